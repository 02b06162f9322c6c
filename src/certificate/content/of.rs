//! What is stated and what was computed, brought together.

use super::issue::{Issue, Measured};
use super::{Content, File, rows, words};
use crate::certificate::stated;
use crate::report::cautions::{BENCH, BENCH_GAS};
use crate::{gas::Species, record::write_run};

/// Name of the file that holds what is stated.
pub(in crate::certificate) const STATED: &str = "certificate.toml";

/// The content of a certificate for `results`, the run it rests on, and `as_found`, the one before cleaning or adjustment.
#[must_use]
pub fn of(issue: &Issue, results: &Measured<'_>, as_found: Option<&Measured<'_>>) -> Content {
    let run = results.run;
    let title = words::title(run.purpose, as_found.is_some());
    let main = rows::calibration("results", title, results);
    let found = as_found.map(|measured| rows::calibration("as_found", words::AS_FOUND, measured));
    let judged = main.conformity.as_ref().zip(run.acceptance.as_ref()).map(|(c, a)| (a.rule, c.verdict));
    let days = [Some(run), as_found.map(|m| m.run)].into_iter().flatten().map(|r| r.taken.date_naive());
    let (first, last) =
        days.fold((run.taken.date_naive(), run.taken.date_naive()), |(a, b), day| (a.min(day), b.max(day)));
    let mut cautions = BENCH.to_vec();
    if run.gas != Species::Oxygen {
        cautions.push(BENCH_GAS);
    }
    Content {
        title: words::TITLE,
        performed: (first, last),
        place: issue.place.clone().unwrap_or_else(|| "at the address of the shop".to_owned()),
        method: words::method(&issue.program),
        changed_by_work: as_found.and_then(|found| rows::changed_by_work(found, results)),
        statements: words::statements(issue, run, judged),
        cautions,
        files: files(issue, results, as_found),
        results: main,
        as_found: found,
        issue: issue.clone(),
    }
}

/// What is stated, and the run file and readings of each run.
fn files(issue: &Issue, results: &Measured<'_>, as_found: Option<&Measured<'_>>) -> Vec<File> {
    let stated = stated::written(issue, results, as_found);
    let mut files = vec![File::new(
        STATED,
        "what the shop and the customer state",
        "application/toml",
        stated.into_bytes(),
    )];
    for (measured, run_says, readings_says) in [
        (Some(results), "the run file of the results", "the raw readings of the results"),
        (as_found, "the run file of the run as found", "the raw readings of the run as found"),
    ] {
        let Some(measured) = measured else { continue };
        let of_run = run_files(measured);
        files.push(File::new(of_run.toml_name, run_says, "application/toml", of_run.toml));
        files.push(File::new(of_run.readings_name, readings_says, "text/csv", of_run.readings));
    }
    files
}

/// The files of a run: those it came in, or written anew.
pub(in crate::certificate) fn run_files(measured: &Measured<'_>) -> super::RunFiles {
    if let Some(files) = measured.files {
        return files.clone();
    }
    let readings_name = format!("{}.csv", measured.name);
    let (toml, csv) = write_run(measured.run, &readings_name);
    super::RunFiles {
        toml_name: format!("{}.toml", measured.name),
        toml: toml.into_bytes(),
        readings_name,
        readings: csv.into_bytes(),
    }
}
