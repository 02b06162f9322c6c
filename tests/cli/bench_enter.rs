//! A run typed: the dialogue through a reader and two writers, and the program with input from a pipe.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use crate::bench_files::{RUN, readings, said, write};
use crate::hands::{Bench, plain};
use ebbline::entry::{Readings, RunNumber};
use ebbline::quantity::Unit;
use ebbline::quantity::unit::{Kind, lookup};
use ebbline::work::ExitStatus;
use ebbline::work::enter::Desk;
use ebbline::work::runs;

/// Points of a straight line, as they would be typed: up, then down.
const POINTS: [&str; 9] = [
    "4.000 0.2307",
    "6.000 0.3240",
    "8.000 0.4170",
    "10.000 0.5104",
    "12.000 0.6036",
    "11.000 0.5569",
    "9.000 0.4637",
    "7.000 0.3705",
    "5.000 0.2773",
];

fn number(n: u32) -> RunNumber {
    RunNumber::new(n).unwrap()
}

// ---- somebody sits there ----

#[test]
fn a_new_user_is_led_from_nothing_to_a_judged_run() {
    let bench = Bench::new("new-user");
    write(&bench.folder, RUN, b"not read");
    let file = bench.path("run.toml");
    let talk = bench.asked(
        "CMF-0417",
        &[
            "",
            "acc",
            "acceptance",
            "FM-01",
            &file,
            "1009.2",
            "1009.2 bar",
            "1009.2 hPa",
            "?",
            "21 °C +/- 1 °C",
            "yesterday",
            "2026-11-12T09:40:00+11:00",
            "0.0001 L/min",
            "",
            POINTS[0],
            POINTS[1],
            "8",
            "0.4170",
            POINTS[3],
            "12.000 0.5036",
            "correct 5 12.000 0.6036",
            "list",
            POINTS[5],
            POINTS[6],
            "9.000 0.4500",
            "strike 8",
            "strike 8 read the wrong line",
            POINTS[7],
            POINTS[8],
            "help",
            "sheet",
            "done",
            "",
            "",
        ],
    );
    for words in [
        "\"acc\" is none of acceptance, as-found",
        "no flow meter FM-01 in the register",
        "gives also: transducer, acceptance, technician",
        "R0001 is begun for CMF-0417; the orifice is new",
        "4 more points for a line",
        "flow at 8 bar> 0.4170 R0001 point 3: 8 bar 0.417 L/min",
        "R0001 point 5 corrected: 12 bar 0.6036 L/min (was 12 bar 0.5036 L/min)",
        "point 8 lies apart from the rest, -2.53 % off the line",
        "strike wants the reason too",
        "R0001 point 8 struck: read the wrong line",
        "choked: holds again",
        "PASS so far",
        "What can be typed",
        "struck: read the wrong line",
        "Line q = α + β·p1",
    ] {
        assert!(talk.says(words), "{words:?} is not in\n{}", talk.text);
    }
    // Every prompt and sentence within 80 columns; an acknowledgement is one line whatever its length.
    for line in talk.text.lines().filter(|line| !line.contains(" corrected: ")) {
        assert!(line.chars().count() <= 80 || line.contains(&file), "{line:?}");
    }
    let desk = talk.desk();
    assert!(!desk.is_open());
    let run = desk.run();
    assert_eq!(
        (run.technician.as_deref(), run.taken.to_rfc3339().as_str()),
        (Some("A. Invented"), "2026-11-12T09:40:00+11:00")
    );
    assert_eq!(run.conditions.barometer.expanded.map(|u| u.as_pa()), Some(100.0), "the ± of the file stays");
    assert_eq!(run.before.zero.map(|zero| zero.as_l_min()), Some(0.0001));
    assert!(run.acceptance.is_some() && run.after.zero.is_none());
    let judged = runs::accept(&bench.shelf(), "R0001", None, None).unwrap();
    assert_eq!(judged.decision.figures.points_used, 9);
    bench.holds();
}

#[test]
fn an_afternoon_of_five_orifices_on_one_bench() {
    let bench = Bench::new("afternoon").with_register();
    for (i, orifice) in ["CMF-1", "CMF-2", "CMF-3", "CMF-4", "CMF-5"].into_iter().enumerate() {
        let mut typed: Vec<&str> = match i {
            0 => vec![
                "",
                "acceptance",
                "fm-01",
                "PT-01",
                "VALVE",
                "I. Varga",
                "1009 hPa ± 1 hPa",
                "21 °C ± 1 °C",
            ],
            // The bench as it was, then barometer and temperature as they were.
            _ => vec!["", "", ""],
        };
        typed.extend(["2026-11-12T14:00:00+11:00", "", ""]);
        typed.extend(POINTS);
        match i {
            1 => typed.extend(["correct 3 8.000 0.4171"]),
            2 => typed.extend(["strike 9 hose was touched"]),
            _ => {}
        }
        typed.extend(["done", "0.0002 L/min", "0.002 bar/min"]);
        let talk = bench.asked(orifice, &typed);
        assert_eq!(talk.text.contains("The same bench as in R000"), i > 0, "{}", talk.text);
        let desk = talk.desk();
        assert_eq!((desk.number(), desk.is_open()), (Some(number(i as u32 + 1)), false), "{}", talk.text);
        assert_eq!(desk.run().meter.id.as_ref().unwrap().as_str(), "FM-01");
        assert_eq!(desk.run().acceptance.as_ref().unwrap().id.as_ref().unwrap().as_str(), "VALVE");
        runs::accept(&bench.shelf(), &format!("R000{}", i + 1), None, None).unwrap();
    }
    // A second run of the first orifice is compared with the one before as soon as there is a line.
    let mut again = vec!["", "", "", "2026-11-13T09:00:00+11:00", "", ""];
    let less: Vec<String> = POINTS
        .iter()
        .map(|point| {
            let (pressure, flow) = point.split_once(' ').unwrap();
            format!("{pressure} {:.4}", flow.parse::<f64>().unwrap() * 0.97)
        })
        .collect();
    again.extend(less.iter().map(String::as_str));
    let talk = bench.asked("cmf-1", &again);
    assert!(
        talk.text.contains("same as last time, DOES NOT HOLD: 3.0 % less than in R0001"),
        "{}",
        talk.text
    );
    let (listed, _) = runs::list(&bench.shelf(), false).unwrap();
    assert_eq!(listed.iter().map(|run| run.orifice.as_str()).collect::<Vec<_>>()[..2], ["CMF-1", "CMF-5"]);
    assert!(listed[0].open && listed[1..].iter().all(|run| !run.open && run.judged.is_some()));
    bench.holds();
}

#[test]
fn leaving_before_the_first_point_leaves_nothing() {
    let bench = Bench::new("left-early");
    for typed in [&[][..], &["", "quit"], &["oxygen", ""]] {
        let talk = bench.asked("CMF-0417", typed);
        assert!(talk.desk.is_none(), "{}", talk.text);
    }
    assert!(!bench.book().exists());
}

#[test]
fn what_is_left_open_goes_on_with_everything_that_was_there() {
    let bench = Bench::new("left-open").with_register();
    let mut typed = vec![
        "",
        "",
        "FM-01",
        "PT-01",
        "none",
        "",
        "1009 hPa ± 1 hPa",
        "21 °C ± 1 °C",
        "",
        "",
        "0.004 bar/min",
    ];
    typed.extend(&POINTS[..4]);
    typed.extend(["conditions", "", "22 °C"]);
    let talk = bench.asked("CMF-0417", &typed);
    assert!(talk.desk().is_open());
    // Somebody else goes on with it, and is told that it is open.
    assert!(bench.asked("CMF-0417", &[]).text.contains("R0001 of this orifice is still open"));
    let mut typed = vec!["zero 0.0003 L/min"];
    typed.extend(&POINTS[4..]);
    typed.extend(["done", "quit"]);
    let talk = bench.again("R0001", &typed);
    assert!(talk.says("gas 22 °C ± 1 °C"), "{}", talk.text);
    assert!(talk.desk().is_open(), "quit at the last question leaves it open\n{}", talk.text);
    let talk = bench.again("r0001", &["done", "0.003 bar/min"]);
    let run = talk.desk().run().clone();
    assert!(!talk.desk().is_open(), "{}", talk.text);
    assert_eq!(run.conditions.temperature.value.map(|t| t.as_c()), Some(22.0));
    assert!((run.before.leak_pa_s.unwrap() - 400.0 / 60.0).abs() < 1e-9);
    assert!((run.after.leak_pa_s.unwrap() - 300.0 / 60.0).abs() < 1e-9);
    assert_eq!(run.after.zero.map(|zero| zero.as_l_min()), Some(0.0003));
    let error = Desk::resume(bench.shelf(), "R0001").unwrap_err();
    assert!(error.to_string().contains("R0001 is complete"), "{error}");
    bench.holds();
}

#[test]
fn a_run_without_a_line_ends_only_on_purpose() {
    let bench = Bench::new("no-line").with_run();
    let talk =
        bench.asked("A", &["", "", "done", POINTS[0], POINTS[1], "done", "sheet", "done anyway", "", ""]);
    assert!(talk.says("there is no point yet"), "{}", talk.text);
    assert!(talk.says("a line needs 5 usable points"), "{}", talk.text);
    assert!(talk.says("3 more points for a line"), "{}", talk.text);
    assert!(!talk.desk().is_open());
}

#[test]
fn two_who_type_into_one_run_see_each_other() {
    let bench = Bench::new("two");
    write(&bench.folder, RUN, b"");
    let mut first = bench.desk("CMF-0417");
    assert_eq!(first.add(plain(4.0, 0.23)).unwrap().point, 1);
    let mut second = Desk::resume(bench.shelf(), "R0001").unwrap();
    assert_eq!(second.add(plain(6.0, 0.324)).unwrap().point, 2);
    assert_eq!(first.add(plain(8.0, 0.417)).unwrap().point, 3);
    assert_eq!(first.points().len(), 3);
    second.strike(1, "not settled").unwrap();
    let error = first.correct(1, plain(4.0, 0.231)).unwrap_err();
    assert_eq!(
        (error.to_string().contains("point 1 of run R0001"), error.status()),
        (true, ExitStatus::Wrong)
    );
    second.finish(true).unwrap();
    let error = first.add(plain(9.0, 0.4637)).unwrap_err();
    assert!(error.to_string().contains("R0001 is complete"), "{error}");
    bench.holds();
}

#[test]
fn numbers_without_a_unit_that_do_not_fit_are_doubted_and_with_units_taken() {
    let bench = Bench::new("doubt").with_run();
    let talk = bench.asked(
        "A",
        &[
            "",
            "",
            "58 0.2307",
            POINTS[0],
            "145 510.4",
            "145 psi 510.4 mL/min",
            "correct 1 58 0.2307",
            "0.5 0.6 bar",
        ],
    );
    for words in [
        "58 bar is far beyond the range of the transducer, which ends at 16 bar",
        "145 bar is far beyond",
        "R0001 point 2: 9.9973",
        "\"bar\" in \"0.6 bar\" is a unit of pressure, and a flow is asked for",
    ] {
        assert!(talk.says(words), "{words:?} is not in\n{}", talk.text);
    }
    assert_eq!(talk.desk().points().len(), 2);
    // Without a range only the other points tell.
    let toml: String =
        RUN.lines().filter(|line| !line.starts_with("range")).map(|line| format!("{line}\n")).collect();
    write(&bench.folder, &toml, b"");
    let talk =
        bench.asked("A", &["", "", POINTS[0], "145 0.5104", "145 bar 0.5104 L/min", "8 417", "0.2 0.03"]);
    assert!(talk.says("its flow for each bar would be 0.076 times theirs"), "{}", talk.text);
    assert!(talk.says("8 bar 417 L/min does not go with the other points"), "{}", talk.text);
    assert_eq!(talk.desk().points().len(), 3, "{}", talk.text);
}

#[test]
fn numbers_are_read_in_the_units_that_were_stated() {
    let bench = Bench::new("units").with_run();
    let unit = |kind: Kind, text: &str| -> Option<Unit> { Some(lookup(kind, text).unwrap()) };
    let manner = ebbline::cli::enter::Manner {
        pressure_unit: unit(Kind::Pressure, "psi"),
        flow_unit: unit(Kind::Flow, "mL/min"),
        ..Default::default()
    };
    let talk = bench.asked_in("A", &["", "", "145.0377 510.4", "10 bar 0.5104 L/min", "list"], &manner);
    assert!(talk.says("R0001 point 1: 145.0377 psi 510.4 mL/min"), "{}", talk.text);
    assert!(talk.says("R0001 point 2: 145.0377 psi 510.4 mL/min"), "{}", talk.text);
    let absolute = ebbline::cli::enter::Manner { absolute: true, ..Default::default() };
    let talk = bench.asked_in("A", &["", "", "11.0 0.51", "-0.1 0.5"], &absolute);
    assert!(talk.says("R0002 point 1: 11 bar absolute 0.51 L/min"), "{}", talk.text);
    assert!(talk.says("an absolute pressure is never below zero"), "{}", talk.text);
    // Going on with it keeps it absolute.
    assert!(bench.again("R0002", &["12 0.55"]).text.contains("point 2: 12 bar absolute"));
}

// ---- from a pipe ----

#[test]
fn piped_points_say_the_same_as_the_file_with_these_readings() {
    let bench = Bench::new("same-as-file");
    write(&bench.folder, RUN, readings().as_bytes());
    let (fitted, _, _) = said(&bench.program(&["bench", "fit", "run.toml", "--json"], ""));
    let mut typed = String::from("# invented\n\n");
    for row in readings().lines().skip(1) {
        typed.push_str(&format!(
            "{}\n",
            row.replace("rising", "up").replace("falling", "down").replace(',', " ")
        ));
    }
    typed.push_str("done\n");
    let arguments = [
        "bench",
        "enter",
        "CMF-0417",
        "--from",
        "run.toml",
        "--json",
        "--taken",
        "2026-11-12T09:40:00+11:00",
    ];
    let (stdout, stderr, status) = said(&bench.program(&arguments, &typed));
    assert_eq!(status, 0, "{stderr}");
    let document: serde_json::Value = serde_json::from_str(&stdout).unwrap();
    assert_eq!(document["run"], "R0001");
    assert_eq!(
        (&document["open"], document["points"].as_array().unwrap().len()),
        (&serde_json::json!(false), 19)
    );
    assert_eq!(document["points"][1]["sweep"], "rising");
    let mut fitted: serde_json::Value = serde_json::from_str(&fitted).unwrap();
    let mut typed_fit = document["fit"].clone();
    for fit in [&mut fitted, &mut typed_fit] {
        fit["notes"] = serde_json::Value::Null;
    }
    assert_eq!(fitted, typed_fit);
    assert!(stderr.contains("R0001 point 19: "), "the talk goes to stderr: {stderr}");
    bench.holds();
}

#[test]
fn a_pipe_is_acknowledged_line_by_line_without_prompts_and_stays_open_at_its_end() {
    let bench = Bench::new("pipe").with_run();
    let typed = format!("zero 0.0001 L/min\n{}\n{}\n8\n0.4170 up\n", POINTS[0], POINTS[1]);
    let (stdout, stderr, status) =
        said(&bench.program(&["bench", "enter", "A", "--from", "run.toml"], &typed));
    assert_eq!(status, 0, "{stderr}");
    assert!(stderr.contains("a new book was begun"), "{stderr}");
    let lines: Vec<&str> = stdout.lines().filter(|line| line.starts_with("R0001 point")).collect();
    assert_eq!(
        lines,
        [
            "R0001 point 1: 4 bar 0.2307 L/min",
            "R0001 point 2: 6 bar 0.324 L/min",
            "R0001 point 3: 8 bar 0.417 L/min up"
        ]
    );
    assert!(
        stdout.starts_with("meter at no flow before the run: 0.0001 L/min\nR0001 is begun for A"),
        "{stdout}"
    );
    assert!(!stdout.contains('>') && !stdout.contains('['), "no prompt: {stdout}");
    assert!(stdout.ends_with("R0001 stays open with 3 points, go on with: bench resume R0001\n"), "{stdout}");
    let rest = format!("{}\ndone\n", POINTS[3..].join("\n"));
    let (stdout, stderr, status) = said(&bench.program(&["bench", "resume", "R0001"], &rest));
    assert_eq!(status, 0, "{stderr}");
    assert!(
        stdout.starts_with("R0001 point 4: 10 bar 0.5104 L/min\n  1 more point for a line\n"),
        "{stdout}"
    );
    assert!(stdout.contains("PASS — A: ") && stdout.contains("bench accept R0001"), "{stdout}");
    let (stdout, _, status) = said(&bench.program(&["bench", "accept", "R0001"], ""));
    assert_eq!((status, stdout.contains("PASS")), (0, true), "{stdout}");
    bench.holds();
}

#[test]
fn what_is_needed_and_not_said_is_taken_from_the_first_lines() {
    let bench = Bench::new("needed").with_register();
    let first = "meter FM-01\nPT-01\nbarometer 1009.2 hPa ± 1 hPa\n21 °C\n";
    let (stdout, stderr, status) = said(
        &bench.program(&["bench", "enter", "A", "--acceptance", "VALVE"], &format!("{first}{}\n", POINTS[0])),
    );
    assert_eq!((status, stdout.contains("R0001 point 1: ")), (0, true), "{stderr}");
    let error = |input: &str, words: &[&str]| {
        let (stdout, stderr, status) = said(&bench.program(&["bench", "enter", "A"], input));
        assert_eq!((status, stdout.as_str()), (2, ""), "{input:?}: {stderr}");
        for word in words {
            assert!(stderr.contains(word), "{word:?} is not in {stderr:?}");
        }
        assert_eq!(stderr.lines().filter(|line| !line.starts_with("note: ")).count(), 1, "{stderr}");
    };
    error("", &["ended before the flow meter"]);
    error(
        &format!("{}\n", POINTS[0]),
        &["line 1 of the input", "the flow meter", "--meter", "nothing was recorded"],
    );
    error("FM-01\nPT-02\n", &["line 2", "no transducer PT-02", "PT-01"]);
    error("FM-01\nPT-01\n\n1009.2 bar\n", &["line 4", "--barometer", "1009200 hPa", "unit"]);
    error("FM-01\nPT-01\n1009.2 hPa\n", &["ended before the gas temperature"]);
    error("FM-01\nPT-01\n1009.2 hPa\n21 °C\n", &["no point", "nothing was recorded"]);
    assert_eq!(bench.run(1).changes.len(), 0);
    bench.holds();
}

#[test]
fn a_wrong_line_of_a_pipe_is_named_and_what_was_acknowledged_stays() {
    let bench = Bench::new("wrong-lines").with_run();
    for (i, (line, words)) in [
        ("10,02 0,4831", &["comma", "10.02"][..]),
        ("10.02 bar 0.4831 slpm", &["slpm", "reads_at"]),
        ("ten", &["ten", "help"]),
        ("nan 0.4", &["nan"]),
        ("10.02 -0.1", &["negative"]),
        ("-1.5 0.1", &["-1 bar"]),
        ("correct 7 10 0.51", &["no point 7"]),
        ("strike 1", &["reason"]),
        ("strike 1 \u{202e}why", &["the reason"]),
        ("done", &["5 usable", "quit"]),
        ("zero 0.0002", &["unit"]),
        ("1002 0.51", &["far beyond"]),
        ("\u{1b}]0;title\u{7}", &["\\u{1b}"]),
    ]
    .into_iter()
    .enumerate()
    {
        let run = format!("R{:04}", i + 1);
        let typed = format!("{}\n{}\n{line}\n{}\n", POINTS[0], POINTS[1], POINTS[2]);
        let (stdout, stderr, status) =
            said(&bench.program(&["bench", "enter", "A", "--from", "run.toml"], &typed));
        assert_eq!(status, 2, "{line:?}: {stderr}");
        assert!(
            stdout.contains(&format!("{run} point 2: ")) && !stdout.contains("point 3"),
            "{line:?}: {stdout}"
        );
        let said = stderr.lines().find(|line| line.starts_with("ebbline: ")).unwrap();
        assert!(
            said.contains("line 3 of the input: ") && said.contains(&format!("bench resume {run}")),
            "{said}"
        );
        for word in words {
            assert!(said.contains(word), "{word:?} is not in {said:?}");
        }
        assert!(!said.chars().any(char::is_control), "{said:?}");
        assert_eq!(bench.points(i as u32 + 1), 2);
    }
    // Bytes that are no text, and a line without end.
    for line in [&b"\xFF\xFE 0.4\n"[..], &[b'9'; 20_000]] {
        let mut typed = format!("{}\n", POINTS[0]).into_bytes();
        typed.extend_from_slice(line);
        let (_, stderr, status) =
            said(&bench.program_bytes(&["bench", "enter", "A", "--from", "run.toml"], &typed));
        assert_eq!((status, stderr.contains("line 2 of the input")), (2, true), "{stderr}");
    }
    // With --json nothing is on stdout then.
    let (stdout, stderr, status) =
        said(&bench.program(&["bench", "enter", "A", "--from", "run.toml", "--json"], "10 0.51\nten\n"));
    assert_eq!((status, stdout.as_str()), (2, ""), "{stderr}");
    bench.holds();
}

#[test]
fn hostile_names_and_options_are_refused_in_one_sentence_and_leave_nothing() {
    let bench = Bench::new("hostile").with_run();
    let long = "x".repeat(33);
    let refused = |arguments: &[&str], word: &str| {
        let (stdout, stderr, status) = said(&bench.program(arguments, "10 0.51\n"));
        assert_eq!((status, stdout.as_str()), (2, ""), "{arguments:?}: {stderr}");
        assert!(stderr.contains(word), "{arguments:?}: {word:?} is not in {stderr:?}");
        assert!(!stderr.trim_end().chars().any(|c| c.is_control() && c != '\n'), "{stderr:?}");
    };
    for name in ["../x", "a b", "", "R0001", "x.toml", "a\nb", "\u{1b}[2J", "a'; DROP TABLE run;--", &long] {
        refused(&["bench", "enter", name, "--from", "run.toml"], "name");
    }
    for (option, text, word) in [
        ("--meter", "FM-9", "no flow meter FM-9"),
        ("--meter", "no/such.toml", "no such file"),
        ("--transducer", "run.csv", "no transducer run.csv"),
        ("--acceptance", "LAX", "no acceptance LAX"),
        ("--gas", "argon", "oxygen, air"),
        ("--gas", "air", "gas_factor"),
        ("--oxygen", "99.5", "unit"),
        ("--oxygen", "101 %", "at most 100 %"),
        ("--purpose", "fun", "as-found"),
        ("--barometer", "1009.2", "unit"),
        ("--barometer", "1009.2 bar", "unit"),
        ("--temperature", "21", "unit"),
        ("--temperature", "-300 °C", "absolute zero"),
        ("--taken", "today", "offset"),
        ("--technician", "\u{1b}[31mRed", "visible"),
        ("--pressure-unit", "barg", "barg"),
        ("--flow-unit", "sccm", "sccm"),
    ] {
        refused(&["bench", "enter", "A", "--from", "run.toml", option, text], word);
    }
    for file in ["run.csv", "missing.toml"] {
        refused(&["bench", "enter", "A", "--from", file], file);
    }
    assert!(!bench.book().exists());
    for (run, word) in [("R0001", "no book"), ("CMF-0417", "is no run"), ("\u{1b}[2J", "is no run")] {
        refused(&["bench", "resume", run], word);
    }
    // Names of other scripts are names.
    for (i, name) in ["Düse-4", "орифис_1", "孔板.7", &"é".repeat(32)].into_iter().enumerate() {
        let (stdout, stderr, status) = said(&bench.program(
            &["bench", "enter", name, "--from", "run.toml", "--technician", "Ж \"x\" 'y'"],
            "10 0.51\n",
        ));
        assert_eq!((status, stdout.contains(name)), (0, true), "{stderr}");
        assert_eq!(bench.run(i as u32 + 1).run.orifice.as_str(), name);
    }
    refused(&["bench", "resume", "R0099"], "no run R0099");
    bench.holds();
}

#[test]
fn an_imported_run_cannot_be_typed_into() {
    let bench = Bench::new("imported");
    write(&bench.folder, RUN, readings().as_bytes());
    assert_eq!(said(&bench.program(&["bench", "import", "run.toml"], "")).2, 0);
    let (stdout, stderr, status) = said(&bench.program(&["bench", "resume", "R0001"], "10 0.51\n"));
    assert_eq!((status, stdout.as_str(), stderr.contains("R0001 is complete")), (2, "", true), "{stderr}");
}

#[test]
fn limits_of_the_orifice_are_not_replaced_by_those_of_a_file() {
    let bench = Bench::new("own-limits").with_register().with_run();
    bench.register_orifice("OWN", "VALVE");
    let typed = format!("{}\ndone\n", POINTS.join("\n"));
    let (stdout, stderr, status) =
        said(&bench.program(&["bench", "enter", "own", "--from", "run.toml"], &typed));
    assert_eq!(status, 0, "{stderr}");
    assert!(stderr.contains("judged by the limits VALVE of the orifice"), "{stderr}");
    // VALVE allows 0.40 L/min ± 5 %; the file 0.48 L/min.
    assert!(stdout.contains("FAIL — OWN: ") && stdout.contains("0.3800 to 0.4200"), "{stdout}");
    assert_eq!(bench.run(1).run.orifice.as_str(), "OWN");
    let arguments = ["bench", "enter", "OWN", "--from", "run.toml", "--acceptance", "none"];
    assert_eq!(said(&bench.program(&arguments, &typed)).2, 0);
}

#[test]
fn a_reader_that_goes_away_ends_the_talk_quietly() {
    let bench = Bench::new("closed").with_run();
    let (stderr, status) =
        bench.program_unheard(&["bench", "enter", "A", "--from", "run.toml"], "4 0.2307\n6 0.324\n");
    assert_eq!(status, 0, "{stderr}");
    assert!(!stderr.contains("panicked") && bench.points(1) >= 1, "{stderr}");
    bench.holds();
}

#[test]
fn a_purity_that_is_stated_is_kept_and_one_that_is_not_is_said() {
    let bench = Bench::new("purity").with_run();
    let arguments = ["bench", "enter", "A", "--from", "run.toml", "--oxygen", "99.95 % ± 0.02 %"];
    let (_, stderr, status) = said(&bench.program(&arguments, "10 0.51\n"));
    assert_eq!((status, stderr.contains("purity")), (0, false), "{stderr}");
    let purity = bench.run(1).run.purity.unwrap();
    assert!((purity.fraction - 0.9995).abs() < 1e-12 && (purity.expanded - 0.0002).abs() < 1e-12);
    let (_, stderr, _) = said(&bench.program(&arguments[..5], "10 0.51\n"));
    assert!(stderr.contains("no purity of the oxygen is stated: taken as 99.5 % ± 0.3 %"), "{stderr}");
}

#[test]
fn a_line_that_does_not_rise_is_said_without_a_crossing() {
    let bench = Bench::new("flat").with_run();
    let typed: String = (0..8).map(|i| format!("{} 0.4{}\n", 5 + i, 10 - i)).collect();
    let (stdout, stderr, status) =
        said(&bench.program(&["bench", "enter", "A", "--from", "run.toml"], &typed));
    assert_eq!(status, 0, "{stderr}");
    assert!(!stdout.contains("inf ") && !stdout.contains("NaN"), "{stdout}");
}

#[test]
fn readings_typed_are_kept_to_the_last_bit() {
    let bench = Bench::new("bits").with_run();
    let typed = "10.017 0.48313\n145.3 psi 483.1 mL/min\n";
    assert_eq!(said(&bench.program(&["bench", "enter", "A", "--from", "run.toml"], typed)).2, 0);
    let Readings::Points(points) = bench.run(1).run.readings else { panic!("no points") };
    assert_eq!(points[0].flow.as_l_min().to_bits(), 0.48313_f64.to_bits());
    assert_eq!(points[0].pressure.shown_pa().to_bits(), (10.017 * 1e5_f64).to_bits());
    assert_eq!(points[1].flow.as_l_min().to_bits(), (483.1 / 1000.0_f64).to_bits());
}
