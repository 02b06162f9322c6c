//! The plot of an orifice's history, looked at from outside: as text, as XML, as measured texts, as pixels.

#![allow(clippy::unwrap_used)] // a picture that does not parse is a failure

use std::collections::HashSet;
use std::sync::{Arc, OnceLock};

use crate::plot_histories::{self, Made, time};
use chrono::{DateTime, Duration, FixedOffset};
use ebbline::bench::Verdict;
use ebbline::entry::Purpose;
use ebbline::plot::{HistoryPlot, HistoryRun, Leaving, Trend, TrendPlace, history_plot};
use ebbline::quantity::Shown;
use ebbline::report::Units;
use ebbline::work::png;
use proptest::prelude::*;
use resvg::tiny_skia::Pixmap;
use resvg::usvg::{self, fontdb, roxmltree};

/// Golden pictures: history, width, height.
const GOLDEN: [(&str, u32, u32); 8] = [
    ("clogging", 960, 480),
    ("clogging", 480, 360),
    ("clogged", 1600, 800),
    ("two", 480, 360),
    ("forty", 960, 480),
    ("five-hundred", 960, 480),
    ("half-blocked", 480, 360),
    ("hostile-texts", 960, 480),
];

/// Sizes every history is measured at.
const SIZES: [(u32, u32); 7] =
    [(400, 320), (480, 360), (720, 320), (600, 900), (960, 480), (1600, 800), (2000, 500)];

fn units(text: &str) -> Units {
    Units::new(Shown::parse(text).unwrap())
}

fn sized(width: u32, height: u32) -> HistoryPlot {
    HistoryPlot { width, height, ..HistoryPlot::default() }
}

fn drawn(made: &Made, width: u32, height: u32) -> String {
    history_plot(&made.history(), &sized(width, height))
}

fn named(name: &str) -> Made {
    plot_histories::all().into_iter().find(|(n, _)| *n == name).unwrap().1
}

/// The picture as a program with no other font would see it: texts set in the bundled one.
fn parsed(svg: &str) -> usvg::Tree {
    static FONTS: OnceLock<Arc<fontdb::Database>> = OnceLock::new();
    let fonts = FONTS.get_or_init(|| {
        let mut fonts = fontdb::Database::new();
        for face in [dejavu::sans::regular(), dejavu::sans::bold()] {
            fonts.load_font_source(fontdb::Source::Binary(Arc::new(face)));
        }
        Arc::new(fonts)
    });
    let options = usvg::Options { fontdb: Arc::clone(fonts), ..usvg::Options::default() };
    usvg::Tree::from_str(svg, &options).unwrap()
}

fn texts(group: &usvg::Group) -> Vec<&usvg::Text> {
    group
        .children()
        .iter()
        .flat_map(|node| match node {
            usvg::Node::Group(g) => texts(g),
            usvg::Node::Text(t) => vec![&**t],
            _ => Vec::new(),
        })
        .collect()
}

fn words(text: &usvg::Text) -> String {
    text.chunks().iter().map(|c| c.text()).collect()
}

fn has_class(node: &roxmltree::Node, class: &str) -> bool {
    node.attribute("class").is_some_and(|c| c.split(' ').any(|c| c == class))
}

/// The texts of all elements of a class, with plain spaces.
fn of_class(svg: &str, class: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).unwrap();
    document
        .descendants()
        .filter(|n| has_class(n, class))
        .map(|n| {
            n.descendants().filter_map(|d| if d.is_text() { d.text() } else { None }).collect::<String>()
        })
        .map(|text| text.replace('\u{a0}', " "))
        .collect()
}

/// The `d` of the paths of the first group of a class; that is the panel's, as the legend is drawn later.
fn paths_of_class(svg: &str, class: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).unwrap();
    let group = document.descendants().find(|n| has_class(n, class));
    group
        .iter()
        .flat_map(|g| g.descendants().filter_map(|n| n.attribute("d")).map(str::to_owned).collect::<Vec<_>>())
        .collect()
}

/// The places a path goes through, arcs left out.
fn places(d: &str) -> Vec<(f64, f64)> {
    d.split(['M', 'L', 'Z'])
        .filter(|s| !s.is_empty() && !s.contains('A'))
        .map(|s| s.split_once(' ').unwrap())
        .map(|(x, y)| (x.parse().unwrap(), y.parse().unwrap()))
        .collect()
}

/// Left, top, right and bottom of the panel: the first stroke of the axes.
fn panel(svg: &str) -> (f64, f64, f64, f64) {
    let axes = paths_of_class(svg, "plot-axes");
    let corners = places(axes[0].split('Z').next().unwrap());
    (corners[0].0, corners[0].1, corners[2].0, corners[2].1)
}

#[test]
fn pictures_are_those_that_were_looked_at() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/golden");
    let bless = std::env::var_os("EBBLINE_BLESS").is_some_and(|v| v == "1");
    for (name, width, height) in GOLDEN {
        let svg = drawn(&named(name), width, height);
        let file = folder.join(format!("history-{name}-{width}.svg"));
        if bless {
            std::fs::create_dir_all(&folder).unwrap();
            std::fs::write(&file, &svg).unwrap();
        }
        let golden = std::fs::read_to_string(&file).unwrap_or_else(|e| {
            panic!("{}: {e}; look at the picture, then set EBBLINE_BLESS=1", file.display())
        });
        let first = golden.lines().zip(svg.lines()).position(|(a, b)| a != b);
        assert!(
            golden == svg,
            "{name} at {width} by {height} is not the golden picture, first in line {:?}: look at it, then set \
             EBBLINE_BLESS=1",
            first.map(|i| i + 1)
        );
    }
}

#[test]
fn a_picture_holds_only_shapes_texts_and_their_attributes() {
    let elements: HashSet<&str> = ["svg", "title", "desc", "g", "rect", "path", "text", "tspan"].into();
    let plain: HashSet<&str> = "id class width height viewBox version role aria-labelledby font-family font-size \
        font-weight text-anchor fill fill-opacity stroke stroke-opacity stroke-width stroke-linecap stroke-linejoin \
        stroke-dasharray x y d"
        .split_whitespace()
        .collect();
    for (name, made) in plot_histories::all() {
        let options = HistoryPlot { id_prefix: "shop-7".to_owned(), ..HistoryPlot::default() };
        let svg = history_plot(&made.history(), &options);
        let document = roxmltree::Document::parse(&svg).unwrap();
        let mut ids = HashSet::new();
        for node in document.descendants().filter(roxmltree::Node::is_element) {
            assert!(elements.contains(node.tag_name().name()), "{name}: <{}>", node.tag_name().name());
            assert_eq!(node.tag_name().namespace(), Some("http://www.w3.org/2000/svg"), "{name}");
            for attribute in node.attributes() {
                assert!(plain.contains(attribute.name()), "{name}: {}", attribute.name());
                let value = attribute.value();
                assert!(!value.contains("url(") && !value.contains("//"), "{name}: {value}");
                if attribute.name() == "id" {
                    assert!(value.starts_with("shop-7-") && ids.insert(value.to_owned()), "{name}: {value}");
                }
            }
        }
        let root = document.root_element();
        assert_eq!(root.attribute("role"), Some("img"));
        let labels: Vec<&str> = root.attribute("aria-labelledby").unwrap().split(' ').collect();
        assert!(
            labels.len() == 2 && labels.iter().all(|l| ids.contains(*l)),
            "{name}: {labels:?} of {ids:?}"
        );
    }
}

#[test]
fn an_id_prefix_that_could_break_out_is_tamed() {
    for bad in ["\" onload=\"x", "7up", "", "<g>", "ы"] {
        let options = HistoryPlot { id_prefix: bad.to_owned(), ..HistoryPlot::default() };
        let svg = history_plot(&named("one").history(), &options);
        let document = roxmltree::Document::parse(&svg).unwrap();
        for node in document.descendants() {
            assert!(node.attribute("onload").is_none());
            let valid = |id: &str| id.chars().all(|c| c.is_ascii_alphanumeric() || c == '-' || c == '_');
            let starts = |id: &str| id.starts_with(|c: char| c.is_ascii_alphabetic());
            assert!(node.attribute("id").is_none_or(|id| valid(id) && starts(id)), "{bad}");
        }
    }
}

#[test]
fn hostile_names_are_shown_as_they_are_and_do_nothing() {
    let svg = drawn(&named("hostile-texts"), 960, 480);
    assert_eq!(of_class(&svg, "plot-title"), ["Отверстие_ЖЩШЮжщшюЫы-Ünïté-12<&\">"]);
    assert!(of_class(&svg, "plot-latest").concat().starts_with("]]>, check"));
    let head = of_class(&svg, "plot-change-head").join(" ");
    assert!(head.contains("nobody would ever give one, <&\">"), "{head}");
    assert!(
        svg.contains(
            "<title>&lt;script&gt;alert(&quot;&amp;amp;&quot;)&lt;/script&gt;, acceptance, 2024-11-"
        )
    );
    for gone in ['\u{202e}', '\u{0}', '\u{1b}'] {
        assert!(!svg.contains(gone), "{gone:?}");
    }
}

#[test]
fn every_text_lies_inside_and_no_two_touch() {
    for (name, made) in plot_histories::all() {
        for (width, height) in SIZES {
            texts_stand_apart(name, &drawn(&made, width, height), (width, height));
        }
        for (width, height) in [(400, 320), (960, 480)] {
            let options = HistoryPlot { units: units("psi,mL/min"), ..sized(width, height) };
            let name = format!("{name} in psi and mL/min");
            texts_stand_apart(&name, &history_plot(&made.history(), &options), (width, height));
        }
    }
}

/// Checks that each text lies within the picture, touches no other, and has a glyph for each of its characters.
fn texts_stand_apart(name: &str, svg: &str, (width, height): (u32, u32)) {
    let tree = parsed(svg);
    let texts = texts(tree.root());
    assert!(texts.len() >= 4, "{name}");
    let boxes: Vec<usvg::Rect> = texts.iter().map(|t| t.abs_bounding_box()).collect();
    for (i, (text, b)) in texts.iter().zip(&boxes).enumerate() {
        let inside =
            b.left() >= 0.0 && b.top() >= 0.0 && b.right() <= width as f32 && b.bottom() <= height as f32;
        assert!(inside, "{name} at {width} by {height}: \"{}\" leaves the picture: {b:?}", words(text));
        for (other, b2) in texts.iter().zip(&boxes).skip(i + 1) {
            // A hundredth of a pixel is rounding.
            let apart = b.right() <= b2.left() + 0.01
                || b2.right() <= b.left() + 0.01
                || b.bottom() <= b2.top() + 0.01
                || b2.bottom() <= b.top() + 0.01;
            let pair = (words(text), words(other));
            assert!(apart, "{name} at {width} by {height}: {pair:?} touch: {b:?} {b2:?}");
        }
        for glyph in text.layouted().iter().flat_map(|s| &s.positioned_glyphs) {
            assert!(glyph.id.0 != 0, "{name}: no glyph for {:?} in \"{}\"", glyph.text, words(text));
        }
    }
}

#[test]
fn words_in_the_panel_stand_on_no_mark() {
    for (name, made) in plot_histories::all() {
        for (width, height) in SIZES {
            let svg = drawn(&made, width, height);
            let mut marks: Vec<(f64, f64)> = Vec::new();
            for class in ["plot-pass", "plot-fail", "plot-undecided", "plot-no-verdict", "plot-changed"] {
                marks.extend(paths_of_class(&svg, class).iter().flat_map(|d| places(d)));
            }
            for class in ["plot-bars", "plot-limits", "plot-line"] {
                for d in paths_of_class(&svg, class) {
                    for stroke in d.split('M').filter(|s| !s.is_empty()) {
                        let ends = places(&format!("M{stroke}"));
                        for pair in ends.windows(2) {
                            let along = |i: u32| f64::from(i) / 200.0;
                            marks.extend((0..=200).map(|i| {
                                (
                                    pair[0].0 + (pair[1].0 - pair[0].0) * along(i),
                                    pair[0].1 + (pair[1].1 - pair[0].1) * along(i),
                                )
                            }));
                        }
                    }
                }
            }
            let tree = parsed(&svg);
            let (left, top, right, bottom) = panel(&svg);
            for text in texts(tree.root()) {
                let b = text.abs_bounding_box();
                let (l, t, r, u) =
                    (f64::from(b.left()), f64::from(b.top()), f64::from(b.right()), f64::from(b.bottom()));
                if l < left || r > right || t < top || u > bottom {
                    continue;
                }
                let hit = marks.iter().find(|(x, y)| *x > l && *x < r && *y > t && *y < u);
                assert!(hit.is_none(), "{name} at {width}: \"{}\" stands on {hit:?}", words(text));
            }
        }
    }
}

#[test]
fn nothing_of_the_panel_leaves_its_frame() {
    for (name, made) in plot_histories::all() {
        for (width, height) in SIZES {
            let svg = drawn(&made, width, height);
            let (left, top, right, bottom) = panel(&svg);
            for class in
                ["plot-band", "plot-band-beyond", "plot-line", "plot-limits", "plot-bars", "plot-leaving"]
            {
                for (x, y) in paths_of_class(&svg, class).iter().flat_map(|d| places(d)) {
                    let inside =
                        x >= left - 0.02 && x <= right + 0.02 && y >= top - 0.02 && y <= bottom + 0.02;
                    // The legend draws the same classes, in the margin; there the panel has none.
                    let legend = x > right + 10.0 || y > bottom + 25.0;
                    assert!(inside || legend, "{name} at {width}: {class} at {x}, {y}");
                }
            }
        }
    }
}

#[test]
fn each_verdict_has_its_own_shape() {
    let mut made = named("five");
    let verdicts = [Verdict::Pass, Verdict::Undecided, Verdict::Fail, Verdict::None, Verdict::Pass];
    made.runs.iter_mut().zip(verdicts).for_each(|(run, verdict)| run.verdict = verdict);
    let svg = drawn(&made, 960, 480);
    let document = roxmltree::Document::parse(&svg).unwrap();
    let mut shapes = HashSet::new();
    for (class, runs) in [("plot-pass", 2), ("plot-undecided", 1), ("plot-fail", 1), ("plot-no-verdict", 1)] {
        let group = document.descendants().find(|n| has_class(n, class)).unwrap();
        let told = group.descendants().filter(|n| n.has_tag_name("title")).count();
        assert_eq!(told, runs, "{class}");
        let path = group.children().find(roxmltree::Node::is_element).unwrap();
        let steps: String = path.attribute("d").unwrap().chars().filter(char::is_ascii_alphabetic).collect();
        // Shape and filling, without any colour.
        let ink = group.attribute("fill") == Some("#1D2A33");
        let parts = group.children().filter(roxmltree::Node::is_element).count() / runs;
        assert!(shapes.insert((steps, ink, parts)), "{class} looks like another");
    }
    let legend = of_class(&svg, "plot-legend");
    for word in ["not judged", "pass", "undecided", "fail"] {
        assert!(legend.iter().any(|l| l == word), "{word} in {legend:?}");
    }
}

#[test]
fn a_change_beyond_the_uncertainties_is_ringed_and_said_in_brick() {
    let svg = drawn(&named("two"), 960, 480);
    assert_eq!(of_class(&svg, "plot-en"), ["E_n \u{2212}1.3"]);
    assert_eq!(of_class(&svg, "plot-change"), ["\u{2212}1.6 %, E_n \u{2212}1.3"]);
    assert_eq!(paths_of_class(&svg, "plot-changed").len(), 1);
    let document = roxmltree::Document::parse(&svg).unwrap();
    for class in ["plot-en", "plot-change"] {
        let text = document.descendants().find(|n| has_class(n, class)).unwrap();
        assert_eq!(text.attribute("fill"), Some("#B4442C"), "{class}");
    }
    // An E_n of 1 is within: the limit is what may not be passed.
    let mut within = named("two");
    within.runs[1].en = Some(-1.0);
    let svg = drawn(&within, 960, 480);
    assert!(of_class(&svg, "plot-en").is_empty() && !svg.contains("#B4442C"));
    assert_eq!(of_class(&svg, "plot-change"), ["\u{2212}1.6 %, E_n \u{2212}1.00"]);
}

#[test]
fn a_run_that_changed_is_ringed_even_where_no_word_has_room() {
    let made = named("much-changed");
    let changed = made.runs.iter().filter(|r| r.en.is_some_and(|en| en.abs() > 1.0)).count();
    let svg = drawn(&made, 480, 360);
    // The legend's own ring is in a group of its own.
    assert_eq!(paths_of_class(&svg, "plot-changed").len(), changed);
    assert!(of_class(&svg, "plot-en").len() < changed);
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(legend.contains(&format!("|E_n| over 1 to the run before ({changed})")), "{legend}");
}

#[test]
fn the_margin_says_trend_leaving_and_what_is_not_drawn() {
    let made = named("clogging");
    let svg = drawn(&made, 960, 480);
    let trend = made.trend.as_ref().unwrap();
    let expected = format!(
        "\u{2212}{:.2} ± {:.2} % a year",
        100.0 * trend.per_year_share.abs(),
        100.0 * trend.per_year_expanded
    );
    assert_eq!(of_class(&svg, "plot-trend"), [expected]);
    let leaving = trend.leaves.unwrap();
    let month = |t: DateTime<FixedOffset>| t.format("%Y-%m").to_string();
    let about = format!("leaves the limits about {}", month(leaving.about));
    assert_eq!(of_class(&svg, "plot-leaves"), std::slice::from_ref(&about));
    assert_eq!(of_class(&svg, "plot-leaving-label"), [about]);
    assert_eq!(
        of_class(&svg, "plot-not-before"),
        [format!("95 %: not before {}", month(leaving.not_before.unwrap()))]
    );
    let not_drawn = of_class(&svg, "plot-not-drawn").join(" ");
    assert_eq!(not_drawn, "2 runs in another gas or at another pressure are not drawn");
    // A trend that is over: the limits were left before the latest run.
    let mut over = made;
    over.trend.as_mut().unwrap().leaves =
        Some(Leaving { about: time("2026-03-01T00:00:00Z"), not_before: None });
    let svg = drawn(&over, 960, 480);
    assert_eq!(of_class(&svg, "plot-leaves"), ["left the limits about 2026-03"]);
}

#[test]
fn the_trend_is_whole_between_its_runs_dashed_beyond_and_ends_on_the_limit() {
    let svg = drawn(&named("clogging"), 960, 480);
    let line = paths_of_class(&svg, "plot-line");
    let (whole, dashed) = (places(&line[0]), places(&line[1]));
    assert_eq!(line.len(), 2);
    assert!((whole[1].0 - dashed[0].0).abs() < 0.02 && (whole[1].1 - dashed[0].1).abs() < 0.02);
    // The last run of the trend is the latest: its bar stands where the whole line ends.
    let bars = places(&paths_of_class(&svg, "plot-bars")[0]);
    let last_bar = bars.iter().map(|p| p.0).fold(f64::MIN, f64::max);
    assert!((whole[1].0 - last_bar).abs() < 4.0, "{whole:?} {last_bar}");
    // It ends where dotted stroke and lower limit meet.
    let stroke = places(&paths_of_class(&svg, "plot-leaving")[0]);
    let ahead = places(&paths_of_class(&svg, "plot-limits")[1]);
    let lower = ahead.iter().map(|p| p.1).fold(f64::MIN, f64::max);
    assert!((dashed[1].0 - stroke[0].0).abs() < 0.1, "{dashed:?} {stroke:?}");
    assert!((dashed[1].1 - lower).abs() < 0.1, "{dashed:?} {lower}");
}

#[test]
fn limits_are_joined_only_between_runs_judged_by_the_same() {
    let count = |made: &Made| paths_of_class(&drawn(made, 960, 480), "plot-limits")[0].matches('M').count();
    let mut made = named("five");
    assert_eq!(count(&made), 2);
    // Another upper limit from the fourth run on: nobody knows since when.
    for run in &mut made.runs[3..] {
        run.limits_l_min = Some((0.456, 0.500));
    }
    assert_eq!(count(&made), 3);
    made.runs[1].limits_l_min = None;
    assert_eq!(count(&made), 5);
    // Hours apart there is no room for a gap: a step.
    let mut close = named("same-day");
    close.runs[1].limits_l_min = Some((0.460, 0.500));
    close.runs[1].taken = close.runs[0].taken + Duration::minutes(20);
    assert_eq!(count(&close), 2);
}

#[test]
fn the_limits_beside_the_panel_are_the_latest() {
    let svg = drawn(&named("forty"), 960, 480);
    assert_eq!(of_class(&svg, "plot-limit"), ["0.4944", "0.4656"]);
    let svg = drawn(&named("limits-far-away"), 960, 480);
    assert!(of_class(&svg, "plot-limit").is_empty());
    assert!(of_class(&svg, "plot-legend").contains(&"a limit beyond the panel".to_owned()));
    assert!(of_class(&svg, "plot-flow-detail").contains(&"limits 4.56 to 5.04 L/min".to_owned()));
    assert!(of_class(&drawn(&named("not-judged"), 960, 480), "plot-limit").is_empty());
}

#[test]
fn dates_spread_from_days_to_decades() {
    let labels = |name: &str| {
        let svg = drawn(&named(name), 960, 480);
        (of_class(&svg, "plot-tick-label"), of_class(&svg, "plot-period"))
    };
    let has = |labels: &[String], wanted: &[&str]| wanted.iter().all(|w| labels.iter().any(|l| l == w));
    let (days, month) = labels("same-week");
    assert!(has(&days, &["7", "8", "9", "10", "11", "12"]) && month == ["2023-02"], "{days:?} {month:?}");
    let (months, years) = labels("clogging");
    assert!(has(&months, &["Jan", "Jul"]) && has(&years, &["2025", "2026", "2027"]), "{months:?} {years:?}");
    let (years, none) = labels("five-hundred");
    assert!(has(&years, &["1990", "2000", "2010", "2020"]) && none.is_empty(), "{years:?}");
}

#[test]
fn runs_are_drawn_in_the_order_of_their_dates_whatever_the_order_they_come_in() {
    let made = named("clogging");
    let mut mixed = made.clone();
    mixed.runs.rotate_left(5);
    mixed.runs.swap(0, 3);
    assert_eq!(drawn(&made, 960, 480), drawn(&mixed, 960, 480));
}

#[test]
fn numbers_that_cannot_be_drawn_are_counted_and_said() {
    let svg = drawn(&named("odd-numbers"), 960, 480);
    let told = of_class(&svg, "plot-not-drawn").join("; ");
    assert_eq!(told, "1 run has no flow that can be drawn; 1 run has no uncertainty to draw");
    let svg = drawn(&named("none"), 480, 360);
    assert_eq!(of_class(&svg, "plot-verdict"), ["No run"]);
    assert_eq!(of_class(&svg, "plot-latest"), ["no accepted run of oxygen at 10 bar gauge"]);
    assert!(of_class(&svg, "plot-tick-label").is_empty());
}

#[test]
fn the_description_tells_the_result() {
    let svg = drawn(&named("clogged"), 480, 360);
    let document = roxmltree::Document::parse(&svg).unwrap();
    let told = document.descendants().find(|n| n.has_tag_name("desc")).unwrap().text().unwrap();
    let told = told.replace('\u{a0}', " ");
    for part in [
        "Orifice CMF-0417, oxygen at 10 bar gauge, 14 runs",
        "Latest: R0103, check, 2027-01-17: 0.4512 ± 0.0038 L/min STPD (95 %), verdict: fail, limits 0.456 to 0.504",
        "Against R0096, 2026-11-01: \u{2212}1.2 %, E_n \u{2212}2.3.",
        "|E_n| over 1 to the run before: R0068 on 2026-02-25 (E_n \u{2212}2.7), ",
        "Trend since 2025-12-25 (7 runs): \u{2212}6.",
    ] {
        assert!(told.contains(part), "{part} in {told}");
    }
}

#[test]
fn units_change_numbers_but_no_mark() {
    let made = named("clogging");
    let options = HistoryPlot { units: units("psi,mL/min"), ..HistoryPlot::default() };
    let (plain, other) = (drawn(&made, 960, 480), history_plot(&made.history(), &options));
    assert_eq!(of_class(&other, "plot-axis-title"), ["flow of oxygen at 145 psi gauge, mL/min STPD"]);
    assert_eq!(of_class(&other, "plot-limit"), ["504", "456"]);
    assert_eq!(of_class(&plain, "plot-flow"), ["0.4709 ± 0.0040 L/min"]);
    assert_eq!(of_class(&other, "plot-flow"), ["470.9 ± 4.0 mL/min"]);
    assert_eq!(of_class(&plain, "plot-trend"), of_class(&other, "plot-trend"));
    let heights = |svg: &str| -> Vec<f64> {
        places(&paths_of_class(svg, "plot-bars")[0]).iter().map(|p| p.1).collect()
    };
    for (a, b) in heights(&plain).iter().zip(heights(&other)) {
        assert!((a - b).abs() < 0.02, "{a} {b}");
    }
}

#[test]
fn a_run_says_itself_when_pointed_at() {
    let svg = drawn(&named("two"), 960, 480);
    let told =
        "R0019, check, 2026-11-12: 0.4775 ± 0.0041 L/min STPD; pass; E_n \u{2212}1.3 to the run before";
    assert!(svg.contains(&format!("<title>{told}</title>")), "{svg}");
}

/// A picture as pixels on their ground.
fn painted(svg: &str) -> Pixmap {
    Pixmap::decode_png(&png::render(svg, 1.0).unwrap()).unwrap()
}

#[test]
fn brick_is_kept_for_what_is_dangerous_and_the_ground_can_be_left_out() {
    assert!(!drawn(&named("five"), 480, 360).contains("#B4442C"));
    assert!(drawn(&named("clogged"), 480, 360).contains("#B4442C"));
    let options = HistoryPlot { transparent: true, ..sized(480, 360) };
    let clear = painted(&history_plot(&named("clogged").history(), &options));
    assert_eq!(clear.pixel(1, 1).unwrap().alpha(), 0);
    let paper = painted(&drawn(&named("clogged"), 480, 360)).pixel(1, 1).unwrap();
    assert_eq!((paper.red(), paper.green(), paper.blue()), (0xFA, 0xF8, 0xF3));
}

#[test]
fn sizes_beyond_reason_are_brought_back() {
    for (asked, got) in [((0, 0), (400, 320)), ((u32::MAX, 1), (8000, 320)), ((777, 555), (777, 555))] {
        let svg = drawn(&named("clogging"), asked.0, asked.1);
        let expected = format!("viewBox=\"0 0 {}.00 {}.00\"", got.0, got.1);
        assert!(svg.contains(&expected), "{asked:?}");
    }
}

/// A number as a broken record could hold it.
fn any_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -0.2..1.5f64,
        1 => prop_oneof![
            Just(0.0), Just(-0.0), Just(f64::NAN), Just(f64::INFINITY), Just(f64::NEG_INFINITY), Just(f64::MAX),
            Just(f64::MIN_POSITIVE), Just(1e-9), Just(1e11), Just(-1e11)
        ],
    ]
}

/// A date, mostly of our time, and the ends of the calendar.
fn any_date() -> impl Strategy<Value = DateTime<FixedOffset>> {
    let offset = |seconds| FixedOffset::east_opt(seconds).unwrap();
    prop_oneof![
        6 => (0i64..40_000_000, -50_000i32..50_000)
            .prop_map(move |(m, o)| (time("1960-01-01T00:00:00Z") + Duration::minutes(m)).with_timezone(&offset(o))),
        1 => prop_oneof![
            Just(DateTime::<chrono::Utc>::MIN_UTC.with_timezone(&offset(-50_000))),
            Just(DateTime::<chrono::Utc>::MAX_UTC.with_timezone(&offset(50_000))),
            Just(time("0001-01-01T00:00:00Z")),
        ],
    ]
}

fn any_run() -> impl Strategy<Value = HistoryRun> {
    let limits = prop_oneof![Just(None), (any_number(), any_number()).prop_map(Some)];
    let en = prop_oneof![Just(None), (any_number().prop_map(|x| Some(4.0 * x)))];
    let kind = (0usize..4, 0usize..4);
    (any::<String>(), any_date(), any_number(), any_number(), limits, en, kind).prop_map(
        |(name, taken, flow, expanded, limits, en, (verdict, purpose))| HistoryRun {
            name,
            taken,
            flow_l_min: flow,
            expanded_l_min: expanded,
            limits_l_min: limits,
            verdict: [Verdict::Pass, Verdict::Fail, Verdict::Undecided, Verdict::None][verdict],
            en,
            purpose: [Purpose::Acceptance, Purpose::AsFound, Purpose::AsLeft, Purpose::Check][purpose],
        },
    )
}

fn any_trend() -> impl Strategy<Value = Trend> {
    let line = prop::collection::vec((any_date(), any_number(), any_number()), 0..5);
    (any_date(), any_date(), any_number(), any_number(), line, prop::option::of(any_date())).prop_map(
        |(from, to, share, expanded, line, about)| Trend {
            runs: line.len(),
            from,
            to,
            per_year_share: share,
            per_year_expanded: expanded,
            line: line
                .into_iter()
                .map(|(at, flow_l_min, expanded_l_min)| TrendPlace { at, flow_l_min, expanded_l_min })
                .collect(),
            leaves: about.map(|about| Leaving { about, not_before: Some(from) }),
        },
    )
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 256, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn whatever_the_numbers_the_picture_is_well_formed_and_finite(
        runs in prop::collection::vec(any_run(), 0..12),
        trend in prop::option::of(any_trend()),
        orifice in any::<String>(),
        ip_bar in any_number(),
        width in 0u32..2500,
        height in 0u32..2500,
    ) {
        let made = Made { orifice, gas: ebbline::gas::Species::Air, ip_bar, runs, left_out: 0, trend };
        let svg = drawn(&made, width, height);
        let document = roxmltree::Document::parse(&svg).unwrap();
        let root = document.root_element();
        let side = |name| root.attribute(name).unwrap().parse::<f64>().unwrap();
        let longest = side("width").max(side("height"));
        for node in document.descendants() {
            for attribute in node.attributes() {
                let value = attribute.value();
                prop_assert!(!value.contains("NaN") && !value.contains("inf"), "{}", value);
                prop_assert!(!value.contains("-0.00"), "{}", value);
            }
            if let Some(d) = node.attribute("d") {
                for number in d.split(|c: char| c.is_ascii_alphabetic() || c == ' ').filter(|s| !s.is_empty()) {
                    let number: f64 = number.parse().unwrap();
                    prop_assert!((-20.0..=longest + 20.0).contains(&number), "{} in {}", number, d);
                }
            }
        }
    }
}

/// Units, wider and narrower than the usual ones.
fn any_units() -> impl Strategy<Value = &'static str> {
    prop_oneof![Just(""), Just("psi"), Just("kPa,mL/min"), Just("hPa,ft³/h"), Just("psi,L/h")]
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 48, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn texts_stand_apart_at_any_size_and_in_any_unit(
        which in 0usize..16,
        width in 400u32..2000,
        height in 320u32..1400,
        shown in any_units(),
    ) {
        static HISTORIES: OnceLock<Vec<(&str, Made)>> = OnceLock::new();
        let histories = HISTORIES.get_or_init(plot_histories::all);
        let (name, made) = &histories[which % histories.len()];
        let options = HistoryPlot { units: units(shown), ..sized(width, height) };
        texts_stand_apart(&format!("{name} in \"{shown}\""), &history_plot(&made.history(), &options), (width, height));
    }
}
