//! The chain under test: ports, workers, loggers, ledgers, the live state.

use std::fmt::Debug;
use std::io::{BufRead as _, BufReader, Write as _};
use std::process::{Child, ChildStdin, ChildStdout, Command, Stdio};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use ebbline::clock::{Monotonic, Ticks};
use ebbline::entry::{Instrument, Measures, Place};
use ebbline::instrument::{Heard, Opener, Streams, SystemPorts, What, listen};
use ebbline::logger::{
    BenchLogger, BenchOptions, CellScale, Ledger, Live, SessionLedger, SessionLive, SessionLogger,
    SessionOptions,
};

use super::ledgers::Tells;
use super::ports::{Device, Load, now};

/// How often what came is looked at, and the live state renewed.
const TURN_S: f64 = 0.02;
/// Longest arrival that is told apart, in ten thousandths of a second: ten seconds.
const LONGEST: usize = 100_000;

/// What was measured.
pub(crate) struct Figures {
    pub(crate) sent: u64,
    pub(crate) heard: u64,
    pub(crate) kept: u64,
    pub(crate) faults: u64,
    pub(crate) points: u64,
    pub(crate) rows: u64,
    pub(crate) lasted_s: f64,
    pub(crate) cpu_s: f64,
    pub(crate) writer_cpu_s: f64,
    /// After a quarter and at the end.
    pub(crate) memory_mb: [f64; 2],
    /// Median, 99th percentile, longest.
    pub(crate) arrival_ms: [f64; 3],
    pub(crate) longest_turn_ms: f64,
    pub(crate) held_back: u64,
    /// How long the machine kept the writer from its rounds of a millisecond.
    pub(crate) longest_round_ms: f64,
}

/// What a screen would look at.
#[derive(Default)]
struct State {
    bench: Option<Live>,
    session: Option<SessionLive>,
}

/// The loggers of those instruments that each has a use for.
struct Loggers {
    bench: BenchLogger,
    session: Option<SessionLogger>,
    /// Instruments before this number are the bench's.
    first_of_session: usize,
}

impl Loggers {
    fn new(instruments: &[Instrument]) -> Self {
        let of_session = |one: &Instrument| matches!(one.measures, Measures::Cell | Measures::Depth);
        let first = instruments.iter().position(of_session).unwrap_or(instruments.len());
        let (bench, session) = instruments.split_at(first);
        Self {
            bench: BenchLogger::new(bench, BenchOptions::default()).unwrap(),
            session: (!session.is_empty()).then(|| {
                SessionLogger::new(session, &[CellScale::Bar; 3], SessionOptions::of(Place::Couch)).unwrap()
            }),
            first_of_session: first,
        }
    }

    fn hear(&mut self, heard: Heard) {
        match (&mut self.session, heard.instrument.checked_sub(self.first_of_session)) {
            (Some(session), Some(instrument)) => session.hear(&Heard { instrument, ..heard }),
            _ => drop(self.bench.hear(&heard)),
        }
    }
}

/// Listens for so long and says what came of it.
pub(crate) fn listen_for<B, S>(load: Load, seconds: f64, bench: &mut B, session: &mut S) -> Figures
where
    B: Ledger<Error: Debug> + Tells,
    S: SessionLedger<Error: Debug> + Tells,
{
    let devices = load.devices();
    let mut writer = Writer::start(load, devices.len());
    let instruments: Vec<Instrument> =
        devices.iter().zip(&writer.ports).map(|(device, port)| device.profile(port)).collect();
    let clock = Monotonic::start();
    let (opener, ticks): (Arc<dyn Opener>, Arc<dyn Ticks>) = (Arc::new(SystemPorts), Arc::new(clock));
    let streams = listen(&instruments, &opener, &ticks).unwrap();
    while streams.counters().iter().any(|one| !one.connected) {
        std::thread::sleep(Duration::from_millis(10));
    }
    // Longer than a port is listened to before anything is asked.
    std::thread::sleep(Duration::from_millis(200));

    let mut chain = Chain {
        loggers: Loggers::new(&instruments),
        state: Arc::new(Mutex::new(State::default())),
        arrivals: vec![0; LONGEST + 1],
        heard: 0,
        faults: 0,
        longest_turn_s: 0.0,
        batch: Vec::new(),
    };
    // Questions that nobody answered before the beginning are nobody's fault.
    let _ = streams.waiting().count();
    writer.go();
    let (began_s, began_cpu_s) = (clock.now_s(), cpu_s());
    let mut first_mb = memory_mb();
    let mut next_s = began_s;
    while clock.now_s() < began_s + seconds {
        next_s += TURN_S;
        clock.sleep(next_s - clock.now_s());
        chain.turn(&streams, &devices, &clock, bench, session);
        if clock.now_s() < began_s + seconds / 4.0 {
            first_mb = memory_mb();
        }
    }
    let (lasted_s, spent_s, last_mb) = (clock.now_s() - began_s, cpu_s() - began_cpu_s, memory_mb());
    let (sent, held_back, writer_cpu_s, longest_round_ms) = writer.stop();
    // What is on its way arrives; a question that is not answered any more is no fault.
    let faults = chain.faults;
    for _ in 0..15 {
        clock.sleep(TURN_S);
        chain.turn(&streams, &devices, &clock, bench, session);
    }
    drop(streams);
    chain.loggers.bench.hand_over_all(clock.now_s(), bench).unwrap();
    if let Some(logger) = &mut chain.loggers.session {
        logger.hand_over_all(clock.now_s(), session).unwrap();
    }
    // The session keeps rows; what its instruments said was counted as it was heard.
    let of_session = chain.heard - chain.of_bench(&devices);
    Figures {
        sent,
        heard: chain.heard,
        kept: bench.told().readings + of_session,
        faults,
        points: bench.told().points,
        rows: session.told().rows,
        lasted_s,
        cpu_s: spent_s,
        writer_cpu_s,
        memory_mb: [first_mb, last_mb],
        arrival_ms: [0.5, 0.99, 1.0].map(|share| chain.arrival_ms(share)),
        longest_turn_ms: chain.longest_turn_s * 1e3,
        held_back,
        longest_round_ms,
    }
}

struct Chain {
    loggers: Loggers,
    state: Arc<Mutex<State>>,
    /// How many arrived after so many ten thousandths of a second.
    arrivals: Vec<u64>,
    heard: u64,
    faults: u64,
    longest_turn_s: f64,
    batch: Vec<(usize, f64)>,
}

impl Chain {
    fn turn<B, S>(
        &mut self,
        streams: &Streams,
        devices: &[Device],
        clock: &Monotonic,
        bench: &mut B,
        session: &mut S,
    ) where
        B: Ledger<Error: Debug>,
        S: SessionLedger<Error: Debug>,
    {
        let began_s = clock.now_s();
        for heard in streams.waiting() {
            match &heard.what {
                What::Reading(reading) => self.batch.push((heard.instrument, reading.shown)),
                What::Fault(_) | What::Lost(_) => self.faults += 1,
                What::Connected => {}
            }
            self.loggers.hear(heard);
        }
        let now_s = clock.now_s();
        self.loggers.bench.tick(now_s);
        self.loggers.bench.hand_over(now_s, bench).unwrap();
        let mut state = State { bench: Some(self.loggers.bench.live(now_s)), session: None };
        if let Some(logger) = &mut self.loggers.session {
            logger.tick(now_s);
            logger.hand_over(now_s, session).unwrap();
            state.session = Some(logger.live(now_s));
        }
        *self.state.lock().unwrap() = state;
        let at = now();
        self.heard += self.batch.len() as u64;
        for (instrument, shown) in self.batch.drain(..) {
            let age = usize::try_from(devices[instrument].age(shown, at)).unwrap();
            self.arrivals[age.min(LONGEST)] += 1;
        }
        self.longest_turn_s = self.longest_turn_s.max(clock.now_s() - began_s);
    }

    /// Readings in the live state of the bench.
    fn of_bench(&self, devices: &[Device]) -> u64 {
        let state = self.state.lock().unwrap();
        let channels = &state.bench.as_ref().unwrap().channels;
        assert!(
            channels.len() <= devices.len() && state.session.is_some() == (channels.len() < devices.len())
        );
        channels.iter().map(|channel| channel.readings).sum()
    }

    /// Within how many milliseconds this share arrived.
    fn arrival_ms(&self, share: f64) -> f64 {
        let wanted = share * self.heard as f64;
        let mut sum = 0;
        let reached = self.arrivals.iter().position(|count| {
            sum += count;
            sum as f64 >= wanted
        });
        reached.unwrap_or(LONGEST) as f64 / 10.0
    }
}

/// The writing process.
struct Writer {
    child: Child,
    stdin: ChildStdin,
    stdout: BufReader<ChildStdout>,
    ports: Vec<String>,
}

impl Writer {
    fn start(load: Load, ports: usize) -> Self {
        let mut child = Command::new(std::env::current_exe().unwrap())
            .args(["--writer", load.name()])
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .spawn()
            .unwrap();
        let (stdin, stdout) = (child.stdin.take().unwrap(), BufReader::new(child.stdout.take().unwrap()));
        let mut writer = Self { child, stdin, stdout, ports: Vec::new() };
        for _ in 0..ports {
            let name = writer.line();
            writer.ports.push(name);
        }
        writer
    }

    fn line(&mut self) -> String {
        let mut line = String::new();
        self.stdout.read_line(&mut line).unwrap();
        line.trim_end().to_owned()
    }

    fn go(&mut self) {
        self.stdin.write_all(b"go\n").unwrap();
    }

    /// Goes out: what it sent, how many bytes waited for room, its own seconds of the processor, and the longest of its
    /// rounds of a millisecond, in milliseconds.
    fn stop(&mut self) -> (u64, u64, f64, f64) {
        self.stdin.write_all(b"stop\n").unwrap();
        let said = self.line();
        let mut words = said.split(' ');
        let mut number = || words.next().unwrap();
        (
            number().parse().unwrap(),
            number().parse().unwrap(),
            number().parse().unwrap(),
            number().parse().unwrap(),
        )
    }
}

impl Drop for Writer {
    fn drop(&mut self) {
        let _ = self.child.kill();
        let _ = self.child.wait();
    }
}

/// Seconds of the processor that this process has used, of which the kernel counts hundredths.
pub(crate) fn cpu_s() -> f64 {
    let text = std::fs::read_to_string("/proc/self/stat").unwrap();
    // The name of the program may hold anything, and ends with the last bracket.
    let behind = text.rsplit_once(')').unwrap().1;
    let ticks: u64 = behind.split_whitespace().skip(11).take(2).map(|n| n.parse::<u64>().unwrap()).sum();
    ticks as f64 / 100.0
}

/// Resident memory, MB.
fn memory_mb() -> f64 {
    let text = std::fs::read_to_string("/proc/self/status").unwrap();
    let line = text.lines().find(|line| line.starts_with("VmRSS:")).unwrap();
    line.split_whitespace().nth(1).unwrap().parse::<f64>().unwrap() / 1024.0
}
