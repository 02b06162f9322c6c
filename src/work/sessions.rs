//! Sessions of the book: imported, listed, shown, left out.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use super::WorkError;
use super::lines;
use super::registers::id_of;
use super::runs::said;
use super::shelf::{Shelf, ShelfRegisters, stamped};
use super::uptake::{GatheredSession, work_out};
use crate::book::{
    Book, LineSource, RowContent, RunState, SessionChange, SessionQuery, SessionRecord, SessionRow,
    SessionSource, SessionToImport,
};
use crate::entry::{Id, LineReference, LiveNote, LiveNoteKind, Run, Session, SessionNumber};
use crate::record::{read_run_and_files, read_session_and_files};
use crate::report::session_changes::{Before, Change, Changed};
use crate::report::session_list::Row;
use crate::report::session_shown::Shown;
use crate::report::typed::clock;

/// Most sessions a list shows unless all are asked for.
pub const LISTED: u32 = 50;

/// What became of one file.
#[derive(Debug, Clone, PartialEq)]
pub struct ImportedSession {
    /// The file.
    pub file: PathBuf,
    /// The session it is in the book.
    pub session: SessionNumber,
    /// The diver.
    pub diver: String,
    /// Whether it is new; the same bytes were there already otherwise.
    pub new: bool,
    /// Whether the diver was unknown and was created with the code only.
    pub diver_created: bool,
    /// Whether the orifice was unknown and was created with its name only.
    pub orifice_created: bool,
    /// What was said on reading.
    pub notes: Vec<String>,
}

/// A session file, read.
struct Read {
    session: Session,
    line_run: Option<Run>,
    files: SessionSource,
    notes: Vec<String>,
}

/// Imports session files, each with its readings and the run file its line comes from: all are read and worked out
/// before the first is written, so that a mistake in one writes none.
///
/// # Errors
/// A file that is refused (nothing is written then), or a book that cannot be written.
pub fn import(
    shelf: &Shelf,
    files: &[PathBuf],
    notes: &mut Vec<String>,
) -> Result<Vec<ImportedSession>, WorkError> {
    let read = files.iter().map(|file| read(file, shelf)).collect::<Result<Vec<_>, _>>()?;
    let mut book = shelf.to_write(notes)?;
    let items: Vec<SessionToImport<'_>> = read
        .iter()
        .map(|read| SessionToImport {
            session: &read.session,
            line_run: read.line_run.as_ref(),
            files: &read.files,
        })
        .collect();
    let recorded = stamped(|stamp| book.import_sessions(&items, stamp))??;
    let imported = files.iter().zip(&read).zip(recorded).map(|((file, read), recorded)| ImportedSession {
        file: file.clone(),
        session: recorded.number,
        diver: read.session.diver.to_string(),
        new: recorded.new,
        diver_created: recorded.diver_created,
        orifice_created: recorded.orifice_created,
        notes: read.notes.clone(),
    });
    Ok(imported.collect())
}

fn read(path: &Path, shelf: &Shelf) -> Result<Read, WorkError> {
    let (loaded, own) = read_session_and_files(path)?;
    let mut notes: Vec<String> = loaded.notes.iter().map(ToString::to_string).collect();
    let session = loaded.value;
    let mut line = None;
    if let Some(LineReference::RunFile(file)) = &session.line {
        let at = path.parent().unwrap_or(Path::new("")).join(file);
        let registers = ShelfRegisters::new(shelf);
        let (run, bytes) = match read_run_and_files(&at, &registers) {
            Ok(found) => found,
            Err(refused) => return Err(registers.failure().unwrap_or_else(|| refused.into())),
        };
        notes.extend(run.notes.iter().map(|note| format!("{file}: {note}")));
        let source = LineSource {
            file_name: file.clone(),
            file: bytes.toml,
            readings_name: bytes.readings_name,
            readings: bytes.readings,
        };
        line = Some((run.value, source));
    }
    let (line_run, line_source) = line.unzip();
    checked(path, &session, line_run.as_ref())?;
    let files = SessionSource {
        session_file_name: path.file_name().unwrap_or_default().to_string_lossy().into_owned(),
        session_file: own.toml,
        readings_name: own.readings_name,
        readings: own.readings,
        line: line_source,
    };
    Ok(Read { session, line_run, files, notes })
}

/// A session whose input is wrong (an event outside the readings, say) does not go into the book; one that merely has no
/// answer does. A line that is to come from the book is not needed for that.
fn checked(path: &Path, session: &Session, line_run: Option<&Run>) -> Result<(), WorkError> {
    let name = path.display().to_string();
    let line = line_run.map(|run| lines::of_kept_run(run, path, session.taken.date_naive())).transpose()?;
    if line.is_none() && matches!(session.line, Some(LineReference::Orifice(_))) {
        return Ok(());
    }
    let gathered = GatheredSession { name, session: session.clone(), line, left_out: Vec::new() };
    work_out(std::slice::from_ref(&gathered)).map(|_| ())
}

/// The newest sessions, [`LISTED`] of them unless `all`, of one diver or of all, and whether there are older ones.
///
/// # Errors
/// When there is no book or it cannot be read.
pub fn list(shelf: &Shelf, diver: Option<&str>, all: bool) -> Result<(Vec<Row>, bool), WorkError> {
    let diver = diver.map(id_of).transpose()?;
    let limit = (!all).then_some(LISTED + 1);
    let mut rows = shelf.to_read()?.sessions(&SessionQuery { diver, limit, ..SessionQuery::default() })?;
    let more = !all && rows.len() > LISTED as usize;
    if more {
        rows.truncate(LISTED as usize);
    }
    Ok((rows.into_iter().map(listed).collect(), more))
}

/// Every session of a diver, the newest first.
pub(super) fn all_of(book: &Book, diver: &Id) -> Result<Vec<SessionRow>, WorkError> {
    Ok(book.sessions(&SessionQuery { diver: Some(diver.clone()), ..SessionQuery::default() })?)
}

/// One session as the book has it.
pub(super) fn kept(book: &Book, number: SessionNumber) -> Result<SessionRecord, WorkError> {
    Ok(book.session(number)?)
}

fn listed(row: SessionRow) -> Row {
    Row {
        number: row.number,
        diver: row.diver,
        place: row.place,
        kept: row.kept,
        taken: row.taken,
        minutes: row.minutes,
        cells: row.cells,
        readings: row.readings,
        left_out: row.left_out,
        stretches_left_out: row.stretches_left_out,
        open: row.state == RunState::Open,
    }
}

/// A session of the book, with the names of the files it came from.
#[derive(Debug, Clone, PartialEq)]
pub struct KeptSession {
    /// What the book has.
    pub record: SessionRecord,
    /// The files.
    pub files: Vec<String>,
    /// What was corrected or struck since, in order.
    pub changes: Vec<Change>,
    /// What happened to its instruments while it was logged, and its alarms; empty for any other.
    pub heard: Vec<String>,
}

impl KeptSession {
    /// The same for `report`.
    #[must_use]
    pub fn shown(&self) -> Shown<'_> {
        Shown {
            number: self.record.number,
            session: &self.record.session,
            recorded: self.record.recorded,
            left_out: &self.record.left_out,
            files: &self.files,
            notes: &self.heard,
            open: self.record.state == RunState::Open,
            changes: &self.changes,
        }
    }
}

/// One session as it stands in the book.
///
/// # Errors
/// A name that is no session's, a session that is not there, a book that cannot be read.
pub fn show(shelf: &Shelf, session: &str) -> Result<KeptSession, WorkError> {
    let number = number_of(session)?;
    let book = shelf.to_read()?;
    let record = kept(&book, number)?;
    let files = book.session_source_of(number)?.map(|source| {
        let line = source.line.map(|line| line.file_name);
        [Some(source.session_file_name), Some(source.readings_name), line].into_iter().flatten().collect()
    });
    let changes = record.changes.iter().map(|change| changed(change, &record)).collect();
    let heard = heard(&book.session_notes(number)?);
    Ok(KeptSession { record, files: files.unwrap_or_default(), changes, heard })
}

/// Alarms one by one, and how often anything else happened, in sentences.
fn heard(notes: &[LiveNote]) -> Vec<String> {
    let name = |note: &LiveNote| note.instrument.as_ref().map(|id| format!("{id}: ")).unwrap_or_default();
    let mut counts: BTreeMap<(String, LiveNoteKind), (usize, String)> = BTreeMap::new();
    let mut said = Vec::new();
    for note in notes {
        match note.kind {
            LiveNoteKind::AlarmRaised | LiveNoteKind::AlarmCleared => {
                said.push(format!("{} {} ({})", clock(note.at_s), note.kind.name(), note.says));
            }
            LiveNoteKind::Connected => {}
            kind => {
                let count = counts.entry((name(note), kind)).or_insert((0, note.says.clone()));
                count.0 += 1;
            }
        }
    }
    said.extend(counts.into_iter().map(|((name, kind), (times, says))| {
        format!("{name}{} {times} times while logging ({says})", kind.name())
    }));
    said
}

/// A change for `report`.
fn changed(change: &SessionChange, record: &SessionRecord) -> Change {
    match change {
        SessionChange::Corrected { row, before, at } => {
            let cells = record.session.readings.cells.len();
            let before = match before {
                RowContent::Readings(values) => {
                    let (at_s, rest) =
                        values.split_first().map_or((f64::NAN, &[][..]), |(at, rest)| (*at, rest));
                    Before::Readings { at_s, cells: rest.get(..cells).unwrap_or(rest).to_vec() }
                }
                RowContent::Event(event) => Before::Event(*event),
            };
            Change { at: *at, what: Changed::Corrected { row: *row, before } }
        }
        SessionChange::Struck { row, why, at } => {
            Change { at: *at, what: Changed::Struck { row: *row, why: why.clone() } }
        }
        SessionChange::Restated { at } => Change { at: *at, what: Changed::Restated },
    }
}

/// Leaves a stretch of a session out, or the whole session out of the diver's uptake, with a reason.
///
/// # Errors
/// A session that is not there, a stretch outside its readings, an empty reason, a book that cannot be written.
pub fn leave_out(
    shelf: &Shelf,
    session: &str,
    stretch: Option<(&str, &str)>,
    why: &str,
    by: Option<&str>,
) -> Result<(SessionNumber, Option<(f64, f64)>), WorkError> {
    let number = number_of(session)?;
    let why = said("--why", why)?;
    let by = by.map(|by| said("--by", by)).transpose()?;
    let mut book = shelf.to_change()?;
    let record = kept(&book, number)?;
    let stretch_s =
        stretch.map(|(from, until)| stretch_of(&record.session, number, from, until)).transpose()?;
    stamped(|stamp| book.leave_out_of_session(number, stretch_s, why, by, stamp))??;
    Ok((number, stretch_s))
}

fn stretch_of(
    session: &Session,
    number: SessionNumber,
    from: &str,
    until: &str,
) -> Result<(f64, f64), WorkError> {
    let on = |text: &str| -> Result<f64, WorkError> {
        Ok(crate::record::elapsed_or_time(text).map_err(WorkError::SessionTime)?.on(session))
    };
    let (from_s, until_s) = (on(from)?, on(until)?);
    let times = session.readings.time_s.iter().copied().filter(|t| t.is_finite());
    let (first_s, last_s) =
        times.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), t| (low.min(t), high.max(t)));
    if from_s < until_s && from_s >= first_s && until_s <= last_s {
        Ok((from_s, until_s))
    } else {
        Err(WorkError::Stretch {
            session: number,
            from: from.to_owned(),
            until: until.to_owned(),
            first_s,
            last_s,
        })
    }
}

/// The session a name stands for.
///
/// # Errors
/// A text that is no session's number.
pub fn number_of(session: &str) -> Result<SessionNumber, WorkError> {
    SessionNumber::parse(session).ok_or_else(|| WorkError::NoSessionNumber(session.to_owned()))
}
