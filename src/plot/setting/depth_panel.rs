//! The panel of depth: curves, the band of another day's uptake, marked depths.
//!
//! Comes in: what is drawn and where. Goes out: marks inside the panel's frame, and words that stand on nothing and on
//! none of one another; what finds no place is said in the margin anyway.

use super::layout::{Layout, Panel};
use super::seen::{Place, Seen};
use super::signs::{Stroke, draw_band, draw_mark, draw_no_flow, draw_stroke};
use super::words::Words;

use super::super::axes::tick_size;
use super::super::frame::Frame;
use super::super::ink::{BRICK, INK, PAPER};
use super::super::letters::Weight;
use super::super::places::{TO_BASELINE, Taken, around, text_frame};
use super::super::svg::{Anchor, Path, Svg, Text};

/// Places of a label beside its mark that are near enough not to be taken for another mark's.
const NEAR: usize = 14;

/// Draws the panel.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, words: &Words, panel: &Panel, layout: &Layout) {
    let (frame, body, size) = (panel.frame(), layout.body, tick_size(layout.body));
    let mut taken = Taken::default();
    band(svg, seen, panel, body, &mut taken);
    if let Some(stops) = seen.stops {
        let no_flow = Frame { left: panel.x().clamped(stops), ..frame };
        draw_no_flow(svg, &no_flow, body);
        taken.frame(no_flow);
    }
    let place = |p: &Place, flow: f64| (panel.x().at(p.depth), panel.y().clamped(flow));
    let lowest: Vec<(f64, f64)> = seen.places.iter().map(|p| place(p, p.lowest)).collect();
    let best: Vec<(f64, f64)> = seen.places.iter().map(|p| place(p, p.flow)).collect();
    let known = seen.places.iter().filter(|p| !p.beyond_span).count();
    draw_stroke(svg, Stroke::Best, &through(best.get(..known).unwrap_or_default()), body);
    draw_stroke(
        svg,
        Stroke::BestBeyond,
        &through(best.get(known.saturating_sub(1)..).unwrap_or_default()),
        body,
    );
    // Over the best estimate: where the choke ratio is well known they nearly coincide.
    draw_stroke(svg, Stroke::Lowest, &through(&lowest), body);
    taken.along(&lowest, 0.2 * body);
    taken.along(&best, 0.25 * body);
    if let Some(depth) = seen.max_depth.filter(|d| panel.x().shows(*d)) {
        let x = panel.x().at(depth);
        let mut path = Path::default();
        path.stroke((x, frame.top), (x, frame.bottom));
        draw_stroke(svg, Stroke::MaxDepth, &path, body);
        taken.stroke((x, frame.top), (x, frame.bottom), 1.0);
    }
    let mut drops = Path::default();
    let at = |depth: f64, flow: f64| (panel.x().at(depth), panel.y().clamped(flow));
    for mark in &seen.marks {
        let (x, y) = at(mark.depth, mark.flow);
        if frame.bottom - y > body {
            drops.stroke((x, y), (x, frame.bottom));
            taken.stroke((x, y), (x, frame.bottom), 0.8);
        }
        taken.frame(Frame {
            left: x - 0.6 * body,
            top: y - 0.6 * body,
            right: x + 0.6 * body,
            bottom: y + 0.6 * body,
        });
    }
    draw_stroke(svg, Stroke::Drop, &drops, body);
    for mark in &seen.marks {
        draw_mark(svg, mark.marked, at(mark.depth, mark.flow), body, layout.transparent);
    }
    svg.group("plot-panel-labels", &[]);
    if seen.places.is_empty() {
        let middle = (0.5 * (frame.left + frame.right), 0.5 * (frame.top + frame.bottom));
        let room = |anchor_y: f64| {
            text_frame(words.no_curve, body, Weight::Regular, (middle.0, anchor_y), Anchor::Middle)
        };
        let low = frame.top + 0.72 * frame.height();
        let places = [low, frame.bottom - body, frame.top + body].map(room);
        if let Some(frame) = taken.first(places, &frame).or_else(|| places.first().copied()) {
            label(svg, words.no_curve, &frame, body, "plot-no-curve", layout.transparent);
            taken.frame(frame);
        }
    }
    for (mark, told) in seen.marks.iter().zip(&words.marks) {
        let from = at(mark.depth, mark.flow);
        let found = told.iter().take(2).find_map(|text| {
            taken
                .first(around(text, size, from, 0.9 * body).into_iter().take(NEAR), &frame)
                .map(|place| (text, place))
        });
        if let Some((text, place)) = found {
            label(svg, text, &place, size, "plot-mark-label", layout.transparent);
            taken.frame(place);
        }
    }
    if let Some(depth) = seen.max_depth.filter(|d| panel.x().shows(*d)) {
        upright_label(
            svg,
            &words.max_depth_label,
            panel.x().at(depth),
            &frame,
            (layout, "plot-max-depth-label"),
            &mut taken,
        );
    }
    svg.end();
}

/// The band of another day's uptake across a panel.
pub(super) fn band(svg: &mut Svg, seen: &Seen, panel: &Panel, body: f64, taken: &mut Taken) {
    let Some(band) = seen.band else { return };
    let (top, bottom) = (panel.y().clamped(band.high), panel.y().clamped(band.low));
    let frame = Frame { top, bottom, ..panel.frame() };
    let middle = panel.y().clamped(band.middle);
    draw_band(svg, &frame, middle, body);
    taken.stroke((frame.left, middle), (frame.right, middle), 1.0);
}

/// A text beside an upright, at the height that is free.
pub(super) fn upright_label(
    svg: &mut Svg,
    text: &str,
    x: f64,
    frame: &Frame,
    (layout, class): (&Layout, &'static str),
    taken: &mut Taken,
) {
    let (body, size) = (layout.body, tick_size(layout.body));
    let steps = 24_u32;
    let places = (0..=steps).flat_map(|i| {
        let y = frame.top + 0.9 * body + (frame.height() - 1.8 * body) * f64::from(i) / f64::from(steps);
        let at = |x: f64, anchor| text_frame(text, size, Weight::Regular, (x, y), anchor);
        [at(x + 0.5 * body, Anchor::Start), at(x - 0.5 * body, Anchor::End)]
    });
    if let Some(place) = taken.first(places, frame) {
        label(svg, text, &place, size, class, layout.transparent);
        taken.frame(place);
    }
}

/// A text on a ground of its own, so that no hatch goes through the letters.
pub(super) fn label(
    svg: &mut Svg,
    text: &str,
    frame: &Frame,
    size: f64,
    class: &'static str,
    transparent: bool,
) {
    if !transparent {
        let ground = [("class", "plot-ground"), ("fill", PAPER), ("fill-opacity", "0.88")];
        svg.rect(frame.left - 2.0, frame.top, frame.width() + 4.0, frame.height(), &ground);
    }
    let fill = if class == "plot-never-label" { BRICK } else { INK };
    svg.text(&Text {
        x: frame.left,
        y: 0.5 * (frame.top + frame.bottom) + TO_BASELINE * size,
        size,
        anchor: Anchor::Start,
        fill,
        muted: false,
        class,
        pieces: &[(text, Weight::Regular)],
    });
}

/// A path through places.
pub(super) fn through(places: &[(f64, f64)]) -> Path {
    let mut path = Path::default();
    if places.len() > 1 {
        for (i, (x, y)) in places.iter().enumerate() {
            if i == 0 {
                path.move_to(*x, *y);
            } else {
                path.line_to(*x, *y);
            }
        }
    }
    path
}
