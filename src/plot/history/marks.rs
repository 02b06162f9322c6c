//! The signs runs are drawn with, in the panel and in the legend alike.
//!
//! Comes in: a place in pixels and what the sign stands for. Goes out: paths. Pass: a full circle; no verdict: an
//! empty one; undecided: a diamond, half full; fail: a crossed square. A run whose E_n is over 1 has a ring.
//! What was cleaned or adjusted before the run stands as a small triangle on the axis of dates.

use super::seen::{Mark, Seen};
use crate::bench::Verdict;
use crate::report::number::value_and_u;

use super::super::ink::{BRICK, INK, PAPER, SAND};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};
use super::dates::date;
use super::words::en;

/// With this many runs or fewer the signs have their full size.
const FULL_SIZE_RUNS: f64 = 25.0;

/// All verdicts in the order they are drawn, so that the worst lies on top.
pub(super) const DRAWING_ORDER: [Verdict; 4] =
    [Verdict::None, Verdict::Pass, Verdict::Undecided, Verdict::Fail];

/// One sign to be drawn: its place, and what it says when pointed at.
pub(super) struct Sign {
    pub x: f64,
    pub y: f64,
    pub told: Option<String>,
}

/// Size of the signs, half their width in pixels: smaller where there are many.
pub(super) fn radius(seen: &Seen, body: f64) -> f64 {
    let crowd = (FULL_SIZE_RUNS / (seen.marks.len() as f64).max(1.0)).sqrt().min(1.0);
    body * (0.40 * crowd).max(0.16)
}

/// Radius of the ring round a sign.
pub(super) fn ring_radius(radius: f64, body: f64) -> f64 {
    (1.95 * radius).max(radius + 0.22 * body)
}

/// Width of bars and outlines, in pixels.
pub(super) fn hair(radius: f64) -> f64 {
    (0.21 * radius).clamp(0.5, 1.2)
}

/// Draws the signs of one verdict; pale ones let what lies under them be seen.
pub(super) fn draw(
    svg: &mut Svg,
    verdict: Verdict,
    signs: &[Sign],
    radius: f64,
    (transparent, pale): (bool, bool),
) {
    if signs.is_empty() {
        return;
    }
    let ground = if transparent { "none" } else { PAPER };
    let (class, fill, stroke) = match verdict {
        Verdict::Pass => ("plot-points plot-pass", INK, INK),
        Verdict::Fail => ("plot-points plot-fail", ground, BRICK),
        Verdict::Undecided => ("plot-points plot-undecided", ground, INK),
        Verdict::None => ("plot-points plot-no-verdict", ground, INK),
    };
    let width = coordinate(if verdict == Verdict::Fail { 1.5 } else { 1.0 } * hair(radius));
    let mut attributes =
        vec![("fill", fill), ("stroke", stroke), ("stroke-width", &width), ("stroke-linejoin", "round")];
    if pale && verdict == Verdict::Pass {
        attributes.extend([("fill-opacity", "0.5"), ("stroke-opacity", "0.5")]);
    }
    svg.group(class, &attributes);
    for sign in signs {
        let path = outline(verdict, sign.x, sign.y, radius);
        match &sign.told {
            Some(told) => svg.path_with_title(&path, told),
            None => svg.path(&path, &[]),
        }
        if verdict == Verdict::Undecided {
            let mut half = Path::default();
            let reach = 1.3 * radius;
            half.move_to(sign.x, sign.y - reach)
                .line_to(sign.x, sign.y + reach)
                .line_to(sign.x - reach, sign.y)
                .close();
            svg.path(&half, &[("fill", INK)]);
        }
    }
    svg.end();
}

fn outline(verdict: Verdict, x: f64, y: f64, r: f64) -> Path {
    let mut path = Path::default();
    match verdict {
        Verdict::Pass | Verdict::None => {
            path.circle(x, y, 0.95 * r);
        }
        Verdict::Undecided => {
            let reach = 1.3 * r;
            path.move_to(x, y - reach).line_to(x + reach, y).line_to(x, y + reach).line_to(x - reach, y);
            path.close();
        }
        Verdict::Fail => {
            let reach = 1.05 * r;
            let corner = |right: f64, down: f64| (x + right * reach, y + down * reach);
            let [a, b, c, d] = [corner(-1.0, -1.0), corner(1.0, -1.0), corner(1.0, 1.0), corner(-1.0, 1.0)];
            path.move_to(a.0, a.1).line_to(b.0, b.1).line_to(c.0, c.1).line_to(d.0, d.1).close();
            path.stroke(a, c).stroke(b, d);
        }
    }
    path
}

/// Rings round signs, for what changed since the run before.
pub(super) fn draw_rings(svg: &mut Svg, places: &[(f64, f64)], radius: f64, body: f64) {
    let width = coordinate((0.3 * radius).clamp(0.8, 1.5));
    svg.group("plot-changed", &[("fill", "none"), ("stroke", BRICK), ("stroke-width", &width)]);
    for (x, y) in places {
        let mut path = Path::default();
        path.circle(*x, *y, ring_radius(radius, body));
        svg.path(&path, &[]);
    }
    svg.end();
}

/// Triangles that stand on `y`, for what was cleaned or adjusted before the run.
pub(super) fn draw_flags(svg: &mut Svg, places: &[f64], y: f64, size: f64) {
    svg.group(
        "plot-as-left",
        &[("fill", SAND), ("stroke", INK), ("stroke-width", "0.8"), ("stroke-linejoin", "round")],
    );
    for x in places {
        let mut path = Path::default();
        path.move_to(*x, y - size).line_to(x + 0.55 * size, y).line_to(x - 0.55 * size, y).close();
        svg.path(&path, &[]);
    }
    svg.end();
}

/// A small arrow whose tip touches the edge of the panel at `(x, y)`, upward (−1) or downward (1), for what lies beyond.
pub(super) fn arrow((x, y): (f64, f64), outward: f64, size: f64) -> Path {
    let mut path = Path::default();
    let back = |along: f64| y - outward * along * size;
    path.stroke((x, back(1.5)), (x, back(0.15)));
    path.move_to(x - 0.5 * size, back(0.75)).line_to(x, back(0.15)).line_to(x + 0.5 * size, back(0.75));
    path
}

/// What a run says when it is pointed at.
pub(super) fn told(mark: &Mark, seen: &Seen) -> String {
    let (value, expanded) = value_and_u(mark.flow, mark.bar);
    let verdict = match mark.verdict {
        Verdict::Pass => "pass",
        Verdict::Fail => "fail",
        Verdict::Undecided => "undecided",
        Verdict::None => "no verdict",
    };
    let flow = if expanded.is_empty() { value } else { format!("{value} ± {expanded}") };
    let compared = mark.en.map_or(String::new(), |value| format!("; {} to the run before", en(value)));
    format!(
        "{}, {}, {}: {flow} {} STPD; {verdict}{compared}",
        mark.name,
        mark.purpose.name(),
        date(mark.day),
        seen.units.flow_symbol(),
    )
}
