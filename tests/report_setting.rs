//! A setting in words, as a document and on its one page: every sentence, every key, every default, no line too long.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

mod setting_support;
mod simulator;

use std::collections::BTreeSet;

use chrono::NaiveDate;
use ebbline::bench::Analysis;
use ebbline::bench::choke::Origin;
use ebbline::entry::{Amount, Id, Meter, MeterKind, Papers, Run};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, IndicatedFlow, Length, PressureRate, ReferenceConditions, Shown, Temperature,
    Uncertain, Volume,
};
use ebbline::report::setting::{OrificeNamed, Reported, favourable, text, why_not};
use ebbline::report::{Units, setting_json, setting_sentences, sheet};
use ebbline::setting::{
    Against, Defaulted, FirstStageKind, FittingDiameter, InjectionSource, OrificeInput, RestingUptake,
    Setting, SettingOptions, Standing, Trapped, Warning, WhyNot, setting,
};
use serde_json::Value;
use setting_support::*;
use simulator::{Random, Scene, Trial};

/// Everything a report is made of.
struct Desk {
    setting: Setting,
    options: SettingOptions,
    lines: Vec<String>,
    run: Run,
    analysis: Analysis,
    diver: String,
    sessions: Vec<String>,
    uptake_why_not: Option<String>,
    notes: Vec<String>,
}

impl Desk {
    fn new(orifices: &[OrificeInput], uptake: Option<&RestingUptake>, options: SettingOptions) -> Self {
        let trial = Trial::new(Scene::PLAIN, &mut Random::new(7));
        Self {
            setting: setting(orifices, uptake, &options).expect("a good call"),
            options,
            lines: vec!["run R0003 of 2026-11-12, accepted".into(); orifices.len()],
            analysis: trial.analyse_nominal(),
            run: trial.run,
            diver: "D-07".into(),
            sessions: vec!["S0001 of 2026-11-20, couch".into(), "S0002 of 2026-11-21, couch".into()],
            uptake_why_not: None,
            notes: Vec::new(),
        }
    }

    fn say<T>(&self, say: impl FnOnce(&Reported<'_>) -> T) -> T {
        let orifices: Vec<OrificeNamed<'_>> = self
            .lines
            .iter()
            .map(|line| OrificeNamed { line, run: &self.run, analysis: &self.analysis })
            .collect();
        say(&Reported {
            setting: &self.setting,
            options: &self.options,
            orifices: &orifices,
            diver: Some(&self.diver),
            sessions: &self.sessions,
            uptake: None,
            uptake_why_not: self.uptake_why_not.as_deref(),
            first_stage: Some("FS-1"),
            on: NaiveDate::from_ymd_opt(2026, 11, 22).unwrap(),
            notes: &self.notes,
        })
    }

    fn text(&self) -> String {
        self.say(|reported| text(reported, &Units::default()))
    }

    fn sheet(&self) -> String {
        self.say(|reported| sheet::text(reported, &Units::default()))
    }

    fn json(&self) -> Value {
        serde_json::to_value(self.say(setting_json::json)).unwrap()
    }
}

fn shown(units: &str) -> Units {
    Units::new(Shown::parse(units).unwrap())
}

fn meter() -> Meter {
    Meter {
        id: Some(Id::new("FM-01").unwrap()),
        kind: MeterKind::Mass {
            reads_at: ReferenceConditions {
                temperature: Temperature::from_c(20.0),
                pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
            },
            made_for: Species::Oxygen,
            gas_factor: None,
        },
        papers: Papers {
            gain: Some(0.008),
            zero: None,
            noise: Some(Amount::OfReading(0.002)),
            resolution: None,
            coverage: 2.0,
            range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
            certificate: None,
            due: None,
        },
    }
}

/// What a careful diver says; the rest takes its default.
fn careful() -> SettingOptions {
    SettingOptions {
        gauge_error: bar(0.2),
        loop_volume: Some(Uncertain { value: Volume::from_l(7.0), expanded: None }),
        water_temperature: water(12.0),
        trapped: Some(Trapped::Volume(Uncertain { value: Volume::from_l(0.015), expanded: None })),
        meter: Some(meter()),
        ..SettingOptions::default()
    }
}

fn recommended() -> Desk {
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), careful())
}

fn compensated() -> Desk {
    let options = SettingOptions {
        first_stage: FirstStageKind::Compensated,
        max_depth: Some(Length::from_m(20.0)),
        ..careful()
    };
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), options)
}

/// A hole too large: even the lowest measured pressure feeds too much.
fn refused() -> Desk {
    let uptake = diver(0.33, 0.014, 12.0);
    let options = SettingOptions { despite: Some("the other one is away".into()), ..careful() };
    let too_large = OrificeInput { standing: Standing::Failed, ..orifice("CMF-0417", bench_line(0.12)) };
    Desk::new(&[too_large], Some(&uptake), options)
}

fn judged(ip_bar: f64) -> Desk {
    let options = SettingOptions { judge: Some(gauge(ip_bar)), ..careful() };
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), options)
}

fn without_uptake() -> Desk {
    let mut desk = Desk::new(&[orifice("CMF-0417", bench_line(0.028))], None, careful());
    desk.uptake_why_not = Some("fewer than two cells agree".into());
    desk
}

fn two_orifices() -> Desk {
    let options = SettingOptions { ip_range: Some((gauge(8.0), gauge(11.0))), ..careful() };
    let orifices = [
        orifice("CMF-0417", bench_line(0.028)),
        OrificeInput { standing: Standing::NeverJudged, ..orifice("CMF-0502", bench_line(0.12)) },
    ];
    Desk::new(&orifices, Some(&diver(0.33, 0.014, 12.0)), options)
}

fn all_desks() -> Vec<(&'static str, Desk)> {
    vec![
        ("recommended", recommended()),
        ("compensated", compensated()),
        ("refused", refused()),
        ("judged well", judged(9.2)),
        ("judged badly", judged(10.6)),
        ("without uptake", without_uptake()),
        ("two orifices", two_orifices()),
    ]
}

fn columns(line: &str) -> usize {
    line.chars().count()
}

/// Each of `all` has its own place in the match that numbers them, so that a new variant breaks the build, and none is
/// forgotten.
#[track_caller]
fn all_there<T>(all: &[T], place: impl Fn(&T) -> usize, count: usize) {
    let places: BTreeSet<usize> = all.iter().map(place).collect();
    assert_eq!(places, (0..count).collect());
}

#[track_caller]
fn all_different(says: &[String]) {
    let different: BTreeSet<&String> = says.iter().collect();
    assert_eq!(different.len(), says.len());
    for say in says {
        assert!(say.len() > 3 && !say.contains("NaN") && !say.contains("no number"), "{say}");
    }
}

#[track_caller]
fn holds(text: &str, needles: &[&str]) {
    for needle in needles {
        assert!(text.contains(needle), "{needle:?} is not in: {text}");
    }
}

fn fitting() -> Option<FittingDiameter> {
    Some(FittingDiameter { ip_bar_gauge: 9.0, um: 57.2, smallest_um: 53.1, largest_um: 63.4 })
}

#[test]
fn every_refusal_says_what_why_and_what_to_do() {
    let since = NaiveDate::from_ymd_opt(2026, 3, 1).unwrap();
    // 0.95 of 0.33 is 0.3135.
    let all: Vec<(WhyNot, &[&str])> = vec![
        (WhyNot::NoUptake, &["measure it first"]),
        (WhyNot::ImplausiblePerKilogram { ml_kg_min: 6.43 }, &["6.4 mL/(kg·min)", "--despite"]),
        (WhyNot::Failed, &["failed", "cleaned", "--despite"]),
        (WhyNot::Undecided, &["could not be decided", "--despite"]),
        (WhyNot::Overdue { since }, &["2026-03-01", "--despite"]),
        (WhyNot::LineDoesNotRise, &["does not rise"]),
        (
            WhyNot::NothingLowEnough {
                lowest_ip_bar_gauge: 8.0,
                richest_l_min: 0.412_31,
                chance: 0.9,
                fitting: fitting(),
            },
            &[
                "8.0 bar (116 psi)",
                "0.4124 L/min STPD",
                "0.3135 L/min",
                "90 %",
                "2.5 %",
                "57.2 µm",
                "53.1 µm",
                "63.4 µm",
            ],
        ),
        (
            WhyNot::NothingHighEnough { highest_ip_bar_gauge: 11.0, shortfall: 0.2741, fitting: fitting() },
            &["11.0 bar (159 psi)", "27.5 %", "25 %", "57.2 µm"],
        ),
        (
            WhyNot::NoDivisionInRange { range_bar_gauge: (9.71, 9.79), division_bar: 0.1 },
            &["9.71 bar", "9.79 bar", "0.1 bar", "finer gauge"],
        ),
        (
            WhyNot::OutsideSpan {
                ip_bar_gauge: 9.8,
                needs_bar_abs: 10.813,
                span_bar_abs: (4.0, 9.5),
                fitting: fitting(),
            },
            &["9.8 bar (142 psi)", "10.81 bar absolute", "4.00 to 9.50 bar absolute", "57.2 µm"],
        ),
        (
            WhyNot::ShortfallTooLarge { ip_bar_gauge: 7.5, shortfall: 0.2512, fitting: None },
            &["7.5 bar (108 psi)", "25.2 %", "too lean", "measure again", "No other hole"],
        ),
    ];
    let place = |why: &WhyNot| match why {
        WhyNot::NoUptake => 0,
        WhyNot::ImplausiblePerKilogram { .. } => 1,
        WhyNot::Failed => 2,
        WhyNot::Undecided => 3,
        WhyNot::Overdue { .. } => 4,
        WhyNot::LineDoesNotRise => 5,
        WhyNot::NothingLowEnough { .. } => 6,
        WhyNot::NothingHighEnough { .. } => 7,
        WhyNot::NoDivisionInRange { .. } => 8,
        WhyNot::OutsideSpan { .. } => 9,
        WhyNot::ShortfallTooLarge { .. } => 10,
    };
    all_there(&all, |(why, _)| place(why), 11);
    let set = recommended().setting;
    let says = |units: &Units| -> Vec<String> {
        all.iter().map(|(why, _)| setting_sentences::why_not(why, &set, units)).collect()
    };
    let sentences = says(&Units::default());
    all_different(&sentences);
    for ((_, needles), sentence) in all.iter().zip(&sentences) {
        holds(sentence, needles);
    }
    // For the page to keep: the same reasons, and no pressure one could dial.
    let kept: Vec<String> = all
        .iter()
        .map(|(why, _)| setting_sentences::why_not_without_ip(why, &set, &Units::default()))
        .collect();
    all_different(&kept);
    assert!(kept.iter().all(|say| !say.contains(" bar") && !say.contains("psi")), "{kept:#?}");
    // 57.2 µm over 25.4 µm: 2.252 thousandths of an inch.
    holds(&says(&shown("in"))[6], &["57.2 µm (2.25 thousandths of an inch)"]);
    holds(&says(&shown("psi"))[6], &["116 psi (8.0 bar)"]);
    // At the maximum depth of a compensated first stage it is the pressure there that is not held.
    holds(&setting_sentences::why_not(&all[9].0, &compensated().setting, &Units::default()), &["at 20 m"]);
}

#[test]
fn every_objection_to_a_judged_ip_has_its_sentence() {
    let all: Vec<(Against, &[&str])> = vec![
        (Against::Overfeeds { chance: 0.0251 }, &["2.6 %", "2.5 % is allowed", "lower it"]),
        (Against::ShortfallTooSmall { shortfall: 0.0496 }, &["4.9 %", "5 % is asked", "lower it"]),
        (Against::ShortfallTooLarge { shortfall: 0.2501 }, &["25.1 %", "over 25 %", "raise it"]),
        (
            Against::OutsideRange { range_bar_gauge: (7.0, 11.0) },
            &["7 bar (101.5 psi)", "11 bar (159.5 psi)"],
        ),
        (Against::AboveMaximum { max_ip_bar_gauge: 10.5 }, &["10.5 bar (152.3 psi)", "maker"]),
    ];
    let place = |against: &Against| match against {
        Against::Overfeeds { .. } => 0,
        Against::ShortfallTooSmall { .. } => 1,
        Against::ShortfallTooLarge { .. } => 2,
        Against::OutsideRange { .. } => 3,
        Against::AboveMaximum { .. } => 4,
    };
    all_there(&all, |(against, _)| place(against), 5);
    let set = recommended().setting;
    let say = |against: &Against| setting_sentences::against(against, &set, &Units::default());
    let says: Vec<String> = all.iter().map(|(against, _)| say(against)).collect();
    all_different(&says);
    for ((_, needles), sentence) in all.iter().zip(&says) {
        holds(sentence, needles);
    }
    holds(&say(&Against::ShortfallTooSmall { shortfall: -0.031 }), &["3.1 % more than the uptake"]);
}

#[test]
fn every_warning_has_its_sentence() {
    let since = NaiveDate::from_ymd_opt(2026, 3, 1).unwrap();
    let why = || "spare is away".to_owned();
    let all: Vec<(Warning, &[&str])> = vec![
        (Warning::GaugeErrorAssumed { expanded_bar: 0.5 }, &["±0.5 bar (k = 2", "2.5 %", "transducer"]),
        (Warning::IpSpreadAssumed { bar: 0.3 }, &["0.3 bar", "nearly empty cylinder"]),
        (Warning::IpRepeatAssumed { expanded_bar: 0.1 }, &["±0.1 bar (k = 2)"]),
        (Warning::WaterTemperatureUnknown, &["12 °C", "--water-temperature"]),
        (Warning::LoopVolumeUnknown, &["no minutes", "--loop-volume"]),
        (Warning::TrappedVolumeUnknown, &["contents gauge"]),
        (Warning::UnusualPerKilogram { ml_kg_min: 4.8 }, &["4.8 mL/(kg·min)", "reference conditions"]),
        (
            Warning::DespitePerKilogram { ml_kg_min: 6.4, why: why() },
            &["6.4 mL/(kg·min)", "\"spare is away\""],
        ),
        (Warning::NeverJudged, &["nobody has judged"]),
        (Warning::DespiteFailed { why: why() }, &["failed", "\"spare is away\""]),
        (Warning::DespiteUndecided { why: why() }, &["undecided", "\"spare is away\""]),
        (Warning::DespiteOverdue { since, why: why() }, &["2026-03-01", "\"spare is away\""]),
        (Warning::RangeLimits { highest_ip_bar_gauge: 9.0 }, &["9.0 bar (130 psi)", "larger hole"]),
        (Warning::ChokeRatioBounded, &["only bounded", "low IP"]),
        (Warning::ChokeModelFails, &["no choke ratio", "build"]),
        (Warning::NotChokedAtSurface, &["at the surface"]),
        (Warning::DeeperThanConstant { one_percent_at_m: 43.9, left: 0.8765 }, &["43 m", "20 m", "87.6 %"]),
        (Warning::StopsAboveMaxDepth { stops_at_m: 18.7 }, &["18 m", "20 m", "run back"]),
        (
            Warning::BeyondSpanAtDepth { needs_bar_abs: 10.81, highest_bar_abs: 9.83 },
            &["10.81 bar absolute", "9.83 bar absolute", "20 m", "10 %"],
        ),
        (Warning::LeanAtSurface { shortfall: 0.3175 }, &["31.8 %", "surface", "20 m"]),
        (Warning::MeterOutOfRange, &["range of the meter"]),
        (Warning::MeterWithoutGasFactor, &["another gas", "factor"]),
    ];
    let place = |warning: &Warning| match warning {
        Warning::GaugeErrorAssumed { .. } => 0,
        Warning::IpSpreadAssumed { .. } => 1,
        Warning::IpRepeatAssumed { .. } => 2,
        Warning::WaterTemperatureUnknown => 3,
        Warning::LoopVolumeUnknown => 4,
        Warning::TrappedVolumeUnknown => 5,
        Warning::UnusualPerKilogram { .. } => 6,
        Warning::DespitePerKilogram { .. } => 7,
        Warning::NeverJudged => 8,
        Warning::DespiteFailed { .. } => 9,
        Warning::DespiteUndecided { .. } => 10,
        Warning::DespiteOverdue { .. } => 11,
        Warning::RangeLimits { .. } => 12,
        Warning::ChokeRatioBounded => 13,
        Warning::ChokeModelFails => 14,
        Warning::NotChokedAtSurface => 15,
        Warning::DeeperThanConstant { .. } => 16,
        Warning::StopsAboveMaxDepth { .. } => 17,
        Warning::BeyondSpanAtDepth { .. } => 18,
        Warning::LeanAtSurface { .. } => 19,
        Warning::MeterOutOfRange => 20,
        Warning::MeterWithoutGasFactor => 21,
    };
    all_there(&all, |(warning, _)| place(warning), 22);
    let set = compensated().setting;
    let says: Vec<String> =
        all.iter().map(|(warning, _)| setting_sentences::warning(warning, &set, &Units::default())).collect();
    all_different(&says);
    for ((_, needles), sentence) in all.iter().zip(&says) {
        holds(sentence, needles);
    }
}

/// Every option with a default.
const DEFAULTED: [Defaulted; 18] = [
    Defaulted::IpRange,
    Defaulted::GaugeDivision,
    Defaulted::GaugeScale,
    Defaulted::GaugeError,
    Defaulted::IpSpread,
    Defaulted::IpRepeat,
    Defaulted::Chance,
    Defaulted::Shortfall,
    Defaulted::Water,
    Defaulted::WaterTemperature,
    Defaulted::SetAt,
    Defaulted::DiveAt,
    Defaulted::Diluent,
    Defaulted::Po2High,
    Defaulted::Po2Low,
    Defaulted::Work,
    Defaulted::Oxygen,
    Defaulted::Contents,
];

#[test]
fn every_option_and_every_source_has_its_name() {
    let place = |which: &Defaulted| match which {
        Defaulted::IpRange => 0,
        Defaulted::GaugeDivision => 1,
        Defaulted::GaugeScale => 2,
        Defaulted::GaugeError => 3,
        Defaulted::IpSpread => 4,
        Defaulted::IpRepeat => 5,
        Defaulted::Chance => 6,
        Defaulted::Shortfall => 7,
        Defaulted::Water => 8,
        Defaulted::WaterTemperature => 9,
        Defaulted::SetAt => 10,
        Defaulted::DiveAt => 11,
        Defaulted::Diluent => 12,
        Defaulted::Po2High => 13,
        Defaulted::Po2Low => 14,
        Defaulted::Work => 15,
        Defaulted::Oxygen => 16,
        Defaulted::Contents => 17,
    };
    all_there(&DEFAULTED, place, 18);
    let names: Vec<String> =
        DEFAULTED.iter().map(|d| setting_sentences::option_name(*d).to_owned()).collect();
    all_different(&names);
    let sources = [
        InjectionSource::LineRandom,
        InjectionSource::LineCommon,
        InjectionSource::Gauge,
        InjectionSource::Repeatability,
        InjectionSource::Barometer,
        InjectionSource::Purity,
        InjectionSource::GasTemperature,
    ];
    let place = |source: &InjectionSource| match source {
        InjectionSource::LineRandom => 0,
        InjectionSource::LineCommon => 1,
        InjectionSource::Gauge => 2,
        InjectionSource::Repeatability => 3,
        InjectionSource::Barometer => 4,
        InjectionSource::Purity => 5,
        InjectionSource::GasTemperature => 6,
    };
    all_there(&sources, place, 7);
    let names: Vec<String> = sources.iter().map(|s| setting_sentences::source_name(*s).to_owned()).collect();
    all_different(&names);
    let text = recommended().text();
    holds(&text, &names.iter().map(String::as_str).collect::<Vec<_>>());
}

#[test]
fn every_default_is_printed_with_its_value() {
    let options = SettingOptions {
        trapped: Some(Trapped::Fall(Uncertain {
            value: PressureRate::from_pa_s(2e6 / 60.0),
            expanded: None,
        })),
        ..SettingOptions::default()
    };
    let desk = Desk::new(&[orifice("A", bench_line(0.022))], Some(&diver(0.33, 0.02, 12.0)), options);
    assert_eq!(desk.setting.used.defaulted.len(), DEFAULTED.len());
    let (text, sheet, json) = (desk.text(), desk.sheet(), desk.json());
    // The values of the interface; the diluent is air of 20.95 % oxygen (ICAO standard atmosphere: 20.9476 %).
    let values = [
        ("ip-range", "what the bench run of each orifice spans"),
        ("gauge-division", "0.1 bar"),
        ("gauge-scale", "20 bar"),
        ("gauge-error", "±0.5 bar (k = 2)"),
        ("ip-spread", "up to 0.3 bar higher"),
        ("ip-repeat", "±0.1 bar (k = 2)"),
        ("chance", "2.5 %"),
        ("shortfall", "5 % of the uptake"),
        ("water", "sea, 1025 kg/m³"),
        (
            "water-temperature",
            "not known: best estimate with gas of 20 °C, overfeeding judged at 4 °C, leanness at 30 °C",
        ),
        ("set-at", "1013.25 hPa ± 30 hPa"),
        ("dive-at", "1013.25 hPa ± 30 hPa"),
        ("diluent", "20.95 % oxygen"),
        ("po2-high", "1.3 bar"),
        ("po2-low", "0.7 bar"),
        ("work", "1.5 L/min STPD"),
        ("oxygen", "99.5 % ± 0.3 %"),
        ("contents", "150 bar down to 130 bar"),
    ];
    assert_eq!(values.len(), DEFAULTED.len());
    let flat = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
    for (name, value) in values {
        holds(&flat(&text), &[&format!("{name} {value} (default)")]);
        holds(&flat(&sheet), &[&format!("{name}* {value}")]);
        let defaulted = json["assumed"]["defaulted"].as_array().unwrap();
        assert!(defaulted.iter().any(|d| d == name), "{name}");
    }
    // What is given is not called a default.
    let text = flat(&recommended().text());
    holds(&text, &["gauge-error ±0.2 bar (k = 2) ip-spread"]);
    assert!(!text.contains("gauge-scale"));
}

/// The keys of the interface: each path whose object is there must have them.
const CONTRACT: [(&str, &[&str]); 9] = [
    (
        "",
        &[
            "format",
            "method",
            "recommended",
            "why_not",
            "judged",
            "never_exceed_ip_bar_gauge",
            "depth",
            "table",
            "patency",
            "expected_reading",
            "orifices",
            "assumed",
            "warnings",
        ],
    ),
    (
        "/recommended",
        &[
            "orifice",
            "ip_bar_gauge",
            "ip_psi_gauge",
            "injection_l_min",
            "injection_u",
            "shortfall_l_min",
            "overfeed_chance",
            "po2_drift_bar_min",
        ],
    ),
    (
        "/depth",
        &[
            "first_stage",
            "water",
            "one_percent_at_m",
            "nine_tenths_at_m",
            "stops_at_m",
            "one_percent_at_bar_abs",
            "nine_tenths_at_bar_abs",
            "stops_at_bar_abs",
            "choke_ratio_origin",
            "overtakes_at_m",
            "overtakes_at_best_estimate_m",
        ],
    ),
    (
        "/table/0",
        &[
            "ip_bar_gauge",
            "injection_l_min",
            "shortfall_l_min",
            "overfeed_chance",
            "po2_drift_bar_min",
            "minutes_high_to_low",
            "minutes_to_hypoxia_at_work",
        ],
    ),
    ("/patency", &["from_bar", "to_bar", "seconds", "low", "high"]),
    ("/expected_reading", &["meter", "reads_at", "value", "unit", "low", "high"]),
    ("/orifices/0", &["orifice", "fits", "why_not", "ip_bar_gauge"]),
    ("/orifices/1", &["orifice", "fits", "why_not", "ip_bar_gauge"]),
    ("/judged", &["ip_bar_gauge", "verdict", "against", "injection_l_min", "overfeed_chance", "depth"]),
];

#[test]
fn the_document_has_the_keys_of_the_interface_in_every_case() {
    let mut seen = BTreeSet::new();
    let mut top: Option<Vec<String>> = None;
    for (name, desk) in all_desks() {
        let json = desk.json();
        for (path, keys) in CONTRACT {
            let Some(object) = json.pointer(path).and_then(Value::as_object) else { continue };
            seen.insert(path);
            for key in keys {
                assert!(object.contains_key(*key), "{name}: no {path}/{key}");
            }
        }
        let keys: Vec<String> = json.as_object().unwrap().keys().cloned().collect();
        assert_eq!(top.get_or_insert_with(|| keys.clone()), &keys, "{name}");
        assert_eq!((json["format"].as_u64(), json["method"].as_u64()), (Some(1), Some(1)), "{name}");
        assert!(json["warnings"].as_array().unwrap().iter().all(Value::is_string), "{name}");
        assert_eq!(json["recommended"].is_null(), json["why_not"].is_string(), "{name}");
        assert_eq!(json["recommended"].is_object(), desk.setting.recommended.is_some(), "{name}");
    }
    assert_eq!(seen.len(), CONTRACT.len(), "{seen:?}");
}

#[test]
fn the_document_carries_the_numbers_of_the_setting() {
    let desk = recommended();
    let (orifice, described) = desk.setting.recommended().unwrap();
    let json = desk.json();
    let number = |path: &str| json.pointer(path).and_then(Value::as_f64).unwrap_or(f64::NAN);
    let near = |path: &str, want: f64| {
        let got = number(path);
        assert!((got - want).abs() <= 1e-9 * want.abs().max(1e-3), "{path}: got {got}, want {want}");
    };
    let at = &described.at;
    near("/recommended/ip_bar_gauge", at.ip_bar_gauge);
    // One psi is 6894.757 293 168 Pa (NIST SP 811, B.8).
    near("/recommended/ip_psi_gauge", at.ip_bar_gauge * 1e5 / 6_894.757_293_168);
    near("/recommended/injection_l_min", at.surface.nominal_l_min);
    near("/recommended/injection_u", at.surface.u_l_min);
    near("/recommended/shortfall_l_min", at.shortfall_l_min);
    near("/recommended/overfeed_chance", at.overfeed_chance);
    near("/recommended/po2_drift_bar_min", at.drift.unwrap().held_bar_min);
    near("/recommended/held/richest_l_min", at.held.richest_l_min);
    near("/never_exceed_ip_bar_gauge", orifice.never_exceed_ip_bar_gauge.unwrap());
    near("/depth/stops_at_m", described.depth.stops.unwrap().depth_m);
    near("/depth/one_percent_at_bar_abs", described.depth.one_percent.unwrap().ambient_bar_abs);
    near("/patency/seconds", described.patency.unwrap().seconds);
    near("/patency/low", described.patency.unwrap().low_seconds);
    let reading = described.expected_reading.as_ref().unwrap();
    near("/expected_reading/value", reading.full.value_l_min);
    near("/expected_reading/nearly_empty/high", reading.nearly_empty.high_l_min);
    assert_eq!(json["expected_reading"]["meter"], "FM-01");
    assert_eq!(json["expected_reading"]["reads_at"], "20 °C, 101.325 kPa");
    assert_eq!(json["table"].as_array().unwrap().len(), orifice.table.len());
    let origin = described.depth.choke_ratio_origin == Origin::Measured;
    assert_eq!(json["depth"]["choke_ratio_origin"] == "measured", origin);
    assert_eq!(
        (&json["depth"]["first_stage"], &json["depth"]["overtakes_at_m"]),
        (&"uncompensated".into(), &Value::Null)
    );
    near("/assumed/gauge_error_expanded_bar", 0.2);
    near("/assumed/loop_volume_l", 7.0);
    // Compensated: it overtakes, and nothing stops.
    let json = compensated().json();
    assert!(json["depth"]["overtakes_at_m"].is_number() && json["depth"]["stops_at_m"].is_null());
    assert!(
        json["recommended"]["held"]["nominal_l_min"].as_f64()
            > json["recommended"]["injection_l_min"].as_f64()
    );
    // Without an uptake there is nothing but the reason.
    let json = without_uptake().json();
    for key in [
        "recommended",
        "judged",
        "never_exceed_ip_bar_gauge",
        "depth",
        "patency",
        "expected_reading",
        "uptake",
    ] {
        assert!(json[key].is_null(), "{key}");
    }
    assert_eq!(json["table"].as_array().map(Vec::len), Some(0));
    holds(json["why_not"].as_str().unwrap(), &["fewer than two cells agree"]);
    // Judged.
    let json = judged(10.6).json();
    assert_eq!(json["judged"]["verdict"], "not");
    assert!(json["judged"]["against"].as_array().unwrap().len() > 1);
    assert_eq!(judged(9.2).json()["judged"]["verdict"], "may be used");
    let json = two_orifices().json();
    assert_eq!((&json["orifices"][0]["fits"], &json["orifices"][1]["fits"]), (&true.into(), &false.into()));
    assert!(json["orifices"][1]["ip_bar_gauge"].is_null() && json["orifices"][1]["why_not"].is_string());
}

#[test]
fn what_is_favourable_and_what_goes_to_stderr_agree() {
    for (name, desk) in all_desks() {
        let (good, why) = desk.say(|reported| (favourable(reported), why_not(reported)));
        assert_eq!(good, why.is_none(), "{name}: {why:?}");
        let expected = matches!(name, "recommended" | "compensated" | "judged well" | "two orifices");
        assert_eq!(good, expected, "{name}");
    }
    let why = |desk: Desk| desk.say(why_not).unwrap();
    holds(&why(refused()), &["no setting", "too large", "µm"]);
    holds(&why(without_uptake()), &["no resting uptake", "fewer than two cells agree"]);
    holds(&why(judged(10.6)), &["10.6 bar (153.7 psi) through CMF-0417", "it overfeeds"]);
    // An orifice that may not be used cannot be judged, and that is not favourable either.
    let options = SettingOptions { judge: Some(gauge(9.2)), ..careful() };
    let failed = OrificeInput { standing: Standing::Failed, ..orifice("B", bench_line(0.028)) };
    let both = [orifice("A", bench_line(0.028)), failed];
    let desk = Desk::new(&both, Some(&diver(0.33, 0.014, 12.0)), options);
    assert!(desk.setting.recommended.is_some() && !desk.say(favourable));
    holds(&why(desk), &["through B: the orifice may not be used"]);
}

#[test]
fn the_text_begins_with_the_pressures_and_carries_the_rest_in_order() {
    let text = recommended().text();
    // 9.3 bar is 134.885 psi: rounded down as well.
    assert!(
        text.starts_with("SET 9.3 bar (134 psi) gauge through CMF-0417\nNEVER EXCEED 9.3 bar (134 psi)"),
        "{text}"
    );
    let order = [
        "0 °C, 101.325 kPa, dry",
        "injects",
        "uptake at rest",
        "shortfall",
        "overfeeding",
        "How PO2 sinks",
        "at work",
        "sooner on ascent",
        "flow constant to",
        "a tenth lost at",
        "stops at",
        "choke ratio",
        "does gas flow?",
        "flow meter",
        "IP by IP",
        "What was taken",
        "Budget",
        "To know",
        "Cautions",
    ];
    let mut from = 0;
    for needle in order {
        let Some(found) = text[from..].find(needle) else {
            panic!("{needle} is not where it belongs in:\n{text}")
        };
        from += found;
    }
    let rows = |text: &str| {
        let table = text.split("IP by IP").nth(1).unwrap().split("\n\n").next().unwrap().to_owned();
        table.lines().filter(|l| l.trim_start().starts_with(|c: char| c.is_ascii_digit())).count() - 1
    };
    // The title's second line begins with a number too.
    assert_eq!(rows(&text), 12, "{text}");
    holds(&text, &["  set\n", "  NO\n"]);
    let units = shown("psi,mL/min,ft,F");
    let imperial = recommended().say(|reported| self::text(reported, &units));
    holds(&imperial, &["SET 134 psi (9.3 bar)", "mL/min", " ft (", "53.6 °F"]);
    let text = compensated().text();
    holds(
        &text,
        &["at 20 m, where the chance is held", "overfeeds", "the injection exceeds the uptake", "from 2"],
    );
    let text = two_orifices().text();
    holds(
        &text,
        &[
            "recommended",
            "CMF-0502 (effective diameter 60.0 µm): does not fit",
            "CMF-0502: nobody has judged",
        ],
    );
    let text = refused().text();
    assert!(text.starts_with("NO SETTING: even "), "{text}");
    holds(&text, &["DESPITE: \"the other one is away\"", "NO IP IS LOW ENOUGH"]);
    holds(&judged(10.6).text(), &["Judged: 10.6 bar (153.7 psi) gauge through CMF-0417: NOT TO BE USED"]);
    holds(&judged(9.2).text(), &["Judged: 9.2 bar (133.4 psi) gauge through CMF-0417: may be used"]);
}

#[test]
fn a_flow_and_what_stands_after_its_plus_minus_end_at_the_same_place() {
    let mut seen = 0;
    for (name, desk) in all_desks() {
        for line in desk.text().lines().filter(|l| l.trim_start().starts_with("injects ") && l.contains('±'))
        {
            let mut words = line.split_whitespace().skip(1);
            let value = words.next().unwrap();
            let expanded = words.nth(1).unwrap();
            let decimals = |text: &str| text.split_once('.').map(|(_, d)| d.len());
            assert_eq!(decimals(value), decimals(expanded), "{name}: {line}");
            seen += 1;
        }
    }
    assert!(seen >= 6, "{seen}");
}

#[test]
fn the_page_to_keep_is_one_page() {
    for units in [Units::default(), shown("psi,mL/min,ft,F")] {
        for (name, desk) in all_desks() {
            let sheet = desk.say(|reported| sheet::text(reported, &units));
            let text = desk.say(|reported| text(reported, &units));
            for line in sheet.lines().chain(text.lines()) {
                assert!(columns(line) <= 80, "{name}: {} columns: {line}", columns(line));
                assert_eq!(line, line.trim_end(), "{name}");
            }
            assert!(sheet.lines().count() < 90, "{name}: {} lines\n{sheet}", sheet.lines().count());
        }
    }
    let sheet = recommended().sheet();
    holds(
        &sheet,
        &[
            "for D-07, 2026-11-22",
            "orifice CMF-0417, run R0003 of 2026-11-12, accepted",
            "9.3 bar      134 psi",
            "NEVER EXCEED",
            "prove it by flow on the assembled unit",
            "on another day 0.330 L/min, 95 % from",
            "2.5 % is allowed",
            "contents gauge",
            "nearly empty",
            "FM-01",
            "Raise PO2 before going up",
        ],
    );
}

#[test]
fn without_a_setting_the_page_says_so_and_gives_no_pressure_to_dial() {
    for desk in [refused(), without_uptake()] {
        let sheet = desk.sheet();
        holds(&sheet, &["NO SETTING", "why"]);
        let before_cautions = sheet.split("-- CAUTIONS").next().unwrap();
        for never in [" bar", "psi", "SET  ", "NEVER EXCEED"] {
            assert!(!before_cautions.contains(never), "{never}:\n{sheet}");
        }
    }
    holds(
        &refused().sheet(),
        &["N O   S E T T I N G", "injects too much", "µm", "DESPITE: \"the other one is away\""],
    );
    holds(&without_uptake().sheet(), &["fewer than two cells agree"]);
}

#[test]
fn texts_that_somebody_typed_come_out_as_data() {
    let options = SettingOptions {
        despite: Some("<script>alert(1)</script>\u{1b}[2J\nSET 15 bar\u{202e}".into()),
        ..careful()
    };
    let failed = OrificeInput { standing: Standing::Failed, ..orifice("A", bench_line(0.028)) };
    let mut desk = Desk::new(&[failed], Some(&diver(0.33, 0.014, 12.0)), options);
    desk.diver = "=cmd|' /C calc'!A0\u{7}".into();
    desk.lines[0] = format!("file {}.toml\r\nNEVER EXCEED 20 bar", "x".repeat(200));
    desk.sessions = vec!["S0001\u{0}".into()];
    desk.notes = vec!["\u{1b}]0;title\u{7}".into()];
    for output in [desk.text(), desk.sheet()] {
        assert!(output.chars().all(|c| c == '\n' || !c.is_control()), "{output:?}");
        assert!(!output.contains('\u{202e}') && output.lines().all(|l| columns(l) <= 80), "{output}");
        holds(
            &output,
            &["=cmd|' /C calc'!A0\\u{7}", "<script>alert(1)</script>\\u{1b}[2J\\nSET", "S0001\\u{0}"],
        );
        // Nobody's text begins a line of ours.
        assert_eq!(output.lines().filter(|l| l.trim_start().starts_with("SET 15")).count(), 0, "{output}");
        assert!(!output.lines().any(|l| l.trim_start().starts_with("NEVER EXCEED 20")), "{output}");
    }
    let document = desk.say(setting_json::document);
    assert!(document.chars().all(|c| c == '\n' || !c.is_control()), "{document:?}");
    let json: Value = serde_json::from_str(&document).unwrap();
    assert_eq!(json["diver"], "=cmd|' /C calc'!A0\u{7}");
    holds(json["despite"].as_str().unwrap(), &["<script>alert(1)</script>\\u{1b}"]);
}
