//! A bench run file to a [`Run`].
//!
//! Comes in: the text of the run file, and a way to open the files it names. Goes out: the run as plain data, with
//! notes on what was taken for granted. The keys are those of `interface.md`, "A bench run file"; what is refused is
//! listed in [`super::error::Refusal`]. Left out: every computation, and the registers, which live in a book and are
//! asked through [`Registers`].

use std::fs::File;
use std::io::Read;
use std::path::Path;

use super::around;
use super::columns::Columns;
use super::document::{Source, Table};
use super::error::{Fault, RecordError, Refusal};
use super::instruments::{self, GASES};
use super::note::{Loaded, Note};
use super::readings;
use super::sheet::Sheet;
use crate::entry::{Acceptance, Build, Id, Meter, MeterKind, Purity, Purpose, Readings, Run, Transducer};
use crate::gas::Species;
use crate::quantity::Share;
use crate::quantity::text::uncertain;

/// Purity of the oxygen where none is stated, and its expanded uncertainty (k = 2): that of `interface.md`.
pub const DEFAULT_PURITY: Purity = Purity { fraction: 0.995, expanded: 0.003 };

/// Longest run file that is read, in bytes.
const LONGEST_RUN_FILE: u64 = 1 << 20;
/// Longest file of readings that is kept to the byte: five million rows of a hundred bytes.
const LONGEST_READINGS: u64 = 500_000_000;

pub(super) const KEYS: [&str; 18] = [
    "record",
    "orifice",
    "build",
    "gas",
    "oxygen",
    "purpose",
    "taken",
    "technician",
    "readings",
    "rows",
    "columns",
    "conditions",
    "before",
    "after",
    "meter",
    "transducer",
    "acceptance",
    "leave_out",
];

pub(super) const PURPOSES: [(&str, Purpose); 4] = [
    (Purpose::Acceptance.name(), Purpose::Acceptance),
    (Purpose::AsFound.name(), Purpose::AsFound),
    (Purpose::AsLeft.name(), Purpose::AsLeft),
    (Purpose::Check.name(), Purpose::Check),
];

/// The words for how a hole is built, in files.
pub(super) const BUILDS: [(&str, Build); 4] = [
    (Build::ThinPlate.name(), Build::ThinPlate),
    (Build::ShortTube.name(), Build::ShortTube),
    (Build::Nozzle.name(), Build::Nozzle),
    (Build::Unknown.name(), Build::Unknown),
];

/// Opens the files that a run file names; a name resolves only here.
pub type Files<'f> = &'f mut dyn FnMut(&str) -> Result<Box<dyn Read>, RecordError>;

/// Where entries named by an id come from.
pub trait Registers {
    /// The flow meter of that name.
    fn meter(&self, id: &Id) -> Option<Meter>;
    /// The pressure transducer of that name.
    fn transducer(&self, id: &Id) -> Option<Transducer>;
    /// The acceptance limits of that name.
    fn acceptance(&self, id: &Id) -> Option<Acceptance>;
}

/// The registers of a file that is read without a book: empty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct NoRegisters;

impl Registers for NoRegisters {
    fn meter(&self, _: &Id) -> Option<Meter> {
        None
    }

    fn transducer(&self, _: &Id) -> Option<Transducer> {
        None
    }

    fn acceptance(&self, _: &Id) -> Option<Acceptance> {
        None
    }
}

/// Reads a run file and the readings it names, which are looked for beside it.
///
/// # Errors
/// Every [`RecordError`]; each means exit status 2.
pub fn read_run(path: &Path) -> Result<Loaded<Run>, RecordError> {
    read_run_with(path, &NoRegisters)
}

/// As [`read_run`], with registers.
///
/// # Errors
/// Every [`RecordError`].
pub fn read_run_with(path: &Path, registers: &dyn Registers) -> Result<Loaded<Run>, RecordError> {
    let (name, bytes) = read_toml(path)?;
    let text = as_text(&name, &bytes)?;
    let beside = path.parent().unwrap_or(Path::new(""));
    parse_run_with(text, &name, &mut |file| open(&beside.join(file)), registers)
}

/// The files of a run, to the byte.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RunFiles {
    /// The run file.
    pub toml: Vec<u8>,
    /// The name of its readings as it gives it.
    pub readings_name: String,
    /// The readings.
    pub readings: Vec<u8>,
}

/// As [`read_run_with`], and hands back the bytes that were read.
///
/// # Errors
/// Every [`RecordError`].
pub fn read_run_and_files(
    path: &Path,
    registers: &dyn Registers,
) -> Result<(Loaded<Run>, RunFiles), RecordError> {
    let (name, toml) = read_toml(path)?;
    let text = as_text(&name, &toml)?;
    let beside = path.parent().unwrap_or(Path::new(""));
    let (mut readings_name, mut readings) = (String::new(), Vec::new());
    let mut files = |file: &str| {
        readings_name = file.to_owned();
        open_and_keep(&beside.join(file), &mut readings)
    };
    let loaded = parse_run_with(text, &name, &mut files, registers)?;
    Ok((loaded, RunFiles { toml, readings_name, readings }))
}

pub(super) fn read_toml(path: &Path) -> Result<(String, Vec<u8>), RecordError> {
    let name = path.display().to_string();
    let mut bytes = Vec::new();
    let read = open(path)?.take(LONGEST_RUN_FILE + 1).read_to_end(&mut bytes);
    read.map_err(|error| RecordError::unreadable(&name, Fault::of(&error)))?;
    Ok((name, bytes))
}

/// Reads a run from the text of its file; `name` stands in refusals, and other files open only through `files`.
///
/// # Errors
/// Every [`RecordError`], and those of `files`.
pub fn parse_run(toml_text: &str, name: &str, files: Files<'_>) -> Result<Loaded<Run>, RecordError> {
    parse_run_with(toml_text, name, files, &NoRegisters)
}

/// As [`parse_run`], with registers that hold instruments and limits named by an id.
///
/// # Errors
/// Every [`RecordError`], and those of `files`.
pub fn parse_run_with(
    toml_text: &str,
    name: &str,
    files: Files<'_>,
    registers: &dyn Registers,
) -> Result<Loaded<Run>, RecordError> {
    let source = Source::new(name, toml_text.trim_start_matches('\u{FEFF}'));
    let parsed = source.parse()?;
    let value = run(&source.whole(&parsed), name, files, registers)?;
    Ok(Loaded { value, notes: source.into_notes() })
}

fn run(
    file: &Table<'_>,
    name: &str,
    files: Files<'_>,
    registers: &dyn Registers,
) -> Result<Run, RecordError> {
    let record = file.required("record", "record = \"bench run\"")?;
    if record.text()? != "bench run" {
        return Err(record.refuse(Refusal::OtherRecord(record.text()?.to_owned())));
    }
    file.only(&KEYS)?;
    let orifice = file.required("orifice", "orifice = \"CMF-0417\"")?.id()?;
    let build = file.field("build").map_or(Ok(Build::Unknown), |field| field.word(&BUILDS))?;
    let gas = file.required("gas", "gas = \"oxygen\"")?.word(&GASES)?;
    let purity = purity(file, gas)?;
    let purpose = match file.field("purpose") {
        Some(field) => field.word(&PURPOSES)?,
        None => {
            file.note(Note::PurposeTaken);
            Purpose::Check
        }
    };
    let taken = file.required("taken", "taken = \"2026-11-12T09:40:00+11:00\"")?.time()?;
    let technician = file.field("technician").map(|field| field.free_text()).transpose()?.flatten();
    let series = match file.field("rows") {
        Some(field) => field.word(&[("points", false), ("series", true)])?,
        None => false,
    };
    let meter = meter(file, gas, registers)?;
    let transducer = transducer(file, registers)?;
    let acceptance = acceptance(file, registers)?;
    let example = "a table [columns] with pressure = { column = \"ip\", unit = \"bar\" }";
    let columns = file.required("columns", example)?.table("columns")?;
    let columns = Columns::read(&columns, &meter.kind, series)?;
    let (uses_volume, wet) = match meter.kind {
        MeterKind::Mass { .. } => (false, false),
        MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => (true, wet),
        MeterKind::Float { .. } => (true, false),
    };
    let conditions = around::conditions(file, &columns, uses_volume, wet)?;
    let before = around::zero_and_leak(file.table("before")?.as_ref())?;
    let after = around::zero_and_leak(file.table("after")?.as_ref())?;
    let leave_out = file.tables("leave_out")?;
    // What can be refused without the readings is refused before they are read.
    around::left_out(&leave_out, None)?;

    let readings = file.required("readings", "readings = \"cmf-0417.csv\"")?;
    // The name comes back in refusals, so it is held to what free text is held to.
    let Some(csv) = readings.free_text()? else { return Err(readings.refuse(Refusal::EmptyText)) };
    let csv_name = Path::new(name).parent().unwrap_or(Path::new("")).join(&csv).display().to_string();
    let mut sheet = Sheet::open(&csv_name, files(&csv)?, &columns.names())?;
    let readings = if series {
        readings::series(&mut sheet, &columns)?
    } else {
        readings::points(&mut sheet, &columns)?
    };
    let points = match &readings {
        Readings::Points(points) => Some(points.len()),
        Readings::Series(_) => None,
    };
    let left_out = around::left_out(&leave_out, points)?;
    Ok(Run {
        orifice,
        build,
        gas,
        purity,
        purpose,
        taken,
        technician,
        readings,
        conditions,
        before,
        after,
        meter,
        transducer,
        acceptance,
        left_out,
    })
}

pub(super) fn purity(file: &Table<'_>, gas: Species) -> Result<Option<Purity>, RecordError> {
    let field = file.field("oxygen");
    if gas != Species::Oxygen {
        return match field {
            Some(field) => Err(field.refuse(Refusal::PurityOfOther(gas.name()))),
            None => Ok(None),
        };
    }
    let Some(field) = field else {
        file.note(Note::PurityTaken);
        return Ok(Some(DEFAULT_PURITY));
    };
    let given = field.quantity(uncertain::<Share>)?;
    let fraction = given.value.as_ratio();
    if fraction <= 0.0 || fraction > 1.0 {
        let shown = field.text()?.to_owned();
        return Err(field.refuse(Refusal::OutOfBounds { shown, want: "above 0 % and at most 100 %" }));
    }
    let expanded = match given.expanded {
        Some(expanded) => expanded.as_ratio(),
        None => {
            field.note(Note::PurityUncertaintyTaken(field.place()));
            DEFAULT_PURITY.expanded
        }
    };
    Ok(Some(Purity { fraction, expanded }))
}

pub(super) fn meter(file: &Table<'_>, gas: Species, registers: &dyn Registers) -> Result<Meter, RecordError> {
    let field = file.required("meter", "a table [meter] with kind = \"mass\" and what its papers say")?;
    if !field.is_text() {
        return instruments::meter(&field.table("meter")?, Some(gas));
    }
    let id = field.id()?;
    let meter = registers.meter(&id).ok_or_else(|| field.refuse(not_registered(&id, "meter")))?;
    instruments::suits(&meter.kind, gas).map_err(|refusal| field.refuse(refusal))?;
    Ok(meter)
}

pub(super) fn transducer(file: &Table<'_>, registers: &dyn Registers) -> Result<Transducer, RecordError> {
    let field = file.required("transducer", "a table [transducer] with what its papers say")?;
    if !field.is_text() {
        return instruments::transducer(&field.table("transducer")?);
    }
    let id = field.id()?;
    registers.transducer(&id).ok_or_else(|| field.refuse(not_registered(&id, "transducer")))
}

pub(super) fn acceptance(
    file: &Table<'_>,
    registers: &dyn Registers,
) -> Result<Option<Acceptance>, RecordError> {
    let Some(field) = file.field("acceptance") else { return Ok(None) };
    if !field.is_text() {
        return around::acceptance(&field.table("acceptance")?).map(Some);
    }
    let id = field.id()?;
    registers.acceptance(&id).map(Some).ok_or_else(|| field.refuse(not_registered(&id, "acceptance")))
}

fn not_registered(id: &Id, table: &'static str) -> Refusal {
    Refusal::NotRegistered { id: id.as_str().to_owned(), table }
}

/// Opens a file for reading, if it is one.
pub(super) fn open(path: &Path) -> Result<Box<dyn Read>, RecordError> {
    let refuse = |fault| RecordError::unreadable(&path.display().to_string(), fault);
    let file = File::open(path).map_err(|error| refuse(Fault::of(&error)))?;
    let about = file.metadata().map_err(|error| refuse(Fault::of(&error)))?;
    if about.is_dir() { Err(refuse(Fault::Directory)) } else { Ok(Box::new(file)) }
}

/// Opens a file of readings and keeps its bytes.
pub(super) fn open_and_keep(path: &Path, kept: &mut Vec<u8>) -> Result<Box<dyn Read>, RecordError> {
    let read = open(path)?.take(LONGEST_READINGS + 1).read_to_end(kept);
    let refuse = |fault| RecordError::unreadable(&path.display().to_string(), fault);
    read.map_err(|error| refuse(Fault::of(&error)))?;
    if kept.len() as u64 > LONGEST_READINGS {
        return Err(refuse(Fault::LargeReadings));
    }
    Ok(Box::new(std::io::Cursor::new(kept.clone())))
}

/// The bytes of a file of ours as the text they should be.
pub(super) fn as_text<'b>(name: &str, bytes: &'b [u8]) -> Result<&'b str, RecordError> {
    if bytes.contains(&0) {
        return Err(RecordError::unreadable(name, Fault::Binary));
    }
    if bytes.len() as u64 > LONGEST_RUN_FILE {
        return Err(RecordError::unreadable(name, Fault::TooLarge));
    }
    std::str::from_utf8(bytes).map_err(|error| {
        let line = 1 + bytes[..error.valid_up_to()].iter().filter(|byte| **byte == b'\n').count() as u64;
        RecordError::unreadable(name, Fault::NotUtf8(line))
    })
}
