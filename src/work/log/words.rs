//! What happened to an instrument, and alarms, as notes in words.

use crate::entry::{Id, Instrument, LiveNote, LiveNoteKind};
use crate::logger::{Alarm, AlarmChange, AlarmKind, Trouble, TroubleAt};
use crate::work::instruments::said;

/// The note of a trouble.
pub(super) fn trouble_note(trouble: &TroubleAt, instrument: Option<Id>, began_s: f64) -> LiveNote {
    let at_s = trouble.at_s - began_s;
    let (kind, says, bytes) = match &trouble.what {
        Trouble::Fault(fault) => (LiveNoteKind::Fault, said(fault.kind).says(), fault.bytes.clone()),
        Trouble::Lost(lost) => (LiveNoteKind::Lost, format!("its port was lost: {lost}"), Vec::new()),
        Trouble::Connected => (LiveNoteKind::Connected, "its port was opened".to_owned(), Vec::new()),
        Trouble::Stale => (LiveNoteKind::Stale, "its last reading is too old".to_owned(), Vec::new()),
        Trouble::Fresh => (LiveNoteKind::Fresh, "its readings come again".to_owned(), Vec::new()),
        Trouble::Frozen { since_s } => {
            let for_s = trouble.at_s - since_s;
            (LiveNoteKind::Frozen, format!("it has shown the very same value for {for_s:.0} s"), Vec::new())
        }
        Trouble::Thawed => (LiveNoteKind::Thawed, "its value moves again".to_owned(), Vec::new()),
        Trouble::TimeRanBack { by_s } => (
            LiveNoteKind::ClockBack,
            format!("its reading is stamped {by_s:.1} s earlier than the one before it"),
            Vec::new(),
        ),
    };
    LiveNote { instrument, at_s, kind, says, bytes }
}

/// The note of an alarm.
pub(super) fn alarm_note(change: &AlarmChange, instruments: &[Instrument], began_s: f64) -> LiveNote {
    let kind = if change.raised { LiveNoteKind::AlarmRaised } else { LiveNoteKind::AlarmCleared };
    let instrument = instrument_of(&change.alarm).and_then(|number| instruments.get(number));
    LiveNote {
        instrument: instrument.map(|instrument| instrument.id.clone()),
        at_s: change.at_s - began_s,
        kind,
        says: alarm_words(&change.alarm, instruments),
        bytes: Vec::new(),
    }
}

/// The instrument an alarm is about.
pub(super) const fn instrument_of(alarm: &Alarm) -> Option<usize> {
    match alarm.kind {
        AlarmKind::Missing { instrument }
        | AlarmKind::Stale { instrument }
        | AlarmKind::Frozen { instrument }
        | AlarmKind::Disagrees { instrument } => Some(instrument),
        _ => None,
    }
}

/// An alarm in one sentence, with its worst value.
pub(super) fn alarm_words(alarm: &Alarm, instruments: &[Instrument]) -> String {
    let worst = alarm.worst;
    let name = |number: usize| instruments.get(number).map_or("an instrument", |one| one.id.as_str());
    match alarm.kind {
        AlarmKind::Po2Low { limit_bar } => {
            format!(
                "PO2 low: {worst:.2} bar, below the floor of {limit_bar:.2} bar: add oxygen or come off the loop"
            )
        }
        AlarmKind::Po2High { limit_bar } => {
            format!(
                "PO2 high: {worst:.2} bar, above the ceiling of {limit_bar:.2} bar: flush with diluent or come off the loop"
            )
        }
        AlarmKind::TooDeep { limit_m } => {
            format!("too deep: {worst:.1} m, and a session goes no deeper than {limit_m:.0} m")
        }
        AlarmKind::NoPo2 => "no cell can be read: come off the loop".to_owned(),
        AlarmKind::Missing { instrument } => format!("nothing was heard of {} yet", name(instrument)),
        AlarmKind::Stale { instrument } => {
            format!("{} is silent: its last reading is {worst:.0} s old", name(instrument))
        }
        AlarmKind::Frozen { instrument } => {
            format!(
                "{} is frozen: the very same value for {worst:.0} s while the others move",
                name(instrument)
            )
        }
        AlarmKind::Disagrees { instrument } => {
            format!("{} is {worst:.2} bar off the other cells: trust neither", name(instrument))
        }
        AlarmKind::RisesUnfed => {
            format!(
                "PO2 rises by {worst:.3} bar/min with nothing injected: a leak of oxygen into the loop, or a cell"
            )
        }
    }
}
