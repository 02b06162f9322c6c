//! How fast PO2 moves at an injection and an uptake.
//!
//! Comes in: injection and uptake (L/min STPD), loop volume (L at the pressure around). Goes out: bar/min, negative =
//! sinking. Held by diluent: `(1 − f_d)·(J − M)·p_std·T/(V·T_std)`, the same at any depth; sealed or venting the same
//! with the loop's own oxygen fraction for `f_d`. `T` is that of a warm loop. Left out: nitrogen of the body, vapour.

use super::options::{LOOP_C, Used};
use crate::quantity::{STANDARD_ATMOSPHERE_PA, Temperature, ZERO_CELSIUS_K};

/// PO2 below which a diver loses consciousness, bar (common practice, no source).
pub const HYPOXIA_BAR: f64 = 0.16;

/// Drift of PO2 and what it leads to, at rest with nobody touching anything.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drift {
    /// Loop held by diluent, bar/min; negative = sinking.
    pub held_bar_min: f64,
    /// Loop neither topped nor held, at the surface and the lower PO2, bar/min; none where that PO2 needs more than pure
    /// oxygen.
    pub sealed_bar_min: Option<f64>,
    /// Minutes from the upper to the lower PO2 at rest; none when PO2 does not sink.
    pub minutes_high_to_low: Option<f64>,
    /// Minutes from the lower PO2 to [`HYPOXIA_BAR`] at work, if nobody adds oxygen (sooner on ascent); none when the
    /// injection covers the work.
    pub minutes_to_hypoxia_at_work: Option<f64>,
}

impl Drift {
    /// At an injection and a resting uptake, both L/min STPD; none when the loop volume is not known.
    #[must_use]
    pub fn of(used: &Used, injection_l_min: f64, uptake_l_min: f64) -> Option<Self> {
        let volume_l = used.loop_volume_l?;
        let inert = 1.0 - used.diluent_fraction;
        let rest = inert * bar_min(injection_l_min - uptake_l_min, volume_l);
        let work = inert * bar_min(injection_l_min - used.work_l_min, volume_l);
        let fraction = used.po2_low_bar / used.dive_at_bar_abs;
        let minutes = |from: f64, to: f64, rate: f64| (rate < 0.0).then(|| (from - to) / -rate);
        Some(Self {
            held_bar_min: rest,
            sealed_bar_min: (fraction < 1.0)
                .then(|| (1.0 - fraction) * bar_min(injection_l_min - uptake_l_min, volume_l)),
            minutes_high_to_low: minutes(used.po2_high_bar, used.po2_low_bar, rest),
            minutes_to_hypoxia_at_work: minutes(used.po2_low_bar, HYPOXIA_BAR, work),
        })
    }
}

/// What a flow of dry gas adds to the pressure of a closed volume, bar/min.
fn bar_min(l_min: f64, volume_l: f64) -> f64 {
    let loop_k = Temperature::from_c(LOOP_C).as_k();
    l_min * (STANDARD_ATMOSPHERE_PA / 1e5) * loop_k / (volume_l * ZERO_CELSIUS_K)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::quantity::{Uncertain, Volume};
    use crate::setting::SettingOptions;

    #[test]
    fn drift_is_the_one_of_the_back_of_an_envelope() {
        // 7.0 L loop, air, J 0.25, M 0.30: 0.790 524 · −0.05 · 1.01325 · (306.15/273.15) / 7.0 = −0.006 412 6 bar/min;
        // 0.6 bar at that rate: 93.57 min. Work of 1.5: 0.790 524 · 1.25 · 1.01325 · 1.120 813 / 7.0 = 0.160 32 bar/min,
        // 0.54 bar: 3.368 min.
        let options = SettingOptions {
            loop_volume: Some(Uncertain { value: Volume::from_l(7.0), expanded: None }),
            ..Default::default()
        };
        let used = Used::of(&options).unwrap();
        let drift = Drift::of(&used, 0.25, 0.30).unwrap();
        assert!((drift.held_bar_min + 0.006_412_6).abs() < 5e-8, "{}", drift.held_bar_min);
        assert!((drift.minutes_high_to_low.unwrap() - 93.57).abs() < 0.01);
        assert!((drift.minutes_to_hypoxia_at_work.unwrap() - 3.368).abs() < 5e-4);
        // (1 − 0.7/1.01325)/0.790 524 of that.
        assert!((drift.sealed_bar_min.unwrap() / drift.held_bar_min - 0.391_08).abs() < 5e-5);
    }

    #[test]
    fn a_loop_that_does_not_sink_has_no_minutes_and_an_unknown_loop_no_drift() {
        let options = SettingOptions {
            loop_volume: Some(Uncertain { value: Volume::from_l(7.0), expanded: None }),
            ..Default::default()
        };
        let used = Used::of(&options).unwrap();
        let rising = Drift::of(&used, 0.31, 0.30).unwrap();
        assert!(rising.held_bar_min > 0.0 && rising.minutes_high_to_low.is_none());
        assert_eq!(Drift::of(&used, 1.5, 0.3).unwrap().minutes_to_hypoxia_at_work, None);
        assert_eq!(Drift::of(&Used::of(&SettingOptions::default()).unwrap(), 0.25, 0.3), None);
    }
}
