//! A line that bytes go over, and who opens one.
//!
//! Real ports stand in [`super::system`]; a test hands in lines of its own.

use std::io::{self, Read, Write};

use super::error::{OpenError, ProfileError};
use crate::entry::{Instrument, Protocol, Socket};

/// A serial line, or anything that behaves as one.
///
/// A read gives what has arrived, at least one byte. Nothing in time is an error of the kind `TimedOut`, `WouldBlock` or
/// `Interrupted`; every other error, and a read of no bytes, means that the line is lost.
pub trait Line: Read + Write + Send {
    /// How long a read or a write waits at most, in seconds.
    ///
    /// # Errors
    /// Where the line cannot be told so.
    fn wait_at_most(&mut self, longest_s: f64) -> io::Result<()>;
}

/// Parity of a byte.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Parity {
    /// None.
    None,
    /// Even.
    Even,
    /// Odd.
    Odd,
}

/// How a line is set.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct LineSettings {
    /// Bits per second.
    pub baud: u32,
    /// 5 to 8.
    pub data_bits: u8,
    /// Parity.
    pub parity: Parity,
    /// 1 or 2.
    pub stop_bits: u8,
}

impl LineSettings {
    /// The settings of an instrument's profile. Without a frame: 8N1 for text, and 8E1 for Modbus, which is its
    /// default ("MODBUS over Serial Line", V1.02, 2.5.1).
    ///
    /// # Errors
    /// Without a baud rate, and with a frame that is none.
    pub fn of(instrument: &Instrument) -> Result<Self, ProfileError> {
        let id = || instrument.id.as_str().to_owned();
        let baud = instrument.baud.ok_or_else(|| ProfileError::NoBaud { id: id() })?;
        let default = match instrument.protocol {
            Some(Protocol::ModbusRtu { .. }) => "8E1",
            _ => "8N1",
        };
        let frame = instrument.frame.as_deref().unwrap_or(default);
        Self::parse(baud, frame).ok_or_else(|| ProfileError::Frame { id: id(), frame: frame.to_owned() })
    }

    /// From a baud rate and a frame, as in "8N1"; none when that is no frame.
    #[must_use]
    pub fn parse(baud: u32, frame: &str) -> Option<Self> {
        let [data @ b'5'..=b'8', parity, stop @ (b'1' | b'2')] = frame.as_bytes() else { return None };
        let parity = match parity {
            b'N' => Parity::None,
            b'E' => Parity::Even,
            b'O' => Parity::Odd,
            _ => return None,
        };
        (baud > 0).then_some(Self { baud, data_bits: data - b'0', parity, stop_bits: stop - b'0' })
    }

    /// The frame as text, as in "8N1".
    #[must_use]
    pub fn frame(&self) -> String {
        let parity = match self.parity {
            Parity::None => 'N',
            Parity::Even => 'E',
            Parity::Odd => 'O',
        };
        format!("{}{parity}{}", self.data_bits, self.stop_bits)
    }
}

/// Opens lines.
pub trait Opener: Send + Sync {
    /// Opens a port with these settings, its old input thrown away.
    ///
    /// # Errors
    /// Why it does not open.
    fn open(&self, socket: &Socket, settings: LineSettings) -> Result<Box<dyn Line>, OpenError>;
}

/// Whether an error of a read only says that nothing came in time.
#[must_use]
pub(super) fn nothing_yet(error: &io::Error) -> bool {
    matches!(error.kind(), io::ErrorKind::TimedOut | io::ErrorKind::WouldBlock | io::ErrorKind::Interrupted)
}
