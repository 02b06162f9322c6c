//! The history of an orifice: its flow at the nominal pressure, run by run, against the date each was taken.
//!
//! Comes in: accepted runs as plain data, with their limits, verdicts and E_n as they were judged, and a trend worked
//! out elsewhere. Goes out: SVG text. An orifice that slowly clogs or wears is seen here before it fails: in a trend
//! toward the limits, and in a step from one run to the next that their uncertainties do not explain. Bars are the
//! whole expanded uncertainty of each run, 95 %. Limits are drawn as each run was judged by them; between two runs
//! judged by different limits nothing is drawn, because nobody recorded when they changed. Dates are those of the
//! record, each in its own offset. Nothing is worked out here but the change from one run to the next. Left out:
//! fitting a trend; runs in another gas or at another pressure, of which only the number is said.

mod dates;
mod seen;
mod words;
mod layout;
mod marks;
mod panel;
mod labels;
mod legend;
mod margin;

use chrono::{DateTime, FixedOffset};

use super::ink::PAPER;
use super::svg::{Head, Svg, tame_prefix};
use crate::bench::Verdict;
use crate::entry::Purpose;
use crate::gas::Species;
use crate::report::Units;
use layout::Layout;
use margin::Margin;
use seen::Seen;
use words::Words;

/// Smallest and largest width and height in pixels; beyond them the nearer end is taken.
const WIDTH: (u32, u32) = (400, 8000);
const HEIGHT: (u32, u32) = (320, 8000);

/// An accepted run of an orifice.
#[derive(Debug, Clone, PartialEq)]
pub struct HistoryRun {
    /// Its name in the book.
    pub name: String,
    /// When it was taken.
    pub taken: DateTime<FixedOffset>,
    /// Flow at the nominal pressure, L/min STPD.
    pub flow_l_min: f64,
    /// Its expanded uncertainty for 95 %, L/min STPD.
    pub expanded_l_min: f64,
    /// Lower and upper limit it was judged by, L/min STPD in the gas of the run; none when there were none.
    pub limits_l_min: Option<(f64, f64)>,
    /// Its verdict.
    pub verdict: Verdict,
    /// E_n of its flow against the run before it in the history; none when not compared.
    pub en: Option<f64>,
    /// Why it was made.
    pub purpose: Purpose,
}

/// A straight trend of the flow over time.
#[derive(Debug, Clone, PartialEq)]
pub struct Trend {
    /// How many runs it goes through.
    pub runs: usize,
    /// When the first of them was taken.
    pub from: DateTime<FixedOffset>,
    /// When the last of them was taken.
    pub to: DateTime<FixedOffset>,
    /// Change in a year as a share of the flow; negative when the flow falls.
    pub per_year_share: f64,
    /// Its expanded uncertainty for 95 %.
    pub per_year_expanded: f64,
    /// The line with the half-width of its band: at least two dates, as many as the curve of the band needs; those
    /// after `to` are drawn as looked ahead.
    pub line: Vec<TrendPlace>,
    /// When the trend would leave the limits of the latest run, if it would.
    pub leaves: Option<Leaving>,
}

/// A trend at one date.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TrendPlace {
    /// The date.
    pub at: DateTime<FixedOffset>,
    /// The line, L/min STPD.
    pub flow_l_min: f64,
    /// Half the width of its 95 % band, L/min STPD.
    pub expanded_l_min: f64,
}

/// When a trend leaves the limits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Leaving {
    /// The line itself.
    pub about: DateTime<FixedOffset>,
    /// The first edge of its 95 % band, if known.
    pub not_before: Option<DateTime<FixedOffset>>,
}

/// What is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct History<'a> {
    /// Name of the orifice.
    pub orifice: &'a str,
    /// The gas of the runs.
    pub gas: Species,
    /// The nominal pressure, bar gauge.
    pub ip_bar: f64,
    /// The accepted runs in that gas at that pressure; drawn in the order of their dates.
    pub runs: &'a [HistoryRun],
    /// How many accepted runs in another gas or at another pressure are not among them.
    pub left_out: usize,
    /// The trend through the last of them.
    pub trend: Option<Trend>,
}

/// How a history is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct HistoryPlot {
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

/// Draws the history of an orifice as SVG text.
///
/// Numbers that are not finite are not drawn; a run whose flow is not is counted as not drawn.
#[must_use]
pub fn history_plot(history: &History<'_>, options: &HistoryPlot) -> String {
    let options = &options.within_bounds();
    let seen = Seen::new(history, options);
    let words = Words::new(history, &seen);
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
    panel::draw(&mut svg, &seen, &layout);
    labels::draw(&mut svg, &seen, &layout);
    margin.draw(&mut svg, &layout);
    svg.finish()
}

impl Default for HistoryPlot {
    fn default() -> Self {
        Self {
            width: 960,
            height: 480,
            id_prefix: "ebb".to_owned(),
            transparent: false,
            units: Units::default(),
        }
    }
}

impl HistoryPlot {
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
