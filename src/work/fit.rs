//! `bench fit`: a run file to its line, checks and verdict.

use std::borrow::Cow;
use std::path::{Path, PathBuf};

use super::output::write_whole;
use super::runs::{load, number_of};
use super::shelf::{Shelf, ShelfRegisters};
use super::{ExitStatus, WorkError, png};
use crate::bench::advice::{LowPoints, low_points};
use crate::bench::monte_carlo::{FEWEST_TRIALS, MOST_TRIALS, MonteCarlo, monte_carlo};
use crate::bench::{Analysis, FEWEST_POINTS, Questions, Verdict, analyse};
use crate::entry::{PointReading, Readings, Run, SeriesReadings};
use crate::plot::{RunPlot, run_plot};
use crate::quantity::{AbsolutePressure, GaugePressure, PressureDifference, StpdFlow, Uncertain};
use crate::record::{NoRegisters, read_run_with};
use crate::report::Units;
use crate::report::bench_fit::Fitted;
use crate::series::{SteadyOptions, SteadyPoints, steady_points};

/// Seed of the Monte Carlo check; stored with its result.
const SEED: u64 = 101;

/// What is asked of a run.
#[derive(Debug, Clone, Default)]
pub struct FitRequest {
    /// The run file, or the name of a run of the book.
    pub run: String,
    /// Pressures at which the flow is wanted.
    pub at: Vec<GaugePressure>,
    /// Flows for which the pressure is wanted.
    pub for_flow: Vec<StpdFlow>,
    /// Ambient pressure for those answers.
    pub barometer: Option<Uncertain<AbsolutePressure, PressureDifference>>,
    /// Trials of a Monte Carlo check.
    pub monte_carlo: Option<usize>,
    /// Where the book is, if it was said.
    pub book: Option<PathBuf>,
    /// Where to draw it, `.svg` or `.png`.
    pub plot: Option<PathBuf>,
    /// The units of the plot.
    pub units: Units,
}

/// What came of it.
#[derive(Debug, Clone, PartialEq)]
pub struct FitOutcome {
    /// What was recorded.
    pub run: Run,
    /// What was made of it.
    pub analysis: Analysis,
    /// The Monte Carlo check.
    pub monte_carlo: Option<MonteCarlo>,
    /// What would settle the choke ratio.
    pub low_points: Option<LowPoints>,
    /// What was said on reading.
    pub notes: Vec<String>,
}

impl FitOutcome {
    /// The same for `report`.
    #[must_use]
    pub fn fitted(&self) -> Fitted<'_> {
        Fitted {
            run: &self.run,
            analysis: &self.analysis,
            monte_carlo: self.monte_carlo.as_ref(),
            low_points: self.low_points.as_ref(),
            notes: &self.notes,
        }
    }

    /// Favourable unless the verdict is fail or undecided.
    #[must_use]
    pub fn status(&self) -> ExitStatus {
        match self.analysis.judgement.as_ref().map_or(Verdict::None, |j| j.verdict) {
            Verdict::Pass | Verdict::None => ExitStatus::Done,
            Verdict::Fail | Verdict::Undecided => ExitStatus::Unfavourable,
        }
    }
}

/// Whether an argument names a file: it has a slash or ends in `.toml`, `.pdf` or `.xml`.
#[must_use]
pub fn names_a_file(argument: &str) -> bool {
    let lower = argument.to_lowercase();
    argument.contains(['/', '\\']) || [".toml", ".pdf", ".xml"].iter().any(|ending| lower.ends_with(ending))
}

/// Reads, analyses and draws one run, from its file or from the book.
///
/// # Errors
/// A file that is missing or refused, a run that is not in the book or cannot be analysed, a plot that cannot be
/// written.
pub fn fit(request: &FitRequest) -> Result<FitOutcome, WorkError> {
    if let Some(trials) = request.monte_carlo.filter(|n| !(FEWEST_TRIALS..=MOST_TRIALS).contains(n)) {
        return Err(WorkError::Trials(trials));
    }
    let kind = request.plot.as_deref().map(plot_kind).transpose()?;
    let questions = Questions {
        at: request.at.clone(),
        for_flow: request.for_flow.clone(),
        ambient: request.barometer,
        before: None,
    };
    let (run, analysis, notes) = if names_a_file(&request.run) {
        let (run, notes) = from_file(request)?;
        let file = PathBuf::from(&request.run);
        let (points, more) = points_of(&file, &run.readings)?;
        let analysis =
            analyse(&run, &points, &questions).map_err(|error| WorkError::Bench { file, error })?;
        (run, analysis, notes.into_iter().chain(more).collect())
    } else {
        let number = number_of(&request.run)?;
        let loaded = load(&Shelf::find(request.book.as_deref())?.to_read()?, number)?;
        let analysis = loaded.analyse(&questions)?;
        (loaded.run, analysis, Vec::new())
    };
    let monte_carlo = match request.monte_carlo {
        None => None,
        Some(trials) => Some(
            monte_carlo(&run, &analysis, trials, SEED, threads()).ok_or(WorkError::NoMonteCarlo(trials))?,
        ),
    };
    let low_points = low_points(&run, &analysis);
    if let (Some(kind), Some(path)) = (kind, &request.plot) {
        draw(&run, &analysis, &request.units, kind, path)?;
    }
    Ok(FitOutcome { run, analysis, monte_carlo, low_points, notes })
}

/// The run of a file; its book is opened only if the file names an entry of it.
fn from_file(request: &FitRequest) -> Result<(Run, Vec<String>), WorkError> {
    let path = Path::new(&request.run);
    let loaded = match Shelf::find(request.book.as_deref()) {
        Ok(shelf) => {
            let registers = ShelfRegisters::new(&shelf);
            match read_run_with(path, &registers) {
                Ok(loaded) => loaded,
                Err(refused) => return Err(registers.failure().unwrap_or_else(|| refused.into())),
            }
        }
        // A system without a data folder still fits files.
        Err(_) => read_run_with(path, &NoRegisters)?,
    };
    Ok((loaded.value, loaded.notes.iter().map(ToString::to_string).collect()))
}

/// The steady points of a run's readings, and for a time series what was made of it.
///
/// # Errors
/// A time series with fewer steady spans than a line needs points.
pub(super) fn points_of<'r>(
    file: &Path,
    readings: &'r Readings,
) -> Result<(Cow<'r, [PointReading]>, Vec<String>), WorkError> {
    let series = match readings {
        Readings::Points(points) => return Ok((Cow::Borrowed(points), Vec::new())),
        Readings::Series(series) => series,
    };
    let steady = steady(series);
    if steady.points.len() < FEWEST_POINTS {
        return Err(WorkError::TooFewSteady {
            file: file.to_owned(),
            found: steady.points.len(),
            needed: FEWEST_POINTS,
            hold_s: SteadyOptions::default().least_duration_s,
            nearly: nearly_steady(&steady),
        });
    }
    let notes = crate::report::series_notes::notes(series, &steady);
    Ok((Cow::Owned(steady.points), notes))
}

/// The steady spans of a time series, by the default options.
pub(super) fn steady(series: &SeriesReadings) -> SteadyPoints {
    steady_points(series, &SteadyOptions::default())
}

fn nearly_steady(steady: &SteadyPoints) -> String {
    match crate::report::series_notes::rejected(steady) {
        text if text.is_empty() => text,
        text => format!(" ({text})"),
    }
}

/// What a plot is written as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum PlotKind {
    Svg,
    Png,
}

pub(super) fn plot_kind(path: &Path) -> Result<PlotKind, WorkError> {
    match path.extension().and_then(|e| e.to_str()).map(str::to_lowercase).as_deref() {
        Some("svg") => Ok(PlotKind::Svg),
        Some("png") => Ok(PlotKind::Png),
        _ => Err(WorkError::PlotKind(path.to_owned())),
    }
}

fn draw(run: &Run, analysis: &Analysis, units: &Units, kind: PlotKind, path: &Path) -> Result<(), WorkError> {
    let svg = run_plot(run, analysis, &RunPlot { units: *units, ..RunPlot::default() });
    write_plot(&svg, kind, path)
}

/// Writes a drawing as what its file is named.
pub(super) fn write_plot(svg: &str, kind: PlotKind, path: &Path) -> Result<(), WorkError> {
    match kind {
        PlotKind::Svg => write_whole(path, svg.as_bytes()),
        PlotKind::Png => write_whole(path, &png::render(svg, 2.0)?),
    }
}

pub(super) fn threads() -> usize {
    std::thread::available_parallelism().map_or(1, std::num::NonZero::get)
}
