//! Books to test with: folders that go by themselves, invented runs, salts that are numbers.

#![allow(clippy::unwrap_used, reason = "a failed step of a test is a failed test")]
#![allow(dead_code, reason = "each test file uses its own part of this")]

use std::path::{Path, PathBuf};
use std::sync::atomic::{AtomicU64, Ordering};
use std::time::Duration;

use chrono::{DateTime, FixedOffset};
use ebbline::book::{
    Book, LineSource, Options, Recorded, SessionRecorded, SessionSource, SessionToImport, SourceFiles, Stamp,
    ToImport,
};
use ebbline::entry::{
    Assumptions, CellPapers, CellReadings, CellSignal, Conditions, Decision, Diluent, Event, Id, Indication,
    Influence, Injection, LeakTest, LineReference, LoopKept, Meter, MeterKind, Papers, Place, PointReading,
    Purity, Purpose, Readings, Rest, Run, Session, SessionConditions, SessionReadings, StoredFigures,
    StoredPart, StoredVerdict, Sweep, Transducer, What, ZeroAndLeak,
};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Mass, PressureDifference, ReferenceConditions, Span,
    Temperature, TemperatureDifference, Uncertain, Volume,
};

/// A test of the module at `path` as the test program calls it: without the name of the program.
pub(crate) fn named(path: &str, test: &str) -> String {
    let (_program, module) = path.split_once("::").unwrap();
    format!("{module}::{test}")
}

/// A folder of its own, removed at the end.
pub(crate) struct Folder(pub(crate) PathBuf);

impl Folder {
    pub(crate) fn new(name: &str) -> Self {
        static MADE: AtomicU64 = AtomicU64::new(0);
        let made = MADE.fetch_add(1, Ordering::Relaxed);
        let path = std::env::temp_dir().join(format!("ebbline-{}-{made}-{name}", std::process::id()));
        std::fs::create_dir_all(&path).unwrap();
        Self(path)
    }

    pub(crate) fn book(&self) -> PathBuf {
        self.0.join("book.db")
    }

    /// Names of what lies in it.
    pub(crate) fn names(&self) -> Vec<String> {
        let mut names: Vec<String> = std::fs::read_dir(&self.0)
            .unwrap()
            .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }
}

impl Drop for Folder {
    fn drop(&mut self) {
        let _ = std::fs::remove_dir_all(&self.0);
    }
}

/// Waits only as long as a test likes to.
pub(crate) const QUICK: Options = Options { busy: Duration::from_millis(100) };

pub(crate) fn time(text: &str) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(text).unwrap()
}

/// Runs `what` with a stamp whose salts are this process and a count: no two alike, and no chance in a test.
pub(crate) fn stamped<T>(what: impl FnOnce(&mut Stamp<'_>) -> T) -> T {
    static DRAWN: AtomicU64 = AtomicU64::new(1);
    let mut salt = || {
        let mut salt = [0xA5; 16];
        salt[..8].copy_from_slice(&DRAWN.fetch_add(1, Ordering::Relaxed).to_le_bytes());
        salt[8..12].copy_from_slice(&std::process::id().to_le_bytes());
        salt
    };
    what(&mut Stamp { at: time("2026-11-12T10:00:00+11:00"), salt: &mut salt })
}

pub(crate) fn begin(path: &Path) -> Book {
    stamped(|stamp| Book::open_or_begin(path, &Options::default(), stamp)).unwrap()
}

pub(crate) fn id(text: &str) -> Id {
    Id::new(text).unwrap()
}

/// A point of an invented line: 0.045 L/min a bar, and something that tells it from its neighbours.
pub(crate) fn point(index: usize) -> PointReading {
    let bar = 6.0 + 0.5 * (index % 16) as f64;
    PointReading {
        pressure: Indication::Gauge(GaugePressure::from_bar(bar)),
        flow: IndicatedFlow::from_l_min(0.045 * (bar + 1.0) + 1e-5 * index as f64),
        timed: None,
        pressure_scatter: None,
        flow_scatter: None,
        averaged: 1.0,
        temperature: Some(Temperature::from_c(21.0)),
        barometer: Some(AbsolutePressure::from_pa(100_920.0)),
        meter_temperature: None,
        meter_pressure: None,
        sweep: Some(if index % 32 < 16 { Sweep::Rising } else { Sweep::Falling }),
        time_s: Some(60.0 * index as f64),
    }
}

/// An invented run of `points` points.
pub(crate) fn run(orifice: &str, points: usize) -> Run {
    let reads_at = ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    };
    Run {
        orifice: id(orifice),
        build: Default::default(),
        gas: Species::Oxygen,
        purity: Some(Purity { fraction: 0.995, expanded: 0.003 }),
        purpose: Purpose::Acceptance,
        taken: time("2026-11-12T09:40:00+11:00"),
        technician: Some("I. Varga".into()),
        readings: Readings::Points((0..points).map(point).collect()),
        conditions: Conditions {
            temperature: Influence { value: None, expanded: Some(TemperatureDifference::from_k(1.0)) },
            ..Conditions::default()
        },
        before: ZeroAndLeak::default(),
        after: ZeroAndLeak::default(),
        meter: Meter {
            id: None,
            kind: MeterKind::Mass { reads_at, made_for: Species::Oxygen, gas_factor: None },
            papers: Papers {
                gain: Some(0.008),
                zero: Some(IndicatedFlow::from_l_min(0.0006)),
                noise: None,
                resolution: Some(IndicatedFlow::from_l_min(0.0001)),
                coverage: 2.0,
                range: None,
                certificate: Some("FM-2026-118".into()),
                due: None,
            },
        },
        transducer: Transducer {
            id: None,
            papers: Papers {
                gain: Some(0.002),
                zero: Some(PressureDifference::from_pa(1000.0)),
                noise: None,
                resolution: None,
                coverage: 2.0,
                range: None,
                certificate: None,
                due: None,
            },
        },
        acceptance: None,
        left_out: Vec::new(),
    }
}

/// The size of files a run of 20 points has, and a text that no other has.
pub(crate) fn files(text: &str) -> SourceFiles {
    let about: String = (0..18)
        .map(|line| format!("# {text} {line}: an invented run file, as long as they are.\n"))
        .collect();
    let rows: String =
        (0..20).map(|row| format!("{row}.000,0.3{row}50,21.{row},1009.2,rising,{text}\n")).collect();
    SourceFiles {
        run_file_name: "cmf-0417.toml".into(),
        run_file: format!("# {text}\n{about}").into_bytes(),
        readings_name: "cmf-0417.csv".into(),
        readings: format!("ip,flow,gas_c,baro,sweep,time\n{rows}").into_bytes(),
    }
}

pub(crate) fn import(book: &mut Book, run: &Run, text: &str) -> Recorded {
    stamped(|stamp| book.import(ToImport { run, files: &files(text) }, stamp)).unwrap()
}

pub(crate) fn decision(flow_l_min: f64) -> Decision {
    Decision {
        verdict: StoredVerdict::Pass,
        figures: StoredFigures {
            method_revision: 1,
            gas: Species::Oxygen,
            ip: GaugePressure::from_bar(10.0),
            p1_bar: 11.01325,
            flow_l_min,
            standard_uncertainty_l_min: 0.0021,
            dof: f64::INFINITY,
            coverage_factor: 1.96,
            parts: vec![StoredPart { source: "meter gain".into(), u_l_min: 0.002, dof: f64::INFINITY }],
            limits_l_min: Some((0.456, 0.504)),
            conformity_probability: Some(0.9987),
            failed_checks: Vec::new(),
            points_used: 20,
            meter_certificate: Some("FM-2026-118".into()),
            transducer_certificate: None,
            against: None,
        },
        at: time("2026-11-12T11:00:00+11:00"),
        by: Some("I. Varga".into()),
        remark: None,
    }
}

/// An invented couch session of three cells, a reading a second, whose injection came through the line of a run file;
/// `mark` is a number that stands in no other session's readings, in bar.
pub(crate) fn session(diver: &str, seconds: usize, mark: f64) -> Session {
    let cell = |n: usize| {
        let mut readings: Vec<f64> =
            (0..seconds).map(|t| 0.98 + 0.003 * n as f64 - 1e-4 * t as f64).collect();
        readings.iter_mut().skip(1).step_by(7).for_each(|reading| *reading = mark + 1e-6 * n as f64);
        CellReadings { name: format!("c{n}"), signal: CellSignal::Bar(readings) }
    };
    let ip = Uncertain { value: GaugePressure::from_bar(9.4), expanded: None };
    Session {
        diver: id(diver),
        mass: Some(Mass::from_kg(82.0)),
        place: Place::Couch,
        kept: LoopKept::Held,
        diluent: Diluent::Air,
        loop_volume: Some(Uncertain { value: Volume::from_l(7.5), expanded: Some(Volume::from_l(1.0)) }),
        leak_test: LeakTest::Passed,
        nose_clip: Some(true),
        oxygen: None,
        taken: time("2026-11-20T18:05:00+11:00"),
        readings: SessionReadings {
            time_s: (0..seconds).map(|t| t as f64).collect(),
            cells: (1..=3).map(cell).collect(),
            depth_m: None,
            loop_temperature_k: None,
        },
        line: Some(LineReference::RunFile("cmf-0417.toml".into())),
        conditions: SessionConditions { scrubber_warm: Some(true), ..SessionConditions::default() },
        cells: CellPapers::default(),
        rest: Rest { rested_for: Some(Span::from_s(1500.0)), ..Rest::default() },
        assumptions: Assumptions::DEFAULT,
        events: vec![Event { at_s: 0.0, what: What::Injection(Injection::Ip(ip)) }],
        cylinder: None,
    }
}

/// The files such a session comes from, as long as they are; `text` stands in no other's.
pub(crate) fn session_files(session: &Session, text: &str) -> SessionSource {
    let about: String =
        (0..28).map(|line| format!("# {text} {line}: an invented session file, as long.\n")).collect();
    let columns: Vec<&Vec<f64>> = session
        .readings
        .cells
        .iter()
        .map(|cell| match &cell.signal {
            CellSignal::Bar(readings) | CellSignal::Volts { readings, .. } => readings,
        })
        .collect();
    let row = |(index, time): (usize, &f64)| {
        let cells: String = columns.iter().map(|column| format!(",{:.4}", column[index])).collect();
        format!("{time:.0}{cells}\n")
    };
    let rows: String = session.readings.time_s.iter().enumerate().map(row).collect();
    let SourceFiles { run_file_name, run_file, readings_name, readings } = files(text);
    SessionSource {
        session_file_name: format!("{text}.toml"),
        session_file: format!("# {text}\ndiver = \"{}\"\n{about}", session.diver).into_bytes(),
        readings_name: format!("{text}.csv"),
        readings: format!("t,c1,c2,c3\n{rows}").into_bytes(),
        line: Some(LineSource { file_name: run_file_name, file: run_file, readings_name, readings }),
    }
}

/// Imports a session with the line of 20 points that its run file holds.
pub(crate) fn import_session(book: &mut Book, session: &Session, text: &str) -> SessionRecorded {
    let (line, files) = (run("CMF-0417", 20), session_files(session, text));
    let item = SessionToImport { session, line_run: Some(&line), files: &files };
    stamped(|stamp| book.import_sessions(&[item], stamp)).unwrap().remove(0)
}
