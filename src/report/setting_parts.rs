//! What is said of one IP, part by part, as labelled lines: the text and the one-page sheet are made of them.
//!
//! Comes in: a setting with what it was asked by, and one IP described. Goes out: pairs of a label and a sentence.

use super::Units;
use super::layout::{table, wrapped};
use super::number::{fixed, shortest};
use super::setting::Reported;
use super::setting_sentences::{max_depth, water_name};
use super::setting_words::{
    chance, data, decimals_of, depth, depth_point, depth_shown, depth_symbol, down, injection, limit,
    minutes, rate, share_down, share_up, temperature, up, uptake,
};
use crate::bench::choke::Origin;
use crate::quantity::show::reference_to_text;
use crate::setting::{DepthPoint, DepthRow, Described, FirstStageKind, HYPOXIA_BAR, Patency, ReadingWindow};

/// A label and what stands behind it.
pub(super) type Line = (&'static str, String);

/// Columns of a label.
const LABEL: usize = 18;

/// Lines as text of 80 columns.
pub(super) fn lines(lines: &[Line]) -> String {
    lines
        .iter()
        .map(|(label, text)| wrapped(&format!("  {label:<LABEL$}"), &" ".repeat(LABEL + 2), text))
        .collect()
}

/// Injection, uptake, shortfall and chance.
pub(super) fn injected(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Line> {
    let (used, at) = (&reported.setting.used, &described.at);
    let (surface, held) = (&at.surface, &at.held);
    let (text, decimals) = injection(surface.nominal_l_min, surface.u_l_min, units);
    let symbol = units.flow_symbol();
    let rich = |l_min: f64| format!("{} {symbol}", up(units.flow(l_min), decimals));
    let lean = |l_min: f64| format!("{} {symbol}", down(units.flow(l_min), decimals));
    let mut lines = vec![
        (
            "injects",
            format!(
                "{text} at the surface (U, k = 2, about 95 %), gas of {}",
                temperature(used.nominal_k, units)
            ),
        ),
        (
            "at its richest",
            format!(
                "{}: IP risen by {}, gas of {}",
                rich(surface.richest_l_min),
                units.pressure_text(used.ip_spread_bar),
                temperature(used.coldest_k, units)
            ),
        ),
        (
            "at its leanest",
            format!("{}: gas of {}", lean(surface.leanest_l_min), temperature(used.warmest_k, units)),
        ),
    ];
    if used.first_stage == FirstStageKind::Compensated {
        lines.push((
            "at depth",
            format!(
                "at {}, where the chance is held: {} {symbol}, at its richest {}, at its leanest {}",
                max_depth(reported.setting, units),
                fixed(units.flow(held.nominal_l_min), decimals),
                rich(held.richest_l_min),
                lean(held.leanest_l_min)
            ),
        ));
    }
    lines.push(("uptake at rest", another_day(reported, units)));
    let gap = units.flow(at.shortfall_l_min.abs());
    let nominal = match &reported.setting.uptake {
        Some(uptake) if at.shortfall_l_min >= 0.0 => format!(
            "{} {symbol}, {} of that uptake",
            fixed(gap, decimals),
            share_down(at.shortfall_l_min / uptake.uptake_l_min)
        ),
        _ => format!("NONE: injects {} {symbol} more than that uptake", fixed(gap, decimals)),
    };
    let richest = short(at.least_shortfall, share_down);
    let leanest = short(at.largest_shortfall, share_up);
    let ends = format!("{richest} at its richest, {leanest} at its leanest");
    lines.push((
        "shortfall",
        if used.first_stage == FirstStageKind::Compensated {
            format!("{nominal}, at the surface; at {}: {ends}", max_depth(reported.setting, units))
        } else {
            format!("{nominal}; {ends}")
        },
    ));
    lines.push((
        "overfeeding",
        format!(
            "chance of {} that the richest injection exceeds another day's uptake ({} is allowed)",
            chance(at.overfeed_chance, used.chance),
            limit(used.chance)
        ),
    ));
    lines
}

/// A shortfall as a share, in percent; below nought it is too much.
pub(super) fn short(share: f64, rounded: impl Fn(f64) -> String) -> String {
    if share >= 0.0 { rounded(share) } else { format!("{} too much", share_up(-share)) }
}

/// Another day's uptake and where it comes from.
pub(super) fn another_day(reported: &Reported<'_>, units: &Units) -> String {
    let Some(resting) = &reported.setting.uptake else { return "not known".to_owned() };
    let from = reported.uptake.and_then(|u| u.lowest()).map_or_else(String::new, |(place, estimate)| {
        let days = estimate.next_day.days;
        format!("; {}, {days} day{} measured", place.place.name(), if days == 1 { "" } else { "s" })
    });
    format!("on another day {}{from}", uptake(resting, units))
}

/// How PO2 moves.
pub(super) fn drift(reported: &Reported<'_>, described: &Described) -> Vec<Line> {
    let used = &reported.setting.used;
    let Some(drift) = &described.at.drift else {
        return vec![("at rest", "not known, because the loop volume is not: give --loop-volume".to_owned())];
    };
    let (high, low) = (shortest(used.po2_high_bar, 4), shortest(used.po2_low_bar, 4));
    let moves = |bar_min: f64| {
        let verb = if bar_min < 0.0 { "sinks" } else { "RISES" };
        format!("{verb} by {} bar/min", rate(bar_min.abs()))
    };
    let sealed = drift.sealed_bar_min.map_or_else(String::new, |bar_min| {
        format!("; in a sealed loop at the surface and {low} bar by {} bar/min", rate(bar_min.abs()))
    });
    let mut lines =
        vec![("at rest", format!("PO2 {} in a loop held by diluent{sealed}", moves(drift.held_bar_min)))];
    lines.push((
        "",
        drift.minutes_high_to_low.map_or_else(
            || "PO2 does not sink: this is no setting to rest with".to_owned(),
            |m| format!("from {high} to {low} bar in {} min", minutes(m)),
        ),
    ));
    lines.push((
        "at work",
        drift.minutes_to_hypoxia_at_work.map_or_else(
            || "the injection covers the work stated".to_owned(),
            |m| {
                format!(
                    "of {} L/min: from {low} to {HYPOXIA_BAR} bar in {} min if nobody adds oxygen; sooner on ascent",
                    shortest(used.work_l_min, 4),
                    minutes(m)
                )
            },
        ),
    ));
    lines.push((
        "",
        format!(
            "best estimates with a loop of {} L; no uncertainty is worked out for them",
            shortest(used.loop_volume_l.unwrap_or(f64::NAN), 4)
        ),
    ));
    lines
}

/// What depth does.
pub(super) fn depths(reported: &Reported<'_>, described: &Described, units: &Units) -> Vec<Line> {
    let (used, limits) = (&reported.setting.used, &described.depth);
    let at = |point: Option<DepthPoint>| match point {
        None => "nowhere within what is known".to_owned(),
        Some(point) if point.depth_m <= 0.0 => "the surface already".to_owned(),
        Some(point) => depth_point(&point, units),
    };
    let known = match limits.choke_ratio_origin {
        Origin::Measured => "measured by the bench run",
        Origin::Bounded => "only bounded by the bench run, not measured",
    };
    let choke = (
        "choke ratio",
        format!(
            "{known}; the depths where 1 % and a tenth are lost take {}, the lower end of its 95 % interval",
            fixed(limits.choke_ratio_low, 2)
        ),
    );
    match limits.first_stage {
        FirstStageKind::Uncompensated => {
            let error_bar = used.gauge_error_expanded_bar;
            let moved = used.depth_of(used.dive_at_bar_abs + error_bar);
            let gauge = format!(
                "the depths take the IP for true: a gauge that is off by {} moves the last by {} {}",
                units.pressure_text(error_bar),
                up(depth_shown(moved, units), 0),
                depth_symbol(units)
            );
            vec![
                ("flow constant to", format!("{}: there 1 % of it is lost", at(limits.one_percent))),
                ("a tenth lost at", at(limits.nine_tenths)),
                ("stops at", format!("{}: below, gas can flow back", at(limits.stops))),
                choke,
                ("gauge", gauge),
            ]
        }
        FirstStageKind::Compensated => {
            let end = limits.known_to_m.unwrap_or(0.0);
            let from = |m: Option<f64>, happens: &str, else_not: &str| {
                m.map_or_else(
                    || format!("{else_not} above {}, to where anything is known", depth(end, units)),
                    |m| format!("from {} on {happens}", depth(m, units)),
                )
            };
            let over = format!("the chance is over {}", limit(used.chance));
            let not_over = format!("the chance stays within {}", limit(used.chance));
            vec![
                ("overfeeds", from(limits.overtakes_at_m, &over, &not_over)),
                (
                    "best estimates",
                    from(
                        limits.overtakes_at_best_estimate_m,
                        "the injection exceeds the uptake",
                        "the injection stays below the uptake",
                    ),
                ),
                ("known to", format!("{}: 10 % beyond what the bench run measured", depth(end, units))),
                ("choked to", format!("{}: there 1 % of the flow is lost", at(limits.one_percent))),
                choke,
            ]
        }
    }
}

/// Injection over depth as a table of about `most` rows.
pub(super) fn depth_table(
    reported: &Reported<'_>,
    described: &Described,
    units: &Units,
    most: usize,
) -> String {
    let (used, limits) = (&reported.setting.used, &described.depth);
    let compensated = limits.first_stage == FirstStageKind::Compensated;
    let (_, decimals) = injection(described.at.surface.nominal_l_min, described.at.surface.u_l_min, units);
    let mut rows: Vec<Vec<String>> = thinned(&limits.rows, most)
        .map(|row| {
            let mut cells = vec![
                down(depth_shown(row.depth_m, units), 0),
                fixed(row.ambient_bar_abs, 2),
                fixed(units.flow(row.injection_l_min), decimals),
                down(units.flow(row.lowest_l_min), decimals),
            ];
            if compensated {
                cells.push(chance(row.chance, used.chance));
            }
            cells.push(if row.beyond_span { "beyond the bench run" } else { "" }.to_owned());
            cells
        })
        .collect();
    // Of two rows at the same shown depth the deeper stays: there is less left.
    let shown: Vec<String> = rows.iter().filter_map(|cells| cells.first().cloned()).collect();
    let mut at = 0;
    rows.retain(|_| {
        at += 1;
        shown.get(at) != shown.get(at - 1)
    });
    let q = units.flow_symbol();
    let (mut heads, mut symbols) =
        (vec!["depth", "ambient", "injects", "low b"], vec![depth_symbol(units), "bar abs", q, q]);
    if compensated {
        heads.push("chance");
        symbols.push("");
    }
    heads.push("");
    symbols.push("");
    table(&heads, &symbols, &rows, true)
}

/// The first, the last and some between.
fn thinned(rows: &[DepthRow], most: usize) -> impl Iterator<Item = &DepthRow> {
    let last = rows.len().saturating_sub(1);
    let step = last.div_ceil(most.saturating_sub(1).max(1)).max(1);
    // A row next to the last would only crowd it.
    rows.iter()
        .enumerate()
        .filter_map(move |(i, row)| (i == last || (i % step == 0 && (last - i) * 2 >= step)).then_some(row))
}

/// The check with the contents gauge, and the flow a meter should show.
pub(super) fn proof(described: &Described, units: &Units) -> Vec<Line> {
    let mut lines = Vec::new();
    if let Some(patency) = &described.patency {
        lines.push(("does gas flow?", patency_sentence(patency, units)));
    }
    if let Some(reading) = &described.expected_reading {
        let name = reading.meter.as_ref().map_or_else(|| "the meter".to_owned(), |id| data(id.as_str()));
        let litres = reading.reads_at.map_or_else(
            || "the volume that passes, gas of 20 °C".to_owned(),
            |at| format!("litres of {}", reference_to_text(at)),
        );
        lines.push((
            "flow meter",
            format!("{name} ({}, {litres}), on the assembled unit at the surface:", reading.kind),
        ));
        lines.push(("", format!("full cylinder: {}", window(&reading.full, units))));
        lines.push(("", format!("nearly empty: {}", window(&reading.nearly_empty, units))));
        if reading.out_of_range {
            lines.push(("", "which leaves the range of that meter".to_owned()));
        }
    }
    lines
}

fn patency_sentence(patency: &Patency, units: &Units) -> String {
    let decimals = if patency.seconds < 20.0 { 1 } else { 0 };
    format!(
        "shut the cylinder valve: from {} to {} the contents gauge takes {} s, {} s to {} s (95 %). Sooner: a leak or a \
         larger hole. Later: a blockage. Either way do not dive",
        units.pressure_text(patency.from_bar),
        units.pressure_text(patency.to_bar),
        fixed(patency.seconds, decimals),
        up(patency.low_seconds, decimals),
        down(patency.high_seconds, decimals)
    )
}

/// A reading with the window that proves the setting.
pub(super) fn window(window: &ReadingWindow, units: &Units) -> String {
    let value = super::number::figures(units.flow(window.value_l_min), 3);
    let decimals = decimals_of(&value);
    let symbol = units.flow_symbol();
    if window.high_l_min < window.low_l_min {
        return format!("{value} {symbol}, and no reading would prove the setting");
    }
    format!(
        "{value} {symbol}, proved by {} to {} {symbol}",
        up(units.flow(window.low_l_min), decimals),
        down(units.flow(window.high_l_min), decimals)
    )
}

/// The water by name.
pub(super) const fn water(described: &Described) -> &'static str {
    water_name(described.depth.water)
}
