//! Sessions without nitrogen, leak, impurity or carbon dioxide, on a loop whose oxygen fraction is a stated function.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(dead_code, reason = "each test file uses its own part")]

use chrono::DateTime;
use ebbline::entry::{
    Assumptions, CellPapers, CellReadings, CellSignal, Diluent, Event, Id, Influence, Injection, LeakTest,
    LoopKept, Metered, Place, Purity, Rest, Session, SessionConditions, SessionReadings, What,
};
use ebbline::quantity::{
    AbsolutePressure, PressureDifference, ReferenceConditions, Share, Span, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use ebbline::uptake::{Estimate, PlaceUptake, SessionInput, WhyNot, uptake};

/// 1013.25 hPa and 33 °C, at which water saturates at 5.0354 kPa (IAPWS): dry gas stands under 96.2896 kPa.
pub(crate) const DRY_BAR: f64 = 0.962_896;

/// A session without nitrogen, leak, impurity or carbon dioxide, so that the balance is the bare one.
pub(crate) fn bare(
    kept: LoopKept,
    volume_l: Option<f64>,
    minutes: f64,
    fraction: impl Fn(f64) -> f64,
) -> Session {
    let time_s: Vec<f64> = (0..=(minutes * 12.0) as usize).map(|i| 5.0 * i as f64).collect();
    let po2: Vec<f64> = time_s.iter().map(|s| DRY_BAR * fraction(s / 60.0)).collect();
    let cell = |i: usize| CellReadings { name: format!("c{i}"), signal: CellSignal::Bar(po2.clone()) };
    let none = StpdFlow::from_l_min(0.0);
    Session {
        diver: Id::new("D-07").unwrap(),
        mass: None,
        place: Place::Couch,
        kept,
        diluent: Diluent::Oxygen(Share::from_ratio(0.21)),
        loop_volume: volume_l.map(litres_given),
        leak_test: LeakTest::Passed,
        nose_clip: None,
        oxygen: Some(Purity { fraction: 1.0, expanded: 0.0 }),
        taken: DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap(),
        readings: SessionReadings {
            time_s,
            cells: (1..=3).map(cell).collect(),
            depth_m: None,
            loop_temperature_k: None,
        },
        line: None,
        conditions: SessionConditions {
            barometer: Influence {
                value: Some(AbsolutePressure::STANDARD_ATMOSPHERE),
                expanded: Some(PressureDifference::from_bar(0.002)),
            },
            loop_temperature: Influence {
                value: Some(Temperature::from_c(33.0)),
                expanded: Some(TemperatureDifference::from_k(4.0)),
            },
            time_on_loop: Some(Span::from_s(600.0)),
            scrubber_warm: Some(true),
            ..SessionConditions::default()
        },
        cells: CellPapers { gain: Some(0.02), calibrated_at: None },
        rest: Rest::default(),
        assumptions: Assumptions {
            lung_share: 0.0,
            washout: (none, none),
            leak: Some((none, none)),
            ..Assumptions::DEFAULT
        },
        events: Vec::new(),
        cylinder: None,
    }
}

pub(crate) fn litres_given(litres: f64) -> Uncertain<Volume> {
    Uncertain { value: Volume::from_m3(litres / 1e3), expanded: Some(Volume::from_m3(0.001)) }
}

pub(crate) fn at(minute: f64, what: What) -> Event {
    Event { at_s: 60.0 * minute, what }
}

pub(crate) fn inject(minute: f64, l_min: f64) -> Event {
    let flow =
        Uncertain { value: StpdFlow::from_l_min(l_min), expanded: Some(StpdFlow::from_l_min(0.02 * l_min)) };
    at(minute, What::Injection(if l_min > 0.0 { Injection::Flow(flow) } else { Injection::Off }))
}

pub(crate) fn amount(litres_stpd: f64) -> Metered {
    Metered {
        volume: Uncertain {
            value: Volume::from_m3(litres_stpd / 1e3),
            expanded: Some(Volume::from_m3(0.02 * litres_stpd / 1e3)),
        },
        reads_at: Some(ReferenceConditions::STPD),
    }
}

pub(crate) fn place(session: &Session) -> PlaceUptake {
    uptake(&[SessionInput { session, line: None }]).unwrap().places.remove(0)
}

pub(crate) fn answer(session: &Session) -> Estimate {
    place(session).answer.unwrap()
}

pub(crate) fn why_not(session: &Session) -> WhyNot {
    let place = place(session);
    assert!(place.sessions[0].segments.is_empty() && place.sessions[0].answer.is_err());
    place.answer.unwrap_err()
}

pub(crate) fn near(got: f64, want: f64, tolerance: f64) {
    let difference = (got - want).abs();
    assert!(
        difference <= tolerance,
        "got {got}, want {want}, difference {difference:e}, tolerance {tolerance:e}"
    );
}

/// Litres STPD of dry gas in seven litres: 7 · 96.2896/101.325 · 273.15/306.15.
pub(crate) const N7: f64 = 5.935_099;
