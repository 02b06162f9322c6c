//! Sessions that are recorded row by row: typed, or logged as they happen.
//!
//! Such a session is begun with its header; then come rows, each a record or part of one: readings of all columns at one
//! time, or an event. Rows count from 1 in the order they came and are never renumbered: a corrected one is read from
//! the record that corrects it, a struck one keeps its number and is taken from what was read. Adding a row looks at
//! the header alone, however long the session is: a logger adds one every half second.

use std::borrow::Cow;

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, params};

use super::body::{Body, Kind, Record};
use super::chain::{Stamp, Writing};
use super::error::{BookError, Inside};
use super::open::Book;
use super::runs::{Origin, RunState};
use super::sessions::{
    BLOCK_ROWS, Extent, SessionRecord, SessionRecorded, columns, columns_mut, exists, head, record_of,
};
use crate::entry::{CellSignal, Event, Run, Session, SessionLeftOut, SessionNumber, SessionReadings};

/// A row of a session that was recorded row by row.
#[derive(Debug, Clone, PartialEq)]
pub struct KeptRow {
    /// What it says now.
    pub content: RowContent,
    /// Why it was struck; none while it stands.
    pub struck: Option<String>,
}

/// What a row says.
#[derive(Debug, Clone, PartialEq)]
pub enum RowContent {
    /// Readings, in the order of the columns: time in seconds, cells in bar or volts, depth in metres and loop
    /// temperature in kelvins where there are such columns. A missing one is NaN.
    Readings(Vec<f64>),
    /// Something that happened.
    Event(Event),
}

/// A change after the first writing of a row.
#[derive(Debug, Clone, PartialEq)]
pub enum SessionChange {
    /// The row was recorded wrong.
    Corrected {
        /// The row.
        row: usize,
        /// What had stood there.
        before: RowContent,
        /// When.
        at: DateTime<FixedOffset>,
    },
    /// The row was struck.
    Struck {
        /// The row.
        row: usize,
        /// Why.
        why: String,
        /// When.
        at: DateTime<FixedOffset>,
    },
    /// What stands around the rows was corrected.
    Restated {
        /// When.
        at: DateTime<FixedOffset>,
    },
}

impl Book {
    /// Begins a session that is recorded row by row; readings and events that it has already are its first rows, the
    /// readings first. `line_run` is the run of a run file it names, so that it stands alone for good.
    ///
    /// # Errors
    /// Those of every write.
    pub fn begin_session(
        &mut self,
        session: &Session,
        line_run: Option<&Run>,
        stamp: &mut Stamp<'_>,
    ) -> Result<SessionRecorded, BookError> {
        self.write(stamp, |writing| begin(writing, session, line_run, Origin::Entered))
    }

    /// Adds rows of readings to an open session. The first ones say which columns there are, unless it was begun with
    /// them.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`];
    /// [`BookError::OtherColumns`] for other cells or columns than those before; those of every write.
    pub fn add_session_readings(
        &mut self,
        number: SessionNumber,
        readings: &SessionReadings,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| add_readings(writing, number, readings))
    }

    /// Adds something that happened to an open session.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`]; those of every
    /// write.
    pub fn add_session_event(
        &mut self,
        number: SessionNumber,
        event: &Event,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            refuse_complete(&writing.transaction, number)?;
            writing.append(Body::SessionEvent { session: number, event: *event })?;
            Ok(())
        })
    }

    /// Replaces the readings of a row of an open session; `readings` has that one row.
    ///
    /// # Errors
    /// Those of [`Book::add_session_readings`]; [`BookError::NoSuchRow`], [`BookError::RowStruck`],
    /// [`BookError::OtherKindOfRow`] where the row is an event.
    pub fn correct_session_readings(
        &mut self,
        number: SessionNumber,
        row: usize,
        readings: &SessionReadings,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let there = open_session(&writing.transaction, number)?;
            let (row, replaces) = there.holder(row, Some(false))?;
            let columns = columns(readings);
            let one_row = columns.iter().all(|column| column.len() == 1);
            if !one_row || !same_columns(&there.header.readings, readings) {
                return Err(BookError::OtherColumns { session: number }.into());
            }
            let values = columns.concat();
            writing.append(Body::SessionReadingCorrected { session: number, row, replaces, values })?;
            Ok(())
        })
    }

    /// Replaces a row of an open session that is an event.
    ///
    /// # Errors
    /// Those of [`Book::add_session_event`]; [`BookError::NoSuchRow`], [`BookError::RowStruck`],
    /// [`BookError::OtherKindOfRow`] where the row holds readings.
    pub fn correct_session_event(
        &mut self,
        number: SessionNumber,
        row: usize,
        event: &Event,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (row, replaces) = open_session(&writing.transaction, number)?.holder(row, Some(true))?;
            writing.append(Body::SessionEventCorrected { session: number, row, replaces, event: *event })?;
            Ok(())
        })
    }

    /// Strikes a row of an open session; the numbers of the others stay.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`],
    /// [`BookError::NoSuchRow`], [`BookError::RowStruck`]; [`BookError::NoReason`] for an empty reason; those of every
    /// write.
    pub fn strike_session_row(
        &mut self,
        number: SessionNumber,
        row: usize,
        why: &str,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (row, replaces) = open_session(&writing.transaction, number)?.holder(row, None)?;
            if why.trim().is_empty() {
                return Err(BookError::NoReason { session: number }.into());
            }
            writing.append(Body::SessionRowStruck { session: number, row, replaces, why: why.to_owned() })?;
            Ok(())
        })
    }

    /// Replaces what stands around the rows of an open session: volume, conditions, rest and the like. Readings and
    /// events of `header` do not count.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`];
    /// [`BookError::AnotherSession`] when diver, place, loop at first, time or cells differ; those of every write.
    pub fn restate_session(
        &mut self,
        number: SessionNumber,
        header: &Session,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (seq, there) = open_header(&writing.transaction, number)?;
            let same_time = there.taken == header.taken && there.taken.offset() == header.taken.offset();
            let same =
                there.diver == header.diver && there.place == header.place && there.kept == header.kept;
            if !same || !same_time || !same_columns(&there.readings, &header.readings) {
                return Err(BookError::AnotherSession { session: number }.into());
            }
            let header = Cow::Owned(Session { events: Vec::new(), ..header.clone() });
            writing.append(Body::SessionRestated { session: number, replaces: seq, header })?;
            Ok(())
        })
    }

    /// Says that all rows of a session are in.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`], [`BookError::SessionComplete`]; those of every
    /// write.
    pub fn finish_session(&mut self, number: SessionNumber, stamp: &mut Stamp<'_>) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let readings = open_session(&writing.transaction, number)?.standing()?.readings;
            let extent = Extent::of(&readings);
            writing.append(Body::SessionFinished { session: number, cells: readings.cells.len(), extent })?;
            Ok(())
        })
    }
}

/// Puts the header of a session that is recorded row by row at the end of the chain, with what it has already.
pub(super) fn begin(
    writing: &mut Writing<'_, '_, '_>,
    session: &Session,
    line_run: Option<&Run>,
    origin: Origin,
) -> Result<SessionRecorded, Inside> {
    let header = Session { events: Vec::new(), ..session.clone() };
    let recorded = head(writing, &header, origin, None, None)?;
    let session_number = recorded.number;
    if let Some(run) = line_run {
        writing.append(Body::SessionLine { session: session_number, run: Cow::Borrowed(run) })?;
    }
    add_blocks(writing, session_number, &session.readings)?;
    for event in &session.events {
        writing.append(Body::SessionEvent { session: session_number, event: *event })?;
    }
    Ok(recorded)
}

/// Puts rows of readings of an open session at the end of the chain.
pub(super) fn add_readings(
    writing: &mut Writing<'_, '_, '_>,
    number: SessionNumber,
    readings: &SessionReadings,
) -> Result<(), Inside> {
    let (seq, header) = open_header(&writing.transaction, number)?;
    if !same_columns(&header.readings, readings) {
        if has_columns(&header.readings) || has_readings(&writing.transaction, number)? {
            return Err(BookError::OtherColumns { session: number }.into());
        }
        let header = Session { readings: emptied(readings), ..header };
        let header = Cow::Owned(header);
        writing.append(Body::SessionRestated { session: number, replaces: seq, header })?;
    }
    add_blocks(writing, number, readings)
}

/// Whether rows may still come to a session that is there.
pub(super) fn is_open(connection: &Connection, number: SessionNumber) -> Result<bool, Inside> {
    let sql = "SELECT 1 FROM session WHERE number = ?1 AND readings IS NULL \
               AND NOT EXISTS (SELECT 1 FROM session_finished WHERE session = ?1)";
    Ok(connection.prepare_cached(sql)?.exists([number.get()])?)
}

pub(super) fn refuse_complete(connection: &Connection, number: SessionNumber) -> Result<(), Inside> {
    exists(connection, number)?;
    if is_open(connection, number)? {
        Ok(())
    } else {
        Err(BookError::SessionComplete { session: number }.into())
    }
}

/// The header of an open session as it stands, and the record that holds it; no row is read.
fn open_header(connection: &Connection, number: SessionNumber) -> Result<(u64, Session), Inside> {
    refuse_complete(connection, number)?;
    let sql = "SELECT max(seq) FROM of_session WHERE session = ? AND kind IN (?, ?)";
    let kinds = params![number.get(), Kind::Session.number(), Kind::SessionRestated.number()];
    let seq: u64 = connection.prepare_cached(sql)?.query_row(kinds, |row| row.get(0))?;
    match record_of(connection, seq, number)?.body {
        Body::Session { header, .. } | Body::SessionRestated { header, .. } => Ok((seq, header.into_owned())),
        _ => Err(Inside::Damaged(format!("record {seq} is no header of session {number}"))),
    }
}

fn has_readings(connection: &Connection, number: SessionNumber) -> Result<bool, Inside> {
    let sql = "SELECT 1 FROM of_session WHERE session = ? AND kind = ?";
    let of = params![number.get(), Kind::SessionReadings.number()];
    Ok(connection.prepare_cached(sql)?.exists(of)?)
}

/// The rows of an open session, put together.
fn open_session(connection: &Connection, number: SessionNumber) -> Result<ByRows, Inside> {
    refuse_complete(connection, number)?;
    by_rows(connection, number)
}

fn by_rows(connection: &Connection, number: SessionNumber) -> Result<ByRows, Inside> {
    let sql = "SELECT seq FROM of_session WHERE session = ? ORDER BY seq";
    let mut statement = connection.prepare_cached(sql)?;
    let seqs = statement.query_map([number.get()], |row| row.get(0))?;
    let mut found: Option<ByRows> = None;
    for seq in seqs.collect::<Result<Vec<u64>, _>>()? {
        match (&mut found, record_of(connection, seq, number)?) {
            (None, Record { at, body: Body::Session { origin, header, .. } }) => {
                found = Some(ByRows::begun(number, seq, at, origin, header.into_owned()));
            }
            (Some(found), record) => found.take(seq, record)?,
            (None, _) => break,
        }
    }
    found.ok_or_else(|| Inside::Damaged(format!("session {number} has no header")))
}

/// Puts rows of readings at the end of the chain, in blocks.
fn add_blocks(
    writing: &mut Writing<'_, '_, '_>,
    session: SessionNumber,
    readings: &SessionReadings,
) -> Result<(), Inside> {
    let columns = columns(readings);
    let rows = readings.time_s.len();
    if columns.iter().any(|column| column.len() != rows) {
        return Err(BookError::OtherColumns { session }.into());
    }
    for from in (0..rows).step_by(BLOCK_ROWS) {
        let to = rows.min(from + BLOCK_ROWS);
        let columns =
            columns.iter().map(|column| Cow::Borrowed(column.get(from..to).unwrap_or(&[]))).collect();
        writing.append(Body::SessionReadings { session, columns })?;
    }
    Ok(())
}

/// Whether two tables have the same columns: cells of the same names and kinds, depth, loop temperature.
fn same_columns(a: &SessionReadings, b: &SessionReadings) -> bool {
    let same_cells = a.cells.len() == b.cells.len()
        && a.cells.iter().zip(&b.cells).all(|(a, b)| {
            let same_signal = match (&a.signal, &b.signal) {
                (CellSignal::Bar(_), CellSignal::Bar(_)) => true,
                (
                    CellSignal::Volts { in_air: air, in_oxygen: oxygen, .. },
                    CellSignal::Volts { in_air, in_oxygen, .. },
                ) => air.to_bits() == in_air.to_bits() && oxygen.to_bits() == in_oxygen.to_bits(),
                _ => false,
            };
            a.name == b.name && same_signal
        });
    let others = |r: &SessionReadings| (r.depth_m.is_some(), r.loop_temperature_k.is_some());
    same_cells && others(a) == others(b)
}

fn has_columns(readings: &SessionReadings) -> bool {
    !readings.cells.is_empty() || readings.depth_m.is_some() || readings.loop_temperature_k.is_some()
}

/// The same columns without their numbers.
fn emptied(readings: &SessionReadings) -> SessionReadings {
    let mut emptied = readings.clone();
    columns_mut(&mut emptied).into_iter().for_each(Vec::clear);
    emptied
}

/// A session put together from its rows.
pub(super) struct ByRows {
    number: SessionNumber,
    header: Session,
    header_seq: u64,
    line_run: Option<Run>,
    recorded: DateTime<FixedOffset>,
    origin: Origin,
    /// How far its readings go as it was finished.
    finished: Option<Extent>,
    rows: Vec<KeptRow>,
    /// For each row the record that holds it now.
    holders: Vec<u64>,
    changes: Vec<SessionChange>,
    left_out: Vec<SessionLeftOut>,
}

impl ByRows {
    /// One that was begun by the record `seq`.
    pub(super) fn begun(
        number: SessionNumber,
        seq: u64,
        recorded: DateTime<FixedOffset>,
        origin: Origin,
        header: Session,
    ) -> Self {
        Self {
            number,
            header,
            header_seq: seq,
            line_run: None,
            recorded,
            origin,
            finished: None,
            rows: Vec::new(),
            holders: Vec::new(),
            changes: Vec::new(),
            left_out: Vec::new(),
        }
    }

    /// Takes in the next record of the session.
    pub(super) fn take(&mut self, seq: u64, record: Record<'static>) -> Result<(), Inside> {
        let wrong = || Inside::Damaged(format!("record {seq} does not fit the session it belongs to"));
        let at = record.at;
        match record.body {
            Body::SessionReadings { columns: block, .. } => {
                let rows = block.first().map_or(0, |column| column.len());
                let fits = block.len() == columns(&self.header.readings).len();
                if !fits || block.iter().any(|column| column.len() != rows) {
                    return Err(wrong());
                }
                for row in 0..rows {
                    let values = block.iter().filter_map(|column| column.get(row).copied()).collect();
                    self.rows.push(KeptRow { content: RowContent::Readings(values), struck: None });
                    self.holders.push(seq);
                }
            }
            Body::SessionEvent { event, .. } => {
                self.rows.push(KeptRow { content: RowContent::Event(event), struck: None });
                self.holders.push(seq);
            }
            Body::SessionReadingCorrected { row, replaces, values, .. } => {
                if values.len() != columns(&self.header.readings).len() {
                    return Err(wrong());
                }
                self.correct(row, replaces, seq, RowContent::Readings(values), at).ok_or_else(wrong)?;
            }
            Body::SessionEventCorrected { row, replaces, event, .. } => {
                self.correct(row, replaces, seq, RowContent::Event(event), at).ok_or_else(wrong)?;
            }
            Body::SessionRowStruck { row, replaces, why, .. } => {
                let index = self.index(row, replaces).ok_or_else(wrong)?;
                let there = self.rows.get_mut(index).ok_or_else(wrong)?;
                there.struck = Some(why.clone());
                self.changes.push(SessionChange::Struck { row: index + 1, why, at });
            }
            Body::SessionRestated { replaces, header, .. } => {
                if replaces != self.header_seq {
                    return Err(wrong());
                }
                let before = std::mem::replace(&mut self.header, header.into_owned());
                self.header_seq = seq;
                // That the first readings brought their columns is no correction.
                if has_columns(&before.readings) || !has_columns(&self.header.readings) {
                    self.changes.push(SessionChange::Restated { at });
                }
            }
            Body::SessionFinished { extent, .. } => self.finished = Some(extent),
            Body::SessionLine { run, .. } => self.line_run = Some(run.into_owned()),
            Body::SessionLeftOut { left_out, .. } => self.left_out.push(left_out),
            // What happened to the instruments is no row of the session.
            Body::SessionLoggingBegun { .. } | Body::SessionNote { .. } => {}
            _ => return Err(wrong()),
        }
        Ok(())
    }

    fn index(&self, row: u32, replaces: u64) -> Option<usize> {
        let index = (row as usize).checked_sub(1)?;
        (self.holders.get(index) == Some(&replaces)).then_some(index)
    }

    fn correct(
        &mut self,
        row: u32,
        replaces: u64,
        seq: u64,
        content: RowContent,
        at: DateTime<FixedOffset>,
    ) -> Option<()> {
        let index = self.index(row, replaces)?;
        let there = self.rows.get_mut(index)?;
        let before = std::mem::replace(&mut there.content, content);
        *self.holders.get_mut(index)? = seq;
        self.changes.push(SessionChange::Corrected { row: index + 1, before, at });
        Some(())
    }

    /// A row that may be changed, and the record that holds it; `event` says what it has to be.
    fn holder(&self, row: usize, event: Option<bool>) -> Result<(u32, u64), Inside> {
        let session = self.number;
        let none = || BookError::NoSuchRow { session, row, rows: self.rows.len() };
        let index = row.checked_sub(1).ok_or_else(none)?;
        let (there, holder) = self.rows.get(index).zip(self.holders.get(index)).ok_or_else(none)?;
        if there.struck.is_some() {
            return Err(BookError::RowStruck { session, row }.into());
        }
        let is_event = matches!(there.content, RowContent::Event(_));
        if event.is_some_and(|event| event != is_event) {
            return Err(BookError::OtherKindOfRow { session, row, is_event }.into());
        }
        Ok((u32::try_from(row).map_err(|_| none())?, *holder))
    }

    /// The session with the rows that stand.
    fn standing(&self) -> Result<Session, Inside> {
        let mut session = self.header.clone();
        session.events.clear();
        let mut there = columns_mut(&mut session.readings);
        let mut events = Vec::new();
        for row in self.rows.iter().filter(|row| row.struck.is_none()) {
            match &row.content {
                RowContent::Readings(values) if values.len() == there.len() => {
                    there.iter_mut().zip(values).for_each(|(column, value)| column.push(*value));
                }
                RowContent::Readings(_) => {
                    let says = format!("session {} has rows of other columns", self.number);
                    return Err(Inside::Damaged(says));
                }
                RowContent::Event(event) => events.push(*event),
            }
        }
        session.events = events;
        Ok(session)
    }

    /// The session as it stands.
    pub(super) fn into_record(self) -> Result<SessionRecord, Inside> {
        let session = self.standing()?;
        if self.finished.is_some_and(|finished| finished.rows != session.readings.time_s.len()) {
            let says = format!("session {} does not have the readings it had", self.number);
            return Err(Inside::Damaged(says));
        }
        Ok(SessionRecord {
            number: self.number,
            session,
            line_run: self.line_run,
            origin: self.origin,
            state: if self.finished.is_some() { RunState::Complete } else { RunState::Open },
            recorded: self.recorded,
            left_out: self.left_out,
            rows: self.rows,
            changes: self.changes,
        })
    }
}
