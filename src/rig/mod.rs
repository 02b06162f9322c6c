//! A simulated bench that speaks the protocols of real meters, with what can go wrong on demand.
//!
//! Comes in: settings with a seed, a clock, commands, the bytes of whoever asks. Goes out: the bytes of the instruments,
//! over pseudo-terminals ([`Rig::serve`], Unix only) or within one process ([`Transport`]), the entries for the register
//! that lead to them ([`Rig::profiles`]), what is true ([`Truth`]) and a log of every byte sent ([`Log`]).
//!
//! Behind it stands a model stepped in time: a regulator that lags and creeps ([`Script`]), an orifice by the law of
//! [`crate::gas`] ([`Hole`]), a room that drifts, a diver on a loop ([`CouchSettings`]), and instruments that lag, are off
//! within their papers, scatter and round ([`Gauge`]). Each [`Fault`] befalls one device at a time planned or commanded.
//!
//! Left out: the time that bits take on a line, parity and framing errors of the line itself, float meters (which have no
//! plug), instruments that drift, and everything about gas that [`crate::gas`] leaves out. It is a model to try the
//! program with, and says nothing of a real orifice or a real diver.

mod time;
mod hole;
mod regulator;
mod couch;
mod bench;
mod gauge;
mod fault;
mod lines;
pub mod modbus;
mod log;
mod port;
mod command;
mod error;
mod assembled;
mod profile;
mod standard;
mod transport;
#[cfg(unix)]
mod serve;

pub use assembled::{Rig, Settings, TICK_S};
pub use bench::{BenchSettings, Drift, Truth};
pub use command::Command;
pub use couch::{CouchSettings, Feed};
pub use error::RigError;
pub use fault::{Fault, FaultPlan, Lasts, Overflow, Planned};
pub use gauge::{Allowed, Gauge, OffBy, Reading, Source};
pub use hole::Hole;
pub use lines::{Field, LinesDevice, Speaks};
pub use log::{Delivery, Log, Meant, Message, Sent};
pub use modbus::{ModbusDevice, ModbusValue};
pub use port::{PortSettings, Wiring};
pub use regulator::{RegulatorSettings, Script};
#[cfg(unix)]
pub use serve::Served;
pub use time::{JumpingTime, OfTicks, RealTime, Settable, Time, VirtualTime};
pub use transport::{SharedRig, Transport};
