//! Ledgers that keep everything in memory: for tests, and for a look without a book.

use std::convert::Infallible;

use super::alarm::AlarmChange;
use super::ledger::{Block, Ledger, SessionLedger, Taken, TroubleAt};
use super::session::Row;
use crate::entry::Event;

/// A run in memory.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct InMemory {
    /// The blocks of readings.
    pub blocks: Vec<Block>,
    /// The points.
    pub points: Vec<Taken>,
    /// What went wrong.
    pub faults: Vec<TroubleAt>,
    /// The heartbeats, in seconds of the clock.
    pub heartbeats_s: Vec<f64>,
}

impl Ledger for InMemory {
    type Error = Infallible;

    fn readings(&mut self, block: &Block) -> Result<(), Infallible> {
        self.blocks.push(block.clone());
        Ok(())
    }

    fn point(&mut self, point: &Taken) -> Result<(), Infallible> {
        self.points.push(*point);
        Ok(())
    }

    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), Infallible> {
        self.faults.push(trouble.clone());
        Ok(())
    }

    fn heartbeat(&mut self, at_s: f64) -> Result<(), Infallible> {
        self.heartbeats_s.push(at_s);
        Ok(())
    }
}

/// A session in memory.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct SessionInMemory {
    /// The rows.
    pub rows: Vec<Row>,
    /// The events.
    pub events: Vec<Event>,
    /// Alarms raised and cleared.
    pub alarms: Vec<AlarmChange>,
    /// What went wrong.
    pub faults: Vec<TroubleAt>,
    /// The heartbeats, in seconds of the clock.
    pub heartbeats_s: Vec<f64>,
}

impl SessionLedger for SessionInMemory {
    type Error = Infallible;

    fn rows(&mut self, rows: &[Row]) -> Result<(), Infallible> {
        self.rows.extend_from_slice(rows);
        Ok(())
    }

    fn event(&mut self, event: &Event) -> Result<(), Infallible> {
        self.events.push(*event);
        Ok(())
    }

    fn alarm(&mut self, change: &AlarmChange) -> Result<(), Infallible> {
        self.alarms.push(*change);
        Ok(())
    }

    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), Infallible> {
        self.faults.push(trouble.clone());
        Ok(())
    }

    fn heartbeat(&mut self, at_s: f64) -> Result<(), Infallible> {
        self.heartbeats_s.push(at_s);
        Ok(())
    }
}
