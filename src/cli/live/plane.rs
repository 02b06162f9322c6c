//! A plane of two axes in the cells of a terminal: ends of the axes as numbers, straight lines, signs.
//!
//! Straight lines are drawn in dots of braille or half blocks where the terminal has them, else in points of ASCII. Signs
//! stand in the cell that their place falls into.

use ratatui::layout::Rect;
use ratatui::style::Color;
use ratatui::symbols::Marker;
use ratatui::widgets::Widget as _;
use ratatui::widgets::canvas::{Canvas, Line};

use super::pen::{Pen, width};

/// A stretch of an axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Span {
    low: f64,
    high: f64,
}

impl Span {
    /// One that holds nothing yet.
    pub(super) const fn empty() -> Self {
        Self { low: f64::INFINITY, high: f64::NEG_INFINITY }
    }

    /// Widens it to hold a value.
    pub(super) const fn take(&mut self, value: f64) {
        if value.is_finite() {
            self.low = self.low.min(value);
            self.high = self.high.max(value);
        }
    }

    /// Whether a value lies in it.
    pub(super) fn holds(&self, value: f64) -> bool {
        (self.low..=self.high).contains(&value)
    }

    /// Where a value lies between its ends, 0 to 1.
    fn share(&self, value: f64) -> f64 {
        (value - self.low) / (self.high - self.low)
    }

    /// With a share of itself added at both ends, and at least so much.
    pub(super) fn padded(self, share: f64, least: f64) -> Self {
        let more = ((self.high - self.low) * share).max(least);
        Self { low: self.low - more, high: self.high + more }
    }
}

/// The cell that a place between the ends of an axis falls into.
fn cell(share: f64, cells: u16) -> Option<u16> {
    (0.0..=1.0).contains(&share).then(|| ((share * f64::from(cells)) as u16).min(cells - 1))
}

/// A line from one place to another, in a colour.
pub(super) type Stroke = ((f64, f64), (f64, f64), Color);
/// How the ends of an axis are written, and its unit.
pub(super) type Axis<'a> = (&'a dyn Fn(f64) -> String, &'a str);

/// The plane.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Plane {
    whole: Rect,
    inner: Rect,
    x: Span,
    y: Span,
}

/// Columns left of the plane for the numbers of its vertical axis.
const LEFT: u16 = 8;

impl Plane {
    /// A plane in an area; none where there is no room, or an axis without length.
    pub(super) fn new(whole: Rect, x: Span, y: Span) -> Option<Self> {
        let inner = Rect {
            x: whole.x + LEFT.min(whole.width),
            width: whole.width.saturating_sub(LEFT),
            height: whole.height.saturating_sub(1),
            ..whole
        };
        let sound = |span: Span| span.low.is_finite() && span.high > span.low;
        (inner.width >= 8 && inner.height >= 2 && sound(x) && sound(y)).then_some(Self { whole, inner, x, y })
    }

    /// The ends of the horizontal axis.
    pub(super) const fn x(&self) -> (f64, f64) {
        (self.x.low, self.x.high)
    }

    /// The numbers at the ends of both axes.
    pub(super) fn axes(&self, pen: &mut Pen<'_>, x: Axis<'_>, y: Axis<'_>) {
        let faint = pen.look.faint();
        let (name, unit) = y;
        let left = Rect { width: LEFT - 1, height: 1, ..self.whole };
        pen.right(left, &name(self.y.high), faint);
        pen.right(Rect { y: self.inner.bottom() - 1, ..left }, &name(self.y.low), faint);
        if self.inner.height > 3 {
            pen.right(Rect { y: self.inner.y + self.inner.height / 2, ..left }, unit, faint);
        }
        for y in self.inner.y..self.inner.bottom() {
            pen.glyph(self.inner.x - 1, y, pen.look.glyph("│", "|"), faint);
        }
        let (name, unit) = x;
        let below = Rect { y: self.inner.bottom(), height: 1, ..self.inner };
        let rest = pen.right(below, &name(self.x.high), faint);
        let low = name(self.x.low);
        pen.text(rest, &low, faint);
        let middle = (usize::from(below.width) / 2).saturating_sub(width(unit) / 2);
        let middle = u16::try_from(middle).unwrap_or(0);
        pen.text(Rect { x: below.x + middle, width: below.width - middle - 8, ..below }, unit, faint);
    }

    /// Straight lines; what lies outside is not drawn.
    pub(super) fn lines(&self, pen: &mut Pen<'_>, strokes: &[Stroke]) {
        let Some(marker) = pen.look.marker() else { return self.lines_of_points(pen, strokes) };
        let colour = pen.look.colour;
        self.canvas(pen, marker, |context| {
            for ((x1, y1), (x2, y2), own) in strokes {
                let own = if colour { *own } else { Color::Reset };
                context.draw(&Line { x1: *x1, y1: *y1, x2: *x2, y2: *y2, color: own });
            }
        });
    }

    /// A word at the right end of the row that a value of the vertical axis falls into.
    pub(super) fn word(&self, pen: &mut Pen<'_>, value: f64, word: &str) {
        if let Some(row) = self.row(value) {
            let row = Rect { y: self.inner.y + row, height: 1, ..self.inner };
            pen.right(
                Rect { width: row.width.saturating_sub(1), ..row },
                &format!(" {word} "),
                pen.look.faint(),
            );
        }
    }

    fn canvas(
        &self,
        pen: &mut Pen<'_>,
        marker: Marker,
        paint: impl Fn(&mut ratatui::widgets::canvas::Context<'_>),
    ) {
        Canvas::default()
            .marker(marker)
            .x_bounds([self.x.low, self.x.high])
            .y_bounds([self.y.low, self.y.high])
            .paint(paint)
            .render(self.inner.intersection(pen.buffer.area), pen.buffer);
    }

    fn lines_of_points(&self, pen: &mut Pen<'_>, strokes: &[Stroke]) {
        let steps = u32::from(self.inner.width.max(self.inner.height)) * 2;
        for ((x1, y1), (x2, y2), _) in strokes {
            for step in 0..=steps {
                let share = f64::from(step) / f64::from(steps);
                let at = (x1 + (x2 - x1) * share, y1 + (y2 - y1) * share);
                self.glyph(pen, at, ".", pen.look.accent());
            }
        }
    }

    /// A sign at a place; nothing where that lies outside.
    pub(super) fn glyph(&self, pen: &mut Pen<'_>, at: (f64, f64), glyph: &str, style: ratatui::style::Style) {
        let column = cell(self.x.share(at.0), self.inner.width);
        if let Some((column, row)) = column.zip(self.row(at.1)) {
            pen.glyph(self.inner.x + column, self.inner.y + row, glyph, style);
        }
    }

    /// The row of cells that a value of the vertical axis falls into.
    fn row(&self, value: f64) -> Option<u16> {
        cell(1.0 - self.y.share(value), self.inner.height)
    }
}
