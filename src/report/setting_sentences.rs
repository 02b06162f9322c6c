//! A setting's refusals, objections and warnings as sentences that say what, why and what to do; the names of what it
//! was asked with and of what its injection may be off by.
//!
//! Comes in: one of them, and the setting it belongs to, for the limits it was held to. Goes out: a sentence without
//! a full stop at its end.

use super::Units;
use super::number::{fixed, shortest};
use super::setting_words::{
    chance, data, depth, depth_shown, depth_symbol, diameter, down, first_stage, ip_given, ip_on_gauge,
    limit, share_down, share_up, temperature, up,
};
use crate::gas::Water;
use crate::setting::{
    Against, Defaulted, FirstStageKind, FittingDiameter, InjectionSource, LARGEST_SHORTFALL, Setting,
    Warning, WhyNot,
};

/// Why there is no setting.
#[must_use]
pub fn why_not(why: &WhyNot, setting: &Setting, units: &Units) -> String {
    let used = &setting.used;
    let ip = |bar: f64| ip_on_gauge(bar, used.gauge_division_bar, units);
    match why {
        WhyNot::NothingLowEnough { lowest_ip_bar_gauge, richest_l_min, chance: p, fitting } => format!(
            "even {}, the lowest IP of the range, injects too much: up to {} {} STPD{}, with a chance of {} to \
             exceed another day's uptake at rest where {} is allowed; the hole is too large. {}",
            ip(*lowest_ip_bar_gauge),
            up(units.flow(*richest_l_min), flow_decimals(units)),
            units.flow_symbol(),
            most_allowed(setting, units),
            chance(*p, used.chance),
            limit(used.chance),
            fitting_sentence(fitting.as_ref(), true, units)
        ),
        WhyNot::NothingHighEnough { highest_ip_bar_gauge, shortfall, fitting } => format!(
            "even {}, the highest IP of the range, may fall short by {} of the uptake at rest, and over {} is too \
             lean; the hole is too small. {}",
            ip(*highest_ip_bar_gauge),
            share_up(*shortfall),
            limit(LARGEST_SHORTFALL),
            fitting_sentence(fitting.as_ref(), true, units)
        ),
        WhyNot::NoDivisionInRange { range_bar_gauge: (low, high), division_bar } => format!(
            "the range from {} to {} holds no mark of a gauge with divisions of {}: widen the range, or use a finer \
             gauge and say its division",
            ip_given(*low, units),
            ip_given(*high, units),
            units.pressure_text(*division_bar)
        ),
        WhyNot::OutsideSpan { ip_bar_gauge, needs_bar_abs, span_bar_abs, fitting } => format!(
            "{} would be the IP, which puts {} bar absolute on the orifice{}, and its bench run holds only from {} to \
             {} bar absolute: measure the orifice there, or take another. {}",
            ip(*ip_bar_gauge),
            fixed(*needs_bar_abs, 2),
            at_max_depth(setting, units),
            fixed(span_bar_abs.0, 2),
            fixed(span_bar_abs.1, 2),
            fitting_sentence(fitting.as_ref(), true, units)
        ),
        WhyNot::ShortfallTooLarge { ip_bar_gauge, shortfall, fitting } => format!(
            "to keep the chance of overfeeding to {} the IP would be {}, where the injection may fall short by {} of \
             the uptake at rest, and over {} is no setting, because too lean kills as well: {}. {}",
            limit(used.chance),
            ip(*ip_bar_gauge),
            share_up(*shortfall),
            limit(LARGEST_SHORTFALL),
            MEASURE_AGAIN,
            fitting_sentence(fitting.as_ref(), true, units)
        ),
        other => why_not_without_ip(other, setting, units),
    }
}

/// What to measure again when a setting is too lean.
const MEASURE_AGAIN: &str = "measure again, first what the uncertainty comes from most (more sessions on other days, \
    the error of the IP gauge, the upward spread of the IP, the water temperature)";

/// Why there is no setting, naming no IP: for a sheet that must not be dialled from.
#[must_use]
pub fn why_not_without_ip(why: &WhyNot, setting: &Setting, units: &Units) -> String {
    match why {
        WhyNot::NoUptake => {
            "there is no resting uptake to set by: measure it first, on the couch or in a pool".into()
        }
        WhyNot::ImplausiblePerKilogram { ml_kg_min } => format!(
            "{} mL/(kg·min) is hardly anybody's uptake at rest: look whether a flow, the loop volume, the mass or the \
             reference conditions of a meter are wrong, and measure again; to set by it all the same, give the reason \
             with --despite",
            fixed(*ml_kg_min, 1)
        ),
        WhyNot::Failed => {
            "the orifice failed its acceptance: have it cleaned or replaced and measured again; to use \
            it all the same, give the reason with --despite"
                .into()
        }
        WhyNot::Undecided => {
            "the acceptance of the orifice could not be decided: repeat the bench run with a smaller \
            uncertainty; to use it all the same, give the reason with --despite"
                .into()
        }
        WhyNot::Overdue { since } => format!(
            "the calibration of the orifice fell due on {since}: calibrate it; to use it all the same, give the \
             reason with --despite"
        ),
        WhyNot::LineDoesNotRise => {
            "the flow of the orifice does not rise with the pressure, so no IP can be found on \
            its line: look at its bench run and repeat it"
                .into()
        }
        WhyNot::NothingLowEnough { fitting, .. } => format!(
            "even the lowest IP of the range injects too much; the hole is too large. {}",
            fitting_sentence(fitting.as_ref(), false, units)
        ),
        WhyNot::NothingHighEnough { shortfall, fitting, .. } => format!(
            "even the highest IP of the range may fall short by {} of the uptake at rest, and over {} is too lean; \
             the hole is too small. {}",
            share_up(*shortfall),
            limit(LARGEST_SHORTFALL),
            fitting_sentence(fitting.as_ref(), false, units)
        ),
        WhyNot::NoDivisionInRange { .. } => {
            "the range of the first stage holds no mark of the IP gauge: widen the \
            range, or use a finer gauge and say its division"
                .into()
        }
        WhyNot::OutsideSpan { fitting, .. } => format!(
            "the setting needs a pressure{} at which the orifice was not measured: measure it there, or take another. \
             {}",
            at_max_depth(setting, units),
            fitting_sentence(fitting.as_ref(), false, units)
        ),
        WhyNot::ShortfallTooLarge { shortfall, fitting, .. } => format!(
            "to keep the chance of overfeeding to {} the injection may fall short by {} of the uptake at rest, and \
             over {} is no setting, because too lean kills as well: {MEASURE_AGAIN}. {}",
            limit(setting.used.chance),
            share_up(*shortfall),
            limit(LARGEST_SHORTFALL),
            fitting_sentence(fitting.as_ref(), false, units)
        ),
    }
}

/// What speaks against an IP that was to be judged.
#[must_use]
pub fn against(against: &Against, setting: &Setting, units: &Units) -> String {
    let used = &setting.used;
    let place = at_max_depth(setting, units);
    match against {
        Against::Overfeeds { chance: p } => format!(
            "it overfeeds{place} with a chance of {}, and {} is allowed: lower it",
            chance(*p, used.chance),
            limit(used.chance)
        ),
        Against::ShortfallTooSmall { shortfall } if *shortfall < 0.0 => format!(
            "at its richest it injects{place} {} more than the uptake at rest, and {} less is asked for: lower it",
            share_up(-*shortfall),
            limit(used.shortfall)
        ),
        Against::ShortfallTooSmall { shortfall } => format!(
            "at its richest it falls short{place} by only {} of the uptake at rest, and {} is asked for: lower it",
            share_down(*shortfall),
            limit(used.shortfall)
        ),
        Against::ShortfallTooLarge { shortfall } => format!(
            "at its leanest it falls short{place} by {} of the uptake at rest, and over {} is too lean, which kills as \
             well: raise it as far as the chance of overfeeding allows, or take a larger hole",
            share_up(*shortfall),
            limit(LARGEST_SHORTFALL)
        ),
        Against::OutsideRange { range_bar_gauge: (low, high) } => format!(
            "the first stage can be set from {} to {} only",
            ip_given(*low, units),
            ip_given(*high, units)
        ),
        Against::AboveMaximum { max_ip_bar_gauge } => format!(
            "it is above the maximum of {} that the maker of the first stage states: lower it",
            ip_given(*max_ip_bar_gauge, units)
        ),
    }
}

/// What to know before trusting a setting.
#[must_use]
pub fn warning(warning: &Warning, setting: &Setting, units: &Units) -> String {
    let used = &setting.used;
    match warning {
        Warning::GaugeErrorAssumed { expanded_bar } => format!(
            "nothing is known of the error of the IP gauge: ±{} (k = 2, 2.5 % of its scale) was taken. Compare the gauge \
             with the bench transducer and give --gauge-error: it is often the largest part",
            units.pressure_text(*expanded_bar)
        ),
        Warning::IpSpreadAssumed { bar } => format!(
            "nothing is known of creep, lock-up and supply pressure: a rise of {} was taken. Read the highest IP between \
             a full and a nearly empty cylinder with gas flowing through the orifice, and give --ip-spread",
            units.pressure_text(*bar)
        ),
        Warning::IpRepeatAssumed { expanded_bar } => format!(
            "nothing is known of how well the IP comes back: ±{} (k = 2) was taken. Set it several times and give \
             --ip-repeat",
            units.pressure_text(*expanded_bar)
        ),
        Warning::WaterTemperatureUnknown => format!(
            "the water temperature is not known, so overfeeding is judged with gas at {} and leanness at {}: \
             --water-temperature narrows the setting",
            temperature(used.coldest_k, units),
            temperature(used.warmest_k, units)
        ),
        Warning::LoopVolumeUnknown => {
            "the loop volume is not known, so no drift of PO2 and no minutes are given: measure it and give --loop-volume"
                .into()
        }
        Warning::TrappedVolumeUnknown => "nothing is known of the gas trapped behind a shut cylinder valve, so the \
            contents gauge cannot be timed before a dive: enter its volume or an observed fall with the first stage"
            .into(),
        Warning::UnusualPerKilogram { ml_kg_min } => format!(
            "{} mL/(kg·min) is unusual for rest: look whether a flow, the loop volume, the mass or the reference \
             conditions of a meter are wrong",
            fixed(*ml_kg_min, 1)
        ),
        Warning::DespitePerKilogram { ml_kg_min, why } => format!(
            "SET DESPITE an uptake of {} mL/(kg·min) that is hardly anybody's at rest; the reason given: \"{}\"",
            fixed(*ml_kg_min, 1),
            data(why)
        ),
        Warning::NeverJudged => "nobody has judged this orifice: give its run an [acceptance], or accept it".into(),
        Warning::DespiteFailed { why } => format!(
            "SET DESPITE the orifice having failed its acceptance; the reason given: \"{}\"",
            data(why)
        ),
        Warning::DespiteUndecided { why } => format!(
            "SET DESPITE the orifice's acceptance being undecided; the reason given: \"{}\"",
            data(why)
        ),
        Warning::DespiteOverdue { since, why } => format!(
            "SET DESPITE the orifice's calibration having fallen due on {since}; the reason given: \"{}\"",
            data(why)
        ),
        Warning::RangeLimits { highest_ip_bar_gauge } => format!(
            "the range (of the first stage, of its stated maximum, or of the bench run) ends at {} before the richest \
             setting that is allowed: a larger hole would come nearer to the uptake",
            ip_on_gauge(*highest_ip_bar_gauge, used.gauge_division_bar, units)
        ),
        Warning::ChokeRatioBounded => "the choke ratio of the orifice is only bounded, so the depths are those of the \
            worst likely one: bench points at low IP would settle it"
            .into(),
        Warning::ChokeModelFails => "no choke ratio describes the bench run, so the depths are those of the build of \
            the orifice alone: look at the residuals of the run"
            .into(),
        Warning::NotChokedAtSurface => "at this IP the hole may not be choked even at the surface, so its flow is not \
            constant at any depth: take a smaller hole at a higher IP"
            .into(),
        Warning::DeeperThanConstant { one_percent_at_m, left } => format!(
            "the maximum depth is below {}, to where the flow is constant: at {} there may be only {} of it left. PO2 \
             sinks faster there",
            depth(*one_percent_at_m, units),
            max_depth(setting, units),
            share_down(*left)
        ),
        Warning::StopsAboveMaxDepth { stops_at_m } => format!(
            "the flow stops at {}, above the maximum depth of {}, and may run back below: do not dive there with it",
            depth(*stops_at_m, units),
            max_depth(setting, units)
        ),
        Warning::BeyondSpanAtDepth { needs_bar_abs, highest_bar_abs } => format!(
            "at {} the orifice sees {} bar absolute, and it was measured to {} bar absolute only (up to 10 % beyond is \
             still given): those rows are marked; measure the orifice higher up",
            max_depth(setting, units),
            fixed(*needs_bar_abs, 2),
            fixed(*highest_bar_abs, 2)
        ),
        Warning::LeanAtSurface { shortfall } => format!(
            "held to {}, the setting may fall short by {} of the uptake at the surface, where hypoxia is nearest: for a \
             constant flow the first stage must not follow depth",
            max_depth(setting, units),
            share_up(*shortfall)
        ),
        Warning::MeterOutOfRange => "the expected reading leaves the range of the meter: prove the setting with a meter \
            whose range holds it"
            .into(),
        Warning::MeterWithoutGasFactor => "the meter was made for another gas and its papers give no factor for oxygen, \
            so no reading is foretold: ask its maker for the factor, or name another meter"
            .into(),
    }
}

/// The option of `setting` that was not given.
#[must_use]
pub const fn option_name(which: Defaulted) -> &'static str {
    match which {
        Defaulted::IpRange => "ip-range",
        Defaulted::GaugeDivision => "gauge-division",
        Defaulted::GaugeScale => "gauge-scale",
        Defaulted::GaugeError => "gauge-error",
        Defaulted::IpSpread => "ip-spread",
        Defaulted::IpRepeat => "ip-repeat",
        Defaulted::Chance => "chance",
        Defaulted::Shortfall => "shortfall",
        Defaulted::Water => "water",
        Defaulted::WaterTemperature => "water-temperature",
        Defaulted::SetAt => "set-at",
        Defaulted::DiveAt => "dive-at",
        Defaulted::Diluent => "diluent",
        Defaulted::Po2High => "po2-high",
        Defaulted::Po2Low => "po2-low",
        Defaulted::Work => "work",
        Defaulted::Oxygen => "oxygen",
        Defaulted::Contents => "contents",
    }
}

/// What an injection may be off by.
#[must_use]
pub const fn source_name(source: InjectionSource) -> &'static str {
    match source {
        InjectionSource::LineRandom => "scatter of the line's points",
        InjectionSource::LineCommon => "instruments of the bench run",
        InjectionSource::Gauge => "the diver's IP gauge",
        InjectionSource::Repeatability => "repeatability of the IP",
        InjectionSource::Barometer => "ambient pressure",
        InjectionSource::Purity => "purity of the oxygen",
        InjectionSource::GasTemperature => "gas temperature",
    }
}

/// The word for a kind of first stage in options and JSON.
#[must_use]
pub const fn first_stage_name(kind: FirstStageKind) -> &'static str {
    match kind {
        FirstStageKind::Uncompensated => "uncompensated",
        FirstStageKind::Compensated => "compensated",
    }
}

/// The word for a water in options and JSON.
#[must_use]
pub const fn water_name(water: Water) -> &'static str {
    match water {
        Water::Sea => "sea",
        Water::Fresh => "fresh",
    }
}

/// Which hole would fit, and with `ip` what it would be set to.
fn fitting_sentence(fitting: Option<&FittingDiameter>, ip: bool, units: &Units) -> String {
    fitting.map_or_else(
        || {
            "No other hole would do either: uptake and IP are not known well enough to set between too rich and too lean"
                .to_owned()
        },
        |fitting| {
            // Where none fits at the bottom, the largest is the one that is named already.
            let bottom = if fitting.largest_um > fitting.um {
                format!("{} at its bottom", diameter(fitting.largest_um, units))
            } else {
                "none at its bottom".to_owned()
            };
            let set = if ip { format!(", set to {}", ip_on_gauge(fitting.ip_bar_gauge, 0.1, units)) } else { String::new() };
            format!(
                "An effective diameter of {} would fit{set} ({} at the top of the range, {bottom})",
                diameter(fitting.um, units),
                diameter(fitting.smallest_um, units),
            )
        },
    )
}

/// The most that may be injected, where the uptake is known.
fn most_allowed(setting: &Setting, units: &Units) -> String {
    setting.uptake.as_ref().map_or_else(String::new, |uptake| {
        let most = (1.0 - setting.used.shortfall) * uptake.uptake_l_min;
        format!(
            " ({} {} at most would leave the least shortfall of {})",
            down(units.flow(most), flow_decimals(units)),
            units.flow_symbol(),
            limit(setting.used.shortfall)
        )
    })
}

/// Decimals of a flow that is read by people: a tenth of a millilitre a minute.
fn flow_decimals(units: &Units) -> i32 {
    let tenth_ml = units.flow(1e-4);
    (0..9).find(|decimals| libm::pow(10.0, -f64::from(*decimals)) <= tenth_ml * 1.5).unwrap_or(9)
}

/// " at 30 m" where the chance is held at depth.
fn at_max_depth(setting: &Setting, units: &Units) -> String {
    match setting.used.first_stage {
        FirstStageKind::Uncompensated => String::new(),
        kind @ FirstStageKind::Compensated => {
            format!(" at {} ({} first stage)", max_depth(setting, units), first_stage(kind))
        }
    }
}

/// The maximum depth as it was given.
pub(super) fn max_depth(setting: &Setting, units: &Units) -> String {
    setting.used.max_depth_m.map_or_else(
        || "the maximum depth".to_owned(),
        |m| format!("{} {}", shortest(depth_shown(m, units), 4), depth_symbol(units)),
    )
}
