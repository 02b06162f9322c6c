//! Lines for a clock that is faster than the machine's.
//!
//! A line waits in the machine's seconds. Where the clock that asks goes several times as fast
//! ([`crate::clock::Hastened`]), waits are as much shorter, so that nothing is asked later than it should be.

use std::io::{self, Read, Write};
use std::sync::Arc;

use super::error::OpenError;
use super::line::{Line, LineSettings, Opener};
use crate::entry::Socket;

/// Ports whose lines wait so many times shorter.
pub struct Hurried {
    /// Who opens them.
    pub opener: Arc<dyn Opener>,
    /// How many times as fast the clock goes, above nought.
    pub times: f64,
}

impl Opener for Hurried {
    fn open(&self, socket: &Socket, settings: LineSettings) -> Result<Box<dyn Line>, OpenError> {
        let line = self.opener.open(socket, settings)?;
        Ok(Box::new(HurriedLine { line, times: self.times }))
    }
}

struct HurriedLine {
    line: Box<dyn Line>,
    times: f64,
}

impl Read for HurriedLine {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        self.line.read(buffer)
    }
}

impl Write for HurriedLine {
    fn write(&mut self, buffer: &[u8]) -> io::Result<usize> {
        self.line.write(buffer)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.line.flush()
    }
}

impl Line for HurriedLine {
    fn wait_at_most(&mut self, longest_s: f64) -> io::Result<()> {
        self.line.wait_at_most(longest_s / self.times)
    }
}
