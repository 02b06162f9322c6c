//! Registers: entries are added, edited by new revisions, found whatever their case, and listed by name.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]

use crate::book_support::{Folder, begin, id, stamped, time};
use ebbline::book::{Book, BookError, Entry, Register};
use ebbline::entry::{
    Acceptance, Diver, FirstStage, Id, Instrument, Limits, Measures, Orifice, Rule, Shop, Tolerance,
};
use ebbline::quantity::{GaugePressure, Length, Mass, PressureDifference, StpdFlow};
use proptest::prelude::*;

fn orifice(name: &str, serial: &str) -> Orifice {
    Orifice { serial: Some(serial.into()), ..Orifice::bare(id(name)) }
}

fn add(book: &mut Book, entry: Entry) -> Result<(), BookError> {
    stamped(|stamp| book.add(entry, stamp))
}

#[test]
fn an_entry_of_each_register_comes_back() {
    let folder = Folder::new("each");
    let mut book = begin(&folder.book());
    let made = Orifice { nominal_diameter: Some(Length::from_um(76.0)), ..orifice("CMF-0417", "7") };
    let instrument = Instrument {
        id: id("FM-01"),
        measures: Measures::Flow,
        socket: None,
        baud: Some(19_200),
        frame: None,
        unit: Some("L/min".into()),
        protocol: None,
        papers: None,
    };
    let stage = FirstStage {
        id: id("FS-2"),
        compensated: false,
        ip_range: (GaugePressure::from_bar(7.0), GaugePressure::from_bar(13.0)),
        division: PressureDifference::from_bar(0.1),
        gauge_scale: None,
        gauge_error: None,
        ip_spread: None,
        ip_repeat: None,
        max_ip: None,
        trapped_volume: None,
        fall_observed: None,
        maker: None,
        serial: None,
    };
    let acceptance = Acceptance {
        id: Some(id("usual")),
        ip: GaugePressure::from_bar(10.0),
        flow: StpdFlow::from_l_min(0.48),
        gas: None,
        tolerance: Tolerance::Relative(0.05),
        rule: Rule::Guarded,
        limits: Limits::DEFAULT,
    };
    let diver = Diver { mass: Some(Mass::from_kg(82.0)), ..Diver::bare(id("D-07")) };
    // One name in five registers is five entries.
    for entry in [
        Entry::Orifice(made.clone()),
        Entry::Instrument(instrument.clone()),
        Entry::FirstStage(stage.clone()),
        Entry::Acceptance(acceptance.clone()),
        Entry::Diver(diver.clone()),
        Entry::Orifice(orifice("FM-01", "1")),
    ] {
        add(&mut book, entry).unwrap();
    }
    assert_eq!(book.entry::<Orifice>(&id("cmf-0417")).unwrap().unwrap().entry, made);
    assert_eq!(book.entry::<Instrument>(&id("fm-01")).unwrap().unwrap().entry, instrument);
    assert_eq!(book.entry::<FirstStage>(&id("FS-2")).unwrap().unwrap().entry, stage);
    assert_eq!(book.entry::<Acceptance>(&id("USUAL")).unwrap().unwrap().entry, acceptance);
    assert_eq!(book.entry::<Diver>(&id("D-07")).unwrap().unwrap().entry, diver);
    assert!(book.entry::<Diver>(&id("FS-2")).unwrap().is_none());
    let entries = book.info().unwrap().entries;
    assert!(
        entries.contains(&(Register::Orifice, 2)) && entries.contains(&(Register::Shop, 0)),
        "{entries:?}"
    );
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn two_names_that_differ_only_in_case_are_one() {
    let folder = Folder::new("case");
    let mut book = begin(&folder.book());
    add(&mut book, Entry::Orifice(orifice("Ünit-É", "1"))).unwrap();
    let taken = add(&mut book, Entry::Orifice(orifice("üNIT-é", "2"))).unwrap_err();
    assert_eq!(
        taken.to_string(),
        "orifice Ünit-É is already in the register: names that differ only in case are the same, so edit it or \
         choose another"
    );
    assert!(taken.is_of_the_call());
    let long = "é".repeat(32);
    add(&mut book, Entry::Orifice(orifice(&long, "3"))).unwrap();
    assert!(book.entry::<Orifice>(&id(&long.to_uppercase())).unwrap().is_some());
}

#[test]
fn an_edit_is_a_new_revision_and_the_old_ones_stay() {
    let folder = Folder::new("edit");
    let mut book = begin(&folder.book());
    let unknown = stamped(|stamp| book.edit(Entry::Orifice(orifice("A", "1")), stamp)).unwrap_err();
    assert_eq!(unknown.to_string(), "there is no orifice A in the register");
    add(&mut book, Entry::Orifice(orifice("A", "1"))).unwrap();
    for (serial, revision) in [("2", 2), ("3", 3)] {
        let given = stamped(|stamp| book.edit(Entry::Orifice(orifice("a", serial)), stamp)).unwrap();
        assert_eq!(given, revision);
    }
    let now = book.entry::<Orifice>(&id("A")).unwrap().unwrap();
    assert_eq!((now.entry.serial.as_deref(), now.revision), (Some("3"), 3));
    assert_eq!(now.at, time("2026-11-12T10:00:00+11:00"));
    let all = book.revisions::<Orifice>(&id("A")).unwrap();
    let serials: Vec<_> = all.iter().map(|one| one.entry.serial.as_deref().unwrap()).collect();
    assert_eq!(serials, ["3", "2", "1"]);
    assert_eq!(all[2].entry.id.as_str(), "A");
}

#[test]
fn a_register_is_listed_by_name_a_page_at_a_time_each_as_it_stands() {
    let folder = Folder::new("list");
    let mut book = begin(&folder.book());
    for name in ["b", "C", "a", "D"] {
        add(&mut book, Entry::Orifice(orifice(name, "1"))).unwrap();
    }
    stamped(|stamp| book.edit(Entry::Orifice(orifice("C", "2")), stamp)).unwrap();
    let listed = |after: Option<&Id>, limit| {
        let entries = book.entries::<Orifice>(after, limit).unwrap();
        entries.iter().map(|one| format!("{} {}", one.entry.id, one.revision)).collect::<Vec<_>>()
    };
    assert_eq!(listed(None, None), ["a 1", "b 1", "C 2", "D 1"]);
    assert_eq!(listed(Some(&id("B")), Some(1)), ["C 2"]);
}

#[test]
fn the_shop_is_one_entry_with_revisions() {
    let folder = Folder::new("shop");
    let mut book = begin(&folder.book());
    assert_eq!(book.shop().unwrap(), None);
    let shop = |name: &str| Shop {
        name: name.into(),
        address: "Kai 1\nHafen".into(),
        contact: None,
        logo: None,
        accent: None,
        number_pattern: None,
        signatories: Vec::new(),
        statements: Vec::new(),
    };
    assert_eq!(stamped(|stamp| book.set_shop(shop("Ebb"), stamp)).unwrap(), 1);
    assert_eq!(stamped(|stamp| book.set_shop(shop("Ebb & Söhne"), stamp)).unwrap(), 2);
    let now = book.shop().unwrap().unwrap();
    assert_eq!((now.entry.name.as_str(), now.revision), ("Ebb & Söhne", 2));
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn every_text_of_unicode_comes_back_from_the_book(
        texts in proptest::collection::vec(proptest::collection::vec(any::<char>(), 0..200), 1..20),
    ) {
        let folder = Folder::new("unicode");
        let mut book = begin(&folder.book());
        let texts: Vec<String> = texts.into_iter().map(String::from_iter).collect();
        for (index, text) in texts.iter().enumerate() {
            let made = Orifice { description: Some(text.clone()), ..Orifice::bare(id(&format!("o{index}"))) };
            add(&mut book, Entry::Orifice(made)).unwrap();
        }
        for (index, text) in texts.iter().enumerate() {
            let back = book.entry::<Orifice>(&id(&format!("O{index}"))).unwrap().unwrap();
            prop_assert_eq!(back.entry.description.as_ref(), Some(text));
        }
        prop_assert_eq!(book.check(&[]).unwrap().wrong, None);
    }
}
