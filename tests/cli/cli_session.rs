//! `session` as its users see it: what is said, what is kept, and what is refused.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use crate::couch::{self, SHARE, UPTAKE, at, small_file, stated, through, write, write_orifice, write_three};
use crate::desk::{Desk, fixture};
use crate::loop_simulator::Kind;
use ebbline::entry::{CellSignal, Event, Id, Injection, LineReference, Session, What};
use serde_json::{Value, json};

/// Only the first minutes of a session.
fn cut(mut session: Session, rows: usize) -> Session {
    session.readings.time_s.truncate(rows);
    for cell in &mut session.readings.cells {
        let CellSignal::Bar(column) = &mut cell.signal else { panic!("bar") };
        column.truncate(rows);
    }
    session
}

/// A session of less than three minutes, which has no answer.
fn too_short() -> Session {
    cut(stated(Kind::Held, 5), 30)
}

fn uptake(json: &Value) -> (f64, f64) {
    (json["uptake_l_min"].as_f64().unwrap(), json["u"].as_f64().unwrap())
}

#[track_caller]
fn near_the_truth(json: &Value) {
    let (value, u) = uptake(json);
    assert!((value - UPTAKE).abs() < 3.0 * u && u < 0.1 * UPTAKE, "{value} ± {u}, true {UPTAKE}");
}

#[track_caller]
fn has(value: &Value, keys: &[&str]) {
    for key in keys {
        assert!(value.get(key).is_some(), "no {key} in {value}");
    }
}

#[test]
fn an_import_begins_the_book_and_the_same_bytes_again_add_nothing() {
    let desk = Desk::new("session-import");
    write(&desk, "held", &stated(Kind::Held, 1));
    let said = desk.call(&["session", "import", "held.toml"]);
    assert_eq!(said.status, 0, "{said:?}");
    assert!(said.stdout.contains("S0001 D-07 imported from held.toml"), "{said:?}");
    assert!(said.stdout.contains("the diver is new and was created"), "{said:?}");
    assert!(said.stderr.contains("a new book was begun"), "{said:?}");
    assert_eq!(desk.json(&["diver", "show", "D-07"])["entry"]["id"], "D-07");
    let head = desk.json(&["book", "info"])["head"].clone();
    let again = desk.json(&["session", "import", "held.toml"]);
    assert_eq!(
        again,
        json!([{ "session": "S0001", "diver": "D-07", "file": "held.toml", "new": false, "diver_created": false,
                 "orifice_created": false, "notes": [] }])
    );
    assert_eq!(desk.json(&["book", "info"])["head"], head);
    assert!(desk.done(&["session", "import", "held.toml"]).contains("is there already"));
    // The bytes count, not the name.
    std::fs::copy(desk.folder.join("held.toml"), desk.folder.join("copy.toml")).unwrap();
    assert_eq!(desk.json(&["session", "import", "copy.toml"])[0]["session"], "S0001");
    // Of two new sessions of one unknown diver, the first creates the entry; so does an orifice of the book.
    let mut other = at(stated(Kind::Held, 2), "2026-11-21T18:05:00+11:00");
    other.diver = Id::new("D-08").unwrap();
    other.line = Some(LineReference::Orifice(Id::new("small").unwrap()));
    write(&desk, "other", &other);
    let imported = desk.json(&["session", "import", "other.toml", "other.toml"]);
    let of = |i: usize, key: &str| imported[i][key].clone();
    assert_eq!(
        (of(0, "session"), of(0, "new"), of(0, "diver_created")),
        (json!("S0002"), json!(true), json!(true))
    );
    assert_eq!(
        (of(1, "session"), of(1, "new"), of(1, "diver_created")),
        (json!("S0002"), json!(false), json!(false))
    );
    assert_eq!(of(0, "orifice_created"), json!(true));
    assert_eq!(desk.json(&["orifice", "show", "small"])["entry"]["id"], "small");
    // A session without an answer is kept all the same.
    write(&desk, "short", &at(too_short(), "2026-11-22T18:05:00+11:00"));
    assert_eq!(desk.json(&["session", "import", "short.toml"])[0]["session"], "S0003");
}

#[test]
fn a_mistake_in_one_of_two_files_writes_none() {
    let desk = Desk::new("session-mistake");
    write(&desk, "good", &stated(Kind::Held, 1));
    let text = desk.read("good.toml");
    let bad = |from: &str, to: &str| {
        assert!(text.contains(from), "{from}");
        desk.write("bad.toml", text.replacen(from, to, 1));
    };
    for (from, to, says) in [
        ("what = \"injection\"", "what = \"ejection\"", "ejection"),
        ("at = \"00:00:00\"", "at = \"09:00:00\"", "bad.toml"),
        ("diver = ", "driver = ", "driver"),
        ("record = \"session\"", "record = \"bench run\"", "bench run"),
        ("leak_test = \"passed\"", "leak_test = 5", "leak_test"),
        ("good.csv", "nowhere.csv", "nowhere.csv"),
    ] {
        bad(from, to);
        desk.refused(&["session", "import", "good.toml", "bad.toml"], 2, says);
        assert!(!desk.book().exists(), "{to}");
    }
    desk.write("bad.toml", format!("{text}\n[[\n"));
    desk.refused(&["session", "import", "good.toml", "bad.toml"], 2, "bad.toml");
    desk.refused(&["session", "import", "good.toml", "missing.toml"], 2, "missing.toml");
    // A run file that the session names is a file of the session.
    write(&desk, "through", &through(Kind::HeldTwice, 1, small_file()));
    desk.refused(&["session", "import", "good.toml", "through.toml"], 2, "small.toml");
    assert!(!desk.book().exists());
    for verb in
        [["session", "list"].as_slice(), &["session", "show", "S0001"], &["session", "uptake", "D-07"]]
    {
        desk.refused(verb, 2, "there is no book");
    }
    assert!(!desk.book().exists());
}

#[test]
fn list_and_show_say_what_was_recorded() {
    let desk = Desk::new("session-show");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    write(&desk, "other", &Session { diver: Id::new("D-08").unwrap(), ..stated(Kind::Sealed, 4) });
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml", "other.toml"]);
    let list = desk.json(&["session", "list"]);
    let numbers: Vec<&str> =
        list.as_array().unwrap().iter().map(|row| row["session"].as_str().unwrap()).collect();
    assert_eq!(numbers, ["S0004", "S0003", "S0002", "S0001"]);
    has(
        &list[1],
        &["session", "diver", "place", "loop", "taken", "minutes", "cells", "readings", "left_out_whole"],
    );
    assert_eq!((&list[1]["taken"], &list[1]["cells"]), (&json!("2026-11-24T18:30:00+11:00"), &json!(3)));
    assert_eq!((&list[2]["loop"], &list[2]["minutes"]), (&json!("sealed"), &json!(20.0)));
    assert_eq!(desk.json(&["session", "list", "d-08"]).as_array().unwrap().len(), 1);
    assert_eq!(desk.json(&["session", "list", "D-09"]), json!([]));
    let text = desk.done(&["session", "list", "--all"]);
    assert!(text.contains("S0001") && text.contains("2026-11-20") && text.contains("held"), "{text}");
    let shown = desk.json(&["session", "show", "s0001"]);
    assert_eq!((&shown["session"], &shown["diver"]), (&json!("S0001"), &json!("D-07")), "{shown}");
    let text = desk.done(&["session", "show", "S0001"]);
    for says in
        ["D-07, couch, held loop", "couch-1.toml, couch-1.csv, small.toml", "injection at IP", "313 rows"]
    {
        assert!(text.contains(says), "no {says:?} in {text}");
    }
    assert!(text.lines().all(|line| line.chars().count() <= 80), "{text}");
    // Pressures as they are asked for.
    assert!(desk.done(&["session", "show", "S0001", "--show", "psi"]).contains("psi"));
    desk.refused(&["session", "show", "S0009"], 2, "S0009");
    desk.refused(&["session", "show", "R0001"], 2, "is no session");
    desk.refused(&["session", "show", "couch-1.toml"], 2, "is no session");
}

#[test]
fn a_stretch_that_is_left_out_no_longer_counts_and_stays_in_the_record() {
    let desk = Desk::new("session-stretch");
    write(&desk, "held", &stated(Kind::Held, 1));
    desk.done(&["session", "import", "held.toml"]);
    let before = desk.json(&["session", "uptake", "S0001"]);
    near_the_truth(&before);
    let out = ["session", "leave-out", "S0001", "--from", "00:05:00", "--until", "00:07:30", "--why"];
    let with = |more: &[&str]| desk.json(&[&out, more].concat());
    assert_eq!(
        with(&["spoke, mask off", "--by", "A. Invented"]),
        json!({ "session": "S0001", "from_s": 300.0, "until_s": 450.0, "why": "spoke, mask off" })
    );
    let after = desk.json(&["session", "uptake", "D-07"]);
    let readings = |json: &Value| -> i64 {
        let segments = json["sessions"][0]["segments"].as_array().unwrap();
        segments.iter().map(|segment| segment["readings"].as_i64().unwrap()).sum()
    };
    assert!(readings(&after) < readings(&before) - 20, "{after}");
    assert!(uptake(&after) != uptake(&before));
    assert!(
        after["sessions"][0]["left_out"].as_array().unwrap().iter().any(|out| out["from_s"] == 300.0),
        "{after}"
    );
    near_the_truth(&after);
    let text = desk.done(&["session", "show", "S0001"]);
    assert!(text.contains("from 00:05:00 to 00:07:30: spoke, mask off"), "{text}");
    assert_eq!(desk.json(&["session", "list"])[0]["stretches_left_out"], 1);
    // A time of day is the same moment; the same stretch again, one outside, and one the wrong way round are refused.
    let again = ["--from", "2026-11-20T18:10:00+11:00", "--until", "2026-11-20T18:12:30+11:00", "--why", "x"];
    desk.refused(&[&["session", "leave-out", "S0001"], again.as_slice()].concat(), 2, "already left out");
    for (from, until, says) in [
        ("00:07:00", "00:06:00", "correct --from or --until"),
        ("00:19:00", "02:00:00", "0 s to 1200 s"),
        ("90", "00:06:00", "\"90\""),
    ] {
        let call = ["session", "leave-out", "S0001", "--from", from, "--until", until, "--why", "x"];
        desk.refused(&call, 2, says);
    }
    desk.refused(&["session", "leave-out", "S0001", "--why", " "], 2, "--why");
    desk.refused(&["session", "leave-out", "S0001", "--why", "a\u{202e}b"], 2, "--why");
    desk.refused(&["session", "leave-out", "S0001", "--from", "00:01:00", "--why", "x"], 2, "--until");
    desk.refused(&["session", "leave-out", "S0007", "--why", "x"], 2, "S0007");
    assert_eq!(desk.json(&["book", "check"])["holds"], true);
}

#[test]
fn a_whole_session_that_is_left_out_counts_only_by_its_number() {
    let desk = Desk::new("session-whole");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    let all = desk.json(&["session", "uptake", "D-07"]);
    assert_eq!(all["sessions"].as_array().unwrap().len(), 3);
    near_the_truth(&all);
    let left_out = desk.json(&["session", "leave-out", "S0002", "--why", "ate before"]);
    assert_eq!(left_out, json!({ "session": "S0002", "from_s": null, "until_s": null, "why": "ate before" }));
    let rest = desk.json(&["session", "uptake", "D-07"]);
    let names = |json: &Value| -> Vec<String> {
        let sessions = json["sessions"].as_array().unwrap();
        sessions.iter().map(|s| s["session"].as_str().unwrap().to_owned()).collect()
    };
    assert_eq!(names(&rest), ["S0001", "S0003"]);
    assert!(rest["notes"].to_string().contains("S0002 is left out"), "{rest}");
    assert_eq!(desk.json(&["session", "uptake", "S0001", "S0003"])["uptake_l_min"], rest["uptake_l_min"]);
    let named = desk.json(&["session", "uptake", "S0001", "S0002", "S0003"]);
    assert_eq!((uptake(&named), names(&named).len()), (uptake(&all), 3));
    assert_eq!(desk.json(&["session", "list"])[1]["left_out_whole"], true);
    desk.refused(&["session", "leave-out", "S0002", "--why", "again"], 2, "already left out");
    desk.done(&["session", "leave-out", "S0001", "--why", "x"]);
    desk.done(&["session", "leave-out", "S0003", "--why", "x"]);
    desk.refused(&["session", "uptake", "D-07"], 2, "D-07 has no session in the book that counts");
    assert_eq!(desk.call(&["session", "uptake", "S0003"]).status, 0);
}

#[test]
fn a_file_a_number_and_a_diver_give_the_same_to_the_last_bit() {
    let desk = Desk::new("session-same");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    let files = ["session", "uptake", "couch-1.toml", "couch-2.toml", "couch-3.toml"];
    let of_files = desk.json(&files);
    near_the_truth(&of_files);
    assert!(!desk.book().exists(), "a file needs no book");
    // What the run file leaves unsaid is said once, and of the run file.
    assert_eq!(
        of_files["notes"],
        json!([
            "small.toml: no purity of the oxygen is stated: taken as 99.5 % ± 0.3 %",
            "couch-1.toml: the IP of 4.7 bar lies outside what the bench run of small measured: the line is stretched"
        ])
    );
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    // The files are not needed any more.
    for name in ["small.toml", "small.csv", "couch-1.csv", "couch-2.csv", "couch-3.csv"] {
        std::fs::remove_file(desk.folder.join(name)).unwrap();
    }
    let without_names = |mut json: Value| {
        for session in json["sessions"].as_array_mut().unwrap() {
            session["session"].take();
            session["line"].take();
        }
        // Both say it of sessions by their names.
        json["warnings"].take();
        json["notes"].take();
        json
    };
    let of_files = without_names(of_files);
    for of in [["S0001", "S0002", "S0003"].as_slice(), &["D-07"], &["d-07", "s0002"]] {
        let of_book = desk.json(&[&["session", "uptake"], of].concat());
        assert_eq!(without_names(of_book), of_files, "{of:?}");
    }
    let text = desk.done(&["session", "uptake", "D-07"]);
    assert!(text.contains("L/min STPD") && text.contains("S0003"), "{text}");
    assert!(text.lines().all(|line| line.chars().count() <= 80), "{text}");
}

#[test]
fn the_same_readings_are_one_session_however_often_they_are_named() {
    let desk = Desk::new("session-twice");
    write(&desk, "held", &stated(Kind::Held, 1));
    let once = desk.json(&["session", "uptake", "held.toml"]);
    let twice = desk.json(&["session", "uptake", "held.toml", "./held.toml"]);
    assert_eq!(uptake(&twice), uptake(&once));
    assert!(twice["notes"].to_string().contains("counts once"), "{twice}");
    desk.done(&["session", "import", "held.toml"]);
    assert_eq!(uptake(&desk.json(&["session", "uptake", "S0001", "held.toml", "D-07"])), uptake(&once));
    // Imported again with something else said of it: which of the two holds is a person's to say.
    desk.write("held.toml", desk.read("held.toml").replace("leak_test = \"passed\"\n", ""));
    desk.done(&["session", "import", "held.toml"]);
    desk.refused(&["session", "uptake", "D-07"], 2, "S0001 and S0002 hold the same readings");
    desk.refused(&["session", "uptake", "S0001", "held.toml"], 2, "hold the same readings");
    desk.done(&["session", "leave-out", "S0001", "--why", "the leak test was not done"]);
    assert_eq!(desk.json(&["session", "uptake", "D-07"])["sessions"][0]["session"], "S0002");
}

#[test]
fn plots_have_a_file_each_and_only_a_number_or_a_reason_makes_one() {
    let desk = Desk::new("session-plot");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    let said = desk.call(&["session", "uptake", "couch-1.toml", "--plot", "one.svg"]);
    assert_eq!(said.status, 0, "{said:?}");
    assert!(said.stderr.contains("plot written to one.svg"), "{said:?}");
    let svg = desk.read("one.svg");
    assert!(svg.starts_with("<svg") && svg.contains("couch-1.toml"), "{svg}");
    write(&desk, "b/couch-2", &stated(Kind::Sealed, 6));
    // On another day: one diver cannot rest twice at once.
    let toml = desk.read("b/couch-2.toml");
    let day = toml.split("taken = \"").nth(1).unwrap()[..10].to_owned();
    desk.write("b/couch-2.toml", toml.replace(&day, "2026-12-03"));
    let files = ["couch-1.toml", "couch-2.toml", "b/couch-2.toml"];
    let said = desk.call(&[&["session", "uptake"], files.as_slice(), &["--plot", "all.svg"]].concat());
    assert_eq!(said.status, 0, "{said:?}");
    assert!(!desk.folder.join("all.svg").exists());
    let (first, second) = (desk.read("all-couch-2.svg"), desk.read("all-couch-2-2.svg"));
    assert!(said.stderr.contains("all-couch-1.svg") && said.stderr.contains("all-couch-2-2.svg"), "{said:?}");
    assert!(first != second && second.contains("b/couch-2.toml"));
    desk.done(&["session", "uptake", "couch-1.toml", "--plot", "one.png"]);
    assert!(std::fs::read(desk.folder.join("one.png")).unwrap().starts_with(b"\x89PNG"));
    desk.refused(&["session", "uptake", "couch-1.toml", "--plot", "one.gif"], 2, ".svg or .png");
    desk.refused(&["session", "uptake", "couch-1.toml", "--plot", "no/such/one.svg"], 3, "one.svg");
    // Without an answer it is drawn too, and says why.
    write(&desk, "short", &too_short());
    assert_eq!(desk.call(&["session", "uptake", "short.toml", "--plot", "short.svg"]).status, 1);
    assert!(desk.read("short.svg").starts_with("<svg"));
}

#[test]
fn a_monte_carlo_check_agrees_with_the_budget_and_is_the_same_each_time() {
    let desk = Desk::new("session-monte-carlo");
    write(&desk, "held", &stated(Kind::HeldTwice, 1));
    let call = ["session", "uptake", "held.toml", "--monte-carlo", "2000"];
    let json = desk.json(&call);
    let check = &json["monte_carlo"];
    assert_eq!((&check["trials"], &check["generator"]), (&json!(2000), &json!("ChaCha8")), "{json}");
    let (value, u) = uptake(&json);
    let (mean, spread) = uptake(check);
    // Of 2000 trials the mean scatters by u/45 and u by a sixtieth; the rest is what the budget leaves out.
    assert!(
        (mean - value).abs() < 0.2 * u && (spread / u - 1.0).abs() < 0.2,
        "{value} ± {u}, {mean} ± {spread}"
    );
    assert_eq!(json, desk.json(&call));
    assert!(desk.done(&call).contains("Monte Carlo"));
    for trials in ["999", "10000001"] {
        desk.refused(&["session", "uptake", "held.toml", "--monte-carlo", trials], 2, "1000 to 10000000");
    }
}

#[test]
fn the_document_has_the_keys_of_the_interface() {
    let desk = Desk::new("session-json");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    let json = desk.json(&["session", "uptake", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    has(
        &json,
        &[
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
        ],
    );
    assert_eq!((&json["format"], &json["method"], &json["why_not"]), (&json!(1), &json!(1), &Value::Null));
    has(&json["next_day"], &["uptake_l_min", "u", "degrees_of_freedom", "interval_95", "days"]);
    assert_eq!(json["next_day"]["days"], 2);
    let session = &json["sessions"][0];
    has(session, &["diver", "place", "uptake_l_min", "u", "segments", "loop_volume_l", "cells_left_out"]);
    assert_eq!((&session["diver"], &session["place"]), (&json!("D-07"), &json!("couch")));
    let keys = [
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
    for segment in session["segments"].as_array().unwrap() {
        has(segment, &keys);
    }
    has(&session["loop_volume_l"], &["value", "u", "origin"]);
    has(&json["budget"][0], &["source", "u_l_min"]);
    has(&json["would_help"][0], &["what", "interval_half_width_l_min"]);
    assert!(json["warnings"].is_array());
    let interval = json["interval_95"].as_array().unwrap();
    assert!(interval[0].as_f64() < json["uptake_l_min"].as_f64(), "{json}");
    assert!(json["uptake_l_min"].as_f64() < interval[1].as_f64(), "{json}");
}

#[test]
fn without_an_answer_the_document_holds_nulls_and_the_reason() {
    let desk = Desk::new("session-no-answer");
    write(&desk, "short", &too_short());
    let said = desk.call(&["session", "uptake", "short.toml", "--json"]);
    assert_eq!(said.status, 1, "{said:?}");
    let json: Value = serde_json::from_str(&said.stdout).unwrap();
    for key in ["uptake_l_min", "u", "degrees_of_freedom", "interval_95", "next_day"] {
        assert_eq!(json[key], Value::Null, "{key}");
    }
    let why = json["why_not"].as_str().unwrap();
    assert!(!why.is_empty() && json["sessions"][0]["why_not"].is_string(), "{json}");
    let of_stderr: String = said.stderr.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(of_stderr.contains(why), "{of_stderr:?} does not say {why:?}");
    let text = desk.call(&["session", "uptake", "short.toml"]);
    assert_eq!(text.status, 1);
    assert!(!text.stdout.is_empty() && !text.stderr.is_empty(), "{text:?}");
    // One that has no answer does not spoil one that has.
    write(&desk, "held", &at(stated(Kind::Held, 1), "2026-11-21T18:05:00+11:00"));
    let both = desk.json(&["session", "uptake", "short.toml", "held.toml"]);
    assert_eq!(uptake(&both), uptake(&desk.json(&["session", "uptake", "held.toml"])));
    assert!(both["sessions"][0]["why_not"].is_string() && both["sessions"][1]["why_not"].is_null());
}

#[test]
fn what_cannot_be_worked_out_is_refused_by_name() {
    let desk = Desk::new("session-refused");
    write(&desk, "held", &stated(Kind::Held, 1));
    write(&desk, "other", &Session { diver: Id::new("D-08").unwrap(), ..stated(Kind::Sealed, 4) });
    desk.refused(&["session", "uptake", "missing.toml"], 2, "missing.toml");
    write_orifice(&desk, "small", "small", SHARE);
    desk.refused(&["session", "uptake", "small.toml"], 2, "bench run");
    desk.refused(&["session", "uptake", "held.toml", "other.toml"], 2, "D-07 and to D-08");
    desk.refused(&["session", "uptake"], 2, "Usage");
    // An intermediate pressure without a line, and one through an orifice that no book knows.
    let mut by_name = through(Kind::HeldTwice, 1, LineReference::Orifice(Id::new("small").unwrap()));
    write(&desk, "by-name", &by_name);
    desk.refused(&["session", "uptake", "by-name.toml"], 2, "there is no book");
    by_name.line = None;
    write(&desk, "no-line", &by_name);
    desk.refused(&["session", "uptake", "no-line.toml"], 2, "no-line.toml");
    write(&desk, "lost", &through(Kind::HeldTwice, 1, LineReference::RunFile("gone.toml".to_owned())));
    desk.refused(&["session", "uptake", "lost.toml"], 2, "gone.toml");
    assert!(!desk.book().exists());
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.refused(&["session", "uptake", "D-07"], 2, "D-07 has no session");
    desk.refused(&["session", "uptake", "by-name.toml"], 2, "no orifice small");
    desk.done(&["orifice", "add", "small", "--maker", "invented"]);
    desk.refused(&["session", "uptake", "by-name.toml"], 2, "no complete run");
    desk.write("book.db", "no book");
    desk.refused(&["session", "list"], 3, "is not a book");
}

#[test]
fn a_session_by_the_books_orifice_takes_the_run_in_force_when_it_was_taken() {
    let desk = Desk::new("session-in-force");
    // 5 % less flow a year later, when the hole was half blocked.
    couch::write_run_of(&desk, "then", SHARE, |toml| toml.replace("CMF-0417", "small"));
    couch::write_run_of(&desk, "later", 0.95 * SHARE, |toml| {
        toml.replace("CMF-0417", "small").replace("2026-11-12", "2027-11-12")
    });
    let by_name = LineReference::Orifice(Id::new("small").unwrap());
    write(&desk, "by-name", &through(Kind::HeldTwice, 1, by_name));
    write(&desk, "by-file", &through(Kind::HeldTwice, 1, LineReference::RunFile("then.toml".to_owned())));
    let of_file = desk.json(&["session", "uptake", "by-file.toml"]);
    desk.done(&["bench", "import", "later.toml", "then.toml"]);
    let of_name = desk.json(&["session", "uptake", "by-name.toml"]);
    assert_eq!(uptake(&of_name), uptake(&of_file));
    assert!(of_name["notes"].to_string().contains("never judged"), "{of_name}");
    desk.done(&["bench", "accept", "R0002"]);
    let judged = desk.json(&["session", "uptake", "by-name.toml"]);
    assert!(judged["sessions"][0]["line"].as_str().unwrap().contains("run R0002"), "{judged}");
    assert!(!judged["notes"].to_string().contains("never judged"), "{judged}");
}

#[test]
fn a_forgotten_divers_sessions_are_gone_and_say_so() {
    let desk = Desk::new("session-forget");
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    desk.done(&["session", "leave-out", "S0002", "--why", "ate before"]);
    write(&desk, "other", &Session { diver: Id::new("D-08").unwrap(), ..stated(Kind::Sealed, 4) });
    desk.done(&["session", "import", "other.toml"]);
    let before = desk.json(&["session", "uptake", "D-08"]);
    let forgotten = desk.json(&["diver", "forget", "D-07", "--why", "asked in writing"]);
    // The bare entry; of each session a header, readings, a line and its four files; what was left out.
    assert_eq!(forgotten["records_erased"], 1 + 3 * (1 + 1 + 1 + 4) + 1);
    assert_eq!(forgotten["sessions_erased"], json!(["S0001", "S0002", "S0003"]));
    for number in ["S0001", "s0003"] {
        desk.refused(&["session", "show", number], 2, "was erased on 20");
        desk.refused(&["session", "uptake", number], 2, ": asked in writing");
        desk.refused(&["session", "leave-out", number, "--why", "x"], 2, "was erased on 20");
    }
    desk.refused(&["session", "uptake", "D-07"], 2, "D-07 has no session in the book that counts");
    let list = desk.json(&["session", "list"]);
    assert_eq!((list.as_array().unwrap().len(), &list[0]["session"]), (1, &json!("S0004")));
    assert!(!desk.done(&["session", "list"]).contains("S0001"));
    assert_eq!(desk.json(&["session", "uptake", "D-08"]), before);
    // Numbers are never given again.
    desk.done(&["session", "import", "couch-1.toml"]);
    assert_eq!(desk.json(&["session", "list"])[0]["session"], "S0005");
    let text = desk.done(&["diver", "forget", "D-07", "--why", "asked again"]);
    assert!(text.contains("8 records") && text.contains("everything of session S0005"), "{text}");
}

#[test]
fn a_table_of_ones_own_is_taken_as_it_is() {
    // A small table of one's own: own heads, semicolons, decimal commas, clock times, and a reading that is missing.
    let desk = Desk::new("session-own-table");
    let session = stated(Kind::Held, 1);
    let mut csv = String::from("Uhr;Zelle A;Zelle B;Zelle C\n");
    let CellSignal::Bar(column) = &session.readings.cells[0].signal else { panic!("bar") };
    for (row, po2) in column.iter().enumerate() {
        let s = 5 * row;
        let b = if row == 7 { String::new() } else { format!("{:.3}", po2 + 0.001) };
        let line = format!("18:{:02}:{:02};{po2:.3};{b};{:.3}\n", 5 + s / 60, s % 60, po2 - 0.001);
        csv.push_str(&line.replace('.', ","));
    }
    desk.write("own.csv", csv);
    let Some(Event { what: What::Injection(Injection::Flow(flow)), .. }) = session.events.first() else {
        panic!("a flow")
    };
    desk.write(
        "own.toml",
        format!(
            "record = \"session\"\ndiver = \"D-07\"\nplace = \"couch\"\nloop = \"held\"\ndiluent = \"air\"\n\
             loop_volume = \"{:.2} L ± 0.3 L\"\nleak_test = \"passed\"\ntaken = \"2026-11-20T18:05:00+11:00\"\n\
             readings = \"own.csv\"\n[columns]\ntime = {{ column = \"Uhr\" }}\ncells = [\
             {{ column = \"Zelle A\", unit = \"bar\" }}, {{ column = \"Zelle B\", unit = \"bar\" }}, \
             {{ column = \"Zelle C\", unit = \"bar\" }}]\n[conditions]\nbarometer = \"1013 hPa ± 2 hPa\"\n\
             loop_temperature = \"33 °C ± 4 °C\"\ntime_on_loop = \"00:10:00\"\nscrubber_warm = true\n\
             [[events]]\nat = \"00:00:00\"\nwhat = \"injection\"\nflow = \"{:.5} L/min ± 0.005 L/min\"\n",
            session.loop_volume.unwrap().value.as_l(),
            flow.value.as_l_min(),
        ),
    );
    let json = desk.json(&["session", "uptake", "own.toml"]);
    near_the_truth(&json);
    assert_eq!(json["sessions"][0]["cells_left_out"], json!([]), "{json}");
    assert!(json["notes"].to_string().contains("99.5"), "the purity is taken for granted and said: {json}");
    assert!(!desk.book().exists());
}
