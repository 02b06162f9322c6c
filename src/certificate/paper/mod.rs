//! A plain document set in pages: tagged PDF/A-3A with attachments, or text for the terminal.
//!
//! Comes in: a [`Document`] made of blocks, without any knowledge of what it certifies. Goes out: the bytes of a PDF, the
//! same for the same document on every machine, or every [`Problem`] that forbids it, all at once. What is on paper is
//! extractable as text, reads in order for those who do not see it, and means the same in black and white.
//!
//! The way: `check` finds problems and reads pictures, `flow` turns blocks into strips, `pages` lays strips on pages,
//! `paint` paints them. `plain` makes text of the same model, [`read`] finds again what is inside a PDF.
//!
//! Texts are set in DejaVu Sans Condensed, drawings in DejaVu Sans, both bundled. A space may become a line break; write a
//! no-break space (U+00A0) between a number and its unit. Lines of running text hold at most some 90 characters.
//!
//! Conformance to PDF/A-3A (ISO 19005-3, level A) is checked by the writer alone, krilla, which refuses what it knows to be
//! against the standard; the free validator is in none of the registries this project draws on. What no program checks is
//! kept here by hand: every text and figure is tagged in reading order, head and ornament are artifacts, no colour carries
//! meaning.
//!
//! Left out: writing from right to left, hyphenation, footnotes, PDF/UA as a claim, colour profiles of logos (taken as
//! sRGB).

mod model;
mod characters;
mod problem;
mod faces;
mod lines;
mod picture;
mod style;
mod tree;
mod check;
mod strip;
mod table;
mod flow;
mod pages;
mod paint;
mod plain;
pub mod read;

pub use characters::Fault;
pub use model::{
    Align, Attachment, Block, Column, Document, Emphasis, Figure, Letterhead, Level, Logo, Notice, Pair,
    Paper, Relationship, Row, Run, Sentence, Signature, Standing, Table, Text, Verdict,
};
pub use plain::text;
pub use problem::{PictureFault, Problem};

/// Sets a document in pages and packs it as PDF/A-3A.
///
/// # Errors
/// Every problem of the document at once, in reading order; those found while tables are set come last.
pub fn render(document: &Document) -> Result<Vec<u8>, Vec<Problem>> {
    let faces = faces()?;
    let checked = check::checked(document, &faces);
    let mut problems = checked.problems;
    let mut flow = flow::Flow::of(document, &faces, checked.accent, checked.logo, checked.figures);
    problems.append(&mut flow.problems);
    if !problems.is_empty() {
        return Err(problems);
    }
    let pages = pages::laid(&flow.strips, &flow.heads, style::Sheet::of(document.paper).text_height());
    paint::painted(paint::Painting {
        document,
        faces: &faces,
        strips: &flow.strips,
        heads: &flow.heads,
        pages: &pages,
        tree: flow.tree,
    })
}

/// What in a text could not be printed, regular or bold, each character once: for a check where the text is entered.
pub fn faults(text: &str) -> Vec<Fault> {
    let Ok(faces) = faces() else { return Vec::new() };
    let mut faults = faces.faults(text, false);
    for fault in faces.faults(text, true) {
        if !faults.contains(&fault) {
            faults.push(fault);
        }
    }
    faults
}

fn faces() -> Result<faces::Faces, Vec<Problem>> {
    faces::Faces::new()
        .ok_or_else(|| vec![Problem::Conformance("the bundled font cannot be read".to_owned())])
}
