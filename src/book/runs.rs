//! Runs: imported whole, or entered point by point.
//!
//! A run is a header, blocks of readings (one a commit), corrections and judgements, each a record of its own; reading
//! a run puts them together. A point keeps its number for good: a corrected one is read from the record that corrects
//! it, a struck one stays in its place and is left out with the reason "struck: …".

use std::borrow::Cow;
use std::collections::BTreeMap;

use chrono::{DateTime, FixedOffset};
use rusqlite::{Connection, OptionalExtension, params};

use super::body::{Body, Kind, Record};
use super::chain::{Stamp, Writing, record_at, source_digest};
use super::error::{BookError, Inside};
use super::open::Book;
use super::registers::{self, Entry, Register};
use crate::entry::{Decision, LeftOut, Orifice, PointReading, Readings, Run, RunNumber};

/// How a run came into the book.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Origin {
    /// From files.
    Imported,
    /// Typed, point by point.
    Entered,
    /// Logged from instruments.
    Logged,
}

/// The files a run was imported from, to the byte.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct SourceFiles {
    /// Name of the run file, without folders.
    pub run_file_name: String,
    /// The run file.
    pub run_file: Vec<u8>,
    /// Name of the file of readings as the run file gives it.
    pub readings_name: String,
    /// The file of readings.
    pub readings: Vec<u8>,
}

/// A run with the files it was read from.
#[derive(Debug, Clone, Copy)]
pub struct ToImport<'a> {
    /// The run.
    pub run: &'a Run,
    /// Its files.
    pub files: &'a SourceFiles,
}

/// What importing or beginning a run did.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Recorded {
    /// The run.
    pub number: RunNumber,
    /// Whether it is new; files with the same bytes were imported before otherwise.
    pub new: bool,
    /// Whether its orifice was unknown and now stands in the register with its name only.
    pub orifice_created: bool,
}

/// How far a run is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RunState {
    /// Points may still come.
    Open,
    /// All points are in.
    Complete,
}

/// A change after the first writing of a point.
#[derive(Debug, Clone, PartialEq)]
pub enum Change {
    /// The point was typed wrong; what had stood there.
    Corrected {
        /// The point.
        point: usize,
        /// The reading before.
        before: PointReading,
        /// When.
        at: DateTime<FixedOffset>,
    },
    /// The point was struck.
    Struck {
        /// The point.
        point: usize,
        /// Why.
        why: String,
        /// When.
        at: DateTime<FixedOffset>,
    },
    /// What stands around the readings was corrected.
    Restated {
        /// When.
        at: DateTime<FixedOffset>,
    },
    /// The point was left out of the line.
    LeftOut {
        /// The point.
        point: usize,
        /// Why.
        why: String,
        /// By whom.
        by: Option<String>,
        /// When.
        at: DateTime<FixedOffset>,
    },
}

/// A run as it stands in the book.
#[derive(Debug, Clone, PartialEq)]
pub struct RunRecord {
    /// Its number.
    pub number: RunNumber,
    /// The run, with corrections and everything left out in it.
    pub run: Run,
    /// How it came.
    pub origin: Origin,
    /// How far it is.
    pub state: RunState,
    /// When it was recorded.
    pub recorded: DateTime<FixedOffset>,
    /// What was changed since, in order.
    pub changes: Vec<Change>,
    /// Decisions, in order; the last holds.
    pub decisions: Vec<Decision>,
    /// Whether a point was left out after the last decision, so that its figures are of an earlier state.
    pub changed_since_decision: bool,
}

impl Book {
    /// Records a run from files. Files with the same bytes were recorded before: the run is named and nothing added.
    ///
    /// # Errors
    /// Those of every write.
    pub fn import(&mut self, item: ToImport<'_>, stamp: &mut Stamp<'_>) -> Result<Recorded, BookError> {
        self.write(stamp, |writing| import_one(writing, item))
    }

    /// Records runs from files in one transaction: all of them, or on an error none.
    ///
    /// # Errors
    /// Those of every write.
    pub fn import_many(
        &mut self,
        items: &[ToImport<'_>],
        stamp: &mut Stamp<'_>,
    ) -> Result<Vec<Recorded>, BookError> {
        self.write(stamp, |writing| items.iter().map(|item| import_one(writing, *item)).collect())
    }

    /// Begins a run that is typed; its points, if it has some already, are its first block.
    ///
    /// # Errors
    /// [`BookError::NotPoints`] for a time series; those of every write.
    pub fn begin_run(&mut self, run: &Run, stamp: &mut Stamp<'_>) -> Result<Recorded, BookError> {
        let Readings::Points(points) = &run.readings else { return Err(BookError::NotPoints) };
        self.write(stamp, |writing| {
            let orifice_created = orifice_of(writing, run)?;
            let number = header(writing, run, Origin::Entered, None)?;
            if !points.is_empty() {
                writing.append(Body::Readings { run: number, readings: Cow::Borrowed(&run.readings) })?;
            }
            Ok(Recorded { number, new: true, orifice_created })
        })
    }

    /// Adds points to an open run; the number of the first of them.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`]; those of every write.
    pub fn add_points(
        &mut self,
        run: RunNumber,
        points: Vec<PointReading>,
        stamp: &mut Stamp<'_>,
    ) -> Result<usize, BookError> {
        self.write(stamp, |writing| {
            let there = open_run(&writing.transaction, run)?;
            let readings = Cow::Owned(Readings::Points(points));
            writing.append(Body::Readings { run, readings })?;
            Ok(there.holders.len() + 1)
        })
    }

    /// Replaces the reading of a point that was typed wrong.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`], [`BookError::NoSuchPoint`], [`BookError::AlreadyLeftOut`]
    /// for a struck one; those of every write.
    pub fn correct_point(
        &mut self,
        run: RunNumber,
        point: usize,
        reading: PointReading,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (point, replaces) = open_run(&writing.transaction, run)?.holder(run, point)?;
            writing.append(Body::PointCorrected { run, point, replaces, reading })?;
            Ok(())
        })
    }

    /// Strikes a point of an open run; the numbers of the others stay.
    ///
    /// # Errors
    /// Those of [`Book::correct_point`].
    pub fn strike_point(
        &mut self,
        run: RunNumber,
        point: usize,
        why: &str,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let (point, replaces) = open_run(&writing.transaction, run)?.holder(run, point)?;
            writing.append(Body::PointStruck { run, point, replaces, why: why.to_owned() })?;
            Ok(())
        })
    }

    /// Replaces what stands around the readings of an open run: conditions, instruments, acceptance, zero and leak.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`]; [`BookError::AnotherRun`] when orifice, gas, purpose, time or
    /// technician differ; those of every write.
    pub fn restate_run(
        &mut self,
        run: RunNumber,
        header: &Run,
        stamp: &mut Stamp<'_>,
    ) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            let there = open_run(&writing.transaction, run)?;
            let same = |a: &Run, b: &Run| {
                let taken = a.taken == b.taken && a.taken.offset() == b.taken.offset();
                let who = a.technician == b.technician;
                a.orifice == b.orifice && a.gas == b.gas && a.purpose == b.purpose && taken && who
            };
            if !same(&there.header, header) {
                return Err(BookError::AnotherRun { run }.into());
            }
            let replaces = there.header_seq;
            writing.append(Body::RunRestated { run, replaces, header: Cow::Borrowed(header) })?;
            Ok(())
        })
    }

    /// Says that all points of a run are in.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`], [`BookError::Complete`]; those of every write.
    pub fn finish_run(&mut self, run: RunNumber, stamp: &mut Stamp<'_>) -> Result<(), BookError> {
        self.write(stamp, |writing| {
            open_run(&writing.transaction, run)?;
            writing.append(Body::RunFinished { run })?;
            Ok(())
        })
    }

    /// The run of a number, put together.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn run(&self, number: RunNumber) -> Result<RunRecord, BookError> {
        self.read(|connection| Ok(assemble(connection, number)?.into_record(number)))
    }

    /// The files a run was imported from; none when it was entered.
    ///
    /// # Errors
    /// [`BookError::NoSuchRun`]; those of every read.
    pub fn source_of(&self, number: RunNumber) -> Result<Option<SourceFiles>, BookError> {
        self.read(|connection| {
            exists(connection, number)?;
            let sql = "SELECT seq FROM of_run WHERE run = ? AND kind = ?";
            let mut statement = connection.prepare_cached(sql)?;
            let of = params![number.get(), Kind::Source.number()];
            let seq: Option<u64> = statement.query_row(of, |row| row.get(0)).optional()?;
            let Some(seq) = seq else { return Ok(None) };
            match record_at(connection, seq)?.map(|record| record.body) {
                Some(Body::Source { files, .. }) => Ok(Some(files.into_owned())),
                _ => Err(Inside::Damaged(format!("record {seq} holds no files"))),
            }
        })
    }
}

fn import_one(writing: &mut Writing<'_, '_, '_>, item: ToImport<'_>) -> Result<Recorded, Inside> {
    let digest = source_digest([item.files.run_file.as_slice(), &item.files.readings]);
    let known = "SELECT number FROM run WHERE source = ?";
    let known: Option<u32> =
        writing.transaction.prepare_cached(known)?.query_row([digest], |row| row.get(0)).optional()?;
    if let Some(number) = known.and_then(RunNumber::new) {
        return Ok(Recorded { number, new: false, orifice_created: false });
    }
    let orifice_created = orifice_of(writing, item.run)?;
    let number = header(writing, item.run, Origin::Imported, Some(digest))?;
    writing.append(Body::Readings { run: number, readings: Cow::Borrowed(&item.run.readings) })?;
    writing.append(Body::Source { run: number, files: Cow::Borrowed(item.files) })?;
    Ok(Recorded { number, new: true, orifice_created })
}

/// Puts the orifice of a run into the register where it is unknown; whether it was.
pub(super) fn orifice_of(writing: &mut Writing<'_, '_, '_>, run: &Run) -> Result<bool, Inside> {
    let unknown = registers::latest(&writing.transaction, Register::Orifice, run.orifice.as_str())?.is_none();
    if unknown {
        registers::append(writing, Entry::Orifice(Orifice::bare(run.orifice.clone())), None)?;
    }
    Ok(unknown)
}

/// Puts the header of a new run at the end of the chain; its number.
pub(super) fn header(
    writing: &mut Writing<'_, '_, '_>,
    run: &Run,
    origin: Origin,
    source: Option<[u8; 32]>,
) -> Result<RunNumber, Inside> {
    let last: u32 = writing
        .transaction
        .prepare_cached("SELECT coalesce(max(number), 0) FROM run")?
        .query_row([], |row| row.get(0))?;
    let number = last.checked_add(1).and_then(RunNumber::new);
    let number = number.ok_or_else(|| Inside::Damaged("its runs are numbered beyond all counting".into()))?;
    writing.append(Body::Run { number, origin, source, header: Cow::Borrowed(run) })?;
    Ok(number)
}

/// Refuses the number of a run that was never recorded.
pub(super) fn exists(connection: &Connection, number: RunNumber) -> Result<(), Inside> {
    let mut statement = connection.prepare_cached("SELECT 1 FROM run WHERE number = ?")?;
    if statement.exists([number.get()])? { Ok(()) } else { Err(Inside::NoSuchRun(number)) }
}

/// A run put together from its records.
pub(super) struct Assembled {
    pub(super) header: Run,
    pub(super) header_seq: u64,
    origin: Origin,
    pub(super) state: RunState,
    recorded: DateTime<FixedOffset>,
    /// For each point the record that holds its reading now.
    holders: Vec<u64>,
    struck: BTreeMap<u32, String>,
    changes: Vec<Change>,
    decisions: Vec<Decision>,
    changed_since_decision: bool,
}

impl Assembled {
    /// Points that a series does not have before it is analysed: only a list of points has a last one.
    pub(super) fn points(&self) -> Option<usize> {
        matches!(self.header.readings, Readings::Points(_)).then_some(self.holders.len())
    }

    /// Whether a point is struck or left out.
    pub(super) fn is_out(&self, point: usize) -> bool {
        let struck = u32::try_from(point).is_ok_and(|point| self.struck.contains_key(&point));
        struck || self.header.left_out.iter().any(|out| out.point == point)
    }

    /// A point that may be changed, and the record that holds it.
    fn holder(&self, run: RunNumber, point: usize) -> Result<(u32, u64), Inside> {
        let none = || BookError::NoSuchPoint { run, point, points: self.holders.len() };
        let holder = point.checked_sub(1).and_then(|index| self.holders.get(index)).ok_or_else(none)?;
        if self.is_out(point) {
            return Err(BookError::AlreadyLeftOut { run, point }.into());
        }
        Ok((u32::try_from(point).map_err(|_| none())?, *holder))
    }

    fn into_record(mut self, number: RunNumber) -> RunRecord {
        for (point, why) in self.struck {
            self.header.left_out.push(LeftOut { point: point as usize, why: format!("struck: {why}") });
        }
        RunRecord {
            number,
            run: self.header,
            origin: self.origin,
            state: self.state,
            recorded: self.recorded,
            changes: self.changes,
            decisions: self.decisions,
            changed_since_decision: self.changed_since_decision,
        }
    }

    /// Takes in the next record of the run.
    fn take(&mut self, seq: u64, record: Record<'static>) -> Result<(), Inside> {
        let wrong = || Inside::Damaged(format!("record {seq} does not fit the run it belongs to"));
        let at = record.at;
        match record.body {
            Body::Readings { readings, .. } => match (&mut self.header.readings, readings.into_owned()) {
                (Readings::Points(points), Readings::Points(more)) => {
                    self.holders.extend(more.iter().map(|_| seq));
                    points.extend(more);
                }
                (there @ Readings::Points(_), series @ Readings::Series(_)) if self.holders.is_empty() => {
                    *there = series;
                }
                _ => return Err(wrong()),
            },
            Body::PointCorrected { point, reading, .. } => {
                let index = (point as usize).checked_sub(1).ok_or_else(wrong)?;
                let Readings::Points(points) = &mut self.header.readings else { return Err(wrong()) };
                let place = points.get_mut(index).ok_or_else(wrong)?;
                let before = std::mem::replace(place, reading);
                *self.holders.get_mut(index).ok_or_else(wrong)? = seq;
                self.changes.push(Change::Corrected { point: point as usize, before, at });
            }
            Body::PointStruck { point, why, .. } => {
                self.changes.push(Change::Struck { point: point as usize, why: why.clone(), at });
                self.struck.insert(point, why);
            }
            Body::RunRestated { header, .. } => {
                let readings = std::mem::replace(&mut self.header.readings, Readings::Points(Vec::new()));
                let left_out = std::mem::take(&mut self.header.left_out);
                self.header = Run { readings, left_out, ..header.into_owned() };
                self.header_seq = seq;
                self.changes.push(Change::Restated { at });
            }
            Body::PointTaken { point, .. } => {
                let Readings::Points(points) = &mut self.header.readings else { return Err(wrong()) };
                points.push(point.reading);
                self.holders.push(seq);
            }
            Body::RunFinished { .. } => self.state = RunState::Complete,
            Body::LeftOut { left_out, by, .. } => {
                let (point, why) = (left_out.point, left_out.why.clone());
                self.changes.push(Change::LeftOut { point, why, by, at });
                self.header.left_out.push(left_out);
                self.changed_since_decision = !self.decisions.is_empty();
            }
            Body::Decided { decision, .. } => {
                self.decisions.push(*decision);
                self.changed_since_decision = false;
            }
            _ => return Err(wrong()),
        }
        Ok(())
    }
}

/// The run of a number from its records, in their order; the files it came from are not read.
pub(super) fn assemble(connection: &Connection, number: RunNumber) -> Result<Assembled, Inside> {
    exists(connection, number)?;
    // Files and raw readings are large and no part of what a run says.
    let sql = "SELECT seq FROM of_run WHERE run = ? AND kind NOT IN (?, ?, ?, ?) ORDER BY seq";
    let apart = [Kind::Source, Kind::LiveReadings, Kind::LiveNote, Kind::LoggingBegun].map(Kind::number);
    let mut statement = connection.prepare_cached(sql)?;
    let of = params![number.get(), apart[0], apart[1], apart[2], apart[3]];
    let seqs = statement.query_map(of, |row| row.get(0))?;
    let mut run: Option<Assembled> = None;
    for seq in seqs.collect::<Result<Vec<u64>, _>>()? {
        let lost = || Inside::Damaged(format!("record {seq} of run {number} is not there"));
        let record = record_at(connection, seq)?.ok_or_else(lost)?;
        match (&mut run, record) {
            (None, Record { at, body: Body::Run { origin, header, .. } }) => {
                let state = if origin == Origin::Imported { RunState::Complete } else { RunState::Open };
                run = Some(Assembled {
                    header: header.into_owned(),
                    header_seq: seq,
                    origin,
                    state,
                    recorded: at,
                    holders: Vec::new(),
                    struck: BTreeMap::new(),
                    changes: Vec::new(),
                    decisions: Vec::new(),
                    changed_since_decision: false,
                });
            }
            (Some(run), record) => run.take(seq, record)?,
            (None, _) => return Err(lost()),
        }
    }
    run.ok_or_else(|| Inside::Damaged(format!("run {number} has no records")))
}

fn open_run(connection: &Connection, number: RunNumber) -> Result<Assembled, Inside> {
    let run = assemble(connection, number)?;
    match run.state {
        RunState::Open => Ok(run),
        RunState::Complete => Err(BookError::Complete { run: number }.into()),
    }
}
