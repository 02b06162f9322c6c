//! A logged session as a face shows it, from what the logger says.

use super::ledger::Kept;
use super::session::kept_now;
use super::view::{plain_dial, saved};
use crate::entry::{Event, Instrument, Session, SessionNumber, What};
use crate::instrument::Counters;
use crate::logger::{AlarmKind, Role, SessionLive};
use crate::quantity::Kind;
use crate::report::Units;
use crate::report::live_parts::{Dial, DialState, Hold};
use crate::report::session_live::{AlarmSeen, CellSeen, SessionView, Wrong};
use crate::stats::ordinary;

/// Seconds over which the rate of PO2 is taken, and fewest rows for it.
const RATE_OVER_S: f64 = 60.0;
const FEWEST_ROWS: usize = 10;

/// What there is to show.
pub(super) struct SessionState<'a> {
    pub(super) now_s: f64,
    pub(super) instruments: &'a [Instrument],
    pub(super) live: &'a SessionLive,
    pub(super) counters: &'a [Counters],
    pub(super) troubles: &'a [Option<String>],
    pub(super) session: &'a Session,
    pub(super) number: Option<SessionNumber>,
    pub(super) limits_bar: (f64, f64),
    pub(super) events: &'a [Event],
    /// Seconds since the first row, and median PO2 in bar.
    pub(super) curve: &'a [(f64, f64)],
    pub(super) rows_before: usize,
    pub(super) kept: Option<&'a Kept>,
    pub(super) units: Units,
    pub(super) hold: Hold,
    pub(super) left_s: Option<f64>,
}

/// The view of a session.
pub(super) fn session_view(state: &SessionState<'_>) -> SessionView {
    let live = state.live;
    let dial = |channel| {
        let instrument = state.instruments.get(channel_number(channel));
        plain_dial(instrument, channel, state.counters, state.troubles, state.now_s, DialState::Read)
    };
    let cells = live.channels.iter().filter(|channel| channel.role == Role::Cell);
    let cells = cells.zip(&live.po2_bar).map(|(channel, po2_bar)| {
        let volts = channel.last.filter(|reading| reading.kind() == Some(Kind::Voltage));
        let of_voltage = volts.map(|reading| reading.si * 1e3);
        // The last value stays, with its age, when the cell is silent.
        let value = if of_voltage.is_some() { *po2_bar } else { dial(channel).value };
        // What the last digit of a voltage counts is none of its PO2.
        let resolution = if of_voltage.is_some() { None } else { dial(channel).resolution };
        CellSeen {
            dial: Dial { value, resolution, ..dial(channel) },
            millivolts: of_voltage,
            off: live
                .alarms
                .iter()
                .any(|alarm| alarm.kind == AlarmKind::Disagrees { instrument: channel.instrument }),
        }
    });
    let around = live.channels.iter().filter(|channel| channel.role != Role::Cell).map(dial);
    let injection = state.events.iter().rev().find_map(|event| match event.what {
        What::Injection(injection) => Some(injection),
        _ => None,
    });
    SessionView {
        units: state.units,
        session: state.number,
        diver: state.session.diver.to_string(),
        place: state.session.place,
        kept: kept_now(state.session, state.events),
        elapsed_s: live.time_s,
        left_s: state.left_s,
        po2_bar: live.median_po2_bar,
        po2_rate_bar_min: rate(state.curve, state.events),
        limits_bar: state.limits_bar,
        cells: cells.collect(),
        around: around.collect(),
        alarms: alarms(state),
        injection,
        events: state.events.to_vec(),
        rows: state.rows_before + live.rows,
        curve: state.curve.to_vec(),
        saved: saved(state.kept, state.now_s),
        hold: state.hold.clone(),
    }
}

const fn channel_number(channel: &crate::logger::ChannelLive) -> usize {
    channel.instrument
}

fn alarms(state: &SessionState<'_>) -> Vec<AlarmSeen> {
    let name =
        |number: usize| state.instruments.get(number).map(|one| one.id.to_string()).unwrap_or_default();
    let seen = state.live.alarms.iter().map(|alarm| AlarmSeen {
        what: match alarm.kind {
            AlarmKind::Po2Low { limit_bar } => Wrong::Po2Low { limit_bar },
            AlarmKind::Po2High { limit_bar } => Wrong::Po2High { limit_bar },
            AlarmKind::TooDeep { limit_m } => Wrong::TooDeep { limit_m },
            AlarmKind::NoPo2 => Wrong::NoPo2,
            AlarmKind::Missing { instrument } => Wrong::Missing(name(instrument)),
            AlarmKind::Stale { instrument } => Wrong::Stale(name(instrument)),
            AlarmKind::Frozen { instrument } => Wrong::Frozen(name(instrument)),
            AlarmKind::Disagrees { instrument } => Wrong::Disagrees(name(instrument)),
            AlarmKind::RisesUnfed => Wrong::RisesUnfed,
        },
        for_s: state.now_s - alarm.since_s,
        worst: alarm.worst,
    });
    seen.collect()
}

/// How fast PO2 went over the last minute, since the last event, in bar a minute; none with too few rows. A look, not an
/// uptake.
fn rate(curve: &[(f64, f64)], events: &[Event]) -> Option<f64> {
    let last_s = curve.last()?.0;
    let from_s = events.last().map_or(f64::NEG_INFINITY, |event| event.at_s).max(last_s - RATE_OVER_S);
    let late: Vec<(f64, f64)> = curve.iter().copied().filter(|(at_s, _)| *at_s >= from_s).collect();
    if late.len() < FEWEST_ROWS {
        return None;
    }
    let (time_min, po2_bar): (Vec<f64>, Vec<f64>) =
        late.iter().map(|(at_s, po2_bar)| ((at_s - last_s) / 60.0, *po2_bar)).unzip();
    slope(&time_min, &po2_bar)
}

fn slope(x: &[f64], y: &[f64]) -> Option<f64> {
    let line = ordinary::polynomial(x, y, 1).ok()?;
    line.parameters.get(1).copied().filter(|slope| slope.is_finite())
}
