//! `bench log`, `session log`, and their `resume`: a screen on a terminal, else a line a second.
//!
//! On a terminal that can be drawn on there is a screen; from a pipe, on a dumb terminal and with `--by-itself` a line a
//! second is printed; with `--json` only the document at the end. Ctrl-C and a wish of the system to end leave the run
//! open, with everything that was heard in the book.

use std::io;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use super::arguments::{BenchLog, EnterSession, Global, LogLength, Resume, ResumeSession, SessionLog};
use super::live::{BenchLines, BenchScreen, Look, SessionLines, SessionScreen, has_screen};
use super::{Ended, enter, interrupt, note, shelf, units};
use crate::report::bench_live::BenchView;
use crate::report::session_live::SessionView;
use crate::work::ExitStatus;
use crate::work::log::{
    self, BenchEnded, BenchFace, BenchLogRequest, BenchWish, HowLong, SessionEnded, SessionFace, SessionHow,
    SessionLogRequest, SessionWish, Why, Wires,
};

pub(super) fn bench(arguments: &BenchLog, global: &Global) -> Result<ExitStatus, Ended> {
    let stop = interrupt::flag();
    let shelf = shelf(global)?;
    let request = BenchLogRequest {
        orifice: arguments.orifice.clone(),
        gas: arguments.gas.clone(),
        oxygen: arguments.oxygen.clone(),
        meter: arguments.meter.clone(),
        transducer: arguments.transducer.clone(),
        barometer: arguments.barometer.clone(),
        temperature: arguments.temperature.clone(),
        purpose: arguments.purpose.clone(),
        technician: arguments.technician.clone(),
        acceptance: arguments.acceptance.clone(),
        how: how(&arguments.length, global),
    };
    let ended = before_bench(arguments.length.by_itself, &stop, global, |face| {
        log::log(&shelf, &request, &Wires::of_the_system(), face, &|| stop.load(Ordering::Relaxed))
    })?;
    end_bench(&ended, global)
}

pub(super) fn resume_bench(arguments: &Resume, global: &Global) -> Result<ExitStatus, Ended> {
    if !log::run_was_logged(&shelf(global)?, &arguments.run)? {
        return enter::resume(arguments, global);
    }
    let stop = interrupt::flag();
    let shelf = shelf(global)?;
    let how = how(&arguments.length, global);
    let stopped = || stop.load(Ordering::Relaxed);
    let held = log::is_held(&shelf, &arguments.run)?;
    let ended = before_bench(arguments.length.by_itself, &stop, global, |face| {
        let wires = Wires::of_the_system();
        if held {
            log::watch(&shelf, &arguments.run, how, &wires, face, &stopped)
        } else {
            log::resume(&shelf, &arguments.run, how, &wires, face, &stopped)
        }
    })?;
    end_bench(&ended, global)
}

pub(super) fn session(arguments: &SessionLog, global: &Global) -> Result<ExitStatus, Ended> {
    let stop = interrupt::flag();
    let shelf = shelf(global)?;
    let session: &EnterSession = &arguments.session;
    // An instrument in the register that goes by the name is meant before a value.
    let depth = log::names_an_instrument(&shelf, session.depth.as_deref())?;
    let temperature = log::names_an_instrument(&shelf, session.loop_temperature.as_deref())?;
    let mut without = session.clone();
    if depth {
        without.depth = None;
    }
    if temperature {
        without.loop_temperature = None;
    }
    let start = enter::session::start(&without, global)?;
    let request = SessionLogRequest {
        start,
        from: session.from.as_deref().map(Path::new),
        cells: arguments.cell.clone(),
        depth: session.depth.clone().filter(|_| depth),
        loop_temperature: session.loop_temperature.clone().filter(|_| temperature),
        injection: arguments.injection.clone(),
        how: SessionHow { lasts: arguments.lasts, units: units(global) },
    };
    let ended = before_session(&stop, global, |face| {
        log::log_session(&shelf, request, &Wires::of_the_system(), face, &|| stop.load(Ordering::Relaxed))
    })?;
    end_session(&ended, global)
}

pub(super) fn resume_session(arguments: &ResumeSession, global: &Global) -> Result<ExitStatus, Ended> {
    let shelf = shelf(global)?;
    if !log::was_logged(&shelf, &arguments.session)? {
        return enter::session::resume(arguments, global);
    }
    let stop = interrupt::flag();
    let how = SessionHow { lasts: arguments.lasts, units: units(global) };
    let ended = before_session(&stop, global, |face| {
        let wires = Wires::of_the_system();
        log::resume_session(&shelf, &arguments.session, how, &wires, face, &|| stop.load(Ordering::Relaxed))
    })?;
    end_session(&ended, global)
}

fn how(length: &LogLength, global: &Global) -> HowLong {
    HowLong {
        by_itself: length.by_itself || !has_screen(),
        lasts: length.lasts,
        points: length.points,
        units: units(global),
    }
}

/// Runs before the face that fits where the output goes.
fn before_bench<T>(
    by_itself: bool,
    stop: &Arc<AtomicBool>,
    global: &Global,
    run: impl FnOnce(&mut dyn BenchFace) -> Result<T, crate::work::WorkError>,
) -> Result<T, Ended> {
    if global.json {
        return Ok(run(&mut Quiet)?);
    }
    if by_itself || !has_screen() {
        let mut stdout = io::stdout();
        let mut lines = BenchLines::new(&mut stdout, Arc::clone(stop));
        let ended = run(&mut lines)?;
        return heard(lines.closed()).map(|()| ended);
    }
    let look = Look::of_environment(global.no_color);
    let mut screen = BenchScreen::open(look, Arc::clone(stop)).map_err(Ended::Stdout)?;
    let ended = run(&mut screen);
    // The terminal is as it was before anything else is said.
    drop(screen);
    Ok(ended?)
}

fn before_session<T>(
    stop: &Arc<AtomicBool>,
    global: &Global,
    run: impl FnOnce(&mut dyn SessionFace) -> Result<T, crate::work::WorkError>,
) -> Result<T, Ended> {
    if global.json {
        return Ok(run(&mut Quiet)?);
    }
    if !has_screen() {
        let mut stdout = io::stdout();
        let mut lines = SessionLines::new(&mut stdout, Arc::clone(stop));
        let ended = run(&mut lines)?;
        return heard(lines.closed()).map(|()| ended);
    }
    let look = Look::of_environment(global.no_color);
    let mut screen = SessionScreen::open(look, Arc::clone(stop)).map_err(Ended::Stdout)?;
    let ended = run(&mut screen);
    drop(screen);
    Ok(ended?)
}

/// A reader of stdout that went away ends quietly, as everywhere.
fn heard(closed: Option<io::ErrorKind>) -> Result<(), Ended> {
    match closed {
        None => Ok(()),
        Some(io::ErrorKind::BrokenPipe) => Err(Ended::ClosedStdout(ExitStatus::Done)),
        Some(kind) => Err(Ended::Stdout(kind.into())),
    }
}

fn end_bench(ended: &BenchEnded, global: &Global) -> Result<ExitStatus, Ended> {
    if ended.why == Why::NoLineYet {
        note(
            "ebbline: its time or its points are reached, but no line can be made of it yet: the run stays open",
        );
    }
    match &ended.desk {
        Some(desk) => enter::end(desk, true, global),
        None => enter::left(None, true, global),
    }
}

fn end_session(ended: &SessionEnded, global: &Global) -> Result<ExitStatus, Ended> {
    if let Some(why) = &ended.not_yet {
        note(&format!("ebbline: its time is over, but the session stays open: {why}"));
    }
    match &ended.desk {
        Some(desk) => enter::session::end(desk, true, global),
        None => enter::session::left(None, true, global),
    }
}

/// Nobody before it: notes go to stderr, and a document comes at the end.
struct Quiet;

impl BenchFace for Quiet {
    fn show(&mut self, _: &BenchView) {}

    fn wishes(&mut self) -> Vec<BenchWish> {
        Vec::new()
    }

    fn say(&mut self, sentence: &str) {
        note(sentence);
    }
}

impl SessionFace for Quiet {
    fn show(&mut self, _: &SessionView) {}

    fn wishes(&mut self) -> Vec<SessionWish> {
        Vec::new()
    }

    fn say(&mut self, sentence: &str) {
        note(sentence);
    }
}
