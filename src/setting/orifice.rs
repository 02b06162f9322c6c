//! An orifice as a setting needs it.
//!
//! Comes in: a run, analysed, and what its acceptance came to. Goes out: an [`OrificeInput`]. The line is turned into
//! oxygen's where the bench ran another gas.

use chrono::NaiveDate;

use crate::bench::Analysis;
use crate::bench::choke::ChokeRatio;
use crate::bench::convert::gas_ratio;
use crate::bench::line::OrificeLine;
use crate::entry::Id;
use crate::gas::{self, Species};
use crate::quantity::{AbsolutePressure, StpdFlow, Temperature};
use crate::uptake::InjectionLine;

/// What became of the orifice's acceptance.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Standing {
    /// Accepted, or passed by the acceptance in its file.
    Accepted,
    /// Nobody has judged it: used, with a warning.
    NeverJudged,
    /// Failed: only with a recorded override.
    Failed,
    /// Undecided: only with a recorded override.
    Undecided,
}

/// An orifice with its line.
#[derive(Debug, Clone, PartialEq)]
pub struct OrificeInput {
    /// Its name.
    pub id: Id,
    /// Its line for oxygen; the same that the sessions were injected through, if they were.
    pub line: InjectionLine,
    /// What is known of its choke ratio.
    pub choke: ChokeRatio,
    /// Lowest and highest pressure of the points of the line, bar absolute.
    pub span_bar_abs: (f64, f64),
    /// Effective diameter, µm, for oxygen.
    pub effective_diameter_um: f64,
    /// Its acceptance.
    pub standing: Standing,
    /// The day its calibration fell due, when that has passed on the day of the setting.
    pub overdue_since: Option<NaiveDate>,
}

impl OrificeInput {
    /// From a run made with `gas` and analysed.
    #[must_use]
    pub fn of(
        id: Id,
        gas: Species,
        analysis: &Analysis,
        standing: Standing,
        overdue_since: Option<NaiveDate>,
    ) -> Self {
        let span = analysis
            .points
            .iter()
            .filter(|p| p.used())
            .map(|p| p.pressure_bar_abs)
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), p| (low.min(p), high.max(p)));
        let line = oxygen_line(&analysis.line, gas, span);
        Self {
            id,
            effective_diameter_um: diameter_um(&line, span),
            line,
            choke: analysis.choke.clone(),
            span_bar_abs: span,
            standing,
            overdue_since,
        }
    }
}

/// The line for oxygen of an orifice that was run with `gas` between two absolute pressures in bar. A session's injection
/// goes through the same function, so that both are the same line.
#[must_use]
pub fn oxygen_line(line: &OrificeLine, gas: Species, span_bar_abs: (f64, f64)) -> InjectionLine {
    let middle = 0.5 * (span_bar_abs.0 + span_bar_abs.1);
    InjectionLine::of(line, gas_ratio(gas, Species::Oxygen, middle, line.random.at(middle)))
}

/// Diameter with a discharge coefficient of 1 that has the line's slope, in the middle of the span, µm.
fn diameter_um(line: &InjectionLine, span: (f64, f64)) -> f64 {
    let p1_bar = 0.5 * (span.0 + span.1);
    let flow = StpdFlow::from_l_min((line.slope * p1_bar).max(0.0));
    let t1 = Temperature::from_c(super::options::NOMINAL_C);
    gas::effective_diameter(Species::Oxygen, flow, AbsolutePressure::from_bar(p1_bar), t1).as_um()
}
