//! A diver resting on a loop, simulated independently of the estimator: it knows nothing of slopes, kinds or formulas of
//! the method, only what gas goes where.
//!
//! Two compartments. The *lungs* have a constant volume and hold oxygen, inert gas and carbon dioxide; the *bag*
//! (counterlungs, hoses, scrubber) has what volume its oxygen and inert gas need. Ventilation carries bag gas into the
//! lungs; what no longer fits flows back without its carbon dioxide. The lungs lose the uptake, which wanders, gain carbon
//! dioxide and the nitrogen of one tissue whose tension follows that of the lungs. The bag gets the injection with its
//! impurity, puffs of diluent when it runs low, oxygen when told, and loses a leak and, when overfull, a vent. Three cells
//! see the bag through a lag with a common gain, their own offsets, noise and a last digit.
//!
//! Amounts in litres at 0 °C and 101.325 kPa; pressures in bar; minutes.
#![allow(dead_code, unused_imports)] // Each test file uses its own part.

mod feed;
mod script;
mod stated;

pub(crate) use feed::Feed;
pub(crate) use script::{Errors, Extra, Kind, Scene, scene_of, scene_through, truth};
pub(crate) use stated::{ALL_STATED, Stated, as_stated};

/// Random numbers of the simulator's own: splitmix64 (Steele, Lea and Flood 2014), normal deviates by Box and Muller.
#[derive(Debug, Clone)]
pub(crate) struct Dice(u64);

impl Dice {
    pub(crate) fn new(seed: u64) -> Self {
        Self(seed.wrapping_mul(0x9E37_79B9_7F4A_7C15) ^ 0xD1B5_4A32_D192_ED03)
    }

    pub(crate) fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9E37_79B9_7F4A_7C15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
        z ^ (z >> 31)
    }

    pub(crate) fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * ((self.bits() >> 11) as f64 + 0.5) / (1u64 << 53) as f64
    }

    pub(crate) fn normal(&mut self, mean: f64, sd: f64) -> f64 {
        let (u, v) = (self.between(0.0, 1.0), self.between(0.0, 1.0));
        mean + sd * (-2.0 * libm::log(u)).sqrt() * libm::cos(2.0 * std::f64::consts::PI * v)
    }
}

/// Everything true about a diver, a loop and a day.
#[derive(Debug, Clone)]
pub(crate) struct Truth {
    /// The day's mean uptake.
    pub(crate) uptake: f64,
    pub(crate) wander: f64,
    pub(crate) wander_min: f64,
    /// Actual litres at the first reading, and the lungs' part.
    pub(crate) volume_l: f64,
    pub(crate) lungs_l: f64,
    pub(crate) loop_c: f64,
    pub(crate) ambient_bar: f64,
    /// Carbon dioxide made per oxygen used; ventilation that keeps it at some pressure.
    pub(crate) respiratory: f64,
    pub(crate) carbon_dioxide_bar: f64,
    /// Nitrogen leaving the body on first breathing none, and its time constant.
    pub(crate) nitrogen: f64,
    pub(crate) nitrogen_min: f64,
    pub(crate) body_bar: f64,
    pub(crate) on_loop_min: f64,
    pub(crate) leak: f64,
    pub(crate) diluent: f64,
    pub(crate) purity: f64,
    pub(crate) puff_l: f64,
    pub(crate) cell_gain: f64,
    pub(crate) cell_offsets: [f64; 3],
    pub(crate) cell_noise: f64,
    pub(crate) cell_lag_min: f64,
    pub(crate) last_digit: f64,
    /// Vapour rises from 20 °C to that of the loop with this time constant from the first reading on; zero for at once.
    pub(crate) warming_min: f64,
    /// Litres by which an oxygen add ends above the mark it was to end at.
    pub(crate) mark_off_l: f64,
}

/// How the bag is kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Keeping {
    Sealed,
    Held,
}

/// What is done at a time.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Act {
    /// Whole gas from now on.
    Inject(f64),
    /// Oxygen (with its impurity) added at once.
    Oxygen(f64),
    /// Oxygen added until the loop is back at its volume.
    OxygenToMark,
    /// Diluent added until the loop is back at its volume.
    DiluentToMark,
    Keep(Keeping),
}

/// What the simulation leaves behind.
#[derive(Debug, Clone, Default)]
pub(crate) struct Log {
    pub(crate) time_s: Vec<f64>,
    pub(crate) cells: [Vec<f64>; 3],
    pub(crate) loop_c: Vec<f64>,
    /// Oxygen gas added at each act that added some.
    pub(crate) added: Vec<f64>,
    /// Whole gas injected.
    pub(crate) injected: f64,
    /// Actual litres at the end.
    pub(crate) end_volume_l: f64,
}

/// Saturation pressure of water in bar: Buck's formula of 1996, not the one the tool uses (they agree to 0.1 %).
fn vapour(c: f64) -> f64 {
    0.006_112_1 * libm::exp((18.678 - c / 234.5) * (c / (257.14 + c)))
}

/// Oxygen, inert gas, carbon dioxide.
#[derive(Debug, Clone, Copy, Default)]
struct Gas {
    o: f64,
    n: f64,
    c: f64,
}

impl Gas {
    fn sum(self) -> f64 {
        self.o + self.n + self.c
    }
}

/// Runs a diver from a PO2 of `po2` for `minutes`, doing `acts` (minute, what) in order, read every `every_s`.
pub(crate) fn run(
    truth: &Truth,
    po2: f64,
    minutes: f64,
    every_s: f64,
    acts: &[(f64, Act)],
    dice: &mut Dice,
) -> Log {
    let step = 0.5 / 60.0;
    let temperature = |minute: f64| {
        if truth.warming_min > 0.0 {
            truth.loop_c - (truth.loop_c - 20.0) * libm::exp(-minute.max(0.0) / truth.warming_min)
        } else {
            truth.loop_c
        }
    };
    // Dry litres at standard conditions in one actual litre.
    let density = |c: f64| (truth.ambient_bar - vapour(c)) / 1.013_25 * 273.15 / (c + 273.15);
    let settle = -2.0;
    let (mut c_now, mut k) = (temperature(settle), density(temperature(settle)));
    let dry = truth.ambient_bar - vapour(c_now);
    let f = po2 / dry;
    let bag_l = truth.volume_l - truth.lungs_l;
    let mut bag = Gas { o: f * bag_l * k, n: (1.0 - f) * bag_l * k, c: 0.0 };
    let share_c = truth.carbon_dioxide_bar / dry;
    let full = truth.lungs_l * k;
    let mut lungs = Gas { o: (f - share_c) * full, n: (1.0 - f) * full, c: share_c * full };
    let inert_bar = (1.0 - f) * dry;
    let left = libm::exp(-truth.on_loop_min / truth.nitrogen_min);
    let mut tissue = inert_bar + (truth.body_bar - inert_bar) * left;
    let mut wander = dice.normal(0.0, 1.0);
    let stay = libm::exp(-step / truth.wander_min);
    let stir = (1.0 - stay * stay).sqrt();
    let ventilation = truth.respiratory * truth.uptake / share_c;
    let mut seen = po2;
    let follow = 1.0 - libm::exp(-step / truth.cell_lag_min);
    let mut log = Log::default();
    let (mut inject, mut keeping) = (0.0, Keeping::Held);
    let mut next_act = 0;
    let mut next_reading = 0.0;
    let steps = ((minutes - settle) / step).round() as usize;
    for i in 0..=steps {
        let minute = settle + i as f64 * step;
        if truth.warming_min > 0.0 && minute > 0.0 {
            c_now = temperature(minute);
            k = density(c_now);
        }
        let dry = truth.ambient_bar - vapour(c_now);
        if minute < -1e-9 {
            // Settling: lungs and bag come to terms; the bag is kept at its oxygen fraction and volume.
            let bag_now = bag_l * k;
            bag = Gas { o: f * bag_now, n: (1.0 - f) * bag_now, c: 0.0 };
        }
        while next_act < acts.len() && acts[next_act].0 <= minute + 1e-9 && minute >= -1e-9 {
            let missing = truth.volume_l * k - bag.sum() - lungs.sum();
            let mut oxygen = 0.0;
            match acts[next_act].1 {
                Act::Inject(flow) => inject = flow,
                Act::Oxygen(litres) => oxygen = litres,
                Act::OxygenToMark => oxygen = (missing + truth.mark_off_l * k).max(0.0),
                Act::DiluentToMark => {
                    bag.o += truth.diluent * missing.max(0.0);
                    bag.n += (1.0 - truth.diluent) * missing.max(0.0);
                }
                Act::Keep(next) => keeping = next,
            }
            if oxygen > 0.0 {
                bag.o += truth.purity * oxygen;
                bag.n += (1.0 - truth.purity) * oxygen;
                log.added.push(oxygen);
            }
            next_act += 1;
        }
        if minute >= next_reading - 1e-9 {
            log.time_s.push(next_reading * 60.0);
            for (cell, offset) in log.cells.iter_mut().zip(truth.cell_offsets) {
                let shown = seen / (1.0 + truth.cell_gain) + offset + dice.normal(0.0, truth.cell_noise);
                cell.push((shown / truth.last_digit).round() * truth.last_digit);
            }
            log.loop_c.push(c_now);
            next_reading += every_s / 60.0;
        }
        // One step of breathing.
        wander = stay * wander + stir * dice.normal(0.0, 1.0);
        let uptake = truth.uptake * (1.0 + truth.wander * wander);
        let breath = (ventilation * step).min(0.5 * bag.sum());
        let of_bag = breath / bag.sum();
        let (o_in, n_in) = (bag.o * of_bag, bag.n * of_bag);
        bag.o -= o_in;
        bag.n -= n_in;
        let in_lungs = dry * lungs.n / lungs.sum();
        let given_off = truth.nitrogen * (tissue - in_lungs) / truth.body_bar * step;
        tissue += (in_lungs - tissue) / truth.nitrogen_min * step;
        lungs.o += o_in - uptake * step;
        lungs.n += n_in + given_off;
        lungs.c += truth.respiratory * uptake * step;
        let over = (lungs.sum() - truth.lungs_l * k) / lungs.sum();
        bag.o += over * lungs.o;
        bag.n += over * lungs.n;
        lungs.o -= over * lungs.o;
        lungs.n -= over * lungs.n;
        lungs.c -= over * lungs.c;
        if minute >= -1e-9 {
            bag.o += truth.purity * inject * step;
            bag.n += (1.0 - truth.purity) * inject * step;
            log.injected += inject * step;
            let lost = truth.leak * step / bag.sum();
            bag.o -= lost * bag.o;
            bag.n -= lost * bag.n;
            if keeping == Keeping::Held {
                let volume = (bag.sum() + lungs.sum()) / k;
                if volume < truth.volume_l - truth.puff_l / 2.0 {
                    bag.o += truth.diluent * truth.puff_l * k;
                    bag.n += (1.0 - truth.diluent) * truth.puff_l * k;
                } else if volume > truth.volume_l + truth.puff_l / 2.0 {
                    let out = (volume - truth.volume_l - truth.puff_l / 2.0) * k / bag.sum();
                    bag.o -= out * bag.o;
                    bag.n -= out * bag.n;
                }
            }
        }
        seen += follow * (dry * bag.o / bag.sum() - seen);
        log.end_volume_l = (bag.sum() + lungs.sum()) / k;
    }
    log
}
