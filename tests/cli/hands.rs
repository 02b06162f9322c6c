//! Somebody who types: a bench of its own for each test, a script for the dialogue, input for the program.

#![allow(dead_code, reason = "each test file uses its own part")]
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::cell::RefCell;
use std::collections::VecDeque;
use std::io::{BufRead, Read, Write};
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Output, Stdio};
use std::rc::Rc;

use ebbline::book::{Book, Entry, Options, RunRecord, SessionRecord, Stamp};
use ebbline::cli::enter::{Beginning, Manner, Question, SessionBeginning, Talk, converse, converse_session};
use ebbline::entry::{
    Acceptance, Id, Indication, Instrument, InstrumentPapers, Limits, Measures, Orifice, PointReading,
    Readings, Rule, Run, RunNumber, SessionNumber, Tolerance,
};
use ebbline::quantity::{GaugePressure, IndicatedFlow, StpdFlow};
use ebbline::record::{NoRegisters, Setup, read_setup};
use ebbline::report::Units;
use ebbline::work::enter::{Desk, Start};
use ebbline::work::enter_session::{SessionDesk, SessionStart};
use ebbline::work::shelf::Shelf;

use crate::bench_files::{RUN, folder, write};

/// A folder with a book that is not there yet.
pub(crate) struct Bench {
    pub(crate) folder: PathBuf,
}

/// What was said, and the run that was typed.
pub(crate) struct Talked {
    pub(crate) text: String,
    pub(crate) desk: Option<Desk>,
}

/// What was said, and the session that was typed.
pub(crate) struct SessionTalked {
    pub(crate) text: String,
    pub(crate) desk: Option<SessionDesk>,
}

impl SessionTalked {
    /// What was said, however its lines were broken.
    pub(crate) fn says(&self, words: &str) -> bool {
        self.text.split_whitespace().collect::<Vec<_>>().join(" ").contains(words)
    }

    /// The session.
    #[track_caller]
    pub(crate) fn desk(&self) -> &SessionDesk {
        self.desk.as_ref().unwrap_or_else(|| panic!("no session was typed:\n{}", self.text))
    }
}

impl Talked {
    /// What was said, however its lines were broken.
    pub(crate) fn says(&self, words: &str) -> bool {
        self.text.split_whitespace().collect::<Vec<_>>().join(" ").contains(words)
    }

    /// The run.
    #[track_caller]
    pub(crate) fn desk(&self) -> &Desk {
        self.desk.as_ref().unwrap_or_else(|| panic!("no run was typed:\n{}", self.text))
    }
}

impl Bench {
    pub(crate) fn new(name: &str) -> Self {
        Self { folder: folder(&format!("enter-{name}")) }
    }

    /// With a run file beside it, whose readings are none.
    pub(crate) fn with_run(self) -> Self {
        write(&self.folder, RUN, b"");
        self
    }

    /// With FM-01, PT-01 and the limits VALVE in the register.
    pub(crate) fn with_register(self) -> Self {
        let papers = self.setup();
        let instrument = |id: &str, measures, papers| Instrument {
            id: Id::new(id).unwrap(),
            measures,
            socket: None,
            baud: None,
            frame: None,
            unit: None,
            protocol: None,
            papers: Some(papers),
        };
        let meter = InstrumentPapers::Meter(papers.meter.unwrap());
        let transducer = InstrumentPapers::Transducer(papers.transducer.unwrap());
        let valve = Acceptance {
            id: Some(Id::new("VALVE").unwrap()),
            ip: GaugePressure::from_bar(10.0),
            flow: StpdFlow::from_l_min(0.40),
            gas: None,
            tolerance: Tolerance::Relative(0.05),
            rule: Rule::Guarded,
            limits: Limits::DEFAULT,
        };
        self.register(Entry::Instrument(instrument("FM-01", Measures::Flow, meter)));
        self.register(Entry::Instrument(instrument("PT-01", Measures::Pressure, transducer)));
        self.register(Entry::Acceptance(valve));
        self
    }

    /// An orifice with limits of its own.
    pub(crate) fn register_orifice(&self, id: &str, acceptance: &str) {
        let bare = Orifice::bare(Id::new(id).unwrap());
        self.register(Entry::Orifice(Orifice { acceptance: Some(Id::new(acceptance).unwrap()), ..bare }));
    }

    fn setup(&self) -> Setup {
        let file = self.folder.join("papers.toml");
        std::fs::write(&file, RUN).unwrap();
        read_setup(&file, None, &NoRegisters).unwrap().value
    }

    pub(crate) fn register(&self, entry: Entry) {
        stamped(|stamp| {
            let mut book = Book::open_or_begin(&self.book(), &Options::default(), stamp).unwrap();
            book.add(entry, stamp).unwrap();
        });
    }

    pub(crate) fn path(&self, name: &str) -> String {
        self.folder.join(name).display().to_string()
    }

    pub(crate) fn book(&self) -> PathBuf {
        self.folder.join("book.db")
    }

    pub(crate) fn shelf(&self) -> Shelf {
        Shelf::at(&self.book())
    }

    /// A run that can begin, with the bench of the run file.
    pub(crate) fn desk(&self, orifice: &str) -> Desk {
        let mut start = Start::new(self.shelf(), orifice, false).unwrap();
        start.take_from(&self.folder.join("run.toml")).unwrap();
        Desk::new(start.ready().unwrap())
    }

    /// A new run with somebody there; a run file beside the book gives the bench and the time is said.
    pub(crate) fn asked(&self, orifice: &str, typed: &[&str]) -> Talked {
        self.asked_in(orifice, typed, &Manner::default())
    }

    pub(crate) fn asked_in(&self, orifice: &str, typed: &[&str], manner: &Manner) -> Talked {
        let mut start = Start::new(self.shelf(), orifice, true).unwrap();
        let file = self.folder.join("run.toml");
        if file.exists() && orifice == "A" {
            start.take_from(&file).unwrap();
            start.answer(Question::Taken, "2026-11-12T09:40:00+11:00").unwrap();
        }
        Self::talk(Beginning::New(Box::new(start)), typed, manner)
    }

    /// A run that goes on, with somebody there.
    pub(crate) fn again(&self, run: &str, typed: &[&str]) -> Talked {
        let desk = Desk::resume(self.shelf(), run).unwrap();
        Self::talk(Beginning::Again(Box::new(desk)), typed, &Manner::default())
    }

    fn talk(beginning: Beginning, typed: &[&str], manner: &Manner) -> Talked {
        let (mut keys, screen) = Keys::typing(typed);
        let (mut out, mut aside) = (screen.clone(), screen.clone());
        let held = converse(beginning, &mut Talk::new(&mut keys, &mut out, &mut aside, true), manner);
        let text = String::from_utf8(screen.0.borrow().clone()).unwrap();
        let desk = held.unwrap_or_else(|broken| panic!("{broken:?}\n{text}"));
        Talked { text, desk }
    }

    /// A new session with somebody there.
    pub(crate) fn session_asked(&self, diver: &str, typed: &[&str]) -> SessionTalked {
        let start = SessionStart::new(self.shelf(), diver).unwrap();
        Self::session_talk(SessionBeginning::New(Box::new(start)), typed)
    }

    /// A session that goes on, with somebody there.
    pub(crate) fn session_again(&self, session: &str, typed: &[&str]) -> SessionTalked {
        let desk = SessionDesk::resume(self.shelf(), session).unwrap();
        Self::session_talk(SessionBeginning::Again(Box::new(desk)), typed)
    }

    fn session_talk(beginning: SessionBeginning, typed: &[&str]) -> SessionTalked {
        let (mut keys, screen) = Keys::typing(typed);
        let (mut out, mut aside) = (screen.clone(), screen.clone());
        let mut talk = Talk::new(&mut keys, &mut out, &mut aside, true);
        let held = converse_session(beginning, &mut talk, &Units::default());
        let text = String::from_utf8(screen.0.borrow().clone()).unwrap();
        let desk = held.unwrap_or_else(|broken| panic!("{broken:?}\n{text}"));
        SessionTalked { text, desk }
    }

    /// A session as the book holds it.
    #[track_caller]
    pub(crate) fn session(&self, number: u32) -> SessionRecord {
        open(&self.book()).session(SessionNumber::new(number).unwrap()).unwrap()
    }

    /// The program with `input` from a pipe.
    pub(crate) fn program(&self, arguments: &[&str], input: &str) -> Output {
        self.program_bytes(arguments, input.as_bytes())
    }

    pub(crate) fn program_bytes(&self, arguments: &[&str], input: &[u8]) -> Output {
        let mut child = self.child(arguments);
        let mut typing = child.stdin.take().unwrap();
        // It may have ended before it read everything.
        let _ = typing.write_all(input);
        drop(typing);
        child.wait_with_output().unwrap()
    }

    /// The program with nobody reading its stdout: what it said on stderr, and its exit status.
    pub(crate) fn program_unheard(&self, arguments: &[&str], input: &str) -> (String, i32) {
        let mut child = self.child(arguments);
        drop(child.stdout.take());
        let _ = child.stdin.take().unwrap().write_all(input.as_bytes());
        let output = child.wait_with_output().unwrap();
        (String::from_utf8(output.stderr).unwrap(), output.status.code().unwrap_or(-1))
    }

    /// The program, started, with all three streams piped.
    pub(crate) fn child(&self, arguments: &[&str]) -> Child {
        let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
        command.current_dir(&self.folder).args(["--book", "book.db"]).args(arguments);
        command.stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
        command.spawn().expect("the program starts")
    }

    /// A run as the book holds it.
    #[track_caller]
    pub(crate) fn run(&self, number: u32) -> RunRecord {
        open(&self.book()).run(RunNumber::new(number).unwrap()).unwrap()
    }

    /// How many points it has.
    #[track_caller]
    pub(crate) fn points(&self, number: u32) -> usize {
        points_of(&self.run(number).run).len()
    }

    /// The book is what was recorded.
    #[track_caller]
    pub(crate) fn holds(&self) {
        let check = open(&self.book()).check(&[]).unwrap();
        assert_eq!(check.wrong, None);
    }
}

/// What somebody sees: what is said and what is typed, in order.
#[derive(Clone, Default)]
struct Screen(Rc<RefCell<Vec<u8>>>);

impl Write for Screen {
    fn write(&mut self, bytes: &[u8]) -> std::io::Result<usize> {
        self.0.borrow_mut().extend_from_slice(bytes);
        Ok(bytes.len())
    }

    fn flush(&mut self) -> std::io::Result<()> {
        Ok(())
    }
}

/// A keyboard that shows a line on the screen as it is typed.
struct Keys {
    lines: VecDeque<Vec<u8>>,
    current: Vec<u8>,
    read: usize,
    screen: Screen,
}

impl Keys {
    /// Types these lines onto a screen.
    fn typing(typed: &[&str]) -> (Self, Screen) {
        let screen = Screen::default();
        let lines = typed.iter().map(|line| format!("{line}\n").into_bytes()).collect();
        (Self { lines, current: Vec::new(), read: 0, screen: screen.clone() }, screen)
    }
}

impl Read for Keys {
    fn read(&mut self, into: &mut [u8]) -> std::io::Result<usize> {
        let there = self.fill_buf()?;
        let count = there.len().min(into.len());
        into[..count].copy_from_slice(&there[..count]);
        self.consume(count);
        Ok(count)
    }
}

impl BufRead for Keys {
    fn fill_buf(&mut self) -> std::io::Result<&[u8]> {
        if self.read == self.current.len() {
            self.current = self.lines.pop_front().unwrap_or_default();
            self.read = 0;
            self.screen.write_all(&self.current)?;
        }
        Ok(&self.current[self.read..])
    }

    fn consume(&mut self, count: usize) {
        self.read += count;
    }
}

/// The points of a run.
pub(crate) fn points_of(run: &Run) -> &[PointReading] {
    match &run.readings {
        Readings::Points(points) => points,
        Readings::Series(_) => panic!("a typed run has points"),
    }
}

fn open(path: &Path) -> Book {
    Book::open_to_read(path, &Options::default()).unwrap()
}

/// A point of a gauge in bar and a meter in L/min.
pub(crate) fn plain(bar: f64, l_min: f64) -> PointReading {
    PointReading {
        pressure: Indication::Gauge(GaugePressure::from_bar(bar)),
        flow: IndicatedFlow::from_l_min(l_min),
        timed: None,
        pressure_scatter: None,
        flow_scatter: None,
        averaged: 1.0,
        temperature: None,
        barometer: None,
        meter_temperature: None,
        meter_pressure: None,
        sweep: None,
        time_s: None,
    }
}

/// A stamp with the time of a test and salts that are a count.
fn stamped<T>(what: impl FnOnce(&mut Stamp<'_>) -> T) -> T {
    use std::sync::atomic::{AtomicU64, Ordering};
    static DRAWN: AtomicU64 = AtomicU64::new(1);
    let mut salt = || {
        let mut salt = [0x5A; 16];
        salt[..8].copy_from_slice(&DRAWN.fetch_add(1, Ordering::Relaxed).to_le_bytes());
        salt
    };
    let at = chrono::DateTime::parse_from_rfc3339("2026-11-12T08:00:00+11:00").unwrap();
    what(&mut Stamp { at, salt: &mut salt })
}
