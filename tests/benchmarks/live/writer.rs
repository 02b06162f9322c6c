//! The other process: pseudo-terminals with devices behind them.
//!
//! It prints the names of its ports, begins at a line on its standard input, ends at the next one or at its end, and then
//! prints what it sent.

use std::fs::File;
use std::io::{self, BufRead as _, Read as _, Write as _};
use std::os::fd::OwnedFd;
use std::sync::Arc;
use std::sync::atomic::{AtomicU32, Ordering};
use std::time::{Duration, Instant};

use ebbline::instrument::modbus_frame::sealed;
use rustix::fs::{Mode, OFlags};
use rustix::pty::OpenptFlags;
use rustix::termios::OptionalActions;

use super::ports::{A_SECOND, ASK, BYTES_A_SECOND, Device, Load, Speaks};

/// How often the ports are looked at: an adapter hands over what came in a millisecond.
const EVERY: Duration = Duration::from_millis(1);

/// Writes until told to stop.
pub(crate) fn write(load: Load) {
    let mut ports: Vec<Port> = load.devices().into_iter().map(Port::new).collect();
    for port in &ports {
        println!("{}", port.name);
    }
    let told = Arc::new(AtomicU32::new(0));
    let teller = Arc::clone(&told);
    std::thread::spawn(move || {
        for _ in io::stdin().lock().lines() {
            teller.fetch_add(1, Ordering::SeqCst);
        }
        // The listener is gone.
        teller.fetch_add(2, Ordering::SeqCst);
    });
    while told.load(Ordering::SeqCst) == 0 {
        std::thread::sleep(EVERY);
    }
    let began = Instant::now();
    let mut longest = Duration::ZERO;
    while told.load(Ordering::SeqCst) < 2 {
        let round = Instant::now();
        for port in &mut ports {
            port.attend(began.elapsed().as_secs_f64());
        }
        std::thread::sleep(EVERY);
        longest = longest.max(round.elapsed());
    }
    // What is begun is ended, and nothing more asked for is answered.
    let ended = Instant::now();
    while ports.iter().any(|port| !port.pending.is_empty()) && ended.elapsed().as_secs() < 2 {
        ports.iter_mut().for_each(Port::push);
        std::thread::sleep(EVERY);
    }
    let sent: u64 = ports.iter().map(|port| port.messages).sum();
    let held_back = ports.iter().map(|port| port.held_back).max().unwrap_or(0);
    println!("{sent} {held_back} {} {}", super::chain::cpu_s(), longest.as_secs_f64() * 1e3);
}

struct Port {
    device: Device,
    name: String,
    master: File,
    /// Held open, so that the near end does not fail before the listener opens it.
    _far: OwnedFd,
    /// Bytes that are not written yet.
    pending: Vec<u8>,
    input: Vec<u8>,
    messages: u64,
    bytes: u64,
    /// Most bytes that ever waited for room.
    held_back: u64,
}

impl Port {
    fn new(device: Device) -> Self {
        let master = rustix::pty::openpt(OpenptFlags::RDWR | OpenptFlags::NOCTTY).unwrap();
        rustix::pty::grantpt(&master).unwrap();
        rustix::pty::unlockpt(&master).unwrap();
        let name = rustix::pty::ptsname(&master, Vec::new()).unwrap().into_string().unwrap();
        rustix::fs::fcntl_setfl(&master, OFlags::NONBLOCK).unwrap();
        let flags = OFlags::RDWR | OFlags::NOCTTY | OFlags::NONBLOCK;
        let far = rustix::fs::open(name.as_str(), flags, Mode::empty()).unwrap();
        let mut modes = rustix::termios::tcgetattr(&far).unwrap();
        modes.make_raw();
        rustix::termios::tcsetattr(&far, OptionalActions::Now, &modes).unwrap();
        // The listener joins a stream at the end of a line, as it must.
        let pending = match device.speaks {
            Speaks::ByItself | Speaks::WithoutPause => b"\r\n".to_vec(),
            Speaks::WhenAsked | Speaks::Modbus => Vec::new(),
        };
        Self {
            device,
            name,
            master: File::from(master),
            _far: far,
            pending,
            input: Vec::new(),
            messages: 0,
            bytes: 0,
            held_back: 0,
        }
    }

    fn attend(&mut self, elapsed_s: f64) {
        match self.device.speaks {
            Speaks::ByItself => {
                while (self.messages as f64) < elapsed_s * A_SECOND {
                    self.say(self.device.line().as_bytes());
                }
            }
            Speaks::WithoutPause => {
                while (self.bytes as f64) < elapsed_s * BYTES_A_SECOND {
                    self.say(self.device.line().as_bytes());
                }
            }
            Speaks::WhenAsked => {
                self.hear();
                while let Some(at) = find(&self.input, ASK.as_bytes()) {
                    self.input.drain(..at + ASK.len());
                    self.say(self.device.line().as_bytes());
                }
            }
            Speaks::Modbus => {
                self.hear();
                let question = sealed(vec![1, 4, 0, 0, 0, 2]);
                while let Some(at) = find(&self.input, &question) {
                    self.input.drain(..at + question.len());
                    let answer = [[1, 4, 4].as_slice(), &self.device.registers()].concat();
                    self.say(&sealed(answer));
                }
            }
        }
        self.push();
    }

    fn say(&mut self, message: &[u8]) {
        self.pending.extend_from_slice(message);
        self.messages += 1;
        self.bytes += message.len() as u64;
    }

    fn hear(&mut self) {
        let mut buffer = [0; 256];
        while let Ok(read) = self.master.read(&mut buffer) {
            self.input.extend_from_slice(&buffer[..read]);
        }
    }

    /// Writes what there is room for; a real port would lose the rest.
    fn push(&mut self) {
        while !self.pending.is_empty() {
            match self.master.write(&self.pending) {
                Ok(written) => drop(self.pending.drain(..written)),
                Err(_) => {
                    self.held_back = self.held_back.max(self.pending.len() as u64);
                    return;
                }
            }
        }
    }
}

fn find(heard: &[u8], wanted: &[u8]) -> Option<usize> {
    heard.windows(wanted.len()).position(|window| window == wanted)
}
