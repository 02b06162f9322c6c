//! Resting oxygen uptake from couch and pool sessions.
//!
//! Comes in: sessions of one diver ([`crate::entry::Session`]), each with its injection's line where it goes by
//! intermediate pressure. Goes out: an [`Uptake`]: for couch and pool apart the uptake with its interval, its budget,
//! another day's prediction and what would have helped; for each session its segments; or, typed, why there is no
//! number. The steps, each of its own file: `bins` and `cells` (which readings to believe), `given` (what is stated
//! and how well), `plan` (which of them belong together), `model` (what a segment says; the equations stand there),
//! `slope`, `fit`, `solve` (one session), `combine` (several, and another day), `help`, `monte_carlo`.
//!
//! Reasons to doubt it: the uptake's own wander is a stated number, not seen in the readings; the lungs' carbon dioxide and
//! the body's nitrogen are corrected by what is usual, not by what was; a loop that is said to be held is believed to be
//! held; all oxygen that reaches the loop is believed to have been written down.

pub mod slope;
pub mod cylinder;
mod injection;
mod why_not;
mod bins;
mod cells;
mod rest;
mod given;
mod jumps;
mod segment;
mod contents;
mod model;
mod plan;
mod fit;
mod sources;
mod weigh;
mod solve;
mod session;
mod combine;
mod help;
mod monte_carlo;

pub(crate) use cells::calibration_points_bar;
pub use cells::{CellLeftOut, CellTrouble};
pub use help::{Help, HelpWith};
pub use injection::{InjectionLine, LineShift};
pub use monte_carlo::MonteCarlo;
pub use rest::{PerKilogram, Plausible, RestDoubt, RestItem};
pub use segment::Kind;
pub use session::{LoopVolume, SegmentUptake, Series, SessionEstimate, SessionUptake};
pub use solve::{COVERAGE_PROBABILITY, Origin};
pub use sources::Source;
pub use why_not::{Jump, Proposal, StretchLeftOut, StretchWhy, UptakeError, Warning, WhyNot};

use combine::{Case, Combined, combine, lines, per_unit};
use help::would_help;
use session::{Worked, work};

use crate::entry::{Id, Place, Session};
use crate::stats::monte_carlo::Plan;

/// Revision of the method: rises when any printed figure could change.
pub const METHOD_REVISION: u32 = 1;

/// A session and the line its intermediate pressures go through.
#[derive(Debug, Clone, Copy)]
pub struct SessionInput<'a> {
    /// The session.
    pub session: &'a Session,
    /// Its line; not needed when events give flows.
    pub line: Option<&'a InjectionLine>,
}

/// A diver's resting uptake.
#[derive(Debug, Clone, PartialEq)]
pub struct Uptake {
    /// The diver.
    pub diver: Id,
    /// Couch and pool apart, those that occur.
    pub places: Vec<PlaceUptake>,
}

/// The uptake in one place.
#[derive(Debug, Clone, PartialEq)]
pub struct PlaceUptake {
    /// Where.
    pub place: Place,
    /// The uptake, or why there is none: that of the first session, when none has an answer.
    pub answer: Result<Estimate, WhyNot>,
    /// Every session, in the order handed in.
    pub sessions: Vec<SessionUptake>,
}

/// An uptake.
#[derive(Debug, Clone, PartialEq)]
pub struct Estimate {
    /// Mean uptake of the days measured, L/min STPD.
    pub uptake_l_min: f64,
    /// Standard uncertainty, L/min.
    pub u: f64,
    /// Effective degrees of freedom; infinite when no row limits them.
    pub dof: f64,
    /// 95 % interval, L/min.
    pub interval_95: (f64, f64),
    /// Contributions by source, largest first.
    pub budget: Vec<BudgetRow>,
    /// Another day's uptake: a prediction, and the only one a setting may use.
    pub next_day: NextDay,
    /// What would have narrowed the interval, best first.
    pub would_help: Vec<Help>,
    /// Uptake per kilogram, when the mass is known.
    pub per_kilogram: Option<PerKilogram>,
    /// What the uptake shares with a setting made through the same line.
    pub shared: Shared,
}

/// One row of the budget.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BudgetRow {
    /// The source.
    pub source: Source,
    /// Contribution to the uptake, L/min.
    pub u_l_min: f64,
}

/// Another day's uptake.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NextDay {
    /// Best estimate, L/min STPD.
    pub uptake_l_min: f64,
    /// Standard uncertainty of the prediction, L/min.
    pub u: f64,
    /// Effective degrees of freedom.
    pub dof: f64,
    /// 95 % interval, L/min; not below zero.
    pub interval_95: (f64, f64),
    /// Days measured.
    pub days: usize,
    /// Spread from day to day that was used, one standard deviation, L/min.
    pub day_spread_l_min: f64,
}

/// How the uptake moves with errors that a setting may share. All are derivatives of `uptake_l_min` (and of another
/// day's), and their contributions are already in `u`.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Shared {
    /// For each distinct line the sessions went by.
    pub lines: Vec<SharedLine>,
    /// Per bar of error of the diver's gauge of the intermediate pressure (true less shown).
    pub per_ip_bar: f64,
    /// Standard uncertainty of that gauge in the sessions, bar: the largest.
    pub ip_u_bar: f64,
    /// Per unit of the oxygen's purity.
    pub per_purity: f64,
    /// Per kelvin of gas temperature at the orifice.
    pub per_gas_k: f64,
}

/// How the uptake moves with one line.
#[derive(Debug, Clone, PartialEq)]
pub struct SharedLine {
    /// The line; it carries its own covariance.
    pub line: InjectionLine,
    /// Per L/min of its intercept.
    pub per_intercept: f64,
    /// Per L/min per bar of its slope.
    pub per_slope: f64,
}

impl Uptake {
    /// The place with the lowest uptake, which a setting takes: more than the other would use is too much there.
    #[must_use]
    pub fn lowest(&self) -> Option<(&PlaceUptake, &Estimate)> {
        self.places
            .iter()
            .filter_map(|place| place.answer.as_ref().ok().map(|estimate| (place, estimate)))
            .min_by(|a, b| a.1.next_day.uptake_l_min.total_cmp(&b.1.next_day.uptake_l_min))
    }
}

/// Works out a diver's uptake from one or more sessions.
///
/// # Errors
/// What is wrong with the input itself, by [`UptakeError`]; a session that merely has no answer is none.
pub fn uptake(inputs: &[SessionInput<'_>]) -> Result<Uptake, UptakeError> {
    let worked = work_all(inputs)?;
    let diver = worked.first().ok_or(UptakeError::NoSession)?.session.diver.clone();
    let mut places = Vec::new();
    for place in [Place::Couch, Place::Pool] {
        let here: Vec<&Worked<'_>> = worked.iter().filter(|w| w.session.place == place).collect();
        let Some(first) = here.first() else { continue };
        let solved: Vec<&Worked<'_>> = here.iter().filter(|w| w.solved.is_some()).copied().collect();
        let cases: Vec<Case<'_>> = solved.iter().filter_map(|w| Case::of(w)).collect();
        let answer = match (combine(&cases), &first.uptake.answer) {
            (Some(combined), _) => Ok(estimate(&combined, &cases, &solved)),
            (None, Err(why)) => Err(why.clone()),
            (None, Ok(_)) => Err(WhyNot::Unbounded),
        };
        let sessions = here.iter().map(|w| w.uptake.clone()).collect();
        places.push(PlaceUptake { place, answer, sessions });
    }
    Ok(Uptake { diver, places })
}

/// The uptake in one place by Monte Carlo; none when no session there has an answer, or too few trials do.
///
/// # Errors
/// As [`uptake`].
pub fn uptake_by_monte_carlo(
    inputs: &[SessionInput<'_>],
    place: Place,
    plan: &Plan,
) -> Result<Option<MonteCarlo>, UptakeError> {
    let worked = work_all(inputs)?;
    let here: Vec<&Worked<'_>> =
        worked.iter().filter(|w| w.session.place == place && w.solved.is_some()).collect();
    Ok(monte_carlo::monte_carlo(&here, plan))
}

fn work_all<'a>(inputs: &[SessionInput<'a>]) -> Result<Vec<Worked<'a>>, UptakeError> {
    let first = inputs.first().ok_or(UptakeError::NoSession)?;
    if let Some(other) = inputs.iter().find(|i| !i.session.diver.same_as(&first.session.diver)) {
        let name = |input: &SessionInput<'_>| input.session.diver.as_str().to_owned();
        return Err(UptakeError::SeveralDivers(name(first), name(other)));
    }
    inputs.iter().enumerate().map(|(index, input)| work(index, input)).collect()
}

fn estimate(combined: &Combined, cases: &[Case<'_>], sessions: &[&Worked<'_>]) -> Estimate {
    let weights = &combined.weights;
    let mass = sessions.iter().rev().find_map(|w| w.session.mass);
    let models = || sessions.iter().filter_map(|w| w.solved.as_ref().map(|(model, _)| model));
    Estimate {
        uptake_l_min: combined.uptake,
        u: combined.u,
        dof: combined.dof,
        interval_95: combined.interval,
        budget: combined
            .rows
            .iter()
            .map(|(source, u_l_min)| BudgetRow { source: *source, u_l_min: *u_l_min })
            .collect(),
        next_day: NextDay {
            uptake_l_min: combined.uptake,
            u: combined.next_u,
            dof: combined.next_dof,
            interval_95: combined.next_interval,
            days: combined.days,
            day_spread_l_min: combined.day_spread,
        },
        would_help: would_help(sessions),
        per_kilogram: mass.and_then(|mass| rest::per_kilogram(combined.uptake, mass)),
        shared: Shared {
            lines: lines(cases, weights)
                .into_iter()
                .map(|(line, per_intercept, per_slope)| SharedLine {
                    line: line.clone(),
                    per_intercept,
                    per_slope,
                })
                .collect(),
            per_ip_bar: per_unit(cases, weights, Source::IpGauge),
            ip_u_bar: models().map(|m| m.given.ip_u_bar).fold(0.0, f64::max),
            per_purity: per_unit(cases, weights, Source::Purity),
            per_gas_k: per_unit(cases, weights, Source::GasTemperature),
        },
    }
}
