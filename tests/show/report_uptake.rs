//! What a diver reads of an uptake: every finding has its sentence, the document its keys, the text its width.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

mod sentences;

use crate::loop_simulator::{Dice, Extra, Kind, Scene, scene_of, truth};
use ebbline::entry::{Place, Session, SessionLeftOut, SessionNumber};
use ebbline::quantity::show::Shown as ShownUnits;
use ebbline::quantity::{Length, Mass, PressureDifference, Span, Temperature};
use ebbline::report::cautions::{POOL_DEEPEST_M, SESSION, UPTAKE, po2_limits_bar};
use ebbline::report::layout::{WIDTH, columns};
use ebbline::report::session_list::{self, Row};
use ebbline::report::session_shown::{self, Shown};
use ebbline::report::session_uptake::{Named, Reported, summary_line, text, why_not};
use ebbline::report::{Units, uptake_json};
use ebbline::stats::monte_carlo::Plan;
use ebbline::uptake::{MonteCarlo, SessionInput, Uptake, uptake, uptake_by_monte_carlo};
use proptest::prelude::*;
use serde_json::Value;

fn scene(kind: Kind, seed: u64) -> Scene {
    let mut dice = Dice::new(seed);
    let truth = truth(&mut dice);
    scene_of(kind, truth, &Extra::default(), &mut dice)
}

/// Sessions worked out, with all that a report needs.
struct Worked {
    scenes: Vec<Scene>,
    names: Vec<String>,
    uptake: Uptake,
    monte_carlo: Vec<(Place, MonteCarlo)>,
    notes: Vec<String>,
}

impl Worked {
    fn of(scenes: Vec<Scene>) -> Self {
        let inputs: Vec<_> =
            scenes.iter().map(|s| SessionInput { session: &s.session, line: s.line.as_ref() }).collect();
        let made = uptake(&inputs).unwrap();
        let names = (1..=scenes.len()).map(|n| format!("S{n:04}")).collect();
        Self { scenes, names, uptake: made, monte_carlo: Vec::new(), notes: Vec::new() }
    }

    fn with<T>(&self, say: impl Fn(&Reported<'_>) -> T) -> T {
        let named: Vec<Named<'_>> = self
            .names
            .iter()
            .zip(&self.scenes)
            .map(|(name, scene)| Named {
                name,
                session: &scene.session,
                line: scene.line.as_ref().map(|_| "CMF-0417, run R0003"),
            })
            .collect();
        say(&Reported {
            uptake: &self.uptake,
            sessions: &named,
            monte_carlo: &self.monte_carlo,
            notes: &self.notes,
        })
    }

    fn text(&self) -> String {
        self.with(|reported| text(reported, &Units::default()))
    }

    fn json(&self) -> Value {
        serde_json::from_str(&self.with(uptake_json::document)).unwrap()
    }
}

/// A session of which nobody can make a number.
fn hopeless() -> Scene {
    let mut scene = scene(Kind::Held, 7);
    scene.session.loop_volume = None;
    scene
}

fn in_the_pool(mut scene: Scene, days_later: i64) -> Scene {
    let session = &mut scene.session;
    session.place = Place::Pool;
    session.conditions.depth.value = Some(Length::from_m(0.0));
    session.conditions.depth.expanded = Some(Length::from_m(0.2));
    session.taken += chrono::TimeDelta::days(days_later);
    scene
}

fn one(kind: Kind, seed: u64) -> Worked {
    Worked::of(vec![scene(kind, seed)])
}

#[test]
fn the_document_has_the_keys_of_the_interface() {
    // Written off the contract by hand.
    let top = [
        "format",
        "method",
        "uptake_l_min",
        "u",
        "degrees_of_freedom",
        "interval_95",
        "why_not",
        "next_day",
        "sessions",
        "budget",
        "would_help",
        "warnings",
    ];
    let next_day = ["uptake_l_min", "u", "degrees_of_freedom", "interval_95", "days"];
    let session = ["diver", "place", "uptake_l_min", "u", "segments", "loop_volume_l", "cells_left_out"];
    let segment = [
        "from_s",
        "to_s",
        "loop",
        "injection_l_min",
        "slope_per_min",
        "slope_u",
        "slope_u_noise",
        "slope_u_ordinary",
        "readings",
        "uptake_l_min",
        "u",
    ];
    let has = |value: &Value, keys: &[&str]| {
        let object = value.as_object().unwrap();
        for key in keys {
            assert!(object.contains_key(*key), "{key} is missing in {value:#}");
        }
    };
    for kind in Kind::ALL {
        let json = one(kind, 11).json();
        has(&json, &top);
        assert_eq!(json["format"], 1);
        has(&json["next_day"], &next_day);
        assert_eq!(json["next_day"]["days"], 1);
        has(&json["sessions"][0], &session);
        has(&json["sessions"][0]["loop_volume_l"], &["value", "u", "origin"]);
        for row in json["sessions"][0]["segments"].as_array().unwrap() {
            has(row, &segment);
        }
        has(&json["budget"][0], &["source", "u_l_min"]);
        has(&json["would_help"][0], &["what", "interval_half_width_l_min"]);
        assert!(json["warnings"].as_array().unwrap().iter().all(Value::is_string));
        assert!(json["uptake_l_min"].as_f64().unwrap() > 0.0 && json["why_not"].is_null());
        let (low, high) =
            (json["interval_95"][0].as_f64().unwrap(), json["interval_95"][1].as_f64().unwrap());
        assert!(
            low < json["uptake_l_min"].as_f64().unwrap() && json["uptake_l_min"].as_f64().unwrap() < high
        );
    }
    let none = Worked::of(vec![hopeless()]).json();
    has(&none, &top);
    has(&none["sessions"][0], &session);
    for key in ["uptake_l_min", "u", "degrees_of_freedom", "interval_95", "next_day"] {
        assert!(none[key].is_null(), "{key}");
    }
    assert!(none["why_not"].as_str().unwrap().contains("loop_volume"));
    assert_eq!(none["budget"], serde_json::json!([]));
}

#[test]
fn infinite_degrees_of_freedom_are_null_and_no_limit() {
    let mut worked = one(Kind::Held, 3);
    let Ok(estimate) = &mut worked.uptake.places[0].answer else { panic!("no answer") };
    estimate.dof = f64::INFINITY;
    estimate.next_day.dof = 12.3;
    assert!(worked.json()["degrees_of_freedom"].is_null());
    assert_eq!(worked.json()["next_day"]["degrees_of_freedom"], 12.3);
    let words = worked.text().split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(
        words.contains("degrees of freedom no limit") && words.contains("degrees of freedom 12."),
        "{words}"
    );
}

#[test]
fn couch_and_pool_stand_apart_and_the_lower_one_is_on_top() {
    let worked = Worked::of(vec![
        in_the_pool(scene(Kind::Held, 21), 0),
        scene(Kind::Sealed, 22),
        scene(Kind::Held, 23),
    ]);
    let (place, estimate) = worked.uptake.lowest().unwrap();
    let json = worked.json();
    assert_eq!(json["place"], place.place.name());
    assert!((json["uptake_l_min"].as_f64().unwrap() - estimate.uptake_l_min).abs() < 1e-9);
    let places: Vec<&str> =
        json["places"].as_array().unwrap().iter().map(|p| p["place"].as_str().unwrap()).collect();
    assert_eq!(places, ["couch", "pool"]);
    assert!(json["places"].as_array().unwrap().iter().all(|p| p["next_day"]["uptake_l_min"].is_number()));
    // In the order handed in, the pool first.
    let names: Vec<&Value> = json["sessions"].as_array().unwrap().iter().map(|s| &s["session"]).collect();
    assert_eq!(names, ["S0001", "S0002", "S0003"]);
    assert_eq!(json["sessions"][0]["place"], "pool");
    let text = worked.text();
    assert!(
        text.contains("never pooled") && text.contains("\nCouch\n") && text.contains("\nPool\n"),
        "{text}"
    );
}

#[test]
fn a_place_without_a_number_is_said_beside_one_that_has_one() {
    let worked = Worked::of(vec![in_the_pool(hopeless(), 0), scene(Kind::Held, 24)]);
    let json = worked.json();
    assert_eq!(json["place"], "couch");
    assert!(json["why_not"].is_null() && json["places"][1]["why_not"].is_string());
    assert!(json["places"][1]["uptake_l_min"].is_null() && json["sessions"][0]["why_not"].is_string());
    assert!(worked.with(why_not).is_none());
    let warnings = json["warnings"].to_string();
    assert!(warnings.contains("pool: no number"), "{warnings}");
}

#[test]
fn without_a_number_the_reason_and_the_advice_come_first() {
    let worked = Worked::of(vec![hopeless()]);
    let (text, why) = (worked.text(), worked.with(why_not).unwrap());
    assert!(text.starts_with("No resting oxygen uptake of D-07: "), "{text}");
    assert!(why.contains("another injection") && why.contains("loop_volume = "), "{why}");
    assert!(
        !text.contains("Budget") && !text.contains("another day") && text.contains("Before the next session")
    );
    let two = Worked::of(vec![hopeless(), hopeless()]);
    let why = two.with(why_not).unwrap();
    assert!(why.contains("S0001: ") && why.contains("S0002: "), "{why}");
}

#[test]
fn what_is_no_uptake_is_never_printed() {
    // A loop at a constant PO2 without injection: nothing is used.
    let mut scene = scene(Kind::Held, 5);
    for event in &mut scene.session.events {
        event.what = ebbline::entry::What::Injection(ebbline::entry::Injection::Off);
    }
    for cell in &mut scene.session.readings.cells {
        if let ebbline::entry::CellSignal::Bar(column) = &mut cell.signal {
            for (i, po2) in column.iter_mut().enumerate() {
                *po2 = 0.8 + 0.001 * ((i * 7919 % 13) as f64 - 6.0) / 6.0;
            }
        }
    }
    let worked = Worked::of(vec![scene]);
    let ebbline::uptake::WhyNot::NotPositive { came_out } =
        worked.uptake.places[0].answer.as_ref().unwrap_err()
    else {
        panic!("{:?}", worked.uptake.places[0].answer)
    };
    let digits = format!("{:.3}", came_out.abs());
    for said in [worked.text(), worked.json().to_string(), worked.with(why_not).unwrap()] {
        assert!(!said.contains(&digits), "{digits} in {said}");
    }
}

/// Every "number ± number" of a text.
fn pairs(text: &str) -> Vec<(String, String)> {
    let words: Vec<&str> = text.split_whitespace().collect();
    let is_number = |w: &str| w.parse::<f64>().is_ok();
    words
        .windows(3)
        .filter(|w| w[1] == "±" && is_number(w[0]))
        .map(|w| (w[0].to_owned(), w[2].trim_end_matches([',', ';', ')']).to_owned()))
        .collect()
}

fn decimals(number: &str) -> usize {
    number.split_once('.').map_or(0, |(_, d)| d.len())
}

proptest! {
    #[test]
    fn value_and_uncertainty_end_at_the_same_place(
        value in 0.05..3.0f64,
        relative in 1e-4..0.9f64,
        next in 1e-3..0.9f64,
        millilitres in any::<bool>(),
    ) {
        let mut worked = one(Kind::Held, 3);
        let Ok(estimate) = &mut worked.uptake.places[0].answer else { panic!("no answer") };
        estimate.uptake_l_min = value;
        estimate.interval_95 = (value * (1.0 - relative), value * (1.0 + relative));
        estimate.next_day.uptake_l_min = value;
        estimate.next_day.interval_95 = (value * (1.0 - next), value * (1.0 + next));
        let units = Units::new(ShownUnits::parse(if millilitres { "mL/min" } else { "" }).unwrap());
        let line = worked.with(|reported| summary_line(reported, &units));
        let pairs = pairs(&line);
        prop_assert_eq!(pairs.len(), 2, "{}", line);
        for (value, u) in pairs {
            prop_assert_eq!(decimals(&value), decimals(&u), "{}", line);
        }
    }
}

#[test]
fn every_pair_of_value_and_uncertainty_in_a_text_agrees() {
    for (i, kind) in Kind::ALL.into_iter().enumerate() {
        let mut scene = scene(kind, 100 + i as u64);
        scene.session.mass = Some(Mass::from_kg(82.0));
        let text = Worked::of(vec![scene]).text();
        let pairs = pairs(&text);
        assert!(pairs.len() >= 3, "{text}");
        for (value, u) in pairs {
            assert_eq!(decimals(&value), decimals(&u), "{value} ± {u} in {text}");
        }
    }
}

#[test]
fn an_uneven_interval_is_given_by_its_ends() {
    let mut worked = one(Kind::Null, 31);
    let Ok(estimate) = &mut worked.uptake.places[0].answer else { panic!("no answer") };
    (estimate.uptake_l_min, estimate.interval_95) = (0.300, (0.270, 0.350));
    let line = worked.with(|reported| summary_line(reported, &Units::default()));
    assert!(line.contains("0.300 L/min STPD (95 % from 0.270 to 0.350)"), "{line}");
}

#[test]
fn texts_are_eighty_columns_wide_in_any_unit() {
    let american = Units::new(ShownUnits::parse("psi,mL/min,ft,F").unwrap());
    for (i, kind) in Kind::ALL.into_iter().enumerate() {
        let seed = 40 + i as u64;
        let mut second = scene(kind, seed + 1000);
        second.session.taken += chrono::TimeDelta::days(3);
        let worked =
            Worked::of(vec![scene(kind, seed), second, in_the_pool(scene(kind, seed + 2000), 1), hopeless()]);
        for units in [Units::default(), american] {
            let text = worked.with(|reported| text(reported, &units));
            for line in text.lines() {
                assert!(columns(line) <= WIDTH, "{kind:?}: {line}");
            }
            let shown = session_shown::text(&shown(&worked.scenes[0].session, &[]), &units);
            for line in shown.lines() {
                assert!(columns(line) <= WIDTH, "{kind:?}: {line}");
            }
        }
    }
}

#[test]
fn the_same_results_give_the_same_bytes() {
    let (a, b) = (one(Kind::Line, 8), one(Kind::Line, 8));
    assert_eq!(a.text(), b.text());
    assert_eq!(a.with(uptake_json::document), b.with(uptake_json::document));
}

#[test]
fn cautions_stand_beside_the_number_and_before_the_next_session() {
    let words = |text: &str| text.split_whitespace().collect::<Vec<_>>().join(" ");
    let text = words(&one(Kind::Held, 3).text());
    for caution in SESSION.iter().chain(&UPTAKE) {
        assert!(text.contains(&words(caution)), "{caution}");
    }
    // The numbers of the cautions are those that act.
    for place in [Place::Couch, Place::Pool] {
        let (floor, ceiling) = po2_limits_bar(place);
        let line = SESSION.iter().find(|c| c.to_lowercase().starts_with(place.name())).unwrap();
        assert!(
            line.contains(&format!("{floor:.2} bar")) && line.contains(&format!("{ceiling:.1} bar")),
            "{line}"
        );
    }
    assert!(SESSION.iter().any(|c| c.contains(&format!("deeper than {POOL_DEEPEST_M:.0} m"))));
}

#[test]
fn a_record_that_passed_a_limit_carries_its_own_caution() {
    // Couch: floor 0.40, ceiling 1.0; readings 5 s apart.
    let with = |place: Place, row: usize, po2: f64| {
        let mut scene = scene(Kind::Held, 51);
        scene.session.place = place;
        for cell in &mut scene.session.readings.cells {
            if let ebbline::entry::CellSignal::Bar(column) = &mut cell.signal {
                column[row] = po2;
            }
        }
        let worked = Worked::of(vec![scene]);
        (worked.json(), worked.text())
    };
    let of = |json: &Value, word: &str| {
        let all = json["warnings"].as_array().unwrap().clone();
        all.into_iter().filter_map(|w| w.as_str().map(str::to_owned)).find(|w| w.contains(word))
    };
    let (json, text) = with(Place::Couch, 150, 0.381);
    let caution = of(&json, "below the floor").unwrap();
    assert!(
        caution.contains("0.381 bar at 00:12:30") && caution.contains("0.40 bar for a couch"),
        "{caution}"
    );
    assert_eq!(json["sessions"][0]["po2_lowest_bar"], 0.381);
    assert!(
        text.replace(
            "
    ", " "
        )
        .contains("below the floor"),
        "{text}"
    );
    let (json, _) = with(Place::Couch, 30, 1.004);
    let caution = of(&json, "above the ceiling").unwrap();
    assert!(
        caution.contains("1.004 bar at 00:02:30") && caution.contains("1.0 bar for a couch"),
        "{caution}"
    );
    let (json, _) = with(Place::Pool, 150, 0.55);
    assert!(of(&json, "below the floor").unwrap().contains("0.60 bar for a pool"));
    // A faulty reading is no PO2, and a usual session has no such caution.
    for po2 in [0.0, 1.9] {
        let (json, _) = with(Place::Couch, 150, po2);
        assert!(of(&json, "the record is used").is_none(), "{json:#}");
    }
    let mut deep = in_the_pool(scene(Kind::Held, 52), 0);
    deep.session.conditions.depth.value = Some(Length::from_m(4.0));
    deep.session.conditions.barometer.expanded = Some(PressureDifference::from_bar(0.002));
    let json = Worked::of(vec![deep]).json();
    let caution = of(&json, "deeper than").unwrap();
    assert!(caution.contains("went to 4 m, deeper than the 3 m"), "{caution}");
}

#[test]
fn an_unmarked_jump_is_proposed_ready_to_paste() {
    // Oxygen added at 7 min 30 s of a held session, and the event forgotten.
    let mut jumped = scene(Kind::Held, 61);
    for cell in &mut jumped.session.readings.cells {
        if let ebbline::entry::CellSignal::Bar(column) = &mut cell.signal {
            for po2 in column.iter_mut().skip(90) {
                *po2 += 0.08;
            }
        }
    }
    let worked = Worked::of(vec![jumped]);
    let (json, text) = (worked.json(), worked.text());
    let proposed = &json["sessions"][0]["proposed_events"][0];
    assert_eq!(proposed["what"], "oxygen add");
    let at = proposed["at"].as_str().unwrap();
    assert!((proposed["at_s"].as_f64().unwrap() - 450.0).abs() <= 20.0, "{at}");
    let lines = format!("    [[events]]\n    at = \"{at}\"\n    what = \"oxygen add\"\n");
    assert!(text.contains(&lines), "{text}");
    // The lines are TOML that says the same.
    let table: toml::Table = lines.parse().unwrap();
    assert_eq!(table["events"][0]["at"].as_str(), Some(at));
}

#[test]
fn monte_carlo_stands_beside_the_budget() {
    let mut worked = one(Kind::Held, 3);
    let plan = Plan { trials: 2000, seed: 5, threads: 1 };
    let input = SessionInput { session: &worked.scenes[0].session, line: None };
    let mc = uptake_by_monte_carlo(&[input], Place::Couch, &plan).unwrap().unwrap();
    worked.monte_carlo.push((Place::Couch, mc));
    assert!(worked.text().contains("Monte Carlo   2000 trials"), "{}", worked.text());
    let json = worked.json();
    assert_eq!(json["monte_carlo"]["trials"], 2000);
    assert_eq!(json["places"][0]["monte_carlo"]["seed"], mc.seed);
    assert!(one(Kind::Held, 3).json()["monte_carlo"].is_null());
}

#[test]
fn an_implausible_uptake_raises_the_question() {
    let mut heavy = scene(Kind::Held, 3);
    heavy.session.mass = Some(Mass::from_kg(400.0));
    let worked = Worked::of(vec![heavy]);
    let warnings = worked.json()["warnings"].to_string();
    assert!(warnings.contains("mL/(kg·min)") && warnings.contains("on record"), "{warnings}");
    assert_eq!(worked.json()["per_kilogram"]["plausible"], "hardly");
}

#[test]
fn a_warning_of_several_sessions_is_said_once_with_their_names() {
    let mut second = scene(Kind::Held, 72);
    second.session.taken += chrono::TimeDelta::days(1);
    second.session.rest.posture = Some("lying".into());
    let worked = Worked::of(vec![scene(Kind::Held, 71), second]);
    let json = worked.json();
    let warnings: Vec<&str> = json["warnings"].as_array().unwrap().iter().filter_map(Value::as_str).collect();
    let meal: Vec<_> = warnings.iter().filter(|w| w.contains("last_meal")).collect();
    assert!(meal.len() == 1 && meal[0].starts_with("S0001, S0002: "), "{meal:?}");
    let posture: Vec<_> = warnings.iter().filter(|w| w.contains("posture")).collect();
    assert!(posture.len() == 1 && posture[0].starts_with("S0001: "), "{posture:?}");
    // The text has what each did not say in one sentence.
    let words = worked.text().split_whitespace().collect::<Vec<_>>().join(" ");
    assert_eq!(words.matches("[rest] does not say").count(), 2, "{words}");
    assert!(words.contains("S0002: [rest] does not say rested_for, last_meal,"), "{words}");
}

fn shown<'a>(session: &'a Session, left_out: &'a [SessionLeftOut]) -> Shown<'a> {
    Shown {
        number: SessionNumber::new(12).unwrap(),
        session,
        recorded: session.taken,
        left_out,
        files: &[],
        notes: &[],
        open: false,
        changes: &[],
    }
}

/// Escape, a line's end, and a mark that turns the direction of text.
const NASTY: &str = "dry \u{1b}[2J suit\n\u{202e}x";

fn hidden(text: &str) -> bool {
    text.chars().any(|c| (c.is_control() && c != '\n') || c == '\u{202e}')
}

#[test]
fn typed_texts_come_out_as_data() {
    let mut session = scene(Kind::Held, 81).session;
    session.rest.suit = Some(NASTY.into());
    session.rest.posture = Some(NASTY.into());
    session.readings.cells[1].name = NASTY.into();
    session.line = Some(ebbline::entry::LineReference::RunFile(NASTY.into()));
    let out = [SessionLeftOut {
        stretch_s: Some((60.0, 120.0)),
        why: NASTY.into(),
        by: Some(NASTY.into()),
        at: session.taken,
    }];
    let (files, notes) = ([NASTY.to_owned()], [NASTY.to_owned()]);
    let shown = Shown { files: &files, notes: &notes, ..shown(&session, &out) };
    let text = session_shown::text(&shown, &Units::default());
    assert!(!hidden(&text) && text.contains("\\u{1b}[2J"), "{text}");
    let json: Value = serde_json::from_str(&session_shown::json(&shown)).unwrap();
    assert_eq!(json["rest"]["suit"], NASTY);
    assert_eq!(json["left_out"][0]["why"], NASTY);
    assert_eq!(json["readings"][1]["cell"], NASTY);
    let rows = [Row::of(
        SessionNumber::new(3).unwrap(),
        &session,
        &[SessionLeftOut { stretch_s: None, ..out[0].clone() }],
    )];
    let list = session_list::text(&rows, false);
    assert!(!hidden(&list) && list.contains("left out"), "{list}");

    // The cell that carries the name is left out, so that a sentence has to name it.
    let mut off = scene(Kind::Held, 82);
    off.session.readings.cells[1].name = NASTY.into();
    if let ebbline::entry::CellSignal::Bar(column) = &mut off.session.readings.cells[1].signal {
        column.iter_mut().for_each(|po2| *po2 -= 0.08);
    }
    let mut worked = Worked::of(vec![off]);
    worked.names[0] = NASTY.into();
    worked.notes.push(NASTY.into());
    assert!(!hidden(&worked.text()));
    let json = worked.json();
    assert_eq!(json["sessions"][0]["cells_left_out"], serde_json::json!([NASTY]));
    assert!(json["sessions"][0]["cells_left_out_why"][0].as_str().unwrap().contains("bar below the middle"));
    assert_eq!(json["sessions"][0]["session"], NASTY);
}

#[test]
fn a_session_is_shown_as_it_was_recorded() {
    let mut session = scene(Kind::SealedTwice, 91).session;
    session.rest.rested_for = Some(Span::from_s(1500.0));
    session.rest.water_temperature = Some(Temperature::from_c(33.0));
    session.rest.caffeine_or_nicotine = Some(false);
    // Events written out of order are shown by time.
    session.events.reverse();
    let text = session_shown::text(&shown(&session, &[]), &Units::default());
    assert!(text.starts_with("S0012 — D-07, couch, sealed loop, 24 min\n"), "{text}");
    let at = |word: &str| text.find(word).unwrap_or_else(|| panic!("{word} in {text}"));
    assert!(at("  00:00:00  injection") < at("  00:12:00  oxygen add of"), "{text}");
    // 25 °C and 1.013 bar, as the script has it.
    assert!(text.contains("litres at 25 °C, 101.3 kPa"), "{text}");
    assert!(
        text.contains("rested for          25 min") && text.contains("water temperature   33 °C"),
        "{text}"
    );
    let json: Value = serde_json::from_str(&session_shown::json(&shown(&session, &[]))).unwrap();
    assert_eq!(json["session"], "S0012");
    let first = &json["readings"][0];
    let ebbline::entry::CellSignal::Bar(column) = &session.readings.cells[0].signal else { panic!("bar") };
    // Twelve significant figures.
    let is = |value: &Value, want: f64| assert!((value.as_f64().unwrap() - want).abs() < 1e-11, "{value}");
    is(&first["first"], column[0]);
    assert_eq!(first["readings"], column.len());
    let least = column.iter().copied().fold(f64::INFINITY, f64::min);
    is(&first["lowest"], least);
    for key in [
        "diver",
        "place",
        "loop",
        "taken",
        "minutes",
        "cells",
        "left_out",
        "events",
        "conditions",
        "warnings",
    ] {
        assert!(json.get(key).is_some(), "{key}");
    }
}

#[test]
fn a_list_says_what_was_left_out_and_that_there_is_more() {
    let session = scene(Kind::Held, 92).session;
    let number = |n| SessionNumber::new(n).unwrap();
    let out = |stretch_s| SessionLeftOut { stretch_s, why: "phone rang".into(), by: None, at: session.taken };
    let rows = [
        Row::of(number(3), &session, &[]),
        Row::of(number(2), &session, &[out(Some((0.0, 60.0))), out(Some((100.0, 160.0)))]),
        Row::of(number(1), &session, &[out(None)]),
    ];
    let text = session_list::text(&rows, true);
    assert!(
        text.contains("2 stretches left out")
            && text.lines().any(|l| l.trim_start().starts_with("S0001") && l.ends_with("left out")),
        "{text}"
    );
    assert!(text.contains("--all") && text.lines().all(|l| columns(l) <= WIDTH), "{text}");
    assert!(!session_list::text(&rows, false).contains("--all"));
    let json: Value = serde_json::from_str(&session_list::json(&rows)).unwrap();
    assert_eq!(json[0]["session"], "S0003");
    assert_eq!(json[1]["stretches_left_out"], 2);
    assert_eq!(json[2]["left_out_whole"], true);
    assert!(session_list::text(&[], false).starts_with("No sessions"));
}
