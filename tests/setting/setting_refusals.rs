//! Where a setting ends: each boundary of the refusals, and calls that are wrong.

#![allow(clippy::float_cmp, reason = "a division of a gauge is a printed decimal, the same on both sides")]

use crate::setting_support::*;
use chrono::NaiveDate;
use ebbline::quantity::Length;
use ebbline::setting::{
    FirstStageKind, OrificeInput, RestingUptake, SettingError, SettingOptions, Standing, Warning, WhyNot,
    setting,
};
use ebbline::uptake::{PerKilogram, Plausible};

/// The answer for one exact orifice of 0.028 L/min per bar and M = 0.32: 9.857 bar gauge at most, 7.571 at least.
fn answer(options: &SettingOptions) -> Result<f64, WhyNot> {
    answer_of(&orifice("A", exact_line(0.028)), &diver(0.32, 0.0, f64::INFINITY), options)
}

fn answer_of(
    orifice: &OrificeInput,
    uptake: &RestingUptake,
    options: &SettingOptions,
) -> Result<f64, WhyNot> {
    let set = setting(std::slice::from_ref(orifice), Some(uptake), options).expect("a good call");
    assert_eq!(set.recommended.is_some(), set.orifices[0].answer.is_ok());
    assert_eq!(set.why_not.is_none(), set.recommended.is_some());
    set.orifices[0].answer.clone().map(|d| d.at.ip_bar_gauge)
}

fn range(low: f64, high: f64) -> SettingOptions {
    SettingOptions { ip_range: Some((gauge(low), gauge(high))), ..exact() }
}

#[test]
fn a_range_that_begins_too_high_names_the_hole_that_fits() {
    assert_eq!(answer(&range(9.8, 12.0)), Ok(9.8));
    let Err(WhyNot::NothingLowEnough { lowest_ip_bar_gauge, fitting, .. }) = answer(&range(9.9, 12.0)) else {
        panic!("{:?}", answer(&range(9.9, 12.0)));
    };
    assert_eq!(lowest_ip_bar_gauge, 9.9);
    // In the middle, 10.95 bar gauge, 11.95 absolute: 0.304/11.95 over 0.028, rooted, of 60 µm: 57.19 µm.
    let fitting = fitting.expect("a hole that fits");
    assert!((fitting.um - 57.19).abs() < 0.005, "{fitting:?}");
    assert!(fitting.smallest_um < fitting.um && fitting.um < fitting.largest_um);
    let scale = (fitting.um / 60.0) * (fitting.um / 60.0);
    let fits = orifice("B", exact_line(0.028 * scale));
    assert_eq!(answer_of(&fits, &diver(0.32, 0.0, f64::INFINITY), &range(9.9, 12.0)), Ok(10.9));
}

#[test]
fn a_range_that_ends_too_low_names_the_hole_that_fits() {
    // 7.6: 0.028 · 8.6 = 0.2408, 24.75 % short; 7.5: 0.238, 25.6 %.
    assert_eq!(answer(&range(5.0, 7.6)), Ok(7.6));
    let Err(WhyNot::NothingHighEnough { highest_ip_bar_gauge, shortfall, fitting }) =
        answer(&range(5.0, 7.5))
    else {
        panic!("{:?}", answer(&range(5.0, 7.5)));
    };
    assert_eq!(highest_ip_bar_gauge, 7.5);
    assert!((shortfall - 0.256_25).abs() < 1e-9);
    assert!(fitting.expect("a hole that fits").um > 60.0);
    let set =
        setting(&[orifice("A", exact_line(0.028))], Some(&diver(0.32, 0.0, f64::INFINITY)), &range(5.0, 7.6))
            .expect("a good call");
    assert!(set.orifices[0].warnings.contains(&Warning::RangeLimits { highest_ip_bar_gauge: 7.6 }));
    // The maker's maximum ends it as well.
    let max = SettingOptions { max_ip: Some(gauge(7.5)), ..range(5.0, 12.0) };
    assert!(matches!(answer(&max), Err(WhyNot::NothingHighEnough { .. })));
}

#[test]
fn a_range_between_two_divisions_holds_nothing() {
    assert!(matches!(answer(&range(9.71, 9.79)), Err(WhyNot::NoDivisionInRange { .. })));
}

#[test]
fn a_needed_pressure_outside_the_bench_span_is_no_setting() {
    let spanning = |low, high| OrificeInput { span_bar_abs: (low, high), ..orifice("A", exact_line(0.028)) };
    let uptake = diver(0.32, 0.0, f64::INFINITY);
    // 9.8 bar gauge needs 10.8 bar absolute; a tenth of a bar is the same pressure.
    assert_eq!(answer_of(&spanning(4.0, 10.71), &uptake, &range(5.0, 12.0)), Ok(9.8));
    assert!(matches!(
        answer_of(&spanning(4.0, 10.69), &uptake, &range(5.0, 12.0)),
        Err(WhyNot::OutsideSpan { needs_bar_abs, fitting: Some(_), .. }) if (needs_bar_abs - 10.8).abs() < 1e-9
    ));
    assert!(matches!(
        answer_of(&spanning(10.91, 14.0), &uptake, &range(5.0, 12.0)),
        Err(WhyNot::OutsideSpan { .. })
    ));
    // Without a range the span is the range: the setting stays inside.
    assert_eq!(answer_of(&spanning(4.0, 10.69), &uptake, &exact()), Ok(9.6));
    // To judge an IP there is a wrong call.
    let judge = SettingOptions { judge: Some(gauge(9.8)), ..exact() };
    let set = setting(&[spanning(4.0, 10.69)], Some(&uptake), &judge);
    assert!(matches!(set, Err(SettingError::IpOutsideSpan { .. })), "{set:?}");
    assert!(setting(&[spanning(4.0, 10.71)], Some(&uptake), &judge).is_ok());
}

#[test]
fn over_a_quarter_short_is_no_setting() {
    // J = 0.32 − 1.959 964·u: 0.2408 (7.6 bar) for u = 0.0404; 0.238 (7.5) for u = 0.0418.
    let at = |u| answer_of(&orifice("A", exact_line(0.028)), &diver(0.32, u, f64::INFINITY), &exact());
    assert_eq!(at(0.0404), Ok(7.6));
    assert!(matches!(at(0.0418), Err(WhyNot::ShortfallTooLarge { ip_bar_gauge, fitting: None, .. })
        if ip_bar_gauge == 7.5));
}

#[test]
fn an_orifice_that_is_not_in_order_needs_a_reason() {
    let day = NaiveDate::from_ymd_opt(2026, 11, 1);
    let since = day.expect("a day");
    let uptake = diver(0.32, 0.0, f64::INFINITY);
    let despite = |text: &str| SettingOptions { despite: Some(text.into()), ..exact() };
    let why = || "spare is away".to_owned();
    for (standing, overdue_since, refusal, warning) in [
        (Standing::Failed, None, WhyNot::Failed, Warning::DespiteFailed { why: why() }),
        (Standing::Undecided, None, WhyNot::Undecided, Warning::DespiteUndecided { why: why() }),
        (Standing::Accepted, day, WhyNot::Overdue { since }, Warning::DespiteOverdue { since, why: why() }),
    ] {
        let bad = OrificeInput { standing, overdue_since, ..orifice("A", exact_line(0.028)) };
        for options in [exact(), despite("  ")] {
            let set = setting(std::slice::from_ref(&bad), Some(&uptake), &options).expect("a good call");
            assert_eq!(set.why_not, Some(refusal.clone()));
            assert!(set.orifices[0].table.is_empty() && set.orifices[0].never_exceed_ip_bar_gauge.is_none());
        }
        let set = setting(&[bad], Some(&uptake), &despite("spare is away")).expect("a good call");
        assert!(set.recommended.is_some() && set.orifices[0].warnings.contains(&warning), "{warning:?}");
    }
    let new = OrificeInput { standing: Standing::NeverJudged, ..orifice("A", exact_line(0.028)) };
    let set = setting(&[new], Some(&uptake), &exact()).expect("a good call");
    assert!(set.recommended.is_some() && set.orifices[0].warnings.contains(&Warning::NeverJudged));
}

#[test]
fn a_hardly_possible_uptake_needs_a_reason_and_none_is_no_setting() {
    let per = |plausible| RestingUptake {
        per_kilogram: Some(PerKilogram { ml_kg_min: 6.4, plausible }),
        ..diver(0.32, 0.0, f64::INFINITY)
    };
    let orifices = [orifice("A", exact_line(0.028))];
    let set = |uptake: Option<&RestingUptake>, options: &SettingOptions| {
        setting(&orifices, uptake, options).expect("a good call")
    };
    let refused = set(Some(&per(Plausible::Hardly)), &exact());
    assert_eq!(refused.why_not, Some(WhyNot::ImplausiblePerKilogram { ml_kg_min: 6.4 }));
    assert!(refused.orifices[0].table.is_empty());
    let despite = SettingOptions { despite: Some("weighed in a suit".into()), ..exact() };
    let allowed = set(Some(&per(Plausible::Hardly)), &despite);
    assert!(allowed.recommended.is_some());
    assert!(allowed.warnings.iter().any(|w| matches!(w, Warning::DespitePerKilogram { .. })));
    let unusual = set(Some(&per(Plausible::Unusual)), &exact());
    assert!(unusual.recommended.is_some());
    assert!(unusual.warnings.contains(&Warning::UnusualPerKilogram { ml_kg_min: 6.4 }));
    assert_eq!(set(None, &exact()).why_not, Some(WhyNot::NoUptake));
    for bad in [diver(0.0, 0.0, 8.0), diver(-0.1, 0.0, 8.0), diver(f64::NAN, 0.0, 8.0)] {
        assert_eq!(set(Some(&bad), &exact()).why_not, Some(WhyNot::NoUptake));
    }
}

#[test]
fn a_compensated_stage_goes_a_tenth_beyond_the_span_at_depth_and_says_so() {
    // 7.8 bar gauge at 20 m: 10.810 bar. A span to 9.83 holds it with its tenth (10.813), one to 9.82 does not (10.802).
    let options = SettingOptions {
        first_stage: FirstStageKind::Compensated,
        max_depth: Some(Length::from_m(20.0)),
        ..range(5.0, 12.0)
    };
    let uptake = diver(0.32, 0.0, f64::INFINITY);
    let to = |high| OrificeInput { span_bar_abs: (4.0, high), ..orifice("A", exact_line(0.028)) };
    assert_eq!(answer_of(&to(9.83), &uptake, &options), Ok(7.8));
    assert!(matches!(answer_of(&to(9.82), &uptake, &options), Err(WhyNot::OutsideSpan { .. })));
    let set = setting(&[to(9.83)], Some(&uptake), &options).expect("a good call");
    let (orifice, described) = set.recommended().expect("a setting");
    assert!(orifice.warnings.iter().any(|w| matches!(w, Warning::BeyondSpanAtDepth { .. })));
    // 1.1 · 9.83 − 7.8 = 3.013 bar: 20.03 m, and no row below.
    assert!((described.depth.known_to_m.expect("an end") - 20.03).abs() < 0.005);
    assert!(described.depth.rows.iter().all(|r| r.depth_m < 20.04));
    assert!(described.depth.rows.last().is_some_and(|r| r.beyond_span));
    assert!(!described.depth.rows[0].beyond_span);
    assert_eq!(described.depth.overtakes_at_m, None);
}

#[test]
fn wrong_calls_are_errors() {
    let wrong = |options: SettingOptions| {
        let orifices = [orifice("A", exact_line(0.028))];
        setting(&orifices, Some(&diver(0.32, 0.0, 8.0)), &options).expect_err("a wrong call")
    };
    let compensated = SettingOptions { first_stage: FirstStageKind::Compensated, ..exact() };
    assert_eq!(wrong(compensated), SettingError::CompensatedWithoutMaxDepth);
    for chance in [0.0, -0.01, 0.5, f64::NAN] {
        assert!(matches!(wrong(SettingOptions { chance: Some(chance), ..exact() }), SettingError::Chance(_)));
    }
    for shortfall in [0.0, -0.1, 0.25, f64::NAN] {
        let options = SettingOptions { shortfall: Some(shortfall), ..exact() };
        assert!(matches!(wrong(options), SettingError::Shortfall(_)));
    }
    assert!(matches!(wrong(range(12.0, 9.0)), SettingError::IpRange(..)));
    let options = SettingOptions { gauge_division: bar(0.0), ..exact() };
    assert!(matches!(wrong(options), SettingError::Division(_)));
    let options = SettingOptions { ip_spread: bar(-0.1), ..exact() };
    assert!(matches!(wrong(options), SettingError::Negative { what: "IP spread", .. }));
    let options = SettingOptions { set_at: barometer(10.1, 0.0), ..exact() };
    assert!(matches!(wrong(options), SettingError::Place(_)));
    assert!(matches!(
        wrong(SettingOptions { water_temperature: water(70.0), ..exact() }),
        SettingError::WaterTemperature(_)
    ));
    assert_eq!(setting(&[], None, &exact()), Err(SettingError::NoOrifice));
}
