//! From what instruments say to what is recorded: readings, steady points, rows of a session, alarms.
//!
//! Comes in: what was heard ([`crate::instrument::Heard`]), in the seconds of a clock that somebody else asks, and a
//! person's wishes. Goes out: blocks of raw readings, points, faults and a heartbeat to a [`Ledger`] (a session: rows,
//! events and alarms to a [`SessionLedger`]), and a live state for a screen. Nothing here asks for the time, opens a port
//! or writes a file, so a run of an hour is replayed in a test at once.
//!
//! [`BenchLogger`] joins flow and pressure in time and asks [`crate::series`] once a second whether the end of the last
//! minute is steady: the same search with the same options that finds the points of an imported series. A fault is never
//! a reading; an instrument that is stale, lost or frozen allows no point. [`SessionLogger`] writes a row a second of the
//! last values that are not stale, and raises alarms.
//!
//! Left out: the thermometer of a volumetric meter apart from that of the gas; a frozen thermometer or barometer, which
//! stand still honestly for longer than a run lasts (what they can do by it lies within their ±); and a wrong number that
//! looks like a right one, as from a device switched to another unit that it does not say.

mod outbox;
mod ledger;
mod repeats;
mod channel;
mod sign;
mod window;
mod bench;
mod alarm;
mod cells;
mod rising;
mod session;
mod memory;

pub use alarm::{Alarm, AlarmChange, AlarmKind, AlarmLimits};
pub use bench::{BenchLogger, BenchOptions, Live, SetupError};
pub use cells::CellScale;
pub use channel::ChannelLive;
pub use ledger::{Block, By, Ledger, SessionLedger, Stamped, Taken, Trouble, TroubleAt};
pub use memory::{InMemory, SessionInMemory};
pub use session::{EventRefused, Row, SessionLive, SessionLogger, SessionOptions, SessionSetupError};
pub use sign::{NotSteady, Refusal, Role, Steady};
