//! Spans of time.

/// A span of time, in seconds inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct Span(f64);

impl Span {
    /// From seconds.
    #[must_use]
    pub const fn from_s(s: f64) -> Self {
        Self(s)
    }

    /// In seconds.
    #[must_use]
    pub const fn as_s(self) -> f64 {
        self.0
    }

    /// In minutes.
    #[must_use]
    pub fn as_min(self) -> f64 {
        self.0 / 60.0
    }
}
