//! A couch or pool session while it is logged, as people see it.
//!
//! Comes in: [`SessionView`], filled by whoever logs the session. Goes out: the words of its parts, and one line for a
//! pipe. None of it is a life-support alarm, and every form of it says so.

use super::Units;
use super::live_parts::{Dial, Hold, Saved};
use crate::entry::{Event, Injection, LoopKept, Place, SessionNumber};

/// A session while it is logged.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionView {
    /// The units asked for.
    pub units: Units,
    /// The session; none before the book has it.
    pub session: Option<SessionNumber>,
    /// The diver, by code.
    pub diver: String,
    /// Where the diver rests.
    pub place: Place,
    /// How the loop is kept now.
    pub kept: LoopKept,
    /// Seconds since the first row; none before it.
    pub elapsed_s: Option<f64>,
    /// Seconds until it ends by itself; none when it does not.
    pub left_s: Option<f64>,
    /// Median PO2 of the cells that can be used, bar; none without any.
    pub po2_bar: Option<f64>,
    /// How fast it moves, bar a minute; none when that is not known.
    pub po2_rate_bar_min: Option<f64>,
    /// Floor and ceiling, bar.
    pub limits_bar: (f64, f64),
    /// The cells, in their order.
    pub cells: Vec<CellSeen>,
    /// Depth and loop temperature, where an instrument reads them.
    pub around: Vec<Dial>,
    /// The alarms that are raised, worst or newest first.
    pub alarms: Vec<AlarmSeen>,
    /// The injection in force; none when nobody has said.
    pub injection: Option<Injection>,
    /// What happened, in the order of time.
    pub events: Vec<Event>,
    /// Rows so far.
    pub rows: usize,
    /// Median PO2 of the rows so far, for the curve: seconds since the first row and bar. As many as are at hand.
    pub curve: Vec<(f64, f64)>,
    /// What is safely in the book.
    pub saved: Saved,
    /// Who logs.
    pub hold: Hold,
}

/// A cell.
#[derive(Debug, Clone, PartialEq)]
pub struct CellSeen {
    /// Its PO2 in bar, its state and its faults.
    pub dial: Dial,
    /// What it shows where that is not bar, in millivolts.
    pub millivolts: Option<f64>,
    /// Whether it is off the others.
    pub off: bool,
}

/// An alarm that is raised.
#[derive(Debug, Clone, PartialEq)]
pub struct AlarmSeen {
    /// What is wrong.
    pub what: Wrong,
    /// Since so many seconds.
    pub for_s: f64,
    /// The worst value since: bar of PO2, metres, bar off the others, bar a minute; seconds for an instrument.
    pub worst: f64,
}

/// What is wrong. The texts are names of instruments.
#[derive(Debug, Clone, PartialEq)]
pub enum Wrong {
    /// A cell shows less than the floor.
    Po2Low {
        /// The floor, bar.
        limit_bar: f64,
    },
    /// A cell shows more than the ceiling.
    Po2High {
        /// The ceiling, bar.
        limit_bar: f64,
    },
    /// Deeper than a session may be.
    TooDeep {
        /// The limit, metres.
        limit_m: f64,
    },
    /// No cell can be used.
    NoPo2,
    /// Nothing was ever heard of an instrument.
    Missing(String),
    /// An instrument's last reading is too old, or its port is lost.
    Stale(String),
    /// A cell repeats one value while the others move.
    Frozen(String),
    /// A cell is off the others.
    Disagrees(String),
    /// PO2 rises though the injection is off and nothing was added.
    RisesUnfed,
}
