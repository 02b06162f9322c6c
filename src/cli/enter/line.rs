//! One typed line: a point, or a command.
//!
//! Comes in: the text of a line and the units of numbers without one. Goes out: what was meant, or one sentence. Words
//! are separated by white space, semicolons, or commas that belong to no number; a number begins a new quantity, and
//! what follows it is its unit. Left out: decimal commas, which are refused with the number as it should stand.

use crate::entry::{Indication, PointReading, Sweep, TimedVolume};
use crate::quantity::text::{remarks, value};
use crate::quantity::unit::{Kind, lookup};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Quantity, QuantityError, Span, Volume,
};
use crate::report::enter_words::TypedUnits;

/// What was typed.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Typed {
    /// Nothing, or a remark behind `#`.
    Nothing,
    /// A point.
    Point(PointTyped),
    /// A point that was typed wrong, as it should be.
    Correct(usize, PointTyped),
    /// A point that does not count, and why.
    Strike(usize, String),
    /// The points so far.
    List,
    /// The whole sheet so far.
    Sheet,
    /// A reading of the meter at no flow; empty to be asked for it.
    Zero(String),
    /// A fall of pressure; empty to be asked for it.
    Leak(String),
    /// The barometer alone.
    Barometer(String),
    /// The gas temperature alone.
    Temperature(String),
    /// Both, to be asked for.
    Conditions,
    /// All points are in; `anyway` also without a line.
    Done { anyway: bool },
    /// Leave the run open.
    Quit,
    /// What can be typed.
    Help,
}

/// A point as typed.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct PointTyped {
    pub(super) pressure: Indication,
    /// None when the pressure stands alone.
    pub(super) flow: Option<FlowTyped>,
    pub(super) sweep: Option<Sweep>,
    /// Whether every number had its unit.
    pub(super) with_units: bool,
    /// What has to be said of the units.
    pub(super) remarks: Vec<&'static str>,
}

/// A flow as typed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct FlowTyped {
    pub(super) flow: IndicatedFlow,
    pub(super) timed: Option<TimedVolume>,
    pub(super) with_units: bool,
}

/// Why a line is not taken.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub(super) enum LineError {
    #[error("{0}")]
    Quantity(QuantityError),
    #[error(
        "\"{unit}\" says gauge or absolute, which is said once for the run: write {plain}; here it is read as {zero}"
    )]
    Zero { unit: String, plain: &'static str, zero: &'static str },
    #[error("\"{0}\" is neither a point, as in {1}, nor a command{2}: help lists what can be typed")]
    Unknown(String, &'static str, String),
    #[error("a point has {0}, and this line has {1} numbers")]
    TooMany(&'static str, usize),
    #[error("a volume stands here without its time: write both, as in 0.500 L 62.1 s")]
    NoTime,
    #[error("the time a volume took is above zero")]
    NoSpan,
    #[error("{0} wants the number of a point first, as in {1}")]
    NoNumber(&'static str, &'static str),
    #[error("strike wants the reason too, as in strike 3 hose was touched; it stays in the record")]
    NoReason,
    #[error("correct wants the whole point, as in correct 3 {0}")]
    NoPoint(&'static str),
    #[error("nothing stands behind {0}")]
    Behind(&'static str),
}

const COMMANDS: [&str; 13] = [
    "correct",
    "strike",
    "list",
    "sheet",
    "zero",
    "leak",
    "barometer",
    "temperature",
    "conditions",
    "done",
    "quit",
    "exit",
    "help",
];

/// Reads a line where a point or a command is expected.
pub(super) fn read(line: &str, units: &TypedUnits) -> Result<Typed, LineError> {
    let line = line.trim();
    if line.is_empty() || line.starts_with('#') {
        return Ok(Typed::Nothing);
    }
    let (first, rest) = line.split_once(char::is_whitespace).unwrap_or((line, ""));
    let rest = rest.trim();
    let alone = |name: &'static str, typed: Typed| {
        if rest.is_empty() { Ok(typed) } else { Err(LineError::Behind(name)) }
    };
    match first.to_lowercase().as_str() {
        "?" | "help" => Ok(Typed::Help),
        "list" => alone("list", Typed::List),
        "sheet" => alone("sheet", Typed::Sheet),
        "conditions" => alone("conditions", Typed::Conditions),
        "quit" | "exit" => alone("quit", Typed::Quit),
        "done" if rest.eq_ignore_ascii_case("anyway") => Ok(Typed::Done { anyway: true }),
        "done" => alone("done", Typed::Done { anyway: false }),
        "zero" => Ok(Typed::Zero(rest.to_owned())),
        "leak" => Ok(Typed::Leak(rest.to_owned())),
        "barometer" => Ok(Typed::Barometer(rest.to_owned())),
        "temperature" => Ok(Typed::Temperature(rest.to_owned())),
        "strike" => {
            let (point, why) = numbered("strike", "strike 3 hose was touched", rest)?;
            if why.is_empty() { Err(LineError::NoReason) } else { Ok(Typed::Strike(point, why.to_owned())) }
        }
        "correct" => {
            let (point, again) = numbered("correct", "correct 3 10.02 0.4831", rest)?;
            let typed = point_of(again, units)?.filter(|typed| typed.flow.is_some());
            typed.map(|typed| Typed::Correct(point, typed)).ok_or(LineError::NoPoint(example(units)))
        }
        _ => match point_of(line, units)? {
            Some(point) => Ok(Typed::Point(point)),
            None => Err(unknown(line, first, units)),
        },
    }
}

/// Reads the flow of a point whose pressure was typed before; none for an empty line.
pub(super) fn read_flow(
    line: &str,
    units: &TypedUnits,
) -> Result<Option<(FlowTyped, Option<Sweep>)>, LineError> {
    let (groups, sweep) = groups(line);
    match groups.as_slice() {
        [] if line.trim().is_empty() => Ok(None),
        [] => Err(unknown(line, line, units)),
        _ => Ok(Some((flow_of(&groups, 0, units)?, sweep))),
    }
}

/// A point as the run keeps it.
pub(super) fn reading(pressure: Indication, flow: FlowTyped, sweep: Option<Sweep>) -> PointReading {
    PointReading {
        pressure,
        flow: flow.flow,
        timed: flow.timed,
        pressure_scatter: None,
        flow_scatter: None,
        averaged: 1.0,
        temperature: None,
        barometer: None,
        meter_temperature: None,
        meter_pressure: None,
        sweep,
        time_s: None,
    }
}

/// How a point is typed.
pub(super) const fn example(units: &TypedUnits) -> &'static str {
    if units.timed { "10.02 0.500 62.1" } else { "10.02 0.4831" }
}

/// The point of a line; none when it does not begin with a number.
fn point_of(line: &str, units: &TypedUnits) -> Result<Option<PointTyped>, LineError> {
    let (groups, sweep) = groups(line);
    let Some(first) = groups.first().filter(|group| begins_number(group)) else { return Ok(None) };
    let symbol = units.pressure.symbol;
    let pressure = if units.absolute {
        Indication::Absolute(quantity::<AbsolutePressure>(first, symbol, units)?)
    } else {
        Indication::Gauge(quantity::<GaugePressure>(first, symbol, units)?)
    };
    let flow = if groups.len() == 1 { None } else { Some(flow_of(&groups, 1, units)?) };
    let with_units = has_unit(first) && flow.is_none_or(|flow| flow.with_units);
    Ok(Some(PointTyped { pressure, flow, sweep, with_units, remarks: remarks(line) }))
}

/// The flow in the groups from `from` on: a flow, or for a timed meter a volume and its time.
fn flow_of(groups: &[String], from: usize, units: &TypedUnits) -> Result<FlowTyped, LineError> {
    let flow = |group: &String| -> Result<FlowTyped, LineError> {
        let flow = quantity::<IndicatedFlow>(group, units.flow.symbol, units)?;
        Ok(FlowTyped { flow, timed: None, with_units: has_unit(group) })
    };
    match &groups[from..] {
        [group] if !units.timed => flow(group),
        // A timed meter's flow may be typed divided already, with its unit.
        [group] if has_unit(group) && lookup(Kind::Flow, unit_of(group)).is_ok() => flow(group),
        [_] => Err(LineError::NoTime),
        [volume_text, time] if units.timed => {
            let volume = quantity::<Volume>(volume_text, "L", units)?;
            let duration = quantity::<Span>(time, "s", units)?;
            if duration.as_s() <= 0.0 {
                return Err(LineError::NoSpan);
            }
            let timed = Some(TimedVolume { volume, duration });
            let flow = IndicatedFlow::from_m3_s(volume.as_m3() / duration.as_s());
            Ok(FlowTyped { flow, timed, with_units: has_unit(volume_text) && has_unit(time) })
        }
        _ if units.timed => Err(LineError::TooMany("a pressure, a volume and its time", groups.len())),
        _ => Err(LineError::TooMany("a pressure and a flow", groups.len())),
    }
}

/// The words of a line joined into quantities, each beginning with a number; and the direction of the sweep.
fn groups(line: &str) -> (Vec<String>, Option<Sweep>) {
    let mut groups: Vec<String> = Vec::new();
    let mut sweep = None;
    for word in words(line) {
        match word.to_lowercase().as_str() {
            "up" | "rising" => sweep = Some(Sweep::Rising),
            "down" | "falling" => sweep = Some(Sweep::Falling),
            _ => match groups.last_mut() {
                Some(last) if !begins_number(&word) => {
                    last.push(' ');
                    last.push_str(&word);
                }
                _ => groups.push(word),
            },
        }
    }
    (groups, sweep)
}

fn words(line: &str) -> Vec<String> {
    let apart = |word: &str| -> Vec<String> {
        let bare = word.trim_end_matches(',');
        // "10.02,0.4831": no number has a point behind a comma, so the comma stands between two.
        match bare.split_once(',') {
            Some((a, b)) if is_number(a) && is_number(b) && b.contains('.') => {
                vec![a.to_owned(), b.to_owned()]
            }
            _ => vec![bare.to_owned()],
        }
    };
    let words = line.split(|c: char| c.is_whitespace() || c == ';').filter(|word| !word.is_empty());
    words.flat_map(apart).filter(|word| !word.is_empty()).collect()
}

fn is_number(text: &str) -> bool {
    begins_number(text) && text.parse::<f64>().is_ok()
}

/// Whether a word begins a quantity; the words for what is no number do, so that they are refused by name.
fn begins_number(text: &str) -> bool {
    let bare = text.trim_start_matches(['+', '-', '\u{2212}']);
    let no_number = ["nan", "inf", "infinity"].iter().any(|word| bare.eq_ignore_ascii_case(word));
    no_number || bare.starts_with(|c: char| c.is_ascii_digit() || c == '.' || c == '∞')
}

/// The unit behind the number of a group.
fn unit_of(group: &str) -> &str {
    let signs = |c: char| c.is_ascii_digit() || matches!(c, '+' | '-' | '\u{2212}' | '.' | ',' | ':');
    let rest = group.trim_start_matches(signs);
    // An exponent belongs to the number.
    match rest.strip_prefix(['e', 'E']) {
        Some(after) if after.starts_with(|c: char| c.is_ascii_digit() || c == '-' || c == '+') => {
            after.trim_start_matches(signs).trim()
        }
        _ => rest.trim(),
    }
}

/// Whether a group says its unit; a clock time does by its colons.
fn has_unit(group: &str) -> bool {
    group.contains(':') || !unit_of(group).is_empty()
}

fn quantity<T: Quantity>(group: &str, symbol: &str, units: &TypedUnits) -> Result<T, LineError> {
    let read = if has_unit(group) { value::<T>(group) } else { value::<T>(&format!("{group} {symbol}")) };
    read.map_err(|refused| match refused {
        QuantityError::ZeroInUnit { unit, plain, .. } => {
            LineError::Zero { unit, plain, zero: if units.absolute { "absolute" } else { "gauge" } }
        }
        other => LineError::Quantity(other),
    })
}

/// The number of a point and what follows it.
fn numbered<'l>(
    command: &'static str,
    example: &'static str,
    rest: &'l str,
) -> Result<(usize, &'l str), LineError> {
    let (number, after) = rest.split_once(char::is_whitespace).unwrap_or((rest, ""));
    let plain = !number.is_empty() && number.bytes().all(|b| b.is_ascii_digit());
    match number.parse() {
        Ok(point) if plain && point > 0 => Ok((point, after.trim())),
        _ => Err(LineError::NoNumber(command, example)),
    }
}

fn unknown(line: &str, first: &str, units: &TypedUnits) -> LineError {
    let lower = first.to_lowercase();
    let near = COMMANDS.iter().map(|name| (strsim::osa_distance(&lower, name), name)).min();
    let meant = match near {
        Some((changes, name)) if changes <= 2 && lower.len() <= 12 => format!(" (is {name} meant?)"),
        _ => String::new(),
    };
    let shown: String = line.chars().take(40).collect();
    let cut = if line.chars().count() > 40 { "…" } else { "" };
    LineError::Unknown(format!("{}{cut}", shown.escape_debug()), example(units), meant)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn units() -> TypedUnits {
        TypedUnits::default()
    }

    fn point(line: &str) -> PointTyped {
        match read(line, &units()) {
            Ok(Typed::Point(point)) => point,
            other => panic!("{line:?}: {other:?}"),
        }
    }

    #[track_caller]
    fn refused(line: &str, words: &[&str]) {
        let says = read(line, &units()).expect_err(line).to_string();
        for word in words {
            assert!(says.contains(word), "{line:?}: {word:?} is not in {says:?}");
        }
        assert!(!says.contains('\n') && !says.chars().any(char::is_control), "{says:?}");
    }

    #[test]
    fn a_point_is_the_same_however_it_is_separated_and_in_whatever_unit() {
        let plain = point("10.02 0.4831");
        assert_eq!(plain.pressure, Indication::Gauge(GaugePressure::from_bar(10.02)));
        assert_eq!(plain.flow.unwrap().flow.as_l_min().to_bits(), 0.4831_f64.to_bits());
        assert!(!plain.with_units && plain.sweep.is_none());
        for line in [
            "10.02, 0.4831",
            "10.02;0.4831",
            "10.02,0.4831",
            "\t10.02\t0.4831 ",
            "10.02 bar 0.4831 L/min",
            "10.02bar 0.4831L/min",
            "1.002e1 0.4831",
            "10.02 0.4831 up",
            "10.02 bar 483.1 mL/min falling",
            "1002 kPa 0.4831",
        ] {
            let typed = point(line);
            assert!((typed.pressure.shown_pa() - 1_002_000.0).abs() < 1e-6, "{line}");
            assert!((typed.flow.unwrap().flow.as_l_min() - 0.4831).abs() < 1e-12, "{line}");
        }
        assert!(point("10.02 bar 0.4831 L/min").with_units && !point("10.02 bar 0.4831").with_units);
        assert_eq!(point("10 0.4 up").sweep, Some(Sweep::Rising));
        assert_eq!(point("10 0.4 Falling").sweep, Some(Sweep::Falling));
        assert_eq!(point("10.02").flow, None);
        assert_eq!(point("1 ata 0.4").remarks.len(), 1);
    }

    #[test]
    fn what_is_no_point_is_refused_by_name() {
        refused("10,02 0,4831", &["comma", "10.02"]);
        refused("10.02 0.4831 0.5", &["a pressure and a flow", "3"]);
        refused("10.02 0.4831 bar", &["bar", "flow"]);
        refused("10.02 L/min 0.4831", &["L/min", "pressure"]);
        refused("10.02 sccm", &["sccm"]);
        refused("10.02 0.4831 slpm", &["slpm", "reads_at"]);
        refused("10.02 barg 0.4831", &["barg", "gauge", "write bar"]);
        refused("nan 0.4831", &["nan"]);
        refused("10.02 inf", &["inf"]);
        refused("-2 0.4831", &["-1 bar"]);
        refused("10.02 -0.4831", &["negative"]);
        refused("1e999 0.4", &["too large"]);
        refused("ten 0.4831", &["ten", "help"]);
        refused("\u{1b}[31m", &["\\u{1b}", "help"]);
        refused("lst", &["is list meant?"]);
        refused("list all", &["behind list"]);
        refused(&"x".repeat(4000), &["…"]);
    }

    #[test]
    fn commands_want_what_they_need() {
        assert_eq!(
            read("strike 3 hose was touched", &units()),
            Ok(Typed::Strike(3, "hose was touched".into()))
        );
        refused("strike 3", &["reason"]);
        refused("strike hose", &["number", "strike 3"]);
        refused("strike 0 why", &["number"]);
        refused("correct 3", &["whole point"]);
        refused("correct 3 10.02", &["whole point"]);
        refused("correct 10.02 0.4", &["number"]);
        assert!(matches!(read("CORRECT 3 10.02 0.4831", &units()), Ok(Typed::Correct(3, _))));
        assert_eq!(read("done anyway", &units()), Ok(Typed::Done { anyway: true }));
        assert_eq!(read("zero 0.0002 L/min", &units()), Ok(Typed::Zero("0.0002 L/min".into())));
        assert_eq!(read("  # a remark", &units()), Ok(Typed::Nothing));
    }

    #[test]
    fn a_timed_point_is_a_volume_over_its_time() {
        let units = TypedUnits { timed: true, ..units() };
        for line in ["10.02 0.5 62.5", "10.02 bar 500 mL 00:01:02.5", "10.02 0.5 L 62.5 s up"] {
            let Ok(Typed::Point(typed)) = read(line, &units) else { panic!("{line}") };
            let flow = typed.flow.unwrap();
            assert!((flow.flow.as_l_min() - 0.48).abs() < 1e-12, "{line}: {flow:?}");
            assert!((flow.timed.unwrap().duration.as_s() - 62.5).abs() < 1e-12);
        }
        assert_eq!(read("10.02 0.5", &units), Err(LineError::NoTime));
        assert_eq!(read("10.02 0.5 0", &units), Err(LineError::NoSpan));
        let Ok(Typed::Point(divided)) = read("10.02 0.48 L/min", &units) else { panic!("divided") };
        assert_eq!(divided.flow.unwrap().timed, None);
    }
}
