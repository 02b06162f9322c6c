//! Does a measured value meet its limits, and how sure is that?
//!
//! Takes what is known of a value (estimate, standard uncertainty, degrees of freedom) and limits on one or both sides;
//! returns the probability of conformity (JCGM 106:2012, clause 7), a verdict by simple or guarded acceptance
//! (ILAC-G8:09/2019, 4.2; JCGM 106:2012, 8.2 and 8.3) and the risks of a decision rule over a whole process
//! (JCGM 106:2012, 9.5). Left out: limits that are uncertain themselves, prior knowledge other than the process of 9.5.

use super::distribution::{normal_cdf, student_t_cdf};
use thiserror::Error;

/// Why limits were refused.
#[derive(Debug, Clone, PartialEq, Error)]
pub enum LimitsError {
    /// Neither side is limited.
    #[error("limits need a lower or an upper value")]
    None,
    /// NaN or infinity.
    #[error("a limit is not a finite number: {0}")]
    NotFinite(f64),
    /// Nothing lies between.
    #[error("the lower limit {lower} is not below the upper limit {upper}")]
    Order {
        /// Lower limit.
        lower: f64,
        /// Upper limit.
        upper: f64,
    },
}

/// Tolerance limits, at least one; a value on a limit conforms.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limits {
    lower: Option<f64>,
    upper: Option<f64>,
}

impl Limits {
    /// Limits on one or both sides.
    ///
    /// # Errors
    ///
    /// No limit at all, one that is not finite, or a lower one not below the upper one.
    pub fn new(lower: Option<f64>, upper: Option<f64>) -> Result<Self, LimitsError> {
        if let Some(wrong) = [lower, upper].into_iter().flatten().find(|v| !v.is_finite()) {
            return Err(LimitsError::NotFinite(wrong));
        }
        match (lower, upper) {
            (None, None) => Err(LimitsError::None),
            (Some(lower), Some(upper)) if lower >= upper => Err(LimitsError::Order { lower, upper }),
            _ => Ok(Self { lower, upper }),
        }
    }

    /// The lower limit, if there is one.
    pub fn lower(&self) -> Option<f64> {
        self.lower
    }

    /// The upper limit, if there is one.
    pub fn upper(&self) -> Option<f64> {
        self.upper
    }

    /// Acceptance limits: each limit moved inwards by the guard band `w` (outwards when negative). They may have passed
    /// one another, in which case nothing can be accepted.
    fn guarded(&self, w: f64) -> (f64, f64) {
        (
            self.lower.map_or(f64::NEG_INFINITY, |lower| lower + w),
            self.upper.map_or(f64::INFINITY, |upper| upper - w),
        )
    }
}

/// What is known of a value: Student's t (normal when `dof` is infinite) about `value`, scaled by `u`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Knowledge {
    /// Best estimate.
    pub value: f64,
    /// Its standard uncertainty; zero when it is exact.
    pub u: f64,
    /// Its degrees of freedom, above zero, infinite allowed.
    pub dof: f64,
}

/// Probability that the value lies within the limits (JCGM 106:2012, 7.2 to 7.4).
pub fn conformity_probability(knowledge: &Knowledge, limits: &Limits) -> f64 {
    let Knowledge { value, u, dof } = *knowledge;
    let (lower, upper) = limits.guarded(0.0);
    if u <= 0.0 {
        return if lower <= value && value <= upper { 1.0 } else { 0.0 };
    }
    // Both tails, so that a probability near one loses no digits to a difference of two numbers near one.
    let below = student_t_cdf((lower - value) / u, dof);
    let above = student_t_cdf((value - upper) / u, dof);
    (1.0 - below - above).max(0.0)
}

/// How a value is compared with its limits.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DecisionRule {
    /// The estimate decides alone: pass within the limits, fail outside. On the limit the chance of a wrong verdict is
    /// one half.
    Simple,
    /// Guard band w = U, the expanded uncertainty: pass when the estimate lies within the limits by U, fail when it lies
    /// outside by more than U, undecided between.
    Guarded,
}

/// Verdict of a decision rule.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// The limits are met.
    Pass,
    /// The limits are not met.
    Fail,
    /// The uncertainty is too large to say.
    Undecided,
}

/// Verdict on the estimate `value` with expanded uncertainty `expanded` (not used by [`DecisionRule::Simple`]).
///
/// A value that is not a number is undecided.
pub fn decide(rule: DecisionRule, value: f64, expanded: f64, limits: &Limits) -> Verdict {
    let w = match rule {
        DecisionRule::Simple => 0.0,
        DecisionRule::Guarded => expanded,
    };
    let (inner_lower, inner_upper) = limits.guarded(w);
    let (outer_lower, outer_upper) = limits.guarded(-w);
    if inner_lower <= value && value <= inner_upper {
        Verdict::Pass
    } else if value < outer_lower || value > outer_upper {
        Verdict::Fail
    } else {
        Verdict::Undecided
    }
}

/// Probabilities of a wrong decision over a whole process.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GlobalRisk {
    /// An item outside its limits is accepted (R_C).
    pub consumer: f64,
    /// An item within its limits is rejected (R_P).
    pub producer: f64,
}

/// Risks of accepting by a guard band `w` when items come from a normal process (`process_mean`, `process_sd` > 0) and are
/// measured with normal standard uncertainty `u` > 0 (JCGM 106:2012, 9.5).
pub fn global_risk(process_mean: f64, process_sd: f64, u: f64, limits: &Limits, w: f64) -> GlobalRisk {
    let (accept_lower, accept_upper) = limits.guarded(w);
    let (lower, upper) = limits.guarded(0.0);
    let accepted = |item: f64| {
        if accept_lower > accept_upper {
            return 0.0;
        }
        (1.0 - normal_cdf((accept_lower - item) / u) - normal_cdf((item - accept_upper) / u)).max(0.0)
    };
    let density = |item: f64| {
        let z = (item - process_mean) / process_sd;
        libm::exp(-0.5 * z * z) / (process_sd * (2.0 * std::f64::consts::PI).sqrt())
    };
    // Nine standard deviations hold all but 2e-19 of the process.
    let (first, last) = (process_mean - 9.0 * process_sd, process_mean + 9.0 * process_sd);
    let (low, high) = (lower.clamp(first, last), upper.clamp(first, last));
    let panel = 0.25 * process_sd.min(u);
    let bad = |item: f64| density(item) * accepted(item);
    let good = |item: f64| density(item) * (1.0 - accepted(item));
    GlobalRisk {
        consumer: integral(bad, first, low, panel) + integral(bad, high, last, panel),
        producer: integral(good, low, high, panel),
    }
}

/// Integral by Simpson's rule on panels of at most `panel`, but no more than a million.
fn integral(f: impl Fn(f64) -> f64, from: f64, to: f64, panel: f64) -> f64 {
    if to <= from {
        return 0.0;
    }
    let count = ((to - from) / panel).ceil().clamp(1.0, 1e6) as usize;
    let width = (to - from) / count as f64;
    (0..count)
        .map(|i| {
            let left = from + width * i as f64;
            (f(left) + 4.0 * f(left + 0.5 * width) + f(left + width)) * width / 6.0
        })
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn two_sided() -> Limits {
        Limits::new(Some(-1.0), Some(1.0)).unwrap()
    }

    #[test]
    fn limits_that_limit_nothing_are_refused() {
        assert_eq!(Limits::new(None, None).unwrap_err(), LimitsError::None);
        assert_eq!(
            Limits::new(Some(f64::INFINITY), None).unwrap_err(),
            LimitsError::NotFinite(f64::INFINITY)
        );
        assert_eq!(
            Limits::new(Some(2.0), Some(2.0)).unwrap_err(),
            LimitsError::Order { lower: 2.0, upper: 2.0 }
        );
    }

    #[test]
    fn guarded_acceptance_has_three_answers_and_simple_two() {
        let verdict = |rule, value| decide(rule, value, 0.2, &two_sided());
        use DecisionRule::{Guarded, Simple};
        for (value, simple, guarded) in [
            (0.0, Verdict::Pass, Verdict::Pass),
            (0.8, Verdict::Pass, Verdict::Pass),
            (0.81, Verdict::Pass, Verdict::Undecided),
            (1.0, Verdict::Pass, Verdict::Undecided),
            (-1.1, Verdict::Fail, Verdict::Undecided),
            (1.21, Verdict::Fail, Verdict::Fail),
            (-9.0, Verdict::Fail, Verdict::Fail),
        ] {
            assert_eq!((verdict(Simple, value), verdict(Guarded, value)), (simple, guarded), "value {value}");
        }
        assert_eq!(verdict(Simple, f64::NAN), Verdict::Undecided);
        // An uncertainty as wide as the limits can pass nothing, not even the middle.
        assert_eq!(decide(Guarded, 0.0, 1.5, &two_sided()), Verdict::Undecided);
        let upper = Limits::new(None, Some(1.0)).unwrap();
        assert_eq!(decide(Guarded, -1e9, 0.2, &upper), Verdict::Pass);
    }

    #[test]
    fn probability_is_that_of_the_interval_also_with_few_degrees_of_freedom() {
        let sure = Knowledge { value: 0.5, u: 0.0, dof: f64::INFINITY };
        assert!((conformity_probability(&sure, &two_sided()) - 1.0).abs() < 1e-15);
        // One degree of freedom has a closed form: the arctangent.
        let cauchy = Knowledge { value: 0.0, u: 0.5, dof: 1.0 };
        let want = 2.0 * libm::atan(2.0) / std::f64::consts::PI;
        assert!((conformity_probability(&cauchy, &two_sided()) - want).abs() < 1e-12);
    }

    #[test]
    fn a_process_far_inside_its_limits_risks_nothing_and_an_impassable_guard_rejects_all() {
        let safe = global_risk(0.0, 0.01, 0.01, &two_sided(), 0.0);
        assert!(safe.consumer < 1e-15 && safe.producer < 1e-15, "{safe:?}");
        let shut = global_risk(0.0, 0.01, 0.01, &two_sided(), 1.5);
        assert!(shut.consumer < 1e-15 && (shut.producer - 1.0).abs() < 1e-9, "{shut:?}");
    }
}
