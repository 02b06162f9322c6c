//! `bench log`, `session log` and logged runs that are resumed: from instruments into the book, before a face.
//!
//! Comes in: what was asked for, ports and a clock, and a [`BenchFace`] or [`SessionFace`] that shows and wishes. Goes
//! out: runs and sessions in the book, and how they ended. The face is a trait, so that a screen, a pipe, the page and a
//! test are served alike; nothing here writes to a terminal.

mod bench;
mod face;
mod instruments;
mod ledger;
mod session;
mod session_view;
mod view;
mod watch;
mod words;

pub use bench::{
    BenchEnded, BenchLogRequest, HowLong, Why, Wires, is_held, log, resume, run_was_logged, watch,
};
pub use face::{BenchFace, BenchWish, SessionFace, SessionWish};
pub use instruments::names_an_instrument;
pub use ledger::{Kept, RunLedger, SessionBookLedger, Tie};
pub use session::{
    SessionEnded, SessionHow, SessionLogRequest, is_session_held, log_session, resume_session, was_logged,
};
