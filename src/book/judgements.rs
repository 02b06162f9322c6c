//! What a person decided: points left out with their reason, and runs accepted with the figures they rest on.

use rusqlite::{OptionalExtension, params};

use super::body::Body;
use super::chain::{Stamp, record_at};
use super::error::{BookError, Inside};
use super::open::Book;
use super::registers::key_of;
use super::runs::{RunState, assemble};
use crate::entry::{Decision, Id, LeftOut, RunNumber};

impl Book {
    /// Leaves a point of a run out of its line. Points of a time series are found only by analysing it, so of those
    /// the caller checks that there is one.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::NoSuchPoint`], [`BookError::AlreadyLeftOut`]; those of every write.
    pub fn leave_out(
        &mut self,
        run: RunNumber,
        point: usize,
        why: &str,
        by: Option<&str>,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let there = assemble(&writing.transaction, run)?;
            let points = there.points();
            if point == 0 || points.is_some_and(|points| point > points) {
                return Err(BookError::NoSuchPoint { run, point, points: points.unwrap_or(0) }.into());
            }
            if there.is_out(point) {
                return Err(BookError::AlreadyLeftOut { run, point }.into());
            }
            let left_out = LeftOut { point, why: why.to_owned() };
            writing.append(Body::LeftOut { run, left_out, by: by.map(str::to_owned) })?;
            Ok(())
        })
    }

    /// Records a decision about a complete run. One decided before keeps its earlier decisions; the last holds.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; [`BookError::Incomplete`] for a run whose points are not all in; those of every write.
    pub fn decide(
        &mut self,
        run: RunNumber,
        decision: Decision,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            if assemble(&writing.transaction, run)?.state == RunState::Open {
                return Err(BookError::Incomplete { run }.into());
            }
            writing.append(Body::Decided { run, decision: Box::new(decision) })?;
            Ok(())
        })
    }

    /// The last decision about a run; none when it was never decided.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn decision(&self, run: RunNumber) -> Result<Option<Decision>, BookError> {
        self.read(|connection| {
            super::runs::exists(connection, run)?;
            let sql = "SELECT seq FROM decision WHERE run = ? ORDER BY seq DESC LIMIT 1";
            let mut statement = connection.prepare_cached(sql)?;
            let seq: Option<u64> = statement.query_row([run.get()], |row| row.get(0)).optional()?;
            seq.map(|seq| decision_at(connection, seq)).transpose()
        })
    }

    /// The run of an orifice that was decided upon and taken last before `run`, with its decision that holds; none
    /// when there is none.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn decided_before(
        &self,
        orifice: &Id,
        run: RunNumber,
    ) -> Result<Option<(RunNumber, Decision)>, BookError> {
        self.read(|connection| {
            super::runs::exists(connection, run)?;
            // Of two runs taken in the same second the one recorded first is the one before.
            let sql = "SELECT number, (SELECT max(seq) FROM decision WHERE run = number) AS decided FROM run \
                       WHERE orifice_key = ?1 AND decided IS NOT NULL \
                       AND (taken_s, number) < (SELECT taken_s, number FROM run WHERE number = ?2) \
                       ORDER BY taken_s DESC, number DESC LIMIT 1";
            let mut statement = connection.prepare_cached(sql)?;
            let found: Option<(u32, u64)> = statement
                .query_row(params![key_of(orifice.as_str()), run.get()], |row| Ok((row.get(0)?, row.get(1)?)))
                .optional()?;
            let Some((number, seq)) = found else { return Ok(None) };
            let number =
                RunNumber::new(number).ok_or_else(|| Inside::Damaged("a run has number 0".into()))?;
            Ok(Some((number, decision_at(connection, seq)?)))
        })
    }
}

pub(super) fn decision_at(connection: &rusqlite::Connection, seq: u64) -> Result<Decision, Inside> {
    match record_at(connection, seq)?.map(|record| record.body) {
        Some(Body::Decided { decision, .. }) => Ok(*decision),
        _ => Err(Inside::Damaged(format!("record {seq} holds no decision"))),
    }
}
