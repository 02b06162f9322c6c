//! Lists of runs: from the tables alone, a page at a time, the newest first; and what the book is.

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, Row, params};

use super::body::{Body, CopyKind, Kind};
use super::canonical::{Canonical, Reader};
use super::chain::{Head, last_link, record_at};
use super::error::{BookError, Inside};
use super::judgements::decision_at;
use super::open::Book;
use super::registers::{Register, key_of};
use super::runs::{Origin, RunState};
use super::schema;
use crate::entry::{Decision, Id, Purpose, RunNumber, StoredVerdict};
use crate::gas::Species;

/// A run in a list.
#[derive(Debug, Clone, PartialEq)]
pub struct RunRow {
    /// Its number.
    pub number: RunNumber,
    /// Its orifice as given.
    pub orifice: String,
    /// Its gas.
    pub gas: Species,
    /// Why it was made.
    pub purpose: Purpose,
    /// When it was taken.
    pub taken: DateTime<FixedOffset>,
    /// Who took it.
    pub technician: Option<String>,
    /// How it came.
    pub origin: Origin,
    /// How far it is.
    pub state: RunState,
    /// The decision that holds.
    pub decision: Option<DecisionRow>,
}

/// A decision in a list: the figures stored with it.
#[derive(Debug, Clone, PartialEq)]
pub struct DecisionRow {
    /// The verdict.
    pub verdict: StoredVerdict,
    /// Revision of the method.
    pub method_revision: u32,
    /// Nominal intermediate pressure, in pascals over ambient.
    pub ip_pa: Option<f64>,
    /// Flow there, in litres per minute STPD.
    pub flow_l_min: Option<f64>,
    /// Its expanded uncertainty at 95 %, in litres per minute.
    pub expanded_l_min: Option<f64>,
    /// When.
    pub decided: DateTime<FixedOffset>,
}

/// Which runs a list shows, and how many.
#[derive(Debug, Clone, Copy, Default)]
pub struct RunQuery {
    /// Only those with a lower number: the last one of the page before.
    pub before: Option<RunNumber>,
    /// At most so many.
    pub limit: Option<u32>,
    /// Only those of which points may still come.
    pub open_only: bool,
}

/// A run in an orifice's history.
#[derive(Debug, Clone, PartialEq)]
pub struct HistoryRow {
    /// The run.
    pub run: RunRow,
    /// The decision that holds, with all its figures.
    pub decision: Option<Decision>,
}

/// What a book holds.
#[derive(Debug, Clone, PartialEq)]
pub struct Info {
    /// Version of its form.
    pub version: u32,
    /// End of the chain; its place is the number of records.
    pub head: Head,
    /// When it was begun.
    pub begun: DateTime<FixedOffset>,
    /// Runs.
    pub runs: u64,
    /// Sessions that were not erased.
    pub sessions: u64,
    /// Certificates whose number was given out.
    pub certificates: u64,
    /// Names in each register.
    pub entries: Vec<(Register, u64)>,
    /// Records whose payload was erased.
    pub erased: u64,
    /// Size of the file in bytes, without its log.
    pub file_bytes: u64,
}

/// A copy that was made of the book.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CopyMade {
    /// Of what kind.
    pub kind: CopyKind,
    /// Where it went.
    pub place: String,
    /// When.
    pub at: DateTime<FixedOffset>,
}

const COLUMNS: &str = "SELECT number, orifice, gas, purpose, taken, technician, origin, \
    origin <> 1 AND NOT EXISTS (SELECT 1 FROM of_run WHERE of_run.run = number AND of_run.kind = 8) AS open, \
    decision.seq, verdict, method, ip_pa, flow_l_min, expanded_l_min, decided \
    FROM run LEFT JOIN decision ON decision.seq = (SELECT max(seq) FROM decision AS d WHERE d.run = number)";

impl Book {
    /// Runs, the highest number first.
    ///
    /// # Errors
    /// Those of every read.
    pub fn runs(&self, query: &RunQuery) -> Result<Vec<RunRow>, BookError> {
        let RunQuery { before, limit, open_only } = *query;
        self.read(|connection| {
            let only = if open_only { "AND origin <> 1 AND open" } else { "" };
            let sql = format!("{COLUMNS} WHERE number < ? {only} ORDER BY number DESC LIMIT ?");
            let mut statement = connection.prepare_cached(&sql)?;
            let before = before.map_or(i64::from(u32::MAX) + 1, |number| i64::from(number.get()));
            let mut rows = statement.query(params![before, limit.map_or(-1, i64::from)])?;
            let mut runs = Vec::new();
            while let Some(row) = rows.next()? {
                runs.push(run_row(row)?);
            }
            Ok(runs)
        })
    }

    /// The runs of an orifice, those taken last first, with the decisions that hold.
    ///
    /// # Errors
    /// Those of every read.
    pub fn history(&self, orifice: &Id, limit: Option<u32>) -> Result<Vec<HistoryRow>, BookError> {
        self.read(|connection| {
            let sql = format!("{COLUMNS} WHERE orifice_key = ? ORDER BY taken_s DESC, number DESC LIMIT ?");
            let mut statement = connection.prepare_cached(&sql)?;
            let mut rows = statement.query(params![key_of(orifice.as_str()), limit.map_or(-1, i64::from)])?;
            let mut history = Vec::new();
            while let Some(row) = rows.next()? {
                let decided: Option<u64> = row.get(8)?;
                let decision = decided.map(|seq| decision_at(connection, seq)).transpose()?;
                history.push(HistoryRow { run: run_row(row)?, decision });
            }
            Ok(history)
        })
    }

    /// What the book holds.
    ///
    /// # Errors
    /// Those of every read.
    pub fn info(&self) -> Result<Info, BookError> {
        self.read(|connection| {
            let first = record_at(connection, 1)?;
            let first = first.ok_or_else(|| Inside::Damaged("its first record is not there".into()))?;
            let mut entries = Vec::new();
            for register in Register::ALL {
                let sql = "SELECT count(DISTINCT key) FROM register WHERE register = ?";
                let mut statement = connection.prepare_cached(sql)?;
                entries.push((register, statement.query_row([register.number()], |row| row.get(0))?));
            }
            let bytes = "SELECT page_count * page_size FROM pragma_page_count(), pragma_page_size()";
            Ok(Info {
                version: schema::version_of(connection)?,
                head: last_link(connection)?,
                begun: first.at,
                runs: count(connection, "SELECT count(*) FROM run")?,
                sessions: count(connection, "SELECT count(*) FROM session")?,
                certificates: count(connection, "SELECT count(*) FROM certificate")?,
                entries,
                erased: count(connection, "SELECT count(*) FROM erased")?,
                file_bytes: count(connection, bytes)?,
            })
        })
    }

    /// Copies of the book that were made, in their order.
    ///
    /// # Errors
    /// Those of every read.
    pub fn copies(&self) -> Result<Vec<CopyMade>, BookError> {
        self.read(copies)
    }
}

pub(super) fn copies(connection: &Connection) -> Result<Vec<CopyMade>, Inside> {
    let mut statement = connection.prepare_cached("SELECT seq FROM record WHERE kind = ? ORDER BY seq")?;
    let seqs = statement.query_map([Kind::CopyMade.number()], |row| row.get(0))?;
    let mut copies = Vec::new();
    for seq in seqs.collect::<Result<Vec<u64>, _>>()? {
        if let Some(record) = record_at(connection, seq)?
            && let Body::CopyMade { kind, place } = record.body
        {
            copies.push(CopyMade { kind, place, at: record.at });
        }
    }
    Ok(copies)
}

pub(super) fn count(connection: &Connection, sql: &str) -> Result<u64, Inside> {
    Ok(connection.prepare_cached(sql)?.query_row([], |row| row.get(0))?)
}

fn run_row(row: &Row<'_>) -> Result<RunRow, Inside> {
    let number: u32 = row.get(0)?;
    let wrong = || Inside::Damaged(format!("the list of runs cannot be read at run {number}"));
    let decided: Option<u64> = row.get(8)?;
    let decision = decided.map(|_| -> Result<DecisionRow, Inside> {
        Ok(DecisionRow {
            verdict: choice(row.get(9)?).ok_or_else(wrong)?,
            method_revision: row.get(10)?,
            ip_pa: row.get(11)?,
            flow_l_min: row.get(12)?,
            expanded_l_min: row.get(13)?,
            decided: time(&row.get::<_, String>(14)?).ok_or_else(wrong)?,
        })
    });
    Ok(RunRow {
        number: RunNumber::new(number).ok_or_else(wrong)?,
        orifice: row.get(1)?,
        gas: choice(row.get(2)?).ok_or_else(wrong)?,
        purpose: choice(row.get(3)?).ok_or_else(wrong)?,
        taken: time(&row.get::<_, String>(4)?).ok_or_else(wrong)?,
        technician: row.get(5)?,
        origin: choice(row.get(6)?).ok_or_else(wrong)?,
        state: if row.get(7)? { RunState::Open } else { RunState::Complete },
        decision: decision.transpose()?,
    })
}

/// A choice from its byte, the same as in the canonical bytes.
pub(super) fn choice<T: Canonical>(code: i64) -> Option<T> {
    T::read(&mut Reader::new(&[u8::try_from(code).ok()?])).ok()
}

pub(super) fn time(text: &str) -> Option<DateTime<FixedOffset>> {
    DateTime::parse_from_rfc3339(text).ok()
}
