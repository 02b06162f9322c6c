//! Where a settling signal has settled.
//!
//! Takes evenly spaced means (blocks of a second or so) and returns how many of the first to leave out. The place is
//! that of the *marginal standard error rule* (K. P. White, Simulation 69 (1997) 323-334; from memory): leave out the
//! `d` first of `n` for which `Σ_{i≥d} e_i² / (n − d)²` is least, with at most half left out. The residuals `e` are
//! about the mean, or about a straight line for a signal that may go on creeping. Noise alone also has a least place
//! somewhere; so the cut is made only if the mean of what it would cut off stands away from the rest by more than
//! four of its standard uncertainties, autocorrelation included, and by more than a floor that would matter.

use super::mean::mean_of_span;

/// What the settled part is allowed to do.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Settled {
    /// Stay at one level.
    Level,
    /// Creep along a straight line.
    Line,
}

/// Fewest means that must be left after the cut: below that a line has no scatter worth the name.
const LEAST_LEFT: usize = 4;
/// Standard uncertainties that make a difference: more than for one test, since the rule has looked at many places (common
/// practice, no source).
const SIGNIFICANT: f64 = 4.0;

/// How many of the first values belong to the settling. `floor` is the deviation that would not matter.
#[must_use]
pub fn unsettled(values: &[f64], settled: Settled, floor: f64) -> usize {
    let n = values.len();
    let Some(&offset) = values.last() else { return 0 };
    let most = (n / 2).min(n.saturating_sub(LEAST_LEFT));
    if most == 0 {
        return 0;
    }
    let mut tail = Tail::default();
    let mut best = (f64::INFINITY, 0, tail);
    for d in (0..n).rev() {
        tail.add(values[d] - offset);
        let left = n - d;
        if d <= most && left >= LEAST_LEFT {
            let rule = tail.squares_about(settled) / (left * left) as f64;
            // Of equals the earliest: leave out no more than need be.
            if rule <= best.0 {
                best = (rule, d, tail);
            }
        }
    }
    let (_, mut cut, tail) = best;
    if cut == 0 {
        return 0;
    }
    let deviation = |i: usize| values[i] - offset - tail.at(settled, n - 1 - i);
    let head = (0..cut).map(deviation).sum::<f64>() / cut as f64;
    let Some(rest) = mean_of_span(&values[cut..]) else { return 0 };
    let left = (n - cut) as f64;
    let single = rest.scatter * rest.scatter * left;
    // The head's mean, the tail's mean, and the tail's line carried to the middle of the head.
    let mut shares = 1.0 / cut as f64 + 1.0 / left;
    if settled == Settled::Line {
        shares += 3.0 * (n * n) as f64 / (left * left * left);
    }
    if head.abs() <= (SIGNIFICANT * (single * shares).sqrt()).max(floor) {
        return 0;
    }
    // A signal without noise is cut at half by the rule, however soon it is where it will stay.
    while cut > 0 && deviation(cut - 1).abs() <= floor {
        cut -= 1;
    }
    cut
}

/// Sums over the last values, counted backward.
#[derive(Debug, Clone, Copy, Default)]
struct Tail {
    n: f64,
    sum: f64,
    squares: f64,
    moment: f64,
}

impl Tail {
    fn add(&mut self, x: f64) {
        self.moment += x * self.n;
        self.n += 1.0;
        self.sum += x;
        self.squares += x * x;
    }

    fn slope(&self) -> f64 {
        let n = self.n;
        (self.moment - (n - 1.0) / 2.0 * self.sum) / (n * (n * n - 1.0) / 12.0)
    }

    fn squares_about(&self, settled: Settled) -> f64 {
        let n = self.n;
        let about_mean = self.squares - self.sum * self.sum / n;
        match settled {
            Settled::Level => about_mean.max(0.0),
            Settled::Line => {
                let slope = self.slope();
                (about_mean - slope * slope * n * (n * n - 1.0) / 12.0).max(0.0)
            }
        }
    }

    /// The level or line at the value that stands `back` before the last.
    fn at(&self, settled: Settled, back: usize) -> f64 {
        let mean = self.sum / self.n;
        match settled {
            Settled::Level => mean,
            Settled::Line => mean + self.slope() * (back as f64 - (self.n - 1.0) / 2.0),
        }
    }
}
