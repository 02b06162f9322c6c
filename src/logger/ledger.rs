//! What a logger hands over, and to whom.

use super::alarm::AlarmChange;
use super::session::Row;
use crate::entry::{Event, PointReading};
use crate::instrument::{Fault, Lost, Reading};

/// A reading with the second of the clock at which it arrived.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Stamped {
    /// When, in seconds of the clock.
    pub at_s: f64,
    /// What was read.
    pub reading: Reading,
}

/// Raw readings of one instrument since its last block, in the order they came.
#[derive(Debug, Clone, PartialEq)]
pub struct Block {
    /// Which instrument, counted from 0 in the list that was given.
    pub instrument: usize,
    /// At least one reading.
    pub readings: Vec<Stamped>,
}

/// Who wanted a point.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum By {
    /// The logger: it was steady.
    Itself,
    /// A person.
    Hand,
}

/// A point that was taken.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Taken {
    /// Its number in the run, counted from 1.
    pub number: usize,
    /// The means over its span, as a run has them; `time_s` is the middle of the span, since the first reading.
    pub reading: PointReading,
    /// First reading of the span, in seconds of the clock.
    pub from_s: f64,
    /// Last reading of the span, in seconds of the clock.
    pub to_s: f64,
    /// Who wanted it.
    pub by: By,
}

/// What happened to an instrument that is no reading.
#[derive(Debug, Clone, PartialEq)]
pub enum Trouble {
    /// Something heard that is none.
    Fault(Fault),
    /// Its port was lost.
    Lost(Lost),
    /// Its port was opened.
    Connected,
    /// Its last reading is too old.
    Stale,
    /// Its readings come again.
    Fresh,
    /// It repeats one value, bit for bit, for longer than its noise and its last digit allow.
    Frozen {
        /// Since when, in seconds of the clock.
        since_s: f64,
    },
    /// Its value moves again.
    Thawed,
    /// Its reading is stamped earlier than what came before it.
    TimeRanBack {
        /// By so many seconds.
        by_s: f64,
    },
}

/// A trouble with its time.
#[derive(Debug, Clone, PartialEq)]
pub struct TroubleAt {
    /// Which instrument, counted from 0 in the list that was given.
    pub instrument: usize,
    /// When, in seconds of the clock.
    pub at_s: f64,
    /// What.
    pub what: Trouble,
}

/// Who keeps a run that is being logged.
///
/// Raw readings come before the point that was made of them. What was refused is handed over again, so an
/// implementation takes a thing whole or not at all.
pub trait Ledger {
    /// Why something was not kept.
    type Error;

    /// Keeps raw readings.
    ///
    /// # Errors
    /// When they were not kept.
    fn readings(&mut self, block: &Block) -> Result<(), Self::Error>;

    /// Keeps a point.
    ///
    /// # Errors
    /// When it was not kept.
    fn point(&mut self, point: &Taken) -> Result<(), Self::Error>;

    /// Keeps a fault.
    ///
    /// # Errors
    /// When it was not kept.
    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), Self::Error>;

    /// Says that the logger is alive, at a second of the clock.
    ///
    /// # Errors
    /// When that cannot be said, as when another holds the run.
    fn heartbeat(&mut self, at_s: f64) -> Result<(), Self::Error>;
}

/// Who keeps a session that is being logged; as [`Ledger`].
pub trait SessionLedger {
    /// Why something was not kept.
    type Error;

    /// Keeps rows, at least one.
    ///
    /// # Errors
    /// When they were not kept.
    fn rows(&mut self, rows: &[Row]) -> Result<(), Self::Error>;

    /// Keeps an event.
    ///
    /// # Errors
    /// When it was not kept.
    fn event(&mut self, event: &Event) -> Result<(), Self::Error>;

    /// Keeps an alarm that was raised or cleared.
    ///
    /// # Errors
    /// When it was not kept.
    fn alarm(&mut self, change: &AlarmChange) -> Result<(), Self::Error>;

    /// Keeps a fault.
    ///
    /// # Errors
    /// When it was not kept.
    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), Self::Error>;

    /// Says that the logger is alive, at a second of the clock.
    ///
    /// # Errors
    /// When that cannot be said, as when another holds the session.
    fn heartbeat(&mut self, at_s: f64) -> Result<(), Self::Error>;
}
