//! A session as the files an import takes: its own, its readings, and those of the run its line comes from.

use std::collections::BTreeMap;
use std::io::{Cursor, Read};

use super::run_files::{self, travels};
use super::spreadsheet;
use crate::book::{SessionRecord, SessionSource};
use crate::entry::{CellSignal, LineReference, Run, Session, SessionReadings};
use crate::record::{Files, RecordError, Registers, parse_session, write_session};
use crate::report::export::Form;

/// The run file of a session that is written, and its readings.
const LINE: [&str; 2] = ["line.toml", "line.csv"];

/// The files of a session, by their names in its folder.
pub(super) struct SessionFiles {
    /// The name of the session file.
    pub(super) own: String,
    pub(super) files: BTreeMap<String, Vec<u8>>,
    pub(super) form: Form,
}

/// The files of a session.
///
/// `source` are the files it came from. They are taken where they read back, with the registers as they stand, as the
/// session and the line that stand in the book.
pub(super) fn of(
    mut record: SessionRecord,
    source: Option<SessionSource>,
    registers: &dyn Registers,
) -> SessionFiles {
    let own = format!("{}.toml", record.number);
    source
        .and_then(|source| as_it_came(&own, &mut record, source, registers))
        .unwrap_or_else(|| as_it_stands(own, record))
}

fn as_it_came(
    own: &str,
    record: &mut SessionRecord,
    source: SessionSource,
    registers: &dyn Registers,
) -> Option<SessionFiles> {
    let text = std::str::from_utf8(&source.session_file).ok()?;
    if !same(reads_as(text, own, &source.readings)?, &mut record.session) {
        return None;
    }
    if !spreadsheet::is_plain(&source.readings) {
        return None;
    }
    let mut names = vec![(source.readings_name, source.readings)];
    match (&record.line_run, source.line) {
        (None, None) => {}
        (Some(run), Some(line)) => {
            let text = std::str::from_utf8(&line.file).ok()?;
            let read = run_files::reads_as(text, &line.file_name, &line.readings, registers)?;
            if !run_files::same(&read, run) || !spreadsheet::is_plain(&line.readings) {
                return None;
            }
            // The readings of a run file are named from its own folder.
            let readings = match line.file_name.rsplit_once('/') {
                Some((folder, _)) => format!("{folder}/{}", line.readings_name),
                None => line.readings_name,
            };
            names.extend([(line.file_name, line.file), (readings, line.readings)]);
        }
        _ => return None,
    }
    let mut files = BTreeMap::from([(own.to_owned(), source.session_file)]);
    for (name, bytes) in names {
        if !travels(&name, own) || is_taken_for_a_session(&name) {
            return None;
        }
        // One file may be named twice; two whose names differ only in case are one on some systems.
        let there = files.iter().find(|(other, _)| other.to_lowercase() == name.to_lowercase());
        if there.is_some_and(|(other, there)| *other != name || *there != bytes) {
            return None;
        }
        files.insert(name, bytes);
    }
    Some(SessionFiles { own: own.to_owned(), files, form: Form::Original })
}

/// Whether a file beside a session file is one of those the README hands to `session import`: `S*[0-9].toml`.
fn is_taken_for_a_session(name: &str) -> bool {
    let stem = name.to_lowercase();
    let stem = stem.strip_suffix(".toml").unwrap_or_default();
    stem.starts_with('s') && stem.ends_with(|c: char| c.is_ascii_digit())
}

fn as_it_stands(own: String, record: SessionRecord) -> SessionFiles {
    let mut session = record.session;
    let readings_name = format!("{}.csv", record.number);
    let line = record.line_run.as_ref().map(|run: &Run| run_files::as_it_stands(LINE[0], run, LINE[1]));
    let named = session.line.take();
    // A run file that was named and is not kept cannot be named again.
    let lost = line.is_none() && matches!(named, Some(LineReference::RunFile(_)));
    session.line = match (&line, named) {
        (Some(_), _) => Some(LineReference::RunFile(LINE[0].to_owned())),
        (None, Some(LineReference::RunFile(_))) => None,
        (None, named) => named,
    };
    let (toml, csv) = write_session(&session, &readings_name);
    let whole = !lost
        && line.as_ref().is_none_or(|line| line.form != Form::Incomplete)
        && reads_as(&toml, &own, csv.as_bytes()).is_some_and(|read| same(read, &mut session));
    let mut files = BTreeMap::from([(own.clone(), toml.into_bytes()), (readings_name, csv.into_bytes())]);
    if let Some(line) = line {
        files.insert(LINE[0].to_owned(), line.toml);
        files.insert(line.readings_name, line.readings);
    }
    SessionFiles { own, files, form: if whole { Form::Written } else { Form::Incomplete } }
}

fn reads_as(toml: &str, name: &str, readings: &[u8]) -> Option<Session> {
    let mut open =
        |_: &str| -> Result<Box<dyn Read>, RecordError> { Ok(Box::new(Cursor::new(readings.to_vec()))) };
    let files: Files<'_> = &mut open;
    parse_session(toml, name, files).ok().map(|loaded| loaded.value)
}

/// Whether two sessions are the same to the last bit; a missing reading is as good as another.
fn same(mut read: Session, session: &mut Session) -> bool {
    // Readings are compared apart, and taken out so that millions of rows need not be copied for that.
    let (here, there) = (std::mem::take(&mut read.readings), std::mem::take(&mut session.readings));
    let alike =
        read == *session && read.taken.offset() == session.taken.offset() && same_readings(&here, &there);
    session.readings = there;
    alike
}

fn same_readings(a: &SessionReadings, b: &SessionReadings) -> bool {
    let some = |a: &Option<Vec<f64>>, b: &Option<Vec<f64>>| match (a, b) {
        (None, None) => true,
        (Some(a), Some(b)) => same_columns(a, b),
        _ => false,
    };
    same_columns(&a.time_s, &b.time_s)
        && some(&a.depth_m, &b.depth_m)
        && some(&a.loop_temperature_k, &b.loop_temperature_k)
        && a.cells.len() == b.cells.len()
        && a.cells.iter().zip(&b.cells).all(|(a, b)| a.name == b.name && same_signals(&a.signal, &b.signal))
}

fn same_signals(a: &CellSignal, b: &CellSignal) -> bool {
    match (a, b) {
        (CellSignal::Bar(a), CellSignal::Bar(b)) => same_columns(a, b),
        (
            CellSignal::Volts { readings: a, in_air, in_oxygen },
            CellSignal::Volts { readings: b, in_air: b_in_air, in_oxygen: b_in_oxygen },
        ) => same_columns(&[*in_air, *in_oxygen], &[*b_in_air, *b_in_oxygen]) && same_columns(a, b),
        _ => false,
    }
}

fn same_columns(a: &[f64], b: &[f64]) -> bool {
    let same = |(a, b): (&f64, &f64)| a.to_bits() == b.to_bits() || (a.is_nan() && b.is_nan());
    a.len() == b.len() && a.iter().zip(b).all(same)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_a_session_file_is_handed_to_an_import() {
        for name in ["S0001.toml", "s2.TOML", "Stage-3.toml"] {
            assert!(is_taken_for_a_session(name), "{name}");
        }
        for name in ["cmf-0417.toml", "line.toml", "small.toml", "S0001.csv", "below/S1.csv"] {
            assert!(!is_taken_for_a_session(name), "{name}");
        }
    }
}
