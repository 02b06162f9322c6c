//! Sessions of an export, and what was left out of them.

use serde::Serialize;

use super::folder::Folder;
use super::{AsTheyStand, ONE_FOLDER, session_files, toml_text};
use crate::book::{Book, SessionQuery};
use crate::entry::SessionNumber;
use crate::report::export::{Exported, Form, LeftOut};
use crate::work::WorkError;

#[derive(Serialize)]
struct Document {
    left_out: Vec<Table>,
}

/// What was left out, and how it is left out again.
#[derive(Serialize)]
struct Table {
    session: String,
    /// Its number in a new book made of the export.
    in_a_new_book: String,
    at: String,
    /// Seconds on the time column; the whole session without.
    #[serde(skip_serializing_if = "Option::is_none")]
    from_s: Option<f64>,
    #[serde(skip_serializing_if = "Option::is_none")]
    until_s: Option<f64>,
    why: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    by: Option<String>,
    command: String,
}

impl Table {
    fn of(out: &LeftOut) -> Self {
        let (from_s, until_s) = out.what.stretch_s.unzip();
        Self {
            session: out.session.to_string(),
            in_a_new_book: out.anew.to_string(),
            at: out.what.at.to_rfc3339(),
            from_s,
            until_s,
            why: out.what.why.clone(),
            by: out.what.by.clone(),
            command: out.command(),
        }
    }
}

/// Writes every session.
pub(super) fn sessions(folder: &mut Folder, book: &Book, exported: &mut Exported) -> Result<(), WorkError> {
    let rows = book.sessions(&SessionQuery::default())?;
    let mut numbers: Vec<SessionNumber> = rows.iter().map(|row| row.number).collect();
    numbers.sort_unstable();
    exported.session_blocks = numbers.last().is_some_and(|last| last.get() > ONE_FOLDER);
    // Numbers of a new book have no gap where a session was erased.
    for (number, anew) in numbers.into_iter().zip((1..).filter_map(SessionNumber::new)) {
        let record = book.session(number)?;
        let left_out = record.left_out.iter().cloned();
        exported.left_out.extend(left_out.map(|what| LeftOut { session: number, anew, what }));
        let found = session_files::of(record, book.session_source_of(number)?, &AsTheyStand(book));
        let place = if exported.session_blocks {
            format!("sessions/{:07}/{number}", number.get() / 1000 * 1000)
        } else {
            format!("sessions/{number}")
        };
        for (name, bytes) in &found.files {
            folder.write(&format!("{place}/{name}"), bytes)?;
        }
        if found.form == Form::Incomplete {
            exported.notes.push(format!(
                "{number}: files cannot say all that the book holds of it, such as a run file that was never kept; an \
                 import may refuse it"
            ));
        }
        exported.sessions.push((number, format!("{place}/{}", found.own), found.form));
    }
    if !exported.left_out.is_empty() {
        let document = Document { left_out: exported.left_out.iter().map(Table::of).collect() };
        folder.write("sessions/left-out.toml", toml_text(&document).as_bytes())?;
    }
    Ok(())
}
