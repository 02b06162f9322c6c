//! The whole chain by Monte Carlo (JCGM 101:2008), as a check on the budget.
//!
//! Each trial draws every reading's random error and every common error, corrects all points, fits the line and
//! reads off the flow at the nominal pressure. Which points are choked is not drawn again: the trial asks what the
//! flow is, given the points the line uses. Random errors are normal, or, where the random part was widened by the
//! scatter of n points, Student's t of n − 2 degrees of freedom drawn once a trial for all points together.

use super::Analysis;
use super::correct::{Correction, Raw, Shift};
use super::line::COVERAGE_PROBABILITY;
use super::sources::{CommonSource, Shape};
use crate::entry::Run;
use crate::stats::line::fit_from;
use crate::stats::monte_carlo::{Plan, Random, propagate};

/// Fewest trials from which an interval is stated.
pub const FEWEST_TRIALS: usize = 1_000;
/// Most trials: their results are kept in memory, 8 bytes each.
pub const MOST_TRIALS: usize = 10_000_000;

/// Standard error of the end of a 95 % interval of equal tails, in standard deviations of a normal distribution, times the
/// root of the number of trials: `sqrt(0.025 · 0.975) / φ(1.96)`.
const END_STANDARD_ERROR: f64 = 2.671;
/// So many standard errors of an end are put down to the number of trials.
const STANDARD_ERRORS: f64 = 3.0;

/// The flow at the nominal pressure by Monte Carlo.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MonteCarlo {
    /// Trials asked for.
    pub trials: usize,
    /// Trials whose fit did not converge, left out of the rest.
    pub failed: usize,
    /// Seed of the generator (ChaCha8).
    pub seed: u64,
    /// Mean, L/min.
    pub mean: f64,
    /// Standard deviation, L/min.
    pub standard_uncertainty: f64,
    /// 95 % interval of equal tails, L/min.
    pub interval_95: (f64, f64),
    /// The interval of the budget, L/min.
    pub budget_interval_95: (f64, f64),
    /// Whether both ends of the two agree within half a unit of the second significant digit of the standard
    /// uncertainty (JCGM 101:2008, clause 8) and what so many trials leave open of an end.
    pub agrees: bool,
}

/// Runs `trials` trials on `threads` threads; the result does not depend on their number.
///
/// None when too few trials converge for an interval.
#[must_use]
pub fn monte_carlo(
    run: &Run,
    analysis: &Analysis,
    trials: usize,
    seed: u64,
    threads: usize,
) -> Option<MonteCarlo> {
    let chain = Chain::new(run, analysis);
    let plan = Plan { trials, seed, threads };
    let draws = propagate(
        &plan,
        || Scratch::new(chain.raw.len()),
        |random, scratch| chain.trial(random, scratch).map(|flow| [flow]),
    );
    let summary = draws.summary(0, COVERAGE_PROBABILITY)?;
    let flow = &analysis.nominal.flow;
    let budget = (flow.flow_l_min - flow.expanded(), flow.flow_l_min + flow.expanded());
    let tolerance = numerical_tolerance(flow.standard_uncertainty)
        + STANDARD_ERRORS * END_STANDARD_ERROR * flow.standard_uncertainty
            / (draws.values.len() as f64).sqrt();
    let agrees = (summary.symmetric.0 - budget.0).abs() <= tolerance
        && (summary.symmetric.1 - budget.1).abs() <= tolerance;
    Some(MonteCarlo {
        trials,
        failed: draws.failed,
        seed,
        mean: summary.mean,
        standard_uncertainty: summary.sd,
        interval_95: summary.symmetric,
        budget_interval_95: budget,
        agrees,
    })
}

/// Half a unit of the second significant digit of `u` (JCGM 101:2008, 7.9.2).
fn numerical_tolerance(u: f64) -> f64 {
    let exponent = libm::floor(libm::log10(u)) - 1.0;
    0.5 * libm::pow(10.0, exponent)
}

/// What every trial needs, worked out once.
struct Chain {
    raw: Vec<Raw>,
    correction: Correction,
    sources: Vec<CommonSource>,
    /// Random standard uncertainties as shown: pascals, and L/min of the meter's scale.
    shown_u: Vec<(f64, f64)>,
    /// Variances the fit weighs by: bar² and (L/min)².
    ux2: Vec<f64>,
    uy2: Vec<f64>,
    start: (f64, f64),
    p1_bar: f64,
    /// Factor on the random errors, and degrees of freedom of that factor.
    widen: f64,
    random_dof: f64,
}

struct Scratch {
    x: Vec<f64>,
    y: Vec<f64>,
}

impl Scratch {
    fn new(n: usize) -> Self {
        Self { x: vec![0.0; n], y: vec![0.0; n] }
    }
}

impl Chain {
    fn new(run: &Run, analysis: &Analysis) -> Self {
        let correction = Correction::of(run);
        let used: Vec<_> = analysis.points.iter().filter(|p| p.used()).collect();
        let shown_u = used
            .iter()
            .map(|p| (p.pressure_u * 1e5, p.flow_u / correction.apply(&p.raw, &Shift::NONE).per_shown))
            .collect();
        Self {
            raw: used.iter().map(|p| p.raw).collect(),
            correction,
            sources: analysis.sources.clone(),
            shown_u,
            ux2: used.iter().map(|p| p.pressure_u * p.pressure_u).collect(),
            uy2: used.iter().map(|p| p.flow_u * p.flow_u).collect(),
            start: (analysis.line.random.intercept, analysis.line.random.slope),
            p1_bar: analysis.nominal.flow.p1_bar,
            widen: analysis.line.widened.sqrt(),
            random_dof: analysis.line.random_dof,
        }
    }

    fn trial(&self, random: &mut Random, scratch: &mut Scratch) -> Option<f64> {
        let mut shift = Shift::NONE;
        for source in &self.sources {
            let deviate = match source.shape {
                Shape::Normal => random.normal(),
                Shape::Rectangular => random.rectangular(-1.0, 1.0) * 3.0_f64.sqrt(),
            };
            shift.set(source.source, deviate * source.standard_uncertainty);
        }
        let widen = if self.random_dof.is_finite() {
            self.widen / (random.chi_squared(self.random_dof) / self.random_dof).sqrt()
        } else {
            self.widen
        };
        for (i, (raw, (pressure_u, flow_u))) in self.raw.iter().zip(&self.shown_u).enumerate() {
            let mut drawn = *raw;
            drawn.shown_pa += widen * pressure_u * random.normal();
            drawn.shown_l_min += widen * flow_u * random.normal();
            let corrected = self.correction.apply(&drawn, &shift);
            scratch.x[i] = corrected.p1_bar;
            scratch.y[i] = corrected.flow_l_min;
        }
        let line = fit_from(&scratch.x, &self.ux2, &scratch.y, &self.uy2, self.start)?;
        Some(line.intercept + line.slope * self.p1_bar)
    }
}
