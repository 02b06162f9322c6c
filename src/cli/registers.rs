//! The registers on the terminal.

use std::path::PathBuf;

use super::arguments::{
    Acceptances, Add, Divers, Edit, EditShop, Entries, FirstStages, Forget, Global, Instruments, One,
    Orifices, ShopVerbs, ShowOrifice,
};
use super::{Ended, instrument, note, say, shelf, tell_notes, units};
use crate::report::{orifice_history, registers as words};
use crate::work::fit::names_a_file;
use crate::work::history::{self, HistoryRequest};
use crate::work::registers::{self, Given, RegisterKind};
use crate::work::{ExitStatus, WorkError};

pub(super) fn orifice(verb: &Orifices, global: &Global) -> Result<ExitStatus, Ended> {
    let kind = RegisterKind::Orifice;
    match verb {
        Orifices::Add(Add { what, flags }) => add(kind, what, &flags.given, global),
        Orifices::Edit(Edit { id, file, flags }) => edit(kind, id, file.as_ref(), &flags.given, global),
        Orifices::List(list) => self::list(kind, list, global),
        Orifices::Show(show) => show_orifice(show, global),
    }
}

pub(super) fn instrument(verb: &Instruments, global: &Global) -> Result<ExitStatus, Ended> {
    let kind = RegisterKind::Instrument;
    match verb {
        Instruments::Add(Add { what, flags }) => add(kind, what, &flags.given, global),
        Instruments::Edit(Edit { id, file, flags }) => edit(kind, id, file.as_ref(), &flags.given, global),
        Instruments::List(list) => self::list(kind, list, global),
        Instruments::Show(One { id, all }) => show(kind, id, *all, global),
        Instruments::Ports => instrument::ports(global),
        Instruments::Try(arguments) => instrument::try_instrument(arguments, global),
    }
}

pub(super) fn first_stage(verb: &FirstStages, global: &Global) -> Result<ExitStatus, Ended> {
    let kind = RegisterKind::FirstStage;
    match verb {
        FirstStages::Add(Add { what, flags }) => add(kind, what, &flags.given, global),
        FirstStages::Edit(Edit { id, file, flags }) => edit(kind, id, file.as_ref(), &flags.given, global),
        FirstStages::List(list) => self::list(kind, list, global),
        FirstStages::Show(One { id, all }) => show(kind, id, *all, global),
    }
}

pub(super) fn diver(verb: &Divers, global: &Global) -> Result<ExitStatus, Ended> {
    let kind = RegisterKind::Diver;
    match verb {
        Divers::Add(Add { what, flags }) => add(kind, what, &flags.given, global),
        Divers::Edit(Edit { id, file, flags }) => edit(kind, id, file.as_ref(), &flags.given, global),
        Divers::List(list) => self::list(kind, list, global),
        Divers::Show(One { id, all }) => show(kind, id, *all, global),
        Divers::Forget(Forget { id, why }) => {
            let forgotten = registers::forget(&shelf(global)?, id, why)?;
            let text = if global.json {
                words::forgotten_json(&forgotten)
            } else {
                words::forgotten_text(&forgotten)
            };
            say(&text, ExitStatus::Done)
        }
    }
}

pub(super) fn acceptance(verb: &Acceptances, global: &Global) -> Result<ExitStatus, Ended> {
    let kind = RegisterKind::Acceptance;
    match verb {
        Acceptances::Add(Add { what, flags }) => add(kind, what, &flags.given, global),
        Acceptances::Edit(Edit { id, file, flags }) => edit(kind, id, file.as_ref(), &flags.given, global),
        Acceptances::List(list) => self::list(kind, list, global),
        Acceptances::Show(One { id, all }) => show(kind, id, *all, global),
    }
}

pub(super) fn shop(verb: &ShopVerbs, global: &Global) -> Result<ExitStatus, Ended> {
    match verb {
        ShopVerbs::Show(one) => show(RegisterKind::Shop, "shop", one.all, global),
        ShopVerbs::Edit(EditShop { file, flags }) => {
            edit(RegisterKind::Shop, "shop", file.as_ref(), &flags.given, global)
        }
    }
}

type Flag = (String, String);

fn add(kind: RegisterKind, what: &[String], flags: &[Flag], global: &Global) -> Result<ExitStatus, Ended> {
    let mut notes = Vec::new();
    let saved = registers::add(&shelf(global)?, kind, &to_add(what, flags)?, &mut notes)?;
    tell_notes(&notes);
    let text =
        if global.json { words::saved_json(&saved) } else { saved.iter().map(words::saved_text).collect() };
    say(&text, ExitStatus::Done)
}

/// Files without flags; or flags, in front of which the name may stand.
fn to_add(what: &[String], flags: &[Flag]) -> Result<Vec<Given>, Ended> {
    let files = what.iter().filter(|what| names_a_file(what)).count();
    if files > 0 {
        if files < what.len() || !flags.is_empty() {
            return Err(WorkError::FilesOrFlags.into());
        }
        return Ok(what.iter().map(|file| Given::File(PathBuf::from(file))).collect());
    }
    let named = match what {
        [] if flags.is_empty() => return Err(WorkError::NothingGiven.into()),
        [] => None,
        [id] => Some(("id".to_owned(), id.clone())),
        _ => return Err(WorkError::FilesOrFlags.into()),
    };
    Ok(vec![Given::Flags(named.into_iter().chain(flags.iter().cloned()).collect())])
}

fn edit(
    kind: RegisterKind,
    id: &str,
    file: Option<&PathBuf>,
    flags: &[Flag],
    global: &Global,
) -> Result<ExitStatus, Ended> {
    let given = match file {
        Some(_) if !flags.is_empty() => return Err(WorkError::FilesOrFlags.into()),
        Some(file) => Given::File(file.clone()),
        None => Given::Flags(flags.to_vec()),
    };
    let mut notes = Vec::new();
    let saved = registers::edit(&shelf(global)?, kind, id, &given, &mut notes)?;
    tell_notes(&notes);
    let text = if global.json { words::saved_json(&[saved]) } else { words::saved_text(&saved) };
    say(&text, ExitStatus::Done)
}

fn list(kind: RegisterKind, list: &Entries, global: &Global) -> Result<ExitStatus, Ended> {
    let listed = registers::list(&shelf(global)?, kind, list.all)?;
    let text =
        if global.json { words::list_json(&listed) } else { words::list_text(&listed, &units(global)) };
    say(&text, ExitStatus::Done)
}

fn show(kind: RegisterKind, id: &str, all: bool, global: &Global) -> Result<ExitStatus, Ended> {
    let shown = registers::show(&shelf(global)?, kind, id, all)?;
    let text = if global.json { words::json(&shown) } else { words::text(&shown, &units(global)) };
    say(&text, ExitStatus::Done)
}

fn show_orifice(show: &ShowOrifice, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let request = HistoryRequest { orifice: show.id.clone(), all: show.all, plot: show.plot.clone(), units };
    let (entry, history) = history::show(&shelf(global)?, &request)?;
    if let Some(plot) = &show.plot {
        note(&format!("plot written to {}", plot.display()));
    }
    let text = if global.json {
        orifice_history::json(&entry, &history)
    } else {
        orifice_history::text(&entry, &history, &units)
    };
    say(&text, ExitStatus::Done)
}
