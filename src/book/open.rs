//! Opening and beginning a book.
//!
//! Every connection runs in WAL mode with `synchronous=FULL` (acknowledged means on the disk), `secure_delete` (erased
//! means overwritten), foreign keys and recursive triggers. A new book is made under another name and linked into place
//! when it is whole, so that no moment of a crash leaves half a book. A reading connection is kept from writing by
//! SQLite itself; whichever connection meets damage leaves file and log as they are when it closes.

use std::cell::Cell;
use std::fs::File;
use std::io::ErrorKind;
use std::path::{Path, PathBuf};
use std::time::Duration;

use rusqlite::config::DbConfig;
use rusqlite::{Connection, ErrorCode, OpenFlags, Transaction, TransactionBehavior};

use super::body::Body;
use super::chain::{Stamp, Writing};
use super::error::{BookError, Inside};
use super::{header, schema};

/// How a book is opened.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Options {
    /// How long is waited for another program that is writing.
    pub busy: Duration,
}

impl Default for Options {
    fn default() -> Self {
        Self { busy: Duration::from_secs(5) }
    }
}

/// What opening a book did.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Opening {
    /// It was there.
    Found,
    /// It was there in an older form and was brought to the present one.
    Upgraded {
        /// The form it had.
        from: u32,
    },
    /// It was made.
    Begun,
    /// It was made, and the folder for it.
    BegunWithFolder,
}

/// An open book.
#[derive(Debug)]
pub struct Book {
    pub(super) connection: Connection,
    path: PathBuf,
    busy: Duration,
    reading_only: bool,
    opening: Opening,
    damage_met: Cell<bool>,
}

/// Pause between two tries to begin a write. SQLite's own pauses grow to 100 ms, and of ten programs that write without
/// a pause one can then miss its turn for seconds; every 2 ms none does.
const PAUSE: Duration = Duration::from_millis(2);

impl Book {
    /// Opens a book for writing.
    ///
    /// # Errors
    /// [`BookError::NoBook`] where there is none; [`BookError::NotABook`], [`BookError::Newer`] and
    /// [`BookError::Damaged`] with the file left as it is; [`BookError::Locked`], [`BookError::Permission`],
    /// [`BookError::Io`].
    pub fn open(path: &Path, options: &Options) -> Result<Self, BookError> {
        Self::open_for(path, options, false, Opening::Found)
    }

    /// Opens a book for reading; one in an older form is first brought to the present one.
    ///
    /// # Errors
    /// Those of [`Book::open`].
    pub fn open_to_read(path: &Path, options: &Options) -> Result<Self, BookError> {
        let version = header::peek(path, schema::VERSION)?;
        let opening =
            if version < schema::VERSION { Self::open(path, options)?.opening() } else { Opening::Found };
        Self::open_for(path, options, true, opening)
    }

    /// Opens a book for writing, and makes it and its folder where there is none.
    ///
    /// # Errors
    /// Those of [`Book::open`] but for the first, and of making the folder and the file.
    pub fn open_or_begin(path: &Path, options: &Options, stamp: &mut Stamp<'_>) -> Result<Self, BookError> {
        match Self::open(path, options) {
            Err(BookError::NoBook { .. }) => {
                let opening = begin(path, options, stamp)?;
                Self::open_for(path, options, false, opening)
            }
            opened => opened,
        }
    }

    /// Where the book is.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// What opening it did.
    #[must_use]
    pub const fn opening(&self) -> Opening {
        self.opening
    }

    /// How long is waited for another program.
    pub(super) const fn busy(&self) -> Duration {
        self.busy
    }

    fn open_for(
        path: &Path,
        options: &Options,
        reading_only: bool,
        opening: Opening,
    ) -> Result<Self, BookError> {
        let version = header::peek(path, schema::VERSION)?;
        let outside = |error: Inside| error.at(path, options.busy.as_secs_f64());
        let connection = connect(path, options, OpenFlags::SQLITE_OPEN_READ_WRITE).map_err(outside)?;
        let mut book = Self {
            connection,
            path: path.to_owned(),
            busy: options.busy,
            reading_only,
            opening,
            damage_met: Cell::new(false),
        };
        book.settle(version)?;
        Ok(book)
    }

    /// Second look at the version, now through SQLite; migrations; the log.
    fn settle(&mut self, peeked: u32) -> Result<(), BookError> {
        let seen = schema::version_of(&self.connection).map_err(Inside::from);
        let version = seen.map_err(|error| self.outside(error))?;
        if version > schema::VERSION {
            self.damage_met.set(true);
            let path = self.path.clone();
            return Err(BookError::Newer { path, found: version, known: schema::VERSION });
        }
        if self.reading_only {
            return self.pragma("query_only", "ON");
        }
        let mode: Result<String, _> =
            self.connection.pragma_update_and_check(None, "journal_mode", "WAL", |row| row.get(0));
        mode.map_err(|error| self.outside(error.into()))?;
        let migrated = schema::migrate(&mut self.connection, &schema::MIGRATIONS);
        migrated.map_err(|error| self.outside(error))?;
        if version < schema::VERSION {
            self.opening = Opening::Upgraded { from: peeked };
        }
        Ok(())
    }

    fn pragma(&self, name: &str, value: &str) -> Result<(), BookError> {
        self.connection.pragma_update(None, name, value).map_err(|error| self.outside(error.into()))
    }

    /// Runs `what` on one state of the book, whoever writes meanwhile.
    pub(super) fn read<T>(
        &self,
        what: impl FnOnce(&Connection) -> Result<T, Inside>,
    ) -> Result<T, BookError> {
        let done = self.connection.unchecked_transaction().map_err(Inside::from).and_then(|state| {
            let found = what(&state)?;
            state.finish()?;
            Ok(found)
        });
        done.map_err(|error| self.outside(error))
    }

    /// Runs `what` in one transaction and makes it permanent; on an error nothing of it remains.
    pub(super) fn write<T>(
        &mut self,
        stamp: &mut Stamp<'_>,
        what: impl FnOnce(&mut Writing<'_, '_, '_>) -> Result<T, Inside>,
    ) -> Result<T, BookError> {
        if self.reading_only {
            return Err(BookError::ReadingOnly { path: self.path.clone() });
        }
        let done = begin_write(&self.connection, self.busy).and_then(|transaction| {
            let mut writing = Writing::new(transaction, stamp)?;
            let result = what(&mut writing)?;
            writing.commit()?;
            Ok(result)
        });
        done.map_err(|error| self.outside(error))
    }

    /// The sentence for an error; after damage the connection closes without touching file or log.
    pub(super) fn outside(&self, error: Inside) -> BookError {
        let error = error.at(&self.path, self.busy.as_secs_f64());
        if matches!(error, BookError::Damaged { .. }) {
            self.damage_met.set(true);
        }
        error
    }

    /// Makes the connection close without touching file or log.
    pub(super) fn leave_as_it_is(&self) {
        self.damage_met.set(true);
    }
}

/// The last connection of a healthy book empties the log into the file, so that the book is one file again.
impl Drop for Book {
    fn drop(&mut self) {
        if !self.damage_met.get() {
            // If that cannot be said, the log stays beside the file, and whoever opens the book next reads both.
            let _ = self.connection.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, false);
        }
    }
}

/// A connection with the settings that every one has.
pub(super) fn connect(path: &Path, options: &Options, access: OpenFlags) -> Result<Connection, Inside> {
    let connection = Connection::open_with_flags(path, access | OpenFlags::SQLITE_OPEN_NO_MUTEX)?;
    connection.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, true)?;
    connection.busy_timeout(options.busy)?;
    connection.set_prepared_statement_cache_capacity(64);
    connection.execute_batch(
        "PRAGMA synchronous = FULL; PRAGMA foreign_keys = ON; PRAGMA recursive_triggers = ON; \
         PRAGMA secure_delete = ON; PRAGMA temp_store = MEMORY; PRAGMA cell_size_check = ON; \
         PRAGMA trusted_schema = OFF;",
    )?;
    Ok(connection)
}

/// Begins a write at once, or waits until the others let it.
pub(super) fn begin_write(connection: &Connection, busy: Duration) -> Result<Transaction<'_>, Inside> {
    connection.busy_timeout(Duration::ZERO)?;
    let mut waited = Duration::ZERO;
    let begun = loop {
        match Transaction::new_unchecked(connection, TransactionBehavior::Immediate) {
            Err(error) if error.sqlite_error_code() == Some(ErrorCode::DatabaseBusy) && waited < busy => {
                std::thread::sleep(PAUSE);
                waited += PAUSE;
            }
            begun => break begun,
        }
    };
    connection.busy_timeout(busy)?;
    Ok(begun?)
}

/// Makes a book under another name and links it into place; another program may have been faster.
fn begin(path: &Path, options: &Options, stamp: &mut Stamp<'_>) -> Result<Opening, BookError> {
    let folder = folder_of(path);
    let opening = if folder.is_dir() { Opening::Begun } else { Opening::BegunWithFolder };
    std::fs::create_dir_all(folder).map_err(|error| BookError::of_io(folder, "created", &error))?;
    let scratch = scratch_beside(path, stamp);
    let made = make(&scratch, options, stamp);
    let made = made.map_err(|error| match error.at(path, options.busy.as_secs_f64()) {
        BookError::Permission { path, .. } => BookError::Permission { path, doing: "created" },
        other => other,
    });
    let placed = made.and_then(|()| place(&scratch, path, false));
    remove_scratch(&scratch);
    Ok(if placed? { opening } else { Opening::Found })
}

/// Writes a whole book of one record: that it was begun.
fn make(scratch: &Path, options: &Options, stamp: &mut Stamp<'_>) -> Result<(), Inside> {
    let access = OpenFlags::SQLITE_OPEN_READ_WRITE | OpenFlags::SQLITE_OPEN_CREATE;
    let mut connection = connect(scratch, options, access)?;
    schema::migrate(&mut connection, &schema::MIGRATIONS)?;
    let mut writing = Writing::new(begin_write(&connection, options.busy)?, stamp)?;
    writing.append(Body::Begun)?;
    writing.commit()?;
    connection.pragma_update_and_check(None, "journal_mode", "WAL", |_| Ok(()))?;
    connection.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, false)?;
    Ok(connection.close().map_err(|(_, error)| error)?)
}

/// The folder a file is in.
pub(super) fn folder_of(path: &Path) -> &Path {
    path.parent().filter(|folder| !folder.as_os_str().is_empty()).unwrap_or(Path::new("."))
}

/// A name beside `path` that no other program takes at the same time.
pub(super) fn scratch_beside(path: &Path, stamp: &mut Stamp<'_>) -> PathBuf {
    let apart: String = (stamp.salt)().iter().map(|byte| format!("{byte:02x}")).collect();
    header::with_suffix(path, &format!(".{apart}.part"))
}

/// Removes what is left under a scratch name; nothing left is as good.
pub(super) fn remove_scratch(scratch: &Path) {
    for suffix in ["", "-journal", "-wal", "-shm"] {
        let _ = std::fs::remove_file(header::with_suffix(scratch, suffix));
    }
}

/// Puts a finished file in its place, on the disk; whether it could be, as a file that must not be replaced was not
/// there. `replace` replaces it.
pub(super) fn place(scratch: &Path, path: &Path, replace: bool) -> Result<bool, BookError> {
    let failed = |error: std::io::Error| BookError::of_io(path, "created", &error);
    File::open(scratch).and_then(|file| file.sync_all()).map_err(failed)?;
    if replace {
        std::fs::rename(scratch, path).map_err(failed)?;
    } else {
        // A link is made only where nothing is, in one step. Where the file system knows no links, two programs that
        // begin the same book within the same millisecond could still meet.
        match std::fs::hard_link(scratch, path) {
            Ok(()) => {}
            Err(error) if error.kind() == ErrorKind::AlreadyExists => return Ok(false),
            Err(_) if path.exists() => return Ok(false),
            Err(_) => std::fs::rename(scratch, path).map_err(failed)?,
        }
    }
    // The entry in the folder reaches the disk with the folder; systems that cannot sync one do so by themselves.
    let _ = File::open(folder_of(path)).and_then(|folder| folder.sync_all());
    Ok(true)
}
