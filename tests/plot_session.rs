//! The plot of a session, looked at from outside: as text, as XML, as measured texts.

#![allow(clippy::unwrap_used, reason = "a picture that does not parse is a failure")]

#[path = "loop_simulator/mod.rs"]
mod loop_simulator;

use std::collections::HashSet;
use std::sync::{Arc, OnceLock};

use ebbline::entry::{
    CalibratedAt, CellSignal, Event, Id, Injection, LoopKept, Metered, Place, Session, What,
};
use ebbline::plot::{SessionPlot, session_plot};
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Length, Shown, StpdFlow, Temperature, Uncertain, Volume,
};
use ebbline::report::Units;
use ebbline::uptake::{Kind as Read, SegmentUptake, SessionInput, SessionUptake, Warning, uptake};
use loop_simulator::{Dice, Extra, Kind, scene_of, truth};
use proptest::prelude::*;
use resvg::usvg::{self, fontdb, roxmltree};

/// Golden pictures: session, width, height.
const GOLDEN: [(&str, u32, u32); 9] = [
    ("held-twice", 960, 640),
    ("held-twice", 480, 480),
    ("sealed-twice", 960, 640),
    ("topped", 1600, 900),
    ("venting", 480, 480),
    ("unmarked-jump", 960, 640),
    ("many-events", 960, 640),
    ("pool", 960, 640),
    ("hostile-texts", 960, 640),
];

/// Sizes every session is measured at.
const SIZES: [(u32, u32); 6] = [(400, 320), (480, 480), (600, 900), (960, 640), (1600, 900), (2000, 500)];

/// A session to draw, worked out.
#[derive(Clone)]
pub struct Drawn {
    session: Session,
    uptake: SessionUptake,
    options: SessionPlot,
}

impl Drawn {
    pub fn at(&self, width: u32, height: u32) -> String {
        session_plot(&self.session, &self.uptake, &SessionPlot { width, height, ..self.options.clone() })
    }
}

/// A simulated session, changed, and worked out.
fn made(kind: Kind, seed: u64, extra: &Extra, change: impl FnOnce(&mut Session)) -> Drawn {
    let mut dice = Dice::new(seed);
    let truth = truth(&mut dice);
    let scene = scene_of(kind, truth, extra, &mut dice);
    let mut session = scene.session;
    change(&mut session);
    let input = SessionInput { session: &session, line: scene.line.as_ref() };
    let uptake = uptake(&[input]).unwrap().places.remove(0).sessions.remove(0);
    let options = SessionPlot { name: "S0001".to_owned(), ..SessionPlot::default() };
    Drawn { session, uptake, options }
}

fn columns(session: &mut Session) -> impl Iterator<Item = &mut Vec<f64>> {
    session.readings.cells.iter_mut().map(|cell| match &mut cell.signal {
        CellSignal::Bar(column) => column,
        CellSignal::Volts { readings, .. } => readings,
    })
}

/// Adds to every cell from a second on.
fn jump(session: &mut Session, at_s: f64, bar: f64) {
    let rows: Vec<usize> =
        (0..session.readings.time_s.len()).filter(|i| session.readings.time_s[*i] > at_s).collect();
    for column in columns(session) {
        rows.iter().for_each(|row| column[*row] += bar);
    }
}

fn litres(l: f64) -> Option<Metered> {
    let volume = Uncertain { value: Volume::from_m3(l / 1e3), expanded: None };
    Some(Metered { volume, reads_at: None })
}

fn flow(l_min: f64) -> What {
    let value = StpdFlow::from_l_min(l_min);
    What::Injection(Injection::Flow(Uncertain { value, expanded: None }))
}

fn named(name: &str) -> Drawn {
    let usual = Extra::default();
    match name {
        "held-twice" => made(Kind::HeldTwice, 3, &usual, |_| {}),
        "null" => made(Kind::Null, 5, &usual, |_| {}),
        "venting" => made(Kind::Venting, 7, &usual, |_| {}),
        "sealed" => made(Kind::Sealed, 11, &usual, |_| {}),
        "sealed-twice" => made(Kind::SealedTwice, 12, &usual, |_| {}),
        "sealed-then-held" => made(Kind::SealedThenHeld, 13, &usual, |_| {}),
        "topped" => made(Kind::Topped, 4, &usual, |_| {}),
        "line" => made(Kind::Line, 9, &usual, |_| {}),
        // One long stretch with a jump nobody wrote down.
        "unmarked-jump" => {
            let mut drawn = made(Kind::Held, 21, &usual, |session| jump(session, 660.0, 0.09));
            drawn.options.why_not = Some(
                "PO2 jumps by 0.09 bar at 0:11:00 and no event says why; write the event down, or exclude \
                 the stretch"
                    .to_owned(),
            );
            drawn
        }
        "many-events" => made(Kind::HeldTwice, 3, &usual, |session| {
            for i in 1..=40_u32 {
                let what = match i % 4 {
                    0 => What::OxygenAdd(litres(0.4)),
                    1 => What::DiluentAdd(litres(0.25)),
                    2 => What::Vent(None),
                    _ => What::MakeUp { kept: None, mark: true },
                };
                session.events.push(Event { at_s: 600.0 + 15.0 * f64::from(i), what });
            }
        }),
        // Too many for their words, few enough for numbers.
        "some-events" => made(Kind::HeldTwice, 3, &usual, |session| {
            for i in 1..=11_u32 {
                let what =
                    if i % 2 == 0 { What::OxygenAdd(litres(0.4)) } else { What::DiluentAdd(litres(0.25)) };
                session.events.push(Event { at_s: 500.0 + 30.0 * f64::from(i), what });
            }
        }),
        "pool" => made(Kind::HeldTwice, 15, &usual, |session| {
            session.place = Place::Pool;
            session.conditions.depth.value = Some(Length::from_m(1.5));
            let depth = session.readings.time_s.iter().map(|t| 1.5 + 0.2 * libm::sin(t / 90.0));
            session.readings.depth_m = Some(depth.collect());
            session.events.push(Event { at_s: 560.0, what: What::Exclude { until_s: 700.0 } });
            session.events.push(Event { at_s: 1500.0, what: What::Stop });
            // One cell is off, and nothing was read for two minutes.
            columns(session).nth(1).unwrap().iter_mut().for_each(|p| *p += 0.09);
            for column in columns(session) {
                column[60..84].fill(f64::NAN);
            }
        }),
        "left-out" => {
            let mut drawn = made(Kind::Held, 6, &usual, |session| {
                session.conditions.scrubber_warm = Some(false);
                session.conditions.time_on_loop = None;
            });
            drawn.options.left_out = vec![(660.0, 780.0), (900.0, 930.0), (f64::NAN, 5.0)];
            drawn
        }
        "volts" => made(Kind::Held, 6, &usual, |session| {
            for cell in &mut session.readings.cells {
                let CellSignal::Bar(column) = &cell.signal else { continue };
                // 10 mV in air of 0.2095 · 1.013 bar, straight through zero.
                let readings = column.iter().map(|p| p * 0.010 / (0.209_476 * 1.013)).collect();
                cell.signal =
                    CellSignal::Volts { readings, in_air: 0.010, in_oxygen: 0.010 * 0.995 / 0.209_476 };
            }
            session.cells.calibrated_at = Some(CalibratedAt {
                barometer: AbsolutePressure::from_bar(1.013),
                temperature: Temperature::from_c(20.0),
                humidity: 0.0,
                oxygen: 0.995,
            });
        }),
        "passed-the-floor" => {
            let extra = Extra { po2: Some(0.55), share: Some(0.1), minutes: -6.0, ..usual };
            made(Kind::Held, 31, &extra, |_| {})
        }
        "hostile-texts" => {
            let mut drawn = made(Kind::Held, 6, &usual, |session| {
                session.diver = Id::new("Дайвер_ЖЩШЮжщшюЫы-Ünïté-12").unwrap();
                session.readings.cells[0].name = "<script>alert(\"&amp;\")</script>".to_owned();
                session.readings.cells[1].name = "c2\u{202e}gnirts\u{0}\u{1b}[31m <&\">".to_owned();
                session.readings.cells[2].name =
                    "</text><image href=\"http://example.org/x.png\"/>".repeat(4);
                jump(session, 600.0, 0.09);
            });
            drawn.options.name = "../<&\"'>/ночь\u{202e}.toml".to_owned();
            drawn.options.why_not = Some("</text><g onload=\"x\">шланг отошёл <&\"> ".repeat(6));
            drawn
        }
        _ => panic!("no session {name}"),
    }
}

const NAMES: [&str; 16] = [
    "held-twice",
    "null",
    "venting",
    "sealed",
    "sealed-twice",
    "sealed-then-held",
    "topped",
    "line",
    "unmarked-jump",
    "many-events",
    "some-events",
    "pool",
    "left-out",
    "volts",
    "passed-the-floor",
    "hostile-texts",
];

/// All of them, worked out once.
fn all() -> &'static [(&'static str, Drawn)] {
    static ALL: OnceLock<Vec<(&str, Drawn)>> = OnceLock::new();
    ALL.get_or_init(|| NAMES.into_iter().map(|name| (name, named(name))).collect())
}

fn drawn(name: &str) -> &'static Drawn {
    &all().iter().find(|(n, _)| *n == name).unwrap().1
}
pub fn all_names() -> Vec<(&'static str, Drawn)> {
    all().to_vec()
}
