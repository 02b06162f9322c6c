//! The registers: orifices, instruments, first stages, acceptances, divers, and the shop.
//!
//! An entry is added once and edited by a new record that names the one it replaces; all revisions stay. Names that
//! differ only in case are one name. The shop is a register with a single entry.

use rusqlite::{Connection, OptionalExtension, params};

use super::body::{Body, Kind};
use super::chain::{Stamp, Writing, record_at};
use super::error::{BookError, Inside};
use super::open::Book;
use chrono::{DateTime, FixedOffset};

use crate::entry::{Acceptance, Diver, FirstStage, Id, Instrument, Orifice, Shop};

/// Which register.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Register {
    /// Orifices and valves under test.
    Orifice,
    /// Instruments.
    Instrument,
    /// First stages.
    FirstStage,
    /// Acceptance limits.
    Acceptance,
    /// The shop itself.
    Shop,
    /// Divers.
    Diver,
}

impl Register {
    /// Every register.
    pub const ALL: [Self; 6] =
        [Self::Orifice, Self::Instrument, Self::FirstStage, Self::Acceptance, Self::Shop, Self::Diver];

    /// The words for one of its entries.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Orifice => "orifice",
            Self::Instrument => "instrument",
            Self::FirstStage => "first stage",
            Self::Acceptance => "acceptance",
            Self::Shop => "shop",
            Self::Diver => "diver",
        }
    }

    pub(super) const fn kind(self) -> Kind {
        match self {
            Self::Orifice => Kind::Orifice,
            Self::Instrument => Kind::Instrument,
            Self::FirstStage => Kind::FirstStage,
            Self::Acceptance => Kind::Acceptance,
            Self::Shop => Kind::Shop,
            Self::Diver => Kind::Diver,
        }
    }

    /// Its number in the table, as the schema describes it.
    pub(super) const fn number(self) -> i64 {
        match self {
            Self::Orifice => 1,
            Self::Instrument => 2,
            Self::FirstStage => 3,
            Self::Acceptance => 4,
            Self::Shop => 5,
            Self::Diver => 6,
        }
    }
}

/// An entry of any register.
#[derive(Debug, Clone, PartialEq)]
#[expect(
    clippy::large_enum_variant,
    reason = "entries are handled one at a time; a box would only be in the way"
)]
pub enum Entry {
    /// An orifice.
    Orifice(Orifice),
    /// An instrument.
    Instrument(Instrument),
    /// A first stage.
    FirstStage(FirstStage),
    /// Acceptance limits; in the register they have a name.
    Acceptance(Acceptance),
    /// The shop.
    Shop(Shop),
    /// A diver.
    Diver(Diver),
}

/// The name the only entry of the shop's register goes by.
const SHOP: &str = "shop";

impl Entry {
    /// Its register.
    #[must_use]
    pub const fn register(&self) -> Register {
        match self {
            Self::Orifice(_) => Register::Orifice,
            Self::Instrument(_) => Register::Instrument,
            Self::FirstStage(_) => Register::FirstStage,
            Self::Acceptance(_) => Register::Acceptance,
            Self::Shop(_) => Register::Shop,
            Self::Diver(_) => Register::Diver,
        }
    }

    /// Its name as given; that of the shop is `shop`, and that of limits without one is empty.
    #[must_use]
    pub fn name(&self) -> &str {
        match self {
            Self::Orifice(entry) => entry.id.as_str(),
            Self::Instrument(entry) => entry.id.as_str(),
            Self::FirstStage(entry) => entry.id.as_str(),
            Self::Acceptance(entry) => entry.id.as_ref().map_or("", Id::as_str),
            Self::Shop(_) => SHOP,
            Self::Diver(entry) => entry.id.as_str(),
        }
    }
}

/// A type that a register keeps.
pub trait Kept: Sized {
    /// Its register.
    const REGISTER: Register;

    /// The entry as this type; none when it is of another.
    fn of(entry: Entry) -> Option<Self>;
}

macro_rules! kept {
    ($($type:ident),+) => {
        $(impl Kept for $type {
            const REGISTER: Register = Register::$type;

            fn of(entry: Entry) -> Option<Self> {
                if let Entry::$type(entry) = entry { Some(entry) } else { None }
            }
        })+
    };
}

kept!(Orifice, Instrument, FirstStage, Acceptance, Shop, Diver);

/// An entry as it stands, or stood, in a register.
#[derive(Debug, Clone, PartialEq)]
pub struct Registered<T> {
    /// The entry.
    pub entry: T,
    /// Its revision, counted from 1.
    pub revision: u32,
    /// When that revision was written.
    pub at: DateTime<FixedOffset>,
}

impl Book {
    /// Adds an entry.
    ///
    /// # Errors
    /// [`BookError::Taken`] when the name is there already, in whatever case; those of every write.
    pub fn add(&mut self, entry: Entry, stamp: &mut Stamp<'_>) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (register, name) = (entry.register(), entry.name());
            if let Some(there) = latest(&writing.transaction, register, name)? {
                return Err(BookError::Taken { register, id: there.id }.into());
            }
            append(writing, entry, None)
        })
    }

    /// Writes a new revision of an entry; the revision's number.
    ///
    /// # Errors
    /// [`BookError::Unknown`] when no entry has that name; those of every write.
    pub fn edit(&mut self, entry: Entry, stamp: &mut Stamp<'_>) -> Result<u32, BookError> {
        self.write(stamp, |writing| {
            let (register, name) = (entry.register(), entry.name());
            let Some(there) = latest(&writing.transaction, register, name)? else {
                return Err(BookError::Unknown { register, id: name.to_owned() }.into());
            };
            let revision = there.revision + 1;
            append(writing, entry, Some(&there))?;
            Ok(revision)
        })
    }

    /// Writes what the shop is, whether it was known or not; the revision's number.
    ///
    /// # Errors
    /// Those of every write.
    pub fn set_shop(&mut self, shop: Shop, stamp: &mut Stamp<'_>) -> Result<u32, BookError> {
        self.write(stamp, |writing| {
            let there = latest(&writing.transaction, Register::Shop, SHOP)?;
            append(writing, Entry::Shop(shop), there.as_ref())?;
            Ok(there.map_or(1, |there| there.revision + 1))
        })
    }

    /// The entry of that name as it stands; none when there is none.
    ///
    /// # Errors
    /// Those of every read.
    pub fn entry<T: Kept>(&self, id: &Id) -> Result<Option<Registered<T>>, BookError> {
        self.read(|connection| registered(connection, id.as_str()))
    }

    /// The shop as it stands; none when nothing was said of it.
    ///
    /// # Errors
    /// Those of every read.
    pub fn shop(&self) -> Result<Option<Registered<Shop>>, BookError> {
        self.read(|connection| registered(connection, SHOP))
    }

    /// The entries of a register in the order of their names, after the name `after`, at most `limit` of them.
    ///
    /// # Errors
    /// Those of every read.
    pub fn entries<T: Kept>(
        &self,
        after: Option<&Id>,
        limit: Option<u32>,
    ) -> Result<Vec<Registered<T>>, BookError> {
        self.read(|connection| {
            // SQLite takes the other columns from the row that has the maximum ("Bare columns in an aggregate query").
            let sql = "SELECT seq, max(revision) FROM register WHERE register = ? AND key > ? \
                       GROUP BY key ORDER BY key LIMIT ?";
            let mut statement = connection.prepare_cached(sql)?;
            let after = after.map_or_else(String::new, |id| key_of(id.as_str()));
            let limit = limit.map_or(-1, i64::from);
            let seqs = statement.query_map(params![T::REGISTER.number(), after, limit], |row| row.get(0))?;
            let seqs: Vec<u64> = seqs.collect::<Result<_, _>>()?;
            seqs.into_iter().map(|seq| revision_at(connection, seq)).collect()
        })
    }

    /// All revisions of an entry, the newest first.
    ///
    /// # Errors
    /// Those of every read.
    pub fn revisions<T: Kept>(&self, id: &Id) -> Result<Vec<Registered<T>>, BookError> {
        self.read(|connection| revisions(connection, id.as_str()))
    }

    /// All revisions of the shop, the newest first.
    ///
    /// # Errors
    /// Those of every read.
    pub fn shop_revisions(&self) -> Result<Vec<Registered<Shop>>, BookError> {
        self.read(|connection| revisions(connection, SHOP))
    }
}

fn revisions<T: Kept>(connection: &Connection, name: &str) -> Result<Vec<Registered<T>>, Inside> {
    let sql = "SELECT seq FROM register WHERE register = ? AND key = ? ORDER BY revision DESC";
    let mut statement = connection.prepare_cached(sql)?;
    let seqs = statement.query_map(params![T::REGISTER.number(), key_of(name)], |row| row.get(0))?;
    let seqs: Vec<u64> = seqs.collect::<Result<_, _>>()?;
    seqs.into_iter().map(|seq| revision_at(connection, seq)).collect()
}

/// The shop as it stands within a transaction.
pub(super) fn shop_in(connection: &Connection) -> Result<Option<Registered<Shop>>, Inside> {
    registered(connection, SHOP)
}

/// The form of a name that is the same for all ways to write it.
pub(super) fn key_of(name: &str) -> String {
    name.to_lowercase()
}

/// The revision of an entry that holds.
pub(super) struct Latest {
    pub(super) seq: u64,
    pub(super) id: String,
    pub(super) revision: u32,
}

/// The revision that holds; none when no entry has that name.
pub(super) fn latest(
    connection: &Connection,
    register: Register,
    name: &str,
) -> Result<Option<Latest>, Inside> {
    let sql = "SELECT seq, id, revision FROM register WHERE register = ? AND key = ? \
               ORDER BY revision DESC LIMIT 1";
    let mut statement = connection.prepare_cached(sql)?;
    let found = statement.query_row(params![register.number(), key_of(name)], |row| {
        Ok(Latest { seq: row.get(0)?, id: row.get(1)?, revision: row.get(2)? })
    });
    Ok(found.optional()?)
}

/// Appends the first revision, or the one after `before`.
pub(super) fn append(
    writing: &mut Writing<'_, '_, '_>,
    entry: Entry,
    before: Option<&Latest>,
) -> Result<(), Inside> {
    let revision = before.map_or(1, |before| before.revision + 1);
    let replaces = before.map(|before| before.seq);
    writing.append(Body::Entry { revision, replaces, entry: Box::new(entry) })?;
    Ok(())
}

fn registered<T: Kept>(connection: &Connection, name: &str) -> Result<Option<Registered<T>>, Inside> {
    latest(connection, T::REGISTER, name)?.map(|there| revision_at(connection, there.seq)).transpose()
}

fn revision_at<T: Kept>(connection: &Connection, seq: u64) -> Result<Registered<T>, Inside> {
    let wrong = || Inside::Damaged(format!("record {seq} is no {}", T::REGISTER.name()));
    let record = record_at(connection, seq)?.ok_or_else(wrong)?;
    let Body::Entry { revision, entry, .. } = record.body else { return Err(wrong()) };
    Ok(Registered { entry: T::of(*entry).ok_or_else(wrong)?, revision, at: record.at })
}
