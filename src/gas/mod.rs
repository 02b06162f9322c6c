//! Species, water vapour, choked and subsonic flow, the atmosphere and depth.
//!
//! Comes in: quantities of [`crate::quantity`]. Goes out: flows, factors and pressures. Left out: heat transfer,
//! two-phase flow, gas mixtures other than air, and anything an orifice does that a choke ratio does not describe.

mod ambient;
mod critical_flow;
mod orifice;
mod species;
mod water_vapour;

pub use ambient::{STANDARD_GRAVITY, Water, at_altitude, at_depth, depth_of};
pub use critical_flow::{critical_flow_function, ideal_critical_flow_function, ideal_critical_ratio};
pub use orifice::{
    ANR, STPD_PER_ANR, choked_mass_flow, effective_diameter, flow_ratio_between, reynolds_number,
    sonic_conductance, stpd_density, subsonic_factor,
};
pub use species::{MOLAR_GAS_CONSTANT, Species};
pub use water_vapour::saturation_pressure;
