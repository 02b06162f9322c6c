//! A run as the two files an import takes.

use std::io::{Cursor, Read};
use std::path::{Component, Path};

use super::spreadsheet;
use crate::book::{RunRecord, SourceFiles};
use crate::entry::{LeftOut, Readings, Run};
use crate::record::{Files, NoRegisters, RecordError, Registers, parse_run_with, write_run};
use crate::report::export::Form;

/// The files of a run.
pub(super) struct RunFiles {
    pub(super) toml: Vec<u8>,
    /// As the run file names it.
    pub(super) readings_name: String,
    pub(super) readings: Vec<u8>,
    pub(super) form: Form,
}

/// The files of a run; none when it has no point yet.
///
/// `source` are the files it came from. They are taken where they read back, with the registers as they stand, as the run
/// that stands in the book.
pub(super) fn of(
    record: &RunRecord,
    source: Option<&SourceFiles>,
    registers: &dyn Registers,
) -> Option<RunFiles> {
    let run = &record.run;
    if matches!(&run.readings, Readings::Points(points) if points.is_empty()) {
        return None;
    }
    let name = format!("{}.toml", record.number);
    let original = source.and_then(|source| as_it_came(&name, run, source, registers));
    Some(original.unwrap_or_else(|| as_it_stands(&name, run, &format!("{}.csv", record.number))))
}

fn as_it_came(name: &str, run: &Run, source: &SourceFiles, registers: &dyn Registers) -> Option<RunFiles> {
    let readings_name = &source.readings_name;
    if !travels(readings_name, name) || !spreadsheet::is_plain(&source.readings) {
        return None;
    }
    let text = std::str::from_utf8(&source.run_file).ok()?;
    let read = reads_as(text, name, &source.readings, registers)?;
    let files = |toml: Vec<u8>, form| RunFiles {
        toml,
        readings_name: readings_name.clone(),
        readings: source.readings.clone(),
        form,
    };
    if same(&read, run) {
        return Some(files(source.run_file.clone(), Form::Original));
    }
    // Points that were left out since stand behind those of the file.
    let since = run.left_out.strip_prefix(read.left_out.as_slice())?;
    let mut text = text.to_owned();
    if !text.ends_with('\n') {
        text.push('\n');
    }
    text.push_str(&left_out(since));
    let read = reads_as(&text, name, &source.readings, registers)?;
    same(&read, run).then(|| files(text.into_bytes(), Form::LeftOutAdded))
}

/// The files of a run as it stands in the book.
pub(super) fn as_it_stands(name: &str, run: &Run, readings_name: &str) -> RunFiles {
    let (toml, csv) = write_run(run, readings_name);
    let read = reads_as(&toml, name, csv.as_bytes(), &NoRegisters);
    let whole = read.is_some_and(|read| same(&read, run));
    RunFiles {
        toml: toml.into_bytes(),
        readings_name: readings_name.to_owned(),
        readings: csv.into_bytes(),
        form: if whole { Form::Written } else { Form::Incomplete },
    }
}

/// The tables of points left out, as they stand at the end of a run file.
fn left_out(points: &[LeftOut]) -> String {
    let each = |out: &LeftOut| {
        let why = toml::Value::String(out.why.clone());
        format!("\n[[leave_out]]\npoint = {}\nwhy = {why}\n", out.point)
    };
    points.iter().map(each).collect()
}

/// The run of a run file and its readings; none when they are refused.
pub(super) fn reads_as(toml: &str, name: &str, readings: &[u8], registers: &dyn Registers) -> Option<Run> {
    let mut open =
        |_: &str| -> Result<Box<dyn Read>, RecordError> { Ok(Box::new(Cursor::new(readings.to_vec()))) };
    let files: Files<'_> = &mut open;
    parse_run_with(toml, name, files, registers).ok().map(|loaded| loaded.value)
}

/// Whether two runs are the same to the last bit. A missing reading of a series is no number and so not equal to itself,
/// but is written as the same empty cell.
pub(super) fn same(a: &Run, b: &Run) -> bool {
    let offset = a.taken.offset() == b.taken.offset();
    offset && (a == b || (matches!(a.readings, Readings::Series(_)) && write_run(a, "") == write_run(b, "")))
}

/// Whether a name of readings stays beside the run file on any system, and is not the run file's own.
pub(super) fn travels(readings_name: &str, run_file: &str) -> bool {
    let plain = |part: &str| {
        let kept = |c: char| c.is_alphanumeric() || " -_.()".contains(c);
        part.chars().all(kept)
            && part.starts_with(char::is_alphanumeric)
            && part.ends_with(char::is_alphanumeric)
    };
    let parts: Vec<Component<'_>> = Path::new(readings_name).components().collect();
    let inside = parts.iter().all(|part| match part {
        Component::Normal(part) => part.to_str().is_some_and(plain),
        _ => false,
    });
    inside
        && !parts.is_empty()
        && readings_name.len() < 200
        && readings_name.to_lowercase() != run_file.to_lowercase()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn readings_stay_beside_their_run_file() {
        for name in ["a.csv", "logger/2026-11 (2).csv", "Ünit.txt"] {
            assert!(travels(name, "R0001.toml"), "{name}");
        }
        for name in [
            "",
            "/data/a.csv",
            "../a.csv",
            "./../a.csv",
            "a\\b.csv",
            ".hidden",
            "r0001.TOML",
            "C:a.csv",
            "a.",
        ] {
            assert!(!travels(name, "R0001.toml"), "{name}");
        }
    }

    #[test]
    fn a_reason_comes_back_whatever_is_in_it() {
        for why in ["plain", "\"quoted\" and 'so' and \\", "=1+1", "日本語 ]]", "'''\"\"\""] {
            let text = left_out(&[LeftOut { point: 3, why: why.to_owned() }]);
            let table: toml::Table = text.parse().unwrap();
            assert_eq!(table["leave_out"][0]["why"].as_str(), Some(why), "{text}");
        }
    }
}
