//! Edits of entries, by files and by flags, and entries from flags.

use ebbline::entry::InstrumentPapers;
use ebbline::record::{RecordError, RegisterEntry, RegisterKind, flag_of, from_flags, parse_register_as};

use super::{ACCEPTANCE, DIVER, FIRST_STAGE, LINES, MODBUS, ORIFICE, SHOP, entry, shut, with};

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
