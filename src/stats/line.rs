//! Straight line y = a + b·x with standard uncertainties in both coordinates.
//!
//! Takes points with the standard uncertainty of each x and of each y and returns intercept, slope, their covariance and
//! the observed chi-squared. Algorithm: the Gauss-Newton iteration of ISO/TS 28037:2010, clause 7 (generalised distance
//! regression); with every `ux` zero it is clause 6 (weighted least squares) and needs one step. Use of the line forwards
//! and backwards: clause 11.
//!
//! **Standard errors** are those of clause 7 (and of York et al., Am. J. Phys. 72 (2004) 367): the inverse of the
//! curvature at the adjusted points. Two other definitions are in print, the inverse Hessian of the profiled
//! chi-squared, and the law of propagation applied to the whole fit; they differ from these in the second or third digit.
//! They are not scaled by the reduced chi-squared; [`Line::scaled`] does that on request (Birge).
//!
//! Points are taken as independent of one another and x as independent of y; for correlated points see
//! [`super::correlated`]. Vertical lines and lines forced through the origin are left out.

use super::line_scan::{DIRECTIONS, directions_of_better_lines, scanned_start};
pub use super::points::{CalibrationPoints, LineError};

/// A fitted line y = intercept + slope·x with standard uncertainties as in ISO/TS 28037:2010, clause 7.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Line {
    /// Value of the line at x = 0 (unit of y).
    pub intercept: f64,
    /// Unit of y per unit of x.
    pub slope: f64,
    /// Standard uncertainty of the intercept.
    pub intercept_u: f64,
    /// Standard uncertainty of the slope.
    pub slope_u: f64,
    /// Covariance of intercept and slope.
    pub covariance: f64,
    /// Observed chi-squared: sum of the squared weighted residuals.
    pub chi_square: f64,
    /// Degrees of freedom, n − 2.
    pub dof: usize,
    /// Number of points.
    pub n: usize,
    // The x at which value and slope are uncorrelated, with the value there and its variance. Evaluating about it keeps
    // its digits when x = 0 is far from the points, where intercept and slope nearly cancel one another.
    centre: f64,
    centre_value: f64,
    centre_variance: f64,
}

impl Line {
    /// A line made from its parameters and their variances and covariance, for instance after common sources of
    /// uncertainty were added. `n` points, observed `chi_square`.
    ///
    /// Where the points lie far from x = 0, prefer [`Line::scaled`] and [`Line::with_added`], which keep more digits.
    pub fn from_parts(
        (intercept, slope): (f64, f64),
        (intercept_variance, slope_variance, covariance): (f64, f64, f64),
        chi_square: f64,
        n: usize,
    ) -> Self {
        let centre = if slope_variance > 0.0 { -covariance / slope_variance } else { 0.0 };
        let centre_variance = (intercept_variance + centre * covariance).max(0.0);
        Self {
            intercept,
            slope,
            intercept_u: intercept_variance.max(0.0).sqrt(),
            slope_u: slope_variance.max(0.0).sqrt(),
            covariance,
            chi_square,
            dof: n.saturating_sub(2),
            n,
            centre,
            centre_value: intercept + slope * centre,
            centre_variance,
        }
    }

    /// A line through (`centre`, `value`) with a `slope` uncorrelated with the value there.
    pub(super) fn about(
        (centre, value, slope): (f64, f64, f64),
        (value_variance, slope_variance): (f64, f64),
        chi_square: f64,
        n: usize,
    ) -> Self {
        Self {
            intercept: value - slope * centre,
            slope,
            intercept_u: (value_variance + centre * centre * slope_variance).sqrt(),
            slope_u: slope_variance.sqrt(),
            covariance: -centre * slope_variance,
            chi_square,
            dof: n.saturating_sub(2),
            n,
            centre,
            centre_value: value,
            centre_variance: value_variance,
        }
    }

    /// Chi-squared over its degrees of freedom; none with two points.
    pub fn reduced_chi_square(&self) -> Option<f64> {
        (self.dof > 0).then(|| self.chi_square / self.dof as f64)
    }

    /// The same line with its variances and covariance multiplied by `factor` (the reduced chi-squared: Birge's ratio,
    /// Phys. Rev. 40 (1932) 207; or a pooled residual variance, when the fit was made with unit uncertainties).
    pub fn scaled(&self, factor: f64) -> Self {
        Self {
            intercept_u: self.intercept_u * factor.sqrt(),
            slope_u: self.slope_u * factor.sqrt(),
            covariance: self.covariance * factor,
            centre_variance: self.centre_variance * factor,
            ..*self
        }
    }

    /// The same line with the variance of the intercept, the variance of the slope and their covariance enlarged by a
    /// source of uncertainty common to all points.
    pub fn with_added(&self, intercept_variance: f64, slope_variance: f64, covariance: f64) -> Self {
        // Moved to the centre first, where the sum does not cancel.
        let c = self.centre;
        let old_slope_variance = self.slope_u * self.slope_u;
        let value_variance =
            self.centre_variance + intercept_variance + c * (2.0 * covariance + c * slope_variance);
        let value_slope = covariance + c * slope_variance;
        let slope_sum = old_slope_variance + slope_variance;
        let shift = if slope_sum > 0.0 { -value_slope / slope_sum } else { 0.0 };
        Self {
            intercept_u: (self.intercept_u * self.intercept_u + intercept_variance).max(0.0).sqrt(),
            slope_u: slope_sum.max(0.0).sqrt(),
            covariance: self.covariance + covariance,
            centre: c + shift,
            centre_value: self.centre_value + self.slope * shift,
            centre_variance: (value_variance + shift * value_slope).max(0.0),
            ..*self
        }
    }

    /// Value of the line at `x`.
    pub fn at(&self, x: f64) -> f64 {
        self.centre_value + self.slope * (x - self.centre)
    }

    /// Standard uncertainty of the line at `x`, where `x` is exact.
    pub fn u_at(&self, x: f64) -> f64 {
        self.variance_at(x).sqrt()
    }

    /// The y of an `x` with standard uncertainty `ux`, and its standard uncertainty (ISO/TS 28037:2010, 11.1).
    pub fn forward(&self, x: f64, ux: f64) -> (f64, f64) {
        let through = self.slope * ux;
        (self.at(x), (self.variance_at(x) + through * through).sqrt())
    }

    /// The x of a `y` with standard uncertainty `uy`, and its standard uncertainty to first order
    /// (ISO/TS 28037:2010, 11.2). None when the slope is zero. For limits that stay honest when the slope is uncertain
    /// see [`super::inverse::line_inverse`].
    pub fn inverse(&self, y: f64, uy: f64) -> Option<(f64, f64)> {
        let x = self.centre + (y - self.centre_value) / self.slope;
        let u = ((self.variance_at(x) + uy * uy).sqrt() / self.slope).abs();
        (x.is_finite() && u.is_finite()).then_some((x, u))
    }

    /// The x at which value and slope are uncorrelated, the value there, and its variance: for what must keep its
    /// digits far from x = 0.
    pub(super) fn about_centre(&self) -> (f64, f64, f64) {
        (self.centre, self.centre_value, self.centre_variance)
    }

    fn variance_at(&self, x: f64) -> f64 {
        let lever = self.slope_u * (x - self.centre);
        self.centre_variance + lever * lever
    }
}

/// Fits the line to the points.
///
/// # Errors
///
/// [`LineError::NoSlope`] when the slope leaves the finite numbers (a flat line through points without `uy`),
/// [`LineError::NotConverged`] when the steps do not become small.
pub fn fit(points: &CalibrationPoints) -> Result<Line, LineError> {
    let run =
        |start| iterate(points.x(), points.x_variances(), points.y(), points.y_variances(), start, FIT_STEPS);
    // Points that scatter far more than their uncertainties say can have a second, worse minimum beside the right one, or
    // throw the first step out of the valley; of the two starts the better end counts. Points that scatter as stated leave
    // no room for a better line elsewhere, and nothing is scanned.
    let settled = |o: &Outcome| matches!(o, Outcome::Settled);
    let mut best = run(weighted_start(points));
    let better =
        if settled(&best.2) { directions_of_better_lines(points, best.0.chi_square) } else { 0..DIRECTIONS };
    if let Some(start) = scanned_start(points, better) {
        let other = run(start);
        if settled(&other.2) && (!settled(&best.2) || other.0.chi_square < best.0.chi_square * (1.0 - 1e-9)) {
            best = other;
        }
    }
    let (state, steps, outcome) = best;
    match outcome {
        Outcome::Settled => Ok(Line::about(
            (state.centre, state.value, state.slope),
            (1.0 / state.f2, 1.0 / state.g2),
            state.chi_square,
            points.count(),
        )),
        Outcome::Broken => Err(LineError::NoSlope { slope: state.slope, steps }),
        Outcome::Restless => Err(LineError::NotConverged { steps, slope: state.slope }),
    }
}

/// Intercept and slope with what the same pass yields, for Monte Carlo trials.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Estimate {
    /// Value of the line at x = 0.
    pub intercept: f64,
    /// Slope.
    pub slope: f64,
    /// Variance of the intercept (clause 7).
    pub intercept_variance: f64,
    /// Variance of the slope (clause 7).
    pub slope_variance: f64,
    /// Covariance of intercept and slope (clause 7).
    pub covariance: f64,
    /// Observed chi-squared.
    pub chi_square: f64,
    /// Gauss-Newton steps taken.
    pub steps: usize,
}

/// The fit of [`fit`] without checks and without allocating, for trials by the hundred thousand.
///
/// `x` and `y` with their *variances* `ux2`, `uy2`, all of one length (the shortest counts), and `start` = (intercept,
/// slope) near the answer. Iterates until a step moves the line by less than 1e-13 of the spread of y. None when it
/// does not settle, leaves the finite numbers, or has fewer than two points.
pub fn fit_from(x: &[f64], ux2: &[f64], y: &[f64], uy2: &[f64], start: (f64, f64)) -> Option<Estimate> {
    let n = x.len().min(ux2.len()).min(y.len()).min(uy2.len());
    if n < 2 {
        return None;
    }
    let (state, steps, outcome) = iterate(&x[..n], &ux2[..n], &y[..n], &uy2[..n], start, TRIAL_STEPS);
    matches!(outcome, Outcome::Settled).then(|| state.estimate(steps))
}

/// Steps after which [`fit`] gives up. Pearson's data with York's weights, a hard case in print, need 13.
const FIT_STEPS: usize = 1000;

/// Steps after which a trial gives up: a trial is a small disturbance of a fit that has settled.
const TRIAL_STEPS: usize = 200;

/// A step below this fraction of the spread of y ends the iteration.
const SETTLED: f64 = 1e-13;

/// Below this fraction of the spread of y, a step that is no smaller than the one before is rounding noise.
const ROUNDING: f64 = 1e-10;

enum Outcome {
    Settled,
    Broken,
    Restless,
}

/// The line about its weighted centre, in the coordinates given.
struct State {
    centre: f64,
    value: f64,
    slope: f64,
    // F² and G² of clause 7: inverse variances of the value at the centre and of the slope.
    f2: f64,
    g2: f64,
    chi_square: f64,
}

impl State {
    fn estimate(&self, steps: usize) -> Estimate {
        let slope_variance = 1.0 / self.g2;
        Estimate {
            intercept: self.value - self.slope * self.centre,
            slope: self.slope,
            intercept_variance: 1.0 / self.f2 + self.centre * self.centre * slope_variance,
            slope_variance,
            covariance: -self.centre * slope_variance,
            chi_square: self.chi_square,
            steps,
        }
    }
}

fn iterate(
    x: &[f64],
    ux2: &[f64],
    y: &[f64],
    uy2: &[f64],
    start: (f64, f64),
    most_steps: usize,
) -> (State, usize, Outcome) {
    let n = x.len() as f64;
    let x_mean = x.iter().sum::<f64>() / n;
    let y_mean = y.iter().sum::<f64>() / n;
    let mut x_square = 0.0;
    let mut y_square = 0.0;
    for (&x, &y) in x.iter().zip(y) {
        x_square += (x - x_mean) * (x - x_mean);
        y_square += (y - y_mean) * (y - y_mean);
    }
    let x_spread = (x_square / n).sqrt();
    // The floor is the rounding of y itself, for points that lie exactly flat.
    let y_spread = (y_square / n).sqrt() + f64::EPSILON * y_mean.abs();

    // Symbols as in ISO/TS 28037:2010, clause 7, but about a moving centre: x and y are taken from the means (so that a
    // huge offset costs no digits), and the line is A + b·(x − centre), the centre following g0, the weighted mean of the
    // adjusted x (so that G² is not the small difference of two large sums when the weights are very unequal).
    let mut b = start.1;
    let mut centre = 0.0;
    let mut value = start.0 + b * x_mean - y_mean;
    let (mut f2, mut g2, mut chi_square);
    let mut before = f64::INFINITY;
    let mut steps = 0;
    let outcome = loop {
        steps += 1;
        let (mut t_sum, mut tg, mut tgg, mut th, mut tgh, mut tzz) = (0.0, 0.0, 0.0, 0.0, 0.0, 0.0);
        for (((&x, &ux2), &y), &uy2) in x.iter().zip(ux2).zip(y).zip(uy2) {
            let d = (x - x_mean) - centre;
            let t = 1.0 / (uy2 + b * b * ux2);
            let z = (y - y_mean) - value - b * d;
            // Adjusted x: x* = x + b·ux²·t·z.
            let g = d + b * ux2 * t * z;
            let tz = t * z;
            t_sum += t;
            tg += t * g;
            tgg += t * g * g;
            th += tz;
            tgh += tz * g;
            tzz += tz * z;
        }
        f2 = t_sum;
        chi_square = tzz;
        let g0 = tg / t_sum;
        g2 = tgg - g0 * tg;
        let db = (tgh - g0 * th) / g2;
        let da = th / t_sum;
        b += db;
        // Value at the new centre: the weighted mean residual there is th/F², plus the lever of the slope.
        value += da + b * g0 - db * g0;
        centre += g0;
        if !(b.is_finite() && value.is_finite() && g2 > 0.0) {
            break Outcome::Broken;
        }
        let step = da.abs() + db.abs() * x_spread;
        if step <= SETTLED * y_spread || (step <= ROUNDING * y_spread && step >= before) {
            break Outcome::Settled;
        }
        before = step;
        if steps == most_steps {
            break Outcome::Restless;
        }
    };
    let state = State { centre: centre + x_mean, value: value + y_mean, slope: b, f2, g2, chi_square };
    (state, steps, outcome)
}

/// Unweighted line, then one line with the weights its slope gives: near enough for Gauss-Newton as a rule.
fn weighted_start(points: &CalibrationPoints) -> (f64, f64) {
    let (x, ux2, y, uy2) = (points.x(), points.x_variances(), points.y(), points.y_variances());
    let plain = line_of_least_squares(x, y, |_| 1.0);
    let again = line_of_least_squares(x, y, |i| 1.0 / (uy2[i] + plain.1 * plain.1 * ux2[i]));
    if again.0.is_finite() && again.1.is_finite() { again } else { plain }
}

/// (intercept, slope) of least squares with the weight of each point.
fn line_of_least_squares(x: &[f64], y: &[f64], weight: impl Fn(usize) -> f64) -> (f64, f64) {
    let (mut w, mut wx, mut wy) = (0.0, 0.0, 0.0);
    for i in 0..x.len() {
        w += weight(i);
        wx += weight(i) * x[i];
        wy += weight(i) * y[i];
    }
    let (x_mean, y_mean) = (wx / w, wy / w);
    let (mut wxx, mut wxy) = (0.0, 0.0);
    for i in 0..x.len() {
        let d = x[i] - x_mean;
        wxx += weight(i) * d * d;
        wxy += weight(i) * d * (y[i] - y_mean);
    }
    let b = wxy / wxx;
    (y_mean - b * x_mean, b)
}

#[cfg(test)]
mod tests {
    use super::super::monte_carlo::Random;
    use super::*;

    #[test]
    fn a_flat_line_without_uncertainty_in_y_has_no_weights_and_says_so() {
        let points = CalibrationPoints::new(&[1.0, 2.0, 3.0], &[0.1; 3], &[5.0; 3], &[0.0; 3]).unwrap();
        assert!(matches!(fit(&points), Err(LineError::NoSlope { .. })));
    }

    #[test]
    fn a_flat_line_is_a_line() {
        let points = CalibrationPoints::new(&[1.0, 2.0, 4.0], &[0.1; 3], &[5.0; 3], &[0.2; 3]).unwrap();
        let line = fit(&points).unwrap();
        assert!((line.intercept - 5.0).abs() < 1e-14 && line.slope.abs() < 1e-15 && line.chi_square < 1e-25);
        assert!(line.slope_u > 0.0 && line.inverse(5.0, 0.1).is_none_or(|(_, u)| u > 1e6));
    }

    #[test]
    fn two_points_give_the_line_through_them_and_no_degrees_of_freedom() {
        let points = CalibrationPoints::new(&[1.0, 3.0], &[0.1, 0.2], &[2.0, 8.0], &[0.0, 0.3]).unwrap();
        let line = fit(&points).unwrap();
        assert!((line.slope - 3.0).abs() < 1e-13 && (line.intercept + 1.0).abs() < 1e-13);
        assert_eq!((line.dof, line.reduced_chi_square()), (0, None));
    }

    #[test]
    fn points_far_off_their_own_uncertainties_still_find_the_better_line() {
        // Started from the ordinary line alone, a few per cent of such point sets ended in a second minimum or nowhere.
        let mut random = Random::new(9, 0);
        let (mut lost, mut beaten) = (0, 0);
        for _ in 0..500 {
            let n = 3 + (20.0 * random.uniform()) as usize;
            let wild = |random: &mut Random| 0.05 * libm::pow(10.0, random.rectangular(-3.0, 3.0));
            let (ux, uy): (Vec<f64>, Vec<f64>) =
                (0..n).map(|_| (wild(&mut random), wild(&mut random))).unzip();
            let x: Vec<f64> = (0..n).map(|i| i as f64 + ux[i] * random.normal()).collect();
            let y: Vec<f64> = (0..n).map(|i| 2.0 * i as f64 + uy[i] * random.normal()).collect();
            let points = CalibrationPoints::new(&x, &ux, &y, &uy).unwrap();
            let Ok(line) = fit(&points) else {
                lost += 1;
                continue;
            };
            let scanned = scanned_start(&points, 0..DIRECTIONS).unwrap();
            let chi_square = |(a, b): (f64, f64)| {
                (0..n)
                    .map(|i| (y[i] - a - b * x[i]).powi(2) / (uy[i] * uy[i] + b * b * ux[i] * ux[i]))
                    .sum::<f64>()
            };
            beaten += usize::from(line.chi_square > chi_square(scanned) * (1.0 + 1e-6));
        }
        assert!(lost <= 5 && beaten == 0, "{lost} lost, {beaten} beaten, of 500");
    }

    #[test]
    fn the_fast_form_gives_the_answer_of_the_careful_one() {
        let x: Vec<f64> = (0..20).map(|i| 4.0 + 0.5 * f64::from(i)).collect();
        let y: Vec<f64> =
            x.iter().enumerate().map(|(i, x)| 0.01 + 0.04 * x + 0.001 * [1.0, -1.0, 0.4][i % 3]).collect();
        let (ux, uy) = (vec![0.01; 20], vec![0.001; 20]);
        let points = CalibrationPoints::new(&x, &ux, &y, &uy).unwrap();
        let line = fit(&points).unwrap();
        let quick = fit_from(&x, points.x_variances(), &y, points.y_variances(), (0.0, 0.041)).unwrap();
        assert!((quick.slope - line.slope).abs() < 1e-14 && (quick.intercept - line.intercept).abs() < 1e-14);
        assert!((quick.slope_variance.sqrt() / line.slope_u - 1.0).abs() < 1e-11);
        assert!((quick.covariance / line.covariance - 1.0).abs() < 1e-11 && quick.steps < 9);
        assert!(fit_from(&x[..1], points.x_variances(), &y, points.y_variances(), (0.0, 0.04)).is_none());
        assert!(fit_from(&x, points.x_variances(), &y, points.y_variances(), (0.0, f64::NAN)).is_none());
    }

    #[test]
    fn parts_scaling_and_added_variance_agree_with_the_plain_formulas() {
        let points =
            CalibrationPoints::new(&[1.0, 2.0, 4.0, 7.0], &[0.1; 4], &[2.0, 3.1, 4.8, 8.2], &[0.2; 4])
                .unwrap();
        let line = fit(&points).unwrap();
        let (vaa, vbb, vab) =
            (line.intercept_u * line.intercept_u, line.slope_u * line.slope_u, line.covariance);
        let plain = |x: f64, a: f64, b: f64, c: f64| (a + x * (2.0 * c + x * b)).sqrt();
        let parts = Line::from_parts((line.intercept, line.slope), (vaa, vbb, vab), line.chi_square, line.n);
        let added = line.with_added(0.3, 0.01, -0.02);
        let tripled = line.scaled(3.0);
        for x in [-2.0, 0.0, 3.0, 11.0] {
            let near =
                |got: f64, want: f64| assert!((got / want - 1.0).abs() < 1e-12, "at {x}: {got} {want}");
            near(line.u_at(x), plain(x, vaa, vbb, vab));
            near(parts.u_at(x), line.u_at(x));
            near(parts.at(x), line.at(x));
            near(added.u_at(x), plain(x, vaa + 0.3, vbb + 0.01, vab - 0.02));
            near(added.at(x), line.intercept + line.slope * x);
            near(tripled.u_at(x), 3f64.sqrt() * line.u_at(x));
        }
    }
}
