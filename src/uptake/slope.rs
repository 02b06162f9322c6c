//! Slope of a span of readings, and what measurement noise makes of its uncertainty.
//!
//! Takes times and values of a span, evenly spaced or nearly so, and returns the ordinary least-squares slope with two
//! standard uncertainties: the ordinary one, as if the readings were independent, and that of W. K. Newey and K. D.
//! West, Econometrica 55 (1987) 703, with Bartlett's weights `1 − l/S`, the automatic bandwidth
//! `S = 1.1447·(α n)^(1/3)` of D. W. K. Andrews, Econometrica 59 (1991) 817, eq. 6.2 and 6.4 for a first-order
//! autoregression of the scores, and the small-sample factor `n/(n − 2)`.
//!
//! It stands beside [`crate::stats::autocorrelation`], which whitens first and never credits alternating readings: this
//! is the textbook estimator, so that a reader can recompute the figure with any statistics package. Left out: wander of
//! the uptake itself, which integrates into the line and shows in no residual.

/// A slope with its uncertainties, in the unit of the values per unit of time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Slope {
    /// Slope.
    pub slope: f64,
    /// Value of the line at the mean time.
    pub level: f64,
    /// Mean time.
    pub middle: f64,
    /// Newey-West standard uncertainty of the slope.
    pub u: f64,
    /// Ordinary standard error of the slope; for comparison only.
    pub u_ordinary: f64,
    /// Standard deviation of the residuals (n − 2).
    pub residual: f64,
    /// Bandwidth that was used, in readings.
    pub bandwidth: f64,
    /// Degrees of freedom of `u`: with Bartlett's weights the variance of a long-run variance is `2·(2/3)·S/n` of its
    /// square (Andrews 1991, section 3), which is that of a chi-squared of `1.5·n/S`; at most n − 2.
    pub dof: f64,
    /// Readings.
    pub readings: usize,
}

/// Slope of `values` against `times`; none with fewer than four readings or when all times are the same.
#[must_use]
pub fn slope(times: &[f64], values: &[f64]) -> Option<Slope> {
    fit(times, values, None)
}

/// As [`slope`] with a stated bandwidth, in readings: lags below it count with the weight `1 − lag/bandwidth`.
#[must_use]
pub fn slope_with_bandwidth(times: &[f64], values: &[f64], bandwidth: f64) -> Option<Slope> {
    fit(times, values, Some(bandwidth))
}

fn fit(times: &[f64], values: &[f64], bandwidth: Option<f64>) -> Option<Slope> {
    let readings = times.len().min(values.len());
    if readings < 4 {
        return None;
    }
    let n = readings as f64;
    let middle = times.iter().take(readings).sum::<f64>() / n;
    let level = values.iter().take(readings).sum::<f64>() / n;
    let (mut square, mut cross) = (0.0, 0.0);
    for (t, y) in times.iter().zip(values) {
        square += (t - middle) * (t - middle);
        cross += (t - middle) * (y - level);
    }
    if square.is_nan() || square <= 0.0 || !cross.is_finite() {
        return None;
    }
    let slope = cross / square;
    let mut residuals = 0.0;
    let mut scores = Vec::with_capacity(readings);
    for (t, y) in times.iter().zip(values) {
        let residual = y - level - slope * (t - middle);
        residuals += residual * residual;
        scores.push((t - middle) * residual);
    }
    let ordinary = residuals / (n - 2.0) / square;
    let bandwidth = bandwidth.unwrap_or_else(|| andrews_bandwidth(&scores));
    // Bartlett's weights make a positive semidefinite estimate, so that only rounding can take it below zero.
    let long_run = (bartlett_sum(&scores, bandwidth) * n / (n - 2.0)).max(0.0) / (square * square);
    Some(Slope {
        slope,
        level,
        middle,
        u: long_run.sqrt(),
        u_ordinary: ordinary.sqrt(),
        residual: (residuals / (n - 2.0)).sqrt(),
        bandwidth,
        dof: (1.5 * n / bandwidth).min(n - 2.0),
        readings,
    })
}

/// Andrews' automatic bandwidth for Bartlett's weights, from a first-order autoregression of the scores; at least 1.
fn andrews_bandwidth(scores: &[f64]) -> f64 {
    let before: f64 = scores.iter().take(scores.len() - 1).map(|v| v * v).sum();
    if before <= 0.0 {
        return 1.0;
    }
    // The coefficient is kept from 1, where the bandwidth is infinite (Andrews and Monahan, Econometrica 60 (1992) 953,
    // section 3).
    let rho = (lagged(scores, 1)[0] / before).clamp(-0.97, 0.97);
    let (less, more) = (1.0 - rho, 1.0 + rho);
    let alpha = 4.0 * rho * rho / (less * less * more * more);
    (1.1447 * libm::cbrt(alpha * scores.len() as f64)).clamp(1.0, scores.len() as f64)
}

/// Sum of squares and of lagged products, weighted.
fn bartlett_sum(scores: &[f64], bandwidth: f64) -> f64 {
    let mut sum: f64 = scores.iter().map(|v| v * v).sum();
    let mut lag = 1;
    while (lag as f64) < bandwidth && lag < scores.len() {
        let several = lagged(scores, lag);
        for (at, product) in (lag..).zip(several).take_while(|(at, _)| (*at as f64) < bandwidth) {
            sum += 2.0 * (1.0 - at as f64 / bandwidth) * product;
        }
        lag += several.len();
    }
    sum
}

/// Lags whose products are summed side by side: one sum alone waits for its last addition before the next.
const SIDE_BY_SIDE: usize = 8;

/// Sums of the products of values `lag` apart, `lag + 1` apart and so on; each in order of the values.
fn lagged(values: &[f64], lag: usize) -> [f64; SIDE_BY_SIDE] {
    let mut sums = [0.0; SIDE_BY_SIDE];
    let later = values.get(lag..).unwrap_or_default();
    let whole = (later.len() + 1).saturating_sub(SIDE_BY_SIDE);
    for (a, apart) in values.iter().zip(later.windows(SIDE_BY_SIDE)) {
        for (sum, b) in sums.iter_mut().zip(apart) {
            *sum += a * b;
        }
    }
    for (at, a) in values.iter().enumerate().skip(whole) {
        for (sum, b) in sums.iter_mut().zip(later.iter().skip(at)) {
            *sum += a * b;
        }
    }
    sums
}
