//! The margin: latest verdict and flow, change, trend, legend and notes, beside the panel or below it.
//!
//! Comes in: the words, and what is drawn. Goes out: lines of text and signs, placed, with the room they take. Where
//! there is too little room the notes are shortened first, then the other texts; verdict, flow, change, trend and what
//! is not drawn always stay.

use super::HistoryPlot;
use super::layout::{Layout, body_size, edge};
use super::legend::{self, Entry, Sign, entries};
use super::seen::Seen;
use super::words::Words;

use super::super::ink::{BRICK, INK};
use super::super::letters::{Weight, shorten, width, wrap};
use super::super::svg::{Anchor, Svg, Text};

/// A picture narrower than this, in pixels, or not wider than its height by this ratio, has its margin below.
const BESIDE_FROM: (f64, f64) = (700.0, 1.15);
/// Distance of lines, in sizes of their text.
const LEADING: f64 = 1.32;
/// From the top of a line to its baseline, in sizes of its text.
const RISE: f64 = 0.93;
/// Room of a sign in the legend, in sizes of body text.
const SIGN_ROOM: f64 = 2.7;
/// The margin below takes at most this share of the height, if leaving something out achieves it.
const MOST_BELOW: f64 = 0.34;

/// The margin with everything in it.
pub(super) struct Margin {
    /// Whether it stands beside the panel.
    pub beside: bool,
    pub width: f64,
    pub height: f64,
    body: f64,
    transparent: bool,
    lines: Vec<Line>,
    signs: Vec<(f64, f64, Sign)>,
}

/// A line of text; `y` is its baseline from the top of the margin.
struct Line {
    x: f64,
    y: f64,
    style: Style,
    text: String,
}

/// How a line is set.
#[derive(Debug, Clone, Copy)]
struct Style {
    size: f64,
    fill: &'static str,
    muted: bool,
    weight: Weight,
    class: &'static str,
}

/// How much is said.
#[derive(Debug, Clone, Copy)]
struct Fullness {
    /// Notes in full, the short ones, or none.
    notes: Option<usize>,
    lines: usize,
    brief: bool,
}

/// From all that there is to say to the least.
const FULLNESS: [Fullness; 4] = [
    Fullness { notes: Some(0), lines: 3, brief: false },
    Fullness { notes: Some(1), lines: 3, brief: false },
    Fullness { notes: Some(1), lines: 2, brief: true },
    Fullness { notes: None, lines: 1, brief: true },
];

impl Margin {
    pub(super) fn new(words: &Words, seen: &Seen, options: &HistoryPlot) -> Self {
        let body = body_size(options);
        let (w, h) = (f64::from(options.width), f64::from(options.height));
        let legend = entries(seen);
        let room = h - 2.0 * edge(body);
        if w >= BESIDE_FROM.0 && w >= BESIDE_FROM.1 * h {
            let width = (0.24 * w).clamp(18.0 * body, 22.0 * body);
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

    /// Title and what the history is of, over the panel.
    pub(super) fn draw_head(&self, svg: &mut Svg, words: &Words, layout: &Layout) {
        let (size, body) = (self.title_size(), self.body);
        let right = if self.beside { layout.margin.left - 1.8 * body } else { layout.width - layout.edge };
        let room = right - layout.edge;
        let share = if self.beside { 1.0 } else { 0.5 };
        let orifice = shorten(&words.orifice, size, Weight::Bold, share * room);
        let after = width(&orifice, size, Weight::Bold) + body;
        let (x, y, room) = if self.beside {
            (layout.edge, layout.head_y + 1.5 * body, room)
        } else {
            (layout.edge + after, layout.head_y, room - after)
        };
        let about = shorten(&words.about, body, Weight::Regular, room);
        svg.group("plot-head", &[]);
        for (x, y, size, class, content, weight) in [
            (layout.edge, layout.head_y, size, "plot-title", &orifice, Weight::Bold),
            (x, y, body, "plot-about", &about, Weight::Regular),
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

    /// Draws the margin at its place.
    pub(super) fn draw(&self, svg: &mut Svg, layout: &Layout) {
        let (left, top) = (layout.margin.left, layout.margin.top);
        svg.group("plot-margin", &[]);
        for (x, y, sign) in &self.signs {
            legend::draw(svg, *sign, (left + x, top + y), self.body, self.transparent);
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
}

/// Lines being written from the top downward.
struct Writer {
    y: f64,
    body: f64,
    width: f64,
    lines: Vec<Line>,
    signs: Vec<(f64, f64, Sign)>,
}

impl Writer {
    const fn new(body: f64, width: f64) -> Self {
        Self { y: 0.0, body, width, lines: Vec::new(), signs: Vec::new() }
    }

    const fn plain(&self, class: &'static str) -> Style {
        Style { size: self.body, fill: INK, muted: false, weight: Weight::Regular, class }
    }

    const fn muted(&self, class: &'static str) -> Style {
        Style { muted: true, ..self.plain(class) }
    }

    /// A column beside the panel.
    fn beside(words: &Words, legend: &[Entry], body: f64, width: f64, room: f64, fullness: Fullness) -> Self {
        let mut w = Self::new(body, width);
        let (most, gap) = (fullness.lines, if fullness.brief { 0.5 } else { 0.8 });
        let large = |class| Style { size: 1.15 * body, ..Self::new(body, width).plain(class) };
        let fill = if words.bad { BRICK } else { INK };
        let verdict = Style { size: 1.55 * body, fill, weight: Weight::Bold, ..w.plain("plot-verdict") };
        w.paragraph(&words.verdict, verdict, 1);
        w.paragraph(&words.latest, w.plain("plot-latest"), most);
        if !words.flow.is_empty() {
            w.space(gap);
            w.paragraph(&words.flow_head, w.muted("plot-flow-head"), most);
            w.paragraph(&words.flow, large("plot-flow"), most);
            for text in [Some(&words.flow_detail), words.limits.as_ref()].into_iter().flatten() {
                w.paragraph(text, w.muted("plot-flow-detail"), most);
            }
        }
        if let Some(change) = &words.change {
            w.space(gap);
            w.paragraph(&change.head, w.muted("plot-change-head"), most);
            let fill = if change.over { BRICK } else { INK };
            w.paragraph(&change.text, Style { fill, ..large("plot-change") }, most);
        }
        if let Some(trend) = &words.trend {
            w.space(gap);
            w.paragraph(&trend.head, w.muted("plot-trend-head"), most);
            w.paragraph(&trend.text, large("plot-trend"), most);
            if let Some(text) = &trend.leaves {
                w.paragraph(text, w.plain("plot-leaves"), most);
            }
            if let Some(text) = &trend.not_before {
                w.paragraph(text, w.muted("plot-not-before"), most);
            }
        }
        w.space(if fullness.brief { 0.6 } else { 1.1 });
        for entry in legend {
            w.entry(entry, fullness);
        }
        for text in &words.not_drawn {
            w.paragraph(text, w.plain("plot-not-drawn"), 3);
        }
        // The notes stand at the foot of the column.
        let first = w.lines.len();
        if fullness.notes.is_some() {
            w.space(if fullness.brief { 0.3 } else { 1.0 });
        }
        w.notes(words, fullness, 20);
        let spare = (room - w.y).max(0.0);
        w.lines[first..].iter_mut().for_each(|line| line.y += spare);
        w.y += spare;
        w
    }

    /// Rows below the panel.
    fn below(words: &Words, legend: &[Entry], body: f64, width: f64, fullness: Fullness) -> Self {
        let mut w = Self::new(body, width);
        w.verdict_row(words);
        let brick = |over: bool| if over { BRICK } else { INK };
        if let Some(change) = &words.change {
            let text = format!("{}: {}", change.head, change.text);
            w.paragraph(&text, Style { fill: brick(change.over), ..w.plain("plot-change") }, 2);
        }
        if let Some(trend) = &words.trend {
            let mut text = format!("{}: {}", trend.head, trend.text);
            for part in trend.leaves.iter().chain(&trend.not_before) {
                text.push_str(&format!("; {part}"));
            }
            w.paragraph(&text, w.plain("plot-trend"), 2);
        }
        w.space(0.35);
        w.rows(legend, fullness.brief);
        let not_drawn = words.not_drawn.join("; ");
        w.paragraph(&not_drawn, w.plain("plot-not-drawn"), 2);
        if fullness.notes.is_some() {
            w.space(0.3);
        }
        w.notes(words, fullness, 4);
        w
    }

    /// The verdict in bold, after it the latest run with its flow.
    fn verdict_row(&mut self, words: &Words) {
        let (size, fill) = (1.1 * self.body, if words.bad { BRICK } else { INK });
        let bold = width(&format!("{}: ", words.verdict), size, Weight::Bold);
        // The lines are broken as if the verdict stood before them in no-break spaces.
        let indent = "\u{a0}".repeat((bold / width("\u{a0}", self.body, Weight::Regular)).ceil() as usize);
        let mut text = format!("{indent}{}", words.latest);
        if !words.flow.is_empty() {
            text.push_str(&format!(": {}, {}", words.flow, words.flow_detail));
        }
        text.extend(words.limits.iter().map(|limits| format!("; {limits}")));
        for (i, line) in wrap(&text, self.body, self.width, 2).iter().enumerate() {
            let style = self.plain("plot-latest");
            if i == 0 {
                let y = self.y + RISE * size;
                let verdict = Style { size, fill, weight: Weight::Bold, ..self.plain("plot-verdict") };
                self.lines.push(Line { x: 0.0, y, style: verdict, text: words.verdict.clone() });
                let text = line.trim_start_matches('\u{a0}').to_owned();
                self.lines.push(Line { x: bold, y, style, text });
                self.y += LEADING * size;
            } else {
                self.line(line.clone(), style, 0.0);
            }
        }
    }

    /// The legend in rows, each entry after the other.
    fn rows(&mut self, legend: &[Entry], brief: bool) {
        let (mut x, gap, indent) = (0.0, 1.2 * self.body, SIGN_ROOM * self.body);
        for entry in legend {
            let text = if brief { &entry.brief } else { &entry.text };
            let text = shorten(text, self.body, Weight::Regular, self.width - indent);
            let wide = indent + width(&text, self.body, Weight::Regular);
            if x > 0.0 && x + wide > self.width {
                x = 0.0;
                self.y += LEADING * self.body;
            }
            let y = self.y + RISE * self.body;
            self.signs.push((x + 0.45 * indent, y - 0.36 * self.body, entry.sign));
            self.lines.push(Line { x: x + indent, y, style: self.plain("plot-legend"), text });
            x += wide + gap;
        }
        if !legend.is_empty() {
            self.y += LEADING * self.body;
        }
    }

    /// A sign with its text beside it.
    fn entry(&mut self, entry: &Entry, fullness: Fullness) {
        let indent = SIGN_ROOM * self.body;
        self.signs.push((0.45 * indent, self.y + (RISE - 0.36) * self.body, entry.sign));
        let text = if fullness.brief { &entry.brief } else { &entry.text };
        for line in wrap(text, self.body, self.width - indent, fullness.lines) {
            self.line(line, self.plain("plot-legend"), indent);
        }
        self.y += 0.2 * self.body;
    }

    fn notes(&mut self, words: &Words, fullness: Fullness, most: usize) {
        if let Some(which) = fullness.notes {
            let size = (0.85 * self.body).max(8.0);
            self.paragraph(&words.notes[which], Style { size, ..self.muted("plot-notes") }, most);
        }
    }

    /// A text on as many lines as it needs, up to `most`.
    fn paragraph(&mut self, text: &str, style: Style, most: usize) {
        // Lines are broken for regular letters; bold ones are wider.
        let lines = match style.weight {
            Weight::Regular => wrap(text, style.size, self.width, most),
            Weight::Bold => vec![shorten(text, style.size, Weight::Bold, self.width)],
        };
        for line in lines {
            self.line(line, style, 0.0);
        }
    }

    fn line(&mut self, text: String, style: Style, x: f64) {
        self.lines.push(Line { x, y: self.y + RISE * style.size, style, text });
        self.y += LEADING * style.size;
    }

    fn space(&mut self, lines: f64) {
        self.y += lines * self.body;
    }

    fn finish(self, beside: bool, height: f64, options: &HistoryPlot) -> Margin {
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
