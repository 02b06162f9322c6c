//! The screens of a run and of a session that are being logged, drawn without a terminal, and their lines for a pipe.

#![allow(clippy::unwrap_used)] // a screen that cannot be drawn is a failure

use std::fs;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use crate::live_views::*;
use ebbline::cli::live::{BenchLines, BenchScene, SessionLines, SessionScene};
use ebbline::entry::{Injection, LoopKept, What};
use ebbline::report::cautions::SESSION_LIVE;
use ebbline::report::live_parts::DialState;
use ebbline::work::log::{BenchFace as _, BenchWish, SessionFace as _, SessionWish};
use ratatui::crossterm::event::{Event, KeyCode, KeyEvent, KeyModifiers};
use ratatui::style::{Color, Modifier};

const SIZES: [(u16, u16); 3] = [(80, 24), (120, 40), (60, 20)];

/// Compares with the golden screen of that name, or makes it one when EBBLINE_BLESS is 1.
fn golden(name: &str, got: &str) {
    let file = Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/golden").join(format!("{name}.txt"));
    if std::env::var_os("EBBLINE_BLESS").is_some_and(|v| v == "1") {
        fs::write(&file, got).unwrap();
        return;
    }
    let want = fs::read_to_string(&file)
        .unwrap_or_else(|e| panic!("{}: {e}; look at the screen, then set EBBLINE_BLESS=1", file.display()));
    assert!(
        got == want,
        "{} is not the golden screen: look at it, then set EBBLINE_BLESS=1\n{got}",
        file.display()
    );
}

#[test]
fn runs_look_as_they_did() {
    for (name, view) in bench_views() {
        for (wide, high) in SIZES {
            let screen = text(&bench_screen(&view, FULL, wide, high));
            golden(&format!("live-bench-{name}-{wide}x{high}"), &screen);
        }
    }
    golden("live-bench-seven-points-ascii", &text(&bench_screen(&seven_points(), ASCII, 80, 24)));
    golden("live-bench-troubled-ascii", &text(&bench_screen(&troubled(), ASCII, 80, 24)));
}

#[test]
fn sessions_look_as_they_did() {
    for (name, view) in session_views() {
        for (wide, high) in SIZES {
            let screen = text(&session_screen(&view, FULL, wide, high));
            golden(&format!("live-session-{name}-{wide}x{high}"), &screen);
        }
    }
    golden("live-session-low-ascii", &text(&session_screen(&low(), ASCII, 80, 24)));
}

#[test]
fn no_size_is_too_small_to_draw_in() {
    for (wide, high) in [(1, 1), (2, 9), (9, 2), (20, 5), (79, 24), (80, 23), (80, 25), (99, 31), (250, 80)] {
        for look in [FULL, ASCII] {
            for (_, view) in bench_views() {
                bench_screen(&view, look, wide, high);
            }
            for (_, view) in session_views() {
                session_screen(&view, look, wide, high);
            }
        }
    }
}

#[test]
fn ascii_means_ascii() {
    for (name, view) in bench_views() {
        assert!(text(&bench_screen(&view, ASCII, 80, 24)).is_ascii(), "{name}");
    }
    for (name, view) in session_views() {
        assert!(text(&session_screen(&view, ASCII, 120, 40)).is_ascii(), "{name}");
    }
}

#[test]
fn without_colour_there_is_none() {
    let plain = ebbline::cli::live::Look { colour: false, ..FULL };
    let has_colour = |buffer: &ratatui::buffer::Buffer| {
        buffer.content.iter().any(|cell| cell.fg != Color::Reset || cell.bg != Color::Reset)
    };
    assert!(has_colour(&bench_screen(&seven_points(), FULL, 80, 24)));
    assert!(!has_colour(&bench_screen(&seven_points(), plain, 80, 24)));
    assert!(!has_colour(&session_screen(&all_wrong(), plain, 80, 24)));
    // ... and the words are the same.
    assert_eq!(text(&session_screen(&low(), plain, 80, 24)), text(&session_screen(&low(), FULL, 80, 24)));
}

#[test]
fn what_is_needed_stands_on_the_least_screen() {
    for (name, view) in bench_views() {
        let screen = text(&bench_screen(&view, FULL, 80, 24));
        let saved = view.saved.words("reading");
        for needed in [saved.as_str(), "space point", "q leave open", "? help", "CMF-0417"] {
            let needed = if needed == "CMF-0417" { &view.orifice } else { needed };
            assert!(screen.contains(needed), "{name}: {needed}\n{screen}");
        }
    }
    for (name, view) in session_views() {
        for (wide, high) in [(80, 24), (60, 20)] {
            let screen = text(&session_screen(&view, FULL, wide, high));
            let flat = screen.split_whitespace().collect::<Vec<_>>().join(" ");
            assert!(flat.contains(SESSION_LIVE), "{name}: the caution\n{screen}");
            let alarms = view.alarms.len();
            assert_eq!(screen.contains("ALARM"), alarms > 0, "{name}\n{screen}");
        }
    }
}

#[test]
fn a_value_that_is_not_of_now_is_never_shown_as_one() {
    let mut view = seven_points();
    view.pressure.value = Some(77.777);
    for state in [
        DialState::Stale { age_s: 9.0 },
        DialState::Frozen { for_s: 40.0 },
        DialState::Lost { age_s: Some(9.0) },
    ] {
        view.pressure.state = state.clone();
        let screen = text(&bench_screen(&view, FULL, 80, 24));
        let seven = "▀▀▀█ ▀▀▀█";
        assert!(!screen.contains(seven), "{screen}");
        // The last one is told in the words beside it, and nowhere else.
        assert_eq!(screen.matches("77.777").count(), 1, "{screen}");
        let word = match state {
            DialState::Stale { .. } => "STALE",
            DialState::Frozen { .. } => "FROZEN",
            _ => "LOST",
        };
        assert!(screen.contains(word), "{screen}");
    }
    view.pressure.state = DialState::Steady;
    assert!(text(&bench_screen(&view, FULL, 80, 24)).contains("▀▀▀█ ▀▀▀█"));
}

#[test]
fn an_alarm_is_reversed_over_the_whole_width() {
    for look in [FULL, ASCII] {
        let buffer = session_screen(&low(), look, 80, 24);
        let row = (0..24).find(|y| {
            let row: String = (0..80).map(|x| buffer[(x, *y)].symbol()).collect();
            row.contains("BELOW THE FLOOR")
        });
        let row = row.unwrap();
        assert!((0..80).all(|x| buffer[(x, row)].modifier.contains(Modifier::REVERSED)));
        let calm = session_screen(&couch(), look, 80, 24);
        assert!(!calm.content.iter().any(|cell| cell.modifier.contains(Modifier::REVERSED)));
    }
}

#[test]
fn the_bell_rings_once_for_each_alarm() {
    let mut scene = SessionScene::new(FULL);
    assert!(!scene.show(&couch()));
    assert!(scene.show(&low()));
    let mut longer = low();
    longer.alarms[0].for_s = 40.0;
    longer.alarms[0].worst = 0.33;
    assert!(!scene.show(&longer));
    assert!(scene.show(&all_wrong()));
    assert!(!scene.show(&all_wrong()));
    assert!(!scene.show(&couch()));
    assert!(scene.show(&low()));
}

#[test]
fn what_was_typed_elsewhere_cannot_steer_the_terminal() {
    for page in [None, Some(KeyCode::Tab)] {
        let mut scene = BenchScene::new(FULL);
        scene.show(&long_names());
        if let Some(key) = page {
            scene.event(&press(key));
        }
        scene.say("no point \u{1b}[31m");
        let screen = text(&bench_drawn(&mut scene, 120, 40));
        assert!(!screen.chars().any(|c| c.is_control() && c != '\n'), "{screen}");
        assert!(!screen.contains('\u{202e}'));
    }
}

#[test]
fn the_page_of_everything_shortens_nothing() {
    let mut view = forty_points();
    view.points[2].left_out = Some("the hose was touched while the flow settled, seen by both of us".into());
    let mut scene = BenchScene::new(FULL);
    scene.show(&view);
    scene.event(&press(KeyCode::Tab));
    let first = text(&bench_drawn(&mut scene, 80, 24));
    assert!(first.contains("more below"), "{first}");
    let mut all = first;
    for _ in 0..6 {
        scene.event(&press(KeyCode::PageDown));
        all.push_str(&text(&bench_drawn(&mut scene, 80, 24)));
    }
    for number in 1..=40 {
        assert!(all.contains(&format!("point {number}: ")), "{number}\n{all}");
    }
    let flat = all.split_whitespace().collect::<Vec<_>>().join(" ");
    assert!(flat.contains("settled, seen by both of us"), "{all}");
    for check in &view.checks {
        assert!(flat.contains(&check.says), "{}", check.says);
    }
}

fn press(code: KeyCode) -> Event {
    Event::Key(KeyEvent::new(code, KeyModifiers::NONE))
}

/// Types text, `\n` for Enter, `\u{1b}` for Esc.
fn bench_keys(scene: &mut BenchScene, keys: &str) -> Vec<BenchWish> {
    keys.chars().filter_map(|key| scene.event(&press(code(key))).1).collect()
}

fn session_keys(scene: &mut SessionScene, keys: &str) -> Vec<SessionWish> {
    keys.chars().filter_map(|key| scene.event(&press(code(key))).1).collect()
}

fn code(key: char) -> KeyCode {
    match key {
        '\n' => KeyCode::Enter,
        '\u{1b}' => KeyCode::Esc,
        key => KeyCode::Char(key),
    }
}

#[test]
fn keys_of_a_run_are_wishes() {
    let mut scene = BenchScene::new(FULL);
    scene.show(&seven_points());
    assert_eq!(bench_keys(&mut scene, " "), [BenchWish::Take]);
    assert_eq!(bench_keys(&mut scene, "a"), [BenchWish::ByItself(false)]);
    assert_eq!(bench_keys(&mut scene, "q"), [BenchWish::LeaveOpen]);
    assert_eq!(bench_keys(&mut scene, "fy"), [BenchWish::Finish]);
    assert_eq!(bench_keys(&mut scene, "fn"), []);
    assert_eq!(bench_keys(&mut scene, "f\n"), []);
    let why = "qf ?: шланг".to_owned();
    let wish = BenchWish::LeaveOut { point: 3, why };
    assert_eq!(bench_keys(&mut scene, "l3\nqf ?: шланг\n"), [wish]);
    assert_eq!(bench_keys(&mut scene, "l3\nwhy\u{1b}"), []);
    let leave = Event::Key(KeyEvent::new(KeyCode::Char('c'), KeyModifiers::CONTROL));
    assert_eq!(scene.event(&leave).1, Some(BenchWish::LeaveOpen));
    let by_key = ebbline::report::bench_live::BenchView { by_itself: false, ..seven_points() };
    scene.show(&by_key);
    assert_eq!(bench_keys(&mut scene, "a"), [BenchWish::ByItself(true)]);
}

#[test]
fn a_point_that_is_none_and_a_reason_that_is_none_are_asked_again() {
    let mut scene = BenchScene::new(FULL);
    scene.show(&seven_points());
    assert_eq!(bench_keys(&mut scene, "l9\n"), []);
    let screen = text(&bench_drawn(&mut scene, 80, 24));
    assert!(screen.contains("\"9\" is no point of this run: type a number from 1 to 7"), "{screen}");
    assert!(screen.contains("> 9_"), "{screen}");
    scene.event(&press(KeyCode::Backspace));
    assert_eq!(bench_keys(&mut scene, "2\n \n"), []);
    assert!(text(&bench_drawn(&mut scene, 80, 24)).contains("without a reason"));
    assert_eq!(bench_keys(&mut scene, "leak\n"), [BenchWish::LeaveOut { point: 2, why: "leak".into() }]);
    scene.show(&begun());
    assert_eq!(bench_keys(&mut scene, "l"), []);
    assert!(text(&bench_drawn(&mut scene, 80, 24)).contains("no point yet"));
}

#[test]
fn who_only_watches_can_only_leave() {
    let mut scene = BenchScene::new(FULL);
    scene.show(&watched());
    assert_eq!(bench_keys(&mut scene, " alfyq"), [BenchWish::LeaveOpen]);
    assert!(text(&bench_drawn(&mut scene, 80, 24)).contains("process 4711 logs it"));
}

#[test]
fn keys_of_a_session_are_events_that_happened_now() {
    let mut scene = SessionScene::new(FULL);
    scene.show(&couch());
    assert_eq!(session_keys(&mut scene, "o\n"), [SessionWish::Event(What::OxygenAdd(None))]);
    assert_eq!(session_keys(&mut scene, "d\n"), [SessionWish::Event(What::DiluentAdd(None))]);
    assert_eq!(session_keys(&mut scene, "v\n"), [SessionWish::Event(What::Vent(None))]);
    let wishes = session_keys(&mut scene, "o0.4 L at 25 °C, 101.3 kPa\n");
    let [SessionWish::Event(What::OxygenAdd(Some(metered)))] = wishes.as_slice() else {
        panic!("{wishes:?}")
    };
    assert!((metered.volume.value.as_l() - 0.4).abs() < 1e-12 && metered.reads_at.is_some());
    let off = SessionWish::Event(What::Injection(Injection::Off));
    assert_eq!(session_keys(&mut scene, "ioff\n"), [off]);
    let wishes = session_keys(&mut scene, "i9.4 bar\n");
    assert!(
        matches!(wishes.as_slice(), [SessionWish::Event(What::Injection(Injection::Ip(_)))]),
        "{wishes:?}"
    );
    let wishes = session_keys(&mut scene, "i0.31 L/min\n");
    assert!(
        matches!(wishes.as_slice(), [SessionWish::Event(What::Injection(Injection::Flow(_)))]),
        "{wishes:?}"
    );
    let sealed = What::MakeUp { kept: Some(LoopKept::Sealed), mark: true };
    assert_eq!(session_keys(&mut scene, "msealed mark\n"), [SessionWish::Event(sealed)]);
    assert_eq!(
        session_keys(&mut scene, "x10:30\n13:00\n"),
        [SessionWish::Exclude { from_s: 630.0, until_s: 780.0 }]
    );
    assert_eq!(
        session_keys(&mut scene, "x20:00\n\n"),
        [SessionWish::Exclude { from_s: 1200.0, until_s: 1450.0 }]
    );
    assert_eq!(session_keys(&mut scene, "sy"), [SessionWish::Finish]);
    assert_eq!(session_keys(&mut scene, "sq"), []);
    assert_eq!(session_keys(&mut scene, "q"), [SessionWish::LeaveOpen]);
    assert_eq!(session_keys(&mut scene, "o\u{1b}d\u{1b}i\u{1b}v\u{1b}x\u{1b}m\u{1b}"), []);
}

#[test]
fn an_answer_that_is_none_says_why_and_keeps_what_was_typed() {
    let mut scene = SessionScene::new(FULL);
    scene.show(&couch());
    for (keys, says) in [
        ("o0,4 L\n", "0.4"),
        ("i\n", "say what is injected"),
        ("m\n", "sealed, held or topped"),
        ("xsoon\n", "is no time"),
        ("x59:00\n", "has not been yet"),
        ("x10:00\n9:00\n", "must lie after the beginning"),
    ] {
        assert_eq!(session_keys(&mut scene, keys), [], "{keys}");
        let screen = text(&session_drawn(&mut scene, 80, 24));
        assert!(screen.contains(says), "{keys}: {says}\n{screen}");
        assert_eq!(session_keys(&mut scene, "\u{1b}"), []);
    }
}

#[test]
fn questions_and_help_look_as_they_did() {
    let mut run = BenchScene::new(FULL);
    run.show(&seven_points());
    bench_keys(&mut run, "l6\nшланг задели");
    golden("live-bench-why", &text(&bench_drawn(&mut run, 80, 24)));
    bench_keys(&mut run, "\u{1b}?");
    golden("live-bench-help", &text(&bench_drawn(&mut run, 80, 24)));
    let mut session = SessionScene::new(FULL);
    session.show(&all_wrong());
    session_keys(&mut session, "i0.31");
    golden("live-session-injection", &text(&session_drawn(&mut session, 80, 24)));
    session_keys(&mut session, "\n");
    golden("live-session-injection-again", &text(&session_drawn(&mut session, 80, 24)));
    session_keys(&mut session, "\u{1b}?");
    // The alarms stay in sight on every page.
    golden("live-session-help", &text(&session_drawn(&mut session, 80, 24)));
}

/// Everything that lines wrote.
fn bench_lines(show: impl FnOnce(&mut BenchLines<'_>)) -> String {
    let mut out = Vec::new();
    show(&mut BenchLines::new(&mut out, Arc::new(AtomicBool::new(false))));
    String::from_utf8(out).unwrap()
}

#[test]
fn a_pipe_gets_a_line_a_second_and_each_point_once() {
    let text = bench_lines(|lines| {
        let mut view = seven_points();
        for quarter in 0..8 {
            view.elapsed_s = 100.0 + 0.25 * f64::from(quarter);
            if quarter == 6 {
                view.points.push(point(8, 6.0, ebbline::entry::Sweep::Falling));
            }
            lines.show(&view);
        }
        view.points[0].left_out = Some("leak\nat the fitting".into());
        lines.show(&view);
        lines.say("point 1 left out");
        assert_eq!(lines.wishes(), []);
    });
    golden("live-bench-lines", &text);
    assert_eq!(text.lines().filter(|line| line.starts_with("00:01:4")).count(), 2, "{text}");
    assert_eq!(text.lines().filter(|line| line.starts_with("point 8:")).count(), 1, "{text}");
}

#[test]
fn lines_of_troubled_instruments_say_so() {
    let text = bench_lines(|lines| lines.show(&troubled()));
    for says in
        ["-- bar gauge (STALE: last 10.021 bar, 12 s ago)", "FROZEN", "NOT SAVED for 21 s, 214 readings"]
    {
        assert!(text.contains(says), "{text}");
    }
}

#[test]
fn a_session_in_a_pipe_begins_with_the_caution_and_says_each_alarm_once_more() {
    let mut out = Vec::new();
    {
        let mut lines = SessionLines::new(&mut out, Arc::new(AtomicBool::new(false)));
        lines.show(&not_begun());
        lines.show(&not_begun());
        lines.show(&couch());
        let mut view = low();
        view.elapsed_s = Some(1451.0);
        lines.show(&view);
        lines.show(&view);
        view.elapsed_s = Some(1452.0);
        lines.show(&view);
    }
    let text = String::from_utf8(out).unwrap();
    golden("live-session-lines", &text);
    assert!(text.starts_with(SESSION_LIVE), "{text}");
    assert_eq!(text.lines().filter(|line| line.starts_with("ALARM")).count(), 1, "{text}");
    assert_eq!(text.lines().filter(|line| line.starts_with("not begun")).count(), 1, "{text}");
}

#[test]
fn an_interruption_and_a_closed_pipe_leave_the_run_open() {
    let interrupted = Arc::new(AtomicBool::new(false));
    let mut out = Vec::new();
    let mut lines = BenchLines::new(&mut out, Arc::clone(&interrupted));
    assert_eq!(lines.wishes(), []);
    interrupted.store(true, Ordering::SeqCst);
    assert_eq!(lines.wishes(), [BenchWish::LeaveOpen]);

    struct Closed;
    impl std::io::Write for Closed {
        fn write(&mut self, _: &[u8]) -> std::io::Result<usize> {
            Err(std::io::ErrorKind::BrokenPipe.into())
        }
        fn flush(&mut self) -> std::io::Result<()> {
            Ok(())
        }
    }
    let mut closed = Closed;
    let mut lines = SessionLines::new(&mut closed, Arc::new(AtomicBool::new(false)));
    assert_eq!(lines.wishes(), []);
    lines.show(&couch());
    assert_eq!(lines.wishes(), [SessionWish::LeaveOpen]);
    assert_eq!(lines.closed(), Some(std::io::ErrorKind::BrokenPipe));
}
