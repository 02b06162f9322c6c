//! The slope of a segment as the oxygen partial pressure it stands for.
//!
//! Comes in: a segment. Goes out: PO2 at a time. Held and venting: the oxygen fraction `f` is straight, `PO2 = f·dry`.
//! Sealed: `1/(1 − f)` is. Topped: a straight bar from the level at the beginning to the one at the end,
//! because its `slope_per_min` is that of the loop's contents of oxygen, which is another thing.

use crate::uptake::{Kind, SegmentUptake};

/// Places at which a line that is not straight in PO2 is worked out.
const STEPS: u32 = 24;
/// Readings that give the level at the beginning of a topped loop.
const FIRST_READINGS: usize = 3;

/// PO2 in bar at a second of the time column; for a topped loop, which has no slope of PO2, its mean level.
pub(super) fn po2_bar(segment: &SegmentUptake, at_s: f64) -> f64 {
    let fitted = segment.level + segment.slope_per_min * (at_s - segment.middle_s) / 60.0;
    let fraction = match segment.kind {
        Kind::Sealed => 1.0 - 1.0 / fitted,
        Kind::Held | Kind::Venting => fitted,
        Kind::Topped => segment.level,
    };
    fraction * segment.dry_bar
}

/// The line over its segment, seconds and bar; empty when it is nowhere. `series` are the readings it goes through.
pub(super) fn line(segment: &SegmentUptake, series: &[(f64, f64)]) -> Vec<(f64, f64)> {
    if segment.kind == Kind::Topped {
        return bar(segment, series);
    }
    let steps = if segment.kind == Kind::Sealed { STEPS } else { 1 };
    let places: Vec<(f64, f64)> = (0..=steps)
        .map(|i| {
            let at_s = segment.from_s + (segment.to_s - segment.from_s) * f64::from(i) / f64::from(steps);
            (at_s, po2_bar(segment, at_s))
        })
        .collect();
    if places.iter().all(|(s, bar)| s.is_finite() && bar.is_finite()) { places } else { Vec::new() }
}

/// From the level at the beginning to that at the end. The uptake gives the mean of the two; the first readings give the
/// one, and so the other.
fn bar(segment: &SegmentUptake, series: &[(f64, f64)]) -> Vec<(f64, f64)> {
    let first: Vec<f64> = series
        .iter()
        .filter(|(t, p)| *t >= segment.from_s && *t <= segment.to_s && p.is_finite())
        .take(FIRST_READINGS)
        .map(|(_, p)| *p)
        .collect();
    let begin = first.iter().sum::<f64>() / first.len() as f64;
    let end = 2.0 * segment.level * segment.dry_bar - begin;
    let both = begin.is_finite() && end.is_finite();
    if both { vec![(segment.from_s, begin), (segment.to_s, end)] } else { Vec::new() }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn segment(kind: Kind, level: f64, slope_per_min: f64) -> SegmentUptake {
        SegmentUptake {
            from_s: 0.0,
            to_s: 600.0,
            kind,
            injection_l_min: 0.3,
            slope_per_min,
            slope_u: 0.0,
            slope_u_noise: 0.0,
            slope_u_ordinary: None,
            level,
            middle_s: 300.0,
            dry_bar: 0.95,
            readings: 120,
            uptake_l_min: None,
            u: 0.0,
        }
    }

    #[test]
    fn a_held_slope_is_straight_in_po2() {
        // f = 0.8 in the middle, falling 0.01 a minute: 0.85 five minutes before, 0.75 five minutes after; times 0.95.
        let line = line(&segment(Kind::Held, 0.8, -0.01), &[]);
        assert_eq!(line.len(), 2);
        assert!((line[0].1 - 0.8075).abs() < 1e-12 && (line[1].1 - 0.7125).abs() < 1e-12, "{line:?}");
    }

    #[test]
    fn a_sealed_slope_is_straight_in_one_over_the_inert_share() {
        // 1/(1 − f) = 2.5 in the middle, 2 at the end: f = 0.6, then 0.5.
        let segment = segment(Kind::Sealed, 2.5, -0.1);
        assert!((po2_bar(&segment, 300.0) - 0.57).abs() < 1e-12);
        assert!((po2_bar(&segment, 600.0) - 0.475).abs() < 1e-12);
        assert_eq!(line(&segment, &[]).len(), 25);
    }

    #[test]
    fn a_topped_bar_goes_from_the_first_level_to_the_last() {
        // Mean level 0.6 · 0.95 = 0.57 bar, first readings 0.60 bar: 0.54 bar at the end.
        let series = [(0.0, 0.599), (5.0, 0.601), (10.0, 0.600), (15.0, 0.2)];
        let line = line(&segment(Kind::Topped, 0.6, -0.02), &series);
        assert!((line[0].1 - 0.60).abs() < 1e-12 && (line[1].1 - 0.54).abs() < 1e-12, "{line:?}");
    }

    #[test]
    fn what_is_not_finite_is_nowhere() {
        for (kind, level) in [(Kind::Held, f64::NAN), (Kind::Sealed, 0.0), (Kind::Topped, 0.6)] {
            assert!(line(&segment(kind, level, 0.0), &[]).is_empty());
        }
    }
}
