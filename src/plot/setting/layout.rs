//! Where everything of a setting's plate stands, and the titles of its axes.
//!
//! Comes in: what is drawn, its words, the size of the picture, which panels it has. Goes out: a [`Layout`] in pixels.
//! In a wide picture the margin is a column to the right of the panels, in a narrow one it lies below.

use super::margin::margin;
use super::seen::Seen;
use super::signs::{self, Sign};
use super::words::{Words, other_pressure};
use super::{Panels, SettingPlot};

use super::super::axes::{Axes, Side, apart, label_room, tick_size, title, widest};
use super::super::axis::Scale;
use super::super::column::{Column, Heading, body_size, edge, margin_frame, stands_beside};
use super::super::frame::Frame;
use super::super::letters::{Weight, width};
use super::super::svg::{Anchor, Svg};

/// Width over height of the usual picture of both panels, and of one.
const RATIO: (f64, f64) = (1.2, 1.7);
/// The margin below takes about this share of the height, if leaving something out achieves it.
const MOST_BELOW: (f64, f64) = (0.34, 0.40);
/// Room between the panels and the margin beside them, in sizes of body text.
const GUTTER: f64 = 2.5;
/// At most about so many labels on level axes and on upright ones.
const MOST_LABELS: (f64, f64) = (13.0, 9.0);

/// A panel.
pub(super) struct Panel {
    pub axes: Axes,
}

impl Panel {
    pub(super) fn frame(&self) -> Frame {
        self.axes.frame
    }

    pub(super) fn x(&self) -> Scale {
        self.axes.bottom.scale
    }

    pub(super) fn y(&self) -> Scale {
        self.axes.left.scale
    }
}

/// Places in pixels.
pub(super) struct Layout {
    pub width: f64,
    pub height: f64,
    /// Size of body text; all distances are counted in it.
    pub body: f64,
    pub transparent: bool,
    pub depth: Option<Panel>,
    pub ip: Option<Panel>,
    margin_width: f64,
    beside: bool,
    margin: Column<Sign>,
}

impl Layout {
    pub(super) fn new(seen: &Seen, words: &Words, options: &SettingPlot, panels: Panels) -> Self {
        let (w, h) = (f64::from(options.width), f64::from(options.height));
        let both = panels == Panels::Both;
        let body = body_size(w, h, if both { RATIO.0 } else { RATIO.1 });
        let (edge, size) = (edge(body), tick_size(body));
        // Two panels, one over the other, leave a column beside them also in a picture as high as it is wide.
        let beside = if both { w >= 700.0 && w >= 0.9 * h } else { stands_beside(w, h) };
        let margin_width = if beside { (0.26 * w).clamp(19.0 * body, 24.0 * body) } else { w - 2.0 * edge };
        let most_below = if both { MOST_BELOW.0 } else { MOST_BELOW.1 };
        let room = if beside { h - 2.0 * edge } else { most_below * h };
        let margin = margin(words, seen, panels, (body, margin_width), (beside, room));

        let heading = Heading { title: &words.name, about: &words.about, beside, body };
        let top = heading.bottom() + 0.6 * body;
        let bottom = h - edge - if beside { 0.0 } else { margin.y + 0.6 * body };
        // Over a panel: its titles and the labels of its upper axis; under it: labels and a title.
        let (over, under) = (1.5 * body + label_room(body), label_room(body) + 1.35 * body);
        let count = if both { 2.0 } else { 1.0 };
        let between = if both { 0.9 * body } else { 0.0 };
        let each = ((bottom - top - between) / count - over - under).max(2.0 * body);
        let right = w - edge - if beside { margin_width + GUTTER * body } else { 0.5 * body };
        let label = width("0.000", size, Weight::Regular);
        let frame = |index: f64, left: f64| {
            let top = top + over + index * (each + over + under + between);
            Frame { left, top, right, bottom: top + each }
        };
        let upright = |range: (f64, f64)| {
            let scale = Scale::new(range.0, range.1, each, 0.0);
            scale.ticks(|_| (1.9 * size).max(each / MOST_LABELS.1))
        };
        let (depth_ticks, ip_ticks) = (upright(seen.depth_flows), upright(seen.ip_flows));
        let widest = |has: bool, ticks| if has { widest(ticks, body) } else { 0.0 };
        let labels =
            widest(panels.has_depth(), &depth_ticks).max(widest(panels.has_ip(), &ip_ticks)).max(label);
        let left = edge + labels.min(0.2 * w) + 0.7 * body;
        let long = right - left;
        let level = |range: (f64, f64)| {
            let scale = Scale::new(range.0, range.1, left, right);
            let ticks = scale.ticks(|labels| apart(labels, body, long, MOST_LABELS.0));
            Side { scale, ticks, labelled: true }
        };
        let panel = |index: f64, x: (f64, f64), y: (f64, f64), ticks, above: (f64, f64)| {
            let frame = frame(index, left);
            let left = Side { scale: Scale::new(y.0, y.1, frame.bottom, frame.top), ticks, labelled: true };
            Panel { axes: Axes { frame, left, bottom: level(x), top: Some(level(above)), right: None } }
        };
        let depth =
            panels.has_depth().then(|| panel(0.0, seen.depths, seen.depth_flows, depth_ticks, seen.ambients));
        let per = other_pressure(seen).1;
        let others = (seen.ips.0 * per, seen.ips.1 * per);
        let index = if both { 1.0 } else { 0.0 };
        let ip = panels.has_ip().then(|| panel(index, seen.ips, seen.ip_flows, ip_ticks, others));
        Self {
            width: w,
            height: h,
            body,
            transparent: options.transparent,
            depth,
            ip,
            margin_width,
            beside,
            margin,
        }
    }

    /// Of a picture without head and margin, whose panels stand where the caller puts them.
    pub(super) fn bare((width, height): (f64, f64), body: f64, transparent: bool) -> Self {
        Self {
            width,
            height,
            body,
            transparent,
            depth: None,
            ip: None,
            margin_width: 0.0,
            beside: false,
            margin: Column::new(body, width),
        }
    }

    /// What the picture is of.
    pub(super) fn draw_head(&self, svg: &mut Svg, words: &Words) {
        let beside = if self.beside { self.margin_width + GUTTER * self.body } else { 0.0 };
        let right = self.width - edge(self.body) - beside;
        Heading { title: &words.name, about: &words.about, beside: self.beside, body: self.body }
            .draw(svg, right);
    }

    /// Titles of the axes.
    pub(super) fn draw_titles(&self, svg: &mut Svg, words: &Words) {
        let (body, left) = (self.body, edge(self.body));
        svg.group("plot-axis-titles", &[]);
        let panels = [
            (&self.depth, &words.flow_axis, &words.ambient_axis, &words.depth_axis),
            (&self.ip, &words.surface_flow_axis, &words.other_ip_axis, &words.ip_axis),
        ];
        for (panel, flow, above, below) in panels {
            let Some(panel) = panel else { continue };
            let frame = panel.frame();
            let (room, y) = (frame.right - left, frame.top - label_room(body) - 0.45 * body);
            title(svg, flow, (left, y), Anchor::Start, body, 0.55 * room);
            title(svg, above, (frame.right, y), Anchor::End, body, 0.4 * room);
            let middle = (0.5 * (frame.left + frame.right), frame.bottom + label_room(body) + body);
            title(svg, below, middle, Anchor::Middle, body, frame.width());
        }
        svg.end();
    }

    /// The margin at its place.
    pub(super) fn draw_margin(&self, svg: &mut Svg) {
        let beside = self.beside.then_some(self.margin_width);
        let frame = margin_frame((self.width, self.height), self.body, beside, self.margin.y);
        let (body, transparent) = (self.body, self.transparent);
        self.margin.draw(svg, (frame.left, frame.top), |svg, sign, place| {
            signs::draw(svg, sign, place, body, transparent);
        });
    }
}
