//! How fast a pressure changes.

/// A change of pressure with time (a leak with the outlet blanked), in pascals per second inside; positive as the
/// key that holds it says, for a leak a fall.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct PressureRate(f64);

impl PressureRate {
    /// From pascals per second.
    #[must_use]
    pub const fn from_pa_s(pa_s: f64) -> Self {
        Self(pa_s)
    }

    /// In pascals per second.
    #[must_use]
    pub const fn as_pa_s(self) -> f64 {
        self.0
    }

    /// In bar per minute.
    #[must_use]
    pub fn as_bar_min(self) -> f64 {
        self.0 * 60.0 / 1e5
    }
}
