//! What can only be seen from inside: frozen bytes, a full disk, the settings of a connection, every value through a file.

use std::borrow::Cow;
use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset};
use proptest::prelude::*;
use proptest::strategy::ValueTree;
use proptest::test_runner::TestRunner;

use super::body::{self, Body, Record};
use super::canonical::{session_strategy, strategy};
use super::sessions::{BLOCK_ROWS, Extent, FileRole, PIECE_BYTES};
use super::*;
use crate::entry::*;
use crate::gas::{Species, Water};
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
fn any_sessions_come_back_from_a_file_to_the_last_bit() {
    let folder = Folder::new("sessions");
    let mut book = begin(&folder.book());
    let mut runner = TestRunner::deterministic();
    let sessions: Vec<Session> =
        (0..150).map(|_| session_strategy::session().new_tree(&mut runner).unwrap().current()).collect();
    let runs: Vec<Option<Run>> = (0..sessions.len())
        .map(|n| (n % 3 == 0).then(|| strategy::run().new_tree(&mut runner).unwrap().current()))
        .collect();
    let sources: Vec<SessionSource> = (0..sessions.len()).map(|n| session_files(n, n % 3 == 0)).collect();
    let items: Vec<SessionToImport<'_>> = sessions
        .iter()
        .zip(&runs)
        .zip(&sources)
        .map(|((session, run), files)| SessionToImport { session, line_run: run.as_ref(), files })
        .collect();
    let recorded = stamped(|stamp| book.import_sessions(&items, stamp)).unwrap();
    drop(book);
    let book = Book::open_to_read(&folder.book(), &Options::default()).unwrap();
    for (index, recorded) in recorded.iter().enumerate() {
        assert!(recorded.new);
        let found = book.session(recorded.number).unwrap();
        assert_eq!(format!("{:?}", found.session), format!("{:?}", sessions[index]));
        assert_eq!(format!("{:?}", found.line_run), format!("{:?}", runs[index]));
        assert_eq!(bits(&found.session), bits(&sessions[index]));
        assert_eq!(book.session_source_of(recorded.number).unwrap().as_ref(), Some(&sources[index]));
    }
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.sessions), (None, 150));
    let rows = book.sessions(&SessionQuery::default()).unwrap();
    assert_eq!(rows.len(), sessions.len());
    for (row, session) in rows.iter().rev().zip(&sessions) {
        let Session { diver, place, kept, taken, readings, .. } = session;
        assert_eq!((row.diver.as_str(), row.place, row.kept), (diver.as_str(), *place, *kept));
        assert_eq!(
            (row.taken, row.readings, row.cells),
            (*taken, readings.time_s.len(), readings.cells.len())
        );
        let times = || readings.time_s.iter().copied().filter(|time| !time.is_nan());
        let (first, last) = (times().reduce(f64::min), times().reduce(f64::max));
        let minutes = first.zip(last).map_or(0.0, |(first, last)| (last - first) / 60.0);
        assert_eq!(format!("{:?}", row.minutes + 0.0), format!("{:?}", minutes + 0.0));
    }
}

/// The bits of every number a session's columns and header hold.
fn bits(session: &Session) -> (Vec<u8>, Vec<u64>) {
    let number = SessionNumber::new(1).unwrap();
    let record = |body| body::write(&Record { at: session.taken, body });
    let extent = Some(Extent { rows: 0, first_s: 0.0, last_s: 0.0 });
    let header = Body::Session {
        number,
        origin: Origin::Entered,
        source: None,
        extent,
        header: Cow::Borrowed(session),
    };
    let columns = sessions::columns(&session.readings).concat();
    (record(header), columns.into_iter().map(f64::to_bits).collect())
}

/// Files of a session that no other has; empty ones among them.
fn session_files(n: usize, with_line: bool) -> SessionSource {
    let SourceFiles { run_file_name, run_file, readings_name, readings } = files(&format!("run {n}"));
    let line = LineSource { file_name: run_file_name, file: run_file, readings_name, readings };
    SessionSource {
        session_file_name: format!("couch {n}.toml"),
        session_file: format!("# session {n}").into_bytes(),
        readings_name: format!("../couch {n}.csv"),
        readings: if n.is_multiple_of(2) { Vec::new() } else { vec![0xFF; n] },
        line: with_line.then_some(line),
    }
}

#[test]
fn readings_and_files_of_more_than_one_block_come_back_whole() {
    let folder = Folder::new("blocks");
    let mut book = begin(&folder.book());
    let rows = 2 * BLOCK_ROWS + 1;
    let column = |step: f64| (0..rows).map(|row| row as f64 * step).collect::<Vec<_>>();
    let mut session = sample_session();
    session.readings.time_s = column(0.1);
    for (cell, step) in session.readings.cells.iter_mut().zip([1e-6, 1e-7]) {
        let (CellSignal::Bar(readings) | CellSignal::Volts { readings, .. }) = &mut cell.signal;
        *readings = column(step);
    }
    session.readings.depth_m = Some(column(1e-5));
    let mut from = session_files(1, true);
    from.readings = (0..2 * PIECE_BYTES + 1).map(|at| (at % 251) as u8).collect();
    from.line.as_mut().unwrap().readings = vec![7; PIECE_BYTES];
    let item = SessionToImport { session: &session, line_run: None, files: &from };
    let before = book.info().unwrap().head.seq;
    let number = stamped(|stamp| book.import_sessions(&[item], stamp)).unwrap()[0].number;
    // The diver, the header, three blocks, and of the files one, three, one and one pieces.
    assert_eq!(book.info().unwrap().head.seq - before, 1 + 1 + 3 + 6);
    assert_eq!(book.session(number).unwrap().session, session);
    assert_eq!(book.session_source_of(number).unwrap(), Some(from));
    assert_eq!(book.sessions(&SessionQuery::default()).unwrap()[0].readings, rows);
    assert_eq!(book.check(&[]).unwrap().wrong, None);
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
fn a_full_disk_is_said_and_nothing_of_the_runs_or_sessions_remains() {
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
    // Of sessions neither: the first fits, but not with the second.
    let session = sample_session();
    let (small, large) =
        (session_files(0, false), SessionSource { readings: vec![b'7'; 100_000], ..session_files(1, false) });
    let both = [&small, &large].map(|files| SessionToImport { session: &session, line_run: None, files });
    let refused = stamped(|stamp| book.import_sessions(&both, stamp)).unwrap_err();
    assert!(matches!(refused, BookError::Full { .. }), "{refused}");
    drop(book);
    let book = Book::open_to_read(&folder.book(), &Options::default()).unwrap();
    let check = book.check(&[]).unwrap();
    assert_eq!((check.wrong, check.runs, check.sessions), (None, 1, 0));
    assert_eq!(book.info().unwrap().entries.last(), Some(&(Register::Diver, 0)));
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

/// A session's header written out by hand, with something in most of its fields and every kind of event.
fn sample_session() -> Session {
    let flow = |l_min: f64, u: f64| Uncertain {
        value: StpdFlow::from_l_min(l_min),
        expanded: Some(StpdFlow::from_l_min(u)),
    };
    let metered = Metered {
        volume: Uncertain { value: Volume::from_l(0.4), expanded: None },
        reads_at: Some(ReferenceConditions {
            temperature: Temperature::from_c(25.0),
            pressure: AbsolutePressure::from_pa(101_300.0),
        }),
    };
    let ip =
        Uncertain { value: GaugePressure::from_bar(9.4), expanded: Some(PressureDifference::from_bar(0.1)) };
    let warm =
        Uncertain { value: Temperature::from_c(24.0), expanded: Some(TemperatureDifference::from_k(1.0)) };
    let contents = |bar: f64| Uncertain {
        value: GaugePressure::from_bar(bar),
        expanded: Some(PressureDifference::from_bar(1.0)),
    };
    let events = [
        What::Injection(Injection::Flow(flow(0.31, 0.01))),
        What::OxygenAdd(Some(metered)),
        What::DiluentAdd(None),
        What::Vent(Some(Metered { reads_at: None, ..metered })),
        What::MakeUp { kept: Some(LoopKept::Sealed), mark: true },
        What::Injection(Injection::Ip(ip)),
        What::Exclude { until_s: 700.5 },
        What::Injection(Injection::Off),
        What::Stop,
    ];
    Session {
        diver: Id::new("D-07").unwrap(),
        mass: Some(Mass::from_kg(82.0)),
        place: Place::Pool,
        kept: LoopKept::Topped,
        diluent: Diluent::Oxygen(Share::from_percent(18.0)),
        loop_volume: Some(Uncertain { value: Volume::from_l(7.5), expanded: Some(Volume::from_l(1.0)) }),
        leak_test: LeakTest::Measured(flow(0.005, 0.001)),
        nose_clip: Some(false),
        oxygen: Some(Purity { fraction: 0.995, expanded: 0.003 }),
        taken: time("2026-11-20T18:05:00+11:00"),
        readings: SessionReadings {
            time_s: Vec::new(),
            cells: vec![
                CellReadings { name: "c1".into(), signal: CellSignal::Bar(Vec::new()) },
                CellReadings {
                    name: "Zelle 2".into(),
                    signal: CellSignal::Volts { readings: Vec::new(), in_air: 0.0101, in_oxygen: 0.048 },
                },
            ],
            depth_m: Some(Vec::new()),
            loop_temperature_k: None,
        },
        line: Some(LineReference::RunFile("cmf-0417.toml".into())),
        conditions: SessionConditions {
            depth: Influence { value: Some(Length::from_m(1.5)), expanded: None },
            water: Water::Sea,
            time_on_loop: Some(Span::from_s(600.0)),
            scrubber_warm: Some(true),
            ..SessionConditions::default()
        },
        cells: CellPapers {
            gain: Some(0.02),
            calibrated_at: Some(CalibratedAt {
                barometer: AbsolutePressure::from_pa(101_600.0),
                temperature: Temperature::from_c(21.0),
                humidity: 0.5,
                oxygen: 0.995,
            }),
        },
        rest: Rest {
            posture: Some("lying".into()),
            rested_for: Some(Span::from_s(1500.0)),
            caffeine_or_nicotine: Some(false),
            water_temperature: Some(Temperature::from_c(33.0)),
            suit: Some("none".into()),
            ..Rest::default()
        },
        assumptions: Assumptions { wander: 0.05, ..Assumptions::DEFAULT },
        events: (0_u8..).zip(events).map(|(n, what)| Event { at_s: 60.0 * f64::from(n), what }).collect(),
        cylinder: Some(Cylinder {
            volume: Uncertain { value: Volume::from_l(2.0), expanded: None },
            from: contents(182.0),
            from_temperature: warm,
            to: contents(171.0),
            to_temperature: warm,
            feeds: Feeds::Adds,
        }),
    }
}

fn session_left_out(stretch_s: Option<(f64, f64)>) -> SessionLeftOut {
    let by = stretch_s.is_none().then(|| "I. Varga".to_owned());
    SessionLeftOut { stretch_s, why: "coughed".into(), by, at: time("2026-11-21T09:00:00+11:00") }
}

/// One record of every kind.
fn sample_records() -> Vec<Record<'static>> {
    let run = RunNumber::new(7).unwrap();
    let session = SessionNumber::new(5).unwrap();
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
        Body::Certificate(Box::new(certificate_tests::sample(sample_run(), decision.figures.clone()))),
        Body::CertificateFiles { certificate: 42, files: CertificateFiles { pdf: [3; 32], xml: [4; 32] } },
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
        Body::Session {
            number: session,
            origin: Origin::Imported,
            source: Some([8; 32]),
            extent: Some(Extent { rows: 2, first_s: 0.0, last_s: 1.0 }),
            header: Cow::Owned(sample_session()),
        },
        Body::SessionReadings {
            session,
            columns: [[0.0, 1.0], [0.7, f64::NAN], [0.048, 0.0479]].map(|c| Cow::Owned(c.to_vec())).into(),
        },
        Body::SessionLine { session, run: Cow::Owned(sample_run()) },
        Body::SessionFile {
            session,
            role: FileRole::LineReadings,
            name: "cmf-0417.csv".into(),
            bytes: Cow::Owned(b"ip,flow\n".to_vec()),
        },
        Body::SessionLeftOut { session, left_out: session_left_out(Some((60.0, 90.5))) },
        Body::SessionLeftOut { session, left_out: session_left_out(None) },
        Body::Session {
            number: session,
            origin: Origin::Entered,
            source: None,
            extent: None,
            header: Cow::Owned(Session { events: Vec::new(), ..sample_session() }),
        },
        Body::SessionEvent { session, event: Event { at_s: 600.0, what: What::OxygenAdd(None) } },
        Body::SessionReadingCorrected {
            session,
            row: 2,
            replaces: 3,
            values: vec![30.0, 0.69, f64::NAN, 1.5],
        },
        Body::SessionEventCorrected {
            session,
            row: 3,
            replaces: 4,
            event: Event { at_s: 90.0, what: What::Stop },
        },
        Body::SessionRowStruck { session, row: 4, replaces: 5, why: "read the wrong watch".into() },
        Body::SessionRestated {
            session,
            replaces: 2,
            header: Cow::Owned(Session { events: Vec::new(), mass: None, ..sample_session() }),
        },
        Body::SessionFinished {
            session,
            cells: 2,
            extent: Extent { rows: 2, first_s: 0.0, last_s: f64::NAN },
        },
        Body::Erasure { erased: vec![12, 19], sessions: vec![session], why: "asked to".into() },
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
