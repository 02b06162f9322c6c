//! A setting: injection against depth, and injection at the surface against the intermediate pressure (IP).
//!
//! Comes in: a setting as worked out, and in words why there is none. Goes out: SVG text of both panels, one over the
//! other, or of either alone. Against depth: the best estimate and the curve of the lowest likely choke ratio for the
//! IP that is recommended (else judged, else the first there is), where one per cent, a tenth and everything is lost;
//! with a compensated first stage where the chance passes its limit and where the best estimates cross. Against IP: each
//! orifice's line, the richest and leanest injection of the one that is set, the IP to set under the band of another
//! day's uptake, and the IP never to exceed. Without a setting lines and band are drawn and nothing is marked as set.
//! Nothing is worked out here but the band, from the uptake's own uncertainty. Left out: drift, patency and the budget,
//! which are tables.

mod seen;
mod words;
mod signs;
mod layout;
mod margin;
mod depth_panel;
mod ip_panel;
mod small;

pub(super) use small::POINTS as SMALL_PLOT_POINTS;
pub use small::small_setting_plot;

use super::ink::PAPER;
use super::svg::{Head, Svg, tame_prefix};
use crate::report::Units;
use crate::setting::Setting;
use layout::Layout;
use seen::Seen;
use words::Words;

/// Smallest and largest width and height in pixels; beyond them the nearer end is taken.
const WIDTH: (u32, u32) = (400, 8000);
const HEIGHT: (u32, u32) = (320, 8000);
/// Least height of both panels together.
const LEAST_OF_BOTH: u32 = 480;

/// How a setting is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct SettingPlot {
    /// Width in pixels, 400 to 8000.
    pub width: u32,
    /// Height in pixels, 320 to 8000; of both panels together at least 480.
    pub height: u32,
    /// Put before every id, so that several plots can share a page: a letter, then letters, digits, `-`, `_`.
    pub id_prefix: String,
    /// Without the ground of paper.
    pub transparent: bool,
    /// The units of pressures, flows and depths.
    pub units: Units,
    /// Why there is no setting, in words; looked at only when there is none.
    pub why_not: Option<String>,
}

/// Which panels a picture has.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Panels {
    Both,
    Depth,
    Ip,
}

impl Panels {
    fn has_depth(self) -> bool {
        self != Self::Ip
    }

    fn has_ip(self) -> bool {
        self != Self::Depth
    }
}

/// Draws a setting against depth and against IP as SVG text. Numbers that are not finite are not drawn.
#[must_use]
pub fn setting_plot(setting: &Setting, options: &SettingPlot) -> String {
    let height = options.height.max(LEAST_OF_BOTH);
    plot(setting, &SettingPlot { height, ..options.clone() }, Panels::Both)
}

/// Draws the injection against depth alone.
#[must_use]
pub fn depth_plot(setting: &Setting, options: &SettingPlot) -> String {
    plot(setting, options, Panels::Depth)
}

/// Draws the injection at the surface against IP alone.
#[must_use]
pub fn ip_plot(setting: &Setting, options: &SettingPlot) -> String {
    plot(setting, options, Panels::Ip)
}

fn plot(setting: &Setting, options: &SettingPlot, panels: Panels) -> String {
    let options = &options.within_bounds();
    let seen = Seen::new(setting, options);
    let words = Words::new(setting, &seen, options, panels);
    let layout = Layout::new(&seen, &words, options, panels);
    let mut svg = Svg::new(&Head {
        width: layout.width,
        height: layout.height,
        id_prefix: &options.id_prefix,
        title: &words.title,
        description: &words.description,
    });
    if !options.transparent {
        let ground = [("class", "plot-paper"), ("fill", PAPER)];
        svg.rect(0.0, 0.0, layout.width, layout.height, &ground);
    }
    layout.draw_head(&mut svg, &words);
    if let Some(panel) = &layout.depth {
        panel.axes.draw(&mut svg, layout.body, layout.width);
        depth_panel::draw(&mut svg, &seen, &words, panel, &layout);
    }
    if let Some(panel) = &layout.ip {
        panel.axes.draw(&mut svg, layout.body, layout.width);
        ip_panel::draw(&mut svg, &seen, &words, panel, &layout);
    }
    layout.draw_titles(&mut svg, &words);
    layout.draw_margin(&mut svg);
    svg.finish()
}

impl Default for SettingPlot {
    fn default() -> Self {
        Self {
            width: 960,
            height: 800,
            id_prefix: "ebb".to_owned(),
            transparent: false,
            units: Units::default(),
            why_not: None,
        }
    }
}

impl SettingPlot {
    fn within_bounds(&self) -> Self {
        Self {
            width: self.width.clamp(WIDTH.0, WIDTH.1),
            height: self.height.clamp(HEIGHT.0, HEIGHT.1),
            id_prefix: tame_prefix(&self.id_prefix),
            ..self.clone()
        }
    }
}
