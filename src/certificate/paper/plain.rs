//! The same document as plain text, for a look in the terminal.
//!
//! Comes in: a document and a width in characters. Goes out: lines of at most that width (a table that cannot be made
//! as narrow becomes a list). Nothing is refused: what must not reach a terminal is shown by its number.

use super::characters::{fault, is_mark};
use super::model::{Align, Block, Document, Level, Relationship, Signature, Standing, Table};
use super::table::{end_of_whole, is_number};

/// Narrower than this nothing is set.
const NARROWEST: usize = 24;
/// Columns of a table are not made narrower than this, unless all they hold is.
const NARROW_COLUMN: usize = 10;
const BETWEEN_COLUMNS: usize = 2;

/// The document as text in lines of at most `width` characters, at least 24.
pub fn text(document: &Document, width: usize) -> String {
    let mut out = Out { width: width.max(NARROWEST), lines: Vec::new() };
    if let Some(letterhead) = &document.letterhead {
        out.paragraph("", &letterhead.name);
        letterhead.address.iter().for_each(|line| out.paragraph("", line));
        out.lines.push("─".repeat(out.width));
    }
    out.paragraph("", &document.running_head);
    out.blocks(&document.blocks);
    out.space();
    out.paragraph("── ", &document.end);
    for attachment in &document.attachments {
        let kind = match attachment.relationship {
            Relationship::Source => "source",
            Relationship::Data => "data",
            Relationship::Alternative => "alternative",
            Relationship::Supplement => "supplement",
            Relationship::Unspecified => "unspecified",
        };
        let (name, about, size) = (&attachment.name, &attachment.description, attachment.bytes.len());
        out.paragraph("attached: ", &format!("{name} ({kind}, {size} bytes): {about}"));
    }
    let mut text = out.lines.join("\n");
    text.push('\n');
    text
}

struct Out {
    width: usize,
    lines: Vec<String>,
}

impl Out {
    fn space(&mut self) {
        if self.lines.last().is_some_and(|line| !line.is_empty()) {
            self.lines.push(String::new());
        }
    }

    /// Text behind `lead`, which later lines are indented by.
    fn paragraph(&mut self, lead: &str, text: &str) {
        let indent = " ".repeat(length(lead));
        for (i, line) in wrapped(text, self.width.saturating_sub(length(lead))).into_iter().enumerate() {
            let before = if i == 0 { lead } else { &indent };
            self.lines.push(format!("{before}{line}").trim_end().to_owned());
        }
    }

    fn blocks(&mut self, blocks: &[Block]) {
        for block in blocks {
            self.block(block);
        }
    }

    fn block(&mut self, block: &Block) {
        match block {
            Block::Heading(level, text) => {
                self.space();
                self.paragraph("", text);
                let under = match level {
                    Level::One => "═",
                    Level::Two => "─",
                    Level::Three => "",
                };
                let longest = self.lines.last().map_or(0, |line| length(line));
                if !under.is_empty() {
                    self.lines.push(under.repeat(longest));
                }
            }
            Block::Paragraph(text) | Block::FinePrint(text) => {
                self.space();
                self.paragraph("", &text.characters());
            }
            Block::List(points) => {
                self.space();
                points.iter().for_each(|point| self.paragraph("– ", &point.characters()));
            }
            Block::Pairs { pairs, .. } => {
                self.space();
                let keys =
                    pairs.iter().map(|pair| length(&tame(&pair.key))).max().unwrap_or(0).min(self.width / 2);
                for pair in pairs {
                    self.beside(&pair.key, &pair.value.characters(), keys);
                }
            }
            Block::Table(table) => {
                self.space();
                if let Some(caption) = &table.caption {
                    self.paragraph("", &caption.characters());
                }
                self.table(table);
            }
            Block::Figure(figure) => {
                self.space();
                self.paragraph("[figure] ", &figure.alt);
                if let Some(caption) = &figure.caption {
                    self.paragraph("         ", &caption.characters());
                }
            }
            Block::Notice(notice) => {
                self.space();
                self.paragraph("┃ ", &notice.label);
                for paragraph in &notice.paragraphs {
                    for line in wrapped(&paragraph.characters(), self.width - 2) {
                        self.lines.push(format!("┃ {line}"));
                    }
                }
            }
            Block::Sentence(sentence) => {
                self.space();
                self.paragraph("", &sentence.statement.characters());
                if let Some(verdict) = &sentence.verdict {
                    let sign = match verdict.standing {
                        Standing::Holds => "─────  ",
                        Standing::Undecided => "──  ─  ",
                        Standing::DoesNotHold => "──╱──  ",
                    };
                    self.paragraph(sign, &verdict.words.characters());
                }
            }
            Block::Signatures(signatures) => {
                signatures.iter().for_each(|signature| self.signature(signature))
            }
            Block::Together(blocks) => self.blocks(blocks),
            Block::WithNext(block) => self.block(block),
            Block::PageBreak => self.space(),
        }
    }

    fn signature(&mut self, signature: &Signature) {
        self.space();
        self.lines.push("_".repeat(NARROWEST));
        self.paragraph("", &signature.role);
        signature.name.iter().chain(&signature.details).for_each(|line| self.paragraph("", line));
    }

    /// A name in a column of its own, and what it stands for.
    fn beside(&mut self, key: &str, value: &str, keys: usize) {
        let (keys_wrapped, values) =
            (wrapped(key, keys), wrapped(value, self.width - keys - BETWEEN_COLUMNS));
        for i in 0..keys_wrapped.len().max(values.len()) {
            let part = |of: &[String]| of.get(i).cloned().unwrap_or_default();
            let line = format!("{}  {}", padded(&part(&keys_wrapped), keys, Align::Left), part(&values));
            self.lines.push(line.trim_end().to_owned());
        }
    }

    fn table(&mut self, table: &Table) {
        let heads: Vec<String> = table
            .columns
            .iter()
            .map(|column| match &column.unit {
                Some(unit) => format!("{}, {unit}", column.head),
                None => column.head.clone(),
            })
            .collect();
        let Some(widths) = self.widths(table, &heads) else {
            for row in &table.rows {
                for (head, cell) in heads.iter().zip(&row.cells) {
                    self.paragraph("", &format!("{head}: {}", cell.characters()));
                }
                self.lines.push("·".to_owned());
            }
            return;
        };
        let aligns: Vec<Align> = table.columns.iter().map(|column| column.align).collect();
        let heads = heads.iter().zip(&widths).map(|(head, column)| wrapped(head, column.width)).collect();
        self.row(heads, &widths, &aligns);
        let all: usize = widths.iter().map(|column| column.width + BETWEEN_COLUMNS).sum();
        self.lines.push("─".repeat(all.saturating_sub(BETWEEN_COLUMNS)));
        for row in &table.rows {
            let cells = row.cells.iter().zip(&widths).zip(&aligns);
            let cells = cells.map(|((cell, column), align)| {
                let cell = tame(&cell.characters());
                if *align == Align::Decimal && is_number(&cell) {
                    // Spaces behind bring the points under one another.
                    let after = length(&cell) - length(cell.get(..end_of_whole(&cell)).unwrap_or_default());
                    vec![format!("{cell}{}", " ".repeat(column.after_point.saturating_sub(after)))]
                } else {
                    wrapped(&cell, column.width)
                }
            });
            let cells = cells.collect();
            self.row(cells, &widths, &aligns);
        }
    }

    fn row(&mut self, cells: Vec<Vec<String>>, widths: &[Column], aligns: &[Align]) {
        let tallest = cells.iter().map(Vec::len).max().unwrap_or(0);
        for i in 0..tallest {
            let parts: Vec<String> = cells
                .iter()
                .zip(widths.iter().zip(aligns))
                .map(|(lines, (column, align))| {
                    padded(lines.get(i).map_or("", String::as_str), column.width, *align)
                })
                .collect();
            self.lines.push(parts.join(&" ".repeat(BETWEEN_COLUMNS)).trim_end().to_owned());
        }
    }

    /// Columns that fit side by side, if they can be made to.
    fn widths(&self, table: &Table, heads: &[String]) -> Option<Vec<Column>> {
        let mut columns: Vec<Column> = Vec::new();
        for (i, column) in table.columns.iter().enumerate() {
            let cells: Vec<String> = table
                .rows
                .iter()
                .filter_map(|row| row.cells.get(i))
                .map(|cell| tame(&cell.characters()))
                .collect();
            let after =
                |cell: &str| length(cell) - length(cell.get(..end_of_whole(cell)).unwrap_or_default());
            let numbers: Vec<&String> =
                cells.iter().filter(|cell| column.align == Align::Decimal && is_number(cell)).collect();
            let after_point = numbers.iter().map(|cell| after(cell)).max().unwrap_or(0);
            let before = numbers.iter().map(|cell| length(cell) - after(cell)).max().unwrap_or(0);
            let widest = cells.iter().map(|cell| length(cell)).max().unwrap_or(0).max(before + after_point);
            let fixed = if column.align == Align::Decimal { widest } else { 0 };
            let head = heads.get(i).map_or(0, |head| length(&tame(head)));
            let head_word = heads
                .get(i)
                .map_or(0, |head| head.split(' ').map(length).max().unwrap_or(0))
                .min(NARROW_COLUMN);
            let least = fixed.max(widest.min(NARROW_COLUMN)).max(head_word);
            columns.push(Column { width: widest.max(head), least, after_point });
        }
        let room = self.width.checked_sub(BETWEEN_COLUMNS * columns.len().saturating_sub(1))?;
        if columns.iter().map(|column| column.least).sum::<usize>() > room {
            return None;
        }
        // Taken from the widest, one character at a time.
        while columns.iter().map(|column| column.width).sum::<usize>() > room {
            let widest = columns
                .iter_mut()
                .filter(|column| column.width > column.least)
                .max_by_key(|column| column.width)?;
            widest.width -= 1;
        }
        Some(columns)
    }
}

struct Column {
    width: usize,
    least: usize,
    after_point: usize,
}

/// Width in a terminal, in characters: marks stand on the letter before them.
fn length(text: &str) -> usize {
    text.chars().filter(|c| !is_mark(*c)).count()
}

/// The text without what a terminal would obey or hide.
fn tame(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match fault(c) {
            Some(_) => out.extend(c.escape_unicode()),
            None => out.push(c),
        }
    }
    out
}

fn padded(text: &str, width: usize, align: Align) -> String {
    let missing = width.saturating_sub(length(text));
    let before = match align {
        Align::Left => 0,
        Align::Centre => missing / 2,
        Align::Right | Align::Decimal => missing,
    };
    format!("{}{text}{}", " ".repeat(before), " ".repeat(missing - before))
}

/// Lines of at most `width` characters, at least one; a longer word breaks anywhere.
fn wrapped(text: &str, width: usize) -> Vec<String> {
    let width = width.max(1);
    let mut lines = vec![String::new()];
    let mut used = 0;
    for word in tame(text).split(' ') {
        let long = length(word);
        if used > 0 && used + 1 + long > width {
            lines.push(String::new());
            used = 0;
        }
        if let Some(line) = lines.last_mut()
            && used > 0
        {
            line.push(' ');
            used += 1;
        }
        for c in word.chars() {
            let wide = usize::from(!is_mark(c));
            if used + wide > width {
                lines.push(String::new());
                used = 0;
            }
            if let Some(line) = lines.last_mut() {
                line.push(c);
            }
            used += wide;
        }
    }
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_keep_their_width_and_lose_no_letter() {
        for text in ["one two three four", &"e\u{301}".repeat(50), "a 0123456789012345678901234567890 b"] {
            let lines = wrapped(text, 9);
            assert!(lines.iter().all(|line| length(line) <= 9), "{lines:?}");
            let letters = |s: &str| s.chars().filter(|c| *c != ' ').collect::<String>();
            assert_eq!(letters(&lines.concat()), letters(text));
        }
    }

    #[test]
    fn what_a_terminal_would_obey_is_shown_by_its_number() {
        assert_eq!(tame("a\u{1B}[2Jb\u{202E}"), "a\\u{1b}[2Jb\\u{202e}");
    }
}
