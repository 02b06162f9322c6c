//! Judgements and changes of runs: numbers, times and fixed words as CSV, what a person typed as TOML.

use chrono::{DateTime, FixedOffset};
use serde::Serialize;

use super::toml_text;
use crate::book::{Change, RunRecord};
use crate::entry::{Decision, Indication};

/// The tables while runs are taken in.
#[derive(Default)]
pub(super) struct Sheets {
    /// Each with its time, by which they are put in order.
    judgements: Vec<(DateTime<FixedOffset>, Vec<String>)>,
    parts: Vec<Vec<String>>,
    changes: Vec<Vec<String>>,
    texts: Texts,
}

#[derive(Default, Serialize)]
struct Texts {
    #[serde(skip_serializing_if = "Vec::is_empty")]
    judgement: Vec<JudgementText>,
    #[serde(skip_serializing_if = "Vec::is_empty")]
    change: Vec<ChangeText>,
}

#[derive(Serialize)]
struct JudgementText {
    run: String,
    judgement: usize,
    #[serde(skip_serializing_if = "Option::is_none")]
    by: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    remark: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    meter_certificate: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    transducer_certificate: Option<String>,
}

#[derive(Serialize)]
struct ChangeText {
    run: String,
    change: usize,
    #[serde(skip_serializing_if = "Option::is_none")]
    why: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    by: Option<String>,
}

const JUDGEMENTS: [&str; 20] = [
    "run",
    "judgement",
    "at",
    "verdict",
    "method",
    "gas",
    "ip_pa_gauge",
    "p1_bar_abs",
    "flow_l_min",
    "u_l_min",
    "degrees_of_freedom",
    "coverage_factor",
    "lower_l_min",
    "upper_l_min",
    "conformity_probability",
    "failed_checks",
    "points_used",
    "against",
    "e_n",
    "out_of_date",
];
const PARTS: [&str; 5] = ["run", "judgement", "source", "u_l_min", "degrees_of_freedom"];
const CHANGES: [&str; 8] = [
    "run",
    "change",
    "at",
    "what",
    "point",
    "before_pressure_pa",
    "before_pressure_is",
    "before_flow_shown_l_min",
];

impl Sheets {
    /// Takes in a run.
    pub(super) fn take(&mut self, record: &RunRecord) {
        let run = record.number.to_string();
        let last = record.decisions.len();
        for (place, decision) in record.decisions.iter().enumerate() {
            let stale = place + 1 == last && record.changed_since_decision;
            self.judgement(&run, place + 1, decision, stale);
        }
        for (place, change) in record.changes.iter().enumerate() {
            self.change(&run, place + 1, change);
        }
    }

    /// How many judgements were taken in.
    pub(super) fn judgements(&self) -> usize {
        self.judgements.len()
    }

    fn judgement(&mut self, run: &str, number: usize, decision: &Decision, stale: bool) {
        let figures = &decision.figures;
        let (lower, upper) = figures.limits_l_min.unzip();
        let (against, en) = figures.against.unzip();
        let row = vec![
            run.to_owned(),
            number.to_string(),
            decision.at.to_rfc3339(),
            decision.verdict.name().to_owned(),
            figures.method_revision.to_string(),
            figures.gas.name().to_owned(),
            digits(figures.ip.as_pa()),
            digits(figures.p1_bar),
            digits(figures.flow_l_min),
            digits(figures.standard_uncertainty_l_min),
            digits(figures.dof),
            digits(figures.coverage_factor),
            some(lower),
            some(upper),
            some(figures.conformity_probability),
            figures.failed_checks.join("; "),
            figures.points_used.to_string(),
            against.map(|run| run.to_string()).unwrap_or_default(),
            some(en),
            if stale { "yes" } else { "no" }.to_owned(),
        ];
        self.judgements.push((decision.at, row));
        for part in &figures.parts {
            let (u, dof) = (digits(part.u_l_min), digits(part.dof));
            self.parts.push(vec![run.to_owned(), number.to_string(), part.source.clone(), u, dof]);
        }
        let text = JudgementText {
            run: run.to_owned(),
            judgement: number,
            by: decision.by.clone(),
            remark: decision.remark.clone(),
            meter_certificate: figures.meter_certificate.clone(),
            transducer_certificate: figures.transducer_certificate.clone(),
        };
        let said = [&text.by, &text.remark, &text.meter_certificate, &text.transducer_certificate];
        if said.iter().any(|text| text.is_some()) {
            self.texts.judgement.push(text);
        }
    }

    fn change(&mut self, run: &str, number: usize, change: &Change) {
        let (at, what, point, before, why, by) = match change {
            Change::Corrected { point, before, at } => {
                (at, "corrected", Some(point), Some(before), None, None)
            }
            Change::Struck { point, why, at } => (at, "struck", Some(point), None, Some(why), None),
            Change::Restated { at } => (at, "restated", None, None, None, None),
            Change::LeftOut { point, why, by, at } => {
                (at, "left out", Some(point), None, Some(why), by.as_ref())
            }
        };
        let is = before.map(|before| match before.pressure {
            Indication::Gauge(_) => "gauge",
            Indication::Absolute(_) => "absolute",
        });
        self.changes.push(vec![
            run.to_owned(),
            number.to_string(),
            at.to_rfc3339(),
            what.to_owned(),
            point.map(ToString::to_string).unwrap_or_default(),
            some(before.map(|before| before.pressure.shown_pa())),
            is.unwrap_or_default().to_owned(),
            some(before.map(|before| before.flow.as_l_min())),
        ]);
        if why.is_some() || by.is_some() {
            let (why, by) = (why.cloned(), by.cloned());
            self.texts.change.push(ChangeText { run: run.to_owned(), change: number, why, by });
        }
    }

    /// The files by their names; judgements in the order they were made.
    pub(super) fn files(mut self) -> Vec<(&'static str, Vec<u8>)> {
        self.judgements.sort_by_key(|(at, _)| *at);
        let judgements: Vec<Vec<String>> = self.judgements.into_iter().map(|(_, row)| row).collect();
        vec![
            ("judgements.csv", sheet(&JUDGEMENTS, &judgements)),
            ("parts.csv", sheet(&PARTS, &self.parts)),
            ("changes.csv", sheet(&CHANGES, &self.changes)),
            ("texts.toml", toml_text(&self.texts).into_bytes()),
        ]
    }
}

fn sheet(heads: &[&str], rows: &[Vec<String>]) -> Vec<u8> {
    // No cell holds a comma, a quote or a line break: they are numbers, times, and words of this program.
    let mut text = heads.join(",") + "\n";
    for row in rows {
        text.push_str(&row.join(","));
        text.push('\n');
    }
    text.into_bytes()
}

/// A number in the fewest digits that come back to the last bit.
fn digits(x: f64) -> String {
    if x.is_nan() {
        String::new()
    } else if x.is_infinite() {
        "infinite".to_owned()
    } else {
        x.to_string()
    }
}

fn some(x: Option<f64>) -> String {
    x.map(digits).unwrap_or_default()
}
