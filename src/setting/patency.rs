//! The patency check: cylinder valve shut, the contents gauge must fall in its time.
//!
//! Comes in: the flow through the orifice, the trapped volume or an observed fall, two readings of the contents gauge. Goes
//! out: the seconds between them, with a lowest and a highest for 95 %. `dP/dt = Z·J·p_std·T/(V·T_std)`, taken between the two
//! readings as the difference of what the volume holds. Left out: cooling of the trapped gas as it expands.

use super::options::Trapped;
use crate::quantity::{AbsolutePressure, PressureRate, Volume};
use crate::uptake::cylinder::contents_l;

/// Expanded uncertainty of one reading of the contents gauge, bar (common practice, no source).
const READING_EXPANDED_BAR: f64 = 2.0;
/// Temperature of the trapped gas, K, and its expanded uncertainty (common practice, no source).
const TRAPPED_K: (f64, f64) = (293.15, 10.0);
/// Relative expanded uncertainty of a trapped volume or a fall without a ± (common practice, no source).
const STATED_RELATIVE: f64 = 0.1;

/// How long the contents gauge takes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Patency {
    /// First reading, bar gauge.
    pub from_bar: f64,
    /// Second reading, bar gauge.
    pub to_bar: f64,
    /// Expected time between them, s.
    pub seconds: f64,
    /// Lowest, s: faster is a leak or a hole too large.
    pub low_seconds: f64,
    /// Highest, s: slower is a blockage.
    pub high_seconds: f64,
}

impl Patency {
    /// `flow_l_min` is the whole gas at the IP, L/min STPD, and `relative_u` its relative standard uncertainty.
    pub(super) fn of(
        trapped: Trapped,
        (from_bar, to_bar): (f64, f64),
        flow_l_min: f64,
        relative_u: f64,
    ) -> Option<Self> {
        let reading_u = READING_EXPANDED_BAR / (from_bar - to_bar) / std::f64::consts::SQRT_2;
        // Two readings at k = 2 each: their difference has √2 of one, and half of that is standard.
        let (seconds, own_u) = match trapped {
            Trapped::Volume(volume) => {
                let litres = volume.value.as_l();
                let absolute = |bar: f64| bar + AbsolutePressure::STANDARD_ATMOSPHERE.as_bar();
                let held = |bar: f64| contents_l(litres, absolute(bar), TRAPPED_K.0);
                let left = held(from_bar) - held(to_bar);
                let volume_u = relative(volume.expanded.map(Volume::as_l), litres);
                // Amount goes with 1/T and flow with 1/√T.
                let temperature_u = 0.5 * TRAPPED_K.1 / 2.0 / TRAPPED_K.0;
                let u = volume_u * volume_u + temperature_u * temperature_u + relative_u * relative_u;
                (60.0 * left / flow_l_min, u.sqrt())
            }
            Trapped::Fall(fall) => {
                let rate = fall.value.as_bar_min();
                (
                    60.0 * (from_bar - to_bar) / rate,
                    relative(fall.expanded.map(PressureRate::as_bar_min), rate),
                )
            }
        };
        let half = 2.0 * (own_u * own_u + reading_u * reading_u).sqrt();
        (seconds.is_finite() && seconds > 0.0).then(|| Self {
            from_bar,
            to_bar,
            seconds,
            low_seconds: seconds * (1.0 - half).max(0.0),
            high_seconds: seconds * (1.0 + half),
        })
    }
}

/// Relative standard uncertainty.
fn relative(expanded: Option<f64>, value: f64) -> f64 {
    expanded.map_or(STATED_RELATIVE, |e| e / value) / 2.0
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::Uncertain;

    #[test]
    fn the_fall_of_a_small_volume_is_timed() {
        // 15 mL at 20 °C from 150 to 130 bar gauge through 0.30 L/min STPD. Z of oxygen at 20 °C: 0.9366 at 151 bar and
        // 0.9390 at 131 bar (the polynomial of `uptake`). Held: 0.015 · p/1.01325 · 273.15/293.15 / Z = 2.2238 and
        // 1.9243 L; 0.2995 L at 0.30 L/min: 59.9 s. By `dP/dt = Z·J·p_std·T/(V·T_std)` with Z = 0.938: 20.40 bar/min, 58.8 s.
        let volume = Uncertain { value: Volume::from_l(0.015), expanded: Some(Volume::from_l(0.0015)) };
        let patency = Patency::of(Trapped::Volume(volume), (150.0, 130.0), 0.30, 0.02).unwrap();
        assert!((58.0..61.0).contains(&patency.seconds), "{}", patency.seconds);
        assert!(patency.low_seconds < 0.9 * patency.seconds && patency.high_seconds > 1.1 * patency.seconds);
    }

    #[test]
    fn an_observed_fall_needs_no_volume() {
        let fall = Uncertain { value: PressureRate::from_pa_s(20.0 * 1e5 / 60.0), expanded: None };
        let patency = Patency::of(Trapped::Fall(fall), (150.0, 130.0), 0.30, 0.02).unwrap();
        assert!((patency.seconds - 60.0).abs() < 1e-9);
        let none = Uncertain { value: PressureRate::from_pa_s(0.0), expanded: None };
        assert_eq!(Patency::of(Trapped::Fall(none), (150.0, 130.0), 0.30, 0.02), None);
    }
}
