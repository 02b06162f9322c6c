//! The sheet as PDF from outside: its numbers are those of the document, it is one page or says where the rest is, nothing that
//! warns is left out, and no name breaks it.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::Write as _;
use std::process::Command;

use ebbline::certificate::paper::read;
use ebbline::report::cautions;
use serde_json::Value;

use crate::couch::{ON, SHARE, small_file, write_orifice, write_run_of, write_three};
use crate::desk::{Desk, fixture};

const SESSIONS: [&str; 6] =
    ["--session", "couch-1.toml", "--session", "couch-2.toml", "--session", "couch-3.toml"];
/// What a careful diver says, so that little is left to warn of.
const CAREFUL: [&str; 8] = [
    "--gauge-error",
    "0.2 bar",
    "--ip-spread",
    "0.2 bar",
    "--ip-repeat",
    "0.1 bar",
    "--water-temperature",
    "16 °C ± 4 °C",
];

fn desk(name: &str) -> Desk {
    let desk = Desk::new(name);
    write_orifice(&desk, "small", "small", SHARE);
    write_three(&desk, &small_file());
    desk.done(&["instrument", "add", &fixture("lines")]);
    desk.done(&["first-stage", "add", &fixture("first_stage")]);
    desk
}

fn asked<'a>(orifice: &'a str, more: &[&'a str]) -> Vec<&'a str> {
    [&["setting", "--orifice", orifice], SESSIONS.as_slice(), &ON, more].concat()
}

/// The bytes of a sheet, and how many pages it has by our own reader.
#[track_caller]
fn made(desk: &Desk, arguments: &[&str], name: &str, status: i32) -> (Vec<u8>, usize) {
    let said = desk.call(&[arguments, &["--sheet", name]].concat());
    assert_eq!(said.status, status, "{said:?}");
    let bytes = std::fs::read(desk.folder.join(name)).unwrap();
    let pages = read::read(&bytes).unwrap().pages.len();
    (bytes, pages)
}

/// Page by page what poppler reads, without white space and signs of dashes; nothing where it is not installed.
fn read_by_others(desk: &Desk, name: &str) -> Option<Vec<String>> {
    let output = match Command::new("pdftotext").arg("-raw").arg(desk.folder.join(name)).arg("-").output() {
        Ok(output) => output,
        Err(e) if e.kind() == std::io::ErrorKind::NotFound => {
            assert!(std::env::var_os("EBBLINE_PDF_TOOLS").is_none(), "pdftotext is not installed");
            // Past the capture of the test harness, which would swallow it.
            let said =
                "NOT RUN: pdftotext is not installed (package poppler-utils); the sheet was not read back\n";
            std::io::stderr().write_all(said.as_bytes()).unwrap();
            return None;
        }
        Err(e) => panic!("{e}"),
    };
    assert!(output.status.success(), "{output:?}");
    let text = String::from_utf8(output.stdout).unwrap();
    Some(text.split('\u{c}').filter(|page| !page.trim().is_empty()).map(letters).collect())
}

fn letters(text: &str) -> String {
    text.chars().filter(|c| !c.is_whitespace()).collect()
}

#[track_caller]
fn holds(text: &str, what: &str) {
    assert!(text.contains(&letters(what)), "no {what:?} in {text}");
}

fn number(json: &Value, keys: &[&str]) -> f64 {
    let found = keys.iter().fold(json, |value, key| &value[key]);
    found.as_f64().unwrap_or_else(|| panic!("{keys:?}: {json}"))
}

/// Rounded down to whole units, as depths are.
fn whole(value: f64) -> String {
    format!("{:.0}", (value + 1e-6).floor())
}

#[test]
fn the_numbers_of_the_sheet_are_those_of_the_document() {
    let desk = desk("sheet-numbers");
    let more = [&["--meter", "FM-01", "--first-stage", "FS-01"], &CAREFUL[..]].concat();
    let call = asked("small.toml", &more);
    let json = desk.json(&call);
    for (paper, name) in [("a5", "a5.pdf"), ("a4", "a4.pdf")] {
        let (_, pages) = made(&desk, &[&call[..], &["--paper", paper]].concat(), name, 0);
        let Some(read) = read_by_others(&desk, name) else { return };
        let text = read.concat();
        // These sessions leave much unsaid, and every warning of that is there: one page, or a sentence on the first.
        assert_eq!(
            (read.len(), read[0].contains(&letters("Continued overleaf"))),
            (pages, pages > 1),
            "{paper}"
        );
        let set = &json["recommended"];
        let ip = number(set, &["ip_bar_gauge"]);
        holds(&text, &format!("SET {ip:.1} bar {} psi, gauge", whole(number(set, &["ip_psi_gauge"]))));
        holds(&text, &format!("NEVER EXCEED {:.1} bar", number(&json, &["never_exceed_ip_bar_gauge"])));
        // U at k = 2 has two digits, rounded up where that would lower it by over a twentieth; the value ends where it does.
        let (value, u) = (number(set, &["injection_l_min"]), number(set, &["injection_u"]));
        let after = text.split("INJECTS").nth(1).unwrap();
        let shown: String = after.chars().take_while(|c| c.is_ascii_digit() || *c == '.').collect();
        let place = 0.5 * 10f64.powi(-(shown.split_once('.').unwrap().1.len() as i32));
        assert!((shown.parse::<f64>().unwrap() - value).abs() <= place + 1e-9, "{shown}, {value}");
        let after_u = after.split('±').nth(1).unwrap();
        let shown_u: String = after_u.chars().take_while(|c| c.is_ascii_digit() || *c == '.').collect();
        let ratio = shown_u.parse::<f64>().unwrap() / (2.0 * u);
        assert!((0.95..1.2).contains(&ratio), "{shown_u}, {u}");
        for (key, says) in [
            ("one_percent_at_m", "1 % of the flow lost"),
            ("nine_tenths_at_m", "a tenth lost"),
            ("stops_at_m", "flow stops"),
        ] {
            holds(&text, &format!("{says} {}", whole(number(&json, &["depth", key]))));
        }
        let patency = &json["patency"];
        for key in ["from_bar", "to_bar"] {
            holds(&text, &format!("{} bar", whole(number(patency, &[key]))));
        }
        holds(&text, &format!("takes {:.0} s", number(patency, &["seconds"])));
        let reading = &json["expected_reading"];
        holds(&text, reading["meter"].as_str().unwrap());
        holds(&text, &format!("{:.3} L/min, proved by", number(reading, &["value"])));
        let row = json["table"]
            .as_array()
            .unwrap()
            .iter()
            .find(|row| (number(row, &["ip_bar_gauge"]) - ip).abs() < 1e-9)
            .unwrap();
        let minutes = number(row, &["minutes_high_to_low"]);
        holds(&text, &format!("1.3 to 0.7 bar in {} min", whole(minutes)));
        holds(&text, "revision 1");
        holds(&text, "holds on 2026-12-01");
        holds(&text, "orifice small");
        holds(&text, "D-07");
        assert_all_that_warns(&text, &json);
    }
}

/// Every caution and every warning of the document is on the sheet.
#[track_caller]
fn assert_all_that_warns(text: &str, json: &Value) {
    for caution in cautions::SETTING {
        holds(text, caution);
    }
    let own: &[&str] = if json["depth"]["first_stage"] == "compensated" {
        &[cautions::SETTING_COMPENSATED]
    } else {
        &cautions::SETTING_UNCOMPENSATED
    };
    for caution in own {
        holds(text, caution);
    }
    for warning in json["warnings"].as_array().unwrap() {
        holds(text, warning.as_str().unwrap());
    }
}

#[test]
fn the_same_setting_gives_the_same_bytes_and_a4_is_another_paper() {
    let desk = desk("sheet-bytes");
    let call = asked("small.toml", &CAREFUL);
    let (first, _) = made(&desk, &call, "first.pdf", 0);
    assert_eq!(first, made(&desk, &call, "second.pdf", 0).0);
    assert_eq!(first, made(&desk, &[&call[..], &["--paper", "a5"]].concat(), "third.pdf", 0).0);
    assert_ne!(first, made(&desk, &[&call[..], &["--paper", "a4"]].concat(), "a4.pdf", 0).0);
}

#[test]
fn what_does_not_fit_stands_overleaf_and_the_first_page_says_so() {
    let desk = desk("sheet-worst");
    write_run_of(&desk, "bare", SHARE, |toml| {
        let id = "\"LONG-orifice_name.of-32-letters\"";
        let kept = toml.split("[acceptance]").next().unwrap_or_default();
        kept.replace("\"CMF-0417\"", id)
    });
    let why = "the shop is closed until spring and the customer dives the day after tomorrow, ".repeat(4);
    let worst = ["--first-stage", "compensated", "--max-depth", "6 m", "--ip", "5 bar", "--despite", &why];
    let call = asked("bare.toml", &worst);
    let said = desk.call(&[&["--json"], &call[..]].concat());
    let json: Value = serde_json::from_str(&said.stdout).unwrap();
    assert!(json["warnings"].as_array().unwrap().len() > 4, "{json}");
    for paper in ["a5", "a4"] {
        let name = format!("{paper}.pdf");
        let (_, pages) = made(&desk, &[&call[..], &["--paper", paper]].concat(), &name, said.status);
        assert_eq!(pages, 2, "{paper}");
        let Some(read) = read_by_others(&desk, &name) else { return };
        let [first, second] = read.as_slice() else { panic!("{read:?}") };
        holds(first, "Continued overleaf");
        holds(first, "NEVER EXCEED");
        let both = format!("{first}{second}");
        assert_all_that_warns(&both, &json);
        holds(&both, why.trim());
        // What stands overleaf is named.
        let named = if second.contains("Cautions") { "cautions" } else { "warnings" };
        holds(first, named);
    }
}

#[test]
fn a_hostile_name_is_text_and_the_sheet_is_made() {
    let desk = desk("sheet-hostile");
    let why = "</text><script>alert(1)</script> &amp; 漢";
    let (_, pages) =
        made(&desk, &asked("small.toml", &[&CAREFUL[..], &["--despite", why]].concat()), "sheet.pdf", 0);
    assert!(pages <= 2);
    let Some(read) = read_by_others(&desk, "sheet.pdf") else { return };
    let text = read.concat();
    holds(&text, "</text><script>alert(1)</script> &amp; <U+6F22>");
}

#[test]
fn without_a_setting_the_sheet_says_so_and_names_no_ip() {
    let desk = desk("sheet-none");
    write_orifice(&desk, "large", "large", 2.0);
    let (_, pages) = made(&desk, &asked("large.toml", &CAREFUL), "none.pdf", 1);
    assert_eq!(pages, 1);
    let Some(read) = read_by_others(&desk, "none.pdf") else { return };
    let text = read.concat();
    holds(&text, "No setting");
    holds(&text, "too large");
    assert!(!text.contains("SET") && !text.contains("psi,gauge"), "{text}");
}

#[test]
fn an_ending_or_a_paper_that_fits_nothing_is_refused_before_anything_is_written() {
    let desk = desk("sheet-refused");
    for name in ["sheet.doc", "sheet", "sheet.svg"] {
        desk.refused(&asked("small.toml", &["--sheet", name]), 2, ".pdf or .txt");
        assert!(!desk.folder.join(name).exists());
    }
    desk.refused(&asked("small.toml", &["--paper", "a4"]), 2, "--sheet FILE.pdf");
    desk.refused(&asked("small.toml", &["--paper", "a4", "--sheet", "sheet.txt"]), 2, "--sheet FILE.pdf");
    assert!(!desk.folder.join("sheet.txt").exists());
    desk.refused(&asked("small.toml", &["--paper", "a3", "--sheet", "sheet.pdf"]), 2, "a5");
    desk.refused(&asked("small.toml", &["--sheet", "no/such/sheet.pdf"]), 3, "sheet.pdf");
}
