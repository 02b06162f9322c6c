//! Nothing recorded changes unnoticed: by statement, by a flipped byte, by removed, moved or cut records.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use std::collections::BTreeSet;
use std::path::Path;

use crate::book_support::{
    Folder, QUICK, begin, decision, id, import, import_session, point, run, session, stamped,
};
use crate::studies::cases;
use ebbline::book::{Book, Check, Entry, Head, RunQuery, SessionQuery, Wrong};
use ebbline::entry::{Acceptance, Diver, FirstStage, Instrument, Orifice};
use rusqlite::Connection;

/// A closed book with some of everything; its head.
fn some_of_everything(path: &Path) -> Head {
    let mut book = begin(path);
    for n in 0..8 {
        let number = import(&mut book, &run(&format!("CMF-{n}"), 20), &format!("run {n}")).number;
        stamped(|stamp| book.decide(number, decision(0.48 + f64::from(n) / 1000.0), stamp)).unwrap();
    }
    let typed = stamped(|stamp| book.begin_run(&run("CMF-3", 3), stamp)).unwrap().number;
    stamped(|stamp| book.correct_point(typed, 2, point(7), stamp)).unwrap();
    stamped(|stamp| book.strike_point(typed, 3, "typed twice", stamp)).unwrap();
    stamped(|stamp| book.finish_run(typed, stamp)).unwrap();
    stamped(|stamp| book.leave_out(typed, 1, "door open", None, stamp)).unwrap();
    for name in ["D-1", "D-2"] {
        let diver = Diver { name: Some("Somebody".into()), ..Diver::bare(id(name)) };
        stamped(|stamp| book.add(Entry::Diver(diver), stamp)).unwrap();
    }
    for (diver, text) in [("D-1", "gone"), ("D-2", "couch"), ("D-2", "left out")] {
        let number = import_session(&mut book, &session(diver, 30, 0.7), text).number;
        let stretch = (text == "couch").then_some((3.0, 5.5));
        stamped(|stamp| book.leave_out_of_session(number, stretch, "coughed", None, stamp)).unwrap();
    }
    let row_by_row =
        stamped(|stamp| book.begin_session(&session("D-2", 9, 0.7), None, stamp)).unwrap().number;
    stamped(|stamp| book.finish_session(row_by_row, stamp)).unwrap();
    stamped(|stamp| book.forget_diver(&id("D-1"), "asked to", stamp)).unwrap();
    book.check(&[]).unwrap().head
}

fn check(path: &Path, against: &[Head]) -> Option<Check> {
    Book::open_to_read(path, &QUICK).and_then(|book| book.check(against)).ok()
}

fn wrong(path: &Path, against: &[Head]) -> Wrong {
    check(path, against).unwrap().wrong.unwrap()
}

/// Everything that can be read, as text.
fn everything(path: &Path) -> Option<String> {
    let book = Book::open_to_read(path, &QUICK).ok()?;
    let rows = book.runs(&RunQuery::default()).ok()?;
    let mut all = format!("{rows:?}");
    for row in &rows {
        all += &format!("{:?} {:?}", book.run(row.number).ok()?, book.source_of(row.number).ok()?);
        all += &format!("{:?}", book.history(&id(&row.orifice), None).ok()?);
    }
    let rows = book.sessions(&SessionQuery::default()).ok()?;
    all += &format!("{rows:?}");
    for row in &rows {
        all += &format!("{:?}", book.session(row.number).ok()?);
        all += &format!("{:?}", book.session_source_of(row.number).ok()?);
    }
    all += &format!("{:?}", book.entries::<Orifice>(None, None).ok()?);
    all += &format!("{:?}", book.entries::<Instrument>(None, None).ok()?);
    all += &format!("{:?}", book.entries::<FirstStage>(None, None).ok()?);
    all += &format!("{:?}", book.entries::<Acceptance>(None, None).ok()?);
    all += &format!("{:?} {:?}", book.entries::<Diver>(None, None).ok()?, book.info().ok()?);
    Some(all)
}

#[test]
fn no_statement_changes_deletes_or_replaces_what_was_recorded() {
    let folder = Folder::new("append-only");
    some_of_everything(&folder.book());
    let raw = Connection::open(folder.book()).unwrap();
    for recursive in ["ON", "OFF"] {
        raw.pragma_update(None, "recursive_triggers", recursive).unwrap();
        for (table, column) in [
            ("record", "seq"),
            ("payload", "seq"),
            ("run", "seq"),
            ("of_run", "seq"),
            ("decision", "seq"),
            ("register", "seq"),
            ("session", "seq"),
            ("of_session", "seq"),
            ("session_finished", "seq"),
            ("session_left_out", "seq"),
            ("session_erased", "number"),
            ("erased", "seq"),
        ] {
            for statement in [
                format!("UPDATE {table} SET {column} = {column}"),
                format!("DELETE FROM {table}"),
                format!("INSERT OR REPLACE INTO {table} SELECT * FROM {table}"),
                format!("REPLACE INTO {table} SELECT * FROM {table} LIMIT 1"),
            ] {
                let refused = raw.execute(&statement, []).unwrap_err().to_string();
                let by_trigger = ["the record is append-only", "a record comes after the last one", "erased"];
                assert!(by_trigger.iter().any(|says| refused.contains(says)), "{statement}: {refused}");
            }
        }
        // A second row of the same number would push out the first by another key than seq.
        for statement in [
            "INSERT OR REPLACE INTO run SELECT 2, number, orifice, orifice_key, gas, purpose, taken, taken_s, \
             technician, origin, NULL FROM run WHERE number = 1",
            "INSERT OR REPLACE INTO session SELECT 1, number, diver, diver_key, place, kept, taken, recorded, origin, \
             first_s, last_s, cells, readings, NULL FROM session WHERE number = 2",
            "INSERT INTO session SELECT 1, 1, diver, diver_key, place, kept, taken, recorded, origin, \
             first_s, last_s, cells, readings, NULL FROM session WHERE number = 2",
            "INSERT OR REPLACE INTO register SELECT 1, register, key, id, revision FROM register LIMIT 1",
        ] {
            assert!(raw.execute(statement, []).unwrap_err().to_string().contains("append-only"));
        }
    }
    // Only personal records can be erased.
    let refused = raw.execute("INSERT INTO erased SELECT 2, max(seq) FROM record", []).unwrap_err();
    assert!(refused.to_string().contains("only a personal record can be erased"), "{refused}");
    drop(raw);
    assert_eq!(check(&folder.book(), &[]).unwrap().wrong, None);
}

/// Where in the file the payloads, salts, digests and links lie.
fn recorded_bytes(path: &Path, file: &[u8]) -> BTreeSet<usize> {
    let raw = Connection::open(path).unwrap();
    let mut all =
        raw.prepare("SELECT digest, link, salt, bytes FROM record LEFT JOIN payload USING (seq)").unwrap();
    let mut rows = all.query([]).unwrap();
    let mut places = BTreeSet::new();
    while let Some(row) = rows.next().unwrap() {
        for column in 0..4 {
            let Ok(bytes) = row.get::<_, Vec<u8>>(column) else { continue };
            for piece in bytes.chunks(16).filter(|piece| piece.len() == 16) {
                let mut found = file.windows(16).enumerate().filter(|(_, window)| *window == piece);
                // A piece that lies twice in the file is left out: one of the two may be something else.
                if let (Some((at, _)), None) = (found.next(), found.next()) {
                    places.extend(at..at + 16);
                }
            }
        }
    }
    places
}

#[test]
fn every_flip_in_what_was_recorded_is_found_and_no_flip_anywhere_goes_unnoticed_that_changes_an_answer() {
    let folder = Folder::new("flips");
    some_of_everything(&folder.book());
    let whole = std::fs::read(folder.book()).unwrap();
    let answers = everything(&folder.book()).unwrap();
    let recorded: Vec<usize> = recorded_bytes(&folder.book(), &whole).into_iter().collect();
    assert!(recorded.len() > 5_000, "{} of {}", recorded.len(), whole.len());
    let damaged = folder.0.join("damaged.db");
    // A fixed sequence (Knuth's multiplier) instead of chance: the same flips every time.
    let mut state: u64 = 20_261_112;
    let mut next = |below: usize| {
        state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1);
        (state >> 33) as usize % below
    };
    let (mut found, mut harmless) = (0, 0);
    let flips = cases(200, 600);
    for study in 0..flips {
        let in_record = study % 2 == 0;
        let at = if in_record { recorded[next(recorded.len())] } else { next(whole.len()) };
        let mut bytes = whole.clone();
        bytes[at] ^= 1_u8 << next(8);
        std::fs::write(&damaged, &bytes).unwrap();
        let holds = check(&damaged, &[]).is_some_and(|check| check.wrong.is_none());
        if holds {
            assert!(!in_record, "a flip at {at} in what was recorded went unnoticed");
            assert_eq!(everything(&damaged).as_ref(), Some(&answers), "a flip at {at} changed an answer");
            harmless += 1;
        } else {
            found += 1;
        }
        assert!(bytes == std::fs::read(&damaged).unwrap(), "checking changed the file (flip at {at})");
    }
    println!("{found} flips found, {harmless} in bytes that hold nothing");
    assert!(found >= flips / 2);
    // Beside a book whose damage was met its log stays; beside a sound one it does not.
    std::fs::write(&damaged, &whole).unwrap();
    assert_eq!(check(&damaged, &[]).map(|check| check.wrong), Some(None));
    assert_eq!(folder.names(), ["book.db", "damaged.db"]);
}

/// Changes a book with its triggers off, and puts them back so that only the change can be seen.
fn behind_its_back(path: &Path, change: &str) {
    let raw = Connection::open(path).unwrap();
    raw.pragma_update(None, "foreign_keys", "OFF").unwrap();
    let triggers: Vec<(String, String)> = raw
        .prepare("SELECT name, sql FROM sqlite_schema WHERE type = 'trigger'")
        .unwrap()
        .query_map([], |row| Ok((row.get(0)?, row.get(1)?)))
        .unwrap()
        .collect::<Result<_, _>>()
        .unwrap();
    for (name, _) in &triggers {
        raw.execute_batch(&format!("DROP TRIGGER {name}")).unwrap();
    }
    raw.execute_batch(change).unwrap();
    assert!(raw.changes() > 0, "{change} changed nothing");
    for (_, sql) in &triggers {
        raw.execute_batch(sql).unwrap();
    }
}

#[test]
fn each_way_to_alter_the_record_behind_its_back_is_named_with_its_place() {
    type Expected = fn(&Wrong) -> bool;
    let alterations: [(&str, Expected); 22] = [
        ("DELETE FROM record WHERE seq = 9", |w| *w == Wrong::RecordMissing(9)),
        ("DELETE FROM payload WHERE seq = 9", |w| *w == Wrong::PayloadMissing(9)),
        ("UPDATE payload SET bytes = zeroblob(length(bytes)) WHERE seq = 9", |w| *w == Wrong::Payload(9)),
        ("UPDATE payload SET salt = zeroblob(16) WHERE seq = 9", |w| *w == Wrong::Payload(9)),
        ("UPDATE record SET kind = 4 WHERE seq = 9", |w| *w == Wrong::Link(9)),
        ("UPDATE record SET digest = zeroblob(32) WHERE seq = 9", |w| *w == Wrong::Link(9)),
        // Two records change places.
        (
            "UPDATE record SET seq = -9 WHERE seq = 9; UPDATE record SET seq = 9 WHERE seq = 14; \
             UPDATE record SET seq = 14 WHERE seq = -9;",
            |w| *w == Wrong::Link(9),
        ),
        ("DELETE FROM run WHERE number = 3", |w| matches!(w, Wrong::List { table: "run", .. })),
        ("UPDATE run SET technician = 'another'", |w| matches!(w, Wrong::List { table: "run", .. })),
        ("UPDATE decision SET flow_l_min = 0.5 WHERE run = 3", |w| {
            matches!(w, Wrong::List { table: "decision", .. })
        }),
        ("UPDATE decision SET verdict = 2 WHERE run = 4", |w| {
            matches!(w, Wrong::List { table: "decision", .. })
        }),
        ("INSERT INTO of_run VALUES (1, 1, 8)", |w| *w == Wrong::Unaccounted("of_run")),
        ("UPDATE session SET last_s = 1200.0 WHERE number = 2", |w| {
            matches!(w, Wrong::List { table: "session", .. })
        }),
        ("DELETE FROM session WHERE number = 3", |w| matches!(w, Wrong::List { table: "session", .. })),
        ("DELETE FROM of_session WHERE kind = 1002 AND session = 2", |w| {
            matches!(w, Wrong::List { table: "of_session", .. })
        }),
        ("DELETE FROM session_left_out WHERE whole", |w| {
            matches!(w, Wrong::List { table: "session_left_out", .. })
        }),
        // The number of an erased session would be free again, or that of another taken.
        ("DELETE FROM session_erased", |w| matches!(w, Wrong::List { table: "session_erased", .. })),
        ("INSERT INTO session_erased SELECT 2, erasure FROM session_erased", |w| {
            *w == Wrong::Unaccounted("session_erased")
        }),
        // The readings of a session go, but no erasure is recorded.
        ("DELETE FROM payload WHERE seq = (SELECT max(seq) FROM record WHERE kind = 1002)", |w| {
            matches!(w, Wrong::PayloadMissing(_))
        }),
        ("DELETE FROM head", |w| *w == Wrong::CutTail),
        // The diver's entry goes as in an erasure, but no erasure is recorded.
        ("DELETE FROM payload WHERE seq = (SELECT max(seq) FROM record WHERE kind = 1000)", |w| {
            matches!(w, Wrong::PayloadMissing(_))
        }),
        // An erasure is written into the list alone.
        ("INSERT INTO erased SELECT max(seq), 9 FROM record WHERE kind = 1000", |w| {
            *w == Wrong::Unaccounted("erased")
        }),
    ];
    let folder = Folder::new("behind");
    let head = some_of_everything(&folder.book());
    let whole = std::fs::read(folder.book()).unwrap();
    for (change, expected) in alterations {
        std::fs::write(folder.book(), &whole).unwrap();
        behind_its_back(&folder.book(), change);
        let found = wrong(&folder.book(), &[head]);
        assert!(expected(&found), "{change}: {found:?}");
    }
}

#[test]
fn a_trigger_that_is_gone_or_foreign_is_named() {
    let folder = Folder::new("schema");
    some_of_everything(&folder.book());
    let raw = Connection::open(folder.book()).unwrap();
    raw.execute_batch("CREATE TRIGGER sly AFTER INSERT ON run BEGIN SELECT 1; END").unwrap();
    assert_eq!(wrong(&folder.book(), &[]), Wrong::Schema("sly".into()));
    raw.execute_batch("DROP TRIGGER sly; DROP TRIGGER record_kept;").unwrap();
    assert_eq!(wrong(&folder.book(), &[]), Wrong::Schema("record_kept".into()));
}

/// Takes the last records off with all the rows by which they are found.
const CUT: &str = "DELETE FROM record WHERE seq > (SELECT max(seq) - 3 FROM record); \
    DELETE FROM payload WHERE seq > (SELECT max(seq) FROM record); \
    DELETE FROM erased WHERE erasure > (SELECT max(seq) FROM record); \
    DELETE FROM register WHERE seq > (SELECT max(seq) FROM record); \
    DELETE FROM of_run WHERE seq > (SELECT max(seq) FROM record); ";

#[test]
fn a_cut_tail_shows_by_the_books_own_head_and_a_rewritten_one_by_a_head_kept_elsewhere() {
    let folder = Folder::new("tail");
    let mut book = begin(&folder.book());
    import(&mut book, &run("A", 5), "one");
    let kept = book.check(&[]).unwrap().head;
    let typed = stamped(|stamp| book.begin_run(&run("A", 3), stamp)).unwrap().number;
    for n in 0..4 {
        stamped(|stamp| book.add_points(typed, vec![point(n)], stamp)).unwrap();
    }
    let end = book.check(&[kept]).unwrap().head;
    drop(book);
    assert_eq!(check(&folder.book(), &[kept, end]).unwrap().wrong, None);

    behind_its_back(&folder.book(), CUT);
    assert_eq!(wrong(&folder.book(), &[]), Wrong::CutTail);
    // Nothing is built upon a cut tail.
    let mut cut = Book::open(&folder.book(), &QUICK).unwrap();
    let refused = stamped(|stamp| cut.add_points(typed, vec![point(1)], stamp)).unwrap_err();
    assert!(refused.to_string().contains("does not end where its last transaction left it"), "{refused}");
    drop(cut);

    let rewrite = "INSERT OR REPLACE INTO head SELECT 1, seq, link FROM record ORDER BY seq DESC LIMIT 1";
    behind_its_back(&folder.book(), rewrite);
    assert_eq!(check(&folder.book(), &[kept]).unwrap().wrong, None, "the book alone cannot know");
    assert_eq!(wrong(&folder.book(), &[kept, end]), Wrong::Head(end));
    let forged = Head { link: [7; 32], ..kept };
    assert_eq!(wrong(&folder.book(), &[forged]), Wrong::Head(forged));
    assert!(Wrong::Head(end).to_string().contains("its end was cut off or rewritten"));
}
