//! Settings worked by hand, the working in comments.

#![allow(clippy::float_cmp, reason = "a division of a gauge is a printed decimal, the same on both sides")]

use crate::setting_support::*;
use ebbline::entry::{Amount, Id, Meter, MeterKind, Papers};
use ebbline::gas::{Species, Water, subsonic_factor};
use ebbline::quantity::{
    AbsolutePressure, IndicatedFlow, Length, ReferenceConditions, Temperature, Uncertain, Volume,
};
use ebbline::setting::{Against, FirstStageKind, Setting, SettingOptions, Trapped, Warning, setting};
use ebbline::uptake::SharedLine;

fn set(options: &SettingOptions, uptake: &ebbline::setting::RestingUptake) -> Setting {
    setting(&[orifice("A", exact_line(0.028))], Some(uptake), options).expect("a good call")
}

fn ip(setting: &Setting) -> f64 {
    setting.recommended().expect("a setting").1.at.ip_bar_gauge
}

#[track_caller]
fn near(what: &str, got: f64, want: f64, tolerance: f64) {
    let difference = (got - want).abs();
    assert!(
        difference <= tolerance,
        "{what}: got {got}, want {want}, difference {difference}, tolerance {tolerance}"
    );
}

#[test]
fn with_everything_known_the_least_shortfall_decides_and_the_gauge_rounds_down() {
    // M = 0.32: J ≤ 0.95 · 0.32 = 0.304; p1 = 0.304/0.028 = 10.857 bar absolute, 9.857 bar gauge where the barometer is
    // 1 bar: 9.8. Never to exceed: 0.32/0.028 = 11.4286, 10.4286: 10.4.
    let set = set(&exact(), &diver(0.32, 0.0, f64::INFINITY));
    let (orifice, described) = set.recommended().expect("a setting");
    assert_eq!(described.at.ip_bar_gauge, 9.8);
    assert_eq!(orifice.never_exceed_ip_bar_gauge, Some(10.4));
    // 0.028 · 10.8 = 0.3024: short by 0.0176.
    near("injection", described.at.surface.nominal_l_min, 0.3024, 1e-9);
    near("shortfall", described.at.shortfall_l_min, 0.0176, 1e-9);
    assert_eq!(described.at.overfeed_chance, 0.0);
}

#[test]
fn the_chance_holds_with_gauge_spread_and_cold_water() {
    // u(M) = 0.02, gauge ±0.5 bar (k = 2): 0.25 · 0.028 = 0.007; together 0.021 190; times 1.959 964 = 0.041 531:
    // J ≤ 0.278 469, p1 = 9.945 3, 8.945 bar gauge: 8.9.
    let uptake = diver(0.32, 0.02, f64::INFINITY);
    let with_gauge = SettingOptions { gauge_error: bar(0.5), ..exact() };
    assert_eq!(ip(&set(&with_gauge, &uptake)), 8.9);
    // An upward spread of 0.3 bar comes off whole: 8.645: 8.6.
    let with_spread = SettingOptions { ip_spread: bar(0.3), ..with_gauge };
    assert_eq!(ip(&set(&with_spread, &uptake)), 8.6);
    // Water not known: at 4 °C the flow is sqrt(293.15/277.15) = 1.028 459 of it: 0.028 796 9 L/min per bar, gauge
    // 0.007 199; together 0.021 256: J ≤ 0.278 338, p1 = 9.665 6, less 1.3: 8.366: 8.3.
    let no_water = SettingOptions { water_temperature: None, ..with_spread };
    let set = set(&no_water, &uptake);
    assert_eq!(ip(&set), 8.3);
    // Leanest, at 30 °C and 9.3 bar: 0.028 · sqrt(293.15/303.15) · 9.3 = 0.256 07; 19.98 % short.
    let at = set.recommended().expect("a setting").1.at;
    near("leanest", at.surface.leanest_l_min, 0.256_07, 5e-6);
    near("largest shortfall", at.largest_shortfall, 0.1998, 5e-5);
    assert!(set.warnings.contains(&Warning::WaterTemperatureUnknown));
}

#[test]
fn few_degrees_of_freedom_cost_injection() {
    // t(0.975; 8) = 2.306 004: J ≤ 0.32 − 2.306 004 · 0.02 = 0.273 88, p1 = 9.781 4: 8.7; normal: 0.280 80, 10.029: 9.0.
    assert_eq!(ip(&set(&exact(), &diver(0.32, 0.02, 8.0))), 8.7);
    assert_eq!(ip(&set(&exact(), &diver(0.32, 0.02, f64::INFINITY))), 9.0);
}

#[test]
fn an_error_of_the_line_that_made_the_session_is_not_counted_twice() {
    // A line off by 5 % of slope, common to all points, and a session that follows it fully at p1 = 9.5 bar: all of its
    // u(M) = 0.028 · 0.05 · 9.5 = 0.0133 is the line's. At p1 the difference moves by 0.0014 · (p1 − 9.5): next to
    // nothing, so the least shortfall decides: 9.8. Taken as independent: at 10 bar sqrt(0.0133² + 0.014²) = 0.0193;
    // 0.32 − 1.96 · that = 0.2821, p1 = 10.08.
    let mut line = exact_line(0.028);
    line.common.push(ebbline::uptake::LineShift { source: None, intercept: 0.0, slope: 0.0014 });
    let shared = SharedLine { line: line.clone(), per_intercept: 1.0, per_slope: 9.5 };
    let own = (0.0133_f64 * 0.0133 + 0.004 * 0.004).sqrt();
    let together =
        ebbline::setting::RestingUptake { shared_lines: vec![shared], ..diver(0.32, own, f64::INFINITY) };
    let apart = diver(0.32, own, f64::INFINITY);
    let at = |uptake| {
        let set = setting(&[orifice("A", line.clone())], Some(uptake), &exact()).expect("a good call");
        ip(&set)
    };
    assert_eq!(at(&together), 9.8);
    // With the 0.004 that is the session's own: sqrt(0.0133² + 0.014² + 0.004²) = 0.0197; 0.2814, p1 = 10.05: 9.0.
    assert_eq!(at(&apart), 9.0);
}

#[test]
fn set_on_a_mountain_the_gauge_shows_more() {
    // The same absolute pressure, 10.857 bar, over 0.8 bar where set: 10.057: 10.0. Where the dive is does not matter.
    let options = SettingOptions { set_at: barometer(0.8, 0.0), ..exact() };
    assert_eq!(ip(&set(&options, &diver(0.32, 0.0, f64::INFINITY))), 10.0);
    let dive = SettingOptions { dive_at: barometer(0.8, 0.0), ..exact() };
    assert_eq!(ip(&set(&dive, &diver(0.32, 0.0, f64::INFINITY))), 9.8);
}

#[test]
fn depths_follow_the_lower_end_of_the_choke_ratio() {
    // 10.0 bar gauge judged, set at 1.01325 bar: p1 = 11.01325 bar; the flow stops at 10 bar over the surface:
    // 10e5/(1025 · 9.80665) = 99.48 m (flow stopping where ambient equals supply is common practice, no source).
    let options = SettingOptions {
        set_at: barometer(1.013_25, 0.0),
        dive_at: barometer(1.013_25, 0.0),
        judge: Some(gauge(10.0)),
        ..exact()
    };
    let set = set(&options, &diver(0.36, 0.0, f64::INFINITY));
    let depth = &set.orifices[0].judged.as_ref().expect("judged").described.depth;
    near("stops", depth.stops.expect("stops").depth_m, 99.48, 0.005);
    let low = choke(0.45).interval_95.0;
    assert!(low < 0.45 && low > 0.3, "{low}");
    assert_eq!(depth.choke_ratio_low, low);
    for (point, left) in [(depth.one_percent, 0.99), (depth.nine_tenths, 0.90)] {
        let point = point.expect("a depth");
        near("flow left there", subsonic_factor(point.ambient_bar_abs / 11.013_25, low), left, 1e-9);
        near("its depth", 1.013_25 + point.depth_m * 1025.0 * 9.806_65 / 1e5, point.ambient_bar_abs, 1e-9);
    }
    let last = depth.rows.last().expect("rows");
    near("injection where it stops", last.injection_l_min, 0.0, 1e-6);
    assert!(depth.rows.windows(2).all(|w| w[1].injection_l_min <= w[0].injection_l_min + 1e-12));
    assert_eq!((depth.overtakes_at_m, depth.overtakes_at_best_estimate_m), (None, None));
    let fresh = SettingOptions { water: Some(Water::Fresh), ..options };
    let set =
        setting(&[orifice("A", exact_line(0.028))], Some(&diver(0.36, 0.0, 8.0)), &fresh).expect("good");
    let depth = &set.orifices[0].judged.as_ref().expect("judged").described.depth;
    near("stops, fresh", depth.stops.expect("stops").depth_m, 101.97, 0.005);
}

#[test]
fn a_compensated_first_stage_is_set_for_its_maximum_depth() {
    // 20 m of sea water over 1 bar: 1 + 20 · 0.100 518 = 3.010 36 bar. J ≤ 0.304: p1 = 10.857, 7.847 bar gauge: 7.8.
    // It overtakes 0.32 at p1 = 11.4286: 3.6286 bar, 26.15 m.
    let options = SettingOptions {
        first_stage: FirstStageKind::Compensated,
        max_depth: Some(Length::from_m(20.0)),
        ..exact()
    };
    let uptake = diver(0.32, 0.0, f64::INFINITY);
    let at_20 = set(&options, &uptake);
    let (orifice, described) = at_20.recommended().expect("a setting");
    assert_eq!(described.at.ip_bar_gauge, 7.8);
    near("at the surface", described.at.surface.nominal_l_min, 0.028 * 8.8, 1e-9);
    near("at 20 m", described.at.held.nominal_l_min, 0.028 * 10.810_36, 1e-6);
    near("overtakes", described.depth.overtakes_at_m.expect("a depth"), 26.15, 0.005);
    near("best estimates", described.depth.overtakes_at_best_estimate_m.expect("a depth"), 26.15, 0.005);
    assert_eq!(described.depth.stops, None);
    assert!(!orifice.warnings.iter().any(|w| matches!(w, Warning::LeanAtSurface { .. })));
    // 30 m: 6.8 bar gauge; 0.028 · 7.8 = 0.2184 at the surface, 31.75 % short there.
    let deep = SettingOptions { max_depth: Some(Length::from_m(30.0)), ..options };
    let at_30 = set(&deep, &uptake);
    assert_eq!(ip(&at_30), 6.8);
    let lean = at_30.orifices[0].warnings.iter().find_map(|w| match w {
        Warning::LeanAtSurface { shortfall } => Some(*shortfall),
        _ => None,
    });
    near("lean at the surface", lean.expect("a warning"), 0.3175, 5e-5);
}

#[test]
fn an_ip_is_judged_by_all_that_speaks_against_it() {
    let judged = |ip: f64| {
        let options =
            SettingOptions { judge: Some(gauge(ip)), ip_range: Some((gauge(7.0), gauge(11.0))), ..exact() };
        let set = set(&options, &diver(0.32, 0.01, f64::INFINITY));
        set.orifices[0].judged.clone().expect("judged").against
    };
    // 9.6: 0.2968, 7.25 % short, 2.32 standard deviations below: chance 1.0 %.
    assert_eq!(judged(9.6), []);
    // 9.8 is 5.5 % short, 1.76 standard deviations: 3.9 %.
    assert!(matches!(judged(9.8)[..], [Against::Overfeeds { chance }] if (chance - 0.039).abs() < 5e-4));
    // 10.0: 0.308, 3.75 % short.
    assert!(matches!(judged(10.0)[..], [Against::Overfeeds { .. }, Against::ShortfallTooSmall { shortfall }]
        if (shortfall - 0.0375).abs() < 1e-9));
    // 7.5: 0.238, 25.6 % short; 6.5 is outside the range too.
    assert!(matches!(judged(7.5)[..], [Against::ShortfallTooLarge { .. }]));
    assert!(matches!(judged(6.5)[..], [Against::ShortfallTooLarge { .. }, Against::OutsideRange { .. }]));
}

#[test]
fn the_better_orifice_is_recommended_and_an_excused_one_is_last() {
    // Holes of 0.028 and 0.040 with a gauge of ±0.5 bar: the smaller one is set higher, where the gauge matters less.
    let options = SettingOptions { gauge_error: bar(0.5), despite: Some("no other".into()), ..exact() };
    let uptake = diver(0.32, 0.01, f64::INFINITY);
    let (small, large) = (orifice("small", exact_line(0.028)), orifice("large", exact_line(0.040)));
    let both = setting(&[large.clone(), small.clone()], Some(&uptake), &options).expect("a good call");
    assert_eq!(both.recommended, Some(1));
    let failed =
        ebbline::setting::OrificeInput { standing: ebbline::setting::Standing::Failed, ..small.clone() };
    let both = setting(&[large, failed], Some(&uptake), &options).expect("a good call");
    assert_eq!(both.recommended, Some(0));
    assert!(both.orifices[1].answer.is_ok());
    assert_eq!(both.orifices[1].warnings[0], Warning::DespiteFailed { why: "no other".into() });
}

#[test]
fn a_meter_is_foretold_in_its_own_litres() {
    let reads_at = ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    };
    let papers = Papers {
        gain: Some(0.008),
        zero: None,
        noise: Some(Amount::OfReading(0.002)),
        resolution: None,
        coverage: 2.0,
        range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
        certificate: None,
        due: None,
    };
    let meter = |kind| Meter { id: Some(Id::new("FM-01").expect("a name")), kind, papers: papers.clone() };
    let mass = meter(MeterKind::Mass { reads_at, made_for: Species::Oxygen, gas_factor: None });
    let options = |meter| SettingOptions {
        gauge_error: bar(0.5),
        ip_spread: bar(0.3),
        meter: Some(meter),
        trapped: Some(Trapped::Volume(Uncertain { value: Volume::from_l(0.015), expanded: None })),
        ..exact()
    };
    let uptake = diver(0.32, 0.02, f64::INFINITY);
    let set_mass = set(&options(mass), &uptake);
    let described = set_mass.recommended().expect("a setting").1;
    // 8.6 bar gauge: 0.028 · 9.6 = 0.2688 L/min STPD; at 20 °C litres are 293.15/273.15 larger: 0.288 48. Risen by 0.3 bar:
    // 0.028 · 9.9 · 1.073 220 = 0.297 50.
    let reading = described.expected_reading.as_ref().expect("a reading");
    near("reading", reading.full.value_l_min, 0.288_48, 5e-6);
    near("nearly empty", reading.nearly_empty.value_l_min, 0.297_50, 5e-6);
    // The IP gauge alone: 0.25/9.6 = 2.60 %; with meter (0.4 % and 0.1 %) and proof temperature (0.34 %): 2.66 %, so low
    // 5.3 % under. High: the uptake and the meter allow 0.32 − 1.96 · sqrt(0.02² + (0.0054 · 0.28)²) = 0.280 7
    // L/min, which is 0.280 7/0.277 2 of the richest: 0.292 1 as set, 0.301 2 nearly empty.
    near("low", reading.full.low_l_min, 0.288_48 * (1.0 - 0.0532), 2e-4);
    near("high", reading.full.high_l_min, 0.292_1, 2e-4);
    near("high, nearly empty", reading.nearly_empty.high_l_min, 0.301_2, 2e-4);
    assert!(described.patency.is_some());
    // A piston at 1 bar and 20 °C: 0.2688 · 1.01325 · 293.15/273.15 = 0.292 30 L/min.
    let piston = set(&options(meter(MeterKind::Volumetric { wet: false })), &uptake);
    let described = piston.recommended().expect("a setting").1;
    near("piston", described.expected_reading.as_ref().expect("a reading").full.value_l_min, 0.292_30, 5e-6);
    // Made for air, without a factor: no reading, and said so.
    let air = meter(MeterKind::Mass { reads_at, made_for: Species::Air, gas_factor: None });
    let none = set(&options(air), &uptake);
    let (orifice, described) = none.recommended().expect("a setting");
    assert_eq!(described.expected_reading, None);
    assert!(orifice.warnings.contains(&Warning::MeterWithoutGasFactor));
}
