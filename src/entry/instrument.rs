//! An instrument in the register: where it is plugged in, how it speaks, what its papers say.
//!
//! Data only; the bytes are spoken by `instrument`.

use super::{Id, Meter, Transducer};
use crate::quantity::Span;

/// What an instrument measures.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Measures {
    /// Flow.
    Flow,
    /// Intermediate pressure.
    Pressure,
    /// Temperature.
    Temperature,
    /// Ambient pressure.
    Barometer,
    /// Oxygen, as a cell.
    Cell,
    /// Depth.
    Depth,
}

impl Measures {
    /// The word for it in files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Flow => "flow",
            Self::Pressure => "pressure",
            Self::Temperature => "temperature",
            Self::Barometer => "barometer",
            Self::Cell => "cell",
            Self::Depth => "depth",
        }
    }
}

/// Where an instrument is found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Socket {
    /// A serial port by its name.
    Port(String),
    /// A USB device as `vendor:product:serial`, which survives re-plugging.
    Usb(String),
}

/// Which numbers a Modbus device is asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ModbusTable {
    /// Input registers (function 4).
    Input,
    /// Holding registers (function 3).
    Holding,
}

/// How a Modbus device packs a number.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ModbusNumber {
    /// IEEE 754 binary32 in two registers.
    F32,
    /// Signed, one register.
    I16,
    /// Unsigned, one register.
    U16,
    /// Signed, two registers.
    I32,
    /// Unsigned, two registers.
    U32,
}

/// Which of two registers comes first.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum WordOrder {
    /// The high one.
    Big,
    /// The low one.
    Little,
}

/// How an instrument is spoken to.
#[derive(Debug, Clone, PartialEq)]
pub enum Protocol {
    /// Lines of text, streamed or asked for.
    Lines {
        /// What is sent to ask for a reading; none when the instrument streams by itself.
        ask: Option<String>,
        /// How often it is asked.
        every: Option<Span>,
        /// What ends a line.
        ends: String,
        /// Regular expression with the named group `value`, and optionally `unit`.
        pattern: String,
        /// Age from which a reading is stale.
        stale_after: Option<Span>,
    },
    /// A Modbus device on a serial line.
    ModbusRtu {
        /// Its address.
        device: u8,
        /// Which table.
        table: ModbusTable,
        /// First register, counted from nought.
        register: u16,
        /// How the number is packed.
        number: ModbusNumber,
        /// Order of two registers.
        word_order: WordOrder,
        /// What the number is multiplied by.
        scale: f64,
        /// How often it is asked.
        every: Option<Span>,
        /// Age from which a reading is stale.
        stale_after: Option<Span>,
    },
}

/// What the papers of an instrument say, by their table.
#[derive(Debug, Clone, PartialEq)]
pub enum InstrumentPapers {
    /// Those of a flow meter.
    Meter(Meter),
    /// Those of a transducer.
    Transducer(Transducer),
}

/// An instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct Instrument {
    /// Its name.
    pub id: Id,
    /// What it measures.
    pub measures: Measures,
    /// Where it is plugged in; none for one that is only read by eye.
    pub socket: Option<Socket>,
    /// Bits per second.
    pub baud: Option<u32>,
    /// Data bits, parity and stop bits, as `8N1`.
    pub frame: Option<String>,
    /// Symbol of the unit of the numbers it sends.
    pub unit: Option<String>,
    /// How it is spoken to.
    pub protocol: Option<Protocol>,
    /// Its papers.
    pub papers: Option<InstrumentPapers>,
}
