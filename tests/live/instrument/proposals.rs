//! Trying out: each wrong setting gets a proposal that was tried.

use ebbline::entry::{Instrument, Measures, ModbusNumber, ModbusTable, Protocol, WordOrder};
use ebbline::instrument::modbus_frame::sealed;
use ebbline::instrument::{Change, Lost, Trial, fitting_text, try_out};

use super::support::{NUMBER, Port, asked, lines, modbus, to_16_bar};

fn trial(instrument: &Instrument, port: &Port) -> Trial {
    try_out(instrument, port, port.ticks.as_ref(), 3.0).unwrap()
}

/// The changes of the only proposal, which must have been tried and must still do well when taken.
#[track_caller]
fn only(trial: &Trial, port: &Port) -> Vec<Change> {
    let [proposal] = trial.proposals.as_slice() else { panic!("{:#?}", trial.proposals) };
    assert!(proposal.readings.len() >= 2, "{proposal:?}");
    let again = try_out(&proposal.instrument, port, port.ticks.as_ref(), 3.0).unwrap();
    assert!(again.does_well() && again.proposals.is_empty(), "{again:?}");
    proposal.changes.clone()
}

/// A flow meter that says this every fifth of a second for a very long time.
fn meter(set: &str, baud: u32, line: &str) -> Port {
    Port::new(set, baud).says(0.05, 0.2, 2_000, |_| line.to_owned())
}

fn flow() -> Instrument {
    lines("FM-1", Measures::Flow, NUMBER, Some("L/min"))
}

#[test]
fn a_right_profile_gets_its_readings_and_no_proposal() {
    let port = meter("8N1", 9_600, "0.512\r\n");
    let trial = trial(&flow(), &port);
    assert!(trial.does_well() && trial.proposals.is_empty() && trial.lost.is_none());
    assert_eq!(trial.readings().count(), 14);
    assert!((trial.rate_per_s().unwrap() - 5.0).abs() < 1e-6);
    assert_eq!(trial.bytes, 15 * 7);
    assert!(trial.raw.starts_with(b"0.512\r\n0.512"));
}

#[test]
fn a_wrong_baud_rate() {
    let port = meter("8N1", 57_600, "0.512\r\n");
    assert_eq!(only(&trial(&flow(), &port), &port), [Change::Baud { from: 9_600, to: 57_600 }]);
}

#[test]
fn a_wrong_frame() {
    let port = meter("7E1", 9_600, "0.512\r\n");
    let change = Change::Frame { from: "8N1".to_owned(), to: "7E1".to_owned() };
    assert_eq!(only(&trial(&flow(), &port), &port), [change]);
}

#[test]
fn a_wrong_ending() {
    let port = meter("8N1", 9_600, "0.512\r");
    let change = Change::Ends { from: "\r\n".to_owned(), to: "\r".to_owned() };
    assert_eq!(only(&trial(&flow(), &port), &port), [change]);
}

#[test]
fn a_wrong_pattern() {
    let wrong = lines("FM-1", Measures::Flow, r"^FLOW=(?P<value>[\d.]+)$", Some("L/min"));
    for (line, to) in [
        ("0.512\r\n", r"(?P<value>[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)"),
        (
            "T 21.3 C F 0.512 L/min\r\n",
            r"(?:^|[\s,;])F\s*(?P<value>[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?)\s*(?P<unit>L/min)",
        ),
    ] {
        let port = meter("8N1", 9_600, line);
        let [Change::Pattern { to: got, .. }] = &only(&trial(&wrong, &port), &port)[..] else {
            panic!("{line}")
        };
        assert_eq!(got, to);
    }
}

#[test]
fn a_pattern_for_one_of_several_columns_is_offered_for_each() {
    let wrong = lines("FM-1", Measures::Flow, r"^FLOW=(?P<value>[\d.]+)$", Some("L/min"));
    let port = meter("8N1", 9_600, "0.512,21.30,10.50\r\n");
    let trial = trial(&wrong, &port);
    let shown: Vec<f64> = trial.proposals.iter().map(|one| one.readings[0].shown).collect();
    assert_eq!(shown, [0.512, 21.3, 10.5]);
}

#[test]
fn a_wrong_unit_that_the_line_says() {
    let port = meter("8N1", 9_600, "512 mL/min\r\n");
    let change = Change::Unit { from: Some("L/min".to_owned()), to: "mL/min".to_owned() };
    // 512 L/min would be a fault; 12 L/min would not, and is told all the same.
    assert_eq!(only(&trial(&flow(), &port), &port), std::slice::from_ref(&change));
    let port = meter("8N1", 9_600, "12 mL/min\r\n");
    let trial = trial(&flow(), &port);
    assert!(trial.does_well());
    assert_eq!(only(&trial, &port), [change]);
}

#[test]
fn a_wrong_unit_that_only_the_range_tells() {
    let ip =
        Instrument { papers: Some(to_16_bar()), ..lines("PT-1", Measures::Pressure, NUMBER, Some("bar")) };
    let port = meter("8N1", 9_600, "152.3\r\n");
    let trial = trial(&ip, &port);
    let units: Vec<&Change> = trial.proposals.iter().flat_map(|one| &one.changes).collect();
    let psi = Change::Unit { from: Some("bar".to_owned()), to: "psi".to_owned() };
    assert!(units.contains(&&psi), "{units:?}");
    assert!(trial.proposals.iter().all(|one| one.readings.iter().all(|reading| reading.si <= 1.6e6)));
}

#[test]
fn a_unit_that_hides_its_reference_conditions_goes_into_the_profile() {
    let with_unit = lines("FM-1", Measures::Flow, r"(?P<value>[\d.]+)\s*(?P<unit>\S+)", None);
    for (line, unit) in [("0.512 slpm\r\n", "L/min"), ("512 sccm\r\n", "cm³/min"), ("0.512 SLM\r\n", "L/min")]
    {
        let port = meter("8N1", 9_600, line);
        let changes = only(&trial(&with_unit, &port), &port);
        assert!(
            matches!(&changes[..], [Change::Pattern { .. }, Change::Unit { from: None, to }] if to == unit),
            "{line}: {changes:?}"
        );
    }
}

#[test]
fn two_wrong_settings_at_once() {
    let wrong = lines("FM-1", Measures::Flow, r"^FLOW=(?P<value>[\d.]+)$", Some("L/min"));
    let port = meter("8N1", 115_200, "0.512\r");
    let changes = only(&trial(&wrong, &port), &port);
    assert!(
        matches!(
            &changes[..],
            [Change::Baud { to: 115_200, .. }, Change::Ends { .. }, Change::Pattern { .. }]
        ),
        "{changes:?}"
    );
}

#[test]
fn an_asked_instrument_at_the_wrong_speed() {
    let port = Port::new("8N1", 38_400)
        .answers(|asked| if asked == b"READ?\n" { b"READ?\r\n0.512\r\n".to_vec() } else { Vec::new() });
    let profile = asked("FM-1", Measures::Flow, "READ?\n", NUMBER, "L/min");
    assert_eq!(only(&trial(&profile, &port), &port), [Change::Baud { from: 9_600, to: 38_400 }]);
}

#[test]
fn nothing_is_proposed_where_nothing_is_heard_and_noise_stays_noise() {
    let silent = Port::new("8N1", 9_600);
    let of_silent = trial(&flow(), &silent);
    assert!(of_silent.proposals.is_empty() && of_silent.bytes == 0);
    assert_eq!(silent.world.lock().unwrap().opened, 1);
    let noise = Port::new("8N1", 9_600).says(0.0, 0.2, 2_000, |n| format!("\u{1}{n}\u{7f}\r\n"));
    assert!(trial(&flow(), &noise).proposals.is_empty());
    let gone = Port::new("8N1", 9_600);
    gone.world.lock().unwrap().plugged = false;
    assert!(matches!(trial(&flow(), &gone).lost, Some(Lost::Open(_))));
}

#[test]
fn what_was_recorded_can_be_fitted_without_a_port() {
    let found = fitting_text(b"0.512;0.513;0.514;0.515;", &flow());
    assert!(matches!(found[0].changes[..], [Change::Ends { .. }]));
    assert_eq!(found[0].readings.len(), 3);
    assert!(fitting_text(b"", &flow()).is_empty() && fitting_text(b"\xff\xfe\r\n", &flow()).is_empty());
}

/// A Modbus device 1 whose input registers 0 and 1 hold this.
fn device(baud: u32, set: &str, table: u8, registers: [u16; 2]) -> Port {
    Port::new(set, baud).answers(move |asked| {
        if asked.get(1) != Some(&table) {
            return sealed(vec![1, asked.get(1).copied().unwrap_or(0) | 0x80, 1]);
        }
        let bytes = registers.iter().flat_map(|register| register.to_be_bytes());
        sealed([1, table, 4].into_iter().chain(bytes).collect())
    })
}

#[test]
fn a_modbus_device_at_the_wrong_speed_frame_table_or_word_order() {
    let profile = modbus("PT-1", 1, 0, ModbusNumber::I32);
    let port = device(38_400, "8N1", 4, [0, 10_500]);
    assert_eq!(only(&trial(&profile, &port), &port), [Change::Baud { from: 19_200, to: 38_400 }]);
    let port = device(19_200, "8E1", 4, [0, 10_500]);
    let frame = Change::Frame { from: "8N1".to_owned(), to: "8E1".to_owned() };
    assert_eq!(only(&trial(&profile, &port), &port), [frame]);
    let port = device(19_200, "8N1", 3, [0, 10_500]);
    let table = Change::Table { from: ModbusTable::Input, to: ModbusTable::Holding };
    assert_eq!(only(&trial(&profile, &port), &port), [table]);
    let port = device(19_200, "8N1", 4, [10_500, 0]);
    let order = Change::WordOrder { from: WordOrder::Big, to: WordOrder::Little };
    assert_eq!(only(&trial(&profile, &port), &port), [order]);
}

#[test]
fn a_modbus_device_with_the_wrong_unit() {
    // 1013.2 with a scale of 0.1 is hectopascals; as kilopascals it would be ten atmospheres.
    let mut profile = modbus("B-1", 1, 0, ModbusNumber::U16);
    profile.measures = Measures::Barometer;
    profile.unit = Some("kPa".to_owned());
    if let Some(Protocol::ModbusRtu { scale, .. }) = &mut profile.protocol {
        *scale = 0.1;
    }
    let port = Port::new("8N1", 19_200).answers(|_| sealed(vec![1, 4, 2, 0x27, 0x94]));
    let trial = trial(&profile, &port);
    let units: Vec<&Change> = trial.proposals.iter().flat_map(|one| &one.changes).collect();
    let hpa = Change::Unit { from: Some("kPa".to_owned()), to: "hPa".to_owned() };
    assert!(units.contains(&&hpa), "{units:?}");
}
