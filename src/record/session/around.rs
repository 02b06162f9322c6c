//! What stands around a session: `[conditions]`, `[rest]`, the cylinder.

use super::super::around::{Alone, Reader, above_zero};
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::registers::words;
use super::spread::{given, to_k2};
use crate::entry::{Cylinder, Feeds, Rest, SessionConditions};
use crate::gas::Water;
use crate::quantity::text::{span, value};
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, Quantity, Span, Temperature, Uncertain, Volume,
};

/// The words for what a pool is filled with, in files.
pub(super) const WATERS: [(&str, Water); 2] = [("fresh", Water::Fresh), ("sea", Water::Sea)];

/// The words for what a cylinder feeds, in files.
pub(super) const FEEDS: [(&str, Feeds); 2] = [("all", Feeds::All), ("adds", Feeds::Adds)];

/// `[conditions]`; whether depth and loop temperature have columns.
pub(super) fn conditions(
    whole: &Table<'_>,
    depth_column: bool,
    temperature_column: bool,
) -> Result<SessionConditions, RecordError> {
    let Some(table) = whole.table("conditions")? else { return Ok(SessionConditions::default()) };
    table.only(&[
        "barometer",
        "depth",
        "water",
        "loop_temperature",
        "time_on_loop",
        "scrubber_warm",
        "coverage",
    ])?;
    let column = |there: bool| if there { Alone::Column } else { Alone::Refused };
    let reader = Reader { table: &table, to_k2: to_k2(&table)? };
    let barometer = reader.influence::<AbsolutePressure>("barometer", Alone::Refused)?;
    if let (Some(field), Some(pressure)) = (table.field("barometer"), barometer.value) {
        above_zero(&field, pressure)?;
    }
    Ok(SessionConditions {
        barometer,
        depth: reader.influence::<Length>("depth", column(depth_column))?,
        water: table.field("water").map_or(Ok(Water::Fresh), |field| field.word(&WATERS))?,
        loop_temperature: reader.influence::<Temperature>("loop_temperature", column(temperature_column))?,
        time_on_loop: some_span(&table, "time_on_loop")?,
        scrubber_warm: table.field("scrubber_warm").map(|field| field.flag()).transpose()?,
    })
}

/// `[rest]`.
pub(super) fn rest(whole: &Table<'_>) -> Result<Rest, RecordError> {
    let Some(table) = whole.table("rest")? else { return Ok(Rest::default()) };
    table.only(&[
        "posture",
        "rested_for",
        "last_meal",
        "last_exercise",
        "last_dive",
        "caffeine_or_nicotine",
        "water_temperature",
        "suit",
    ])?;
    let temperature = |field: Field<'_>| field.quantity(value::<Temperature>);
    Ok(Rest {
        posture: words(&table, "posture")?,
        rested_for: some_span(&table, "rested_for")?,
        last_meal: some_span(&table, "last_meal")?,
        last_exercise: some_span(&table, "last_exercise")?,
        last_dive: some_span(&table, "last_dive")?,
        caffeine_or_nicotine: table.field("caffeine_or_nicotine").map(|field| field.flag()).transpose()?,
        water_temperature: table.field("water_temperature").map(temperature).transpose()?,
        suit: words(&table, "suit")?,
    })
}

/// The cylinder.
pub(super) fn cylinder(table: &Table<'_>) -> Result<Cylinder, RecordError> {
    table.only(&["volume", "from", "from_temperature", "to", "to_temperature", "feeds", "coverage"])?;
    let k2 = to_k2(table)?;
    let volume = positive::<Volume>(&table.required("volume", r#"volume = "2 L""#)?, k2)?;
    let from = positive::<GaugePressure>(&table.required("from", r#"from = "182 bar ± 1 bar""#)?, k2)?;
    let example = r#"from_temperature = "24 °C ± 1 °C""#;
    let from_temperature = given::<Temperature>(&table.required("from_temperature", example)?, k2)?;
    let to = positive::<GaugePressure>(&table.required("to", r#"to = "171 bar ± 1 bar""#)?, k2)?;
    let example = r#"to_temperature = "24 °C ± 1 °C""#;
    let to_temperature = given::<Temperature>(&table.required("to_temperature", example)?, k2)?;
    let feeds = table.required("feeds", r#"feeds = "all""#)?.word(&FEEDS)?;
    Ok(Cylinder { volume, from, from_temperature, to, to_temperature, feeds })
}

fn positive<T: Quantity>(field: &Field<'_>, to_k2: f64) -> Result<Uncertain<T, T::Difference>, RecordError> {
    let read = given::<T>(field, to_k2)?;
    above_zero(field, read.value)?;
    Ok(read)
}

fn some_span(table: &Table<'_>, key: &str) -> Result<Option<Span>, RecordError> {
    table.field(key).map(|field| field.quantity(span)).transpose()
}

/// A quantity that may be nought and not below, though its kind may be.
pub(super) fn not_negative<T: Quantity>(field: &Field<'_>) -> Result<T, RecordError> {
    let read = field.quantity(value::<T>)?;
    if read.si() >= 0.0 {
        return Ok(read);
    }
    let shown = field.quantity_text()?.to_owned();
    Err(field.refuse(Refusal::OutOfBounds { shown, want: "zero or above" }))
}
