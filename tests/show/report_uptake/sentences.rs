//! Every finding of `uptake` has a sentence of its own, with its numbers and units. The cases are a chain: an exhaustive
//! match names what each sentence must hold and the next case, so that a new variant does not compile until it is in.

use std::collections::HashSet;

use ebbline::entry::{LoopKept, Place};
use ebbline::quantity::show::Shown;
use ebbline::report::Units;
use ebbline::report::uptake_sentences as say;
use ebbline::uptake::{
    CellLeftOut, CellTrouble, Help, HelpWith, Jump, PerKilogram, Plausible, Proposal, RestDoubt, RestItem,
    StretchLeftOut, StretchWhy, Warning, WhyNot,
};

/// What a sentence must hold, and the case after it.
type Case<T> = (&'static [&'static str], Option<T>);

/// Walks a chain: every sentence holds its words, none is said twice, and each is one clean sentence.
fn walk<T: std::fmt::Debug>(first: T, case: fn(&T) -> Case<T>, sentence: impl Fn(&T) -> String) -> usize {
    let mut seen = HashSet::new();
    let mut next = Some(first);
    while let Some(now) = next {
        let (holds, after) = case(&now);
        let said = sentence(&now);
        for word in holds {
            assert!(said.contains(word), "{now:?}: \"{word}\" is missing in \"{said}\"");
        }
        assert!(said.len() > 8 && !said.ends_with('.') && !said.contains("  "), "{said:?}");
        assert!(
            !said.contains("NaN") && !said.contains('{') && !said.chars().any(char::is_control),
            "{said:?}"
        );
        assert!(seen.insert(said.clone()), "said twice: {said}");
        next = after;
    }
    seen.len()
}

fn jump(looks_like: Jump) -> Proposal {
    let change_bar = if looks_like == Jump::OxygenAdd { 0.082 } else { -0.043 };
    Proposal { at_s: 450.0, change_bar, looks_like }
}

fn warning_case(warning: &Warning) -> Case<Warning> {
    use Warning as W;
    match warning {
        W::OneCellOnly => (&["only one oxygen cell"], Some(W::CellGainAssumed { expanded: 0.02 })),
        W::CellGainAssumed { .. } => (
            &["±2 % (k = 2)", "[cells]"],
            Some(W::AboveCalibration { po2_bar: 1.1234, calibrated_bar: 0.98 }),
        ),
        W::AboveCalibration { .. } => (&["1.123 bar", "0.980 bar"], Some(W::RowsWithoutTime(3))),
        W::RowsWithoutTime(_) => (&["3 rows have no time"], Some(W::RowsUnordered(1))),
        W::RowsUnordered(_) => (&["1 row was out of order"], Some(W::TimesRepeated(2))),
        W::TimesRepeated(_) => (&["2 times stand"], Some(W::Gap { from_s: 61.0, to_s: 3_700.0 })),
        W::Gap { .. } => (&["from 00:01:01 to 01:01:40"], Some(W::BarometerUnknown)),
        W::BarometerUnknown => (&["no barometer", "1013.25 ± 30 hPa"], Some(W::BarometerAssumed)),
        W::BarometerAssumed => (&["±2 hPa"], Some(W::LoopTemperatureUnknown)),
        W::LoopTemperatureUnknown => (&["33 ± 4 °C"], Some(W::LoopTemperatureAssumed)),
        W::LoopTemperatureAssumed => (&["±1 °C"], Some(W::DepthUnknown)),
        W::DepthUnknown => (&["the surface ± 1 m"], Some(W::DepthAssumed)),
        W::DepthAssumed => (&["±0.2 m"], Some(W::TimeOnLoopUnknown)),
        W::TimeOnLoopUnknown => (&["time_on_loop"], Some(W::WarmUpLeftOut { seconds: 600.0 })),
        W::WarmUpLeftOut { .. } => (&["10 min", "scrubber_warm = true"], Some(W::LeakNotTested)),
        W::LeakNotTested => {
            (&["leak_test = \"passed\"", "nose clip"], Some(W::LoopVolumeAssumed { expanded: 0.15 }))
        }
        W::LoopVolumeAssumed { .. } => {
            let next = W::LoopVolumeDisagrees { stated_l: 7.5, found_l: 5.25, apart: 4.13 };
            (&["±15 % (k = 2)"], Some(next))
        }
        W::LoopVolumeDisagrees { .. } => {
            (&["7.5 L", "5.25 L", "4.1 standard uncertainties"], Some(W::FlowAssumed { expanded: 0.02 }))
        }
        W::FlowAssumed { .. } => {
            (&["injection", "±2 % (k = 2)"], Some(W::IpGaugeAssumed { expanded_bar: 0.5 }))
        }
        W::IpGaugeAssumed { .. } => (&["±0.5 bar (k = 2)"], Some(W::MeteredAssumed { expanded: 0.03 })),
        W::MeteredAssumed { .. } => {
            (&["±3 % (k = 2)"], Some(W::SealedNitrogen { fraction: 0.712, on_loop_s: 130.0 }))
        }
        W::SealedNitrogen { .. } => (
            &["0.71", "2 min 10 s", "0.65", "dangerous"],
            Some(W::HeldButVents { from_s: 90.0, to_s: 840.0 }),
        ),
        W::HeldButVents { .. } => (
            &["from 00:01:30 to 00:14:00", "read high"],
            Some(W::HeldOrVenting { from_s: 90.0, to_s: 840.0 }),
        ),
        W::HeldOrVenting { .. } => {
            (&["from 00:01:30 to 00:14:00"], Some(W::UnmarkedJump(jump(Jump::OxygenAdd))))
        }
        W::UnmarkedJump(proposal) => match proposal.looks_like {
            Jump::OxygenAdd => (
                &["up by 0.082 bar", "[[events]] at = \"00:07:30\" what = \"oxygen add\""],
                Some(W::UnmarkedJump(jump(Jump::DiluentAdd))),
            ),
            Jump::DiluentAdd => (
                &["down by 0.043 bar", "[[events]] at = \"00:07:30\" what = \"diluent add\""],
                Some(W::StretchLeftOut(StretchLeftOut {
                    from_s: 100.0,
                    to_s: 160.0,
                    kept: LoopKept::Sealed,
                    why: StretchWhy::Short,
                })),
            ),
        },
        W::StretchLeftOut(_) => {
            (&["sealed", "from 00:01:40 to 00:02:40", "too short"], Some(W::WanderRaised(0.071)))
        }
        W::WanderRaised(_) => (&["raised to 7.1 %"], Some(W::WanderLowered(0.025))),
        W::WanderLowered(_) => {
            (&["lowered to 2.5 %"], Some(W::CylinderDisagrees { difference_l_min: -0.0213, apart: 3.4 }))
        }
        W::CylinderDisagrees { difference_l_min, .. } if *difference_l_min < 0.0 => (
            &["0.021 L/min (STPD) less", "3.4 standard"],
            Some(W::CylinderDisagrees { difference_l_min: 0.0213, apart: 3.4 }),
        ),
        W::CylinderDisagrees { .. } => (&["0.021 L/min (STPD) more"], Some(W::CylinderUsed)),
        W::CylinderUsed => (&["the drop was used"], Some(W::Rest(RestDoubt::Stimulated))),
        W::Rest(_) => (&["caffeine or nicotine"], None),
    }
}

#[test]
fn every_warning_has_a_sentence_of_its_own() {
    let said = walk(Warning::OneCellOnly, warning_case, |w| say::warning(w, &Units::default()));
    // As many as there are variants, and both ways of a jump and of a cylinder.
    assert_eq!(said, 33);
}

fn cell(name: &str, why: CellTrouble) -> CellLeftOut {
    CellLeftOut { name: name.into(), why }
}

fn why_not_case(why: &WhyNot) -> Case<WhyNot> {
    use WhyNot as N;
    match why {
        N::TooShort { .. } => (
            &["2 min 10 s", "4 min", "next time"],
            Some(N::NoUsableCell {
                left_out: vec![cell("c1", CellTrouble::Faults(0.25)), cell("c2", CellTrouble::Calibration)],
            }),
        ),
        N::NoUsableCell { .. } => (
            &["c1 has 25 %", "c2 shows"],
            Some(N::CellsDisagree { left_out: vec![cell("c3", CellTrouble::Off(0.07))] }),
        ),
        N::CellsDisagree { .. } => (
            &["c3 reads 0.070 bar above"],
            Some(N::RisingWithInjectionOff { from_s: 90.0, to_s: 600.0, slope_per_min: 0.00312 }),
        ),
        N::RisingWithInjectionOff { .. } => (
            &["from 00:01:30 to 00:10:00", "0.0031 a minute", "next time"],
            Some(N::NearlyPureOxygen { fraction: 0.957 }),
        ),
        N::NearlyPureOxygen { .. } => (&["0.96", "0.65", "next time"], Some(N::NoVolumeOneInjection)),
        N::NoVolumeOneInjection => {
            let next = N::LoopVolumeContradicts { stated_l: 14.0, found_l: 6.95, apart: 13.2 };
            (&["loop_volume = \"7.5 L ± 0.5 L\"", "another injection"], Some(next))
        }
        N::LoopVolumeContradicts { .. } => {
            (&["14.0 L", "7.0 L", "13 standard", "again"], Some(N::UnmarkedJump { at_s: 450.0 }))
        }
        N::UnmarkedJump { .. } => (&["00:07:30", "event", "exclude"], Some(N::ContentsUnknown)),
        N::ContentsUnknown => (&["make-up", "mark = true"], Some(N::NotAccounted { at_s: 700.0 })),
        N::NotAccounted { .. } => (&["00:11:40", "meter every"], Some(N::InjectionUnknown)),
        N::InjectionUnknown => (&["injection event"], Some(N::Unbounded)),
        N::Unbounded => (&["two injections further apart"], Some(N::NotPositive { came_out: -0.123_45 })),
        N::NotPositive { .. } => (&["reference conditions", "times of the events"], None),
    }
}

#[test]
fn every_reason_for_no_number_has_a_sentence_of_its_own() {
    let first = WhyNot::TooShort { usable_s: 130.0, needed_s: 240.0 };
    assert_eq!(walk(first, why_not_case, say::why_not), 13);
    assert!(!say::why_not(&WhyNot::NotPositive { came_out: -0.123_45 }).contains("0.12"));
    // Without any cell the list is no empty pair of brackets.
    assert!(say::why_not(&WhyNot::NoUsableCell { left_out: Vec::new() }).contains("none was recorded"));
}

fn stretch_case(why: &StretchWhy) -> Case<StretchWhy> {
    use StretchWhy as S;
    match why {
        S::DeadTime => (&["mixing"], Some(S::WarmUp)),
        S::WarmUp => (&["warming"], Some(S::Excluded)),
        S::Excluded => (&["marked"], Some(S::Short)),
        S::Short => (&["too short"], Some(S::UnmarkedJump(450.0))),
        S::UnmarkedJump(_) => (&["00:07:30"], Some(S::ContentsUnknown)),
        S::ContentsUnknown => (&["contents"], Some(S::InjectionUnknown)),
        S::InjectionUnknown => (&["injection"], Some(S::NearlyPureOxygen(0.931))),
        S::NearlyPureOxygen(_) => (&["0.93"], Some(S::NotAccounted(60.0))),
        S::NotAccounted(_) => (&["00:01:00"], None),
    }
}

#[test]
fn every_stretch_left_out_says_why() {
    assert_eq!(walk(StretchWhy::DeadTime, stretch_case, say::stretch_why), 9);
}

fn cell_case(trouble: &CellTrouble) -> Case<CellTrouble> {
    use CellTrouble as C;
    match trouble {
        C::Faults(_) => (&["c2", "3.4 %"], Some(C::Frozen { from_s: 30.0, to_s: 300.0 })),
        C::Frozen { .. } => (&["c2", "from 00:00:30 to 00:05:00"], Some(C::Off(-0.0812))),
        C::Off(bar) if *bar < 0.0 => (&["c2", "0.081 bar below"], Some(C::Off(0.0812))),
        C::Off(_) => (&["c2", "0.081 bar above"], Some(C::Calibration)),
        C::Calibration => (&["c2", "calibration"], None),
    }
}

#[test]
fn every_cell_left_out_is_named_with_its_reason() {
    let said = walk(CellTrouble::Faults(0.034), cell_case, |why| say::cell(&cell("c2", *why)));
    assert_eq!(said, 5);
}

fn rest_case(doubt: &RestDoubt) -> Case<RestDoubt> {
    use RestDoubt as R;
    use RestItem as I;
    let not_said = |item| Some(R::NotSaid(item));
    match doubt {
        R::NotSaid(item) => match item {
            I::Posture => (&["posture"], not_said(I::RestedFor)),
            I::RestedFor => (&["rested_for"], not_said(I::LastMeal)),
            I::LastMeal => (&["last_meal"], not_said(I::LastExercise)),
            I::LastExercise => (&["last_exercise"], not_said(I::LastDive)),
            I::LastDive => (&["last_dive"], not_said(I::CaffeineOrNicotine)),
            I::CaffeineOrNicotine => (&["caffeine_or_nicotine"], not_said(I::WaterTemperature)),
            I::WaterTemperature => (&["water_temperature"], not_said(I::Suit)),
            I::Suit => (&["suit"], Some(R::RestedTooShort(300.0))),
        },
        R::RestedTooShort(_) => (&["5 min", "20 min", "reads high"], Some(R::Fed(5_400.0))),
        R::Fed(_) => (&["1 h 30 min", "3 h", "reads high"], Some(R::Exercised(3_600.0))),
        R::Exercised(_) => (&["1 h before", "4 h", "reads high"], Some(R::Dived(10_800.0))),
        R::Dived(_) => (&["3 h before", "12 h", "reads high"], Some(R::Stimulated)),
        R::Stimulated => (&["caffeine or nicotine", "reads high"], Some(R::ColdWater(27.5))),
        R::ColdWater(_) => (&["27.5 °C", "32 °C", "reads high"], None),
    }
}

#[test]
fn every_doubt_about_rest_says_which_way_it_errs() {
    let said = walk(RestDoubt::NotSaid(RestItem::Posture), rest_case, |d| say::rest(d, &Units::default()));
    assert_eq!(said, 14);
}

fn help_case(what: &HelpWith) -> Case<HelpWith> {
    use HelpWith as H;
    match what {
        H::SecondInjection { flow_l_min, ip_bar_gauge: None, .. } if *flow_l_min <= 0.0 => (
            &["10 minutes with the injection off", "brought up first", "0.40 bar"],
            Some(H::SecondInjection { flow_l_min: 0.274, ip_bar_gauge: None, minutes: 10.0 }),
        ),
        H::SecondInjection { ip_bar_gauge: None, .. } => (
            &["10 minutes", "0.27 L/min"],
            Some(H::SecondInjection { flow_l_min: 0.274, ip_bar_gauge: Some(8.42), minutes: 10.0 }),
        ),
        H::SecondInjection { .. } => {
            (&["0.27 L/min", "IP 8.4 bar gauge"], Some(H::MeasuredVolume { expanded_l: 0.5 }))
        }
        H::MeasuredVolume { .. } => (&["±0.5 L (k = 2)"], Some(H::LongerRest { minutes: 10.0 })),
        H::LongerRest { .. } => (&["10 minutes more"], Some(H::AnotherDay)),
        H::AnotherDay => (&["another day"], Some(H::ComparedGauge { expanded_bar: 0.1 })),
        H::ComparedGauge { .. } => (&["±0.1 bar (k = 2)"], None),
    }
}

#[test]
fn every_proposal_says_what_it_would_bring() {
    let first = HelpWith::SecondInjection { flow_l_min: 0.0, ip_bar_gauge: None, minutes: 10.0 };
    let said = walk(first, help_case, |what| {
        let help = Help { what: *what, half_width_l_min: 0.013, next_day_half_width_l_min: 0.039 };
        let said = say::help(&help, (0.018, 0.041), Place::Couch, &Units::default());
        assert!(said.contains("±0.018 to ±0.013 L/min"), "{said}");
        assert!(said.contains("another day's ±0.041 to ±0.039 L/min"), "{said}");
        said
    });
    assert_eq!(said, 7);
}

#[test]
fn a_proposal_shows_as_many_figures_as_tell_it_from_now() {
    let said = |now, then| {
        let (half_width_l_min, next_day_half_width_l_min) = then;
        let help = Help { what: HelpWith::AnotherDay, half_width_l_min, next_day_half_width_l_min };
        say::help(&help, now, Place::Couch, &Units::default())
    };
    let text = said((0.0124, 0.0961), (0.0121, 0.0961));
    assert!(
        text.contains("bring ±0.0124 to ±0.0121 L/min, and leave another day's at ±0.096 L/min"),
        "{text}"
    );
    let text = said((0.0124, 0.0961), (0.0124, 0.0882));
    assert!(text.contains("another day's ±0.096 to ±0.088 L/min, and leave ±0.012 L/min"), "{text}");
}

#[test]
fn what_is_not_said_of_rest_goes_into_one_sentence() {
    let said = |items: &[RestItem]| say::rest_not_said(items, &Units::default());
    assert_eq!(said(&[]), None);
    assert_eq!(
        said(&[RestItem::Suit]),
        Some(say::rest(&RestDoubt::NotSaid(RestItem::Suit), &Units::default()))
    );
    assert!(said(&[RestItem::Posture, RestItem::LastDive]).unwrap().contains("posture, last_dive, so"));
}

#[test]
fn an_uptake_per_kilogram_is_usual_or_a_question() {
    let per = |ml_kg_min, plausible| PerKilogram { ml_kg_min, plausible };
    assert_eq!(say::per_kilogram_warning(&per(3.4, Plausible::Usual)), None);
    let unusual = say::per_kilogram_warning(&per(1.8, Plausible::Unusual)).unwrap();
    let hardly = say::per_kilogram_warning(&per(1.2, Plausible::Hardly)).unwrap();
    assert!(unusual.contains("1.8 mL/(kg·min)") && unusual.contains("wrong?"), "{unusual}");
    assert!(hardly.contains("1.2 mL/(kg·min)") && hardly.contains("No setting"), "{hardly}");
    assert!(!unusual.contains("No setting"));
}

#[test]
fn sentences_follow_the_units_that_were_asked_for() {
    let units = Units::new(Shown::parse("psi,mL/min,ft,F").unwrap());
    let said = say::warning(&Warning::DepthUnknown, &units);
    assert!(said.contains("± 3.3 ft"), "{said}");
    // 0.5 bar are 7.252 psi.
    let said = say::warning(&Warning::IpGaugeAssumed { expanded_bar: 0.5 }, &units);
    assert!(said.contains("±7.252 psi"), "{said}");
    let said = say::rest(&RestDoubt::ColdWater(25.0), &units);
    assert!(said.contains("77.0 °F") && said.contains("90 °F"), "{said}");
    let what = HelpWith::SecondInjection { flow_l_min: 0.25, ip_bar_gauge: Some(8.0), minutes: 10.0 };
    let said = say::help_with(&what, Place::Pool, &units);
    assert!(said.contains("250 mL/min") && said.contains("116.0 psi"), "{said}");
}
