//! What a logger hands over, put into the book.
//!
//! The logger hands over one thing at a time and a heartbeat last; they are gathered and kept in one transaction at the
//! heartbeat. What the book refused stays gathered and goes first the next time, so that a disk that is full for a
//! minute costs nothing but that minute's safety, which [`Kept`] tells. A lease that was lost ends the logging.

use chrono::{DateTime, FixedOffset};

use super::words::{alarm_note, trouble_note};
use crate::book::{Book, BookError, Holder, Lease, Logged, RunBatch, SessionBatch};
use crate::entry::{
    CellSignal, Event, Id, Instrument, LivePoint, LiveReadings, Measures, RunNumber, SessionNumber,
    SessionReadings,
};
use crate::instrument::Reading;
use crate::logger::{AlarmChange, Block, Ledger, Row, SessionLedger, Taken, TroubleAt};
use crate::work::WorkError;
use crate::work::shelf::stamped;

/// What is in the book of what was handed over.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Kept {
    /// Things handed over that are not in the book yet.
    pub waiting: usize,
    /// Since when, in seconds of the clock; none while all is saved.
    pub since_s: Option<f64>,
    /// Why the book refused them last.
    pub why: Option<String>,
}

/// The ties of a run or session to the clock and the register.
#[derive(Debug, Clone)]
pub struct Tie {
    /// The second of the clock at the time of the run or session.
    pub began_s: f64,
    /// The instruments, as the logger counts them.
    pub instruments: Vec<Instrument>,
    /// Who logs.
    pub holder: Holder,
}

impl Tie {
    /// The name of an instrument.
    fn id(&self, instrument: usize) -> Option<Id> {
        self.instruments.get(instrument).map(|instrument| instrument.id.clone())
    }
}

/// The book as the ledger of a run.
#[derive(Debug)]
pub struct RunLedger {
    book: Book,
    run: RunNumber,
    tie: Tie,
    batch: RunBatch,
    kept: Kept,
}

impl RunLedger {
    /// The ledger of a run whose lease is held.
    #[must_use]
    pub fn new(book: Book, run: RunNumber, tie: Tie) -> Self {
        Self { book, run, tie, batch: RunBatch::default(), kept: Kept::default() }
    }

    /// What is saved.
    #[must_use]
    pub const fn kept(&self) -> &Kept {
        &self.kept
    }

    /// Lets the lease go.
    ///
    /// # Errors
    /// Those of the book.
    pub fn let_go(mut self) -> Result<(), WorkError> {
        Ok(self.book.let_go(Logged::Run(self.run), &self.tie.holder)?)
    }
}

impl Ledger for RunLedger {
    type Error = WorkError;

    fn readings(&mut self, block: &Block) -> Result<(), WorkError> {
        let Some(instrument) = self.tie.id(block.instrument) else { return Ok(()) };
        let mut open: Option<LiveReadings> = None;
        for stamped in &block.readings {
            let Reading { shown, unit, .. } = stamped.reading;
            let readings = match &mut open {
                Some(there) if there.unit == unit.symbol => there,
                _ => {
                    self.batch.readings.extend(open.take());
                    let unit = unit.symbol.to_owned();
                    let instrument = instrument.clone();
                    open.insert(LiveReadings { instrument, unit, at_s: Vec::new(), shown: Vec::new() })
                }
            };
            readings.at_s.push(stamped.at_s - self.tie.began_s);
            readings.shown.push(shown);
        }
        self.batch.readings.extend(open);
        Ok(())
    }

    fn point(&mut self, point: &Taken) -> Result<(), WorkError> {
        let began_s = self.tie.began_s;
        self.batch.points.push(LivePoint {
            reading: point.reading,
            span_s: (point.from_s - began_s, point.to_s - began_s),
            by_itself: point.by == crate::logger::By::Itself,
        });
        Ok(())
    }

    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), WorkError> {
        let id = self.tie.id(trouble.instrument);
        self.batch.notes.push(trouble_note(trouble, id, self.tie.began_s));
        Ok(())
    }

    fn heartbeat(&mut self, at_s: f64) -> Result<(), WorkError> {
        let Self { book, run, tie, batch, kept } = self;
        let done = stamped(|stamp| book.keep_of_run(*run, batch, &tie.holder, stamp))?;
        let things = batch.readings.iter().map(|block| block.shown.len()).sum::<usize>()
            + batch.points.len()
            + batch.notes.len();
        settle(done, kept, things, at_s)?;
        if kept.since_s.is_none() {
            *batch = RunBatch::default();
        }
        Ok(())
    }
}

/// The book as the ledger of a session.
#[derive(Debug)]
pub struct SessionBookLedger {
    book: Book,
    session: SessionNumber,
    tie: Tie,
    /// The columns, with the rows that are not in the book yet.
    batch: SessionBatch,
    kept: Kept,
}

impl SessionBookLedger {
    /// The ledger of a session whose lease is held; `columns` has its columns and no rows. Its cells are the instruments
    /// that are cells, in their order.
    #[must_use]
    pub fn new(book: Book, session: SessionNumber, tie: Tie, columns: SessionReadings) -> Self {
        let batch = SessionBatch { rows: columns, events: Vec::new(), notes: Vec::new() };
        Self { book, session, tie, batch, kept: Kept::default() }
    }

    /// What is saved.
    #[must_use]
    pub const fn kept(&self) -> &Kept {
        &self.kept
    }

    /// Lets the lease go.
    ///
    /// # Errors
    /// Those of the book.
    pub fn let_go(mut self) -> Result<(), WorkError> {
        Ok(self.book.let_go(Logged::Session(self.session), &self.tie.holder)?)
    }

    fn add(&mut self, row: &Row) {
        let Self { tie, batch, .. } = self;
        let value = |number: usize| row.values.get(number).copied().flatten();
        let of = |measures: Measures| {
            let place = tie.instruments.iter().position(|one| one.measures == measures);
            place.and_then(value).map_or(f64::NAN, |reading| reading.si)
        };
        batch.rows.time_s.push(row.time_s);
        let cells = tie.instruments.iter().enumerate().filter(|(_, one)| one.measures == Measures::Cell);
        for ((number, _), cell) in cells.zip(&mut batch.rows.cells) {
            let reading = value(number);
            match &mut cell.signal {
                // A cell that shows its PO2 does so as a pressure, and one that is bare as a voltage.
                CellSignal::Bar(bar) => bar.push(reading.map_or(f64::NAN, |reading| reading.si / 1e5)),
                CellSignal::Volts { readings, .. } => {
                    readings.push(reading.map_or(f64::NAN, |reading| reading.si));
                }
            }
        }
        if let Some(depth_m) = &mut batch.rows.depth_m {
            depth_m.push(of(Measures::Depth));
        }
        if let Some(loop_temperature_k) = &mut batch.rows.loop_temperature_k {
            loop_temperature_k.push(of(Measures::Temperature));
        }
    }
}

impl SessionLedger for SessionBookLedger {
    type Error = WorkError;

    fn rows(&mut self, rows: &[Row]) -> Result<(), WorkError> {
        rows.iter().for_each(|row| self.add(row));
        Ok(())
    }

    fn event(&mut self, event: &Event) -> Result<(), WorkError> {
        self.batch.events.push(*event);
        Ok(())
    }

    fn alarm(&mut self, change: &AlarmChange) -> Result<(), WorkError> {
        self.batch.notes.push(alarm_note(change, &self.tie.instruments, self.tie.began_s));
        Ok(())
    }

    fn fault(&mut self, trouble: &TroubleAt) -> Result<(), WorkError> {
        let id = self.tie.id(trouble.instrument);
        self.batch.notes.push(trouble_note(trouble, id, self.tie.began_s));
        Ok(())
    }

    fn heartbeat(&mut self, at_s: f64) -> Result<(), WorkError> {
        let Self { book, session, tie, batch, kept } = self;
        let done = stamped(|stamp| book.keep_of_session(*session, batch, &tie.holder, stamp))?;
        let things = batch.rows.time_s.len() + batch.events.len() + batch.notes.len();
        settle(done, kept, things, at_s)?;
        if kept.since_s.is_none() {
            clear(&mut batch.rows);
            batch.events.clear();
            batch.notes.clear();
        }
        Ok(())
    }
}

/// Keeps account of what the book said; what another holds, or what is complete, ends the logging.
fn settle(done: Result<(), BookError>, kept: &mut Kept, things: usize, at_s: f64) -> Result<(), WorkError> {
    match done {
        Ok(()) => *kept = Kept::default(),
        Err(error) if error.is_of_the_call() => return Err(error.into()),
        Err(error) => {
            kept.since_s.get_or_insert(at_s);
            kept.waiting = things;
            kept.why = Some(error.to_string());
        }
    }
    Ok(())
}

/// Takes the rows out of a table and leaves its columns.
pub(super) fn clear(readings: &mut SessionReadings) {
    readings.time_s.clear();
    for cell in &mut readings.cells {
        match &mut cell.signal {
            CellSignal::Bar(column) | CellSignal::Volts { readings: column, .. } => column.clear(),
        }
    }
    readings.depth_m.iter_mut().chain(&mut readings.loop_temperature_k).for_each(Vec::clear);
}

/// A holder that no other process is.
///
/// # Errors
/// When the system gives no random numbers.
pub(super) fn holder() -> Result<Holder, WorkError> {
    let mut id = [0_u8; 16];
    getrandom::fill(&mut id).map_err(|_| WorkError::NoRandomNumbers)?;
    Ok(Holder { id, host: host(), process: std::process::id(), displaces: None })
}

/// The name of this machine; empty where the system has none.
#[cfg(unix)]
fn host() -> String {
    rustix::system::uname().nodename().to_string_lossy().into_owned()
}

#[cfg(not(unix))]
fn host() -> String {
    std::env::var("COMPUTERNAME").unwrap_or_default()
}

/// How long a process of this machine that is still there may be silent before it is taken to be another one with the same
/// number, seconds: a machine that stands still for some seconds has not lost its run (common practice, no source).
const SILENT_S: u64 = 60;

/// Whether somebody logs under this lease, as far as can be known: of this machine, whether the process is there; of
/// another one, whether the lease has not lapsed.
pub(super) fn is_alive(lease: &Lease) -> bool {
    if lease.host.is_empty() || lease.host != host() {
        return lease.holds();
    }
    process_is_there(lease.process) && lease.age_ms.unsigned_abs() < SILENT_S * 1000
}

#[cfg(unix)]
fn process_is_there(process: u32) -> bool {
    let process = i32::try_from(process).ok().and_then(rustix::process::Pid::from_raw);
    // Only that there is none is an answer; that it may not be asked means that it is there.
    process.is_none_or(|process| rustix::process::test_kill_process(process) != Err(rustix::io::Errno::SRCH))
}

#[cfg(not(unix))]
const fn process_is_there(_: u32) -> bool {
    true
}

/// Seconds from the time of a run or session to a moment.
pub(super) fn seconds_after(taken: DateTime<FixedOffset>, now: DateTime<FixedOffset>) -> f64 {
    (now - taken).num_milliseconds() as f64 / 1e3
}
