//! `demo`: an invented shop's orifices, from input files through the real code to sheets and plots.
//!
//! The readings are drawn from a model of a bench with a fixed seed, so that the files are the same on every machine;
//! each says in its first line that it is invented. Nothing after the drawing knows that it is a demonstration: the
//! files are read and fitted like anybody's.

use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::WorkError;
use super::fit::{FitOutcome, FitRequest, fit};
use super::output::{make_folder, write_whole};
use crate::entry::{
    Acceptance, Amount, Build, Conditions, Id, Indication, Influence, LeftOut, Limits, Meter, MeterKind,
    Papers, PointReading, Purity, Purpose, Readings, Rule, Run, SeriesReadings, Sweep, Tolerance, Transducer,
    ZeroAndLeak,
};
use crate::gas::{self, Species};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, StpdFlow,
    Temperature, TemperatureDifference,
};
use crate::record::write_run;
use crate::report::Units;
use crate::stats::monte_carlo::Random;

/// First line of every file.
const INVENTED: &str =
    "# Invented for the demonstration: no such shop, orifice, instrument or certificate exists.\n";
/// Seed of all drawing.
const SEED: u64 = 2_026;
/// Barometer, gas temperature and downstream pressure of the invented bench.
const BAROMETER_PA: f64 = 100_920.0;
const GAS_C: f64 = 21.0;
/// What the instruments of the invented bench are off by: within their papers, the same for every run.
const METER_GAIN: f64 = 0.0021;
const METER_ZERO_L_MIN: f64 = -0.000_1;
const TRANSDUCER_GAIN: f64 = -0.000_5;
const TRANSDUCER_ZERO_PA: f64 = 250.0;

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

/// Fills `folder` and fits what it wrote there.
///
/// # Errors
/// When the folder cannot be written; an error in reading back or fitting would be a defect of the program.
pub fn demo(folder: &Path, units: Units) -> Result<Vec<DemoRun>, WorkError> {
    make_folder(folder)?;
    invented().into_iter().enumerate().map(|(i, orifice)| one(folder, units, i as u64, &orifice)).collect()
}

/// An orifice of the invented shop, and how its run is taken.
struct Invented {
    id: &'static str,
    about: &'static str,
    /// True diameter in µm, choke ratio and `k` of the discharge coefficient `1 − k/√Re`.
    diameter_um: f64,
    choke_ratio: f64,
    k: f64,
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

fn invented() -> Vec<Invented> {
    let plain = Invented {
        id: "",
        about: "",
        diameter_um: 73.6,
        choke_ratio: 0.50,
        k: 2.0,
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
            diameter_um: 54.0,
            k: 3.0,
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
            choke_ratio: 0.46,
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
    let bench = Bench { orifice };
    let mut random = Random::new(SEED, stream);
    let readings = if orifice.logged { bench.logged(&mut random) } else { bench.typed(&mut random) };
    let run = run_of(orifice, readings);
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

/// The invented bench with one orifice on it.
struct Bench<'a> {
    orifice: &'a Invented,
}

impl Bench<'_> {
    /// True flow in L/min STPD at a true gauge pressure.
    fn true_flow_l_min(&self, gauge_pa: f64) -> f64 {
        let p1 = AbsolutePressure::from_pa(gauge_pa + BAROMETER_PA);
        let t1 = Temperature::from_c(GAS_C);
        let d = self.orifice.diameter_um * 1e-6;
        let area = std::f64::consts::PI / 4.0 * d * d;
        let full = gas::choked_mass_flow(Species::Oxygen, area, p1, t1);
        let factor = gas::subsonic_factor(BAROMETER_PA / p1.as_pa(), self.orifice.choke_ratio);
        let reynolds = 4.0 * full * factor / (std::f64::consts::PI * d * Species::Oxygen.viscosity());
        let discharge = 1.0 - self.orifice.k / reynolds.max(1.0).sqrt();
        full * factor * discharge.max(0.1) / gas::stpd_density(Species::Oxygen) * 6e4
    }

    /// What the transducer shows, in pascals, before noise.
    fn shown_pa(gauge_pa: f64) -> f64 {
        gauge_pa * (1.0 + TRANSDUCER_GAIN) + TRANSDUCER_ZERO_PA
    }

    /// What the flow meter shows, in L/min at 20 °C and 101.325 kPa, before noise.
    fn shown_l_min(true_l_min: f64) -> f64 {
        true_l_min / meter_reads_at().stpd_factor() * (1.0 + METER_GAIN) + METER_ZERO_L_MIN
    }

    fn typed(&self, random: &mut Random) -> Readings {
        let top = self.orifice.steps.iter().copied().fold(0.0, f64::max);
        let peak = self.orifice.steps.iter().position(|s| *s >= top).unwrap_or(0);
        let points = self.orifice.steps.iter().enumerate().map(|(i, step)| {
            let gauge_pa = (step + 0.02 * random.normal()) * 1e5;
            let pressure_pa = Self::shown_pa(gauge_pa) + 200.0 * random.normal();
            let flow = Self::shown_l_min(self.true_flow_l_min(gauge_pa)) * (1.0 + 0.001 * random.normal());
            let pressure = if self.orifice.gauge_as_absolute {
                Indication::Absolute(AbsolutePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)))
            } else {
                Indication::Gauge(GaugePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)))
            };
            PointReading {
                pressure,
                flow: IndicatedFlow::from_l_min(to_decimals(flow, 4)),
                timed: None,
                pressure_scatter: None,
                flow_scatter: None,
                averaged: 1.0,
                temperature: None,
                barometer: None,
                meter_temperature: None,
                meter_pressure: None,
                sweep: Some(if i <= peak { Sweep::Rising } else { Sweep::Falling }),
                time_s: Some(90.0 * i as f64),
            }
        });
        Readings::Points(points.collect())
    }

    /// Two readings a second; the pressure settles within seconds, the meter follows a little later.
    fn logged(&self, random: &mut Random) -> Readings {
        const EVERY_S: f64 = 0.5;
        const HOLD_S: f64 = 45.0;
        const PRESSURE_SETTLES_S: f64 = 1.5;
        const METER_SETTLES_S: f64 = 1.0;
        let mut series = SeriesReadings::default();
        let (mut gauge_pa, mut meter) = (3.0e5, self.true_flow_l_min(3.0e5));
        let each = (HOLD_S / EVERY_S) as usize;
        for (i, step) in self.orifice.steps.iter().enumerate() {
            let target_pa = (step + 0.02 * random.normal()) * 1e5;
            for j in 0..each {
                gauge_pa += (target_pa - gauge_pa) * (1.0 - libm::exp(-EVERY_S / PRESSURE_SETTLES_S));
                meter +=
                    (self.true_flow_l_min(gauge_pa) - meter) * (1.0 - libm::exp(-EVERY_S / METER_SETTLES_S));
                let pressure_pa = Self::shown_pa(gauge_pa) + 200.0 * random.normal();
                let flow = Self::shown_l_min(meter) * (1.0 + 0.001 * random.normal());
                series.time_s.push((i * each + j) as f64 * EVERY_S);
                series.pressure_pa.push(GaugePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)).as_pa());
                series.flow_l_min.push(to_decimals(flow, 4));
            }
        }
        Readings::Series(series)
    }
}

fn run_of(orifice: &Invented, readings: Readings) -> Run {
    Run {
        orifice: id(orifice.id),
        build: orifice.build,
        gas: Species::Oxygen,
        purity: Some(Purity { fraction: 0.995, expanded: 0.003 }),
        purpose: Purpose::Acceptance,
        taken: taken(),
        technician: Some("A. Invented".into()),
        readings,
        conditions: Conditions {
            temperature: Influence {
                value: Some(Temperature::from_c(GAS_C)),
                expanded: Some(TemperatureDifference::from_k(1.0)),
            },
            barometer: Influence {
                value: Some(AbsolutePressure::from_pa(BAROMETER_PA)),
                expanded: Some(PressureDifference::from_pa(100.0)),
            },
            ..Conditions::default()
        },
        before: ZeroAndLeak {
            zero: Some(IndicatedFlow::from_l_min(-0.000_1)),
            leak_pa_s: Some(0.002e5 / 60.0),
        },
        after: ZeroAndLeak { zero: Some(IndicatedFlow::from_l_min(0.0)), leak_pa_s: None },
        meter: Meter {
            id: None,
            kind: MeterKind::Mass { reads_at: meter_reads_at(), made_for: Species::Oxygen, gas_factor: None },
            papers: Papers {
                gain: Some(0.008),
                zero: Some(IndicatedFlow::from_l_min(0.000_6)),
                noise: Some(Amount::OfReading(0.002)),
                resolution: Some(IndicatedFlow::from_l_min(0.000_1)),
                coverage: 2.0,
                range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
                certificate: Some("invented-FM-118".into()),
                due: NaiveDate::from_ymd_opt(2027, 3, 1),
            },
        },
        transducer: Transducer {
            id: None,
            papers: Papers {
                gain: Some(0.002),
                zero: Some(PressureDifference::from_bar(0.010)),
                noise: Some(Amount::Fixed(PressureDifference::from_bar(0.004))),
                resolution: Some(PressureDifference::from_bar(0.001)),
                coverage: 2.0,
                range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
                certificate: Some("invented-PT-031".into()),
                due: NaiveDate::from_ymd_opt(2027, 3, 1),
            },
        },
        acceptance: Some(Acceptance {
            id: None,
            ip: GaugePressure::from_bar(10.0),
            flow: StpdFlow::from_l_min(0.48),
            gas: Some(Species::Oxygen),
            tolerance: Tolerance::Relative(0.05),
            rule: Rule::Guarded,
            limits: Limits::DEFAULT,
        }),
        left_out: orifice
            .left_out
            .iter()
            .map(|(point, why)| LeftOut { point: *point, why: (*why).to_owned() })
            .collect(),
    }
}

fn meter_reads_at() -> ReferenceConditions {
    ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    }
}

/// An afternoon, with the offset of no place in particular.
fn taken() -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339("2026-11-12T14:00:00+00:00").unwrap_or_default()
}

/// The names above are sound; a test reads every file back.
fn id(name: &str) -> Id {
    Id::new(name).unwrap_or_else(|_| unreachable!("the demonstration's own names are sound"))
}

/// What a display of so many decimals shows.
fn to_decimals(value: f64, decimals: usize) -> f64 {
    format!("{value:.decimals$}").parse().unwrap_or(value)
}
