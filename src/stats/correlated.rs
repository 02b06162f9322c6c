//! Straight line through points whose x are correlated among themselves, and whose y are.
//!
//! Takes x and y with their covariance matrices and returns the same [`Line`] as [`super::line`]. Model and standard
//! errors: ISO/TS 28037:2010, clause 10 (generalised Gauss-Markov regression). The standard iterates over the true x as
//! well; here they are eliminated in each step (for a given line the best ones follow linearly), which leaves two unknowns
//! and the same answer. With diagonal matrices it is clause 7 again.
//!
//! Covariance between an x and a y is left out.

use super::line::Line;
use nalgebra::{DMatrix, DVector};
use thiserror::Error;

/// Why no line came out.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum CorrelatedError {
    /// Lists and matrices do not belong together.
    #[error(
        "{x} x and {y} y need covariance matrices of that size: got {ux_rows} by {ux_columns} and {uy_rows} by {uy_columns}"
    )]
    Shapes {
        /// Number of x.
        x: usize,
        /// Number of y.
        y: usize,
        /// Rows of the covariance matrix of x.
        ux_rows: usize,
        /// Its columns.
        ux_columns: usize,
        /// Rows of the covariance matrix of y.
        uy_rows: usize,
        /// Its columns.
        uy_columns: usize,
    },
    /// Fewer than two points.
    #[error("a line needs at least 2 points: got {0}; take more points")]
    TooFew(usize),
    /// NaN or infinity.
    #[error("{0} holds a number that is not finite")]
    NotFinite(&'static str),
    /// A covariance matrix that differs from its transpose.
    #[error("the covariance matrix of {0} is not symmetric")]
    NotSymmetric(&'static str),
    /// All x are the same.
    #[error("all x are equal, so they say nothing about the slope; take points at different x")]
    OneX,
    /// The covariance of the residuals cannot be inverted.
    #[error(
        "the covariance of the residuals is not positive definite; check the covariance matrices for a point without uncertainty"
    )]
    NotPositiveDefinite,
    /// The steps did not become small.
    #[error("the fit did not settle in {steps} steps (last slope {slope}); the points hardly form a line")]
    NotConverged {
        /// Steps taken.
        steps: usize,
        /// The slope at the last step.
        slope: f64,
    },
}

/// Points fit for a line, with a covariance matrix for all x and one for all y.
#[derive(Debug, Clone, PartialEq)]
pub struct CorrelatedPoints {
    x: DVector<f64>,
    ux: DMatrix<f64>,
    y: DVector<f64>,
    uy: DMatrix<f64>,
}

impl CorrelatedPoints {
    /// Checks and keeps the points: `x` with covariance matrix `ux` (unit of x squared), `y` with `uy`.
    ///
    /// # Errors
    ///
    /// Sizes that differ, fewer than two points, NaN or infinity, a matrix that is not symmetric to rounding, all x equal.
    pub fn new(x: &[f64], ux: DMatrix<f64>, y: &[f64], uy: DMatrix<f64>) -> Result<Self, CorrelatedError> {
        let n = x.len();
        if y.len() != n || ux.shape() != (n, n) || uy.shape() != (n, n) {
            return Err(CorrelatedError::Shapes {
                x: n,
                y: y.len(),
                ux_rows: ux.nrows(),
                ux_columns: ux.ncols(),
                uy_rows: uy.nrows(),
                uy_columns: uy.ncols(),
            });
        }
        if n < 2 {
            return Err(CorrelatedError::TooFew(n));
        }
        for (what, values) in [
            ("x", x),
            ("y", y),
            ("the covariance matrix of x", ux.as_slice()),
            ("the covariance matrix of y", uy.as_slice()),
        ] {
            if values.iter().any(|v| !v.is_finite()) {
                return Err(CorrelatedError::NotFinite(what));
            }
        }
        for (what, matrix) in [("x", &ux), ("y", &uy)] {
            if (matrix - matrix.transpose()).amax() > 1e-12 * matrix.amax() {
                return Err(CorrelatedError::NotSymmetric(what));
            }
        }
        if x.iter().all(|v| v.total_cmp(&x[0]).is_eq()) {
            return Err(CorrelatedError::OneX);
        }
        Ok(Self { x: DVector::from_column_slice(x), ux, y: DVector::from_column_slice(y), uy })
    }
}

/// Steps after which the fit gives up.
const MOST_STEPS: usize = 1000;

/// Fits the line to the points.
///
/// # Errors
///
/// [`CorrelatedError::NotPositiveDefinite`] when a combination of residuals has no uncertainty,
/// [`CorrelatedError::NotConverged`] when the steps do not become small.
pub fn fit_correlated(points: &CorrelatedPoints) -> Result<Line, CorrelatedError> {
    let n = points.x.len();
    let (x_mean, y_mean) = (points.x.mean(), points.y.mean());
    let x = points.x.add_scalar(-x_mean);
    let y = points.y.add_scalar(-y_mean);
    let (x_spread, y_spread) = ((x.norm_squared() / n as f64).sqrt(), (y.norm_squared() / n as f64).sqrt());
    let floor = y_spread + f64::EPSILON * y_mean.abs();

    // Symbols as in ISO/TS 28037:2010, clause 10, about the means. For a line (a, b) the residuals r = y − a − b·x have
    // covariance V = Uy + b²·Ux, and the best true x are x* = x + b·Ux·V⁻¹·r. A Gauss-Newton step solves
    // r ≈ δa + δb·x* with weight V⁻¹.
    let mut b = x.dot(&y) / x.norm_squared();
    let mut a = 0.0;
    let ones = DVector::from_element(n, 1.0);
    let mut before = f64::INFINITY;
    for _ in 0..MOST_STEPS {
        let residual = &y - &x * b - &ones * a;
        let v = &points.uy + &points.ux * (b * b);
        let variances = v.diagonal();
        let weight = v.cholesky().ok_or(CorrelatedError::NotPositiveDefinite)?;
        // Rounding can carry a singular matrix through the factorisation: what is left of a variance once the points
        // before it are known must be more than that.
        let left = weight.l_dirty().diagonal();
        if left.iter().zip(variances.iter()).any(|(l, v)| l * l < 1e-12 * v) {
            return Err(CorrelatedError::NotPositiveDefinite);
        }
        let weighted = weight.solve(&residual);
        let true_x = &x + (&points.ux * &weighted) * b;
        let weighted_ones = weight.solve(&ones);
        let weighted_x = weight.solve(&true_x);
        let f2 = ones.dot(&weighted_ones);
        let g0 = true_x.dot(&weighted_ones) / f2;
        // Taken about g0 so that G² does not come out as a small difference.
        let about = &true_x - &ones * g0;
        let g2 = about.dot(&(&weighted_x - &weighted_ones * g0));
        let h0 = weighted_ones.dot(&residual) / f2;
        let db = about.dot(&weighted) / g2;
        let da = h0 - db * g0;
        a += da;
        b += db;
        if !(a.is_finite() && b.is_finite() && g2 > 0.0) {
            return Err(CorrelatedError::NotPositiveDefinite);
        }
        let step = h0.abs() + db.abs() * x_spread;
        if step <= 1e-13 * floor || (step <= 1e-10 * floor && step >= before) {
            let centre = g0 + x_mean;
            return Ok(Line::about(
                (centre, y_mean + a + b * g0, b),
                (1.0 / f2, 1.0 / g2),
                residual.dot(&weighted),
                n,
            ));
        }
        before = step;
    }
    Err(CorrelatedError::NotConverged { steps: MOST_STEPS, slope: b })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn diagonal(u: &[f64]) -> DMatrix<f64> {
        DMatrix::from_diagonal(&DVector::from_iterator(u.len(), u.iter().map(|u| u * u)))
    }

    #[test]
    fn what_does_not_fit_together_is_refused_by_name() {
        let new = CorrelatedPoints::new;
        let u = diagonal(&[0.1, 0.1]);
        assert!(matches!(
            new(&[1.0, 2.0], u.clone(), &[1.0, 2.0], diagonal(&[0.1])),
            Err(CorrelatedError::Shapes { uy_rows: 1, .. })
        ));
        assert_eq!(
            new(&[1.0], diagonal(&[0.1]), &[1.0], diagonal(&[0.1])).unwrap_err(),
            CorrelatedError::TooFew(1)
        );
        let lopsided = DMatrix::from_row_slice(2, 2, &[1.0, 0.5, 0.2, 1.0]);
        assert_eq!(
            new(&[1.0, 2.0], u.clone(), &[1.0, 2.0], lopsided).unwrap_err(),
            CorrelatedError::NotSymmetric("y")
        );
        assert_eq!(
            new(&[1.0, f64::NAN], u.clone(), &[1.0, 2.0], u.clone()).unwrap_err(),
            CorrelatedError::NotFinite("x")
        );
        assert_eq!(new(&[1.0, 1.0], u.clone(), &[1.0, 2.0], u).unwrap_err(), CorrelatedError::OneX);
    }

    #[test]
    fn a_common_error_without_scatter_cannot_be_inverted_and_says_so() {
        let common = DMatrix::from_element(3, 3, 0.04);
        let points =
            CorrelatedPoints::new(&[1.0, 2.0, 3.0], DMatrix::zeros(3, 3), &[1.0, 2.0, 2.5], common).unwrap();
        assert_eq!(fit_correlated(&points).unwrap_err(), CorrelatedError::NotPositiveDefinite);
    }

    #[test]
    fn a_common_error_of_y_moves_into_the_intercept_only() {
        let (x, y) = ([1.0, 2.0, 3.0, 5.0], [1.1, 1.9, 3.2, 4.8]);
        let alone = CorrelatedPoints::new(&x, diagonal(&[0.05; 4]), &y, diagonal(&[0.1; 4])).unwrap();
        let uy = diagonal(&[0.1; 4]) + DMatrix::from_element(4, 4, 0.09);
        let common = CorrelatedPoints::new(&x, diagonal(&[0.05; 4]), &y, uy).unwrap();
        let (alone, common) = (fit_correlated(&alone).unwrap(), fit_correlated(&common).unwrap());
        assert!((alone.slope - common.slope).abs() < 1e-12 && (alone.slope_u - common.slope_u).abs() < 1e-12);
        let added = common.intercept_u.powi(2) - alone.intercept_u.powi(2);
        assert!((added - 0.09).abs() < 1e-12, "added variance {added}");
    }
}
