//! Rows put in order and averaged over a few seconds.
//!
//! Comes in: the time column, in whatever order it was written. Goes out: which row falls into which bin, bins in order
//! of time; repeated times fall into one bin. Nothing is interpolated: a bin exists where rows are.

use std::borrow::Cow;
use std::ops::Range;

/// Bins of rows in order of time.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Bins {
    /// Rows in order of time; none when they stand in that order, each with a time.
    order: Option<Vec<usize>>,
    /// Where each bin begins among the rows in order of time, and where the last one ends.
    starts: Vec<usize>,
    /// Mean time of each bin, seconds.
    pub(super) time_s: Vec<f64>,
    /// First and last reading of each bin, seconds.
    pub(super) ends_s: Vec<(f64, f64)>,
    /// First reading, seconds.
    pub(super) first_s: f64,
    /// Last reading, seconds.
    pub(super) last_s: f64,
    /// Rows without a finite time, which are not used.
    pub(super) without_time: usize,
    /// Rows that stood before one with an earlier time.
    pub(super) unordered: usize,
    /// Rows whose time stands in the row before too.
    pub(super) repeated: usize,
}

/// Bins of `width_s`; none when no row has a time.
pub(super) fn bins(time_s: &[f64], width_s: f64) -> Option<Bins> {
    let count = |times: &[f64], of: fn(f64, f64) -> bool| {
        times.windows(2).filter(|pair| of(pair[0], pair[1])).count()
    };
    // Times that never fall are finite when the first and the last are; a missing one neither rises nor falls.
    let rising = count(time_s, |a, b| b >= a) + 1 == time_s.len()
        && time_s.first()?.is_finite()
        && time_s.last()?.is_finite();
    let (mut order, mut without_time, mut unordered) = (None, 0, 0);
    let mut times = Cow::Borrowed(time_s);
    if !rising {
        let mut rows: Vec<usize> = (0..time_s.len()).filter(|&row| time_s[row].is_finite()).collect();
        without_time = time_s.len() - rows.len();
        unordered = rows.windows(2).filter(|pair| time_s[pair[1]] < time_s[pair[0]]).count();
        if unordered > 0 {
            rows.sort_by(|&a, &b| time_s[a].total_cmp(&time_s[b]));
        }
        times = Cow::Owned(rows.iter().map(|&row| time_s[row]).collect());
        order = Some(rows);
    }
    let repeated = count(&times, |a, b| b <= a);
    let (first_s, last_s) = (*times.first()?, *times.last()?);
    let number = |time_s: f64| (time_s - first_s) / width_s;
    let mut starts = vec![0];
    let mut ends_s = Vec::new();
    let (mut start, mut rows) = (0, 1);
    while start < times.len() {
        let next = libm::floor(number(times[start])) + 1.0;
        let is_in = |time_s: f64| number(time_s) < next;
        // As many rows as in the bin before, as a rule; else they are searched for.
        let guess = start + rows;
        let fits =
            times.get(guess - 1).is_some_and(|t| is_in(*t)) && times.get(guess).is_some_and(|t| !is_in(*t));
        let end = if fits { guess } else { start + times[start..].partition_point(|t| is_in(*t)).max(1) };
        rows = end - start;
        ends_s.push((times[start], times[end - 1]));
        starts.push(end);
        start = end;
    }
    let sums = sums(&times, &starts, |_, time_s| time_s - first_s);
    let time_s = sums.iter().zip(starts.windows(2));
    let time_s = time_s.map(|(sum, ends)| first_s + sum / (ends[1] - ends[0]) as f64).collect();
    Some(Bins { order, starts, time_s, ends_s, first_s, last_s, without_time, unordered, repeated })
}

/// Bins whose sums are made side by side: one sum alone waits for its last addition before the next.
const SIDE_BY_SIDE: usize = 4;

/// Sum in each bin of what `of` makes of the place and the reading, in order of the readings.
fn sums(column: &[f64], starts: &[usize], of: impl Fn(usize, f64) -> f64) -> Vec<f64> {
    let bins = starts.len().saturating_sub(1);
    let mut sums = vec![0.0; bins];
    for (group, sums) in sums.chunks_mut(SIDE_BY_SIDE).enumerate() {
        let starts = &starts[group * SIDE_BY_SIDE..];
        let mut shared = 0;
        if let (Ok(from), [a, b, c, d]) =
            (<[usize; SIDE_BY_SIDE]>::try_from(&starts[..sums.len()]), &mut *sums)
        {
            shared = starts.windows(2).take(SIDE_BY_SIDE).map(|ends| ends[1] - ends[0]).min().unwrap_or(0);
            let of_bin = |bin: usize| &column[from[bin]..from[bin] + shared];
            let pairs = of_bin(0).iter().zip(of_bin(1)).zip(of_bin(2).iter().zip(of_bin(3)));
            for (at, ((e, f), (g, h))) in pairs.enumerate() {
                *a += of(from[0] + at, *e);
                *b += of(from[1] + at, *f);
                *c += of(from[2] + at, *g);
                *d += of(from[3] + at, *h);
            }
        }
        for (sum, ends) in sums.iter_mut().zip(starts.windows(2)) {
            let rest = ends[0] + shared..ends[1];
            *sum = rest.clone().zip(&column[rest]).fold(*sum, |sum, (at, x)| sum + of(at, *x));
        }
    }
    sums
}

impl Bins {
    /// Where the readings of each bin stand in a column that is [in order](Bins::in_order).
    pub(super) fn ranges(&self) -> impl Iterator<Item = Range<usize>> {
        self.starts.windows(2).map(|pair| pair[0]..pair[1])
    }

    /// The readings of a column in order of time, one for each row that has a time; NaN where the column has none.
    pub(super) fn in_order<'a>(&self, column: &'a [f64]) -> Cow<'a, [f64]> {
        let rows = self.starts.last().copied().unwrap_or(0);
        let at = |row: usize| column.get(row).copied().unwrap_or(f64::NAN);
        match (&self.order, column.get(..rows)) {
            (None, Some(readings)) => Cow::Borrowed(readings),
            (None, None) => (0..rows).map(at).collect(),
            (Some(order), _) => order.iter().map(|&row| at(row)).collect(),
        }
    }

    /// Mean in each bin of those readings of a column [in order](Bins::in_order) that `counts` says count, and how many do;
    /// NaN where none does.
    pub(super) fn means_of(&self, column: &[f64], counts: impl Fn(usize, f64) -> bool) -> (Vec<f64>, usize) {
        // Without a branch: adding nothing leaves a sum as it is.
        let mut means = sums(column, &self.starts, |at, x| if counts(at, x) { x } else { 0.0 });
        let mut counted = 0;
        for (mean, range) in means.iter_mut().zip(self.ranges()) {
            let count = range.clone().zip(&column[range]).filter(|(at, x)| counts(*at, **x)).count();
            counted += count;
            *mean /= count as f64;
        }
        (means, counted)
    }

    /// Mean of the finite readings of a column in each bin; NaN where there are none.
    fn means(&self, column: &[f64]) -> Vec<f64> {
        self.means_of(&self.in_order(column), |_, x| x.is_finite()).0
    }

    /// Mean of the finite readings of a column in each bin, the nearest bin's mean where there are none; none when there is no
    /// finite reading at all.
    pub(super) fn filled_means(&self, column: &[f64]) -> Option<Vec<f64>> {
        let mut means = self.means(column);
        let known: Vec<usize> = (0..means.len()).filter(|&i| means[i].is_finite()).collect();
        let first = *known.first()?;
        let mut next = 0;
        let mut last = first;
        for i in 0..means.len() {
            while next < known.len() && known[next] < i {
                last = known[next];
                next += 1;
            }
            if means[i].is_nan() {
                let ahead = known.get(next).copied().unwrap_or(last);
                let nearer_ahead =
                    (self.time_s[ahead] - self.time_s[i]).abs() < (self.time_s[i] - self.time_s[last]).abs();
                means[i] = means[if nearer_ahead || last > i { ahead } else { last }];
            }
        }
        Some(means)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn unordered_and_repeated_times_come_out_in_order() {
        let got = bins(&[0.0, 6.0, 1.0, f64::NAN, 6.0, 12.0], 5.0).unwrap();
        assert_eq!(got.order.as_deref(), Some(&[0, 2, 1, 4, 5][..]));
        assert_eq!(got.starts, [0, 2, 4, 5]);
        assert_eq!((got.without_time, got.unordered, got.repeated), (1, 1, 1));
        assert_eq!(got.time_s, [0.5, 6.0, 12.0]);
        let column = [1.0, 5.0, 3.0, 9.0, 7.0, f64::NAN];
        assert_eq!(got.in_order(&column)[..4], [1.0, 3.0, 5.0, 7.0]);
        assert_eq!(got.means(&column)[..2], [2.0, 6.0]);
        assert_eq!(got.filled_means(&column).unwrap(), [2.0, 6.0, 6.0]);
    }

    #[test]
    fn times_in_order_need_no_list_of_rows_and_a_short_column_is_missing_at_its_end() {
        // Two rows in 0…5 s, two in 5…10 s (5 s itself begins a bin), none in 10…15 s, three in 15…20 s.
        let got = bins(&[0.0, 4.0, 5.0, 9.9, 15.0, 16.0, 17.0], 5.0).unwrap();
        assert_eq!((got.order.as_ref(), got.starts.as_slice()), (None, &[0, 2, 4, 7][..]));
        assert_eq!(got.ends_s, [(0.0, 4.0), (5.0, 9.9), (15.0, 17.0)]);
        assert_eq!((got.time_s[0], got.time_s[2]), (2.0, 16.0));
        assert_eq!(got.in_order(&[1.0, 2.0, 3.0])[..3], [1.0, 2.0, 3.0]);
        assert!(got.in_order(&[1.0, 2.0, 3.0])[3..].iter().all(|x| x.is_nan()));
        assert_eq!(got.filled_means(&[1.0, 2.0, 3.0]).unwrap(), [1.5, 3.0, 3.0]);
    }

    #[test]
    fn no_time_at_all_is_none() {
        assert_eq!(bins(&[f64::NAN], 5.0), None);
        assert_eq!(bins(&[], 5.0), None);
    }
}
