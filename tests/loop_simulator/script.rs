//! Sessions to simulate: the truth drawn, what the diver does, and the record as the diver would write it.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use super::{Act, Dice, Feed, Keeping, Log, Truth, run};
use chrono::DateTime;
use ebbline::entry::{
    CellReadings, CellSignal, Cylinder, Diluent, Event, Feeds, Id, Influence, Injection, LeakTest, LoopKept,
    Metered, Place, Purity, Rest, Session, SessionConditions, SessionReadings, What,
};
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, PressureDifference, ReferenceConditions, Span, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use ebbline::uptake::InjectionLine;

/// What a diver does in a session.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Kind {
    /// Held with one injection, volume measured.
    Held,
    /// Held with two injections, volume measured.
    HeldTwice,
    /// Held with the injection off and near the uptake; volume not measured.
    Null,
    /// Held, the second injection above the uptake, so that it vents.
    Venting,
    /// Sealed with one injection.
    Sealed,
    /// Sealed, injection changed, oxygen added between.
    SealedTwice,
    /// Sealed, brought back to the mark with diluent, then held.
    SealedThenHeld,
    /// Topped with metered oxygen.
    Topped,
    /// Topped from a cylinder that feeds everything.
    Cylinder,
    /// Held with an intermediate pressure through a line.
    Line,
}

impl Kind {
    pub(crate) const ALL: [Self; 10] = [
        Self::Held,
        Self::HeldTwice,
        Self::Null,
        Self::Venting,
        Self::Sealed,
        Self::SealedTwice,
        Self::SealedThenHeld,
        Self::Topped,
        Self::Cylinder,
        Self::Line,
    ];
}

/// The random part of a line: variances of intercept and slope, and their covariance.
pub(super) const LINE_RANDOM: (f64, f64, f64) = (1e-6, 1e-8, -0.95e-7);
/// The part common to its points: a gain, relative.
pub(super) const LINE_GAIN: f64 = 0.005;

/// A simulated session: the truth, and what was written down.
pub(crate) struct Scene {
    pub(crate) truth: Truth,
    pub(crate) session: Session,
    pub(crate) line: Option<InjectionLine>,
    pub(crate) log: Log,
}

/// A truth drawn from what the method states about divers and loops.
pub(crate) fn truth(dice: &mut Dice) -> Truth {
    let volume_l = dice.between(5.5, 9.0);
    Truth {
        uptake: dice.between(0.22, 0.42),
        wander: 0.04,
        wander_min: 2.0,
        volume_l,
        lungs_l: volume_l * dice.between(0.35, 0.45),
        loop_c: dice.normal(33.0, 2.0),
        ambient_bar: dice.between(0.98, 1.03),
        respiratory: dice.between(0.75, 0.95),
        carbon_dioxide_bar: dice.between(0.048, 0.058),
        nitrogen: dice.between(0.020, 0.060),
        nitrogen_min: dice.between(10.0, 14.0),
        body_bar: 0.75,
        on_loop_min: 10.0,
        leak: dice.between(0.0, 0.004),
        diluent: 0.2095,
        purity: dice.normal(0.995, 0.0015).min(1.0),
        puff_l: dice.between(0.1, 0.3),
        cell_gain: dice.normal(0.0, 0.01),
        cell_offsets: [dice.normal(0.0, 0.004), dice.normal(0.0, 0.004), dice.normal(0.0, 0.004)],
        cell_noise: 0.002,
        cell_lag_min: 0.1,
        last_digit: 0.001,
        warming_min: 0.0,
        mark_off_l: 0.0,
    }
}

/// What is done beside what the kind says.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Extra {
    /// Seconds between readings.
    pub(crate) every_s: f64,
    /// Minutes more at the end.
    pub(crate) minutes: f64,
    /// A whole-gas flow from the end of the usual minutes on.
    pub(crate) then: Option<f64>,
    /// Standard deviation of the stated loop volume, litres; twice that is the stated ±.
    pub(crate) volume_u_l: f64,
    /// PO2 at the first reading, bar, if not the usual one.
    pub(crate) po2: Option<f64>,
    /// The injection over the uptake in a held or sealed session, if not drawn.
    pub(crate) share: Option<f64>,
    /// What the record is off by, if not drawn.
    pub(crate) errors: Option<Errors>,
}

/// What a record is off by: what it states less what is true, unless said otherwise.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Errors {
    pub(crate) volume_l: f64,
    pub(crate) barometer_bar: f64,
    /// Flow meter and meter of what is added, relative.
    pub(crate) flow: f64,
    pub(crate) metered: f64,
    /// Intercept and slope of the line.
    pub(crate) line: (f64, f64),
    pub(crate) ip_bar: f64,
    /// True temperature of the gas at the orifice less the 20 °C that are assumed.
    pub(crate) gas_k: f64,
}

impl Default for Extra {
    fn default() -> Self {
        Self { every_s: 5.0, minutes: 0.0, then: None, volume_u_l: 0.5, po2: None, share: None, errors: None }
    }
}

/// A session of a kind with a given truth.
pub(crate) fn scene_of(kind: Kind, truth: Truth, extra: &Extra, dice: &mut Dice) -> Scene {
    scene(kind, truth, extra, None, dice)
}

/// The same, injected through an orifice.
pub(crate) fn scene_through(kind: Kind, truth: Truth, extra: &Extra, feed: &Feed, dice: &mut Dice) -> Scene {
    scene(kind, truth, extra, Some(feed), dice)
}

fn scene(kind: Kind, truth: Truth, extra: &Extra, feed: Option<&Feed>, dice: &mut Dice) -> Scene {
    let m = truth.uptake;
    let part = |share: f64| (m * share / truth.purity).max(0.0);
    let mut builder = Builder::new(&truth, extra, feed, dice);
    let (keep, mut po2, mut minutes): (LoopKept, f64, f64);
    match kind {
        Kind::Held => {
            (keep, po2, minutes) = (LoopKept::Held, 0.95, 20.0);
            let share = dice.between(0.75, 0.9);
            builder.inject(0.0, part(extra.share.unwrap_or(share)), dice);
        }
        Kind::HeldTwice => {
            (keep, po2, minutes) = (LoopKept::Held, 0.95, 26.0);
            builder.inject(0.0, part(0.9), dice);
            builder.inject(16.0, part(dice.between(0.4, 0.6)), dice);
        }
        Kind::Null => {
            (keep, po2, minutes) = (LoopKept::Held, 0.85, 26.0);
            builder.inject(0.0, part(dice.between(0.75, 0.95)), dice);
            builder.inject(18.0, 0.0, dice);
            builder.session.loop_volume = None;
        }
        Kind::Venting => {
            (keep, po2, minutes) = (LoopKept::Held, 0.7, 28.0);
            builder.inject(0.0, part(0.75), dice);
            builder.inject(14.0, part(dice.between(1.2, 1.4)), dice);
        }
        Kind::Sealed => {
            (keep, po2, minutes) = (LoopKept::Sealed, 0.6, 20.0);
            let share = dice.between(0.75, 0.9);
            builder.inject(0.0, part(extra.share.unwrap_or(share)), dice);
        }
        Kind::SealedTwice => {
            (keep, po2, minutes) = (LoopKept::Sealed, 0.58, 24.0);
            builder.inject(0.0, part(0.5), dice);
            builder.oxygen(12.0, 0.9);
            builder.inject(12.0, part(0.85), dice);
        }
        Kind::SealedThenHeld => {
            (keep, po2, minutes) = (LoopKept::Sealed, 0.62, 26.0);
            builder.inject(0.0, part(0.8), dice);
            builder.acts.push((12.0, Act::DiluentToMark));
            builder.acts.push((12.0, Act::Keep(Keeping::Held)));
            builder.event(12.0, What::MakeUp { kept: Some(LoopKept::Held), mark: true });
        }
        Kind::Topped | Kind::Cylinder => {
            (keep, po2, minutes) = (LoopKept::Topped, 0.6, 27.0);
            builder.inject(0.0, part(dice.between(0.5, 0.8)), dice);
            for at in [6.0, 12.0, 18.0, 24.0] {
                builder.acts.push((at, Act::OxygenToMark));
            }
        }
        Kind::Line => {
            (keep, po2, minutes) = (LoopKept::Held, 0.95, 24.0);
            builder.through_a_line(0.0, part(0.85), dice);
        }
    }
    if let Some(flow) = extra.then {
        // PO2 is brought up first, as one must before the injection is turned off for ten minutes.
        builder.oxygen(minutes, 3.0);
        builder.inject(minutes, flow, dice);
    }
    minutes += extra.minutes;
    po2 = extra.po2.unwrap_or(po2);
    let keeping = if keep == LoopKept::Held { Keeping::Held } else { Keeping::Sealed };
    builder.acts.push((0.0, Act::Keep(keeping)));
    builder.acts.sort_by(|a, b| a.0.total_cmp(&b.0));
    let log = run(&truth, po2, minutes, extra.every_s, &builder.acts, dice);
    builder.session.kept = keep;
    match kind {
        Kind::Topped => {
            let meter = extra.errors.map_or_else(|| dice.normal(0.0, 0.01), |e| e.metered);
            for (at, litres) in [6.0, 12.0, 18.0, 24.0].into_iter().zip(&log.added) {
                builder.added(at, litres * (1.0 + meter));
            }
        }
        Kind::Cylinder => {
            for at in [6.0, 12.0, 18.0, 24.0] {
                builder.event(at, What::OxygenAdd(None));
            }
            builder.session.cylinder =
                Some(cylinder(log.injected + log.added.iter().sum::<f64>(), &truth, dice));
        }
        _ => {}
    }
    builder.session.readings = readings(&log);
    Scene { line: builder.line, session: builder.session, log, truth }
}

fn readings(log: &Log) -> SessionReadings {
    let cell = |i: usize| CellReadings {
        name: format!("c{}", i + 1),
        signal: CellSignal::Bar(log.cells[i].clone()),
    };
    SessionReadings {
        time_s: log.time_s.clone(),
        cells: (0..3).map(cell).collect(),
        depth_m: None,
        loop_temperature_k: None,
    }
}

/// A cylinder that lost so many litres: 2 L from 150 bar at 24 °C. Its true contents follow a table of the compressibility of
/// oxygen at 24 °C (CoolProp 8.0), interpolated; gauge and thermometer err as stated.
fn cylinder(lost_l: f64, truth: &Truth, dice: &mut Dice) -> Cylinder {
    let contents = |gauge: f64| {
        let p = gauge + truth.ambient_bar;
        2.0 * p / 1.013_25 * 273.15 / 297.15 / oxygen_z(p)
    };
    let (from, mut low, mut high) = (150.0, 0.0, 150.0);
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if contents(from) - contents(middle) > lost_l { low = middle } else { high = middle }
    }
    let (bar, k) = (0.2, 0.2);
    let p = |p: f64, dice: &mut Dice| Uncertain {
        value: GaugePressure::from_bar(p + dice.normal(0.0, bar / 2.0)),
        expanded: Some(PressureDifference::from_bar(bar)),
    };
    let t = |dice: &mut Dice| Uncertain {
        value: Temperature::from_c(24.0 + dice.normal(0.0, k / 2.0)),
        expanded: Some(TemperatureDifference::from_k(k)),
    };
    Cylinder {
        volume: Uncertain {
            value: Volume::from_m3(0.002 * (1.0 + dice.normal(0.0, 0.005))),
            expanded: Some(Volume::from_m3(0.000_02)),
        },
        from: p(from, dice),
        from_temperature: t(dice),
        to: p(low, dice),
        to_temperature: t(dice),
        feeds: Feeds::All,
    }
}

/// Compressibility factor of oxygen at 24 °C between 100 and 160 bar.
fn oxygen_z(bar: f64) -> f64 {
    const TABLE: [(f64, f64); 4] = Z_24C;
    for pair in TABLE.windows(2) {
        let ((a, za), (b, zb)) = (pair[0], pair[1]);
        if bar <= b {
            return za + (zb - za) * (bar - a) / (b - a);
        }
    }
    TABLE[3].1
}

/// (bar, Z) at 297.15 K.
const Z_24C: [(f64, f64); 4] = [(100.0, 0.950_54), (120.0, 0.945_50), (140.0, 0.942_40), (160.0, 0.941_29)];

/// The record as it grows.
struct Builder<'a> {
    acts: Vec<(f64, Act)>,
    session: Session,
    line: Option<InjectionLine>,
    /// The flow meter's error in this session, relative.
    meter: f64,
    errors: Option<Errors>,
    feed: Option<(&'a Feed, Gas)>,
}

/// Where the gas that is injected comes from.
#[derive(Debug, Clone, Copy)]
struct Gas {
    ambient_bar: f64,
    kelvin: f64,
}

impl<'a> Builder<'a> {
    fn new(truth: &Truth, extra: &Extra, feed: Option<&'a Feed>, dice: &mut Dice) -> Self {
        let volume_u_l = extra.volume_u_l;
        let errors = extra.errors;
        let off_l = errors.map_or_else(|| dice.normal(0.0, volume_u_l), |e| e.volume_l);
        let off_bar = errors.map_or_else(|| dice.normal(0.0, 0.001), |e| e.barometer_bar);
        let plus_minus_bar = |bar: f64| Some(PressureDifference::from_bar(bar));
        let session = Session {
            diver: Id::new("D-07").unwrap(),
            mass: None,
            place: Place::Couch,
            kept: LoopKept::Held,
            diluent: Diluent::Air,
            loop_volume: Some(Uncertain {
                value: Volume::from_m3((truth.volume_l + off_l) / 1e3),
                expanded: Some(Volume::from_m3(2.0 * volume_u_l / 1e3)),
            }),
            leak_test: LeakTest::Passed,
            nose_clip: Some(true),
            oxygen: Some(Purity { fraction: 0.995, expanded: 0.003 }),
            taken: DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap(),
            readings: SessionReadings::default(),
            line: None,
            conditions: SessionConditions {
                barometer: Influence {
                    value: Some(AbsolutePressure::from_bar(truth.ambient_bar + off_bar)),
                    expanded: plus_minus_bar(0.002),
                },
                loop_temperature: Influence {
                    value: Some(Temperature::from_c(33.0)),
                    expanded: Some(TemperatureDifference::from_k(4.0)),
                },
                time_on_loop: Some(Span::from_s(truth.on_loop_min * 60.0)),
                scrubber_warm: Some(true),
                ..SessionConditions::default()
            },
            cells: ebbline::entry::CellPapers { gain: Some(0.02), calibrated_at: None },
            rest: Rest::default(),
            assumptions: ebbline::entry::Assumptions::DEFAULT,
            events: Vec::new(),
            cylinder: None,
        };
        let meter = errors.map_or_else(|| dice.normal(0.0, 0.01), |e| e.flow);
        // The gas at the orifice is that of the room, which the session takes for 20 °C ± 5 °C.
        let feed = feed.map(|feed| {
            (feed, Gas { ambient_bar: truth.ambient_bar, kelvin: 293.15 + dice.normal(0.0, 2.5) })
        });
        let line = feed.map(|(feed, _)| feed.line.clone());
        Self { acts: Vec::new(), session, line, meter, errors, feed }
    }

    fn event(&mut self, at_min: f64, what: What) {
        self.session.events.push(Event { at_s: at_min * 60.0, what });
    }

    /// A true flow, and what the diver's meter says it is.
    fn inject(&mut self, at_min: f64, flow: f64, dice: &mut Dice) {
        if let Some((feed, gas)) = self.feed.filter(|_| flow > 0.0) {
            let (shown_bar, flow) = feed.set(flow, gas.ambient_bar, gas.kelvin, dice);
            self.acts.push((at_min, Act::Inject(flow)));
            let ip = Uncertain {
                value: GaugePressure::from_bar(shown_bar),
                expanded: Some(PressureDifference::from_bar(feed.gauge_expanded_bar)),
            };
            return self.event(at_min, What::Injection(Injection::Ip(ip)));
        }
        self.acts.push((at_min, Act::Inject(flow)));
        let shown = flow * (1.0 + self.meter);
        let injection = if flow > 0.0 {
            Injection::Flow(Uncertain {
                value: StpdFlow::from_l_min(shown),
                expanded: Some(StpdFlow::from_l_min(0.02 * shown)),
            })
        } else {
            Injection::Off
        };
        self.event(at_min, What::Injection(injection));
    }

    /// A true flow by an intermediate pressure through a line that is a little wrong, on a gauge that is a little off.
    fn through_a_line(&mut self, at_min: f64, flow: f64, dice: &mut Dice) {
        self.acts.push((at_min, Act::Inject(flow)));
        let slope = 0.033;
        let gas_c = self.errors.map_or_else(|| dice.normal(20.0, 2.5), |e| 20.0 + e.gas_k);
        let at_20 = flow / (293.15 / (gas_c + 273.15)).sqrt();
        let ambient_bar = match self.errors {
            Some(errors) => self.session.conditions.barometer.value.unwrap().as_bar() - errors.barometer_bar,
            None => self.session.conditions.barometer.value.unwrap().as_bar(),
        };
        let true_ip = at_20 / slope + 0.1 - ambient_bar;
        let off = match self.errors {
            Some(errors) => errors.line,
            None => {
                let gain = dice.normal(0.0, 0.005);
                (-0.1 * slope * gain, slope * gain)
            }
        };
        self.line = Some(InjectionLine {
            intercept: -0.1 * slope + off.0,
            slope: slope + off.1,
            intercept_variance: LINE_RANDOM.0,
            slope_variance: LINE_RANDOM.1,
            covariance: LINE_RANDOM.2,
            random_dof: 8.0,
            common: vec![ebbline::uptake::LineShift {
                source: Some(ebbline::bench::correct::Source::MeterGain),
                intercept: -0.1 * slope * LINE_GAIN,
                slope: slope * LINE_GAIN,
            }],
        });
        let off_bar = self.errors.map_or_else(|| dice.normal(0.0, 0.1), |e| e.ip_bar);
        self.event(
            at_min,
            What::Injection(Injection::Ip(Uncertain {
                value: GaugePressure::from_bar(true_ip + off_bar),
                expanded: Some(PressureDifference::from_bar(0.2)),
            })),
        );
    }

    /// Oxygen added by hand and metered.
    fn oxygen(&mut self, at_min: f64, litres: f64) {
        self.acts.push((at_min, Act::Oxygen(litres)));
        self.added(at_min, litres);
    }

    fn added(&mut self, at_min: f64, litres: f64) {
        let at = ReferenceConditions {
            temperature: Temperature::from_c(25.0),
            pressure: AbsolutePressure::from_bar(1.013),
        };
        let shown = litres / at.stpd_factor();
        self.event(
            at_min,
            What::OxygenAdd(Some(Metered {
                volume: Uncertain {
                    value: Volume::from_m3(shown / 1e3),
                    expanded: Some(Volume::from_m3(0.02 * shown / 1e3)),
                },
                reads_at: Some(at),
            })),
        );
    }
}
