//! What the plate says in words and numbers.
//!
//! Comes in: a run, its analysis, and what is drawn. Goes out: [`Words`], each already cleaned of what cannot be
//! drawn. Values are rounded to two digits of their expanded uncertainty. Left out: the sentences of the checks and
//! warnings, which are the report's.

use super::seen::{ResidualUnit, Seen, Use};
use crate::bench::checks::CheckKind;
use crate::bench::choke::Origin;
use crate::bench::line::FlowAt;
use crate::bench::{Analysis, Judgement, Verdict};
use crate::entry::{Rule, Run, Tolerance};

use super::super::letters::clean;
use super::super::number::{decimals_for, fixed, short};

/// All texts of the plate but tick labels and legend.
pub(super) struct Words {
    /// Of the picture, for readers who do not see it.
    pub title: String,
    pub description: String,
    pub orifice: String,
    pub about: String,
    pub verdict: &'static str,
    /// Whether the verdict is one to be afraid of.
    pub bad: bool,
    pub why: String,
    pub flow_head: String,
    pub flow: String,
    pub flow_detail: String,
    pub as_oxygen: Option<String>,
    pub choke: String,
    pub choke_detail: String,
    pub acceptance: Option<String>,
    pub flow_axis: [String; 2],
    pub pressure_axis: [String; 2],
    pub gauge_axis: [String; 2],
    pub residual_axis: [String; 2],
    /// How to read bars and band: in full, and for where there is little room.
    pub notes: [String; 2],
}

impl Words {
    pub(super) fn new(run: &Run, analysis: &Analysis, seen: &Seen) -> Self {
        let (pressure, flow_unit) = (seen.units.pressure.symbol, seen.units.flow.symbol);
        let gas = run.gas.name();
        let orifice = clean(run.orifice.as_str());
        let ip = ip(seen);
        let flow = with_uncertainty(&analysis.nominal.flow, seen);
        let (verdict, bad, why) = verdict(run, analysis.judgement.as_ref(), seen);
        let (choke, choke_detail) = choke(analysis);
        let ambient =
            fixed(seen.units.ambient(), decimals_for(seen.units.ambient(), 1e-4 * seen.units.ambient()));
        Self {
            title: format!("Orifice {orifice}: flow of {gas} against upstream pressure"),
            description: describe(run, analysis, seen, &flow, verdict),
            about: about(run),
            verdict,
            bad,
            why,
            flow_head: format!("Flow at {ip}"),
            flow_detail: format!("{gas} STPD, 95\u{a0}%, k\u{a0}=\u{a0}{}", coverage(seen)),
            as_oxygen: analysis
                .nominal
                .as_oxygen
                .as_ref()
                .map(|o| format!("{}\u{a0}{flow_unit} as oxygen", with_uncertainty(o, seen))),
            flow: format!("{flow}\u{a0}{flow_unit}"),
            choke,
            choke_detail,
            acceptance: acceptance(run, seen),
            flow_axis: [format!("flow of {gas}, {flow_unit} STPD"), format!("{flow_unit} STPD")],
            pressure_axis: [
                format!("upstream pressure, {pressure} absolute"),
                format!("{pressure} absolute"),
            ],
            gauge_axis: [
                format!("intermediate pressure (IP), {pressure} gauge at {ambient} {pressure} ambient"),
                format!("IP, {pressure} gauge at {ambient} {pressure}"),
            ],
            residual_axis: match seen.units.residual {
                ResidualUnit::Percent => {
                    [format!("residual (flow less line), % of the flow at {ip}"), "residual (flow less line), %".to_owned()]
                }
                ResidualUnit::Flow => [
                    format!("residual (flow less line), {flow_unit} STPD"),
                    format!("residual, {flow_unit}"),
                ],
            },
            notes: [
                "Bars, where the signs do not hide them: expanded uncertainty of the random part, k\u{a0}=\u{a0}2; \
                 below, of both axes together. Band: random and common parts, 95\u{a0}%. Gas at 20\u{a0}°C; litres \
                 at 0\u{a0}°C, 101.325\u{a0}kPa, dry."
                    .to_owned(),
                "Bars: random part, k\u{a0}=\u{a0}2. Band: all parts, 95\u{a0}%.".to_owned(),
            ],
            orifice,
        }
    }
}

/// The nominal pressure, as "10 bar gauge".
pub(super) fn ip(seen: &Seen) -> String {
    let value = seen.nominal.map_or("?".to_owned(), |n| short(n.ip));
    format!("{value}\u{a0}{} gauge", seen.units.pressure.symbol)
}

fn coverage(seen: &Seen) -> String {
    seen.nominal.map_or("?".to_owned(), |n| fixed(n.coverage_factor, 2))
}

/// "0.4831 ± 0.0049" in the shown unit, without it.
fn with_uncertainty(flow: &FlowAt, seen: &Seen) -> String {
    let (value, expanded) = (flow.flow_l_min * seen.units.per_l_min, flow.expanded() * seen.units.per_l_min);
    if !value.is_finite() {
        return "not known".to_owned();
    }
    let decimals = decimals_for(value, expanded);
    if expanded.is_finite() {
        format!("{}\u{a0}±\u{a0}{}", fixed(value, decimals), fixed(expanded, decimals))
    } else {
        format!("{}, uncertainty not known", fixed(value, decimals))
    }
}

fn about(run: &Run) -> String {
    let mut parts = vec![
        run.gas.name().to_owned(),
        run.purpose.name().to_owned(),
        run.taken.format("%Y-%m-%d").to_string(),
    ];
    parts.extend(run.technician.iter().map(|t| clean(t).trim().to_owned()).filter(|t| !t.is_empty()));
    parts.join(" · ")
}

fn verdict(run: &Run, judgement: Option<&Judgement>, seen: &Seen) -> (&'static str, bool, String) {
    let Some(j) = judgement else {
        return ("Not judged", false, "The run names no acceptance".to_owned());
    };
    let flow = seen.units.flow.symbol;
    let limit = |l_min: f64| short(l_min * seen.units.per_l_min);
    let gas = run.acceptance.as_ref().and_then(|a| a.gas).filter(|gas| *gas != run.gas);
    let limits = match gas {
        Some(gas) => {
            format!(
                "{} to {}\u{a0}{flow} of {}",
                limit(j.limits_l_min.0),
                limit(j.limits_l_min.1),
                gas.name()
            )
        }
        None => format!("{} to {}\u{a0}{flow}", limit(j.limits_l_min.0), limit(j.limits_l_min.1)),
    };
    let chance = format!("probability of conformity {}", probability(j.probability));
    let failed: Vec<&str> = j.failed_checks.iter().map(|k| check_name(*k)).collect();
    let does_not_hold = || format!("Does not hold: {}", failed.join(", "));
    let guarded = run.acceptance.as_ref().is_some_and(|a| a.rule == Rule::Guarded);
    let by_flow = match (j.by_flow, guarded) {
        (Verdict::Pass, true) => format!("Flow with its uncertainty within {limits}"),
        (Verdict::Pass, false) => format!("Flow within {limits}"),
        (Verdict::Fail, true) => format!("Flow with its uncertainty outside {limits}"),
        (Verdict::Fail, false) => format!("Flow outside {limits}"),
        (Verdict::Undecided | Verdict::None, _) => {
            format!("A limit of {limits} lies within the uncertainty of the flow")
        }
    };
    let why = if failed.is_empty() {
        format!("{by_flow}; {chance}")
    } else if j.by_flow == Verdict::Pass {
        format!("{}. {by_flow}", does_not_hold())
    } else {
        format!("{by_flow}; {chance}. {}", does_not_hold())
    };
    match j.verdict {
        Verdict::Pass => ("Pass", false, why),
        Verdict::Fail => ("Fail", true, why),
        Verdict::Undecided => ("Undecided", false, why),
        Verdict::None => ("Not judged", false, "Nothing to judge by".to_owned()),
    }
}

fn probability(p: f64) -> String {
    match p {
        p if !p.is_finite() => "not known".to_owned(),
        p if p >= 0.995 => "over 99\u{a0}%".to_owned(),
        p if p < 0.005 => "under 1\u{a0}%".to_owned(),
        p => format!("{}\u{a0}%", fixed(100.0 * p, 0)),
    }
}

fn check_name(kind: CheckKind) -> &'static str {
    match kind {
        CheckKind::Choked => "choked",
        CheckKind::Straight => "straight",
        CheckKind::Hysteresis => "rising = falling",
        CheckKind::Repeatable => "repeatable",
        CheckKind::Steady => "steady",
        CheckKind::ThroughZero => "through zero",
        CheckKind::Outlier => "outlier",
        CheckKind::SameAsBefore => "same as last time",
        CheckKind::Instruments => "instruments",
    }
}

/// The choke ratio's value, and how it is known.
fn choke(analysis: &Analysis) -> (String, String) {
    let choke = &analysis.choke;
    let (low, high) = choke.interval_95;
    if ![choke.value, low, high].iter().all(|x| x.is_finite()) {
        return ("not known".to_owned(), "no interval".to_owned());
    }
    let decimals = decimals_for(choke.value, (high - low) / 2.0).clamp(2, 3);
    let interval = format!("{} to {}", fixed(low, decimals), fixed(high, decimals));
    match choke.origin {
        Origin::Measured => (fixed(choke.value, decimals), format!("95\u{a0}%: {interval}, measured")),
        Origin::Bounded => (interval, "95\u{a0}%, bounded, not measured".to_owned()),
    }
}

fn acceptance(run: &Run, seen: &Seen) -> Option<String> {
    let a = run.acceptance.as_ref()?;
    let window = seen.window?;
    let flow = seen.units.flow.symbol;
    let tolerance = match a.tolerance {
        Tolerance::Relative(share) => format!("{}\u{a0}%", short(100.0 * share)),
        Tolerance::Flow(q) => format!("{}\u{a0}{flow}", short(q.as_l_min() * seen.units.per_l_min)),
    };
    let nominal = short(a.flow.as_l_min() * seen.units.per_l_min);
    Some(match a.gas {
        Some(gas) if window.converted => {
            format!(
                "acceptance: {nominal}\u{a0}{flow} of {} ±\u{a0}{tolerance}, as {}",
                gas.name(),
                run.gas.name()
            )
        }
        _ => format!("acceptance: {nominal}\u{a0}{flow} ±\u{a0}{tolerance}"),
    })
}

/// The result in sentences, for readers who do not see the picture.
fn describe(run: &Run, analysis: &Analysis, seen: &Seen, flow: &str, verdict: &str) -> String {
    let units = &seen.units;
    let (pressure, flow_unit) = (units.pressure.symbol, units.flow.symbol);
    let used = seen.marks.iter().filter(|m| m.how == Use::InTheLine).count();
    let total = analysis.line.total();
    let slope = total.slope * units.per_l_min / units.per_bar;
    let slope_u = total.slope_u * units.per_l_min / units.per_bar;
    let intercept = total.intercept * units.per_l_min;
    let intercept_u = total.intercept_u * units.per_l_min;
    let known = |value: f64, u: f64| {
        if value.is_finite() && u.is_finite() {
            let decimals = decimals_for(value, u);
            format!("{} (standard uncertainty {})", fixed(value, decimals), fixed(u, decimals))
        } else {
            "not known".to_owned()
        }
    };
    let mut text = format!(
        "Orifice {}, {}, {used} points. Line: slope {} {flow_unit} STPD per {pressure}, intercept {} {flow_unit} at \
         0 {pressure} absolute. Flow at {}: {flow} {flow_unit} STPD (95 %, k = {}). Verdict: {}.",
        clean(run.orifice.as_str()),
        run.gas.name(),
        known(slope, slope_u),
        known(intercept, intercept_u),
        ip(seen),
        coverage(seen),
        verdict.to_lowercase(),
    );
    let not_choked = seen.marks.iter().filter(|m| m.how == Use::NotChoked).count();
    let reasons: Vec<String> = seen
        .marks
        .iter()
        .filter_map(|m| match &m.how {
            Use::LeftOut(why) => Some(format!("point {} ({})", m.index, clean(why).trim())),
            _ => None,
        })
        .collect();
    match (not_choked, reasons.len()) {
        (0, 0) => text.push_str(" No point is left out."),
        _ => {
            if not_choked > 0 {
                text.push_str(&format!(" Not in the line because not choked: {not_choked}."));
            }
            if !reasons.is_empty() {
                text.push_str(&format!(" Left out by a person: {}.", reasons.join(", ")));
            }
        }
    }
    text
}
