//! Axes: numbers to pixels, and where the ticks go.
//!
//! Comes in: the range of an axis, its place in pixels, how much room a label needs. Goes out: a [`Scale`], and
//! [`Ticks`] at round numbers (steps of 1, 2 or 5 times a power of ten) whose labels keep apart. Left out:
//! logarithmic axes.

use super::number::{exponent, fixed};

/// A straight map from a range of numbers to a range of pixels.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Scale {
    pub low: f64,
    pub high: f64,
    from: f64,
    to: f64,
}

/// Ticks with labels, and the finer ones between them.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Ticks {
    pub major: Vec<(f64, String)>,
    pub minor: Vec<f64>,
}

impl Scale {
    /// `low` at pixel `from`, `high` at pixel `to`.
    pub(super) const fn new(low: f64, high: f64, from: f64, to: f64) -> Self {
        Self { low, high, from, to }
    }

    /// The pixel of a number, also beyond the range.
    pub(super) fn at(&self, value: f64) -> f64 {
        self.from + (value - self.low) / (self.high - self.low) * (self.to - self.from)
    }

    /// The pixel of a number, at the nearer end when it lies beyond the range.
    pub(super) fn clamped(&self, value: f64) -> f64 {
        self.at(value.clamp(self.low, self.high))
    }

    /// Whether a number lies within the range.
    pub(super) fn shows(&self, value: f64) -> bool {
        value >= self.low && value <= self.high
    }

    /// The ticks that fit: `room` says how many pixels the widest of some labels needs from its neighbour.
    pub(super) fn ticks(&self, room: impl Fn(&[(f64, String)]) -> f64) -> Ticks {
        let (span, pixels) = (self.high - self.low, (self.to - self.from).abs());
        let first = exponent(span) - 2;
        for power in first..first + 5 {
            for (digit, finer) in [(1.0, 5), (2.0, 4), (5.0, 5)] {
                let step = digit * 10f64.powi(power);
                if span / step > 100.0 {
                    continue;
                }
                let major: Vec<(f64, String)> = multiples(step, self.low, self.high)
                    .map(|value| (value, fixed(value, (-power).clamp(0, 12) as usize)))
                    .collect();
                if pixels * step / span >= room(&major) {
                    let minor = multiples(step / f64::from(finer), self.low, self.high).collect();
                    return Ticks { major, minor };
                }
            }
        }
        Ticks { major: Vec::new(), minor: Vec::new() }
    }
}

/// Multiples of `step` from `low` to `high`; none when the numbers are too large for such a step to be told.
fn multiples(step: f64, low: f64, high: f64) -> impl Iterator<Item = f64> {
    let told = low.abs().max(high.abs()) / step < 1e9;
    let slack = 1e-9;
    let (first, last) = if told {
        (libm::ceil(low / step - slack) as i64, libm::floor(high / step + slack) as i64)
    } else {
        (0, -1)
    };
    (first..=last).map(move |i| i as f64 * step)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(low: f64, high: f64, pixels: f64, room: f64) -> Vec<String> {
        Scale::new(low, high, 0.0, pixels).ticks(|_| room).major.into_iter().map(|t| t.1).collect()
    }

    #[test]
    fn ticks_are_round_and_as_close_as_their_room_allows() {
        assert_eq!(labels(3.7, 13.4, 600.0, 50.0), ["4", "5", "6", "7", "8", "9", "10", "11", "12", "13"]);
        assert_eq!(labels(3.7, 13.4, 300.0, 50.0), ["4", "6", "8", "10", "12"]);
        assert_eq!(labels(-0.3, 0.3, 100.0, 30.0), ["\u{2212}0.2", "0.0", "0.2"]);
    }

    #[test]
    fn a_range_too_narrow_for_doubles_has_no_ticks_rather_than_endless_ones() {
        assert!(labels(1e9, 1e9 + 1e-6, 600.0, 50.0).is_empty());
    }

    #[test]
    fn the_low_end_may_stand_at_the_bottom_of_the_picture() {
        let scale = Scale::new(0.0, 10.0, 300.0, 100.0);
        assert_eq!((scale.at(0.0), scale.at(10.0), scale.clamped(20.0)), (300.0, 100.0, 100.0));
        assert!(scale.shows(10.0) && !scale.shows(10.1));
    }
}
