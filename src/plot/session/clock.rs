//! Elapsed time: as text, and where the ticks of an axis of time go.
//!
//! Comes in: seconds. Goes out: "0:12:30", and ticks at whole seconds, minutes and hours whose labels keep apart.

use super::super::axis::{Scale, Ticks};

/// Steps between labels, seconds, each with the finer ticks between two of them.
const STEPS: [(f64, f64); 20] = [
    (1.0, 1.0),
    (2.0, 2.0),
    (5.0, 5.0),
    (10.0, 5.0),
    (15.0, 3.0),
    (30.0, 3.0),
    (60.0, 4.0),
    (120.0, 4.0),
    (300.0, 5.0),
    (600.0, 5.0),
    (900.0, 3.0),
    (1_800.0, 3.0),
    (3_600.0, 4.0),
    (7_200.0, 4.0),
    (10_800.0, 3.0),
    (21_600.0, 3.0),
    (43_200.0, 4.0),
    (86_400.0, 4.0),
    (604_800.0, 7.0),
    (6_048_000.0, 10.0),
];
/// More ticks than this on an axis are none: the span is absurd.
const MOST_TICKS: f64 = 400.0;

/// Elapsed time as h:mm:ss, rounded to the second.
pub(super) fn elapsed(seconds: f64) -> String {
    if !seconds.is_finite() {
        return "?".to_owned();
    }
    let whole = seconds.abs().round().min(1e15) as u64;
    let sign = if seconds < 0.0 && whole > 0 { "\u{2212}" } else { "" };
    format!("{sign}{}:{:02}:{:02}", whole / 3600, whole / 60 % 60, whole % 60)
}

/// The ticks that fit in `pixels`: `room` says how far apart some labels must stand.
pub(super) fn ticks(scale: &Scale, pixels: f64, room: impl Fn(&[(f64, String)]) -> f64) -> Ticks {
    let span = scale.high - scale.low;
    for (step, finer) in STEPS {
        if span / step > MOST_TICKS {
            continue;
        }
        let major: Vec<(f64, String)> =
            multiples(step, scale).map(|seconds| (seconds, elapsed(seconds))).collect();
        if pixels * step / span >= room(&major) {
            let minor = if finer > 1.0 { multiples(step / finer, scale).collect() } else { Vec::new() };
            return Ticks { major, minor };
        }
    }
    Ticks { major: Vec::new(), minor: Vec::new() }
}

fn multiples(step: f64, scale: &Scale) -> impl Iterator<Item = f64> {
    let told = scale.low.abs().max(scale.high.abs()) / step < 1e9;
    let (first, last) = if told {
        (libm::ceil(scale.low / step - 1e-9) as i64, libm::floor(scale.high / step + 1e-9) as i64)
    } else {
        (0, -1)
    };
    (first..=last).map(move |i| i as f64 * step)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn elapsed_time_has_hours_minutes_and_seconds() {
        assert_eq!(elapsed(0.0), "0:00:00");
        assert_eq!(elapsed(749.6), "0:12:30");
        assert_eq!(elapsed(36_061.0), "10:01:01");
        assert_eq!(elapsed(-0.2), "0:00:00");
        assert_eq!(elapsed(-61.0), "\u{2212}0:01:01");
        assert_eq!(elapsed(f64::NAN), "?");
    }

    #[test]
    fn ticks_stand_at_whole_minutes() {
        let labels = |high: f64, pixels: f64| -> Vec<String> {
            let scale = Scale::new(0.0, high, 0.0, pixels);
            ticks(&scale, pixels, |_| 60.0).major.into_iter().map(|t| t.1).collect()
        };
        assert_eq!(labels(1560.0, 400.0), ["0:00:00", "0:05:00", "0:10:00", "0:15:00", "0:20:00", "0:25:00"]);
        assert_eq!(labels(90.0, 250.0), ["0:00:00", "0:00:30", "0:01:00", "0:01:30"]);
        assert!(labels(1e12, 400.0).is_empty());
    }
}
