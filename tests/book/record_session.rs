//! The session file: what is read as it stands, what is refused and in which words, and the way back.
//!
//! All files are invented (`fixtures/sessions`). A refusal is compared whole: its words are what a diver reads.

#![allow(clippy::unwrap_used, reason = "a test that cannot read its own files fails")]
#![allow(clippy::float_cmp, reason = "what is read must be the very double that was written")]

mod drawn;

use std::io::{Cursor, Read};
use std::path::Path;

use crate::bare::{amount, at, bare, inject};
use chrono::DateTime;
use ebbline::entry::{
    Assumptions, CalibratedAt, CellSignal, Cylinder, Diluent, Event, Feeds, Injection, LeakTest,
    LineReference, LoopKept, Metered, Place, Purity, Session, What,
};
use ebbline::gas::Water;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Length, Mass, PressureDifference, ReferenceConditions, Share, Span,
    StpdFlow, Temperature, TemperatureDifference, Uncertain, Volume,
};
use ebbline::record::{
    Loaded, Note, RecordError, When, elapsed_or_time, event_from, parse_session, read_session,
    read_session_and_files, write_session,
};
use ebbline::uptake::{SessionInput, uptake};
use proptest::prelude::*;

const COUCH: &str = include_str!("../../fixtures/sessions/couch.toml");
const COUCH_CSV: &str = include_str!("../../fixtures/sessions/couch-1.csv");
const POOL: &str = include_str!("../../fixtures/sessions/pool.toml");
const POOL_CSV: &str = include_str!("../../fixtures/sessions/pool.csv");

fn parse(toml: &str, csv: &str) -> Result<Loaded<Session>, RecordError> {
    let csv = csv.as_bytes().to_vec();
    parse_session(toml, "session.toml", &mut |_| Ok(Box::new(Cursor::new(csv.clone()))))
}

fn session(toml: &str, csv: &str) -> Session {
    parse(toml, csv).unwrap_or_else(|error| panic!("{error}\n{toml}")).value
}

fn refusal(toml: &str, csv: &str) -> String {
    match parse(toml, csv) {
        Err(error) => error.to_string(),
        Ok(_) => panic!("taken:\n{toml}\n{csv}"),
    }
}

/// `text` with one piece replaced; the piece must be there, once.
fn with(text: &str, old: &str, new: &str) -> String {
    assert_eq!(text.matches(old).count(), 1, "{old:?} stands once in the fixture");
    text.replacen(old, new, 1)
}

fn seconds(s: f64) -> Option<Span> {
    Some(Span::from_s(s))
}

/// A session as text, in which every double differs from every other, and a missing reading is equal to itself.
fn text_of(session: &Session) -> String {
    format!("{session:?}")
}

#[test]
fn the_contract_s_example_is_read_as_it_stands() {
    let loaded = read_session(Path::new("fixtures/sessions/couch.toml")).unwrap();
    assert_eq!(loaded.notes, []);
    let session = loaded.value;
    assert_eq!(session, self::session(COUCH, COUCH_CSV));
    assert_eq!(session.diver.as_str(), "D-07");
    assert_eq!(session.mass, Some(Mass::from_kg(82.0)));
    assert_eq!((session.place, session.kept, session.diluent), (Place::Couch, LoopKept::Held, Diluent::Air));
    let litres = |l: f64| Volume::from_m3(l / 1e3);
    assert_eq!(session.loop_volume, Some(Uncertain { value: litres(7.5), expanded: Some(litres(1.0)) }));
    assert_eq!((session.leak_test, session.nose_clip), (LeakTest::Passed, None));
    assert_eq!(session.oxygen, Some(Purity { fraction: 99.5 / 100.0, expanded: 0.3 / 100.0 }));
    assert_eq!(session.taken.to_rfc3339(), "2026-11-20T18:05:00+11:00");
    assert_eq!(session.line, Some(LineReference::RunFile("cmf-0417.toml".to_owned())));
    let readings = &session.readings;
    assert_eq!(readings.time_s, (0..=20).map(|i| 60.0 * f64::from(i)).collect::<Vec<_>>());
    assert_eq!(readings.cells.iter().map(|cell| cell.name.as_str()).collect::<Vec<_>>(), ["c1", "c2", "c3"]);
    let CellSignal::Bar(third) = &readings.cells[2].signal else { panic!("bar") };
    // 0.700 - 0.003 bar at first, and 1200 s later 0.000 08 bar/s · 1200 s less.
    assert_eq!((third[0], third[20], third.len()), (0.697, 0.601, 21));
    assert_eq!((&readings.depth_m, &readings.loop_temperature_k), (&None, &None));
    let conditions = &session.conditions;
    assert_eq!(conditions.barometer.value, Some(AbsolutePressure::from_pa(101_600.0)));
    assert_eq!(conditions.barometer.expanded, Some(PressureDifference::from_pa(200.0)));
    assert_eq!((conditions.depth.value, conditions.depth.expanded), (Some(Length::from_m(0.0)), None));
    assert_eq!(conditions.water, Water::Fresh);
    assert_eq!(conditions.loop_temperature.value, Some(Temperature::from_c(33.0)));
    assert_eq!(conditions.loop_temperature.expanded, Some(TemperatureDifference::from_k(4.0)));
    assert_eq!((conditions.time_on_loop, conditions.scrubber_warm), (seconds(600.0), Some(true)));
    assert_eq!((session.cells.gain, session.cells.calibrated_at), (Some(0.02), None));
    let rest = &session.rest;
    assert_eq!((rest.posture.as_deref(), rest.suit.as_deref()), (Some("lying"), Some("none")));
    assert_eq!((rest.rested_for, rest.last_meal), (seconds(1_500.0), seconds(16_200.0)));
    assert_eq!((rest.last_exercise, rest.last_dive), (seconds(50_400.0), seconds(172_800.0)));
    assert_eq!(rest.caffeine_or_nicotine, Some(false));
    assert_eq!(rest.water_temperature, Some(Temperature::from_c(33.0)));
    assert_eq!(session.assumptions, Assumptions::DEFAULT);
    let flow = Uncertain { value: StpdFlow::from_l_min(0.31), expanded: None };
    let events = [
        Event { at_s: 0.0, what: What::Injection(Injection::Flow(flow)) },
        Event { at_s: 600.0, what: What::OxygenAdd(None) },
    ];
    assert_eq!((session.events.as_slice(), session.cylinder), (&events[..], None));
}

#[test]
fn every_key_is_read_and_every_spread_is_brought_to_two() {
    let loaded = parse(POOL, POOL_CSV).unwrap();
    let session = loaded.value;
    let said: Vec<String> = loaded.notes.iter().map(Note::to_string).collect();
    assert_eq!(said, ["session.toml, line 11, oxygen: no ± is stated, taken as ± 0.3 %"]);
    let litres = |l: f64| Volume::from_m3(l / 1e3);
    // 165 lb of 0.453 592 37 kg (international pound, 1959) are 74.842 741 05 kg.
    assert!((session.mass.unwrap().as_kg() - 74.842_741_05).abs() < 5e-9);
    assert_eq!(session.place, Place::Pool);
    assert_eq!(session.diluent, Diluent::Oxygen(Share::from_ratio(0.18)));
    let flow = |l_min: f64| StpdFlow::from_l_min(l_min);
    let leak = Uncertain { value: flow(0.005), expanded: Some(flow(0.002)) };
    assert_eq!((session.leak_test, session.nose_clip), (LeakTest::Measured(leak), Some(true)));
    assert_eq!(session.oxygen, Some(Purity { fraction: 99.7 / 100.0, expanded: 0.003 }));
    assert!(matches!(&session.line, Some(LineReference::Orifice(id)) if id.as_str() == "CMF-0417"));
    let uncertain_c = |c: f64| Uncertain {
        value: Temperature::from_c(c),
        expanded: Some(TemperatureDifference::from_k(1.0)),
    };
    let uncertain_bar = |bar: f64| Uncertain {
        value: GaugePressure::from_bar(bar),
        expanded: Some(PressureDifference::from_bar(1.0)),
    };
    let cylinder = Cylinder {
        volume: Uncertain { value: litres(2.0), expanded: Some(litres(0.02)) },
        from: uncertain_bar(182.0),
        from_temperature: uncertain_c(24.0),
        to: uncertain_bar(171.0),
        to_temperature: uncertain_c(25.0),
        feeds: Feeds::Adds,
    };
    assert_eq!(session.cylinder, Some(cylinder));

    let conditions = &session.conditions;
    // 29.92 inHg of 3386.388 640 341 Pa (NIST SP 811, B.8) are 101 320.748 Pa; ± 1 hPa at k = 1 is ± 2 hPa at k = 2.
    assert!((conditions.barometer.value.unwrap().as_pa() - 101_320.748).abs() < 5e-4);
    assert_eq!(conditions.barometer.expanded, Some(PressureDifference::from_pa(200.0)));
    assert_eq!((conditions.depth.value, conditions.depth.expanded), (None, Some(Length::from_m(0.2))));
    assert_eq!(conditions.loop_temperature.expanded, Some(TemperatureDifference::from_k(3.0)));
    assert_eq!((conditions.water, conditions.scrubber_warm), (Water::Sea, Some(false)));
    assert_eq!(conditions.time_on_loop, seconds(750.0));
    assert_eq!(session.cells.gain, Some(0.02));
    let calibrated_at = CalibratedAt {
        barometer: AbsolutePressure::from_pa(101_300.0),
        temperature: Temperature::from_c(20.0),
        humidity: 0.5,
        oxygen: 99.5 / 100.0,
    };
    assert_eq!(session.cells.calibrated_at, Some(calibrated_at));
    let rest = &session.rest;
    assert_eq!((rest.posture.as_deref(), rest.suit.as_deref()), (Some("upright, still"), Some("5 mm")));
    assert_eq!((rest.rested_for, rest.last_dive), (seconds(1_800.0), seconds(259_200.0)));
    let assumed = Assumptions {
        dead_time: Span::from_s(60.0),
        warm_up: Span::from_s(720.0),
        lung_share: 35.0 / 100.0,
        lung_carbon_dioxide: PressureDifference::from_pa(5_000.0),
        washout: (StpdFlow::from_m3_s(25.0 / 6e7), StpdFlow::from_m3_s(50.0 / 6e7)),
        washout_time: Span::from_s(600.0),
        sealed_fraction: 0.6,
        sealed_wait: Span::from_s(900.0),
        wander: 0.05,
        least_wander: 0.03,
        wander_time: Span::from_s(90.0),
        leak: Some((StpdFlow::from_m3_s(1.0 / 6e7), StpdFlow::from_m3_s(10.0 / 6e7))),
        day_spread: 0.06,
        day_spread_weight: 6.0,
        cell_limit: PressureDifference::from_pa(4_000.0),
        cell_faults: 0.02,
        cell_gain: 0.03,
        flush: 0.015,
        depth_drift: Length::from_m(0.2),
        ip_gauge: PressureDifference::from_pa(40_000.0),
        flow: 0.03,
        metered: 0.04,
        gas_temperature: (Temperature::from_c(22.0), TemperatureDifference::from_k(3.0)),
        loop_volume: 0.2,
        mark: litres(0.3),
        average_over: Span::from_s(2.0),
        least_usable: Span::from_s(180.0),
    };
    assert_eq!(session.assumptions, assumed);

    let warm = ReferenceConditions {
        temperature: Temperature::from_c(25.0),
        pressure: AbsolutePressure::from_pa(101_300.0),
    };
    let metered = |l, expanded: Option<f64>, reads_at| {
        Some(Metered { volume: Uncertain { value: litres(l), expanded: expanded.map(litres) }, reads_at })
    };
    let ip =
        Uncertain { value: GaugePressure::from_bar(9.4), expanded: Some(PressureDifference::from_bar(0.3)) };
    let events = [
        (0.0, What::Injection(Injection::Ip(ip))),
        (120.0, What::DiluentAdd(metered(0.5, Some(0.05), None))),
        // 23:58:00 is three minutes after the first reading at 23:55:00, whenever the session was begun.
        (180.0, What::Vent(metered(0.2, None, Some(warm)))),
        (240.0, What::MakeUp { kept: Some(LoopKept::Topped), mark: true }),
        // 13:00:00.5 UTC is half a second past midnight at +11:00. Its ± is stated at k = 1.
        (300.5, What::OxygenAdd(metered(0.4, Some(0.02), Some(warm)))),
        (360.0, What::Exclude { until_s: 450.0 }),
        (480.0, What::Injection(Injection::Off)),
        (660.0, What::Stop),
    ];
    assert_eq!(session.events, events.map(|(at_s, what)| Event { at_s, what }));
}

#[test]
fn a_table_with_decimal_commas_crosses_midnight_and_mixes_bar_and_millivolts() {
    let readings = session(POOL, POOL_CSV).readings;
    // Twenty-six rows half a minute apart, from 23:55:00 to 00:07:30.
    assert_eq!(readings.time_s, (0..26).map(|i| 30.0 * f64::from(i)).collect::<Vec<_>>());
    let names: Vec<&str> = readings.cells.iter().map(|cell| cell.name.as_str()).collect();
    assert_eq!(names, ["c1", "handset", "c2"]);
    let CellSignal::Volts { readings: volts, in_air, in_oxygen } = &readings.cells[0].signal else {
        panic!()
    };
    assert_eq!((volts[0], volts[1], *in_air, *in_oxygen), (0.0412, 41.1 / 1e3, 0.0101, 0.048));
    let CellSignal::Bar(bar) = &readings.cells[1].signal else { panic!() };
    assert_eq!(bar[..3], [0.870, 0.871, 0.872]);
    let CellSignal::Volts { in_air, in_oxygen, .. } = &readings.cells[2].signal else { panic!() };
    assert_eq!((*in_air, *in_oxygen), (0.0104, 0.0492));
    assert_eq!(readings.depth_m.unwrap()[..2], [1.2, 1.3]);
    assert_eq!(readings.loop_temperature_k.unwrap()[1], Temperature::from_c(31.1).as_k());
}

/// The example with another time column and events at these texts; gives the readings' and the events' seconds.
fn placed(time: &str, rows: &str, ats: &[&str]) -> Result<(Vec<f64>, Vec<f64>), String> {
    let toml = with(COUCH, "time = { column = \"t\", unit = \"s\" }", &format!("time = {time}"));
    let (head, _) = toml.split_once("[[events]]").unwrap();
    let event = |at: &&str| format!("[[events]]\nat = \"{at}\"\nwhat = \"injection\"\noff = true\n");
    let toml = format!("{head}{}", ats.iter().map(event).collect::<String>());
    let csv = format!("t,c1,c2,c3\n{}", rows.replace(' ', ",0.7,0.7,0.7\n"));
    let session = parse(&toml, &csv).map_err(|error| error.to_string())?.value;
    Ok((session.readings.time_s, session.events.iter().map(|event| event.at_s).collect()))
}

#[test]
fn an_elapsed_time_counts_on_a_numeric_column_s_own_numbers() {
    let number = "{ column = \"t\", unit = \"s\" }";
    let ats = ["00:02:00", "00:02:30.5", "3 min", "2026-11-20T18:05:30+11:00"];
    let got = placed(number, "120 150.5 180 ", &ats).unwrap();
    // The column begins at 120 s; the clock's 18:05:30 is half a minute after the first reading, at `taken`.
    assert_eq!(got, (vec![0.0, 30.5, 60.0], vec![0.0, 30.5, 60.0, 30.0]));
    let minutes =
        placed("{ column = \"t\", unit = \"min\" }", "2 2.5 3 ", &["00:02:00", "00:02:30"]).unwrap();
    assert_eq!(minutes, (vec![0.0, 30.0, 60.0], vec![0.0, 30.0]));
    let early = placed(number, "120 150.5 180 ", &["00:01:59"]).unwrap_err();
    let sentence = "session.toml, line 46, [[events]] at: \"00:01:59\" lies before the first reading (00:02:00 on the \
                    time column); what was so already is written at the first reading's time";
    assert_eq!(early, sentence);
    let late = placed(number, "120 150.5 180 ", &["00:03:01"]).unwrap_err();
    assert!(
        late.contains("\"00:03:01\" lies after the last reading (00:03:00 on the time column)"),
        "{late}"
    );
    // The two ends of an exclusion may be written in two ways, which only the column tells apart.
    let toml = with(
        POOL,
        "at = \"00:06:00\"\nwhat = \"exclude\"",
        "at = \"2026-11-21T00:01:00+11:00\"\nwhat = \"exclude\"",
    );
    let exclude = session(&toml, POOL_CSV).events[5];
    assert_eq!(exclude, Event { at_s: 360.0, what: What::Exclude { until_s: 450.0 } });
}

#[test]
fn clock_and_dated_columns_begin_at_nought_and_take_times_of_day() {
    let plain = "{ column = \"t\" }";
    let ats = ["00:00:00", "00:01:00", "2026-11-20T18:06:10+11:00"];
    // `taken` is 18:05:00, and the first reading ten seconds later.
    let clock = placed(plain, "18:05:10 18:05:40.5 18:06:10 ", &ats).unwrap();
    assert_eq!(clock, (vec![0.0, 30.5, 60.0], vec![0.0, 60.0, 60.0]));
    let local = "2026-11-20T18:05:10 2026-11-20T18:05:40.5 2026-11-20T18:06:10 ";
    assert_eq!(placed(plain, local, &ats).unwrap(), clock);
    let offset = "2026-11-20T07:05:10Z 2026-11-20T18:05:40.5+11:00 2026-11-20T02:06:10-05:00 ";
    assert_eq!(placed(plain, offset, &ats).unwrap(), clock);
    let sentence = placed(plain, local, &["18:05:40"]).unwrap_err();
    assert!(sentence.ends_with(
        "\"18:05:40\" lies after the last reading (00:01:00 on the time column); HH:MM:SS is what has elapsed there, \
         and a time of day is written with its date and offset"
    ));
}

#[test]
fn disorder_repeats_and_gaps_in_the_times_are_data() {
    let number = placed("{ column = \"t\", unit = \"s\" }", "0 20 10 20  -5 ", &["00:00:20"]).unwrap();
    assert!(number.0[4].is_nan());
    assert_eq!((&number.0[..4], number.0[5]), (&[0.0, 20.0, 10.0, 20.0][..], -5.0));
    let clock = placed("{ column = \"t\" }", "23:59:58 00:00:03 23:59:59  00:00:04 ", &["00:00:06"]).unwrap();
    assert!(clock.0[3].is_nan());
    assert_eq!((&clock.0[..3], clock.0[4]), (&[0.0, 5.0, 1.0][..], 6.0));
    // The first row without a time is passed over: the column begins with the second.
    let late = placed("{ column = \"t\", unit = \"s\" }", " 120 130 ", &["00:02:00"]).unwrap();
    assert!(late.0[0].is_nan());
    assert_eq!((&late.0[1..], &late.1[..]), (&[0.0, 10.0][..], &[0.0][..]));
    let none = placed("{ column = \"t\" }", "  ", &["00:00:00"]).unwrap_err();
    assert_eq!(none, "couch-1.csv, line 1: no row has a time; name another time column, or fill this one");
}

#[test]
fn what_a_logger_writes_for_a_fault_is_a_missing_reading_and_said_once() {
    let csv = "t,c1,c2,c3\n0,0.7,NaN,\n300,-0.01,ERR,0.7\n600,0.7,0.7,--\n900,0.7,err,0.7\n";
    let loaded = parse(COUCH, csv).unwrap();
    let columns: Vec<Vec<f64>> = loaded
        .value
        .readings
        .cells
        .iter()
        .map(|cell| match &cell.signal {
            CellSignal::Bar(bar) => bar.clone(),
            CellSignal::Volts { .. } => panic!("bar"),
        })
        .collect();
    // A reading below zero is a cell's fault, and is kept so that it is counted.
    assert_eq!(columns[0], [0.7, -0.01, 0.7, 0.7]);
    let missing = |column: &[f64]| column.iter().map(|x| x.is_nan()).collect::<Vec<_>>();
    assert_eq!(missing(&columns[1]), [true, true, false, true]);
    assert_eq!(missing(&columns[2]), [true, false, true, false]);
    let said: Vec<String> = loaded.notes.iter().map(Note::to_string).collect();
    let sentences = [
        "couch-1.csv, line 2, column \"c2\": \"NaN\" is no number and taken as a missing reading, and so are 2 more words \
         in this column",
        "couch-1.csv, line 4, column \"c3\": \"--\" is no number and taken as a missing reading",
    ];
    assert_eq!(said, sentences);
}

#[test]
fn what_is_taken_for_granted_is_said() {
    let toml = with(COUCH, "oxygen = \"99.5 % ± 0.3 %\"", "# no purity");
    let toml = with(&toml, "{ column = \"c1\", unit = \"bar\" }", "{ column = \"c1\", unit = \"ata\" }");
    let toml = with(
        &toml,
        "gain = \"2 %\"",
        "gain = \"2 %\"\ncalibrated_at = { barometer = \"1013 hPa\", temperature = \"20 °C\", humidity = \"50 %\", oxygen \
         = \"99.5 %\" }",
    );
    let loaded = parse(&toml, COUCH_CSV).unwrap();
    assert_eq!(loaded.value.oxygen, None);
    assert!(loaded.value.cells.calibrated_at.is_some());
    let CellSignal::Bar(bar) = &loaded.value.readings.cells[0].signal else { panic!("bar") };
    assert!((bar[0] - 0.7 * 1.013_25).abs() < 1e-15);
    let said: Vec<String> = loaded.notes.iter().map(Note::to_string).collect();
    assert_eq!(said[0], "no purity of the oxygen is stated: taken as 99.5 % ± 0.3 %");
    assert!(said[1].starts_with("session.toml, line 17, [columns.cells] unit: ata is read as 1.01325 bar"));
    assert_eq!(
        said[2],
        "session.toml, line 30, [cells] calibrated_at: not used, only a cell read in mV needs it"
    );
    assert_eq!(said.len(), 3);
    let toml = with(POOL, "depth = \"± 0.1 m\"", "depth = \"1.5 m ± 0.1 m\"");
    let loaded = parse(&toml, POOL_CSV).unwrap();
    assert_eq!(loaded.value.conditions.depth.value, None);
    assert!(loaded.notes[1].to_string().contains("[conditions] depth: not used, the column gives the value"));
}

#[test]
fn every_refusal_names_its_place_and_says_what_to_do() {
    let cases: toml::Table = include_str!("../../fixtures/sessions/refused.toml").parse().unwrap();
    let cases = cases["case"].as_array().unwrap();
    assert!(cases.len() > 100);
    for case in cases {
        let text = |key: &str| case[key].as_str().unwrap();
        let replaced = |whole: &str| with(whole, text("old"), text("new"));
        let got = match text("file") {
            "couch.toml" => refusal(&replaced(COUCH), COUCH_CSV),
            "couch-1.csv" => refusal(COUCH, &replaced(COUCH_CSV)),
            "pool.toml" => refusal(&replaced(POOL), POOL_CSV),
            "pool.csv" => refusal(POOL, &replaced(POOL_CSV)),
            other => panic!("no file {other}"),
        };
        assert_eq!(got, text("says"), "{case}");
    }
}

#[test]
fn a_file_and_its_readings_are_handed_back_to_the_byte() {
    let path = Path::new("fixtures/sessions/pool.toml");
    let (loaded, files) = read_session_and_files(path).unwrap();
    assert_eq!(text_of(&loaded.value), text_of(&session(POOL, POOL_CSV)));
    assert_eq!((files.toml.as_slice(), files.readings.as_slice()), (POOL.as_bytes(), POOL_CSV.as_bytes()));
    assert_eq!(files.readings_name, "pool.csv");
    let missing = read_session(Path::new("fixtures/sessions/none.toml")).unwrap_err().to_string();
    assert!(missing.starts_with("fixtures/sessions/none.toml: there is no such file"), "{missing}");

    let folder = std::env::temp_dir().join(format!("ebbline-session-{}", std::process::id()));
    std::fs::create_dir_all(&folder).unwrap();
    let refused = |name: &str, bytes: &[u8]| {
        std::fs::write(folder.join(name), bytes).unwrap();
        let error = read_session_and_files(&folder.join(name)).unwrap_err().to_string();
        error.replace(&format!("{}", folder.join("").display()), "")
    };
    let large = "large.toml: a session file has at most 1 MiB; readings belong into the CSV file it names";
    assert_eq!(refused("large.toml", "#\n".repeat(600_000).as_bytes()), large);
    let alone = refused("alone.toml", COUCH.as_bytes());
    assert!(alone.starts_with("couch-1.csv: there is no such file"), "{alone}");
    std::fs::remove_dir_all(&folder).unwrap();
}

#[test]
fn too_many_rows_are_refused_at_the_limit() {
    let toml = "record = \"session\"\ndiver = \"D\"\nplace = \"couch\"\nloop = \"held\"\ndiluent = \"air\"\n\
                taken = \"2026-11-20T18:05:00+11:00\"\nreadings = \"r.csv\"\n\
                [columns]\ntime = { column = \"t\", unit = \"s\" }\ncells = [ { column = \"c\", unit = \"bar\" } ]\n\
                [[events]]\nat = \"00:00:00\"\nwhat = \"injection\"\noff = true\n";
    let rows =
        |count: usize| -> Box<dyn Read> { Box::new(Cursor::new(format!("t,c\n{}", "0,1\n".repeat(count)))) };
    let read = |count| parse_session(toml, "session.toml", &mut |_| Ok(rows(count)));
    assert_eq!(read(5_000_000).unwrap().value.readings.time_s.len(), 5_000_000);
    let sentence = "r.csv, line 5000002: there are more than 5000000 rows; split or thin the file";
    assert_eq!(read(5_000_001).unwrap_err().to_string(), sentence);
}

#[test]
fn one_event_is_read_from_its_texts() {
    let begun = DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap();
    let read = |pairs: &[(&str, &str)]| event_from(pairs, begun).map_err(|error| error.to_string());
    let ip = Uncertain { value: GaugePressure::from_bar(9.4), expanded: None };
    for (pairs, at_s, what) in [
        (
            &[("at", "00:10:00"), ("what", "injection"), ("off", "true")][..],
            600.0,
            What::Injection(Injection::Off),
        ),
        (
            &[("at", "0:00:00.5"), ("what", "injection"), ("ip", "9.4 bar")],
            0.5,
            What::Injection(Injection::Ip(ip)),
        ),
        (&[("at", "2026-11-20T18:06:00+11:00"), ("what", "oxygen add")], 60.0, What::OxygenAdd(None)),
        (
            &[("what", "make-up"), ("mark", "true"), ("at", "00:00:01")],
            1.0,
            What::MakeUp { kept: None, mark: true },
        ),
        (
            &[("at", "00:01:00"), ("what", "exclude"), ("until", "90 s")],
            60.0,
            What::Exclude { until_s: 90.0 },
        ),
    ] {
        assert_eq!(read(pairs), Ok(Event { at_s, what }));
    }
    for (pairs, says) in [
        (
            &[("at", "00:10:00")][..],
            "event, what: this key is missing; write for example what = \"oxygen add\"",
        ),
        (
            &[("at", "00:10:00"), ("what", "injection"), ("off", "yes")],
            "event, off: \"yes\" is not known here; use one of: true, false",
        ),
        (
            &[("at", "00:10:00"), ("what", "injection"), ("flow", "300 sccm")],
            "event, flow: \"300 sccm\" does not say at which temperature and pressure its litres are counted; give the \
             flow in L/min STPD (0 °C, 101.325 kPa, dry)",
        ),
        (
            &[("at", "00:10:00"), ("what", "stop"), ("flow", "1 L/min\"\nwhat = \"vent")],
            "event, flow: an event \"stop\" has no flow; take it out, or correct what",
        ),
    ] {
        assert_eq!(read(pairs), Err(says.to_owned()));
    }
}

#[test]
fn a_moment_is_placed_on_a_session() {
    let session = session(COUCH, COUCH_CSV);
    let on = |text: &str| elapsed_or_time(text).map(|when: When| when.on(&session));
    assert_eq!(on("00:08:30"), Ok(510.0));
    assert_eq!(on("2026-11-20T07:13:30.25Z"), Ok(510.25));
    assert_eq!(
        on("18:13").unwrap_err().to_string(),
        "\"18:13\" is no time in a session; write what has elapsed, as in \"00:08:30\", or a time with its offset, as in \
         \"2026-11-20T18:13:30+11:00\""
    );
}

#[test]
fn what_is_written_reads_back_as_the_same_session() {
    for (toml, csv) in [(COUCH, COUCH_CSV), (POOL, POOL_CSV)] {
        let given = session(toml, csv);
        let (toml, csv) = write_session(&given, "again.csv");
        assert_eq!(session(&toml, &csv), given, "{toml}{csv}");
        assert_eq!(write_session(&given, "again.csv"), (toml, csv), "the same session gives the same text");
    }
}

#[test]
fn a_written_table_has_customary_units_and_no_word_of_anybody() {
    let mut given = session(POOL, POOL_CSV);
    given.readings.cells[1].name = "=\"hand\", set\\ # [x]".to_owned();
    given.rest.posture = Some("\"\"\"three\"\"\" 'single' é".to_owned());
    let (toml, csv) = write_session(&given, "ten \"points\".csv");
    assert_eq!(session(&toml, &csv), given, "{toml}");
    let mut lines = csv.lines();
    assert_eq!(lines.next(), Some("time_s,cell_1_mv,cell_2_bar,cell_3_mv,depth_m,loop_temperature_c"));
    assert_eq!(lines.next(), Some("0,41.2,0.87,42.6,1.2,31"));
    assert!(lines.all(|line| line.chars().all(|c| c.is_ascii_digit() || c == '.' || c == ',')), "{csv}");
    assert!(
        toml.contains("washout = \"0.025 L/min to 0.05 L/min\"") && toml.contains("at = \"00:05:00.5\""),
        "{toml}"
    );
}

#[test]
fn an_event_before_the_first_row_is_written_as_a_time() {
    let mut given = session(COUCH, "t,c1,c2,c3\n0,0.7,0.7,0.7\n-20,0.7,0.7,0.7\n1200,0.7,0.7,0.7\n");
    given.events[0].at_s = -12.5;
    let (toml, csv) = write_session(&given, "again.csv");
    assert!(toml.contains("at = \"2026-11-20T18:04:47.500+11:00\""), "{toml}");
    assert_eq!(session(&toml, &csv), given);
}

/// What the uptake says of a session, every double with all its digits.
fn uptake_of(session: &Session) -> String {
    format!("{:?}", uptake(&[SessionInput { session, line: None }]))
}

#[test]
fn a_session_from_files_gives_the_very_uptake_of_the_same_session_in_memory() {
    let rounded = |bar: f64| format!("{bar:.4}");
    let mut given = bare(LoopKept::Held, Some(7.0), 25.0, |t| 0.7 - 0.004 * t + 0.0004 * libm::sin(7.0 * t));
    given.events = vec![inject(0.0, 0.3), inject(12.0, 0.2), at(12.5, What::OxygenAdd(Some(amount(0.4))))];
    let mut csv = "no;t;b;a\n".to_owned();
    let readings = &mut given.readings;
    readings.cells.truncate(2);
    for row in 0..readings.time_s.len() {
        let mut texts = Vec::new();
        for (cell, offset) in readings.cells.iter_mut().zip([0.0, 0.002]) {
            let CellSignal::Bar(bar) = &mut cell.signal else { panic!("bar") };
            texts.push(rounded(bar[row] + offset));
            bar[row] = texts.last().unwrap().parse().unwrap();
        }
        // A logger that was switched on an hour before, and writes decimal commas.
        let line = format!("{row};{};{};{}\n", 3_600.0 + readings.time_s[row], texts[1], texts[0]);
        csv.push_str(&line.replace('.', ","));
    }
    let toml = "record = \"session\"\ndiver = \"D-07\"\nplace = \"couch\"\nloop = \"held\"\ndiluent = \"oxygen 21 %\"\n\
        loop_volume = \"7 L ± 1 L\"\nleak_test = \"passed\"\noxygen = \"100 % ± 0 %\"\n\
        taken = \"2026-11-20T18:05:00+11:00\"\nreadings = \"couch.csv\"\n\
        [columns]\ntime = { column = \"t\", unit = \"s\" }\n\
        cells = [{ column = \"a\", unit = \"bar\", name = \"c1\" }, { column = \"b\", unit = \"bar\", name = \"c2\" }]\n\
        [conditions]\nbarometer = \"1013.25 hPa ± 2 hPa\"\nloop_temperature = \"33 °C ± 4 °C\"\n\
        time_on_loop = \"00:10:00\"\nscrubber_warm = true\n[cells]\ngain = \"2 %\"\n\
        [assumptions]\nlung_share = \"0 %\"\nwashout = [\"0 L/min\", \"0 L/min\"]\nleak = [\"0 L/min\", \"0 L/min\"]\n\
        [[events]]\nat = \"01:00:00\"\nwhat = \"injection\"\nflow = \"0.3 L/min ± 6 mL/min\"\n\
        [[events]]\nat = \"2026-11-20T18:17:00+11:00\"\nwhat = \"injection\"\nflow = \"0.2 L/min ± 4 mL/min\"\n\
        [[events]]\nat = \"01:12:30\"\nwhat = \"oxygen add\"\nvolume = \"0.4 L ± 0.008 L\"\nreads_at = \"STPD\"\n";
    let read = session(toml, &csv);
    assert_eq!(text_of(&read), text_of(&given));
    let wanted = uptake_of(&given);
    assert!(wanted.starts_with("Ok(") && wanted.contains("answer: Ok("), "{wanted}");
    assert_eq!(uptake_of(&read), wanted);
    let (toml, csv) = write_session(&read, "again.csv");
    assert_eq!(uptake_of(&session(&toml, &csv)), wanted);
}

proptest! {
    #[test]
    fn any_session_is_written_and_read_back_to_the_last_bit(
        drawn in proptest::collection::vec(0.0..1.0_f64, 400),
        words in "\\PC{1,20}",
    ) {
        let given = drawn::session(&drawn, &words);
        let (toml, csv) = write_session(&given, "again.csv");
        let back = parse(&toml, &csv);
        prop_assert!(back.is_ok(), "{:?}\n{}{}", back.err(), toml, csv);
        prop_assert_eq!(text_of(&back.unwrap().value), text_of(&given), "{}{}", toml, csv);
    }

    #[test]
    fn any_bytes_as_readings_are_read_or_refused(text in "\\PC{0,300}", rows in "(([-+0-9.,eEn:TZ\" ]{0,9}[,;]){3}[-0-9.,e\"]{0,4}\r?\n){0,6}") {
        let _ = parse(COUCH, &text);
        let _ = parse(COUCH, &format!("t,c1,c2,c3\n{rows}"));
        let clock = with(COUCH, "{ column = \"t\", unit = \"s\" }", "{ column = \"t\" }");
        let _ = parse(&clock, &format!("t;c1;c2;c3\n{rows}"));
    }

    #[test]
    fn any_text_as_a_session_file_is_read_or_refused(text in "\\PC{0,12}", at in 0_usize..4_000, gone in 0_usize..30) {
        let chars: Vec<char> = POOL.chars().collect();
        let at = at.min(chars.len());
        let end = (at + gone).min(chars.len());
        let damaged: String = chars[..at].iter().copied().chain(text.chars()).chain(chars[end..].iter().copied()).collect();
        let _ = parse(&damaged, POOL_CSV);
    }
}
