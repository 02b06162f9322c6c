//! What can be said of a stream at any time: how much came, how fast, how old, and how long unchanged.

use std::collections::{BTreeMap, VecDeque};

use super::fault::FaultKind;
use super::reading::Reading;

/// Readings over which the rate is taken.
const RATE_OVER: usize = 16;

/// Counts of one instrument since listening began.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Counters {
    /// Whether its port is open.
    pub connected: bool,
    /// How often its port was lost.
    pub losses: u64,
    /// Bytes heard on its port, those for others on it too.
    pub bytes: u64,
    /// Readings.
    pub readings: u64,
    /// Faults, by kind.
    pub faults: BTreeMap<FaultKind, u64>,
    /// The last reading and its second.
    pub last: Option<(f64, Reading)>,
    /// How many readings in a row, the last one with them, show the very same number, and the second of their first.
    pub unchanged: Option<(u64, f64)>,
    recent_s: VecDeque<f64>,
}

impl Counters {
    /// Age of the last reading in seconds at the second `now_s`; none before the first.
    #[must_use]
    pub fn age_s(&self, now_s: f64) -> Option<f64> {
        self.last.map(|(at_s, _)| (now_s - at_s).max(0.0))
    }

    /// Readings a second, over the last sixteen; none before two at different seconds.
    #[must_use]
    pub fn rate_per_s(&self) -> Option<f64> {
        let span_s = self.recent_s.back()? - self.recent_s.front()?;
        (span_s > 0.0).then(|| (self.recent_s.len() - 1) as f64 / span_s)
    }

    /// Faults of every kind.
    #[must_use]
    pub fn faults_in_all(&self) -> u64 {
        self.faults.values().sum()
    }

    pub(super) fn reading(&mut self, at_s: f64, reading: Reading) {
        let before = self.last.map(|(_, last)| last.shown.to_bits());
        self.unchanged = match self.unchanged {
            // The very same number, bit for bit, is what freezing means.
            Some((times, since_s)) if before == Some(reading.shown.to_bits()) => Some((times + 1, since_s)),
            _ => Some((1, at_s)),
        };
        self.readings += 1;
        self.last = Some((at_s, reading));
        self.recent_s.push_back(at_s);
        if self.recent_s.len() > RATE_OVER {
            self.recent_s.pop_front();
        }
    }

    pub(super) fn fault(&mut self, kind: FaultKind) {
        *self.faults.entry(kind).or_default() += 1;
    }
}
