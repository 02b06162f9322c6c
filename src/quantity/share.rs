//! A share of a whole: what stands before a per cent sign.

/// A ratio of two like quantities (a gain error, a purity, a relative humidity); 0.01 is one per cent.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Share(f64);

impl Share {
    /// From the ratio; 0.01 is one per cent.
    #[must_use]
    pub const fn from_ratio(ratio: f64) -> Self {
        Self(ratio)
    }

    /// From per cent.
    #[must_use]
    pub fn from_percent(percent: f64) -> Self {
        Self(percent / 100.0)
    }

    /// As the ratio; 0.01 is one per cent.
    #[must_use]
    pub const fn as_ratio(self) -> f64 {
        self.0
    }

    /// In per cent.
    #[must_use]
    pub fn as_percent(self) -> f64 {
        self.0 * 100.0
    }
}
