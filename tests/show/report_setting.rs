//! A setting in words, as a document and on its one page: every sentence, every key, every default, no line too long.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

mod desk;
mod sentences;

use std::collections::BTreeSet;

use crate::setting_support::*;
use desk::*;
use ebbline::bench::choke::Origin;
use ebbline::entry::{Id, Place};
use ebbline::quantity::{PressureRate, Uncertain};
use ebbline::report::setting::{favourable, text, why_not};
use ebbline::report::{Units, setting_json, sheet};
use ebbline::setting::{OrificeInput, SettingOptions, Standing, Trapped};
use ebbline::uptake::{Estimate, NextDay, PlaceUptake, Shared, Uptake};
use sentences::DEFAULTED;
use serde_json::Value;

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
    let flat = without_uptake().sheet().split_whitespace().collect::<Vec<_>>().join(" ");
    holds(&flat, &["there is no resting uptake to set by", "fewer than two cells agree"]);
}

#[test]
fn another_days_uptake_says_where_and_on_how_many_days_it_was_measured() {
    let mut desk = recommended();
    // t(0.975; 12) = 2.178 81: 0.33 ± 2.178 81 · 0.014 = 0.2995 to 0.3605.
    let next_day = NextDay {
        uptake_l_min: 0.33,
        u: 0.014,
        dof: 12.0,
        interval_95: (0.2995, 0.3605),
        days: 2,
        day_spread_l_min: 0.01,
    };
    let estimate = Estimate {
        uptake_l_min: 0.33,
        u: 0.009,
        dof: 12.0,
        interval_95: (0.31, 0.35),
        budget: Vec::new(),
        next_day,
        would_help: Vec::new(),
        per_kilogram: None,
        shared: Shared::default(),
    };
    let place = PlaceUptake { place: Place::Couch, answer: Ok(estimate), sessions: Vec::new() };
    desk.uptake = Some(Uptake { diver: Id::new("D-07").unwrap(), places: vec![place] });
    for output in [desk.text(), desk.sheet()] {
        let flat = output.split_whitespace().collect::<Vec<_>>().join(" ");
        // Ending where the half-width of 0.0305 ends with two figures, rounded up: 0.031.
        holds(&flat, &["on another day 0.330 L/min, 95 % from 0.299 to 0.361 L/min; couch, 2 days measured"]);
    }
    let json = desk.json();
    let interval = |i: usize| json["uptake"]["interval_95"][i].as_f64().unwrap();
    assert!((interval(0) - 0.2995).abs() < 5e-5 && (interval(1) - 0.3605).abs() < 5e-5, "{}", json["uptake"]);
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
