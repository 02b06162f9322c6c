//! From a bench run and a couch session to a setting, through the rooms as they are.

#![allow(clippy::float_cmp, reason = "a division of a gauge is a printed decimal, the same on both sides")]
#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

use crate::loop_simulator::{Dice, Extra, Kind, scene_of, truth};
use crate::setting_support::*;
use crate::simulator::{MeterSort, Random, Scene, Trial};
use ebbline::entry::Id;
use ebbline::gas::Species;
use ebbline::setting::{OrificeInput, RestingUptake, SettingOptions, Standing, WhyNot, oxygen_line, setting};
use ebbline::uptake::{SessionInput, uptake};

fn input(trial: &Trial) -> OrificeInput {
    let analysis = trial.analyse_nominal();
    let id = Id::new("CMF").expect("a name");
    OrificeInput::of(id, trial.run.gas, &analysis, Standing::Accepted, None)
}

#[test]
fn a_run_with_air_is_set_as_oxygen() {
    // Oxygen over air is about 0.951 (the method's number; common practice).
    let scene = Scene { gas: Species::Air, meter: MeterSort::Mass, b: (0.4, 0.5), ..Scene::PLAIN };
    let trial = Trial::new(scene, &mut Random::new(11));
    let analysis = trial.analyse_nominal();
    let oxygen = input(&trial);
    let ratio = oxygen.line.slope / analysis.line.random.slope;
    assert!((ratio - 0.951).abs() < 0.004, "{ratio}");
    // The hole is the same, whatever the gas.
    let difference = oxygen.effective_diameter_um / analysis.effective_diameter_um.unwrap().0 - 1.0;
    assert!(difference.abs() < 0.004, "{difference}");
    // Only the conversion is uncertain beside what the run itself is.
    assert_eq!(oxygen.line.common.len(), analysis.line.common.len() + 1);
    assert!(oxygen.span_bar_abs.0 > 4.5 && oxygen.span_bar_abs.1 < 14.5, "{:?}", oxygen.span_bar_abs);
    assert_eq!(oxygen.line, oxygen_line(&analysis.line, Species::Air, oxygen.span_bar_abs));
    let middle = 0.5 * (oxygen.span_bar_abs.0 + oxygen.span_bar_abs.1);
    let flow = oxygen.line.flow(middle, 293.15);
    let set = setting(&[oxygen], Some(&diver(1.15 * flow, 0.07 * flow, 14.0)), &SettingOptions::default())
        .expect("a good call");
    let (_, described) = set.recommended().expect("a setting");
    assert!(described.at.overfeed_chance <= 0.025 && described.at.surface.u_l_min > 0.0);
    assert!(
        described.depth.one_percent.expect("a depth").depth_m
            < described.depth.stops.expect("a depth").depth_m
    );
}

#[test]
fn a_session_through_the_same_line_is_carried_jointly() {
    let mut seen = 0;
    for seed in 0..20 {
        let mut dice = Dice::new(seed);
        let truth = truth(&mut dice);
        let scene = scene_of(Kind::Line, truth, &Extra::default(), &mut dice);
        let session = SessionInput { session: &scene.session, line: scene.line.as_ref() };
        let found = uptake(&[session]).expect("a session");
        let Some((_, estimate)) = found.lowest() else { continue };
        let uptake = RestingUptake::from(estimate);
        assert_eq!(uptake.uptake_l_min, estimate.next_day.uptake_l_min);
        assert!(uptake.u_l_min > estimate.u, "another day is less certain than the sessions");
        let Some(line) = scene.line.clone() else { continue };
        let same = OrificeInput { line, ..orifice("A", exact_line(0.03)) };
        let mut other = same.clone();
        // The same numbers but another line: a millionth of a millionth apart.
        other.line.slope *= 1.0 + 1e-12;
        let at = |orifice: OrificeInput| {
            let set = setting(&[orifice], Some(&uptake), &exact()).expect("a good call");
            set.orifices[0].table.iter().map(|row| row.overfeed_chance).collect::<Vec<f64>>()
        };
        let (joint, apart) = (at(same), at(other));
        assert!(!joint.is_empty());
        // Far out in the tail fewer degrees of freedom weigh more than a smaller uncertainty.
        for (joint, apart) in joint.iter().zip(&apart).filter(|(_, apart)| (0.01..0.4).contains(*apart)) {
            assert!(joint <= apart, "seed {seed}: {joint} > {apart}");
            seen += usize::from(joint < apart);
        }
    }
    assert!(seen > 0, "no session went through a line");
}

#[test]
fn without_a_session_that_answers_there_is_no_setting() {
    let trial = Trial::new(Scene::PLAIN, &mut Random::new(3));
    let set = setting(&[input(&trial)], None, &SettingOptions::default()).expect("a good call");
    assert_eq!((set.recommended, set.why_not), (None, Some(WhyNot::NoUptake)));
}
