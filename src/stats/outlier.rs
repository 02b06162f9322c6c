//! Is a reading too far from the rest?
//!
//! Takes values expected to be normal about one mean and names the suspicious ones by index; leaves the decision to the
//! caller. Grubbs' test for one suspect (F. E. Grubbs, Technometrics 11 (1969) 1; NIST e-Handbook 1.3.5.17.1) and the
//! generalised extreme studentised deviate test for up to a stated number (B. Rosner, Technometrics 25 (1983) 165; NIST
//! e-Handbook 1.3.5.17.3). Left out: tests for other distributions.

use super::distribution::student_t_quantile;
use thiserror::Error;

/// Why the test cannot be made.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum OutlierError {
    /// Too few values for the number of suspects.
    #[error("{values} values are too few to test {suspects} of them for being outliers; at most {} can be", values.saturating_sub(2))]
    TooFew {
        /// Number of values.
        values: usize,
        /// Suspects asked for.
        suspects: usize,
    },
    /// NaN or infinity.
    #[error("value {0} (counted from 1) is not a finite number")]
    NotFinite(usize),
    /// A significance that is no probability.
    #[error("the significance must lie between 0 and 1: got {0}")]
    Significance(f64),
}

/// The value farthest from the mean.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extreme {
    /// Its index, from 0.
    pub index: usize,
    /// Its distance from the mean in sample standard deviations (Grubbs' G); 0 when all values are equal.
    pub statistic: f64,
}

/// Whether the suspect may lie on either side, or the side was fixed before looking.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sides {
    /// Only the largest (or only the smallest) value was under suspicion.
    One,
    /// Either end.
    Two,
}

/// One removal of the generalised test.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct EsdStep {
    /// The value removed, by its index in the values handed in.
    pub index: usize,
    /// Its studentised deviate among those still there, R in the literature.
    pub statistic: f64,
    /// What it is compared with, λ in the literature.
    pub critical: f64,
}

/// Answer of the generalised test.
#[derive(Debug, Clone, PartialEq)]
pub struct Esd {
    /// Indices of the outliers, the most extreme first; empty when there are none.
    pub flagged: Vec<usize>,
    /// Every removal, also those that turned out harmless.
    pub steps: Vec<EsdStep>,
}

/// The value farthest from the mean and its Grubbs statistic.
///
/// # Errors
///
/// Fewer than three values, or one that is not finite.
pub fn grubbs(values: &[f64]) -> Result<Extreme, OutlierError> {
    check(values, 1)?;
    let all: Vec<usize> = (0..values.len()).collect();
    Ok(most_extreme(values, &all))
}

/// What Grubbs' statistic of `n` normal values exceeds with probability `significance`.
///
/// # Errors
///
/// Fewer than three values, or a significance outside (0, 1).
pub fn grubbs_critical(n: usize, significance: f64, sides: Sides) -> Result<f64, OutlierError> {
    if n < 3 {
        return Err(OutlierError::TooFew { values: n, suspects: 1 });
    }
    check_significance(significance)?;
    let each = match sides {
        Sides::One => significance / n as f64,
        Sides::Two => significance / (2.0 * n as f64),
    };
    Ok(critical(n, each))
}

/// Tests up to `suspects` values at once at the given two-sided `significance`: outliers that hide one another, because
/// together they widen the spread, are still found.
///
/// # Errors
///
/// Fewer than `suspects` + 2 values, a value that is not finite, a significance outside (0, 1).
pub fn generalised_esd(values: &[f64], suspects: usize, significance: f64) -> Result<Esd, OutlierError> {
    check(values, suspects)?;
    check_significance(significance)?;
    let mut left: Vec<usize> = (0..values.len()).collect();
    let mut steps = Vec::with_capacity(suspects);
    for _ in 0..suspects {
        let n = left.len();
        let extreme = most_extreme(values, &left);
        let critical = critical(n, significance / (2.0 * n as f64));
        steps.push(EsdStep { index: extreme.index, statistic: extreme.statistic, critical });
        left.retain(|&i| i != extreme.index);
    }
    // The number of outliers is the last step above its limit, even when an earlier one was below: that is masking.
    let count = steps.iter().rposition(|s| s.statistic > s.critical).map_or(0, |i| i + 1);
    Ok(Esd { flagged: steps[..count].iter().map(|s| s.index).collect(), steps })
}

/// Largest deviate of `n` values that leaves the probability `each` to a single one of them.
fn critical(n: usize, each: f64) -> f64 {
    let n = n as f64;
    let t = student_t_quantile(1.0 - each, n - 2.0);
    (n - 1.0) * t / (n * (n - 2.0 + t * t)).sqrt()
}

fn most_extreme(values: &[f64], among: &[usize]) -> Extreme {
    let n = among.len() as f64;
    let mean = among.iter().map(|&i| values[i]).sum::<f64>() / n;
    let square = among.iter().map(|&i| (values[i] - mean) * (values[i] - mean)).sum::<f64>();
    let sd = (square / (n - 1.0)).sqrt();
    let mut found = Extreme { index: among[0], statistic: 0.0 };
    let mut farthest = -1.0;
    for &i in among {
        let distance = (values[i] - mean).abs();
        if distance > farthest {
            farthest = distance;
            found.index = i;
        }
    }
    // Equal values: their mean may differ from them by rounding, which is no deviation.
    let rounding = 4.0 * f64::EPSILON * mean.abs();
    found.statistic = if sd > rounding { farthest / sd } else { 0.0 };
    found
}

fn check(values: &[f64], suspects: usize) -> Result<(), OutlierError> {
    if values.len() < 3 || values.len() < suspects + 2 {
        return Err(OutlierError::TooFew { values: values.len(), suspects });
    }
    match values.iter().position(|v| !v.is_finite()) {
        Some(i) => Err(OutlierError::NotFinite(i + 1)),
        None => Ok(()),
    }
}

fn check_significance(significance: f64) -> Result<(), OutlierError> {
    if significance > 0.0 && significance < 1.0 {
        Ok(())
    } else {
        Err(OutlierError::Significance(significance))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn equal_values_hold_no_outlier() {
        let values = [0.1, 0.1, 0.1, 0.1, 0.1, 0.1];
        assert!(grubbs(&values).unwrap().statistic.abs() < 1e-15);
        assert!(generalised_esd(&values, 3, 0.05).unwrap().flagged.is_empty());
    }

    #[test]
    fn two_outliers_that_hide_one_another_are_both_found() {
        let values = [1.0, 1.1, 0.9, 1.05, 0.95, 1.02, 0.98, 1.0, 9.0, 9.1];
        let one = grubbs(&values).unwrap();
        assert!(one.statistic < grubbs_critical(10, 0.05, Sides::Two).unwrap(), "not masked: no test");
        assert_eq!(generalised_esd(&values, 3, 0.05).unwrap().flagged, vec![9, 8]);
    }

    #[test]
    fn too_few_values_and_wrong_numbers_are_refused() {
        assert_eq!(grubbs(&[1.0, 2.0]).unwrap_err(), OutlierError::TooFew { values: 2, suspects: 1 });
        assert_eq!(
            generalised_esd(&[1.0; 5], 4, 0.05).unwrap_err().to_string(),
            "5 values are too few to test 4 of them for being outliers; at most 3 can be"
        );
        assert_eq!(grubbs(&[1.0, f64::INFINITY, 2.0]).unwrap_err(), OutlierError::NotFinite(2));
        assert_eq!(generalised_esd(&[1.0; 5], 1, 1.0).unwrap_err(), OutlierError::Significance(1.0));
        assert!(grubbs_critical(2, 0.05, Sides::One).is_err());
    }
}
