//! `setting` as its users see it: from files alone, from the book, and every reason for which there is none.

#![allow(
    clippy::float_cmp,
    reason = "an IP is a mark of the gauge, a printed decimal that is the same on both sides"
)]
#![allow(clippy::unwrap_used, reason = "a test may panic")]

use crate::couch::{ON, SHARE, UPTAKE, small_file, stated, write, write_orifice, write_run_of, write_three};
use crate::desk::{Desk, Said, fixture};
use crate::loop_simulator::Kind;
use ebbline::entry::{CellSignal, Id, LineReference, Session};
use ebbline::quantity::Mass;
use serde_json::{Value, json};

const SESSIONS: [&str; 6] =
    ["--session", "couch-1.toml", "--session", "couch-2.toml", "--session", "couch-3.toml"];

/// A desk with the run file of an orifice that suits and three sessions through it.
fn desk(name: &str) -> Desk {
    let desk = Desk::new(name);
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    desk
}

/// The same in a book, with the run judged.
fn book(name: &str) -> Desk {
    let desk = desk(name);
    desk.done(&["bench", "import", "small.toml"]);
    desk.done(&["bench", "accept", "R0001"]);
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    desk
}

fn asked<'a>(orifice: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&["setting", "--orifice", orifice], SESSIONS.as_slice(), &ON, more].concat()
}

/// Calls it with `--json` and expects a verdict that is not favourable: the document, and what stderr says.
#[track_caller]
fn unfavourable(desk: &Desk, arguments: &[&str]) -> (Value, String) {
    let said: Said = desk.call(&[&["--json"], arguments].concat());
    assert_eq!(said.status, 1, "{arguments:?}: {said:?}");
    let words: Vec<&str> = said.stderr.split_whitespace().collect();
    (serde_json::from_str(&said.stdout).unwrap(), words.join(" "))
}

/// As [`unfavourable`], without a recommendation; the reason, which stderr says too.
#[track_caller]
fn no_setting(desk: &Desk, arguments: &[&str]) -> String {
    let (json, stderr) = unfavourable(desk, arguments);
    assert_eq!(json["recommended"], Value::Null, "{json}");
    assert_eq!(json["judged"], Value::Null, "{json}");
    let why = json["why_not"].as_str().unwrap().to_owned();
    assert!(stderr.contains(&why), "{stderr:?} does not say {why:?}");
    let text = desk.call(arguments);
    assert_eq!(text.status, 1, "{text:?}");
    assert!(!text.stdout.contains("SET "), "{text:?}");
    why
}

#[track_caller]
fn has(value: &Value, keys: &[&str]) {
    for key in keys {
        assert!(value.get(key).is_some(), "no {key} in {value}");
    }
}

fn ip(json: &Value) -> f64 {
    json["recommended"]["ip_bar_gauge"].as_f64().unwrap()
}

#[test]
fn files_alone_give_a_setting_and_no_book() {
    let desk = desk("setting-files");
    let json = desk.json(&asked("small.toml", &[]));
    let set = &json["recommended"];
    assert_eq!(set["orifice"], "small");
    // Less than the diver takes up, and not by more than a quarter.
    let injection = set["injection_l_min"].as_f64().unwrap();
    assert!(injection < UPTAKE && injection > 0.7 * UPTAKE, "{set}");
    // The hole of `bench_files`: 0.0466 L/min a bar at 20 °C from 0.95 bar below its barometer of 1.0092 bar; the readings are
    // of 21 °C, the setting of 20 °C, and of what passes 99.5 % is oxygen.
    let upstream = ip(&json) + 1.01325 - 0.0592;
    let true_flow = 0.995 * 0.0466 * SHARE * upstream * 273.15 / 293.15 * (294.15_f64 / 293.15).sqrt();
    assert!((injection / true_flow - 1.0).abs() < 0.001, "{injection}, {true_flow}");
    assert!(set["overfeed_chance"].as_f64().unwrap() <= 0.025, "{set}");
    assert!(json["never_exceed_ip_bar_gauge"].as_f64().unwrap() >= ip(&json), "{json}");
    assert!(!desk.book().exists());
    let text = desk.done(&asked("small.toml", &[]));
    assert!(text.starts_with(&format!("SET {:.1} bar", ip(&json))), "{text}");
    assert!(text.contains("No setting replaces watching PO2"), "{text}");
    assert!(text.lines().all(|line| line.chars().count() <= 80), "{text}");
    // Units are shown as they are asked for, and change nothing.
    let psi = desk.done(&asked("small.toml", &["--show", "psi,ft,F"]));
    assert!(psi.starts_with("SET ") && psi.contains(" psi") && psi.contains(" ft"), "{psi}");
}

#[test]
fn the_document_has_the_keys_of_the_interface() {
    let desk = desk("setting-json");
    desk.done(&["instrument", "add", &fixture("lines")]);
    desk.done(&["first-stage", "add", &fixture("first_stage")]);
    let json = desk.json(&asked("small.toml", &["--meter", "FM-01", "--first-stage", "FS-01"]));
    has(
        &json,
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
    );
    assert_eq!((&json["format"], &json["method"]), (&json!(1), &json!(1)));
    assert_eq!((&json["why_not"], &json["judged"]), (&Value::Null, &Value::Null));
    has(
        &json["recommended"],
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
    );
    has(
        &json["depth"],
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
    );
    assert_eq!(
        (&json["depth"]["first_stage"], &json["depth"]["water"]),
        (&json!("uncompensated"), &json!("sea"))
    );
    assert!(["measured", "bounded"].contains(&json["depth"]["choke_ratio_origin"].as_str().unwrap()));
    let rows = json["table"].as_array().unwrap();
    assert!(rows.len() > 3, "{rows:?}");
    for row in rows {
        has(
            row,
            &[
                "ip_bar_gauge",
                "injection_l_min",
                "shortfall_l_min",
                "overfeed_chance",
                "po2_drift_bar_min",
                "minutes_high_to_low",
                "minutes_to_hypoxia_at_work",
            ],
        );
    }
    has(&json["patency"], &["from_bar", "to_bar", "seconds", "low", "high"]);
    has(&json["expected_reading"], &["meter", "reads_at", "value", "unit", "low", "high"]);
    let reading = &json["expected_reading"];
    assert_eq!((&reading["meter"], &reading["unit"]), (&json!("FM-01"), &json!("L/min")));
    // The meter reads at 20 °C what is injected at 0 °C: 7.3 % more.
    let ratio = reading["value"].as_f64().unwrap() / json["recommended"]["injection_l_min"].as_f64().unwrap();
    assert!((ratio / (293.15 / 273.15) - 1.0).abs() < 0.01, "{ratio}");
    assert!(reading["low"].as_f64() < reading["value"].as_f64(), "{reading}");
    has(&json["orifices"][0], &["orifice", "fits", "why_not", "ip_bar_gauge"]);
    assert!(json["assumed"].is_object() && json["warnings"].is_array());
}

#[test]
fn files_and_book_give_the_same_but_for_names() {
    let desk = book("setting-same");
    let without_names = |mut json: Value| {
        for key in ["sessions", "notes"] {
            json[key].take();
        }
        for orifice in json["orifices"].as_array_mut().unwrap() {
            orifice["line"].take();
        }
        let text = (1..=3)
            .fold(json.to_string(), |text, n| text.replace(&format!("S000{n}"), &format!("couch-{n}.toml")));
        serde_json::from_str::<Value>(&text).unwrap()
    };
    let of_files = without_names(desk.json(&asked("small.toml", &[])));
    let by_diver = [["setting", "--orifice", "small", "--diver", "D-07"].as_slice(), &ON].concat();
    assert_eq!(without_names(desk.json(&by_diver)), of_files);
    let numbers =
        ["setting", "--orifice", "SMALL", "--session", "S0001", "--session", "s0002", "--session", "S0003"];
    assert_eq!(without_names(desk.json(&[&numbers, ON.as_slice()].concat())), of_files);
    // A session that is left out no longer counts for the diver.
    desk.done(&["session", "leave-out", "S0003", "--why", "ate before"]);
    let fewer = desk.json(&by_diver);
    assert!(ip(&fewer) <= ip(&of_files), "{fewer}");
    assert!(fewer["notes"].to_string().contains("S0003 is left out"), "{fewer}");
    assert_eq!(fewer["sessions"].as_array().unwrap().len(), 2);
}

#[test]
fn a_session_and_a_setting_by_the_same_run_carry_its_errors_together() {
    let desk = desk("setting-jointly");
    let chances = |orifice: &str| -> Vec<f64> {
        let json = desk.json(&asked(orifice, &[]));
        json["table"].as_array().unwrap().iter().map(|row| row["overfeed_chance"].as_f64().unwrap()).collect()
    };
    let joint = chances("small.toml");
    // The same hole by another run: one flow reads a hundred-thousandth of a litre more.
    write_run_of(&desk, "again", SHARE, |toml| toml.replace("CMF-0417", "small"));
    let lines: Vec<String> = desk.read("again.csv").lines().map(str::to_owned).collect();
    assert_eq!(lines.len(), 20);
    let more = |line: &String| {
        let cells: Vec<&str> = line.split(',').collect();
        format!("{},{:.5},{}", cells[0], cells[1].parse::<f64>().unwrap() + 1e-5, cells[2])
    };
    let changed: Vec<String> =
        lines.iter().enumerate().map(|(i, line)| if i == 7 { more(line) } else { line.clone() }).collect();
    desk.write("again.csv", changed.join("\n") + "\n");
    let apart = chances("again.toml");
    assert_eq!(joint.len(), apart.len());
    let mut seen = 0;
    // A meter that shows too much makes the uptake look larger and the injection look larger: together they hurt less.
    for (joint, apart) in joint.iter().zip(&apart).filter(|(_, apart)| (0.002..0.4).contains(*apart)) {
        assert!(joint < apart, "{joint}, {apart}");
        seen += 1;
    }
    assert!(seen > 2, "{joint:?}");
    // The run of the book is the same run.
    desk.done(&["bench", "import", "small.toml"]);
    desk.done(&["bench", "accept", "R0001"]);
    assert_eq!(chances("small"), joint);
    // So it is where the sessions name the orifice of the book and not a file.
    write_three(&desk, &LineReference::Orifice(Id::new("small").unwrap()));
    assert_eq!(chances("small"), joint);
}

#[test]
fn without_an_uptake_there_is_no_setting() {
    let desk = desk("setting-no-uptake");
    let mut short: Session = stated(Kind::Held, 5);
    short.readings.time_s.truncate(30);
    for cell in &mut short.readings.cells {
        let CellSignal::Bar(column) = &mut cell.signal else { panic!("bar") };
        column.truncate(30);
    }
    write(&desk, "short", &short);
    let call = [["setting", "--orifice", "small.toml", "--session", "short.toml"].as_slice(), &ON].concat();
    let why = no_setting(&desk, &call);
    assert!(why.contains("uptake"), "{why}");
    let (json, _) = unfavourable(&desk, &call);
    assert_eq!((&json["uptake"], &json["never_exceed_ip_bar_gauge"]), (&Value::Null, &Value::Null), "{json}");
    // A uptake that hardly anybody has is an answer of the session, and no setting without a reason.
    let heavy = |kg: f64| Session { mass: Some(Mass::from_kg(kg)), ..stated(Kind::HeldTwice, 1) };
    write(&desk, "slight", &heavy(18.0));
    let call = [["setting", "--orifice", "small.toml", "--session", "slight.toml"].as_slice(), &ON].concat();
    let why = no_setting(&desk, &call);
    assert!(why.contains("mL/(kg·min)") && why.contains("--despite"), "{why}");
}

#[test]
fn a_hole_that_does_not_fit_is_refused_with_the_diameter_that_would() {
    let desk = desk("setting-nothing-fits");
    write_orifice(&desk, "large", "large", 2.0);
    write_orifice(&desk, "tiny", "tiny", 0.3);
    let why = no_setting(&desk, &asked("large.toml", &[]));
    assert!(why.contains("too large") && why.contains("µm"), "{why}");
    let why = no_setting(&desk, &asked("tiny.toml", &[]));
    assert!(why.contains("too small") && why.contains("µm"), "{why}");
    // Compared, the one that fits is recommended and the others say why not.
    let both = desk.json(&asked("large.toml", &["--orifice", "small.toml"]));
    assert_eq!(both["recommended"]["orifice"], "small");
    let fits = |i: usize| (both["orifices"][i]["fits"].clone(), both["orifices"][i]["why_not"].is_string());
    assert_eq!((fits(0), fits(1)), ((json!(false), true), (json!(true), false)), "{both}");
    desk.refused(&asked("small.toml", &["--orifice", "small.toml"]), 2, "named twice");
}

#[test]
fn a_failed_undecided_or_overdue_orifice_needs_a_reason_that_is_recorded() {
    let desk = desk("setting-despite");
    let acceptance = |tolerance: &str, flow: f64| {
        let (tolerance, flow) =
            (format!("tolerance = \"{tolerance}\""), format!("flow = \"{flow:.4} L/min\""));
        move |toml: String| {
            toml.replace("CMF-0417", "small")
                .replace("tolerance = \"5 %\"", &tolerance)
                .replace("flow = \"0.2640 L/min\"", &flow)
        }
    };
    write_run_of(&desk, "failed", SHARE, acceptance("5 %", 0.30));
    // At the limit, within the guard band.
    write_run_of(&desk, "undecided", SHARE, acceptance("5 %", 0.2761));
    let overdue = ["--on", "2027-03-02"];
    for (file, on, says) in [
        ("failed.toml", ON, "failed its acceptance"),
        ("undecided.toml", ON, "could not be decided"),
        ("small.toml", overdue, "fell due on 2027-03-01"),
    ] {
        let call = [["setting", "--orifice", file].as_slice(), &SESSIONS, &on].concat();
        let why = no_setting(&desk, &call);
        assert!(why.contains(says) && why.contains("--despite"), "{file}: {why}");
        let despite = [call.as_slice(), &["--despite", "no other = to hand <b>"]].concat();
        let json = desk.json(&despite);
        assert!(json["recommended"].is_object(), "{json}");
        assert_eq!(json["despite"], "no other = to hand <b>");
        let text = desk.done(&despite);
        let words = text.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(text.contains("DESPITE: \"no other = to hand <b>\""), "{file}: {text}");
        assert!(words.contains("SET DESPITE"), "{file}: {text}");
    }
    // The due day itself is in date.
    let last =
        [["setting", "--orifice", "small.toml"].as_slice(), &SESSIONS, &["--on", "2027-03-01"]].concat();
    assert!(desk.json(&last)["recommended"].is_object());
    desk.refused(&asked("small.toml", &["--despite", " "]), 2, "--despite");
    assert!(!desk.book().exists());
}

#[test]
fn the_newest_judged_run_counts_and_newer_ones_are_named() {
    let desk = desk("setting-judged");
    let run = |name: &str, day: &str, share: f64| {
        write_run_of(&desk, name, share, |toml| toml.replace("CMF-0417", "small").replace("2026-11-12", day));
        desk.json(&["bench", "import", &format!("{name}.toml")])[0]["run"].as_str().unwrap().to_owned()
    };
    assert_eq!(run("first", "2026-11-12", SHARE), "R0001");
    let call = asked("small", &[]);
    let never = desk.json(&call);
    assert!(never["recommended"].is_object());
    assert!(never["warnings"].to_string().contains("nobody has judged this orifice"), "{never}");
    desk.done(&["bench", "accept", "R0001"]);
    let judged = desk.json(&call);
    assert!(!judged["warnings"].to_string().contains("nobody has judged this orifice"), "{judged}");
    assert_eq!(ip(&judged), ip(&never));
    assert_eq!(run("newer", "2026-11-15", 0.999 * SHARE), "R0002");
    let newer = desk.json(&call);
    assert!(newer["orifices"][0]["line"].as_str().unwrap().contains("run R0001"), "{newer}");
    let notes = newer["notes"].to_string();
    assert!(notes.contains("R0002 is newer and not judged yet"), "{notes}");
    assert!(desk.done(&call).contains("R0002"));
    assert_eq!(newer["recommended"], judged["recommended"]);
    desk.done(&["bench", "accept", "R0002"]);
    let after = desk.json(&call);
    assert!(
        after["orifices"][0]["line"].as_str().unwrap().contains("run R0002 of 2026-11-15, accepted"),
        "{after}"
    );
    assert!(ip(&after) >= ip(&judged), "the hole passes less: {after}");
    // A point left out since: the judgement is of an earlier state.
    desk.done(&["bench", "leave-out", "R0002", "3", "--why", "hose touched"]);
    let why = no_setting(&desk, &call);
    assert!(why.contains("could not be decided"), "{why}");
}

#[test]
fn first_stage_and_place_change_the_setting_as_they_should() {
    let desk = desk("setting-stage");
    desk.refused(&asked("small.toml", &["--first-stage", "FS-01"]), 2, "there is no book");
    desk.done(&["first-stage", "add", &fixture("first_stage")]);
    let plain = desk.json(&asked("small.toml", &[]));
    let stage = desk.json(&asked("small.toml", &["--first-stage", "FS-01"]));
    assert_eq!(stage["first_stage"], "FS-01");
    // Its gauge is better known (0.3 bar for 0.5) and it creeps less (0.2 bar for 0.3).
    assert!(ip(&stage) > ip(&plain), "{} {}", ip(&stage), ip(&plain));
    assert_eq!(plain["patency"], Value::Null);
    assert!(stage["patency"]["seconds"].as_f64().unwrap() > 0.0);
    desk.refused(&asked("small.toml", &["--first-stage", "FS-02"]), 2, "no first stage FS-02");
    desk.refused(&asked("small.toml", &["--first-stage", "compensated"]), 2, "--max-depth");
    let compensated = asked("small.toml", &["--first-stage", "compensated", "--max-depth", "6 m"]);
    let json = desk.json(&compensated);
    assert_eq!(json["depth"]["first_stage"], "compensated");
    assert!(ip(&json) < ip(&plain), "it feeds more the deeper it is: {json}");
    desk.refused(&asked("small.toml", &["--meter", "FM-01"]), 2, "no flow meter FM-01");
    desk.refused(&asked("small.toml", &["--max-depth", "6"]), 2, "unit");
    desk.refused(&asked("small.toml", &["--chance", "60 %"]), 2, "below 50 %");
    desk.refused(&asked("small.toml", &["--gauge-error", "-0.1 bar"]), 2, "negative");
}

#[test]
fn an_ip_that_is_named_is_judged() {
    let desk = desk("setting-ip");
    let set = ip(&desk.json(&asked("small.toml", &[])));
    let fine = format!("{set} bar");
    let json = desk.json(&asked("small.toml", &["--ip", &fine]));
    assert_eq!((&json["judged"]["verdict"], &json["judged"]["against"]), (&json!("may be used"), &json!([])));
    let (json, stderr) = unfavourable(&desk, &asked("small.toml", &["--ip", "12 bar"]));
    assert_eq!(json["judged"]["verdict"], "not", "{json}");
    assert!(json["judged"]["against"][0].as_str().unwrap().contains("overfeeds"), "{json}");
    assert!(stderr.contains("overfeeds"), "{stderr}");
    let text = desk.call(&asked("small.toml", &["--ip", "12 bar"]));
    assert!(text.status == 1 && text.stdout.contains("overfeeds"), "{text:?}");
    for outside in ["20 bar", "1 bar"] {
        desk.refused(&asked("small.toml", &["--ip", outside]), 2, "its bench run holds from");
    }
    desk.refused(&asked("small.toml", &["--ip", "9"]), 2, "unit");
}

#[test]
fn the_sheet_as_text_is_written_whole() {
    let desk = desk("setting-sheet");
    let said = desk.call(&asked("small.toml", &["--sheet", "sheet.txt"]));
    assert_eq!(said.status, 0, "{said:?}");
    assert!(said.stderr.contains("sheet written to sheet.txt"), "{said:?}");
    let sheet = desk.read("sheet.txt");
    let set = ip(&desk.json(&asked("small.toml", &[])));
    assert!(sheet.contains(&format!("{set:.1} bar")) && sheet.contains("D-07"), "{sheet}");
    desk.refused(&asked("small.toml", &["--sheet", "no/such/sheet.txt"]), 3, "sheet.txt");
    desk.refused(&asked("small.toml", &["--plot", "plot.gif"]), 2, ".svg or .png");
    // Without a setting the sheet says so, and names no IP to dial in.
    write_orifice(&desk, "large", "large", 2.0);
    assert_eq!(desk.call(&asked("large.toml", &["--sheet", "none.txt"])).status, 1);
    let none = desk.read("none.txt");
    assert!(none.contains("too large") && !none.contains("SET "), "{none}");
}

#[test]
fn a_plot_is_written_with_a_setting_and_without_one() {
    let desk = desk("setting-plot");
    let said = desk.call(&asked("small.toml", &["--plot", "plot.svg"]));
    assert_eq!(said.status, 0, "{said:?}");
    assert!(said.stderr.contains("plot written to plot.svg"), "{said:?}");
    let svg = desk.read("plot.svg");
    assert!(svg.starts_with("<svg") && svg.contains("small"), "{svg}");
    desk.done(&asked("small.toml", &["--plot", "plot.png"]));
    assert!(std::fs::read(desk.folder.join("plot.png")).unwrap().starts_with(b"\x89PNG"));
    write_orifice(&desk, "large", "large", 2.0);
    assert_eq!(desk.call(&asked("large.toml", &["--plot", "none.svg"])).status, 1);
    assert!(desk.read("none.svg").starts_with("<svg"));
}

#[test]
fn what_is_not_there_is_refused_by_name() {
    let desk = desk("setting-refused");
    desk.refused(&asked("missing.toml", &[]), 2, "missing.toml");
    desk.refused(&asked("couch-1.toml", &[]), 2, "session");
    desk.refused(&asked("small", &[]), 2, "there is no book");
    desk.refused(&["setting", "--orifice", "small.toml", "--diver", "D-07"], 2, "there is no book");
    desk.refused(&["setting", "--orifice", "small.toml"], 2, "--diver DIVER, or --session FILE.toml");
    desk.refused(&["setting", "--diver", "D-07"], 2, "--orifice");
    desk.refused(&["setting", "--orifice", "small.toml", "--session", "nowhere.toml"], 2, "nowhere.toml");
    let both = ["setting", "--orifice", "small.toml", "--diver", "D-07", "--session", "couch-1.toml"];
    desk.refused(&both, 2, "cannot be used with");
    write(&desk, "other", &Session { diver: Id::new("D-08").unwrap(), ..stated(Kind::Sealed, 4) });
    desk.refused(&asked("small.toml", &["--session", "other.toml"]), 2, "D-07 and to D-08");
    assert!(!desk.book().exists());
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.refused(&asked("small", &[]), 2, "no orifice small");
    desk.refused(&["setting", "--orifice", "small.toml", "--diver", "D-07"], 2, "D-07 has no session");
    desk.refused(&["setting", "--orifice", "small.toml", "--diver", "nobody"], 2, "nobody has no session");
    desk.done(&["orifice", "add", "small", "--maker", "invented"]);
    desk.refused(&asked("small", &[]), 2, "no complete run");
}

#[test]
fn what_the_register_knows_of_a_diver_is_used_with_the_diver_only() {
    let desk = desk("setting-diver");
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.done(&["session", "import", "couch-1.toml", "couch-2.toml", "couch-3.toml"]);
    let by_diver = [["setting", "--orifice", "small.toml", "--diver", "D-07"].as_slice(), &ON].concat();
    // The fixture: 7.5 L, and 18 % of oxygen in the diluent.
    let text = desk.done(&by_diver);
    assert!(text.contains("7.5 L with the lungs") && text.contains("18"), "{text}");
    let files = desk.done(&asked("small.toml", &[]));
    assert!(!files.contains("7.5 L with the lungs"), "{files}");
    let said = [by_diver.as_slice(), &["--loop-volume", "6.0 L ± 0.5 L"]].concat();
    assert!(desk.done(&said).contains("6 L with the lungs"));
}
