//! Every refusal, objection, warning, option and source has its sentence or name, and none is another's.

use std::collections::BTreeSet;

use chrono::NaiveDate;
use ebbline::report::{Units, setting_sentences};
use ebbline::setting::{Against, Defaulted, FittingDiameter, InjectionSource, Warning, WhyNot};

use super::desk::{compensated, holds, recommended, shown};

/// Each of `all` has its own place in the match that numbers them, so that a new variant breaks the build, and none is
/// forgotten.
#[track_caller]
fn all_there<T>(all: &[T], place: impl Fn(&T) -> usize, count: usize) {
    let places: BTreeSet<usize> = all.iter().map(place).collect();
    assert_eq!(places, (0..count).collect());
}

#[track_caller]
fn all_different(says: &[String]) {
    let different: BTreeSet<&String> = says.iter().collect();
    assert_eq!(different.len(), says.len());
    for say in says {
        assert!(say.len() > 3 && !say.contains("NaN") && !say.contains("no number"), "{say}");
    }
}

fn fitting() -> Option<FittingDiameter> {
    Some(FittingDiameter { ip_bar_gauge: 9.0, um: 57.2, smallest_um: 53.1, largest_um: 63.4 })
}

#[test]
fn every_refusal_says_what_why_and_what_to_do() {
    let since = NaiveDate::from_ymd_opt(2026, 3, 1).unwrap();
    // 0.95 of 0.33 is 0.3135.
    let all: Vec<(WhyNot, &[&str])> = vec![
        (WhyNot::NoUptake, &["measure it first"]),
        (WhyNot::ImplausiblePerKilogram { ml_kg_min: 6.43 }, &["6.4 mL/(kg·min)", "--despite"]),
        (WhyNot::Failed, &["failed", "cleaned", "--despite"]),
        (WhyNot::Undecided, &["could not be decided", "--despite"]),
        (WhyNot::Overdue { since }, &["2026-03-01", "--despite"]),
        (WhyNot::LineDoesNotRise, &["does not rise"]),
        (
            WhyNot::NothingLowEnough {
                lowest_ip_bar_gauge: 8.0,
                richest_l_min: 0.412_31,
                chance: 0.9,
                fitting: fitting(),
            },
            &[
                "8.0 bar (116 psi)",
                "0.4124 L/min STPD",
                "0.3135 L/min",
                "90 %",
                "2.5 %",
                "57.2 µm",
                "53.1 µm",
                "63.4 µm",
            ],
        ),
        (
            WhyNot::NothingHighEnough { highest_ip_bar_gauge: 11.0, shortfall: 0.2741, fitting: fitting() },
            &["11.0 bar (159 psi)", "27.5 %", "25 %", "57.2 µm"],
        ),
        (
            WhyNot::NoDivisionInRange { range_bar_gauge: (9.71, 9.79), division_bar: 0.1 },
            &["9.71 bar", "9.79 bar", "0.1 bar", "finer gauge"],
        ),
        (
            WhyNot::OutsideSpan {
                ip_bar_gauge: 9.8,
                needs_bar_abs: 10.813,
                span_bar_abs: (4.0, 9.5),
                fitting: fitting(),
            },
            &["9.8 bar (142 psi)", "10.81 bar absolute", "4.00 to 9.50 bar absolute", "57.2 µm"],
        ),
        (
            WhyNot::ShortfallTooLarge { ip_bar_gauge: 7.5, shortfall: 0.2512, fitting: None },
            &["7.5 bar (108 psi)", "25.2 %", "too lean", "measure again", "No other hole"],
        ),
    ];
    let place = |why: &WhyNot| match why {
        WhyNot::NoUptake => 0,
        WhyNot::ImplausiblePerKilogram { .. } => 1,
        WhyNot::Failed => 2,
        WhyNot::Undecided => 3,
        WhyNot::Overdue { .. } => 4,
        WhyNot::LineDoesNotRise => 5,
        WhyNot::NothingLowEnough { .. } => 6,
        WhyNot::NothingHighEnough { .. } => 7,
        WhyNot::NoDivisionInRange { .. } => 8,
        WhyNot::OutsideSpan { .. } => 9,
        WhyNot::ShortfallTooLarge { .. } => 10,
    };
    all_there(&all, |(why, _)| place(why), 11);
    let set = recommended().setting;
    let says = |units: &Units| -> Vec<String> {
        all.iter().map(|(why, _)| setting_sentences::why_not(why, &set, units)).collect()
    };
    let sentences = says(&Units::default());
    all_different(&sentences);
    for ((_, needles), sentence) in all.iter().zip(&sentences) {
        holds(sentence, needles);
    }
    // For the page to keep: the same reasons, and no pressure one could dial.
    let kept: Vec<String> = all
        .iter()
        .map(|(why, _)| setting_sentences::why_not_without_ip(why, &set, &Units::default()))
        .collect();
    all_different(&kept);
    assert!(kept.iter().all(|say| !say.contains(" bar") && !say.contains("psi")), "{kept:#?}");
    // 57.2 µm over 25.4 µm: 2.252 thousandths of an inch.
    holds(&says(&shown("in"))[6], &["57.2 µm (2.25 thousandths of an inch)"]);
    holds(&says(&shown("psi"))[6], &["116 psi (8.0 bar)"]);
    // At the maximum depth of a compensated first stage it is the pressure there that is not held.
    holds(&setting_sentences::why_not(&all[9].0, &compensated().setting, &Units::default()), &["at 20 m"]);
}

#[test]
fn every_objection_to_a_judged_ip_has_its_sentence() {
    let all: Vec<(Against, &[&str])> = vec![
        (Against::Overfeeds { chance: 0.0251 }, &["2.6 %", "2.5 % is allowed", "lower it"]),
        (Against::ShortfallTooSmall { shortfall: 0.0496 }, &["4.9 %", "5 % is asked", "lower it"]),
        (Against::ShortfallTooLarge { shortfall: 0.2501 }, &["25.1 %", "over 25 %", "raise it"]),
        (
            Against::OutsideRange { range_bar_gauge: (7.0, 11.0) },
            &["7 bar (101.5 psi)", "11 bar (159.5 psi)"],
        ),
        (Against::AboveMaximum { max_ip_bar_gauge: 10.5 }, &["10.5 bar (152.3 psi)", "maker"]),
    ];
    let place = |against: &Against| match against {
        Against::Overfeeds { .. } => 0,
        Against::ShortfallTooSmall { .. } => 1,
        Against::ShortfallTooLarge { .. } => 2,
        Against::OutsideRange { .. } => 3,
        Against::AboveMaximum { .. } => 4,
    };
    all_there(&all, |(against, _)| place(against), 5);
    let set = recommended().setting;
    let say = |against: &Against| setting_sentences::against(against, &set, &Units::default());
    let says: Vec<String> = all.iter().map(|(against, _)| say(against)).collect();
    all_different(&says);
    for ((_, needles), sentence) in all.iter().zip(&says) {
        holds(sentence, needles);
    }
    holds(&say(&Against::ShortfallTooSmall { shortfall: -0.031 }), &["3.1 % more than the uptake"]);
}

#[test]
fn every_warning_has_its_sentence() {
    let since = NaiveDate::from_ymd_opt(2026, 3, 1).unwrap();
    let why = || "spare is away".to_owned();
    let all: Vec<(Warning, &[&str])> = vec![
        (Warning::GaugeErrorAssumed { expanded_bar: 0.5 }, &["±0.5 bar (k = 2", "2.5 %", "transducer"]),
        (Warning::IpSpreadAssumed { bar: 0.3 }, &["0.3 bar", "nearly empty cylinder"]),
        (Warning::IpRepeatAssumed { expanded_bar: 0.1 }, &["±0.1 bar (k = 2)"]),
        (Warning::WaterTemperatureUnknown, &["12 °C", "--water-temperature"]),
        (Warning::LoopVolumeUnknown, &["no minutes", "--loop-volume"]),
        (Warning::TrappedVolumeUnknown, &["contents gauge"]),
        (Warning::UnusualPerKilogram { ml_kg_min: 4.8 }, &["4.8 mL/(kg·min)", "reference conditions"]),
        (
            Warning::DespitePerKilogram { ml_kg_min: 6.4, why: why() },
            &["6.4 mL/(kg·min)", "\"spare is away\""],
        ),
        (Warning::NeverJudged, &["nobody has judged"]),
        (Warning::DespiteFailed { why: why() }, &["failed", "\"spare is away\""]),
        (Warning::DespiteUndecided { why: why() }, &["undecided", "\"spare is away\""]),
        (Warning::DespiteOverdue { since, why: why() }, &["2026-03-01", "\"spare is away\""]),
        (Warning::RangeLimits { highest_ip_bar_gauge: 9.0 }, &["9.0 bar (130 psi)", "larger hole"]),
        (Warning::ChokeRatioBounded, &["only bounded", "low IP"]),
        (Warning::ChokeModelFails, &["no choke ratio", "build"]),
        (Warning::NotChokedAtSurface, &["at the surface"]),
        (Warning::DeeperThanConstant { one_percent_at_m: 43.9, left: 0.8765 }, &["43 m", "20 m", "87.6 %"]),
        (Warning::StopsAboveMaxDepth { stops_at_m: 18.7 }, &["18 m", "20 m", "run back"]),
        (
            Warning::BeyondSpanAtDepth { needs_bar_abs: 10.81, highest_bar_abs: 9.83 },
            &["10.81 bar absolute", "9.83 bar absolute", "20 m", "10 %"],
        ),
        (Warning::LeanAtSurface { shortfall: 0.3175 }, &["31.8 %", "surface", "20 m"]),
        (Warning::MeterOutOfRange, &["range of the meter"]),
        (Warning::MeterWithoutGasFactor, &["another gas", "factor"]),
    ];
    let place = |warning: &Warning| match warning {
        Warning::GaugeErrorAssumed { .. } => 0,
        Warning::IpSpreadAssumed { .. } => 1,
        Warning::IpRepeatAssumed { .. } => 2,
        Warning::WaterTemperatureUnknown => 3,
        Warning::LoopVolumeUnknown => 4,
        Warning::TrappedVolumeUnknown => 5,
        Warning::UnusualPerKilogram { .. } => 6,
        Warning::DespitePerKilogram { .. } => 7,
        Warning::NeverJudged => 8,
        Warning::DespiteFailed { .. } => 9,
        Warning::DespiteUndecided { .. } => 10,
        Warning::DespiteOverdue { .. } => 11,
        Warning::RangeLimits { .. } => 12,
        Warning::ChokeRatioBounded => 13,
        Warning::ChokeModelFails => 14,
        Warning::NotChokedAtSurface => 15,
        Warning::DeeperThanConstant { .. } => 16,
        Warning::StopsAboveMaxDepth { .. } => 17,
        Warning::BeyondSpanAtDepth { .. } => 18,
        Warning::LeanAtSurface { .. } => 19,
        Warning::MeterOutOfRange => 20,
        Warning::MeterWithoutGasFactor => 21,
    };
    all_there(&all, |(warning, _)| place(warning), 22);
    let set = compensated().setting;
    let says: Vec<String> =
        all.iter().map(|(warning, _)| setting_sentences::warning(warning, &set, &Units::default())).collect();
    all_different(&says);
    for ((_, needles), sentence) in all.iter().zip(&says) {
        holds(sentence, needles);
    }
}

/// Every option with a default.
pub(crate) const DEFAULTED: [Defaulted; 18] = [
    Defaulted::IpRange,
    Defaulted::GaugeDivision,
    Defaulted::GaugeScale,
    Defaulted::GaugeError,
    Defaulted::IpSpread,
    Defaulted::IpRepeat,
    Defaulted::Chance,
    Defaulted::Shortfall,
    Defaulted::Water,
    Defaulted::WaterTemperature,
    Defaulted::SetAt,
    Defaulted::DiveAt,
    Defaulted::Diluent,
    Defaulted::Po2High,
    Defaulted::Po2Low,
    Defaulted::Work,
    Defaulted::Oxygen,
    Defaulted::Contents,
];

#[test]
fn every_option_and_every_source_has_its_name() {
    let place = |which: &Defaulted| match which {
        Defaulted::IpRange => 0,
        Defaulted::GaugeDivision => 1,
        Defaulted::GaugeScale => 2,
        Defaulted::GaugeError => 3,
        Defaulted::IpSpread => 4,
        Defaulted::IpRepeat => 5,
        Defaulted::Chance => 6,
        Defaulted::Shortfall => 7,
        Defaulted::Water => 8,
        Defaulted::WaterTemperature => 9,
        Defaulted::SetAt => 10,
        Defaulted::DiveAt => 11,
        Defaulted::Diluent => 12,
        Defaulted::Po2High => 13,
        Defaulted::Po2Low => 14,
        Defaulted::Work => 15,
        Defaulted::Oxygen => 16,
        Defaulted::Contents => 17,
    };
    all_there(&DEFAULTED, place, 18);
    let names: Vec<String> =
        DEFAULTED.iter().map(|d| setting_sentences::option_name(*d).to_owned()).collect();
    all_different(&names);
    let sources = [
        InjectionSource::LineRandom,
        InjectionSource::LineCommon,
        InjectionSource::Gauge,
        InjectionSource::Repeatability,
        InjectionSource::Barometer,
        InjectionSource::Purity,
        InjectionSource::GasTemperature,
    ];
    let place = |source: &InjectionSource| match source {
        InjectionSource::LineRandom => 0,
        InjectionSource::LineCommon => 1,
        InjectionSource::Gauge => 2,
        InjectionSource::Repeatability => 3,
        InjectionSource::Barometer => 4,
        InjectionSource::Purity => 5,
        InjectionSource::GasTemperature => 6,
    };
    all_there(&sources, place, 7);
    let names: Vec<String> = sources.iter().map(|s| setting_sentences::source_name(*s).to_owned()).collect();
    all_different(&names);
    let text = recommended().text();
    holds(&text, &names.iter().map(String::as_str).collect::<Vec<_>>());
}
