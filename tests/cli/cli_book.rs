//! `book` as its users see it: what it holds, whether it holds, a copy; and an orifice's history.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use crate::bench_files::{RUN, readings};
use crate::desk::{Desk, fixture};
use serde_json::{Value, json};

/// A run of `orifice` with its flows times `share`, taken on a day; imported and judged.
fn judged(desk: &Desk, orifice: &str, day: &str, purpose: &str, share: f64) -> String {
    let name = imported(desk, orifice, day, purpose, share);
    desk.done(&["bench", "accept", &name]);
    name
}

fn imported(desk: &Desk, orifice: &str, day: &str, purpose: &str, share: f64) -> String {
    let toml = RUN
        .replace("\"CMF-0417\"", &format!("{orifice:?}"))
        .replace("2026-11-12", day)
        .replace("purpose = \"acceptance\"", &format!("purpose = \"{purpose}\""));
    let mut csv = String::from("ip,flow,sweep\n");
    for line in readings().lines().skip(1) {
        let cells: Vec<&str> = line.split(',').collect();
        csv.push_str(&format!("{},{:.5},{}\n", cells[0], share * cells[1].parse::<f64>().unwrap(), cells[2]));
    }
    desk.write("run.toml", toml);
    desk.write("run.csv", csv);
    desk.json(&["bench", "import", "run.toml"])[0]["run"].as_str().unwrap().to_owned()
}

#[test]
fn info_says_what_the_book_holds() {
    let desk = Desk::new("book-info");
    desk.refused(&["book", "info"], 2, "there is no book");
    assert!(!desk.book().exists());
    judged(&desk, "CMF-0417", "2026-11-12", "acceptance", 1.0);
    desk.done(&["diver", "add", &fixture("diver")]);
    let info = desk.json(&["book", "info"]);
    assert_eq!(info["runs"], 1);
    assert_eq!(info["entries"]["orifice"], 1);
    assert_eq!(info["entries"]["first_stage"], 0);
    assert_eq!(info["form"], 1);
    let bytes = std::fs::metadata(desk.book()).unwrap().len();
    assert_eq!((&info["size_bytes"], &info["size_per_run_bytes"]), (&json!(bytes), &json!(bytes)));
    let head = info["head"].as_str().unwrap();
    assert_eq!(head.split('-').next().unwrap(), info["records"].to_string());
    let text = desk.done(&["book", "info"]);
    assert!(text.contains(head) && text.contains("size per run"), "{text}");
}

#[test]
fn check_holds_passes_through_kept_heads_and_sees_what_was_changed() {
    let desk = Desk::new("book-check");
    judged(&desk, "A", "2026-11-12", "acceptance", 1.0);
    let early = desk.json(&["book", "info"])["head"].as_str().unwrap().to_owned();
    judged(&desk, "B", "2026-11-12", "acceptance", 1.0);
    let late = desk.json(&["book", "info"])["head"].as_str().unwrap().to_owned();
    let check = desk.json(&["book", "check", "--head", &early, &late, "--head", &early]);
    assert_eq!(
        (&check["holds"], &check["heads_given"], &check["head"]),
        (&json!(true), &json!(3), &json!(late))
    );
    desk.refused(&["book", "check", "--head", "7-abc"], 2, "no head");
    let foreign = format!("{}-{}", early.split('-').next().unwrap(), "0".repeat(64));
    let said = desk.call(&["book", "check", "--head", &foreign, "--json"]);
    assert_eq!(said.status, 1, "{said:?}");
    let json: Value = serde_json::from_str(&said.stdout).unwrap();
    assert_eq!(json["holds"], false);
    assert!(json["wrong"].as_str().unwrap().contains("does not pass through"), "{json}");
    assert!(said.stderr.contains("does not hold"), "{said:?}");
    // Somebody takes the triggers away and changes a figure.
    let book = rusqlite::Connection::open(desk.book()).unwrap();
    book.execute_batch("DROP TRIGGER decision_stays; UPDATE decision SET verdict = 1 + verdict % 2;")
        .unwrap();
    drop(book);
    let said = desk.call(&["book", "check"]);
    assert_eq!(said.status, 1, "{said:?}");
    assert!(said.stdout.contains("does not hold: the table, index or trigger decision_stays"), "{said:?}");
}

#[test]
fn what_is_no_book_or_damaged_beyond_reading_is_left_as_it_is() {
    let desk = Desk::new("book-damaged");
    desk.write("book.db", "just a text\n");
    for verb in [["book", "check"], ["book", "info"], ["orifice", "list"], ["shop", "show"]] {
        desk.refused(&verb, 3, "is not a book");
    }
    desk.refused(&["orifice", "add", "A", "--maker", "x"], 3, "is not a book");
    desk.refused(&["book", "export", "out"], 3, "is not a book");
    assert_eq!(desk.read("book.db"), "just a text\n");
    assert!(!desk.folder.join("out").exists());
    std::fs::remove_file(desk.book()).unwrap();
    judged(&desk, "A", "2026-11-12", "acceptance", 1.0);
    let whole = std::fs::read(desk.book()).unwrap();
    desk.write("book.db", &whole[..whole.len() / 2]);
    desk.refused(&["book", "check"], 3, "damaged");
    assert_eq!(std::fs::read(desk.book()).unwrap(), &whole[..whole.len() / 2]);
}

#[test]
fn a_backup_is_a_book_and_replaces_nothing_unless_it_may() {
    let desk = Desk::new("book-backup");
    let run = judged(&desk, "A", "2026-11-12", "acceptance", 1.0);
    let made = desk.json(&["book", "backup", "copy.db"]);
    assert_eq!(made["check"]["holds"], true);
    let here = desk.call(&["bench", "fit", &run, "--json"]);
    assert_eq!(here.stdout, desk.call_on("copy.db", &["bench", "fit", &run, "--json"]).stdout);
    desk.refused(&["book", "backup", "copy.db"], 2, "is there already");
    desk.done(&["book", "backup", "copy.db", "--replace"]);
    desk.refused(&["book", "backup", "book.db", "--replace"], 2, "is there already");
    desk.refused(&["book", "backup", "no/such/folder/copy.db"], 3, "copy.db");
    let copies = desk.json(&["book", "info"])["copies"].clone();
    assert_eq!(copies.as_array().unwrap().len(), 2, "{copies}");
    assert!(copies[0]["place"].as_str().unwrap().ends_with("copy.db"));
    assert_eq!(desk.json(&["book", "check"])["holds"], true);
}

#[test]
fn the_history_of_an_orifice_shows_a_slow_blockage_before_it_fails() {
    let desk = Desk::new("book-history");
    let months =
        ["2025-01-10", "2025-04-10", "2025-07-10", "2025-10-10", "2026-01-10", "2026-04-10", "2026-07-10"];
    // A fifth of a per cent each quarter, half of what two runs can tell apart; the last is as far down as 1.2 %.
    for (i, day) in months.iter().enumerate() {
        judged(&desk, "slow", day, "check", 1.0 - 0.002 * i as f64);
        judged(&desk, "steady", day, "check", 1.0);
    }
    let open = imported(&desk, "slow", "2026-08-01", "check", 0.9);
    let slow = desk.json(&["orifice", "show", "SLOW", "--plot", "slow.svg"]);
    let runs = slow["runs"].as_array().unwrap();
    assert_eq!((runs.len(), &runs[0]["run"], &runs[0]["verdict"]), (8, &json!(open), &Value::Null));
    for run in &runs[1..7] {
        assert_eq!(run["verdict"], "pass", "{run}");
        assert!(run["e_n"].as_f64().unwrap() < 0.0 && run["e_n"].as_f64().unwrap() > -1.0, "{run}");
    }
    assert_eq!(runs[7]["e_n"], Value::Null);
    let trend = &slow["trend"];
    assert_eq!((&trend["runs"], &trend["significant"]), (&json!(7), &json!(true)), "{trend}");
    // 0.2 % in 90 or 91 days is 0.8 % a year.
    assert!((trend["percent_per_year"].as_f64().unwrap() + 0.80).abs() < 0.03, "{trend}");
    let interval = &trend["interval_95"];
    assert!(interval[0].as_f64().unwrap() < -0.8 && interval[1].as_f64().unwrap() < 0.0, "{trend}");
    let (about, not_before) =
        (trend["leaves_limits_about"].as_str().unwrap(), trend["leaves_limits_not_before"].as_str().unwrap());
    assert!("2026-07-10" < not_before && not_before < about, "{trend}");
    let warning = slow["warnings"][0].as_str().unwrap();
    assert!(
        warning.contains("falls") && warning.contains("clogging") && warning.contains(about),
        "{warning}"
    );
    let text = desk.done(&["orifice", "show", "slow"]);
    assert!(text.contains("WARNING: the flow falls"), "{text}");
    assert!(text.lines().all(|line| line.chars().count() <= 80), "{text}");
    let svg = desk.read("slow.svg");
    assert!(svg.contains("R0013") && svg.contains(&about[..7]), "{svg}");

    let steady = desk.json(&["orifice", "show", "steady"]);
    assert_eq!((&steady["trend"]["significant"], &steady["warnings"]), (&json!(false), &json!([])));
    assert_eq!(steady["trend"]["leaves_limits_about"], Value::Null);
}

#[test]
fn a_step_from_one_run_to_the_next_is_warned_of_and_cleaning_begins_anew() {
    let desk = Desk::new("book-step");
    judged(&desk, "A", "2026-01-10", "acceptance", 1.0);
    let dirty = judged(&desk, "A", "2026-04-10", "as-found", 0.97);
    let warnings = desk.json(&["orifice", "show", "A"])["warnings"].clone();
    let sentence = warnings[0].as_str().unwrap();
    assert!(sentence.contains(&format!("from R0001 to {dirty}")) && sentence.contains("E_n -"), "{warnings}");
    judged(&desk, "A", "2026-04-11", "as-left", 1.0);
    let after = desk.json(&["orifice", "show", "A"]);
    assert_eq!(after["runs"][0]["verdict"], "pass", "cleaning is no failure: {after}");
    let text = desk.done(&["orifice", "show", "A"]);
    assert!(text.contains("Trend: none yet; it needs 3 accepted runs"), "{text}");
    for (day, share) in [("2026-07-10", 1.0), ("2026-10-10", 1.0)] {
        judged(&desk, "A", day, "check", share);
    }
    let shown = desk.json(&["orifice", "show", "A"]);
    assert_eq!((&shown["trend"]["runs"], &shown["warnings"]), (&json!(3), &json!([])), "{shown}");
}

#[test]
fn a_history_without_judged_runs_is_listed_and_not_drawn() {
    let desk = Desk::new("book-undrawn");
    desk.done(&["orifice", "add", "A", "--maker", "x"]);
    assert!(desk.done(&["orifice", "show", "A"]).contains("No runs of it yet"));
    imported(&desk, "A", "2026-01-10", "check", 1.0);
    assert!(desk.done(&["orifice", "show", "A"]).contains("not judged"));
    desk.refused(&["orifice", "show", "A", "--plot", "a.svg"], 2, "bench accept");
    desk.refused(&["orifice", "show", "A", "--plot", "a.gif"], 2, ".svg or .png");
    assert!(!desk.folder.join("a.svg").exists());
}
