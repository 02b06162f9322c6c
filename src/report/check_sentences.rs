//! The checks of a bench run: their names, and one sentence for the technician.

use super::Units;
use super::layout::numbers;
use super::number::{figures, fixed, limit_percent, percent};
use crate::bench::checks::{CannotTell, Check, CheckKind, CheckVerdict, CrossingCause, Finding};
use crate::bench::instruments::{Instrument, InstrumentFinding, When};

/// Name of a check, its limit key in an acceptance, and the unit of its value and limit in JSON.
#[must_use]
pub const fn name_key_unit(kind: CheckKind) -> (&'static str, Option<&'static str>, Option<&'static str>) {
    const SHARE: Option<&str> = Some("share of the flow at the nominal IP");
    match kind {
        CheckKind::Choked => ("choked", None, Some("share of the point's flow")),
        CheckKind::Straight => ("straight", Some("straight"), SHARE),
        CheckKind::Hysteresis => ("rising = falling", Some("hysteresis"), SHARE),
        CheckKind::Repeatable => ("repeatable", Some("repeat"), SHARE),
        CheckKind::Steady => ("steady", Some("steady"), SHARE),
        CheckKind::ThroughZero => ("through zero", Some("crossing"), Some("kPa absolute")),
        CheckKind::Outlier => ("outlier", Some("significance"), Some("studentised residual")),
        CheckKind::SameAsBefore => ("same as last time", Some("en"), Some("E_n")),
        CheckKind::Instruments => ("instruments", Some("leak"), None),
    }
}

/// What a check says, in one sentence or two.
#[must_use]
pub fn sentence(check: &Check, units: &Units) -> String {
    if let Finding::CannotTell(why) = &check.finding {
        return cannot_tell(check.kind, *why).to_owned();
    }
    match check.kind {
        CheckKind::Choked => choked(check),
        CheckKind::Straight => trend(
            check,
            "the line is straight",
            "the line bends",
            "at mid-span: look for a leak, a pressure the regulator cannot hold, or a hole that is not choked",
        ),
        CheckKind::Hysteresis => trend(
            check,
            "rising and falling sweep agree",
            "rising and falling sweep differ",
            ": wait longer at each point, and look for dirt that moves",
        ),
        CheckKind::Steady => trend(
            check,
            "the flow did not drift over the run",
            "the flow drifted",
            "over the run: let the meter warm up, and look for a clogging hole",
        ),
        CheckKind::Repeatable => repeatable(check),
        CheckKind::ThroughZero => through_zero(check, units),
        CheckKind::Outlier => outlier(check),
        CheckKind::SameAsBefore => same_as_before(check),
        CheckKind::Instruments => instruments(check, units),
    }
}

fn choked(check: &Check) -> String {
    match &check.finding {
        Finding::NotChoked(points) => format!(
            "{} {} not choked enough for the line; shown, left out of it, and used for the choke ratio",
            points_word(points),
            if points.len() == 1 { "is" } else { "are" }
        ),
        _ => "every point of the line is choked within half its own scatter".into(),
    }
}

fn trend(check: &Check, holds: &str, fails: &str, advice: &str) -> String {
    let (value, limit) = (check.value.unwrap_or(f64::NAN), check.limit.unwrap_or(f64::NAN));
    let size = percent(value.abs());
    match check.verdict {
        CheckVerdict::Pass => format!("{holds} within {} ({size})", limit_percent(limit)),
        CheckVerdict::Fail => {
            let space = if advice.starts_with(':') { "" } else { " " };
            format!(
                "{fails} by {size} of the flow, more than {}{space}{advice}{}",
                limit_percent(limit),
                lack_of_fit(check)
            )
        }
        CheckVerdict::Note => format!(
            "{size} of the flow would be more than {}, but chance explains it (p = {}): more points would tell",
            limit_percent(limit),
            figures(check.p_value.unwrap_or(f64::NAN), 2)
        ),
    }
}

fn lack_of_fit(check: &Check) -> String {
    match check.finding {
        Finding::Bent { lack_of_fit_p: Some(p) } => {
            format!(" (lack of fit against repeated points: p = {})", figures(p, 2))
        }
        _ => String::new(),
    }
}

fn repeatable(check: &Check) -> String {
    let (value, limit) = (check.value.unwrap_or(f64::NAN), check.limit.unwrap_or(f64::NAN));
    if check.verdict == CheckVerdict::Pass {
        format!(
            "repeated points scatter by {} of the flow (standard deviation), within {}",
            percent(value),
            limit_percent(limit)
        )
    } else {
        format!(
            "repeated points scatter by {} of the flow (standard deviation), more than {}: wait longer at each point, \
             and look for a loose fitting",
            percent(value),
            limit_percent(limit)
        )
    }
}

fn through_zero(check: &Check, units: &Units) -> String {
    let Finding::Crossing { interval_bar, cause } = check.finding else { return String::new() };
    if !check.value.is_some_and(f64::is_finite) {
        return "the flow does not rise with the pressure, so the line crosses its axis nowhere: look whether the \
                pressure reached the orifice, and whether flow and pressure were mixed up"
            .to_owned();
    }
    // Kilopascals, as in the limits, unless another unit was asked for.
    let (factor, symbol) = if units.pressure_symbol() == "bar" {
        (100.0, "kPa")
    } else {
        (units.pressure(1.0), units.pressure_symbol())
    };
    let at = fixed(check.value.unwrap_or(f64::NAN) / 100.0 * factor, 1);
    let interval = if interval_bar.0.is_finite() {
        format!("{} to {}", fixed(interval_bar.0 * factor, 1), fixed(interval_bar.1 * factor, 1))
    } else {
        "no limits".into()
    };
    let place = format!("the line crosses the pressure axis at {at} {symbol} absolute (95 %: {interval})");
    let suggestion = match cause {
        None => return format!("{place}, where it should"),
        Some(CrossingCause::AbsoluteEnteredAsGauge) => {
            "one atmosphere too high: absolute pressure was entered as gauge, write absolute = true"
        }
        Some(CrossingCause::GaugeEnteredAsAbsolute) => {
            "one atmosphere too low: gauge pressure was entered as absolute, take absolute = true away"
        }
        Some(CrossingCause::DoesNotRise) => "",
        Some(CrossingCause::High) => {
            "too high: the transducer's zero reads high, gas leaks between transducer and meter, or the hole clogs as \
             the run goes on"
        }
        Some(CrossingCause::Low) => {
            "too low: the transducer's zero reads low, the meter's zero reads high, or gas passes beside the hole"
        }
    };
    if cause == Some(CrossingCause::DoesNotRise) {
        return "the flow does not rise with the pressure, so the line crosses nowhere: look whether the flow meter is \
                stuck, or gas passes beside the hole"
            .into();
    }
    let doubt = if check.verdict == CheckVerdict::Note { "perhaps " } else { "" };
    format!("{place}, {doubt}{suggestion}")
}

fn outlier(check: &Check) -> String {
    let largest = fixed(check.value.unwrap_or(f64::NAN), 1);
    let limit = fixed(check.limit.unwrap_or(f64::NAN), 1);
    match &check.finding {
        Finding::Apart(points) => format!(
            "{} {} apart from the rest ({largest}, limit {limit}); still used: repeat {}, or leave {} out with a reason",
            points_word(points),
            if points.len() == 1 { "lies" } else { "lie" },
            it(points),
            it(points),
        ),
        _ => format!("no point lies apart (largest studentised residual {largest}, limit {limit})"),
    }
}

fn same_as_before(check: &Check) -> String {
    let Finding::Change { change, before } = &check.finding else { return String::new() };
    let en = fixed(check.value.unwrap_or(f64::NAN), 2);
    let size = percent(change.abs());
    let direction = if *change < 0.0 { "less" } else { "more" };
    let suggestion = match (check.verdict, *change < 0.0) {
        (CheckVerdict::Fail, true) => ": a blockage, look at filter and hole",
        (CheckVerdict::Fail, false) => ": wear, or a hole that was cleaned since",
        (CheckVerdict::Note, _) => ": as-left, so the work in between changed it",
        _ => "",
    };
    format!("{size} {direction} than in {before} (E_n = {en}){suggestion}")
}

fn instruments(check: &Check, units: &Units) -> String {
    let Finding::Instruments(findings) = &check.finding else {
        return "calibrations in date, readings in range, zero and leak as they should be".into();
    };
    findings.iter().map(|f| instrument(f, units)).collect::<Vec<_>>().join("; ")
}

fn instrument(finding: &InstrumentFinding, units: &Units) -> String {
    let name = |which: &Instrument| match which {
        Instrument::Meter => "flow meter",
        Instrument::Transducer => "transducer",
    };
    let when = |when: &When| match when {
        When::Before => "before the run",
        When::After => "after the run",
    };
    match finding {
        InstrumentFinding::Overdue(which, due) => {
            format!("the calibration of the {} ran out on {due}: have it calibrated", name(which))
        }
        InstrumentFinding::NoDueDate(which) => format!("the {} has no due date", name(which)),
        InstrumentFinding::NoRange(which) => format!("the {} has no range", name(which)),
        InstrumentFinding::OutsideRange(which, points) => {
            format!("{} outside the range of the {}", points_word(points), name(which))
        }
        InstrumentFinding::LowInRange(which, points) => {
            format!("{} under a tenth of the {}'s full scale", points_word(points), name(which))
        }
        InstrumentFinding::ZeroOff(at, zero, allowed) => format!(
            "the meter showed {} at no flow {}, more than its papers allow ({}): set its zero and repeat",
            units.flow_text(*zero),
            when(at),
            units.flow_text(*allowed)
        ),
        InstrumentFinding::Leaks(at, pa_s) => format!(
            "the pressure fell by {} a minute with the outlet blanked {}: find the leak and repeat",
            units.pressure_text(pa_s * 60.0 / 1e5),
            when(at)
        ),
        InstrumentFinding::ZeroAndLeakNotRecorded => "no zero or leak check was recorded".into(),
    }
}

const fn cannot_tell(kind: CheckKind, why: CannotTell) -> &'static str {
    match (kind, why) {
        (_, CannotTell::TooFewPoints) => "too few points to tell",
        (_, CannotTell::OneSweep) => "only one sweep: step the pressure down again as well",
        (_, CannotTell::NoRepetition) => "no pressure was read twice: repeat some points",
        (_, CannotTell::TimeRunsWithPressure) => {
            "time and pressure ran together, so drift and slope cannot be told apart: step down again as well"
        }
        (_, CannotTell::NoRunBefore) => "no earlier accepted run of this orifice is known",
    }
}

fn points_word(points: &[usize]) -> String {
    format!("{} {}", if points.len() == 1 { "point" } else { "points" }, numbers(points))
}

const fn it(points: &[usize]) -> &'static str {
    if points.len() == 1 { "it" } else { "them" }
}
