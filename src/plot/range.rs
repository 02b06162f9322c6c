//! Ranges of an axis: what can stand on it, and how far it reaches.

/// An axis begins at nought when its lowest number is under this share of its highest.
const FROM_NOUGHT: f64 = 0.3;

/// Whether a number can stand on an axis: finite, and not so large that differences drown.
pub(super) fn drawable(x: f64) -> bool {
    x.is_finite() && x.abs() < 1e12
}

/// Lowest and highest of values with bars.
pub(super) fn hull(values: impl Iterator<Item = (f64, f64)>) -> Option<(f64, f64)> {
    values.fold(None, |hull, (x, bar)| match hull {
        None => Some((x - bar, x + bar)),
        Some((low, high)) => Some((f64::min(low, x - bar), f64::max(high, x + bar))),
    })
}

/// A range widened to values that lie no further than `reach` spans beyond it.
pub(super) fn reaching(range: (f64, f64), values: impl Iterator<Item = f64>, reach: f64) -> (f64, f64) {
    let span = (range.1 - range.0).max(0.05 * range.1.abs());
    let near = (range.0 - reach * span, range.1 + reach * span);
    values.filter(|v| (near.0..=near.1).contains(v)).fold(range, |(low, high), v| (low.min(v), high.max(v)))
}

/// A range with room around it (`padding` is its share of the range), from nought when it nearly begins there, and never without width.
pub(super) fn framed((low, high): (f64, f64), padding: f64) -> (f64, f64) {
    let least = (1e-3 * low.abs().max(high.abs())).max(1e-9);
    let (low, high) = if high - low < least { (low - least, high + least) } else { (low, high) };
    let from_nought = low >= 0.0 && low < FROM_NOUGHT * high;
    let low = if from_nought { 0.0 } else { low };
    let room = padding * (high - low);
    (if from_nought { 0.0 } else { low - room }, high + room)
}
