//! What the plate of a setting says in words and numbers.
//!
//! Comes in: a setting, what is drawn. Goes out: [`Words`], each already cleaned of what cannot be drawn. Values are
//! rounded as the report does it, depths and pressures to be kept under are rounded down. Left out: tick labels and
//! legend.

use super::seen::{Mark, Marked, Seen, Whose, described};
use super::{Panels, SettingPlot};
use crate::gas::Water;
use crate::quantity::unit::Kind;
use crate::report::number::{figures, fixed, percent, shortest, value_and_u};
use crate::setting::{AtIp, FirstStageKind, Setting};

use super::super::letters::clean;
use super::super::number::short;

/// All texts but tick labels and legend.
pub(super) struct Words {
    /// Of the picture, for readers who do not see it.
    pub title: String,
    pub description: String,
    pub name: String,
    pub about: String,
    pub flow_axis: Vec<String>,
    pub surface_flow_axis: Vec<String>,
    pub depth_axis: Vec<String>,
    pub ambient_axis: Vec<String>,
    pub ip_axis: Vec<String>,
    pub other_ip_axis: Vec<String>,
    /// The IP to set, or that there is none.
    pub answer: String,
    pub is_setting: bool,
    /// The reason why there is none.
    pub why_not: String,
    /// What follows from the IP, a line each.
    pub facts: Vec<String>,
    pub never: Option<String>,
    pub judged: Option<String>,
    /// Orifices without a setting, by name.
    pub refused: Vec<String>,
    pub band: Option<String>,
    /// Each marked depth: beside its mark from the fullest to the shortest, and in the legend.
    pub marks: Vec<[String; 3]>,
    pub chosen_label: String,
    pub judged_label: String,
    pub never_label: String,
    pub max_depth_label: String,
    pub lowest: String,
    pub division: String,
    /// Said in the panel of depth where there is no curve.
    pub no_curve: &'static str,
    /// How to read it: in full, and for where there is little room.
    pub notes: [String; 2],
}

impl Words {
    pub(super) fn new(setting: &Setting, seen: &Seen, options: &SettingPlot, panels: Panels) -> Self {
        let units = &seen.units;
        let (flow, bar, metre) =
            (units.flow_symbol(), units.pressure_symbol(), units.unit(Kind::Length).symbol);
        let shown = described(setting);
        let orifice = shown
            .and_then(|(_, i, _)| setting.orifices.get(i))
            .or(setting.orifices.first())
            .map_or(String::new(), |o| clean(o.orifice.as_str()).trim().to_owned());
        let is_setting = seen.chosen.is_some() && setting.recommended.is_some();
        let ip = |ip: f64| format!("{}\u{a0}{bar}", pressure_down(ip, seen));
        let at = shown.map(|(_, _, d)| &d.at);
        let name = match panels {
            Panels::Both => "Setting",
            Panels::Depth => "Injection against depth",
            Panels::Ip => "Injection against IP",
        };
        let what = shown.map_or("no IP", |(whose, _, _)| match whose {
            Whose::Recommended => "the IP to set",
            Whose::Judged => "the IP judged",
            Whose::Fitting => "an IP that fits",
        });
        let mut words = Self {
            title: format!("{name}: orifice {orifice}, {what}"),
            description: String::new(),
            name: name.to_owned(),
            about: about(setting, &orifice),
            flow_axis: vec![format!("oxygen injected, {flow} STPD"), format!("{flow} STPD")],
            surface_flow_axis: vec![
                format!("oxygen injected at the surface, {flow} STPD"),
                format!("at the surface, {flow} STPD"),
                format!("{flow} STPD"),
            ],
            depth_axis: vec![format!("depth, {metre}")],
            ambient_axis: vec![format!("ambient pressure, {bar} absolute"), format!("{bar} absolute")],
            ip_axis: vec![
                format!("intermediate pressure as the gauge shows it, {bar} gauge"),
                format!("IP, {bar} gauge"),
            ],
            other_ip_axis: vec![
                format!("IP, {} gauge", other_pressure(seen).0),
                format!("{} gauge", other_pressure(seen).0),
            ],
            answer: match seen.chosen.filter(|_| is_setting) {
                Some(chosen) => format!("{} gauge", ip(chosen.ip)),
                None => "No setting".to_owned(),
            },
            is_setting,
            why_not: options.why_not.as_deref().map(|w| clean(w).trim().to_owned()).unwrap_or_default(),
            facts: if is_setting {
                at.map(|at| facts(at, seen, setting)).unwrap_or_default()
            } else {
                Vec::new()
            },
            never: seen.never.map(|never| format!("Never above {} gauge", ip(never))),
            judged: judged(setting, seen),
            refused: setting
                .orifices
                .iter()
                .filter(|o| o.answer.is_err())
                .map(|o| format!("{}: no setting", clean(o.orifice.as_str()).trim()))
                .collect(),
            band: seen.band.map(|b| {
                let (middle, half) = value_and_u(b.middle, 0.5 * (b.high - b.low));
                let decimals = half.split_once('.').map_or(0, |(_, d)| d.len()) as i32;
                format!(
                    "another day's uptake {middle}, 95\u{a0}%: {} to {} {flow}",
                    fixed(b.low, decimals),
                    fixed(b.high, decimals)
                )
            }),
            marks: seen.marks.iter().map(|m| mark(m, seen, setting)).collect(),
            chosen_label: seen.chosen.map_or(String::new(), |c| {
                let fitting = if is_setting { "set" } else { "would fit" };
                format!("{fitting} {}", ip(c.ip))
            }),
            judged_label: seen.judged.map_or(String::new(), |j| format!("judged {}\u{a0}{bar}", short(j.ip))),
            never_label: seen.never.map_or(String::new(), |n| format!("never above {}", ip(n))),
            max_depth_label: seen
                .max_depth
                .map_or(String::new(), |d| format!("max. depth {}\u{a0}{metre}", short(d))),
            lowest: shown.map_or(String::new(), |(_, _, d)| {
                format!("with the lowest likely choke ratio, {}", figures(d.depth.choke_ratio_low, 2))
            }),
            division: format!("small ticks: divisions of the gauge, {}\u{a0}{bar}", short(seen.division)),
            no_curve: "no setting: no curve against depth",
            notes: notes(seen, flow, panels),
        };
        words.description = describe(seen, &words, panels);
        words
    }
}

/// Symbol of the second axis of IP, and how many of its unit are one shown unit.
pub(super) fn other_pressure(seen: &Seen) -> (&'static str, f64) {
    let psi = |text: &str| crate::quantity::unit::lookup(Kind::Pressure, text).ok();
    let other = if seen.units.pressure_symbol() == "psi" { psi("bar") } else { psi("psi") };
    match other {
        Some(unit) => (unit.symbol, seen.units.pressure_pa() / unit.factor),
        None => ("Pa", seen.units.pressure_pa()),
    }
}

/// An IP with the digits of the gauge's division, rounded down, so that none is given too high.
fn pressure_down(ip: f64, seen: &Seen) -> String {
    let division = shortest(seen.division, 3);
    let decimals = division.split_once('.').map_or(0, |(_, d)| d.len()) as i32;
    // A division that is round in bar is none in another unit.
    let decimals = if seen.units.pressure_symbol() == "bar" { decimals } else { decimals.min(1) };
    let unit = libm::pow(10.0, f64::from(decimals));
    fixed(libm::floor(ip * unit + 1e-6) / unit, decimals)
}

/// A text whose numbers are not parted from their units at the end of a line.
fn together(text: &str) -> String {
    let mut text = text.to_owned();
    for unit in [" %", " L/min", " mL/min", " bar", " psi", " kPa", " m,", " ft,"] {
        text = text.replace(unit, &unit.replace(' ', "\u{a0}"));
    }
    text
}

/// A depth rounded down to a tenth, so that it is not given too deep.
fn rounded_down(depth: f64) -> String {
    let tenths = libm::floor(depth * 10.0 + 1e-6);
    fixed(tenths / 10.0, 1)
}

fn about(setting: &Setting, orifice: &str) -> String {
    let stage = match setting.used.first_stage {
        FirstStageKind::Uncompensated => "first stage not depth-compensated",
        FirstStageKind::Compensated => "first stage depth-compensated",
    };
    let water = match setting.used.water {
        Water::Sea => "sea water",
        Water::Fresh => "fresh water",
    };
    format!("orifice {orifice}, {stage}, {water}")
}

fn facts(at: &AtIp, seen: &Seen, setting: &Setting) -> Vec<String> {
    let units = &seen.units;
    let (value, u) = value_and_u(units.flow(at.surface.nominal_l_min), units.flow(at.surface.u_l_min));
    let u = if u.is_empty() { u } else { format!(", u\u{a0}=\u{a0}{u}") };
    let short_by = if at.shortfall_l_min.is_finite() {
        let (uptake, flow) = (setting.uptake.as_ref().map(|u| u.uptake_l_min), units.flow_symbol());
        let share = uptake.filter(|m| *m > 0.0).map(|m| at.shortfall_l_min / m);
        let share = share.map(|s| format!(" ({})", percent(s))).unwrap_or_default();
        format!(
            "Short of another day's uptake by {} {flow}{share}",
            figures(units.flow(at.shortfall_l_min), 2)
        )
    } else {
        String::new()
    };
    let held = if seen.compensated { seen.max_depth } else { None };
    let held = held
        .map(|d| format!(" at {}\u{a0}{}", short(d), units.unit(Kind::Length).symbol))
        .unwrap_or_default();
    let facts = [
        format!("Injects {value} {} STPD at the surface{u}", units.flow_symbol()),
        short_by,
        format!(
            "Chance of overfeed{held}: {}, held under {}",
            chance_up(at.overfeed_chance),
            percent(setting.used.chance)
        ),
    ];
    facts.iter().filter(|f| !f.is_empty() && !f.contains("NaN")).map(|f| together(f)).collect()
}

fn judged(setting: &Setting, seen: &Seen) -> Option<String> {
    let at = seen.judged?;
    let judged = setting.orifices.iter().find_map(|o| {
        let judged = o.judged.as_ref()?;
        let own = (seen.units.pressure(judged.described.at.ip_bar_gauge) - at.ip).abs() < 1e-9;
        own.then_some(judged)
    })?;
    let chance = judged.described.at.overfeed_chance;
    let chance = if chance.is_finite() { format!(", chance {}", chance_up(chance)) } else { String::new() };
    let against = match judged.against.len() {
        0 => "nothing speaks against it".to_owned(),
        1 => "one thing speaks against it".to_owned(),
        n => format!("{n} things speak against it"),
    };
    Some(together(&format!(
        "Judged: {}\u{a0}{} gauge injects {} {} STPD{chance}; {against}",
        short(at.ip),
        seen.units.pressure_symbol(),
        figures(at.flow, 3),
        seen.units.flow_symbol()
    )))
}

fn mark(mark: &Mark, seen: &Seen, setting: &Setting) -> [String; 3] {
    let metre = seen.units.unit(Kind::Length).symbol;
    let bar = format!("{}\u{a0}{} absolute", figures(mark.bar_abs, 3), seen.units.pressure_symbol());
    let limit = together(&percent(setting.used.chance));
    let at = format!("{}\u{a0}{metre}", rounded_down(mark.depth));
    match mark.marked {
        Marked::OnePercent => [
            format!("1\u{a0}% lost: {at}, {bar}"),
            format!("1\u{a0}%: {at}"),
            format!("choke limit, one per cent lost: {at}, {bar}"),
        ],
        Marked::Tenth => [
            format!("a tenth lost: {at}, {bar}"),
            format!("a tenth: {at}"),
            format!("a tenth lost: {at}, {bar}"),
        ],
        Marked::Stops => [
            format!("stops: {at}, {bar}"),
            format!("stops: {at}"),
            format!("flow stops, and can run back deeper: {at}, {bar}"),
        ],
        Marked::Chance => [
            format!("chance over {limit} from {at}"),
            format!("over {limit}: {at}"),
            format!("chance of overfeed passes {limit}: {at}, {bar}"),
        ],
        Marked::Crosses => [
            format!("best estimates cross: {at}"),
            format!("cross: {at}"),
            format!("best estimates cross, it overfeeds deeper: {at}, {bar}"),
        ],
    }
}

fn notes(seen: &Seen, flow: &str, panels: Panels) -> [String; 2] {
    let stpd = format!("{flow} STPD: 0\u{a0}°C, 101.325\u{a0}kPa, dry, oxygen.");
    let depth = match (panels.has_depth(), seen.compensated) {
        (false, _) => "",
        (true, false) => " The flow is constant only while choked; past the last depth gas can flow back.",
        (true, true) => " With a depth-compensated first stage the injection grows with depth.",
    };
    let rest = " Uptake at rest is the lowest demand. The setting never replaces watching PO2; raise it before ascent.";
    [format!("{stpd}{depth}{rest}"), format!("{flow} STPD. At rest only: keep watching PO2.")]
}

/// The picture in sentences.
fn describe(seen: &Seen, words: &Words, panels: Panels) -> String {
    let mut text = format!("{}. ", words.about);
    if words.is_setting {
        text.push_str(&format!("Set the IP to {}. ", words.answer));
    } else if words.why_not.is_empty() {
        text.push_str("There is no setting. ");
    } else {
        text.push_str(&format!("No setting: {}. ", words.why_not.trim_end_matches('.')));
    }
    let mut said: Vec<String> = words.facts.clone();
    said.extend(words.never.iter().chain(&words.judged).cloned());
    said.extend(words.refused.iter().cloned());
    if let Some(band) = &words.band {
        said.push(format!("Band: {band} STPD"));
    }
    if panels.has_depth() {
        said.extend(words.marks.iter().map(|m| m[2].clone()));
        if !words.max_depth_label.is_empty() {
            said.push(words.max_depth_label.clone());
        }
    }
    if panels.has_ip() && !seen.lines.is_empty() {
        let names: Vec<&str> = seen.lines.iter().map(|l| l.name.as_str()).collect();
        said.push(format!("Lines of {}", names.join(", ")));
    }
    for sentence in said {
        text.push_str(&format!("{sentence}. "));
    }
    text.trim_end().replace('\u{a0}', " ")
}

/// A chance that is worse the larger it is, rounded up to a tenth of a per cent.
fn chance_up(p: f64) -> String {
    if p > 0.99 {
        "over 99\u{a0}%".to_owned()
    } else if p < 0.001 {
        "under 0.1\u{a0}%".to_owned()
    } else {
        format!("{}\u{a0}%", fixed((1000.0 * p - 1e-6).ceil() / 10.0, 1))
    }
}
