//! What a record says: its kind, its canonical bytes, and the rows by which it is found.
//!
//! Comes in: what is to be recorded. Goes out: the bytes the chain runs over, and back; and from the same value the
//! rows of the tables for lists, so that writing and checking cannot disagree about them.

use std::borrow::Cow;

use super::canonical::{self, Bytes, Canonical, Reader, Unreadable, Writer, session_header};
use super::certificates::CertificateFiles;
use super::registers::Entry;
use super::runs::{Origin, SourceFiles};
use super::sessions::{Extent, FileRole};
use crate::entry::{
    Certificate, Decision, Diver, Event, FirstStage, Instrument, LeftOut, LiveNote, LivePoint, LiveReadings,
    LoggingBegun, Orifice, PointReading, Readings, Run, RunNumber, Session, SessionLeftOut, SessionNumber,
    Shop,
};
use chrono::{DateTime, FixedOffset};

/// First byte of every payload: the form of the bytes that follow it.
///
/// When a type of `entry` gains a field, new records get the next number, and [`read`] keeps reading the old ones.
pub(super) const FORMAT: u8 = 1;

/// Kinds from here on are personal: their payloads can be erased. The triggers know the same number.
pub(super) const FIRST_PERSONAL_KIND: u16 = 1000;

/// The kind of a record, as its number stands in the chain; a number is never given twice.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Kind {
    Begun = 1,
    Run = 2,
    Readings = 3,
    Source = 4,
    PointCorrected = 5,
    PointStruck = 6,
    RunRestated = 7,
    RunFinished = 8,
    LeftOut = 9,
    Decided = 10,
    Orifice = 11,
    Instrument = 12,
    FirstStage = 13,
    Acceptance = 14,
    Shop = 15,
    Erasure = 16,
    CopyMade = 17,
    LoggingBegun = 18,
    LiveReadings = 19,
    PointTaken = 20,
    LiveNote = 21,
    Certificate = 22,
    CertificateFiles = 23,
    Diver = 1000,
    Session = 1001,
    SessionReadings = 1002,
    SessionLine = 1003,
    SessionFile = 1004,
    SessionLeftOut = 1005,
    SessionEvent = 1006,
    SessionReadingCorrected = 1007,
    SessionEventCorrected = 1008,
    SessionRowStruck = 1009,
    SessionRestated = 1010,
    SessionFinished = 1011,
    SessionLoggingBegun = 1012,
    SessionNote = 1013,
}

impl Kind {
    const ALL: [Self; 37] = [
        Self::Begun,
        Self::Run,
        Self::Readings,
        Self::Source,
        Self::PointCorrected,
        Self::PointStruck,
        Self::RunRestated,
        Self::RunFinished,
        Self::LeftOut,
        Self::Decided,
        Self::Orifice,
        Self::Instrument,
        Self::FirstStage,
        Self::Acceptance,
        Self::Shop,
        Self::Erasure,
        Self::CopyMade,
        Self::LoggingBegun,
        Self::LiveReadings,
        Self::PointTaken,
        Self::LiveNote,
        Self::Certificate,
        Self::CertificateFiles,
        Self::Diver,
        Self::Session,
        Self::SessionReadings,
        Self::SessionLine,
        Self::SessionFile,
        Self::SessionLeftOut,
        Self::SessionEvent,
        Self::SessionReadingCorrected,
        Self::SessionEventCorrected,
        Self::SessionRowStruck,
        Self::SessionRestated,
        Self::SessionFinished,
        Self::SessionLoggingBegun,
        Self::SessionNote,
    ];

    /// The kind of a number, if this program knows it.
    pub(super) fn of(number: u16) -> Option<Self> {
        Self::ALL.into_iter().find(|kind| kind.number() == number)
    }

    /// Its number in the chain.
    pub(super) const fn number(self) -> u16 {
        self as u16
    }
}

/// A file the record was copied to.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CopyKind {
    /// A backup of the whole book.
    Backup,
    /// An export with divers.
    Export,
}

/// What a record says.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Body<'a> {
    /// The book was begun.
    Begun,
    /// A run was begun; its header.
    Run { number: RunNumber, origin: Origin, source: Option<[u8; 32]>, header: Cow<'a, Run> },
    /// A block of readings of a run.
    Readings { run: RunNumber, readings: Cow<'a, Readings> },
    /// The files a run was imported from.
    Source { run: RunNumber, files: Cow<'a, SourceFiles> },
    /// A point was typed wrong; `replaces` is the record that held it.
    PointCorrected { run: RunNumber, point: u32, replaces: u64, reading: PointReading },
    /// A point was struck; `replaces` is the record that held it.
    PointStruck { run: RunNumber, point: u32, replaces: u64, why: String },
    /// What stands around the readings was corrected; `replaces` is the header before.
    RunRestated { run: RunNumber, replaces: u64, header: Cow<'a, Run> },
    /// All points are in.
    RunFinished { run: RunNumber },
    /// A point was left out of the line.
    LeftOut { run: RunNumber, left_out: LeftOut, by: Option<String> },
    /// A run was decided upon.
    Decided { run: RunNumber, decision: Box<Decision> },
    /// A process began to log a run, or went on.
    LoggingBegun { run: RunNumber, begun: LoggingBegun },
    /// Readings of one instrument of a logged run.
    LiveReadings { run: RunNumber, readings: Cow<'a, LiveReadings> },
    /// The next point of a logged run.
    PointTaken { run: RunNumber, point: LivePoint },
    /// Something that happened to an instrument of a logged run.
    LiveNote { run: RunNumber, note: Cow<'a, LiveNote> },
    /// A number was given to a certificate.
    Certificate(Box<Certificate>),
    /// The files of a certificate, whose record is named, were written.
    CertificateFiles { certificate: u64, files: CertificateFiles },
    /// An entry of a register; `replaces` is the record of the revision before.
    Entry { revision: u32, replaces: Option<u64>, entry: Box<Entry> },
    /// A session was recorded or begun; its header, and how far its readings go, none while they still come.
    Session {
        number: SessionNumber,
        origin: Origin,
        source: Option<[u8; 32]>,
        extent: Option<Extent>,
        header: Cow<'a, Session>,
    },
    /// A block of readings of a session: its next rows, one piece of each column.
    SessionReadings { session: SessionNumber, columns: Vec<Cow<'a, [f64]>> },
    /// The run that a session's injection line was made from, with its readings.
    SessionLine { session: SessionNumber, run: Cow<'a, Run> },
    /// A piece of a file that a session was imported from.
    SessionFile { session: SessionNumber, role: FileRole, name: String, bytes: Cow<'a, [u8]> },
    /// A session or a stretch of it was left out of the diver's uptake.
    SessionLeftOut { session: SessionNumber, left_out: SessionLeftOut },
    /// The next row of an open session is an event.
    SessionEvent { session: SessionNumber, event: Event },
    /// A row of readings was recorded wrong: its values in the order of the columns; `replaces` held it.
    SessionReadingCorrected { session: SessionNumber, row: u32, replaces: u64, values: Vec<f64> },
    /// A row that is an event was recorded wrong; `replaces` is the record that held it.
    SessionEventCorrected { session: SessionNumber, row: u32, replaces: u64, event: Event },
    /// A row was struck; `replaces` is the record that held it.
    SessionRowStruck { session: SessionNumber, row: u32, replaces: u64, why: String },
    /// What stands around the rows of an open session was corrected; `replaces` is the header before.
    SessionRestated { session: SessionNumber, replaces: u64, header: Cow<'a, Session> },
    /// All rows of a session are in: its cells, and how far the readings that stand go.
    SessionFinished { session: SessionNumber, cells: usize, extent: Extent },
    /// A process began to log a session, or went on.
    SessionLoggingBegun { session: SessionNumber, begun: LoggingBegun },
    /// Something that happened to an instrument of a logged session, or an alarm.
    SessionNote { session: SessionNumber, note: Cow<'a, LiveNote> },
    /// Payloads were erased, among them those of `sessions`, whose numbers stay used.
    Erasure { erased: Vec<u64>, sessions: Vec<SessionNumber>, why: String },
    /// A copy was made.
    CopyMade { kind: CopyKind, place: String },
}

/// A record: when it was written and what it says.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Record<'a> {
    pub(super) at: DateTime<FixedOffset>,
    pub(super) body: Body<'a>,
}

impl Body<'_> {
    /// Its kind.
    pub(super) const fn kind(&self) -> Kind {
        match self {
            Self::Begun => Kind::Begun,
            Self::Run { .. } => Kind::Run,
            Self::Readings { .. } => Kind::Readings,
            Self::Source { .. } => Kind::Source,
            Self::PointCorrected { .. } => Kind::PointCorrected,
            Self::PointStruck { .. } => Kind::PointStruck,
            Self::RunRestated { .. } => Kind::RunRestated,
            Self::RunFinished { .. } => Kind::RunFinished,
            Self::LeftOut { .. } => Kind::LeftOut,
            Self::Decided { .. } => Kind::Decided,
            Self::LoggingBegun { .. } => Kind::LoggingBegun,
            Self::LiveReadings { .. } => Kind::LiveReadings,
            Self::PointTaken { .. } => Kind::PointTaken,
            Self::LiveNote { .. } => Kind::LiveNote,
            Self::Certificate(_) => Kind::Certificate,
            Self::CertificateFiles { .. } => Kind::CertificateFiles,
            Self::Entry { entry, .. } => entry.register().kind(),
            Self::Session { .. } => Kind::Session,
            Self::SessionReadings { .. } => Kind::SessionReadings,
            Self::SessionLine { .. } => Kind::SessionLine,
            Self::SessionFile { .. } => Kind::SessionFile,
            Self::SessionLeftOut { .. } => Kind::SessionLeftOut,
            Self::SessionEvent { .. } => Kind::SessionEvent,
            Self::SessionReadingCorrected { .. } => Kind::SessionReadingCorrected,
            Self::SessionEventCorrected { .. } => Kind::SessionEventCorrected,
            Self::SessionRowStruck { .. } => Kind::SessionRowStruck,
            Self::SessionRestated { .. } => Kind::SessionRestated,
            Self::SessionFinished { .. } => Kind::SessionFinished,
            Self::SessionLoggingBegun { .. } => Kind::SessionLoggingBegun,
            Self::SessionNote { .. } => Kind::SessionNote,
            Self::Erasure { .. } => Kind::Erasure,
            Self::CopyMade { .. } => Kind::CopyMade,
        }
    }

    /// The run it belongs to.
    pub(super) const fn run(&self) -> Option<RunNumber> {
        match self {
            Self::Run { number: run, .. }
            | Self::Readings { run, .. }
            | Self::Source { run, .. }
            | Self::PointCorrected { run, .. }
            | Self::PointStruck { run, .. }
            | Self::RunRestated { run, .. }
            | Self::RunFinished { run }
            | Self::LeftOut { run, .. }
            | Self::Decided { run, .. }
            | Self::LoggingBegun { run, .. }
            | Self::LiveReadings { run, .. }
            | Self::PointTaken { run, .. }
            | Self::LiveNote { run, .. } => Some(*run),
            _ => None,
        }
    }

    /// The session it belongs to.
    pub(super) const fn session(&self) -> Option<SessionNumber> {
        match self {
            Self::Session { number: session, .. }
            | Self::SessionReadings { session, .. }
            | Self::SessionLine { session, .. }
            | Self::SessionFile { session, .. }
            | Self::SessionLeftOut { session, .. }
            | Self::SessionEvent { session, .. }
            | Self::SessionReadingCorrected { session, .. }
            | Self::SessionEventCorrected { session, .. }
            | Self::SessionRowStruck { session, .. }
            | Self::SessionRestated { session, .. }
            | Self::SessionFinished { session, .. }
            | Self::SessionLoggingBegun { session, .. }
            | Self::SessionNote { session, .. } => Some(*session),
            _ => None,
        }
    }
}

/// The canonical bytes of a record.
pub(super) fn write(record: &Record<'_>) -> Vec<u8> {
    let mut bytes = Writer::default();
    let out = &mut bytes;
    out.raw(&[FORMAT]);
    record.at.write(out);
    match &record.body {
        Body::Begun => {}
        Body::Run { number, origin, source, header } => {
            number.write(out);
            origin.write(out);
            source.write(out);
            canonical::header::write(header, out);
        }
        Body::Readings { run, readings } => {
            run.write(out);
            readings.write(out);
        }
        Body::Source { run, files } => {
            run.write(out);
            files.write(out);
        }
        Body::PointCorrected { run, point, replaces, reading } => {
            run.write(out);
            point.write(out);
            replaces.write(out);
            reading.write(out);
        }
        Body::PointStruck { run, point, replaces, why } => {
            run.write(out);
            point.write(out);
            replaces.write(out);
            why.write(out);
        }
        Body::RunRestated { run, replaces, header } => {
            run.write(out);
            replaces.write(out);
            canonical::header::write(header, out);
        }
        Body::RunFinished { run } => run.write(out),
        Body::LeftOut { run, left_out, by } => {
            run.write(out);
            left_out.write(out);
            by.write(out);
        }
        Body::Decided { run, decision } => {
            run.write(out);
            decision.write(out);
        }
        Body::LoggingBegun { run, begun } => {
            run.write(out);
            begun.write(out);
        }
        Body::LiveReadings { run, readings } => {
            run.write(out);
            readings.write(out);
        }
        Body::PointTaken { run, point } => {
            run.write(out);
            point.write(out);
        }
        Body::LiveNote { run, note } => {
            run.write(out);
            note.write(out);
        }
        Body::Certificate(certificate) => certificate.write(out),
        Body::CertificateFiles { certificate, files } => {
            certificate.write(out);
            files.write(out);
        }
        Body::Entry { revision, replaces, entry } => {
            revision.write(out);
            replaces.write(out);
            match entry.as_ref() {
                Entry::Orifice(entry) => entry.write(out),
                Entry::Instrument(entry) => entry.write(out),
                Entry::FirstStage(entry) => entry.write(out),
                Entry::Acceptance(entry) => entry.write(out),
                Entry::Shop(entry) => entry.write(out),
                Entry::Diver(entry) => entry.write(out),
            }
        }
        Body::Session { number, origin, source, extent, header } => {
            number.write(out);
            origin.write(out);
            source.write(out);
            extent.write(out);
            session_header::write(header, out);
        }
        Body::SessionReadings { session, columns } => {
            session.write(out);
            columns.write(out);
        }
        Body::SessionLine { session, run } => {
            session.write(out);
            canonical::header::write(run, out);
            run.readings.write(out);
        }
        Body::SessionFile { session, role, name, bytes } => {
            session.write(out);
            role.write(out);
            name.write(out);
            bytes.write(out);
        }
        Body::SessionLeftOut { session, left_out } => {
            session.write(out);
            left_out.write(out);
        }
        Body::SessionEvent { session, event } => {
            session.write(out);
            event.write(out);
        }
        Body::SessionReadingCorrected { session, row, replaces, values } => {
            session.write(out);
            row.write(out);
            replaces.write(out);
            values.write(out);
        }
        Body::SessionEventCorrected { session, row, replaces, event } => {
            session.write(out);
            row.write(out);
            replaces.write(out);
            event.write(out);
        }
        Body::SessionRowStruck { session, row, replaces, why } => {
            session.write(out);
            row.write(out);
            replaces.write(out);
            why.write(out);
        }
        Body::SessionRestated { session, replaces, header } => {
            session.write(out);
            replaces.write(out);
            session_header::write(header, out);
        }
        Body::SessionFinished { session, cells, extent } => {
            session.write(out);
            cells.write(out);
            extent.write(out);
        }
        Body::SessionLoggingBegun { session, begun } => {
            session.write(out);
            begun.write(out);
        }
        Body::SessionNote { session, note } => {
            session.write(out);
            note.write(out);
        }
        Body::Erasure { erased, sessions, why } => {
            erased.write(out);
            sessions.write(out);
            why.write(out);
        }
        Body::CopyMade { kind, place } => {
            kind.write(out);
            place.write(out);
        }
    }
    bytes.into_bytes()
}

/// The record of a kind from its canonical bytes.
///
/// # Errors
/// A kind or a form that this program does not know; bytes that are not that kind's.
pub(super) fn read(kind: u16, bytes: &[u8]) -> Result<Record<'static>, Unreadable> {
    let kind = Kind::of(kind).ok_or(Unreadable::Choice(u32::from(kind), "record"))?;
    let mut reader = Reader::new(bytes);
    let from = &mut reader;
    let format = u8::read(from)?;
    if format != FORMAT {
        return Err(Unreadable::Choice(u32::from(format), "form"));
    }
    let at = Canonical::read(from)?;
    let body = match kind {
        Kind::Begun => Body::Begun,
        Kind::Run => Body::Run {
            number: Canonical::read(from)?,
            origin: Canonical::read(from)?,
            source: Canonical::read(from)?,
            header: Cow::Owned(canonical::header::read(from)?),
        },
        Kind::Readings => {
            Body::Readings { run: Canonical::read(from)?, readings: Cow::Owned(Canonical::read(from)?) }
        }
        Kind::Source => {
            Body::Source { run: Canonical::read(from)?, files: Cow::Owned(Canonical::read(from)?) }
        }
        Kind::PointCorrected => Body::PointCorrected {
            run: Canonical::read(from)?,
            point: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            reading: Canonical::read(from)?,
        },
        Kind::PointStruck => Body::PointStruck {
            run: Canonical::read(from)?,
            point: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            why: Canonical::read(from)?,
        },
        Kind::RunRestated => Body::RunRestated {
            run: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            header: Cow::Owned(canonical::header::read(from)?),
        },
        Kind::RunFinished => Body::RunFinished { run: Canonical::read(from)? },
        Kind::LeftOut => Body::LeftOut {
            run: Canonical::read(from)?,
            left_out: Canonical::read(from)?,
            by: Canonical::read(from)?,
        },
        Kind::Decided => {
            Body::Decided { run: Canonical::read(from)?, decision: Box::new(Canonical::read(from)?) }
        }
        Kind::LoggingBegun => {
            Body::LoggingBegun { run: Canonical::read(from)?, begun: Canonical::read(from)? }
        }
        Kind::LiveReadings => {
            Body::LiveReadings { run: Canonical::read(from)?, readings: Cow::Owned(Canonical::read(from)?) }
        }
        Kind::PointTaken => Body::PointTaken { run: Canonical::read(from)?, point: Canonical::read(from)? },
        Kind::LiveNote => {
            Body::LiveNote { run: Canonical::read(from)?, note: Cow::Owned(Canonical::read(from)?) }
        }
        Kind::Certificate => Body::Certificate(Box::new(Canonical::read(from)?)),
        Kind::CertificateFiles => {
            Body::CertificateFiles { certificate: Canonical::read(from)?, files: Canonical::read(from)? }
        }
        Kind::Orifice => entry(from, |from| Orifice::read(from).map(Entry::Orifice))?,
        Kind::Instrument => entry(from, |from| Instrument::read(from).map(Entry::Instrument))?,
        Kind::FirstStage => entry(from, |from| FirstStage::read(from).map(Entry::FirstStage))?,
        Kind::Acceptance => entry(from, |from| Canonical::read(from).map(Entry::Acceptance))?,
        Kind::Shop => entry(from, |from| Shop::read(from).map(Entry::Shop))?,
        Kind::Diver => entry(from, |from| Diver::read(from).map(Entry::Diver))?,
        Kind::Session => Body::Session {
            number: Canonical::read(from)?,
            origin: Canonical::read(from)?,
            source: Canonical::read(from)?,
            extent: Canonical::read(from)?,
            header: Cow::Owned(session_header::read(from)?),
        },
        Kind::SessionReadings => {
            Body::SessionReadings { session: Canonical::read(from)?, columns: Canonical::read(from)? }
        }
        Kind::SessionLine => {
            let (session, header) = (Canonical::read(from)?, canonical::header::read(from)?);
            let run = Run { readings: Canonical::read(from)?, ..header };
            Body::SessionLine { session, run: Cow::Owned(run) }
        }
        Kind::SessionFile => Body::SessionFile {
            session: Canonical::read(from)?,
            role: Canonical::read(from)?,
            name: Canonical::read(from)?,
            bytes: Canonical::read(from)?,
        },
        Kind::SessionLeftOut => {
            Body::SessionLeftOut { session: Canonical::read(from)?, left_out: Canonical::read(from)? }
        }
        Kind::SessionEvent => {
            Body::SessionEvent { session: Canonical::read(from)?, event: Canonical::read(from)? }
        }
        Kind::SessionReadingCorrected => Body::SessionReadingCorrected {
            session: Canonical::read(from)?,
            row: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            values: Canonical::read(from)?,
        },
        Kind::SessionEventCorrected => Body::SessionEventCorrected {
            session: Canonical::read(from)?,
            row: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            event: Canonical::read(from)?,
        },
        Kind::SessionRowStruck => Body::SessionRowStruck {
            session: Canonical::read(from)?,
            row: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            why: Canonical::read(from)?,
        },
        Kind::SessionRestated => Body::SessionRestated {
            session: Canonical::read(from)?,
            replaces: Canonical::read(from)?,
            header: Cow::Owned(session_header::read(from)?),
        },
        Kind::SessionFinished => Body::SessionFinished {
            session: Canonical::read(from)?,
            cells: Canonical::read(from)?,
            extent: Canonical::read(from)?,
        },
        Kind::SessionLoggingBegun => {
            Body::SessionLoggingBegun { session: Canonical::read(from)?, begun: Canonical::read(from)? }
        }
        Kind::SessionNote => {
            Body::SessionNote { session: Canonical::read(from)?, note: Cow::Owned(Canonical::read(from)?) }
        }
        Kind::Erasure => Body::Erasure {
            erased: Canonical::read(from)?,
            sessions: Canonical::read(from)?,
            why: Canonical::read(from)?,
        },
        Kind::CopyMade => Body::CopyMade { kind: Canonical::read(from)?, place: Canonical::read(from)? },
    };
    reader.finish()?;
    Ok(Record { at, body })
}

fn entry(
    from: &mut Reader<'_>,
    read: impl FnOnce(&mut Reader<'_>) -> Result<Entry, Unreadable>,
) -> Result<Body<'static>, Unreadable> {
    let (revision, replaces) = (Canonical::read(from)?, Canonical::read(from)?);
    Ok(Body::Entry { revision, replaces, entry: Box::new(read(from)?) })
}

canonical::choice!(Origin, "origin" { Imported = 1, Entered = 2, Logged = 3 });
canonical::choice!(CopyKind, "copy" { Backup = 1, Export = 2 });

impl Canonical for SourceFiles {
    fn write(&self, out: &mut Writer) {
        let Self { run_file_name, run_file, readings_name, readings } = self;
        run_file_name.write(out);
        out.length(run_file.len());
        out.raw(run_file);
        readings_name.write(out);
        out.length(readings.len());
        out.raw(readings);
    }

    fn read(from: &mut Reader<'_>) -> Result<Self, Unreadable> {
        Ok(Self {
            run_file_name: Canonical::read(from)?,
            run_file: Bytes::read(from)?.0,
            readings_name: Canonical::read(from)?,
            readings: Bytes::read(from)?.0,
        })
    }
}
