//! `instrument try` and `instrument ports`: an instrument listened to for a few seconds, and the ports there are.
//!
//! Both write nothing: not the book, not the profile.

use std::path::Path;

use super::fit::names_a_file;
use super::registers::{RegisterKind, flag_of, id_of};
use super::shelf::Shelf;
use super::{ExitStatus, WorkError};
use crate::book::{BookError, Register};
use crate::clock::Monotonic;
use crate::entry::{Instrument, ModbusTable, Socket, WordOrder};
use crate::instrument::{
    Change, Fault, FaultKind, Lost, PortSeen, Proposal, Reading, Scale, SystemPorts, Trial, UsbIdentity,
    try_out,
};
use crate::quantity::Span;
use crate::record::{RegisterEntry, read_register_as};
use crate::report::instrument_trial::{
    ChangeShown, FaultShown, ProfileFrom, ProposalShown, TrialFault, TrialReading, TrialShown,
};
use crate::report::port_list::{Absent, PortList, PortShown, UsbShown};

/// Shortest and longest time to listen, seconds.
const LISTEN_S: (f64, f64) = (0.5, 3_600.0);

/// An instrument to be tried.
#[derive(Debug, Clone, PartialEq)]
pub struct TrialRequest {
    /// Its name in the register, or the file of its profile.
    pub what: String,
    /// How long it is listened to.
    pub lasts: Span,
    /// The book as it was named on the command line, for the commands that are proposed.
    pub book: Option<String>,
}

/// Listens to an instrument and looks for settings under which it does better.
///
/// # Errors
/// A profile that is refused or not in the register, a time outside the bounds, a port that does not open.
pub fn try_instrument(
    shelf: &Shelf,
    request: &TrialRequest,
    notes: &mut Vec<String>,
) -> Result<TrialShown, WorkError> {
    let lasts_s = request.lasts.as_s();
    if !(LISTEN_S.0..=LISTEN_S.1).contains(&lasts_s) {
        return Err(WorkError::ListenFor(lasts_s));
    }
    let (instrument, from) = profile(shelf, request, notes)?;
    let trial = try_out(&instrument, &SystemPorts, &Monotonic::start(), lasts_s)?;
    if let Some(Lost::Open(error)) = trial.lost {
        return Err(error.into());
    }
    Ok(shown(instrument, from, trial))
}

/// How a trial ends: favourably when readings came, no fault among them, and nothing speaks against the profile.
#[must_use]
pub fn status_of(trial: &TrialShown) -> ExitStatus {
    match (&trial.lost, trial.reads_well()) {
        (Some(_), _) => ExitStatus::Failed,
        (None, true) => ExitStatus::Done,
        (None, false) => ExitStatus::Unfavourable,
    }
}

fn profile(
    shelf: &Shelf,
    request: &TrialRequest,
    notes: &mut Vec<String>,
) -> Result<(Instrument, ProfileFrom), WorkError> {
    if names_a_file(&request.what) {
        let loaded = read_register_as(RegisterKind::Instrument, Path::new(&request.what), None)?;
        notes.extend(loaded.notes.iter().map(ToString::to_string));
        if let RegisterEntry::Instrument(instrument) = loaded.value {
            return Ok((instrument, ProfileFrom::File(request.what.clone())));
        }
        // The reader was told which register.
        return Err(WorkError::NothingGiven);
    }
    let id = id_of(&request.what)?;
    let found = shelf.to_read()?.entry::<Instrument>(&id)?;
    let unknown = || BookError::Unknown { register: Register::Instrument, id: request.what.clone() };
    let found = found.ok_or_else(unknown)?;
    Ok((found.entry, ProfileFrom::Register(request.book.clone())))
}

fn shown(instrument: Instrument, from: ProfileFrom, trial: Trial) -> TrialShown {
    let scale = Scale::of(&instrument).ok();
    let outside =
        |reading: &Reading| scale.as_ref().and_then(|scale| scale.within_range(reading)) == Some(false);
    TrialShown {
        baud: trial.settings.baud,
        frame: trial.settings.frame(),
        listened_s: trial.listened_s,
        bytes: trial.bytes,
        readings: trial
            .readings()
            .map(|(at_s, reading)| TrialReading {
                at_s,
                shown: reading.shown,
                unit: reading.unit.symbol,
                si: reading.si,
                kind: reading.kind(),
            })
            .collect(),
        rate_per_s: trial.rate_per_s(),
        outside_range: trial.readings().filter(|(_, reading)| outside(reading)).count(),
        faults: faults(trial.faults().map(|(_, fault)| fault)),
        lost: trial.lost.as_ref().map(ToString::to_string),
        proposals: trial.proposals.iter().map(proposed).collect(),
        raw: trial.raw,
        instrument,
        from,
    }
}

fn faults<'f>(all: impl Iterator<Item = &'f Fault>) -> Vec<FaultShown> {
    let mut kinds: Vec<FaultShown> = Vec::new();
    for fault in all {
        let kind = said(fault.kind);
        match kinds.iter_mut().find(|known| known.kind == kind) {
            Some(known) => {
                known.times += 1;
                if known.example.is_empty() {
                    known.example.clone_from(&fault.bytes);
                }
            }
            None => kinds.push(FaultShown { kind, times: 1, example: fault.bytes.clone() }),
        }
    }
    kinds
}

/// A kind of fault as the report knows it.
pub(super) const fn said(kind: FaultKind) -> TrialFault {
    match kind {
        FaultKind::Empty => TrialFault::Empty,
        FaultKind::Garbage => TrialFault::Garbage,
        FaultKind::TooLong => TrialFault::TooLong,
        FaultKind::HalfLine => TrialFault::HalfLine,
        FaultKind::NoMatch => TrialFault::NoMatch,
        FaultKind::CutNumber => TrialFault::CutNumber,
        FaultKind::NotANumber => TrialFault::NotANumber,
        FaultKind::NotFinite => TrialFault::NotFinite,
        FaultKind::NoUnit => TrialFault::NoUnit,
        FaultKind::UnknownUnit => TrialFault::UnknownUnit,
        FaultKind::UnstatedReference => TrialFault::UnstatedReference,
        FaultKind::OtherUnit => TrialFault::OtherUnit,
        FaultKind::Silence => TrialFault::Silence,
        FaultKind::CheckSum => TrialFault::CheckSum,
        FaultKind::OtherDevice => TrialFault::OtherDevice,
        FaultKind::OtherFunction => TrialFault::OtherFunction,
        FaultKind::WrongLength => TrialFault::WrongLength,
        FaultKind::Refused(code) => TrialFault::Refused(code),
        FaultKind::Impossible => TrialFault::Impossible,
        FaultKind::OutOfRange => TrialFault::OutOfRange,
    }
}

fn proposed(proposal: &Proposal) -> ProposalShown {
    ProposalShown {
        changes: proposal.changes.iter().map(changed).collect(),
        readings: proposal.readings.len(),
        first: proposal.readings.first().map(|reading| (reading.shown, reading.unit.symbol)),
        faults: proposal.faults,
    }
}

fn changed(change: &Change) -> ChangeShown {
    let (key, from, to) = match change {
        Change::Baud { from, to } => ("baud", Some(from.to_string()), to.to_string()),
        Change::Frame { from, to } => ("frame", Some(from.clone()), to.clone()),
        Change::Ends { from, to } => ("protocol.ends", Some(from.clone()), to.clone()),
        Change::Pattern { from, to } => ("protocol.pattern", Some(from.clone()), to.clone()),
        Change::Unit { from, to } => ("unit", from.clone(), to.clone()),
        Change::Table { from, to } => {
            ("protocol.table", Some(table(*from).to_owned()), table(*to).to_owned())
        }
        Change::WordOrder { from, to } => {
            ("protocol.word_order", Some(order(*from).to_owned()), order(*to).to_owned())
        }
    };
    ChangeShown { key, flag: flag_of(key), from, to }
}

const fn table(table: ModbusTable) -> &'static str {
    match table {
        ModbusTable::Input => "input",
        ModbusTable::Holding => "holding",
    }
}

const fn order(order: WordOrder) -> &'static str {
    match order {
        WordOrder::Big => "big",
        WordOrder::Little => "little",
    }
}

/// The serial ports there are, each with the instruments of the register that are set to it. Where there is no book, no
/// instrument is.
///
/// # Errors
/// When the system does not list its ports, or there is a book that cannot be read.
pub fn ports(shelf: &Shelf) -> Result<PortList, WorkError> {
    let seen = crate::instrument::ports()?;
    let (instruments, book) = match shelf.to_read() {
        Ok(book) => (book.entries::<Instrument>(None, None)?, true),
        Err(WorkError::Book(BookError::NoBook { .. })) => (Vec::new(), false),
        Err(error) => return Err(error),
    };
    let set: Vec<(String, Socket)> = instruments
        .into_iter()
        .filter_map(|found| Some((found.entry.id.to_string(), found.entry.socket?)))
        .collect();
    Ok(listed(&seen, &set, book))
}

fn listed(seen: &[PortSeen], set: &[(String, Socket)], book: bool) -> PortList {
    let is_at = |port: &PortSeen, socket: &Socket| match socket {
        Socket::Port(name) => *name == port.name,
        Socket::Usb(identity) => port.usb.as_ref().is_some_and(|usb| usb.is(identity)),
    };
    let ports = seen.iter().map(|port| PortShown {
        name: port.name.clone(),
        usb: port.usb.as_ref().map(usb),
        instruments: set.iter().filter(|(_, socket)| is_at(port, socket)).map(|(id, _)| id.clone()).collect(),
    });
    let absent = set.iter().filter(|(_, socket)| !seen.iter().any(|port| is_at(port, socket)));
    let absent = absent.map(|(id, socket)| {
        let (set_to, there) = match socket {
            Socket::Port(name) => (name.clone(), Path::new(name).exists()),
            Socket::Usb(identity) => (format!("the USB device {identity}"), false),
        };
        Absent { instrument: id.clone(), set_to, there }
    });
    PortList { ports: ports.collect(), absent: absent.collect(), book }
}

fn usb(usb: &UsbIdentity) -> UsbShown {
    UsbShown {
        identity: usb.text(),
        model: format!("{:04x}:{:04x}", usb.vendor, usb.product),
        maker: usb.maker.clone(),
        name: usb.name.clone(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_port_is_found_by_its_name_and_by_what_is_plugged_into_it() {
        let usb = UsbIdentity {
            vendor: 0x0403,
            product: 0x6001,
            serial: Some("A1".into()),
            maker: None,
            name: None,
        };
        let seen =
            [PortSeen { name: "COM3".into(), usb: Some(usb) }, PortSeen { name: "COM4".into(), usb: None }];
        let set = [
            ("FM-01".to_owned(), Socket::Usb("0403:6001:A1".into())),
            ("PT-01".to_owned(), Socket::Port("COM4".into())),
            ("PT-02".to_owned(), Socket::Port("COM4".into())),
            ("BAR-1".to_owned(), Socket::Port("COM9".into())),
            ("C-1".to_owned(), Socket::Usb("0403:6001:A2".into())),
        ];
        let list = listed(&seen, &set, true);
        assert_eq!(list.ports[0].instruments, ["FM-01"]);
        assert_eq!(list.ports[0].usb.as_ref().unwrap().identity.as_deref(), Some("0403:6001:A1"));
        assert_eq!(list.ports[1].instruments, ["PT-01", "PT-02"]);
        let absent: Vec<&str> = list.absent.iter().map(|absent| absent.instrument.as_str()).collect();
        assert_eq!(absent, ["BAR-1", "C-1"]);
        assert!(list.absent.iter().all(|absent| !absent.there));
    }

    #[test]
    fn faults_of_a_kind_are_counted_and_keep_the_first_bytes() {
        let all = [
            Fault::new(FaultKind::Silence, b""),
            Fault::new(FaultKind::NoMatch, b"ERR"),
            Fault::new(FaultKind::Silence, b"x"),
            Fault::new(FaultKind::NoMatch, b"OOPS"),
        ];
        let counted = faults(all.iter());
        assert_eq!(
            counted,
            [
                FaultShown { kind: TrialFault::Silence, times: 2, example: b"x".to_vec() },
                FaultShown { kind: TrialFault::NoMatch, times: 2, example: b"ERR".to_vec() },
            ]
        );
    }
}
