//! The simulated bench listened to as real instruments are: ports, workers and a logger on one virtual clock.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(dead_code, reason = "each test binary uses a part")]

use std::io::{self, Read, Write};
use std::sync::{Arc, Mutex};
use std::time::Duration;

use chrono::{DateTime, FixedOffset};
use ebbline::clock::Ticks;
use ebbline::entry::{Id, Instrument, Measures, Socket};
use ebbline::instrument::{Heard, Line, LineSettings, OpenError, Opener, Streams, Worker, by_hand};
use ebbline::rig::{JumpingTime, Rig, Settings, SharedRig, Time, Transport, VirtualTime};

/// Longest wait of one port, seconds, so that the ports are served in turn on the one clock.
const TURN_S: f64 = 0.02;
/// Shortest, that of a real port: two ports that each wait for a rounding error would never move the clock.
const LEAST_S: f64 = 0.001;

pub(crate) fn id(name: &str) -> Id {
    Id::new(name).unwrap()
}

/// The clock of whoever listens.
pub(crate) struct Clock(pub(crate) Arc<dyn Time>);

impl Ticks for Clock {
    fn now_s(&self) -> f64 {
        self.0.now_s()
    }

    fn sleep(&self, s: f64) {
        self.0.sleep(s);
    }

    fn started(&self) -> DateTime<FixedOffset> {
        DateTime::parse_from_rfc3339("2026-11-12T12:00:00+11:00").unwrap()
    }
}

/// The ports of the rig.
struct Ports {
    rig: SharedRig,
    time: Arc<VirtualTime>,
    /// The first instrument on each port.
    first: Vec<(String, Id)>,
}

impl Opener for Ports {
    fn open(&self, socket: &Socket, _: LineSettings) -> Result<Box<dyn Line>, OpenError> {
        let Socket::Port(name) = socket else { panic!("the rig has ports") };
        let (_, first) = self.first.iter().find(|(port, _)| port == name).unwrap();
        let time: Arc<dyn Time> = Arc::<VirtualTime>::clone(&self.time);
        let transport = Transport::open(&self.rig, first, time, Duration::ZERO);
        let mut transport = transport.map_err(|_| OpenError::NotThere { port: name.clone() })?;
        transport.clear();
        Ok(Box::new(End(transport)))
    }
}

struct End(Transport);

impl Read for End {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        self.0.read(buffer)
    }
}

impl Write for End {
    fn write(&mut self, buffer: &[u8]) -> io::Result<usize> {
        self.0.write(buffer)
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Line for End {
    fn wait_at_most(&mut self, longest_s: f64) -> io::Result<()> {
        self.0.set_timeout(Duration::from_secs_f64(longest_s.clamp(LEAST_S, TURN_S)));
        Ok(())
    }
}

/// A rig and those who listen to it.
pub(crate) struct Heeded {
    pub(crate) rig: SharedRig,
    pub(crate) clock: Arc<JumpingTime<Arc<VirtualTime>>>,
    pub(crate) instruments: Vec<Instrument>,
    workers: Vec<Worker>,
    pub(crate) streams: Streams,
}

impl Heeded {
    /// The standard rig with nothing but these instruments, changed, and listened to.
    pub(crate) fn new(seed: u64, only: &[Measures], change: impl FnOnce(&mut Settings)) -> Self {
        let mut settings = Settings::standard(seed).unwrap();
        settings.gauges.retain(|gauge| only.contains(&gauge.source.measures()));
        let there: Vec<Id> = settings.gauges.iter().map(|gauge| gauge.id.clone()).collect();
        settings.ports.retain(|port| match &port.wiring {
            ebbline::rig::Wiring::Lines(lines) => {
                lines.fields.iter().all(|field| there.contains(&field.gauge))
            }
            ebbline::rig::Wiring::Bus { devices, .. } => {
                devices.iter().all(|device| device.values.iter().all(|value| there.contains(&value.gauge)))
            }
        });
        change(&mut settings);
        let time = Arc::new(VirtualTime::new());
        let mut rig = Rig::new(settings).unwrap();
        rig.advance(0.0);
        let instruments = rig.profiles();
        let clock = Arc::new(JumpingTime::new(Arc::clone(&time)));
        rig.may_set(Arc::<JumpingTime<Arc<VirtualTime>>>::clone(&clock));
        let rig: SharedRig = Arc::new(Mutex::new(rig));
        let mut first: Vec<(String, Id)> = Vec::new();
        for instrument in &instruments {
            let Some(Socket::Port(name)) = &instrument.socket else { panic!("the rig has ports") };
            if !first.iter().any(|(port, _)| port == name) {
                first.push((name.clone(), instrument.id.clone()));
            }
        }
        let ports: Arc<dyn Opener> = Arc::new(Ports { rig: Arc::clone(&rig), time, first });
        let for_clock: Arc<dyn Time> = Arc::<JumpingTime<Arc<VirtualTime>>>::clone(&clock);
        let ticks: Arc<dyn Ticks> = Arc::new(Clock(for_clock));
        let (workers, streams) = by_hand(&instruments, &ports, &ticks).unwrap();
        Self { rig, clock, instruments, workers, streams }
    }

    /// Listens for a few hundredths of a second.
    pub(crate) fn turn(&mut self) -> Vec<Heard> {
        for worker in &mut self.workers {
            worker.turn();
        }
        self.streams.waiting().collect()
    }

    pub(crate) fn now_s(&self) -> f64 {
        self.clock.now_s()
    }

    pub(crate) fn number(&self, name: &str) -> usize {
        self.instruments.iter().position(|one| one.id == id(name)).unwrap()
    }
}
