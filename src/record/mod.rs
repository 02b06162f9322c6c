//! The files of a bench run: TOML and CSV to [`crate::entry::Run`] and back.
//!
//! Comes in: a run file and the readings it names (`interface.md`, "A bench run file"), from the disk or from files
//! handed in together. Goes out: plain data, with notes on what was taken for granted; or one refusal that names the
//! file, the line and the field. Nothing is guessed: a unit, a reference condition or a word that is missing or
//! unknown is refused. Nothing is computed either, but for units. Left out: session files, registers.

mod error;
mod note;
mod run;
mod readings;
mod columns;
mod instruments;
mod around;
mod document;
mod sheet;
mod times;
mod number;
mod write;

pub use error::{Fault, Place, RecordError, Refusal};
pub use note::{Loaded, Note};
pub use readings::{MOST_POINTS, MOST_SERIES_ROWS};
pub use run::{DEFAULT_PURITY, Files, NoRegisters, Registers, parse_run, parse_run_with, read_run};
pub use write::write_run;
