//! `bench` on the terminal.

use serde::Serialize;

use super::arguments::{Accept, Fit, Global, Import, LeaveOut, List, Show};
use super::{Ended, note, say, shelf, tell_notes, units};
use crate::report::layout::wrapped;
use crate::report::{bench_fit, bench_json, json_text, run_list, run_shown};
use crate::work::ExitStatus;
use crate::work::fit::{FitRequest, fit as fit_run};
use crate::work::runs::{self, Imported};

pub(super) fn fit(arguments: &Fit, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let outcome = fit_run(&FitRequest {
        run: arguments.run.clone(),
        at: arguments.at.clone(),
        for_flow: arguments.for_flow.clone(),
        barometer: arguments.barometer,
        monte_carlo: arguments.monte_carlo,
        book: global.book.clone(),
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

pub(super) fn import(arguments: &Import, global: &Global) -> Result<ExitStatus, Ended> {
    let mut notes = Vec::new();
    let mut closed = None;
    let imported = runs::import(&shelf(global)?, &arguments.files, &mut notes, |imported| {
        // Told as soon as it is on the disk, so that what was told is there whatever happens next.
        if !global.json && closed.is_none() {
            closed = say(&imported_line(imported), ExitStatus::Done).err();
        }
    })?;
    tell_notes(&notes);
    for imported in &imported {
        let said: Vec<String> = imported.notes.iter().map(|n| format!("{}: {n}", imported.run)).collect();
        tell_notes(&said);
    }
    if let Some(ended) = closed {
        return Err(ended);
    }
    if !global.json {
        return Ok(ExitStatus::Done);
    }
    say(&json_text(&imported.iter().map(JsonImported::of).collect::<Vec<_>>()), ExitStatus::Done)
}

fn imported_line(imported: &Imported) -> String {
    let (run, file) = (imported.run, imported.file.display());
    let what = if imported.new { "imported from" } else { "is there already, the same bytes as" };
    let bare =
        if imported.orifice_created { "; the orifice is new and was created with its name only" } else { "" };
    wrapped("", "       ", &format!("{run}  {} {what} {file}{bare}", imported.orifice))
}

#[derive(Serialize)]
struct JsonImported {
    run: String,
    orifice: String,
    file: String,
    new: bool,
    orifice_created: bool,
    notes: Vec<String>,
}

impl JsonImported {
    fn of(imported: &Imported) -> Self {
        Self {
            run: imported.run.to_string(),
            orifice: imported.orifice.clone(),
            file: imported.file.display().to_string(),
            new: imported.new,
            orifice_created: imported.orifice_created,
            notes: imported.notes.clone(),
        }
    }
}

pub(super) fn leave_out(arguments: &LeaveOut, global: &Global) -> Result<ExitStatus, Ended> {
    let by = arguments.by.as_deref();
    let number = runs::leave_out(&shelf(global)?, &arguments.run, arguments.point, &arguments.why, by)?;
    let text = if global.json {
        json_text(
            &serde_json::json!({ "run": number.to_string(), "point": arguments.point, "why": arguments.why.trim() }),
        )
    } else {
        wrapped(
            "",
            "  ",
            &format!(
                "{number}: point {} is left out of the line; judge it again: bench accept {number}",
                arguments.point
            ),
        )
    };
    say(&text, ExitStatus::Done)
}

pub(super) fn accept(arguments: &Accept, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let judged =
        runs::accept(&shelf(global)?, &arguments.run, arguments.by.as_deref(), arguments.remark.as_deref())?;
    let fitted = bench_fit::Fitted {
        run: &judged.run,
        analysis: &judged.analysis,
        monte_carlo: None,
        low_points: None,
        notes: &[],
    };
    let text = if global.json {
        json_text(&run_shown::judgement_json(&judged.decision, judged.number))
    } else {
        let line = bench_fit::verdict_line(&fitted, &units);
        let mut text = wrapped("", "  ", &format!("{} {}: {line}", judged.number, judged.run.orifice));
        text.push_str(&wrapped("  ", "  ", "kept in the book with its figures, whatever the verdict"));
        text
    };
    // Judging is done whatever the verdict; the verdict itself is what `bench fit` answers with.
    say(&text, ExitStatus::Done)
}

pub(super) fn list(arguments: &List, global: &Global) -> Result<ExitStatus, Ended> {
    let (listed, more) = runs::list(&shelf(global)?, arguments.all)?;
    let text =
        if global.json { run_list::json(&listed) } else { run_list::text(&listed, more, &units(global)) };
    say(&text, ExitStatus::Done)
}

pub(super) fn show(arguments: &Show, global: &Global) -> Result<ExitStatus, Ended> {
    let shown = runs::show(&shelf(global)?, &arguments.run)?;
    let text = if global.json { run_shown::json(&shown) } else { run_shown::text(&shown, &units(global)) };
    say(&text, ExitStatus::Done)
}
