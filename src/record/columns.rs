//! The `[columns]` table: which quantity stands in which column, and in what unit.

use super::document::{Field, Table};
use super::error::{RecordError, Refusal};
use super::note::Note;
use super::sheet::Sheet;
use crate::entry::MeterKind;
use crate::quantity::unit::{self, Kind, Unit};
use crate::quantity::{IndicatedFlow, PartialPressure, Quantity};

/// Every key of `[columns]`. The last three are for means that were taken elsewhere: their own scatter (a standard
/// uncertainty of the mean) and how many independent readings went into each.
const KEYS: [&str; 13] = [
    "pressure",
    "flow",
    "volume",
    "duration",
    "temperature",
    "barometer",
    "sweep",
    "time",
    "meter_temperature",
    "meter_pressure",
    "pressure_scatter",
    "flow_scatter",
    "averaged",
];

/// Which column holds what.
pub(super) struct Columns {
    pub(super) pressure: Column,
    /// Whether the pressure is over vacuum.
    pub(super) absolute: bool,
    pub(super) flow: Flow,
    pub(super) temperature: Option<Column>,
    pub(super) barometer: Option<Column>,
    pub(super) meter_temperature: Option<Column>,
    pub(super) meter_pressure: Option<Column>,
    pub(super) pressure_scatter: Option<Column>,
    pub(super) flow_scatter: Option<Column>,
    pub(super) averaged: Option<Column>,
    pub(super) sweep: Option<String>,
    pub(super) time: Option<Time>,
}

/// Where the flow comes from.
pub(super) enum Flow {
    /// Read, in litres per minute.
    Read(Column),
    /// A volume in cubic metres and its duration in seconds.
    Timed { volume: Column, duration: Column },
}

/// Where the time comes from.
pub(super) enum Time {
    /// Times of day or dates.
    Written(String),
    /// Numbers, in seconds.
    Number(Column),
}

/// A column of numbers, how its cells become what the entry keeps, and what is refused of it.
pub(super) struct Column {
    pub(super) name: String,
    /// None for a plain count.
    unit: Option<Unit>,
    pub(super) kept: Kept,
    lowest: f64,
    below: fn(String) -> Refusal,
}

/// In what the entry keeps the numbers of a column.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Kept {
    /// In SI, or as they stand where they have no unit.
    Si,
    /// In litres per minute, as [`IndicatedFlow`] keeps them.
    LitresPerMinute,
    /// In bar, as [`PartialPressure`] keeps them.
    Bar,
}

/// A [`Column`] with its place in an opened table.
pub(super) struct Placed<'c> {
    column: &'c Column,
    index: usize,
}

impl Columns {
    /// Reads the table for a meter of a kind; `series` allows a flow below zero and needs times.
    pub(super) fn read(table: &Table<'_>, kind: &MeterKind, series: bool) -> Result<Self, RecordError> {
        table.only(&KEYS)?;
        let mut taken = Taken::default();
        // A timed meter's flow may also stand there divided already.
        let timed = matches!(kind, MeterKind::Timed { .. });
        let divided = timed && table.field("flow").is_some();
        for key in ["volume", "duration"] {
            if let (true, Some(field)) = (!timed || divided, table.field(key)) {
                return Err(field.refuse(match divided {
                    true => Refusal::FlowTwice,
                    false => Refusal::NotOfThisKind { kind: kind.name(), key },
                }));
            }
        }
        if timed && series {
            return Err(table.refuse("volume", Refusal::SeriesOfTimed));
        }
        let pressure_field = table.required("pressure", r#"pressure = { column = "ip", unit = "bar" }"#)?;
        let inner = pressure_field.table("columns.pressure")?;
        inner.only(&["column", "unit", "absolute"])?;
        let absolute = inner.field("absolute").map(|field| field.flag()).transpose()?.unwrap_or(false);
        let mut pressure = taken.column(&inner, &PRESSURE)?;
        if absolute {
            (pressure.lowest, pressure.below) = (0.0, Refusal::NegativePressure);
        }
        let flow = if timed && !divided {
            let volume = table.required("volume", r#"volume = { column = "vol", unit = "L" }"#)?;
            let duration = table.required("duration", r#"duration = { column = "t", unit = "s" }"#)?;
            Flow::Timed { volume: taken.of(&volume, &VOLUME)?, duration: taken.of(&duration, &DURATION)? }
        } else {
            let flow = table.required("flow", r#"flow = { column = "flow", unit = "L/min" }"#)?;
            let mut flow = taken.of(&flow, &FLOW)?;
            if series {
                flow.lowest = f64::NEG_INFINITY;
            }
            Flow::Read(flow)
        };
        let mut optional =
            |spec: &Spec| table.field(spec.key).map(|field| taken.of(&field, spec)).transpose();
        let temperature = optional(&TEMPERATURE)?;
        let barometer = optional(&BAROMETER)?;
        let meter_temperature = optional(&METER_TEMPERATURE)?;
        let meter_pressure = optional(&METER_PRESSURE)?;
        let pressure_scatter = optional(&PRESSURE_SCATTER)?;
        let flow_scatter = optional(&FLOW_SCATTER)?;
        let averaged = table.field("averaged").map(|field| taken.averaged(&field)).transpose()?;
        let sweep = table.field("sweep").map(|field| taken.words(&field)).transpose()?;
        let time = table.field("time").map(|field| taken.time(&field)).transpose()?;
        if series && time.is_none() {
            return Err(table.refuse("time", Refusal::SeriesNeedsTime));
        }
        let only_points = "a series has its own scatter and its own sweep";
        let only_volumes = "only a meter that shows the volume that passes needs it";
        let is_mass = matches!(kind, MeterKind::Mass { .. });
        for (keys, unused, why) in [
            (&["pressure_scatter", "flow_scatter", "averaged", "sweep"][..], series, only_points),
            (&["meter_temperature", "meter_pressure"], is_mass, only_volumes),
        ] {
            for field in keys.iter().filter_map(|key| table.field(key)).filter(|_| unused) {
                field.note(Note::NotUsed { place: field.place(), why });
            }
        }
        Ok(Self {
            pressure,
            absolute,
            flow,
            temperature,
            barometer,
            meter_temperature,
            meter_pressure,
            pressure_scatter,
            flow_scatter,
            averaged,
            sweep,
            time,
        })
    }

    /// The names of all columns wanted of the table.
    pub(super) fn names(&self) -> Vec<&str> {
        let mut names = vec![self.pressure.name.as_str()];
        match &self.flow {
            Flow::Read(flow) => names.push(&flow.name),
            Flow::Timed { volume, duration } => names.extend([volume.name.as_str(), duration.name.as_str()]),
        }
        let optional = [
            &self.temperature,
            &self.barometer,
            &self.meter_temperature,
            &self.meter_pressure,
            &self.pressure_scatter,
            &self.flow_scatter,
            &self.averaged,
        ];
        names.extend(optional.into_iter().flatten().map(|column| column.name.as_str()));
        names.extend(self.sweep.as_deref());
        names.extend(self.time.as_ref().map(|time| match time {
            Time::Written(name) => name.as_str(),
            Time::Number(column) => column.name.as_str(),
        }));
        names
    }
}

impl Column {
    pub(super) fn placed(&self, sheet: &Sheet) -> Option<Placed<'_>> {
        sheet.column(&self.name).map(|index| Placed { column: self, index })
    }
}

impl Placed<'_> {
    /// The value in the present row; an empty cell is refused.
    pub(super) fn needed(&self, sheet: &mut Sheet) -> Result<f64, RecordError> {
        match self.value(sheet)? {
            Some(value) => Ok(value),
            None => Err(sheet.refuse(self.index, Refusal::EmptyCell)),
        }
    }

    /// The value in the present row, NaN for an empty cell.
    pub(super) fn or_missing(&self, sheet: &mut Sheet) -> Result<f64, RecordError> {
        Ok(self.value(sheet)?.unwrap_or(f64::NAN))
    }

    /// The refusal of the present row's cell.
    pub(super) fn refuse(&self, sheet: &Sheet, refusal: Refusal) -> RecordError {
        sheet.refuse(self.index, refusal)
    }

    fn value(&self, sheet: &mut Sheet) -> Result<Option<f64>, RecordError> {
        let Some(shown) = sheet.number(self.index)? else { return Ok(None) };
        let value = match self.column.unit {
            Some(unit) => match self.column.kept {
                Kept::Si => unit.to_si(shown),
                Kept::LitresPerMinute => IndicatedFlow::from_shown(shown, unit).as_l_min(),
                Kept::Bar => PartialPressure::from_shown(shown, unit).as_bar(),
            },
            None => shown,
        };
        if value >= self.column.lowest && value < f64::INFINITY {
            Ok(Some(value))
        } else {
            self.out_of_range(sheet)
        }
    }

    #[cold]
    fn out_of_range(&self, sheet: &Sheet) -> Result<Option<f64>, RecordError> {
        let cell = String::from_utf8_lossy(sheet.cell(self.index)).into_owned();
        let shown = match self.column.unit {
            Some(unit) => format!("{cell} {}", unit.symbol),
            None => cell.clone(),
        };
        let too_low = cell.starts_with('-') || self.column.lowest > 0.0;
        let refusal = if too_low { (self.column.below)(shown) } else { Refusal::NotFinite(cell) };
        Err(sheet.refuse(self.index, refusal))
    }
}

/// What one key of `[columns]` holds.
pub(super) struct Spec {
    pub(super) key: &'static str,
    pub(super) table: &'static str,
    pub(super) kind: Kind,
    pub(super) example: &'static str,
    pub(super) lowest: f64,
    pub(super) below: fn(String) -> Refusal,
}

const PRESSURE: Spec = Spec {
    key: "pressure",
    table: "columns.pressure",
    kind: Kind::Pressure,
    example: "bar",
    lowest: -1e5,
    below: Refusal::BelowVacuum,
};
const FLOW: Spec = Spec {
    key: "flow",
    table: "columns.flow",
    kind: Kind::Flow,
    example: "L/min",
    lowest: 0.0,
    below: Refusal::NegativeFlow,
};
const VOLUME: Spec = Spec {
    key: "volume",
    table: "columns.volume",
    kind: Kind::Volume,
    example: "L",
    lowest: 0.0,
    below: Refusal::NegativeVolume,
};
const DURATION: Spec = Spec {
    key: "duration",
    table: "columns.duration",
    kind: Kind::Time,
    example: "s",
    lowest: f64::MIN_POSITIVE,
    below: Refusal::NoDuration,
};
pub(super) const TEMPERATURE: Spec = Spec {
    key: "temperature",
    table: "columns.temperature",
    kind: Kind::Temperature,
    example: "°C",
    lowest: 0.0,
    below: Refusal::BelowZeroKelvin,
};
const METER_TEMPERATURE: Spec =
    Spec { key: "meter_temperature", table: "columns.meter_temperature", ..TEMPERATURE };
const BAROMETER: Spec = Spec {
    key: "barometer",
    table: "columns.barometer",
    kind: Kind::Pressure,
    example: "hPa",
    lowest: 0.0,
    below: Refusal::NegativePressure,
};
const METER_PRESSURE: Spec = Spec { key: "meter_pressure", table: "columns.meter_pressure", ..BAROMETER };
const PRESSURE_SCATTER: Spec = Spec {
    key: "pressure_scatter",
    table: "columns.pressure_scatter",
    kind: Kind::Pressure,
    example: "bar",
    lowest: 0.0,
    below: Refusal::NegativeUncertainty,
};
const FLOW_SCATTER: Spec = Spec {
    key: "flow_scatter",
    table: "columns.flow_scatter",
    kind: Kind::Flow,
    example: "L/min",
    lowest: 0.0,
    below: Refusal::NegativeUncertainty,
};

/// The columns given away so far, with the key that has each.
#[derive(Default)]
pub(super) struct Taken(Vec<(String, &'static str)>);

impl Taken {
    pub(super) fn of(&mut self, field: &Field<'_>, spec: &Spec) -> Result<Column, RecordError> {
        let inner = field.table(spec.table)?;
        inner.only(&["column", "unit"])?;
        self.column(&inner, spec)
    }

    pub(super) fn column(&mut self, inner: &Table<'_>, spec: &Spec) -> Result<Column, RecordError> {
        let name = self.name(inner, spec.key)?;
        let unit = inner.field("unit").ok_or_else(|| inner.refuse("unit", Refusal::NoUnit(spec.example)))?;
        Ok(Column {
            name,
            unit: Some(find_unit(&unit, spec.kind)?),
            kept: if spec.kind == Kind::Flow { Kept::LitresPerMinute } else { Kept::Si },
            lowest: spec.lowest,
            below: spec.below,
        })
    }

    fn words(&mut self, field: &Field<'_>) -> Result<String, RecordError> {
        let inner = field.table("columns.sweep")?;
        inner.only(&["column", "unit"])?;
        if let Some(unit) = inner.field("unit") {
            return Err(unit.refuse(Refusal::UnitOfWords));
        }
        self.name(&inner, "sweep")
    }

    fn averaged(&mut self, field: &Field<'_>) -> Result<Column, RecordError> {
        let inner = field.table("columns.averaged")?;
        inner.only(&["column", "unit"])?;
        if let Some(unit) = inner.field("unit") {
            return Err(unit.refuse(Refusal::UnitOfWords));
        }
        let below = |shown| Refusal::OutOfBounds { shown, want: "a count of readings, 1 or more" };
        Ok(Column { name: self.name(&inner, "averaged")?, unit: None, kept: Kept::Si, lowest: 1.0, below })
    }

    pub(super) fn time(&mut self, field: &Field<'_>) -> Result<Time, RecordError> {
        let inner = field.table("columns.time")?;
        inner.only(&["column", "unit"])?;
        let name = self.name(&inner, "time")?;
        let Some(unit) = inner.field("unit") else { return Ok(Time::Written(name)) };
        Ok(Time::Number(Column {
            name,
            unit: Some(find_unit(&unit, Kind::Time)?),
            kept: Kept::Si,
            lowest: f64::MIN,
            below: Refusal::NotFinite,
        }))
    }

    fn name(&mut self, inner: &Table<'_>, key: &'static str) -> Result<String, RecordError> {
        let field = inner.required("column", r#"column = "flow""#)?;
        let name = field.text()?.trim();
        if name.is_empty() {
            return Err(field.refuse(Refusal::EmptyText));
        }
        if let Some((_, other)) = self.0.iter().find(|(taken, _)| taken == name) {
            return Err(field.refuse(Refusal::SameColumn { column: name.to_owned(), other }));
        }
        self.0.push((name.to_owned(), key));
        Ok(name.to_owned())
    }
}

fn find_unit(field: &Field<'_>, kind: Kind) -> Result<Unit, RecordError> {
    let unit = unit::lookup(kind, field.text()?).map_err(|error| field.refuse(Refusal::Quantity(error)))?;
    if let Some(says) = unit.remark {
        field.note(Note::Remark { place: field.place(), says });
    }
    Ok(unit)
}
