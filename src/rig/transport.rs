//! A line to the rig within one process: what a test reads and writes in place of a serial port.

use std::collections::VecDeque;
use std::io::{self, Read, Write};
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::time::Duration;

use super::RigError;
use super::assembled::{Rig, TICK_S};
use super::log::Delivery;
use super::time::Time;
use crate::entry::Id;

/// A rig that several hold.
pub type SharedRig = Arc<Mutex<Rig>>;

/// The rig, whoever panicked while holding it.
pub(super) fn lock(rig: &Mutex<Rig>) -> MutexGuard<'_, Rig> {
    rig.lock().unwrap_or_else(PoisonError::into_inner)
}

/// One end of a line. Reading waits at most its time-out by the rig's clock, then fails with
/// [`io::ErrorKind::TimedOut`]; an unplugged line ends (nought bytes) and cannot be written to
/// ([`io::ErrorKind::BrokenPipe`]), also after it is plugged in again: then it has to be opened anew.
pub struct Transport {
    rig: SharedRig,
    port: usize,
    plugs: u64,
    time: Arc<dyn Time>,
    timeout_s: f64,
    waiting: VecDeque<u8>,
}

impl std::fmt::Debug for Transport {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Transport").field("port", &self.port).finish_non_exhaustive()
    }
}

impl Transport {
    /// Opens the line that an instrument is on. `time` is the rig's own clock.
    ///
    /// # Errors
    /// [`RigError::NoInstrument`]; [`RigError::Unplugged`]; [`RigError::InUse`] while another holds it.
    pub fn open(
        rig: &SharedRig,
        instrument: &Id,
        time: Arc<dyn Time>,
        timeout: Duration,
    ) -> Result<Self, RigError> {
        let mut at = lock(rig);
        at.advance(time.now_s());
        let port = at.port_of(instrument)?;
        let (plugged, plugs) = at.plug(port);
        if !plugged {
            return Err(RigError::Unplugged(instrument.clone()));
        }
        match at.held.get_mut(port) {
            Some(held) if !*held => *held = true,
            _ => return Err(RigError::InUse(instrument.clone())),
        }
        let (rig, timeout_s) = (Arc::clone(rig), timeout.as_secs_f64());
        Ok(Self { rig, port, plugs, time, timeout_s, waiting: VecDeque::new() })
    }

    /// Another time-out for reading.
    pub fn set_timeout(&mut self, timeout: Duration) {
        self.timeout_s = timeout.as_secs_f64();
    }

    /// Drops what has come and was not read.
    pub fn clear(&mut self) {
        self.exchange(&[]);
        self.waiting.clear();
    }

    /// Hands over bytes and takes what has come; goes out: whether the line is still plugged in.
    fn exchange(&mut self, bytes: &[u8]) -> bool {
        let mut rig = lock(&self.rig);
        let now_s = self.time.now_s();
        rig.advance(now_s);
        if rig.plug(self.port) != (true, self.plugs) {
            return false;
        }
        for message in rig.exchange(self.port, now_s, bytes) {
            self.waiting.extend(&message.bytes);
            rig.sent(self.port, message, Delivery::Whole);
        }
        true
    }
}

impl Read for Transport {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        let began_s = self.time.now_s();
        loop {
            let plugged = self.exchange(&[]);
            if !self.waiting.is_empty() || !plugged || buffer.is_empty() {
                return self.waiting.read(buffer);
            }
            let left_s = began_s + self.timeout_s - self.time.now_s();
            // A billionth of a second is no time, but for rounding.
            if left_s <= 1e-9 {
                return Err(io::ErrorKind::TimedOut.into());
            }
            self.time.sleep(left_s.min(0.5 * TICK_S));
        }
    }
}

impl Write for Transport {
    fn write(&mut self, bytes: &[u8]) -> io::Result<usize> {
        if self.exchange(bytes) { Ok(bytes.len()) } else { Err(io::ErrorKind::BrokenPipe.into()) }
    }

    fn flush(&mut self) -> io::Result<()> {
        Ok(())
    }
}

impl Drop for Transport {
    fn drop(&mut self) {
        let mut rig = lock(&self.rig);
        // A line that was plugged in anew may be another's by now.
        if rig.plug(self.port).1 == self.plugs
            && let Some(held) = rig.held.get_mut(self.port)
        {
            *held = false;
        }
    }
}
