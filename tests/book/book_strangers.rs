//! What is no book, or one that may not be opened: a typed error, a clear sentence, and the file as it was.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use std::path::{Path, PathBuf};
use std::process::Command;

use crate::book_support::{Folder, QUICK, begin, files, import, named, run, stamped};
use ebbline::book::{Book, BookError, Options, Stranger, ToImport};
use ebbline::entry::RunNumber;
use rusqlite::Connection;
use rusqlite::config::DbConfig;

/// Every file of a folder with its bytes.
fn contents(folder: &Path) -> Vec<(PathBuf, Vec<u8>)> {
    let mut all: Vec<_> = std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.is_file())
        .map(|path| (path.clone(), std::fs::read(&path).unwrap()))
        .collect();
    all.sort();
    all
}

/// Opens in every way there is; each must refuse with the same sentence and leave the folder to the byte.
fn refused(path: &Path) -> BookError {
    let before = contents(path.parent().unwrap());
    let to_read = Book::open_to_read(path, &QUICK).err().unwrap();
    let to_write = Book::open(path, &QUICK).err().unwrap();
    let to_begin = stamped(|stamp| Book::open_or_begin(path, &QUICK, stamp)).err().unwrap();
    assert_eq!(to_read.to_string(), to_write.to_string());
    assert_eq!(to_read.to_string(), to_begin.to_string());
    assert!(before == contents(path.parent().unwrap()), "something in the folder changed");
    assert!(!to_read.is_of_the_call(), "exit status 3");
    to_read
}

#[test]
fn no_book_is_said_with_what_to_do_and_none_is_made() {
    let folder = Folder::new("none");
    let path = folder.book();
    for opened in [Book::open(&path, &QUICK), Book::open_to_read(&path, &QUICK)] {
        let error = opened.err().unwrap();
        assert!(matches!(error, BookError::NoBook { .. }) && error.is_of_the_call());
        assert_eq!(
            error.to_string(),
            format!(
                "there is no book at {}: name another, or begin one by entering or importing a run",
                path.display()
            )
        );
    }
    assert!(folder.names().is_empty());
}

#[test]
fn files_that_are_no_books_are_named_for_what_they_are() {
    let folder = Folder::new("strangers");
    let text = folder.0.join("notes.txt");
    std::fs::write(&text, "6 bar 0.31\n".repeat(60)).unwrap();
    let empty = folder.0.join("empty.db");
    std::fs::write(&empty, "").unwrap();
    let other = folder.0.join("other.db");
    Connection::open(&other).unwrap().execute_batch("CREATE TABLE songs (name TEXT)").unwrap();
    let short = folder.0.join("short.db");
    std::fs::write(&short, "SQLite format 3\0").unwrap();
    std::fs::create_dir(folder.0.join("folder.db")).unwrap();
    for (path, what, sentence) in [
        (text, Some(Stranger::NoDatabase), "is not a book: it is no database; name another file"),
        (empty, Some(Stranger::Empty), "is not a book: it is empty; name another file"),
        (
            other,
            Some(Stranger::OtherApplication),
            "is not a book: it is the database of another program; name",
        ),
        (folder.0.join("folder.db"), Some(Stranger::Folder), "is not a book: it is a folder"),
        (short, None, "is damaged: its first page is cut short; it was left as it is"),
    ] {
        let error = refused(&path);
        assert!(error.to_string().contains(sentence), "{error}");
        match (&error, what) {
            (BookError::NotABook { what: found, .. }, Some(what)) => assert_eq!(*found, what),
            (BookError::Damaged { .. }, None) => {}
            _ => panic!("{error:?}"),
        }
    }
}

#[test]
fn a_newer_book_is_left_as_it_is_even_when_only_its_log_says_so() {
    for in_log in [false, true] {
        let folder = Folder::new("newer");
        import(&mut begin(&folder.book()), &run("A", 5), "one");
        let newer = Connection::open(folder.book()).unwrap();
        newer.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, in_log).unwrap();
        newer.pragma_update(None, "user_version", 99).unwrap();
        newer.execute_batch("CREATE TABLE later (x INTEGER)").unwrap();
        drop(newer);
        let user_version = std::fs::read(folder.book()).unwrap()[63];
        assert_eq!(user_version, if in_log { 1 } else { 99 }, "the study does not stand where it should");
        let error = refused(&folder.book());
        assert!(matches!(error, BookError::Newer { found: 99, .. }), "{error}");
        assert!(
            error.to_string().contains("written by a newer program (form 99, this program knows up to 1)")
        );
    }
}

#[test]
fn a_book_cut_short_is_damaged_and_left_as_it_is() {
    let folder = Folder::new("cut");
    import(&mut begin(&folder.book()), &run("A", 20), "one");
    let whole = std::fs::read(folder.book()).unwrap();
    for keep in [100, 4095, 4096, whole.len() / 2, whole.len() - 1] {
        std::fs::write(folder.book(), &whole[..keep]).unwrap();
        let error = refused(&folder.book());
        assert!(matches!(error, BookError::Damaged { .. }), "{keep} of {}: {error}", whole.len());
    }
}

#[test]
fn a_log_whose_book_is_gone_is_not_read_into_a_new_one() {
    let folder = Folder::new("orphan");
    let mut book = begin(&folder.book());
    import(&mut book, &run("A", 20), "one");
    std::fs::remove_file(folder.book()).unwrap();
    let error = refused(&folder.book());
    assert!(
        error.to_string().contains("the file is gone and its log (the name with -wal) is there"),
        "{error}"
    );
}

#[test]
fn a_page_of_noise_is_damaged_and_neither_file_nor_log_is_touched() {
    let folder = Folder::new("noise");
    import(&mut begin(&folder.book()), &run("A", 20), "one");
    // Another program stopped before it could empty its log, and then the file was damaged.
    let writer = Connection::open(folder.book()).unwrap();
    writer.set_db_config(DbConfig::SQLITE_DBCONFIG_NO_CKPT_ON_CLOSE, true).unwrap();
    writer.execute_batch("CREATE TABLE t (x INTEGER); DROP TABLE t;").unwrap();
    drop(writer);
    let mut bytes = std::fs::read(folder.book()).unwrap();
    let length = bytes.len();
    bytes[4096..length].iter_mut().enumerate().for_each(|(at, byte)| *byte = (at * 31 % 251) as u8);
    std::fs::write(folder.book(), bytes).unwrap();
    let names = ["book.db", "book.db-wal"].map(|name| folder.0.join(name));
    let before = names.clone().map(|name| std::fs::read(name).unwrap());
    for open in [Book::open_to_read, Book::open] {
        let found = open(&folder.book(), &QUICK).and_then(|book| book.run(RunNumber::new(1).unwrap()));
        assert!(matches!(found, Err(BookError::Damaged { .. })), "{found:?}");
        let checked = open(&folder.book(), &QUICK).and_then(|book| book.check(&[]));
        assert!(!matches!(checked, Ok(check) if check.wrong.is_none()));
    }
    assert!(before == names.map(|name| std::fs::read(name).unwrap()));
}

#[test]
fn a_locked_book_is_said_after_the_wait_and_not_before() {
    let folder = Folder::new("locked");
    let mut book = begin(&folder.book());
    import(&mut book, &run("A", 5), "one");
    drop(book);
    let mut book = Book::open(&folder.book(), &QUICK).unwrap();
    let other = Connection::open(folder.book()).unwrap();
    other.execute_batch("BEGIN EXCLUSIVE").unwrap();
    let (made, from) = (run("A", 5), files("two"));
    let error = stamped(|stamp| book.import(ToImport { run: &made, files: &from }, stamp)).unwrap_err();
    assert!(matches!(error, BookError::Locked { .. }), "{error}");
    assert!(error.to_string().contains("is in use by another program, and was still after 0.1 s"), "{error}");
    assert!(!error.is_of_the_call());
    // Whoever only reads is not kept out.
    assert_eq!(Book::open_to_read(&folder.book(), &QUICK).unwrap().info().unwrap().runs, 1);
    other.execute_batch("ROLLBACK").unwrap();
    assert!(import(&mut book, &made, "two").new);
    assert_eq!(Options::default().busy.as_secs(), 5);
}

/// The test itself, run again as a user without rights: root may write everywhere.
const AS_NOBODY: &str = "EBBLINE_TEST_AS_NOBODY";

#[cfg(unix)]
#[test]
fn a_folder_and_a_file_without_rights_are_said() {
    use std::os::unix::fs::PermissionsExt;
    use std::os::unix::process::CommandExt;

    if let Some(folder) = std::env::var_os(AS_NOBODY) {
        let folder = PathBuf::from(folder);
        let denied = |error: Option<BookError>, doing: &str| {
            let error = error.unwrap();
            assert!(matches!(error, BookError::Permission { .. }), "{error:?}");
            assert!(error.to_string().contains(&format!("may not be {doing} by this user")), "{error}");
        };
        let mine = folder.join("book.db");
        denied(Book::open_to_read(&folder.join("secret.db"), &QUICK).err(), "read");
        let opened = stamped(|stamp| {
            let mut book = Book::open(&mine, &QUICK)?;
            let (made, from) = (run("A", 5), files("two"));
            book.import(ToImport { run: &made, files: &from }, stamp)
        });
        let error = opened.unwrap_err();
        assert!(matches!(error, BookError::Permission { .. }), "{error:?}");
        let begun = stamped(|stamp| Book::open_or_begin(&folder.join("new.db"), &QUICK, stamp));
        denied(begun.err(), "created");
        let begun = stamped(|stamp| Book::open_or_begin(&folder.join("in/new.db"), &QUICK, stamp));
        denied(begun.err(), "created");
        return;
    }
    let folder = Folder::new("rights");
    import(&mut begin(&folder.book()), &run("A", 5), "one");
    drop(begin(&folder.0.join("secret.db")));
    let rights = |name: &Path, mode| {
        std::fs::set_permissions(name, std::fs::Permissions::from_mode(mode)).unwrap();
    };
    rights(&folder.0.join("secret.db"), 0o000);
    rights(&folder.book(), 0o444);
    // Copied beside, so that a user without rights can start it wherever it was built.
    let program = std::env::temp_dir().join(format!("ebbline-rights-{}", std::process::id()));
    // By another program: a file that this one has open for writing cannot be started while a child of another test,
    // begun just then, still holds it open.
    let copied = Command::new("cp").arg(std::env::current_exe().unwrap()).arg(&program).status().unwrap();
    assert!(copied.success());
    rights(&program, 0o755);
    rights(&folder.0, 0o555);
    let before = std::fs::read(folder.book()).unwrap();
    let mut again = Command::new(&program);
    let this = named(module_path!(), "a_folder_and_a_file_without_rights_are_said");
    again.args([&this, "--exact", "--nocapture"]);
    again.env(AS_NOBODY, &folder.0);
    let root = Command::new("id").arg("-u").output().is_ok_and(|id| id.stdout.starts_with(b"0"));
    if root {
        again.uid(65_534).gid(65_534);
    }
    let done = again.output().unwrap();
    rights(&folder.0, 0o755);
    std::fs::remove_file(&program).unwrap();
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stdout));
    assert!(String::from_utf8_lossy(&done.stdout).contains("1 passed"));
    assert!(before == std::fs::read(folder.book()).unwrap());
    assert_eq!(folder.names(), ["book.db", "secret.db"]);
}
