//! How a certificate rounds: the uncertainty first, the result to the same place, and only when it is printed.
//!
//! At most two significant figures of U, rounded up where the nearest figure would be more than 5 % too small
//! (ILAC-P14:09/2020, 5.3; EA-4/02 M:2022, 6.3). The rounding itself is that of every sheet and stands in
//! [`report::number`](crate::report::number); here it becomes places and texts.

use crate::report::number::{fixed, rounded_uncertainty};

/// Decimals that a result with the expanded uncertainty `expanded` is printed with; fewer than none before the point. None
/// without an uncertainty above nought.
#[must_use]
pub fn decimals(expanded: f64) -> Option<i32> {
    known(expanded).map(|u| rounded_uncertainty(u).1)
}

/// An expanded uncertainty as printed; none without one above nought.
#[must_use]
pub fn expanded(expanded: f64) -> Option<String> {
    known(expanded).map(|u| {
        let (rounded, decimals) = rounded_uncertainty(u);
        fixed(rounded, decimals)
    })
}

/// A result as printed, to so many decimals.
#[must_use]
pub fn value(value: f64, decimals: i32) -> String {
    fixed(value, decimals)
}

fn known(expanded: f64) -> Option<f64> {
    Some(expanded).filter(|u| u.is_finite() && *u > 0.0)
}
