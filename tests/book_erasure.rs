//! Forgetting a diver: no byte is left, the chain holds, and whoever still reads is told of.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

mod book_support;

use std::path::Path;

use book_support::{Folder, QUICK, begin, id, import, run, stamped};
use ebbline::book::{Book, BookError, CopyKind, Entry, Forgotten};
use ebbline::entry::{Diver, Orifice};
use rusqlite::Connection;

/// Texts that stand nowhere but with the diver who is forgotten; one of them fills pages of its own.
fn marks() -> Vec<String> {
    let long: String = (0..4000).map(|n| format!("Ottilie-{n:05};")).collect();
    vec!["Ottilie Kjærgaard".into(), "D-Ottilie".into(), "d-ottilie".into(), long]
}

fn diver(name: &str) -> Diver {
    Diver { name: Some(name.into()), ..Diver::bare(id("D-Ottilie")) }
}

/// A book with a diver of four revisions among much else.
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
    }
    book
}

/// Which of the marks stand in the file, its log or its index of the log.
fn found_in(folder: &Folder) -> Vec<String> {
    let mut found = Vec::new();
    for name in folder.names() {
        let bytes = std::fs::read(folder.0.join(&name)).unwrap();
        for mark in marks() {
            // The long text lies in pieces on its pages: each of its numbered parts is looked for.
            let parts: Vec<&str> = if mark.len() > 100 { mark.split(';').collect() } else { vec![&mark] };
            for part in parts.into_iter().filter(|part| part.len() >= 9) {
                if memmem(&bytes, part.as_bytes()) {
                    found.push(format!("{part} in {name}"));
                    break;
                }
            }
        }
    }
    found
}

fn memmem(bytes: &[u8], part: &[u8]) -> bool {
    let Some(first) = part.first() else { return false };
    bytes.iter().enumerate().filter(|(_, byte)| *byte == first).any(|(at, _)| bytes[at..].starts_with(part))
}

#[test]
fn no_byte_of_a_forgotten_diver_remains_and_the_chain_holds() {
    let folder = Folder::new("forget");
    let mut book = book_with_diver(&folder.book());
    assert!(!found_in(&folder).is_empty(), "the marks must be seen while they are there");
    let before = book.check(&[]).unwrap();
    stamped(|stamp| book.note_copy(CopyKind::Backup, "stick/book.db", stamp)).unwrap();
    let done = stamped(|stamp| book.forget_diver(&id("d-OTTILIE"), "asked to", stamp)).unwrap();
    let Forgotten::Done { records: 4, copies } = done else { panic!("{done:?}") };
    assert_eq!(copies[0].place, "stick/book.db");
    // While the book is open as well as after.
    assert_eq!(found_in(&folder), Vec::<String>::new());
    assert!(!book.erasure_unfinished().unwrap());
    assert!(book.entry::<Diver>(&id("D-Ottilie")).unwrap().is_none());
    assert!(book.revisions::<Diver>(&id("D-Ottilie")).unwrap().is_empty());
    assert_eq!(book.entries::<Diver>(None, None).unwrap().len(), 40);
    drop(book);
    assert_eq!(found_in(&folder), Vec::<String>::new());

    let book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let check = book.check(&[before.head]).unwrap();
    assert_eq!(check.wrong, None);
    assert_eq!(check.erasures.len(), 1);
    assert_eq!((check.erasures[0].why.as_str(), check.erasures[0].erased.len()), ("asked to", 4));
    assert_eq!(check.records, before.records + 2);
    assert_eq!(book.info().unwrap().erased, 4);
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
    assert!(matches!(held, Forgotten::StillHeld { records: 4, .. }), "{held:?}");
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
