//! `demo`: an invented shop's orifices and an invented diver, from input files through the real code to sheets and plots.
//!
//! The readings are drawn from a model of a bench with a fixed seed, so that the files are the same on every machine;
//! each says in its first line that it is invented. Nothing after the drawing knows that it is a demonstration: the
//! files are read and fitted like anybody's.

mod breath;
mod certificate;
mod diver;
mod live;
mod model;
mod shop;

use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::WorkError;
use super::fit::{FitOutcome, FitRequest, fit};
use super::output::{make_folder, write_whole};
use crate::entry::{Build, Id, Purpose};
use crate::record::write_run;
use crate::report::Units;
use crate::stats::monte_carlo::Random;
use model::{Around, Bench, Day, Errors, Hole};

pub use certificate::DemoCertificate;
pub use diver::DemoDiver;
pub use live::DemoLogged;
pub use shop::DemoShop;

/// First line of every file.
const INVENTED: &str =
    "# Invented for the demonstration: no such shop, orifice, instrument or certificate exists.\n";
/// Seed of all drawing.
const SEED: u64 = 2_026;
/// What the instruments of the invented bench are off by under their last certificates.
const ERRORS: Errors = Errors {
    meter_gain: 0.0021,
    meter_zero_l_min: -0.000_1,
    transducer_gain: -0.000_5,
    transducer_zero_pa: 250.0,
};
/// The day on which its orifices were tried.
const DAY: Day = Day { barometer_pa: 100_920.0, gas_c: 21.0 };
const METER_CERTIFICATE: &str = "invented-FM-118";
const TRANSDUCER_CERTIFICATE: &str = "invented-PT-031";
/// The last days of those.
const METER_DUE: Option<NaiveDate> = NaiveDate::from_ymd_opt(2027, 3, 1);
const TRANSDUCER_DUE: Option<NaiveDate> = NaiveDate::from_ymd_opt(2027, 3, 1);

/// One orifice of the demonstration, fitted.
#[derive(Debug, Clone, PartialEq)]
pub struct DemoRun {
    /// The run file.
    pub file: PathBuf,
    /// Its readings.
    pub readings: PathBuf,
    /// Its plot.
    pub plot: PathBuf,
    /// What it shows.
    pub about: &'static str,
    /// What came of it.
    pub outcome: FitOutcome,
}

/// What the demonstration left.
#[derive(Debug, Clone, PartialEq)]
pub struct Demonstration {
    /// Single orifices, each with something to show.
    pub runs: Vec<DemoRun>,
    /// The book of the shop.
    pub shop: DemoShop,
    /// The certificate of one of its runs, and the amendment.
    pub certificate: Option<DemoCertificate>,
    /// The diver's sessions, uptake and setting.
    pub diver: DemoDiver,
    /// The run that was logged from the simulated bench; none where the system has no pseudo-terminals.
    pub logged: Option<DemoLogged>,
}

/// Fills `folder`: fits single orifices from their files, keeps the book of the shop, and rests its diver.
///
/// # Errors
/// When the folder cannot be written, or holds a book that no demonstration made; an error in reading back or fitting
/// would be a defect of the program.
pub fn demo(folder: &Path, units: Units) -> Result<Demonstration, WorkError> {
    shop::may_be_written(folder)?;
    make_folder(folder)?;
    let orifices = invented().into_iter().enumerate();
    let runs =
        orifices.map(|(i, orifice)| one(folder, units, i as u64, &orifice)).collect::<Result<_, _>>()?;
    let shop::KeptShop { shop, certificate, diver, logged } = shop::keep(folder, units)?;
    Ok(Demonstration { runs, shop, certificate, diver, logged })
}

/// An orifice of the invented shop, and how its run is taken.
struct Invented {
    id: &'static str,
    about: &'static str,
    hole: Hole,
    build: Build,
    /// Pressures in bar gauge, in the order they are set.
    steps: &'static [f64],
    /// Gauge readings in a column that is said to be absolute.
    gauge_as_absolute: bool,
    /// Logged as a time series instead of typed points.
    logged: bool,
    /// A point the technician leaves out, with a reason.
    left_out: Option<(usize, &'static str)>,
}

const UP_AND_DOWN: &[f64] =
    &[4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0, 11.0, 12.0, 13.0, 12.0, 11.0, 10.0, 9.0, 8.0, 7.0, 6.0, 5.0, 4.0];
const DOWN_TO_LOW: &[f64] = &[
    0.25, 0.45, 0.7, 1.0, 1.4, 2.0, 3.0, 4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0, 11.0, 12.0, 13.0, 11.0, 9.0,
    7.0, 5.0, 3.0, 1.4, 1.0, 0.7, 0.45,
];
const A_FEW: &[f64] = &[5.0, 7.0, 9.0, 11.0, 13.0, 12.0, 10.0, 8.0, 6.0, 4.0];

/// A hole that passes 0.48 L/min of oxygen at 10 bar.
const GOOD: Hole = Hole { diameter_um: 73.6, choke_ratio: 0.50, k: 2.0 };

fn invented() -> Vec<Invented> {
    let plain = Invented {
        id: "",
        about: "",
        hole: GOOD,
        build: Build::ShortTube,
        steps: UP_AND_DOWN,
        gauge_as_absolute: false,
        logged: false,
        left_out: None,
    };
    vec![
        Invented {
            id: "demo-good",
            about: "a good orifice, one point left out because the hose was touched",
            left_out: Some((12, "hose touched while reading")),
            ..plain
        },
        Invented {
            id: "demo-half-blocked",
            about: "the same kind, half blocked",
            hole: Hole { diameter_um: 54.0, k: 3.0, ..GOOD },
            ..plain
        },
        Invented {
            id: "demo-gauge-as-absolute",
            about: "gauge readings in a column said to be absolute: the line crosses one atmosphere off",
            gauge_as_absolute: true,
            ..plain
        },
        Invented {
            id: "demo-swept-low",
            about: "swept down into the subsonic range: its choke ratio is measured",
            hole: Hole { choke_ratio: 0.46, ..GOOD },
            build: Build::Unknown,
            steps: DOWN_TO_LOW,
            ..plain
        },
        Invented {
            id: "demo-logged",
            about: "logged as a time series: steady spans become points",
            steps: A_FEW,
            logged: true,
            ..plain
        },
    ]
}

fn one(folder: &Path, units: Units, stream: u64, orifice: &Invented) -> Result<DemoRun, WorkError> {
    let bench = Bench {
        hole: orifice.hole,
        errors: ERRORS,
        day: DAY,
        steps: orifice.steps,
        gauge_as_absolute: orifice.gauge_as_absolute,
    };
    let mut random = Random::new(SEED, stream);
    let readings = if orifice.logged { bench.logged(&mut random) } else { bench.typed(&mut random) };
    let around = Around {
        orifice: id(orifice.id),
        build: orifice.build,
        purpose: Purpose::Acceptance,
        taken: taken(),
        technician: "A. Invented",
        day: DAY,
        meter: model::meter(None, METER_CERTIFICATE, METER_DUE),
        transducer: model::transducer(None, TRANSDUCER_CERTIFICATE, TRANSDUCER_DUE),
        acceptance: model::limits(None, 0.48),
        left_out: orifice.left_out,
    };
    let run = model::run_of(around, readings);
    let file = folder.join(format!("{}.toml", orifice.id));
    let readings_name = format!("{}.csv", orifice.id);
    let plot = folder.join(format!("{}.svg", orifice.id));
    let (toml, csv) = write_run(&run, &readings_name);
    let readings = folder.join(&readings_name);
    write_whole(&readings, csv.as_bytes())?;
    write_whole(&file, format!("{INVENTED}{toml}").as_bytes())?;
    let outcome = fit(&FitRequest {
        // A folder named without a slash still makes a path here.
        run: Path::new(".").join(&file).display().to_string(),
        plot: Some(plot.clone()),
        units,
        ..FitRequest::default()
    })?;
    Ok(DemoRun { file, readings, plot, about: orifice.about, outcome })
}

/// An afternoon, with the offset of no place in particular.
fn taken() -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339("2026-11-12T14:00:00+00:00").unwrap_or_default()
}

/// The names above are sound; a test reads every file back.
fn id(name: &str) -> Id {
    Id::new(name).unwrap_or_else(|_| unreachable!("the demonstration's own names are sound"))
}
