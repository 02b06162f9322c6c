//! `book`: what it holds, whether it holds, a copy of it.

use std::path::Path;

use super::shelf::{Shelf, stamped};
use super::{ExitStatus, WorkError};
use crate::book::{Check, CopyKind, ErasureNote, Head};
use crate::report::book::{Backup, BookCheck, BookInfo, Erasure};

/// What the book holds.
///
/// # Errors
/// When there is no book or it cannot be read.
pub fn info(shelf: &Shelf) -> Result<BookInfo, WorkError> {
    let book = shelf.to_read()?;
    let info = book.info()?;
    Ok(BookInfo {
        path: shelf.path().display().to_string(),
        form: info.version,
        begun: info.begun,
        records: info.head.seq,
        runs: info.runs,
        sessions: info.sessions,
        certificates: info.certificates,
        entries: info.entries.iter().map(|(register, count)| (register.name(), *count)).collect(),
        erased: info.erased,
        erasures: book.erasures()?.into_iter().map(erasure).collect(),
        erasure_unfinished: book.erasure_unfinished()?,
        copies: book.copies()?.into_iter().map(|copy| (said_copy(copy.kind), copy.place, copy.at)).collect(),
        head: info.head.to_string(),
        bytes: info.file_bytes,
    })
}

/// Checks the book from its first record to its last, and whether its chain passes through heads kept elsewhere.
///
/// # Errors
/// A text that is no head; no book, or one that cannot be read so far that it could be checked.
pub fn check(shelf: &Shelf, heads: &[String]) -> Result<BookCheck, WorkError> {
    let heads = heads.iter().map(|head| head.parse::<Head>()).collect::<Result<Vec<_>, _>>()?;
    let found = shelf.to_read()?.check(&heads)?;
    Ok(shown(shelf.path(), found, heads.len()))
}

/// Whether what was checked holds.
#[must_use]
pub const fn status_of(check: &BookCheck) -> ExitStatus {
    if check.wrong.is_none() { ExitStatus::Done } else { ExitStatus::Unfavourable }
}

/// Copies the book, checks the copy, and notes in the book that there is one.
///
/// # Errors
/// No book, one that cannot be read or noted in, a file that is there already, a copy that cannot be written.
pub fn backup(shelf: &Shelf, to: &Path, replace: bool) -> Result<Backup, WorkError> {
    let mut book = shelf.to_change()?;
    let check = stamped(|stamp| book.backup(to, replace, stamp))??;
    let place = place_of(to);
    stamped(|stamp| book.note_copy(CopyKind::Backup, &place, stamp))??;
    Ok(Backup { path: to.display().to_string(), check: shown(to, check, 0) })
}

/// The words for a kind of copy.
pub(super) const fn said_copy(kind: CopyKind) -> &'static str {
    match kind {
        CopyKind::Backup => "backup",
        CopyKind::Export => "export with divers",
    }
}

/// A file or folder by its whole path, as a person finds it again.
pub(super) fn place_of(path: &Path) -> String {
    std::path::absolute(path).unwrap_or_else(|_| path.to_owned()).display().to_string()
}

fn shown(path: &Path, check: Check, heads: usize) -> BookCheck {
    BookCheck {
        path: path.display().to_string(),
        records: check.records,
        runs: check.runs,
        sessions: check.sessions,
        erasures: check.erasures.into_iter().map(erasure).collect(),
        head: check.head.to_string(),
        heads,
        wrong: check.wrong.map(|wrong| wrong.to_string()),
    }
}

fn erasure(note: ErasureNote) -> Erasure {
    let ErasureNote { seq, at, why, erased, sessions } = note;
    Erasure { record: seq, at, why, records: erased.len(), sessions }
}
