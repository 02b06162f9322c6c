//! The effective diameter that would fit.
//!
//! Comes in: an orifice that was tried, and the range of the first stage. Goes out: the diameters with which the largest
//! allowed injection falls in the middle, at the top and at the bottom of the range. Flow goes with the square of the
//! diameter; the hole that would fit is taken to be known as well as the one that was tried.

use super::injection::Feed;
use super::options::LARGEST_SHORTFALL;

/// Halvings of a factor between 0 and 64: to a part in 10⁹.
const HALVINGS: usize = 40;
/// Holes that pass this many times as much are not looked for.
const LARGEST_SCALE: f64 = 64.0;

/// Effective diameters that would fit, µm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FittingDiameter {
    /// The IP at which `um` is set, bar gauge: the middle of the range, or its top where only a smaller hole at a higher IP
    /// is known well enough.
    pub ip_bar_gauge: f64,
    /// The diameter whose setting lies there.
    pub um: f64,
    /// The diameter whose setting lies at the top of the range: the smallest that fits.
    pub smallest_um: f64,
    /// The diameter whose setting lies at the bottom of the range, where that one fits, else `um`.
    pub largest_um: f64,
}

impl FittingDiameter {
    /// For a range in bar gauge; none when even the right hole would be too lean.
    pub(super) fn of(feed: &Feed<'_>, diameter_um: f64, (low, high): (f64, f64)) -> Option<Self> {
        let at = |ip| Some(diameter_um * scale_for(feed, ip)?.sqrt());
        let smallest_um = at(high)?;
        let middle = 0.5 * (low + high);
        let (ip_bar_gauge, um) = at(middle).map_or((high, smallest_um), |um| (middle, um));
        Some(Self { ip_bar_gauge, um, smallest_um, largest_um: at(low).unwrap_or(um) })
    }
}

/// How many times as much the hole must pass so that `ip_bar` is its setting.
fn scale_for(feed: &Feed<'_>, ip_bar: f64) -> Option<f64> {
    let (mut good, mut bad) = (0.0, LARGEST_SCALE);
    for _ in 0..HALVINGS {
        let middle = 0.5 * (good + bad);
        if allowed(&feed.scaled(middle), ip_bar) {
            good = middle;
        } else {
            bad = middle;
        }
    }
    let lean = good > 0.0 && shortfall_of_leanest(&feed.scaled(good), ip_bar) <= LARGEST_SHORTFALL;
    lean.then_some(good)
}

/// Whether an IP keeps the chance and the least shortfall.
pub(super) fn allowed(feed: &Feed<'_>, ip_bar: f64) -> bool {
    let held = feed.used.held_at_m();
    let most = (1.0 - feed.used.shortfall) * feed.uptake.uptake_l_min;
    feed.injected(ip_bar, held).richest_l_min <= most && feed.chance(ip_bar, held) <= feed.used.chance
}

/// Shortfall of the leanest injection where the chance is held, as a share of the uptake.
pub(super) fn shortfall_of_leanest(feed: &Feed<'_>, ip_bar: f64) -> f64 {
    1.0 - feed.injected(ip_bar, feed.used.held_at_m()).leanest_l_min / feed.uptake.uptake_l_min
}
