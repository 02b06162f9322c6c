//! The one line on which all segments lie.
//!
//! Comes in: observations `y = β·(net − M)` with weights, and where the loop volume was measured a pseudo-observation of
//! `β = 1/N₀`. Goes out: `β`, `M`, and how both move with each observation. Weighted least squares in `β` and `β·M`, in
//! which the observations are linear, about the weighted mean: `β = (Σw(n − n̄)y + w_β·β_prior)/(Σw(n − n̄)² + w_β)`,
//! `M = n̄ − ȳ/β`. The null of two injections, and one slope with a measured volume, are its two ends. Left out: weights
//! that change with the observations; the caller sets them once.

use super::model::Observation;

/// A measured `β` and its weight.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Prior {
    pub(super) inverse_n: f64,
    pub(super) weight: f64,
}

/// The fitted line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Fit {
    /// Weighted means of net injection and of y.
    pub(super) net: f64,
    pub(super) y: f64,
    /// β, 1/L.
    pub(super) inverse_n: f64,
    /// Sum of weights, and the weight of β from the observations alone and with the prior.
    pub(super) weights: f64,
    pub(super) spread: f64,
    pub(super) stiffness: f64,
    /// β from the observations alone, when they differ in injection.
    pub(super) found: Option<f64>,
}

impl Fit {
    /// Fits; none without an observation, or when nothing determines β.
    pub(super) fn of(observations: &[Observation], weights: &[f64], prior: Option<Prior>) -> Option<Self> {
        let (mut sum, mut net, mut y) = (0.0, 0.0, 0.0);
        for (o, w) in observations.iter().zip(weights) {
            sum += w;
            net += w * o.net;
            y += w * o.y;
        }
        (net, y) = (net / sum, y / sum);
        let (mut spread, mut cross) = (0.0, 0.0);
        for (o, w) in observations.iter().zip(weights) {
            spread += w * (o.net - net) * (o.net - net);
            cross += w * (o.net - net) * (o.y - y);
        }
        let (pull, weight) = prior.map_or((0.0, 0.0), |p| (p.weight * p.inverse_n, p.weight));
        let stiffness = spread + weight;
        let inverse_n = (cross + pull) / stiffness;
        (inverse_n.is_finite() && y.is_finite()).then_some(Self {
            net,
            y,
            inverse_n,
            weights: sum,
            spread,
            stiffness,
            found: (spread > 0.0).then_some(cross / spread),
        })
    }

    /// The uptake.
    pub(super) fn uptake(&self) -> f64 {
        self.net - self.y / self.inverse_n
    }

    /// Change of (−ȳ, β) for one unit of an observation's y.
    pub(super) fn per_y(&self, observation: &Observation, weight: f64) -> (f64, f64) {
        (-weight / self.weights, weight * (observation.net - self.net) / self.stiffness)
    }

    /// Change of M for a change of (−ȳ + β·n̄, β): the numerator and denominator of `M − n̄`.
    pub(super) fn uptake_change(&self, (numerator, denominator): (f64, f64)) -> f64 {
        (numerator + self.y / self.inverse_n * denominator) / self.inverse_n
    }

    /// What another fit is away from this one, as numerator and denominator.
    pub(super) fn away(&self, other: &Self) -> (f64, f64) {
        (-(other.y - self.y) + self.inverse_n * (other.net - self.net), other.inverse_n - self.inverse_n)
    }
}
