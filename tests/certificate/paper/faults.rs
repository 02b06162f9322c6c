//! What cannot be set is refused, all of it at once, in words that say where.

use ebbline::certificate::paper::*;

use super::samples::{LOGO_SVG, bare, certificate, letterhead, moment, pair, points};
use super::{set, written};

/// What stands in the way, in words.
fn refused(document: &Document) -> Vec<String> {
    render(document).err().unwrap_or_default().iter().map(ToString::to_string).collect()
}

fn refused_for(block: Block) -> Vec<String> {
    refused(&bare(vec![block]))
}

#[test]
fn a_character_the_font_lacks_is_named_with_its_place() {
    let table = Table {
        caption: None,
        columns: vec![Column::new("item", Align::Left), Column::new("remark", Align::Left)],
        rows: vec![Row::new(["a", "b"]), Row::new(["c", "流量 ok"])],
        row_heads: false,
    };
    assert_eq!(
        refused(&bare(vec![
            Block::Paragraph("fine".into()),
            Block::Paragraph(Text::plain("no \u{1F9EA} here").and_bold("\u{1F9EA}")),
            Block::Table(table),
            Block::Pairs { pairs: vec![pair("Name", "한글")], two_columns: false },
        ])),
        [
            "paragraph 2: the font has no “\u{1F9EA}” (U+1F9EA): write it in other letters",
            "table 1, row 2, column “remark”: the font has no “流” (U+6D41): write it in other letters",
            "table 1, row 2, column “remark”: the font has no “量” (U+91CF): write it in other letters",
            "the value of “Name”: the font has no “한” (U+D55C): write it in other letters",
            "the value of “Name”: the font has no “글” (U+AE00): write it in other letters",
        ]
    );
    assert_eq!(faults("Ωμέγα"), []);
    assert_eq!(faults("流"), [Fault::Missing('流')]);
}

#[test]
fn characters_that_mislead_are_refused_by_name() {
    for (text, says) in [
        ("a\u{202E}b", "the right-to-left override (U+202E)"),
        ("a\u{2066}b", "the left-to-right isolate (U+2066)"),
        ("a\tb", "a tab (U+0009)"),
        ("a\nb", "a line break (U+000A)"),
        ("a\u{1B}[2J", "a control character (U+001B)"),
        ("a\u{200B}b", "an invisible character (U+200B)"),
        ("שלום", "written from right to left"),
        ("\u{E001}", "U+E001, which is no character"),
        ("z\u{300}\u{300}\u{300}\u{300}\u{300}", "heaps more than 3 marks"),
    ] {
        let words = refused_for(Block::Heading(Level::Two, text.to_owned()));
        assert!(words[0].starts_with("heading 1: ") && words[0].contains(says), "{words:?}");
    }
}

#[test]
fn every_place_of_a_document_is_looked_at() {
    // A character that is refused, put into each text in turn.
    let bad = "\u{7}";
    let text = || Text::plain(bad);
    let with = |change: &dyn Fn(&mut Document)| {
        let mut document = Document { letterhead: Some(letterhead()), ..bare(Vec::new()) };
        change(&mut document);
        document
    };
    let table = |change: &dyn Fn(&mut Table)| {
        let mut table = points(2);
        change(&mut table);
        Block::Table(table)
    };
    let figure = |alt: &str, caption: Option<Text>| {
        Block::Figure(Figure { svg: LOGO_SVG.to_owned(), alt: alt.to_owned(), caption, width: 0.5 })
    };
    let notice =
        |label: &str, text: Text| Block::Notice(Notice { label: label.to_owned(), paragraphs: vec![text] });
    let sign = |role: &str, name: &str, detail: &str| {
        Block::Signatures(vec![Signature {
            role: role.to_owned(),
            name: Some(name.to_owned()),
            details: vec![detail.to_owned()],
        }])
    };
    let verdict = Verdict { standing: Standing::Holds, words: text() };
    let attached = |description: &str| Attachment {
        name: "a.csv".to_owned(),
        mime_type: "text/csv".to_owned(),
        relationship: Relationship::Data,
        description: description.to_owned(),
        bytes: vec![1],
        modified: moment(),
    };
    let documents = [
        with(&|d| d.title = bad.to_owned()),
        with(&|d| d.author = Some(bad.to_owned())),
        with(&|d| d.producer = bad.to_owned()),
        with(&|d| d.running_head = bad.to_owned()),
        with(&|d| d.end = bad.to_owned()),
        with(&|d| d.letterhead.as_mut().unwrap().name = bad.to_owned()),
        with(&|d| d.letterhead.as_mut().unwrap().address.push(bad.to_owned())),
        with(&|d| d.letterhead.as_mut().unwrap().logo.as_mut().unwrap().alt = bad.to_owned()),
        with(&|d| d.attachments = vec![attached(bad)]),
        bare(vec![Block::Paragraph(text())]),
        bare(vec![Block::FinePrint(text())]),
        bare(vec![Block::List(vec![text()])]),
        bare(vec![Block::Pairs { pairs: vec![pair(bad, "")], two_columns: false }]),
        bare(vec![Block::Pairs { pairs: vec![pair("", bad)], two_columns: true }]),
        bare(vec![table(&|t| t.caption = Some(text()))]),
        bare(vec![table(&|t| t.columns[1].head = bad.to_owned())]),
        bare(vec![table(&|t| t.columns[1].unit = Some(bad.to_owned()))]),
        bare(vec![table(&|t| t.rows[1].cells[2] = text())]),
        bare(vec![figure(bad, None)]),
        bare(vec![figure("a", Some(text()))]),
        bare(vec![notice(bad, "".into())]),
        bare(vec![notice("Caution", text())]),
        bare(vec![Block::Sentence(Sentence { statement: text(), verdict: None })]),
        bare(vec![Block::Sentence(Sentence { statement: "".into(), verdict: Some(verdict) })]),
        bare(vec![sign(bad, "", "")]),
        bare(vec![sign("", bad, "")]),
        bare(vec![sign("", "", bad)]),
        bare(vec![Block::Together(vec![Block::WithNext(Box::new(Block::Paragraph(text())))])]),
    ];
    for (i, document) in documents.iter().enumerate() {
        let words = refused(document);
        assert!(
            words.iter().any(|w| w.ends_with("holds a control character (U+0007): take it out")),
            "{i}: {words:?}"
        );
    }
}

#[test]
fn all_problems_are_told_at_once() {
    let document = Document {
        title: " ".to_owned(),
        language: "English!".to_owned(),
        accent: Some("sea green".to_owned()),
        letterhead: Some(Letterhead {
            logo: Some(Logo { bytes: b"GIF89a".to_vec(), alt: String::new() }),
            ..letterhead()
        }),
        blocks: vec![
            Block::Heading(Level::One, String::new()),
            Block::Table(Table { rows: vec![Row::new(["one"])], ..points(1) }),
            Block::Table(Table { caption: None, columns: vec![], rows: vec![], row_heads: false }),
            Block::Figure(Figure {
                svg: "<svg".to_owned(),
                alt: " ".to_owned(),
                caption: None,
                width: f32::NAN,
            }),
        ],
        attachments: ["../etc/passwd", "x.csv", "x.csv"]
            .iter()
            .map(|name| Attachment {
                name: (*name).to_owned(),
                mime_type: if *name == "x.csv" { "csv" } else { "text/csv" }.to_owned(),
                relationship: Relationship::Source,
                description: "d".to_owned(),
                bytes: Vec::new(),
                modified: moment(),
            })
            .collect(),
        ..bare(Vec::new())
    };
    let words = refused(&document);
    let begin = [
        "the language “English!” is no tag",
        "the title is empty",
        "the accent colour “sea green” is not of the form #0B6E7A",
        "what the logo shows (its alternative text) is empty",
        "the logo: the picture is neither a PNG nor an SVG file",
        "heading 1 is empty",
        "table 1, row 1 has 1 cells, and its table 6 columns",
        "table 2 is empty",
        "what figure 1 shows (its alternative text) is empty",
        "figure 1 asks for NaN times the width",
        "figure 1: the picture cannot be read",
        "the attachment name “../etc/passwd” is not made of letters",
        "attachment x.csv: “csv” is no MIME type",
        "two attachments are named x.csv",
        "attachment x.csv: “csv” is no MIME type",
    ];
    assert_eq!(words.len(), begin.len(), "{words:#?}");
    for (word, begin) in words.iter().zip(begin) {
        assert!(word.starts_with(begin), "{word} / {begin}");
    }
}

#[test]
fn a_table_too_wide_says_by_how_much() {
    let columns: Vec<Column> = (0..24).map(|i| Column::numbers(format!("c{i}"), "bar")).collect();
    let rows = vec![Row::new((0..24).map(|i| format!("{i}.12345")))];
    let table = Table { caption: None, columns, rows, row_heads: false };
    let words = refused_for(Block::Table(table));
    let [word] = words.as_slice() else { panic!("{words:?}") };
    let numbers: Vec<f32> = word.split(' ').filter_map(|w| w.parse().ok()).collect();
    assert!(word.starts_with("table 1 needs ") && numbers[1] > numbers[2], "{word}");
    // The paper gives 595.276 pt less two margins of 66 pt, 163 mm.
    assert!((numbers[2] - 163.0).abs() < 0.5, "{word}");
}

fn figure(svg: &str) -> Block {
    Block::Figure(Figure { svg: svg.to_owned(), alt: "a drawing".to_owned(), caption: None, width: 1.0 })
}

#[test]
fn letters_that_would_vanish_are_counted() {
    let svg = |text: &str| {
        format!("<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"90\" height=\"40\">{text}</svg>")
    };
    let words = refused_for(figure(&svg(
        "<text y=\"9\" font-family=\"DejaVu Sans\">stays</text><text y=\"30\" font-family=\"Papyrus\">goes away</text>",
    )));
    assert_eq!(
        words,
        [
            "figure 1: 8 of 13 letters of the drawing would vanish, from “goes away” on: set its texts in DejaVu Sans, or turn \
          them into paths"
        ]
    );
    let words = refused_for(figure(&svg("<text y=\"9\">流</text>")));
    assert_eq!(
        words,
        ["figure 1: a text of the drawing: the font has no “流” (U+6D41): write it in other letters"]
    );
    for (inside, says) in [
        ("<image href=\"a.png\" width=\"4\" height=\"4\"/>", "a picture of pixels"),
        (
            "<filter id=\"f\"><feGaussianBlur stdDeviation=\"2\"/></filter><rect width=\"9\" height=\"9\" filter=\"url(#f)\"/>",
            "a filter effect",
        ),
        ("<text y=\"9\">a\u{202E}b</text>", "the right-to-left override"),
    ] {
        let words = refused_for(figure(&svg(inside)));
        assert!(words.len() == 1 && words[0].contains(says), "{inside}: {words:?}");
    }
    assert_eq!(
        refused_for(figure(&svg(
            "<title>流</title><text y=\"9\">a<tspan font-weight=\"bold\">b</tspan></text>"
        ))),
        [""; 0]
    );
}

/// A PNG of one colour.
fn png(width: u32, height: u32) -> Vec<u8> {
    let mut pixels = resvg::tiny_skia::Pixmap::new(width, height).unwrap();
    pixels.fill(resvg::tiny_skia::Color::from_rgba8(11, 110, 122, 128));
    pixels.encode_png().unwrap()
}

fn with_logo(bytes: Vec<u8>) -> Document {
    let logo = Some(Logo { bytes, alt: "sign".to_owned() });
    Document {
        letterhead: Some(Letterhead { logo, ..letterhead() }),
        ..bare(vec![Block::Paragraph("text".into())])
    }
}

#[test]
fn a_logo_of_any_size_finds_its_box() {
    for (width, height) in [(1, 1), (3000, 2), (2, 3000), (2600, 1900)] {
        let document = with_logo(png(width, height));
        let bytes = set(&document);
        assert!(bytes.len() < 400_000, "{width} by {height}: {} bytes", bytes.len());
        assert!(bytes == set(&document));
    }
    written("logo", &with_logo(png(400, 300)));
    for svg in ["0 0 1 1000000", "0 0 1000000 1", "0 0 0.001 0.001"] {
        let svg = format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"{svg}\"><path d=\"M0 0h9v9z\"/></svg>"
        );
        set(&with_logo(svg.into_bytes()));
    }
}

#[test]
fn a_logo_that_cannot_be_read_is_refused() {
    let whole = png(30, 20);
    let mut vast = whole.clone();
    vast[16..20].copy_from_slice(&100_000_u32.to_be_bytes());
    vast[20..24].copy_from_slice(&100_000_u32.to_be_bytes());
    let mut nothing = whole.clone();
    nothing[16..20].copy_from_slice(&0_u32.to_be_bytes());
    let svg = |size: &str| format!("<svg xmlns=\"http://www.w3.org/2000/svg\" {size}/>").into_bytes();
    // Each group twice the one before it: a picture of 2⁴⁰ rectangles.
    let groups: String = (1..40)
        .map(|i| format!("<g id=\"g{i}\"><use href=\"#g{0}\"/><use href=\"#g{0}\"/></g>", i - 1))
        .collect();
    let endless = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"9\" height=\"9\"><g id=\"g0\"><rect width=\"1\" height=\"1\"/></g>{groups}</svg>"
    );
    for (bytes, says) in [
        (endless.into_bytes(), "it repeats itself without end"),
        (Vec::new(), "neither a PNG nor an SVG"),
        (b"\xFF\xD8\xFF\xE0".to_vec(), "neither a PNG nor an SVG"),
        (whole[..20].to_vec(), "cannot be read (its head is cut off)"),
        (whole[..whole.len() / 2].to_vec(), "cannot be read"),
        (nothing, "cannot be read"),
        (vast, "has 100000 by 100000 pixels, over 25 million"),
        (svg("width=\"0\" height=\"5\""), "cannot be read"),
        (svg("viewBox=\"0 0 -1 5\" width=\"-3\""), "cannot be read"),
        (b"<html></html>".to_vec(), "cannot be read"),
        (b"<!DOCTYPE svg [<!ENTITY a \"aaaa\"><!ENTITY b \"&a;&a;\">]><svg>&b;".to_vec(), "cannot be read"),
    ] {
        let words = refused(&with_logo(bytes));
        assert!(
            words.len() == 1 && words[0].starts_with("the logo: ") && words[0].contains(says),
            "{says}: {words:?}"
        );
    }
}

#[test]
fn a_running_head_fills_its_line_and_no_more() {
    let with = |paper, letters| Document { running_head: "N".repeat(letters), paper, ..bare(Vec::new()) };
    for (paper, fits, does_not) in [(Paper::A4, 45, 90), (Paper::A5, 30, 60)] {
        set(&with(paper, fits));
        let words = refused(&with(paper, does_not));
        assert!(
            words.len() == 1 && words[0].starts_with("the running head is longer than a line"),
            "{words:?}"
        );
    }
}

#[test]
fn a_drawing_that_pdf_a_forbids_is_told() {
    let clips: String = (0..40)
        .map(|i| format!("<clipPath id=\"c{i}\"><rect width=\"{}\" height=\"9\"/></clipPath>", 99 - i))
        .collect();
    let groups: String = (0..40).map(|i| format!("<g clip-path=\"url(#c{i})\">")).collect();
    let ends = "</g>".repeat(40);
    let deep = format!(
        "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"99\" height=\"9\">{clips}{groups}<rect width=\"5\" height=\"5\"/>{ends}</svg>"
    );
    let words = refused(&with_logo(deep.into_bytes()));
    assert!(words.iter().any(|w| w.contains("groups inside one another")), "{words:?}");
    let turning = "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"99\" height=\"9\"><linearGradient id=\"g\" x2=\"0.1\" \
        spreadMethod=\"repeat\"><stop stop-color=\"red\"/><stop offset=\"1\" stop-color=\"blue\"/></linearGradient><rect width=\"99\" \
        height=\"9\" fill=\"url(#g)\"/></svg>";
    let words = refused(&with_logo(turning.into()));
    assert_eq!(words.len(), 1, "{words:?}");
    assert!(words[0].contains("a colour that repeats or turns, which PDF/A does not allow"), "{words:?}");
}

#[test]
fn the_accent_is_a_colour_and_nothing_else() {
    for accent in ["#0B6E7A", "#ffffff", "#000000"] {
        set(&Document { accent: Some(accent.to_owned()), ..certificate() });
    }
    for accent in ["", "#", "#12345", "#1234567", "0B6E7A", "#0B6E7G", "#+12345", "red\u{202E}"] {
        let words = refused(&Document { accent: Some(accent.to_owned()), ..bare(Vec::new()) });
        assert!(words.len() == 1 && words[0].contains("six hexadecimal digits"), "{accent}: {words:?}");
        assert!(!words[0].contains('\u{202E}'));
    }
}
