//! `bench enter` and `bench resume`: a run that is typed.
//!
//! [`Start`] collects what is needed before the first point, each answer checked as it is given; [`Desk`] is the run
//! itself: points are added, corrected and struck, each committed to the book before it is acknowledged, and what the
//! points say so far is computed again from the readings by the same functions as everywhere. The run begins in the
//! book together with its first point, so that a person who leaves before leaves nothing behind. Left out: every
//! terminal (that is `cli`'s) and every sentence for people but refusals.

mod start;
mod named;
mod desk;

use crate::book::BookError;
use crate::entry::RunNumber;
use crate::quantity::QuantityError;
use crate::record::MOST_POINTS;
use crate::work::WorkError;

pub use desk::{Added, Desk, Standing};
pub use start::{Ready, Start};

/// Why an answer or a point is not taken.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum EnterError {
    /// An answer that has no default was left empty.
    #[error("this one has no default: {0}")]
    Needed(&'static str),
    /// A word that is none of those asked for.
    #[error("\"{text}\" is none of {known}", text = short(.text))]
    Word {
        /// What was typed.
        text: String,
        /// The words.
        known: String,
    },
    /// No quantity, or one that cannot be.
    #[error(transparent)]
    Quantity(#[from] QuantityError),
    /// No name.
    #[error("\"{text}\" is no name: {why}", text = short(.text))]
    Name {
        /// What was typed.
        text: String,
        /// Why not.
        why: &'static str,
    },
    /// No time.
    #[error(
        "\"{text}\" is no time: write date, time and offset as in 2026-11-12T09:40:00+11:00",
        text = short(.0)
    )]
    Time(String),
    /// A name that no register holds.
    #[error("there is no {what} {id} in the register{there}")]
    NotRegistered {
        /// What was asked for.
        what: &'static str,
        /// The name.
        id: String,
        /// What there is, and what else can be done, ready to be appended.
        there: String,
    },
    /// A file that lacks what is asked of it.
    #[error("{file} has no [{table}] table: name another file, or a name in the register")]
    NotInFile {
        /// The file.
        file: String,
        /// The table.
        table: &'static str,
    },
    /// Conditions that no bench has, or a meter that says nothing about the gas; the text is a whole sentence.
    #[error("{0}")]
    Refused(String),
    /// A reading without a unit that does not fit the others.
    #[error(
        "{reading} does not go with the other points, its flow for each bar would be {times} times theirs: if it was \
         read so, write it with its units"
    )]
    UnitDoubt {
        /// The reading as it was understood.
        reading: String,
        /// How many times, as text.
        times: String,
    },
    /// A reading without a unit that is far outside the instrument's range.
    #[error(
        "{reading} is far beyond the range of the {instrument}, which ends at {top}: if it was read so, write it with \
         its unit"
    )]
    FarBeyond {
        /// The reading as it was understood.
        reading: String,
        /// Whose range.
        instrument: &'static str,
        /// Its upper end.
        top: String,
    },
    /// A point that is asked for before there is one.
    #[error("there is no point yet")]
    NoPoints,
    /// As many points as a run file may have.
    #[error("a run has at most {MOST_POINTS} points: finish this one and begin another")]
    TooManyPoints,
    /// A run that came in otherwise than typed.
    #[error("{0} was not typed, so nothing can be typed into it")]
    NotTyped(RunNumber),
    /// A run without a line.
    #[error("{0}; `done anyway` ends the run without a line, `quit` leaves it open")]
    NoLine(String),
    /// A line of piped input that is not taken.
    #[error("line {line} of the input: {says}; {kept}")]
    AtLine {
        /// The line, counted from 1.
        line: u64,
        /// Why not.
        says: String,
        /// What became of the points before it.
        kept: String,
    },
    /// Piped input that held no point.
    #[error("the input holds no point, so nothing was recorded")]
    NothingTyped,
    /// Piped input that ended before everything needed was said.
    #[error(
        "the input ended before {0} was given, so nothing was recorded: give it as an option or on a line of the input"
    )]
    EndedBefore(&'static str),
}

/// Whether the same may be tried again in a moment: another program was writing.
#[must_use]
pub const fn is_passing(error: &WorkError) -> bool {
    matches!(error, WorkError::Book(BookError::Locked { .. }))
}

/// A text as it may stand in a sentence: what hides made visible, and cut.
pub(super) fn short(text: &str) -> String {
    const LONGEST: usize = 60;
    match text.char_indices().nth(LONGEST) {
        Some((end, _)) => format!("{}…", text[..end].escape_debug()),
        None => text.escape_debug().to_string(),
    }
}
