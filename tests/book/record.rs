//! The bench run file: what is read as if nothing were odd, what is refused and in which words, and the way back.
//!
//! All files are invented (`fixtures/runs`). A refusal is compared whole: its words are what a person at the bench reads.

#![allow(clippy::unwrap_used, reason = "a test that cannot read its own files fails")]
#![allow(clippy::float_cmp, reason = "what is read must be the very double that was written")]

use std::io::{Cursor, Read};
use std::path::Path;

use ebbline::entry::{
    Acceptance, Id, Indication, Meter, MeterKind, PointReading, Purity, Purpose, Readings, Run, Sweep,
    Tolerance, Transducer,
};
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, StpdFlow, Temperature, presets_listed,
};
use ebbline::record::{
    DEFAULT_PURITY, Fault, Loaded, NoRegisters, Note, RecordError, Refusal, Registers, parse_run,
    parse_run_with, read_run, write_run,
};
use proptest::prelude::*;

const POINTS: &str = include_str!("../../fixtures/runs/points.toml");
const POINTS_CSV: &str = include_str!("../../fixtures/runs/points.csv");
const SERIES: &str = include_str!("../../fixtures/runs/series.toml");
const SERIES_CSV: &str = include_str!("../../fixtures/runs/series.csv");
const TIMED: &str = include_str!("../../fixtures/runs/timed.toml");
const TIMED_CSV: &str = include_str!("../../fixtures/runs/timed.csv");
const FLOAT: &str = include_str!("../../fixtures/runs/float.toml");
const FLOAT_CSV: &str = include_str!("../../fixtures/runs/float.csv");

fn parse(toml: &str, csv: &[u8]) -> Result<Loaded<Run>, RecordError> {
    let csv = csv.to_vec();
    parse_run(toml, "run.toml", &mut |_| Ok(Box::new(Cursor::new(csv.clone()))))
}

fn run(toml: &str, csv: &str) -> Run {
    parse(toml, csv.as_bytes()).unwrap().value
}

/// `text` with one piece replaced; the piece must be there, once.
fn with(text: &str, old: &str, new: &str) -> String {
    assert_eq!(text.matches(old).count(), 1, "{old:?} stands once in the fixture");
    text.replacen(old, new, 1)
}

fn refusal(toml: &str, csv: &str) -> String {
    match parse(toml, csv.as_bytes()) {
        Err(error) => error.to_string(),
        Ok(_) => panic!("taken:\n{toml}\n{csv}"),
    }
}

#[test]
fn a_points_file_is_read_as_it_stands() {
    let loaded = read_run(Path::new("fixtures/runs/points.toml")).unwrap();
    assert_eq!(loaded.notes, []);
    let run = loaded.value;
    assert_eq!(run, self::run(POINTS, POINTS_CSV));
    assert_eq!(run.orifice.as_str(), "CMF-0417");
    assert_eq!(run.purpose, Purpose::Acceptance);
    assert_eq!(run.taken.to_rfc3339(), "2026-11-12T09:40:00+11:00");
    assert_eq!(run.technician.as_deref(), Some("I. Varga"));
    assert_eq!(run.conditions.barometer.value, None);
    assert_eq!(run.conditions.barometer.expanded.map(|u| u.as_pa()), Some(100.0));
    assert_eq!(run.before.leak_pa_s, Some(0.002e5 / 60.0));
    assert_eq!(run.after.zero, Some(IndicatedFlow::from_l_min(-0.0001)));
    assert_eq!(run.meter.papers.coverage, 2.0);
    let acceptance = run.acceptance.unwrap();
    assert_eq!(acceptance.ip, GaugePressure::from_bar(10.0));
    assert_eq!(acceptance.flow, StpdFlow::from_l_min(0.48));
    assert_eq!(acceptance.tolerance, Tolerance::Relative(0.05));
    assert_eq!((run.left_out[0].point, run.left_out.len()), (7, 1));
    let Readings::Points(points) = run.readings else { panic!("points") };
    assert_eq!(points.len(), 10);
    assert_eq!(points[0].pressure, Indication::Gauge(GaugePressure::from_pa(401_300.0)));
    assert_eq!(points[9].flow, IndicatedFlow::from_l_min(0.2638));
    assert_eq!(points[9].temperature, Some(Temperature::from_c(21.2)));
    assert_eq!(points[9].barometer, Some(AbsolutePressure::from_pa(100_890.0)));
    assert_eq!((points[0].time_s, points[1].time_s), (Some(0.0), Some(95.0)));
    assert_eq!((points[5].sweep, points[6].sweep), (Some(Sweep::Rising), Some(Sweep::Falling)));
    assert_eq!(points[0].averaged, 1.0);
}

#[test]
fn a_series_keeps_missing_readings_as_nan() {
    let run = run(SERIES, SERIES_CSV);
    let Readings::Series(series) = &run.readings else { panic!("series") };
    assert_eq!(series.time_s, [0.0, 1.0, 2.0, 3.0, 4.0, 4.0, 5.5]);
    assert_eq!(series.pressure_pa[1], 601_100.0);
    assert!(series.pressure_pa[4].is_nan() && series.flow_l_min[2].is_nan());
    assert_eq!(series.flow_l_min[5], -0.2 / 1000.0);
    let temperature_k = series.temperature_k.as_ref().unwrap();
    assert!(temperature_k[3].is_nan());
    assert_eq!(temperature_k[6], 21.5 + 273.15);
    assert_eq!((&series.barometer_pa, series.pressure_is_absolute), (&None, false));
}

#[test]
fn a_timed_meter_gives_volume_over_duration() {
    let run = run(TIMED, TIMED_CSV);
    let Readings::Points(points) = &run.readings else { panic!("points") };
    assert_eq!(points[0].flow, IndicatedFlow::from_m3_s(1e-3 / 262.4));
    // 73.0 psi at 6894.757 293 168 361 Pa/psi (NIST Special Publication 811, appendix B.8).
    assert!((points[0].pressure.shown_pa() - 503_317.282_4).abs() < 0.001);
    assert!(matches!(points[0].pressure, Indication::Absolute(_)));
    assert_eq!(run.meter.kind, MeterKind::Timed { wet: true });
    assert_eq!(run.purity, None);
}

#[test]
fn odd_but_fine_tables_give_the_same_run() {
    let plain = run(POINTS, POINTS_CSV);
    let lines: Vec<&str> = POINTS_CSV.lines().collect();
    let spread = lines.iter().map(|line| format!(" {} \n\n , , , , , \n  \n", line.replace(',', " , ")));
    let quoted = lines.iter().map(|line| format!("\"{}\"\n", line.replace(',', "\",\"")));
    let more = lines.iter().enumerate().map(|(i, line)| match i {
        0 => format!("no,\"remark, or two\",{line},\n"),
        _ => format!("{i},\"a, \"\"b\"\" é\",{line},\n"),
    });
    let semicolons = POINTS_CSV.replace(',', ";").replace('.', ",");
    for (name, csv) in [
        ("byte order mark", format!("\u{FEFF}{POINTS_CSV}")),
        ("CRLF", POINTS_CSV.replace('\n', "\r\n")),
        ("BOM, CRLF, semicolons, decimal commas", format!("\u{FEFF}{}", semicolons.replace('\n', "\r\n"))),
        ("semicolons, decimal commas", semicolons.clone()),
        ("semicolons, decimal points", POINTS_CSV.replace(',', ";")),
        ("tabs", POINTS_CSV.replace(',', "\t")),
        ("no final newline", POINTS_CSV.trim_end().to_owned()),
        ("empty lines and spaces", spread.collect()),
        ("empty lines first", format!("\n\r\n{POINTS_CSV}")),
        ("a byte order mark on an empty line", format!("\u{FEFF}\n{POINTS_CSV}")),
        ("quotes", quoted.collect()),
        ("other columns", more.collect()),
        ("exponents and signs", POINTS_CSV.replace("4.013", "+4013e-3").replace("0.2296", ".2296")),
    ] {
        assert_eq!(run(POINTS, &csv), plain, "{name}");
    }
    let crlf = format!("\u{FEFF}{}", POINTS.replace('\n', "\r\n"));
    assert_eq!(run(&crlf, POINTS_CSV), plain, "run file with byte order mark and CRLF");
}

#[test]
fn every_form_of_time_gives_the_same_seconds() {
    let plain = run(POINTS, POINTS_CSV);
    for date in [",2026-11-12T09:", ",2026-11-12 09:"] {
        let dated = POINTS_CSV.replace(",09:", date);
        assert_eq!(run(POINTS, &dated), plain);
        let offset = |line: &str| match line.ends_with("time") {
            true => line.to_owned(),
            false => format!("{line}+11:00"),
        };
        let offsets: Vec<String> = dated.lines().map(offset).collect();
        assert_eq!(run(POINTS, &offsets.join("\n")), plain);
    }
}

#[test]
fn what_is_taken_for_granted_is_said() {
    let toml = with(POINTS, "purpose = \"acceptance\"\n", "");
    let toml = with(&toml, "oxygen = \"99.5 % ± 0.3 %\"\n", "");
    let toml = with(&toml, "unit = \"bar\"", "unit = \"ata\"");
    let toml = with(&toml, "ip = \"10 bar\"", "ip = \"10 ata\"");
    let toml =
        with(&toml, "barometer = \"± 1.0 hPa\"", "barometer = \"1010 hPa ± 1.0 hPa\"\nhumidity = \"40 %\"");
    let loaded = parse(&toml, POINTS_CSV.as_bytes()).unwrap();
    assert_eq!(loaded.value.purpose, Purpose::Check);
    assert_eq!(loaded.value.purity, Some(DEFAULT_PURITY));
    assert_eq!(loaded.value.conditions.barometer.value, None);
    let said: Vec<String> = loaded.notes.iter().map(Note::to_string).collect();
    assert_eq!(said.len(), 5, "{said:?}");
    assert_eq!(said[0], "no purity of the oxygen is stated: taken as 99.5 % ± 0.3 %");
    assert_eq!(said[1], "no purpose is stated: taken as \"check\"");
    assert!(
        said[2].starts_with("run.toml, line 54, [acceptance] ip: ata is read as 1.01325 bar"),
        "{}",
        said[2]
    );
    let unused = "run.toml, line 22, [conditions] humidity: not used, only a meter that shows the volume that passes \
                  needs it";
    assert_eq!(said[3], unused);
    let unused = "run.toml, line 21, [conditions] barometer: not used, the column gives the value, and only the ± is \
                  taken from here";
    assert_eq!(said[4], unused);
    let loaded = parse(&with(POINTS, "99.5 % ± 0.3 %", "99.9 %"), POINTS_CSV.as_bytes()).unwrap();
    assert_eq!(loaded.value.purity, Some(Purity { fraction: 99.9 / 100.0, expanded: 0.003 }));
    assert_eq!(loaded.notes[0].to_string(), "run.toml, line 6, oxygen: no ± is stated, taken as ± 0.3 %");
}

#[test]
fn a_coverage_factor_of_the_conditions_is_brought_to_two() {
    let toml = with(POINTS, "[conditions]\n", "[conditions]\ncoverage = 1\n");
    let expanded = run(&toml, POINTS_CSV).conditions.temperature.expanded;
    assert_eq!(expanded.map(|u| u.as_k()), Some(2.0));
}

#[test]
fn a_gas_factor_is_brought_to_two_and_written_as_its_papers_state_it() {
    let toml = with(FLOAT, "scale = \"reference\"", "scale = \"reference\"\ncoverage = 1.7");
    let given = run(&toml, FLOAT_CSV);
    let MeterKind::Float { gas_factor: Some(factor), .. } = &given.meter.kind else { panic!("float") };
    assert_eq!(factor.expanded, Some(0.03 * (2.0 / 1.7)));
    let (toml, csv) = write_run(&given, "again.csv");
    assert!(toml.contains("gas_factor = \"0.95 ± 0.03\""), "{toml}");
    assert_eq!(run(&toml, &csv), given);
}

#[test]
fn every_refusal_names_its_place_and_says_what_to_do() {
    let cases: toml::Table = include_str!("../../fixtures/runs/refused.toml").parse().unwrap();
    let cases = cases["case"].as_array().unwrap();
    assert!(cases.len() > 80);
    for case in cases {
        let text = |key: &str| case[key].as_str().unwrap();
        let replaced = |whole: &str| with(whole, text("old"), text("new"));
        let got = match text("file") {
            "points.toml" => refusal(&replaced(POINTS), POINTS_CSV),
            "points.csv" => refusal(POINTS, &replaced(POINTS_CSV)),
            "series.toml" => refusal(&replaced(SERIES), SERIES_CSV),
            "series.csv" => refusal(SERIES, &replaced(SERIES_CSV)),
            "timed.toml" => refusal(&replaced(TIMED), TIMED_CSV),
            "timed.csv" => refusal(TIMED, &replaced(TIMED_CSV)),
            "float.toml" => refusal(&replaced(FLOAT), FLOAT_CSV),
            other => panic!("no file {other}"),
        };
        assert_eq!(got, text("says"), "{case}");
    }
}

#[test]
fn every_missing_key_is_refused_with_an_example() {
    let missing = |example: &str| format!("this key is missing; write for example {example}");
    for (line, place) in [
        ("record = \"bench run\"", "record"),
        ("orifice = \"CMF-0417\"", "orifice"),
        ("gas = \"oxygen\"", "gas"),
        ("taken = \"2026-11-12T09:40:00+11:00\"", "taken"),
        ("flow = { column = \"flow\", unit = \"L/min\" }", "line 13, [columns] flow"),
        ("pressure = { column = \"ip\", unit = \"bar\" }", "line 13, [columns] pressure"),
        ("kind = \"mass\"", "line 33, [meter] kind"),
        ("ip = \"10 bar\"", "line 54, [acceptance] ip"),
        ("flow = \"0.48 L/min\"", "line 54, [acceptance] flow"),
        ("tolerance = \"5 %\"", "line 54, [acceptance] tolerance"),
        ("point = 7", "line 60, [[leave_out]] point"),
    ] {
        let without = with(POINTS, &format!("\n{line}\n"), "\n");
        assert_eq!(refusal(&without, POINTS_CSV), format!("run.toml, {place}: {}", missing(line)));
    }
    for (table, example) in [
        ("columns", "a table [columns] with pressure = { column = \"ip\", unit = \"bar\" }"),
        ("meter", "a table [meter] with kind = \"mass\" and what its papers say"),
        ("transducer", "a table [transducer] with what its papers say"),
    ] {
        let from = POINTS.find(&format!("[{table}]")).unwrap();
        let to = POINTS[from..].find("\n\n").unwrap() + from;
        let without = format!("{}{}", &POINTS[..from], &POINTS[to..]);
        assert_eq!(refusal(&without, POINTS_CSV), format!("run.toml, {table}: {}", missing(example)));
    }
}

#[test]
fn what_breaks_the_rules_of_toml_is_refused_with_its_line() {
    let not_toml = refusal(&with(POINTS, "gas = \"oxygen\"\n", "gas = oxygen\n"), POINTS_CSV);
    assert!(not_toml.starts_with("run.toml, line 5: this is not TOML ("), "{not_toml}");
    let twice = refusal(&with(POINTS, "[before]", "[conditions]"), POINTS_CSV);
    assert!(twice.starts_with("run.toml, line 26: this is not TOML ("), "{twice}");
}

#[test]
fn dates_may_be_written_as_toml_dates() {
    let toml = with(POINTS, "\"2027-03-01\"", "2027-03-01");
    let toml = with(&toml, "\"2026-11-12T09:40:00+11:00\"", "2026-11-12T09:40:00+11:00");
    assert_eq!(run(&toml, POINTS_CSV), run(POINTS, POINTS_CSV));
}

#[test]
fn quantities_are_refused_by_name_where_they_stand() {
    for (old, new, place) in [
        ("gain = \"0.8 %\"", "gain = \"-0.8 %\"", "run.toml, line 37, [meter] gain: "),
        ("zero = \"0.0006 L/min\"", "zero = \"-0.0006 L/min\"", "run.toml, line 38, [meter] zero: "),
        ("noise = \"0.2 %\"", "noise = \"-0.2 %\"", "run.toml, line 39, [meter] noise: "),
        ("noise = \"0.004 bar\"", "noise = \"-0.004 bar\"", "run.toml, line 49, [transducer] noise: "),
        (
            "resolution = \"0.001 bar\"",
            "resolution = \"0.001\"",
            "run.toml, line 50, [transducer] resolution: ",
        ),
        ("\"± 1.0 hPa\"", "\"± -1.0 hPa\"", "run.toml, line 23, [conditions] barometer: "),
        ("unit = \"L/min\"", "unit = \"sccm\"", "run.toml, line 15, [columns.flow] unit: "),
        ("unit = \"L/min\"", "unit = \"bar\"", "run.toml, line 15, [columns.flow] unit: "),
        ("\"0 bar to 16 bar\"", "\"16 bar\"", "run.toml, line 52, [transducer] range: "),
        ("\"20 °C, 101.325 kPa\"", "\"normal\"", "run.toml, line 35, [meter] reads_at: "),
        ("\"20 °C, 101.325 kPa\"", "\"\"", "run.toml, line 35, [meter] reads_at: "),
        ("ip = \"10 bar\"", "ip = \"-2 bar\"", "run.toml, line 55, [acceptance] ip: "),
    ] {
        let error = parse(&with(POINTS, old, new), POINTS_CSV.as_bytes()).unwrap_err();
        let RecordError::Input { refusal, .. } = &error else { panic!("{error}") };
        assert!(matches!(**refusal, Refusal::Quantity(_)), "{error}");
        assert!(error.to_string().starts_with(place), "{error}");
    }
}

#[test]
fn meters_must_say_what_their_litres_are() {
    for (toml, csv, line, kind) in [(POINTS, POINTS_CSV, 33, "mass"), (FLOAT, FLOAT_CSV, 19, "float")] {
        let no_reference = with(toml, "reads_at = \"20 °C, 101.325 kPa\"\n", "");
        let sentence = format!(
            "run.toml, line {line}, [meter] reads_at: a {kind} meter shows litres at reference conditions, and there \
             is no default; write {}",
            presets_listed()
        );
        assert_eq!(refusal(&no_reference, csv), sentence);
    }
    for factor in ["0.98", "\"0.98\"", "\"0.98 ± 0.01\"", "\"0.98 +/- 0.01\""] {
        let toml =
            with(POINTS, "made_for = \"oxygen\"", &format!("made_for = \"air\"\ngas_factor = {factor}"));
        let MeterKind::Mass { gas_factor: Some(given), .. } = run(&toml, POINTS_CSV).meter.kind else {
            panic!()
        };
        assert_eq!(given.value, 0.98);
        assert_eq!(given.expanded, (factor.len() > 6).then_some(0.01));
    }
    // A float meter on another gas needs no factor: both laws bound it.
    run(&with(FLOAT, "gas_factor = \"0.95 ± 0.03\"\n", ""), FLOAT_CSV);
}

#[test]
fn barometer_and_temperature_must_come_from_somewhere() {
    let from = TIMED.find("[conditions]").unwrap();
    let to = TIMED.find("[meter]").unwrap();
    let no_table = format!("{}{}", &TIMED[..from], &TIMED[to..]);
    let barometer = "the absolute pressure, and whether the orifice is choked, need the barometer; give it here, as in \
                     barometer = \"1009.2 hPa ± 1.0 hPa\", or as a column";
    assert_eq!(refusal(&no_table, TIMED_CSV), format!("run.toml, [conditions] barometer: {barometer}"));
}

#[test]
fn entries_of_registers_are_asked_for() {
    struct One(Meter);
    impl Registers for One {
        fn meter(&self, id: &Id) -> Option<Meter> {
            (id.as_str() == "FM-01").then(|| self.0.clone())
        }
        fn transducer(&self, _: &Id) -> Option<Transducer> {
            None
        }
        fn acceptance(&self, _: &Id) -> Option<Acceptance> {
            None
        }
    }
    let (before, after) = (POINTS.find("[meter]").unwrap(), POINTS.find("[transducer]").unwrap());
    let toml = format!("meter = \"FM-01\"\n{}{}", &POINTS[..before], &POINTS[after..]);
    let sentence = "run.toml, line 1, meter: \"FM-01\" would be an entry of a register, and no book is open that holds \
                    it; write a [meter] table";
    assert_eq!(refusal(&toml, POINTS_CSV), sentence);
    let plain = run(POINTS, POINTS_CSV);
    let files = &mut |_: &str| -> Result<Box<dyn Read>, RecordError> { Ok(Box::new(POINTS_CSV.as_bytes())) };
    assert!(parse_run_with(&toml, "run.toml", files, &NoRegisters).is_err());
    assert_eq!(parse_run_with(&toml, "run.toml", files, &One(plain.meter.clone())).unwrap().value, plain);
    let of_air = with(&toml, "gas = \"oxygen\"\noxygen = \"99.5 % ± 0.3 %\"\n", "gas = \"air\"\n");
    let other_gas = parse_run_with(&of_air, "run.toml", files, &One(plain.meter.clone())).unwrap_err();
    let sentence = "run.toml, line 1, meter: the gas is air and the meter was made for oxygen; give gas_factor from the \
                    meter's papers (true flow over shown flow)";
    assert_eq!(other_gas.to_string(), sentence);
    let toml = format!("acceptance = \"SHOP-5\"\n{}", &POINTS[..POINTS.find("[acceptance]").unwrap()]);
    assert!(
        refusal(&toml, POINTS_CSV).starts_with("run.toml, line 1, acceptance: \"SHOP-5\" would be an entry")
    );
}

#[test]
fn tables_without_a_table_in_them_are_refused() {
    let header = POINTS_CSV.lines().next().unwrap();
    let no_rows = "line 1: there are no rows under the header";
    let empty = "line 1: the file is empty; its first line must name the columns";
    let semicolons = POINTS_CSV.replace(',', ";").replacen("4.013", "4,013", 1);
    for (csv, sentence) in [
        (format!("{header}\n"), no_rows),
        (format!("{header}\n\n,,,,,\n"), no_rows),
        (
            POINTS_CSV.replace('\n', "\r"),
            "line 1: the lines end with a carriage return alone; save the file with LF or CRLF at the ends of its lines",
        ),
        (String::new(), empty),
        (" \n\n".to_owned(), empty),
        (
            format!("{POINTS_CSV}{POINTS_CSV}"),
            "line 12, column \"ip\": the header stands here again; remove this line, or import the two recordings one \
             by one",
        ),
        (
            semicolons,
            "line 2, column \"flow\": \"0.2296\" mixes decimal comma and decimal point with the cells above; use one of \
             them",
        ),
        (
            format!("{header}\n\n\r\n{}", "1,".repeat(40_000)),
            "line 4: the line is longer than 64 KiB; this is not a table of readings",
        ),
        ("x".repeat(70_000), "line 1: the line is longer than 64 KiB; this is not a table of readings"),
    ] {
        assert_eq!(refusal(POINTS, &csv), format!("points.csv, {sentence}"));
    }
    assert_eq!(
        refusal(
            &with(POINTS, "unit = \"bar\" }", "unit = \"bar\", absolute = true }"),
            &with(POINTS_CSV, "4.013", "-0.1")
        ),
        "points.csv, line 2, column \"ip\": -0.1 bar is a negative absolute pressure, which cannot be; check the unit, or \
         take absolute = true out"
    );
}

#[test]
fn a_series_by_the_clock_crosses_midnight_and_never_runs_back() {
    let backwards = "times run backwards here; sort the rows by time, or import the recordings one by one";
    let time = "time = { column = \"t\", unit = \"s\" }";
    let clock = with(SERIES, time, "time = { column = \"t\" }");
    let back = "t,p,q,gas\n02:59:59,6,310,21\n02:00:00,6,310,21\n";
    assert_eq!(refusal(&clock, back), format!("series.csv, line 3, column \"t\": {backwards}"));
    let midnight = run(&clock, "t,p,q,gas\n23:59:59,6,310,21\n00:00:01,6,310,21\n");
    let Readings::Series(series) = midnight.readings else { panic!("series") };
    assert_eq!(series.time_s, [0.0, 2.0]);
}

/// A logger that never stops: a header, then the same rows over and over.
struct Endless {
    rows: Vec<u8>,
    given: usize,
}

impl Read for Endless {
    fn read(&mut self, out: &mut [u8]) -> std::io::Result<usize> {
        let header = b"t,p,q,gas\n";
        let left = match header.get(self.given..) {
            Some(left) if !left.is_empty() => left,
            _ => &self.rows[(self.given - header.len()) % self.rows.len()..],
        };
        let length = left.len().min(out.len());
        out[..length].copy_from_slice(&left[..length]);
        self.given += length;
        Ok(length)
    }
}

#[test]
fn too_many_rows_are_refused_at_the_limit() {
    let (header, row) =
        POINTS_CSV.split_once('\n').map(|(h, rest)| (h, rest.lines().next().unwrap())).unwrap();
    let table = |rows: usize| format!("{header}\n{}", format!("{row}\n").repeat(rows));
    let Readings::Points(points) = run(POINTS, &table(5_000)).readings else { panic!("points") };
    assert_eq!(points.len(), 5_000);
    let sentence = "points.csv, line 5002: there are more than 5000 rows; split or thin the file";
    assert_eq!(refusal(POINTS, &table(5_001)), sentence);

    let rows = "0,1,1,20\n".repeat(1_000).into_bytes();
    let endless = &mut |_: &str| -> Result<Box<dyn Read>, RecordError> {
        Ok(Box::new(Endless { rows: rows.clone(), given: 0 }))
    };
    let sentence = "series.csv, line 5000002: there are more than 5000000 rows; split or thin the file";
    assert_eq!(parse_run(SERIES, "run.toml", endless).unwrap_err().to_string(), sentence);
}

#[test]
fn what_is_no_text_is_refused_in_one_sentence() {
    let error = |csv: &[u8]| parse(POINTS, csv).unwrap_err();
    let binary =
        "points.csv: this is not text but binary data (or UTF-16 text); save it as plain text in UTF-8";
    assert_eq!(error(b"ip,flow\x00\x01").to_string(), binary);
    let late = [POINTS_CSV.as_bytes(), b"1,2,3,4,\x00,6\n"].concat();
    assert_eq!(error(&late), RecordError::Unreadable { file: "points.csv".to_owned(), fault: Fault::Binary });
    let latin = [POINTS_CSV.as_bytes(), b"1,2,3,4,\xE9,6\n"].concat();
    assert_eq!(error(&latin).to_string(), "points.csv: line 12 is not UTF-8 text; save the file as UTF-8");
    let latin_header = [b"ip,flow [\xB0]\n", POINTS_CSV.as_bytes()].concat();
    assert_eq!(
        error(&latin_header).to_string(),
        "points.csv: line 1 is not UTF-8 text; save the file as UTF-8"
    );
}

#[test]
fn files_that_cannot_be_opened_are_refused_in_one_sentence() {
    let folder = std::env::temp_dir().join(format!("ebbline-record-{}", std::process::id()));
    std::fs::create_dir_all(folder.join("runs")).unwrap();
    let write = |name: &str, bytes: &[u8]| std::fs::write(folder.join(name), bytes).unwrap();
    let refused = |name: &str, about: &str, sentence: &str| {
        let got = read_run(&folder.join(name)).unwrap_err().to_string();
        assert_eq!(got, format!("{}: {sentence}", folder.join(about).display()));
    };
    let missing =
        "there is no such file; check the name (one that stands in a file is taken relative to that file)";
    refused("none.toml", "none.toml", missing);
    refused("runs", "runs", "this is a directory; name a file in it");
    write("run.toml", POINTS.as_bytes());
    refused("run.toml", "points.csv", missing);
    write("directory.toml", with(POINTS, "\"points.csv\"", "\"runs\"").as_bytes());
    refused("directory.toml", "runs", "this is a directory; name a file in it");
    write("binary.toml", b"\x7fELF\x00\x00");
    let binary = "this is not text but binary data (or UTF-16 text); save it as plain text in UTF-8";
    refused("binary.toml", "binary.toml", binary);
    write("latin.toml", b"# caf\xE9\nrecord = \"bench run\"\n");
    refused("latin.toml", "latin.toml", "line 1 is not UTF-8 text; save the file as UTF-8");
    write("large.toml", "#\n".repeat(600_000).as_bytes());
    let large = "a run file has at most 1 MiB; readings belong into the CSV file it names";
    refused("large.toml", "large.toml", large);
    std::fs::remove_dir_all(&folder).unwrap();
    // Whoever may read everything is never denied, so this sentence is checked by its cause.
    let denied = std::io::Error::from(std::io::ErrorKind::PermissionDenied);
    assert_eq!(Fault::of(&denied).to_string(), "no permission to read it; change its permissions or copy it");
}

#[test]
fn what_is_written_reads_back_as_the_same_run() {
    for (toml, csv) in [(POINTS, POINTS_CSV), (TIMED, TIMED_CSV), (FLOAT, FLOAT_CSV)] {
        let given = run(toml, csv);
        let (toml, csv) = write_run(&given, "again.csv");
        assert_eq!(run(&toml, &csv), given, "{toml}{csv}");
        assert_eq!(write_run(&given, "again.csv"), (toml, csv), "the same run gives the same text");
    }
    let series = run(SERIES, SERIES_CSV);
    let (toml, csv) = write_run(&series, "again.csv");
    assert!(csv.contains("\n2,6.013,,"), "{csv}");
    // A missing reading is NaN, which equals nothing; the same text the second time says the runs are the same.
    assert_eq!(write_run(&run(&toml, &csv), "again.csv"), (toml, csv));
}

#[test]
fn a_written_table_has_customary_units_and_the_digits_that_were_read() {
    let (toml, csv) = write_run(&run(POINTS, POINTS_CSV), "again.csv");
    assert!(toml.contains("pressure = { column = \"pressure_bar\", unit = \"bar\" }"), "{toml}");
    assert!(toml.contains("gain = \"0.8 %\"") && toml.contains("oxygen = \"99.5 % ± 0.3 %\""), "{toml}");
    let mut lines = csv.lines();
    assert_eq!(lines.next(), Some("time_s,sweep,pressure_bar,flow_l_min,temperature_c,barometer_hpa"));
    assert_eq!(lines.next(), Some("0,rising,4.013,0.2296,20.8,1009.2"));
}

#[test]
fn free_text_is_written_so_that_it_comes_back() {
    let mut given = run(POINTS, POINTS_CSV);
    given.technician = Some("Ö. \"Old\" \\ Varga # no, = [x]".to_owned());
    given.meter.id = Some(Id::new("FM-01").unwrap());
    given.left_out[0].why = "'single' and \"\"\"three\"\"\"".to_owned();
    let (toml, csv) = write_run(&given, "ten \"points\".csv");
    assert_eq!(run(&toml, &csv), given, "{toml}");
}

proptest! {
    #[test]
    fn any_bytes_as_readings_are_read_or_refused(bytes in proptest::collection::vec(any::<u8>(), 0..400)) {
        let _ = parse(POINTS, &bytes);
        let headed = [b"t,p,q,gas\n".to_vec(), bytes].concat();
        let _ = parse(SERIES, &headed);
    }

    #[test]
    fn any_cells_as_readings_are_read_or_refused(
        rows in "(([-+0-9.,eEn:TZ\" ]{0,9}[,;\t]){3}[-0-9.,e\"]{0,4}\r?\n){0,6}",
    ) {
        let _ = parse(SERIES, format!("t,p,q,gas\n{rows}").as_bytes());
        let clock = with(SERIES, "{ column = \"t\", unit = \"s\" }", "{ column = \"t\" }");
        let _ = parse(&clock, format!("t;p;q;gas\n{rows}").as_bytes());
    }

    #[test]
    fn any_text_as_a_run_file_is_read_or_refused(text in "\\PC{0,200}", at in 0_usize..1_500, gone in 0_usize..30) {
        let _ = parse(&text, POINTS_CSV.as_bytes());
        let chars: Vec<char> = POINTS.chars().collect();
        let at = at.min(chars.len());
        let end = (at + gone).min(chars.len());
        let middle = text.chars().take(8);
        let damaged: String = chars[..at].iter().copied().chain(middle).chain(chars[end..].iter().copied()).collect();
        let _ = parse(&damaged, POINTS_CSV.as_bytes());
    }

    #[test]
    fn any_points_are_written_and_read_back_to_the_last_bit(
        pressures_pa in proptest::collection::vec(-1e5..2e6_f64, 1..20),
        flow in 0.0..3.0_f64, kelvin in 250.0..330.0_f64, barometer_pa in 5e4..1.1e5_f64, scatter in 0.0..1e-3_f64,
        coverage in 0.5..4.0_f64, gain in 0.0..0.1_f64, zero in -1e-3..1e-3_f64,
    ) {
        let mut given = run(POINTS, POINTS_CSV);
        let Readings::Points(points) = &given.readings else { panic!("points") };
        let first = points[0];
        let points = pressures_pa.iter().zip(0..).map(|(pa, i)| PointReading {
            pressure: Indication::Gauge(GaugePressure::from_pa(*pa)),
            flow: IndicatedFlow::from_l_min(flow / f64::from(i + 1)),
            temperature: Some(Temperature::from_k(kelvin + f64::from(i) / 7.0)),
            barometer: Some(AbsolutePressure::from_pa(barometer_pa + f64::from(i) / 3.0)),
            flow_scatter: Some(IndicatedFlow::from_l_min(scatter)),
            averaged: 1.0 + flow,
            time_s: Some(f64::from(i) / 3.0),
            ..first
        });
        given.readings = Readings::Points(points.collect());
        given.left_out.clear();
        given.meter.papers.coverage = coverage;
        given.meter.papers.gain = Some(gain);
        given.before.zero = Some(IndicatedFlow::from_l_min(zero));
        given.after.leak_pa_s = Some(zero * 1e3);
        let (toml, csv) = write_run(&given, "again.csv");
        prop_assert_eq!(run(&toml, &csv), given, "{}{}", toml, csv);
    }
}
