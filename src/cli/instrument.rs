//! `instrument try` and `instrument ports` on the terminal.

use std::io::{self, IsTerminal as _};

use super::arguments::{Global, Try};
use super::{Ended, note, say, shelf, tell_notes, units};
use crate::report::{instrument_trial, port_list, typed};
use crate::work::ExitStatus;
use crate::work::instruments::{self, TrialRequest};

pub(super) fn try_instrument(arguments: &Try, global: &Global) -> Result<ExitStatus, Ended> {
    let request = TrialRequest {
        what: arguments.what.clone(),
        lasts: arguments.lasts,
        book: global.book.as_ref().map(|book| book.display().to_string()),
    };
    if io::stderr().is_terminal() {
        note(&format!(
            "listening for {}; where that does not do well, other settings are tried, which may take a minute or two …",
            typed::span(arguments.lasts.as_s())
        ));
    }
    let mut notes = Vec::new();
    let trial = instruments::try_instrument(&shelf(global)?, &request, &mut notes)?;
    tell_notes(&notes);
    let status = instruments::status_of(&trial);
    if status != ExitStatus::Done {
        note(&format!("ebbline: {}", instrument_trial::summary(&trial)));
    }
    let text = if global.json {
        instrument_trial::json(&trial)
    } else {
        instrument_trial::text(&trial, &units(global))
    };
    say(&text, status)
}

pub(super) fn ports(global: &Global) -> Result<ExitStatus, Ended> {
    let list = instruments::ports(&shelf(global)?)?;
    let text = if global.json { port_list::json(&list) } else { port_list::text(&list) };
    say(&text, ExitStatus::Done)
}
