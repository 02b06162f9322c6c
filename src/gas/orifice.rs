//! Flow through a hole: choked, subsonic, from one gas to another.
//!
//! Equations: ISO 9300 (choked mass flow), ISO 6358-1 (sonic conductance `C`, choke ratio `b`, the ellipse between
//! `b` and 1). Left out: the cracking pressure and the free exponent of the 2013 edition of ISO 6358.

use super::{MOLAR_GAS_CONSTANT, Species, critical_flow_function};
use crate::quantity::{
    AbsolutePressure, Length, ReferenceConditions, STANDARD_ATMOSPHERE_PA, StpdFlow, Temperature,
    ZERO_CELSIUS_K,
};

/// Reference state of ISO 6358 and ISO 8778 (ANR): 20 °C, 100 kPa. Its 65 % relative humidity enters only through
/// the printed density 1.185 kg/m³, not through this.
pub const ANR: ReferenceConditions = ReferenceConditions {
    temperature: Temperature::from_k(293.15),
    pressure: AbsolutePressure::from_pa(1e5),
};

/// Litres STPD in one litre ANR, ideal gas: `(100 / 101.325) · (273.15 / 293.15)`.
pub const STPD_PER_ANR: f64 = (1e5 / STANDARD_ATMOSPHERE_PA) * (ZERO_CELSIUS_K / 293.15);

/// Share of the choked flow that still passes at the pressure ratio `ratio = p2/p1`, for a hole of choke ratio `b`.
///
/// ISO 6358-1: 1 up to `b`, `sqrt(1 − ((ratio − b)/(1 − b))²)` above, 0 from `p2 = p1` on.
#[must_use]
pub fn subsonic_factor(ratio: f64, b: f64) -> f64 {
    if ratio <= b {
        return 1.0;
    }
    let x = (ratio - b) / (1.0 - b);
    (1.0 - x * x).max(0.0).sqrt()
}

/// Choked mass flow in kg/s through `area` (m², already times its discharge coefficient) of a gas at stagnation
/// pressure `p1` and temperature `t1`.
#[must_use]
pub fn choked_mass_flow(species: Species, area: f64, p1: AbsolutePressure, t1: Temperature) -> f64 {
    let c_star = critical_flow_function(species, p1, t1);
    c_star * area * p1.as_pa() * (species.molar_mass() / (MOLAR_GAS_CONSTANT * t1.as_k())).sqrt()
}

/// Mass in kg of one cubic metre STPD, ideal gas: a litre STPD is an amount of substance (the real density of
/// oxygen at 0 °C and 101.325 kPa is 0.1 % more).
#[must_use]
pub fn stpd_density(species: Species) -> f64 {
    STANDARD_ATMOSPHERE_PA * species.molar_mass() / (MOLAR_GAS_CONSTANT * ZERO_CELSIUS_K)
}

/// Diameter of the round hole that would pass `flow` of a gas at `p1` and `t1` with a discharge coefficient of 1.
///
/// "Effective": a blockage, and the real discharge coefficient, show as a smaller number.
#[must_use]
pub fn effective_diameter(species: Species, flow: StpdFlow, p1: AbsolutePressure, t1: Temperature) -> Length {
    let mass_flow = flow.as_l_min() * 1e-3 / 60.0 * stpd_density(species);
    let per_area = choked_mass_flow(species, 1.0, p1, t1);
    Length::from_m((4.0 * mass_flow / per_area / std::f64::consts::PI).sqrt())
}

/// Sonic conductance of ISO 6358 in dm³/(s·bar) ANR from the slope of a line in L/min STPD per bar, for gas at 20 °C.
#[must_use]
pub fn sonic_conductance(slope_l_min_bar: f64) -> f64 {
    slope_l_min_bar / 60.0 / STPD_PER_ANR
}

/// Reynolds number of the jet in a hole of `diameter`: `4·q_m / (π·d·µ)`.
#[must_use]
pub fn reynolds_number(species: Species, flow: StpdFlow, diameter: Length) -> f64 {
    let mass_flow = flow.as_l_min() * 1e-3 / 60.0 * stpd_density(species);
    4.0 * mass_flow / (std::f64::consts::PI * diameter.as_m() * species.viscosity())
}

/// Standard-volume flow of `to` over that of `from` through the same choked hole from the same upstream state:
/// `C*/sqrt(M)` of one over the other; oxygen over air is about 0.951.
#[must_use]
pub fn flow_ratio_between(from: Species, to: Species, p1: AbsolutePressure, t1: Temperature) -> f64 {
    let of = |gas: Species| critical_flow_function(gas, p1, t1) / gas.molar_mass().sqrt();
    of(to) / of(from)
}
