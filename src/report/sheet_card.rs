//! What the printed sheet says, part by part: the words of the text sheet, cut into the pieces that are laid on a card.
//!
//! Comes in: a setting as reported. Goes out: a [`Card`] of plain texts. Every warning and every caution is there in full,
//! since a card that is laminated has no second source beside it. Left out: where anything stands (`plot`, `certificate`),
//! what was compared, the budget.

use super::Units;
use super::number::{fixed, shortest};
use super::setting::Reported;
use super::setting_parts::{Line, another_day, short, window};
use super::setting_sentences::{against, max_depth, water_name, why_not_without_ip};
use super::setting_words::{
    bar_on_gauge, chance, data, depth, depth_shown, depth_symbol, down, first_stage, injection, ip_given,
    limit, minutes, psi_on_gauge, rate, share_down, share_up, temperature, up,
};
use crate::bench::choke::Origin;
use crate::quantity::show::reference_to_text;
use crate::setting::{DepthPoint, Described, FirstStageKind, HYPOXIA_BAR, METHOD_REVISION, OrificeSetting};

/// Rows of the table over IP on each side of the setting.
const AROUND: usize = 1;
/// Most sessions that are named; more are counted.
const MOST_SESSIONS: usize = 4;

/// The sheet as pieces of text.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Card {
    /// What it is, for whom.
    pub title: String,
    /// Orifice and run, sessions, the day it holds for, method revision: a line each.
    pub about: Vec<String>,
    /// The numbers that matter; none where there is no setting.
    pub large: Vec<Large>,
    /// Why there is no setting.
    pub none: Option<String>,
    /// Everything else about the IP to set.
    pub parts: Vec<Part>,
    /// The table over IP, and that of depths.
    pub tables: Vec<CardTable>,
    /// The reason given for going on all the same, the judgement asked for, every warning.
    pub to_know: Vec<String>,
    /// The cautions.
    pub cautions: Vec<String>,
}

/// A number to be read at arm's length.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Large {
    /// What it is.
    pub label: &'static str,
    /// The number with its unit.
    pub number: String,
    /// The same in another unit, or its uncertainty.
    pub beside: String,
    /// Whether passing it is dangerous.
    pub limit: bool,
}

/// Sentences under a title.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Part {
    /// What they are of.
    pub title: String,
    /// Label, which may be empty, and sentence.
    pub facts: Vec<(&'static str, String)>,
}

/// A table.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CardTable {
    /// What it is of.
    pub title: String,
    /// Head and unit of each column.
    pub heads: Vec<(&'static str, String)>,
    /// As many cells as columns.
    pub rows: Vec<Vec<String>>,
    /// The row that stands out.
    pub strong: Option<usize>,
    /// What has to be known to read it.
    pub notes: Vec<String>,
}

/// The pieces of the sheet.
#[must_use]
pub fn card(reported: &Reported<'_>, units: &Units) -> Card {
    let setting = reported.setting;
    let diver = reported.diver.map_or_else(|| "no diver named".to_owned(), data);
    let mut card = Card {
        title: format!("Setting of the intermediate pressure (IP) for {diver}"),
        about: about(reported),
        to_know: to_know(reported, units),
        cautions: reported.cautions().iter().map(|caution| (*caution).to_owned()).collect(),
        ..Card::default()
    };
    match setting.recommended() {
        Some((orifice, described)) => {
            card.large = large(reported, described, units);
            card.parts = parts(reported, described, units);
            card.tables = vec![ip_table(reported, orifice, units), depth_table(reported, described, units)];
        }
        None => {
            card.none =
                Some(reported.reasons(|why| why_not_without_ip(why, setting, units)).unwrap_or_default());
            if setting.uptake.is_some() {
                let facts = vec![("uptake at rest", another_day(reported, units))];
                card.parts = vec![Part { title: "Uptake, STPD (0 °C, 101.325 kPa, dry)".to_owned(), facts }];
            }
        }
    }
    card
}

fn about(reported: &Reported<'_>) -> Vec<String> {
    let setting = reported.setting;
    let shown = setting.recommended().map(|(orifice, _)| orifice);
    let mut lines: Vec<String> = setting
        .orifices
        .iter()
        .filter(|o| shown.is_none_or(|s| std::ptr::eq(s, *o)))
        .map(|orifice| {
            let from = reported.named(orifice).map_or_else(String::new, |n| format!(", {}", data(n.line)));
            format!("orifice {}{from}", orifice.orifice)
        })
        .collect();
    let holds = format!("holds on {}; method revision {}", reported.on, METHOD_REVISION);
    match lines.as_mut_slice() {
        [one] => one.push_str(&format!("; {holds}")),
        _ => lines.push(holds),
    }
    let sessions: Vec<String> = reported.sessions.iter().map(|s| data(s)).collect();
    match sessions.as_slice() {
        [] => {}
        few if few.len() <= MOST_SESSIONS => lines.push(format!("uptake from {}", few.join("; "))),
        many => {
            let (first, last) =
                (many.first().cloned().unwrap_or_default(), many.last().cloned().unwrap_or_default());
            lines.push(format!("uptake from {} sessions, {first} to {last}", many.len()));
        }
    }
    lines
}

fn large(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Large> {
    let division = reported.setting.used.gauge_division_bar;
    let pressure = |label, bar, limit| Large {
        label,
        number: format!("{} bar", bar_on_gauge(bar, division)),
        beside: format!("{} psi, gauge", psi_on_gauge(bar)),
        limit,
    };
    let mut large = vec![pressure("set", described.at.ip_bar_gauge, false)];
    large.extend(reported.never_exceed().map(|(_, bar)| pressure("never exceed", bar, true)));
    let surface = &described.at.surface;
    let (text, _) = injection(surface.nominal_l_min, surface.u_l_min, units);
    let (number, beside) = text.split_once(" ± ").map_or_else(
        || (text.clone(), "STPD".to_owned()),
        |(value, u)| {
            let symbol = units.flow_symbol();
            (format!("{value} {symbol}"), format!("± {} STPD, k = 2", u.trim_end_matches(symbol).trim()))
        },
    );
    large.push(Large { label: "injects", number, beside, limit: false });
    large
}

fn parts(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Part> {
    let part = |title: &str, facts| Part { title: title.to_owned(), facts };
    let mut proofs = proof(described, units);
    proofs.extend(choke_and_gauge(reported, described, units));
    vec![
        part("Injection, STPD (0 °C, 101.325 kPa, dry)", injected(reported, described, units)),
        part("PO2 sinks", drift(reported, described)),
        part("Proof, before the dive", proofs),
    ]
}

/// As in the text sheet, without what the large numbers say.
fn injected(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Line> {
    let (setting, used, at) = (reported.setting, &reported.setting.used, &described.at);
    let decimals = injection(at.surface.nominal_l_min, at.surface.u_l_min, units).1;
    let rich = |l_min: f64| up(units.flow(l_min), decimals);
    let lean = |l_min: f64| down(units.flow(l_min), decimals);
    let symbol = units.flow_symbol();
    let (warm, cold) = (temperature(used.warmest_k, units), temperature(used.coldest_k, units));
    let (of_warm, of_cold) = if warm == cold {
        (String::new(), format!("), gas of {cold}"))
    } else {
        (format!(" (gas of {warm})"), format!(", gas of {cold})"))
    };
    let mut facts = vec![(
        "from",
        format!(
            "{} at its leanest{of_warm} to {} {symbol} at its richest (IP up by {}{of_cold}",
            lean(at.surface.leanest_l_min),
            rich(at.surface.richest_l_min),
            units.pressure_text(used.ip_spread_bar)
        ),
    )];
    let compensated = used.first_stage == FirstStageKind::Compensated;
    if compensated {
        facts.push((
            "at depth",
            format!(
                "at {}: {} {symbol}, {} to {}",
                max_depth(setting, units),
                fixed(units.flow(at.held.nominal_l_min), decimals),
                lean(at.held.leanest_l_min),
                rich(at.held.richest_l_min)
            ),
        ));
    }
    facts.push(("uptake at rest", another_day(reported, units)));
    let nominal = match &setting.uptake {
        Some(uptake) if at.shortfall_l_min >= 0.0 => share_down(at.shortfall_l_min / uptake.uptake_l_min),
        _ => "NONE".to_owned(),
    };
    let place = if compensated { format!("at {}: ", max_depth(setting, units)) } else { String::new() };
    facts.push((
        "short by",
        format!(
            "{nominal} ({place}{} richest, {} leanest)",
            short(at.least_shortfall, share_down),
            short(at.largest_shortfall, share_up)
        ),
    ));
    facts.push((
        "overfeeds",
        format!(
            "with a chance of {}; {} is allowed",
            chance(at.overfeed_chance, used.chance),
            limit(used.chance)
        ),
    ));
    facts
}

fn drift(reported: &Reported<'_>, described: &Described) -> Vec<Line> {
    let used = &reported.setting.used;
    let Some(drift) = &described.at.drift else {
        return vec![("at rest", "not known, because the loop volume is not: give --loop-volume".to_owned())];
    };
    let (high, low) = (shortest(used.po2_high_bar, 4), shortest(used.po2_low_bar, 4));
    let verb = if drift.held_bar_min < 0.0 { "sinks" } else { "RISES" };
    let sealed = drift.sealed_bar_min.map_or_else(String::new, |bar_min| {
        format!(", {} sealed at the surface and {low} bar", rate(bar_min.abs()))
    });
    let rest = drift.minutes_high_to_low.map_or_else(
        || "PO2 does not sink: this is no setting to rest with".to_owned(),
        |m| format!("{high} to {low} bar in {} min", minutes(m)),
    );
    let work = drift.minutes_to_hypoxia_at_work.map_or_else(
        || "the injection covers it".to_owned(),
        |m| {
            format!(
                "from {low} to {HYPOXIA_BAR} bar in {} min if nobody adds oxygen; sooner on ascent",
                minutes(m)
            )
        },
    );
    vec![
        (
            "at rest",
            format!(
                "{verb} by {} bar/min in a loop of {} L held by diluent{sealed}; {rest} (best estimates)",
                rate(drift.held_bar_min.abs()),
                shortest(used.loop_volume_l.unwrap_or(f64::NAN), 4)
            ),
        ),
        ("at work", format!("of {} L/min: {work}", shortest(used.work_l_min, 4))),
    ]
}

/// The check with the contents gauge, and the flow a meter should show.
fn proof(described: &Described, units: &Units) -> Vec<Line> {
    let mut facts = Vec::new();
    if let Some(patency) = &described.patency {
        let decimals = if patency.seconds < 20.0 { 1 } else { 0 };
        facts.push((
            "does gas flow?",
            format!(
                "valve shut, {} to {} takes {} s, {} s to {} s (95 %). Sooner: a leak or larger hole; later: a \
                 blockage. Either way do not dive",
                units.pressure_text(patency.from_bar),
                units.pressure_text(patency.to_bar),
                fixed(patency.seconds, decimals),
                up(patency.low_seconds, decimals),
                down(patency.high_seconds, decimals)
            ),
        ));
    }
    let Some(reading) = &described.expected_reading else {
        facts.push((
            "flow meter",
            "none was named: measure the flow on the assembled unit and compare".to_owned(),
        ));
        return facts;
    };
    let name = reading.meter.as_ref().map_or_else(|| "the meter".to_owned(), |id| data(id.as_str()));
    let litres = reading.reads_at.map_or_else(
        || "the volume that passes, gas of 20 °C".to_owned(),
        |at| format!("litres of {}", reference_to_text(at)),
    );
    let range = if reading.out_of_range { "; that leaves its range" } else { "" };
    facts.push((
        "flow meter",
        format!(
            "{name} ({}, {litres}): {}; cylinder nearly empty: {}{range}",
            reading.kind,
            window(&reading.full, units),
            window(&reading.nearly_empty, units)
        ),
    ));
    facts
}

fn choke_and_gauge(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Line> {
    let (used, limits) = (&reported.setting.used, &described.depth);
    let low = fixed(limits.choke_ratio_low, 2);
    // Where it is only bounded a warning says what that means.
    let known = match limits.choke_ratio_origin {
        Origin::Measured => "measured",
        Origin::Bounded => "bounded",
    };
    let mut facts = vec![("choke ratio", format!("{known}; depths take its low end, {low}"))];
    match limits.first_stage {
        FirstStageKind::Uncompensated => {
            let error_bar = used.gauge_error_expanded_bar;
            let moved = used.depth_of(used.dive_at_bar_abs + error_bar);
            facts.push((
                "gauge",
                format!(
                    "off by {}, the flow stops {} {} elsewhere",
                    units.pressure_text(error_bar),
                    up(depth_shown(moved, units), 0),
                    depth_symbol(units)
                ),
            ));
        }
        FirstStageKind::Compensated => facts.extend(limits.known_to_m.map(|end| {
            ("known to", format!("{}: 10 % beyond what the bench run measured", depth(end, units)))
        })),
    }
    facts
}

fn ip_table(reported: &Reported<'_>, orifice: &OrificeSetting, units: &Units) -> CardTable {
    let used = &reported.setting.used;
    let set = orifice.answer.as_ref().ok();
    let decimals = set.map_or(4, |d| injection(d.at.surface.nominal_l_min, d.at.surface.u_l_min, units).1);
    let is = |bar: f64, at: f64| (bar - at).abs() < 1e-9;
    let centre = set
        .and_then(|d| orifice.table.iter().position(|at| is(d.at.ip_bar_gauge, at.ip_bar_gauge)))
        .unwrap_or(0);
    let from = centre.saturating_sub(AROUND);
    let to = orifice.table.len().min(centre + AROUND + 1);
    let or_dash = |text: Option<String>| text.unwrap_or_else(|| "–".to_owned());
    let rows = orifice.table.get(from..to).unwrap_or_default().iter().map(|at| {
        let share = at.shortfall_l_min / (at.shortfall_l_min + at.surface.nominal_l_min);
        let drift = at.drift.as_ref();
        let too_high = orifice.never_exceed_ip_bar_gauge.is_none_or(|most| at.ip_bar_gauge > most + 1e-9);
        let is_set = set.is_some_and(|d| is(d.at.ip_bar_gauge, at.ip_bar_gauge));
        vec![
            bar_on_gauge(at.ip_bar_gauge, used.gauge_division_bar),
            psi_on_gauge(at.ip_bar_gauge),
            fixed(units.flow(at.surface.nominal_l_min), decimals),
            share_down(share).trim_end_matches(" %").to_owned(),
            chance(at.overfeed_chance, used.chance).trim_end_matches(" %").to_owned(),
            or_dash(drift.map(|d| rate(d.held_bar_min).replace('-', "\u{2212}"))),
            or_dash(drift.and_then(|d| d.minutes_high_to_low).map(minutes)),
            or_dash(drift.and_then(|d| d.minutes_to_hypoxia_at_work).map(minutes)),
            if is_set {
                "set"
            } else if too_high {
                "NO"
            } else {
                ""
            }
            .to_owned(),
        ]
    });
    let (high, low) = (shortest(used.po2_high_bar, 4), shortest(used.po2_low_bar, 4));
    let held = match used.first_stage {
        FirstStageKind::Uncompensated => String::new(),
        FirstStageKind::Compensated => format!(" at {}", max_depth(reported.setting, units)),
    };
    let head = |head, unit: &str| (head, unit.to_owned());
    CardTable {
        title: "Drift of PO2, IP by IP".to_owned(),
        heads: vec![
            head("IP", "bar"),
            head("IP", "psi"),
            head("injects", units.flow_symbol()),
            head("short", "%"),
            head("chance", "%"),
            head("PO2", "bar/min"),
            head("rest", "min"),
            head("work", "min"),
            head("", ""),
        ],
        rows: rows.collect(),
        strong: Some(centre - from),
        notes: vec![format!(
            "short of uptake; chance to overfeed{held}; rest: PO2 {high} to {low} bar; work of {} L/min: {low} to \
             {HYPOXIA_BAR} bar",
            shortest(used.work_l_min, 4)
        )],
    }
}

fn depth_table(reported: &Reported<'_>, described: &Described, units: &Units) -> CardTable {
    let (used, limits) = (&reported.setting.used, &described.depth);
    let symbol = depth_symbol(units);
    let point = |what: &str, point: Option<DepthPoint>| {
        let (m, bar) = match point {
            None => ("unknown".to_owned(), "–".to_owned()),
            Some(point) if point.depth_m <= 0.0 => ("surface".to_owned(), down(point.ambient_bar_abs, 1)),
            Some(point) => (down(depth_shown(point.depth_m, units), 0), down(point.ambient_bar_abs, 1)),
        };
        vec![what.to_owned(), m, bar]
    };
    let from = |what: &str, m: Option<f64>| {
        let shown = m.map_or_else(
            || match limits.known_to_m {
                Some(end) => format!("not to {}", down(depth_shown(end, units), 0)),
                None => "unknown".to_owned(),
            },
            |m| down(depth_shown(m, units), 0),
        );
        vec![what.to_owned(), shown, String::new()]
    };
    let rows = match limits.first_stage {
        FirstStageKind::Uncompensated => vec![
            point("1 % of the flow lost", limits.one_percent),
            point("a tenth lost", limits.nine_tenths),
            point("flow stops", limits.stops),
        ],
        FirstStageKind::Compensated => vec![
            from("overfeeds (chance)", limits.overtakes_at_m),
            from("overfeeds (best estimate)", limits.overtakes_at_best_estimate_m),
            point("1 % of the flow lost", limits.one_percent),
        ],
    };
    let stage = reported.first_stage.map_or_else(String::new, |name| format!("{}, ", data(name)));
    let mut note = format!("first stage {stage}{}", first_stage(limits.first_stage));
    if used.max_depth_m.is_some() {
        note.push_str(&format!("; maximum depth {}", max_depth(reported.setting, units)));
    }
    CardTable {
        title: format!("Depth, {} water", water_name(limits.water)),
        heads: vec![("", String::new()), ("depth", symbol.to_owned()), ("ambient", "bar abs".to_owned())],
        rows,
        strong: None,
        notes: vec![note],
    }
}

/// The reason given for going on all the same, what was judged, and every warning.
fn to_know(reported: &Reported<'_>, units: &Units) -> Vec<String> {
    let setting = reported.setting;
    let needed = if reported.excused() { "" } else { " (nothing needed it)" };
    let despite = reported.despite().map(|why| format!("DESPITE{needed}: \u{201C}{why}\u{201D}"));
    let judged = setting.orifices.iter().filter_map(|orifice| {
        let judged = orifice.judged.as_ref()?;
        let says: Vec<String> = judged.against.iter().map(|a| against(a, setting, units)).collect();
        let verdict = if says.is_empty() {
            "may be used".to_owned()
        } else {
            format!("NOT to be used: {}", says.join("; "))
        };
        let ip = ip_given(judged.described.at.ip_bar_gauge, units);
        Some(format!("Judged: {ip} through {} {verdict}", orifice.orifice))
    });
    despite
        .into_iter()
        .chain(judged)
        .chain(reported.warnings(units))
        .chain(reported.notes.iter().map(|note| data(note)))
        .collect()
}
