//! What each verb does, one file a verb: load, compute, store, hand back a result.
//!
//! The only place with a sequence of steps, and, with `record`, the only one that touches files.

pub mod book;
pub mod certificate;
pub mod demo;
pub mod enter;
pub mod enter_session;
pub mod error;
pub mod export;
pub mod fit;
pub mod history;
pub mod instruments;
pub mod lines;
pub mod log;
pub mod output;
pub mod png;
pub mod registers;
pub mod rig;
pub mod runs;
pub mod sessions;
pub mod setting;
pub mod shelf;
pub mod uptake;

pub use error::{ExitStatus, WorkError};
