//! Backups, and books of every form there was.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use std::path::{Path, PathBuf};

use crate::book_support::{
    self, Folder, QUICK, begin, decision, id, import, import_session, run, session, stamped,
};
use ebbline::book::{Book, BookError, Entry, Opening, Wrong};
use ebbline::entry::{Diver, Orifice, RunNumber, SessionNumber};
use rusqlite::Connection;

#[test]
fn a_backup_is_a_book_of_one_file_with_the_same_chain_taken_while_others_write() {
    let folder = Folder::new("backup");
    let mut book = begin(&folder.book());
    let number = import(&mut book, &run("A", 20), "one").number;
    let writer = Connection::open(folder.book()).unwrap();
    writer.execute_batch("BEGIN IMMEDIATE").unwrap();
    let copy = folder.0.join("copy.db");
    let copied = stamped(|stamp| book.backup(&copy, false, stamp)).unwrap();
    writer.execute_batch("ROLLBACK").unwrap();
    drop(writer);
    assert_eq!(copied.head, book.check(&[]).unwrap().head);
    assert_eq!(folder.names().iter().filter(|name| name.starts_with("copy.db")).count(), 1);

    let there = stamped(|stamp| book.backup(&copy, false, stamp)).unwrap_err();
    assert!(matches!(there, BookError::CopyThere { .. }) && there.is_of_the_call(), "{there}");
    stamped(|stamp| book.decide(number, decision(0.48), stamp)).unwrap();
    stamped(|stamp| book.backup(&copy, true, stamp)).unwrap();
    assert_eq!(folder.names().iter().filter(|name| name.starts_with("copy.db")).count(), 1);
    // Neither the book itself nor one that is in use is replaced.
    let other = folder.0.join("other.db");
    let mut in_use = begin(&other);
    import(&mut in_use, &run("A", 20), "another");
    for path in [folder.book(), other] {
        let refused = stamped(|stamp| book.backup(&path, true, stamp)).unwrap_err();
        assert!(matches!(refused, BookError::CopyThere { .. }), "{refused}");
    }
    assert_eq!(in_use.check(&[]).unwrap().wrong, None);
    drop(in_use);
    let nowhere = folder.0.join("no/such/folder/copy.db");
    assert!(stamped(|stamp| book.backup(&nowhere, false, stamp)).is_err());

    // The copy is read without leaving anything beside it, and goes on as a book.
    let read = Book::open_to_read(&copy, &QUICK).unwrap();
    assert_eq!(read.run(number).unwrap(), book.run(number).unwrap());
    drop(read);
    let mut taken_up = Book::open(&copy, &QUICK).unwrap();
    assert_eq!(import(&mut taken_up, &run("B", 20), "two").number.get(), 2);
    assert_eq!(taken_up.check(&[copied.head]).unwrap().wrong, None);
}

#[test]
fn a_backup_of_a_book_that_does_not_hold_is_not_kept() {
    let folder = Folder::new("bad-backup");
    import(&mut begin(&folder.book()), &run("A", 20), "one");
    let raw = Connection::open(folder.book()).unwrap();
    raw.execute_batch("DROP TRIGGER payload_stays; UPDATE payload SET salt = zeroblob(16) WHERE seq = 3")
        .unwrap();
    drop(raw);
    let book = Book::open_to_read(&folder.book(), &QUICK).unwrap();
    let refused = stamped(|stamp| book.backup(&folder.0.join("copy.db"), false, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::BadCopy { .. }) && !refused.is_of_the_call(), "{refused}");
    drop(book);
    assert_eq!(folder.names(), ["book.db"]);
}

fn frozen(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/book").join(name)
}

/// The schema of a book as statements, tables before what stands on them.
fn schema(path: &Path) -> String {
    let raw = Connection::open(path).unwrap();
    let mut all = raw
        .prepare(
            "SELECT sql FROM sqlite_schema WHERE sql IS NOT NULL ORDER BY type = 'table' DESC, type, name",
        )
        .unwrap();
    let statements = all.query_map([], |row| row.get::<_, String>(0)).unwrap();
    statements.map(|statement| statement.unwrap() + ";\n\n").collect()
}

/// The forms there have been, the last being the present one.
const FORMS: [u32; 1] = [1];

/// Writes the fixtures of the present form anew, only when EBBLINE_FREEZE is set; those of older forms stay.
fn freeze(form: u32) {
    if std::env::var_os("EBBLINE_FREEZE").is_none() {
        return;
    }
    let folder = Folder::new("freeze");
    let mut book = begin(&folder.book());
    let number = import(&mut book, &run("CMF-0417", 20), "frozen").number;
    stamped(|stamp| book.decide(number, decision(0.48), stamp)).unwrap();
    stamped(|stamp| book.leave_out(number, 4, "door open", None, stamp)).unwrap();
    for name in ["D-1", "D-2"] {
        stamped(|stamp| book.add(Entry::Diver(Diver::bare(id(name))), stamp)).unwrap();
    }
    for (diver, text) in [("D-1", "gone"), ("D-2", "couch")] {
        let number = import_session(&mut book, &session(diver, 30, 0.7), text).number;
        let why = ("coughed", Some("I. Varga"));
        stamped(|stamp| book.leave_out_of_session(number, Some((3.0, 5.5)), why.0, why.1, stamp)).unwrap();
    }
    stamped(|stamp| book.forget_diver(&id("D-1"), "asked to", stamp)).unwrap();
    drop(book);
    std::fs::copy(folder.book(), frozen(&format!("book_{form}.db"))).unwrap();
    std::fs::write(frozen(&format!("schema_{form}.sql")), schema(&folder.book())).unwrap();
}

#[test]
fn a_book_of_every_form_comes_to_the_schema_of_a_new_one() {
    let folder = Folder::new("forms");
    drop(begin(&folder.book()));
    let new = schema(&folder.book());
    for form in FORMS {
        freeze(form);
        let path = folder.0.join(format!("form-{form}.db"));
        let old = Connection::open(&path).unwrap();
        let statements = std::fs::read_to_string(frozen(&format!("schema_{form}.sql"))).unwrap();
        old.execute_batch(&statements).unwrap();
        old.pragma_update(None, "application_id", 0x4562_626C).unwrap();
        old.pragma_update(None, "user_version", form).unwrap();
        drop(old);
        drop(Book::open(&path, &QUICK).unwrap());
        assert_eq!(schema(&path), new, "form {form}");
    }
}

#[test]
fn a_book_of_every_form_still_holds_and_says_the_same() {
    let folder = Folder::new("frozen");
    for form in FORMS {
        std::fs::copy(frozen(&format!("book_{form}.db")), folder.book()).unwrap();
        let book = Book::open(&folder.book(), &QUICK).unwrap();
        assert_eq!(book.opening() == Opening::Found, Some(&form) == FORMS.last());
        let check = book.check(&[]).unwrap();
        assert_eq!((check.wrong, check.runs, check.erasures.len()), (None, 1, 1));
        let record = book.run(RunNumber::new(1).unwrap()).unwrap();
        let mut expected = run("CMF-0417", 20);
        expected.left_out = record.run.left_out.clone();
        assert_eq!(record.run, expected);
        assert_eq!((record.run.left_out[0].point, record.run.left_out[0].why.as_str()), (4, "door open"));
        assert_eq!(record.decisions, [decision(0.48)]);
        assert_eq!(book.source_of(record.number).unwrap(), Some(book_support::files("frozen")));
        let [gone, there] = [1, 2].map(|number| SessionNumber::new(number).unwrap());
        let error = book.session(gone).unwrap_err().to_string();
        assert_eq!(error, "session S0001 was erased on 2026-11-12T10:00:00+11:00: asked to");
        let record = book.session(there).unwrap();
        assert_eq!(
            (&record.session, &record.line_run),
            (&session("D-2", 30, 0.7), &Some(run("CMF-0417", 20)))
        );
        assert_eq!(record.left_out[0].stretch_s, Some((3.0, 5.5)));
        assert_eq!(record.left_out[0].at, book_support::time("2026-11-12T10:00:00+11:00"));
        let files = book_support::session_files(&record.session, "couch");
        assert_eq!(book.session_source_of(there).unwrap(), Some(files));
        assert_eq!(book.entries::<Orifice>(None, None).unwrap().len(), 1);
        assert_eq!(book.entries::<Diver>(None, None).unwrap()[0].entry, Diver::bare(id("D-2")));
    }
    // The fixture can fail: one byte of it and it no longer holds.
    let mut bytes = std::fs::read(folder.book()).unwrap();
    let at = bytes.windows(9).position(|window| window == b"door open").unwrap();
    bytes[at] = b'D';
    std::fs::write(folder.book(), bytes).unwrap();
    let wrong = Book::open_to_read(&folder.book(), &QUICK).unwrap().check(&[]).unwrap().wrong;
    assert!(matches!(wrong, Some(Wrong::Payload(_))), "{wrong:?}");
}
