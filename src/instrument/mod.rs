//! Serial instruments: ports, framing, protocols, reconnecting; a stream of timed readings and faults.

pub mod crc;
