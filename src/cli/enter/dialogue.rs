//! The dialogue itself: questions, then points and commands until the run is complete or left.
//!
//! Comes in: a run that begins or goes on, and a [`Talk`]. Goes out: the run as it stands. With somebody there a wrong
//! answer gets one sentence and the same question again; from a pipe it ends the dialogue, and what was acknowledged
//! before stays. A point is acknowledged only when it is in the book.

use std::io;

use super::super::with_causes;
use super::line::{self, FlowTyped, PointTyped, Typed, example};
use super::talk::{Heard, Talk};
use crate::entry::{Indication, MeterKind, PointReading, RunNumber, Sweep};
use crate::quantity::Unit;
use crate::report::enter_questions::{self as questions, Question};
use crate::report::enter_words::{self as words, TypedUnits};
use crate::report::layout::wrapped;
use crate::report::{Units, bench_fit};
use crate::work::enter::{Desk, EnterError, Standing, Start, is_passing};
use crate::work::enter_session::SessionEnterError;
use crate::work::{ExitStatus, WorkError};

/// A run that is about to be typed.
pub enum Beginning {
    /// A new one, as far as options say.
    New(Box<Start>),
    /// One that was left open.
    Again(Box<Desk>),
}

/// How the dialogue reads and shows numbers; none given takes that of a run file, else the common one.
#[derive(Debug, Clone, Copy, Default)]
pub struct Manner {
    /// Unit of pressures typed without one.
    pub pressure_unit: Option<Unit>,
    /// Unit of flows typed without one.
    pub flow_unit: Option<Unit>,
    /// Whether the transducer shows absolute pressure.
    pub absolute: bool,
    /// Units of results.
    pub units: Units,
}

/// Why the dialogue broke off.
#[derive(Debug)]
pub enum Broken {
    /// Something was refused from a pipe, or the book failed.
    Work(WorkError),
    /// Nobody listens any more, or nothing can be read.
    Talk(io::Error),
}

impl From<io::Error> for Broken {
    fn from(error: io::Error) -> Self {
        Self::Talk(error)
    }
}

impl From<WorkError> for Broken {
    fn from(error: WorkError) -> Self {
        Self::Work(error)
    }
}

impl From<EnterError> for Broken {
    fn from(error: EnterError) -> Self {
        Self::Work(error.into())
    }
}

/// What an answer led to.
pub(super) enum Answer {
    /// Something typed.
    Text(String),
    /// The end of the input, or `quit`.
    Left,
}

/// Holds the dialogue; none when it was left before there was anything to type points into.
///
/// # Errors
/// A refusal from a pipe, a book that fails, an end of the talk that fails.
pub fn converse(beginning: Beginning, talk: &mut Talk<'_>, manner: &Manner) -> Result<Option<Desk>, Broken> {
    let mut table = match beginning {
        Beginning::New(start) => {
            let Some(table) = begin(*start, talk, manner)? else { return Ok(None) };
            table
        }
        Beginning::Again(desk) => go_on(*desk, talk, manner)?,
    };
    while table.desk.is_open() {
        if table.step(talk)? == Step::Left {
            break;
        }
    }
    Ok(Some(table.desk))
}

fn begin(mut start: Start, talk: &mut Talk<'_>, manner: &Manner) -> Result<Option<Table>, Broken> {
    let asked = if talk.asks {
        talk.say(&words::greeting(
            start.orifice(),
            start.is_registered(),
            start.own_limits(),
            start.open_run(),
        ))?;
        ask_all(&mut start, talk)?
    } else {
        hear_needed(&mut start, talk)?;
        true
    };
    if !asked {
        return Ok(None);
    }
    let ready = start.ready()?;
    for note in &ready.notes {
        talk.note(note);
    }
    let default = TypedUnits::default();
    let typed = TypedUnits {
        pressure: manner.pressure_unit.or(ready.pressure_unit).unwrap_or(default.pressure),
        absolute: manner.absolute || ready.absolute,
        flow: manner.flow_unit.or(ready.flow_unit).unwrap_or(default.flow),
        timed: false,
    };
    let table = Table::new(Desk::new(ready), typed, manner.units);
    talk.prompt(&format!("\n{}", words::how_to_type(&table.typed)))?;
    Ok(Some(table))
}

fn go_on(desk: Desk, talk: &mut Talk<'_>, manner: &Manner) -> Result<Table, Broken> {
    let absolute = desk.points().first().is_some_and(|p| matches!(p.pressure, Indication::Absolute(_)));
    let default = TypedUnits::default();
    let typed = TypedUnits {
        pressure: manner.pressure_unit.unwrap_or(default.pressure),
        absolute: manner.absolute || absolute,
        flow: manner.flow_unit.unwrap_or(default.flow),
        timed: false,
    };
    let mut table = Table::new(desk, typed, manner.units);
    if talk.asks {
        if let Some(number) = table.desk.number() {
            talk.say(&words::going_on(number, table.desk.run()))?;
        }
        talk.say(&format!("  {}\n", words::conditions_words(table.desk.run())))?;
        talk.say(&table.list())?;
        table.say_standing(None, talk)?;
        talk.say(&format!("\n{}", words::how_to_type(&table.typed)))?;
    } else {
        table.desk.remember();
    }
    Ok(table)
}

/// Asks everything that is not said yet; whether nobody left.
fn ask_all(start: &mut Start, talk: &mut Talk<'_>) -> Result<bool, Broken> {
    if let Some((run, bench)) = start.same_bench() {
        loop {
            talk.say(&questions::same_bench_question(run, &bench))?;
            let Answer::Text(text) = hear_answer(talk)? else { return Ok(false) };
            match text.to_lowercase().as_str() {
                "" | "yes" | "y" => match start.take_same_bench() {
                    Ok(()) => break,
                    Err(error) => not_taken(error, talk)?,
                },
                "no" | "n" => break,
                _ => talk.say("  yes or no\n")?,
            }
        }
    }
    for question in Question::ALL {
        while !start.is_answered(question) {
            talk.say(&questions::question(question, start.default_words(question).as_deref()))?;
            let Answer::Text(text) = hear_answer(talk)? else { return Ok(false) };
            if text == "?" {
                talk.say(&questions::explained(question))?;
            } else if let Err(error) = start.answer(question, bare(&text, question)) {
                not_taken(error, talk)?;
            }
            for note in start.take_notes() {
                talk.note(&note);
            }
        }
    }
    Ok(true)
}

/// From a pipe only what has no common default is waited for, a line each.
fn hear_needed(start: &mut Start, talk: &mut Talk<'_>) -> Result<(), Broken> {
    for question in Question::NEEDED {
        while !start.is_answered(question) {
            let Some(heard) = talk.hear()? else {
                return Err(EnterError::EndedBefore(questions::asked_for(question)).into());
            };
            let says = match heard.text() {
                Ok(text) if text.trim().is_empty() || text.trim().starts_with('#') => continue,
                Ok(text) => match start.answer(question, bare(text.trim(), question)) {
                    Ok(()) => continue,
                    Err(error) if error.status() == ExitStatus::Wrong => with_causes(&error),
                    Err(error) => return Err(error.into()),
                },
                Err(says) => says.to_owned(),
            };
            let option = question.word();
            let says =
                format!("{} is needed here (or as --{option}): {says}", questions::asked_for(question));
            return Err(at_line(talk, says, words::kept(None, 0)).into());
        }
    }
    Ok(())
}

/// An answer without the word for what it answers, which may stand before it.
fn bare(text: &str, question: Question) -> &str {
    let after = text.strip_prefix(question.word());
    after.filter(|rest| rest.starts_with(char::is_whitespace)).unwrap_or(text).trim()
}

/// The next answer of somebody who sits there.
pub(super) fn hear_answer(talk: &mut Talk<'_>) -> Result<Answer, Broken> {
    loop {
        match talk.hear()?.map(Heard::text) {
            None => {
                // The prompt still stands on its line.
                talk.prompt("\n")?;
                return Ok(Answer::Left);
            }
            Some(Ok(text)) if matches!(text.trim(), "quit" | "exit") => return Ok(Answer::Left),
            Some(Ok(text)) => return Ok(Answer::Text(text.trim().to_owned())),
            Some(Err(says)) => talk.say(&format!("  {says}\n"))?,
        }
    }
}

/// Says why an answer is not taken; what is not the answer's fault ends the dialogue.
pub(super) fn not_taken(error: WorkError, talk: &mut Talk<'_>) -> Result<(), Broken> {
    if error.status() != ExitStatus::Wrong {
        return Err(Broken::Work(error));
    }
    Ok(talk.say(&wrapped("  ", "  ", &with_causes(&error)))?)
}

pub(super) fn at_line(talk: &Talk<'_>, says: String, kept: String) -> EnterError {
    EnterError::AtLine { line: talk.line(), says, kept }
}

/// Whether the dialogue goes on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Step {
    On,
    Left,
}

/// The run on the desk, and how its numbers are read and shown.
struct Table {
    desk: Desk,
    typed: TypedUnits,
    units: Units,
}

impl Table {
    fn new(desk: Desk, typed: TypedUnits, units: Units) -> Self {
        let timed = matches!(desk.run().meter.kind, MeterKind::Timed { .. });
        Self { desk, typed: TypedUnits { timed, ..typed }, units }
    }

    /// Hears one line and does what it says.
    fn step(&mut self, talk: &mut Talk<'_>) -> Result<Step, Broken> {
        talk.prompt(&words::point_prompt(self.desk.points().len() + 1))?;
        let Some(heard) = talk.hear()? else {
            talk.prompt("\n")?;
            return Ok(Step::Left);
        };
        let typed = match heard.text() {
            Ok(text) => line::read(&text, &self.typed).map_err(|error| error.to_string()),
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
                talk.note(&words::kept(self.desk.number(), self.desk.points().len()));
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
        let kept = words::kept(self.desk.number(), self.desk.points().len());
        Err(at_line(talk, says, kept).into())
    }

    fn act(&mut self, typed: Typed, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        match typed {
            Typed::Nothing => {}
            Typed::Quit => return Ok(Step::Left),
            Typed::Help => talk.say(&words::help(&self.typed))?,
            Typed::List => talk.say(&self.list())?,
            Typed::Sheet => self.sheet(talk)?,
            Typed::Point(point) => return self.point(point, talk),
            Typed::Correct(point, again) => self.correct(point, again, talk)?,
            Typed::Strike(point, why) => {
                self.desk.strike(point, &why)?;
                talk.say(&words::point_struck(self.number()?, point, why.trim()))?;
                self.say_standing(None, talk)?;
            }
            Typed::Zero(text) => return self.restate(self.before_or_after().0, &text, talk),
            Typed::Leak(text) => return self.restate(self.before_or_after().1, &text, talk),
            Typed::Barometer(text) => return self.restate(Question::Barometer, &text, talk),
            Typed::Temperature(text) => return self.restate(Question::Temperature, &text, talk),
            Typed::Conditions => {
                for question in [Question::Barometer, Question::Temperature] {
                    if self.restate(question, "", talk)? == Step::Left {
                        return Ok(Step::Left);
                    }
                }
            }
            Typed::Done { anyway } => return self.done(anyway, talk),
        }
        Ok(Step::On)
    }

    fn point(&mut self, typed: PointTyped, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        for remark in &typed.remarks {
            talk.note(remark);
        }
        let (flow, sweep) = match typed.flow {
            Some(flow) => (flow, typed.sweep),
            None => match self.flow(&typed, talk)? {
                FlowHeard::Flow(flow, sweep) => (flow, sweep.or(typed.sweep)),
                FlowHeard::Nothing => return Ok(Step::On),
                FlowHeard::Left => return Ok(Step::Left),
            },
        };
        let reading = line::reading(typed.pressure, flow, sweep);
        if !(typed.with_units && flow.with_units) {
            self.desk.doubt(&reading, None, &self.typed)?;
        }
        let added = self.desk.add(reading)?;
        for note in &added.notes {
            talk.note(note);
        }
        if added.begun {
            talk.say(&words::begun(added.run, &self.desk.run().orifice, added.orifice_created))?;
        }
        talk.say(&words::point_taken(added.run, added.point, &reading, &self.typed))?;
        self.say_standing(Some(added.point), talk)?;
        Ok(Step::On)
    }

    /// The flow of a point whose pressure was typed alone.
    fn flow(&self, typed: &PointTyped, talk: &mut Talk<'_>) -> Result<FlowHeard, Refused> {
        loop {
            talk.prompt(&words::flow_prompt(typed.pressure, &self.typed))?;
            let Some(heard) = talk.hear()? else {
                talk.prompt("\n")?;
                return if talk.asks {
                    Ok(FlowHeard::Left)
                } else {
                    Err(Refused::Line(format!(
                        "a pressure alone is no point: write both, as in {}",
                        example(&self.typed)
                    )))
                };
            };
            let read = match heard.text() {
                Ok(text) => line::read_flow(&text, &self.typed).map_err(|error| error.to_string()),
                Err(says) => Err(says.to_owned()),
            };
            match read {
                Ok(Some((flow, sweep))) => return Ok(FlowHeard::Flow(flow, sweep)),
                Ok(None) if talk.asks => {
                    talk.say("  no point was taken\n")?;
                    return Ok(FlowHeard::Nothing);
                }
                Ok(None) => {}
                Err(says) if talk.asks => talk.say(&wrapped("  ", "  ", &says))?,
                Err(says) => return Err(Refused::Line(says)),
            }
        }
    }

    fn correct(&mut self, point: usize, typed: PointTyped, talk: &mut Talk<'_>) -> Result<(), Refused> {
        let Some(flow) = typed.flow else { return Ok(()) };
        let there = point.checked_sub(1).and_then(|i| self.desk.points().get(i)).and_then(|p| p.sweep);
        let reading: PointReading = line::reading(typed.pressure, flow, typed.sweep.or(there));
        if !typed.with_units {
            self.desk.doubt(&reading, Some(point), &self.typed)?;
        }
        let before = self.desk.correct(point, reading)?;
        talk.say(&words::point_corrected(self.number()?, point, &reading, &before, &self.typed))?;
        self.say_standing(Some(point), talk)?;
        Ok(())
    }

    /// Restates a condition, or zero or leak; without a text it is asked for, and an empty answer leaves it.
    fn restate(&mut self, question: Question, text: &str, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        let mut text = text.to_owned();
        loop {
            if text.is_empty() {
                let now = words::stands(question, self.desk.run());
                talk.prompt(&questions::question(question, Some(&now)))?;
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
                    text.clear();
                }
                Err(error) => return Err(Refused::Work(error)),
            }
        }
        talk.say(&words::restated(self.desk.number(), question, self.desk.run()))?;
        self.say_standing(None, talk)?;
        Ok(Step::On)
    }

    fn done(&mut self, anyway: bool, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        self.desk.may_finish(anyway)?;
        if talk.asks {
            let after = self.desk.run().after;
            let open = [
                (Question::ZeroAfter, after.zero.is_none()),
                (Question::LeakAfter, after.leak_pa_s.is_none()),
            ];
            for question in open.into_iter().filter(|(_, open)| *open).map(|(question, _)| question) {
                if self.ask_after(question, talk)? == Step::Left {
                    return Ok(Step::Left);
                }
            }
        }
        self.desk.finish(anyway)?;
        Ok(Step::On)
    }

    fn ask_after(&mut self, question: Question, talk: &mut Talk<'_>) -> Result<Step, Refused> {
        loop {
            talk.say(&questions::question(question, Some("not read")))?;
            match hear_answer(talk).map_err(Refused::of)? {
                Answer::Left => return Ok(Step::Left),
                Answer::Text(text) if text == "?" => talk.say(&questions::explained(question))?,
                Answer::Text(text) => match self.desk.restate(question, bare(&text, question)) {
                    Ok(()) => return Ok(Step::On),
                    Err(error) => not_taken(error, talk).map_err(Refused::of)?,
                },
            }
        }
    }

    fn sheet(&self, talk: &mut Talk<'_>) -> Result<(), Refused> {
        match self.desk.line() {
            Some((analysis, low)) => {
                talk.say(&bench_fit::sheet(&self.desk.fitted(analysis, low.as_ref()), &self.units))?;
            }
            None => talk.say(&self.why_no_line())?,
        }
        Ok(())
    }

    fn list(&self) -> String {
        let analysis = match self.desk.standing() {
            Standing::Line(fitted) => Some(fitted.analysis),
            _ => None,
        };
        words::list(self.desk.points(), self.desk.left_out(), analysis, &self.typed)
    }

    fn why_no_line(&self) -> String {
        match self.desk.standing() {
            Standing::More { missing, not_choked } => words::more_points(missing, not_choked),
            Standing::No(error) => words::no_line(&with_causes(error)),
            Standing::Line(_) => String::new(),
        }
    }

    /// Says what the points say now, as far as it changed.
    fn say_standing(&mut self, point: Option<usize>, talk: &mut Talk<'_>) -> Result<(), io::Error> {
        let text = match self.desk.standing() {
            Standing::Line(fitted) => words::running(&fitted, point, self.desk.said(), &self.units),
            _ if self.desk.points().is_empty() => String::new(),
            _ => self.why_no_line(),
        };
        self.desk.remember();
        talk.say(&text)
    }

    /// Zero and leak belong before the first point, or after the last.
    fn before_or_after(&self) -> (Question, Question) {
        if self.desk.points().is_empty() {
            (Question::ZeroBefore, Question::LeakBefore)
        } else {
            (Question::ZeroAfter, Question::LeakAfter)
        }
    }

    fn number(&self) -> Result<RunNumber, EnterError> {
        self.desk.number().ok_or(EnterError::NoPoints)
    }
}

/// The flow of a point, asked for.
enum FlowHeard {
    Flow(FlowTyped, Option<Sweep>),
    Nothing,
    Left,
}

/// Why a line was not done.
pub(super) enum Refused {
    Line(String),
    Work(WorkError),
    Talk(io::Error),
}

impl Refused {
    fn of(broken: Broken) -> Self {
        match broken {
            Broken::Work(error) => Self::Work(error),
            Broken::Talk(error) => Self::Talk(error),
        }
    }
}

impl From<io::Error> for Refused {
    fn from(error: io::Error) -> Self {
        Self::Talk(error)
    }
}

impl From<WorkError> for Refused {
    fn from(error: WorkError) -> Self {
        Self::Work(error)
    }
}

impl From<SessionEnterError> for Refused {
    fn from(error: SessionEnterError) -> Self {
        Self::Work(error.into())
    }
}

impl From<EnterError> for Refused {
    fn from(error: EnterError) -> Self {
        Self::Work(error.into())
    }
}
