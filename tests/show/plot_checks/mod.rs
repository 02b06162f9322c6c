//! What every picture must hold to, whatever it is of.

#![allow(clippy::unwrap_used, reason = "a picture that does not parse is a failure")]
#![allow(dead_code, reason = "each test file uses its own part")]

use std::collections::HashSet;
use std::sync::{Arc, OnceLock};

use ebbline::quantity::Shown;
use ebbline::report::Units;
use resvg::usvg::{self, fontdb, roxmltree};

pub(crate) fn units(text: &str) -> Units {
    Units::new(Shown::parse(text).unwrap())
}

/// The picture with its texts set in the bundled font.
fn parsed(svg: &str) -> usvg::Tree {
    static FONTS: OnceLock<Arc<fontdb::Database>> = OnceLock::new();
    let fonts = FONTS.get_or_init(|| {
        let mut fonts = fontdb::Database::new();
        for face in [dejavu::sans::regular(), dejavu::sans::bold()] {
            fonts.load_font_source(fontdb::Source::Binary(Arc::new(face)));
        }
        Arc::new(fonts)
    });
    let options = usvg::Options { fontdb: fonts.clone(), ..usvg::Options::default() };
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

/// Fails unless every text of a picture lies inside it, has all its glyphs and touches no other.
pub(crate) fn texts_stand_apart(name: &str, svg: &str) {
    let tree = parsed(svg);
    let (width, height) = (tree.size().width(), tree.size().height());
    let texts = texts(tree.root());
    assert!(texts.len() > 8, "{name}: only {} texts", texts.len());
    let boxes: Vec<usvg::Rect> = texts.iter().map(|t| t.abs_bounding_box()).collect();
    for (i, (text, a)) in texts.iter().zip(&boxes).enumerate() {
        assert!(
            a.left() >= 0.0 && a.top() >= 0.0 && a.right() <= width && a.bottom() <= height,
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

/// Fails unless a picture is made of shapes, texts and presentation attributes, with ids under `prefix`.
pub(crate) fn holds_only_shapes_and_texts(name: &str, svg: &str, prefix: &str) {
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
    let document = roxmltree::Document::parse(svg).unwrap();
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
                assert!(value.starts_with(prefix) && ids.insert(value.to_owned()), "{name}: id {value}");
            }
        }
    }
    let root = document.root_element();
    assert_eq!(root.attribute("role"), Some("img"));
    let labels: Vec<&str> = root.attribute("aria-labelledby").unwrap().split(' ').collect();
    assert!(labels.len() == 2 && labels.iter().all(|l| ids.contains(*l)), "{name}: {labels:?} of {ids:?}");
}

/// Fails unless every number of a picture is one and lies in it, give or take the half of a stroke's end.
pub(crate) fn numbers_are_finite_and_inside(svg: &str) {
    let document = roxmltree::Document::parse(svg).unwrap();
    let side = |name: &str| document.root_element().attribute(name).unwrap().parse::<f64>().unwrap();
    let (w, h) = (side("width"), side("height"));
    for node in document.descendants() {
        for attribute in node.attributes() {
            let value = attribute.value();
            assert!(!value.contains("NaN") && !value.contains("inf"), "{value}");
            assert!(!value.contains("-0.00"), "{value}");
        }
        for (i, number) in numbers(node.attribute("d").unwrap_or_default()).into_iter().enumerate() {
            assert!(
                (-20.0..=w.max(h) + 20.0).contains(&number),
                "{number}, {i} of {:?}",
                node.attribute("d")
            );
        }
    }
}

/// The texts of all elements of a class.
pub(crate) fn of_class(svg: &str, class: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).unwrap();
    document
        .descendants()
        .filter(|n| n.attribute("class").is_some_and(|c| c.split(' ').any(|c| c == class)))
        .map(|n| n.descendants().filter_map(|d| if d.is_text() { d.text() } else { None }).collect())
        .collect()
}

/// The `d` of every path in all groups of a class, those of the legend left out.
pub(crate) fn paths(svg: &str, class: &str) -> Vec<String> {
    let document = roxmltree::Document::parse(svg).unwrap();
    document
        .descendants()
        .filter(|n| n.attribute("class") == Some(class))
        .filter(|n| !n.ancestors().any(|a| a.attribute("class") == Some("plot-margin")))
        .flat_map(|n| n.children().filter_map(|c| c.attribute("d").map(str::to_owned)).collect::<Vec<_>>())
        .collect()
}

/// The numbers of a `d`, in order.
pub(crate) fn numbers(d: &str) -> Vec<f64> {
    d.split(|c: char| c.is_ascii_alphabetic() || c == ' ')
        .filter(|s| !s.is_empty())
        .map(|s| s.parse().unwrap())
        .collect()
}

/// The places of a `d` made of strokes.
pub(crate) fn places(d: &str) -> Vec<(f64, f64)> {
    numbers(d).chunks(2).map(|pair| (pair[0], pair[1])).collect()
}

/// Middle of the outline of a `d` made of strokes.
pub(crate) fn middle(d: &str) -> (f64, f64) {
    let places = places(d);
    let ends = |of: &dyn Fn(&(f64, f64)) -> f64| {
        let values = || places.iter().map(of);
        0.5 * (values().fold(f64::MAX, f64::min) + values().fold(f64::MIN, f64::max))
    };
    (ends(&|p| p.0), ends(&|p| p.1))
}

/// Labels of ticks with their places.
pub(crate) fn tick_labels(svg: &str) -> Vec<(String, f64, f64)> {
    let document = roxmltree::Document::parse(svg).unwrap();
    let number = |n: &roxmltree::Node<'_, '_>, name: &str| n.attribute(name).unwrap().parse().unwrap();
    document
        .descendants()
        .filter(|n| n.attribute("class") == Some("plot-tick-label"))
        .map(|n| (n.text().unwrap().to_owned(), number(&n, "x"), number(&n, "y")))
        .collect()
}

/// The title and the description for readers who do not see the picture.
pub(crate) fn told(svg: &str) -> (String, String) {
    let document = roxmltree::Document::parse(svg).unwrap();
    let of = |tag: &str| {
        let node =
            document.root_element().children().find(|n| n.has_tag_name(("http://www.w3.org/2000/svg", tag)));
        node.unwrap().text().unwrap().to_owned()
    };
    (of("title"), of("desc"))
}

/// Compares with the golden picture of that name, or makes it one when EBBLINE_BLESS is 1.
pub(crate) fn is_golden(file: &str, svg: &str) {
    let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("fixtures/golden");
    let file = folder.join(file);
    if std::env::var_os("EBBLINE_BLESS").is_some_and(|v| v == "1") {
        std::fs::create_dir_all(&folder).unwrap();
        std::fs::write(&file, svg).unwrap();
    }
    let golden = std::fs::read_to_string(&file)
        .unwrap_or_else(|e| panic!("{}: {e}; look at the picture, then set EBBLINE_BLESS=1", file.display()));
    let first = golden.lines().zip(svg.lines()).position(|(a, b)| a != b);
    assert!(
        golden == svg,
        "{} is not the golden picture, first in line {:?}: look at it, then set EBBLINE_BLESS=1",
        file.display(),
        first.map(|i| i + 1)
    );
}
