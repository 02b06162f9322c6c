//! Tables: widths by content, numbers under one another, a head for each page.
//!
//! Comes in: a [`Table`]. Goes out: its head and its rows as strips, or the least width it needs. Thin rules above and
//! below the head and under the table, hairlines between rows, no vertical ones.

use super::faces::Faces;
use super::lines::{Line, broken, natural_width, widest_word};
use super::model::{Align, Emphasis, Row, Table, Text};
use super::strip::{Cell, Ink, Item, Keep, RowSpace, Strip, row};
use super::style::{CELLS, Colour, INK, PALE, QUIET, SAND, Size};
use super::tree::{NodeId, Role, Tree};

/// Least and most space between two columns.
const GAP: (f32, f32) = (9.0, 34.0);
/// A word wider than this many ems breaks inside rather than widen its column.
const LONG_WORD: f32 = 9.0;
/// Share of the width that one column may ask for where not all get what they ask.
const MOST_ASKED: f32 = 0.7;
/// Space above and below the text of a row.
const ROW: (f32, f32) = (2.3, 2.6);
/// The ground of a row reaches this far beyond its text on both sides.
const BLEED: f32 = 3.0;
const HEAVY: f32 = 0.8;
const HAIR: f32 = 0.4;

/// A table set for a width.
pub(super) struct SetTable {
    pub head: Strip,
    pub rows: Vec<Strip>,
}

/// Widths of a column's cells, in points.
#[derive(Debug, Clone, Copy, Default)]
struct Measured {
    least: f32,
    natural: f32,
    /// Of numbers: from their beginning to the point, over all cells.
    before_point: f32,
    /// Of numbers: from the point to the end.
    after_point: f32,
}

/// A column with its place.
#[derive(Debug, Clone, Copy)]
struct Placed {
    x: f32,
    width: f32,
    measured: Measured,
    align: Align,
}

/// Sets a table in the largest size that fits.
///
/// # Errors
/// The least width it needs in the smallest letters, in points.
pub(super) fn set(
    faces: &Faces,
    tree: &mut Tree,
    node: NodeId,
    table: &Table,
    room: f32,
    tallest: f32,
) -> Result<SetTable, f32> {
    let mut needs = 0.0;
    for size in CELLS {
        match widths(faces, table, size, room) {
            Ok(columns) => return Ok(Setter { faces, tree, table, size, columns, tallest }.set(node)),
            Err(width) => needs = width,
        }
    }
    Err(needs)
}

/// The point of a number: the first `.` or `,` between two digits, as a place in its bytes.
pub(super) fn decimal_point(text: &str) -> Option<usize> {
    let bytes = text.as_bytes();
    let digit = |i: Option<usize>| i.and_then(|i| bytes.get(i)).is_some_and(u8::is_ascii_digit);
    (0..bytes.len())
        .find(|i| matches!(bytes.get(*i), Some(b'.' | b',')) && digit(i.checked_sub(1)) && digit(Some(i + 1)))
}

/// Whether a text is aligned as a number: it has a digit, and only signs stand before the first.
pub(super) fn is_number(text: &str) -> bool {
    let signs = text
        .trim_start_matches(['-', '+', '−', '±', '<', '>', '≤', '≥', '≈', ' ', '\u{A0}', '\u{202F}', '(']);
    signs.starts_with(|c: char| c.is_ascii_digit())
}

/// Where a number's whole part ends: at its point, or behind its first run of digits.
pub(super) fn end_of_whole(text: &str) -> usize {
    let mut end = None;
    for (i, c) in text.char_indices() {
        match (c.is_ascii_digit(), end) {
            (true, _) => end = Some(i + 1),
            (false, Some(end)) => {
                return decimal_point(text).filter(|point| *point == end).unwrap_or(end);
            }
            (false, None) => {}
        }
    }
    end.unwrap_or(text.len())
}

fn strong(text: &Text, bold: bool) -> Text {
    let mut text = text.clone();
    if bold {
        text.0.iter_mut().for_each(|run| run.bold = true);
    }
    text
}

fn cell_text(row: &Row, column: usize) -> Text {
    strong(row.cells.get(column).unwrap_or(&Text::default()), row.emphasis == Emphasis::Strong)
}

fn head_text(head: &str) -> Text {
    Text::bold(head)
}

fn measure(faces: &Faces, table: &Table, column: usize, size: Size) -> Measured {
    let mut measured = Measured::default();
    let Some(described) = table.columns.get(column) else { return measured };
    let mut others: f32 = 0.0;
    for row in &table.rows {
        let text = cell_text(row, column);
        let natural = natural_width(faces, &text) * size.letters;
        let characters = text.characters();
        if described.align == Align::Decimal && is_number(&characters) {
            let before = width_before(faces, &text, end_of_whole(&characters)) * size.letters;
            measured.before_point = measured.before_point.max(before);
            measured.after_point = measured.after_point.max(natural - before);
        } else if described.align == Align::Decimal {
            others = others.max(natural);
        } else {
            measured.least = measured.least.max(widest_word(faces, &text).min(LONG_WORD) * size.letters);
            measured.natural = measured.natural.max(natural);
        }
    }
    let numbers = (measured.before_point + measured.after_point).max(others);
    measured.least = measured.least.max(numbers);
    measured.natural = measured.natural.max(numbers);
    let head = head_text(&described.head);
    measured.least = measured.least.max(widest_word(faces, &head).min(LONG_WORD) * size.letters);
    measured.natural = measured.natural.max(natural_width(faces, &head) * size.letters);
    if let Some(unit) = &described.unit {
        let unit = Text::plain(unit.as_str());
        measured.least =
            measured.least.max(widest_word(faces, &unit).min(LONG_WORD) * unit_size(size).letters);
        measured.natural = measured.natural.max(natural_width(faces, &unit) * unit_size(size).letters);
    }
    measured
}

/// Width of the first `bytes` of a text on one line, in ems.
fn width_before(faces: &Faces, text: &Text, bytes: usize) -> f32 {
    let mut start = 0;
    let mut width = 0.0;
    for run in &text.0 {
        let end = bytes.saturating_sub(start).min(run.text.len());
        width += faces.width(run.text.get(..end).unwrap_or_default(), run.bold);
        start += run.text.len();
    }
    width
}

/// The columns with their places, or the least width of them all.
fn widths(faces: &Faces, table: &Table, size: Size, room: f32) -> Result<Vec<Placed>, f32> {
    let measured: Vec<Measured> = (0..table.columns.len()).map(|i| measure(faces, table, i, size)).collect();
    let gaps = measured.len().saturating_sub(1) as f32;
    let least: f32 = measured.iter().map(|m| m.least).sum::<f32>() + gaps * GAP.0;
    let natural: f32 = measured.iter().map(|m| m.natural).sum::<f32>() + gaps * GAP.0;
    // Half a thousandth of a point is rounding, not content.
    if least > room + 5e-4 {
        return Err(least);
    }
    // A column with a text without end asks for no more than most of the width, so that the others get some of it.
    let asked = |m: &Measured| m.natural.min(room * MOST_ASKED).max(m.least);
    let all_asked: f32 = measured.iter().map(asked).sum::<f32>() + gaps * GAP.0;
    let share = if all_asked > least { ((room - least) / (all_asked - least)).clamp(0.0, 1.0) } else { 1.0 };
    let fits = natural <= room;
    let slack = if gaps > 0.0 { ((room - natural) / gaps).clamp(0.0, GAP.1 - GAP.0) } else { 0.0 };
    let mut x = 0.0;
    Ok(measured
        .into_iter()
        .zip(&table.columns)
        .map(|(measured, column)| {
            let asked = if fits { measured.natural } else { asked(&measured) };
            let width = measured.least + (asked - measured.least) * share;
            let placed = Placed { x, width, measured, align: column.align };
            x += width + GAP.0 + slack;
            placed
        })
        .collect())
}

/// Units stand smaller under their heads.
fn unit_size(size: Size) -> Size {
    Size { letters: size.letters - 0.8, lines: size.lines }
}

struct Setter<'a> {
    faces: &'a Faces,
    tree: &'a mut Tree,
    table: &'a Table,
    size: Size,
    columns: Vec<Placed>,
    tallest: f32,
}

impl Setter<'_> {
    fn set(mut self, node: NodeId) -> SetTable {
        let head = self.head(node);
        let body = self.tree.add(node, Role::Rows);
        let mut rows = Vec::new();
        for i in 0..self.table.rows.len() {
            let mut row = self.row(body, i);
            // The first two rows and the last two stay together.
            if (i == 0 || i + 2 == self.table.rows.len())
                && let Some(last) = row.last_mut()
            {
                last.keep = Keep::Needed;
            }
            rows.append(&mut row);
        }
        if let Some(last) = rows.last_mut() {
            last.keep = Keep::Free;
            last.items.push(self.rule(last.height - HEAVY / 2.0, HEAVY, INK));
        }
        SetTable { head, rows }
    }

    fn width(&self) -> f32 {
        self.columns.last().map_or(0.0, |column| column.x + column.width)
    }

    fn rule(&self, y: f32, height: f32, colour: Colour) -> Item {
        Item { x: 0.0, y, node: None, ink: Ink::Fill { width: self.width(), height, colour } }
    }

    fn head(&mut self, node: NodeId) -> Strip {
        let head = self.tree.add(node, Role::Head);
        let tr = self.tree.add(head, Role::Row);
        let (small, mut names, mut units) = (unit_size(self.size), Vec::new(), Vec::new());
        for (column, placed) in self.table.columns.iter().zip(&self.columns) {
            let th = self.tree.add(tr, Role::ColumnHead);
            let lines = |text: &Text, size: Size| -> Vec<(f32, Line)> {
                let lines = broken(self.faces, text, (placed.width + 0.01) / size.letters);
                lines.into_iter().map(|line| (shift(placed, line.width * size.letters), line)).collect()
            };
            let name = lines(&head_text(&column.head), self.size);
            names.push(Cell { x: placed.x, lines: name, size: self.size, colour: INK, node: th });
            if let Some(unit) = &column.unit {
                let lines = lines(&Text::plain(unit.as_str()), small);
                units.push(Cell { x: placed.x, lines, size: small, colour: QUIET, node: th });
            }
        }
        // Heads stand on one line at their feet, units under them.
        let tallest = names.iter().map(|cell| cell.lines.len()).max().unwrap_or(0);
        for cell in &mut names {
            let missing = tallest - cell.lines.len();
            cell.lines.splice(0..0, std::iter::repeat_with(|| (0.0, Line::default())).take(missing));
        }
        let space = RowSpace { above: ROW.0 + 1.2, below: 1.0, tallest: f32::INFINITY };
        let mut strip = row(&names, space).pop().unwrap_or_default();
        // Lines that hold nothing are no part of what is read.
        strip.items.retain(|item| !matches!(&item.ink, Ink::Letters(line, ..) if line.stretches.is_empty()));
        if !units.is_empty() {
            let top = strip.height - 1.6;
            let space = RowSpace { above: 0.0, below: 1.0, tallest: f32::INFINITY };
            let below = row(&units, space).pop().unwrap_or_default();
            strip.height = top + below.height;
            strip.items.extend(below.items.into_iter().map(|item| Item { y: item.y + top, ..item }));
        }
        strip.height += ROW.1;
        strip.items.push(self.rule(0.0, HEAVY, INK));
        strip.items.push(self.rule(strip.height - HAIR, HAIR, INK));
        strip.keep = Keep::Needed;
        strip
    }

    fn row(&mut self, body: NodeId, number: usize) -> Vec<Strip> {
        let Some(described) = self.table.rows.get(number) else { return Vec::new() };
        let tr = self.tree.add(body, Role::Row);
        let colour = if described.emphasis == Emphasis::Quiet { QUIET } else { INK };
        let mut cells = Vec::new();
        for (i, placed) in self.columns.iter().enumerate() {
            let role = if i == 0 && self.table.row_heads { Role::RowHead } else { Role::Cell };
            let node = self.tree.add(tr, role);
            let text = cell_text(described, i);
            let lines = self.cell_lines(placed, &text);
            cells.push(Cell { x: placed.x, lines, size: self.size, colour, node });
        }
        let space = RowSpace { above: ROW.0, below: ROW.1, tallest: self.tallest };
        let mut strips = row(&cells, space);
        if described.emphasis == Emphasis::Strong {
            for strip in &mut strips {
                let ground =
                    Ink::Fill { width: self.width() + 2.0 * BLEED, height: strip.height, colour: PALE };
                strip.items.insert(0, Item { x: -BLEED, y: 0.0, node: None, ink: ground });
            }
        }
        if number + 1 < self.table.rows.len()
            && let Some(last) = strips.last_mut()
        {
            let height = last.height;
            last.items.push(self.rule(height - HAIR, HAIR, SAND));
        }
        strips
    }

    fn cell_lines(&self, placed: &Placed, text: &Text) -> Vec<(f32, Line)> {
        let letters = self.size.letters;
        let characters = text.characters();
        let room =
            if placed.align == Align::Decimal { f32::INFINITY } else { (placed.width + 0.01) / letters };
        let lines = broken(self.faces, text, room);
        let numbers = placed.align == Align::Decimal && is_number(&characters);
        lines
            .into_iter()
            .map(|line| {
                let dx = if numbers {
                    let before = width_before(self.faces, text, end_of_whole(&characters)) * letters;
                    placed.width - placed.measured.after_point - before
                } else {
                    shift(placed, line.width * letters)
                };
                (dx, line)
            })
            .collect()
    }
}

/// How far a line of `width` stands from its column's left.
fn shift(placed: &Placed, width: f32) -> f32 {
    match placed.align {
        Align::Left => 0.0,
        Align::Centre => (placed.width - width) / 2.0,
        Align::Right | Align::Decimal => placed.width - width,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_point_of_a_number_is_found_whatever_stands_around_it() {
        for (text, whole) in [
            ("0.4831", 1),
            ("−12,5", 5),
            ("0.31 ± 0.02", 1),
            ("12 ± 0.5", 2),
            ("12", 2),
            ("< 3 bar", 3),
            ("1,234.5", 1),
        ] {
            assert!(is_number(text), "{text}");
            assert_eq!(end_of_whole(text), whole, "{text}");
        }
        for text in ["not evaluated", "–", "", "R12.5"] {
            assert!(!is_number(text), "{text}");
        }
    }
}
