//! The entries of the registers: orifices, first stages, divers, acceptances, the shop, instruments.
//!
//! Comes in: a file of `interface.md`, "Registers", or the flags of a command that say the same; in an edit, the entry
//! as it stands, whose keys hold where none are given. Goes out: the entry as plain data, or one refusal that names
//! the file and line, or the flag. The way back is [`write_register`], whose text reads back as an equal entry.
//!
//! An edit replaces key by key, in tables too; a list is replaced whole, and so is a protocol or a meter of another
//! kind. An empty text takes a key away.
//!
//! Left out: the registers themselves, which live in a book; whether an acceptance named by an orifice exists.

mod refusal;
mod keys;
mod orifice;
mod first_stage;
mod diver;
mod acceptance;
mod shop;
mod number_pattern;
mod instrument;
mod protocol;
mod pattern;
mod flags;
mod write;

use std::io::Read;
use std::path::Path;

use super::document::{Origin, Source, Table};
use super::error::{Fault, RecordError, Refusal};
use super::note::Loaded;
use super::run::{Files, as_text, open};
use crate::entry::{Acceptance, Diver, FirstStage, Id, Instrument, InstrumentPapers, Orifice, Shop, Socket};

pub(super) use diver::diluent;
pub use flags::flag_of;
pub(super) use keys::{positive, words};
pub use number_pattern::{NumberPattern, NumberPatternFault};
pub use pattern::PatternFault;
pub use refusal::RegisterRefusal;
pub use write::write_register;

/// Longest file of an entry that is read, in bytes.
const LONGEST_FILE: u64 = 1 << 20;

/// An entry of any register.
#[allow(clippy::large_enum_variant, reason = "one entry is read at a time, and none is kept here")]
#[derive(Debug, Clone, PartialEq)]
pub enum RegisterEntry {
    /// An orifice.
    Orifice(Orifice),
    /// An instrument; its papers go by its name.
    Instrument(Instrument),
    /// A first stage.
    FirstStage(FirstStage),
    /// A diver.
    Diver(Diver),
    /// Acceptance limits; in the register they have a name.
    Acceptance(Acceptance),
    /// The shop.
    Shop(Shop),
}

/// A register.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RegisterKind {
    /// Orifices.
    Orifice,
    /// Instruments.
    Instrument,
    /// First stages.
    FirstStage,
    /// Divers.
    Diver,
    /// Acceptances.
    Acceptance,
    /// The shop.
    Shop,
}

impl RegisterKind {
    /// All of them, in the order people read them.
    pub const ALL: [Self; 6] =
        [Self::Orifice, Self::Instrument, Self::FirstStage, Self::Diver, Self::Acceptance, Self::Shop];

    /// What `record` says in its files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Orifice => "orifice",
            Self::Instrument => "instrument",
            Self::FirstStage => "first stage",
            Self::Diver => "diver",
            Self::Acceptance => "acceptance",
            Self::Shop => "shop",
        }
    }
}

impl RegisterEntry {
    /// Its register.
    #[must_use]
    pub const fn kind(&self) -> RegisterKind {
        match self {
            Self::Orifice(_) => RegisterKind::Orifice,
            Self::Instrument(_) => RegisterKind::Instrument,
            Self::FirstStage(_) => RegisterKind::FirstStage,
            Self::Diver(_) => RegisterKind::Diver,
            Self::Acceptance(_) => RegisterKind::Acceptance,
            Self::Shop(_) => RegisterKind::Shop,
        }
    }

    /// Its name; the shop, and limits outside a register, have none.
    #[must_use]
    pub const fn id(&self) -> Option<&Id> {
        match self {
            Self::Orifice(entry) => Some(&entry.id),
            Self::Instrument(entry) => Some(&entry.id),
            Self::FirstStage(entry) => Some(&entry.id),
            Self::Diver(entry) => Some(&entry.id),
            Self::Acceptance(entry) => entry.id.as_ref(),
            Self::Shop(_) => None,
        }
    }
}

/// Reads the file of an entry; the logo of a shop is looked for beside it.
///
/// # Errors
/// Every [`RecordError`] but those of runs; each means exit status 2.
pub fn read_register(path: &Path) -> Result<Loaded<RegisterEntry>, RecordError> {
    let (name, text) = text_of(path)?;
    parse_register(&text, &name, &mut files_beside(path))
}

/// As [`read_register`], of one register, and in an edit over the entry that stands there.
///
/// # Errors
/// As [`parse_register_as`].
pub fn read_register_as(
    kind: RegisterKind,
    path: &Path,
    stands: Option<&RegisterEntry>,
) -> Result<Loaded<RegisterEntry>, RecordError> {
    let (name, text) = text_of(path)?;
    parse_register_as(kind, &text, &name, stands, &mut files_beside(path))
}

/// Reads an entry from the text of its file; `name` stands in refusals, and a logo opens only through `files`.
///
/// # Errors
/// As [`read_register`], and those of `files`.
pub fn parse_register(
    toml_text: &str,
    name: &str,
    files: Files<'_>,
) -> Result<Loaded<RegisterEntry>, RecordError> {
    read(None, file(toml_text, name), None, files)
}

/// As [`parse_register`], of one register, so that `record` need not be said but must agree.
///
/// With `stands`, an edit: keys that are given replace those of the entry as it stands, an empty text takes one away,
/// and `id` need not be said but must agree.
///
/// # Errors
/// As [`parse_register`]; also a file of another register, and another `id`.
pub fn parse_register_as(
    kind: RegisterKind,
    toml_text: &str,
    name: &str,
    stands: Option<&RegisterEntry>,
    files: Files<'_>,
) -> Result<Loaded<RegisterEntry>, RecordError> {
    read(Some(kind), file(toml_text, name), stands, files)
}

/// As [`parse_register_as`], from the flags of a command: keys as in files, those in tables with dots
/// (`protocol.ask`), each with its text. A key of a list may come several times.
///
/// Texts stand for numbers, `true` and `false` where a file has these. In `protocol.ask` and `protocol.ends`, which
/// a shell cannot type, `\r`, `\n`, `\t` and `\\` are read as in a file. A logo may lie anywhere.
///
/// # Errors
/// As [`parse_register_as`], with the flag as its place (see [`flag_of`]); also a flag given twice, a text that is no
/// number where one is wanted, and an unknown escape.
pub fn from_flags(
    kind: RegisterKind,
    flags: &[(String, String)],
    stands: Option<&RegisterEntry>,
    files: Files<'_>,
) -> Result<Loaded<RegisterEntry>, RecordError> {
    let text = flags::as_toml(flags)?;
    read(Some(kind), Source::from(Origin::Flags, "the command", &text), stands, files)
}

/// Opens files by their names relative to the file at `path`.
pub fn files_beside(path: &Path) -> impl FnMut(&str) -> Result<Box<dyn Read>, RecordError> {
    let folder = path.parent().unwrap_or(Path::new("")).to_owned();
    move |name| open(&folder.join(name))
}

fn text_of(path: &Path) -> Result<(String, String), RecordError> {
    let name = path.display().to_string();
    let mut bytes = Vec::new();
    let read = open(path)?.take(LONGEST_FILE + 1).read_to_end(&mut bytes);
    read.map_err(|error| RecordError::unreadable(&name, Fault::of(&error)))?;
    if bytes.len() as u64 > LONGEST_FILE {
        return Err(RecordError::unreadable(&name, Fault::LargeEntry));
    }
    let text = as_text(&name, &bytes)?.to_owned();
    Ok((name, text))
}

fn file<'d>(text: &'d str, name: &'d str) -> Source<'d> {
    Source::new(name, text.trim_start_matches('\u{FEFF}'))
}

fn read(
    kind: Option<RegisterKind>,
    source: Source<'_>,
    stands: Option<&RegisterEntry>,
    files: Files<'_>,
) -> Result<Loaded<RegisterEntry>, RecordError> {
    let parsed = source.parse()?;
    let given = source.whole(&parsed);
    let value = match stands {
        None => entry(kind, &given, None, files)?,
        Some(stands) => edited(kind, given, stands, files)?,
    };
    Ok(Loaded { value, notes: source.into_notes() })
}

/// What is given over what stands, which is written as a file would have it, so that one way leads to an entry.
fn edited(
    kind: Option<RegisterKind>,
    given: Table<'_>,
    stands: &RegisterEntry,
    files: Files<'_>,
) -> Result<RegisterEntry, RecordError> {
    let name = format!("{} as it stands", stands.id().map_or("the shop", Id::as_str));
    let text = write_register(&kept(stands, &given)?);
    let below = Source::from(Origin::Entry, &name, &text);
    let parsed = below.parse()?;
    let keeps_logo = given.field("logo").is_none();
    let mut entry = entry(kind, &given.over(&below, &parsed), stands.id(), files)?;
    if let (true, RegisterEntry::Shop(shop), RegisterEntry::Shop(stands)) = (keeps_logo, &mut entry, stands) {
        shop.logo.clone_from(&stands.logo);
    }
    Ok(entry)
}

/// The entry as it stands, without what one of the keys given excludes, and without the logo, whose bytes no text holds.
fn kept(stands: &RegisterEntry, given: &Table<'_>) -> Result<RegisterEntry, RecordError> {
    let mut kept = stands.clone();
    match &mut kept {
        RegisterEntry::Shop(shop) => shop.logo = None,
        RegisterEntry::Instrument(instrument) => {
            let gives = |key: &str| given.field(key).is_some();
            let found_otherwise = match &instrument.socket {
                Some(Socket::Port(_)) => gives("usb"),
                Some(Socket::Usb(_)) => gives("port"),
                None => false,
            };
            if found_otherwise {
                instrument.socket = None;
            }
            let protocol = instrument.protocol.as_ref().map(protocol::kind_of);
            if of_another_kind(given, "protocol", protocol)? {
                instrument.protocol = None;
            }
            let other_papers = match &instrument.papers {
                Some(InstrumentPapers::Meter(meter)) => {
                    gives("transducer") || of_another_kind(given, "meter", Some(meter.kind.name()))?
                }
                Some(InstrumentPapers::Transducer(_)) => gives("meter"),
                None => false,
            };
            if other_papers {
                instrument.papers = None;
            }
        }
        _ => {}
    }
    Ok(kept)
}

/// Whether the table given behind `key` says another `kind` than the one that stands there.
fn of_another_kind(given: &Table<'_>, key: &str, stands: Option<&str>) -> Result<bool, RecordError> {
    let Some(field) = given.field(key).filter(|field| !field.is_text()) else { return Ok(false) };
    let Some(kind) = field.table(key)?.field("kind") else { return Ok(false) };
    Ok(Some(kind.text()?) != stands)
}

fn entry(
    kind: Option<RegisterKind>,
    file: &Table<'_>,
    stands: Option<&Id>,
    files: Files<'_>,
) -> Result<RegisterEntry, RecordError> {
    Ok(match record(kind, file)? {
        RegisterKind::Orifice => RegisterEntry::Orifice(orifice::read(file, stands)?),
        RegisterKind::Instrument => RegisterEntry::Instrument(instrument::read(file, stands)?),
        RegisterKind::FirstStage => RegisterEntry::FirstStage(first_stage::read(file, stands)?),
        RegisterKind::Diver => RegisterEntry::Diver(diver::read(file, stands)?),
        RegisterKind::Acceptance => RegisterEntry::Acceptance(acceptance::read(file, stands)?),
        RegisterKind::Shop => RegisterEntry::Shop(shop::read(file, files)?),
    })
}

/// The register a file is for, which must be `wanted` where that is said.
fn record(wanted: Option<RegisterKind>, file: &Table<'_>) -> Result<RegisterKind, RecordError> {
    let field = match (file.field("record"), wanted) {
        (Some(field), _) => field,
        (None, Some(wanted)) => return Ok(wanted),
        (None, None) => file.required("record", "record = \"orifice\"")?,
    };
    let word = field.text()?;
    if ["bench run", "session"].contains(&word) {
        return Err(field.refuse(RegisterRefusal::NoEntry(word.to_owned()).into()));
    }
    let kind = field.word(&RegisterKind::ALL.map(|kind| (kind.name(), kind)))?;
    match wanted.filter(|wanted| *wanted != kind) {
        Some(wanted) => {
            let (found, wanted) = (kind.name(), wanted.name());
            Err(field.refuse(RegisterRefusal::OtherRegister { found, wanted }.into()))
        }
        None => Ok(kind),
    }
}

impl From<RegisterRefusal> for Refusal {
    fn from(refusal: RegisterRefusal) -> Self {
        Self::Register(refusal)
    }
}
