//! What instruments said while a run or a session was logged.
//!
//! Times are seconds after the time at which the run or the session was taken, by a clock that never runs back while one
//! process logs. A number stands as it was shown, with the unit it was shown in.

use super::{Id, Instrument, PointReading};

/// Readings of one instrument, in the order they came; both columns are equally long.
#[derive(Debug, Clone, PartialEq)]
pub struct LiveReadings {
    /// The instrument.
    pub instrument: Id,
    /// The unit all of them were shown in, as `L/min`.
    pub unit: String,
    /// Seconds after the time of the run.
    pub at_s: Vec<f64>,
    /// The numbers shown.
    pub shown: Vec<f64>,
}

/// A steady point of a logged run: the means over a span of its readings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LivePoint {
    /// The means.
    pub reading: PointReading,
    /// First and last reading of the span, seconds after the time of the run.
    pub span_s: (f64, f64),
    /// Whether it was taken because it was steady; else at a person's wish.
    pub by_itself: bool,
}

/// What a note is about.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum LiveNoteKind {
    /// Something was heard that is no reading.
    Fault,
    /// A port was opened.
    Connected,
    /// A port was lost.
    Lost,
    /// The last reading is too old.
    Stale,
    /// Readings come again.
    Fresh,
    /// One value is repeated for longer than noise allows.
    Frozen,
    /// The value moves again.
    Thawed,
    /// A reading is stamped earlier than the one before it.
    ClockBack,
    /// An alarm of a session was raised.
    AlarmRaised,
    /// An alarm of a session is over.
    AlarmCleared,
}

impl LiveNoteKind {
    /// Every kind.
    pub const ALL: [Self; 10] = [
        Self::Fault,
        Self::Connected,
        Self::Lost,
        Self::Stale,
        Self::Fresh,
        Self::Frozen,
        Self::Thawed,
        Self::ClockBack,
        Self::AlarmRaised,
        Self::AlarmCleared,
    ];

    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Fault => "fault",
            Self::Connected => "connected",
            Self::Lost => "lost",
            Self::Stale => "stale",
            Self::Fresh => "fresh",
            Self::Frozen => "frozen",
            Self::Thawed => "thawed",
            Self::ClockBack => "clock back",
            Self::AlarmRaised => "alarm raised",
            Self::AlarmCleared => "alarm cleared",
        }
    }
}

/// Something that happened to an instrument, or an alarm.
#[derive(Debug, Clone, PartialEq)]
pub struct LiveNote {
    /// The instrument; none for an alarm that is about no single one.
    pub instrument: Option<Id>,
    /// Seconds after the time of the run or session.
    pub at_s: f64,
    /// What it is about.
    pub kind: LiveNoteKind,
    /// The same in words.
    pub says: String,
    /// Bytes that were heard and are no reading.
    pub bytes: Vec<u8>,
}

/// A process began to log, or went on logging, with these instruments.
#[derive(Debug, Clone, PartialEq)]
pub struct LoggingBegun {
    /// Seconds after the time of the run or session.
    pub at_s: f64,
    /// The instruments as they stood in the register.
    pub instruments: Vec<Instrument>,
}
