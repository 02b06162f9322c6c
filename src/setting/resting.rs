//! The resting uptake as a setting takes it.

use crate::uptake::{Estimate, PerKilogram, SharedLine};

/// Another day's resting uptake: a prediction, and the only uptake a setting uses.
#[derive(Debug, Clone, PartialEq)]
pub struct RestingUptake {
    /// Best estimate, L/min STPD.
    pub uptake_l_min: f64,
    /// Standard uncertainty of the prediction, L/min.
    pub u_l_min: f64,
    /// Its effective degrees of freedom.
    pub dof: f64,
    /// How it moves with the lines its sessions were injected through.
    pub shared_lines: Vec<SharedLine>,
    /// Uptake per kilogram, when the mass is known.
    pub per_kilogram: Option<PerKilogram>,
}

impl From<&Estimate> for RestingUptake {
    fn from(estimate: &Estimate) -> Self {
        Self {
            uptake_l_min: estimate.next_day.uptake_l_min,
            u_l_min: estimate.next_day.u,
            dof: estimate.next_day.dof,
            shared_lines: estimate.shared.lines.clone(),
            per_kilogram: estimate.per_kilogram,
        }
    }
}
