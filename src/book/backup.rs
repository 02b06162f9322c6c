//! A copy of the whole book.
//!
//! Written under another name from one state of the book, whoever writes meanwhile; checked from its first record to
//! its last; only then given its name. The copy is one file without a log, which opens from a medium that cannot be
//! written, and is a book like any other.

use std::path::Path;

use rusqlite::OpenFlags;

use super::body::{Body, CopyKind};
use super::chain::{Head, Stamp, last_link};
use super::check::Check;
use super::error::{BookError, Inside};
use super::header::has_log;
use super::open::{Book, Options, connect, place, remove_scratch, scratch_beside};

impl Book {
    /// Copies the book to `to`; what the check of the copy found. `replace` allows that a file is there.
    ///
    /// # Errors
    /// [`BookError::CopyThere`], also with `replace` for this book itself and for one that another program has open; [`BookError::BadCopy`] when the copy does not hold; those of writing a file, and of
    /// every read.
    pub fn backup(&self, to: &Path, replace: bool, stamp: &mut Stamp<'_>) -> Result<Check, BookError> {
        // A book in use is never replaced: what stands in its log would be read into the copy.
        let in_use = has_log(to) || same_file(to, self.path());
        if in_use || (!replace && to.exists()) {
            return Err(BookError::CopyThere { path: to.to_owned() });
        }
        let scratch = scratch_beside(to, stamp);
        let copied = self.copy_to(&scratch, to).and_then(|check| {
            let placed = place(&scratch, to, replace)?;
            if placed { Ok(check) } else { Err(BookError::CopyThere { path: to.to_owned() }) }
        });
        remove_scratch(&scratch);
        copied
    }

    /// Records that a copy was made, so that an erasure can name it.
    ///
    /// # Errors
    /// Those of every write.
    pub fn note_copy(&mut self, kind: CopyKind, place: &str, stamp: &mut Stamp<'_>) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            writing.append(Body::CopyMade { kind, place: place.to_owned() })?;
            Ok(())
        })
    }

    fn copy_to(&self, scratch: &Path, to: &Path) -> Result<Check, BookError> {
        let before = self.read(last_link)?;
        self.vacuum_into(scratch).map_err(|error| match self.outside(error) {
            // What fails while writing the copy is said of the copy.
            BookError::Full { .. } => BookError::Full { path: to.to_owned() },
            BookError::Permission { doing, .. } => BookError::Permission { path: to.to_owned(), doing },
            BookError::Io { doing, says, .. } => BookError::Io { path: to.to_owned(), doing, says },
            other => other,
        })?;
        let copy = Book::open_to_read(scratch, &Options::default())?;
        let kept: &[Head] = if before == Head::NONE { &[] } else { &[before] };
        let check = copy.check(kept)?;
        match &check.wrong {
            Some(wrong) => Err(BookError::BadCopy { path: to.to_owned(), what: wrong.to_string() }),
            None => Ok(check),
        }
    }

    /// Through a connection of its own: SQLite does not distinguish writing the copy from writing the book, so one for
    /// reading only refuses it.
    fn vacuum_into(&self, scratch: &Path) -> Result<(), Inside> {
        let refused = || Inside::Damaged("the name of the copy is no text".into());
        let name = scratch.to_str().ok_or_else(refused)?;
        let options = Options { busy: self.busy() };
        let connection = connect(self.path(), &options, OpenFlags::SQLITE_OPEN_READ_WRITE)?;
        connection.execute("VACUUM INTO ?", [name])?;
        Ok(())
    }
}

fn same_file(a: &Path, b: &Path) -> bool {
    matches!((a.canonicalize(), b.canonicalize()), (Ok(a), Ok(b)) if a == b)
}
