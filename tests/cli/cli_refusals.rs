//! Dangerous mistakes are refused with one sentence on stderr, exit status 2, and nothing on stdout; files that are
//! only written in another habit are read as if nothing were odd.

use crate::bench_files::{RUN, ebbline, folder, readings, said, write};

/// Fits a changed run and expects a refusal that contains every one of `words`.
#[track_caller]
fn refused(name: &str, toml: &str, csv: &[u8], words: &[&str]) {
    let folder = folder(&format!("refused-{name}"));
    write(&folder, toml, csv);
    let (stdout, stderr, status) = said(&ebbline(&folder, &["bench", "fit", "run.toml", "--json"]));
    assert_eq!(status, 2, "{name}: {stderr}");
    assert_eq!(stdout, "", "{name}: stdout must be empty");
    for word in words {
        assert!(stderr.contains(word), "{name}: {word:?} is not in {stderr:?}");
    }
    assert_eq!(stderr.trim_end().lines().count(), 1, "{name}: one sentence, got {stderr:?}");
    assert!(stderr.starts_with("ebbline: "), "{name}: {stderr:?}");
}

/// The run file with one line changed.
#[track_caller]
fn with(from: &str, to: &str) -> String {
    assert!(RUN.contains(from), "{from:?} is not in the run file");
    RUN.replacen(from, to, 1)
}

#[test]
fn a_run_as_it_should_be_is_fitted() {
    let folder = folder("as-it-should-be");
    write(&folder, RUN, readings().as_bytes());
    let (stdout, stderr, status) = said(&ebbline(&folder, &["bench", "fit", "run.toml"]));
    assert_eq!(status, 0, "{stderr}");
    assert!(stdout.starts_with("PASS — CMF-0417: "), "{stdout}");
}

#[test]
fn a_meter_that_does_not_say_its_reference_conditions() {
    let toml = with("reads_at = \"20 °C, 101.325 kPa\"\n", "");
    refused("no-reads-at", &toml, readings().as_bytes(), &["reads_at", "STPD", "ANR"]);
    for unit in ["sccm", "slpm", "NL/min"] {
        let toml = with("unit = \"L/min\"", &format!("unit = \"{unit}\""));
        refused(unit.trim_end_matches("/min"), &toml, readings().as_bytes(), &[unit, "reads_at"]);
    }
}

#[test]
fn a_gas_that_differs_without_a_factor() {
    let toml = with("made_for = \"oxygen\"", "made_for = \"air\"");
    refused("gas-differs", &toml, readings().as_bytes(), &["gas_factor"]);
}

#[test]
fn a_number_without_its_unit() {
    refused("no-unit", &with("zero = \"0.010 bar\"", "zero = \"0.010\""), readings().as_bytes(), &["unit"]);
    refused("no-column-unit", &with(", unit = \"bar\"", ""), readings().as_bytes(), &["unit", "pressure"]);
}

#[test]
fn conditions_in_another_unit_than_they_say() {
    let toml = with("1009.2 hPa ± 1.0 hPa", "1009.2 bar ± 1.0 hPa");
    refused("barometer-in-bar", &toml, readings().as_bytes(), &["barometer", "hPa", "unit"]);
    let toml = with("21.0 °C ± 1.0 °C", "21.0 K ± 1.0 °C");
    refused("kelvins", &toml, readings().as_bytes(), &["temperature", "°C", "unit"]);
}

#[test]
fn fewer_than_five_usable_points() {
    let few: String = readings().lines().take(5).map(|l| format!("{l}\n")).collect();
    refused("four-points", RUN, few.as_bytes(), &["5", "4"]);
    let left_out = format!(
        "{RUN}{}",
        (1..=15).map(|p| format!("\n[[leave_out]]\npoint = {p}\nwhy = \"test\"\n")).collect::<String>()
    );
    refused("fifteen-left-out", &left_out, readings().as_bytes(), &["5 usable", "15"]);
}

#[test]
fn all_points_at_one_pressure() {
    let csv: String = (0..8).map(|i| format!("10.00{i},0.48{i},rising\n")).collect();
    refused("one-pressure", RUN, format!("ip,flow,sweep\n{csv}").as_bytes(), &["pressure", "bar"]);
}

#[test]
fn what_is_no_number() {
    for word in ["NaN", "inf", "-inf", "abc", ""] {
        let csv = readings().replacen("6.000", word, 1);
        assert_ne!(csv, readings(), "{word}: the reading was there");
        refused(&format!("cell-{word}"), RUN, csv.as_bytes(), &["run.csv", "line"]);
    }
}

#[test]
fn a_header_that_names_a_column_twice() {
    let csv = readings().replacen("ip,flow,sweep", "ip,flow,ip", 1);
    refused("doubled-header", RUN, csv.as_bytes(), &["ip", "twice"]);
}

#[test]
fn an_unknown_key_with_the_nearest_known() {
    let toml = with("technician =", "techncian =");
    refused("unknown-key", &toml, readings().as_bytes(), &["techncian", "technician", "line"]);
    let toml = with("resolution = \"0.001 bar\"", "resolutoin = \"0.001 bar\"");
    refused(
        "unknown-key-in-table",
        &toml,
        readings().as_bytes(),
        &["resolutoin", "resolution", "transducer"],
    );
}

#[test]
fn a_negative_uncertainty() {
    refused(
        "negative-gain",
        &with("gain = \"0.8 %\"", "gain = \"-0.8 %\""),
        readings().as_bytes(),
        &["-0.8"],
    );
    let toml = with("21.0 °C ± 1.0 °C", "21.0 °C ± -1.0 °C");
    refused("negative-plus-minus", &toml, readings().as_bytes(), &["-1.0"]);
}

#[test]
fn files_that_are_no_readings() {
    refused("binary", RUN, b"ip,flow\n\x00\x01\x02\xff\xfe\n", &["run.csv"]);
    refused("header-only", RUN, b"ip,flow,sweep\n", &["run.csv"]);
    refused("empty", RUN, b"", &["run.csv"]);
    refused("not-toml", "record = \"bench run", readings().as_bytes(), &["run.toml", "TOML"]);

    let missing = folder("refused-missing");
    std::fs::write(missing.join("run.toml"), RUN).unwrap();
    let directory = folder("refused-directory");
    std::fs::write(directory.join("run.toml"), RUN).unwrap();
    std::fs::create_dir(directory.join("run.csv")).unwrap();
    let nothing = folder("refused-nothing");
    let folder_as_file = folder("refused-folder");
    std::fs::create_dir(folder_as_file.join("run.toml")).unwrap();
    for folder in [missing, directory, nothing, folder_as_file] {
        let (stdout, stderr, status) = said(&ebbline(&folder, &["bench", "fit", "run.toml"]));
        assert_eq!((stdout.as_str(), status), ("", 2), "{}: {stderr}", folder.display());
        assert_eq!(stderr.trim_end().lines().count(), 1, "{stderr:?}");
    }
}

#[test]
fn more_points_or_rows_than_are_taken() {
    let row = "10.000,0.4800,rising\n";
    let many = format!("ip,flow,sweep\n{}", row.repeat(5_001));
    refused("too-many-points", RUN, many.as_bytes(), &["run.csv", "5"]);
    let toml = with("[columns]", "rows = \"series\"\n\n[columns]\ntime = { column = \"t\", unit = \"s\" }");
    let toml = toml.replace("sweep = { column = \"sweep\" }\n", "");
    let many = format!("t,ip,flow\n{}", "1,10,0.48\n".repeat(5_000_001));
    refused("too-many-rows", &toml, many.as_bytes(), &["run.csv", "5"]);
}

#[test]
fn calls_that_cannot_be_meant() {
    let folder = folder("refused-calls");
    write(&folder, RUN, readings().as_bytes());
    for call in [
        &["bench", "fit", "R0001"][..],
        &["bench", "fit", "run.toml", "--at", "9.4"],
        &["bench", "fit", "run.toml", "--at", "-2 bar"],
        &["bench", "fit", "run.toml", "--for-flow", "1 sccm"],
        &["bench", "fit", "run.toml", "--barometer", "1009"],
        &["bench", "fit", "run.toml", "--barometer", "1009 kPa"],
        &["bench", "fit", "run.toml", "--plot", "run.jpg"],
        &["bench", "fit", "run.toml", "--monte-carlo", "5"],
        &["bench", "fit", "run.toml", "--show", "parsec"],
        &["bench", "fit"],
        &["bench", "unfit", "run.toml"],
        &[],
    ] {
        let (stdout, stderr, status) = said(&ebbline(&folder, call));
        assert_eq!((stdout.as_str(), status), ("", 2), "{call:?}: {stderr}");
        assert!(!stderr.is_empty(), "{call:?}");
    }
    let left: Vec<_> = std::fs::read_dir(&folder).unwrap().map(|e| e.unwrap().file_name()).collect();
    assert_eq!(left.len(), 2, "nothing written: {left:?}");
}

#[test]
fn other_habits_of_writing_change_nothing() {
    let plain_folder = folder("habit-plain");
    write(&plain_folder, RUN, readings().as_bytes());
    let (plain, _, status) = said(&ebbline(&plain_folder, &["bench", "fit", "run.toml", "--json"]));
    assert_eq!(status, 0);
    let csv = readings();
    let german: String = csv.lines().map(|l| l.replace(',', ";").replace('.', ",") + "\n").collect();
    let spaced: String = csv.lines().map(|l| format!("{l}\n\n")).collect();
    for (name, changed) in [
        ("bom", format!("\u{feff}{csv}")),
        ("crlf", csv.replace('\n', "\r\n")),
        ("semicolons", german),
        ("no-final-newline", csv.trim_end().to_owned()),
        ("empty-lines", spaced),
    ] {
        let folder = folder(&format!("habit-{name}"));
        write(&folder, RUN, changed.as_bytes());
        let (stdout, stderr, status) = said(&ebbline(&folder, &["bench", "fit", "run.toml", "--json"]));
        assert_eq!(status, 0, "{name}: {stderr}");
        assert_eq!(stdout, plain, "{name}");
    }
}
