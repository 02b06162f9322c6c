//! Entries of the registers, shown and listed.
//!
//! Comes in: entries as they stand in the book, each with its revision and when that was written. Goes out: text in the
//! units asked for, and JSON whose `entry` has the keys and texts of the entry's own file, so that a program can hand it
//! back. Left out: the history of an orifice, which stands below its entry (`super::orifice_history`).

mod list;
mod rows;
mod show;

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::run_list::ListedRun;
use crate::entry::{Acceptance, Diver, FirstStage, Instrument, Orifice, SessionNumber, Shop};

pub use list::{json as list_json, text as list_text};
pub use show::{copies_text, forgotten_json, forgotten_text, json, json_value, saved_json, saved_text, text};

/// An entry of any register.
#[derive(Debug, Clone, PartialEq)]
#[expect(
    clippy::large_enum_variant,
    reason = "entries are handled one at a time; a box would only be in the way"
)]
pub enum AnyEntry {
    /// An orifice.
    Orifice(Orifice),
    /// An instrument.
    Instrument(Instrument),
    /// A first stage.
    FirstStage(FirstStage),
    /// A diver.
    Diver(Diver),
    /// Acceptance limits.
    Acceptance(Acceptance),
    /// The shop.
    Shop(Shop),
}

impl AnyEntry {
    /// Its name; that of the shop is the word `shop`.
    #[must_use]
    pub fn name(&self) -> &str {
        match self {
            Self::Orifice(entry) => entry.id.as_str(),
            Self::Instrument(entry) => entry.id.as_str(),
            Self::FirstStage(entry) => entry.id.as_str(),
            Self::Diver(entry) => entry.id.as_str(),
            Self::Acceptance(entry) => entry.id.as_ref().map_or("", |id| id.as_str()),
            Self::Shop(_) => "shop",
        }
    }
}

/// A revision of an entry.
#[derive(Debug, Clone, PartialEq)]
pub struct Revision {
    /// The entry.
    pub entry: AnyEntry,
    /// Its revision, counted from 1.
    pub revision: u32,
    /// When it was written.
    pub at: DateTime<FixedOffset>,
    /// The text of its file.
    pub file: String,
}

/// An entry as it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct ShownEntry {
    /// The words for its register.
    pub register: &'static str,
    /// As it stands.
    pub now: Revision,
    /// Earlier revisions, the newest first, where they were asked for.
    pub earlier: Option<Vec<Revision>>,
}

/// An entry of a list.
#[derive(Debug, Clone, PartialEq)]
pub struct ListedEntry {
    /// As it stands.
    pub now: Revision,
    /// Of an orifice, its newest run.
    pub last_run: Option<ListedRun>,
}

/// Entries of a register.
#[derive(Debug, Clone, PartialEq)]
pub struct EntryList {
    /// The words for the register, and the command that adds to it.
    pub register: &'static str,
    /// The command of the register.
    pub command: &'static str,
    /// The first of them.
    pub entries: Vec<ListedEntry>,
    /// How many there are.
    pub all: u64,
    /// The day on which calibrations are in date or not.
    pub today: NaiveDate,
}

/// What adding or editing an entry did.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Saved {
    /// The words for its register.
    pub register: &'static str,
    /// Its name.
    pub name: String,
    /// The revision that stands now.
    pub revision: u32,
    /// Whether anything changed; an edit that changes nothing writes no revision.
    pub changed: bool,
}

/// A copy that forgetting a diver cannot reach.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CopyNamed {
    /// Whether it is an export with divers; else a backup.
    pub is_export: bool,
    /// Where it went.
    pub place: String,
    /// When.
    pub at: DateTime<FixedOffset>,
}

/// A diver who was forgotten.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ForgottenDiver {
    /// The name in the register, as it was given.
    pub diver: String,
    /// Records whose content went; nought when an earlier erasure was finished.
    pub records: usize,
    /// Sessions among what went.
    pub sessions: Vec<SessionNumber>,
    /// Copies that it cannot reach.
    pub copies: Vec<CopyNamed>,
}
