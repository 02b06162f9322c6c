//! Writing into the cells of a screen, within its edges whatever is written.

use ratatui::buffer::Buffer;
use ratatui::layout::Rect;
use ratatui::style::Style;
use unicode_width::{UnicodeWidthChar as _, UnicodeWidthStr as _};

use super::look::Look;

/// A pen over the cells of a screen.
pub(super) struct Pen<'a> {
    pub(super) buffer: &'a mut Buffer,
    pub(super) look: Look,
}

impl Pen<'_> {
    /// A text in the first row of an area; what is too long ends with a sign that it was.
    pub(super) fn text(&mut self, area: Rect, text: &str, style: Style) {
        let area = area.intersection(self.buffer.area);
        if area.is_empty() {
            return;
        }
        let text = cut(&self.look.text(text), usize::from(area.width), self.look);
        self.buffer.set_stringn(area.x, area.y, text, usize::from(area.width), style);
    }

    /// A text at the right end of the first row of an area; the columns it left on its left, without a gap of two.
    pub(super) fn right(&mut self, area: Rect, text: &str, style: Style) -> Rect {
        let wide = u16::try_from(width(&self.look.text(text))).unwrap_or(u16::MAX).min(area.width);
        let left = area.width - wide;
        self.text(Rect { x: area.x + left, width: wide, ..area }, text, style);
        Rect { width: left.saturating_sub(2), ..area }
    }

    /// One string into one cell and those to its right, if they are there.
    pub(super) fn glyph(&mut self, x: u16, y: u16, glyph: &str, style: Style) {
        if let Some(cell) = self.buffer.cell_mut((x, y)) {
            cell.set_symbol(glyph).set_style(style);
        }
    }

    /// A level stroke through the whole of a row.
    pub(super) fn rule(&mut self, area: Rect) {
        let stroke = self.look.glyph("─", "-");
        let style = self.look.faint();
        for x in area.x..area.right() {
            self.glyph(x, area.y, stroke, style);
        }
    }

    /// A stroke down the first column of an area.
    pub(super) fn bar(&mut self, area: Rect) {
        let stroke = self.look.glyph("│", "|");
        let style = self.look.faint();
        for y in area.y..area.bottom() {
            self.glyph(area.x, y, stroke, style);
        }
    }

    /// Lines from the top of an area, as many as it has rows.
    pub(super) fn lines(&mut self, area: Rect, lines: &[(String, Style)]) {
        for (row, (text, style)) in rows(area).zip(lines) {
            self.text(row, text, *style);
        }
    }

    /// A gauge: how much of a whole has passed, 0 to 1.
    pub(super) fn gauge(&mut self, area: Rect, share: f64, style: Style) {
        let share = if share.is_finite() { share.clamp(0.0, 1.0) } else { 0.0 };
        let done = (share * f64::from(area.width)).floor() as u16;
        for i in 0..area.width {
            let glyph = if i < done { self.look.glyph("━", "#") } else { self.look.glyph("─", "-") };
            let style = if i < done { style } else { self.look.faint() };
            self.glyph(area.x + i, area.y, glyph, style);
        }
    }
}

/// The rows of an area, from its top.
pub(super) fn rows(area: Rect) -> impl Iterator<Item = Rect> {
    (area.y..area.bottom()).map(move |y| Rect { y, height: 1, ..area })
}

/// Takes rows from the top of an area.
pub(super) fn take(area: &mut Rect, height: u16) -> Rect {
    let height = height.min(area.height);
    let taken = Rect { height, ..*area };
    area.y += height;
    area.height -= height;
    taken
}

/// Takes rows from the bottom of an area.
pub(super) fn take_below(area: &mut Rect, height: u16) -> Rect {
    let height = height.min(area.height);
    area.height -= height;
    Rect { y: area.bottom(), height, ..*area }
}

/// The area without a margin of columns at both sides.
pub(super) fn inset(area: Rect, margin: u16) -> Rect {
    let width = area.width.saturating_sub(2 * margin);
    Rect { x: area.x + margin.min(area.width), width, ..area }
}

/// Columns of a text.
pub(super) fn width(text: &str) -> usize {
    text.width()
}

/// A text cut to so many columns, with a sign that it was.
pub(super) fn cut(text: &str, most: usize, look: Look) -> String {
    if width(text) <= most {
        return text.to_owned();
    }
    let sign = look.glyph("…", "~");
    let mut kept = String::new();
    let mut columns = 0;
    for c in text.chars() {
        columns += c.width().unwrap_or(0);
        if columns + 1 > most {
            break;
        }
        kept.push(c);
    }
    if most > 0 { kept.trim_end().to_owned() + sign } else { String::new() }
}

/// The end of a text that has at most so many columns.
pub(super) fn tail(text: &str, most: usize) -> String {
    let mut columns = 0;
    let kept: Vec<char> = text
        .chars()
        .rev()
        .take_while(|c| {
            columns += c.width().unwrap_or(0);
            columns <= most
        })
        .collect();
    kept.into_iter().rev().collect()
}

/// A text broken at spaces into lines of at most so many columns; a word that is longer is broken too.
pub(super) fn wrap(text: &str, most: usize) -> Vec<String> {
    let most = most.max(1);
    let mut lines: Vec<String> = Vec::new();
    let mut line = String::new();
    for word in text.split_whitespace() {
        let gap = usize::from(!line.is_empty());
        if width(&line) + gap + width(word) <= most {
            if gap == 1 {
                line.push(' ');
            }
            line.push_str(word);
            continue;
        }
        if !line.is_empty() {
            lines.push(std::mem::take(&mut line));
        }
        for c in word.chars() {
            if width(&line) + c.width().unwrap_or(0) > most {
                lines.push(std::mem::take(&mut line));
            }
            line.push(c);
        }
    }
    if !line.is_empty() {
        lines.push(line);
    }
    lines
}

/// Parts joined by a dot between them into lines of at most so many columns, no part broken that fits a line.
pub(super) fn joined(parts: &[String], most: usize) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for part in parts {
        match lines.last_mut() {
            Some(line) if width(line) + 3 + width(part) <= most => {
                line.push_str(" · ");
                line.push_str(part);
            }
            _ => lines.extend(wrap(part, most)),
        }
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cli::live::look::Glyphs;

    const LOOK: Look = Look { glyphs: Glyphs::Full, colour: false };

    #[test]
    fn texts_are_cut_and_broken_by_columns_and_not_by_bytes() {
        assert_eq!(cut("Ева Варга", 9, LOOK), "Ева Варга");
        assert_eq!(cut("Ева Варга", 6, LOOK), "Ева В…");
        assert_eq!(cut("試験弁", 5, LOOK), "試験…");
        assert_eq!(tail("Ева Варга", 5), "Варга");
        assert_eq!(wrap("one two  three", 7), ["one two", "three"]);
        assert_eq!(wrap("abcdefgh ij", 3), ["abc", "def", "gh", "ij"]);
        assert_eq!(joined(&["one".into(), "two".into(), "three".into()], 9), ["one · two", "three"]);
    }

    #[test]
    fn nothing_is_written_beyond_an_edge() {
        let mut buffer = Buffer::empty(Rect::new(0, 0, 4, 1));
        let mut pen = Pen { buffer: &mut buffer, look: LOOK };
        pen.text(Rect::new(2, 0, 40, 1), "level", Style::new());
        pen.text(Rect::new(0, 7, 40, 1), "below", Style::new());
        pen.gauge(Rect::new(3, 0, 9, 1), f64::NAN, Style::new());
        pen.rule(Rect::new(0, 5, 9, 1));
        let row: String = buffer.content.iter().map(|cell| cell.symbol()).collect();
        assert_eq!(row, "  l─");
    }
}
