//! Is the model the wrong shape? F test of the lack of fit against the scatter of repeated readings.
//!
//! Takes readings, the values a fitted model gives for them, and which readings are repetitions of one another; returns
//! the split of the residual sum of squares and the F test. Source: Kutner, Nachtsheim, Neter, Li, Applied Linear
//! Statistical Models, 5th edition, section 3.7. The model was fitted by least squares with equal weights; unequal
//! weights are left out.

use super::distribution::fisher_f_upper;
use thiserror::Error;

/// Why the test cannot be made.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum LackOfFitError {
    /// The three lists differ in length.
    #[error("{groups} group marks, {y} readings and {fitted} fitted values do not belong together")]
    Lengths {
        /// Number of group marks.
        groups: usize,
        /// Number of readings.
        y: usize,
        /// Number of fitted values.
        fitted: usize,
    },
    /// NaN or infinity.
    #[error("reading {0} (counted from 1) or its fitted value is not a finite number")]
    NotFinite(usize),
    /// No reading was repeated.
    #[error(
        "no reading was repeated, so that scatter and lack of fit cannot be told apart; repeat some points"
    )]
    NoRepetition,
    /// As many parameters as groups.
    #[error(
        "{groups} groups leave nothing to test a model with {parameters} parameters; take points at more places"
    )]
    TooFewGroups {
        /// Groups of repetitions.
        groups: usize,
        /// Parameters of the model.
        parameters: usize,
    },
    /// The repetitions agree exactly.
    #[error(
        "the repeated readings agree exactly, so that there is no scatter to judge by; use a finer resolution"
    )]
    NoScatter,
}

/// The residual sum of squares, split, and the test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LackOfFit {
    /// Sum of squares within the groups of repetitions (pure error).
    pub pure_error: f64,
    /// Its degrees of freedom.
    pub pure_error_dof: usize,
    /// Sum of squares between the group means and the model.
    pub lack_of_fit: f64,
    /// Its degrees of freedom.
    pub lack_of_fit_dof: usize,
    /// Ratio of the two mean squares.
    pub f: f64,
    /// Probability of an F at least as large if the model has the right shape.
    pub p: f64,
}

/// Tests a model with `parameters` fitted parameters: `groups[i]` marks reading `y[i]` (equal marks: repetitions), and
/// `fitted[i]` is the model's value for it.
///
/// # Errors
///
/// Lengths that differ, numbers that are not finite, no repetition, no more groups than parameters, or repetitions
/// without any scatter.
pub fn lack_of_fit(
    groups: &[usize],
    y: &[f64],
    fitted: &[f64],
    parameters: usize,
) -> Result<LackOfFit, LackOfFitError> {
    if groups.len() != y.len() || fitted.len() != y.len() {
        return Err(LackOfFitError::Lengths { groups: groups.len(), y: y.len(), fitted: fitted.len() });
    }
    if let Some(i) = (0..y.len()).find(|&i| !(y[i].is_finite() && fitted[i].is_finite())) {
        return Err(LackOfFitError::NotFinite(i + 1));
    }
    let mut marks = groups.to_vec();
    marks.sort_unstable();
    marks.dedup();
    if marks.len() == y.len() {
        return Err(LackOfFitError::NoRepetition);
    }
    if marks.len() <= parameters {
        return Err(LackOfFitError::TooFewGroups { groups: marks.len(), parameters });
    }
    let (mut pure_error, mut all) = (0.0, 0.0);
    let mut largest = 0.0_f64;
    for mark in &marks {
        let members: Vec<usize> = (0..y.len()).filter(|&i| groups[i] == *mark).collect();
        let mean = members.iter().map(|&i| y[i]).sum::<f64>() / members.len() as f64;
        for i in members {
            pure_error += (y[i] - mean) * (y[i] - mean);
            all += (y[i] - fitted[i]) * (y[i] - fitted[i]);
            largest = largest.max(y[i].abs());
        }
    }
    let rounding = 4.0 * f64::EPSILON * largest;
    if pure_error <= rounding * rounding * y.len() as f64 {
        return Err(LackOfFitError::NoScatter);
    }
    let (pure_error_dof, lack_of_fit_dof) = (y.len() - marks.len(), marks.len() - parameters);
    let between = (all - pure_error).max(0.0);
    let f = (between / lack_of_fit_dof as f64) / (pure_error / pure_error_dof as f64);
    let p = fisher_f_upper(f, lack_of_fit_dof as f64, pure_error_dof as f64);
    Ok(LackOfFit { pure_error, pure_error_dof, lack_of_fit: between, lack_of_fit_dof, f, p })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_cannot_be_tested_is_refused_with_the_reason() {
        let y = [1.0, 1.1, 2.0, 2.2, 3.0, 2.9];
        assert!(matches!(lack_of_fit(&[1, 1], &y, &y, 2), Err(LackOfFitError::Lengths { groups: 2, .. })));
        assert_eq!(lack_of_fit(&[1, 2, 3, 4, 5, 6], &y, &y, 2).unwrap_err(), LackOfFitError::NoRepetition);
        let two = LackOfFitError::TooFewGroups { groups: 2, parameters: 2 };
        assert_eq!(lack_of_fit(&[1, 1, 1, 2, 2, 2], &y, &y, 2).unwrap_err(), two);
        let same = [0.1, 0.1, 0.2, 0.2, 0.7, 0.7];
        assert_eq!(lack_of_fit(&[1, 1, 2, 2, 3, 3], &same, &y, 2).unwrap_err(), LackOfFitError::NoScatter);
        let broken = [1.0, f64::NAN, 2.0, 2.2, 3.0, 2.9];
        assert_eq!(
            lack_of_fit(&[1, 1, 2, 2, 3, 3], &broken, &y, 2).unwrap_err(),
            LackOfFitError::NotFinite(2)
        );
    }

    #[test]
    fn a_model_through_the_group_means_lacks_nothing() {
        let fit = lack_of_fit(
            &[1, 1, 2, 2, 3, 3],
            &[1.0, 1.2, 2.0, 2.2, 3.0, 3.2],
            &[1.1, 1.1, 2.1, 2.1, 3.1, 3.1],
            2,
        );
        let fit = fit.unwrap();
        assert!(fit.f < 1e-12 && fit.p > 0.999_999, "{fit:?}");
    }
}
