//! What the plate says in words and numbers.
//!
//! Comes in: a run, its analysis, and what is drawn. Goes out: [`Words`], each already cleaned of what cannot be
//! drawn. The verdict with its reason is the report's sentence, and values are rounded as the report does it, so
//! that sheet and plate say the same. Left out: the sentences of checks and warnings.

use super::seen::{ResidualUnit, Seen, Use};
use crate::bench::choke::Origin;
use crate::bench::line::FlowAt;
use crate::bench::{Analysis, Verdict};
use crate::entry::{Run, Tolerance};
use crate::report::bench_fit::{Fitted, verdict_line};
use crate::report::number::{figures, fixed, value_and_u};

use super::super::letters::clean;
use super::super::number::short;

/// All texts of the plate but tick labels and legend.
pub(super) struct Words {
    /// Of the picture, for readers who do not see it.
    pub title: String,
    pub description: String,
    pub orifice: String,
    pub about: String,
    pub verdict: String,
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
    /// Titles of axes: in full, and for where that has no room.
    pub flow_axis: [String; 2],
    pub pressure_axis: [String; 2],
    pub gauge_axis: [String; 2],
    pub residual_axis: [String; 2],
    /// How to read bars and band: in full, and for where there is little room.
    pub notes: [String; 2],
}

impl Words {
    pub(super) fn new(run: &Run, analysis: &Analysis, seen: &Seen) -> Self {
        let units = &seen.shown.units;
        let (pressure, flow_unit) = (units.pressure_symbol(), units.flow_symbol());
        let gas = run.gas.name();
        let orifice = clean(run.orifice.as_str());
        let ip = ip(seen);
        let (verdict, why) = verdict(run, analysis, seen);
        let (choke, choke_detail) = choke(analysis);
        let ambient = figures(seen.shown.ambient(), 6);
        Self {
            title: format!("Orifice {orifice}: flow of {gas} against upstream pressure"),
            description: describe(run, analysis, seen, &verdict),
            about: about(run),
            bad: analysis.judgement.as_ref().is_some_and(|j| j.verdict == Verdict::Fail),
            verdict,
            why,
            flow_head: format!("Flow at {ip}"),
            flow: kept_together(&with_uncertainty(&analysis.nominal.flow, seen)),
            flow_detail: kept_together(&format!("{gas} STPD, 95 %, k = {}", coverage(seen))),
            as_oxygen: analysis
                .nominal
                .as_oxygen
                .as_ref()
                .map(|o| kept_together(&format!("{} as oxygen", with_uncertainty(o, seen)))),
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
            residual_axis: match seen.shown.residual {
                ResidualUnit::Percent => [
                    format!("residual (flow less line), % of the flow at {ip}"),
                    "residual (flow less line), %".to_owned(),
                ],
                ResidualUnit::Flow => {
                    [format!("residual (flow less line), {flow_unit} STPD"), format!("residual, {flow_unit}")]
                }
            },
            notes: [
                kept_together(
                    "Bars, where the signs do not hide them: expanded uncertainty of the random part, k = 2; below, \
                     of both axes together. Band: random and common parts, 95 %. Gas at 20 °C; litres at 0 °C, \
                     101.325 kPa, dry.",
                ),
                kept_together("Bars: random part, k = 2. Band: all parts, 95 %."),
            ],
            orifice,
        }
    }
}

/// The nominal pressure, as "10 bar gauge".
pub(super) fn ip(seen: &Seen) -> String {
    let value = seen.nominal.map_or("?".to_owned(), |n| short(n.ip));
    format!("{value}\u{a0}{} gauge", seen.shown.units.pressure_symbol())
}

/// A text whose numbers are not parted from their units at the end of a line.
fn kept_together(text: &str) -> String {
    const INSEPARABLE: [&str; 11] =
        [" %", " ± ", " = ", " °C", " kPa", " L/min", " mL/min", " L/h", " bar", " psi", " ft³/h"];
    INSEPARABLE.iter().fold(text.to_owned(), |text, part| text.replace(part, &part.replace(' ', "\u{a0}")))
}

fn coverage(seen: &Seen) -> String {
    seen.nominal.map_or("?".to_owned(), |n| fixed(n.coverage_factor, 2))
}

/// "0.4831 ± 0.0049 L/min".
fn with_uncertainty(flow: &FlowAt, seen: &Seen) -> String {
    let units = &seen.shown.units;
    let (value, expanded) = value_and_u(units.flow(flow.flow_l_min), units.flow(flow.expanded()));
    if expanded.is_empty() {
        format!("{value} {}", units.flow_symbol())
    } else {
        format!("{value} ± {expanded} {}", units.flow_symbol())
    }
}

fn about(run: &Run) -> String {
    let date = run.taken.format("%Y-%m-%d").to_string();
    let mut parts = vec![run.gas.name().to_owned(), run.purpose.name().to_owned(), date];
    parts.extend(run.technician.iter().map(|t| clean(t).trim().to_owned()).filter(|t| !t.is_empty()));
    parts.join(" · ")
}

/// The report's verdict, as its word and its reason.
fn verdict(run: &Run, analysis: &Analysis, seen: &Seen) -> (String, String) {
    let fitted = Fitted { run, analysis, monte_carlo: None, low_points: None, notes: &[] };
    let line = clean(&verdict_line(&fitted, &seen.shown.units));
    let (word, why) = line.split_once(": ").unwrap_or((&line, ""));
    (as_in_a_sentence(&word.to_lowercase()), kept_together(&as_in_a_sentence(why)))
}

/// With a capital at its beginning.
fn as_in_a_sentence(text: &str) -> String {
    let mut letters = text.chars();
    letters.next().map_or(String::new(), |first| first.to_uppercase().chain(letters).collect())
}

/// The choke ratio's value, and how it is known.
fn choke(analysis: &Analysis) -> (String, String) {
    let choke = &analysis.choke;
    let (low, high) = choke.interval_95;
    let interval = |decimals| format!("{} to {}", fixed(low, decimals), fixed(high, decimals));
    match choke.origin {
        Origin::Measured => {
            let (value, _) = value_and_u(choke.value, choke.standard_uncertainty);
            let decimals = value.split_once('.').map_or(0, |(_, decimals)| decimals.len()).clamp(2, 3) as i32;
            let known = kept_together(&format!("measured, 95 %: {}", interval(decimals)));
            (fixed(choke.value, decimals), known)
        }
        Origin::Bounded => (interval(2), kept_together("only bounded, 95 %")),
    }
}

fn acceptance(run: &Run, seen: &Seen) -> Option<String> {
    let a = run.acceptance.as_ref()?;
    let window = seen.window?;
    let units = &seen.shown.units;
    let flow = units.flow_symbol();
    let tolerance = match a.tolerance {
        Tolerance::Relative(share) => format!("{} %", short(100.0 * share)),
        Tolerance::Flow(q) => format!("{} {flow}", short(units.flow(q.as_l_min()))),
    };
    let nominal = short(units.flow(a.flow.as_l_min()));
    Some(kept_together(&match a.gas {
        Some(gas) if window.converted => {
            format!("acceptance: {nominal} {flow} of {} ± {tolerance}, as {}", gas.name(), run.gas.name())
        }
        _ => format!("acceptance: {nominal} {flow} ± {tolerance}"),
    }))
}

/// The result in sentences, for readers who do not see the picture.
fn describe(run: &Run, analysis: &Analysis, seen: &Seen, verdict: &str) -> String {
    let units = &seen.shown.units;
    let (pressure, flow) = (units.pressure_symbol(), units.flow_symbol());
    let used = seen.marks.iter().filter(|m| m.how == Use::InTheLine).count();
    let total = analysis.line.total();
    let (slope, slope_u) = value_and_u(units.slope(total.slope), units.slope(total.slope_u));
    let (intercept, intercept_u) = value_and_u(units.flow(total.intercept), units.flow(total.intercept_u));
    let mut text = format!(
        "Orifice {}, {}, {used} points in the line. Flow at {}: {} STPD (95 %, k = {}). Verdict: {}. Line: slope \
         {slope} {flow} per {pressure} (standard uncertainty {slope_u}), intercept {intercept} {flow} at 0 {pressure} \
         absolute (standard uncertainty {intercept_u}).",
        clean(run.orifice.as_str()),
        run.gas.name(),
        ip(seen),
        with_uncertainty(&analysis.nominal.flow, seen),
        coverage(seen),
        verdict.to_lowercase(),
    );
    let not_choked = seen.marks.iter().filter(|m| m.how == Use::NotChoked).count();
    let left_out: Vec<String> = seen
        .marks
        .iter()
        .filter_map(|m| match &m.how {
            Use::LeftOut(why) => Some(format!("point {} ({})", m.index, clean(why).trim())),
            _ => None,
        })
        .collect();
    if not_choked > 0 {
        text.push_str(&format!(" Not in the line because not choked: {not_choked}."));
    }
    if !left_out.is_empty() {
        text.push_str(&format!(" Left out by a person: {}.", left_out.join(", ")));
    }
    if not_choked == 0 && left_out.is_empty() {
        text.push_str(" No point is left out.");
    }
    text
}
