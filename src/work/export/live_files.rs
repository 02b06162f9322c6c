//! What instruments said while a run was logged: raw readings as CSV of numbers, the rest as TOML.
//!
//! No import takes these back: the run file beside them has the points, which are what an analysis reads.

use std::fmt::Write as _;

use serde::Serialize;

use super::toml_text;
use crate::book::Book;
use crate::entry::{LiveNote, LivePoint, LiveReadings, RunNumber};
use crate::work::WorkError;

#[derive(Serialize)]
struct Live {
    #[serde(skip_serializing_if = "Vec::is_empty")]
    readings: Vec<Column>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    point: Vec<Span>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    note: Vec<Note>,
}

/// Which number in the CSV stands for which instrument and unit.
#[derive(Serialize)]
struct Column {
    number: usize,
    instrument: String,
    unit: String,
}

/// From which readings a point was made.
#[derive(Serialize)]
struct Span {
    point: usize,
    from_s: f64,
    until_s: f64,
    by_itself: bool,
}

#[derive(Serialize)]
struct Note {
    #[serde(skip_serializing_if = "Option::is_none")]
    instrument: Option<String>,
    at_s: f64,
    kind: &'static str,
    says: String,
    #[serde(skip_serializing_if = "String::is_empty")]
    bytes_hex: String,
}

/// Raw readings and the rest of a logged run; none when the book has nothing of the kind.
pub(super) fn of(book: &Book, run: RunNumber) -> Result<Option<(String, String)>, WorkError> {
    let readings = book.live_readings(run)?;
    let (points, notes) = (book.live_points(run)?, book.live_notes(run)?);
    if readings.is_empty() && points.is_empty() && notes.is_empty() {
        return Ok(None);
    }
    Ok(Some((csv(&readings), toml_text(&live(&readings, &points, &notes)))))
}

fn csv(readings: &[LiveReadings]) -> String {
    let mut rows: Vec<(f64, usize, f64)> = Vec::new();
    for (index, one) in readings.iter().enumerate() {
        rows.extend(one.at_s.iter().zip(&one.shown).map(|(at_s, shown)| (*at_s, index + 1, *shown)));
    }
    rows.sort_by(|a, b| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1)));
    let mut text = String::from("at_s,number,shown\n");
    for (at_s, number, shown) in rows {
        // Shortest digits that come back to the last bit.
        let _ = writeln!(text, "{at_s},{number},{shown}");
    }
    text
}

fn live(readings: &[LiveReadings], points: &[LivePoint], notes: &[LiveNote]) -> Live {
    let column = |(index, one): (usize, &LiveReadings)| Column {
        number: index + 1,
        instrument: one.instrument.to_string(),
        unit: one.unit.clone(),
    };
    let span = |(index, point): (usize, &LivePoint)| Span {
        point: index + 1,
        from_s: point.span_s.0,
        until_s: point.span_s.1,
        by_itself: point.by_itself,
    };
    let note = |note: &LiveNote| Note {
        instrument: note.instrument.as_ref().map(ToString::to_string),
        at_s: note.at_s,
        kind: note.kind.name(),
        says: note.says.clone(),
        bytes_hex: note.bytes.iter().map(|byte| format!("{byte:02x}")).collect(),
    };
    Live {
        readings: readings.iter().enumerate().map(column).collect(),
        point: points.iter().enumerate().map(span).collect(),
        note: notes.iter().map(note).collect(),
    }
}
