//! A session file and its readings to a [`Session`], and back.
//!
//! Comes in: the text of a session file (`interface.md`, "A session file") and a way to open the readings it names.
//! Goes out: the session as plain data, with notes on what was taken for granted; what is refused is listed in
//! [`SessionRefusal`] and [`Refusal`]. The way back is [`write_session`], whose files read back as an equal session.
//!
//! Left out: the run file that `line` names, and the book that `orifice` and `diver` are entries of; every computation.

mod refusal;
mod moment;
mod spread;
mod columns;
mod cells;
mod events;
mod around;
mod assumptions;
mod write;
mod setup;

use std::path::Path;

use self::spread::{actual_volume, flow};
use super::document::{Field, Source, Table};
use super::error::{Fault, RecordError, Refusal};
use super::note::{Loaded, Note};
use super::registers::{diluent, positive};
use super::run::{Files, as_text, open, open_and_keep, purity, read_toml};
use super::sheet::Sheet;
use crate::entry::{
    Cylinder, Event, Injection, LeakTest, LineReference, LoopKept, Place, Session, SessionReadings, What,
};
use crate::gas::Species;

pub use cells::CellCalibration;
pub use events::event_from;
pub use moment::{When, elapsed_or_time};
pub use refusal::SessionRefusal;
pub use setup::{SessionSetup, read_cell_calibration, read_session_setup, session_setup_from};
pub use write::write_session;

const KEYS: [&str; 21] = [
    "record",
    "diver",
    "mass",
    "place",
    "loop",
    "diluent",
    "loop_volume",
    "leak_test",
    "nose_clip",
    "oxygen",
    "taken",
    "readings",
    "line",
    "orifice",
    "columns",
    "conditions",
    "cells",
    "rest",
    "assumptions",
    "events",
    "cylinder",
];

const PLACES: [(&str, Place); 2] = [(Place::Couch.name(), Place::Couch), (Place::Pool.name(), Place::Pool)];

/// The words for how a loop is kept, in files.
const LOOPS: [(&str, LoopKept); 3] = [
    (LoopKept::Sealed.name(), LoopKept::Sealed),
    (LoopKept::Held.name(), LoopKept::Held),
    (LoopKept::Topped.name(), LoopKept::Topped),
];

/// The files of a session, to the byte; the run file that it may name is not among them.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SessionFiles {
    /// The session file.
    pub toml: Vec<u8>,
    /// The name of its readings as it gives it.
    pub readings_name: String,
    /// The readings.
    pub readings: Vec<u8>,
}

/// Reads a session file and the readings it names, which are looked for beside it.
///
/// # Errors
/// Every [`RecordError`]; each means exit status 2.
pub fn read_session(path: &Path) -> Result<Loaded<Session>, RecordError> {
    let (name, bytes) = read_toml(path)?;
    let beside = path.parent().unwrap_or(Path::new(""));
    parse_session(session_text(&name, &bytes)?, &name, &mut |file| open(&beside.join(file)))
}

/// As [`read_session`], and hands back the bytes that were read.
///
/// # Errors
/// Every [`RecordError`].
pub fn read_session_and_files(path: &Path) -> Result<(Loaded<Session>, SessionFiles), RecordError> {
    let (name, toml) = read_toml(path)?;
    let beside = path.parent().unwrap_or(Path::new(""));
    let (mut readings_name, mut readings) = (String::new(), Vec::new());
    let mut files = |file: &str| {
        readings_name = file.to_owned();
        open_and_keep(&beside.join(file), &mut readings)
    };
    let loaded = parse_session(session_text(&name, &toml)?, &name, &mut files)?;
    Ok((loaded, SessionFiles { toml, readings_name, readings }))
}

/// Reads a session from the text of its file; `name` stands in refusals, and the readings open only through `files`.
///
/// # Errors
/// Every [`RecordError`], and those of `files`.
pub fn parse_session(toml_text: &str, name: &str, files: Files<'_>) -> Result<Loaded<Session>, RecordError> {
    let source = Source::new(name, toml_text.trim_start_matches('\u{FEFF}'));
    let parsed = source.parse()?;
    let value = session(&source.whole(&parsed), name, files)?;
    Ok(Loaded { value, notes: source.into_notes() })
}

fn session_text<'b>(name: &str, bytes: &'b [u8]) -> Result<&'b str, RecordError> {
    as_text(name, bytes).map_err(|error| match error {
        RecordError::Unreadable { file, fault: Fault::TooLarge } => {
            RecordError::unreadable(&file, Fault::LargeSession)
        }
        other => other,
    })
}

fn session(file: &Table<'_>, name: &str, files: Files<'_>) -> Result<Session, RecordError> {
    let record = file.required("record", "record = \"session\"")?;
    if record.text()? != "session" {
        return Err(record.refuse(SessionRefusal::OtherRecord(record.text()?.to_owned()).into()));
    }
    file.only(&KEYS)?;
    let diver = file.required("diver", "diver = \"D-07\"")?.id()?;
    let mass = positive(file, "mass")?;
    let place = file.required("place", "place = \"couch\"")?.word(&PLACES)?;
    let kept = file.required("loop", "loop = \"held\"")?.word(&LOOPS)?;
    let diluent = diluent(&file.required("diluent", "diluent = \"air\"")?)?;
    let loop_volume = file.field("loop_volume").map(|field| actual_volume(&field, 1.0)).transpose()?;
    let leak_test = file.field("leak_test").map_or(Ok(LeakTest::NotDone), |field| leak_test(&field))?;
    let nose_clip = file.field("nose_clip").map(|field| field.flag()).transpose()?;
    let oxygen = match file.field("oxygen") {
        Some(_) => purity(file, Species::Oxygen)?,
        None => {
            file.note(Note::PurityTaken);
            None
        }
    };
    let taken = file.required("taken", "taken = \"2026-11-20T18:05:00+11:00\"")?.time()?;
    let line = line(file)?;
    let example = "a table [columns] with time = { column = \"t\", unit = \"s\" } and cells = [ … ]";
    let columns = columns::Columns::read(&file.required("columns", example)?.table("columns")?)?;
    let conditions = around::conditions(file, columns.depth.is_some(), columns.loop_temperature.is_some())?;
    let papers = cells::papers(file, &columns.cells)?;
    let rest = around::rest(file)?;
    let assumptions = assumptions::assumptions(file)?;
    let tables = file.tables("events")?;
    // What can be refused without the readings is refused before they are read.
    let early = placed(&tables, &moment::Axis::unread(&taken))?;
    injected(file, &tables, &early, line.is_some())?;
    let cylinder = cylinder(file, kept, &early)?;

    let readings = file.required("readings", "readings = \"couch-1.csv\"")?;
    // The name comes back in refusals, so it is held to what free text is held to.
    let Some(csv) = readings.free_text()? else { return Err(readings.refuse(Refusal::EmptyText)) };
    let csv_name = Path::new(name).parent().unwrap_or(Path::new("")).join(&csv).display().to_string();
    let mut sheet = Sheet::open(&csv_name, files(&csv)?, &columns.names())?;
    let rows = columns::rows(&mut sheet, &columns, &taken)?;
    let events = placed(&tables, &rows.axis)?;
    rows.notes.into_iter().for_each(|note| file.note(note));
    Ok(Session {
        diver,
        mass,
        place,
        kept,
        diluent,
        loop_volume,
        leak_test,
        nose_clip,
        oxygen,
        taken,
        readings: SessionReadings {
            time_s: rows.time_s,
            cells: cells::readings(columns.cells, rows.cells, &papers),
            depth_m: rows.depth_m,
            loop_temperature_k: rows.loop_temperature_k,
        },
        line,
        conditions,
        cells: papers.common,
        rest,
        assumptions,
        events,
        cylinder,
    })
}

/// "passed", or the leak that was measured.
fn leak_test(field: &Field<'_>) -> Result<LeakTest, RecordError> {
    let text = field.quantity_text()?.trim();
    if text == "passed" {
        return Ok(LeakTest::Passed);
    }
    // A word that is no number was meant as a word.
    if !text.contains(|c: char| c.is_ascii_digit()) {
        let known = "passed, or the leak as in \"0.005 L/min\"".to_owned();
        return Err(field.refuse(Refusal::UnknownWord { word: text.to_owned(), known }));
    }
    flow(field, 1.0).map(LeakTest::Measured)
}

/// The run file or the orifice, if one is named.
fn line(file: &Table<'_>) -> Result<Option<LineReference>, RecordError> {
    let orifice = file.field("orifice");
    let Some(run_file) = file.field("line") else {
        return orifice.map(|field| field.id().map(LineReference::Orifice)).transpose();
    };
    if let Some(orifice) = orifice {
        return Err(orifice.refuse(SessionRefusal::LineTwice.into()));
    }
    let Some(name) = run_file.free_text()? else { return Err(run_file.refuse(Refusal::EmptyText)) };
    Ok(Some(LineReference::RunFile(name)))
}

fn placed(tables: &[Table<'_>], axis: &moment::Axis) -> Result<Vec<Event>, RecordError> {
    tables.iter().map(|table| events::event(table, axis)).collect()
}

/// Refuses a session without any injection, and an intermediate pressure that has no line.
fn injected(
    file: &Table<'_>,
    tables: &[Table<'_>],
    events: &[Event],
    has_line: bool,
) -> Result<(), RecordError> {
    if !events.iter().any(|event| matches!(event.what, What::Injection(_))) {
        return Err(file.refuse("events", SessionRefusal::NoInjection.into()));
    }
    let by_ip = |event: &Event| matches!(event.what, What::Injection(Injection::Ip(_)));
    let first = tables.iter().zip(events).find(|(_, event)| by_ip(event));
    match first.and_then(|(table, _)| table.field("ip")) {
        Some(field) if !has_line => Err(field.refuse(SessionRefusal::NeedsLine.into())),
        _ => Ok(()),
    }
}

fn cylinder(file: &Table<'_>, kept: LoopKept, events: &[Event]) -> Result<Option<Cylinder>, RecordError> {
    let Some(field) = file.field("cylinder") else { return Ok(None) };
    let from_then_on =
        |event: &Event| matches!(event.what, What::MakeUp { kept: Some(LoopKept::Topped), .. });
    if kept != LoopKept::Topped && !events.iter().any(from_then_on) {
        return Err(field.refuse(SessionRefusal::CylinderNotTopped.into()));
    }
    around::cylinder(&field.table("cylinder")?).map(Some)
}
