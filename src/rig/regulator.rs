//! The regulator of the rig: IP follows what is set, a little late, a little off, and creeps.

use crate::quantity::GaugePressure;
use crate::stats::monte_carlo::Random;

/// What is set at the regulator and for how long; the last is held on.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Script(pub Vec<(GaugePressure, f64)>);

impl Script {
    /// Steps in bar gauge, each held for `hold_s` seconds.
    #[must_use]
    pub fn of_bar(steps: &[f64], hold_s: f64) -> Self {
        Self(steps.iter().map(|bar| (GaugePressure::from_bar(*bar), hold_s)).collect())
    }

    /// Number of the step in force `t_s` seconds after the beginning, and its IP; none without steps.
    #[must_use]
    pub fn at(&self, t_s: f64) -> Option<(usize, GaugePressure)> {
        let mut ends_s = 0.0;
        for (number, (ip, hold_s)) in self.0.iter().enumerate() {
            ends_s += hold_s;
            if t_s < ends_s {
                return Some((number, *ip));
            }
        }
        let last = self.0.last()?;
        Some((self.0.len() - 1, last.0))
    }

    /// How long all of it takes, seconds.
    #[must_use]
    pub fn lasts_s(&self) -> f64 {
        self.0.iter().map(|(_, hold_s)| hold_s).sum()
    }
}

/// How a regulator behaves. The defaults are common practice, without a source.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RegulatorSettings {
    /// Time constant with which IP follows, seconds.
    pub lag_s: f64,
    /// How far IP creeps up after a step, bar.
    pub creep_bar: f64,
    /// Time constant of the creep, seconds.
    pub creep_s: f64,
    /// How well a hand finds the pressure it wants, standard deviation in bar.
    pub scatter_bar: f64,
}

impl Default for RegulatorSettings {
    fn default() -> Self {
        Self { lag_s: 1.5, creep_bar: 0.01, creep_s: 60.0, scatter_bar: 0.02 }
    }
}

/// A regulator at work.
#[derive(Debug, Clone)]
pub(super) struct Regulator {
    settings: RegulatorSettings,
    script: Script,
    /// Step of the script that is in force; none when the hand is on it.
    step: Option<usize>,
    commanded_bar: f64,
    set_bar: f64,
    since_s: f64,
    ip_bar: f64,
    random: Random,
}

impl Regulator {
    /// Begins settled at the first step of the script, or closed.
    pub(super) fn new(settings: RegulatorSettings, script: Script, random: Random) -> Self {
        let mut new = Self {
            settings,
            script,
            step: None,
            commanded_bar: 0.0,
            set_bar: 0.0,
            since_s: 0.0,
            ip_bar: 0.0,
            random,
        };
        if let Some((step, ip)) = new.script.at(0.0) {
            new.turn(ip);
            new.step = Some(step);
            new.ip_bar = new.set_bar;
        }
        new
    }

    /// Turned by hand: the script is at its end.
    pub(super) fn set(&mut self, ip: GaugePressure) {
        self.script = Script::default();
        self.step = None;
        self.turn(ip);
    }

    fn turn(&mut self, ip: GaugePressure) {
        self.commanded_bar = ip.as_bar();
        // A closed regulator is closed, whatever the hand.
        let scatter = if self.commanded_bar > 0.0 { self.settings.scatter_bar } else { 0.0 };
        self.set_bar = (self.commanded_bar + scatter * self.random.normal()).max(0.0);
        self.since_s = 0.0;
    }

    /// Goes on to `t_s`, `dt_s` after the last time.
    pub(super) fn step(&mut self, t_s: f64, dt_s: f64) {
        if let Some((step, ip)) = self.script.at(t_s)
            && self.step != Some(step)
        {
            self.turn(ip);
            self.step = Some(step);
        }
        self.since_s += dt_s;
        let crept = 1.0 - libm::exp(-self.since_s / self.settings.creep_s.max(1e-9));
        let creep_bar = if self.commanded_bar > 0.0 { self.settings.creep_bar * crept } else { 0.0 };
        let follows = 1.0 - libm::exp(-dt_s / self.settings.lag_s.max(1e-9));
        self.ip_bar += (self.set_bar + creep_bar - self.ip_bar) * follows;
    }

    pub(super) fn commanded(&self) -> GaugePressure {
        GaugePressure::from_bar(self.commanded_bar)
    }

    pub(super) fn ip(&self) -> GaugePressure {
        GaugePressure::from_bar(self.ip_bar)
    }
}
