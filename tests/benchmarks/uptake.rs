//! A session from its readings to the uptake with its whole budget, another day and what would have helped.
//!
//! An hour on a held loop with two injections through a line, three cells: at 10 Hz, and as a million rows. Then 100 000 Monte Carlo
//! trials of two sessions of 20 minutes read every 5 s, two threads. Readings are those of the simulated loop of the tests, made
//! denser by straight lines with the cells' noise on them. `--write FOLDER` leaves the hour there for the alternative instead.

#![allow(clippy::print_stdout, reason = "a benchmark's result is what it prints")]
#![allow(clippy::unwrap_used, reason = "a benchmark that cannot go on has nothing to clean up")]

#[allow(dead_code, reason = "each benchmark uses its own part")]
mod common;
#[path = "../loop_simulator/mod.rs"]
mod loop_simulator;

use std::fmt::Write as _;
use std::hint::black_box;
use std::path::Path;

use common::{Seconds, Setting, time};
use ebbline::bench::correct::Source;
use ebbline::entry::{CellSignal, Injection, Place, What};
use ebbline::stats::monte_carlo::Plan;
use ebbline::uptake::{Estimate, InjectionLine, LineShift, SessionInput, uptake, uptake_by_monte_carlo};
use loop_simulator::{Dice, Extra, Feed, Kind, Scene, scene_through, truth};

/// Any seed; the time does not depend on it.
const SEED: u64 = 101;
const THREADS: usize = 2;
const HERTZ: usize = 10;
const MILLION: usize = 1_000_000;

fn main() {
    let setting = Setting::from_arguments();
    let arguments: Vec<String> = std::env::args().collect();
    let hour = hour(3_600 * HERTZ);
    if let Some(at) = arguments.iter().position(|a| a == "--write") {
        return write(&hour, Path::new(&arguments[at + 1]));
    }
    let times = if setting.in_earnest { 20 } else { 1 };
    let mut last = None;
    let seconds = time(setting.repetitions(21), times, || last = Some(estimate(black_box(&[&hour]))));
    let e = last.unwrap();
    println!(
        "uptake of an hour at {HERTZ} Hz, 3 cells: {}; uptake {:.12}, u {:.12}, another day {:.12} L/min",
        told(&seconds, 1e3, "ms"),
        e.uptake_l_min,
        e.u,
        e.next_day.u
    );

    let rows = if setting.in_earnest { MILLION } else { MILLION / 100 };
    let long = self::hour(rows);
    let seconds = time(setting.repetitions(9), 1, || {
        black_box(estimate(black_box(&[&long])));
    });
    println!("uptake of {rows} rows, 3 cells: {}", told(&seconds, 1.0, "s"));

    let two = two_sessions();
    let inputs = two.each_ref().map(input);
    let trials = if setting.in_earnest { 100_000 } else { 1_000 };
    let plan = Plan { trials, seed: SEED, threads: THREADS };
    let mut last = None;
    let seconds = time(setting.repetitions(9), 1, || {
        last = uptake_by_monte_carlo(black_box(&inputs), Place::Couch, &plan).unwrap();
    });
    let drawn = last.unwrap();
    println!(
        "uptake by {trials} Monte Carlo trials of two sessions on {THREADS} threads: {}; mean {:.9}, u {:.9} L/min",
        told(&seconds, 1.0, "s"),
        drawn.mean,
        drawn.u
    );
}

fn told(seconds: &Seconds, scale: f64, unit: &str) -> String {
    let Seconds { least, median, most } = seconds;
    format!("median {:.6} {unit} (from {:.6} to {:.6} {unit})", median * scale, least * scale, most * scale)
}

fn input(scene: &Scene) -> SessionInput<'_> {
    SessionInput { session: &scene.session, line: scene.line.as_ref() }
}

fn estimate(scenes: &[&Scene]) -> Estimate {
    let inputs: Vec<_> = scenes.iter().map(|s| input(s)).collect();
    uptake(&inputs).unwrap().places.remove(0).answer.unwrap()
}

/// An orifice whose line is known as a good bench knows it.
fn feed() -> Feed {
    let line = InjectionLine {
        intercept: -0.002,
        slope: 0.033,
        intercept_variance: 4e-7,
        slope_variance: 4e-9,
        covariance: -3.6e-8,
        random_dof: 12.0,
        common: vec![
            LineShift { source: Some(Source::MeterGain), intercept: -0.000_008, slope: 0.000_132 },
            LineShift { source: Some(Source::MeterZero), intercept: 0.000_3, slope: 0.0 },
            LineShift { source: Some(Source::TransducerZero), intercept: 0.000_165, slope: 0.0 },
        ],
    };
    let truth = line.clone();
    let passes = Box::new(move |p1_bar, _, kelvin| truth.flow(p1_bar, kelvin));
    Feed { passes, line, gauge_off_bar: 0.05, gauge_expanded_bar: 0.3 }
}

/// An hour with two injections, in so many rows.
fn hour(rows: usize) -> Scene {
    let mut dice = Dice::new(SEED);
    let mut truth = truth(&mut dice);
    truth.uptake = 0.30;
    let extra = Extra {
        every_s: 0.5,
        minutes: 40.0,
        share: Some(0.9),
        then: Some(0.75 * truth.uptake),
        ..Extra::default()
    };
    let mut scene = scene_through(Kind::Held, truth, &extra, &feed(), &mut dice);
    let readings = &mut scene.session.readings;
    let coarse = std::mem::take(&mut readings.time_s);
    let at_row = |row: usize| coarse.last().unwrap() * row as f64 / rows as f64;
    for cell in &mut readings.cells {
        let CellSignal::Bar(column) = &mut cell.signal else { unreachable!("the simulator reads bar") };
        *column = (0..rows)
            .map(|row| {
                let place = at_row(row) / 0.5;
                let (before, share) = (place as usize, place.fract());
                let after = (before + 1).min(column.len() - 1);
                let there = column[before] + share * (column[after] - column[before]);
                ((there + dice.normal(0.0, 0.001)) * 1e3).round() / 1e3
            })
            .collect();
    }
    readings.time_s = (0..rows).map(at_row).collect();
    scene
}

/// Twenty minutes each, on two days, through one line.
fn two_sessions() -> [Scene; 2] {
    let feed = feed();
    let mut dice = Dice::new(SEED);
    let mut truth = truth(&mut dice);
    truth.uptake = 0.30;
    [0, 1].map(|day| {
        let mut scene = scene_through(Kind::Held, truth.clone(), &Extra::default(), &feed, &mut dice);
        scene.session.taken += chrono::Duration::days(day);
        scene
    })
}

/// The hour and all that is stated of it, for the alternative.
fn write(scene: &Scene, folder: &Path) {
    let session = &scene.session;
    let columns: Vec<&Vec<f64>> = session
        .readings
        .cells
        .iter()
        .map(|cell| match &cell.signal {
            CellSignal::Bar(column) => column,
            CellSignal::Volts { .. } => unreachable!("the simulator reads bar"),
        })
        .collect();
    let mut table = String::from("t,c1,c2,c3\n");
    for (row, t) in session.readings.time_s.iter().enumerate() {
        // Seventeen digits bring back the same number.
        writeln!(table, "{t:.17e},{},{},{}", columns[0][row], columns[1][row], columns[2][row]).unwrap();
    }
    let events: Vec<_> = session
        .events
        .iter()
        .map(|event| match event.what {
            What::Injection(Injection::Ip(ip)) => {
                serde_json::json!({ "at_s": event.at_s, "ip_bar": ip.value.as_bar(), "expanded_bar": ip.expanded.unwrap().as_bar() })
            }
            _ => serde_json::json!({ "at_s": event.at_s }),
        })
        .collect();
    let line = scene.line.as_ref().unwrap();
    let volume = session.loop_volume.unwrap();
    let (conditions, assumed) = (&session.conditions, &session.assumptions);
    let stated = serde_json::json!({
        "events": events,
        "line": {
            "intercept": line.intercept, "slope": line.slope, "intercept_variance": line.intercept_variance,
            "slope_variance": line.slope_variance, "covariance": line.covariance, "random_dof": line.random_dof,
            "common": line.common.iter().map(|c| [c.intercept, c.slope]).collect::<Vec<_>>(),
        },
        "loop_volume_l": [volume.value.as_m3() * 1e3, volume.expanded.unwrap().as_m3() * 1e3],
        "purity": [session.oxygen.unwrap().fraction, session.oxygen.unwrap().expanded],
        "barometer_bar": [conditions.barometer.value.unwrap().as_bar(), conditions.barometer.expanded.unwrap().as_bar()],
        "loop_k": [conditions.loop_temperature.value.unwrap().as_k(), conditions.loop_temperature.expanded.unwrap().as_k()],
        "time_on_loop_s": conditions.time_on_loop.unwrap().as_s(),
        "cell_gain": session.cells.gain.unwrap(),
        "gas_k": [assumed.gas_temperature.0.as_k(), assumed.gas_temperature.1.as_k()],
        "washout_l_min": [assumed.washout.0.as_l_min(), assumed.washout.1.as_l_min()],
        "washout_min": assumed.washout_time.as_min(),
        "leak_l_min": [0.0, 0.004],
        "lung_share": assumed.lung_share,
        "lung_carbon_dioxide_bar": assumed.lung_carbon_dioxide.as_bar(),
        "wander": assumed.wander,
        "wander_min": assumed.wander_time.as_min(),
        "dead_time_s": assumed.dead_time.as_s(),
        "average_over_s": assumed.average_over.as_s(),
        "cell_limit_bar": assumed.cell_limit.as_bar(),
        "cell_faults": assumed.cell_faults,
        "day_spread": assumed.day_spread,
        "day_spread_weight": assumed.day_spread_weight,
    });
    std::fs::create_dir_all(folder).unwrap();
    std::fs::write(folder.join("session.csv"), table).unwrap();
    std::fs::write(folder.join("session.json"), stated.to_string()).unwrap();
}
