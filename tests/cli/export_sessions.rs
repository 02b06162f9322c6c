//! `book export` of sessions: a fresh book made of it has the same uptake to the last bit, and nothing of them leaves unasked.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::couch::{SHARE, at, stated, through, write, write_orifice, write_run_of};
use crate::desk::{Desk, fixture};
use crate::loop_simulator::Kind;
use chrono::DateTime;
use ebbline::book::{Book, Options, Stamp};
use ebbline::entry::{CellSignal, Id, LineReference, Session};
use serde_json::{Value, json};

fn file(name: &str) -> LineReference {
    LineReference::RunFile(name.to_owned())
}

/// A book with every way in which a session can have come.
fn filled(name: &str) -> Desk {
    let desk = Desk::new(name);
    desk.done(&["instrument", "add", &fixture("lines")]);
    write_orifice(&desk, "small", "small", SHARE);
    let import = |name: &str, session: &Session| {
        write(&desk, name, session);
        desk.json(&["session", "import", &format!("{name}.toml")])[0]["session"].as_str().unwrap().to_owned()
    };
    let on = |session, day: u32| at(session, &format!("2026-11-{day:02}T18:05:00+11:00"));
    // S0001: through a run file beside it, in a folder of one's own names.
    desk.write("mine/small.toml", desk.read("small.toml"));
    desk.write("mine/small.csv", desk.read("small.csv"));
    import("mine/couch-1", &on(through(Kind::HeldTwice, 1, file("small.toml")), 13));
    // S0002: stated flows. S0003: another diver. S0004: by an orifice of the book, a reading missing.
    import("stated", &on(stated(Kind::SealedTwice, 2), 14));
    import("other", &Session { diver: Id::new("D-08").unwrap(), ..stated(Kind::Topped, 3) });
    let mut missing = on(through(Kind::Sealed, 4, LineReference::Orifice(Id::new("small").unwrap())), 15);
    let CellSignal::Bar(column) = &mut missing.readings.cells[1].signal else { panic!("bar") };
    column[17] = f64::NAN;
    import("by-orifice", &missing);
    // S0005: the run file is elsewhere. S0006: its meter stands in the register and has changed since.
    std::fs::create_dir(desk.folder.join("below")).unwrap();
    import("below/elsewhere", &on(through(Kind::HeldTwice, 5, file("../small.toml")), 16));
    write_run_of(&desk, "metered", SHARE, |toml| {
        let (head, rest) = toml.split_once("[meter]").unwrap();
        let (_, transducer) = rest.split_once("[transducer]").unwrap();
        format!("{}[transducer]{transducer}", head.replace("[columns]", "meter = \"FM-01\"\n\n[columns]"))
    });
    import("metered-couch", &on(through(Kind::HeldTwice, 6, file("metered.toml")), 17));
    desk.done(&["instrument", "edit", "FM-01", "--meter-gain", "0.4 %"]);
    // S0007: a remark in the table of readings, which a spreadsheet would run.
    let session = on(stated(Kind::Held, 7), 18);
    write(&desk, "remarks", &session);
    let csv = desk.read("remarks.csv");
    let remarked: Vec<String> = csv
        .lines()
        .enumerate()
        .map(|(i, line)| match i {
            0 => format!("{line},remark"),
            5 => format!("{line},=1+1"),
            _ => format!("{line},"),
        })
        .collect();
    desk.write("remarks.csv", remarked.join("\n") + "\n");
    desk.done(&["session", "import", "remarks.toml"]);
    // S0008: typed.
    let mut salt = 0_u8;
    let mut salts = || {
        salt += 1;
        [salt; 16]
    };
    let now = DateTime::parse_from_rfc3339("2026-11-20T12:00:00+11:00").unwrap();
    let mut book = Book::open(&desk.book(), &Options::default()).unwrap();
    book.enter_session(&on(stated(Kind::Cylinder, 8), 19), &mut Stamp { at: now, salt: &mut salts }).unwrap();
    drop(book);
    // S0009: the run file is called as a session would be.
    desk.write("S7.toml", desk.read("small.toml"));
    import("by-s7", &on(through(Kind::HeldTwice, 9, file("S7.toml")), 20));
    desk.done(&["bench", "import", "small.toml"]);
    desk.done(&["bench", "accept", "R0001"]);
    desk
}

fn files(folder: &Path) -> Vec<PathBuf> {
    let (mut found, mut open) = (Vec::new(), vec![folder.to_owned()]);
    while let Some(folder) = open.pop() {
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.is_dir() { open.push(path) } else { found.push(path) }
        }
    }
    found.sort();
    found
}

/// A fresh book made of the export in `out`, by the commands of its README.
fn taken_back(desk: &Desk, book: &str) {
    let readme = desk.read("out/README.txt");
    let texts: toml::Table = match std::fs::read_to_string(desk.folder.join("out/sessions/left-out.toml")) {
        Ok(text) => text.parse().unwrap(),
        Err(_) => toml::Table::new(),
    };
    let mut left_out = texts.get("left_out").and_then(|out| out.as_array()).into_iter().flatten();
    let mut lines = 0;
    for line in readme.lines().filter_map(|line| line.strip_prefix("  ebbline --book NEW.db ")) {
        let mut line = line.to_owned();
        if line.starts_with("session leave-out") {
            // WHY and NAME stand for what a shell may misread; here a variable holds it.
            let table = left_out.next().unwrap();
            let text =
                |key: &str| table.get(key).and_then(|text| text.as_str()).unwrap_or_default().to_owned();
            assert_eq!(text("command"), line);
            line = line.replace("WHY", "\"$WHY\"").replace("NAME", "\"$NAME\"");
            call(desk, book, &line, &[("WHY", text("why")), ("NAME", text("by"))]);
        } else {
            call(desk, book, &line, &[]);
            if line.starts_with("bench import") {
                call(desk, book, "bench accept R0001", &[]);
            }
        }
        lines += 1;
    }
    assert!(lines >= 4, "{readme}");
    assert_eq!(left_out.next(), None);
}

/// A command of the README, through a shell that resolves its names.
fn call(desk: &Desk, book: &str, line: &str, variables: &[(&str, String)]) {
    let mut shell = std::process::Command::new("sh");
    shell.current_dir(desk.folder.join("out")).envs(variables.iter().map(|(name, text)| (name, text)));
    let program = env!("CARGO_BIN_EXE_ebbline");
    let said = shell.args(["-c", &format!("'{program}' --book '../{book}' {line}")]).output().unwrap();
    assert!(said.status.success(), "{line}: {}", String::from_utf8_lossy(&said.stderr));
}

fn uptakes(desk: &Desk, book: &str, of: &[&str]) -> Value {
    let said = desk.call_on(book, &[&["session", "uptake", "--json"], of].concat());
    assert!(said.status < 2, "{of:?}: {said:?}");
    let mut json: Value = serde_json::from_str(&said.stdout).unwrap();
    for session in json["sessions"].as_array_mut().unwrap() {
        session["session"].take();
    }
    // Both say it of sessions by their numbers, which an erased one shifts.
    json["warnings"].take();
    json["notes"].take();
    json
}

#[cfg(unix)]
#[test]
fn a_fresh_book_made_of_an_export_has_the_same_uptakes_to_the_last_bit() {
    let desk = filled("export-sessions");
    let exported = desk.json(&["book", "export", "out", "--with-divers"]);
    let forms: BTreeMap<&str, &str> = exported["sessions"]
        .as_array()
        .unwrap()
        .iter()
        .map(|session| (session["session"].as_str().unwrap(), session["form"].as_str().unwrap()))
        .collect();
    let expected = [
        ("S0001", "original"),
        ("S0002", "original"),
        ("S0003", "original"),
        ("S0004", "original"),
        ("S0005", "written"),
        ("S0006", "written"),
        ("S0007", "written"),
        ("S0008", "written"),
        ("S0009", "written"),
    ];
    assert_eq!(forms, BTreeMap::from(expected));
    assert_eq!(exported["sessions_not_exported"], 0);
    // Originals are the bytes that came, the run file and its readings among them.
    for (out, came) in [
        ("S0001/S0001.toml", "mine/couch-1.toml"),
        ("S0001/couch-1.csv", "mine/couch-1.csv"),
        ("S0001/small.toml", "mine/small.toml"),
        ("S0001/small.csv", "mine/small.csv"),
        ("S0002/S0002.toml", "stated.toml"),
        ("S0004/by-orifice.csv", "by-orifice.csv"),
    ] {
        let bytes = |name: &str| std::fs::read(desk.folder.join(name)).unwrap();
        assert_eq!(bytes(&format!("out/sessions/{out}")), bytes(came), "{out}");
    }
    taken_back(&desk, "fresh.db");
    for (session, _) in expected {
        assert_eq!(
            uptakes(&desk, "fresh.db", &[session]),
            uptakes(&desk, "book.db", &[session]),
            "{session}"
        );
    }
    assert_eq!(uptakes(&desk, "fresh.db", &["D-07"]), uptakes(&desk, "book.db", &["D-07"]));
    // Exported again, every file of a session is the same; S0005 and the like are originals now.
    let said = desk.call_on("fresh.db", &["book", "export", "again", "--with-divers"]);
    assert_eq!(said.status, 0, "{said:?}");
    for path in files(&desk.folder.join("out/sessions")) {
        let again = desk
            .folder
            .join("again/sessions")
            .join(path.strip_prefix(desk.folder.join("out/sessions")).unwrap());
        assert_eq!(std::fs::read(&path).unwrap(), std::fs::read(&again).unwrap(), "{}", path.display());
    }
}

#[cfg(unix)]
#[test]
fn what_was_left_out_is_left_out_again_by_the_commands_of_the_export() {
    let desk = filled("export-left-out");
    let out = |more: &[&str]| desk.done(&[&["session", "leave-out"], more].concat());
    out(&[
        "S0001",
        "--from",
        "00:04:00.1",
        "--until",
        "00:05:30",
        "--why",
        "spoke, mask off",
        "--by",
        "A. Invented",
    ]);
    out(&["S0001", "--from", "00:09:00", "--until", "00:09:30", "--why", "=1+1 `x` $(x) \"y\" 'z'"]);
    out(&["S0005", "--why", "ate before", "--by", "@B"]);
    // An erased session leaves a gap that a new book does not have.
    desk.done(&["diver", "forget", "D-08", "--why", "asked"]);
    let exported = desk.json(&["book", "export", "out", "--with-divers"]);
    assert_eq!(
        exported["left_out_of_sessions"],
        json!([
            { "session": "S0001", "in_a_new_book": "S0001", "command": "session leave-out S0001 --from \"240.1 s\" --until \"330 s\" --why \"spoke, mask off\" \
                         --by \"A. Invented\"" },
            { "session": "S0001", "in_a_new_book": "S0001",
              "command": "session leave-out S0001 --from \"540 s\" --until \"570 s\" --why WHY" },
            { "session": "S0005", "in_a_new_book": "S0004",
              "command": "session leave-out S0004 --why \"ate before\" --by NAME" },
        ])
    );
    let text = desk.done(&["book", "export", "out", "--with-divers"]);
    assert!(text.contains("sessions/left-out.toml"), "{text}");
    assert!(!desk.folder.join("out/sessions/S0003").exists());
    taken_back(&desk, "fresh.db");
    let fresh = |arguments: &[&str]| -> Value {
        serde_json::from_str(&desk.call_on("fresh.db", &[&["--json"], arguments].concat()).stdout).unwrap()
    };
    assert_eq!(uptakes(&desk, "fresh.db", &["D-07"]), uptakes(&desk, "book.db", &["D-07"]));
    assert_eq!(uptakes(&desk, "fresh.db", &["S0004"]), uptakes(&desk, "book.db", &["S0005"]));
    let whole = |json: &Value| -> Vec<Value> {
        let left_out = json["left_out"].as_array().unwrap().clone();
        left_out
            .into_iter()
            .map(|mut out| {
                out["at"].take();
                out
            })
            .collect()
    };
    assert_eq!(
        whole(&fresh(&["session", "show", "S0001"])),
        whole(&desk.json(&["session", "show", "S0001"]))
    );
    assert_eq!(fresh(&["session", "list"])[4]["left_out_whole"], true);
}

#[test]
fn no_cell_of_an_exported_session_is_anything_a_spreadsheet_runs() {
    let desk = filled("export-session-cells");
    desk.done(&["session", "leave-out", "S0001", "--why", "=1+1", "--by", "@x"]);
    desk.done(&["book", "export", "out", "--with-divers"]);
    let mut tables = 0;
    for path in
        files(&desk.folder.join("out/sessions")).iter().filter(|path| path.extension().unwrap() == "csv")
    {
        let text = std::fs::read_to_string(path).unwrap();
        for cell in text.lines().flat_map(|line| line.split([',', ';', '\t'])) {
            let formula = cell.starts_with(['=', '+', '-', '@']);
            assert!(!formula || cell.parse::<f64>().is_ok(), "{}: {cell:?}", path.display());
        }
        tables += 1;
    }
    assert!(tables >= 13, "{tables}");
    let left_out: toml::Table = desk.read("out/sessions/left-out.toml").parse().unwrap();
    assert_eq!(left_out["left_out"][0]["why"].as_str(), Some("=1+1"));
    assert_eq!(left_out["left_out"][0]["by"].as_str(), Some("@x"));
}

#[test]
fn without_divers_nothing_of_a_session_leaves_and_the_export_says_how_many_stayed() {
    let desk = filled("export-sessions-behind");
    desk.done(&["session", "leave-out", "S0002", "--why", "a reason of its own"]);
    let json = desk.json(&["book", "export", "out"]);
    assert_eq!((&json["sessions"], &json["sessions_not_exported"]), (&json!([]), &json!(9)), "{json}");
    assert_eq!(json["left_out_of_sessions"], json!([]));
    let text = desk.done(&["book", "export", "out"]);
    assert!(text.contains("Divers and 9 sessions are not in it: --with-divers"), "{text}");
    assert!(desk.read("out/README.txt").contains("Divers and 9 sessions are not in it"));
    assert!(!desk.folder.join("out/sessions").exists() && !desk.folder.join("out/divers").exists());
    for path in files(&desk.folder.join("out")) {
        let text = String::from_utf8_lossy(&std::fs::read(&path).unwrap()).into_owned();
        for word in ["D-07", "D-08", "S0001", "couch", "a reason of its own", "left-out.toml"] {
            assert!(!text.contains(word), "{}: {word}", path.display());
        }
    }
    assert_eq!(desk.json(&["book", "info"])["copies"], json!([]));
    // An export with divers is replaced by one without, and nothing of it stays behind.
    desk.done(&["book", "export", "out", "--with-divers"]);
    assert!(desk.folder.join("out/sessions/S0001/S0001.toml").exists());
    desk.done(&["book", "export", "out"]);
    assert!(!desk.folder.join("out/sessions").exists());
    assert_eq!(desk.json(&["book", "info"])["copies"].as_array().unwrap().len(), 1);
}

#[test]
fn info_and_check_count_sessions_and_name_those_that_were_erased() {
    let desk = filled("export-sessions-erased");
    let info = desk.json(&["book", "info"]);
    assert_eq!((&info["sessions"], &info["erasures"]), (&json!(9), &json!([])), "{info}");
    let check = desk.json(&["book", "check"]);
    assert_eq!((&check["holds"], &check["sessions"]), (&json!(true), &json!(9)), "{check}");
    desk.done(&["diver", "forget", "D-08", "--why", "asked in writing"]);
    let info = desk.json(&["book", "info"]);
    assert_eq!(info["sessions"], 8);
    let erasure = &info["erasures"][0];
    assert_eq!((&erasure["sessions"], &erasure["why"]), (&json!(["S0003"]), &json!("asked in writing")));
    assert_eq!(erasure["records"], info["erased_records"]);
    let check = desk.json(&["book", "check"]);
    assert_eq!((&check["sessions"], &check["erasures"][0]), (&json!(8), erasure));
    let day = erasure["at"].as_str().unwrap();
    for text in [desk.done(&["book", "info"]), desk.done(&["book", "check"])] {
        let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
        assert!(text.contains("session S0003 among them: asked in writing") && text.contains(day), "{text}");
        assert!(text.contains("sessions 8") || text.contains("8 sessions"), "{text}");
    }
}
