//! Species, water vapour, choked and subsonic flow, the atmosphere and depth.
//!
//! Comes in: quantities of [`crate::quantity`]. Goes out: flows, factors and pressures. Left out: heat transfer,
//! two-phase flow, gas mixtures other than air.

mod species;

pub use species::{MOLAR_GAS_CONSTANT, Species};
