//! Both panels side by side, small, without head, legend and margin: for the sheet, whose words stand beside them.
//!
//! Comes in: a setting and the height there is. Goes out: SVG text as wide as the sheet's other drawings, with labels of 6.5
//! points at that size. Labels inside the panels stand where there is room, and are left out where there is none: every number
//! of theirs stands in the sheet's words. Left out: the upper axes (ambient pressure, psi), which are in the tables.

use super::layout::{Layout, Panel};
use super::seen::Seen;
use super::words::Words;
use super::{Panels, SettingPlot, depth_panel, ip_panel};

use super::super::axes::{Axes, Side, apart, label_room, tick_size, title, widest};
use super::super::axis::Scale;
use super::super::card::CARD_WIDTH;
use super::super::frame::Frame;
use super::super::svg::{Anchor, Head, Svg};
use crate::setting::Setting;

/// Size of body text in pixels; labels of ticks have the least size there is, 9 pixels.
const BODY: f64 = 9.8;
/// Points to a pixel, so that 9 pixels are 6.5 points.
pub(in super::super) const POINTS: f64 = 6.5 / 9.0;
/// At most about so many labels on level axes and on upright ones.
const MOST_LABELS: (f64, f64) = (7.0, 5.0);

/// Draws a setting against depth (left) and against IP (right), `height` points high at the width of the sheet.
#[must_use]
pub fn small_setting_plot(setting: &Setting, options: &SettingPlot, height: f64) -> String {
    let (w, h) = (CARD_WIDTH / POINTS, height / POINTS);
    let options = &options.within_bounds();
    let seen = Seen::new(setting, options);
    let words = Words::new(setting, &seen, options, Panels::Both);
    let mut layout = Layout::bare((w, h), BODY, options.transparent);
    let half = 0.5 * w;
    let depth = panel((0.0, half - BODY), h, seen.depths, seen.depth_flows);
    let ip = panel((half, w - 0.5 * BODY), h, seen.ips, seen.ip_flows);
    let mut svg = Svg::new(&Head {
        width: w,
        height: h,
        id_prefix: &options.id_prefix,
        title: &words.title,
        description: &words.description,
    });
    depth.axes.draw(&mut svg, BODY, half - 0.5 * BODY);
    depth_panel::draw(&mut svg, &seen, &words, &depth, &layout);
    ip.axes.draw(&mut svg, BODY, w);
    ip_panel::draw(&mut svg, &seen, &words, &ip, &layout);
    svg.group("plot-axis-titles", &[]);
    let size = tick_size(BODY);
    let (flow, surface) = (words.flow_axis.last(), words.surface_flow_axis.last());
    let (depth_of, ip_of) = (words.depth_axis.last(), words.ip_axis.last());
    let against = |flow: Option<&String>, place: &str, of: Option<&String>| {
        let (flow, of) = (flow.map_or("", String::as_str), of.map_or("", String::as_str));
        [
            format!("injection{place}, {flow}, against {of}"),
            format!("injection, {flow}, against {of}"),
            format!("{flow} against {of}"),
        ]
    };
    // One line says both axes: a title under each panel would take a third of its height.
    for (left, choice) in
        [(0.0, against(flow, "", depth_of)), (half, against(surface, " at the surface", ip_of))]
    {
        title(&mut svg, &choice, (left, 0.9 * size), Anchor::Start, size, half - BODY);
    }
    svg.end();
    layout.depth = Some(depth);
    layout.ip = Some(ip);
    svg.finish()
}

fn panel((left, right): (f64, f64), height: f64, x: (f64, f64), y: (f64, f64)) -> Panel {
    let size = tick_size(BODY);
    let (top, bottom) = (1.7 * size, height - label_room(BODY) - 1.0);
    let bottom = bottom.max(top + BODY);
    let upright = Scale::new(y.0, y.1, bottom, top);
    let ticks = upright.ticks(|_| (1.6 * size).max((bottom - top) / MOST_LABELS.1));
    let frame = Frame { left: left + widest(&ticks, BODY) + 0.9 * BODY, top, right, bottom };
    let level = Scale::new(x.0, x.1, frame.left, frame.right);
    let marks = level.ticks(|labels| apart(labels, BODY, frame.width(), MOST_LABELS.0));
    Panel {
        axes: Axes {
            frame,
            left: Side { scale: upright, ticks, labelled: true },
            bottom: Side { scale: level, ticks: marks, labelled: true },
            top: None,
            right: None,
        },
    }
}
