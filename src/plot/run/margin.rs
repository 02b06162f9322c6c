//! The margin: verdict, flow, choke ratio, legend and notes, beside the panels or below them.
//!
//! Comes in: the words, and what is drawn. Goes out: lines of text and signs, placed, with the room they take. Only
//! what is present is explained. Where there is too little room the notes are shortened first, then the other texts;
//! verdict, flow, choke ratio and legend always stay.

use super::RunPlot;
use super::flow_panel::in_view;
use super::layout::{Frame, Layout, body_size, edge};
use super::marks::{Cross, arrow, begin, cross_of, sign};
use super::residual_strip::beyond;
use super::seen::{Seen, Shape, Use};
use super::words::{Words, ip};

use super::super::frame::hatch;
use super::super::ink::{BRICK, INK, SAND, SEA_GLASS};
use super::super::letters::{Weight, clean, shorten, width, wrap};
use super::super::number::coordinate;
use super::super::svg::{Anchor, Path, Svg, Text};

/// A picture narrower than this, in pixels, or not wider than its height by this ratio, has its margin below.
const BESIDE_FROM: (f64, f64) = (700.0, 1.15);
/// Distance of lines, in sizes of their text.
const LEADING: f64 = 1.32;
/// Room of a sign in the legend, in sizes of body text.
const SIGN_ROOM: f64 = 2.7;
/// The margin below takes at most this share of the height, if leaving something out achieves it.
const MOST_BELOW: f64 = 0.28;

/// The margin with everything in it.
pub(super) struct Margin {
    /// Whether it stands beside the panels.
    pub beside: bool,
    pub width: f64,
    pub height: f64,
    body: f64,
    transparent: bool,
    lines: Vec<Line>,
    signs: Vec<Placed>,
}

/// A line of text; `y` is its baseline from the top of the margin.
struct Line {
    x: f64,
    y: f64,
    size: f64,
    fill: &'static str,
    muted: bool,
    class: &'static str,
    pieces: Vec<(String, Weight)>,
}

/// A sign of the legend; `y` is its middle.
struct Placed {
    x: f64,
    y: f64,
    sign: Sign,
}

/// What the legend can explain.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Sign {
    Point(Cross, Shape),
    Line,
    Window,
    Flow,
    Beyond,
}

/// How much is said.
#[derive(Debug, Clone, Copy)]
struct Fullness {
    /// Notes in full, else the short ones.
    notes: bool,
    reason_lines: usize,
    legend_lines: usize,
    brief: bool,
}

/// From all that there is to say to the least.
const FULLNESS: [Fullness; 4] = [
    Fullness { notes: true, reason_lines: 8, legend_lines: 4, brief: false },
    Fullness { notes: false, reason_lines: 8, legend_lines: 4, brief: false },
    Fullness { notes: false, reason_lines: 4, legend_lines: 2, brief: false },
    Fullness { notes: false, reason_lines: 2, legend_lines: 1, brief: true },
];

impl Margin {
    pub(super) fn new(words: &Words, seen: &Seen, options: &RunPlot) -> Self {
        let body = body_size(options);
        let (w, h) = (f64::from(options.width), f64::from(options.height));
        let legend = legend(words, seen);
        let room = h - 2.0 * edge(body);
        if w >= BESIDE_FROM.0 && w >= BESIDE_FROM.1 * h {
            let width = (0.24 * w).clamp(17.0 * body, 22.0 * body);
            let fits = FULLNESS
                .iter()
                .map(|fullness| Writer::beside(words, &legend, body, width, room, *fullness))
                .find(|writer| writer.y <= room);
            if let Some(writer) = fits {
                return writer.finish(true, room, options);
            }
        }
        let width = w - 2.0 * edge(body);
        let mut below = FULLNESS.iter().map(|fullness| Writer::below(words, &legend, body, width, *fullness));
        let least = Writer::below(words, &legend, body, width, FULLNESS[FULLNESS.len() - 1]);
        let writer = below.find(|writer| writer.y <= MOST_BELOW * h).unwrap_or(least);
        let height = writer.y;
        writer.finish(false, height, options)
    }

    /// Size of the title.
    pub(super) fn title_size(&self) -> f64 {
        if self.beside { 1.55 * self.body } else { 1.3 * self.body }
    }

    /// Title and what the run is, over the panels.
    pub(super) fn draw_head(&self, svg: &mut Svg, words: &Words, layout: &Layout) {
        let (size, body) = (self.title_size(), self.body);
        let right = if self.beside { layout.main.right } else { layout.width - layout.edge };
        let room = right - layout.edge;
        let share = if self.beside { 1.0 } else { 0.6 };
        let orifice = shorten(&words.orifice, size, Weight::Bold, share * room);
        let after = width(&orifice, size, Weight::Bold) + body;
        let (x, y, room) = if self.beside {
            (layout.edge, layout.head_y + 1.5 * body, room)
        } else {
            (layout.edge + after, layout.head_y, room - after)
        };
        svg.group("plot-head", &[]);
        let mut text = |x: f64, y: f64, size: f64, class, content: &str, weight| {
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
        };
        text(layout.edge, layout.head_y, size, "plot-title", &orifice, Weight::Bold);
        text(x, y, body, "plot-about", &shorten(&words.about, body, Weight::Regular, room), Weight::Regular);
        svg.end();
    }

    /// Draws the margin at its place.
    pub(super) fn draw(&self, svg: &mut Svg, layout: &Layout) {
        let (left, top) = (layout.margin.left, layout.margin.top);
        svg.group("plot-margin", &[]);
        for placed in &self.signs {
            self.draw_sign(svg, placed.sign, left + placed.x, top + placed.y);
        }
        for line in &self.lines {
            let pieces: Vec<(&str, Weight)> = line.pieces.iter().map(|(t, w)| (t.as_str(), *w)).collect();
            svg.text(&Text {
                x: left + line.x,
                y: top + line.y,
                size: line.size,
                anchor: Anchor::Start,
                fill: line.fill,
                muted: line.muted,
                class: line.class,
                pieces: &pieces,
            });
        }
        svg.end();
    }

    /// A sign centred at a place, as it is in the panels.
    fn draw_sign(&self, svg: &mut Svg, what: Sign, x: f64, y: f64) {
        let body = self.body;
        let half = 0.95 * body;
        match what {
            Sign::Point(cross, shape) => {
                let r = 0.4 * body;
                begin(svg, (cross, shape), r, self.transparent);
                svg.path(&sign((cross, shape), x, y, r), &[]);
                svg.end();
            }
            Sign::Line => {
                svg.group("plot-band", &[("fill", SAND)]);
                svg.rect(x - half, y - 0.38 * body, 2.0 * half, 0.76 * body, &[]);
                svg.end();
                let width = coordinate(0.14 * body);
                let mut path = Path::default();
                path.stroke((x - half, y), (x + half, y));
                svg.group("plot-line", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
                svg.path(&path, &[]);
                svg.end();
            }
            Sign::Window => {
                let mut path = Path::default();
                let (wide, high, lip) = (0.55 * body, 0.5 * body, 0.28 * body);
                for side in [-1.0, 1.0] {
                    path.move_to(x + side * (wide - lip), y - high)
                        .line_to(x + side * wide, y - high)
                        .line_to(x + side * wide, y + high)
                        .line_to(x + side * (wide - lip), y + high);
                    path.stroke((x + side * wide, y), (x + side * (wide + lip), y));
                }
                let width = coordinate(0.12 * body);
                svg.group("plot-limits", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
                svg.path(&path, &[]);
                svg.end();
            }
            Sign::Flow => {
                let (wide, high) = (0.75 * body, 0.34 * body);
                let frame = Frame { left: x - wide, top: y - high, right: x + wide, bottom: y + high };
                svg.group("plot-flow-at-nominal", &[("fill", "none"), ("stroke", INK)]);
                svg.path(&hatch(&frame, 0.28 * body), &[("stroke-width", "0.7")]);
                svg.rect(frame.left, frame.top, 2.0 * wide, 2.0 * high, &[("stroke-width", "1")]);
                svg.end();
            }
            Sign::Beyond => {
                svg.group("plot-beyond", &[("fill", "none"), ("stroke", INK), ("stroke-width", "1")]);
                svg.path(&arrow((x, y + 0.5 * body), (0.0, 1.0), 0.7 * body), &[]);
                svg.end();
            }
        }
    }
}

/// An entry of the legend.
struct Entry {
    sign: Sign,
    text: String,
    /// What stands for it where there is little room.
    brief: String,
}

/// The legend: what is there, and nothing else.
fn legend(words: &Words, seen: &Seen) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut add =
        |sign, text: String, brief: &str| entries.push(Entry { sign, text, brief: brief.to_owned() });
    let shape_of = |cross: Cross| seen.marks.iter().find(|m| cross_of(&m.how) == cross).map(|m| m.shape);
    let count = |cross: Cross| seen.marks.iter().filter(|m| cross_of(&m.how) == cross).count();
    for (shape, text) in [(Shape::Rising, "rising"), (Shape::Falling, "falling"), (Shape::Neither, "point")] {
        if seen.marks.iter().any(|m| m.how == Use::InTheLine && m.shape == shape) {
            add(Sign::Point(Cross::None, shape), text.to_owned(), text);
        }
    }
    if let Some(shape) = shape_of(Cross::Upright) {
        let n = count(Cross::Upright);
        let text = format!("not choked, not in the line ({n})");
        add(Sign::Point(Cross::Upright, shape), text, &format!("not choked ({n})"));
    }
    if let Some(shape) = shape_of(Cross::Slanting) {
        let text = left_out(seen);
        add(Sign::Point(Cross::Slanting, shape), text.clone(), &text);
    }
    let band = "line, 95\u{a0}% band";
    add(Sign::Line, format!("{band}; dashed beyond the points"), band);
    match (&words.acceptance, seen.window_in_view()) {
        (Some(text), Some(_)) => add(Sign::Window, text.clone(), "acceptance"),
        (Some(text), None) => add(Sign::Beyond, format!("{text}, beyond the panel"), "acceptance"),
        (None, _) => {}
    }
    if seen.nominal.is_some() {
        add(Sign::Flow, format!("flow at {} with its uncertainty", ip(seen)), "flow ±\u{a0}U");
    }
    if seen.marks.iter().any(|m| beyond(m, seen)) {
        add(Sign::Beyond, "beyond the strip, with its value".to_owned(), "beyond the strip");
    }
    if seen.marks.iter().any(|m| !in_view(m, seen)) {
        add(Sign::Beyond, "a point beyond the panel".to_owned(), "beyond the panel");
    }
    entries
}

/// The first reason, and how many points were left out.
fn left_out(seen: &Seen) -> String {
    let reasons: Vec<String> = seen
        .marks
        .iter()
        .filter_map(|m| match &m.how {
            Use::LeftOut(why) => Some(clean(why).trim().to_owned()),
            _ => None,
        })
        .collect();
    let first = reasons.first().map_or("", String::as_str);
    let first = if first.is_empty() { "no reason kept" } else { first };
    let others = reasons.iter().filter(|r| r.as_str() != first).count();
    match (reasons.len(), others) {
        (1, _) => format!("left out: {first}"),
        (n, 0) => format!("left out ({n}): {first}"),
        (n, _) => format!("left out ({n}), first: {first}"),
    }
}

/// Lines being written from the top downward.
struct Writer {
    y: f64,
    body: f64,
    width: f64,
    lines: Vec<Line>,
    signs: Vec<Placed>,
}

impl Writer {
    const fn new(body: f64, width: f64) -> Self {
        Self { y: 0.0, body, width, lines: Vec::new(), signs: Vec::new() }
    }

    /// A column beside the panels.
    fn beside(words: &Words, legend: &[Entry], body: f64, width: f64, room: f64, fullness: Fullness) -> Self {
        let mut w = Self::new(body, width);
        let fill = if words.bad { BRICK } else { INK };
        w.line(&words.verdict, 1.55 * body, fill, Weight::Bold, "plot-verdict");
        w.space(0.15);
        w.paragraph(&words.why, body, false, fullness.reason_lines, "plot-why");
        w.space(1.0);
        w.paragraph(&words.flow_head, body, true, 2, "plot-flow-head");
        w.paragraph(&words.flow, 1.15 * body, false, 2, "plot-flow");
        w.paragraph(&words.flow_detail, body, true, 2, "plot-flow-detail");
        if let Some(text) = &words.as_oxygen {
            w.paragraph(text, body, false, 2, "plot-as-oxygen");
        }
        w.space(1.0);
        w.paragraph("Choke ratio b", body, true, 1, "plot-choke-head");
        w.paragraph(&words.choke, 1.15 * body, false, 1, "plot-choke");
        w.paragraph(&words.choke_detail, body, true, 2, "plot-choke-detail");
        w.space(1.3);
        for entry in legend {
            w.entry(entry, fullness);
        }
        // The notes stand at the foot of the column.
        w.space(if fullness.notes { 1.5 } else { 0.3 });
        let first = w.lines.len();
        w.notes(words, fullness, 20);
        let spare = (room - w.y).max(0.0);
        w.lines[first..].iter_mut().for_each(|line| line.y += spare);
        w.y += spare;
        w
    }

    /// Rows below the panels.
    fn below(words: &Words, legend: &[Entry], body: f64, width: f64, fullness: Fullness) -> Self {
        let mut w = Self::new(body, width);
        w.verdict_row(words, fullness.reason_lines.min(3));
        // The reason of a verdict mostly says the flow already.
        let mut result = if words.why.contains(&words.flow) {
            format!("Flow of {}", words.flow_detail)
        } else {
            format!("{}: {}, {}", words.flow_head, words.flow, words.flow_detail)
        };
        if let Some(text) = &words.as_oxygen {
            result.push_str(&format!("; {text}"));
        }
        result.push_str(&format!(". Choke ratio\u{a0}b: {} ({}).", words.choke, words.choke_detail));
        w.paragraph(&result, body, false, 3, "plot-flow");
        w.space(0.5);
        w.rows(legend, fullness.brief);
        w.space(0.3);
        w.notes(words, fullness, 4);
        w
    }

    fn verdict_row(&mut self, words: &Words, most: usize) {
        let (size, fill) = (1.1 * self.body, if words.bad { BRICK } else { INK });
        // The bold word is the first of the text: the lines are broken as if they were narrower by its surplus.
        let verdict = format!("{}: ", words.verdict);
        let bold = width(&verdict, size, Weight::Bold);
        let indent = "\u{a0}".repeat((bold / width("\u{a0}", self.body, Weight::Regular)).ceil() as usize);
        let lines = wrap(&format!("{indent}{}", words.why), self.body, self.width, most);
        for (i, line) in lines.iter().enumerate() {
            if i == 0 {
                let rest = line.trim_start_matches('\u{a0}').to_owned();
                self.y += 0.93 * size;
                let y = self.y;
                self.push(
                    0.0,
                    y,
                    size,
                    fill,
                    false,
                    "plot-verdict",
                    vec![(words.verdict.clone(), Weight::Bold)],
                );
                self.push(bold, y, self.body, INK, false, "plot-why", vec![(rest, Weight::Regular)]);
                self.y += LEADING * size - 0.93 * size;
            } else {
                self.line(line, self.body, INK, Weight::Regular, "plot-why");
            }
        }
    }

    /// The legend in rows, each entry after the other.
    fn rows(&mut self, legend: &[Entry], brief: bool) {
        let (mut x, gap) = (0.0, 1.4 * self.body);
        let indent = SIGN_ROOM * self.body;
        for entry in legend {
            let text = if brief { &entry.brief } else { &entry.text };
            let text = shorten(text, self.body, Weight::Regular, self.width - indent);
            let wide = indent + width(&text, self.body, Weight::Regular);
            if x > 0.0 && x + wide > self.width {
                x = 0.0;
                self.y += LEADING * self.body;
            }
            let y = self.y + 0.93 * self.body;
            self.signs.push(Placed { x: x + 0.45 * indent, y: y - 0.36 * self.body, sign: entry.sign });
            self.push(x + indent, y, self.body, INK, false, "plot-legend", vec![(text, Weight::Regular)]);
            x += wide + gap;
        }
        self.y += LEADING * self.body;
    }

    fn notes(&mut self, words: &Words, fullness: Fullness, most: usize) {
        let [full, short] = &words.notes;
        let text = if fullness.notes { full } else { short };
        self.paragraph(text, notes_size(self.body), true, most, "plot-notes");
    }

    /// A sign with its text beside it.
    fn entry(&mut self, entry: &Entry, fullness: Fullness) {
        let (size, indent) = (self.body, SIGN_ROOM * self.body);
        let middle = self.y + (0.93 - 0.36) * size;
        self.signs.push(Placed { x: 0.45 * indent, y: middle, sign: entry.sign });
        let text = if fullness.brief { &entry.brief } else { &entry.text };
        for line in wrap(text, size, self.width - indent, fullness.legend_lines) {
            self.y += 0.93 * size;
            let y = self.y;
            self.push(indent, y, size, INK, false, "plot-legend", vec![(line, Weight::Regular)]);
            self.y += (LEADING - 0.93) * size;
        }
        self.y += 0.25 * size;
    }

    fn paragraph(&mut self, text: &str, size: f64, muted: bool, most: usize, class: &'static str) {
        for line in wrap(text, size, self.width, most) {
            self.y += 0.93 * size;
            let y = self.y;
            self.push(0.0, y, size, INK, muted, class, vec![(line, Weight::Regular)]);
            self.y += (LEADING - 0.93) * size;
        }
    }

    fn line(&mut self, text: &str, size: f64, fill: &'static str, weight: Weight, class: &'static str) {
        let text = shorten(text, size, weight, self.width);
        self.y += 0.93 * size;
        let y = self.y;
        self.push(0.0, y, size, fill, false, class, vec![(text, weight)]);
        self.y += (LEADING - 0.93) * size;
    }

    fn space(&mut self, lines: f64) {
        self.y += lines * self.body;
    }

    #[allow(clippy::too_many_arguments)] // one line of text has that many sides
    fn push(
        &mut self,
        x: f64,
        y: f64,
        size: f64,
        fill: &'static str,
        muted: bool,
        class: &'static str,
        pieces: Vec<(String, Weight)>,
    ) {
        self.lines.push(Line { x, y, size, fill, muted, class, pieces });
    }

    fn finish(self, beside: bool, height: f64, options: &RunPlot) -> Margin {
        Margin {
            beside,
            width: self.width,
            height,
            body: self.body,
            transparent: options.transparent,
            lines: self.lines,
            signs: self.signs,
        }
    }
}

/// Size of the notes.
fn notes_size(body: f64) -> f64 {
    (0.85 * body).max(8.0)
}
