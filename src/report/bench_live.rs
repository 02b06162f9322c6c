//! A bench run while it is logged, as people see it.
//!
//! Comes in: [`BenchView`], filled by whoever logs the run. Goes out: the words of its parts, and one line for a pipe.
//! Drawing them on a terminal is `cli`'s, on the page the page's.

use super::Units;
use super::live_parts::{Dial, Hold, Saved};
use crate::entry::{Purpose, RunNumber, Sweep};

/// A run while it is logged.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchView {
    /// The units asked for.
    pub units: Units,
    /// The run; none before the book has it.
    pub run: Option<RunNumber>,
    /// The orifice.
    pub orifice: String,
    /// The gas, in a word.
    pub gas: String,
    /// Why the run is made.
    pub purpose: Purpose,
    /// Who makes it.
    pub technician: Option<String>,
    /// Intermediate pressure.
    pub pressure: Dial,
    /// Flow.
    pub flow: Dial,
    /// Gas temperature and barometer, where an instrument reads them.
    pub around: Vec<Dial>,
    /// Steady, or why not.
    pub sign: Sign,
    /// Whether points are taken by themselves.
    pub by_itself: bool,
    /// Whether there is a point at this level already.
    pub taken_here: bool,
    /// How far the run has come.
    pub sweep: SweepSoFar,
    /// The points, in the order of their numbers.
    pub points: Vec<PointSeen>,
    /// The line so far; none without one.
    pub line: Option<LineSeen>,
    /// Limits of the acceptance at its nominal IP: bar gauge, lowest and highest L/min of this run's gas as the points have
    /// it; none without an acceptance.
    pub limits: Option<(f64, f64, f64)>,
    /// The running line, its verdict so far and what the last point says of it, a sentence each; without a line, why there
    /// is none.
    pub says: Vec<String>,
    /// The checks, in their order.
    pub checks: Vec<CheckSeen>,
    /// What is safely in the book.
    pub saved: Saved,
    /// Who logs.
    pub hold: Hold,
    /// Seconds since the run began.
    pub elapsed_s: f64,
    /// Seconds until it ends by itself; none when it does not.
    pub left_s: Option<f64>,
}

/// The steady sign.
#[derive(Debug, Clone, PartialEq)]
pub struct Sign {
    /// Whether a point can be taken.
    pub steady: bool,
    /// Steady, or why not, without a full stop: "pressure still falling 0.04 bar/min".
    pub says: String,
    /// For how many seconds it has been steady.
    pub held_s: f64,
    /// For how many it must be.
    pub least_s: f64,
}

/// How far a run has come.
#[derive(Debug, Clone, PartialEq)]
pub struct SweepSoFar {
    /// The direction in which the pressure was stepped last; none before the first step.
    pub direction: Option<Sweep>,
    /// Points that are wanted in all; none when nobody said.
    pub wanted: Option<usize>,
    /// Lowest and highest IP that the run is to cover, bar gauge; none when nothing says.
    pub span_bar: Option<(f64, f64)>,
    /// What to do next, in a few words, as "next: 11 bar, rising"; none when nothing is known.
    pub next: Option<String>,
}

/// A point of the run.
#[derive(Debug, Clone, PartialEq)]
pub struct PointSeen {
    /// Its number.
    pub number: usize,
    /// Pressure as shown, bar.
    pub pressure_bar: f64,
    /// Flow as shown, L/min.
    pub flow_l_min: f64,
    /// The direction it was reached in.
    pub sweep: Option<Sweep>,
    /// How far it lies off the line, as a share of it; none without a line.
    pub off_line: Option<f64>,
    /// Why it does not count: struck or left out, or not choked; none when it does. What a person typed is tamed when
    /// shown.
    pub left_out: Option<String>,
    /// Whether a check says that it lies apart from the rest.
    pub apart: bool,
}

/// The line so far in the same figures as the points: pressure as shown in bar, flow as shown in L/min.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LineSeen {
    /// Flow at no pressure shown.
    pub intercept_l_min: f64,
    /// Rise of the flow with the pressure.
    pub slope_l_min_bar: f64,
}

/// What a check says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Holds {
    /// It holds.
    Yes,
    /// It does not hold.
    No,
    /// It could not be decided, or there is something to know.
    Open,
}

/// A check so far.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CheckSeen {
    /// Its finding.
    pub holds: Holds,
    /// Its sentence.
    pub says: String,
}
