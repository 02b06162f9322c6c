//! What is true on the rig: regulator, orifice, room and loop, stepped in time.

use super::couch::{Couch, CouchSettings, Feed};
use super::hole::Hole;
use super::regulator::{Regulator, RegulatorSettings, Script};
use crate::gas::{self, Species, Water};
use crate::quantity::{AbsolutePressure, GaugePressure, Length, StpdFlow, Temperature, Volume};
use crate::stats::monte_carlo::Random;

/// A slow wave about a value, with a phase drawn from the seed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Drift {
    /// Half of what it goes up and down, in the unit of what drifts.
    pub by: f64,
    /// Seconds from one crest to the next.
    pub period_s: f64,
}

/// A bench.
#[derive(Debug, Clone, PartialEq)]
pub struct BenchSettings {
    /// The orifice.
    pub hole: Hole,
    /// The gas before it.
    pub gas: Species,
    /// What is set at the regulator.
    pub script: Script,
    /// How the regulator behaves.
    pub regulator: RegulatorSettings,
    /// Temperature of the gas at the orifice.
    pub temperature: Temperature,
    /// Its drift in kelvins.
    pub temperature_drift: Drift,
    /// Ambient pressure.
    pub barometer: AbsolutePressure,
    /// Its drift in pascals.
    pub barometer_drift: Drift,
    /// Depth of the loop in fresh water, and of the orifice's outlet.
    pub depth: Length,
    /// The loop.
    pub couch: CouchSettings,
}

impl Default for BenchSettings {
    /// An orifice that passes about 0.48 L/min STPD of oxygen at 10 bar, swept up and down, 45 s a step.
    fn default() -> Self {
        let steps: Vec<f64> = (4..=13).chain((4..13).rev()).map(f64::from).collect();
        Self {
            hole: Hole { diameter: Length::from_um(73.6), choke_ratio: 0.50, k: 2.0 },
            gas: Species::Oxygen,
            script: Script::of_bar(&steps, 45.0),
            regulator: RegulatorSettings::default(),
            temperature: Temperature::from_c(21.0),
            temperature_drift: Drift { by: 0.4, period_s: 5_400.0 },
            barometer: AbsolutePressure::from_pa(100_920.0),
            barometer_drift: Drift { by: 40.0, period_s: 14_400.0 },
            depth: Length::from_m(0.0),
            couch: CouchSettings::default(),
        }
    }
}

/// What is true at a time.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Truth {
    /// Seconds since the rig began.
    pub time_s: f64,
    /// What was wanted of the regulator.
    pub commanded: GaugePressure,
    /// IP over the barometer.
    pub ip: GaugePressure,
    /// What passes the orifice.
    pub flow: StpdFlow,
    /// Temperature of the gas at the orifice.
    pub temperature: Temperature,
    /// Ambient pressure of the room.
    pub barometer: AbsolutePressure,
    /// Depth of the loop.
    pub depth: Length,
    /// PO2 of the loop in bar.
    pub po2_bar: f64,
    /// Oxygen that goes into the loop.
    pub injection: StpdFlow,
    /// Oxygen that the diver uses just now.
    pub uptake: StpdFlow,
}

/// A bench at work.
#[derive(Debug, Clone)]
pub(super) struct Bench {
    settings: BenchSettings,
    regulator: Regulator,
    couch: Couch,
    depth: Length,
    /// Phases of the drifts of temperature and barometer, radians.
    phases: (f64, f64),
    truth: Truth,
}

impl Bench {
    /// The bench of a seed. Streams 0 to 2 of the generator are its own.
    pub(super) fn new(settings: BenchSettings, seed: u64) -> Self {
        let mut random = Random::new(seed, 0);
        let mut phase = || random.rectangular(0.0, 2.0 * std::f64::consts::PI);
        let phases = (phase(), phase());
        let regulator = Regulator::new(settings.regulator, settings.script.clone(), Random::new(seed, 1));
        let barometer = barometer(&settings, phases.1, 0.0);
        let ambient = gas::at_depth(barometer, settings.depth, Water::Fresh);
        let couch = Couch::new(settings.couch, ambient, Random::new(seed, 2));
        let truth = Truth {
            time_s: 0.0,
            commanded: regulator.commanded(),
            ip: regulator.ip(),
            flow: StpdFlow::from_m3_s(0.0),
            temperature: settings.temperature,
            barometer,
            depth: settings.depth,
            po2_bar: couch.po2_bar(),
            injection: StpdFlow::from_m3_s(0.0),
            uptake: settings.couch.uptake,
        };
        let mut new = Self { depth: settings.depth, settings, regulator, couch, phases, truth };
        new.see(0.0, 0.0);
        new
    }

    /// Goes on to `t_s`, `dt_s` after the last time.
    pub(super) fn step(&mut self, t_s: f64, dt_s: f64) {
        self.regulator.step(t_s, dt_s);
        self.see(t_s, dt_s);
    }

    fn see(&mut self, t_s: f64, dt_s: f64) {
        let of = &self.settings;
        let barometer = barometer(of, self.phases.1, t_s);
        let wave = wave(of.temperature_drift, self.phases.0, t_s);
        let temperature = Temperature::from_k(of.temperature.as_k() + wave);
        let ambient = gas::at_depth(barometer, self.depth, Water::Fresh);
        let ip = self.regulator.ip();
        // A first stage that does not follow depth: IP stands over the barometer, the outlet at depth.
        let flow = of.hole.flow(of.gas, ip.above(barometer), ambient, temperature);
        if dt_s > 0.0 {
            self.couch.step(ambient, flow, dt_s);
        }
        let (injection, uptake) = self.couch.flows();
        self.truth = Truth {
            time_s: t_s,
            commanded: self.regulator.commanded(),
            ip,
            flow,
            temperature,
            barometer,
            depth: self.depth,
            po2_bar: self.couch.po2_bar(),
            injection,
            uptake,
        };
    }

    pub(super) fn truth(&self) -> &Truth {
        &self.truth
    }

    pub(super) fn gas(&self) -> Species {
        self.settings.gas
    }

    pub(super) fn set_ip(&mut self, ip: GaugePressure) {
        self.regulator.set(ip);
    }

    pub(super) fn set_depth(&mut self, depth: Length) {
        self.depth = depth;
    }

    pub(super) fn set_feed(&mut self, feed: Feed) {
        self.couch.feed = feed;
    }

    pub(super) fn set_uptake(&mut self, uptake: StpdFlow) {
        self.couch.uptake_l_min = uptake.as_l_min();
    }

    pub(super) fn add_oxygen(&mut self, stpd: Volume) {
        self.couch.add_oxygen(stpd.as_l());
    }

    pub(super) fn add_diluent(&mut self, stpd: Volume) {
        self.couch.add_diluent(stpd.as_l());
    }
}

fn barometer(settings: &BenchSettings, phase: f64, t_s: f64) -> AbsolutePressure {
    AbsolutePressure::from_pa(settings.barometer.as_pa() + wave(settings.barometer_drift, phase, t_s))
}

fn wave(drift: Drift, phase: f64, t_s: f64) -> f64 {
    drift.by * libm::sin(2.0 * std::f64::consts::PI * t_s / drift.period_s.max(1e-9) + phase)
}
