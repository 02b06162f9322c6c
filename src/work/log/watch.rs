//! A run that another process logs, shown from the book.
//!
//! The book has every reading at most half a second after it was heard, so that what is shown here is never more than a
//! second old. The sign is worked out again from those readings by the logger's own functions.

use super::ledger::seconds_after;
use super::view::{BenchState, bench_view};
use crate::book::{Lease, Logged, SeenTo};
use crate::clock;
use crate::entry::{Instrument, LoggingBegun, RunNumber};
use crate::instrument::{Counters, Heard, Reading, What};
use crate::logger::{BenchLogger, BenchOptions};
use crate::quantity::unit::{Kind, lookup};
use crate::report::Units;
use crate::report::bench_live::BenchView;
use crate::report::live_parts::Hold;
use crate::work::WorkError;
use crate::work::enter::Desk;
use crate::work::shelf::Shelf;

/// A run that is watched.
pub(super) struct Watched {
    desk: Desk,
    book: crate::book::Book,
    number: RunNumber,
    instruments: Vec<Instrument>,
    logger: BenchLogger,
    seen: SeenTo,
    points: usize,
}

impl Watched {
    pub(super) fn new(shelf: &Shelf, number: RunNumber) -> Result<Self, WorkError> {
        let desk = Desk::of_logged(shelf.clone(), number)?;
        let book = shelf.to_read()?;
        let begun = book.logging_begun(number)?;
        let LoggingBegun { instruments, .. } =
            begun.ok_or(crate::book::BookError::NotLogged { run: number })?;
        let options = BenchOptions { by_itself: false, began_s: Some(0.0), ..BenchOptions::default() };
        let mut logger = BenchLogger::new(&instruments, options)?;
        for point in desk.points() {
            logger.was_taken(point.pressure.shown_pa(), point.sweep);
        }
        let points = desk.points().len();
        Ok(Self { desk, book, number, instruments, logger, seen: SeenTo::default(), points })
    }

    /// Looks into the book; the lease as it stands.
    pub(super) fn look(&mut self) -> Result<Option<Lease>, WorkError> {
        let mut new = Vec::new();
        for readings in self.book.live_readings_after(self.number, &mut self.seen)? {
            let number = self.instruments.iter().position(|one| one.id == readings.instrument);
            let kinds = [Kind::Flow, Kind::Pressure, Kind::Temperature];
            let unit = kinds.into_iter().find_map(|kind| lookup(kind, &readings.unit).ok());
            let (Some(instrument), Some(unit)) = (number, unit) else { continue };
            for (&at_s, &shown) in readings.at_s.iter().zip(&readings.shown) {
                let reading = Reading { si: unit.to_si(shown), shown, unit };
                new.push(Heard { instrument, at_s, what: What::Reading(reading) });
            }
        }
        new.sort_by(|a, b| a.at_s.total_cmp(&b.at_s));
        for heard in &new {
            let _ = self.logger.hear(heard);
        }
        if self.book.live_points(self.number)?.len() != self.points || !self.desk.is_open() {
            self.desk.read_again()?;
            for point in self.desk.points().iter().skip(self.points) {
                self.logger.was_taken(point.pressure.shown_pa(), point.sweep);
            }
            self.points = self.desk.points().len();
        }
        let lease = self.book.lease(Logged::Run(self.number), clock::now())?;
        if lease.is_none() {
            self.desk.read_again()?;
        }
        Ok(lease)
    }

    pub(super) const fn points(&self) -> usize {
        self.points
    }

    pub(super) const fn is_open(&self) -> bool {
        self.desk.is_open()
    }

    pub(super) fn view(&self, units: Units, lease: Option<&Lease>) -> BenchView {
        let now_s = seconds_after(self.desk.run().taken, clock::now());
        let counters = vec![Counters::default(); self.instruments.len()];
        let by = lease.map_or_else(|| "nobody".to_owned(), |l| format!("process {}", l.process));
        bench_view(&BenchState {
            now_s,
            instruments: &self.instruments,
            live: &self.logger.live(now_s),
            counters: &counters,
            troubles: &[],
            by_itself: false,
            asked: self.desk.run(),
            desk: Some(&self.desk),
            kept: None,
            units,
            hold: Hold::Watched(by),
            wanted: None,
            elapsed_s: now_s,
            left_s: None,
        })
    }

    pub(super) fn into_desk(self) -> Desk {
        self.desk
    }
}
