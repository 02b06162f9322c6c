//! An orifice's line, found and judged: from a run file, or from the runs of the book.
//!
//! Which run of the book: for a setting the newest that was judged, and where none was, the newest that is complete; for a
//! session the one in force when it was taken. Both go through [`OrificeInput::of`], so that a session and a setting by
//! the same run have the same line to the bit, and carry its errors together.

use std::path::Path;

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::WorkError;
use super::fit::points_of;
use super::runs::load;
use super::shelf::{Shelf, ShelfRegisters};
use crate::bench::{Analysis, Questions, Verdict, analyse};
use crate::book::{Book, HistoryRow, RunState};
use crate::entry::{Id, Purpose, Run, RunNumber, StoredVerdict};
use crate::record::{NoRegisters, Registers, read_run_with};
use crate::setting::{OrificeInput, Standing};
use crate::uptake::InjectionLine;

/// An orifice with the run its line was made from.
#[derive(Debug, Clone, PartialEq)]
pub struct FoundLine {
    /// As a setting takes it.
    pub input: OrificeInput,
    /// The run.
    pub run: Run,
    /// What was made of it.
    pub analysis: Analysis,
    /// Where it comes from, in words: "run R0003 of 2026-11-12, accepted".
    pub words: String,
    /// What was noticed on the way.
    pub notes: Vec<String>,
}

impl FoundLine {
    /// The line for oxygen.
    #[must_use]
    pub const fn line(&self) -> &InjectionLine {
        &self.input.line
    }

    /// What speaks against it as the line of a session taken at `taken`; each is a sentence.
    #[must_use]
    pub fn doubts(&self, taken: DateTime<FixedOffset>) -> Vec<String> {
        let orifice = &self.input.id;
        let mut doubts = Vec::new();
        match self.input.standing {
            Standing::Accepted => {}
            Standing::NeverJudged => doubts.push(format!("{orifice}, which it breathed through, was never judged")),
            Standing::Failed => doubts.push(format!(
                "{orifice}, which it breathed through, failed its acceptance: the injection may be another, and so the uptake"
            )),
            Standing::Undecided => doubts.push(format!(
                "{orifice}, which it breathed through, is undecided: the injection may be another, and so the uptake"
            )),
        }
        if let Some(since) = self.input.overdue_since {
            doubts.push(format!(
                "{orifice}: the calibration of the bench's instruments fell due on {since}, before the session"
            ));
        }
        if self.run.taken > taken {
            doubts.push(format!(
                "{orifice} was measured on {}, after the session: what happened to it in between is not known",
                self.run.taken.date_naive()
            ));
        }
        doubts
    }
}

/// The orifice of a run file, judged by the file's own limits; calibrations that fell due before `on` are overdue.
///
/// # Errors
/// A file that is missing or refused, a run that cannot be analysed, a book that is named and cannot be read.
pub fn from_file(path: &Path, shelf: Option<&Shelf>, on: NaiveDate) -> Result<FoundLine, WorkError> {
    let loaded = match shelf {
        Some(shelf) => {
            let registers = ShelfRegisters::new(shelf);
            read_with(path, &registers).map_err(|error| registers.failure().unwrap_or(error))?
        }
        None => read_with(path, &NoRegisters)?,
    };
    let (run, mut notes) = loaded;
    let analysis = of_run(&run, path, &mut notes)?;
    // The file is named, so that nobody takes what is said of it for the session's.
    for note in &mut notes {
        note.insert_str(0, &format!("{}: ", path.display()));
    }
    let standing = by_own_limits(&analysis);
    let judged = match standing {
        Standing::Accepted => "passed by its own limits",
        Standing::Failed => "failed by its own limits",
        Standing::Undecided => "undecided by its own limits",
        Standing::NeverJudged => "no limits to judge it by",
    };
    let words = format!("file {} of {}, {judged}", path.display(), run.taken.date_naive());
    Ok(found(run, analysis, standing, on, words, notes))
}

fn read_with(path: &Path, registers: &dyn Registers) -> Result<(Run, Vec<String>), WorkError> {
    let loaded = read_run_with(path, registers)?;
    Ok((loaded.value, loaded.notes.iter().map(ToString::to_string).collect()))
}

/// The orifice of a run that is at hand already, as its session kept it.
///
/// # Errors
/// A run that cannot be analysed; `name` stands in its sentence.
pub fn of_kept_run(run: &Run, name: &Path, on: NaiveDate) -> Result<FoundLine, WorkError> {
    let mut notes = Vec::new();
    let analysis = of_run(run, name, &mut notes)?;
    let standing = by_own_limits(&analysis);
    let words = format!("run of {} that the session's file named", run.taken.date_naive());
    Ok(found(run.clone(), analysis, standing, on, words, notes))
}

/// The orifice of the book for a setting.
///
/// # Errors
/// An orifice that is not in the register, or has no complete run; a run that cannot be analysed; a book that cannot be
/// read.
pub fn from_book(book: &Book, orifice: &Id, on: NaiveDate) -> Result<FoundLine, WorkError> {
    let rows = complete_runs(book, orifice)?;
    let judged = rows.iter().find(|row| row.decision.is_some());
    let Some(row) = judged.or(rows.first()) else { return Err(WorkError::NoRunOf(orifice.clone())) };
    let mut found = of_row(book, row, on)?;
    let newer: Vec<String> = rows
        .iter()
        .take_while(|other| other.run.number != row.run.number)
        .map(|other| other.run.number.to_string())
        .collect();
    if !newer.is_empty() {
        found.notes.push(format!(
            "{orifice}: {} newer and not judged yet, so the last judged run is used: bench accept judges",
            are(&newer)
        ));
    }
    Ok(found)
}

/// The orifice of the book as it was when a session was taken: the last run before it that did not fail, else the first
/// after it.
///
/// # Errors
/// As [`from_book`].
pub fn from_book_at(book: &Book, orifice: &Id, taken: DateTime<FixedOffset>) -> Result<FoundLine, WorkError> {
    let rows = complete_runs(book, orifice)?;
    // As-found belongs to the time before it, as-left to the time after it.
    let holds = |row: &HistoryRow| match row.run.purpose {
        Purpose::AsFound => row.run.taken >= taken,
        Purpose::AsLeft => row.run.taken <= taken,
        Purpose::Acceptance | Purpose::Check => true,
    };
    let spoilt = |row: &HistoryRow| {
        let verdict = row.decision.as_ref().map(|d| d.verdict);
        matches!(verdict, Some(StoredVerdict::Fail | StoredVerdict::Undecided))
    };
    let before = |row: &&HistoryRow| row.run.taken <= taken;
    let sound = || rows.iter().filter(|row| !spoilt(row));
    let row = sound()
        .filter(|row| holds(row))
        .find(before)
        .or_else(|| sound().rfind(|row| holds(row)))
        .or_else(|| sound().find(before))
        .or_else(|| sound().next_back())
        .or_else(|| rows.iter().find(before))
        .or(rows.last());
    let Some(row) = row else { return Err(WorkError::NoRunOf(orifice.clone())) };
    of_row(book, row, taken.date_naive())
}

fn are(numbers: &[String]) -> String {
    match numbers {
        [one] => format!("{one} is"),
        [all @ .., last] => format!("{} and {last} are", all.join(", ")),
        [] => String::new(),
    }
}

/// The complete runs of an orifice, those taken last first.
fn complete_runs(book: &Book, orifice: &Id) -> Result<Vec<HistoryRow>, WorkError> {
    let mut rows = book.history(orifice, None)?;
    rows.retain(|row| row.run.state == RunState::Complete);
    if rows.is_empty() && book.entry::<crate::entry::Orifice>(orifice)?.is_none() {
        return Err(WorkError::NoOrifice(orifice.clone()));
    }
    Ok(rows)
}

fn of_row(book: &Book, row: &HistoryRow, on: NaiveDate) -> Result<FoundLine, WorkError> {
    let number: RunNumber = row.run.number;
    let loaded = load(book, number)?;
    let analysis = loaded.analyse(&Questions::default())?;
    let changed = book.run(number)?.changed_since_decision;
    let stored = row.decision.as_ref().map(|decision| decision.verdict);
    let standing = standing(stored, changed, &analysis);
    let judged = match (standing, changed) {
        (Standing::Accepted, _) => "accepted",
        (Standing::Failed, _) => "failed",
        (Standing::Undecided, true) => "not judged since a point was left out",
        (Standing::Undecided, false) => "undecided",
        (Standing::NeverJudged, _) if stored.is_some() => "judged without limits",
        (Standing::NeverJudged, _) => "never judged",
    };
    let words = format!("run {number} of {}, {judged}", row.run.taken.date_naive());
    Ok(found(loaded.run, analysis, standing, on, words, Vec::new()))
}

/// What a judgement lets an orifice do. After a change the judgement is of an earlier state: it can only be made worse.
fn standing(stored: Option<StoredVerdict>, changed: bool, analysis: &Analysis) -> Standing {
    match stored {
        None | Some(StoredVerdict::None) => Standing::NeverJudged,
        Some(StoredVerdict::Fail) => Standing::Failed,
        Some(StoredVerdict::Undecided) => Standing::Undecided,
        Some(StoredVerdict::Pass) if changed => match by_own_limits(analysis) {
            Standing::Failed => Standing::Failed,
            _ => Standing::Undecided,
        },
        Some(StoredVerdict::Pass) => Standing::Accepted,
    }
}

fn by_own_limits(analysis: &Analysis) -> Standing {
    match analysis.judgement.as_ref().map_or(Verdict::None, |judgement| judgement.verdict) {
        Verdict::Pass => Standing::Accepted,
        Verdict::Fail => Standing::Failed,
        Verdict::Undecided => Standing::Undecided,
        Verdict::None => Standing::NeverJudged,
    }
}

fn of_run(run: &Run, name: &Path, notes: &mut Vec<String>) -> Result<Analysis, WorkError> {
    let (points, more) = points_of(name, &run.readings)?;
    notes.extend(more);
    analyse(run, &points, &Questions::default())
        .map_err(|error| WorkError::Bench { file: name.to_owned(), error })
}

fn found(
    run: Run,
    analysis: Analysis,
    standing: Standing,
    on: NaiveDate,
    words: String,
    notes: Vec<String>,
) -> FoundLine {
    let due = [run.meter.papers.due, run.transducer.papers.due];
    let overdue = due.into_iter().flatten().filter(|due| *due < on).min();
    let input = OrificeInput::of(run.orifice.clone(), run.gas, &analysis, standing, overdue);
    FoundLine { input, run, analysis, words, notes }
}
