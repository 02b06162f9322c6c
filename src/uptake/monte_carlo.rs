//! The uptake by Monte Carlo (JCGM 101:2008), as a check on the budget.
//!
//! Each trial draws every source of error once for all sessions or anew for each, as the combination takes them, moves
//! the model by them, draws noise and wander of every segment, and fits the line again with the weights held. Rectangular
//! sources are drawn rectangular; noise and wander as Student's t of their degrees of freedom. Not drawn again: which
//! cells, segments and kinds are used.

use super::combine::{Case, combine};
use super::fit::Fit;
use super::model::{Model, Observation};
use super::segment::Shift;
use super::session::Worked;
use super::solve::{COVERAGE_PROBABILITY, Solved};
use super::sources::{Moves, Shape, Source, moves};
use crate::stats::monte_carlo::{Plan, Random, propagate};

/// The uptake by Monte Carlo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MonteCarlo {
    /// Trials asked for.
    pub trials: usize,
    /// Trials that gave no positive loop volume, left out of the rest.
    pub failed: usize,
    /// Seed of the generator (ChaCha8).
    pub seed: u64,
    /// Mean, L/min.
    pub mean: f64,
    /// Standard deviation, L/min.
    pub u: f64,
    /// 95 % interval of equal tails, L/min.
    pub interval_95: (f64, f64),
    /// The interval of the budget, L/min.
    pub budget_interval_95: (f64, f64),
}

/// One session, ready to be drawn.
struct Drawn<'a> {
    model: &'a Model,
    solved: &'a Solved,
    moves: Vec<Moves>,
    weight: f64,
    /// Which of the distinct lines it goes by.
    line: Option<usize>,
    volume_is_own: bool,
}

/// Runs the trials of `plan`; none when too few of them give an interval.
pub(super) fn monte_carlo(sessions: &[&Worked<'_>], plan: &Plan) -> Option<MonteCarlo> {
    let cases: Vec<Case<'_>> = sessions.iter().filter_map(|w| Case::of(w)).collect();
    let combined = combine(&cases)?;
    let mut lines: Vec<&super::InjectionLine> = Vec::new();
    let first_volume = cases.first().and_then(|c| c.prior_volume);
    let volume_is_own = cases.iter().any(|c| c.prior_volume != first_volume);
    let mut drawn = Vec::new();
    for (worked, weight) in sessions.iter().filter(|w| w.solved.is_some()).zip(&combined.weights) {
        let (model, solved) = worked.solved.as_ref()?;
        let line = model.line.as_ref().map(|line| {
            lines.iter().position(|there| *there == line).unwrap_or_else(|| {
                lines.push(line);
                lines.len() - 1
            })
        });
        drawn.push(Drawn { model, solved, moves: moves(model), weight: *weight, line, volume_is_own });
    }
    let draws = propagate(
        plan,
        || Scratch { observations: Vec::new(), lines: vec![(0.0, 0.0); lines.len()] },
        |random, scratch| trial(&drawn, &lines, random, scratch).map(|uptake| [uptake]),
    );
    let summary = draws.summary(0, COVERAGE_PROBABILITY)?;
    Some(MonteCarlo {
        trials: plan.trials,
        failed: draws.failed,
        seed: plan.seed,
        mean: summary.mean,
        u: summary.sd,
        interval_95: summary.symmetric,
        budget_interval_95: combined.interval,
    })
}

struct Scratch {
    observations: Vec<Observation>,
    lines: Vec<(f64, f64)>,
}

fn trial(
    drawn: &[Drawn<'_>],
    lines: &[&super::InjectionLine],
    random: &mut Random,
    scratch: &mut Scratch,
) -> Option<f64> {
    let mut shared = [f64::NAN; SOURCES];
    for (line, shift) in lines.iter().zip(&mut scratch.lines) {
        let first = line.intercept_variance.max(0.0).sqrt();
        let across = if first > 0.0 { line.covariance / first } else { 0.0 };
        let rest = (line.slope_variance - across * across).max(0.0).sqrt();
        let widen = widen(random, line.random_dof);
        let (a, b) = (widen * random.normal(), widen * random.normal());
        *shift = (a * first, a * across + b * rest);
        for common in &line.common {
            let z = random.normal();
            shift.0 += z * common.intercept;
            shift.1 += z * common.slope;
        }
    }
    let shared_volume = random.normal();
    let mut uptake = 0.0;
    for session in drawn {
        let (model, solved) = (session.model, session.solved);
        let mut shift = Shift::default();
        for moves in &session.moves {
            let known = &mut shared[moves.source as usize];
            let deviate = if known.is_nan() || moves.source.is_of_the_session() {
                match moves.shape {
                    Shape::Normal => random.normal(),
                    Shape::Rectangular => random.rectangular(-1.0, 1.0) * 3.0_f64.sqrt(),
                }
            } else {
                *known
            };
            *known = deviate;
            *(moves.shift)(&mut shift) = deviate * moves.u;
        }
        if let Some(line) = session.line {
            (shift.intercept, shift.slope) = scratch.lines[line];
        }
        model.observe(&shift, solved.fit.inverse_n, &solved.kinds, &mut scratch.observations);
        let wander_widen = widen(random, solved.wander_dof);
        for i in 0..scratch.observations.len() {
            let noise = &solved.noise[i];
            let wander = wander_widen * solved.wander[i] * solved.fit.inverse_n;
            scratch.observations[i].y += noise.y_u * widen(random, noise.dof) * random.normal()
                + wander * random.normal()
                + noise.mark_u * random.normal();
        }
        let volume = if session.volume_is_own { random.normal() } else { shared_volume };
        let prior = solved.prior.map(|prior| {
            let mut moved = model.moved_prior(prior, &shift);
            // The volume is what was measured: β is one over it.
            let relative = 1.0 / (prior.weight.sqrt() * prior.inverse_n);
            moved.inverse_n /= 1.0 + relative * volume;
            moved
        });
        let fit = Fit::of(&scratch.observations, &solved.weights, prior).filter(|f| f.inverse_n > 0.0)?;
        uptake += session.weight * fit.uptake();
    }
    uptake.is_finite().then_some(uptake)
}

/// How many sources there are.
const SOURCES: usize = Source::Mark as usize + 1;

/// Factor that makes a normal deviate one of Student's t.
fn widen(random: &mut Random, dof: f64) -> f64 {
    if dof.is_infinite() { 1.0 } else { 1.0 / (random.chi_squared(dof) / dof).sqrt() }
}
