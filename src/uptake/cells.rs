//! Oxygen cells: from what each shows to one partial pressure, and which of them to believe.
//!
//! Comes in: the cells' columns, binned rows, the ambient pressure. Goes out: the mean of the agreeing cells in each
//! bin, the cells left out by name with the reason, and whether enough are left. A cell in volts is read on the straight
//! line through its two calibration points. Left out: curvature of an ageing cell above its calibration point (flagged
//! by the caller), and a cell's own temperature.

use super::bins::Bins;
use super::why_not::WhyNot;
use crate::entry::{Assumptions, CalibratedAt, CellSignal, SessionReadings};
use crate::gas::saturation_pressure;
use crate::series::spike::step_noise;

/// Oxygen in dry air, 0 to 1 (ICAO standard atmosphere, 0.209 476).
pub(super) const OXYGEN_IN_AIR: f64 = 0.209_476;
/// A reading above ambient by more than this share is a fault (interface).
const ABOVE_AMBIENT: f64 = 0.05;
/// Shortest repetition of one value that can be a frozen cell, seconds (common practice, no source).
const FROZEN_S: f64 = 60.0;
/// Fewest equal readings of a frozen cell (common practice, no source).
const FROZEN_READINGS: usize = 10;
/// How far the other cells must have moved meanwhile, bar, and in steps of the cell's last digit: a display of hundredths
/// repeats honestly while the loop moves by one, and the others' rounding adds another (common practice, no source).
const FROZEN_MOVES_BAR: f64 = 0.015;
const FROZEN_MOVES_DIGITS: f64 = 2.5;
/// Share of the bins in which a cell may be further off than the limit (common practice, no source).
const OFF_SHARE: f64 = 0.05;

/// A cell that was left out.
#[derive(Debug, Clone, PartialEq)]
pub struct CellLeftOut {
    /// The name of its column.
    pub name: String,
    /// Why.
    pub why: CellTrouble,
}

/// What is wrong with a cell.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum CellTrouble {
    /// Too many readings that are missing, not positive, or above ambient by over 5 %: this share, 0 to 1.
    Faults(f64),
    /// It repeated one value while the others moved, between these seconds.
    Frozen {
        /// From, seconds.
        from_s: f64,
        /// To, seconds.
        to_s: f64,
    },
    /// It was off the median of the cells by this much, in the mean over the session, bar.
    Off(f64),
    /// Its two calibration points do not make a line.
    Calibration,
}

/// What the cells come to.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Cells {
    /// Mean oxygen partial pressure of the agreeing cells in each bin, bar; NaN where one of them is missing.
    pub(super) po2_bar: Vec<f64>,
    /// Cells left out.
    pub(super) left_out: Vec<CellLeftOut>,
    /// How many are used.
    pub(super) used: usize,
    /// Partial pressure at the upper calibration point, bar, when it is known.
    pub(super) calibrated_to_bar: Option<f64>,
}

/// Whether a signal is a voltage.
pub(super) fn any_in_volts(readings: &SessionReadings) -> bool {
    readings.cells.iter().any(|c| matches!(c.signal, CellSignal::Volts { .. }))
}

/// Reads the cells.
pub(super) fn read(
    readings: &SessionReadings,
    calibrated_at: Option<CalibratedAt>,
    bins: &Bins,
    ambient: &Ambient<'_>,
    assumptions: &Assumptions,
) -> Result<Cells, WhyNot> {
    let most_bar = ambient.most_bar(bins);
    let points = calibrated_at.map(|at| calibration_points_bar(&at));
    let mut left_out = Vec::new();
    // Name and bin means of the cells that read.
    let mut sound: Vec<(usize, Vec<f64>)> = Vec::new();
    for (index, cell) in readings.cells.iter().enumerate() {
        let trouble = |why| CellLeftOut { name: cell.name.clone(), why };
        let (column, gain, offset) = match &cell.signal {
            CellSignal::Bar(column) => (column, 1.0, 0.0),
            CellSignal::Volts { readings, in_air, in_oxygen } => {
                let span = in_oxygen - in_air;
                let Some((air, oxygen)) = points.filter(|_| span.is_finite() && span > 0.0) else {
                    left_out.push(trouble(CellTrouble::Calibration));
                    continue;
                };
                let gain = (oxygen - air) / span;
                (readings, gain, air - gain * in_air)
            }
        };
        let mut column = bins.in_order(column);
        if let CellSignal::Volts { .. } = &cell.signal {
            column.to_mut().iter_mut().for_each(|shown| *shown = offset + gain * *shown);
        }
        let (means, good) = match &most_bar {
            MostBar::Same(most_bar) => bins.means_of(&column, |_, po2| po2 > 0.0 && po2 <= *most_bar),
            MostBar::Each(most_bar) => bins.means_of(&column, |at, po2| po2 > 0.0 && po2 <= most_bar[at]),
        };
        let all = good == column.len();
        let read = if all { good } else { column.iter().filter(|po2| !po2.is_nan()).count() };
        let faults = read - good;
        let share = if read > 0 { faults as f64 / read as f64 } else { 1.0 };
        if share > assumptions.cell_faults {
            left_out.push(trouble(CellTrouble::Faults(share)));
        } else {
            sound.push((index, means));
        }
    }
    drop_out(readings, &mut sound, &mut left_out, assumptions.cell_faults);
    let frozen = frozen(readings, bins, &sound);
    sound.retain(|(index, _)| match frozen.iter().find(|(f, _)| f == index) {
        Some((_, why)) => {
            left_out.push(CellLeftOut { name: readings.cells[*index].name.clone(), why: *why });
            false
        }
        None => true,
    });
    if sound.is_empty() {
        return Err(WhyNot::NoUsableCell { left_out });
    }
    if sound.len() > 1 {
        // Two cells lie half their distance from the middle: it is their distance that is held to the limit.
        let limit_bar = assumptions.cell_limit.as_bar() * if sound.len() == 2 { 0.5 } else { 1.0 };
        disagreeing(readings, &mut sound, &mut left_out, limit_bar);
        if sound.len() < 2 {
            return Err(WhyNot::CellsDisagree { left_out });
        }
    }
    let n = sound.len() as f64;
    let po2_bar = (0..bins.time_s.len())
        .map(|bin| sound.iter().map(|(_, means)| means[bin]).sum::<f64>() / n)
        .collect();
    let calibrated_to_bar = points.map(|(_, oxygen)| oxygen).filter(|_| any_in_volts(readings));
    Ok(Cells { po2_bar, left_out, used: sound.len(), calibrated_to_bar })
}

/// Oxygen partial pressure in bar in the air and in the oxygen of a calibration; the oxygen is dry.
pub(crate) fn calibration_points_bar(at: &CalibratedAt) -> (f64, f64) {
    let vapour = at.humidity * saturation_pressure(at.temperature).as_bar();
    (OXYGEN_IN_AIR * (at.barometer.as_bar() - vapour), at.oxygen * at.barometer.as_bar())
}

/// Where the counterlung is, and so the pressure around it.
pub(super) struct Ambient<'a> {
    /// At the surface, bar, and for each metre of water.
    pub(super) barometer_bar: f64,
    pub(super) bar_per_m: f64,
    /// Depth where the column says nothing, metres; and the column.
    pub(super) depth_m: f64,
    pub(super) depths_m: Option<&'a [f64]>,
}

/// The largest oxygen partial pressure that is no fault, bar.
enum MostBar {
    Same(f64),
    /// For each row in order of time.
    Each(Vec<f64>),
}

impl Ambient<'_> {
    fn most_bar(&self, bins: &Bins) -> MostBar {
        let at = |depth_m: f64| (self.barometer_bar + self.bar_per_m * depth_m) * (1.0 + ABOVE_AMBIENT);
        let Some(depths) = self.depths_m else { return MostBar::Same(at(self.depth_m)) };
        let known = |d: &f64| if d.is_finite() { *d } else { self.depth_m };
        MostBar::Each(bins.in_order(depths).iter().map(|d| at(known(d))).collect())
    }
}

/// Leaves out cells that have no reading in too many of the bins in which another has.
fn drop_out(
    readings: &SessionReadings,
    sound: &mut Vec<(usize, Vec<f64>)>,
    left_out: &mut Vec<CellLeftOut>,
    most: f64,
) {
    let bins = sound.first().map_or(0, |(_, means)| means.len());
    let any: Vec<bool> = (0..bins).map(|bin| sound.iter().any(|(_, means)| means[bin].is_finite())).collect();
    let there = any.iter().filter(|any| **any).count() as f64;
    sound.retain(|(index, means)| {
        let missing = any.iter().zip(means).filter(|(any, mean)| **any && mean.is_nan()).count() as f64;
        let share = if there > 0.0 { missing / there } else { 1.0 };
        if share > most {
            let name = readings.cells[*index].name.clone();
            left_out.push(CellLeftOut { name, why: CellTrouble::Faults(share) });
        }
        share <= most
    });
}

/// Cells that repeated one value exactly while the others moved. A cell alone cannot be told from a steady loop.
fn frozen(readings: &SessionReadings, bins: &Bins, sound: &[(usize, Vec<f64>)]) -> Vec<(usize, CellTrouble)> {
    let mut found = Vec::new();
    if sound.len() < 2 {
        return found;
    }
    let times = bins.in_order(&readings.time_s);
    for (index, _) in sound {
        let (column, in_bar) = match &readings.cells[*index].signal {
            CellSignal::Bar(column) => (column, true),
            // A tenth of a millivolt, the coarsest voltmeter in use, is 2 mbar.
            CellSignal::Volts { readings: column, .. } => (column, false),
        };
        let others: Vec<&Vec<f64>> = sound.iter().filter(|(i, _)| i != index).map(|(_, m)| m).collect();
        let mean_at = |bin: usize| others.iter().map(|m| m[bin]).sum::<f64>() / others.len() as f64;
        // A whole column is looked through for its last digit: only when it is asked for.
        let mut digits_bar = None;
        let mut worst: Option<(f64, f64)> = None;
        repeats(&bins.in_order(column), &times, bins, |run| {
            let (from_s, to_s) = (times[run.from.0], times[run.to.0]);
            let moved = (mean_at(run.to.1) - mean_at(run.from.1)).abs();
            if moved > FROZEN_MOVES_BAR && worst.is_none_or(|(a, b)| to_s - from_s > b - a) {
                let least_bar = *digits_bar.get_or_insert_with(|| {
                    if in_bar { FROZEN_MOVES_DIGITS * step_noise(column).last_digit } else { 0.0 }
                });
                if moved > least_bar {
                    worst = Some((from_s, to_s));
                }
            }
        });
        if let Some((from_s, to_s)) = worst {
            found.push((*index, CellTrouble::Frozen { from_s, to_s }));
        }
    }
    found
}

/// A value that was repeated: its first and last reading, each with its bin.
struct Run {
    from: (usize, usize),
    to: (usize, usize),
    count: usize,
}

/// Hands over every repetition of one value that is long enough for a frozen cell; missing readings are looked past.
fn repeats(column: &[f64], times: &[f64], bins: &Bins, mut found: impl FnMut(&Run)) {
    let mut close = |run: &Run| {
        if run.count >= FROZEN_READINGS && times[run.to.0] - times[run.from.0] >= FROZEN_S {
            found(run);
        }
    };
    let mut run = Run { from: (0, 0), to: (0, 0), count: 0 };
    let mut last = f64::NAN;
    for (bin, range) in bins.ranges().enumerate() {
        // What begins and ends within a bin of a few seconds is not long enough.
        let (from_s, to_s) = bins.ends_s[bin];
        let mut may_skip = to_s - from_s < FROZEN_S;
        let mut at = range.start;
        while at < range.end {
            let shown = column[at];
            // The very same number, bit for bit, is what freezing means.
            if shown.to_bits() == last.to_bits() && !shown.is_nan() {
                (run.to, run.count) = ((at, bin), run.count + 1);
            } else if !shown.is_nan() {
                close(&run);
                if std::mem::take(&mut may_skip) {
                    at += last_run(&column[at..range.end]);
                }
                (run, last) = (Run { from: (at, bin), to: (at, bin), count: 1 }, column[at]);
            }
            at += 1;
        }
    }
    close(&run);
}

/// Where the repetition that some readings end with begins.
fn last_run(readings: &[f64]) -> usize {
    let (mut begin, mut value) = (0, f64::NAN);
    for (at, shown) in readings.iter().enumerate().rev().filter(|(_, shown)| !shown.is_nan()) {
        if !value.is_nan() && shown.to_bits() != value.to_bits() {
            break;
        }
        (begin, value) = (at, *shown);
    }
    begin
}

/// Leaves out cells that are off the median, in the mean or in over 5 % of the bins.
fn disagreeing(
    readings: &SessionReadings,
    sound: &mut Vec<(usize, Vec<f64>)>,
    left_out: &mut Vec<CellLeftOut>,
    limit_bar: f64,
) {
    let bins = sound.first().map_or(0, |(_, means)| means.len());
    let mut sums = vec![(0.0, 0_usize); sound.len()];
    let mut compared = 0_usize;
    let mut values = Vec::with_capacity(sound.len());
    for bin in 0..bins {
        values.clear();
        values.extend(sound.iter().map(|(_, means)| means[bin]));
        if values.iter().any(|v| v.is_nan()) {
            continue;
        }
        values.sort_unstable_by(f64::total_cmp);
        let middle = values.len() / 2;
        let median = if values.len().is_multiple_of(2) {
            0.5 * (values[middle - 1] + values[middle])
        } else {
            values[middle]
        };
        compared += 1;
        for ((_, means), (sum, beyond)) in sound.iter().zip(&mut sums) {
            let off = means[bin] - median;
            *sum += off;
            *beyond += usize::from(off.abs() > limit_bar);
        }
    }
    let n = compared.max(1) as f64;
    let mut at = 0;
    sound.retain(|(index, _)| {
        let (sum, beyond) = sums[at];
        at += 1;
        let (off, share) = (sum / n, beyond as f64 / n);
        let out = compared > 0 && (off.abs() > limit_bar || share > OFF_SHARE);
        if out {
            let name = readings.cells[*index].name.clone();
            left_out.push(CellLeftOut { name, why: CellTrouble::Off(off) });
        }
        !out
    });
}
