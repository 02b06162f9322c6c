//! One entry of a register; what adding, editing and forgetting did.

use serde_json::{Value, json};

use super::rows::rows;
use super::{CopyNamed, ForgottenDiver, Revision, Saved, ShownEntry};
use crate::report::book::session_numbers;
use crate::report::layout::{columns, wrapped};
use crate::report::{Units, json_text};

/// Columns in front of what a key says.
const LABEL: usize = 20;

/// The entry as text, with earlier revisions where they were asked for.
#[must_use]
pub fn text(shown: &ShownEntry, units: &Units) -> String {
    let now = &shown.now;
    let mut text = wrapped(
        "",
        "  ",
        &format!("{} — {}, revision {} of {}", now.entry.name(), shown.register, now.revision, when(now)),
    );
    text.push_str(&keys(now, units));
    match &shown.earlier {
        None if now.revision > 1 => {
            text.push_str("  Earlier revisions are not shown: --all shows every one.\n");
        }
        None => {}
        Some(earlier) => {
            for revision in earlier {
                let head = format!("Revision {} of {}", revision.revision, when(revision));
                text.push_str(&wrapped("\n", "  ", &head));
                text.push_str(&keys(revision, units));
            }
        }
    }
    text
}

fn when(revision: &Revision) -> String {
    revision.at.to_rfc3339()
}

fn keys(revision: &Revision, units: &Units) -> String {
    let mut text = String::new();
    let rows = rows(&revision.entry, units);
    if rows.is_empty() {
        text.push_str("  nothing but its name is known\n");
    }
    for (label, says) in rows {
        let pad = " ".repeat(LABEL.saturating_sub(columns(label) + 2));
        for (place, line) in says.lines().enumerate() {
            let first = if place == 0 { format!("  {label}{pad}") } else { " ".repeat(LABEL) };
            text.push_str(&wrapped(&first, &" ".repeat(LABEL), line));
        }
    }
    text
}

/// The entry as JSON.
#[must_use]
pub fn json(shown: &ShownEntry) -> String {
    json_text(&json_value(shown))
}

/// The entry as a JSON value; the history of an orifice is put beside it.
#[must_use]
pub fn json_value(shown: &ShownEntry) -> Value {
    let mut value = revision_json(&shown.now);
    if let Some(object) = value.as_object_mut() {
        object.insert("register".into(), shown.register.into());
        if let Some(earlier) = &shown.earlier {
            object.insert("earlier".into(), earlier.iter().map(revision_json).collect());
        }
    }
    value
}

/// A revision as JSON: `entry` is what its file says.
pub(super) fn revision_json(revision: &Revision) -> Value {
    let entry: Option<Value> =
        revision.file.parse::<toml::Table>().ok().and_then(|table| serde_json::to_value(table).ok());
    json!({
        "id": revision.entry.name(),
        "revision": revision.revision,
        "at": revision.at.to_rfc3339(),
        "entry": entry,
    })
}

/// What adding or editing did.
#[must_use]
pub fn saved_text(saved: &Saved) -> String {
    let Saved { register, name, revision, changed } = saved;
    let what = if register == name { register.to_string() } else { format!("{register} {name}") };
    let what = match (*changed, *revision) {
        (false, revision) => format!("{what}: nothing changed, revision {revision} stands"),
        (true, 1) => format!("{what} is in the register"),
        (true, revision) => format!("{what}: revision {revision} stands; the earlier ones are kept"),
    };
    wrapped("", "  ", &what)
}

/// The same as JSON.
#[must_use]
pub fn saved_json(saved: &[Saved]) -> String {
    let each = |saved: &Saved| {
        json!({
            "register": saved.register,
            "id": saved.name,
            "revision": saved.revision,
            "changed": saved.changed,
        })
    };
    json_text(&saved.iter().map(each).collect::<Vec<_>>())
}

/// What forgetting a diver did.
#[must_use]
pub fn forgotten_text(forgotten: &ForgottenDiver) -> String {
    let ForgottenDiver { diver, records, sessions, copies } = forgotten;
    let among = match session_numbers(sessions) {
        named if named.is_empty() => String::new(),
        named => format!(", everything of {named} among them"),
    };
    let what = match records {
        0 => format!("{diver}: the earlier erasure is finished; no byte is left in the book or its log"),
        1 => {
            format!("{diver} is forgotten: 1 record is erased, no byte of it is left in the book or its log")
        }
        n => format!(
            "{diver} is forgotten: {n} records are erased{among}; no byte of them is left in the book or its log"
        ),
    };
    let mut text =
        wrapped("", "  ", &format!("{what}. The chain holds, and says that something was erased and why."));
    text.push_str(&copies_text(copies));
    text
}

/// The copies that an erasure cannot reach.
#[must_use]
pub fn copies_text(copies: &[CopyNamed]) -> String {
    if copies.is_empty() {
        return wrapped(
            "  ",
            "  ",
            "The book knows of no copy. Whoever copied the file by other means has to be asked.",
        );
    }
    let mut text =
        wrapped("  ", "  ", "Copies the program cannot reach, which may hold the diver still; delete them:");
    for copy in copies {
        let kind = if copy.is_export { "export with divers" } else { "backup" };
        text.push_str(&wrapped(
            "  - ",
            "    ",
            &format!("{}, {kind} of {}", copy.place, copy.at.to_rfc3339()),
        ));
    }
    text
}

/// The same as JSON.
#[must_use]
pub fn forgotten_json(forgotten: &ForgottenDiver) -> String {
    let copy = |copy: &CopyNamed| {
        json!({
            "kind": if copy.is_export { "export" } else { "backup" },
            "place": copy.place,
            "at": copy.at.to_rfc3339(),
        })
    };
    json_text(&json!({
        "diver": forgotten.diver,
        "records_erased": forgotten.records,
        "sessions_erased": forgotten.sessions.iter().map(ToString::to_string).collect::<Vec<_>>(),
        "copies": forgotten.copies.iter().map(copy).collect::<Vec<_>>(),
    }))
}
