//! A session typed: the dialogue through a reader and two writers, and the program with input from a pipe.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::{Read as _, Write as _};
use std::time::Duration;

use crate::bench_files::{RUN, readings, said, write};
use crate::hands::Bench;
use ebbline::book::{Entry, RunState, SessionChange};
use ebbline::entry::{CellSignal, Diluent, Diver, Id, LeakTest, LoopKept, Place};
use ebbline::quantity::{Mass, Share, Uncertain, Volume};
use ebbline::work::ExitStatus;
use ebbline::work::enter_session::{Row, SessionDesk, SessionStart};
use ebbline::work::uptake;

/// A session file of the contract, with a run file for its line.
const SESSION: &str = r#"record = "session"
diver = "D-07"
mass = "82 kg"
place = "couch"
loop = "held"
diluent = "air"
loop_volume = "7.5 L ± 1.0 L"
leak_test = "passed"
nose_clip = true
taken = "2026-11-20T18:05:00+11:00"
readings = "couch.csv"
line = "run.toml"

[columns]
time = { column = "t", unit = "s" }
cells = [ { column = "c1", unit = "bar" }, { column = "c2", unit = "bar" }, { column = "c3", unit = "bar" } ]

[conditions]
barometer = "1016 hPa ± 2 hPa"
loop_temperature = "33 °C ± 4 °C"
time_on_loop = "00:10:00"
scrubber_warm = true

[cells]
gain = "2 %"

[rest]
posture = "lying"
rested_for = "00:25:00"
last_meal = "04:30:00"
last_exercise = "14:00:00"
last_dive = "48:00:00"
caffeine_or_nicotine = false

[assumptions]
wander = "3 %"

[[events]]
at = "00:00:00"
what = "injection"
off = true

[[events]]
at = "00:10:00"
what = "injection"
ip = "5.5 bar ± 0.2 bar"

[[events]]
at = "00:12:00"
what = "exclude"
until = "00:12:30"

[[events]]
at = "00:19:00"
what = "oxygen add"
volume = "0.4 L"
reads_at = "25 °C, 101.3 kPa"
"#;

/// The same events as they are typed, each before the first reading of its time or a later one.
const EVENTS: [(u32, &str); 4] = [
    (0, "0:00 injection off"),
    (600, "10:00 injection 5.5 bar ± 0.2 bar"),
    (720, "12:00 exclude until 12:30"),
    (1140, "19:00 Oxygen Add 0.4 L at 25 °C, 101.3 kPa"),
];

/// A reading every 30 s for 20 min of three cells, one of which was not read once: it sinks while nothing is injected,
/// and less when something is.
fn po2() -> Vec<(u32, [String; 3])> {
    (0..=40_u32)
        .map(|n| {
            let minute = f64::from(n) / 2.0;
            let sunk = 0.032 * minute.min(10.0) + 0.005 * (minute - 10.0).max(0.0);
            let ragged = [0.001, -0.0004, 0.0007, -0.0011][n as usize % 4];
            let cell = |more: f64| format!("{:.4}", 0.9503 + more + ragged - sunk);
            let third = if n == 7 { "-".to_owned() } else { cell(0.0211) };
            (30 * n, [cell(0.0), cell(-0.0107), third])
        })
        .collect()
}

fn csv() -> String {
    let row = |(t, cells): &(u32, [String; 3])| format!("{t},{}\n", cells.join(","));
    String::from("t,c1,c2,c3\n") + &po2().iter().map(row).collect::<String>()
}

/// Every row as it is typed, times in three of the forms there are.
fn lines() -> Vec<String> {
    let mut lines = Vec::new();
    for (t, cells) in po2() {
        lines.extend(EVENTS.iter().filter(|(at, _)| *at == t).map(|(_, line)| (*line).to_owned()));
        let time = match t / 30 % 3 {
            0 => format!("{}:{:02}", t / 60, t % 60),
            1 => format!("0:{:02}:{:02}", t / 60, t % 60),
            _ => t.to_string(),
        };
        lines.push(format!("{time} {}", cells.join(if t % 60 == 0 { " " } else { ", " })));
    }
    lines
}

fn with_files(name: &str) -> Bench {
    let bench = Bench::new(&format!("session-{name}"));
    write(&bench.folder, RUN, readings().as_bytes());
    std::fs::write(bench.folder.join("couch.toml"), SESSION).unwrap();
    std::fs::write(bench.folder.join("couch.csv"), csv()).unwrap();
    bench
}

const TAKEN: [&str; 2] = ["--taken", "2026-11-20T18:05:00+11:00"];
const BARE: [&str; 7] = ["session", "enter", "D-07", "--place", "couch", "--loop", "held"];

fn enter(bench: &Bench, more: &[&str], input: &str) -> (String, String, i32) {
    said(&bench.program(&[&BARE[..], &TAKEN, more].concat(), input))
}

// ---- the same as a file ----

#[test]
fn a_typed_session_is_that_of_the_file_to_the_last_bit() {
    let bench = with_files("same");
    let typed = lines().join("\n") + "\ndone\n";
    let arguments = [&["session", "enter", "d-07", "--from", "couch.toml"][..], &TAKEN].concat();
    let (stdout, stderr, status) = said(&bench.program(&arguments, &typed));
    assert_eq!(status, 0, "{stderr}");
    assert!(
        stdout.contains("S0001 row 45: 00:20:00 PO2") && stdout.contains("Resting oxygen uptake of d-07"),
        "{stdout}"
    );
    assert!(stdout.ends_with("S0001 is complete: session uptake S0001 tells the same again\n"), "{stdout}");
    let (_, stderr, status) = said(&bench.program(&["session", "import", "couch.toml"], ""));
    assert_eq!(status, 0, "{stderr}");
    let (typed, filed) = (bench.session(1), bench.session(2));
    assert_eq!((typed.state, filed.state), (RunState::Complete, RunState::Complete));
    // Debug shows the bits that matter; the code of the diver is as it was typed.
    let mut session = typed.session;
    assert_eq!(session.diver.as_str(), "d-07");
    session.diver = filed.session.diver.clone();
    assert_eq!(format!("{session:?}"), format!("{:?}", filed.session));
    assert_eq!(format!("{:?}", typed.line_run), format!("{:?}", filed.line_run));
    let worked = |of: &str| {
        let mut notes = Vec::new();
        let gathered = uptake::gather(&[of.to_owned()], Some(&bench.book()), &mut notes).unwrap();
        let lowest = uptake::work_out(&gathered).unwrap();
        let (_, estimate) = lowest.lowest().expect("a number");
        let next = &estimate.next_day;
        [estimate.uptake_l_min, estimate.u, next.uptake_l_min, next.u].map(f64::to_bits)
    };
    assert_eq!(worked("S0001"), worked("S0002"));
    bench.holds();
}

#[test]
fn the_document_stands_alone_on_stdout_and_holds_the_rows_and_the_uptake() {
    let bench = with_files("json");
    let mut typed = lines();
    typed.insert(3, "correct 3 0:30 0.9 0.9 0.9".into());
    typed.insert(4, "strike 3 looked at the wrong handset".into());
    let arguments = [&["session", "enter", "D-07", "--from", "couch.toml", "--json"][..], &TAKEN].concat();
    let (stdout, stderr, status) = said(&bench.program(&arguments, &typed.join("\n")));
    assert_eq!(status, 0, "{stderr}");
    let document: serde_json::Value = serde_json::from_str(&stdout).unwrap();
    assert_eq!((&document["session"], &document["open"]), (&"S0001".into(), &true.into()));
    assert_eq!(document["rows"].as_array().unwrap().len(), 45);
    assert_eq!(document["rows"][0]["event"], "injection off");
    assert_eq!(document["rows"][2]["struck"], "looked at the wrong handset");
    assert_eq!(document["rows"][8]["po2_bar"][2], serde_json::Value::Null, "not read is null");
    assert!(stderr.contains("S0001 row 45: "), "the talk goes to stderr: {stderr}");
    // An open session can be asked already, by its number; for the diver it does not count yet.
    let (asked, stderr, status) = said(&bench.program(&["session", "uptake", "S0001", "--json"], ""));
    assert_eq!(status, 0, "{stderr}");
    let asked: serde_json::Value = serde_json::from_str(&asked).unwrap();
    assert_eq!(asked["uptake_l_min"], document["uptake"]["uptake_l_min"]);
    assert!(asked["uptake_l_min"].as_f64().unwrap() > 0.1, "{asked}");
    let (_, stderr, status) = said(&bench.program(&["session", "uptake", "D-07"], ""));
    assert_eq!((status, stderr.contains("no session in the book that counts")), (2, true), "{stderr}");
    let (listed, _, _) = said(&bench.program(&["session", "list"], ""));
    assert!(listed.lines().last().unwrap().ends_with("open"), "{listed}");
    let (shown, _, _) = said(&bench.program(&["session", "show", "S0001"], ""));
    for words in [
        "still open: session resume S0001 goes on with it",
        "row 3 corrected, it was 00:00:30 PO2 0.9339 0.9232 0.955 bar",
        "row 3 struck: looked at the wrong handset",
    ] {
        assert!(shown.contains(words), "{words:?} is not in\n{shown}");
    }
    bench.holds();
}

// ---- somebody sits there ----

#[test]
fn a_diver_is_led_from_the_cautions_to_an_uptake() {
    let bench = with_files("led");
    let diver = Diver {
        mass: Some(Mass::from_kg(82.0)),
        loop_volume: Some(Uncertain { value: Volume::from_l(7.0), expanded: Some(Volume::from_l(0.8)) }),
        diluent: Some(Diluent::Oxygen(Share::from_percent(18.0))),
        ..Diver::bare(Id::new("D-07").unwrap())
    };
    bench.register(Entry::Diver(diver));
    said(&bench.program(&["bench", "import", "run.toml"], ""));
    let mut typed = vec![
        // Place, loop, diluent, volume, mass: defaults, and answers that are none.
        "Couch",
        "holding",
        "held",
        "",
        "?",
        "",
        "82",
        "",
        "passed",
        "yes",
        // Barometer, loop temperature, time on the loop, scrubber, gain, orifice.
        "1016",
        "1016 hPa ± 2 hPa",
        "",
        "10 min",
        "y",
        "",
        "CMF-9",
        "CMF-0417",
        // Rest: posture, rested for, last meal, exercise, caffeine, dive; when.
        "lying",
        "25 min",
        "4:30",
        "4.5 h",
        "",
        "no",
        "48 h",
        "yesterday",
        "2026-11-20T18:05:00+11:00",
    ];
    let rows = lines();
    typed.extend(rows.iter().take(9).map(String::as_str));
    typed.extend([
        "help",
        "so far",
        "sheet",
        "conditions",
        "list",
        "last-exercise 14 h",
        "barometer ± 1 hPa",
    ]);
    typed.extend(["place pool", "depth 1 m", "loop-volume 7.5 L ± 1.0 L", "mass", "", "mass", "80 kg"]);
    typed.extend(rows.iter().skip(9).map(String::as_str));
    typed.extend(["so far", "done"]);
    let talk = bench.session_asked("D-07", &typed);
    let missing: Vec<&str> = [
        "Before anybody goes on the loop",
        "never alone",
        "Place (couch, pool) [couch]: Couch",
        "\"holding\" is not known here; use one of: sealed, held, topped",
        "Diluent, as in air or oxygen 18 % [oxygen 18 %]:",
        "first reading, as in 7.5 L ± 1 L [7 L ± 0.8 L]: ?",
        "then two injections that differ are needed",
        "Mass of the diver, as in 82 kg [82 kg]:",
        "\"82\" has a number without a unit",
        "Barometer with its ±, as in 1016 hPa ± 2 hPa [not read: 1013.25 ± 30 hPa is taken]: 1016",
        "as in 33 °C ± 4 °C [not read: 33 °C ± 4 °C is taken]:",
        "[not known: 2 % is taken]",
        "there is no orifice CMF-9",
        "row 1> 0:00 injection off S0001 is begun for D-07",
        "needed: the first reading, as in 0:00 0.95 0.94 0.96",
        "median 0.951 bar; needed: 4 min usable at one injection, so far 0 s",
        "bar/min since 00:01:30 (line through 3 rows, no uncertainty)",
        "What can be typed",
        "only 0 s of the readings can be used",
        "last-exercise not said",
        "S0001 last-exercise: 14 h",
        "has only an uncertainty",
        "the place stays as the session began with it",
        "the depth is asked in a pool only, and this is a couch session",
        "S0001 loop-volume: 7.5 L ± 1 L",
        "S0001 mass: 80 kg",
        "barometer 1016 ± 2 hPa",
        "enough for an uptake: so far tells it",
        "Resting oxygen uptake of D-07 (couch): ",
    ]
    .into_iter()
    .filter(|words| !talk.says(words))
    .collect();
    assert!(missing.is_empty(), "{missing:?} is not in\n{}", talk.text);
    for line in talk.text.lines().filter(|line| !line.contains("row 4") && !line.contains("[not read")) {
        // What is typed behind a question is the diver's.
        let asked = line.split_once("]: ").map_or(line, |(asked, _)| asked);
        assert!(asked.chars().count() <= 80 || line.contains("> "), "{line:?}");
    }
    let desk = talk.desk();
    assert!(!desk.is_open(), "{}", talk.text);
    let session = desk.session();
    assert_eq!((session.place, session.kept), (Place::Couch, LoopKept::Held));
    assert_eq!((session.leak_test, session.nose_clip), (LeakTest::Passed, Some(true)));
    assert_eq!(session.mass.map(Mass::as_kg), Some(80.0));
    assert_eq!(session.rest.last_meal.map(|s| s.as_s()), Some(16_200.0));
    assert_eq!(session.diluent, Diluent::Oxygen(Share::from_percent(18.0)));
    assert_eq!(session.cells.gain, None, "what is not known stays unknown, and is warned of");
    bench.holds();
}

#[test]
fn leaving_before_the_first_row_leaves_nothing() {
    let bench = Bench::new("session-left-early");
    for typed in [&[][..], &["", "quit"], &["pool", ""]] {
        assert!(bench.session_asked("D-07", typed).desk.is_none());
    }
    assert!(!bench.book().exists());
}

/// The answers that take every default of a couch session.
fn defaults<'a>(rows: &[&'a str]) -> Vec<&'a str> {
    let mut typed = vec![""; 20];
    typed.extend(rows);
    typed
}

#[test]
fn floors_and_ceilings_are_said_at_once_and_the_row_is_data() {
    let bench = Bench::new("session-floors");
    let talk = bench.session_asked(
        "D-07",
        &defaults(&["0:00 0.405 0.41", "1:00 0.398 0.405", "2:00 1.01 0.99", "3:00 0.4 1.0"]),
    );
    assert!(talk.says("below 0.40 bar: add oxygen now, or come off the loop and breathe fresh gas (cell 1 shows 0.398 bar)"), "{}", talk.text);
    assert!(talk.says("above 1.0 bar: add no oxygen, and bring it down with diluent, or come off the loop (cell 1 shows 1.01 bar)"), "{}", talk.text);
    assert_eq!(talk.text.matches("  ! ").count(), 2, "the limits themselves are within\n{}", talk.text);
    assert_eq!(bench.session(1).session.readings.time_s, [0.0, 60.0, 120.0, 180.0]);
    // A pool has other limits and a depth; the loop there is under more pressure than in the dry.
    let mut pool = vec!["pool"];
    pool.extend([""; 7]);
    pool.extend(["3.5 m", "", "", "", "", "", "", "", "", "", "", "", "", "", ""]);
    pool.extend(["0:00 0.59 0.7", "1:00 1.29 1.31", "2:00 1.5 1.2"]);
    let talk = bench.session_asked("D-08", &pool);
    for words in [
        "deeper than 3 m",
        "below 0.60 bar",
        "above 1.3 bar",
        "cell 1 shows 1.5 bar, and between 0 and 1.42 bar",
    ] {
        assert!(talk.says(words), "{words:?} is not in\n{}", talk.text);
    }
    // By hand: (1.01325 + 3.5 · 0.0980665) · 1.05 = 1.4243 bar, in fresh water.
    assert_eq!(bench.session(2).session.readings.time_s.len(), 2);
    // A pipe gets the same beside its rows.
    let (stdout, _, _) = enter(&bench, &[], "0:00 0.39 0.5\n");
    assert!(stdout.contains("  ! below 0.40 bar"), "{stdout}");
}

#[test]
fn corrections_and_strikes_are_of_rows_by_their_numbers() {
    let bench = Bench::new("session-corrections");
    let rows = [
        "0:00 0.9 0.9",
        "0:00 injection 0.3 L/min",
        "1:00 0.89 0.89",
        "2:00 9.88 0.88",
        "2:00 0.98 0.88",
        "1:30 0.885 0.885",
        "correct 2 0:00 injection off",
        "correct 4 2:00 0.88 0.88",
        "correct 3 1:00 0.89 -",
        "correct 1 0:01 0.9 0.9",
        "correct 1 0:00 0.91 0.9",
        "correct 2 0:00 0.9 0.9",
        "correct 9 3:00 0.9 0.9",
        "correct 3 stop",
        "strike 1 why",
        "strike 5",
        "strike 5 typed twice",
        "strike 5 again",
        "correct 5 2:30 0.8 0.8",
        "list",
        "done",
    ];
    let talk = bench.session_asked("D-07", &defaults(&rows));
    for words in [
        "cell 1 shows 9.88 bar, and between 0 and 1.06 bar is what can be here",
        "row 5 is earlier than a row before it: if that is a slip, correct 5",
        "S0001 row 2 corrected: 00:00:00 injection off (was 00:00:00 injection 0.3 L/min STPD)",
        "S0001 row 4 corrected: 00:02:00 PO2 0.88 0.88 bar (was 00:02:00 PO2 0.98 0.88 bar)",
        "S0001 row 3 corrected: 00:01:00 PO2 0.89 - bar",
        "every time counts from the first reading",
        "S0001 row 1 corrected: 00:00:00 PO2 0.91 0.9 bar",
        "row 2 of session S0001 is an event: strike it",
        "session S0001 has no row 9: its rows are 1 to 5",
        "correct wants the whole row",
        "every time counts from this reading, so it stays",
        "strike wants the reason too",
        "S0001 row 5 struck: typed twice",
        "row 5 of session S0001 is already struck",
        "struck: typed twice — PO2 0.885 0.885 bar",
    ] {
        assert!(talk.says(words), "{words:?} is not in\n{}", talk.text);
    }
    let record = bench.session(1);
    assert_eq!(record.state, RunState::Complete, "no answer is no reason to stay open\n{}", talk.text);
    assert_eq!(record.session.readings.time_s, [0.0, 60.0, 120.0]);
    let CellSignal::Bar(first) = &record.session.readings.cells[0].signal else { panic!("typed in bar") };
    assert_eq!(first, &[0.91, 0.89, 0.88]);
    let corrected = record.changes.iter().filter(|c| matches!(c, SessionChange::Corrected { .. })).count();
    assert_eq!((corrected, record.changes.len()), (4, 5));
    bench.holds();
}

#[test]
fn what_is_left_open_goes_on_and_what_is_wrong_keeps_it_open() {
    let bench = Bench::new("session-left-open");
    let talk =
        bench.session_asked("D-07", &defaults(&["done", "0:00 oxygen add", "done", "0:00 0.9", "done"]));
    assert!(talk.says("there is no row yet") && talk.says("there is no reading yet"), "{}", talk.text);
    assert!(talk.says("no row says what was injected: type 0:00 injection off"), "{}", talk.text);
    assert!(talk.desk().is_open());
    assert!(bench.session_asked("D-07", &[]).says("S0001 of this diver is still open; session resume S0001"));
    let talk = bench.session_again("s0001", &["0:00 injection off", "5:00 stop", "done"]);
    assert!(talk.says("S0001 goes on — D-07: couch, held loop") && talk.says("never alone"), "{}", talk.text);
    assert!(
        talk.says("row 4 is at 00:05:00, after the last reading at 00:00:00: correct its time"),
        "{}",
        talk.text
    );
    assert!(talk.desk().is_open());
    let talk = bench.session_again("S0001", &["5:00 0.85", "done"]);
    assert!(!talk.desk().is_open(), "{}", talk.text);
    let error = SessionDesk::resume(bench.shelf(), "S0001").unwrap_err();
    assert_eq!((error.to_string().contains("S0001 is complete"), error.status()), (true, ExitStatus::Wrong));
    let error = SessionDesk::resume(bench.shelf(), "S0009").unwrap_err();
    assert!(error.to_string().contains("there is no session S0009"), "{error}");
    bench.holds();
}

#[test]
fn two_who_type_into_one_session_see_each_other() {
    let bench = Bench::new("session-two");
    let reading = |at_s: f64| Row::Readings { at_s, po2_bar: vec![0.9, f64::NAN] };
    let start = SessionStart::new(bench.shelf(), "D-07").unwrap();
    let mut first = SessionDesk::new(start.ready().unwrap());
    assert_eq!(first.add(&reading(0.0)).unwrap().row, 1);
    let mut second = SessionDesk::resume(bench.shelf(), "S0001").unwrap();
    assert_eq!(second.add(&reading(30.0)).unwrap().row, 2);
    assert_eq!((first.add(&reading(60.0)).unwrap().row, first.rows()), (3, 3));
    second.strike(2, "coughed").unwrap();
    let error = first.correct(2, &reading(31.0)).unwrap_err();
    assert!(error.to_string().contains("row 2 of session S0001 is already struck"), "{error}");
}

// ---- from a pipe ----

#[test]
fn a_line_that_is_not_understood_ends_with_its_number_and_the_rows_before_stay() {
    let bench = with_files("refused");
    let long = "x".repeat(5000);
    let (mut rows, mut wrong) = (0, Vec::new());
    for (line, says) in [
        ("10:00", "a time alone is no row"),
        ("1:00 0.9 0.9", "this row has 2 cells and the first one had 3"),
        ("1:00 0.9 0.9 0.9 0.9", "this row has 4 cells"),
        ("1:00 - - -", "no cell was read in this row"),
        ("1:00 0,9 0,9 0,9", "comma"),
        ("1:00 0.9 nan 0.9", "nan"),
        ("1:00 0.9 -0.9 0.9", "PO2"),
        ("1:00 90 0.9 0.9", "cell 1 shows 90 bar"),
        ("1:00 0 0.9 0.9", "cell 1 shows 0 bar"),
        ("1:00 0.9 V 0.9 0.9", "PO2 is typed in bar"),
        ("1:60 0.9 0.9 0.9", "\"1:60\" is no time"),
        ("1:5 0.9 0.9 0.9", "\"1:5\" is no time"),
        ("18:05:99 0.9 0.9 0.9", "is no time"),
        ("2026-11-20T18:04:59+11:00 0.9 0.9 0.9", "is before the first reading"),
        ("0:30 injection", "say what is injected from then on"),
        ("0:30 injection 9.4", "say what is injected from then on"),
        ("0:30 injection lots", "say what is injected from then on"),
        ("0:30 injection 0.3 sccm", "sccm"),
        ("0:30 injection 9.4 bar", "an IP needs the orifice's line"),
        ("0:30 injection -2 L/min", "negative"),
        ("0:30 oxygen", "is nothing that is noted in a session (is oxygen add meant?)"),
        ("0:30 ventt", "(is vent meant?)"),
        ("0:30 oxygen add much", "much"),
        ("0:30 make-up", "make-up"),
        ("0:30 make-up tight", "tight"),
        ("0:30 exclude", "until when"),
        ("0:30 exclude until 0:20", "0:20"),
        ("0:30 stop now", "\"now\" stands behind stop"),
        ("strike", "wants the number of a row"),
        ("strike 2", "strike wants the reason"),
        ("correct 0 0:00 0.9 0.9 0.9", "wants the number of a row"),
        ("list all", "\"all\" stands behind list"),
        ("lst", "(is list meant?)"),
        ("\u{1b}[31m", "\\u{1b}"),
        ("done", "no row says what was injected"),
        ("loop sealed", "the loop stays as the session began with it"),
        ("loop-volume lots", "lots"),
        ("last-meal 4", "without a unit"),
        ("suit wet", "the suit is asked in a pool only"),
        ("barometer", "barometer wants what it is on the same line"),
        (&long, "longer than anything"),
    ] {
        let input = format!("# invented\n0:00 0.9 0.9 0.9\n{line}\n9:00 0.8 0.8 0.8\n");
        let (stdout, stderr, status) = enter(&bench, &[], &input);
        rows += 1;
        let kept = format!("S{rows:04} stays open with 1 row, go on with: session resume S{rows:04}");
        let told = ["line 3 of the input: ", says, &kept].iter().all(|words| stderr.contains(words));
        let tame = !stderr.trim_end().chars().any(|c| c.is_control() && c != '\n');
        if status != 2 || !told || !tame || bench.session(rows).session.readings.time_s != [0.0] {
            wrong.push(format!("{line:?} wants {says:?}: {status} {stdout} {stderr:?}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    bench.holds();
}

#[test]
fn a_pipe_is_asked_nothing_and_guesses_neither_place_nor_loop() {
    let bench = with_files("needed");
    let (stdout, stderr, status) =
        said(&bench.program(&["session", "enter", "D-07"], "\n# who\nplace couch\nsealed\n0:00 0.9 0.9\n"));
    assert_eq!(status, 0, "{stderr}");
    assert!(!stdout.contains('>') && !stdout.contains('['), "no prompt: {stdout}");
    assert!(stdout.ends_with("S0001 stays open with 1 row, go on with: session resume S0001\n"), "{stdout}");
    assert_eq!(bench.session(1).session.kept, LoopKept::Sealed);
    let mut wrong = Vec::new();
    for (arguments, input, says) in [
        (
            &["session", "enter", "D-07"][..],
            "0:00 0.9\n",
            "line 1 of the input: the place (couch or pool) is needed here (or as --place)",
        ),
        (&["session", "enter", "D-07", "--place", "pool"], "", "the input ended before how the loop is kept"),
        (&BARE, "", "the input holds no row, so nothing was recorded"),
        (&BARE, "1:00 0.9\n", "line 1 of the input: every time counts from the first reading"),
        (&["session", "enter", "D 07"], "", "\"D 07\" is no name"),
        (&["session", "enter", "D-07", "--place", "sofa"], "", "sofa"),
        (&["session", "enter", "D-07", "--loop-volume", "7"], "", "without a unit"),
        (&["session", "enter", "D-07", "--orifice", "CMF-1"], "", "CMF-1"),
        (&["session", "enter", "D-07", "--from", "run.toml"], "", "bench run"),
        (&["session", "enter", "D-07", "--from", "missing.toml"], "", "missing.toml"),
        (&["session", "resume", "R0001"], "", "is no session"),
    ] {
        let (stdout, stderr, status) = said(&bench.program(arguments, input));
        if (status, stdout.as_str()) != (2, "") || !stderr.contains(says) {
            wrong.push(format!("{arguments:?} wants {says:?}: {status} {stdout} {stderr}"));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    assert_eq!(bench.session(1).rows.len(), 1);
}

#[test]
fn the_file_of_another_diver_gives_the_bench_and_not_the_body() {
    let bench = with_files("another");
    let arguments = ["session", "enter", "D-08", "--from", "couch.toml", "--loop", "sealed"];
    let (_, stderr, status) = said(&bench.program(&arguments, "0:00 0.9 0.9 0.9\n"));
    assert_eq!(status, 0, "{stderr}");
    assert!(
        stderr.contains("couch.toml is of D-07: mass, loop volume and rest are not taken from it"),
        "{stderr}"
    );
    let session = bench.session(1).session;
    assert_eq!((session.loop_volume, session.mass, session.rest.last_meal), (None, None, None));
    assert_eq!(session.kept, LoopKept::Sealed, "what is said goes before the file");
    assert_eq!(session.conditions.barometer.value.map(|p| p.as_pa()), Some(101_600.0));
    assert!(bench.session(1).line_run.is_some());
}

#[test]
fn forgetting_the_diver_takes_an_open_session() {
    let bench = Bench::new("session-forgotten");
    enter(&bench, &[], "0:00 0.9 0.9\n0:00 injection off\n");
    let forget = ["diver", "forget", "d-07", "--why", "asked to"];
    let (_, stderr, status) = said(&bench.program(&forget, ""));
    assert_eq!(status, 0, "{stderr}");
    let (_, stderr, status) = said(&bench.program(&["session", "resume", "S0001"], "1:00 0.9 0.9\n"));
    assert_eq!((status, stderr.contains("S0001 was erased on")), (2, true), "{stderr}");
    bench.holds();
}

/// The row typed on a line: different for every line, so that one that got lost or doubled shows.
fn numbered(line: usize) -> (u32, f64) {
    (line as u32, 0.9 - 1e-5 * line as f64)
}

#[test]
fn nothing_acknowledged_is_lost_at_whatever_moment_it_is_killed() {
    // More of them by EBBLINE_KILLS; a fixed sequence of moments, but what is cut off differs every time.
    let kills: u32 = std::env::var("EBBLINE_KILLS").map_or(4, |kills| kills.parse().unwrap());
    let bench = Bench::new("session-killed");
    let row = |line| {
        let (t, po2) = numbered(line);
        format!("{t} {po2:.5} {po2:.5}\n")
    };
    let script: String = (0..4_000).map(row).collect();
    let (mut state, mut began) = (417_u64, 0_u32);
    for kill in 0..kills {
        let mut child = bench.child(&BARE);
        let (mut input, mut out) = (child.stdin.take().unwrap(), child.stdout.take().unwrap());
        let script = script.clone();
        // The pipe breaks when the child is killed before it took everything.
        let typing = std::thread::spawn(move || input.write_all(script.as_bytes()));
        let hearing = std::thread::spawn(move || {
            let mut said = Vec::new();
            let _ = out.read_to_end(&mut said);
            said
        });
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        std::thread::sleep(Duration::from_millis(150 + (state >> 33) % 700));
        child.kill().unwrap();
        child.wait().unwrap();
        let _ = typing.join().unwrap();
        let heard = String::from_utf8_lossy(&hearing.join().unwrap()).into_owned();
        // A half line was not acknowledged.
        let whole = heard.rfind('\n').map_or("", |end| &heard[..end]);
        let acknowledged: Vec<&str> =
            whole.lines().filter(|line| line.starts_with('S') && line.contains(" row ")).collect();
        let listed = said(&bench.program(&["session", "list", "--json", "--all"], "")).0;
        let sessions: serde_json::Value = serde_json::from_str(&listed).unwrap_or_default();
        let sessions = sessions.as_array().map_or(0, Vec::len) as u32;
        if sessions == began {
            assert!(acknowledged.is_empty(), "kill {kill}: {whole}");
            continue;
        }
        began = sessions;
        bench.holds();
        let record = bench.session(began);
        let (rows, heard) = (record.rows.len(), acknowledged.len());
        assert!(rows == heard || rows == heard + 1, "kill {kill}: {rows} rows and {heard} acknowledged");
        assert_eq!(record.state, RunState::Open);
        for (line, at_s) in record.session.readings.time_s.iter().enumerate() {
            assert!((at_s - f64::from(numbered(line).0)).abs() < 1e-9, "kill {kill}, row {}", line + 1);
        }
        let (stdout, stderr, status) =
            said(&bench.program(&["session", "resume", &format!("S{began:04}")], "9999 0.8 0.8\n"));
        assert_eq!(status, 0, "kill {kill}: {stderr}");
        assert!(stdout.starts_with(&format!("S{began:04} row {}: ", rows + 1)), "kill {kill}: {stdout}");
    }
    assert!(
        began >= kills / 2,
        "only {began} of {kills} sessions had begun before the kill: it comes too early"
    );
}
