//! The `[protocol]` table of an instrument: text lines, or a Modbus RTU device.

use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::note::Note;
use super::RegisterRefusal;
use super::pattern::Groups;
use crate::entry::{ModbusNumber, ModbusTable, Protocol, WordOrder};
use crate::quantity::Span;
use crate::quantity::text::span;

const KEYS: [&str; 12] = [
    "kind",
    "ask",
    "every",
    "ends",
    "pattern",
    "stale_after",
    "device",
    "table",
    "register",
    "type",
    "word_order",
    "scale",
];
const OF_LINES: [&str; 3] = ["ask", "ends", "pattern"];
const OF_MODBUS: [&str; 6] = ["device", "table", "register", "type", "word_order", "scale"];

/// Which protocol, before its own keys are read.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Kind {
    Lines,
    ModbusRtu,
}

const LINES: &str = "lines";
const MODBUS_RTU: &str = "modbus-rtu";

/// The words of `table`.
pub(super) const TABLES: [(&str, ModbusTable); 2] =
    [("input", ModbusTable::Input), ("holding", ModbusTable::Holding)];

/// The words of `type`.
pub(super) const TYPES: [(&str, ModbusNumber); 5] = [
    ("f32", ModbusNumber::F32),
    ("i16", ModbusNumber::I16),
    ("u16", ModbusNumber::U16),
    ("i32", ModbusNumber::I32),
    ("u32", ModbusNumber::U32),
];

/// The words of `word_order`.
pub(super) const WORD_ORDERS: [(&str, WordOrder); 2] =
    [("big", WordOrder::Big), ("little", WordOrder::Little)];

/// The word of `kind` for a protocol.
pub(super) const fn kind_of(protocol: &Protocol) -> &'static str {
    match protocol {
        Protocol::Lines { .. } => LINES,
        Protocol::ModbusRtu { .. } => MODBUS_RTU,
    }
}

/// Whether a number takes two registers.
pub(super) const fn takes_two(number: ModbusNumber) -> bool {
    matches!(number, ModbusNumber::F32 | ModbusNumber::I32 | ModbusNumber::U32)
}

pub(super) fn read(table: &Table<'_>) -> Result<Protocol, RecordError> {
    table.only(&KEYS)?;
    let field = table.required("kind", "kind = \"lines\"")?;
    let kind = field.word(&[(LINES, Kind::Lines), (MODBUS_RTU, Kind::ModbusRtu)])?;
    let (protocol, others): (_, &[&'static str]) = match kind {
        Kind::Lines => (LINES, &OF_MODBUS),
        Kind::ModbusRtu => (MODBUS_RTU, &OF_LINES),
    };
    for &key in others {
        if let Some(field) = table.field(key) {
            return Err(field.refuse(RegisterRefusal::NotOfThisProtocol { protocol, key }.into()));
        }
    }
    let (every, stale_after) = (positive_span(table, "every")?, positive_span(table, "stale_after")?);
    match kind {
        Kind::Lines => lines(table, every, stale_after),
        Kind::ModbusRtu => modbus(table, every, stale_after),
    }
}

fn lines(table: &Table<'_>, every: Option<Span>, stale_after: Option<Span>) -> Result<Protocol, RecordError> {
    let ask = table.field("ask").map(|field| on_the_line(&field)).transpose()?;
    if ask.is_some() {
        not_stale_at_once(table, every, stale_after)?;
    } else if let Some(field) = table.field("every") {
        let why = "an instrument that streams by itself is not asked";
        field.note(Note::NotUsed { place: field.place(), why });
    }
    let ends = on_the_line(&table.required("ends", "ends = \"\\r\\n\"")?)?;
    let field = table.required("pattern", r"pattern = '(?P<value>[-+]?\d+(\.\d+)?)'")?;
    let pattern = field.seen_text()?.to_owned();
    Groups::of(&pattern).map_err(|fault| field.refuse(RegisterRefusal::Pattern(fault).into()))?;
    Ok(Protocol::Lines { ask, every, ends, pattern, stale_after })
}

fn modbus(
    table: &Table<'_>,
    every: Option<Span>,
    stale_after: Option<Span>,
) -> Result<Protocol, RecordError> {
    not_stale_at_once(table, every, stale_after)?;
    let field = table.required("device", "device = 1")?;
    // "MODBUS over Serial Line", V1.02, 2.2: 0 is the broadcast, 248 to 255 are reserved.
    let device = field.integer()?;
    let device = u8::try_from(device).ok().filter(|device| (1..=247).contains(device)).ok_or_else(|| {
        field.refuse(Refusal::OutOfBounds { shown: device.to_string(), want: "an address from 1 to 247" })
    })?;
    let registers = table.required("table", "table = \"input\"")?.word(&TABLES)?;
    let number = table.required("type", "type = \"f32\"")?.word(&TYPES)?;
    let two = takes_two(number);
    let field = table.required("register", "register = 0")?;
    let register = field.integer()?;
    let (last, want) = if two {
        (u16::MAX - 1, "a register from 0 to 65534, since the number takes two")
    } else {
        (u16::MAX, "a register from 0 to 65535")
    };
    let register = u16::try_from(register).ok().filter(|register| *register <= last);
    let register = register.ok_or_else(|| {
        let shown = field.integer().unwrap_or_default().to_string();
        field.refuse(Refusal::OutOfBounds { shown, want })
    })?;
    let word_order = match (two, table.field("word_order")) {
        (true, None) => return Err(table.refuse("word_order", Refusal::MissingKey("word_order = \"big\""))),
        (true, Some(field)) => field.word(&WORD_ORDERS)?,
        (false, field) => {
            if let Some(field) = field {
                field.word(&WORD_ORDERS)?;
                let why = "the number takes one register";
                field.note(Note::NotUsed { place: field.place(), why });
            }
            WordOrder::Big
        }
    };
    let scale = |field: Field<'_>| field.number("a number other than zero", |scale| scale.abs() > 0.0);
    let scale = table.field("scale").map_or(Ok(1.0), scale)?;
    let table = registers;
    Ok(Protocol::ModbusRtu { device, table, register, number, word_order, scale, every, stale_after })
}

fn positive_span(table: &Table<'_>, key: &str) -> Result<Option<Span>, RecordError> {
    let Some(field) = table.field(key) else { return Ok(None) };
    let given = field.quantity(span)?;
    if given.as_s() > 0.0 {
        return Ok(Some(given));
    }
    Err(field.refuse(Refusal::OutOfBounds { shown: field.text()?.to_owned(), want: "above zero" }))
}

fn not_stale_at_once(
    table: &Table<'_>,
    every: Option<Span>,
    stale_after: Option<Span>,
) -> Result<(), RecordError> {
    match (every, stale_after, table.field("stale_after")) {
        (Some(every), Some(stale), Some(field)) if stale.as_s() <= every.as_s() => {
            Err(field.refuse(RegisterRefusal::StaleAtOnce.into()))
        }
        _ => Ok(()),
    }
}

/// A text as it goes over the line, control characters and all.
fn on_the_line(field: &Field<'_>) -> Result<String, RecordError> {
    let text = field.text()?;
    if let Some(other) = text.chars().find(|c| !c.is_ascii()) {
        return Err(field.refuse(RegisterRefusal::NotAscii(other.into()).into()));
    }
    if text.is_empty() {
        Err(field.refuse(RegisterRefusal::NothingToSend.into()))
    } else {
        Ok(text.to_owned())
    }
}
