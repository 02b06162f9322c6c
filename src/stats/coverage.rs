//! From a combined standard uncertainty to an interval: effective degrees of freedom and the coverage factor.
//!
//! Takes contributions with their degrees of freedom (infinite allowed) and returns the effective degrees of freedom by
//! Welch-Satterthwaite (JCGM 100:2008, G.4.1) and the factor of Student's t for a coverage probability (G.3.2). The
//! effective degrees of freedom are used as they come, fractional; the GUM's alternative of cutting them to the next
//! lower integer is left out.

use super::distribution::student_t_quantile;

/// Effective degrees of freedom of the root sum of squares of independent contributions.
///
/// Each contribution is a standard uncertainty in the unit of the result (sign immaterial) with its degrees of freedom,
/// above zero, infinite allowed. Infinite when every contribution that is not zero has infinite degrees of freedom, and
/// when there is no uncertainty at all.
pub fn welch_satterthwaite(contributions: impl IntoIterator<Item = (f64, f64)>) -> f64 {
    let (mut variance, mut spread) = (0.0, 0.0);
    for (u, dof) in contributions {
        let square = u * u;
        variance += square;
        // Squares in two steps, so that a tiny unit (flows in m³/s) does not underflow: ratios are taken below.
        spread += if dof.is_infinite() { 0.0 } else { square * (square / dof) };
    }
    if spread > 0.0 { variance * (variance / spread) } else { f64::INFINITY }
}

/// The factor k by which a standard uncertainty with `dof` degrees of freedom (infinite allowed) is multiplied so that the
/// interval ± k·u covers with `probability` (0.95 for 95 %). NaN when `probability` is outside (0, 1) or `dof` not positive.
pub fn coverage_factor(probability: f64, dof: f64) -> f64 {
    if probability > 0.0 && probability < 1.0 {
        student_t_quantile(0.5 + 0.5 * probability, dof)
    } else {
        f64::NAN
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn one_contribution_keeps_its_degrees_of_freedom() {
        assert!((welch_satterthwaite([(0.3, 7.0)]) - 7.0).abs() < 1e-12);
        assert!((welch_satterthwaite([(-1e-9, 7.0), (0.0, 1.0)]) - 7.0).abs() < 1e-12);
    }

    #[test]
    fn contributions_known_beyond_doubt_leave_infinite_degrees_of_freedom() {
        assert!(welch_satterthwaite([(0.3, f64::INFINITY), (0.0, 4.0)]).is_infinite());
        assert!(welch_satterthwaite([]).is_infinite());
    }

    #[test]
    fn coverage_factors_are_the_familiar_ones() {
        assert!((coverage_factor(0.95, f64::INFINITY) - 1.959_964).abs() < 5e-7);
        assert!((coverage_factor(0.95, 8.0) - 2.306_004).abs() < 5e-7);
        assert!(coverage_factor(1.0, 8.0).is_nan() && coverage_factor(0.95, 0.0).is_nan());
    }
}
