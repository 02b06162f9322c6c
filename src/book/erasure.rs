//! Forgetting a diver.
//!
//! The erasure is recorded first; then every payload of the diver goes with its salt, and the rows that name the diver.
//! Done means gone from the file and its log: the file is written anew without what was deleted (`secure_delete` alone
//! may leave a stale copy where SQLite moved a row between pages), and the log is emptied. While another program reads
//! an older state, the log cannot be emptied; then the book remembers that, and asking again finishes.

use rusqlite::{Connection, params};

use super::body::{Body, FIRST_PERSONAL_KIND, Kind, Record};
use super::body_rows::place;
use super::chain::{Stamp, record_at};
use super::error::{BookError, Inside};
use super::lists::{CopyMade, copies, count};
use super::open::Book;
use super::registers::{Register, key_of};
use super::sessions::sessions_of;
use crate::entry::{Id, SessionNumber};

/// What became of a diver's data.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Forgotten {
    /// No byte of it is left in the book or its log.
    Done {
        /// Records whose payloads went now; nought when an earlier erasure was only finished.
        records: usize,
        /// Copies made before, which the book cannot reach.
        copies: Vec<CopyMade>,
    },
    /// It is deleted and cannot be read any more, but its bytes may still be in the file or its log, because another
    /// program is reading the book. Ask again when that one has stopped.
    StillHeld {
        /// Records whose payloads went now; nought when an earlier erasure was to be finished.
        records: usize,
        /// Copies made before, which the book cannot reach.
        copies: Vec<CopyMade>,
    },
}

impl Book {
    /// Deletes everything personal of a diver, in whatever case the code is written: the entry of the register and every
    /// session with its readings, line, files and what was left out of it. The reason stays for good, and is what the
    /// numbers of those sessions answer from then on: it must not name the diver.
    ///
    /// # Errors
    /// [`BookError::Unknown`] when there is no such diver and no earlier erasure to finish; those of every write.
    pub fn forget_diver(
        &mut self,
        diver: &Id,
        why: &str,
        stamp: &mut Stamp<'_>,
    ) -> Result<Forgotten, BookError> {
        let (records, copies) = self.write(stamp, |writing| {
            let copies = copies(&writing.transaction)?;
            let erased = records_of(&writing.transaction, diver)?;
            if erased.is_empty() {
                return if count(&writing.transaction, "SELECT count(*) FROM wiping")? > 0 {
                    Ok((0, copies))
                } else {
                    Err(BookError::Unknown { register: Register::Diver, id: diver.as_str().to_owned() }
                        .into())
                };
            }
            let records = erased.len();
            let sessions = sessions_of(&writing.transaction, diver)?;
            writing.append(Body::Erasure { erased: erased.clone(), sessions, why: why.to_owned() })?;
            for table in ERASABLE {
                let sql = format!("DELETE FROM {table} WHERE seq = ?");
                let mut statement = writing.transaction.prepare(&sql)?;
                for seq in &erased {
                    statement.execute([place(*seq)])?;
                }
            }
            writing.transaction.execute("INSERT OR IGNORE INTO wiping (one) VALUES (1)", [])?;
            Ok((records, copies))
        })?;
        if self.wipe().map_err(|error| self.outside(error))? {
            Ok(Forgotten::Done { records, copies })
        } else {
            Ok(Forgotten::StillHeld { records, copies })
        }
    }

    /// Whether an erasure has yet to be carried through to the file and its log.
    ///
    /// # Errors
    /// Those of every read.
    pub fn erasure_unfinished(&self) -> Result<bool, BookError> {
        self.read(|connection| Ok(count(connection, "SELECT count(*) FROM wiping")? > 0))
    }

    /// What was erased, in its order: when, why, and which sessions went.
    ///
    /// # Errors
    /// Those of every read.
    pub fn erasures(&self) -> Result<Vec<ErasureNote>, BookError> {
        self.read(|connection| {
            let sql = "SELECT seq FROM record WHERE kind = ? ORDER BY seq";
            let mut statement = connection.prepare_cached(sql)?;
            let seqs = statement.query_map([Kind::Erasure.number()], |row| row.get(0))?;
            let mut notes = Vec::new();
            for seq in seqs.collect::<Result<Vec<u64>, _>>()? {
                if let Some(Record { at, body: Body::Erasure { erased, sessions, why } }) =
                    record_at(connection, seq)?
                {
                    notes.push(ErasureNote { seq, at, why, erased, sessions });
                }
            }
            Ok(notes)
        })
    }

    /// Writes the file anew without what was deleted and empties its log; whether that could be done.
    fn wipe(&self) -> Result<bool, Inside> {
        // The copy SQLite makes on the way may be as large as the book, so it does not go into memory; nothing that was
        // erased is in it.
        self.connection.execute_batch("PRAGMA temp_store = FILE; VACUUM; PRAGMA temp_store = MEMORY;")?;
        if !self.empty_log()? {
            return Ok(false);
        }
        self.connection.execute("DELETE FROM wiping", [])?;
        Ok(true)
    }

    /// Whether everything in the log went into the file and the log has no byte left.
    fn empty_log(&self) -> Result<bool, Inside> {
        let (busy, logged): (bool, i64) =
            self.connection
                .query_row("PRAGMA wal_checkpoint(TRUNCATE)", [], |row| Ok((row.get(0)?, row.get(1)?)))?;
        let log = std::fs::metadata(super::header::log_of(self.path()));
        let bytes = log.map_or(0, |about| about.len());
        Ok(!busy && logged == 0 && bytes == 0)
    }
}

/// The tables whose rows go with the payload they repeat.
const ERASABLE: [&str; 6] =
    ["payload", "register", "session", "of_session", "session_finished", "session_left_out"];

/// Everything personal that belongs to a diver, in its order: all revisions of the entry, and all of the sessions.
fn records_of(connection: &Connection, diver: &Id) -> Result<Vec<u64>, Inside> {
    let sql = "SELECT register.seq FROM register JOIN record USING (seq) \
               WHERE register = ?1 AND key = ?2 AND kind >= ?3 \
               UNION SELECT of_session.seq FROM session JOIN of_session ON session = number \
               WHERE diver_key = ?2 ORDER BY 1";
    let mut statement = connection.prepare_cached(sql)?;
    let of = params![Register::Diver.number(), key_of(diver.as_str()), FIRST_PERSONAL_KIND];
    let seqs = statement.query_map(of, |row| row.get(0))?;
    Ok(seqs.collect::<Result<_, _>>()?)
}

/// An erasure as the chain tells it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ErasureNote {
    /// Its place in the chain.
    pub seq: u64,
    /// When.
    pub at: chrono::DateTime<chrono::FixedOffset>,
    /// Why.
    pub why: String,
    /// The places whose payloads went.
    pub erased: Vec<u64>,
    /// The sessions among them; their numbers are never given again.
    pub sessions: Vec<SessionNumber>,
}
