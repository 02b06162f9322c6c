//! What a session states, in working units, with a standard uncertainty for each source of error.
//!
//! Comes in: a session's conditions, papers and assumptions. Goes out: numbers in bar, litres, kelvins and minutes, their
//! standard uncertainties, and a warning for each that had to be assumed. A rectangular source is taken at its mean with
//! its half-width over √3 (JCGM 100:2008, 4.3.7). Left out: correlation between sources.

use super::cells::{OXYGEN_IN_AIR, any_in_volts};
use super::why_not::{UptakeError, Warning};
use crate::entry::{Diluent, Event, Injection, LeakTest, Metered, Place, Purity, Session, What};
use crate::gas::STANDARD_GRAVITY;
use crate::quantity::Uncertain;

/// ± without a statement are k = 2, as stated ones are.
const COVERAGE: f64 = 2.0;
/// Without any barometer: the standard atmosphere ± 30 hPa (as for a setting).
const UNKNOWN_BAROMETER_BAR: (f64, f64) = (1.013_25, 0.030);
/// Barometer without ±: 2 hPa.
const BAROMETER_EXPANDED_BAR: f64 = 0.002;
/// Loop temperature when none is stated, and its ±: common practice, no source.
const UNKNOWN_LOOP_K: (f64, f64) = (306.15, 4.0);
/// Loop temperature without ±.
const TEMPERATURE_EXPANDED_K: f64 = 1.0;
/// Depth of the counterlung in a pool without a statement, ±; and a stated one without ±, metres (common practice).
const UNKNOWN_DEPTH_EXPANDED_M: f64 = 1.0;
const DEPTH_EXPANDED_M: f64 = 0.2;
/// Purity of oxygen where none is stated: 99.5 % ± 0.3 %.
const PURITY: Purity = Purity { fraction: 0.995, expanded: 0.003 };
/// Leak of loop gas, L/min STPD: after a passed test with a nose clip, and otherwise.
const TESTED_LEAK: (f64, f64) = (0.0, 0.004);
const UNTESTED_LEAK: (f64, f64) = (0.0, 0.030);

/// What is stated, in working units.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Given {
    /// Barometer at the surface, bar.
    pub(super) barometer_bar: f64,
    pub(super) barometer_u: f64,
    /// Depth where no column gives it, metres; and its standard uncertainty, bar.
    pub(super) depth_m: f64,
    pub(super) depth_u_bar: f64,
    /// Drift of depth from the first reading to the last, standard uncertainty, bar.
    pub(super) drift_u_bar: f64,
    pub(super) bar_per_m: f64,
    /// Loop temperature where no column gives it.
    pub(super) loop_k: f64,
    pub(super) loop_u_k: f64,
    /// Carbon dioxide averaged over the loop, bar, and its standard uncertainty as a share of it.
    pub(super) carbon_dioxide_bar: f64,
    pub(super) carbon_dioxide_u: f64,
    /// Oxygen in the diluent.
    pub(super) diluent: f64,
    /// Loop volume at the first reading, litres, and its standard uncertainty.
    pub(super) volume_l: Option<(f64, f64)>,
    pub(super) leak: f64,
    pub(super) leak_u: f64,
    pub(super) purity: f64,
    pub(super) purity_u: f64,
    /// Nitrogen leaving the body at the start, L/min STPD.
    pub(super) washout: f64,
    pub(super) washout_u: f64,
    pub(super) washout_min: f64,
    pub(super) on_loop_s: f64,
    /// Seconds from the first reading that a cold scrubber spoils.
    pub(super) warm_up_s: f64,
    /// Relative standard uncertainty of the cells' gain.
    pub(super) gain_u: f64,
    pub(super) gas_k: f64,
    pub(super) gas_u_k: f64,
    /// Relative standard uncertainty of stated flows; zero when none is stated.
    pub(super) flow_u: f64,
    /// Standard uncertainty of the intermediate-pressure gauge, bar; zero when none is read.
    pub(super) ip_u_bar: f64,
    /// Relative standard uncertainty of metered amounts.
    pub(super) metered_u: f64,
    /// Standard uncertainty of the volume to which a topped loop is brought back, actual litres.
    pub(super) mark_u_l: f64,
}

impl Given {
    /// Resolves what a session states.
    pub(super) fn of(session: &Session, warnings: &mut Vec<Warning>) -> Result<Self, UptakeError> {
        let (conditions, assumed) = (&session.conditions, &session.assumptions);
        let (barometer_bar, barometer_u) = match (conditions.barometer.value, conditions.barometer.expanded) {
            (Some(p), Some(d)) => (p.as_bar(), d.as_bar() / COVERAGE),
            (Some(p), None) => {
                warnings.push(Warning::BarometerAssumed);
                (p.as_bar(), BAROMETER_EXPANDED_BAR / COVERAGE)
            }
            (None, _) => {
                warnings.push(Warning::BarometerUnknown);
                (UNKNOWN_BAROMETER_BAR.0, UNKNOWN_BAROMETER_BAR.1 / COVERAGE)
            }
        };
        let has_depths = session.readings.depth_m.is_some();
        let bar_per_m = conditions.water.density() * STANDARD_GRAVITY / 1e5;
        let stated_depth = conditions.depth.value.map(|d| d.as_m());
        let stated_depth_u = conditions.depth.expanded.map(|d| d.as_m());
        let depth_expanded_m = match (session.place, stated_depth_u, stated_depth) {
            (_, Some(d), _) => d,
            (Place::Couch, None, _) if !has_depths => 0.0,
            (Place::Pool, None, None) if !has_depths => {
                warnings.push(Warning::DepthUnknown);
                UNKNOWN_DEPTH_EXPANDED_M
            }
            (_, None, _) => {
                warnings.push(Warning::DepthAssumed);
                DEPTH_EXPANDED_M
            }
        };
        let drifts = session.place == Place::Pool && !has_depths;
        let drift_m = if drifts { assumed.depth_drift.as_m() / 3.0_f64.sqrt() } else { 0.0 };
        let has_temperatures = session.readings.loop_temperature_k.is_some();
        let (loop_k, loop_u_k) =
            match (conditions.loop_temperature.value, conditions.loop_temperature.expanded) {
                (t, Some(d)) if t.is_some() || has_temperatures => {
                    (t.map_or(UNKNOWN_LOOP_K.0, |t| t.as_k()), d.as_k() / COVERAGE)
                }
                (t, None) if t.is_some() || has_temperatures => {
                    warnings.push(Warning::LoopTemperatureAssumed);
                    (t.map_or(UNKNOWN_LOOP_K.0, |t| t.as_k()), TEMPERATURE_EXPANDED_K / COVERAGE)
                }
                _ => {
                    warnings.push(Warning::LoopTemperatureUnknown);
                    (UNKNOWN_LOOP_K.0, UNKNOWN_LOOP_K.1 / COVERAGE)
                }
            };
        let volume_l = session.loop_volume.map(|volume| {
            let litres = volume.value.as_m3() * 1e3;
            let expanded = volume.expanded.map(|d| d.as_m3() * 1e3).unwrap_or_else(|| {
                warnings.push(Warning::LoopVolumeAssumed { expanded: assumed.loop_volume });
                assumed.loop_volume * litres
            });
            (litres, expanded / COVERAGE)
        });
        let (leak, leak_u) = leak(session, warnings);
        let purity = session.oxygen.unwrap_or(PURITY);
        let (low, high) = (assumed.washout.0.as_l_min(), assumed.washout.1.as_l_min());
        let on_loop_s = conditions.time_on_loop.map(|t| t.as_s()).unwrap_or_else(|| {
            warnings.push(Warning::TimeOnLoopUnknown);
            0.0
        });
        let cold = !has_temperatures && conditions.scrubber_warm != Some(true);
        let warm_up_s = if cold { (assumed.warm_up.as_s() - on_loop_s).max(0.0) } else { 0.0 };
        if warm_up_s > 0.0 {
            warnings.push(Warning::WarmUpLeftOut { seconds: warm_up_s });
        }
        let stated_gain = session.cells.gain.unwrap_or_else(|| {
            warnings.push(Warning::CellGainAssumed { expanded: assumed.cell_gain });
            assumed.cell_gain
        }) / COVERAGE;
        let flushed = any_in_volts(&session.readings);
        let gain_u = if flushed { stated_gain.max(assumed.flush) } else { stated_gain };
        let given = Self {
            barometer_bar,
            barometer_u,
            depth_m: stated_depth.unwrap_or(0.0),
            depth_u_bar: depth_expanded_m / COVERAGE * bar_per_m,
            drift_u_bar: drift_m * bar_per_m,
            bar_per_m,
            loop_k,
            loop_u_k,
            carbon_dioxide_bar: assumed.lung_share * assumed.lung_carbon_dioxide.as_bar(),
            // From none to twice as much: see the module's page on the carbon dioxide of the lungs.
            carbon_dioxide_u: 1.0 / 3.0_f64.sqrt(),
            diluent: match session.diluent {
                Diluent::Air => OXYGEN_IN_AIR,
                Diluent::Oxygen(share) => share.as_ratio(),
            },
            volume_l,
            leak,
            leak_u,
            purity: purity.fraction,
            purity_u: purity.expanded / COVERAGE,
            washout: 0.5 * (low + high),
            washout_u: 0.5 * (high - low).abs() / 3.0_f64.sqrt(),
            washout_min: assumed.washout_time.as_min(),
            on_loop_s,
            warm_up_s,
            gain_u,
            gas_k: assumed.gas_temperature.0.as_k(),
            gas_u_k: assumed.gas_temperature.1.as_k() / COVERAGE,
            flow_u: stated_flows(session, warnings) / COVERAGE,
            ip_u_bar: stated_pressures(session, warnings) / COVERAGE,
            metered_u: metered(session, warnings) / COVERAGE,
            mark_u_l: assumed.mark.as_m3() * 1e3 / COVERAGE,
        };
        given.check()?;
        Ok(given)
    }

    fn check(&self) -> Result<(), UptakeError> {
        let refuse = |what, value| Err(UptakeError::Impossible { what, value });
        if !(0.0..1.0).contains(&self.diluent) {
            return refuse("the diluent's oxygen fraction", self.diluent);
        }
        if !(self.purity > 0.5 && self.purity <= 1.0) {
            return refuse("the oxygen's purity", self.purity);
        }
        if !(self.barometer_bar > 0.3 && self.barometer_bar < 1.2) {
            return refuse("the barometer in bar", self.barometer_bar);
        }
        if !(self.loop_k > 250.0 && self.loop_k < 330.0) {
            return refuse("the loop temperature in kelvins", self.loop_k);
        }
        if let Some((litres, u)) = self.volume_l
            && !(litres > 0.0 && litres < 100.0 && u > 0.0)
        {
            return refuse("the loop volume (or its ±) in litres", litres);
        }
        if self.washout_min.is_nan() || self.washout_min <= 0.0 {
            return refuse("the washout time in minutes", self.washout_min);
        }
        Ok(())
    }
}

/// Mean and standard uncertainty of the leak of loop gas, L/min STPD.
fn leak(session: &Session, warnings: &mut Vec<Warning>) -> (f64, f64) {
    let rectangular =
        |(low, high): (f64, f64)| (0.5 * (low + high), 0.5 * (high - low).abs() / 3.0_f64.sqrt());
    if let Some((low, high)) = session.assumptions.leak {
        return rectangular((low.as_l_min(), high.as_l_min()));
    }
    match session.leak_test {
        LeakTest::Passed if session.nose_clip != Some(false) => rectangular(TESTED_LEAK),
        LeakTest::Measured(Uncertain { value, expanded: Some(d) }) => {
            (value.as_l_min(), d.as_l_min() / COVERAGE)
        }
        // Without a ±, anything from none to twice as much.
        LeakTest::Measured(Uncertain { value, expanded: None }) => rectangular((0.0, 2.0 * value.as_l_min())),
        LeakTest::Passed | LeakTest::NotDone => {
            warnings.push(Warning::LeakNotTested);
            rectangular(UNTESTED_LEAK)
        }
    }
}

/// Largest relative ± of the stated flows; they are taken to come from one meter, and so to err together.
fn stated_flows(session: &Session, warnings: &mut Vec<Warning>) -> f64 {
    let mut largest = 0.0_f64;
    let mut assumed = false;
    for event in &session.events {
        if let Event { what: What::Injection(Injection::Flow(flow)), .. } = event {
            match flow.expanded {
                Some(d) if flow.value.as_l_min() > 0.0 => {
                    largest = largest.max(d.as_l_min() / flow.value.as_l_min());
                }
                Some(_) => {}
                None => {
                    assumed = true;
                    largest = largest.max(session.assumptions.flow);
                }
            }
        }
    }
    if assumed {
        warnings.push(Warning::FlowAssumed { expanded: session.assumptions.flow });
    }
    largest
}

/// Largest ± of the intermediate pressures, bar; they are read on one gauge, and so err together.
fn stated_pressures(session: &Session, warnings: &mut Vec<Warning>) -> f64 {
    let mut largest = 0.0_f64;
    let mut assumed = false;
    for event in &session.events {
        if let Event { what: What::Injection(Injection::Ip(ip)), .. } = event {
            assumed |= ip.expanded.is_none();
            let expanded = ip.expanded.unwrap_or(session.assumptions.ip_gauge);
            largest = largest.max(expanded.as_bar());
        }
    }
    if assumed {
        warnings.push(Warning::IpGaugeAssumed { expanded_bar: session.assumptions.ip_gauge.as_bar() });
    }
    largest
}

/// Largest relative ± of the metered amounts.
fn metered(session: &Session, warnings: &mut Vec<Warning>) -> f64 {
    let mut largest = 0.0_f64;
    let mut assumed = false;
    for event in &session.events {
        let (What::OxygenAdd(Some(Metered { volume, .. }))
        | What::DiluentAdd(Some(Metered { volume, .. }))
        | What::Vent(Some(Metered { volume, .. }))) = event.what
        else {
            continue;
        };
        let litres = volume.value.as_m3();
        match volume.expanded {
            Some(d) if litres > 0.0 => largest = largest.max(d.as_m3() / litres),
            Some(_) => {}
            None => {
                assumed = true;
                largest = largest.max(session.assumptions.metered);
            }
        }
    }
    if assumed {
        warnings.push(Warning::MeteredAssumed { expanded: session.assumptions.metered });
    }
    largest
}
