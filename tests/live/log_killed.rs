//! The logger is killed at any moment: what was sent more than a second before is in the book, every point that was told
//! is there, the book holds, and the run goes on where it stopped. What was sent is known from the rig's own log.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use std::io::Read as _;
use std::process::Child;
use std::time::Duration;

use crate::logged::{Bench, now_s};
use ebbline::entry::RunNumber;

/// What may be missing of the last seconds before a kill.
const MAY_BE_MISSING_S: f64 = 1.0;
/// Longest way of a reading from the rig's log to the logger's stamp, on a machine that does other things too.
const ON_THE_WAY_S: f64 = 0.75;
/// Rigs at once, where there are many kills.
const MOST_RIGS: u32 = 4;

/// Numbers from one to the next, to be killed at moments nobody chose.
fn next(state: &mut u64) -> u64 {
    *state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
    *state >> 33
}

/// How long the logger lives, in seconds: mostly shorter than a point takes, every fourth time long enough for one.
fn lives_s(kill: u32, state: &mut u64) -> f64 {
    let chance = (next(state) % 1_000) as f64 / 1e3;
    if kill % 4 == 2 { 12.5 + 4.0 * chance } else { 0.2 + 3.0 * chance }
}

/// What a killed child had said.
fn killed(mut child: Child, after_s: f64) -> (f64, String) {
    let mut out = child.stdout.take().unwrap();
    let hearing = std::thread::spawn(move || {
        let mut said = Vec::new();
        let _ = out.read_to_end(&mut said);
        String::from_utf8_lossy(&said).into_owned()
    });
    std::thread::sleep(Duration::from_secs_f64(after_s));
    let killed_s = now_s();
    if child.try_wait().unwrap().is_some() {
        let mut says = String::new();
        child.stderr.take().unwrap().read_to_string(&mut says).unwrap();
        panic!("the logger ended by itself: {says}");
    }
    child.kill().unwrap();
    child.wait().unwrap();
    let said = hearing.join().unwrap();
    // A half line was not told.
    let whole = said.rfind('\n').map_or("", |end| &said[..end]);
    (killed_s, whole.to_owned())
}

/// The numbers of the points that were told.
fn told(said: &str) -> Vec<usize> {
    let of_a_point = said.lines().filter_map(|line| line.strip_prefix("point "));
    of_a_point.filter_map(|rest| rest.split([' ', ':']).next()?.parse().ok()).collect()
}

/// A rig whose logger is killed so many times; goes out: kills that left readings behind, and points.
fn study(rig: u32, kills: u32) -> (u32, usize) {
    let seed = (40 + rig).to_string();
    // Levels that a point can be taken at within the longer lives.
    let script = "4 bar 30 s, 6 bar 30 s, 8 bar 30 s, 10 bar 30 s, 7 bar 30 s, 5 bar 30 s, 9 bar 120 s";
    let bench = Bench::new(&format!("killed-{rig}"), &["--seed", &seed, "--script", script]);
    let run = RunNumber::new(1).unwrap();
    let (mut state, mut with_readings, mut told_in_all) = (900 + u64::from(rig), 0, Vec::new());
    let mut before: Vec<Vec<(f64, f64)>> = vec![Vec::new(); 2];
    for kill in 0..kills {
        let begun = bench.book().exists() && bench.program(&["bench", "show", "R0001"]).status.success();
        let child = if begun {
            bench.child(&["bench", "resume", "R0001", "--by-itself"])
        } else {
            bench.child(&["bench", "log", "KILLED", "--by-itself"])
        };
        let (killed_s, said) = killed(child, lives_s(kill, &mut state));
        bench.holds();
        told_in_all.extend(told(&said));
        if !bench.program(&["bench", "show", "R0001"]).status.success() {
            assert!(told_in_all.is_empty(), "rig {rig}, kill {kill}: {said}");
            continue;
        }
        let points = bench.open().live_points(run).unwrap().len();
        let numbers: Vec<usize> = (1..=told_in_all.len()).collect();
        assert_eq!(told_in_all, numbers, "rig {rig}, kill {kill}: each point is told once, in order");
        assert!(
            (told_in_all.len()..=told_in_all.len() + 1).contains(&points),
            "rig {rig}, kill {kill}: {points} points in the book, {} told",
            told_in_all.len()
        );
        // One that was in the book and not told any more counts as told from here on.
        told_in_all = (1..=points).collect();
        let mut any = false;
        for (of, instrument) in ["rig-flow", "rig-ip"].into_iter().enumerate() {
            let (kept, sent) = (bench.kept(run, instrument), bench.sent(instrument));
            assert_eq!(kept[..before[of].len()], before[of], "rig {rig}, kill {kill}: what was kept stays");
            let new = &kept[before[of].len()..];
            nothing_is_missing(new, &sent, killed_s, &format!("rig {rig}, kill {kill}, {instrument}"));
            any |= !new.is_empty();
            before[of] = kept;
        }
        with_readings += u32::from(any);
    }
    bench.holds();
    (with_readings, told_in_all.len())
}

/// What was sent from the first reading that was kept until a second before the kill is there, and nothing else.
fn nothing_is_missing(kept: &[(f64, f64)], sent: &[(f64, f64)], killed_s: f64, of: &str) {
    let Some((first_s, _)) = kept.first() else { return };
    let expected =
        sent.iter().filter(|(sent_s, _)| *sent_s > first_s + 0.01 && *sent_s < killed_s - MAY_BE_MISSING_S);
    let near = |a: &(f64, f64), b: &(f64, f64)| {
        (a.1 - b.1).abs() < 1e-9 * a.1.abs().max(1.0) && (a.0 - b.0).abs() < ON_THE_WAY_S
    };
    for reading in expected {
        assert!(kept.iter().any(|kept| near(kept, reading)), "{of}: {reading:?} was sent and is not there");
    }
    for reading in kept {
        assert!(sent.iter().any(|sent| near(sent, reading)), "{of}: {reading:?} is there and was never sent");
    }
}

#[test]
fn nothing_older_than_a_second_is_lost_at_whatever_moment_the_logger_is_killed() {
    // More of them by EBBLINE_KILLS, on several rigs at once.
    let kills: u32 = std::env::var("EBBLINE_KILLS").map_or(8, |kills| kills.parse().unwrap());
    let rigs = (kills / 4).clamp(1, MOST_RIGS);
    let studies: Vec<_> = (0..rigs).map(|rig| std::thread::spawn(move || study(rig, kills / rigs))).collect();
    let (mut with_readings, mut points) = (0, 0);
    for one in studies {
        let (of_one, points_of_one) = one.join().unwrap();
        with_readings += of_one;
        points += points_of_one;
    }
    assert!(with_readings >= kills / 2, "only {with_readings} of {kills} kills came after a reading");
    assert!(points >= 1, "no point was taken between any two kills: they come too early");
}

#[test]
fn a_killed_session_has_every_row_but_those_of_the_last_second() {
    // The rig's couch ebbs by itself; what is checked is that rows come without a gap up to a second before each kill.
    let kills: u32 = std::env::var("EBBLINE_KILLS").map_or(3, |kills| kills.parse::<u32>().unwrap() / 8);
    let bench = Bench::new("session-killed", &["--seed", "91"]);
    let session = ebbline::entry::SessionNumber::new(1).unwrap();
    let (mut state, mut rows_before) = (33, 0);
    for kill in 0..kills {
        let begun = bench.book().exists() && bench.program(&["session", "show", "S0001"]).status.success();
        let child = if begun {
            bench.child(&["session", "resume", "S0001"])
        } else {
            bench.child(&[
                "session",
                "log",
                "D-7",
                "--from",
                "rig/couch/session.toml",
                "--injection",
                "0.31 L/min",
                "--barometer",
                "1016 hPa",
            ])
        };
        let (killed_s, said) = killed(child, lives_s(1, &mut state) + 1.5);
        bench.holds();
        let book = bench.open();
        let Ok(record) = book.session(session) else { continue };
        let readings = &record.session.readings;
        let taken_s = record.session.taken.timestamp_millis() as f64 / 1e3;
        let new = &readings.time_s[rows_before..];
        for pair in new.windows(2) {
            assert!((pair[1] - pair[0] - 1.0).abs() < 1e-6, "kill {kill}: rows at {pair:?} s");
        }
        let newest_s = taken_s + new.last().copied().unwrap_or(f64::NEG_INFINITY);
        // A row a second, half a second until it is committed, and what may be missing.
        let due_s = killed_s - 1.0 - MAY_BE_MISSING_S;
        assert!(
            newest_s >= due_s || new.is_empty(),
            "kill {kill}: newest row at {newest_s}, killed at {killed_s}: {said}"
        );
        assert_eq!(record.session.events.len(), 1, "the injection, once");
        rows_before = readings.time_s.len();
    }
    assert!(rows_before >= kills as usize, "only {rows_before} rows in {kills} lives");
}
