//! A plain document set in pages: tagged PDF/A-3A with attachments, or text for the terminal.
//!
//! Comes in: a [`Document`] made of blocks, without any knowledge of what it certifies. Goes out: the bytes of a PDF, the
//! same for the same document on every machine, or every [`Problem`] that forbids it, all at once. What is on paper is
//! extractable as text, reads in order for those who do not see it, and means the same in black and white.

mod model;

pub use model::{
    Align, Attachment, Block, Column, Document, Emphasis, Figure, Letterhead, Level, Logo, Notice, Pair,
    Paper, Relationship, Row, Run, Sentence, Signature, Standing, Table, Text, Verdict,
};
