//! Which few low points would settle the choke ratio.
//!
//! Comes in: an analysis whose choke ratio is only bounded. Goes out: the smallest of a ladder of plans that makes
//! it measured, found by doing it on the model: points are made up at the pressures of the plan, with the random
//! uncertainty the papers give there, for choke ratios over the whole of what is still possible, and the posterior
//! is worked out again. A plan is named when the chance that it settles the matter, averaged over those choke ratios,
//! is high enough. Left out: plans made for one orifice alone.

use super::choke::{LARGEST_K, MEASURED_HALF_WIDTH, Origin};
use super::choke_model::modelled_flow;
use super::correct::{Correction, Raw, Shift};
use super::{Analysis, known_of_choking};
use crate::entry::{Indication, PointReading, Run};
use crate::quantity::{AbsolutePressure, GaugePressure, IndicatedFlow};
use crate::stats::distribution::normal_cdf;

/// Least chance, by the model, that a plan settles the matter. In the simulated study plans named so settle it in 96 to
/// 99 of 100 runs, for good instruments and for poor ones.
const LEAST_CHANCE: f64 = 0.92;
/// How far the half-width that comes out scatters about the one that was foreseen, relative (simulated study).
const FORESEEN_SCATTER: f64 = 0.1;
/// Quantiles of the choke ratio for which a plan is tried, lowest first: there a plan is worth least.
const TRIED: [f64; 10] = [0.05, 0.15, 0.25, 0.35, 0.45, 0.55, 0.65, 0.75, 0.85, 0.95];
/// Pressure ratios p2/p1 of the plans, fewest points first.
const PLANS: [&[f64]; 6] = [
    &[0.55, 0.70],
    &[0.45, 0.60, 0.75],
    &[0.40, 0.50, 0.60, 0.70, 0.80],
    &[0.40, 0.50, 0.60, 0.70, 0.80, 0.40, 0.50, 0.60, 0.70, 0.80],
    &[0.30, 0.35, 0.40, 0.45, 0.50, 0.55, 0.60, 0.65, 0.70, 0.75, 0.80, 0.85],
    &[
        0.30, 0.35, 0.40, 0.45, 0.50, 0.55, 0.60, 0.65, 0.70, 0.75, 0.80, 0.85, 0.30, 0.35, 0.40, 0.45, 0.50,
        0.55, 0.60, 0.65, 0.70, 0.75, 0.80, 0.85,
    ],
];
/// The regulator is stepped in these, bar.
const STEP_BAR: f64 = 0.05;

/// What to do about a choke ratio that is only bounded.
#[derive(Debug, Clone, PartialEq)]
pub enum LowPoints {
    /// Points at these pressures, bar gauge, highest first, would settle it.
    At(Vec<f64>),
    /// With these instruments no plan of low points, up to 24 of them, would surely settle it.
    NotWithTheseInstruments,
}

/// The advice; none when the choke ratio is measured already, or when the model does not describe the points.
#[must_use]
pub fn low_points(run: &Run, analysis: &Analysis) -> Option<LowPoints> {
    if analysis.choke.origin == Origin::Measured || !analysis.choke.model_fits {
        return None;
    }
    let correction = Correction::of(run);
    let template = analysis.points.iter().find(|p| p.used())?;
    let meter_range = run.meter.papers.range.map(|(low, high)| (low.as_l_min(), high.as_l_min()));
    let transducer_range = run.transducer.papers.range.map(|(low, high)| (low.as_pa(), high.as_pa()));
    // In the middle of what k may be: at an end of its range it would look better known than it is.
    let modelled = |p1_bar: f64, p2_bar: f64, b: f64| {
        modelled_flow(run.gas, (analysis.line.random.slope, LARGEST_K / 2.0, b), p1_bar, p2_bar)
    };
    for plan in PLANS {
        let pressures: Vec<f64> = plan
            .iter()
            .map(|ratio| {
                let p1 = template.downstream_bar_abs / ratio;
                let gauge = p1 - template.raw.ambient_pa / 1e5;
                (gauge / STEP_BAR).round() * STEP_BAR
            })
            .filter(|gauge| *gauge > 0.0)
            .collect();
        let chance = |b: f64| {
            let mut points = analysis.points.clone();
            for point in &mut points {
                if !matches!(point.why_not, Some(super::WhyNot::LeftOut(_))) {
                    point.why_not = None;
                    // What stands there already is taken as the model would have it for this choke ratio.
                    let flow = modelled(point.pressure_bar_abs, point.downstream_bar_abs, b);
                    let (_, per_shown) = shown_for(&correction, &point.raw, flow);
                    point.raw.shown_l_min = flow / per_shown;
                    point.flow_l_min = flow;
                }
            }
            for gauge in &pressures {
                let mut raw = template.raw;
                raw.shown_pa = gauge * 1e5 + if raw.absolute { raw.ambient_pa } else { 0.0 };
                let at = correction.apply(&raw, &Shift::NONE);
                let flow = modelled(at.p1_bar, at.p2_bar, b);
                let (shown, _) = shown_for(&correction, &raw, flow);
                let beyond = |range: Option<(f64, f64)>, shown: f64| {
                    range.is_some_and(|(low, high)| shown < low || shown > high)
                };
                if beyond(meter_range, shown) || beyond(transducer_range, raw.shown_pa) {
                    return 0.0;
                }
                raw.shown_l_min = shown;
                let corrected = correction.apply(&raw, &Shift::NONE);
                let (pressure_u, flow_u) =
                    super::sources::random_part(run, &as_reading(&raw), &raw, &corrected);
                let mut point = template.clone();
                point.raw = raw;
                point.pressure_bar_abs = corrected.p1_bar;
                point.downstream_bar_abs = corrected.p2_bar;
                point.flow_l_min = corrected.flow_l_min;
                point.pressure_u = pressure_u;
                point.flow_u = flow_u.unwrap_or(template.flow_u);
                points.push(point);
            }
            let posterior = known_of_choking(run, &points, &correction, &analysis.sources);
            normal_cdf((MEASURED_HALF_WIDTH / posterior.half_width() - 1.0) / FORESEEN_SCATTER)
        };
        if likely(|p| chance(analysis.choke.quantile(p))) {
            let mut sorted = pressures;
            sorted.sort_by(|a, b| b.total_cmp(a));
            return Some(LowPoints::At(sorted));
        }
    }
    Some(LowPoints::NotWithTheseInstruments)
}

/// Whether the mean chance over what is tried reaches [`LEAST_CHANCE`]; stops as soon as it no longer can.
fn likely(chance_at: impl Fn(f64) -> f64) -> bool {
    let most_missing = (1.0 - LEAST_CHANCE) * TRIED.len() as f64;
    let mut missing = 0.0;
    TRIED.iter().all(|p| {
        missing += 1.0 - chance_at(*p);
        missing <= most_missing
    })
}

/// What the meter shows for a corrected flow, and the flow for one litre shown.
fn shown_for(correction: &Correction, raw: &Raw, flow_l_min: f64) -> (f64, f64) {
    let per_shown = correction.apply(raw, &Shift::NONE).per_shown;
    (flow_l_min / per_shown, per_shown)
}

fn as_reading(raw: &Raw) -> PointReading {
    let pressure = if raw.absolute {
        Indication::Absolute(AbsolutePressure::from_pa(raw.shown_pa))
    } else {
        Indication::Gauge(GaugePressure::from_pa(raw.shown_pa))
    };
    PointReading {
        pressure,
        flow: IndicatedFlow::from_l_min(raw.shown_l_min),
        timed: None,
        pressure_scatter: None,
        flow_scatter: None,
        averaged: 1.0,
        temperature: None,
        barometer: None,
        meter_temperature: None,
        meter_pressure: None,
        sweep: None,
        time_s: None,
    }
}
