//! The document as plain data.
//!
//! Every text is one paragraph: it holds no line break and no other control character, and breaks into lines where it
//! must. What the font lacks is found when the document is set, not here.

use chrono::{DateTime, FixedOffset};

/// A document, whole.
#[derive(Debug, Clone, PartialEq)]
pub struct Document {
    /// Size of the sheet, upright.
    pub paper: Paper,
    /// Language of the texts as a BCP 47 tag: `en`, `de-AT`.
    pub language: String,
    /// Title, as viewers show it; the first heading is a block of its own.
    pub title: String,
    /// Who answers for the content: the shop.
    pub author: Option<String>,
    /// The program that made it, with its version.
    pub producer: String,
    /// Date of the document. Given, never asked from a clock.
    pub date: DateTime<FixedOffset>,
    /// Stands on every page, left of "page i of n": the number of the certificate.
    pub running_head: String,
    /// The marked end after the last block: "end of certificate EB-2026-0017".
    pub end: String,
    /// Colour of rules as `#RRGGBB`; [`Document::DEFAULT_ACCENT`] when absent. No meaning hangs on it.
    pub accent: Option<String>,
    /// Stands on top of the first page.
    pub letterhead: Option<Letterhead>,
    /// The content in reading order.
    pub blocks: Vec<Block>,
    /// Files carried inside; their names differ.
    pub attachments: Vec<Attachment>,
}

impl Document {
    /// The accent of the program itself.
    pub const DEFAULT_ACCENT: &'static str = "#0B6E7A";
}

/// Size of a sheet, upright.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Paper {
    /// 210 mm by 297 mm (ISO 216).
    A4,
    /// 148 mm by 210 mm (ISO 216).
    A5,
    /// 8.5 in by 11 in (ANSI A).
    Letter,
}

/// Who sends the document.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Letterhead {
    /// Name of the shop.
    pub name: String,
    /// Address, telephone and the like, line by line.
    pub address: Vec<String>,
    /// Picture beside them.
    pub logo: Option<Logo>,
}

/// A picture of any size, scaled into its box with its proportions kept.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Logo {
    /// A PNG file or the text of an SVG file; which of the two shows in the bytes.
    pub bytes: Vec<u8>,
    /// What it shows, for those who do not see it.
    pub alt: String,
}

/// One paragraph of text in runs.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Text(pub Vec<Run>);

/// A stretch of text in one weight.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Run {
    /// The characters.
    pub text: String,
    /// Bold instead of regular.
    pub bold: bool,
}

impl Text {
    /// Regular text.
    pub fn plain(text: impl Into<String>) -> Self {
        Self::default().and(text)
    }

    /// Bold text.
    pub fn bold(text: impl Into<String>) -> Self {
        Self::default().and_bold(text)
    }

    /// The same with regular text behind.
    #[must_use]
    pub fn and(mut self, text: impl Into<String>) -> Self {
        self.0.push(Run { text: text.into(), bold: false });
        self
    }

    /// The same with bold text behind.
    #[must_use]
    pub fn and_bold(mut self, text: impl Into<String>) -> Self {
        self.0.push(Run { text: text.into(), bold: true });
        self
    }

    /// The characters without their weight.
    pub fn characters(&self) -> String {
        self.0.iter().map(|run| run.text.as_str()).collect()
    }

    /// Whether it holds no character at all.
    pub fn is_empty(&self) -> bool {
        self.0.iter().all(|run| run.text.is_empty())
    }
}

impl From<&str> for Text {
    fn from(text: &str) -> Self {
        Self::plain(text)
    }
}

impl From<String> for Text {
    fn from(text: String) -> Self {
        Self::plain(text)
    }
}

/// A piece of the content.
#[derive(Debug, Clone, PartialEq)]
pub enum Block {
    /// A heading; never alone at the foot of a page.
    Heading(Level, String),
    /// A paragraph.
    Paragraph(Text),
    /// A paragraph in smaller letters: what has to be said once, such as "copy only in full".
    FinePrint(Text),
    /// Points of a list, one paragraph each.
    List(Vec<Text>),
    /// Names with their values.
    Pairs {
        /// In order: down the first column, then down the second.
        pairs: Vec<Pair>,
        /// In two columns side by side, where the paper is wide enough (not on A5).
        two_columns: bool,
    },
    /// A table.
    Table(Table),
    /// A drawing.
    Figure(Figure),
    /// A caution, set off from the text.
    Notice(Notice),
    /// The result in a sentence, in large letters.
    Sentence(Sentence),
    /// Places to sign, two beside one another.
    Signatures(Vec<Signature>),
    /// Blocks that stay on one page, if they fit on one at all.
    Together(Vec<Block>),
    /// A block that stays on the page where the next one begins.
    WithNext(Box<Block>),
    /// What follows begins on a new page, unless it does so anyway.
    PageBreak,
}

/// Level of a heading.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Level {
    /// Of the document.
    One,
    /// Of a section.
    Two,
    /// Of a part of a section.
    Three,
}

/// A name with its value.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Pair {
    /// What it is.
    pub key: String,
    /// Its value; may be empty, which stays an empty place.
    pub value: Text,
}

/// A table. Its head is repeated on each page.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Table {
    /// Stands above it.
    pub caption: Option<Text>,
    /// At least one.
    pub columns: Vec<Column>,
    /// Each with as many cells as there are columns.
    pub rows: Vec<Row>,
    /// Whether the first cell of each row says what the row is.
    pub row_heads: bool,
}

/// A column of a table; as wide as its content asks for.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Column {
    /// Its head.
    pub head: String,
    /// The unit of its values, under the head.
    pub unit: Option<String>,
    /// Where cells stand in it.
    pub align: Align,
}

impl Column {
    /// A column without a unit.
    pub fn new(head: impl Into<String>, align: Align) -> Self {
        Self { head: head.into(), unit: None, align }
    }

    /// A column of numbers in a unit, under one another by their decimal points.
    pub fn numbers(head: impl Into<String>, unit: impl Into<String>) -> Self {
        Self { head: head.into(), unit: Some(unit.into()), align: Align::Decimal }
    }
}

/// Where the cells of a column stand.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Align {
    /// On the left; cells wrap.
    Left,
    /// In the middle; cells wrap.
    Centre,
    /// On the right; cells wrap.
    Right,
    /// Decimal points under one another. The point is the first `.` or `,` between two digits; a number without one ends
    /// where the others have it, and what is no number stands on the right. Cells do not wrap.
    Decimal,
}

/// A row of a table.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Row {
    /// As many as the table has columns.
    pub cells: Vec<Text>,
    /// How it stands out.
    pub emphasis: Emphasis,
}

impl Row {
    /// A row like the others.
    pub fn new(cells: impl IntoIterator<Item = impl Into<Text>>) -> Self {
        Self { cells: cells.into_iter().map(Into::into).collect(), emphasis: Emphasis::None }
    }

    /// The same row, standing out.
    #[must_use]
    pub fn with(mut self, emphasis: Emphasis) -> Self {
        self.emphasis = emphasis;
        self
    }
}

/// How a row stands out from its neighbours.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Emphasis {
    /// Not at all.
    #[default]
    None,
    /// Bold: a total, the nominal pressure.
    Strong,
    /// Paler: a point that was left out. A cell has to say so in words.
    Quiet,
}

/// A drawing.
#[derive(Debug, Clone, PartialEq)]
pub struct Figure {
    /// The text of an SVG file whose texts are in a bundled family (DejaVu Sans).
    pub svg: String,
    /// What it shows, for those who do not see it. Not empty.
    pub alt: String,
    /// Stands under it.
    pub caption: Option<Text>,
    /// Width as a share of the width of the text, above 0 and up to 1.
    pub width: f32,
}

/// A caution, set off from the text by a bar and a word.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Notice {
    /// The word before it: "Caution". Black and white print has nothing else to tell it by.
    pub label: String,
    /// Its paragraphs.
    pub paragraphs: Vec<Text>,
}

/// The result in a sentence, with the verdict on it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Sentence {
    /// The result.
    pub statement: Text,
    /// What it was judged to be, where it was.
    pub verdict: Option<Verdict>,
}

/// A verdict. The sign beside it only repeats the words.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Verdict {
    /// Chooses the sign.
    pub standing: Standing,
    /// In words, with the rule it was reached by.
    pub words: Text,
}

/// Which sign stands beside a verdict: the level line whole, broken or crossed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// It holds.
    Holds,
    /// It is undecided.
    Undecided,
    /// It does not hold.
    DoesNotHold,
}

/// A place to sign.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Signature {
    /// What is signed: "Measured by", "Authorised by".
    pub role: String,
    /// Who signs, where known.
    pub name: Option<String>,
    /// Under the name: place and date, function.
    pub details: Vec<String>,
}

/// A file carried inside the document.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Attachment {
    /// File name without folders, unlike all others of the document: `readings.csv`.
    pub name: String,
    /// MIME type: `text/csv`.
    pub mime_type: String,
    /// What it is to the document.
    pub relationship: Relationship,
    /// What it holds, in a few words.
    pub description: String,
    /// The file itself.
    pub bytes: Vec<u8>,
    /// When it was last changed. Given, never asked from a clock.
    pub modified: DateTime<FixedOffset>,
}

/// What an attached file is to the document (ISO 19005-3, `AFRelationship`).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Relationship {
    /// The document was made from it.
    Source,
    /// What a table or figure shows was derived from it.
    Data,
    /// The same content in another form.
    Alternative,
    /// Something beside it.
    Supplement,
    /// None of these.
    Unspecified,
}
