//! Frames of Modbus RTU: the questions of functions 3 and 4, and what answers them.
//!
//! Source of every layout: MODBUS Application Protocol Specification V1.1b3, 6.3 and 6.4 (data), 7 (exceptions); the
//! check sum: "MODBUS over Serial Line", V1.02, 6.2.2.

use super::crc::crc16;
use super::fault::FaultKind;
use crate::entry::{ModbusNumber, ModbusTable, WordOrder};

/// A question for registers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Request {
    /// Address of the device.
    pub device: u8,
    /// Which table.
    pub table: ModbusTable,
    /// First register, counted from nought.
    pub register: u16,
    /// How many: 1 to 125.
    pub count: u8,
}

/// The answer to a question.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Answer {
    /// The registers.
    Registers(Vec<u16>),
    /// An exception with its code.
    Refused(u8),
}

impl Request {
    /// The function code.
    #[must_use]
    pub const fn function(&self) -> u8 {
        match self.table {
            ModbusTable::Holding => 3,
            ModbusTable::Input => 4,
        }
    }

    /// The frame that asks it.
    #[must_use]
    pub fn frame(&self) -> Vec<u8> {
        let mut frame = vec![self.device, self.function()];
        frame.extend(self.register.to_be_bytes());
        frame.extend(u16::from(self.count).to_be_bytes());
        sealed(frame)
    }

    /// The answer in what was heard since the question was sent, wherever it begins: a stray byte at the turn of a
    /// two-wire line and the echo of the question may come before it. None as long as there is no whole one.
    #[must_use]
    pub fn answer(&self, heard: &[u8]) -> Option<Answer> {
        let heard = self.without_echo(heard);
        (0..heard.len()).find_map(|begin| self.answer_at(heard.get(begin..)?))
    }

    /// What was heard instead of an answer.
    #[must_use]
    pub fn fault(&self, heard: &[u8]) -> FaultKind {
        let heard = self.without_echo(heard);
        let whole = self.length();
        match heard {
            [] => FaultKind::Silence,
            [device, function, ..] if is_frame(heard) => {
                let ours = *function & 0x7f == self.function();
                if *device != self.device {
                    FaultKind::OtherDevice
                } else if ours {
                    FaultKind::WrongLength
                } else {
                    FaultKind::OtherFunction
                }
            }
            [_, function, ..] if *function & 0x80 != 0 && heard.len() == EXCEPTION_BYTES => {
                FaultKind::CheckSum
            }
            _ if heard.len() < whole => FaultKind::WrongLength,
            _ => FaultKind::CheckSum,
        }
    }

    /// Bytes of an answer: address, function, count, data, check sum.
    #[must_use]
    pub fn length(&self) -> usize {
        5 + 2 * usize::from(self.count)
    }

    fn without_echo<'h>(&self, heard: &'h [u8]) -> &'h [u8] {
        let frame = self.frame();
        match heard.strip_prefix(frame.as_slice()) {
            Some(rest) => rest,
            // The beginning of an echo is no answer either.
            None if frame.starts_with(heard) => &[],
            None => heard,
        }
    }

    fn answer_at(&self, heard: &[u8]) -> Option<Answer> {
        let (device, function) = (*heard.first()?, *heard.get(1)?);
        if device != self.device {
            return None;
        }
        if function == self.function() | 0x80 {
            let frame = heard.get(..EXCEPTION_BYTES)?;
            return is_sealed(frame).then_some(Answer::Refused(*frame.get(2)?));
        }
        let data_bytes = 2 * self.count;
        if function != self.function() || *heard.get(2)? != data_bytes {
            return None;
        }
        let frame = heard.get(..self.length())?;
        if !is_sealed(frame) {
            return None;
        }
        let data = frame.get(3..3 + usize::from(data_bytes))?;
        let registers = data.chunks_exact(2).map(|two| match two {
            [high, low] => u16::from_be_bytes([*high, *low]),
            _ => 0,
        });
        Some(Answer::Registers(registers.collect()))
    }
}

/// Bytes of an exception: address, function, code, check sum.
const EXCEPTION_BYTES: usize = 5;

/// A frame with its check sum behind it.
#[must_use]
pub fn sealed(mut frame: Vec<u8>) -> Vec<u8> {
    frame.extend(crc16(&frame).to_le_bytes());
    frame
}

/// Whether the last two bytes are the check sum of those before.
#[must_use]
pub fn is_sealed(frame: &[u8]) -> bool {
    match frame.split_last_chunk::<2>() {
        Some((body, sum)) => !body.is_empty() && crc16(body) == u16::from_le_bytes(*sum),
        None => false,
    }
}

/// Whether these bytes are, or begin with, a frame of some device and function.
fn is_frame(heard: &[u8]) -> bool {
    let by_count = heard.get(2).map(|count| 5 + usize::from(*count)).and_then(|length| heard.get(..length));
    let by_exception = heard.get(..EXCEPTION_BYTES);
    is_sealed(heard) || [by_count, by_exception].into_iter().flatten().any(is_sealed)
}

/// How many registers a number takes.
#[must_use]
pub const fn registers_of(number: ModbusNumber) -> u8 {
    match number {
        ModbusNumber::I16 | ModbusNumber::U16 => 1,
        ModbusNumber::F32 | ModbusNumber::I32 | ModbusNumber::U32 => 2,
    }
}

/// The number in registers; none when they are too few.
#[must_use]
pub fn number_in(registers: &[u16], number: ModbusNumber, order: WordOrder) -> Option<f64> {
    let first = *registers.first()?;
    if registers_of(number) == 1 {
        return Some(match number {
            ModbusNumber::I16 => f64::from(first.cast_signed()),
            _ => f64::from(first),
        });
    }
    let second = *registers.get(1)?;
    let (high, low) = match order {
        WordOrder::Big => (first, second),
        WordOrder::Little => (second, first),
    };
    let both = u32::from(high) << 16 | u32::from(low);
    Some(match number {
        ModbusNumber::F32 => f64::from(f32::from_bits(both)),
        ModbusNumber::I32 => f64::from(both.cast_signed()),
        _ => f64::from(both),
    })
}

/// A number times the scale of a profile. A scale that is one over a whole number divides by it: 512 at a scale of 0.001
/// is the same 0.512 that a line of text says.
#[must_use]
pub fn scaled(number: f64, scale: f64) -> f64 {
    let parts = (1.0 / scale).round();
    let is_share = parts.abs() >= 1.0 && parts.abs() < 1e9 && (1.0 / parts).to_bits() == scale.to_bits();
    if is_share { number / parts } else { number * scale }
}
