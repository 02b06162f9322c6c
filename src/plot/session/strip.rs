//! The strip below: the injection as a step line, and the depth as a dotted one where it was read.
//!
//! Comes in: what is drawn and where. Goes out: strokes inside the strip's frame. Where the injection is not known
//! there is no line.

use super::layout::Layout;
use super::seen::Seen;
use super::trace::{Thinning, strokes};

use super::super::ink::{INK, SEA_GLASS};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// Steps that end and begin within so many seconds are joined.
const JOINED_S: f64 = 1e-6;

/// Draws the strip, if there is one.
pub(super) fn draw(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    let Some(strip) = layout.strip else { return };
    let body = layout.body;
    let mut path = Path::default();
    let mut last_s = f64::NEG_INFINITY;
    for step in seen.steps.iter().filter(|s| layout.flow.shows(s.l_min)) {
        let y = layout.flow.at(step.l_min);
        let (from, to) = (layout.x.clamped(step.from_s), layout.x.clamped(step.to_s));
        if step.from_s - last_s <= JOINED_S {
            path.line_to(from, y);
        } else {
            path.move_to(from, y);
        }
        path.line_to(to, y);
        last_s = step.to_s;
    }
    let width = coordinate(0.2 * body);
    let attributes = [("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", width.as_str())];
    svg.group("plot-injection", &attributes);
    svg.path(&path, &[]);
    svg.end();
    let Some(depth) = seen.depth else { return };
    let thinning = Thinning {
        left: strip.left,
        width: strip.width(),
        longest: layout.x.at(seen.times.0 + seen.gap_s) - strip.left,
    };
    let places = seen.rows().filter(|row| layout.x.shows(seen.time_s[*row])).map(|row| {
        let m = depth.get(row).copied().unwrap_or(f64::NAN);
        let y = if layout.depth.shows(m) { layout.depth.at(m) } else { f64::NAN };
        (layout.x.at(seen.time_s[row]), y)
    });
    let mut path = Path::default();
    for stroke in strokes(places, &thinning) {
        for (i, (x, y)) in stroke.iter().enumerate() {
            if i == 0 {
                path.move_to(*x, *y);
            } else {
                path.line_to(*x, *y);
            }
        }
    }
    let (width, dashes) =
        (coordinate(0.12 * body), format!("{} {}", coordinate(0.12 * body), coordinate(0.3 * body)));
    let attributes = [
        ("fill", "none"),
        ("stroke", INK),
        ("stroke-width", width.as_str()),
        ("stroke-dasharray", dashes.as_str()),
        ("stroke-linecap", "round"),
    ];
    svg.group("plot-depth", &attributes);
    svg.path(&path, &[]);
    svg.end();
}
