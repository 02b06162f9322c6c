//! The gases a bench sees, with the constants the laws need.

/// Molar gas constant in J/(mol·K), exact (SI Brochure, 9th edition; CODATA 2018).
pub const MOLAR_GAS_CONSTANT: f64 = 8.314_462_618_153_24;

/// A gas that can stand upstream of the orifice.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Species {
    /// Oxygen; its purity is kept beside it.
    Oxygen,
    /// Dry air.
    Air,
    /// Nitrogen.
    Nitrogen,
    /// Helium.
    Helium,
}

impl Species {
    /// Every species, in the order they are listed to a reader.
    pub const ALL: [Self; 4] = [Self::Oxygen, Self::Air, Self::Nitrogen, Self::Helium];

    /// The word for it in files and on paper.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Oxygen => "oxygen",
            Self::Air => "air",
            Self::Nitrogen => "nitrogen",
            Self::Helium => "helium",
        }
    }

    /// Molar mass in kg/mol. Oxygen, nitrogen, helium: CIAAW values as used by the equations of state cited in
    /// `critical_flow`; dry air: CIPM-2007, 400 ppm carbon dioxide.
    #[must_use]
    pub const fn molar_mass(self) -> f64 {
        match self {
            Self::Oxygen => 0.031_998_8,
            Self::Air => 0.028_965_46,
            Self::Nitrogen => 0.028_013_48,
            Self::Helium => 0.004_002_602,
        }
    }

    /// Dynamic viscosity in Pa·s at 20 °C and 1 bar (CoolProp 8.0 transport correlations, `viscosity0` of the
    /// critical-flow table in `fixtures/reference/gas`).
    ///
    /// Used where a few per cent do not matter (Reynolds number, the viscous law of a float meter); it grows by
    /// about 0.25 % per kelvin, which is left out.
    #[must_use]
    pub const fn viscosity(self) -> f64 {
        match self {
            Self::Oxygen => 2.027_238e-5,
            Self::Air => 1.820_548e-5,
            Self::Nitrogen => 1.757_276e-5,
            Self::Helium => 1.961_753e-5,
        }
    }
}
