//! A content made again from the files inside a certificate.

use std::io::Cursor;

use crate::bench::{Analysis, BenchError, FEWEST_POINTS, Questions, analyse};
use crate::certificate::content::{self, Content, Measured, RunFiles};
use crate::certificate::dcc::ReceivedFile;
use crate::certificate::stated::{Stated, StatedError, StatedRun};
use crate::entry::{PointReading, Readings, Run};
use crate::record::{Fault, RecordError, parse_run};
use crate::series::{SteadyOptions, steady_points};

/// Longest run file that is read, in bytes, as on import.
const LONGEST_RUN_FILE: usize = 1 << 20;

/// Why no content can be made of the files inside.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum AgainError {
    /// What was stated is not there.
    #[error("certificate.toml, which holds what was stated, is not among them")]
    NoStated,
    /// What was stated cannot be read.
    #[error(transparent)]
    Stated(#[from] StatedError),
    /// A run file is not there.
    #[error("the run file {0:?} is not among them")]
    NoRunFile(String),
    /// Two files of one name.
    #[error("{0:?} is there twice")]
    Twice(String),
    /// A run file is no text or far too long.
    #[error("the run file {0:?} is no text of at most 1 MiB")]
    NoText(String),
    /// A run is refused.
    #[error("{0}")]
    Record(#[from] RecordError),
    /// The readings are a time series without enough steady spans.
    #[error("the readings of run {run} have {found} steady spans, and a line needs {FEWEST_POINTS} points")]
    TooFewSteady {
        /// The run.
        run: String,
        /// Steady spans.
        found: usize,
    },
    /// A run gives no line.
    #[error("{0}")]
    Bench(#[from] BenchError),
}

/// Makes the content again.
///
/// # Errors
/// Every [`AgainError`].
pub fn made_again(stated: &Stated, files: &[ReceivedFile]) -> Result<Content, AgainError> {
    // There are at most a few dozen, which is held on reading.
    let twice = files.iter().enumerate().find(|(i, file)| files.iter().take(*i).any(|f| f.name == file.name));
    if let Some((_, file)) = twice {
        return Err(AgainError::Twice(short(&file.name)));
    }
    let results = Taken::of(&stated.results, files)?;
    let as_found = stated.as_found.as_ref().map(|run| Taken::of(run, files)).transpose()?;
    let found = as_found.as_ref().map(Taken::measured);
    Ok(content::of(&stated.issue, &results.measured(), found.as_ref()))
}

/// A run read and analysed.
struct Taken<'a> {
    stated: &'a StatedRun,
    run: Run,
    analysis: Analysis,
    files: RunFiles,
}

impl<'a> Taken<'a> {
    fn of(stated: &'a StatedRun, files: &[ReceivedFile]) -> Result<Self, AgainError> {
        let named = |name: &str| files.iter().find(|file| file.name == name);
        let toml = named(&stated.file).ok_or_else(|| AgainError::NoRunFile(short(&stated.file)))?;
        let text = Some(&toml.bytes).filter(|bytes| bytes.len() <= LONGEST_RUN_FILE);
        let text = text.and_then(|bytes| std::str::from_utf8(bytes).ok());
        let text = text.ok_or_else(|| AgainError::NoText(short(&stated.file)))?;
        let mut readings = None;
        let loaded = parse_run(text, &stated.file, &mut |name| {
            // Only among the files handed in together, never outside.
            let file = named(name)
                .ok_or_else(|| RecordError::Unreadable { file: short(name), fault: Fault::Missing })?;
            readings = Some((name.to_owned(), file.bytes.clone()));
            Ok(Box::new(Cursor::new(file.bytes.clone())))
        })?;
        let (readings_name, readings) = readings.unwrap_or_default();
        let run = loaded.value;
        let questions = Questions { before: stated.before.as_ref(), ..Questions::default() };
        let analysis = match &run.readings {
            Readings::Points(points) => analyse(&run, points, &questions)?,
            Readings::Series(series) => {
                let points: Vec<PointReading> = steady_points(series, &SteadyOptions::default()).points;
                if points.len() < FEWEST_POINTS {
                    let found = points.len();
                    return Err(AgainError::TooFewSteady { run: short(&stated.name), found });
                }
                analyse(&run, &points, &questions)?
            }
        };
        let files =
            RunFiles { toml_name: stated.file.clone(), toml: toml.bytes.clone(), readings_name, readings };
        Ok(Self { stated, run, analysis, files })
    }

    fn measured(&self) -> Measured<'_> {
        Measured {
            name: &self.stated.name,
            run: &self.run,
            analysis: &self.analysis,
            before: self.stated.before.as_ref(),
            files: Some(&self.files),
        }
    }
}

fn short(name: &str) -> String {
    name.chars().take(60).collect()
}
