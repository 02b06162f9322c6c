//! What each common source of a run may be off by, and the random part of each point.
//!
//! Comes in: the papers and conditions of a run. Goes out: standard uncertainties, in the units of
//! [`Source`](super::correct::Source). Expanded uncertainties are divided by their coverage factor here and nowhere
//! else. Left out: correlation between sources.

use super::correct::{Corrected, FloatLaws, Raw, Source};
use super::warning::Warning;
use crate::entry::{Amount, MeterKind, Papers, PointReading, Run};

/// Expanded uncertainty of a temperature of which none is stated, in kelvins, k = 2 (common practice, no source).
pub const DEFAULT_TEMPERATURE_EXPANDED_K: f64 = 1.0;
/// Expanded uncertainty of a barometer of which none is stated, in pascals, k = 2 (common practice, no source).
pub const DEFAULT_BAROMETER_EXPANDED_PA: f64 = 200.0;
/// Coverage factor of what stands after a `±` in the conditions.
const CONDITION_COVERAGE: f64 = 2.0;

/// How the error of a source is distributed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Shape {
    /// Normal.
    Normal,
    /// Rectangular.
    Rectangular,
}

/// What one source may be off by.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CommonSource {
    /// Which.
    pub source: Source,
    /// Its standard uncertainty, in the unit of the source.
    pub standard_uncertainty: f64,
    /// Its distribution.
    pub shape: Shape,
}

/// The sources of a run that are off by anything, in the order of [`Source::ALL`], and what had to be assumed.
#[must_use]
pub(super) fn common_sources(run: &Run, warnings: &mut Vec<Warning>) -> Vec<CommonSource> {
    let mut sources = Vec::new();
    let mut normal = |source, standard_uncertainty: Option<f64>| {
        if let Some(u) = standard_uncertainty.filter(|u| *u > 0.0) {
            sources.push(CommonSource { source, standard_uncertainty: u, shape: Shape::Normal });
        }
    };
    let (meter, transducer, conditions) = (&run.meter.papers, &run.transducer.papers, &run.conditions);
    if meter.gain.is_none() {
        warnings.push(Warning::MeterGainUnknown);
    }
    if transducer.gain.is_none() && transducer.zero.is_none() {
        warnings.push(Warning::TransducerPapersUnknown);
    }
    normal(Source::MeterGain, meter.gain.map(|g| g / meter.coverage));
    normal(Source::MeterZero, meter.zero.map(|z| z.as_l_min() / meter.coverage));
    normal(Source::TransducerGain, transducer.gain.map(|g| g / transducer.coverage));
    normal(Source::TransducerZero, transducer.zero.map(|z| z.as_pa() / transducer.coverage));
    let mut stated = |given: Option<f64>, default: f64, warning| {
        given.unwrap_or_else(|| {
            warnings.push(warning);
            default
        }) / CONDITION_COVERAGE
    };
    let barometer = stated(
        conditions.barometer.expanded.map(|d| d.as_pa()),
        DEFAULT_BAROMETER_EXPANDED_PA,
        Warning::BarometerAssumed,
    );
    let temperature = stated(
        conditions.temperature.expanded.map(|d| d.as_k()),
        DEFAULT_TEMPERATURE_EXPANDED_K,
        Warning::TemperatureAssumed,
    );
    normal(Source::Barometer, Some(barometer));
    normal(Source::GasTemperature, Some(temperature));
    normal(Source::BackPressure, conditions.back_pressure.expanded.map(|d| d.as_pa() / CONDITION_COVERAGE));
    if !matches!(run.meter.kind, MeterKind::Mass { .. }) {
        let (own_temperature, own_pressure) = meter_has_its_own(run);
        if own_temperature {
            let k = stated(
                conditions.meter_temperature.expanded.map(|d| d.as_k()),
                DEFAULT_TEMPERATURE_EXPANDED_K,
                Warning::MeterTemperatureAssumed,
            );
            normal(Source::MeterTemperature, Some(k));
        }
        if own_pressure {
            let pa = stated(
                conditions.meter_pressure.expanded.map(|d| d.as_pa()),
                DEFAULT_BAROMETER_EXPANDED_PA,
                Warning::MeterPressureAssumed,
            );
            normal(Source::MeterPressure, Some(pa));
        }
        // Water in the gas round a float is not corrected for, so its ± is no source either.
        if !matches!(run.meter.kind, MeterKind::Float { .. }) {
            normal(Source::Humidity, conditions.humidity.expanded.map(|d| d / CONDITION_COVERAGE));
        }
        if matches!(run.meter.kind, MeterKind::Volumetric { wet: true } | MeterKind::Timed { wet: true })
            && conditions.water_temperature.value.is_some()
        {
            let k = stated(
                conditions.water_temperature.expanded.map(|d| d.as_k()),
                DEFAULT_TEMPERATURE_EXPANDED_K,
                Warning::WaterTemperatureAssumed,
            );
            normal(Source::WaterTemperature, Some(k));
        }
    }
    if let MeterKind::Mass { made_for, gas_factor, .. } | MeterKind::Float { made_for, gas_factor, .. } =
        &run.meter.kind
        && *made_for != run.gas
    {
        if let Some(factor) = gas_factor {
            if factor.expanded.is_none() {
                warnings.push(Warning::GasFactorWithoutUncertainty);
            }
            normal(Source::GasFactor, factor.expanded.map(|d| d / factor.value / CONDITION_COVERAGE));
        } else {
            // Only a float comes here without a factor; `record` refuses a mass-reading meter.
            let laws = FloatLaws::of(*made_for, run.gas);
            warnings.push(Warning::FloatLawUnknown {
                by_density: laws.by_density,
                by_viscosity: laws.by_viscosity,
            });
            sources.push(CommonSource {
                source: Source::FloatLaw,
                standard_uncertainty: laws.relative_half_width() / 3.0_f64.sqrt(),
                shape: Shape::Rectangular,
            });
        }
    }
    sources
}

/// Random standard uncertainty of the pressure (bar) and of the corrected flow (L/min STPD, 20 °C) of one point.
///
/// The larger of the observed scatter of the mean and the noise of the papers over `sqrt(n)`, and the resolution as
/// `δ/√12`. The flow's part is none when the papers state neither noise nor resolution and no scatter was observed:
/// then only the scatter about the line can tell.
#[must_use]
pub(super) fn random_part(
    run: &Run,
    reading: &PointReading,
    raw: &Raw,
    corrected: &Corrected,
) -> (f64, Option<f64>) {
    let pressure_pa = of_reading(
        &run.transducer.papers,
        raw.shown_pa,
        reading.pressure_scatter.map(|d| d.as_pa()),
        reading.averaged,
        |d| d.as_pa(),
    );
    let flow = of_reading(
        &run.meter.papers,
        raw.shown_l_min,
        reading.flow_scatter.map(|d| d.as_l_min()),
        reading.averaged,
        |d| d.as_l_min(),
    );
    (pressure_pa.unwrap_or(0.0) / 1e5, flow.map(|u| u * corrected.per_shown))
}

/// Whether the meter's temperature and pressure are given apart from the orifice's.
fn meter_has_its_own(run: &Run) -> (bool, bool) {
    use crate::entry::Readings;
    let (by_column_t, by_column_p) = match &run.readings {
        Readings::Points(points) => (
            points.iter().any(|p| p.meter_temperature.is_some()),
            points.iter().any(|p| p.meter_pressure.is_some()),
        ),
        Readings::Series(series) => {
            (series.meter_temperature_k.is_some(), series.meter_pressure_pa.is_some())
        }
    };
    (
        by_column_t || run.conditions.meter_temperature.value.is_some(),
        by_column_p || run.conditions.meter_pressure.value.is_some(),
    )
}

/// Standard uncertainty of one indication on its own, in its own unit; none if nothing is known and it is not zero.
fn of_reading<D: Copy, R>(
    papers: &Papers<D, R>,
    shown: f64,
    scatter: Option<f64>,
    averaged: f64,
    number: impl Fn(D) -> f64,
) -> Option<f64> {
    let noise = papers.noise.map(|noise| {
        let expanded = match noise {
            Amount::OfReading(share) => share * shown.abs(),
            Amount::Fixed(d) => number(d),
        };
        expanded / papers.coverage / averaged.max(1.0).sqrt()
    });
    let resolution = papers.resolution.map(|d| number(d) / 12.0_f64.sqrt());
    let larger = match (noise, scatter) {
        (Some(a), Some(b)) => Some(a.max(b)),
        (a, b) => a.or(b),
    };
    match (larger, resolution) {
        (None, None) => None,
        (a, b) => {
            let (a, b) = (a.unwrap_or(0.0), b.unwrap_or(0.0));
            Some((a * a + b * b).sqrt()).filter(|u| *u > 0.0)
        }
    }
}
