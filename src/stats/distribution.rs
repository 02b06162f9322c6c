//! Probabilities and quantiles of the normal, Student, chi-squared and F distributions.
//!
//! Takes an argument (or a probability) and degrees of freedom, which may be fractional and, for Student's t, infinite;
//! returns the tail probability (or the quantile). Equations: NIST Digital Library of Mathematical Functions (DLMF) 7.2
//! (error function), 8.9 and 8.11 (incomplete gamma), 8.17 (incomplete beta). Everything is built on `libm`, so that the
//! same input gives the same bits on every machine; a general statistics crate calls the platform's functions.
//! Relative accuracy is about 1e-13 for up to some ten thousand degrees of freedom.
//!
//! Left out: non-central distributions, discrete distributions.

use std::f64::consts::{FRAC_1_SQRT_2, PI};

/// Probability that a standard normal variable is at most `z`.
pub fn normal_cdf(z: f64) -> f64 {
    0.5 * libm::erfc(-z * FRAC_1_SQRT_2)
}

/// The `z` below which a standard normal variable lies with probability `p`.
///
/// `p` = 0 gives minus infinity, 1 gives infinity, anything outside 0…1 NaN.
pub fn normal_quantile(p: f64) -> f64 {
    if p < 0.5 { -normal_upper_quantile(p) } else { normal_upper_quantile(1.0 - p) }
}

/// Probability that Student's t with `dof` degrees of freedom is at most `t`. `dof` > 0, may be fractional or infinite.
pub fn student_t_cdf(t: f64, dof: f64) -> f64 {
    if t < 0.0 { student_t_upper(-t, dof) } else { 1.0 - student_t_upper(t, dof) }
}

/// Two-sided probability that Student's t with `dof` degrees of freedom is at least as far from zero as `t`.
pub fn student_t_two_sided(t: f64, dof: f64) -> f64 {
    2.0 * student_t_upper(t.abs(), dof)
}

/// The t below which Student's t with `dof` degrees of freedom lies with probability `p`. `dof` > 0, may be fractional
/// or infinite (then the normal quantile); `p` outside 0…1 or `dof` not positive gives NaN.
pub fn student_t_quantile(p: f64, dof: f64) -> f64 {
    if !(dof > 0.0 && (0.0..=1.0).contains(&p)) {
        f64::NAN
    } else if p < 0.5 {
        -student_t_upper_quantile(p, dof)
    } else {
        student_t_upper_quantile(1.0 - p, dof)
    }
}

/// Probability that F with `numerator` and `denominator` degrees of freedom exceeds `f`.
pub fn fisher_f_upper(f: f64, numerator: f64, denominator: f64) -> f64 {
    if f.is_nan() || f <= 0.0 {
        return if f.is_nan() { f } else { 1.0 };
    }
    if f.is_infinite() {
        return 0.0;
    }
    let whole = denominator + numerator * f;
    regularised_beta(denominator / 2.0, numerator / 2.0, denominator / whole, numerator * f / whole)
}

/// Probability that chi-squared with `dof` degrees of freedom exceeds `x`.
pub fn chi_squared_upper(x: f64, dof: f64) -> f64 {
    if x.is_nan() || x <= 0.0 {
        return if x.is_nan() { x } else { 1.0 };
    }
    let (a, z) = (dof / 2.0, x / 2.0);
    let front = libm::exp(a * libm::log(z) - z - libm::lgamma(a));
    if z < a + 1.0 { 1.0 - front * gamma_series(a, z) } else { front * gamma_fraction(a, z) }
}

/// The x below which chi-squared with `dof` degrees of freedom lies with probability `p` (0 < `p` < 1).
pub fn chi_squared_quantile(p: f64, dof: f64) -> f64 {
    if !(dof > 0.0 && p > 0.0 && p < 1.0) {
        return f64::NAN;
    }
    // Bisection on a bracket that certainly holds the root: slow and sure, and nothing here is called in a loop.
    let (mut low, mut high) = (0.0, dof + 10.0);
    while chi_squared_upper(high, dof) > 1.0 - p {
        high *= 2.0;
    }
    for _ in 0..200 {
        let middle = 0.5 * (low + high);
        if middle <= low || middle >= high {
            break;
        }
        if chi_squared_upper(middle, dof) > 1.0 - p {
            low = middle;
        } else {
            high = middle;
        }
    }
    0.5 * (low + high)
}

/// The z that a standard normal variable exceeds with probability `q` ≤ 0.5.
fn normal_upper_quantile(q: f64) -> f64 {
    if q.is_nan() || q < 0.0 {
        return f64::NAN;
    }
    // Below the smallest normal number the density has no digits left to correct with.
    if q < f64::MIN_POSITIVE {
        return f64::INFINITY;
    }
    // Start: Abramowitz & Stegun, Handbook of Mathematical Functions, 26.2.23 (error below 4.5e-4).
    let t = (-2.0 * libm::log(q)).sqrt();
    let mut z = t
        - (2.515517 + t * (0.802853 + t * 0.010328)) / (1.0 + t * (1.432788 + t * (0.189269 + t * 0.001308)));
    // Two steps of Halley's method cube the error each time: 1e-4, 1e-12, rounding.
    for _ in 0..2 {
        let error = (q - 0.5 * libm::erfc(z * FRAC_1_SQRT_2)) * (2.0 * PI).sqrt() * libm::exp(0.5 * z * z);
        z -= error / (1.0 + 0.5 * z * error);
    }
    z
}

/// Degrees of freedom from which Student's t is taken through its expansion about the normal distribution. The terms left
/// out are below 1e-11 of the probability up to seven standard deviations and 1e-17 at two, while the continued fraction
/// loses digits as the degrees of freedom grow (at 1e6 it was wrong by 1e-11) and needs more and more steps.
const NEARLY_NORMAL_DOF: f64 = 1e4;

/// Probability that Student's t exceeds `t` ≥ 0.
fn student_t_upper(t: f64, dof: f64) -> f64 {
    if t.is_infinite() {
        return 0.0;
    }
    if dof.is_infinite() {
        return normal_cdf(-t);
    }
    let square = t * t;
    // The expansion is one in t²/dof; far out in the tail the fraction converges fast anyway.
    if dof >= NEARLY_NORMAL_DOF && square < 0.01 * dof {
        return normal_cdf(-normal_equivalent(t, dof));
    }
    let whole = dof + square;
    0.5 * regularised_beta(dof / 2.0, 0.5, dof / whole, square / whole)
}

/// The normal deviate with the same tail probability as `t`: the series of Abramowitz & Stegun 26.7.5 turned round, to
/// fourth order in 1/dof. Coefficients from memory, checked against the incomplete beta function with 40 digits.
fn normal_equivalent(t: f64, dof: f64) -> f64 {
    let s = t * t;
    let first = (s + 1.0) / 4.0;
    let second = ((13.0 * s + 8.0) * s + 3.0) / 96.0;
    let third = (((35.0 * s + 19.0) * s + 1.0) * s - 15.0) / 384.0;
    let fourth = ((((6271.0 * s + 3224.0) * s - 102.0) * s - 1680.0) * s - 945.0) / 92_160.0;
    t - t / dof * (first - (second - (third - fourth / dof) / dof) / dof)
}

/// The t that Student's t exceeds with probability `q` ≤ 0.5.
/// Degrees of freedom from which the expansion of the quantile in 1/dof needs no steps to the root.
const EXPANSION_ALONE: f64 = 1e4;

fn student_t_upper_quantile(q: f64, dof: f64) -> f64 {
    let z = normal_upper_quantile(q);
    if dof.is_infinite() || z.is_infinite() || z <= 0.0 {
        return z.max(0.0);
    }
    // Student's tail is the heavier one, so the normal quantile lies to the left of the root; there the tail
    // probability is convex and falling, and Newton's steps climb to the root without ever passing it. The expansion in
    // 1/dof (Abramowitz & Stegun 26.7.5, three terms, from memory) lies nearer and as a rule to the left as well; where it
    // does not, it is not used.
    let s = z * z;
    let (first, second) = ((s + 1.0) / 4.0, ((5.0 * s + 16.0) * s + 3.0) / 96.0);
    let third = (((3.0 * s + 19.0) * s + 17.0) * s - 15.0) / 384.0;
    let nearer = z + z / dof * (first + (second + third / dof) / dof);
    if dof >= EXPANSION_ALONE && z <= 5.0 {
        // The next term is under 3e-13 here.
        return nearer;
    }
    let mut t = if student_t_upper(nearer, dof) > q { nearer } else { z };
    let log_density_at_zero = -0.5 * libm::log(dof) - log_beta(dof / 2.0, 0.5);
    for _ in 0..500 {
        let density = libm::exp(log_density_at_zero - 0.5 * (dof + 1.0) * libm::log1p(t * t / dof));
        let step = (student_t_upper(t, dof) - q) / density;
        // A step backwards is rounding: the root is reached.
        if step.is_nan() || step <= 2.0 * f64::EPSILON * t {
            break;
        }
        t += step;
    }
    t
}

/// Regularised incomplete beta function I_x(a, b), DLMF 8.17.2, with `y` = 1 − `x` handed in because the caller knows it
/// to full precision.
fn regularised_beta(a: f64, b: f64, x: f64, y: f64) -> f64 {
    if x <= 0.0 {
        return 0.0;
    }
    if y <= 0.0 {
        return 1.0;
    }
    let log_x = if y < 0.5 { libm::log1p(-y) } else { libm::log(x) };
    let log_y = if x < 0.5 { libm::log1p(-x) } else { libm::log(y) };
    let front = libm::exp(a * log_x + b * log_y - log_beta(a, b));
    // The fraction converges fast on one side of the distribution's mean; the other side by symmetry, DLMF 8.17.4.
    if x < (a + 1.0) / (a + b + 2.0) {
        front * beta_fraction(a, b, x) / a
    } else {
        1.0 - front * beta_fraction(b, a, y) / b
    }
}

/// Continued fraction DLMF 8.17.22, evaluated from the front by Lentz's method with Thompson and Barnett's guards.
fn beta_fraction(a: f64, b: f64, x: f64) -> f64 {
    let coefficient = |j: u32| {
        let m = f64::from(j / 2);
        if j.is_multiple_of(2) {
            m * (b - m) * x / ((a + 2.0 * m - 1.0) * (a + 2.0 * m))
        } else {
            -(a + m) * (a + b + m) * x / ((a + 2.0 * m) * (a + 2.0 * m + 1.0))
        }
    };
    // 1/(1 + d1/(1 + d2/(1 + …))): the value of the denominator is built up as f.
    1.0 / lentz(1.0, |j| (coefficient(j), 1.0))
}

/// Σ zᵏ/(a)ₖ₊₁, the series of the lower incomplete gamma function, DLMF 8.11.4 (without its front factor).
fn gamma_series(a: f64, z: f64) -> f64 {
    let mut term = 1.0 / a;
    let mut sum = term;
    let mut k = a;
    while term > sum * 0.25 * f64::EPSILON {
        k += 1.0;
        term *= z / k;
        sum += term;
    }
    // The caller's front factor divides by Γ(a), and DLMF's series by Γ(a)·a.
    sum
}

/// Continued fraction of the upper incomplete gamma function, the even part of DLMF 8.9.2 (without its front factor).
fn gamma_fraction(a: f64, z: f64) -> f64 {
    1.0 / lentz(z + 1.0 - a, |j| {
        let k = f64::from(j);
        (-k * (k - a), z + 2.0 * k + 1.0 - a)
    })
}

/// Value of b0 + a1/(b1 + a2/(b2 + …)) by Lentz's method; `term(j)` gives (aⱼ, bⱼ) for j = 1, 2, ….
fn lentz(b0: f64, term: impl Fn(u32) -> (f64, f64)) -> f64 {
    // A zero denominator is replaced by a number too small to matter (Thompson and Barnett 1986).
    let guard = |v: f64| if v.abs() < 1e-300 { 1e-300 } else { v };
    let mut value = guard(b0);
    let (mut c, mut d) = (value, 0.0);
    for j in 1..1_000_000 {
        let (a, b) = term(j);
        d = 1.0 / guard(b + a * d);
        c = guard(b + a / c);
        let factor = c * d;
        value *= factor;
        if (factor - 1.0).abs() <= f64::EPSILON {
            break;
        }
    }
    value
}

/// Natural logarithm of the beta function B(a, b).
fn log_beta(a: f64, b: f64) -> f64 {
    let (large, small) = if a > b { (a, b) } else { (b, a) };
    if large >= 20.0 && (small - 0.5).abs() < f64::EPSILON {
        // ln Γ(a) and ln Γ(a + ½) of a large a are huge and nearly equal: at a = 5e5 their difference keeps nine digits.
        // Asymptotic series of the ratio, coefficients from DLMF 5.11.13 expanded at ½; at a = 20 good to 2e-17.
        let s = 1.0 / (large * large);
        let series = -1.0 / 8.0
            + s * (1.0 / 192.0 + s * (-1.0 / 640.0 + s * (17.0 / 14_336.0 + s * (-31.0 / 18_432.0))));
        return 0.5 * libm::log(PI) - 0.5 * libm::log(large) - series / large;
    }
    libm::lgamma(a) + libm::lgamma(b) - libm::lgamma(a + b)
}

#[cfg(test)]
mod tests {
    use super::*;
    use statrs::distribution::{ChiSquared, ContinuousCDF, FisherSnedecor, Normal, StudentsT};

    fn near(got: f64, want: f64, relative: f64, what: &str) {
        let difference = (got - want).abs();
        assert!(
            difference <= relative * want.abs(),
            "{what}: got {got}, want {want}, difference {difference:e}"
        );
    }

    #[test]
    fn tail_probabilities_agree_with_an_independent_library() {
        let normal = Normal::new(0.0, 1.0).unwrap();
        for z in [-8.0, -3.1, -1.0, -0.01, 0.0, 0.5, 2.2, 5.0] {
            near(normal_cdf(z), normal.cdf(z), 1e-10, "normal");
        }
        for dof in [0.7, 1.0, 2.5, 7.0, 18.998, 200.0, 5000.5] {
            let student = StudentsT::new(0.0, 1.0, dof).unwrap();
            for t in [-30.0, -4.0, -0.3, 0.001, 1.0, 2.5] {
                near(student_t_cdf(t, dof), student.cdf(t), 1e-10, &format!("Student t, dof {dof}, t {t}"));
            }
        }
        for (d1, d2) in [(1.0, 3.0), (4.0, 5.0), (2.5, 40.0), (12.0, 300.0)] {
            let fisher = FisherSnedecor::new(d1, d2).unwrap();
            for f in [0.01, 0.7, 1.0, 3.3, 14.8] {
                near(fisher_f_upper(f, d1, d2), fisher.sf(f), 1e-9, &format!("F({d1}, {d2}) at {f}"));
            }
        }
        for dof in [1.0, 2.0, 4.0, 5.5, 60.0] {
            let chi = ChiSquared::new(dof).unwrap();
            for x in [0.01, 0.5, 3.0, 9.488, 80.0] {
                near(chi_squared_upper(x, dof), chi.sf(x), 1e-9, &format!("chi-squared({dof}) at {x}"));
            }
        }
    }

    #[test]
    fn student_t_with_one_and_two_dof_has_its_closed_form() {
        // One degree of freedom: tan(π(p − ½)); two: (2p − 1)·sqrt(2/(4p(1 − p))).
        for p in [0.5001, 0.6, 0.9, 0.975, 0.9999, 0.999_999_9] {
            near(student_t_quantile(p, 1.0), libm::tan(PI * (p - 0.5)), 1e-9, "one dof");
            let two = (2.0 * p - 1.0) * (2.0 / (4.0 * p * (1.0 - p))).sqrt();
            near(student_t_quantile(p, 2.0), two, 1e-9, "two dof");
        }
    }

    #[test]
    fn student_t_quantile_undoes_the_probability_also_for_fractional_dof() {
        for dof in [0.3, 1.5, 3.7, 18.998, 120.4, 9_999.0, 999_999.0, 1e6, 3e7, 1e12, f64::INFINITY] {
            for p in [1e-9, 0.001, 0.025, 0.3, 0.4999, 0.6, 0.95, 0.975] {
                near(student_t_cdf(student_t_quantile(p, dof), dof), p, 1e-12, &format!("dof {dof}, p {p}"));
            }
        }
    }

    #[test]
    fn student_t_joins_smoothly_where_the_expansion_takes_over() {
        for p in [0.6, 0.975, 0.9999] {
            let below = student_t_quantile(p, NEARLY_NORMAL_DOF * (1.0 - 1e-12));
            near(student_t_quantile(p, NEARLY_NORMAL_DOF), below, 1e-12, "quantile at the joint");
        }
    }

    #[test]
    fn normal_quantile_undoes_the_probability_far_into_the_tail() {
        for p in [1e-300, 1e-30, 1e-9, 0.025, 0.3, 0.5, 0.8, 0.975] {
            near(normal_cdf(normal_quantile(p)), p, 1e-11, &format!("p {p}"));
        }
        near(normal_quantile(0.975), 1.959_963_984_540_054, 1e-15, "0.975");
    }

    #[test]
    fn chi_squared_quantile_undoes_the_probability() {
        for dof in [0.5, 1.0, 4.0, 37.2, 900.0] {
            for p in [0.001, 0.5, 0.95, 0.9999] {
                near(
                    1.0 - chi_squared_upper(chi_squared_quantile(p, dof), dof),
                    p,
                    1e-11,
                    &format!("{dof}, {p}"),
                );
            }
        }
    }

    #[test]
    fn the_expansion_alone_is_the_root_to_its_last_digits() {
        for dof in [1e4, 1.5e4, 1e6, 1e9] {
            for p in [0.6, 0.9, 0.975, 0.995, 0.99997, 0.999_999] {
                let t = student_t_quantile(p, dof);
                let slope = libm::exp(-0.5 * t * t) / (2.0 * PI).sqrt();
                let off = (student_t_upper(t, dof) - (1.0 - p)) / slope;
                assert!(off.abs() < 1e-9, "dof {dof}, p {p}: {off:e}");
            }
        }
    }

    #[test]
    fn impossible_arguments_give_nan_and_the_ends_give_infinity() {
        assert!(student_t_quantile(1.2, 3.0).is_nan());
        assert!(student_t_quantile(0.9, 0.0).is_nan());
        assert!(student_t_quantile(0.9, f64::NAN).is_nan());
        assert!(normal_quantile(-0.1).is_nan());
        assert!(chi_squared_quantile(1.0, 3.0).is_nan());
        assert!(student_t_quantile(1.0, 3.0).is_infinite() && student_t_quantile(0.0, 3.0).is_infinite());
    }
}
