//! Rectangles, and hatches that fill them.
//!
//! Comes in: the sides of a rectangle in pixels. Goes out: what lies in it or meets it, and strokes that stay inside.
//! Hatches are strokes and no patterns, because a picture refers to nothing.

use super::svg::Path;

/// No more strokes of one hatch: a picture of the largest size has fewer.
const MOST_STROKES: f64 = 6000.0;

/// A rectangle.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Frame {
    pub left: f64,
    pub top: f64,
    pub right: f64,
    pub bottom: f64,
}

impl Frame {
    pub(super) fn width(&self) -> f64 {
        self.right - self.left
    }

    pub(super) fn height(&self) -> f64 {
        self.bottom - self.top
    }

    pub(super) fn holds(&self, other: &Self) -> bool {
        other.left >= self.left
            && other.right <= self.right
            && other.top >= self.top
            && other.bottom <= self.bottom
    }

    pub(super) fn meets(&self, other: &Self) -> bool {
        self.left < other.right
            && other.left < self.right
            && self.top < other.bottom
            && other.top < self.bottom
    }

    /// Its outline.
    pub(super) fn outline(&self) -> Path {
        let mut path = Path::default();
        path.move_to(self.left, self.top)
            .line_to(self.right, self.top)
            .line_to(self.right, self.bottom)
            .line_to(self.left, self.bottom)
            .close();
        path
    }
}

/// Which way the strokes of a hatch go.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Hatch {
    /// Upward to the right.
    Rising,
    /// Downward to the right.
    Falling,
    /// Both.
    Crossed,
    /// Level.
    Level,
}

/// Strokes slanting downward to the right at 45° through a frame, `apart` pixels from one another along its edges.
pub(super) fn hatch(frame: &Frame, apart: f64) -> Path {
    hatched(frame, Hatch::Falling, apart)
}

/// Strokes of a kind through a frame, `apart` pixels from one another along its edges.
pub(super) fn hatched(frame: &Frame, kind: Hatch, apart: f64) -> Path {
    let mut path = Path::default();
    match kind {
        Hatch::Rising => slanting(&mut path, frame, apart, true),
        Hatch::Falling => slanting(&mut path, frame, apart, false),
        Hatch::Crossed => {
            slanting(&mut path, frame, apart, true);
            slanting(&mut path, frame, apart, false);
        }
        Hatch::Level => {
            for y in between(frame.top, frame.bottom, 0.6 * apart) {
                path.stroke((frame.left, y), (frame.right, y));
            }
        }
    }
    path
}

fn slanting(path: &mut Path, frame: &Frame, apart: f64, rising: bool) {
    let (width, height) = (frame.width(), frame.height());
    let count = ((width + height) / apart).clamp(0.0, MOST_STROKES) as u32;
    let y = |away: f64| if rising { frame.top + away } else { frame.bottom - away };
    for i in 1..=count {
        // The stroke on which x and the distance from the lower side (rising: the upper one) add up to this.
        let along = f64::from(i) * apart;
        let (from, to) = (along.min(width), (along - height).max(0.0));
        if from > to {
            path.stroke((frame.left + from, y(along - from)), (frame.left + to, y(along - to)));
        }
    }
}

/// Places between two ends, evenly from both.
fn between(from: f64, to: f64, apart: f64) -> impl Iterator<Item = f64> {
    let count = ((to - from) / apart).clamp(0.0, MOST_STROKES) as u32;
    let first = 0.5 * (to - from - f64::from(count.saturating_sub(1)) * apart);
    (0..count).map(move |i| from + first + f64::from(i) * apart)
}

#[cfg(test)]
mod tests {
    use super::*;

    const FRAME: Frame = Frame { left: 10.0, top: 20.0, right: 40.0, bottom: 28.0 };

    #[test]
    fn hatch_stays_in_its_frame_and_fills_it() {
        let path = format!("{:?}", hatch(&FRAME, 4.0));
        assert!(path.contains("M14.00 28.00L10.00 24.00"), "{path}");
        assert_eq!(path.matches('M').count(), 9, "{path}");
        // Frames of no height have nothing to hatch.
        assert_eq!(format!("{:?}", hatch(&Frame { bottom: 20.0, ..FRAME }, 4.0)).matches('M').count(), 0);
    }

    #[test]
    fn a_rising_hatch_is_the_falling_one_upside_down() {
        let path = format!("{:?}", hatched(&FRAME, Hatch::Rising, 4.0));
        assert!(path.contains("M14.00 20.00L10.00 24.00"), "{path}");
        assert_eq!(format!("{:?}", hatched(&FRAME, Hatch::Crossed, 4.0)).matches('M').count(), 18);
    }

    #[test]
    fn level_strokes_keep_from_the_edges() {
        // 8 px by 3 px: two strokes, 3 px from one another, 2.5 px at each end.
        let path = format!("{:?}", hatched(&FRAME, Hatch::Level, 5.0));
        assert!(path.contains("M10.00 22.50L40.00 22.50M10.00 25.50"), "{path}");
        assert_eq!(path.matches('M').count(), 2);
    }
}
