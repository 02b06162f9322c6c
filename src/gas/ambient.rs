//! Ambient pressure at altitude and at depth.

use crate::quantity::{AbsolutePressure, Length};

/// Standard acceleration of gravity in m/s², exact (3rd CGPM, 1901).
pub const STANDARD_GRAVITY: f64 = 9.806_65;

/// What one dives in; its density is a convention, not a measurement.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Water {
    /// Sea water, 1025 kg/m³.
    Sea,
    /// Fresh water, 1000 kg/m³.
    Fresh,
}

impl Water {
    /// Density in kg/m³ (common practice, no source; oceanographic formulae give 1018-1028 for sea water of 35 g/kg
    /// and 992-1000 for fresh water between 0 and 40 °C).
    #[must_use]
    pub const fn density(self) -> f64 {
        match self {
            Self::Sea => 1025.0,
            Self::Fresh => 1000.0,
        }
    }
}

/// Pressure of the standard atmosphere at geopotential altitude `altitude`, up to 11 km (ISO 2533:1975).
#[must_use]
pub fn at_altitude(altitude: Length) -> AbsolutePressure {
    // Sea-level temperature in K, lapse rate in K/m and specific gas constant of air in J/(kg·K) of ISO 2533.
    const T0: f64 = 288.15;
    const LAPSE: f64 = 0.0065;
    const R_AIR: f64 = 287.052_87;
    let ratio = 1.0 - LAPSE * altitude.as_m() / T0;
    let exponent = STANDARD_GRAVITY / (R_AIR * LAPSE);
    AbsolutePressure::from_pa(AbsolutePressure::STANDARD_ATMOSPHERE.as_pa() * libm::pow(ratio, exponent))
}

/// Pressure at `depth` under a surface at `surface`: `p_surface + ρ·g·d`.
#[must_use]
pub fn at_depth(surface: AbsolutePressure, depth: Length, water: Water) -> AbsolutePressure {
    AbsolutePressure::from_pa(surface.as_pa() + water.density() * STANDARD_GRAVITY * depth.as_m())
}

/// Depth at which the pressure under a surface at `surface` is `pressure`; negative above the surface.
#[must_use]
pub fn depth_of(surface: AbsolutePressure, pressure: AbsolutePressure, water: Water) -> Length {
    Length::from_m((pressure.as_pa() - surface.as_pa()) / (water.density() * STANDARD_GRAVITY))
}
