//! Why an instrument's profile cannot be listened to, and why a port does not open.

use crate::quantity::QuantityError;

/// Why a profile cannot be listened to.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ProfileError {
    /// No port.
    #[error("{id} has no port: name one with port = \"…\" or usb = \"…\" in its profile")]
    NoSocket {
        /// The instrument.
        id: String,
    },
    /// No baud rate.
    #[error("{id} has no baud rate: name it in its profile, as in baud = 19200")]
    NoBaud {
        /// The instrument.
        id: String,
    },
    /// No protocol.
    #[error("{id} has no protocol: add a table [protocol] to its profile")]
    NoProtocol {
        /// The instrument.
        id: String,
    },
    /// A unit that is none of what it measures.
    #[error("the unit of {id} cannot be used: {cause}")]
    Unit {
        /// The instrument.
        id: String,
        /// What is wrong with it.
        cause: QuantityError,
    },
    /// A Modbus device without a unit.
    #[error("{id} has no unit, and its protocol sends none: name it in its profile, as in unit = \"bar\"")]
    NoUnit {
        /// The instrument.
        id: String,
    },
    /// Data bits, parity and stop bits that are none.
    #[error("{frame:?} of {id} is not a frame: write data bits, parity and stop bits, as in \"8N1\"")]
    Frame {
        /// The instrument.
        id: String,
        /// What was given.
        frame: String,
    },
    /// A pattern that does not compile.
    #[error("the pattern of {id} cannot be used: {why}")]
    Pattern {
        /// The instrument.
        id: String,
        /// What the compiler of the expression says, in one line.
        why: String,
    },
    /// Two instruments on one port that cannot be there together.
    #[error("{first} and {second} share a port and differ in {what}: make their profiles agree")]
    Shared {
        /// One of them.
        first: String,
        /// The other.
        second: String,
        /// What they differ in.
        what: Differ,
    },
}

/// What instruments on one port must have in common.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum Differ {
    /// The baud rate.
    #[error("their baud rate")]
    Baud,
    /// The frame.
    #[error("their frame")]
    Frame,
    /// Text lines or Modbus.
    #[error("their kind of protocol")]
    Protocol,
    /// Whether they stream or are asked.
    #[error("whether they are asked or stream by themselves")]
    Asked,
    /// What ends a streamed line.
    #[error("what ends their lines")]
    Ends,
}

/// Why a port does not open.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum OpenError {
    /// No such port.
    #[error("{port} is not there: check the cable")]
    NotThere {
        /// The port.
        port: String,
    },
    /// No USB device of that identity.
    #[error("no USB port {identity} is plugged in: check the cable")]
    NotPlugged {
        /// Vendor, product and serial number.
        identity: String,
    },
    /// Several ports of one USB identity.
    #[error("several ports belong to {identity} ({}): name one of them as port", .ports.join(", "))]
    SeveralPorts {
        /// Vendor, product and serial number.
        identity: String,
        /// Their names.
        ports: Vec<String>,
    },
    /// Somebody else has it, or it is not ours to open.
    #[error("{port} cannot be opened: another program has it, or this user may not ({why})")]
    NotOurs {
        /// The port.
        port: String,
        /// What the system says.
        why: String,
    },
    /// Anything else.
    #[error("{port} cannot be opened: {why}")]
    Failed {
        /// The port.
        port: String,
        /// What the system says.
        why: String,
    },
}

/// Why a connection ended.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Lost {
    /// It could not be opened.
    #[error(transparent)]
    Open(#[from] OpenError),
    /// Nothing was heard for so long that the port is opened anew.
    #[error("nothing was heard for {for_s} s")]
    Silent {
        /// How long, in whole seconds.
        for_s: u32,
    },
    /// The other end went away.
    #[error("the port was closed by its other end: check the cable")]
    Closed,
    /// The system says so.
    #[error("the port failed: {0}")]
    Failed(String),
}
