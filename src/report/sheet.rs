//! The one page a diver keeps beside the unit: who, which orifice, which IP, what it does, how deep, how to prove it.
//!
//! Comes in: a setting as reported. Goes out: text of 80 columns, under 90 lines. Where there is no setting the page says
//! so, large, with the reason, and names no IP at all. Left out: the table over IP, the budget, what was compared.

use super::layout::{WIDTH, wrapped};
use super::setting::Reported;
use super::setting_parts::{Line, another_day, depth_table, depths, drift, injected, lines, proof, water};
use super::setting_sentences::{against, why_not_without_ip};
use super::setting_words::{bar_on_gauge, data, ip_given, psi_on_gauge};
use super::{Units, setting_assumed};
use crate::setting::{Described, OrificeSetting, Warning};

/// Most rows of the table over depth on the page.
const MOST_DEPTHS: usize = 6;

/// The sheet, at most 80 columns wide.
#[must_use]
pub fn text(reported: &Reported<'_>, units: &Units) -> String {
    let mut text = head(reported);
    match reported.setting.recommended() {
        Some((orifice, described)) => text.push_str(&set(reported, orifice, described, units)),
        None => text.push_str(&none(reported, units)),
    }
    text.push_str(&ruled("CAUTIONS"));
    for caution in reported.cautions() {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text
}

/// A line across the page with a title in it.
fn ruled(title: &str) -> String {
    let rest = WIDTH.saturating_sub(title.chars().count() + 4);
    format!("-- {title} {}\n", "-".repeat(rest))
}

fn head(reported: &Reported<'_>) -> String {
    let setting = reported.setting;
    let mut text = format!("{}\n", "=".repeat(WIDTH));
    let diver = reported.diver.map_or_else(|| "no diver named".to_owned(), data);
    text.push_str(&wrapped(
        "  ",
        "  ",
        &format!("SETTING of the intermediate pressure (IP) for {diver}, {}", reported.on),
    ));
    let shown = setting.recommended().map(|(orifice, _)| orifice);
    for orifice in setting.orifices.iter().filter(|o| shown.is_none_or(|s| std::ptr::eq(s, *o))) {
        let from = reported.named(orifice).map_or_else(String::new, |n| format!(", {}", data(n.line)));
        text.push_str(&wrapped("  ", "    ", &format!("orifice {}{from}", orifice.orifice)));
    }
    if !reported.sessions.is_empty() {
        let sessions: Vec<String> = reported.sessions.iter().map(|s| data(s)).collect();
        text.push_str(&wrapped("  ", "    ", &format!("uptake from {}", sessions.join("; "))));
    }
    text.push_str(&format!("{}\n", "=".repeat(WIDTH)));
    text
}

/// A pressure large: bar and psi always.
fn large(label: &str, bar: f64, division_bar: f64) -> String {
    format!("  {label:<16}{:>8} bar {:>8} psi   gauge\n", bar_on_gauge(bar, division_bar), psi_on_gauge(bar))
}

fn despite(reported: &Reported<'_>) -> String {
    let needed = if reported.excused() { "" } else { " (nothing needed it)" };
    reported
        .despite()
        .map_or_else(String::new, |why| wrapped("  ", "    ", &format!("DESPITE{needed}: \"{why}\"")))
}

fn set(reported: &Reported<'_>, orifice: &OrificeSetting, described: &Described, units: &Units) -> String {
    let setting = reported.setting;
    let division = setting.used.gauge_division_bar;
    let mut text = String::from("\n");
    text.push_str(&large("SET", described.at.ip_bar_gauge, division));
    if let Some((_, never)) = reported.never_exceed() {
        text.push_str(&large("NEVER EXCEED", never, division));
    }
    text.push_str(&format!("  {:<16}prove it by flow on the assembled unit\n", "AND THEN"));
    text.push_str(&despite(reported));
    if let Some(judged) = &orifice.judged {
        let ip = ip_given(judged.described.at.ip_bar_gauge, units);
        let says: Vec<String> = judged.against.iter().map(|a| against(a, setting, units)).collect();
        let verdict = if says.is_empty() {
            "may be used".to_owned()
        } else {
            format!("NOT to be used: {}", says.join("; "))
        };
        text.push_str(&wrapped("  ", "    ", &format!("Judged: {ip} {verdict}")));
    }
    text.push('\n');
    text.push_str(&ruled("INJECTION, STPD (0 °C, 101.325 kPa, dry)"));
    text.push_str(&lines(&injected(reported, described, units)));
    text.push_str(&ruled("PO2 SINKS"));
    text.push_str(&lines(&drift(reported, described)));
    text.push_str(&ruled(&format!("DEPTH, {} water", water(described))));
    text.push_str(&lines(&depths(reported, described, units)));
    text.push_str(&depth_table(reported, described, units, MOST_DEPTHS));
    text.push_str(&ruled("PROOF, before the dive"));
    let mut proofs = proof(described, units);
    if described.expected_reading.is_none() {
        proofs.push((
            "flow meter",
            "none was named: measure the flow and compare with the injection above".to_owned(),
        ));
    }
    text.push_str(&lines(&proofs));
    text.push_str(&ruled("TAKEN (*: default, nobody gave it)"));
    text.push_str(&taken(reported, units));
    text.push_str(&marked(reported, orifice, units));
    text
}

/// The assumptions as one paragraph.
fn taken(reported: &Reported<'_>, units: &Units) -> String {
    let rows: Vec<String> = setting_assumed::rows(reported, units)
        .into_iter()
        .map(|row| format!("{}{} {}", row.name, if row.defaulted { "*" } else { "" }, row.text))
        .collect();
    wrapped("  ", "  ", &rows.join("; "))
}

/// The warnings that a reader of the page must have before the number; the rest stands in the text.
fn marked(reported: &Reported<'_>, orifice: &OrificeSetting, units: &Units) -> String {
    let setting = reported.setting;
    let on_page = |w: &&Warning| match w {
        // Said by other lines of the page already.
        Warning::GaugeErrorAssumed { .. }
        | Warning::IpSpreadAssumed { .. }
        | Warning::IpRepeatAssumed { .. }
        | Warning::WaterTemperatureUnknown
        | Warning::LoopVolumeUnknown
        | Warning::TrappedVolumeUnknown
        | Warning::ChokeRatioBounded
        | Warning::MeterOutOfRange
        | Warning::RangeLimits { .. } => false,
        Warning::UnusualPerKilogram { .. }
        | Warning::DespitePerKilogram { .. }
        | Warning::NeverJudged
        | Warning::DespiteFailed { .. }
        | Warning::DespiteUndecided { .. }
        | Warning::DespiteOverdue { .. }
        | Warning::ChokeModelFails
        | Warning::NotChokedAtSurface
        | Warning::DeeperThanConstant { .. }
        | Warning::StopsAboveMaxDepth { .. }
        | Warning::BeyondSpanAtDepth { .. }
        | Warning::LeanAtSurface { .. }
        | Warning::MeterWithoutGasFactor => true,
    };
    let says: String = setting
        .warnings
        .iter()
        .chain(&orifice.warnings)
        .filter(on_page)
        .map(|w| super::setting_sentences::warning(w, setting, units))
        .chain(reported.of_sessions(units))
        .chain(reported.notes.iter().map(|note| data(note)))
        .map(|says| wrapped("  ! ", "    ", &says))
        .collect();
    if says.is_empty() { says } else { format!("{}{says}", ruled("TO KNOW")) }
}

fn none(reported: &Reported<'_>, units: &Units) -> String {
    let setting = reported.setting;
    let edge = "#".repeat(WIDTH);
    let mut text = format!("\n{edge}\n{:^WIDTH$}", "N O   S E T T I N G").trim_end().to_owned();
    text.push_str(&format!("\n{edge}\n\n"));
    text.push_str("  NO SETTING. Do not dive with an IP of your own choice instead.\n\n");
    let why = reported.reasons(|why| why_not_without_ip(why, setting, units)).unwrap_or_default();
    let mut said: Vec<Line> = vec![("why", why)];
    if setting.uptake.is_some() {
        said.push(("uptake at rest", another_day(reported, units)));
    }
    text.push_str(&lines(&said));
    text.push_str(&despite(reported));
    text.push('\n');
    text
}
