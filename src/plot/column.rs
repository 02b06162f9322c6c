//! Lines of text with signs beside them: the margin of a plate, beside the panels or below them.
//!
//! Comes in: texts and signs in the order they are read, the width there is. Goes out: them placed, with the height
//! they take. What a sign looks like is the caller's. Left out: what is said where there is too little room, which the
//! callers decide by trying.

use super::frame::Frame;
use super::ink::INK;
use super::letters::{Weight, shorten, width, wrap};
use super::svg::{Anchor, Svg, Text};

/// Distance of lines, in sizes of their text.
const LEADING: f64 = 1.32;
/// From the top of a line to its baseline, in sizes of its text.
const RISE: f64 = 0.93;
/// Room of a sign, in sizes of body text.
const SIGN_ROOM: f64 = 2.7;
/// A picture narrower than this, in pixels, or not wider than its height by this ratio, has its margin below.
const BESIDE_FROM: (f64, f64) = (700.0, 1.15);

/// How a line is set.
#[derive(Debug, Clone, Copy)]
pub(super) struct Style {
    pub size: f64,
    pub fill: &'static str,
    pub muted: bool,
    pub weight: Weight,
    pub class: &'static str,
}

/// A line of text; `y` is its baseline from the top of the column.
struct Line {
    x: f64,
    y: f64,
    style: Style,
    text: String,
}

/// Lines and signs, placed from the top downward.
pub(super) struct Column<S> {
    /// How far down it reaches.
    pub y: f64,
    pub body: f64,
    pub width: f64,
    lines: Vec<Line>,
    signs: Vec<(f64, f64, S)>,
}

/// Whether a picture of this size has its margin beside the panels.
pub(super) fn stands_beside(width: f64, height: f64) -> bool {
    width >= BESIDE_FROM.0 && width >= BESIDE_FROM.1 * height
}

/// The size of body text in a picture of this size: 12 px in one of 960 by 960/`ratio`, and never under 9 px.
pub(super) fn body_size(width: f64, height: f64, ratio: f64) -> f64 {
    let smaller = width.min(ratio * height) / 960.0;
    (12.0 * smaller.sqrt()).max(9.0)
}

/// Distance from the edge of the picture to what stands in it.
pub(super) fn edge(body: f64) -> f64 {
    1.6 * body
}

impl<S: Copy> Column<S> {
    pub(super) const fn new(body: f64, width: f64) -> Self {
        Self { y: 0.0, body, width, lines: Vec::new(), signs: Vec::new() }
    }

    pub(super) const fn plain(&self, class: &'static str) -> Style {
        Style { size: self.body, fill: INK, muted: false, weight: Weight::Regular, class }
    }

    pub(super) const fn muted(&self, class: &'static str) -> Style {
        Style { muted: true, ..self.plain(class) }
    }

    /// A text on as many lines as it needs, up to `most`.
    pub(super) fn paragraph(&mut self, text: &str, style: Style, most: usize) {
        // Lines are broken for regular letters; bold ones are wider.
        let lines = match style.weight {
            Weight::Regular => wrap(text, style.size, self.width, most),
            Weight::Bold => vec![shorten(text, style.size, Weight::Bold, self.width)],
        };
        for line in lines {
            self.line(line, style, 0.0);
        }
    }

    /// A bold text, and after it on the same line a regular one that runs on below.
    pub(super) fn led(&mut self, lead: &str, lead_style: Style, text: &str, style: Style, most: usize) {
        let lead = shorten(lead, lead_style.size, Weight::Bold, self.width);
        let bold = width(&format!("{lead}  "), lead_style.size, Weight::Bold);
        // The lines are broken as if the lead stood before them in no-break spaces.
        let spaces = (bold / width("\u{a0}", style.size, Weight::Regular)).ceil() as usize;
        let indent = "\u{a0}".repeat(spaces);
        let y = self.y + RISE * lead_style.size;
        self.lines.push(Line { x: 0.0, y, style: lead_style, text: lead });
        let lines = wrap(&format!("{indent}{text}"), style.size, self.width, most);
        for (i, line) in lines.into_iter().enumerate() {
            if i == 0 {
                let text = line.trim_start_matches('\u{a0}').to_owned();
                // A first word that does not fit beside the lead is nothing but indent and an ellipsis.
                if bold + width(&text, style.size, Weight::Regular) <= self.width {
                    self.lines.push(Line { x: bold, y, style, text });
                }
                self.y += LEADING * lead_style.size;
            } else {
                self.line(line, style, 0.0);
            }
        }
    }

    /// A sign with its text beside it.
    pub(super) fn entry(&mut self, sign: S, text: &str, most: usize) {
        let indent = SIGN_ROOM * self.body;
        self.signs.push((0.45 * indent, self.y + (RISE - 0.36) * self.body, sign));
        for line in wrap(text, self.body, self.width - indent, most) {
            self.line(line, self.plain("plot-legend"), indent);
        }
        self.y += 0.2 * self.body;
    }

    /// Signs with their texts in rows, each after the other.
    pub(super) fn rows(&mut self, entries: &[(S, String)]) {
        let (mut x, gap, indent) = (0.0, 1.2 * self.body, SIGN_ROOM * self.body);
        for (sign, text) in entries {
            let text = shorten(text, self.body, Weight::Regular, self.width - indent);
            let wide = indent + width(&text, self.body, Weight::Regular);
            if x > 0.0 && x + wide > self.width {
                x = 0.0;
                self.y += LEADING * self.body;
            }
            let y = self.y + RISE * self.body;
            self.signs.push((x + 0.45 * indent, y - 0.36 * self.body, *sign));
            self.lines.push(Line { x: x + indent, y, style: self.plain("plot-legend"), text });
            x += wide + gap;
        }
        if !entries.is_empty() {
            self.y += LEADING * self.body;
        }
    }

    pub(super) fn space(&mut self, lines: f64) {
        self.y += lines * self.body;
    }

    /// How many lines there are.
    pub(super) fn count(&self) -> usize {
        self.lines.len()
    }

    /// Moves the lines from the `first` on down to the foot of a column of this height.
    pub(super) fn move_to_foot(&mut self, first: usize, height: f64) {
        let spare = (height - self.y).max(0.0);
        self.lines.iter_mut().skip(first).for_each(|line| line.y += spare);
        self.y += spare;
    }

    /// Draws it with its upper left corner at a place.
    pub(super) fn draw(
        &self,
        svg: &mut Svg,
        (left, top): (f64, f64),
        sign: impl Fn(&mut Svg, S, (f64, f64)),
    ) {
        svg.group("plot-margin", &[]);
        for (x, y, what) in &self.signs {
            sign(svg, *what, (left + x, top + y));
        }
        for line in &self.lines {
            svg.text(&Text {
                x: left + line.x,
                y: top + line.y,
                size: line.style.size,
                anchor: Anchor::Start,
                fill: line.style.fill,
                muted: line.style.muted,
                class: line.style.class,
                pieces: &[(&line.text, line.style.weight)],
            });
        }
        svg.end();
    }

    fn line(&mut self, text: String, style: Style, x: f64) {
        self.lines.push(Line { x, y: self.y + RISE * style.size, style, text });
        self.y += LEADING * style.size;
    }
}

/// Title and what the picture is of: on two lines beside a margin, on one over it.
pub(super) struct Heading<'a> {
    pub title: &'a str,
    pub about: &'a str,
    pub beside: bool,
    pub body: f64,
}

impl Heading<'_> {
    fn title_size(&self) -> f64 {
        if self.beside { 1.55 * self.body } else { 1.3 * self.body }
    }

    /// Height it takes from the upper edge of the picture on.
    pub(super) fn bottom(&self) -> f64 {
        edge(self.body)
            + 1.2 * self.title_size()
            + if self.beside { 1.4 * self.body } else { 0.1 * self.body }
    }

    /// Draws it between the left edge of the picture and `right`.
    pub(super) fn draw(&self, svg: &mut Svg, right: f64) {
        let (size, body, left) = (self.title_size(), self.body, edge(self.body));
        let (room, y) = (right - left, left + 0.9 * size);
        let share = if self.beside { 1.0 } else { 0.5 };
        let title = shorten(self.title, size, Weight::Bold, share * room);
        let after = width(&title, size, Weight::Bold) + body;
        let (x, about_y, room) =
            if self.beside { (left, y + 1.5 * body, room) } else { (left + after, y, room - after) };
        let about = shorten(self.about, body, Weight::Regular, room);
        svg.group("plot-head", &[]);
        for (x, y, size, class, content, weight) in [
            (left, y, size, "plot-title", &title, Weight::Bold),
            (x, about_y, body, "plot-about", &about, Weight::Regular),
        ] {
            svg.text(&Text {
                x,
                y,
                size,
                anchor: Anchor::Start,
                fill: INK,
                muted: weight == Weight::Regular,
                class,
                pieces: &[(content, weight)],
            });
        }
        svg.end();
    }
}

/// Where the margin stands: beside the panels, or below them with this height.
pub(super) fn margin_frame(picture: (f64, f64), body: f64, beside: Option<f64>, below: f64) -> Frame {
    let edge = edge(body);
    let (right, bottom) = (picture.0 - edge, picture.1 - edge);
    match beside {
        Some(width) => Frame { left: right - width, top: edge, right, bottom },
        None => Frame { left: edge, top: bottom - below, right, bottom },
    }
}
