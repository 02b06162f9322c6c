//! A fitted run as the sheet a technician pins to the wall: verdict first, then flow, checks, line, points, budget.

use super::cautions::BENCH;
use super::check_sentences::{name_key_unit, sentence};
use super::layout::{table, wrapped};
use super::number::{figures, fixed, percent, probability, shortest, u_alone, value_and_u};
use super::{Units, warning_sentences};
use crate::bench::advice::LowPoints;
use crate::bench::checks::CheckVerdict;
use crate::bench::choke::Origin;
use crate::bench::correct::Source;
use crate::bench::line::{FlowAt, Part};
use crate::bench::monte_carlo::MonteCarlo;
use crate::bench::{Analysis, Doubt, FlowAtIp, Judgement, Point, Verdict, WhyNot};
use crate::entry::{Rule, Run, Sweep};

/// Everything that is said of a fitted run.
#[derive(Debug, Clone, Copy)]
pub struct Fitted<'a> {
    /// What was recorded.
    pub run: &'a Run,
    /// What was made of it.
    pub analysis: &'a Analysis,
    /// The Monte Carlo check, when it was asked for.
    pub monte_carlo: Option<&'a MonteCarlo>,
    /// What would settle the choke ratio.
    pub low_points: Option<&'a LowPoints>,
    /// What was said on reading the file.
    pub notes: &'a [String],
}

/// The sheet, 80 columns wide.
#[must_use]
pub fn sheet(fitted: &Fitted<'_>, units: &Units) -> String {
    let mut text = String::new();
    text.push_str(&head(fitted, units));
    text.push('\n');
    text.push_str(&flows(fitted, units));
    if !fitted.analysis.ip_for.is_empty() {
        text.push('\n');
        text.push_str(&pressures(fitted, units));
    }
    text.push('\n');
    text.push_str(&checks(fitted, units));
    if !fitted.analysis.warnings.is_empty() || !fitted.notes.is_empty() {
        text.push_str("\nTo know\n");
        let warnings = fitted.analysis.warnings.iter().map(|w| warning_sentences::sentence(w, units));
        for warning in warnings.chain(fitted.notes.iter().cloned()) {
            text.push_str(&wrapped("  - ", "    ", &warning));
        }
    }
    text.push('\n');
    text.push_str(&line(fitted, units));
    text.push('\n');
    text.push_str(&points(fitted.analysis, units));
    text.push('\n');
    text.push_str(&budget(fitted, units));
    text.push_str("\nCautions\n");
    for caution in BENCH {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text
}

/// The verdict and its reason in a few words: what goes to stderr with exit 1.
#[must_use]
pub fn verdict_line(fitted: &Fitted<'_>, units: &Units) -> String {
    format!("{}: {}", verdict_word(fitted), reason(fitted, units))
}

const fn verdict_word(fitted: &Fitted<'_>) -> &'static str {
    match &fitted.analysis.judgement {
        None => "NO VERDICT",
        Some(judgement) => match judgement.verdict {
            Verdict::Pass => "PASS",
            Verdict::Fail => "FAIL",
            Verdict::Undecided => "UNDECIDED",
            Verdict::None => "NO VERDICT",
        },
    }
}

/// The word for a verdict in JSON.
#[must_use]
pub fn verdict_name(analysis: &Analysis) -> &'static str {
    match analysis.judgement.as_ref().map_or(Verdict::None, |j| j.verdict) {
        Verdict::Pass => "pass",
        Verdict::Fail => "fail",
        Verdict::Undecided => "undecided",
        Verdict::None => "none",
    }
}

/// The name of a decision rule.
#[must_use]
pub const fn rule_name(rule: Rule) -> &'static str {
    match rule {
        Rule::Simple => "simple",
        Rule::Guarded => "guarded",
    }
}

/// Why a point is not used.
#[must_use]
pub fn why_not(point: &Point) -> Option<String> {
    match point.why_not.as_ref()? {
        WhyNot::NotChoked => {
            Some(format!("not choked: expected to have lost {} of its flow", percent(point.expected_loss)))
        }
        WhyNot::LeftOut(why) => Some(format!("left out: {why}")),
    }
}

/// The name of a row of the budget.
#[must_use]
pub const fn source_name(part: Part) -> &'static str {
    match part {
        Part::Random => "scatter of the points",
        Part::AmbientAsked => "ambient pressure asked for",
        Part::GasConversion => "gas conversion",
        Part::Common(source) => match source {
            Source::MeterGain => "meter gain",
            Source::MeterZero => "meter zero",
            Source::TransducerGain => "transducer gain",
            Source::TransducerZero => "transducer zero",
            Source::Barometer => "barometer",
            Source::GasTemperature => "gas temperature",
            Source::BackPressure => "back pressure",
            Source::MeterTemperature => "meter temperature",
            Source::MeterPressure => "meter pressure",
            Source::Humidity => "humidity",
            Source::WaterTemperature => "water temperature",
            Source::GasFactor => "gas factor",
            Source::FloatLaw => "law of the float",
        },
    }
}

fn head(fitted: &Fitted<'_>, units: &Units) -> String {
    let run = fitted.run;
    let mut text =
        wrapped("", "  ", &format!("{} — {}: {}", verdict_word(fitted), run.orifice, reason(fitted, units)));
    let who = run.technician.as_ref().map(|t| format!(", {t}")).unwrap_or_default();
    let purity = match (&run.purity, run.gas) {
        (Some(p), crate::gas::Species::Oxygen) => format!(" {} %", figures(p.fraction * 100.0, 3)),
        _ => String::new(),
    };
    text.push_str(&wrapped(
        "  ",
        "  ",
        &format!("{}{purity}, {}, taken {}{who}", run.gas.name(), run.purpose.name(), run.taken.to_rfc3339()),
    ));
    text
}

fn reason(fitted: &Fitted<'_>, units: &Units) -> String {
    let (Some(judgement), Some(acceptance)) = (&fitted.analysis.judgement, &fitted.run.acceptance) else {
        return "the run has no [acceptance] to be judged by".into();
    };
    let flow = &judgement.flow;
    let as_gas = as_gas(fitted, judgement);
    let (value, u) = value_and_u(units.flow(flow.flow_l_min), units.flow(flow.expanded()));
    let window = |l_min: f64| fixed(units.flow(l_min), decimals_of(&value));
    let place = format!(
        "{value} ± {u} {}{as_gas} at {} IP",
        units.flow_symbol(),
        units.pressure_text(acceptance.ip.as_bar())
    );
    let limits = format!("{} to {}", window(judgement.limits_l_min.0), window(judgement.limits_l_min.1));
    let by_flow = match (judgement.by_flow, acceptance.rule) {
        (Verdict::Pass, Rule::Guarded) => format!("{place} lies within {limits} with all its uncertainty"),
        (Verdict::Pass, Rule::Simple) => format!("{place} lies within {limits} (simple rule)"),
        (Verdict::Fail, Rule::Guarded) => format!("{place} lies outside {limits} with all its uncertainty"),
        (Verdict::Fail, Rule::Simple) => format!("{place} lies outside {limits} (simple rule)"),
        _ => format!("{place} is too near the limits {limits} for its uncertainty"),
    };
    let chance = format!("probability of conformity {}", probability(judgement.probability));
    format!("{by_flow}; {chance}{}{}", failed(judgement), doubts(judgement))
}

/// The gas of the judged flow, where it is not the run's.
pub(super) fn as_gas(fitted: &Fitted<'_>, judgement: &Judgement) -> String {
    if judgement.gas == fitted.run.gas { String::new() } else { format!(" as {}", judgement.gas.name()) }
}

/// What keeps a flow within the limits from passing, beside the checks.
fn doubts(judgement: &Judgement) -> String {
    if judgement.by_flow != Verdict::Pass {
        return String::new();
    }
    let one = |doubt: &Doubt| match doubt {
        Doubt::MeterGainUnknown => {
            "; but the flow meter's papers state no gain, so the uncertainty is too small to pass by"
        }
        Doubt::TransducerPapersUnknown => {
            "; but the transducer's papers state neither gain nor zero, so the uncertainty is too small to pass by"
        }
        Doubt::BeyondThePoints => "; but no point was taken as far as that pressure: take points there",
    };
    judgement.doubts.iter().map(one).collect()
}

fn failed(judgement: &Judgement) -> String {
    let names: Vec<&str> = judgement.failed_checks.iter().map(|k| name_key_unit(*k).0).collect();
    match (names.len(), judgement.verdict) {
        (0, _) => String::new(),
        (1, Verdict::Undecided) => format!("; but the check \"{}\" does not hold", names[0]),
        (1, _) => format!("; the check \"{}\" does not hold either", names[0]),
        (_, Verdict::Undecided) => format!("; but the checks \"{}\" do not hold", names.join("\", \"")),
        (_, _) => format!("; the checks \"{}\" do not hold either", names.join("\", \"")),
    }
}

fn decimals_of(text: &str) -> i32 {
    text.split_once('.').map_or(0, |(_, d)| i32::try_from(d.len()).unwrap_or(0))
}

fn flows(fitted: &Fitted<'_>, units: &Units) -> String {
    let run = fitted.run;
    let mut text = wrapped(
        "",
        "  ",
        &format!(
            "Flow of {}, STPD (0 °C, 101.325 kPa, dry), gas of {} {} at the orifice; U for 95 %",
            run.gas.name(),
            fixed(units.temperature(20.0), 0),
            units.temperature_symbol()
        ),
    );
    let row = |at: &FlowAtIp, flow: &FlowAt, gas: &str| {
        let (value, u) = value_and_u(units.flow(flow.flow_l_min), units.flow(flow.expanded()));
        let dof = if flow.dof.is_finite() { fixed(flow.dof, 0) } else { "infinite".into() };
        vec![
            fixed(units.pressure(at.ip.as_bar()), 2),
            shortest(units.pressure(at.ambient.as_bar()), 6),
            value,
            u,
            percent(flow.expanded() / flow.flow_l_min),
            fixed(flow.coverage_factor, 2),
            dof,
            gas.to_owned(),
        ]
    };
    let mut rows = Vec::new();
    for at in &fitted.analysis.flow_at {
        rows.push(row(at, &at.flow, run.gas.name()));
        if let Some(oxygen) = &at.as_oxygen {
            rows.push(row(at, oxygen, "as oxygen"));
        }
    }
    let (p, q) = (units.pressure_symbol(), units.flow_symbol());
    let gauge = format!("{p} gauge");
    text.push_str(&table(
        &["IP", "ambient", "flow", "± U", "U/flow", "k", "dof", "gas"],
        &[&gauge, p, q, q, "", "", "", ""],
        &rows,
        true,
    ));
    text
}

fn pressures(fitted: &Fitted<'_>, units: &Units) -> String {
    let ambient = fitted.analysis.flow_at.first().map_or(1.013_25, |at| at.ambient.as_bar());
    let mut text = wrapped(
        "",
        "  ",
        &format!(
            "IP for a flow of {} (STPD), at {} {} ambient; 95 % interval",
            fitted.run.gas.name(),
            shortest(units.pressure(ambient), 6),
            units.pressure_symbol()
        ),
    );
    let rows: Vec<Vec<String>> = fitted
        .analysis
        .ip_for
        .iter()
        .map(|ip| {
            let bar = |b: f64| if b.is_finite() { fixed(units.pressure(b), 3) } else { "no limit".into() };
            vec![
                figures(units.flow(ip.flow.as_l_min()), 4),
                bar(ip.ip_bar_gauge),
                bar(ip.interval_bar_gauge.0),
                bar(ip.interval_bar_gauge.1),
            ]
        })
        .collect();
    let gauge = format!("{} gauge", units.pressure_symbol());
    text.push_str(&table(
        &["flow", "IP", "from", "to"],
        &[units.flow_symbol(), &gauge, &gauge, &gauge],
        &rows,
        false,
    ));
    text
}

fn checks(fitted: &Fitted<'_>, units: &Units) -> String {
    let mut text = String::from("Checks\n");
    for check in &fitted.analysis.checks {
        let word = match check.verdict {
            CheckVerdict::Pass => "holds",
            CheckVerdict::Fail => "DOES NOT HOLD",
            CheckVerdict::Note => "note",
        };
        let first = format!("  {:<18}", name_key_unit(check.kind).0);
        let says = format!("{word}: {}", sentence(check, units));
        text.push_str(&wrapped(&first, &" ".repeat(20), &says));
    }
    text
}

fn line(fitted: &Fitted<'_>, units: &Units) -> String {
    let analysis = fitted.analysis;
    let total = analysis.line.total();
    let (p, q) = (units.pressure_symbol(), units.flow_symbol());
    let mut text = String::from("Line  q = α + β·p1, p1 absolute; u standard uncertainty, all sources\n");
    let (slope, slope_u) = value_and_u(units.slope(total.slope), units.slope(total.slope_u));
    let (intercept, intercept_u) = value_and_u(units.flow(total.intercept), units.flow(total.intercept_u));
    text.push_str(&format!("  slope β          {slope} {q} per {p}, u = {slope_u}\n"));
    text.push_str(&format!("  intercept α      {intercept} {q}, u = {intercept_u}\n"));
    let correlation = total.covariance / (total.slope_u * total.intercept_u);
    let used = analysis.points.iter().filter(|p| p.used()).count();
    text.push_str(&format!(
        "  correlation      {}; reduced chi-square {} with {} of {} points\n",
        fixed(correlation, 3),
        figures(total.reduced_chi_square().unwrap_or(f64::NAN), 2),
        used,
        analysis.points.len()
    ));
    if analysis.line.random_dof.is_finite() {
        text.push_str(&format!(
            "  random part      times {} (Birge), with {} degrees of freedom\n",
            figures(analysis.line.widened.sqrt(), 3),
            fixed(analysis.line.random_dof, 0)
        ));
    }
    text.push_str("  standard errors  those of ISO/TS 28037:2010, clause 7\n");
    let known = |found: Option<(f64, f64)>, unit: &str, remark: &str| match found {
        Some((value, u)) => {
            let (value, u) = value_and_u(value, u);
            format!("{value} {unit}, u = {u} ({remark})\n")
        }
        None => "not known: the flow does not rise with the pressure\n".to_owned(),
    };
    text.push_str("  effective hole   ");
    text.push_str(&known(analysis.effective_diameter_um, "µm", "discharge coefficient 1"));
    text.push_str("  conductance C    ");
    text.push_str(&known(analysis.sonic_conductance, "dm³/(s·bar) ANR", "ISO 6358"));
    let choke = &analysis.choke;
    // Value and interval to the same place: a hundredth while it is only bounded, a thousandth once measured.
    let places = if choke.origin == Origin::Measured { 3 } else { 2 };
    let b = fixed(choke.value, places);
    let origin = match choke.origin {
        Origin::Measured => "measured",
        Origin::Bounded => "only bounded",
    };
    let advice = match fitted.low_points {
        None => String::new(),
        Some(LowPoints::At(gauge)) => {
            let list: Vec<String> = gauge.iter().map(|g| fixed(units.pressure(*g), 2)).collect();
            format!("; points at {} {} gauge would settle it", list.join(", "), units.pressure_symbol())
        }
        Some(LowPoints::NotWithTheseInstruments) => {
            "; no plan of up to 24 low points is sure to settle it with these instruments".into()
        }
    };
    text.push_str(&wrapped(
        "  choke ratio b    ",
        "                   ",
        &format!(
            "{b}, {origin} (95 %: {} to {}){advice}",
            fixed(choke.interval_95.0, places),
            fixed(choke.interval_95.1, places)
        ),
    ));
    if let Some(mc) = fitted.monte_carlo {
        text.push_str(&monte_carlo(fitted, mc, units));
    }
    text
}

fn monte_carlo(fitted: &Fitted<'_>, mc: &MonteCarlo, units: &Units) -> String {
    let decimals = decimals_of(&value_and_u(units.flow(mc.mean), units.flow(mc.standard_uncertainty)).0) + 1;
    let interval = |i: (f64, f64)| {
        format!("{} to {}", fixed(units.flow(i.0), decimals), fixed(units.flow(i.1), decimals))
    };
    let outcome = if mc.agrees { "they agree" } else { "they differ by more than rounding" };
    let failed = if mc.failed > 0 { format!(", {} without a fit", mc.failed) } else { String::new() };
    wrapped(
        "  Monte Carlo      ",
        "                   ",
        &format!(
            "{} trials{failed}, seed {}: 95 % from {} {} at {} IP; by the budget {}: {outcome}",
            mc.trials,
            mc.seed,
            interval(mc.interval_95),
            units.flow_symbol(),
            units.pressure_text(fitted.analysis.nominal.ip.as_bar()),
            interval(mc.budget_interval_95)
        ),
    )
}

fn points(analysis: &Analysis, units: &Units) -> String {
    let (p, q) = (units.pressure_symbol(), units.flow_symbol());
    let mut text = String::from("Points  (u: random standard uncertainty; residual from the line)\n");
    let rows: Vec<Vec<String>> = analysis
        .points
        .iter()
        .map(|point| {
            let (pressure, pressure_u) =
                value_and_u(units.pressure(point.pressure_bar_abs), units.pressure(point.pressure_u));
            let (flow, flow_u) = value_and_u(units.flow(point.flow_l_min), units.flow(point.flow_u));
            let sweep = match point.sweep {
                Some(Sweep::Rising) => "up",
                Some(Sweep::Falling) => "down",
                None => "",
            };
            let residual = point.residual_l_min / (point.flow_l_min - point.residual_l_min) * 100.0;
            let why = match &point.why_not {
                None => String::new(),
                Some(WhyNot::NotChoked) => "not choked".into(),
                Some(WhyNot::LeftOut(why)) => format!("left out: {why}"),
            };
            vec![
                point.index.to_string(),
                pressure,
                pressure_u,
                flow,
                flow_u,
                if residual.is_finite() { fixed(residual, 2) } else { String::new() },
                sweep.into(),
                why,
            ]
        })
        .collect();
    let absolute = format!("{p} abs");
    text.push_str(&table(
        &["no", "p1", "u", "flow", "u", "resid.", "sweep", ""],
        &["", &absolute, p, q, q, "%", "", ""],
        &rows,
        true,
    ));
    text
}

fn budget(fitted: &Fitted<'_>, units: &Units) -> String {
    let nominal = &fitted.analysis.nominal;
    let head = format!(
        "Budget of the flow at {} IP, {} {} ambient; standard uncertainties",
        units.pressure_text(nominal.ip.as_bar()),
        shortest(units.pressure(nominal.ambient.as_bar()), 6),
        units.pressure_symbol()
    );
    let mut text = wrapped("", "  ", &head);
    let mut parts = nominal.flow.parts.clone();
    parts.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()));
    let total = nominal.flow.standard_uncertainty;
    let mut rows: Vec<Vec<String>> = parts
        .iter()
        .map(|(part, u, dof)| {
            vec![
                // What two steps of the arithmetic leave of nothing is nothing.
                if u.abs() < 1e-9 * total { "0".into() } else { u_alone(units.flow(u.abs())) },
                fixed(u * u / (total * total) * 100.0, 0),
                if dof.is_finite() { fixed(*dof, 0) } else { "infinite".into() },
                source_name(*part).to_owned(),
            ]
        })
        .collect();
    let dof = if nominal.flow.dof.is_finite() { fixed(nominal.flow.dof, 0) } else { "infinite".into() };
    rows.push(vec![u_alone(units.flow(total)), "100".into(), dof, "combined".into()]);
    text.push_str(&table(&["u", "share", "dof", "source"], &[units.flow_symbol(), "%", "", ""], &rows, true));
    text
}
