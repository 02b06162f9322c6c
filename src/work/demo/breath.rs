//! The invented diver at rest on a loop: one well-stirred volume, an uptake that wanders, three cells.
//!
//! Comes in: what is true of diver, loop and day, and what is done when; a source of random numbers with a fixed seed.
//! Goes out: the readings as a handset would have written them. Amounts in litres STPD, pressures in bar, minutes.
//! Left out: mixing, the lungs as a volume of their own, a leak.

use crate::entry::{CellReadings, CellSignal, SessionReadings};
use crate::gas;
use crate::quantity::Temperature;
use crate::stats::monte_carlo::Random;

/// Seconds from one step to the next, and from one reading to the next.
const STEP_S: f64 = 0.5;
const EVERY_S: f64 = 2.0;
/// Standard deviation and correlation time of the uptake's wander.
const WANDER: f64 = 0.035;
const WANDER_MIN: f64 = 2.0;
/// Nitrogen that leaves the body at first, and how fast that fades.
const NITROGEN_L_MIN: f64 = 0.038;
const NITROGEN_MIN: f64 = 12.0;
/// Carbon dioxide in the lungs' part of the loop.
const CARBON_DIOXIDE_BAR: f64 = 0.4 * 0.053;
/// What the three cells are off by: a gain they share, an offset each; their lag and their noise.
const CELL_GAIN: f64 = 1.004;
const CELL_OFFSETS_BAR: [f64; 3] = [0.004, -0.003, 0.001];
const CELL_LAG_S: f64 = 6.0;
const CELL_NOISE_BAR: f64 = 0.002;

/// What is true of diver, loop and day.
#[derive(Debug, Clone, Copy)]
pub(super) struct Truth {
    /// Uptake on that day.
    pub(super) uptake_l_min: f64,
    /// Actual litres at the first reading, lungs included.
    pub(super) volume_l: f64,
    pub(super) loop_c: f64,
    pub(super) barometer_bar: f64,
    /// Time on the loop before the first reading.
    pub(super) on_loop_min: f64,
    /// Oxygen in the diluent, and in what is injected.
    pub(super) diluent: f64,
    pub(super) purity: f64,
}

/// What is done.
#[derive(Debug, Clone, Copy)]
pub(super) enum Act {
    /// Whole gas injected from now on.
    Inject(f64),
    /// Flushed with oxygen until PO2 is this.
    OxygenTo(f64),
}

/// Lets the diver rest for `minutes` from a PO2 on; `held` makes up the volume with diluent.
pub(super) fn breathe(
    truth: &Truth,
    po2_bar: f64,
    minutes: f64,
    held: bool,
    acts: &[(f64, Act)],
    random: &mut Random,
) -> SessionReadings {
    let vapour = gas::saturation_pressure(Temperature::from_c(truth.loop_c)).as_bar();
    let dry_bar = truth.barometer_bar - vapour;
    let litres = |bar: f64| truth.volume_l * bar / 1.013_25 * 273.15 / (truth.loop_c + 273.15);
    let full = litres(dry_bar - CARBON_DIOXIDE_BAR);
    let (mut oxygen, mut inert) = (full * po2_bar / dry_bar, full * (1.0 - po2_bar / dry_bar));
    let (mut wander, mut seen, mut inject) = (random.normal(), po2_bar, 0.0);
    let step_min = STEP_S / 60.0;
    let stays = libm::exp(-step_min / WANDER_MIN);
    let stirs = (1.0 - stays * stays).sqrt();
    let follows = 1.0 - libm::exp(-STEP_S / CELL_LAG_S);
    let mut time_s = Vec::new();
    let mut cells: [Vec<f64>; 3] = Default::default();
    let mut acts = acts.iter().peekable();
    let every = (EVERY_S / STEP_S) as usize;
    for i in 0..=(minutes * 60.0 / STEP_S) as usize {
        let minute = i as f64 * step_min;
        while let Some((_, act)) = acts.next_if(|(at, _)| *at <= minute + 1e-9) {
            match act {
                Act::Inject(flow) => inject = *flow,
                Act::OxygenTo(po2) => {
                    let all = oxygen + inert;
                    oxygen = all * po2 / dry_bar;
                    inert = all - oxygen;
                }
            }
        }
        let fraction = oxygen / (oxygen + inert);
        seen += (fraction * dry_bar - seen) * follows;
        if i % every == 0 {
            time_s.push(minute * 60.0);
            for (cell, offset) in cells.iter_mut().zip(CELL_OFFSETS_BAR) {
                let shown = seen * CELL_GAIN + offset + CELL_NOISE_BAR * random.normal();
                cell.push(libm::round(shown * 1e3) / 1e3);
            }
        }
        wander = stays * wander + stirs * random.normal();
        let uptake = truth.uptake_l_min * (1.0 + WANDER * wander);
        let washed = NITROGEN_L_MIN * libm::exp(-(truth.on_loop_min + minute) / NITROGEN_MIN);
        oxygen += (truth.purity * inject - uptake) * step_min;
        inert += ((1.0 - truth.purity) * inject + washed) * step_min;
        if held && oxygen + inert < full {
            let missing = full - oxygen - inert;
            oxygen += truth.diluent * missing;
            inert += (1.0 - truth.diluent) * missing;
        } else if held {
            // More goes in than is used: the loop vents what it holds.
            let share = full / (oxygen + inert);
            oxygen *= share;
            inert *= share;
        }
    }
    let names = ["c1", "c2", "c3"];
    let cells = names
        .into_iter()
        .zip(cells)
        .map(|(name, bar)| CellReadings { name: name.to_owned(), signal: CellSignal::Bar(bar) })
        .collect();
    SessionReadings { time_s, cells, depth_m: None, loop_temperature_k: None }
}
