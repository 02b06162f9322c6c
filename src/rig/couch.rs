//! A diver on a loop: enough of one to log a session.
//!
//! One well-mixed volume, saturated at its temperature, gets the injection and what is added, loses the uptake (which
//! wanders), is made up with diluent when it is held, and vents what no longer fits. Left out: lungs and bag apart, carbon
//! dioxide, nitrogen from the body, leaks, mixing; `tests/loop_simulator` has those for the studies.

use crate::entry::LoopKept;
use crate::gas;
use crate::quantity::{
    AbsolutePressure, STANDARD_ATMOSPHERE_PA, StpdFlow, Temperature, Volume, ZERO_CELSIUS_K,
};
use crate::stats::monte_carlo::Random;

/// What feeds the loop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Feed {
    /// Nothing.
    Off,
    /// A flow of the whole gas.
    Flow(StpdFlow),
    /// The orifice of the bench at its IP.
    Orifice,
}

/// A diver and a loop.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CouchSettings {
    /// Actual volume, lungs included.
    pub volume: Volume,
    /// Mean uptake.
    pub uptake: StpdFlow,
    /// How far the uptake wanders, a share of it, standard deviation.
    pub wander: f64,
    /// Time constant of that, seconds.
    pub wander_s: f64,
    /// How the volume is kept; a topped loop shrinks like a sealed one until oxygen is added.
    pub kept: LoopKept,
    /// Oxygen fraction of the diluent.
    pub diluent: f64,
    /// Oxygen fraction of what is injected and added.
    pub purity: f64,
    /// Temperature of the loop, saturated with water.
    pub temperature: Temperature,
    /// PO2 at the beginning, bar.
    pub po2_bar: f64,
    /// What feeds it at the beginning.
    pub feed: Feed,
}

impl Default for CouchSettings {
    fn default() -> Self {
        Self {
            volume: Volume::from_l(7.5),
            uptake: StpdFlow::from_l_min(0.26),
            wander: 0.04,
            wander_s: 120.0,
            kept: LoopKept::Held,
            diluent: 0.21,
            purity: 0.995,
            temperature: Temperature::from_c(33.0),
            po2_bar: 0.8,
            feed: Feed::Flow(StpdFlow::from_l_min(0.21)),
        }
    }
}

/// A loop being breathed. Amounts are dry litres STPD.
#[derive(Debug, Clone)]
pub(super) struct Couch {
    settings: CouchSettings,
    pub(super) feed: Feed,
    pub(super) uptake_l_min: f64,
    oxygen_l: f64,
    inert_l: f64,
    wander: f64,
    random: Random,
    /// What went in at the last step, oxygen alone, L/min.
    injection_l_min: f64,
    uptake_now_l_min: f64,
    po2_bar: f64,
}

impl Couch {
    pub(super) fn new(settings: CouchSettings, ambient: AbsolutePressure, mut random: Random) -> Self {
        let wander = random.normal();
        let mut new = Self {
            settings,
            feed: settings.feed,
            uptake_l_min: settings.uptake.as_l_min(),
            oxygen_l: 0.0,
            inert_l: 0.0,
            wander,
            random,
            injection_l_min: 0.0,
            uptake_now_l_min: settings.uptake.as_l_min(),
            po2_bar: settings.po2_bar,
        };
        let (dry_pa, full_l) = (new.dry_pa(ambient), new.full_l(ambient));
        let fraction = (settings.po2_bar * 1e5 / dry_pa).clamp(0.0, 1.0);
        new.oxygen_l = fraction * full_l;
        new.inert_l = (1.0 - fraction) * full_l;
        new.see(ambient);
        new
    }

    /// Pressure of the dry gas.
    fn dry_pa(&self, ambient: AbsolutePressure) -> f64 {
        ambient.as_pa() - gas::saturation_pressure(self.settings.temperature).as_pa()
    }

    /// Dry litres STPD that fill the loop.
    fn full_l(&self, ambient: AbsolutePressure) -> f64 {
        let (dry, k) = (self.dry_pa(ambient) / STANDARD_ATMOSPHERE_PA, self.settings.temperature.as_k());
        self.settings.volume.as_l() * dry * ZERO_CELSIUS_K / k
    }

    fn see(&mut self, ambient: AbsolutePressure) {
        let all = self.oxygen_l + self.inert_l;
        self.po2_bar = if all > 0.0 { self.oxygen_l / all * self.dry_pa(ambient) / 1e5 } else { 0.0 };
    }

    /// Adds oxygen of the stated purity, litres STPD.
    pub(super) fn add_oxygen(&mut self, litres: f64) {
        self.oxygen_l += self.settings.purity * litres;
        self.inert_l += (1.0 - self.settings.purity) * litres;
    }

    /// Adds diluent, litres STPD.
    pub(super) fn add_diluent(&mut self, litres: f64) {
        self.oxygen_l += self.settings.diluent * litres;
        self.inert_l += (1.0 - self.settings.diluent) * litres;
    }

    /// Breathes for `dt_s` at `ambient`, while `orifice` passes through the orifice of the bench.
    pub(super) fn step(&mut self, ambient: AbsolutePressure, orifice: StpdFlow, dt_s: f64) {
        let minutes = dt_s / 60.0;
        let whole = match self.feed {
            Feed::Off => 0.0,
            Feed::Flow(flow) => flow.as_l_min(),
            Feed::Orifice => orifice.as_l_min(),
        };
        let stay = libm::exp(-dt_s / self.settings.wander_s.max(1e-9));
        self.wander = stay * self.wander + (1.0 - stay * stay).sqrt() * self.random.normal();
        self.uptake_now_l_min = (self.uptake_l_min * (1.0 + self.settings.wander * self.wander)).max(0.0);
        self.injection_l_min = self.settings.purity * whole;
        self.add_oxygen(whole * minutes);
        self.oxygen_l = (self.oxygen_l - self.uptake_now_l_min * minutes).max(0.0);
        let (full, all) = (self.full_l(ambient), self.oxygen_l + self.inert_l);
        if all > full {
            self.oxygen_l *= full / all;
            self.inert_l *= full / all;
        } else if self.settings.kept == LoopKept::Held {
            self.add_diluent(full - all);
        }
        self.see(ambient);
    }

    /// PO2 in bar.
    pub(super) fn po2_bar(&self) -> f64 {
        self.po2_bar
    }

    /// Oxygen that goes in, and what is taken up, now.
    pub(super) fn flows(&self) -> (StpdFlow, StpdFlow) {
        (StpdFlow::from_l_min(self.injection_l_min), StpdFlow::from_l_min(self.uptake_now_l_min))
    }
}
