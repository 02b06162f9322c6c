//! Whole runs logged by themselves on the simulated bench: does the interval hold the rig's own truth, and does any wrong
//! number get among the readings? The clock is virtual, the seeds are fixed, so every figure comes out again.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::print_stdout, reason = "a study is read, not only passed")]

use crate::logger_rig::{Heeded, id};
use ebbline::bench::{Analysis, Questions, analyse};
use ebbline::entry::{
    Build, Conditions, Influence, InstrumentPapers, Measures, PointReading, Purpose, Readings, Run, Sweep,
    ZeroAndLeak,
};
use ebbline::gas::Species;
use ebbline::instrument::Counters;
use ebbline::logger::{BenchLogger, BenchOptions, By, InMemory, Taken, Trouble};
use ebbline::quantity::unit::lookup;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Kind, Length, PressureDifference, Temperature, TemperatureDifference,
};
use ebbline::rig::{Command, Delivery, Fault, Hole, Lasts, Overflow, Planned, Script, Sent, Settings};
use ebbline::stats::monte_carlo::Random;

const BENCH: [Measures; 4] = [Measures::Flow, Measures::Pressure, Measures::Barometer, Measures::Temperature];
/// Up and down, bar gauge.
const LEVELS: [f64; 14] = [4.0, 5.0, 6.0, 7.0, 8.0, 9.0, 10.0, 11.0, 12.0, 13.0, 11.0, 9.0, 7.0, 5.0];
/// A technician who has waited for this long at a level goes on, seconds.
const PATIENCE_S: f64 = 90.0;

/// A run and everything that is known of it afterwards.
struct Logged {
    ledger: InMemory,
    hole: Hole,
    sent: Vec<Sent>,
    counters: Vec<Counters>,
    instruments: Vec<ebbline::entry::Instrument>,
    /// Points with their sweeps.
    points: Vec<Taken>,
    /// Seconds of the clock when it ended.
    lasted_s: f64,
}

/// A run over all levels: IP goes on when a point was taken, or when patience ends.
fn logged(seed: u64, change: impl FnOnce(&mut Settings)) -> Logged {
    let mut random = Random::new(seed, 7);
    let hole = Hole {
        diameter: Length::from_um(random.rectangular(55.0, 105.0)),
        choke_ratio: random.rectangular(0.44, 0.53),
        k: random.rectangular(0.0, 3.0),
    };
    let mut heeded = Heeded::new(seed, &BENCH, |settings| {
        settings.bench.hole = hole;
        settings.bench.script = Script::of_bar(&LEVELS[..1], 1e9);
        change(settings);
    });
    let mut logger = BenchLogger::new(&heeded.instruments, BenchOptions::default()).unwrap();
    let mut ledger = InMemory::default();
    let mut since_s = 0.0;
    let mut levels = LEVELS[1..].iter();
    loop {
        let mut taken = None;
        for heard in heeded.turn() {
            taken = logger.hear(&heard).or(taken);
        }
        let now_s = heeded.now_s();
        logger.tick(now_s);
        logger.hand_over(now_s, &mut ledger).unwrap();
        if taken.is_some() || now_s > since_s + PATIENCE_S {
            let Some(next) = levels.next() else { break };
            since_s = now_s;
            heeded.rig.lock().unwrap().command(Command::Ip(GaugePressure::from_bar(*next))).unwrap();
        }
    }
    logger.hand_over_all(heeded.now_s(), &mut ledger).unwrap();
    let rig = heeded.rig.lock().unwrap();
    Logged {
        ledger,
        hole,
        sent: rig.log().sent().cloned().collect(),
        counters: heeded.streams.counters(),
        points: logger.points().to_vec(),
        lasted_s: heeded.now_s(),
        instruments: heeded.instruments.clone(),
    }
}

impl Logged {
    /// The run as the book would have it, with the papers of the rig's instruments.
    fn analysis(&self) -> Analysis {
        let papers = |measures: Measures| {
            self.instruments.iter().find(|one| one.measures == measures).and_then(|one| one.papers.clone())
        };
        let Some(InstrumentPapers::Meter(meter)) = papers(Measures::Flow) else { panic!("a meter") };
        let Some(InstrumentPapers::Transducer(transducer)) = papers(Measures::Pressure) else { panic!() };
        let readings: Vec<PointReading> = self.points.iter().map(|taken| taken.reading).collect();
        let run = Run {
            orifice: id("CMF-0417"),
            build: Build::Unknown,
            gas: Species::Oxygen,
            purity: None,
            purpose: Purpose::Check,
            taken: chrono::DateTime::parse_from_rfc3339("2026-11-12T09:40:00+11:00").unwrap(),
            technician: None,
            readings: Readings::Points(readings.clone()),
            conditions: Conditions {
                // The rig's thermometer is off by up to 0.5 K, its barometer by up to 1 hPa.
                temperature: Influence { value: None, expanded: Some(TemperatureDifference::from_k(0.5)) },
                barometer: Influence { value: None, expanded: Some(PressureDifference::from_pa(100.0)) },
                ..Conditions::default()
            },
            before: ZeroAndLeak::default(),
            after: ZeroAndLeak::default(),
            meter,
            transducer,
            acceptance: None,
            left_out: Vec::new(),
        };
        let questions = Questions { at: vec![GaugePressure::from_bar(10.0)], ..Questions::default() };
        analyse(&run, &readings, &questions).unwrap()
    }

    /// The rig's true flow at 10 bar gauge over 1.01325 bar, gas of 20 °C, L/min STPD.
    fn true_flow(&self) -> f64 {
        let room = AbsolutePressure::STANDARD_ATMOSPHERE;
        let ip = GaugePressure::from_bar(10.0).above(room);
        self.hole.flow(Species::Oxygen, ip, room, Temperature::from_c(20.0)).as_l_min()
    }

    /// What an instrument meant to say, in SI, with its true value and time, in the order it left the device.
    fn meant(&self, number: usize) -> Vec<(f64, f64, f64, &Sent)> {
        let instrument = &self.instruments[number];
        let kind = match instrument.measures {
            Measures::Flow => Kind::Flow,
            Measures::Temperature => Kind::Temperature,
            _ => Kind::Pressure,
        };
        let mut meant = Vec::new();
        for sent in self.sent.iter().filter(|sent| sent.delivery == Delivery::Whole) {
            for one in sent.message.meant.iter().filter(|one| one.gauge == instrument.id) {
                let unit = lookup(kind, one.unit).unwrap();
                meant.push((sent.message.time_s, unit.to_si(one.value), unit.to_si(one.truth), sent));
            }
        }
        meant
    }

    /// Every reading in the ledger is, in order, one that its instrument meant within the second before it; of a line sent
    /// twice, twice. Goes out: how many there are.
    #[track_caller]
    fn no_wrong_number(&self, what: &str) -> usize {
        let mut readings = 0;
        // A clock that was set is not the rig's any more: then their order has to do.
        let same_clock = self.jumps() == 0;
        for number in 0..self.instruments.len() {
            let meant = self.meant(number);
            let mut next = 0;
            let blocks = self.ledger.blocks.iter().filter(|block| block.instrument == number);
            for stamped in blocks.flat_map(|block| &block.readings) {
                readings += 1;
                let si = stamped.reading.si;
                // A number that changes its unit on the way is rounded again.
                let same = |si_meant: f64| (si - si_meant).abs() <= 1e-6 * si.abs() + 1e-12;
                let again = next > 0
                    && meant[next - 1].3.message.faults.contains(&Fault::Echo)
                    && same(meant[next - 1].1);
                if again {
                    continue;
                }
                // Coarse numbers come again: one that was lost on its way must not be taken for a later one alike.
                let in_time = |said_s: f64| !same_clock || (-1e-6..1.0).contains(&(stamped.at_s - said_s));
                let found = meant.iter().skip(next).position(|one| same(one.1) && in_time(one.0));
                let id = self.instruments[number].id.as_str();
                let found = found.unwrap_or_else(|| {
                    panic!("{what}: {id} never meant {si} in the second before {} s", stamped.at_s);
                });
                next += found + 1;
            }
        }
        readings
    }

    /// How often the clock of whoever reads was set.
    fn jumps(&self) -> usize {
        let set = |sent: &&Sent| sent.message.faults.iter().any(|fault| matches!(fault, Fault::ClockJump(_)));
        self.sent.iter().filter(set).count()
    }

    /// Every point is at the mean of what was true over its span, within what its instruments may be off by.
    #[track_caller]
    fn no_wrong_point(&self, what: &str) {
        for (name, measures, gain, zero) in [
            // Gains of 0.8 % and 0.2 %, zeros of 0.0006 L/min and 0.010 bar, and the lag of half a second.
            ("flow", Measures::Flow, 0.009, 0.000_7 / 6e4),
            ("IP", Measures::Pressure, 0.002_5, 1_100.0),
        ] {
            let number = self.instruments.iter().position(|one| one.measures == measures).unwrap();
            let meant = self.meant(number);
            for point in &self.points {
                let span = point.from_s - 1.0..=point.to_s;
                let (sum, count) = meant
                    .iter()
                    .filter(|one| span.contains(&one.0))
                    .fold((0.0, 0), |(sum, n), one| (sum + one.2, n + 1));
                assert!(count > 0, "{what}: {name} of {point:?}");
                let truth = sum / f64::from(count);
                let got = match measures {
                    Measures::Flow => point.reading.flow.as_m3_s(),
                    _ => point.reading.pressure.shown_pa(),
                };
                assert!(
                    (got - truth).abs() <= gain * truth.abs() + zero,
                    "{what}: {name} of point {} is {got}, the truth {truth}",
                    point.number
                );
            }
        }
    }

    fn named(&self, wanted: impl Fn(&Trouble) -> bool) -> usize {
        self.ledger.faults.iter().filter(|trouble| wanted(&trouble.what)).count()
    }
}

#[test]
fn a_hundred_runs_by_themselves_hold_the_orifice_that_was_simulated() {
    const RUNS: u64 = 100;
    let (mut covered, mut widths, mut seconds, mut levels) = (0, Vec::new(), 0.0, 0);
    let (mut offs, mut readings) = (Vec::new(), 0);
    for seed in 0..RUNS {
        let run = logged(seed, |_| {});
        readings += run.no_wrong_number("no fault");
        run.no_wrong_point("no fault");
        assert_eq!(run.points.len(), LEVELS.len(), "seed {seed}: a point a level");
        assert!(run.points.iter().all(|point| point.by == By::Itself));
        let sweeps: Vec<Sweep> = run.points.iter().map(|point| point.reading.sweep.unwrap()).collect();
        let (rising, falling) = sweeps.split_at(10);
        assert!(
            rising.iter().all(|s| *s == Sweep::Rising) && falling.iter().all(|s| *s == Sweep::Falling),
            "seed {seed}: {sweeps:?}"
        );
        let analysis = run.analysis();
        let (flow, truth) = (&analysis.nominal.flow, run.true_flow());
        covered += usize::from((flow.flow_l_min - truth).abs() <= flow.expanded());
        widths.push(flow.expanded() / truth);
        offs.push((flow.flow_l_min - truth) / flow.standard_uncertainty);
        seconds += run.lasted_s;
        levels += run.points.len();
    }
    widths.sort_by(f64::total_cmp);
    let n = offs.len() as f64;
    let mean = offs.iter().sum::<f64>() / n;
    let percent = 100.0 * covered as f64 / RUNS as f64;
    println!("coverage of the flow at 10 bar: {covered} of {RUNS}");
    println!("median half-width {:.3} % of the flow", 100.0 * widths[widths.len() / 2]);
    println!("mean error {mean:+.3} standard uncertainties");
    println!("{:.1} s a level, {readings} readings", seconds / levels as f64);
    assert!((90.0..=99.0).contains(&percent), "{percent} %");
    assert!(widths[widths.len() / 2] < 0.013);
    // Of a hundred runs the mean error is known to a tenth of a standard uncertainty.
    assert!(mean.abs() < 0.35, "mean error {mean}");
}

/// What is to be seen of a fault afterwards.
#[derive(Clone, Copy, PartialEq, Debug)]
enum Leaves {
    /// Faults that are counted.
    Faults,
    /// A port that was lost and found.
    Loss,
    /// A frozen value that was named.
    Frozen,
    /// Nothing but readings, late or twice.
    Readings,
}

#[test]
fn every_fault_of_the_rig_is_survived_counted_and_never_a_reading() {
    use Leaves::{Faults, Frozen, Loss, Readings};
    let wrong_unit = |unit: &str| Fault::WrongUnit(unit.to_owned());
    let cases = [
        ("rig-flow", Fault::Garbage, Faults),
        ("rig-flow", Fault::HalfLine, Faults),
        ("rig-flow", Fault::Silence, Faults),
        ("rig-flow", Fault::Frozen, Frozen),
        ("rig-flow", Fault::NotANumber, Faults),
        ("rig-flow", Fault::Overflow(Overflow::Ol), Faults),
        ("rig-flow", Fault::Overflow(Overflow::Dashes), Faults),
        ("rig-flow", Fault::Overflow(Overflow::Huge), Faults),
        ("rig-flow", Fault::Unplugged, Loss),
        ("rig-flow", wrong_unit("mL/min"), Readings),
        ("rig-flow", Fault::Echo, Readings),
        ("rig-flow", Fault::Burst, Faults),
        ("rig-flow", Fault::WrongDevice, Faults),
        ("rig-flow", Fault::Late(0.7), Readings),
        ("rig-flow", Fault::ClockJump(40.0), Readings),
        // A frame is found behind noise by its check sum.
        ("rig-ip", Fault::Garbage, Readings),
        ("rig-ip", Fault::HalfLine, Faults),
        ("rig-ip", Fault::Silence, Faults),
        ("rig-ip", Fault::Frozen, Frozen),
        ("rig-ip", Fault::NotANumber, Faults),
        ("rig-ip", Fault::Overflow(Overflow::Huge), Faults),
        ("rig-ip", Fault::Unplugged, Loss),
        ("rig-ip", wrong_unit("psi"), Faults),
        ("rig-ip", Fault::Echo, Readings),
        ("rig-ip", Fault::BadCrc, Faults),
        ("rig-ip", Fault::WrongDevice, Faults),
        ("rig-ip", Fault::Late(0.7), Faults),
    ];
    for (number, (device, fault, leaves)) in cases.into_iter().enumerate() {
        let what = format!("{device}: {fault}");
        let run = logged(1_000 + number as u64, |settings| {
            // In a hold, over a step, once, and for longer than a point takes.
            // A plug that is out for one message is out for good; a second will do.
            let once = if fault == Fault::Unplugged { Lasts::For(1.0) } else { Lasts::Once };
            let times =
                [(8.0, Lasts::For(3.0)), (30.0, Lasts::For(9.0)), (55.0, once), (80.0, Lasts::For(25.0))];
            for (from_s, lasts) in times {
                settings.faults.push((id(device), Planned { from_s, lasts, fault: fault.clone() }));
            }
        });
        let readings = run.no_wrong_number(&what);
        if run.jumps() == 0 {
            run.no_wrong_point(&what);
        }
        let number = run.instruments.iter().position(|one| one.id == id(device)).unwrap();
        let counts = &run.counters[number];
        let frozen = run.named(|trouble| matches!(trouble, Trouble::Frozen { .. }));
        let stale = run.named(|trouble| *trouble == Trouble::Stale);
        println!(
            "{what}: {} points, {readings} readings, {} faults, {} losses, frozen {frozen}, stale {stale}, {:.0} s",
            run.points.len(),
            counts.faults_in_all(),
            counts.losses,
            run.lasted_s
        );
        match leaves {
            Faults => assert!(counts.faults_in_all() >= 3, "{what}: {:?}", counts.faults),
            Loss => assert!(counts.losses >= 3 && stale > 0, "{what}: {counts:?}"),
            Frozen => assert!(frozen >= 2, "{what}: named {frozen} times"),
            Readings => {}
        }
        assert_eq!(frozen > 0, leaves == Frozen, "{what}");
        // A fault costs time, and at the longest of them a level.
        assert!(run.points.len() >= LEVELS.len() - 2, "{what}: {} points", run.points.len());
        let (flow, truth) = (run.analysis().nominal.flow, run.true_flow());
        // Three standard uncertainties: the interval of each run alone may miss the truth.
        assert!(
            (flow.flow_l_min - truth).abs() <= 1.5 * flow.expanded(),
            "{what}: {} ± {}, the truth {truth}",
            flow.flow_l_min,
            flow.expanded()
        );
    }
}
