//! Instruments and limits of a run by their names: in the register, in a run file, or those of the last run.
//!
//! Comes in: a name. Goes out: the papers as they stand in the register today, or one sentence with the names there are.

use std::path::Path;

use super::start::{Answer, Start};
use super::{EnterError, short};
use crate::book::{Book, BookError};
use crate::entry::{Acceptance, Id, IdError, Instrument, InstrumentPapers, Meter, Transducer};
use crate::gas::Species;
use crate::record::meter_suits;
use crate::report::enter_questions::{Question, asked_for};
use crate::work::WorkError;
use crate::work::fit::names_a_file;
use crate::work::shelf::{Shelf, meter_of, transducer_of};

/// Names of a register that are listed in a refusal.
const NAMES_LISTED: usize = 8;

impl Start {
    pub(super) fn answer_meter(&mut self, text: &str) -> Result<(), WorkError> {
        let gas = self.gas.unwrap_or(Species::Oxygen);
        let meter = if names_a_file(text) {
            // Such a file mostly holds the rest of the bench too.
            let open = |start: &Self| Question::ALL.map(|question| !start.is_answered(question));
            let before = open(self);
            self.take_from(Path::new(text))?;
            let with_it = Question::ALL.iter().zip(before.iter().zip(open(self)));
            let with_it: Vec<&str> = with_it
                .filter(|(question, (before, now))| **before && !now && **question != Question::Meter)
                .map(|(question, _)| question.word())
                .collect();
            if !with_it.is_empty() {
                self.notes.push(format!("{} gives also: {}", short(text), with_it.join(", ")));
            }
            self.meter.take().ok_or_else(|| not_in(text, "meter"))?
        } else if let (true, Some(last)) = (text.is_empty(), &self.last) {
            // The register may know newer papers than the last run had.
            match &last.run.meter.id {
                Some(id) => self.registered_meter(id)?.unwrap_or_else(|| last.run.meter.clone()),
                None => last.run.meter.clone(),
            }
        } else if text.is_empty() {
            return Err(EnterError::Needed(asked_for(Question::Meter)).into());
        } else {
            let id = name(text)?;
            self.registered_meter(&id)?.map_or_else(|| Err(self.unknown("flow meter", &id, is_meter)), Ok)?
        };
        suits(&meter, gas)?;
        self.meter = Some(meter);
        Ok(())
    }

    pub(super) fn answer_transducer(&mut self, text: &str) -> Result<(), WorkError> {
        let transducer = if names_a_file(text) {
            self.setup(Path::new(text))?.transducer.ok_or_else(|| not_in(text, "transducer"))?
        } else if let (true, Some(last)) = (text.is_empty(), &self.last) {
            match &last.run.transducer.id {
                Some(id) => self.registered_transducer(id)?.unwrap_or_else(|| last.run.transducer.clone()),
                None => last.run.transducer.clone(),
            }
        } else if text.is_empty() {
            return Err(EnterError::Needed(asked_for(Question::Transducer)).into());
        } else {
            let id = name(text)?;
            let found = self.registered_transducer(&id)?;
            found.map_or_else(|| Err(self.unknown("transducer", &id, is_transducer)), Ok)?
        };
        self.transducer = Some(transducer);
        Ok(())
    }

    pub(super) fn answer_acceptance(&mut self, text: &str) -> Result<(), WorkError> {
        let acceptance = if text.is_empty() {
            let last = self.last.as_ref().and_then(|last| last.run.acceptance.clone());
            match last.as_ref().and_then(|acceptance| acceptance.id.clone()) {
                Some(id) => self.registered_acceptance(&id)?.or(last),
                None => last,
            }
        } else if text.eq_ignore_ascii_case("none") {
            None
        } else if names_a_file(text) {
            Some(self.setup(Path::new(text))?.acceptance.ok_or_else(|| not_in(text, "acceptance"))?)
        } else {
            let id = name(text)?;
            let found = self.registered_acceptance(&id)?;
            Some(found.map_or_else(|| Err(self.unknown_acceptance(&id)), Ok)?)
        };
        self.acceptance = Answer::Given(acceptance);
        Ok(())
    }

    fn registered_meter(&self, id: &Id) -> Result<Option<Meter>, WorkError> {
        let Some(book) = there(&self.shelf)? else { return Ok(None) };
        Ok(meter_of(&book, id)?)
    }

    fn registered_transducer(&self, id: &Id) -> Result<Option<Transducer>, WorkError> {
        let Some(book) = there(&self.shelf)? else { return Ok(None) };
        Ok(transducer_of(&book, id)?)
    }

    fn registered_acceptance(&self, id: &Id) -> Result<Option<Acceptance>, WorkError> {
        let Some(book) = there(&self.shelf)? else { return Ok(None) };
        Ok(book.entry::<Acceptance>(id)?.map(|found| found.entry))
    }

    /// The refusal of an instrument, with the names there are.
    fn unknown(&self, what: &'static str, id: &Id, is: fn(&Instrument) -> bool) -> WorkError {
        let names = || -> Result<Vec<String>, WorkError> {
            let Some(book) = there(&self.shelf)? else { return Ok(Vec::new()) };
            let entries = book.entries::<Instrument>(None, None)?;
            Ok(entries.iter().filter(|e| is(&e.entry)).map(|e| e.entry.id.to_string()).collect())
        };
        match names() {
            Ok(names) => not_registered(what, id, &names),
            Err(error) => error,
        }
    }

    fn unknown_acceptance(&self, id: &Id) -> WorkError {
        let names = || -> Result<Vec<String>, WorkError> {
            let Some(book) = there(&self.shelf)? else { return Ok(Vec::new()) };
            let entries = book.entries::<Acceptance>(None, None)?;
            Ok(entries.iter().filter_map(|e| e.entry.id.as_ref()).map(ToString::to_string).collect())
        };
        match names() {
            Ok(names) => not_registered("acceptance", id, &names),
            Err(error) => error,
        }
    }
}

/// A name, refused in a sentence that shows nothing hidden.
pub(super) fn name(text: &str) -> Result<Id, EnterError> {
    Id::new(text).map_err(|why| EnterError::Name {
        text: text.to_owned(),
        why: match why {
            IdError::Length(..) => "a name has 1 to 32 characters",
            IdError::Character(..) => "a name has only letters, digits, \"-\", \"_\" and \".\"",
            IdError::Reserved(_) => "it reads as a file or a run, choose another",
        },
    })
}

/// Refuses a meter that says nothing about the gas.
pub(super) fn suits(meter: &Meter, gas: Species) -> Result<(), WorkError> {
    meter_suits(&meter.kind, gas).map_err(|refusal| EnterError::Refused(refusal.to_string()).into())
}

fn not_in(file: &str, table: &'static str) -> EnterError {
    EnterError::NotInFile { file: short(file), table }
}

fn not_registered(what: &'static str, id: &Id, names: &[String]) -> WorkError {
    let add = if what == "acceptance" { "ebbline acceptance add" } else { "ebbline instrument add" };
    let shown = names.len().min(NAMES_LISTED);
    let more = if names.len() > shown { ", …" } else { "" };
    let there = match shown {
        0 => format!(
            ", which holds none yet: {add} adds one, or name a run file that has it (with a slash, or ending in .toml)"
        ),
        _ => format!(" (there: {}{more})", names[..shown].join(", ")),
    };
    EnterError::NotRegistered { what, id: id.to_string(), there }.into()
}

fn is_meter(instrument: &Instrument) -> bool {
    matches!(instrument.papers, Some(InstrumentPapers::Meter(_)))
}

fn is_transducer(instrument: &Instrument) -> bool {
    matches!(instrument.papers, Some(InstrumentPapers::Transducer(_)))
}

/// The book, if there is one.
pub(super) fn there(shelf: &Shelf) -> Result<Option<Book>, WorkError> {
    match shelf.to_read() {
        Ok(book) => Ok(Some(book)),
        Err(WorkError::Book(BookError::NoBook { .. })) => Ok(None),
        Err(error) => Err(error),
    }
}
