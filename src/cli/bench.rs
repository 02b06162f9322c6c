//! `bench fit` on the terminal.

use super::arguments::{Fit, Global};
use super::{Ended, note, say, units};
use crate::report::{bench_fit, bench_json};
use crate::work::ExitStatus;
use crate::work::fit::{FitRequest, fit as fit_run};

pub(super) fn fit(arguments: &Fit, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let outcome = fit_run(&FitRequest {
        run: arguments.run.clone(),
        at: arguments.at.clone(),
        for_flow: arguments.for_flow.clone(),
        barometer: arguments.barometer,
        monte_carlo: arguments.monte_carlo,
        plot: arguments.plot.clone(),
        units,
    })?;
    let fitted = outcome.fitted();
    let status = outcome.status();
    if status == ExitStatus::Unfavourable {
        note(&format!("ebbline: {}: {}", outcome.run.orifice, bench_fit::verdict_line(&fitted, &units)));
    }
    if let Some(plot) = &arguments.plot {
        note(&format!("plot written to {}", plot.display()));
    }
    let text = if global.json { bench_json::document(&fitted) } else { bench_fit::sheet(&fitted, &units) };
    say(&text, status)
}
