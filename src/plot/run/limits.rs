//! The limits of acceptance in numbers, beside their brackets.
//!
//! Comes in: window, marks and line in pixels. Goes out: a number at each bracket's end, or both in one text where there
//! is no room for two, or nothing where everything near is taken: no number stands on a point or on the line, and the
//! verdict says the limits anyway.

use super::flow_panel::{Drawn, in_view, window_half_width};
use super::layout::{Frame, Layout};
use super::marks::radius;
use super::seen::{Nominal, Seen, Window};
use crate::report::number::fixed;

use super::super::ink::INK;
use super::super::letters::{Weight, width};
use super::super::number::short;
use super::super::svg::{Anchor, Svg, Text};

/// Places at which the line is looked at.
const LINE_STEPS: u32 = 128;

/// Draws the numbers.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, layout: &Layout, line: &Drawn) {
    let (Some(nominal), Some(window)) = (seen.nominal, seen.window) else { return };
    let taken = taken(seen, layout, line);
    let labels = if seen.window_in_view().is_some() {
        beside_the_brackets(&nominal, &window, seen, layout, &taken)
    } else {
        at_the_edge(&nominal, &window, seen, layout, &taken)
    };
    svg.group("plot-limit-labels", &[]);
    for label in labels {
        svg.text(&Text {
            x: label.frame.left,
            y: (label.frame.top + label.frame.bottom) / 2.0 + 0.36 * size(layout),
            size: size(layout),
            anchor: Anchor::Start,
            fill: INK,
            muted: false,
            class: "plot-limit",
            pieces: &[(&label.text, Weight::Regular)],
        });
    }
    svg.end();
}

struct Label {
    text: String,
    frame: Frame,
}

fn size(layout: &Layout) -> f64 {
    0.92 * layout.body
}

/// A text beside `x` on one side, `away` from it, its middle at `y`.
fn beside(text: &str, (x, y): (f64, f64), side: f64, away: f64, layout: &Layout) -> Frame {
    let (size, wide) = (size(layout), width(text, size(layout), Weight::Regular));
    let left = if side < 0.0 { x - away - wide } else { x + away };
    Frame { left, top: y - 0.6 * size, right: left + wide, bottom: y + 0.6 * size }
}

fn first_free(places: impl IntoIterator<Item = Frame>, taken: &[Frame], layout: &Layout) -> Option<Frame> {
    places.into_iter().find(|f| layout.main.holds(f) && !taken.iter().any(|t| t.meets(f)))
}

fn beside_the_brackets(
    nominal: &Nominal,
    window: &Window,
    seen: &Seen,
    layout: &Layout,
    taken: &[Frame],
) -> Vec<Label> {
    let x = layout.x.at(nominal.pressure);
    let number = |limit: f64| fixed(limit, seen.shown.flow_decimals);
    // Clear of the ticks of the nominal flow.
    let away = window_half_width(layout) + 0.7 * layout.body;
    let mut labels: Vec<Label> = Vec::new();
    // A rising line leaves the upper left and the lower right free.
    for (limit, first, outward) in [(window.high, -1.0, -0.7), (window.low, 1.0, 0.7)] {
        let (text, y) = (number(limit), layout.flow.at(limit));
        let places = [0.0, outward, -outward].into_iter().flat_map(|shift: f64| {
            [first, -first].map(|side| beside(&text, (x, y + shift * size(layout)), side, away, layout))
        });
        let clear = |f: &Frame| !labels.iter().any(|l| l.frame.meets(f));
        if let Some(frame) = first_free(places.filter(clear), taken, layout) {
            labels.push(Label { text, frame });
        }
    }
    if labels.len() < 2 {
        labels.clear();
        let text = format!("{} to {}", number(window.low), number(window.high));
        let middle = (layout.flow.at(window.low) + layout.flow.at(window.high)) / 2.0;
        let places = [0.0, -1.0, 1.0, -2.0, 2.0].into_iter().flat_map(|shift: f64| {
            [-1.0, 1.0].map(|side| beside(&text, (x, middle + shift * size(layout)), side, away, layout))
        });
        if let Some(frame) = first_free(places, taken, layout) {
            labels.push(Label { text, frame });
        }
    }
    labels
}

/// For a window beyond the panel, beside the arrow that points to it.
fn at_the_edge(
    nominal: &Nominal,
    window: &Window,
    seen: &Seen,
    layout: &Layout,
    taken: &[Frame],
) -> Vec<Label> {
    let text = format!("limits {} to {}", short(window.low), short(window.high));
    let y = if window.nominal > seen.flows.1 {
        layout.main.top + size(layout)
    } else {
        layout.main.bottom - size(layout)
    };
    let x = layout.x.at(nominal.pressure);
    let places = [1.0, -1.0].map(|side| beside(&text, (x, y), side, layout.body, layout));
    first_free(places, taken, layout).map(|frame| Label { text, frame }).into_iter().collect()
}

/// What points, their bars and the line occupy.
fn taken(seen: &Seen, layout: &Layout, line: &Drawn) -> Vec<Frame> {
    let r = radius(seen, layout.body);
    let mut taken: Vec<Frame> = seen
        .marks
        .iter()
        .filter(|m| in_view(m, seen))
        .map(|m| {
            let (x, y) = (layout.x.at(m.pressure), layout.flow.at(m.flow));
            Frame {
                left: layout.x.clamped(m.pressure - m.pressure_bar).min(x - r),
                right: layout.x.clamped(m.pressure + m.pressure_bar).max(x + r),
                top: layout.flow.clamped(m.flow + m.flow_bar).min(y - r),
                bottom: layout.flow.clamped(m.flow - m.flow_bar).max(y + r),
            }
        })
        .collect();
    if let Some((from, to)) = line.reach {
        let place = |i: u32| {
            let pressure = from + (to - from) * f64::from(i) / f64::from(LINE_STEPS);
            (layout.x.at(pressure), layout.flow.at(line.at(pressure)))
        };
        let around = 0.15 * layout.body;
        taken.extend((0..LINE_STEPS).map(|i| {
            let (a, b) = (place(i), place(i + 1));
            Frame {
                left: a.0.min(b.0),
                right: a.0.max(b.0),
                top: a.1.min(b.1) - around,
                bottom: a.1.max(b.1) + around,
            }
        }));
    }
    taken
}
