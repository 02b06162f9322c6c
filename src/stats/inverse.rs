//! A ratio of two estimates and the x at which a line reaches a given y, each with honest limits.
//!
//! Takes estimates with their variances and covariance and a quantile t; returns the set of values compatible with them:
//! an interval, everything outside an interval, or everything. Source: E. C. Fieller, J. Roy. Stat. Soc. B 16 (1954) 175;
//! inverse prediction is the same theorem (Graybill & Iyer, Regression Analysis, ch. 6). The first-order interval of
//! ISO/TS 28037:2010, 11.2, is [`super::line::Line::inverse`].

use super::line::Line;

/// The values of a ratio that the estimates do not contradict.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Fieller {
    /// From `lower` to `upper`: the denominator differs from zero beyond doubt.
    Interval {
        /// Lower limit.
        lower: f64,
        /// Upper limit.
        upper: f64,
    },
    /// Everything up to `lower` and everything from `upper`: the denominator may be zero, but the ratio is known not to
    /// lie between them. One of the two may be infinite.
    Outside {
        /// The lower part ends here.
        lower: f64,
        /// The upper part begins here.
        upper: f64,
    },
    /// Every value: the estimates say nothing.
    Unbounded,
}

/// Limits of the ratio `a`/`b`.
///
/// `vaa` and `vbb` are the variances of a and b, `vab` their covariance, `t` the quantile for the wanted probability
/// (1.96 for 95 % with many degrees of freedom). All finite, variances not negative.
pub fn fieller(a: f64, b: f64, vaa: f64, vbb: f64, vab: f64, t: f64) -> Fieller {
    // The values q with (a − q·b)² ≤ t²·(vaa − 2q·vab + q²·vbb), that is p2·q² − 2·p1·q + p0 ≤ 0.
    let t2 = t * t;
    let p2 = b * b - t2 * vbb;
    let p1 = a * b - t2 * vab;
    let p0 = a * a - t2 * vaa;
    // p1² − p2·p0 written out, because b²a² cancels and the rest is small when a and b are well known.
    let d = t2 * (b * b * vaa - 2.0 * a * b * vab + a * a * vbb - t2 * (vaa * vbb - vab * vab));
    if p2.is_nan() || p1.is_nan() || p0.is_nan() || d.is_nan() {
        return Fieller::Unbounded;
    }
    if p2.abs() <= 0.0 {
        // A straight inequality: −2·p1·q + p0 ≤ 0.
        let edge = p0 / (2.0 * p1);
        return match p1 {
            p1 if p1 > 0.0 => Fieller::Outside { lower: f64::NEG_INFINITY, upper: edge },
            p1 if p1 < 0.0 => Fieller::Outside { lower: edge, upper: f64::INFINITY },
            _ => Fieller::Unbounded,
        };
    }
    if d < 0.0 {
        // Only with p2 < 0: the parabola stays below zero. (With p2 > 0 the ratio a/b itself is a member.)
        return if p2 < 0.0 {
            Fieller::Unbounded
        } else {
            Fieller::Interval { lower: p1 / p2, upper: p1 / p2 }
        };
    }
    // The root that adds magnitudes first, the other from the product of the roots: no cancellation.
    let sum = if p1 >= 0.0 { p1 + d.sqrt() } else { p1 - d.sqrt() };
    let first = sum / p2;
    let second = if sum.abs() > 0.0 { p0 / sum } else { 0.0 };
    let (lower, upper) = (first.min(second), first.max(second));
    if p2 > 0.0 { Fieller::Interval { lower, upper } } else { Fieller::Outside { lower, upper } }
}

/// The x at which a line reaches a given y.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Inverse {
    /// Best estimate.
    pub x: f64,
    /// Standard uncertainty to first order; for limits use `limits`.
    pub u: f64,
    /// What the line does not contradict.
    pub limits: Fieller,
}

/// The x at which `line` reaches `y0`, with limits for the quantile `t`.
///
/// `y0_variance` is the variance of y0 itself: 0 for a stated value (mean response), the residual variance over m for the
/// mean of m new readings. The variances of `line` must be in force already (see [`Line::scaled`]), and `t` must go with
/// their degrees of freedom. None when the slope is zero.
pub fn line_inverse(line: &Line, y0: f64, y0_variance: f64, t: f64) -> Option<Inverse> {
    let (x, u) = line.inverse(y0, y0_variance.max(0.0).sqrt())?;
    // Measured from the line's centre, where value and slope are uncorrelated: x − centre = (y0 − value)/slope.
    let (centre, value, value_variance) = line.about_centre();
    let slope_variance = line.slope_u * line.slope_u;
    let shift = |limit: f64| limit + centre;
    let limits = match fieller(y0 - value, line.slope, value_variance + y0_variance, slope_variance, 0.0, t) {
        Fieller::Interval { lower, upper } => Fieller::Interval { lower: shift(lower), upper: shift(upper) },
        Fieller::Outside { lower, upper } => Fieller::Outside { lower: shift(lower), upper: shift(upper) },
        Fieller::Unbounded => Fieller::Unbounded,
    };
    Some(Inverse { x, u, limits })
}

/// The x at which `line` crosses zero, with limits for the quantile `t`. None when the slope is zero.
pub fn zero_crossing(line: &Line, t: f64) -> Option<Inverse> {
    line_inverse(line, 0.0, 0.0, t)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn exact_estimates_give_their_ratio() {
        assert_eq!(fieller(6.0, 2.0, 0.0, 0.0, 0.0, 1.96), Fieller::Interval { lower: 3.0, upper: 3.0 });
    }

    #[test]
    fn a_negative_denominator_turns_nothing_round() {
        let (Fieller::Interval { lower: a, upper: b }, Fieller::Interval { lower: c, upper: d }) =
            (fieller(1.0, 4.0, 0.01, 0.02, 0.003, 2.0), fieller(1.0, -4.0, 0.01, 0.02, -0.003, 2.0))
        else {
            panic!("both are well determined");
        };
        assert!((a + d).abs() < 1e-15 && (b + c).abs() < 1e-15);
    }

    #[test]
    fn the_limits_stand_where_the_definition_says() {
        for (a, b, vaa, vbb, vab) in
            [(1.0, 3.0, 0.1, 0.2, 0.05), (-2.0, 1.0, 0.1, 0.01, -0.02), (1.0, 1.0, 0.49, 0.49, 0.0)]
        {
            let (Fieller::Interval { lower, upper } | Fieller::Outside { lower, upper }) =
                fieller(a, b, vaa, vbb, vab, 1.9)
            else {
                panic!("not unbounded");
            };
            for q in [lower, upper] {
                let (left, right) = ((a - q * b).powi(2), 1.9 * 1.9 * (vaa - 2.0 * q * vab + q * q * vbb));
                assert!((left - right).abs() < 1e-12 * left.max(1.0), "q {q}: {left} {right}");
            }
        }
    }

    #[test]
    fn estimates_lost_in_their_noise_exclude_nothing() {
        assert_eq!(fieller(0.1, 0.1, 1.0, 1.0, 0.0, 2.0), Fieller::Unbounded);
        assert_eq!(fieller(0.0, 0.0, 0.0, 0.0, 0.0, 2.0), Fieller::Unbounded);
        assert_eq!(fieller(f64::NAN, 1.0, 0.1, 0.1, 0.0, 2.0), Fieller::Unbounded);
    }

    #[test]
    fn a_denominator_just_at_the_edge_leaves_a_half_line() {
        // b² = t²·vbb exactly: 4·q ≥ 4 − 1 for these numbers.
        assert_eq!(
            fieller(2.0, 1.0, 1.0, 1.0, 0.0, 1.0),
            Fieller::Outside { lower: f64::NEG_INFINITY, upper: 0.75 }
        );
    }

    #[test]
    fn a_line_without_slope_reaches_no_other_value() {
        let flat = Line::from_parts((1.0, 0.0), (0.01, 0.0, 0.0), 0.0, 5);
        assert_eq!(line_inverse(&flat, 2.0, 0.0, 2.0), None);
    }

    #[test]
    fn limits_of_a_line_far_from_zero_agree_with_those_beside_it() {
        let near = Line::from_parts((1.0, 2.0), (0.04, 0.01, -0.005), 0.0, 5);
        let shifted = Line::from_parts(
            (1.0 - 2.0 * 1000.0, 2.0),
            (0.04 + 2000.0 * 0.005 + 1e6 * 0.01, 0.01, -0.005 - 10.0),
            0.0,
            5,
        );
        let (a, b) = (zero_crossing(&near, 2.0).unwrap(), zero_crossing(&shifted, 2.0).unwrap());
        let (Fieller::Interval { lower: al, upper: au }, Fieller::Interval { lower: bl, upper: bu }) =
            (a.limits, b.limits)
        else {
            panic!("both are well determined");
        };
        assert!((al + 1000.0 - bl).abs() < 1e-8 && (au + 1000.0 - bu).abs() < 1e-8, "{a:?} {b:?}");
    }
}
