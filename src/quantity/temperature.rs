//! Temperatures and their differences, in kelvins inside.

/// The zero of the Celsius scale in kelvins, exact (SI Brochure, 9th edition, 2.3.1).
pub const ZERO_CELSIUS_K: f64 = 273.15;

/// A thermodynamic temperature, in kelvins inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Temperature(f64);

/// A difference of two temperatures (an uncertainty, a rise), in kelvins inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct TemperatureDifference(f64);

impl Temperature {
    /// From kelvins.
    #[must_use]
    pub const fn from_k(k: f64) -> Self {
        Self(k)
    }

    /// From degrees Celsius.
    #[must_use]
    pub const fn from_c(c: f64) -> Self {
        Self(c + ZERO_CELSIUS_K)
    }

    /// In kelvins.
    #[must_use]
    pub const fn as_k(self) -> f64 {
        self.0
    }

    /// In degrees Celsius.
    #[must_use]
    pub const fn as_c(self) -> f64 {
        self.0 - ZERO_CELSIUS_K
    }
}

impl TemperatureDifference {
    /// From kelvins, which are also degrees Celsius here.
    #[must_use]
    pub const fn from_k(k: f64) -> Self {
        Self(k)
    }

    /// In kelvins.
    #[must_use]
    pub const fn as_k(self) -> f64 {
        self.0
    }
}
