//! `demo` on the terminal: runs it and names what it left.

use serde::Serialize;

use super::arguments::{Demo, Global};
use super::{Ended, note, say, units};
use crate::report::bench_fit;
use crate::report::layout::wrapped;
use crate::work::ExitStatus;
use crate::work::demo::{DemoRun, demo as run_demo};

pub(super) fn demo(arguments: &Demo, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    note(&format!("an invented shop is measured into {} …", arguments.into.display()));
    let runs = run_demo(&arguments.into, units)?;
    if global.json {
        let list: Vec<Named> = runs.iter().map(Named::of).collect();
        let mut text = serde_json::to_string_pretty(&list).unwrap_or_default();
        text.push('\n');
        return say(&text, ExitStatus::Done);
    }
    let mut text =
        String::from("The demonstration: every orifice, instrument and person in it is invented.\n");
    for run in &runs {
        text.push('\n');
        text.push_str(&wrapped("", "  ", &format!("{}: {}", run.outcome.run.orifice, run.about)));
        text.push_str(&wrapped("  ", "    ", &bench_fit::verdict_line(&run.outcome.fitted(), &units)));
        for (what, path) in [("run file", &run.file), ("readings", &run.readings), ("plot", &run.plot)] {
            text.push_str(&format!("  {what:<9} {}\n", path.display()));
        }
    }
    text.push_str("\nTry one yourself:\n");
    if let Some(first) = runs.first() {
        text.push_str(&format!("  ebbline bench fit {}\n", first.file.display()));
    }
    say(&text, ExitStatus::Done)
}

/// What `--json` says of one orifice.
#[derive(Serialize)]
struct Named {
    orifice: String,
    about: &'static str,
    verdict: String,
    run_file: String,
    readings: String,
    plot: String,
}

impl Named {
    fn of(run: &DemoRun) -> Self {
        let line = bench_fit::verdict_line(&run.outcome.fitted(), &crate::report::Units::default());
        Self {
            orifice: run.outcome.run.orifice.to_string(),
            about: run.about,
            verdict: line,
            run_file: run.file.display().to_string(),
            readings: run.readings.display().to_string(),
            plot: run.plot.display().to_string(),
        }
    }
}
