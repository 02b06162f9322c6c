//! A bench run logged from readings that are made up: when a point is taken and when it is refused, and what is handed over.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
use ebbline::entry::{
    Amount, Id, Instrument, InstrumentPapers, Measures, Papers, Protocol, Sweep, Transducer,
};
use ebbline::instrument::{Fault, FaultKind, Heard, Lost, Reading, What};
use ebbline::logger::{
    BenchLogger, BenchOptions, Block, By, InMemory, Ledger, NotSteady, Refusal, Role, SetupError, Taken,
    Trouble, TroubleAt,
};
use ebbline::quantity::unit::lookup;
use ebbline::quantity::{Kind, PressureDifference, Span};
use ebbline::series::mean_of_span;
use ebbline::stats::monte_carlo::Random;

fn instrument(id: &str, measures: Measures) -> Instrument {
    Instrument {
        id: Id::new(id).unwrap(),
        measures,
        socket: None,
        baud: None,
        frame: None,
        unit: None,
        protocol: None,
        papers: None,
    }
}

fn pair() -> Vec<Instrument> {
    vec![instrument("FM-1", Measures::Flow), instrument("PT-1", Measures::Pressure)]
}

fn with_barometer() -> Vec<Instrument> {
    let protocol = Protocol::Lines {
        ask: None,
        every: None,
        ends: "\n".to_owned(),
        pattern: "(?P<value>.*)".to_owned(),
        stale_after: Some(Span::from_s(5.0)),
    };
    let barometer = Instrument { protocol: Some(protocol), ..instrument("B-1", Measures::Barometer) };
    [pair(), vec![barometer]].concat()
}

fn reading(kind: Kind, symbol: &str, shown: f64) -> What {
    let unit = lookup(kind, symbol).unwrap();
    What::Reading(Reading { si: unit.to_si(shown), shown, unit })
}

/// A bench that is made up: flow in L/min is a twentieth of the absolute pressure in bar, ten readings a second of each.
struct Bench {
    logger: BenchLogger,
    ledger: InMemory,
    random: Random,
    at_s: f64,
    /// Standard deviations of pressure in bar and of flow as a share.
    noise: (f64, f64),
    frozen_flow: Option<f64>,
    /// What was said of flow, and of pressure, with the seconds.
    flow: Vec<(f64, f64)>,
    pressure: Vec<(f64, f64)>,
}

impl Bench {
    fn new(instruments: &[Instrument], options: BenchOptions) -> Self {
        Self {
            logger: BenchLogger::new(instruments, options).unwrap(),
            ledger: InMemory::default(),
            random: Random::new(5, 0),
            at_s: 0.0,
            noise: (0.002, 0.001),
            frozen_flow: None,
            flow: Vec::new(),
            pressure: Vec::new(),
        }
    }

    fn say(&mut self, instrument: usize, what: What) -> Option<Taken> {
        self.logger.hear(&Heard { instrument, at_s: self.at_s, what })
    }

    /// Pressure by the seconds since the beginning of this, for so long; goes out: the points taken.
    fn goes(&mut self, for_s: f64, bar: impl Fn(f64) -> f64) -> Vec<Taken> {
        let mut taken = Vec::new();
        let steps = (for_s * 10.0).round() as u32;
        let began_s = self.at_s;
        for _ in 0..steps {
            let true_bar = bar(self.at_s - began_s);
            let shown = ((true_bar + self.noise.0 * self.random.normal()) * 1e3).round() / 1e3;
            let flow = (true_bar + 1.01325) / 20.0 * (1.0 + self.noise.1 * self.random.normal());
            let flow = self.frozen_flow.unwrap_or((flow * 1e4).round() / 1e4);
            self.pressure.push((self.at_s, shown));
            self.flow.push((self.at_s, flow));
            taken.extend(self.say(1, reading(Kind::Pressure, "bar", shown)));
            taken.extend(self.say(0, reading(Kind::Flow, "L/min", flow)));
            self.logger.tick(self.at_s);
            self.logger.hand_over(self.at_s, &mut self.ledger).unwrap();
            self.at_s += 0.1;
        }
        taken
    }

    fn holds(&mut self, for_s: f64, bar: f64) -> Vec<Taken> {
        self.goes(for_s, |_| bar)
    }

    fn sign(&self) -> Result<f64, NotSteady> {
        self.logger.live(self.at_s).sign.map(|steady| steady.to_s - steady.from_s)
    }
}

fn values(said: &[(f64, f64)], taken: &Taken) -> Vec<f64> {
    said.iter().filter(|(t, _)| (taken.from_s..=taken.to_s).contains(t)).map(|(_, x)| *x).collect()
}

#[test]
fn a_level_gives_one_point_with_the_mean_of_its_span_and_its_uncertainty() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    let taken = bench.holds(40.0, 6.0);
    assert_eq!(taken.len(), 1, "{taken:?}");
    let point = taken[0];
    assert_eq!((point.number, point.by), (1, By::Itself));
    let lasts_s = point.to_s - point.from_s;
    assert!((10.0..12.5).contains(&lasts_s), "{lasts_s} s");
    let flow = mean_of_span(&values(&bench.flow, &point)).unwrap();
    let pressure = mean_of_span(&values(&bench.pressure, &point)).unwrap();
    let reading = point.reading;
    assert!((reading.flow.as_l_min() - flow.mean).abs() < 1e-12);
    assert!((reading.flow_scatter.unwrap().as_l_min() - flow.scatter).abs() < 1e-12);
    assert!((reading.pressure.shown_pa() / 1e5 - pressure.mean).abs() < 1e-9);
    assert!((reading.pressure_scatter.unwrap().as_pa() / 1e5 - pressure.scatter).abs() < 1e-9);
    assert!((reading.averaged - flow.effective.min(pressure.effective)).abs() < 1e-6);
    // Noise of 0.1 % over some hundred readings: a hundredth of a per cent.
    assert!((reading.flow.as_l_min() - 7.01325 / 20.0).abs() < 5e-5);
    assert!((reading.time_s.unwrap() - (point.from_s + point.to_s) / 2.0).abs() < 1e-9);
    // Nobody knows yet where it was reached from.
    assert_eq!(reading.sweep, None);
    assert_eq!(bench.ledger.points, taken);
    let live = bench.logger.live(bench.at_s);
    assert!(live.taken_here && live.points == 1 && live.sign.is_ok());
}

#[test]
fn the_next_point_needs_a_step_and_the_sweep_is_seen_from_the_order() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    assert_eq!(bench.holds(20.0, 6.0).len(), 1);
    // Less than the stated step, up and down again.
    assert!(bench.holds(25.0, 6.06).is_empty() && bench.holds(25.0, 5.98).is_empty());
    assert_eq!(bench.holds(25.0, 6.5).len(), 1);
    assert_eq!(bench.holds(25.0, 7.0).len(), 1);
    // Away without a point, and back at the same level: a new one.
    assert!(bench.holds(8.0, 8.0).is_empty());
    assert_eq!(bench.holds(25.0, 7.0).len(), 1);
    let sweeps: Vec<_> = bench.logger.points().iter().map(|point| point.reading.sweep).collect();
    assert_eq!(sweeps[..3], [Some(Sweep::Rising); 3]);
    assert_eq!(sweeps[3], Some(Sweep::Falling));
    // What the ledger had at once does not change.
    assert_eq!(bench.ledger.points[0].reading.sweep, None);
    assert_eq!(bench.ledger.points[1].reading.sweep, Some(Sweep::Rising));
}

#[test]
fn a_slow_ramp_gives_no_point_and_says_so() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    // 0.3 bar a minute are 50 mbar in ten seconds, of which 20 are allowed, and too little to be a step in 2.5 s.
    let taken = bench.goes(60.0, |t| 8.0 - 0.3 * t / 60.0);
    assert!(taken.is_empty(), "{taken:?}");
    let sign = bench.sign().unwrap_err();
    let NotSteady::PressureDrifts { rate_pa_s } = sign else { panic!("{sign}") };
    assert!((rate_pa_s * 60.0 / 1e5 + 0.3).abs() < 0.01, "{rate_pa_s}");
    assert_eq!(sign.to_string(), "pressure still falling 0.30 bar/min");
    assert_eq!(
        bench.logger.take_now(bench.at_s).unwrap_err().to_string(),
        "no point: pressure still falling 0.30 bar/min"
    );
    // 3 bar a minute is a hand on the knob.
    bench.goes(15.0, |t| 7.7 - 3.0 * t / 60.0);
    assert!(matches!(bench.sign(), Err(NotSteady::PressureMoves { rate_pa_s }) if rate_pa_s < -4_000.0));
}

#[test]
fn on_demand_a_point_is_taken_of_new_readings_only_and_refused_with_the_reason() {
    let options = BenchOptions { by_itself: false, ..BenchOptions::default() };
    let mut bench = Bench::new(&pair(), options);
    assert_eq!(
        bench.logger.take_now(0.0).unwrap_err(),
        Refusal::NotSteady(NotSteady::NothingHeard { role: Role::Flow })
    );
    bench.holds(6.0, 6.0);
    let refused = bench.logger.take_now(bench.at_s).unwrap_err();
    assert!(
        matches!(refused, Refusal::NotSteady(NotSteady::TooShort { held_s, .. }) if held_s < 6.0),
        "{refused}"
    );
    assert!(bench.holds(24.0, 6.0).is_empty());
    let first = bench.logger.take_now(bench.at_s).unwrap();
    // All that is steady, not only the least.
    assert!(first.by == By::Hand && first.to_s - first.from_s > 25.0);
    bench.holds(5.0, 6.0);
    let refused = bench.logger.take_now(bench.at_s).unwrap_err();
    assert!(
        matches!(refused, Refusal::SameReadings { wait_s, .. } if (4.0..7.0).contains(&wait_s)),
        "{refused}"
    );
    bench.holds(8.0, 6.0);
    let second = bench.logger.take_now(bench.at_s).unwrap();
    assert!(second.number == 2 && second.from_s > first.to_s);
}

#[test]
fn no_point_with_a_stale_instrument_and_it_is_named_once() {
    let mut bench = Bench::new(&with_barometer(), BenchOptions::default());
    assert!(bench.holds(15.0, 6.0).is_empty());
    assert_eq!(bench.sign(), Err(NotSteady::NothingHeard { role: Role::Barometer }));
    bench.say(2, reading(Kind::Pressure, "hPa", 1009.2));
    // Five seconds are allowed.
    let taken = bench.holds(4.0, 6.0);
    assert_eq!(taken.len(), 1);
    assert!((taken[0].reading.barometer.unwrap().as_pa() - 100_920.0).abs() < 1e-6);
    assert!(bench.holds(20.0, 7.0).is_empty());
    assert!(matches!(bench.sign(), Err(NotSteady::Stale { role: Role::Barometer, age_s }) if age_s > 20.0));
    assert!(bench.logger.take_now(bench.at_s).is_err());
    // A fault is not a reading.
    bench.say(2, What::Fault(Fault::new(FaultKind::Garbage, b"\x7f")));
    assert!(bench.sign().is_err());
    bench.say(2, reading(Kind::Pressure, "hPa", 1009.3));
    assert_eq!(bench.holds(3.0, 7.0).len(), 1);
    // A lost port is stale at once.
    bench.say(1, What::Lost(Lost::Closed));
    assert!(matches!(bench.sign(), Err(NotSteady::Stale { role: Role::Pressure, .. })));
    bench.logger.hand_over_all(bench.at_s, &mut bench.ledger).unwrap();
    let count = |wanted: &Trouble| bench.ledger.faults.iter().filter(|one| one.what == *wanted).count();
    assert_eq!((count(&Trouble::Stale), count(&Trouble::Fresh)), (1, 1));
    let live = bench.logger.live(bench.at_s);
    assert_eq!(live.channels[2].faults.get(&FaultKind::Garbage), Some(&1));
    assert_eq!((live.channels[1].connected, live.channels[1].stale), (Some(false), true));
}

#[test]
fn a_value_frozen_longer_than_noise_allows_is_named_and_gives_no_point() {
    let mut with_papers = pair();
    with_papers[1].papers = Some(InstrumentPapers::Transducer(Transducer {
        id: None,
        papers: Papers {
            gain: None,
            zero: None,
            noise: Some(Amount::Fixed(PressureDifference::from_bar(0.004))),
            resolution: Some(PressureDifference::from_bar(0.001)),
            coverage: 2.0,
            range: None,
            certificate: None,
            due: None,
        },
    }));
    // By the papers: nothing else moves.
    let mut bench = Bench::new(&with_papers, BenchOptions::default());
    bench.noise.0 = 0.0;
    assert!(bench.holds(30.0, 6.0).is_empty());
    assert!(matches!(bench.sign(), Err(NotSteady::Frozen { role: Role::Pressure, for_s }) if for_s > 29.0));
    // Without papers a display that never moves is a quiet one.
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    bench.noise.0 = 0.0;
    assert_eq!(bench.holds(30.0, 6.0).len(), 1);
    // A flow that stays while the pressure is stepped is frozen all the same.
    bench.noise.0 = 0.002;
    bench.holds(20.0, 6.5);
    bench.frozen_flow = Some(0.3757);
    bench.holds(5.0, 6.5);
    let taken = bench.holds(30.0, 7.5);
    assert!(taken.is_empty(), "{taken:?}");
    assert!(matches!(bench.sign(), Err(NotSteady::Frozen { role: Role::Flow, .. })), "{:?}", bench.sign());
    bench.frozen_flow = None;
    assert_eq!(bench.holds(30.0, 7.5).len(), 1);
    let named: Vec<&TroubleAt> = bench
        .ledger
        .faults
        .iter()
        .filter(|one| matches!(one.what, Trouble::Frozen { .. } | Trouble::Thawed))
        .collect();
    assert_eq!(named.len(), 2, "{named:?}");
    assert!(named.iter().all(|one| one.instrument == 0));
}

#[test]
fn scatter_that_hides_a_drift_waits_for_more_readings() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    // 5 % over a hundred readings is half a per cent, over three hundred three tenths, which is the limit.
    bench.noise.1 = 0.05;
    assert!(bench.holds(15.0, 6.0).is_empty());
    assert!(matches!(bench.sign(), Err(NotSteady::Scatters { role: Role::Flow, share }) if share > 0.003));
    assert_eq!(bench.holds(45.0, 6.0).len(), 1);
}

#[test]
fn without_pressure_there_is_no_point() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    assert!(bench.holds(30.0, 0.0).is_empty());
    assert!(matches!(bench.sign(), Err(NotSteady::NoPressure { .. })));
}

#[test]
fn a_clock_that_is_set_back_begins_anew() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    assert_eq!(bench.holds(20.0, 6.0).len(), 1);
    bench.at_s -= 3_600.0;
    assert!(bench.holds(8.0, 7.0).is_empty());
    assert_eq!(bench.holds(12.0, 7.0).len(), 1);
    let back = bench.ledger.faults.iter().filter(|one| matches!(one.what, Trouble::TimeRanBack { .. }));
    assert!(back.count() >= 1);
}

#[test]
fn everything_is_handed_over_twice_a_second_and_a_point_at_once_behind_its_readings() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    bench.holds(30.0, 6.0);
    bench.logger.hand_over_all(bench.at_s, &mut bench.ledger).unwrap();
    let beats = &bench.ledger.heartbeats_s;
    assert!(beats.windows(2).all(|two| two[1] - two[0] <= 0.6 + 1e-9), "{beats:?}");
    for (instrument, said) in [(0, &bench.flow), (1, &bench.pressure)] {
        let blocks: Vec<&Block> =
            bench.ledger.blocks.iter().filter(|block| block.instrument == instrument).collect();
        assert!(blocks.iter().all(|block| !block.readings.is_empty() && block.readings.len() <= 7));
        let all: Vec<(f64, f64)> = blocks
            .iter()
            .flat_map(|block| &block.readings)
            .map(|stamped| (stamped.at_s, stamped.reading.shown))
            .collect();
        assert_eq!(&all, said);
    }
}

/// A ledger that refuses a while, and keeps the order of things.
#[derive(Default)]
struct Sulky {
    refuses: bool,
    kept: Vec<String>,
    last_s: f64,
}

impl Sulky {
    fn keep(&mut self, what: String) -> Result<(), &'static str> {
        if self.refuses {
            return Err("the disk is full");
        }
        self.kept.push(what);
        Ok(())
    }
}

impl Ledger for Sulky {
    type Error = &'static str;

    fn readings(&mut self, block: &Block) -> Result<(), &'static str> {
        self.last_s = block.readings.last().unwrap().at_s.max(self.last_s);
        self.keep(format!("{} readings", block.readings.len()))
    }

    fn point(&mut self, point: &Taken) -> Result<(), &'static str> {
        assert!(self.last_s >= point.to_s, "its readings come first");
        self.keep(format!("point {}", point.number))
    }

    fn fault(&mut self, _: &TroubleAt) -> Result<(), &'static str> {
        self.keep("fault".to_owned())
    }

    fn heartbeat(&mut self, _: f64) -> Result<(), &'static str> {
        Ok(())
    }
}

#[test]
fn what_a_ledger_refuses_is_handed_over_again() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    let mut sulky = Sulky { refuses: true, ..Sulky::default() };
    let mut refusals = 0;
    for step in 0..200 {
        sulky.refuses = step < 150;
        bench.logger.hear(&Heard {
            instrument: 1,
            at_s: bench.at_s,
            what: reading(Kind::Pressure, "bar", 6.0 + 0.001 * f64::from(step % 3)),
        });
        let flow = 0.35 + 0.000_1 * f64::from(step % 4);
        bench.logger.hear(&Heard {
            instrument: 0,
            at_s: bench.at_s,
            what: reading(Kind::Flow, "L/min", flow),
        });
        refusals += usize::from(bench.logger.hand_over(bench.at_s, &mut sulky).is_err());
        bench.at_s += 0.1;
    }
    bench.logger.hand_over_all(bench.at_s, &mut sulky).unwrap();
    assert!(refusals > 100, "{refusals}");
    assert_eq!(sulky.kept.iter().filter(|kept| *kept == "point 1").count(), 1);
    let readings = sulky.kept.iter().filter_map(|kept| kept.strip_suffix(" readings")?.parse::<usize>().ok());
    assert_eq!(readings.sum::<usize>(), 400);
}

#[test]
fn instruments_that_make_no_run_are_refused_by_name() {
    let refused = |instruments: &[Instrument]| {
        BenchLogger::new(instruments, BenchOptions::default()).unwrap_err().to_string()
    };
    assert_eq!(refused(&pair()[..1]), "a run needs an instrument that measures pressure: name one");
    let twice = [pair(), vec![instrument("FM-2", Measures::Flow)]].concat();
    assert_eq!(refused(&twice), "FM-1 and FM-2 both measure flow: name one of them");
    let cell = [pair(), vec![instrument("C-1", Measures::Cell)]].concat();
    assert_eq!(
        BenchLogger::new(&cell, BenchOptions::default()).unwrap_err(),
        SetupError::NotForBench { id: "C-1".to_owned(), role: Role::Cell }
    );
}

#[test]
fn a_reading_costs_the_same_however_long_the_run() {
    // What is kept does not grow: after an hour at one level the logger is as small as after two minutes.
    let size = |for_s: f64| {
        let mut bench = Bench::new(&pair(), BenchOptions { by_itself: false, ..BenchOptions::default() });
        bench.holds(for_s, 6.0);
        bench.logger.hand_over_all(bench.at_s, &mut bench.ledger).unwrap();
        format!("{:?}", bench.logger).len()
    };
    let (short, long) = (size(120.0), size(1_200.0));
    assert!(long < short + short / 3, "{short} and {long} bytes");
}

#[test]
fn an_instrument_that_says_thousands_of_numbers_a_second_is_averaged_and_costs_no_more() {
    let mut bench = Bench::new(&pair(), BenchOptions::default());
    let mut taken = Vec::new();
    let mut sizes = Vec::new();
    let mut sums: Vec<(f64, f64)> = Vec::new();
    // Two thousand a second of each for two minutes, all of them with noise.
    for step in 0..240_000_u32 {
        bench.at_s = f64::from(step) / 2e3;
        let bar = 6.0 + 0.02 * bench.random.normal();
        let flow = 0.35 * (1.0 + 0.01 * bench.random.normal());
        sums.push((bench.at_s, flow));
        taken.extend(bench.say(1, reading(Kind::Pressure, "bar", bar)));
        taken.extend(bench.say(0, reading(Kind::Flow, "L/min", flow)));
        bench.logger.hand_over(bench.at_s, &mut bench.ledger).unwrap();
        if step == 150_000 || step == 239_999 {
            bench.logger.hand_over_all(bench.at_s, &mut bench.ledger).unwrap();
            sizes.push(format!("{:?}", bench.logger).len());
        }
    }
    assert_eq!(taken.len(), 1, "{taken:?}");
    let point = taken[0];
    // What was read over the span, every reading of it; its ends are known to a twentieth of a second.
    let flows = values(&sums, &point);
    let mean = flows.iter().sum::<f64>() / flows.len() as f64;
    let scatter = 0.35 * 0.01 / (flows.len() as f64).sqrt();
    assert!(
        (point.reading.flow.as_l_min() - mean).abs() < scatter,
        "{} and {mean}",
        point.reading.flow.as_l_min()
    );
    let stated = point.reading.flow_scatter.unwrap().as_l_min();
    assert!((0.7..1.4).contains(&(stated / scatter)), "{stated} and {scatter}");
    // Twenty rows a second for a minute and a quarter, and not two thousand.
    assert!(sizes.iter().all(|size| *size < 500_000), "{sizes:?} bytes");
    let kept: usize = bench.ledger.blocks.iter().map(|block| block.readings.len()).sum();
    assert_eq!(kept, 480_000);
}

#[test]
fn a_clock_that_jumps_and_stays_loses_nothing() {
    for by_s in [-3_600.0, -0.5, 40.0, 3_600.0] {
        let mut bench = Bench::new(&pair(), BenchOptions::default());
        assert_eq!(bench.holds(20.0, 6.0).len(), 1);
        // In the middle of a hold, and for good.
        bench.holds(5.0, 6.5);
        bench.at_s += by_s;
        assert_eq!(bench.holds(25.0, 6.5).len(), 1, "{by_s}");
        assert_eq!(bench.holds(25.0, 7.0).len(), 1, "{by_s}");
        bench.logger.hand_over_all(bench.at_s, &mut bench.ledger).unwrap();
        for (instrument, said) in [(0, &bench.flow), (1, &bench.pressure)] {
            let blocks = bench.ledger.blocks.iter().filter(|block| block.instrument == instrument);
            let all: Vec<(f64, f64)> = blocks
                .flat_map(|block| &block.readings)
                .map(|stamped| (stamped.at_s, stamped.reading.shown))
                .collect();
            assert_eq!(&all, said, "{by_s}");
        }
        let back: Vec<f64> = bench
            .ledger
            .faults
            .iter()
            .filter_map(|one| if let Trouble::TimeRanBack { by_s } = one.what { Some(by_s) } else { None })
            .collect();
        // Said once, of the instrument that shows it first: what the clock went back, less the tenth of a second since then.
        let expected = if by_s < 0.0 { vec![-by_s - 0.1] } else { Vec::new() };
        assert_eq!(back.len(), expected.len(), "{by_s}: {back:?}");
        assert!(back.iter().zip(&expected).all(|(a, b)| (a - b).abs() < 1e-6), "{by_s}: {back:?}");
        let numbers: Vec<usize> = bench.ledger.points.iter().map(|point| point.number).collect();
        assert_eq!(numbers, [1, 2, 3], "{by_s}");
    }
}
