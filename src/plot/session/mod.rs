//! A couch or pool session: oxygen partial pressure against elapsed time, what was read from it and what was not.
//!
//! Comes in: a session, its uptake as worked out, and in words why there is none. Goes out: SVG text. From the top:
//! the segments with what each says, PO2 with the cells faint and the mean of the agreeing ones strong, each segment's
//! fitted slope over its span, stretches left out hatched by reason, the floor and ceiling of the place; below it the
//! events, each with its own sign and dash; and where the injection changes or a depth was read, both as a strip.
//! Nothing is worked out here but where a fitted slope lies in PO2 and the purity in a stated flow. Left out: the
//! budget, the interval of another day, and what would have helped, which are tables.

mod clock;
mod stretches;
mod fitted;
mod trace;
mod seen;
mod words;
mod signs;
mod lanes;
mod layout;
mod margin;
mod panel;
mod labels;
mod strip;

use super::ink::PAPER;
use super::svg::{Head, Svg, tame_prefix};
use crate::entry::Session;
use crate::report::Units;
use crate::uptake::SessionUptake;
use layout::Layout;
use seen::Seen;
use words::Words;

/// Smallest and largest width and height in pixels; beyond them the nearer end is taken.
const WIDTH: (u32, u32) = (400, 8000);
const HEIGHT: (u32, u32) = (320, 8000);

/// How a session is drawn.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionPlot {
    /// Width in pixels, 400 to 8000.
    pub width: u32,
    /// Height in pixels, 320 to 8000.
    pub height: u32,
    /// Put before every id, so that several plots can share a page: a letter, then letters, digits, `-`, `_`.
    pub id_prefix: String,
    /// Without the ground of paper.
    pub transparent: bool,
    /// The units of pressures (of the first stage), flows and depths; PO2 is always in bar.
    pub units: Units,
    /// What the session is called: its id in the book, or its file.
    pub name: String,
    /// First and last second of each stretch that a person left out.
    pub left_out: Vec<(f64, f64)>,
    /// Why there is no number, in words; looked at only when there is none.
    pub why_not: Option<String>,
}

/// Draws a session as SVG text.
///
/// `uptake` must be that of `session`. Numbers that are not finite are not drawn.
#[must_use]
pub fn session_plot(session: &Session, uptake: &SessionUptake, options: &SessionPlot) -> String {
    let options = &options.within_bounds();
    let seen = Seen::new(session, uptake, options);
    let words = Words::new(session, uptake, &seen, options);
    let layout = Layout::new(&seen, &words, options);
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
    panel::draw(&mut svg, &seen, &layout);
    strip::draw(&mut svg, &seen, &layout);
    layout.draw_axes(&mut svg, &words);
    lanes::draw(&mut svg, &seen, &layout);
    labels::draw(&mut svg, &seen, &words, &layout);
    layout.draw_margin(&mut svg);
    svg.finish()
}

impl Default for SessionPlot {
    fn default() -> Self {
        Self {
            width: 960,
            height: 640,
            id_prefix: "ebb".to_owned(),
            transparent: false,
            units: Units::default(),
            name: String::new(),
            left_out: Vec::new(),
            why_not: None,
        }
    }
}

impl SessionPlot {
    fn within_bounds(&self) -> Self {
        Self {
            width: self.width.clamp(WIDTH.0, WIDTH.1),
            height: self.height.clamp(HEIGHT.0, HEIGHT.1),
            id_prefix: tame_prefix(&self.id_prefix),
            ..self.clone()
        }
    }
}
