//! Modbus RTU from the side of the device: registers, answers, exceptions, frames.
//!
//! MODBUS Application Protocol V1.1b3, functions 3 (6.3) and 4 (6.4) and exceptions (7); MODBUS over Serial Line V1.02
//! for the frame. Left out: every function that writes, and the silent interval, in whose place a tenth of a second
//! without a byte ends what was begun.

use super::fault::Fault;
use super::gauge::Reading;
use crate::entry::{Id, ModbusNumber, ModbusTable, WordOrder};
use crate::instrument::crc::crc16;

/// A number in the registers of a device.
#[derive(Debug, Clone, PartialEq)]
pub struct ModbusValue {
    /// The instrument it is from.
    pub gauge: Id,
    /// The table it stands in.
    pub table: ModbusTable,
    /// Its first register, counted from nought.
    pub register: u16,
    /// How it is packed.
    pub number: ModbusNumber,
    /// Order of two registers.
    pub word_order: WordOrder,
    /// What a reader multiplies it by.
    pub scale: f64,
}

impl ModbusValue {
    /// How many registers it takes.
    #[must_use]
    pub const fn takes(&self) -> u16 {
        match self.number {
            ModbusNumber::I16 | ModbusNumber::U16 => 1,
            ModbusNumber::F32 | ModbusNumber::I32 | ModbusNumber::U32 => 2,
        }
    }

    /// Whether a register is one of its own.
    pub(super) fn holds(&self, table: ModbusTable, register: u16) -> bool {
        self.table == table && register >= self.register && register - self.register < self.takes()
    }

    /// Its registers for a reading, with what is in force done to it.
    #[must_use]
    pub fn words(&self, reading: &Reading, in_force: &[Fault]) -> Vec<u16> {
        let mut reading = *reading;
        let mut special = None;
        for fault in in_force {
            match fault {
                Fault::WrongUnit(symbol) => reading = reading.in_unit(symbol),
                Fault::NotANumber => special = Some(Special::NotANumber),
                Fault::Overflow(_) => special = Some(Special::Overflow),
                _ => {}
            }
        }
        let raw = match special {
            None => reading.value / self.scale,
            Some(Special::NotANumber) => f64::NAN,
            Some(Special::Overflow) => 9.9e37,
        };
        words(self.number, self.word_order, raw)
    }
}

enum Special {
    NotANumber,
    Overflow,
}

/// A number in registers. Integers are rounded and stop at their ends; no number is the lowest of the signed ones and
/// the highest of the others, as such devices have it.
#[must_use]
pub fn words(number: ModbusNumber, order: WordOrder, raw: f64) -> Vec<u16> {
    // `as` stops at the ends of the type.
    let rounded = raw.round();
    let bits = match number {
        ModbusNumber::I16 => {
            return vec![(if raw.is_nan() { i16::MIN } else { rounded as i16 }).cast_unsigned()];
        }
        ModbusNumber::U16 => return vec![if raw.is_nan() { u16::MAX } else { rounded as u16 }],
        ModbusNumber::I32 => (if raw.is_nan() { i32::MIN } else { rounded as i32 }).cast_unsigned(),
        ModbusNumber::U32 => {
            if raw.is_nan() {
                u32::MAX
            } else {
                rounded as u32
            }
        }
        ModbusNumber::F32 => (raw as f32).to_bits(),
    };
    let (high, low) = ((bits >> 16) as u16, (bits & 0xFFFF) as u16);
    match order {
        WordOrder::Big => vec![high, low],
        WordOrder::Little => vec![low, high],
    }
}

/// A device on a bus.
#[derive(Debug, Clone, PartialEq)]
pub struct ModbusDevice {
    /// Its address, 1 to 247.
    pub address: u8,
    /// Its numbers.
    pub values: Vec<ModbusValue>,
}

/// The most registers one request may ask for (V1.1b3, 6.3 and 6.4).
const MOST_REGISTERS: u16 = 125;
/// Exception codes (V1.1b3, 7).
const ILLEGAL_FUNCTION: u8 = 1;
const ILLEGAL_ADDRESS: u8 = 2;
const ILLEGAL_VALUE: u8 = 3;

/// What is asked for: table, first register, how many. None for anything but functions 3 and 4 of the right length.
#[must_use]
pub fn asked(pdu: &[u8]) -> Option<(ModbusTable, u16, u16)> {
    let (function, rest) = pdu.split_first()?;
    let table = match function {
        3 => ModbusTable::Holding,
        4 => ModbusTable::Input,
        _ => return None,
    };
    let [a, b, c, d] = *rest else { return None };
    Some((table, u16::from_be_bytes([a, b]), u16::from_be_bytes([c, d])))
}

/// The answer to a request, both without address and check sum; `word` says what stands in a register, if it is there.
#[must_use]
pub fn answer(pdu: &[u8], word: impl Fn(ModbusTable, u16) -> Option<u16>) -> Vec<u8> {
    let function = pdu.first().copied().unwrap_or(0);
    let exception = |code: u8| vec![function | 0x80, code];
    let Some((table, first, count)) = asked(pdu) else {
        return exception(if matches!(function, 3 | 4) { ILLEGAL_VALUE } else { ILLEGAL_FUNCTION });
    };
    if !(1..=MOST_REGISTERS).contains(&count) {
        return exception(ILLEGAL_VALUE);
    }
    // 125 registers are 250 bytes.
    let mut reply = vec![function, (count * 2) as u8];
    for offset in 0..count {
        let Some(word) = first.checked_add(offset).and_then(|register| word(table, register)) else {
            return exception(ILLEGAL_ADDRESS);
        };
        reply.extend(word.to_be_bytes());
    }
    reply
}

/// A frame of address, what is said and check sum, low byte first.
#[must_use]
pub fn frame(address: u8, pdu: &[u8]) -> Vec<u8> {
    let mut frame = Vec::with_capacity(pdu.len() + 3);
    frame.push(address);
    frame.extend_from_slice(pdu);
    let crc = crc16(&frame);
    frame.extend(crc.to_le_bytes());
    frame
}

/// Takes the next whole request off the front of `buffer`, without its check sum: address, then what is asked. Bytes
/// that begin none are dropped.
pub(super) fn next_request(buffer: &mut Vec<u8>) -> Option<Vec<u8>> {
    loop {
        let length = match buffer.get(1)? {
            1..=6 | 8 => 8,
            15 | 16 => 9 + usize::from(*buffer.get(6)?),
            // Nothing is known of the length of another; it is taken to be all there is.
            _ => buffer.len().max(4),
        };
        if buffer.len() < length {
            return None;
        }
        let (body, sum) = buffer.split_at(length - 2);
        if sum.starts_with(&crc16(body).to_le_bytes()) {
            let request = body.to_vec();
            buffer.drain(..length);
            return Some(request);
        }
        buffer.remove(0);
    }
}
