//! What an export says of itself.

use std::fmt::Write as _;

use serde_json::json;

use super::json_text;
use super::layout::{counted, wrapped};
use crate::entry::RunNumber;

/// How a run was written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RunForm {
    /// As the files it came from, to the byte.
    Original,
    /// The same, with points that were left out since at the end of the run file.
    LeftOutAdded,
    /// Written as it stands in the book.
    Written,
    /// The same, but a file cannot say all of it.
    Incomplete,
}

impl RunForm {
    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Original => "original",
            Self::LeftOutAdded => "original, points left out added",
            Self::Written => "written",
            Self::Incomplete => "written, incomplete",
        }
    }
}

/// What was exported.
#[derive(Debug, Clone, PartialEq)]
pub struct Exported {
    /// The folder.
    pub folder: String,
    /// Its runs: number, run file, how it was written.
    pub runs: Vec<(RunNumber, String, RunForm)>,
    /// How many entries of each register.
    pub entries: Vec<(&'static str, usize)>,
    /// How many judgements.
    pub judgements: usize,
    /// Whether divers are in it.
    pub with_divers: bool,
    /// Whether each thousand of runs has a folder of its own.
    pub blocks: bool,
    /// What is to be said of single runs and entries.
    pub notes: Vec<String>,
}

impl Exported {
    fn count(&self, form: RunForm) -> usize {
        self.runs.iter().filter(|(_, _, of)| *of == form).count()
    }
}

/// What was exported, as text.
#[must_use]
pub fn text(exported: &Exported) -> String {
    let mut parts =
        vec![counted(exported.runs.len() as u64, "run"), counted(exported.judgements as u64, "judgement")];
    let kept = exported.entries.iter().filter(|(_, count)| *count > 0);
    parts.extend(kept.map(|(register, count)| counted(*count as u64, register)));
    let mut text = wrapped("", "  ", &format!("{}: {}", exported.folder, parts.join(", ")));
    let divers = if exported.with_divers {
        "Divers are in it: whoever has the folder has their details. The book knows of it, and names it when one is forgotten."
    } else {
        "Divers are not in it: --with-divers takes them too."
    };
    text.push_str(&wrapped("  ", "  ", divers));
    text.push_str("  README.txt says what is what, and how a new book takes it back.\n");
    text
}

/// What was exported, as JSON.
#[must_use]
pub fn json(exported: &Exported) -> String {
    let run = |(number, file, form): &(RunNumber, String, RunForm)| json!({ "run": number.to_string(), "file": file, "form": form.name() });
    let entries: serde_json::Map<String, serde_json::Value> =
        exported.entries.iter().map(|(name, n)| (name.replace(' ', "_"), (*n).into())).collect();
    json_text(&json!({
        "folder": exported.folder,
        "runs": exported.runs.iter().map(run).collect::<Vec<_>>(),
        "entries": entries,
        "judgements": exported.judgements,
        "with_divers": exported.with_divers,
        "notes": exported.notes,
    }))
}

/// The README of the folder; `head` is the head of the chain when it was made.
#[must_use]
pub fn readme(exported: &Exported, head: &str) -> String {
    let mut text = String::from("Export of an Ebbline book\n\n");
    let mut paragraph = |says: &str| {
        text.push_str(&wrapped("", "", says));
        text.push('\n');
    };
    paragraph(
        "Everything the book holds, in files one can read without the program: TOML is text for people, CSV holds only \
         numbers, times and fixed words, so that a spreadsheet has nothing to run. The folder is made anew with each \
         export; keep your own files elsewhere. It is no substitute for a backup: only the book carries the chain that \
         shows whether something was changed.",
    );
    text.push_str("The head of the book's chain when this was made\n");
    let _ = writeln!(text, "  {head}\n");
    text.push_str("What is where\n");
    let mut row = |name: &str, says: &str| {
        text.push_str(&wrapped(&format!("  {name:<14}"), &" ".repeat(16), says));
    };
    let runs = if exported.blocks { "runs/*/" } else { "runs/" };
    row("acceptances/", "limits orifices are accepted by, one file each");
    row("orifices/", "the register of orifices, one file each");
    row("instruments/", "flow meters, transducers and the rest, with their papers");
    row("first-stages/", "first stages");
    if exported.with_divers {
        row("divers/", "divers: personal, hand on with care");
    }
    row("shop/", "what stands on certificates, and the logo");
    row(".../earlier/", "earlier revisions of an entry; the number before .toml is the revision");
    row(runs, "a folder for each run: the run file and the readings it names");
    row(
        "judgements/",
        "judgements.csv: each with its figures as they stood, the last one of a run holds; parts.csv: the \
         uncertainty of each by its sources; changes.csv: points corrected, struck or left out; texts.toml: who said \
         what about them",
    );
    row("entries.toml", "which entry stands in which file, its revision, and when that was written");
    row("book.toml", "the book itself: its head, when it was begun, copies it knows of");
    row("contents.txt", "every file, by which the program knows this folder again");
    text.push_str("\nHow runs were written\n");
    let count = |form| exported.count(form);
    for (form, says) in [
        (RunForm::Original, "as the files they were imported from, to the byte"),
        (RunForm::LeftOutAdded, "the same, with points left out since at the end of the run file"),
        (
            RunForm::Written,
            "written as they stand in the book: typed runs, and imported ones whose files would read \
             differently today (an instrument's papers have changed), name readings elsewhere, or hold more than numbers",
        ),
        (RunForm::Incomplete, "written, but a file cannot say all of it"),
    ] {
        if count(form) > 0 {
            text.push_str(&wrapped(&format!("  {:>6}  ", count(form)), "          ", says));
        }
    }
    for note in &exported.notes {
        text.push_str(&wrapped("  - ", "    ", note));
    }
    text.push_str("\nTaking it back into a new book (in this folder, in this order)\n\n");
    let mut command = |line: &str| {
        let _ = writeln!(text, "  ebbline --book NEW.db {line}");
    };
    let has = |register: &str| exported.entries.iter().any(|(name, n)| *name == register && *n > 0);
    for (register, line) in [
        ("acceptance", "acceptance add acceptances/*.toml"),
        ("orifice", "orifice add orifices/*.toml"),
        ("instrument", "instrument add instruments/*.toml"),
        ("first stage", "first-stage add first-stages/*.toml"),
        ("diver", "diver add divers/*.toml"),
        ("shop", "shop edit shop/shop.toml"),
    ] {
        if has(register) {
            command(line);
        }
    }
    match (exported.runs.is_empty(), exported.blocks) {
        (true, _) => {}
        (false, false) => command("bench import runs/*/*.toml"),
        (false, true) => command("bench import runs/0000000/*/*.toml     (and so on, folder by folder)"),
    }
    text.push('\n');
    text.push_str(&wrapped(
        "",
        "",
        "Runs are numbered anew in the order they are imported; where none is missing they keep their numbers. What a run \
         gives is then the same to the last bit. Judgements are a person's: give bench accept again, in the order of \
         judgements.csv, and the comparison of each run with the one before is there again too.",
    ));
    text
}
