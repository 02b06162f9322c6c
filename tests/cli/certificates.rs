//! `certificate` as its users see it: from a run file to a PDF and an XML, amended, listed, shown, and checked anywhere.

#![allow(clippy::unwrap_used, reason = "a test may panic")]

use std::collections::BTreeSet;
use std::process::{Command, Stdio};

use crate::bench_files::{RUN, readings};
use crate::desk::{Desk, Said};
use serde_json::{Value, json};

const SHOP: &str = "record = \"shop\"\nname = \"Harbour Orifice Works\"\n\
    address = \"\"\"\n1 Slip Road\n7000 Hobart\nAU\"\"\"\nsignatories = [\"I. Varga\"]\n";

fn orifice(id: &str) -> String {
    format!(
        "record = \"orifice\"\nid = \"{id}\"\ndescription = \"restrictor of a left-hand block\"\n\
         serial = \"{id}-77\"\nbuild = \"short tube\"\ncustomer = \"Reef School, 12 Bay Road, 4870 Cairns\"\n"
    )
}

/// A shop with an orifice; runs are dated so that no clock is behind them.
fn shop(name: &str) -> Desk {
    let desk = Desk::new(name);
    desk.write("shop.toml", SHOP);
    desk.write("orifice.toml", orifice("A"));
    desk.done(&["shop", "edit", "shop.toml"]);
    desk.done(&["orifice", "add", "orifice.toml"]);
    desk
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

fn judged(desk: &Desk, orifice: &str, day: &str, purpose: &str, share: f64) -> String {
    let run = imported(desk, orifice, day, purpose, share);
    desk.done(&["bench", "accept", &run]);
    run
}

fn bytes(desk: &Desk, name: &str) -> Vec<u8> {
    std::fs::read(desk.folder.join(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
}

fn check(desk: &Desk, book: &str, file: &str) -> (Said, Value) {
    let said = desk.call_on(book, &["certificate", "check", file, "--json"]);
    let json = serde_json::from_str(&said.stdout).unwrap_or(Value::Null);
    (said, json)
}

fn records(desk: &Desk) -> u64 {
    desk.json(&["book", "info"])["records"].as_u64().unwrap()
}

#[test]
fn a_run_is_certified_listed_shown_checked_and_amended() {
    let desk = shop("certificate-way");
    assert!(desk.done(&["certificate", "list"]).contains("No certificates"));
    let found = judged(&desk, "A", "2025-06-02", "as-found", 0.85);
    let left = judged(&desk, "A", "2025-06-03", "as-left", 1.0);
    let work = ["--as-found", &found, "--work", "cleaned"];
    // A look first: nothing is written and no number used.
    let before = records(&desk);
    let look = desk.done(&[&["certificate", "issue", &left, "--look"], &work[..]].concat());
    assert!(look.contains("Reef School") && look.contains("cleaned"), "{look}");
    assert_eq!(records(&desk), before);
    let issued = desk.json(&[&["certificate", "issue", &left, "--into", "out"], &work[..]].concat());
    let number = issued["number"].as_str().unwrap();
    let year = &issued["issued"].as_str().unwrap()[..4];
    assert_eq!(number, format!("{year}-0001"));
    assert_eq!(
        (&issued["new"], &issued["verdict"], &issued["as_found"]),
        (&json!(true), &json!("pass"), &json!(found))
    );
    assert!(issued["issued"].as_str().unwrap().ends_with("+11:00"), "the offset of the bench: {issued}");
    let (pdf, xml) = (format!("out/{number}.pdf"), format!("out/{number}.xml"));
    assert!(bytes(&desk, &pdf).starts_with(b"%PDF-") && desk.read(&xml).contains(number));
    assert_eq!(issued["files"], json!([pdf, xml]));
    let [first_pdf, first_xml] = [&pdf, &xml].map(|file| bytes(&desk, file));

    // The same again, also by its number and on no other terms.
    let count = records(&desk);
    for named in [left.as_str(), number] {
        let again = desk.json(&["certificate", "issue", named, "--into", "again"]);
        assert_eq!((&again["number"], &again["new"]), (&json!(number), &json!(false)));
        assert_eq!(again["pdf"]["sha256"], issued["pdf"]["sha256"]);
        assert_eq!(bytes(&desk, &format!("again/{number}.pdf")), first_pdf);
        assert_eq!(bytes(&desk, &format!("again/{number}.xml")), first_xml);
    }
    let others: [&[&str]; 3] = [&["--paper", "letter"], &["--remark", "x"], &["--as-found", &left]];
    for option in others {
        let call = [&["certificate", "issue", &left, "--into", "other"], option].concat();
        desk.refused(&call, 2, "issued with another");
    }
    assert!(!desk.folder.join("other").exists());
    assert_eq!(records(&desk), count);

    let list = desk.json(&["certificate", "list"]);
    assert_eq!(
        (&list[0]["number"], &list[0]["state"], &list[0]["run"]),
        (&json!(number), &json!("issued"), &json!(left))
    );
    let shown = desk.done(&["certificate", "show", number]);
    for text in
        ["Harbour Orifice Works", "I. Varga", "PASS", "A-77", "As found, before the work", "FM-2026-118"]
    {
        assert!(shown.contains(text), "{text}: {shown}");
    }

    // It holds here, and in a folder without a book, where none is made.
    for file in [&pdf, &xml] {
        let (said, json) = check(&desk, "book.db", file);
        assert_eq!(
            (said.status, &json["holds"], &json["issued_here"]),
            (0, &json!(true), &json!(true)),
            "{said:?}"
        );
        assert_eq!(json["findings"], json!([]));
        let (said, json) = check(&desk, "none.db", file);
        assert_eq!((said.status, &json["holds"], &json["issued_here"]), (0, &json!(true), &Value::Null));
        let text = desk.call_on("none.db", &["certificate", "check", file]).stdout;
        assert!(text.contains("HOLDS") && text.contains("not genuine"), "{text}");
    }
    assert!(!desk.folder.join("none.db").exists());

    // The customer was wrong.
    desk.done(&["orifice", "edit", "A", "--customer", "Reef School, 14 Bay Road, 4870 Cairns"]);
    desk.refused(&["certificate", "amend", number, "--why", " "], 2, "--why");
    desk.refused(
        &["certificate", "amend", "1999-0001", "--why", "x"],
        2,
        "there is no certificate 1999-0001",
    );
    let amended = desk.json(&[
        "certificate",
        "amend",
        number,
        "--why",
        "wrong house number",
        "--replace",
        "--into",
        "out",
    ]);
    let second = amended["number"].as_str().unwrap();
    assert_eq!(second, format!("{year}-0002"));
    assert_eq!((&amended["amends"], &amended["changed"]), (&json!(number), &json!("the customer")));
    let text = desk.done(&["certificate", "show", second]);
    assert!(
        text.contains(number) && text.contains("wrong house number") && text.contains("14 Bay Road"),
        "{text}"
    );
    desk.refused(&["certificate", "amend", number, "--why", "again"], 2, "is amended by");
    // The first stays, and says that it was replaced.
    let (_, json) = check(&desk, "book.db", &pdf);
    assert_eq!((&json["holds"], &json["amended_by"]), (&json!(true), &json!(second)));
    assert_eq!(desk.json(&["certificate", "issue", number, "--into", "again"])["amended_by"], second);
    assert_eq!(desk.json(&["certificate", "issue", &left, "--into", "again"])["number"], second);
    let list = desk.done(&["certificate", "list"]);
    assert!(list.contains(&format!("replaced by {second}")), "{list}");
    assert_eq!(desk.json(&["book", "check"])["holds"], true);
    desk.done(&["book", "export", "export"]);
    let exported = desk.read("export/certificates.toml");
    assert!(
        exported.contains(&format!("number = \"{number}\"")) && exported.contains("wrong house number"),
        "{exported}"
    );
}

#[test]
fn everything_that_is_missing_is_said_at_once_and_uses_no_number() {
    let desk = Desk::new("certificate-missing");
    desk.refused(&["certificate", "list"], 2, "there is no book");
    desk.refused(&["certificate", "issue", "R0001"], 2, "there is no book");
    let run = imported(&desk, "A", "2025-06-02", "acceptance", 1.0);
    desk.refused(&["certificate", "issue", &run], 2, "is not judged yet");
    desk.refused(&["certificate", "issue", "R0007"], 2, "there is no run R0007");
    desk.refused(&["certificate", "issue", "nothing"], 2, "neither a run");
    desk.done(&["bench", "accept", &run]);
    desk.refused(&["certificate", "issue", &run], 2, "nothing is said of the shop");
    desk.done(&["shop", "edit", "--name", "S", "--address", "1 Slip Road"]);
    let before = records(&desk);
    let said = desk.call(&["certificate", "issue", &run, "--into", "out"]);
    assert_eq!((said.status, said.stdout.as_str()), (2, ""), "{said:?}");
    for missing in
        ["country of the shop", "signatory", "customer", "address of the customer", "description", "serial"]
    {
        assert!(said.stderr.contains(missing), "{missing}: {}", said.stderr);
    }
    assert!(!desk.folder.join("out").exists());
    assert_eq!(records(&desk), before);
    // A run that changed since it was judged, and runs as found that are none.
    let desk = shop("certificate-runs");
    let first = judged(&desk, "A", "2025-06-02", "acceptance", 1.0);
    let other = judged(&desk, "B", "2025-06-01", "as-found", 0.9);
    let later = judged(&desk, "A", "2025-06-05", "check", 1.0);
    for (found, why) in [(&other, "is of orifice B"), (&later, "not taken before"), (&first, "the same run")]
    {
        desk.refused(&["certificate", "issue", &first, "--as-found", found, "--work", "x"], 2, why);
    }
    desk.refused(&["certificate", "issue", &first, "--by", "X. Stranger"], 2, "may sign for the shop");
    desk.refused(&["certificate", "issue", &first, "--received", "soon"], 2, "2026-11-10");
    desk.done(&["bench", "leave-out", &first, "3", "--why", "hose touched"]);
    desk.refused(&["certificate", "issue", &first], 2, "otherwise than it was judged");
    desk.done(&["bench", "accept", &first]);
    // A failed run has its certificate, and it says so.
    let failed = judged(&desk, "A", "2025-06-09", "check", 0.7);
    let issued = desk.json(&["certificate", "issue", &failed]);
    assert_eq!(issued["verdict"], "fail");
    // What was issued does not move with what is left out or edited later.
    let number = issued["number"].as_str().unwrap().to_owned();
    let pdf = bytes(&desk, &format!("{number}.pdf"));
    desk.done(&["bench", "leave-out", &failed, "2", "--why", "hose touched"]);
    desk.done(&["orifice", "edit", "A", "--description", "another"]);
    desk.done(&["shop", "edit", "--name", "Another shop"]);
    desk.done(&["certificate", "issue", &failed, "--into", "again"]);
    assert_eq!(bytes(&desk, &format!("again/{number}.pdf")), pdf);
}

#[test]
fn a_number_whose_files_were_not_written_is_finished_by_issuing_again() {
    let desk = shop("certificate-killed");
    let run = judged(&desk, "A", "2025-06-02", "acceptance", 1.0);
    // A file in the place of the folder is seen before a number is used.
    desk.write("file", "x");
    desk.refused(&["certificate", "issue", &run, "--into", "file"], 3, "cannot be written");
    assert_eq!(desk.json(&["certificate", "list"]), json!([]));
    // A folder in the place of the PDF is not: the number is given and nothing written.
    let number = {
        let look = desk.done(&["certificate", "issue", &run, "--look"]);
        let end = look.lines().rev().find(|line| line.contains("End of certificate")).unwrap().to_owned();
        end.split_whitespace().find(|word| word.ends_with("-0001")).unwrap().to_owned()
    };
    std::fs::create_dir_all(desk.folder.join(format!("out/{number}.pdf/in the way"))).unwrap();
    desk.refused(&["certificate", "issue", &run, "--into", "out"], 3, "cannot be written");
    let list = desk.json(&["certificate", "list"]);
    assert_eq!((&list[0]["number"], &list[0]["files_written"]), (&json!(number), &json!(false)));
    assert!(list[0]["state"].as_str().unwrap().contains("not written"), "{list}");
    std::fs::remove_dir_all(desk.folder.join("out")).unwrap();
    let issued = desk.json(&["certificate", "issue", &run, "--into", "out"]);
    assert_eq!(issued["number"], number);
    assert_eq!(desk.json(&["certificate", "list"])[0]["state"], "issued");
    // A file of that name that is another stays.
    desk.write(&format!("else/{number}.pdf"), "mine");
    desk.refused(&["certificate", "issue", &run, "--into", "else"], 2, "is another file");
    assert_eq!(desk.read(&format!("else/{number}.pdf")), "mine");
}

#[test]
fn eight_processes_issue_five_certificates_each_and_no_number_is_given_twice() {
    let desk = shop("certificate-crowd");
    let runs: Vec<String> = (0..40)
        .map(|i| judged(&desk, "A", &format!("2025-{:02}-{:02}", 1 + i / 28, 1 + i % 28), "check", 1.0))
        .collect();
    let script = |runs: &[String]| {
        let mut children = Vec::new();
        for part in runs.chunks(5) {
            let (part, folder) = (part.to_vec(), desk.folder.clone());
            children.push(std::thread::spawn(move || {
                for run in part {
                    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
                    command.current_dir(&folder).args(["--book", "book.db", "certificate", "issue", &run]);
                    command.args(["--into", "out"]).stdin(Stdio::null());
                    let output = command.output().unwrap();
                    assert!(output.status.success(), "{output:?}");
                }
            }));
        }
        children.into_iter().for_each(|child| child.join().unwrap());
    };
    script(&runs);
    let list = desk.json(&["certificate", "list", "--all"]);
    let of = |key: &str| -> BTreeSet<String> {
        list.as_array().unwrap().iter().map(|one| one[key].as_str().unwrap().to_owned()).collect()
    };
    assert_eq!((of("number").len(), of("run").len(), of("pdf_sha256").len()), (40, 40, 40));
    assert!(of("number").last().unwrap().ends_with("-0040"), "{list}");
    assert_eq!(std::fs::read_dir(desk.folder.join("out")).unwrap().count(), 80);
    assert_eq!(desk.json(&["book", "check"])["holds"], true);
    // One run issued by all at once is one certificate.
    let one = judged(&desk, "A", "2025-07-01", "check", 1.0);
    script(&vec![one; 8]);
    assert_eq!(desk.json(&["certificate", "list", "--all"]).as_array().unwrap().len(), 41);
}

#[test]
fn what_was_changed_does_not_hold_and_what_is_no_certificate_is_refused() {
    let desk = shop("certificate-changed");
    let run = judged(&desk, "A", "2025-06-02", "acceptance", 1.0);
    let issued = desk.json(&["certificate", "issue", &run]);
    let number = issued["number"].as_str().unwrap();
    let xml = desk.read(&format!("{number}.xml"));
    // A printed number: 0.48… L/min becomes 0.58….
    let flow = desk.json(&["bench", "show", &run])["judgements"][0]["flow_l_min"].as_f64();
    let flow = flow.unwrap_or_else(|| desk.json(&["bench", "list"])[0]["flow_l_min"].as_f64().unwrap());
    let printed = format!("{flow:.4}");
    let changed = format!("{:.4}", flow + 0.1);
    assert!(xml.contains(&printed), "{printed}");
    desk.write("changed.xml", xml.replace(&printed, &changed));
    let (said, json) = check(&desk, "none.db", "changed.xml");
    assert_eq!((said.status, &json["holds"]), (1, &json!(false)), "{said:?}");
    assert!(said.stderr.contains("DOES NOT HOLD"), "{said:?}");
    let findings = json["findings"].as_array().unwrap();
    let named = findings.iter().any(|f| f["printed"] == json!(changed) && f["recomputed"] == json!(printed));
    assert!(named, "{json}");
    // Consistent with itself, of another customer, and not what was issued here.
    let forged = shop("certificate-forged");
    forged.done(&["orifice", "edit", "A", "--customer", "Somebody Else, 1 Road"]);
    let other = judged(&forged, "A", "2025-06-02", "acceptance", 1.0);
    forged.done(&["certificate", "issue", &other]);
    for ending in ["pdf", "xml"] {
        let file = format!("forged.{ending}");
        desk.write(&file, bytes(&forged, &format!("{number}.{ending}")));
        let (_, json) = check(&desk, "none.db", &file);
        assert_eq!((&json["holds"], &json["issued_here"]), (&json!(true), &Value::Null));
        let (said, json) = check(&desk, "book.db", &file);
        assert_eq!(
            (said.status, &json["holds"], &json["issued_here"]),
            (1, &json!(false), &json!(false)),
            "{said:?}"
        );
        assert!(
            json["findings"][0]["says"].as_str().unwrap().contains("another file under this number"),
            "{json}"
        );
    }
    // A number that was never given, under the name of this shop.
    desk.done(&["shop", "edit", "--number-pattern", "X{n}"]);
    let unknown = shop("certificate-unknown");
    unknown.done(&["shop", "edit", "--number-pattern", "HOW-{n}"]);
    let run = judged(&unknown, "A", "2025-06-02", "acceptance", 1.0);
    unknown.done(&["certificate", "issue", &run]);
    desk.write("unknown.xml", bytes(&unknown, "HOW-1.xml"));
    let (said, json) = check(&desk, "book.db", "unknown.xml");
    assert_eq!(
        (said.status, &json["holds"], &json["issued_here"]),
        (0, &json!(true), &Value::Null),
        "{said:?}"
    );
    assert!(json["book_says"].as_str().unwrap().contains("bears the name of its shop"), "{json}");
    // A PDF with one byte changed behind its end.
    let mut pdf = bytes(&desk, &format!("{number}.pdf"));
    pdf.extend_from_slice(b"\n% more\n");
    desk.write("longer.pdf", &pdf);
    assert_eq!(check(&desk, "none.db", "longer.pdf").0.status, 1);
    // No certificates.
    desk.write("short.pdf", &pdf[..pdf.len() / 2]);
    desk.write("text.pdf", "a text");
    desk.write("empty.xml", "");
    desk.write("strange.xml", "<a/>");
    for file in ["short.pdf", "text.pdf", "empty.xml", "strange.xml", "nowhere.xml", "."] {
        let said = desk.call_on("none.db", &["certificate", "check", file]);
        assert_eq!((said.status, said.stdout.as_str()), (2, ""), "{file}: {said:?}");
        assert_eq!(said.stderr.lines().count(), 1, "{file}: {said:?}");
    }
    let large = std::fs::File::create(desk.folder.join("large.pdf")).unwrap();
    large.set_len(65 << 20).unwrap();
    desk.refused(&["certificate", "check", "large.pdf"], 2, "at most 64 MB");
}

#[test]
fn hostile_texts_stay_text() {
    let desk = shop("certificate-hostile");
    let long = format!("{}; 12 Bay Road", "Zwölf Müller & Söhne <b>Ω</b> ".repeat(360).trim());
    assert!(long.len() > 10_000);
    let run = judged(&desk, "A", "2025-06-02", "acceptance", 1.0);
    let issued = desk.json(&[
        "certificate",
        "issue",
        &run,
        "--customer",
        &long,
        "--paper",
        "letter",
        "--remark",
        "</dcc:name><x>&amp;\"]]>",
        "--place",
        "../../etc; $(reboot)",
    ]);
    let number = issued["number"].as_str().unwrap();
    for ending in ["pdf", "xml"] {
        let (said, json) = check(&desk, "book.db", &format!("{number}.{ending}"));
        assert_eq!((said.status, &json["issued_here"]), (0, &json!(true)), "{said:?}");
    }
    let hidden = ["certificate", "issue", &run, "--remark", "a\u{202E}b"];
    desk.refused(&hidden, 2, "visible characters");
    // A character no bundled font has is named.
    let run = judged(&desk, "A", "2025-06-03", "check", 1.0);
    desk.refused(&["certificate", "issue", &run, "--remark", "孔板"], 2, "孔");
    // Numbers in any script make file names any system takes.
    desk.done(&["shop", "edit", "--number-pattern", "Ünit.Ω_{n:3}"]);
    let issued = desk.json(&["certificate", "issue", &run, "--into", "out"]);
    assert_eq!(issued["number"], "Ünit.Ω_002");
    let file = issued["files"][0].as_str().unwrap();
    assert!(file.is_ascii() && desk.folder.join(file).exists(), "{file}");
    assert_eq!(check(&desk, "book.db", file).1["issued_here"], json!(true));
    desk.done(&["certificate", "show", "üNIT.ω_002"]);
}
