//! Words in the main panel: floor and ceiling, reasons over stretches, unmarked jumps.
//!
//! Comes in: what is drawn, in pixels. Goes out: texts that stand on nothing and on none of one another. Where
//! everything near is taken there is no text: the hatch and the mark stay, and the margin explains them.

use super::layout::Layout;
use super::panel::{cell_strokes, fit_places, series_strokes, stretch_frames};
use super::seen::Seen;
use super::stretches::Reason;
use super::words::Words;

use super::super::axes::tick_size;
use super::super::frame::Frame;
use super::super::ink::{BRICK, INK, PAPER};
use super::super::letters::{Weight, width};
use super::super::places::{TO_BASELINE, Taken, text_frame};
use super::super::svg::{Anchor, Svg, Text};

/// Jumps that are told beside their mark; of more, only the marks are drawn.
const MOST_JUMPS: usize = 8;

/// Draws the words.
pub(super) fn draw(svg: &mut Svg, seen: &Seen<'_>, words: &Words, layout: &Layout) {
    let mut taken = taken(seen, layout);
    let (size, main) = (tick_size(layout.body), layout.main);
    svg.group("plot-panel-labels", &[]);
    draw_jumps(svg, seen, words, layout, &mut taken);
    draw_limits(svg, seen, words, layout, &mut taken);
    for (reason, frame) in stretch_frames(seen, layout) {
        let told = reason.words().1;
        let wide = width(told, size, Weight::Regular) + 0.8 * layout.body;
        if reason == Reason::DeadTime || wide > frame.width() {
            continue;
        }
        let spare = frame.width() - wide;
        let places = (0..60).flat_map(|step| {
            let y = main.bottom - (0.9 + 0.5 * f64::from(step)) * size;
            [0.5, 0.25, 0.75, 0.0, 1.0].map(|share| {
                let x = frame.left + 0.4 * layout.body + share * spare;
                text_frame(told, size, Weight::Regular, (x, y), Anchor::Start)
            })
        });
        if let Some(frame) = taken.first(places, &main) {
            text(svg, told, &frame, size, INK, "plot-reason", Weight::Regular, layout);
            taken.frame(frame);
        }
    }
    svg.end();
}

/// A question mark on the upright of each jump, and beside it what it looks like. The mark stands wherever its upright
/// is free, and at the top of the panel where nothing is: it must not be missed.
fn draw_jumps(svg: &mut Svg, seen: &Seen<'_>, words: &Words, layout: &Layout, taken: &mut Taken) {
    let (size, main, body) = (tick_size(layout.body), layout.main, layout.body);
    let mark_size = 1.35 * body;
    let shown = || seen.jumps.iter().enumerate().filter(|(_, j)| layout.x.shows(j.at_s));
    let mut marks: Vec<(usize, Frame)> = Vec::new();
    for (i, jump) in shown() {
        let x = layout.x.at(jump.at_s).clamp(main.left + body, main.right - body);
        let at = |step: u32| {
            let y = main.top + body + 0.5 * f64::from(step) * body;
            text_frame("?", mark_size, Weight::Bold, (x, y), Anchor::Middle)
        };
        // Two jumps at one place have one mark.
        let top = Some(at(0)).filter(|frame| !marks.iter().any(|(_, other)| other.meets(frame)));
        if let Some(frame) = taken.first((0..60).map(at), &main).or(top) {
            text(svg, "?", &frame, mark_size, BRICK, "plot-jump-mark", Weight::Bold, layout);
            taken.frame(frame);
            marks.push((i, frame));
        }
    }
    for (_, jump) in shown() {
        let x = layout.x.at(jump.at_s);
        taken.stroke((x, main.top), (x, main.bottom), 0.8);
    }
    for (i, mark) in marks {
        let Some(told) = words.jumps.get(i).filter(|_| i < MOST_JUMPS) else { continue };
        let middle = 0.5 * (mark.top + mark.bottom);
        let places = (0..40).flat_map(|step| {
            let y = middle + 0.5 * f64::from(step) * size;
            let at = |x: f64, anchor| text_frame(&told[0], size, Weight::Regular, (x, y), anchor);
            [at(mark.right + 0.3 * body, Anchor::Start), at(mark.left - 0.3 * body, Anchor::End)]
        });
        if let Some(frame) = taken.first(places, &main) {
            text(svg, &told[0], &frame, size, BRICK, "plot-jump-label", Weight::Regular, layout);
            taken.frame(frame);
        }
    }
}

fn draw_limits(svg: &mut Svg, seen: &Seen<'_>, words: &Words, layout: &Layout, taken: &mut Taken) {
    let (size, main) = (tick_size(layout.body), layout.main);
    // Off the lines: the ceiling's words above or below it, the floor's as well.
    let limits = [
        (seen.limits.1, &words.ceiling, seen.passed.1.is_some(), [-0.75, 0.8]),
        (seen.limits.0, &words.floor, seen.passed.0.is_some(), [0.8, -0.75]),
    ];
    for (limit, told, passed, sides) in limits {
        if !layout.po2.shows(limit) {
            continue;
        }
        let y = layout.po2.at(limit);
        let wide = width(told, size, Weight::Regular);
        let room = (main.width() - wide - layout.body).max(0.0);
        let places = (0..=24).flat_map(|i| {
            let x = main.right - 0.5 * layout.body - room * f64::from(i) / 24.0;
            sides.map(|side| text_frame(told, size, Weight::Regular, (x, y + side * size), Anchor::End))
        });
        if let Some(frame) = taken.first(places, &main) {
            let fill = if passed { BRICK } else { INK };
            text(svg, told, &frame, size, fill, "plot-limit-label", Weight::Regular, layout);
            taken.frame(frame);
        }
    }
}

#[allow(clippy::too_many_arguments)] // one text has that many sides
fn text(
    svg: &mut Svg,
    content: &str,
    frame: &Frame,
    size: f64,
    fill: &'static str,
    class: &'static str,
    weight: Weight,
    layout: &Layout,
) {
    // A ground of its own, so that no hatch goes through the letters.
    if !layout.transparent {
        let ground = [("class", "plot-ground"), ("fill", PAPER), ("fill-opacity", "0.85")];
        let gap = 0.15 * layout.body;
        svg.rect(frame.left - gap, frame.top, frame.width() + 2.0 * gap, frame.height(), &ground);
    }
    svg.text(&Text {
        x: frame.left,
        y: 0.5 * (frame.top + frame.bottom) + TO_BASELINE * size,
        size,
        anchor: Anchor::Start,
        fill,
        muted: false,
        class,
        pieces: &[(content, weight)],
    });
}

/// What readings, fitted slopes, limits and uprights occupy.
fn taken(seen: &Seen<'_>, layout: &Layout) -> Taken {
    let mut taken = Taken::default();
    let main = layout.main;
    for stroke in cell_strokes(seen, layout).iter().flatten().chain(&series_strokes(seen, layout)) {
        taken.along(stroke, 0.12 * layout.body);
        if let [(x, y)] = stroke.as_slice() {
            taken.stroke((*x, *y), (*x, *y), 0.2 * layout.body);
        }
    }
    for fit in &seen.fits {
        taken.along(&fit_places(fit, layout), 0.4 * layout.body);
    }
    for limit in [seen.limits.0, seen.limits.1].into_iter().filter(|l| layout.po2.shows(*l)) {
        let y = layout.po2.at(limit);
        taken.stroke((main.left, y), (main.right, y), 0.8);
    }
    for item in &layout.events.items {
        taken.stroke((item.x, main.top), (item.x, main.bottom), 0.8);
    }
    taken
}
