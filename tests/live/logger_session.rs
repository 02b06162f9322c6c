//! A session logged from readings that are made up, and from the simulated loop: rows, events, every alarm and its end.
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
use crate::logger_rig::Heeded;
use ebbline::entry::{CalibratedAt, Id, Injection, Instrument, Measures, Place, What as Happened};
use ebbline::instrument::{Heard, Lost, Reading, What};
use ebbline::logger::{
    AlarmKind, CellScale, EventRefused, SessionInMemory, SessionLogger, SessionOptions, SessionSetupError,
    Trouble,
};
use ebbline::quantity::unit::lookup;
use ebbline::quantity::{AbsolutePressure, Kind, Temperature};
use ebbline::rig::Feed;
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

fn cells(count: usize) -> Vec<Instrument> {
    (1..=count).map(|n| instrument(&format!("C-{n}"), Measures::Cell)).collect()
}

fn heard(instrument: usize, at_s: f64, kind: Kind, symbol: &str, shown: f64) -> Heard {
    let unit = lookup(kind, symbol).unwrap();
    Heard { instrument, at_s, what: What::Reading(Reading { si: unit.to_si(shown), shown, unit }) }
}

/// Three cells in bar, and depth, on a loop that is made up; half a second from one reading to the next.
struct Loop {
    logger: SessionLogger,
    ledger: SessionInMemory,
    random: Random,
    at_s: f64,
    noise_bar: f64,
}

impl Loop {
    fn new(place: Place) -> Self {
        let instruments = [cells(3), vec![instrument("D-1", Measures::Depth)]].concat();
        let logger =
            SessionLogger::new(&instruments, &[CellScale::Bar; 3], SessionOptions::of(place)).unwrap();
        Self {
            logger,
            ledger: SessionInMemory::default(),
            random: Random::new(3, 0),
            at_s: 100.0,
            noise_bar: 0.001,
        }
    }

    /// Cells and depth by the seconds since the beginning of this, for so long; none is silent.
    fn goes(&mut self, for_s: f64, shows: impl Fn(f64) -> [Option<f64>; 4]) {
        let began_s = self.at_s;
        for _ in 0..(for_s * 2.0).round() as u32 {
            for (number, shown) in shows(self.at_s - began_s).into_iter().enumerate() {
                let Some(shown) = shown else { continue };
                let noise = if number < 3 { self.noise_bar * self.random.normal() } else { 0.0 };
                let (kind, unit) = if number < 3 { (Kind::Pressure, "bar") } else { (Kind::Length, "m") };
                self.logger.hear(&heard(number, self.at_s, kind, unit, shown + noise));
            }
            self.logger.tick(self.at_s);
            self.logger.hand_over(self.at_s, &mut self.ledger).unwrap();
            self.at_s += 0.5;
        }
    }

    fn all(&mut self, for_s: f64, po2_bar: f64) {
        self.goes(for_s, |_| [Some(po2_bar), Some(po2_bar), Some(po2_bar), Some(0.5)]);
    }

    /// What is raised now.
    fn raised(&self) -> Vec<AlarmKind> {
        self.logger.live(self.at_s).alarms.iter().map(|alarm| alarm.kind).collect()
    }

    /// When a kind was raised and cleared, seconds since the first row.
    fn changes(&self, kind: AlarmKind) -> Vec<(bool, f64)> {
        let began_s = self.logger.began_s().unwrap();
        let of_it = self.ledger.alarms.iter().filter(|change| change.alarm.kind == kind);
        of_it.map(|change| (change.raised, change.at_s - began_s)).collect()
    }
}

#[test]
fn rows_come_every_second_with_the_last_values_that_are_not_stale() {
    let mut one = Loop::new(Place::Couch);
    one.noise_bar = 0.0;
    one.goes(10.0, |t| [Some(0.7 + 0.001 * t), Some(0.7), (t < 4.2).then_some(0.7), Some(0.0)]);
    let rows = &one.ledger.rows;
    let times: Vec<f64> = rows.iter().map(|row| row.time_s).collect();
    assert_eq!(times, (0..10).map(f64::from).collect::<Vec<f64>>());
    // The reading of the very second is in its row.
    let shown: Vec<f64> = rows.iter().map(|row| row.values[0].unwrap().shown).collect();
    assert!(shown.iter().zip(&times).all(|(x, t)| (x - 0.7 - 0.001 * t).abs() < 1e-12), "{shown:?}");
    // The third cell fell silent after 4.0 s; its last value counts for two more.
    let there: Vec<bool> = rows.iter().map(|row| row.values[2].is_some()).collect();
    assert_eq!(there.iter().filter(|there| **there).count(), 7, "{there:?}");
    assert!(there[6] && !there[7]);
    let stale = AlarmKind::Stale { instrument: 2 };
    assert_eq!(one.changes(stale), [(true, 6.5)]);
    one.all(8.0, 0.7);
    // It is back at 10 s and trusted again five seconds later.
    assert_eq!(one.changes(stale), [(true, 6.5), (false, 15.0)]);
    let (gone, back) = (Trouble::Stale, Trouble::Fresh);
    let troubles: Vec<&Trouble> = one.ledger.faults.iter().map(|one| &one.what).collect();
    assert_eq!(troubles, [&gone, &back]);
}

#[test]
fn floor_and_ceiling_of_the_place_ring_at_once_and_stop_with_a_margin() {
    for (place, floor, ceiling) in [(Place::Couch, 0.40, 1.0), (Place::Pool, 0.60, 1.3)] {
        let mut one = Loop::new(place);
        let (low, high) = (AlarmKind::Po2Low { limit_bar: floor }, AlarmKind::Po2High { limit_bar: ceiling });
        one.noise_bar = 0.0;
        one.all(10.0, floor);
        one.all(1.0, ceiling);
        assert!(one.raised().is_empty(), "{:?}", one.raised());
        // One cell is enough.
        one.goes(5.0, |_| [Some(floor + 0.03), Some(floor - 0.001), Some(floor + 0.03), Some(0.5)]);
        assert_eq!(one.raised(), [low]);
        // Above the floor by less than the margin it goes on; above it the alarm ends after five seconds.
        one.all(20.0, floor + 0.01);
        assert_eq!(one.raised(), [low]);
        one.all(6.0, floor + 0.05);
        assert!(one.raised().is_empty());
        assert_eq!(one.changes(low), [(true, 11.0), (false, 41.0)]);
        one.goes(3.0, |_| [Some(ceiling + 0.01), Some(ceiling - 0.01), Some(ceiling - 0.01), Some(0.5)]);
        assert_eq!(one.raised(), [high]);
        let worst =
            one.ledger.alarms.iter().find(|change| change.alarm.kind == low && !change.raised).unwrap();
        assert!((worst.alarm.worst - (floor - 0.001)).abs() < 1e-9);
    }
}

#[test]
fn deeper_than_three_metres_rings() {
    let mut one = Loop::new(Place::Pool);
    let deep = AlarmKind::TooDeep { limit_m: 3.0 };
    for (depth_m, rings) in [(2.9, false), (3.0, false), (3.1, true), (2.9, true), (2.7, false)] {
        one.goes(8.0, |_| [Some(1.0), Some(1.0), Some(1.0), Some(depth_m)]);
        assert_eq!(one.raised().contains(&deep), rings, "{depth_m} m");
    }
}

#[test]
fn a_cell_that_was_never_heard_is_missing_and_without_any_there_is_no_po2() {
    let mut one = Loop::new(Place::Couch);
    one.goes(5.0, |_| [Some(0.7), None, Some(0.7), Some(0.0)]);
    assert_eq!(one.raised(), [AlarmKind::Missing { instrument: 1 }]);
    assert_eq!(one.ledger.rows[3].values[1], None);
    one.goes(4.0, |_| [None, None, None, Some(0.0)]);
    assert!(one.raised().contains(&AlarmKind::NoPo2));
    one.all(8.0, 0.7);
    assert!(one.raised().is_empty(), "{:?}", one.raised());
    // A lost port does not wait to become old.
    for cell in 0..3 {
        one.logger.hear(&Heard { instrument: cell, at_s: one.at_s, what: What::Lost(Lost::Closed) });
    }
    assert!(one.raised().contains(&AlarmKind::NoPo2));

    // Nothing at all is heard: said after the time in which a reading grows stale.
    let mut silent =
        SessionLogger::new(&cells(2), &[CellScale::Bar; 2], SessionOptions::of(Place::Couch)).unwrap();
    silent.tick(0.0);
    silent.tick(1.9);
    assert!(silent.live(1.9).alarms.is_empty());
    silent.tick(2.1);
    assert_eq!(silent.live(2.1).alarms.len(), 3);
    assert_eq!(silent.mark(2.1, Happened::Stop), Err(EventRefused::NotBegun));
}

#[test]
fn a_cell_off_the_others_is_named_after_ten_seconds() {
    let mut one = Loop::new(Place::Couch);
    let off = AlarmKind::Disagrees { instrument: 1 };
    one.goes(8.0, |_| [Some(0.7), Some(0.76), Some(0.7), Some(0.0)]);
    one.all(5.0, 0.7);
    assert!(one.changes(off).is_empty());
    one.goes(12.0, |_| [Some(0.7), Some(0.76), Some(0.7), Some(0.0)]);
    assert_eq!(one.raised(), [off]);
    assert_eq!(one.changes(off), [(true, 23.0)]);
    // Of two nobody knows which.
    one.goes(20.0, |_| [Some(0.7), Some(0.78), None, Some(0.0)]);
    let raised = one.raised();
    assert!(raised.contains(&AlarmKind::Disagrees { instrument: 0 }) && raised.contains(&off), "{raised:?}");
}

#[test]
fn a_cell_that_stands_still_while_the_others_sink_is_frozen_and_not_believed() {
    let mut one = Loop::new(Place::Couch);
    let frozen = AlarmKind::Frozen { instrument: 2 };
    one.all(10.0, 0.7);
    // 0.03 bar a minute; 0.015 are passed at 30 s, the minute at 60 s.
    let sinks = |t: f64| Some(0.7 - 0.03 * t / 60.0);
    one.noise_bar = 0.0;
    one.goes(90.0, |t| [sinks(t), sinks(t), Some(0.7), Some(0.0)]);
    let raised = one.changes(frozen);
    assert_eq!(raised.len(), 1);
    assert!((70.0..72.0).contains(&raised[0].1), "{raised:?}");
    assert_eq!(one.logger.live(one.at_s - 0.5).po2_bar[2], None);
    // What it showed stays in the rows: a reading is a reading.
    assert!(one.ledger.rows.last().unwrap().values[2].is_some());
    // A quiet loop, all cells still: nothing moves, nothing is frozen.
    let mut quiet = Loop::new(Place::Couch);
    quiet.noise_bar = 0.0;
    quiet.all(300.0, 0.7);
    assert!(quiet.raised().is_empty(), "{:?}", quiet.raised());
}

#[test]
fn po2_that_rises_with_the_injection_off_rings_and_a_sinking_one_does_not() {
    let run = |rate_bar_min: f64, feed: Option<Injection>| {
        let mut one = Loop::new(Place::Couch);
        one.all(5.0, 0.6);
        if let Some(feed) = feed {
            one.logger.mark(one.at_s, Happened::Injection(feed)).unwrap();
        }
        one.goes(240.0, |t| {
            let po2 = Some(0.6 + rate_bar_min * t / 60.0);
            [po2, po2, po2, Some(0.0)]
        });
        one
    };
    let rises = AlarmKind::RisesUnfed;
    let rang = run(0.02, Some(Injection::Off));
    let raised = rang.changes(rises);
    assert_eq!(raised.len(), 1, "{raised:?}");
    // The ninety seconds after an event do not count, and a slope needs forty-five more.
    assert!((139.0..160.0).contains(&raised[0].1), "{raised:?}");
    assert!(run(-0.03, Some(Injection::Off)).changes(rises).is_empty());
    assert!(run(0.0, Some(Injection::Off)).changes(rises).is_empty());
    // Nobody has said that it is off.
    assert!(run(0.02, None).changes(rises).is_empty());

    // On the way down PO2 rises by itself: 1 m of fresh water is 9807 Pa of 101 325.
    let mut down = Loop::new(Place::Pool);
    down.all(5.0, 0.7);
    down.logger.mark(down.at_s, Happened::Injection(Injection::Off)).unwrap();
    down.goes(240.0, |t| {
        let depth_m = (t / 100.0).min(2.4);
        let po2 = Some((0.7 - 0.01 * t / 60.0) * (1.0 + 0.096_784 * depth_m));
        [po2, po2, po2, Some(depth_m)]
    });
    assert!(down.changes(rises).is_empty(), "{:?}", down.changes(rises));
}

#[test]
fn events_stand_on_the_time_column_and_the_end_ends_the_rows() {
    let mut one = Loop::new(Place::Couch);
    one.all(10.0, 0.7);
    let added = one.logger.mark(one.at_s, Happened::OxygenAdd(None)).unwrap();
    assert!((added.at_s - 10.0).abs() < 1e-9);
    let earlier = one.logger.mark_at(4.0, one.at_s, Happened::Vent(None)).unwrap();
    assert!((earlier.at_s - 4.0).abs() < 1e-9);
    let refused = one.logger.mark_at(60.0, one.at_s, Happened::Vent(None)).unwrap_err();
    assert_eq!(refused.to_string(), "60 s is not between the beginning and now (10 s)");
    one.all(5.0, 0.7);
    one.logger.mark(one.at_s, Happened::Stop).unwrap();
    one.all(5.0, 0.7);
    assert_eq!(one.ledger.rows.len(), 16);
    assert!(matches!(one.logger.mark(one.at_s, Happened::Stop), Err(EventRefused::Over(_))));
    assert_eq!(one.ledger.events.len(), 3);
}

#[test]
fn volts_are_read_on_the_calibration_and_bar_is_no_reading_of_such_a_cell() {
    let at = CalibratedAt {
        barometer: AbsolutePressure::from_bar(1.01325),
        temperature: Temperature::from_c(20.0),
        humidity: 0.0,
        oxygen: 1.0,
    };
    let scale = CellScale::Volts { in_air: 0.010, in_oxygen: 0.048, at };
    let mut logger = SessionLogger::new(&cells(2), &[scale; 2], SessionOptions::of(Place::Couch)).unwrap();
    logger.hear(&heard(0, 0.0, Kind::Voltage, "mV", 29.0));
    logger.hear(&heard(1, 0.0, Kind::Pressure, "bar", 0.7));
    logger.tick(0.5);
    // Air 0.209 476 of 1.01325 bar is 0.212 252; half way to 1.01325 is 0.612 751.
    let live = logger.live(0.5);
    assert!((live.po2_bar[0].unwrap() - 0.612_751).abs() < 5e-7, "{live:?}");
    assert_eq!(live.po2_bar[1], None);
    assert_eq!(live.channels[1].faults.len(), 1);
    let flat = CellScale::Volts { in_air: 0.048, in_oxygen: 0.010, at };
    let refused =
        SessionLogger::new(&cells(2), &[scale, flat], SessionOptions::of(Place::Couch)).unwrap_err();
    assert_eq!(refused, SessionSetupError::NoLine("C-2".to_owned()));
}

#[test]
fn a_clock_that_slept_leaves_a_hole_and_invents_no_rows() {
    let mut one = Loop::new(Place::Couch);
    one.all(10.0, 0.7);
    one.at_s += 7_200.0;
    one.all(10.0, 0.7);
    assert!(one.ledger.rows.len() < 25, "{}", one.ledger.rows.len());
    let times: Vec<f64> = one.ledger.rows.iter().map(|row| row.time_s).collect();
    assert!(times.windows(2).all(|two| two[1] > two[0]) && *times.last().unwrap() > 7_215.0, "{times:?}");
}

#[test]
fn what_makes_no_session_is_refused_by_name() {
    let refused = |instruments: &[Instrument], scales: usize, every_s: f64| {
        let options = SessionOptions { every_s, ..SessionOptions::of(Place::Couch) };
        SessionLogger::new(instruments, &vec![CellScale::Bar; scales], options).unwrap_err()
    };
    assert_eq!(refused(&cells(1), 1, 1.0), SessionSetupError::Cells(1));
    assert_eq!(refused(&cells(4), 4, 1.0), SessionSetupError::Cells(4));
    assert_eq!(refused(&cells(3), 2, 1.0), SessionSetupError::Scales { cells: 3, scales: 2 });
    assert_eq!(refused(&cells(2), 2, 0.0), SessionSetupError::Rate(0.0));
    let with = |measures| [cells(2), vec![instrument("X", measures), instrument("Y", measures)]].concat();
    assert!(matches!(refused(&with(Measures::Depth), 2, 1.0), SessionSetupError::Twice { .. }));
    assert!(matches!(refused(&with(Measures::Flow), 2, 1.0), SessionSetupError::NotForSession { .. }));
}

#[test]
fn the_simulated_loop_is_logged_with_its_cells_in_millivolts() {
    let mut heeded = Heeded::new(4, &[Measures::Cell, Measures::Depth], |settings| {
        settings.bench.couch.feed = Feed::Off;
        settings.bench.couch.po2_bar = 0.45;
    });
    // The rig's cells give 48 mV a bar and nought at nought.
    let at = CalibratedAt {
        barometer: AbsolutePressure::from_bar(1.0),
        temperature: Temperature::from_c(20.0),
        humidity: 0.0,
        oxygen: 1.0,
    };
    let scale = CellScale::Volts { in_air: 0.048 * 0.209_476, in_oxygen: 0.048, at };
    let mut logger =
        SessionLogger::new(&heeded.instruments, &[scale; 3], SessionOptions::of(Place::Couch)).unwrap();
    let mut ledger = SessionInMemory::default();
    let mut off = false;
    while heeded.now_s() < 300.0 {
        for heard in heeded.turn() {
            logger.hear(&heard);
        }
        let now_s = heeded.now_s();
        logger.tick(now_s);
        if !off && logger.began_s().is_some() {
            logger.mark(now_s, Happened::Injection(Injection::Off)).unwrap();
            off = true;
        }
        logger.hand_over(now_s, &mut ledger).unwrap();
    }
    assert!((290..=300).contains(&ledger.rows.len()), "{} rows", ledger.rows.len());
    let missing = ledger.rows.iter().skip(3).flat_map(|row| &row.values).filter(|value| value.is_none());
    assert_eq!(missing.count(), 0);
    // 0.26 L/min out of 7.5 L is 0.03 bar a minute: from 0.45 bar the floor is passed before 120 s, whichever cell is off by
    // 2 %, and PO2 ends near 0.31 bar.
    let low =
        ledger.alarms.iter().find(|change| matches!(change.alarm.kind, AlarmKind::Po2Low { .. })).unwrap();
    assert!(low.raised && (60.0..130.0).contains(&low.at_s), "{low:?}");
    assert!(
        ledger.alarms.iter().all(|change| matches!(change.alarm.kind, AlarmKind::Po2Low { .. })),
        "{:?}",
        ledger.alarms
    );
    let live = logger.live(heeded.now_s());
    let truth = heeded.rig.lock().unwrap().truth().po2_bar;
    assert!((live.median_po2_bar.unwrap() - truth).abs() < 0.02 * truth + 0.005, "{live:?}, truth {truth}");
}
