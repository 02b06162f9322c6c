//! Serial instruments: a stream of timed readings and faults.
//!
//! Comes in: profiles from the register, somebody who opens ports ([`Opener`]), a clock ([`crate::clock::Ticks`]). Goes
//! out: what was heard ([`Heard`]), in SI units, each with the second its bytes arrived; and counts of it. Two
//! protocols: lines of text, streamed or asked for, and Modbus RTU. Both are machines without a port of their own
//! ([`Conversation`]), fed with bytes and times.
//!
//! Nothing doubtful becomes a reading: a line with one strange byte, a number that goes on beyond the pattern, a unit of
//! another kind, a frame with a wrong check sum, the rest of a line that was joined in its middle. Each is a [`Fault`]
//! with its bytes.
//!
//! Left out: whether a value is *frozen*, which needs to know its noise ([`Counters::unchanged`] says how long it is the
//! same); flow control; Modbus over anything but a serial line; writing to instruments anything but the question.

pub mod crc;
mod error;
mod fault;
mod reading;
mod conversation;
pub mod split;
pub mod text_line;
mod streamed;
mod asked;
pub mod modbus_frame;
mod modbus;
mod line;
mod hurried;
mod system;
mod bus;
mod exchange;
mod counters;
mod worker;
mod streams;
mod proposal;
mod try_out;

pub use asked::{Asked, Question};
pub use bus::{Bus, SILENT_S, alone, buses};
pub use conversation::{Conversation, Found};
pub use counters::Counters;
pub use error::{Differ, Lost, OpenError, ProfileError};
pub use fault::{Fault, FaultKind, KEPT_BYTES};
pub use hurried::Hurried;
pub use line::{Line, LineSettings, Opener, Parity};
pub use modbus::{Modbus, Poll};
pub use proposal::{Change, Proposal, fitting_text};
pub use reading::{Reading, Scale};
pub use streamed::Streamed;
pub use streams::{Streams, by_hand, listen};
pub use system::{PortSeen, SystemPorts, UsbIdentity, port_of, ports};
pub use try_out::{BAUD_RATES, FRAMES, Trial, try_out};
pub use worker::{Heard, What, Worker};
