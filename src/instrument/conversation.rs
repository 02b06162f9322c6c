//! What both protocols have in common: a conversation is fed with bytes and times, and says what to send.
//!
//! No conversation owns a port or asks a clock, so a recorded file, a test and a real port run the same code.

use super::fault::Fault;
use super::reading::Reading;

/// Seconds a new connection is listened to before anything is asked: the rest of an answer to somebody else must not
/// be taken for ours (common practice, no source).
pub(super) const SETTLE_S: f64 = 0.1;
/// Seconds without a byte after which something begun is not going on: longer than what USB adapters gather bytes for
/// and than a busy machine sleeps (common practice, no source; the 3.5 characters of "MODBUS over Serial Line", V1.02,
/// 2.5.1.1, are shorter than both from 4800 bit/s on).
pub(super) const GAP_S: f64 = 0.1;
/// Seconds an answer may take to begin (common practice, no source).
pub(super) const ANSWER_S: f64 = 0.5;
/// Seconds for which a line that never falls silent is waited for before it is asked all the same.
pub(super) const LONGEST_SETTLE_S: f64 = 1.0;
/// Seconds between questions where the profile names none.
pub(super) const DEFAULT_EVERY_S: f64 = 0.5;
/// Age in seconds from which a reading is stale where the profile names none.
pub(super) const DEFAULT_STALE_S: f64 = 2.0;

/// Something found in the bytes.
#[derive(Debug, Clone, PartialEq)]
pub struct Found {
    /// Which instrument of those on the port, counted from 0.
    pub member: usize,
    /// Its reading, or the fault that stands for it.
    pub what: Result<Reading, Fault>,
}

/// A protocol spoken with the instruments on one port.
pub trait Conversation: Send {
    /// The port was opened: whatever was going on is forgotten.
    fn opened(&mut self, now_s: f64);

    /// Bytes arrived.
    fn heard(&mut self, now_s: f64, bytes: &[u8], found: &mut Vec<Found>);

    /// Time passed. What is returned is to be sent now.
    fn turn(&mut self, now_s: f64, found: &mut Vec<Found>) -> Option<Vec<u8>>;

    /// When [`Conversation::turn`] has something to do next, if no byte comes.
    fn wake_s(&self) -> f64;
}

/// When an instrument is asked.
#[derive(Debug, Clone)]
pub(super) struct Schedule {
    every_s: f64,
    due_s: f64,
    silences: u32,
}

impl Schedule {
    /// Silences in a row from which an instrument is asked more rarely, so that it does not slow the others down.
    const PATIENCE: u32 = 3;
    /// Seconds between questions to an instrument that does not answer.
    const RARELY_S: f64 = 2.0;

    pub(super) fn every(every_s: Option<f64>) -> Self {
        Self { every_s: every_s.unwrap_or(DEFAULT_EVERY_S), due_s: 0.0, silences: 0 }
    }

    pub(super) fn begin(&mut self, now_s: f64) {
        (self.due_s, self.silences) = (now_s, 0);
    }

    pub(super) const fn every_s(&self) -> f64 {
        self.every_s
    }

    pub(super) const fn due_s(&self) -> f64 {
        self.due_s
    }

    /// It is asked now; questions that could not be asked in time are left out.
    pub(super) fn asked(&mut self, now_s: f64) {
        self.due_s = (self.due_s + self.every_s).max(now_s);
    }

    pub(super) const fn answered(&mut self) {
        self.silences = 0;
    }

    pub(super) fn silent(&mut self, now_s: f64) {
        self.silences = self.silences.saturating_add(1);
        if self.silences >= Self::PATIENCE {
            self.due_s = self.due_s.max(now_s + Self::RARELY_S);
        }
    }

    /// Whose turn it is; of several due at once, the first.
    pub(super) fn next<'s>(all: impl Iterator<Item = &'s Self>) -> Option<(usize, f64)> {
        all.map(Self::due_s).enumerate().min_by(|a, b| a.1.total_cmp(&b.1))
    }
}

/// A pause in which bytes are heard and thrown away.
#[derive(Debug, Clone, Copy)]
pub(super) struct Pause {
    until_s: f64,
    at_most_s: f64,
    quiet_s: f64,
    last_byte_s: f64,
}

impl Pause {
    /// Until nothing was heard for so many seconds.
    pub(super) fn of(now_s: f64, quiet_s: f64) -> Self {
        let until_s = now_s + quiet_s;
        let at_most_s = until_s.max(now_s + LONGEST_SETTLE_S);
        Self { until_s, at_most_s, quiet_s, last_byte_s: f64::NEG_INFINITY }
    }

    pub(super) fn heard(&mut self, now_s: f64) {
        self.last_byte_s = now_s;
        self.until_s = (now_s + self.quiet_s).min(self.at_most_s).max(self.until_s);
    }

    pub(super) const fn until_s(&self) -> f64 {
        self.until_s
    }

    /// Whether it ended in silence, and not because it lasted long enough.
    pub(super) fn was_quiet(&self, now_s: f64) -> bool {
        now_s >= self.last_byte_s + self.quiet_s
    }
}

/// Seconds a number of bytes takes on the wire: start bit, eight bits, parity and stop, at most eleven bits a byte.
pub(super) fn wire_s(bytes: usize, baud: u32) -> f64 {
    11.0 * bytes as f64 / f64::from(baud.max(1))
}
