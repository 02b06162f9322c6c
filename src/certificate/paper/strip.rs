//! Strips: what stands on a page, from the top down.
//!
//! A strip is as wide as the text and is never cut. Pages are made of strips ([`super::pages`]), strips of blocks
//! ([`super::flow`]), and each item on a strip is painted where it says ([`super::paint`]).

use super::lines::Line;
use super::model::Level;
use super::picture::Picture;
use super::style::{Colour, Size};
use super::tree::NodeId;

/// Where the baseline of a line stands, in ems below the middle of its height: DejaVu's letters reach 0.76 above the
/// baseline and 0.24 below it (`OS/2`, sTypoAscender and sTypoDescender).
const BASELINE_BELOW_MIDDLE: f32 = 0.26;

/// A strip.
#[derive(Clone, Default)]
pub(super) struct Strip {
    /// Space above it, left out on top of a page.
    pub before: f32,
    pub height: f32,
    pub keep: Keep,
    /// Whether it begins a page, or is on top of one anyway.
    pub fresh_page: bool,
    /// Which head, by its number in the flow, is repeated above it on top of a page.
    pub head: Option<usize>,
    /// A heading that readers may jump to.
    pub heading: Option<(Level, String)>,
    pub items: Vec<Item>,
}

/// Whether the next strip has to stand on the same page.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Default)]
pub(super) enum Keep {
    #[default]
    Free,
    /// If the whole fits on a page.
    Wanted,
    /// Even where the whole does not fit: a heading with its text, the first lines of a paragraph.
    Needed,
}

/// Something painted, with its place on the strip.
#[derive(Clone)]
pub(super) struct Item {
    pub x: f32,
    /// From the strip's top; of a line, its baseline.
    pub y: f32,
    /// What it belongs to; nothing for mere decoration.
    pub node: Option<NodeId>,
    pub ink: Ink,
}

/// What is painted.
#[derive(Clone)]
pub(super) enum Ink {
    /// Letters of a size.
    Letters(Line, f32, Colour),
    /// A filled rectangle: a rule, a ground.
    Fill { width: f32, height: f32, colour: Colour },
    /// A stroke from the item's place by so much to the right and down.
    Stroke { dx: f32, dy: f32, width: f32, colour: Colour },
    /// A picture scaled into a rectangle.
    Picture { picture: Picture, width: f32, height: f32 },
}

/// Baseline of a line of `size` whose height begins at `top`.
pub(super) fn baseline(top: f32, size: Size) -> f32 {
    top + size.lines / 2.0 + BASELINE_BELOW_MIDDLE * size.letters
}

/// Text in a row of things that stand side by side: a cell, a name, a value.
pub(super) struct Cell {
    pub x: f32,
    /// Each with how far it is moved to the right.
    pub lines: Vec<(f32, Line)>,
    pub size: Size,
    pub colour: Colour,
    pub node: NodeId,
}

/// Space above and below the text of a row, and the height over which a row is cut between its lines.
#[derive(Debug, Clone, Copy)]
pub(super) struct RowSpace {
    pub above: f32,
    pub below: f32,
    pub tallest: f32,
}

/// A row of cells: one strip, or one for each line where it would be too tall for a page.
pub(super) fn row(cells: &[Cell], space: RowSpace) -> Vec<Strip> {
    let pitch = cells.iter().map(|cell| cell.size.lines).fold(0.0, f32::max);
    let letters = cells.iter().map(|cell| cell.size.letters).fold(0.0, f32::max);
    let count = cells.iter().map(|cell| cell.lines.len()).max().unwrap_or(0);
    let first = baseline(0.0, Size { letters, lines: pitch });
    let mut whole = Strip { height: space.above + space.below + pitch * count as f32, ..Strip::default() };
    let item = |cell: &Cell, dx: f32, line: &Line, y: f32| Item {
        x: cell.x + dx,
        y,
        node: Some(cell.node),
        ink: Ink::Letters(line.clone(), cell.size.letters, cell.colour),
    };
    if whole.height <= space.tallest {
        for cell in cells {
            for (i, (dx, line)) in cell.lines.iter().enumerate() {
                whole.items.push(item(cell, *dx, line, space.above + first + pitch * i as f32));
            }
        }
        return vec![whole];
    }
    (0..count)
        .map(|i| {
            let above = if i == 0 { space.above } else { 0.0 };
            let below = if i + 1 == count { space.below } else { 0.0 };
            let lines = cells.iter().filter_map(|cell| cell.lines.get(i).map(|(dx, line)| (cell, *dx, line)));
            Strip {
                height: above + pitch + below,
                items: lines.map(|(cell, dx, line)| item(cell, dx, line, above + first)).collect(),
                ..Strip::default()
            }
        })
        .collect()
}

/// Keeps the first and the last two of the strips together: no line of a paragraph stands alone on a page.
pub(super) fn without_lone_lines(strips: &mut [Strip]) {
    if let [first, _, ..] = strips {
        first.keep = Keep::Needed;
    }
    if let [.., last_but_one, _] = strips {
        last_but_one.keep = Keep::Needed;
    }
}

/// Has each strip but the last stand with the next one, as far as `keep` asks.
pub(super) fn kept(strips: &mut [Strip], keep: Keep) {
    if let [before @ .., _] = strips {
        for strip in before {
            strip.keep = strip.keep.max(keep);
        }
    }
}
