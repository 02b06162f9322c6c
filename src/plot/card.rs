//! The pieces of the printed sheet: large numbers, sentences in two columns, tables, cautions.
//!
//! Comes in: the words of [`Card`]. Goes out: drawings of one width whose letters are never smaller than 6.5 when the drawing
//! is set at its own size, each with everything it says as one text for readers who do not see it. Nothing is ever
//! shortened here but a file's name: a long word breaks between two letters, and a drawing grows as high as its words
//! need; what does not fit on a page is for the caller to part.
//!
//! Letters are set nine tenths as wide as DejaVu Sans has them, which is what the condensed face of that family does; that
//! is the face of the documents these drawings stand in. Left out: what stands on which page.

use super::ink::{BRICK, INK, SAND};
use super::letters::{Weight, clean, width};
use super::number::coordinate;
use super::setting::SMALL_PLOT_POINTS;
use super::svg::{Anchor, Head, Svg, Text};
use crate::report::sheet_card::{Card, CardTable, Large, Part};

/// Width of every drawing, points: the width of the text of an A5 page of these documents, with a ten-thousandth to spare.
pub const CARD_WIDTH: f64 = 335.5;

/// Letters over their width in DejaVu Sans.
const CONDENSED: f64 = 0.9;
/// Width in letters that are not condensed.
const WIDE: f64 = CARD_WIDTH / CONDENSED;
/// Smallest letters, and the distance of their lines.
const SIZE: f64 = 6.5;
const LEADING: f64 = 7.6;
/// Letters of a title over sentences or a table.
const HEADING: f64 = 7.2;
/// Between two columns.
const GUTTER: f64 = 14.0;
/// Letters of the title, and of the numbers that matter.
const TITLE: f64 = 9.6;
const LARGE: f64 = 25.0;
const BESIDE: f64 = 9.0;
/// Space above the plots.
pub const BEFORE_PLOTS: f64 = 3.0;
/// Most lines of a line about where the numbers come from: it holds the name of a file.
const MOST_ABOUT: usize = 3;

/// A drawing of the sheet.
#[derive(Debug, Clone, PartialEq)]
pub struct CardDrawing {
    /// SVG text.
    pub svg: String,
    /// Height at the width [`CARD_WIDTH`], points.
    pub height: f64,
    /// What it says, for those who do not see it.
    pub alt: String,
}

/// Title, numbers, sentences, tables and the plots of [`super::small_setting_plot`], where they stand there; `continued` is what the foot
/// says when there is more overleaf.
#[must_use]
pub fn card_front(card: &Card, plots: Option<&CardDrawing>, continued: Option<&str>) -> CardDrawing {
    let mut ink = Drawing::new();
    ink.paragraph((0.0, WIDE), TITLE, &[(&card.title, Weight::Bold)]);
    for line in &card.about {
        let lines = broken(&line_pieces(&[(line, Weight::Regular)]), SIZE, WIDE);
        let cut = lines.len() > MOST_ABOUT;
        for mut line in lines.into_iter().take(MOST_ABOUT) {
            if cut {
                line.push(("…".to_owned(), Weight::Regular));
            }
            ink.line(0.0, SIZE, INK, Anchor::Start, &line);
        }
    }
    ink.said(&card.about);
    ink.rule(1.5, INK, 1.0);
    match &card.none {
        Some(why) => {
            ink.space(LARGE * 0.95);
            let none = [("No setting".to_owned(), Weight::Bold)];
            ink.at(0.0, LARGE * 0.8, BRICK, Anchor::Start, &none);
            ink.said(&["No setting."]);
            ink.space(2.0);
            let warn = "Do not dive with an IP of your own choice instead.";
            ink.paragraph((0.0, WIDE), BESIDE, &[(warn, Weight::Bold)]);
            ink.paragraph((0.0, WIDE), BESIDE, &[(why, Weight::Regular)]);
        }
        None => ink.large(&card.large),
    }
    ink.rule(2.0, INK, 0.5);
    ink.parts(&card.parts);
    if !card.tables.is_empty() {
        ink.rule(2.0, SAND, 0.6);
        ink.tables(&card.tables);
    }
    if let Some(plots) = plots {
        ink.space(BEFORE_PLOTS);
        ink.svg.push(Ink::Picture { y: ink.y, svg: plots.svg.clone() });
        ink.said.push(plots.alt.clone());
        ink.y += plots.height;
    }
    if let Some(continued) = continued {
        ink.space(4.0);
        ink.paragraph((0.0, WIDE), BESIDE, &[(continued, Weight::Bold)]);
    }
    ink.finish("sheet-front", "Setting, numbers and tables")
}

/// Paragraphs under titles in two columns, as many drawings as are needed when each may be at most `highest`.
#[must_use]
pub fn card_paragraphs(sections: &[(&str, &[String])], highest: f64) -> Vec<CardDrawing> {
    let mut rest: Vec<Item<'_>> = Vec::new();
    for (title, paragraphs) in sections.iter().filter(|(_, paragraphs)| !paragraphs.is_empty()) {
        rest.push(Item { text: title, title: true });
        rest.extend(paragraphs.iter().map(|text| Item { text, title: false }));
    }
    let mut drawings = Vec::new();
    while !rest.is_empty() {
        let mut count = rest.len();
        let drawing = loop {
            let ink = paragraphs_drawn(rest.get(..count).unwrap_or_default());
            if ink.y <= highest || count == 1 {
                break ink.finish("sheet-words", "To know");
            }
            // An item less at a time: there are few. A title does not end a drawing.
            count -= 1;
            while count > 1 && rest.get(count - 1).is_some_and(|item| item.title) {
                count -= 1;
            }
        };
        rest.drain(..count);
        drawings.push(drawing);
    }
    drawings
}

/// A title or a paragraph.
#[derive(Clone, Copy)]
struct Item<'a> {
    text: &'a str,
    title: bool,
}

/// Where a paragraph begins behind its dash.
const INDENT: f64 = 7.0;
/// Space after a paragraph.
const AFTER: f64 = 0.9;
/// Space above a title that does not begin a column.
const ABOVE_TITLE: f64 = 2.5;

fn paragraphs_drawn(items: &[Item<'_>]) -> Drawing {
    let column = 0.5 * (WIDE - GUTTER);
    let mut ink = Drawing::new();
    ink.rule(0.0, BRICK, 1.2);
    ink.space(1.5);
    let set: Vec<(Vec<Line>, bool)> = items
        .iter()
        .map(|item| {
            let (size, weight, indent) =
                if item.title { (HEADING, Weight::Bold, 0.0) } else { (SIZE, Weight::Regular, INDENT) };
            (broken(&line_pieces(&[(item.text, weight)]), size, column - indent), item.title)
        })
        .collect();
    ink.said(&items.iter().map(|item| item.text).collect::<Vec<_>>());
    ink.in_columns(&set);
    ink
}

/// A line in pieces of one weight.
type Line = Vec<(String, Weight)>;

/// How many of some heights stand in the left of two columns, so that the higher of the two is lowest.
fn halves(heights: &[f64]) -> usize {
    let all: f64 = heights.iter().sum();
    let mut left = 0.0;
    let mut best = (f64::INFINITY, 0);
    for (i, height) in heights.iter().enumerate() {
        left += height;
        let higher = f64::max(left, all - left);
        if higher < best.0 {
            best = (higher, i + 1);
        }
    }
    best.1
}

/// Words with their weights, cleaned of what cannot be drawn.
fn line_pieces(pieces: &[(&str, Weight)]) -> Vec<(String, Weight)> {
    pieces
        .iter()
        .flat_map(|(text, weight)| {
            let text = clean(text);
            let words: Vec<_> =
                text.split(' ').filter(|w| !w.is_empty()).map(|w| (w.to_owned(), *weight)).collect();
            words
        })
        .collect()
}

/// Words on lines of at most `room`; a word wider than a line breaks between two letters.
fn broken(words: &[(String, Weight)], size: f64, room: f64) -> Vec<Line> {
    let mut lines: Vec<Line> = Vec::new();
    let (mut line, mut x): (Line, f64) = (Vec::new(), 0.0);
    for (word, weight) in words {
        for part in parts_of(word, size, *weight, room) {
            let wide = bold_or_not(&part, size, *weight);
            let space = if line.is_empty() { 0.0 } else { width(" ", size, Weight::Regular) };
            if x + space + wide > room && !line.is_empty() {
                lines.push(std::mem::take(&mut line));
                x = 0.0;
            } else {
                x += space;
            }
            x += wide;
            let same = line.last_mut().filter(|(_, last)| last == weight);
            match same {
                Some((text, _)) => {
                    text.push(' ');
                    text.push_str(&part);
                }
                None => {
                    // The space belongs to the weight before it.
                    if let Some((text, _)) = line.last_mut() {
                        text.push(' ');
                    }
                    line.push((part, *weight));
                }
            }
        }
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

/// Bold letters as wide as they are at the most in these texts; see [`width`], whose bound holds for any letter.
fn bold_or_not(text: &str, size: f64, weight: Weight) -> f64 {
    let plain = text.is_ascii();
    match weight {
        Weight::Bold if plain => BOLD_DIGITS * width(text, size, Weight::Regular),
        weight => width(text, size, weight),
    }
}

fn parts_of(word: &str, size: f64, weight: Weight, room: f64) -> Vec<String> {
    let mut parts = vec![String::new()];
    for c in word.chars() {
        if let Some(part) = parts.last_mut() {
            part.push(c);
            if bold_or_not(part, size, weight) > room && part.chars().count() > 1 {
                part.pop();
                parts.push(c.to_string());
            }
        }
    }
    parts
}

/// A drawing being made, from the top down.
struct Drawing {
    svg: Vec<Ink>,
    y: f64,
    said: Vec<String>,
}

enum Ink {
    Text {
        x: f64,
        y: f64,
        size: f64,
        fill: &'static str,
        anchor: Anchor,
        line: Line,
    },
    Rule {
        y: f64,
        fill: &'static str,
        height: f64,
    },
    /// The small plots, as they are.
    Picture {
        y: f64,
        svg: String,
    },
    Ground {
        x: f64,
        y: f64,
        width: f64,
        height: f64,
    },
}

impl Drawing {
    fn new() -> Self {
        Self { svg: Vec::new(), y: 0.0, said: Vec::new() }
    }

    fn said<S: AsRef<str>>(&mut self, texts: &[S]) {
        self.said.extend(texts.iter().map(|text| clean(text.as_ref())));
    }

    fn space(&mut self, space: f64) {
        self.y += space;
    }

    /// A line of text at the height reached, which does not move on.
    fn at(&mut self, x: f64, size: f64, fill: &'static str, anchor: Anchor, line: &[(String, Weight)]) {
        let y = self.y + if size > BESIDE { 0.0 } else { 0.86 * size };
        self.svg.push(Ink::Text { x, y, size, fill, anchor, line: line.to_vec() });
    }

    fn line(&mut self, x: f64, size: f64, fill: &'static str, anchor: Anchor, line: &[(String, Weight)]) {
        let leading = if size > SIZE { 1.22 * size } else { LEADING };
        self.svg.push(Ink::Text { x, y: self.y + 0.86 * size, size, fill, anchor, line: line.to_vec() });
        self.y += leading;
    }

    fn paragraph(&mut self, (x, room): (f64, f64), size: f64, pieces: &[(&str, Weight)]) {
        self.said.push(pieces.iter().map(|(text, _)| clean(text)).collect::<Vec<_>>().join(" "));
        for line in broken(&line_pieces(pieces), size, room) {
            self.line(x, size, INK, Anchor::Start, &line);
        }
    }

    fn rule(&mut self, around: f64, fill: &'static str, height: f64) {
        self.y += around;
        self.svg.push(Ink::Rule { y: self.y, fill, height });
        self.y += height + around;
    }

    fn large(&mut self, numbers: &[Large]) {
        let column = WIDE / numbers.len().max(1) as f64;
        let top = self.y;
        for (i, number) in numbers.iter().enumerate() {
            let x = i as f64 * column;
            let fill = if number.limit { BRICK } else { INK };
            self.y = top;
            let label = number.label.to_uppercase();
            self.line(x, BESIDE, fill, Anchor::Start, &[(label, Weight::Bold)]);
            // A number that is wider than its column takes smaller letters.
            let wide = width(&number.number, 1.0, Weight::Regular) * BOLD_DIGITS;
            let size = LARGE.min((column - 8.0) / wide);
            self.y += 0.86 * LARGE;
            self.svg.push(Ink::Text {
                x,
                y: self.y,
                size,
                fill,
                anchor: Anchor::Start,
                line: vec![(number.number.clone(), Weight::Bold)],
            });
            self.y += 3.5;
            let size = BESIDE.min((column - 8.0) / width(&number.beside, 1.0, Weight::Regular).max(1e-3));
            let y = self.y + 0.86 * BESIDE;
            let line = vec![(number.beside.clone(), Weight::Regular)];
            self.svg.push(Ink::Text { x, y, size, fill, anchor: Anchor::Start, line });
            self.y += 1.22 * BESIDE;
            self.said.push(format!("{}: {}, {}.", number.label, number.number, number.beside));
        }
    }

    /// Sentences in two columns.
    fn parts(&mut self, parts: &[Part]) {
        let column = 0.5 * (WIDE - GUTTER);
        let mut set: Vec<(Vec<Line>, bool)> = Vec::new();
        for part in parts {
            set.push((broken(&line_pieces(&[(&part.title, Weight::Bold)]), HEADING, column), true));
            self.said.push(format!("{}.", part.title));
            for (label, text) in &part.facts {
                let pieces = [(*label, Weight::Bold), (text.as_str(), Weight::Regular)];
                set.push((broken(&line_pieces(&pieces), SIZE, column - INDENT), false));
                self.said.push(format!("{label} {text}.").trim().to_owned());
            }
        }
        self.in_columns(&set);
    }

    /// Titles and paragraphs, each on its lines, in two columns of about the same height.
    fn in_columns(&mut self, set: &[(Vec<Line>, bool)]) {
        let column = 0.5 * (WIDE - GUTTER);
        let height = |(lines, title): &(Vec<Line>, bool)| {
            lines.len() as f64 * LEADING + AFTER + if *title { ABOVE_TITLE } else { 0.0 }
        };
        let mut half = halves(&set.iter().map(height).collect::<Vec<_>>());
        // A title does not stand at the foot of a column.
        if half > 0 && half < set.len() && set.get(half - 1).is_some_and(|(_, title)| *title) {
            half -= 1;
        }
        let (top, mut lowest, mut x) = (self.y, self.y, 0.0);
        for (i, (lines, title)) in set.iter().enumerate() {
            if i == half && i > 0 {
                (x, self.y) = (column + GUTTER, top);
            }
            if *title && self.y > top {
                self.y += ABOVE_TITLE;
            }
            let (size, indent) = if *title { (HEADING, 0.0) } else { (SIZE, INDENT) };
            for (j, line) in lines.iter().enumerate() {
                let y = self.y + 0.86 * size;
                if j == 0 && !*title {
                    let dash = vec![("–".to_owned(), Weight::Regular)];
                    self.svg.push(Ink::Text { x, y, size, fill: INK, anchor: Anchor::Start, line: dash });
                }
                let line = line.clone();
                self.svg.push(Ink::Text { x: x + indent, y, size, fill: INK, anchor: Anchor::Start, line });
                self.y += LEADING;
            }
            self.y += AFTER;
            lowest = f64::max(lowest, self.y);
        }
        self.y = lowest;
    }

    /// Tables side by side, the first as wide as it needs to be.
    fn tables(&mut self, tables: &[CardTable]) {
        let (top, mut lowest, mut x) = (self.y, self.y, 0.0);
        for (i, table) in tables.iter().enumerate() {
            self.y = top;
            let room = if i + 1 < tables.len() { 0.6 * WIDE - GUTTER } else { WIDE - x };
            self.table(table, x, room);
            x += room + GUTTER;
            lowest = f64::max(lowest, self.y);
        }
        self.y = lowest;
    }

    fn table(&mut self, table: &CardTable, left: f64, room: f64) {
        let pieces = line_pieces(&[(&table.title, Weight::Bold)]);
        self.said.push(format!("{}.", table.title));
        for line in broken(&pieces, HEADING, room) {
            self.line(left, HEADING, INK, Anchor::Start, &line);
        }
        let natural: Vec<f64> = table
            .heads
            .iter()
            .enumerate()
            .map(|(i, (head, unit))| {
                let cells = table.rows.iter().filter_map(|row| row.get(i));
                let all = cells.map(String::as_str).chain([*head, unit.as_str()]);
                all.map(|text| width(text, SIZE, Weight::Regular)).fold(0.0, f64::max)
            })
            .collect();
        let free = room - natural.iter().sum::<f64>();
        let apart = (free / (natural.len().max(2) as f64 - 1.0)).clamp(2.0, 16.0);
        let text_first = table.heads.first().is_some_and(|(head, _)| head.is_empty());
        let edges: Vec<(f64, Anchor)> = natural
            .iter()
            .enumerate()
            .scan(left, |x, (i, wide)| {
                let start = *x;
                *x += wide + apart;
                Some(if i == 0 && text_first { (start, Anchor::Start) } else { (start + wide, Anchor::End) })
            })
            .collect();
        let wide = natural.iter().sum::<f64>() + apart * (natural.len().max(1) as f64 - 1.0);
        let units: Vec<String> = table.heads.iter().map(|(_, unit)| unit.clone()).collect();
        let heads: Vec<String> = table.heads.iter().map(|(head, _)| (*head).to_owned()).collect();
        for (cells, weight) in [(&heads, Weight::Regular), (&units, Weight::Regular)] {
            self.cells(cells, &edges, weight);
        }
        for (i, row) in table.rows.iter().enumerate() {
            let strong = table.strong == Some(i);
            if strong {
                let ground =
                    Ink::Ground { x: left - 1.5, y: self.y - 0.6, width: wide + 3.0, height: LEADING };
                self.svg.push(ground);
            }
            self.cells(row, &edges, Weight::Regular);
            let named = table.heads.iter().zip(row).filter(|(_, cell)| !cell.is_empty());
            let said: Vec<String> =
                named.map(|((head, unit), cell)| format!("{head} {cell} {unit}").trim().to_owned()).collect();
            self.said.push(format!("{}.", said.join(", ")));
        }
        self.y += 1.5;
        for note in &table.notes {
            self.paragraph((left, room), SIZE, &[(note, Weight::Regular)]);
        }
    }

    fn cells(&mut self, cells: &[String], edges: &[(f64, Anchor)], weight: Weight) {
        for (text, (x, anchor)) in cells.iter().zip(edges).filter(|(text, _)| !text.is_empty()) {
            let line = vec![(clean(text), weight)];
            self.svg.push(Ink::Text {
                x: *x,
                y: self.y + 0.86 * SIZE,
                size: SIZE,
                fill: INK,
                anchor: *anchor,
                line,
            });
        }
        self.y += LEADING;
    }

    fn finish(self, id_prefix: &str, title: &str) -> CardDrawing {
        let height = self.y.max(1.0) + 1.5;
        let mut svg = Svg::new(&Head { width: CARD_WIDTH, height, id_prefix, title, description: title });
        svg.group("card", &[("transform", "scale(0.9 1)")]);
        for ink in &self.svg {
            match ink {
                Ink::Picture { .. } => {}
                Ink::Text { x, y, size, fill, anchor, line } => {
                    let pieces: Vec<(&str, Weight)> = line.iter().map(|(t, w)| (t.as_str(), *w)).collect();
                    svg.text(&Text {
                        x: *x,
                        y: *y,
                        size: *size,
                        anchor: *anchor,
                        fill,
                        muted: false,
                        class: "card-text",
                        pieces: &pieces,
                    });
                }
                Ink::Rule { y, fill, height } => svg.rect(0.0, *y, WIDE, *height, &[("fill", fill)]),
                Ink::Ground { x, y, width, height } => {
                    svg.rect(*x, *y, *width, *height, &[("fill", SAND), ("fill-opacity", "0.6")]);
                }
            }
        }
        svg.end();
        for ink in &self.svg {
            if let Ink::Picture { y, svg: inner } = ink {
                let scale = coordinate(1000.0 * SMALL_PLOT_POINTS);
                let place = format!("translate(0 {}) scale(0.001) scale({scale})", coordinate(*y));
                svg.group("card-plots", &[("transform", &place)]);
                svg.inside(inner);
                svg.end();
            }
        }
        CardDrawing { svg: svg.finish(), height, alt: self.said.join(" ") }
    }
}

/// Bold over regular for figures and small Latin letters (1.09 to 1.15 in DejaVu Sans), rounded up.
const BOLD_DIGITS: f64 = 1.16;
