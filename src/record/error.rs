//! What is refused, where it stands, and what to do about it.
//!
//! Every refusal is one sentence behind its place: `run.toml, line 12, [meter] zero: …`. Text that came from a file is
//! shown quoted and escaped, so that no file can write control characters to a terminal.

use std::fmt;

use super::registers::RegisterRefusal;
use super::session::SessionRefusal;
use crate::entry::IdError;
use crate::quantity::QuantityError;

/// Why a file is not taken. Both kinds mean exit status 2 and nothing stored.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum RecordError {
    /// The file was read, and something in it is refused.
    #[error("{place}: {refusal}")]
    Input {
        /// Where it stands.
        place: Place,
        /// What is refused.
        refusal: Box<Refusal>,
    },
    /// The file could not be read as text at all.
    #[error("{file}: {fault}")]
    Unreadable {
        /// The file's name as it was given.
        file: String,
        /// What kept it from being read.
        fault: Fault,
    },
}

/// Where something stands in a file.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// The file's name as it was given; a flag; or an entry that stands in a register.
    pub file: String,
    /// The line, counted from 1; none for something that is missing from the whole file.
    pub line: Option<u64>,
    /// The key with its table, or the column.
    pub field: Option<String>,
}

/// What kept a file from being read.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Fault {
    /// It is not there.
    #[error(
        "there is no such file; check the name (one that stands in a file is taken relative to that file)"
    )]
    Missing,
    /// It is a directory.
    #[error("this is a directory; name a file in it")]
    Directory,
    /// It may not be read.
    #[error("no permission to read it; change its permissions or copy it")]
    Permission,
    /// It holds bytes that no text holds.
    #[error("this is not text but binary data (or UTF-16 text); save it as plain text in UTF-8")]
    Binary,
    /// It is text in another encoding.
    #[error("line {0} is not UTF-8 text; save the file as UTF-8")]
    NotUtf8(u64),
    /// It is far too long to be what it should be.
    #[error("a run file has at most 1 MiB; readings belong into the CSV file it names")]
    TooLarge,
    /// It is far too long to be a session file.
    #[error("a session file has at most 1 MiB; readings belong into the CSV file it names")]
    LargeSession,
    /// Readings longer than are kept.
    #[error("readings have at most 500 MB; split or thin the file")]
    LargeReadings,
    /// It is far too long to be an entry of a register.
    #[error("an entry of a register has at most 1 MiB; this must be another file")]
    LargeEntry,
    /// The system refused with its own words.
    #[error("it cannot be read ({0})")]
    System(String),
}

impl Fault {
    /// The fault behind an error of the system.
    #[must_use]
    pub fn of(error: &std::io::Error) -> Self {
        match error.kind() {
            std::io::ErrorKind::NotFound | std::io::ErrorKind::NotADirectory => Self::Missing,
            std::io::ErrorKind::PermissionDenied => Self::Permission,
            std::io::ErrorKind::IsADirectory => Self::Directory,
            _ => Self::System(error.to_string()),
        }
    }
}

/// What is refused in a file that could be read.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum Refusal {
    /// The text breaks the rules of TOML.
    #[error("this is not TOML ({0}); correct it there")]
    NotToml(String),
    /// A key nobody reads.
    #[error("unknown key {key:?}; the nearest known one is {nearest:?}")]
    UnknownKey {
        /// The key as written.
        key: String,
        /// The known key nearest to it.
        nearest: &'static str,
    },
    /// A key that must be there.
    #[error("this key is missing; write for example {0}")]
    MissingKey(&'static str),
    /// A value of another type.
    #[error("this must be {want}, not {got}")]
    WrongType {
        /// What it must be.
        want: &'static str,
        /// What it is.
        got: &'static str,
    },
    /// A number where a unit is possible.
    #[error("the number {0} has no unit; write it in quotes with its unit")]
    BareNumber(String),
    /// A word that is not one of those known.
    #[error("{word:?} is not known here; use one of: {known}")]
    UnknownWord {
        /// The word as written.
        word: String,
        /// The words known, separated by commas.
        known: String,
    },
    /// The text is no quantity.
    #[error("{0}")]
    Quantity(QuantityError),
    /// The text is no name.
    #[error("{0}")]
    Id(IdError),
    /// The text is no number.
    #[error("{0:?} is not a number")]
    NotANumber(String),
    /// Not a number, or an infinity.
    #[error("{0:?} is not a reading; remove the row, or correct the logger's export")]
    NotFinite(String),
    /// A number out of its bounds.
    #[error("{shown} cannot be; it must be {want}")]
    OutOfBounds {
        /// The number as written.
        shown: String,
        /// Its bounds in words.
        want: &'static str,
    },
    /// An uncertainty below zero.
    #[error("{0:?} is negative; an uncertainty is never below zero")]
    NegativeUncertainty(String),
    /// No RFC 3339 time.
    #[error("{0:?} is not a time with its offset; write it as \"2026-11-12T09:40:00+11:00\"")]
    NotATime(String),
    /// No date.
    #[error("{0:?} is not a date; write it as \"2027-03-01\"")]
    NotADate(String),
    /// A character that does not belong into a line of text.
    #[error("the text holds a control or direction character (U+{0:04X}); type it without")]
    HiddenCharacter(u32),
    /// An empty text where words are needed.
    #[error("this is empty; say it in words")]
    EmptyText,
    /// Another kind of record.
    #[error("this is a {0:?} file; a bench run file says record = \"bench run\"")]
    OtherRecord(String),
    /// What only an entry of a register is refused for.
    #[error("{0}")]
    Register(RegisterRefusal),
    /// What only a session is refused for.
    #[error("{0}")]
    Session(SessionRefusal),
    /// A purity for a gas that is not oxygen.
    #[error("the gas is {0}; leave the purity of oxygen out")]
    PurityOfOther(&'static str),

    /// A meter whose litres mean nothing yet.
    #[error("a {kind} meter shows litres at reference conditions, and there is no default; write {presets}")]
    NoReferenceConditions {
        /// The kind of meter.
        kind: &'static str,
        /// The presets, listed.
        presets: String,
    },
    /// The gas is not the one the meter was made for, and nobody says by how much it matters.
    #[error(
        "the gas is {gas} and the meter was made for {made_for}; give gas_factor from the meter's papers (true flow \
         over shown flow)"
    )]
    GasDiffers {
        /// The gas of the run.
        gas: &'static str,
        /// The gas the meter was made for.
        made_for: &'static str,
    },
    /// A key that belongs to another kind of meter.
    #[error("a {kind} meter has no {key}; take it out, or correct kind")]
    NotOfThisKind {
        /// The kind of meter.
        kind: &'static str,
        /// The key.
        key: &'static str,
    },
    /// A working state for a scale that is not marked in reference litres.
    #[error("made_at belongs to a scale in reference litres; say scale = \"reference\", or take it out")]
    MadeAtOfActual,
    /// An entry of a register, and no register holds it.
    #[error(
        "{id:?} would be an entry of a register, and no book is open that holds it; write a [{table}] table"
    )]
    NotRegistered {
        /// The entry's name.
        id: String,
        /// The table to write instead.
        table: &'static str,
    },
    /// Nothing gives the barometer.
    #[error(
        "the absolute pressure, and whether the orifice is choked, need the barometer; give it here, as in \
         barometer = \"1009.2 hPa ± 1.0 hPa\", or as a column"
    )]
    NoBarometer,
    /// Nothing gives the gas temperature.
    #[error(
        "the flow depends on the gas temperature at the orifice; give it here, as in temperature = \"21.0 °C ± \
         1.0 °C\", or as a column"
    )]
    NoTemperature,
    /// An uncertainty alone where nothing else gives the value.
    #[error("{0:?} has only an uncertainty, and no column gives the value; write the value before the ±")]
    OnlyUncertainty(String),
    /// A column without its unit.
    #[error("the unit is missing; say what the column is in, as in unit = {0:?}")]
    NoUnit(&'static str),
    /// A unit on a column of words or plain numbers.
    #[error("this column has no unit; take the key out")]
    UnitOfWords,
    /// Two quantities in one column.
    #[error("the column {column:?} is already taken by {other}; each quantity has its own")]
    SameColumn {
        /// The column's name.
        column: String,
        /// The quantity that has it.
        other: &'static str,
    },
    /// A series needs times.
    #[error("a series needs a time column; name it, as in time = {{ column = \"t\", unit = \"s\" }}")]
    SeriesNeedsTime,
    /// A timed meter gives points.
    #[error("a timed meter gives single points, not a series; say rows = \"points\"")]
    SeriesOfTimed,
    /// Both a flow and what it would be computed from.
    #[error("the flow has a column already; give either flow, or volume and duration")]
    FlowTwice,
    /// A point that is not there.
    #[error("there is no point {point}; the readings hold points 1 to {points}")]
    NoSuchPoint {
        /// The number given.
        point: i64,
        /// How many points there are.
        points: usize,
    },
    /// A point left out twice.
    #[error("point {0} is left out twice; keep one entry with one reason")]
    LeftOutTwice(i64),

    /// A column the CSV does not have.
    #[error("there is no such column; the nearest in the header is {0:?}")]
    NoColumn(String),
    /// Two columns of one name.
    #[error("the header names it twice; rename or remove one of the two")]
    DoubledColumn,
    /// No header.
    #[error("the file is empty; its first line must name the columns")]
    NoHeader,
    /// No row under the header.
    #[error("there are no rows under the header")]
    NoRows,
    /// A row of another width.
    #[error(
        "the row has {got} fields and the header {header}; correct the row (a decimal comma needs \";\" between fields)"
    )]
    FieldCount {
        /// Fields in the row.
        got: usize,
        /// Fields in the header.
        header: usize,
    },
    /// An empty cell.
    #[error("the cell is empty; give the reading, or remove the row")]
    EmptyCell,
    /// A decimal comma where a comma may separate fields.
    #[error("{0:?} has a decimal comma, which is read only where \";\" separates the fields")]
    DecimalComma(String),
    /// Points and commas as decimal marks in one file.
    #[error("{0:?} mixes decimal comma and decimal point with the cells above; use one of them")]
    MixedDecimals(String),
    /// The header once more.
    #[error("the header stands here again; remove this line, or import the two recordings one by one")]
    HeaderAgain,
    /// A quoted cell without an end.
    #[error("a quoted cell does not end on its line; close the quote")]
    OpenQuote,
    /// Lines that only a carriage return ends.
    #[error(
        "the lines end with a carriage return alone; save the file with LF or CRLF at the ends of its lines"
    )]
    BareReturn,
    /// A line no logger writes.
    #[error("the line is longer than 64 KiB; this is not a table of readings")]
    LongLine,
    /// More rows than are read.
    #[error("there are more than {0} rows; split or thin the file")]
    TooManyRows(usize),
    /// Gauge pressure under vacuum.
    #[error("{0} is a gauge pressure below -1 bar, which cannot be; check the unit, or say absolute = true")]
    BelowVacuum(String),
    /// Absolute pressure under vacuum.
    #[error(
        "{0} is a negative absolute pressure, which cannot be; check the unit, or take absolute = true out"
    )]
    NegativePressure(String),
    /// Temperature under absolute zero.
    #[error("{0} is below absolute zero; check the unit")]
    BelowZeroKelvin(String),
    /// Negative flow of a steady point.
    #[error("{0} is a negative flow; a zero reading belongs into [before] or [after]")]
    NegativeFlow(String),
    /// Negative volume.
    #[error("{0} is a negative volume, which cannot be")]
    NegativeVolume(String),
    /// A duration that is not above zero.
    #[error("{0} is not a duration; it must be above zero")]
    NoDuration(String),
    /// A cell of the time column that is no time.
    #[error("{0:?} is not a time; use RFC 3339, a clock time HH:MM:SS, or numbers with a unit in [columns]")]
    NotATimeCell(String),
    /// A time in another form than the first row's.
    #[error("{0:?} is written otherwise than the first time of this column; use one form throughout")]
    OtherTimeForm(String),
    /// A time earlier than the one above.
    #[error("times run backwards here; sort the rows by time, or import the recordings one by one")]
    Backwards,
}

impl RecordError {
    pub(super) fn unreadable(file: &str, fault: Fault) -> Self {
        Self::Unreadable { file: file.to_owned(), fault }
    }
}

impl Refusal {
    pub(super) fn at(self, place: Place) -> RecordError {
        RecordError::Input { place, refusal: Box::new(self) }
    }
}

impl fmt::Display for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.file)?;
        if let Some(line) = self.line {
            write!(f, ", line {line}")?;
        }
        if let Some(field) = &self.field {
            write!(f, ", {field}")?;
        }
        Ok(())
    }
}
