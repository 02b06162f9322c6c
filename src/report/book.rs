//! The record file: what it holds, whether it holds, and copies of it.

use std::fmt::Write as _;

use chrono::{DateTime, FixedOffset};
use serde_json::json;

use super::json_text;
use super::layout::{counted, wrapped};
use super::typed::tame;
use crate::entry::SessionNumber;

/// What a book holds.
#[derive(Debug, Clone, PartialEq)]
pub struct BookInfo {
    /// Where it is.
    pub path: String,
    /// Version of its form.
    pub form: u32,
    /// When it was begun.
    pub begun: DateTime<FixedOffset>,
    /// Records in its chain.
    pub records: u64,
    /// Its runs.
    pub runs: u64,
    /// Its sessions, but for those that were erased.
    pub sessions: u64,
    /// Its certificates.
    pub certificates: u64,
    /// Names in each register, with the words for the register.
    pub entries: Vec<(&'static str, u64)>,
    /// Records whose content was erased.
    pub erased: u64,
    /// What was erased, in its order.
    pub erasures: Vec<Erasure>,
    /// Whether an erasure has yet to be carried through.
    pub erasure_unfinished: bool,
    /// Copies that were made: what, where, when.
    pub copies: Vec<(&'static str, String, DateTime<FixedOffset>)>,
    /// The head of its chain.
    pub head: String,
    /// Size of the file in bytes.
    pub bytes: u64,
}

impl BookInfo {
    /// Bytes for each run; none without a run.
    #[must_use]
    pub const fn bytes_per_run(&self) -> Option<u64> {
        self.bytes.checked_div(self.runs)
    }
}

/// Something that was erased, as the chain tells it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Erasure {
    /// Its place in the chain.
    pub record: u64,
    /// When.
    pub at: DateTime<FixedOffset>,
    /// Why.
    pub why: String,
    /// How many records.
    pub records: usize,
    /// The sessions among them; their numbers are never given again.
    pub sessions: Vec<SessionNumber>,
}

/// What a check found.
#[derive(Debug, Clone, PartialEq)]
pub struct BookCheck {
    /// Where the book is.
    pub path: String,
    /// Records that were walked.
    pub records: u64,
    /// Runs among them.
    pub runs: u64,
    /// Sessions among them, but for those that were erased.
    pub sessions: u64,
    /// What was erased, in its order.
    pub erasures: Vec<Erasure>,
    /// End of the chain, as far as it holds.
    pub head: String,
    /// Heads that were kept elsewhere and looked for.
    pub heads: usize,
    /// The first thing that is wrong.
    pub wrong: Option<String>,
}

/// A copy of the book that was made.
#[derive(Debug, Clone, PartialEq)]
pub struct Backup {
    /// Where it is.
    pub path: String,
    /// What the check of the copy found.
    pub check: BookCheck,
}

/// What the book holds, as text.
#[must_use]
pub fn info_text(info: &BookInfo) -> String {
    let mut text = wrapped("", "  ", &info.path);
    let mut row = |label: &str, says: &str| {
        text.push_str(&wrapped(&format!("  {label:<18}"), &" ".repeat(20), says));
    };
    row("form", &info.form.to_string());
    row("begun", &info.begun.to_rfc3339());
    row("records", &info.records.to_string());
    row("runs", &info.runs.to_string());
    row("sessions", &info.sessions.to_string());
    row("certificates", &info.certificates.to_string());
    for (register, count) in &info.entries {
        row(register, &count.to_string());
    }
    row("size", &size(info.bytes));
    if let Some(each) = info.bytes_per_run() {
        row("size per run", &size(each));
    }
    let erased = match (info.erased, info.erasure_unfinished) {
        (0, false) => "nothing".to_owned(),
        (n, false) => counted(n, "record"),
        (n, true) => format!("{}, not yet carried through: give diver forget again", counted(n, "record")),
    };
    row("erased", &erased);
    for erasure in &info.erasures {
        row("", &erasure_line(erasure));
    }
    for (kind, place, at) in &info.copies {
        row("copy", &format!("{kind} of {}: {place}", at.to_rfc3339()));
    }
    // A head is one word of 70 letters, which a certificate or a notebook takes over as it stands.
    let _ = writeln!(text, "  head of the chain\n    {}", info.head);
    text
}

/// What the book holds, as JSON.
#[must_use]
pub fn info_json(info: &BookInfo) -> String {
    let entries: serde_json::Map<String, serde_json::Value> =
        info.entries.iter().map(|(name, count)| (name.replace(' ', "_"), (*count).into())).collect();
    let copy = |(kind, place, at): &(&str, String, DateTime<FixedOffset>)| json!({ "kind": kind, "place": place, "at": at.to_rfc3339() });
    json_text(&json!({
        "path": info.path,
        "form": info.form,
        "begun": info.begun.to_rfc3339(),
        "records": info.records,
        "runs": info.runs,
        "sessions": info.sessions,
        "certificates": info.certificates,
        "entries": entries,
        "erased_records": info.erased,
        "erasures": info.erasures.iter().map(erasure_value).collect::<Vec<_>>(),
        "erasure_unfinished": info.erasure_unfinished,
        "copies": info.copies.iter().map(copy).collect::<Vec<_>>(),
        "head": info.head,
        "size_bytes": info.bytes,
        "size_per_run_bytes": info.bytes_per_run(),
    }))
}

/// What the check found, in one sentence.
#[must_use]
pub fn check_line(check: &BookCheck) -> String {
    match &check.wrong {
        None => {
            let (records, runs) = (counted(check.records, "record"), counted(check.runs, "run"));
            let sessions = counted(check.sessions, "session");
            format!("holds: {records}, {runs}, {sessions}, from the first to the last")
        }
        Some(wrong) => format!("does not hold: {wrong}"),
    }
}

/// What the check found, as text.
#[must_use]
pub fn check_text(check: &BookCheck) -> String {
    let mut text = wrapped("", "  ", &format!("{} {}", check.path, check_line(check)));
    if check.wrong.is_some() {
        let line = format!(
            "the first {} records are as they were recorded; the file was left as it is",
            check.records
        );
        text.push_str(&wrapped("  ", "  ", &line));
        return text;
    }
    match check.heads {
        0 => text.push_str(&wrapped(
            "  ",
            "  ",
            "Whoever rewrote all of it would not be seen: compare with a head kept elsewhere, --head HEAD.",
        )),
        1 => text.push_str("  The chain passes through the head that was given.\n"),
        n => {
            let _ = writeln!(text, "  The chain passes through the {n} heads that were given.");
        }
    }
    for erasure in &check.erasures {
        text.push_str(&wrapped("  ", "    ", &erasure_line(erasure)));
    }
    let _ = writeln!(text, "  head of the chain\n    {}", check.head);
    text
}

/// What the check found, as JSON.
#[must_use]
pub fn check_json(check: &BookCheck) -> String {
    json_text(&check_value(check))
}

fn check_value(check: &BookCheck) -> serde_json::Value {
    json!({
        "path": check.path,
        "holds": check.wrong.is_none(),
        "wrong": check.wrong,
        "records": check.records,
        "runs": check.runs,
        "sessions": check.sessions,
        "erasures": check.erasures.iter().map(erasure_value).collect::<Vec<_>>(),
        "heads_given": check.heads,
        "head": check.head,
    })
}

fn erasure_line(erasure: &Erasure) -> String {
    let Erasure { record, at, why, records, sessions } = erasure;
    let erased = counted(*records as u64, "record");
    let sessions = match session_numbers(sessions) {
        named if named.is_empty() => String::new(),
        named => format!(", {named} among them"),
    };
    format!("record {record} of {} erased {erased}{sessions}: {}", at.to_rfc3339(), tame(why))
}

fn erasure_value(erasure: &Erasure) -> serde_json::Value {
    json!({
        "record": erasure.record,
        "at": erasure.at.to_rfc3339(),
        "why": erasure.why,
        "records": erasure.records,
        "sessions": erasure.sessions.iter().map(ToString::to_string).collect::<Vec<_>>(),
    })
}

/// Sessions in a sentence: "session S0002", "sessions S0001 to S0003 and S0007"; nothing for none.
#[must_use]
pub fn session_numbers(sessions: &[SessionNumber]) -> String {
    let mut stretches: Vec<(SessionNumber, SessionNumber)> = Vec::new();
    for &number in sessions {
        match stretches.last_mut() {
            Some((_, last)) if last.get().checked_add(1) == Some(number.get()) => *last = number,
            _ => stretches.push((number, number)),
        }
    }
    let said: Vec<String> = stretches
        .iter()
        .flat_map(|&(first, last)| match last.get() - first.get() {
            0 => vec![first.to_string()],
            1 => vec![first.to_string(), last.to_string()],
            _ => vec![format!("{first} to {last}")],
        })
        .collect();
    let noun = if sessions.len() == 1 { "session" } else { "sessions" };
    match said.as_slice() {
        [] => String::new(),
        [one] => format!("{noun} {one}"),
        [most @ .., last] => format!("{noun} {} and {last}", most.join(", ")),
    }
}

/// What was copied, as text.
#[must_use]
pub fn backup_text(backup: &Backup) -> String {
    let check = &backup.check;
    let mut text =
        wrapped("", "  ", &format!("{} is a copy of the book, and {}", backup.path, check_line(check)));
    let _ = writeln!(text, "  head of its chain\n    {}", check.head);
    text
}

/// What was copied, as JSON.
#[must_use]
pub fn backup_json(backup: &Backup) -> String {
    json_text(&json!({ "path": backup.path, "check": check_value(&backup.check) }))
}

/// A size in the unit people read it in.
fn size(bytes: u64) -> String {
    const KILO: f64 = 1024.0;
    let kibi = bytes as f64 / KILO;
    if bytes < 1024 {
        format!("{bytes} bytes")
    } else if kibi < KILO {
        format!("{kibi:.1} KiB")
    } else {
        format!("{:.1} MiB", kibi / KILO)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn sessions_are_named_as_a_person_says_them() {
        let said = |numbers: &[u32]| {
            let numbers: Vec<SessionNumber> = numbers.iter().filter_map(|n| SessionNumber::new(*n)).collect();
            session_numbers(&numbers)
        };
        assert_eq!(said(&[]), "");
        assert_eq!(said(&[2]), "session S0002");
        assert_eq!(said(&[1, 2]), "sessions S0001 and S0002");
        assert_eq!(said(&[1, 2, 3]), "sessions S0001 to S0003");
        assert_eq!(said(&[1, 2, 3, 7, 9, 10]), "sessions S0001 to S0003, S0007, S0009 and S0010");
    }
}
