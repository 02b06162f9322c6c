//! Statistics for calibration: plain numbers in, plain structs out.
//!
//! This room knows no gas, no orifice and no unit: a caller hands it numbers in one consistent set of units and reads the
//! results in the same set. In reading order:
//!
//! - [`distribution`]: normal, Student, chi-squared and F probabilities, with the same bits on every machine.
//! - [`mod@line`]: straight line with uncertainties in both coordinates (ISO/TS 28037:2010, clauses 6, 7 and 11).
//! - [`correlated`]: the same line when the points are correlated (ISO/TS 28037:2010, clause 10).
//! - [`ordinary`]: ordinary least squares, for the diagnostics that stand beside the line.
//! - [`outlier`], [`lack_of_fit`]: is a point strange, is the model the wrong shape?
//! - [`inverse`]: the x of a given y, and a ratio, with limits by Fieller's theorem.
//! - [`coverage`], [`budget`], [`conformity`]: from standard uncertainties to an interval and to a verdict.
//! - [`autocorrelation`]: what a mean or a slope is worth when successive readings resemble one another.
//! - [`monte_carlo`]: propagation of distributions (JCGM 101:2008) with a portable generator.
//!
//! Left out: prediction with a model other than a straight line, robust regression, Bayesian updating.

pub mod distribution;
mod points;
mod line_scan;
pub mod line;
pub mod correlated;
mod twice;
pub mod ordinary;
pub mod outlier;
pub mod lack_of_fit;
pub mod inverse;
pub mod coverage;
pub mod budget;
pub mod conformity;
pub mod autocorrelation;
pub mod monte_carlo;
