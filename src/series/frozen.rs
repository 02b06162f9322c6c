//! Rows that cannot be used: holes in time, missing values, and a channel that has frozen.
//!
//! Takes columns (seconds, readings; NaN is a missing reading) and returns [`Stretch`]es of rows. A hole is an
//! interval between readings longer than a limit; shorter ones are bridged, so that a channel read at every tenth row
//! is not "missing". A channel has frozen when it repeats one value exactly, for longer than its own habit makes
//! plausible, while the other channel moves: both are asked for, because a display coarser than its noise repeats
//! honestly for minutes. Left out: a logger that repeats *all* its channels, which cannot be told from a
//! quiet bench.

use std::ops::Range;

use super::spike::step_noise;

/// Which column a stretch belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Channel {
    /// Indicated pressure.
    Pressure,
    /// Indicated flow.
    Flow,
}

/// Rows of one channel that were not used, with the time of the last use before and the first use after them.
#[derive(Debug, Clone, PartialEq)]
pub struct Stretch {
    /// The channel.
    pub channel: Channel,
    /// The rows, counted from 0; the end is excluded.
    pub rows: Range<usize>,
    /// Where it begins, in seconds.
    pub from_s: f64,
    /// Where it ends, in seconds.
    pub to_s: f64,
}

/// A break in the time column in front of a row.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TimeBreak {
    /// The first row after the break, counted from 0.
    pub row: usize,
    /// Time of the row before it, in seconds.
    pub from_s: f64,
    /// Time of this row, in seconds; smaller than `from_s` where time runs back.
    pub to_s: f64,
}

/// When a repeated value counts as frozen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FrozenOptions {
    /// Shortest time of exact repetition, in seconds. Default 5: twice a slow meter's own rate (common practice, no
    /// source).
    pub least_s: f64,
    /// Fewest equal readings. Default 10 (common practice, no source).
    pub least_readings: usize,
    /// Chance, over the whole record, below which a repetition is implausible. Default 1e-6 (common practice, no
    /// source).
    pub chance: f64,
    /// How far the other channel must move, as a share of its mean, beyond ten times its noise. Default 0.02: a step
    /// of 0.2 bar at 10 bar (common practice, no source).
    pub other_moves: f64,
}

impl Default for FrozenOptions {
    fn default() -> Self {
        Self { least_s: 5.0, least_readings: 10, chance: 1e-6, other_moves: 0.02 }
    }
}

/// Places where time runs back or leaps further than `longest_gap_s`. Rows without a finite time are passed over.
#[must_use]
pub fn time_breaks(time_s: &[f64], longest_gap_s: f64) -> Vec<TimeBreak> {
    let mut breaks = Vec::new();
    let mut last = f64::NAN;
    for (row, &t) in time_s.iter().enumerate() {
        if !t.is_finite() {
            continue;
        }
        if t < last || t - last > longest_gap_s {
            breaks.push(TimeBreak { row, from_s: last, to_s: t });
        }
        last = t;
    }
    breaks
}

/// Stretches in which `channel` has rows but no finite reading for longer than `longest_gap_s`.
///
/// A stretch at either end of the record is measured from the first or to the last row that has a time.
#[must_use]
pub fn missing(channel: Channel, time_s: &[f64], values: &[f64], longest_gap_s: f64) -> Vec<Stretch> {
    let mut stretches = Vec::new();
    let mut close = |rows: Range<usize>, from_s: f64, to_s: f64| {
        if !rows.is_empty() && to_s - from_s > longest_gap_s {
            stretches.push(Stretch { channel, rows, from_s, to_s });
        }
    };
    // The first row after the last reading, and the time from which the silence counts.
    let mut after = 0;
    let mut silent_since = f64::NAN;
    let mut last_time = f64::NAN;
    let rows = time_s.len().min(values.len());
    for (row, (&t, &x)) in time_s.iter().zip(values).enumerate() {
        if !t.is_finite() {
            continue;
        }
        if t < last_time {
            close(after..row, silent_since, last_time);
            (after, silent_since) = (row, t);
        }
        if silent_since.is_nan() {
            silent_since = t;
        }
        if x.is_finite() {
            close(after..row, silent_since, t);
            (after, silent_since) = (row + 1, t);
        }
        last_time = t;
    }
    close(after..rows, silent_since, last_time);
    stretches
}

/// Stretches in which `values` repeats one number exactly, implausibly long, while `other` moves.
///
/// The plausible length comes from the channel's own habit: with the share `r` of equal neighbours elsewhere in the
/// record, a run of `m` equal neighbours has the chance `r^m` at each of the record's places.
#[must_use]
pub fn frozen(
    channel: Channel,
    time_s: &[f64],
    values: &[f64],
    other: &[f64],
    options: &FrozenOptions,
) -> Vec<Stretch> {
    let mut pairs = 0_usize;
    let mut equal = 0_usize;
    let mut runs: Vec<(Range<usize>, usize)> = Vec::new();
    let mut run = 0..0;
    let mut count = 0;
    let mut last = f64::NAN;
    for (row, &x) in values.iter().enumerate().filter(|(_, x)| x.is_finite()) {
        // The very same number, bit for bit, is what freezing means.
        if x.to_bits() == last.to_bits() {
            equal += 1;
            count += 1;
        } else {
            if count >= options.least_readings.max(2) {
                runs.push((run.clone(), count));
            }
            run.start = row;
            count = 1;
        }
        pairs += usize::from(last.is_finite());
        run.end = row + 1;
        last = x;
    }
    if count >= options.least_readings.max(2) {
        runs.push((run, count));
    }
    if runs.is_empty() {
        return Vec::new();
    }
    let noise = step_noise(other).deviation;
    runs.into_iter()
        .filter_map(|(rows, count)| {
            let from_s = *time_s.get(rows.start)?;
            let to_s = *time_s.get(rows.end.checked_sub(1)?)?;
            let repeats = count - 1;
            let lasts = to_s - from_s >= options.least_s;
            let implausible = is_implausible(repeats, equal, pairs, options.chance);
            let moves = lasts && implausible && moves(other.get(rows.clone())?, noise, options.other_moves);
            moves.then_some(Stretch { channel, rows, from_s, to_s })
        })
        .collect()
}

/// Whether `repeats` equal neighbours in a row are rarer than `chance`, `equal` of all `pairs` being equal.
fn is_implausible(repeats: usize, equal: usize, pairs: usize, chance: f64) -> bool {
    let elsewhere = pairs.saturating_sub(repeats);
    let equal_elsewhere = equal.saturating_sub(repeats);
    if equal_elsewhere == 0 {
        return true;
    }
    let share = equal_elsewhere as f64 / elsewhere.max(1) as f64;
    repeats as f64 * libm::log(share.min(1.0)) < libm::log(chance / pairs.max(1) as f64)
}

/// Whether the readings range over more than `share` of their mean and ten times their noise.
fn moves(values: &[f64], noise: f64, share: f64) -> bool {
    let mut least = f64::INFINITY;
    let mut most = f64::NEG_INFINITY;
    let mut sum = 0.0;
    let mut count = 0_usize;
    for &x in values.iter().filter(|x| x.is_finite()) {
        least = least.min(x);
        most = most.max(x);
        sum += x;
        count += 1;
    }
    count > 1 && most - least > share * (sum / count as f64).abs() + 10.0 * noise
}
