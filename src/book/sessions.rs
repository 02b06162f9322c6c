//! Sessions: imported whole from their files, or entered whole; those that are recorded row by row are
//! [`super::session_rows`]'s.
//!
//! A session is a header, blocks of readings, the run its injection line was made from, pieces of its files, and what
//! was left out of it, each a record of its own; reading a session puts them together. All of these records are
//! personal: forgetting the diver erases them, and the number stays used.

use std::borrow::Cow;

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, OptionalExtension, params};

use super::body::{Body, Kind, Record};
use super::chain::{Stamp, Writing, record_at, source_digest};
use super::error::{BookError, Inside};
use super::open::Book;
use super::registers::{self, Entry, Register, key_of};
use super::runs::{Origin, RunState};
use super::session_rows::{ByRows, KeptRow, SessionChange};
use super::{canonical, session_rows};
use crate::entry::{
    CellSignal, Diver, Id, LineReference, Orifice, Run, Session, SessionLeftOut, SessionNumber,
    SessionReadings,
};

/// Rows of readings in a block: two mebibytes with three cells, so that of millions of rows only so much is held twice
/// while they are written, read or checked.
pub(super) const BLOCK_ROWS: usize = 1 << 16;
/// Bytes of a file in a piece, for the same reason.
pub(super) const PIECE_BYTES: usize = 1 << 22;

/// The files a session was imported from, to the byte.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SessionSource {
    /// Name of the session file, without folders.
    pub session_file_name: String,
    /// The session file.
    pub session_file: Vec<u8>,
    /// Name of the file of readings as the session file gives it.
    pub readings_name: String,
    /// The file of readings.
    pub readings: Vec<u8>,
    /// The run file that the session file names for its injection line.
    pub line: Option<LineSource>,
}

/// The run file behind a session's injection line, to the byte.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LineSource {
    /// Name of the run file as the session file gives it.
    pub file_name: String,
    /// The run file.
    pub file: Vec<u8>,
    /// Name of its file of readings as the run file gives it.
    pub readings_name: String,
    /// Its file of readings.
    pub readings: Vec<u8>,
}

/// A session with what its files held.
#[derive(Debug, Clone, Copy)]
pub struct SessionToImport<'a> {
    /// The session.
    pub session: &'a Session,
    /// The run of the run file it names, so that the session stands alone for good.
    pub line_run: Option<&'a Run>,
    /// Its files.
    pub files: &'a SessionSource,
}

/// What recording a session did.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SessionRecorded {
    /// The session.
    pub number: SessionNumber,
    /// Whether it is new; files with the same bytes were imported before otherwise.
    pub new: bool,
    /// Whether its diver was unknown and now stands in the register with the code only.
    pub diver_created: bool,
    /// Whether the orifice it names was unknown and now stands in the register with its name only.
    pub orifice_created: bool,
}

/// A session as it stands in the book.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionRecord {
    /// Its number.
    pub number: SessionNumber,
    /// The session as it was recorded, with its corrections; nothing that was left out is taken from it.
    pub session: Session,
    /// The run its injection line is made from, when its file named a run file.
    pub line_run: Option<Run>,
    /// How it came.
    pub origin: Origin,
    /// How far it is.
    pub state: RunState,
    /// When it was recorded or begun.
    pub recorded: DateTime<FixedOffset>,
    /// What was left out of it, in order.
    pub left_out: Vec<SessionLeftOut>,
    /// The rows of one that was recorded row by row, struck ones too; of any other none.
    pub rows: Vec<KeptRow>,
    /// What was changed in them, in order.
    pub changes: Vec<SessionChange>,
}

/// How far the readings of a session go, kept with its header so that a list need not read them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Extent {
    /// Rows.
    pub(super) rows: usize,
    /// Earliest time in seconds; NaN without one.
    pub(super) first_s: f64,
    /// Latest time in seconds; NaN without one.
    pub(super) last_s: f64,
}

canonical::fields!(Extent { rows, first_s, last_s });

impl Extent {
    pub(super) fn of(readings: &SessionReadings) -> Self {
        // Comparisons and not `min`: of two noughts of opposite sign those could give either.
        let (mut first_s, mut last_s) = (f64::NAN, f64::NAN);
        for &time in readings.time_s.iter().filter(|time| !time.is_nan()) {
            if first_s.is_nan() || time < first_s {
                first_s = time;
            }
            if last_s.is_nan() || time > last_s {
                last_s = time;
            }
        }
        Self { rows: readings.time_s.len(), first_s, last_s }
    }
}

/// Which of its files a piece belongs to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum FileRole {
    SessionFile,
    Readings,
    LineFile,
    LineReadings,
}

canonical::choice!(FileRole, "file" { SessionFile = 1, Readings = 2, LineFile = 3, LineReadings = 4 });

impl SessionSource {
    /// Each file with its role and name, in the order in which they are kept and digested.
    fn files(&self) -> Vec<(FileRole, &str, &[u8])> {
        let mut files = vec![
            (FileRole::SessionFile, self.session_file_name.as_str(), self.session_file.as_slice()),
            (FileRole::Readings, &self.readings_name, &self.readings),
        ];
        if let Some(line) = &self.line {
            files.push((FileRole::LineFile, &line.file_name, &line.file));
            files.push((FileRole::LineReadings, &line.readings_name, &line.readings));
        }
        files
    }
}

impl Book {
    /// Records sessions from files in one transaction: all of them, or on an error none. Files with the same bytes were
    /// recorded before: the session is named and nothing added.
    ///
    /// # Errors
    /// Those of every write.
    pub fn import_sessions(
        &mut self,
        items: &[SessionToImport<'_>],
        stamp: &mut Stamp<'_>,
    ) -> Result<Vec<SessionRecorded>, BookError> {
        self.write(stamp, |writing| items.iter().map(|item| import_one(writing, *item)).collect())
    }

    /// Records a session that was typed or logged: it has no files.
    ///
    /// # Errors
    /// Those of every write.
    pub fn enter_session(
        &mut self,
        session: &Session,
        stamp: &mut Stamp<'_>,
    ) -> Result<SessionRecorded, BookError> {
        self.write(stamp, |writing| append(writing, session, None, None))
    }

    /// The session of a number, put together.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`]; those of every read.
    pub fn session(&self, number: SessionNumber) -> Result<SessionRecord, BookError> {
        self.read(|connection| assemble(connection, number))
    }

    /// The files a session was imported from; none when it was entered.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`]; those of every read.
    pub fn session_source_of(&self, number: SessionNumber) -> Result<Option<SessionSource>, BookError> {
        self.read(|connection| source(connection, number))
    }

    /// Leaves a session, or a stretch of it in seconds on its time column, out of the diver's uptake, for good.
    ///
    /// # Errors
    /// [`BookError::NoSuchSession`], [`BookError::SessionErased`]; [`BookError::NoReason`] for an empty reason;
    /// [`BookError::NoSuchStretch`] for one that ends before it begins or that lies outside the readings;
    /// [`BookError::SessionAlreadyLeftOut`] when the same was left out before; those of every write.
    pub fn leave_out_of_session(
        &mut self,
        number: SessionNumber,
        stretch_s: Option<(f64, f64)>,
        why: &str,
        by: Option<&str>,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        let at = stamp.at;
        self.write(stamp, |writing| {
            may_be_left_out(&writing.transaction, number, stretch_s)?;
            if why.trim().is_empty() {
                return Err(BookError::NoReason { session: number }.into());
            }
            let left_out = SessionLeftOut { stretch_s, why: why.to_owned(), by: by.map(str::to_owned), at };
            writing.append(Body::SessionLeftOut { session: number, left_out })?;
            Ok(())
        })
    }
}

fn import_one(
    writing: &mut Writing<'_, '_, '_>,
    item: SessionToImport<'_>,
) -> Result<SessionRecorded, Inside> {
    let digest = source_digest(item.files.files().into_iter().map(|(_, _, bytes)| bytes));
    let known = "SELECT number FROM session WHERE source = ?";
    let known: Option<u32> =
        writing.transaction.prepare_cached(known)?.query_row([digest], |row| row.get(0)).optional()?;
    if let Some(number) = known.and_then(SessionNumber::new) {
        return Ok(SessionRecorded { number, new: false, diver_created: false, orifice_created: false });
    }
    append(writing, item.session, item.line_run, Some((item.files, digest)))
}

/// Puts a new session at the end of the chain, with the register entries it needs.
fn append(
    writing: &mut Writing<'_, '_, '_>,
    session: &Session,
    line_run: Option<&Run>,
    files: Option<(&SessionSource, [u8; 32])>,
) -> Result<SessionRecorded, Inside> {
    let origin = if files.is_some() { Origin::Imported } else { Origin::Entered };
    let (extent, source) = (Some(Extent::of(&session.readings)), files.map(|(_, digest)| digest));
    let recorded = head(writing, session, origin, extent, source)?;
    let number = recorded.number;
    let columns = columns(&session.readings);
    let rows = columns.iter().map(|column| column.len()).max().unwrap_or(0);
    for from in (0..rows).step_by(BLOCK_ROWS) {
        let columns = columns.iter().map(|column| Cow::Borrowed(block(column, from))).collect();
        writing.append(Body::SessionReadings { session: number, columns })?;
    }
    if let Some(run) = line_run {
        writing.append(Body::SessionLine { session: number, run: Cow::Borrowed(run) })?;
    }
    for (role, name, bytes) in files.iter().flat_map(|(files, _)| files.files()) {
        // An empty file is one empty piece.
        let pieces = bytes.chunks(PIECE_BYTES).chain(bytes.is_empty().then_some(bytes));
        for piece in pieces {
            let (name, bytes) = (name.to_owned(), Cow::Borrowed(piece));
            writing.append(Body::SessionFile { session: number, role, name, bytes })?;
        }
    }
    Ok(recorded)
}

/// Puts the header of a new session at the end of the chain, with the register entries it needs.
pub(super) fn head(
    writing: &mut Writing<'_, '_, '_>,
    session: &Session,
    origin: Origin,
    extent: Option<Extent>,
    source: Option<[u8; 32]>,
) -> Result<SessionRecorded, Inside> {
    let diver_created =
        created(writing, Register::Diver, &session.diver, |id| Entry::Diver(Diver::bare(id)))?;
    let orifice_created = match &session.line {
        Some(LineReference::Orifice(orifice)) => {
            created(writing, Register::Orifice, orifice, |id| Entry::Orifice(Orifice::bare(id)))?
        }
        Some(LineReference::RunFile(_)) | None => false,
    };
    let number = next_number(&writing.transaction)?;
    writing.append(Body::Session { number, origin, source, extent, header: Cow::Borrowed(session) })?;
    Ok(SessionRecorded { number, new: true, diver_created, orifice_created })
}

/// Puts a bare entry into a register where the name is unknown; whether it was.
fn created(
    writing: &mut Writing<'_, '_, '_>,
    register: Register,
    id: &Id,
    bare: fn(Id) -> Entry,
) -> Result<bool, Inside> {
    let unknown = registers::latest(&writing.transaction, register, id.as_str())?.is_none();
    if unknown {
        registers::append(writing, bare(id.clone()), None)?;
    }
    Ok(unknown)
}

fn next_number(connection: &Connection) -> Result<SessionNumber, Inside> {
    let sql = "SELECT max((SELECT coalesce(max(number), 0) FROM session), \
               (SELECT coalesce(max(number), 0) FROM session_erased))";
    let last: u32 = connection.prepare_cached(sql)?.query_row([], |row| row.get(0))?;
    let number = last.checked_add(1).and_then(SessionNumber::new);
    number.ok_or_else(|| Inside::Damaged("its sessions are numbered beyond all counting".into()))
}

/// The columns of readings, in the order in which blocks hold them.
pub(super) fn columns(readings: &SessionReadings) -> Vec<&[f64]> {
    let SessionReadings { time_s, cells, depth_m, loop_temperature_k } = readings;
    let cells = cells.iter().map(|cell| match &cell.signal {
        CellSignal::Bar(column) | CellSignal::Volts { readings: column, .. } => column.as_slice(),
    });
    let rest = depth_m.iter().chain(loop_temperature_k).map(Vec::as_slice);
    std::iter::once(time_s.as_slice()).chain(cells).chain(rest).collect()
}

/// The same columns, to be filled.
pub(super) fn columns_mut(readings: &mut SessionReadings) -> Vec<&mut Vec<f64>> {
    let SessionReadings { time_s, cells, depth_m, loop_temperature_k } = readings;
    let cells = cells.iter_mut().map(|cell| match &mut cell.signal {
        CellSignal::Bar(column) | CellSignal::Volts { readings: column, .. } => column,
    });
    std::iter::once(time_s).chain(cells).chain(depth_m).chain(loop_temperature_k).collect()
}

/// The rows of a column that belong to the block that begins at row `from`; fewer where the column ends.
fn block(column: &[f64], from: usize) -> &[f64] {
    let rest = column.get(from..).unwrap_or(&[]);
    rest.get(..BLOCK_ROWS).unwrap_or(rest)
}

/// Refuses the number of a session that was never recorded, and says when one was erased.
pub(super) fn exists(connection: &Connection, number: SessionNumber) -> Result<(), Inside> {
    if connection.prepare_cached("SELECT 1 FROM session WHERE number = ?")?.exists([number.get()])? {
        return Ok(());
    }
    let mut erased = connection.prepare_cached("SELECT erasure FROM session_erased WHERE number = ?")?;
    let erasure: Option<u64> = erased.query_row([number.get()], |row| row.get(0)).optional()?;
    let Some(erasure) = erasure else { return Err(Inside::NoSuchSession(number)) };
    match record_at(connection, erasure)? {
        Some(Record { at, body: Body::Erasure { why, .. } }) => {
            Err(BookError::SessionErased { session: number, at, why }.into())
        }
        _ => Err(Inside::Damaged(format!("record {erasure} is no erasure"))),
    }
}

/// Whether a session has such a stretch, and it was not left out before; of a complete one without
/// reading its readings.
fn may_be_left_out(
    connection: &Connection,
    number: SessionNumber,
    stretch_s: Option<(f64, f64)>,
) -> Result<(), Inside> {
    exists(connection, number)?;
    if let Some((from, to)) = stretch_s {
        let readings_s = ends(connection, number)?;
        let inside = readings_s.is_some_and(|(first, last)| from <= to && from <= last && to >= first);
        if !inside || !from.is_finite() || !to.is_finite() {
            return Err(
                BookError::NoSuchStretch { session: number, stretch_s: (from, to), readings_s }.into()
            );
        }
    }
    let same = "SELECT 1 FROM session_left_out WHERE session = ? AND from_s IS ? AND to_s IS ?";
    let (from, to) = stretch_s.unzip();
    if connection.prepare_cached(same)?.exists(params![number.get(), from, to])? {
        return Err(BookError::SessionAlreadyLeftOut { session: number, stretch_s }.into());
    }
    Ok(())
}

/// Earliest and latest reading of a session, in seconds; none without readings.
fn ends(connection: &Connection, number: SessionNumber) -> Result<Option<(f64, f64)>, Inside> {
    if session_rows::is_open(connection, number)? {
        let Extent { first_s, last_s, .. } = Extent::of(&assemble(connection, number)?.session.readings);
        return Ok((!first_s.is_nan()).then_some((first_s, last_s)));
    }
    let sql = "SELECT coalesce(done.first_s, session.first_s), coalesce(done.last_s, session.last_s) \
               FROM session LEFT JOIN session_finished AS done ON done.session = number WHERE number = ?";
    let ends: (Option<f64>, Option<f64>) =
        connection.prepare_cached(sql)?.query_row([number.get()], |row| Ok((row.get(0)?, row.get(1)?)))?;
    Ok(ends.0.zip(ends.1))
}

/// The places of a session's records, in their order: those of its files, or all the others.
fn places(connection: &Connection, number: SessionNumber, of_files: bool) -> Result<Vec<u64>, Inside> {
    exists(connection, number)?;
    let sql = "SELECT seq FROM of_session WHERE session = ? AND (kind = ?) = ? ORDER BY seq";
    let mut statement = connection.prepare_cached(sql)?;
    let of = params![number.get(), Kind::SessionFile.number(), of_files];
    Ok(statement.query_map(of, |row| row.get(0))?.collect::<Result<_, _>>()?)
}

/// The record of a session at a place that its list names.
pub(super) fn record_of(
    connection: &Connection,
    seq: u64,
    number: SessionNumber,
) -> Result<Record<'static>, Inside> {
    let lost = || Inside::Damaged(format!("record {seq} of session {number} is not there"));
    record_at(connection, seq)?.ok_or_else(lost)
}

/// The session of a number from its records, in their order; the files it came from are not read.
pub(super) fn assemble(connection: &Connection, number: SessionNumber) -> Result<SessionRecord, Inside> {
    let mut seqs = places(connection, number, false)?.into_iter();
    let headless = || Inside::Damaged(format!("session {number} has no header"));
    let seq = seqs.next().ok_or_else(headless)?;
    let first = record_of(connection, seq, number)?;
    let Record { at: recorded, body: Body::Session { origin, extent, header, .. } } = first else {
        return Err(headless());
    };
    let session = header.into_owned();
    let Some(extent) = extent else {
        let mut by_rows = ByRows::begun(number, seq, recorded, origin, session);
        for seq in seqs {
            by_rows.take(seq, record_of(connection, seq, number)?)?;
        }
        return by_rows.into_record();
    };
    let mut found = SessionRecord {
        number,
        session,
        line_run: None,
        origin,
        state: RunState::Complete,
        recorded,
        left_out: Vec::new(),
        rows: Vec::new(),
        changes: Vec::new(),
    };
    // Room for all rows at once, and for no more than the records that follow can hold, whatever the header says.
    let rows = extent.rows.min(seqs.len().saturating_mul(BLOCK_ROWS));
    for seq in seqs {
        let wrong = || Inside::Damaged(format!("record {seq} does not fit the session it belongs to"));
        match record_of(connection, seq, number)?.body {
            Body::SessionReadings { columns, .. } => {
                let there = columns_mut(&mut found.session.readings);
                if there.len() != columns.len() {
                    return Err(wrong());
                }
                for (there, more) in there.into_iter().zip(columns) {
                    if there.is_empty() {
                        there.reserve_exact(rows);
                    }
                    there.extend_from_slice(&more);
                }
            }
            Body::SessionLine { run, .. } => found.line_run = Some(run.into_owned()),
            Body::SessionLeftOut { left_out, .. } => found.left_out.push(left_out),
            _ => return Err(wrong()),
        }
    }
    if found.session.readings.time_s.len() != extent.rows {
        return Err(Inside::Damaged(format!("session {number} does not have the readings it had")));
    }
    Ok(found)
}

/// The files of a session from their pieces, in their order.
fn source(connection: &Connection, number: SessionNumber) -> Result<Option<SessionSource>, Inside> {
    let mut files: [Option<(String, Vec<u8>)>; 4] = [const { None }; 4];
    let places = places(connection, number, true)?;
    if places.is_empty() {
        return Ok(None);
    }
    for seq in places {
        let Body::SessionFile { role, name, bytes, .. } = record_of(connection, seq, number)?.body else {
            return Err(Inside::Damaged(format!("record {seq} holds no file")));
        };
        let [session, readings, line, line_readings] = &mut files;
        let file = match role {
            FileRole::SessionFile => session,
            FileRole::Readings => readings,
            FileRole::LineFile => line,
            FileRole::LineReadings => line_readings,
        };
        match file {
            Some((_, there)) => there.extend_from_slice(&bytes),
            None => *file = Some((name, bytes.into_owned())),
        }
    }
    let [Some((session_file_name, session_file)), Some((readings_name, readings)), line, line_readings] =
        files
    else {
        return Err(Inside::Damaged(format!("a file of session {number} is not there")));
    };
    let line = line.zip(line_readings).map(|((file_name, file), (readings_name, readings))| LineSource {
        file_name,
        file,
        readings_name,
        readings,
    });
    Ok(Some(SessionSource { session_file_name, session_file, readings_name, readings, line }))
}

/// The numbers of a diver's sessions, in their order.
pub(super) fn sessions_of(connection: &Connection, diver: &Id) -> Result<Vec<SessionNumber>, Inside> {
    let mut statement =
        connection.prepare_cached("SELECT number FROM session WHERE diver_key = ? ORDER BY number")?;
    let numbers = statement.query_map([key_of(diver.as_str())], |row| row.get(0))?;
    let numbers: Vec<u32> = numbers.collect::<Result<_, _>>()?;
    let nought = || Inside::Damaged("a session has number 0".into());
    numbers.into_iter().map(|number| SessionNumber::new(number).ok_or_else(nought)).collect()
}
