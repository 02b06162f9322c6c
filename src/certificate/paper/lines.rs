//! Texts broken into lines.
//!
//! Comes in: a [`Text`] and a width. Goes out: lines of glyphs. Lines break at spaces; a word that is wider than a whole
//! line breaks anywhere between two letters, never between a letter and its mark. A no-break space does not break.

use std::rc::Rc;

use super::faces::{Faces, Glyph};
use super::model::{Run, Text};

/// A line.
#[derive(Debug, Clone, Default)]
pub(super) struct Line {
    pub stretches: Vec<Stretch>,
    /// Width in ems, without the spaces it ends with.
    pub width: f32,
}

/// A stretch of a line in one weight.
#[derive(Debug, Clone)]
pub(super) struct Stretch {
    pub bold: bool,
    /// Where it begins, in ems from the beginning of the line.
    pub x: f32,
    pub text: String,
    pub glyphs: Vec<Glyph>,
}

/// A word, or the part of one that is in one weight.
struct Word {
    bold: bool,
    text: String,
    glyphs: Rc<[Glyph]>,
    width: f32,
    /// Spaces behind it, at which a line may break.
    spaces: usize,
}

/// Breaks a text into lines of at most `room` ems; at least one line, which is empty for an empty text.
pub(super) fn broken(faces: &Faces, text: &Text, room: f32) -> Vec<Line> {
    let words = words(faces, text);
    let mut setter = Setter { faces, room, lines: Vec::new(), line: Line::default(), x: 0.0 };
    let mut rest = words.as_slice();
    while !rest.is_empty() {
        // Words without a space between them stay together.
        let end = rest.iter().position(|word| word.spaces > 0).map_or(rest.len(), |i| i + 1);
        let (together, after) = rest.split_at(end);
        setter.add(together);
        rest = after;
    }
    setter.finish()
}

/// Width of the text on one line, in ems.
pub(super) fn natural_width(faces: &Faces, text: &Text) -> f32 {
    let Some((last, before)) =
        words(faces, text).split_last().map(|(l, b)| (l.width, width_with_spaces(faces, b)))
    else {
        return 0.0;
    };
    before + last
}

/// Width of the widest word, in ems: narrower, it would have to break inside.
pub(super) fn widest_word(faces: &Faces, text: &Text) -> f32 {
    let mut widest: f32 = 0.0;
    let mut width = 0.0;
    for word in words(faces, text) {
        width += word.width;
        widest = widest.max(width);
        if word.spaces > 0 {
            width = 0.0;
        }
    }
    widest
}

fn width_with_spaces(faces: &Faces, words: &[Word]) -> f32 {
    words.iter().map(|word| word.width + word.spaces as f32 * faces.width(" ", word.bold)).sum()
}

fn words(faces: &Faces, text: &Text) -> Vec<Word> {
    let mut words = Vec::new();
    for Run { text, bold } in &text.0 {
        for part in text.split_inclusive(' ') {
            let letters = part.strip_suffix(' ').unwrap_or(part);
            let spaces = part.len() - letters.len();
            let glyphs = faces.shape(letters, *bold);
            let width = glyphs.iter().map(|glyph| glyph.advance).sum();
            words.push(Word { bold: *bold, text: letters.to_owned(), glyphs, width, spaces });
        }
    }
    words
}

struct Setter<'a> {
    faces: &'a Faces,
    room: f32,
    lines: Vec<Line>,
    line: Line,
    /// Where the next word begins.
    x: f32,
}

impl Setter<'_> {
    fn add(&mut self, together: &[Word]) {
        let width: f32 = together.iter().map(|word| word.width).sum();
        if self.x + width > self.room && !self.line.stretches.is_empty() {
            self.end_line();
        }
        let whole = width <= self.room;
        for word in together {
            if whole {
                self.put(word.bold, &word.text, &word.glyphs);
            } else {
                self.put_in_parts(word);
            }
            for _ in 0..word.spaces {
                self.put_space(word.bold);
            }
        }
    }

    /// A word that fits on no line.
    fn put_in_parts(&mut self, word: &Word) {
        let mut rest: &[Glyph] = &word.glyphs;
        while let Some(first) = rest.first() {
            let mut end = 0;
            let mut width = 0.0;
            while let Some(glyph) = rest.get(end) {
                let cluster = rest.iter().skip(end).take_while(|g| g.characters == glyph.characters);
                let (count, advance) = cluster.fold((0, 0.0), |(n, w), g| (n + 1, w + g.advance));
                if self.x + width + advance > self.room && (end > 0 || self.x > 0.0) {
                    break;
                }
                end += count;
                width += advance;
            }
            if end == 0 {
                self.end_line();
                continue;
            }
            let (part, after) = rest.split_at(end);
            let start = first.characters.start;
            let stop = part.last().map_or(start, |glyph| glyph.characters.end);
            let moved: Vec<Glyph> = part
                .iter()
                .map(|glyph| Glyph {
                    characters: glyph.characters.start - start..glyph.characters.end - start,
                    ..glyph.clone()
                })
                .collect();
            self.put(word.bold, word.text.get(start..stop).unwrap_or_default(), &moved);
            rest = after;
            if !rest.is_empty() {
                self.end_line();
            }
        }
    }

    fn put(&mut self, bold: bool, text: &str, glyphs: &[Glyph]) {
        if text.is_empty() {
            return;
        }
        self.append(bold, text, glyphs);
        self.line.width = self.x;
    }

    /// A space counts only once something stands behind it.
    fn put_space(&mut self, bold: bool) {
        let glyphs = self.faces.shape(" ", bold);
        self.append(bold, " ", &glyphs);
    }

    fn append(&mut self, bold: bool, text: &str, glyphs: &[Glyph]) {
        if self.line.stretches.last().is_none_or(|stretch| stretch.bold != bold) {
            self.line.stretches.push(Stretch { bold, x: self.x, text: String::new(), glyphs: Vec::new() });
        }
        if let Some(stretch) = self.line.stretches.last_mut() {
            let start = stretch.text.len();
            stretch.text.push_str(text);
            stretch.glyphs.extend(glyphs.iter().map(|glyph| glyph.shifted(start)));
        }
        self.x += glyphs.iter().map(|glyph| glyph.advance).sum::<f32>();
    }

    fn end_line(&mut self) {
        self.lines.push(std::mem::take(&mut self.line));
        self.x = 0.0;
    }

    fn finish(mut self) -> Vec<Line> {
        self.end_line();
        self.lines
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn texts(text: &Text, room: f32) -> Vec<String> {
        let faces = Faces::new().unwrap();
        let lines = broken(&faces, text, room);
        for line in &lines {
            assert!(line.width <= room + 1e-3, "{} in {room}", line.width);
        }
        lines.iter().map(|line| line.stretches.iter().map(|s| s.text.as_str()).collect()).collect()
    }

    #[test]
    fn lines_break_at_spaces_and_lose_nothing() {
        let said = "The flow at the nominal pressure, with its uncertainty";
        let lines = texts(&said.into(), 10.0);
        assert!(lines.len() > 2, "{lines:?}");
        assert_eq!(lines.concat(), said);
        assert!(lines.iter().rev().skip(1).all(|line| line.ends_with(' ')));
    }

    #[test]
    fn a_word_in_two_weights_does_not_break_between_them() {
        let lines = texts(&Text::plain("one two ").and_bold("thr").and("ee"), 4.5);
        assert_eq!(lines, ["one two ", "three"]);
    }

    #[test]
    fn a_word_wider_than_a_line_breaks_anywhere_but_not_before_a_mark() {
        let word = "e\u{301}x\u{331}".repeat(5_000);
        let lines = texts(&word.as_str().into(), 7.0);
        assert_eq!(lines.concat(), word);
        assert!(lines.len() > 500);
        assert!(lines.iter().all(|line| line.starts_with(['e', 'x'])));
    }

    #[test]
    fn a_letter_wider_than_the_line_stands_alone() {
        let faces = Faces::new().unwrap();
        assert_eq!(broken(&faces, &"WWW".into(), 0.1).len(), 3);
        assert_eq!(broken(&faces, &Text::default(), 5.0).len(), 1);
    }

    #[test]
    fn a_no_break_space_holds_number_and_unit_together() {
        assert_eq!(texts(&"flow 0.31\u{A0}L/min".into(), 5.5), ["flow ", "0.31\u{A0}L/min"]);
    }

    #[test]
    fn kerning_and_marks_are_the_fonts_own() {
        let faces = Faces::new().unwrap();
        let apart = faces.width("A", false) + faces.width("V", false);
        assert!(faces.width("AV", false) < apart - 0.02, "no kerning");
        assert!((faces.width("e\u{301}", false) - faces.width("é", false)).abs() < 1e-6);
        let figures: Vec<f32> = ('0'..='9').map(|c| faces.width(&c.to_string(), true)).collect();
        assert!(figures.iter().all(|w| (w - figures[0]).abs() < 1e-6), "figures are tabular");
    }
}
