//! Many readings as a stroke of few vertices.
//!
//! Comes in: places in pixels in order of x, a missing reading as a y that is not finite. Goes out: strokes, of which
//! each column of pixels keeps its lowest and highest reading, so that a spike stays and a million readings take no more
//! room than a thousand. A stroke is broken where readings are missing over a column of pixels or more.

/// Columns at most, two vertices each.
const MOST_COLUMNS: f64 = 750.0;

/// How readings become strokes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Thinning {
    pub left: f64,
    pub width: f64,
    /// Readings further apart than this in pixels are not joined.
    pub longest: f64,
}

/// The strokes through some places.
pub(super) fn strokes(places: impl Iterator<Item = (f64, f64)>, thinning: &Thinning) -> Vec<Vec<(f64, f64)>> {
    let columns = thinning.width.ceil().clamp(1.0, MOST_COLUMNS);
    let wide = thinning.width / columns;
    let mut strokes = Vec::new();
    let mut stroke: Vec<(f64, f64)> = Vec::new();
    let mut column = Column::default();
    let (mut last_x, mut missed) = (f64::NEG_INFINITY, false);
    for (x, y) in places {
        if !(x.is_finite() && y.is_finite()) {
            missed = true;
            continue;
        }
        let apart = x - last_x;
        if (missed && apart >= wide) || apart > thinning.longest {
            column.empty_into(&mut stroke);
            if !stroke.is_empty() {
                strokes.push(std::mem::take(&mut stroke));
            }
        }
        let index = libm::floor((x - thinning.left) / wide).min(columns - 1.0) as i64;
        if column.index != Some(index) {
            column.empty_into(&mut stroke);
            column.index = Some(index);
        }
        column.take((x, y));
        (last_x, missed) = (x, false);
    }
    column.empty_into(&mut stroke);
    if !stroke.is_empty() {
        strokes.push(stroke);
    }
    strokes
}

/// Lowest and highest reading of a column of pixels.
#[derive(Default)]
struct Column {
    index: Option<i64>,
    lowest: Option<(f64, f64)>,
    highest: Option<(f64, f64)>,
}

impl Column {
    fn take(&mut self, place: (f64, f64)) {
        if self.lowest.is_none_or(|lowest| place.1 < lowest.1) {
            self.lowest = Some(place);
        }
        if self.highest.is_none_or(|highest| place.1 > highest.1) {
            self.highest = Some(place);
        }
    }

    fn empty_into(&mut self, stroke: &mut Vec<(f64, f64)>) {
        if let (Some(a), Some(b)) = (self.lowest.take(), self.highest.take()) {
            let (first, second) = if a.0 <= b.0 { (a, b) } else { (b, a) };
            stroke.push(first);
            if second.0 > first.0 || second.1 > first.1 || second.1 < first.1 {
                stroke.push(second);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const WIDE: Thinning = Thinning { left: 0.0, width: 100.0, longest: 60.0 };

    #[test]
    fn few_readings_stay_as_they_are() {
        let places = [(0.0, 5.0), (10.0, 6.0), (20.0, 4.0)];
        assert_eq!(strokes(places.into_iter(), &WIDE), [places.to_vec()]);
    }

    #[test]
    fn a_hundred_thousand_readings_keep_their_spike() {
        let place = |i: u32| (f64::from(i) * 1e-3, if i == 50_007 { 90.0 } else { f64::from(i % 7) });
        let drawn = strokes((0..100_000).map(place), &WIDE);
        assert_eq!(drawn.len(), 1);
        assert!(drawn[0].len() <= 200, "{}", drawn[0].len());
        assert!(drawn[0].contains(&(50.007, 90.0)));
        assert!(drawn[0].windows(2).all(|pair| pair[0].0 <= pair[1].0));
    }

    #[test]
    fn missing_readings_break_a_stroke_where_one_would_see_it() {
        let with = |missing: std::ops::Range<u32>| {
            let place = |i: u32| (f64::from(i) * 0.1, if missing.contains(&i) { f64::NAN } else { 1.0 });
            strokes((0..1000).map(place), &WIDE).len()
        };
        assert_eq!((with(500..501), with(500..520)), (1, 2));
        // Rows that are not there at all.
        assert_eq!(strokes([(0.0, 1.0), (70.0, 1.0)].into_iter(), &WIDE).len(), 2);
    }
}
