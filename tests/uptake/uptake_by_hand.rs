//! Sessions small enough to be worked by hand, each in its comment.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::float_cmp, reason = "times that were written down come back as they were")]

use crate::bare::*;
use ebbline::entry::{
    CalibratedAt, CellSignal, Cylinder, Feeds, Id, Influence, Injection, LoopKept, Place, What,
};
use ebbline::gas::saturation_pressure;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Length, Mass, PressureDifference, Span, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use ebbline::uptake::{
    Estimate, InjectionLine, Kind, Origin, Plausible, SessionInput, Source, StretchWhy, UptakeError, Warning,
    WhyNot, uptake,
};

#[test]
fn a_held_session_by_hand() {
    // f falls by 0.004 a minute: M = J + N·0.004/(1 − 0.21) = 0.3 + 5.9351·0.0050633 = 0.33005 L/min.
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    let place = place(&session);
    let estimate = place.answer.unwrap();
    near(estimate.uptake_l_min, 0.3 + N7 * 0.004 / 0.79, 2e-6);
    near(estimate.uptake_l_min, 0.330_05, 1e-5);
    let one = &place.sessions[0];
    assert_eq!(one.segments.len(), 1);
    let segment = &one.segments[0];
    assert_eq!((segment.kind, segment.from_s, segment.to_s), (Kind::Held, 90.0, 1200.0));
    near(segment.slope_per_min, -0.004, 1e-8);
    let volume = one.answer.as_ref().unwrap().loop_volume;
    assert_eq!(volume.origin, Origin::Given);
    near(volume.litres, 7.0, 1e-9);
    // The volume's ± 0.5 L (standard) moves M by 0.5/7 of N·0.0050633: 0.00215; the wander over 18.5 minutes is
    // 0.04·0.33·√(4.8/18.5) = 0.00672; the flow's 1 % is 0.003.
    let row = |source| estimate.budget.iter().find(|r| r.source == source).unwrap().u_l_min;
    near(row(Source::LoopVolume), 0.002_15, 1e-5);
    near(row(Source::Wander), 0.006_72, 1e-5);
    near(row(Source::StatedFlow), 0.003, 1e-5);
}

#[test]
fn carbon_dioxide_and_a_leak_by_hand() {
    // The lungs' 40 % at 5.3 kPa leave 94.1696 kPa of dry gas: N is less by 2.12/96.2896, and with it M − J.
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    session.assumptions.lung_share = 0.4;
    near(answer(&session).uptake_l_min, 0.3 + N7 * (1.0 - 2.12 / 96.289_6) * 0.004 / 0.79, 2e-6);
    // A leak of 10 mL/min at f = 0.657 in the middle (10.75 min): M is less by 0.010·(0.657 − 0.21)/0.79 = 5.66 mL/min.
    session.assumptions.lung_share = 0.0;
    let leak = StpdFlow::from_l_min(0.010);
    session.assumptions.leak = Some((leak, leak));
    near(answer(&session).uptake_l_min, 0.330_05 - 0.005_66, 2e-5);
}

#[test]
fn a_sealed_session_by_hand() {
    // f0 = 0.6, so that the inert gas is 0.4·5.9351 = 2.3740 L; 1/(1 − f) falls from 2.5 by 0.04 a minute:
    // M = 0.2 + 0.04·2.3740 = 0.29496 L/min. (f at the first half minute is what is read, 0.6 − 0.0016 at its middle.)
    let mut session = bare(LoopKept::Sealed, Some(7.0), 20.0, |t| 1.0 - 1.0 / (2.5 - 0.04 * t));
    session.events = vec![inject(0.0, 0.2)];
    let estimate = answer(&session);
    near(estimate.uptake_l_min, 0.294_96, 0.000_5);
    // Oxygen added in the middle leaves the inert gas as it is: the same slope, 0.12 higher, is the same uptake.
    let mut added = bare(LoopKept::Sealed, Some(7.0), 20.0, |t| {
        1.0 - 1.0 / (2.5 - 0.04 * t + if t > 10.0 { 0.12 } else { 0.0 })
    });
    added.events = vec![inject(0.0, 0.2), at(10.0, What::OxygenAdd(Some(amount(0.285))))];
    near(answer(&added).uptake_l_min, estimate.uptake_l_min, 1e-6);
}

#[test]
fn nitrogen_by_hand() {
    // Nitrogen that does not fade: W = 0.040·(P_body − P_loop)/P_body with P_body = 0.79·(1.01325 − 0.063) = 0.75070 bar
    // and P_loop = 0.5·0.962896 = 0.48145 bar: W = 0.014347 L/min. Sealed at f = 0.5, which is held by J: apparent uptake
    // is M + W·f/(1 − f), so that with f level M = J − W = 0.3 − 0.014347.
    let mut session = bare(LoopKept::Sealed, Some(7.0), 20.0, |_| 0.5);
    session.events = vec![inject(0.0, 0.3)];
    let nitrogen = StpdFlow::from_l_min(0.040);
    session.assumptions.washout = (nitrogen, nitrogen);
    session.assumptions.washout_time = Span::from_s(1e9);
    near(answer(&session).uptake_l_min, 0.3 - 0.014_347, 2e-5);
    // Held, the same level: M = J − W·f_d/(1 − f_d) = 0.3 − 0.014347·0.21/0.79, and no more than J goes in.
    session.kept = LoopKept::Held;
    let place = place(&session);
    // f level with nitrogen coming in means that more goes in than is used: by its own drift the loop vents.
    assert_eq!(place.sessions[0].segments[0].kind, Kind::Venting);
    near(place.answer.unwrap().uptake_l_min, 0.3 - 0.014_347, 2e-5);
}

#[test]
fn a_topped_session_by_hand() {
    // PO2 level throughout, 0.15 L/min for 20 minutes and 1.2 + 1.8 L by hand: (3 + 3)/20 = 0.3 L/min.
    let mut session = bare(LoopKept::Topped, Some(7.0), 20.0, |_| 0.7);
    let oxygen = |minute, litres| at(minute, What::OxygenAdd(Some(amount(litres))));
    session.events = vec![inject(0.0, 0.15), oxygen(6.0, 1.2), oxygen(13.0, 1.8)];
    let level = answer(&session).uptake_l_min;
    near(level, 0.3, 1e-9);
    // Ending 0.02 lower in f at the same volume: 0.02·5.9351/20 = 5.94 mL/min more.
    let mut lower = bare(LoopKept::Topped, Some(7.0), 20.0, |t| if t < 6.5 { 0.7 } else { 0.68 });
    lower.events.clone_from(&session.events);
    near(answer(&lower).uptake_l_min, 0.305_94, 1e-5);
    // 0.6 L of loop gas let out at f = 0.7: 0.42/20 less.
    session.events.push(at(9.0, What::Vent(Some(amount(0.6)))));
    near(answer(&session).uptake_l_min, 0.3 - 0.021, 1e-7);
}

#[test]
fn a_cylinders_drop_by_hand() {
    // Two litres from 182 to 179 bar gauge at 24 °C. Compressibility of oxygen there (CoolProp 8.0): 0.93996 at 183.01 bar
    // and 0.93950 at 180.01 bar. (183.01325/0.93996 − 180.01325/0.93950)·2/1.01325·273.15/297.15 = 5.629 L.
    let k =
        |c| Uncertain { value: Temperature::from_c(c), expanded: Some(TemperatureDifference::from_k(1.0)) };
    let bar = |bar| Uncertain {
        value: GaugePressure::from_bar(bar),
        expanded: Some(PressureDifference::from_bar(0.1)),
    };
    let cylinder = Cylinder {
        volume: Uncertain { value: Volume::from_m3(0.002), expanded: Some(Volume::from_m3(0.000_02)) },
        from: bar(182.0),
        from_temperature: k(24.0),
        to: bar(179.0),
        to_temperature: k(24.0),
        feeds: Feeds::All,
    };
    let mut session = bare(LoopKept::Topped, Some(7.0), 20.0, |_| 0.7);
    session.cylinder = Some(cylinder);
    session.events = vec![inject(0.0, 0.15), at(6.0, What::OxygenAdd(None)), at(13.0, What::OxygenAdd(None))];
    // ± 1 K at either end is some 1.6 L of 5.6 each: the interval is nearly as wide as the number.
    let (low, high) = answer(&session).interval_95;
    assert!(high - low > 0.7 * 5.629 / 20.0, "{low} {high}");
    // ± 4 K, and it would reach zero: no number.
    let far = Uncertain { expanded: Some(TemperatureDifference::from_k(4.0)), ..k(24.0) };
    session.cylinder = Some(Cylinder { from_temperature: far, to_temperature: far, ..cylinder });
    assert!(matches!(why_not(&session), WhyNot::NotPositive { .. }));
    let exact = |t: Uncertain<Temperature, TemperatureDifference>| Uncertain {
        expanded: Some(TemperatureDifference::from_k(0.1)),
        ..t
    };
    let known = Cylinder { from_temperature: exact(k(24.0)), to_temperature: exact(k(24.0)), ..cylinder };
    session.cylinder = Some(known);
    let all = answer(&session).uptake_l_min;
    // The tool's compressibility is good to 0.0013, and errs alike at both ends.
    near(all, 5.629 / 20.0, 0.004);
    // The cylinder feeds only the adds: then the trickle comes on top.
    session.cylinder = Some(Cylinder { feeds: Feeds::Adds, ..known });
    near(answer(&session).uptake_l_min, all + 0.15, 1e-9);
    // Metered adds are used where they are known; a drop that is far from them is a leak.
    session.cylinder = Some(known);
    session.events = vec![
        inject(0.0, 0.15),
        at(6.0, What::OxygenAdd(Some(amount(0.5)))),
        at(13.0, What::OxygenAdd(Some(amount(0.5)))),
    ];
    let place = place(&session);
    near(place.answer.unwrap().uptake_l_min, 0.2, 1e-9);
    assert!(place.sessions[0].warnings.iter().any(|w| matches!(w, Warning::CylinderDisagrees { .. })));
}

#[test]
fn a_null_by_hand_needs_no_volume() {
    // Slopes −0.010 at J = 0.26 and −0.045 a minute at J = 0: they cross zero at 0.26 + 0.26·10/35 = 0.33429 L/min, and the dry gas is
    // 0.26·0.79/0.035 = 5.8686 L.
    let mut session =
        bare(
            LoopKept::Held,
            None,
            20.0,
            |t| if t < 12.0 { 0.9 - 0.01 * t } else { 0.78 - 0.045 * (t - 12.0) },
        );
    session.events = vec![inject(0.0, 0.26), inject(12.0, 0.0)];
    let place = place(&session);
    let estimate = place.answer.unwrap();
    near(estimate.uptake_l_min, 0.334_286, 1e-5);
    let volume = place.sessions[0].answer.as_ref().unwrap().loop_volume;
    assert_eq!(volume.origin, Origin::Found);
    near(volume.litres, 7.0 * 5.868_57 / N7, 1e-3);
    // The interval is Fieller's: not even about the estimate.
    let (low, high) = estimate.interval_95;
    assert!(high - estimate.uptake_l_min > estimate.uptake_l_min - low);
    // With the volume measured too, both say it together.
    session.loop_volume = Some(litres_given(7.2));
    let both = self::place(&session).sessions.remove(0).answer.unwrap();
    assert_eq!(both.loop_volume.origin, Origin::Both);
    assert!(both.loop_volume.litres > volume.litres && both.loop_volume.litres < 7.2);
    assert!(both.u < estimate.u);
    // A volume that the slopes contradict: one far too small reads low and is said so, one far too large gives no number.
    session.loop_volume = Some(litres_given(4.0));
    let small = self::place(&session).sessions.remove(0);
    assert!(small.answer.is_ok());
    let said = small.warnings.iter().any(|w| matches!(w, Warning::LoopVolumeDisagrees { .. }));
    assert!(said, "{:?}", small.warnings);
    session.loop_volume = Some(litres_given(14.0));
    let large = self::place(&session).sessions.remove(0).answer.unwrap_err();
    assert!(matches!(large, WhyNot::LoopVolumeContradicts { .. }), "{large:?}");
}

#[test]
fn a_held_loop_that_vents_is_read_as_venting() {
    // J = 0.5 above M = 0.3: f rises by (1 − f)·0.2/5.9351. Read as held it would be
    // M = 0.5 − N·f'/0.79 with f' = 0.4·0.2/5.9351: 0.399 instead of 0.3.
    let rise = |t: f64| 1.0 - 0.45 * libm::exp(-0.2 / N7 * t);
    let mut session = bare(LoopKept::Held, Some(7.0), 12.0, rise);
    session.events = vec![inject(0.0, 0.5)];
    let place = place(&session);
    assert_eq!(place.sessions[0].segments[0].kind, Kind::Venting);
    // f goes from 0.56 to 0.71 here, and the curve's mean slope over its mean inert share is 0.1 % off.
    near(place.answer.unwrap().uptake_l_min, 0.3, 5e-4);
    assert!(place.sessions[0].warnings.iter().any(|w| matches!(w, Warning::HeldButVents { .. })));
}

#[test]
fn a_sealed_loop_back_at_the_mark_is_a_known_one_and_after_a_vent_it_is_not() {
    // Sealed at M − J = 0.1 for ten minutes from f = 0.6, then made up with diluent and held, f falling by 0.1·0.79/5.9351.
    let inert = 0.4 * N7;
    let fraction = move |t: f64| {
        if t <= 10.0 { 1.0 - 1.0 / (2.5 - 0.1 / inert * t) } else { 0.46 - 0.1 * 0.79 / N7 * (t - 10.0) }
    };
    let mut session = bare(LoopKept::Sealed, Some(7.0), 20.0, fraction);
    let held = |mark| What::MakeUp { kept: Some(LoopKept::Held), mark };
    session.events = vec![inject(0.0, 0.2), at(10.0, held(true))];
    let place = place(&session);
    let kinds: Vec<Kind> = place.sessions[0].segments.iter().map(|s| s.kind).collect();
    assert_eq!(kinds, [Kind::Sealed, Kind::Held]);
    near(place.answer.unwrap().uptake_l_min, 0.3, 0.001);
    // A vent before it leaves the contents unknown until the mark.
    session.events = vec![inject(0.0, 0.2), at(0.5, What::Vent(None)), at(10.0, held(true))];
    let vented = self::place(&session);
    assert_eq!(vented.sessions[0].segments.len(), 1);
    let why: Vec<StretchWhy> = vented.sessions[0].left_out.iter().map(|s| s.why).collect();
    assert!(why.contains(&StretchWhy::ContentsUnknown), "{why:?}");
    near(vented.answer.unwrap().uptake_l_min, 0.3, 1e-6);
    session.events = vec![inject(0.0, 0.2), at(0.5, What::Vent(None)), at(10.0, held(false))];
    assert_eq!(why_not(&session), WhyNot::ContentsUnknown);
}

#[test]
fn carried_contents_follow_a_sealed_loop_into_a_held_one() {
    // As above, but not filled up: held on at what was left. The sealed ten minutes took 1 L of 5.9351: N = 4.9351, f = 0.51895.
    let inert = 0.4 * N7;
    let f10 = 1.0 - 1.0 / (2.5 - 0.1 / inert * 10.0);
    let fraction = move |t: f64| {
        if t <= 10.0 {
            1.0 - 1.0 / (2.5 - 0.1 / inert * t)
        } else {
            f10 - 0.1 * 0.79 / (N7 - 1.0) * (t - 10.0)
        }
    };
    let mut session = bare(LoopKept::Sealed, Some(7.0), 20.0, fraction);
    session.events =
        vec![inject(0.0, 0.2), at(10.0, What::MakeUp { kept: Some(LoopKept::Held), mark: false })];
    let segments = place(&session).sessions.remove(0).segments;
    near(segments[0].uptake_l_min.unwrap(), 0.3, 0.002);
    near(segments[1].uptake_l_min.unwrap(), 0.3, 0.002);
}

#[test]
fn volts_are_read_on_their_two_points() {
    // Dry air of 1013.25 hPa holds 0.21225 bar, dry pure oxygen 1.01325 bar; 10 mV and 48 mV.
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    let bars = answer(&session).uptake_l_min;
    let air = 0.209_476 * 1.013_25;
    for cell in &mut session.readings.cells {
        let CellSignal::Bar(po2) = &cell.signal else { panic!() };
        let volts = po2.iter().map(|p| 0.010 + 0.038 * (p - air) / (1.013_25 - air)).collect();
        cell.signal = CellSignal::Volts { readings: volts, in_air: 0.010, in_oxygen: 0.048 };
    }
    let input = SessionInput { session: &session, line: None };
    assert_eq!(uptake(&[input]).unwrap_err(), UptakeError::NoCalibration);
    session.cells.calibrated_at = Some(CalibratedAt {
        barometer: AbsolutePressure::STANDARD_ATMOSPHERE,
        temperature: Temperature::from_c(20.0),
        humidity: 0.0,
        oxygen: 1.0,
    });
    near(answer(&session).uptake_l_min, bars, 1e-9);
    // A flush is not trusted beyond 1 % (standard), whatever the papers say.
    session.cells.gain = Some(0.001);
    let row = |e: &Estimate| e.budget.iter().find(|r| r.source == Source::CellGain).unwrap().u_l_min;
    near(row(&answer(&session)), 0.01 * 0.030_05, 2e-6);
    // Above the calibration point an ageing cell reads low: the same cells, calibrated in 60 % of oxygen.
    session.cells.calibrated_at.as_mut().unwrap().oxygen = 0.6;
    for cell in &mut session.readings.cells {
        let CellSignal::Volts { in_oxygen, .. } = &mut cell.signal else { panic!() };
        *in_oxygen = 0.010 + 0.038 * (0.6 * 1.013_25 - air) / (1.013_25 - air);
    }
    near(answer(&session).uptake_l_min, bars, 1e-9);
    let warnings = place(&session).sessions.remove(0).warnings;
    assert!(warnings.iter().any(|w| matches!(w, Warning::AboveCalibration { .. })), "{warnings:?}");
}

#[test]
fn depth_and_its_drift_count_in_a_pool() {
    // A metre down fresh water adds 0.0980665 bar; the same fractions are other pressures, and N is larger by them.
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    session.place = Place::Pool;
    let deeper = (DRY_BAR + 0.098_066_5) / DRY_BAR;
    for cell in &mut session.readings.cells {
        let CellSignal::Bar(po2) = &mut cell.signal else { panic!() };
        po2.iter_mut().for_each(|p| *p *= deeper);
    }
    session.conditions.depth =
        Influence { value: Some(Length::from_m(1.0)), expanded: Some(Length::from_m(0.1)) };
    let estimate = answer(&session);
    near(estimate.uptake_l_min, 0.3 + N7 * deeper * 0.004 / 0.79, 3e-6);
    assert!(estimate.budget.iter().any(|r| r.source == Source::DepthDrift));
    // A depth column takes the drift with it.
    let rows = session.readings.time_s.len();
    session.readings.depth_m = Some(vec![1.0; rows]);
    let with_column = answer(&session);
    near(with_column.uptake_l_min, estimate.uptake_l_min, 1e-9);
    assert!(with_column.budget.iter().all(|r| r.source != Source::DepthDrift));
}

#[test]
fn a_line_gives_the_injection_and_its_errors_are_handed_on() {
    // q = −0.0033 + 0.033·(9 + 1.01325) = 0.32714 L/min of 20 °C gas.
    let line = InjectionLine {
        intercept: -0.003_3,
        slope: 0.033,
        intercept_variance: 4e-6,
        slope_variance: 4e-8,
        covariance: -3e-7,
        random_dof: 6.0,
        common: Vec::new(),
    };
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    let ip =
        Uncertain { value: GaugePressure::from_bar(9.0), expanded: Some(PressureDifference::from_bar(0.2)) };
    session.events = vec![at(0.0, What::Injection(Injection::Ip(ip)))];
    let input = SessionInput { session: &session, line: None };
    assert_eq!(uptake(&[input]).unwrap_err(), UptakeError::NoLine { index: 1 });
    let input = SessionInput { session: &session, line: Some(&line) };
    let estimate = uptake(&[input]).unwrap().places.remove(0).answer.unwrap();
    near(estimate.uptake_l_min, 0.327_137 + 0.030_05, 2e-5);
    // One injection and a measured volume: M moves with J one to one.
    let shared = &estimate.shared;
    near(shared.lines[0].per_intercept, 1.0, 1e-6);
    near(shared.lines[0].per_slope, 10.013_25, 1e-5);
    near(shared.per_ip_bar, 0.033, 1e-6);
    let row = |source| estimate.budget.iter().find(|r| r.source == source).unwrap().u_l_min;
    near(row(Source::IpGauge), 0.003_3, 1e-6);
    near(row(Source::InjectionLine), line.combined_u(1.0, 10.013_25), 1e-6);
}

#[test]
fn couch_and_pool_are_never_pooled_and_the_lower_is_taken() {
    let mut couch = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.006 * t);
    couch.events = vec![inject(0.0, 0.3)];
    let mut pool = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    pool.events = vec![inject(0.0, 0.3)];
    pool.place = Place::Pool;
    pool.conditions.depth =
        Influence { value: Some(Length::from_m(0.0)), expanded: Some(Length::from_m(0.1)) };
    let inputs = [&couch, &pool].map(|session| SessionInput { session, line: None });
    let result = uptake(&inputs).unwrap();
    assert_eq!(result.places.len(), 2);
    let (place, lowest) = result.lowest().unwrap();
    assert_eq!(place.place, Place::Pool);
    near(lowest.uptake_l_min, 0.330_05, 1e-5);
    let mut other = couch.clone();
    other.diver = Id::new("D-08").unwrap();
    let mixed = [&couch, &other].map(|session| SessionInput { session, line: None });
    assert!(matches!(uptake(&mixed), Err(UptakeError::SeveralDivers(_, _))));
    assert_eq!(uptake(&[]).unwrap_err(), UptakeError::NoSession);
}

#[test]
fn an_implausible_uptake_raises_the_question() {
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    for (kg, want) in [(100.0, Plausible::Usual), (180.0, Plausible::Unusual), (230.0, Plausible::Hardly)] {
        session.mass = Some(Mass::from_kg(kg));
        let said = answer(&session).per_kilogram.unwrap();
        assert_eq!(said.plausible, want, "{said:?}");
    }
}

#[test]
fn the_constants_of_these_hand_sums_are_the_tabulated_ones() {
    // Saturation at 33 °C: 5035.4 Pa (IAPWS, Wagner and Pruss 1993).
    let vapour = saturation_pressure(Temperature::from_c(33.0)).as_bar();
    near(1.013_25 - vapour, DRY_BAR, 1e-6);
    near(7.0 * DRY_BAR / 1.013_25 * 273.15 / 306.15, N7, 1e-5);
}
