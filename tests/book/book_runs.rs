//! Runs in the book: imported, entered, judged, listed.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use crate::book_support::{Folder, QUICK, begin, decision, files, id, import, point, run, stamped, time};
use ebbline::book::{Book, BookError, Change, Entry, Opening, Options, Origin, RunQuery, RunState, ToImport};
use ebbline::entry::{Orifice, Readings, RunNumber, SeriesReadings};

fn number(text: &str) -> RunNumber {
    RunNumber::parse(text).unwrap()
}

#[test]
fn a_book_is_begun_with_its_folder_and_says_so() {
    let folder = Folder::new("begun");
    let path = folder.0.join("ébb line/ledger/book.db");
    let book = begin(&path);
    assert_eq!(book.opening(), Opening::BegunWithFolder);
    drop(book);
    assert_eq!(begin(&path).opening(), Opening::Found);
    let other = folder.0.join("other.db");
    assert_eq!(begin(&other).opening(), Opening::Begun);
    // Nothing else is left in the folder: no log, no scratch file.
    assert_eq!(folder.names(), ["other.db", "ébb line"]);
}

#[test]
fn an_imported_run_gets_a_number_its_orifice_and_its_files_back() {
    let folder = Folder::new("import");
    let mut book = begin(&folder.book());
    let first = import(&mut book, &run("CMF-0417", 20), "one");
    assert_eq!((first.number.to_string().as_str(), first.new, first.orifice_created), ("R0001", true, true));
    let second = import(&mut book, &run("cmf-0417", 20), "two");
    assert_eq!((second.number.to_string().as_str(), second.orifice_created), ("R0002", false));
    let orifice = book.entry::<Orifice>(&id("CMF-0417")).unwrap().unwrap();
    assert_eq!(orifice.entry, Orifice::bare(id("CMF-0417")));

    let record = book.run(number("R0002")).unwrap();
    assert_eq!(record.run, run("cmf-0417", 20));
    assert_eq!((record.origin, record.state), (Origin::Imported, RunState::Complete));
    assert_eq!(record.recorded, time("2026-11-12T10:00:00+11:00"));
    assert_eq!(book.source_of(number("R0002")).unwrap(), Some(files("two")));
    assert!(matches!(book.run(number("R0003")), Err(BookError::NoSuchRun { .. })));
    assert!(matches!(book.source_of(number("R0003")), Err(BookError::NoSuchRun { .. })));
}

#[test]
fn the_same_bytes_again_find_the_run_and_add_nothing() {
    let folder = Folder::new("again");
    let mut book = begin(&folder.book());
    import(&mut book, &run("A", 5), "one");
    import(&mut book, &run("A", 5), "two");
    let before = book.info().unwrap();
    let again = import(&mut book, &run("A", 5), "one");
    assert_eq!((again.number, again.new), (number("R0001"), false));
    let (a, b) = (run("A", 5), files("three"));
    let twice = [ToImport { run: &a, files: &b }, ToImport { run: &a, files: &b }];
    let recorded = stamped(|stamp| book.import_many(&twice, stamp)).unwrap();
    assert_eq!(recorded[0].number, recorded[1].number);
    assert_eq!((recorded[0].new, recorded[1].new), (true, false));
    let after = book.info().unwrap();
    assert_eq!((before.runs, after.runs, after.head.seq), (2, 3, before.head.seq + 3));
}

#[test]
fn a_typed_run_is_entered_corrected_struck_resumed_and_finished() {
    let folder = Folder::new("enter");
    let mut book = begin(&folder.book());
    let r1 = stamped(|stamp| book.begin_run(&run("A", 0), stamp)).unwrap().number;
    for index in 0..4 {
        let given = stamped(|stamp| book.add_points(r1, vec![point(index)], stamp)).unwrap();
        assert_eq!(given, index + 1);
    }
    drop(book);

    let mut book = Book::open(&folder.book(), &Options::default()).unwrap();
    let open = RunQuery { open_only: true, ..RunQuery::default() };
    assert_eq!(book.runs(&open).unwrap()[0].number, r1);
    stamped(|stamp| book.correct_point(r1, 2, point(9), stamp)).unwrap();
    stamped(|stamp| book.correct_point(r1, 2, point(10), stamp)).unwrap();
    stamped(|stamp| book.strike_point(r1, 3, "typed twice", stamp)).unwrap();
    assert_eq!(stamped(|stamp| book.add_points(r1, vec![point(4), point(5)], stamp)).unwrap(), 5);
    let mut header = run("A", 0);
    header.before.leak_pa_s = Some(2.5);
    stamped(|stamp| book.restate_run(r1, &header, stamp)).unwrap();

    let gone = stamped(|stamp| book.correct_point(r1, 3, point(1), stamp)).unwrap_err();
    assert_eq!(gone.to_string(), "point 3 of run R0001 is already left out");
    let none = stamped(|stamp| book.strike_point(r1, 7, "", stamp)).unwrap_err();
    assert_eq!(none.to_string(), "run R0001 has no point 7: its points are 1 to 6");
    assert!(stamped(|stamp| book.strike_point(r1, 0, "", stamp)).is_err());
    let other = stamped(|stamp| book.restate_run(r1, &run("B", 0), stamp)).unwrap_err();
    assert!(matches!(other, BookError::AnotherRun { .. }) && other.is_of_the_call());
    let early = stamped(|stamp| book.decide(r1, decision(0.48), stamp)).unwrap_err();
    assert_eq!(early.to_string(), "run R0001 is still being entered: finish it first");

    stamped(|stamp| book.finish_run(r1, stamp)).unwrap();
    let late = stamped(|stamp| book.add_points(r1, vec![point(4)], stamp)).unwrap_err();
    assert!(matches!(late, BookError::Complete { .. }), "{late}");
    assert!(book.runs(&open).unwrap().is_empty());

    let record = book.run(r1).unwrap();
    let expected = [0, 10, 2, 3, 4, 5].map(point).to_vec();
    assert_eq!(record.run.readings, Readings::Points(expected));
    assert_eq!(record.run.before.leak_pa_s, Some(2.5));
    assert_eq!((record.origin, record.state), (Origin::Entered, RunState::Complete));
    let out: Vec<_> = record.run.left_out.iter().map(|out| (out.point, out.why.as_str())).collect();
    assert_eq!(out, [(3, "struck: typed twice")]);
    // Nothing is overwritten: what stood there can still be seen.
    assert!(matches!(record.changes[0], Change::Corrected { point: 2, before, .. } if before == point(1)));
    assert!(matches!(record.changes[1], Change::Corrected { point: 2, before, .. } if before == point(9)));
    assert!(matches!(&record.changes[2], Change::Struck { point: 3, why, .. } if why == "typed twice"));
    assert!(matches!(record.changes[3], Change::Restated { .. }));
    assert_eq!(book.source_of(r1).unwrap(), None);
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn a_series_cannot_be_typed_but_is_imported() {
    let folder = Folder::new("series");
    let mut book = begin(&folder.book());
    let mut series = run("A", 0);
    series.readings = Readings::Series(SeriesReadings {
        time_s: (0..10_000).map(f64::from).collect(),
        pressure_pa: vec![1e6; 10_000],
        flow_l_min: vec![0.5; 10_000],
        ..SeriesReadings::default()
    });
    let refused = stamped(|stamp| book.begin_run(&series, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::NotPoints));
    let number = import(&mut book, &series, "series").number;
    assert_eq!(book.run(number).unwrap().run, series);
    stamped(|stamp| book.leave_out(number, 12, "door", None, stamp)).unwrap();
    assert_eq!(book.run(number).unwrap().run.left_out[0].point, 12);
}

#[test]
fn a_point_is_left_out_once_with_its_reason_and_a_decision_before_it_is_marked() {
    let folder = Folder::new("judge");
    let mut book = begin(&folder.book());
    let r1 = import(&mut book, &run("A", 6), "one").number;
    assert_eq!(book.decision(r1).unwrap(), None);
    stamped(|stamp| book.decide(r1, decision(0.48), stamp)).unwrap();
    assert!(!book.run(r1).unwrap().changed_since_decision);
    stamped(|stamp| book.leave_out(r1, 6, "the hose was kinked", Some("I. Varga"), stamp)).unwrap();
    assert!(book.run(r1).unwrap().changed_since_decision);
    for (point, sentence) in [
        (6, "point 6 of run R0001 is already left out"),
        (7, "run R0001 has no point 7: its points are 1 to 6"),
        (0, "run R0001 has no point 0: its points are 1 to 6"),
    ] {
        let refused = stamped(|stamp| book.leave_out(r1, point, "x", None, stamp)).unwrap_err();
        assert_eq!(refused.to_string(), sentence);
        assert!(refused.is_of_the_call());
    }
    stamped(|stamp| book.decide(r1, decision(0.47), stamp)).unwrap();
    let record = book.run(r1).unwrap();
    assert!(!record.changed_since_decision);
    assert_eq!(record.decisions, [decision(0.48), decision(0.47)]);
    assert_eq!(book.decision(r1).unwrap(), Some(decision(0.47)));
    assert!(matches!(&record.changes[..], [Change::LeftOut { point: 6, why, by: Some(by), .. }]
        if why == "the hose was kinked" && by == "I. Varga"));
}

#[test]
fn lists_come_a_page_at_a_time_newest_first_with_the_stored_figures() {
    let folder = Folder::new("lists");
    let mut book = begin(&folder.book());
    for index in 0..7 {
        let orifice = if index % 2 == 0 { "A" } else { "B" };
        let mut made = run(orifice, 5);
        // The second of A was taken before the first: history goes by when they were taken.
        made.taken = time(&format!("2026-0{}-01T08:00:00+11:00", if index == 2 { 1 } else { index + 2 }));
        import(&mut book, &made, &format!("{index}"));
    }
    stamped(|stamp| book.decide(number("R0001"), decision(0.481), stamp)).unwrap();
    stamped(|stamp| book.decide(number("R0005"), decision(0.475), stamp)).unwrap();
    stamped(|stamp| book.decide(number("R0005"), decision(0.476), stamp)).unwrap();
    let page = RunQuery { limit: Some(3), ..RunQuery::default() };
    let names = |rows: Vec<ebbline::book::RunRow>| {
        rows.iter().map(|row| row.number.to_string()).collect::<Vec<_>>().join(" ")
    };
    assert_eq!(names(book.runs(&page).unwrap()), "R0007 R0006 R0005");
    let next = RunQuery { before: Some(number("R0005")), ..page };
    assert_eq!(names(book.runs(&next).unwrap()), "R0004 R0003 R0002");
    assert_eq!(book.runs(&RunQuery::default()).unwrap().len(), 7);
    let row = book.runs(&page).unwrap().remove(2);
    let shown = row.decision.unwrap();
    assert_eq!((shown.flow_l_min, shown.expanded_l_min), (Some(0.476), Some(1.96 * 0.0021)));
    assert_eq!((row.orifice.as_str(), row.technician.as_deref()), ("A", Some("I. Varga")));

    let history = book.history(&id("a"), None).unwrap();
    let order: Vec<_> = history.iter().map(|row| row.run.number.to_string()).collect();
    assert_eq!(order, ["R0007", "R0005", "R0001", "R0003"]);
    assert_eq!(history[1].decision, Some(decision(0.476)));
    assert_eq!(history[0].decision, None);
    assert_eq!(book.history(&id("A"), Some(2)).unwrap().len(), 2);
    assert!(book.history(&id("nobody"), None).unwrap().is_empty());

    let before = |run| book.decided_before(&id("A"), number(run)).unwrap().map(|(n, d)| (n.to_string(), d));
    assert_eq!(before("R0007"), Some(("R0005".into(), decision(0.476))));
    assert_eq!(before("R0005"), Some(("R0001".into(), decision(0.481))));
    assert_eq!(before("R0001"), None);
    assert_eq!(before("R0003"), None);
}

#[test]
fn a_book_open_for_reading_refuses_to_write() {
    let folder = Folder::new("read");
    drop(begin(&folder.book()));
    let mut book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let entry = Entry::Orifice(Orifice::bare(id("A")));
    let refused = stamped(|stamp| book.add(entry, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::ReadingOnly { .. }));
    assert_eq!(folder.names().iter().filter(|name| !name.starts_with("book.db")).count(), 0);
    drop(book);
    assert_eq!(folder.names(), ["book.db"]);
}
