//! Sessions in the book: imported, entered, left out, listed.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use crate::book_support::{
    Folder, QUICK, begin, id, import, import_session, run, session, session_files, stamped, time,
};
use ebbline::book::{
    Book, BookError, Entry, Origin, SessionQuery, SessionRecorded, SessionSource, SessionToImport,
};
use ebbline::entry::{
    CellSignal, Diver, LineReference, LoopKept, Orifice, Place, Session, SessionLeftOut, SessionNumber,
};

fn number(n: u32) -> SessionNumber {
    SessionNumber::new(n).unwrap()
}

fn numbers(book: &Book, query: &SessionQuery) -> Vec<u32> {
    book.sessions(query).unwrap().iter().map(|row| row.number.get()).collect()
}

#[test]
fn an_imported_session_comes_back_with_its_line_and_its_files() {
    let folder = Folder::new("session-import");
    let mut book = begin(&folder.book());
    let first = import_session(&mut book, &session("D-07", 1200, 0.7), "couch-1");
    assert_eq!(
        first,
        SessionRecorded { number: number(1), new: true, diver_created: true, orifice_created: false }
    );
    assert_eq!(first.number.to_string(), "S0001");
    assert_eq!(book.entry::<Diver>(&id("d-07")).unwrap().unwrap().entry, Diver::bare(id("D-07")));
    // Nothing of the run behind the line enters the registers or the list of runs.
    assert!(book.entries::<Orifice>(None, None).unwrap().is_empty());
    let second = import_session(&mut book, &session("d-07", 60, 0.7), "couch-2");
    assert_eq!((second.number, second.diver_created), (number(2), false));
    drop(book);

    let book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!(record.session, session("D-07", 1200, 0.7));
    assert_eq!(record.line_run, Some(run("CMF-0417", 20)));
    assert_eq!((record.number, record.origin), (number(1), Origin::Imported));
    assert_eq!(record.recorded, time("2026-11-12T10:00:00+11:00"));
    assert!(record.left_out.is_empty());
    let files = session_files(&record.session, "couch-1");
    assert_eq!(book.session_source_of(number(1)).unwrap(), Some(files));
    let (info, check) = (book.info().unwrap(), book.check(&[]).unwrap());
    assert_eq!((info.runs, info.sessions, check.runs, check.sessions, check.wrong), (0, 2, 0, 2, None));
    let missing = book.session(number(3)).unwrap_err();
    assert_eq!(missing.to_string(), format!("there is no session S0003 in {}", folder.book().display()));
    assert!(missing.is_of_the_call());
    assert!(matches!(book.session_source_of(number(3)), Err(BookError::NoSuchSession { .. })));
}

#[test]
fn an_orifice_that_a_session_names_is_created_once_and_bare() {
    let folder = Folder::new("session-orifice");
    let mut book = begin(&folder.book());
    let named = |orifice: &str| Session {
        line: Some(LineReference::Orifice(id(orifice))),
        ..session("D-07", 60, 0.7)
    };
    let one = |book: &mut Book, session: &Session, text: &str| {
        let files = SessionSource { line: None, ..session_files(session, text) };
        let item = SessionToImport { session, line_run: None, files: &files };
        let recorded = stamped(|stamp| book.import_sessions(&[item], stamp)).unwrap()[0];
        assert_eq!(book.session_source_of(recorded.number).unwrap(), Some(files));
        recorded
    };
    assert!(one(&mut book, &named("CMF-0417"), "a").orifice_created);
    assert!(!one(&mut book, &named("cmf-0417"), "b").orifice_created);
    import(&mut book, &run("B", 5), "one");
    let recorded = one(&mut book, &named("b"), "c");
    assert_eq!((recorded.orifice_created, recorded.diver_created), (false, false));
    let orifices = book.entries::<Orifice>(None, None).unwrap();
    assert_eq!(orifices.len(), 2);
    assert_eq!(orifices[1].entry, Orifice::bare(id("CMF-0417")));
    assert_eq!(book.session(recorded.number).unwrap().line_run, None);
}

#[test]
fn the_same_bytes_again_name_the_session_and_add_nothing() {
    let folder = Folder::new("session-again");
    let mut book = begin(&folder.book());
    let (a, b) = (session("D-07", 60, 0.7), session("D-08", 60, 0.71));
    import_session(&mut book, &a, "one");
    let before = book.info().unwrap().head;
    let again = import_session(&mut book, &a, "one");
    assert_eq!((again.number, again.new, again.diver_created), (number(1), false, false));
    assert_eq!(book.info().unwrap().head, before);
    // Twice in one import; and another run file behind the same session and readings is another session.
    let (one, two) = (session_files(&a, "one"), session_files(&b, "two"));
    let mut other_line = one.clone();
    other_line.line.as_mut().unwrap().file.push(b'\n');
    let without = SessionSource { line: None, ..one.clone() };
    let item = |session, files| SessionToImport { session, line_run: None, files };
    let items = [item(&b, &two), item(&b, &two), item(&a, &one), item(&a, &other_line), item(&a, &without)];
    let recorded = stamped(|stamp| book.import_sessions(&items, stamp)).unwrap();
    let told: Vec<(u32, bool)> = recorded.iter().map(|one| (one.number.get(), one.new)).collect();
    assert_eq!(told, [(2, true), (2, false), (1, false), (3, true), (4, true)]);
    assert!(recorded[0].diver_created && !recorded[1].diver_created);
}

#[test]
fn an_entered_session_has_no_files_and_is_new_each_time() {
    let folder = Folder::new("session-enter");
    let mut book = begin(&folder.book());
    stamped(|stamp| book.add(Entry::Diver(Diver::bare(id("D-07"))), stamp)).unwrap();
    let mut typed = session("d-07", 3, 0.7);
    typed.line = Some(LineReference::Orifice(id("CMF-0417")));
    typed.place = Place::Pool;
    typed.readings.depth_m = Some(vec![1.2, f64::NAN, 1.3]);
    if let CellSignal::Bar(readings) = &mut typed.readings.cells[1].signal {
        readings[2] = f64::NAN;
    }
    for n in 1..=2 {
        let recorded = stamped(|stamp| book.enter_session(&typed, stamp)).unwrap();
        let expected =
            SessionRecorded { number: number(n), new: true, diver_created: false, orifice_created: n == 1 };
        assert_eq!(recorded, expected);
        let record = book.session(number(n)).unwrap();
        assert_eq!((record.origin, record.line_run.is_none()), (Origin::Entered, true));
        // A missing reading comes back as missing, which equality would not show.
        assert_eq!(format!("{:?}", record.session), format!("{typed:?}"));
        assert_eq!(book.session_source_of(number(n)).unwrap(), None);
    }
    let empty = session("D-07", 0, 0.7);
    let recorded = stamped(|stamp| book.enter_session(&empty, stamp)).unwrap();
    assert_eq!(book.session(recorded.number).unwrap().session, empty);
    let row = book.sessions(&SessionQuery::default()).unwrap().remove(0);
    assert_eq!((row.readings, row.cells), (0, 3));
    assert!(row.minutes.abs() < 1e-12, "nought, not unknown");
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn a_list_tells_of_sessions_the_newest_first_a_page_at_a_time() {
    let folder = Folder::new("session-list");
    let mut book = begin(&folder.book());
    for n in 0..6 {
        let mut one = session(["D-07", "d-07", "D-08"][n % 3], 60 * (n + 1) + 1, 0.7);
        if n == 5 {
            one.kept = LoopKept::Sealed;
            one.place = Place::Pool;
            // Two minutes before, and between: the list takes the earliest and the latest.
            one.readings.time_s[7] = -120.0;
        }
        import_session(&mut book, &one, &format!("couch {n}"));
    }
    stamped(|stamp| book.leave_out_of_session(number(2), None, "had run", None, stamp)).unwrap();
    for from in [10.0, 20.0] {
        let stretch = Some((from, from + 5.0));
        stamped(|stamp| book.leave_out_of_session(number(3), stretch, "coughed", None, stamp)).unwrap();
    }
    let query = |diver: Option<&str>, limit, offset| SessionQuery { diver: diver.map(id), limit, offset };
    assert_eq!(numbers(&book, &SessionQuery::default()), [6, 5, 4, 3, 2, 1]);
    assert_eq!(numbers(&book, &query(Some("D-07"), None, 0)), [5, 4, 2, 1], "whatever the case of the code");
    assert_eq!(numbers(&book, &query(Some("d-08"), None, 0)), [6, 3]);
    assert_eq!(numbers(&book, &query(None, Some(2), 0)), [6, 5]);
    assert_eq!(numbers(&book, &query(None, Some(2), 4)), [2, 1]);
    assert_eq!(numbers(&book, &query(Some("D-07"), Some(2), 1)), [4, 2]);
    assert_eq!(numbers(&book, &query(None, None, 5)), [1]);
    assert!(numbers(&book, &query(Some("D-09"), None, 0)).is_empty());

    let rows = book.sessions(&SessionQuery::default()).unwrap();
    let newest = &rows[0];
    assert_eq!((newest.diver.as_str(), newest.place, newest.kept), ("D-08", Place::Pool, LoopKept::Sealed));
    assert_eq!(
        (newest.taken, newest.recorded),
        (time("2026-11-20T18:05:00+11:00"), time("2026-11-12T10:00:00+11:00"))
    );
    assert_eq!((newest.cells, newest.readings), (3, 361));
    // By hand: from −120 s to 360 s are 480 s.
    assert!((newest.minutes - 8.0).abs() < 1e-12, "{}", newest.minutes);
    // By hand: 121 readings, one a second, are two minutes.
    assert!((rows[4].minutes - 2.0).abs() < 1e-12, "{}", rows[4].minutes);
    let out: Vec<(bool, usize)> = rows.iter().map(|row| (row.left_out, row.stretches_left_out)).collect();
    assert_eq!(out, [(false, 0), (false, 0), (false, 0), (false, 2), (true, 0), (false, 0)]);
}

#[test]
fn what_is_left_out_is_kept_in_order_with_its_reason_and_the_readings_stay() {
    let folder = Folder::new("session-left-out");
    let mut book = begin(&folder.book());
    let one = session("D-07", 601, 0.7);
    import_session(&mut book, &one, "couch");
    let mut leave_out = |stretch, why: &str, by| {
        stamped(|stamp| book.leave_out_of_session(number(1), stretch, why, by, stamp))
    };
    leave_out(Some((60.0, 90.5)), "mask off", Some("I. Varga")).unwrap();
    // The first and the last second are within; a stretch may reach past the readings.
    leave_out(Some((600.0, 700.0)), "stood up", None).unwrap();
    leave_out(None, "fever next day", None).unwrap();
    for (stretch, why, says) in [
        (None, "again", "session S0001 is already left out"),
        (Some((60.0, 90.5)), "again", "session S0001 is already left out from 60 s to 90.5 s"),
        (Some((1.0, 2.0)), " \t", "nothing is left out of session S0001 without a reason: say why"),
        (
            Some((90.0, 60.0)),
            "x",
            "session S0001 has no reading from 90 s to 60 s: a stretch goes from an earlier to a later time within its \
             readings, 0 s to 600 s",
        ),
        (
            Some((600.5, 700.0)),
            "x",
            "session S0001 has no reading from 600.5 s to 700 s: a stretch goes from an earlier to a later time within \
             its readings, 0 s to 600 s",
        ),
    ] {
        let refused = leave_out(stretch, why, None).unwrap_err();
        assert_eq!(refused.to_string(), says);
        assert!(refused.is_of_the_call());
    }
    for stretch in [(f64::NAN, 5.0), (5.0, f64::NAN), (0.0, f64::INFINITY), (-20.0, -10.0)] {
        let refused = leave_out(Some(stretch), "x", None).unwrap_err();
        assert!(matches!(refused, BookError::NoSuchStretch { .. }), "{refused}");
    }
    let missing = stamped(|stamp| book.leave_out_of_session(number(2), None, "x", None, stamp)).unwrap_err();
    assert!(matches!(missing, BookError::NoSuchSession { .. }));
    let typed = session("D-07", 0, 0.7);
    let empty = stamped(|stamp| book.enter_session(&typed, stamp)).unwrap().number;
    let refused = stamped(|stamp| book.leave_out_of_session(empty, Some((0.0, 1.0)), "x", None, stamp));
    assert!(refused.unwrap_err().to_string().ends_with("within its readings, and it has none"));

    let record = book.session(number(1)).unwrap();
    assert_eq!(record.session, one);
    let at = time("2026-11-12T10:00:00+11:00");
    let out = |stretch_s, why: &str, by: Option<&str>| SessionLeftOut {
        stretch_s,
        why: why.into(),
        by: by.map(str::to_owned),
        at,
    };
    let expected = [
        out(Some((60.0, 90.5)), "mask off", Some("I. Varga")),
        out(Some((600.0, 700.0)), "stood up", None),
        out(None, "fever next day", None),
    ];
    assert_eq!(record.left_out, expected);
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn twenty_minutes_of_three_cells_take_about_as_much_as_their_numbers_and_files() {
    let folder = Folder::new("session-size");
    let mut book = begin(&folder.book());
    let mut file_bytes = 0;
    for n in 0..20 {
        let one = session("D-07", 1200, 0.7 + 0.001 * n as f64);
        let files = session_files(&one, &format!("couch {n}"));
        let line = files.line.as_ref().unwrap();
        file_bytes += [&files.session_file, &files.readings, &line.file, &line.readings]
            .map(Vec::len)
            .iter()
            .sum::<usize>();
        import_session(&mut book, &one, &format!("couch {n}"));
    }
    drop(book);
    let size = std::fs::metadata(folder.book()).unwrap().len() as usize;
    // Eight bytes for each time and each reading of three cells.
    let numbers = 20 * 1200 * 4 * 8;
    println!("a session: {} bytes, of which {} are its files", size / 20, file_bytes / 20);
    assert!(size < (numbers + file_bytes) * 6 / 5, "{size} for {numbers} and {file_bytes}");
}
