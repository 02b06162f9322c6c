//! `demo`: what it leaves, and what it leaves alone.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::desk::Desk;
use serde_json::{Value, json};

fn bytes(folder: &Path) -> BTreeMap<PathBuf, Vec<u8>> {
    let (mut found, mut open) = (BTreeMap::new(), vec![folder.to_owned()]);
    while let Some(folder) = open.pop() {
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() {
                open.push(path);
            } else {
                let bytes = std::fs::read(&path).unwrap();
                found.insert(path, bytes);
            }
        }
    }
    found
}

#[test]
fn the_book_of_the_invented_shop_shows_an_orifice_that_clogs_before_it_fails() {
    let desk = Desk::new("demo");
    let left: Value = serde_json::from_str(&desk.done(&["demo", "--into", "out", "--json"])).unwrap();
    let sheet = std::fs::read(desk.folder.join("out/demo-sheet.pdf")).unwrap();
    assert_eq!(ebbline::certificate::paper::read::read(&sheet).unwrap().pages.len(), 1, "of A5");
    let shop = &left["shop"];
    // The one that is logged from the simulated bench among them, where there are pseudo-terminals.
    assert_eq!(shop["orifices"], if cfg!(unix) { 14 } else { 13 });
    let book = shop["book"].as_str().unwrap();
    let said = |arguments: &[&str]| -> Value {
        let said = desk.call_on(book, &[arguments, &["--json"]].concat());
        assert_eq!(said.status, 0, "{said:?}");
        serde_json::from_str(&said.stdout).unwrap()
    };
    assert_eq!(said(&["book", "check"])["holds"], true);
    assert_eq!(said(&["book", "info"])["runs"], shop["runs"]);
    assert_eq!(
        said(&["bench", "list", "--all"]).as_array().unwrap().len() as u64,
        shop["runs"].as_u64().unwrap()
    );
    let orifices = said(&["orifice", "list"]);
    let clogging = shop["clogging"].as_str().unwrap();
    for orifice in orifices.as_array().unwrap() {
        let id = orifice["id"].as_str().unwrap();
        let history = said(&["orifice", "show", id, "--all"]);
        let significant = history["trend"]["significant"] == json!(true);
        assert_eq!(significant, id == clogging, "{id}: {}", history["trend"]);
        let last = history["runs"][0]["verdict"].as_str().unwrap();
        // What is logged is not the same twice: with so few points it may stay undecided.
        assert!(
            id == "demo-live" || last == "pass" || history["runs"].as_array().unwrap().len() == 1,
            "{id}: {last}"
        );
    }
    let history = said(&["orifice", "show", clogging, "--all"]);
    let runs = history["runs"].as_array().unwrap();
    assert!(runs.iter().all(|run| run["verdict"] == "pass"), "{history}");
    let (first, last) = (runs.last().unwrap(), &runs[0]);
    let days = |run: &Value| chrono::DateTime::parse_from_rfc3339(run["taken"].as_str().unwrap()).unwrap();
    assert!((days(last) - days(first)).num_days() > 700, "two years");
    let warning = history["warnings"][0].as_str().unwrap();
    assert!(warning.contains("clogging") && warning.contains("passes the acceptance limit"), "{warning}");
    assert_eq!(shop["warnings"], history["warnings"]);
    assert!(desk.read(shop["plot"].as_str().unwrap()).contains(clogging));
    // The register knows all kinds, and every file says that it is invented.
    for command in ["instrument", "first-stage", "acceptance", "diver"] {
        assert!(!said(&[command, "list"]).as_array().unwrap().is_empty(), "{command}");
    }
    assert_eq!(said(&["shop", "show"])["entry"]["name"], "Invented Orifice Works");
    for (path, bytes) in bytes(&desk.folder.join(shop["files"].as_str().unwrap())) {
        let toml = path.extension().is_some_and(|e| e == "toml");
        assert!(!toml || bytes.starts_with(b"# Invented"), "{}", path.display());
    }
}

#[test]
fn a_run_of_the_invented_shop_is_certified_and_the_certificate_amended() {
    let desk = Desk::new("demo-certificate");
    let left: Value = serde_json::from_str(&desk.done(&["demo", "--into", "out", "--json"])).unwrap();
    let issued = &left["certificate"];
    assert_eq!(
        (&issued["number"], &issued["amendment"]),
        (&json!("DEMO-2026-0001"), &json!("DEMO-2026-0002"))
    );
    assert_eq!(issued["hold"], true);
    let files: Vec<&str> = issued["files"].as_array().unwrap().iter().map(|f| f.as_str().unwrap()).collect();
    assert_eq!(files.len(), 4);
    for file in files {
        for (book, here) in [("out/book.db", json!(true)), ("none.db", Value::Null)] {
            let said = desk.call_on(book, &["certificate", "check", file, "--json"]);
            let json: Value = serde_json::from_str(&said.stdout).unwrap();
            assert_eq!(
                (said.status, &json["holds"], &json["issued_here"]),
                (0, &json!(true), &here),
                "{said:?}"
            );
        }
    }
    // Somebody issues another one from it: the book stays as it is.
    let book = "out/book.db";
    let said = desk.call_on(book, &["certificate", "issue", "R0001", "--into", "mine"]);
    assert_eq!(said.status, 0, "{said:?}");
    desk.refused(&["demo", "--into", "out"], 2, "DEMO-");
}

#[test]
fn a_second_time_gives_the_same_files_and_another_book() {
    let desk = Desk::new("demo-twice");
    desk.done(&["demo", "--into", "out"]);
    let first = bytes(&desk.folder.join("out"));
    desk.done(&["demo", "--into", "out"]);
    let second = bytes(&desk.folder.join("out"));
    assert_eq!(first.keys().collect::<Vec<_>>(), second.keys().collect::<Vec<_>>());
    for (path, bytes) in &first {
        // A certificate prints the head of the chain, whose salts are drawn anew.
        let of_book = path.ends_with("book.db") || path.parent().unwrap().ends_with("certificates");
        assert_eq!(*bytes == second[path], !of_book, "{}", path.display());
    }
}

#[test]
fn a_book_that_no_demonstration_made_or_that_is_used_is_left_alone() {
    let desk = Desk::new("demo-other");
    std::fs::create_dir(desk.folder.join("out")).unwrap();
    assert_eq!(desk.call_on("out/book.db", &["orifice", "add", "A", "--maker", "x"]).status, 0);
    let before = bytes(&desk.folder.join("out"));
    desk.refused(&["demo", "--into", "out"], 2, "no demonstration made");
    assert_eq!(bytes(&desk.folder.join("out")), before);
    // Somebody went on in the book of a demonstration.
    desk.done(&["demo", "--into", "used"]);
    let run = desk.read("used/demo-good.toml").replace("\"demo-good\"", "\"CMF-1\"");
    desk.write("used/mine.toml", run);
    assert_eq!(desk.call_on("used/book.db", &["bench", "import", "used/mine.toml"]).status, 0);
    let before = bytes(&desk.folder.join("used"));
    desk.refused(&["demo", "--into", "used"], 2, "CMF-1");
    assert_eq!(bytes(&desk.folder.join("used")), before);
    // What is no book at all is no demonstration's either.
    desk.write("text/book.db", "a text");
    desk.refused(&["demo", "--into", "text"], 3, "is not a book");
    assert_eq!(desk.read("text/book.db"), "a text");
}
