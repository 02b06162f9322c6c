//! The probability that the injection exceeds the uptake.
//!
//! Comes in: the excess `D = J − M` by its best estimate, the standard uncertainty of everything normal in it, and that of
//! the uptake with its degrees of freedom. Goes out: `P(D > 0)`. With `D = d + s·Z − u·T`, Z normal and T Student,
//! `P = ∫ φ(z)·F_ν((d + s·z)/u) dz`: the convolution itself, by the trapezoidal rule, which for such an integrand
//! converges faster than any power of the step. One pair of effective degrees of freedom (Welch-Satterthwaite) for the sum
//! would be quicker and wrong in the way that matters: adding uncertainty could then lower the chance. Left out: that an uptake
//! is never negative.

use crate::stats::distribution::{normal_cdf, student_t_cdf};

/// Normal deviates to which the integral goes; beyond lies 1e-15 of the probability.
const END: f64 = 8.0;
/// Widest step.
const STEP: f64 = 0.25;
/// Where the Student part is less than this share of the normal one, its shape no longer shows (a share of 0.01 changes
/// the chance by under 1e-4 of itself).
const LEAST_SHARE: f64 = 0.01;

/// The excess of injection over uptake, L/min.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Excess {
    /// Best estimate.
    pub(super) mean: f64,
    /// Standard uncertainty of its normal part.
    pub(super) normal_u: f64,
    /// Standard uncertainty of its Student part, and that part's degrees of freedom.
    pub(super) student_u: f64,
    pub(super) dof: f64,
}

impl Excess {
    /// The probability that it is above zero.
    pub(super) fn chance(&self) -> f64 {
        let Self { mean, normal_u, student_u, dof } = *self;
        if dof.is_infinite() || student_u < LEAST_SHARE * normal_u {
            let u = (normal_u * normal_u + student_u * student_u).sqrt();
            return at(mean, u, normal_cdf);
        }
        if normal_u <= 0.0 {
            return at(mean, student_u, |t| student_t_cdf(t, dof));
        }
        let step = STEP.min(0.5 * student_u / normal_u);
        let steps = (END / step).ceil() as i32;
        let (mut sum, mut weights) = (0.0, 0.0);
        for i in -steps..=steps {
            let z = f64::from(i) * step;
            let weight = libm::exp(-0.5 * z * z);
            weights += weight;
            sum += weight * student_t_cdf((mean + normal_u * z) / student_u, dof);
        }
        sum / weights
    }
}

/// The distribution function at `mean/u`; a step where nothing is uncertain.
fn at(mean: f64, u: f64, distribution: impl Fn(f64) -> f64) -> f64 {
    if u > 0.0 {
        distribution(mean / u)
    } else if mean > 0.0 {
        1.0
    } else {
        0.0
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::stats::monte_carlo::Random;

    #[test]
    fn the_chance_is_that_of_a_million_draws() {
        for (case, (mean, normal_u, student_u, dof)) in
            [(-0.05, 0.01, 0.025, 8.0), (-0.05, 0.03, 0.015, 3.0), (-0.03, 0.012, 0.012, 14.0)]
                .into_iter()
                .enumerate()
        {
            let mut random = Random::new(20_261_112, case as u64);
            let draws = 400_000;
            let over = (0..draws)
                .filter(|_| mean + normal_u * random.normal() - student_u * random.student_t(dof) > 0.0)
                .count();
            let want = over as f64 / f64::from(draws);
            let got = Excess { mean, normal_u, student_u, dof }.chance();
            // Four standard deviations of the count.
            let tolerance = 4.0 * (want * (1.0 - want) / f64::from(draws)).sqrt();
            assert!((got - want).abs() < tolerance, "case {case}: got {got}, want {want} ± {tolerance}");
        }
    }

    #[test]
    fn the_ends_are_the_plain_distributions() {
        // 2.5 % tails: −1.959964 normal (any table), −2.306004 for 8 degrees of freedom.
        let normal = Excess { mean: -1.959_964 * 0.05, normal_u: 0.03, student_u: 0.04, dof: f64::INFINITY };
        assert!((normal.chance() - 0.025).abs() < 1e-7);
        let student = Excess { mean: -2.306_004, normal_u: 0.0, student_u: 1.0, dof: 8.0 };
        assert!((student.chance() - 0.025).abs() < 1e-7);
        let certain = |mean| Excess { mean, normal_u: 0.0, student_u: 0.0, dof: 8.0 }.chance();
        assert_eq!((certain(-0.1), certain(0.1)), (0.0, 1.0));
    }

    #[test]
    fn the_joints_are_smooth() {
        let at = |student_u| Excess { mean: -0.2, normal_u: 0.1, student_u, dof: 3.0 }.chance();
        assert!((at(0.000_999) / at(0.001_001) - 1.0).abs() < 1e-3);
        let at = |normal_u| Excess { mean: -0.2, normal_u, student_u: 0.1, dof: 3.0 }.chance();
        assert!((at(0.0) - at(1e-6)).abs() < 1e-9);
    }

    #[test]
    fn more_uncertainty_never_lowers_the_chance() {
        // Where effective degrees of freedom would: 3 of them, and a normal part added.
        let at = |normal_u| Excess { mean: -3.0, normal_u, student_u: 1.0, dof: 3.0 }.chance();
        let mut last = 0.0;
        for i in 0..200 {
            let chance = at(f64::from(i) * 0.02);
            assert!(chance >= last, "{i}: {chance} < {last}");
            last = chance;
        }
    }
}
