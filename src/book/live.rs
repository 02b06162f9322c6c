//! Runs and sessions that are logged from instruments.
//!
//! A logged run is a header, what was connected, blocks of raw readings (one an instrument and commit), points, and notes
//! of faults, each a record of its own. Its points are what an analysis reads, as those of a typed run; the raw readings
//! are there to be looked at and exported. What is handed over together is kept together or not at all, and only while
//! the one who hands it over holds the lease ([`super::lease`]).

use std::borrow::Cow;
use std::collections::BTreeMap;

use rusqlite::{Connection, params};

use super::body::{Body, Kind};
use super::chain::{Stamp, record_at};
use super::error::{BookError, Inside};
use super::lease::{Holder, Logged, renew};
use super::open::Book;
use super::runs::{self, Origin, Recorded};
use super::session_rows;
use super::sessions::{self, SessionRecorded};
use crate::entry::{
    Event, LiveNote, LivePoint, LiveReadings, LoggingBegun, Readings, Run, RunNumber, Session, SessionNumber,
    SessionReadings,
};

/// What a logger of a run hands over at once.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct RunBatch {
    /// Raw readings, an instrument a block.
    pub readings: Vec<LiveReadings>,
    /// Points made of them, in order.
    pub points: Vec<LivePoint>,
    /// What else happened.
    pub notes: Vec<LiveNote>,
}

impl RunBatch {
    /// Whether there is nothing in it.
    #[must_use]
    pub fn is_empty(&self) -> bool {
        self.readings.is_empty() && self.points.is_empty() && self.notes.is_empty()
    }
}

/// What a logger of a session hands over at once.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionBatch {
    /// Rows of the columns that the session was begun with; may be none.
    pub rows: SessionReadings,
    /// What happened in it.
    pub events: Vec<Event>,
    /// Faults and alarms.
    pub notes: Vec<LiveNote>,
}

/// A place in the chain, up to which somebody has seen.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct SeenTo(u64);

impl Book {
    /// Begins a run that is logged: its header, the instruments, and the lease.
    ///
    /// # Errors
    /// Those of every write.
    pub fn begin_logged_run(
        &mut self,
        run: &Run,
        begun: &LoggingBegun,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<Recorded, BookError> {
        let now = stamp.at;
        self.write(stamp, |writing| {
            let orifice_created = runs::orifice_of(writing, run)?;
            let header = Run { readings: Readings::Points(Vec::new()), ..run.clone() };
            let number = runs::header(writing, &header, Origin::Logged, None)?;
            renew(&writing.transaction, Logged::Run(number), holder, now, true)?;
            writing.append(Body::LoggingBegun { run: number, begun: begun.clone() })?;
            Ok(Recorded { number, new: true, orifice_created })
        })
    }

    /// Goes on logging an open run that was logged before, with the lease.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`]; [`BookError::NotLogged`] for one that was typed;
    /// [`BookError::Held`] while another logs it; those of every write.
    pub fn resume_logged_run(
        &mut self,
        run: RunNumber,
        begun: &LoggingBegun,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let now = stamp.at;
        self.write(stamp, |writing| {
            refuse_complete(&writing.transaction, run)?;
            let sql = "SELECT 1 FROM of_run WHERE run = ? AND kind = ?";
            let logged = params![run.get(), Kind::LoggingBegun.number()];
            if !writing.transaction.prepare_cached(sql)?.exists(logged)? {
                return Err(BookError::NotLogged { run }.into());
            }
            renew(&writing.transaction, Logged::Run(run), holder, now, true)?;
            writing.append(Body::LoggingBegun { run, begun: begun.clone() })?;
            Ok(())
        })
    }

    /// Keeps what a logger hands over: raw readings, then what else happened, then points. Nothing at all only renews the
    /// lease.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`]; [`BookError::Held`] and [`BookError::LeaseLost`] when the
    /// lease is not the holder's; those of every write.
    pub fn keep_of_run(
        &mut self,
        run: RunNumber,
        batch: &RunBatch,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let now = stamp.at;
        if batch.is_empty() {
            return self.hold(Logged::Run(run), holder, now);
        }
        self.write(stamp, |writing| {
            refuse_complete(&writing.transaction, run)?;
            renew(&writing.transaction, Logged::Run(run), holder, now, false)?;
            for readings in &batch.readings {
                writing.append(Body::LiveReadings { run, readings: Cow::Borrowed(readings) })?;
            }
            for note in &batch.notes {
                writing.append(Body::LiveNote { run, note: Cow::Borrowed(note) })?;
            }
            for point in &batch.points {
                writing.append(Body::PointTaken { run, point: *point })?;
            }
            Ok(())
        })
    }

    /// Begins a session that is logged: its header with the columns and no rows, the instruments, and the lease.
    /// `line_run` as in [`Book::begin_session`].
    ///
    /// # Errors
    /// Those of every write.
    pub fn begin_logged_session(
        &mut self,
        session: &Session,
        line_run: Option<&Run>,
        begun: &LoggingBegun,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<SessionRecorded, BookError> {
        let now = stamp.at;
        self.write(stamp, |writing| {
            let recorded = session_rows::begin(writing, session, line_run, Origin::Logged)?;
            let number = recorded.number;
            renew(&writing.transaction, Logged::Session(number), holder, now, true)?;
            writing.append(Body::SessionLoggingBegun { session: number, begun: begun.clone() })?;
            Ok(recorded)
        })
    }

    /// Goes on logging an open session, with the lease.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`];
    /// [`BookError::Held`] while another logs it; those of every write.
    pub fn resume_logged_session(
        &mut self,
        session: SessionNumber,
        begun: &LoggingBegun,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let now = stamp.at;
        self.write(stamp, |writing| {
            session_rows::refuse_complete(&writing.transaction, session)?;
            renew(&writing.transaction, Logged::Session(session), holder, now, true)?;
            writing.append(Body::SessionLoggingBegun { session, begun: begun.clone() })?;
            Ok(())
        })
    }

    /// Keeps what a logger of a session hands over: rows, then notes, then events. Nothing at all only renews the lease.
    ///
    /// # Errors
    /// Those of [`Book::add_session_readings`]; [`BookError::Held`] and [`BookError::LeaseLost`] when the lease is not
    /// the holder's.
    pub fn keep_of_session(
        &mut self,
        session: SessionNumber,
        batch: &SessionBatch,
        holder: &Holder,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let now = stamp.at;
        let SessionBatch { rows, events, notes } = batch;
        if rows.time_s.is_empty() && events.is_empty() && notes.is_empty() {
            return self.hold(Logged::Session(session), holder, now);
        }
        self.write(stamp, |writing| {
            renew(&writing.transaction, Logged::Session(session), holder, now, false)?;
            if rows.time_s.is_empty() {
                session_rows::refuse_complete(&writing.transaction, session)?;
            } else {
                session_rows::add_readings(writing, session, rows)?;
            }
            for note in notes {
                writing.append(Body::SessionNote { session, note: Cow::Borrowed(note) })?;
            }
            for event in events {
                writing.append(Body::SessionEvent { session, event: *event })?;
            }
            Ok(())
        })
    }

    /// The raw readings of a logged run, an instrument each, in the order they came.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn live_readings(&self, run: RunNumber) -> Result<Vec<LiveReadings>, BookError> {
        self.read(|connection| {
            let mut all: BTreeMap<(String, String), LiveReadings> = BTreeMap::new();
            for seq in of_run(connection, run, Kind::LiveReadings, 0)? {
                let Some(Body::LiveReadings { readings, .. }) = record_at(connection, seq)?.map(|r| r.body)
                else {
                    return Err(Inside::Damaged(format!("record {seq} holds no readings")));
                };
                let readings = readings.into_owned();
                let key = (readings.instrument.as_str().to_owned(), readings.unit.clone());
                match all.get_mut(&key) {
                    Some(there) => {
                        there.at_s.extend(readings.at_s);
                        there.shown.extend(readings.shown);
                    }
                    None => {
                        all.insert(key, readings);
                    }
                }
            }
            Ok(all.into_values().collect())
        })
    }

    /// The raw readings of a logged run that were kept since somebody looked last, for one who watches it.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn live_readings_after(
        &self,
        run: RunNumber,
        seen: &mut SeenTo,
    ) -> Result<Vec<LiveReadings>, BookError> {
        self.read(|connection| {
            let mut new = Vec::new();
            for seq in of_run(connection, run, Kind::LiveReadings, seen.0)? {
                if let Some(Body::LiveReadings { readings, .. }) = record_at(connection, seq)?.map(|r| r.body)
                {
                    new.push(readings.into_owned());
                }
                seen.0 = seq;
            }
            Ok(new)
        })
    }

    /// The points of a logged run as they were taken, each with its span.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn live_points(&self, run: RunNumber) -> Result<Vec<LivePoint>, BookError> {
        self.read(|connection| {
            let mut points = Vec::new();
            for seq in of_run(connection, run, Kind::PointTaken, 0)? {
                if let Some(Body::PointTaken { point, .. }) = record_at(connection, seq)?.map(|r| r.body) {
                    points.push(point);
                }
            }
            Ok(points)
        })
    }

    /// What happened to the instruments of a logged run.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn live_notes(&self, run: RunNumber) -> Result<Vec<LiveNote>, BookError> {
        self.read(|connection| {
            let mut notes = Vec::new();
            for seq in of_run(connection, run, Kind::LiveNote, 0)? {
                if let Some(Body::LiveNote { note, .. }) = record_at(connection, seq)?.map(|r| r.body) {
                    notes.push(note.into_owned());
                }
            }
            Ok(notes)
        })
    }

    /// What happened to the instruments of a logged session, and its alarms.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`]; those of every read.
    pub fn session_notes(&self, session: SessionNumber) -> Result<Vec<LiveNote>, BookError> {
        self.read(|connection| {
            sessions::exists(connection, session)?;
            let sql = "SELECT seq FROM of_session WHERE session = ? AND kind = ? ORDER BY seq";
            let mut statement = connection.prepare_cached(sql)?;
            let of = params![session.get(), Kind::SessionNote.number()];
            let seqs = statement.query_map(of, |row| row.get(0))?.collect::<Result<Vec<u64>, _>>()?;
            let mut notes = Vec::new();
            for seq in seqs {
                if let Some(Body::SessionNote { note, .. }) = record_at(connection, seq)?.map(|r| r.body) {
                    notes.push(note.into_owned());
                }
            }
            Ok(notes)
        })
    }

    /// What a logged run was last begun or resumed with; none for any other run.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn logging_begun(&self, run: RunNumber) -> Result<Option<LoggingBegun>, BookError> {
        self.read(|connection| {
            let Some(seq) = of_run(connection, run, Kind::LoggingBegun, 0)?.pop() else { return Ok(None) };
            match record_at(connection, seq)?.map(|record| record.body) {
                Some(Body::LoggingBegun { begun, .. }) => Ok(Some(begun)),
                _ => Err(Inside::Damaged(format!("record {seq} says nothing of a logger"))),
            }
        })
    }

    /// As [`Book::logging_begun`], for a session.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`]; those of every read.
    pub fn session_logging_begun(&self, session: SessionNumber) -> Result<Option<LoggingBegun>, BookError> {
        self.read(|connection| {
            sessions::exists(connection, session)?;
            let sql = "SELECT max(seq) FROM of_session WHERE session = ? AND kind = ?";
            let mut statement = connection.prepare_cached(sql)?;
            let of = params![session.get(), Kind::SessionLoggingBegun.number()];
            let seq: Option<u64> = statement.query_row(of, |row| row.get(0))?;
            let Some(seq) = seq else { return Ok(None) };
            match record_at(connection, seq)?.map(|record| record.body) {
                Some(Body::SessionLoggingBegun { begun, .. }) => Ok(Some(begun)),
                _ => Err(Inside::Damaged(format!("record {seq} says nothing of a logger"))),
            }
        })
    }
}

/// The records of a kind of a run after a place, in order.
fn of_run(connection: &Connection, run: RunNumber, kind: Kind, after: u64) -> Result<Vec<u64>, Inside> {
    runs::exists(connection, run)?;
    let sql = "SELECT seq FROM of_run WHERE run = ? AND kind = ? AND seq > ? ORDER BY seq";
    let mut statement = connection.prepare_cached(sql)?;
    let after = i64::try_from(after).unwrap_or(i64::MAX);
    let seqs = statement.query_map(params![run.get(), kind.number(), after], |row| row.get(0))?;
    Ok(seqs.collect::<Result<Vec<u64>, _>>()?)
}

/// Refuses a run that is complete; no reading of it is looked at.
fn refuse_complete(connection: &Connection, run: RunNumber) -> Result<(), Inside> {
    runs::exists(connection, run)?;
    let sql = "SELECT 1 FROM run WHERE number = ?1 AND origin <> 1 \
               AND NOT EXISTS (SELECT 1 FROM of_run WHERE run = ?1 AND kind = ?2)";
    let open = params![run.get(), Kind::RunFinished.number()];
    if connection.prepare_cached(sql)?.exists(open)? {
        Ok(())
    } else {
        Err(BookError::Complete { run }.into())
    }
}
