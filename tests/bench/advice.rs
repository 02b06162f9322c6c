//! Advice is true: the low points that are said to settle the choke ratio, taken on the simulated bench, do settle it.

// Each figure is printed, so that a study can be read and not only passed.
#![allow(clippy::print_stdout)]

use std::collections::BTreeMap;

use crate::simulator::{Hole, MeterSort, Papers, Random, Scene, Tally, Transition, Trial, at_nominal};
use crate::studies::{cases, room};
use ebbline::bench::advice::{LowPoints, low_points};
use ebbline::bench::analyse;
use ebbline::bench::choke::Origin;
use ebbline::entry::Sweep;

/// What came of the advice on a number of runs.
#[derive(Default)]
struct Followed {
    /// Of the runs with a bounded choke ratio: points were named.
    named: Tally,
    /// Of those: with these points the choke ratio was measured.
    settled: Tally,
    /// Of those: the interval holds the true choke ratio.
    covered: Tally,
    /// Of the runs told that nothing would surely settle it: the biggest plan did.
    settled_against_advice: Tally,
    /// Bounded runs without any advice, because the model does not describe them.
    silent: usize,
    /// How many points were named, and how often.
    counts: BTreeMap<usize, usize>,
}

/// Takes runs from 4 bar upward, asks what would settle the choke ratio, takes those points and looks.
/// A part of the runs where the study is not a full one.
fn follow(runs: usize, mut trial: impl FnMut(&mut Random) -> Trial) -> Followed {
    let runs = cases(runs / 4, runs);
    let mut random = Random::new(811);
    let mut followed = Followed::default();
    while followed.named.of() < runs {
        let mut trial = trial(&mut random);
        let Ok(first) = analyse(&trial.run, &trial.readings, &at_nominal()) else { continue };
        if first.choke.origin == Origin::Measured {
            continue;
        }
        let Some(advice) = low_points(&trial.run, &first) else {
            followed.silent += 1;
            continue;
        };
        followed.named.add(matches!(advice, LowPoints::At(_)));
        let points = match &advice {
            LowPoints::At(points) => points.clone(),
            LowPoints::NotWithTheseInstruments => biggest_plan(),
        };
        let points: Vec<_> = points.iter().map(|bar| (*bar, Some(Sweep::Falling))).collect();
        trial.take(&points, &mut random);
        let second = analyse(&trial.run, &trial.readings, &at_nominal());
        let choke = second.ok().map(|a| a.choke);
        let settled = choke.as_ref().is_some_and(|c| c.origin == Origin::Measured);
        if matches!(advice, LowPoints::At(_)) {
            *followed.counts.entry(points.len()).or_default() += 1;
            followed.settled.add(settled);
            let interval = choke.map(|c| c.interval_95);
            followed.covered.add(interval.is_some_and(|(low, high)| (low..=high).contains(&trial.hole.b)));
        } else {
            followed.settled_against_advice.add(settled);
        }
    }
    followed
}

/// A share is not below a limit, but for chance.
fn at_least(tally: &Tally, limit: f64) -> bool {
    tally.share() >= limit - room(limit, tally.of())
}

/// A share is not above a limit, but for chance.
fn at_most(tally: &Tally, limit: f64) -> bool {
    tally.share() <= limit + room(limit, tally.of())
}

/// Two dozen points, from ratios of 0.30 to 0.85, each twice: as much as anybody would take.
fn biggest_plan() -> Vec<f64> {
    let once = (0..12).map(|i| 1.013 / (0.30 + 0.05 * f64::from(i)) - 1.013);
    once.clone().chain(once).collect()
}

fn report(what: &str, followed: &Followed) {
    println!(
        "{what}: named {}; settled {}; covered {}; settled against advice {}; silent {}; points {:?}",
        followed.named,
        followed.settled,
        followed.covered,
        followed.settled_against_advice,
        followed.silent,
        followed.counts
    );
}

/// A run on any hole with instruments of these papers.
fn with_papers(papers: Papers) -> impl Fn(&mut Random) -> Trial {
    move |random| {
        let hole = Hole {
            diameter: random.uniform(50e-6, 120e-6),
            b: random.uniform(0.08, 0.60),
            cd: random.uniform(0.75, 0.95),
            k: random.uniform(0.0, 3.5),
            transition: Transition::Ellipse,
        };
        Trial::of(Scene::PLAIN, hole, papers, random)
    }
}

#[test]
fn points_named_on_the_usual_benches_settle_the_choke_ratio() {
    let followed = follow(1_000, |random| {
        let scene = Scene::mixed(random);
        Trial::new(scene, random)
    });
    report("all benches", &followed);
    assert!(followed.named.of() >= 200, "{}", followed.named);
    assert!(at_least(&followed.named, 0.95), "points are named for {}", followed.named); // all 1 000
    assert!(at_least(&followed.settled, 0.95), "settled {}", followed.settled); // 99.7 %
    assert!(
        at_least(&followed.covered, 0.92) && at_most(&followed.covered, 0.99),
        "covered {}",
        followed.covered
    ); // 95.1 %
    // A model that does not describe the points gets no advice; honest runs seldom look so.
    let silent = followed.silent as f64 / followed.named.of() as f64;
    assert!(silent < 0.03 + room(0.03, followed.named.of()), "{} runs without advice", followed.silent); // 13
}

#[test]
fn points_named_for_poorer_instruments_settle_it_too() {
    let good = Papers::of(MeterSort::Mass);
    let benches = [
        ("meter noise 0.6 %", Papers { meter_noise: 0.006, ..good }), // named 100 %, settled 97.5 %
        ("meter noise 1 %", Papers { meter_noise: 0.010, ..good }),   // 68 %, 96.0 %
        ("meter zero 0.01 L/min", Papers { meter_zero_l_min: 0.01, ..good }), // 100 %, 98.3 %
        ("transducer zero 0.05 bar", Papers { transducer_zero_bar: 0.05, ..good }), // 100 %, 99.3 %
        (
            "transducer noise 0.02 bar",
            Papers { transducer_noise_bar: 0.02, transducer_step_bar: 0.01, ..good },
        ), // 100 %, 96.8 %
        (
            "transducer noise 0.04 bar",
            Papers { transducer_noise_bar: 0.04, transducer_step_bar: 0.01, ..good },
        ), // 84 %, 97.9 %
    ];
    for (name, papers) in benches {
        let followed = follow(400, with_papers(papers));
        report(name, &followed);
        assert!(at_least(&followed.named, 0.5), "{name}: named {}", followed.named);
        assert!(at_least(&followed.settled, 0.95), "{name}: settled {}", followed.settled);
    }
}

#[test]
fn instruments_that_cannot_settle_it_are_told_so() {
    let good = Papers::of(MeterSort::Mass);
    let benches = [
        ("meter noise 5 %", Papers { meter_noise: 0.05, ..good }), // two dozen points settle 22 %
        ("meter noise 20 %", Papers { meter_noise: 0.20, ..good }), // 1 %
        ("transducer noise 0.1 bar", Papers { transducer_noise_bar: 0.1, transducer_step_bar: 0.05, ..good }), // 9.5 %
    ];
    for (name, papers) in benches {
        let followed = follow(200, with_papers(papers));
        report(name, &followed);
        assert!(at_most(&followed.named, 0.01), "{name}: named {}", followed.named);
        let against = &followed.settled_against_advice;
        assert!(at_most(against, 0.35), "{name}: two dozen points settle {against}");
    }
}

#[test]
fn points_outside_the_range_of_the_instruments_are_not_named() {
    use ebbline::quantity::{GaugePressure, IndicatedFlow};
    let good = Papers::of(MeterSort::Mass);
    let mut random = Random::new(821);
    let mut seen = 0;
    while seen < 50 {
        let mut trial = with_papers(good)(&mut random);
        trial.run.transducer.papers.range =
            Some((GaugePressure::from_bar(2.0), GaugePressure::from_bar(16.0)));
        let analysis = trial.analyse_nominal();
        if let Some(advice) = low_points(&trial.run, &analysis) {
            assert_eq!(advice, LowPoints::NotWithTheseInstruments);
            seen += 1;
        }
        trial.run.transducer.papers.range = None;
        trial.run.meter.papers.range =
            Some((IndicatedFlow::from_l_min(1e-9), IndicatedFlow::from_l_min(2.0)));
        let analysis = trial.analyse_nominal();
        let advice = low_points(&trial.run, &analysis);
        assert_ne!(advice, Some(LowPoints::NotWithTheseInstruments), "{:?}", trial.hole);
    }
}
