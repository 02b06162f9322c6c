//! Whether PO2 rises though nothing feeds the loop.
//!
//! With the injection off and nothing added PO2 can only sink: a rise is oxygen from somewhere, a valve that leaks or a
//! hand that does not know. Comes in: events, and a PO2 a row, brought to the surface (on the way down every PO2
//! rises). Goes out: the slope over the last two minutes, counted where it exceeds three of its standard uncertainties,
//! resemblance of neighbours included ([`crate::stats::autocorrelation`]).

use std::collections::VecDeque;

use super::alarm::Condition;
use crate::entry::{Assumptions, Injection, What};
use crate::stats::autocorrelation::series_slope;

/// Seconds over which a slope is taken, and the fewest that give one (common practice, no source).
const OVER_S: f64 = 120.0;
const LEAST_S: f64 = 45.0;
/// Standard uncertainties from which a slope counts (common practice, no source).
const SIGNIFICANT: f64 = 3.0;

/// PO2 without a feed.
#[derive(Debug, Clone, Default)]
pub(super) struct Rising {
    rows: VecDeque<(f64, f64)>,
    unfed: bool,
    /// Rows before this second are of a loop that mixes.
    from_s: f64,
}

impl Rising {
    /// Something happened.
    pub(super) fn event(&mut self, at_s: f64, what: &What) {
        match what {
            What::Injection(injection) => self.unfed = *injection == Injection::Off,
            What::OxygenAdd(_) | What::DiluentAdd(_) | What::Vent(_) | What::MakeUp { .. } => {}
            What::Exclude { .. } | What::Stop => return,
        }
        self.from_s = self.from_s.max(at_s + Assumptions::DEFAULT.dead_time.as_s());
        self.rows.clear();
    }

    /// A PO2, as it would be at the surface.
    pub(super) fn row(&mut self, at_s: f64, po2_bar: f64) {
        if !self.unfed || at_s < self.from_s {
            return;
        }
        self.rows.push_back((at_s, po2_bar));
        while self.rows.front().is_some_and(|(t, _)| *t < at_s - OVER_S) {
            self.rows.pop_front();
        }
    }

    /// Whether it rises by more than `most_bar_min`.
    pub(super) fn condition(&self, most_bar_min: f64) -> Condition {
        if !self.unfed {
            return Condition::Over;
        }
        let (Some((first_s, _)), Some((last_s, _))) = (self.rows.front(), self.rows.back()) else {
            return Condition::Between;
        };
        if last_s - first_s < LEAST_S {
            return Condition::Between;
        }
        let (x, y): (Vec<f64>, Vec<f64>) = self.rows.iter().map(|(t, po2)| (t - first_s, *po2)).unzip();
        match series_slope(&x, &y) {
            Ok(slope) if slope.slope * 60.0 > most_bar_min && slope.slope > SIGNIFICANT * slope.u => {
                Condition::Holds(slope.slope * 60.0)
            }
            Ok(slope) if slope.slope <= 0.0 => Condition::Over,
            _ => Condition::Between,
        }
    }
}
