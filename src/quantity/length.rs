//! Length, mass and volume.

/// A length, in metres inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Length(f64);

/// A mass, in kilograms inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Mass(f64);

/// A volume, in cubic metres inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Volume(f64);

impl Length {
    /// From metres.
    #[must_use]
    pub const fn from_m(m: f64) -> Self {
        Self(m)
    }

    /// From micrometres.
    #[must_use]
    pub fn from_um(um: f64) -> Self {
        Self(um / 1e6)
    }

    /// In metres.
    #[must_use]
    pub const fn as_m(self) -> f64 {
        self.0
    }

    /// In micrometres.
    #[must_use]
    pub fn as_um(self) -> f64 {
        self.0 * 1e6
    }
}

impl Mass {
    /// From kilograms.
    #[must_use]
    pub const fn from_kg(kg: f64) -> Self {
        Self(kg)
    }

    /// In kilograms.
    #[must_use]
    pub const fn as_kg(self) -> f64 {
        self.0
    }
}

impl Volume {
    /// From cubic metres.
    #[must_use]
    pub const fn from_m3(m3: f64) -> Self {
        Self(m3)
    }

    /// In cubic metres.
    #[must_use]
    pub const fn as_m3(self) -> f64 {
        self.0
    }

    /// From litres.
    #[must_use]
    pub fn from_l(l: f64) -> Self {
        Self(l / 1e3)
    }

    /// In litres.
    #[must_use]
    pub fn as_l(self) -> f64 {
        self.0 * 1e3
    }
}
