//! What a record may do wrong: no number leaves the program that the readings do not carry.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::float_cmp, reason = "times that were written down come back as they were")]

use crate::bare::*;
use ebbline::entry::Diluent;
use ebbline::entry::{CellSignal, Event, LeakTest, LoopKept, Session, SessionConditions, What};
use ebbline::quantity::Share;
use ebbline::uptake::{CellTrouble, Jump, SessionInput, UptakeError, Warning, WhyNot, uptake};

#[test]
fn sessions_that_cannot_answer_give_no_number() {
    let held = |slope: f64, minutes: f64| bare(LoopKept::Held, Some(7.0), minutes, move |t| 0.7 + slope * t);
    // PO2 rises with the injection off.
    let mut session = held(0.004, 20.0);
    session.events = vec![inject(0.0, 0.0)];
    assert!(matches!(why_not(&session), WhyNot::RisingWithInjectionOff { .. }));
    // Under four minutes.
    let mut session = held(-0.004, 5.0);
    session.events = vec![inject(0.0, 0.3)];
    assert!(matches!(why_not(&session), WhyNot::TooShort { usable_s, needed_s } if usable_s < needed_s));
    // Neither volume nor a second injection.
    let mut session = held(-0.004, 20.0);
    session.loop_volume = None;
    session.events = vec![inject(0.0, 0.3)];
    assert_eq!(why_not(&session), WhyNot::NoVolumeOneInjection);
    // A sealed loop nearly pure in oxygen.
    let mut session = bare(LoopKept::Sealed, Some(7.0), 20.0, |t| 0.97 - 0.001 * t);
    session.events = vec![inject(0.0, 0.2)];
    assert!(matches!(why_not(&session), WhyNot::NearlyPureOxygen { fraction } if fraction > 0.9));
    // Falling so slowly against the injection, or so fast upward, that the uptake would be negative.
    let mut session = bare(LoopKept::Sealed, Some(7.0), 12.0, |t| 0.3 + 0.03 * t);
    session.events = vec![inject(0.0, 0.05)];
    assert!(matches!(why_not(&session), WhyNot::NotPositive { .. }));
    // Two injections so alike that the slopes say nothing.
    let mut session = held(-0.004, 20.0);
    session.loop_volume = None;
    session.events = vec![inject(0.0, 0.3), inject(10.0, 0.285)];
    assert_eq!(why_not(&session), WhyNot::Unbounded);
    // Topped, and something let out that nobody measured.
    let mut session = bare(LoopKept::Topped, Some(7.0), 20.0, |_| 0.7);
    session.events = vec![inject(0.0, 0.3), at(8.0, What::Vent(None))];
    assert_eq!(why_not(&session), WhyNot::NotAccounted { at_s: 480.0 });
}

#[test]
fn cells_that_freeze_drop_out_or_disagree_are_left_out_by_name() {
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    let with = |cell: usize, change: &dyn Fn(usize, f64) -> f64| {
        let mut session = session.clone();
        let CellSignal::Bar(po2) = &mut session.readings.cells[cell].signal else { panic!() };
        for (row, p) in po2.iter_mut().enumerate() {
            *p = change(row, *p);
        }
        session
    };
    let trouble = |session: &Session| {
        let place = place(session);
        near(place.answer.unwrap().uptake_l_min, 0.330_05, 1e-5);
        let left_out = &place.sessions[0].cells_left_out;
        assert_eq!((left_out.len(), left_out[0].name.as_str(), place.sessions[0].cells_used), (1, "c2", 2));
        left_out[0].why
    };
    assert!(matches!(
        trouble(&with(1, &|row, p| if row > 100 { 0.62 } else { p })),
        CellTrouble::Frozen { .. }
    ));
    assert!(matches!(
        trouble(&with(1, &|row, p| if row % 20 == 0 { f64::NAN } else { p })),
        CellTrouble::Faults(_)
    ));
    assert!(matches!(
        trouble(&with(1, &|row, p| if row % 20 == 0 { 1.2 } else { p })),
        CellTrouble::Faults(_)
    ));
    assert!(matches!(trouble(&with(1, &|_, p| p - 0.08)), CellTrouble::Off(by) if (by + 0.08).abs() < 1e-9));
    // Three that all disagree: nobody can say which is right.
    let mut apart = with(1, &|_, p| p - 0.08);
    let CellSignal::Bar(po2) = &mut apart.readings.cells[2].signal else { panic!() };
    po2.iter_mut().for_each(|p| *p += 0.08);
    assert!(matches!(why_not(&apart), WhyNot::CellsDisagree { left_out } if left_out.len() == 2));
    // One cell alone is answered, with a warning; none is not.
    let mut one = session.clone();
    one.readings.cells.truncate(1);
    let said = place(&one);
    near(said.answer.unwrap().uptake_l_min, 0.330_05, 1e-5);
    assert!(said.sessions[0].warnings.contains(&Warning::OneCellOnly));
    let CellSignal::Bar(po2) = &mut one.readings.cells[0].signal else { panic!() };
    po2.iter_mut().for_each(|p| *p = 5.0);
    assert!(matches!(why_not(&one), WhyNot::NoUsableCell { .. }));
}

#[test]
fn a_display_of_hundredths_is_no_frozen_cell() {
    // Read once a minute to 0.01 bar while PO2 sinks by 0.0019 a minute: every value comes five times.
    let mut session = bare(LoopKept::Held, Some(7.0), 40.0, |t| 0.7 - 0.002 * t);
    session.events = vec![inject(0.0, 0.3)];
    let every = |column: &[f64]| column.iter().copied().step_by(12).collect::<Vec<_>>();
    session.readings.time_s = every(&session.readings.time_s);
    for (i, cell) in session.readings.cells.iter_mut().enumerate() {
        let CellSignal::Bar(po2) = &mut cell.signal else { panic!() };
        *po2 = every(po2).iter().map(|p| ((p + 0.003 * i as f64) * 100.0).round() / 100.0).collect();
    }
    let place = place(&session);
    assert_eq!(place.sessions[0].cells_used, 3, "{:?}", place.sessions[0].cells_left_out);
    near(place.answer.unwrap().uptake_l_min, 0.3 + N7 * 0.002 / 0.79, 0.001);
}

#[test]
fn a_jump_nobody_marked_is_proposed_and_not_used() {
    // Oxygen at minute 12 that nobody wrote down: the first ten minutes, up to the injection's change, still answer.
    let jump = |t: f64| if t > 12.0 { 0.06 } else { 0.0 };
    let mut session = bare(LoopKept::Held, Some(7.0), 20.0, move |t| 0.7 - 0.004 * t + jump(t));
    session.events = vec![inject(0.0, 0.3), inject(10.0, 0.3)];
    let place = place(&session);
    near(place.answer.unwrap().uptake_l_min, 0.330_05, 1e-5);
    let one = &place.sessions[0];
    assert_eq!(one.segments.len(), 1);
    let proposed = one.warnings.iter().find_map(|w| match w {
        Warning::UnmarkedJump(proposal) => Some(*proposal),
        _ => None,
    });
    let proposed = proposed.unwrap();
    near(proposed.at_s, 720.0, 20.0);
    near(proposed.change_bar, 0.06 * DRY_BAR, 0.01);
    assert_eq!(proposed.looks_like, Jump::OxygenAdd);
    // Marked, it is an event like any other, and the rest answers too.
    session.events.push(at(12.0, What::OxygenAdd(None)));
    assert_eq!(self::place(&session).sessions[0].segments.len(), 2);
    // Only stretches with a jump: no number.
    session.events = vec![inject(0.0, 0.3)];
    assert!(matches!(why_not(&session), WhyNot::UnmarkedJump { .. }));
}

#[test]
fn gaps_disorder_and_repeats_are_lived_with() {
    let mut session = bare(LoopKept::Held, Some(7.0), 24.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    let keep = |t: f64| !(600.0..780.0).contains(&t);
    let times = session.readings.time_s.clone();
    let mut order: Vec<usize> = (0..times.len()).filter(|i| keep(times[*i])).collect();
    order.swap(20, 90);
    order.push(30);
    session.readings.time_s = order.iter().map(|i| times[*i]).collect();
    for cell in &mut session.readings.cells {
        let CellSignal::Bar(po2) = &mut cell.signal else { panic!() };
        *po2 = order.iter().map(|i| po2[*i]).collect();
    }
    let place = place(&session);
    near(place.answer.unwrap().uptake_l_min, 0.330_05, 1e-5);
    let one = &place.sessions[0];
    assert_eq!(one.segments.len(), 2);
    let warned = |of: fn(&Warning) -> bool| one.warnings.iter().any(of);
    assert!(warned(|w| matches!(w, Warning::Gap { from_s, to_s } if *from_s == 595.0 && *to_s == 780.0)));
    assert!(warned(|w| matches!(w, Warning::RowsUnordered(_))));
    assert!(warned(|w| matches!(w, Warning::TimesRepeated(1))));
    // Excluded readings are not used, and split the stretch without a dead time.
    let mut session = bare(LoopKept::Held, Some(7.0), 24.0, |t| {
        0.7 - 0.004 * t + if (10.0..12.0).contains(&t) { 0.2 } else { 0.0 }
    });
    session.events = vec![inject(0.0, 0.3), at(10.0, What::Exclude { until_s: 720.0 })];
    let one = self::place(&session).sessions.remove(0);
    near(one.answer.unwrap().uptake_l_min, 0.330_05, 1e-5);
    assert_eq!(one.segments.len(), 2);
    assert!(one.segments[1].from_s > 720.0 && one.segments[1].from_s < 735.0);
}

#[test]
fn events_that_cannot_be_are_refused() {
    let session = bare(LoopKept::Held, Some(7.0), 20.0, |t| 0.7 - 0.004 * t);
    let refuse = |events: Vec<Event>| {
        let session = Session { events, ..session.clone() };
        uptake(&[SessionInput { session: &session, line: None }]).unwrap_err()
    };
    assert_eq!(refuse(Vec::new()), UptakeError::NoInjection);
    let outside = refuse(vec![inject(0.0, 0.3), at(21.0, What::Stop)]);
    assert!(matches!(outside, UptakeError::EventOutside { index: 2, .. }), "{outside:?}");
    let backwards = refuse(vec![inject(0.0, 0.3), at(5.0, What::Exclude { until_s: 10.0 })]);
    assert!(matches!(backwards, UptakeError::ExcludeBackwards { index: 2, .. }), "{backwards:?}");
    let mut strange = session.clone();
    strange.events = vec![inject(0.0, 0.3)];
    strange.diluent = Diluent::Oxygen(Share::from_ratio(1.0));
    let refused = uptake(&[SessionInput { session: &strange, line: None }]).unwrap_err();
    assert!(matches!(refused, UptakeError::Impossible { .. }), "{refused:?}");
}

#[test]
fn what_had_to_be_assumed_is_said() {
    let mut session = bare(LoopKept::Held, Some(7.0), 30.0, |t| 0.7 - 0.004 * t);
    session.events = vec![inject(0.0, 0.3)];
    session.conditions = SessionConditions::default();
    session.cells.gain = None;
    session.loop_volume.as_mut().unwrap().expanded = None;
    session.leak_test = LeakTest::NotDone;
    session.assumptions.leak = None;
    let warnings = place(&session).sessions.remove(0).warnings;
    let said = |of: fn(&Warning) -> bool| assert!(warnings.iter().any(of), "{warnings:?}");
    said(|w| *w == Warning::BarometerUnknown);
    said(|w| *w == Warning::LoopTemperatureUnknown);
    said(|w| *w == Warning::TimeOnLoopUnknown);
    said(|w| matches!(w, Warning::WarmUpLeftOut { seconds } if *seconds == 600.0));
    said(|w| matches!(w, Warning::CellGainAssumed { .. }));
    said(|w| matches!(w, Warning::LoopVolumeAssumed { .. }));
    said(|w| *w == Warning::LeakNotTested);
}

/// A generator of Lehmer's (Park and Miller 1988), enough to make nonsense with.
struct Nonsense(u64);

impl Nonsense {
    fn below(&mut self, n: u64) -> u64 {
        self.0 = self.0 * 48_271 % 2_147_483_647;
        self.0 % n
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.below(10_000) as f64 / 10_000.0
    }
}

/// A record of random readings, events and statements, most of it absurd.
fn nonsense(seed: u64) -> Session {
    let mut any = Nonsense(seed * 7_919 + 1);
    let kept = [LoopKept::Held, LoopKept::Sealed, LoopKept::Topped];
    let (slope, bend) = (any.between(-0.05, 0.03), any.between(-0.002, 0.002));
    let volume = (any.below(3) > 0).then(|| any.between(0.5, 20.0));
    let start = any.between(0.1, 1.1);
    let minutes = any.between(0.2, 40.0);
    let mut session = bare(kept[any.below(3) as usize], volume, minutes, |t| start + t * (slope + bend * t));
    session.assumptions = ebbline::entry::Assumptions::DEFAULT;
    for cell in &mut session.readings.cells {
        let CellSignal::Bar(po2) = &mut cell.signal else { panic!() };
        for p in po2.iter_mut() {
            *p += any.between(-0.01, 0.01);
            if any.below(200) == 0 {
                *p = [f64::NAN, f64::INFINITY, -1.0, 0.0, 1e300][any.below(5) as usize];
            }
        }
    }
    if any.below(4) == 0 {
        session.place = ebbline::entry::Place::Pool;
        session.readings.depth_m =
            Some(session.readings.time_s.iter().map(|_| any.between(-1.0, 4.0)).collect());
    }
    if any.below(4) == 0 {
        session.readings.loop_temperature_k =
            Some(session.readings.time_s.iter().map(|_| any.between(270.0, 320.0)).collect());
    }
    for _ in 0..any.below(7) {
        let minute = any.between(0.0, minutes);
        let metered = (any.below(2) == 0).then(|| amount(any.between(0.0, 4.0)));
        session.events.push(match any.below(8) {
            0 | 1 => inject(minute, any.between(0.0, 1.0)),
            2 => inject(minute, 0.0),
            3 => at(minute, What::OxygenAdd(metered)),
            4 => at(minute, What::DiluentAdd(metered)),
            5 => at(minute, What::Vent(metered)),
            6 => at(
                minute,
                What::MakeUp {
                    kept: (any.below(2) == 0).then(|| kept[any.below(3) as usize]),
                    mark: any.below(2) == 0,
                },
            ),
            _ => at(minute, What::Exclude { until_s: 60.0 * minute + any.between(0.0, 300.0) }),
        });
    }
    session
}

#[test]
fn no_record_makes_a_negative_or_infinite_uptake() {
    let (mut answers, mut none, mut refused) = (0, 0, 0);
    for seed in 1..=4_000 {
        let session = nonsense(seed);
        let Ok(result) = uptake(&[SessionInput { session: &session, line: None }]) else {
            refused += 1;
            continue;
        };
        let place = &result.places[0];
        let Ok(estimate) = &place.answer else {
            none += 1;
            continue;
        };
        answers += 1;
        let next = &estimate.next_day;
        let mut printed = vec![estimate.uptake_l_min, estimate.u, next.uptake_l_min, next.u];
        printed.extend([
            estimate.interval_95.0,
            estimate.interval_95.1,
            next.interval_95.0,
            next.interval_95.1,
        ]);
        printed.extend(estimate.budget.iter().map(|r| r.u_l_min));
        printed.extend(estimate.would_help.iter().map(|h| h.half_width_l_min));
        for segment in &place.sessions[0].segments {
            printed.extend(segment.uptake_l_min);
            printed.extend([segment.u, segment.slope_u, segment.slope_u_noise]);
            assert!(segment.slope_per_min.is_finite());
        }
        assert!(printed.iter().all(|v| v.is_finite() && *v >= 0.0), "seed {seed}: {printed:?}");
        assert!(
            estimate.uptake_l_min > 0.0 && estimate.interval_95.0 < estimate.interval_95.1,
            "seed {seed}"
        );
    }
    assert!(answers > 100 && none > 100 && refused > 100, "{answers} {none} {refused}");
}
