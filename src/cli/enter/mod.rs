//! `bench enter` and `bench resume`: a run typed at a prompt, or from a pipe; a session likewise, in `session`.
//!
//! With a terminal questions and answers alternate on it; from a pipe nothing is asked, and each point is acknowledged
//! on stdout as soon as it is in the book. With `--json` stdout holds the document alone and the talk goes to stderr.
//! Everything is over [`BufRead`](std::io::BufRead) and [`Write`], so that a test can hold the same dialogue.

mod dialogue;
mod line;
mod talk;
mod session_dialogue;
pub(super) mod session;

use std::io::{self, IsTerminal as _, Write};

use super::arguments::{self, Global};
use super::{Ended, say, shelf, units};
use crate::report::{bench_fit, enter_words as words};
use crate::work::enter::{Desk, EnterError, Start};
use crate::work::{ExitStatus, WorkError};

pub use crate::report::enter_questions::Question;
pub use crate::report::session_enter_questions::SessionQuestion;
pub use dialogue::{Beginning, Broken, Manner, converse};
pub use session_dialogue::{SessionBeginning, converse_session};
pub use talk::Talk;

pub(super) fn enter(arguments: &arguments::Enter, global: &Global) -> Result<ExitStatus, Ended> {
    let asks = io::stdin().is_terminal();
    let mut start = Start::new(shelf(global)?, &arguments.orifice, asks)?;
    let said = |start: &mut Start, question: Question, text: &Option<String>| -> Result<(), WorkError> {
        text.as_ref().map_or(Ok(()), |text| start.answer(question, text))
    };
    // The gas first, because the papers of a meter are read for it.
    said(&mut start, Question::Gas, &arguments.gas)?;
    if let Some(purity) = &arguments.oxygen {
        start.take_purity(purity)?;
    }
    if let Some(file) = &arguments.from {
        start.take_from(file)?;
    }
    for (question, text) in [
        (Question::Purpose, &arguments.purpose),
        (Question::Meter, &arguments.meter),
        (Question::Transducer, &arguments.transducer),
        (Question::Acceptance, &arguments.acceptance),
        (Question::Technician, &arguments.technician),
        (Question::Barometer, &arguments.barometer),
        (Question::Temperature, &arguments.temperature),
        (Question::Taken, &arguments.taken),
    ] {
        said(&mut start, question, text)?;
    }
    hold(Beginning::New(Box::new(start)), &arguments.typed, asks, global)
}

pub(super) fn resume(arguments: &arguments::Resume, global: &Global) -> Result<ExitStatus, Ended> {
    let asks = io::stdin().is_terminal();
    let desk = Desk::resume(shelf(global)?, &arguments.run)?;
    hold(Beginning::Again(Box::new(desk)), &arguments.typed, asks, global)
}

/// Holds the dialogue on the standard streams and says how it ended.
fn hold(
    beginning: Beginning,
    typed: &arguments::Typed,
    asks: bool,
    global: &Global,
) -> Result<ExitStatus, Ended> {
    let manner = Manner {
        pressure_unit: typed.pressure_unit,
        flow_unit: typed.flow_unit,
        absolute: typed.absolute,
        units: units(global),
    };
    // The document stands alone on stdout, and a prompt belongs where somebody sees it.
    let aside = global.json || (asks && !io::stdout().is_terminal());
    let mut input = io::stdin().lock();
    let mut out: Box<dyn Write> = if aside { Box::new(io::stderr()) } else { Box::new(io::stdout()) };
    let mut notes = io::stderr();
    let held = converse(beginning, &mut Talk::new(&mut input, &mut out, &mut notes, asks), &manner);
    match held {
        Ok(Some(desk)) => end(&desk, asks, global),
        Ok(None) => left(None, asks, global),
        Err(Broken::Work(error)) => Err(error.into()),
        Err(Broken::Talk(error)) if error.kind() == io::ErrorKind::BrokenPipe => {
            Err(Ended::ClosedStdout(ExitStatus::Done))
        }
        Err(Broken::Talk(error)) => Err(Ended::Stdout(error)),
    }
}

pub(super) fn end(desk: &Desk, asks: bool, global: &Global) -> Result<ExitStatus, Ended> {
    if desk.is_open() || global.json {
        return left(Some(desk), asks, global);
    }
    let line = desk.line();
    let mut text = String::new();
    if let Some((analysis, low)) = &line {
        text.push('\n');
        text.push_str(&bench_fit::sheet(&desk.fitted(analysis, low.as_ref()), &units(global)));
        text.push('\n');
    }
    text.push_str(&desk.number().map_or_else(String::new, |number| words::finished(number, line.is_some())));
    say(&text, ExitStatus::Done)
}

/// The document, or what became of a run that was left.
pub(super) fn left(desk: Option<&Desk>, asks: bool, global: &Global) -> Result<ExitStatus, Ended> {
    let number = desk.and_then(Desk::number);
    if number.is_none() && !asks {
        return Err(EnterError::NothingTyped.into());
    }
    let Some(desk) = desk.filter(|_| global.json) else {
        return say(&words::left_open(number, desk.map_or(0, |desk| desk.points().len())), ExitStatus::Done);
    };
    let line = desk.line();
    let fitted = line.as_ref().map(|(analysis, low)| desk.fitted(analysis, low.as_ref()));
    say(&words::document(number, desk.is_open(), desk.run(), fitted.as_ref()), ExitStatus::Done)
}
