//! Sessions of the book in a list: what was recorded, nothing worked out.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;

use super::layout::{shortened, table};
use super::number::{Plain, fixed, shortest};
use super::typed::tame;
use crate::entry::{Diluent, LoopKept, Place, Session, SessionLeftOut, SessionNumber};

/// Longest name of a diver in the table, in columns.
const NAME: usize = 16;

/// One session of a list.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Its number.
    pub number: SessionNumber,
    /// Its diver.
    pub diver: String,
    /// Where the diver rested.
    pub place: Place,
    /// How the loop was kept at the first reading.
    pub kept: LoopKept,
    /// When it was begun.
    pub taken: DateTime<FixedOffset>,
    /// Minutes from the first reading to the last.
    pub minutes: f64,
    /// Oxygen cells that were read.
    pub cells: usize,
    /// Rows of readings.
    pub readings: usize,
    /// Whether the whole session is left out of the diver's uptake.
    pub left_out: bool,
    /// Stretches left out of it by hand.
    pub stretches_left_out: usize,
    /// Whether rows may still come.
    pub open: bool,
}

impl Row {
    /// The row of a session that is at hand, and complete.
    #[must_use]
    pub fn of(number: SessionNumber, session: &Session, left_out: &[SessionLeftOut]) -> Self {
        Self {
            number,
            diver: session.diver.to_string(),
            place: session.place,
            kept: session.kept,
            taken: session.taken,
            minutes: minutes(session),
            cells: session.readings.cells.len(),
            readings: session.readings.time_s.len(),
            left_out: left_out.iter().any(|out| out.stretch_s.is_none()),
            stretches_left_out: left_out.iter().filter(|out| out.stretch_s.is_some()).count(),
            open: false,
        }
    }
}

/// Minutes from the first reading of a session to its last; nought without readings.
#[must_use]
pub fn minutes(session: &Session) -> f64 {
    let times = || session.readings.time_s.iter().copied().filter(|t| t.is_finite());
    let (first, last) = (times().fold(f64::INFINITY, f64::min), times().fold(f64::NEG_INFINITY, f64::max));
    ((last - first) / 60.0).max(0.0)
}

/// The list as a table; `more` says that older sessions are not shown.
#[must_use]
pub fn text(rows: &[Row], more: bool) -> String {
    if rows.is_empty() {
        return "No sessions in the book yet: session import FILE.toml, or session enter DIVER.\n".to_owned();
    }
    let cells: Vec<Vec<String>> = rows
        .iter()
        .map(|row| {
            vec![
                row.number.to_string(),
                shortened(&tame(&row.diver), NAME),
                row.taken.format("%Y-%m-%d").to_string(),
                row.place.name().to_owned(),
                row.kept.name().to_owned(),
                fixed(row.minutes, 0),
                row.cells.to_string(),
                row.readings.to_string(),
                remarks(row),
            ]
        })
        .collect();
    let mut text = table(
        &["session", "diver", "taken", "place", "loop", "time", "cells", "readings", ""],
        &["", "", "", "", "", "min", "", "", ""],
        &cells,
        true,
    );
    if more {
        text.push_str("  Older sessions are not shown: --all shows every session.\n");
    }
    text
}

fn remarks(row: &Row) -> String {
    let left_out = match (row.left_out, row.stretches_left_out) {
        (true, _) => "left out".to_owned(),
        (false, 0) => String::new(),
        (false, 1) => "1 stretch left out".to_owned(),
        (false, n) => format!("{n} stretches left out"),
    };
    let parts = [if row.open { "open" } else { "" }, left_out.as_str()];
    parts.into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(", ")
}

/// A diluent as a session file writes it: "air", "oxygen 18 %".
#[must_use]
pub fn diluent(diluent: Diluent) -> String {
    match diluent {
        Diluent::Air => "air".to_owned(),
        Diluent::Oxygen(share) => format!("oxygen {} %", shortest(share.as_percent(), 6)),
    }
}

/// The list as JSON.
#[must_use]
pub fn json(rows: &[Row]) -> String {
    super::json_text(&rows.iter().map(JsonRow::of).collect::<Vec<_>>())
}

/// A session in a list, in JSON; also part of what `session show` writes.
#[derive(Debug, Serialize)]
pub(super) struct JsonRow {
    session: String,
    diver: String,
    place: &'static str,
    r#loop: &'static str,
    taken: String,
    minutes: Plain,
    cells: usize,
    readings: usize,
    left_out_whole: bool,
    stretches_left_out: usize,
    open: bool,
}

impl JsonRow {
    pub(super) fn of(row: &Row) -> Self {
        Self {
            session: row.number.to_string(),
            diver: row.diver.clone(),
            place: row.place.name(),
            r#loop: row.kept.name(),
            taken: row.taken.to_rfc3339(),
            minutes: Plain(row.minutes),
            cells: row.cells,
            readings: row.readings,
            left_out_whole: row.left_out,
            stretches_left_out: row.stretches_left_out,
            open: row.open,
        }
    }
}
