//! Lists of sessions: from the tables alone, a page at a time, the newest first; no reading is decoded but those of
//! sessions that are still open.

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, Row, params};

use super::error::{BookError, Inside};
use super::lists::{choice, time};
use super::open::Book;
use super::registers::key_of;
use super::runs::RunState;
use super::sessions::{Extent, assemble};
use crate::entry::{Id, LoopKept, Place, SessionNumber};

/// A session in a list.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionRow {
    /// Its number.
    pub number: SessionNumber,
    /// Code of its diver as given.
    pub diver: String,
    /// Where the diver rested.
    pub place: Place,
    /// How the loop was kept at first.
    pub kept: LoopKept,
    /// When it was begun.
    pub taken: DateTime<FixedOffset>,
    /// When it was recorded.
    pub recorded: DateTime<FixedOffset>,
    /// From the first to the last reading, in minutes; nought without any.
    pub minutes: f64,
    /// Oxygen cells.
    pub cells: usize,
    /// Rows of readings.
    pub readings: usize,
    /// Whether rows may still come.
    pub state: RunState,
    /// Whether the whole session was left out.
    pub left_out: bool,
    /// Stretches of it that were left out.
    pub stretches_left_out: usize,
}

/// Which sessions a list shows, and how many.
#[derive(Debug, Clone, Default)]
pub struct SessionQuery {
    /// Only those of this diver, in whatever case the code is written.
    pub diver: Option<Id>,
    /// At most so many.
    pub limit: Option<u32>,
    /// After so many newer ones.
    pub offset: u32,
}

impl Book {
    /// Sessions, the highest number first; erased ones are not among them.
    ///
    /// # Errors
    /// Those of every read.
    pub fn sessions(&self, query: &SessionQuery) -> Result<Vec<SessionRow>, BookError> {
        self.read(|connection| {
            let of = if query.diver.is_some() { "diver_key" } else { "?1" };
            let sql = format!(
                "SELECT number, diver, place, kept, taken, recorded, coalesce(done.first_s, session.first_s), \
                       coalesce(done.last_s, session.last_s), coalesce(done.cells, session.cells), \
                       coalesce(done.readings, session.readings), \
                       (SELECT count(*) FROM session_left_out AS out WHERE out.session = number AND whole), \
                       (SELECT count(*) FROM session_left_out AS out WHERE out.session = number AND NOT whole) \
                       FROM session LEFT JOIN session_finished AS done ON done.session = number WHERE {of} IS ?1 ORDER BY number DESC LIMIT ?2 OFFSET ?3"
            );
            let mut statement = connection.prepare_cached(&sql)?;
            let diver = query.diver.as_ref().map(|diver| key_of(diver.as_str()));
            let limit = query.limit.map_or(-1, i64::from);
            let mut rows = statement.query(params![diver, limit, query.offset])?;
            let mut sessions = Vec::new();
            while let Some(row) = rows.next()? {
                sessions.push(session_row(connection, row)?);
            }
            Ok(sessions)
        })
    }
}

fn session_row(connection: &Connection, row: &Row<'_>) -> Result<SessionRow, Inside> {
    let number: u32 = row.get(0)?;
    let wrong = || Inside::Damaged(format!("the list of sessions cannot be read at session {number}"));
    let numbered = SessionNumber::new(number).ok_or_else(wrong)?;
    let ends: (Option<f64>, Option<f64>) = (row.get(6)?, row.get(7)?);
    let between = |first: f64, last: f64| (last - first) / 60.0;
    let whole: u64 = row.get(10)?;
    let (state, cells, readings, minutes) = match row.get::<_, Option<usize>>(9)? {
        Some(readings) => {
            let minutes = ends.0.zip(ends.1).map_or(0.0, |(first, last)| between(first, last));
            (RunState::Complete, row.get(8)?, readings, minutes)
        }
        None => {
            let there = assemble(connection, numbered)?.session.readings;
            let Extent { rows, first_s, last_s } = Extent::of(&there);
            let minutes = if first_s.is_nan() { 0.0 } else { between(first_s, last_s) };
            (RunState::Open, there.cells.len(), rows, minutes)
        }
    };
    Ok(SessionRow {
        number: numbered,
        diver: row.get(1)?,
        place: choice(row.get(2)?).ok_or_else(wrong)?,
        kept: choice(row.get(3)?).ok_or_else(wrong)?,
        taken: time(&row.get::<_, String>(4)?).ok_or_else(wrong)?,
        recorded: time(&row.get::<_, String>(5)?).ok_or_else(wrong)?,
        minutes,
        cells,
        readings,
        state,
        left_out: whole > 0,
        stretches_left_out: row.get(11)?,
    })
}
