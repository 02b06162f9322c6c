//! Rows of a table to points or to a series.
//!
//! Comes in: what stands in which column, and an opened table. Goes out: [`Readings`] in the units the entry keeps.
//! A steady point needs every cell of its columns; in a series an empty cell is a missing reading. Rows are counted
//! while they are read, so a file beyond the limits is left where the limit is.

use super::columns::{Column, Columns, Flow, Placed, Time};
use super::error::{RecordError, Refusal};
use super::sheet::Sheet;
use super::times::Times;
use crate::entry::{Indication, PointReading, Readings, SeriesReadings, Sweep, TimedVolume};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, Span, Temperature, Volume,
};

/// Most rows of steady points.
pub const MOST_POINTS: usize = 5_000;

/// Most rows of a time series.
pub const MOST_SERIES_ROWS: usize = 5_000_000;

/// The words of the sweep column.
pub(super) const SWEEPS: [(&str, Sweep); 2] = [("rising", Sweep::Rising), ("falling", Sweep::Falling)];

/// Reads every row as a steady point.
pub(super) fn points(sheet: &mut Sheet, columns: &Columns) -> Result<Readings, RecordError> {
    let pressure = place(sheet, &columns.pressure)?;
    let flow = PlacedFlow::of(sheet, &columns.flow)?;
    let temperature = place_some(sheet, columns.temperature.as_ref())?;
    let barometer = place_some(sheet, columns.barometer.as_ref())?;
    let meter_temperature = place_some(sheet, columns.meter_temperature.as_ref())?;
    let meter_pressure = place_some(sheet, columns.meter_pressure.as_ref())?;
    let pressure_scatter = place_some(sheet, columns.pressure_scatter.as_ref())?;
    let flow_scatter = place_some(sheet, columns.flow_scatter.as_ref())?;
    let averaged = place_some(sheet, columns.averaged.as_ref())?;
    let sweep = columns.sweep.as_ref().and_then(|name| sheet.column(name));
    let mut time = columns.time.as_ref().map(|time| Clock::of(sheet, time)).transpose()?;
    let mut points = Vec::new();
    while sheet.next_row()? {
        if points.len() == MOST_POINTS {
            return Err(sheet.refuse_row(Refusal::TooManyRows(MOST_POINTS)));
        }
        let shown_pa = pressure.needed(sheet)?;
        let (shown, timed) = flow.needed(sheet)?;
        points.push(PointReading {
            pressure: if columns.absolute {
                Indication::Absolute(AbsolutePressure::from_pa(shown_pa))
            } else {
                Indication::Gauge(GaugePressure::from_pa(shown_pa))
            },
            flow: shown,
            timed,
            pressure_scatter: needed(&pressure_scatter, sheet)?.map(PressureDifference::from_pa),
            flow_scatter: needed(&flow_scatter, sheet)?.map(IndicatedFlow::from_l_min),
            averaged: needed(&averaged, sheet)?.unwrap_or(1.0),
            temperature: needed(&temperature, sheet)?.map(Temperature::from_k),
            barometer: needed(&barometer, sheet)?.map(AbsolutePressure::from_pa),
            meter_temperature: needed(&meter_temperature, sheet)?.map(Temperature::from_k),
            meter_pressure: needed(&meter_pressure, sheet)?.map(AbsolutePressure::from_pa),
            sweep: sweep.map_or(Ok(None), |column| read_sweep(sheet, column))?,
            time_s: time.as_mut().map(|time| time.next(sheet)).transpose()?,
        });
    }
    if points.is_empty() { Err(sheet.refuse_table(Refusal::NoRows)) } else { Ok(Readings::Points(points)) }
}

/// Reads every row as one instant of a time series.
pub(super) fn series(sheet: &mut Sheet, columns: &Columns) -> Result<Readings, RecordError> {
    let (Flow::Read(flow), Some(time)) = (&columns.flow, &columns.time) else {
        // `Columns::read` has refused a series without times and of a timed meter.
        return Err(sheet.refuse_table(Refusal::SeriesNeedsTime));
    };
    let mut time = Clock::of(sheet, time)?;
    let wanted = [
        Some(&columns.pressure),
        Some(flow),
        columns.temperature.as_ref(),
        columns.barometer.as_ref(),
        columns.meter_temperature.as_ref(),
        columns.meter_pressure.as_ref(),
    ];
    let mut filled: [Option<Vec<f64>>; 6] = Default::default();
    let mut reading = Vec::new();
    for (column, slot) in wanted.into_iter().zip(0..) {
        if let Some(column) = column {
            reading.push((place(sheet, column)?, slot, Vec::new()));
        }
    }
    let mut time_s: Vec<f64> = Vec::new();
    let mut before = f64::NEG_INFINITY;
    while sheet.next_row()? {
        if time_s.len() == MOST_SERIES_ROWS {
            return Err(sheet.refuse_row(Refusal::TooManyRows(MOST_SERIES_ROWS)));
        }
        let now = time.next(sheet)?;
        if now < before {
            return Err(time.refuse(sheet, Refusal::Backwards));
        }
        before = now;
        time_s.push(now);
        for (column, _, values) in &mut reading {
            values.push(column.or_missing(sheet)?);
        }
    }
    if time_s.is_empty() {
        return Err(sheet.refuse_table(Refusal::NoRows));
    }
    for (_, slot, values) in reading {
        let slot: usize = slot;
        filled[slot] = Some(values);
    }
    let [pressure_pa, flow_l_min, temperature_k, barometer_pa, meter_temperature_k, meter_pressure_pa] =
        filled;
    Ok(Readings::Series(SeriesReadings {
        time_s,
        pressure_pa: pressure_pa.unwrap_or_default(),
        pressure_is_absolute: columns.absolute,
        flow_l_min: flow_l_min.unwrap_or_default(),
        temperature_k,
        barometer_pa,
        meter_temperature_k,
        meter_pressure_pa,
    }))
}

enum PlacedFlow<'c> {
    Read(Placed<'c>),
    Timed { volume: Placed<'c>, duration: Placed<'c> },
}

impl<'c> PlacedFlow<'c> {
    fn of(sheet: &Sheet, flow: &'c Flow) -> Result<Self, RecordError> {
        Ok(match flow {
            Flow::Read(column) => Self::Read(place(sheet, column)?),
            Flow::Timed { volume, duration } => {
                Self::Timed { volume: place(sheet, volume)?, duration: place(sheet, duration)? }
            }
        })
    }

    fn needed(&self, sheet: &mut Sheet) -> Result<(IndicatedFlow, Option<TimedVolume>), RecordError> {
        match self {
            Self::Read(column) => Ok((IndicatedFlow::from_l_min(column.needed(sheet)?), None)),
            Self::Timed { volume, duration } => {
                let (volume_m3, duration_s) = (volume.needed(sheet)?, duration.needed(sheet)?);
                let timed =
                    TimedVolume { volume: Volume::from_m3(volume_m3), duration: Span::from_s(duration_s) };
                Ok((IndicatedFlow::from_m3_s(volume_m3 / duration_s), Some(timed)))
            }
        }
    }
}

/// The time column while it is read.
enum Clock<'c> {
    Written { times: Times, index: usize },
    Number { column: Placed<'c>, first: Option<f64> },
}

impl<'c> Clock<'c> {
    fn of(sheet: &Sheet, time: &'c Time) -> Result<Self, RecordError> {
        Ok(match time {
            Time::Written(name) => Self::Written { times: Times::default(), index: index(sheet, name)? },
            Time::Number(column) => Self::Number { column: place(sheet, column)?, first: None },
        })
    }

    /// Seconds since the first row.
    fn next(&mut self, sheet: &mut Sheet) -> Result<f64, RecordError> {
        match self {
            Self::Written { times, index } => match sheet.cell(*index) {
                [] => Err(sheet.refuse(*index, Refusal::EmptyCell)),
                cell => times.seconds(cell).map_err(|refusal| sheet.refuse(*index, refusal)),
            },
            Self::Number { column, first } => {
                let now = column.needed(sheet)?;
                Ok(now - *first.get_or_insert(now))
            }
        }
    }

    fn refuse(&self, sheet: &Sheet, refusal: Refusal) -> RecordError {
        match self {
            Self::Written { index, .. } => sheet.refuse(*index, refusal),
            Self::Number { column, .. } => column.refuse(sheet, refusal),
        }
    }
}

fn needed(column: &Option<Placed<'_>>, sheet: &mut Sheet) -> Result<Option<f64>, RecordError> {
    column.as_ref().map(|column| column.needed(sheet)).transpose()
}

fn read_sweep(sheet: &Sheet, column: usize) -> Result<Option<Sweep>, RecordError> {
    let word = sheet.cell(column);
    if word.is_empty() {
        return Ok(None);
    }
    let known = SWEEPS.iter().find(|(name, _)| name.as_bytes() == word);
    known.map(|(_, sweep)| Some(*sweep)).ok_or_else(|| {
        let word = String::from_utf8_lossy(word).into_owned();
        let known = format!("{}, {}, or an empty cell", SWEEPS[0].0, SWEEPS[1].0);
        sheet.refuse(column, Refusal::UnknownWord { word, known })
    })
}

fn place<'c>(sheet: &Sheet, column: &'c Column) -> Result<Placed<'c>, RecordError> {
    column.placed(sheet).ok_or_else(|| sheet.refuse_table(Refusal::NoColumn(column.name.clone())))
}

fn place_some<'c>(sheet: &Sheet, column: Option<&'c Column>) -> Result<Option<Placed<'c>>, RecordError> {
    column.map(|column| place(sheet, column)).transpose()
}

fn index(sheet: &Sheet, name: &str) -> Result<usize, RecordError> {
    sheet.column(name).ok_or_else(|| sheet.refuse_table(Refusal::NoColumn(name.to_owned())))
}
