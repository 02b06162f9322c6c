//! Where everything of a session's plate stands, and the axes.
//!
//! Comes in: what is drawn, its words, the size of the picture. Goes out: a [`Layout`] in pixels, and head, frames and
//! ticks drawn. In a wide picture the margin is a column to the right of the panels, in a narrow one it lies below.
//! Where the main panel would become too low, the lanes are told in fewer lines, then the strip goes.

use super::SessionPlot;
use super::clock;
use super::lanes::{self, Events, Segments, Told};
use super::margin::margin;
use super::seen::Seen;
use super::signs::{self, Sign};
use super::words::{Words, depth};

use super::super::axes::{Axes, Side, apart, label_room, tick_size, title, widest};
use super::super::axis::{Scale, Ticks};
use super::super::column::{Column, Heading, body_size, edge, margin_frame, stands_beside};
use super::super::frame::Frame;
use super::super::letters::{Weight, width};
use super::super::svg::{Anchor, Svg};

/// Width over height of the usual picture.
const RATIO: f64 = 1.5;
/// The margin below takes about this share of the height, if leaving something out achieves it.
const MOST_BELOW: f64 = 0.36;
/// The main panel should have at least this share of the height, and so many lines of text.
const LEAST_MAIN: (f64, f64) = (0.27, 9.0);
/// At most about so many labels on the axes of time and of PO2.
const MOST_LABELS: (f64, f64) = (12.0, 9.0);
/// Room between the panels and the margin beside them, in sizes of body text.
const GUTTER: f64 = 2.7;
/// Height of the strip in lines of text.
const STRIP_LINES: f64 = 5.0;

/// Places in pixels.
pub(super) struct Layout {
    pub width: f64,
    pub height: f64,
    /// Size of body text; all distances are counted in it.
    pub body: f64,
    pub transparent: bool,
    /// Seconds to pixels, in all panels.
    pub x: Scale,
    /// PO2 in bar to pixels.
    pub po2: Scale,
    pub segments_lane: Frame,
    pub main: Frame,
    pub events_lane: Frame,
    pub strip: Option<Frame>,
    /// L/min and metres to pixels in the strip.
    pub flow: Scale,
    pub depth: Scale,
    pub segments: Segments,
    pub segment_lines: Vec<Vec<String>>,
    pub events: Events,
    pub margin_width: f64,
    beside: bool,
    margin: Column<Sign>,
    po2_ticks: Ticks,
    time_ticks: Ticks,
    flow_side: Side,
    depth_side: Option<Side>,
}

/// What is shown of lanes and strip.
#[derive(Debug, Clone, Copy)]
struct Offer {
    segment_lines: usize,
    events: (Told, usize),
    strip: bool,
}

const OFFERS: [Offer; 5] = [
    Offer { segment_lines: 4, events: (Told::Full, 4), strip: true },
    Offer { segment_lines: 2, events: (Told::Full, 2), strip: true },
    Offer { segment_lines: 1, events: (Told::Numbered, 3), strip: true },
    Offer { segment_lines: 1, events: (Told::Numbered, 2), strip: false },
    Offer { segment_lines: 1, events: (Told::Silent, 1), strip: false },
];

impl Layout {
    pub(super) fn new(seen: &Seen<'_>, words: &Words, options: &SessionPlot) -> Self {
        let offered = |offer: &Offer| Self::offered(seen, words, options, *offer);
        let good = |layout: &Self| {
            layout.main.height() >= (LEAST_MAIN.0 * layout.height).max(LEAST_MAIN.1 * layout.body)
        };
        let mut layouts = OFFERS.iter().map(offered);
        layouts.find(good).unwrap_or_else(|| offered(&OFFERS[OFFERS.len() - 1]))
    }

    fn offered(seen: &Seen<'_>, words: &Words, options: &SessionPlot, offer: Offer) -> Self {
        let (w, h) = (f64::from(options.width), f64::from(options.height));
        let body = body_size(w, h, RATIO);
        let (edge, size) = (edge(body), tick_size(body));
        let beside = stands_beside(w, h);
        let margin_width = if beside { (0.25 * w).clamp(18.0 * body, 23.0 * body) } else { w - 2.0 * edge };
        let has_strip = offer.strip && seen.has_strip;
        let strip_height = if has_strip { STRIP_LINES * body } else { 0.0 };

        // From left to right: labels, panels, labels of depths, margin.
        let flow =
            Scale::new(options.units.flow(seen.flows.0), options.units.flow(seen.flows.1), strip_height, 0.0);
        let flow_ticks = if has_strip { flow.ticks(|_| 1.6 * size) } else { none() };
        let depths = (depth(&options.units, seen.depths.0), depth(&options.units, seen.depths.1));
        let depth_scale = Scale::new(depths.0, depths.1, 0.0, strip_height);
        let has_depth = has_strip && seen.depth.is_some();
        let depth_ticks = if has_depth { depth_scale.ticks(|_| 1.6 * size) } else { none() };
        let po2_label = width("0.00", size, Weight::Regular);
        let left = edge + widest(&flow_ticks, body).max(po2_label).min(0.2 * w) + 0.7 * body;
        let depth_room = if has_depth { widest(&depth_ticks, body).min(0.15 * w) + 0.7 * body } else { 0.0 };
        let right = w - edge - if beside { margin_width + GUTTER * body } else { 0.5 * body } - depth_room;
        let x = Scale::new(seen.times.0, seen.times.1, left, right);

        let events = lanes::events(seen, words, &x, (left, right), body, offer.events);
        let segments = lanes::segments(seen, words, &x, (left, right), body, offer.segment_lines);
        let room = if beside { h - 2.0 * edge } else { MOST_BELOW * h };
        let margin = margin(words, seen, (segments, &events), (body, margin_width), (beside, room));

        // From the top: head, title of the axis, segments, PO2, events, strip with its title, labels of time.
        let heading = Heading { title: &words.name, about: &words.about, beside, body };
        let lane_top = heading.bottom() + 2.2 * body;
        let main_top = lane_top + lanes::segments_height(segments, words, body);
        let below = if beside { 0.0 } else { margin.y + 0.7 * body };
        let bottom = h - edge - below - label_room(body) - 1.35 * body;
        let strip_top = bottom - strip_height;
        let lane_bottom = if has_strip { strip_top - 2.2 * body } else { bottom };
        let main_bottom = lane_bottom - lanes::events_height(&events, body);
        let main = Frame { left, top: main_top, right, bottom: main_bottom.max(main_top + body) };
        let events_lane = Frame { top: main.bottom, bottom: lane_bottom.max(main.bottom), ..main };
        let strip = has_strip.then_some(Frame { top: strip_top, bottom, ..main });

        let po2 = Scale::new(seen.po2.0, seen.po2.1, main.bottom, main.top);
        let po2_ticks = po2.ticks(|_| (1.9 * size).max(main.height() / MOST_LABELS.1));
        let long = right - left;
        let time_ticks = clock::ticks(&x, long, |labels| apart(labels, body, long, MOST_LABELS.0));
        let segment_lines = match segments {
            Segments::Lines(variant) => words.segments.iter().map(|s| s.lines[variant].clone()).collect(),
            Segments::Lettered => Vec::new(),
        };
        let side = |low: f64, high: f64, from: f64, to: f64, ticks| Side {
            scale: Scale::new(low, high, from, to),
            ticks,
            labelled: true,
        };
        Self {
            width: w,
            height: h,
            body,
            transparent: options.transparent,
            x,
            po2,
            segments_lane: Frame { top: lane_top, bottom: main_top, ..main },
            main,
            events_lane,
            strip,
            flow: Scale::new(seen.flows.0, seen.flows.1, bottom, strip_top),
            depth: Scale::new(seen.depths.0, seen.depths.1, strip_top, bottom),
            segments,
            segment_lines,
            events,
            margin_width,
            beside,
            margin,
            po2_ticks,
            time_ticks,
            flow_side: side(flow.low, flow.high, bottom, strip_top, flow_ticks),
            depth_side: has_depth.then(|| side(depths.0, depths.1, strip_top, bottom, depth_ticks)),
        }
    }

    /// The middle of a row of the lane of events.
    pub(super) fn event_y(&self, row: usize) -> f64 {
        let high = lanes::ROW * tick_size(self.body).max(self.body);
        self.events_lane.top + 0.2 * self.body + (row as f64 + 0.5) * high
    }

    /// Name of the session and what it is.
    pub(super) fn draw_head(&self, svg: &mut Svg, words: &Words) {
        let right = if self.beside {
            self.width - edge(self.body) - self.margin_width - GUTTER * self.body
        } else {
            self.width - edge(self.body)
        };
        Heading { title: &words.name, about: &words.about, beside: self.beside, body: self.body }
            .draw(svg, right);
    }

    /// Grid, frames, ticks, labels and titles of the axes.
    pub(super) fn draw_axes(&self, svg: &mut Svg, words: &Words) {
        let time = |frame: Frame, labelled| Axes {
            frame,
            left: Side { scale: self.po2, ticks: self.po2_ticks.clone(), labelled: true },
            bottom: Side { scale: self.x, ticks: self.time_ticks.clone(), labelled },
            top: None,
            right: None,
        };
        let lane_is_last = self.strip.is_none() && self.events_lane.height() > 0.0;
        time(self.main, self.strip.is_none() && !lane_is_last).draw(svg, self.body, self.width);
        if lane_is_last {
            let mut lane = time(self.events_lane, true);
            lane.left.ticks = none();
            lane.draw(svg, self.body, self.width);
        }
        if let Some(strip) = self.strip {
            let mut axes = time(strip, true);
            axes.left = self.flow_side.clone();
            axes.right.clone_from(&self.depth_side);
            axes.draw(svg, self.body, self.width);
        }
        let (body, left) = (self.body, edge(self.body));
        let (right, lowest) = (self.main.right, self.strip.map_or(self.events_lane.bottom, |s| s.bottom));
        svg.group("plot-axis-titles", &[]);
        let y = self.segments_lane.top - 0.85 * body;
        title(svg, &words.po2_axis, (left, y), Anchor::Start, body, right - left);
        let y = lowest + label_room(body) + body;
        let middle = 0.5 * (self.main.left + right);
        title(svg, &words.time_axis, (middle, y), Anchor::Middle, body, right - left);
        if let Some(strip) = self.strip {
            let y = strip.top - 0.85 * body;
            let share = if self.depth_side.is_some() { 0.55 } else { 1.0 };
            title(svg, &words.flow_axis, (left, y), Anchor::Start, body, share * (right - left));
            if self.depth_side.is_some() {
                title(svg, &words.depth_axis, (right, y), Anchor::End, body, 0.4 * (right - left));
            }
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

const fn none() -> Ticks {
    Ticks { major: Vec::new(), minor: Vec::new() }
}
