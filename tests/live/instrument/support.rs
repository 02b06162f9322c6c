//! Profiles, a clock that only moves when it is waited on, and ports whose other end is written here.

use std::collections::VecDeque;
use std::io::{self, Read, Write};
use std::sync::{Arc, Mutex};

use chrono::DateTime;
use ebbline::clock::{Ticks, Virtual};
use ebbline::entry::{
    Id, Instrument, InstrumentPapers, Measures, ModbusNumber, ModbusTable, Papers, Protocol, Socket,
    Transducer, WordOrder,
};
use ebbline::instrument::{Conversation, Found, Line, LineSettings, OpenError, Opener};
use ebbline::quantity::{GaugePressure, Span};

/// The pattern of the interface's example.
pub(crate) const NUMBER: &str = r"(?P<value>[-+]?\d+(\.\d+)?)";

/// An instrument that sends lines; it streams.
pub(crate) fn lines(id: &str, measures: Measures, pattern: &str, unit: Option<&str>) -> Instrument {
    let protocol = Protocol::Lines {
        ask: None,
        every: None,
        ends: "\r\n".to_owned(),
        pattern: pattern.to_owned(),
        stale_after: None,
    };
    instrument(id, measures, protocol, unit)
}

/// The same, asked five times a second.
pub(crate) fn asked(id: &str, measures: Measures, ask: &str, pattern: &str, unit: &str) -> Instrument {
    let protocol = Protocol::Lines {
        ask: Some(ask.to_owned()),
        every: Some(Span::from_s(0.2)),
        ends: "\r\n".to_owned(),
        pattern: pattern.to_owned(),
        stale_after: None,
    };
    instrument(id, measures, protocol, Some(unit))
}

/// A pressure transducer on Modbus, asked five times a second for one number.
pub(crate) fn modbus(id: &str, device: u8, register: u16, number: ModbusNumber) -> Instrument {
    let protocol = Protocol::ModbusRtu {
        device,
        table: ModbusTable::Input,
        register,
        number,
        word_order: WordOrder::Big,
        scale: if number == ModbusNumber::F32 { 1.0 } else { 0.001 },
        every: Some(Span::from_s(0.2)),
        stale_after: None,
    };
    Instrument { baud: Some(19_200), ..instrument(id, Measures::Pressure, protocol, Some("bar")) }
}

fn instrument(id: &str, measures: Measures, protocol: Protocol, unit: Option<&str>) -> Instrument {
    Instrument {
        id: Id::new(id).unwrap(),
        measures,
        socket: Some(Socket::Port("bench".to_owned())),
        baud: Some(9_600),
        frame: Some("8N1".to_owned()),
        unit: unit.map(str::to_owned),
        protocol: Some(protocol),
        papers: None,
    }
}

/// Papers of a transducer from 0 bar to 16 bar.
pub(crate) fn to_16_bar() -> InstrumentPapers {
    let papers = Papers {
        gain: None,
        zero: None,
        noise: None,
        resolution: None,
        coverage: 2.0,
        range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
        certificate: None,
        due: None,
    };
    InstrumentPapers::Transducer(Transducer { id: None, papers })
}

pub(crate) fn noon() -> Arc<Virtual> {
    Arc::new(Virtual::starting(DateTime::parse_from_rfc3339("2026-11-12T12:00:00+11:00").unwrap()))
}

/// A conversation talked through by hand.
pub(crate) struct Talk<'c> {
    pub(crate) with: &'c mut dyn Conversation,
    pub(crate) now_s: f64,
    pub(crate) found: Vec<Found>,
}

impl<'c> Talk<'c> {
    pub(crate) fn open(with: &'c mut dyn Conversation) -> Self {
        with.opened(0.0);
        Self { with, now_s: 0.0, found: Vec::new() }
    }

    pub(crate) fn hear(&mut self, bytes: &[u8]) {
        self.with.heard(self.now_s, bytes, &mut self.found);
    }

    /// Lets time pass, and returns what was sent meanwhile.
    pub(crate) fn pass(&mut self, s: f64) -> Vec<Vec<u8>> {
        let until_s = self.now_s + s;
        let mut sent = Vec::new();
        loop {
            sent.extend(self.with.turn(self.now_s, &mut self.found));
            let wake_s = self.with.wake_s();
            if wake_s > until_s {
                self.now_s = until_s;
                return sent;
            }
            self.now_s = self.now_s.max(wake_s);
        }
    }

    /// Lets time pass until something is sent; fails after ten seconds.
    pub(crate) fn until_sent(&mut self) -> Vec<u8> {
        for _ in 0..10_000 {
            if let Some(sent) = self.with.turn(self.now_s, &mut self.found) {
                return sent;
            }
            self.now_s += 0.001;
        }
        panic!("nothing was asked for ten seconds");
    }

    pub(crate) fn take(&mut self) -> Vec<Found> {
        std::mem::take(&mut self.found)
    }
}

type Answer = Box<dyn FnMut(&[u8]) -> Vec<u8> + Send>;

/// What is behind a port.
pub(crate) struct World {
    /// How the instrument behind it is set; at other settings only noise comes and nothing is understood.
    pub(crate) set: LineSettings,
    pub(crate) plugged: bool,
    /// Bytes and the seconds at which they come by themselves.
    pub(crate) coming: VecDeque<(f64, Vec<u8>)>,
    /// What it answers at once.
    pub(crate) answer: Answer,
    /// The seconds at which it was opened, or tried to be.
    pub(crate) tried_s: Vec<f64>,
    pub(crate) opened: usize,
}

/// A port that is made up, on a virtual clock.
#[derive(Clone)]
pub(crate) struct Port {
    pub(crate) ticks: Arc<Virtual>,
    pub(crate) world: Arc<Mutex<World>>,
}

impl Port {
    pub(crate) fn new(set: &str, baud: u32) -> Self {
        let world = World {
            set: LineSettings::parse(baud, set).unwrap(),
            plugged: true,
            coming: VecDeque::new(),
            answer: Box::new(|_| Vec::new()),
            tried_s: Vec::new(),
            opened: 0,
        };
        Self { ticks: noon(), world: Arc::new(Mutex::new(world)) }
    }

    /// Something that is said every so many seconds from second `from_s` on, `times` times.
    pub(crate) fn says(self, from_s: f64, every_s: f64, times: u32, line: impl Fn(u32) -> String) -> Self {
        {
            let mut world = self.world.lock().unwrap();
            let said = (0..times).map(|n| (from_s + every_s * f64::from(n), line(n).into_bytes()));
            world.coming.extend(said);
        }
        self
    }

    pub(crate) fn answers(self, answer: impl FnMut(&[u8]) -> Vec<u8> + Send + 'static) -> Self {
        self.world.lock().unwrap().answer = Box::new(answer);
        self
    }

    pub(crate) fn opener(&self) -> Arc<dyn Opener> {
        Arc::new(self.clone())
    }

    pub(crate) fn clock(&self) -> Arc<dyn Ticks> {
        self.ticks.clone()
    }
}

impl Opener for Port {
    fn open(&self, socket: &Socket, settings: LineSettings) -> Result<Box<dyn Line>, OpenError> {
        let now_s = self.ticks.now_s();
        let mut world = self.world.lock().unwrap();
        world.tried_s.push(now_s);
        if !world.plugged {
            return Err(OpenError::NotThere { port: format!("{socket:?}") });
        }
        world.opened += 1;
        world.coming.retain(|(at_s, _)| *at_s >= now_s);
        Ok(Box::new(End { port: self.clone(), settings, wait_s: 0.1 }))
    }
}

struct End {
    port: Port,
    settings: LineSettings,
    wait_s: f64,
}

impl Read for End {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let now_s = self.port.ticks.now_s();
        let mut world = self.port.world.lock().unwrap();
        if !world.plugged {
            return Err(io::ErrorKind::BrokenPipe.into());
        }
        match world.coming.front_mut() {
            Some((at_s, bytes)) if *at_s <= now_s + self.wait_s => {
                self.port.ticks.sleep(*at_s - now_s);
                let taken = bytes.len().min(buffer.len());
                let right = self.settings == world.set;
                let (_, mut bytes) = world.coming.pop_front().unwrap();
                let rest = bytes.split_off(taken);
                if !rest.is_empty() {
                    world.coming.push_front((self.port.ticks.now_s(), rest));
                }
                // What a wrong speed makes of bytes, as far as it matters: others, many above 127.
                let heard = |byte: u8| if right { byte } else { byte.rotate_left(3) ^ 0xa5 };
                for (to, from) in buffer.iter_mut().zip(bytes) {
                    *to = heard(from);
                }
                Ok(taken)
            }
            _ => {
                self.port.ticks.sleep(self.wait_s);
                Err(io::ErrorKind::TimedOut.into())
            }
        }
    }
}

impl Write for End {
    fn write(&mut self, buffer: &[u8]) -> io::Result<usize> {
        let now_s = self.port.ticks.now_s();
        let mut world = self.port.world.lock().unwrap();
        if self.settings == world.set {
            let answer = (world.answer)(buffer);
            if !answer.is_empty() {
                // Ten milliseconds to think.
                world.coming.push_front((now_s + 0.01, answer));
            }
        }
        Ok(buffer.len())
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Line for End {
    fn wait_at_most(&mut self, longest_s: f64) -> io::Result<()> {
        self.wait_s = longest_s;
        Ok(())
    }
}
