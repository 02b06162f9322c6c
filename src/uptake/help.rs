//! What would have made the interval narrower, found by doing it on the model.
//!
//! Comes in: the sessions with their models. Goes out: proposals with the half-width each would give. A proposal is carried
//! out on the last session's model: a segment is thought up at the end of it, on the estimated line, with the noise its
//! own segments show scaled to its length (`T^−3/2`), or a statement is made better; everything is then estimated again.
//! Left out: what the new readings would themselves say about uptake; the estimate stays where it is.

use super::combine::{Case, combine, litres_per_volume};
use super::model::Model;
use super::segment::{Kind, Rate, Segment, Shift};
use super::session::Worked;
use super::solve::{Solved, solve_again};
use crate::entry::{Assumptions, LoopKept};

/// Length of a segment that is proposed, minutes.
const MINUTES: f64 = 10.0;
/// A loop volume measured with care, ± litres (k = 2): common practice, no source.
const MEASURED_L: f64 = 0.5;
/// A gauge compared with a calibrated one, ± bar (k = 2): common practice, no source.
const COMPARED_BAR: f64 = 0.1;
/// A second injection near the uptake says most about it; this share keeps PO2 from rising.
const NEAR_BALANCE: f64 = 0.9;
/// Injections closer than this to one already done are not a second one, L/min.
const APART_L_MIN: f64 = 0.05;
/// A proposal must narrow one of the intervals by this share to be made.
const WORTH: f64 = 0.02;

/// A proposal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Help {
    /// What to do.
    pub what: HelpWith,
    /// Half-width of the 95 % interval of the uptake it would give, L/min.
    pub half_width_l_min: f64,
    /// Half-width of the 95 % interval of another day's uptake it would give, L/min.
    pub next_day_half_width_l_min: f64,
}

/// What to do.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum HelpWith {
    /// Ten minutes at another injection, in the same session; with the injection off PO2 must be brought up first, so that it
    /// stays above its floor.
    SecondInjection {
        /// Whole gas, L/min STPD; zero for off.
        flow_l_min: f64,
        /// The intermediate pressure that gives it, bar gauge, where the session goes by a line.
        ip_bar_gauge: Option<f64>,
        /// Minutes.
        minutes: f64,
    },
    /// A loop volume measured to ± so many litres (k = 2).
    MeasuredVolume {
        /// Litres.
        expanded_l: f64,
    },
    /// So many minutes more at the last injection.
    LongerRest {
        /// Minutes.
        minutes: f64,
    },
    /// The same again on another day.
    AnotherDay,
    /// The gauge of the intermediate pressure compared to ± so many bar (k = 2).
    ComparedGauge {
        /// Bar.
        expanded_bar: f64,
    },
}

/// Proposals, best first.
pub(super) fn would_help(sessions: &[&Worked<'_>]) -> Vec<Help> {
    let Some(now) = combine(&cases(sessions, None, false)) else { return Vec::new() };
    let Some((model, solved)) = sessions.last().and_then(|w| w.solved.as_ref()) else { return Vec::new() };
    let Some(assumptions) = sessions.last().map(|w| &w.session.assumptions) else { return Vec::new() };
    let mut helps = Vec::new();
    let mut propose = |what, changed: Option<&Solved>, another_day| {
        if let Some(then) = combine(&cases(sessions, changed, another_day)) {
            let narrower = then.half_width() < (1.0 - WORTH) * now.half_width()
                || then.next_half_width() < (1.0 - WORTH) * now.next_half_width();
            if narrower {
                helps.push(Help {
                    what,
                    half_width_l_min: then.half_width(),
                    next_day_half_width_l_min: then.next_half_width(),
                });
            }
        }
    };
    if let Some((what, then)) = best_second_injection(model, solved, assumptions) {
        propose(what, Some(&then), false);
    }
    if let Some(then) = longer(model, solved, assumptions) {
        propose(HelpWith::LongerRest { minutes: MINUTES }, Some(&then), false);
    }
    let kappa = litres_per_volume(model);
    let stated_u = model.given.volume_l.map_or(f64::INFINITY, |(_, u)| u);
    if stated_u > 1.2 * MEASURED_L / 2.0 {
        let mut better = model.clone();
        better.given.volume_l = Some((1.0 / (solved.fit.inverse_n * kappa), MEASURED_L / 2.0));
        if let Ok(then) = solve_again(&better, assumptions, solved) {
            propose(HelpWith::MeasuredVolume { expanded_l: MEASURED_L }, Some(&then), false);
        }
    }
    if model.given.ip_u_bar > 1.2 * COMPARED_BAR / 2.0 {
        let mut better = model.clone();
        better.given.ip_u_bar = COMPARED_BAR / 2.0;
        if let Ok(then) = solve_again(&better, assumptions, solved) {
            propose(HelpWith::ComparedGauge { expanded_bar: COMPARED_BAR }, Some(&then), false);
        }
    }
    propose(HelpWith::AnotherDay, None, true);
    helps.sort_by(|a, b| a.half_width_l_min.total_cmp(&b.half_width_l_min));
    helps
}

/// The sessions, the last one solved otherwise or done again on another day.
fn cases<'a>(sessions: &[&'a Worked<'_>], changed: Option<&'a Solved>, another_day: bool) -> Vec<Case<'a>> {
    let mut cases: Vec<Case<'a>> = sessions.iter().filter_map(|w| Case::of(w)).collect();
    if let (Some(solved), Some(last)) = (changed, cases.last_mut()) {
        last.solved = solved;
    }
    if another_day {
        let again = cases.last().map(|last| Case {
            session: last.session,
            solved: last.solved,
            line: last.line,
            prior_volume: last.prior_volume,
            day: cases.iter().map(|c| c.day).max().unwrap_or(0) + 1,
        });
        cases.extend(again);
    }
    cases
}

/// Ten minutes with the injection off, or near the balance, whichever narrows more.
fn best_second_injection(
    model: &Model,
    solved: &Solved,
    assumptions: &Assumptions,
) -> Option<(HelpWith, Solved)> {
    let done: Vec<f64> = solved.observations.iter().map(|o| o.injected).collect();
    let flows = [0.0, NEAR_BALANCE * solved.uptake];
    let new = |flow: &f64| done.iter().all(|there| (there - flow).abs() > APART_L_MIN);
    let mut best: Option<(HelpWith, Solved)> = None;
    for oxygen in flows.into_iter().filter(new) {
        let flow_l_min = oxygen / model.given.purity;
        let (rate, ip_bar_gauge) = rate_for(model, flow_l_min)?;
        let Some(longer) = with_segment(model, solved, rate) else { continue };
        let Ok(then) = solve_again(&longer, assumptions, solved) else { continue };
        if best.as_ref().is_none_or(|(_, b)| then.u < b.u) {
            let what = HelpWith::SecondInjection { flow_l_min, ip_bar_gauge, minutes: MINUTES };
            best = Some((what, then));
        }
    }
    best
}

/// How a flow is asked for: as pressure where the session goes by a line.
fn rate_for(model: &Model, flow_l_min: f64) -> Option<(Rate, Option<f64>)> {
    if flow_l_min <= 0.0 {
        return Some((Rate::Off, None));
    }
    let by_line = model.rates.iter().any(|(_, rate)| matches!(rate, Some(Rate::Ip(_))));
    let Some(line) = model.line.as_ref().filter(|_| by_line) else {
        return Some((Rate::Flow(flow_l_min), None));
    };
    let at = |ip: f64| model.flow(Rate::Ip(ip), &Shift::default());
    let ip = (flow_l_min - at(10.0)) / line.slope + 10.0;
    // The line is straight but for the root of the temperature: one correction suffices.
    let ip = ip + (flow_l_min - at(ip)) / line.slope;
    ip.is_finite().then_some((Rate::Ip(ip), Some(ip)))
}

/// More of the last injection.
fn longer(model: &Model, solved: &Solved, assumptions: &Assumptions) -> Option<Solved> {
    let last = model.segments.last()?;
    let longer = if last.top_up.is_some() {
        let mut longer = model.clone();
        let minutes = last.minutes();
        let top_up = longer.segments.last_mut()?.top_up.as_mut()?;
        top_up.scale = (minutes + MINUTES) / minutes;
        longer
    } else {
        let rate = last.rates.first()?.0;
        with_segment(model, solved, rate)?
    };
    solve_again(&longer, assumptions, solved).ok()
}

/// The model with a segment of ten minutes thought up at its end.
fn with_segment(model: &Model, solved: &Solved, rate: Rate) -> Option<Model> {
    let last = model.segments.last()?;
    if last.kept == LoopKept::Topped {
        return None;
    }
    let width_s = 5.0;
    let bins = (MINUTES * 60.0 / width_s) as usize;
    let from_s = model.last_s + 90.0;
    let to_s = from_s + MINUTES * 60.0;
    // The readings of the last bin stand for the state the loop is in.
    let template = last.bins.end.checked_sub(1)?;
    let mut longer = model.clone();
    let start = longer.time_s.len();
    let fraction = model.fraction(template, &Shift::default());
    let dry = model.ambient[template] - model.vapour[template];
    for bin in 0..bins {
        let at_s = from_s + (bin as f64 + 0.5) * width_s;
        longer.time_s.push(at_s);
        longer.ends_s.push((at_s, at_s));
        longer.po2.push(model.po2[template]);
        longer.ambient.push(model.ambient[template]);
        longer.vapour.push(model.vapour[template]);
        longer.vapour_per_k.push(model.vapour_per_k[template]);
        longer.loop_k.push(model.loop_k[template]);
        let minutes = (at_s - model.time_s[template]) / 60.0;
        longer.washout.push(model.washout[template] * libm::exp(-minutes / model.given.washout_min));
        longer.inert_share.push(1.0 - fraction);
    }
    longer.rates.push((model.last_s, Some(rate)));
    let mut segment =
        Segment::new(last.stage, last.kept, from_s, to_s, start..start + bins, vec![(rate, 1.0)]);
    segment.thought_up = Some(usual_noise(model, solved, last.kept)?);
    longer.segments.push(segment);
    longer.finish();
    // Then the slope that lies on the line: what each bin's fraction must be for y = β·(net − M).
    let mut kinds = solved.kinds.clone();
    let vents = last.kept == LoopKept::Held && model.flow(rate, &Shift::default()) > solved.uptake;
    kinds.push(if vents { Kind::Venting } else { Kind::from(last.kept) });
    let mut observations = Vec::new();
    let inverse_n = solved.fit.inverse_n;
    longer.observe(&Shift::default(), inverse_n, &kinds, &mut observations);
    let flat = observations.last()?;
    let slope = (inverse_n * (flat.net - solved.uptake) - flat.y) / flat.per_slope;
    for bin in start..start + bins {
        let lever = longer.lever[bin];
        let there = if last.kept == LoopKept::Sealed {
            1.0 - 1.0 / (1.0 / (1.0 - fraction) + slope * lever)
        } else {
            fraction + slope * lever
        };
        longer.po2[bin] = there * dry;
    }
    longer.finish();
    Some(longer)
}

/// Slope noise of ten minutes by the longest segment kept in the same way.
fn usual_noise(model: &Model, solved: &Solved, kept: LoopKept) -> Option<(f64, f64)> {
    let like = model.segments.iter().zip(&solved.noise).filter(|(s, _)| s.kept == kept);
    let (segment, noise) = like.max_by(|a, b| a.0.minutes().total_cmp(&b.0.minutes()))?;
    let shorter = segment.minutes() / MINUTES;
    Some((noise.slope_u * shorter * shorter.sqrt(), noise.dof))
}
