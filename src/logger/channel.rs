//! One instrument as it is heard: its last value and age, its rate, its faults, whether it is stale, lost or frozen.

use std::collections::{BTreeMap, VecDeque};

use super::ledger::{Stamped, Trouble};
use super::repeats::{Noise, Repeats};
use super::sign::Role;
use crate::entry::{Instrument, Measures, Protocol};
use crate::instrument::{FaultKind, Heard, Reading, What};

/// Age in seconds from which a reading is stale where the profile names none: that of [`crate::instrument`].
const DEFAULT_STALE_S: f64 = 2.0;
/// Readings over which the rate is taken.
const RATE_OVER: usize = 16;

/// An instrument as a screen shows it.
#[derive(Debug, Clone, PartialEq)]
pub struct ChannelLive {
    /// Which instrument, counted from 0 in the list that was given.
    pub instrument: usize,
    /// What it measures.
    pub role: Role,
    /// The last reading.
    pub last: Option<Reading>,
    /// Its age in seconds.
    pub age_s: Option<f64>,
    /// Whether there is none, or it is too old.
    pub stale: bool,
    /// Whether its port is open; not known before the first word of it.
    pub connected: Option<bool>,
    /// Readings a second, over the last sixteen.
    pub rate_per_s: Option<f64>,
    /// Readings so far.
    pub readings: u64,
    /// Faults that were heard, by kind; of a flood only some are ([`crate::instrument::Counters`] has all).
    pub faults: BTreeMap<FaultKind, u64>,
    /// Since when its value is frozen, in seconds of the clock.
    pub frozen_since_s: Option<f64>,
}

/// An instrument at work.
#[derive(Debug, Clone)]
pub(super) struct Channel {
    pub(super) role: Role,
    pub(super) stale_after_s: f64,
    pub(super) last: Option<Stamped>,
    pub(super) repeats: Repeats,
    /// Frozen by what others do meanwhile, since this second.
    pub(super) frozen_beside_s: Option<f64>,
    connected: Option<bool>,
    readings: u64,
    recent_s: VecDeque<f64>,
    faults: BTreeMap<FaultKind, u64>,
    said_stale: bool,
    said_frozen: bool,
}

impl Channel {
    pub(super) fn new(instrument: &Instrument, role: Role) -> Self {
        let stale = instrument.protocol.as_ref().and_then(|protocol| match protocol {
            Protocol::Lines { stale_after, .. } | Protocol::ModbusRtu { stale_after, .. } => *stale_after,
        });
        // A thermometer and a barometer stand still honestly; see the room's own page.
        let noise = match instrument.measures {
            Measures::Flow | Measures::Pressure => Noise::of(instrument),
            _ => None,
        };
        Self {
            role,
            stale_after_s: stale.map_or(DEFAULT_STALE_S, crate::quantity::Span::as_s),
            last: None,
            repeats: Repeats::new(noise),
            frozen_beside_s: None,
            connected: None,
            readings: 0,
            recent_s: VecDeque::new(),
            faults: BTreeMap::new(),
            said_stale: false,
            said_frozen: false,
        }
    }

    /// Takes what was heard of it, and says what is to be recorded of that besides a reading.
    pub(super) fn heard(&mut self, heard: &Heard) -> Vec<Trouble> {
        let mut troubles = Vec::new();
        match &heard.what {
            What::Reading(reading) => self.reading(heard.at_s, *reading, &mut troubles),
            What::Fault(fault) => {
                *self.faults.entry(fault.kind).or_default() += 1;
                troubles.push(Trouble::Fault(fault.clone()));
            }
            What::Connected => {
                self.connected = Some(true);
                troubles.push(Trouble::Connected);
            }
            What::Lost(why) => {
                self.connected = Some(false);
                troubles.push(Trouble::Lost(why.clone()));
            }
        }
        troubles
    }

    fn reading(&mut self, at_s: f64, reading: Reading, troubles: &mut Vec<Trouble>) {
        if let Some(last) = self.last.filter(|last| at_s < last.at_s) {
            troubles.push(Trouble::TimeRanBack { by_s: last.at_s - at_s });
            self.recent_s.clear();
            self.repeats = self.repeats.anew();
        }
        if std::mem::take(&mut self.said_stale) {
            troubles.push(Trouble::Fresh);
        }
        self.connected = Some(true);
        self.readings += 1;
        self.last = Some(Stamped { at_s, reading });
        self.recent_s.push_back(at_s);
        if self.recent_s.len() > RATE_OVER {
            self.recent_s.pop_front();
        }
        self.repeats.heard(at_s, reading.shown, reading.si);
        if self.repeats.is_new() {
            self.frozen_beside_s = None;
        }
        self.say_frozen(troubles);
    }

    /// Says it once when the value freezes, and once when it moves again.
    pub(super) fn say_frozen(&mut self, troubles: &mut Vec<Trouble>) {
        let since_s = self.frozen_since_s();
        match since_s {
            Some(since_s) if !self.said_frozen => troubles.push(Trouble::Frozen { since_s }),
            None if self.said_frozen => troubles.push(Trouble::Thawed),
            _ => {}
        }
        self.said_frozen = since_s.is_some();
    }

    /// Since when its value is frozen.
    pub(super) fn frozen_since_s(&self) -> Option<f64> {
        self.repeats.frozen_since_s().or(self.frozen_beside_s)
    }

    /// Time passed: whether it has just become stale.
    pub(super) fn becomes_stale(&mut self, now_s: f64) -> bool {
        let now_stale = self.last.is_some() && self.is_stale(now_s) && !self.said_stale;
        self.said_stale |= now_stale;
        now_stale
    }

    /// Age of the last reading, in seconds.
    pub(super) fn age_s(&self, now_s: f64) -> Option<f64> {
        self.last.map(|last| (now_s - last.at_s).max(0.0))
    }

    /// Whether there is no reading, or the last one is too old, or its port is lost.
    pub(super) fn is_stale(&self, now_s: f64) -> bool {
        self.connected == Some(false) || self.age_s(now_s).is_none_or(|age_s| age_s > self.stale_after_s)
    }

    /// Seconds from one reading to the next, over the last sixteen; none before two.
    pub(super) fn interval_s(&self) -> Option<f64> {
        let span_s = self.recent_s.back()? - self.recent_s.front()?;
        (span_s > 0.0).then(|| span_s / (self.recent_s.len() - 1) as f64)
    }

    pub(super) fn live(&self, instrument: usize, now_s: f64) -> ChannelLive {
        ChannelLive {
            instrument,
            role: self.role,
            last: self.last.map(|last| last.reading),
            age_s: self.age_s(now_s),
            stale: self.is_stale(now_s),
            connected: self.connected,
            rate_per_s: self.interval_s().map(|interval_s| 1.0 / interval_s),
            readings: self.readings,
            faults: self.faults.clone(),
            frozen_since_s: self.frozen_since_s(),
        }
    }
}
