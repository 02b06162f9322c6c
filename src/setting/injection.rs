//! The injection at an intermediate pressure and a depth, and the chance that it exceeds the uptake there.
//!
//! Comes in: an orifice, the uptake of another day, what the setting uses. Goes out: the injection three ways, its budget
//! and the chance. `J = purity · (α + β·p1)·sqrt(293.15 K/T) · ψ(p2/p1)`.
//!
//! - *nominal*: IP as shown, gas of the water's temperature (20 °C when that is not known), ψ averaged over what is
//!   known of the choke ratio.
//! - *richest*: IP raised by the whole upward spread, coldest gas, ψ of the largest likely choke ratio. The spread is a
//!   bound, not a distribution: it is added, not averaged.
//! - *leanest*: IP as shown, warmest gas, ψ as nominal.
//!
//! `P(J > M)` is that of the richest injection. Normal in it: the line (random part with the variance of its Student
//! distribution, each common source), gauge, repeatability, ambient pressure, purity, gas temperature. Student: another
//! day's uptake. Where the sessions were injected through the same line, an error of the line moves both: what it does to
//! `J` less what it does to `M` counts, and it is taken out of the uptake's own uncertainty. The diver's gauge, the purity
//! and the gas temperature may be shared too; they move `J` and `M` the same way, so taking them as independent can only
//! overstate the chance.

use super::chance::Excess;
use super::options::{FirstStageKind, Used};
use super::resting::RestingUptake;
use crate::bench::choke::ChokeRatio;
use crate::bench::correct::REFERENCE_TEMPERATURE_K;
use crate::gas;
use crate::uptake::InjectionLine;

/// Upper end of the 95 % interval of the choke ratio.
const RICH_QUANTILE: f64 = 0.975;
/// A Student distribution of two degrees of freedom or less has no variance; five points leave at least three.
const FEWEST_DOF: f64 = 3.0;

/// What the injection may be off by.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum InjectionSource {
    /// Scatter of the points of the line.
    LineRandom,
    /// Sources common to all points of the line.
    LineCommon,
    /// The diver's own gauge of the intermediate pressure.
    Gauge,
    /// The first stage's repeatability.
    Repeatability,
    /// The ambient pressure where the IP counts from.
    Barometer,
    /// Purity of the oxygen.
    Purity,
    /// Temperature of the gas at the orifice.
    GasTemperature,
}

/// The injection at one place.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Injected {
    /// Best estimate, L/min STPD of oxygen.
    pub nominal_l_min: f64,
    /// Its standard uncertainty, the upward spread of the IP not in it, L/min.
    pub u_l_min: f64,
    /// With the IP at its upward bound and the coldest gas, L/min.
    pub richest_l_min: f64,
    /// With the warmest gas, L/min.
    pub leanest_l_min: f64,
}

/// An orifice on a first stage, fed to a diver.
#[derive(Debug, Clone)]
pub(super) struct Feed<'a> {
    pub(super) used: &'a Used,
    pub(super) line: InjectionLine,
    pub(super) choke: &'a ChokeRatio,
    pub(super) uptake: &'a RestingUptake,
    /// What the sessions share with this line.
    own: Own,
    rich_b: f64,
}

/// The uptake's uncertainty less what it shares with the line.
#[derive(Debug, Clone, Copy)]
struct Own {
    u: f64,
    dof: f64,
    per_intercept: f64,
    per_slope: f64,
}

impl Own {
    fn of(uptake: &RestingUptake, line: &InjectionLine) -> Self {
        let alone = Self { u: uptake.u_l_min, dof: uptake.dof, per_intercept: 0.0, per_slope: 0.0 };
        let Some(shared) = uptake.shared_lines.iter().find(|s| s.line == *line) else { return alone };
        let (a, b) = (shared.per_intercept, shared.per_slope);
        let combined = line.combined_u(a, b);
        let (total, taken) = (alone.u * alone.u, combined * combined);
        let variance = total - taken;
        if variance <= 0.0 {
            // The line alone explains more than there is: then nothing is known to be shared.
            return alone;
        }
        // Welch-Satterthwaite, undone for what is taken out.
        let random = line.random_u(a, b);
        let random = random * random;
        let quotient = total * total / alone.dof - random * random / line.random_dof;
        let dof = if quotient > 0.0 { variance * variance / quotient } else { f64::INFINITY };
        Self { u: variance.sqrt(), dof, per_intercept: a, per_slope: b }
    }
}

impl<'a> Feed<'a> {
    pub(super) fn new(
        used: &'a Used,
        line: &InjectionLine,
        choke: &'a ChokeRatio,
        uptake: &'a RestingUptake,
    ) -> Self {
        let own = Own::of(uptake, line);
        Self { used, own, line: line.clone(), choke, uptake, rich_b: choke.quantile(RICH_QUANTILE) }
    }

    /// The same with a hole that passes `scale` times as much; another hole shares no error with the sessions.
    pub(super) fn scaled(&self, scale: f64) -> Self {
        let mut line = self.line.clone();
        line.intercept *= scale;
        line.slope *= scale;
        line.intercept_variance *= scale * scale;
        line.slope_variance *= scale * scale;
        line.covariance *= scale * scale;
        for shift in &mut line.common {
            shift.intercept *= scale;
            shift.slope *= scale;
        }
        let own = Own { u: self.uptake.u_l_min, dof: self.uptake.dof, per_intercept: 0.0, per_slope: 0.0 };
        Self { line, own, ..self.clone() }
    }

    /// Absolute pressure upstream of the orifice, bar.
    pub(super) fn p1_bar(&self, ip_bar: f64, depth_m: f64) -> f64 {
        ip_bar
            + match self.used.first_stage {
                FirstStageKind::Uncompensated => self.used.set_at_bar_abs,
                FirstStageKind::Compensated => self.used.ambient_at(depth_m),
            }
    }

    /// The injection at an IP and a depth.
    pub(super) fn injected(&self, ip_bar: f64, depth_m: f64) -> Injected {
        let (p1, p2) = (self.p1_bar(ip_bar, depth_m), self.used.ambient_at(depth_m));
        let passes = 1.0 - self.choke.expected_loss(p2 / p1);
        let nominal = State { p1, kelvin: self.used.nominal_k, passes };
        let leanest = State { kelvin: self.used.warmest_k, ..nominal };
        Injected {
            nominal_l_min: self.flow(&nominal),
            u_l_min: combined(&self.parts(&nominal, (0.0, 0.0))),
            richest_l_min: self.flow(&self.richest(ip_bar, depth_m)),
            leanest_l_min: self.flow(&leanest),
        }
    }

    /// The budget of the nominal injection, L/min.
    pub(super) fn budget(&self, ip_bar: f64, depth_m: f64) -> Vec<(InjectionSource, f64)> {
        let (p1, p2) = (self.p1_bar(ip_bar, depth_m), self.used.ambient_at(depth_m));
        let passes = 1.0 - self.choke.expected_loss(p2 / p1);
        self.parts(&State { p1, kelvin: self.used.nominal_k, passes }, (0.0, 0.0)).to_vec()
    }

    /// The probability that the richest injection exceeds another day's uptake.
    pub(super) fn chance(&self, ip_bar: f64, depth_m: f64) -> f64 {
        let state = self.richest(ip_bar, depth_m);
        let parts = self.parts(&state, (self.own.per_intercept, self.own.per_slope));
        Excess {
            mean: self.flow(&state) - self.uptake.uptake_l_min,
            normal_u: combined(&parts),
            student_u: self.own.u,
            dof: self.own.dof,
        }
        .chance()
    }

    fn richest(&self, ip_bar: f64, depth_m: f64) -> State {
        let p1 = self.p1_bar(ip_bar, depth_m) + self.used.ip_spread_bar;
        let passes = gas::subsonic_factor(self.used.ambient_at(depth_m) / p1, self.rich_b);
        State { p1, kelvin: self.used.coldest_k, passes }
    }

    fn flow(&self, state: &State) -> f64 {
        self.used.purity * self.line.flow(state.p1, state.kelvin) * state.passes
    }

    /// Contributions to `J` less `(per_intercept, per_slope)` of the line's errors, L/min. The slope of ψ is left out of the
    /// pressure's: an IP error is then understated only where the hole is not choked.
    fn parts(&self, state: &State, shared: (f64, f64)) -> [(InjectionSource, f64); 7] {
        let used = self.used;
        let per_flow = used.purity * (REFERENCE_TEMPERATURE_K / state.kelvin).sqrt() * state.passes;
        let (a, b) = (per_flow - shared.0, per_flow * state.p1 - shared.1);
        let dof = self.line.random_dof.max(FEWEST_DOF);
        let widen = if dof.is_finite() { (dof / (dof - 2.0)).sqrt() } else { 1.0 };
        let common: f64 =
            self.line.common.iter().map(|c| a * c.intercept + b * c.slope).map(|shift| shift * shift).sum();
        let per_bar = per_flow * self.line.slope;
        let ambient_u = match used.first_stage {
            FirstStageKind::Uncompensated => used.set_at_u_bar,
            FirstStageKind::Compensated => used.dive_at_u_bar,
        };
        let flow = self.flow(state);
        [
            (InjectionSource::LineRandom, widen * self.line.random_u(a, b)),
            (InjectionSource::LineCommon, common.sqrt()),
            (InjectionSource::Gauge, per_bar * used.gauge_u_bar()),
            (InjectionSource::Repeatability, per_bar * used.repeat_u_bar()),
            (InjectionSource::Barometer, per_bar * ambient_u),
            (InjectionSource::Purity, flow / used.purity * used.purity_u),
            (InjectionSource::GasTemperature, 0.5 * flow / state.kelvin * used.temperature_u_k),
        ]
    }
}

/// Gas upstream of the orifice, and the share of the choked flow that passes.
#[derive(Debug, Clone, Copy)]
struct State {
    p1: f64,
    kelvin: f64,
    passes: f64,
}

fn combined(parts: &[(InjectionSource, f64)]) -> f64 {
    parts.iter().map(|(_, u)| u * u).sum::<f64>().sqrt()
}
