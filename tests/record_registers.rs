//! The files of the registers: what is read as it stands, what is refused and in which words, edits, flags, the way back.
//!
//! All files are invented (`fixtures/registers`). A refusal is compared whole: its words are what a person reads.

#![allow(clippy::unwrap_used, reason = "a test that cannot read its own files fails")]

use std::io::{Cursor, Read};
use std::path::Path;

use chrono::NaiveDate;
use ebbline::entry::{
    Acceptance, Amount, Build, Diluent, Diver, FirstStage, FloatScale, Id, Instrument, InstrumentPapers,
    Limits, Logo, Measures, Meter, MeterKind, ModbusNumber, ModbusTable, Orifice, Papers, Protocol, Rule,
    Shop, Signatory, Socket, Tolerance, Transducer, WordOrder,
};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Length, Mass, PressureDifference, PressureRate,
    ReferenceConditions, Share, Span, StpdFlow, Temperature, Uncertain, Volume,
};
use ebbline::record::{
    Fault, Loaded, NumberPattern, RecordError, RegisterEntry, RegisterKind, files_beside, flag_of,
    from_flags, parse_register, parse_register_as, read_register, read_register_as, write_register,
};
use proptest::prelude::*;

const ORIFICE: &str = include_str!("../fixtures/registers/orifice.toml");
const FIRST_STAGE: &str = include_str!("../fixtures/registers/first_stage.toml");
const DIVER: &str = include_str!("../fixtures/registers/diver.toml");
const ACCEPTANCE: &str = include_str!("../fixtures/registers/acceptance.toml");
const SHOP: &str = include_str!("../fixtures/registers/shop.toml");
const LINES: &str = include_str!("../fixtures/registers/lines.toml");
const MODBUS: &str = include_str!("../fixtures/registers/modbus.toml");
const LOGO: &[u8] = include_bytes!("../fixtures/registers/logo.svg");

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
    let cases: toml::Table = include_str!("../fixtures/registers/refused.toml").parse().unwrap();
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
    let sentence = "there is no such file; check the name, which is taken relative to the file that names it";
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

/// The entry of `stands` after an edit by a file.
fn edit(stands: &str, toml: &str) -> Result<RegisterEntry, RecordError> {
    let stands = entry(stands);
    parse_register_as(stands.kind(), toml, "edit.toml", Some(&stands), &mut shut).map(|loaded| loaded.value)
}

#[test]
fn an_edit_replaces_the_keys_given_and_no_others() {
    assert_eq!(edit(ORIFICE, "").unwrap(), entry(ORIFICE));
    let want = entry(&with(ORIFICE, "\"Tern Dive Club\"", "\"Skua Divers\""));
    assert_eq!(edit(ORIFICE, "customer = \"Skua Divers\"").unwrap(), want);
    assert_eq!(
        edit(ORIFICE, "record = \"orifice\"\nid = \"cmf-0417\"\ncustomer = \"Skua Divers\"").unwrap(),
        want
    );
    let want =
        entry(&with(&with(ORIFICE, "customer = \"Tern Dive Club\"\n", ""), "length = \"0.2 mm\"\n", ""));
    assert_eq!(edit(ORIFICE, "customer = \"\"\nlength = \" \"").unwrap(), want);

    let want = entry(&with(LINES, "2027-03-01", "2028-03-01"));
    assert_eq!(edit(LINES, "[meter]\ndue = 2028-03-01").unwrap(), want);
    let want = entry(&with(LINES, "ask = \"READ?\\n\"\nevery = \"200 ms\"\n", ""));
    assert_eq!(edit(LINES, "[protocol]\nask = \"\"\nevery = \"\"").unwrap(), want);
    let want = entry(&with(LINES, "port = \"/dev/ttyUSB0\"", "usb = \"0403:6001:A1\""));
    assert_eq!(edit(LINES, "usb = \"0403:6001:A1\"").unwrap(), want);
    let want = entry(&with(MODBUS, "usb = \"0403:6001:A10K\"", "port = \"COM3\""));
    assert_eq!(edit(MODBUS, "port = \"COM3\"").unwrap(), want);
    assert_eq!(edit(ACCEPTANCE, "en = 2").unwrap(), entry(&with(ACCEPTANCE, "en = 1", "en = 2")));

    let want = entry(&with(SHOP, "\"I. Varga\",\n", ""));
    let edited =
        edit(SHOP, "signatories = [{ name = \"M. Okafor\", role = \"head of calibration\" }]").unwrap();
    assert_eq!(edited, want, "a list is replaced whole, and the logo stays without being opened");
    assert_eq!(edit(SHOP, "logo = \"\"").unwrap(), entry(&with(SHOP, "logo = \"logo.svg\"\n", "")));
}

#[test]
fn an_edit_to_another_kind_takes_nothing_along() {
    let (head, protocol) = LINES.split_once("[protocol]").unwrap();
    let (_, meter) = protocol.split_once("[meter]").unwrap();
    let modbus =
        "[protocol]\nkind = \"modbus-rtu\"\ndevice = 3\ntable = \"holding\"\nregister = 7\ntype = \"u16\"\n";
    assert_eq!(edit(LINES, modbus).unwrap(), entry(&format!("{head}{modbus}[meter]{meter}")));
    let wet = "[meter]\nkind = \"volumetric\"\nwet = true\n";
    let (before, _) = LINES.split_once("[meter]").unwrap();
    assert_eq!(edit(LINES, wet).unwrap(), entry(&format!("{before}{wet}")));
    // The same kind said again takes everything along.
    let same = "[protocol]\nkind = \"lines\"\n[meter]\nkind = \"mass\"";
    assert_eq!(edit(LINES, same).unwrap(), entry(LINES));
    let pressure = "measures = \"pressure\"\nunit = \"bar\"\n[transducer]\ngain = \"0.2 %\"";
    let RegisterEntry::Instrument(edited) = edit(LINES, pressure).unwrap() else { panic!("an instrument") };
    assert!(matches!(edited.papers, Some(InstrumentPapers::Transducer(_))));
}

#[test]
fn an_edit_is_refused_where_it_stands_or_where_the_entry_does_not_fit_it() {
    for (stands, toml, sentence) in [
        (
            ORIFICE,
            "id = \"CMF-0418\"",
            "edit.toml, line 1, id: the entry is \"CMF-0417\" and keeps its name; take \"CMF-0418\" out, or add it as \
             an entry of its own",
        ),
        (
            ORIFICE,
            "\nrecord = \"diver\"",
            "edit.toml, line 2, record: this is an entry of the register \"diver\", and one of \"orifice\" is wanted; \
             add it there",
        ),
        (ORIFICE, "\nlength = \"0 mm\"", "edit.toml, line 2, length: 0 mm cannot be; it must be above zero"),
        (
            LINES,
            "measures = \"depth\"",
            "FM-01 as it stands, unit: \"L/min\" is a unit of flow, and a length is asked for: use m, µm, mm, cm, in \
             or ft",
        ),
        (
            LINES,
            "measures = \"depth\"\nunit = \"m\"",
            "FM-01 as it stands, meter: a table [meter] goes with an instrument for flow, and this one measures depth; \
             take it out",
        ),
        (
            FIRST_STAGE,
            "ip_range = \"18 bar to 21 bar\"",
            "FS-01 as it stands, gauge_scale: 20 bar cannot be; it must be at least the upper end of ip_range",
        ),
        (
            LINES,
            "[protocol]\nends = \"\"",
            "edit.toml, line 1, [protocol] ends: this key is missing; write for example ends = \"\\r\\n\"",
        ),
        (
            LINES,
            "[protocol]\naks = \"X\"",
            "edit.toml, line 2, [protocol]: unknown key \"aks\"; the nearest known one is \"ask\"",
        ),
        (
            SHOP,
            "name = \"\"",
            "edit.toml, name: this key is missing; write for example name = \"Harbour Orifice Works\"",
        ),
        (
            LINES,
            "[protocol]\nkind = 7",
            "edit.toml, line 2, [protocol] kind: this must be a text in quotes, not a number",
        ),
        (LINES, "protocol = 7", "edit.toml, line 1, protocol: this must be a table, not a number"),
    ] {
        assert_eq!(edit(stands, toml).unwrap_err().to_string(), sentence);
    }
    let diver = entry(DIVER);
    let other =
        parse_register_as(RegisterKind::Orifice, "", "edit.toml", Some(&diver), &mut shut).unwrap_err();
    let sentence = "D-07 as it stands, record: this is an entry of the register \"diver\", and one of \"orifice\" is \
                    wanted; add it there";
    assert_eq!(other.to_string(), sentence);
    let other = parse_register_as(RegisterKind::Orifice, DIVER, "new.toml", None, &mut shut).unwrap_err();
    let sentence = "new.toml, line 1, record: this is an entry of the register \"diver\", and one of \"orifice\" is \
                    wanted; add it there";
    assert_eq!(other.to_string(), sentence);
    let unsaid = with(ORIFICE, "record = \"orifice\"\n", "");
    let read = parse_register_as(RegisterKind::Orifice, &unsaid, "new.toml", None, &mut shut).unwrap();
    assert_eq!(read.value, entry(ORIFICE));
}

fn flags(pairs: &[(&str, &str)]) -> Vec<(String, String)> {
    pairs.iter().map(|(key, text)| ((*key).to_owned(), (*text).to_owned())).collect()
}

#[test]
fn flags_give_the_entry_that_a_file_gives() {
    let given =
        |kind, pairs: &[(&str, &str)]| from_flags(kind, &flags(pairs), None, &mut shut).unwrap().value;
    let orifice = given(
        RegisterKind::Orifice,
        &[
            ("nominal_diameter", "76 µm"),
            ("id", "CMF-0417"),
            ("description", "Restrictor of a left-hand block"),
            ("serial", "0417"),
            ("maker", "invented"),
            ("customer", "Tern Dive Club"),
            ("build", "short tube"),
            ("length", "0.2 mm"),
            ("acceptance", "SHOP-5"),
        ],
    );
    assert_eq!(orifice, entry(ORIFICE));
    let lines = given(
        RegisterKind::Instrument,
        &[
            ("meter.kind", "mass"),
            ("id", "FM-01"),
            ("measures", "flow"),
            ("protocol.kind", "lines"),
            ("protocol.ask", r"READ?\n"),
            ("protocol.ends", r"\r\n"),
            ("port", "/dev/ttyUSB0"),
            ("baud", "19200"),
            ("frame", "8N1"),
            ("unit", "L/min"),
            ("protocol.every", "200 ms"),
            ("protocol.pattern", r"(?P<value>[-+]?\d+(\.\d+)?)"),
            ("protocol.stale_after", "2 s"),
            ("meter.reads_at", "20 °C, 101.325 kPa"),
            ("meter.made_for", "oxygen"),
            ("meter.gain", "0.8 %"),
            ("meter.zero", "0.0006 L/min"),
            ("meter.noise", "0.2 %"),
            ("meter.resolution", "0.0001 L/min"),
            ("meter.coverage", "2"),
            ("meter.range", "0.02 L/min to 2 L/min"),
            ("meter.certificate", "FM-2026-118"),
            ("meter.due", "2027-03-01"),
        ],
    );
    assert_eq!(lines, entry(LINES));
    let acceptance = given(
        RegisterKind::Acceptance,
        &[
            ("id", "SHOP-5"),
            ("ip", "10 bar"),
            ("flow", "0.48 L/min"),
            ("tolerance", "5 %"),
            ("rule", "guarded"),
            ("gas", "oxygen"),
            ("straight", "0.4 %"),
            ("significance", "0.01"),
            ("crossing", "0 kPa to 25 kPa"),
            ("en", "1"),
        ],
    );
    assert_eq!(acceptance, entry(ACCEPTANCE));
    let RegisterEntry::FirstStage(first_stage) = given(
        RegisterKind::FirstStage,
        &[("id", "FS"), ("compensated", "true"), ("ip_range", "9 bar to 11 bar"), ("division", "0.2 bar")],
    ) else {
        panic!("a first stage")
    };
    assert!(first_stage.compensated);
    let RegisterEntry::Shop(shop) = given(
        RegisterKind::Shop,
        &[
            ("name", "H"),
            ("statements", "One."),
            ("address", "1 \"Slip\" Road\n7000"),
            ("statements", "Two \\."),
        ],
    ) else {
        panic!("a shop")
    };
    assert_eq!(
        (shop.statements, shop.address.as_str()),
        (vec!["One.".to_owned(), "Two \\.".to_owned()], "1 \"Slip\" Road\n7000")
    );
}

#[test]
fn flags_edit_as_files_do() {
    let edited = |stands: &str, pairs: &[(&str, &str)]| {
        let stands = entry(stands);
        from_flags(stands.kind(), &flags(pairs), Some(&stands), &mut shut).unwrap().value
    };
    assert_eq!(edited(LINES, &[]), entry(LINES));
    let want = with(&with(LINES, "2027-03-01", "2028-03-01"), "19200", "9600");
    assert_eq!(edited(LINES, &[("meter.due", "2028-03-01"), ("baud", "9600")]), entry(&want));
    let want = with(SHOP, "statements = [\"Results hold for the item as received.\"]\n", "");
    let want = with(&want, "contact = \"bench@harbour.example\"\n", "");
    assert_eq!(edited(SHOP, &[("statements", ""), ("contact", "")]), entry(&want));
}

#[test]
fn flags_are_refused_under_their_own_names() {
    let first_stage: &[(&str, &str)] =
        &[("id", "FS"), ("ip_range", "9 bar to 11 bar"), ("division", "0.2 bar")];
    let instrument: &[(&str, &str)] = &[
        ("id", "FM"),
        ("measures", "flow"),
        ("port", "COM3"),
        ("unit", "L/min"),
        ("protocol.kind", "lines"),
    ];
    for (kind, start, more, sentence) in [
        (
            RegisterKind::Orifice,
            &[] as &[_],
            &[("serial", "7")] as &[_],
            "--id: this key is missing; write for example id = \"CMF-0417\"",
        ),
        (
            RegisterKind::Orifice,
            &[("id", "A")],
            &[("nominal_diameter", "76")],
            "--nominal-diameter: \"76\" has a number without a unit: give the length in m, µm, mm, cm, in or ft",
        ),
        (
            RegisterKind::Orifice,
            &[("id", "A")],
            &[("id", "A")],
            "--id: this flag says again what another one says; keep one of them",
        ),
        (
            RegisterKind::Orifice,
            &[("id", "A")],
            &[("seriel", "7")],
            "--seriel: unknown key \"seriel\"; the nearest known one is \"serial\"",
        ),
        (
            RegisterKind::Orifice,
            &[("id", "A")],
            &[("serial", "7\u{202E}")],
            "--serial: the text holds a control or direction character (U+202E); type it without",
        ),
        (
            RegisterKind::FirstStage,
            first_stage,
            &[],
            "--compensated: this key is missing; write for example compensated = false (its IP does not follow depth)",
        ),
        (
            RegisterKind::FirstStage,
            first_stage,
            &[("compensated", "no")],
            "--compensated: \"no\" is not known here; use one of: true, false",
        ),
        (
            RegisterKind::FirstStage,
            first_stage,
            &[("compensated", "")],
            "--compensated: this must be true or false, not a text",
        ),
        (RegisterKind::Instrument, instrument, &[("baud", "fast")], "--baud: \"fast\" is not a number"),
        (RegisterKind::Instrument, instrument, &[("baud", "nan")], "--baud: \"nan\" is not a number"),
        (
            RegisterKind::Instrument,
            instrument,
            &[("baud", "0")],
            "--baud: 0 cannot be; it must be a number of bits per second above zero, as in 19200",
        ),
        (
            RegisterKind::Instrument,
            instrument,
            &[("baud", "9600")],
            "--protocol-ends: this key is missing; write for example ends = \"\\r\\n\"",
        ),
        (
            RegisterKind::Instrument,
            instrument,
            &[("baud", "9600"), ("protocol.ends", "\\x0D")],
            "--protocol-ends: \"\\\\x0D\" has a backslash that makes no escape; use \\r, \\n, \\t, or \\\\ for a backslash",
        ),
        (
            RegisterKind::Instrument,
            instrument,
            &[("baud", "9600"), ("protocol.stale_after", "5 m")],
            "--protocol-stale-after: \"m\" in \"5 m\" is a unit of length, and a span of time is asked for: use s, ms, \
             min or h",
        ),
        (
            RegisterKind::Instrument,
            instrument,
            &[("baud", "9600"), ("protocol.asks", "x")],
            "--protocol-asks: unknown key \"asks\"; the nearest known one is \"ask\"",
        ),
        (
            RegisterKind::Shop,
            &[("name", "H"), ("address", "A"), ("signatories", "V")],
            &[("signatories", "v")],
            "--signatories: \"v\" is named twice; keep one",
        ),
    ] {
        let all = flags(&[start, more].concat());
        let error = from_flags(kind, &all, None, &mut shut).unwrap_err();
        assert_eq!(error.to_string(), sentence);
    }
    assert_eq!(flag_of("nominal_diameter"), "--nominal-diameter");
    assert_eq!(flag_of("meter.made_for"), "--meter-made-for");
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

fn ids() -> impl Strategy<Value = Id> {
    "[A-Za-zÄß][-A-Za-z0-9_.é]{0,8}".prop_filter_map("a name", |text| Id::new(&text).ok())
}

/// Words as they are after reading: no spaces around, nothing hidden, something there.
fn words() -> impl Strategy<Value = String> {
    "[!-~äß€][ -~äß€]{0,12}[!-~äß€]"
}

fn maybe<T: std::fmt::Debug>(some: impl Strategy<Value = T>) -> impl Strategy<Value = Option<T>> {
    proptest::option::of(some)
}

fn uncertain<T: std::fmt::Debug + Clone>(
    from: fn(f64) -> T,
    most: f64,
) -> impl Strategy<Value = Option<Uncertain<T>>> {
    maybe(
        (1e-9..most, maybe(0.0..most)).prop_map(move |(value, expanded)| Uncertain {
            value: from(value),
            expanded: expanded.map(from),
        }),
    )
}

fn orifices() -> impl Strategy<Value = RegisterEntry> {
    let builds = vec![Build::ThinPlate, Build::ShortTube, Build::Nozzle, Build::Unknown];
    let size = || maybe((1e-6..1e-2_f64).prop_map(Length::from_m));
    let texts = (maybe(words()), maybe(words()), maybe(words()), maybe(words()));
    (ids(), texts, proptest::sample::select(builds), size(), size(), maybe(ids())).prop_map(
        |(id, (description, serial, maker, customer), build, length, nominal_diameter, acceptance)| {
            RegisterEntry::Orifice(Orifice {
                id,
                description,
                serial,
                maker,
                customer,
                build,
                length,
                nominal_diameter,
                acceptance,
            })
        },
    )
}

fn first_stages() -> impl Strategy<Value = RegisterEntry> {
    let spread = || maybe((0.0..1e5_f64).prop_map(PressureDifference::from_pa));
    let volumes = (uncertain(Volume::from_m3, 1e-4), uncertain(PressureRate::from_pa_s, 1e5));
    (
        (ids(), any::<bool>(), 0.0..9e5_f64, 2e5..9e5_f64, 1.0..2e5_f64),
        (maybe(0.0..1e6_f64), maybe(1.0..1e6_f64)),
        (spread(), spread(), spread()),
        volumes,
        (maybe(words()), maybe(words())),
    )
        .prop_map(|((id, compensated, low, width, division), (scale, most), spreads, volumes, texts)| {
            let high = low + width;
            RegisterEntry::FirstStage(FirstStage {
                id,
                compensated,
                ip_range: (GaugePressure::from_pa(low), GaugePressure::from_pa(high)),
                division: PressureDifference::from_pa(division),
                gauge_scale: scale.map(|above| GaugePressure::from_pa(high + above)),
                gauge_error: spreads.0,
                ip_spread: spreads.1,
                ip_repeat: spreads.2,
                max_ip: most.map(|above| GaugePressure::from_pa(low + above)),
                trapped_volume: volumes.0,
                fall_observed: volumes.1,
                maker: texts.0,
                serial: texts.1,
            })
        })
}

fn divers() -> impl Strategy<Value = RegisterEntry> {
    let diluent = prop_oneof![
        Just(Diluent::Air),
        (1e-3..1.0_f64).prop_map(|share| Diluent::Oxygen(Share::from_ratio(share)))
    ];
    let mass = maybe((1.0..300.0_f64).prop_map(Mass::from_kg));
    (ids(), maybe(words()), mass, uncertain(Volume::from_m3, 0.02), maybe(diluent)).prop_map(
        |(id, name, mass, loop_volume, diluent)| {
            RegisterEntry::Diver(Diver { id, name, mass, loop_volume, diluent })
        },
    )
}

fn acceptances() -> impl Strategy<Value = RegisterEntry> {
    let tolerance = prop_oneof![
        (1e-4..0.5_f64).prop_map(Tolerance::Relative),
        (1e-9..1e-5_f64).prop_map(|flow| Tolerance::Flow(StpdFlow::from_m3_s(flow))),
    ];
    let share = || 1e-5..0.2_f64;
    let limits = (
        share(),
        share(),
        share(),
        share(),
        1e-4..0.4_f64,
        -1e5..0.0_f64,
        1.0..1e5_f64,
        0.1..5.0_f64,
        1e-3..1e3_f64,
    );
    let gas = maybe(proptest::sample::select(Species::ALL.to_vec()));
    let rule = proptest::sample::select(vec![Rule::Simple, Rule::Guarded]);
    (ids(), 0.0..2e6_f64, 1e-7..1e-4_f64, gas, tolerance, rule, limits).prop_map(
        |(id, ip, flow, gas, tolerance, rule, limits)| {
            let (straight, hysteresis, repeat, steady, significance, low, high, en, leak_pa_s) = limits;
            RegisterEntry::Acceptance(Acceptance {
                id: Some(id),
                ip: GaugePressure::from_pa(ip),
                flow: StpdFlow::from_m3_s(flow),
                gas,
                tolerance,
                rule,
                limits: Limits {
                    straight,
                    hysteresis,
                    repeat,
                    steady,
                    significance,
                    crossing_pa: (low, high),
                    en,
                    leak_pa_s,
                },
            })
        },
    )
}

fn shops() -> impl Strategy<Value = RegisterEntry> {
    let lines = || proptest::collection::vec(words(), 1..4).prop_map(|lines| lines.join("\n"));
    let logo = maybe(Just(Logo { file_name: "logo.svg".to_owned(), bytes: LOGO.to_vec() }));
    let pattern = maybe("[A-QT-Z]{0,3}\\{year\\}-\\{n(:[1-9])?\\}");
    let signatories = proptest::collection::vec((words(), maybe(words())), 0..3).prop_map(|people| {
        let mut signatories: Vec<Signatory> = Vec::new();
        for (name, role) in people {
            if signatories.iter().all(|other| other.name.to_lowercase() != name.to_lowercase()) {
                signatories.push(Signatory { name, role });
            }
        }
        signatories
    });
    let statements = proptest::collection::vec(words(), 0..3);
    (words(), lines(), maybe(lines()), logo, maybe("#[0-9a-fA-F]{6}"), pattern, signatories, statements)
        .prop_map(|(name, address, contact, logo, accent, number_pattern, signatories, statements)| {
            RegisterEntry::Shop(Shop {
                name,
                address,
                contact,
                logo,
                accent,
                number_pattern,
                signatories,
                statements,
            })
        })
}

fn protocols() -> impl Strategy<Value = Protocol> {
    let times = || (maybe(1e-3..10.0_f64), maybe(10.5..100.0_f64));
    let span = |s: Option<f64>| s.map(Span::from_s);
    let lines =
        (maybe("[ -~\r\n\t]{1,9}"), "[\r\n;]{1,2}", times()).prop_map(move |(ask, ends, (every, stale))| {
            let pattern = r"^\s*(?P<value>[-+.\deE]+)\s*(?P<unit>\S*)".to_owned();
            Protocol::Lines { ask, every: span(every), ends, pattern, stale_after: span(stale) }
        });
    let table = proptest::sample::select(vec![ModbusTable::Input, ModbusTable::Holding]);
    let numbers =
        vec![ModbusNumber::F32, ModbusNumber::I16, ModbusNumber::U16, ModbusNumber::I32, ModbusNumber::U32];
    let number = proptest::sample::select(numbers);
    let scale = any::<f64>().prop_filter("a number", |x| x.is_finite() && x.abs() > 0.0);
    let modbus = (1..=247_u8, table, 0..u16::MAX, number, any::<bool>(), scale, times()).prop_map(
        move |(device, table, register, number, little, scale, (every, stale))| {
            let one = matches!(number, ModbusNumber::I16 | ModbusNumber::U16);
            let word_order = if little && !one { WordOrder::Little } else { WordOrder::Big };
            let (every, stale_after) = (span(every), span(stale));
            Protocol::ModbusRtu { device, table, register, number, word_order, scale, every, stale_after }
        },
    );
    prop_oneof![lines, modbus]
}

fn papers<D: std::fmt::Debug, R: std::fmt::Debug>(
    difference: fn(f64) -> D,
    reading: fn(f64) -> R,
) -> impl Strategy<Value = Papers<D, R>> {
    let amount = move || maybe((0.0..0.1_f64).prop_map(difference));
    let noise = prop_oneof![
        (0.0..0.1_f64).prop_map(Amount::OfReading),
        (0.0..0.1_f64).prop_map(move |noise| Amount::Fixed(difference(noise))),
    ];
    let range =
        maybe((0.0..1.0_f64, 1.5..9.0_f64).prop_map(move |(low, high)| (reading(low), reading(high))));
    let day = maybe((0..20_000_i64).prop_map(|days| NaiveDate::default() + chrono::Duration::days(days)));
    (maybe(0.0..0.1_f64), amount(), maybe(noise), amount(), 0.5..4.0_f64, range, maybe(words()), day)
        .prop_map(|(gain, zero, noise, resolution, coverage, range, certificate, due)| Papers {
            gain,
            zero,
            noise,
            resolution,
            coverage,
            range,
            certificate,
            due,
        })
}

fn meters() -> impl Strategy<Value = Meter> {
    let reference = || {
        (250.0..320.0_f64, 8e4..1.2e5_f64).prop_map(|(k, pa)| ReferenceConditions {
            temperature: Temperature::from_k(k),
            pressure: AbsolutePressure::from_pa(pa),
        })
    };
    let gas = || proptest::sample::select(Species::ALL.to_vec());
    let mass = (reference(), gas()).prop_map(|(reads_at, made_for)| MeterKind::Mass {
        reads_at,
        made_for,
        gas_factor: None,
    });
    let float = (reference(), gas(), maybe(reference())).prop_map(|(reads_at, made_for, made_at)| {
        let scale = if made_at.is_some() { FloatScale::Reference } else { FloatScale::Actual };
        MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor: None }
    });
    let kind = prop_oneof![
        mass,
        float,
        any::<bool>().prop_map(|wet| MeterKind::Volumetric { wet }),
        any::<bool>().prop_map(|wet| MeterKind::Timed { wet }),
    ];
    (kind, papers(IndicatedFlow::from_l_min, IndicatedFlow::from_l_min)).prop_map(|(kind, papers)| Meter {
        id: None,
        kind,
        papers,
    })
}

fn instruments() -> impl Strategy<Value = RegisterEntry> {
    let socket = prop_oneof![
        words().prop_map(Socket::Port),
        "[0-9a-fA-F]{4}:[0-9a-fA-F]{4}:[!-~]{1,9}".prop_map(Socket::Usb),
    ];
    let line = (socket, 1..=u32::MAX, maybe("8[NEO][12]"), protocols());
    let measures = vec![
        Measures::Flow,
        Measures::Pressure,
        Measures::Temperature,
        Measures::Barometer,
        Measures::Cell,
        Measures::Depth,
    ];
    let transducer = papers(PressureDifference::from_bar, GaugePressure::from_bar)
        .prop_map(|papers| Transducer { id: None, papers });
    (ids(), proptest::sample::select(measures), maybe(line), maybe(meters()), maybe(transducer)).prop_map(
        |(id, measures, line, meter, transducer)| {
            let unit = match measures {
                Measures::Flow => "mL/min",
                Measures::Pressure => "psi",
                Measures::Temperature => "°F",
                Measures::Barometer => "hPa",
                Measures::Cell => "mV",
                Measures::Depth => "ft",
            };
            let papers = match measures {
                Measures::Flow => meter.map(|m| InstrumentPapers::Meter(Meter { id: Some(id.clone()), ..m })),
                Measures::Pressure | Measures::Barometer => {
                    transducer.map(|t| InstrumentPapers::Transducer(Transducer { id: Some(id.clone()), ..t }))
                }
                _ => None,
            };
            let unit = Some(unit.to_owned());
            let (socket, baud, frame, protocol) = match line {
                Some((socket, baud, frame, protocol)) => (Some(socket), Some(baud), frame, Some(protocol)),
                None => (None, None, None, None),
            };
            RegisterEntry::Instrument(Instrument {
                id,
                measures,
                socket,
                baud,
                frame,
                unit,
                protocol,
                papers,
            })
        },
    )
}

fn entries() -> impl Strategy<Value = RegisterEntry> {
    prop_oneof![orifices(), first_stages(), divers(), acceptances(), shops(), instruments()]
}

proptest! {
    #[test]
    fn any_entry_is_written_and_read_back_to_the_last_bit(given in entries()) {
        let written = write_register(&given);
        let again = parse(&written);
        prop_assert_eq!(again.map(|loaded| loaded.value), Ok(given), "{}", written);
    }

    #[test]
    fn an_edit_that_says_nothing_changes_nothing(given in entries()) {
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
