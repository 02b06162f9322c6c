//! `[cells]`: what is known of the oxygen cells.

use super::super::around::above_zero;
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::instruments::share;
use super::super::note::Note;
use super::SessionRefusal;
use super::columns::Cell;
use super::spread::{expanded, to_k2};
use crate::entry::{CalibratedAt, CellPapers, CellReadings, CellSignal};
use crate::quantity::text::value;
use crate::quantity::{AbsolutePressure, Share, Temperature, Voltage};

/// What `[cells]` says.
#[derive(Default)]
pub(super) struct Papers {
    pub(super) common: CellPapers,
    /// Volts in air and in oxygen of each cell read in volts, in their order.
    points: Vec<(f64, f64)>,
}

/// Reads the table; `whole` is the file, for what is missing when there is no table.
pub(super) fn papers(whole: &Table<'_>, cells: &[Cell]) -> Result<Papers, RecordError> {
    papers_of(whole, cells.iter().filter(|cell| cell.in_volts).count())
}

/// The table for so many cells that are read in volts.
fn papers_of(whole: &Table<'_>, in_volts: usize) -> Result<Papers, RecordError> {
    let Some(table) = whole.table("cells")? else {
        return match in_volts {
            0 => Ok(Papers::default()),
            _ => Err(whole.refuse("[cells] air", Refusal::MissingKey(AIR))),
        };
    };
    table.only(&["gain", "coverage", "air", "oxygen", "calibrated_at"])?;
    let gain = table.field("gain").map(|field| expanded::<Share>(&field, to_k2(&table)?)).transpose()?;
    let gain = gain.map(Share::as_ratio);
    let calibrated_at = table.table("calibrated_at")?.map(|inner| calibrated_at(&inner)).transpose()?;
    if in_volts == 0 {
        if let Some(field) = ["air", "oxygen"].into_iter().find_map(|key| table.field(key)) {
            return Err(field.refuse(SessionRefusal::NoVoltCells.into()));
        }
        if let Some(field) = table.field("calibrated_at") {
            field.note(Note::NotUsed { place: field.place(), why: "only a cell read in mV needs it" });
        }
        return Ok(Papers { common: CellPapers { gain, calibrated_at }, points: Vec::new() });
    }
    let air = voltages(&table.required("air", AIR)?, in_volts)?;
    let oxygen_field = table.required("oxygen", OXYGEN)?;
    let oxygen = voltages(&oxygen_field, in_volts)?;
    if calibrated_at.is_none() {
        return Err(table.refuse("calibrated_at", Refusal::MissingKey(CALIBRATED_AT)));
    }
    let points: Vec<(f64, f64)> = air.into_iter().zip(oxygen).collect();
    // One dead cell is left out by name later; all of them are a mistake in the file.
    if points.iter().all(|(air, oxygen)| oxygen <= air) {
        return Err(oxygen_field.refuse(SessionRefusal::AirAboveOxygen.into()));
    }
    Ok(Papers { common: CellPapers { gain, calibrated_at }, points })
}

/// The calibration of cells that are read in mV.
#[derive(Debug, Clone, PartialEq)]
pub struct CellCalibration {
    /// Volts in air and in oxygen of each such cell, in their order.
    pub points: Vec<(f64, f64)>,
    /// The state at the calibration.
    pub at: CalibratedAt,
}

/// The calibration that a session file has for `in_volts` cells; none when its `[cells]` names none.
///
/// # Errors
/// As for the table of a session file with such cells.
pub(super) fn calibration(
    whole: &Table<'_>,
    in_volts: usize,
) -> Result<Option<CellCalibration>, RecordError> {
    let Some(table) = whole.table("cells")? else { return Ok(None) };
    if table.field("air").is_none() && table.field("oxygen").is_none() {
        return Ok(None);
    }
    let papers = papers_of(whole, in_volts)?;
    let at = papers.common.calibrated_at;
    Ok(at.map(|at| CellCalibration { points: papers.points, at }))
}

const AIR: &str = r#"air = ["10.1 mV", "10.4 mV"]"#;
const OXYGEN: &str = r#"oxygen = ["48.0 mV", "49.2 mV"]"#;
const CALIBRATED_AT: &str = r#"calibrated_at = { barometer = "1013 hPa", temperature = "20 °C", humidity = "50 %", oxygen = "99.5 %" }"#;

fn voltages(field: &Field<'_>, cells: usize) -> Result<Vec<f64>, RecordError> {
    let items = field.items()?;
    if items.len() != cells {
        return Err(field.refuse(SessionRefusal::OnePerCell { got: items.len(), cells }.into()));
    }
    items
        .iter()
        .map(|item| {
            let given = item.quantity(value::<Voltage>)?.as_v();
            if given >= 0.0 {
                return Ok(given);
            }
            let shown = item.text()?.to_owned();
            Err(item.refuse(Refusal::OutOfBounds { shown, want: "zero or above" }))
        })
        .collect()
}

fn calibrated_at(table: &Table<'_>) -> Result<CalibratedAt, RecordError> {
    table.only(&["barometer", "temperature", "humidity", "oxygen"])?;
    let barometer = table.required("barometer", r#"barometer = "1013 hPa""#)?;
    let barometer = above_zero(&barometer, barometer.quantity(value::<AbsolutePressure>)?)?;
    let temperature =
        table.required("temperature", r#"temperature = "20 °C""#)?.quantity(value::<Temperature>)?;
    let humidity = fraction(&table.required("humidity", r#"humidity = "50 %""#)?, false)?;
    let oxygen = fraction(&table.required("oxygen", r#"oxygen = "99.5 %""#)?, true)?;
    Ok(CalibratedAt { barometer, temperature, humidity, oxygen })
}

/// A share of a whole, 0 to 1, or above 0.
pub(super) fn fraction(field: &Field<'_>, above: bool) -> Result<f64, RecordError> {
    let given = share(field)?;
    if (given > 0.0 || !above) && given <= 1.0 {
        return Ok(given);
    }
    let shown = field.quantity_text()?.to_owned();
    let want = if above { "above 0 % and at most 100 %" } else { "between 0 % and 100 %" };
    Err(field.refuse(Refusal::OutOfBounds { shown, want }))
}

/// Puts the columns of the cells and their calibration together.
pub(super) fn readings(cells: Vec<Cell>, columns: Vec<Vec<f64>>, papers: &Papers) -> Vec<CellReadings> {
    let mut points = papers.points.iter().peekable();
    let each = |(cell, readings): (Cell, Vec<f64>)| {
        let signal = match points.next_if(|_| cell.in_volts) {
            Some(&(in_air, in_oxygen)) => CellSignal::Volts { readings, in_air, in_oxygen },
            None => CellSignal::Bar(readings),
        };
        CellReadings { name: cell.name, signal }
    };
    cells.into_iter().zip(columns).map(each).collect()
}
