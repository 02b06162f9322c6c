//! What depth does to an injection.
//!
//! Comes in: a feed and an IP. Goes out: where the flow has lost one per cent, a tenth, everything; or, for a compensated
//! first stage, where it overtakes the uptake; and rows over depth. Not compensated: `p1` stays what it was where it was set,
//! `p2 = p_surface + ρ·g·d`, flow by the ellipse of ISO 6358-1: `ψ = 0.99` and `0.9` at the lower end of the 95 % interval of
//! the choke ratio, which is the shallower. Compensated: `p1` and `p2` rise together, and `p1 − p2` stays. Left out: how the
//! first stage's own delivery weakens with depth, and what the gauge is off by (half a bar is five metres of the last depth).

use super::injection::Feed;
use super::options::FirstStageKind;
use super::search::{BEYOND_SPAN, SPAN_TOLERANCE_BAR};
use crate::bench::choke::Origin;
use crate::gas::{self, Water};

/// Depth between two rows, m.
const ROW_M: f64 = 3.0;
/// Most rows; a deeper table has wider steps.
const MOST_ROWS: f64 = 60.0;
/// Depth to which a compensated first stage is looked at where the span allows it, m.
const DEEPEST_M: f64 = 350.0;
/// Halvings of a depth: to a millionth of a metre.
const HALVINGS: usize = 30;

/// A depth by metres and by pressure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DepthPoint {
    /// Depth where dived, m; zero when it is reached at the surface already.
    pub depth_m: f64,
    /// Ambient pressure, bar absolute.
    pub ambient_bar_abs: f64,
}

/// One depth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct DepthRow {
    /// Depth, m.
    pub depth_m: f64,
    /// Ambient pressure, bar absolute.
    pub ambient_bar_abs: f64,
    /// Best estimate of the injection, L/min STPD.
    pub injection_l_min: f64,
    /// At the lower end of the choke ratio, L/min STPD.
    pub lowest_l_min: f64,
    /// The chance that the richest injection exceeds the uptake.
    pub chance: f64,
    /// Whether the pressure at the orifice is beyond what the bench measured.
    pub beyond_span: bool,
}

/// What depth does.
#[derive(Debug, Clone, PartialEq)]
pub struct DepthLimits {
    /// Kind of first stage.
    pub first_stage: FirstStageKind,
    /// Water.
    pub water: Water,
    /// The choke ratio used for the first two depths: the lower end of its 95 % interval.
    pub choke_ratio_low: f64,
    /// How the choke ratio is known.
    pub choke_ratio_origin: Origin,
    /// Where one per cent is lost; none when nowhere.
    pub one_percent: Option<DepthPoint>,
    /// Where a tenth is lost; none when nowhere.
    pub nine_tenths: Option<DepthPoint>,
    /// Where the flow stops, and past which it can run back; none for a compensated first stage.
    pub stops: Option<DepthPoint>,
    /// Compensated: the depth from which the chance is over the limit; none when it is not before the rows end.
    pub overtakes_at_m: Option<f64>,
    /// Compensated: the depth at which the best estimates cross; none when they do not before the rows end.
    pub overtakes_at_best_estimate_m: Option<f64>,
    /// Compensated: the depth at which the pressure is [`BEYOND_SPAN`] beyond the bench span; nothing is known below.
    pub known_to_m: Option<f64>,
    /// Injection over depth.
    pub rows: Vec<DepthRow>,
}

impl DepthLimits {
    pub(super) fn of(feed: &Feed<'_>, ip_bar: f64, origin: Origin, span_high_bar: f64) -> Self {
        let used = feed.used;
        let low = feed.choke.interval_95.0;
        let point = |bar: f64| DepthPoint { depth_m: used.depth_of(bar).max(0.0), ambient_bar_abs: bar };
        let compensated = used.first_stage == FirstStageKind::Compensated;
        let where_left = |left: f64| {
            let ratio = ratio_where(left, low);
            let bar =
                if compensated { ratio * ip_bar / (1.0 - ratio) } else { ratio * feed.p1_bar(ip_bar, 0.0) };
            point(bar)
        };
        let known_to_m = compensated
            .then(|| used.depth_of((1.0 + BEYOND_SPAN) * span_high_bar - ip_bar).clamp(0.0, DEEPEST_M));
        let stops = (!compensated).then(|| point(feed.p1_bar(ip_bar, 0.0)));
        let end =
            known_to_m.or(stops.map(|s| s.depth_m.max(used.max_depth_m.unwrap_or(0.0)))).unwrap_or_default();
        let overtakes = |above: &dyn Fn(f64) -> bool| known_to_m.and_then(|end| first_depth(end, above));
        Self {
            first_stage: used.first_stage,
            water: used.water,
            choke_ratio_low: low,
            choke_ratio_origin: origin,
            one_percent: Some(where_left(0.99)),
            nine_tenths: Some(where_left(0.90)),
            stops,
            overtakes_at_m: overtakes(&|depth| feed.chance(ip_bar, depth) > used.chance),
            overtakes_at_best_estimate_m: overtakes(&|depth| {
                feed.injected(ip_bar, depth).nominal_l_min > feed.uptake.uptake_l_min
            }),
            known_to_m,
            rows: rows(feed, ip_bar, end, low, span_high_bar),
        }
    }
}

/// Share of the surface's flow left at a depth, at the lower end of the choke ratio; first stage not compensated.
pub(super) fn left_at(feed: &Feed<'_>, ip_bar: f64, depth_m: f64) -> f64 {
    let ratio = feed.used.ambient_at(depth_m) / feed.p1_bar(ip_bar, depth_m);
    gas::subsonic_factor(ratio, feed.choke.interval_95.0)
}

/// `p2/p1` at which the share `left` of the choked flow passes a hole of choke ratio `b`: the ellipse, solved.
fn ratio_where(left: f64, b: f64) -> f64 {
    b + (1.0 - b) * (1.0 - left * left).sqrt()
}

/// The shallowest depth down to `end` at which `above` holds; none when it does not at `end`.
fn first_depth(end: f64, above: &dyn Fn(f64) -> bool) -> Option<f64> {
    if !above(end) {
        return None;
    }
    if above(0.0) {
        return Some(0.0);
    }
    let (mut below, mut deep) = (0.0, end);
    for _ in 0..HALVINGS {
        let middle = 0.5 * (below + deep);
        if above(middle) {
            deep = middle;
        } else {
            below = middle;
        }
    }
    // The shallower end, so that the limit is not given too deep.
    Some(below)
}

fn rows(feed: &Feed<'_>, ip_bar: f64, end: f64, low_b: f64, span_high_bar: f64) -> Vec<DepthRow> {
    let steps = (end / ROW_M).ceil().clamp(1.0, MOST_ROWS);
    let step = (end / steps / ROW_M).ceil().max(1.0) * ROW_M;
    let mut depths: Vec<f64> = (0..).map(|i| f64::from(i) * step).take_while(|d| *d < end).collect();
    depths.push(end);
    depths
        .into_iter()
        .map(|depth_m| {
            let (p1, p2) = (feed.p1_bar(ip_bar, depth_m), feed.used.ambient_at(depth_m));
            let choked = feed.used.purity * feed.line.flow(p1, feed.used.nominal_k);
            DepthRow {
                depth_m,
                ambient_bar_abs: p2,
                injection_l_min: feed.injected(ip_bar, depth_m).nominal_l_min,
                lowest_l_min: choked * gas::subsonic_factor(p2 / p1, low_b),
                chance: feed.chance(ip_bar, depth_m),
                beyond_span: p1 > span_high_bar + SPAN_TOLERANCE_BAR,
            }
        })
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::setting::options::{SettingOptions, Used};

    #[test]
    fn depths_are_those_worked_by_hand() {
        // 10 bar gauge set at 1.01325 bar: p1 = 11.01325 bar; b = 0.528.
        // Choked to p2 = 0.528 · 11.01325 = 5.8150 bar: 4.80175 bar over the surface; sea water has
        // 1025 · 9.80665 = 10 051.8 Pa/m: 47.77 m; fresh water 9806.65 Pa/m: 48.96 m.
        // A tenth lost: 0.528 + 0.472 · sqrt(1 − 0.81) = 0.733 74, 8.0809 bar: 70.31 m. Stops at p2 = p1: 99.48 m
        // (that flow stops where ambient equals supply is common practice, no source).
        let p1 = 11.013_25;
        let depth = |water, ratio: f64| {
            let options = SettingOptions { water: Some(water), ..Default::default() };
            Used::of(&options).unwrap().depth_of(ratio * p1)
        };
        for (what, got, want) in [
            ("choked, sea", depth(Water::Sea, ratio_where(1.0, 0.528)), 47.8),
            ("choked, fresh", depth(Water::Fresh, ratio_where(1.0, 0.528)), 49.0),
            ("a tenth lost, sea", depth(Water::Sea, ratio_where(0.9, 0.528)), 70.3),
            ("stops, sea", depth(Water::Sea, ratio_where(0.0, 0.528)), 99.5),
        ] {
            let difference = (got - want).abs();
            assert!(
                difference <= 0.05,
                "{what}: got {got}, want {want}, difference {difference}, tolerance 0.05"
            );
        }
    }

    #[test]
    fn the_ellipse_is_solved_as_it_is_used() {
        for b in [0.08, 0.3, 0.528] {
            for left in [0.99, 0.9, 0.5, 0.1] {
                assert!((gas::subsonic_factor(ratio_where(left, b), b) - left).abs() < 1e-12);
            }
        }
    }

    #[test]
    fn the_first_depth_is_given_from_the_shallow_side() {
        let found = first_depth(60.0, &|d| d > 21.3).unwrap();
        assert!((21.299_99..=21.3).contains(&found), "{found}");
        assert_eq!(first_depth(60.0, &|d| d > 60.0), None);
        assert_eq!(first_depth(60.0, &|_| true), Some(0.0));
    }
}
