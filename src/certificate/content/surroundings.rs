//! Instruments and influences of a run, as a certificate names them.

use chrono::NaiveDate;

use super::figure::{Figure, NoUncertainty, Uncertainty, Unit};
use crate::bench::{Analysis, DEFAULT_BAROMETER_EXPANDED_PA, DEFAULT_TEMPERATURE_EXPANDED_K};
use crate::entry::{Amount, MeterKind, Papers, Run};
use crate::quantity::Quantity;
use crate::quantity::show::{range_to_text, reference_to_text, to_text};
use crate::report::number::{figures, limit_percent, shortest};

/// Coverage factor of what stands behind ± in the conditions of a run file.
const CONDITION_K: f64 = 2.0;
/// What k = 2 covers of a normal distribution (JCGM 100:2008, table G.1).
const P_OF_2: f64 = 0.9545;

/// An instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct Equipment {
    /// First part of its paths: `results/meter`.
    pub path: String,
    /// What it is.
    pub name: &'static str,
    /// Its name in the register.
    pub id: Option<String>,
    /// Number of its calibration certificate.
    pub certificate: Option<String>,
    /// Last day on which that is in date.
    pub due: Option<NaiveDate>,
    /// Whether it was in date when the run was taken.
    pub in_date: Option<bool>,
    /// What its papers say: name and text.
    pub papers: Vec<(&'static str, String)>,
}

/// An influence.
#[derive(Debug, Clone, PartialEq)]
pub struct Condition {
    /// Name.
    pub name: &'static str,
    /// How it was known.
    pub says: &'static str,
    /// Value with its uncertainty.
    pub figure: Figure,
}

/// The instruments of a run.
pub(super) fn equipment(path: &str, run: &Run) -> Vec<Equipment> {
    let day = run.taken.date_naive();
    let meter = &run.meter;
    let mut papers: Vec<(&'static str, String)> = vec![("kind", meter.kind.name().to_owned())];
    match &meter.kind {
        MeterKind::Mass { reads_at, made_for, gas_factor } => {
            papers.push(("litres at", reference_to_text(*reads_at)));
            papers.push(("calibrated for", made_for.name().to_owned()));
            papers.extend(gas_factor.map(|f| ("gas factor", factor(f.value, f.expanded))));
        }
        MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => {
            papers.push(("gas over water", if *wet { "yes" } else { "no" }.to_owned()));
        }
        MeterKind::Float { reads_at, made_for, gas_factor, .. } => {
            papers.push(("scale made for", format!("{}, {}", made_for.name(), reference_to_text(*reads_at))));
            papers.extend(gas_factor.map(|f| ("gas factor", factor(f.value, f.expanded))));
        }
    }
    papers.extend(of_papers(&meter.papers));
    let instrument = |key: &str,
                      name,
                      id: Option<String>,
                      certificate: &Option<String>,
                      due: Option<NaiveDate>,
                      papers| {
        Equipment {
            path: format!("{path}/{key}"),
            name,
            id,
            certificate: certificate.clone(),
            due,
            in_date: due.map(|due| day <= due),
            papers,
        }
    };
    let transducer = &run.transducer;
    vec![
        instrument(
            "meter",
            "flow meter",
            meter.id.as_ref().map(ToString::to_string),
            &meter.papers.certificate,
            meter.papers.due,
            papers,
        ),
        instrument(
            "transducer",
            "pressure transducer",
            transducer.id.as_ref().map(ToString::to_string),
            &transducer.papers.certificate,
            transducer.papers.due,
            of_papers(&transducer.papers),
        ),
    ]
}

fn factor(value: f64, expanded: Option<f64>) -> String {
    match expanded {
        Some(expanded) => format!("{} ± {} (k = 2)", shortest(value, 6), shortest(expanded, 3)),
        None => shortest(value, 6),
    }
}

fn of_papers<R: Quantity>(papers: &Papers<R::Difference, R>) -> Vec<(&'static str, String)> {
    let k = shortest(papers.coverage, 4);
    let with_k = |text: String| format!("± {text} (k = {k})");
    let mut rows = Vec::new();
    rows.extend(papers.gain.map(|gain| ("gain", with_k(format!("{} of the reading", limit_percent(gain))))));
    rows.extend(papers.zero.map(|zero| ("zero", with_k(to_text(zero)))));
    rows.extend(papers.noise.map(|noise| {
        let text = match noise {
            Amount::OfReading(share) => format!("{} of the reading", limit_percent(share)),
            Amount::Fixed(noise) => to_text(noise),
        };
        ("noise", with_k(text))
    }));
    rows.extend(papers.resolution.map(|step| ("resolution", to_text(step))));
    rows.extend(papers.range.map(|(low, high)| ("range", range_to_text(low, high))));
    rows
}

/// The influences of a run. Where a column gave the value point by point, it is the mean over the points.
pub(super) fn conditions(path: &str, run: &Run, analysis: &Analysis) -> Vec<Condition> {
    let given = &run.conditions;
    let mean = |of: fn(&crate::bench::Point) -> f64| {
        let n = analysis.points.len().max(1) as f64;
        analysis.points.iter().map(of).sum::<f64>() / n
    };
    let stated = "stated for the whole run";
    let column = "mean of the readings of all points";
    let from = |value: bool| if value { stated } else { column };
    let mut rows = vec![
        Condition {
            name: "gas temperature at the orifice",
            says: from(given.temperature.value.is_some()),
            figure: influence(
                path,
                "temperature",
                "gas temperature at the orifice",
                (
                    mean(|p| p.raw.temperature_k) - 273.15,
                    Some(given.temperature.expanded.map_or(DEFAULT_TEMPERATURE_EXPANDED_K, |d| d.as_k())),
                ),
                Unit::DegreeCelsius,
            ),
        },
        Condition {
            name: "barometer",
            says: from(given.barometer.value.is_some()),
            figure: influence(
                path,
                "barometer",
                "barometer",
                (
                    mean(|p| p.raw.ambient_pa) / 100.0,
                    Some(
                        given.barometer.expanded.map_or(DEFAULT_BAROMETER_EXPANDED_PA, |d| d.as_pa()) / 100.0,
                    ),
                ),
                Unit::HectoPascal,
            ),
        },
    ];
    let mut more = |key, name, says, value: Option<f64>, expanded: Option<f64>, unit| {
        if let Some(value) = value {
            let figure = influence(path, key, name, (value, expanded), unit);
            rows.push(Condition { name, says, figure });
        }
    };
    let back = &given.back_pressure;
    more(
        "back_pressure",
        "pressure downstream of the orifice over the barometer",
        if back.value.is_some() { stated } else { "not stated: taken as nought" },
        Some(back.value.map_or(0.0, |d| d.as_pa()) / 100.0),
        back.expanded.map(|d| d.as_pa() / 100.0),
        Unit::HectoPascal,
    );
    let humidity = &given.humidity;
    more(
        "humidity",
        "relative humidity of the gas in the meter",
        stated,
        humidity.value.map(|h| h * 100.0),
        humidity.expanded.map(|d| d * 100.0),
        Unit::Percent,
    );
    let meter = &given.meter_temperature;
    more(
        "meter_temperature",
        "gas temperature in the meter",
        stated,
        meter.value.map(|t| t.as_c()),
        meter.expanded.map(|d| d.as_k()),
        Unit::DegreeCelsius,
    );
    let pressure = &given.meter_pressure;
    more(
        "meter_pressure",
        "absolute pressure in the meter",
        stated,
        pressure.value.map(|p| p.as_pa() / 100.0),
        pressure.expanded.map(|d| d.as_pa() / 100.0),
        Unit::HectoPascal,
    );
    let water = &given.water_temperature;
    more(
        "water_temperature",
        "water temperature of the meter",
        stated,
        water.value.map(|t| t.as_c()),
        water.expanded.map(|d| d.as_k()),
        Unit::DegreeCelsius,
    );
    rows
}

fn influence(
    path: &str,
    key: &str,
    name: &'static str,
    (value, expanded): (f64, Option<f64>),
    unit: Unit,
) -> Figure {
    let path = format!("{path}/conditions/{key}");
    match expanded.filter(|u| *u > 0.0) {
        Some(expanded) => {
            let mut figure = Figure::measured(path, name, (value, expanded, CONDITION_K), unit);
            figure.uncertainty = Uncertainty::Expanded { expanded, k: CONDITION_K, p: P_OF_2 };
            figure
        }
        None => {
            let decimals = figures(value, 5).split_once('.').map_or(0, |(_, d)| d.len().min(2) as i32);
            Figure::plain(path, name, value, unit, decimals, NoUncertainty::NotStated)
        }
    }
}

/// What k = 2 covers, for the points.
pub(super) const fn k_and_p_of_points() -> (f64, f64) {
    (CONDITION_K, P_OF_2)
}
