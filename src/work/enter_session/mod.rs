//! `session enter` and `session resume`: a couch or pool session that is typed.
//!
//! [`SessionStart`] collects what is needed before the first row, each answer checked as it is given and by the rules of a
//! session file; [`SessionDesk`] is the session itself: rows are added, corrected and struck, each committed to the book
//! before it is acknowledged, and what they say so far is worked out again by the same functions as everywhere. The
//! session begins in the book together with its first row. Left out: every terminal (that is `cli`'s), every sentence for
//! people but refusals, cells that are read in mV, and the cylinder of a topped loop, which only a file states.

mod answers;
mod start;
mod line;
mod so_far;
mod desk;

use crate::entry::SessionNumber;
use crate::quantity::QuantityError;
use crate::record::RecordError;

pub use desk::{RowAdded, SessionDesk};
pub use line::{Row, Typed, happened, read, seconds};
pub use so_far::SoFar;
pub use start::{SessionReady, SessionStart};

use super::enter::short;

/// Why an answer or a row is not taken.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SessionEnterError {
    /// Something that a session file is refused for too.
    #[error("{0}")]
    Refused(String),
    /// No name.
    #[error("\"{text}\" is no name: {why}", text = short(.text))]
    Name {
        /// What was typed.
        text: String,
        /// Why not.
        why: String,
    },
    /// No time of day.
    #[error(
        "\"{text}\" is no time: write date, time and offset as in 2026-11-20T18:05:00+11:00",
        text = short(.0)
    )]
    Taken(String),
    /// What the session is, restated.
    #[error("the {0} stays as the session began with it: leave this one and enter another")]
    Stays(&'static str),
    /// An answer for another place.
    #[error("the {0} is asked in a pool only, and this is a couch session")]
    PoolOnly(&'static str),
    /// No time within the session.
    #[error(
        "\"{text}\" is no time: write minutes and seconds since the first reading as in 10:30, with hours as in 1:05:00, \
         or seconds",
        text = short(.0)
    )]
    Moment(String),
    /// Neither a row nor a command.
    #[error("\"{text}\" is neither a row, as in 10:00 0.88 0.87 0.89, nor a command{meant}: help lists what can be typed",
        text = short(.text))]
    Unknown {
        /// What was typed.
        text: String,
        /// The nearest command, ready to be appended.
        meant: String,
    },
    /// A time and nothing else.
    #[error(
        "a time alone is no row: write PO2 of each cell behind it, as in 10:00 0.88 0.87 0.89, or what happened"
    )]
    TimeAlone,
    /// Nothing that can happen.
    #[error(
        "\"{text}\" is nothing that is noted in a session{meant}: injection, oxygen add, diluent add, vent, make-up, \
         exclude and stop are",
        text = short(.text)
    )]
    Happening {
        /// What was typed.
        text: String,
        /// The nearest, ready to be appended.
        meant: String,
    },
    /// An injection that says nothing.
    #[error(
        "say what is injected from then on: injection off, injection 0.31 L/min (STPD), or injection 9.4 bar (IP, \
         through the line of the orifice)"
    )]
    NothingInjected,
    /// Words behind an event that has none.
    #[error("\"{text}\" stands behind {what}, which takes {takes}", text = short(.text))]
    Behind {
        /// The words.
        text: String,
        /// The event or command.
        what: &'static str,
        /// What it takes.
        takes: &'static str,
    },
    /// A command that wants the number of a row.
    #[error("{0} wants the number of a row first, as in {1}")]
    NoNumber(&'static str, &'static str),
    /// A correction without the row.
    #[error("correct wants the whole row, as in correct 3 10:00 0.88 0.87 0.89")]
    NoRow,
    /// A strike without a reason.
    #[error("strike wants the reason too, as in strike 3 read the wrong watch; it stays in the record")]
    NoReason,
    /// A PO2 that is none.
    #[error("{0}; PO2 is typed in bar, as in 0.88, and - for a cell that was not read")]
    Po2(QuantityError),
    /// A PO2 that cannot be at that place.
    #[error(
        "cell {cell} shows {shown} bar, and between 0 and {most} bar is what can be here: type the row again, with - for \
         a cell that shows nonsense"
    )]
    Impossible {
        /// The cell, counted from 1.
        cell: usize,
        /// As typed.
        shown: String,
        /// Most that can be, as text.
        most: String,
    },
    /// A row in which no cell was read.
    #[error(
        "no cell was read in this row: leave it out, or exclude the stretch, as in 12:00 exclude until 13:00"
    )]
    NoCell,
    /// Another number of cells than in the first row.
    #[error("this row has {got} cells and the first one had {cells}: write - for a cell that was not read")]
    OtherCells {
        /// In this row.
        got: usize,
        /// In the first.
        cells: usize,
    },
    /// A first reading that is not at 0:00.
    #[error(
        "every time counts from the first reading, so that is at 0:00: write it so, and the others by the same watch"
    )]
    NotAtZero,
    /// A time before the first reading.
    #[error("{0} is before the first reading, which every time counts from")]
    BeforeFirst(String),
    /// The first reading, struck.
    #[error(
        "every time counts from this reading, so it stays: correct it, or exclude what it begins, as in 0:00 exclude \
         until 0:30"
    )]
    FirstStays,
    /// An intermediate pressure and no orifice.
    #[error(
        "an IP needs the orifice's line: name one of the book first, as in orifice CMF-0417, or type the flow"
    )]
    NoLine,
    /// A row that is asked for before there is one.
    #[error("there is no row yet")]
    NoRows,
    /// A session without readings, at its end.
    #[error("there is no reading yet; `quit` leaves the session as it is")]
    NoReadings,
    /// A session without an injection, at its end.
    #[error(
        "no row says what was injected: type 0:00 injection off (or 0.31 L/min, or 9.4 bar) first, then done; `quit` leaves \
         the session open"
    )]
    NoInjection,
    /// An event outside the readings, at the end.
    #[error(
        "row {row} is at {at}, after the last reading at {last}: correct its time (correct {row} …), or type a reading \
         from after it, then done; `quit` leaves the session open"
    )]
    EventOutside {
        /// The row.
        row: usize,
        /// Its time.
        at: String,
        /// Last reading.
        last: String,
    },
    /// Anything else that cannot be worked out, at the end.
    #[error("{0}; correct it, then done; `quit` leaves the session open")]
    NotWorkedOut(String),
    /// A session that came in otherwise than row by row.
    #[error("{0} came in whole, so no row can be typed into it")]
    NotTyped(SessionNumber),
    /// Piped input that held no row.
    #[error("the input holds no row, so nothing was recorded")]
    NothingTyped,
}

/// A refusal of a file without the place, which a person who typed it knows.
fn refused(error: RecordError) -> SessionEnterError {
    SessionEnterError::Refused(match error {
        RecordError::Input { refusal, .. } => refusal.to_string(),
        other => other.to_string(),
    })
}
