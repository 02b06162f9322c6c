//! `session uptake`: sessions from files and from the book, with their lines, to the diver's resting uptake.

use std::path::{Path, PathBuf};

use super::fit::{names_a_file, plot_kind, threads, write_plot};
use super::lines::{self, FoundLine};
use super::registers::id_of;
use super::sessions::{all_of, kept};
use super::shelf::Shelf;
use super::{ExitStatus, WorkError};
use crate::bench::monte_carlo::{FEWEST_TRIALS, MOST_TRIALS};
use crate::book::{Book, RunState};
use crate::entry::{
    CellSignal, Diver, Event, Injection, LineReference, Place, Session, SessionLeftOut, SessionNumber,
    SessionReadings, What,
};
use crate::plot::{SessionPlot, session_plot};
use crate::quantity::AbsolutePressure;
use crate::record::read_session;
use crate::report::Units;
use crate::report::session_uptake::{Named, Reported};
use crate::stats::monte_carlo::Plan;
use crate::uptake::{MonteCarlo, SessionInput, Uptake, uptake, uptake_by_monte_carlo};

/// An IP may lie so far beyond the pressures of the bench run, as a factor of the absolute pressure.
const BEYOND_BENCH: f64 = 1.1;
/// Absolute pressures this near the ends of the bench run count as measured, bar: barometers differ.
const SPAN_TOLERANCE_BAR: f64 = 0.1;
/// Seed of the Monte Carlo check; stored with its result.
const SEED: u64 = 101;

/// What is asked of sessions.
#[derive(Debug, Clone, Default)]
pub struct UptakeRequest {
    /// Session files, numbers of sessions of the book, or a diver of the book for all of that diver's.
    pub of: Vec<String>,
    /// Trials of a Monte Carlo check.
    pub monte_carlo: Option<usize>,
    /// Where the book is, if it was said.
    pub book: Option<PathBuf>,
    /// Where to draw it, `.svg` or `.png`; with several sessions each gets a file of its own.
    pub plot: Option<PathBuf>,
    /// The units of the plot.
    pub units: Units,
}

/// A session with what belongs to it.
#[derive(Debug, Clone, PartialEq)]
pub struct GatheredSession {
    /// Its number in the book, or its file.
    pub name: String,
    /// The session, with what was left out of it since excluded.
    pub session: Session,
    /// Its line.
    pub line: Option<FoundLine>,
    /// Stretches a person left out.
    pub left_out: Vec<SessionLeftOut>,
}

/// What came of it.
#[derive(Debug, Clone, PartialEq)]
pub struct UptakeOutcome {
    /// The sessions.
    pub sessions: Vec<GatheredSession>,
    /// What was made of them.
    pub uptake: Uptake,
    /// The Monte Carlo check, for each place that has an answer.
    pub monte_carlo: Vec<(Place, MonteCarlo)>,
    /// What was noticed on the way.
    pub notes: Vec<String>,
    /// The plots that were written.
    pub plots: Vec<PathBuf>,
}

impl UptakeOutcome {
    /// Favourable when there is a number.
    #[must_use]
    pub fn status(&self) -> ExitStatus {
        if self.uptake.lowest().is_some() { ExitStatus::Done } else { ExitStatus::Unfavourable }
    }

    /// The sessions for `report`.
    #[must_use]
    pub fn named(&self) -> Vec<Named<'_>> {
        named(&self.sessions)
    }

    /// The same for `report`.
    #[must_use]
    pub fn reported<'a>(&'a self, named: &'a [Named<'a>]) -> Reported<'a> {
        Reported { uptake: &self.uptake, sessions: named, monte_carlo: &self.monte_carlo, notes: &self.notes }
    }
}

pub(super) fn named(sessions: &[GatheredSession]) -> Vec<Named<'_>> {
    sessions
        .iter()
        .map(|s| Named {
            name: &s.name,
            session: &s.session,
            line: s.line.as_ref().map(|line| line.words.as_str()),
        })
        .collect()
}

/// Reads sessions, works out the uptake, and draws it.
///
/// # Errors
/// A file that is missing or refused, a session or diver that is not in the book, sessions that cannot be worked out, a
/// plot that cannot be written.
pub fn session_uptake(request: &UptakeRequest) -> Result<UptakeOutcome, WorkError> {
    if let Some(trials) = request.monte_carlo.filter(|n| !(FEWEST_TRIALS..=MOST_TRIALS).contains(n)) {
        return Err(WorkError::Trials(trials));
    }
    let kind = request.plot.as_deref().map(plot_kind).transpose()?;
    let mut notes = Vec::new();
    let sessions = gather(&request.of, request.book.as_deref(), &mut notes)?;
    let uptake = work_out(&sessions)?;
    let inputs = inputs(&sessions);
    let mut monte_carlo = Vec::new();
    if let Some(trials) = request.monte_carlo {
        let plan = Plan { trials, seed: SEED, threads: threads() };
        for place in uptake.places.iter().filter(|place| place.answer.is_ok()) {
            let found = uptake_by_monte_carlo(&inputs, place.place, &plan);
            let found = found.map_err(|error| wrong(&sessions, error))?;
            monte_carlo.push((place.place, found.ok_or(WorkError::NoMonteCarlo(trials))?));
        }
    }
    let mut outcome = UptakeOutcome { sessions, uptake, monte_carlo, notes, plots: Vec::new() };
    if let (Some(kind), Some(path)) = (kind, &request.plot) {
        let mut drawn = Vec::new();
        for (gathered, svg) in drawings(&outcome, &request.units) {
            let at =
                if outcome.sessions.len() == 1 { path.clone() } else { beside(path, &gathered.name, &drawn) };
            drawn.push((at, svg));
        }
        for (at, svg) in &drawn {
            write_plot(svg, kind, at)?;
        }
        outcome.plots = drawn.into_iter().map(|(at, _)| at).collect();
    }
    Ok(outcome)
}

/// Every session's drawing, in the order of the sessions.
fn drawings<'a>(outcome: &'a UptakeOutcome, units: &Units) -> Vec<(&'a GatheredSession, String)> {
    let of = |index: usize, gathered: &'a GatheredSession| {
        let place = outcome.uptake.places.iter().find(|place| place.place == gathered.session.place)?;
        let worked = place.sessions.iter().find(|worked| worked.index == index)?;
        let why_not = worked.answer.as_ref().err().map(crate::report::uptake_sentences::why_not);
        let options = SessionPlot {
            units: *units,
            name: gathered.name.clone(),
            left_out: gathered.left_out.iter().filter_map(|left| left.stretch_s).collect(),
            why_not,
            ..SessionPlot::default()
        };
        Some((gathered, session_plot(&gathered.session, worked, &options)))
    };
    outcome.sessions.iter().enumerate().filter_map(|(index, gathered)| of(index, gathered)).collect()
}

/// `plot.svg` of a session named `S0001` or `data/couch-1.toml`: `plot-S0001.svg`, `plot-couch-1.svg`; `plot-couch-1-2.svg`
/// where another folder's `couch-1.toml` was drawn before.
fn beside(path: &Path, name: &str, drawn: &[(PathBuf, String)]) -> PathBuf {
    let stem = Path::new(name).file_stem().unwrap_or_default().to_string_lossy();
    let plain: String =
        stem.chars().map(|c| if c.is_alphanumeric() || "-_.".contains(c) { c } else { '-' }).collect();
    let own = path.file_stem().unwrap_or_default().to_string_lossy();
    let ending = path.extension().unwrap_or_default().to_string_lossy();
    let taken = |at: &PathBuf| drawn.iter().any(|(other, _)| other == at);
    let first = path.with_file_name(format!("{own}-{plain}.{ending}"));
    let others = (2..).map(|n: u64| path.with_file_name(format!("{own}-{plain}-{n}.{ending}")));
    std::iter::once(first.clone()).chain(others).find(|at| !taken(at)).unwrap_or(first)
}

/// Works out the uptake of sessions that were gathered.
///
/// # Errors
/// What is wrong with a session itself.
pub fn work_out(sessions: &[GatheredSession]) -> Result<Uptake, WorkError> {
    uptake(&inputs(sessions)).map_err(|error| wrong(sessions, error))
}

fn inputs(sessions: &[GatheredSession]) -> Vec<SessionInput<'_>> {
    sessions
        .iter()
        .map(|s| SessionInput { session: &s.session, line: s.line.as_ref().map(FoundLine::line) })
        .collect()
}

/// The first session that is refused on its own is named; what is wrong between sessions names them itself.
fn wrong(sessions: &[GatheredSession], error: crate::uptake::UptakeError) -> WorkError {
    let alone = sessions.iter().find_map(|gathered| {
        let alone = uptake(&inputs(std::slice::from_ref(gathered))).err()?;
        Some(WorkError::Uptake { session: gathered.name.clone(), error: alone })
    });
    alone.unwrap_or_else(|| {
        let names: Vec<&str> = sessions.iter().map(|gathered| gathered.name.as_str()).collect();
        WorkError::Uptake { session: names.join(", "), error }
    })
}

/// Reads sessions by file, number or diver, each with its line. A session that was left out as a whole, or is still open,
/// counts only when it is named by its number.
///
/// # Errors
/// As [`session_uptake`].
pub fn gather(
    of: &[String],
    book: Option<&Path>,
    notes: &mut Vec<String>,
) -> Result<Vec<GatheredSession>, WorkError> {
    let mut sessions: Vec<GatheredSession> = Vec::new();
    let mut opened: Option<Book> = None;
    for of in of {
        if names_a_file(of) {
            let gathered = from_file(Path::new(of), book, notes)?;
            take(&mut sessions, gathered, notes)?;
            continue;
        }
        let opened = match &opened {
            Some(opened) => opened,
            None => opened.insert(Shelf::find(book)?.to_read()?),
        };
        let numbers = match SessionNumber::parse(of) {
            Some(number) => vec![number],
            None => {
                let diver = id_of(of)?;
                let rows = all_of(opened, &diver)?;
                let (out, rest): (Vec<_>, Vec<_>) = rows.into_iter().partition(|row| row.left_out);
                for row in out {
                    notes.push(format!("{} is left out of the diver's uptake", row.number));
                }
                let (open, used): (Vec<_>, Vec<_>) =
                    rest.into_iter().partition(|row| row.state == RunState::Open);
                for row in open {
                    notes.push(format!(
                        "{number} is still open and does not count yet: session resume {number} goes on with it",
                        number = row.number
                    ));
                }
                if used.is_empty() {
                    return Err(WorkError::NoSessionOf(diver));
                }
                used.into_iter().rev().map(|row| row.number).collect()
            }
        };
        for number in numbers {
            if sessions.iter().all(|other| other.name != number.to_string()) {
                let gathered = from_book(opened, number, notes)?;
                take(&mut sessions, gathered, notes)?;
            }
        }
    }
    no_overlap(&sessions)?;
    Ok(sessions)
}

/// Takes a session in, unless it is there. The same readings are one observation, however often they are named; counted
/// twice they would make the uptake look surer than it is.
fn take(
    sessions: &mut Vec<GatheredSession>,
    gathered: GatheredSession,
    notes: &mut Vec<String>,
) -> Result<(), WorkError> {
    let same = |other: &&GatheredSession| {
        let (a, b) = (&other.session, &gathered.session);
        a.taken == b.taken && same_readings(&a.readings, &b.readings)
    };
    let Some(twin) = sessions.iter().find(same) else {
        sessions.push(gathered);
        return Ok(());
    };
    let said = |session: &Session| Session { readings: SessionReadings::default(), ..session.clone() };
    let line = |of: &GatheredSession| of.line.as_ref().map(|found| found.line().clone());
    if said(&twin.session) != said(&gathered.session) || line(twin) != line(&gathered) {
        return Err(WorkError::SameReadings { one: twin.name.clone(), other: gathered.name });
    }
    notes.push(format!("{} is the same session as {} and counts once", gathered.name, twin.name));
    Ok(())
}

fn shown(signal: &CellSignal) -> &[f64] {
    match signal {
        CellSignal::Bar(column) | CellSignal::Volts { readings: column, .. } => column,
    }
}

/// Whether what was read is the same to the last bit, whatever was made of it.
fn same_readings(a: &SessionReadings, b: &SessionReadings) -> bool {
    let same = |(a, b): (&f64, &f64)| a.to_bits() == b.to_bits() || (a.is_nan() && b.is_nan());
    let columns = |a: &[f64], b: &[f64]| a.len() == b.len() && a.iter().zip(b).all(same);
    let cells = || a.cells.iter().zip(&b.cells);
    columns(&a.time_s, &b.time_s)
        && a.cells.len() == b.cells.len()
        && cells().all(|(a, b)| columns(shown(&a.signal), shown(&b.signal)))
}

/// A session of a file, with its line from the run file it names, or from the book.
fn from_file(
    path: &Path,
    book: Option<&Path>,
    notes: &mut Vec<String>,
) -> Result<GatheredSession, WorkError> {
    let loaded = read_session(path)?;
    let name = path.display().to_string();
    notes.extend(loaded.notes.iter().map(|note| format!("{name}: {note}")));
    let session = loaded.value;
    let line = match &session.line {
        None => None,
        Some(LineReference::RunFile(file)) => {
            let at = path.parent().unwrap_or(Path::new("")).join(file);
            Some(lines::from_file(&at, Shelf::find(book).ok().as_ref(), session.taken.date_naive())?)
        }
        Some(LineReference::Orifice(orifice)) => {
            let opened = Shelf::find(book)?.to_read()?;
            Some(lines::from_book_at(&opened, orifice, session.taken)?)
        }
    };
    let of_file = matches!(session.line, Some(LineReference::RunFile(_)));
    note_line(&name, of_file, &session, line.as_ref(), notes)?;
    Ok(GatheredSession { name, session, line, left_out: Vec::new() })
}

fn from_book(
    book: &Book,
    number: SessionNumber,
    notes: &mut Vec<String>,
) -> Result<GatheredSession, WorkError> {
    let kept = kept(book, number)?;
    let name = number.to_string();
    let mut session = with_left_out(kept.session, &kept.left_out);
    let line = match (&session.line, &kept.line_run) {
        (_, Some(run)) => Some(lines::of_kept_run(run, Path::new(&name), session.taken.date_naive())?),
        (Some(LineReference::Orifice(orifice)), None) => {
            Some(lines::from_book_at(book, orifice, session.taken)?)
        }
        (Some(LineReference::RunFile(_)) | None, None) => None,
    };
    if session.mass.is_none() {
        session.mass = book.entry::<Diver>(&session.diver)?.and_then(|found| found.entry.mass);
    }
    note_line(&name, false, &session, line.as_ref(), notes)?;
    Ok(GatheredSession { name, session, line, left_out: kept.left_out })
}

/// A session with the stretches excluded that a person left out since.
pub(super) fn with_left_out(mut session: Session, left_out: &[SessionLeftOut]) -> Session {
    let stretches = left_out.iter().filter_map(|left| left.stretch_s);
    session
        .events
        .extend(stretches.map(|(from_s, until_s)| Event { at_s: from_s, what: What::Exclude { until_s } }));
    session
}

/// What is to be said of a session's line, behind the session's name unless it names a run file itself, and whether it
/// says anything at the pressures it is asked at.
pub(super) fn note_line(
    name: &str,
    names_file: bool,
    session: &Session,
    line: Option<&FoundLine>,
    notes: &mut Vec<String>,
) -> Result<(), WorkError> {
    let Some(line) = line else { return Ok(()) };
    let of_run =
        line.notes.iter().map(|note| if names_file { note.clone() } else { format!("{name}: {note}") });
    for said in of_run.chain(line.doubts(session.taken).into_iter().map(|doubt| format!("{name}: {doubt}"))) {
        if !notes.contains(&said) {
            notes.push(said);
        }
    }
    let barometer = session.conditions.barometer.value.unwrap_or(AbsolutePressure::STANDARD_ATMOSPHERE);
    let (low, high) = line.input.span_bar_abs;
    for event in &session.events {
        let What::Injection(Injection::Ip(ip)) = event.what else { continue };
        let p1_bar = ip.value.above(barometer).as_bar();
        // A tenth beyond the bench is where depths end too; further out nothing says that the line is one.
        if p1_bar < low / BEYOND_BENCH || p1_bar > high * BEYOND_BENCH {
            let span_bar_gauge = (low - barometer.as_bar(), high - barometer.as_bar());
            return Err(WorkError::IpOutsideBench {
                session: name.to_owned(),
                ip_bar_gauge: ip.value.as_bar(),
                orifice: line.input.id.clone(),
                span_bar_gauge,
            });
        }
        if p1_bar < low - SPAN_TOLERANCE_BAR || p1_bar > high + SPAN_TOLERANCE_BAR {
            notes.push(format!(
                "{name}: the IP of {} bar lies outside what the bench run of {} measured: the line is stretched",
                ip.value.as_bar(),
                line.input.id
            ));
        }
    }
    Ok(())
}

/// One diver cannot rest twice at once: of two sessions that overlap in time one has a wrong date, or both are the same.
fn no_overlap(sessions: &[GatheredSession]) -> Result<(), WorkError> {
    let span = |gathered: &GatheredSession| {
        let times = gathered.session.readings.time_s.iter().copied().filter(|t| t.is_finite());
        let begun = gathered.session.taken.timestamp() as f64;
        let (first, last) =
            times.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), t| (low.min(t), high.max(t)));
        (begun + first, begun + last)
    };
    for (i, one) in sessions.iter().enumerate() {
        for other in &sessions[i + 1..] {
            let (a, b) = (span(one), span(other));
            // Two divers are refused for being two.
            if one.session.diver.same_as(&other.session.diver) && a.0 < b.1 && b.0 < a.1 {
                return Err(WorkError::Overlap(one.name.clone(), other.name.clone()));
            }
        }
    }
    Ok(())
}
