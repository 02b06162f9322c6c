//! The registers: entries added, edited, listed, shown; a diver forgotten.

use std::path::PathBuf;

use super::shelf::{Shelf, stamped};
use super::{WorkError, runs};
use crate::book::{
    Book, BookError, CopyKind, CopyMade, Entry, Forgotten, Kept, Register, Registered, RunRow,
};
use crate::clock;
use crate::entry::{Acceptance, Diver, FirstStage, Id, Instrument, Orifice, Shop};
use crate::record::{RegisterEntry, files_beside, from_flags, read_register_as, write_register};
use crate::report::registers::{
    AnyEntry, CopyNamed, EntryList, ForgottenDiver, ListedEntry, Revision, Saved, ShownEntry,
};
use crate::report::run_list::ListedRun;

pub use crate::record::{RegisterKind, flag_of};

/// Most entries a list shows unless all are asked for.
pub const LISTED: u32 = 50;

/// What an entry is made of.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Given {
    /// A file.
    File(PathBuf),
    /// Flags: keys as in the file, those in tables with dots, each with its text.
    Flags(Vec<(String, String)>),
}

/// Adds entries: all are read before the first is written, so that a mistake in one writes none.
///
/// # Errors
/// A file or flag that is refused, a name that is taken, a book that cannot be written.
pub fn add(
    shelf: &Shelf,
    kind: RegisterKind,
    given: &[Given],
    notes: &mut Vec<String>,
) -> Result<Vec<Saved>, WorkError> {
    let mut entries: Vec<RegisterEntry> = Vec::with_capacity(given.len());
    for given in given {
        let entry = read(kind, given, None, notes)?;
        let same =
            |other: &RegisterEntry| matches!((other.id(), entry.id()), (Some(a), Some(b)) if a.same_as(b));
        if let Some(id) = entries.iter().find(|other| same(other)).and_then(RegisterEntry::id) {
            return Err(BookError::Taken { register: register_of(kind), id: id.as_str().to_owned() }.into());
        }
        entries.push(entry);
    }
    let mut book = shelf.to_write(notes)?;
    for entry in &entries {
        if let Some(there) = entry.id().map(|id| find(&book, kind, id.as_str())).transpose()?.flatten() {
            let id = there.entry.id().map_or_else(String::new, ToString::to_string);
            return Err(BookError::Taken { register: register_of(kind), id }.into());
        }
    }
    let mut saved = Vec::with_capacity(entries.len());
    for entry in entries {
        note_unknown_acceptance(&book, &entry, notes)?;
        let entry = into_book(entry);
        let name = entry.name().to_owned();
        stamped(|stamp| book.add(entry, stamp))??;
        saved.push(Saved { register: kind.name(), name, revision: 1, changed: true });
    }
    Ok(saved)
}

/// Writes a new revision of an entry. What is given replaces what stands, key by key; the shop may be new.
///
/// # Errors
/// No entry of that name, a file or flag that is refused, a book that cannot be written.
pub fn edit(
    shelf: &Shelf,
    kind: RegisterKind,
    id: &str,
    given: &Given,
    notes: &mut Vec<String>,
) -> Result<Saved, WorkError> {
    if *given == Given::Flags(Vec::new()) {
        return Err(WorkError::NothingGiven);
    }
    let is_shop = kind == RegisterKind::Shop;
    let stands = match shelf.to_read() {
        Ok(book) => find(&book, kind, id)?,
        Err(WorkError::Book(BookError::NoBook { .. })) if is_shop => None,
        Err(error) => return Err(error),
    };
    if stands.is_none() && !is_shop {
        return Err(unknown(kind, id));
    }
    let entry = read(kind, given, stands.as_ref().map(|stands| &stands.entry), notes)?;
    let name = into_report(entry.clone()).name().to_owned();
    let saved = |revision, changed| Saved { register: kind.name(), name: name.clone(), revision, changed };
    if let Some(stands) = &stands
        && stands.entry == entry
    {
        return Ok(saved(stands.revision, false));
    }
    let mut book = if is_shop { shelf.to_write(notes)? } else { shelf.to_change()? };
    note_unknown_acceptance(&book, &entry, notes)?;
    let revision = match into_book(entry) {
        Entry::Shop(shop) => stamped(|stamp| book.set_shop(shop, stamp))??,
        entry => stamped(|stamp| book.edit(entry, stamp))??,
    };
    Ok(saved(revision, true))
}

/// The entries of a register in the order of their names, the first [`LISTED`] of them unless `all`.
///
/// # Errors
/// When there is no book or it cannot be read.
pub fn list(shelf: &Shelf, kind: RegisterKind, all: bool) -> Result<EntryList, WorkError> {
    let book = shelf.to_read()?;
    let limit = (!all).then_some(LISTED);
    let entries = match kind {
        RegisterKind::Orifice => entries::<Orifice>(&book, limit)?,
        RegisterKind::Instrument => entries::<Instrument>(&book, limit)?,
        RegisterKind::FirstStage => entries::<FirstStage>(&book, limit)?,
        RegisterKind::Diver => entries::<Diver>(&book, limit)?,
        RegisterKind::Acceptance => entries::<Acceptance>(&book, limit)?,
        RegisterKind::Shop => entries::<Shop>(&book, limit)?,
    };
    let counted =
        book.info()?.entries.iter().find(|(register, _)| *register == register_of(kind)).map(|(_, n)| *n);
    let entries = entries
        .into_iter()
        .map(|found| {
            let last_run = match &found.entry {
                RegisterEntry::Orifice(orifice) => last_run(&book, &orifice.id)?,
                _ => None,
            };
            Ok(ListedEntry { now: revision(found), last_run })
        })
        .collect::<Result<Vec<_>, WorkError>>()?;
    Ok(EntryList {
        register: kind.name(),
        command: command(kind),
        all: counted.unwrap_or(entries.len() as u64),
        entries,
        today: clock::now().date_naive(),
    })
}

/// An entry as it stands, and its earlier revisions if `all`.
///
/// # Errors
/// When there is no book, it cannot be read, or it has no such entry.
pub fn show(shelf: &Shelf, kind: RegisterKind, id: &str, all: bool) -> Result<ShownEntry, WorkError> {
    shown(&shelf.to_read()?, kind, id, all)
}

/// As [`show`], of an open book.
pub(super) fn shown(book: &Book, kind: RegisterKind, id: &str, all: bool) -> Result<ShownEntry, WorkError> {
    let now = find(book, kind, id)?.ok_or_else(|| unknown(kind, id))?;
    let earlier = all.then(|| revisions(book, kind, id)).transpose()?;
    Ok(ShownEntry {
        register: kind.name(),
        now: revision(now),
        earlier: earlier.map(|all| all.into_iter().skip(1).map(revision).collect()),
    })
}

/// Deletes everything personal of a diver, with a reason that stays.
///
/// # Errors
/// No such diver; a reason that is empty or names the diver; [`WorkError::StillHeld`] while another program keeps the
/// bytes; a book that cannot be written.
pub fn forget(shelf: &Shelf, diver: &str, why: &str) -> Result<ForgottenDiver, WorkError> {
    let id = id_of(diver)?;
    let why = runs::said("--why", why)?;
    let mut book = shelf.to_change()?;
    let mut names = vec![id.as_str().to_lowercase()];
    for known in book.revisions::<Diver>(&id)? {
        names.extend(known.entry.name.iter().flat_map(|name| name.split_whitespace()).map(str::to_lowercase));
    }
    let words = why.to_lowercase();
    let words: Vec<&str> = words.split(|c: char| c.is_whitespace() || ",;:!?()\"".contains(c)).collect();
    let named =
        |name: &String| words.iter().any(|word| word.trim_end_matches('.') == name.trim_end_matches('.'));
    // An initial says nothing, and is a word of its own in some languages.
    if names.iter().filter(|name| name.chars().count() > 2).any(named) {
        return Err(WorkError::ReasonNames(diver.to_owned()));
    }
    let done = stamped(|stamp| book.forget_diver(&id, why, stamp))??;
    let copies = |copies: Vec<CopyMade>| copies.into_iter().map(copy_named).collect::<Vec<_>>();
    match done {
        Forgotten::Done { records, copies: made } => {
            // The last erasure of the book is this one, unless this only finished an earlier one.
            let last = if records == 0 { None } else { book.erasures()?.pop() };
            let sessions = last.map(|erasure| erasure.sessions).unwrap_or_default();
            Ok(ForgottenDiver { diver: diver.to_owned(), records, sessions, copies: copies(made) })
        }
        Forgotten::StillHeld { records, copies: made } => Err(WorkError::StillHeld {
            diver: diver.to_owned(),
            records,
            copies: crate::report::registers::copies_text(&copies(made)),
        }),
    }
}

fn copy_named(copy: CopyMade) -> CopyNamed {
    CopyNamed { is_export: copy.kind == CopyKind::Export, place: copy.place, at: copy.at }
}

/// The command of a register.
#[must_use]
pub const fn command(kind: RegisterKind) -> &'static str {
    match kind {
        RegisterKind::Orifice => "orifice",
        RegisterKind::Instrument => "instrument",
        RegisterKind::FirstStage => "first-stage",
        RegisterKind::Diver => "diver",
        RegisterKind::Acceptance => "acceptance",
        RegisterKind::Shop => "shop",
    }
}

fn read(
    kind: RegisterKind,
    given: &Given,
    stands: Option<&RegisterEntry>,
    notes: &mut Vec<String>,
) -> Result<RegisterEntry, WorkError> {
    let loaded = match given {
        Given::File(path) => read_register_as(kind, path, stands)?,
        Given::Flags(flags) => from_flags(kind, flags, stands, &mut files_beside("here".as_ref()))?,
    };
    notes.extend(loaded.notes.iter().map(ToString::to_string));
    Ok(loaded.value)
}

/// The name of an entry.
///
/// # Errors
/// A text that is no name.
pub(super) fn id_of(text: &str) -> Result<Id, WorkError> {
    Id::new(text).map_err(WorkError::NoName)
}

fn unknown(kind: RegisterKind, id: &str) -> WorkError {
    if kind == RegisterKind::Shop {
        return WorkError::NoShop;
    }
    BookError::Unknown { register: register_of(kind), id: id.to_owned() }.into()
}

fn note_unknown_acceptance(
    book: &Book,
    entry: &RegisterEntry,
    notes: &mut Vec<String>,
) -> Result<(), WorkError> {
    if let RegisterEntry::Orifice(Orifice { id, acceptance: Some(acceptance), .. }) = entry
        && book.entry::<Acceptance>(acceptance)?.is_none()
    {
        notes.push(format!(
            "{id} names the acceptance {acceptance}, which is not in the register: its runs are judged by it once it is"
        ));
    }
    Ok(())
}

fn last_run(book: &Book, orifice: &Id) -> Result<Option<ListedRun>, WorkError> {
    let newest = book.history(orifice, Some(1))?.into_iter().next();
    Ok(newest.map(|row: crate::book::HistoryRow| -> RunRow { row.run }).map(runs::listed))
}

const fn register_of(kind: RegisterKind) -> Register {
    match kind {
        RegisterKind::Orifice => Register::Orifice,
        RegisterKind::Instrument => Register::Instrument,
        RegisterKind::FirstStage => Register::FirstStage,
        RegisterKind::Diver => Register::Diver,
        RegisterKind::Acceptance => Register::Acceptance,
        RegisterKind::Shop => Register::Shop,
    }
}

/// An entry of one type as it is read from and written to files.
pub(super) trait OfFile: Kept {
    /// The entry of any register.
    fn any(self) -> RegisterEntry;
}

macro_rules! of_file {
    ($($type:ident),+) => {
        $(impl OfFile for $type {
            fn any(self) -> RegisterEntry {
                RegisterEntry::$type(self)
            }
        })+

        /// An entry as the book takes it.
        pub(super) fn into_book(entry: RegisterEntry) -> Entry {
            match entry {
                $(RegisterEntry::$type(entry) => Entry::$type(entry),)+
            }
        }

        /// An entry as it is shown.
        fn into_report(entry: RegisterEntry) -> AnyEntry {
            match entry {
                $(RegisterEntry::$type(entry) => AnyEntry::$type(entry),)+
            }
        }
    };
}

of_file!(Orifice, Instrument, FirstStage, Diver, Acceptance, Shop);

/// A revision of an entry of any register.
pub(super) type Found = Registered<RegisterEntry>;

fn any<T: OfFile>(found: Registered<T>) -> Found {
    Registered { entry: found.entry.any(), revision: found.revision, at: found.at }
}

fn revision(found: Found) -> Revision {
    let file = write_register(&found.entry);
    Revision { entry: into_report(found.entry), revision: found.revision, at: found.at, file }
}

fn entries<T: OfFile>(book: &Book, limit: Option<u32>) -> Result<Vec<Found>, WorkError> {
    Ok(book.entries::<T>(None, limit)?.into_iter().map(any).collect())
}

/// The entry of a name as it stands; the shop needs no name.
fn find(book: &Book, kind: RegisterKind, id: &str) -> Result<Option<Found>, WorkError> {
    if kind == RegisterKind::Shop {
        return Ok(book.shop()?.map(any));
    }
    let id = id_of(id)?;
    Ok(match kind {
        RegisterKind::Orifice => book.entry::<Orifice>(&id)?.map(any),
        RegisterKind::Instrument => book.entry::<Instrument>(&id)?.map(any),
        RegisterKind::FirstStage => book.entry::<FirstStage>(&id)?.map(any),
        RegisterKind::Diver => book.entry::<Diver>(&id)?.map(any),
        RegisterKind::Acceptance => book.entry::<Acceptance>(&id)?.map(any),
        RegisterKind::Shop => book.shop()?.map(any),
    })
}

/// All revisions of an entry, the newest first.
pub(super) fn revisions(book: &Book, kind: RegisterKind, id: &str) -> Result<Vec<Found>, WorkError> {
    fn all<T: OfFile>(book: &Book, id: &Id) -> Result<Vec<Found>, WorkError> {
        Ok(book.revisions::<T>(id)?.into_iter().map(any).collect())
    }
    let id = id_of(if kind == RegisterKind::Shop { command(kind) } else { id })?;
    match kind {
        RegisterKind::Orifice => all::<Orifice>(book, &id),
        RegisterKind::Instrument => all::<Instrument>(book, &id),
        RegisterKind::FirstStage => all::<FirstStage>(book, &id),
        RegisterKind::Diver => all::<Diver>(book, &id),
        RegisterKind::Acceptance => all::<Acceptance>(book, &id),
        RegisterKind::Shop => all::<Shop>(book, &id),
    }
}
