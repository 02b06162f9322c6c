//! Ebbline: from bench readings of a constant-mass-flow orifice to a line one can sign.
//!
//! The rooms below stand in reading order: each uses only rooms above it (checked by `tests/tidy.rs`).
//! Everything from [`quantity`] to [`plot`] is pure: no input or output, no clock, no random number it was not handed.

pub mod quantity;
pub mod gas;
pub mod stats;
pub mod entry;
pub mod series;
pub mod bench;
pub mod report;
pub mod plot;
pub mod record;
pub mod work;
pub mod cli;
