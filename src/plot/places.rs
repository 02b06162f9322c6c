//! Where a text can stand: places that are taken, and the first that is free.
//!
//! Comes in: what is drawn, as rectangles in pixels, and places for a text, best first. Goes out: a place that touches
//! nothing, or none. Left out: moving what already stands.

use super::frame::Frame;
use super::letters::{Weight, width};
use super::svg::Anchor;

/// Half the height of a text over its size, with a little air.
const HALF_HEIGHT: f64 = 0.62;
/// From the middle of a text down to its baseline, over its size.
pub(super) const TO_BASELINE: f64 = 0.36;

/// What is taken.
#[derive(Debug, Clone, Default)]
pub(super) struct Taken(Vec<Frame>);

impl Taken {
    pub(super) fn frame(&mut self, frame: Frame) {
        self.0.push(frame);
    }

    /// A straight stroke with some room about it; a slanting one is taken in pieces.
    pub(super) fn stroke(&mut self, a: (f64, f64), b: (f64, f64), around: f64) {
        let long = (b.0 - a.0).abs().min((b.1 - a.1).abs());
        let pieces = (long / 6.0).clamp(1.0, 400.0) as u32;
        let at = |i: u32| {
            let share = f64::from(i) / f64::from(pieces);
            (a.0 + share * (b.0 - a.0), a.1 + share * (b.1 - a.1))
        };
        for i in 0..pieces {
            let (p, q) = (at(i), at(i + 1));
            self.0.push(Frame {
                left: p.0.min(q.0) - around,
                right: p.0.max(q.0) + around,
                top: p.1.min(q.1) - around,
                bottom: p.1.max(q.1) + around,
            });
        }
    }

    /// Strokes from place to place.
    pub(super) fn along(&mut self, places: &[(f64, f64)], around: f64) {
        for pair in places.windows(2) {
            self.stroke(pair[0], pair[1], around);
        }
    }

    pub(super) fn free(&self, frame: &Frame) -> bool {
        !self.0.iter().any(|taken| taken.meets(frame))
    }

    /// The first place within `bounds` that touches nothing.
    pub(super) fn first(&self, places: impl IntoIterator<Item = Frame>, bounds: &Frame) -> Option<Frame> {
        places.into_iter().find(|frame| bounds.holds(frame) && self.free(frame))
    }
}

/// The room of a text whose middle is at height `y`.
pub(super) fn text_frame(text: &str, size: f64, weight: Weight, (x, y): (f64, f64), anchor: Anchor) -> Frame {
    let wide = width(text, size, weight);
    let left = match anchor {
        Anchor::Start => x,
        Anchor::Middle => x - 0.5 * wide,
        Anchor::End => x - wide,
    };
    Frame { left, top: y - HALF_HEIGHT * size, right: left + wide, bottom: y + HALF_HEIGHT * size }
}

/// Places beside a point for a text: to the right and left, then above and below, then further up and down.
pub(super) fn around(text: &str, size: f64, (x, y): (f64, f64), away: f64) -> Vec<Frame> {
    let at = |x: f64, y: f64, anchor| text_frame(text, size, Weight::Regular, (x, y), anchor);
    let mut places = Vec::new();
    for step in [0.0, -1.0, 1.0, -2.0, 2.0, -3.2, 3.2, -4.6, 4.6, -6.2, 6.2, -8.0, 8.0] {
        let y = y + step * size;
        places.push(at(x + away, y, Anchor::Start));
        places.push(at(x - away, y, Anchor::End));
        if f64::abs(step) > 0.5 {
            places.push(at(x, y + 0.5 * step.signum() * size, Anchor::Middle));
        }
    }
    places
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_text_goes_where_nothing_stands() {
        let bounds = Frame { left: 0.0, top: 0.0, right: 200.0, bottom: 100.0 };
        let mut taken = Taken::default();
        let first = |taken: &Taken| taken.first(around("9.4 bar", 12.0, (100.0, 50.0), 5.0), &bounds);
        let right = first(&taken).unwrap();
        assert!((right.left - 105.0).abs() < 1e-9);
        taken.frame(right);
        assert!(first(&taken).unwrap().right <= 95.0);
        taken.frame(bounds);
        assert_eq!(first(&taken), None);
    }

    #[test]
    fn a_slanting_stroke_leaves_its_corners_free() {
        let mut taken = Taken::default();
        taken.stroke((0.0, 0.0), (100.0, 100.0), 1.0);
        let at = |x: f64, y: f64| Frame { left: x - 5.0, top: y - 5.0, right: x + 5.0, bottom: y + 5.0 };
        assert!(!taken.free(&at(50.0, 50.0)));
        assert!(taken.free(&at(80.0, 20.0)));
    }
}
