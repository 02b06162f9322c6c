//! What the benchmarks share: the run they work on, and a stopwatch that can be trusted.
//!
//! A figure is the median over several repetitions after a warm-up, with the fastest and the slowest beside it; a
//! repetition lasts long enough for the clock not to matter. Started by `cargo test --benches` (without `--bench`) each runs once,
//! so that a benchmark that no longer works is noticed. Left out: outlier models and comparison with an earlier run; the
//! machine's noise is shown, not removed.

#![allow(clippy::disallowed_methods, reason = "a stopwatch asks for the time")]

use std::hint::black_box;
use std::path::PathBuf;
use std::time::Instant;

use ebbline::bench::{Analysis, Questions, analyse};
use ebbline::entry::{PointReading, Readings, Run};
use ebbline::record::read_run;

/// How the benchmark was started.
pub(crate) struct Setting {
    /// Timed in earnest, or one repetition to see that it works.
    pub(crate) in_earnest: bool,
    /// Fewer repetitions.
    pub(crate) quick: bool,
    /// The run file.
    pub(crate) file: PathBuf,
}

impl Setting {
    /// From the command line: `--quick`, and the run file to work on instead of the committed one.
    pub(crate) fn from_arguments() -> Self {
        let arguments: Vec<String> = std::env::args().skip(1).collect();
        let given = |flag: &str| arguments.iter().any(|a| a == flag);
        let file = arguments.iter().find(|a| a.ends_with(".toml")).map_or_else(
            || PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/benchmarks/twenty_points.toml"),
            PathBuf::from,
        );
        Self { in_earnest: given("--bench"), quick: given("--quick"), file }
    }

    /// Repetitions: `full`, a third of it when quick, one when not in earnest.
    pub(crate) fn repetitions(&self, full: usize) -> usize {
        match (self.in_earnest, self.quick) {
            (false, _) => 1,
            (true, true) => full.div_ceil(3),
            (true, false) => full,
        }
    }
}

/// A run of steady points.
pub(crate) struct Prepared {
    /// The run.
    pub(crate) run: Run,
}

impl Prepared {
    /// Reads the run of `setting`.
    pub(crate) fn new(setting: &Setting) -> Self {
        Self { run: read_run(&setting.file).unwrap_or_else(|e| panic!("{e}")).value }
    }

    /// Its points.
    pub(crate) fn points(&self) -> &[PointReading] {
        match &self.run.readings {
            Readings::Points(points) => points,
            Readings::Series(_) => panic!("the benchmark needs a run of points"),
        }
    }

    /// From the points to the verdict.
    pub(crate) fn analyse(&self) -> Analysis {
        analyse(black_box(&self.run), self.points(), &Questions::default()).unwrap_or_else(|e| panic!("{e}"))
    }
}

/// Seconds a repetition took: fastest, median, slowest.
pub(crate) struct Seconds {
    /// Fastest.
    pub(crate) least: f64,
    /// Median.
    pub(crate) median: f64,
    /// Slowest.
    pub(crate) most: f64,
}

/// Times `work`, done `times` in a row in each of `repetitions` repetitions, after one that does not count; seconds of
/// once.
pub(crate) fn time(repetitions: usize, times: usize, mut work: impl FnMut()) -> Seconds {
    let mut once = || {
        let start = Instant::now();
        (0..times).for_each(|_| work());
        start.elapsed().as_secs_f64() / times as f64
    };
    once();
    let mut seconds: Vec<f64> = (0..repetitions).map(|_| once()).collect();
    seconds.sort_by(f64::total_cmp);
    Seconds { least: seconds[0], median: seconds[seconds.len() / 2], most: seconds[seconds.len() - 1] }
}
