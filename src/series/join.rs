//! A slower channel brought onto a span: the thermometer, the barometer.
//!
//! Takes a column with its times and a span, and returns the mean of the finite readings within the span; where there
//! are none, the reading nearest in time within a stated limit; else nothing. There is no interpolation: between
//! two readings of a barometer a minute apart a straight line knows no more than the nearer one.

use std::ops::Range;

/// A slower channel's value for a span.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Joined {
    /// The value, in the unit of the column.
    pub value: f64,
    /// Readings it is the mean of.
    pub readings: usize,
    /// Seconds from the span to the reading, 0 when it lies within.
    pub away_s: f64,
}

/// The value of a column that stands in the same table as the span's rows.
///
/// `nearest_s` is how far before or after the span a reading may lie that stands in for it.
#[must_use]
pub fn over_rows(time_s: &[f64], values: &[f64], rows: Range<usize>, nearest_s: f64) -> Option<Joined> {
    let length = time_s.len().min(values.len());
    let rows = rows.start.min(length)..rows.end.min(length);
    let from_s = time_s[rows.clone()].iter().copied().find(|t| t.is_finite());
    let to_s = time_s[rows.clone()].iter().rev().copied().find(|t| t.is_finite());
    within(values, rows.clone())
        .or_else(|| nearest(&time_s[..length], values, rows, from_s?, to_s?, nearest_s))
}

/// The value between `from_s` and `to_s` of a column that has its own times, which must not run back.
#[must_use]
pub fn over_time(time_s: &[f64], values: &[f64], from_s: f64, to_s: f64, nearest_s: f64) -> Option<Joined> {
    let length = time_s.len().min(values.len());
    let start = time_s[..length].partition_point(|&t| t < from_s);
    let end = time_s[..length].partition_point(|&t| t <= to_s).max(start);
    within(values, start..end)
        .or_else(|| nearest(&time_s[..length], values, start..end, from_s, to_s, nearest_s))
}

/// Mean of the finite readings among the rows.
fn within(values: &[f64], rows: Range<usize>) -> Option<Joined> {
    let finite = || values[rows.clone()].iter().copied().filter(|x| x.is_finite());
    let offset = finite().next()?;
    let (sum, readings) = finite().fold((0.0, 0_usize), |(sum, n), x| (sum + (x - offset), n + 1));
    Some(Joined { value: offset + sum / readings as f64, readings, away_s: 0.0 })
}

/// The finite reading nearest to the span outside the rows; the earlier one of two equally near.
fn nearest(
    time_s: &[f64],
    values: &[f64],
    rows: Range<usize>,
    from_s: f64,
    to_s: f64,
    nearest_s: f64,
) -> Option<Joined> {
    let pick = |away_s: f64, row: usize| Joined { value: values[row], readings: 1, away_s };
    let before = (0..rows.start)
        .rev()
        .map(|row| (from_s - time_s[row], row))
        .take_while(|(away, _)| !(*away > nearest_s || *away < 0.0))
        .find(|(away, row)| away.is_finite() && values[*row].is_finite());
    let after = (rows.end..time_s.len())
        .map(|row| (time_s[row] - to_s, row))
        .take_while(|(away, _)| !(*away > nearest_s || *away < 0.0))
        .find(|(away, row)| away.is_finite() && values[*row].is_finite());
    match (before, after) {
        (Some(b), Some(a)) if a.0 < b.0 => Some(pick(a.0, a.1)),
        (Some(b), _) => Some(pick(b.0, b.1)),
        (None, Some(a)) => Some(pick(a.0, a.1)),
        (None, None) => None,
    }
}
