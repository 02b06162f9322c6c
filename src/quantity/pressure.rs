//! Gauge and absolute pressure, kept apart by type, and pressure differences.
//!
//! The only ways from one to the other are [`GaugePressure::above`] and [`AbsolutePressure::gauge_over`], and both
//! name the ambient pressure.

/// Standard atmosphere in pascals, exact (10th CGPM, 1954, Resolution 4).
pub const STANDARD_ATMOSPHERE_PA: f64 = 101_325.0;

/// A pressure over vacuum, in pascals inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct AbsolutePressure(f64);

/// A pressure over the ambient pressure, in pascals inside; never below a full vacuum when it came from text.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct GaugePressure(f64);

/// A difference of two pressures (a zero error, a back pressure, an uncertainty), in pascals inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct PressureDifference(f64);

impl AbsolutePressure {
    /// The standard atmosphere, 101.325 kPa.
    pub const STANDARD_ATMOSPHERE: Self = Self(STANDARD_ATMOSPHERE_PA);

    /// From pascals.
    #[must_use]
    pub const fn from_pa(pa: f64) -> Self {
        Self(pa)
    }

    /// From bar (100 kPa).
    #[must_use]
    pub fn from_bar(bar: f64) -> Self {
        Self(bar * 1e5)
    }

    /// In pascals.
    #[must_use]
    pub const fn as_pa(self) -> f64 {
        self.0
    }

    /// In bar (100 kPa).
    #[must_use]
    pub fn as_bar(self) -> f64 {
        self.0 / 1e5
    }

    /// What a gauge shows that stands in `ambient`.
    #[must_use]
    pub fn gauge_over(self, ambient: Self) -> GaugePressure {
        GaugePressure(self.0 - ambient.0)
    }

    /// This pressure raised by a difference.
    #[must_use]
    pub fn plus(self, difference: PressureDifference) -> Self {
        Self(self.0 + difference.0)
    }
}

impl GaugePressure {
    /// From pascals over ambient.
    #[must_use]
    pub const fn from_pa(pa: f64) -> Self {
        Self(pa)
    }

    /// From bar (100 kPa) over ambient.
    #[must_use]
    pub fn from_bar(bar: f64) -> Self {
        Self(bar * 1e5)
    }

    /// In pascals over ambient.
    #[must_use]
    pub const fn as_pa(self) -> f64 {
        self.0
    }

    /// In bar (100 kPa) over ambient.
    #[must_use]
    pub fn as_bar(self) -> f64 {
        self.0 / 1e5
    }

    /// The absolute pressure of a gauge reading taken in `ambient`.
    #[must_use]
    pub fn above(self, ambient: AbsolutePressure) -> AbsolutePressure {
        AbsolutePressure(self.0 + ambient.0)
    }
}

impl PressureDifference {
    /// No difference.
    pub const ZERO: Self = Self(0.0);

    /// From pascals.
    #[must_use]
    pub const fn from_pa(pa: f64) -> Self {
        Self(pa)
    }

    /// From bar (100 kPa).
    #[must_use]
    pub fn from_bar(bar: f64) -> Self {
        Self(bar * 1e5)
    }

    /// In pascals.
    #[must_use]
    pub const fn as_pa(self) -> f64 {
        self.0
    }

    /// In bar (100 kPa).
    #[must_use]
    pub fn as_bar(self) -> f64 {
        self.0 / 1e5
    }
}
