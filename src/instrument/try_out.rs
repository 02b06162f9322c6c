//! Trying out one instrument: what comes over its port, what its profile makes of it, and which profile would do better.

use super::bus::alone;
use super::error::{Lost, ProfileError};
use super::exchange::{self, LONGEST_WAIT_S};
use super::fault::{Fault, FaultKind};
use super::line::{LineSettings, Opener};
use super::proposal::{Change, Proposal, fitting_text, tried};
use super::reading::{Reading, kinds};
use crate::clock::Ticks;
use crate::entry::{Instrument, ModbusTable, Protocol, WordOrder};
use crate::quantity::Span;

/// Usual baud rates, the most usual first (common practice, no source).
pub const BAUD_RATES: [u32; 11] =
    [9_600, 19_200, 115_200, 38_400, 57_600, 4_800, 2_400, 1_200, 230_400, 460_800, 921_600];
/// Usual frames, the most usual first (common practice, no source). Modbus has only those of eight data bits.
pub const FRAMES: [&str; 6] = ["8N1", "8E1", "7E1", "8O1", "7O1", "8N2"];
/// Bytes that are kept to be shown.
const KEPT: usize = 4096;
/// Longest time in seconds at one setting that is only tried.
const LONGEST_PROBE_S: f64 = 3.0;

/// What a trial brought.
#[derive(Debug, Clone, PartialEq)]
pub struct Trial {
    /// How the port was set.
    pub settings: LineSettings,
    /// Why the port did not open, or was lost on the way.
    pub lost: Option<Lost>,
    /// Seconds that were listened.
    pub listened_s: f64,
    /// All bytes heard.
    pub bytes: u64,
    /// The first of them, at most 4096.
    pub raw: Vec<u8>,
    /// What they are under the profile, each with its second since the trial began.
    pub found: Vec<(f64, Result<Reading, Fault>)>,
    /// Settings under which what was heard parses better, each tried.
    pub proposals: Vec<Proposal>,
}

impl Trial {
    /// The readings, each with its second since the trial began.
    pub fn readings(&self) -> impl Iterator<Item = (f64, Reading)> + '_ {
        self.found.iter().filter_map(|(at_s, what)| what.as_ref().ok().map(|reading| (*at_s, *reading)))
    }

    /// The faults, each with its second since the trial began.
    pub fn faults(&self) -> impl Iterator<Item = (f64, &Fault)> + '_ {
        self.found.iter().filter_map(|(at_s, what)| what.as_ref().err().map(|fault| (*at_s, fault)))
    }

    /// Readings a second; none before two at different seconds.
    #[must_use]
    pub fn rate_per_s(&self) -> Option<f64> {
        let first = self.readings().next()?.0;
        let (intervals, last) =
            self.readings().skip(1).fold((0_u32, first), |(n, _), (at_s, _)| (n + 1, at_s));
        (last > first).then(|| f64::from(intervals) / (last - first))
    }

    /// Whether the profile does well as it is: two readings, and at most one fault to four of them.
    #[must_use]
    pub fn does_well(&self) -> bool {
        let readings = self.readings().count();
        readings >= 2 && 4 * self.faults().count() <= readings
    }

    /// Whether most of what was found are faults of these kinds.
    fn mostly(&self, of: impl Fn(FaultKind) -> bool) -> bool {
        2 * self.faults().filter(|(_, fault)| of(fault.kind)).count() > self.found.len()
    }
}

/// Listens to an instrument for so many seconds as its profile says, and where that does not do well, looks for settings
/// under which it does: other endings, patterns and units on what was heard, then other baud rates and frames, each for
/// at most three seconds. An instrument that streams and of which no byte was heard is not looked for: at a wrong speed
/// bytes come all the same.
///
/// # Errors
/// A profile that cannot be listened to. A port that does not open is a result.
pub fn try_out(
    instrument: &Instrument,
    opener: &dyn Opener,
    ticks: &dyn Ticks,
    seconds: f64,
) -> Result<Trial, ProfileError> {
    let mut trial = listened(instrument, opener, ticks, seconds)?;
    if trial.lost.is_none() {
        trial.proposals = match &instrument.protocol {
            Some(Protocol::ModbusRtu { .. }) => for_modbus(&trial, instrument, opener, ticks, seconds),
            _ => for_text(&trial, instrument, opener, ticks, seconds),
        };
    }
    Ok(trial)
}

/// What comes in so many seconds.
fn listened(
    instrument: &Instrument,
    opener: &dyn Opener,
    ticks: &dyn Ticks,
    seconds: f64,
) -> Result<Trial, ProfileError> {
    let mut bus = alone(instrument)?;
    let (settings, began_s) = (bus.settings, ticks.now_s());
    let mut trial = Trial {
        settings,
        lost: None,
        listened_s: 0.0,
        bytes: 0,
        raw: Vec::new(),
        found: Vec::new(),
        proposals: Vec::new(),
    };
    let mut line = match opener.open(&bus.socket, settings) {
        Ok(line) => line,
        Err(error) => {
            trial.lost = Some(Lost::Open(error));
            return Ok(trial);
        }
    };
    bus.conversation.opened(ticks.now_s());
    loop {
        let left_s = began_s + seconds - ticks.now_s();
        trial.listened_s = seconds - left_s.max(0.0);
        if left_s <= 0.0 {
            return Ok(trial);
        }
        let longest_s = left_s.min(LONGEST_WAIT_S);
        match exchange::turn(line.as_mut(), bus.conversation.as_mut(), ticks, longest_s) {
            Ok(turn) => {
                trial.bytes += turn.bytes.len() as u64;
                let room = KEPT.saturating_sub(trial.raw.len());
                trial.raw.extend(turn.bytes.iter().take(room));
                trial.found.extend(turn.found.into_iter().map(|one| (turn.at_s - began_s, one.what)));
            }
            Err(error) => {
                trial.lost = Some(match error.kind() {
                    std::io::ErrorKind::UnexpectedEof | std::io::ErrorKind::BrokenPipe => Lost::Closed,
                    _ => Lost::Failed(error.to_string()),
                });
                return Ok(trial);
            }
        }
    }
}

fn for_text(
    trial: &Trial,
    instrument: &Instrument,
    opener: &dyn Opener,
    ticks: &dyn Ticks,
    seconds: f64,
) -> Vec<Proposal> {
    let here = fitting_text(&trial.raw, instrument);
    let asked = matches!(&instrument.protocol, Some(Protocol::Lines { ask: Some(_), .. }));
    if trial.does_well() || !here.is_empty() || (!asked && trial.bytes == 0) {
        return here;
    }
    let probe_s = probe_s(instrument, seconds);
    elsewhere(instrument, trial.settings)
        .find_map(|(changes, other)| {
            let probe = listened(&other, opener, ticks, probe_s).ok()?;
            let so = tried(&probe.raw, &other)?;
            if so.fits() {
                let (readings, faults) = (so.readings, so.faults.len());
                return Some(vec![Proposal { changes, instrument: other, readings, faults }]);
            }
            let found = fitting_text(&probe.raw, &other)
                .into_iter()
                .map(|one| Proposal { changes: [changes.clone(), one.changes].concat(), ..one });
            let found: Vec<Proposal> = found.collect();
            (!found.is_empty()).then_some(found)
        })
        .unwrap_or_default()
}

fn for_modbus(
    trial: &Trial,
    instrument: &Instrument,
    opener: &dyn Opener,
    ticks: &dyn Ticks,
    seconds: f64,
) -> Vec<Proposal> {
    if trial.does_well() {
        return Vec::new();
    }
    let probe_s = probe_s(instrument, seconds);
    let probed = |changes: Vec<Change>, other: Instrument| {
        let probe = listened(&other, opener, ticks, probe_s).ok()?;
        let readings: Vec<Reading> = probe.readings().map(|(_, reading)| reading).collect();
        let faults = probe.faults().count();
        probe.does_well().then_some(Proposal { changes, instrument: other, readings, faults })
    };
    if trial.mostly(|kind| matches!(kind, FaultKind::Refused(_))) {
        return other_table(instrument)
            .and_then(|(change, other)| probed(vec![change], other))
            .into_iter()
            .collect();
    }
    let nonsense =
        |kind| matches!(kind, FaultKind::NotFinite | FaultKind::OutOfRange | FaultKind::Impossible);
    if trial.mostly(nonsense) {
        let order = other_order(instrument).and_then(|(change, other)| probed(vec![change], other));
        if let Some(order) = order {
            return vec![order];
        }
        return other_units(instrument).filter_map(|(change, other)| probed(vec![change], other)).collect();
    }
    elsewhere(instrument, trial.settings)
        .filter(|(_, other)| other.frame.as_deref().is_none_or(|frame| frame.starts_with('8')))
        .find_map(|(changes, other)| probed(changes, other))
        .into_iter()
        .collect()
}

/// The profile at every other usual speed and frame: first all speeds with its own frame.
fn elsewhere(
    instrument: &Instrument,
    settings: LineSettings,
) -> impl Iterator<Item = (Vec<Change>, Instrument)> + '_ {
    let own = settings.frame();
    let frames: Vec<String> =
        FRAMES.iter().map(|frame| (*frame).to_owned()).filter(|frame| *frame != own).collect();
    let frames = std::iter::once(own.clone()).chain(frames);
    let rates = move || {
        let others = BAUD_RATES.into_iter().filter(move |rate| *rate != settings.baud);
        std::iter::once(settings.baud).chain(others)
    };
    let all = frames.flat_map(move |frame| rates().map(move |baud| (baud, frame.clone())));
    all.filter_map(move |(baud, frame)| {
        let mut changes = Vec::new();
        let mut other = instrument.clone();
        if baud != settings.baud {
            changes.push(Change::Baud { from: settings.baud, to: baud });
            other.baud = Some(baud);
        }
        if frame != own {
            changes.push(Change::Frame { from: own.clone(), to: frame.clone() });
        }
        other.frame = Some(frame);
        (!changes.is_empty()).then_some((changes, other))
    })
}

fn other_table(instrument: &Instrument) -> Option<(Change, Instrument)> {
    let mut other = instrument.clone();
    let Some(Protocol::ModbusRtu { table, .. }) = &mut other.protocol else { return None };
    let from = *table;
    *table = match from {
        ModbusTable::Input => ModbusTable::Holding,
        ModbusTable::Holding => ModbusTable::Input,
    };
    Some((Change::Table { from, to: *table }, other))
}

fn other_order(instrument: &Instrument) -> Option<(Change, Instrument)> {
    let mut other = instrument.clone();
    let Some(Protocol::ModbusRtu { word_order, number, .. }) = &mut other.protocol else { return None };
    if super::modbus_frame::registers_of(*number) == 1 {
        return None;
    }
    let from = *word_order;
    *word_order = match from {
        WordOrder::Big => WordOrder::Little,
        WordOrder::Little => WordOrder::Big,
    };
    Some((Change::WordOrder { from, to: *word_order }, other))
}

fn other_units(instrument: &Instrument) -> impl Iterator<Item = (Change, Instrument)> + '_ {
    let units = kinds(instrument.measures).iter().flat_map(|kind| kind.units());
    units.filter(|unit| Some(unit.symbol) != instrument.unit.as_deref()).map(|unit| {
        let mut other = instrument.clone();
        let from = other.unit.replace(unit.symbol.to_owned());
        (Change::Unit { from, to: unit.symbol.to_owned() }, other)
    })
}

/// Seconds to listen at a setting that is only tried: long enough for two readings of an instrument that is asked.
fn probe_s(instrument: &Instrument, seconds: f64) -> f64 {
    let every = match &instrument.protocol {
        Some(Protocol::Lines { ask: Some(_), every, .. } | Protocol::ModbusRtu { every, .. }) => {
            every.map_or(super::conversation::DEFAULT_EVERY_S, Span::as_s)
        }
        _ => 0.5,
    };
    (0.5 + 3.0 * every).max(1.0).min(seconds.max(1.0)).min(LONGEST_PROBE_S)
}
