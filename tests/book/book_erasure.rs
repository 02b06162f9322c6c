//! Forgetting a diver: no byte is left, the chain holds, and whoever still reads is told of.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use std::path::Path;

use crate::book_support::{
    Folder, QUICK, begin, id, import, import_session, run, session, session_files, stamped,
};
use ebbline::book::{
    Book, BookError, CopyKind, Entry, Forgotten, SessionQuery, SessionRecorded, SessionToImport,
};
use ebbline::entry::{Diver, Orifice, SessionNumber};
use rusqlite::Connection;

/// Texts that stand nowhere but with the diver who is forgotten; one of them fills pages of its own.
fn marks() -> Vec<String> {
    let long: String = (0..4000).map(|n| format!("Ottilie-{n:05};")).collect();
    let names = ["Ottilie Kjærgaard", "D-Ottilie", "d-ottilie"].map(str::to_owned);
    // Names and content of the session's files, who made the line's run, and what was left out by whom and why.
    let sessions = ["d-OTTILIE", "couch-O-1", "couch-O-2", "linje-O-7", "O coughed at last", "Doctor O."];
    names.into_iter().chain([long]).chain(sessions.map(str::to_owned)).collect()
}

/// A reading, in bar, that stands in no session but those of the diver who is forgotten.
const READING: f64 = 0.736_129_843_1;

/// Three sessions of the diver who is forgotten, the code in three cases: of twenty minutes, of more rows than a block,
/// and a typed one; their records are 8, 8 and 2.
fn sessions_of_the_diver(book: &mut Book, n: usize) -> Option<SessionRecorded> {
    let (diver, seconds, text) = match n {
        7 => ("D-Ottilie", 1200, "couch-O-1"),
        20 => ("d-ottilie", 70_000, "couch-O-2"),
        31 => {
            let typed = session("d-OTTILIE", 300, READING);
            return Some(stamped(|stamp| book.enter_session(&typed, stamp)).unwrap());
        }
        _ => return None,
    };
    let (session, mut line) = (session(diver, seconds, READING), run("CMF-0417", 20));
    line.technician = Some("linje-O-7".into());
    let files = session_files(&session, text);
    let item = SessionToImport { session: &session, line_run: Some(&line), files: &files };
    let recorded = stamped(|stamp| book.import_sessions(&[item], stamp)).unwrap().remove(0);
    if n == 7 {
        let (number, by) = (recorded.number, Some("Doctor O."));
        let out = stamped(|stamp| {
            book.leave_out_of_session(number, Some((60.0, 90.0)), "O coughed at last", by, stamp)
        });
        out.unwrap();
    }
    Some(recorded)
}

/// Records of the diver: four revisions of the entry, and the sessions.
const RECORDS: usize = 4 + 8 + 8 + 2;

fn diver(name: &str) -> Diver {
    Diver { name: Some(name.into()), ..Diver::bare(id("D-Ottilie")) }
}

/// A book with a diver of four revisions and three sessions among much else, sessions of others too.
fn book_with_diver(path: &Path) -> Book {
    let mut book = begin(path);
    let marks = marks();
    for n in 0..40 {
        import(&mut book, &run(&format!("A{n}"), 20), &format!("before {n}"));
        let other = Diver { name: Some(format!("Somebody {n}")), ..Diver::bare(id(&format!("D-{n:02}"))) };
        stamped(|stamp| book.add(Entry::Diver(other), stamp)).unwrap();
        match n {
            5 => stamped(|stamp| book.add(Entry::Diver(diver(&marks[0])), stamp)).unwrap(),
            9 | 30 => {
                stamped(|stamp| book.edit(Entry::Diver(diver(&marks[3])), stamp)).unwrap();
            }
            20 => {
                stamped(|stamp| book.edit(Entry::Diver(diver(&marks[0])), stamp)).unwrap();
            }
            _ => {}
        }
        if let Some(recorded) = sessions_of_the_diver(&mut book, n) {
            assert!(recorded.new && !recorded.diver_created, "{n}");
        } else if n % 10 == 0 {
            import_session(&mut book, &session(&format!("D-{n:02}"), 1200, 0.7), &format!("couch {n}"));
        }
    }
    book
}

/// Which of the marks stand in the file, its log or its index of the log.
fn found_in(folder: &Folder) -> Vec<String> {
    let mut found = Vec::new();
    for name in folder.names() {
        let bytes = std::fs::read(folder.0.join(&name)).unwrap();
        for mark in marks() {
            // The long text lies in pieces on its pages: what each of its numbered parts begins with is looked for.
            let part = if mark.len() > 100 { "Ottilie-0" } else { &mark };
            if memmem(&bytes, part.as_bytes()) {
                found.push(format!("{part} in {name}"));
            }
        }
        // Each cell's own reading, as its bits lie in a block.
        let seen = |n: &i32| memmem(&bytes, &(READING + 1e-6 * f64::from(*n)).to_le_bytes());
        found.extend((1..=3).filter(seen).map(|n| format!("a reading of cell {n} in {name}")));
    }
    found
}

fn memmem(bytes: &[u8], part: &[u8]) -> bool {
    bytes.windows(part.len()).any(|window| window == part)
}

#[test]
fn no_byte_of_a_forgotten_diver_remains_and_the_chain_holds() {
    let folder = Folder::new("forget");
    let mut book = book_with_diver(&folder.book());
    let seen = found_in(&folder);
    for mark in marks().iter().map(|mark| &mark[..9]).chain(["a reading of cell 1", "a reading of cell 3"]) {
        assert!(seen.iter().any(|seen| seen.starts_with(mark)), "{mark} must be seen while it is there");
    }
    let before = book.check(&[]).unwrap();
    stamped(|stamp| book.note_copy(CopyKind::Backup, "stick/book.db", stamp)).unwrap();
    let done = stamped(|stamp| book.forget_diver(&id("d-OTTILIE"), "asked to", stamp)).unwrap();
    let Forgotten::Done { records: RECORDS, copies } = done else { panic!("{done:?}") };
    assert_eq!(copies[0].place, "stick/book.db");
    // While the book is open as well as after.
    assert_eq!(found_in(&folder), Vec::<String>::new());
    assert!(!book.erasure_unfinished().unwrap());
    assert!(book.entry::<Diver>(&id("D-Ottilie")).unwrap().is_none());
    assert!(book.revisions::<Diver>(&id("D-Ottilie")).unwrap().is_empty());
    assert_eq!(book.entries::<Diver>(None, None).unwrap().len(), 40);
    // Of others nothing is gone.
    let rows = book.sessions(&SessionQuery::default()).unwrap();
    let of: Vec<(u32, &str)> = rows.iter().map(|row| (row.number.get(), row.diver.as_str())).collect();
    assert_eq!(of, [(5, "D-30"), (3, "D-10"), (1, "D-00")]);
    assert_eq!(book.session(rows[1].number).unwrap().session, session("D-10", 1200, 0.7));
    drop(book);
    assert_eq!(found_in(&folder), Vec::<String>::new());

    let book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let check = book.check(&[before.head]).unwrap();
    assert_eq!(check.wrong, None);
    assert_eq!(check.erasures.len(), 1);
    let erasure = &check.erasures[0];
    assert_eq!((erasure.why.as_str(), erasure.erased.len()), ("asked to", RECORDS));
    assert_eq!(erasure.sessions.iter().map(|number| number.get()).collect::<Vec<_>>(), [2, 4, 6]);
    assert_eq!(check.sessions, 3);
    assert_eq!(check.records, before.records + 2);
    assert_eq!(book.info().unwrap().erased, RECORDS as u64);
}

#[test]
fn a_reader_is_told_of_and_asking_again_finishes() {
    let folder = Folder::new("held");
    drop(book_with_diver(&folder.book()));
    let mut book = Book::open(&folder.book(), &QUICK).unwrap();
    let reader = Connection::open(folder.book()).unwrap();
    reader.execute_batch("BEGIN").unwrap();
    let payloads = |reader: &Connection| -> i64 {
        reader.query_row("SELECT count(*) FROM payload", [], |row| row.get(0)).unwrap()
    };
    let seen = payloads(&reader);
    let held = stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to", stamp)).unwrap();
    assert!(matches!(held, Forgotten::StillHeld { records: RECORDS, .. }), "{held:?}");
    assert_eq!(payloads(&reader), seen, "the reader keeps the state it began with");
    assert!(book.entry::<Diver>(&id("D-Ottilie")).unwrap().is_none());
    assert!(book.erasure_unfinished().unwrap());
    assert!(!found_in(&folder).is_empty(), "a reader that holds nothing back would make this study empty");
    let again = stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to", stamp)).unwrap();
    assert!(matches!(again, Forgotten::StillHeld { records: 0, .. }), "{again:?}");
    drop(book);
    reader.execute_batch("ROLLBACK").unwrap();
    drop(reader);

    let mut book = Book::open(&folder.book(), &QUICK).unwrap();
    let done = stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to", stamp)).unwrap();
    assert!(matches!(done, Forgotten::Done { records: 0, .. }), "{done:?}");
    assert_eq!(found_in(&folder), Vec::<String>::new());
    assert_eq!(book.check(&[]).unwrap().wrong, None);
    // Nothing is left to finish, so the name is now unknown.
    let unknown = stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to", stamp)).unwrap_err();
    assert_eq!(unknown.to_string(), "there is no diver D-Ottilie in the register");
}

#[test]
fn only_divers_can_be_forgotten_and_a_forgotten_name_may_come_again() {
    let folder = Folder::new("again");
    let mut book = begin(&folder.book());
    stamped(|stamp| book.add(Entry::Orifice(Orifice::bare(id("A"))), stamp)).unwrap();
    let refused = stamped(|stamp| book.forget_diver(&id("A"), "x", stamp)).unwrap_err();
    assert!(matches!(refused, BookError::Unknown { .. }) && refused.is_of_the_call());
    for _ in 0..2 {
        stamped(|stamp| book.add(Entry::Diver(diver("Ottilie Kjærgaard")), stamp)).unwrap();
        let done = stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to", stamp)).unwrap();
        assert!(matches!(done, Forgotten::Done { records: 1, .. }), "{done:?}");
    }
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.erasures.len()), (None, 2));
    assert_eq!(found_in(&folder), Vec::<String>::new());
}

#[test]
fn the_number_of_an_erased_session_says_when_and_why_and_is_never_given_again() {
    let folder = Folder::new("numbers");
    let mut book = begin(&folder.book());
    let number = |n| SessionNumber::new(n).unwrap();
    for (n, diver) in (1..).zip(["D-1", "D-2", "D-Ottilie"]) {
        let recorded = import_session(&mut book, &session(diver, 60, READING), &format!("couch-O-{n}"));
        assert_eq!(recorded.number, number(n));
    }
    stamped(|stamp| book.forget_diver(&id("d-ottilie"), "asked to", stamp)).unwrap();
    let says = "session S0003 was erased on 2026-11-12T10:00:00+11:00: asked to";
    let out = stamped(|stamp| book.leave_out_of_session(number(3), None, "x", None, stamp));
    for refused in [
        book.session(number(3)).map(|_| ()).unwrap_err(),
        book.session_source_of(number(3)).map(|_| ()).unwrap_err(),
        out.unwrap_err(),
    ] {
        assert_eq!(refused.to_string(), says);
        assert!(refused.is_of_the_call());
    }
    // The same files again are a new session with the next number, also when the book was closed in between.
    drop(book);
    let mut book = Book::open(&folder.book(), &QUICK).unwrap();
    let again = import_session(&mut book, &session("D-Ottilie", 60, READING), "couch-O-3");
    assert_eq!((again.number, again.new, again.diver_created), (number(4), true, true));
    stamped(|stamp| book.forget_diver(&id("D-Ottilie"), "asked to again", stamp)).unwrap();
    let refused = book.session(number(4)).unwrap_err().to_string();
    assert!(refused.ends_with(": asked to again"), "{refused}");
    assert_eq!(book.session(number(3)).unwrap_err().to_string(), says);
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.sessions, check.erasures.len()), (None, 2, 2));
    assert_eq!(
        import_session(&mut book, &session("D-3", 60, READING), "couch-O-4").number,
        number(5),
        "numbers go on past those of erased sessions"
    );
    assert_eq!(book.sessions(&SessionQuery::default()).unwrap().len(), 3);
}
