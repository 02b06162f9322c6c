//! Several sessions of one diver, and another day.
//!
//! Comes in: solved sessions of one place. Goes out: one uptake with its budget, and the prediction for another day. What
//! is drawn anew in every session (noise, wander, barometer, drift of depth, the mark, the cylinder) is averaged; what is the
//! same in all (cells, line, loop volume where the statement is the same, leak, nitrogen, …) is added by its sign and
//! not averaged away. Sessions of one day weigh by what is their own; days weigh by that and the spread from day to day.
//!
//! Another day: `u² = u² of the mean + σ_day²·(1 + Σ weight²)`, which with k equal days is
//! `u_common² + u_within²/k + σ_day²·(1 + 1/k)`. `σ_day²` pools the stated spread, with its degrees of freedom, with the
//! variance between days less what the sessions themselves explain; two days can raise it but never lower it.

use super::segment::Shift;
use super::session::Worked;
use super::solve::{COVERAGE_PROBABILITY, Part, Solved};
use super::sources::Source;
use crate::entry::Session;
use crate::stats::coverage::{coverage_factor, welch_satterthwaite};

/// A session as the combination needs it.
pub(super) struct Case<'a> {
    pub(super) session: &'a Session,
    pub(super) solved: &'a Solved,
    pub(super) line: Option<&'a super::InjectionLine>,
    pub(super) prior_volume: Option<(f64, f64)>,
    /// Sessions of one number are of one day.
    pub(super) day: i64,
}

impl<'a> Case<'a> {
    pub(super) fn of(worked: &'a Worked<'_>) -> Option<Self> {
        let (model, solved) = worked.solved.as_ref()?;
        Some(Self {
            session: worked.session,
            solved,
            line: model.line.as_ref(),
            prior_volume: model.given.volume_l,
            day: day_of(worked.session),
        })
    }
}

/// The day a session was taken, where it was taken.
pub(super) fn day_of(session: &Session) -> i64 {
    use chrono::Datelike;
    i64::from(session.taken.date_naive().num_days_from_ce())
}

/// The uptake of several sessions.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Combined {
    pub(super) uptake: f64,
    pub(super) u: f64,
    pub(super) dof: f64,
    pub(super) interval: (f64, f64),
    pub(super) rows: Vec<(Source, f64)>,
    /// Weight of each session.
    pub(super) weights: Vec<f64>,
    pub(super) days: usize,
    pub(super) day_spread: f64,
    pub(super) next_u: f64,
    pub(super) next_dof: f64,
    pub(super) next_interval: (f64, f64),
}

impl Combined {
    pub(super) fn half_width(&self) -> f64 {
        0.5 * (self.interval.1 - self.interval.0)
    }

    pub(super) fn next_half_width(&self) -> f64 {
        0.5 * (self.next_interval.1 - self.next_interval.0)
    }
}

/// Combines sessions; none without any.
pub(super) fn combine(cases: &[Case<'_>]) -> Option<Combined> {
    let first = cases.first()?;
    let assumptions = &first.session.assumptions;
    let own = |case: &Case<'_>| {
        case.solved.parts.iter().filter(|p| is_own(p.source, cases)).map(|p| p.uptake * p.uptake).sum::<f64>()
    };
    // A session without anything of its own would weigh infinitely.
    let least = |case: &Case<'_>| own(case).max(1e-12 * case.solved.uptake * case.solved.uptake);
    let mut days: Vec<i64> = cases.iter().map(|c| c.day).collect();
    days.sort_unstable();
    days.dedup();
    let of_day = |day: i64| cases.iter().filter(move |c| c.day == day);
    let day_variance: Vec<f64> =
        days.iter().map(|d| 1.0 / of_day(*d).map(|c| 1.0 / least(c)).sum::<f64>()).collect();
    let day_mean: Vec<f64> = days
        .iter()
        .zip(&day_variance)
        .map(|(d, v)| v * of_day(*d).map(|c| c.solved.uptake / least(c)).sum::<f64>())
        .collect();
    let weights_of = |spread: f64| -> Vec<f64> {
        let weights: Vec<f64> = day_variance.iter().map(|v| 1.0 / (v + spread * spread)).collect();
        let sum: f64 = weights.iter().sum();
        weights.iter().map(|w| w / sum).collect()
    };
    let mean_of = |weights: &[f64]| weights.iter().zip(&day_mean).map(|(w, m)| w * m).sum::<f64>();
    let stated = assumptions.day_spread * mean_of(&weights_of(0.0));
    // A stated spread of none is none, whatever the days say.
    let (spread, spread_dof) = if stated > 0.0 {
        pooled_spread(stated, assumptions.day_spread_weight, &day_mean, &day_variance)
    } else {
        (0.0, assumptions.day_spread_weight)
    };
    let of_days = weights_of(spread);
    let uptake = mean_of(&of_days);
    let weights: Vec<f64> = cases
        .iter()
        .map(|case| {
            let day = days.iter().position(|d| *d == case.day).unwrap_or(0);
            of_days[day] * day_variance[day] / least(case)
        })
        .collect();
    let parts = parts(cases, &weights);
    let u = parts.iter().map(|p| p.uptake * p.uptake).sum::<f64>().sqrt();
    let dof = welch_satterthwaite(parts.iter().map(|p| (p.uptake, p.dof)));
    let interval = if let [only] = cases {
        only.solved.interval
    } else {
        let k = coverage_factor(COVERAGE_PROBABILITY, dof);
        ((uptake - k * u).max(0.0), uptake + k * u)
    };
    let squares: f64 = of_days.iter().map(|w| w * w).sum();
    let day_u = spread * (1.0 + squares).sqrt();
    let next_u = (u * u + day_u * day_u).sqrt();
    let next_dof = welch_satterthwaite(parts.iter().map(|p| (p.uptake, p.dof)).chain([(day_u, spread_dof)]));
    let k = coverage_factor(COVERAGE_PROBABILITY, next_dof);
    Some(Combined {
        uptake,
        u,
        dof,
        interval,
        rows: rows(&parts),
        weights,
        days: days.len(),
        day_spread: spread,
        next_u,
        next_dof,
        next_interval: ((uptake - k * next_u).max(0.0), uptake + k * next_u),
    })
}

/// Spread from day to day, L/min, and its degrees of freedom.
fn pooled_spread(stated: f64, weight: f64, means: &[f64], variances: &[f64]) -> (f64, f64) {
    let days = means.len();
    if days < 2 {
        return (stated, weight);
    }
    let n = days as f64;
    let mean = means.iter().sum::<f64>() / n;
    let between = means.iter().map(|m| (m - mean) * (m - mean)).sum::<f64>() / (n - 1.0);
    let explained = variances.iter().sum::<f64>() / n;
    let seen = (between - explained).max(0.0);
    let pooled = ((weight * stated * stated + (n - 1.0) * seen) / (weight + n - 1.0)).sqrt();
    if days == 2 { (pooled.max(stated), weight) } else { (pooled, weight + n - 1.0) }
}

/// Whether a row is drawn anew in every session.
fn is_own(source: Source, cases: &[Case<'_>]) -> bool {
    if source == Source::LoopVolume {
        // The same statement is the same measurement; different ones are different.
        let first = cases.first().and_then(|c| c.prior_volume);
        return cases.iter().any(|c| c.prior_volume != first);
    }
    source.is_of_the_session()
}

/// Every independent contribution to the weighted mean.
fn parts(cases: &[Case<'_>], weights: &[f64]) -> Vec<Part> {
    let mut parts: Vec<Part> = Vec::new();
    for (case, weight) in cases.iter().zip(weights) {
        for part in case.solved.parts.iter().filter(|p| p.source != Source::InjectionLine) {
            let mine = Part { uptake: weight * part.uptake, ..*part };
            let shared = !is_own(part.source, cases);
            match parts.iter_mut().find(|p| shared && p.source == part.source) {
                Some(there) => there.uptake += mine.uptake,
                None => parts.push(mine),
            }
        }
    }
    for (line, per_intercept, per_slope) in lines(cases, weights) {
        let part =
            |uptake, dof| Part { source: Source::InjectionLine, uptake, ratio: (0.0, 0.0), dof, u: 1.0 };
        parts.push(part(line.random_u(per_intercept, per_slope), line.random_dof));
        parts.extend(
            line.common
                .iter()
                .map(|c| part(per_intercept * c.intercept + per_slope * c.slope, f64::INFINITY)),
        );
    }
    parts
}

/// Each distinct line, with the change of the mean for one unit of its intercept and slope.
pub(super) fn lines<'a>(cases: &[Case<'a>], weights: &[f64]) -> Vec<(&'a super::InjectionLine, f64, f64)> {
    let mut lines: Vec<(&super::InjectionLine, f64, f64)> = Vec::new();
    for (case, weight) in cases.iter().zip(weights) {
        let Some(line) = case.line else { continue };
        let (a, b) = case.solved.per_line;
        match lines.iter_mut().find(|(there, _, _)| *there == line) {
            Some(there) => {
                there.1 += weight * a;
                there.2 += weight * b;
            }
            None => lines.push((line, weight * a, weight * b)),
        }
    }
    lines
}

/// Contributions gathered by source, largest first.
fn rows(parts: &[Part]) -> Vec<(Source, f64)> {
    let mut rows: Vec<(Source, f64)> = Vec::new();
    for part in parts {
        match rows.iter_mut().find(|(source, _)| *source == part.source) {
            Some(row) => row.1 += part.uptake * part.uptake,
            None => rows.push((part.source, part.uptake * part.uptake)),
        }
    }
    for row in &mut rows {
        row.1 = row.1.sqrt();
    }
    rows.retain(|row| row.1 > 0.0);
    rows.sort_by(|a, b| b.1.total_cmp(&a.1).then(a.0.cmp(&b.0)));
    rows
}

/// Change of the mean for one unit of a source that moves the model as a whole.
pub(super) fn per_unit(cases: &[Case<'_>], weights: &[f64], source: Source) -> f64 {
    cases
        .iter()
        .zip(weights)
        .filter_map(|(case, weight)| case.solved.part(source).map(|p| weight * p.uptake / p.u))
        .sum()
}

/// The litres of dry gas at standard conditions at which a solved session's volume was stated or found.
pub(super) fn litres_per_volume(model: &super::model::Model) -> f64 {
    model.kappa(&Shift::default())
}
