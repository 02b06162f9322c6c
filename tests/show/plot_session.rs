//! The plot of a session, looked at from outside: as text, as XML, as measured texts.

#![allow(clippy::unwrap_used, reason = "a picture that does not parse is a failure")]

use std::sync::OnceLock;

use crate::loop_simulator::{Dice, Extra, Kind, scene_of, truth};
use crate::plot_checks::{
    holds_only_shapes_and_texts, is_golden, numbers, numbers_are_finite_and_inside, of_class, paths, places,
    texts_stand_apart, told, units,
};
use ebbline::entry::{CalibratedAt, CellSignal, Event, Id, Injection, Metered, Place, Session, What};
use ebbline::plot::{SessionPlot, session_plot};
use ebbline::quantity::{AbsolutePressure, GaugePressure, Length, StpdFlow, Temperature, Uncertain, Volume};
use ebbline::uptake::{Kind as Read, SessionInput, SessionUptake, uptake};
use proptest::prelude::*;

/// Golden pictures: session, width, height.
const GOLDEN: [(&str, u32, u32); 11] = [
    ("some-events", 960, 640),
    ("left-out", 480, 480),
    ("held-twice", 960, 640),
    ("held-twice", 480, 480),
    ("sealed-twice", 960, 640),
    ("topped", 1600, 900),
    ("venting", 480, 480),
    ("unmarked-jump", 960, 640),
    ("many-events", 960, 640),
    ("pool", 960, 640),
    ("hostile-texts", 960, 640),
];

/// Sizes every session is measured at.
const SIZES: [(u32, u32); 6] = [(400, 320), (480, 480), (600, 900), (960, 640), (1600, 900), (2000, 500)];

/// A session to draw, worked out.
#[derive(Clone)]
struct Drawn {
    session: Session,
    uptake: SessionUptake,
    options: SessionPlot,
}

impl Drawn {
    fn at(&self, width: u32, height: u32) -> String {
        session_plot(&self.session, &self.uptake, &SessionPlot { width, height, ..self.options.clone() })
    }
}

/// A simulated session, changed, and worked out.
fn made(kind: Kind, seed: u64, extra: &Extra, change: impl FnOnce(&mut Session)) -> Drawn {
    let mut dice = Dice::new(seed);
    let truth = truth(&mut dice);
    let scene = scene_of(kind, truth, extra, &mut dice);
    let mut session = scene.session;
    change(&mut session);
    let input = SessionInput { session: &session, line: scene.line.as_ref() };
    let uptake = uptake(&[input]).unwrap().places.remove(0).sessions.remove(0);
    let options = SessionPlot { name: "S0001".to_owned(), ..SessionPlot::default() };
    Drawn { session, uptake, options }
}

fn columns(session: &mut Session) -> impl Iterator<Item = &mut Vec<f64>> {
    session.readings.cells.iter_mut().map(|cell| match &mut cell.signal {
        CellSignal::Bar(column) => column,
        CellSignal::Volts { readings, .. } => readings,
    })
}

/// Adds to every cell from a second on.
fn jump(session: &mut Session, at_s: f64, bar: f64) {
    let rows: Vec<usize> =
        (0..session.readings.time_s.len()).filter(|i| session.readings.time_s[*i] > at_s).collect();
    for column in columns(session) {
        rows.iter().for_each(|row| column[*row] += bar);
    }
}

fn litres(l: f64) -> Option<Metered> {
    let volume = Uncertain { value: Volume::from_m3(l / 1e3), expanded: None };
    Some(Metered { volume, reads_at: None })
}

fn flow(l_min: f64) -> What {
    let value = StpdFlow::from_l_min(l_min);
    What::Injection(Injection::Flow(Uncertain { value, expanded: None }))
}

fn named(name: &str) -> Drawn {
    let usual = Extra::default();
    match name {
        "held-twice" => made(Kind::HeldTwice, 3, &usual, |_| {}),
        "null" => made(Kind::Null, 5, &usual, |_| {}),
        "venting" => made(Kind::Venting, 7, &usual, |_| {}),
        "sealed" => made(Kind::Sealed, 11, &usual, |_| {}),
        "sealed-twice" => made(Kind::SealedTwice, 12, &usual, |_| {}),
        "sealed-then-held" => made(Kind::SealedThenHeld, 13, &usual, |_| {}),
        "topped" => made(Kind::Topped, 4, &usual, |_| {}),
        "line" => made(Kind::Line, 9, &usual, |_| {}),
        // One long stretch with a jump nobody wrote down.
        "unmarked-jump" => {
            let mut drawn = made(Kind::Held, 21, &usual, |session| jump(session, 660.0, 0.09));
            drawn.options.why_not = Some(
                "PO2 jumps by 0.09 bar at 0:11:00 and no event says why; write the event down, or exclude \
                 the stretch"
                    .to_owned(),
            );
            drawn
        }
        "many-events" => made(Kind::HeldTwice, 3, &usual, |session| {
            for i in 1..=40_u32 {
                let what = match i % 4 {
                    0 => What::OxygenAdd(litres(0.4)),
                    1 => What::DiluentAdd(litres(0.25)),
                    2 => What::Vent(None),
                    _ => What::MakeUp { kept: None, mark: true },
                };
                session.events.push(Event { at_s: 600.0 + 15.0 * f64::from(i), what });
            }
        }),
        // Too many for their words, few enough for numbers.
        "some-events" => made(Kind::HeldTwice, 3, &usual, |session| {
            for i in 1..=11_u32 {
                let what =
                    if i % 2 == 0 { What::OxygenAdd(litres(0.4)) } else { What::DiluentAdd(litres(0.25)) };
                session.events.push(Event { at_s: 500.0 + 30.0 * f64::from(i), what });
            }
        }),
        "pool" => made(Kind::HeldTwice, 15, &usual, |session| {
            session.place = Place::Pool;
            session.conditions.depth.value = Some(Length::from_m(1.5));
            let depth = session.readings.time_s.iter().map(|t| 1.5 + 0.2 * libm::sin(t / 90.0));
            session.readings.depth_m = Some(depth.collect());
            session.events.push(Event { at_s: 560.0, what: What::Exclude { until_s: 700.0 } });
            session.events.push(Event { at_s: 1500.0, what: What::Stop });
            // One cell is off, and nothing was read for two minutes.
            columns(session).nth(1).unwrap().iter_mut().for_each(|p| *p += 0.09);
            for column in columns(session) {
                column[60..84].fill(f64::NAN);
            }
        }),
        "left-out" => {
            let mut drawn = made(Kind::Held, 6, &usual, |session| {
                session.conditions.scrubber_warm = Some(false);
                session.conditions.time_on_loop = None;
            });
            drawn.options.left_out = vec![(660.0, 780.0), (900.0, 930.0), (f64::NAN, 5.0)];
            drawn
        }
        "volts" => made(Kind::Held, 6, &usual, |session| {
            for cell in &mut session.readings.cells {
                let CellSignal::Bar(column) = &cell.signal else { continue };
                // 10 mV in air of 0.2095 · 1.013 bar, straight through zero.
                let readings = column.iter().map(|p| p * 0.010 / (0.209_476 * 1.013)).collect();
                cell.signal =
                    CellSignal::Volts { readings, in_air: 0.010, in_oxygen: 0.010 * 0.995 / 0.209_476 };
            }
            session.cells.calibrated_at = Some(CalibratedAt {
                barometer: AbsolutePressure::from_bar(1.013),
                temperature: Temperature::from_c(20.0),
                humidity: 0.0,
                oxygen: 0.995,
            });
        }),
        "passed-the-floor" => {
            let extra = Extra { po2: Some(0.55), share: Some(0.1), minutes: -6.0, ..usual };
            made(Kind::Held, 31, &extra, |_| {})
        }
        "hostile-texts" => {
            let mut drawn = made(Kind::Held, 6, &usual, |session| {
                session.diver = Id::new("Дайвер_ЖЩШЮжщшюЫы-Ünïté-12").unwrap();
                session.readings.cells[0].name = "<script>alert(\"&amp;\")</script>".to_owned();
                session.readings.cells[1].name = "c2\u{202e}gnirts\u{0}\u{1b}[31m <&\">".to_owned();
                session.readings.cells[2].name =
                    "</text><image href=\"http://example.org/x.png\"/>".repeat(4);
                jump(session, 600.0, 0.09);
            });
            drawn.options.name = "../<&\"'>/ночь\u{202e}.toml".to_owned();
            drawn.options.why_not = Some("</text><g onload=\"x\">шланг отошёл <&\"> ".repeat(6));
            drawn
        }
        _ => panic!("no session {name}"),
    }
}

const NAMES: [&str; 16] = [
    "held-twice",
    "null",
    "venting",
    "sealed",
    "sealed-twice",
    "sealed-then-held",
    "topped",
    "line",
    "unmarked-jump",
    "many-events",
    "some-events",
    "pool",
    "left-out",
    "volts",
    "passed-the-floor",
    "hostile-texts",
];

/// All of them, worked out once.
fn all() -> &'static [(&'static str, Drawn)] {
    static ALL: OnceLock<Vec<(&str, Drawn)>> = OnceLock::new();
    ALL.get_or_init(|| NAMES.into_iter().map(|name| (name, named(name))).collect())
}

fn drawn(name: &str) -> &'static Drawn {
    &all().iter().find(|(n, _)| *n == name).unwrap().1
}

#[test]
fn pictures_are_those_that_were_looked_at() {
    for (name, width, height) in GOLDEN {
        is_golden(&format!("session-{name}-{width}.svg"), &drawn(name).at(width, height));
    }
}

#[test]
fn a_picture_holds_only_shapes_texts_and_their_attributes() {
    for (name, made) in all() {
        let options = SessionPlot { id_prefix: "shop-7".to_owned(), ..made.options.clone() };
        let svg = session_plot(&made.session, &made.uptake, &options);
        holds_only_shapes_and_texts(name, &svg, "shop-7-");
        numbers_are_finite_and_inside(&svg);
        assert_eq!(svg, session_plot(&made.session, &made.uptake, &options), "{name}: two pictures");
    }
    for bad in ["\" onload=\"x", "7up", "", "<g>", "ы"] {
        let made = drawn("held-twice");
        let options = SessionPlot { id_prefix: bad.to_owned(), ..made.options.clone() };
        let svg = session_plot(&made.session, &made.uptake, &options);
        let prefix: String = bad.chars().filter(char::is_ascii_alphanumeric).collect();
        let prefix =
            if prefix.starts_with(|c: char| c.is_ascii_alphabetic()) { prefix } else { "ebb".to_owned() };
        holds_only_shapes_and_texts(bad, &svg, &format!("{prefix}-"));
    }
}

#[test]
fn every_text_lies_inside_and_no_two_touch() {
    for (name, made) in all() {
        for (width, height) in SIZES {
            texts_stand_apart(name, &made.at(width, height));
        }
    }
}

/// PO2 at a height of the main panel, by the lines of floor and ceiling.
fn po2_at(svg: &str, limits: (f64, f64)) -> impl Fn(f64) -> f64 {
    let lines = paths(svg, "plot-limit");
    let (floor, ceiling) = (places(&lines[0])[0].1, places(&lines[1])[0].1);
    move |y| limits.0 + (y - floor) / (ceiling - floor) * (limits.1 - limits.0)
}

/// Second of the time column at an x, by the ends of the floor's line.
fn second_at(svg: &str, made: &Drawn) -> impl Fn(f64) -> f64 {
    let line = places(&paths(svg, "plot-limit")[0]);
    let times = &made.session.readings.time_s;
    let (first, last) = (times[0], times[times.len() - 1]);
    move |x| first + (x - line[0].0) / (line[1].0 - line[0].0) * (last - first)
}

#[test]
fn a_fitted_slope_spans_its_segment_and_passes_through_the_mean_of_its_bins() {
    let mut seen = 0;
    for (name, made) in all().iter().filter(|(name, _)| *name != "topped") {
        let svg = made.at(1600, 900);
        let limits = if made.session.place == Place::Couch { (0.40, 1.0) } else { (0.60, 1.3) };
        let (po2, second) = (po2_at(&svg, limits), second_at(&svg, made));
        let lines = paths(&svg, "plot-fits");
        assert_eq!(lines.len(), made.uptake.segments.len(), "{name}");
        for (line, segment) in lines.iter().zip(&made.uptake.segments) {
            let places = places(line);
            let (from, to) = (second(places[0].0), second(places[places.len() - 1].0));
            // A hundredth of a pixel is under a tenth of a second here.
            assert!(
                (from - segment.from_s).abs() < 0.1 && (to - segment.to_s).abs() < 0.1,
                "{name}: {from} to {to}"
            );
            let series = &made.uptake.series;
            let bins: Vec<f64> = series
                .time_s
                .iter()
                .zip(&series.po2_bar)
                .filter(|(t, _)| **t >= segment.from_s && **t <= segment.to_s)
                .map(|(_, p)| *p)
                .collect();
            let mean = bins.iter().sum::<f64>() / bins.len() as f64;
            let after = places.iter().position(|p| second(p.0) >= segment.middle_s).unwrap();
            let (a, b) = (places[after - 1], places[after]);
            let share = (segment.middle_s - second(a.0)) / (second(b.0) - second(a.0));
            let at_middle = po2(a.1 + share * (b.1 - a.1));
            // Held: the mean itself, and half a hundredth of a pixel is 1e-5 bar; a depth that comes and goes moves it by
            // a little more. Sealed: the mean of 1/(1 − f) is that of a curve.
            let tolerance = match segment.kind {
                Read::Sealed => 0.004,
                _ if made.session.readings.depth_m.is_some() => 0.002,
                _ => 0.000_1,
            };
            assert!((at_middle - mean).abs() < tolerance, "{name}: {at_middle} for {mean}");
            seen += 1;
        }
    }
    assert!(seen > 15, "{seen} segments");
}

#[test]
fn a_topped_bar_goes_from_the_level_at_the_beginning_to_that_at_the_end() {
    let made = drawn("topped");
    let svg = made.at(1600, 900);
    let po2 = po2_at(&svg, (0.40, 1.0));
    let bar = places(&paths(&svg, "plot-fits")[0]);
    let series = &made.uptake.series.po2_bar;
    // The levels are means over some readings and a line through a minute of them: within two of the last digits, 0.001
    // bar each, and the noise of 0.002 bar.
    assert!((po2(bar[0].1) - series[0]).abs() < 0.006, "{} for {}", po2(bar[0].1), series[0]);
    let last = series[series.len() - 1];
    assert!((po2(bar[1].1) - last).abs() < 0.006, "{} for {last}", po2(bar[1].1));
}

#[test]
fn segments_say_kind_injection_and_uptake() {
    for (name, count) in [("held-twice", 2), ("sealed-twice", 2), ("topped", 1)] {
        let made = drawn(name);
        let labels = of_class(&made.at(1600, 900), "plot-segment-label").join(" ");
        assert_eq!(made.uptake.segments.len(), count, "{name}");
        for segment in &made.uptake.segments {
            let uptake = segment.uptake_l_min.unwrap();
            for part in [
                segment.kind.name().to_owned(),
                format!("{:.3}", segment.injection_l_min),
                format!("uptake {:.2}", libm::floor(uptake * 100.0) / 100.0),
                " ± ".to_owned(),
                "L/min".to_owned(),
            ] {
                // A value ends where its uncertainty does: after more than two decimals.
                assert!(labels.contains(&part), "{name}: {part} in {labels}");
            }
        }
    }
    // Where there is no room for words over the spans, letters lead to them.
    let svg = drawn("pool").at(400, 320);
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(of_class(&svg, "plot-segment-label").is_empty());
    assert!(of_class(&svg, "plot-key").contains(&"A".to_owned()));
    assert!(legend.contains("held, injection 0.") && legend.contains("uptake"), "{legend}");
}

#[test]
fn the_margin_gives_the_number_or_says_why_there_is_none() {
    let made = drawn("held-twice");
    let svg = made.at(960, 640);
    let estimate = made.uptake.answer.as_ref().unwrap();
    let number = of_class(&svg, "plot-uptake").concat();
    assert!(
        number.starts_with(&format!("{:.3}", estimate.uptake_l_min)) && number.ends_with("L/min"),
        "{number}"
    );
    let interval = of_class(&svg, "plot-why").concat();
    assert!(
        interval.contains("95\u{a0}%: ")
            && interval.contains(&format!("{:.3}", estimate.interval_95.0).as_str()[..4])
    );
    let volume = of_class(&svg, "plot-volume").join(" ");
    assert!(
        volume.contains("Loop volume") && volume.contains("stated, and corrected by the slopes"),
        "{volume}"
    );
    assert!(of_class(&svg, "plot-who").concat().contains("couch, diver D-07"));
    let (title, description) = told(&svg);
    assert!(title.contains("S0001") && title.contains("D-07"), "{title}");
    for part in ["Resting oxygen uptake 0.", "Segments: 0:01:", "Events: 0:00:00 injection 0.", "dead time"] {
        assert!(description.contains(part), "{part} in {description}");
    }

    let svg = drawn("unmarked-jump").at(960, 640);
    assert_eq!(of_class(&svg, "plot-no-number"), ["No number"]);
    assert!(of_class(&svg, "plot-why").join(" ").contains("write the event down"));
    assert!(of_class(&svg, "plot-uptake").is_empty() && of_class(&svg, "plot-volume").is_empty());
    assert!(told(&svg).1.contains("No number: PO2 jumps by 0.09 bar"));
}

#[test]
fn an_unmarked_jump_has_a_mark_and_a_proposal() {
    let svg = drawn("unmarked-jump").at(960, 640);
    assert_eq!(of_class(&svg, "plot-jump-mark"), ["?"]);
    assert_eq!(of_class(&svg, "plot-jump-label"), ["+0.09 bar, oxygen added?"]);
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(
        legend.contains("unmarked jump 0:11:0") && legend.contains("not used: a jump no event"),
        "{legend}"
    );
    assert!(of_class(&svg, "plot-reason").contains(&"unmarked jump".to_owned()));
    for (name, made) in all().iter().filter(|(name, _)| !["unmarked-jump", "hostile-texts"].contains(name)) {
        assert!(of_class(&made.at(960, 640), "plot-jump-mark").is_empty(), "{name}");
    }
}

#[test]
fn stretches_left_out_are_hatched_with_their_reason() {
    let made = drawn("left-out");
    let svg = made.at(960, 640);
    let legend = of_class(&svg, "plot-legend").join("; ");
    for part in ["left out by a person", "scrubber warming up"] {
        assert!(legend.contains(part), "{part} in {legend}");
    }
    let labels = of_class(&svg, "plot-reason");
    assert!(labels.contains(&"warm-up".to_owned()) && labels.contains(&"left out".to_owned()), "{labels:?}");
    // Each stretch has its outline; one of them is that of the two minutes a person left out.
    let second = second_at(&svg, made);
    let outlines: Vec<(f64, f64)> = paths(&svg, "plot-left-out")
        .iter()
        .filter(|d| d.ends_with('Z'))
        .map(|d| (second(places(d)[0].0), second(places(d)[1].0)))
        .collect();
    let near = |a: f64, b: f64| (a - b).abs() < 0.1;
    assert!(outlines.iter().any(|(from, to)| near(*from, 660.0) && near(*to, 780.0)), "{outlines:?}");
    assert!(outlines.iter().any(|(from, to)| near(*from, 900.0) && near(*to, 930.0)), "{outlines:?}");
    // A topped loop is read at its ends, whatever is added between.
    assert!(!of_class(&drawn("topped").at(960, 640), "plot-legend").join(" ").contains("dead time"));
}

#[test]
fn events_are_told_in_words_then_numbers_then_counts() {
    let texts = |name: &str, class: &str| of_class(&drawn(name).at(960, 640), class);
    let labels = texts("sealed-twice", "plot-event-label").join("; ").replace('\u{a0}', " ");
    assert!(labels.contains("oxygen 0.900 L STPD") && labels.contains("injection 0.225 L/min"), "{labels}");
    assert!(texts("pool", "plot-event-label").contains(&"stop".to_owned()));
    let numbers = texts("some-events", "plot-event-label");
    assert!(numbers.contains(&"7".to_owned()) && numbers.len() == 13, "{numbers:?}");
    let key = texts("some-events", "plot-legend").join("; ").replace('\u{a0}', " ");
    assert!(!key.contains("not listed") && key.contains("0:08:50 diluent 0.250 L as read"), "{key}");
    assert!(texts("many-events", "plot-event-label").is_empty());
    let counts = texts("many-events", "plot-legend").join("; ");
    for part in ["injection changed (2)", "oxygen added (10)", "diluent added (10)", "loop vented (10)"] {
        assert!(counts.contains(part), "{part} in {counts}");
    }
}

#[test]
fn every_kind_of_event_has_an_upright_and_a_dash_of_its_own() {
    let svg = drawn("many-events").at(960, 640);
    let document = resvg::usvg::roxmltree::Document::parse(&svg).unwrap();
    let dashes: std::collections::HashSet<String> = document
        .descendants()
        .filter(|n| n.attribute("class") == Some("plot-upright"))
        .map(|n| n.attribute("stroke-dasharray").unwrap_or_default().to_owned())
        .collect();
    assert_eq!(dashes.len(), 5, "{dashes:?}");
    assert_eq!(paths(&svg, "plot-upright").len(), 42);
}

#[test]
fn a_cell_left_out_is_drawn_and_named() {
    let svg = drawn("pool").at(960, 640);
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(legend.contains("c2, left out: 0.08"), "{legend}");
    assert_eq!(paths(&svg, "plot-cell").len(), 3);
    // Nothing was read for two minutes: all lines are broken there.
    for line in paths(&svg, "plot-cell").iter().chain(&paths(&svg, "plot-series")) {
        assert!(line.matches('M').count() >= 2, "{line}");
    }
}

#[test]
fn cells_in_volts_are_drawn_where_the_same_cells_in_bar_are() {
    let bar = made(Kind::Held, 6, &Extra::default(), |_| {}).at(960, 640);
    let volts = drawn("volts").at(960, 640);
    let (bar, volts) = (paths(&bar, "plot-cell"), paths(&volts, "plot-cell"));
    assert_eq!(bar.len(), 3);
    for (bar, volts) in bar.iter().zip(&volts) {
        let (bar, volts) = (numbers(bar), numbers(volts));
        assert_eq!(bar.len(), volts.len());
        // A last digit of rounding.
        assert!(bar.iter().zip(&volts).all(|(a, b)| (a - b).abs() < 0.011));
    }
}

#[test]
fn the_injection_is_a_step_line_of_oxygen() {
    let made = drawn("held-twice");
    let svg = made.at(960, 640);
    let line = places(&paths(&svg, "plot-injection")[0]);
    let second = second_at(&svg, made);
    assert_eq!(line.len(), 4);
    assert!((second(line[1].0) - 960.0).abs() < 0.1 && (line[1].0 - line[2].0).abs() < 1e-9, "{line:?}");
    // Heights are in proportion, from nought at the foot of the strip.
    let foot = paths(&svg, "plot-axes").iter().flat_map(|d| places(d)).map(|p| p.1).fold(0.0, f64::max);
    let foot = foot - 0.42 * 12.0;
    let ratio = (foot - line[0].1) / (foot - line[3].1);
    let segments = &made.uptake.segments;
    let want = segments[0].injection_l_min / segments[1].injection_l_min;
    assert!((ratio - want).abs() < 0.01 * want, "{ratio} for {want}");
    // Without a change and without a depth there is no strip.
    assert!(paths(&drawn("sealed").at(960, 640), "plot-injection").is_empty());
    assert_eq!(paths(&drawn("pool").at(960, 640), "plot-depth").len(), 1);
}

#[test]
fn brick_is_only_for_what_is_dangerous() {
    for name in ["held-twice", "sealed-twice", "topped", "many-events", "left-out"] {
        assert!(!drawn(name).at(960, 640).contains("#B4442C"), "{name}");
    }
    let svg = drawn("passed-the-floor").at(960, 640);
    let passed = of_class(&svg, "plot-passed").join(" ");
    assert!(passed.contains("PO2 fell below the floor of 0.40 bar at 0:0"), "{passed}");
    assert_eq!(of_class(&svg, "plot-limit-label").len(), 2);
    assert!(svg.contains("#B4442C"));
}

#[test]
fn hostile_texts_are_shown_as_they_are_and_do_nothing() {
    let svg = drawn("hostile-texts").at(960, 640);
    assert_eq!(of_class(&svg, "plot-title"), ["../<&\"'>/ночь.toml"]);
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(
        legend.contains("<script>alert(\"&amp;\")</script>") && legend.contains("c2gnirts[31m <&\">"),
        "{legend}"
    );
    assert!(of_class(&svg, "plot-why").join(" ").contains("</text><g onload=\"x\">шланг отошёл <&\">"));
    for gone in ['\u{202e}', '\u{0}', '\u{1b}'] {
        assert!(!svg.contains(gone), "{gone:?}");
    }
}

#[test]
fn a_million_readings_make_a_file_no_larger_than_a_thousand_do() {
    let mut made = drawn("held-twice").clone();
    let rows = 1_000_000;
    let old = made.session.readings.clone();
    let last = old.time_s[old.time_s.len() - 1];
    let at = |i: usize| last * i as f64 / (rows - 1) as f64;
    let readings = &mut made.session.readings;
    readings.time_s = (0..rows).map(at).collect();
    for (cell, old) in readings.cells.iter_mut().zip(&old.cells) {
        let (CellSignal::Bar(new), CellSignal::Bar(old)) = (&mut cell.signal, &old.signal) else { panic!() };
        let noise = |i: usize| 0.004 * ((i * 7919 % 1013) as f64 / 1013.0 - 0.5);
        *new = (0..rows).map(|i| old[(at(i) / 5.0) as usize] + noise(i)).collect();
    }
    let CellSignal::Bar(first) = &mut readings.cells[0].signal else { panic!() };
    first[400_000] = 0.5;
    for (width, height) in [(960, 640), (8000, 4000)] {
        let svg = made.at(width, height);
        assert!(svg.len() < 150_000, "{} bytes at {width}", svg.len());
        let cells = paths(&svg, "plot-cell");
        assert!(cells.iter().all(|d| places(d).len() <= 1500));
        // The one low reading among a million is still there.
        let po2 = po2_at(&svg, (0.40, 1.0));
        let lowest = places(&cells[0]).iter().map(|p| po2(p.1)).fold(f64::MAX, f64::min);
        assert!((lowest - 0.5).abs() < 1e-3, "{lowest}");
    }
}

#[test]
fn units_change_flows_and_depths_and_never_po2() {
    let made = drawn("pool");
    let options = SessionPlot { units: units("psi,mL/min,ft"), ..made.options.clone() };
    let svg = session_plot(&made.session, &made.uptake, &options);
    let titles = of_class(&svg, "plot-axis-title").join("; ");
    for part in ["PO2, bar", "mL/min STPD", "depth (dotted), ft"] {
        assert!(titles.contains(part), "{part} in {titles}");
    }
    assert!(of_class(&svg, "plot-uptake").concat().ends_with("mL/min"));
    assert!(of_class(&svg, "plot-event-label").join(" ").replace('\u{a0}', " ").contains("mL/min"));
    let label = of_class(&svg, "plot-limit-label");
    assert!(label.contains(&"floor 0.60 bar (pool)".to_owned()), "{label:?}");
}

#[test]
fn sizes_beyond_reason_are_brought_back() {
    for (asked, got) in [((0, 0), (400, 320)), ((u32::MAX, 1), (8000, 320)), ((777, 555), (777, 555))] {
        let svg = drawn("held-twice").at(asked.0, asked.1);
        assert!(svg.contains(&format!("viewBox=\"0 0 {}.00 {}.00\"", got.0, got.1)), "{asked:?}");
    }
}

/// A number as a broken session could hold it.
fn any_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -2.0..2000.0f64,
        2 => 0.0..1.2f64,
        1 => prop_oneof![
            Just(0.0), Just(-0.0), Just(f64::NAN), Just(f64::INFINITY), Just(f64::NEG_INFINITY), Just(f64::MAX),
            Just(f64::MIN_POSITIVE), Just(1e-9), Just(1e11), Just(-1e11)
        ],
    ]
}

fn any_event() -> impl Strategy<Value = What> {
    prop_oneof![
        any_number().prop_map(flow),
        Just(What::Injection(Injection::Off)),
        any_number().prop_map(|bar| {
            let value = GaugePressure::from_bar(bar);
            What::Injection(Injection::Ip(Uncertain { value, expanded: None }))
        }),
        any_number().prop_map(|l| What::OxygenAdd(litres(l))),
        Just(What::DiluentAdd(None)),
        any_number().prop_map(|l| What::Vent(litres(l))),
        any_number().prop_map(|until_s| What::Exclude { until_s }),
        Just(What::Stop),
    ]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 128, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn whatever_the_numbers_the_picture_is_well_formed_and_finite(
        which in 0usize..NAMES.len(),
        times in prop::collection::vec(any_number(), 0..40),
        readings in prop::collection::vec(any_number(), 40),
        segment in prop::collection::vec(any_number(), 9),
        events in prop::collection::vec((any_number(), any_event()), 0..30),
        left_out in prop::collection::vec((any_number(), any_number()), 0..6),
        texts in (any::<String>(), any::<String>(), any::<String>()),
        size in (0u32..2500, 0u32..2500),
    ) {
        let mut made = all()[which].1.clone();
        let n = times.len();
        for (i, cell) in made.session.readings.cells.iter_mut().enumerate() {
            cell.signal = CellSignal::Bar(readings.iter().map(|p| p + 0.01 * i as f64).take(n).collect());
            cell.name.clone_from(&texts.0);
        }
        made.session.readings.time_s = times;
        made.session.readings.depth_m = Some(readings[..n / 2].to_vec());
        made.session.events.extend(events.iter().map(|(at_s, what)| Event { at_s: *at_s, what: *what }));
        made.uptake.series.po2_bar.iter_mut().zip(&readings).for_each(|(p, r)| *p = *r);
        for (i, s) in made.uptake.segments.iter_mut().enumerate() {
            let at = |j: usize| segment[(i + j) % 9];
            (s.from_s, s.to_s, s.level, s.middle_s) = (at(0), at(1), at(2), at(3));
            (s.slope_per_min, s.dry_bar, s.injection_l_min, s.uptake_l_min, s.u) =
                (at(4), at(5), at(6), Some(at(7)), at(8));
        }
        if let Ok(estimate) = &mut made.uptake.answer {
            (estimate.uptake_l_min, estimate.u, estimate.interval_95) = (segment[0], segment[1], (segment[2], segment[3]));
            (estimate.loop_volume.litres, estimate.loop_volume.u) = (segment[4], segment[5]);
        }
        made.options.left_out = left_out;
        (made.options.name, made.options.why_not) = (texts.1, Some(texts.2));
        numbers_are_finite_and_inside(&made.at(size.0, size.1));
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn texts_stand_apart_at_any_size_and_in_any_unit(
        which in 0usize..NAMES.len(),
        width in 400u32..2000,
        height in 320u32..1400,
        shown in prop_oneof![Just(""), Just("psi,ft"), Just("kPa,mL/min"), Just("hPa,ft³/h"), Just("psi,L/h")],
    ) {
        let (name, made) = &all()[which];
        let options = SessionPlot { units: units(shown), width, height, ..made.options.clone() };
        texts_stand_apart(&format!("{name} in \"{shown}\""), &session_plot(&made.session, &made.uptake, &options));
    }
}
