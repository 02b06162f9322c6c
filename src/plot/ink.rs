//! The colours of everything drawn: the paper and inks of the page.

/// Warm paper.
pub(super) const PAPER: &str = "#FAF8F3";
/// Ink: text, axes, points.
pub(super) const INK: &str = "#1D2A33";
/// Sea-glass: the line itself.
pub(super) const SEA_GLASS: &str = "#0B6E7A";
/// Sand: bands and fills.
pub(super) const SAND: &str = "#D8C9A3";
/// Brick: only what is dangerous.
pub(super) const BRICK: &str = "#B4442C";
