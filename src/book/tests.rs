//! What can only be seen from inside: frozen bytes, a full disk, the settings of a connection, every value through a file.

use std::borrow::Cow;
use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset};
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;

use super::body::{self, Body, Record};
use super::canonical::strategy;
use super::*;
use crate::entry::*;
use crate::gas::Species;
use crate::quantity::*;

/// A folder of its own that goes when the test ends.
struct Folder(PathBuf);

impl Folder {
    fn new(name: &str) -> Self {
        let path = std::env::temp_dir().join(format!("ebbline-book-{}-{name}", std::process::id()));
        std::fs::create_dir_all(&path).unwrap();
        Self(path)
    }

    fn book(&self) -> PathBuf {
        self.0.join("book.db")
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

fn time(text: &str) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(text).unwrap()
}

/// Runs `what` with a stamp whose salts count up: enough where nothing depends on chance.
fn stamped<T>(what: impl FnOnce(&mut Stamp<'_>) -> T) -> T {
    static DRAWN: std::sync::atomic::AtomicU64 = std::sync::atomic::AtomicU64::new(1);
    let mut salt = || {
        let drawn = DRAWN.fetch_add(1, std::sync::atomic::Ordering::Relaxed);
        let mut salt = [0; 16];
        salt[..8].copy_from_slice(&drawn.to_le_bytes());
        salt
    };
    what(&mut Stamp { at: time("2026-11-12T10:00:00+11:00"), salt: &mut salt })
}

fn begin(path: &Path) -> Book {
    stamped(|stamp| Book::open_or_begin(path, &Options::default(), stamp)).unwrap()
}

fn files(of: &str) -> SourceFiles {
    SourceFiles {
        run_file_name: format!("{of}.toml"),
        run_file: format!("# {of}").into_bytes(),
        readings_name: format!("{of}.csv"),
        readings: b"ip,flow\n".to_vec(),
    }
}

#[test]
fn any_runs_and_entries_come_back_from_a_file_to_the_last_bit() {
    let folder = Folder::new("round-trip");
    let mut book = begin(&folder.book());
    let mut runner = TestRunner::deterministic();
    let mut draw = |strategy: BoxedStrategy<Run>| strategy.new_tree(&mut runner).unwrap().current();
    let runs: Vec<Run> = (0..200).map(|_| draw(strategy::run())).collect();
    let sources: Vec<SourceFiles> = (0..runs.len()).map(|n| files(&format!("run {n}"))).collect();
    let items: Vec<ToImport<'_>> =
        runs.iter().zip(&sources).map(|(run, files)| ToImport { run, files }).collect();
    let recorded = stamped(|stamp| book.import_many(&items, stamp)).unwrap();
    drop(book);
    let book = Book::open_to_read(&folder.book(), &Options::default()).unwrap();
    for (index, recorded) in recorded.iter().enumerate() {
        assert!(recorded.new);
        let record = book.run(recorded.number).unwrap();
        // Debug shows the bits that matter: the sign of a nought, the offset of a time; a NaN equals itself.
        assert_eq!(format!("{:?}", record.run), format!("{:?}", runs[index]));
        let header = |run: &Run| {
            body::write(&Record {
                at: run.taken,
                body: Body::RunRestated { run: recorded.number, replaces: 1, header: Cow::Borrowed(run) },
            })
        };
        assert_eq!(header(&record.run), header(&runs[index]));
        assert_eq!(book.source_of(recorded.number).unwrap().as_ref(), Some(&sources[index]));
    }
    assert_eq!(book.check(&[]).unwrap().wrong, None);
    assert_eq!(book.runs(&RunQuery::default()).unwrap().len(), runs.len());
}

#[test]
fn any_decision_is_listed_with_its_figures_or_without_those_that_are_none() {
    let folder = Folder::new("decisions");
    let mut book = begin(&folder.book());
    let (run, files) = (sample_run(), files("a"));
    let number = stamped(|stamp| book.import(ToImport { run: &run, files: &files }, stamp)).unwrap().number;
    let mut runner = TestRunner::deterministic();
    for _ in 0..60 {
        let decision = strategy::decision().new_tree(&mut runner).unwrap().current();
        stamped(|stamp| book.decide(number, decision.clone(), stamp)).unwrap();
        let stored = book.decision(number).unwrap().unwrap();
        assert_eq!(format!("{stored:?}"), format!("{decision:?}"));
        let row = book.runs(&RunQuery::default()).unwrap().remove(0).decision.unwrap();
        let flow = decision.figures.flow_l_min;
        // SQLite keeps a negative nought of a list as nought; the decision itself keeps its sign.
        let listed = (!flow.is_nan()).then_some((flow + 0.0).to_bits());
        assert_eq!(row.flow_l_min.map(f64::to_bits), listed);
        assert_eq!((row.verdict, row.decided), (decision.verdict, decision.at));
    }
    assert_eq!(book.check(&[]).unwrap().wrong, None);
}

#[test]
fn each_connection_has_the_settings_the_record_rests_on() {
    let folder = Folder::new("settings");
    let book = begin(&folder.book());
    let text = |name: &str| {
        book.connection
            .pragma_query_value(None, name, |row| row.get::<_, rusqlite::types::Value>(0))
            .map(|value| format!("{value:?}"))
            .unwrap()
    };
    assert_eq!(text("journal_mode"), "Text(\"wal\")");
    assert_eq!(text("synchronous"), "Integer(2)", "FULL");
    for on in ["secure_delete", "recursive_triggers", "foreign_keys", "cell_size_check"] {
        assert_eq!(text(on), "Integer(1)", "{on}");
    }
    assert_eq!(text("busy_timeout"), "Integer(5000)");
}

#[test]
fn a_full_disk_is_said_and_nothing_of_the_runs_remains() {
    let folder = Folder::new("full");
    let mut book = begin(&folder.book());
    let run = sample_run();
    stamped(|stamp| book.import(ToImport { run: &run, files: &files("first") }, stamp)).unwrap();
    // SQLite reports the same for a file that may not grow as for a disk without room.
    let pages: i64 = book.connection.pragma_query_value(None, "page_count", |row| row.get(0)).unwrap();
    book.connection.pragma_update_and_check(None, "max_page_count", pages + 1, |_| Ok(())).unwrap();
    let large = SourceFiles { readings: vec![b'7'; 100_000], ..files("second") };
    let small = files("third");
    let both = [ToImport { run: &run, files: &small }, ToImport { run: &run, files: &large }];
    let refused = stamped(|stamp| book.import_many(&both, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::Full { .. }), "{refused}");
    assert!(!refused.is_of_the_call());
    assert!(refused.to_string().contains("is full: nothing was recorded"), "{refused}");
    drop(book);
    let book = Book::open_to_read(&folder.book(), &Options::default()).unwrap();
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.runs), (None, 1));
}

/// A run written out by hand, with something in most of its fields.
fn sample_run() -> Run {
    let reads_at = ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    };
    let point = |bar: f64, flow: f64, sweep| PointReading {
        pressure: Indication::Gauge(GaugePressure::from_bar(bar)),
        flow: IndicatedFlow::from_l_min(flow),
        timed: (bar > 9.0)
            .then_some(TimedVolume { volume: Volume::from_l(1.0), duration: Span::from_s(114.0) }),
        pressure_scatter: None,
        flow_scatter: Some(IndicatedFlow::from_l_min(0.0002)),
        averaged: 12.0,
        temperature: Some(Temperature::from_c(21.5)),
        barometer: None,
        meter_temperature: None,
        meter_pressure: None,
        sweep: Some(sweep),
        time_s: Some(bar * 60.0),
    };
    Run {
        orifice: Id::new("CMF-0417").unwrap(),
        build: Build::ThinPlate,
        gas: Species::Oxygen,
        purity: Some(Purity { fraction: 0.995, expanded: 0.003 }),
        purpose: Purpose::AsFound,
        taken: time("2026-11-12T09:40:00+11:00"),
        technician: Some("Ilse Várga".into()),
        readings: Readings::Points(vec![
            point(6.0, 0.3356, Sweep::Rising),
            point(8.0, 0.4312, Sweep::Rising),
            point(10.0, 0.5268, Sweep::Falling),
        ]),
        conditions: Conditions {
            barometer: Influence {
                value: Some(AbsolutePressure::from_pa(100_920.0)),
                expanded: Some(PressureDifference::from_pa(100.0)),
            },
            ..Conditions::default()
        },
        before: ZeroAndLeak { zero: Some(IndicatedFlow::from_l_min(0.0001)), leak_pa_s: None },
        after: ZeroAndLeak { zero: None, leak_pa_s: Some(3.5) },
        meter: Meter {
            id: Some(Id::new("FM-01").unwrap()),
            kind: MeterKind::Mass { reads_at, made_for: Species::Air, gas_factor: None },
            papers: Papers {
                gain: Some(0.008),
                zero: Some(IndicatedFlow::from_l_min(0.0006)),
                noise: Some(Amount::OfReading(0.002)),
                resolution: Some(IndicatedFlow::from_l_min(0.0001)),
                coverage: 2.0,
                range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
                certificate: Some("FM-2026-118".into()),
                due: chrono::NaiveDate::from_ymd_opt(2027, 3, 1),
            },
        },
        transducer: Transducer {
            id: None,
            papers: Papers {
                gain: Some(0.002),
                zero: Some(PressureDifference::from_pa(1000.0)),
                noise: Some(Amount::Fixed(PressureDifference::from_pa(400.0))),
                resolution: None,
                coverage: 2.0,
                range: None,
                certificate: None,
                due: None,
            },
        },
        acceptance: Some(Acceptance {
            id: None,
            ip: GaugePressure::from_bar(10.0),
            flow: StpdFlow::from_l_min(0.48),
            gas: None,
            tolerance: Tolerance::Relative(0.05),
            rule: Rule::Guarded,
            limits: Limits::DEFAULT,
        }),
        left_out: vec![LeftOut { point: 2, why: "door opened".into() }],
    }
}

/// One record of every kind.
fn sample_records() -> Vec<Record<'static>> {
    let run = RunNumber::new(7).unwrap();
    let id = |text: &str| Id::new(text).unwrap();
    let header = || Cow::Owned(Run { readings: Readings::Points(Vec::new()), ..sample_run() });
    let Readings::Points(points) = sample_run().readings else { unreachable!("the sample has points") };
    let series = Readings::Series(SeriesReadings {
        time_s: vec![0.0, 1.0],
        pressure_pa: vec![1e6, f64::NAN],
        pressure_is_absolute: true,
        flow_l_min: vec![0.5, 0.25],
        temperature_k: Some(vec![294.0, 295.0]),
        barometer_pa: None,
        meter_temperature_k: None,
        meter_pressure_pa: None,
    });
    let decision = Decision {
        verdict: StoredVerdict::Undecided,
        figures: StoredFigures {
            method_revision: 1,
            gas: Species::Air,
            ip: GaugePressure::from_bar(10.0),
            p1_bar: 11.01325,
            flow_l_min: 0.5,
            standard_uncertainty_l_min: 0.004,
            dof: f64::INFINITY,
            coverage_factor: 1.96,
            parts: vec![StoredPart { source: "meter gain".into(), u_l_min: -0.002, dof: f64::INFINITY }],
            limits_l_min: Some((0.456, 0.504)),
            conformity_probability: Some(0.84),
            failed_checks: vec!["steady".into()],
            points_used: 9,
            meter_certificate: Some("FM-2026-118".into()),
            transducer_certificate: None,
            against: Some((RunNumber::new(3).unwrap(), -0.4)),
        },
        at: time("2026-11-12T11:00:00+11:00"),
        by: Some("I. Varga".into()),
        remark: None,
    };
    let instrument = |protocol, papers| Instrument {
        id: id("FM-01"),
        measures: Measures::Flow,
        socket: Some(Socket::Usb("0403:6001:A7".into())),
        baud: Some(19_200),
        frame: Some("8N1".into()),
        unit: Some("L/min".into()),
        protocol: Some(protocol),
        papers: Some(papers),
    };
    let lines = Protocol::Lines {
        ask: Some("READ?\n".into()),
        every: Some(Span::from_s(0.2)),
        ends: "\r\n".into(),
        pattern: r"(?P<value>\d+)".into(),
        stale_after: Some(Span::from_s(2.0)),
    };
    let modbus = Protocol::ModbusRtu {
        device: 1,
        table: ModbusTable::Holding,
        register: 40,
        number: ModbusNumber::I32,
        word_order: WordOrder::Little,
        scale: 0.001,
        every: None,
        stale_after: None,
    };
    let entry = |entry| Body::Entry { revision: 2, replaces: Some(5), entry: Box::new(entry) };
    let bodies = vec![
        Body::Begun,
        Body::Run { number: run, origin: Origin::Imported, source: Some([9; 32]), header: header() },
        Body::Readings { run, readings: Cow::Owned(sample_run().readings) },
        Body::Readings { run, readings: Cow::Owned(series) },
        Body::Source { run, files: Cow::Owned(files("cmf-0417")) },
        Body::PointCorrected { run, point: 2, replaces: 3, reading: points[1] },
        Body::PointStruck { run, point: 3, replaces: 3, why: "typed twice".into() },
        Body::RunRestated { run, replaces: 2, header: header() },
        Body::RunFinished { run },
        Body::LeftOut {
            run,
            left_out: LeftOut { point: 1, why: "hose kinked".into() },
            by: Some("I. Varga".into()),
        },
        Body::Decided { run, decision: Box::new(decision) },
        entry(Entry::Orifice(Orifice {
            customer: Some("Club".into()),
            nominal_diameter: Some(Length::from_um(76.0)),
            ..Orifice::bare(id("CMF-0417"))
        })),
        entry(Entry::Instrument(instrument(lines, InstrumentPapers::Meter(sample_run().meter)))),
        entry(Entry::Instrument(instrument(modbus, InstrumentPapers::Transducer(sample_run().transducer)))),
        entry(Entry::FirstStage(FirstStage {
            id: id("FS-2"),
            compensated: false,
            ip_range: (GaugePressure::from_bar(7.0), GaugePressure::from_bar(13.0)),
            division: PressureDifference::from_bar(0.1),
            gauge_scale: Some(GaugePressure::from_bar(20.0)),
            gauge_error: None,
            ip_spread: None,
            ip_repeat: Some(PressureDifference::from_bar(0.1)),
            max_ip: None,
            trapped_volume: Some(Uncertain { value: Volume::from_l(0.03), expanded: None }),
            fall_observed: Some(Uncertain {
                value: PressureRate::from_pa_s(9e4),
                expanded: Some(PressureRate::from_pa_s(5e3)),
            }),
            maker: None,
            serial: Some("77".into()),
        })),
        entry(Entry::Acceptance(Acceptance {
            id: Some(id("mild")),
            tolerance: Tolerance::Flow(StpdFlow::from_l_min(0.02)),
            rule: Rule::Simple,
            gas: Some(Species::Helium),
            ..sample_run().acceptance.unwrap()
        })),
        entry(Entry::Shop(Shop {
            name: "Ebb & Söhne".into(),
            address: "Kai 1\nHafen".into(),
            contact: None,
            logo: Some(Logo { file_name: "logo.svg".into(), bytes: b"<svg/>".to_vec() }),
            accent: Some("#0B6E7A".into()),
            number_pattern: Some("{year}-{n:4}".into()),
            signatories: vec![Signatory { name: "I. Varga".into(), role: None }],
            statements: vec!["Uncertainties are expanded.".into()],
        })),
        entry(Entry::Diver(Diver {
            id: id("D-07"),
            name: Some("A diver".into()),
            mass: Some(Mass::from_kg(82.0)),
            loop_volume: Some(Uncertain { value: Volume::from_l(7.5), expanded: Some(Volume::from_l(1.0)) }),
            diluent: Some(Diluent::Oxygen(Share::from_percent(18.0))),
        })),
        Body::Erasure { erased: vec![12, 19], why: "asked to".into() },
        Body::CopyMade { kind: CopyKind::Backup, place: "stick/book.db".into() },
    ];
    bodies.into_iter().map(|body| Record { at: time("2026-11-12T10:00:00.25+11:00"), body }).collect()
}

#[test]
fn the_bytes_of_each_kind_of_record_are_those_frozen_for_form_1() {
    // A difference means that books written before would no longer verify: give the change a new form instead.
    // The file is written anew only when EBBLINE_FREEZE is set.
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/book/canonical_1.txt");
    let records = sample_records();
    let line = |record: &Record<'_>| {
        let hex: String = body::write(record).iter().map(|byte| format!("{byte:02x}")).collect();
        format!("{} {hex}\n", record.body.kind().number())
    };
    let written: String = records.iter().map(line).collect();
    if std::env::var_os("EBBLINE_FREEZE").is_some() {
        std::fs::write(&path, &written).unwrap();
    }
    let frozen = std::fs::read_to_string(&path).unwrap();
    assert_eq!(frozen.lines().count(), records.len());
    for (frozen, record) in frozen.lines().zip(&records) {
        assert_eq!(format!("{frozen}\n"), line(record), "{:?}", record.body.kind());
        let (kind, hex) = frozen.split_once(' ').unwrap();
        let bytes: Vec<u8> =
            (0..hex.len()).step_by(2).map(|at| u8::from_str_radix(&hex[at..at + 2], 16).unwrap()).collect();
        let read = body::read(kind.parse().unwrap(), &bytes).unwrap();
        assert_eq!(format!("{read:?}"), format!("{record:?}"));
    }
}
