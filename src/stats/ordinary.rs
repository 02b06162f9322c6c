//! Ordinary least squares, for the diagnostics that stand beside the line: is there curvature, drift, a difference between
//! sweeps, a point far off?
//!
//! Takes design columns and readings of equal weight and returns parameters, standard errors, covariance, p-values,
//! residuals and the share of variation explained. The fit itself is `linregress`'s; around it stand what it leaves out:
//!
//! - columns are centred, scaled and made orthogonal first, so that collinear ones can be told and a polynomial keeps its
//!   digits;
//! - the parameters are then refined with residuals computed to twice the working precision, since the small difference
//!   of large numbers (NIST's Wampler 1) is lost otherwise;
//! - p-values come from [`super::distribution`]: the library's divide by a standard error no smaller than 2e-16, which
//!   is wrong for flows in m³/s;
//! - a perfect fit, a single column and a constant y are answered, not NaN.
//!
//! Left out: weights, selection of columns, ridge and robust regression.

use super::distribution::student_t_two_sided;
use super::twice::Twice;
use linregress::fit_low_level_regression_model_without_statistics;
use thiserror::Error;

/// Why no fit came out.
#[derive(Debug, Clone, Error)]
pub enum OrdinaryError {
    /// A column has another length than the readings.
    #[error("column {column} has {length} entries for {y} readings")]
    Lengths {
        /// Which column, counted from 1.
        column: usize,
        /// Its length.
        length: usize,
        /// Number of readings.
        y: usize,
    },
    /// Nothing to fit.
    #[error("a fit needs at least one column")]
    NoColumns,
    /// No degrees of freedom left.
    #[error("{points} points leave no degrees of freedom for {parameters} parameters; at least {} are needed", parameters + 1)]
    TooFew {
        /// Number of points.
        points: usize,
        /// Number of parameters, the intercept included.
        parameters: usize,
    },
    /// NaN or infinity.
    #[error("point {0} (counted from 1) holds a number that is not finite")]
    NotFinite(usize),
    /// A column is zero, constant beside an intercept, or a combination of those before it.
    #[error("column {0} says nothing that the columns before it (or the intercept) do not say; leave it out")]
    Collinear(usize),
    /// The library gave up.
    #[error("the least-squares fit failed")]
    Solver(#[source] linregress::Error),
}

/// Whether a constant is fitted beside the columns.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Intercept {
    /// A constant is fitted; it is the first parameter.
    Free,
    /// The fit goes through zero where all columns are zero.
    Zero,
}

/// A least-squares fit with its statistics. Parameters are in the order of the columns, the intercept first where free.
#[derive(Debug, Clone, PartialEq)]
pub struct OrdinaryFit {
    /// Estimates.
    pub parameters: Vec<f64>,
    /// Their standard errors: square roots of the diagonal of `covariance`.
    pub standard_errors: Vec<f64>,
    /// Covariance of the parameters, row by row: residual variance times (XᵀX)⁻¹.
    pub covariance: Vec<Vec<f64>>,
    /// Reading minus fitted value, in the order of the readings.
    pub residuals: Vec<f64>,
    /// Sum of the squared residuals.
    pub residual_square_sum: f64,
    /// Square root of the residual sum of squares over the degrees of freedom.
    pub residual_sd: f64,
    /// Share of the variation of y explained: about its mean with a free intercept, about zero without (NIST's
    /// convention). None when y does not vary.
    pub r_squared: Option<f64>,
    /// Number of points minus number of parameters, at least 1.
    pub dof: usize,
    /// Whether the residuals are no larger than the rounding of y.
    pub perfect: bool,
}

impl OrdinaryFit {
    /// Two-sided probability of so large a parameter, counted from 0, if its true value is zero (Student's t). None in a
    /// perfect fit, where there is no scatter to judge by, and where there is no such parameter.
    pub fn p_value(&self, parameter: usize) -> Option<f64> {
        let (b, se) = (self.parameters.get(parameter)?, *self.standard_errors.get(parameter)?);
        (!self.perfect && se > 0.0).then(|| student_t_two_sided(b / se, self.dof as f64))
    }
}

/// Fits `y` as a combination of `columns`.
///
/// # Errors
///
/// No columns, lengths that differ, numbers that are not finite, no degrees of freedom left, a column that depends on
/// those before it.
pub fn fit(columns: &[&[f64]], y: &[f64], intercept: Intercept) -> Result<OrdinaryFit, OrdinaryError> {
    for (j, column) in columns.iter().enumerate() {
        if column.len() != y.len() {
            return Err(OrdinaryError::Lengths { column: j + 1, length: column.len(), y: y.len() });
        }
    }
    check(columns, y, columns.len() + usize::from(intercept == Intercept::Free))?;

    // Working columns z = (c − mean)/scale, and the matrix that takes their parameters back to those of the columns.
    let first = usize::from(intercept == Intercept::Free);
    let p = first + columns.len();
    let mut back = vec![vec![0.0; p]; p];
    let mut z = Vec::with_capacity(p);
    if intercept == Intercept::Free {
        z.push(vec![1.0; y.len()]);
        back[0][0] = 1.0;
    }
    for (j, column) in columns.iter().enumerate() {
        let middle = match intercept {
            Intercept::Free => column.iter().sum::<f64>() / y.len() as f64,
            Intercept::Zero => 0.0,
        };
        let scale = column.iter().fold(0.0_f64, |m, c| m.max((c - middle).abs()));
        if scale <= 4.0 * f64::EPSILON * middle.abs() {
            return Err(OrdinaryError::Collinear(j + 1));
        }
        z.push(column.iter().map(|c| (c - middle) / scale).collect());
        back[first + j][first + j] = 1.0 / scale;
        if intercept == Intercept::Free {
            back[0][first + j] = -middle / scale;
        }
    }
    let residual = |i: usize, parameters: &[f64]| {
        let mut sum = Twice::from(y[i]);
        if intercept == Intercept::Free {
            sum = sum.plus(-parameters[0]);
        }
        for (column, b) in columns.iter().zip(&parameters[first..]) {
            sum = sum.plus_product(-b, column[i]);
        }
        sum.value()
    };
    solve(&z, &back, y, intercept, residual)
}

/// Fits `y` as a polynomial in `x`: parameters of x⁰, x¹, … x^`degree`.
///
/// # Errors
///
/// As [`fit`]; fewer than `degree` + 1 different x count as a collinear column.
pub fn polynomial(x: &[f64], y: &[f64], degree: usize) -> Result<OrdinaryFit, OrdinaryError> {
    if x.len() != y.len() {
        return Err(OrdinaryError::Lengths { column: 1, length: x.len(), y: y.len() });
    }
    check(&[x], y, degree + 1)?;
    // Powers of u = (x − c)/h, which runs from −1 to 1, instead of powers of x, which are nearly parallel.
    let (low, high) = x.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(l, h), &v| (l.min(v), h.max(v)));
    let (c, h) = (0.5 * low + 0.5 * high, 0.5 * high - 0.5 * low);
    if h <= 4.0 * f64::EPSILON * c.abs() {
        return Err(OrdinaryError::Collinear(1));
    }
    let power = |v: f64, k: usize| (0..k).fold(1.0, |product, _| product * v);
    let z: Vec<Vec<f64>> = (0..=degree).map(|k| x.iter().map(|x| power((x - c) / h, k)).collect()).collect();
    // uᵏ = Σₘ binomial(k, m)·xᵐ·(−c)^(k−m)/hᵏ.
    let mut back = vec![vec![0.0; degree + 1]; degree + 1];
    let mut binomials = vec![1.0; degree + 1];
    for (m, row) in back.iter_mut().enumerate() {
        for k in m..=degree {
            row[k] = binomials[k] * power(-c, k - m) / power(h, k);
            binomials[k] *= (k - m) as f64 / (m + 1) as f64;
        }
    }
    let residual = |i: usize, parameters: &[f64]| {
        // Horner's rule in twice the working precision.
        let mut sum = Twice::from(0.0);
        for b in parameters.iter().rev() {
            sum = sum.times(x[i]).plus(-b);
        }
        sum.plus(y[i]).value()
    };
    solve(&z, &back, y, Intercept::Free, residual)
}

/// Residuals of a straight line through (`x`, `y`), each over its own standard deviation: the residual standard deviation
/// times sqrt(1 − leverage), so that a point at the end of the line, which pulls the line to itself, is judged fairly
/// (internally studentised residuals; Cook & Weisberg, Residuals and Influence in Regression, 1982, 2.2).
///
/// None for a point the line must pass through (leverage 1), and for all points of a perfect fit.
///
/// # Errors
///
/// As [`fit`].
pub fn studentised_residuals(x: &[f64], y: &[f64]) -> Result<Vec<Option<f64>>, OrdinaryError> {
    if x.len() != y.len() {
        return Err(OrdinaryError::Lengths { column: 1, length: x.len(), y: y.len() });
    }
    check(&[x], y, 2)?;
    // A straight line about its centre is written down in four sums, and keeps its digits there.
    let n = x.len() as f64;
    let (mean, level) = (x.iter().sum::<f64>() / n, y.iter().sum::<f64>() / n);
    let square: f64 = x.iter().map(|x| (x - mean) * (x - mean)).sum();
    let widest = x.iter().fold(0.0_f64, |m, x| m.max((x - mean).abs()));
    if widest <= 4.0 * f64::EPSILON * mean.abs() {
        return Err(OrdinaryError::Collinear(1));
    }
    let slope = x.iter().zip(y).map(|(x, y)| (x - mean) * (y - level)).sum::<f64>() / square;
    let residual = |x: &f64, y: &f64| (y - level) - slope * (x - mean);
    let largest = y.iter().fold(0.0_f64, |m, y| m.max(y.abs()));
    let perfect = x.iter().zip(y).all(|(x, y)| residual(x, y).abs() <= 8.0 * f64::EPSILON * largest);
    let sd = (x.iter().zip(y).map(|(x, y)| residual(x, y) * residual(x, y)).sum::<f64>() / (n - 2.0)).sqrt();
    Ok(x.iter()
        .zip(y)
        .map(|(x, y)| {
            let free = 1.0 - 1.0 / n - (x - mean) * (x - mean) / square;
            // A leverage of 1 comes out of rounding a little below it.
            (!perfect && free > 1e-12).then(|| residual(x, y) / (sd * free.sqrt()))
        })
        .collect())
}

fn check(columns: &[&[f64]], y: &[f64], parameters: usize) -> Result<(), OrdinaryError> {
    if columns.is_empty() {
        return Err(OrdinaryError::NoColumns);
    }
    if let Some(i) = (0..y.len()).find(|&i| !y[i].is_finite() || columns.iter().any(|c| !c[i].is_finite())) {
        return Err(OrdinaryError::NotFinite(i + 1));
    }
    if y.len() <= parameters {
        return Err(OrdinaryError::TooFew { points: y.len(), parameters });
    }
    Ok(())
}

/// Rounds of refinement. Wampler 1 gains its last digits in the second; more change nothing.
const REFINEMENTS: usize = 2;

/// Fits `y` by the working columns `z`, takes the parameters back by `back`, refines them with `residual(i, parameters)`.
fn solve(
    z: &[Vec<f64>],
    back: &[Vec<f64>],
    y: &[f64],
    intercept: Intercept,
    residual: impl Fn(usize, &[f64]) -> f64,
) -> Result<OrdinaryFit, OrdinaryError> {
    let (n, p) = (y.len(), z.len());
    let triangle = Orthogonal::new(z).map_err(|column| {
        // Columns are counted as the caller counts them: without the constant.
        OrdinaryError::Collinear(column + 1 - usize::from(intercept == Intercept::Free))
    })?;
    let mut parameters = first_parameters(&triangle.q, y)?;
    triangle.back_substitute(&mut parameters);
    parameters = times(back, &parameters);
    let residuals_of = |parameters: &[f64]| (0..n).map(|i| residual(i, parameters)).collect::<Vec<f64>>();
    let mut residuals = residuals_of(&parameters);
    for _ in 0..REFINEMENTS {
        let correction = times(back, &triangle.solve(&residuals));
        let mut moved = false;
        for (b, c) in parameters.iter_mut().zip(correction) {
            let before = b.to_bits();
            *b += c;
            moved |= b.to_bits() != before;
        }
        // The same parameters have the same residuals, and another round would bring the same correction.
        if !moved {
            break;
        }
        residuals = residuals_of(&parameters);
    }

    let dof = n - p;
    let largest = y.iter().fold(0.0_f64, |m, v| m.max(v.abs()));
    let perfect = residuals.iter().all(|r| r.abs() <= 8.0 * f64::EPSILON * largest);
    let residual_square_sum: f64 = residuals.iter().map(|r| r * r).sum();
    let variance = residual_square_sum / dof as f64;
    // Covariance of the parameters: back·R⁻¹·R⁻ᵀ·backᵀ, as a product with its own transpose.
    let half: Vec<Vec<f64>> = triangle.inverse_columns().iter().map(|column| times(back, column)).collect();
    let covariance: Vec<Vec<f64>> = (0..p)
        .map(|i| (0..p).map(|j| variance * half.iter().map(|h| h[i] * h[j]).sum::<f64>()).collect())
        .collect();
    let standard_errors: Vec<f64> = (0..p).map(|i| covariance[i][i].sqrt()).collect();
    let about = match intercept {
        Intercept::Free => y.iter().sum::<f64>() / n as f64,
        Intercept::Zero => 0.0,
    };
    let whole: f64 = y.iter().map(|y| (y - about) * (y - about)).sum();
    let rounding = 4.0 * f64::EPSILON * largest;
    let r_squared = (whole > rounding * rounding * n as f64).then(|| 1.0 - residual_square_sum / whole);
    Ok(OrdinaryFit {
        parameters,
        standard_errors,
        covariance,
        residual_sd: variance.sqrt(),
        residual_square_sum,
        residuals,
        r_squared,
        dof,
        perfect,
    })
}

/// Parameters of orthonormal columns by `linregress`, whose singular values are found at once when all are one.
fn first_parameters(z: &[Vec<f64>], y: &[f64]) -> Result<Vec<f64>, OrdinaryError> {
    let n = y.len();
    // The library refuses a single column. One extra point with an extra column of its own, zero everywhere else, is
    // fitted exactly by that column and changes neither the other parameter nor the residuals.
    let lonely = z.len() == 1;
    let mut rows = Vec::with_capacity((n + 1) * (z.len() + 2));
    for i in 0..n {
        rows.push(y[i]);
        rows.extend(z.iter().map(|column| column[i]));
        if lonely {
            rows.push(0.0);
        }
    }
    if lonely {
        rows.extend([0.0, 0.0, 1.0]);
    }
    let (points, width) = if lonely { (n + 1, 3) } else { (n, z.len() + 1) };
    let mut parameters = fit_low_level_regression_model_without_statistics(&rows, points, width)
        .map_err(OrdinaryError::Solver)?;
    parameters.truncate(z.len());
    Ok(parameters)
}

/// Columns split into orthonormal ones and an upper triangle, Z = Q·R (modified Gram-Schmidt, twice).
struct Orthogonal {
    q: Vec<Vec<f64>>,
    r: Vec<Vec<f64>>,
}

/// A column of which less than this share stands apart from the columns before it says nothing of its own.
const DEPENDENT: f64 = 1e-11;

impl Orthogonal {
    /// Err with the index of the first column that depends on those before it.
    fn new(z: &[Vec<f64>]) -> Result<Self, usize> {
        let p = z.len();
        let mut q: Vec<Vec<f64>> = Vec::with_capacity(p);
        let mut r = vec![vec![0.0; p]; p];
        for (j, column) in z.iter().enumerate() {
            let mut v = column.clone();
            let length = dot(&v, &v).sqrt();
            // The second pass removes what rounding left of the first.
            for _ in 0..2 {
                for (i, other) in q.iter().enumerate() {
                    let along = dot(other, &v);
                    r[i][j] += along;
                    for (v, o) in v.iter_mut().zip(other) {
                        *v -= along * o;
                    }
                }
            }
            let left = dot(&v, &v).sqrt();
            if left.is_nan() || left <= DEPENDENT * length {
                return Err(j);
            }
            r[j][j] = left;
            v.iter_mut().for_each(|v| *v /= left);
            q.push(v);
        }
        Ok(Self { q, r })
    }

    /// Least-squares parameters for `y`.
    fn solve(&self, y: &[f64]) -> Vec<f64> {
        let mut parameters: Vec<f64> = self.q.iter().map(|q| dot(q, y)).collect();
        self.back_substitute(&mut parameters);
        parameters
    }

    /// R⁻¹, column by column.
    fn inverse_columns(&self) -> Vec<Vec<f64>> {
        let p = self.r.len();
        let column = |j: usize| {
            let mut column = vec![0.0; p];
            column[j] = 1.0;
            self.back_substitute(&mut column);
            column
        };
        (0..p).map(column).collect()
    }

    /// Solves R·v = `right` in place.
    fn back_substitute(&self, right: &mut [f64]) {
        for j in (0..right.len()).rev() {
            right[j] /= self.r[j][j];
            for i in 0..j {
                right[i] -= self.r[i][j] * right[j];
            }
        }
    }
}

fn dot(a: &[f64], b: &[f64]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

fn times(matrix: &[Vec<f64>], vector: &[f64]) -> Vec<f64> {
    matrix.iter().map(|row| dot(row, vector)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn standard_errors_agree_with_the_librarys_own() {
        let x = [0.0, 1.0, 2.0, 3.0, 4.0, 6.0];
        let s = [1.0, -1.0, 1.0, -1.0, 1.0, -1.0];
        let y = [1.1, 1.9, 3.2, 3.8, 5.3, 6.7];
        let ours = fit(&[&x, &s], &y, Intercept::Free).unwrap();
        let rows: Vec<f64> = (0..6).flat_map(|i| [y[i], 1.0, x[i], s[i]]).collect();
        let theirs = linregress::fit_low_level_regression_model(&rows, 6, 4).unwrap();
        for j in 0..3 {
            assert!((ours.parameters[j] - theirs.parameters()[j]).abs() < 1e-12);
            assert!((ours.standard_errors[j] / theirs.se()[j] - 1.0).abs() < 1e-12);
            assert!((ours.p_value(j).unwrap() / theirs.p_values()[j] - 1.0).abs() < 1e-9);
        }
        assert!((ours.r_squared.unwrap() - theirs.rsquared()).abs() < 1e-12);
    }

    #[test]
    fn p_values_do_not_depend_on_the_unit() {
        let (x, y) = ([1.0, 2.0, 3.0, 4.0, 5.0], [1.0, 2.3, 2.8, 4.4, 4.9]);
        let tiny: Vec<f64> = y.iter().map(|y| y * 1e-22).collect();
        let (plain, scaled) = (polynomial(&x, &y, 2).unwrap(), polynomial(&x, &tiny, 2).unwrap());
        for (a, b) in (0..3).map(|j| (plain.p_value(j), scaled.p_value(j))) {
            assert!((a.unwrap() / b.unwrap() - 1.0).abs() < 1e-9, "{a:?} {b:?}");
        }
    }

    #[test]
    fn a_perfect_fit_is_said_to_be_one_and_has_no_p_values() {
        let x = [1.0, 2.0, 3.0, 4.0, 5.0];
        let y = x.map(|x| 0.1 + 0.3 * x);
        let line = polynomial(&x, &y, 1).unwrap();
        assert!(line.perfect && line.p_value(0).or(line.p_value(1)).is_none() && line.residual_sd < 1e-15);
        assert!(studentised_residuals(&x, &y).unwrap().iter().all(Option::is_none));
    }

    #[test]
    fn a_constant_y_has_no_variation_to_explain() {
        let line = polynomial(&[1.0, 2.0, 3.0, 4.0], &[0.1; 4], 1).unwrap();
        assert_eq!(line.r_squared, None);
        assert!(line.parameters[1].abs() < 1e-16);
    }

    #[test]
    fn what_cannot_be_fitted_is_refused_by_name() {
        let (x, y) = ([1.0, 2.0, 3.0, 4.0], [1.0, 2.0, 2.5, 4.5]);
        let doubled = x.map(|x| 2.0 * x + 1.0);
        let error = |r: Result<OrdinaryFit, OrdinaryError>| r.unwrap_err();
        assert!(matches!(error(fit(&[], &y, Intercept::Free)), OrdinaryError::NoColumns));
        assert!(matches!(
            error(fit(&[&x, &x[..3]], &y, Intercept::Free)),
            OrdinaryError::Lengths { column: 2, length: 3, y: 4 }
        ));
        assert!(matches!(error(polynomial(&x, &y, 3)), OrdinaryError::TooFew { points: 4, parameters: 4 }));
        assert!(matches!(error(fit(&[&x, &doubled], &y, Intercept::Free)), OrdinaryError::Collinear(2)));
        assert!(matches!(error(fit(&[&[3.0; 4]], &y, Intercept::Free)), OrdinaryError::Collinear(1)));
        assert!(matches!(error(fit(&[&[0.0; 4]], &y, Intercept::Zero)), OrdinaryError::Collinear(1)));
        assert!(matches!(error(polynomial(&[1.0, 1.0, 2.0, 2.0], &y, 2)), OrdinaryError::Collinear(2)));
        assert!(matches!(error(polynomial(&[5.0; 4], &y, 1)), OrdinaryError::Collinear(1)));
        assert!(matches!(error(polynomial(&x, &[1.0, 2.0, f64::NAN, 3.0], 1)), OrdinaryError::NotFinite(3)));
    }

    #[test]
    fn studentised_residuals_have_their_closed_form() {
        // Line through x = −1, 0, 1, 2 and a lone point at the end; leverages by 1/n + (x − mean)²/Σ.
        let (x, y) = ([-1.0, 0.0, 1.0, 4.0], [0.2, -0.1, 0.3, 1.0]);
        let line = polynomial(&x, &y, 1).unwrap();
        let got = studentised_residuals(&x, &y).unwrap();
        for i in 0..4 {
            let leverage = 0.25 + (x[i] - 1.0).powi(2) / 14.0;
            let want = line.residuals[i] / (line.residual_sd * (1.0 - leverage).sqrt());
            assert!((got[i].unwrap() - want).abs() < 1e-12, "point {i}");
        }
        let lever = studentised_residuals(&[0.0, 0.0, 0.0, 1.0], &[0.1, 0.3, 0.2, 5.0]).unwrap();
        assert!(lever[3].is_none() && lever[0].is_some());
    }
}
