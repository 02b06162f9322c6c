//! Rows put in order and averaged over a few seconds.
//!
//! Comes in: the time column, in whatever order it was written. Goes out: which row falls into which bin, bins in order
//! of time; repeated times fall into one bin. Nothing is interpolated: a bin exists where rows are.

/// Rows in order of time, each with its bin.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Bins {
    /// Rows in order of time.
    pub(super) rows: Vec<usize>,
    /// The bin of each of `rows`, counted from 0.
    pub(super) bin: Vec<usize>,
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
    let mut rows: Vec<usize> = (0..time_s.len()).filter(|&row| time_s[row].is_finite()).collect();
    let without_time = time_s.len() - rows.len();
    let unordered = rows.windows(2).filter(|pair| time_s[pair[1]] < time_s[pair[0]]).count();
    if unordered > 0 {
        rows.sort_by(|&a, &b| time_s[a].total_cmp(&time_s[b]));
    }
    let repeated = rows.windows(2).filter(|pair| time_s[pair[1]] <= time_s[pair[0]]).count();
    let (first_s, last_s) = (time_s[*rows.first()?], time_s[*rows.last()?]);
    let mut bin = Vec::with_capacity(rows.len());
    let mut means: Vec<f64> = Vec::new();
    let mut ends_s: Vec<(f64, f64)> = Vec::new();
    let (mut cell, mut sum, mut count) = (f64::NAN, 0.0, 0.0);
    for &row in &rows {
        let at = libm::floor((time_s[row] - first_s) / width_s);
        // A new bin when the number differs from the last one, and at the start, where that is NaN.
        if cell.is_nan() || at > cell {
            if count > 0.0 {
                means.push(first_s + sum / count);
            }
            (cell, sum, count) = (at, 0.0, 0.0);
            ends_s.push((time_s[row], time_s[row]));
        }
        if let Some(ends) = ends_s.last_mut() {
            ends.1 = time_s[row];
        }
        sum += time_s[row] - first_s;
        count += 1.0;
        bin.push(means.len());
    }
    means.push(first_s + sum / count);
    Some(Bins { rows, bin, time_s: means, ends_s, first_s, last_s, without_time, unordered, repeated })
}

impl Bins {
    /// Mean of the finite readings of a column in each bin; NaN where there are none.
    pub(super) fn means(&self, reading: impl Fn(usize) -> f64) -> Vec<f64> {
        let mut means = vec![f64::NAN; self.time_s.len()];
        let (mut now, mut sum, mut count) = (0, 0.0, 0.0);
        for (&row, &bin) in self.rows.iter().zip(&self.bin) {
            if bin != now {
                if count > 0.0 {
                    means[now] = sum / count;
                }
                (now, sum, count) = (bin, 0.0, 0.0);
            }
            let x = reading(row);
            if x.is_finite() {
                sum += x;
                count += 1.0;
            }
        }
        if count > 0.0 {
            means[now] = sum / count;
        }
        means
    }

    /// As [`Bins::means`], with each empty bin taking the nearest bin's mean; none when all are empty.
    pub(super) fn filled_means(&self, reading: impl Fn(usize) -> f64) -> Option<Vec<f64>> {
        let mut means = self.means(reading);
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
        assert_eq!(got.rows, [0, 2, 1, 4, 5]);
        assert_eq!(got.bin, [0, 0, 1, 1, 2]);
        assert_eq!((got.without_time, got.unordered, got.repeated), (1, 1, 1));
        assert_eq!(got.time_s, [0.5, 6.0, 12.0]);
        let column = [1.0, 5.0, 3.0, 9.0, 7.0, f64::NAN];
        assert_eq!(got.means(|row| column[row])[..2], [2.0, 6.0]);
        assert_eq!(got.filled_means(|row| column[row]).unwrap(), [2.0, 6.0, 6.0]);
    }

    #[test]
    fn no_time_at_all_is_none() {
        assert_eq!(bins(&[f64::NAN], 5.0), None);
        assert_eq!(bins(&[], 5.0), None);
    }
}
