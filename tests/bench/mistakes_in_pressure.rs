//! The mistakes that read as another atmosphere are named by where the line crosses, and honest runs are left in peace.

use crate::simulator::{
    NOMINAL_IP_BAR, Random, Scene, Tally, Trial, at_nominal, misread_as_absolute, misread_as_gauge,
};
use crate::studies::{cases, room};
use ebbline::bench::checks::{Check, CheckKind, CheckVerdict, CrossingCause, Finding};
use ebbline::bench::{Verdict, analyse};
use ebbline::entry::{Limits, PointReading, Rule};

/// The check of the crossing of a run with these readings.
fn crossing(trial: &Trial, readings: &[PointReading]) -> Check {
    let analysis = analyse(&trial.run, readings, &at_nominal())
        .unwrap_or_else(|e| panic!("fitted and named, not refused: {e} ({:?})", trial.hole));
    let check = analysis.checks.into_iter().find(|c| c.kind == CheckKind::ThroughZero);
    check.expect("the crossing is always checked")
}

/// Simulated runs of all benches, every third with low points; a part of `count` where the study is not a full one.
fn runs(seed: u64, count: usize, absolute: bool) -> impl Iterator<Item = Trial> {
    let mut random = Random::new(seed);
    (0..cases(count / 4, count)).map(move |i| {
        let mut scene = Scene { absolute, ..Scene::mixed(&mut random) };
        // Low points on a hole that never chokes can leave too few for any line, mistake or none.
        if i % 3 == 0 && scene.b.0 > 0.1 {
            scene.low_points = random.whole(5, 9);
        }
        Trial::new(scene, &mut random)
    })
}

#[track_caller]
fn named(check: &Check, cause: CrossingCause, trial: &Trial) {
    let Finding::Crossing { interval_bar, cause: found } = check.finding else {
        panic!("{check:?}");
    };
    assert!(
        check.verdict == CheckVerdict::Fail && found == Some(cause),
        "crossing {:?} kPa, interval {interval_bar:?} bar, {:?}, cause {found:?}, wanted {cause:?} ({:?})",
        check.value,
        check.verdict,
        trial.hole
    );
}

#[test]
fn gauge_read_as_absolute_is_named_in_every_run() {
    let mut crossings = Vec::new();
    for trial in runs(901, 600, false) {
        let check = crossing(&trial, &misread_as_absolute(&trial.readings));
        named(&check, CrossingCause::GaugeEnteredAsAbsolute, &trial);
        crossings.extend(check.value);
    }
    let (low, high) = ends(&crossings);
    println!("crossings of gauge read as absolute: {low:.1} to {high:.1} kPa"); // -99.9 to -67.7
    assert!(high < -40.0, "{high}");
}

#[test]
fn absolute_read_as_gauge_is_named_in_every_run() {
    let mut crossings = Vec::new();
    for trial in runs(902, 600, true) {
        let check = crossing(&trial, &misread_as_gauge(&trial.readings));
        named(&check, CrossingCause::AbsoluteEnteredAsGauge, &trial);
        crossings.extend(check.value);
    }
    let (low, high) = ends(&crossings);
    println!("crossings of absolute read as gauge: {low:.1} to {high:.1} kPa"); // 99.3 to 134.3
    assert!(low > 80.0, "{low}");
}

fn ends(values: &[f64]) -> (f64, f64) {
    values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| (low.min(*v), high.max(*v)))
}

#[test]
fn honest_runs_do_not_fail_by_their_crossing() {
    let (mut failed, mut noted, mut atmosphere) = (Tally::default(), Tally::default(), 0);
    for trial in runs(903, 1_500, false).chain(runs(904, 1_500, true)) {
        let Ok(analysis) = analyse(&trial.run, &trial.readings, &at_nominal()) else { continue };
        let check = &analysis.checks[CheckKind::ThroughZero as usize];
        assert_eq!(check.kind, CheckKind::ThroughZero);
        failed.add(check.verdict == CheckVerdict::Fail);
        noted.add(check.verdict == CheckVerdict::Note);
        atmosphere += usize::from(matches!(
            check.finding,
            Finding::Crossing {
                cause: Some(CrossingCause::GaugeEnteredAsAbsolute | CrossingCause::AbsoluteEnteredAsGauge),
                ..
            }
        ));
    }
    println!("honest runs failed by the crossing: {failed}; noted: {noted}"); // 0.20 %; 1.1 %
    assert!(failed.share() < 0.01 + room(0.01, failed.of()), "{failed}");
    assert_eq!(atmosphere, 0, "no honest run is told that it is an atmosphere off");
}

#[test]
fn a_mistaken_run_never_passes_though_its_flow_may() {
    // The flow at the nominal pressure is off by 9 %; a tolerance of 15 % lets it through, the check does not.
    for mut trial in runs(905, 200, false) {
        trial.judge_by(trial.true_flow(NOMINAL_IP_BAR), 0.15, Rule::Simple);
        let readings = misread_as_absolute(&trial.readings);
        let analysis = analyse(&trial.run, &readings, &at_nominal()).expect("fitted");
        let judgement = analysis.judgement.expect("it has an acceptance");
        assert_ne!(judgement.verdict, Verdict::Pass);
        assert!(judgement.failed_checks.contains(&CheckKind::ThroughZero), "{:?}", judgement.failed_checks);
    }
}

#[test]
fn the_other_checks_leave_honest_runs_in_peace() {
    use CheckKind::{Hysteresis, Instruments, Outlier, Repeatable, Steady, Straight};
    let mut failed = vec![(Straight, Tally::default()), (Hysteresis, Tally::default())];
    failed.extend([Repeatable, Steady, Outlier, Instruments].map(|kind| (kind, Tally::default())));
    let mut apart = Tally::default();
    for trial in runs(906, 3_000, false) {
        let Ok(analysis) = analyse(&trial.run, &trial.readings, &at_nominal()) else { continue };
        for (kind, tally) in &mut failed {
            let check = analysis.checks.iter().find(|c| c.kind == *kind).expect("every check is made");
            tally.add(check.verdict == CheckVerdict::Fail);
            if *kind == Outlier {
                apart.add(matches!(check.finding, Finding::Apart(_)));
            }
        }
    }
    for (kind, tally) in &failed {
        println!("honest runs failed by {kind:?}: {tally}"); // straight 0.17 %, repeatable 0.23 %, others 0
        assert!(tally.share() < 0.01 + room(0.01, tally.of()), "{kind:?}: {tally}");
    }
    // A test at the one per cent level flags one per cent.
    println!("honest runs with a point called apart: {apart}"); // 2.2 %
    let limit = 3.0 * Limits::DEFAULT.significance;
    assert!(apart.share() < limit + room(limit, apart.of()), "{apart}");
}
