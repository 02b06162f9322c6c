//! What has to be known before the first row.
//!
//! Comes in: answers as text, from options, prompts or a session file. Goes out: a [`SessionReady`] session without rows.
//! Diluent, loop volume and mass have the diver's own entry for their default; what is not said about conditions and rest
//! stays unsaid, and the uptake warns of it.

use std::path::Path;

use chrono::{DateTime, FixedOffset, Timelike as _};

use super::SessionEnterError;
use super::answers::{put, says, take};
use crate::book::{Book, BookError, RunState, SessionQuery};
use crate::clock;
use crate::entry::{
    CellPapers, Diluent, Diver, Id, Influence, LeakTest, LineReference, LoopKept, Place, Rest, Run, Session,
    SessionConditions, SessionNumber, SessionReadings,
};
use crate::quantity::show::uncertain_to_text;
use crate::record::{read_run_and_files, read_session_setup};
use crate::report::session_enter_questions::SessionQuestion;
use crate::report::session_enter_words::stands;
use crate::work::WorkError;
use crate::work::lines::{self, FoundLine};
use crate::work::shelf::{Shelf, ShelfRegisters};
use crate::work::uptake::note_line;

/// What is known of a session before it begins.
#[derive(Debug)]
pub struct SessionStart {
    shelf: Shelf,
    /// As it stands in the register; none when it is new.
    registered: Option<Diver>,
    /// A session of this diver that is still open.
    open: Option<SessionNumber>,
    /// As far as it is known; without readings and events.
    session: Session,
    taken: Option<DateTime<FixedOffset>>,
    answered: Vec<SessionQuestion>,
    line_run: Option<Run>,
    notes: Vec<String>,
}

/// A session that can begin with its first row.
#[derive(Debug)]
pub struct SessionReady {
    pub(super) shelf: Shelf,
    /// The session, without rows.
    pub session: Session,
    /// The run of the run file that its setup names.
    pub line_run: Option<Run>,
    pub(super) line: Option<FoundLine>,
    /// What was said on the way.
    pub notes: Vec<String>,
}

impl SessionStart {
    /// Begins with a diver.
    ///
    /// # Errors
    /// A text that is no name; a book that is there and cannot be read.
    pub fn new(shelf: Shelf, diver: &str) -> Result<Self, WorkError> {
        let diver = Id::new(diver)
            .map_err(|why| SessionEnterError::Name { text: diver.to_owned(), why: why.to_string() })?;
        let (mut registered, mut open) = (None, None);
        if let Some(book) = there(&shelf)? {
            registered = book.entry::<Diver>(&diver)?.map(|found| found.entry);
            let of = SessionQuery { diver: Some(diver.clone()), limit: Some(1), offset: 0 };
            let newest = book.sessions(&of)?;
            open = newest.first().filter(|row| row.state == RunState::Open).map(|row| row.number);
        }
        let session = Session {
            diver: registered.as_ref().map_or(diver, |diver| diver.id.clone()),
            mass: registered.as_ref().and_then(|diver| diver.mass),
            place: Place::Couch,
            kept: LoopKept::Held,
            diluent: registered.as_ref().and_then(|diver| diver.diluent).unwrap_or(Diluent::Air),
            loop_volume: registered.as_ref().and_then(|diver| diver.loop_volume),
            leak_test: LeakTest::NotDone,
            nose_clip: None,
            oxygen: None,
            taken: this_second(),
            readings: SessionReadings::default(),
            line: None,
            conditions: SessionConditions::default(),
            cells: CellPapers::default(),
            rest: Rest::default(),
            assumptions: crate::entry::Assumptions::DEFAULT,
            events: Vec::new(),
            cylinder: None,
        };
        Ok(Self {
            shelf,
            registered,
            open,
            session,
            taken: None,
            answered: Vec::new(),
            line_run: None,
            notes: Vec::new(),
        })
    }

    /// Takes from a session file everything that is not given yet but the time, readings and events.
    ///
    /// # Errors
    /// A file that is refused, or the run file it names.
    pub fn take_from(&mut self, file: &Path) -> Result<(), WorkError> {
        let loaded = read_session_setup(file)?;
        self.notes.extend(loaded.notes.iter().map(ToString::to_string));
        let said = loaded.value;
        if let (false, Some(LineReference::RunFile(name))) =
            (self.is_answered(SessionQuestion::Orifice), &said.line)
        {
            let at = file.parent().unwrap_or(Path::new("")).join(name);
            let registers = ShelfRegisters::new(&self.shelf);
            let run = match read_run_and_files(&at, &registers) {
                Ok((run, _)) => run,
                Err(refused) => return Err(registers.failure().unwrap_or_else(|| refused.into())),
            };
            self.notes.extend(run.notes.iter().map(ToString::to_string));
            self.line_run = Some(run.value);
        }
        let of_another = |diver: &Id| !diver.as_str().eq_ignore_ascii_case(self.session.diver.as_str());
        let another = said.diver.as_ref().filter(|diver| of_another(diver));
        let taken = match another {
            None => "volume, conditions and rest are",
            Some(_) => "conditions are",
        };
        self.notes.extend(another.map(|diver| {
            format!("{} is of {diver}: mass, loop volume and rest are not taken from it", file.display())
        }));
        for question in SessionQuestion::ALL {
            let known = self.answered.contains(&question) || (another.is_some() && question.of_the_diver());
            if !known && says(&said, question) {
                take(&mut self.session, question, said.clone());
                self.answered.push(question);
            }
        }
        self.session.oxygen = said.oxygen;
        self.session.assumptions = said.assumptions;
        self.session.cylinder = said.cylinder;
        self.session.conditions.water = said.conditions.water;
        self.notes.push(format!(
            "{taken} those of {}: what differs today is typed anew, as in barometer 1009 hPa ± 1 hPa",
            file.display()
        ));
        Ok(())
    }

    /// The diver.
    #[must_use]
    pub const fn diver(&self) -> &Id {
        &self.session.diver
    }

    /// Whether the diver is in the register.
    #[must_use]
    pub const fn is_registered(&self) -> bool {
        self.registered.is_some()
    }

    /// The newest session of this diver, when it is still open.
    #[must_use]
    pub const fn open_session(&self) -> Option<SessionNumber> {
        self.open
    }

    /// The session as far as it is known.
    #[must_use]
    pub const fn session(&self) -> &Session {
        &self.session
    }

    /// What is to be said since this was asked last.
    pub fn take_notes(&mut self) -> Vec<String> {
        std::mem::take(&mut self.notes)
    }

    /// Whether a question has its answer, or is not asked at this place.
    #[must_use]
    pub fn is_answered(&self, question: SessionQuestion) -> bool {
        let elsewhere = question.of_the_pool() && self.session.place == Place::Couch;
        elsewhere || self.answered.contains(&question)
    }

    /// What an empty answer means, in words.
    #[must_use]
    pub fn default_words(&self, question: SessionQuestion) -> String {
        match question {
            SessionQuestion::Taken => this_second().to_rfc3339(),
            _ => stands(question, &self.session),
        }
    }

    /// Takes an answer; an empty one means what [`SessionStart::default_words`] says.
    ///
    /// # Errors
    /// A text that is no answer, each in one sentence; an orifice without a line; a book that cannot be read.
    pub fn answer(&mut self, question: SessionQuestion, text: &str) -> Result<(), WorkError> {
        let text = text.trim();
        if question == SessionQuestion::Taken {
            self.taken = Some(if text.is_empty() { this_second() } else { time(text)? });
        } else if !text.is_empty() {
            let mut session = self.session.clone();
            put(&mut session, question, text)?;
            if question == SessionQuestion::Orifice {
                // Whether it has a line is known now, and not when the diver is on the loop.
                line_of(&self.shelf, &session, None)?;
                self.line_run = None;
            }
            self.session = session;
        }
        self.answered.push(question);
        Ok(())
    }

    /// The session, when everything needed is known; what is not answered takes its default.
    ///
    /// # Errors
    /// A line that cannot be found or worked out.
    pub fn ready(mut self) -> Result<SessionReady, WorkError> {
        self.session.taken = self.taken.unwrap_or_else(this_second);
        let depth = self.session.conditions.depth.value.map_or(0.0, |depth| depth.as_m());
        if self.session.place == Place::Couch && depth.abs() > 0.0 {
            self.session.conditions.depth = Influence::default();
            self.notes.push("the depth that was said belongs to a pool, and is not taken".to_owned());
        }
        let own = self.registered.as_ref().and_then(|diver| diver.loop_volume);
        if let (Some(volume), false) = (own, self.answered.contains(&SessionQuestion::LoopVolume)) {
            let volume = uncertain_to_text(volume);
            self.notes.push(format!("the loop volume is that of the diver's entry: {volume}"));
        }
        if self.session.kept != LoopKept::Topped && self.session.cylinder.take().is_some() {
            self.notes
                .push("the cylinder of the file is weighed for a topped loop, and is not taken".to_owned());
        }
        if self.session.oxygen.is_none() {
            self.notes.push(crate::record::Note::PurityTaken.to_string());
        }
        let line = line_of(&self.shelf, &self.session, self.line_run.as_ref())?;
        note_line("the session", false, &self.session, line.as_ref(), &mut self.notes)?;
        Ok(SessionReady {
            shelf: self.shelf,
            session: self.session,
            line_run: self.line_run,
            line,
            notes: self.notes,
        })
    }
}

/// The line of a session: of the run that its file named, or of its orifice in the book.
///
/// # Errors
/// An orifice without a complete run; a run that cannot be analysed; a book that cannot be read.
pub(super) fn line_of(
    shelf: &Shelf,
    session: &Session,
    line_run: Option<&Run>,
) -> Result<Option<FoundLine>, WorkError> {
    match (&session.line, line_run) {
        (_, Some(run)) => {
            Ok(Some(lines::of_kept_run(run, Path::new("the run file"), session.taken.date_naive())?))
        }
        (Some(LineReference::Orifice(orifice)), None) => {
            Ok(Some(lines::from_book_at(&shelf.to_read()?, orifice, session.taken)?))
        }
        (Some(LineReference::RunFile(_)) | None, None) => Ok(None),
    }
}

/// The time a person would write down.
fn this_second() -> DateTime<FixedOffset> {
    let now = clock::now();
    now.with_nanosecond(0).unwrap_or(now)
}

fn time(text: &str) -> Result<DateTime<FixedOffset>, SessionEnterError> {
    DateTime::parse_from_rfc3339(text).map_err(|_| SessionEnterError::Taken(text.to_owned()))
}

/// The book, if there is one.
fn there(shelf: &Shelf) -> Result<Option<Book>, WorkError> {
    match shelf.to_read() {
        Ok(book) => Ok(Some(book)),
        Err(WorkError::Book(BookError::NoBook { .. })) => Ok(None),
        Err(error) => Err(error),
    }
}
