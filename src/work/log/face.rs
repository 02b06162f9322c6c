//! Who sits before a run or a session that is being logged, and what they may wish.

use crate::entry::What;
use crate::report::bench_live::BenchView;
use crate::report::session_live::SessionView;

/// A wish of a person who logs a run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum BenchWish {
    /// Take a point now.
    Take,
    /// Take points by itself, or only at a wish.
    ByItself(bool),
    /// Strike a point.
    LeaveOut {
        /// Its number, counted from 1.
        point: usize,
        /// Why.
        why: String,
    },
    /// All points are in.
    Finish,
    /// Leave the run open, to go on later.
    LeaveOpen,
}

/// Before whom a run is logged: a screen, lines, or nobody.
pub trait BenchFace {
    /// Shows the run as it stands; at most four times a second.
    fn show(&mut self, view: &BenchView);

    /// What was wished since it was asked last; never waits.
    fn wishes(&mut self) -> Vec<BenchWish>;

    /// Says a sentence.
    fn say(&mut self, sentence: &str);
}

/// A wish of a person who logs a session.
#[derive(Debug, Clone, PartialEq)]
pub enum SessionWish {
    /// This happened now.
    Event(What),
    /// Readings that do not count, in seconds on the time column.
    Exclude {
        /// First second dropped.
        from_s: f64,
        /// Last second dropped.
        until_s: f64,
    },
    /// The session is over.
    Finish,
    /// Leave the session open, to go on later.
    LeaveOpen,
}

/// Before whom a session is logged.
pub trait SessionFace {
    /// Shows the session as it stands; at most four times a second.
    fn show(&mut self, view: &SessionView);

    /// What was wished since it was asked last; never waits.
    fn wishes(&mut self) -> Vec<SessionWish>;

    /// Says a sentence.
    fn say(&mut self, sentence: &str);
}
