//! A couch or pool session while it is logged, as people see it.
//!
//! Comes in: [`SessionView`], filled by whoever logs the session. Goes out: the words of its parts, and one line for a
//! pipe. None of it is a life-support alarm, and every form of it says so.

use super::layout::counted;
use super::live_parts::{Dial, DialKind, DialState, Hold, Saved};
use super::number::fixed;
use super::typed::{clock, span, tame};
use super::{Units, session_shown};
use crate::entry::{Event, Injection, LoopKept, Place, SessionNumber, What};

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

/// Who rests, where, and how the loop is kept.
#[must_use]
pub fn title(view: &SessionView) -> String {
    format!("{} · {} · loop {}", tame(&view.diver), view.place.name(), view.kept.name())
}

/// Its number and how long it lasts.
#[must_use]
pub fn whereabouts(view: &SessionView) -> String {
    let session = view.session.map_or_else(|| "a new session".to_owned(), |s| format!("session {s}"));
    format!("{session} · {}", elapsed(view))
}

/// What is saved, how many rows there are, and how long it still lasts.
#[must_use]
pub fn saved_words(view: &SessionView) -> String {
    let rows = counted(u64::try_from(view.rows).unwrap_or(u64::MAX), "row");
    let left = view.left_s.map(|left| format!(" · {} left", span(left))).unwrap_or_default();
    format!("{} · {rows}{left}", view.saved.words("row"))
}

fn elapsed(view: &SessionView) -> String {
    view.elapsed_s.map_or_else(|| "not begun".to_owned(), clock)
}

/// PO2 as a number in bar, with two decimals; none without a cell that can be used.
#[must_use]
pub fn po2_number(view: &SessionView) -> Option<String> {
    view.po2_bar.map(|bar| DialKind::Po2.number(bar, None, &view.units))
}

/// How PO2 moves: "falling 0.021 bar/min", "level", or that it is not known.
#[must_use]
pub fn trend_words(view: &SessionView) -> String {
    match (view.po2_bar, view.po2_rate_bar_min) {
        (None, _) if view.cells.iter().all(|cell| cell.dial.state == DialState::Waiting) => {
            "no cell was read yet".to_owned()
        }
        (None, _) => "NO CELL CAN BE USED".to_owned(),
        (Some(_), None) => "trend not known yet".to_owned(),
        (Some(po2), Some(rate)) => {
            DialKind::Po2.rate_words(rate, po2, &view.units).unwrap_or_else(|| "level".to_owned())
        }
    }
}

/// The tilt of the level line of PO2; see [`Dial::tilt`].
#[must_use]
pub fn trend_tilt(view: &SessionView) -> Option<i8> {
    let po2 = view.po2_bar?;
    Some(view.po2_rate_bar_min.map_or(0, |rate| DialKind::Po2.tilt(rate, po2)))
}

/// Floor and ceiling.
#[must_use]
pub fn limits_words(view: &SessionView) -> String {
    let (floor, ceiling) = view.limits_bar;
    format!("floor {} · ceiling {} bar", fixed(floor, 2), fixed(ceiling, 2))
}

/// A cell in words: its PO2, what it shows, or what is the matter.
#[must_use]
pub fn cell_words(cell: &CellSeen, units: &Units) -> String {
    if !cell.dial.is_alive() {
        return cell.dial.state_words(units);
    }
    let mut text = cell.dial.value_words(units);
    if let Some(millivolts) = cell.millivolts {
        text.push_str(&format!("  {} mV", fixed(millivolts, 1)));
    }
    if cell.off {
        text.push_str("  OFF THE OTHERS");
    }
    text
}

/// The injection in force.
#[must_use]
pub fn injection_words(view: &SessionView) -> String {
    match view.injection {
        Some(injection) => session_shown::what(&What::Injection(injection), &view.units),
        None => "injection not said: key i".to_owned(),
    }
}

/// An event with its time.
#[must_use]
pub fn event_words(event: &Event, units: &Units) -> String {
    format!("{} {}", clock(event.at_s), session_shown::what(&event.what, units))
}

/// An alarm in one sentence, without its full stop.
#[must_use]
pub fn alarm_words(alarm: &AlarmSeen, units: &Units) -> String {
    let bar = |bar: f64| format!("{} bar", fixed(bar, 2));
    let metres =
        |m: f64| format!("{} {}", DialKind::Depth.number(m, None, units), DialKind::Depth.symbol(units));
    let since = span(alarm.for_s);
    match &alarm.what {
        Wrong::Po2Low { limit_bar } => format!(
            "PO2 BELOW THE FLOOR {}: lowest {}, for {since}; fresh gas now",
            bar(*limit_bar),
            bar(alarm.worst)
        ),
        Wrong::Po2High { limit_bar } => format!(
            "PO2 ABOVE THE CEILING {}: highest {}, for {since}; no more oxygen",
            bar(*limit_bar),
            bar(alarm.worst)
        ),
        Wrong::TooDeep { limit_m } => {
            format!("TOO DEEP: {}, no deeper than {}, for {since}", metres(alarm.worst), metres(*limit_m))
        }
        Wrong::NoPo2 => {
            format!("NO PO2: no cell can be used, for {since}; off the loop, or another display")
        }
        Wrong::Missing(name) => format!("{} MISSING: nothing was heard of it for {since}", tame(name)),
        Wrong::Stale(name) => {
            format!("{} STALE: no reading for {}", tame(name), span(alarm.worst.max(alarm.for_s)))
        }
        Wrong::Frozen(name) => {
            format!("{} FROZEN: the same value for {} while others move", tame(name), span(alarm.worst))
        }
        Wrong::Disagrees(name) => {
            format!("{} OFF THE OTHERS by up to {}, for {since}", tame(name), bar(alarm.worst))
        }
        Wrong::RisesUnfed => format!(
            "PO2 RISES UNFED: {} bar/min with the injection off, for {since}; find where the oxygen comes from",
            fixed(alarm.worst, 3)
        ),
    }
}

/// What an alarm is about in a few words, where there is no room for its sentence.
#[must_use]
pub fn alarm_name(alarm: &AlarmSeen) -> String {
    match &alarm.what {
        Wrong::Po2Low { .. } => "PO2 BELOW THE FLOOR".to_owned(),
        Wrong::Po2High { .. } => "PO2 ABOVE THE CEILING".to_owned(),
        Wrong::TooDeep { .. } => "TOO DEEP".to_owned(),
        Wrong::NoPo2 => "NO PO2".to_owned(),
        Wrong::Missing(name) => format!("{} MISSING", tame(name)),
        Wrong::Stale(name) => format!("{} STALE", tame(name)),
        Wrong::Frozen(name) => format!("{} FROZEN", tame(name)),
        Wrong::Disagrees(name) => format!("{} OFF THE OTHERS", tame(name)),
        Wrong::RisesUnfed => "PO2 RISES UNFED".to_owned(),
    }
}

/// The session in one line, for a pipe.
#[must_use]
pub fn session_line(view: &SessionView) -> String {
    let mut parts = session_parts(view);
    parts.extend(view.alarms.iter().map(|alarm| format!("ALARM {}", alarm_words(alarm, &view.units))));
    parts.join("; ")
}

/// The parts of that line but the alarms.
#[must_use]
pub fn session_parts(view: &SessionView) -> Vec<String> {
    let units = &view.units;
    let session = view.session.map(|session| format!(" {session}")).unwrap_or_default();
    let po2 = po2_number(view).map_or_else(|| "--".to_owned(), |number| format!("{number} bar"));
    let cells: Vec<String> = view
        .cells
        .iter()
        .map(|cell| format!("{} {}", tame(&cell.dial.instrument), cell_words(cell, units)))
        .collect();
    let mut parts =
        vec![format!("{}{session}  PO2 {po2} ({})", elapsed(view), trend_words(view)), cells.join(", ")];
    for dial in &view.around {
        let state = if dial.is_alive() { dial.value_words(units) } else { dial.state_words(units) };
        parts.push(format!("{} {state}", dial.kind.name()));
    }
    parts.push(injection_words(view));
    if view.saved != Saved::All {
        parts.push(view.saved.words("row"));
    }
    parts.extend(view.hold.words());
    parts
}
