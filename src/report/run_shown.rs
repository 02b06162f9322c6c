//! One run of the book as it was recorded: readings as read, what was changed since, and the judgements.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;

use super::Units;
use super::layout::{same_decimals, table, wrapped};
use super::number::{Plain, fixed, probability, shortest, value_and_u};
use super::run_list::{ListedRun, Row};
use crate::bench::METHOD_REVISION;
use crate::entry::{Decision, Indication, MeterKind, PointReading, Readings, Run, RunNumber, Sweep};

/// Most readings of a time series that are shown.
const SERIES_SHOWN: usize = 10;

/// A run of the book.
#[derive(Debug, Clone, PartialEq)]
pub struct ShownRun {
    /// Number, orifice and judgement, as in a list.
    pub listed: ListedRun,
    /// What was recorded.
    pub run: Run,
    /// How it came into the book.
    pub came: Came,
    /// When it was recorded.
    pub recorded: DateTime<FixedOffset>,
    /// What was changed since, in order, each with its time.
    pub changes: Vec<(DateTime<FixedOffset>, String)>,
    /// The judgements, in order; the last holds.
    pub decisions: Vec<Decision>,
    /// Whether a point was left out after the last judgement.
    pub changed_since: bool,
}

/// How a run came into the book.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Came {
    /// From files.
    Imported,
    /// Typed.
    Typed,
    /// Logged from instruments.
    Logged(Vec<Heard>),
}

/// What came of an instrument while a run was logged.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Heard {
    /// Its name.
    pub instrument: String,
    /// Raw readings.
    pub readings: usize,
    /// What else happened, with how often.
    pub notes: Vec<(&'static str, usize)>,
}

impl Came {
    const fn word(&self) -> &'static str {
        match self {
            Self::Imported => "imported",
            Self::Typed => "typed",
            Self::Logged(_) => "logged",
        }
    }
}

/// The run as text.
#[must_use]
pub fn text(shown: &ShownRun, units: &Units) -> String {
    let (run, listed) = (&shown.run, &shown.listed);
    let state = if listed.open { "open: points may still come" } else { "complete" };
    let how = shown.came.word();
    let mut text = wrapped("", "  ", &format!("{} — {}, {state}", listed.number, run.orifice));
    let who = run.technician.as_ref().map(|t| format!(", {t}")).unwrap_or_default();
    let line = format!("{}, {}, taken {}{who}", run.gas.name(), run.purpose.name(), run.taken.to_rfc3339());
    text.push_str(&wrapped("  ", "  ", &line));
    text.push_str(&wrapped("  ", "  ", &format!("{how} {}", shown.recorded.to_rfc3339())));
    text.push_str(&wrapped("  ", "  ", &instruments(run)));
    if let Came::Logged(heard) = &shown.came {
        text.push_str(&wrapped("  ", "  ", &heard_words(heard)));
    }
    text.push('\n');
    text.push_str(&readings(run, units));
    if !shown.changes.is_empty() {
        text.push_str("\nChanged since\n");
        for (at, what) in &shown.changes {
            text.push_str(&wrapped("  ", "    ", &format!("{} {what}", at.to_rfc3339())));
        }
    }
    text.push_str("\nJudgements\n");
    if shown.decisions.is_empty() {
        text.push_str(&wrapped("  ", "    ", &format!("none yet: bench accept {}", listed.number)));
    }
    for decision in &shown.decisions {
        text.push_str(&wrapped("  ", "    ", &judgement(decision, units)));
    }
    if shown.changed_since {
        let again =
            format!("a point was left out after the last judgement: bench accept {} again", listed.number);
        text.push_str(&wrapped("  ", "    ", &again));
    }
    text.push_str(&wrapped("\n", "  ", &format!("The line and its checks: bench fit {}", listed.number)));
    text
}

/// What came of the instruments, in a line.
fn heard_words(heard: &[Heard]) -> String {
    let one = |heard: &Heard| {
        let notes: Vec<String> =
            heard.notes.iter().map(|(what, times)| format!("{what} {times} times")).collect();
        let notes = if notes.is_empty() { String::new() } else { format!(" ({})", notes.join(", ")) };
        format!("{} {} raw readings{notes}", heard.instrument, heard.readings)
    };
    format!("heard: {}", heard.iter().map(one).collect::<Vec<_>>().join("; "))
}

/// The run as JSON.
#[must_use]
pub fn json(shown: &ShownRun) -> String {
    super::json_text(&Document::of(shown))
}

/// One judgement as JSON, with the run it is of.
#[must_use]
pub fn judgement_json(decision: &Decision, run: RunNumber) -> impl Serialize + use<> {
    #[derive(Serialize)]
    struct Judged {
        run: String,
        #[serde(flatten)]
        judgement: JsonJudgement,
    }
    Judged { run: run.to_string(), judgement: JsonJudgement::of(decision) }
}

/// One judgement in a sentence.
#[must_use]
pub fn judgement(decision: &Decision, units: &Units) -> String {
    let figures = &decision.figures;
    let (value, u) = value_and_u(units.flow(figures.flow_l_min), units.flow(figures.expanded_l_min()));
    let mut text = format!(
        "{} {}: {value} ± {u} {} (STPD, 95 %) at {} IP, {} points",
        decision.at.to_rfc3339(),
        decision.verdict.name(),
        units.flow_symbol(),
        units.pressure_text(figures.ip.as_bar()),
        figures.points_used
    );
    if let Some(p) = figures.conformity_probability {
        text.push_str(&format!("; probability of conformity {}", probability(p)));
    }
    if !figures.failed_checks.is_empty() {
        text.push_str(&format!("; not held: {}", figures.failed_checks.join(", ")));
    }
    if let Some((before, en)) = figures.against {
        text.push_str(&format!("; E_n {} against {before}", fixed(en, 2)));
    }
    if figures.method_revision != METHOD_REVISION {
        text.push_str(&format!("; by method {}", figures.method_revision));
    }
    if let Some(by) = &decision.by {
        text.push_str(&format!("; by {by}"));
    }
    if let Some(remark) = &decision.remark {
        text.push_str(&format!("; \"{remark}\""));
    }
    text
}

fn instruments(run: &Run) -> String {
    let named = |id: &Option<crate::entry::Id>, certificate: &Option<String>| {
        let id = id.as_ref().map(|id| format!(" {id}")).unwrap_or_default();
        let certificate = certificate.as_ref().map(|c| format!(", certificate {c}")).unwrap_or_default();
        format!("{id}{certificate}")
    };
    let reads = match &run.meter.kind {
        MeterKind::Mass { reads_at, .. } | MeterKind::Float { reads_at, .. } => {
            format!(", reads at {}", crate::quantity::show::reference_to_text(*reads_at))
        }
        MeterKind::Volumetric { .. } | MeterKind::Timed { .. } => String::new(),
    };
    format!(
        "{} flow meter{}{reads}; transducer{}",
        run.meter.kind.name(),
        named(&run.meter.id, &run.meter.papers.certificate),
        named(&run.transducer.id, &run.transducer.papers.certificate)
    )
}

fn readings(run: &Run, units: &Units) -> String {
    let mut text = String::from("Readings as read (flow in litres of the meter's own scale)\n");
    let (p, q) = (units.pressure_symbol(), units.flow_symbol());
    let row = |index: usize, pressure_pa: f64, flow_l_min: f64, sweep: Option<Sweep>| {
        let out =
            run.left_out.iter().find(|l| l.point == index && !matches!(run.readings, Readings::Series(_)));
        vec![
            index.to_string(),
            shortest(units.pressure(pressure_pa / 1e5), 7),
            shortest(units.flow(flow_l_min), 7),
            match sweep {
                Some(Sweep::Rising) => "up".to_owned(),
                Some(Sweep::Falling) => "down".to_owned(),
                None => String::new(),
            },
            out.map_or_else(String::new, |out| {
                super::layout::shortened(&format!("left out: {}", out.why), 40)
            }),
        ]
    };
    let (absolute, rows, more) = match &run.readings {
        Readings::Points(points) => {
            let absolute = points.iter().any(|p| matches!(p.pressure, Indication::Absolute(_)));
            let rows = points
                .iter()
                .enumerate()
                .map(|(i, point)| row(i + 1, point.pressure.shown_pa(), point.flow.as_l_min(), point.sweep));
            (absolute, rows.collect::<Vec<_>>(), 0)
        }
        Readings::Series(series) => {
            let shown = series.time_s.len().min(SERIES_SHOWN);
            let rows = (0..shown).map(|i| row(i + 1, series.pressure_pa[i], series.flow_l_min[i], None));
            (series.pressure_is_absolute, rows.collect(), series.time_s.len() - shown)
        }
    };
    let mut rows = rows;
    for column in [1, 2] {
        let cells: Vec<String> = rows.iter().map(|row| row[column].clone()).collect();
        for (row, cell) in rows.iter_mut().zip(same_decimals(&cells)) {
            row[column] = cell;
        }
    }
    let kind = format!("{p} {}", if absolute { "abs" } else { "gauge" });
    text.push_str(&table(&["no", "pressure", "flow", "sweep", ""], &["", &kind, q, "", ""], &rows, true));
    if more > 0 {
        text.push_str(&format!("  … and {more} rows more of the time series\n"));
    }
    if let (Readings::Series(_), false) = (&run.readings, run.left_out.is_empty()) {
        for out in &run.left_out {
            text.push_str(&wrapped(
                "  ",
                "    ",
                &format!("steady point {} left out: {}", out.point, out.why),
            ));
        }
    }
    text
}

#[derive(Serialize)]
struct Document {
    #[serde(flatten)]
    row: Row,
    origin: &'static str,
    recorded: String,
    meter: JsonInstrument,
    transducer: JsonInstrument,
    readings: Vec<JsonReading>,
    left_out: Vec<JsonLeftOut>,
    changes: Vec<JsonChange>,
    judgements: Vec<JsonJudgement>,
    changed_since_judgement: bool,
}

#[derive(Serialize)]
struct JsonInstrument {
    id: Option<String>,
    kind: Option<&'static str>,
    certificate: Option<String>,
    due: Option<String>,
}

/// A reading of a point as it was read.
#[derive(Serialize)]
pub(super) struct JsonReading {
    index: usize,
    pressure_bar: Plain,
    absolute: bool,
    flow_shown_l_min: Plain,
    sweep: Option<&'static str>,
    time_s: Option<Plain>,
}

#[derive(Serialize)]
struct JsonLeftOut {
    point: usize,
    why: String,
}

#[derive(Serialize)]
struct JsonChange {
    at: String,
    what: String,
}

#[derive(Serialize)]
struct JsonJudgement {
    at: String,
    verdict: &'static str,
    method: u32,
    ip_bar_gauge: Plain,
    flow_l_min: Plain,
    u: Plain,
    expanded: Plain,
    coverage_factor: Plain,
    degrees_of_freedom: Plain,
    conformity_probability: Option<Plain>,
    failed_checks: Vec<String>,
    e_n: Option<Plain>,
    e_n_against: Option<String>,
    by: Option<String>,
    remark: Option<String>,
}

impl Document {
    fn of(shown: &ShownRun) -> Self {
        let run = &shown.run;
        let papers = |id: &Option<crate::entry::Id>,
                      kind,
                      certificate: &Option<String>,
                      due: Option<chrono::NaiveDate>| {
            JsonInstrument {
                id: id.as_ref().map(ToString::to_string),
                kind,
                certificate: certificate.clone(),
                due: due.map(|d| d.to_string()),
            }
        };
        let (meter, transducer) = (&run.meter, &run.transducer);
        Self {
            row: Row::of(&shown.listed),
            origin: shown.came.word(),
            recorded: shown.recorded.to_rfc3339(),
            meter: papers(&meter.id, Some(meter.kind.name()), &meter.papers.certificate, meter.papers.due),
            transducer: papers(&transducer.id, None, &transducer.papers.certificate, transducer.papers.due),
            readings: match &run.readings {
                Readings::Points(points) => {
                    points.iter().enumerate().map(|(i, p)| JsonReading::of(i + 1, p)).collect()
                }
                // A time series is read from the file it came from; its rows are not repeated here.
                Readings::Series(_) => Vec::new(),
            },
            left_out: run
                .left_out
                .iter()
                .map(|l| JsonLeftOut { point: l.point, why: l.why.clone() })
                .collect(),
            changes: shown
                .changes
                .iter()
                .map(|(at, what)| JsonChange { at: at.to_rfc3339(), what: what.clone() })
                .collect(),
            judgements: shown.decisions.iter().map(JsonJudgement::of).collect(),
            changed_since_judgement: shown.changed_since,
        }
    }
}

impl JsonReading {
    /// A reading with the number of its point.
    pub(super) fn of(index: usize, point: &PointReading) -> Self {
        Self {
            index,
            pressure_bar: Plain(point.pressure.shown_pa() / 1e5),
            absolute: matches!(point.pressure, Indication::Absolute(_)),
            flow_shown_l_min: Plain(point.flow.as_l_min()),
            sweep: point.sweep.map(|sweep| match sweep {
                Sweep::Rising => "rising",
                Sweep::Falling => "falling",
            }),
            time_s: point.time_s.map(Plain),
        }
    }
}

impl JsonJudgement {
    fn of(decision: &Decision) -> Self {
        let figures = &decision.figures;
        Self {
            at: decision.at.to_rfc3339(),
            verdict: decision.verdict.name(),
            method: figures.method_revision,
            ip_bar_gauge: Plain(figures.ip.as_bar()),
            flow_l_min: Plain(figures.flow_l_min),
            u: Plain(figures.standard_uncertainty_l_min),
            expanded: Plain(figures.expanded_l_min()),
            coverage_factor: Plain(figures.coverage_factor),
            degrees_of_freedom: Plain(figures.dof),
            conformity_probability: figures.conformity_probability.map(Plain),
            failed_checks: figures.failed_checks.clone(),
            e_n: figures.against.map(|(_, en)| Plain(en)),
            e_n_against: figures.against.map(|(run, _)| run.to_string()),
            by: decision.by.clone(),
            remark: decision.remark.clone(),
        }
    }
}
