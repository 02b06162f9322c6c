//! One session of the book as it was recorded: what stood around it, what happened, what the cells showed, and what was
//! left out since. Nothing is worked out here but the extremes of a column.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;
use serde_json::{Value, json};

use super::Units;
use super::cautions::SESSION;
use super::layout::{table, wrapped};
use super::number::{Plain, fixed, limit_percent, shortest};
use super::session_changes::{self, Change};
use super::session_limits;
use super::session_list::{JsonRow, Row, diluent, minutes};
use super::typed::{clock, span, tame};
use super::uptake_sentences::from_to;
use crate::entry::{
    Assumptions, CellReadings, CellSignal, Cylinder, Event, Feeds, Injection, LeakTest, LineReference,
    Metered, Session, SessionLeftOut, SessionNumber, What,
};
use crate::gas::Water;
use crate::quantity::unit::{Kind, Unit};
use crate::quantity::{
    GaugePressure, PressureDifference, Span, Temperature, TemperatureDifference, Uncertain,
};

/// A session of the book.
#[derive(Debug, Clone, Copy)]
pub struct Shown<'a> {
    /// Its number.
    pub number: SessionNumber,
    /// What was recorded.
    pub session: &'a Session,
    /// When it was recorded in the book.
    pub recorded: DateTime<FixedOffset>,
    /// What was left out by hand, in order.
    pub left_out: &'a [SessionLeftOut],
    /// Names of the files it came from.
    pub files: &'a [String],
    /// What was said on reading them.
    pub notes: &'a [String],
    /// Whether rows may still come.
    pub open: bool,
    /// What was corrected or struck in it, in order.
    pub changes: &'a [Change],
}

/// The session as text.
#[must_use]
pub fn text(shown: &Shown<'_>, units: &Units) -> String {
    let session = shown.session;
    let title = format!(
        "{} — {}, {}, {} loop, {} min",
        shown.number,
        session.diver,
        session.place.name(),
        session.kept.name(),
        fixed(minutes(session), 0)
    );
    let mut text = wrapped("", "  ", &title);
    let recorded = format!("taken {}, recorded {}", session.taken.to_rfc3339(), shown.recorded.to_rfc3339());
    text.push_str(&wrapped("  ", "  ", &recorded));
    if shown.open {
        let open = format!("still open: session resume {} goes on with it", shown.number);
        text.push_str(&wrapped("  ", "  ", &open));
    }
    if !shown.files.is_empty() {
        let files: Vec<String> = shown.files.iter().map(|file| tame(file)).collect();
        text.push_str(&wrapped("  ", "  ", &format!("from {}", files.join(", "))));
    }
    text.push_str("\nStated (± as written, k = 2)\n");
    for (label, says) in stated(session, units).into_iter().chain(rest(session, units)) {
        text.push_str(&wrapped(&format!("  {label:<20}"), &" ".repeat(22), &says));
    }
    text.push_str("\nEvents\n");
    if session.events.is_empty() {
        text.push_str("  none\n");
    }
    for event in in_order(session) {
        let first = format!("  {}  ", clock(event.at_s));
        text.push_str(&wrapped(&first, "            ", &what(&event.what, units)));
    }
    text.push('\n');
    text.push_str(&cells(session));
    if !shown.left_out.is_empty() {
        text.push_str("\nLeft out by hand\n");
        for out in shown.left_out {
            text.push_str(&wrapped("  ", "    ", &left_out(out)));
        }
    }
    if !shown.changes.is_empty() {
        text.push_str("\nCorrected\n");
        for change in shown.changes {
            text.push_str(&wrapped("  ", "    ", &session_changes::words(change, units)));
        }
    }
    let extremes = session_limits::extremes(session, &[], None);
    let passed = session_limits::cautions(session, extremes.as_ref(), units);
    if !passed.is_empty() || !shown.notes.is_empty() {
        text.push_str("\nTo know\n");
        for line in passed.into_iter().chain(shown.notes.iter().map(|note| tame(note))) {
            text.push_str(&wrapped("  - ", "    ", &line));
        }
    }
    text.push_str("\nCautions for the next session\n");
    for caution in SESSION {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text.push_str(&wrapped("\n", "  ", &format!("What comes out: session uptake {}", shown.number)));
    text
}

/// A value with its ± in one unit: "7.5 ± 1.0 L".
fn given(unit: Unit, si: f64, expanded_si: Option<f64>) -> String {
    let value = shortest(unit.from_si(si), 6);
    match expanded_si {
        // The ± of a temperature is a difference, which has no zero of its own.
        Some(u) => format!("{value} ± {} {}", shortest(u / unit.factor, 3), unit.symbol),
        None => format!("{value} {}", unit.symbol),
    }
}

pub(super) fn hectopascal(pa: f64, expanded_pa: Option<f64>) -> String {
    let expanded = expanded_pa.map_or_else(String::new, |u| format!(" ± {}", shortest(u / 100.0, 3)));
    format!("{}{expanded} hPa", shortest(pa / 100.0, 6))
}

/// What the file states, row by row; what it does not state is missing.
fn stated(session: &Session, units: &Units) -> Vec<(&'static str, String)> {
    let (volume, length, temperature) =
        (units.unit(Kind::Volume), units.unit(Kind::Length), units.unit(Kind::Temperature));
    let conditions = &session.conditions;
    let mut rows: Vec<(&'static str, String)> = vec![("diluent", diluent(session.diluent))];
    let mut row = |label, says: Option<String>| rows.extend(says.map(|says| (label, says)));
    row(
        "loop volume",
        session.loop_volume.map(|v| given(volume, v.value.as_m3(), v.expanded.map(|d| d.as_m3()))),
    );
    row("mass", session.mass.map(|m| given(units.unit(Kind::Mass), m.as_kg(), None)));
    row(
        "oxygen",
        session.oxygen.map(|p| format!("{} ± {}", limit_percent(p.fraction), limit_percent(p.expanded))),
    );
    row("line", session.line.as_ref().map(line));
    row("leak test", Some(leak(session.leak_test, units)));
    row("nose clip", session.nose_clip.map(yes_no));
    row(
        "barometer",
        conditions
            .barometer
            .value
            .map(|p| hectopascal(p.as_pa(), conditions.barometer.expanded.map(|d| d.as_pa()))),
    );
    let water = match conditions.water {
        Water::Sea => "sea water",
        Water::Fresh => "fresh water",
    };
    row(
        "depth",
        conditions.depth.value.map(|d| {
            format!("{}, {water}", given(length, d.as_m(), conditions.depth.expanded.map(|u| u.as_m())))
        }),
    );
    row(
        "loop temperature",
        conditions
            .loop_temperature
            .value
            .map(|t| given(temperature, t.as_k(), conditions.loop_temperature.expanded.map(|u| u.as_k()))),
    );
    row("on the loop before", conditions.time_on_loop.map(|t| span(t.as_s())));
    row("scrubber warm", conditions.scrubber_warm.map(yes_no));
    row("gain of the cells", session.cells.gain.map(|gain| format!("± {}", limit_percent(gain))));
    row(
        "cells calibrated at",
        session.cells.calibrated_at.map(|at| {
            format!(
                "{}, {}, humidity {}, oxygen {}",
                hectopascal(at.barometer.as_pa(), None),
                given(temperature, at.temperature.as_k(), None),
                limit_percent(at.humidity),
                limit_percent(at.oxygen)
            )
        }),
    );
    row("cylinder", session.cylinder.as_ref().map(|c| cylinder(c, units)));
    let otherwise = session.assumptions != Assumptions::DEFAULT;
    row(
        "assumptions",
        otherwise.then(|| "some differ from the defaults: see [assumptions] of the file".into()),
    );
    rows
}

fn line(line: &LineReference) -> String {
    match line {
        LineReference::RunFile(file) => format!("run file {}", tame(file)),
        LineReference::Orifice(id) => format!("orifice {id}"),
    }
}

fn leak(test: LeakTest, units: &Units) -> String {
    match test {
        LeakTest::Passed => "passed".into(),
        LeakTest::Measured(leak) => {
            format!(
                "{} STPD",
                given(units.unit(Kind::Flow), leak.value.as_m3_s(), leak.expanded.map(|d| d.as_m3_s()))
            )
        }
        LeakTest::NotDone => "nothing is said".into(),
    }
}

fn cylinder(cylinder: &Cylinder, units: &Units) -> String {
    let (pressure, temperature) = (units.unit(Kind::Pressure), units.unit(Kind::Temperature));
    let volume = &cylinder.volume;
    let feeds = match cylinder.feeds {
        Feeds::All => "injection and adds",
        Feeds::Adds => "adds alone",
    };
    let end = |p: &Uncertain<GaugePressure, PressureDifference>,
               t: &Uncertain<Temperature, TemperatureDifference>| {
        format!(
            "{} gauge at {}",
            given(pressure, p.value.as_pa(), p.expanded.map(|d| d.as_pa())),
            given(temperature, t.value.as_k(), t.expanded.map(|d| d.as_k()))
        )
    };
    format!(
        "{}, from {} to {}, feeds {feeds}",
        given(units.unit(Kind::Volume), volume.value.as_m3(), volume.expanded.map(|d| d.as_m3())),
        end(&cylinder.from, &cylinder.from_temperature),
        end(&cylinder.to, &cylinder.to_temperature)
    )
}

/// What is said about rest.
fn rest(session: &Session, units: &Units) -> Vec<(&'static str, String)> {
    let rest = &session.rest;
    let ago = |s: Span| format!("{} before", span(s.as_s()));
    let rows = [
        ("posture", rest.posture.as_deref().map(tame)),
        ("rested for", rest.rested_for.map(|s| span(s.as_s()))),
        ("last meal", rest.last_meal.map(ago)),
        ("last exercise", rest.last_exercise.map(ago)),
        ("last dive", rest.last_dive.map(ago)),
        ("caffeine, nicotine", rest.caffeine_or_nicotine.map(yes_no)),
        (
            "water temperature",
            rest.water_temperature.map(|t| given(units.unit(Kind::Temperature), t.as_k(), None)),
        ),
        ("suit", rest.suit.as_deref().map(tame)),
    ];
    rows.into_iter().filter_map(|(label, says)| Some((label, says?))).collect()
}

fn yes_no(yes: bool) -> String {
    if yes { "yes" } else { "no" }.to_owned()
}

/// Events by time; those of one time in the order given.
fn in_order(session: &Session) -> Vec<&Event> {
    let mut events: Vec<&Event> = session.events.iter().collect();
    events.sort_by(|a, b| a.at_s.total_cmp(&b.at_s));
    events
}

/// What happened, in words.
pub(super) fn what(what: &What, units: &Units) -> String {
    match what {
        What::Injection(Injection::Off) => "injection off".into(),
        What::Injection(Injection::Flow(flow)) => format!(
            "injection {} STPD",
            given(units.unit(Kind::Flow), flow.value.as_m3_s(), flow.expanded.map(|d| d.as_m3_s()))
        ),
        What::Injection(Injection::Ip(ip)) => format!(
            "injection at IP {} gauge",
            given(units.unit(Kind::Pressure), ip.value.as_pa(), ip.expanded.map(|d| d.as_pa()))
        ),
        What::OxygenAdd(amount) => format!("oxygen add{}", metered(amount.as_ref(), units)),
        What::DiluentAdd(amount) => format!("diluent add{}", metered(amount.as_ref(), units)),
        What::Vent(amount) => format!("vent{}", metered(amount.as_ref(), units)),
        What::MakeUp { kept, mark } => {
            let kept = kept.map_or_else(String::new, |kept| format!(", {} from then on", kept.name()));
            format!("make-up{kept}{}", if *mark { ", back at the first volume" } else { "" })
        }
        What::Exclude { until_s } => format!("left out until {}", clock(*until_s)),
        What::Stop => "stop".into(),
    }
}

fn metered(amount: Option<&Metered>, units: &Units) -> String {
    let Some(amount) = amount else { return ", not metered".to_owned() };
    let volume = &amount.volume;
    let at = amount.reads_at.map_or_else(
        || "the state of the loop".to_owned(),
        |at| {
            let temperature = given(units.unit(Kind::Temperature), at.temperature.as_k(), None);
            format!("{temperature}, {} kPa", shortest(at.pressure.as_pa() / 1000.0, 6))
        },
    );
    format!(
        " of {}, litres at {at}",
        given(units.unit(Kind::Volume), volume.value.as_m3(), volume.expanded.map(|d| d.as_m3()))
    )
}

/// First, last, lowest and highest reading of a cell, with how many there are.
struct Summary {
    name: String,
    unit: &'static str,
    readings: usize,
    /// First, last, lowest, highest, in `unit`; none without a reading.
    figures: Option<[f64; 4]>,
}

impl Summary {
    fn of(cell: &CellReadings) -> Self {
        let (column, scale, unit) = match &cell.signal {
            CellSignal::Bar(column) => (column, 1.0, "bar"),
            CellSignal::Volts { readings, .. } => (readings, 1e3, "mV"),
        };
        let read: Vec<f64> = column.iter().filter(|v| v.is_finite()).map(|v| scale * v).collect();
        let figures = read.first().zip(read.last()).map(|(first, last)| {
            let lowest = read.iter().copied().fold(f64::INFINITY, f64::min);
            [*first, *last, lowest, read.iter().copied().fold(f64::NEG_INFINITY, f64::max)]
        });
        Self { name: cell.name.clone(), unit, readings: read.len(), figures }
    }
}

fn cells(session: &Session) -> String {
    let readings = &session.readings;
    let times = || readings.time_s.iter().copied().filter(|t| t.is_finite());
    let (first, last) = (times().fold(f64::INFINITY, f64::min), times().fold(f64::NEG_INFINITY, f64::max));
    let over =
        if first <= last { format!(", {}", from_to(first, last)) } else { ", none with a time".to_owned() };
    let mut text = wrapped("", "  ", &format!("Readings as read: {} rows{over}", readings.time_s.len()));
    let rows: Vec<Vec<String>> = readings
        .cells
        .iter()
        .map(Summary::of)
        .map(|cell| {
            let figure = |i: usize| {
                cell.figures
                    .and_then(|f| f.get(i).copied())
                    .map_or_else(String::new, |v| fixed(v, if cell.unit == "mV" { 2 } else { 3 }))
            };
            vec![
                cell.readings.to_string(),
                figure(0),
                figure(1),
                figure(2),
                figure(3),
                cell.unit.to_owned(),
                tame(&cell.name),
            ]
        })
        .collect();
    text.push_str(&table(
        &["readings", "first", "last", "lowest", "highest", "", "cell"],
        &["", "", "", "", "", "", ""],
        &rows,
        true,
    ));
    text
}

fn left_out(out: &SessionLeftOut) -> String {
    let what = match out.stretch_s {
        Some((from_s, to_s)) => from_to(from_s, to_s),
        None => "the whole session".to_owned(),
    };
    let by = out.by.as_ref().map_or_else(String::new, |by| format!(", by {}", tame(by)));
    format!("{what}: {} ({}{by})", tame(&out.why), out.at.to_rfc3339())
}

/// The session as JSON.
#[must_use]
pub fn json(shown: &Shown<'_>) -> String {
    super::json_text(&Document::of(shown))
}

#[derive(Serialize)]
struct Document {
    #[serde(flatten)]
    row: JsonRow,
    diluent: String,
    loop_volume_l: Option<Plain>,
    left_out: Vec<Value>,
    changes: Vec<Value>,
    recorded: String,
    files: Vec<String>,
    conditions: Value,
    rest: Value,
    line: Option<String>,
    events: Vec<Value>,
    rows: usize,
    readings: Vec<Value>,
    warnings: Vec<String>,
    notes: Vec<String>,
}

impl Document {
    fn of(shown: &Shown<'_>) -> Self {
        let (session, units) = (shown.session, Units::default());
        let extremes = session_limits::extremes(session, &[], None);
        Self {
            row: JsonRow::of(&Row { open: shown.open, ..Row::of(shown.number, session, shown.left_out) }),
            diluent: diluent(session.diluent),
            loop_volume_l: session.loop_volume.map(|volume| Plain(volume.value.as_m3() * 1e3)),
            left_out: shown.left_out.iter().map(left_out_json).collect(),
            changes: shown.changes.iter().map(session_changes::json).collect(),
            recorded: shown.recorded.to_rfc3339(),
            files: shown.files.to_vec(),
            conditions: conditions_json(session),
            rest: rest_json(session),
            line: session.line.as_ref().map(line),
            events: in_order(session).iter().map(|event| event_json(event, &units)).collect(),
            rows: session.readings.time_s.len(),
            readings: session.readings.cells.iter().map(cell_json).collect(),
            warnings: session_limits::cautions(session, extremes.as_ref(), &units),
            notes: shown.notes.to_vec(),
        }
    }
}

fn left_out_json(out: &SessionLeftOut) -> Value {
    json!({
        "from_s": out.stretch_s.map(|(from_s, _)| Plain(from_s)),
        "to_s": out.stretch_s.map(|(_, to_s)| Plain(to_s)),
        "why": out.why,
        "by": out.by,
        "at": out.at.to_rfc3339(),
    })
}

fn conditions_json(session: &Session) -> Value {
    let conditions = &session.conditions;
    json!({
        "barometer_hpa": conditions.barometer.value.map(|p| Plain(p.as_pa() / 100.0)),
        "barometer_expanded_hpa": conditions.barometer.expanded.map(|d| Plain(d.as_pa() / 100.0)),
        "depth_m": conditions.depth.value.map(|d| Plain(d.as_m())),
        "depth_expanded_m": conditions.depth.expanded.map(|d| Plain(d.as_m())),
        "water": match conditions.water { Water::Sea => "sea", Water::Fresh => "fresh" },
        "loop_temperature_c": conditions.loop_temperature.value.map(|t| Plain(t.as_c())),
        "loop_temperature_expanded_k": conditions.loop_temperature.expanded.map(|d| Plain(d.as_k())),
        "time_on_loop_s": conditions.time_on_loop.map(|t| Plain(t.as_s())),
        "scrubber_warm": conditions.scrubber_warm,
        "loop_volume_expanded_l": session.loop_volume.and_then(|v| v.expanded).map(|d| Plain(d.as_m3() * 1e3)),
        "mass_kg": session.mass.map(|m| Plain(m.as_kg())),
        "oxygen": session.oxygen.map(|p| Plain(p.fraction)),
        "leak_test": leak(session.leak_test, &Units::default()),
        "nose_clip": session.nose_clip,
        "cell_gain": session.cells.gain.map(Plain),
        "default_assumptions": session.assumptions == Assumptions::DEFAULT,
    })
}

fn rest_json(session: &Session) -> Value {
    let rest = &session.rest;
    let seconds = |span: Option<Span>| span.map(|s| Plain(s.as_s()));
    json!({
        "posture": rest.posture,
        "rested_for_s": seconds(rest.rested_for),
        "last_meal_s": seconds(rest.last_meal),
        "last_exercise_s": seconds(rest.last_exercise),
        "last_dive_s": seconds(rest.last_dive),
        "caffeine_or_nicotine": rest.caffeine_or_nicotine,
        "water_temperature_c": rest.water_temperature.map(|t| Plain(t.as_c())),
        "suit": rest.suit,
    })
}

fn event_json(event: &Event, units: &Units) -> Value {
    json!({ "at": clock(event.at_s), "at_s": Plain(event.at_s), "says": what(&event.what, units) })
}

fn cell_json(cell: &CellReadings) -> Value {
    let summary = Summary::of(cell);
    let figure = |i: usize| summary.figures.and_then(|f| f.get(i).copied()).map(Plain);
    json!({
        "cell": summary.name,
        "unit": summary.unit,
        "readings": summary.readings,
        "first": figure(0),
        "last": figure(1),
        "lowest": figure(2),
        "highest": figure(3),
    })
}
