//! One port kept open: what is heard on it goes out as it comes; a lost or silent one is opened anew.

use std::sync::mpsc::Sender;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use super::bus::Bus;
use super::counters::Counters;
use super::error::Lost;
use super::exchange::{self, LONGEST_WAIT_S};
use super::fault::Fault;
use super::line::{Line, Opener};
use super::reading::Reading;
use crate::clock::Ticks;

/// First wait in seconds before a lost port is tried again; each further one is twice as long.
const FIRST_WAIT_S: f64 = 0.1;
/// Longest wait in seconds between two tries.
const LONGEST_BACK_OFF_S: f64 = 5.0;
/// Faults of one instrument handed out in one second; at a wrong baud rate there would be thousands. All are counted.
const FAULTS_A_SECOND: u32 = 20;

/// Something heard of an instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct Heard {
    /// Which, counted from 0 in the list that was given.
    pub instrument: usize,
    /// When, in seconds of the clock that was handed in; of bytes, when they arrived.
    pub at_s: f64,
    /// What.
    pub what: What,
}

/// What was heard.
#[derive(Debug, Clone, PartialEq)]
pub enum What {
    /// A reading.
    Reading(Reading),
    /// Something that is no reading.
    Fault(Fault),
    /// Its port was opened; whether it answers, its first reading says.
    Connected,
    /// Its port was lost, or does not open; said once until it opens.
    Lost(Lost),
}

/// Counts of all instruments, shared between the threads and those who ask.
pub(super) type Shared = Arc<Mutex<Vec<Counters>>>;

/// A thread that died with the lock in its hand leaves counts that are still counts.
pub(super) fn counted(counters: &Shared) -> MutexGuard<'_, Vec<Counters>> {
    counters.lock().unwrap_or_else(PoisonError::into_inner)
}

/// Keeps one port.
pub struct Worker {
    bus: Bus,
    opener: Arc<dyn Opener>,
    ticks: Arc<dyn Ticks>,
    out: Sender<Heard>,
    counters: Shared,
    line: Option<Box<dyn Line>>,
    last_byte_s: f64,
    try_again_s: f64,
    back_off_s: f64,
    lost_said: bool,
    /// For each member the second in which faults are counted against the limit, and how many they are.
    faults: Vec<(f64, u32)>,
}

impl Worker {
    pub(super) fn new(
        bus: Bus,
        opener: Arc<dyn Opener>,
        ticks: Arc<dyn Ticks>,
        out: Sender<Heard>,
        counters: Shared,
    ) -> Self {
        let faults = vec![(f64::NEG_INFINITY, 0); bus.members.len()];
        Self {
            bus,
            opener,
            ticks,
            out,
            counters,
            line: None,
            last_byte_s: 0.0,
            try_again_s: f64::NEG_INFINITY,
            back_off_s: FIRST_WAIT_S,
            lost_said: false,
            faults,
        }
    }

    /// One turn: opens the port if it is time to, or listens for at most a tenth of a second.
    pub fn turn(&mut self) {
        let Some(line) = self.line.as_deref_mut() else { return self.open() };
        match exchange::turn(line, self.bus.conversation.as_mut(), self.ticks.as_ref(), LONGEST_WAIT_S) {
            Ok(turn) => {
                if !turn.bytes.is_empty() {
                    self.last_byte_s = turn.at_s;
                    // A port that speaks is a good one; one that merely opens may fail at once again.
                    self.back_off_s = FIRST_WAIT_S;
                }
                self.hand_out(turn.at_s, turn.bytes.len(), turn.found);
                if turn.at_s >= self.last_byte_s + self.bus.silent_s {
                    // Whole seconds of a handful; the cast saturates.
                    #[allow(
                        clippy::cast_possible_truncation,
                        clippy::cast_sign_loss,
                        reason = "a few seconds"
                    )]
                    let for_s = self.bus.silent_s.round() as u32;
                    self.lose(&Lost::Silent { for_s });
                }
            }
            Err(error) => {
                let closed = matches!(
                    error.kind(),
                    std::io::ErrorKind::UnexpectedEof | std::io::ErrorKind::BrokenPipe
                );
                self.lose(&if closed { Lost::Closed } else { Lost::Failed(error.to_string()) });
            }
        }
    }

    fn open(&mut self) {
        let now_s = self.ticks.now_s();
        if now_s < self.try_again_s {
            return self.ticks.sleep((self.try_again_s - now_s).min(LONGEST_WAIT_S));
        }
        match self.opener.open(&self.bus.socket, self.bus.settings) {
            Ok(line) => {
                let now_s = self.ticks.now_s();
                self.line = Some(line);
                self.last_byte_s = now_s;
                self.lost_said = false;
                self.bus.conversation.opened(now_s);
                for instrument in counted_members(&self.bus, &mut counted(&self.counters)) {
                    instrument.connected = true;
                }
                self.say(now_s, &What::Connected);
            }
            Err(error) => self.lose(&Lost::Open(error)),
        }
    }

    /// The port is gone: says so once, and plans the next try.
    fn lose(&mut self, why: &Lost) {
        let now_s = self.ticks.now_s();
        let was_open = self.line.take().is_some();
        self.try_again_s = now_s + self.back_off_s;
        self.back_off_s = (2.0 * self.back_off_s).min(LONGEST_BACK_OFF_S);
        for instrument in counted_members(&self.bus, &mut counted(&self.counters)) {
            instrument.connected = false;
            instrument.losses += u64::from(was_open);
        }
        if was_open || !self.lost_said {
            self.lost_said = true;
            self.say(now_s, &What::Lost(why.clone()));
        }
    }

    fn hand_out(&mut self, at_s: f64, bytes: usize, found: Vec<super::Found>) {
        let mut counters = counted(&self.counters);
        for instrument in counted_members(&self.bus, &mut counters) {
            instrument.bytes += bytes as u64;
        }
        for one in found {
            let Some(instrument) = self.bus.members.get(one.member).copied() else { continue };
            let Some(counts) = counters.get_mut(instrument) else { continue };
            let what = match one.what {
                Ok(reading) => {
                    counts.reading(at_s, reading);
                    What::Reading(reading)
                }
                Err(fault) => {
                    counts.fault(fault.kind);
                    let Some((since_s, said)) = self.faults.get_mut(one.member) else { continue };
                    if at_s >= *since_s + 1.0 {
                        (*since_s, *said) = (at_s, 0);
                    }
                    *said += 1;
                    if *said > FAULTS_A_SECOND {
                        continue;
                    }
                    What::Fault(fault)
                }
            };
            // Nobody listens any more only while everything is being stopped.
            let _ = self.out.send(Heard { instrument, at_s, what });
        }
    }

    /// Says something of every instrument on the port.
    fn say(&self, at_s: f64, what: &What) {
        for instrument in &self.bus.members {
            let _ = self.out.send(Heard { instrument: *instrument, at_s, what: what.clone() });
        }
    }
}

/// The counts of the instruments on a bus.
fn counted_members<'c>(bus: &Bus, counters: &'c mut [Counters]) -> impl Iterator<Item = &'c mut Counters> {
    counters.iter_mut().enumerate().filter(|(index, _)| bus.members.contains(index)).map(|(_, one)| one)
}
