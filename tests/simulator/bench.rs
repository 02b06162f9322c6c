//! A bench with instruments that are off by what their papers allow, and a technician who works at it.

use chrono::DateTime;
use ebbline::bench::{self, Analysis, Questions};
use ebbline::entry::{
    Acceptance, Amount, Build, Conditions, Id, Indication, Influence, Limits, Meter, MeterKind, PointReading,
    Purpose, Readings, Rule, Run, Sweep, Tolerance, Transducer, ZeroAndLeak,
};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, StpdFlow,
    Temperature, TemperatureDifference,
};

use super::{Hole, Random, Transition};

/// The intermediate pressure at which orifices are judged, bar gauge.
pub(crate) const NOMINAL_IP_BAR: f64 = 10.0;
/// The ambient pressure they are judged at, bar.
const NOMINAL_AMBIENT_BAR: f64 = 1.013_25;
/// The gas temperature they are judged at, K.
const NOMINAL_TEMPERATURE_K: f64 = 293.15;

/// What the flow is read from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum MeterSort {
    /// Thermal, in litres of 20 °C and 101.325 kPa.
    Mass,
    /// A piston: the volume that passes, dry, at the gas's temperature.
    Piston,
    /// A drum over water with thermometers of its own in meter and water.
    Wet,
}

/// What the papers say: expanded uncertainties, k = 2, and last digits.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Papers {
    pub(crate) meter_gain: f64,
    pub(crate) meter_zero_l_min: f64,
    pub(crate) meter_noise: f64,
    pub(crate) meter_step_l_min: f64,
    pub(crate) transducer_gain: f64,
    pub(crate) transducer_zero_bar: f64,
    pub(crate) transducer_noise_bar: f64,
    pub(crate) transducer_step_bar: f64,
    pub(crate) temperature_k: f64,
    pub(crate) barometer_bar: f64,
    pub(crate) own_temperature_k: f64,
}

impl Papers {
    /// The instruments a good shop has.
    pub(crate) fn of(sort: MeterSort) -> Self {
        let mass = Self {
            meter_gain: 0.008,
            meter_zero_l_min: 0.0006,
            meter_noise: 0.002,
            meter_step_l_min: 0.0001,
            transducer_gain: 0.002,
            transducer_zero_bar: 0.010,
            transducer_noise_bar: 0.004,
            transducer_step_bar: 0.001,
            temperature_k: 1.0,
            barometer_bar: 0.001,
            own_temperature_k: 0.5,
        };
        match sort {
            MeterSort::Mass => mass,
            MeterSort::Piston => {
                Self { meter_gain: 0.006, meter_zero_l_min: 0.0, meter_noise: 0.003, ..mass }
            }
            MeterSort::Wet => Self {
                meter_gain: 0.005,
                meter_zero_l_min: 0.0,
                meter_noise: 0.004,
                meter_step_l_min: 0.0005,
                ..mass
            },
        }
    }
}

/// What kind of afternoon it is.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Scene {
    pub(crate) gas: Species,
    pub(crate) meter: MeterSort,
    /// Lowest and highest pressure of the sweep, bar gauge.
    pub(crate) sweep_bar: (f64, f64),
    /// How many points below the sweep, down to 0.3 bar gauge.
    pub(crate) low_points: usize,
    /// Choke ratios the hole is drawn from.
    pub(crate) b: (f64, f64),
    /// What the technician says of the hole.
    pub(crate) build: Build,
    /// True noise over the stated one.
    pub(crate) noise: f64,
    /// Shape of the transition.
    pub(crate) transition: Transition,
    /// Whether the transducer shows absolute pressure.
    pub(crate) absolute: bool,
}

impl Scene {
    /// Oxygen, a mass meter, 4 to 13 bar, any hole.
    pub(crate) const PLAIN: Self = Self {
        gas: Species::Oxygen,
        meter: MeterSort::Mass,
        sweep_bar: (4.0, 13.0),
        low_points: 0,
        b: (0.08, 0.60),
        build: Build::Unknown,
        noise: 1.0,
        transition: Transition::Ellipse,
        absolute: false,
    };

    /// Any of the benches and gases, in the shares a shop might have; half of the runs know the build of their hole.
    pub(crate) fn mixed(random: &mut Random) -> Self {
        let meter = match random.uniform(0.0, 1.0) {
            u if u < 0.6 => MeterSort::Mass,
            u if u < 0.8 => MeterSort::Piston,
            _ => MeterSort::Wet,
        };
        let gas = if random.chance(0.3) { Species::Air } else { Species::Oxygen };
        let (build, b) = match random.whole(0, 5) {
            0 => (Build::ThinPlate, (0.08, 0.40)),
            1 => (Build::ShortTube, (0.35, 0.60)),
            2 => (Build::Nozzle, (0.45, 0.60)),
            _ => (Build::Unknown, (0.08, 0.60)),
        };
        let sweep_bar = (random.uniform(3.5, 5.0), random.uniform(12.0, 13.5));
        Self { gas, meter, sweep_bar, b, build, absolute: random.chance(0.2), ..Self::PLAIN }
    }
}

/// What the instruments are off by: the corrected value is the shown one plus these.
#[derive(Debug, Clone, Copy)]
struct Errors {
    meter_gain: f64,
    meter_zero_l_min: f64,
    transducer_gain: f64,
    transducer_zero_bar: f64,
    temperature_k: f64,
    barometer_bar: f64,
    meter_temperature_k: f64,
    water_temperature_k: f64,
}

impl Errors {
    fn drawn(papers: &Papers, random: &mut Random) -> Self {
        // The papers state twice the standard deviation.
        let mut of = |expanded: f64| random.normal(expanded / 2.0);
        Self {
            meter_gain: of(papers.meter_gain),
            meter_zero_l_min: of(papers.meter_zero_l_min),
            transducer_gain: of(papers.transducer_gain),
            transducer_zero_bar: of(papers.transducer_zero_bar),
            temperature_k: of(papers.temperature_k),
            barometer_bar: of(papers.barometer_bar),
            meter_temperature_k: of(papers.own_temperature_k),
            water_temperature_k: of(papers.own_temperature_k),
        }
    }
}

/// One run and the truth behind it.
#[derive(Debug, Clone)]
pub(crate) struct Trial {
    pub(crate) scene: Scene,
    pub(crate) hole: Hole,
    pub(crate) run: Run,
    pub(crate) readings: Vec<PointReading>,
    papers: Papers,
    errors: Errors,
    ambient_bar: f64,
    back_bar: f64,
    temperature_k: f64,
    drift_k: f64,
    meter_temperature_k: f64,
    water_temperature_k: f64,
}

impl Trial {
    /// A hole, a bench and a run, all from the seed.
    pub(crate) fn new(scene: Scene, random: &mut Random) -> Self {
        let hole = Hole {
            diameter: random.uniform(50e-6, 120e-6),
            b: random.uniform(scene.b.0, scene.b.1),
            cd: random.uniform(0.75, 0.95),
            k: random.uniform(0.0, 3.5),
            transition: scene.transition,
        };
        Self::of(scene, hole, Papers::of(scene.meter), random)
    }

    /// A run on a given hole.
    pub(crate) fn of(scene: Scene, hole: Hole, papers: Papers, random: &mut Random) -> Self {
        let errors = Errors::drawn(&papers, random);
        let ambient_bar = random.uniform(0.96, 1.035);
        let temperature_k = random.uniform(289.15, 298.15);
        let mut trial = Self {
            scene,
            hole,
            run: blank_run(&scene, &papers),
            readings: Vec::new(),
            papers,
            errors,
            ambient_bar,
            back_bar: random.uniform(0.0, 0.005),
            temperature_k,
            drift_k: random.normal(0.3),
            meter_temperature_k: temperature_k + random.normal(0.5),
            water_temperature_k: temperature_k + random.normal(1.0),
        };
        // What stands still is read once, to the last digit of its instrument.
        let conditions = &mut trial.run.conditions;
        conditions.barometer.value =
            Some(AbsolutePressure::from_bar(rounded(ambient_bar - errors.barometer_bar, 1e-4)));
        conditions.back_pressure.value = Some(PressureDifference::from_bar(rounded(trial.back_bar, 1e-5)));
        if scene.meter == MeterSort::Wet {
            conditions.meter_temperature.value = Some(Temperature::from_k(rounded(
                trial.meter_temperature_k - errors.meter_temperature_k,
                0.01,
            )));
            conditions.water_temperature.value = Some(Temperature::from_k(rounded(
                trial.water_temperature_k - errors.water_temperature_k,
                0.01,
            )));
        }
        let pressures = trial.pressures(random);
        trial.take(&pressures, random);
        trial
    }

    /// The pressures of the sweep, up and down: 14 to 25 points with the low ones.
    fn pressures(&self, random: &mut Random) -> Vec<(f64, Option<Sweep>)> {
        let low = self.scene.low_points;
        let high = random.whole(14, 25).saturating_sub(low).max(8);
        let (bottom, top) = self.scene.sweep_bar;
        let up = high.div_ceil(2);
        let down = high - up;
        let step = |i: usize, n: usize| bottom + (top - bottom) * i as f64 / (n - 1).max(1) as f64;
        let rising = (0..up).map(|i| (step(i, up), Some(Sweep::Rising)));
        let falling = (0..down).rev().map(|i| (step(i, down), Some(Sweep::Falling)));
        // On the way down the pressure is let off to almost nothing, in even ratios.
        let lower = (0..low).map(|i| {
            let share = (i as f64 + 1.0) / low as f64;
            (bottom * libm::pow(0.3 / bottom, share), Some(Sweep::Falling))
        });
        rising.chain(falling).chain(lower).collect()
    }

    /// Takes a point at each of these pressures, bar gauge, after those that stand there.
    pub(crate) fn take(&mut self, pressures: &[(f64, Option<Sweep>)], random: &mut Random) {
        for &(bar, sweep) in pressures {
            let reading = self.read(bar, sweep, random);
            self.readings.push(reading);
        }
        self.run.readings = Readings::Points(self.readings.clone());
    }

    fn read(&self, target_bar: f64, sweep: Option<Sweep>, random: &mut Random) -> PointReading {
        let index = self.readings.len();
        let (papers, errors) = (&self.papers, &self.errors);
        let temperature = self.temperature_k + self.drift_k * index as f64 / 20.0;
        // A regulator set by hand stands a little beside where it was meant to.
        let gauge = target_bar + random.uniform(-0.02, 0.02);
        let (p1, p2) = (gauge + self.ambient_bar, self.ambient_bar + self.back_bar);
        let flow = self.hole.flow(self.scene.gas, p1, p2, temperature);
        let litres = match self.scene.meter {
            MeterSort::Mass => flow * 293.15 / 273.15,
            MeterSort::Piston => flow * 1.013_25 / p2 * temperature / 273.15,
            MeterSort::Wet => {
                let vapour = magnus_bar(self.water_temperature_k);
                flow * 1.013_25 / (p2 - vapour) * self.meter_temperature_k / 273.15
            }
        };
        let shown_flow = (litres - errors.meter_zero_l_min) / (1.0 + errors.meter_gain);
        let noise_l_min = random.normal(self.scene.noise * papers.meter_noise / 2.0 * shown_flow);
        let over = if self.scene.absolute { p1 } else { gauge };
        let shown_bar = (over - errors.transducer_zero_bar) / (1.0 + errors.transducer_gain)
            + random.normal(self.scene.noise * papers.transducer_noise_bar / 2.0);
        let shown_bar = rounded(shown_bar, papers.transducer_step_bar);
        PointReading {
            pressure: if self.scene.absolute {
                Indication::Absolute(AbsolutePressure::from_bar(shown_bar))
            } else {
                Indication::Gauge(GaugePressure::from_bar(shown_bar))
            },
            flow: IndicatedFlow::from_l_min(rounded(shown_flow + noise_l_min, papers.meter_step_l_min)),
            timed: None,
            pressure_scatter: None,
            flow_scatter: None,
            averaged: 1.0,
            temperature: Some(Temperature::from_k(rounded(temperature - errors.temperature_k, 0.1))),
            barometer: None,
            meter_temperature: None,
            meter_pressure: None,
            sweep,
            time_s: Some(90.0 * index as f64),
        }
    }

    /// The true flow at an intermediate pressure, at the ambient pressure and temperature orifices are judged at,
    /// L/min STPD.
    pub(crate) fn true_flow(&self, ip_bar: f64) -> f64 {
        let p1 = ip_bar + NOMINAL_AMBIENT_BAR;
        self.hole.flow(self.scene.gas, p1, NOMINAL_AMBIENT_BAR, NOMINAL_TEMPERATURE_K)
    }

    /// The true intermediate pressure for a flow, bar gauge.
    pub(crate) fn true_ip(&self, flow_l_min: f64) -> f64 {
        let (mut low, mut high) = (0.0, 40.0);
        for _ in 0..60 {
            let middle = (low + high) / 2.0;
            if self.true_flow(middle) < flow_l_min { low = middle } else { high = middle }
        }
        (low + high) / 2.0
    }

    /// The run as the method sees it.
    pub(crate) fn analyse(&self, questions: &Questions<'_>) -> Analysis {
        bench::analyse(&self.run, &self.readings, questions)
            .unwrap_or_else(|e| panic!("a plain run was refused: {e} ({:?})", self.hole))
    }

    /// Ask at the nominal pressure.
    pub(crate) fn analyse_nominal(&self) -> Analysis {
        self.analyse(&at_nominal())
    }

    /// Gives the run an acceptance at the nominal pressure.
    pub(crate) fn judge_by(&mut self, flow_l_min: f64, tolerance: f64, rule: Rule) {
        self.run.acceptance = Some(Acceptance {
            id: None,
            ip: GaugePressure::from_bar(NOMINAL_IP_BAR),
            flow: StpdFlow::from_l_min(flow_l_min),
            gas: Some(self.scene.gas),
            tolerance: Tolerance::Relative(tolerance),
            rule,
            limits: Limits::DEFAULT,
        });
    }
}

/// The question for the flow at the nominal pressure.
pub(crate) fn at_nominal() -> Questions<'static> {
    Questions { at: vec![GaugePressure::from_bar(NOMINAL_IP_BAR)], ..Questions::default() }
}

/// The readings with every gauge pressure passed off as absolute.
pub(crate) fn misread_as_absolute(readings: &[PointReading]) -> Vec<PointReading> {
    let turned = |p: &PointReading| PointReading {
        pressure: Indication::Absolute(AbsolutePressure::from_pa(p.pressure.shown_pa())),
        ..*p
    };
    readings.iter().map(turned).collect()
}

/// The readings with every absolute pressure passed off as gauge.
pub(crate) fn misread_as_gauge(readings: &[PointReading]) -> Vec<PointReading> {
    let turned = |p: &PointReading| PointReading {
        pressure: Indication::Gauge(GaugePressure::from_pa(p.pressure.shown_pa())),
        ..*p
    };
    readings.iter().map(turned).collect()
}

fn rounded(value: f64, step: f64) -> f64 {
    if step > 0.0 { (value / step).round() * step } else { value }
}

/// Vapour pressure over water, bar: the Magnus formula (D. Sonntag 1990, from memory; within 0.1 % of the tables).
fn magnus_bar(t_k: f64) -> f64 {
    let c = t_k - 273.15;
    6.112e-3 * libm::exp(17.62 * c / (243.12 + c))
}

/// A run without readings and without the values of its conditions.
fn blank_run(scene: &Scene, papers: &Papers) -> Run {
    let some = |value: f64| (value > 0.0).then_some(value);
    let kind = match scene.meter {
        MeterSort::Mass => MeterKind::Mass {
            reads_at: ReferenceConditions {
                temperature: Temperature::from_c(20.0),
                pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
            },
            made_for: scene.gas,
            gas_factor: None,
        },
        MeterSort::Piston => MeterKind::Volumetric { wet: false },
        MeterSort::Wet => MeterKind::Volumetric { wet: true },
    };
    let due = chrono::NaiveDate::from_ymd_opt(2027, 3, 1);
    let meter = Meter {
        id: None,
        kind,
        papers: ebbline::entry::Papers {
            gain: some(papers.meter_gain),
            zero: some(papers.meter_zero_l_min).map(IndicatedFlow::from_l_min),
            noise: Some(Amount::OfReading(papers.meter_noise)),
            resolution: Some(IndicatedFlow::from_l_min(papers.meter_step_l_min)),
            coverage: 2.0,
            range: Some((IndicatedFlow::from_l_min(0.01), IndicatedFlow::from_l_min(2.0))),
            certificate: Some("FM-2026-118".to_owned()),
            due,
        },
    };
    let transducer = Transducer {
        id: None,
        papers: ebbline::entry::Papers {
            gain: some(papers.transducer_gain),
            zero: some(papers.transducer_zero_bar).map(PressureDifference::from_bar),
            noise: Some(Amount::Fixed(PressureDifference::from_bar(papers.transducer_noise_bar))),
            resolution: Some(PressureDifference::from_bar(papers.transducer_step_bar)),
            coverage: 2.0,
            range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
            certificate: Some("PT-2026-041".to_owned()),
            due,
        },
    };
    let own = Some(TemperatureDifference::from_k(papers.own_temperature_k))
        .filter(|_| scene.meter == MeterSort::Wet);
    let conditions = Conditions {
        temperature: Influence {
            value: None,
            expanded: Some(TemperatureDifference::from_k(papers.temperature_k)),
        },
        barometer: Influence {
            value: None,
            expanded: Some(PressureDifference::from_bar(papers.barometer_bar)),
        },
        meter_temperature: Influence { value: None, expanded: own },
        water_temperature: Influence { value: None, expanded: own },
        ..Conditions::default()
    };
    Run {
        orifice: Id::new("CMF-0417").expect("a name"),
        build: scene.build,
        gas: scene.gas,
        purity: None,
        purpose: Purpose::Check,
        taken: DateTime::parse_from_rfc3339("2026-11-12T09:40:00+11:00").expect("a time"),
        technician: None,
        readings: Readings::Points(Vec::new()),
        conditions,
        before: ZeroAndLeak::default(),
        after: ZeroAndLeak::default(),
        meter,
        transducer,
        acceptance: None,
        left_out: Vec::new(),
    }
}
