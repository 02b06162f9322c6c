//! `bench log` and a logged run that is resumed: from the instruments into the book, before a face.
//!
//! Comes in: what was asked for, and where ports and time come from. The run begins in the book with the first reading of
//! its instruments, so that a wrong cable leaves nothing behind; from then on everything heard is handed to the ledger
//! twice a second and every point at once. Goes out: how it ended. A run that is left, by a key, a signal or the death of
//! the process, stays open and is resumed.

use std::sync::Arc;

use chrono::{DateTime, FixedOffset};

use super::face::{BenchFace, BenchWish};
use super::ledger::{Kept, RunLedger, Tie, holder, is_alive, seconds_after};
use super::view::{BenchState, bench_view};
use crate::book::{Book, Holder, Lease, Logged};
use crate::clock::{self, Monotonic, Ticks};
use crate::entry::{Instrument, InstrumentPapers, LoggingBegun, Measures, Run, RunNumber, Sweep};
use crate::instrument::{Heard, Opener, Streams, SystemPorts, What, listen};
use crate::logger::{BenchLogger, BenchOptions, Refusal};
use crate::quantity::{AbsolutePressure, PressureDifference, Span};
use crate::report::Units;
use crate::report::bench_live::BenchView;
use crate::report::enter_questions::Question;
use crate::report::live_parts::Hold;
use crate::work::WorkError;
use crate::work::enter::{Desk, Ready, Start};
use crate::work::instruments::said;
use crate::work::runs::number_of;
use crate::work::shelf::{Shelf, stamped};

use super::instruments::{Chosen, book_with_instruments, choose, condition_instrument};

/// How often what is due is looked for, seconds.
const TURN_S: f64 = 0.05;
/// Least time between the last reading before and the first after a run was taken up again, seconds.
const LEAST_GAP_S: f64 = 0.001;
/// How often the face is shown the run, seconds.
const SHOW_S: f64 = 0.25;

/// Where readings and time come from.
#[derive(Clone)]
pub struct Wires {
    /// Opens ports.
    pub opener: Arc<dyn Opener>,
    /// Tells the time.
    pub ticks: Arc<dyn Ticks>,
}

impl Wires {
    /// The ports and the clock of this machine.
    #[must_use]
    pub fn of_the_system() -> Self {
        Self { opener: Arc::new(SystemPorts), ticks: Arc::new(Monotonic::start()) }
    }
}

/// What is asked of `bench log`. Texts are as typed; none takes what the registers leave no doubt about.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct BenchLogRequest {
    /// The orifice.
    pub orifice: String,
    /// Gas.
    pub gas: Option<String>,
    /// Oxygen in the oxygen.
    pub oxygen: Option<String>,
    /// Name of the flow meter.
    pub meter: Option<String>,
    /// Name of the transducer.
    pub transducer: Option<String>,
    /// Name of a barometer, or a value.
    pub barometer: Option<String>,
    /// Name of a thermometer, or a value.
    pub temperature: Option<String>,
    /// Why the run is made.
    pub purpose: Option<String>,
    /// Who makes it.
    pub technician: Option<String>,
    /// Name of the limits.
    pub acceptance: Option<String>,
    /// How it is logged.
    pub how: HowLong,
}

/// How a run is logged.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct HowLong {
    /// Whether points are taken by themselves.
    pub by_itself: bool,
    /// After how long it ends.
    pub lasts: Option<Span>,
    /// After how many points of the run it ends.
    pub points: Option<usize>,
    /// Units shown.
    pub units: Units,
}

/// How logging a run ended.
#[derive(Debug)]
pub struct BenchEnded {
    /// The run as it stands; none when it never began.
    pub desk: Option<Desk>,
    /// Why it ended.
    pub why: Why,
}

/// Why the logging of a run ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Why {
    /// All points are in.
    Finished,
    /// It was left open.
    LeftOpen,
    /// Its time or its points were reached, but no line can be made of them yet; it stays open.
    NoLineYet,
}

/// Logs a new run.
///
/// # Errors
/// What is asked for cannot be; a profile that is refused; nothing heard within the time asked for; a book that cannot be
/// written at the beginning, or a lease that was lost.
pub fn log(
    shelf: &Shelf,
    request: &BenchLogRequest,
    wires: &Wires,
    face: &mut dyn BenchFace,
    stop: &dyn Fn() -> bool,
) -> Result<BenchEnded, WorkError> {
    let mut start = Start::new(shelf.clone(), &request.orifice, false)?;
    let answers = [
        (Question::Gas, &request.gas),
        (Question::Purpose, &request.purpose),
        (Question::Technician, &request.technician),
        (Question::Acceptance, &request.acceptance),
    ];
    for (question, text) in answers {
        if let Some(text) = text {
            start.answer(question, text)?;
        }
    }
    if let Some(oxygen) = &request.oxygen {
        start.take_purity(oxygen)?;
    }
    let book = book_with_instruments(shelf)?;
    let mut instruments = Vec::new();
    let roles = [
        (Question::Meter, Measures::Flow, &request.meter),
        (Question::Transducer, Measures::Pressure, &request.transducer),
    ];
    for (question, measures, named) in roles {
        let Chosen { instrument, by_itself } = choose(&book, measures, named.as_deref())?;
        start.answer(question, instrument.id.as_str())?;
        if by_itself {
            face.say(&format!("{} {}: the only one with a port", question.word(), instrument.id));
        }
        instruments.push(instrument);
    }
    let conditions = [
        (Question::Barometer, Measures::Barometer, &request.barometer),
        (Question::Temperature, Measures::Temperature, &request.temperature),
    ];
    for (question, measures, given) in conditions {
        match condition_instrument(&book, measures, given.as_deref())? {
            Some(instrument) => {
                start.is_read_along(question, expanded(&instrument));
                instruments.push(instrument);
            }
            None => start.answer(question, given.as_deref().unwrap_or_default())?,
        }
    }
    drop(book);
    let Ready { run, notes, .. } = start.ready()?;
    notes.iter().for_each(|note| face.say(note));
    let driver = Driver::new(shelf, instruments, wires, request.how, run, None)?;
    driver.run(None, face, stop)
}

/// The expanded uncertainty (k = 2) that the papers of a barometer give it; none where it has none.
fn expanded(instrument: &Instrument) -> Option<PressureDifference> {
    let Some(InstrumentPapers::Transducer(transducer)) = &instrument.papers else { return None };
    let papers = &transducer.papers;
    let zero_pa = papers.zero.map(PressureDifference::as_pa);
    let gain_pa = papers.gain.map(|gain| gain * AbsolutePressure::STANDARD_ATMOSPHERE.as_pa());
    if zero_pa.is_none() && gain_pa.is_none() {
        return None;
    }
    let both_pa = libm::hypot(zero_pa.unwrap_or(0.0), gain_pa.unwrap_or(0.0));
    Some(PressureDifference::from_pa(2.0 * both_pa / papers.coverage))
}

/// Goes on with a logged run.
///
/// # Errors
/// A run that is not there, is complete, was typed, or is logged by another process; as [`log`].
pub fn resume(
    shelf: &Shelf,
    run: &str,
    how: HowLong,
    wires: &Wires,
    face: &mut dyn BenchFace,
    stop: &dyn Fn() -> bool,
) -> Result<BenchEnded, WorkError> {
    let number = number_of(run)?;
    let book = shelf.to_change()?;
    let there = book.run(number)?;
    let begun = book.logging_begun(number)?.ok_or(crate::book::BookError::NotLogged { run: number })?;
    let mut instruments = Vec::new();
    for old in begun.instruments {
        // A profile that was mended since is the one that is plugged in now.
        let now = book.entry::<Instrument>(&old.id)?.map(|found| found.entry);
        instruments.push(now.unwrap_or(old));
    }
    let points = book.live_points(number)?;
    let last_s = book
        .live_readings(number)?
        .iter()
        .filter_map(|readings| readings.at_s.last().copied())
        .chain(points.iter().map(|point| point.span_s.1))
        .fold(0.0, f64::max);
    drop(book);
    let taken = there.run.taken;
    let before = match &there.run.readings {
        crate::entry::Readings::Points(points) => points.len(),
        crate::entry::Readings::Series(_) => 0,
    };
    let last = points.last().map(|point| (point.reading.pressure.shown_pa(), point.reading.sweep));
    let driver =
        Driver::new(shelf, instruments, wires, how, there.run, Some(Again { taken, last_s, before, last }))?;
    driver.run(Some(number), face, stop)
}

/// A run that is in the book.
struct InBook {
    desk: Desk,
    ledger: RunLedger,
}

/// A run or session that goes on.
pub(super) struct Again {
    /// Its time.
    pub(super) taken: DateTime<FixedOffset>,
    /// The last second it has.
    pub(super) last_s: f64,
    /// Points it has.
    pub(super) before: usize,
    /// Pressure and sweep of the last of them.
    pub(super) last: Option<(f64, Option<Sweep>)>,
}

impl Again {
    /// The second of the clock at its time. A system clock that was set back must not put new readings before old ones.
    pub(super) fn began_s(&self, ticks: &dyn Ticks, started_s: f64) -> f64 {
        started_s - seconds_after(self.taken, ticks.time_of_day(started_s)).max(self.last_s + LEAST_GAP_S)
    }
}

struct Driver<'a> {
    shelf: &'a Shelf,
    instruments: Vec<Instrument>,
    ticks: Arc<dyn Ticks>,
    streams: Streams,
    logger: BenchLogger,
    how: HowLong,
    holder: Holder,
    began_s: Option<f64>,
    started_s: f64,
    /// The run as asked for, or as it stood when it was resumed.
    asked: Box<Run>,
    /// The last fault or loss of each instrument, in words.
    troubles: Vec<Option<String>>,
}

impl<'a> Driver<'a> {
    fn new(
        shelf: &'a Shelf,
        instruments: Vec<Instrument>,
        wires: &Wires,
        how: HowLong,
        asked: Run,
        again: Option<Again>,
    ) -> Result<Self, WorkError> {
        let started_s = wires.ticks.now_s();
        let began_s = again.as_ref().map(|again| again.began_s(&*wires.ticks, started_s));
        let last = again.as_ref().and_then(|again| again.last);
        let options = BenchOptions {
            by_itself: how.by_itself,
            last,
            began_s,
            points_before: again.map_or(0, |again| again.before),
            ..BenchOptions::default()
        };
        let logger = BenchLogger::new(&instruments, options)?;
        let instruments_count = instruments.len();
        let streams = listen(&instruments, &wires.opener, &wires.ticks)?;
        Ok(Self {
            shelf,
            instruments,
            ticks: Arc::clone(&wires.ticks),
            streams,
            logger,
            how,
            holder: holder()?,
            began_s,
            started_s,
            troubles: vec![None; instruments_count],
            asked: Box::new(asked),
        })
    }

    fn run(
        mut self,
        again: Option<RunNumber>,
        face: &mut dyn BenchFace,
        stop: &dyn Fn() -> bool,
    ) -> Result<BenchEnded, WorkError> {
        let mut there = again.map(|number| self.go_on(number)).transpose()?;
        let mut shown_s = f64::NEG_INFINITY;
        let why = loop {
            let new_points = self.hear();
            let now_s = self.ticks.now_s();
            self.logger.tick(now_s);
            if there.is_none()
                && let Some(first_s) = self.began_s
            {
                there = Some(self.begin(first_s, face)?);
            }
            if let Some(InBook { desk, ledger }) = &mut there {
                self.logger.hand_over(now_s, ledger)?;
                if new_points {
                    // At once, whatever else is due: a point is acknowledged when it is in the book.
                    self.logger.hand_over_all(now_s, ledger)?;
                    desk.read_again()?;
                }
            }
            if now_s - shown_s >= SHOW_S || new_points {
                shown_s = now_s;
                face.show(&self.view(now_s, there.as_ref()));
            }
            if let Some(why) = self.wishes(there.as_mut(), face)? {
                break why;
            }
            if stop() {
                break Why::LeftOpen;
            }
            if let Some(why) = self.is_over(now_s, there.as_mut())? {
                break why;
            }
        };
        self.end(there, why, face)
    }

    /// Takes what was heard; whether a point was taken of it.
    fn hear(&mut self) -> bool {
        let mut new_points = false;
        if let Some(first) = self.streams.wait(TURN_S) {
            let rest: Vec<Heard> = self.streams.waiting().collect();
            for heard in std::iter::once(&first).chain(&rest) {
                new_points |= self.logger.hear(heard).is_some();
                self.note(heard);
            }
        }
        new_points
    }

    /// Notes when the first reading came, and what was wrong last.
    fn note(&mut self, heard: &Heard) {
        let says = match &heard.what {
            What::Reading(_) => {
                self.began_s.get_or_insert(heard.at_s);
                return;
            }
            What::Connected => return,
            What::Fault(fault) => said(fault.kind).says(),
            What::Lost(lost) => lost.to_string(),
        };
        if let Some(trouble) = self.troubles.get_mut(heard.instrument) {
            *trouble = Some(says);
        }
    }

    fn tie(&self, began_s: f64) -> Tie {
        Tie { began_s, instruments: self.instruments.clone(), holder: self.holder.clone() }
    }

    /// Begins the run in the book; its time is that of its first reading.
    fn begin(&mut self, first_s: f64, face: &mut dyn BenchFace) -> Result<InBook, WorkError> {
        let run = Run { taken: self.ticks.time_of_day(first_s), ..(*self.asked).clone() };
        let mut notes = Vec::new();
        let mut book = self.shelf.to_write(&mut notes)?;
        let begun = LoggingBegun { at_s: 0.0, instruments: self.instruments.clone() };
        let holder = self.holder.clone();
        let recorded = stamped(|stamp| book.begin_logged_run(&run, &begun, &holder, stamp))??;
        notes.iter().for_each(|note| face.say(note));
        if recorded.orifice_created {
            face.say(&format!("the orifice {} is new and was created with its name only", run.orifice));
        }
        self.in_book(book, recorded.number, first_s)
    }

    fn go_on(&mut self, number: RunNumber) -> Result<InBook, WorkError> {
        let mut book = self.shelf.to_change()?;
        self.holder.displaces = gone(book.lease(Logged::Run(number), clock::now())?);
        let began_s = self.began_s.unwrap_or(self.started_s);
        let begun = LoggingBegun { at_s: self.started_s - began_s, instruments: self.instruments.clone() };
        let holder = self.holder.clone();
        stamped(|stamp| book.resume_logged_run(number, &begun, &holder, stamp))??;
        self.in_book(book, number, began_s)
    }

    fn in_book(&self, book: Book, number: RunNumber, began_s: f64) -> Result<InBook, WorkError> {
        let desk = Desk::of_logged(self.shelf.clone(), number)?;
        Ok(InBook { desk, ledger: RunLedger::new(book, number, self.tie(began_s)) })
    }

    fn view(&self, now_s: f64, there: Option<&InBook>) -> BenchView {
        bench_view(&BenchState {
            now_s,
            instruments: &self.instruments,
            live: &self.logger.live(now_s),
            counters: &self.streams.counters(),
            troubles: &self.troubles,
            by_itself: self.logger.takes_by_itself(),
            asked: &self.asked,
            desk: there.map(|there| &there.desk),
            kept: there.map(|there| there.ledger.kept()),
            units: self.how.units,
            hold: Hold::Ours,
            wanted: self.how.points,
            elapsed_s: now_s - self.began_s.unwrap_or(self.started_s),
            left_s: self.how.lasts.map(|lasts| (lasts.as_s() - (now_s - self.started_s)).max(0.0)),
        })
    }

    /// Does what was wished; why it ended, if one wish says so.
    fn wishes(
        &mut self,
        there: Option<&mut InBook>,
        face: &mut dyn BenchFace,
    ) -> Result<Option<Why>, WorkError> {
        let mut there = there;
        for wish in face.wishes() {
            let now_s = self.ticks.now_s();
            match (wish, there.as_deref_mut()) {
                (BenchWish::LeaveOpen, _) => return Ok(Some(Why::LeftOpen)),
                (BenchWish::ByItself(by_itself), _) => {
                    self.logger.take_by_itself(by_itself);
                    face.say(if by_itself {
                        "steady points are taken by themselves"
                    } else {
                        "points are taken at your key only"
                    });
                }
                (_, None) => face.say("no instrument was heard yet: the run has not begun"),
                (BenchWish::Take, Some(InBook { desk, ledger })) => match self.logger.take_now(now_s) {
                    Ok(taken) => {
                        self.logger.hand_over_all(now_s, ledger)?;
                        desk.read_again()?;
                        if ledger.kept().since_s.is_none() {
                            face.say(&format!("point {} taken", taken.number));
                        }
                    }
                    Err(refusal) => face.say(&refused(&refusal)),
                },
                (BenchWish::LeaveOut { point, why }, Some(InBook { desk, .. })) => {
                    match desk.strike(point, &why) {
                        Ok(()) => face.say(&format!("point {point} is struck: {}", why.trim())),
                        Err(error) if error.status() == crate::work::ExitStatus::Wrong => {
                            face.say(&error.to_string());
                        }
                        Err(error) => return Err(error),
                    }
                }
                (BenchWish::Finish, Some(InBook { desk, .. })) => match desk.may_finish(false) {
                    Ok(()) => return Ok(Some(Why::Finished)),
                    Err(error) => face.say(&error.to_string()),
                },
            }
        }
        Ok(None)
    }

    /// Whether its time or its points are reached.
    fn is_over(&self, now_s: f64, there: Option<&mut InBook>) -> Result<Option<Why>, WorkError> {
        let lasts_s = self.how.lasts.map(Span::as_s);
        let timed = lasts_s.is_some_and(|lasts_s| now_s - self.started_s >= lasts_s);
        let Some(InBook { desk, .. }) = there else {
            // Without a word from any instrument there is no run to end.
            return match (timed, lasts_s) {
                (true, Some(for_s)) => Err(WorkError::NothingHeard { for_s }),
                _ => Ok(None),
            };
        };
        let all = self.how.points.is_some_and(|points| desk.points().len() >= points);
        if !timed && !all {
            return Ok(None);
        }
        Ok(Some(if desk.may_finish(false).is_ok() { Why::Finished } else { Why::NoLineYet }))
    }

    /// Stops listening, keeps what was still on its way, and ends or leaves the run.
    fn end(self, there: Option<InBook>, why: Why, face: &mut dyn BenchFace) -> Result<BenchEnded, WorkError> {
        let Self { ticks, streams, mut logger, .. } = self;
        let rest = streams.stop();
        let Some(InBook { mut desk, mut ledger }) = there else { return Ok(BenchEnded { desk: None, why }) };
        for heard in &rest {
            let _ = logger.hear(heard);
        }
        keep_the_rest(&*ticks, || {
            logger.hand_over_all(ticks.now_s(), &mut ledger)?;
            Ok(ledger.kept().clone())
        })?;
        ledger.let_go()?;
        desk.read_again()?;
        if why == Why::Finished {
            desk.finish(false)?;
            face.say("the run is complete");
        }
        Ok(BenchEnded { desk: Some(desk), why })
    }
}

/// How often the last readings are tried again where the book refuses them, and seconds between two tries: a disk that is
/// full for a moment may have room again.
const LAST_TRIES: u32 = 10;
const LAST_PAUSE_S: f64 = 0.5;

/// Hands over the last readings until they are in the book.
///
/// # Errors
/// [`WorkError::NotSaved`] when the book refuses them to the end.
pub(super) fn keep_the_rest(
    ticks: &dyn Ticks,
    mut hand_over: impl FnMut() -> Result<Kept, WorkError>,
) -> Result<(), WorkError> {
    let mut kept = hand_over()?;
    for _ in 0..LAST_TRIES {
        if kept.since_s.is_none() {
            return Ok(());
        }
        ticks.sleep(LAST_PAUSE_S);
        kept = hand_over()?;
    }
    match kept.why {
        None => Ok(()),
        Some(why) => Err(WorkError::NotSaved { things: kept.waiting, why }),
    }
}

fn refused(refusal: &Refusal) -> String {
    refusal.to_string()
}

/// Shows a run that another process logs, from the book, until it is let go or left.
///
/// # Errors
/// A run that is not there, a book that cannot be read.
pub fn watch(
    shelf: &Shelf,
    run: &str,
    how: HowLong,
    wires: &Wires,
    face: &mut dyn BenchFace,
    stop: &dyn Fn() -> bool,
) -> Result<BenchEnded, WorkError> {
    let number = number_of(run)?;
    let mut watched = super::watch::Watched::new(shelf, number)?;
    let began_s = wires.ticks.now_s();
    loop {
        let lease = watched.look()?;
        face.show(&watched.view(how.units, lease.as_ref()));
        let left = face.wishes().into_iter().any(|wish| match wish {
            BenchWish::LeaveOpen => true,
            _ => {
                face_says_watching(face);
                false
            }
        });
        let held = lease.as_ref().is_some_and(is_alive);
        let timed = how.lasts.is_some_and(|lasts| wires.ticks.now_s() - began_s >= lasts.as_s());
        let all = how.points.is_some_and(|points| watched.points() >= points);
        if left || stop() || timed || all || !held || !watched.is_open() {
            let why = if watched.is_open() { Why::LeftOpen } else { Why::Finished };
            return Ok(BenchEnded { desk: Some(watched.into_desk()), why });
        }
        wires.ticks.sleep(SHOW_S);
    }
}

fn face_says_watching(face: &mut dyn BenchFace) {
    face.say("another process holds the instruments and takes the points: here they are only shown");
}

/// Whether a run was logged, not typed.
///
/// # Errors
/// A run that is not there, a book that cannot be read.
pub fn run_was_logged(shelf: &Shelf, run: &str) -> Result<bool, WorkError> {
    let number = number_of(run)?;
    Ok(shelf.to_read()?.logging_begun(number)?.is_some())
}

/// The holder of a lease whose process is known to be gone.
pub(super) fn gone(lease: Option<Lease>) -> Option<[u8; 16]> {
    lease.filter(|lease| !is_alive(lease)).map(|lease| lease.id)
}

/// Whether another process logs a run now.
///
/// # Errors
/// A run that is not there, a book that cannot be read.
pub fn is_held(shelf: &Shelf, run: &str) -> Result<bool, WorkError> {
    let number = number_of(run)?;
    let lease = shelf.to_read()?.lease(Logged::Run(number), clock::now())?;
    Ok(lease.is_some_and(|lease| is_alive(&lease)))
}
