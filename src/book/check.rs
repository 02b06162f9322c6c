//! Whether the book is still what was recorded.
//!
//! Comes in: a book, and heads that were printed or written down elsewhere. Goes out: what it holds, and the first thing
//! that is wrong with its place. In order: SQLite's own check of every page and index; the tables and triggers against
//! those of a new book; each record's place, link and digest; that its payload reads, and writes the same bytes again; the
//! rows by which it is found; that no payload is missing without an erasure and none is there in spite of one; that
//! the chain passes through the given heads and ends where its last transaction left it. Nothing is written.
//!
//! Left out: whoever rewrites the whole chain from some record on and every table with it is seen only by a head kept
//! elsewhere.

use std::collections::BTreeMap;

use rusqlite::types::Value;
use rusqlite::{Connection, OptionalExtension, params};

use super::body::{self, Body, FIRST_PERSONAL_KIND, Record};
use super::body_rows::{self, Row};
use super::chain::{Head, payload_digest, stored_head};
use super::erasure::ErasureNote;
use super::error::{BookError, Inside};
use super::lists::count;
use super::open::Book;
use super::schema;
use crate::entry::SessionNumber;

/// What a check found.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    /// Records in the chain, as far as it was walked.
    pub records: u64,
    /// Runs among them.
    pub runs: u64,
    /// Sessions among them that were not erased.
    pub sessions: u64,
    /// Erasures, in their order.
    pub erasures: Vec<ErasureNote>,
    /// The end of the chain, as far as it holds.
    pub head: Head,
    /// The first thing that is wrong; none when the book holds.
    pub wrong: Option<Wrong>,
}

/// What can be wrong with a book.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Wrong {
    /// SQLite finds a page or an index at fault.
    #[error("the file is damaged: {0}")]
    File(String),
    /// A table, index or trigger is not as a new book has it.
    #[error("the table, index or trigger {0} is missing, changed or foreign")]
    Schema(String),
    /// A record was removed, or the order changed.
    #[error("record {0} is missing from the chain")]
    RecordMissing(u64),
    /// A link does not follow from the one before.
    #[error("the link of record {0} does not follow from the one before it: a record was changed or moved")]
    Link(u64),
    /// The payload is not the one that was recorded.
    #[error("the content of record {0} is not what was recorded")]
    Payload(u64),
    /// The payload is gone, and no erasure names it.
    #[error("the content of record {0} is gone, and no erasure names it")]
    PayloadMissing(u64),
    /// The payload is there, and an erasure names it.
    #[error("the content of record {0} is there although an erasure names it")]
    NotErased(u64),
    /// An erasure names what cannot be erased.
    #[error("the erasure in record {erasure} names record {named}, which is not a personal one before it")]
    Erasure {
        /// The erasure.
        erasure: u64,
        /// What it names.
        named: u64,
    },
    /// The payload is no record of its kind.
    #[error("record {0} cannot be read: {1}")]
    Unreadable(u64, String),
    /// A row for lists is not what the payload says.
    #[error("the list \"{table}\" does not show what record {seq} says")]
    List {
        /// The record.
        seq: u64,
        /// The table.
        table: &'static str,
    },
    /// A table for lists has rows that no record accounts for.
    #[error("the list \"{0}\" has rows that no record accounts for")]
    Unaccounted(&'static str),
    /// The chain ends before a head that was kept, or does not pass through it.
    #[error("the chain does not pass through {0}, which was its head once: its end was cut off or rewritten")]
    Head(Head),
    /// The chain does not end where its last transaction left it.
    #[error("the chain does not end where its last transaction left it: its end was cut off")]
    CutTail,
}

impl Book {
    /// Checks the book from its first record to its last; `against` are heads that were kept elsewhere, as certificates
    /// print them.
    ///
    /// # Errors
    /// Only what keeps the check from being made: a lock, the disk, a damage SQLite refuses to read past
    /// ([`BookError::Damaged`]).
    pub fn check(&self, against: &[Head]) -> Result<Check, BookError> {
        let found = self.read(|connection| check(connection, against));
        if !matches!(&found, Ok(Check { wrong: None, .. })) {
            self.leave_as_it_is();
        }
        found
    }
}

const LISTS: [&str; 12] = [
    "run",
    "of_run",
    "decision",
    "certificate",
    "certificate_files",
    "register",
    "session",
    "of_session",
    "session_finished",
    "session_left_out",
    "session_erased",
    "erased",
];

fn check(connection: &Connection, against: &[Head]) -> Result<Check, Inside> {
    let mut found =
        Check { records: 0, runs: 0, sessions: 0, erasures: Vec::new(), head: Head::NONE, wrong: None };
    found.wrong = match file_and_schema(connection)? {
        Some(wrong) => Some(wrong),
        None => walk(connection, against, &mut found)?,
    };
    Ok(found)
}

fn file_and_schema(connection: &Connection) -> Result<Option<Wrong>, Inside> {
    let says: String = connection.query_row("PRAGMA integrity_check(1)", [], |row| row.get(0))?;
    if says != "ok" {
        return Ok(Some(Wrong::File(says)));
    }
    let (here, new) = (schema::things(connection)?, schema::expected()?);
    let stranger = here.iter().find(|thing| !new.contains(thing));
    let missing = new.iter().find(|thing| !here.contains(thing));
    Ok(stranger.or(missing).map(|(_, name, _)| Wrong::Schema(name.clone())))
}

/// What is known of the records walked so far.
#[derive(Default)]
struct Walked {
    rows: BTreeMap<&'static str, u64>,
    /// Personal records without a payload, until an erasure names them.
    without_payload: BTreeMap<u64, ()>,
    personal: BTreeMap<u64, ()>,
    /// The sessions that are there, each with its record.
    sessions: BTreeMap<SessionNumber, u64>,
}

fn walk(connection: &Connection, against: &[Head], found: &mut Check) -> Result<Option<Wrong>, Inside> {
    let mut walked = Walked::default();
    let sql = "SELECT record.seq, kind, digest, link, salt, bytes FROM record LEFT JOIN payload USING (seq) \
               ORDER BY record.seq";
    let mut statement = connection.prepare(sql)?;
    let mut records = statement.query([])?;
    while let Some(row) = records.next()? {
        let (seq, kind): (u64, u16) = (row.get(0)?, row.get(1)?);
        let (digest, link): ([u8; 32], [u8; 32]) = (row.get(2)?, row.get(3)?);
        if seq != found.head.seq + 1 {
            return Ok(Some(Wrong::RecordMissing(found.head.seq + 1)));
        }
        let head = found.head.followed_by(kind, &digest);
        if head.link != link {
            return Ok(Some(Wrong::Link(seq)));
        }
        if let Some(kept) = against.iter().find(|kept| kept.seq == seq && kept.link != link) {
            return Ok(Some(Wrong::Head(*kept)));
        }
        let salt: Option<Vec<u8>> = row.get(4)?;
        let bytes = row.get_ref(5)?.as_blob_or_null();
        let bytes = bytes.map_err(|_| Inside::Damaged(format!("the content of record {seq} is no bytes")))?;
        let wrong = match (salt, bytes) {
            (Some(salt), Some(bytes)) => {
                if payload_digest(&salt, bytes) == digest {
                    record(connection, seq, kind, bytes, &mut walked, found)?
                } else {
                    Some(Wrong::Payload(seq))
                }
            }
            _ if kind >= FIRST_PERSONAL_KIND => {
                walked.without_payload.insert(seq, ());
                None
            }
            _ => Some(Wrong::PayloadMissing(seq)),
        };
        if wrong.is_some() {
            return Ok(wrong);
        }
        if kind >= FIRST_PERSONAL_KIND {
            walked.personal.insert(seq, ());
        }
        found.head = head;
        found.records = seq;
    }
    ends(connection, against, &walked, found)
}

/// A record whose payload is the one that was recorded: it reads, writes the same again, and the lists show it.
fn record(
    connection: &Connection,
    seq: u64,
    kind: u16,
    bytes: &[u8],
    walked: &mut Walked,
    found: &mut Check,
) -> Result<Option<Wrong>, Inside> {
    let record = match body::read(kind, bytes) {
        Ok(record) => record,
        Err(why) => return Ok(Some(Wrong::Unreadable(seq, why.to_string()))),
    };
    if body::write(&record) != bytes {
        return Ok(Some(Wrong::Unreadable(seq, "it has another form than the canonical one".into())));
    }
    for row in body_rows::rows(seq, &record) {
        if !is_listed(connection, &row)? {
            return Ok(Some(Wrong::List { seq, table: row.table }));
        }
        *walked.rows.entry(row.table).or_default() += 1;
    }
    match record {
        Record { at, body: Body::Erasure { erased, sessions, why } } => {
            for named in &erased {
                if !walked.personal.contains_key(named) {
                    return Ok(Some(Wrong::Erasure { erasure: seq, named: *named }));
                }
                if walked.without_payload.remove(named).is_none() {
                    return Ok(Some(Wrong::NotErased(*named)));
                }
            }
            found.erasures.push(ErasureNote { seq, at, why, erased, sessions });
        }
        Record { body: Body::Run { .. }, .. } => found.runs += 1,
        Record { body: Body::Session { number, .. }, .. } => {
            walked.sessions.insert(number, seq);
            found.sessions += 1;
        }
        _ => {}
    }
    Ok(None)
}

fn is_listed(connection: &Connection, row: &Row) -> Result<bool, Inside> {
    let names: Vec<&str> = row.columns.iter().map(|(name, _)| *name).collect();
    let Some((by, key)) = row.columns.first() else { return Ok(false) };
    let sql = format!("SELECT {} FROM {} WHERE {by} = ?", names.join(", "), row.table);
    let mut statement = connection.prepare_cached(&sql)?;
    let listed = statement.query_row(params![key], |listed| {
        for (index, (_, value)) in row.columns.iter().enumerate() {
            // Equal as numbers: SQLite keeps a negative nought as nought.
            if listed.get::<_, Value>(index)? != *value {
                return Ok(false);
            }
        }
        Ok(true)
    });
    Ok(listed.optional()? == Some(true))
}

/// What can only be said at the end of the chain.
fn ends(
    connection: &Connection,
    against: &[Head],
    walked: &Walked,
    found: &Check,
) -> Result<Option<Wrong>, Inside> {
    if let Some(seq) = walked.without_payload.keys().next() {
        return Ok(Some(Wrong::PayloadMissing(*seq)));
    }
    let erased = found.erasures.iter().flat_map(|erasure| &erasure.sessions);
    if let Some(seq) = erased.filter_map(|session| walked.sessions.get(session)).min() {
        return Ok(Some(Wrong::NotErased(*seq)));
    }
    if let Some(kept) = against.iter().find(|kept| kept.seq > found.head.seq || kept.seq == 0) {
        return Ok(Some(Wrong::Head(*kept)));
    }
    if stored_head(connection)? != Some(found.head) {
        return Ok(Some(Wrong::CutTail));
    }
    for table in LISTS {
        let rows = count(connection, &format!("SELECT count(*) FROM {table}"))?;
        if rows != walked.rows.get(table).copied().unwrap_or(0) {
            return Ok(Some(Wrong::Unaccounted(table)));
        }
    }
    let erased: u64 = found.erasures.iter().map(|erasure| erasure.erased.len() as u64).sum();
    let payloads = count(connection, "SELECT count(*) FROM payload")?;
    Ok((payloads + erased != found.records).then_some(Wrong::Unaccounted("payload")))
}
