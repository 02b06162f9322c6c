//! A setting as a diver reads it: the IP to set and the one never to exceed first, then injection, drift, depth, proof.
//!
//! Comes in: a setting, what it was asked with, the runs behind its orifices. Goes out: text of 80 columns, and the
//! reason where there is no setting. Left out: the one page to keep (`sheet`), and the document (`setting_json`).

use chrono::NaiveDate;

use super::layout::{counted, table, wrapped};
use super::number::{figures, fixed, u_alone};
use super::setting_parts::{depth_table, depths, drift, injected, lines, proof, water};
use super::setting_sentences::{against, max_depth, source_name, warning, why_not as refusal};
use super::setting_words::{
    bar_on_gauge, chance, data, diameter, injection, ip_given, ip_on_gauge, minutes, psi_on_gauge, rate,
    share_down,
};
use super::{Units, cautions, session_uptake, setting_assumed, warning_sentences};
use crate::bench::Analysis;
use crate::bench::Warning as BenchWarning;
use crate::entry::Run;
use crate::setting::{
    AtIp, Described, FirstStageKind, HYPOXIA_BAR, Judged, LARGEST_SHORTFALL, OrificeSetting, Setting,
    SettingOptions, Warning, WhyNot,
};
use crate::uptake::Uptake;

/// Most rows of the table over IP in the text.
const MOST_ROWS: usize = 12;
/// Most rows of the table over depth in the text.
const MOST_DEPTHS: usize = 9;

/// The run an orifice's line comes from.
#[derive(Debug, Clone, Copy)]
pub struct OrificeNamed<'a> {
    /// In words: "run R0003 of 2026-11-12, accepted", or "file cmf-0417.toml, passed by its own limits".
    pub line: &'a str,
    /// The run.
    pub run: &'a Run,
    /// Its analysis.
    pub analysis: &'a Analysis,
}

/// Everything that is said of a setting.
#[derive(Debug, Clone, Copy)]
pub struct Reported<'a> {
    /// The setting.
    pub setting: &'a Setting,
    /// What it was asked with.
    pub options: &'a SettingOptions,
    /// The orifices, in the order of the setting's.
    pub orifices: &'a [OrificeNamed<'a>],
    /// The diver's name.
    pub diver: Option<&'a str>,
    /// The sessions in words: "S0001 of 2026-11-20, couch".
    pub sessions: &'a [String],
    /// The uptake they gave.
    pub uptake: Option<&'a Uptake>,
    /// Why they gave none.
    pub uptake_why_not: Option<&'a str>,
    /// The first stage in the register.
    pub first_stage: Option<&'a str>,
    /// The day of the setting, by which calibrations are in date or not.
    pub on: NaiveDate,
    /// What was said on reading the files.
    pub notes: &'a [String],
}

impl<'a> Reported<'a> {
    /// The judged IP that stands first: that of the recommended orifice, else of the first that has one.
    pub(super) fn judged(&self) -> Option<(&'a OrificeSetting, &'a Judged)> {
        let all = &self.setting.orifices;
        let recommended = self.setting.recommended.and_then(|index| all.get(index));
        let mut order = recommended.into_iter().chain(all);
        order.find_map(|orifice| orifice.judged.as_ref().map(|judged| (orifice, judged)))
    }

    /// What depth, proof and table are given for: the recommended IP, else the judged one.
    pub(super) fn described(&self) -> Option<(&'a OrificeSetting, &'a Described)> {
        self.setting
            .recommended()
            .or_else(|| self.judged().map(|(orifice, judged)| (orifice, &judged.described)))
    }

    /// The orifice whose table and limit are given where none is recommended or judged.
    pub(super) fn shown(&self) -> Option<&'a OrificeSetting> {
        let all = &self.setting.orifices;
        self.described().map(|(orifice, _)| orifice).or_else(|| all.iter().find(|o| !o.table.is_empty()))
    }

    /// The orifice and the IP never to exceed with it: of the recommended one, else of the first that has one.
    pub(super) fn never_exceed(&self) -> Option<(&'a OrificeSetting, f64)> {
        let with = |orifice: &'a OrificeSetting| Some((orifice, orifice.never_exceed_ip_bar_gauge?));
        match self.setting.recommended() {
            Some((orifice, _)) => with(orifice),
            None => self.setting.orifices.iter().find_map(with),
        }
    }

    /// The reason given for going on all the same.
    pub(super) fn despite(&self) -> Option<String> {
        let text = self.options.despite.as_deref().map(data)?;
        (!text.is_empty()).then_some(text)
    }

    /// The run behind an orifice.
    pub(super) fn named(&self, orifice: &OrificeSetting) -> Option<&'a OrificeNamed<'a>> {
        let index = self.setting.orifices.iter().position(|o| std::ptr::eq(o, orifice))?;
        self.orifices.get(index)
    }

    /// Why there is no setting, the reason of each orifice where they differ.
    pub(super) fn reasons(&self, say: impl Fn(&WhyNot) -> String) -> Option<String> {
        let setting = self.setting;
        if setting.recommended.is_some() {
            return None;
        }
        let first = setting.why_not.as_ref()?;
        if let (WhyNot::NoUptake, Some(why)) = (first, self.uptake_why_not) {
            return Some(format!("{}. The sessions: {}", say(first), data(why)));
        }
        let refused = || setting.orifices.iter().filter_map(|o| Some((o, o.answer.as_ref().err()?)));
        if refused().all(|(_, why)| why == first) {
            return Some(say(first));
        }
        let each: Vec<String> = refused().map(|(o, why)| format!("{}: {}", o.orifice, say(why))).collect();
        Some(each.join("; "))
    }

    /// Every warning as a sentence, those of an orifice with its name where there are several.
    pub(super) fn warnings(&self, units: &Units) -> Vec<String> {
        let setting = self.setting;
        let mut all: Vec<String> = setting.warnings.iter().map(|w| warning(w, setting, units)).collect();
        for orifice in &setting.orifices {
            let name =
                if setting.orifices.len() > 1 { format!("{}: ", orifice.orifice) } else { String::new() };
            all.extend(orifice.warnings.iter().map(|w| format!("{name}{}", warning(w, setting, units))));
            let bench =
                self.named(orifice).map(|named| named.analysis.warnings.as_slice()).unwrap_or_default();
            let told = |w: &&BenchWarning| !matches!(w, BenchWarning::ChokeModelFails);
            all.extend(
                bench
                    .iter()
                    .filter(told)
                    .map(|w| format!("{name}in its bench run: {}", warning_sentences::sentence(w, units))),
            );
        }
        all.extend(self.of_sessions(units));
        all
    }

    /// What the sessions behind the uptake warn of: most of it reads high, and a setting by it is too rich.
    pub(super) fn of_sessions(&self, units: &Units) -> Vec<String> {
        // A name alone; what stands behind it in a list of sessions is its date and place.
        let short = |words: &String| words.split(" of ").next().unwrap_or(words).to_owned();
        let names: Vec<String> = self.sessions.iter().map(short).collect();
        self.uptake.map(|uptake| session_uptake::behind(uptake, &names, units)).unwrap_or_default()
    }

    /// The warnings that a setting was made in spite of.
    pub(super) fn excused(&self) -> bool {
        let despite = |w: &Warning| {
            matches!(
                w,
                Warning::DespitePerKilogram { .. }
                    | Warning::DespiteFailed { .. }
                    | Warning::DespiteUndecided { .. }
                    | Warning::DespiteOverdue { .. }
            )
        };
        let mut orifices = self.setting.orifices.iter().flat_map(|o| &o.warnings);
        self.setting.warnings.iter().any(despite) || orifices.any(despite)
    }

    /// The cautions that stand beside it.
    pub(super) fn cautions(&self) -> Vec<&'static str> {
        let own: &[&str] = match self.setting.used.first_stage {
            FirstStageKind::Uncompensated => &cautions::SETTING_UNCOMPENSATED,
            FirstStageKind::Compensated => &[cautions::SETTING_COMPENSATED],
        };
        cautions::SETTING.iter().chain(own).copied().collect()
    }
}

/// The setting as text, 80 columns wide.
#[must_use]
pub fn text(reported: &Reported<'_>, units: &Units) -> String {
    let setting = reported.setting;
    let mut text = head(reported, units);
    let mut section = |title: &str, body: &str| {
        if !body.is_empty() {
            text.push_str(&format!("\n{}{body}", wrapped("", "  ", title)));
        }
    };
    if let Some((_, described)) = setting.recommended() {
        section(INJECTION, &lines(&injected(reported, described, units)));
        section("How PO2 sinks", &lines(&drift(reported, described)));
    }
    for orifice in &setting.orifices {
        if let Some(judged) = &orifice.judged {
            section(&judged_title(orifice, judged, units), &judgement(reported, judged, units));
        }
    }
    if let Some((orifice, described)) = reported.described() {
        let at = given_or_set(reported, described, units);
        section(
            &format!("Depth, {} water, {at} through {}", water(described), orifice.orifice),
            &(lines(&depths(reported, described, units))
                + &depth_table(reported, described, units, MOST_DEPTHS)),
        );
        section(&format!("Proof before a dive, {at} set"), &lines(&proof(described, units)));
    }
    if let Some(orifice) = reported.shown() {
        section(&table_title(reported, orifice, units), &ip_table(reported, orifice, units));
    }
    if setting.orifices.len() > 1 {
        section("Orifices", &comparison(reported, units));
    }
    section("What was taken (default: nobody gave it)", &assumed(reported, units));
    if let Some((orifice, described)) = reported.described() {
        let title = format!(
            "Budget of the injection at the surface, {} through {}; standard uncertainties",
            given_or_set(reported, described, units),
            orifice.orifice
        );
        section(&title, &budget(described, units));
    }
    let to_know = reported.warnings(units).into_iter().chain(reported.notes.iter().map(|n| data(n)));
    section("To know", &to_know.map(|says| wrapped("  - ", "    ", &says)).collect::<String>());
    section("Cautions", &reported.cautions().iter().map(|c| wrapped("  - ", "    ", c)).collect::<String>());
    text
}

/// The setting in one sentence.
#[must_use]
pub fn summary_line(reported: &Reported<'_>, units: &Units) -> String {
    let setting = reported.setting;
    let ip = |bar: f64| ip_on_gauge(bar, setting.used.gauge_division_bar, units);
    match setting.recommended() {
        Some((orifice, described)) => {
            let (injected, _) =
                injection(described.at.surface.nominal_l_min, described.at.surface.u_l_min, units);
            let never = orifice
                .never_exceed_ip_bar_gauge
                .map_or_else(String::new, |bar| format!(", never above {}", ip(bar)));
            format!(
                "set {} gauge through {}{never}: injects {injected} STPD (k = 2), {} less than the resting uptake of \
                 another day",
                ip(described.at.ip_bar_gauge),
                orifice.orifice,
                share_down(
                    described.at.shortfall_l_min
                        / (described.at.shortfall_l_min + described.at.surface.nominal_l_min)
                ),
            )
        }
        None => {
            let why = reported.reasons(|why| refusal(why, setting, units)).unwrap_or_default();
            format!("no setting: {why}")
        }
    }
}

/// Why there is no setting, or what speaks against the IP to be judged: what goes to stderr with exit 1.
#[must_use]
pub fn why_not(reported: &Reported<'_>) -> Option<String> {
    let units = Units::default();
    let setting = reported.setting;
    let none = reported.reasons(|why| refusal(why, setting, &units)).map(|why| format!("no setting: {why}"));
    let judged = reported.options.judge.is_some().then(|| judged_against(reported, &units)).flatten();
    let all: Vec<String> = none.into_iter().chain(judged).collect();
    (!all.is_empty()).then(|| all.join("; "))
}

/// Whether an orifice is recommended and, where an IP was to be judged, nothing speaks against it with any orifice.
#[must_use]
pub fn favourable(reported: &Reported<'_>) -> bool {
    let setting = reported.setting;
    let fits = |o: &OrificeSetting| o.judged.as_ref().is_some_and(|judged| judged.against.is_empty());
    let may_be_used = reported.options.judge.is_none() || setting.orifices.iter().all(fits);
    setting.recommended().is_some() && may_be_used
}

/// What speaks against the judged IP, orifice by orifice.
fn judged_against(reported: &Reported<'_>, units: &Units) -> Option<String> {
    let setting = reported.setting;
    let ip = ip_given(reported.options.judge?.as_bar(), units);
    let mut all = Vec::new();
    for orifice in &setting.orifices {
        match &orifice.judged {
            Some(judged) if judged.against.is_empty() => {}
            Some(judged) => {
                let says: Vec<String> = judged.against.iter().map(|a| against(a, setting, units)).collect();
                all.push(format!("{ip} through {}: {}", orifice.orifice, says.join("; ")));
            }
            None => all.push(format!("{ip} through {}: the orifice may not be used", orifice.orifice)),
        }
    }
    (!all.is_empty()).then(|| all.join("; "))
}

/// Title of the part on injection.
const INJECTION: &str = "Injection and uptake, L/min STPD (0 °C, 101.325 kPa, dry), pure oxygen";

fn head(reported: &Reported<'_>, units: &Units) -> String {
    let setting = reported.setting;
    let used = &setting.used;
    let ip = |bar: f64| ip_on_gauge(bar, used.gauge_division_bar, units);
    let mut text = match setting.recommended() {
        Some((orifice, described)) => wrapped(
            "",
            "  ",
            &format!("SET {} gauge through {}", ip(described.at.ip_bar_gauge), orifice.orifice),
        ),
        None => {
            let why = reported.reasons(|why| refusal(why, setting, units)).unwrap_or_default();
            wrapped("", "  ", &format!("NO SETTING: {why}"))
        }
    };
    if let Some((orifice, bar)) = reported.never_exceed() {
        let whose =
            if setting.recommended.is_some() { String::new() } else { format!(" with {}", orifice.orifice) };
        text.push_str(&wrapped("", "  ", &format!("NEVER EXCEED {} gauge{whose}", ip(bar))));
    } else if setting.recommended.is_none() && reported.shown().is_some() {
        text.push_str(&wrapped(
            "",
            "  ",
            "NO IP IS LOW ENOUGH: even the lowest measured one exceeds the allowed chance",
        ));
    }
    if let Some(why) = reported.despite() {
        let needed = if reported.excused() { "" } else { " (nothing needed it)" };
        text.push_str(&wrapped("", "  ", &format!("DESPITE{needed}: \"{why}\"")));
    }
    let diver = reported.diver.map_or_else(String::new, |diver| format!("for {}, ", data(diver)));
    text.push_str(&wrapped("  ", "  ", &format!("{diver}on {}", reported.on)));
    for orifice in &setting.orifices {
        let from = reported.named(orifice).map_or_else(String::new, |n| format!(": {}", data(n.line)));
        text.push_str(&wrapped("  ", "  ", &format!("orifice {}{from}", orifice.orifice)));
    }
    if !reported.sessions.is_empty() {
        let sessions: Vec<String> = reported.sessions.iter().map(|s| data(s)).collect();
        let count = counted(sessions.len() as u64, "session");
        text.push_str(&wrapped("  ", "  ", &format!("uptake from {count}: {}", sessions.join("; "))));
    }
    if setting.recommended.is_some() {
        text.push_str(&wrapped(
            "  ",
            "  ",
            "rounded down to what the gauge can show; bar and psi are the same pressure, psi rounded down as well",
        ));
    }
    text
}

/// The IP of a description, as the gauge shows it or as it was given.
fn given_or_set(reported: &Reported<'_>, described: &Described, units: &Units) -> String {
    let bar = described.at.ip_bar_gauge;
    if reported.setting.recommended().is_some_and(|(_, set)| std::ptr::eq(set, described)) {
        ip_on_gauge(bar, reported.setting.used.gauge_division_bar, units)
    } else {
        ip_given(bar, units)
    }
}

fn judged_title(orifice: &OrificeSetting, judged: &Judged, units: &Units) -> String {
    let verdict = if judged.against.is_empty() { "may be used" } else { "NOT TO BE USED" };
    format!(
        "Judged: {} gauge through {}: {verdict}",
        ip_given(judged.described.at.ip_bar_gauge, units),
        orifice.orifice
    )
}

fn judgement(reported: &Reported<'_>, judged: &Judged, units: &Units) -> String {
    let mut text: String = judged
        .against
        .iter()
        .map(|a| wrapped("  - ", "    ", &against(a, reported.setting, units)))
        .collect();
    text.push_str(&lines(&injected(reported, &judged.described, units)));
    text.push_str(&lines(&drift(reported, &judged.described)));
    text
}

fn table_title(reported: &Reported<'_>, orifice: &OrificeSetting, units: &Units) -> String {
    let used = &reported.setting.used;
    let minutes = if used.loop_volume_l.is_some() {
        format!(
            "; rest: minutes from PO2 {} to {} bar; work: minutes from {} to {HYPOXIA_BAR} bar at {} L/min if nobody \
             adds oxygen, sooner on ascent",
            used.po2_high_bar, used.po2_low_bar, used.po2_low_bar, used.work_l_min
        )
    } else {
        String::new()
    };
    let place = match used.first_stage {
        FirstStageKind::Uncompensated => String::new(),
        FirstStageKind::Compensated => format!(" at {}", max_depth(reported.setting, units)),
    };
    format!(
        "IP by IP through {} (gauge; injection STPD, best estimate at the surface; chance to overfeed{place}{minutes})",
        orifice.orifice
    )
}

/// Rows around the setting, at most [`MOST_ROWS`].
fn ip_table(reported: &Reported<'_>, orifice: &OrificeSetting, units: &Units) -> String {
    let used = &reported.setting.used;
    let described = reported.described().map(|(_, described)| described);
    let shown = orifice.answer.as_ref().ok().or(described);
    let decimals = shown.map_or(4, |d| injection(d.at.surface.nominal_l_min, d.at.surface.u_l_min, units).1);
    let centre = shown.map(|d| d.at.ip_bar_gauge).or(orifice.never_exceed_ip_bar_gauge);
    let with_drift = used.loop_volume_l.is_some();
    let rows: Vec<Vec<String>> = around(&orifice.table, centre)
        .iter()
        .map(|at| {
            let share = at.shortfall_l_min / (at.shortfall_l_min + at.surface.nominal_l_min);
            let mut cells = vec![
                bar_on_gauge(at.ip_bar_gauge, used.gauge_division_bar),
                psi_on_gauge(at.ip_bar_gauge),
                fixed(units.flow(at.surface.nominal_l_min), decimals),
                fixed(units.flow(at.shortfall_l_min), decimals),
                share_down(share).trim_end_matches(" %").to_owned(),
                chance(at.overfeed_chance, used.chance).trim_end_matches(" %").to_owned(),
            ];
            if with_drift {
                let drift = at.drift.as_ref();
                let or_dash = |m: Option<f64>| m.map_or_else(|| "-".to_owned(), minutes);
                cells.push(drift.map_or_else(|| "-".to_owned(), |d| rate(d.held_bar_min)));
                cells.push(or_dash(drift.and_then(|d| d.minutes_high_to_low)));
                cells.push(or_dash(drift.and_then(|d| d.minutes_to_hypoxia_at_work)));
            }
            cells.push(mark(reported.setting, orifice, at).to_owned());
            cells
        })
        .collect();
    let q = units.flow_symbol();
    let mut heads = vec!["IP", "IP", "injects", "short", "short", "chance"];
    let mut symbols = vec!["bar", "psi", q, q, "%", "%"];
    if with_drift {
        heads.extend(["drift", "rest", "work"]);
        symbols.extend(["bar/min", "min", "min"]);
    }
    heads.push("");
    symbols.push("");
    table(&heads, &symbols, &rows, true)
}

/// What a row of the table is, or what speaks against it.
fn mark(setting: &Setting, orifice: &OrificeSetting, at: &AtIp) -> &'static str {
    let is = |bar: f64| (bar - at.ip_bar_gauge).abs() < 1e-9;
    if orifice.answer.as_ref().is_ok_and(|d| is(d.at.ip_bar_gauge)) {
        "set"
    } else if orifice.never_exceed_ip_bar_gauge.is_none_or(|most| at.ip_bar_gauge > most + 1e-9) {
        "NO"
    } else if at.largest_shortfall > LARGEST_SHORTFALL {
        "too lean"
    } else if at.least_shortfall < setting.used.shortfall {
        "too rich"
    } else {
        ""
    }
}

/// The rows nearest to a pressure.
fn around(rows: &[AtIp], centre: Option<f64>) -> &[AtIp] {
    let nearest = centre.map_or(rows.len() / 2, |bar| rows.partition_point(|at| at.ip_bar_gauge < bar));
    let last_start = rows.len().saturating_sub(MOST_ROWS);
    let start = nearest.saturating_sub(MOST_ROWS / 2).min(last_start);
    rows.get(start..rows.len().min(start + MOST_ROWS)).unwrap_or_default()
}

fn comparison(reported: &Reported<'_>, units: &Units) -> String {
    let setting = reported.setting;
    let mut text = String::new();
    for (index, orifice) in setting.orifices.iter().enumerate() {
        let size = diameter(orifice.effective_diameter_um, units);
        let says = match &orifice.answer {
            Ok(described) => {
                let at = &described.at;
                let first = if setting.recommended == Some(index) { "recommended; " } else { "" };
                format!(
                    "{first}{}, injects {}, at its leanest short by {}, chance {}",
                    ip_on_gauge(at.ip_bar_gauge, setting.used.gauge_division_bar, units),
                    injection(at.surface.nominal_l_min, at.surface.u_l_min, units).0,
                    super::setting_words::share_up(at.largest_shortfall),
                    chance(at.overfeed_chance, setting.used.chance)
                )
            }
            Err(why) => format!("does not fit: {}", refusal(why, setting, units)),
        };
        text.push_str(&wrapped(
            "  ",
            "    ",
            &format!("{} (effective diameter {size}): {says}", orifice.orifice),
        ));
    }
    text
}

fn assumed(reported: &Reported<'_>, units: &Units) -> String {
    setting_assumed::rows(reported, units)
        .iter()
        .map(|row| {
            let default = if row.defaulted { " (default)" } else { "" };
            wrapped(&format!("  {:<18}", row.name), &" ".repeat(20), &format!("{}{default}", row.text))
        })
        .collect()
}

fn budget(described: &Described, units: &Units) -> String {
    let total = described.at.surface.u_l_min;
    let mut parts = described.budget.clone();
    parts.sort_by(|a, b| b.1.total_cmp(&a.1));
    let share = |u: f64| if total > 0.0 { fixed(100.0 * u * u / (total * total), 0) } else { "0".to_owned() };
    let shown = |u: f64| if u > 1e-9 * total { u_alone(units.flow(u)) } else { "0".to_owned() };
    let mut rows: Vec<Vec<String>> =
        parts.iter().map(|(source, u)| vec![shown(*u), share(*u), source_name(*source).to_owned()]).collect();
    rows.push(vec![shown(total), share(total), "combined".to_owned()]);
    let text = table(&["u", "share", "source"], &[units.flow_symbol(), "%", ""], &rows, true);
    let relative = figures(100.0 * total / described.at.surface.nominal_l_min, 2);
    let beside = format!(
        "u is {relative} % of the injection; the upward spread of the IP is added whole, not in here"
    );
    text + &wrapped("  ", "  ", &beside)
}
