//! The dialogue of a typed session: cautions and questions, then rows and commands until it is complete or left.
//!
//! Comes in: a session that begins or goes on, and a [`Talk`]. Goes out: the session as it stands. With somebody there a
//! wrong answer gets one sentence and the same question again; from a pipe it ends the dialogue, and what was
//! acknowledged before stays. A row is acknowledged only when it is in the book; a PO2 past a floor or a ceiling is
//! acknowledged and cautioned in one breath.

use super::super::with_causes;
use super::dialogue::{Answer, Broken, Refused, Step, at_line, hear_answer, not_taken};
use super::talk::{Heard, Talk};
use crate::entry::SessionNumber;
use crate::report::layout::wrapped;
use crate::report::session_enter_questions::{self as questions, SessionQuestion};
use crate::report::session_enter_words::{self as words, RowWords};
use crate::report::{Units, session_uptake};
use crate::work::ExitStatus;
use crate::work::enter::{EnterError, is_passing};
use crate::work::enter_session::{Row, SessionDesk, SessionEnterError, SessionStart, Typed, read};

/// A session that is about to be typed.
pub enum SessionBeginning {
    /// A new one, as far as options say.
    New(Box<SessionStart>),
    /// One that was left open.
    Again(Box<SessionDesk>),
}

/// Holds the dialogue; none when it was left before there was anything to type rows into.
///
/// # Errors
/// A refusal from a pipe, a book that fails, an end of the talk that fails.
pub fn converse_session(
    beginning: SessionBeginning,
    talk: &mut Talk<'_>,
    units: &Units,
) -> Result<Option<SessionDesk>, Broken> {
    let desk = match beginning {
        SessionBeginning::New(start) => {
            let Some(desk) = begin(*start, talk)? else { return Ok(None) };
            desk
        }
        SessionBeginning::Again(desk) => go_on(*desk, talk, units)?,
    };
    let mut table = Table { desk, units: *units };
    while table.desk.is_open() {
        if table.step(talk)? == Step::Left {
            break;
        }
    }
    Ok(Some(table.desk))
}

fn begin(mut start: SessionStart, talk: &mut Talk<'_>) -> Result<Option<SessionDesk>, Broken> {
    for note in start.take_notes() {
        talk.note(&note);
    }
    if talk.asks {
        talk.say(&words::cautions())?;
        talk.say(&words::greeting(start.diver(), start.is_registered(), start.open_session()))?;
        if !ask_all(&mut start, talk)? {
            return Ok(None);
        }
    } else {
        hear_needed(&mut start, talk)?;
        if let Some(caution) = words::depth_caution(start.session()) {
            talk.note(&caution);
        }
    }
    let ready = start.ready()?;
    for note in &ready.notes {
        talk.note(note);
    }
    talk.prompt(&format!("\n{}", words::how_to_type()))?;
    Ok(Some(SessionDesk::new(ready)))
}

fn go_on(desk: SessionDesk, talk: &mut Talk<'_>, units: &Units) -> Result<SessionDesk, Broken> {
    if talk.asks {
        talk.say(&words::cautions())?;
        if let Some(number) = desk.number() {
            talk.say(&words::going_on(number, desk.session()))?;
        }
        talk.say(&words::list(&desk.listed(), units))?;
        talk.say(&standing(&desk))?;
        talk.say(&format!("\n{}", words::how_to_type()))?;
    }
    Ok(desk)
}

/// Asks everything that is not said yet; whether nobody left.
fn ask_all(start: &mut SessionStart, talk: &mut Talk<'_>) -> Result<bool, Broken> {
    for question in SessionQuestion::ALL {
        while !start.is_answered(question) {
            talk.say(&questions::question(question, &start.default_words(question)))?;
            let Answer::Text(text) = hear_answer(talk)? else { return Ok(false) };
            if text == "?" {
                talk.say(&questions::explained(question))?;
            } else if let Err(error) = start.answer(question, bare(&text, question)) {
                not_taken(error, talk)?;
            }
            for note in start.take_notes() {
                talk.note(&note);
            }
            if question == SessionQuestion::Depth
                && let Some(caution) = words::depth_caution(start.session())
            {
                talk.say(&wrapped("  ! ", "    ", &caution))?;
            }
        }
    }
    Ok(true)
}

/// From a pipe only what nobody should guess is waited for, a line each.
fn hear_needed(start: &mut SessionStart, talk: &mut Talk<'_>) -> Result<(), Broken> {
    for question in SessionQuestion::NEEDED {
        while !start.is_answered(question) {
            let needed = questions::asked_for(question);
            let Some(heard) = talk.hear()? else { return Err(EnterError::EndedBefore(needed).into()) };
            let says = match heard.text() {
                Ok(text) if text.trim().is_empty() || text.trim().starts_with('#') => continue,
                Ok(text) => match start.answer(question, bare(text.trim(), question)) {
                    Ok(()) => continue,
                    Err(error) if error.status() == ExitStatus::Wrong => with_causes(&error),
                    Err(error) => return Err(error.into()),
                },
                Err(says) => says.to_owned(),
            };
            let says = format!("{needed} is needed here (or as --{}): {says}", question.word());
            return Err(at_line(talk, says, words::kept(None, 0)).into());
        }
    }
    Ok(())
}

/// An answer without the word for what it answers, which may stand before it.
fn bare(text: &str, question: SessionQuestion) -> &str {
    let after = text.strip_prefix(question.word());
    after.filter(|rest| rest.starts_with(char::is_whitespace)).unwrap_or(text).trim()
}

/// What the rows say so far, in a line.
fn standing(desk: &SessionDesk) -> String {
    let so_far = desk.so_far();
    words::standing(so_far.median_bar, so_far.slope.as_ref(), &so_far.needs)
}

/// The session on the desk, and how results are shown.
struct Table {
    desk: SessionDesk,
    units: Units,
}

impl Table {
    /// Hears one line and does what it says.
    fn step(&mut self, talk: &mut Talk<'_>) -> Result<Step, Broken> {
        talk.prompt(&words::row_prompt(self.desk.rows() + 1))?;
        let Some(heard) = talk.hear()? else {
            talk.prompt("\n")?;
            return Ok(Step::Left);
        };
        let typed = match heard.text() {
            Ok(text) => read(&text, self.desk.session()).map_err(|error| error.to_string()),
            Err(says) => Err(says.to_owned()),
        };
        let done = match typed {
            Ok(typed) => self.act(typed, talk),
            Err(says) => Err(Refused::Line(says)),
        };
        match done {
            Ok(step) => Ok(step),
            Err(Refused::Talk(error)) => Err(Broken::Talk(error)),
            // Somebody who sits there tries again; a pipe cannot.
            Err(Refused::Work(error)) if talk.asks && is_passing(&error) => {
                self.refused(with_causes(&error), talk)
            }
            Err(Refused::Work(error)) if error.status() != ExitStatus::Wrong => {
                talk.note(&words::kept(self.desk.number(), self.desk.rows()));
                Err(Broken::Work(error))
            }
            Err(Refused::Work(error)) => self.refused(with_causes(&error), talk),
            Err(Refused::Line(says)) => self.refused(says, talk),
        }
    }

    fn refused(&self, says: String, talk: &mut Talk<'_>) -> Result<Step, Broken> {
        if talk.asks {
            talk.say(&wrapped("  ", "  ", &says))?;
            return Ok(Step::On);
        }
        let kept = words::kept(self.desk.number(), self.desk.rows());
        Err(at_line(talk, says, kept).into())
    }

    fn act(&mut self, typed: Typed, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        match typed {
            Typed::Nothing => {}
            Typed::Quit => return Ok(Step::Left),
            Typed::Help => talk.say(&words::help())?,
            Typed::List => talk.say(&words::list(&self.desk.listed(), &self.units))?,
            Typed::SoFar => self.so_far(talk, false)?,
            Typed::Sheet => self.so_far(talk, true)?,
            Typed::Conditions => talk.say(&words::conditions(self.desk.session()))?,
            Typed::Row(row) => self.row(&row, talk)?,
            Typed::Correct(number, again) => self.correct(number, &again, talk)?,
            Typed::Strike(row, why) => {
                self.desk.strike(row, &why)?;
                talk.say(&words::row_struck(self.number()?, row, why.trim()))?;
                talk.say(&standing(&self.desk))?;
            }
            Typed::Restate(question, text) => return self.restate(question, text, talk),
            Typed::Done => self.desk.finish()?,
        }
        Ok(Step::On)
    }

    fn row(&mut self, row: &Row, talk: &mut Talk<'_>) -> Result<(), Refused> {
        let earlier = self.desk.is_earlier(row);
        let added = self.desk.add(row)?;
        for note in &added.notes {
            talk.note(note);
        }
        if added.begun {
            talk.say(&words::begun(added.session, &self.desk.session().diver, added.diver_created))?;
        }
        talk.say(&words::row_taken(added.session, added.row, words_of(row), &self.units))?;
        self.caution(row, talk)?;
        if earlier {
            let number = added.row;
            talk.note(&format!(
                "row {number} is earlier than a row before it: if that is a slip, correct {number} …"
            ));
        }
        talk.say(&standing(&self.desk))?;
        Ok(())
    }

    /// What a typed PO2 asks for at once: beside the row, and from a pipe also where somebody may be watching.
    fn caution(&self, row: &Row, talk: &mut Talk<'_>) -> Result<(), Refused> {
        let Row::Readings { po2_bar, .. } = row else { return Ok(()) };
        if let Some(caution) = words::po2_caution(self.desk.session().place, po2_bar) {
            talk.say(&wrapped("  ! ", "    ", &caution))?;
        }
        Ok(())
    }

    fn correct(&mut self, row: usize, again: &Row, talk: &mut Talk<'_>) -> Result<(), Refused> {
        let before = self.desk.correct(row, again)?;
        let was = self.desk.words(&before);
        talk.say(&words::row_corrected(self.number()?, row, words_of(again), was, &self.units))?;
        self.caution(again, talk)?;
        talk.say(&standing(&self.desk))?;
        Ok(())
    }

    /// Restates an answer; without a text it is asked for, and an empty answer leaves it.
    fn restate(
        &mut self,
        question: SessionQuestion,
        mut text: String,
        talk: &mut Talk<'_>,
    ) -> Result<Step, Refused> {
        if text.is_empty() && !talk.asks {
            // The next line is a row, and no answer.
            let word = question.word();
            return Err(Refused::Line(format!("{word} wants what it is on the same line")));
        }
        loop {
            if text.is_empty() {
                let now = words::stands(question, self.desk.session());
                talk.prompt(&questions::question(question, &now))?;
                match talk.hear()?.map(Heard::text) {
                    None => {
                        talk.prompt("\n")?;
                        return Ok(Step::Left);
                    }
                    Some(Ok(line)) => text = line.trim().to_owned(),
                    Some(Err(says)) => return Err(Refused::Line(says.to_owned())),
                }
                if text.is_empty() {
                    return Ok(Step::On);
                }
                if text == "?" {
                    talk.say(&questions::explained(question))?;
                    text.clear();
                    continue;
                }
            }
            match self.desk.restate(question, bare(&text, question)) {
                Ok(()) => break,
                Err(error) if talk.asks && error.status() == ExitStatus::Wrong => {
                    talk.say(&wrapped("  ", "  ", &with_causes(&error)))?;
                    return Ok(Step::On);
                }
                Err(error) => return Err(Refused::Work(error)),
            }
        }
        talk.say(&words::restated(self.desk.number(), question, self.desk.session()))?;
        if question == SessionQuestion::Depth
            && let Some(caution) = words::depth_caution(self.desk.session())
        {
            talk.say(&wrapped("  ! ", "    ", &caution))?;
        }
        if self.desk.rows() > 0 {
            talk.say(&standing(&self.desk))?;
        }
        Ok(Step::On)
    }

    /// The uptake so far: in a sentence, or `whole` with everything it rests on.
    fn so_far(&self, talk: &mut Talk<'_>, whole: bool) -> Result<(), Refused> {
        let text = match self.desk.outcome() {
            Some(outcome) => {
                let named = outcome.named();
                let reported = outcome.reported(&named);
                if whole {
                    session_uptake::text(&reported, &self.units)
                } else {
                    wrapped("  ", "    ", &session_uptake::summary_line(&reported, &self.units))
                }
            }
            None => wrapped("  ", "    ", &words::needed(&self.desk.so_far().needs)),
        };
        Ok(talk.say(&text)?)
    }

    fn number(&self) -> Result<SessionNumber, SessionEnterError> {
        self.desk.number().ok_or(SessionEnterError::NoRows)
    }
}

fn words_of(row: &Row) -> RowWords<'_> {
    match row {
        Row::Readings { at_s, po2_bar } => RowWords::Readings { at_s: *at_s, po2_bar },
        Row::Event(event) => RowWords::Event(event),
    }
}
