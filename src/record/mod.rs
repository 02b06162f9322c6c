//! The files of a bench run, TOML and CSV, to [`crate::entry::Run`] and back; and those of the registers
//! and of sessions.
//!
//! Comes in: a run file and the readings it names (`interface.md`, "A bench run file"), from the disk or from files
//! handed in together. Goes out: plain data, with notes on what was taken for granted; or one refusal that names the
//! file, the line and the field. Nothing is guessed: a unit, a reference condition or a word that is missing or
//! unknown is refused. Nothing is computed either, but for units. An entry of a register is a file of its own, or the
//! flags of a command (`interface.md`, "Registers"). A session is a file of its own too (`interface.md`, "A session file").

mod error;
mod note;
mod run;
mod setup;
mod readings;
mod columns;
mod instruments;
mod around;
mod document;
mod sheet;
mod times;
mod number;
mod write;
mod registers;
mod session;

pub use document::hidden_character;
pub use error::{Fault, Place, RecordError, Refusal};
pub use instruments::suits as meter_suits;
pub use note::{Loaded, Note};
pub use readings::{MOST_POINTS, MOST_SERIES_ROWS};
pub use registers::{
    NumberPattern, NumberPatternFault, PatternFault, RegisterEntry, RegisterKind, RegisterRefusal,
    files_beside, flag_of, from_flags, parse_register, parse_register_as, read_register, read_register_as,
    write_register,
};
pub use run::{
    DEFAULT_PURITY, Files, NoRegisters, Registers, RunFiles, parse_run, parse_run_with, read_run,
    read_run_and_files, read_run_with,
};
pub use session::{
    CellCalibration, SessionFiles, SessionRefusal, SessionSetup, When, elapsed_or_time, event_from,
    parse_session, read_cell_calibration, read_session, read_session_and_files, read_session_setup,
    session_setup_from, write_session,
};
pub use setup::{Setup, read_setup};
pub use write::write_run;
