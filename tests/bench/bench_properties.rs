//! What must not matter to a line: the order of the points, and the units and references in which they were written.

use crate::simulator::{MeterSort, Random, Scene, Trial, at_nominal};
use ebbline::bench::analyse;
use ebbline::bench::line::OrificeLine;
use ebbline::entry::{Indication, MeterKind, PointReading};
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, Temperature,
    TemperatureDifference,
};
use proptest::prelude::*;

/// A run of any bench, with and without low points.
fn any_run() -> impl Strategy<Value = (Trial, u64)> {
    (any::<u64>(), 0_usize..8).prop_map(|(seed, low_points)| {
        let mut random = Random::new(seed);
        // A hole that never chokes can leave too few points for a line.
        let scene =
            Scene { low_points, b: (0.2, 0.6), build: Default::default(), ..Scene::mixed(&mut random) };
        (Trial::new(scene, &mut random), seed)
    })
}

fn line_of(trial: &Trial) -> OrificeLine {
    analyse(&trial.run, &trial.readings, &at_nominal()).expect("a plain run").line
}

/// Whether two lines are the same to `relative`, uncertainties and all.
fn same(got: &OrificeLine, want: &OrificeLine, relative: f64) -> Result<(), TestCaseError> {
    let (a, b) = (got.total(), want.total());
    let (random_a, random_b) = (got.random, want.random);
    // The intercept is small against what it is made of: slope times a pressure of some bar.
    let scale = want.random.slope.abs() * 10.0;
    let pairs = [
        ("slope", a.slope, b.slope, b.slope),
        ("intercept", a.intercept, b.intercept, scale),
        ("u(slope)", a.slope_u, b.slope_u, b.slope_u),
        ("u(intercept)", a.intercept_u, b.intercept_u, b.intercept_u),
        ("covariance", a.covariance, b.covariance, b.slope_u * b.intercept_u),
        ("random u(slope)", random_a.slope_u, random_b.slope_u, random_b.slope_u),
        ("chi-square", random_a.chi_square, random_b.chi_square, random_b.chi_square.max(1.0)),
    ];
    for (what, got, want, scale) in pairs {
        let difference = (got - want).abs() / scale.abs();
        prop_assert!(
            difference <= relative,
            "{what}: got {got}, want {want}, difference {difference:e} of {scale}, tolerance {relative:e}"
        );
    }
    Ok(())
}

fn with_readings(trial: &Trial, turn: impl Fn(&PointReading) -> PointReading) -> Trial {
    let mut turned = trial.clone();
    turned.readings = trial.readings.iter().map(turn).collect();
    turned
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 200, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn the_order_of_the_points_does_not_matter_to_the_line((trial, seed) in any_run()) {
        let mut random = Random::new(seed ^ 0x5eed);
        let mut shuffled = trial.clone();
        for i in (1..shuffled.readings.len()).rev() {
            shuffled.readings.swap(i, random.whole(0, i));
        }
        let (got, want) = (analyse(&shuffled.run, &shuffled.readings, &at_nominal()), line_of(&trial));
        let got = got.expect("a plain run");
        same(&got.line, &want, 1e-9)?;
        let choke = analyse(&trial.run, &trial.readings, &at_nominal()).expect("a plain run").choke;
        prop_assert!((got.choke.value - choke.value).abs() < 1e-9, "{} {}", got.choke.value, choke.value);
    }

    #[test]
    fn units_of_pressure_and_temperature_do_not_matter((trial, _) in any_run()) {
        let mut turned = with_readings(&trial, |p| PointReading {
            pressure: match p.pressure {
                Indication::Gauge(g) => Indication::Gauge(GaugePressure::from_bar(g.as_bar())),
                Indication::Absolute(a) => Indication::Absolute(AbsolutePressure::from_bar(a.as_bar())),
            },
            temperature: p.temperature.map(|t| Temperature::from_c(t.as_c())),
            ..*p
        });
        let conditions = &mut turned.run.conditions;
        let bar = |p: AbsolutePressure| AbsolutePressure::from_bar(p.as_bar());
        conditions.barometer.value = conditions.barometer.value.map(bar);
        let papers = &mut turned.run.transducer.papers;
        papers.zero = papers.zero.map(|z| PressureDifference::from_bar(z.as_bar()));
        same(&line_of(&turned), &line_of(&trial), 1e-9)?;
    }

    #[test]
    fn the_reference_of_the_meters_litres_does_not_matter((trial, _) in any_run(), celsius in 0.0..30.0, kpa in 95.0..105.0) {
        prop_assume!(trial.scene.meter == MeterSort::Mass);
        let at = ReferenceConditions {
            temperature: Temperature::from_c(celsius),
            pressure: AbsolutePressure::from_pa(kpa * 1e3),
        };
        // Litres at 20 °C and 101.325 kPa become so many at the other reference.
        let factor = (101.325 / kpa) * ((celsius + 273.15) / 293.15);
        let scaled = |f: IndicatedFlow| IndicatedFlow::from_l_min(f.as_l_min() * factor);
        let mut turned = with_readings(&trial, |p| PointReading { flow: scaled(p.flow), ..*p });
        let meter = &mut turned.run.meter;
        if let MeterKind::Mass { reads_at, .. } = &mut meter.kind {
            *reads_at = at;
        }
        meter.papers.zero = meter.papers.zero.map(scaled);
        meter.papers.resolution = meter.papers.resolution.map(scaled);
        same(&line_of(&turned), &line_of(&trial), 1e-9)?;
    }

    #[test]
    fn another_coverage_factor_for_the_same_papers_does_not_matter((trial, _) in any_run(), coverage in 1.0..3.0) {
        let mut turned = trial.clone();
        let factor = coverage / 2.0;
        let meter = &mut turned.run.meter.papers;
        meter.coverage = coverage;
        meter.gain = meter.gain.map(|g| g * factor);
        meter.zero = meter.zero.map(|z| IndicatedFlow::from_l_min(z.as_l_min() * factor));
        meter.noise = meter.noise.map(|noise| match noise {
            ebbline::entry::Amount::OfReading(share) => ebbline::entry::Amount::OfReading(share * factor),
            fixed => fixed,
        });
        same(&line_of(&turned), &line_of(&trial), 1e-9)?;
    }

    #[test]
    fn a_barometer_written_at_every_point_is_the_one_of_the_run((trial, _) in any_run()) {
        let value = trial.run.conditions.barometer.value;
        let mut turned = with_readings(&trial, |p| PointReading { barometer: value, ..*p });
        turned.run.conditions.barometer.value = None;
        same(&line_of(&turned), &line_of(&trial), 1e-12)?;
    }

    #[test]
    fn gauge_and_absolute_readings_of_one_run_give_one_line((trial, _) in any_run()) {
        // The transducer's own gain acts on what it shows, so only the line itself is compared, not its common part.
        let ambient = trial.run.conditions.barometer.value.expect("read once");
        let turned = with_readings(&trial, |p| PointReading {
            pressure: match p.pressure {
                Indication::Gauge(g) => Indication::Absolute(g.above(ambient)),
                Indication::Absolute(a) => Indication::Gauge(a.gauge_over(ambient)),
            },
            ..*p
        });
        let points = |t: &Trial| {
            let analysis = analyse(&t.run, &t.readings, &at_nominal()).expect("a plain run");
            (analysis.points.iter().map(|p| p.used()).collect::<Vec<_>>(), analysis.line.random)
        };
        let ((used, got), (also_used, want)) = (points(&turned), points(&trial));
        // The zero that is not the barometer's changes what is known of b a little, and so may the points left out.
        prop_assume!(used == also_used);
        prop_assert!((got.slope / want.slope - 1.0).abs() < 1e-9, "{} {}", got.slope, want.slope);
        let difference = (got.intercept - want.intercept).abs() / (10.0 * want.slope);
        prop_assert!(difference < 1e-9, "{} {}", got.intercept, want.intercept);
    }
}

#[test]
fn a_warmer_gas_passes_less_and_the_line_is_quoted_at_20_degrees() {
    // q ∝ 1/√T: the same hole at 10 °C and at 30 °C gives one line, to what its errors allow.
    let mut random = Random::new(77);
    let scene = Scene { meter: MeterSort::Mass, ..Scene::PLAIN };
    for _ in 0..50 {
        let mut trial = Trial::new(scene, &mut random);
        let want = line_of(&trial).random.at(11.0);
        let warmer = TemperatureDifference::from_k(10.0);
        for p in &mut trial.readings {
            let t = p.temperature.expect("read").as_k();
            p.temperature = Some(Temperature::from_k(t + warmer.as_k()));
            p.flow = IndicatedFlow::from_l_min(p.flow.as_l_min() * (t / (t + warmer.as_k())).sqrt());
        }
        let got = line_of(&trial).random.at(11.0);
        assert!((got / want - 1.0).abs() < 1e-6, "got {got}, want {want}");
    }
}
