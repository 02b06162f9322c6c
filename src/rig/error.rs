//! Why the rig does not do something.

use std::io;

use super::fault::Fault;
use crate::entry::{Id, IdError};
use crate::quantity::QuantityError;

/// Why the rig does not do something.
#[derive(Debug, thiserror::Error)]
pub enum RigError {
    /// A float meter has nothing to plug in.
    #[error("{0} is a float meter, which has no plug; give the rig a mass-reading or volumetric meter")]
    FloatMeter(Id),
    /// A quantity or unit that is none.
    #[error(transparent)]
    Unit(#[from] QuantityError),
    /// A name that is none.
    #[error(transparent)]
    Name(#[from] IdError),
    /// Two instruments, or two ports, of one name.
    #[error("two instruments or ports of the rig are named {0}; name each once")]
    Twice(String),
    /// An instrument that the rig does not have.
    #[error("the rig has no instrument {asked}; it has {has}")]
    NoInstrument {
        /// What was asked for.
        asked: String,
        /// What there is.
        has: String,
    },
    /// An instrument that stands on no line, or on two.
    #[error("instrument {0} stands on {1} lines of the rig; put it on one")]
    Lines(Id, usize),
    /// A port without a device, a line without a number, a device without a register.
    #[error("{0} has nothing to say; give it at least one instrument")]
    Nothing(String),
    /// Two devices of one address on a bus, or an address that is none.
    #[error("{port}: address {address} is taken or is none from 1 to 247")]
    Address {
        /// The bus.
        port: String,
        /// The address.
        address: u8,
    },
    /// Two numbers in one register, or one that runs over the last.
    #[error(
        "{port}: device {address} has two numbers in register {register}, or one that runs over the last"
    )]
    Register {
        /// The bus.
        port: String,
        /// The device.
        address: u8,
        /// The register.
        register: u16,
    },
    /// A rate that is none.
    #[error("{0}: a line every {1} s cannot be; give a time above zero")]
    Rate(String, f64),
    /// A word that is no fault.
    #[error("\"{0}\" is no fault of the rig; it knows {known}", known = Fault::NAMES.join(", "))]
    Fault(String),
    /// A fault without what it needs.
    #[error("the fault {fault} needs {what} behind it")]
    FaultNeeds {
        /// The fault.
        fault: String,
        /// What it needs.
        what: &'static str,
    },
    /// A fault that the protocol of the device does not have.
    #[error("{device} cannot have the fault {fault}: {why}")]
    NotItsFault {
        /// The device.
        device: Id,
        /// The fault.
        fault: Fault,
        /// Why not.
        why: &'static str,
    },
    /// A command that is none.
    #[error("\"{said}\" is no command of the rig; say {known}")]
    Command {
        /// What was said.
        said: String,
        /// The commands there are.
        known: &'static str,
    },
    /// A port that is not plugged in just now.
    #[error("{0} is not plugged in")]
    Unplugged(Id),
    /// A port that somebody holds.
    #[error("{0} is in use; let go of it first")]
    InUse(Id),
    /// A pseudo-terminal that cannot be made.
    #[error("no pseudo-terminal for {port}; check that the system has some left")]
    Terminal {
        /// The port.
        port: String,
        /// What the system says.
        #[source]
        source: io::Error,
    },
    /// The name of a port in a folder that cannot be made.
    #[error("{path} cannot be made; give a folder that can be written")]
    Link {
        /// The name.
        path: String,
        /// What the system says.
        #[source]
        source: io::Error,
    },
    /// A log that cannot be written.
    #[error("the log of the rig, {path}, cannot be written; give a file that can")]
    Log {
        /// The file.
        path: String,
        /// What the system says.
        #[source]
        source: io::Error,
    },
    /// The thread that serves cannot be begun, or ended in a panic.
    #[error("the rig stopped by itself; start it again")]
    Stopped,
}
