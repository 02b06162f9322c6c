//! One session's uptake with its budget.
//!
//! Comes in: a [`Model`]. Goes out: a [`Solved`] session, or why there is no answer. Segments are
//! weighed and the line through them is fitted ([`super::weigh`]); then every source of error is moved by ± its standard
//! uncertainty with the weights held, half the difference being its row (JCGM 100:2008, clause 5). The interval is ± k·u
//! where the loop volume was measured; without it uptake is a ratio of two estimates and Fieller's theorem gives the
//! limits, all rows counted in numerator and denominator. Left out: correlation between sources.

use super::fit::{Fit, Prior};
use super::model::{Model, Observation};
use super::segment::{Kind, Shift};
use super::sources::{Source, leak_check, moves};
use super::weigh::{Noise, VENTS, Work};
use super::why_not::{StretchWhy, Warning, WhyNot};
use crate::entry::{Assumptions, LoopKept};
use crate::stats::coverage::{coverage_factor, welch_satterthwaite};
use crate::stats::inverse::{Fieller, fieller};

/// Probability of every interval this room states.
pub const COVERAGE_PROBABILITY: f64 = 0.95;
/// Volumes further apart than this many standard uncertainties disagree, drops and metered oxygen likewise.
const DISAGREES: f64 = 3.0;
/// Volumes further apart than this many are not two views of one thing: one of them is wrong, and nobody can say which.
/// So many, because the volume found from injections that lie near each other scatters more than its uncertainty says.
const CONTRADICTS: f64 = 10.0;
/// And only when the stated volume is this many times the one found.
const TOO_LARGE: f64 = 1.5;

/// What a row of the budget does.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Part {
    pub(super) source: Source,
    /// Change of M for one standard uncertainty, signed for sources that move the model as a whole, L/min.
    pub(super) uptake: f64,
    /// The same of the ratio's numerator and denominator.
    pub(super) ratio: (f64, f64),
    pub(super) dof: f64,
    /// The source's standard uncertainty in its own unit.
    pub(super) u: f64,
}

/// Where the loop volume comes from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Origin {
    /// It was stated, and one injection cannot correct it.
    Given,
    /// It came out of two injections.
    Found,
    /// Stated, and corrected by two injections.
    Both,
}

/// A session, solved.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Solved {
    pub(super) uptake: f64,
    pub(super) u: f64,
    pub(super) dof: f64,
    pub(super) interval: (f64, f64),
    pub(super) fit: Fit,
    pub(super) weights: Vec<f64>,
    pub(super) prior: Option<Prior>,
    pub(super) observations: Vec<Observation>,
    pub(super) kinds: Vec<Kind>,
    pub(super) noise: Vec<Noise>,
    /// Wander of the uptake over each segment, L/min.
    pub(super) wander: Vec<f64>,
    pub(super) relative_wander: f64,
    pub(super) wander_dof: f64,
    pub(super) parts: Vec<Part>,
    /// Change of M for one unit of the line's intercept and slope.
    pub(super) per_line: (f64, f64),
    pub(super) origin: Origin,
    pub(super) volume_l: f64,
    pub(super) volume_u: f64,
    pub(super) warnings: Vec<Warning>,
}

impl Solved {
    /// The row of a source, if it has one.
    pub(super) fn part(&self, source: Source) -> Option<&Part> {
        self.parts.iter().find(|p| p.source == source)
    }
}

/// Solves a session.
pub(super) fn solve(model: &Model, assumptions: &Assumptions) -> Result<Solved, WhyNot> {
    enough(model, assumptions)?;
    let mut work = Work::start(model, assumptions, None)?;
    work.settle()?;
    work.learn_wander()?;
    work.finish()
}

/// Solves a session that was changed in thought: what the readings said, their slopes and of the wander, stays.
pub(super) fn solve_again(
    model: &Model,
    assumptions: &Assumptions,
    before: &Solved,
) -> Result<Solved, WhyNot> {
    enough(model, assumptions)?;
    let mut work = Work::start(model, assumptions, Some(before))?;
    (work.wander, work.wander_dof) = (before.relative_wander, before.wander_dof);
    work.settle()?;
    work.finish()
}

/// Whether there is enough to look at.
fn enough(model: &Model, assumptions: &Assumptions) -> Result<(), WhyNot> {
    let usable_s: f64 = model.segments.iter().map(|s| s.to_s - s.from_s).sum();
    let needed_s = assumptions.least_usable.as_s();
    if usable_s >= needed_s && !model.segments.is_empty() {
        return Ok(());
    }
    // The reason a person can do something about comes before the bare shortness.
    let why = |of: fn(&StretchWhy) -> Option<WhyNot>| model.left_out.iter().find_map(|s| of(&s.why));
    let reasons: [fn(&StretchWhy) -> Option<WhyNot>; 5] = [
        |w| match w {
            StretchWhy::NearlyPureOxygen(fraction) => Some(WhyNot::NearlyPureOxygen { fraction: *fraction }),
            _ => None,
        },
        |w| match w {
            StretchWhy::UnmarkedJump(at_s) => Some(WhyNot::UnmarkedJump { at_s: *at_s }),
            _ => None,
        },
        |w| match w {
            StretchWhy::NotAccounted(at_s) => Some(WhyNot::NotAccounted { at_s: *at_s }),
            _ => None,
        },
        |w| (*w == StretchWhy::ContentsUnknown).then_some(WhyNot::ContentsUnknown),
        |w| (*w == StretchWhy::InjectionUnknown).then_some(WhyNot::InjectionUnknown),
    ];
    Err(reasons.into_iter().find_map(why).unwrap_or(WhyNot::TooShort { usable_s, needed_s }))
}

impl Work<'_> {
    fn finish(mut self) -> Result<Solved, WhyNot> {
        let fit = self.fit.ok_or(WhyNot::Unbounded)?;
        let uptake = fit.uptake();
        if uptake.is_nan() || uptake <= 0.0 {
            return Err(WhyNot::NotPositive { came_out: uptake });
        }
        let mut parts = self.observed_parts(&fit);
        parts.extend(self.moved_parts(&fit)?);
        let (per_line, line) = self.line_part(&fit)?;
        parts.extend(line);
        parts.retain(|p| p.uptake != 0.0 || p.ratio.1 != 0.0);
        parts.sort_by_key(|p| p.source);
        let u = parts.iter().map(|p| p.uptake * p.uptake).sum::<f64>().sqrt();
        let dof = welch_satterthwaite(parts.iter().map(|p| (p.uptake, p.dof)));
        let k = coverage_factor(COVERAGE_PROBABILITY, dof);
        let several = self.several_injections();
        let origin = match (self.prior.is_some(), several) {
            (true, false) => Origin::Given,
            (true, true) => Origin::Both,
            (false, _) => Origin::Found,
        };
        let variance = |f: fn(&Part) -> f64| parts.iter().map(f).sum::<f64>();
        let (vaa, vbb) = (variance(|p| p.ratio.0 * p.ratio.0), variance(|p| p.ratio.1 * p.ratio.1));
        let interval = if origin == Origin::Found {
            let vab = variance(|p| p.ratio.0 * p.ratio.1);
            match fieller(-fit.y, fit.inverse_n, vaa, vbb, vab, k) {
                Fieller::Interval { lower, upper } => (fit.net + lower, fit.net + upper),
                Fieller::Outside { .. } | Fieller::Unbounded => return Err(WhyNot::Unbounded),
            }
        } else {
            (uptake - k * u, uptake + k * u)
        };
        if interval.0.is_nan() || interval.0 <= 0.0 || !interval.1.is_finite() {
            return Err(WhyNot::NotPositive { came_out: uptake });
        }
        self.warn(&fit, several)?;
        let volume_l = 1.0 / (fit.inverse_n * self.model.kappa(&Shift::default()));
        let wander = (0..self.noise.len())
            .map(|i| self.wander * self.wander_variance(i).sqrt() / self.inverse_n)
            .collect();
        Ok(Solved {
            uptake,
            u,
            dof,
            interval,
            fit,
            weights: self.weights,
            prior: self.prior,
            observations: self.observations,
            kinds: self.kinds,
            noise: self.noise,
            wander,
            relative_wander: self.wander,
            wander_dof: self.wander_dof,
            parts,
            per_line,
            origin,
            volume_l,
            volume_u: volume_l * vbb.sqrt() / fit.inverse_n,
            warnings: self.warnings,
        })
    }

    /// Rows of noise, wander, mark and loop volume.
    fn observed_parts(&self, fit: &Fit) -> Vec<Part> {
        // The observations err independently: each row adds them by squares, in the uptake and, for the ratio, as the two
        // axes of their common ellipse.
        let row = |source, dof, own: &dyn Fn(usize) -> (f64, f64)| {
            let (mut vaa, mut vbb, mut vab, mut uptake) = (0.0, 0.0, 0.0, 0.0);
            let mut terms = Vec::with_capacity(self.weights.len());
            for i in 0..self.weights.len() {
                let (u, dof) = own(i);
                let (a, b) = fit.per_y(&self.observations[i], self.weights[i]);
                let m = fit.uptake_change((a, b));
                vaa += a * a * u * u;
                vbb += b * b * u * u;
                vab += a * b * u * u;
                uptake += m * m * u * u;
                terms.push((m * u, dof));
            }
            let dof = if dof > 0.0 { dof } else { welch_satterthwaite(terms) };
            // Two parts that together have these variances and covariance; the first carries the uptake's.
            let along = vaa.sqrt();
            let (first, second) = if along > 0.0 {
                ((along, vab / along), (vbb - vab * vab / vaa).max(0.0).sqrt())
            } else {
                ((0.0, 0.0), vbb.sqrt())
            };
            let part = |uptake, ratio| Part { source, uptake, ratio, dof, u: 1.0 };
            [part(uptake.sqrt(), first), part(0.0, (0.0, second))]
        };
        let noise = row(Source::SlopeNoise, 0.0, &|i| (self.noise[i].y_u, self.noise[i].dof));
        let wander = row(Source::Wander, self.wander_dof, &|i| {
            (self.wander * self.wander_variance(i).sqrt(), self.wander_dof)
        });
        let mark = row(Source::Mark, f64::INFINITY, &|i| (self.noise[i].mark_u, f64::INFINITY));
        let mut parts: Vec<Part> = noise.into_iter().chain(wander).chain(mark).collect();
        if let Some(prior) = self.prior {
            let change = (0.0, prior.weight.sqrt() / fit.stiffness);
            parts.push(Part {
                source: Source::LoopVolume,
                // A larger volume is a smaller β.
                uptake: -fit.uptake_change(change),
                ratio: (0.0, -change.1),
                dof: f64::INFINITY,
                u: 1.0,
            });
        }
        parts
    }

    /// The fit with the model moved.
    fn moved(&self, shift: &Shift, observations: &mut Vec<Observation>) -> Result<Fit, WhyNot> {
        self.model.observe(shift, self.inverse_n, &self.kinds, observations);
        Fit::of(observations, &self.weights, self.prior.map(|p| self.model.moved_prior(p, shift)))
            .ok_or(WhyNot::Unbounded)
    }

    /// Half the difference of the fit with one source moved up and down.
    fn half(
        &self,
        fit: &Fit,
        u: f64,
        shift: impl Fn(&mut Shift) -> &mut f64,
    ) -> Result<(f64, (f64, f64)), WhyNot> {
        let mut observations = Vec::with_capacity(self.observations.len());
        let (mut up, mut down) = (Shift::default(), Shift::default());
        *shift(&mut up) = u;
        *shift(&mut down) = -u;
        let up = self.moved(&up, &mut observations)?;
        let down = self.moved(&down, &mut observations)?;
        let (a, b) = (fit.away(&up), fit.away(&down));
        let ratio = (0.5 * (a.0 - b.0), 0.5 * (a.1 - b.1));
        Ok((0.5 * (up.uptake() - down.uptake()), ratio))
    }

    fn moved_parts(&self, fit: &Fit) -> Result<Vec<Part>, WhyNot> {
        let mut parts = Vec::new();
        for moves in moves(self.model) {
            let (uptake, ratio) = self.half(fit, moves.u, moves.shift)?;
            parts.push(Part { source: moves.source, uptake, ratio, dof: f64::INFINITY, u: moves.u });
        }
        Ok(parts)
    }

    /// Change of M for one unit of the line's intercept and slope, and the line's row: random and common parts together,
    /// the random one with its degrees of freedom.
    fn line_part(&self, fit: &Fit) -> Result<((f64, f64), Vec<Part>), WhyNot> {
        let Some(line) = &self.model.line else { return Ok(((0.0, 0.0), Vec::new())) };
        // Steps of the size of a per cent of a usual flow, at which the model is straight.
        let (step_a, step_b) = (0.005, 0.000_5);
        let (a, ratio_a) = self.half(fit, step_a, |s| &mut s.intercept)?;
        let (b, ratio_b) = self.half(fit, step_b, |s| &mut s.slope)?;
        let per_line = (a / step_a, b / step_b);
        let along = |intercept: f64, slope: f64| {
            let (x, y) = (intercept / step_a, slope / step_b);
            (x * ratio_a.0 + y * ratio_b.0, x * ratio_a.1 + y * ratio_b.1)
        };
        let part = |intercept: f64, slope: f64, dof| Part {
            source: Source::InjectionLine,
            uptake: per_line.0 * intercept + per_line.1 * slope,
            ratio: along(intercept, slope),
            dof,
            u: 1.0,
        };
        let mut parts = Vec::new();
        // The random part as two independent ones (its Cholesky factor).
        let first = line.intercept_variance.max(0.0).sqrt();
        if first > 0.0 {
            let across = line.covariance / first;
            let rest = (line.slope_variance - across * across).max(0.0).sqrt();
            parts.push(part(first, across, line.random_dof));
            parts.push(part(0.0, rest, line.random_dof));
        } else {
            parts.push(part(0.0, line.slope_variance.max(0.0).sqrt(), line.random_dof));
        }
        parts.extend(line.common.iter().map(|c| part(c.intercept, c.slope, f64::INFINITY)));
        Ok((per_line, parts))
    }

    fn warn(&mut self, fit: &Fit, several: bool) -> Result<(), WhyNot> {
        for (i, segment) in self.model.segments.iter().enumerate() {
            if segment.kept != LoopKept::Held {
                continue;
            }
            let (from_s, to_s) = (segment.from_s, segment.to_s);
            let o = &self.observations[i];
            let over = o.drift - self.inverse_n * o.drift_at_balance;
            if over.abs() < VENTS * self.noise[i].slope_u * o.per_drift {
                self.warnings.push(Warning::HeldOrVenting { from_s, to_s });
            } else if self.kinds[i] == Kind::Venting {
                self.warnings.push(Warning::HeldButVents { from_s, to_s });
            }
        }
        if let (Some(prior), Some(found), true) = (self.prior, fit.found, several) {
            let u = (1.0 / fit.spread + 1.0 / prior.weight).sqrt();
            let apart = (found - prior.inverse_n).abs() / u;
            if apart > DISAGREES {
                let kappa = self.model.kappa(&Shift::default());
                let litres = |inverse_n: f64| 1.0 / (inverse_n * kappa);
                let (stated_l, found_l) = (litres(prior.inverse_n), litres(found));
                // A stated volume that is too large reads high, the dangerous side; one that is too small is only warned of.
                if apart > CONTRADICTS && found_l > 0.0 && stated_l > TOO_LARGE * found_l {
                    return Err(WhyNot::LoopVolumeContradicts { stated_l, found_l, apart });
                }
                self.warnings.push(Warning::LoopVolumeDisagrees { stated_l, found_l, apart });
            }
        }
        if let Some((difference_l_min, u)) = leak_check(self.model) {
            let apart = difference_l_min.abs() / u;
            if apart > DISAGREES {
                self.warnings.push(Warning::CylinderDisagrees { difference_l_min, apart });
            }
        }
        Ok(())
    }
}

impl Model {
    /// The measured β when what turns litres into dry gas moves.
    pub(super) fn moved_prior(&self, prior: Prior, shift: &Shift) -> Prior {
        let scale = self.kappa(&Shift::default()) / self.kappa(shift);
        Prior { inverse_n: prior.inverse_n * scale, weight: prior.weight }
    }
}
