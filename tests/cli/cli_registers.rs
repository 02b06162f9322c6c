//! The registers as their users see them: entries from files and from flags, edits, lists, what is refused.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use crate::desk::{Desk, fixture};
use serde_json::{Value, json};

/// Command, file of the invented entry, its name.
const REGISTERS: [(&str, &str, &str); 6] = [
    ("acceptance", "acceptance", "SHOP-5"),
    ("orifice", "orifice", "CMF-0417"),
    ("first-stage", "first_stage", "FS-01"),
    ("diver", "diver", "D-07"),
    ("instrument", "lines", "FM-01"),
    ("instrument", "modbus", "PT-01"),
];

/// The keys of a file as flags: those in tables behind the name of the table, numbers and switches as texts.
fn flags_of(name: &str) -> Vec<String> {
    let table: toml::Table = std::fs::read_to_string(fixture(name)).unwrap().parse().unwrap();
    let text = |value: &toml::Value| match value {
        toml::Value::String(text) => text.replace('\r', "\\r").replace('\n', "\\n"),
        other => other.to_string(),
    };
    let flag = |key: &str| format!("--{}", key.replace('_', "-"));
    let mut flags = Vec::new();
    for (key, value) in &table {
        match value {
            toml::Value::Table(inner) => {
                for (below, value) in inner {
                    flags.extend([flag(&format!("{key}-{below}")), text(value)]);
                }
            }
            _ if key == "record" => {}
            value => flags.extend([flag(key), text(value)]),
        }
    }
    flags
}

#[test]
fn an_entry_from_a_file_and_one_from_flags_are_the_same() {
    for (command, file, id) in REGISTERS {
        let desk = Desk::new(&format!("registers-{file}"));
        assert!(desk.done(&[command, "add", &fixture(file)]).contains(id));
        let of_file = desk.json(&[command, "show", id]);
        let flags = flags_of(file);
        let mut all = vec![command, "add"];
        all.extend(flags.iter().map(String::as_str));
        let other = desk.call_on("flags.db", &all);
        assert_eq!(other.status, 0, "{file}: {other:?}");
        let said = desk.call_on("flags.db", &[command, "show", id, "--json"]);
        let of_flags: Value = serde_json::from_str(&said.stdout).unwrap();
        assert_eq!(of_file["entry"], of_flags["entry"], "{file}");
        assert_eq!((&of_file["revision"], &of_file["id"]), (&json!(1), &json!(id)));
    }
}

#[test]
fn every_flag_is_a_key_that_is_read() {
    use clap::CommandFactory as _;
    let desk = Desk::new("registers-flags");
    let mut cli = ebbline::cli::arguments::Arguments::command();
    cli.build();
    let mut seen = 0;
    for command in ["orifice", "instrument", "first-stage", "diver", "acceptance", "shop"] {
        let verb = if command == "shop" { "edit" } else { "add" };
        let verbs = cli.find_subcommand(command).unwrap().find_subcommand(verb).unwrap();
        for argument in verbs.get_arguments().filter(|a| a.get_id().as_str().starts_with("key:")) {
            let flag = format!("--{}", argument.get_long().unwrap());
            let said = desk.call(&[command, verb, &flag, "\u{7}"]);
            assert_eq!(said.status, 2, "{command} {flag}: {said:?}");
            assert!(!said.stderr.contains("is not a key") && !said.stderr.contains("unknown"), "{said:?}");
            seen += 1;
        }
    }
    assert!(seen > 80, "only {seen} flags");
    assert!(!desk.book().exists(), "a refusal begins no book");
}

#[test]
fn quantities_need_their_unit_and_a_refusal_names_the_flag() {
    let desk = Desk::new("registers-units");
    for (arguments, flag) in [
        (vec!["orifice", "add", "A", "--length", "0.2"], "--length"),
        (vec!["orifice", "add", "A", "--nominal-diameter", "76"], "--nominal-diameter"),
        (
            vec![
                "first-stage",
                "add",
                "A",
                "--compensated",
                "false",
                "--ip-range",
                "7 to 13",
                "--division",
                "0.1 bar",
            ],
            "--ip-range",
        ),
        (vec!["diver", "add", "A", "--mass", "82"], "--mass"),
        (vec!["diver", "add", "A", "--loop-volume", "7.5"], "--loop-volume"),
        (vec!["acceptance", "add", "A", "--ip", "10", "--flow", "0.48 L/min", "--tolerance", "5 %"], "--ip"),
        (vec!["acceptance", "add", "A", "--ip", "10 bar", "--flow", "0.48", "--tolerance", "5 %"], "--flow"),
        (
            vec!["instrument", "add", "A", "--measures", "pressure", "--transducer-zero", "0.01"],
            "--transducer-zero",
        ),
    ] {
        desk.refused(&arguments, 2, flag);
    }
    // Negative quantities are values, not flags.
    desk.refused(&["diver", "add", "A", "--mass", "-82 kg"], 2, "--mass");
    assert!(!desk.book().exists());
}

#[test]
fn an_edit_keeps_what_it_does_not_say_and_every_revision_stays() {
    let desk = Desk::new("registers-edit");
    desk.done(&["acceptance", "add", &fixture("acceptance")]);
    desk.done(&["orifice", "add", &fixture("orifice")]);
    let said = desk.done(&["orifice", "edit", "cmf-0417", "--customer", "Reef School", "--serial", ""]);
    assert!(said.contains("revision 2"), "{said}");
    let shown = desk.json(&["orifice", "show", "CMF-0417", "--all"]);
    assert_eq!(shown["entry"]["customer"], "Reef School");
    assert_eq!(shown["entry"].get("serial"), None);
    assert_eq!(shown["entry"]["maker"], "invented");
    assert_eq!(shown["revision"], 2);
    assert_eq!(shown["earlier"][0]["revision"], 1);
    assert_eq!(shown["earlier"][0]["entry"]["customer"], "Tern Dive Club");
    assert!(desk.json(&["orifice", "show", "CMF-0417"]).get("earlier").is_none());
    // A file edits in the same way; what says the same again writes nothing.
    desk.write("change.toml", "record = \"orifice\"\nmaker = \"somebody\"\n");
    desk.done(&["orifice", "edit", "CMF-0417", "change.toml"]);
    let again = desk.json(&["orifice", "edit", "CMF-0417", "change.toml"]);
    assert_eq!((&again[0]["revision"], &again[0]["changed"]), (&json!(3), &json!(false)));
    let text = desk.done(&["orifice", "show", "CMF-0417"]);
    assert!(text.contains("revision 3") && text.contains("--all shows every one"), "{text}");
    desk.refused(&["orifice", "edit", "CMF-0417"], 2, "flags");
    desk.refused(&["orifice", "edit", "CMF-0417", "change.toml", "--maker", "x"], 2, "either files");
    desk.refused(&["orifice", "edit", "OTHER", "--maker", "x"], 2, "there is no orifice OTHER");
    desk.refused(&["orifice", "edit", "CMF-0417", "--id", "OTHER"], 2, "keeps its name");
    // The papers of an instrument after a calibration.
    desk.done(&["instrument", "add", &fixture("lines")]);
    let new = ["--meter-certificate", "FM-2027-001", "--meter-due", "2028-03-01"];
    desk.done(&[&["instrument", "edit", "FM-01"][..], &new].concat());
    let shown = desk.json(&["instrument", "show", "FM-01"]);
    assert_eq!(shown["entry"]["meter"]["certificate"], "FM-2027-001");
    assert_eq!(shown["entry"]["meter"]["gain"], "0.8 %");
    assert_eq!(shown["entry"]["protocol"]["ask"], "READ?\n");
}

#[test]
fn the_shop_is_said_once_and_changed_later() {
    let desk = Desk::new("registers-shop");
    desk.refused(&["shop", "show"], 2, "there is no book");
    desk.refused(&["shop", "edit", "--contact", "x"], 2, "name");
    desk.done(&["shop", "edit", &fixture("shop")]);
    desk.done(&[
        "shop",
        "edit",
        "--contact",
        "ring twice",
        "--signatories",
        "A. One",
        "--signatories",
        "B. Two",
    ]);
    let shown = desk.json(&["shop", "show", "--all"]);
    assert_eq!(shown["entry"]["name"], "Harbour Orifice Works");
    assert_eq!(shown["entry"]["contact"], "ring twice");
    assert_eq!(shown["entry"]["signatories"], json!(["A. One", "B. Two"]));
    assert_eq!(shown["entry"]["logo"], "logo.svg");
    assert_eq!((&shown["revision"], shown["earlier"].as_array().unwrap().len()), (&json!(2), 1));
    let text = desk.done(&["shop", "show"]);
    assert!(text.contains("1 Slip Road\n") && text.contains("7000 Hobart"), "{text}");
}

#[test]
fn a_book_without_a_shop_says_how_one_is_said() {
    let desk = Desk::new("registers-no-shop");
    desk.done(&["orifice", "add", "A", "--maker", "x"]);
    desk.refused(&["shop", "show"], 2, "shop edit");
    desk.refused(&["orifice", "show", "B"], 2, "there is no orifice B");
    desk.refused(&["diver", "show", "a/b"], 2, "name");
}

#[test]
fn names_of_every_script_up_to_32_letters_and_none_twice_in_whatever_case() {
    let desk = Desk::new("registers-names");
    let long = "ж".repeat(32);
    let names =
        ["Ünit_3.b", "孔板-7", "فتحة", "ऑरिफ़िस".trim(), "ΟΠΗ", "オリフィス", &long, "..", "con", "-x"];
    let mut added = 0;
    for name in names {
        let said = desk.call(&["orifice", "add", "--id", name, "--maker", "x"]);
        // Combining marks of some scripts are no letters.
        if said.status == 0 {
            added += 1;
            let shown = desk.json(&["orifice", "show", "--", name]);
            assert_eq!(shown["id"], name);
        } else {
            assert_eq!(said.status, 2, "{name}: {said:?}");
            assert!(said.stderr.contains("letters"), "{name}: {said:?}");
        }
    }
    assert!(added >= 8, "only {added}");
    assert_eq!(desk.json(&["orifice", "list"]).as_array().unwrap().len(), added);
    desk.refused(&["orifice", "add", "ünit_3.B", "--maker", "y"], 2, "already in the register");
    desk.refused(&["orifice", "add", &"ж".repeat(33), "--maker", "y"], 2, "32");
    for name in ["a b", "a\nb", "a\"b", "a'b", "a;b", "R0007", "é\u{301}\u{202E}"] {
        let said = desk.call(&["orifice", "add", "--id", name, "--maker", "y"]);
        assert_eq!((said.status, said.stdout.as_str()), (2, ""), "{name:?}: {said:?}");
    }
    assert_eq!(desk.json(&["orifice", "list"]).as_array().unwrap().len(), added);
}

#[test]
fn hostile_words_come_back_as_they_were_and_line_breaks_only_where_they_make_sense() {
    let desk = Desk::new("registers-words");
    for (i, words) in
        ["\"quoted\" and 'so'", "=HYPERLINK(\"x\")", "@SUM(1)", "\\n is no break", "日本語, עברית, 🤿", "--x"]
            .iter()
            .enumerate()
    {
        let id = format!("W{i}");
        desk.done(&["orifice", "add", &id, "--description", words]);
        assert_eq!(desk.json(&["orifice", "show", &id])["entry"]["description"], *words);
    }
    for words in ["two\nlines", "bell\u{7}", "turned \u{202E}round", "a\rb"] {
        let said = desk.call(&["orifice", "add", "W9", "--description", words]);
        assert_eq!((said.status, said.stdout.as_str()), (2, ""), "{words:?}: {said:?}");
    }
    desk.done(&["shop", "edit", "--name", "S", "--address", "two\nlines"]);
    assert_eq!(desk.json(&["shop", "show"])["entry"]["address"], "two\nlines");
}

#[test]
fn several_files_are_added_all_or_none() {
    let desk = Desk::new("registers-several");
    for id in ["A", "B", "C"] {
        desk.write(&format!("{id}.toml"), format!("record = \"orifice\"\nid = \"{id}\"\n"));
    }
    desk.write("bad.toml", "record = \"orifice\"\nid = \"D\"\nlenght = \"1 mm\"\n");
    desk.refused(&["orifice", "add", "A.toml", "bad.toml"], 2, "bad.toml, line 3");
    assert!(!desk.book().exists());
    desk.done(&["orifice", "add", "B.toml"]);
    desk.refused(&["orifice", "add", "A.toml", "B.toml"], 2, "B is already in the register");
    assert_eq!(desk.json(&["orifice", "list"]).as_array().unwrap().len(), 1);
    desk.refused(&["orifice", "add", "A.toml", "A.toml"], 2, "A is already in the register");
    let added = desk.json(&["orifice", "add", "A.toml", "C.toml"]);
    assert_eq!(added.as_array().unwrap().len(), 2);
    desk.refused(&["orifice", "add"], 2, "--help");
    desk.refused(&["orifice", "add", "A.toml", "--maker", "x"], 2, "either files");
    desk.refused(&["orifice", "add", "X", "Y"], 2, "either files");
    desk.refused(&["first-stage", "add", "A.toml"], 2, "orifice");
}

#[test]
fn lists_show_fifty_and_say_how_many_there_are() {
    let desk = Desk::new("registers-lists");
    assert!(desk.call(&["orifice", "list"]).status == 2);
    desk.done(&["first-stage", "add", &fixture("first_stage")]);
    assert!(desk.done(&["orifice", "list"]).starts_with("No orifice in the register yet: orifice add"));
    let files: Vec<String> = (0..60)
        .map(|i| {
            let name = format!("o/{i:02}.toml");
            desk.write(
                &name,
                format!("record = \"orifice\"\nid = \"N{i:02}\"\ndescription = \"number {i}\"\n"),
            );
            name
        })
        .collect();
    let mut add = vec!["orifice", "add"];
    add.extend(files.iter().map(String::as_str));
    desk.done(&add);
    let text = desk.done(&["orifice", "list"]);
    assert_eq!(text.lines().count(), 52, "{text}");
    assert!(text.contains("50 of 60 are shown: --all shows every one."), "{text}");
    assert!(text.contains("N49") && !text.contains("N50"), "{text}");
    assert!(desk.done(&["orifice", "list", "--all"]).contains("N59"));
    assert_eq!(desk.json(&["orifice", "list", "--all"]).as_array().unwrap().len(), 60);
    assert!(text.lines().all(|line| line.chars().count() <= 80), "{text}");
}

#[test]
fn shown_units_are_those_asked_for_and_json_says_what_the_file_says() {
    let desk = Desk::new("registers-shown");
    desk.done(&["acceptance", "add", &fixture("acceptance")]);
    let text = desk.done(&["acceptance", "show", "SHOP-5", "--show", "psi,mL/min"]);
    assert!(text.contains("145.04 psi") && text.contains("480 mL/min"), "{text}");
    let file: toml::Table = std::fs::read_to_string(fixture("acceptance")).unwrap().parse().unwrap();
    let shown = desk.json(&["acceptance", "show", "SHOP-5", "--show", "psi"]);
    for key in ["record", "id", "ip", "flow", "tolerance", "rule", "gas", "straight"] {
        assert_eq!(shown["entry"][key], file[key].as_str().unwrap(), "{key}");
    }
}

#[test]
fn an_overdue_calibration_is_seen_in_the_list() {
    let desk = Desk::new("registers-overdue");
    desk.done(&["instrument", "add", &fixture("lines")]);
    desk.done(&["instrument", "edit", "FM-01", "--meter-due", "2020-01-31"]);
    assert!(desk.done(&["instrument", "list"]).contains("2020-01-31 OVERDUE"));
}

#[test]
fn a_diver_is_forgotten_with_a_reason_that_does_not_name_them() {
    let desk = Desk::new("registers-forget");
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.done(&["diver", "edit", "D-07", "--mass", "83 kg"]);
    desk.done(&["book", "backup", "copy.db"]);
    desk.refused(&["diver", "forget", "D-07"], 2, "--why");
    for why in ["", "  ", "two\nlines"] {
        desk.refused(&["diver", "forget", "D-07", "--why", why], 2, "--why");
    }
    for why in ["d-07 asked for it", "Mr Halász asked", "asked by (HALÁSZ)."] {
        desk.refused(&["diver", "forget", "D-07", "--why", why], 2, "must not name");
    }
    assert_eq!(desk.json(&["diver", "list"]).as_array().unwrap().len(), 1);
    desk.refused(&["diver", "forget", "D-08", "--why", "left"], 2, "there is no diver D-08");
    let said = desk.json(&["diver", "forget", "d-07", "--why", "left the club and asked"]);
    assert_eq!(said["records_erased"], 2);
    assert_eq!(said["copies"][0]["kind"], "backup");
    assert!(said["copies"][0]["place"].as_str().unwrap().ends_with("copy.db"), "{said}");
    desk.refused(&["diver", "show", "D-07"], 2, "there is no diver");
    desk.refused(&["diver", "forget", "D-07", "--why", "again"], 2, "there is no diver");
    let bytes = std::fs::read(desk.book()).unwrap();
    assert!(!bytes.windows(6).any(|w| w == "Halász".as_bytes().get(..6).unwrap()));
    let check = desk.json(&["book", "check"]);
    assert_eq!((&check["holds"], &check["erasures"][0]["records"]), (&json!(true), &json!(2)));
    assert_eq!(desk.json(&["book", "info"])["erased_records"], 2);
}

#[test]
fn while_another_program_reads_forgetting_says_what_holds_it_and_finishes_later() {
    let desk = Desk::new("registers-held");
    desk.done(&["diver", "add", &fixture("diver")]);
    let reader = rusqlite::Connection::open(desk.book()).unwrap();
    reader.execute_batch("BEGIN").unwrap();
    let _: i64 = reader.query_row("SELECT count(*) FROM record", [], |row| row.get(0)).unwrap();
    desk.refused(&["diver", "forget", "D-07", "--why", "left"], 3, "another program is reading the book");
    desk.refused(&["diver", "show", "D-07"], 2, "there is no diver");
    assert!(desk.done(&["book", "info"]).contains("not yet carried through"));
    reader.execute_batch("COMMIT").unwrap();
    drop(reader);
    let said = desk.done(&["diver", "forget", "D-07", "--why", "left"]);
    assert!(said.contains("earlier erasure is finished"), "{said}");
    assert_eq!(desk.json(&["book", "info"])["erasure_unfinished"], false);
}
