//! `book export`: everything in the book as TOML and CSV that `add` and `import` take back.
//!
//! One folder a kind. A run is written as the files it came from, to the byte, wherever those still say what the book
//! says; a point that was left out since is added at the end of its TOML; else the run is written as it stands. So is a
//! session, with the run file its line comes from; what was left out of it stands beside them, with the command that leaves
//! it out again, because a session file has no words for it. CSV holds
//! numbers, times and fixed words and nothing a spreadsheet would run: what a person typed stands in TOML. The export is
//! written beside its folder and put in place when it is whole.
//!
//! Left out: salts and links (a backup keeps them), sessions and divers unless they were asked for, readings of a point
//! as they were before a correction but for pressure and flow.

mod certificates;
mod decisions;
mod folder;
mod live_files;
mod run_files;
mod session_files;
mod sessions;
mod spreadsheet;

use std::collections::BTreeSet;
use std::path::Path;

use serde::Serialize;

use super::WorkError;
use super::book::{place_of, said_copy};
use super::registers::{Found, RegisterKind, command, revisions};
use super::shelf::{Shelf, meter_of, stamped, transducer_of};
use crate::book::{Book, CopyKind, Kept, Origin, RunQuery, RunState};
use crate::entry::{Acceptance, Diver, FirstStage, Id, Instrument, Meter, Orifice, RunNumber, Transducer};
use crate::record::{RegisterEntry, Registers, write_register};
use crate::report::export::{self as words, Exported, Form};
use folder::Folder;

/// Up to this number runs stand in one folder; with more, each thousand has its own, so that names sort as numbers.
const ONE_FOLDER: u32 = 9_999;

/// Exports the book into `to`, with divers only if asked for.
///
/// # Errors
/// A folder that holds something else than an earlier export; no book, or one that cannot be read; a disk that cannot be
/// written.
pub fn export(shelf: &Shelf, to: &Path, with_divers: bool) -> Result<Exported, WorkError> {
    // Divers are noted as copied, so that forgetting one can name this export.
    let mut book = if with_divers { shelf.to_change()? } else { shelf.to_read()? };
    folder::may_be_written(to)?;
    let mut folder = Folder::begin(to)?;
    let exported = fill(&mut folder, &book, to, with_divers);
    let exported = match exported {
        Ok(exported) => exported,
        Err(error) => {
            folder.give_up();
            return Err(error);
        }
    };
    folder.put_in_place(to)?;
    if with_divers {
        stamped(|stamp| book.note_copy(CopyKind::Export, &place_of(to), stamp))??;
    }
    Ok(exported)
}

fn fill(folder: &mut Folder, book: &Book, to: &Path, with_divers: bool) -> Result<Exported, WorkError> {
    let mut exported = Exported {
        folder: to.display().to_string(),
        runs: Vec::new(),
        sessions: Vec::new(),
        sessions_behind: 0,
        left_out: Vec::new(),
        entries: Vec::new(),
        judgements: 0,
        certificates: 0,
        with_divers,
        blocks: false,
        session_blocks: false,
        notes: Vec::new(),
    };
    let mut listed = Vec::new();
    for kind in RegisterKind::ALL {
        if kind == RegisterKind::Diver && !with_divers {
            continue;
        }
        let count = entries(folder, book, kind, &mut listed, &mut exported.notes)?;
        exported.entries.push((kind.name(), count));
    }
    folder.write("entries.toml", toml_text(&Listed { entry: listed }).as_bytes())?;
    runs(folder, book, &mut exported)?;
    exported.certificates = certificates::write(folder, book)?;
    let info = book.info()?;
    if with_divers {
        sessions::sessions(folder, book, &mut exported)?;
    } else {
        exported.sessions_behind = info.sessions;
    }
    folder.write("book.toml", toml_text(&about(book, &info)?).as_bytes())?;
    folder.write("README.txt", words::readme(&exported, &info.head.to_string()).as_bytes())?;
    Ok(exported)
}

/// A document of ours as TOML; there is nothing in one that TOML cannot say.
fn toml_text(document: &impl Serialize) -> String {
    toml::to_string(document).unwrap_or_default()
}

// ---- registers ----

#[derive(Serialize)]
struct Listed {
    entry: Vec<ListedEntry>,
}

/// Where an entry stands in the export, and since when it stands in the book.
#[derive(Serialize)]
struct ListedEntry {
    register: &'static str,
    id: String,
    revision: u32,
    at: String,
    file: String,
}

const fn folder_of(kind: RegisterKind) -> &'static str {
    match kind {
        RegisterKind::Orifice => "orifices",
        RegisterKind::Instrument => "instruments",
        RegisterKind::FirstStage => "first-stages",
        RegisterKind::Diver => "divers",
        RegisterKind::Acceptance => "acceptances",
        RegisterKind::Shop => "shop",
    }
}

fn names<T: Kept>(book: &Book, of: impl Fn(&T) -> Option<&Id>) -> Result<Vec<String>, WorkError> {
    let entries = book.entries::<T>(None, None)?;
    Ok(entries.iter().filter_map(|found| of(&found.entry)).map(ToString::to_string).collect())
}

fn entries(
    folder: &mut Folder,
    book: &Book,
    kind: RegisterKind,
    listed: &mut Vec<ListedEntry>,
    notes: &mut Vec<String>,
) -> Result<usize, WorkError> {
    let ids = match kind {
        RegisterKind::Orifice => names(book, |entry: &Orifice| Some(&entry.id))?,
        RegisterKind::Instrument => names(book, |entry: &Instrument| Some(&entry.id))?,
        RegisterKind::FirstStage => names(book, |entry: &FirstStage| Some(&entry.id))?,
        RegisterKind::Diver => names(book, |entry: &Diver| Some(&entry.id))?,
        RegisterKind::Acceptance => names(book, |entry: &Acceptance| entry.id.as_ref())?,
        RegisterKind::Shop => book.shop()?.map(|_| command(kind).to_owned()).into_iter().collect(),
    };
    let mut stems = BTreeSet::new();
    for id in &ids {
        let stem = file_stem(id, &mut stems);
        for (place, found) in revisions(book, kind, id)?.iter().enumerate() {
            let file = match place {
                0 => format!("{}/{stem}.toml", folder_of(kind)),
                _ => format!("{}/earlier/{stem}.{}.toml", folder_of(kind), found.revision),
            };
            entry(folder, &file, found, notes)?;
            listed.push(ListedEntry {
                register: kind.name(),
                id: id.clone(),
                revision: found.revision,
                at: found.at.to_rfc3339(),
                file,
            });
        }
    }
    Ok(ids.len())
}

fn entry(folder: &mut Folder, file: &str, found: &Found, notes: &mut Vec<String>) -> Result<(), WorkError> {
    let mut written = found.entry.clone();
    if let RegisterEntry::Shop(shop) = &mut written
        && let Some(logo) = &mut shop.logo
    {
        // Each revision may have its own logo under the same name.
        let kind = if logo.file_name.to_lowercase().ends_with(".svg") { "svg" } else { "png" };
        logo.file_name = format!("logo-{}.{kind}", found.revision);
        let beside = file.rsplit_once('/').map_or("", |(folder, _)| folder);
        folder.write(&format!("{beside}/{}", logo.file_name), &logo.bytes)?;
        notes.push(format!("{file}: the logo is called {} here", logo.file_name));
    }
    folder.write(file, write_register(&written).as_bytes())
}

/// A name for the file of an entry: its id, but for names that some systems keep for themselves or hide.
fn file_stem(id: &str, taken: &mut BTreeSet<String>) -> String {
    const DEVICES: [&str; 6] = ["con", "prn", "aux", "nul", "com", "lpt"];
    let lower = id.to_lowercase();
    let first = lower.split('.').next().unwrap_or_default();
    let device = DEVICES.iter().any(|device| {
        first
            .strip_prefix(device)
            .is_some_and(|rest| rest.chars().all(|c| c.is_numeric()) && rest.chars().count() < 2)
    });
    let mut stem = if device || id.starts_with(['.', '-']) { format!("_{id}") } else { id.to_owned() };
    while !taken.insert(stem.to_lowercase()) {
        stem.insert(0, '_');
    }
    stem
}

// ---- runs ----

/// The registers as they stand, for reading the files of a run again.
struct AsTheyStand<'b>(&'b Book);

impl Registers for AsTheyStand<'_> {
    fn meter(&self, id: &Id) -> Option<Meter> {
        meter_of(self.0, id).ok().flatten()
    }

    fn transducer(&self, id: &Id) -> Option<Transducer> {
        transducer_of(self.0, id).ok().flatten()
    }

    fn acceptance(&self, id: &Id) -> Option<Acceptance> {
        self.0.entry::<Acceptance>(id).ok().flatten().map(|found| found.entry)
    }
}

fn runs(folder: &mut Folder, book: &Book, exported: &mut Exported) -> Result<(), WorkError> {
    let rows = book.runs(&RunQuery::default())?;
    let mut numbers: Vec<RunNumber> = rows.iter().map(|row| row.number).collect();
    numbers.sort_unstable();
    exported.blocks = numbers.last().is_some_and(|last| last.get() > ONE_FOLDER);
    let mut decisions = decisions::Sheets::default();
    for number in numbers {
        let record = book.run(number)?;
        decisions.take(&record);
        let source = book.source_of(number)?;
        let place = if exported.blocks {
            format!("runs/{:07}/{number}", number.get() / 1000 * 1000)
        } else {
            format!("runs/{number}")
        };
        if record.origin == Origin::Logged
            && let Some((raw, live)) = live_files::of(book, number)?
        {
            folder.write(&format!("{place}/{number}-raw.csv"), raw.as_bytes())?;
            folder.write(&format!("{place}/{number}-live.toml"), live.as_bytes())?;
        }
        let Some(files) = run_files::of(&record, source.as_ref(), &AsTheyStand(book)) else {
            exported.notes.push(format!("{number} is open and has no point yet: it is not exported"));
            continue;
        };
        let toml_file = format!("{place}/{number}.toml");
        folder.write(&toml_file, &files.toml)?;
        folder.write(&format!("{place}/{}", files.readings_name), &files.readings)?;
        if record.state == RunState::Open {
            exported.notes.push(format!("{number} is still open: an import takes it as complete"));
        }
        if files.form == Form::Incomplete {
            exported.notes.push(format!(
                "{number}: a run file cannot say all that the book holds of it, such as a quantity read at some points only"
            ));
        }
        exported.runs.push((number, toml_file, files.form));
    }
    exported.judgements = decisions.judgements();
    for (name, bytes) in decisions.files() {
        folder.write(&format!("judgements/{name}"), &bytes)?;
    }
    Ok(())
}

// ---- the book ----

#[derive(Serialize)]
struct About {
    head: String,
    begun: String,
    form: u32,
    records: u64,
    runs: u64,
    sessions: u64,
    program: &'static str,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    copy: Vec<AboutCopy>,
}

#[derive(Serialize)]
struct AboutCopy {
    kind: &'static str,
    place: String,
    at: String,
}

fn about(book: &Book, info: &crate::book::Info) -> Result<About, WorkError> {
    let copy = book
        .copies()?
        .into_iter()
        .map(|copy| AboutCopy { kind: said_copy(copy.kind), place: copy.place, at: copy.at.to_rfc3339() })
        .collect();
    Ok(About {
        head: info.head.to_string(),
        begun: info.begun.to_rfc3339(),
        form: info.version,
        records: info.head.seq,
        runs: info.runs,
        sessions: info.sessions,
        program: concat!("ebbline ", env!("CARGO_PKG_VERSION")),
        copy,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_file_is_called_as_the_entry_unless_a_system_would_not_have_it() {
        let mut taken = BTreeSet::new();
        let mut stem = |id: &str| file_stem(id, &mut taken);
        assert_eq!(stem("CMF-0417"), "CMF-0417");
        assert_eq!(stem("Ünit_3.b"), "Ünit_3.b");
        for (id, name) in
            [("con", "_con"), ("LPT1", "_LPT1"), ("nul.2", "_nul.2"), ("..", "_.."), ("-x", "_-x")]
        {
            assert_eq!(stem(id), name);
        }
        assert_eq!(stem("console"), "console");
        assert_eq!(stem("com12"), "com12");
        // The entry of that very name steps aside.
        assert_eq!(stem("_CON"), "__CON");
    }
}
