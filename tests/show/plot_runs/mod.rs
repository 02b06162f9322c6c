//! Runs to draw: made up, with a flow law and a scatter of their own, so that a picture shows what a bench would.

#![allow(clippy::unwrap_used)] // made-up input that does not parse is a mistake in this file

use chrono::DateTime;
use ebbline::bench::{Analysis, Questions, analyse};
use ebbline::entry::{
    Acceptance, Amount, Build, Conditions, Id, Indication, Influence, LeftOut, Limits, Meter, MeterKind,
    Papers, PointReading, Purity, Purpose, Readings, Rule, Run, Sweep, Tolerance, Transducer, ZeroAndLeak,
};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, StpdFlow,
    Temperature, TemperatureDifference,
};

/// Litres STPD in one litre of the meter, which reads at 20 °C.
const STPD_PER_LITRE: f64 = 273.15 / 293.15;
/// Barometer of all runs, bar.
pub(crate) const BAROMETER_BAR: f64 = 1.0092;

/// What a made-up run is made from.
#[derive(Debug, Clone)]
pub(crate) struct Made {
    pub(crate) orifice: &'static str,
    pub(crate) gas: Species,
    /// Gauge pressures in bar, in the order they are taken.
    pub(crate) ips: Vec<f64>,
    /// L/min STPD per bar of upstream pressure, choked.
    pub(crate) slope: f64,
    pub(crate) choke_ratio: f64,
    /// Relative scatter of the flow.
    pub(crate) scatter: f64,
    /// The pressure column is said to be absolute although it is gauge.
    pub(crate) gauge_said_to_be_absolute: bool,
    pub(crate) with_sweeps: bool,
    pub(crate) acceptance: Option<(f64, f64, f64, Rule)>,
    pub(crate) acceptance_gas: Option<Species>,
    pub(crate) technician: Option<&'static str>,
    pub(crate) left_out: Vec<(usize, &'static str)>,
    /// A share by which the falling sweep reads higher.
    pub(crate) hysteresis: f64,
    pub(crate) build: Build,
}

impl Default for Made {
    fn default() -> Self {
        Self {
            orifice: "CMF-0417",
            gas: Species::Oxygen,
            ips: up_and_down(4.0, 13.0, 1.0),
            slope: 0.0438,
            choke_ratio: 0.48,
            scatter: 0.0008,
            gauge_said_to_be_absolute: false,
            with_sweeps: true,
            acceptance: Some((10.0, 0.48, 0.05, Rule::Guarded)),
            acceptance_gas: None,
            technician: Some("I. Varga"),
            left_out: Vec::new(),
            hysteresis: 0.0,
            build: Build::ShortTube,
        }
    }
}

/// Pressures upward and back.
pub(crate) fn up_and_down(low: f64, high: f64, step: f64) -> Vec<f64> {
    let n = ((high - low) / step).round() as usize;
    let up = (0..=n).map(|i| low + step * i as f64);
    let down = (0..=n).rev().map(|i| low + step * i as f64);
    up.chain(down).collect()
}

/// Numbers about nought with a standard deviation of about one, always the same ones.
pub(crate) struct Scatter(u64);

impl Scatter {
    pub(crate) const fn new(seed: u64) -> Self {
        Self(seed)
    }

    pub(crate) fn next(&mut self) -> f64 {
        let uniform: f64 = (0..12)
            .map(|_| {
                self.0 =
                    self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
                (self.0 >> 11) as f64 / (1u64 << 53) as f64
            })
            .sum();
        uniform - 6.0
    }
}

impl Made {
    pub(crate) fn run(&self) -> Run {
        let mut scatter = Scatter::new(417);
        let top = self.ips.iter().copied().fold(f64::MIN, f64::max);
        let peak = self.ips.iter().position(|p| *p >= top).unwrap_or(0);
        let points = self
            .ips
            .iter()
            .enumerate()
            .map(|(i, ip)| {
                let falling = i > peak;
                let p1 = ip + BAROMETER_BAR;
                let ratio = BAROMETER_BAR / p1;
                let over = ((ratio - self.choke_ratio) / (1.0 - self.choke_ratio)).clamp(0.0, 1.0);
                let choked = (1.0 - over * over).sqrt();
                // The discharge coefficient grows a little with the flow.
                let coefficient = 1.0 - 0.012 / p1.max(0.1).sqrt();
                let flow = self.slope * p1 * choked * coefficient * (1.0 + self.scatter * scatter.next());
                let flow = if falling { flow * (1.0 + self.hysteresis) } else { flow };
                let shown = round(flow / STPD_PER_LITRE, 1e4);
                let pressure = GaugePressure::from_bar(round(ip + 0.002 * scatter.next(), 1e3));
                PointReading {
                    pressure: if self.gauge_said_to_be_absolute {
                        Indication::Absolute(AbsolutePressure::from_pa(pressure.as_pa()))
                    } else {
                        Indication::Gauge(pressure)
                    },
                    flow: IndicatedFlow::from_l_min(shown),
                    pressure_scatter: None,
                    flow_scatter: None,
                    averaged: 1.0,
                    timed: None,
                    temperature: Some(Temperature::from_k(293.15 + 0.02 * i as f64)),
                    barometer: None,
                    meter_temperature: None,
                    meter_pressure: None,
                    sweep: self.with_sweeps.then_some(if falling { Sweep::Falling } else { Sweep::Rising }),
                    time_s: Some(90.0 * i as f64),
                }
            })
            .collect();
        Run {
            orifice: Id::new(self.orifice).unwrap(),
            build: self.build,
            gas: self.gas,
            purity: (self.gas == Species::Oxygen).then_some(Purity { fraction: 0.995, expanded: 0.003 }),
            purpose: Purpose::Acceptance,
            taken: DateTime::parse_from_rfc3339("2026-11-12T09:40:00+11:00").unwrap(),
            technician: self.technician.map(str::to_owned),
            readings: Readings::Points(points),
            conditions: Conditions {
                temperature: Influence { value: None, expanded: Some(TemperatureDifference::from_k(1.0)) },
                barometer: Influence {
                    value: Some(AbsolutePressure::from_bar(BAROMETER_BAR)),
                    expanded: Some(PressureDifference::from_pa(100.0)),
                },
                ..Conditions::default()
            },
            before: ZeroAndLeak::default(),
            after: ZeroAndLeak::default(),
            meter: Meter {
                id: Some(Id::new("FM-01").unwrap()),
                kind: MeterKind::Mass {
                    reads_at: ReferenceConditions {
                        temperature: Temperature::from_k(293.15),
                        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
                    },
                    made_for: self.gas,
                    gas_factor: None,
                },
                papers: Papers {
                    gain: Some(0.008),
                    zero: Some(IndicatedFlow::from_l_min(0.0006)),
                    noise: Some(Amount::OfReading(0.002)),
                    resolution: Some(IndicatedFlow::from_l_min(0.0001)),
                    coverage: 2.0,
                    range: Some((IndicatedFlow::from_l_min(0.0), IndicatedFlow::from_l_min(5.0))),
                    certificate: Some("FM-2026-118".to_owned()),
                    due: None,
                },
            },
            transducer: Transducer {
                id: Some(Id::new("PT-01").unwrap()),
                papers: Papers {
                    gain: Some(0.002),
                    zero: Some(PressureDifference::from_bar(0.010)),
                    noise: Some(Amount::Fixed(PressureDifference::from_bar(0.004))),
                    resolution: Some(PressureDifference::from_bar(0.001)),
                    coverage: 2.0,
                    range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
                    certificate: None,
                    due: None,
                },
            },
            acceptance: self.acceptance.map(|(ip, flow, tolerance, rule)| Acceptance {
                id: None,
                ip: GaugePressure::from_bar(ip),
                flow: StpdFlow::from_l_min(flow),
                gas: self.acceptance_gas,
                tolerance: Tolerance::Relative(tolerance),
                rule,
                limits: Limits::DEFAULT,
            }),
            left_out: self
                .left_out
                .iter()
                .map(|(point, why)| LeftOut { point: *point, why: (*why).to_owned() })
                .collect(),
        }
    }
}

/// A run with its analysis.
pub(crate) fn analysed(made: &Made) -> (Run, Analysis) {
    let run = made.run();
    let Readings::Points(points) = &run.readings else { unreachable!("made of points") };
    let analysis = analyse(&run, points, &Questions::default()).unwrap();
    (run, analysis)
}

/// Every run that is drawn in the tests, by name.
pub(crate) fn all() -> Vec<(&'static str, Made)> {
    let good = Made::default();
    vec![
        ("good", good.clone()),
        ("half-blocked", Made { orifice: "CMF-0392", slope: 0.0231, ..good.clone() }),
        ("gauge-as-absolute", Made { orifice: "CMF-0405", gauge_said_to_be_absolute: true, ..good.clone() }),
        (
            "subsonic",
            Made {
                orifice: "CMF-0421",
                ips: {
                    let low = [0.3, 0.5, 0.7, 0.9, 1.2, 1.6, 2.0, 3.0];
                    let high = up_and_down(4.0, 13.0, 1.5);
                    let mut all: Vec<f64> = low.to_vec();
                    all.extend(high);
                    all.extend(low.iter().rev());
                    all
                },
                left_out: vec![(13, "hose touched while reading"), (17, "regulator crept")],
                ..good.clone()
            },
        ),
        (
            "five-points",
            Made {
                orifice: "CMF-0417",
                ips: vec![5.0, 7.0, 9.0, 11.0, 13.0],
                with_sweeps: false,
                ..good.clone()
            },
        ),
        ("two-hundred-points", Made { ips: up_and_down(4.0, 13.9, 0.1), scatter: 0.0014, ..good.clone() }),
        ("no-acceptance", Made { acceptance: None, technician: None, ..good.clone() }),
        (
            "undecided",
            Made { acceptance: Some((10.0, 0.458, 0.05, Rule::Guarded)), hysteresis: 0.012, ..good.clone() },
        ),
        (
            "helium",
            Made {
                orifice: "CMF-0417",
                gas: Species::Helium,
                slope: 0.0438 * 2.6,
                acceptance_gas: Some(Species::Oxygen),
                ..good.clone()
            },
        ),
        (
            "hostile-texts",
            Made {
                orifice: "Отверстие_ЖЩШЮжщшюЫы-Ünïté-12",
                technician: Some(
                    "<script>alert(\"&amp;\")</script> Ж. О'Нил \u{202e}gnirts\u{0}\u{1b}[31m <&\">",
                ),
                left_out: vec![
                    (
                        3,
                        "<&\"> шланг отошёл, показания недостоверны, точку повторили после осмотра \u{fffe}]]>",
                    ),
                    (4, "</text><image href=\"http://example.org/x.png\"/>"),
                ],
                ..good.clone()
            },
        ),
        (
            "thirty-millilitres",
            Made {
                orifice: "µ-0003",
                slope: 0.0028,
                acceptance: Some((10.0, 0.0308, 0.05, Rule::Simple)),
                ..good.clone()
            },
        ),
        (
            "two-litres",
            Made {
                slope: 0.148,
                acceptance: Some((12.0, 1.9, 0.05, Rule::Simple)),
                scatter: 0.004,
                ..good.clone()
            },
        ),
        ("limits-far-away", Made { acceptance: Some((10.0, 48.0, 0.05, Rule::Simple)), ..good.clone() }),
        (
            "wild-point-left-out",
            Made {
                ips: vec![5.0, 6.0, 7.0, 0.02, 8.0, 9.0, 10.0, 11.0, 12.0],
                left_out: vec![(4, "no gas")],
                ..good
            },
        ),
    ]
}

fn round(x: f64, per: f64) -> f64 {
    (x * per).round() / per
}
