//! What is said while a run is typed: questions, acknowledgements, the running line, help.
//!
//! Comes in: questions, readings, what the points say so far. Goes out: text of 80 columns. The sheet at the end is
//! [`super::bench_fit`]'s; refusals are their own errors. A reading is shown in the unit it is typed in, a result in
//! the units asked for.

use serde::Serialize;

use super::Units;
use super::bench_fit::{Fitted, as_gas};
use super::bench_json::Document as Fit;
use super::check_sentences::{name_key_unit, sentence};
use super::enter_questions::Question;
use super::layout::{same_decimals, table, wrapped};
use super::number::{fixed, shortest, value_and_u};
use super::run_shown::JsonReading;
use crate::bench::checks::{Check, CheckKind, CheckVerdict, Finding};
use crate::bench::{Analysis, Verdict, Warning, WhyNot};
use crate::entry::{Id, Indication, LeftOut, PointReading, Readings, Run, RunNumber, Sweep, TimedVolume};
use crate::quantity::unit::{Kind, Unit};
use crate::quantity::{IndicatedFlow, Quantity, ZERO_CELSIUS_K};

/// Digits of a reading that are shown: more than any instrument here has.
const DIGITS: i32 = 7;

/// The units of numbers that are typed without one.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TypedUnits {
    /// Of the pressure.
    pub pressure: Unit,
    /// Whether that is over vacuum.
    pub absolute: bool,
    /// Of the flow.
    pub flow: Unit,
    /// Whether a point is a volume and the time it took.
    pub timed: bool,
}

impl Default for TypedUnits {
    fn default() -> Self {
        Self {
            pressure: Kind::Pressure.default_unit(),
            absolute: false,
            flow: Kind::Flow.default_unit(),
            timed: false,
        }
    }
}

/// The first lines of a new run.
#[must_use]
pub fn greeting(orifice: &Id, registered: bool, limits: Option<&Id>, open: Option<RunNumber>) -> String {
    let mut text = format!("A run of {orifice}, typed.");
    if !registered {
        text.push_str(" The orifice is new: it goes into the register with its name only.");
    }
    if let Some(limits) = limits {
        text.push_str(&format!(" It is judged by its limits {limits}."));
    }
    text.push_str(" Enter takes what stands in [ ], ? explains, Ctrl-D leaves.");
    let mut text = wrapped("", "", &text);
    if let Some(open) = open {
        let also = format!("{open} of this orifice is still open; bench resume {open} goes on with it.");
        text.push_str(&wrapped("", "", &also));
    }
    text
}

/// The first lines of a run that goes on.
#[must_use]
pub fn going_on(number: RunNumber, run: &Run) -> String {
    let who = run.technician.as_ref().map(|t| format!(", {t}")).unwrap_or_default();
    let about = format!(
        "{number} goes on — {}: {}, {}, taken {}{who}",
        run.orifice,
        run.gas.name(),
        run.purpose.name(),
        run.taken.to_rfc3339()
    );
    wrapped("", "  ", &about)
}

/// How a point is typed.
#[must_use]
pub fn how_to_type(units: &TypedUnits) -> String {
    let zero = if units.absolute { "absolute" } else { "gauge" };
    let pressure = format!("pressure ({} {zero})", units.pressure.symbol);
    let (rest, example) = if units.timed {
        ("volume (L) and time (s)".to_owned(), "10.02 0.500 62.1")
    } else {
        (format!("flow ({} as the meter shows it)", units.flow.symbol), "10.02 0.4831")
    };
    let mut text =
        wrapped("", "  ", &format!("Type each steady point as {pressure} and {rest}, for example"));
    text.push_str(&format!("  {example}\n"));
    text.push_str("or with other units written. \"done\" ends the run, \"help\" lists the rest.\n");
    text
}

/// Before a point.
#[must_use]
pub fn point_prompt(point: usize) -> String {
    format!("point {point}> ")
}

/// Before the flow of a point whose pressure was typed alone.
#[must_use]
pub fn flow_prompt(pressure: Indication, units: &TypedUnits) -> String {
    let what = if units.timed { "volume and time" } else { "flow" };
    format!("  {what} at {}> ", pressure_words(pressure, units))
}

/// A pressure as it is typed.
#[must_use]
pub fn pressure_words(pressure: Indication, units: &TypedUnits) -> String {
    let (shown, absolute) = match pressure {
        Indication::Gauge(gauge) => (gauge.shown(units.pressure), ""),
        Indication::Absolute(absolute) => (absolute.shown(units.pressure), " absolute"),
    };
    format!("{} {}{absolute}", shortest(shown, DIGITS), units.pressure.symbol)
}

/// A flow as it is typed.
#[must_use]
pub fn flow_words(flow: IndicatedFlow, units: &TypedUnits) -> String {
    format!("{} {}", shortest(flow.shown(units.flow), DIGITS), units.flow.symbol)
}

/// A point as it was understood.
#[must_use]
pub fn reading_words(reading: &PointReading, units: &TypedUnits) -> String {
    let flow = match reading.timed {
        Some(TimedVolume { volume, duration }) => format!(
            "{} L in {} s ({})",
            shortest(volume.as_l(), DIGITS),
            shortest(duration.as_s(), DIGITS),
            flow_words(reading.flow, units)
        ),
        None => flow_words(reading.flow, units),
    };
    let sweep = reading.sweep.map(|sweep| format!(" {}", sweep_word(sweep))).unwrap_or_default();
    format!("{} {flow}{sweep}", pressure_words(reading.pressure, units))
}

const fn sweep_word(sweep: Sweep) -> &'static str {
    match sweep {
        Sweep::Rising => "up",
        Sweep::Falling => "down",
    }
}

/// That a run began in the book, and what came with it.
#[must_use]
pub fn begun(number: RunNumber, orifice: &Id, orifice_created: bool) -> String {
    let bare = if orifice_created { "; the orifice is new and was created with its name only" } else { "" };
    wrapped("", "  ", &format!("{number} is begun for {orifice}{bare}"))
}

/// That a point is in the book: one line, whatever its length, which programs may wait for.
#[must_use]
pub fn point_taken(number: RunNumber, point: usize, reading: &PointReading, units: &TypedUnits) -> String {
    format!("{number} point {point}: {}\n", reading_words(reading, units))
}

/// That a point was corrected.
#[must_use]
pub fn point_corrected(
    number: RunNumber,
    point: usize,
    reading: &PointReading,
    before: &PointReading,
    units: &TypedUnits,
) -> String {
    let (now, was) = (reading_words(reading, units), reading_words(before, units));
    format!("{number} point {point} corrected: {now} (was {was})\n")
}

/// That a point was struck.
#[must_use]
pub fn point_struck(number: RunNumber, point: usize, why: &str) -> String {
    format!("{number} point {point} struck: {why}\n")
}

/// That zero, leak or conditions stand now as they were typed; `number` is none before the first point.
#[must_use]
pub fn restated(number: Option<RunNumber>, question: Question, run: &Run) -> String {
    let what = match question {
        Question::ZeroBefore => "meter at no flow before the run",
        Question::ZeroAfter => "meter at no flow after the run",
        Question::LeakBefore => "leak before the run",
        Question::LeakAfter => "leak after the run",
        Question::Barometer => "barometer for all points",
        _ => "gas temperature for all points",
    };
    let number = number.map(|number| format!("{number} ")).unwrap_or_default();
    wrapped("", "  ", &format!("{number}{what}: {}", stands(question, run)))
}

/// How a condition, zero or leak stands now.
#[must_use]
pub fn stands(question: Question, run: &Run) -> String {
    let flow = |flow: Option<IndicatedFlow>| {
        flow.map_or_else(|| "not read".to_owned(), |f| format!("{} L/min", shortest(f.as_l_min(), DIGITS)))
    };
    let leak = |leak: Option<f64>| {
        leak.map_or_else(
            || "not read".to_owned(),
            |l| format!("{} bar/min", shortest(l * 60.0 / 1e5, DIGITS)),
        )
    };
    match question {
        Question::ZeroBefore => flow(run.before.zero),
        Question::ZeroAfter => flow(run.after.zero),
        Question::LeakBefore => leak(run.before.leak_pa_s),
        Question::LeakAfter => leak(run.after.leak_pa_s),
        Question::Barometer => barometer_words(run),
        Question::Temperature => temperature_words(run),
        _ => "as it is".to_owned(),
    }
}

/// Barometer and gas temperature of a run.
#[must_use]
pub fn conditions_words(run: &Run) -> String {
    format!("barometer {}, gas {}", barometer_words(run), temperature_words(run))
}

fn barometer_words(run: &Run) -> String {
    let barometer = &run.conditions.barometer;
    let Some(value) = barometer.value else { return "not read".to_owned() };
    let hpa = |pa: f64, digits| shortest(pa / 100.0, digits);
    match barometer.expanded {
        Some(u) => format!("{} hPa ± {} hPa", hpa(value.as_pa(), DIGITS), hpa(u.as_pa(), 3)),
        None => format!("{} hPa (± 2 hPa taken)", hpa(value.as_pa(), DIGITS)),
    }
}

fn temperature_words(run: &Run) -> String {
    let temperature = &run.conditions.temperature;
    let Some(value) = temperature.value else { return "not read".to_owned() };
    let shown = shortest(value.as_k() - ZERO_CELSIUS_K, DIGITS);
    match temperature.expanded {
        Some(u) => format!("{shown} °C ± {} °C", shortest(u.as_k(), 3)),
        None => format!("{shown} °C (± 1 °C taken)"),
    }
}

/// How many points are missing for a line.
#[must_use]
pub fn more_points(missing: usize, not_choked: usize) -> String {
    let points = if missing == 1 { "point" } else { "points" };
    let not_choked = match not_choked {
        0 => String::new(),
        1 => " (1 is not choked and does not count)".to_owned(),
        n => format!(" ({n} are not choked and do not count)"),
    };
    wrapped("  ", "    ", &format!("{missing} more {points} for a line{not_choked}"))
}

/// Why there is no line although there are points enough.
#[must_use]
pub fn no_line(why: &str) -> String {
    wrapped("  ", "    ", &format!("no line: {why}"))
}

/// The line so far, what this point (if any) says of it, and each check that changed since `before`.
#[must_use]
pub fn running(
    fitted: &Fitted<'_>,
    point: Option<usize>,
    before: Option<&Analysis>,
    units: &Units,
) -> String {
    let analysis = fitted.analysis;
    let mut parts = vec![flow_so_far(fitted, units)];
    if let Some(judgement) = &analysis.judgement {
        let place = |l_min: f64| shortest(units.flow(l_min), 4);
        let (low, high) = judgement.limits_l_min;
        let word = match judgement.verdict {
            Verdict::Pass => "PASS",
            Verdict::Fail => "FAIL",
            Verdict::Undecided | Verdict::None => "UNDECIDED",
        };
        parts.push(format!("{word} so far ({} to {})", place(low), place(high)));
    }
    let crossing = analysis.checks.iter().find(|c| c.kind == CheckKind::ThroughZero).and_then(|c| c.value);
    // A line that hardly rises crosses nowhere.
    let crossing = crossing.filter(|kpa| kpa.is_finite());
    parts.extend(crossing.map(|kpa| format!("crossing {} kPa", fixed(kpa, 1))));
    let mut text = wrapped("  ", "    ", &parts.join("; "));
    if let Some(about) = point.and_then(|point| residual(analysis, point)) {
        text.push_str(&wrapped("  ", "    ", &about));
    }
    for check in &analysis.checks {
        let was = before.and_then(|before| before.checks.iter().find(|c| c.kind == check.kind));
        // What is said of the point itself is not said twice.
        let of_this_point =
            matches!(&check.finding, Finding::Apart(points) if points.as_slice() == [point.unwrap_or(0)]);
        if let Some(says) = changed(check, was, units).filter(|_| !of_this_point) {
            text.push_str(&wrapped("  ", "    ", &says));
        }
    }
    text
}

fn flow_so_far(fitted: &Fitted<'_>, units: &Units) -> String {
    let nominal = &fitted.analysis.nominal;
    let (flow, as_gas) = match &fitted.analysis.judgement {
        Some(judgement) => (&judgement.flow, as_gas(fitted, judgement)),
        None => (&nominal.flow, String::new()),
    };
    let (value, u) = value_and_u(units.flow(flow.flow_l_min), units.flow(flow.expanded()));
    let beyond = fitted.analysis.warnings.iter().any(|w| matches!(w, Warning::Extrapolated { .. }));
    let beyond = match (beyond, &fitted.run.acceptance) {
        (true, _) => " (no points there yet)",
        (false, None) => " (the middle so far)",
        (false, Some(_)) => "",
    };
    format!(
        "{value} ± {u} {}{as_gas} STPD at {} IP{beyond}",
        units.flow_symbol(),
        units.pressure_text(nominal.ip.as_bar())
    )
}

/// What one point says of the line.
fn residual(analysis: &Analysis, index: usize) -> Option<String> {
    let point = analysis.points.iter().find(|point| point.index == index)?;
    let percent = percent_off(point.residual_l_min, point.flow_l_min)?;
    Some(match &point.why_not {
        Some(WhyNot::NotChoked) => format!("point {index} is not choked: shown, left out of the line"),
        Some(WhyNot::LeftOut(_)) => return None,
        None if apart(analysis).contains(&index) => format!(
            "point {index} lies apart from the rest, {percent} off the line: read it again (correct {index} …), or \
             strike {index} with the reason"
        ),
        None => format!("point {index} lies {percent} off the line"),
    })
}

fn percent_off(residual: f64, flow: f64) -> Option<String> {
    let percent = residual / (flow - residual) * 100.0;
    let sign = if percent >= 0.005 { "+" } else { "" };
    percent.is_finite().then(|| format!("{sign}{} %", fixed(percent, 2)))
}

fn apart(analysis: &Analysis) -> &[usize] {
    let outlier = analysis.checks.iter().find(|c| c.kind == CheckKind::Outlier);
    match outlier.map(|c| &c.finding) {
        Some(Finding::Apart(points)) => points,
        _ => &[],
    }
}

/// A check whose verdict, or whose points, changed; what cannot be told yet, or may be chance, waits for the sheet.
fn changed(check: &Check, was: Option<&Check>, units: &Units) -> Option<String> {
    let quiet = |check: &Check| {
        let unsure = matches!(check.finding, Finding::CannotTell(_) | Finding::MayBeChance)
            || (check.kind == CheckKind::ThroughZero && check.verdict == CheckVerdict::Note);
        unsure || check.verdict == CheckVerdict::Pass
    };
    let said_before = was.is_some_and(|was| !quiet(was));
    let name = name_key_unit(check.kind).0;
    if quiet(check) {
        let holds = check.verdict == CheckVerdict::Pass && said_before;
        return holds.then(|| format!("{name}: holds again"));
    }
    let same = was.is_some_and(|was| {
        let listed = |finding: &Finding| {
            matches!(finding, Finding::Apart(_) | Finding::NotChoked(_) | Finding::Instruments(_))
        };
        let both = listed(&check.finding) || listed(&was.finding);
        was.verdict == check.verdict && !quiet(was) && (!both || was.finding == check.finding)
    });
    if same {
        return None;
    }
    let word = if check.verdict == CheckVerdict::Fail { "DOES NOT HOLD" } else { "note" };
    Some(format!("{name}, {word}: {}", sentence(check, units)))
}

/// The points so far.
#[must_use]
pub fn list(
    points: &[PointReading],
    left_out: &[LeftOut],
    analysis: Option<&Analysis>,
    units: &TypedUnits,
) -> String {
    if points.is_empty() {
        return "  no points yet\n".to_owned();
    }
    let column = |shown: &dyn Fn(&PointReading) -> f64| {
        same_decimals(&points.iter().map(|point| shortest(shown(point), DIGITS)).collect::<Vec<_>>())
    };
    let pressures = column(&|point| match point.pressure {
        Indication::Gauge(gauge) => gauge.shown(units.pressure),
        Indication::Absolute(absolute) => absolute.shown(units.pressure),
    });
    let flows = column(&|point| point.flow.shown(units.flow));
    let rows: Vec<Vec<String>> = points
        .iter()
        .enumerate()
        .map(|(i, reading)| {
            let point = analysis.and_then(|a| a.points.get(i));
            let struck = left_out.iter().find(|out| out.point == i + 1);
            let remark = match (struck, point.and_then(|p| p.why_not.as_ref())) {
                (Some(out), _) => out.why.clone(),
                (None, Some(WhyNot::NotChoked)) => "not choked".to_owned(),
                _ if analysis.is_some_and(|a| apart(a).contains(&(i + 1))) => "lies apart".to_owned(),
                _ => String::new(),
            };
            let off = point.filter(|_| struck.is_none());
            let off = off.and_then(|p| percent_off(p.residual_l_min, p.flow_l_min)).unwrap_or_default();
            vec![
                (i + 1).to_string(),
                pressures[i].clone(),
                flows[i].clone(),
                reading.sweep.map_or("", sweep_word).to_owned(),
                off.trim_end_matches(" %").to_owned(),
                super::layout::shortened(&remark, 40),
            ]
        })
        .collect();
    let zero =
        if points.iter().any(|p| matches!(p.pressure, Indication::Absolute(_))) { "abs" } else { "gauge" };
    let pressure = format!("{} {zero}", units.pressure.symbol);
    table(
        &["no", "pressure", "flow shown", "sweep", "off the line", ""],
        &["", &pressure, units.flow.symbol, "", "%", ""],
        &rows,
        true,
    )
}

/// What can be typed.
#[must_use]
pub fn help(units: &TypedUnits) -> String {
    let point = if units.timed { "10.02 0.500 62.1" } else { "10.02 0.4831" };
    let zero = if units.absolute { "absolute" } else { "gauge" };
    let mut text = String::from("What can be typed\n");
    let about_point = format!(
        "a point; {} {zero} and {} unless units are written (145.3 psi 483.1 mL/min)",
        units.pressure.symbol,
        if units.timed { "L and s" } else { units.flow.symbol }
    );
    let rows: [(&str, &str); 12] = [
        (point, &about_point),
        ("10.02 0.4831 up", "with the direction of the sweep, up or down: on every point or on none"),
        ("10.02", "the pressure alone; the flow is asked for"),
        ("correct 3 10.02 0.4831", "point 3 was typed wrong"),
        ("strike 3 hose was touched", "point 3 does not count, for this reason; it stays in the record"),
        ("list", "the points so far"),
        ("sheet", "everything the points say so far"),
        ("zero 0.0002 L/min", "what the meter shows at no flow: before the first point, or after the last"),
        ("leak 0.002 bar/min", "how the pressure falls with the outlet blanked, likewise"),
        ("conditions", "barometer and gas temperature of the whole run, again"),
        ("done", "all points are in"),
        ("quit", "leave the run open; bench resume goes on with it"),
    ];
    for (typed, about) in rows {
        text.push_str(&wrapped(&format!("  {typed:<26} "), &" ".repeat(29), about));
    }
    text
}

/// That a run was left open, or that nothing was recorded.
#[must_use]
pub fn left_open(number: Option<RunNumber>, points: usize) -> String {
    match number {
        None => "Nothing was recorded.\n".to_owned(),
        Some(number) => wrapped("", "  ", &kept(Some(number), points)),
    }
}

/// What became of the points so far.
#[must_use]
pub fn kept(number: Option<RunNumber>, points: usize) -> String {
    match (number, points) {
        (None, _) => "nothing was recorded".to_owned(),
        (Some(number), 1) => format!("{number} stays open with 1 point, go on with: bench resume {number}"),
        (Some(number), n) => {
            format!("{number} stays open with {n} points, go on with: bench resume {number}")
        }
    }
}

/// That a run is complete, below its sheet.
#[must_use]
pub fn finished(number: RunNumber, with_line: bool) -> String {
    if with_line {
        format!(
            "{number} is complete. To judge it and keep the verdict with its figures:\n  ebbline bench accept {number}\n"
        )
    } else {
        format!("{number} is complete, without a line\n")
    }
}

/// The run as a document: its number, whether it is open, its points as read, and the fit.
#[must_use]
pub fn document(number: Option<RunNumber>, open: bool, run: &Run, fitted: Option<&Fitted<'_>>) -> String {
    let points = match &run.readings {
        Readings::Points(points) => points.as_slice(),
        Readings::Series(_) => &[],
    };
    let struck = |i: usize| run.left_out.iter().find(|out| out.point == i + 1).map(|out| out.why.clone());
    super::json_text(&Document {
        format: 1,
        run: number.map(|number| number.to_string()),
        orifice: run.orifice.to_string(),
        open,
        points: points
            .iter()
            .enumerate()
            .map(|(i, point)| JsonPoint { reading: JsonReading::of(i + 1, point), left_out: struck(i) })
            .collect(),
        fit: fitted.map(Fit::of),
    })
}

#[derive(Serialize)]
struct Document {
    format: u32,
    run: Option<String>,
    orifice: String,
    open: bool,
    points: Vec<JsonPoint>,
    fit: Option<Fit>,
}

#[derive(Serialize)]
struct JsonPoint {
    #[serde(flatten)]
    reading: JsonReading,
    left_out: Option<String>,
}
