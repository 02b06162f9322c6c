//! An instrument of the register.

use super::{canonical_choice, canonical_struct};
use crate::entry::{
    Instrument, InstrumentPapers, Measures, ModbusNumber, ModbusTable, Protocol, Socket, WordOrder,
};

canonical_choice!(Measures, "what is measured" {
    Flow = 1,
    Pressure = 2,
    Temperature = 3,
    Barometer = 4,
    Cell = 5,
    Depth = 6,
});
canonical_choice!(Socket, "socket" { Port(name) = 1, Usb(name) = 2 });
canonical_choice!(ModbusTable, "table" { Input = 1, Holding = 2 });
canonical_choice!(ModbusNumber, "number" { F32 = 1, I16 = 2, U16 = 3, I32 = 4, U32 = 5 });
canonical_choice!(WordOrder, "word order" { Big = 1, Little = 2 });
canonical_choice!(Protocol, "protocol" {
    Lines { ask, every, ends, pattern, stale_after } = 1,
    ModbusRtu { device, table, register, number, word_order, scale, every, stale_after } = 2,
});
canonical_choice!(InstrumentPapers, "papers" { Meter(meter) = 1, Transducer(transducer) = 2 });
canonical_struct!(Instrument { id, measures, socket, baud, frame, unit, protocol, papers });
