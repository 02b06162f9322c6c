//! Mean of a span of readings and its standard uncertainty, neighbouring readings being alike.
//!
//! Takes readings in the order they were taken (NaN is passed over), evenly spaced or nearly so, and returns the mean,
//! the standard uncertainty of the mean from the observed scatter, the effective number of independent readings, and
//! the drift over the span. The scatter is that about a straight line: a slow drift moves pressure and flow along
//! the orifice's line together and is no scatter of their means.
//!
//! Equations: with the first autocorrelation `r` of the residuals of `n` readings about a line, `ρ = (r + 2/n)/(1 − 4/n)`
//! undoes the bias `E r ≈ ρ − (2 + 4ρ)/n` (Kendall and Marriott-Pope, in its form for a fitted line; from
//! memory). The variance of the mean of a first-order autoregressive process is `σ²·τ/n` with
//! `τ = (1 + ρ)/(1 − ρ) − 2ρ(1 − ρⁿ)/(n(1 − ρ)²)`, and `σ² = Σe²/(n − 2τ)`, because the line takes with it what is
//! as slow as itself. White noise over a slow wander would hide the wander from neighbours, so the same is done with
//! means of two, four, … readings (blocking, Flyvbjerg and Petersen 1989) down to [`LEAST_BLOCKS`] of them, and the
//! largest uncertainty counts. A negative `ρ` counts as zero.
//!
//! On simulated noise (white, `ρ` = 0.5 and 0.9, white over a slow wander) the stated uncertainty comes out at 1.05 to 1.5
//! times the true one. A span of fewer than about five independent readings does not know its scatter: at three, one mean in
//! twelve lies further off than three of its uncertainties. Left out: anything slower than the span itself.

/// Fewest block means from which an autocorrelation is taken: their scatter is then known to about 15 %.
pub const LEAST_BLOCKS: usize = 32;
/// Fewest independent readings that a span may come out with before its scatter cannot be told from its drift.
const LEAST_EFFECTIVE: f64 = 3.0;
/// Doublings, enough for 32 blocks of a quarter of a thousand million readings.
const LEVELS: usize = 24;

/// Mean, scatter and drift of a span; all but the counts in the unit of the readings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MeanOfSpan {
    /// The mean.
    pub mean: f64,
    /// Standard uncertainty of the mean from the observed scatter, autocorrelation included.
    pub scatter: f64,
    /// Standard deviation of a single reading about the line.
    pub deviation: f64,
    /// Effective number of independent readings, 1 to `readings`; 1 when the readings show no scatter at all.
    pub effective: f64,
    /// Finite readings.
    pub readings: usize,
    /// Change along the fitted line from the first reading to the last.
    pub drift: f64,
}

impl MeanOfSpan {
    /// Standard uncertainty of the drift: of `n` independent readings it is `√12` times that of the mean, for large n.
    #[must_use]
    pub fn drift_u(&self) -> f64 {
        12.0_f64.sqrt() * self.scatter
    }
}

/// Mean of the finite readings among `values`; none when there are fewer than three, or when they are so large that
/// their squares overflow.
#[must_use]
pub fn mean_of_span(values: &[f64]) -> Option<MeanOfSpan> {
    let finite = || values.iter().copied().filter(|x| x.is_finite());
    let offset = finite().next()?;
    let mut readings = 0_usize;
    let mut sum = 0.0;
    let mut moment = 0.0;
    for x in finite() {
        sum += x - offset;
        moment += (x - offset) * readings as f64;
        readings += 1;
    }
    if readings < 3 {
        return None;
    }
    let n = readings as f64;
    let middle = (n - 1.0) / 2.0;
    let mean = sum / n;
    // The sum of squares of 0, 1, …, n − 1 about their mean is n(n² − 1)/12.
    let slope = (moment - middle * sum) / (n * (n * n - 1.0) / 12.0);

    let mut levels = [Level::default(); LEVELS];
    for (i, x) in finite().enumerate() {
        push(&mut levels, x - offset - mean - slope * (i as f64 - middle));
    }
    let single = levels[0].squares / (n - 2.0);
    let variance = levels
        .iter()
        .enumerate()
        .filter(|(i, level)| *i == 0 || level.count >= LEAST_BLOCKS)
        .map(|(_, level)| level.variance_of_mean())
        .fold(0.0, f64::max);
    let effective = if variance > 0.0 { (single / variance).clamp(1.0, n) } else { 1.0 };
    (mean.is_finite() && variance.is_finite() && single.is_finite()).then(|| MeanOfSpan {
        mean: offset + mean,
        scatter: variance.sqrt(),
        deviation: single.sqrt(),
        effective,
        readings,
        drift: slope * (n - 1.0),
    })
}

/// Sums over the block means of one doubling.
#[derive(Debug, Clone, Copy, Default)]
struct Level {
    count: usize,
    squares: f64,
    neighbours: f64,
    last: f64,
}

/// Adds a residual, and the means of pairs it completes at each doubling.
fn push(levels: &mut [Level; LEVELS], residual: f64) {
    let mut value = residual;
    for level in levels {
        let last = level.last;
        level.squares += value * value;
        level.neighbours += value * last;
        level.last = value;
        level.count += 1;
        if level.count % 2 == 1 {
            return;
        }
        value = (value + last) / 2.0;
    }
}

impl Level {
    /// Variance of the mean of all, as of a first-order autoregressive process.
    fn variance_of_mean(&self) -> f64 {
        if self.count < 3 || self.squares <= 0.0 {
            return 0.0;
        }
        let n = self.count as f64;
        let r = self.neighbours / self.squares;
        // With so few that the correction would turn over, the plain coefficient is all there is.
        let rho = if n > 8.0 { (r + 2.0 / n) / (1.0 - 4.0 / n) } else { r };
        let tau = times_fewer(rho.clamp(0.0, 0.999_9), n).min(n / LEAST_EFFECTIVE).max(1.0);
        self.squares / (n - 2.0 * tau) * tau / n
    }
}

/// How many times fewer independent readings than `n` there are at the autocorrelation `rho` of neighbours.
fn times_fewer(rho: f64, n: f64) -> f64 {
    let rest = 1.0 - rho;
    (1.0 + rho) / rest - 2.0 * rho * (1.0 - libm::pow(rho, n)) / (n * rest * rest)
}
