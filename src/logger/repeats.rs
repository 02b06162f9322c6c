//! How long one value may repeat itself before it is frozen.
//!
//! Comes in: the readings of one instrument, and what its papers say of its noise and its last digit. With noise of
//! standard deviation `σ` a reading rounded to steps of `δ` is the same as the one before it with a chance of at most
//! `p = erf(δ/(2√2·σ))`, which is that of the best case, a mean in the middle of a step. So `m` repetitions have a chance
//! of at most `p^m`. An instrument that answers oftener than it measures repeats itself more, and shows it: where its own
//! habit makes the repetitions plausible, they are. A repetition while the other channel moves is found by
//! [`crate::series::frozen`], papers or not.

use crate::entry::{Amount, Instrument, InstrumentPapers};
use crate::quantity::Quantity;
use crate::series::FrozenOptions;

/// Pairs of neighbours that make a habit (common practice, no source).
const HABIT_PAIRS: u64 = 30;
/// The chance below which readings all alike are doubtful enough to make no point of them (common practice, no source).
const DOUBTFUL: f64 = 1e-3;

/// Noise and last digit of an instrument by its papers, in SI units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Noise {
    /// Standard deviation, fixed.
    fixed: f64,
    /// Standard deviation as a share of the reading.
    share: f64,
    /// Step of the last digit.
    step: f64,
}

impl Noise {
    /// Of an instrument whose papers state noise and last digit.
    pub(super) fn of(instrument: &Instrument) -> Option<Self> {
        let new = |noise: Amount<f64>, step: f64, coverage: f64| {
            let (fixed, share) = match noise {
                Amount::Fixed(fixed) => (fixed / coverage, 0.0),
                Amount::OfReading(share) => (0.0, share / coverage),
            };
            (step > 0.0).then_some(Self { fixed, share, step })
        };
        match instrument.papers.as_ref()? {
            InstrumentPapers::Meter(meter) => {
                let papers = &meter.papers;
                new(si(papers.noise?), papers.resolution?.si(), papers.coverage)
            }
            InstrumentPapers::Transducer(transducer) => {
                let papers = &transducer.papers;
                new(si(papers.noise?), papers.resolution?.si(), papers.coverage)
            }
        }
    }

    /// Logarithm of the greatest chance that a reading repeats the one before it; nought without noise.
    fn log_stay(&self, value: f64) -> f64 {
        let deviation = self.fixed.max(self.share * value.abs());
        if deviation > 0.0 {
            libm::log(libm::erf(self.step / (2.0 * 2.0_f64.sqrt() * deviation)).max(f64::MIN_POSITIVE))
        } else {
            0.0
        }
    }
}

fn si<D: Quantity>(amount: Amount<D>) -> Amount<f64> {
    match amount {
        Amount::Fixed(fixed) => Amount::Fixed(fixed.si()),
        Amount::OfReading(share) => Amount::OfReading(share),
    }
}

/// Repetitions of one instrument.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Repeats {
    noise: Option<Noise>,
    /// The value that repeats, as shown and in SI.
    shown: f64,
    si: f64,
    since_s: f64,
    last_s: f64,
    /// Readings that show it in a row.
    times: u64,
    /// Pairs of neighbours before the present repetition, and the equal ones among them.
    pairs: u64,
    equal: u64,
    /// Whether the present repetition was once found too long; it then makes no habit.
    named: bool,
}

impl Repeats {
    pub(super) const fn new(noise: Option<Noise>) -> Self {
        Self {
            noise,
            shown: f64::NAN,
            si: f64::NAN,
            since_s: f64::NAN,
            last_s: f64::NAN,
            times: 0,
            pairs: 0,
            equal: 0,
            named: false,
        }
    }

    /// The same instrument with nothing heard of it yet but its habit.
    pub(super) const fn anew(&self) -> Self {
        Self { pairs: self.pairs, equal: self.equal, ..Self::new(self.noise) }
    }

    /// Whether the last reading is another than the one before it.
    pub(super) const fn is_new(&self) -> bool {
        self.times == 1
    }

    /// The second of the first reading that shows the present value.
    pub(super) const fn since_s(&self) -> f64 {
        self.since_s
    }

    /// How many readings in a row show it.
    pub(super) const fn times(&self) -> u64 {
        self.times
    }

    /// A reading came.
    pub(super) fn heard(&mut self, at_s: f64, shown: f64, si: f64) {
        // The very same number, bit for bit, is what freezing means.
        if self.times > 0 && shown.to_bits() == self.shown.to_bits() {
            self.times += 1;
        } else {
            if self.times > 0 {
                if !self.named {
                    self.pairs += self.times - 1;
                    self.equal += self.times - 1;
                }
                self.pairs += 1;
            }
            (self.shown, self.si, self.since_s, self.times, self.named) = (shown, si, at_s, 1, false);
        }
        self.last_s = at_s;
        self.named |= self.frozen_since_s().is_some();
    }

    /// Since when the value is frozen by the papers; none when it is not.
    pub(super) fn frozen_since_s(&self) -> Option<f64> {
        let habit = FrozenOptions::default();
        let long = self.last_s - self.since_s >= habit.least_s && self.times >= habit.least_readings as u64;
        (long && self.is_implausible(self.times, habit.chance)).then_some(self.since_s)
    }

    /// Whether `readings` from `from_s` on all show one value, and that is doubtful.
    pub(super) fn all_alike_since(&self, from_s: f64, readings: usize) -> bool {
        self.since_s <= from_s && self.is_implausible(readings as u64, DOUBTFUL)
    }

    fn is_implausible(&self, times: u64, chance: f64) -> bool {
        let Some(noise) = self.noise else { return false };
        let repeats = times.saturating_sub(1) as f64;
        let limit = libm::log(chance);
        let by_papers = repeats * noise.log_stay(self.si) < limit;
        let by_habit = self.pairs < HABIT_PAIRS
            || self.equal == 0
            || repeats * libm::log(self.equal as f64 / self.pairs as f64) < limit;
        by_papers && by_habit
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Noise of 0.1 % of 0.5 and a last digit of 0.0001: p = erf(0.0001/(2√2·0.0005)) = erf(0.070711) = 0.079656.
    const FINE: Noise = Noise { fixed: 0.0, share: 0.001, step: 0.000_1 };

    #[test]
    fn the_chance_of_staying_is_that_of_the_best_case() {
        assert!((libm::exp(FINE.log_stay(0.5)) - 0.079_656).abs() < 5e-7);
        assert!(FINE.log_stay(0.0).abs() < 1e-12);
    }

    #[test]
    fn a_fine_display_is_frozen_after_five_seconds_and_a_coarse_one_never() {
        let coarse = Noise { step: 0.01, ..FINE };
        for (noise, frozen) in [(Some(FINE), Some(0.0)), (Some(coarse), None), (None, None)] {
            let mut repeats = Repeats::new(noise);
            for n in 0..25 {
                repeats.heard(0.2 * f64::from(n), 0.5, 0.5);
            }
            assert_eq!(repeats.frozen_since_s(), None);
            repeats.heard(5.0, 0.5, 0.5);
            assert_eq!(repeats.frozen_since_s(), frozen);
            repeats.heard(5.2, 0.500_1, 0.500_1);
            assert_eq!(repeats.frozen_since_s(), None);
        }
    }

    #[test]
    fn an_instrument_that_always_answers_ten_times_the_same_is_not_frozen() {
        let mut repeats = Repeats::new(Some(FINE));
        for n in 0..600 {
            // A new value every ten readings; 54 of the 59 pairs in two of them are equal.
            let value = 0.5 + 0.000_1 * f64::from((n / 10 * 7) % 11);
            repeats.heard(0.2 * f64::from(n), value, value);
            assert_eq!(repeats.frozen_since_s(), None, "reading {n}");
        }
        // ln(1e-6)/ln(0.9) = 131 repetitions are more than even that habit has.
        for n in 600..760 {
            repeats.heard(0.2 * f64::from(n), 0.5, 0.5);
            assert!(n > 700 || repeats.frozen_since_s().is_none(), "reading {n}");
        }
        assert!(repeats.frozen_since_s().is_some());
    }

    #[test]
    fn a_frozen_stretch_makes_no_habit() {
        let mut repeats = Repeats::new(Some(FINE));
        for n in 0..1_000 {
            let value = if n < 900 { 0.5 } else { 0.5 + 0.000_1 * f64::from(n % 7) };
            repeats.heard(0.2 * f64::from(n), value, value);
        }
        for n in 1_000..1_030 {
            repeats.heard(0.2 * f64::from(n), 0.4, 0.4);
        }
        assert_eq!(repeats.frozen_since_s(), Some(200.0));
    }

    #[test]
    fn five_slow_readings_all_alike_are_doubtful() {
        let mut repeats = Repeats::new(Some(FINE));
        for n in 0..5 {
            repeats.heard(2.0 * f64::from(n), 0.5, 0.5);
        }
        // 0.0797⁴ = 4.0e-5.
        assert!(repeats.all_alike_since(0.0, 5) && repeats.frozen_since_s().is_none());
        assert!(!repeats.all_alike_since(-2.0, 5));
    }
}
