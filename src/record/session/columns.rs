//! The `[columns]` table of a session, and its rows.
//!
//! Comes in: what stands in which column, and an opened table. Goes out: the columns of [`SessionReadings`], cells in
//! bar or volts, and the [`Axis`] on which events are placed. A row without a time, rows out of order and times that
//! stand twice are data; so is a cell without a reading, or with one of the words loggers write for a fault.

use chrono::{DateTime, FixedOffset};

use super::super::columns::{Column, Kept, Placed, Spec, TEMPERATURE, Taken, Time};
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::note::Note;
use super::super::readings::MOST_SERIES_ROWS;
use super::super::sheet::Sheet;
use super::super::times::Times;
use super::SessionRefusal;
use super::moment::Axis;
use crate::quantity::QuantityError;
use crate::quantity::unit::{Kind, lookup};

/// Words that loggers and handsets write where a reading should stand, in small letters (common practice, no source).
const FAULT_WORDS: [&str; 15] = [
    "nan", "inf", "-inf", "n/a", "#n/a", "na", "null", "none", "err", "error", "fault", "fail", "-", "--",
    "---",
];

/// Which column holds what.
pub(super) struct Columns {
    time: Time,
    pub(super) cells: Vec<Cell>,
    pub(super) depth: Option<Column>,
    pub(super) loop_temperature: Option<Column>,
}

/// The column of one cell.
pub(super) struct Cell {
    /// The cell's name.
    pub(super) name: String,
    /// Whether it is read in volts; else in bar.
    pub(super) in_volts: bool,
    column: Column,
}

/// What the rows hold, cells in the order they are named in.
pub(super) struct Rows {
    pub(super) time_s: Vec<f64>,
    pub(super) cells: Vec<Vec<f64>>,
    pub(super) depth_m: Option<Vec<f64>>,
    pub(super) loop_temperature_k: Option<Vec<f64>>,
    pub(super) axis: Axis,
    pub(super) notes: Vec<Note>,
}

const CELL_IN_BAR: Spec = Spec {
    key: "cells",
    table: "columns.cells",
    kind: Kind::Pressure,
    example: "bar",
    // A reading below zero is a fault of the cell, and faults are counted, not refused.
    lowest: f64::MIN,
    below: Refusal::NotFinite,
};
const CELL_IN_VOLTS: Spec = Spec { kind: Kind::Voltage, ..CELL_IN_BAR };
const DEPTH: Spec = Spec {
    key: "depth",
    table: "columns.depth",
    kind: Kind::Length,
    example: "m",
    // A sensor's zero may put it a little above the surface; a metre is far more than any does (our own choice).
    lowest: -1.0,
    below: |shown| Refusal::Session(SessionRefusal::AboveSurface(shown)),
};
const LOOP_TEMPERATURE: Spec =
    Spec { key: "loop_temperature", table: "columns.loop_temperature", ..TEMPERATURE };

impl Columns {
    /// Reads the table.
    pub(super) fn read(table: &Table<'_>) -> Result<Self, RecordError> {
        table.only(&["time", "cells", "depth", "loop_temperature"])?;
        let mut taken = Taken::default();
        let time = taken.time(&table.required("time", r#"time = { column = "t", unit = "s" }"#)?)?;
        let example = r#"cells = [ { column = "c1", unit = "bar" } ]"#;
        let cells = table.required("cells", example)?;
        let mut read: Vec<Cell> = Vec::new();
        for item in cells.items()? {
            let cell = cell(&item, &mut taken)?;
            if read.iter().any(|other| other.name == cell.name) {
                return Err(item.refuse(SessionRefusal::SameName(cell.name).into()));
            }
            read.push(cell);
        }
        if read.is_empty() {
            return Err(cells.refuse(SessionRefusal::NoCells.into()));
        }
        let mut optional =
            |spec: &Spec| table.field(spec.key).map(|field| taken.of(&field, spec)).transpose();
        let depth = optional(&DEPTH)?;
        let loop_temperature = optional(&LOOP_TEMPERATURE)?;
        Ok(Self { time, cells: read, depth, loop_temperature })
    }

    /// The names of all columns wanted of the table.
    pub(super) fn names(&self) -> Vec<&str> {
        let time = match &self.time {
            Time::Written(name) => name,
            Time::Number(column) => &column.name,
        };
        let cells = self.cells.iter().map(|cell| &cell.column.name);
        let others = [&self.depth, &self.loop_temperature].into_iter().flatten().map(|column| &column.name);
        std::iter::once(time).chain(cells).chain(others).map(String::as_str).collect()
    }
}

fn cell(item: &Field<'_>, taken: &mut Taken) -> Result<Cell, RecordError> {
    let inner = item.table("columns.cells")?;
    inner.only(&["column", "unit", "name"])?;
    let unit = inner.field("unit").ok_or_else(|| inner.refuse("unit", Refusal::NoUnit("bar")))?;
    let written = unit.text()?;
    let in_volts = lookup(Kind::Voltage, written).is_ok();
    let spec = if in_volts { CELL_IN_VOLTS } else { CELL_IN_BAR };
    match lookup(Kind::Pressure, written) {
        _ if in_volts => {}
        Ok(_) => {}
        // Gauge or absolute, and nothing at all, are refused as they are elsewhere.
        Err(QuantityError::ZeroInUnit { .. } | QuantityError::NoUnit { .. }) => {}
        Err(_) => return Err(unit.refuse(SessionRefusal::CellUnit(written.to_owned()).into())),
    }
    let mut column = taken.column(&inner, &spec)?;
    if !in_volts {
        column.kept = Kept::Bar;
    }
    // The name comes back in reports, so it is held to what free text is held to.
    let field = match inner.field("name") {
        Some(field) => field,
        None => inner.required("column", r#"column = "c1""#)?,
    };
    let Some(name) = field.free_text()? else { return Err(field.refuse(Refusal::EmptyText)) };
    Ok(Cell { name, in_volts, column })
}

/// Reads every row; `taken` is when the session was begun.
pub(super) fn rows(
    sheet: &mut Sheet,
    columns: &Columns,
    taken: &DateTime<FixedOffset>,
) -> Result<Rows, RecordError> {
    let mut clock = Clock::of(sheet, &columns.time)?;
    let mut readers = columns
        .cells
        .iter()
        .map(|cell| &cell.column)
        .chain(&columns.depth)
        .chain(&columns.loop_temperature)
        .map(|column| Reader::of(sheet, column))
        .collect::<Result<Vec<_>, RecordError>>()?;
    let mut time_s = Vec::new();
    while sheet.next_row()? {
        if time_s.len() == MOST_SERIES_ROWS {
            return Err(sheet.refuse_row(Refusal::TooManyRows(MOST_SERIES_ROWS)));
        }
        time_s.push(clock.next(sheet)?);
        for reader in &mut readers {
            reader.next(sheet)?;
        }
    }
    if time_s.is_empty() {
        return Err(sheet.refuse_table(Refusal::NoRows));
    }
    let Some((begins_at_s, begins)) = clock.begins(taken) else {
        return Err(sheet.refuse_table(SessionRefusal::NoTimes.into()));
    };
    let timed = || time_s.iter().copied().filter(|s| s.is_finite());
    let ends_s = (timed().fold(f64::INFINITY, f64::min), timed().fold(f64::NEG_INFINITY, f64::max));
    let notes = readers.iter_mut().filter_map(Reader::note).collect();
    let mut values = readers.into_iter().map(|reader| reader.values);
    let cells = values.by_ref().take(columns.cells.len()).collect();
    let depth_m = columns.depth.as_ref().and_then(|_| values.next());
    let loop_temperature_k = columns.loop_temperature.as_ref().and_then(|_| values.next());
    let axis = Axis { begins_at_s, begins, ends_s };
    Ok(Rows { time_s, cells, depth_m, loop_temperature_k, axis, notes })
}

/// A column of readings while it is read.
struct Reader<'c> {
    column: Placed<'c>,
    values: Vec<f64>,
    /// The first word for a fault, and how many there were.
    words: Option<Note>,
}

impl<'c> Reader<'c> {
    fn of(sheet: &Sheet, column: &'c Column) -> Result<Self, RecordError> {
        let column =
            column.placed(sheet).ok_or_else(|| sheet.refuse_table(Refusal::NoColumn(column.name.clone())))?;
        Ok(Self { column, values: Vec::new(), words: None })
    }

    fn next(&mut self, sheet: &mut Sheet) -> Result<(), RecordError> {
        let value = match self.column.or_missing(sheet) {
            Ok(value) => value,
            Err(error) => self.missing(error)?,
        };
        self.values.push(value);
        Ok(())
    }

    /// A missing reading for a word that says so; any other cell is refused as it was.
    #[cold]
    fn missing(&mut self, error: RecordError) -> Result<f64, RecordError> {
        let RecordError::Input { place, refusal } = &error else { return Err(error) };
        let (Refusal::NotANumber(word) | Refusal::NotFinite(word)) = &**refusal else { return Err(error) };
        if !FAULT_WORDS.contains(&word.to_ascii_lowercase().as_str()) {
            return Err(error);
        }
        match &mut self.words {
            Some(Note::WordsForMissing { readings, .. }) => *readings += 1,
            none => {
                *none = Some(Note::WordsForMissing { place: place.clone(), word: word.clone(), readings: 1 });
            }
        }
        Ok(f64::NAN)
    }

    fn note(&mut self) -> Option<Note> {
        self.words.take()
    }
}

/// The time column while it is read.
enum Clock<'c> {
    Written { times: Times, index: usize },
    Number { column: Placed<'c>, first: Option<f64> },
}

impl<'c> Clock<'c> {
    fn of(sheet: &Sheet, time: &'c Time) -> Result<Self, RecordError> {
        let missing = |name: &str| sheet.refuse_table(Refusal::NoColumn(name.to_owned()));
        Ok(match time {
            Time::Written(name) => {
                let index = sheet.column(name).ok_or_else(|| missing(name))?;
                Self::Written { times: Times::in_any_order(), index }
            }
            Time::Number(column) => {
                let placed = column.placed(sheet).ok_or_else(|| missing(&column.name))?;
                Self::Number { column: placed, first: None }
            }
        })
    }

    /// Seconds since the first row with a time; NaN where there is none.
    fn next(&mut self, sheet: &mut Sheet) -> Result<f64, RecordError> {
        match self {
            Self::Written { times, index } => match sheet.cell(*index) {
                [] => Ok(f64::NAN),
                cell => times.seconds(cell).map_err(|refusal| sheet.refuse(*index, refusal)),
            },
            Self::Number { column, first } => {
                let now = column.or_missing(sheet)?;
                if now.is_nan() {
                    return Ok(now);
                }
                Ok(now - *first.get_or_insert(now))
            }
        }
    }

    /// What the column shows at the first reading, and when that was; none when no row has a time.
    fn begins(&self, taken: &DateTime<FixedOffset>) -> Option<(f64, (i64, u32))> {
        match self {
            Self::Written { times, .. } => Some((0.0, times.begins(taken)?)),
            Self::Number { first, .. } => Some(((*first)?, Axis::from_first_reading(taken).begins)),
        }
    }
}
