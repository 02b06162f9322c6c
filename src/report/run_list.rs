//! Runs of the book in a list: what was stored with the judgement, not what would come out today.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;

use super::Units;
use super::layout::{shortened, table};
use super::number::{Plain, fixed, value_and_u};
use crate::bench::METHOD_REVISION;
use crate::entry::{Purpose, RunNumber, StoredVerdict};
use crate::gas::Species;

/// Longest name of an orifice and of a technician in the table, in columns.
const NAME: usize = 16;

/// One run of a list.
#[derive(Debug, Clone, PartialEq)]
pub struct ListedRun {
    /// Its number.
    pub number: RunNumber,
    /// Its orifice.
    pub orifice: String,
    /// Its gas.
    pub gas: Species,
    /// Why it was made.
    pub purpose: Purpose,
    /// When it was taken.
    pub taken: DateTime<FixedOffset>,
    /// Who took it.
    pub technician: Option<String>,
    /// Whether points may still come.
    pub open: bool,
    /// The judgement that holds.
    pub judged: Option<ListedJudgement>,
}

/// A judgement in a list, with the figures stored with it.
#[derive(Debug, Clone, PartialEq)]
pub struct ListedJudgement {
    /// The verdict.
    pub verdict: StoredVerdict,
    /// Revision of the method that made the figures.
    pub method_revision: u32,
    /// Nominal intermediate pressure, bar gauge.
    pub ip_bar: f64,
    /// Flow there, L/min STPD.
    pub flow_l_min: f64,
    /// Its expanded uncertainty at 95 %, L/min.
    pub expanded_l_min: f64,
    /// When it was made.
    pub at: DateTime<FixedOffset>,
}

/// The list as a table; `more` says that older runs are not shown.
#[must_use]
pub fn text(runs: &[ListedRun], more: bool, units: &Units) -> String {
    if runs.is_empty() {
        return "No runs in the book yet: bench import FILE.toml, or bench enter ORIFICE.\n".to_owned();
    }
    let rows: Vec<Vec<String>> = runs
        .iter()
        .map(|run| {
            let (ip, flow, u, verdict) = match &run.judged {
                Some(j) => {
                    let (value, u) = value_and_u(units.flow(j.flow_l_min), units.flow(j.expanded_l_min));
                    (fixed(units.pressure(j.ip_bar), 1), value, u, verdict_text(j))
                }
                None if run.open => (String::new(), String::new(), String::new(), "open".to_owned()),
                None => (String::new(), String::new(), String::new(), "not judged".to_owned()),
            };
            vec![
                run.number.to_string(),
                shortened(&run.orifice, NAME),
                run.taken.format("%Y-%m-%d").to_string(),
                run.purpose.name().to_owned(),
                run.gas.name().to_owned(),
                ip,
                flow,
                u,
                verdict,
            ]
        })
        .collect();
    let mut text = table(
        &["run", "orifice", "taken", "purpose", "gas", "IP", "flow", "± U", "verdict"],
        &["", "", "", "", "", units.pressure_symbol(), units.flow_symbol(), units.flow_symbol(), ""],
        &rows,
        true,
    );
    text.push_str("  Flow STPD (0 °C, 101.325 kPa, dry) at nominal IP and 1.01325 bar; U for 95 %\n");
    if more {
        text.push_str("  Older runs are not shown: --all shows every run.\n");
    }
    text
}

/// The list as JSON.
#[must_use]
pub fn json(runs: &[ListedRun]) -> String {
    let rows: Vec<Row> = runs.iter().map(Row::of).collect();
    super::json_text(&rows)
}

/// A verdict, with the revision of its method where that is not today's.
#[must_use]
pub fn verdict_text(judged: &ListedJudgement) -> String {
    if judged.method_revision == METHOD_REVISION {
        judged.verdict.name().to_owned()
    } else {
        format!("{} (method {})", judged.verdict.name(), judged.method_revision)
    }
}

/// A run in JSON; also part of what `bench show` writes.
#[derive(Debug, Serialize)]
pub(super) struct Row {
    run: String,
    orifice: String,
    gas: &'static str,
    purpose: &'static str,
    taken: String,
    technician: Option<String>,
    open: bool,
    verdict: Option<&'static str>,
    method: Option<u32>,
    ip_bar_gauge: Option<Plain>,
    flow_l_min: Option<Plain>,
    expanded: Option<Plain>,
    judged: Option<String>,
}

impl Row {
    pub(super) fn of(run: &ListedRun) -> Self {
        let judged = run.judged.as_ref();
        Self {
            run: run.number.to_string(),
            orifice: run.orifice.clone(),
            gas: run.gas.name(),
            purpose: run.purpose.name(),
            taken: run.taken.to_rfc3339(),
            technician: run.technician.clone(),
            open: run.open,
            verdict: judged.map(|j| j.verdict.name()),
            method: judged.map(|j| j.method_revision),
            ip_bar_gauge: judged.map(|j| Plain(j.ip_bar)),
            flow_l_min: judged.map(|j| Plain(j.flow_l_min)),
            expanded: judged.map(|j| Plain(j.expanded_l_min)),
            judged: judged.map(|j| j.at.to_rfc3339()),
        }
    }
}
