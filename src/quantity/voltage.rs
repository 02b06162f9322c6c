//! Voltages of oxygen cells.

/// A voltage, in volts inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Voltage(f64);

impl Voltage {
    /// From volts.
    #[must_use]
    pub const fn from_v(v: f64) -> Self {
        Self(v)
    }

    /// In volts.
    #[must_use]
    pub const fn as_v(self) -> f64 {
        self.0
    }
}
