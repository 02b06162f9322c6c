//! Time series of readings: what of them is steady, and the mean of it.
//!
//! Takes columns as they were logged (seconds, pascals, indicated flow; NaN for a missing reading) and returns steady
//! points with the scatter of their means, beside everything that was not used and why. A raw reading is never
//! changed: spikes, holes and frozen stretches are only passed over. Equations and sources stand in the parts:
//! [`steady`], [`settle`], [`mean`], [`frozen`], [`spike`], [`join`]. Left out: corrections of any kind, and what is
//! known of the instruments' noise from their papers.

pub mod steady;
pub mod mean;
pub mod settle;
pub mod frozen;
pub mod spike;
pub mod join;
mod block;

use std::borrow::Cow;
use std::ops::Range;

use crate::entry::{Indication, PointReading, SeriesReadings, Sweep};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, STANDARD_ATMOSPHERE_PA, Temperature,
};

pub use frozen::{Channel, FrozenOptions, Stretch, TimeBreak};
pub use mean::{MeanOfSpan, mean_of_span};
pub use steady::{Rejected, Rejection, SteadyOptions, SteadySpan, steady_spans};

/// The steady points of a series, and what did not become one.
#[derive(Debug, Clone, PartialEq)]
pub struct SteadyPoints {
    /// A point for each steady span, in order.
    pub points: Vec<PointReading>,
    /// The spans, one for each point.
    pub spans: Vec<SteadySpan>,
    /// Stretches that nearly were steady, in order, with the reason.
    pub rejected: Vec<Rejected>,
    /// What was passed over.
    pub remarks: Vec<Remark>,
}

/// Something in the series that was passed over.
#[derive(Debug, Clone, PartialEq)]
pub enum Remark {
    /// Nothing was logged for longer than a gap that is bridged.
    Gap(TimeBreak),
    /// Time runs back.
    TimeRunsBack(TimeBreak),
    /// Rows that have no finite time.
    NoTime {
        /// How many.
        rows: usize,
    },
    /// A channel has no readings for longer than a gap that is bridged.
    Missing(Stretch),
    /// A channel repeats one value while the other moves.
    Frozen(Stretch),
    /// Readings that stand out alone.
    Spikes {
        /// The channel.
        channel: Channel,
        /// Their rows, counted from 0.
        rows: Vec<usize>,
    },
}

/// The steady points of a series.
///
/// Each is at the mean indications of a steady span; `averaged` is the smaller effective number of independent
/// readings of the two channels, of which one that shows no scatter at all (coarser than its noise) does not count.
/// The sweep is the direction from the level before, for the first that to the level after; a level within
/// `least_step_pa` of the one before keeps its direction. Rows beyond the shortest of the three needed columns are not
/// looked at.
#[must_use]
pub fn steady_points(series: &SeriesReadings, options: &SteadyOptions) -> SteadyPoints {
    let rows = series.time_s.len().min(series.pressure_pa.len()).min(series.flow_l_min.len());
    let time_s = &series.time_s[..rows];
    let mut remarks = Vec::new();
    let mut left_out: Vec<Range<usize>> = Vec::new();

    let without_time = time_s.iter().filter(|t| !t.is_finite()).count();
    if without_time > 0 {
        remarks.push(Remark::NoTime { rows: without_time });
    }
    let gap_s = |values: &[f64]| {
        let interval_s = typical_interval_s(time_s, values).unwrap_or(0.0);
        options.longest_gap_s.max(options.longest_gap_intervals * interval_s)
    };
    for at in frozen::time_breaks(time_s, gap_s(time_s)) {
        left_out.push(at.row..at.row);
        remarks.push(if at.to_s < at.from_s { Remark::TimeRunsBack(at) } else { Remark::Gap(at) });
    }
    let mut clean = |channel: Channel, values: &[f64]| {
        let rows = spike::spikes(time_s, values);
        if !rows.is_empty() {
            remarks.push(Remark::Spikes { channel, rows: rows.clone() });
        }
        rows
    };
    let pressure_spikes = clean(Channel::Pressure, &series.pressure_pa[..rows]);
    let flow_spikes = clean(Channel::Flow, &series.flow_l_min[..rows]);
    let pressure_pa = without(&series.pressure_pa[..rows], &pressure_spikes);
    let flow = without(&series.flow_l_min[..rows], &flow_spikes);

    let habit = FrozenOptions::default();
    let both = [(Channel::Pressure, &pressure_pa, &flow), (Channel::Flow, &flow, &pressure_pa)];
    for (channel, values, other) in both {
        for stretch in frozen::missing(channel, time_s, values, gap_s(values)) {
            left_out.push(stretch.rows.clone());
            remarks.push(Remark::Missing(stretch));
        }
        for stretch in frozen::frozen(channel, time_s, values, other, &habit) {
            left_out.push(stretch.rows.clone());
            remarks.push(Remark::Frozen(stretch));
        }
    }
    left_out.sort_by_key(|rows| (rows.start, rows.end));

    let ambient_pa = if series.pressure_is_absolute { 0.0 } else { STANDARD_ATMOSPHERE_PA };
    let (spans, rejected) = steady_spans(time_s, &pressure_pa, &flow, ambient_pa, &left_out, options);
    let sweeps = sweeps(&spans, &rejected, options.least_step_pa);
    let points = spans.iter().zip(sweeps).map(|(span, sweep)| point(series, span, sweep, options)).collect();
    SteadyPoints { points, spans, rejected, remarks }
}

/// The median interval between finite readings of a channel, in seconds; intervals of zero do not count.
fn typical_interval_s(time_s: &[f64], values: &[f64]) -> Option<f64> {
    // Some thousand intervals, spread over the record, give a median.
    let every = values.len() / 4096 + 1;
    let mut intervals = Vec::new();
    let mut last = f64::NAN;
    let timed = time_s.iter().zip(values).filter(|(t, x)| t.is_finite() && x.is_finite());
    for (i, (&t, _)) in timed.enumerate() {
        if i % every == 0 && t > last {
            intervals.push(t - last);
        }
        last = t;
    }
    spike::quantile(&mut intervals, 0.5)
}

/// The column with the given rows missing.
fn without<'a>(values: &'a [f64], rows: &[usize]) -> Cow<'a, [f64]> {
    let mut values = Cow::Borrowed(values);
    for &row in rows {
        values.to_mut()[row] = f64::NAN;
    }
    values
}

/// The direction of each span's step.
fn sweeps(spans: &[SteadySpan], rejected: &[Rejected], least_step_pa: f64) -> Vec<Option<Sweep>> {
    let mut levels: Vec<(usize, f64, Option<usize>)> = spans
        .iter()
        .enumerate()
        .map(|(i, span)| (span.rows.start, span.pressure.mean, Some(i)))
        .chain(rejected.iter().map(|r| (r.rows.start, r.pressure_pa, None)))
        .collect();
    levels.sort_by_key(|level| level.0);
    let direction = |from: f64, to: f64| {
        let step = to - from;
        let sweep = if step > 0.0 { Sweep::Rising } else { Sweep::Falling };
        (step.abs() > least_step_pa).then_some(sweep)
    };
    let mut sweeps = vec![None; spans.len()];
    // Before the first step the run has the direction of that step.
    let mut now = levels.windows(2).find_map(|pair| direction(pair[0].1, pair[1].1));
    let mut before = levels.first().map_or(f64::NAN, |level| level.1);
    for (_, level, span) in levels {
        now = direction(before, level).or(now);
        if let Some(i) = span {
            sweeps[i] = now;
        }
        before = level;
    }
    sweeps
}

/// A span as a point.
fn point(
    series: &SeriesReadings,
    span: &SteadySpan,
    sweep: Option<Sweep>,
    options: &SteadyOptions,
) -> PointReading {
    let (pressure, flow) = (&span.pressure, &span.flow);
    let joined = |column: &Option<Vec<f64>>| {
        let values = column.as_ref()?;
        Some(join::over_rows(&series.time_s, values, span.rows.clone(), options.nearest_s)?.value)
    };
    let independent = |mean: &MeanOfSpan| (mean.scatter > 0.0).then_some(mean.effective);
    let averaged = [pressure, flow].into_iter().filter_map(independent).reduce(f64::min);
    PointReading {
        pressure: if series.pressure_is_absolute {
            Indication::Absolute(AbsolutePressure::from_pa(pressure.mean))
        } else {
            Indication::Gauge(GaugePressure::from_pa(pressure.mean))
        },
        flow: IndicatedFlow::from_l_min(flow.mean),
        timed: None,
        pressure_scatter: Some(PressureDifference::from_pa(pressure.scatter)),
        flow_scatter: Some(IndicatedFlow::from_l_min(flow.scatter)),
        averaged: averaged.unwrap_or(1.0),
        temperature: joined(&series.temperature_k).map(Temperature::from_k),
        barometer: joined(&series.barometer_pa).map(AbsolutePressure::from_pa),
        meter_temperature: joined(&series.meter_temperature_k).map(Temperature::from_k),
        meter_pressure: joined(&series.meter_pressure_pa).map(AbsolutePressure::from_pa),
        sweep,
        time_s: Some((span.from_s + span.to_s) / 2.0),
    }
}
