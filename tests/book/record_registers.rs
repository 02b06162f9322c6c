//! The files of the registers: what is read as it stands, what is refused and in which words, edits, flags, the way back.
//!
//! All files are invented (`fixtures/registers`). A refusal is compared whole: its words are what a person reads.

#![allow(clippy::unwrap_used, reason = "a test that cannot read its own files fails")]

mod edits;
mod entries;

use std::io::{Cursor, Read};
use std::path::Path;

use chrono::NaiveDate;
use ebbline::entry::{
    Acceptance, Amount, Build, Diluent, Diver, FirstStage, Id, Instrument, InstrumentPapers, Limits, Logo,
    Measures, Meter, MeterKind, ModbusNumber, ModbusTable, Orifice, Papers, Protocol, Rule, Shop, Signatory,
    Socket, Tolerance, WordOrder,
};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Length, Mass, PressureDifference, PressureRate,
    ReferenceConditions, Share, Span, StpdFlow, Temperature, Uncertain, Volume,
};
use ebbline::record::{
    Fault, Loaded, NumberPattern, RecordError, RegisterEntry, RegisterKind, files_beside, from_flags,
    parse_register, parse_register_as, read_register, read_register_as, write_register,
};
use entries::{acceptances, any_entry};
use proptest::prelude::*;

const ORIFICE: &str = include_str!("../../fixtures/registers/orifice.toml");
const FIRST_STAGE: &str = include_str!("../../fixtures/registers/first_stage.toml");
const DIVER: &str = include_str!("../../fixtures/registers/diver.toml");
const ACCEPTANCE: &str = include_str!("../../fixtures/registers/acceptance.toml");
const SHOP: &str = include_str!("../../fixtures/registers/shop.toml");
const LINES: &str = include_str!("../../fixtures/registers/lines.toml");
const MODBUS: &str = include_str!("../../fixtures/registers/modbus.toml");
const LOGO: &[u8] = include_bytes!("../../fixtures/registers/logo.svg");

const ALL: [(&str, &str); 7] = [
    ("orifice.toml", ORIFICE),
    ("first_stage.toml", FIRST_STAGE),
    ("diver.toml", DIVER),
    ("acceptance.toml", ACCEPTANCE),
    ("shop.toml", SHOP),
    ("lines.toml", LINES),
    ("modbus.toml", MODBUS),
];

fn parse_with(toml: &str, logo: &[u8]) -> Result<Loaded<RegisterEntry>, RecordError> {
    parse_register(toml, "entry.toml", &mut |_| Ok(Box::new(Cursor::new(logo.to_vec()))))
}

fn parse(toml: &str) -> Result<Loaded<RegisterEntry>, RecordError> {
    parse_with(toml, LOGO)
}

fn entry(toml: &str) -> RegisterEntry {
    match parse(toml) {
        Ok(loaded) => loaded.value,
        Err(error) => panic!("{error}\n{toml}"),
    }
}

/// An entry read from files that nobody opens.
fn shut(name: &str) -> Result<Box<dyn Read>, RecordError> {
    panic!("{name} is opened")
}

/// `text` with one piece replaced; the piece must be there, once.
fn with(text: &str, old: &str, new: &str) -> String {
    assert_eq!(text.matches(old).count(), 1, "{old:?} stands once in the fixture");
    text.replacen(old, new, 1)
}

fn id(text: &str) -> Id {
    Id::new(text).unwrap()
}

#[test]
fn every_refusal_names_its_place_and_says_what_to_do() {
    let cases: toml::Table = include_str!("../../fixtures/registers/refused.toml").parse().unwrap();
    let cases = cases["case"].as_array().unwrap();
    assert!(cases.len() > 90, "{}", cases.len());
    for case in cases {
        let text = |key: &str| case[key].as_str().unwrap();
        let (_, whole) = ALL.into_iter().find(|(name, _)| *name == text("file")).unwrap();
        let got = match parse(&with(whole, text("old"), text("new"))) {
            Err(error) => error.to_string(),
            Ok(_) => panic!("taken: {case}"),
        };
        assert_eq!(got, text("says"), "{case}");
    }
}

#[test]
fn every_fixture_is_read_as_it_stands() {
    let orifice = Orifice {
        id: id("CMF-0417"),
        description: Some("Restrictor of a left-hand block".to_owned()),
        serial: Some("0417".to_owned()),
        maker: Some("invented".to_owned()),
        customer: Some("Tern Dive Club".to_owned()),
        build: Build::ShortTube,
        length: Some(Length::from_m(0.2e-3)),
        nominal_diameter: Some(Length::from_m(76e-6)),
        acceptance: Some(id("SHOP-5")),
    };
    assert_eq!(entry(ORIFICE), RegisterEntry::Orifice(orifice));
    let bar = PressureDifference::from_bar;
    let first_stage = FirstStage {
        id: id("FS-01"),
        compensated: false,
        ip_range: (GaugePressure::from_bar(7.0), GaugePressure::from_bar(13.0)),
        division: bar(0.1),
        gauge_scale: Some(GaugePressure::from_bar(20.0)),
        gauge_error: Some(bar(0.3)),
        ip_spread: Some(bar(0.2)),
        ip_repeat: Some(bar(0.1)),
        max_ip: Some(GaugePressure::from_bar(13.5)),
        trapped_volume: Some(Uncertain {
            value: Volume::from_m3(12e-6),
            expanded: Some(Volume::from_m3(3e-6)),
        }),
        // 1 bar/min is 5000/3 Pa/s.
        fall_observed: Some(Uncertain {
            value: PressureRate::from_pa_s(3500.0),
            expanded: Some(PressureRate::from_pa_s(1000.0 / 3.0)),
        }),
        maker: Some("invented".to_owned()),
        serial: Some("B-2207".to_owned()),
    };
    assert_eq!(entry(FIRST_STAGE), RegisterEntry::FirstStage(first_stage));
    let diver = Diver {
        id: id("D-07"),
        name: Some("R. Halász".to_owned()),
        mass: Some(Mass::from_kg(82.0)),
        loop_volume: Some(Uncertain {
            value: Volume::from_m3(7.5e-3),
            expanded: Some(Volume::from_m3(1e-3)),
        }),
        diluent: Some(Diluent::Oxygen(Share::from_ratio(0.18))),
    };
    assert_eq!(entry(DIVER), RegisterEntry::Diver(diver));
    let acceptance = Acceptance {
        id: Some(id("SHOP-5")),
        ip: GaugePressure::from_bar(10.0),
        flow: StpdFlow::from_l_min(0.48),
        gas: Some(Species::Oxygen),
        tolerance: Tolerance::Relative(0.05),
        rule: Rule::Guarded,
        limits: Limits { straight: 0.004, ..Limits::DEFAULT },
    };
    assert_eq!(entry(ACCEPTANCE), RegisterEntry::Acceptance(acceptance));
    let shop = Shop {
        name: "Harbour Orifice Works".to_owned(),
        address: "1 Slip Road\n7000 Hobart".to_owned(),
        contact: Some("bench@harbour.example".to_owned()),
        logo: Some(Logo { file_name: "logo.svg".to_owned(), bytes: LOGO.to_vec() }),
        accent: Some("#0B6E7A".to_owned()),
        number_pattern: Some("{year}-{n:4}".to_owned()),
        signatories: vec![
            Signatory { name: "I. Varga".to_owned(), role: None },
            Signatory { name: "M. Okafor".to_owned(), role: Some("head of calibration".to_owned()) },
        ],
        statements: vec!["Results hold for the item as received.".to_owned()],
    };
    assert_eq!(entry(SHOP), RegisterEntry::Shop(shop));
}

#[test]
fn the_instrument_of_the_interface_is_read_as_it_stands() {
    let RegisterEntry::Instrument(lines) = entry(LINES) else { panic!("an instrument") };
    let papers = Papers {
        gain: Some(0.008),
        zero: Some(IndicatedFlow::from_l_min(0.0006)),
        noise: Some(Amount::OfReading(0.002)),
        resolution: Some(IndicatedFlow::from_l_min(0.0001)),
        coverage: 2.0,
        range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
        certificate: Some("FM-2026-118".to_owned()),
        due: NaiveDate::from_ymd_opt(2027, 3, 1),
    };
    let kind = MeterKind::Mass {
        reads_at: ReferenceConditions {
            temperature: Temperature::from_c(20.0),
            pressure: AbsolutePressure::from_pa(101_325.0),
        },
        made_for: Species::Oxygen,
        gas_factor: None,
    };
    let want = Instrument {
        id: id("FM-01"),
        measures: Measures::Flow,
        socket: Some(Socket::Port("/dev/ttyUSB0".to_owned())),
        baud: Some(19_200),
        frame: Some("8N1".to_owned()),
        unit: Some("L/min".to_owned()),
        protocol: Some(Protocol::Lines {
            ask: Some("READ?\n".to_owned()),
            every: Some(Span::from_s(0.2)),
            ends: "\r\n".to_owned(),
            pattern: r"(?P<value>[-+]?\d+(\.\d+)?)".to_owned(),
            stale_after: Some(Span::from_s(2.0)),
        }),
        papers: Some(InstrumentPapers::Meter(Meter { id: Some(id("FM-01")), kind, papers })),
    };
    assert_eq!(lines, want);
    let RegisterEntry::Instrument(modbus) = entry(MODBUS) else { panic!("an instrument") };
    assert_eq!(modbus.socket, Some(Socket::Usb("0403:6001:A10K".to_owned())));
    let protocol = Protocol::ModbusRtu {
        device: 1,
        table: ModbusTable::Input,
        register: 0,
        number: ModbusNumber::I32,
        word_order: WordOrder::Big,
        scale: 0.001,
        every: Some(Span::from_s(0.2)),
        stale_after: Some(Span::from_s(2.0)),
    };
    assert_eq!(modbus.protocol, Some(protocol));
    let Some(InstrumentPapers::Transducer(papers)) = modbus.papers else { panic!("a transducer") };
    assert_eq!((papers.id, papers.papers.coverage.to_bits()), (Some(id("PT-01")), 2_f64.to_bits()));
}

#[test]
fn a_name_alone_is_an_entry_where_nothing_more_is_needed() {
    let bare = entry("record = \"orifice\"\nid = \"A\"");
    assert_eq!(bare, RegisterEntry::Orifice(Orifice::bare(id("A"))));
    assert_eq!(
        entry("record = \"diver\"\nid = \"A\"\nname = \" \""),
        RegisterEntry::Diver(Diver::bare(id("A")))
    );
    // A thermometer that is read by eye.
    let RegisterEntry::Instrument(read_by_eye) =
        entry("record = \"instrument\"\nid = \"T\"\nmeasures = \"temperature\"\nunit = \"C\"")
    else {
        panic!("an instrument")
    };
    assert_eq!((read_by_eye.socket, read_by_eye.unit.as_deref()), (None, Some("°C")));
}

#[test]
fn instruments_are_read_however_they_may_be_written() {
    let lower = with(LINES, "\"8N1\"", "\"8n1\"");
    assert_eq!(entry(&lower), entry(LINES));
    assert_eq!(entry(&with(LINES, "\"L/min\"\n\n", "\"lpm\"\n\n")), entry(LINES));
    let group = with(LINES, "unit = \"L/min\"\n", "");
    let group = with(&group, "(\\.\\d+)?)'", "(\\.\\d+)?) (?<unit>.*)'");
    let RegisterEntry::Instrument(sends_unit) = entry(&group) else { panic!("an instrument") };
    assert_eq!(sends_unit.unit, None);
    for (measures, unit) in [("cell", "mV"), ("cell", "bar"), ("depth", "ft"), ("barometer", "inHg")] {
        let (head, _) = MODBUS.split_once("[transducer]").unwrap();
        let toml = with(head, "\"pressure\"", &format!("\"{measures}\""));
        let RegisterEntry::Instrument(instrument) =
            entry(&with(&toml, "unit = \"bar\"", &format!("unit = \"{unit}\"")))
        else {
            panic!("an instrument")
        };
        assert_eq!((instrument.measures.name(), instrument.unit.as_deref()), (measures, Some(unit)));
    }
    // A meter of a register is held to the gas of the run it is used in, not to any here.
    let air = with(LINES, "made_for = \"oxygen\"", "made_for = \"air\"\ngas_factor = \"0.98 ± 0.01\"");
    let loaded = parse(&air).unwrap();
    assert_eq!(loaded.notes, []);
    parse(&with(LINES, "made_for = \"oxygen\"", "made_for = \"air\"")).unwrap();
}

#[test]
fn what_nothing_uses_is_said() {
    let said =
        |toml: &str| parse(toml).unwrap().notes.iter().map(|note| note.to_string()).collect::<Vec<_>>();
    let streams = with(LINES, "ask = \"READ?\\n\"\n", "");
    let streams = with(&streams, "\"2 s\"", "\"100 ms\"");
    let sentence =
        "entry.toml, line 11, [protocol] every: not used, an instrument that streams by itself is not asked";
    assert_eq!(said(&streams), [sentence]);
    let one_word = with(&with(MODBUS, "\"i32\"", "\"u16\""), "\"big\"", "\"little\"");
    let sentence = "entry.toml, line 15, [protocol] word_order: not used, the number takes one register";
    assert_eq!(said(&one_word), [sentence]);
    let ata = with(MODBUS, "unit = \"bar\"", "unit = \"ata\"");
    assert_eq!(said(&ata).len(), 1);
    assert!(
        said(&ata)[0].starts_with("entry.toml, line 7, unit: ata is read as 1.01325 bar"),
        "{:?}",
        said(&ata)
    );
    for (_, toml) in ALL {
        assert_eq!(said(toml), Vec::<String>::new());
    }
}

#[test]
fn a_shop_reads_its_logo_beside_its_file_and_nowhere_else() {
    let loaded = read_register(Path::new("fixtures/registers/shop.toml")).unwrap();
    assert_eq!(loaded.value, entry(SHOP));
    let folder = std::env::temp_dir().join(format!("ebbline-registers-{}", std::process::id()));
    std::fs::create_dir_all(folder.join("pictures")).unwrap();
    std::fs::write(folder.join("pictures/logo.PNG"), b"\x89PNG\r\n\x1a\n....").unwrap();
    let png = with(SHOP, "\"logo.svg\"", "\"pictures/logo.PNG\"");
    let path = folder.join("shop.toml");
    std::fs::write(&path, &png).unwrap();
    let RegisterEntry::Shop(shop) = read_register(&path).unwrap().value else { panic!("a shop") };
    assert_eq!(shop.logo.unwrap().file_name, "logo.PNG");
    std::fs::write(&path, SHOP).unwrap();
    let missing = read_register(&path).unwrap_err().to_string();
    let sentence =
        "there is no such file; check the name (one that stands in a file is taken relative to that file)";
    assert_eq!(missing, format!("{}: {sentence}", folder.join("logo.svg").display()));
    std::fs::write(&path, "#\n".repeat(600_000)).unwrap();
    let large = read_register(&path).unwrap_err();
    let file = path.display().to_string();
    assert_eq!(large, RecordError::Unreadable { file, fault: Fault::LargeEntry });
    std::fs::write(&path, b"\x89PNG\x00").unwrap();
    let binary = read_register_as(RegisterKind::Shop, &path, None).unwrap_err();
    assert!(matches!(binary, RecordError::Unreadable { fault: Fault::Binary, .. }), "{binary}");
    // From a shell a logo may lie anywhere.
    let flags = |logo: &str| {
        let flags = [("name", "H"), ("address", "1 Slip Road"), ("logo", logo)];
        flags.map(|(key, text)| (key.to_owned(), text.to_owned()))
    };
    let logo = folder.join("pictures/logo.PNG").display().to_string();
    let files = &mut files_beside(Path::new(""));
    let RegisterEntry::Shop(shop) = from_flags(RegisterKind::Shop, &flags(&logo), None, files).unwrap().value
    else {
        panic!("a shop")
    };
    assert_eq!(shop.logo.unwrap().file_name, "logo.PNG");
    std::fs::remove_dir_all(&folder).unwrap();

    for (name, bytes, sentence) in [
        ("logo.svg", vec![b' '; 1 << 20], "the file holds no SVG picture as its name says; save it again"),
        ("logo.svg", vec![b' '; (1 << 20) + 1], "the logo has more than 1 MiB; save it smaller"),
        ("logo.svg", b"<svg\xFF".to_vec(), "the file holds no SVG picture as its name says; save it again"),
        ("logo.png", LOGO.to_vec(), "the file holds no PNG picture as its name says; save it again"),
    ] {
        let error = parse_with(&with(SHOP, "logo.svg", name), &bytes).unwrap_err();
        assert_eq!(error.to_string(), format!("entry.toml, line 7, logo: {sentence}"));
    }
}

#[test]
fn certificate_numbers_follow_the_pattern() {
    let RegisterEntry::Shop(shop) = entry(SHOP) else { panic!("a shop") };
    let pattern = NumberPattern::parse(&shop.number_pattern.unwrap()).unwrap();
    assert_eq!(pattern.number(2026, 7), "2026-0007");
}

#[test]
fn what_is_written_is_read_again_and_looks_as_people_write_it() {
    for (name, toml) in ALL {
        let given = entry(toml);
        let written = write_register(&given);
        assert_eq!(entry(&written), given, "{name}:\n{written}");
        assert_eq!(write_register(&given), written, "the same entry gives the same text");
    }
    assert_eq!(write_register(&entry(ORIFICE)), ORIFICE.replace("0.2 mm", "200 µm"));
    let shop = write_register(&entry(SHOP));
    for line in ["address = \"1 Slip Road\\n7000 Hobart\"\n", "logo = \"logo.svg\"\n", "    \"I. Varga\",\n"]
    {
        assert!(shop.contains(line), "{shop}");
    }
    let lines = write_register(&entry(LINES));
    for line in [
        "ask = \"READ?\\n\"\n",
        "ends = \"\\r\\n\"\n",
        "every = \"0.2 s\"\n",
        "reads_at = \"20 °C, 101.325 kPa\"\n",
    ] {
        assert!(lines.contains(line), "{lines}");
    }
}

proptest! {
    #[test]
    fn any_entry_is_written_and_read_back_to_the_last_bit(given in any_entry()) {
        let written = write_register(&given);
        let again = parse(&written);
        prop_assert_eq!(again.map(|loaded| loaded.value), Ok(given), "{}", written);
    }

    #[test]
    fn an_edit_that_says_nothing_changes_nothing(given in any_entry()) {
        let same = parse_register_as(given.kind(), "", "edit.toml", Some(&given), &mut shut);
        prop_assert_eq!(same.map(|loaded| loaded.value), Ok(given));
    }

    #[test]
    fn an_edit_that_says_everything_leaves_nothing_of_what_stood(given in acceptances(), stood in acceptances()) {
        let text = write_register(&given);
        let (_, without_id) = text.split_once("\nip").unwrap();
        let edited = parse_register_as(RegisterKind::Acceptance, &format!("ip{without_id}"), "edit.toml", Some(&stood), &mut shut);
        let (RegisterEntry::Acceptance(given), RegisterEntry::Acceptance(stood)) = (given, stood) else { panic!() };
        let gas = given.gas.or(stood.gas);
        let want = RegisterEntry::Acceptance(Acceptance { id: stood.id, gas, ..given });
        prop_assert_eq!(edited.map(|loaded| loaded.value), Ok(want));
    }

    #[test]
    fn any_text_as_an_entry_is_read_or_refused(
        text in "\\PC{0,60}", which in 0..ALL.len(), at in 0_usize..700, gone in 0_usize..30,
    ) {
        let _ = parse(&text);
        let chars: Vec<char> = ALL[which].1.chars().collect();
        let at = at.min(chars.len());
        let end = (at + gone).min(chars.len());
        let middle = text.chars().take(8);
        let damaged: String = chars[..at].iter().copied().chain(middle).chain(chars[end..].iter().copied()).collect();
        if let Ok(loaded) = parse(&damaged) {
            let written = write_register(&loaded.value);
            prop_assert_eq!(parse(&written).map(|loaded| loaded.value), Ok(loaded.value), "{}", written);
        }
        let stands = entry(ALL[which].1);
        let _ = parse_register_as(stands.kind(), &damaged, "edit.toml", Some(&stands), &mut |_| Ok(Box::new(LOGO)));
    }

    #[test]
    fn any_flags_are_read_or_refused(
        which in 0..RegisterKind::ALL.len(),
        flags in proptest::collection::vec(("[a-z_.]{0,12}|id|name|address|protocol.ask|en|statements", "\\PC{0,12}"), 0..6),
    ) {
        let files = &mut |_: &str| -> Result<Box<dyn Read>, RecordError> { Ok(Box::new(LOGO)) };
        if let Err(error) = from_flags(RegisterKind::ALL[which], &flags, None, files) {
            let said = error.to_string();
            prop_assert!(said.starts_with("--"), "{}", said);
        }
    }
}
