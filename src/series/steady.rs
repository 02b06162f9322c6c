//! Steady spans: the pressure was stepped, has settled, and holds; the flow has settled to it.
//!
//! Takes the columns time (s), pressure (Pa) and flow (any unit), NaN for a missing reading, and row ranges to leave
//! out; returns each hold once, however long, and each stretch that nearly was one with the reason why it is not.
//!
//! In a few passes over the rows:
//! 1. Rows are gathered into blocks of a tenth of the least duration.
//! 2. At each border of two blocks the mean pressure of a quarter of the least duration after it is compared with that
//!    before it. A difference above `least_step_pa`, or above five times the usual such difference in noise, is a step.
//!    Every place that can be covered by such a pair of windows without a step is quiet; so quiet stretches reach up to
//!    the step and not only to within a window of it. The last block before a step is given up: a hand may have been
//!    on the knob.
//! 3. The ends are cut to where the pressure has settled and where it begins to leave, and the start to where the flow
//!    reduced to the mean pressure has settled ([`super::settle`]). Reduced means `q·(p̄ + p_amb)/(p + p_amb)`: a choked
//!    flow follows the absolute pressure, so what is left is the meter's own lag, while a creeping pressure that the flow
//!    follows is not held against it.
//! 4. What is left must be long enough; its drift of pressure and of reduced flow must be below a limit or within three
//!    of its standard uncertainties, autocorrelation included.
//!
//! A continuous ramp fails at 2 when it is fast, at 4 when it is slow; one too slow to fail at all does no harm to the
//! ratio of the means. Left out: what the flow ought to be, which is the bench's business.

use std::ops::Range;

use super::block::{Block, blocks};
use super::mean::{MeanOfSpan, mean_of_span};
use super::settle::{Settled, unsettled};
use super::spike::quantile;

/// What counts as steady. Pressures in pascals, times in seconds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SteadyOptions {
    /// Shortest steady span. Default 10 s (common practice, no source).
    pub least_duration_s: f64,
    /// Fewest finite readings of each channel in it. Default 5, so that a scatter exists (common practice, no source).
    pub least_readings: usize,
    /// Time left out after the steepest place of a step. Default 3 s, a slow thermal meter's time constant (common
    /// practice, no source).
    pub dead_time_s: f64,
    /// Change of pressure between neighbouring windows that counts as a step. Default 15 mbar, well below the 0.1 bar
    /// of the smallest step that is set on purpose (common practice, no source).
    pub least_step_pa: f64,
    /// Largest drift of pressure over a span. Default 20 mbar: with a meter lagging 3 s over 10 s it makes the flow late by
    /// 0.06 % at 10 bar (common practice, no source).
    pub most_pressure_drift_pa: f64,
    /// Rate of drift that a long span may have beyond that limit. Default 0.1 mbar/s, a regulator's creep (common
    /// practice, no source).
    pub most_creep_pa_s: f64,
    /// Largest drift over a span of the flow reduced to the mean pressure, as a share of the flow. Default 0.003, the
    /// acceptance default for steadiness (common practice, no source).
    pub most_flow_drift: f64,
    /// Gaps in time or in a channel up to this long are bridged. Default 2 s (common practice, no source).
    pub longest_gap_s: f64,
    /// ... or up to so many of the channel's median intervals, if that is longer. Default 3 (common practice, no source).
    pub longest_gap_intervals: f64,
    /// How far outside a span a slower channel's reading may lie that stands in for it. Default 120 s, in which room
    /// temperature and barometer stay within their usual ± (common practice, no source).
    pub nearest_s: f64,
}

impl Default for SteadyOptions {
    fn default() -> Self {
        Self {
            least_duration_s: 10.0,
            least_readings: 5,
            dead_time_s: 3.0,
            least_step_pa: 1500.0,
            most_pressure_drift_pa: 2000.0,
            most_creep_pa_s: 10.0,
            most_flow_drift: 0.003,
            longest_gap_s: 2.0,
            longest_gap_intervals: 3.0,
            nearest_s: 120.0,
        }
    }
}

/// A steady span.
#[derive(Debug, Clone, PartialEq)]
pub struct SteadySpan {
    /// Its rows, counted from 0; the end is excluded.
    pub rows: Range<usize>,
    /// Time of its first row, in seconds.
    pub from_s: f64,
    /// Time of its last row, in seconds.
    pub to_s: f64,
    /// Pressure over the span, in pascals.
    pub pressure: MeanOfSpan,
    /// Flow over the span, in the column's unit.
    pub flow: MeanOfSpan,
}

/// A stretch that did not become a steady span.
#[derive(Debug, Clone, PartialEq)]
pub struct Rejected {
    /// Its rows, counted from 0; the end is excluded.
    pub rows: Range<usize>,
    /// Time of its first row, in seconds.
    pub from_s: f64,
    /// Time of its last row, in seconds.
    pub to_s: f64,
    /// Mean pressure over it, in pascals.
    pub pressure_pa: f64,
    /// Why it was rejected.
    pub why: Rejection,
}

/// Why a stretch is not a steady span.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Rejection {
    /// The pressure never stood still for long enough to tell a level.
    KeptMoving,
    /// Nothing long enough was left after the settling of the pressure.
    TooShort {
        /// What was left, in seconds.
        lasts_s: f64,
        /// What is needed, in seconds.
        least_s: f64,
    },
    /// Too few finite readings of a channel.
    TooFewReadings {
        /// Finite readings of the channel that has fewer.
        readings: usize,
        /// What is needed.
        least: usize,
    },
    /// The pressure drifts.
    PressureDrifts {
        /// Drift over the stretch, in pascals.
        drift_pa: f64,
        /// What is allowed, in pascals.
        most_pa: f64,
    },
    /// The flow settled so late that nothing long enough was left.
    FlowSettlesLate {
        /// What was left, in seconds.
        lasts_s: f64,
        /// What is needed, in seconds.
        least_s: f64,
    },
    /// The flow drifts, the pressure's own drift allowed for.
    FlowDrifts {
        /// Drift over the stretch, as a share of the flow.
        drift: f64,
        /// What is allowed, as a share of the flow.
        most: f64,
    },
}

/// The steady spans among the rows, and what nearly was one, each in order of rows.
///
/// `ambient_pa` is what makes the pressures absolute (0 when they are; a nominal atmosphere is good enough); `left_out`
/// holds row ranges in order of their starts, of which an empty one is a break in time in front of its row.
#[must_use]
pub fn steady_spans(
    time_s: &[f64],
    pressure_pa: &[f64],
    flow: &[f64],
    ambient_pa: f64,
    left_out: &[Range<usize>],
    options: &SteadyOptions,
) -> (Vec<SteadySpan>, Vec<Rejected>) {
    let columns = Columns { time_s, pressure_pa, flow, ambient_pa };
    let runs = blocks(time_s, pressure_pa, flow, left_out, options.least_duration_s / 10.0);
    let changes: Vec<Vec<f64>> =
        runs.iter().map(|run| changes(run, options.least_duration_s / 4.0)).collect();
    let step_pa = step_limit(&changes, options.least_step_pa);
    let (mut spans, mut rejected) = (Vec::new(), Vec::new());
    for (run, changes) in runs.iter().zip(&changes) {
        for piece in quiet(run, changes, step_pa, options) {
            match columns.judge(run, &piece, options) {
                Ok(span) => spans.push(span),
                Err(reject) => rejected.push(reject),
            }
        }
    }
    (spans, rejected)
}

/// A change counts as a step from this many standard deviations of such changes in noise (common practice, no source).
const STEP_DEVIATIONS: f64 = 5.0;
/// ... but never from more than this many times `least_step_pa`, else a record of nothing but motion would be quiet.
const MOST_STEP: f64 = 4.0;
/// The quarter of a standard normal variable's absolute values lies below this.
const NORMAL_QUARTER: f64 = 0.318_639_36;
/// Changes looked at for the usual one.
const SAMPLE: usize = 8192;
/// A drift counts from this many of its standard uncertainties (common practice, no source).
const SIGNIFICANT: f64 = 3.0;
/// The part of a drift limit below which settling does not matter (common practice, no source).
const NEGLIGIBLE: f64 = 0.05;
/// Motion longer than this many least durations is reported (common practice, no source).
const LONG_MOTION: f64 = 3.0;

/// At each block but the first: mean pressure within `window_s` from its start minus that within `window_s` before it.
fn changes(run: &[Block], window_s: f64) -> Vec<f64> {
    let offset = run.first().map_or(0.0, |block| block.pressure);
    let mut changes = Vec::with_capacity(run.len());
    let (mut left, mut right) = (0, 0);
    let (mut sum_left, mut sum_right) = (0.0, 0.0);
    for j in 0..run.len() {
        let at = run[j].from_s;
        while right < run.len() && (right <= j || run[right].from_s < at + window_s) {
            sum_right += run[right].pressure - offset;
            right += 1;
        }
        while left + 1 < j && run[left].from_s < at - window_s {
            sum_left -= run[left].pressure - offset;
            left += 1;
        }
        if j > 0 {
            changes.push(sum_right / (right - j) as f64 - sum_left / (j - left) as f64);
        }
        let here = run[j].pressure - offset;
        sum_left += here;
        sum_right -= here;
    }
    changes
}

/// The change that counts as a step, from the usual changes.
fn step_limit(changes: &[Vec<f64>], least_step_pa: f64) -> f64 {
    let total: usize = changes.iter().map(Vec::len).sum();
    let every = total / SAMPLE + 1;
    let mut sample: Vec<f64> = changes.iter().flatten().step_by(every).map(|c| c.abs()).collect();
    let usual = quantile(&mut sample, 0.25).unwrap_or(0.0) / NORMAL_QUARTER;
    (STEP_DEVIATIONS * usual).min(MOST_STEP * least_step_pa).max(least_step_pa)
}

/// Blocks that may be a steady span.
struct Piece {
    blocks: Range<usize>,
    /// Steepest place of the step before, where there was one.
    stepped_s: Option<f64>,
    /// Whether it is motion, reported only because it lasted.
    moving: bool,
}

/// The quiet pieces of a run of blocks; `changes[i]` stands at the start of block `i + 1`.
fn quiet(run: &[Block], changes: &[f64], step_pa: f64, options: &SteadyOptions) -> Vec<Piece> {
    let window_s = options.least_duration_s / 4.0;
    let is_step = |i: usize| changes[i].is_nan() || changes[i].abs() > step_pa;
    let mut pieces: Vec<Piece> = Vec::new();
    let mut i = 0;
    let mut stepped_s = None;
    while i < changes.len() {
        let start = i;
        if is_step(i) {
            let mut steepest = i;
            while i < changes.len() && is_step(i) {
                if changes[i].abs() > changes[steepest].abs() {
                    steepest = i;
                }
                i += 1;
            }
            stepped_s = Some(run[steepest + 1].from_s);
            let lasts = run[i].from_s - run[start].from_s;
            if lasts > LONG_MOTION * options.least_duration_s {
                pieces.push(Piece { blocks: start..i + 1, stepped_s: None, moving: true });
            }
            continue;
        }
        while i < changes.len() && !is_step(i) {
            i += 1;
        }
        // The window before the first quiet border and the one after the last belong to the piece.
        let from = run[start + 1].from_s - window_s;
        let first = (0..=start).rev().take_while(|&b| b == start || run[b].from_s >= from).last();
        let to = run[i].from_s + window_s;
        let end = (i + 1..run.len()).find(|&b| run[b].from_s >= to).unwrap_or(run.len());
        let mut blocks = first.unwrap_or(start)..end;
        if let Some(before) = pieces.last_mut().filter(|before| !before.moving) {
            let overlap_s = run[before.blocks.end - 1].from_s - run[blocks.start].from_s;
            if overlap_s > window_s / 2.0 {
                // Windows without a step overlap across the border: noise, not a step.
                before.blocks.end = blocks.end;
                continue;
            }
            blocks.start = blocks.start.max(before.blocks.end);
        }
        pieces.push(Piece { blocks, stepped_s, moving: false });
    }
    for piece in pieces.iter_mut().filter(|piece| !piece.moving) {
        if piece.blocks.end < run.len() && piece.blocks.len() > 1 {
            piece.blocks.end -= 1;
        }
    }
    pieces.retain(|piece| !piece.blocks.is_empty());
    pieces
}

/// The columns a piece is judged on.
struct Columns<'a> {
    time_s: &'a [f64],
    pressure_pa: &'a [f64],
    flow: &'a [f64],
    ambient_pa: f64,
}

impl Columns<'_> {
    /// Cuts the settling off a piece and judges what is left.
    fn judge(&self, run: &[Block], piece: &Piece, options: &SteadyOptions) -> Result<SteadySpan, Rejected> {
        let all = &run[piece.blocks.clone()];
        if piece.moving {
            return Err(self.rejected(all, Rejection::KeptMoving));
        }
        let dead = piece.stepped_s.map_or(0, |at| {
            all.iter().position(|b| b.from_s >= at + options.dead_time_s).unwrap_or(all.len() - 1)
        });
        let pressures: Vec<f64> = all[dead..].iter().map(|b| b.pressure).collect();
        let settling = unsettled(&pressures, Settled::Line, NEGLIGIBLE * options.most_pressure_drift_pa);
        // A hand that turns the knob slowly leaves the level as gently as it was reached.
        let backward: Vec<f64> = pressures[settling..].iter().rev().copied().collect();
        let leaving = unsettled(&backward, Settled::Line, NEGLIGIBLE * options.most_pressure_drift_pa);
        let held = &all[dead + settling..all.len() - leaving];
        let least_s = options.least_duration_s;
        let lasts_s = self.lasts_s(held);
        if lasts_s < least_s {
            return Err(self.rejected(held, Rejection::TooShort { lasts_s, least_s }));
        }

        let flows = self.reduced_flows(held);
        let level = flows.iter().sum::<f64>() / flows.len() as f64;
        let settling = unsettled(&flows, Settled::Level, NEGLIGIBLE * options.most_flow_drift * level.abs());
        let (span, flows) = (&held[settling..], &flows[settling..]);
        let lasts_s = self.lasts_s(span);
        if lasts_s < least_s {
            return Err(self.rejected(span, Rejection::FlowSettlesLate { lasts_s, least_s }));
        }

        let rows = rows_of(span);
        let pressure = mean_of_span(&self.pressure_pa[rows.clone()]);
        let flow = mean_of_span(&self.flow[rows.clone()]);
        let count = |mean: &Option<MeanOfSpan>| mean.map_or(0, |mean| mean.readings);
        let readings = count(&pressure).min(count(&flow));
        let (Some(pressure), Some(flow)) = (pressure, flow) else {
            let why = Rejection::TooFewReadings { readings, least: options.least_readings };
            return Err(self.rejected(span, why));
        };
        if readings < options.least_readings {
            let why = Rejection::TooFewReadings { readings, least: options.least_readings };
            return Err(self.rejected(span, why));
        }
        let most_pa = options.most_pressure_drift_pa.max(options.most_creep_pa_s * lasts_s);
        if drifts(&pressure, most_pa) {
            let why = Rejection::PressureDrifts { drift_pa: pressure.drift, most_pa };
            return Err(self.rejected(span, why));
        }
        if let Some(reduced) = mean_of_span(flows) {
            let most = options.most_flow_drift;
            if drifts(&reduced, most * reduced.mean.abs()) {
                let why = Rejection::FlowDrifts { drift: reduced.drift / reduced.mean, most };
                return Err(self.rejected(span, why));
            }
        }
        let (from_s, to_s) = self.times(&rows);
        Ok(SteadySpan { rows, from_s, to_s, pressure, flow })
    }

    /// The blocks' flows as they would be at the mean pressure, if flow went with absolute pressure.
    fn reduced_flows(&self, blocks: &[Block]) -> Vec<f64> {
        let mean_pa = blocks.iter().map(|b| b.pressure).sum::<f64>() / blocks.len() as f64;
        let at_mean = mean_pa + self.ambient_pa;
        let reduced = |b: &Block| {
            let here = b.pressure + self.ambient_pa;
            if at_mean > 0.0 && here > 0.0 { b.flow * at_mean / here } else { b.flow }
        };
        blocks.iter().map(reduced).collect()
    }

    fn lasts_s(&self, blocks: &[Block]) -> f64 {
        let (from_s, to_s) = self.times(&rows_of(blocks));
        to_s - from_s
    }

    /// Times of the first and last of the rows that have one.
    fn times(&self, rows: &Range<usize>) -> (f64, f64) {
        let times = &self.time_s[rows.clone()];
        let first = times.iter().copied().find(|t| t.is_finite());
        let last = times.iter().rev().copied().find(|t| t.is_finite());
        (first.unwrap_or(f64::NAN), last.unwrap_or(f64::NAN))
    }

    fn rejected(&self, blocks: &[Block], why: Rejection) -> Rejected {
        let rows = rows_of(blocks);
        let (from_s, to_s) = self.times(&rows);
        let pressure_pa = blocks.iter().map(|b| b.pressure).sum::<f64>() / blocks.len().max(1) as f64;
        Rejected { rows, from_s, to_s, pressure_pa, why }
    }
}

/// Whether a mean drifts by more than allowed and by more than its noise explains.
fn drifts(mean: &MeanOfSpan, most: f64) -> bool {
    mean.drift.abs() > most && mean.drift.abs() > SIGNIFICANT * mean.drift_u()
}

fn rows_of(blocks: &[Block]) -> Range<usize> {
    match (blocks.first(), blocks.last()) {
        (Some(first), Some(last)) => first.rows.start..last.rows.end,
        _ => 0..0,
    }
}
