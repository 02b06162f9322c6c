//! The intermediate pressures a gauge can show, and the largest of them that may be set.
//!
//! Comes in: what an IP must satisfy, a range. Goes out: the largest division of the gauge that satisfies it, so a setting is
//! rounded down, never up. Injection and chance rise with the IP, so halving the range finds it; whatever is found satisfies
//! the condition itself, not only by that argument.

use super::injection::Feed;
use super::options::{FirstStageKind, Used};

/// A share of a division within which a limit counts as on it (a limit of 9.6 bar is on a division of 0.1 bar).
const ON_DIVISION: f64 = 1e-6;
/// Pressures within this much beyond the bench span are still in it, bar: as close as bench points are one pressure.
pub(super) const SPAN_TOLERANCE_BAR: f64 = 0.1;
/// How far beyond the bench span a compensated first stage may go at depth, as a share of its upper end.
pub const BEYOND_SPAN: f64 = 0.10;

/// Divisions of a gauge.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Divisions(pub(super) f64);

impl Divisions {
    /// The pressure of a division, bar; exact decimals where the division is one over a whole number.
    pub(super) fn bar(self, index: i64) -> f64 {
        let per_bar = 1.0 / self.0;
        if (per_bar - per_bar.round()).abs() < ON_DIVISION {
            index as f64 / per_bar.round()
        } else {
            index as f64 * self.0
        }
    }

    /// First and last division within a range; none when there is none.
    pub(super) fn within(self, (low, high): (f64, f64)) -> Option<(i64, i64)> {
        let first = (low / self.0 - ON_DIVISION).ceil() as i64;
        let last = (high / self.0 + ON_DIVISION).floor() as i64;
        (first <= last).then_some((first, last))
    }

    /// The largest division from `first` to `last` that satisfies `ok`; none when the first does not.
    pub(super) fn largest(self, (first, last): (i64, i64), ok: impl Fn(f64) -> bool) -> Option<i64> {
        if !ok(self.bar(first)) {
            return None;
        }
        if ok(self.bar(last)) {
            return Some(last);
        }
        let (mut good, mut bad) = (first, last);
        while bad - good > 1 {
            let middle = good + (bad - good) / 2;
            if ok(self.bar(middle)) {
                good = middle;
            } else {
                bad = middle;
            }
        }
        Some(good)
    }
}

/// Lowest and highest IP whose pressures lie within a bench span, bar gauge.
pub(super) fn range_of_span(used: &Used, (low, high): (f64, f64)) -> (f64, f64) {
    let (bottom, top) = match used.first_stage {
        FirstStageKind::Uncompensated => (low - used.set_at_bar_abs, high - used.set_at_bar_abs),
        FirstStageKind::Compensated => {
            let at_depth = (1.0 + BEYOND_SPAN) * high - used.ambient_at(used.held_at_m());
            (low - used.dive_at_bar_abs, (high - used.dive_at_bar_abs).min(at_depth))
        }
    };
    (bottom.max(0.0), top)
}

/// The pressure an IP puts on the orifice that the span does not hold, bar absolute; none when it holds all.
pub(super) fn outside_span(feed: &Feed<'_>, ip_bar: f64, (low, high): (f64, f64)) -> Option<f64> {
    let surface = feed.p1_bar(ip_bar, 0.0);
    let held = feed.p1_bar(ip_bar, feed.used.held_at_m());
    if surface < low - SPAN_TOLERANCE_BAR || surface > high + SPAN_TOLERANCE_BAR {
        Some(surface)
    } else if feed.used.first_stage == FirstStageKind::Compensated && held > (1.0 + BEYOND_SPAN) * high {
        Some(held)
    } else {
        None
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn divisions_are_printed_decimals_and_limits_on_them_count() {
        let tenths = Divisions(0.1);
        assert_eq!(tenths.within((7.0, 9.6)), Some((70, 96)));
        assert_eq!((tenths.bar(96), tenths.bar(97)), (9.6, 9.7));
        assert_eq!(Divisions(0.25).within((7.1, 7.2)), None);
        assert_eq!(Divisions(0.25).within((7.1, 7.6)), Some((29, 30)));
    }

    #[test]
    fn the_largest_is_found_and_never_one_above_it() {
        let tenths = Divisions(0.1);
        for limit in 70..=130_i32 {
            let limit = f64::from(limit) / 10.0;
            let found = tenths.largest((70, 130), |ip| ip <= limit).map(|k| tenths.bar(k));
            assert_eq!(found, Some(limit));
        }
        assert_eq!(tenths.largest((70, 130), |ip| ip < 7.0), None);
    }
}
