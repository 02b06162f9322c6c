//! The same hole with another gas.
//!
//! Choked standard-volume flow goes with `C*/sqrt(M)`, times the discharge coefficient, which depends on the Reynolds
//! number and so on the gas too: `1 − k/√Re`, with `k` known only to lie between 0 and
//! [`LARGEST_K`]. The middle of that range is used and its width is uncertainty. Left out:
//! oxygen of less than full purity on the bench, whose molar mass differs by under 0.1 %.

use super::choke::LARGEST_K;
use super::correct::REFERENCE_TEMPERATURE_K;
use crate::gas::{self, Species};
use crate::quantity::{AbsolutePressure, StpdFlow, Temperature};

/// Relative standard uncertainty of the ratio of two critical flow functions (two equations of state differ by
/// 5·10⁻⁵; twice that is allowed for).
const CRITICAL_FLOW_U: f64 = 1e-4;

/// Flow of one gas over the flow of another through the same choked hole from the same upstream state.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct GasRatio {
    /// The ratio.
    pub value: f64,
    /// Its standard uncertainty.
    pub standard_uncertainty: f64,
}

/// The ratio of `to` over `from` for a hole that passes `flow_l_min` of `from` at `p1_bar` absolute and 20 °C.
#[must_use]
pub fn gas_ratio(from: Species, to: Species, p1_bar: f64, flow_l_min: f64) -> GasRatio {
    if from == to {
        return GasRatio { value: 1.0, standard_uncertainty: 0.0 };
    }
    let (p1, t1) = (AbsolutePressure::from_bar(p1_bar), Temperature::from_k(REFERENCE_TEMPERATURE_K));
    let ideal = gas::flow_ratio_between(from, to, p1, t1);
    let flow = StpdFlow::from_l_min(flow_l_min);
    let diameter = gas::effective_diameter(from, flow, p1, t1);
    let inverse_root = |species, flow| 1.0 / gas::reynolds_number(species, flow, diameter).max(1.0).sqrt();
    let (from_re, to_re) =
        (inverse_root(from, flow), inverse_root(to, StpdFlow::from_l_min(flow_l_min * ideal)));
    let with_k = |k: f64| (1.0 - k * to_re) / (1.0 - k * from_re);
    let (none, most) = (with_k(0.0), with_k(LARGEST_K));
    let half_width = (most - none).abs() / 2.0;
    let relative_u = (half_width * half_width / 3.0 + CRITICAL_FLOW_U * CRITICAL_FLOW_U).sqrt();
    let value = ideal * (none + most) / 2.0;
    GasRatio { value, standard_uncertainty: value * relative_u }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn air_passes_five_per_cent_more_than_oxygen() {
        // Common practice, no source.
        let ratio = gas_ratio(Species::Oxygen, Species::Air, 11.0, 0.48);
        assert!((ratio.value - 1.05).abs() < 0.005, "{}", ratio.value);
        assert!((1e-4..0.002).contains(&ratio.standard_uncertainty), "{}", ratio.standard_uncertainty);
    }

    #[test]
    fn helium_is_known_far_worse_because_its_reynolds_number_is_low() {
        let helium = gas_ratio(Species::Air, Species::Helium, 11.0, 0.5);
        let nitrogen = gas_ratio(Species::Air, Species::Nitrogen, 11.0, 0.5);
        assert!(
            helium.standard_uncertainty / helium.value > 5.0 * nitrogen.standard_uncertainty / nitrogen.value
        );
    }
}
