//! Every sample as other programs see it.

use ebbline::certificate::paper::*;

use super::samples::{bare, certificate, names, on, pair, points};
use super::tools::{ask, letters};
use super::{set, written};

/// Every text of a document, in the order of its blocks; a strip of a text is what has to be found.
fn texts(blocks: &[Block]) -> Vec<String> {
    let mut texts = Vec::new();
    for block in blocks {
        match block {
            Block::Heading(_, text) => texts.push(text.clone()),
            Block::Paragraph(text) | Block::FinePrint(text) => texts.push(text.characters()),
            Block::List(points) => texts.extend(points.iter().map(Text::characters)),
            Block::Pairs { pairs, .. } => {
                texts.extend(pairs.iter().flat_map(|pair| [pair.key.clone(), pair.value.characters()]));
            }
            Block::Table(table) => {
                texts.extend(table.caption.iter().map(Text::characters));
                texts.extend(
                    table.columns.iter().flat_map(|c| [c.head.clone(), c.unit.clone().unwrap_or_default()]),
                );
                texts.extend(table.rows.iter().flat_map(|row| row.cells.iter().map(Text::characters)));
            }
            Block::Figure(figure) => texts.extend(figure.caption.iter().map(Text::characters)),
            Block::Notice(notice) => {
                texts.push(notice.label.clone());
                texts.extend(notice.paragraphs.iter().map(Text::characters));
            }
            Block::Sentence(sentence) => {
                texts.push(sentence.statement.characters());
                texts.extend(sentence.verdict.iter().map(|verdict| verdict.words.characters()));
            }
            Block::Signatures(signatures) => texts.extend(signatures.iter().flat_map(|signature| {
                [signature.role.clone(), signature.name.clone().unwrap_or_default()]
                    .into_iter()
                    .chain(signature.details.clone())
            })),
            Block::Together(blocks) => texts.extend(self::texts(blocks)),
            Block::WithNext(block) => texts.extend(self::texts(std::slice::from_ref(block))),
            Block::PageBreak => {}
        }
    }
    texts
}

fn samples() -> Vec<(&'static str, Document)> {
    let rows = |count| {
        bare(vec![
            Block::Heading(Level::Two, format!("{count} rows")),
            Block::Table(points(count)),
            Block::Paragraph("What follows the table.".into()),
        ])
    };
    vec![
        ("certificate", certificate()),
        ("letter", on(Paper::Letter)),
        ("a5", on(Paper::A5)),
        ("names", names()),
        ("names-a5", Document { paper: Paper::A5, ..names() }),
        ("rows-40", rows(40)),
        ("rows-400", rows(400)),
        ("empty", bare(Vec::new())),
    ]
}

/// Whether the letters stand in `all` in pieces of at least `piece` letters each, one after another: a text that goes on
/// to the next page, or is a cell cut between its lines, has other text in between.
fn stands_in(all: &str, text: &str, piece: usize) -> bool {
    let wanted: Vec<char> = text.chars().collect();
    wanted.chunks(piece.max(1)).all(|part| all.contains(&part.iter().collect::<String>()))
}

#[test]
fn every_text_is_found_again_by_another_program() {
    for (name, document) in samples() {
        let path = written(name, &document);
        // In the order of painting.
        let Some(found) = ask("pdftotext", &["-raw"], &path, &["-"]) else { return };
        let found = letters(&found);
        let mut wanted = texts(&document.blocks);
        wanted.extend([document.running_head.clone(), document.end.clone()]);
        if let Some(letterhead) = &document.letterhead {
            wanted.push(letterhead.name.clone());
            wanted.extend(letterhead.address.clone());
        }
        assert!(wanted.len() > 1);
        for text in wanted {
            let text = letters(&text);
            // A dozen letters stand on one line of every column there is.
            let piece = if text.chars().count() > 300 { 2 } else { text.chars().count() };
            assert!(found.contains(&text) || stands_in(&found, &text, piece.min(12)), "{name}: {text:.60}");
        }
        if name == "names" {
            assert!(
                found.matches("Ab\u{308}c\u{327}").count() + found.matches("Ab\u{308}ç").count() > 4_000,
                "{name}"
            );
        }
    }
}

#[test]
fn the_texts_of_a_drawing_are_texts() {
    let path = written("certificate", &certificate());
    let Some(found) = ask("pdftotext", &["-raw", "-l", "1"], &path, &["-"]) else { return };
    for text in ["upstream pressure, bar absolute", "acceptance: 0.48 L/min", "residual (flow less line)"] {
        assert!(letters(&found).contains(&letters(text)), "{text} in {found}");
    }
}

#[test]
fn other_programs_find_nothing_amiss() {
    for (name, document) in samples() {
        let path = written(name, &document);
        if let Some(said) = ask("qpdf", &["--check"], &path, &[]) {
            assert!(said.contains("No syntax or stream encoding errors found"), "{name}: {said}");
        }
        if let Some(said) = ask("pdffonts", &[], &path, &[]) {
            let fonts: Vec<&str> = said.lines().skip(2).collect();
            assert!(!fonts.is_empty());
            for font in fonts {
                // Columns: embedded, subset, with a map to Unicode.
                assert!(font.contains("yes yes yes") && font.contains("+DejaVuSans"), "{name}: {font}");
            }
        }
        if let Some(said) = ask("pdfinfo", &[], &path, &[]) {
            assert!(said.lines().any(|l| l.starts_with("Tagged:") && l.ends_with("yes")), "{name}: {said}");
            assert!(said.contains(&format!("Title:           {}", document.title)), "{said}");
            let size = match document.paper {
                Paper::A4 => "(A4)",
                Paper::A5 => "(A5)",
                Paper::Letter => "(letter)",
            };
            assert!(
                size == "(A5)" && said.contains("419.528 x 595.276") || said.contains(size),
                "{name}: {said}"
            );
        }
        if let Some(said) = ask("pdfdetach", &["-list"], &path, &[]) {
            assert!(said.starts_with(&format!("{} embedded files", document.attachments.len())), "{said}");
            for attachment in &document.attachments {
                assert!(said.contains(&attachment.name), "{said}");
            }
        }
    }
}

#[test]
fn reading_aloud_follows_the_blocks() {
    let path = written("certificate", &certificate());
    let Some(said) = ask("pdfinfo", &["-struct-text"], &path, &[]) else { return };
    let at = |what: &str| said.find(what).unwrap_or_else(|| panic!("{what} in {said}"));
    assert!(at("H1 \"Calibration certificate\"") < said.rfind("Figure").unwrap());
    assert!(at("H2 \"The line\"") < at("THead"));
    for kind in ["H3 \"Equipment\"", "TH (block)", "TD (block)", "Caption", "LBody", "L (block)"] {
        let kind = kind.trim_end_matches(" (block)");
        at(kind);
    }
    // The head of a table that goes on is read once.
    assert_eq!(said.matches("\"residual\"").count(), 1, "{said}");
}

#[test]
fn the_same_document_is_the_same_bytes() {
    for (name, document) in samples() {
        if name != "rows-400" {
            assert!(set(&document) == set(&document), "{name}");
        }
    }
    let other = Document { running_head: "EB-2026-0018".to_owned(), ..certificate() };
    assert!(set(&other) != set(&certificate()));
}

/// A word with the box it stands in: left, top, right, bottom, word.
type Word = (f32, f32, f32, f32, String);

/// The words of each page.
fn boxes(name: &str, document: &Document) -> Option<Vec<Vec<Word>>> {
    let path = written(name, document);
    let said = ask("pdftotext", &["-bbox"], &path, &["-"])?;
    let number = |line: &str, key: &str| -> f32 {
        let from = line.find(&format!("{key}=\"")).unwrap() + key.len() + 2;
        line[from..].split('"').next().unwrap().parse().unwrap()
    };
    let mut pages = Vec::new();
    for line in said.lines().map(str::trim) {
        if line.starts_with("<page ") {
            pages.push(Vec::new());
        } else if line.starts_with("<word ") {
            let word = line.split('>').nth(1).unwrap().trim_end_matches("</word").to_owned();
            let [left, top, right, bottom] = ["xMin", "yMin", "xMax", "yMax"].map(|key| number(line, key));
            pages.last_mut().unwrap().push((left, top, right, bottom, word));
        }
    }
    Some(pages)
}

#[test]
fn nothing_leaves_the_sheet_or_lies_over_another_word() {
    for (name, document) in samples() {
        let Some(pages) = boxes(name, &document) else { return };
        let (width, height) = match document.paper {
            Paper::A4 => (595.276, 841.89),
            Paper::A5 => (419.528, 595.276),
            Paper::Letter => (612.0, 792.0),
        };
        // The words of a drawing are the drawing's own.
        let skip = document.blocks.iter().any(|block| matches!(block, Block::Figure(_)));
        for (number, words) in pages.iter().enumerate() {
            for (i, (left, top, right, bottom, word)) in words.iter().enumerate() {
                assert!(
                    *left > 20.0 && *top > 14.0 && *right < width - 20.0 && *bottom < height - 20.0,
                    "{name}, page {}: {word:.20} at {left} {top} {right} {bottom}",
                    number + 1
                );
                if skip && number < 2 {
                    continue;
                }
                for (l, t, r, b, other) in words.iter().skip(i + 1) {
                    // Boxes are as high as the font's ascent and descent, higher than the letters.
                    let over = (right.min(*r) - left.max(*l)).min(bottom.min(*b) - top.max(*t) - 3.0);
                    assert!(over < 0.6, "{name}, page {}: {word:.20} over {other:.20} by {over}", number + 1);
                }
            }
        }
    }
}

#[test]
fn every_page_says_its_number_and_every_table_its_head() {
    let document = bare(vec![Block::Table(points(400))]);
    let Some(pages) = boxes("rows-only", &document) else { return };
    assert!(pages.len() > 8);
    for (i, words) in pages.iter().enumerate() {
        let all: Vec<&str> = words.iter().map(|(.., word)| word.as_str()).collect();
        let all = all.join(" ");
        let mut head: Vec<_> = words.iter().filter(|(_, _, _, bottom, _)| *bottom < 60.0).collect();
        head.sort_by(|a, b| a.0.total_cmp(&b.0));
        let head: Vec<&str> = head.iter().map(|(.., word)| word.as_str()).collect();
        assert_eq!(head.join(" "), format!("EB-2026-0017 page {} of {}", i + 1, pages.len()));
        assert!(all.contains("residual"), "page {}: {all:.200}", i + 1);
        assert_eq!(all.contains("end of certificate"), i + 1 == pages.len());
    }
}

#[test]
fn no_heading_ends_a_page_and_no_line_stands_alone() {
    let line =
        "Words that fill a line and then some more of them until the second line has begun too and a third. ";
    for count in 30..60 {
        let mut blocks: Vec<Block> = (0..count)
            .map(|i| Block::Pairs { pairs: vec![pair("k", &i.to_string())], two_columns: false })
            .collect();
        blocks.push(Block::Heading(Level::Two, "Heading".to_owned()));
        blocks.push(Block::Paragraph(line.repeat(3).into()));
        let Some(pages) = boxes("headings", &bare(blocks)) else { return };
        for words in &pages {
            let mut lines: Vec<f32> = words.iter().map(|(_, _, _, bottom, _)| *bottom).collect();
            lines.dedup_by(|a, b| (*a - *b).abs() < 1.0);
            let at = |what: &str| {
                words.iter().filter(|(.., word)| word == what).map(|(_, _, _, b, _)| *b).next_back()
            };
            if let Some(heading) = at("Heading") {
                let below = lines.iter().filter(|b| **b > heading + 2.0).count();
                assert!(below >= 2, "{count} pairs: {below} lines under the heading");
            }
        }
    }
}

#[test]
fn points_of_numbers_stand_under_one_another() {
    let cells = ["7.25", "10.5", "−123.456", "0.31 ± 0.02", "8", "not evaluated"];
    let table = Table {
        caption: None,
        columns: vec![Column::numbers("value", "L/min"), Column::new("note", Align::Left)],
        rows: cells.iter().map(|cell| Row::new([*cell, "n"])).collect(),
        row_heads: false,
    };
    let Some(pages) = boxes("points", &bare(vec![Block::Table(table)])) else { return };
    let right = |word: &str| {
        pages[0].iter().find(|(.., w)| w == word).map(|(left, _, right, _, _)| (*left, *right)).unwrap()
    };
    // A figure of the cells is 8.6 pt by 0.5728 em wide, a point 0.286 em (DejaVu Sans Condensed 2.37, `hmtx`).
    let (figure, point) = (8.6 * 0.5728, 8.6 * 0.286);
    let after = |word: &str, figures: f32| right(word).1 - point - figures * figure;
    let places =
        [after("7.25", 2.0), after("10.5", 1.0), after("−123.456", 3.0), after("0.31", 2.0), right("8").1];
    for place in places {
        assert!((place - places[0]).abs() < 0.1, "{places:?}");
    }
}

#[test]
fn lines_of_text_are_short_enough_to_read() {
    let text = "Results relate only to the item calibrated, and the line holds between its lowest and its highest point. ";
    let Some(pages) = boxes("measure", &bare(vec![Block::Paragraph(text.repeat(6).into())])) else { return };
    let mut lines: std::collections::BTreeMap<i32, usize> = std::collections::BTreeMap::new();
    for (_, _, _, bottom, word) in &pages[0] {
        *lines.entry(bottom.round() as i32).or_default() += word.chars().count() + 1;
    }
    let longest = lines.values().max().unwrap() - 1;
    assert!((75..=90).contains(&longest), "{longest}");
}

#[test]
fn the_plain_text_holds_the_same_words() {
    for (name, document) in samples() {
        for width in [40, 80, 120] {
            let plain = text(&document, width);
            for line in plain.lines() {
                let length = line.chars().filter(|c| !matches!(*c, '\u{300}'..='\u{36F}')).count();
                assert!(length <= width, "{name} at {width}: {line}");
            }
            let found = letters(&plain);
            if width == 120 && name == "certificate" {
                for wanted in texts(&document.blocks).iter().filter(|text| text.chars().count() < 30) {
                    assert!(found.contains(&letters(wanted)), "{name}: {wanted}");
                }
            }
            assert!(found.contains(&letters(&document.end)));
        }
    }
}

#[test]
fn the_plain_text_of_a_certificate_is_as_it_was_last_looked_at() {
    let plain = text(&certificate(), 100);
    let begins = plain.lines().take(22).collect::<Vec<_>>().join("\n");
    assert_eq!(
        begins,
        include_str!("plain.txt").trim_end(),
        "the beginning of the plain text has changed; look at it:\n{begins}"
    );
}
