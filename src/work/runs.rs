//! Runs of the book: imported, listed, shown, judged.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset};

use super::shelf::{Shelf, ShelfRegisters, stamped};
use super::{ExitStatus, WorkError};
use crate::bench::checks::CheckKind;
use crate::bench::correct::Source;
use crate::bench::history::Accepted;
use crate::bench::line::{FlowAt, Part};
use crate::bench::{Analysis, METHOD_REVISION, Questions, Verdict, analyse};
use crate::book::{Book, Change, Origin, RunQuery, RunRow, RunState, SourceFiles, ToImport};
use crate::clock;
use crate::entry::{
    Acceptance, Build, Decision, LiveNoteKind, Orifice, Readings, Run, RunNumber, StoredFigures, StoredPart,
    StoredVerdict,
};
use crate::gas::Species;
use crate::record::read_run_and_files;
use crate::report::bench_fit::source_name;
use crate::report::check_sentences::name_key_unit;
use crate::report::run_list::{ListedJudgement, ListedRun};
use crate::report::run_shown::{Came, Heard, ShownRun};

/// Most runs a list shows unless all are asked for.
pub const LISTED: u32 = 50;
/// Runs that are imported in one transaction.
const BATCH: usize = 100;

/// What became of one file.
#[derive(Debug, Clone, PartialEq)]
pub struct Imported {
    /// The file.
    pub file: PathBuf,
    /// The run it is in the book.
    pub run: RunNumber,
    /// The orifice.
    pub orifice: String,
    /// Whether it is new; the same bytes were there already otherwise.
    pub new: bool,
    /// Whether the orifice was unknown and was created with its name only.
    pub orifice_created: bool,
    /// What was said on reading.
    pub notes: Vec<String>,
}

/// Imports run files: all are read before the first is written, so that a mistake in one writes none.
///
/// `acknowledged` is told of each batch as soon as it is on the disk.
///
/// # Errors
/// A file that is refused (nothing is written then), or a book that cannot be written.
pub fn import(
    shelf: &Shelf,
    files: &[PathBuf],
    notes: &mut Vec<String>,
    mut acknowledged: impl FnMut(&Imported),
) -> Result<Vec<Imported>, WorkError> {
    let registers = ShelfRegisters::new(shelf);
    let mut read = Vec::with_capacity(files.len());
    for file in files {
        let (loaded, bytes) = match read_run_and_files(file, &registers) {
            Ok(found) => found,
            Err(refused) => return Err(registers.failure().unwrap_or_else(|| refused.into())),
        };
        let files = SourceFiles {
            run_file_name: file.file_name().unwrap_or_default().to_string_lossy().into_owned(),
            run_file: bytes.toml,
            readings_name: bytes.readings_name,
            readings: bytes.readings,
        };
        read.push((file, loaded, files));
    }
    let mut book = shelf.to_write(notes)?;
    let mut all = Vec::with_capacity(read.len());
    for batch in read.chunks(BATCH) {
        let items: Vec<ToImport<'_>> =
            batch.iter().map(|(_, loaded, files)| ToImport { run: &loaded.value, files }).collect();
        let recorded = stamped(|stamp| book.import_many(&items, stamp))??;
        for ((file, loaded, _), recorded) in batch.iter().zip(recorded) {
            let imported = Imported {
                file: (*file).clone(),
                run: recorded.number,
                orifice: loaded.value.orifice.to_string(),
                new: recorded.new,
                orifice_created: recorded.orifice_created,
                notes: loaded.notes.iter().map(ToString::to_string).collect(),
            };
            acknowledged(&imported);
            all.push(imported);
        }
    }
    Ok(all)
}

/// The newest runs, [`LISTED`] of them unless `all`, and whether there are older ones.
///
/// # Errors
/// When there is no book or it cannot be read.
pub fn list(shelf: &Shelf, all: bool) -> Result<(Vec<ListedRun>, bool), WorkError> {
    let limit = (!all).then_some(LISTED + 1);
    let mut runs = shelf.to_read()?.runs(&RunQuery { before: None, limit, open_only: false })?;
    let more = !all && runs.len() > LISTED as usize;
    if more {
        runs.truncate(LISTED as usize);
    }
    Ok((runs.into_iter().map(listed).collect(), more))
}

/// One run as it stands in the book.
///
/// # Errors
/// A name that is no run's, a run that is not there, a book that cannot be read.
pub fn show(shelf: &Shelf, run: &str) -> Result<ShownRun, WorkError> {
    let number = number_of(run)?;
    let book = shelf.to_read()?;
    let record = book.run(number)?;
    let came = match record.origin {
        Origin::Imported => Came::Imported,
        Origin::Entered => Came::Typed,
        Origin::Logged => Came::Logged(heard(&book, number)?),
    };
    let judged = record.decisions.last().map(|decision| ListedJudgement {
        verdict: decision.verdict,
        method_revision: decision.figures.method_revision,
        ip_bar: decision.figures.ip.as_bar(),
        flow_l_min: decision.figures.flow_l_min,
        expanded_l_min: decision.figures.expanded_l_min(),
        at: decision.at,
    });
    let listed = ListedRun {
        number,
        orifice: record.run.orifice.to_string(),
        gas: record.run.gas,
        purpose: record.run.purpose,
        taken: record.run.taken,
        technician: record.run.technician.clone(),
        open: record.state == RunState::Open,
        judged,
    };
    Ok(ShownRun {
        listed,
        came,
        recorded: record.recorded,
        changes: record.changes.iter().map(change).collect(),
        decisions: record.decisions,
        changed_since: record.changed_since_decision,
        run: record.run,
    })
}

/// What came of the instruments of a logged run.
fn heard(book: &Book, number: RunNumber) -> Result<Vec<Heard>, WorkError> {
    let mut all: BTreeMap<String, (usize, BTreeMap<LiveNoteKind, usize>)> = BTreeMap::new();
    for readings in book.live_readings(number)? {
        all.entry(readings.instrument.to_string()).or_default().0 += readings.shown.len();
    }
    for note in book.live_notes(number)? {
        // That a port was opened once is nothing to tell.
        let name = note.instrument.map(|id| id.to_string()).unwrap_or_default();
        *all.entry(name).or_default().1.entry(note.kind).or_default() += 1;
    }
    let heard = all.into_iter().map(|(instrument, (readings, notes))| Heard {
        instrument,
        readings,
        notes: notes
            .into_iter()
            .filter(|(kind, times)| *kind != LiveNoteKind::Connected || *times > 1)
            .map(|(kind, times)| (kind.name(), times))
            .collect(),
    });
    Ok(heard.collect())
}

/// A row of the book for `report`; a judgement without figures (of a run whose flow could not be told) is none.
pub(super) fn listed(row: RunRow) -> ListedRun {
    let judged = row.decision.as_ref().and_then(|d| {
        Some(ListedJudgement {
            verdict: d.verdict,
            method_revision: d.method_revision,
            ip_bar: d.ip_pa? / 1e5,
            flow_l_min: d.flow_l_min?,
            expanded_l_min: d.expanded_l_min?,
            at: d.decided,
        })
    });
    ListedRun {
        number: row.number,
        orifice: row.orifice,
        gas: row.gas,
        purpose: row.purpose,
        taken: row.taken,
        technician: row.technician,
        open: row.state == RunState::Open,
        judged,
    }
}

fn change(change: &Change) -> (DateTime<FixedOffset>, String) {
    match change {
        Change::Corrected { point, before, at } => {
            let was = format!(
                "{} bar and {} L/min shown",
                before.pressure.shown_pa() / 1e5,
                before.flow.as_l_min()
            );
            (*at, format!("point {point} corrected; it was {was}"))
        }
        Change::Struck { point, why, at } => (*at, format!("point {point} struck: {why}")),
        Change::Restated { at } => (*at, "conditions, instruments or limits corrected".to_owned()),
        Change::LeftOut { point, why, by, at } => {
            let by = by.as_ref().map(|by| format!(" ({by})")).unwrap_or_default();
            (*at, format!("point {point} left out: {why}{by}"))
        }
    }
}

/// Leaves a point of a run out of its line, with a reason.
///
/// # Errors
/// A run or point that is not there, a point that is left out already, an empty reason, a book that cannot be written.
pub fn leave_out(
    shelf: &Shelf,
    run: &str,
    point: usize,
    why: &str,
    by: Option<&str>,
) -> Result<RunNumber, WorkError> {
    let number = number_of(run)?;
    let why = said("--why", why)?;
    let by = by.map(|by| said("--by", by)).transpose()?;
    let mut book = shelf.to_change()?;
    if let Readings::Series(series) = &book.run(number)?.run.readings {
        let points = super::fit::steady(series).points.len();
        if point == 0 || point > points {
            return Err(crate::book::BookError::NoSuchPoint { run: number, point, points }.into());
        }
    }
    stamped(|stamp| book.leave_out(number, point, why, by, stamp))??;
    Ok(number)
}

/// A run judged and kept.
#[derive(Debug, Clone, PartialEq)]
pub struct Judged {
    /// The run.
    pub number: RunNumber,
    /// What was recorded of it.
    pub run: Run,
    /// What was made of it.
    pub analysis: Analysis,
    /// What the book keeps.
    pub decision: Decision,
}

/// Judges a run and keeps the judgement with its figures, whatever the verdict.
///
/// # Errors
/// A run that is not there, is still open or cannot be analysed; a book that cannot be written.
pub fn accept(shelf: &Shelf, run: &str, by: Option<&str>, remark: Option<&str>) -> Result<Judged, WorkError> {
    judge(&mut shelf.to_change()?, number_of(run)?, by, remark, clock::now())
}

/// As [`accept`], in an open book and at a stated time.
///
/// # Errors
/// As [`accept`].
pub(super) fn judge(
    book: &mut Book,
    number: RunNumber,
    by: Option<&str>,
    remark: Option<&str>,
    at: DateTime<FixedOffset>,
) -> Result<Judged, WorkError> {
    let by = by.map(|by| said("--by", by)).transpose()?;
    let remark = remark.map(|remark| said("--remark", remark)).transpose()?;
    let loaded = load(book, number)?;
    let analysis = loaded.analyse(&Questions::default())?;
    let decision = Decision {
        verdict: stored_verdict(&analysis),
        figures: figures(&loaded, &analysis),
        at,
        by: by.map(str::to_owned).or_else(|| loaded.run.technician.clone()),
        remark: remark.map(str::to_owned),
    };
    stamped(|stamp| book.decide(number, decision.clone(), stamp))??;
    Ok(Judged { number, run: loaded.run, analysis, decision })
}

/// A run of the book, ready to be analysed.
#[derive(Debug)]
pub struct LoadedRun {
    /// Its number.
    pub number: RunNumber,
    /// The run, with build and acceptance of its orifice where it has none of its own.
    pub run: Run,
    /// The orifice's accepted run before it.
    pub before: Option<(RunNumber, Accepted)>,
}

/// Reads a run with what the registers add to it, and the accepted run before it.
///
/// # Errors
/// A run that is not there, a book that cannot be read.
pub fn load(book: &Book, number: RunNumber) -> Result<LoadedRun, WorkError> {
    let mut run = book.run(number)?.run;
    if let Some(orifice) = book.entry::<Orifice>(&run.orifice)?.map(|found| found.entry) {
        if run.build == Build::Unknown {
            run.build = orifice.build;
        }
        if let (None, Some(id)) = (&run.acceptance, &orifice.acceptance) {
            run.acceptance = book.entry::<Acceptance>(id)?.map(|found| found.entry);
        }
    }
    let before = book.decided_before(&run.orifice, number)?;
    let before = before.map(|(number, decision)| (number, accepted(number, &decision.figures)));
    Ok(LoadedRun { number, run, before })
}

impl LoadedRun {
    /// Analyses it, compared with the run before where that was of the same gas at the same pressure.
    ///
    /// # Errors
    /// As [`analyse`]; a time series with too few steady spans.
    pub fn analyse(&self, questions: &Questions<'_>) -> Result<Analysis, WorkError> {
        let name = PathBuf::from(self.number.to_string());
        let (points, _) = super::fit::points_of(Path::new(&name), &self.run.readings)?;
        let questions = Questions { before: self.comparable(), ..questions.clone() };
        analyse(&self.run, &points, &questions).map_err(|error| WorkError::Bench { file: name, error })
    }

    /// The run before, where the two flows are of the same thing.
    pub(super) fn comparable(&self) -> Option<&Accepted> {
        let (_, before) = self.before.as_ref()?;
        let ip = self.run.acceptance.as_ref()?.ip;
        let p1_bar = ip.above(crate::quantity::AbsolutePressure::STANDARD_ATMOSPHERE).as_bar();
        same_measurand((before.gas, before.flow.p1_bar), (self.run.gas, p1_bar)).then_some(before)
    }
}

/// Whether two flows are of the same gas at the same absolute pressure (bar).
fn same_measurand(a: (Species, f64), b: (Species, f64)) -> bool {
    a.0 == b.0 && (a.1 - b.1).abs() < 1e-6
}

/// Whether the flows of two judgements can be compared.
pub(super) fn comparable(a: &StoredFigures, b: &StoredFigures) -> bool {
    same_measurand((a.gas, a.p1_bar), (b.gas, b.p1_bar))
}

/// The run a name stands for.
///
/// # Errors
/// A text that is no run's number.
pub fn number_of(run: &str) -> Result<RunNumber, WorkError> {
    RunNumber::parse(run).ok_or_else(|| WorkError::NoRunNumber(run.to_owned()))
}

/// Favourable unless the verdict is fail or undecided.
#[must_use]
pub const fn status_of(verdict: StoredVerdict) -> ExitStatus {
    match verdict {
        StoredVerdict::Pass | StoredVerdict::None => ExitStatus::Done,
        StoredVerdict::Fail | StoredVerdict::Undecided => ExitStatus::Unfavourable,
    }
}

/// A reason or a name somebody gave: not empty, and without characters that hide.
pub(super) fn said<'t>(option: &'static str, text: &'t str) -> Result<&'t str, WorkError> {
    let text = text.trim();
    if text.is_empty() || crate::record::hidden_character(text).is_some() {
        return Err(WorkError::Text { option, text: text.to_owned() });
    }
    Ok(text)
}

pub(super) fn stored_verdict(analysis: &Analysis) -> StoredVerdict {
    match analysis.judgement.as_ref().map_or(Verdict::None, |j| j.verdict) {
        Verdict::Pass => StoredVerdict::Pass,
        Verdict::Fail => StoredVerdict::Fail,
        Verdict::Undecided => StoredVerdict::Undecided,
        Verdict::None => StoredVerdict::None,
    }
}

pub(super) fn figures(loaded: &LoadedRun, analysis: &Analysis) -> StoredFigures {
    let flow = &analysis.nominal.flow;
    let en = analysis.checks.iter().find(|c| c.kind == CheckKind::SameAsBefore).and_then(|c| c.value);
    StoredFigures {
        method_revision: METHOD_REVISION,
        gas: loaded.run.gas,
        ip: analysis.nominal.ip,
        p1_bar: flow.p1_bar,
        flow_l_min: flow.flow_l_min,
        standard_uncertainty_l_min: flow.standard_uncertainty,
        dof: flow.dof,
        coverage_factor: flow.coverage_factor,
        parts: flow
            .parts
            .iter()
            .map(|(part, u, dof)| StoredPart {
                source: source_name(*part).to_owned(),
                u_l_min: *u,
                dof: *dof,
            })
            .collect(),
        limits_l_min: analysis.judgement.as_ref().map(|j| j.limits_l_min),
        conformity_probability: analysis.judgement.as_ref().map(|j| j.probability),
        failed_checks: analysis
            .judgement
            .iter()
            .flat_map(|j| j.failed_checks.iter().map(|k| name_key_unit(*k).0.to_owned()))
            .collect(),
        points_used: u32::try_from(analysis.points.iter().filter(|p| p.used()).count()).unwrap_or(u32::MAX),
        meter_certificate: loaded.run.meter.papers.certificate.clone(),
        transducer_certificate: loaded.run.transducer.papers.certificate.clone(),
        against: loaded.before.as_ref().zip(en).map(|((number, _), en)| (*number, en)),
    }
}

/// A stored judgement as the next run is compared with it. A part whose name is not known any more counts as the run's
/// own, which makes the comparison blunter and never sharper than it is.
pub(super) fn accepted(number: RunNumber, figures: &StoredFigures) -> Accepted {
    let parts = figures.parts.iter().map(|part| (part_named(&part.source), part.u_l_min, part.dof)).collect();
    Accepted {
        name: number.to_string(),
        gas: figures.gas,
        flow: FlowAt::new(figures.p1_bar, figures.flow_l_min, parts),
        meter_certificate: figures.meter_certificate.clone(),
        transducer_certificate: figures.transducer_certificate.clone(),
    }
}

fn part_named(name: &str) -> Part {
    let common = Source::ALL.map(Part::Common);
    let own = [Part::Random, Part::AmbientAsked, Part::GasConversion];
    common.into_iter().chain(own).find(|part| source_name(*part) == name).unwrap_or(Part::Random)
}
