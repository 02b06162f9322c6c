//! A second start for the fit of a line: many directions are looked at, each with the line laid where it fits best.
//!
//! Takes points and returns intercept and slope of the best of those lines. Points that scatter far more than their
//! uncertainties say can have a second, worse minimum beside the right one; where a line is known already, only those
//! directions need to be looked at between which a better one can lie, as a rule none. Left out: minima narrower than
//! the step between two directions, half a degree when both axes are drawn equally long.

use std::f64::consts::PI;
use std::ops::Range;

use super::points::CalibrationPoints;

/// Directions looked at by [`scanned_start`].
pub(super) const DIRECTIONS: usize = 360;

/// The directions between which every line with less than `chi_square` lies, one more on either side included; none
/// when they lie closer together than two directions, so that a scan could only find the line already known.
///
/// With the largest variances put in for all points, chi-squared of a slope b is at least
/// (Syy − 2·b·Sxy + b²·Sxx)/(uy² + b²·ux²), and the slopes for which that is below `chi_square` lie between two roots.
pub(super) fn directions_of_better_lines(points: &CalibrationPoints, chi_square: f64) -> Range<usize> {
    let about = About::new(points);
    let largest = |variances: &[f64]| variances.iter().fold(0.0_f64, |a, b| a.max(*b));
    let lead = about.xx - chi_square * largest(points.x_variances());
    let constant = about.yy - chi_square * largest(points.y_variances());
    let discriminant = about.xy * about.xy - lead * constant;
    if lead <= 0.0 {
        // Even a vertical line could be better.
        return 0..DIRECTIONS;
    }
    let root = discriminant.max(0.0).sqrt();
    let direction = |b: f64| (libm::atan(b / about.unit()) / PI + 0.5) * DIRECTIONS as f64 - 0.5;
    let (first, last) = (direction((about.xy - root) / lead), direction((about.xy + root) / lead));
    if last - first < 1.0 {
        0..0
    } else if first.is_finite() && last.is_finite() {
        first.floor().max(0.0) as usize..(last.ceil() as usize + 1).min(DIRECTIONS)
    } else {
        0..DIRECTIONS
    }
}

/// Means and sums of squares about them.
struct About {
    x: f64,
    y: f64,
    xx: f64,
    xy: f64,
    yy: f64,
}

impl About {
    fn new(points: &CalibrationPoints) -> Self {
        let (x, y, n) = (points.x(), points.y(), points.count() as f64);
        let (x_mean, y_mean) = (x.iter().sum::<f64>() / n, y.iter().sum::<f64>() / n);
        let mut about = Self { x: x_mean, y: y_mean, xx: 0.0, xy: 0.0, yy: 0.0 };
        for (x, y) in x.iter().zip(y) {
            let (dx, dy) = (x - x_mean, y - y_mean);
            about.xx += dx * dx;
            about.xy += dx * dy;
            about.yy += dy * dy;
        }
        about
    }

    /// The slope of the diagonal when both axes are drawn equally long.
    fn unit(&self) -> f64 {
        self.yy.sqrt() / self.xx.sqrt()
    }
}

/// The best line among some of the directions, each laid where it fits best. None when there is no direction, or none
/// has finite weights.
pub(super) fn scanned_start(points: &CalibrationPoints, directions: Range<usize>) -> Option<(f64, f64)> {
    let (x, ux2, y, uy2) = (points.x(), points.x_variances(), points.y(), points.y_variances());
    let about = About::new(points);
    let (x_mean, y_mean, unit) = (about.x, about.y, about.unit());
    let mut best: Option<(f64, (f64, f64))> = None;
    for k in directions {
        // Directions are even when both axes are drawn equally long.
        let angle = PI * ((k as f64 + 0.5) / DIRECTIONS as f64 - 0.5);
        let b = unit * libm::tan(angle);
        let (mut w, mut wr, mut wrr) = (0.0, 0.0, 0.0);
        for i in 0..points.count() {
            let weight = 1.0 / (uy2[i] + b * b * ux2[i]);
            let r = (y[i] - y_mean) - b * (x[i] - x_mean);
            w += weight;
            wr += weight * r;
            wrr += weight * r * r;
        }
        let chi_square = wrr - wr * wr / w;
        if chi_square.is_finite() && best.is_none_or(|(least, _)| chi_square < least) {
            best = Some((chi_square, (y_mean + wr / w - b * x_mean, b)));
        }
    }
    best.map(|(_, line)| line)
}

#[cfg(test)]
mod tests {
    use super::super::monte_carlo::Random;
    use super::*;

    fn points(random: &mut Random, n: usize, uneven: f64, scatter: f64) -> CalibrationPoints {
        let mut u = |size: f64| -> Vec<f64> {
            (0..n).map(|_| size * libm::exp(uneven * (random.uniform() - 0.5))).collect()
        };
        let (ux, uy) = (u(0.02), u(0.05));
        let mut off = |u: &f64| scatter * u * random.normal();
        let x: Vec<f64> = ux.iter().enumerate().map(|(i, u)| i as f64 + off(u)).collect();
        let y: Vec<f64> = uy.iter().enumerate().map(|(i, u)| 1.0 + 2.0 * i as f64 + off(u)).collect();
        CalibrationPoints::new(&x, &ux, &y, &uy).unwrap()
    }

    #[test]
    fn points_that_scatter_as_stated_leave_nothing_to_scan() {
        let mut random = Random::new(11, 0);
        for _ in 0..100 {
            let points = points(&mut random, 20, 0.5, 1.0);
            assert_eq!(directions_of_better_lines(&points, 30.0), 0..0);
        }
    }

    #[test]
    fn every_direction_with_a_better_line_is_among_those_looked_at() {
        let mut random = Random::new(12, 0);
        let (mut found, mut spared) = (0, 0);
        for _ in 0..200 {
            let points = points(&mut random, 12, 4.0, 30.0);
            for chi_square in [2e3, 2e4, 2e5] {
                let looked_at = directions_of_better_lines(&points, chi_square);
                spared += DIRECTIONS - looked_at.len();
                let chi_square_of = |k: usize| {
                    let (a, b) = scanned_start(&points, k..k + 1).unwrap();
                    let (ux2, uy2) = (points.x_variances(), points.y_variances());
                    let off = |i: usize| points.y()[i] - a - b * points.x()[i];
                    (0..12).map(|i| off(i) * off(i) / (uy2[i] + b * b * ux2[i])).sum::<f64>()
                };
                for k in (0..DIRECTIONS).filter(|k| chi_square_of(*k) < chi_square) {
                    found += 1;
                    // A better line alone between two neighbours is the one that is known already.
                    assert!(looked_at.contains(&k) || looked_at.is_empty(), "{k} not in {looked_at:?}");
                }
            }
        }
        assert!(found > 1000 && spared > 1000, "{found} {spared}: nothing was tested");
    }
}
