//! The plate of a bench run: flow against upstream pressure, the line with its band, the acceptance window, the
//! residuals below, and in the margin what it all comes to.
//!
//! Comes in: a run and its analysis. Goes out: SVG text. Points carry the expanded uncertainty (k = 2) of their
//! *random* part on both axes; the band is the line with random and common parts together, for 95 %. Residuals are
//! shares of the flow at the nominal pressure, as the limits of the checks are. Left out: the budget, the checks one
//! by one, and the answers asked for beside the nominal one, which are tables.

mod seen;
mod words;
mod layout;
mod marks;
mod flow_panel;
mod limits;
mod residual_strip;
mod margin;

use super::ink::PAPER;
use super::svg::{Head, Svg, tame_prefix};
use crate::bench::Analysis;
use crate::entry::Run;
use crate::report::Units;
use layout::Layout;
use margin::Margin;
use seen::Seen;
use words::Words;

/// Smallest and largest width and height in pixels; beyond them the nearer end is taken.
const WIDTH: (u32, u32) = (400, 8000);
const HEIGHT: (u32, u32) = (320, 8000);

/// How a run is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct RunPlot {
    /// Width in pixels, 400 to 8000.
    pub width: u32,
    /// Height in pixels, 320 to 8000.
    pub height: u32,
    /// Put before every id, so that several plots can share a page: a letter, then letters, digits, `-`, `_`.
    pub id_prefix: String,
    /// Without the ground of paper.
    pub transparent: bool,
    /// The units of pressures and flows.
    pub units: Units,
}

/// Draws an analysed run as SVG text.
///
/// `analysis` must be that of `run`. Numbers that are not finite are not drawn.
#[must_use]
pub fn run_plot(run: &Run, analysis: &Analysis, options: &RunPlot) -> String {
    let options = &options.within_bounds();
    let seen = Seen::new(run, analysis, options);
    let words = Words::new(run, analysis, &seen);
    let margin = Margin::new(&words, &seen, options);
    let layout = Layout::new(&seen, &margin, options);
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
    margin.draw_head(&mut svg, &words, &layout);
    layout.draw_axes(&mut svg, &words);
    flow_panel::draw(&mut svg, &seen, analysis, &layout);
    residual_strip::draw(&mut svg, &seen, analysis, &layout);
    margin.draw(&mut svg, &layout);
    svg.finish()
}

impl Default for RunPlot {
    fn default() -> Self {
        Self {
            width: 960,
            height: 720,
            id_prefix: "ebb".to_owned(),
            transparent: false,
            units: Units::default(),
        }
    }
}

impl RunPlot {
    fn within_bounds(&self) -> Self {
        Self {
            width: self.width.clamp(WIDTH.0, WIDTH.1),
            height: self.height.clamp(HEIGHT.0, HEIGHT.1),
            id_prefix: tame_prefix(&self.id_prefix),
            transparent: self.transparent,
            units: self.units,
        }
    }
}
