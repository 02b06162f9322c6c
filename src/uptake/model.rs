//! The loop: what each segment says about uptake and dry gas.
//!
//! Comes in: segments, stages and binned readings, and a [`Shift`] that moves any source of error. Goes out: for each
//! segment an observation `(y, net)` of the one line that all kinds of segment lie on,
//!
//! `y = β·(net − M)`, with `β = 1/N₀`, the dry gas at the first reading, and `M` the uptake, both common.
//!
//! `f = PO2/(p_amb − p_H2O)`; `J` injected oxygen; `W` nitrogen from the body and what is no oxygen in the injection;
//! `L` leak of loop gas; `f_d` the diluent; `g = N/N₀` at the segment; a prime is a slope against time.
//!
//! | kind | y | net |
//! |---|---|---|
//! | held | `g·(f' + (f − f_d)·N'/N)/(1 − f_d)` | `J − W·f_d/(1 − f_d) − L·(f − f_d)/(1 − f_d)` |
//! | venting | `g·f'/(1 − f)` | `J − W·f/(1 − f)` |
//! | sealed | `g_s·(1 − f_s)·i·[1/(1 − f)]'` | `J − W·f/(1 − f)` |
//! | topped | `(f_e·g_e − f_s·g_s)/t` | `J + (adds − vented)/t − f·L`, or `drop/t − f·L` |
//!
//! `N'/N` is not zero only with a column of depth or temperature: dry gas that leaves a warming loop of constant
//! volume leaves less to make up. `g_s` and `f_s` stand at the beginning of the sealed stage and are carried through it:
//! `i = 1 + ∫(W − L·(1 − f))/N_inert`, so that oxygen adds leave the yardstick as it is. A topped loop is back at its
//! volume right after the last add; from there to the end it shrinks as a sealed one.
//!
//! Nitrogen: `W₀·e^(−t/τ)·(P_body − P_loop)/P_body`, weighted over a segment as its slope weighs it
//! (`6·u·(1 − u)`). Carbon dioxide: method and budget count the lungs' part of it as not being dry gas. When it replaces
//! the oxygen taken up mole for mole, it does not change the capacity for oxygen at all; its row therefore reaches from
//! none to twice the correction.
//!
//! Left out: oxygen stores of blood and tissue (about 0.5 mL/min while PO2 sinks by 0.2 bar in 20 minutes, from 9 mL
//! of plasma oxygen), and the lungs' own temperature.

use std::ops::Range;

use super::contents::Contents;
use super::cylinder::contents_l;
use super::given::Given;
use super::injection::InjectionLine;
use super::segment::{Kind, Rate, Segment, Shift, Stage};
use super::why_not::StretchLeftOut;
use crate::bench::correct::REFERENCE_TEMPERATURE_K;
use crate::entry::{Cylinder, Feeds};
use crate::quantity::{STANDARD_ATMOSPHERE_PA, ZERO_CELSIUS_K};

/// Standard pressure, bar.
const STANDARD_BAR: f64 = STANDARD_ATMOSPHERE_PA / 1e5;

/// What a segment says: `y = β·(net − M)`.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Observation {
    /// Per minute.
    pub(super) y: f64,
    /// L/min STPD.
    pub(super) net: f64,
    /// Change of `y` for one unit of the fitted variable's slope.
    pub(super) per_slope: f64,
    /// Mean oxygen fraction.
    pub(super) fraction: f64,
    /// Oxygen injected, L/min STPD.
    pub(super) injected: f64,
    /// What a held loop gets beside the injection before it needs diluent: nitrogen and impurity, less the leak and less
    /// what leaves a warming loop, L/min.
    pub(super) inert: f64,
    /// Change of the oxygen fraction per minute times `g`; its change for one unit of the slope; and what it would be over
    /// β, in L/min, at the balance above which the loop vents.
    pub(super) drift: f64,
    pub(super) per_drift: f64,
    pub(super) drift_at_balance: f64,
}

/// A session, ready to be estimated.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Model {
    pub(super) given: Given,
    pub(super) line: Option<InjectionLine>,
    pub(super) first_s: f64,
    pub(super) last_s: f64,
    /// Per bin: mean time, first and last reading, PO2, ambient pressure, vapour and its change per kelvin (all bar).
    pub(super) time_s: Vec<f64>,
    pub(super) ends_s: Vec<(f64, f64)>,
    pub(super) po2: Vec<f64>,
    pub(super) ambient: Vec<f64>,
    pub(super) vapour: Vec<f64>,
    pub(super) vapour_per_k: Vec<f64>,
    pub(super) loop_k: Vec<f64>,
    /// Share of the first washout that is left, and inert share of the dry gas.
    pub(super) washout: Vec<f64>,
    pub(super) inert_share: Vec<f64>,
    /// Minutes from the middle of the bin's segment.
    pub(super) lever: Vec<f64>,
    /// Whether depth or temperature change from bin to bin.
    pub(super) varies: bool,
    /// From when which injection is in force.
    pub(super) rates: Vec<(f64, Option<Rate>)>,
    pub(super) stages: Vec<Stage>,
    pub(super) segments: Vec<Segment>,
    pub(super) left_out: Vec<StretchLeftOut>,
}

impl Model {
    pub(super) fn empty(given: Given, line: Option<InjectionLine>, first_s: f64, last_s: f64) -> Self {
        Self {
            given,
            line,
            first_s,
            last_s,
            time_s: Vec::new(),
            ends_s: Vec::new(),
            po2: Vec::new(),
            ambient: Vec::new(),
            vapour: Vec::new(),
            vapour_per_k: Vec::new(),
            loop_k: Vec::new(),
            washout: Vec::new(),
            inert_share: Vec::new(),
            lever: Vec::new(),
            varies: false,
            rates: Vec::new(),
            stages: Vec::new(),
            segments: Vec::new(),
            left_out: Vec::new(),
        }
    }

    /// Bins whose readings all lie between two times.
    pub(super) fn bins_between(&self, from_s: f64, to_s: f64) -> Range<usize> {
        let start = self.ends_s.partition_point(|ends| ends.0 < from_s);
        // A reading at the very moment of an event may already show it; the last reading of all has no event after it.
        let last_s = self.ends_s.last().map_or(f64::INFINITY, |ends| ends.1);
        let end = self.ends_s.partition_point(|ends| ends.1 < to_s || (to_s >= last_s && ends.1 <= to_s));
        start..end.max(start)
    }

    /// Removes the bins that touch an exclusion.
    pub(super) fn exclude(&mut self, exclusions: &[(f64, f64)]) {
        if exclusions.is_empty() {
            return;
        }
        let keep: Vec<bool> = self
            .ends_s
            .iter()
            .map(|(from, to)| !exclusions.iter().any(|(out, until)| to >= out && from <= until))
            .collect();
        fn sift<T: Copy>(values: &mut Vec<T>, keep: &[bool]) {
            let mut at = 0;
            values.retain(|_| {
                at += 1;
                keep[at - 1]
            });
        }
        sift(&mut self.time_s, &keep);
        sift(&mut self.ends_s, &keep);
        for column in [
            &mut self.po2,
            &mut self.ambient,
            &mut self.vapour,
            &mut self.vapour_per_k,
            &mut self.loop_k,
            &mut self.washout,
            &mut self.inert_share,
        ] {
            sift(column, &keep);
        }
    }

    /// Dry litres STPD in one actual litre of loop at a bin.
    pub(super) fn kappa_at(&self, bin: usize, shift: &Shift) -> f64 {
        let dry = self.dry(bin, shift) - self.given.carbon_dioxide_bar * (1.0 + shift.carbon_dioxide);
        dry / STANDARD_BAR * (ZERO_CELSIUS_K / (self.loop_k[bin] + shift.loop_k))
    }

    /// Dry litres STPD in one actual litre of loop at the first reading.
    pub(super) fn kappa(&self, shift: &Shift) -> f64 {
        if self.time_s.is_empty() { f64::NAN } else { self.kappa_at(0, shift) }
    }

    /// Ambient less vapour pressure at a bin, bar.
    fn dry(&self, bin: usize, shift: &Shift) -> f64 {
        let through = (self.time_s[bin] - self.first_s) / (self.last_s - self.first_s) - 0.5;
        self.ambient[bin] + shift.barometer + shift.depth + shift.drift * through
            - self.vapour[bin]
            - self.vapour_per_k[bin] * shift.loop_k
    }

    /// Oxygen fraction of the dry gas at a bin.
    pub(super) fn fraction(&self, bin: usize, shift: &Shift) -> f64 {
        self.po2[bin] * (1.0 + shift.gain) / self.dry(bin, shift)
    }

    /// Everything about segments that does not depend on a shift.
    pub(super) fn finish(&mut self) {
        self.lever = vec![0.0; self.time_s.len()];
        let minute = |s: f64| (s - self.first_s) / 60.0;
        let mut segments = std::mem::take(&mut self.segments);
        for segment in &mut segments {
            let bins = segment.bins.clone();
            let n = bins.len() as f64;
            segment.middle = self.time_s[bins.clone()].iter().map(|t| minute(*t)).sum::<f64>() / n;
            segment.square = 0.0;
            let (from, to) = (minute(segment.from_s), minute(segment.to_s));
            let (mut weights, mut washout) = (0.0, 0.0);
            for bin in bins {
                let at = minute(self.time_s[bin]);
                self.lever[bin] = at - segment.middle;
                segment.square += self.lever[bin] * self.lever[bin];
                let weight = ((at - from) * (to - at)).max(0.0);
                weights += weight;
                washout += weight * self.washout[bin];
            }
            let (mut mean, mut cross) = (0.0, 0.0);
            for bin in segment.bins.clone() {
                mean += self.po2[bin];
                cross += self.lever[bin] * self.po2[bin];
            }
            segment.po2 = (mean / n, cross / segment.square);
            segment.washout = if weights > 0.0 { washout / weights } else { 0.0 };
            let stage = &self.stages[segment.stage];
            let middle_s = self.first_s + 60.0 * segment.middle;
            (segment.washed, segment.leaked) = self.integrals(stage.from_s, middle_s);
            segment.injected = self.injected(stage, middle_s);
            if self.varies {
                (segment.kappa, segment.kappa_slope) = self.kappa_over(segment);
            }
        }
        self.segments = segments;
    }

    /// Integrals of the washout left and of the inert share, minutes.
    pub(super) fn integrals(&self, from_s: f64, to_s: f64) -> (f64, f64) {
        let (mut washed, mut leaked) = (0.0, 0.0);
        let mut last_s = from_s;
        for bin in self.bins_between(from_s, to_s) {
            let minutes = (self.time_s[bin] - last_s) / 60.0;
            washed += minutes * self.washout[bin];
            leaked += minutes * self.inert_share[bin];
            last_s = self.time_s[bin];
        }
        (washed, leaked)
    }

    /// Whole gas injected and added by hand in a stage up to a time, litres STPD.
    pub(super) fn injected(&self, stage: &Stage, to_s: f64) -> f64 {
        let mut litres: f64 = stage.oxygen.iter().filter(|c| c.at_s <= to_s).filter_map(|c| c.litres).sum();
        for (i, (at_s, rate)) in self.rates.iter().enumerate() {
            let until_s = self.rates.get(i + 1).map_or(to_s, |next| next.0);
            let minutes = (until_s.min(to_s) - at_s.max(stage.from_s)) / 60.0;
            if let (Some(rate), true) = (rate, minutes > 0.0) {
                litres += minutes * self.flow(*rate, &Shift::default());
            }
        }
        litres
    }

    /// Dry gas at a segment's middle over that at its stage's beginning, and its relative change per minute.
    fn kappa_over(&self, segment: &Segment) -> (f64, f64) {
        let none = Shift::default();
        let stage = &self.stages[segment.stage];
        let first = stage.window.start.min(self.time_s.len() - 1);
        let (mut mean, mut slope) = (0.0, 0.0);
        for bin in segment.bins.clone() {
            let kappa = self.kappa_at(bin, &none);
            mean += kappa;
            slope += self.lever[bin] * kappa;
        }
        mean /= segment.bins.len() as f64;
        (mean / self.kappa_at(first, &none), slope / segment.square / mean)
    }

    /// Whole gas, L/min STPD.
    pub(super) fn flow(&self, rate: Rate, shift: &Shift) -> f64 {
        match rate {
            Rate::Off => 0.0,
            Rate::Flow(flow) => flow * (1.0 + shift.flow),
            Rate::Ip(ip) => {
                let p1 = ip + shift.ip + self.given.barometer_bar + shift.barometer;
                let gas_k = self.given.gas_k + shift.gas_k;
                let at_rest = self.line.as_ref().map_or(0.0, |line| line.flow(p1, gas_k));
                let root = (REFERENCE_TEMPERATURE_K / gas_k).sqrt();
                (at_rest + (shift.intercept + shift.slope * p1) * root).max(0.0)
            }
        }
    }

    /// What every segment says; `inverse_n` is the current estimate of β, `kinds` how each is read.
    pub(super) fn observe(
        &self,
        shift: &Shift,
        inverse_n: f64,
        kinds: &[Kind],
        observations: &mut Vec<Observation>,
    ) {
        let given = &self.given;
        let washout = given.washout + shift.washout;
        let leak = given.leak + shift.leak;
        let purity = (given.purity + shift.purity).min(1.0);
        observations.clear();
        let mut contents = Contents::new(self, shift, inverse_n);
        for (segment, kind) in self.segments.iter().zip(kinds) {
            let whole: f64 = segment.rates.iter().map(|(rate, share)| share * self.flow(*rate, shift)).sum();
            let injected = purity * whole;
            let inert = washout * segment.washout + (1.0 - purity) * whole;
            contents.go_to(segment.stage);
            let observation = match kind {
                Kind::Held | Kind::Venting => {
                    let (fraction, slope) = self.fraction_line(segment, shift);
                    let g = contents.ratio * segment.kappa;
                    // Dry gas that leaves a warming loop leaves less to make up.
                    let shrinking = segment.kappa_slope / inverse_n * g;
                    // Where held and venting meet, no diluent is needed: both equations give this.
                    let drift_at_balance = (1.0 - fraction) * (leak + shrinking) - inert;
                    let drift = g * slope;
                    if *kind == Kind::Held {
                        let rest = 1.0 - given.diluent;
                        let above = fraction - given.diluent;
                        Observation {
                            y: g * (slope + above * segment.kappa_slope) / rest,
                            net: injected - inert * given.diluent / rest - leak * above / rest,
                            per_slope: g / rest,
                            fraction,
                            injected,
                            inert: inert - shrinking - leak,
                            drift,
                            per_drift: g,
                            drift_at_balance,
                        }
                    } else {
                        let rest = 1.0 - fraction;
                        Observation {
                            y: g * slope / rest,
                            net: injected - inert * fraction / rest,
                            per_slope: g / rest,
                            fraction,
                            injected,
                            inert: inert - shrinking - leak,
                            drift,
                            per_drift: g,
                            drift_at_balance,
                        }
                    }
                }
                Kind::Sealed => {
                    let (mean, slope) = self.inverse_line(segment, shift);
                    let yardstick = contents.inert_at(segment, mean, slope);
                    Observation {
                        y: yardstick * slope,
                        net: injected - inert * (mean - 1.0),
                        per_slope: yardstick,
                        fraction: 1.0 - 1.0 / mean,
                        injected,
                        inert,
                        ..Observation::default()
                    }
                }
                Kind::Topped => self.topped(segment, shift, &contents, injected, inert, leak, purity),
            };
            observations.push(observation);
        }
    }

    /// Fraction over PO2, where it is the same at every bin.
    fn per_po2(&self, segment: &Segment, shift: &Shift) -> Option<f64> {
        // Only an exact zero leaves the bins alike.
        let alike = !self.varies && shift.drift.to_bits() << 1 == 0;
        alike.then(|| (1.0 + shift.gain) / self.dry(segment.bins.start, shift))
    }

    /// Mean of the oxygen fraction, and its slope per minute.
    fn fraction_line(&self, segment: &Segment, shift: &Shift) -> (f64, f64) {
        match self.per_po2(segment, shift) {
            Some(scale) => (scale * segment.po2.0, scale * segment.po2.1),
            None => self.line_of(segment, |bin| self.fraction(bin, shift)),
        }
    }

    /// Mean of one over the inert share, and its slope per minute.
    fn inverse_line(&self, segment: &Segment, shift: &Shift) -> (f64, f64) {
        match self.per_po2(segment, shift) {
            Some(scale) => self.line_of(segment, |bin| 1.0 / (1.0 - scale * self.po2[bin])),
            None => self.line_of(segment, |bin| 1.0 / (1.0 - self.fraction(bin, shift))),
        }
    }

    /// Mean of a value over a segment's bins, and its slope per minute.
    fn line_of(&self, segment: &Segment, of: impl Fn(usize) -> f64) -> (f64, f64) {
        let (mut sum, mut cross) = (0.0, 0.0);
        for bin in segment.bins.clone() {
            let value = of(bin);
            sum += value;
            cross += self.lever[bin] * value;
        }
        (sum / segment.bins.len() as f64, cross / segment.square)
    }

    #[allow(clippy::too_many_arguments)] // The parts of one balance, worked out by the caller for all kinds alike.
    fn topped(
        &self,
        segment: &Segment,
        shift: &Shift,
        contents: &Contents<'_>,
        injected: f64,
        inert: f64,
        leak: f64,
        purity: f64,
    ) -> Observation {
        let Some(top_up) = &segment.top_up else { return Observation::default() };
        let f_s = self.level_at(&top_up.begin, segment.from_s, shift);
        let f_e = self.level_at(&top_up.end, segment.to_s, shift);
        // Back at the mark right after the last add; from there on only oxygen leaves the loop, as in a sealed one.
        let since_last = if top_up.after_last.is_empty() {
            1.0
        } else {
            let f_l = self.level_at(&top_up.after_last, top_up.last_add_s, shift);
            (1.0 - f_l) / (1.0 - f_e)
        };
        let none = Shift::default();
        let varying = |range: &Range<usize>| {
            if self.varies { self.kappa_at(range.start, &none) / self.kappa(&none) } else { 1.0 }
        };
        let g = contents.ratio;
        let g_e = g * varying(&top_up.end) / varying(&top_up.begin) * since_last;
        let minutes = segment.minutes();
        let scale = top_up.scale;
        let fraction = 0.5 * (f_s + f_e);
        let metered = 1.0 + shift.metered;
        // Oxygen in what was added by hand, less that in what was let out.
        let other = scale * metered * (self.given.diluent * top_up.diluent_l - fraction * top_up.vented_l);
        let added = scale * metered * purity * top_up.oxygen_l;
        let fed = match (&top_up.cylinder, top_up.use_cylinder) {
            (Some(cylinder), true) => {
                let drop = scale * self.drop(cylinder, &[0.0; 5]) + shift.cylinder;
                let trickle = if cylinder.feeds == Feeds::All { 0.0 } else { injected };
                trickle + purity * drop / minutes
            }
            _ => injected + added / minutes,
        };
        Observation {
            y: scale * (f_e * g_e - f_s * g) / minutes,
            net: fed + other / minutes - fraction * leak,
            per_slope: 1.0,
            fraction,
            injected,
            inert,
            ..Observation::default()
        }
    }

    /// Oxygen fraction at a time by a straight line through some bins.
    fn level_at(&self, bins: &Range<usize>, at_s: f64, shift: &Shift) -> f64 {
        let n = bins.len() as f64;
        let (mut time, mut level) = (0.0, 0.0);
        for bin in bins.clone() {
            time += self.time_s[bin] - self.first_s;
            level += self.fraction(bin, shift);
        }
        (time, level) = (time / n, level / n);
        let (mut square, mut cross) = (0.0, 0.0);
        for bin in bins.clone() {
            let lever = self.time_s[bin] - self.first_s - time;
            square += lever * lever;
            cross += lever * (self.fraction(bin, shift) - level);
        }
        let slope = if square > 0.0 { cross / square } else { 0.0 };
        level + slope * (at_s - self.first_s - time)
    }

    /// Standard uncertainty of such a level from the scatter about the line, and its degrees of freedom.
    pub(super) fn level_u(&self, bins: &Range<usize>, at_s: f64) -> (f64, f64) {
        let none = Shift::default();
        let n = bins.len() as f64;
        if bins.len() < 3 {
            return (0.0, 1.0);
        }
        let mean = bins.clone().map(|b| self.time_s[b]).sum::<f64>() / n;
        let (mut squares, mut levers) = (0.0, 0.0);
        for bin in bins.clone() {
            let off = self.fraction(bin, &none) - self.level_at(bins, self.time_s[bin], &none);
            squares += off * off;
            levers += (self.time_s[bin] - mean) * (self.time_s[bin] - mean);
        }
        let lever = at_s - mean;
        let share = 1.0 / n + if levers > 0.0 { lever * lever / levers } else { 0.0 };
        (((squares / (n - 2.0)) * share).sqrt(), n - 2.0)
    }

    /// Litres STPD that left a cylinder; `shift` moves volume (relative), both pressures (bar) and temperatures (K).
    pub(super) fn drop(&self, cylinder: &Cylinder, shift: &[f64; 5]) -> f64 {
        let volume = cylinder.volume.value.as_m3() * 1e3 * (1.0 + shift[0]);
        let ambient = self.given.barometer_bar;
        let from = contents_l(
            volume,
            cylinder.from.value.as_bar() + shift[1] + ambient,
            cylinder.from_temperature.value.as_k() + shift[2],
        );
        let to = contents_l(
            volume,
            cylinder.to.value.as_bar() + shift[3] + ambient,
            cylinder.to_temperature.value.as_k() + shift[4],
        );
        from - to
    }
}
