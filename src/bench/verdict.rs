//! Pass, fail or undecided, and how sure.
//!
//! Comes in: the flow at the nominal pressure with its uncertainty, the acceptance, the checks. Goes out: a
//! [`Judgement`]. Rules: simple acceptance, or guarded with `w = U` on both sides (ILAC-G8:09/2019, JCGM 106:2012,
//! clause 8). A failed check never lets a run pass, nor does a budget that lacks an instrument's largest part, nor a
//! pressure the points do not reach: on doubt it is undecided.

use super::checks::{Check, CheckKind, CheckVerdict};
use super::line::FlowAt;
use crate::entry::{Acceptance, Rule, Tolerance};
use crate::gas::Species;
use crate::stats::conformity::{self, DecisionRule, Knowledge};

/// The verdict on a run.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Verdict {
    /// Within the limits by the rule, and every check holds.
    Pass,
    /// Outside the limits by the rule.
    Fail,
    /// Neither, or a check does not hold.
    Undecided,
    /// Nothing to judge by.
    None,
}

/// A verdict with what led to it.
#[derive(Debug, Clone, PartialEq)]
pub struct Judgement {
    /// The verdict.
    pub verdict: Verdict,
    /// What the flow alone decides.
    pub by_flow: Verdict,
    /// Lower and upper limit of the flow, L/min STPD in the gas the acceptance is meant for.
    pub limits_l_min: (f64, f64),
    /// Probability that the flow lies within the limits.
    pub probability: f64,
    /// The flow that was judged, in `gas`.
    pub flow: FlowAt,
    /// The gas the acceptance is meant for.
    pub gas: Species,
    /// Checks that do not hold.
    pub failed_checks: Vec<CheckKind>,
    /// What keeps a flow within the limits from passing, beside the checks.
    pub doubts: Vec<Doubt>,
}

/// Why a flow within its limits is not enough for a pass.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Doubt {
    /// The flow meter's papers state no gain, so the uncertainty lacks what is usually its largest part.
    MeterGainUnknown,
    /// The transducer's papers state neither gain nor zero.
    TransducerPapersUnknown,
    /// The nominal pressure lies beyond the points of the line.
    BeyondThePoints,
}

/// Judges a flow of `gas`, the one the acceptance is meant for, by an acceptance whose nominal flow is `nominal_l_min`.
#[must_use]
pub(super) fn judge(
    acceptance: &Acceptance,
    nominal_l_min: f64,
    (gas, flow): (Species, &FlowAt),
    checks: &[Check],
    doubts: Vec<Doubt>,
) -> Judgement {
    let half_width = match acceptance.tolerance {
        Tolerance::Relative(share) => share * nominal_l_min,
        Tolerance::Flow(q) => q.as_l_min() * nominal_l_min / acceptance.flow.as_l_min(),
    };
    let limits = (nominal_l_min - half_width, nominal_l_min + half_width);
    let rule = match acceptance.rule {
        Rule::Simple => DecisionRule::Simple,
        Rule::Guarded => DecisionRule::Guarded,
    };
    // Without two limits in their order (a tolerance of nothing) there is nothing to pass by.
    let interval = conformity::Limits::new(Some(limits.0), Some(limits.1)).ok();
    let by_flow = interval.as_ref().map_or(Verdict::Undecided, |interval| {
        match conformity::decide(rule, flow.flow_l_min, flow.expanded(), interval) {
            conformity::Verdict::Pass => Verdict::Pass,
            conformity::Verdict::Fail => Verdict::Fail,
            conformity::Verdict::Undecided => Verdict::Undecided,
        }
    });
    let known = Knowledge { value: flow.flow_l_min, u: flow.standard_uncertainty, dof: flow.dof };
    let probability = interval.as_ref().map_or(0.0, |i| conformity::conformity_probability(&known, i));
    let failed_checks: Vec<CheckKind> =
        checks.iter().filter(|c| c.verdict == CheckVerdict::Fail).map(|c| c.kind).collect();
    let doubtful = !failed_checks.is_empty() || !doubts.is_empty();
    let verdict = if by_flow == Verdict::Pass && doubtful { Verdict::Undecided } else { by_flow };
    Judgement {
        verdict,
        by_flow,
        limits_l_min: limits,
        probability,
        flow: flow.clone(),
        gas,
        failed_checks,
        doubts,
    }
}
