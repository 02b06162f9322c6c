//! Runs from text, without files: the run file as a shop writes it, and readings made by the caller.

use ebbline::bench::{Analysis, BenchError, Questions, analyse};
use ebbline::entry::{PointReading, Readings, Run};
use ebbline::record::parse_run;

/// Reads a run; a refusal fails the test.
#[track_caller]
pub(crate) fn run(toml: &str, csv: &str) -> Run {
    let csv = csv.to_owned();
    let mut files = move |_: &str| {
        let readings: Box<dyn std::io::Read> = Box::new(std::io::Cursor::new(csv.clone().into_bytes()));
        Ok(readings)
    };
    parse_run(toml, "run.toml", &mut files).unwrap_or_else(|e| panic!("{e}")).value
}

/// The points of a run that holds points.
pub(crate) fn points(run: &Run) -> &[PointReading] {
    match &run.readings {
        Readings::Points(points) => points,
        Readings::Series(_) => panic!("a run of points"),
    }
}

/// Analyses a run without further questions.
pub(crate) fn analysed(run: &Run) -> Result<Analysis, BenchError> {
    analyse(run, points(run), &Questions::default())
}
