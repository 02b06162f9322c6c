//! Signs of a setting, in the panels and in the legend alike.
//!
//! Comes in: places in pixels. Goes out: SVG. Every line has a dash of its own and every mark an outline of its own.

use super::seen::Marked;

use super::super::frame::{Frame, Hatch, hatched};
use super::super::ink::{BRICK, INK, PAPER, SAND, SEA_GLASS};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// What the legend can explain.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Sign {
    Band,
    Best,
    BestBeyond,
    Lowest,
    Mark(Marked),
    MaxDepth,
    NoFlow,
    Edges,
    /// The line of an orifice that is not the shown one.
    Other(usize),
    Chosen,
    Judged,
    Never,
    Division,
}

/// What a stroke is of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Stroke {
    Best,
    BestBeyond,
    Lowest,
    Edge,
    Other(usize),
    BandMiddle,
    BandEdge,
    MaxDepth,
    Never,
    Drop,
}

/// Draws a path as what it is.
pub(super) fn draw_stroke(svg: &mut Svg, stroke: Stroke, path: &Path, body: f64) {
    let (class, colour, width, dashes): (&'static str, &str, f64, &[f64]) = match stroke {
        Stroke::Best => ("plot-best", SEA_GLASS, 0.2, &[]),
        Stroke::BestBeyond => ("plot-best-beyond", SEA_GLASS, 0.2, &[0.5, 0.35]),
        Stroke::Lowest => ("plot-lowest", INK, 0.11, &[0.7, 0.25]),
        Stroke::Edge => ("plot-edge", INK, 0.07, &[0.3, 0.25]),
        Stroke::Other(index) => {
            let dashes: &[f64] = match index % 4 {
                0 => &[1.1, 0.3],
                1 => &[0.25, 0.25],
                2 => &[1.0, 0.25, 0.2, 0.25],
                _ => &[0.6, 0.2, 0.15, 0.2, 0.15, 0.2],
            };
            ("plot-other", INK, 0.13, dashes)
        }
        Stroke::BandMiddle => ("plot-band-middle", INK, 0.1, &[1.0, 0.3, 0.15, 0.3]),
        Stroke::BandEdge => ("plot-band-edge", INK, 0.06, &[]),
        Stroke::MaxDepth => ("plot-max-depth", INK, 0.12, &[1.4, 0.5]),
        Stroke::Never => ("plot-never", BRICK, 0.16, &[0.7, 0.25, 0.16, 0.25]),
        Stroke::Drop => ("plot-drop", INK, 0.08, &[0.1, 0.3]),
    };
    let width = coordinate(width * body);
    let dash = dashes.iter().map(|d| coordinate(d * body)).collect::<Vec<_>>().join(" ");
    let mut attributes = vec![("fill", "none"), ("stroke", colour), ("stroke-width", width.as_str())];
    if !dashes.is_empty() {
        attributes.push(("stroke-dasharray", dash.as_str()));
    }
    svg.group(class, &attributes);
    svg.path(path, &[]);
    svg.end();
}

/// The band of another day's uptake.
pub(super) fn draw_band(svg: &mut Svg, frame: &Frame, middle: f64, body: f64) {
    let attributes = [("fill", "none"), ("stroke", INK), ("stroke-opacity", "0.45"), ("stroke-width", "0.7")];
    svg.group("plot-band", &attributes);
    svg.path(&hatched(frame, Hatch::Rising, 0.75 * body), &[]);
    svg.end();
    let mut edges = Path::default();
    edges.stroke((frame.left, frame.top), (frame.right, frame.top));
    edges.stroke((frame.left, frame.bottom), (frame.right, frame.bottom));
    draw_stroke(svg, Stroke::BandEdge, &edges, body);
    let mut path = Path::default();
    path.stroke((frame.left, middle), (frame.right, middle));
    draw_stroke(svg, Stroke::BandMiddle, &path, body);
}

/// Where nothing flows any more.
pub(super) fn draw_no_flow(svg: &mut Svg, frame: &Frame, body: f64) {
    let attributes =
        [("fill", "none"), ("stroke", BRICK), ("stroke-opacity", "0.6"), ("stroke-width", "0.8")];
    svg.group("plot-no-flow", &attributes);
    svg.path(&hatched(frame, Hatch::Crossed, 0.8 * body), &[]);
    svg.end();
}

/// Between the richest and the leanest injection.
pub(super) fn draw_between(svg: &mut Svg, path: &Path) {
    svg.group("plot-between", &[("fill", SAND), ("fill-opacity", "0.8"), ("stroke", "none")]);
    svg.path(path, &[]);
    svg.end();
}

/// The mark of a depth.
pub(super) fn draw_mark(svg: &mut Svg, marked: Marked, (x, y): (f64, f64), body: f64, transparent: bool) {
    let r = 0.42 * body;
    let mut path = Path::default();
    let empty = if transparent { "none" } else { PAPER };
    let (fill, stroke) = match marked {
        Marked::OnePercent => {
            path.circle(x, y, r);
            (empty, INK)
        }
        Marked::Tenth => {
            path.move_to(x, y + 1.15 * r).line_to(x + 1.1 * r, y - 0.8 * r).line_to(x - 1.1 * r, y - 0.8 * r);
            path.close();
            (INK, INK)
        }
        Marked::Stops => {
            square(&mut path, (x, y), 0.9 * r);
            (BRICK, INK)
        }
        Marked::Chance => {
            path.move_to(x, y - 1.25 * r)
                .line_to(x + 1.25 * r, y)
                .line_to(x, y + 1.25 * r)
                .line_to(x - 1.25 * r, y);
            path.close();
            (BRICK, INK)
        }
        Marked::Crosses => {
            path.stroke((x - r, y - r), (x + r, y + r)).stroke((x - r, y + r), (x + r, y - r));
            ("none", BRICK)
        }
    };
    let width = coordinate(if marked == Marked::Crosses { 0.2 } else { 0.12 } * body);
    let attributes =
        [("fill", fill), ("stroke", stroke), ("stroke-width", width.as_str()), ("stroke-linejoin", "round")];
    svg.group("plot-mark", &attributes);
    svg.path(&path, &[]);
    svg.end();
}

/// The mark of the IP that is set: a ring about a full circle.
pub(super) fn draw_chosen(svg: &mut Svg, (x, y): (f64, f64), body: f64, transparent: bool) {
    let empty = if transparent { "none" } else { PAPER };
    let width = coordinate(0.13 * body);
    svg.group("plot-chosen", &[("fill", empty), ("stroke", INK), ("stroke-width", &width)]);
    let (mut ring, mut full) = (Path::default(), Path::default());
    ring.circle(x, y, 0.6 * body);
    full.circle(x, y, 0.3 * body);
    svg.path(&ring, &[]);
    svg.path(&full, &[("fill", INK)]);
    svg.end();
}

/// The mark of the IP that was judged: an empty square.
pub(super) fn draw_judged(svg: &mut Svg, (x, y): (f64, f64), body: f64, transparent: bool) {
    let empty = if transparent { "none" } else { PAPER };
    let width = coordinate(0.15 * body);
    svg.group("plot-judged", &[("fill", empty), ("stroke", INK), ("stroke-width", &width)]);
    let mut path = Path::default();
    square(&mut path, (x, y), 0.42 * body);
    svg.path(&path, &[]);
    svg.end();
}

fn square(path: &mut Path, (x, y): (f64, f64), r: f64) {
    path.move_to(x - r, y - r).line_to(x + r, y - r).line_to(x + r, y + r).line_to(x - r, y + r);
    path.close();
}

/// A sign of the legend centred at a place.
pub(super) fn draw(svg: &mut Svg, sign: Sign, (x, y): (f64, f64), body: f64, transparent: bool) {
    let half = 0.95 * body;
    let frame = Frame { left: x - half, top: y - 0.42 * body, right: x + half, bottom: y + 0.42 * body };
    let (mut level, mut upright) = (Path::default(), Path::default());
    level.stroke((x - half, y), (x + half, y));
    upright.stroke((x, y - 0.6 * body), (x, y + 0.6 * body));
    match sign {
        Sign::Band => draw_band(svg, &frame, y, 0.8 * body),
        Sign::Best => draw_stroke(svg, Stroke::Best, &level, body),
        Sign::BestBeyond => draw_stroke(svg, Stroke::BestBeyond, &level, body),
        Sign::Lowest => draw_stroke(svg, Stroke::Lowest, &level, body),
        Sign::Other(index) => draw_stroke(svg, Stroke::Other(index), &level, body),
        Sign::Mark(marked) => draw_mark(svg, marked, (x, y), body, transparent),
        Sign::MaxDepth => draw_stroke(svg, Stroke::MaxDepth, &upright, body),
        Sign::Never => draw_stroke(svg, Stroke::Never, &upright, body),
        Sign::NoFlow => draw_no_flow(svg, &frame, 0.8 * body),
        Sign::Edges => {
            draw_between(svg, &frame.outline());
            let mut edges = Path::default();
            edges.stroke((frame.left, frame.top), (frame.right, frame.top));
            edges.stroke((frame.left, frame.bottom), (frame.right, frame.bottom));
            draw_stroke(svg, Stroke::Edge, &edges, body);
            draw_stroke(svg, Stroke::Best, &level, body);
        }
        Sign::Chosen => draw_chosen(svg, (x, y), 0.85 * body, transparent),
        Sign::Judged => draw_judged(svg, (x, y), body, transparent),
        Sign::Division => {
            let mut path = Path::default();
            path.stroke((x - half, y + 0.3 * body), (x + half, y + 0.3 * body));
            for i in -2..=2 {
                let at = x + 0.4 * body * f64::from(i);
                path.stroke((at, y + 0.3 * body), (at, y - 0.1 * body));
            }
            svg.group("plot-division", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
            svg.path(&path, &[]);
            svg.end();
        }
    }
}
