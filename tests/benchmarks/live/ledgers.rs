//! A ledger that counts and keeps nothing, so that the memory seen is the chain's own.

use std::convert::Infallible;

use ebbline::entry::Event;
use ebbline::logger::{AlarmChange, Block, Ledger, Row, SessionLedger, Taken, TroubleAt};

/// What was handed over.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Counted {
    pub(crate) readings: u64,
    pub(crate) points: u64,
    pub(crate) rows: u64,
}

/// Who can say what was handed over to it.
pub(crate) trait Tells {
    fn told(&self) -> Counted;
}

impl Tells for Counted {
    fn told(&self) -> Counted {
        *self
    }
}

impl Ledger for Counted {
    type Error = Infallible;

    fn readings(&mut self, block: &Block) -> Result<(), Infallible> {
        self.readings += block.readings.len() as u64;
        Ok(())
    }

    fn point(&mut self, _: &Taken) -> Result<(), Infallible> {
        self.points += 1;
        Ok(())
    }

    fn fault(&mut self, _: &TroubleAt) -> Result<(), Infallible> {
        Ok(())
    }

    fn heartbeat(&mut self, _: f64) -> Result<(), Infallible> {
        Ok(())
    }
}

impl SessionLedger for Counted {
    type Error = Infallible;

    fn rows(&mut self, rows: &[Row]) -> Result<(), Infallible> {
        self.rows += rows.len() as u64;
        Ok(())
    }

    fn event(&mut self, _: &Event) -> Result<(), Infallible> {
        Ok(())
    }

    fn alarm(&mut self, _: &AlarmChange) -> Result<(), Infallible> {
        Ok(())
    }

    fn fault(&mut self, _: &TroubleAt) -> Result<(), Infallible> {
        Ok(())
    }

    fn heartbeat(&mut self, _: f64) -> Result<(), Infallible> {
        Ok(())
    }
}
