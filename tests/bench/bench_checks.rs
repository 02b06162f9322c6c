//! Each check catches what it is for, and keeps quiet otherwise; each verdict follows its rule.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use crate::bench_files::{RUN, readings};
use crate::runs::{analysed, points, run};
use ebbline::bench::checks::{CannotTell, Check, CheckKind, CheckVerdict, CrossingCause, Finding};
use ebbline::bench::history::Accepted;
use ebbline::bench::instruments::{Instrument, InstrumentFinding, When};
use ebbline::bench::{Analysis, Doubt, Questions, Verdict, Warning, WhyNot, analyse};

/// The run with `change` made to each reading: (index, gauge bar, L/min) to (gauge bar, L/min).
fn changed(toml: &str, change: impl Fn(usize, f64, f64) -> (f64, f64)) -> Analysis {
    let mut csv = String::from("ip,flow,sweep\n");
    for (i, line) in readings().lines().skip(1).enumerate() {
        let cells: Vec<&str> = line.split(',').collect();
        let (pressure, flow) = change(i, cells[0].parse().unwrap(), cells[1].parse().unwrap());
        csv.push_str(&format!("{pressure:.4},{flow:.6},{}\n", cells[2]));
    }
    analysed(&run(toml, &csv)).unwrap_or_else(|e| panic!("{e}"))
}

fn check(analysis: &Analysis, kind: CheckKind) -> &Check {
    analysis.checks.iter().find(|c| c.kind == kind).expect("every check is there")
}

/// Built as a short tube, so that points from 4 bar up are known to be choked.
fn tube() -> String {
    RUN.replacen("gas = \"oxygen\"", "build = \"short tube\"\ngas = \"oxygen\"", 1)
}

const NOMINAL: f64 = 0.51;

#[test]
fn an_honest_run_passes_every_check_that_can_be_made() {
    let analysis = changed(&tube(), |_, p, q| (p, q));
    for c in &analysis.checks {
        let expected = match c.kind {
            CheckKind::SameAsBefore | CheckKind::Instruments => CheckVerdict::Note,
            _ => CheckVerdict::Pass,
        };
        assert_eq!(c.verdict, expected, "{c:?}");
    }
    assert_eq!(analysis.judgement.as_ref().unwrap().verdict, Verdict::Pass);
    assert_eq!(analysis.points.iter().filter(|p| p.used()).count(), 19);
}

#[test]
fn straight_finds_a_bend_of_the_size_it_has() {
    // One per cent of the nominal flow at mid-span (8.5 bar gauge), nothing at both ends (4 and 13 bar).
    let bend = |p: f64| 0.01 * NOMINAL * (1.0 - ((p - 8.5) / 4.5).powi(2));
    let analysis = changed(&tube(), |_, p, q| (p, q + bend(p)));
    let straight = check(&analysis, CheckKind::Straight);
    assert_eq!(straight.verdict, CheckVerdict::Fail);
    assert!((straight.value.unwrap().abs() - 0.01).abs() < 5e-4, "{straight:?}");
    let Finding::Bent { lack_of_fit_p: Some(p) } = straight.finding else { panic!("{straight:?}") };
    assert!(p < 0.01, "{p}");
    // Within the flow limits, but never passed with a check that does not hold.
    let judgement = analysis.judgement.as_ref().unwrap();
    assert_eq!((judgement.by_flow, judgement.verdict), (Verdict::Pass, Verdict::Undecided));
    assert!(analysis.warnings.iter().any(|w| matches!(w, Warning::RandomPartWidened { bent: true, .. })));
    // The limit belongs to the shop.
    let wide = tube() + "straight = \"2 %\"\n";
    let analysis = changed(&wide, |_, p, q| (p, q + bend(p)));
    assert_eq!(check(&analysis, CheckKind::Straight).verdict, CheckVerdict::Pass);
}

#[test]
fn hysteresis_is_the_difference_of_the_sweeps() {
    let analysis = changed(&tube(), |i, p, q| (p, if i < 10 { q } else { q - 0.01 * NOMINAL }));
    let found = check(&analysis, CheckKind::Hysteresis);
    assert_eq!(found.verdict, CheckVerdict::Fail);
    assert!((found.value.unwrap() - 0.01).abs() < 1e-3, "{found:?}");
    let wide = tube() + "hysteresis = \"2 %\"\n";
    let analysis = changed(&wide, |i, p, q| (p, if i < 10 { q } else { q - 0.01 * NOMINAL }));
    assert_eq!(check(&analysis, CheckKind::Hysteresis).verdict, CheckVerdict::Pass);
    // Without a sweep column the order tells.
    let toml = tube().replacen("sweep = { column = \"sweep\" }\n", "", 1);
    let analysis = changed(&toml, |i, p, q| (p, if i < 10 { q } else { q - 0.01 * NOMINAL }));
    assert_eq!(check(&analysis, CheckKind::Hysteresis).verdict, CheckVerdict::Fail);
}

#[test]
fn one_sweep_cannot_tell_hysteresis_or_drift() {
    let csv: String = readings().lines().take(11).map(|l| format!("{l}\n")).collect();
    let analysis = analysed(&run(&tube(), &csv)).unwrap();
    assert_eq!(check(&analysis, CheckKind::Hysteresis).finding, Finding::CannotTell(CannotTell::OneSweep));
    assert_eq!(
        check(&analysis, CheckKind::Steady).finding,
        Finding::CannotTell(CannotTell::TimeRunsWithPressure)
    );
    assert_eq!(
        check(&analysis, CheckKind::Repeatable).finding,
        Finding::CannotTell(CannotTell::NoRepetition)
    );
}

#[test]
fn repeated_points_that_scatter_do_not_hold() {
    let analysis = changed(&tube(), |i, p, q| {
        (p, q + if i % 2 == 0 { 0.006 } else { -0.006 } * NOMINAL * f64::from(u8::from(i > 9)))
    });
    let found = check(&analysis, CheckKind::Repeatable);
    assert_eq!(found.verdict, CheckVerdict::Pass, "{found:?}");
    let sign = |i: usize| if [1, 3, 4, 8, 10, 11, 13, 16].contains(&i) { 1.0 } else { -1.0 };
    let analysis = changed(&tube(), |i, p, q| (p, q + 0.01 * NOMINAL * sign(i)));
    let found = check(&analysis, CheckKind::Repeatable);
    assert_eq!(found.verdict, CheckVerdict::Fail, "{found:?}");
    assert!(analysis.warnings.iter().any(|w| matches!(w, Warning::RandomPartWidened { .. })));
    assert!((analysis.nominal.flow.parts[0].2 - 17.0).abs() < 1e-12, "n − 2 degrees of freedom");
}

#[test]
fn steady_is_the_drift_over_the_run() {
    let analysis = changed(&tube(), |i, p, q| (p, q * (1.0 - 0.01 * i as f64 / 18.0)));
    let found = check(&analysis, CheckKind::Steady);
    assert_eq!(found.verdict, CheckVerdict::Fail);
    assert!(found.value.unwrap() < -0.005, "{found:?}");
    let wide = tube() + "steady = \"2 %\"\nhysteresis = \"2 %\"\n";
    let analysis = changed(&wide, |i, p, q| (p, q * (1.0 - 0.01 * i as f64 / 18.0)));
    assert_eq!(check(&analysis, CheckKind::Steady).verdict, CheckVerdict::Pass);
}

#[test]
fn the_crossing_says_what_its_sign_suggests() {
    let cause = |analysis: &Analysis| {
        let found = check(analysis, CheckKind::ThroughZero);
        let Finding::Crossing { cause, .. } = found.finding else { panic!("{found:?}") };
        (found.verdict, cause)
    };
    let absolute_as_gauge = changed(&tube(), |_, p, q| (p + 1.0092, q));
    assert_eq!(cause(&absolute_as_gauge), (CheckVerdict::Fail, Some(CrossingCause::AbsoluteEnteredAsGauge)));
    let said_absolute = tube().replacen("unit = \"bar\" }", "unit = \"bar\", absolute = true }", 1);
    let gauge_as_absolute = changed(&said_absolute, |_, p, q| (p, q));
    assert_eq!(cause(&gauge_as_absolute), (CheckVerdict::Fail, Some(CrossingCause::GaugeEnteredAsAbsolute)));
    let zero_high = changed(&tube(), |_, p, q| (p + 0.4, q));
    assert_eq!(cause(&zero_high), (CheckVerdict::Fail, Some(CrossingCause::High)));
    let zero_low = changed(&tube(), |_, p, q| (p - 0.3, q));
    assert_eq!(cause(&zero_low), (CheckVerdict::Fail, Some(CrossingCause::Low)));
    let wide = tube() + "crossing = \"-100 kPa to 100 kPa\"\n";
    let allowed = changed(&wide, |_, p, q| (p + 0.4, q));
    assert_eq!(cause(&allowed), (CheckVerdict::Pass, None));
}

#[test]
fn a_meter_that_is_stuck_does_not_pass() {
    // The same flow at every pressure, and just the one that is wanted: exactly, and within the noise of the papers.
    let stuck = 0.51 * 273.15 / 293.15;
    let toml = tube().replacen("flow = \"0.48 L/min\"", &format!("flow = \"{stuck:.4} L/min\""), 1);
    for noise in [0.0, 0.0005] {
        let analysis = changed(&toml, |i, p, _| (p, 0.51 * (1.0 + noise * [1.0, -1.0, 0.5, -0.5][i % 4])));
        let found = check(&analysis, CheckKind::ThroughZero);
        assert_eq!(found.verdict, CheckVerdict::Fail, "{noise}: {found:?}");
        let judgement = analysis.judgement.as_ref().unwrap();
        assert_eq!((judgement.by_flow, judgement.verdict), (Verdict::Pass, Verdict::Undecided), "{noise}");
    }
    // A meter that shows nothing at all is at zero everywhere, and fails by its flow.
    let nothing = changed(&toml, |_, p, _| (p, 0.0));
    assert_eq!(check(&nothing, CheckKind::ThroughZero).verdict, CheckVerdict::Note);
    assert_eq!(nothing.judgement.as_ref().unwrap().verdict, Verdict::Fail);
}

#[test]
fn an_outlier_is_flagged_and_stays_in() {
    let analysis = changed(&tube(), |i, p, q| (p, if i == 6 { q * 1.02 } else { q }));
    let found = check(&analysis, CheckKind::Outlier);
    assert_eq!(found.finding, Finding::Apart(vec![7]));
    assert!(analysis.points[6].used());
    let toml = tube() + "\n[[leave_out]]\npoint = 7\nwhy = \"door slammed\"\n";
    let analysis = changed(&toml, |i, p, q| (p, if i == 6 { q * 1.02 } else { q }));
    assert_eq!(analysis.points[6].why_not, Some(WhyNot::LeftOut("door slammed".into())));
    assert_eq!(check(&analysis, CheckKind::Outlier).verdict, CheckVerdict::Pass);
}

#[test]
fn instruments_out_of_date_out_of_range_or_leaking() {
    let findings = |toml: &str| {
        let analysis = changed(toml, |_, p, q| (p, q));
        let found = check(&analysis, CheckKind::Instruments).clone();
        match found.finding {
            Finding::Instruments(list) => (found.verdict, list),
            _ => (found.verdict, Vec::new()),
        }
    };
    let checked = "\n[before]\nzero = \"0.0001 L/min\"\nleak = \"0.002 bar/min\"\n";
    assert_eq!(findings(&(tube() + checked)), (CheckVerdict::Pass, vec![]));
    let overdue = tube().replacen("due = \"2027-03-01\"", "due = \"2026-11-11\"", 1) + checked;
    let (verdict, list) = findings(&overdue);
    assert!(
        verdict == CheckVerdict::Fail
            && matches!(list[..], [InstrumentFinding::Overdue(Instrument::Meter, _)])
    );
    // In date on the last day, where the run was taken.
    let last_day = tube().replacen("due = \"2027-03-01\"", "due = \"2026-11-12\"", 1) + checked;
    assert_eq!(findings(&last_day).0, CheckVerdict::Pass);
    let narrow = tube().replacen("0 bar to 16 bar", "0 bar to 12.5 bar", 1) + checked;
    assert_eq!(findings(&narrow).1, [InstrumentFinding::OutsideRange(Instrument::Transducer, vec![10])]);
    let wide = tube().replacen("0.02 L/min to 2 L/min", "0.02 L/min to 3 L/min", 1) + checked;
    let (verdict, list) = findings(&wide);
    assert!(
        verdict == CheckVerdict::Note
            && matches!(&list[..], [InstrumentFinding::LowInRange(Instrument::Meter, p)] if p.contains(&1))
    );
    let off = tube() + "\n[after]\nzero = \"0.002 L/min\"\n";
    assert!(matches!(findings(&off).1[..], [InstrumentFinding::ZeroOff(When::After, ..)]));
    let leak = tube() + "\n[before]\nleak = \"0.02 bar/min\"\n";
    let (verdict, list) = findings(&leak);
    assert!(verdict == CheckVerdict::Fail && matches!(list[..], [InstrumentFinding::Leaks(When::Before, _)]));
    let allowed = tube() + "leak = \"0.05 bar/min\"\n\n[before]\nleak = \"0.02 bar/min\"\n";
    assert_eq!(findings(&allowed).0, CheckVerdict::Pass);
}

#[test]
fn the_run_before_shows_a_small_blockage_on_the_same_meter() {
    let first = changed(&tube(), |_, p, q| (p, q));
    let now = run(&tube(), &{
        let mut csv = String::from("ip,flow,sweep\n");
        for line in readings().lines().skip(1) {
            let cells: Vec<&str> = line.split(',').collect();
            csv.push_str(&format!(
                "{},{:.5},{}\n",
                cells[0],
                cells[1].parse::<f64>().unwrap() * 0.99,
                cells[2]
            ));
        }
        csv
    });
    let against = |certificate: &str| {
        let before = Accepted {
            name: "R0007".into(),
            gas: ebbline::gas::Species::Oxygen,
            flow: first.nominal.flow.clone(),
            meter_certificate: Some(certificate.into()),
            transducer_certificate: Some("PT-2026-031".into()),
        };
        let questions = Questions { before: Some(&before), ..Questions::default() };
        let analysis = analyse(&now, points(&now), &questions).unwrap();
        check(&analysis, CheckKind::SameAsBefore).clone()
    };
    // One per cent is inside the meter's own 0.8 %, but the same meter errs the same way both times.
    let (same, other) = (against("FM-2026-118"), against("FM-2025-007"));
    assert_eq!((same.verdict, other.verdict), (CheckVerdict::Fail, CheckVerdict::Pass), "{same:?} {other:?}");
    assert!(same.value.unwrap() < -1.0);
    let Finding::Change { change, ref before } = same.finding else { panic!("{same:?}") };
    assert!((change + 0.01).abs() < 1e-3 && before == "R0007");
}

#[test]
fn a_run_after_cleaning_is_not_failed_for_being_another_one_than_before() {
    let dirty = changed(&tube(), |_, p, q| (p, q * 0.8));
    let before = Accepted {
        name: "R0007".into(),
        gas: ebbline::gas::Species::Oxygen,
        flow: dirty.nominal.flow.clone(),
        meter_certificate: Some("FM-2026-118".into()),
        transducer_certificate: Some("PT-2026-031".into()),
    };
    let questions = Questions { before: Some(&before), ..Questions::default() };
    let verdict = |purpose: &str| {
        let toml = tube().replacen("\"acceptance\"", &format!("\"{purpose}\""), 1);
        let now = run(&toml, &readings());
        let analysis = analyse(&now, points(&now), &questions).unwrap();
        (check(&analysis, CheckKind::SameAsBefore).verdict, analysis.judgement.unwrap().verdict)
    };
    assert_eq!(verdict("as-left"), (CheckVerdict::Note, Verdict::Pass));
    let (check, judged) = verdict("check");
    assert_eq!(check, CheckVerdict::Fail);
    assert_ne!(judged, Verdict::Pass);
}

#[test]
fn verdicts_follow_their_rule() {
    // U is about 0.0043 at 0.51 L/min STPD·(273.15/293.15): the nominal flow of this run is about 0.4764.
    let flow = changed(&tube(), |_, p, q| (p, q)).nominal.flow.clone();
    let verdict = |nominal: f64, rule: &str| {
        let toml = tube()
            .replacen("flow = \"0.48 L/min\"", &format!("flow = \"{nominal:.6} L/min\""), 1)
            .replacen("\"guarded\"", &format!("\"{rule}\""), 1);
        let analysis = changed(&toml, |_, p, q| (p, q));
        let judgement = analysis.judgement.clone().unwrap();
        (judgement.verdict, judgement.probability)
    };
    let (value, expanded) = (flow.flow_l_min, flow.expanded());
    // The upper limit 1.05·nominal placed against the value: well above, just inside, just outside, well below.
    let nominal_for = |upper: f64| upper / 1.05;
    assert_eq!(verdict(nominal_for(value + 1.1 * expanded), "guarded").0, Verdict::Pass);
    assert_eq!(verdict(nominal_for(value + 0.9 * expanded), "guarded").0, Verdict::Undecided);
    assert_eq!(verdict(nominal_for(value - 0.9 * expanded), "guarded").0, Verdict::Undecided);
    assert_eq!(verdict(nominal_for(value - 1.1 * expanded), "guarded").0, Verdict::Fail);
    assert_eq!(verdict(nominal_for(value + 0.1 * expanded), "simple").0, Verdict::Pass);
    assert_eq!(verdict(nominal_for(value - 0.1 * expanded), "simple").0, Verdict::Fail);
    // On the limit the chance is one half; a guard band of U leaves 2.5 % beyond it (normal, one side).
    let (_, half) = verdict(nominal_for(value), "simple");
    assert!((half - 0.5).abs() < 1e-3, "{half}");
    let (_, guarded) = verdict(nominal_for(value + expanded), "guarded");
    assert!((guarded - 0.975).abs() < 1e-3, "{guarded}");
}

#[test]
fn limits_meant_for_oxygen_judge_a_run_on_air_by_its_oxygen_flow() {
    // 0.5010 L/min of air at 10 bar is 0.4764 of oxygen (0.951): inside for oxygen, outside if it were meant for air.
    let air = tube().replacen("gas = \"oxygen\"", "gas = \"air\"", 1).replacen(
        "made_for = \"oxygen\"",
        "made_for = \"air\"",
        1,
    );
    let more = |_: usize, p: f64, q: f64| (p, q * 1.08);
    let named = changed(&(air.clone() + "gas = \"oxygen\"\n"), more);
    let unnamed = changed(&air, more);
    assert_eq!(named.judgement.as_ref().unwrap().by_flow, Verdict::Pass);
    assert_ne!(unnamed.judgement.as_ref().unwrap().by_flow, Verdict::Pass);
    assert!(unnamed.warnings.contains(&Warning::AcceptanceGasAssumed));
    assert!(named.warnings.contains(&Warning::BenchGasIsNotOxygen));
    // What was judged is the oxygen flow, and is told as that.
    let judged = named.judgement.as_ref().unwrap();
    assert_eq!(judged.gas, ebbline::gas::Species::Oxygen);
    assert_eq!(Some(&judged.flow), named.nominal.as_oxygen.as_ref());
    let oxygen = named.nominal.as_oxygen.as_ref().unwrap();
    assert!((oxygen.flow_l_min / named.nominal.flow.flow_l_min - 0.951).abs() < 2e-3);
    assert!(
        oxygen.standard_uncertainty / oxygen.flow_l_min
            > named.nominal.flow.standard_uncertainty / named.nominal.flow.flow_l_min
    );
}

#[test]
fn a_flow_within_its_limits_does_not_pass_on_doubt() {
    let honest = |_: usize, p: f64, q: f64| (p, q);
    let judged = |toml: &str| changed(toml, honest).judgement.unwrap();
    let no_gain = tube().replacen("gain = \"0.8 %\"\n", "", 1);
    let no_papers = tube().replacen("gain = \"0.2 %\"\nzero = \"0.010 bar\"\n", "", 1);
    // The same line read at 20 bar, where the points end at 13.
    let far =
        tube().replacen("ip = \"10 bar\"", "ip = \"20 bar\"", 1).replacen("0.48 L/min", "0.91 L/min", 1);
    for (toml, doubt) in [
        (no_gain, Doubt::MeterGainUnknown),
        (no_papers, Doubt::TransducerPapersUnknown),
        (far, Doubt::BeyondThePoints),
    ] {
        let judgement = judged(&toml);
        assert_eq!((judgement.by_flow, judgement.verdict), (Verdict::Pass, Verdict::Undecided), "{doubt:?}");
        assert_eq!(judgement.doubts, [doubt]);
    }
    assert!(judged(&tube()).doubts.is_empty());
}

#[test]
fn a_meter_that_is_stuck_says_nothing_of_a_hole() {
    let analysis = changed(&tube(), |_, p, _| (p, 0.48));
    assert_eq!((analysis.effective_diameter_um, analysis.sonic_conductance), (None, None));
    let found = check(&analysis, CheckKind::ThroughZero);
    assert!(
        matches!(found.finding, Finding::Crossing { cause: Some(CrossingCause::DoesNotRise), .. }),
        "{found:?}"
    );
    assert_eq!(found.verdict, CheckVerdict::Fail);
}

#[test]
fn papers_without_noise_let_the_scatter_speak() {
    let silent = tube().replacen("noise = \"0.2 %\"\nresolution = \"0.0001 L/min\"\n", "", 1);
    let analysis =
        changed(&silent, |i, p, q| (p, q * (1.0 + 0.001 * f64::from(i32::try_from(i * 7 % 5).unwrap() - 2))));
    assert!(analysis.warnings.contains(&Warning::FlowNoiseFromScatter));
    assert!((analysis.line.random_dof - 17.0).abs() < 1e-12);
    assert!(!analysis.warnings.iter().any(|w| matches!(w, Warning::RandomPartWidened { .. })));
    let relative = analysis.nominal.flow.parts[0].1 / analysis.nominal.flow.flow_l_min;
    assert!((1e-4..1e-3).contains(&relative), "{relative}");
}
