//! The rows by which a record is found: what lists need of it, made from the record itself.

use rusqlite::types::Value;

use super::body::{Body, Record};
use super::canonical::{Canonical, Writer};
use crate::entry::Certificate;

/// A row of a table for lists: the table and its columns; the first column is its key.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Row {
    pub(super) table: &'static str,
    pub(super) columns: Vec<(&'static str, Value)>,
}

/// The rows by which a record is found.
pub(super) fn rows(seq: u64, record: &Record<'_>) -> Vec<Row> {
    let Record { at, body } = record;
    let mut rows = Vec::new();
    let kind = Value::Integer(i64::from(body.kind().number()));
    if let Some(run) = body.run() {
        let columns = vec![("seq", place(seq)), ("run", number(run.get())), ("kind", kind)];
        rows.push(Row { table: "of_run", columns });
    } else if let Some(session) = body.session() {
        let columns = vec![("seq", place(seq)), ("session", number(session.get())), ("kind", kind)];
        rows.push(Row { table: "of_session", columns });
    }
    match body {
        Body::Run { number: run, origin, source, header } => {
            let columns = vec![
                ("seq", place(seq)),
                ("number", number(run.get())),
                ("orifice", text(header.orifice.as_str())),
                ("orifice_key", text(&super::registers::key_of(header.orifice.as_str()))),
                ("gas", code(&header.gas)),
                ("purpose", code(&header.purpose)),
                ("taken", text(&header.taken.to_rfc3339())),
                ("taken_s", Value::Integer(header.taken.timestamp())),
                ("technician", header.technician.as_deref().map_or(Value::Null, text)),
                ("origin", code(origin)),
                ("source", digest(*source)),
            ];
            rows.push(Row { table: "run", columns });
        }
        Body::Decided { run, decision } => {
            let figures = &decision.figures;
            let columns = vec![
                ("seq", place(seq)),
                ("run", number(run.get())),
                ("verdict", code(&decision.verdict)),
                ("method", Value::Integer(i64::from(figures.method_revision))),
                ("ip_pa", real(figures.ip.as_pa())),
                ("flow_l_min", real(figures.flow_l_min)),
                ("expanded_l_min", real(figures.expanded_l_min())),
                ("decided", text(&decision.at.to_rfc3339())),
            ];
            rows.push(Row { table: "decision", columns });
        }
        Body::Certificate(given) => {
            let Certificate { number: given_number, counter, year, draft, .. } = given.as_ref();
            let amends = draft.amends.as_ref();
            let columns = vec![
                ("seq", place(seq)),
                ("number", text(given_number)),
                ("key", text(&super::registers::key_of(given_number))),
                ("year", Value::Integer(i64::from(*year))),
                ("counter", number(*counter)),
                ("run", number(draft.results.run.get())),
                ("as_found", draft.as_found.as_ref().map_or(Value::Null, |found| number(found.run.get()))),
                ("orifice", text(draft.results.header.orifice.as_str())),
                (
                    "amends",
                    amends.map_or(Value::Null, |amends| text(&super::registers::key_of(&amends.number))),
                ),
                ("replaces", amends.map_or(Value::Null, |amends| Value::Integer(i64::from(amends.replaces)))),
                ("issued", text(&draft.issued.to_rfc3339())),
            ];
            rows.push(Row { table: "certificate", columns });
        }
        Body::CertificateFiles { certificate, files } => {
            let columns = vec![
                ("seq", place(seq)),
                ("certificate", place(*certificate)),
                ("pdf", digest(Some(files.pdf))),
                ("xml", digest(Some(files.xml))),
            ];
            rows.push(Row { table: "certificate_files", columns });
        }
        Body::Entry { revision, entry, .. } => {
            let columns = vec![
                ("seq", place(seq)),
                ("register", Value::Integer(entry.register().number())),
                ("key", text(&super::registers::key_of(entry.name()))),
                ("id", text(entry.name())),
                ("revision", Value::Integer(i64::from(*revision))),
            ];
            rows.push(Row { table: "register", columns });
        }
        Body::Session { number: session, origin, source, extent, header } => {
            let columns = vec![
                ("seq", place(seq)),
                ("number", number(session.get())),
                ("diver", text(header.diver.as_str())),
                ("diver_key", text(&super::registers::key_of(header.diver.as_str()))),
                ("place", code(&header.place)),
                ("kept", code(&header.kept)),
                ("taken", text(&header.taken.to_rfc3339())),
                ("recorded", text(&at.to_rfc3339())),
                ("origin", code(origin)),
                ("first_s", extent.map_or(Value::Null, |extent| real(extent.first_s))),
                ("last_s", extent.map_or(Value::Null, |extent| real(extent.last_s))),
                ("cells", count(header.readings.cells.len())),
                ("readings", extent.map_or(Value::Null, |extent| count(extent.rows))),
                ("source", digest(*source)),
            ];
            rows.push(Row { table: "session", columns });
        }
        Body::SessionLeftOut { session, left_out } => {
            let (from, to) = left_out.stretch_s.unzip();
            let columns = vec![
                ("seq", place(seq)),
                ("session", number(session.get())),
                ("whole", Value::Integer(i64::from(left_out.stretch_s.is_none()))),
                ("from_s", from.map_or(Value::Null, real)),
                ("to_s", to.map_or(Value::Null, real)),
            ];
            rows.push(Row { table: "session_left_out", columns });
        }
        Body::SessionFinished { session, cells, extent } => {
            let columns = vec![
                ("seq", place(seq)),
                ("session", number(session.get())),
                ("cells", count(*cells)),
                ("readings", count(extent.rows)),
                ("first_s", real(extent.first_s)),
                ("last_s", real(extent.last_s)),
            ];
            rows.push(Row { table: "session_finished", columns });
        }
        Body::Erasure { erased, sessions, .. } => {
            for session in sessions {
                let columns = vec![("number", number(session.get())), ("erasure", place(seq))];
                rows.push(Row { table: "session_erased", columns });
            }
            for target in erased {
                let columns = vec![("seq", place(*target)), ("erasure", place(seq))];
                rows.push(Row { table: "erased", columns });
            }
        }
        _ => {}
    }
    rows
}

/// A place in the chain as SQLite keeps it; SQLite counts rows to 2⁶³ − 1, and a place comes from there.
pub(super) fn place(seq: u64) -> Value {
    Value::Integer(i64::try_from(seq).unwrap_or(i64::MAX))
}

fn number(number: u32) -> Value {
    Value::Integer(i64::from(number))
}

fn count(count: usize) -> Value {
    Value::Integer(i64::try_from(count).unwrap_or(i64::MAX))
}

fn digest(digest: Option<[u8; 32]>) -> Value {
    digest.map_or(Value::Null, |digest| Value::Blob(digest.to_vec()))
}

fn text(text: &str) -> Value {
    Value::Text(text.to_owned())
}

/// SQLite has no NaN; unknown stays unknown.
fn real(figure: f64) -> Value {
    if figure.is_nan() { Value::Null } else { Value::Real(figure) }
}

/// The byte of a choice, the same as in the canonical bytes.
fn code(choice: &impl Canonical) -> Value {
    let mut out = Writer::default();
    choice.write(&mut out);
    Value::Integer(out.into_bytes().first().copied().map_or(0, i64::from))
}
