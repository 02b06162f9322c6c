//! `bench fit` as its callers see it: the JSON contract, the sheet, exit status, plots, closed pipes.

use std::process::{Command, Stdio};

use crate::bench_files::{RUN, ebbline, folder, readings, said, write};
use serde_json::Value;

fn fitted(name: &str, toml: &str, arguments: &[&str]) -> (Value, String, i32) {
    let folder = folder(name);
    write(&folder, toml, readings().as_bytes());
    let all = [&["bench", "fit", "run.toml", "--json"], arguments].concat();
    let (stdout, stderr, status) = said(&ebbline(&folder, &all));
    (serde_json::from_str(&stdout).unwrap_or_else(|e| panic!("{e}: {stdout} {stderr}")), stderr, status)
}

#[test]
fn every_key_of_the_interface_is_there_with_its_kind() {
    let (json, _, status) =
        fitted("json-keys", RUN, &["--at", "9.4 bar", "--for-flow", "0.31 L/min,0.4 L/min"]);
    assert_eq!(status, 0);
    let numbers = [
        "/format",
        "/method",
        "/line/slope_l_min_bar",
        "/line/intercept_l_min",
        "/line/slope_u",
        "/line/intercept_u",
        "/line/covariance",
        "/line/reduced_chi_square",
        "/line/points_used",
        "/line/reference_temperature_c",
        "/points/0/index",
        "/points/0/pressure_bar_abs",
        "/points/0/pressure_u",
        "/points/0/flow_l_min",
        "/points/0/flow_u",
        "/points/0/residual_l_min",
        "/choke_ratio/value",
        "/choke_ratio/u",
        "/choke_ratio/interval_95/0",
        "/choke_ratio/interval_95/1",
        "/sonic_conductance_dm3_s_bar/value",
        "/sonic_conductance_dm3_s_bar/u",
        "/effective_diameter_um/value",
        "/effective_diameter_um/u",
        "/flow_at/0/ip_bar_gauge",
        "/flow_at/0/barometer_bar",
        "/flow_at/0/temperature_c",
        "/flow_at/0/flow_l_min",
        "/flow_at/0/u",
        "/flow_at/0/expanded",
        "/flow_at/0/coverage_factor",
        "/ip_for/0/flow_l_min",
        "/ip_for/0/ip_bar_gauge",
        "/ip_for/0/interval_95/0",
        "/ip_for/0/interval_95/1",
        "/budget/0/u_l_min",
        "/budget/0/at_ip_bar_gauge",
        "/conformity_probability",
    ];
    for pointer in numbers {
        assert!(
            json.pointer(pointer).is_some_and(Value::is_number),
            "{pointer}: {:?}",
            json.pointer(pointer)
        );
    }
    for pointer in [
        "/orifice",
        "/gas",
        "/choke_ratio/origin",
        "/budget/0/source",
        "/checks/0/check",
        "/checks/0/verdict",
        "/checks/0/says",
        "/verdict",
    ] {
        assert!(json.pointer(pointer).is_some_and(Value::is_string), "{pointer}");
    }
    assert!(json["points"][4]["used"] == true);
    // Null where nothing is to say; by `pointer`, because an index finds null also where the key is missing.
    assert_eq!(json.pointer("/points/4/why_not"), Some(&Value::Null));
    assert_eq!(json.pointer("/flow_at/0/degrees_of_freedom"), Some(&Value::Null));
    assert!(json["warnings"].is_array());
    for check in json["checks"].as_array().unwrap() {
        assert!(check.get("value").is_some() && check.get("limit").is_some(), "{check}");
        assert!(["pass", "fail", "note"].contains(&check["verdict"].as_str().unwrap()));
    }
    assert_eq!(json["verdict"], "pass");
}

#[test]
fn the_numbers_belong_together() {
    let (json, ..) = fitted("json-numbers", RUN, &["--at", "9.4 bar", "--for-flow", "0.4 L/min"]);
    let number =
        |pointer: &str| json.pointer(pointer).and_then(Value::as_f64).unwrap_or_else(|| panic!("{pointer}"));
    let (slope, intercept) = (number("/line/slope_l_min_bar"), number("/line/intercept_l_min"));
    assert_eq!(json["flow_at"].as_array().unwrap().len(), 2);
    for (i, ip) in [(0, 10.0), (1, 9.4)] {
        assert!((number(&format!("/flow_at/{i}/ip_bar_gauge")) - ip).abs() < 1e-12);
        assert!((number(&format!("/flow_at/{i}/barometer_bar")) - 1.01325).abs() < 1e-12);
        let flow = intercept + slope * (ip + 1.01325);
        assert!((number(&format!("/flow_at/{i}/flow_l_min")) - flow).abs() < 1e-9);
        let (u, k) = (number(&format!("/flow_at/{i}/u")), number(&format!("/flow_at/{i}/coverage_factor")));
        assert!((number(&format!("/flow_at/{i}/expanded")) - k * u).abs() < 1e-9);
        // From the covariance of the line, which holds random and common parts together.
        let p = ip + 1.01325;
        let variance = number("/line/intercept_u").powi(2)
            + 2.0 * p * number("/line/covariance")
            + (p * number("/line/slope_u")).powi(2);
        assert!((variance.sqrt() - u).abs() < 1e-6 * u, "{} {u}", variance.sqrt());
    }
    let budget: f64 =
        json["budget"].as_array().unwrap().iter().map(|r| r["u_l_min"].as_f64().unwrap().powi(2)).sum();
    assert!((budget.sqrt() - number("/flow_at/0/u")).abs() < 1e-9);
    for point in json["points"].as_array().unwrap() {
        let of = |key: &str| point[key].as_f64().unwrap();
        let residual = of("flow_l_min") - intercept - slope * of("pressure_bar_abs");
        assert!((of("residual_l_min") - residual).abs() < 1e-9);
    }
    let ip = number("/ip_for/0/ip_bar_gauge");
    assert!((intercept + slope * (ip + 1.01325) - 0.4).abs() < 1e-9);
    assert!(number("/ip_for/0/interval_95/0") < ip && ip < number("/ip_for/0/interval_95/1"));
}

#[test]
fn a_barometer_moves_the_answers_and_not_the_verdict() {
    let (json, ..) = fitted("json-barometer", RUN, &["--barometer", "700 hPa", "--at", "10 bar"]);
    let (plain, ..) = fitted("json-no-barometer", RUN, &["--at", "10 bar"]);
    let flow = |json: &Value, i: usize| json["flow_at"][i]["flow_l_min"].as_f64().unwrap();
    assert!((json["flow_at"][1]["barometer_bar"].as_f64().unwrap() - 0.7).abs() < 1e-12);
    let slope = json["line"]["slope_l_min_bar"].as_f64().unwrap();
    assert!((flow(&plain, 1) - flow(&json, 1) - slope * 0.31325).abs() < 1e-9);
    assert_eq!(json["conformity_probability"], plain["conformity_probability"]);
}

#[test]
fn what_the_barometer_may_be_off_by_is_in_both_answers() {
    let call = |name: &str, barometer: &str| {
        fitted(name, RUN, &["--barometer", barometer, "--for-flow", "0.4 L/min"]).0
    };
    let (sharp, blurred) =
        (call("barometer-sharp", "900 hPa"), call("barometer-blurred", "900 hPa ± 100 hPa"));
    let number = |json: &Value, pointer: &str| json.pointer(pointer).and_then(Value::as_f64).unwrap();
    let half_width = |json: &Value| {
        (number(json, "/ip_for/0/interval_95/1") - number(json, "/ip_for/0/interval_95/0")) / 2.0
    };
    // ± 0.1 bar with k = 2 is 0.098 bar for 95 %; the line's slope is known far too well for Fieller to bend it.
    let want = (half_width(&sharp).powi(2) + (1.959_964_f64 * 0.05).powi(2)).sqrt();
    assert!((half_width(&blurred) - want).abs() < 1e-3 * want, "{} {want}", half_width(&blurred));
    assert!(
        (number(&sharp, "/ip_for/0/ip_bar_gauge") - number(&blurred, "/ip_for/0/ip_bar_gauge")).abs() < 1e-9
    );
    let through = 0.05 * number(&sharp, "/line/slope_l_min_bar");
    let want = (number(&sharp, "/flow_at/0/u").powi(2) + through * through).sqrt();
    assert!((number(&blurred, "/flow_at/0/u") - want).abs() < 1e-9);
}

#[test]
fn answers_beyond_the_points_are_warned_of_whichever_way_they_were_asked() {
    for arguments in [["--at", "30 bar"], ["--for-flow", "2 L/min"]] {
        let (json, ..) = fitted("beyond", RUN, &arguments);
        let warned = |w: &Value| w.as_str().unwrap().contains("outside the points of the line");
        assert_eq!(
            json["warnings"].as_array().unwrap().iter().filter(|w| warned(w)).count(),
            1,
            "{arguments:?}"
        );
    }
    let (json, ..) = fitted("within", RUN, &["--at", "9 bar", "--for-flow", "0.4 L/min"]);
    assert_eq!(json["warnings"], Value::Array(Vec::new()));
}

#[test]
fn a_flat_line_has_no_pressure_for_a_flow_and_says_null() {
    let csv: String = (0..12).map(|i| format!("{}.0,0.5100,rising\n", i + 2)).collect();
    let folder = folder("json-flat");
    write(&folder, RUN, format!("ip,flow,sweep\n{csv}").as_bytes());
    let call = ["bench", "fit", "run.toml", "--json", "--for-flow", "0.4 L/min,0.5 L/min"];
    let (stdout, stderr, status) = said(&ebbline(&folder, &call));
    let json: Value = serde_json::from_str(&stdout).unwrap_or_else(|e| panic!("{e}: {stdout} {stderr}"));
    assert_eq!(status, 1, "{stderr}");
    // Whether the slope is nought or the smallest number there is depends on rounding; neither says anything.
    for i in 0..2 {
        for key in ["ip_bar_gauge", "interval_95/0", "interval_95/1"] {
            assert_eq!(json.pointer(&format!("/ip_for/{i}/{key}")), Some(&Value::Null), "{i} {key}");
        }
    }
}

#[test]
fn a_verdict_that_is_not_favourable_is_exit_1_with_its_reason() {
    for (name, flow, verdict) in [("fail", "0.60 L/min", "fail"), ("undecided", "0.5045 L/min", "undecided")]
    {
        let toml = RUN.replacen("flow = \"0.48 L/min\"", &format!("flow = \"{flow}\""), 1);
        let (json, stderr, status) = fitted(&format!("verdict-{name}"), &toml, &[]);
        assert_eq!((json["verdict"].as_str(), status), (Some(verdict), 1), "{stderr}");
        assert!(stderr.to_lowercase().contains(verdict), "{stderr}");
    }
    let without = RUN.split("[acceptance]").next().unwrap().to_owned();
    let (json, _, status) = fitted("verdict-none", &without, &[]);
    assert_eq!((json["verdict"].as_str(), status), (Some("none"), 0));
    assert!(json["conformity_probability"].is_null());
}

#[test]
fn the_sheet_is_80_columns_with_units_and_cautions() {
    for (name, arguments) in [
        ("plain", &["--at", "9.4 bar", "--for-flow", "0.3 L/min", "--monte-carlo", "2000"][..]),
        ("psi", &["--show", "psi,mL/min,ft,F", "--at", "136 psi"]),
    ] {
        let folder = folder(&format!("sheet-{name}"));
        write(&folder, RUN, readings().as_bytes());
        let all = [&["bench", "fit", "run.toml"], arguments].concat();
        let (stdout, stderr, status) = said(&ebbline(&folder, &all));
        assert_eq!(status, 0, "{stderr}");
        for line in stdout.lines() {
            assert!(line.chars().count() <= 80, "{} columns: {line:?}", line.chars().count());
        }
        assert!(stdout.lines().next().unwrap().contains("PASS"));
        for must in ["STPD", "Cautions", "Budget", "Checks", "choke ratio", "no life-support monitor"] {
            assert!(stdout.contains(must), "{must} is missing");
        }
    }
}

#[test]
fn a_plot_is_written_whole_or_not_at_all() {
    let folder = folder("plots");
    write(&folder, RUN, readings().as_bytes());
    for (file, begins) in [("run.svg", &b"<"[..]), ("run.png", b"\x89PNG")] {
        let (_, stderr, status) = said(&ebbline(&folder, &["bench", "fit", "run.toml", "--plot", file]));
        assert_eq!(status, 0, "{stderr}");
        assert!(std::fs::read(folder.join(file)).unwrap().starts_with(begins), "{file}");
    }
    // A folder stands where the plot should go: exit 3, and no temporary file is left.
    std::fs::create_dir(folder.join("taken.svg")).unwrap();
    let (stdout, stderr, status) =
        said(&ebbline(&folder, &["bench", "fit", "run.toml", "--plot", "taken.svg"]));
    assert_eq!((stdout.as_str(), status), ("", 3), "{stderr}");
    let (_, stderr, status) =
        said(&ebbline(&folder, &["bench", "fit", "run.toml", "--plot", "nowhere/run.svg"]));
    assert_eq!(status, 3, "{stderr}");
    let left = std::fs::read_dir(&folder)
        .unwrap()
        .filter(|e| e.as_ref().unwrap().file_name().to_string_lossy().contains(".part"));
    assert_eq!(left.count(), 0);
}

#[test]
fn the_same_input_gives_the_same_bytes() {
    let folder = folder("same-bytes");
    write(&folder, RUN, readings().as_bytes());
    let call = ["bench", "fit", "run.toml", "--json", "--monte-carlo", "5000", "--plot", "a.svg"];
    let first = ebbline(&folder, &call).stdout;
    let drawn = std::fs::read(folder.join("a.svg")).unwrap();
    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    command.current_dir(&folder).args(call).env("TZ", "Pacific/Auckland").env("LANG", "de_DE.UTF-8");
    assert_eq!(command.output().unwrap().stdout, first);
    assert_eq!(std::fs::read(folder.join("a.svg")).unwrap(), drawn);
}

#[test]
#[cfg(unix)]
fn a_closed_stdout_ends_quietly() {
    let folder = folder("closed-stdout");
    write(&folder, RUN, readings().as_bytes());
    let mut command = Command::new(env!("CARGO_BIN_EXE_ebbline"));
    command.current_dir(&folder).args(["bench", "fit", "run.toml"]);
    let mut child = command.stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(String::from_utf8_lossy(&output.stderr), "");
}

#[test]
fn completions_and_manual_name_every_verb() {
    let folder = folder("manual");
    for shell in ["bash", "zsh", "fish", "powershell", "elvish"] {
        let (stdout, _, status) = said(&ebbline(&folder, &["completions", shell]));
        assert_eq!(status, 0);
        assert!(stdout.contains("demo") && stdout.contains("for-flow"), "{shell}");
    }
    let (page, _, status) = said(&ebbline(&folder, &["man"]));
    assert_eq!(status, 0);
    for word in [".TH", "EBBLINE BENCH FIT", "monte", "completions", "demo"] {
        assert!(page.contains(word), "{word} is missing");
    }
}

#[test]
fn the_demonstration_shows_what_it_promises() {
    let folder = folder("demonstration");
    let (stdout, stderr, status) = said(&ebbline(&folder, &["demo", "--into", "out", "--json"]));
    assert_eq!(status, 0, "{stderr}");
    let left: Value = serde_json::from_str(&stdout).unwrap();
    let list = &left["runs"];
    let verdict = |name: &str| {
        let entry = list.as_array().unwrap().iter().find(|e| e["orifice"] == name);
        entry.unwrap_or_else(|| panic!("{name}"))["verdict"].as_str().unwrap().to_owned()
    };
    let expected = [
        ("demo-good", "pass"),
        ("demo-half-blocked", "fail"),
        ("demo-gauge-as-absolute", "fail"),
        ("demo-swept-low", "pass"),
        ("demo-logged", "pass"),
    ];
    for (orifice, word) in expected {
        assert_eq!(verdict(orifice), word, "{orifice}");
    }
    let says = list.as_array().unwrap().iter().map(|e| e["says"].as_str().unwrap().to_owned());
    assert!(says.filter(|s| s.contains("through zero")).count() == 1);
    let low = ebbline(&folder, &["bench", "fit", "out/demo-swept-low.toml", "--json"]).stdout;
    let low: Value = serde_json::from_slice(&low).unwrap();
    assert_eq!(low["choke_ratio"]["origin"], "measured");
    let interval = &low["choke_ratio"]["interval_95"];
    assert!(interval[0].as_f64().unwrap() < 0.46 && 0.46 < interval[1].as_f64().unwrap(), "{interval}");
    // Every file stands alone and says that it is invented; a second time gives the same bytes.
    let read = |entry: &Value, key: &str| std::fs::read(folder.join(entry[key].as_str().unwrap())).unwrap();
    let before: Vec<Vec<u8>> = list
        .as_array()
        .unwrap()
        .iter()
        .flat_map(|e| ["run_file", "readings", "plot"].map(|k| read(e, k)))
        .collect();
    for entry in list.as_array().unwrap() {
        assert!(read(entry, "run_file").starts_with(b"# Invented"));
    }
    ebbline(&folder, &["demo", "--into", "out"]);
    let after: Vec<Vec<u8>> = list
        .as_array()
        .unwrap()
        .iter()
        .flat_map(|e| ["run_file", "readings", "plot"].map(|k| read(e, k)))
        .collect();
    assert!(before == after);
}
