//! Files of an invented diver and of the orifice that suits, for tests that call the program.

#![allow(dead_code, clippy::unwrap_used, reason = "a test may panic, and not every test calls every helper")]

use chrono::DateTime;
use ebbline::entry::{LineReference, Session};
use ebbline::record::write_session;
use ebbline::uptake::InjectionLine;

use crate::bench_files::{RUN, readings};
use crate::desk::Desk;
use crate::loop_simulator::{Dice, Extra, Feed, Kind, Truth, scene_of, scene_through, truth};

/// The orifice of the run files: this share of the flows of the one in `bench_files`, 0.26 L/min STPD at 10 bar.
pub(crate) const SHARE: f64 = 0.55;
/// What the invented diver takes up, L/min STPD.
pub(crate) const UPTAKE: f64 = 0.3;
/// The day of every setting, before the calibrations fall due.
pub(crate) const ON: [&str; 2] = ["--on", "2026-12-01"];

/// Writes a run file of an orifice whose flows are `share` of those in `bench_files`, with its readings beside it.
pub(crate) fn write_orifice(desk: &Desk, name: &str, orifice: &str, share: f64) {
    write_run_of(desk, name, share, |toml| toml.replace("\"CMF-0417\"", &format!("{orifice:?}")));
}

/// The same, with the text of the run file changed at the end.
pub(crate) fn write_run_of(desk: &Desk, name: &str, share: f64, change: impl Fn(String) -> String) {
    let mut csv = String::from("ip,flow,sweep\n");
    for line in readings().lines().skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        csv.push_str(&format!("{},{:.5},{}\n", cells[0], share * cells[1].parse::<f64>().unwrap(), cells[2]));
    }
    let toml = RUN
        .replace("\"run.csv\"", &format!("\"{name}.csv\""))
        .replace("flow = \"0.48 L/min\"", &format!("flow = \"{:.4} L/min\"", 0.48 * share));
    desk.write(&format!("{name}.toml"), change(toml));
    desk.write(&format!("{name}.csv"), csv);
}

/// The day of the diver, without anything drawn that would make one test another's luck.
fn the_truth(dice: &mut Dice) -> Truth {
    Truth {
        uptake: UPTAKE,
        wander: 0.02,
        volume_l: 7.0,
        lungs_l: 2.8,
        loop_c: 33.0,
        ambient_bar: 1.013,
        leak: 0.002,
        nitrogen: 0.040,
        purity: 0.995,
        cell_gain: 0.0,
        cell_offsets: [0.001, 0.0, -0.001],
        ..truth(dice)
    }
}

const EXTRA: Extra = Extra {
    every_s: 5.0,
    minutes: 0.0,
    then: None,
    volume_u_l: 0.15,
    po2: None,
    share: Some(0.85),
    errors: None,
};

/// A session with stated flows.
pub(crate) fn stated(kind: Kind, seed: u64) -> Session {
    let mut dice = Dice::new(seed);
    let truth = the_truth(&mut dice);
    scene_of(kind, truth, &EXTRA, &mut dice).session
}

/// A session through the orifice of [`SHARE`], by the intermediate pressures that the diver set.
pub(crate) fn through(kind: Kind, seed: u64, line: LineReference) -> Session {
    let mut dice = Dice::new(seed);
    let truth = the_truth(&mut dice);
    // The readings of `bench_files` in STPD: 0.0466 L/min a bar at 20 °C, from 0.95 bar below a barometer of 1.0092 bar.
    let slope = 0.0466 * SHARE * 273.15 / 293.15;
    let passes = move |upstream_bar: f64, _: f64, kelvin: f64| {
        slope * (upstream_bar - 0.0592) * (294.15 / kelvin).sqrt()
    };
    let feed = Feed {
        passes: Box::new(passes),
        line: InjectionLine {
            intercept: 0.0,
            slope,
            intercept_variance: 0.0,
            slope_variance: 0.0,
            covariance: 0.0,
            random_dof: f64::INFINITY,
            common: Vec::new(),
        },
        gauge_off_bar: 0.0,
        gauge_expanded_bar: 0.2,
    };
    let mut session = scene_through(kind, truth, &EXTRA, &feed, &mut dice).session;
    session.line = Some(line);
    session
}

/// A session taken at another time.
pub(crate) fn at(mut session: Session, taken: &str) -> Session {
    session.taken = DateTime::parse_from_rfc3339(taken).unwrap();
    session
}

/// Writes a session file and its readings.
pub(crate) fn write(desk: &Desk, name: &str, session: &Session) {
    let beside = name.rsplit_once('/').map_or(name, |(_, beside)| beside);
    let (toml, csv) = write_session(session, &format!("{beside}.csv"));
    desk.write(&format!("{name}.toml"), toml);
    desk.write(&format!("{name}.csv"), csv);
}

/// Three sessions through the orifice that `line` names, on two days: `couch-1.toml` to `couch-3.toml`.
pub(crate) fn write_three(desk: &Desk, line: &LineReference) {
    for (name, kind, seed, taken) in [
        ("couch-1", Kind::HeldTwice, 1, "2026-11-20T18:05:00+11:00"),
        ("couch-2", Kind::Sealed, 2, "2026-11-20T19:10:00+11:00"),
        ("couch-3", Kind::HeldTwice, 3, "2026-11-24T18:30:00+11:00"),
    ] {
        write(desk, name, &at(through(kind, seed, line.clone()), taken));
    }
}

/// The line of the run file `small.toml`.
pub(crate) fn small_file() -> LineReference {
    LineReference::RunFile("small.toml".to_owned())
}
