//! Everything in a document that forbids to set it, found before any page is made.
//!
//! Comes in: a document. Goes out: the problems of its texts, colour, tables and attachments, in reading order, and its
//! pictures. Tables that are too wide are found while they are set.

use super::faces::Faces;
use super::model::{Attachment, Block, Document, Figure, Table, Text};
use super::picture::{Picture, Pictures};
use super::problem::Problem;
use super::style::{Colour, FINE, Sheet};

/// Longest name of an attachment, in characters; file systems take 255 bytes.
const LONGEST_NAME: usize = 120;

/// The longest that stands right of the running head.
const LONGEST_LABEL: &str = "page 9999 of 9999";

/// What the check found beside problems.
pub(super) struct Checked {
    pub problems: Vec<Problem>,
    pub accent: Colour,
    pub logo: Option<Picture>,
    /// Of the figures in reading order.
    pub figures: Vec<Option<Picture>>,
}

/// Checks a document.
pub(super) fn checked(document: &Document, faces: &Faces) -> Checked {
    let mut check = Check {
        faces,
        pictures: Pictures::new(),
        problems: Vec::new(),
        figures: Vec::new(),
        counts: Counts::default(),
    };
    let accent = check.frame(document);
    let logo = check.letterhead(document);
    check.blocks(&document.blocks);
    check.attachments(&document.attachments);
    Checked { problems: check.problems, accent, logo, figures: check.figures }
}

/// How many of each kind have been met, to name them by.
#[derive(Default)]
struct Counts {
    heading: usize,
    paragraph: usize,
    list: usize,
    table: usize,
    figure: usize,
    notice: usize,
    sentence: usize,
    signature: usize,
}

fn next(count: &mut usize) -> usize {
    *count += 1;
    *count
}

struct Check<'a> {
    faces: &'a Faces,
    pictures: Pictures,
    problems: Vec<Problem>,
    figures: Vec<Option<Picture>>,
    counts: Counts,
}

impl Check<'_> {
    fn text(&mut self, place: &str, text: &str, bold: bool) {
        for fault in self.faces.faults(text, bold) {
            let problem = Problem::Character { place: place.to_owned(), fault };
            if !self.problems.contains(&problem) {
                self.problems.push(problem);
            }
        }
    }

    fn runs(&mut self, place: &str, text: &Text, bold: bool) {
        for run in &text.0 {
            self.text(place, &run.text, run.bold || bold);
        }
    }

    fn filled(&mut self, place: &str, text: &str, bold: bool) {
        if text.trim().is_empty() {
            self.problems.push(Problem::Empty { place: place.to_owned() });
        }
        self.text(place, text, bold);
    }

    fn frame(&mut self, document: &Document) -> Colour {
        if !is_language(&document.language) {
            self.problems.push(Problem::Language(document.language.clone()));
        }
        self.filled("the title", &document.title, false);
        self.text("the author", document.author.as_deref().unwrap_or_default(), false);
        self.filled("the producer", &document.producer, false);
        self.filled("the running head", &document.running_head, false);
        let sheet = Sheet::of(document.paper);
        let room = sheet.text_width() - 20.0 - self.faces.width(LONGEST_LABEL, false) * FINE.letters;
        let needed = self.faces.width(&document.running_head, false) * FINE.letters;
        if needed > room {
            let percent = ((1.0 - room / needed) * 100.0).ceil();
            self.problems.push(Problem::RunningHead(percent as u32));
        }
        self.filled("the marked end", &document.end, false);
        let accent = document.accent.as_deref().unwrap_or(Document::DEFAULT_ACCENT);
        colour(accent).unwrap_or_else(|| {
            self.problems.push(Problem::Accent(accent.to_owned()));
            super::style::INK
        })
    }

    fn letterhead(&mut self, document: &Document) -> Option<Picture> {
        let letterhead = document.letterhead.as_ref()?;
        self.filled("the name in the letterhead", &letterhead.name, true);
        for (i, line) in letterhead.address.iter().enumerate() {
            self.text(&format!("the letterhead, line {} of the address", i + 1), line, false);
        }
        let logo = letterhead.logo.as_ref()?;
        self.filled("what the logo shows (its alternative text)", &logo.alt, false);
        match self.pictures.logo(&logo.bytes) {
            Ok(picture) => Some(picture),
            Err(fault) => {
                self.problems.push(Problem::Picture { place: "the logo".to_owned(), fault });
                None
            }
        }
    }

    fn blocks(&mut self, blocks: &[Block]) {
        for block in blocks {
            self.block(block);
        }
    }

    fn block(&mut self, block: &Block) {
        match block {
            Block::Heading(_, text) => {
                let place = format!("heading {}", next(&mut self.counts.heading));
                self.filled(&place, text, true);
            }
            Block::Paragraph(text) | Block::FinePrint(text) => {
                let place = format!("paragraph {}", next(&mut self.counts.paragraph));
                self.runs(&place, text, false);
            }
            Block::List(points) => {
                let list = next(&mut self.counts.list);
                for (i, point) in points.iter().enumerate() {
                    self.runs(&format!("list {list}, point {}", i + 1), point, false);
                }
            }
            Block::Pairs { pairs, .. } => {
                for pair in pairs {
                    let named = quoted(&pair.key);
                    self.text(&format!("the name {named}"), &pair.key, false);
                    self.runs(&format!("the value of {named}"), &pair.value, false);
                }
            }
            Block::Table(table) => self.table(table),
            Block::Figure(figure) => self.figure(figure),
            Block::Notice(notice) => {
                let place = format!("notice {}", next(&mut self.counts.notice));
                self.filled(&format!("the word before {place}"), &notice.label, true);
                if notice.paragraphs.is_empty() {
                    self.problems.push(Problem::Empty { place: place.clone() });
                }
                for paragraph in &notice.paragraphs {
                    self.runs(&place, paragraph, false);
                }
            }
            Block::Sentence(sentence) => {
                let place = format!("sentence {}", next(&mut self.counts.sentence));
                self.runs(&place, &sentence.statement, false);
                if let Some(verdict) = &sentence.verdict {
                    // The sign alone would not say it.
                    if verdict.words.is_empty() {
                        self.problems.push(Problem::Empty { place: format!("the verdict of {place}") });
                    }
                    self.runs(&format!("the verdict of {place}"), &verdict.words, false);
                }
            }
            Block::Signatures(signatures) => {
                for signature in signatures {
                    let place = format!("signature {}", next(&mut self.counts.signature));
                    self.text(&format!("{place}, role"), &signature.role, false);
                    self.text(&format!("{place}, name"), signature.name.as_deref().unwrap_or_default(), true);
                    for detail in &signature.details {
                        self.text(&place, detail, false);
                    }
                }
            }
            Block::Together(blocks) => self.blocks(blocks),
            Block::WithNext(block) => self.block(block),
            Block::PageBreak => {}
        }
    }

    fn table(&mut self, table: &Table) {
        let name = format!("table {}", next(&mut self.counts.table));
        if let Some(caption) = &table.caption {
            self.runs(&format!("{name}, caption"), caption, false);
        }
        if table.columns.is_empty() {
            self.problems.push(Problem::Empty { place: name.clone() });
        }
        for (i, column) in table.columns.iter().enumerate() {
            let place = format!("{name}, head of column {}", i + 1);
            self.filled(&place, &column.head, true);
            self.text(
                &format!("{name}, unit of column {}", i + 1),
                column.unit.as_deref().unwrap_or_default(),
                false,
            );
        }
        for (i, row) in table.rows.iter().enumerate() {
            let place = format!("{name}, row {}", i + 1);
            if row.cells.len() != table.columns.len() {
                self.problems.push(Problem::Cells {
                    place: place.clone(),
                    cells: row.cells.len(),
                    columns: table.columns.len(),
                });
            }
            let bold = row.emphasis == super::model::Emphasis::Strong;
            for (cell, column) in row.cells.iter().zip(&table.columns) {
                self.runs(&format!("{place}, column {}", quoted(&column.head)), cell, bold);
            }
        }
    }

    fn figure(&mut self, figure: &Figure) {
        let place = format!("figure {}", next(&mut self.counts.figure));
        self.filled(&format!("what {place} shows (its alternative text)"), &figure.alt, false);
        if let Some(caption) = &figure.caption {
            self.runs(&format!("{place}, caption"), caption, false);
        }
        if !(figure.width > 0.0 && figure.width <= 1.0) {
            self.problems.push(Problem::Width { place: place.clone(), width: figure.width });
        }
        match self.pictures.drawing(&figure.svg) {
            Ok(picture) => self.figures.push(Some(picture)),
            Err(fault) => {
                self.problems.push(Problem::Picture { place, fault });
                self.figures.push(None);
            }
        }
    }

    fn attachments(&mut self, attachments: &[Attachment]) {
        for (i, attachment) in attachments.iter().enumerate() {
            let name = &attachment.name;
            let tame = |c: char| c.is_ascii_alphanumeric() || matches!(c, '.' | '-' | '_');
            if name.is_empty()
                || name.len() > LONGEST_NAME
                || !name.chars().all(tame)
                || name.starts_with('.')
            {
                self.problems.push(Problem::AttachmentName(name.clone()));
                continue;
            }
            if attachments.iter().take(i).any(|earlier| earlier.name == *name) {
                self.problems.push(Problem::AttachmentTwice(name.clone()));
            }
            if krilla::embed::MimeType::new(&attachment.mime_type).is_none() {
                self.problems.push(Problem::AttachmentType {
                    name: name.clone(),
                    mime_type: attachment.mime_type.clone(),
                });
            }
            self.filled(&format!("the description of attachment {name}"), &attachment.description, false);
        }
    }
}

/// A text in quotation marks, short and without what would disturb a message.
fn quoted(text: &str) -> String {
    let mut short: String = text.chars().take(30).flat_map(char::escape_debug).collect();
    if text.chars().nth(30).is_some() {
        short.push('…');
    }
    format!("\u{201C}{short}\u{201D}")
}

/// `#` and six hexadecimal digits.
fn colour(text: &str) -> Option<Colour> {
    let digits =
        text.strip_prefix('#').filter(|d| d.len() == 6 && d.bytes().all(|b| b.is_ascii_hexdigit()))?;
    let part = |from: usize| u8::from_str_radix(digits.get(from..from + 2)?, 16).ok();
    Some(Colour(part(0)?, part(2)?, part(4)?))
}

/// Subtags of one to eight letters and digits behind a language of two or three letters (RFC 5646, 2.1, without its
/// grandfathered tags).
fn is_language(tag: &str) -> bool {
    let mut parts = tag.split('-');
    let language = parts.next().unwrap_or_default();
    matches!(language.len(), 2 | 3)
        && language.bytes().all(|b| b.is_ascii_alphabetic())
        && parts.all(|part| matches!(part.len(), 1..=8) && part.bytes().all(|b| b.is_ascii_alphanumeric()))
}
