//! Partial pressures of oxygen as handsets show them.

/// The partial pressure of a gas as it was shown, in bar inside.
///
/// What an instrument shows may be below zero; a reading that was shown in bar stays as it is to the last bit.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct PartialPressure(f64);

impl PartialPressure {
    /// From bar (100 kPa).
    #[must_use]
    pub const fn from_bar(bar: f64) -> Self {
        Self(bar)
    }

    /// In bar (100 kPa).
    #[must_use]
    pub const fn as_bar(self) -> f64 {
        self.0
    }

    /// From pascals.
    #[must_use]
    pub fn from_pa(pa: f64) -> Self {
        Self(pa / 1e5)
    }

    /// In pascals.
    #[must_use]
    pub fn as_pa(self) -> f64 {
        self.0 * 1e5
    }
}
