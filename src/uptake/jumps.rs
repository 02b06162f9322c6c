//! Jumps of PO2 that no event explains: found and proposed, never used.
//!
//! Comes in: binned PO2 of a stretch between events, and how the loop is kept. Goes out: proposals. A jump is a
//! difference of the medians of some 20 s before and after a place (10 s are left for the cells to follow) beyond the
//! trend around it. Left out: slow changes, which look like uptake.

use super::why_not::{Jump, Proposal};
use crate::entry::LoopKept;

/// Seconds on each side whose medians are compared, and the bins that are enough for that.
const SIDE_S: f64 = 20.0;
const MOST_SIDE: usize = 4;
/// Seconds in between, for the cells' lag, and the bins that are enough for that.
const LAG_S: f64 = 15.0;
const MOST_LAG: usize = 3;
/// The trend is taken over this many reaches of the medians to each side.
const AROUND: usize = 3;
/// Least jump upward, and downward in a sealed loop, bar (common practice, no source).
const LEAST_BAR: f64 = 0.02;
/// Least jump downward in a loop that is made up with diluent: half a litre of air in seven at PO2 1.0 is 0.06 bar, and
/// such puffs are how a loop is held (common practice, no source).
const LEAST_DOWN_HELD_BAR: f64 = 0.10;
/// A jump is also this many times the usual difference of such medians.
const TIMES_NOISE: f64 = 6.0;

/// Jumps in a stretch; `time_s` and `po2_bar` are its bins.
pub(super) fn jumps(time_s: &[f64], po2_bar: &[f64], kept: LoopKept) -> Vec<Proposal> {
    let n = po2_bar.len();
    let (side, lag) = spans(time_s);
    let reach = 2 * side + lag;
    if n < reach + 2 || kept == LoopKept::Topped {
        return Vec::new();
    }
    let sides: Vec<f64> = po2_bar.windows(side).map(median_of_few).collect();
    let differences: Vec<f64> =
        sides.windows(side + lag + 1).map(|pair| pair[side + lag] - pair[0]).collect();
    // No place departs from the trend by more than the differences are apart.
    let lowest = differences.iter().copied().fold(f64::INFINITY, f64::min);
    let highest = differences.iter().copied().fold(f64::NEG_INFINITY, f64::max);
    if highest - lowest <= LEAST_BAR && differences.iter().all(|d| d.is_finite()) {
        return Vec::new();
    }
    // The trend at each place is the median of the differences around it, of which a jump is a minority; not of all, because
    // a loop that shrinks falls faster and faster, and that is no jump. Noise is the usual departure from the trend.
    let trend = medians_around(&differences, AROUND * reach);
    let departures: Vec<f64> = differences.iter().zip(&trend).map(|(here, trend)| here - trend).collect();
    let sizes: Vec<f64> = departures.iter().map(|d| d.abs()).collect();
    // 1.4826: median departure to standard deviation, normal distribution.
    let noise = 1.482_6 * median(sizes.clone());
    let up = LEAST_BAR.max(TIMES_NOISE * noise);
    let least_down = if kept == LoopKept::Sealed { LEAST_BAR } else { LEAST_DOWN_HELD_BAR };
    let down = least_down.max(TIMES_NOISE * noise);
    let beyond = |d: f64| d > up || -d > down;
    let mut found = Vec::new();
    let mut k = 0;
    while k < differences.len() {
        if !beyond(departures[k]) {
            k += 1;
            continue;
        }
        // One jump shows in as many places as the medians reach over it; its middle is where the difference is largest.
        let end = (k + reach).min(differences.len());
        let largest = (k..end).max_by(|&a, &b| sizes[a].total_cmp(&sizes[b])).unwrap_or(k);
        let change_bar = departures[largest];
        found.push(Proposal {
            at_s: time_s[largest + side],
            change_bar,
            looks_like: if change_bar > 0.0 { Jump::OxygenAdd } else { Jump::DiluentAdd },
        });
        k = largest + reach;
    }
    found
}

/// Bins on each side and between: fewer where readings were written down every half minute, so that a place is compared
/// with what stood near it.
fn spans(time_s: &[f64]) -> (usize, usize) {
    let intervals: Vec<f64> = time_s.windows(2).map(|pair| pair[1] - pair[0]).collect();
    if intervals.is_empty() {
        return (MOST_SIDE, MOST_LAG);
    }
    let every_s = median(intervals);
    let bins = |seconds: f64, most: usize| (1..most).find(|n| *n as f64 * every_s >= seconds - 0.5 * every_s);
    (bins(SIDE_S, MOST_SIDE).unwrap_or(MOST_SIDE), bins(LAG_S, MOST_LAG).unwrap_or(MOST_LAG))
}

/// Median of the values up to `reach` places to each side of every place.
fn medians_around(values: &[f64], reach: usize) -> Vec<f64> {
    let mut sorted: Vec<f64> = Vec::with_capacity(2 * reach + 1);
    let place = |sorted: &[f64], value: f64| sorted.partition_point(|v| v.total_cmp(&value).is_lt());
    for &value in values.iter().take(reach) {
        sorted.insert(place(&sorted, value), value);
    }
    (0..values.len())
        .map(|k| {
            if let Some(&enters) = values.get(k + reach) {
                sorted.insert(place(&sorted, enters), enters);
            }
            if let Some(&leaves) = k.checked_sub(reach + 1).and_then(|left| values.get(left)) {
                sorted.remove(place(&sorted, leaves));
            }
            middle_of(&sorted)
        })
        .collect()
}

/// Median of at most [`MOST_SIDE`] values.
fn median_of_few(values: &[f64]) -> f64 {
    let mut sorted = [0.0; MOST_SIDE];
    let sorted = &mut sorted[..values.len()];
    sorted.copy_from_slice(values);
    sorted.sort_unstable_by(f64::total_cmp);
    middle_of(sorted)
}

fn middle_of(sorted: &[f64]) -> f64 {
    let middle = sorted.len() / 2;
    if sorted.len().is_multiple_of(2) { 0.5 * (sorted[middle - 1] + sorted[middle]) } else { sorted[middle] }
}

fn median(mut values: Vec<f64>) -> f64 {
    let middle = values.len() / 2;
    let even = values.len().is_multiple_of(2);
    let (below, upper, _) = values.select_nth_unstable_by(middle, f64::total_cmp);
    let upper = *upper;
    // The value before the middle one is the largest of those below it.
    let lower = below.iter().copied().max_by(f64::total_cmp).filter(|_| even).unwrap_or(upper);
    if even { 0.5 * (lower + upper) } else { upper }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn medians_that_move_along_are_those_of_every_window_sorted_anew() {
        let values: Vec<f64> = (0..50).map(|i| f64::from((i * 7919) % 17) - 8.0).collect();
        for reach in [0, 1, 6, 49, 60] {
            let moving = medians_around(&values, reach);
            for k in 0..values.len() {
                let mut window = values[k.saturating_sub(reach)..(k + reach + 1).min(values.len())].to_vec();
                assert_eq!(moving[k].to_bits(), median(window.clone()).to_bits(), "reach {reach}, place {k}");
                window.sort_by(f64::total_cmp);
                assert_eq!(moving[k].to_bits(), middle_of(&window).to_bits(), "reach {reach}, place {k}");
            }
        }
    }

    fn stretch(step_at: usize, step: f64) -> (Vec<f64>, Vec<f64>) {
        let time_s: Vec<f64> = (0..120).map(|i| 5.0 * f64::from(i)).collect();
        let po2 = (0..120)
            .map(|i| {
                let ripple = 0.001 * f64::from((i * 7919 % 13) - 6) / 6.0;
                0.8 - 0.0002 * f64::from(i) + ripple + if i as usize >= step_at { step } else { 0.0 }
            })
            .collect();
        (time_s, po2)
    }

    #[test]
    fn an_unmarked_add_is_proposed_where_it_happened() {
        let (time_s, po2) = stretch(60, 0.08);
        let found = jumps(&time_s, &po2, LoopKept::Sealed);
        assert_eq!(found.len(), 1, "{found:?}");
        assert!((found[0].at_s - 300.0).abs() <= 20.0 && (found[0].change_bar - 0.08).abs() < 0.005);
        assert_eq!(found[0].looks_like, Jump::OxygenAdd);
    }

    #[test]
    fn a_puff_of_diluent_is_a_jump_only_where_nothing_may_be_made_up() {
        let (time_s, po2) = stretch(60, -0.05);
        assert_eq!(jumps(&time_s, &po2, LoopKept::Held), []);
        assert_eq!(jumps(&time_s, &po2, LoopKept::Sealed)[0].looks_like, Jump::DiluentAdd);
    }

    #[test]
    fn readings_of_two_decimals_every_half_minute_hide_a_real_jump_only_and_invent_none() {
        // As written down from a handset: 0.66, 0.65, 0.63 …, with the roundings that come of it.
        let time_s: Vec<f64> = (0..20).map(|i| 30.0 * f64::from(i)).collect();
        let fall = |i: f64| libm::round(100.0 * (0.875 - 0.0172 * i)) / 100.0;
        let steady: Vec<f64> = (0..20).map(|i| fall(f64::from(i))).collect();
        assert_eq!(jumps(&time_s, &steady, LoopKept::Sealed), []);
        let added: Vec<f64> =
            steady.iter().enumerate().map(|(i, po2)| po2 + if i >= 9 { 0.07 } else { 0.0 }).collect();
        let found = jumps(&time_s, &added, LoopKept::Sealed);
        assert_eq!(found.len(), 1, "{found:?}");
        assert!((found[0].at_s - 270.0).abs() <= 30.0, "{found:?}");
    }

    #[test]
    fn a_steady_decline_has_no_jump() {
        let (time_s, po2) = stretch(0, 0.0);
        assert_eq!(jumps(&time_s, &po2, LoopKept::Sealed), []);
    }
}
