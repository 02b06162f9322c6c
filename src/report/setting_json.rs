//! `setting --json`: the document of the interface. Keys may be added, never renamed.

use serde::Serialize;

use super::number::Plain;
use super::setting::Reported;
use super::setting_assumed::Assumed;
use super::setting_sentences::{against, first_stage_name, source_name, water_name, why_not};
use super::setting_words::{INJECTION_COVERAGE, data, psi, uptake_interval};
use super::{Units, json_text};
use crate::bench::choke::Origin;
use crate::quantity::show::reference_to_text;
use crate::setting::{
    AtIp, DepthPoint, Described, ExpectedReading, Injected, Judged, METHOD_REVISION, OrificeSetting, Patency,
    ReadingWindow, RestingUptake, Setting,
};

/// Revision of the document.
const FORMAT: u32 = 1;

/// The document, indented, with a newline at its end.
#[must_use]
pub fn document(reported: &Reported<'_>) -> String {
    json_text(&json(reported))
}

/// The document. Flows are L/min STPD; `u` is standard, `expanded` at about 95 %; what is not known is `null`.
#[must_use]
pub fn json(reported: &Reported<'_>) -> impl Serialize + use<> {
    Document::of(reported)
}

#[derive(Serialize)]
struct Document {
    format: u32,
    method: u32,
    diver: Option<String>,
    on: String,
    first_stage: Option<String>,
    sessions: Vec<String>,
    uptake: Option<JsonUptake>,
    recommended: Option<At>,
    why_not: Option<String>,
    judged: Option<JsonJudged>,
    never_exceed_ip_bar_gauge: Option<Plain>,
    never_exceed_ip_psi_gauge: Option<Plain>,
    never_exceed_orifice: Option<String>,
    depth: Option<Depth>,
    table: Vec<Row>,
    table_orifice: Option<String>,
    patency: Option<JsonPatency>,
    expected_reading: Option<Reading>,
    orifices: Vec<JsonOrifice>,
    assumed: Assumed,
    despite: Option<String>,
    warnings: Vec<String>,
    notes: Vec<String>,
}

#[derive(Serialize)]
struct JsonUptake {
    uptake_l_min: Plain,
    u: Plain,
    degrees_of_freedom: Option<Plain>,
    interval_95: [Plain; 2],
}

/// An IP and what it does.
#[derive(Serialize)]
struct At {
    orifice: String,
    ip_bar_gauge: Plain,
    ip_psi_gauge: Plain,
    /// At the surface, nominal.
    injection_l_min: Plain,
    injection_u: Plain,
    injection_expanded: Plain,
    coverage_factor: Plain,
    shortfall_l_min: Plain,
    least_shortfall: Plain,
    largest_shortfall: Plain,
    overfeed_chance: Plain,
    po2_drift_bar_min: Option<Plain>,
    po2_drift_sealed_bar_min: Option<Plain>,
    minutes_high_to_low: Option<Plain>,
    minutes_to_hypoxia_at_work: Option<Plain>,
    surface: JsonInjected,
    /// Where the chance is held: at the maximum depth for a compensated first stage, else at the surface.
    held: JsonInjected,
    budget: Vec<Budget>,
}

#[derive(Serialize)]
struct JsonInjected {
    nominal_l_min: Plain,
    u: Plain,
    richest_l_min: Plain,
    leanest_l_min: Plain,
}

#[derive(Serialize)]
struct Budget {
    source: &'static str,
    u_l_min: Plain,
}

#[derive(Serialize)]
struct JsonJudged {
    verdict: &'static str,
    against: Vec<String>,
    #[serde(flatten)]
    at: At,
    depth: Depth,
    patency: Option<JsonPatency>,
    expected_reading: Option<Reading>,
}

#[derive(Serialize)]
struct Depth {
    at_ip_bar_gauge: Plain,
    first_stage: &'static str,
    water: &'static str,
    one_percent_at_m: Option<Plain>,
    nine_tenths_at_m: Option<Plain>,
    stops_at_m: Option<Plain>,
    one_percent_at_bar_abs: Option<Plain>,
    nine_tenths_at_bar_abs: Option<Plain>,
    stops_at_bar_abs: Option<Plain>,
    choke_ratio_origin: &'static str,
    choke_ratio_low: Plain,
    overtakes_at_m: Option<Plain>,
    overtakes_at_best_estimate_m: Option<Plain>,
    known_to_m: Option<Plain>,
    rows: Vec<DepthJson>,
}

#[derive(Serialize)]
struct DepthJson {
    depth_m: Plain,
    ambient_bar_abs: Plain,
    injection_l_min: Plain,
    lowest_l_min: Plain,
    overfeed_chance: Plain,
    beyond_span: bool,
}

#[derive(Serialize)]
struct Row {
    ip_bar_gauge: Plain,
    ip_psi_gauge: Plain,
    injection_l_min: Plain,
    injection_u: Plain,
    shortfall_l_min: Plain,
    overfeed_chance: Plain,
    po2_drift_bar_min: Option<Plain>,
    minutes_high_to_low: Option<Plain>,
    minutes_to_hypoxia_at_work: Option<Plain>,
    held_l_min: Plain,
    richest_l_min: Plain,
    leanest_l_min: Plain,
}

#[derive(Serialize)]
struct JsonPatency {
    from_bar: Plain,
    to_bar: Plain,
    seconds: Plain,
    low: Plain,
    high: Plain,
}

#[derive(Serialize)]
struct Reading {
    meter: String,
    kind: &'static str,
    reads_at: String,
    /// At a full cylinder, as set.
    value: Plain,
    unit: &'static str,
    low: Plain,
    high: Plain,
    nearly_empty: Window,
    out_of_range: bool,
}

#[derive(Serialize)]
struct Window {
    value: Plain,
    low: Plain,
    high: Plain,
}

#[derive(Serialize)]
struct JsonOrifice {
    orifice: String,
    line: Option<String>,
    fits: bool,
    why_not: Option<String>,
    ip_bar_gauge: Option<Plain>,
    ip_psi_gauge: Option<Plain>,
    injection_l_min: Option<Plain>,
    injection_u: Option<Plain>,
    overfeed_chance: Option<Plain>,
    never_exceed_ip_bar_gauge: Option<Plain>,
    effective_diameter_um: Plain,
    choke_ratio_interval_95: Option<[Plain; 2]>,
    judged: Option<OrificeJudged>,
}

#[derive(Serialize)]
struct OrificeJudged {
    ip_bar_gauge: Plain,
    verdict: &'static str,
    against: Vec<String>,
}

impl Document {
    fn of(reported: &Reported<'_>) -> Self {
        let units = Units::default();
        let setting = reported.setting;
        let never = reported.never_exceed();
        let described = reported.described();
        let shown = reported.shown();
        Self {
            format: FORMAT,
            method: METHOD_REVISION,
            diver: reported.diver.map(str::to_owned),
            on: reported.on.to_string(),
            first_stage: reported.first_stage.map(str::to_owned),
            sessions: reported.sessions.to_vec(),
            uptake: setting.uptake.as_ref().map(JsonUptake::of),
            recommended: setting.recommended().map(|(orifice, described)| At::of(orifice, described)),
            why_not: reported.reasons(|why| why_not(why, setting, &units)),
            judged: reported.judged().map(|(orifice, judged)| JsonJudged::of(orifice, judged, setting)),
            never_exceed_ip_bar_gauge: never.map(|(_, bar)| Plain(bar)),
            never_exceed_ip_psi_gauge: never.map(|(_, bar)| Plain(psi(bar))),
            never_exceed_orifice: never.map(|(orifice, _)| orifice.orifice.to_string()),
            depth: described.map(|(_, described)| Depth::of(described)),
            table: shown.map(|o| o.table.iter().map(Row::of).collect()).unwrap_or_default(),
            table_orifice: shown.map(|o| o.orifice.to_string()),
            patency: described.and_then(|(_, d)| d.patency.as_ref().map(JsonPatency::of)),
            expected_reading: described.and_then(|(_, d)| d.expected_reading.as_ref().map(Reading::of)),
            orifices: setting.orifices.iter().map(|o| JsonOrifice::of(o, reported)).collect(),
            assumed: Assumed::of(reported),
            despite: reported.despite(),
            warnings: reported.warnings(&units),
            notes: reported.notes.iter().map(|note| data(note)).collect(),
        }
    }
}

impl JsonUptake {
    fn of(uptake: &RestingUptake) -> Self {
        let (low, high) = uptake_interval(uptake);
        Self {
            uptake_l_min: Plain(uptake.uptake_l_min),
            u: Plain(uptake.u_l_min),
            degrees_of_freedom: uptake.dof.is_finite().then_some(Plain(uptake.dof)),
            interval_95: [Plain(low), Plain(high)],
        }
    }
}

impl At {
    fn of(orifice: &OrificeSetting, described: &Described) -> Self {
        let at = &described.at;
        let drift = at.drift.as_ref();
        Self {
            orifice: orifice.orifice.to_string(),
            ip_bar_gauge: Plain(at.ip_bar_gauge),
            ip_psi_gauge: Plain(psi(at.ip_bar_gauge)),
            injection_l_min: Plain(at.surface.nominal_l_min),
            injection_u: Plain(at.surface.u_l_min),
            injection_expanded: Plain(INJECTION_COVERAGE * at.surface.u_l_min),
            coverage_factor: Plain(INJECTION_COVERAGE),
            shortfall_l_min: Plain(at.shortfall_l_min),
            least_shortfall: Plain(at.least_shortfall),
            largest_shortfall: Plain(at.largest_shortfall),
            overfeed_chance: Plain(at.overfeed_chance),
            po2_drift_bar_min: drift.map(|d| Plain(d.held_bar_min)),
            po2_drift_sealed_bar_min: drift.and_then(|d| d.sealed_bar_min).map(Plain),
            minutes_high_to_low: drift.and_then(|d| d.minutes_high_to_low).map(Plain),
            minutes_to_hypoxia_at_work: drift.and_then(|d| d.minutes_to_hypoxia_at_work).map(Plain),
            surface: JsonInjected::of(&at.surface),
            held: JsonInjected::of(&at.held),
            budget: described
                .budget
                .iter()
                .map(|(source, u)| Budget { source: source_name(*source), u_l_min: Plain(*u) })
                .collect(),
        }
    }
}

impl JsonInjected {
    const fn of(injected: &Injected) -> Self {
        Self {
            nominal_l_min: Plain(injected.nominal_l_min),
            u: Plain(injected.u_l_min),
            richest_l_min: Plain(injected.richest_l_min),
            leanest_l_min: Plain(injected.leanest_l_min),
        }
    }
}

/// The word for a verdict.
fn verdict(judged: &Judged) -> &'static str {
    if judged.against.is_empty() { "may be used" } else { "not" }
}

fn objections(judged: &Judged, setting: &Setting) -> Vec<String> {
    judged.against.iter().map(|a| against(a, setting, &Units::default())).collect()
}

impl JsonJudged {
    fn of(orifice: &OrificeSetting, judged: &Judged, setting: &Setting) -> Self {
        let described = &judged.described;
        Self {
            verdict: verdict(judged),
            against: objections(judged, setting),
            at: At::of(orifice, described),
            depth: Depth::of(described),
            patency: described.patency.as_ref().map(JsonPatency::of),
            expected_reading: described.expected_reading.as_ref().map(Reading::of),
        }
    }
}

impl Depth {
    fn of(described: &Described) -> Self {
        let limits = &described.depth;
        let metres = |point: Option<DepthPoint>| point.map(|p| Plain(p.depth_m));
        let bar = |point: Option<DepthPoint>| point.map(|p| Plain(p.ambient_bar_abs));
        Self {
            at_ip_bar_gauge: Plain(described.at.ip_bar_gauge),
            first_stage: first_stage_name(limits.first_stage),
            water: water_name(limits.water),
            one_percent_at_m: metres(limits.one_percent),
            nine_tenths_at_m: metres(limits.nine_tenths),
            stops_at_m: metres(limits.stops),
            one_percent_at_bar_abs: bar(limits.one_percent),
            nine_tenths_at_bar_abs: bar(limits.nine_tenths),
            stops_at_bar_abs: bar(limits.stops),
            choke_ratio_origin: match limits.choke_ratio_origin {
                Origin::Measured => "measured",
                Origin::Bounded => "bounded",
            },
            choke_ratio_low: Plain(limits.choke_ratio_low),
            overtakes_at_m: limits.overtakes_at_m.map(Plain),
            overtakes_at_best_estimate_m: limits.overtakes_at_best_estimate_m.map(Plain),
            known_to_m: limits.known_to_m.map(Plain),
            rows: limits
                .rows
                .iter()
                .map(|row| DepthJson {
                    depth_m: Plain(row.depth_m),
                    ambient_bar_abs: Plain(row.ambient_bar_abs),
                    injection_l_min: Plain(row.injection_l_min),
                    lowest_l_min: Plain(row.lowest_l_min),
                    overfeed_chance: Plain(row.chance),
                    beyond_span: row.beyond_span,
                })
                .collect(),
        }
    }
}

impl Row {
    fn of(at: &AtIp) -> Self {
        let drift = at.drift.as_ref();
        Self {
            ip_bar_gauge: Plain(at.ip_bar_gauge),
            ip_psi_gauge: Plain(psi(at.ip_bar_gauge)),
            injection_l_min: Plain(at.surface.nominal_l_min),
            injection_u: Plain(at.surface.u_l_min),
            shortfall_l_min: Plain(at.shortfall_l_min),
            overfeed_chance: Plain(at.overfeed_chance),
            po2_drift_bar_min: drift.map(|d| Plain(d.held_bar_min)),
            minutes_high_to_low: drift.and_then(|d| d.minutes_high_to_low).map(Plain),
            minutes_to_hypoxia_at_work: drift.and_then(|d| d.minutes_to_hypoxia_at_work).map(Plain),
            held_l_min: Plain(at.held.nominal_l_min),
            richest_l_min: Plain(at.held.richest_l_min),
            leanest_l_min: Plain(at.held.leanest_l_min),
        }
    }
}

impl JsonPatency {
    const fn of(patency: &Patency) -> Self {
        Self {
            from_bar: Plain(patency.from_bar),
            to_bar: Plain(patency.to_bar),
            seconds: Plain(patency.seconds),
            low: Plain(patency.low_seconds),
            high: Plain(patency.high_seconds),
        }
    }
}

impl Reading {
    fn of(reading: &ExpectedReading) -> Self {
        let window = |w: &ReadingWindow| Window {
            value: Plain(w.value_l_min),
            low: Plain(w.low_l_min),
            high: Plain(w.high_l_min),
        };
        Self {
            meter: reading.meter.as_ref().map_or_else(|| reading.kind.to_owned(), ToString::to_string),
            kind: reading.kind,
            reads_at: reading.reads_at.map_or_else(
                || "the volume that passes, at the meter's own pressure and 20 °C".to_owned(),
                reference_to_text,
            ),
            value: Plain(reading.full.value_l_min),
            unit: "L/min",
            low: Plain(reading.full.low_l_min),
            high: Plain(reading.full.high_l_min),
            nearly_empty: window(&reading.nearly_empty),
            out_of_range: reading.out_of_range,
        }
    }
}

impl JsonOrifice {
    fn of(orifice: &OrificeSetting, reported: &Reported<'_>) -> Self {
        let setting = reported.setting;
        let at = orifice.answer.as_ref().ok().map(|described| &described.at);
        let named = reported.named(orifice);
        Self {
            orifice: orifice.orifice.to_string(),
            line: named.map(|named| named.line.to_owned()),
            fits: at.is_some(),
            why_not: orifice.answer.as_ref().err().map(|why| why_not(why, setting, &Units::default())),
            ip_bar_gauge: at.map(|at| Plain(at.ip_bar_gauge)),
            ip_psi_gauge: at.map(|at| Plain(psi(at.ip_bar_gauge))),
            injection_l_min: at.map(|at| Plain(at.surface.nominal_l_min)),
            injection_u: at.map(|at| Plain(at.surface.u_l_min)),
            overfeed_chance: at.map(|at| Plain(at.overfeed_chance)),
            never_exceed_ip_bar_gauge: orifice.never_exceed_ip_bar_gauge.map(Plain),
            effective_diameter_um: Plain(orifice.effective_diameter_um),
            choke_ratio_interval_95: named.map(|named| {
                let (low, high) = named.analysis.choke.interval_95;
                [Plain(low), Plain(high)]
            }),
            judged: orifice.judged.as_ref().map(|judged| OrificeJudged {
                ip_bar_gauge: Plain(judged.described.at.ip_bar_gauge),
                verdict: verdict(judged),
                against: objections(judged, setting),
            }),
        }
    }
}
