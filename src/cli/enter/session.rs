//! `session enter` and `session resume`: a couch or pool session typed at a prompt, or from a pipe.
//!
//! The streams are those of a typed run: questions and answers alternate on a terminal, a pipe is asked nothing, and with
//! `--json` stdout holds the document alone.

use std::io::{self, IsTerminal as _, Write};

use super::super::arguments::{EnterSession, Global, ResumeSession};
use super::super::{Ended, say, shelf, tell_notes, units};
use super::dialogue::Broken;
use super::session_dialogue::{SessionBeginning, converse_session};
use super::talk::Talk;
use crate::report::session_enter_questions::SessionQuestion;
use crate::report::{session_enter_words as words, session_uptake, uptake_json};
use crate::work::ExitStatus;
use crate::work::enter_session::{SessionDesk, SessionEnterError, SessionStart};

pub(in crate::cli) fn enter(arguments: &EnterSession, global: &Global) -> Result<ExitStatus, Ended> {
    let asks = io::stdin().is_terminal();
    hold(SessionBeginning::New(Box::new(start(arguments, global)?)), asks, global)
}

/// The session as far as options say.
pub(in crate::cli) fn start(arguments: &EnterSession, global: &Global) -> Result<SessionStart, Ended> {
    let mut start = SessionStart::new(shelf(global)?, &arguments.diver)?;
    // What was said goes before what the file says; the place first, because a pool is asked more.
    for (question, text) in [
        (SessionQuestion::Place, &arguments.place),
        (SessionQuestion::Loop, &arguments.r#loop),
        (SessionQuestion::Diluent, &arguments.diluent),
        (SessionQuestion::LoopVolume, &arguments.loop_volume),
        (SessionQuestion::Mass, &arguments.mass),
        (SessionQuestion::LeakTest, &arguments.leak_test),
        (SessionQuestion::Barometer, &arguments.barometer),
        (SessionQuestion::Depth, &arguments.depth),
        (SessionQuestion::LoopTemperature, &arguments.loop_temperature),
        (SessionQuestion::TimeOnLoop, &arguments.time_on_loop),
        (SessionQuestion::CellGain, &arguments.gain),
        (SessionQuestion::Orifice, &arguments.orifice),
        (SessionQuestion::Taken, &arguments.taken),
    ] {
        if let Some(text) = text {
            start.answer(question, text)?;
        }
    }
    if let Some(file) = &arguments.from {
        start.take_from(file)?;
    }
    Ok(start)
}

pub(in crate::cli) fn resume(arguments: &ResumeSession, global: &Global) -> Result<ExitStatus, Ended> {
    let asks = io::stdin().is_terminal();
    let desk = SessionDesk::resume(shelf(global)?, &arguments.session)?;
    hold(SessionBeginning::Again(Box::new(desk)), asks, global)
}

/// Holds the dialogue on the standard streams and says how it ended.
fn hold(beginning: SessionBeginning, asks: bool, global: &Global) -> Result<ExitStatus, Ended> {
    // The document stands alone on stdout, and a prompt belongs where somebody sees it.
    let aside = global.json || (asks && !io::stdout().is_terminal());
    let mut input = io::stdin().lock();
    let mut out: Box<dyn Write> = if aside { Box::new(io::stderr()) } else { Box::new(io::stdout()) };
    let mut notes = io::stderr();
    let mut talk = Talk::new(&mut input, &mut out, &mut notes, asks);
    match converse_session(beginning, &mut talk, &units(global)) {
        Ok(Some(desk)) => end(&desk, asks, global),
        Ok(None) => left(None, asks, global),
        Err(Broken::Work(error)) => Err(error.into()),
        Err(Broken::Talk(error)) if error.kind() == io::ErrorKind::BrokenPipe => {
            Err(Ended::ClosedStdout(ExitStatus::Done))
        }
        Err(Broken::Talk(error)) => Err(Ended::Stdout(error)),
    }
}

pub(in crate::cli) fn end(desk: &SessionDesk, asks: bool, global: &Global) -> Result<ExitStatus, Ended> {
    if desk.is_open() || global.json {
        return left(Some(desk), asks, global);
    }
    let mut text = String::new();
    let mut with_uptake = false;
    if let Some(outcome) = desk.outcome() {
        let named = outcome.named();
        let reported = outcome.reported(&named);
        text.push('\n');
        text.push_str(&session_uptake::text(&reported, &units(global)));
        text.push('\n');
        with_uptake = session_uptake::why_not(&reported).is_none();
    }
    text.push_str(&desk.number().map_or_else(String::new, |number| words::finished(number, with_uptake)));
    say(&text, ExitStatus::Done)
}

/// The document, or what became of a session that was left.
pub(in crate::cli) fn left(
    desk: Option<&SessionDesk>,
    asks: bool,
    global: &Global,
) -> Result<ExitStatus, Ended> {
    let number = desk.and_then(SessionDesk::number);
    if number.is_none() && !asks {
        return Err(SessionEnterError::NothingTyped.into());
    }
    let Some(desk) = desk.filter(|_| global.json) else {
        return say(&words::left_open(number, desk.map_or(0, SessionDesk::rows)), ExitStatus::Done);
    };
    let uptake = desk.outcome().map(|outcome| {
        let named = outcome.named();
        let reported = outcome.reported(&named);
        tell_notes(&session_uptake::why_not(&reported).into_iter().collect::<Vec<_>>());
        uptake_json::document(&reported)
    });
    let document = words::document(number, desk.is_open(), desk.session(), &desk.listed(), uptake.as_deref());
    say(&document, ExitStatus::Done)
}
