//! Who logs an open run or session: the process that holds the ports owns it, the others watch.
//!
//! A lease is no part of the record. Its holder says four times a second that it is there; who has not been heard of for
//! [`LEASE_LASTS`] counts as gone, unless it is known to be there, and another may go on. A holder that lost its lease is refused at
//! its next word, so that never two write into one run. Times are those of the system clock: one that was set by more
//! than that looks like a holder that is gone, and a holder notices at its next word.

use std::time::Duration;

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, OptionalExtension, params};

use super::error::{BookError, Inside};
use super::open::{Book, begin_write};
use crate::entry::{RunNumber, SessionNumber};

/// How long a lease lasts that is not renewed. Default 3 s: twelve missed words (common practice, no source).
pub const LEASE_LASTS: Duration = Duration::from_secs(3);

/// What is logged.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Logged {
    /// A bench run.
    Run(RunNumber),
    /// A session.
    Session(SessionNumber),
}

impl Logged {
    const fn key(self) -> (u8, u32) {
        match self {
            Self::Run(number) => (1, number.get()),
            Self::Session(number) => (2, number.get()),
        }
    }
}

impl std::fmt::Display for Logged {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Run(number) => write!(f, "run {number}"),
            Self::Session(number) => write!(f, "session {number}"),
        }
    }
}

/// A process that logs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Holder {
    /// Sixteen bytes that it drew for itself.
    pub id: [u8; 16],
    /// The machine it runs on.
    pub host: String,
    /// Its number there.
    pub process: u32,
    /// A holder that is known to be gone, whose lease this one may take before it lapses.
    pub displaces: Option<[u8; 16]>,
}

/// A lease as another process sees it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Lease {
    /// The sixteen bytes of who holds it.
    pub id: [u8; 16],
    /// The machine its holder runs on.
    pub host: String,
    /// Its holder's number there.
    pub process: u32,
    /// Milliseconds since its holder was heard of; below nought when the clock was set back.
    pub age_ms: i64,
}

impl Lease {
    /// Whether its holder is still taken to be there.
    #[must_use]
    pub const fn holds(&self) -> bool {
        self.age_ms.unsigned_abs() < LEASE_LASTS.as_millis() as u64
    }
}

impl Book {
    /// The lease of a run or session; none when nobody logs it, or did and let go.
    ///
    /// # Errors
    /// Those of every read.
    pub fn lease(&self, what: Logged, now: DateTime<FixedOffset>) -> Result<Option<Lease>, BookError> {
        self.read(|connection| lease(connection, what, now))
    }

    /// Takes the lease, or renews it.
    ///
    /// # Errors
    /// [`BookError::Held`] while another holds it; those of every write.
    pub fn hold(
        &mut self,
        what: Logged,
        holder: &Holder,
        now: DateTime<FixedOffset>,
    ) -> Result<(), BookError> {
        let busy = self.busy();
        let held = begin_write(&self.connection, busy).and_then(|transaction| {
            renew(&transaction, what, holder, now, true)?;
            Ok(transaction.commit()?)
        });
        held.map_err(|error| self.outside(error))
    }

    /// Lets a lease go; one that another has taken meanwhile stays his.
    ///
    /// # Errors
    /// Those of every write.
    pub fn let_go(&mut self, what: Logged, holder: &Holder) -> Result<(), BookError> {
        let busy = self.busy();
        let (kind, number) = what.key();
        let gone = begin_write(&self.connection, busy).and_then(|transaction| {
            let sql = "DELETE FROM lease WHERE what = ? AND number = ? AND holder = ?";
            transaction.execute(sql, params![kind, number, holder.id])?;
            Ok(transaction.commit()?)
        });
        gone.map_err(|error| self.outside(error))
    }
}

/// Says within a transaction that the holder is there; `take` also takes a lease that is free or lapsed.
///
/// # Errors
/// [`BookError::Held`] while another holds it, [`BookError::LeaseLost`] when it is free but was not to be taken.
pub(super) fn renew(
    connection: &Connection,
    what: Logged,
    holder: &Holder,
    now: DateTime<FixedOffset>,
    take: bool,
) -> Result<(), Inside> {
    match lease(connection, what, now)? {
        Some(lease) if lease.id == holder.id => {}
        Some(lease) if take && holder.displaces == Some(lease.id) => {}
        // Whether its holder is gone is known by who asks, who then names it.
        Some(lease) => return Err(BookError::Held { what, process: lease.process }.into()),
        None if !take => return Err(BookError::LeaseLost { what }.into()),
        _ => {}
    }
    let (kind, number) = what.key();
    let sql = "INSERT OR REPLACE INTO lease (what, number, holder, host, process, beat_ms) VALUES (?, ?, ?, ?, ?, ?)";
    let mut statement = connection.prepare_cached(sql)?;
    statement.execute(params![
        kind,
        number,
        holder.id,
        holder.host,
        holder.process,
        now.timestamp_millis()
    ])?;
    Ok(())
}

fn lease(connection: &Connection, what: Logged, now: DateTime<FixedOffset>) -> Result<Option<Lease>, Inside> {
    let (kind, number) = what.key();
    let sql = "SELECT holder, host, process, beat_ms FROM lease WHERE what = ? AND number = ?";
    let mut statement = connection.prepare_cached(sql)?;
    let found = statement.query_row(params![kind, number], |row| {
        let (id, host, process): ([u8; 16], String, u32) = (row.get(0)?, row.get(1)?, row.get(2)?);
        let beat_ms: i64 = row.get(3)?;
        Ok(Lease { id, host, process, age_ms: now.timestamp_millis().saturating_sub(beat_ms) })
    });
    Ok(found.optional()?)
}
