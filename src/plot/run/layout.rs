//! Where everything stands, and the axes.
//!
//! Comes in: the ranges, the size of the picture, how much room the margin wants. Goes out: a [`Layout`] in pixels,
//! and the frame with its ticks drawn. In a wide picture the margin is a column to the right of the panels, in a
//! narrow one it lies below them. Left out: what stands in the panels.

use super::RunPlot;
use super::margin::Margin;
use super::seen::Seen;
use super::words::Words;

use super::super::axis::{Scale, Ticks};
pub(super) use super::super::frame::Frame;
use super::super::ink::INK;
use super::super::letters::{Weight, shorten, width};
use super::super::number::{exponent, fixed};
use super::super::svg::{Anchor, Path, Svg, Text};

/// Share of the panels' height that the residual strip has.
const STRIP_SHARE: f64 = 0.25;

/// At most about so many labels on the pressure axes, the flow axis and the residual axis, however much room there is.
const MOST_LABELS: (f64, f64, f64) = (16.0, 12.0, 8.0);

/// Places in pixels.
pub(super) struct Layout {
    pub width: f64,
    pub height: f64,
    /// Size of body text; all distances are counted in it.
    pub body: f64,
    pub edge: f64,
    pub transparent: bool,
    /// Pressure to pixels, for both panels.
    pub x: Scale,
    /// Flow to pixels.
    pub flow: Scale,
    /// Residual to pixels.
    pub residual: Scale,
    pub main: Frame,
    pub strip: Frame,
    /// Baseline of the title.
    pub head_y: f64,
    /// Where the margin stands.
    pub margin: Frame,
    flow_ticks: Ticks,
    residual_ticks: Ticks,
    absolute_ticks: Ticks,
    gauge: Scale,
    gauge_ticks: Ticks,
}

/// The size of body text in a picture of this size: 12 px in one of 960 by 720, and never under 9 px.
pub(super) fn body_size(options: &RunPlot) -> f64 {
    let (w, h) = (f64::from(options.width), f64::from(options.height));
    let smaller = w.min(4.0 / 3.0 * h) / 960.0;
    (12.0 * smaller.sqrt()).max(9.0)
}

/// Distance from the edge of the picture to what stands in it.
pub(super) fn edge(body: f64) -> f64 {
    1.6 * body
}

impl Layout {
    pub(super) fn new(seen: &Seen, margin: &Margin, options: &RunPlot) -> Self {
        let (width_px, height) = (f64::from(options.width), f64::from(options.height));
        let body = body_size(options);
        let edge = edge(body);
        let beside = margin.beside;
        // From the top: title, axis titles, tick labels, main panel, title of the strip, strip, tick labels, title.
        let head_y = edge + 0.9 * margin.title_size();
        let titles = head_y + if beside { 2.2 * body } else { 0.5 * body };
        let top = titles + 1.5 * body + 2.1 * body;
        let below = if beside { edge } else { edge + margin.height + 0.7 * body };
        let bottom = height - below - 3.3 * body;
        let between = 2.5 * body;
        let panels = bottom - top - between;
        let strip_height = (STRIP_SHARE * panels).max((5.0 * body).min(0.4 * panels));
        let (main_bottom, strip_top) = (bottom - strip_height - between, bottom - strip_height);
        let right =
            if beside { width_px - edge - margin.width - 2.2 * body } else { width_px - edge - 0.5 * body };

        let flow = Scale::new(seen.flows.0, seen.flows.1, main_bottom, top);
        let residual = Scale::new(-seen.residual_reach, seen.residual_reach, bottom, strip_top);
        let flow_ticks = flow.ticks(|_| (2.2 * body).max((main_bottom - top) / MOST_LABELS.1));
        let room = (1.2 * tick_size(body)).max(strip_height / MOST_LABELS.2);
        let residual_ticks = strip_ticks(&residual, room);
        let labels = flow_ticks.major.iter().chain(&residual_ticks.major);
        let label_width = labels.map(|(_, l)| width(l, tick_size(body), Weight::Regular)).fold(0.0, f64::max);
        let left = edge + label_width.min(0.25 * width_px) + 0.7 * body;

        let x = Scale::new(seen.pressures.0, seen.pressures.1, left, right);
        let ambient = seen.shown.ambient();
        let gauge = Scale::new(seen.pressures.0 - ambient, seen.pressures.1 - ambient, left, right);
        let apart = |labels: &[(f64, String)]| {
            let widest = labels.iter().map(|(_, l)| width(l, tick_size(body), Weight::Regular));
            (widest.fold(0.0, f64::max) + 1.4 * body).max(4.0 * body).max((right - left) / MOST_LABELS.0)
        };
        let main = Frame { left, top, right, bottom: main_bottom };
        let strip = Frame { left, top: strip_top, right, bottom };
        let margin = if beside {
            Frame {
                left: width_px - edge - margin.width,
                top: edge,
                right: width_px - edge,
                bottom: height - edge,
            }
        } else {
            Frame {
                left: edge,
                top: height - edge - margin.height,
                right: width_px - edge,
                bottom: height - edge,
            }
        };
        Self {
            width: width_px,
            height,
            body,
            edge,
            transparent: options.transparent,
            flow,
            residual,
            main,
            strip,
            head_y,
            margin,
            flow_ticks,
            residual_ticks,
            absolute_ticks: x.ticks(apart),
            gauge_ticks: gauge.ticks(apart),
            x,
            gauge,
        }
    }

    /// Grid, frames, ticks, labels and titles of the axes.
    pub(super) fn draw_axes(&self, svg: &mut Svg, words: &Words) {
        self.draw_grid(svg);
        self.draw_ticks(svg);
        self.draw_labels(svg);
        self.draw_titles(svg, words);
    }

    fn draw_grid(&self, svg: &mut Svg) {
        let (main, strip) = (self.main, self.strip);
        let mut grid = Path::default();
        for (value, _) in &self.absolute_ticks.major {
            let x = self.x.at(*value);
            grid.stroke((x, main.top), (x, main.bottom)).stroke((x, strip.top), (x, strip.bottom));
        }
        for (scale, ticks) in [(&self.flow, &self.flow_ticks), (&self.residual, &self.residual_ticks)] {
            for (value, _) in &ticks.major {
                let y = scale.at(*value);
                grid.stroke((main.left, y), (main.right, y));
            }
        }
        svg.group(
            "plot-grid",
            &[("fill", "none"), ("stroke", INK), ("stroke-opacity", "0.09"), ("stroke-width", "0.8")],
        );
        svg.path(&grid, &[]);
        svg.end();
    }

    fn draw_ticks(&self, svg: &mut Svg) {
        let (main, strip) = (self.main, self.strip);
        let (long, small) = (0.42 * self.body, 0.22 * self.body);
        let mut path = Path::default();
        for frame in [main, strip] {
            path.move_to(frame.left, frame.top)
                .line_to(frame.right, frame.top)
                .line_to(frame.right, frame.bottom)
                .line_to(frame.left, frame.bottom)
                .close();
        }
        // Ticks point outward, where no mark of the panel can hide them.
        let mut upright = |scale: &Scale, ticks: &Ticks, y: f64, outward: f64| {
            for (value, _) in &ticks.major {
                path.stroke((scale.at(*value), y), (scale.at(*value), y + outward * long));
            }
            for value in &ticks.minor {
                path.stroke((scale.at(*value), y), (scale.at(*value), y + outward * small));
            }
        };
        upright(&self.gauge, &self.gauge_ticks, main.top, -1.0);
        upright(&self.x, &self.absolute_ticks, strip.bottom, 1.0);
        for (scale, ticks, finer) in
            [(&self.flow, &self.flow_ticks, true), (&self.residual, &self.residual_ticks, false)]
        {
            for (value, _) in &ticks.major {
                path.stroke((main.left, scale.at(*value)), (main.left - long, scale.at(*value)));
            }
            for value in ticks.minor.iter().filter(|_| finer) {
                path.stroke((main.left, scale.at(*value)), (main.left - small, scale.at(*value)));
            }
        }
        svg.group("plot-axes", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
        svg.path(&path, &[]);
        svg.end();
    }

    fn draw_labels(&self, svg: &mut Svg) {
        let size = tick_size(self.body);
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
        for (scale, ticks) in [(&self.flow, &self.flow_ticks), (&self.residual, &self.residual_ticks)] {
            for (value, text) in &ticks.major {
                label(text, self.main.left - 0.65 * self.body, scale.at(*value) + 0.36 * size, Anchor::End);
            }
        }
        let rows = [
            (&self.gauge, &self.gauge_ticks, self.main.top - 0.75 * self.body),
            (&self.x, &self.absolute_ticks, self.strip.bottom + 1.55 * self.body),
        ];
        for (scale, ticks, y) in rows {
            for (value, text) in &ticks.major {
                let (x, half) = (scale.at(*value), width(text, size, Weight::Regular) / 2.0);
                if x - half >= 2.0 && x + half <= self.width - 2.0 {
                    label(text, x, y, Anchor::Middle);
                }
            }
        }
        svg.end();
    }

    fn draw_titles(&self, svg: &mut Svg, words: &Words) {
        let size = self.body;
        svg.group("plot-axis-titles", &[]);
        let mut title = |text: &str, x: f64, y: f64, anchor: Anchor| {
            svg.text(&Text {
                x,
                y,
                size,
                anchor,
                fill: INK,
                muted: false,
                class: "plot-axis-title",
                pieces: &[(text, Weight::Regular)],
            });
        };
        let fitting = |choice: &[String; 2], room: f64| {
            let fits = |text: &&String| width(text, size, Weight::Regular) <= room;
            match choice.iter().find(fits) {
                Some(text) => text.clone(),
                None => shorten(&choice[1], size, Weight::Regular, room),
            }
        };
        let (left, right) = (self.edge, self.main.right);
        let y = self.main.top - 2.35 * size;
        let flow = fitting(&words.flow_axis, 0.45 * (right - left));
        let room = right - left - width(&flow, size, Weight::Regular) - 2.0 * size;
        title(&flow, left, y, Anchor::Start);
        title(&fitting(&words.gauge_axis, room), right, y, Anchor::End);
        let middle = (self.main.left + right) / 2.0;
        let pressure = fitting(&words.pressure_axis, self.main.width());
        title(&pressure, middle, self.strip.bottom + 3.05 * size, Anchor::Middle);
        let residual = fitting(&words.residual_axis, self.main.width());
        title(&residual, left, self.strip.top - 0.8 * size, Anchor::Start);
        svg.end();
    }
}

/// The ticks of a strip about nought: at least three, where round steps leave fewer.
fn strip_ticks(residual: &Scale, room: f64) -> Ticks {
    let ticks = residual.ticks(|_| room);
    if ticks.major.len() >= 3 {
        return ticks;
    }
    let power = exponent(0.95 * residual.high);
    let unit = 10f64.powi(power);
    let digit = [8.0, 6.0, 5.0, 4.0, 3.0, 2.0, 1.0].into_iter().find(|d| d * unit <= 0.95 * residual.high);
    let reach = digit.unwrap_or(1.0) * unit;
    let label = |value: f64| (value, fixed(value, (-power).clamp(0, 12) as usize));
    Ticks { major: [-reach, 0.0, reach].map(label).to_vec(), minor: Vec::new() }
}

/// Size of the labels of ticks.
fn tick_size(body: f64) -> f64 {
    (0.92 * body).max(9.0)
}
