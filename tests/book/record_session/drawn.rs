//! A session drawn from numbers between 0 and 1: whatever a file can say.

use chrono::{DateTime, Duration};
use ebbline::entry::{
    Assumptions, CalibratedAt, CellPapers, CellReadings, CellSignal, Cylinder, Diluent, Event, Feeds, Id,
    Influence, Injection, LeakTest, LineReference, LoopKept, Metered, Place, Purity, Rest, Session,
    SessionConditions, SessionReadings, What,
};
use ebbline::gas::Water;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Length, Mass, PressureDifference, Quantity, ReferenceConditions, Share,
    Span, StpdFlow, Temperature, TemperatureDifference, Uncertain, Volume,
};
use ebbline::record::hidden_character;

/// Numbers that were drawn, one after another, from the beginning again when there are no more.
struct Draw<'d> {
    drawn: &'d [f64],
    at: usize,
}

impl Draw<'_> {
    fn between(&mut self, low: f64, high: f64) -> f64 {
        let drawn = self.drawn[self.at % self.drawn.len()];
        self.at += 1;
        low + (high - low) * drawn
    }

    /// One of `many`, counted from 0.
    fn one_of(&mut self, many: usize) -> usize {
        (self.between(0.0, many as f64) as usize).min(many - 1)
    }

    fn chance(&mut self) -> bool {
        self.one_of(2) == 1
    }

    fn some<T>(&mut self, make: impl FnOnce(&mut Self) -> T) -> Option<T> {
        if self.chance() { Some(make(self)) } else { None }
    }

    fn quantity<T: Quantity>(&mut self, low: f64, high: f64) -> T {
        T::from_si(self.between(low, high))
    }

    fn uncertain<T: Quantity>(&mut self, low: f64, high: f64) -> Uncertain<T, T::Difference> {
        let value = self.quantity(low, high);
        Uncertain { value, expanded: self.some(|d| d.quantity(0.0, high / 10.0)) }
    }

    fn influence<T: Quantity>(&mut self, low: f64, high: f64, column: bool) -> Influence<T, T::Difference> {
        if column {
            return Influence { value: None, expanded: self.some(|d| d.quantity(0.0, high / 10.0)) };
        }
        self.some(|d| d.uncertain::<T>(low, high)).map_or_else(Influence::default, Influence::from)
    }

    fn span(&mut self) -> Span {
        self.quantity(1e-3, 1e5)
    }

    /// A flow of some litres per minute.
    fn flow(&mut self) -> StpdFlow {
        self.quantity(0.0, 5e-5)
    }

    fn flows(&mut self) -> (StpdFlow, StpdFlow) {
        let (a, b) = (self.flow(), self.flow());
        match self.one_of(3) {
            0 => (a, a),
            _ if a < b => (a, b),
            _ => (b, a),
        }
    }
}

/// A session drawn from numbers between 0 and 1, with free texts made of `words`.
pub(crate) fn session(drawn: &[f64], words: &str) -> Session {
    let mut draw = Draw { drawn, at: 0 };
    let d = &mut draw;
    let seen: String = words.chars().filter(|c| hidden_character(&c.to_string()).is_none()).collect();
    let words = format!("{}.", seen.trim());
    let readings = readings(d, &words);
    let in_volts = readings.cells.iter().any(|cell| matches!(cell.signal, CellSignal::Volts { .. }));
    let kept = [LoopKept::Sealed, LoopKept::Held, LoopKept::Topped][d.one_of(3)];
    let line = [
        None,
        Some(LineReference::RunFile(format!("runs/{words}.toml"))),
        Some(LineReference::Orifice(Id::new("CMF-0417").unwrap())),
    ];
    let line = line[d.one_of(3)].clone();
    let events = events(d, &readings, line.is_some());
    let topped = kept == LoopKept::Topped
        || events.iter().any(|e| matches!(e.what, What::MakeUp { kept: Some(LoopKept::Topped), .. }));
    let taken = DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap();
    let cylinder = if topped { d.some(cylinder) } else { None };
    Session {
        diver: Id::new("D-07").unwrap(),
        mass: d.some(|d| Mass::from_kg(d.between(40.0, 150.0))),
        place: [Place::Couch, Place::Pool][d.one_of(2)],
        kept,
        diluent: [Diluent::Air, Diluent::Oxygen(Share::from_ratio(d.between(0.05, 0.9)))][d.one_of(2)],
        loop_volume: d.some(|d| d.uncertain(1e-3, 2e-2)),
        leak_test: [
            LeakTest::Passed,
            LeakTest::NotDone,
            LeakTest::Measured(Uncertain { value: d.flow(), expanded: d.some(Draw::flow) }),
        ][d.one_of(3)],
        nose_clip: d.some(Draw::chance),
        oxygen: d.some(|d| Purity { fraction: d.between(0.9, 1.0), expanded: d.between(0.0, 0.05) }),
        taken: taken + Duration::nanoseconds(d.between(0.0, 1e15) as i64),
        conditions: SessionConditions {
            barometer: d.influence::<AbsolutePressure>(7e4, 1.1e5, false),
            depth: d.influence::<Length>(0.0, 6.0, readings.depth_m.is_some()),
            water: [Water::Fresh, Water::Sea][d.one_of(2)],
            loop_temperature: d.influence::<Temperature>(280.0, 315.0, readings.loop_temperature_k.is_some()),
            time_on_loop: d.some(Draw::span),
            scrubber_warm: d.some(Draw::chance),
        },
        cells: CellPapers {
            gain: d.some(|d| d.between(0.0, 0.1)),
            calibrated_at: if in_volts { Some(calibrated_at(d)) } else { d.some(calibrated_at) },
        },
        rest: Rest {
            posture: d.some(|_| words.clone()),
            rested_for: d.some(Draw::span),
            last_meal: d.some(Draw::span),
            last_exercise: d.some(Draw::span),
            last_dive: d.some(Draw::span),
            caffeine_or_nicotine: d.some(Draw::chance),
            water_temperature: d.some(|d| d.quantity(275.0, 310.0)),
            suit: d.some(|_| format!("\\{words}\"")),
        },
        assumptions: if d.chance() { assumptions(d) } else { Assumptions::DEFAULT },
        readings,
        line,
        events,
        cylinder,
    }
}

fn readings(d: &mut Draw<'_>, words: &str) -> SessionReadings {
    let rows = 2 + d.one_of(12);
    let mut time_s: Vec<f64> = (0..rows).map(|_| d.between(-10.0, 4e3)).collect();
    time_s[0] = 0.0;
    // Rows without a time, times that stand twice; the last row is the latest, so that events have room.
    for row in 1..rows {
        match d.one_of(6) {
            0 => time_s[row] = f64::NAN,
            1 => time_s[row] = time_s[row - 1],
            _ => {}
        }
    }
    time_s[rows - 1] = 5e3;
    let gaps = |d: &mut Draw<'_>, low: f64, high: f64, never: bool| -> Vec<f64> {
        let missing = |d: &mut Draw<'_>| d.one_of(5) == 0 && !never;
        (0..rows).map(|_| if missing(d) { f64::NAN } else { d.between(low, high) }).collect()
    };
    let cells = (0..=d.one_of(4)).map(|i| {
        let signal = match d.one_of(2) {
            // The first cell always reads: a row without any reading is no row.
            0 => CellSignal::Bar(gaps(d, -0.05, 1.6, i == 0)),
            _ => CellSignal::Volts {
                readings: gaps(d, -0.001, 0.1, i == 0),
                in_air: d.between(0.0, 0.02),
                in_oxygen: d.between(0.03, 0.1),
            },
        };
        CellReadings { name: format!("{words} {i}"), signal }
    });
    let cells = cells.collect();
    let depth_m = d.some(|d| gaps(d, -0.9, 6.0, false));
    let loop_temperature_k = d.some(|d| gaps(d, 280.0, 315.0, false));
    SessionReadings { time_s, cells, depth_m, loop_temperature_k }
}

fn events(d: &mut Draw<'_>, readings: &SessionReadings, has_line: bool) -> Vec<Event> {
    let last_s = readings.time_s.iter().copied().fold(0.0, f64::max);
    let off = Event { at_s: 0.0, what: What::Injection(Injection::Off) };
    let mut events = vec![off];
    for _ in 0..d.one_of(8) {
        let at_s = d.between(0.0, last_s);
        let amount = d.some(|d| Metered {
            volume: d.uncertain(1e-5, 1e-2),
            reads_at: d.some(|d| ReferenceConditions {
                temperature: d.quantity(270.0, 320.0),
                pressure: d.quantity(8e4, 1.1e5),
            }),
        });
        let what = match d.one_of(8) {
            0 => {
                What::Injection(Injection::Flow(Uncertain { value: d.flow(), expanded: d.some(Draw::flow) }))
            }
            1 if has_line => What::Injection(Injection::Ip(d.uncertain::<GaugePressure>(0.0, 2e6))),
            2 => What::OxygenAdd(amount),
            3 => What::DiluentAdd(amount),
            4 => What::Vent(amount),
            5 => {
                What::MakeUp { kept: Some([LoopKept::Held, LoopKept::Topped][d.one_of(2)]), mark: d.chance() }
            }
            6 => What::Exclude { until_s: d.between(at_s, 2.0 * last_s) },
            7 => What::Stop,
            _ => What::MakeUp { kept: None, mark: true },
        };
        events.push(Event { at_s, what });
    }
    events
}

fn calibrated_at(d: &mut Draw<'_>) -> CalibratedAt {
    CalibratedAt {
        barometer: d.quantity(8e4, 1.1e5),
        temperature: d.quantity(270.0, 320.0),
        humidity: d.between(0.0, 1.0),
        oxygen: d.between(0.9, 1.0),
    }
}

fn cylinder(d: &mut Draw<'_>) -> Cylinder {
    Cylinder {
        volume: d.uncertain(1e-3, 1.5e-2),
        from: d.uncertain::<GaugePressure>(1e6, 3e7),
        from_temperature: d.uncertain::<Temperature>(270.0, 320.0),
        to: d.uncertain::<GaugePressure>(1e5, 2e7),
        to_temperature: d.uncertain::<Temperature>(270.0, 320.0),
        feeds: [Feeds::All, Feeds::Adds][d.one_of(2)],
    }
}

fn assumptions(d: &mut Draw<'_>) -> Assumptions {
    Assumptions {
        dead_time: d.span(),
        warm_up: d.span(),
        lung_share: d.between(0.0, 1.0),
        lung_carbon_dioxide: PressureDifference::from_pa(d.between(0.0, 7e3)),
        washout: d.flows(),
        washout_time: d.span(),
        sealed_fraction: d.between(0.0, 1.0),
        sealed_wait: d.span(),
        wander: d.between(0.0, 0.2),
        least_wander: d.between(0.0, 0.1),
        wander_time: d.span(),
        leak: d.some(Draw::flows),
        day_spread: d.between(1e-9, 0.2),
        day_spread_weight: d.between(1e-3, 30.0),
        cell_limit: PressureDifference::from_pa(d.between(1.0, 2e4)),
        cell_faults: d.between(0.0, 1.0),
        cell_gain: d.between(0.0, 0.1),
        flush: d.between(0.0, 0.1),
        depth_drift: Length::from_m(d.between(0.0, 1.0)),
        ip_gauge: PressureDifference::from_pa(d.between(0.0, 1e5)),
        flow: d.between(0.0, 0.1),
        metered: d.between(0.0, 0.1),
        gas_temperature: (
            Temperature::from_k(d.between(270.0, 320.0)),
            TemperatureDifference::from_k(d.between(0.0, 10.0)),
        ),
        loop_volume: d.between(0.0, 0.5),
        mark: Volume::from_m3(d.between(0.0, 1e-3)),
        average_over: d.span(),
        least_usable: d.span(),
    }
}
