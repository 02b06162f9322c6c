//! A panel with axes on its sides: grid, frame, ticks and their labels.
//!
//! Comes in: a rectangle and a scale for each side that has one. Goes out: SVG. Ticks point outward, where no mark of
//! the panel can hide them. Left out: what stands in the panel, and the titles, which the callers place.

use super::axis::{Scale, Ticks};
use super::frame::Frame;
use super::ink::INK;
use super::letters::{Weight, shorten, width};
use super::places::TO_BASELINE;
use super::svg::{Anchor, Path, Svg, Text};

/// One side.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Side {
    pub scale: Scale,
    pub ticks: Ticks,
    /// Whether ticks and labels are drawn, and not only the grid.
    pub labelled: bool,
}

/// A panel and its sides; the grid follows the left and the lower one.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Axes {
    pub frame: Frame,
    pub left: Side,
    pub bottom: Side,
    pub top: Option<Side>,
    pub right: Option<Side>,
}

/// Size of the labels of ticks and marks.
pub(super) fn tick_size(body: f64) -> f64 {
    (0.92 * body).max(9.0)
}

/// How far from a frame the labels of its upper and lower side reach.
pub(super) fn label_room(body: f64) -> f64 {
    0.75 * body + 1.12 * tick_size(body)
}

/// The widest label of some ticks.
pub(super) fn widest(ticks: &Ticks, body: f64) -> f64 {
    ticks.major.iter().map(|(_, l)| width(l, tick_size(body), Weight::Regular)).fold(0.0, f64::max)
}

/// Room between labels on a level axis `long` pixels long: not touching, and not more than about `most` of them.
pub(super) fn apart(labels: &[(f64, String)], body: f64, long: f64, most: f64) -> f64 {
    let widest = labels.iter().map(|(_, l)| width(l, tick_size(body), Weight::Regular)).fold(0.0, f64::max);
    (widest + 1.4 * body).max(long / most)
}

impl Axes {
    pub(super) fn draw(&self, svg: &mut Svg, body: f64, picture_width: f64) {
        self.draw_grid(svg);
        self.draw_ticks(svg, body);
        self.draw_labels(svg, body, picture_width);
    }

    fn draw_grid(&self, svg: &mut Svg) {
        let frame = self.frame;
        let mut grid = Path::default();
        for (value, _) in &self.bottom.ticks.major {
            let x = self.bottom.scale.at(*value);
            grid.stroke((x, frame.top), (x, frame.bottom));
        }
        for (value, _) in &self.left.ticks.major {
            let y = self.left.scale.at(*value);
            grid.stroke((frame.left, y), (frame.right, y));
        }
        let grey = [("fill", "none"), ("stroke", INK), ("stroke-opacity", "0.09"), ("stroke-width", "0.8")];
        svg.group("plot-grid", &grey);
        svg.path(&grid, &[]);
        svg.end();
    }

    fn draw_ticks(&self, svg: &mut Svg, body: f64) {
        let frame = self.frame;
        let (long, small) = (0.42 * body, 0.22 * body);
        let mut path = Path::default();
        path.move_to(frame.left, frame.top)
            .line_to(frame.right, frame.top)
            .line_to(frame.right, frame.bottom)
            .line_to(frame.left, frame.bottom)
            .close();
        let lengths = |side: &Side| -> Vec<(f64, f64)> {
            let major = side.ticks.major.iter().map(|(value, _)| (side.scale.at(*value), long));
            let minor = side.ticks.minor.iter().map(|value| (side.scale.at(*value), small));
            if side.labelled { major.chain(minor).collect() } else { Vec::new() }
        };
        for (x, length) in lengths(&self.bottom) {
            path.stroke((x, frame.bottom), (x, frame.bottom + length));
        }
        for (x, length) in self.top.iter().flat_map(lengths) {
            path.stroke((x, frame.top), (x, frame.top - length));
        }
        for (y, length) in lengths(&self.left) {
            path.stroke((frame.left, y), (frame.left - length, y));
        }
        for (y, length) in self.right.iter().flat_map(lengths) {
            path.stroke((frame.right, y), (frame.right + length, y));
        }
        svg.group("plot-axes", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
        svg.path(&path, &[]);
        svg.end();
    }

    fn draw_labels(&self, svg: &mut Svg, body: f64, picture_width: f64) {
        let (size, frame, gap) = (tick_size(body), self.frame, 0.65 * body);
        svg.group("plot-tick-labels", &[]);
        let mut label = |text: &str, x: f64, y: f64, anchor: Anchor| {
            svg.text(&Text {
                x,
                y,
                size,
                anchor,
                fill: INK,
                muted: false,
                class: "plot-tick-label",
                pieces: &[(text, Weight::Regular)],
            });
        };
        let upright = |side: &Side| if side.labelled { side.ticks.major.clone() } else { Vec::new() };
        for (value, text) in upright(&self.left) {
            let y = self.left.scale.at(value) + TO_BASELINE * size;
            label(&text, frame.left - gap, y, Anchor::End);
        }
        if let Some(side) = &self.right {
            for (value, text) in upright(side) {
                let y = side.scale.at(value) + TO_BASELINE * size;
                label(&text, frame.right + gap, y, Anchor::Start);
            }
        }
        let below = frame.bottom + 0.75 * body + 0.85 * size;
        let above = frame.top - 0.75 * body;
        for (side, y) in [(Some(&self.bottom), below), (self.top.as_ref(), above)] {
            let Some(side) = side else { continue };
            for (value, text) in upright(side) {
                let (x, half) = (side.scale.at(value), 0.5 * width(&text, size, Weight::Regular));
                if x - half >= 2.0 && x + half <= picture_width - 2.0 {
                    label(&text, x, y, Anchor::Middle);
                }
            }
        }
        svg.end();
    }
}

/// Writes the title of an axis: the first of the choice that fits, else the last shortened.
pub(super) fn title(
    svg: &mut Svg,
    choice: &[String],
    (x, y): (f64, f64),
    anchor: Anchor,
    size: f64,
    room: f64,
) {
    let fits = |text: &&String| width(text, size, Weight::Regular) <= room;
    let text = match (choice.iter().find(fits), choice.last()) {
        (Some(text), _) => text.clone(),
        (None, Some(last)) => shorten(last, size, Weight::Regular, room),
        (None, None) => return,
    };
    svg.text(&Text {
        x,
        y,
        size,
        anchor,
        fill: INK,
        muted: false,
        class: "plot-axis-title",
        pieces: &[(&text, Weight::Regular)],
    });
}
