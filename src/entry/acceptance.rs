//! The limits an orifice is accepted by.

use super::Id;
use crate::gas::Species;
use crate::quantity::{GaugePressure, StpdFlow};

/// How far the flow may be from nominal.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Tolerance {
    /// A share of the nominal flow.
    Relative(f64),
    /// A flow.
    Flow(StpdFlow),
}

/// Decision rule (ILAC-G8:09/2019; JCGM 106:2012, clause 8).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Rule {
    /// Simple acceptance: the value decides.
    Simple,
    /// Guarded on both sides by the expanded uncertainty: in between is undecided.
    Guarded,
}

/// What an orifice must show at one nominal pressure.
#[derive(Debug, Clone, PartialEq)]
pub struct Acceptance {
    /// Its name in the register, if it has one.
    pub id: Option<Id>,
    /// Nominal intermediate pressure.
    pub ip: GaugePressure,
    /// Nominal flow at 1.01325 bar ambient and 20 °C gas.
    pub flow: StpdFlow,
    /// The gas the nominal flow is meant for; none means the gas of the run.
    pub gas: Option<Species>,
    /// How far the flow may be off.
    pub tolerance: Tolerance,
    /// Decision rule.
    pub rule: Rule,
    /// Limits of the checks.
    pub limits: Limits,
}

/// Limits of the checks; shares are of the flow at the nominal pressure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Limits {
    /// Departure from straight at mid-span.
    pub straight: f64,
    /// Mean difference of rising and falling sweep.
    pub hysteresis: f64,
    /// Scatter of repeated points.
    pub repeat: f64,
    /// Drift over the run.
    pub steady: f64,
    /// Significance level of the tests that go with them.
    pub significance: f64,
    /// Where the line may cross the pressure axis, lowest and highest, in pascals absolute.
    pub crossing_pa: (f64, f64),
    /// Largest |E_n| against the run before.
    pub en: f64,
    /// Largest fall of pressure with the outlet blanked, in pascals per second.
    pub leak_pa_s: f64,
}

impl Limits {
    /// The limits where the shop states none (common practice, no source; the crossing is explained in `bench`).
    pub const DEFAULT: Self = Self {
        straight: 0.005,
        hysteresis: 0.005,
        repeat: 0.005,
        steady: 0.003,
        significance: 0.01,
        crossing_pa: (0.0, 25_000.0),
        en: 1.0,
        leak_pa_s: 0.01e5 / 60.0,
    };
}

impl Default for Limits {
    fn default() -> Self {
        Self::DEFAULT
    }
}
