//! Large numerals, to be read at arm's length: three rows of half blocks, six rows of whole ones, or strokes of ASCII.

use ratatui::layout::Rect;
use ratatui::style::Style;

use super::pen::{Pen, width};

/// How large.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Size {
    /// Three rows.
    Three,
    /// Six rows.
    Six,
}

impl Size {
    /// Rows of it.
    pub(super) const fn rows(self) -> u16 {
        match self {
            Self::Three => 3,
            Self::Six => 6,
        }
    }
}

/// Six rows of dots of a numeral, all of one width. Our own drawing.
const fn dots(c: char) -> Option<[&'static str; 6]> {
    Some(match c {
        '0' => ["####", "#..#", "#..#", "#..#", "#..#", "####"],
        '1' => ["..#.", ".##.", "..#.", "..#.", "..#.", ".###"],
        '2' => ["####", "...#", "####", "#...", "#...", "####"],
        '3' => ["####", "...#", ".###", "...#", "...#", "####"],
        '4' => ["#..#", "#..#", "####", "...#", "...#", "...#"],
        '5' => ["####", "#...", "####", "...#", "...#", "####"],
        '6' => ["####", "#...", "####", "#..#", "#..#", "####"],
        '7' => ["####", "...#", "..#.", "..#.", ".#..", ".#.."],
        '8' => ["####", "#..#", "####", "#..#", "#..#", "####"],
        '9' => ["####", "#..#", "####", "...#", "...#", "####"],
        '-' => ["....", "....", "####", "....", "....", "...."],
        '.' => [".", ".", ".", ".", ".", "#"],
        _ => return None,
    })
}

/// Three rows of strokes of a numeral, for terminals that know ASCII alone.
const fn strokes(c: char) -> Option<[&'static str; 3]> {
    Some(match c {
        '0' => [" _ ", "| |", "|_|"],
        '1' => ["   ", "  |", "  |"],
        '2' => [" _ ", " _|", "|_ "],
        '3' => [" _ ", " _|", " _|"],
        '4' => ["   ", "|_|", "  |"],
        '5' => [" _ ", "|_ ", " _|"],
        '6' => [" _ ", "|_ ", "|_|"],
        '7' => [" _ ", "  |", "  |"],
        '8' => [" _ ", "|_|", "|_|"],
        '9' => [" _ ", "|_|", " _|"],
        '-' => ["   ", " _ ", "   "],
        '.' => [" ", " ", "."],
        _ => return None,
    })
}

/// A number in large numerals as rows of text; none when there is a character in it that has no numeral.
pub(super) fn large(number: &str, size: Size, ascii: bool) -> Option<Vec<String>> {
    let mut rows = vec![String::new(); usize::from(size.rows())];
    for (place, c) in number.chars().enumerate() {
        let cells: Vec<String> = match (size, ascii) {
            (Size::Three, true) => strokes(c)?.iter().map(|row| (*row).to_owned()).collect(),
            (Size::Three, false) => dots(c)?.chunks_exact(2).map(half_blocks).collect(),
            (Size::Six, _) => dots(c)?.iter().map(|row| whole_blocks(row, ascii)).collect(),
        };
        for (row, cells) in rows.iter_mut().zip(cells) {
            if place > 0 {
                row.push(' ');
            }
            row.push_str(&cells);
        }
    }
    Some(rows)
}

/// Two rows of dots in one row of cells.
fn half_blocks(rows: &[&str]) -> String {
    let [upper, lower] = rows else { return String::new() };
    let pairs = upper.bytes().zip(lower.bytes());
    pairs
        .map(|pair| match pair {
            (b'#', b'#') => '█',
            (b'#', _) => '▀',
            (_, b'#') => '▄',
            _ => ' ',
        })
        .collect()
}

/// A row of dots, two cells wide each.
fn whole_blocks(row: &str, ascii: bool) -> String {
    let full = if ascii { "##" } else { "██" };
    row.bytes().map(|dot| if dot == b'#' { full } else { "  " }).collect()
}

/// A number in large numerals with what stands beside it, if both fit into so many columns.
fn fitting(columns: u16, number: &str, beside: &str, size: Size, ascii: bool) -> Option<Vec<String>> {
    let room = usize::from(columns).saturating_sub(width(beside) + 1);
    large(number, size, ascii).filter(|rows| rows.iter().all(|row| width(row) <= room))
}

/// Whether a number with its unit fits into so many columns at a size.
pub(super) fn fits(columns: u16, number: &str, beside: &str, size: Size) -> bool {
    fitting(columns, number, beside, size, true).is_some()
}

/// Draws a number with what stands to the right of its last row; where that is too wide it is written in one row.
pub(super) fn draw(pen: &mut Pen<'_>, area: Rect, number: &str, beside: &str, (size, style): (Size, Style)) {
    let rows = fitting(area.width, number, beside, size, pen.look.is_ascii());
    let Some(rows) = rows.filter(|_| area.height >= size.rows()) else {
        let middle = Rect { y: area.y + area.height / 2, height: 1, ..area };
        pen.text(middle, &format!("{number} {beside}"), style);
        return;
    };
    for (row, y) in rows.iter().zip(area.y..) {
        pen.text(Rect { y, height: 1, ..area }, row, style);
    }
    let wide = rows.first().map_or(0, |row| width(row) + 1);
    let wide = u16::try_from(wide).unwrap_or(area.width).min(area.width);
    let last = Rect {
        x: area.x + wide,
        y: area.y + size.rows() - 1,
        width: area.width.saturating_sub(wide),
        height: 1,
    };
    pen.text(last, beside, pen.look.strong());
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_numeral_has_all_its_rows_of_one_width_and_differs_from_the_others() {
        let all = "0123456789-.";
        for ascii in [true, false] {
            for size in [Size::Three, Size::Six] {
                let drawn: Vec<Vec<String>> =
                    all.chars().map(|c| large(&c.to_string(), size, ascii).unwrap()).collect();
                for (place, rows) in drawn.iter().enumerate() {
                    assert_eq!(rows.len(), usize::from(size.rows()));
                    let widths: Vec<usize> = rows.iter().map(|row| row.chars().count()).collect();
                    assert!(widths.iter().all(|w| *w == widths[0]), "{rows:?}");
                    assert!(!drawn.iter().take(place).any(|other| other == rows), "{rows:?}");
                }
            }
        }
        assert_eq!(large("1 e", Size::Three, false), None);
    }

    #[test]
    fn half_blocks_stand_for_two_rows_of_dots() {
        assert_eq!(
            large("25.0", Size::Three, false).unwrap(),
            ["▀▀▀█ █▀▀▀   █▀▀█", "█▀▀▀ ▀▀▀█   █  █", "█▄▄▄ ▄▄▄█ ▄ █▄▄█"]
        );
    }
}
