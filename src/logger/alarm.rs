//! Alarms of a session: what is wrong, since when, and when it is over again.
//!
//! An alarm is raised when its condition holds (for some only when it has held for a while), and cleared when the value has
//! been back beyond a margin for some seconds, so that a value at the limit does not ring and stop and ring. What
//! cannot be judged, as PO2 without a cell, neither raises nor clears.

use crate::entry::{Assumptions, Place};
use crate::report::cautions::{POOL_DEEPEST_M, po2_limits_bar};

/// What is wrong. Instruments are counted from 0 in the list that was given.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum AlarmKind {
    /// A cell shows less than the floor of the place.
    Po2Low {
        /// The floor, bar.
        limit_bar: f64,
    },
    /// A cell shows more than the ceiling of the place.
    Po2High {
        /// The ceiling, bar.
        limit_bar: f64,
    },
    /// Deeper than a session may be.
    TooDeep {
        /// The limit, metres.
        limit_m: f64,
    },
    /// No cell can be used.
    NoPo2,
    /// Nothing was ever heard of an instrument.
    Missing {
        /// Which.
        instrument: usize,
    },
    /// An instrument's last reading is too old, or its port is lost.
    Stale {
        /// Which.
        instrument: usize,
    },
    /// A cell repeats one value while the others move.
    Frozen {
        /// Which.
        instrument: usize,
    },
    /// A cell is off the others.
    Disagrees {
        /// Which.
        instrument: usize,
    },
    /// PO2 rises though the injection is off and nothing was added.
    RisesUnfed,
}

/// An alarm.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Alarm {
    /// What is wrong.
    pub kind: AlarmKind,
    /// Since when, in seconds of the clock.
    pub since_s: f64,
    /// The worst value since: bar of PO2, metres, bar off the others, bar a minute; seconds since the last reading or
    /// since the value last moved.
    pub worst: f64,
}

/// An alarm that was raised or cleared.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AlarmChange {
    /// The alarm.
    pub alarm: Alarm,
    /// When it was raised or cleared, in seconds of the clock.
    pub at_s: f64,
    /// Whether it was raised; else it was cleared.
    pub raised: bool,
}

/// When alarms are raised and cleared.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct AlarmLimits {
    /// Floor and ceiling of PO2, bar.
    pub po2_bar: (f64, f64),
    /// How far within them PO2 must be for their alarms to be cleared, bar. Default 0.02, more than a cell's last digit
    /// (common practice, no source).
    pub po2_margin_bar: f64,
    /// Deepest, metres.
    pub deepest_m: f64,
    /// How far above that it must be for the alarm to be cleared, metres. Default 0.2 (common practice, no source).
    pub depth_margin_m: f64,
    /// How far a cell may be off the others, bar: what leaves it out of an uptake.
    pub apart_bar: f64,
    /// The part of that below which the alarm is cleared. Default 0.8 (common practice, no source).
    pub apart_cleared: f64,
    /// For how long it must be off, seconds: cells differ in their lag. Default 10 (common practice, no source).
    pub apart_for_s: f64,
    /// For how long a condition must be over for its alarm to be cleared, seconds. Default 5 (common practice, no source).
    pub cleared_after_s: f64,
    /// Shortest repetition of one value that can be a frozen cell, seconds. Default 60, as in an uptake (common practice,
    /// no source).
    pub frozen_s: f64,
    /// How far the other cells must have moved meanwhile, bar. Default 0.015, as in an uptake (common practice, no source).
    pub frozen_moves_bar: f64,
    /// Rise of PO2 with the injection off that is too much, bar a minute. Default 0.005, a sixth of how fast it ought to
    /// sink (common practice, no source).
    pub rises_bar_min: f64,
}

impl AlarmLimits {
    /// The limits of a place.
    #[must_use]
    pub fn of(place: Place) -> Self {
        Self {
            po2_bar: po2_limits_bar(place),
            po2_margin_bar: 0.02,
            deepest_m: POOL_DEEPEST_M,
            depth_margin_m: 0.2,
            apart_bar: Assumptions::DEFAULT.cell_limit.as_bar(),
            apart_cleared: 0.8,
            apart_for_s: 10.0,
            cleared_after_s: 5.0,
            frozen_s: 60.0,
            frozen_moves_bar: 0.015,
            rises_bar_min: 0.005,
        }
    }
}

/// What a condition is just now.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Condition {
    /// It holds, with the value that makes it so.
    Holds(f64),
    /// It is well over.
    Over,
    /// Neither, or it cannot be told.
    Between,
}

/// One alarm at work.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Watched {
    kind: AlarmKind,
    /// For how long the condition must hold, seconds.
    after_s: f64,
    /// Whether a greater value is a worse one.
    greater_is_worse: bool,
    holds_since_s: Option<f64>,
    over_since_s: Option<f64>,
    raised: Option<Alarm>,
}

impl Watched {
    pub(super) const fn new(kind: AlarmKind, after_s: f64) -> Self {
        let greater_is_worse = !matches!(kind, AlarmKind::Po2Low { .. });
        Self { kind, after_s, greater_is_worse, holds_since_s: None, over_since_s: None, raised: None }
    }

    pub(super) const fn kind(&self) -> AlarmKind {
        self.kind
    }

    pub(super) const fn raised(&self) -> Option<Alarm> {
        self.raised
    }

    /// The condition at a second of the clock; goes out: the change, if there is one.
    pub(super) fn see(
        &mut self,
        now_s: f64,
        condition: Condition,
        cleared_after_s: f64,
    ) -> Option<AlarmChange> {
        match condition {
            Condition::Holds(value) => {
                self.over_since_s = None;
                let since_s = *self.holds_since_s.get_or_insert(now_s);
                if let Some(alarm) = &mut self.raised {
                    let worse = if self.greater_is_worse { value > alarm.worst } else { value < alarm.worst };
                    if worse {
                        alarm.worst = value;
                    }
                    return None;
                }
                if now_s - since_s < self.after_s {
                    return None;
                }
                let alarm = Alarm { kind: self.kind, since_s, worst: value };
                self.raised = Some(alarm);
                Some(AlarmChange { alarm, at_s: now_s, raised: true })
            }
            Condition::Over => {
                let since_s = *self.over_since_s.get_or_insert(now_s);
                if self.raised.is_none() {
                    self.holds_since_s = None;
                    return None;
                }
                if now_s - since_s < cleared_after_s {
                    return None;
                }
                self.holds_since_s = None;
                let alarm = self.raised.take()?;
                Some(AlarmChange { alarm, at_s: now_s, raised: false })
            }
            Condition::Between => {
                self.over_since_s = None;
                if self.raised.is_none() {
                    self.holds_since_s = None;
                }
                None
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn an_alarm_is_raised_at_once_and_cleared_when_it_is_well_over_for_a_while() {
        let mut low = Watched::new(AlarmKind::Po2Low { limit_bar: 0.4 }, 0.0);
        assert_eq!(low.see(0.0, Condition::Over, 5.0), None);
        let raised = low.see(1.0, Condition::Holds(0.39), 5.0).unwrap();
        assert!(raised.raised && raised.alarm.since_s.to_bits() == 1.0_f64.to_bits());
        assert_eq!(low.see(2.0, Condition::Holds(0.37), 5.0), None);
        assert_eq!(low.see(3.0, Condition::Over, 5.0), None);
        // Back at the limit: the five seconds begin anew.
        assert_eq!(low.see(5.0, Condition::Between, 5.0), None);
        assert_eq!(low.see(6.0, Condition::Over, 5.0), None);
        assert_eq!(low.see(10.9, Condition::Over, 5.0), None);
        let cleared = low.see(11.0, Condition::Over, 5.0).unwrap();
        assert!(!cleared.raised && cleared.alarm.worst.to_bits() == 0.37_f64.to_bits());
        assert_eq!(low.raised(), None);
    }

    #[test]
    fn one_that_must_last_is_raised_when_it_has_and_says_since_when_it_holds() {
        let mut off = Watched::new(AlarmKind::Disagrees { instrument: 1 }, 10.0);
        assert_eq!(off.see(0.0, Condition::Holds(0.06), 5.0), None);
        assert_eq!(off.see(9.0, Condition::Between, 5.0), None);
        assert_eq!(off.see(10.0, Condition::Holds(0.06), 5.0), None);
        let raised = off.see(20.0, Condition::Holds(0.07), 5.0).unwrap();
        assert!((raised.alarm.since_s - 10.0).abs() < 1e-12);
    }
}
