//! Slopes, noise, weights and kinds of a session's segments, settled together.
//!
//! Comes in: a model. Goes out: a [`Work`] whose line no longer changes: each segment's slope noise, which held segments
//! vent, the wander in force, the weights `1/(u_noise² + u_wander²)` and the fitted line. Wander: `u = σ_w·M·√(2.4·τ/T)`
//! for a slope, `√(2·τ/T)` for a topped loop. Left out: correlation between the wander of neighbouring segments.

use super::fit::{Fit, Prior};
use super::model::{Model, Observation};
use super::plan::NEARLY_PURE;
use super::segment::{Kind, Segment, Shift};
use super::slope::{Slope, slope};
use super::solve::Solved;
use super::why_not::{Warning, WhyNot};
use crate::entry::{Assumptions, LoopKept};
use crate::stats::coverage::welch_satterthwaite;
use crate::stats::distribution::chi_squared_upper;

/// Degrees of freedom the stated wander counts for against what the segments show (common practice, no source).
pub(super) const WANDER_WEIGHT: f64 = 8.0;
/// Segments from which the data may lower the wander.
const LOWERS_FROM: usize = 6;
/// A slope's weight of wander: the parabola 6·u·(1 − u) squared integrates to 6/5; an even weight to 1. Times 2·τ/T.
const SLOPE_WANDER: f64 = 2.4;
const MEAN_WANDER: f64 = 2.0;
/// The segments raise the wander when so large a scatter has less than this chance under the stated one. (Raised at every
/// scatter above the middle, two segments alone widened the interval by half on average.)
const SURPRISE: f64 = 0.05;
/// Net injections further apart than this are two injections, L/min (common practice, no source).
const APART_L_MIN: f64 = 0.01;
/// The autocorrelation of a level read at an end of a topped loop is not known: its scatter counts twice.
const LEVEL_WIDENED: f64 = 2.0;
/// A held loop vents when its drift says so beyond this many standard uncertainties.
pub(super) const VENTS: f64 = 2.0;
/// A rise counts as one beyond this many standard uncertainties.
const RISES: f64 = 3.0;
/// Rounds of weights, kinds and β; they settle in three or four.
const ROUNDS: usize = 20;

/// A segment's slope noise.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Noise {
    /// Standard uncertainty of the slope in the fitted variable, and of y.
    pub(super) slope_u: f64,
    pub(super) y_u: f64,
    pub(super) dof: f64,
    /// The slope itself, when it came from readings.
    pub(super) fitted: Option<Slope>,
    /// Standard uncertainty of y from the mark a topped loop is brought back to.
    pub(super) mark_u: f64,
}

/// A session being solved.
pub(super) struct Work<'a> {
    pub(super) model: &'a Model,
    pub(super) assumptions: &'a Assumptions,
    pub(super) prior: Option<Prior>,
    pub(super) kinds: Vec<Kind>,
    pub(super) observations: Vec<Observation>,
    pub(super) noise: Vec<Noise>,
    /// Slopes of the readings; none for a segment that has none.
    slopes: Vec<Option<Slope>>,
    pub(super) weights: Vec<f64>,
    /// Relative wander in force and its degrees of freedom.
    pub(super) wander: f64,
    pub(super) wander_dof: f64,
    pub(super) inverse_n: f64,
    pub(super) uptake: f64,
    pub(super) fit: Option<Fit>,
    pub(super) warnings: Vec<Warning>,
}

impl<'a> Work<'a> {
    /// `before`: the same readings solved, of which more is stated now or to which segments were thought up at the end.
    pub(super) fn start(
        model: &'a Model,
        assumptions: &'a Assumptions,
        before: Option<&Solved>,
    ) -> Result<Self, WhyNot> {
        let prior = model.given.volume_l.map(|(litres, u)| {
            let inverse_n = 1.0 / (litres * model.kappa(&Shift::default()));
            let u = u / litres * inverse_n;
            Prior { inverse_n, weight: 1.0 / (u * u) }
        });
        let mut work = Self {
            model,
            assumptions,
            prior,
            kinds: model.segments.iter().map(|s| Kind::from(s.kept)).collect(),
            observations: Vec::new(),
            noise: Vec::new(),
            slopes: Vec::new(),
            weights: Vec::new(),
            wander: assumptions.wander,
            // As stated it is taken as known; learned from the segments it is not.
            wander_dof: f64::INFINITY,
            // Seven litres, until the data or the statement say otherwise.
            inverse_n: prior.map_or(1.0 / 6.0, |p| p.inverse_n),
            uptake: f64::NAN,
            fit: None,
            warnings: Vec::new(),
        };
        work.observe();
        work.refuse_pure()?;
        // What was looked at before passed.
        let known = before.map_or(&[][..], |solved| &solved.noise);
        work.refuse_rising(known.len())?;
        if prior.is_none() && !work.several_injections() {
            return Err(WhyNot::NoVolumeOneInjection);
        }
        work.slopes = known.iter().map(|noise| noise.fitted).collect();
        work.slopes.extend(model.segments.iter().skip(known.len()).map(|segment| own_slope(model, segment)));
        work.measure_noise();
        if work.decide_kinds() {
            work.observe();
            work.measure_noise();
        }
        // What the segments say on their own is near enough to begin with.
        let inverse_n = work.inverse_n;
        work.uptake = work.observations.iter().map(|o| (o.net - o.y / inverse_n).max(0.0)).sum::<f64>()
            / work.observations.len() as f64;
        Ok(work)
    }

    fn observe(&mut self) {
        self.model.observe(&Shift::default(), self.inverse_n, &self.kinds, &mut self.observations);
    }

    pub(super) fn several_injections(&self) -> bool {
        let nets = || self.observations.iter().map(|o| o.net);
        nets().fold(f64::NEG_INFINITY, f64::max) - nets().fold(f64::INFINITY, f64::min) > APART_L_MIN
    }

    fn refuse_pure(&self) -> Result<(), WhyNot> {
        let sealed = self.observations.iter().zip(&self.kinds).filter(|(_, kind)| **kind == Kind::Sealed);
        let fraction = sealed.map(|(o, _)| o.fraction).fold(0.0, f64::max);
        if fraction > NEARLY_PURE { Err(WhyNot::NearlyPureOxygen { fraction }) } else { Ok(()) }
    }

    /// Refuses a loop in which oxygen rises while none is injected, from a segment on.
    fn refuse_rising(&self, from: usize) -> Result<(), WhyNot> {
        for (segment, observation) in self.model.segments.iter().zip(&self.observations).skip(from) {
            if segment.kept == LoopKept::Topped || observation.injected > 0.0 {
                continue;
            }
            let Some(line) = slope_of(self.model, segment, |f| f) else { continue };
            if line.slope > RISES * line.u && line.slope > 0.0 {
                return Err(WhyNot::RisingWithInjectionOff {
                    from_s: segment.from_s,
                    to_s: segment.to_s,
                    slope_per_min: line.slope,
                });
            }
        }
        Ok(())
    }

    /// Slope noise of every segment in the variable its kind is fitted in.
    fn measure_noise(&mut self) {
        let (model, n0) = (self.model, 1.0 / self.inverse_n);
        let segments = model.segments.iter().zip(&self.slopes).zip(&self.observations);
        self.noise = segments
            .map(|((segment, &fitted), observation)| {
                if let Some((slope_u, dof)) = segment.thought_up {
                    let y_u = slope_u * observation.per_slope;
                    return Noise { slope_u, y_u, dof, fitted: None, mark_u: 0.0 };
                }
                if let Some(top_up) = &segment.top_up {
                    let levels = [
                        model.level_u(&top_up.begin, segment.from_s),
                        model.level_u(&top_up.end, segment.to_s),
                        model.level_u(&top_up.after_last, top_up.last_add_s),
                    ];
                    let square: f64 = levels.iter().map(|(u, _)| u * u).sum();
                    let dof = welch_satterthwaite(levels).min(1e6);
                    let slope_u = LEVEL_WIDENED * square.sqrt() / segment.minutes();
                    let litres = model.given.mark_u_l * model.kappa(&Shift::default());
                    let mark_u = observation.fraction * litres / n0 / segment.minutes();
                    return Noise { slope_u, y_u: slope_u, dof, fitted: None, mark_u };
                }
                let (slope_u, dof) = fitted.map_or((f64::INFINITY, 1.0), |s| (s.u, s.dof));
                let y_u = slope_u * observation.per_slope;
                Noise { slope_u, y_u, dof, fitted, mark_u: 0.0 }
            })
            .collect();
    }

    /// Variance of each y from wander of one: σ_w = 1, M and β as they are.
    pub(super) fn wander_variance(&self, i: usize) -> f64 {
        let weight = if self.kinds[i] == Kind::Topped { MEAN_WANDER } else { SLOPE_WANDER };
        let share = weight * self.assumptions.wander_time.as_min() / self.model.segments[i].minutes();
        let scale = self.inverse_n * self.uptake;
        scale * scale * share.min(1.0)
    }

    fn set_weights(&mut self) {
        // Readings without any scatter at all still are not known better than a hundred thousandth.
        let least = 1e-5 * self.inverse_n;
        self.weights = (0..self.noise.len())
            .map(|i| {
                let noise = &self.noise[i];
                let own = noise.y_u * noise.y_u + noise.mark_u * noise.mark_u + least * least;
                1.0 / (own + self.wander * self.wander * self.wander_variance(i))
            })
            .collect();
    }

    /// Weights, kinds and β, until they no longer change.
    pub(super) fn settle(&mut self) -> Result<(), WhyNot> {
        for round in 0..ROUNDS {
            self.set_weights();
            let fit = Fit::of(&self.observations, &self.weights, self.prior)
                .filter(|f| f.inverse_n > 0.0 && f.uptake().is_finite())
                .ok_or(WhyNot::Unbounded)?;
            let uptake = fit.uptake();
            let settled = (uptake - self.uptake).abs() <= 1e-12 * uptake.abs()
                && (fit.inverse_n - self.inverse_n).abs() <= 1e-12 * fit.inverse_n;
            (self.uptake, self.inverse_n, self.fit) = (uptake, fit.inverse_n, Some(fit));
            if settled {
                break;
            }
            // Kinds that flip for ever lie on the balance itself, where both readings agree: let them be.
            if round < ROUNDS / 2 && self.decide_kinds() {
                self.observe();
                self.measure_noise();
            } else {
                self.observe();
            }
        }
        Ok(())
    }

    /// Whether the balance changes the kind of any held segment. The segment's own drift says on which side of the balance
    /// it was: above it the loop was full and vented. (Decided by the uptake of all segments together, a loop at 95 % of
    /// oxygen flipped on the noise of the others, and a venting equation multiplies by twenty there.)
    fn decide_kinds(&mut self) -> bool {
        let mut changed = false;
        for (i, segment) in self.model.segments.iter().enumerate() {
            if segment.kept != LoopKept::Held {
                continue;
            }
            let observation = &self.observations[i];
            let drift_u = self.noise.get(i).map_or(0.0, |noise| noise.slope_u * observation.per_drift);
            let vents = observation.drift - VENTS * drift_u > self.inverse_n * observation.drift_at_balance;
            let kind = if vents { Kind::Venting } else { Kind::Held };
            changed |= kind != self.kinds[i];
            self.kinds[i] = kind;
        }
        changed
    }

    /// What the scatter of the segments about the line says about the wander.
    pub(super) fn learn_wander(&mut self) -> Result<(), WhyNot> {
        // About the segments' own line; a loop volume that does not fit is said so and is no wander. With one injection
        // there is no line, and the segments scatter about one uptake.
        let several = self.several_injections();
        let free = if several { 2 } else { 1 };
        let Some(dof) = self.observations.len().checked_sub(free).filter(|d| *d > 0) else { return Ok(()) };
        let dof = dof as f64;
        let prior = if several { None } else { self.prior };
        let Some(fit) = Fit::of(&self.observations, &self.weights, prior).filter(|f| f.inverse_n > 0.0)
        else {
            return Ok(());
        };
        let square = |wander: f64| {
            let mut sum = 0.0;
            for (i, o) in self.observations.iter().enumerate() {
                let off = o.y - fit.inverse_n * (o.net - fit.uptake());
                let noise = &self.noise[i];
                let own = noise.y_u * noise.y_u + noise.mark_u * noise.mark_u;
                sum += off * off / (own + wander * wander * self.wander_variance(i));
            }
            sum
        };
        // The wander at which the scatter is what it should be, between none and the whole uptake.
        let (mut low, mut high) = (1e-4, 1.0);
        if square(low) <= dof {
            high = low;
        }
        for _ in 0..60 {
            let middle = 0.5 * (low + high);
            if square(middle) > dof {
                low = middle;
            } else {
                high = middle;
            }
        }
        let stated = self.assumptions.wander;
        let pooled = ((WANDER_WEIGHT * stated * stated + dof * high * high) / (WANDER_WEIGHT + dof)).sqrt();
        let floor = self.assumptions.least_wander.min(stated);
        let may_lower = self.observations.len() >= LOWERS_FROM;
        let surprising = chi_squared_upper(square(stated), dof) < SURPRISE;
        let wander = if pooled > stated && surprising {
            pooled
        } else if may_lower && pooled < stated {
            pooled.max(floor)
        } else {
            return Ok(());
        };
        if wander > 1.25 * stated {
            self.warnings.push(Warning::WanderRaised(wander));
        } else if wander < 0.8 * stated {
            self.warnings.push(Warning::WanderLowered(wander));
        }
        (self.wander, self.wander_dof) = (wander, WANDER_WEIGHT + dof);
        self.settle()
    }
}

/// Slope of the readings in the variable that is fitted, which a held loop shares with one that vents.
fn own_slope(model: &Model, segment: &Segment) -> Option<Slope> {
    match segment.kept {
        LoopKept::Topped => None,
        _ if segment.thought_up.is_some() => None,
        LoopKept::Sealed => slope_of(model, segment, |f| 1.0 / (1.0 - f)),
        LoopKept::Held => slope_of(model, segment, |f| f),
    }
}

/// Slope of a function of the oxygen fraction over a segment's bins.
fn slope_of(model: &Model, segment: &Segment, of: impl Fn(f64) -> f64) -> Option<Slope> {
    let none = Shift::default();
    let values: Vec<f64> = segment.bins.clone().map(|bin| of(model.fraction(bin, &none))).collect();
    slope(&model.lever[segment.bins.clone()], &values)
}
