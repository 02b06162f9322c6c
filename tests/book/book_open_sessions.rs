//! Sessions recorded row by row: begun, added to, corrected, struck, finished, erased.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use crate::book_support::{Folder, QUICK, begin, id, run, session, stamped};
use ebbline::book::{
    Book, BookError, Forgotten, Origin, RowContent, RunState, SessionChange, SessionQuery, SessionRecorded,
};
use ebbline::entry::{
    CellSignal, Event, Injection, LineReference, Place, Session, SessionNumber, SessionReadings, What,
};

fn number(n: u32) -> SessionNumber {
    SessionNumber::new(n).unwrap()
}

/// A session without readings and events, whose cells are not known yet.
fn header(diver: &str) -> Session {
    Session { readings: SessionReadings::default(), events: Vec::new(), ..session(diver, 0, 0.7) }
}

/// One row of a session of three cells.
fn row(at_s: f64, po2: f64) -> SessionReadings {
    let mut readings = session("x", 0, 0.0).readings;
    readings.time_s = vec![at_s];
    for (cell, more) in readings.cells.iter_mut().zip([0.0, 0.01, 0.02]) {
        cell.signal = CellSignal::Bar(vec![po2 + more]);
    }
    readings
}

const OFF: Event = Event { at_s: 0.0, what: What::Injection(Injection::Off) };

fn add(book: &mut Book, at_s: f64, po2: f64) {
    stamped(|stamp| book.add_session_readings(number(1), &row(at_s, po2), stamp)).unwrap();
}

#[test]
fn rows_come_one_by_one_and_are_put_together_in_their_order() {
    let folder = Folder::new("open-session");
    let mut book = begin(&folder.book());
    let mut header = header("D-07");
    header.line = Some(LineReference::Orifice(id("CMF-0417")));
    let begun = stamped(|stamp| book.begin_session(&header, Some(&run("CMF-0417", 9)), stamp)).unwrap();
    let expected =
        SessionRecorded { number: number(1), new: true, diver_created: true, orifice_created: true };
    assert_eq!(begun, expected);
    assert_eq!(book.session(number(1)).unwrap().session, header);
    // An event before the first reading, when nobody knows yet how many cells there are.
    stamped(|stamp| book.add_session_event(number(1), &OFF, stamp)).unwrap();
    add(&mut book, 0.0, 0.9);
    add(&mut book, 30.0, 0.89);
    let stop = Event { at_s: 30.0, what: What::Stop };
    stamped(|stamp| book.add_session_event(number(1), &stop, stamp)).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!((record.state, record.origin, record.rows.len()), (RunState::Open, Origin::Entered, 4));
    assert_eq!(record.line_run, Some(run("CMF-0417", 9)));
    let mut readings = row(0.0, 0.9);
    readings.time_s.push(30.0);
    for (cell, po2) in readings.cells.iter_mut().zip([0.89, 0.89 + 0.01, 0.89 + 0.02]) {
        let (CellSignal::Bar(column) | CellSignal::Volts { readings: column, .. }) = &mut cell.signal;
        column.push(po2);
    }
    let whole = Session { readings, events: vec![OFF, stop], ..header };
    assert_eq!(record.session, whole);
    assert_eq!(record.changes, [], "that the cells became known is no correction");
    let listed = book.sessions(&SessionQuery::default()).unwrap().remove(0);
    assert_eq!((listed.state, listed.cells, listed.readings), (RunState::Open, 3, 2));
    assert!((listed.minutes - 0.5).abs() < 1e-12);

    stamped(|stamp| book.finish_session(number(1), stamp)).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!((record.state, &record.session), (RunState::Complete, &whole));
    let listed = book.sessions(&SessionQuery::default()).unwrap().remove(0);
    assert_eq!((listed.state, listed.cells, listed.readings), (RunState::Complete, 3, 2));
    assert!((listed.minutes - 0.5).abs() < 1e-12);
    type Step = fn(&mut Book) -> Result<(), BookError>;
    let more: [Step; 4] = [
        |book| stamped(|stamp| book.add_session_event(number(1), &OFF, stamp)),
        |book| stamped(|stamp| book.add_session_readings(number(1), &row(60.0, 0.8), stamp)),
        |book| stamped(|stamp| book.strike_session_row(number(1), 1, "why", stamp)),
        |book| stamped(|stamp| book.finish_session(number(1), stamp)),
    ];
    for more in more {
        let refused = more(&mut book).unwrap_err();
        assert!(
            matches!(refused, BookError::SessionComplete { .. }) && refused.is_of_the_call(),
            "{refused}"
        );
    }
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn what_was_there_at_the_beginning_is_its_first_rows() {
    let folder = Folder::new("open-session-rows");
    let mut book = begin(&folder.book());
    let first = Session { readings: row(0.0, 0.9), events: vec![OFF], ..header("D-07") };
    stamped(|stamp| book.begin_session(&first, None, stamp)).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!((record.session, record.rows.len()), (first, 2));
}

#[test]
fn a_correction_names_the_record_before_and_a_struck_row_keeps_its_number() {
    let folder = Folder::new("open-session-changes");
    let mut book = begin(&folder.book());
    stamped(|stamp| book.begin_session(&header("D-07"), None, stamp)).unwrap();
    stamped(|stamp| book.add_session_event(number(1), &OFF, stamp)).unwrap();
    for n in 0..4 {
        add(&mut book, 30.0 * f64::from(n), 0.9);
    }
    let right = row(60.0, 0.87);
    stamped(|stamp| book.correct_session_readings(number(1), 4, &right, stamp)).unwrap();
    stamped(|stamp| book.correct_session_readings(number(1), 4, &row(61.0, 0.87), stamp)).unwrap();
    let moved = Event { at_s: 30.0, ..OFF };
    stamped(|stamp| book.correct_session_event(number(1), 1, &moved, stamp)).unwrap();
    stamped(|stamp| book.strike_session_row(number(1), 3, "mask off", stamp)).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!(record.session.readings.time_s, [0.0, 61.0, 90.0]);
    assert_eq!(record.session.events, [moved]);
    assert_eq!(record.rows[2].struck.as_deref(), Some("mask off"));
    let RowContent::Readings(corrected) = &record.rows[3].content else { panic!("{:?}", record.rows[3]) };
    assert_eq!(corrected, &[61.0, 0.87, 0.87 + 0.01, 0.87 + 0.02]);
    let changed: Vec<String> = record
        .changes
        .iter()
        .map(|change| match change {
            SessionChange::Corrected { row, before, .. } => format!("{row} {before:?}"),
            SessionChange::Struck { row, why, .. } => format!("{row} struck {why}"),
            SessionChange::Restated { .. } => "restated".into(),
        })
        .collect();
    assert!(
        changed[0].starts_with("4 Readings([60.0, 0.9,") && changed[1].starts_with("4 Readings([60.0, 0.87")
    );
    assert!(changed[2].starts_with("1 Event") && changed[3] == "3 struck mask off", "{changed:?}");
    for (row, refused) in [
        (3, "row 3 of session S0001 is already struck"),
        (6, "session S0001 has no row 6: its rows are 1 to 5"),
        (0, "session S0001 has no row 0: its rows are 1 to 5"),
        (1, "row 1 of session S0001 is an event: strike it with the reason, and record the other anew"),
    ] {
        let says = stamped(|stamp| book.correct_session_readings(number(1), row, &right, stamp)).unwrap_err();
        assert_eq!((says.to_string().as_str(), says.is_of_the_call()), (refused, true));
    }
    let says = stamped(|stamp| book.correct_session_event(number(1), 2, &OFF, stamp)).unwrap_err();
    assert!(says.to_string().starts_with("row 2 of session S0001 holds readings"), "{says}");
    let says = stamped(|stamp| book.strike_session_row(number(1), 2, " ", stamp)).unwrap_err();
    assert!(matches!(says, BookError::NoReason { .. }), "{says}");
    // The list counts what stands, and a stretch is held against what stands.
    let listed = book.sessions(&SessionQuery::default()).unwrap().remove(0);
    assert_eq!(listed.readings, 3);
    let outside = Some((91.0, 99.0));
    let says =
        stamped(|stamp| book.leave_out_of_session(number(1), outside, "why", None, stamp)).unwrap_err();
    assert!(says.to_string().ends_with("within its readings, 0 s to 90 s"), "{says}");
    stamped(|stamp| book.finish_session(number(1), stamp)).unwrap();
    let says =
        stamped(|stamp| book.leave_out_of_session(number(1), outside, "why", None, stamp)).unwrap_err();
    assert!(says.to_string().ends_with("within its readings, 0 s to 90 s"), "{says}");
    stamped(|stamp| book.leave_out_of_session(number(1), Some((0.0, 61.0)), "why", None, stamp)).unwrap();
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn what_stands_around_the_rows_can_be_restated_but_not_whose_session_it_is() {
    let folder = Folder::new("open-session-restated");
    let mut book = begin(&folder.book());
    let first = header("D-07");
    stamped(|stamp| book.begin_session(&first, None, stamp)).unwrap();
    add(&mut book, 0.0, 0.9);
    let with_cells = book.session(number(1)).unwrap().session;
    let told = Session { loop_volume: None, mass: None, ..with_cells.clone() };
    stamped(|stamp| book.restate_session(number(1), &told, stamp)).unwrap();
    let record = book.session(number(1)).unwrap();
    assert_eq!(record.session, told, "the rows stay whatever the header brought along");
    assert!(matches!(record.changes[..], [SessionChange::Restated { .. }]));
    for other in [
        Session { diver: id("D-08"), ..told.clone() },
        Session { place: Place::Pool, ..told.clone() },
        Session { taken: told.taken + chrono::TimeDelta::seconds(1), ..told.clone() },
        Session { readings: SessionReadings::default(), ..told.clone() },
    ] {
        let refused = stamped(|stamp| book.restate_session(number(1), &other, stamp)).unwrap_err();
        assert!(matches!(refused, BookError::AnotherSession { .. }), "{refused}");
    }
    let mut two_cells = row(30.0, 0.9);
    two_cells.cells.pop();
    let mut with_depth = row(30.0, 0.9);
    with_depth.depth_m = Some(vec![1.0]);
    let mut uneven = row(30.0, 0.9);
    uneven.time_s.push(60.0);
    for other in [two_cells, with_depth, uneven] {
        let refused = stamped(|stamp| book.add_session_readings(number(1), &other, stamp)).unwrap_err();
        assert!(matches!(refused, BookError::OtherColumns { .. }), "{refused}");
    }
    let missing = stamped(|stamp| book.finish_session(number(2), stamp)).unwrap_err();
    assert!(matches!(missing, BookError::NoSuchSession { .. }), "{missing}");
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn a_session_that_came_whole_takes_no_rows() {
    let folder = Folder::new("open-session-whole");
    let mut book = begin(&folder.book());
    stamped(|stamp| book.enter_session(&session("D-07", 60, 0.7), stamp)).unwrap();
    assert_eq!(book.session(number(1)).unwrap().state, RunState::Complete);
    let refused = stamped(|stamp| book.add_session_readings(number(1), &row(99.0, 0.7), stamp)).unwrap_err();
    assert!(matches!(refused, BookError::SessionComplete { .. }), "{refused}");
}

#[test]
fn forgetting_the_diver_takes_an_open_session_and_one_that_was_finished() {
    let folder = Folder::new("open-session-forgotten");
    let mut book = begin(&folder.book());
    // Marks that stand nowhere else: a name, a reading, a reason.
    const READING: f64 = 0.812_345_678_9;
    for _ in 0..2 {
        stamped(|stamp| book.begin_session(&header("D-Ottilie"), None, stamp)).unwrap();
    }
    for n in [1, 2] {
        let add = |book: &mut Book, at_s| {
            stamped(|stamp| book.add_session_readings(number(n), &row(at_s, READING), stamp)).unwrap();
        };
        add(&mut book, 0.0);
        add(&mut book, 30.0);
        stamped(|stamp| book.add_session_event(number(n), &OFF, stamp)).unwrap();
        stamped(|stamp| book.correct_session_readings(number(n), 2, &row(31.0, READING), stamp)).unwrap();
        stamped(|stamp| book.strike_session_row(number(n), 2, "Ottilie laughed", stamp)).unwrap();
    }
    stamped(|stamp| book.finish_session(number(2), stamp)).unwrap();
    let seen = |folder: &Folder| -> Vec<String> {
        let mut seen = Vec::new();
        for name in folder.names() {
            let bytes = std::fs::read(folder.0.join(&name)).unwrap();
            let holds = |part: &[u8]| bytes.windows(part.len()).any(|window| window == part);
            if holds(b"Ottilie") || holds(b"d-ottilie") || holds(&READING.to_le_bytes()) {
                seen.push(name);
            }
        }
        seen
    };
    assert!(!seen(&folder).is_empty(), "what is to go must be seen while it is there");
    let head = book.info().unwrap().head;
    let done = stamped(|stamp| book.forget_diver(&id("d-ottilie"), "asked to", stamp)).unwrap();
    // The diver; of each session the header, its cells, two readings, an event, a correction and a strike; that one is
    // finished.
    let Forgotten::Done { records, .. } = done else { panic!("{done:?}") };
    assert_eq!(records, 1 + 2 * 7 + 1);
    assert_eq!(seen(&folder), Vec::<String>::new());
    let refused = stamped(|stamp| book.add_session_event(number(1), &OFF, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::SessionErased { .. }), "{refused}");
    drop(book);
    let book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let check = book.check(&[head]).unwrap();
    assert_eq!((check.wrong, check.sessions), (None, 0));
}

#[test]
fn adding_a_row_reads_none_of_those_before() {
    let folder = Folder::new("open-session-cheap");
    let mut book = begin(&folder.book());
    stamped(|stamp| book.begin_session(&header("D-07"), None, stamp)).unwrap();
    for n in 0..400 {
        add(&mut book, 0.5 * f64::from(n), 0.9);
    }
    // Records are added and none is written again: the chain is as long as there were calls, with the diver, the
    // beginning of the book, the header and its cells.
    assert_eq!(book.info().unwrap().head.seq, 400 + 4);
    // A row that can no longer be read is met by whoever reads the session, and not by whoever adds to it.
    drop(book);
    let raw = rusqlite::Connection::open(folder.book()).unwrap();
    raw.execute_batch("DROP TRIGGER payload_stays; UPDATE payload SET bytes = x'00' WHERE seq = 200")
        .unwrap();
    drop(raw);
    let mut book = Book::open(&folder.book(), &QUICK).unwrap();
    add(&mut book, 200.0, 0.9);
    assert!(matches!(book.session(number(1)).unwrap_err(), BookError::Damaged { .. }));
}
