//! The panel of IP: each orifice's line, the richest and leanest injection of the one that is set, the IP to set under
//! the band of another day's uptake, the IP never to exceed, the divisions of the gauge.
//!
//! Comes in: what is drawn and where. Goes out: marks inside the panel's frame, and words that stand on nothing and on
//! none of one another; what finds no place is said in the margin anyway.

use super::depth_panel::{band, label, through, upright_label};
use super::layout::{Layout, Panel};
use super::seen::{At, Line, Row, Seen};
use super::signs::{Stroke, draw_between, draw_chosen, draw_judged, draw_stroke};
use super::words::Words;

use super::super::axes::tick_size;
use super::super::frame::Frame;
use super::super::ink::INK;
use super::super::letters::{Weight, shorten};
use super::super::places::{Taken, around, text_frame};
use super::super::svg::{Anchor, Path, Svg};

/// Divisions nearer than this in pixels are not drawn.
const LEAST_DIVISION_PX: f64 = 3.0;
/// More lines than this are not named beside them.
const MOST_NAMED: usize = 8;

/// Draws the panel.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, words: &Words, panel: &Panel, layout: &Layout) {
    let (frame, body, size) = (panel.frame(), layout.body, tick_size(layout.body));
    let mut taken = Taken::default();
    if let Some(line) = seen.lines.iter().find(|l| l.shown) {
        let mut around = places(line, panel, |r| r.richest);
        let leanest = places(line, panel, |r| r.leanest);
        let (upper, lower) = (through(&around), through(&leanest));
        around.extend(leanest.iter().rev());
        let mut between = through(&around);
        between.close();
        draw_between(svg, &between);
        draw_stroke(svg, Stroke::Edge, &upper, body);
        draw_stroke(svg, Stroke::Edge, &lower, body);
    }
    band(svg, seen, panel, body, &mut taken);
    draw_divisions(svg, seen, panel, body);
    let mut others = 0;
    for line in &seen.lines {
        let nominal = places(line, panel, |r| r.nominal);
        taken.along(&nominal, 0.25 * body);
        let stroke = if line.shown { Stroke::Best } else { Stroke::Other(others) };
        others += usize::from(!line.shown);
        draw_stroke(svg, stroke, &through(&nominal), body);
    }
    if let Some(never) = seen.never.filter(|ip| panel.x().shows(*ip)) {
        let x = panel.x().at(never);
        let mut path = Path::default();
        path.stroke((x, frame.top), (x, frame.bottom));
        draw_stroke(svg, Stroke::Never, &path, body);
        taken.stroke((x, frame.top), (x, frame.bottom), 1.0);
    }
    let at = |at: At| (panel.x().clamped(at.ip), panel.y().clamped(at.flow));
    let mut drops = Path::default();
    for mark in seen.chosen.iter().chain(&seen.judged) {
        let (x, y) = at(*mark);
        drops.stroke((x, y), (x, frame.bottom));
        taken.stroke((x, y), (x, frame.bottom), 0.8);
        let r = 0.75 * body;
        taken.frame(Frame { left: x - r, top: y - r, right: x + r, bottom: y + r });
    }
    draw_stroke(svg, Stroke::Drop, &drops, body);
    if let Some(judged) = seen.judged {
        draw_judged(svg, at(judged), body, layout.transparent);
    }
    if let Some(chosen) = seen.chosen {
        draw_chosen(svg, at(chosen), body, layout.transparent);
    }
    svg.group("plot-panel-labels", &[]);
    let marks = [
        (seen.chosen, &words.chosen_label, "plot-chosen-label"),
        (seen.judged, &words.judged_label, "plot-judged-label"),
    ];
    for (mark, text, class) in marks {
        let Some(mark) = mark else { continue };
        if let Some(place) = taken.first(below(text, size, at(mark), body), &frame) {
            label(svg, text, &place, size, class, layout.transparent);
            taken.frame(place);
        }
    }
    if let Some(never) = seen.never.filter(|ip| panel.x().shows(*ip)) {
        upright_label(
            svg,
            &words.never_label,
            panel.x().at(never),
            &frame,
            (layout, "plot-never-label"),
            &mut taken,
        );
    }
    if seen.lines.len() > 1 {
        for line in seen.lines.iter().take(MOST_NAMED) {
            name(svg, line, panel, layout, &mut taken);
        }
    }
    svg.end();
}

/// Places for a text about a point of a rising line: first to its lower right.
fn below(text: &str, size: f64, (x, y): (f64, f64), body: f64) -> Vec<Frame> {
    let mut places = Vec::new();
    for step in [1.1, 1.8, 2.6, 3.6, 4.8] {
        let y = y + step * size;
        places.push(text_frame(text, size, Weight::Regular, (x + 0.6 * body, y), Anchor::Start));
        places.push(text_frame(text, size, Weight::Regular, (x - 0.6 * body, y), Anchor::End));
    }
    places.extend(around(text, size, (x, y), 1.0 * body));
    places
}

/// The name of a line at its end; where that is taken the legend names it by its dash.
fn name(svg: &mut Svg, line: &Line, panel: &Panel, layout: &Layout, taken: &mut Taken) {
    let (body, size) = (layout.body, tick_size(layout.body));
    let Some((x, y)) = places(line, panel, |r| r.nominal).last().copied() else { return };
    let room = panel.frame().right - x - body;
    let text = shorten(&line.name, size, Weight::Regular, room);
    let candidates = [0.0, -0.5, 0.5].map(|step| {
        text_frame(&text, size, Weight::Regular, (x + 0.5 * body, y + step * size), Anchor::Start)
    });
    if let Some(place) = taken.first(candidates, &panel.frame()) {
        label(svg, &text, &place, size, "plot-line-name", layout.transparent);
        taken.frame(place);
    }
}

fn places(line: &Line, panel: &Panel, of: impl Fn(&Row) -> f64) -> Vec<(f64, f64)> {
    line.rows.iter().map(|r| (panel.x().clamped(r.ip), panel.y().clamped(of(r)))).collect()
}

/// The divisions of the gauge as ticks standing on the axis.
fn draw_divisions(svg: &mut Svg, seen: &Seen, panel: &Panel, body: f64) {
    let (x, frame) = (panel.x(), panel.frame());
    let apart = x.at(x.low + seen.division) - frame.left;
    // A division that is none, or too fine to be told.
    if !(apart.is_finite() && apart >= LEAST_DIVISION_PX) {
        return;
    }
    let (first, last) =
        (libm::ceil(x.low / seen.division - 1e-6), libm::floor(x.high / seen.division + 1e-6));
    let mut path = Path::default();
    for i in first as i64..=last as i64 {
        let at = x.at(i as f64 * seen.division);
        let long = if i % 5 == 0 { 0.45 } else { 0.28 };
        path.stroke((at, frame.bottom), (at, frame.bottom - long * body));
    }
    svg.group("plot-divisions", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
    svg.path(&path, &[]);
    svg.end();
}
