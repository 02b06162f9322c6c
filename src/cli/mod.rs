//! Arguments, and what the terminal shows; nothing is computed here.
//!
//! Two steps: [`arguments`] holds what was typed and touches nothing, then each verb's file turns it into a request of
//! `work` and writes what comes back. Results go to stdout, errors to stderr as one sentence with its causes, and the
//! exit status is the one of [`ExitStatus`].

pub mod arguments;
mod bench;
mod book;
mod certificate;
mod demo;
pub mod enter;
mod instrument;
mod interrupt;
pub mod live;
mod log;
mod manual;
mod registers;
mod rig;
mod session;
mod setting;

use std::ffi::OsString;
use std::io::{self, Write};

use clap::{CommandFactory as _, FromArgMatches as _};

use crate::report::Units;
use crate::work::shelf::Shelf;
use crate::work::{ExitStatus, WorkError};
use arguments::{Arguments, Bench, Command, Global};

/// Runs the program with its arguments, the first being its own name, and answers with the exit status.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> u8 {
    let arguments: Vec<OsString> = arguments.into_iter().collect();
    let mut command = Arguments::command();
    if arguments.iter().any(|a| a == "--no-color") {
        command = command.color(clap::ColorChoice::Never);
    }
    let parsed = command.try_get_matches_from_mut(arguments).and_then(|m| Arguments::from_arg_matches(&m));
    let parsed = match parsed {
        Ok(parsed) => parsed,
        Err(error) => {
            // Help and version come this way too, on stdout and with status 0. A closed stream has no reader to tell.
            let _ = error.print();
            return u8::try_from(error.exit_code()).unwrap_or(ExitStatus::Wrong.code());
        }
    };
    match verb(&parsed) {
        Ok(status) => status.code(),
        Err(Ended::Work(error)) => {
            tell(&error);
            error.status().code()
        }
        Err(Ended::ClosedStdout(status)) => status.code(),
        Err(Ended::Stdout(error)) => {
            let _ = writeln!(io::stderr(), "ebbline: the output cannot be written: {error}");
            ExitStatus::Failed.code()
        }
    }
}

/// Why a verb ended early.
enum Ended {
    /// It could not be done.
    Work(WorkError),
    /// The reader of stdout went away; the verb had ended with this status.
    ClosedStdout(ExitStatus),
    /// Stdout cannot be written.
    Stdout(io::Error),
}

impl<E: Into<WorkError>> From<E> for Ended {
    fn from(error: E) -> Self {
        Self::Work(error.into())
    }
}

fn verb(arguments: &Arguments) -> Result<ExitStatus, Ended> {
    match &arguments.command {
        Command::Demo(demo) => demo::demo(demo, &arguments.global),
        Command::Bench(verb) => match verb {
            Bench::Enter(enter) => enter::enter(enter, &arguments.global),
            Bench::Log(bench_log) => log::bench(bench_log, &arguments.global),
            Bench::Resume(resume) => log::resume_bench(resume, &arguments.global),
            Bench::Import(import) => bench::import(import, &arguments.global),
            Bench::Fit(fit) => bench::fit(fit, &arguments.global),
            Bench::LeaveOut(leave_out) => bench::leave_out(leave_out, &arguments.global),
            Bench::Accept(accept) => bench::accept(accept, &arguments.global),
            Bench::List(list) => bench::list(list, &arguments.global),
            Bench::Show(show) => bench::show(show, &arguments.global),
        },
        Command::Session(verb) => session::session(verb, &arguments.global),
        Command::Setting(arguments_of) => setting::setting(arguments_of, &arguments.global),
        Command::Certificate(verb) => certificate::certificate(verb, &arguments.global),
        Command::Orifice(verb) => registers::orifice(verb, &arguments.global),
        Command::Instrument(verb) => registers::instrument(verb, &arguments.global),
        Command::FirstStage(verb) => registers::first_stage(verb, &arguments.global),
        Command::Diver(verb) => registers::diver(verb, &arguments.global),
        Command::Acceptance(verb) => registers::acceptance(verb, &arguments.global),
        Command::Shop(verb) => registers::shop(verb, &arguments.global),
        Command::Rig(arguments_of) => rig::rig(arguments_of, &arguments.global),
        Command::Book(verb) => book::book(verb, &arguments.global),
        Command::Completions { shell } => manual::completions(*shell),
        Command::Man => manual::man(),
    }
}

/// Writes a verb's result to stdout.
fn say(text: &str, status: ExitStatus) -> Result<ExitStatus, Ended> {
    let mut stdout = io::stdout().lock();
    match stdout.write_all(text.as_bytes()).and_then(|()| stdout.flush()) {
        Ok(()) => Ok(status),
        Err(error) if error.kind() == io::ErrorKind::BrokenPipe => Err(Ended::ClosedStdout(status)),
        Err(error) => Err(Ended::Stdout(error)),
    }
}

/// Writes a note to stderr; a closed stderr has no reader to tell.
fn note(text: &str) {
    let _ = writeln!(io::stderr(), "{text}");
}

/// Writes an error with its causes to stderr.
fn tell(error: &WorkError) {
    note(&format!("ebbline: {}", with_causes(error)));
}

/// An error with its causes, each once.
fn with_causes(error: &WorkError) -> String {
    let mut text = error.to_string();
    let mut cause = std::error::Error::source(error);
    while let Some(source) = cause {
        let said = source.to_string();
        if !text.contains(&said) {
            text.push_str(": ");
            text.push_str(&said);
        }
        cause = source.source();
    }
    text
}

/// Tells what was noticed on the way.
fn tell_notes(notes: &[String]) {
    for text in notes {
        note(&format!("note: {text}"));
    }
}

/// The book that was named, or the one at its usual place.
fn shelf(global: &Global) -> Result<Shelf, Ended> {
    Ok(Shelf::find(global.book.as_deref())?)
}

fn units(global: &Global) -> Units {
    Units::new(global.show)
}
