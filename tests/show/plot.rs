//! The plot of a bench run, looked at from outside: as text, as XML, as measured texts, as pixels.

#![allow(clippy::unwrap_used)] // a picture that does not parse is a failure

use std::collections::HashSet;
use std::sync::{Arc, OnceLock};

use crate::plot_runs::{self, Made, analysed, up_and_down};
use ebbline::bench::{Analysis, WhyNot};
use ebbline::entry::{Run, Sweep};
use ebbline::plot::{RunPlot, run_plot};
use ebbline::quantity::Shown;
use ebbline::report::Units;
use ebbline::work::png;
use proptest::prelude::*;
use resvg::tiny_skia::Pixmap;
use resvg::usvg::{self, fontdb, roxmltree};

/// Golden pictures: run, width, height.
const GOLDEN: [(&str, u32, u32); 7] = [
    ("good", 960, 720),
    ("half-blocked", 480, 360),
    ("gauge-as-absolute", 600, 900),
    ("subsonic", 960, 720),
    ("five-points", 480, 360),
    ("helium", 1600, 1000),
    ("hostile-texts", 960, 720),
];

/// Sizes every run is measured at.
const SIZES: [(u32, u32); 5] = [(480, 360), (600, 900), (960, 720), (1600, 1000), (2000, 500)];

fn units(text: &str) -> Units {
    Units::new(Shown::parse(text).unwrap())
}

fn drawn(made: &Made, width: u32, height: u32) -> String {
    let (run, analysis) = analysed(made);
    run_plot(&run, &analysis, &sized(width, height))
}

fn sized(width: u32, height: u32) -> RunPlot {
    RunPlot { width, height, ..RunPlot::default() }
}

fn named(name: &str) -> Made {
    plot_runs::all().into_iter().find(|(n, _)| *n == name).unwrap().1
}

/// The picture as a program without our font data base would not see it: texts set in the bundled font.
fn parsed(svg: &str) -> usvg::Tree {
    let mut fonts = fontdb::Database::new();
    for face in [dejavu::sans::regular(), dejavu::sans::bold()] {
        fonts.load_font_source(fontdb::Source::Binary(Arc::new(face)));
    }
    let options = usvg::Options { fontdb: Arc::new(fonts), ..usvg::Options::default() };
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

/// The texts of all elements of a class.
fn of_class(svg: &str, class: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).unwrap();
    document
        .descendants()
        .filter(|n| n.attribute("class").is_some_and(|c| c.split(' ').any(|c| c == class)))
        .map(|n| n.descendants().filter_map(|d| if d.is_text() { d.text() } else { None }).collect())
        .collect()
}

#[test]
fn pictures_are_those_that_were_looked_at() {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/golden");
    let bless = std::env::var_os("EBBLINE_BLESS").is_some_and(|v| v == "1");
    for (name, width, height) in GOLDEN {
        let svg = drawn(&named(name), width, height);
        let file = folder.join(format!("run-{name}-{width}.svg"));
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
    let attributes: HashSet<&str> = [
        "id",
        "class",
        "width",
        "height",
        "viewBox",
        "version",
        "role",
        "aria-labelledby",
        "font-family",
        "font-size",
        "font-weight",
        "text-anchor",
        "fill",
        "fill-opacity",
        "stroke",
        "stroke-opacity",
        "stroke-width",
        "stroke-linecap",
        "stroke-linejoin",
        "stroke-dasharray",
        "x",
        "y",
        "d",
    ]
    .into();
    for (name, made) in plot_runs::all() {
        let (run, analysis) = analysed(&made);
        let options = RunPlot { id_prefix: "shop-7".to_owned(), ..RunPlot::default() };
        let svg = run_plot(&run, &analysis, &options);
        let document = roxmltree::Document::parse(&svg).unwrap();
        let mut ids = HashSet::new();
        for node in document.descendants().filter(roxmltree::Node::is_element) {
            assert!(elements.contains(node.tag_name().name()), "{name}: <{}>", node.tag_name().name());
            assert_eq!(node.tag_name().namespace(), Some("http://www.w3.org/2000/svg"), "{name}");
            for attribute in node.attributes() {
                assert!(attributes.contains(attribute.name()), "{name}: {}", attribute.name());
                assert_eq!(attribute.namespace(), None, "{name}: {}", attribute.name());
                let value = attribute.value();
                assert!(!value.contains("url(") && !value.contains("//"), "{name}: {value}");
                if attribute.name() == "id" {
                    assert!(
                        value.starts_with("shop-7-") && ids.insert(value.to_owned()),
                        "{name}: id {value}"
                    );
                }
            }
        }
        let root = document.root_element();
        assert_eq!(root.attribute("role"), Some("img"));
        let labels: Vec<&str> = root.attribute("aria-labelledby").unwrap().split(' ').collect();
        assert_eq!(labels.len(), 2);
        assert!(labels.iter().all(|l| ids.contains(*l)), "{name}: {labels:?} of {ids:?}");
        assert!(root.attribute("font-family").unwrap().starts_with("DejaVu Sans"));
    }
}

#[test]
fn an_id_prefix_that_could_break_out_is_tamed() {
    let (run, analysis) = analysed(&Made::default());
    for bad in ["\" onload=\"x", "7up", "", "<g>", "ы"] {
        let options = RunPlot { id_prefix: bad.to_owned(), ..RunPlot::default() };
        let svg = run_plot(&run, &analysis, &options);
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
fn hostile_texts_are_shown_as_they_are_and_do_nothing() {
    let svg = drawn(&named("hostile-texts"), 960, 720);
    let about = of_class(&svg, "plot-about").concat();
    assert!(about.contains("<script>alert(\"&amp;\")</script> Ж. О'Нил gnirts[31m <&\">"), "{about}");
    let legend = of_class(&svg, "plot-legend").join(" ");
    assert!(legend.contains("left out (2), first: <&\"> шланг отошёл"), "{legend}");
    for gone in ['\u{202e}', '\u{0}', '\u{1b}', '\u{fffe}'] {
        assert!(!svg.contains(gone), "{gone:?}");
    }
    // The second reason is only said to those who ask for it.
    assert!(
        svg.contains(
            "left out: &lt;/text&gt;&lt;image href=&quot;http://example.org/x.png&quot;/&gt;</title>"
        )
    );
    assert!(of_class(&svg, "plot-title").concat() == "Отверстие_ЖЩШЮжщшюЫы-Ünïté-12");
}

#[test]
fn every_text_lies_inside_and_no_two_touch() {
    let mut pictures: Vec<(String, String, (u32, u32))> = Vec::new();
    for (name, made) in plot_runs::all() {
        let (run, analysis) = analysed(&made);
        for (width, height) in SIZES {
            pictures.push((
                name.to_owned(),
                run_plot(&run, &analysis, &sized(width, height)),
                (width, height),
            ));
        }
    }
    let (run, analysis) = analysed(&named("subsonic"));
    for (width, height) in [(400, 320), (720, 320), (960, 720)] {
        let options = RunPlot { units: units("psi,mL/min"), ..sized(width, height) };
        let svg = run_plot(&run, &analysis, &options);
        pictures.push(("subsonic in psi and mL/min".to_owned(), svg, (width, height)));
    }
    for (name, svg, size) in &pictures {
        texts_stand_apart(name, svg, *size);
    }
}

/// Fails unless every text of a picture lies inside it, has all its glyphs and touches no other.
fn texts_stand_apart(name: &str, svg: &str, (width, height): (u32, u32)) {
    let tree = parsed(svg);
    let texts = texts(tree.root());
    assert!(texts.len() > 20, "{name}: only {} texts", texts.len());
    let boxes: Vec<usvg::Rect> = texts.iter().map(|t| t.abs_bounding_box()).collect();
    for (i, (text, a)) in texts.iter().zip(&boxes).enumerate() {
        assert!(
            a.left() >= 0.0 && a.top() >= 0.0 && a.right() <= width as f32 && a.bottom() <= height as f32,
            "{name} at {width} by {height}: \"{}\" leaves the picture: {a:?}",
            words(text)
        );
        for (other, b) in texts.iter().zip(&boxes).skip(i + 1) {
            // A hundredth of a pixel is rounding.
            let apart = a.right() <= b.left() + 0.01
                || b.right() <= a.left() + 0.01
                || a.bottom() <= b.top() + 0.01
                || b.bottom() <= a.top() + 0.01;
            assert!(
                apart,
                "{name} at {width} by {height}: \"{}\" touches \"{}\": {a:?} {b:?}",
                words(text),
                words(other)
            );
        }
        for glyph in text.layouted().iter().flat_map(|s| &s.positioned_glyphs) {
            assert!(glyph.id.0 != 0, "{name}: no glyph for {:?} in \"{}\"", glyph.text, words(text));
        }
    }
}

#[test]
fn the_description_tells_the_result() {
    let told = |name: &str| {
        let svg = drawn(&named(name), 960, 720);
        let document = roxmltree::Document::parse(&svg).unwrap();
        document.descendants().find(|n| n.has_tag_name("desc")).unwrap().text().unwrap().to_owned()
    };
    let good = told("good").replace('\u{a0}', " ");
    for part in [
        "Orifice CMF-0417, oxygen, 20 points in the line",
        "slope 0.0",
        "standard uncertainty",
        "Flow at 10 bar gauge: 0.4",
        " ± ",
        "Verdict: pass",
        "No point is left out",
    ] {
        assert!(good.contains(part), "{part} in {good}");
    }
    assert!(told("half-blocked").contains("Verdict: fail"));
    let subsonic = told("subsonic");
    assert!(subsonic.contains("because not choked: "), "{subsonic}");
    assert!(
        subsonic.contains("point 13 (hose touched while reading), point 17 (regulator crept)"),
        "{subsonic}"
    );
    assert!(told("no-acceptance").contains("Verdict: no verdict"));
    assert!(told("undecided").contains("Verdict: undecided"));
}

#[test]
fn the_legend_explains_what_is_there_and_nothing_else() {
    let legend =
        |name: &str| of_class(&drawn(&named(name), 960, 720), "plot-legend").join(" ").replace('\u{a0}', " ");
    let good = legend("good");
    for part in
        ["rising", "falling", "line, 95 % band", "acceptance: 0.48 L/min ± 5 %", "flow at 10 bar gauge"]
    {
        assert!(good.contains(part), "{part} in {good}");
    }
    for part in ["choked", "left out", "beyond the strip", "beyond the panel"] {
        assert!(!good.contains(part), "{part} in {good}");
    }
    assert!(!legend("no-acceptance").contains("acceptance"));
    let five = legend("five-points");
    assert!(five.starts_with("point ") && !five.contains("rising") && !five.contains("falling"), "{five}");
    let subsonic = legend("subsonic");
    for part in [
        "not choked, not in the line (",
        "left out (2), first: hose touched while reading",
        "beyond the strip",
    ] {
        assert!(subsonic.contains(part), "{part} in {subsonic}");
    }
    assert!(legend("limits-far-away").contains("acceptance: 48 L/min ± 5 %, beyond the panel"));
    assert!(legend("wild-point-left-out").contains("a point beyond the panel"));
}

#[test]
fn a_point_lost_by_far_is_an_arrow_with_its_residual() {
    let made = named("subsonic");
    let (run, analysis) = analysed(&made);
    let svg = run_plot(&run, &analysis, &RunPlot::default());
    let worst = analysis.points.iter().map(|p| p.residual_l_min).fold(0.0, f64::min);
    let percent = 100.0 * worst / analysis.nominal.flow.flow_l_min;
    let value = format!("\u{2212}{:.1}", percent.abs());
    assert!(of_class(&svg, "plot-value-beyond").contains(&value), "{value}");
}

/// First and last place of a path made of one stroke.
fn ends(d: &str) -> ((f64, f64), (f64, f64)) {
    let numbers: Vec<f64> =
        d.split(['M', 'L', ' ']).filter(|s| !s.is_empty()).map(|s| s.parse().unwrap()).collect();
    ((numbers[0], numbers[1]), (numbers[numbers.len() - 2], numbers[numbers.len() - 1]))
}

#[test]
fn the_line_is_whole_between_the_points_and_dashed_down_to_its_crossing() {
    let svg = drawn(&named("subsonic"), 960, 720);
    let document = roxmltree::Document::parse(&svg).unwrap();
    let class = |name: &str| {
        document
            .descendants()
            .filter(|n| n.attribute("class").is_some_and(|c| c.split(' ').any(|c| c == name)))
            .collect::<Vec<_>>()
    };
    let line = class("plot-line")[0];
    let strokes: Vec<roxmltree::Node> = line.children().filter(roxmltree::Node::is_element).collect();
    let whole = ends(strokes[0].attribute("d").unwrap());
    let dashed = strokes[1];
    assert_eq!(dashed.attribute("class"), Some("plot-line-beyond"));
    assert!(dashed.attribute("stroke-dasharray").is_some());
    let (foot, _) = ends(dashed.attribute("d").unwrap());
    // Triangles begin at their tip: the x of the outermost points of the line.
    let tips: Vec<f64> = ["plot-rising", "plot-falling"]
        .iter()
        .flat_map(|c| class(c).into_iter().take(1).flat_map(|g| g.children().collect::<Vec<_>>()))
        .filter_map(|n| n.attribute("d").map(|d| ends(d.split('L').next().unwrap()).0.0))
        .collect();
    let (low, high) = tips.iter().fold((f64::MAX, f64::MIN), |(a, b), x| (a.min(*x), b.max(*x)));
    assert!((whole.0.0 - low).abs() < 0.02 && (whole.1.0 - high).abs() < 0.02, "{whole:?} {low} {high}");
    // The lower axis of the main panel: no flow.
    let axis = of_class_attribute(&svg, "plot-axes", "d");
    let bottom: f64 = axis.split('L').nth(2).unwrap().split(' ').nth(1).unwrap().parse().unwrap();
    assert!((foot.1 - bottom).abs() < 0.02, "{foot:?} against {bottom}");
    assert!(foot.0 < low);
}

/// An attribute of the first child of the first group of a class.
fn of_class_attribute(svg: &str, class: &str, attribute: &str) -> String {
    let document = roxmltree::Document::parse(svg).unwrap();
    let group = document.descendants().find(|n| n.attribute("class") == Some(class)).unwrap();
    let child = group.children().find(roxmltree::Node::is_element).unwrap();
    child.attribute(attribute).unwrap().to_owned()
}

#[test]
fn units_change_numbers_and_titles_but_no_mark() {
    let (run, analysis) = analysed(&Made::default());
    let plain = run_plot(&run, &analysis, &RunPlot::default());
    let options = RunPlot { units: units("psi,mL/min"), ..RunPlot::default() };
    let other = run_plot(&run, &analysis, &options);
    let titles = of_class(&other, "plot-axis-title").join("; ");
    for part in ["mL/min STPD", "upstream pressure, psi absolute", "psi gauge at 14.6959 psi"] {
        assert!(titles.contains(part), "{part} in {titles}");
    }
    let flow = of_class(&other, "plot-flow").concat().replace('\u{a0}', " ");
    let expected = format!(
        "{:.1} ± {:.1} mL/min",
        1e3 * analysis.nominal.flow.flow_l_min,
        1e3 * analysis.nominal.flow.expanded()
    );
    assert_eq!(flow, expected);
    // The left margin may differ with the labels; heights may not.
    let heights = |svg: &str| -> Vec<String> {
        let d = of_class_attribute(svg, "plot-bars", "d");
        d.split(['M', 'L']).filter_map(|s| s.split(' ').nth(1).map(str::to_owned)).collect()
    };
    assert_eq!(heights(&plain), heights(&other));
}

#[test]
fn sizes_beyond_reason_are_brought_back() {
    let (run, analysis) = analysed(&Made::default());
    for (asked, got) in [((0, 0), (400, 320)), ((u32::MAX, 1), (8000, 320)), ((777, 555), (777, 555))] {
        let svg = run_plot(&run, &analysis, &sized(asked.0, asked.1));
        let expected = format!("viewBox=\"0 0 {}.00 {}.00\"", got.0, got.1);
        assert!(svg.contains(&expected), "{asked:?}");
    }
}

#[test]
fn two_hundred_points_have_smaller_signs_than_twenty() {
    let first = |made: &Made| {
        let svg = drawn(made, 960, 720);
        let document = roxmltree::Document::parse(&svg).unwrap();
        let rising =
            document.descendants().find(|n| n.attribute("class") == Some("plot-points plot-rising")).unwrap();
        let d = rising.children().find_map(|n| n.attribute("d")).unwrap();
        let x: Vec<f64> = d.split(['M', 'L']).filter_map(|s| s.split(' ').next()?.parse().ok()).collect();
        x.iter().fold(f64::MIN, |a, b| a.max(*b)) - x.iter().fold(f64::MAX, |a, b| a.min(*b))
    };
    let (few, many) = (first(&named("good")), first(&named("two-hundred-points")));
    assert!(many < 0.6 * few && many > 3.0, "{few} px and {many} px");
}

/// A picture as pixels on their ground.
fn painted(svg: &str, scale: f32) -> Pixmap {
    Pixmap::decode_png(&png::render(svg, scale).unwrap()).unwrap()
}

fn has_colour(picture: &Pixmap, (r, g, b): (u8, u8, u8)) -> bool {
    picture.pixels().iter().any(|p| (p.red(), p.green(), p.blue(), p.alpha()) == (r, g, b, 255))
}

#[test]
fn a_png_has_the_size_asked_for_the_paper_and_the_line() {
    let (run, analysis) = analysed(&named("half-blocked"));
    let svg = run_plot(&run, &analysis, &sized(480, 360));
    let picture = painted(&svg, 1.5);
    assert_eq!((picture.width(), picture.height()), (720, 540));
    // Paper, line, band, ink, and the brick of a verdict to be afraid of.
    for colour in [(0xFA, 0xF8, 0xF3), (0x0B, 0x6E, 0x7A), (0x1D, 0x2A, 0x33), (0xB4, 0x44, 0x2C)] {
        assert!(has_colour(&picture, colour), "{colour:02X?}");
    }
    assert_eq!(png::render(&svg, 1.5).unwrap(), png::render(&svg, 1.5).unwrap());

    let options = RunPlot { transparent: true, ..sized(480, 360) };
    let clear = painted(&run_plot(&run, &analysis, &options), 1.0);
    assert_eq!(clear.pixel(1, 1).unwrap().alpha(), 0);
    assert!(has_colour(&clear, (0x0B, 0x6E, 0x7A)));
}

#[test]
fn a_passing_run_shows_no_brick() {
    assert!(!drawn(&named("good"), 480, 360).contains("#B4442C"));
    assert!(drawn(&named("half-blocked"), 480, 360).contains("#B4442C"));
}

/// A number as broken analyses could hold it.
fn any_number() -> impl Strategy<Value = f64> {
    prop_oneof![
        4 => -2.0..20.0f64,
        1 => prop_oneof![
            Just(0.0), Just(-0.0), Just(f64::NAN), Just(f64::INFINITY), Just(f64::NEG_INFINITY), Just(f64::MAX),
            Just(f64::MIN_POSITIVE), Just(1e-9), Just(1e11), Just(-1e11)
        ],
    ]
}

fn any_reason() -> impl Strategy<Value = Option<WhyNot>> {
    prop_oneof![
        3 => Just(None),
        1 => Just(Some(WhyNot::NotChoked)),
        1 => any::<String>().prop_map(|s| Some(WhyNot::LeftOut(s))),
    ]
}

/// Pressure, flow, uncertainty, residual, why it is not used, sweep.
type AnyPoint = (f64, f64, f64, f64, Option<WhyNot>, u8);

/// An analysis whose points, line, flow and limits are whatever they are.
fn broken(points: &[AnyPoint], numbers: &[f64], technician: &str) -> (Run, Analysis) {
    static WHOLE: OnceLock<(Run, Analysis)> = OnceLock::new();
    let whole = WHOLE.get_or_init(|| analysed(&Made { ips: up_and_down(5.0, 9.0, 1.0), ..Made::default() }));
    let (mut run, mut analysis) = whole.clone();
    run.technician = Some(technician.to_owned());
    let pattern = analysis.points[0].clone();
    analysis.points = points
        .iter()
        .enumerate()
        .map(|(i, (p, q, u, residual, why, sweep))| {
            let mut point = pattern.clone();
            point.index = i + 1;
            (point.pressure_bar_abs, point.flow_l_min) = (*p, *q);
            (point.pressure_u, point.flow_u, point.residual_l_min) = (*u, u / 3.0, *residual);
            point.why_not = why.clone();
            point.sweep = [None, Some(Sweep::Rising), Some(Sweep::Falling)][usize::from(*sweep)];
            point
        })
        .collect();
    (analysis.line.random.intercept, analysis.line.random.slope) = (numbers[0], numbers[1]);
    (analysis.nominal.flow.p1_bar, analysis.nominal.flow.flow_l_min) = (numbers[2], numbers[3]);
    analysis.nominal.flow.standard_uncertainty = numbers[4];
    analysis.choke.interval_95 = (numbers[5], numbers[6]);
    if let Some(j) = &mut analysis.judgement {
        j.limits_l_min = (numbers[7], numbers[8]);
        j.probability = numbers[9];
    }
    (run, analysis)
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 256, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn whatever_the_numbers_the_picture_is_well_formed_and_finite(
        points in prop::collection::vec(
            (any_number(), any_number(), any_number(), any_number(), any_reason(), 0u8..3), 0..12,
        ),
        numbers in prop::collection::vec(any_number(), 10),
        technician in any::<String>(),
        width in 0u32..2500,
        height in 0u32..2500,
    ) {
        let (run, analysis) = broken(&points, &numbers, &technician);
        let svg = run_plot(&run, &analysis, &sized(width, height));
        let document = roxmltree::Document::parse(&svg).unwrap();
        let root = document.root_element();
        let (w, h): (f64, f64) =
            (root.attribute("width").unwrap().parse().unwrap(), root.attribute("height").unwrap().parse().unwrap());
        for node in document.descendants() {
            for attribute in node.attributes() {
                let value = attribute.value();
                prop_assert!(!value.contains("NaN") && !value.contains("inf"), "{}", value);
                prop_assert!(!value.contains("-0.00"), "{}", value);
            }
            if let Some(d) = node.attribute("d") {
                for number in d.split(|c: char| c.is_ascii_alphabetic() || c == ' ').filter(|s| !s.is_empty()) {
                    let number: f64 = number.parse().unwrap();
                    prop_assert!((-20.0..=w.max(h) + 20.0).contains(&number), "{} in {}", number, d);
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
    #![proptest_config(ProptestConfig { cases: 24, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn texts_stand_apart_at_any_size_and_in_any_unit(
        which in 0usize..14,
        width in 400u32..2000,
        height in 320u32..1400,
        shown in any_units(),
    ) {
        static RUNS: OnceLock<Vec<(&str, Run, Analysis)>> = OnceLock::new();
        let runs = RUNS.get_or_init(|| {
            let analyse = |(name, made): (&'static str, Made)| {
                let (run, analysis) = analysed(&made);
                (name, run, analysis)
            };
            plot_runs::all().into_iter().map(analyse).collect()
        });
        let (name, run, analysis) = &runs[which % runs.len()];
        let options = RunPlot { units: units(shown), ..sized(width, height) };
        let name = format!("{name} in \"{shown}\"");
        texts_stand_apart(&name, &run_plot(run, analysis, &options), (width, height));
    }
}
