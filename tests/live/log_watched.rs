//! A run that one process logs and others look at: who holds it, who may not, and what they see.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::Read as _;
use std::time::Duration;

use ebbline::entry::RunNumber;

use crate::logged::{Bench, now_s};

#[test]
fn another_process_sees_the_run_and_cannot_log_it() {
    let bench = Bench::new("watched", &["--seed", "77", "--script", "6 bar 600 s"]);
    let run = RunNumber::new(1).unwrap();
    let mut logging = bench.child(&["bench", "log", "WATCHED", "--by-itself", "--for", "14 s"]);
    bench.wait_for("the run", || {
        bench.book().exists() && bench.program(&["bench", "show", "R0001"]).status.success()
    });
    // The newest reading in the book is of this very second.
    std::thread::sleep(Duration::from_secs(3));
    let newest = bench.kept(run, "rig-flow").last().unwrap().0;
    assert!((now_s() - newest).abs() < 2.0, "{} s old", now_s() - newest);
    // One who watches is told who logs, sees values, and ends with the other.
    let watching = bench.program(&["bench", "resume", "R0001", "--by-itself"]);
    let says = String::from_utf8_lossy(&watching.stdout).into_owned();
    assert!(watching.status.success(), "{}", String::from_utf8_lossy(&watching.stderr));
    assert!(says.contains(&format!("process {}", logging.id())), "{says}");
    assert!(says.contains("L/min") && says.contains("bar"), "{says}");
    logging.wait().unwrap();
    // Nobody types into it either.
    let mut out = String::new();
    logging.stdout.take().unwrap().read_to_string(&mut out).unwrap();
    assert!(out.contains("point 1"), "{out}");
    assert_eq!(bench.open().live_points(run).unwrap().len(), 1, "one level, one point, whoever watched");
    // It was left open, and whoever comes next may go on at once.
    let again = bench.program(&["bench", "resume", "R0001", "--by-itself", "--for", "1 s"]);
    assert!(again.status.success(), "{}", String::from_utf8_lossy(&again.stderr));
    let shown = bench.program(&["bench", "show", "R0001", "--json"]);
    let shown: serde_json::Value = serde_json::from_slice(&shown.stdout).unwrap();
    assert_eq!(shown["origin"], "logged");
    bench.holds();
    // Raw readings travel with an export.
    let exported = bench.program(&["book", "export", "out"]);
    assert!(exported.status.success(), "{}", String::from_utf8_lossy(&exported.stderr));
    let raw = std::fs::read_to_string(bench.folder.join("out/runs/R0001/R0001-raw.csv")).unwrap();
    let kept = bench.kept(run, "rig-flow").len() + bench.kept(run, "rig-ip").len();
    assert!(raw.lines().count() > kept, "{} lines, {kept} readings of two instruments", raw.lines().count());
}

#[test]
fn without_a_reading_nothing_is_recorded_and_the_status_says_that_an_instrument_failed() {
    let bench = Bench::new(
        "silent",
        &["--seed", "78", "--fault", "rig-flow silence always", "--fault", "rig-ip silence always"],
    );
    let with = [
        "bench",
        "log",
        "SILENT",
        "--barometer",
        "1009 hPa ± 1 hPa",
        "--temperature",
        "21 °C ± 1 °C",
        "--for",
        "2 s",
    ];
    let ended = bench.program(&with);
    assert_eq!(ended.status.code(), Some(3), "{}", String::from_utf8_lossy(&ended.stdout));
    assert!(String::from_utf8_lossy(&ended.stderr).contains("instrument try"));
    assert!(!bench.program(&["bench", "show", "R0001"]).status.success());
}
