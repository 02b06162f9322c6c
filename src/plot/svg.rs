//! The text of an SVG picture, element by element.
//!
//! Comes in: shapes in pixels, texts. Goes out: well-formed SVG 1.1 whose texts are escaped and cleaned. Left out:
//! where anything goes.

use super::ink::INK;
use super::letters::{Weight, clean};
use super::number::coordinate;

/// The font of all texts, by the name of the one that goes with the program; the others have letters of nearly the
/// same width, or narrower ones.
const FONT: &str = "DejaVu Sans, Verdana, sans-serif";

/// A picture being written.
pub(super) struct Svg {
    out: String,
    open: Vec<&'static str>,
}

/// What a picture says of itself.
pub(super) struct Head<'a> {
    pub width: f64,
    pub height: f64,
    /// Put before every id.
    pub id_prefix: &'a str,
    pub title: &'a str,
    pub description: &'a str,
}

/// On which side of its place a text stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    Start,
    Middle,
    End,
}

/// A text on one line.
pub(super) struct Text<'a> {
    pub x: f64,
    /// Of the baseline.
    pub y: f64,
    pub size: f64,
    pub anchor: Anchor,
    pub fill: &'static str,
    /// Quieter than the rest.
    pub muted: bool,
    pub class: &'static str,
    pub pieces: &'a [(&'a str, Weight)],
}

/// The `d` of a path.
#[derive(Debug, Default)]
pub(super) struct Path(String);

impl Svg {
    pub(super) fn new(head: &Head<'_>) -> Self {
        let (w, h) = (coordinate(head.width), coordinate(head.height));
        let id = head.id_prefix;
        let mut svg = Self { out: String::with_capacity(16_384), open: Vec::new() };
        svg.out.push_str(&format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" version=\"1.1\" id=\"{id}-plot\" class=\"plot\" \
             width=\"{w}\" height=\"{h}\" viewBox=\"0 0 {w} {h}\" role=\"img\" \
             aria-labelledby=\"{id}-title {id}-desc\" font-family=\"{FONT}\" fill=\"{INK}\">\n"
        ));
        svg.out.push_str(&format!("<title id=\"{id}-title\">{}</title>\n", escape(&clean(head.title))));
        svg.out.push_str(&format!("<desc id=\"{id}-desc\">{}</desc>\n", escape(&clean(head.description))));
        svg
    }

    /// Ends the picture.
    pub(super) fn finish(mut self) -> String {
        while !self.open.is_empty() {
            self.end();
        }
        self.out.push_str("</svg>\n");
        self.out
    }

    /// Begins a group whose attributes hold for what follows, up to [`Svg::end`].
    pub(super) fn group(&mut self, class: &'static str, attributes: &[(&str, &str)]) {
        self.out.push_str(&format!("<g class=\"{class}\""));
        self.attributes(attributes);
        self.out.push_str(">\n");
        self.open.push("g");
    }

    /// Another whole picture of this room, at the place of the group it stands in.
    pub(super) fn inside(&mut self, picture: &str) {
        self.out.push_str(picture);
    }

    /// Ends the innermost group.
    pub(super) fn end(&mut self) {
        if let Some(tag) = self.open.pop() {
            self.out.push_str(&format!("</{tag}>\n"));
        }
    }

    pub(super) fn rect(&mut self, x: f64, y: f64, width: f64, height: f64, attributes: &[(&str, &str)]) {
        self.out.push_str(&format!(
            "<rect x=\"{}\" y=\"{}\" width=\"{}\" height=\"{}\"",
            coordinate(x),
            coordinate(y),
            coordinate(width.max(0.0)),
            coordinate(height.max(0.0))
        ));
        self.attributes(attributes);
        self.out.push_str("/>\n");
    }

    /// A path; nothing at all when it is empty.
    pub(super) fn path(&mut self, path: &Path, attributes: &[(&str, &str)]) {
        if !path.0.is_empty() {
            self.out.push_str(&format!("<path d=\"{}\"", path.0));
            self.attributes(attributes);
            self.out.push_str("/>\n");
        }
    }

    /// A path that says what it is when pointed at.
    pub(super) fn path_with_title(&mut self, path: &Path, title: &str) {
        self.out.push_str(&format!(
            "<path d=\"{}\"><title>{}</title></path>\n",
            path.0,
            escape(&clean(title))
        ));
    }

    pub(super) fn text(&mut self, text: &Text<'_>) {
        self.out.push_str(&format!(
            "<text class=\"{}\" x=\"{}\" y=\"{}\" font-size=\"{}\"",
            text.class,
            coordinate(text.x),
            coordinate(text.y),
            coordinate(text.size)
        ));
        match text.anchor {
            Anchor::Start => {}
            Anchor::Middle => self.attributes(&[("text-anchor", "middle")]),
            Anchor::End => self.attributes(&[("text-anchor", "end")]),
        }
        if text.fill != INK {
            self.attributes(&[("fill", text.fill)]);
        }
        if text.muted {
            self.attributes(&[("fill-opacity", "0.72")]);
        }
        self.out.push('>');
        for (piece, weight) in text.pieces {
            let piece = escape(piece);
            match weight {
                Weight::Regular => self.out.push_str(&piece),
                Weight::Bold => {
                    self.out.push_str(&format!("<tspan font-weight=\"bold\">{piece}</tspan>"));
                }
            }
        }
        self.out.push_str("</text>\n");
    }

    fn attributes(&mut self, attributes: &[(&str, &str)]) {
        for (name, value) in attributes {
            self.out.push_str(&format!(" {name}=\"{value}\""));
        }
    }
}

impl Path {
    pub(super) fn move_to(&mut self, x: f64, y: f64) -> &mut Self {
        self.step('M', x, y)
    }

    pub(super) fn line_to(&mut self, x: f64, y: f64) -> &mut Self {
        self.step('L', x, y)
    }

    /// A stroke from one place to another.
    pub(super) fn stroke(&mut self, from: (f64, f64), to: (f64, f64)) -> &mut Self {
        self.move_to(from.0, from.1).line_to(to.0, to.1)
    }

    pub(super) fn close(&mut self) -> &mut Self {
        self.0.push('Z');
        self
    }

    /// A whole circle.
    pub(super) fn circle(&mut self, x: f64, y: f64, r: f64) -> &mut Self {
        let radius = coordinate(r);
        self.move_to(x - r, y);
        for end in [x + r, x - r] {
            self.0.push_str(&format!("A{radius} {radius} 0 1 1 {} {}", coordinate(end), coordinate(y)));
        }
        self.close()
    }

    fn step(&mut self, letter: char, x: f64, y: f64) -> &mut Self {
        self.0.push_str(&format!("{letter}{} {}", coordinate(x), coordinate(y)));
        self
    }
}

/// Text in which the five characters that mean something to XML no longer do.
fn escape(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            c => out.push(c),
        }
    }
    out
}

/// A prefix that makes an id of whatever follows it: a letter, then letters, digits, `-`, `_`; what is none becomes "ebb".
pub(super) fn tame_prefix(prefix: &str) -> String {
    let tame: String =
        prefix.chars().filter(|c| c.is_ascii_alphanumeric() || matches!(c, '-' | '_')).collect();
    if tame.starts_with(|c: char| c.is_ascii_alphabetic()) { tame } else { "ebb".to_owned() }
}
