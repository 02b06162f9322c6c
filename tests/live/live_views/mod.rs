//! Invented views for the live screens, and the screens as text.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use ebbline::cli::live::{BenchScene, Glyphs, Look, SessionScene};
use ebbline::entry::{Event, Injection, LoopKept, Place, Purpose, RunNumber, SessionNumber, Sweep, What};
use ebbline::quantity::text::uncertain;
use ebbline::report::Units;
use ebbline::report::bench_live::{BenchView, CheckSeen, Holds, LineSeen, PointSeen, Sign, SweepSoFar};
use ebbline::report::live_parts::{Dial, DialKind, DialState, Hold, Saved};
use ebbline::report::session_live::{AlarmSeen, CellSeen, SessionView, Wrong};
use ratatui::Terminal;
use ratatui::backend::TestBackend;
use ratatui::buffer::Buffer;

pub(crate) const FULL: Look = Look { glyphs: Glyphs::Full, colour: true };
pub(crate) const ASCII: Look = Look { glyphs: Glyphs::Ascii, colour: false };

/// A dial that is steady.
pub(crate) fn dial(kind: DialKind, instrument: &str, value: f64) -> Dial {
    Dial {
        kind,
        instrument: instrument.into(),
        value: Some(value),
        resolution: None,
        meant: String::new(),
        rate_per_min: Some(0.0),
        state: DialState::Steady,
        per_s: Some(5.0),
        faults: 0,
        trouble: None,
    }
}

/// A point on the invented line 0.0012 + 0.0481 p L/min.
pub(crate) fn point(number: usize, pressure_bar: f64, sweep: Sweep) -> PointSeen {
    let off = 1e-4 * ((number * 37 % 21) as f64 - 10.0);
    PointSeen {
        number,
        pressure_bar,
        flow_l_min: (0.0012 + 0.0481 * pressure_bar) * (1.0 + off),
        sweep: Some(sweep),
        off_line: Some(off),
        left_out: None,
        apart: false,
    }
}

/// A run before its first point: the pressure was just set.
pub(crate) fn begun() -> BenchView {
    BenchView {
        units: Units::default(),
        run: RunNumber::new(61),
        orifice: "CMF-0417".into(),
        gas: "oxygen".into(),
        purpose: Purpose::Acceptance,
        technician: Some("I. Varga".into()),
        pressure: Dial {
            meant: "gauge".into(),
            resolution: Some(0.001),
            rate_per_min: Some(-0.04),
            state: DialState::Moving,
            ..dial(DialKind::Pressure, "PT-01", 10.021)
        },
        flow: Dial {
            meant: "at 20 °C, 101.325 kPa".into(),
            resolution: Some(0.0001),
            rate_per_min: Some(-0.0021),
            state: DialState::Moving,
            ..dial(DialKind::Flow, "FM-01", 0.4831)
        },
        around: vec![
            Dial { state: DialState::Read, ..dial(DialKind::Temperature, "TH-01", 21.34) },
            Dial { state: DialState::Read, ..dial(DialKind::Barometer, "BA-01", 1.00921) },
        ],
        sign: Sign {
            steady: false,
            says: "pressure still falling 0.04 bar/min".into(),
            held_s: 12.0,
            least_s: 30.0,
        },
        by_itself: true,
        taken_here: false,
        sweep: SweepSoFar { direction: None, wanted: None, span_bar: None, next: None },
        points: Vec::new(),
        line: None,
        limits: None,
        says: vec!["6 more points for a line".into()],
        checks: Vec::new(),
        saved: Saved::All,
        hold: Hold::Ours,
        elapsed_s: 72.4,
        left_s: None,
    }
}

/// A run with seven points, steady at a level that has its point.
pub(crate) fn seven_points() -> BenchView {
    let mut points: Vec<PointSeen> = [4.0, 6.0, 8.0, 10.0, 12.0]
        .into_iter()
        .enumerate()
        .map(|(i, bar)| point(i + 1, bar, Sweep::Rising))
        .collect();
    points.push(PointSeen { apart: true, off_line: Some(0.0145), ..point(6, 10.0, Sweep::Falling) });
    points.push(PointSeen { left_out: Some("hose touched".into()), ..point(7, 8.0, Sweep::Falling) });
    let mut view = begun();
    view.pressure.state = DialState::Steady;
    view.flow.state = DialState::Steady;
    view.flow.faults = 2;
    BenchView {
        points,
        sign: Sign { steady: true, says: "steady".into(), held_s: 34.0, least_s: 30.0 },
        taken_here: true,
        sweep: SweepSoFar {
            direction: Some(Sweep::Falling),
            wanted: Some(12),
            span_bar: Some((2.0, 12.0)),
            next: Some("next: 6 bar, falling".into()),
        },
        line: Some(LineSeen { intercept_l_min: 0.0012, slope_l_min_bar: 0.0481 }),
        limits: Some((10.0, 0.456, 0.504)),
        says: vec![
            "0.4822 ± 0.0061 L/min STPD at 10 bar IP; PASS so far (0.456 to 0.504); crossing 2.5 kPa".into(),
            "point 7 does not count".into(),
        ],
        checks: vec![
            CheckSeen { holds: Holds::Yes, says: "choked: every point is choked".into() },
            CheckSeen { holds: Holds::Yes, says: "straight: the line is straight".into() },
            CheckSeen {
                holds: Holds::Open,
                says: "rising = falling: two more falling points are needed to tell".into(),
            },
            CheckSeen {
                holds: Holds::No,
                says: "outlier: point 6 lies apart from the rest: read it again, or leave it out with the reason"
                    .into(),
            },
        ],
        elapsed_s: 1271.0,
        left_s: Some(600.0),
        ..view
    }
}

/// Forty points, up and down.
pub(crate) fn forty_points() -> BenchView {
    let mut view = seven_points();
    view.points = (1..=40)
        .map(|n| {
            let up = if n <= 20 { n } else { 41 - n };
            let sweep = if n <= 20 { Sweep::Rising } else { Sweep::Falling };
            point(n, 2.0 + 0.5 * up as f64, sweep)
        })
        .collect();
    view.sweep.wanted = None;
    view
}

/// Names and reasons as long as they can be, and what a hostile hand would type.
pub(crate) fn long_names() -> BenchView {
    let mut view = seven_points();
    view.orifice = "A-very-long-name-of-32-characters".into();
    view.technician = Some("Варвара Константиновна Преображенская-Вознесенская".into());
    view.pressure.instrument = "transducer-with-32-characters-xx".into();
    view.flow.instrument = "flow-meter-with-32-characters-xx".into();
    view.flow.faults = 12_345;
    view.around[0].instrument = "thermometer-of-32-characters-xxx".into();
    if let Some(point) = view.points.last_mut() {
        point.left_out = Some(format!("шланг задели \u{1b}[2J\u{202e} {}", "and more ".repeat(12)));
    }
    view
}

/// Stale pressure, frozen flow, a lost barometer, and a book that cannot be written.
pub(crate) fn troubled() -> BenchView {
    let mut view = seven_points();
    view.pressure.state = DialState::Stale { age_s: 12.3 };
    view.flow.state = DialState::Frozen { for_s: 34.0 };
    view.around[1].state = DialState::Lost { age_s: Some(130.0) };
    view.around[1].trouble = Some("the port /dev/ttyUSB0 went away".into());
    view.sign = Sign {
        steady: false,
        says: "pressure is stale: its last reading is 12 s old".into(),
        held_s: 0.0,
        least_s: 30.0,
    };
    view.taken_here = false;
    view.saved = Saved::Not { readings: 214, for_s: 21.0, why: Some("the disk is full".into()) };
    view
}

/// In psi and mL/min.
pub(crate) fn other_units() -> BenchView {
    let shown = ebbline::quantity::Shown::parse("psi,mL/min,F").unwrap();
    BenchView { units: Units::new(shown), ..seven_points() }
}

/// Only watched, and without a run yet.
pub(crate) fn watched() -> BenchView {
    BenchView { hold: Hold::Watched("process 4711".into()), run: None, ..begun() }
}

pub(crate) fn bench_views() -> Vec<(&'static str, BenchView)> {
    vec![
        ("begun", begun()),
        ("seven-points", seven_points()),
        ("forty-points", forty_points()),
        ("long-names", long_names()),
        ("troubled", troubled()),
        ("other-units", other_units()),
        ("watched", watched()),
    ]
}

fn cell(name: &str, bar: f64) -> CellSeen {
    let dial = Dial { per_s: Some(1.0), ..dial(DialKind::Po2, name, bar) };
    CellSeen { dial: Dial { state: DialState::Read, ..dial }, millivolts: None, off: false }
}

/// A couch session that goes well.
pub(crate) fn couch() -> SessionView {
    let flow = uncertain("0.31 L/min ± 0.01 L/min").unwrap();
    SessionView {
        units: Units::default(),
        session: SessionNumber::new(12),
        diver: "D-07".into(),
        place: Place::Couch,
        kept: LoopKept::Held,
        elapsed_s: Some(1450.0),
        left_s: None,
        po2_bar: Some(0.8412),
        po2_rate_bar_min: Some(-0.0214),
        limits_bar: (0.40, 1.0),
        cells: vec![cell("C1", 0.843), cell("C2", 0.841), cell("C3", 0.836)],
        around: vec![Dial { state: DialState::Read, ..dial(DialKind::Temperature, "LT-1", 33.1) }],
        alarms: Vec::new(),
        injection: Some(Injection::Flow(flow)),
        events: vec![
            Event { at_s: 0.0, what: What::Injection(Injection::Flow(flow)) },
            Event { at_s: 610.0, what: What::OxygenAdd(None) },
        ],
        rows: 1451,
        curve: (0..=1450)
            .map(|s| {
                let s = f64::from(s);
                let since = if s < 610.0 { s } else { s - 610.0 };
                (s, 0.95 - 0.0078 * since / 60.0)
            })
            .collect(),
        saved: Saved::All,
        hold: Hold::Ours,
    }
}

/// Before the first row.
pub(crate) fn not_begun() -> SessionView {
    let mut view = couch();
    for cell in &mut view.cells {
        cell.dial.state = DialState::Waiting;
        cell.dial.value = None;
        cell.dial.per_s = None;
    }
    SessionView {
        session: None,
        elapsed_s: None,
        po2_bar: None,
        po2_rate_bar_min: None,
        injection: None,
        events: Vec::new(),
        rows: 0,
        curve: Vec::new(),
        ..view
    }
}

/// PO2 under the floor.
pub(crate) fn low() -> SessionView {
    let what = Wrong::Po2Low { limit_bar: 0.40 };
    SessionView {
        po2_bar: Some(0.381),
        po2_rate_bar_min: Some(-0.11),
        alarms: vec![AlarmSeen { what, for_s: 12.0, worst: 0.379 }],
        ..couch()
    }
}

/// In a pool, with everything wrong at once.
pub(crate) fn all_wrong() -> SessionView {
    let mut view = couch();
    view.place = Place::Pool;
    view.limits_bar = (0.60, 1.3);
    view.cells[0].dial.state = DialState::Stale { age_s: 8.0 };
    view.cells[1].dial.state = DialState::Frozen { for_s: 75.0 };
    view.cells[2].dial.state = DialState::Lost { age_s: None };
    view.cells[2].dial.value = None;
    view.around = vec![dial(DialKind::Depth, "DG-1", 3.42), view.around[0].clone()];
    view.around[0].state = DialState::Moving;
    view.around[0].rate_per_min = Some(1.5);
    view.po2_bar = None;
    view.po2_rate_bar_min = None;
    let alarm = |what, for_s, worst| AlarmSeen { what, for_s, worst };
    view.alarms = vec![
        alarm(Wrong::NoPo2, 8.0, 8.0),
        alarm(Wrong::Po2Low { limit_bar: 0.60 }, 95.0, 0.57),
        alarm(Wrong::TooDeep { limit_m: 3.0 }, 4.0, 3.42),
        alarm(Wrong::Stale("C1".into()), 8.0, 8.0),
        alarm(Wrong::Frozen("C2".into()), 75.0, 75.0),
        alarm(Wrong::Missing("C3".into()), 62.0, 62.0),
        alarm(Wrong::RisesUnfed, 30.0, 0.0123),
    ];
    view.saved = Saved::Not { readings: 9, for_s: 9.0, why: Some("the disk is full".into()) };
    view
}

/// Cells in mV, one off the others, long names and many events.
pub(crate) fn long_session() -> SessionView {
    let mut view = couch();
    view.diver = "diver-with-a-name-of-32-characte".into();
    view.cells[0].dial.instrument = "ячейка-с-очень-длинным-именем-32".into();
    view.cells[0].millivolts = Some(43.21);
    view.cells[1].millivolts = Some(44.5);
    view.cells[1].dial.faults = 3;
    view.cells[2].off = true;
    view.alarms = vec![AlarmSeen { what: Wrong::Disagrees("C3".into()), for_s: 15.0, worst: 0.071 }];
    let what = [
        What::OxygenAdd(None),
        What::DiluentAdd(None),
        What::Vent(None),
        What::MakeUp { kept: Some(LoopKept::Sealed), mark: true },
        What::Exclude { until_s: 700.0 },
        What::Injection(Injection::Off),
    ];
    view.events = (0..18).map(|i| Event { at_s: 60.0 * i as f64, what: what[i % 6] }).collect();
    view.injection = Some(Injection::Off);
    view
}

pub(crate) fn session_views() -> Vec<(&'static str, SessionView)> {
    vec![
        ("couch", couch()),
        ("not-begun", not_begun()),
        ("low", low()),
        ("all-wrong", all_wrong()),
        ("long-session", long_session()),
    ]
}

/// The rows of a screen as text.
pub(crate) fn text(buffer: &Buffer) -> String {
    let area = buffer.area;
    (area.y..area.bottom())
        .map(|y| {
            let row: String = (area.x..area.right()).map(|x| buffer[(x, y)].symbol()).collect();
            row.trim_end().to_owned() + "\n"
        })
        .collect()
}

/// The scene of a run on a screen of a size.
pub(crate) fn bench_drawn(scene: &mut BenchScene, wide: u16, high: u16) -> Buffer {
    let mut terminal = Terminal::new(TestBackend::new(wide, high)).unwrap();
    terminal.draw(|frame| scene.draw(frame)).unwrap();
    terminal.backend().buffer().clone()
}

/// The scene of a session on a screen of a size.
pub(crate) fn session_drawn(scene: &mut SessionScene, wide: u16, high: u16) -> Buffer {
    let mut terminal = Terminal::new(TestBackend::new(wide, high)).unwrap();
    terminal.draw(|frame| scene.draw(frame)).unwrap();
    terminal.backend().buffer().clone()
}

/// A run as it is shown first.
pub(crate) fn bench_screen(view: &BenchView, look: Look, wide: u16, high: u16) -> Buffer {
    let mut scene = BenchScene::new(look);
    scene.show(view);
    bench_drawn(&mut scene, wide, high)
}

/// A session as it is shown first.
pub(crate) fn session_screen(view: &SessionView, look: Look, wide: u16, high: u16) -> Buffer {
    let mut scene = SessionScene::new(look);
    scene.show(view);
    session_drawn(&mut scene, wide, high)
}
