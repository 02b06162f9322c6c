//! What can go wrong with a book, in sentences.

use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset};
use rusqlite::ErrorCode;

use super::canonical::Unreadable;
use super::lease::Logged;
use super::registers::Register;
use crate::entry::{RunNumber, SessionNumber};

/// Why the book could not do what was asked.
#[derive(Debug, thiserror::Error)]
pub enum BookError {
    /// There is no file of that name.
    #[error("there is no book at {}: name another, or begin one by entering or importing a run", path.display())]
    NoBook {
        /// Where it was looked for.
        path: PathBuf,
    },
    /// The file is something else.
    #[error("{} is not a book: {what}; name another file", path.display())]
    NotABook {
        /// The file.
        path: PathBuf,
        /// What it is.
        what: Stranger,
    },
    /// A later program made it.
    #[error(
        "{} was written by a newer program (form {found}, this program knows up to {known}): use that program, or a \
         backup from before",
        path.display()
    )]
    Newer {
        /// The file.
        path: PathBuf,
        /// The form it has.
        found: u32,
        /// The last form known here.
        known: u32,
    },
    /// Its content is not what it was.
    #[error("{} is damaged: {what}; it was left as it is, go back to a backup", path.display())]
    Damaged {
        /// The file.
        path: PathBuf,
        /// What was found.
        what: String,
    },
    /// Another program holds it.
    #[error(
        "{} is in use by another program, and was still after {waited_s} s: close that program or try again",
        path.display()
    )]
    Locked {
        /// The file.
        path: PathBuf,
        /// How long was waited, in seconds.
        waited_s: f64,
    },
    /// No room.
    #[error("the disk that holds {} is full: nothing was recorded, make room and try again", path.display())]
    Full {
        /// The file.
        path: PathBuf,
    },
    /// Not allowed.
    #[error("{} may not be {doing} by this user: check the rights of the file and of its folder", path.display())]
    Permission {
        /// The file.
        path: PathBuf,
        /// What was tried: `read`, `opened`, `written`, `created`.
        doing: &'static str,
    },
    /// The disk failed.
    #[error("{} could not be {doing}: the disk or the network it is on reports \"{says}\"", path.display())]
    Io {
        /// The file.
        path: PathBuf,
        /// What was tried.
        doing: &'static str,
        /// What the system says.
        says: String,
    },
    /// More than a row of the book holds.
    #[error("that is too large for {}: a file or a block of readings may have at most a thousand million bytes", path.display())]
    TooLarge {
        /// The file.
        path: PathBuf,
    },
    /// The book is open for reading only.
    #[error("{} was opened for reading only", path.display())]
    ReadingOnly {
        /// The file.
        path: PathBuf,
    },
    /// SQLite reports something that none of the above is.
    #[error("{} could not be used: {says}", path.display())]
    Other {
        /// The file.
        path: PathBuf,
        /// What SQLite says.
        says: String,
    },
    /// A run that was never recorded.
    #[error("there is no run {run} in {}", path.display())]
    NoSuchRun {
        /// The book.
        path: PathBuf,
        /// The run asked for.
        run: RunNumber,
    },
    /// A point that the run does not have.
    #[error("run {run} has no point {point}: its points are 1 to {points}")]
    NoSuchPoint {
        /// The run.
        run: RunNumber,
        /// The point asked for.
        point: usize,
        /// The points it has.
        points: usize,
    },
    /// A point that was struck or left out before.
    #[error("point {point} of run {run} is already left out")]
    AlreadyLeftOut {
        /// The run.
        run: RunNumber,
        /// The point.
        point: usize,
    },
    /// A run that is complete.
    #[error("run {run} is complete: a point is left out with its reason, and new points make a new run")]
    Complete {
        /// The run.
        run: RunNumber,
    },
    /// A run that is still being entered.
    #[error("run {run} is still being entered: finish it first")]
    Incomplete {
        /// The run.
        run: RunNumber,
    },
    /// A correction of what identifies a run.
    #[error("run {run} keeps its orifice, gas, purpose, time and technician: enter another run")]
    AnotherRun {
        /// The run.
        run: RunNumber,
    },
    /// A run to be entered that brings a time series.
    #[error("a run that is entered has points, not a time series")]
    NotPoints,
    /// A run or session that another process logs.
    #[error(
        "{what} is being logged by another process (number {process}), which holds its instruments: stop that one first{}",
        or_watch(*what)
    )]
    Held {
        /// What.
        what: Logged,
        /// The process, as its system counts it.
        process: u32,
    },
    /// The lease of a run or session lapsed while it was logged.
    #[error(
        "{what} was not heard of for too long and could have been taken up by another process: resume it"
    )]
    LeaseLost {
        /// What.
        what: Logged,
    },
    /// A run without instruments.
    #[error("run {run} was typed, not logged: it goes on at the keyboard")]
    NotLogged {
        /// The run.
        run: RunNumber,
    },
    /// A session without instruments.
    #[error("session {session} was not logged from instruments, so that it goes on at the keyboard")]
    SessionNotLogged {
        /// The session.
        session: SessionNumber,
    },
    /// A session that was never recorded.
    #[error("there is no session {session} in {}", path.display())]
    NoSuchSession {
        /// The book.
        path: PathBuf,
        /// The session asked for.
        session: SessionNumber,
    },
    /// A session whose diver was forgotten.
    #[error("session {session} was erased on {}: {why}", at.to_rfc3339())]
    SessionErased {
        /// The session.
        session: SessionNumber,
        /// When it was erased.
        at: DateTime<FixedOffset>,
        /// Why.
        why: String,
    },
    /// A session that is complete.
    #[error(
        "session {session} is complete: a stretch is left out with its reason, and new rows make a new session"
    )]
    SessionComplete {
        /// The session.
        session: SessionNumber,
    },
    /// A row that the session does not have.
    #[error("session {session} has no row {row}{}", rows_there(*rows))]
    NoSuchRow {
        /// The session.
        session: SessionNumber,
        /// The row asked for.
        row: usize,
        /// The rows it has.
        rows: usize,
    },
    /// A row that was struck before.
    #[error("row {row} of session {session} is already struck")]
    RowStruck {
        /// The session.
        session: SessionNumber,
        /// The row.
        row: usize,
    },
    /// A correction that would make readings of an event, or an event of readings.
    #[error(
        "row {row} of session {session} {}: strike it with the reason, and record the other anew",
        if *is_event { "is an event" } else { "holds readings" }
    )]
    OtherKindOfRow {
        /// The session.
        session: SessionNumber,
        /// The row.
        row: usize,
        /// Whether it is an event; else it holds readings.
        is_event: bool,
    },
    /// Readings with other columns than those before, or a correction of more than one row.
    #[error("session {session} has readings of other columns: each row has those of the first")]
    OtherColumns {
        /// The session.
        session: SessionNumber,
    },
    /// A correction of what identifies a session.
    #[error("session {session} keeps its diver, place, loop, time and cells: enter another session")]
    AnotherSession {
        /// The session.
        session: SessionNumber,
    },
    /// A session or a stretch of it that was left out before.
    #[error("session {session} is already left out{}", stretch(*stretch_s))]
    SessionAlreadyLeftOut {
        /// The session.
        session: SessionNumber,
        /// The stretch, in seconds on the time column; none for the whole session.
        stretch_s: Option<(f64, f64)>,
    },
    /// A stretch in which the session has no reading.
    #[error(
        "session {session} has no reading{}: a stretch goes from an earlier to a later time within its readings{}",
        stretch(Some(*stretch_s)),
        within(*readings_s)
    )]
    NoSuchStretch {
        /// The session.
        session: SessionNumber,
        /// The stretch, in seconds on the time column.
        stretch_s: (f64, f64),
        /// Time of the first and of the last reading, in seconds; none when it has no readings.
        readings_s: Option<(f64, f64)>,
    },
    /// Something left out without a reason.
    #[error("nothing is left out of session {session} without a reason: say why")]
    NoReason {
        /// The session.
        session: SessionNumber,
    },
    /// A name that is there.
    #[error("{} {id} is already in the register: names that differ only in case are the same, so edit it or choose another", register.name())]
    Taken {
        /// The register.
        register: Register,
        /// The name as it stands there.
        id: String,
    },
    /// A name that is not there.
    #[error("there is no {} {id} in the register", register.name())]
    Unknown {
        /// The register.
        register: Register,
        /// The name asked for.
        id: String,
    },
    /// A certificate whose number was never given out.
    #[error("there is no certificate {number} in {}: certificate list shows those there are", path.display())]
    NoSuchCertificate {
        /// The book.
        path: PathBuf,
        /// The number asked for.
        number: String,
    },
    /// A shop's pattern that makes no numbers.
    #[error("the shop's number_pattern {pattern:?} makes no certificate numbers: set it anew (shop edit)")]
    NoNumbers {
        /// The pattern.
        pattern: String,
    },
    /// A second certificate that amends the same one.
    #[error("certificate {number} is amended by {by} already: amend that one")]
    AmendedAlready {
        /// The certificate.
        number: String,
        /// The one that amends it.
        by: String,
    },
    /// A file where the copy would go.
    #[error("{} is there already: name another file, or say that it may be replaced (a book in use never is)", path.display())]
    CopyThere {
        /// The file.
        path: PathBuf,
    },
    /// The copy is not what it should be.
    #[error("the copy {} does not hold what the book holds: {what}; it was removed", path.display())]
    BadCopy {
        /// The file.
        path: PathBuf,
        /// What was found.
        what: String,
    },
}

/// That a run can be watched meanwhile; a session cannot yet.
const fn or_watch(what: Logged) -> &'static str {
    match what {
        Logged::Run(_) => ", or watch it (bench resume)",
        Logged::Session(_) => "",
    }
}

/// What a file is that is no book.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum Stranger {
    /// Nothing in it.
    #[error("it is empty")]
    Empty,
    /// A folder.
    #[error("it is a folder")]
    Folder,
    /// Text, or anything else.
    #[error("it is no database")]
    NoDatabase,
    /// SQLite, but of another program.
    #[error("it is the database of another program")]
    OtherApplication,
}

impl BookError {
    /// Whether the call is wrong (exit status 2), not the book or the disk (exit status 3).
    #[must_use]
    pub const fn is_of_the_call(&self) -> bool {
        match self {
            Self::NotABook { .. }
            | Self::Newer { .. }
            | Self::Damaged { .. }
            | Self::Locked { .. }
            | Self::Full { .. }
            | Self::Permission { .. }
            | Self::Io { .. }
            | Self::Other { .. }
            | Self::BadCopy { .. }
            | Self::ReadingOnly { .. } => false,
            Self::NoBook { .. }
            | Self::TooLarge { .. }
            | Self::NoSuchRun { .. }
            | Self::NoSuchPoint { .. }
            | Self::Held { .. }
            | Self::LeaseLost { .. }
            | Self::NotLogged { .. }
            | Self::SessionNotLogged { .. }
            | Self::AlreadyLeftOut { .. }
            | Self::Complete { .. }
            | Self::Incomplete { .. }
            | Self::AnotherRun { .. }
            | Self::NotPoints
            | Self::NoSuchSession { .. }
            | Self::SessionErased { .. }
            | Self::SessionComplete { .. }
            | Self::NoSuchRow { .. }
            | Self::RowStruck { .. }
            | Self::OtherKindOfRow { .. }
            | Self::OtherColumns { .. }
            | Self::AnotherSession { .. }
            | Self::SessionAlreadyLeftOut { .. }
            | Self::NoSuchStretch { .. }
            | Self::NoReason { .. }
            | Self::Taken { .. }
            | Self::Unknown { .. }
            | Self::NoSuchCertificate { .. }
            | Self::NoNumbers { .. }
            | Self::AmendedAlready { .. }
            | Self::CopyThere { .. } => true,
        }
    }

    pub(super) fn stranger(path: &Path, what: Stranger) -> Self {
        Self::NotABook { path: path.to_owned(), what }
    }

    pub(super) fn damaged(path: &Path, what: impl Into<String>) -> Self {
        Self::Damaged { path: path.to_owned(), what: what.into() }
    }

    /// From an error of the system; `doing` is a participle.
    pub(super) fn of_io(path: &Path, doing: &'static str, error: &std::io::Error) -> Self {
        use std::io::ErrorKind;
        let path = path.to_owned();
        match error.kind() {
            ErrorKind::PermissionDenied | ErrorKind::ReadOnlyFilesystem => Self::Permission { path, doing },
            ErrorKind::StorageFull | ErrorKind::QuotaExceeded => Self::Full { path },
            _ => Self::Io { path, doing, says: error.to_string() },
        }
    }
}

/// The words for a stretch after what is said of it.
fn stretch(stretch_s: Option<(f64, f64)>) -> String {
    stretch_s.map_or_else(String::new, |(from, to)| format!(" from {from} s to {to} s"))
}

/// The words for how many rows there are.
fn rows_there(rows: usize) -> String {
    match rows {
        0 => ": it has none yet".to_owned(),
        1 => ": there is only row 1".to_owned(),
        _ => format!(": its rows are 1 to {rows}"),
    }
}

/// The words for what a session has readings of.
fn within(readings_s: Option<(f64, f64)>) -> String {
    readings_s
        .map_or_else(|| ", and it has none".to_owned(), |(first, last)| format!(", {first} s to {last} s"))
}

/// What goes wrong inside the room, where the path of the book is not at hand.
#[derive(Debug)]
pub(super) enum Inside {
    /// SQLite.
    Sql(rusqlite::Error),
    /// A record that no longer reads as one.
    Unreadable(u64, Unreadable),
    /// The content contradicts itself.
    Damaged(String),
    /// A run that was never recorded.
    NoSuchRun(RunNumber),
    /// A session that was never recorded.
    NoSuchSession(SessionNumber),
    /// A sentence that needs no path.
    Said(BookError),
}

impl From<rusqlite::Error> for Inside {
    fn from(error: rusqlite::Error) -> Self {
        Self::Sql(error)
    }
}

impl From<BookError> for Inside {
    fn from(error: BookError) -> Self {
        Self::Said(error)
    }
}

impl Inside {
    /// The sentence for a person; `waited_s` is how long is waited for a lock.
    pub(super) fn at(self, path: &Path, waited_s: f64) -> BookError {
        match self {
            Self::Said(error) => error,
            Self::NoSuchRun(run) => BookError::NoSuchRun { path: path.to_owned(), run },
            Self::NoSuchSession(session) => BookError::NoSuchSession { path: path.to_owned(), session },
            Self::Damaged(what) => BookError::damaged(path, what),
            Self::Unreadable(seq, why) => {
                BookError::damaged(path, format!("record {seq} cannot be read, {why}"))
            }
            Self::Sql(error) => of_sql(&error, path, waited_s),
        }
    }
}

fn of_sql(error: &rusqlite::Error, path: &Path, waited_s: f64) -> BookError {
    let owned = path.to_owned();
    let says = error.to_string();
    match error.sqlite_error_code() {
        Some(ErrorCode::DatabaseBusy | ErrorCode::DatabaseLocked | ErrorCode::FileLockingProtocolFailed) => {
            BookError::Locked { path: owned, waited_s }
        }
        Some(ErrorCode::DiskFull) => BookError::Full { path: owned },
        Some(ErrorCode::DatabaseCorrupt | ErrorCode::NotADatabase) => BookError::damaged(path, says),
        Some(ErrorCode::ReadOnly | ErrorCode::PermissionDenied) => {
            BookError::Permission { path: owned, doing: "written" }
        }
        Some(ErrorCode::CannotOpen) => BookError::Permission { path: owned, doing: "opened" },
        Some(ErrorCode::SystemIoFailure) => BookError::Io { path: owned, doing: "used", says },
        Some(ErrorCode::TooBig) => BookError::TooLarge { path: owned },
        Some(_) => BookError::Other { path: owned, says },
        // A column of another type than it was made with: the file is not as this program wrote it.
        None => BookError::damaged(path, says),
    }
}
