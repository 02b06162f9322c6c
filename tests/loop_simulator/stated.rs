//! Sessions whose every error is drawn from the very distribution that their budget states for it.
//!
//! For the question whether a budget's standard uncertainty is the scatter of whole series made anew. What a simulated diver
//! is beside that (offsets of cells, another time of washout, carbon dioxide that is no dry gas) is left out, because a budget
//! covers it by being wide.

use super::script::{LINE_GAIN, LINE_RANDOM};
use super::{Dice, Errors, Extra, Kind, Scene, Truth, scene_of};
use ebbline::uptake::Source;

/// Every row of a budget that such a session can have.
pub(crate) const ALL_STATED: [Source; 16] = [
    Source::SlopeNoise,
    Source::Wander,
    Source::LoopVolume,
    Source::InjectionLine,
    Source::IpGauge,
    Source::GasTemperature,
    Source::StatedFlow,
    Source::CellGain,
    Source::LoopTemperature,
    Source::CarbonDioxide,
    Source::Barometer,
    Source::Leak,
    Source::Purity,
    Source::Washout,
    Source::Metered,
    Source::Mark,
];

/// What is drawn.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Stated {
    /// Which errors; the others are none.
    pub(crate) rows: fn(Source) -> bool,
    /// Time over which the uptake's wander is alike, minutes. The stated two leave 4 %; at other times it is as much more as
    /// gives the same `σ²·τ`, which is all that the formula of the method (the limit of short times) knows of it.
    pub(crate) wander_min: f64,
    /// Whether a held loop is made up in puffs, so that PO2 ripples, or evenly.
    pub(crate) puffs: bool,
}

impl Stated {
    /// Everything as it is.
    pub(crate) const ALL: Self = Self { rows: |_| true, wander_min: 2.0, puffs: true };
}

/// A session of a kind by a diver who takes up 0.3 L/min.
pub(crate) fn as_stated(kind: Kind, stated: Stated, extra: &Extra, dice: &mut Dice) -> Scene {
    let mut normal = |source, sd: f64| {
        let deviate = dice.normal(0.0, sd);
        if (stated.rows)(source) { deviate } else { 0.0 }
    };
    let (line_a, line_b) = (normal(Source::InjectionLine, 1.0), normal(Source::InjectionLine, 1.0));
    let gain = normal(Source::InjectionLine, LINE_GAIN);
    let first = LINE_RANDOM.0.sqrt();
    let across = LINE_RANDOM.2 / first;
    let rest = (LINE_RANDOM.1 - across * across).sqrt();
    let errors = Errors {
        volume_l: normal(Source::LoopVolume, extra.volume_u_l),
        barometer_bar: normal(Source::Barometer, 0.001),
        flow: normal(Source::StatedFlow, 0.01),
        metered: normal(Source::Metered, 0.01),
        line: (first * line_a - 0.1 * 0.033 * gain, across * line_a + rest * line_b + 0.033 * gain),
        ip_bar: normal(Source::IpGauge, 0.1),
        gas_k: normal(Source::GasTemperature, 2.5),
    };
    let loop_c = 33.0 + normal(Source::LoopTemperature, 2.0);
    let cell_gain = normal(Source::CellGain, 0.01);
    let purity = 0.995 + normal(Source::Purity, 0.0015);
    let mark_off_l = normal(Source::Mark, 0.1);
    let mut between = |source, low: f64, high: f64| {
        let drawn = dice.between(low, high);
        if (stated.rows)(source) { drawn } else { 0.5 * (low + high) }
    };
    let leak = between(Source::Leak, 0.0, 0.004);
    let nitrogen = between(Source::Washout, 0.020, 0.060);
    // Carbon dioxide that is not dry gas, from none to twice 40 % of 5.3 kPa, as so much less of a loop.
    let carbon_dioxide = between(Source::CarbonDioxide, 0.0, 2.0) * 0.4 * 0.053;
    // How much diluent comes in at a time makes the ripple of a held loop.
    let puff_l = dice.between(0.1, 0.3);
    let ambient_bar = 1.013_25;
    let without = 1.0 - carbon_dioxide / (ambient_bar - super::vapour(loop_c));
    let truth = Truth {
        uptake: 0.3,
        wander: if (stated.rows)(Source::Wander) { 0.04 * (2.0 / stated.wander_min).sqrt() } else { 0.0 },
        wander_min: stated.wander_min,
        volume_l: 7.0 * without,
        lungs_l: 2.8 * without,
        loop_c,
        ambient_bar,
        respiratory: 0.85,
        // So little that lungs and bag are one.
        carbon_dioxide_bar: 0.004,
        nitrogen,
        nitrogen_min: 12.0,
        body_bar: 0.75,
        on_loop_min: 10.0,
        leak,
        diluent: 0.209_476,
        purity,
        puff_l: if stated.puffs { puff_l } else { 0.01 },
        cell_gain,
        cell_offsets: [0.0; 3],
        cell_noise: if (stated.rows)(Source::SlopeNoise) { 0.002 } else { 1e-6 },
        cell_lag_min: 0.1,
        last_digit: if (stated.rows)(Source::SlopeNoise) { 0.001 } else { 1e-9 },
        warming_min: 0.0,
        mark_off_l,
    };
    // The record's volume is about the seven litres that there are, carbon dioxide included.
    let errors = Errors { volume_l: errors.volume_l + 7.0 * (1.0 - without), ..errors };
    let extra = Extra { errors: Some(errors), ..*extra };
    scene_of(kind, truth, &extra, dice)
}
