//! `session log` and a logged session that is resumed: from cells into the book, before a face.
//!
//! As a bench run: the session begins in the book with the first reading of a cell, rows come once a second, and what is
//! wished becomes an event at once. Alarms are the logger's; they are shown, kept as notes, and are no life-support
//! alarm. Floors and ceilings act here and nowhere later.

use std::path::Path;
use std::sync::Arc;

use super::bench::{Again, Why, Wires};
use super::face::{SessionFace, SessionWish};
use super::instruments::{book_with_instruments, choose};
use super::ledger::{SessionBookLedger, Tie, holder, is_alive};
use super::session_view::{SessionState, session_view};
use crate::book::{Book, BookError, Holder, Logged};
use crate::clock::{self, Ticks};
use crate::entry::{
    CellReadings, CellSignal, Event, Injection, Instrument, LoggingBegun, LoopKept, Measures, Run, Session,
    SessionNumber, SessionReadings, What,
};
use crate::instrument::{Heard, Streams, What as Said, listen};
use crate::logger::{CellScale, SessionLogger, SessionOptions};
use crate::quantity::unit::{Kind, lookup};
use crate::quantity::{AbsolutePressure, Span};
use crate::record::read_cell_calibration;
use crate::report::Units;
use crate::report::live_parts::Hold;
use crate::work::WorkError;
use crate::work::enter_session::{Row, SessionDesk, SessionReady, SessionStart, Typed, read};
use crate::work::instruments::said;
use crate::work::sessions::number_of;
use crate::work::shelf::{Shelf, stamped};

/// How often what is due is looked for, seconds.
const TURN_S: f64 = 0.05;
/// How often the face is shown the session, seconds.
const SHOW_S: f64 = 0.25;

/// What is asked of `session log`, beside what a [`SessionStart`] knows.
#[derive(Debug)]
pub struct SessionLogRequest<'a> {
    /// The session as far as it is known.
    pub start: SessionStart,
    /// The session file with the calibration of cells that are read in mV, if one is named.
    pub from: Option<&'a Path>,
    /// Names of the cells, in their order; none takes those with a port.
    pub cells: Vec<String>,
    /// Name of a depth gauge.
    pub depth: Option<String>,
    /// Name of a thermometer in the loop.
    pub loop_temperature: Option<String>,
    /// What is injected at the beginning: "0.31 L/min", "9.4 bar" or "off".
    pub injection: Option<String>,
    /// How it is logged.
    pub how: SessionHow,
}

/// How a session is logged.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct SessionHow {
    /// After how long it ends.
    pub lasts: Option<Span>,
    /// Units shown.
    pub units: Units,
}

/// How logging a session ended.
#[derive(Debug)]
pub struct SessionEnded {
    /// The session as it stands; none when it never began.
    pub desk: Option<SessionDesk>,
    /// Why it ended.
    pub why: Why,
    /// Why its time is over and it stays open all the same.
    pub not_yet: Option<String>,
}

/// Logs a new session.
///
/// # Errors
/// What is asked for cannot be; a profile that is refused; nothing heard within the time asked for; a book that cannot be
/// written at the beginning, or a lease that was lost.
pub fn log_session(
    shelf: &Shelf,
    request: SessionLogRequest<'_>,
    wires: &Wires,
    face: &mut dyn SessionFace,
    stop: &dyn Fn() -> bool,
) -> Result<SessionEnded, WorkError> {
    let SessionLogRequest { start, from, cells, depth, loop_temperature, injection, how } = request;
    let SessionReady { mut session, line_run, notes, .. } = start.ready()?;
    let book = book_with_instruments(shelf)?;
    let mut instruments = chosen_cells(&book, &cells, face)?;
    if let Some(name) = &depth {
        instruments.push(choose(&book, Measures::Depth, Some(name))?.instrument);
    }
    if let Some(name) = &loop_temperature {
        instruments.push(choose(&book, Measures::Temperature, Some(name))?.instrument);
    }
    drop(book);
    let scales = scales(&instruments, from, &mut session)?;
    // What such a note says is not so here.
    let used = scales.iter().any(|scale| matches!(scale, CellScale::Volts { .. }));
    for note in notes.iter().filter(|note| !(used && note.contains("only a cell read in mV needs it"))) {
        face.say(note);
    }
    session.readings = columns(&instruments, &scales);
    if let Some(text) = &injection {
        session.events.push(injection_event(text, &session)?);
    }
    let plan = Plan { session, line_run, instruments, scales, how };
    Driver::new(shelf, plan, wires, None)?.run(None, face, stop)
}

/// Goes on with a logged session.
///
/// # Errors
/// A session that is not there, is complete, was not logged, or is logged by another process; as [`log_session`].
pub fn resume_session(
    shelf: &Shelf,
    session: &str,
    how: SessionHow,
    wires: &Wires,
    face: &mut dyn SessionFace,
    stop: &dyn Fn() -> bool,
) -> Result<SessionEnded, WorkError> {
    let number = number_of(session)?;
    let book = shelf.to_change()?;
    let there = book.session(number)?;
    let begun = book.session_logging_begun(number)?;
    let begun = begun.ok_or(BookError::SessionNotLogged { session: number })?;
    let mut instruments = Vec::new();
    for old in begun.instruments {
        let now = book.entry::<Instrument>(&old.id)?.map(|found| found.entry);
        instruments.push(now.unwrap_or(old));
    }
    drop(book);
    let at = there.session.cells.calibrated_at;
    let scale = |cell: &CellReadings| match (&cell.signal, at) {
        (CellSignal::Volts { in_air, in_oxygen, .. }, Some(at)) => {
            CellScale::Volts { in_air: *in_air, in_oxygen: *in_oxygen, at }
        }
        _ => CellScale::Bar,
    };
    let scales = there.session.readings.cells.iter().map(scale).collect();
    let last_s = there.session.readings.time_s.iter().copied().fold(0.0, f64::max);
    let again = Again { taken: there.session.taken, last_s, before: 0, last: None };
    let plan = Plan { session: there.session, line_run: there.line_run, instruments, scales, how };
    Driver::new(shelf, plan, wires, Some(again))?.run(Some(number), face, stop)
}

/// Whether another process logs a session now.
///
/// # Errors
/// A session that is not there, a book that cannot be read.
pub fn is_session_held(shelf: &Shelf, session: &str) -> Result<bool, WorkError> {
    let number = number_of(session)?;
    let lease = shelf.to_read()?.lease(Logged::Session(number), clock::now())?;
    Ok(lease.is_some_and(|lease| is_alive(&lease)))
}

/// Whether a session was logged, not typed.
///
/// # Errors
/// A session that is not there, a book that cannot be read.
pub fn was_logged(shelf: &Shelf, session: &str) -> Result<bool, WorkError> {
    let number = number_of(session)?;
    Ok(shelf.to_read()?.session_logging_begun(number)?.is_some())
}

/// The cells that are named, or all that have a port.
fn chosen_cells(
    book: &Book,
    named: &[String],
    face: &mut dyn SessionFace,
) -> Result<Vec<Instrument>, WorkError> {
    if named.is_empty() {
        let all = book.entries::<Instrument>(None, None)?.into_iter().map(|found| found.entry);
        let cells = all.filter(|one| one.measures == Measures::Cell && one.socket.is_some());
        let cells: Vec<Instrument> = cells.collect();
        let names: Vec<&str> = cells.iter().map(|cell| cell.id.as_str()).collect();
        if !names.is_empty() {
            face.say(&format!("cells {}: those with a port", names.join(", ")));
        }
        return Ok(cells);
    }
    let choose = |name: &String| Ok(choose(book, Measures::Cell, Some(name))?.instrument);
    named.iter().map(choose).collect()
}

/// How the readings of each cell become PO2; a calibration in mV comes from the session file.
fn scales(
    instruments: &[Instrument],
    from: Option<&Path>,
    session: &mut Session,
) -> Result<Vec<CellScale>, WorkError> {
    let cells: Vec<&Instrument> = instruments.iter().filter(|one| one.measures == Measures::Cell).collect();
    let in_volts = cells.iter().filter(|cell| shows_volts(cell)).count();
    if in_volts == 0 {
        return Ok(cells.iter().map(|_| CellScale::Bar).collect());
    }
    let calibration = from.map(|file| read_cell_calibration(file, in_volts)).transpose()?.flatten();
    let calibration = calibration.ok_or(WorkError::NoCellCalibration)?;
    session.cells.calibrated_at = Some(calibration.at);
    let mut points = calibration.points.into_iter();
    let scale = |cell: &&Instrument| match shows_volts(cell).then(|| points.next()).flatten() {
        Some((in_air, in_oxygen)) => CellScale::Volts { in_air, in_oxygen, at: calibration.at },
        None => CellScale::Bar,
    };
    Ok(cells.iter().map(scale).collect())
}

/// Whether a cell is bare and shows a voltage.
fn shows_volts(cell: &Instrument) -> bool {
    let symbol = cell.unit.as_deref();
    symbol.is_some_and(|symbol| lookup(Kind::Voltage, symbol).is_ok())
}

/// The columns of the session, without rows.
fn columns(instruments: &[Instrument], scales: &[CellScale]) -> SessionReadings {
    let cells = instruments.iter().filter(|one| one.measures == Measures::Cell);
    let cell = |(cell, scale): (&Instrument, &CellScale)| CellReadings {
        name: cell.id.to_string(),
        signal: scale.signal(&[]),
    };
    let has = |measures| instruments.iter().any(|one| one.measures == measures);
    SessionReadings {
        time_s: Vec::new(),
        cells: cells.zip(scales).map(cell).collect(),
        depth_m: has(Measures::Depth).then(Vec::new),
        loop_temperature_k: has(Measures::Temperature).then(Vec::new),
    }
}

/// The injection at the beginning, by the rules of a typed session.
fn injection_event(text: &str, session: &Session) -> Result<Event, WorkError> {
    match read(&format!("0:00 injection {text}"), session)? {
        Typed::Row(Row::Event(event)) => Ok(event),
        _ => Err(WorkError::NoInjection(text.to_owned())),
    }
}

/// What is logged.
struct Plan {
    session: Session,
    line_run: Option<Run>,
    instruments: Vec<Instrument>,
    scales: Vec<CellScale>,
    how: SessionHow,
}

/// A session that is in the book.
struct InBook {
    number: SessionNumber,
    ledger: SessionBookLedger,
}

struct Driver<'a> {
    shelf: &'a Shelf,
    plan: Plan,
    ticks: Arc<dyn Ticks>,
    streams: Streams,
    logger: SessionLogger,
    limits_bar: (f64, f64),
    holder: Holder,
    began_s: Option<f64>,
    started_s: f64,
    rows_before: usize,
    events: Vec<Event>,
    /// Median PO2 of the rows: seconds since the first one, and bar.
    curve: Vec<(f64, f64)>,
    troubles: Vec<Option<String>>,
}

impl<'a> Driver<'a> {
    fn new(shelf: &'a Shelf, plan: Plan, wires: &Wires, again: Option<Again>) -> Result<Self, WorkError> {
        let started_s = wires.ticks.now_s();
        let began_s = again.map(|again| again.began_s(&*wires.ticks, started_s));
        let session = &plan.session;
        let usual = SessionOptions::of(session.place);
        let options = SessionOptions {
            barometer: session.conditions.barometer.value.unwrap_or(AbsolutePressure::STANDARD_ATMOSPHERE),
            water: session.conditions.water,
            began_s,
            ..usual
        };
        let logger = SessionLogger::new(&plan.instruments, &plan.scales, options)?;
        let streams = listen(&plan.instruments, &wires.opener, &wires.ticks)?;
        Ok(Self {
            shelf,
            ticks: Arc::clone(&wires.ticks),
            streams,
            logger,
            limits_bar: options.limits.po2_bar,
            holder: holder()?,
            began_s,
            started_s,
            rows_before: session.readings.time_s.len(),
            events: session.events.clone(),
            curve: Vec::new(),
            troubles: vec![None; plan.instruments.len()],
            plan,
        })
    }

    fn run(
        mut self,
        again: Option<SessionNumber>,
        face: &mut dyn SessionFace,
        stop: &dyn Fn() -> bool,
    ) -> Result<SessionEnded, WorkError> {
        let mut there = again.map(|number| self.go_on(number)).transpose()?;
        let mut shown_s = f64::NEG_INFINITY;
        let (why, not_yet) = loop {
            self.hear();
            let now_s = self.ticks.now_s();
            self.logger.tick(now_s);
            if there.is_none()
                && let Some(first_s) = self.logger.began_s()
            {
                self.began_s = Some(first_s);
                there = Some(self.begin(first_s, face)?);
            }
            if let Some(InBook { ledger, .. }) = &mut there {
                self.logger.hand_over(now_s, ledger)?;
            }
            if now_s - shown_s >= SHOW_S {
                shown_s = now_s;
                self.draw_curve(now_s);
                face.show(&self.view(now_s, there.as_ref()));
            }
            if let Some(why) = self.wishes(there.as_mut(), face)? {
                break (why, None);
            }
            if stop() {
                break (Why::LeftOpen, None);
            }
            let lasts_s = self.plan.how.lasts.map(Span::as_s);
            if let Some(for_s) = lasts_s.filter(|lasts_s| now_s - self.started_s >= *lasts_s) {
                let Some(InBook { number, ledger }) = &mut there else {
                    return Err(WorkError::NothingHeard { for_s });
                };
                self.logger.hand_over_all(now_s, ledger)?;
                break match SessionDesk::of_logged(self.shelf.clone(), *number)?.may_finish() {
                    Ok(()) => (Why::Finished, None),
                    Err(error) => (Why::NoLineYet, Some(error.to_string())),
                };
            }
        };
        self.end(there, why, not_yet, face)
    }

    fn hear(&mut self) {
        if let Some(first) = self.streams.wait(TURN_S) {
            let rest: Vec<Heard> = self.streams.waiting().collect();
            for heard in std::iter::once(&first).chain(&rest) {
                self.logger.hear(heard);
                let says = match &heard.what {
                    Said::Reading(_) | Said::Connected => continue,
                    Said::Fault(fault) => said(fault.kind).says(),
                    Said::Lost(lost) => lost.to_string(),
                };
                if let Some(trouble) = self.troubles.get_mut(heard.instrument) {
                    *trouble = Some(says);
                }
            }
        }
    }

    fn draw_curve(&mut self, now_s: f64) {
        let live = self.logger.live(now_s);
        let last_s = self.curve.last().map_or(f64::NEG_INFINITY, |(at_s, _)| *at_s);
        if let (Some(at_s), Some(po2_bar)) = (live.time_s, live.median_po2_bar)
            && at_s - last_s >= 1.0
        {
            self.curve.push((at_s, po2_bar));
        }
    }

    fn tie(&self, began_s: f64) -> Tie {
        Tie { began_s, instruments: self.plan.instruments.clone(), holder: self.holder.clone() }
    }

    /// Begins the session in the book; its time is that of its first reading.
    fn begin(&mut self, first_s: f64, face: &mut dyn SessionFace) -> Result<InBook, WorkError> {
        let session = Session { taken: self.ticks.time_of_day(first_s), ..self.plan.session.clone() };
        let mut notes = Vec::new();
        let mut book = self.shelf.to_write(&mut notes)?;
        let begun = LoggingBegun { at_s: 0.0, instruments: self.plan.instruments.clone() };
        let (holder, line_run) = (self.holder.clone(), self.plan.line_run.as_ref());
        let recorded =
            stamped(|stamp| book.begin_logged_session(&session, line_run, &begun, &holder, stamp))??;
        notes.iter().for_each(|note| face.say(note));
        if recorded.diver_created {
            face.say(&format!("{} is new and was created with the code only", session.diver));
        }
        Ok(self.in_book(book, recorded.number, first_s))
    }

    fn go_on(&mut self, number: SessionNumber) -> Result<InBook, WorkError> {
        let mut book = self.shelf.to_change()?;
        self.holder.displaces = super::bench::gone(book.lease(Logged::Session(number), clock::now())?);
        let began_s = self.began_s.unwrap_or(self.started_s);
        let begun =
            LoggingBegun { at_s: self.started_s - began_s, instruments: self.plan.instruments.clone() };
        let holder = self.holder.clone();
        stamped(|stamp| book.resume_logged_session(number, &begun, &holder, stamp))??;
        Ok(self.in_book(book, number, began_s))
    }

    fn in_book(&self, book: Book, number: SessionNumber, began_s: f64) -> InBook {
        let columns = columns(&self.plan.instruments, &self.plan.scales);
        InBook { number, ledger: SessionBookLedger::new(book, number, self.tie(began_s), columns) }
    }

    fn view(&self, now_s: f64, there: Option<&InBook>) -> crate::report::session_live::SessionView {
        session_view(&SessionState {
            now_s,
            instruments: &self.plan.instruments,
            live: &self.logger.live(now_s),
            counters: &self.streams.counters(),
            troubles: &self.troubles,
            session: &self.plan.session,
            number: there.map(|there| there.number),
            limits_bar: self.limits_bar,
            events: &self.events,
            curve: &self.curve,
            rows_before: self.rows_before,
            kept: there.map(|there| there.ledger.kept()),
            units: self.plan.how.units,
            hold: Hold::Ours,
            left_s: self.plan.how.lasts.map(|lasts| (lasts.as_s() - (now_s - self.started_s)).max(0.0)),
        })
    }

    /// Does what was wished; why it ended, if one wish says so.
    fn wishes(
        &mut self,
        mut there: Option<&mut InBook>,
        face: &mut dyn SessionFace,
    ) -> Result<Option<Why>, WorkError> {
        for wish in face.wishes() {
            let now_s = self.ticks.now_s();
            match (wish, there.as_deref_mut()) {
                (SessionWish::LeaveOpen, _) => return Ok(Some(Why::LeftOpen)),
                (_, None) => face.say("no cell was heard yet: the session has not begun"),
                (SessionWish::Event(what), Some(InBook { ledger, .. })) => {
                    let no_line = self.plan.session.line.is_none() && self.plan.line_run.is_none();
                    if no_line && matches!(what, What::Injection(Injection::Ip(_))) {
                        face.say("an IP says nothing without the orifice's line: give the flow, or begin with --orifice");
                        continue;
                    }
                    match self.logger.mark(now_s, what) {
                        Ok(event) => {
                            self.logger.hand_over_all(now_s, ledger)?;
                            self.events.push(event);
                        }
                        Err(refused) => face.say(&refused.to_string()),
                    }
                }
                (SessionWish::Exclude { from_s, until_s }, Some(InBook { ledger, .. })) => {
                    match self.logger.mark_at(from_s, now_s, What::Exclude { until_s }) {
                        Ok(event) => {
                            self.logger.hand_over_all(now_s, ledger)?;
                            self.events.push(event);
                        }
                        Err(refused) => face.say(&refused.to_string()),
                    }
                }
                (SessionWish::Finish, Some(InBook { number, ledger })) => {
                    self.logger.hand_over_all(now_s, ledger)?;
                    match SessionDesk::of_logged(self.shelf.clone(), *number)?.may_finish() {
                        Ok(()) => return Ok(Some(Why::Finished)),
                        Err(error) => face.say(&error.to_string()),
                    }
                }
            }
        }
        Ok(None)
    }

    /// Stops listening, keeps what was still on its way, and ends or leaves the session.
    fn end(
        self,
        there: Option<InBook>,
        why: Why,
        not_yet: Option<String>,
        face: &mut dyn SessionFace,
    ) -> Result<SessionEnded, WorkError> {
        let Self { shelf, ticks, streams, mut logger, .. } = self;
        for heard in streams.stop() {
            logger.hear(&heard);
        }
        let Some(InBook { number, mut ledger }) = there else {
            return Ok(SessionEnded { desk: None, why, not_yet });
        };
        super::bench::keep_the_rest(&*ticks, || {
            logger.hand_over_all(ticks.now_s(), &mut ledger)?;
            Ok(ledger.kept().clone())
        })?;
        ledger.let_go()?;
        let mut desk = SessionDesk::of_logged(shelf.clone(), number)?;
        if why == Why::Finished {
            desk.finish()?;
            face.say("the session is complete");
        }
        Ok(SessionEnded { desk: Some(desk), why, not_yet })
    }
}

/// The way a loop is kept after what happened.
pub(super) fn kept_now(session: &Session, events: &[Event]) -> LoopKept {
    let changed = events.iter().rev().find_map(|event| match event.what {
        What::MakeUp { kept, .. } => kept,
        _ => None,
    });
    changed.unwrap_or(session.kept)
}
