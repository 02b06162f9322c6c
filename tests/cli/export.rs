//! `book export`: a fresh book made of an export answers the same to the last bit, and no spreadsheet runs anything.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};

use crate::bench_files::{RUN, readings};
use crate::desk::{Desk, Said, fixture};
use chrono::DateTime;
use ebbline::book::{Book, Options, Stamp};
use ebbline::entry::Readings;
use ebbline::record::{NoRegisters, read_run_with};
use serde_json::{Value, json};

fn of(orifice: &str, day: &str) -> String {
    RUN.replace("\"CMF-0417\"", &format!("{orifice:?}")).replace("2026-11-12", day)
}

/// Writes a run under a name and imports it.
fn import(desk: &Desk, name: &str, toml: &str, csv: &str) -> String {
    let csv_name = format!("{name}.csv");
    desk.write(&csv_name, csv);
    desk.write(&format!("{name}.toml"), toml.replace("\"run.csv\"", &format!("{csv_name:?}")));
    desk.json(&["bench", "import", &format!("{name}.toml")])[0]["run"].as_str().unwrap().to_owned()
}

/// A series with pauses in which the logger wrote nothing.
fn series() -> (String, String) {
    let toml = of("series", "2026-03-03")
        .replace("readings = \"run.csv\"", "readings = \"run.csv\"\nrows = \"series\"")
        .replace("sweep = { column = \"sweep\" }", "time = { column = \"t\", unit = \"s\" }");
    let mut csv = String::from("t,ip,flow\n");
    for (i, step) in [5.0, 7.0, 9.0, 11.0, 13.0, 10.0, 8.0, 6.0].iter().enumerate() {
        for j in 0..80 {
            let wobble = 0.001 * f64::from(j % 5 - 2);
            let (ip, flow) =
                (step + wobble, 0.0466 * (step + wobble + 0.95) * (1.0 + 0.0002 * f64::from(j % 3 - 1)));
            let cell = if j == 41 { String::new() } else { format!("{flow:.5}") };
            csv.push_str(&format!("{},{ip:.4},{cell}\n", 40 * i as i32 + j / 2));
        }
    }
    (toml, csv)
}

/// A book with everything an export has to get right.
fn filled(name: &str) -> Desk {
    let desk = Desk::new(name);
    desk.done(&["acceptance", "add", &fixture("acceptance")]);
    desk.done(&["orifice", "add", &fixture("orifice")]);
    desk.done(&["instrument", "add", &fixture("lines"), &fixture("modbus")]);
    desk.done(&["first-stage", "add", &fixture("first_stage")]);
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.done(&["shop", "edit", &fixture("shop")]);
    desk.done(&["shop", "edit", "--contact", "=ring twice"]);
    let long = "ж".repeat(32);
    for id in ["孔板-7", "-x", "nul", &long] {
        desk.done(&["orifice", "add", "--id", id, "--description", "=HYPERLINK(\"http://x\";\"y\")"]);
    }
    // R0001: plain, an id of the register and an acceptance of its own, then with a point left out.
    import(&desk, "plain", &of("CMF-0417", "2026-01-10"), &readings());
    desk.done(&["bench", "accept", "R0001", "--by", "@A. Invented", "--remark", "+1 \"for\" the record"]);
    desk.done(&["bench", "leave-out", "R0001", "3", "--why", "=hose \"touched\", or so"]);
    desk.done(&["bench", "accept", "R0001"]);
    // R0002: by the names of the registers, whose papers change afterwards.
    let named = of("cmf-0417", "2026-04-10");
    let (head, rest) = named.split_once("[meter]").unwrap();
    assert!(rest.contains("[acceptance]"));
    let head = head.replace(
        "[columns]",
        "meter = \"FM-01\"\ntransducer = \"PT-01\"\nacceptance = \"SHOP-5\"\n\n[columns]",
    );
    import(&desk, "named", &head, &readings());
    desk.done(&["bench", "accept", "R0002"]);
    desk.done(&[
        "instrument",
        "edit",
        "FM-01",
        "--meter-gain",
        "0.4 %",
        "--meter-certificate",
        "FM-2027-001",
    ]);
    // R0003: by the names of the registers as they stand.
    import(&desk, "stands", &head.replace("2026-04-10", "2026-07-10"), &readings());
    // R0004: a column of remarks, some of which a spreadsheet would run; R0005 the same in a head.
    let rows = readings();
    let mut remarks = String::from("ip,flow,sweep,remark\n");
    for (i, line) in rows.lines().skip(1).enumerate() {
        remarks
            .push_str(&format!("{line},{}\n", ["", "=1+1", "@x", "\"-cmd|' /C calc'!A0\"", "fine"][i % 5]));
    }
    import(&desk, "remarks", &of(&long, "2026-02-01"), &remarks);
    let head_cell = rows.replace("ip,flow", "=ip,flow");
    import(&desk, "heads", &of("孔板-7", "2026-02-02").replace("\"ip\"", "\"=ip\""), &head_cell);
    // R0006: readings elsewhere; R0007: in a folder below, with semicolons and decimal commas.
    let elsewhere = desk.folder.join("elsewhere.csv");
    desk.write("elsewhere.csv", readings());
    let toml = of("-x", "2026-02-03").replace("\"run.csv\"", &format!("{:?}", elsewhere.to_str().unwrap()));
    import(&desk, "absolute", &toml, "");
    let commas = readings().replace(',', ";").replace('.', ",");
    desk.write("below/in a folder.csv", commas);
    let toml = of("nul", "2026-02-04").replace("\"run.csv\"", "\"below/in a folder.csv\"");
    import(&desk, "below", &toml, "");
    // R0008: a time series with missing readings.
    let (toml, csv) = series();
    import(&desk, "series", &toml, &csv);
    typed(&desk);
    for run in ["R0003", "R0004", "R0005", "R0006", "R0007", "R0008", "R0009"] {
        desk.done(&["bench", "accept", run]);
    }
    desk
}

/// R0009: typed, with a point corrected and one struck. R0010: begun, without a point.
fn typed(desk: &Desk) {
    desk.write("typed.toml", of("CMF-0417", "2026-10-10"));
    desk.write("run.csv", readings());
    let run = read_run_with(&desk.folder.join("typed.toml"), &NoRegisters).unwrap().value;
    let mut salt = 0_u8;
    let mut salts = || {
        salt += 1;
        [salt; 16]
    };
    let at = DateTime::parse_from_rfc3339("2026-10-10T12:00:00+11:00").unwrap();
    let stamp = &mut Stamp { at, salt: &mut salts };
    let mut book = Book::open(&desk.book(), &Options::default()).unwrap();
    let number = book.begin_run(&run, stamp).unwrap().number;
    let Readings::Points(points) = &run.readings else { panic!("points") };
    let mut wrong = points[4];
    wrong.sweep = None;
    book.correct_point(number, 5, wrong, stamp).unwrap();
    book.strike_point(number, 2, "=misread", stamp).unwrap();
    book.finish_run(number, stamp).unwrap();
    book.begin_run(&ebbline::entry::Run { readings: Readings::Points(Vec::new()), ..run }, stamp).unwrap();
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

fn below(desk: &Desk, folder: &str, ending: &str) -> Vec<String> {
    let within = |path: &Path| path.strip_prefix(&desk.folder).unwrap().to_str().unwrap().to_owned();
    let all = files(&desk.folder.join(folder));
    all.iter()
        .map(|path| within(path))
        .filter(|path| path.ends_with(ending) && !path.contains("/earlier/"))
        .collect()
}

/// A fresh book made of the export in `folder`, as its README says.
fn taken_back(desk: &Desk, folder: &str, book: &str) {
    let call = |arguments: &[&str]| -> Said {
        let said = desk.call_on(book, arguments);
        assert_eq!(said.status, 0, "{arguments:?}: {said:?}");
        said
    };
    for (kind, command) in [
        ("acceptances", "acceptance"),
        ("orifices", "orifice"),
        ("instruments", "instrument"),
        ("first-stages", "first-stage"),
    ] {
        let files = below(desk, &format!("{folder}/{kind}"), ".toml");
        let mut all = vec![command, "add"];
        all.extend(files.iter().map(String::as_str));
        call(&all);
    }
    call(&["shop", "edit", &format!("{folder}/shop/shop.toml")]);
    let runs = below(desk, &format!("{folder}/runs"), ".toml");
    let mut all = vec!["bench", "import"];
    all.extend(runs.iter().map(String::as_str));
    call(&all);
    let judgements = desk.read(&format!("{folder}/judgements/judgements.csv"));
    for run in judgements.lines().skip(1).map(|line| line.split(',').next().unwrap()) {
        call(&["bench", "accept", run]);
    }
}

#[test]
fn a_fresh_book_made_of_an_export_gives_the_same_to_the_last_bit() {
    let desk = filled("export-round");
    let exported = desk.json(&["book", "export", "out"]);
    let forms: BTreeMap<&str, &str> = exported["runs"]
        .as_array()
        .unwrap()
        .iter()
        .map(|run| (run["run"].as_str().unwrap(), run["form"].as_str().unwrap()))
        .collect();
    let expected = [
        ("R0001", "original, points left out added"),
        ("R0002", "written"),
        ("R0003", "original"),
        ("R0004", "written"),
        ("R0005", "written"),
        ("R0006", "written"),
        ("R0007", "original"),
        ("R0008", "original"),
        ("R0009", "written"),
    ];
    assert_eq!(forms, BTreeMap::from(expected));
    assert!(exported["notes"].to_string().contains("R0010 is open and has no point yet"), "{exported}");
    // Originals are the bytes that came.
    for (run, name, csv) in [("R0003", "stands", "stands.csv"), ("R0008", "series", "series.csv")] {
        assert_eq!(desk.read(&format!("out/runs/{run}/{run}.toml")), desk.read(&format!("{name}.toml")));
        assert_eq!(desk.read(&format!("out/runs/{run}/{csv}")), desk.read(csv));
    }
    assert!(desk.read("out/runs/R0001/R0001.toml").starts_with(&desk.read("plain.toml")));
    taken_back(&desk, "out", "fresh.db");
    for (run, _) in expected {
        for arguments in [
            vec!["bench", "fit", run, "--json", "--at", "9.4 bar", "--for-flow", "0.4 L/min"],
            vec!["bench", "fit", run],
        ] {
            let (here, there) = (desk.call(&arguments), desk.call_on("fresh.db", &arguments));
            assert!(here.status < 2, "{run}: {here:?}");
            assert_eq!((here.stdout, here.status), (there.stdout, there.status), "{run}");
        }
    }
    for (command, id) in [
        ("acceptance", "SHOP-5"),
        ("orifice", "CMF-0417"),
        ("orifice", "孔板-7"),
        ("instrument", "FM-01"),
        ("instrument", "PT-01"),
        ("first-stage", "FS-01"),
    ] {
        let entry = |said: Said| serde_json::from_str::<Value>(&said.stdout).unwrap()["entry"].clone();
        let show = [command, "show", "--json", "--", id];
        let here = entry(desk.call(&show));
        assert!(here.is_object());
        assert_eq!(here, entry(desk.call_on("fresh.db", &show)), "{id}");
    }
    // An export of the fresh book says the same of runs and entries again.
    let said = desk.call_on("fresh.db", &["book", "export", "again"]);
    assert_eq!(said.status, 0, "{said:?}");
    for kind in ["acceptances", "orifices", "instruments", "first-stages"] {
        for name in below(&desk, &format!("out/{kind}"), ".toml") {
            assert_eq!(desk.read(&name), desk.read(&name.replacen("out/", "again/", 1)), "{name}");
        }
    }
}

#[test]
fn no_cell_of_an_export_is_anything_a_spreadsheet_runs() {
    let desk = filled("export-cells");
    desk.done(&["book", "export", "out", "--with-divers"]);
    let tables: Vec<PathBuf> = files(&desk.folder.join("out"))
        .into_iter()
        .filter(|path| path.extension().is_some_and(|e| e == "csv"))
        .collect();
    assert!(tables.len() >= 12, "{tables:?}");
    let mut cells = 0;
    for table in &tables {
        let text = std::fs::read_to_string(table).unwrap();
        for delimiter in [b',', b';', b'\t'] {
            let mut reader = csv::ReaderBuilder::new()
                .has_headers(false)
                .flexible(true)
                .delimiter(delimiter)
                .from_reader(text.as_bytes());
            for record in reader.records() {
                for cell in &record.unwrap() {
                    let cell = cell.trim();
                    let formula = cell.starts_with(['=', '+', '-', '@', '\t', '\r']);
                    let number = cell.split([',', ';']).all(|part| part.parse::<f64>().is_ok());
                    assert!(!formula || number, "{}: {cell:?}", table.display());
                    cells += 1;
                }
            }
        }
    }
    assert!(cells > 1000);
    // What a person typed is there all the same, as TOML.
    let texts: toml::Table = desk.read("out/judgements/texts.toml").parse().unwrap();
    assert_eq!(texts["judgement"][0]["by"].as_str(), Some("@A. Invented"));
    assert_eq!(texts["judgement"][0]["remark"].as_str(), Some("+1 \"for\" the record"));
    assert_eq!(texts["change"][0]["why"].as_str(), Some("=hose \"touched\", or so"));
    let changes = desk.read("out/judgements/changes.csv");
    assert!(changes.contains("R0009,1,") && changes.contains(",corrected,5,"), "{changes}");
    // The judgements are in the order they were made, the first of R0001 before the second.
    let judgements = desk.read("out/judgements/judgements.csv");
    let order: Vec<&str> = judgements.lines().skip(1).map(|line| &line[..7]).collect();
    assert_eq!(order[..3], ["R0001,1", "R0001,2", "R0002,1"], "{judgements}");
}

#[test]
fn divers_go_out_only_when_asked_for_and_the_book_notes_it() {
    let desk = filled("export-divers");
    desk.done(&["book", "export", "out"]);
    assert!(!desk.folder.join("out/divers").exists());
    for file in files(&desk.folder.join("out")) {
        assert!(
            !String::from_utf8_lossy(&std::fs::read(&file).unwrap()).contains("Halász"),
            "{}",
            file.display()
        );
    }
    assert_eq!(desk.json(&["book", "info"])["copies"], json!([]));
    desk.done(&["book", "export", "out", "--with-divers"]);
    assert!(desk.read("out/divers/D-07.toml").contains("Halász"));
    let copies = desk.json(&["book", "info"])["copies"].clone();
    assert_eq!(copies[0]["kind"], "export with divers");
    let forgotten = desk.json(&["diver", "forget", "D-07", "--why", "asked"]);
    assert_eq!(forgotten["copies"][0]["kind"], "export");
    assert!(forgotten["copies"][0]["place"].as_str().unwrap().ends_with("out"), "{forgotten}");
    desk.done(&["diver", "add", &fixture("diver")]);
    desk.done(&["book", "export", "out"]);
    assert!(!desk.folder.join("out/divers").exists());
}

#[test]
fn a_folder_is_replaced_only_when_all_of_it_is_an_earlier_export() {
    let desk = Desk::new("export-folder");
    desk.refused(&["book", "export", "out"], 2, "there is no book");
    assert!(!desk.folder.join("out").exists());
    desk.done(&["orifice", "add", "A", "--maker", "x"]);
    desk.write("mine/letter.txt", "dear");
    desk.refused(&["book", "export", "mine"], 2, "holds no earlier export");
    desk.refused(&["book", "export", "mine/letter.txt"], 2, "is no folder");
    std::fs::create_dir(desk.folder.join("empty")).unwrap();
    desk.done(&["book", "export", "empty"]);
    desk.done(&["orifice", "add", "B", "--maker", "x"]);
    desk.done(&["book", "export", "empty"]);
    assert!(desk.folder.join("empty/orifices/B.toml").exists());
    desk.write("empty/orifices/mine.toml", "mine");
    desk.refused(&["book", "export", "empty"], 2, "mine.toml");
    assert_eq!(desk.read("empty/orifices/mine.toml"), "mine");
    std::fs::remove_file(desk.folder.join("empty/orifices/mine.toml")).unwrap();
    desk.done(&["book", "export", "./empty/"]);
    // Nothing is left beside it.
    let left: Vec<String> = std::fs::read_dir(&desk.folder)
        .unwrap()
        .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
        .filter(|name| name.contains(".part") || name.contains(".old"))
        .collect();
    assert!(left.is_empty(), "{left:?}");
    assert_eq!(desk.read("mine/letter.txt"), "dear");
}

#[test]
fn every_revision_of_an_entry_and_each_logo_go_out() {
    let desk = filled("export-revisions");
    desk.done(&["book", "export", "out"]);
    assert!(desk.read("out/instruments/FM-01.toml").contains("FM-2027-001"));
    assert!(desk.read("out/instruments/earlier/FM-01.1.toml").contains("FM-2026-118"));
    assert!(desk.read("out/shop/shop.toml").contains("logo-2.svg"));
    assert_eq!(
        desk.read("out/shop/logo-2.svg"),
        std::fs::read_to_string(fixture("logo").replace(".toml", ".svg")).unwrap()
    );
    let entries: toml::Table = desk.read("out/entries.toml").parse().unwrap();
    let entries = entries["entry"].as_array().unwrap();
    let nul = entries.iter().find(|entry| entry["id"].as_str() == Some("nul")).unwrap();
    assert_eq!(nul["file"].as_str(), Some("orifices/_nul.toml"));
    assert!(desk.read("out/orifices/_nul.toml").contains("id = \"nul\""));
    let about: toml::Table = desk.read("out/book.toml").parse().unwrap();
    assert_eq!(about["head"].as_str(), desk.json(&["book", "info"])["head"].as_str());
    let readme = desk.read("out/README.txt");
    assert!(
        readme.contains("bench import runs/*/*.toml") && readme.contains(about["head"].as_str().unwrap()),
        "{readme}"
    );
    assert!(readme.lines().all(|line| line.chars().count() <= 80), "{readme}");
}
