//! A simulated study of settings on another day, by a simulator of its own: how often does the recommended injection exceed
//! the true uptake, and how much of the uptake is left to add by hand?
//!
//! Drawn for each case: the hole and what the bench misread; the diver's mean uptake, the days of the sessions and the day of
//! the dive (about 5 % from day to day, itself known with eight degrees of freedom), what the sessions misread; the IP gauge, how the IP comes back, how far it rises; the
//! weather, the oxygen, the water. The room sees the bench's line, the sessions' prediction and the papers; the truth is kept.

#![allow(clippy::print_stdout, reason = "a study tells what it found")]

use crate::setting_support::*;
use crate::simulator::Random;
use ebbline::entry::Purity;
use ebbline::quantity::{GaugePressure, Temperature, Uncertain};
use ebbline::setting::{OrificeInput, RestingUptake, SettingOptions, setting};
use ebbline::uptake::SharedLine;

/// Day-to-day spread of the uptake, relative, one standard deviation.
const DAY: f64 = 0.05;
/// What a session misreads on its own, relative, one standard deviation.
const SESSION: f64 = 0.035;
/// Degrees of freedom of the stated spread between days.
const DAY_DOF: f64 = 8.0;
/// Cases a study draws; fewer would not tell what is forgotten from chance.
const CASES: usize = 1_500;

/// Where IP and water are among what is possible.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Upward {
    /// Anywhere within their bounds.
    Within,
    /// At the bounds: the IP risen by its whole spread, water that is not known as cold as it gets.
    AtBounds,
}

/// What is left out on purpose.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Forgotten {
    Nothing,
    /// The setting takes the sessions' own uncertainty for another day's.
    AnotherDay,
    /// The gauge is believed.
    Gauge,
    /// The IP is believed to stay.
    Spread,
    /// Water that is not known is believed to be of 20 °C.
    ColdWater,
}

struct Case {
    orifice: OrificeInput,
    uptake: RestingUptake,
    options: SettingOptions,
    /// The true uptake on the day of the dive, L/min.
    uptake_that_day: f64,
    /// The true line.
    line: (f64, f64),
    /// True IP less what the gauge shows, bar, the rise in it.
    ip_error: f64,
    /// True ambient pressure where set, bar.
    ambient: f64,
    purity: f64,
    gas_k: f64,
}

impl Case {
    fn draw(random: &mut Random, upward: Upward, gauge_expanded: f64, forgotten: Forgotten) -> Self {
        let slope = random.uniform(0.018, 0.036);
        let seen = bench_line(slope);
        // The truth lies about what was seen as the papers say: a random part, and each common source.
        let (sa, sb) = (seen.intercept_variance.sqrt(), seen.slope_variance.sqrt());
        let r = seen.covariance / (sa * sb);
        let (x, y) = (random.normal(1.0), random.normal(1.0));
        let mut line = (seen.intercept + sa * x, seen.slope + sb * (r * x + (1.0 - r * r).sqrt() * y));
        for shift in &seen.common {
            let z = random.normal(1.0);
            line = (line.0 + z * shift.intercept, line.1 + z * shift.slope);
        }
        let mean = random.uniform(9.5, 11.5) * slope;
        // The day-to-day spread of this diver: the stated one, as well as eight degrees of freedom know it.
        let chi_squared: f64 = (0..DAY_DOF as usize).map(|_| random.normal(1.0).powi(2)).sum();
        let day_spread = DAY * (DAY_DOF / chi_squared).sqrt();
        let days = random.whole(1, 3);
        let shared = random.chance(0.5);
        // Injected at 9 bar absolute: what the line was off by there is in every session.
        let line_error = (seen.intercept - line.0) + 9.0 * (seen.slope - line.1);
        let k = days as f64;
        let measured: f64 = (0..days)
            .map(|_| mean * (1.0 + random.normal(day_spread)) * (1.0 + random.normal(SESSION)))
            .sum::<f64>()
            / k;
        let measured = measured + if shared { line_error } else { 0.0 };
        let line_u = if shared { seen.combined_u(1.0, 9.0) } else { 0.0 };
        let own = (measured * SESSION).powi(2) / k + line_u * line_u;
        let day = (measured * DAY).powi(2) * (1.0 + 1.0 / k);
        let (u, dof) = match forgotten {
            Forgotten::AnotherDay => (own.sqrt(), f64::INFINITY),
            _ => ((own + day).sqrt(), DAY_DOF * (own + day).powi(2) / day.powi(2)),
        };
        let shared_lines = if shared {
            vec![SharedLine { line: seen.clone(), per_intercept: 1.0, per_slope: 9.0 }]
        } else {
            Vec::new()
        };
        let water = random.chance(0.5).then(|| random.uniform(4.0, 30.0));
        let gas_c = match (water, upward) {
            (Some(c), _) => c + random.normal(0.5),
            (None, Upward::Within) => random.uniform(4.0, 30.0),
            (None, Upward::AtBounds) => 4.0,
        };
        let spread = random.uniform(0.1, 0.4);
        let rise = match upward {
            Upward::Within => random.uniform(0.0, spread),
            Upward::AtBounds => spread,
        };
        let unless = |what, seen: f64| if forgotten == what { 0.0 } else { seen };
        let water = if forgotten == Forgotten::ColdWater { water.or(Some(20.0)) } else { water };
        let options = SettingOptions {
            ip_range: Some((GaugePressure::from_bar(5.0), GaugePressure::from_bar(12.5))),
            gauge_error: bar(unless(Forgotten::Gauge, gauge_expanded)),
            ip_spread: bar(unless(Forgotten::Spread, spread)),
            ip_repeat: bar(0.1),
            water_temperature: water.map(|c| Uncertain { value: Temperature::from_c(c), expanded: None }),
            oxygen: Some(Purity { fraction: 0.995, expanded: 0.003 }),
            ..Default::default()
        };
        Self {
            uptake: RestingUptake { shared_lines, ..diver(measured, u, dof) },
            orifice: orifice("A", seen),
            options,
            uptake_that_day: mean * (1.0 + random.normal(day_spread)),
            line,
            ip_error: random.normal(gauge_expanded / 2.0) + random.normal(0.05) + rise,
            ambient: 1.013_25 + random.normal(0.015),
            purity: (0.995 + random.normal(0.0015)).min(1.0),
            gas_k: gas_c + 273.15,
        }
    }

    /// The true injection at a shown IP, L/min.
    fn injected(&self, ip_bar: f64) -> f64 {
        let p1 = ip_bar + self.ip_error + self.ambient;
        self.purity * (self.line.0 + self.line.1 * p1) * (293.15 / self.gas_k).sqrt()
    }
}

/// What a study came to.
#[derive(Debug)]
struct Outcome {
    set: usize,
    overfed: f64,
    median_shortfall: f64,
}

fn study(upward: Upward, gauge_expanded: f64, forgotten: Forgotten) -> Outcome {
    let mut random = Random::new(417);
    let mut shortfalls = Vec::new();
    for _ in 0..CASES {
        let case = Case::draw(&mut random, upward, gauge_expanded, forgotten);
        let set = setting(std::slice::from_ref(&case.orifice), Some(&case.uptake), &case.options)
            .expect("a good call");
        let Some((_, described)) = set.recommended() else { continue };
        shortfalls.push(1.0 - case.injected(described.at.ip_bar_gauge) / case.uptake_that_day);
    }
    shortfalls.sort_by(f64::total_cmp);
    let overfed = shortfalls.iter().filter(|s| **s < 0.0).count();
    let outcome = Outcome {
        set: shortfalls.len(),
        overfed: overfed as f64 / shortfalls.len() as f64,
        median_shortfall: shortfalls[shortfalls.len() / 2],
    };
    println!("{upward:?}, gauge ±{gauge_expanded} bar, {forgotten:?} forgotten: {outcome:?}");
    outcome
}

/// Twice the standard deviation of the share of cases that happen with the stated chance.
fn sampling(outcome: &Outcome) -> f64 {
    2.0 * (0.025 * 0.975 / outcome.set as f64).sqrt()
}

#[test]
fn on_another_day_overfeed_is_no_oftener_than_stated_and_the_rest_is_little() {
    let outcome = study(Upward::Within, 0.5, Forgotten::Nothing);
    assert!(outcome.set * 4 > CASES * 3, "too many refusals: {outcome:?}");
    assert!(outcome.overfed <= 0.025 + sampling(&outcome), "{outcome:?}");
    assert!(outcome.median_shortfall < 0.22, "{outcome:?}");
}

#[test]
fn at_the_upward_bounds_the_stated_chance_is_the_real_one() {
    // Rounded down to a tenth of a bar the chance is a little less than stated; under half of it would be timid.
    for gauge in [0.5, 1.0] {
        let outcome = study(Upward::AtBounds, gauge, Forgotten::Nothing);
        assert!(outcome.overfed <= 0.025 + sampling(&outcome), "{outcome:?}");
        assert!(outcome.overfed >= 0.0125, "{outcome:?}");
    }
}

#[test]
fn each_thing_forgotten_breaks_the_study() {
    use Forgotten::{AnotherDay, ColdWater, Gauge, Spread};
    for (gauge, forgotten) in [(0.5, AnotherDay), (1.0, Gauge), (0.5, Spread), (0.5, ColdWater)] {
        let outcome = study(Upward::AtBounds, gauge, forgotten);
        assert!(outcome.overfed > 0.025 + sampling(&outcome), "{forgotten:?}: {outcome:?}");
    }
}
