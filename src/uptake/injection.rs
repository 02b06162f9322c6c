//! The injection's calibrated line as a session needs it.
//!
//! Comes in: an orifice's line as the bench made it. Goes out: whole-gas flow of oxygen at an intermediate pressure, and
//! the line's covariance kept in its parts, so that whoever uses uptake and line together can carry what they share.
//! `q = (α + β·p1)·sqrt(293.15 K/T)`, p1 in bar absolute, q in L/min STPD. Left out: first-stage behaviour.

use crate::bench::convert::GasRatio;
use crate::bench::correct::{REFERENCE_TEMPERATURE_K, Source};
use crate::bench::line::OrificeLine;

/// A line `q = α + β·p1` for oxygen of 20 °C; q in L/min STPD, p1 in bar absolute.
#[derive(Debug, Clone, PartialEq)]
pub struct InjectionLine {
    /// Intercept, L/min.
    pub intercept: f64,
    /// Slope, L/min per bar.
    pub slope: f64,
    /// Random part: variance of the intercept.
    pub intercept_variance: f64,
    /// Random part: variance of the slope.
    pub slope_variance: f64,
    /// Random part: their covariance.
    pub covariance: f64,
    /// Degrees of freedom of the random part.
    pub random_dof: f64,
    /// Sources common to all points: change of intercept and of slope for one standard uncertainty.
    pub common: Vec<LineShift>,
}

/// What one standard uncertainty of a source common to all points does to the line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LineShift {
    /// The source; none for turning another gas's line into oxygen's.
    pub source: Option<Source>,
    /// Change of the intercept, L/min.
    pub intercept: f64,
    /// Change of the slope, L/min per bar.
    pub slope: f64,
}

impl InjectionLine {
    /// From an orifice's line; `to_oxygen` is the flow of oxygen over that of the run's gas, 1 exactly for a run with
    /// oxygen.
    #[must_use]
    pub fn of(line: &OrificeLine, to_oxygen: GasRatio) -> Self {
        let ratio = to_oxygen.value;
        let random = &line.random;
        let mut common: Vec<LineShift> = line
            .common
            .iter()
            .map(|c| LineShift {
                source: Some(c.source),
                intercept: ratio * c.intercept,
                slope: ratio * c.slope,
            })
            .collect();
        if to_oxygen.standard_uncertainty > 0.0 {
            common.push(LineShift {
                source: None,
                intercept: random.intercept * to_oxygen.standard_uncertainty,
                slope: random.slope * to_oxygen.standard_uncertainty,
            });
        }
        Self {
            intercept: ratio * random.intercept,
            slope: ratio * random.slope,
            intercept_variance: ratio * ratio * random.intercept_u * random.intercept_u,
            slope_variance: ratio * ratio * random.slope_u * random.slope_u,
            covariance: ratio * ratio * random.covariance,
            random_dof: line.random_dof,
            common,
        }
    }

    /// Whole-gas flow at `p1_bar` absolute and gas of `gas_k`, L/min STPD; not below zero.
    #[must_use]
    pub fn flow(&self, p1_bar: f64, gas_k: f64) -> f64 {
        ((self.intercept + self.slope * p1_bar) * (REFERENCE_TEMPERATURE_K / gas_k).sqrt()).max(0.0)
    }

    /// Standard uncertainty, random part, of something that changes by `per_intercept` and `per_slope` for one unit of
    /// each.
    #[must_use]
    pub fn random_u(&self, per_intercept: f64, per_slope: f64) -> f64 {
        let variance = per_intercept * per_intercept * self.intercept_variance
            + per_slope * per_slope * self.slope_variance
            + 2.0 * per_intercept * per_slope * self.covariance;
        variance.max(0.0).sqrt()
    }

    /// Standard uncertainty, random and common parts, of the same.
    #[must_use]
    pub fn combined_u(&self, per_intercept: f64, per_slope: f64) -> f64 {
        let random = self.random_u(per_intercept, per_slope);
        let common: f64 = self
            .common
            .iter()
            .map(|c| per_intercept * c.intercept + per_slope * c.slope)
            .map(|shift| shift * shift)
            .sum();
        (random * random + common).sqrt()
    }
}
