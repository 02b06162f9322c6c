//! Sizes, spaces and colours: one calm look for every document.
//!
//! Lengths in points (1/72 in). The looks are the project's own; where a number comes from practice, it says so.

use super::model::{Level, Paper};

/// A colour as red, green and blue.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Colour(pub u8, pub u8, pub u8);

/// Text and heavy rules.
pub(super) const INK: Colour = Colour(0x1D, 0x2A, 0x33);
/// Small print and what stands back; 6.1 : 1 on white.
pub(super) const QUIET: Colour = Colour(0x55, 0x60, 0x67);
/// Hairlines.
pub(super) const SAND: Colour = Colour(0xD8, 0xCD, 0xB0);
/// Ground of rows that stand out; pale enough to vanish in a bad copy without loss.
pub(super) const PALE: Colour = Colour(0xF6, 0xF2, 0xE7);
/// The bar of a caution.
pub(super) const BRICK: Colour = Colour(0xB4, 0x44, 0x2C);

/// A size of letters with the distance of its lines.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Size {
    pub letters: f32,
    pub lines: f32,
}

const fn size(letters: f32, lines: f32) -> Size {
    Size { letters, lines }
}

pub(super) const BODY: Size = size(9.8, 14.0);
pub(super) const FINE: Size = size(7.5, 10.5);
pub(super) const CAPTION: Size = size(8.5, 11.5);
pub(super) const STATEMENT: Size = size(14.0, 19.5);
pub(super) const VERDICT: Size = size(10.5, 14.5);
pub(super) const NAME: Size = size(13.0, 17.0);
/// Tables are tried in these sizes until one fits.
pub(super) const CELLS: [Size; 3] = [size(8.6, 11.6), size(7.8, 10.6), size(7.0, 9.6)];

/// Letters of a heading.
pub(super) const fn heading(level: Level) -> Size {
    match level {
        Level::One => size(18.0, 23.0),
        Level::Two => size(12.0, 16.0),
        Level::Three => size(9.8, 14.0),
    }
}

/// Space above a heading.
pub(super) const fn above_heading(level: Level) -> f32 {
    match level {
        Level::One => 20.0,
        Level::Two => 22.0,
        Level::Three => 13.0,
    }
}

/// Space between two paragraphs.
pub(super) const BETWEEN: f32 = 6.5;
/// Space between a heading and what it heads.
pub(super) const BELOW_HEADING: f32 = 4.5;
/// Space around tables, figures and notices.
pub(super) const AROUND: f32 = 12.0;
/// Width of the measure in ems of the text: about 90 characters of DejaVu Sans Condensed, whose mean advance in English
/// is 0.45 em with its spaces (measured on the sentences of a test).
pub(super) const MEASURE: f32 = 39.5;

/// A sheet with its margins.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Sheet {
    pub width: f32,
    pub height: f32,
    /// Left and right.
    pub side: f32,
    /// Top of the text; the running head stands above it.
    pub top: f32,
    /// Baseline of the running head.
    pub head: f32,
    pub bottom: f32,
}

impl Sheet {
    pub(super) const fn of(paper: Paper) -> Self {
        let (width, height) = match paper {
            // 210 mm by 297 mm and 148 mm by 210 mm.
            Paper::A4 => (595.276, 841.89),
            Paper::A5 => (419.528, 595.276),
            Paper::Letter => (612.0, 792.0),
        };
        match paper {
            Paper::A4 | Paper::Letter => {
                Self { width, height, side: 66.0, top: 72.0, head: 44.0, bottom: 56.0 }
            }
            Paper::A5 => Self { width, height, side: 42.0, top: 56.0, head: 34.0, bottom: 40.0 },
        }
    }

    /// Width of the text.
    pub(super) fn text_width(&self) -> f32 {
        self.width - 2.0 * self.side
    }

    /// Height of the text.
    pub(super) fn text_height(&self) -> f32 {
        self.height - self.top - self.bottom
    }

    /// Whether two columns stand side by side on it.
    pub(super) fn is_wide(&self) -> bool {
        self.text_width() > 400.0
    }
}
