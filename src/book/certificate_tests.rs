//! Certificates seen from inside: every value through its bytes and through a file, numbers, and what the lists refuse.

use proptest::collection::vec;
use proptest::option::of;
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;

use super::body::{self, Body, Record};
use super::canonical::strategy;
use super::*;
use crate::entry::*;

fn time(text: &str) -> chrono::DateTime<chrono::FixedOffset> {
    chrono::DateTime::parse_from_rfc3339(text).unwrap()
}

fn number(n: u32) -> RunNumber {
    RunNumber::new(n).unwrap()
}

/// One certificate with everything in it.
pub(super) fn sample(header: Run, before: StoredFigures) -> Certificate {
    let header = Run { readings: Readings::Points(Vec::new()), ..header };
    Certificate {
        number: "2026-0007".into(),
        counter: 7,
        year: 2026,
        head: (41, [0xC4; 32]),
        draft: CertificateDraft {
            results: CertifiedRun {
                run: number(5),
                header: header.clone(),
                before: Some((number(2), before)),
            },
            as_found: Some(CertifiedRun { run: number(4), header, before: None }),
            shop_revision: 3,
            orifice_revision: 2,
            signatory: Signatory { name: "I. Varga".into(), role: Some("head of the workshop".into()) },
            sheet: Sheet::Letter,
            texts: CertificateTexts {
                customer: "Reef School".into(),
                customer_address: "12 Bay Road\n4870 Cairns".into(),
                without_serial: true,
                condition: Some("dirty".into()),
                work_done: Some("cleaned".into()),
                received: chrono::NaiveDate::from_ymd_opt(2026, 11, 10),
                place: None,
                supplied: vec!["the nominal flow".into()],
                interval: Some("one year".into()),
                remarks: vec!["none".into()],
            },
            amends: Some(CertificateAmends {
                number: "2026-0006".into(),
                replaces: true,
                what: "the customer".into(),
                why: "misspelt".into(),
                xml: Some([0x11; 32]),
            }),
            issued: time("2026-11-13T09:00:00+11:00"),
            method_revision: 1,
            program: "0.1.0".into(),
        },
    }
}

fn any_certificate() -> BoxedStrategy<Certificate> {
    let text = strategy::text;
    let certified = || {
        let before = of((1..=u32::MAX, strategy::decision()));
        (1..=u32::MAX, strategy::run(), before).prop_map(|(run, header, before)| CertifiedRun {
            run: number(run),
            header: Run { readings: Readings::Points(Vec::new()), ..header },
            before: before.map(|(run, decision)| (number(run), decision.figures)),
        })
    };
    let stated = (text(), text(), any::<bool>(), of(text()), of(text()), of(text()), of(text()));
    let lists = (vec(text(), 0..3), vec(text(), 0..3));
    let texts = (stated, lists).prop_map(|(stated, (supplied, remarks))| {
        let (customer, customer_address, without_serial, condition, work_done, place, interval) = stated;
        CertificateTexts {
            customer,
            customer_address,
            without_serial,
            condition,
            work_done,
            received: chrono::NaiveDate::from_ymd_opt(2026, 11, 10),
            place,
            supplied,
            interval,
            remarks,
        }
    });
    let amends = of((text(), any::<bool>(), text(), text(), of(any::<[u8; 32]>())).prop_map(
        |(number, replaces, what, why, xml)| CertificateAmends { number, replaces, what, why, xml },
    ));
    let signatory = (text(), of(text())).prop_map(|(name, role)| Signatory { name, role });
    let sheet = prop_oneof![Just(Sheet::A4), Just(Sheet::Letter)];
    let head = (text(), any::<u32>(), any::<i32>(), any::<u64>(), any::<[u8; 32]>());
    let rest = (any::<u32>(), any::<u32>(), any::<u32>(), text());
    (head, certified(), of(certified()), signatory, sheet, texts, amends, rest)
        .prop_map(|(head, results, as_found, signatory, sheet, texts, amends, rest)| {
            let (number, counter, year, seq, link) = head;
            let (shop_revision, orifice_revision, method_revision, program) = rest;
            let issued = results.header.taken;
            Certificate {
                number,
                counter,
                year,
                head: (seq, link),
                draft: CertificateDraft {
                    results,
                    as_found,
                    shop_revision,
                    orifice_revision,
                    signatory,
                    sheet,
                    texts,
                    amends,
                    issued,
                    method_revision,
                    program,
                },
            }
        })
        .boxed()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn a_certificate_comes_back_to_the_last_bit(
        certificate in any_certificate(), seq in any::<u64>(), pdf in any::<[u8; 32]>(), xml in any::<[u8; 32]>(),
    ) {
        let at = certificate.draft.issued;
        let files = Body::CertificateFiles { certificate: seq, files: CertificateFiles { pdf, xml } };
        for body in [Body::Certificate(Box::new(certificate)), files] {
            let record = Record { at, body };
            let bytes = body::write(&record);
            let back = body::read(record.body.kind().number(), &bytes).unwrap();
            prop_assert_eq!(body::write(&back), bytes.clone());
            prop_assert_eq!(format!("{back:?}"), format!("{record:?}"));
            prop_assert!(body::read(record.body.kind().number(), &bytes[..bytes.len() - 1]).is_err());
        }
    }
}

/// A book in memory's place: a file of its own that goes when the test ends.
struct Folder(std::path::PathBuf);

impl Folder {
    fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("ebbline-certificates-{}-{name}", std::process::id()));
        std::fs::create_dir_all(&path).unwrap();
        Self(path)
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

fn stamped<T>(what: impl FnOnce(&mut Stamp<'_>) -> T) -> T {
    let mut drawn = 0_u8;
    let mut salt = || {
        drawn += 1;
        [drawn; 16]
    };
    what(&mut Stamp { at: time("2026-11-13T09:00:00+11:00"), salt: &mut salt })
}

fn begin(folder: &Folder) -> Book {
    stamped(|stamp| Book::open_or_begin(&folder.0.join("book.db"), &Options::default(), stamp)).unwrap()
}

fn drafts() -> (CertificateDraft, TestRunner) {
    let mut runner = TestRunner::deterministic();
    let run = strategy::run().new_tree(&mut runner).unwrap().current();
    let figures = strategy::decision().new_tree(&mut runner).unwrap().current().figures;
    let draft = sample(run, figures).draft;
    (CertificateDraft { amends: None, ..draft }, runner)
}

fn of_run(draft: &CertificateDraft, run: u32, issued: &str) -> CertificateDraft {
    let mut draft = draft.clone();
    draft.results.run = number(run);
    draft.issued = time(issued);
    draft
}

fn shop(pattern: Option<&str>) -> Shop {
    Shop {
        name: "S".into(),
        address: "A".into(),
        contact: None,
        logo: None,
        accent: None,
        number_pattern: pattern.map(str::to_owned),
        signatories: Vec::new(),
        statements: Vec::new(),
    }
}

#[test]
fn numbers_follow_the_pattern_and_none_is_given_twice() {
    let folder = Folder::new("numbers");
    let mut book = begin(&folder);
    let (draft, _) = drafts();
    let give = |book: &mut Book, run, issued: &str| {
        stamped(|stamp| book.give_number(of_run(&draft, run, issued), stamp)).unwrap().number
    };
    // A shop that was never named, and each year from one.
    assert_eq!(give(&mut book, 1, "2026-11-13T09:00:00+11:00"), "2026-0001");
    assert_eq!(give(&mut book, 2, "2026-11-13T09:00:00+11:00"), "2026-0002");
    // The same run has the same number.
    assert_eq!(give(&mut book, 1, "2026-11-14T09:00:00+11:00"), "2026-0001");
    // The year is that of the shop's own clock.
    assert_eq!(give(&mut book, 3, "2027-01-01T00:30:00+11:00"), "2027-0001");
    assert_eq!(give(&mut book, 4, "2026-12-31T23:30:00-10:00"), "2026-0003");
    // Without a year they count on for good, and a number that was given stays given.
    stamped(|stamp| book.set_shop(shop(Some("HOW-{n}")), stamp)).unwrap();
    assert_eq!(give(&mut book, 5, "2028-05-05T00:00:00Z"), "HOW-4");
    stamped(|stamp| book.set_shop(shop(Some("how-{n}")), stamp)).unwrap();
    assert_eq!(give(&mut book, 6, "2029-05-05T00:00:00Z"), "how-5");
    stamped(|stamp| book.set_shop(shop(Some("{year}-{n:4}")), stamp)).unwrap();
    assert_eq!(give(&mut book, 7, "2026-12-01T00:00:00Z"), "2026-0004");
    // A year whose counter is free but whose number another pattern took is passed over.
    stamped(|stamp| book.set_shop(shop(Some("2030-000{n}")), stamp)).unwrap();
    assert_eq!(give(&mut book, 8, "2031-01-01T00:00:00Z"), "2030-0006");
    stamped(|stamp| book.set_shop(shop(None), stamp)).unwrap();
    let mut last = String::new();
    for run in 9..15 {
        last = give(&mut book, run, "2030-02-02T00:00:00Z");
        assert_ne!(last, "2030-0006");
    }
    assert_eq!(last, "2030-0007", "six numbers, one passed over");
    assert_eq!(book.check(&[]).unwrap().wrong, None);
    let rows = book.certificates(&CertificateQuery::default()).unwrap();
    assert_eq!((rows.len(), rows[0].number.as_str(), rows[0].run), (14, "2030-0007", number(14)));
}

#[test]
fn any_certificate_is_found_again_and_its_rows_cannot_be_changed() {
    let folder = Folder::new("rows");
    let mut book = begin(&folder);
    let mut runner = TestRunner::deterministic();
    let mut numbers = Vec::new();
    for run in 1..40 {
        let mut draft = any_certificate().new_tree(&mut runner).unwrap().current().draft;
        draft.results.run = number(run);
        draft.amends = None;
        let given = stamped(|stamp| book.give_number(draft.clone(), stamp)).unwrap();
        assert_eq!(format!("{:?}", given.draft), format!("{draft:?}"));
        let found = book.certificate(&given.number.to_uppercase()).unwrap().unwrap();
        assert_eq!(format!("{:?}", found.certificate), format!("{given:?}"));
        assert_eq!(found.files, None);
        numbers.push(given.number);
    }
    let files = CertificateFiles { pdf: [1; 32], xml: [2; 32] };
    for _ in 0..2 {
        stamped(|stamp| book.note_files(&numbers[0], files, stamp)).unwrap();
    }
    assert_eq!(book.certificate(&numbers[0]).unwrap().unwrap().files, Some(files));
    let refused = stamped(|stamp| book.note_files("1999-0001", files, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::NoSuchCertificate { .. }) && refused.is_of_the_call());
    for sql in [
        "UPDATE certificate SET number = 'x'",
        "DELETE FROM certificate",
        "INSERT OR REPLACE INTO certificate SELECT * FROM certificate",
        "UPDATE certificate_files SET pdf = zeroblob(32)",
        "DELETE FROM certificate_files",
        "INSERT OR REPLACE INTO certificate_files SELECT * FROM certificate_files",
    ] {
        let error = book.connection.execute_batch(sql).unwrap_err().to_string();
        assert!(error.contains("append-only"), "{sql}: {error}");
    }
    assert_eq!(book.check(&[]).unwrap().wrong, None);
    // A row that says something else than its record is found.
    let drop = "DROP TRIGGER certificate_stays";
    let again: String = book
        .connection
        .query_row("SELECT sql FROM sqlite_schema WHERE name = 'certificate_stays'", [], |row| row.get(0))
        .unwrap();
    let change = format!("{drop}; UPDATE certificate SET run = 77 WHERE run = 3; {again};");
    book.connection.execute_batch(&change).unwrap();
    assert!(matches!(book.check(&[]).unwrap().wrong, Some(Wrong::List { table: "certificate", .. })));
}

#[test]
fn an_amendment_names_one_that_is_there_and_each_is_amended_once() {
    let folder = Folder::new("amended");
    let mut book = begin(&folder);
    let (draft, _) = drafts();
    let amend = |number: &str| CertificateAmends {
        number: number.into(),
        replaces: false,
        what: "w".into(),
        why: "y".into(),
        xml: None,
    };
    let first = stamped(|stamp| book.give_number(draft.clone(), stamp)).unwrap().number;
    let amending = |number: &str| CertificateDraft { amends: Some(amend(number)), ..draft.clone() };
    let none = stamped(|stamp| book.give_number(amending("2025-0001"), stamp)).unwrap_err();
    assert!(matches!(none, BookError::NoSuchCertificate { .. }), "{none}");
    let second = stamped(|stamp| book.give_number(amending(&first), stamp)).unwrap().number;
    assert_ne!(first, second);
    let twice = stamped(|stamp| book.give_number(amending(&first), stamp)).unwrap_err();
    assert!(matches!(&twice, BookError::AmendedAlready { by, .. } if *by == second), "{twice}");
    let found = book.certificate(&first).unwrap().unwrap();
    assert_eq!(found.amended_by, Some((second.clone(), false)));
    assert_eq!(book.certificate_of_run(draft.results.run).unwrap().unwrap().certificate.number, second);
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}
