//! Ten programs at once, and programs killed at random moments: nothing acknowledged is lost, the chain holds.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use std::io::{BufRead, BufReader, Write};
use std::path::Path;
use std::process::{Child, Command, Stdio};
use std::sync::mpsc;
use std::time::Duration;

use crate::book_support::{
    self, Folder, begin, decision, files, import, import_session, named, point, run, session, session_files,
    stamped,
};
use ebbline::book::{Book, Options, RunState, SessionQuery};
use ebbline::entry::{Readings, RunNumber, SessionNumber};

/// Where a program started by a test finds its book.
const BOOK: &str = "EBBLINE_TEST_BOOK";
/// What tells it from the others.
const NAME: &str = "EBBLINE_TEST_NAME";

/// This test program again, running `test` alone as a program of its own.
fn again(test: &str, book: &Path, name: &str) -> Child {
    let mut command = Command::new(std::env::current_exe().unwrap());
    command.args([&named(module_path!(), test), "--exact", "--nocapture", "--test-threads=1"]);
    command.env(BOOK, book).env(NAME, name).stdout(Stdio::piped()).stderr(Stdio::null());
    command.spawn().unwrap()
}

/// Says on standard output that something is recorded; it was said only if the whole line was.
fn acknowledge(what: &str) {
    let mut out = std::io::stdout().lock();
    out.write_all(format!("\nrecorded {what} .\n").as_bytes()).unwrap();
    out.flush().unwrap();
}

fn acknowledged(line: &str) -> Option<String> {
    Some(line.strip_prefix("recorded ")?.strip_suffix(" .")?.to_owned())
}

/// Imports, enters and decides until it is killed.
fn works_until_killed(path: &Path, name: &str) {
    let mut book = begin(path);
    for n in 0.. {
        let orifice = format!("{name}-{n}");
        let number = import(&mut book, &run(&orifice, 20), &orifice).number;
        acknowledge(&format!("import {number} {orifice}"));
        stamped(|stamp| book.decide(number, decision(0.48), stamp)).unwrap();
        acknowledge(&format!("decision {number}"));
        let typed = stamped(|stamp| book.begin_run(&run(&orifice, 0), stamp)).unwrap().number;
        acknowledge(&format!("begun {typed} {orifice}"));
        for index in 0..4 {
            stamped(|stamp| book.add_points(typed, vec![point(index)], stamp)).unwrap();
            acknowledge(&format!("point {typed} {}", index + 1));
        }
        stamped(|stamp| book.finish_run(typed, stamp)).unwrap();
        acknowledge(&format!("finished {typed}"));
        let number = import_session(&mut book, &session(&orifice, 20, 0.7), &orifice).number;
        acknowledge(&format!("session {number} {orifice}"));
        stamped(|stamp| book.leave_out_of_session(number, None, "coughed", None, stamp)).unwrap();
        acknowledge(&format!("left-out {number}"));
    }
}

/// Whether what was acknowledged is in the book.
fn is_there(book: &Book, said: &str) -> bool {
    let words: Vec<&str> = said.split(' ').collect();
    if let Some(number) = SessionNumber::parse(words[1]) {
        let Ok(record) = book.session(number) else { return false };
        if words[0] == "left-out" {
            return record.left_out.len() == 1;
        }
        let files = session_files(&record.session, words[2]);
        let same = record.session == session(words[2], 20, 0.7);
        let line = record.line_run == Some(run("CMF-0417", 20));
        return same && line && book.session_source_of(number).unwrap() == Some(files);
    }
    let Ok(record) = book.run(RunNumber::parse(words[1]).unwrap()) else { return false };
    let points = match &record.run.readings {
        Readings::Points(points) => points.clone(),
        Readings::Series(_) => return false,
    };
    match words[0] {
        "import" => {
            record.run == run(words[2], 20) && book.source_of(record.number).unwrap() == Some(files(words[2]))
        }
        "decision" => record.decisions == [decision(0.48)],
        "begun" => record.run.orifice.as_str() == words[2],
        "point" => {
            let number: usize = words[2].parse().unwrap();
            points.get(number - 1) == Some(&point(number - 1))
        }
        "finished" => record.state == RunState::Complete && points.len() == 4,
        other => panic!("{other}"),
    }
}

#[test]
fn nothing_acknowledged_is_missing_after_a_kill_at_any_moment() {
    if let Some(book) = std::env::var_os(BOOK) {
        return works_until_killed(Path::new(&book), &std::env::var(NAME).unwrap());
    }
    // More of them by EBBLINE_KILLS; a fixed sequence of moments, but what is cut off differs every time.
    let kills: u64 = std::env::var("EBBLINE_KILLS").map_or(12, |kills| kills.parse().unwrap());
    let folder = Folder::new("kills");
    let mut state: u64 = 417;
    let mut next = |below: u64| {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (state >> 33) % below
    };
    let mut all = Vec::new();
    for kill in 0..kills {
        // The first four are killed while the book is begun, or before.
        let path = if kill < 4 { folder.0.join(format!("begun-{kill}.db")) } else { folder.book() };
        let test = "nothing_acknowledged_is_missing_after_a_kill_at_any_moment";
        let mut child = again(test, &path, &format!("k{kill}"));
        let (say, heard) = mpsc::channel();
        let out = BufReader::new(child.stdout.take().unwrap());
        let listener = std::thread::spawn(move || {
            for said in out.lines().map_while(Result::ok).filter_map(|line| acknowledged(&line)) {
                let _ = say.send(said);
            }
        });
        let mut said = Vec::new();
        if kill >= 4 {
            let wanted = 1 + next(40) as usize;
            while said.len() < wanted {
                said.push(heard.recv_timeout(Duration::from_secs(60)).expect("the program says something"));
            }
            std::thread::sleep(Duration::from_micros(next(6_000)));
        } else {
            std::thread::sleep(Duration::from_micros(2_000 + kill * 4_000));
        }
        child.kill().unwrap();
        child.wait().unwrap();
        listener.join().unwrap();
        said.extend(heard.try_iter());
        if kill < 4 {
            // Whatever was there when it died: opening begins the book or finds a whole one.
            let book = begin(&path);
            assert_eq!(book.check(&[]).unwrap().wrong, None);
            assert!(said.iter().all(|said| is_there(&book, said)));
            continue;
        }
        all.extend(said);
        let book = Book::open(&path, &Options::default()).unwrap();
        let check = book.check(&[]).unwrap();
        assert_eq!(check.wrong, None, "after kill {kill}");
        let missing: Vec<&String> = all.iter().filter(|said| !is_there(&book, said)).collect();
        assert!(missing.is_empty(), "after kill {kill}: {missing:?}");
    }
    assert!(all.len() as u64 >= kills.saturating_sub(4), "{} acknowledged", all.len());
}

const WRITERS: usize = 10;
const RUNS_EACH: usize = 12;

fn writes_its_runs(path: &Path, name: &str) {
    let mut book = begin(path);
    for n in 0..RUNS_EACH {
        let orifice = format!("{name}-{n}");
        let recorded = import(&mut book, &run(&orifice, 20), &orifice);
        assert!(recorded.new && recorded.orifice_created);
        if n % 4 == 0 {
            let recorded = import_session(&mut book, &session(&orifice, 20, 0.7), &orifice);
            assert!(recorded.new && recorded.diver_created);
        }
    }
}

fn all_is_there(path: &Path) {
    let book = Book::open_to_read(path, &Options::default()).unwrap();
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.runs), (None, (WRITERS * RUNS_EACH) as u64));
    // Numbers without a gap, none given twice.
    let sessions = book.sessions(&SessionQuery::default()).unwrap();
    let numbers: Vec<u32> = sessions.iter().rev().map(|row| row.number.get()).collect();
    assert_eq!(numbers, (1..=(WRITERS * RUNS_EACH / 4) as u32).collect::<Vec<_>>());
    for row in sessions {
        assert_eq!(book.session(row.number).unwrap().session, session(&row.diver, 20, 0.7));
    }
    for writer in 0..WRITERS {
        for n in 0..RUNS_EACH {
            let orifice = format!("w{writer}-{n}");
            let history = book.history(&book_support::id(&orifice), None).unwrap();
            assert_eq!(history.len(), 1, "{orifice}");
            assert_eq!(book.run(history[0].run.number).unwrap().run, run(&orifice, 20));
        }
    }
}

#[test]
fn ten_programs_that_write_at_once_wait_for_each_other_and_lose_nothing() {
    if let Some(book) = std::env::var_os(BOOK) {
        return writes_its_runs(Path::new(&book), &std::env::var(NAME).unwrap());
    }
    let folder = Folder::new("programs");
    // None of them finds a book: they also begin it at once.
    let test = "ten_programs_that_write_at_once_wait_for_each_other_and_lose_nothing";
    let children: Vec<Child> =
        (0..WRITERS).map(|writer| again(test, &folder.book(), &format!("w{writer}"))).collect();
    for child in children {
        let done = child.wait_with_output().unwrap();
        assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stdout));
    }
    all_is_there(&folder.book());
    assert_eq!(folder.names(), ["book.db"]);
}

#[test]
fn ten_threads_with_connections_of_their_own_lose_nothing() {
    let folder = Folder::new("threads");
    let path = folder.book();
    std::thread::scope(|scope| {
        for writer in 0..WRITERS {
            let path = &path;
            scope.spawn(move || writes_its_runs(path, &format!("w{writer}")));
        }
    });
    all_is_there(&path);
}
