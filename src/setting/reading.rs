//! What a named meter should show, in its own litres, when the setting is right.
//!
//! Comes in: a feed at an IP, a meter. Goes out: the reading expected on the assembled unit at the surface where it is set,
//! with gas of 20 °C, and a window: what the uncertainties allow, cut off where the reading would prove a setting too rich
//! (the chance with the uptake and the meter alone, no IP gauge in it) or too lean. Once as set, and once at a nearly empty
//! cylinder, where the IP may have risen by its whole spread. So the setting is proved by flow and needs no trust in the IP
//! gauge. Left out: back pressure of the meter, and a wet meter's humidity (taken as saturated).

use chrono::{DateTime, FixedOffset};

use super::chance::Excess;
use super::injection::{Feed, InjectionSource};
use super::options::LARGEST_SHORTFALL;
use crate::bench::correct::{Correction, REFERENCE_TEMPERATURE_K, Raw, Shift};
use crate::entry::{
    Amount, Build, Conditions, Id, Meter, MeterKind, Papers, Purpose, Readings, Run, Transducer, ZeroAndLeak,
};
use crate::gas::Species;
use crate::quantity::{IndicatedFlow, ReferenceConditions};

/// Expanded uncertainty of the gas temperature at the proof, K (common practice, no source).
const PROOF_TEMPERATURE_EXPANDED_K: f64 = 4.0;
/// Relative expanded uncertainty of a meter whose papers say nothing of its gain (common practice, no source).
const GAIN_NOT_STATED: f64 = 0.05;
/// Halvings of a flow.
const HALVINGS: usize = 40;

/// A reading with its window, litres per minute of the meter's scale.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReadingWindow {
    /// Expected.
    pub value_l_min: f64,
    /// Lowest that proves the setting.
    pub low_l_min: f64,
    /// Highest that proves the setting.
    pub high_l_min: f64,
}

/// What a meter should show.
#[derive(Debug, Clone, PartialEq)]
pub struct ExpectedReading {
    /// The meter's name in the register, if it has one.
    pub meter: Option<Id>,
    /// Its kind.
    pub kind: &'static str,
    /// The reference conditions of its litres; none for a meter that shows the volume that passes.
    pub reads_at: Option<ReferenceConditions>,
    /// As set, at a full cylinder.
    pub full: ReadingWindow,
    /// At a nearly empty cylinder, the IP risen by its whole spread at most.
    pub nearly_empty: ReadingWindow,
    /// Whether a window leaves the meter's range.
    pub out_of_range: bool,
}

impl ExpectedReading {
    /// None when the meter was made for another gas and has no factor.
    pub(super) fn of(feed: &Feed<'_>, ip_bar: f64, meter: &Meter, id: &Id) -> Option<Self> {
        let reads_at = match &meter.kind {
            MeterKind::Mass { reads_at, made_for, gas_factor } => {
                if *made_for != Species::Oxygen && gas_factor.is_none() {
                    return None;
                }
                Some(*reads_at)
            }
            MeterKind::Float { reads_at, .. } => Some(*reads_at),
            MeterKind::Volumetric { .. } | MeterKind::Timed { .. } => None,
        };
        let (used, p1) = (feed.used, feed.p1_bar(ip_bar, 0.0));
        let per_shown = stpd_per_shown(feed, meter, id);
        let shown = |p1: f64| {
            let passes = 1.0 - feed.choke.expected_loss(used.set_at_bar_abs / p1);
            feed.line.flow(p1, REFERENCE_TEMPERATURE_K) * passes / per_shown
        };
        let (full, empty) = (shown(p1), shown(p1 + used.ip_spread_bar));
        let meter_u = meter_relative_u(&meter.papers, full);
        let temperature_u = 0.5 * PROOF_TEMPERATURE_EXPANDED_K / 2.0 / REFERENCE_TEMPERATURE_K;
        let surface = feed.injected(ip_bar, 0.0);
        let flow_u: f64 = feed
            .budget(ip_bar, 0.0)
            .iter()
            .filter(|(source, _)| {
                !matches!(source, InjectionSource::Purity | InjectionSource::GasTemperature)
            })
            .map(|(_, u)| u / surface.nominal_l_min)
            .map(|u| u * u)
            .sum();
        let scatter = 2.0 * (flow_u + meter_u * meter_u + temperature_u * temperature_u).sqrt();
        let held = feed.injected(ip_bar, used.held_at_m());
        let most = richest_proved(feed, (meter_u * meter_u + temperature_u * temperature_u).sqrt());
        let least = (1.0 - LARGEST_SHORTFALL) * feed.uptake.uptake_l_min;
        let low = (full * (1.0 - scatter)).max(full * least / held.leanest_l_min).min(full);
        let window = |value: f64| ReadingWindow {
            value_l_min: value,
            low_l_min: low,
            // What is read as set may still rise by the spread; what is read at a nearly empty cylinder has risen.
            high_l_min: (value * (1.0 + scatter)).min(value * most / held.richest_l_min),
        };
        let (full, nearly_empty) = (window(full), window(empty));
        let out_of_range = meter.papers.range.is_some_and(|(lowest, highest)| {
            full.low_l_min < lowest.as_l_min() || nearly_empty.high_l_min > highest.as_l_min()
        });
        Some(Self {
            meter: meter.id.clone(),
            kind: meter.kind.name(),
            reads_at,
            full,
            nearly_empty,
            out_of_range,
        })
    }
}

/// The largest injection, L/min, that a reading of relative standard uncertainty `reading_u` proves to be allowed.
fn richest_proved(feed: &Feed<'_>, reading_u: f64) -> f64 {
    let (used, uptake) = (feed.used, feed.uptake);
    let others = [used.purity_u / used.purity, 0.5 * used.temperature_u_k / used.coldest_k, reading_u];
    let relative_u = others.iter().map(|u| u * u).sum::<f64>().sqrt();
    let (mut good, mut bad) = (0.0, (1.0 - used.shortfall) * uptake.uptake_l_min);
    for _ in 0..HALVINGS {
        let middle = 0.5 * (good + bad);
        let excess = Excess {
            mean: middle - uptake.uptake_l_min,
            normal_u: middle * relative_u,
            student_u: uptake.u_l_min,
            dof: uptake.dof,
        };
        if excess.chance() <= used.chance {
            good = middle;
        } else {
            bad = middle;
        }
    }
    good
}

/// Relative standard uncertainty of a reading near `shown` litres per minute.
fn meter_relative_u(papers: &Papers<IndicatedFlow, IndicatedFlow>, shown: f64) -> f64 {
    let gain = papers.gain.map_or(GAIN_NOT_STATED / 2.0, |g| g / papers.coverage);
    let zero = papers.zero.map_or(0.0, |z| z.as_l_min() / papers.coverage / shown);
    let noise = match papers.noise {
        None => 0.0,
        Some(Amount::OfReading(share)) => share / papers.coverage,
        Some(Amount::Fixed(flow)) => flow.as_l_min() / papers.coverage / shown,
    };
    let resolution = papers.resolution.map_or(0.0, |r| r.as_l_min() / shown / 12_f64.sqrt());
    [gain, zero, noise, resolution].iter().map(|u| u * u).sum::<f64>().sqrt()
}

/// Litres STPD of oxygen for one litre shown, by the bench's own correction.
fn stpd_per_shown(feed: &Feed<'_>, meter: &Meter, id: &Id) -> f64 {
    let run = Run {
        orifice: id.clone(),
        build: Build::Unknown,
        gas: Species::Oxygen,
        purity: None,
        purpose: Purpose::Check,
        taken: DateTime::<FixedOffset>::default(),
        technician: None,
        readings: Readings::Points(Vec::new()),
        conditions: Conditions::default(),
        before: ZeroAndLeak::default(),
        after: ZeroAndLeak::default(),
        meter: meter.clone(),
        transducer: Transducer {
            id: None,
            papers: Papers {
                gain: None,
                zero: None,
                noise: None,
                resolution: None,
                coverage: 2.0,
                range: None,
                certificate: None,
                due: None,
            },
        },
        acceptance: None,
        left_out: Vec::new(),
    };
    let raw = Raw {
        shown_pa: 0.0,
        absolute: false,
        shown_l_min: 1.0,
        temperature_k: REFERENCE_TEMPERATURE_K,
        ambient_pa: feed.used.set_at_bar_abs * 1e5,
        meter_temperature_k: None,
        meter_pressure_pa: None,
    };
    Correction::of(&run).apply(&raw, &Shift::NONE).per_shown
}
