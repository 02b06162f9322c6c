//! Where everything stands, and the axes.
//!
//! Comes in: the ranges, the size of the picture, how much room the margin wants. Goes out: a [`Layout`] in pixels,
//! and the frame with its ticks drawn. In a wide picture the margin is a column to the right of the panel, in a narrow
//! one it lies below. Left out: what stands in the panel.

use super::HistoryPlot;
use super::dates::{DateTicks, ticks};
use super::margin::Margin;
use super::seen::Seen;
use super::words::Words;

use super::super::axis::{Scale, Ticks};
pub(super) use super::super::frame::Frame;
use super::super::ink::INK;
use super::super::letters::{Weight, shorten, width};
use super::super::number::short;
use super::super::svg::{Anchor, Path, Svg, Text};

/// At most about so many labels on the axes of dates and of flows, however much room there is.
const MOST_LABELS: (f64, f64) = (14.0, 12.0);
/// Label and room beside it take at most this share of the width.
const MOST_LABEL_SHARE: f64 = 0.25;

/// Places in pixels.
pub(super) struct Layout {
    pub width: f64,
    pub height: f64,
    /// Size of body text; all distances are counted in it.
    pub body: f64,
    pub edge: f64,
    pub transparent: bool,
    /// Days to pixels.
    pub x: Scale,
    /// Flow to pixels.
    pub flow: Scale,
    pub panel: Frame,
    /// Baseline of the title.
    pub head_y: f64,
    /// Where the margin stands.
    pub margin: Frame,
    /// The limits of the latest run as they are written beside the panel: number and the middle of its text.
    pub limit_labels: Vec<(String, f64)>,
    flow_ticks: Ticks,
    date_ticks: DateTicks,
}

/// The size of body text in a picture of this size: 12 px in one of 960 by 480, and never under 9 px.
pub(super) fn body_size(options: &HistoryPlot) -> f64 {
    let smaller = f64::from(options.width).min(2.0 * f64::from(options.height)) / 960.0;
    (12.0 * smaller.sqrt()).max(9.0)
}

/// Distance from the edge of the picture to what stands in it.
pub(super) fn edge(body: f64) -> f64 {
    1.6 * body
}

/// Size of the labels of ticks and limits.
pub(super) fn tick_size(body: f64) -> f64 {
    (0.92 * body).max(9.0)
}

impl Layout {
    pub(super) fn new(seen: &Seen, margin: &Margin, options: &HistoryPlot) -> Self {
        let (width_px, height) = (f64::from(options.width), f64::from(options.height));
        let body = body_size(options);
        let (edge, size) = (edge(body), tick_size(body));
        let beside = margin.beside;
        // From the top: title, what it is, title of the flow axis, panel, labels of dates, months or years.
        let head_y = edge + 0.9 * margin.title_size();
        let titles = head_y + if beside { 2.2 * body } else { 0.5 * body };
        let top = titles + 2.0 * body;
        let below = if beside { edge } else { edge + margin.height + 0.8 * body };
        let bottom = height - below - 3.1 * body;

        let flow = Scale::new(seen.flows.0, seen.flows.1, bottom, top);
        let flow_ticks = if seen.marks.is_empty() {
            Ticks { major: Vec::new(), minor: Vec::new() }
        } else {
            flow.ticks(|_| (2.2 * body).max((bottom - top) / MOST_LABELS.1))
        };
        let widest = |labels: &mut dyn Iterator<Item = &str>| {
            labels
                .map(|l| width(l, size, Weight::Regular))
                .fold(0.0, f64::max)
                .min(MOST_LABEL_SHARE * width_px)
        };
        let left = edge + widest(&mut flow_ticks.major.iter().map(|(_, l)| l.as_str())) + 0.7 * body;
        let limit_labels = limit_labels(seen, &flow, size);
        let room = match widest(&mut limit_labels.iter().map(|(l, _)| l.as_str())) {
            wide if wide > 0.0 => wide + 0.5 * body,
            _ => 0.5 * body,
        };
        let right = room + if beside { edge + margin.width + 1.8 * body } else { edge };
        let right = width_px - right;

        let x = Scale::new(seen.days.0, seen.days.1, left, right);
        let apart = |labels: &[(f64, String)]| {
            let widest = labels.iter().map(|(_, l)| width(l, size, Weight::Regular)).fold(0.0, f64::max);
            (widest + 1.1 * body).max((right - left) / MOST_LABELS.0)
        };
        let fits = |label: &str, room: f64| width(label, size, Weight::Regular) + 0.8 * body <= room;
        let date_ticks = if seen.marks.is_empty() { DateTicks::default() } else { ticks(&x, apart, fits) };
        let margin_top = if beside { edge } else { height - edge - margin.height };
        let margin_left = if beside { width_px - edge - margin.width } else { edge };
        Self {
            width: width_px,
            height,
            body,
            edge,
            transparent: options.transparent,
            x,
            flow,
            panel: Frame { left, top, right, bottom },
            head_y,
            margin: Frame {
                left: margin_left,
                top: margin_top,
                right: width_px - edge,
                bottom: height - edge,
            },
            limit_labels,
            flow_ticks,
            date_ticks,
        }
    }

    /// Grid, frame, ticks, labels and title of the axes.
    pub(super) fn draw_axes(&self, svg: &mut Svg, words: &Words) {
        self.draw_grid(svg);
        self.draw_ticks(svg);
        self.draw_labels(svg);
        self.draw_title(svg, words);
    }

    fn draw_grid(&self, svg: &mut Svg) {
        let panel = self.panel;
        let mut grid = Path::default();
        for (day, _) in &self.date_ticks.major {
            grid.stroke((self.x.at(*day), panel.top), (self.x.at(*day), panel.bottom));
        }
        for (value, _) in &self.flow_ticks.major {
            grid.stroke((panel.left, self.flow.at(*value)), (panel.right, self.flow.at(*value)));
        }
        svg.group(
            "plot-grid",
            &[("fill", "none"), ("stroke", INK), ("stroke-opacity", "0.09"), ("stroke-width", "0.8")],
        );
        svg.path(&grid, &[]);
        svg.end();
    }

    fn draw_ticks(&self, svg: &mut Svg) {
        let panel = self.panel;
        let (long, small) = (0.42 * self.body, 0.22 * self.body);
        let mut path = Path::default();
        path.move_to(panel.left, panel.top)
            .line_to(panel.right, panel.top)
            .line_to(panel.right, panel.bottom)
            .line_to(panel.left, panel.bottom)
            .close();
        // Ticks point outward, where no mark of the panel can hide them.
        let (days, flows) = (&self.date_ticks, &self.flow_ticks);
        let down = days.major.iter().map(|t| (t.0, long)).chain(days.minor.iter().map(|t| (*t, small)));
        for (day, length) in down {
            path.stroke((self.x.at(day), panel.bottom), (self.x.at(day), panel.bottom + length));
        }
        let aside = flows.major.iter().map(|t| (t.0, long)).chain(flows.minor.iter().map(|t| (*t, small)));
        for (value, length) in aside {
            path.stroke((panel.left, self.flow.at(value)), (panel.left - length, self.flow.at(value)));
        }
        // Months or years of the lower row are parted by strokes.
        let (from, to) = (panel.bottom + 1.95 * self.body, panel.bottom + 2.9 * self.body);
        for period in days.periods.iter().filter(|p| p.from > self.x.low) {
            path.stroke((self.x.at(period.from), from), (self.x.at(period.from), to));
        }
        svg.group("plot-axes", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
        svg.path(&path, &[]);
        svg.end();
    }

    fn draw_labels(&self, svg: &mut Svg) {
        let size = tick_size(self.body);
        svg.group("plot-tick-labels", &[]);
        let mut label = |text: &str, x: f64, y: f64, anchor: Anchor, class: &'static str| {
            svg.text(&Text {
                x,
                y,
                size,
                anchor,
                fill: INK,
                muted: class == "plot-period",
                class,
                pieces: &[(text, Weight::Regular)],
            });
        };
        for (value, text) in &self.flow_ticks.major {
            let (x, y) = (self.panel.left - 0.65 * self.body, self.flow.at(*value) + 0.36 * size);
            label(text, x, y, Anchor::End, "plot-tick-label");
        }
        for (day, text) in &self.date_ticks.major {
            let (x, half) = (self.x.at(*day), width(text, size, Weight::Regular) / 2.0);
            if x - half >= 2.0 && x + half <= self.width - 2.0 {
                label(text, x, self.panel.bottom + 1.55 * self.body, Anchor::Middle, "plot-tick-label");
            }
        }
        for period in &self.date_ticks.periods {
            let middle = (self.x.at(period.from) + self.x.at(period.to)) / 2.0;
            label(&period.label, middle, self.panel.bottom + 2.8 * self.body, Anchor::Middle, "plot-period");
        }
        for (text, middle) in &self.limit_labels {
            let (x, y) = (self.panel.right + 0.5 * self.body, middle + 0.36 * size);
            label(text, x, y, Anchor::Start, "plot-limit");
        }
        svg.end();
    }

    fn draw_title(&self, svg: &mut Svg, words: &Words) {
        let size = self.body;
        let room = self.panel.right - self.edge;
        let fits = |text: &&String| width(text, size, Weight::Regular) <= room;
        let text = match words.flow_axis.iter().find(fits) {
            Some(text) => text.clone(),
            None => shorten(&words.flow_axis[2], size, Weight::Regular, room),
        };
        svg.group("plot-axis-titles", &[]);
        svg.text(&Text {
            x: self.edge,
            y: self.panel.top - 0.8 * size,
            size,
            anchor: Anchor::Start,
            fill: INK,
            muted: false,
            class: "plot-axis-title",
            pieces: &[(&text, Weight::Regular)],
        });
        svg.end();
    }
}

/// The limits of the latest run that lie in the panel; two that would touch are moved apart.
fn limit_labels(seen: &Seen, flow: &Scale, size: f64) -> Vec<(String, f64)> {
    let Some((low, high)) = seen.latest_limits() else { return Vec::new() };
    let mut labels: Vec<(String, f64)> =
        [high, low].into_iter().filter(|l| seen.shows(*l)).map(|l| (short(l), flow.at(l))).collect();
    if let [upper, lower] = labels.as_mut_slice() {
        let lacking = (1.3 * size - (lower.1 - upper.1)).max(0.0);
        upper.1 -= lacking / 2.0;
        lower.1 += lacking / 2.0;
    }
    labels
}
