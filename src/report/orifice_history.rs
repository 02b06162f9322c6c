//! The history of an orifice below its entry: its runs with the figures they were judged on, and its trend.
//!
//! Comes in: runs as they are listed, the trend worked out elsewhere. Goes out: text and JSON. What is said of a trend
//! is said once, here; the drawing shows the same numbers.

use chrono::{DateTime, FixedOffset};
use serde_json::{Value, json};

use super::layout::{table, wrapped};
use super::number::{Plain, fixed, shortest, value_and_u};
use super::registers::{self, ShownEntry};
use super::run_list::{ListedRun, verdict_text};
use super::{Units, json_text};
use crate::bench::trend::{FEWEST_RUNS, Leaving, Trend};
use crate::entry::{Purpose, RunNumber};
use crate::gas::Species;

/// |E_n| above this says that two runs differ by more than their uncertainties explain (ISO/IEC 17043:2010, B.4.1.1).
pub const EN_LIMIT: f64 = 1.0;

/// So many steps are named; of more, the number is said.
const STEPS_NAMED: usize = 3;

/// A run of the history.
#[derive(Debug, Clone, PartialEq)]
pub struct HistoryRow {
    /// The run as it is listed.
    pub listed: ListedRun,
    /// The accepted run it was compared with and E_n against it, as stored with its judgement.
    pub against: Option<(RunNumber, f64)>,
}

/// The history of an orifice.
#[derive(Debug, Clone, PartialEq)]
pub struct OrificeHistory {
    /// The newest runs, those taken last first.
    pub runs: Vec<HistoryRow>,
    /// Whether there are older runs than those.
    pub more: bool,
    /// Gas and nominal pressure (bar gauge) of the newest accepted run, to which the trend belongs.
    pub of: Option<(Species, f64)>,
    /// The trend through the accepted runs of that gas and pressure.
    pub trend: Option<Trend>,
    /// Limits of the newest of them, L/min.
    pub limits_l_min: Option<(f64, f64)>,
    /// When the trend leaves them if it goes on.
    pub leaves: Option<Leaving>,
    /// Accepted runs in another gas or at another pressure, which the trend does not go through.
    pub others: usize,
    /// Accepted runs that are older than those the trend was looked for in.
    pub unread: bool,
}

impl OrificeHistory {
    /// What a person should look after, a sentence each: a trend that chance does not explain, and steps from one run to
    /// the next that their uncertainties do not.
    #[must_use]
    pub fn warnings(&self, units: &Units) -> Vec<String> {
        let steps = [false, true].map(|rose| self.steps_warning(rose));
        self.trend_warning(units).into_iter().chain(steps.into_iter().flatten()).collect()
    }

    /// Steps one way from a run to the next that their uncertainties do not explain, the newest first.
    fn steps_warning(&self, rose: bool) -> Option<String> {
        let since = self.trend.as_ref().map(|trend| trend.from);
        let step = |row: &HistoryRow| {
            let (before, en) = row.against.filter(|(_, en)| en.abs() > EN_LIMIT && (*en > 0.0) == rose)?;
            // After work on the orifice a change is what the work was for, and what was before it is over.
            let worked_on = row.listed.purpose == Purpose::AsLeft;
            let is_over = since.is_some_and(|since| row.listed.taken <= since);
            (!worked_on && !is_over)
                .then(|| format!("from {before} to {} (E_n {})", row.listed.number, fixed(en, 2)))
        };
        let steps: Vec<String> = self.runs.iter().filter_map(step).collect();
        let more = match steps.len().saturating_sub(STEPS_NAMED) {
            0 => String::new(),
            n => format!(", and {n} times before"),
        };
        let (how, why) = if rose {
            ("rose", "wear, a leak past the orifice, or an earlier blockage that came loose")
        } else {
            ("fell", "dirt, a blocked filter, or a leak before the meter")
        };
        let named: Vec<String> = steps.into_iter().take(STEPS_NAMED).collect();
        (!named.is_empty()).then(|| {
            format!(
                "the flow {how} by more than both uncertainties explain {}{more}: look for {why}",
                named.join(", ")
            )
        })
    }

    fn trend_warning(&self, units: &Units) -> Option<String> {
        let trend = self.trend.as_ref().filter(|trend| trend.is_significant())?;
        let falls = trend.per_year() < 0.0;
        let what = if falls { "falls" } else { "rises" };
        let why = if falls {
            "the orifice is clogging"
        } else {
            "the orifice is wearing, or something leaks past it"
        };
        let mut text = format!("the flow {what} by {}: more than chance explains, {why}", slope(trend));
        let limit = self.limits_l_min.map(|(low, high)| units.flow_text(if falls { low } else { high }));
        match (self.leaves, limit) {
            (Some(Leaving::Already), Some(limit)) => {
                text.push_str(&format!(
                    ". The line is past the acceptance limit of {limit} already: take it out of use, clean or replace it"
                ));
            }
            (Some(Leaving::At { about, not_before }), Some(limit)) => {
                text.push_str(&format!(
                    ". If it goes on, it passes the acceptance limit of {limit} about {}, and not before {}: clean or \
                     replace it before then",
                    day(about),
                    day(not_before)
                ));
            }
            (None, Some(_)) => {
                text.push_str("; at this pace it stays within the acceptance limits for ten years")
            }
            _ => {}
        }
        Some(text)
    }
}

/// "1.9 % a year (95 %: 1.2 % to 2.6 %)", without its sign.
fn slope(trend: &Trend) -> String {
    let (value, u) = value_and_u((trend.per_year() * 100.0).abs(), trend.per_year_expanded() * 100.0);
    if u.is_empty() { format!("{value} % a year") } else { format!("{value} ± {u} % a year (95 %)") }
}

fn day(time: DateTime<FixedOffset>) -> String {
    time.format("%Y-%m-%d").to_string()
}

/// Entry and history as text.
#[must_use]
pub fn text(entry: &ShownEntry, history: &OrificeHistory, units: &Units) -> String {
    let mut text = registers::text(entry, units);
    text.push('\n');
    for warning in history.warnings(units) {
        text.push_str(&wrapped("WARNING: ", "  ", &warning));
    }
    text.push_str(&trend_text(history, units));
    text.push_str(&runs_text(history, units));
    text
}

fn trend_text(history: &OrificeHistory, units: &Units) -> String {
    let Some((gas, ip_bar)) = history.of else { return String::new() };
    let of = format!("{} at {} IP", gas.name(), units.pressure_text(ip_bar));
    let mut text = match &history.trend {
        None => wrapped(
            "Trend: ",
            "  ",
            &format!(
                "none yet; it needs {FEWEST_RUNS} accepted runs of {of} since the orifice was last worked on"
            ),
        ),
        Some(trend) => {
            let sign = if trend.per_year() < 0.0 { "−" } else { "+" };
            let chance = if trend.is_significant() {
                "more than chance explains"
            } else {
                "no more than chance explains"
            };
            let widened =
                if trend.widened > 1.0 { "; widened, as the runs scatter more than they should" } else { "" };
            wrapped(
                "Trend: ",
                "  ",
                &format!(
                    "{sign}{} through {} runs of {of} from {} to {}, {chance} ({}){widened}",
                    slope(trend),
                    trend.runs,
                    day(trend.from),
                    day(trend.to),
                    p_value(trend.p)
                ),
            )
        }
    };
    if history.others > 0 {
        let runs = if history.others == 1 { "accepted run" } else { "accepted runs" };
        let line = format!("{} {runs} in another gas or at another IP left aside", history.others);
        text.push_str(&wrapped("  ", "  ", &line));
    }
    if history.unread {
        text.push_str("  Runs older than those shown were not looked at: --all takes every one.\n");
    }
    text
}

fn p_value(p: f64) -> String {
    if p < 0.001 { "p under 0.001".to_owned() } else { format!("p = {}", shortest(p, 2)) }
}

fn runs_text(history: &OrificeHistory, units: &Units) -> String {
    if history.runs.is_empty() {
        return "No runs of it yet: bench enter, bench log, or bench import FILE.toml.\n".to_owned();
    }
    let row = |row: &HistoryRow| {
        let run = &row.listed;
        let (ip, flow, u, verdict) = match &run.judged {
            Some(judged) => {
                let (value, u) =
                    value_and_u(units.flow(judged.flow_l_min), units.flow(judged.expanded_l_min));
                (fixed(units.pressure(judged.ip_bar), 1), value, u, verdict_text(judged))
            }
            None if run.open => (String::new(), String::new(), String::new(), "open".to_owned()),
            None => (String::new(), String::new(), String::new(), "not judged".to_owned()),
        };
        vec![
            run.number.to_string(),
            day(run.taken),
            run.purpose.name().to_owned(),
            run.gas.name().to_owned(),
            ip,
            flow,
            u,
            row.against.map(|(_, en)| fixed(en, 2)).unwrap_or_default(),
            row.against.map(|(run, _)| run.to_string()).unwrap_or_default(),
            verdict,
        ]
    };
    let (p, q) = (units.pressure_symbol(), units.flow_symbol());
    let mut text = table(
        &["run", "taken", "purpose", "gas", "IP", "flow", "± U", "E_n", "to", "verdict"],
        &["", "", "", "", p, q, q, "", "", ""],
        &history.runs.iter().map(row).collect::<Vec<_>>(),
        true,
    );
    let about = "Flow STPD at the nominal IP over 1.01325 bar, U for 95 %, as judged; E_n to the accepted run before, without \
                 what both owe to the same certificate.";
    text.push_str(&wrapped("  ", "  ", about));
    if history.more {
        text.push_str(&format!("  The newest {} are shown: --all shows every one.\n", history.runs.len()));
    }
    text
}

/// Entry and history as JSON.
#[must_use]
pub fn json(entry: &ShownEntry, history: &OrificeHistory) -> String {
    let mut value = registers::json_value(entry);
    if let Some(object) = value.as_object_mut() {
        object.insert("runs".into(), history.runs.iter().map(run_json).collect());
        object.insert("more_runs".into(), history.more.into());
        object.insert(
            "trend".into(),
            history.trend.as_ref().map_or(Value::Null, |trend| trend_json(history, trend)),
        );
        object.insert("warnings".into(), history.warnings(&Units::default()).into());
    }
    json_text(&value)
}

fn run_json(row: &HistoryRow) -> Value {
    let run = &row.listed;
    let judged = run.judged.as_ref();
    json!({
        "run": run.number.to_string(),
        "taken": run.taken.to_rfc3339(),
        "purpose": run.purpose.name(),
        "gas": run.gas.name(),
        "open": run.open,
        "verdict": judged.map(|judged| judged.verdict.name()),
        "method": judged.map(|judged| judged.method_revision),
        "ip_bar_gauge": judged.map(|judged| Plain(judged.ip_bar)),
        "flow_l_min": judged.map(|judged| Plain(judged.flow_l_min)),
        "expanded": judged.map(|judged| Plain(judged.expanded_l_min)),
        "e_n": row.against.map(|(_, en)| Plain(en)),
        "e_n_against": row.against.map(|(run, _)| run.to_string()),
    })
}

fn trend_json(history: &OrificeHistory, trend: &Trend) -> Value {
    let (per_year, expanded) = (trend.per_year() * 100.0, trend.per_year_expanded() * 100.0);
    let (about, not_before) = match history.leaves {
        Some(Leaving::At { about, not_before }) => (Some(about), Some(not_before)),
        _ => (None, None),
    };
    json!({
        "runs": trend.runs,
        "gas": history.of.map(|(gas, _)| gas.name()),
        "ip_bar_gauge": history.of.map(|(_, ip)| Plain(ip)),
        "from": trend.from.to_rfc3339(),
        "to": trend.to.to_rfc3339(),
        "percent_per_year": Plain(per_year),
        "interval_95": [Plain(per_year - expanded), Plain(per_year + expanded)],
        "degrees_of_freedom": Plain(trend.dof),
        "widened": Plain(trend.widened),
        "p": Plain(trend.p),
        "significant": trend.is_significant(),
        "outside_limits": history.leaves == Some(Leaving::Already),
        "leaves_limits_about": about.map(day),
        "leaves_limits_not_before": not_before.map(day),
    })
}
