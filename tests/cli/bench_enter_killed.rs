//! The program is killed while points are typed: what it acknowledged is in the book, the book holds, and the run goes
//! on where it stopped.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::{Read as _, Write as _};
use std::time::Duration;

use crate::bench_files::said;
use crate::hands::{Bench, points_of};

/// Lines typed at once; more than are read before any kill.
const LINES: usize = 4_000;

/// The point typed on a line: different for every line, so that one that got lost or doubled shows.
fn typed(line: usize) -> (f64, f64) {
    let bar = 4.0 + (line % 17) as f64 * 0.5;
    (bar, 0.0466 * (bar + 0.95) + 1e-5 * line as f64)
}

/// Numbers from one to the next, to be killed at moments nobody chose.
fn next(state: &mut u64) -> u64 {
    *state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
    *state >> 33
}

#[test]
fn nothing_acknowledged_is_lost_at_whatever_moment_it_is_killed() {
    // More of them by EBBLINE_KILLS; a fixed sequence of moments, but what is cut off differs every time.
    let kills: u32 = std::env::var("EBBLINE_KILLS").map_or(8, |kills| kills.parse().unwrap());
    let bench = Bench::new("killed").with_run();
    let script: String = (0..LINES)
        .map(|line| {
            let (bar, flow) = typed(line);
            format!("{bar:.3} {flow:.5}\n")
        })
        .collect();
    let (mut state, mut began, mut cut_short) = (417, 0_u32, 0);
    for kill in 0..kills {
        let mut child = bench.child(&["bench", "enter", "A", "--from", "run.toml"]);
        let (mut input, mut out) = (child.stdin.take().unwrap(), child.stdout.take().unwrap());
        let script = script.clone();
        // The pipe breaks when the child is killed before it took everything.
        let typing = std::thread::spawn(move || input.write_all(script.as_bytes()));
        let hearing = std::thread::spawn(move || {
            let mut said = Vec::new();
            let _ = out.read_to_end(&mut said);
            said
        });
        std::thread::sleep(Duration::from_millis(30 + next(&mut state) % 600));
        child.kill().unwrap();
        child.wait().unwrap();
        let _ = typing.join().unwrap();
        let said_text = String::from_utf8_lossy(&hearing.join().unwrap()).into_owned();
        // A half line was not acknowledged.
        let whole = said_text.rfind('\n').map_or("", |end| &said_text[..end]);
        let acknowledged: Vec<&str> =
            whole.lines().filter(|line| line.starts_with('R') && line.contains(" point ")).collect();
        if !bench.book().exists() {
            assert!(acknowledged.is_empty(), "kill {kill}: {whole}");
            continue;
        }
        bench.holds();
        let listed = said(&bench.program(&["bench", "list", "--json", "--all"], ""));
        let runs: serde_json::Value = serde_json::from_str(&listed.0).unwrap();
        let runs = runs.as_array().unwrap().len() as u32;
        if runs == began {
            assert!(acknowledged.is_empty(), "kill {kill}: {whole}");
            continue;
        }
        began = runs;
        let record = bench.run(began);
        let points = points_of(&record.run);
        assert!(
            points.len() >= acknowledged.len(),
            "kill {kill}: {} of {}",
            points.len(),
            acknowledged.len()
        );
        assert!(
            points.len() <= acknowledged.len() + 1,
            "kill {kill}: one point at most is not acknowledged yet"
        );
        cut_short += u32::from(points.len() < LINES);
        for (line, point) in points.iter().enumerate() {
            let (bar, flow) = typed(line);
            assert!((point.pressure.shown_pa() / 1e5 - bar).abs() < 1e-9, "kill {kill}, point {}", line + 1);
            assert!((point.flow.as_l_min() - flow).abs() < 1e-9, "kill {kill}, point {}", line + 1);
        }
        for (line, said) in acknowledged.iter().enumerate() {
            assert!(said.starts_with(&format!("R{began:04} point {}: ", line + 1)), "kill {kill}: {said}");
        }
        let (stdout, stderr, status) =
            said(&bench.program(&["bench", "resume", &format!("R{began:04}")], "4.25 bar 0.2424 L/min\n"));
        assert_eq!(status, 0, "kill {kill}: {stderr}");
        assert!(
            stdout.starts_with(&format!("R{began:04} point {}: ", points.len() + 1)),
            "kill {kill}: {stdout}"
        );
    }
    assert!(began >= kills / 2, "only {began} of {kills} runs had begun before the kill: it comes too early");
    assert!(cut_short >= kills / 2, "only {cut_short} of {kills} were cut short: it comes too late");
    bench.holds();
}
