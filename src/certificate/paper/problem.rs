//! Why a document cannot be set in pages.

use super::characters::Fault;

/// One reason; a document is set only when there is none.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Problem {
    /// A character that cannot be printed or must not be.
    #[error("{place}: {fault}")]
    Character {
        /// Where it stands: `table 2, row 3, column "flow"`.
        place: String,
        /// What is wrong with it.
        fault: Fault,
    },
    /// Nothing stands where something has to.
    #[error("{place} is empty: write something there, or leave the whole piece out")]
    Empty {
        /// Where.
        place: String,
    },
    /// A picture that cannot be set.
    #[error("{place}: {fault}")]
    Picture {
        /// Which.
        place: String,
        /// Why not.
        fault: PictureFault,
    },
    /// A share of the width that is none.
    #[error("{place} asks for {width} times the width of the text: give a number above 0 and up to 1")]
    Width {
        /// Which figure.
        place: String,
        /// As it was given.
        width: f32,
    },
    /// A table without columns, or a row with more or fewer cells than columns.
    #[error("{place} has {cells} cells, and its table {columns} columns: give each column one cell")]
    Cells {
        /// Which row.
        place: String,
        /// Cells it has.
        cells: usize,
        /// Columns of its table.
        columns: usize,
    },
    /// A table that does not fit in the smallest letters either.
    #[error(
        "{place} needs {needs_mm:.0} mm in the smallest letters, and the paper gives {room_mm:.0} mm: leave columns out, \
         shorten heads, or take larger paper"
    )]
    TooWide {
        /// Which table.
        place: String,
        /// Least width in millimetres.
        needs_mm: f32,
        /// Width of the text in millimetres.
        room_mm: f32,
    },
    /// An accent that is no colour.
    #[error("the accent colour \u{201C}{}\u{201D} is not of the form #0B6E7A: give six hexadecimal digits behind #", .0.escape_debug())]
    Accent(String),
    /// A language tag no reader would know.
    #[error("the language \u{201C}{}\u{201D} is no tag such as en or de-AT", .0.escape_debug())]
    Language(String),
    /// A name no file of every system may have.
    #[error(
        "the attachment name \u{201C}{}\u{201D} is not made of letters a to z, digits, \".\", \"-\" and \"_\", at most 120 of them",
        .0.escape_debug()
    )]
    AttachmentName(String),
    /// A type that is none.
    #[error("attachment {name}: \u{201C}{}\u{201D} is no MIME type such as text/csv", mime_type.escape_debug())]
    AttachmentType {
        /// Of the attachment.
        name: String,
        /// As it was given.
        mime_type: String,
    },
    /// Two attachments of one name.
    #[error("two attachments are named {0}: give them different names")]
    AttachmentTwice(String),
    /// A running head longer than its line.
    #[error("the running head is longer than a line beside the page's number: shorten it by about {0} %")]
    RunningHead(u32),
    /// A drawing with something that PDF/A forbids.
    #[error(
        "the logo or a figure holds {0}, which PDF/A does not allow: draw it more simply, or save a logo as PNG"
    )]
    InPictures(&'static str),
    /// The writer of the PDF refused what was set; a fault of this program.
    #[error("the PDF does not conform to PDF/A-3A, which is a fault of this program: {0}")]
    Conformance(String),
}

/// Why a picture cannot be set.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum PictureFault {
    /// Neither a PNG nor an SVG.
    #[error("the picture is neither a PNG nor an SVG file: save it as one of the two")]
    Format,
    /// A file that is damaged.
    #[error("the picture cannot be read ({0}): save it anew")]
    Damaged(String),
    /// More pixels than are read.
    #[error("the picture has {width} by {height} pixels, over 25 million: save it smaller")]
    TooLarge {
        /// In pixels.
        width: u32,
        /// In pixels.
        height: u32,
    },
    /// Letters in the drawing that would not be drawn.
    #[error(
        "{lost} of {all} letters of the drawing would vanish, from \u{201C}{first}\u{201D} on: set its texts in DejaVu Sans, or \
         turn them into paths"
    )]
    TextVanishes {
        /// Letters that would be missing.
        lost: usize,
        /// Letters of all its texts.
        all: usize,
        /// The first text of which something is missing, shortened.
        first: String,
    },
    /// Characters of the drawing that the font lacks.
    #[error("a text of the drawing: {0}")]
    Character(Fault),
    /// Pixels inside a drawing, or an effect made of pixels.
    #[error("the drawing holds {0}, which is not drawn as lines: take it out, or save the picture as PNG")]
    Pixels(&'static str),
}
