//! The entries of a register in a table: the few keys by which one finds the one that is meant.

use chrono::NaiveDate;
use serde_json::{Value, json};

use super::rows::{diluent, quantity, rule, tolerance, uncertain};
use super::show::revision_json;
use super::{AnyEntry, EntryList, ListedEntry};
use crate::entry::{Instrument, InstrumentPapers, Socket};
use crate::report::layout::shortened;
use crate::report::layout::{WIDTH, columns, wrapped};
use crate::report::run_list::{ListedRun, verdict_text};
use crate::report::{Units, json_text};

/// Longest words of a person in a column that is not the last.
const WORDS: usize = 16;
/// The last column has so much room at least, even where lines then grow longer than 80 columns.
const LEAST_LAST: usize = 12;

/// The list as text.
#[must_use]
pub fn text(list: &EntryList, units: &Units) -> String {
    let Some(first) = list.entries.first() else {
        let command = list.command;
        let text = format!(
            "No {} in the register yet: {command} add FILE.toml, or {command} add ID.",
            list.register
        );
        return wrapped("", "  ", &text);
    };
    let heads = heads(&first.now.entry);
    let rows: Vec<Vec<String>> = list.entries.iter().map(|entry| row(entry, list.today, units)).collect();
    let mut text = left_table(heads, &rows);
    let shown = list.entries.len() as u64;
    if shown < list.all {
        text.push_str(&format!("  {shown} of {} are shown: --all shows every one.\n", list.all));
    }
    text
}

/// The list as JSON.
#[must_use]
pub fn json(list: &EntryList) -> String {
    let each = |listed: &ListedEntry| {
        let mut value = revision_json(&listed.now);
        if let (AnyEntry::Orifice(_), Some(object)) = (&listed.now.entry, value.as_object_mut()) {
            object.insert("last_run".into(), listed.last_run.as_ref().map_or(Value::Null, run_json));
        }
        value
    };
    json_text(&list.entries.iter().map(each).collect::<Vec<_>>())
}

fn run_json(run: &ListedRun) -> Value {
    json!({
        "run": run.number.to_string(),
        "taken": run.taken.to_rfc3339(),
        "verdict": run.judged.as_ref().map(|judged| judged.verdict.name()),
    })
}

const fn heads(entry: &AnyEntry) -> &'static [&'static str] {
    match entry {
        AnyEntry::Orifice(_) => &["orifice", "last run", "taken", "verdict", "customer", "description"],
        AnyEntry::Instrument(_) => &["instrument", "measures", "where", "due", "certificate"],
        AnyEntry::FirstStage(_) => &["first stage", "compensated", "IP range", "division", "maker"],
        AnyEntry::Diver(_) => &["diver", "mass", "loop volume", "diluent", "name"],
        AnyEntry::Acceptance(_) => &["acceptance", "IP", "flow (STPD)", "tolerance", "rule"],
        AnyEntry::Shop(_) => &["shop", "address"],
    }
}

fn row(listed: &ListedEntry, today: NaiveDate, units: &Units) -> Vec<String> {
    let text = |text: Option<&str>| shortened(text.unwrap_or_default(), WORDS);
    let whole = |text: Option<&str>| text.unwrap_or_default().to_owned();
    let name = listed.now.entry.name().to_owned();
    match &listed.now.entry {
        AnyEntry::Orifice(entry) => {
            let run = listed.last_run.as_ref();
            vec![
                name,
                run.map(|run| run.number.to_string()).unwrap_or_default(),
                run.map(|run| run.taken.format("%Y-%m-%d").to_string()).unwrap_or_default(),
                run.map(verdict).unwrap_or_default(),
                text(entry.customer.as_deref()),
                whole(entry.description.as_deref()),
            ]
        }
        AnyEntry::Instrument(entry) => {
            let (due, certificate) = papers(entry, today);
            let place = match &entry.socket {
                Some(Socket::Port(place) | Socket::Usb(place)) => place.as_str(),
                None => "read by eye",
            };
            vec![name, entry.measures.name().to_owned(), shortened(place, 2 * WORDS), due, certificate]
        }
        AnyEntry::FirstStage(entry) => {
            let (low, high) = entry.ip_range;
            vec![
                name,
                if entry.compensated { "yes" } else { "no" }.to_owned(),
                format!("{} to {}", quantity(low, units), quantity(high, units)),
                quantity(entry.division, units),
                whole(entry.maker.as_deref()),
            ]
        }
        AnyEntry::Diver(entry) => vec![
            name,
            entry.mass.map(|mass| quantity(mass, units)).unwrap_or_default(),
            entry.loop_volume.map(|volume| uncertain(volume, units)).unwrap_or_default(),
            entry.diluent.map(diluent).unwrap_or_default(),
            whole(entry.name.as_deref()),
        ],
        AnyEntry::Acceptance(entry) => vec![
            name,
            quantity(entry.ip, units),
            quantity(entry.flow, units),
            tolerance(entry.tolerance, units),
            rule(entry.rule).to_owned(),
        ],
        AnyEntry::Shop(entry) => vec![text(Some(&entry.name)), entry.address.replace('\n', ", ")],
    }
}

fn verdict(run: &ListedRun) -> String {
    match &run.judged {
        Some(judged) => verdict_text(judged),
        None if run.open => "open".to_owned(),
        None => "not judged".to_owned(),
    }
}

/// When the calibration is due, and its certificate.
fn papers(entry: &Instrument, today: NaiveDate) -> (String, String) {
    let (due, certificate) = match &entry.papers {
        Some(InstrumentPapers::Meter(meter)) => (meter.papers.due, &meter.papers.certificate),
        Some(InstrumentPapers::Transducer(transducer)) => {
            (transducer.papers.due, &transducer.papers.certificate)
        }
        None => return ("no papers".to_owned(), String::new()),
    };
    let due = match due {
        Some(due) if due < today => format!("{due} OVERDUE"),
        Some(due) => due.to_string(),
        None => "not stated".to_owned(),
    };
    (due, certificate.clone().unwrap_or_default())
}

/// A table whose columns all begin at the left; the last one is cut to what is left of a line.
fn left_table(heads: &[&str], rows: &[Vec<String>]) -> String {
    let last = heads.len().saturating_sub(1);
    let width = |i: usize| {
        let cells = rows.iter().filter_map(|row| row.get(i)).map(|cell| columns(cell));
        cells.chain([columns(heads[i])]).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..last).map(width).collect();
    let before: usize = widths.iter().map(|width| width + 2).sum::<usize>() + 2;
    let room = WIDTH.saturating_sub(before).max(LEAST_LAST);
    let line = |cells: &[&str]| {
        let mut text = String::from("  ");
        for (cell, width) in cells.iter().zip(&widths) {
            text.push_str(cell);
            text.push_str(&" ".repeat(width.saturating_sub(columns(cell)) + 2));
        }
        text.push_str(&shortened(cells.last().copied().unwrap_or_default(), room));
        text.trim_end().to_owned() + "\n"
    };
    let mut text = line(heads);
    for row in rows {
        text.push_str(&line(&row.iter().map(String::as_str).collect::<Vec<_>>()));
    }
    text
}
