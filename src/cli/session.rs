//! `session` on the terminal.

use serde::Serialize;

use super::arguments::{
    Global, ImportSessions, LeaveOutSession, ListSessions, Sessions, ShowSession, UptakeOf,
};
use super::{Ended, note, say, shelf, tell_notes, units};
use crate::report::layout::wrapped;
use crate::report::{json_text, session_list, session_shown, session_uptake, uptake_json};
use crate::work::ExitStatus;
use crate::work::sessions::{self, ImportedSession};
use crate::work::uptake::{UptakeRequest, session_uptake as work_out};

pub(super) fn session(verb: &Sessions, global: &Global) -> Result<ExitStatus, Ended> {
    match verb {
        Sessions::Enter(arguments) => super::enter::session::enter(arguments, global),
        Sessions::Log(arguments) => super::log::session(arguments, global),
        Sessions::Resume(arguments) => super::log::resume_session(arguments, global),
        Sessions::Import(arguments) => import(arguments, global),
        Sessions::List(arguments) => list(arguments, global),
        Sessions::Show(arguments) => show(arguments, global),
        Sessions::LeaveOut(arguments) => leave_out(arguments, global),
        Sessions::Uptake(arguments) => uptake(arguments, global),
    }
}

fn import(arguments: &ImportSessions, global: &Global) -> Result<ExitStatus, Ended> {
    let mut notes = Vec::new();
    let imported = sessions::import(&shelf(global)?, &arguments.files, &mut notes)?;
    tell_notes(&notes);
    for imported in &imported {
        let said: Vec<String> =
            imported.notes.iter().map(|note| format!("{}: {note}", imported.session)).collect();
        tell_notes(&said);
    }
    let text = if global.json {
        json_text(&imported.iter().map(JsonImported::of).collect::<Vec<_>>())
    } else {
        imported.iter().map(imported_line).collect()
    };
    say(&text, ExitStatus::Done)
}

fn imported_line(imported: &ImportedSession) -> String {
    let (session, file) = (imported.session, imported.file.display());
    let what = if imported.new { "imported from" } else { "is there already, the same bytes as" };
    let diver =
        if imported.diver_created { "; the diver is new and was created with the code only" } else { "" };
    let orifice =
        if imported.orifice_created { "; the orifice is new and was created with its name only" } else { "" };
    wrapped("", "       ", &format!("{session}  {} {what} {file}{diver}{orifice}", imported.diver))
}

#[derive(Serialize)]
struct JsonImported {
    session: String,
    diver: String,
    file: String,
    new: bool,
    diver_created: bool,
    orifice_created: bool,
    notes: Vec<String>,
}

impl JsonImported {
    fn of(imported: &ImportedSession) -> Self {
        Self {
            session: imported.session.to_string(),
            diver: imported.diver.clone(),
            file: imported.file.display().to_string(),
            new: imported.new,
            diver_created: imported.diver_created,
            orifice_created: imported.orifice_created,
            notes: imported.notes.clone(),
        }
    }
}

fn list(arguments: &ListSessions, global: &Global) -> Result<ExitStatus, Ended> {
    let (listed, more) = sessions::list(&shelf(global)?, arguments.diver.as_deref(), arguments.all)?;
    let text = if global.json { session_list::json(&listed) } else { session_list::text(&listed, more) };
    say(&text, ExitStatus::Done)
}

fn show(arguments: &ShowSession, global: &Global) -> Result<ExitStatus, Ended> {
    let kept = sessions::show(&shelf(global)?, &arguments.session)?;
    let text = if global.json {
        session_shown::json(&kept.shown())
    } else {
        session_shown::text(&kept.shown(), &units(global))
    };
    say(&text, ExitStatus::Done)
}

fn leave_out(arguments: &LeaveOutSession, global: &Global) -> Result<ExitStatus, Ended> {
    let stretch = arguments.from.as_deref().zip(arguments.until.as_deref());
    let by = arguments.by.as_deref();
    let (number, stretch_s) =
        sessions::leave_out(&shelf(global)?, &arguments.session, stretch, &arguments.why, by)?;
    let text = if global.json {
        json_text(&serde_json::json!({
            "session": number.to_string(),
            "from_s": stretch_s.map(|(from_s, _)| from_s),
            "until_s": stretch_s.map(|(_, until_s)| until_s),
            "why": arguments.why.trim(),
        }))
    } else if stretch_s.is_some() {
        wrapped(
            "",
            "  ",
            &format!(
                "{number}: the stretch is left out of every slope; session uptake {number} tells what is left"
            ),
        )
    } else {
        wrapped(
            "",
            "  ",
            &format!("{number} is left out of the diver's uptake; named by its number it still counts"),
        )
    };
    say(&text, ExitStatus::Done)
}

fn uptake(arguments: &UptakeOf, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let outcome = work_out(&UptakeRequest {
        of: arguments.of.clone(),
        monte_carlo: arguments.monte_carlo,
        book: global.book.clone(),
        plot: arguments.plot.clone(),
        units,
    })?;
    let named = outcome.named();
    let reported = outcome.reported(&named);
    if let Some(why) = session_uptake::why_not(&reported) {
        note(&format!("ebbline: {why}"));
    }
    for plot in &outcome.plots {
        note(&format!("plot written to {}", plot.display()));
    }
    let text =
        if global.json { uptake_json::document(&reported) } else { session_uptake::text(&reported, &units) };
    say(&text, outcome.status())
}
