//! The invented bench: an orifice, a flow meter and a transducer that are off by what their papers allow.
//!
//! Comes in: a hole, what is set on the bench, a source of random numbers with a fixed seed. Goes out: a run as somebody
//! would have written it down. Flow: choked and subsonic law of `gas` with a discharge coefficient `1 − k/√Re`.

use chrono::{DateTime, FixedOffset, NaiveDate};

use crate::entry::{
    Acceptance, Amount, Build, Conditions, Id, Indication, Influence, LeftOut, Limits, Meter, MeterKind,
    Papers, PointReading, Purity, Purpose, Readings, Rule, Run, SeriesReadings, Sweep, Tolerance, Transducer,
    ZeroAndLeak,
};
use crate::gas::{self, Species};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, StpdFlow,
    Temperature, TemperatureDifference,
};
use crate::stats::monte_carlo::Random;

/// A hole: true diameter in µm, choke ratio, and `k` of the discharge coefficient `1 − k/√Re`.
#[derive(Debug, Clone, Copy)]
pub(super) struct Hole {
    pub(super) diameter_um: f64,
    pub(super) choke_ratio: f64,
    pub(super) k: f64,
}

/// What the instruments are off by, the same for every run under one certificate.
#[derive(Debug, Clone, Copy)]
pub(super) struct Errors {
    pub(super) meter_gain: f64,
    pub(super) meter_zero_l_min: f64,
    pub(super) transducer_gain: f64,
    pub(super) transducer_zero_pa: f64,
}

/// The day on the bench: barometer and gas temperature.
#[derive(Debug, Clone, Copy)]
pub(super) struct Day {
    pub(super) barometer_pa: f64,
    pub(super) gas_c: f64,
}

/// The invented bench with one orifice on it.
pub(super) struct Bench<'a> {
    pub(super) hole: Hole,
    pub(super) errors: Errors,
    pub(super) day: Day,
    /// Pressures in bar gauge, in the order they are set.
    pub(super) steps: &'a [f64],
    /// Gauge readings in a column that is said to be absolute.
    pub(super) gauge_as_absolute: bool,
}

impl Bench<'_> {
    /// True flow in L/min STPD at a true gauge pressure.
    fn true_flow_l_min(&self, gauge_pa: f64) -> f64 {
        let p1 = AbsolutePressure::from_pa(gauge_pa + self.day.barometer_pa);
        let t1 = Temperature::from_c(self.day.gas_c);
        let d = self.hole.diameter_um * 1e-6;
        let area = std::f64::consts::PI / 4.0 * d * d;
        let full = gas::choked_mass_flow(Species::Oxygen, area, p1, t1);
        let factor = gas::subsonic_factor(self.day.barometer_pa / p1.as_pa(), self.hole.choke_ratio);
        let reynolds = 4.0 * full * factor / (std::f64::consts::PI * d * Species::Oxygen.viscosity());
        let discharge = 1.0 - self.hole.k / reynolds.max(1.0).sqrt();
        full * factor * discharge.max(0.1) / gas::stpd_density(Species::Oxygen) * 6e4
    }

    /// What the transducer shows, in pascals, before noise.
    fn shown_pa(&self, gauge_pa: f64) -> f64 {
        gauge_pa * (1.0 + self.errors.transducer_gain) + self.errors.transducer_zero_pa
    }

    /// What the flow meter shows, in L/min at 20 °C and 101.325 kPa, before noise.
    fn shown_l_min(&self, true_l_min: f64) -> f64 {
        true_l_min / meter_reads_at().stpd_factor() * (1.0 + self.errors.meter_gain)
            + self.errors.meter_zero_l_min
    }

    /// Steady points, written down one after the other.
    pub(super) fn typed(&self, random: &mut Random) -> Readings {
        let top = self.steps.iter().copied().fold(0.0, f64::max);
        let peak = self.steps.iter().position(|s| *s >= top).unwrap_or(0);
        let points = self.steps.iter().enumerate().map(|(i, step)| {
            let gauge_pa = (step + 0.02 * random.normal()) * 1e5;
            let pressure_pa = self.shown_pa(gauge_pa) + 200.0 * random.normal();
            let flow = self.shown_l_min(self.true_flow_l_min(gauge_pa)) * (1.0 + 0.001 * random.normal());
            let pressure = if self.gauge_as_absolute {
                Indication::Absolute(AbsolutePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)))
            } else {
                Indication::Gauge(GaugePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)))
            };
            PointReading {
                pressure,
                flow: IndicatedFlow::from_l_min(to_decimals(flow, 4)),
                timed: None,
                pressure_scatter: None,
                flow_scatter: None,
                averaged: 1.0,
                temperature: None,
                barometer: None,
                meter_temperature: None,
                meter_pressure: None,
                sweep: Some(if i <= peak { Sweep::Rising } else { Sweep::Falling }),
                time_s: Some(90.0 * i as f64),
            }
        });
        Readings::Points(points.collect())
    }

    /// Two readings a second; the pressure settles within seconds, the meter follows a little later.
    pub(super) fn logged(&self, random: &mut Random) -> Readings {
        const EVERY_S: f64 = 0.5;
        const HOLD_S: f64 = 45.0;
        const PRESSURE_SETTLES_S: f64 = 1.5;
        const METER_SETTLES_S: f64 = 1.0;
        let mut series = SeriesReadings::default();
        let (mut gauge_pa, mut meter) = (3.0e5, self.true_flow_l_min(3.0e5));
        let each = (HOLD_S / EVERY_S) as usize;
        for (i, step) in self.steps.iter().enumerate() {
            let target_pa = (step + 0.02 * random.normal()) * 1e5;
            for j in 0..each {
                gauge_pa += (target_pa - gauge_pa) * (1.0 - libm::exp(-EVERY_S / PRESSURE_SETTLES_S));
                meter +=
                    (self.true_flow_l_min(gauge_pa) - meter) * (1.0 - libm::exp(-EVERY_S / METER_SETTLES_S));
                let pressure_pa = self.shown_pa(gauge_pa) + 200.0 * random.normal();
                let flow = self.shown_l_min(meter) * (1.0 + 0.001 * random.normal());
                series.time_s.push((i * each + j) as f64 * EVERY_S);
                series.pressure_pa.push(GaugePressure::from_bar(to_decimals(pressure_pa / 1e5, 3)).as_pa());
                series.flow_l_min.push(to_decimals(flow, 4));
            }
        }
        Readings::Series(series)
    }
}

/// What stands around the readings of a run.
pub(super) struct Around<'a> {
    pub(super) orifice: Id,
    pub(super) build: Build,
    pub(super) purpose: Purpose,
    pub(super) taken: DateTime<FixedOffset>,
    pub(super) technician: &'a str,
    pub(super) day: Day,
    pub(super) meter: Meter,
    pub(super) transducer: Transducer,
    pub(super) acceptance: Acceptance,
    pub(super) left_out: Option<(usize, &'a str)>,
}

/// The run of some readings.
pub(super) fn run_of(around: Around<'_>, readings: Readings) -> Run {
    Run {
        orifice: around.orifice,
        build: around.build,
        gas: Species::Oxygen,
        purity: Some(Purity { fraction: 0.995, expanded: 0.003 }),
        purpose: around.purpose,
        taken: around.taken,
        technician: Some(around.technician.to_owned()),
        readings,
        conditions: Conditions {
            temperature: Influence {
                value: Some(Temperature::from_c(around.day.gas_c)),
                expanded: Some(TemperatureDifference::from_k(1.0)),
            },
            barometer: Influence {
                value: Some(AbsolutePressure::from_pa(around.day.barometer_pa)),
                expanded: Some(PressureDifference::from_pa(100.0)),
            },
            ..Conditions::default()
        },
        before: ZeroAndLeak {
            zero: Some(IndicatedFlow::from_l_min(-0.000_1)),
            leak_pa_s: Some(0.002e5 / 60.0),
        },
        after: ZeroAndLeak { zero: Some(IndicatedFlow::from_l_min(0.0)), leak_pa_s: None },
        meter: around.meter,
        transducer: around.transducer,
        acceptance: Some(around.acceptance),
        left_out: around
            .left_out
            .iter()
            .map(|(point, why)| LeftOut { point: *point, why: (*why).to_owned() })
            .collect(),
    }
}

/// The invented flow meter with the papers of one calibration.
pub(super) fn meter(id: Option<Id>, certificate: &str, due: Option<NaiveDate>) -> Meter {
    Meter {
        id,
        kind: MeterKind::Mass { reads_at: meter_reads_at(), made_for: Species::Oxygen, gas_factor: None },
        papers: Papers {
            gain: Some(0.008),
            zero: Some(IndicatedFlow::from_l_min(0.000_6)),
            noise: Some(Amount::OfReading(0.002)),
            resolution: Some(IndicatedFlow::from_l_min(0.000_1)),
            coverage: 2.0,
            range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
            certificate: Some(certificate.to_owned()),
            due,
        },
    }
}

/// The invented transducer with the papers of one calibration.
pub(super) fn transducer(id: Option<Id>, certificate: &str, due: Option<NaiveDate>) -> Transducer {
    Transducer {
        id,
        papers: Papers {
            gain: Some(0.002),
            zero: Some(PressureDifference::from_bar(0.010)),
            noise: Some(Amount::Fixed(PressureDifference::from_bar(0.004))),
            resolution: Some(PressureDifference::from_bar(0.001)),
            coverage: 2.0,
            range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
            certificate: Some(certificate.to_owned()),
            due,
        },
    }
}

/// Guarded limits of 5 % about a flow of oxygen at 10 bar.
pub(super) fn limits(id: Option<Id>, flow_l_min: f64) -> Acceptance {
    Acceptance {
        id,
        ip: GaugePressure::from_bar(10.0),
        flow: StpdFlow::from_l_min(flow_l_min),
        gas: Some(Species::Oxygen),
        tolerance: Tolerance::Relative(0.05),
        rule: Rule::Guarded,
        limits: Limits::DEFAULT,
    }
}

fn meter_reads_at() -> ReferenceConditions {
    ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    }
}

/// What a display of so many decimals shows.
fn to_decimals(value: f64, decimals: usize) -> f64 {
    format!("{value:.decimals$}").parse().unwrap_or(value)
}
