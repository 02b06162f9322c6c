use super::*;
use crate::entry::Id;
use crate::quantity::unit::lookup;

/// A flow meter that streams, tried from the register.
fn trial() -> TrialShown {
    let instrument = Instrument {
        id: Id::new("FM-01").unwrap(),
        measures: Measures::Flow,
        socket: Some(Socket::Port("COM3".into())),
        baud: Some(9_600),
        frame: None,
        unit: Some("L/min".into()),
        protocol: Some(Protocol::Lines {
            ask: None,
            every: None,
            ends: "\n".into(),
            pattern: r"(?P<value>\d+\.\d+)".into(),
            stale_after: None,
        }),
        papers: None,
    };
    let unit = lookup(Kind::Flow, "L/min").unwrap();
    let reading = |at_s: f64, shown: f64| TrialReading {
        at_s,
        shown,
        unit: unit.symbol,
        si: unit.to_si(shown),
        kind: Some(Kind::Flow),
    };
    TrialShown {
        instrument,
        from: ProfileFrom::Register(None),
        baud: 9_600,
        frame: "8N1".into(),
        listened_s: 2.0,
        bytes: 24,
        raw: b"0.4812\n\x1b[2J\"x\\\n".to_vec(),
        readings: vec![reading(0.5, 0.4812), reading(1.0, 0.4799), reading(1.5, 0.4805)],
        rate_per_s: Some(2.0),
        outside_range: 0,
        faults: Vec::new(),
        lost: None,
        proposals: Vec::new(),
    }
}

fn change(key: &'static str, from: Option<&str>, to: &str) -> ChangeShown {
    let flag = format!("--{}", key.replace(['.', '_'], "-"));
    ChangeShown { key, flag, from: from.map(str::to_owned), to: to.to_owned() }
}

fn proposing(changes: Vec<ChangeShown>) -> TrialShown {
    let proposal = ProposalShown { changes, readings: 9, first: Some((0.4812, "L/min")), faults: 0 };
    TrialShown { readings: Vec::new(), proposals: vec![proposal], ..trial() }
}

#[test]
fn a_good_trial_says_what_came_and_between_which_it_lies() {
    let trial = trial();
    assert!(trial.reads_well());
    assert_eq!(summary(&trial), "FM-01 reads: 3 readings (2 a second) and no fault in 2.0 s");
    let text = text(&trial, &Units::default());
    assert!(text.contains("between 0.4799 L/min and 0.4812 L/min; the meter's own litres"), "{text}");
    assert!(!text.contains("that is"), "the unit is the one asked for: {text}");
    // 24 bytes came, of which 15 were kept: 7 to the first line feed, 8 behind it.
    assert!(text.contains("… and 9 bytes more"), "{text}");
}

#[test]
fn bytes_of_a_device_steer_no_terminal() {
    let text = text(&trial(), &Units::default());
    assert!(text.contains("  0.4812\\n\n  \\x1b[2J\"x\\\\\\n\n"), "{text}");
    assert!(!text.contains('\u{1b}'));
    let document: serde_json::Value = serde_json::from_str(&json(&trial())).unwrap();
    assert_eq!(document["raw"], "0.4812\\n\\x1b[2J\"x\\\\\\n");
    assert_eq!((&document["reads_well"], &document["rate_per_s"]), (&true.into(), &2.0.into()));
}

#[test]
fn the_unit_asked_for_stands_beside_the_instrument_s_own() {
    let shown = crate::quantity::Shown::parse("mL/min").unwrap();
    let text = text(&trial(), &Units::new(shown));
    assert!(text.contains("0.4812 L/min 481.2 mL/min"), "{text}");
}

#[test]
fn faults_or_a_proposal_or_a_lost_port_are_not_well() {
    let fault = FaultShown { kind: TrialFault::NoMatch, times: 2, example: b"ERR\r".to_vec() };
    let faulty = TrialShown { faults: vec![fault], ..trial() };
    assert!(!faulty.reads_well());
    assert_eq!(summary(&faulty), "FM-01 reads with faults: 3 readings (2 a second) and 2 faults in 2.0 s");
    let text = text(&faulty, &Units::default());
    assert!(
        text.contains("     2  a line that the pattern does not match\n        such as: ERR\\r\n"),
        "{text}"
    );
    let other_unit = TrialShown {
        proposals: proposing(vec![change("unit", Some("mL/min"), "L/min")]).proposals,
        ..trial()
    };
    assert!(!other_unit.reads_well());
    assert!(summary(&other_unit).contains("something else than the profile"));
    assert!(!TrialShown { lost: Some("gone".into()), ..trial() }.reads_well());
}

#[test]
fn a_proposal_is_a_command_that_can_be_pasted() {
    for (changes, command) in [
        (vec![change("baud", Some("9600"), "19200")], "--baud 19200"),
        (vec![change("protocol.ends", Some("\n"), "\r\n")], r"--protocol-ends '\r\n'"),
        (
            vec![change("protocol.pattern", Some("x"), r"IT'S (?P<value>\d+)")],
            r"--protocol-pattern 'IT'\''S (?P<value>\d+)'",
        ),
        (vec![change("frame", Some("8N1"), "7E1"), change("unit", None, "°C")], "--frame 7E1 --unit '°C'"),
        (vec![change("protocol.word_order", Some("big"), "little")], "--protocol-word-order little"),
    ] {
        let trial = proposing(changes);
        let wanted = format!("ebbline instrument edit FM-01 {command}");
        assert_eq!(trial.proposals[0].command(&trial), Some(wanted.clone()));
        assert!(text(&trial, &Units::default()).contains(&format!("      {wanted}\n")));
    }
    let named = TrialShown {
        from: ProfileFrom::Register(Some("my book.db".into())),
        ..proposing(vec![change("baud", Some("9600"), "19200")])
    };
    let command = named.proposals[0].command(&named).unwrap();
    assert_eq!(command, "ebbline instrument edit FM-01 --baud 19200 --book 'my book.db'");
}

#[test]
fn what_no_shell_can_type_and_what_is_in_a_file_is_a_line_of_toml() {
    let odd =
        proposing(vec![change("protocol.ends", Some("\n"), "\u{3}"), change("baud", Some("1"), "9600")]);
    assert_eq!(odd.proposals[0].command(&odd), None);
    assert_eq!(odd.proposals[0].lines(), ["baud = 9600", "[protocol]", "ends = \"\\U00000003\""]);
    let text = text(&odd, &Units::default());
    assert!(
        text.contains("in a file for ebbline instrument edit FM-01 FILE.toml:\n        baud = 9600\n"),
        "{text}"
    );

    let of_file = TrialShown {
        from: ProfileFrom::File("fm.toml".into()),
        ..proposing(vec![
            change("protocol.pattern", Some("x"), r"(?P<value>\d+)'"),
            change("unit", None, "L/min"),
        ])
    };
    assert_eq!(of_file.proposals[0].command(&of_file), None);
    for line in of_file.proposals[0].lines().iter().filter(|line| !line.starts_with('[')) {
        let table: toml::Table = line.parse().unwrap_or_else(|error| panic!("{line}: {error}"));
        let (key, value) = table.iter().next().unwrap();
        let wanted = if key == "unit" { "L/min" } else { r"(?P<value>\d+)'" };
        assert_eq!(value.as_str(), Some(wanted));
    }
}

#[test]
fn silence_says_what_to_look_at() {
    let silent = TrialShown { bytes: 0, raw: Vec::new(), readings: Vec::new(), rate_per_s: None, ..trial() };
    assert_eq!(summary(&silent), "FM-01 said nothing in 2.0 s");
    assert!(text(&silent, &Units::default()).contains("Not one byte came: check cable and power"));
    let deaf = TrialShown { readings: Vec::new(), rate_per_s: None, ..trial() };
    assert_eq!(summary(&deaf), "FM-01 gives no reading: 24 bytes in 2.0 s, none of them readable");
}
