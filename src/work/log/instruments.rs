//! Which instruments a run or a session is logged from.
//!
//! A name that is given must be in the register, measure what is asked and have a port. Without a name the only
//! instrument of its kind that has a port is taken; where there are several, nothing is guessed.

use crate::book::{Book, BookError};
use crate::entry::{Id, Instrument, Measures};
use crate::work::WorkError;
use crate::work::shelf::Shelf;

/// An instrument, and whether it was taken without being named.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Chosen {
    pub(super) instrument: Instrument,
    pub(super) by_itself: bool,
}

/// The instrument of that name, or the only one with a port.
///
/// # Errors
/// A name that is not there, measures something else or has no port; none or several without a name; a book that cannot
/// be read.
pub(super) fn choose(book: &Book, measures: Measures, named: Option<&str>) -> Result<Chosen, WorkError> {
    let all = with_port(book, measures)?;
    let Some(name) = named else {
        return match all.as_slice() {
            [only] => Ok(Chosen { instrument: only.clone(), by_itself: true }),
            _ => Err(WorkError::WhichInstrument { measures: measures.name(), there: ids(&all) }),
        };
    };
    let refuse = |why: &str| WorkError::NoSuchInstrument {
        id: name.escape_debug().to_string(),
        why: why.to_owned(),
        measures: measures.name(),
        there: ids(&all),
    };
    let id = Id::new(name).map_err(|_| refuse("is no instrument's name"))?;
    let found = book.entry::<Instrument>(&id)?.ok_or_else(|| refuse("is not in the register"))?.entry;
    if found.measures != measures {
        return Err(refuse(&format!("measures {}", found.measures.name())));
    }
    if found.socket.is_none() || found.protocol.is_none() {
        return Err(refuse("has no port or no protocol in its profile, so that it can only be read by eye"));
    }
    Ok(Chosen { instrument: found, by_itself: false })
}

/// The instrument that a condition is read from, if it is one: named, or the only one when nothing is given.
///
/// # Errors
/// As [`choose`], for a name that is in the register.
pub(super) fn condition_instrument(
    book: &Book,
    measures: Measures,
    given: Option<&str>,
) -> Result<Option<Instrument>, WorkError> {
    match given {
        None => {
            let all = with_port(book, measures)?;
            Ok(if let [only] = all.as_slice() { Some(only.clone()) } else { None })
        }
        Some(text) => match Id::new(text.trim()) {
            Ok(id) if book.entry::<Instrument>(&id)?.is_some() => {
                Ok(Some(choose(book, measures, Some(id.as_str()))?.instrument))
            }
            _ => Ok(None),
        },
    }
}

/// Whether a text is the name of an instrument in the register; where there is no book there is none.
///
/// # Errors
/// A book that cannot be read.
pub fn names_an_instrument(shelf: &Shelf, text: Option<&str>) -> Result<bool, WorkError> {
    let Some(id) = text.and_then(|text| Id::new(text.trim()).ok()) else { return Ok(false) };
    match shelf.to_read() {
        Ok(book) => Ok(book.entry::<Instrument>(&id)?.is_some()),
        Err(WorkError::Book(BookError::NoBook { .. })) => Ok(false),
        Err(error) => Err(error),
    }
}

/// The book, for its register of instruments.
///
/// # Errors
/// Where there is none, that instruments are missing; a book that cannot be read.
pub(super) fn book_with_instruments(shelf: &Shelf) -> Result<Book, WorkError> {
    match shelf.to_read() {
        Err(WorkError::Book(BookError::NoBook { path })) => Err(WorkError::NoInstruments { book: path }),
        opened => opened,
    }
}

/// The instruments of a kind that have a port.
fn with_port(book: &Book, measures: Measures) -> Result<Vec<Instrument>, WorkError> {
    let all = book.entries::<Instrument>(None, None)?;
    let entries = all.into_iter().map(|found| found.entry);
    let here = entries.filter(|one| one.measures == measures);
    Ok(here.filter(|one| one.socket.is_some() && one.protocol.is_some()).collect())
}

fn ids(all: &[Instrument]) -> String {
    let ids: Vec<&str> = all.iter().map(|one| one.id.as_str()).collect();
    if ids.is_empty() { "none with a port".to_owned() } else { ids.join(", ") }
}
