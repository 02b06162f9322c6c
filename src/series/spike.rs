//! Single readings that stand out, and how much neighbouring readings usually differ.
//!
//! A spike is one reading, or up to three within a second, that leaves the level of the reading before it by more
//! than eight times the usual difference of neighbours and comes back to that level (a garbled digit, a switching
//! relay). A step never comes back and is left alone. Rows of spikes are returned, nothing is changed.

/// Usual differences of neighbouring readings of a channel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepNoise {
    /// Standard deviation of the difference of neighbours, from their median; 0 when most are equal.
    pub deviation: f64,
    /// Smallest difference seen that is not zero: the step of the last digit, or less. 0 when none was seen.
    pub last_digit: f64,
}

/// A spike leaves by this many standard deviations of neighbouring differences (common practice, no source).
const SPIKE_DEVIATIONS: f64 = 8.0;
/// ... and by this many steps of the last digit, for channels coarser than their noise (common practice, no source).
const SPIKE_DIGITS: f64 = 4.0;
/// Most readings in a spike (common practice, no source).
const SPIKE_READINGS: usize = 3;
/// Longest spike of more than one reading, in seconds (common practice, no source).
const SPIKE_S: f64 = 1.0;
/// The median of the absolute value of a standard normal variable.
const NORMAL_MEDIAN: f64 = 0.674_489_75;
/// Differences looked at for the usual one; a median of some thousand is good to a few per cent.
const SAMPLE: usize = 8192;

/// The rows of spikes, in order.
#[must_use]
pub fn spikes(time_s: &[f64], values: &[f64]) -> Vec<usize> {
    let noise = step_noise(values);
    let limit = (SPIKE_DEVIATIONS * noise.deviation).max(SPIKE_DIGITS * noise.last_digit);
    let rows = values.len().min(time_s.len());
    let mut found = Vec::new();
    let mut level = f64::NAN;
    let mut row = 0;
    while row < rows {
        let x = values[row];
        if !x.is_finite() {
            row += 1;
            continue;
        }
        if (x - level).abs() > limit
            && let Some(back) = comes_back(time_s, values, row, level, limit)
        {
            found.extend((row..back).filter(|&r| values[r].is_finite()));
            row = back;
            continue;
        }
        level = x;
        row += 1;
    }
    found
}

/// The row at which the channel is back at `level` after leaving it at `row`, if that is soon enough for a spike.
fn comes_back(time_s: &[f64], values: &[f64], row: usize, level: f64, limit: f64) -> Option<usize> {
    let side = (values[row] - level).is_sign_positive();
    let mut off = 0;
    // Missing readings are looked past, but not without end.
    for next in row..values.len().min(row + 4 * SPIKE_READINGS) {
        let x = values[next];
        if !x.is_finite() {
            continue;
        }
        if (x - level).abs() <= limit / 2.0 {
            return Some(next);
        }
        off += 1;
        let late = off > 1 && time_s[next] - time_s[row] >= SPIKE_S;
        if off > SPIKE_READINGS || late || (x - level).is_sign_positive() != side {
            return None;
        }
    }
    None
}

/// The usual difference of neighbouring finite readings, from a sample spread over the column.
#[must_use]
pub fn step_noise(values: &[f64]) -> StepNoise {
    let every = values.len() / SAMPLE + 1;
    let mut differences: Vec<f64> = values
        .windows(2)
        .step_by(every)
        .map(|pair| (pair[1] - pair[0]).abs())
        .filter(|d| d.is_finite())
        .collect();
    if differences.is_empty() {
        // A channel read at every tenth row has no two neighbouring rows: take its readings alone.
        let finite: Vec<f64> = values.iter().copied().filter(|x| x.is_finite()).collect();
        differences = finite.windows(2).map(|pair| (pair[1] - pair[0]).abs()).collect();
    }
    let last_digit = differences.iter().copied().filter(|&d| d > 0.0).fold(f64::INFINITY, f64::min);
    StepNoise {
        deviation: quantile(&mut differences, 0.5).unwrap_or(0.0) / NORMAL_MEDIAN,
        last_digit: if last_digit.is_finite() { last_digit } else { 0.0 },
    }
}

/// The value below which the share `share` of `values` lies, which are left in another order; none of none.
pub(super) fn quantile(values: &mut [f64], share: f64) -> Option<f64> {
    let at = ((values.len() as f64 * share) as usize).min(values.len().checked_sub(1)?);
    let (_, value, _) = values.select_nth_unstable_by(at, f64::total_cmp);
    Some(*value)
}
