//! Sessions of the book in a list: what was recorded, nothing worked out.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;

use super::Units;
use super::layout::{shortened, table};
use super::number::{Plain, fixed, shortest};
use super::typed::tame;
use crate::entry::{Diluent, LoopKept, Place, Session, SessionLeftOut, SessionNumber};
use crate::quantity::unit::Kind;

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
    /// What it was made up with.
    pub diluent: Diluent,
    /// When it was begun.
    pub taken: DateTime<FixedOffset>,
    /// Minutes from the first reading to the last.
    pub minutes: f64,
    /// Oxygen cells that were read.
    pub cells: usize,
    /// Loop volume as stated, litres.
    pub loop_volume_l: Option<f64>,
    /// What was left out by hand.
    pub left_out: Vec<SessionLeftOut>,
}

impl Row {
    /// The row of a session.
    #[must_use]
    pub fn of(number: SessionNumber, session: &Session, left_out: &[SessionLeftOut]) -> Self {
        Self {
            number,
            diver: session.diver.to_string(),
            place: session.place,
            kept: session.kept,
            diluent: session.diluent,
            taken: session.taken,
            minutes: minutes(session),
            cells: session.readings.cells.len(),
            loop_volume_l: session.loop_volume.map(|volume| volume.value.as_m3() * 1e3),
            left_out: left_out.to_vec(),
        }
    }

    /// Why the whole session is left out, when it is.
    fn whole(&self) -> Option<&SessionLeftOut> {
        self.left_out.iter().find(|out| out.stretch_s.is_none())
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
pub fn text(rows: &[Row], more: bool, units: &Units) -> String {
    if rows.is_empty() {
        return "No sessions in the book yet: session import FILE.toml, or session log.\n".to_owned();
    }
    let volume = units.unit(Kind::Volume);
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
                row.loop_volume_l.map_or_else(String::new, |l| fixed(volume.from_si(l / 1e3), 1)),
                left_out(row),
            ]
        })
        .collect();
    let mut text = table(
        &["session", "diver", "taken", "place", "loop", "time", "cells", "volume", ""],
        &["", "", "", "", "", "min", "", volume.symbol, ""],
        &cells,
        true,
    );
    text.push_str("  Loop volume as stated, lungs included, at the first reading.\n");
    if more {
        text.push_str("  Older sessions are not shown: --all shows every session.\n");
    }
    text
}

fn left_out(row: &Row) -> String {
    match (row.whole(), row.left_out.len()) {
        (Some(whole), _) => format!("left out: {}", tame(&whole.why)),
        (None, 0) => String::new(),
        (None, 1) => "1 stretch left out".to_owned(),
        (None, n) => format!("{n} stretches left out"),
    }
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

/// A session in JSON; also part of what `session show` writes.
#[derive(Debug, Serialize)]
pub(super) struct JsonRow {
    session: String,
    diver: String,
    place: &'static str,
    r#loop: &'static str,
    diluent: String,
    taken: String,
    minutes: Plain,
    cells: usize,
    loop_volume_l: Option<Plain>,
    left_out: Vec<JsonLeftOut>,
}

#[derive(Debug, Serialize)]
struct JsonLeftOut {
    from_s: Option<Plain>,
    to_s: Option<Plain>,
    why: String,
    by: Option<String>,
    at: String,
}

impl JsonRow {
    pub(super) fn of(row: &Row) -> Self {
        Self {
            session: row.number.to_string(),
            diver: row.diver.clone(),
            place: row.place.name(),
            r#loop: row.kept.name(),
            diluent: diluent(row.diluent),
            taken: row.taken.to_rfc3339(),
            minutes: Plain(row.minutes),
            cells: row.cells,
            loop_volume_l: row.loop_volume_l.map(Plain),
            left_out: row
                .left_out
                .iter()
                .map(|out| JsonLeftOut {
                    from_s: out.stretch_s.map(|s| Plain(s.0)),
                    to_s: out.stretch_s.map(|s| Plain(s.1)),
                    why: out.why.clone(),
                    by: out.by.clone(),
                    at: out.at.to_rfc3339(),
                })
                .collect(),
        }
    }
}
