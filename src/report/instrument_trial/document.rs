//! A trial as JSON.

use serde::Serialize;

use super::raw::{escaped, hexadecimal};
use super::{TrialShown, summary};
use crate::entry::Socket;
use crate::report::json_text;

/// The trial as a document; values in the units they were shown in, bytes escaped.
#[must_use]
pub fn json(trial: &TrialShown) -> String {
    let (port, usb) = match &trial.instrument.socket {
        Some(Socket::Port(name)) => (Some(name.as_str()), None),
        Some(Socket::Usb(identity)) => (None, Some(identity.as_str())),
        None => (None, None),
    };
    json_text(&Document {
        format: 1,
        instrument: trial.instrument.id.as_str(),
        measures: trial.instrument.measures.name(),
        port,
        usb,
        baud: trial.baud,
        frame: &trial.frame,
        reads_well: trial.reads_well(),
        says: summary(trial),
        listened_s: trial.listened_s,
        bytes: trial.bytes,
        raw: escaped(&trial.raw),
        readings: trial.readings.len(),
        rate_per_s: trial.rate_per_s,
        outside_range: trial.outside_range,
        values: trial
            .readings
            .iter()
            .map(|reading| Value { at_s: reading.at_s, value: reading.shown, unit: reading.unit })
            .collect(),
        faults: trial
            .faults
            .iter()
            .map(|fault| Fault {
                fault: fault.kind.name(),
                times: fault.times,
                says: fault.kind.says(),
                bytes: escaped(&fault.example),
                hexadecimal: hexadecimal(&fault.example),
            })
            .collect(),
        lost: trial.lost.as_deref(),
        proposals: trial
            .proposals
            .iter()
            .map(|proposal| Proposal {
                says: proposal.says(),
                changes: proposal
                    .changes
                    .iter()
                    .map(|change| Change { key: change.key, from: change.from.as_deref(), to: &change.to })
                    .collect(),
                command: proposal.command(trial),
                lines: proposal.lines(),
                readings: proposal.readings,
                faults: proposal.faults,
            })
            .collect(),
    })
}

#[derive(Serialize)]
struct Document<'a> {
    format: u32,
    instrument: &'a str,
    measures: &'static str,
    port: Option<&'a str>,
    usb: Option<&'a str>,
    baud: u32,
    frame: &'a str,
    reads_well: bool,
    says: String,
    listened_s: f64,
    bytes: u64,
    raw: String,
    readings: usize,
    rate_per_s: Option<f64>,
    outside_range: usize,
    values: Vec<Value>,
    faults: Vec<Fault>,
    lost: Option<&'a str>,
    proposals: Vec<Proposal<'a>>,
}

#[derive(Serialize)]
struct Value {
    at_s: f64,
    value: f64,
    unit: &'static str,
}

#[derive(Serialize)]
struct Fault {
    fault: &'static str,
    times: usize,
    says: String,
    bytes: String,
    hexadecimal: String,
}

#[derive(Serialize)]
struct Proposal<'a> {
    says: String,
    changes: Vec<Change<'a>>,
    command: Option<String>,
    lines: Vec<String>,
    readings: usize,
    faults: usize,
}

#[derive(Serialize)]
struct Change<'a> {
    key: &'static str,
    from: Option<&'a str>,
    to: &'a str,
}
