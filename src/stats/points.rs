//! Points fit for a straight line.
//!
//! Takes coordinates with their standard uncertainties, checks them once and keeps them, so that [`super::line::fit`]
//! needs no checks of its own. Covariances between points are left out; see [`super::correlated`].

use thiserror::Error;

/// Why points could not be accepted or no line came out.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum LineError {
    /// The four lists differ in length.
    #[error("a line needs as many y, ux and uy as x: got {x} x, {ux} ux, {y} y and {uy} uy")]
    Lengths {
        /// Number of x.
        x: usize,
        /// Number of standard uncertainties of x.
        ux: usize,
        /// Number of y.
        y: usize,
        /// Number of standard uncertainties of y.
        uy: usize,
    },
    /// Fewer than two points.
    #[error("a line needs at least 2 points: got {0}; take more points")]
    TooFew(usize),
    /// A number is NaN or infinite.
    #[error("point {point}: {what} is not a finite number")]
    NotFinite {
        /// Which point, counted from 1.
        point: usize,
        /// Which of its numbers.
        what: &'static str,
    },
    /// A standard uncertainty is below zero.
    #[error("point {point}: {what} is negative; a standard uncertainty is zero or more")]
    Negative {
        /// Which point, counted from 1.
        point: usize,
        /// Which of its numbers.
        what: &'static str,
    },
    /// Neither coordinate of a point has an uncertainty, so that its weight would be infinite.
    #[error("point {0}: ux and uy are both zero; give at least one of them")]
    Exact(usize),
    /// All x are the same.
    #[error("all x are equal, so they say nothing about the slope; take points at different x")]
    OneX,
    /// The numbers left the range in which a slope can be computed.
    #[error(
        "the slope became {slope} after {steps} steps; check for a flat line with uy = 0, or for huge numbers"
    )]
    NoSlope {
        /// The slope that is not a usable number.
        slope: f64,
        /// Steps taken.
        steps: usize,
    },
    /// The steps did not become small.
    #[error("the fit did not settle in {steps} steps (last slope {slope}); the points hardly form a line")]
    NotConverged {
        /// Steps taken.
        steps: usize,
        /// The slope at the last step.
        slope: f64,
    },
}

/// Points fit for a line: at least two, finite, at different x, each with an uncertainty in at least one coordinate.
#[derive(Debug, Clone, PartialEq)]
pub struct CalibrationPoints {
    x: Vec<f64>,
    ux2: Vec<f64>,
    y: Vec<f64>,
    uy2: Vec<f64>,
}

impl CalibrationPoints {
    /// Checks and keeps the points: `x` and `y` with their standard uncertainties `ux` and `uy`, point by point.
    ///
    /// # Errors
    ///
    /// Lengths that differ, fewer than two points, NaN or infinity, a negative uncertainty, a point with both
    /// uncertainties zero (or so small that their squares are), all x equal.
    pub fn new(x: &[f64], ux: &[f64], y: &[f64], uy: &[f64]) -> Result<Self, LineError> {
        let n = x.len();
        if ux.len() != n || y.len() != n || uy.len() != n {
            return Err(LineError::Lengths { x: n, ux: ux.len(), y: y.len(), uy: uy.len() });
        }
        if n < 2 {
            return Err(LineError::TooFew(n));
        }
        for i in 0..n {
            let point = i + 1;
            for (what, value) in [("x", x[i]), ("ux", ux[i] * ux[i]), ("y", y[i]), ("uy", uy[i] * uy[i])] {
                if !value.is_finite() {
                    return Err(LineError::NotFinite { point, what });
                }
            }
            for (what, value) in [("ux", ux[i]), ("uy", uy[i])] {
                if value < 0.0 {
                    return Err(LineError::Negative { point, what });
                }
            }
            if ux[i] * ux[i] + uy[i] * uy[i] <= 0.0 {
                return Err(LineError::Exact(point));
            }
        }
        if x.iter().all(|v| v.total_cmp(&x[0]).is_eq()) {
            return Err(LineError::OneX);
        }
        let squared = |u: &[f64]| u.iter().map(|v| v * v).collect();
        Ok(Self { x: x.to_vec(), ux2: squared(ux), y: y.to_vec(), uy2: squared(uy) })
    }

    /// Number of points, at least 2.
    pub fn count(&self) -> usize {
        self.x.len()
    }

    /// The x, as given.
    pub fn x(&self) -> &[f64] {
        &self.x
    }

    /// The y, as given.
    pub fn y(&self) -> &[f64] {
        &self.y
    }

    /// The variances of the x: squares of the standard uncertainties given.
    pub fn x_variances(&self) -> &[f64] {
        &self.ux2
    }

    /// The variances of the y: squares of the standard uncertainties given.
    pub fn y_variances(&self) -> &[f64] {
        &self.uy2
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn refused(x: &[f64], ux: &[f64], y: &[f64], uy: &[f64]) -> LineError {
        CalibrationPoints::new(x, ux, y, uy).unwrap_err()
    }

    #[test]
    fn points_that_cannot_make_a_line_are_refused_by_name() {
        let u = [0.1, 0.1];
        assert_eq!(refused(&[1.0, 2.0], &u, &[1.0], &u), LineError::Lengths { x: 2, ux: 2, y: 1, uy: 2 });
        assert_eq!(refused(&[1.0], &[0.1], &[1.0], &[0.1]), LineError::TooFew(1));
        let not_finite = LineError::NotFinite { point: 2, what: "y" };
        assert_eq!(refused(&[1.0, 2.0], &u, &[1.0, f64::NAN], &u), not_finite);
        let huge = LineError::NotFinite { point: 1, what: "uy" };
        assert_eq!(refused(&[1.0, 2.0], &u, &[1.0, 2.0], &[1e200, 1.0]), huge);
        let negative = LineError::Negative { point: 1, what: "ux" };
        assert_eq!(refused(&[1.0, 2.0], &[-0.1, 0.1], &[1.0, 2.0], &u), negative);
        assert_eq!(refused(&[1.0, 2.0], &[0.1, 0.0], &[1.0, 2.0], &[0.1, 0.0]), LineError::Exact(2));
        assert_eq!(refused(&[2.0, 2.0], &u, &[1.0, 2.0], &u), LineError::OneX);
    }

    #[test]
    fn messages_say_what_where_and_what_to_do() {
        let error = refused(&[1.0, 2.0], &[0.1, 0.0], &[1.0, 2.0], &[0.1, 0.0]);
        assert_eq!(error.to_string(), "point 2: ux and uy are both zero; give at least one of them");
    }
}
