//! The session that is being typed.
//!
//! Comes in: a [`SessionReady`] session or the number of an open one, then rows and changes. Goes out: after each the
//! session as the book holds it, and what its rows say. Every change is one transaction; the session is read from the book
//! again after it, so that what another program did meanwhile is seen. A row that cannot be is refused before it is
//! written; one that passed a floor or a ceiling is data.

use super::SessionEnterError;
use super::answers::put;
use super::line::Row;
use super::so_far::{SoFar, has_injection, last_reading, so_far, up_to_now};
use super::start::{SessionReady, line_of};
use crate::book::{Book, BookError, KeptRow, RowContent, RunState, SessionRecord};
use crate::entry::{
    CellReadings, CellSignal, Event, Injection, Place, Run, Session, SessionLeftOut, SessionNumber,
    SessionReadings, What,
};
use crate::gas::at_depth;
use crate::quantity::{AbsolutePressure, Length};
use crate::report::number::fixed;
use crate::report::session_enter_questions::SessionQuestion;
use crate::report::session_enter_words::{Listed, RowWords};
use crate::report::typed::clock;
use crate::uptake::{Uptake, UptakeError};
use crate::work::WorkError;
use crate::work::lines::FoundLine;
use crate::work::runs::said;
use crate::work::sessions::number_of;
use crate::work::shelf::{Shelf, stamped};
use crate::work::uptake::{GatheredSession, UptakeOutcome, note_line, with_left_out, work_out};

/// A reading above ambient by more than this share is a fault and no PO2 (interface).
const ABOVE_AMBIENT: f64 = 1.05;

/// A session that is being typed.
#[derive(Debug)]
pub struct SessionDesk {
    shelf: Shelf,
    book: Option<Book>,
    number: Option<SessionNumber>,
    /// As it stands, with the rows that stand; before the first row, as it will begin.
    session: Session,
    rows: Vec<KeptRow>,
    left_out: Vec<SessionLeftOut>,
    line_run: Option<Run>,
    line: Option<FoundLine>,
    open: bool,
    /// What its rows say up to the last reading.
    worked: Option<Result<Uptake, WorkError>>,
}

/// What a row did.
#[derive(Debug, Clone, PartialEq)]
pub struct RowAdded {
    /// The session it is in.
    pub session: SessionNumber,
    /// Its number.
    pub row: usize,
    /// Whether the session began with it.
    pub begun: bool,
    /// Whether the diver was unknown and was created with the code only.
    pub diver_created: bool,
    /// What was said when the book was opened for it.
    pub notes: Vec<String>,
}

impl SessionDesk {
    /// A session that begins with its first row.
    #[must_use]
    pub fn new(ready: SessionReady) -> Self {
        Self {
            shelf: ready.shelf,
            book: None,
            number: None,
            session: ready.session,
            rows: Vec::new(),
            left_out: Vec::new(),
            line_run: ready.line_run,
            line: ready.line,
            open: true,
            worked: None,
        }
    }

    /// An open session of the book.
    ///
    /// # Errors
    /// A text that is no session's number; a session that is not there, is complete, or was not typed; a book that cannot
    /// be opened.
    pub fn resume(shelf: Shelf, session: &str) -> Result<Self, WorkError> {
        let number = number_of(session)?;
        let book = shelf.to_change()?;
        let record = book.session(number)?;
        let typed =
            record.session.readings.cells.iter().all(|cell| matches!(cell.signal, CellSignal::Bar(_)))
                && record.session.readings.depth_m.is_none()
                && record.session.readings.loop_temperature_k.is_none();
        match record.state {
            RunState::Complete if !record.rows.is_empty() => {
                return Err(BookError::SessionComplete { session: number }.into());
            }
            RunState::Open if typed => {}
            RunState::Complete | RunState::Open => return Err(SessionEnterError::NotTyped(number).into()),
        }
        let line = line_of(&shelf, &record.session, record.line_run.as_ref())?;
        let mut desk = Self {
            shelf,
            book: Some(book),
            number: Some(number),
            session: record.session.clone(),
            rows: Vec::new(),
            left_out: Vec::new(),
            line_run: record.line_run.clone(),
            line,
            open: true,
            worked: None,
        };
        desk.take(record);
        Ok(desk)
    }

    /// A session of the book that is being logged, whatever its columns.
    ///
    /// # Errors
    /// A session that is not there or cannot be read.
    pub fn of_logged(shelf: Shelf, number: SessionNumber) -> Result<Self, WorkError> {
        let book = shelf.to_change()?;
        let record = book.session(number)?;
        let line = line_of(&shelf, &record.session, record.line_run.as_ref())?;
        let mut desk = Self {
            shelf,
            book: Some(book),
            number: Some(number),
            session: record.session.clone(),
            rows: Vec::new(),
            left_out: Vec::new(),
            line_run: record.line_run.clone(),
            line,
            open: record.state == RunState::Open,
            worked: None,
        };
        desk.take(record);
        Ok(desk)
    }

    /// Its number; none before the first row.
    #[must_use]
    pub const fn number(&self) -> Option<SessionNumber> {
        self.number
    }

    /// Whether rows may still come.
    #[must_use]
    pub const fn is_open(&self) -> bool {
        self.open
    }

    /// The session as it stands.
    #[must_use]
    pub const fn session(&self) -> &Session {
        &self.session
    }

    /// How many rows there are, struck ones too.
    #[must_use]
    pub const fn rows(&self) -> usize {
        self.rows.len()
    }

    /// The rows for `report`, struck ones too.
    #[must_use]
    pub fn listed(&self) -> Vec<Listed<'_>> {
        let listed = |row| Listed { row: self.words(row), struck: row.struck.as_deref() };
        self.rows.iter().map(listed).collect()
    }

    /// What the rows say so far.
    #[must_use]
    pub fn so_far(&self) -> SoFar<'_> {
        so_far(&self.session, self.worked.as_ref())
    }

    /// Everything the rows say so far, for the sheet; none where they cannot be worked out.
    #[must_use]
    pub fn outcome(&self) -> Option<UptakeOutcome> {
        let uptake = self.worked.as_ref()?.as_ref().ok()?.clone();
        let sessions = vec![self.gathered()];
        let mut notes = Vec::new();
        // What keeps the session from ending is said there.
        let _ = self.of_line(&self.session, &mut notes);
        Some(UptakeOutcome { sessions, uptake, monte_carlo: Vec::new(), notes, plots: Vec::new() })
    }

    /// Adds a row; it is in the book when this returns.
    ///
    /// # Errors
    /// A row that cannot be; a book that cannot be written.
    pub fn add(&mut self, row: &Row) -> Result<RowAdded, WorkError> {
        self.refused(row, None)?;
        let (mut notes, mut begun, mut diver_created) = (Vec::new(), false, false);
        match (self.number, &mut self.book) {
            (Some(number), Some(book)) => match row {
                Row::Readings { at_s, po2_bar } => {
                    let readings = one_row(&self.session.readings, *at_s, po2_bar);
                    stamped(|stamp| book.add_session_readings(number, &readings, stamp))??;
                }
                Row::Event(event) => stamped(|stamp| book.add_session_event(number, event, stamp))??,
            },
            _ => {
                let mut book = self.shelf.to_write(&mut notes)?;
                let first = match row {
                    Row::Readings { at_s, po2_bar } => {
                        let readings = one_row(&self.session.readings, *at_s, po2_bar);
                        Session { readings, ..self.session.clone() }
                    }
                    Row::Event(event) => Session { events: vec![*event], ..self.session.clone() },
                };
                let line_run = self.line_run.as_ref();
                let recorded = stamped(|stamp| book.begin_session(&first, line_run, stamp))??;
                (begun, diver_created) = (true, recorded.diver_created);
                self.number = Some(recorded.number);
                self.book = Some(book);
            }
        }
        self.read_again()?;
        // The last that says the same: another program may have added one behind it.
        let is_it = |kept: &KeptRow| match (&kept.content, row) {
            (RowContent::Event(there), Row::Event(event)) => there == event,
            (RowContent::Readings(there), Row::Readings { at_s, po2_bar }) => {
                let typed = std::iter::once(at_s).chain(po2_bar);
                there.iter().map(|v| v.to_bits()).eq(typed.map(|v| v.to_bits()))
            }
            _ => false,
        };
        let row = self.rows.iter().rposition(is_it).map_or(self.rows.len(), |index| index + 1);
        let session = self.begun()?.0;
        Ok(RowAdded { session, row, begun, diver_created, notes })
    }

    /// Replaces a row that was typed wrong; what had stood there.
    ///
    /// # Errors
    /// A row that is not there or is struck, or of the other kind; one that cannot be; a book that cannot be written.
    pub fn correct(&mut self, row: usize, again: &Row) -> Result<KeptRow, WorkError> {
        self.refused(again, Some(row))?;
        let before = row.checked_sub(1).and_then(|index| self.rows.get(index)).cloned();
        let columns = self.session.readings.clone();
        let (number, book) = self.begun()?;
        match again {
            Row::Readings { at_s, po2_bar } => {
                let readings = one_row(&columns, *at_s, po2_bar);
                stamped(|stamp| book.correct_session_readings(number, row, &readings, stamp))??;
            }
            Row::Event(event) => {
                stamped(|stamp| book.correct_session_event(number, row, event, stamp))??;
            }
        }
        self.read_again()?;
        before.ok_or_else(|| SessionEnterError::NoRows.into())
    }

    /// Strikes a row.
    ///
    /// # Errors
    /// A row that is not there or is struck already, the first reading, a reason that says nothing; a book that cannot be
    /// written.
    pub fn strike(&mut self, row: usize, why: &str) -> Result<(), WorkError> {
        let why = said("the reason", why)?.to_owned();
        if self.first_reading() == Some(row) {
            return Err(SessionEnterError::FirstStays.into());
        }
        let (number, book) = self.begun()?;
        stamped(|stamp| book.strike_session_row(number, row, &why, stamp))??;
        self.read_again()
    }

    /// Restates something around the rows. An empty text leaves it as it is.
    ///
    /// # Errors
    /// A text that is no answer, or a question whose answer stays; a book that cannot be written.
    pub fn restate(&mut self, question: SessionQuestion, text: &str) -> Result<(), WorkError> {
        let text = text.trim();
        if text.is_empty() {
            return Ok(());
        }
        let orifice = question == SessionQuestion::Orifice;
        if question.stays() || (orifice && self.line_run.is_some()) {
            return Err(SessionEnterError::Stays(question.word()).into());
        }
        if question.of_the_pool() && self.session.place == Place::Couch {
            return Err(SessionEnterError::PoolOnly(question.word()).into());
        }
        let mut session = self.session.clone();
        put(&mut session, question, text)?;
        if orifice {
            let line = line_of(&self.shelf, &session, None)?;
            let by_ip = |event: &Event| matches!(event.what, What::Injection(Injection::Ip(_)));
            if line.is_none() && session.events.iter().any(by_ip) {
                return Err(SessionEnterError::NoLine.into());
            }
            self.line = line;
        }
        let (Some(number), Some(book)) = (self.number, &mut self.book) else {
            self.session = session;
            return Ok(());
        };
        stamped(|stamp| book.restate_session(number, &session, stamp))??;
        self.read_again()
    }

    /// Says that all rows are in. A session whose input is wrong stays open; one that merely has no answer ends.
    ///
    /// # Errors
    /// Those of [`SessionDesk::may_finish`]; a book that cannot be written.
    pub fn finish(&mut self) -> Result<(), WorkError> {
        self.may_finish()?;
        let (number, book) = self.begun()?;
        stamped(|stamp| book.finish_session(number, stamp))??;
        self.read_again()
    }

    /// Whether the session can end.
    ///
    /// # Errors
    /// No row, no reading, no injection, an event outside the readings; anything else that cannot be worked out.
    pub fn may_finish(&self) -> Result<(), WorkError> {
        if self.rows.is_empty() {
            return Err(SessionEnterError::NoRows.into());
        }
        if self.session.readings.time_s.is_empty() {
            return Err(SessionEnterError::NoReadings.into());
        }
        if !has_injection(&self.session) {
            return Err(SessionEnterError::NoInjection.into());
        }
        self.of_line(&self.session, &mut Vec::new())?;
        match work_out(std::slice::from_ref(&self.gathered())) {
            Ok(_) => Ok(()),
            Err(WorkError::Uptake {
                error: UptakeError::EventOutside { index, at_s, last_s, .. }, ..
            }) => {
                let is_event =
                    |row: &KeptRow| row.struck.is_none() && matches!(row.content, RowContent::Event(_));
                let rows = self.rows.iter().enumerate().filter(|(_, row)| is_event(row));
                let row = rows.map(|(i, _)| i + 1).nth(index.saturating_sub(1)).unwrap_or(index);
                Err(SessionEnterError::EventOutside { row, at: clock(at_s), last: clock(last_s) }.into())
            }
            Err(WorkError::Uptake { error, .. }) => {
                Err(SessionEnterError::NotWorkedOut(error.to_string()).into())
            }
            Err(error) => Err(error),
        }
    }

    /// A row in the words of `report`.
    #[must_use]
    pub fn words<'r>(&self, row: &'r KeptRow) -> RowWords<'r> {
        match &row.content {
            RowContent::Readings(values) => {
                let (at_s, rest) = values.split_first().map_or((f64::NAN, &[][..]), |(at, rest)| (*at, rest));
                let po2_bar = rest.get(..self.session.readings.cells.len()).unwrap_or(rest);
                RowWords::Readings { at_s, po2_bar }
            }
            RowContent::Event(event) => RowWords::Event(event),
        }
    }

    /// Whether a row is behind one that is later: mostly a slip of the fingers, though a file may have such rows too.
    #[must_use]
    pub fn is_earlier(&self, row: &Row) -> bool {
        let Row::Readings { at_s, .. } = row else { return false };
        last_reading(&self.session) > *at_s
    }

    fn begun(&mut self) -> Result<(SessionNumber, &mut Book), SessionEnterError> {
        self.number.zip(self.book.as_mut()).ok_or(SessionEnterError::NoRows)
    }

    fn read_again(&mut self) -> Result<(), WorkError> {
        let (Some(number), Some(book)) = (self.number, &self.book) else { return Ok(()) };
        let record = book.session(number)?;
        self.take(record);
        Ok(())
    }

    /// Takes the session as the book has it, and works it out again.
    fn take(&mut self, record: SessionRecord) {
        self.open = record.state == RunState::Open;
        self.session = record.session;
        self.rows = record.rows;
        self.left_out = record.left_out;
        let mut gathered = self.gathered();
        if self.open {
            gathered.session = up_to_now(gathered.session);
        }
        let readings = !self.session.readings.time_s.is_empty();
        self.worked = readings.then(|| work_out(std::slice::from_ref(&gathered)));
    }

    /// The session as the uptake takes it.
    fn gathered(&self) -> GatheredSession {
        GatheredSession {
            name: self.number.map_or_else(|| "the session".to_owned(), |number| number.to_string()),
            session: with_left_out(self.session.clone(), &self.left_out),
            line: self.line.clone(),
            left_out: self.left_out.clone(),
        }
    }

    /// The number of the first row of readings that stands.
    fn first_reading(&self) -> Option<usize> {
        let stands = |row: &KeptRow| row.struck.is_none() && matches!(row.content, RowContent::Readings(_));
        self.rows.iter().position(stands).map(|index| index + 1)
    }

    /// Refuses a row that cannot be; `replaces` is the row it is to correct.
    fn refused(&self, row: &Row, replaces: Option<usize>) -> Result<(), WorkError> {
        match row {
            Row::Event(Event { at_s, .. }) if *at_s < 0.0 => {
                Err(SessionEnterError::BeforeFirst(clock(*at_s)).into())
            }
            Row::Event(Event { what: What::Injection(Injection::Ip(_)), .. }) if self.line.is_none() => {
                Err(SessionEnterError::NoLine.into())
            }
            Row::Event(event) => {
                let alone = Session { events: vec![*event], ..self.session.clone() };
                self.of_line(&alone, &mut Vec::new())
            }
            Row::Readings { at_s, po2_bar } => {
                let first = self.first_reading();
                if (first.is_none() || first == replaces) && at_s.abs() > 0.0 {
                    return Err(SessionEnterError::NotAtZero.into());
                }
                if *at_s < 0.0 {
                    return Err(SessionEnterError::BeforeFirst(clock(*at_s)).into());
                }
                let cells = self.session.readings.cells.len();
                if cells > 0 && po2_bar.len() != cells {
                    return Err(SessionEnterError::OtherCells { got: po2_bar.len(), cells }.into());
                }
                if po2_bar.iter().all(|po2| po2.is_nan()) {
                    return Err(SessionEnterError::NoCell.into());
                }
                Ok(self.impossible(po2_bar)?)
            }
        }
    }

    /// Whether the line says anything at the pressures of a session, and what is to be said of it.
    fn of_line(&self, session: &Session, notes: &mut Vec<String>) -> Result<(), WorkError> {
        let name = self.number.map_or_else(|| "the session".to_owned(), |number| number.to_string());
        note_line(&name, false, session, self.line.as_ref(), notes)
    }

    /// Refuses a PO2 that cannot be here: from a file it would be counted as a fault of the cell, from a keyboard it is
    /// mostly a slip.
    fn impossible(&self, po2_bar: &[f64]) -> Result<(), SessionEnterError> {
        let conditions = &self.session.conditions;
        let surface = conditions.barometer.value.unwrap_or(AbsolutePressure::STANDARD_ATMOSPHERE);
        let depth = conditions.depth.value.unwrap_or(Length::from_m(0.0));
        let most = ABOVE_AMBIENT * at_depth(surface, depth, conditions.water).as_bar();
        match po2_bar.iter().position(|po2| *po2 <= 0.0 || *po2 > most) {
            None => Ok(()),
            Some(index) => Err(SessionEnterError::Impossible {
                cell: index + 1,
                shown: po2_bar.get(index).map_or_else(String::new, |po2| format!("{po2}")),
                most: fixed(most, 2),
            }),
        }
    }
}

/// One row of readings; the first one names the cells c1, c2 and so on.
fn one_row(there: &SessionReadings, at_s: f64, po2_bar: &[f64]) -> SessionReadings {
    let name = |index: usize| match there.cells.get(index) {
        Some(cell) => cell.name.clone(),
        None => format!("c{}", index + 1),
    };
    let cell =
        |(index, po2): (usize, &f64)| CellReadings { name: name(index), signal: CellSignal::Bar(vec![*po2]) };
    SessionReadings {
        time_s: vec![at_s],
        cells: po2_bar.iter().enumerate().map(cell).collect(),
        depth_m: None,
        loop_temperature_k: None,
    }
}
