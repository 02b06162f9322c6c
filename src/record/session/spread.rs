//! Uncertainties after a ± in the tables of a session, brought to k = 2.

use super::super::around::above_zero;
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::instruments::{COVERAGE, coverage};
use super::SessionRefusal;
use crate::quantity::text::{expanded_only, uncertain};
use crate::quantity::{Quantity, QuantityError, StpdFlow, Uncertain, Volume};

/// What brings an expanded uncertainty of this table to k = 2.
pub(super) fn to_k2(table: &Table<'_>) -> Result<f64, RecordError> {
    Ok(COVERAGE / coverage(table)?)
}

/// A value with or without its ±.
pub(super) fn given<T: Quantity>(
    field: &Field<'_>,
    to_k2: f64,
) -> Result<Uncertain<T, T::Difference>, RecordError> {
    let Uncertain { value, expanded } = field.quantity(uncertain::<T>)?;
    Ok(Uncertain { value, expanded: expanded.map(|d| scaled(d, to_k2)) })
}

/// An expanded uncertainty alone, as "± 0.5 bar" or "0.5 bar".
pub(super) fn expanded<T: Quantity>(field: &Field<'_>, to_k2: f64) -> Result<T::Difference, RecordError> {
    field.quantity(expanded_only::<T>).map(|d| scaled(d, to_k2))
}

/// A flow at STPD with or without its ±.
///
/// Nothing beside it could say other reference conditions, so litres that hide theirs are refused in their own words.
pub(super) fn flow(field: &Field<'_>, to_k2: f64) -> Result<Uncertain<StpdFlow>, RecordError> {
    given::<StpdFlow>(field, to_k2).map_err(stpd_wanted)
}

/// The refusal of a flow that hides its reference conditions, in the words of [`flow`]; any other as it is.
pub(super) fn stpd_wanted(error: RecordError) -> RecordError {
    with_wanted(error, "the flow in L/min STPD (0 °C, 101.325 kPa, dry)")
}

/// A volume of actual litres, above zero, with or without its ±.
pub(super) fn actual_volume(field: &Field<'_>, to_k2: f64) -> Result<Uncertain<Volume>, RecordError> {
    let wanted = "the volume in actual litres, as in \"7.5 L ± 1.0 L\"";
    let read = given::<Volume>(field, to_k2).map_err(|error| with_wanted(error, wanted))?;
    above_zero(field, read.value)?;
    Ok(read)
}

fn with_wanted(error: RecordError, wanted: &'static str) -> RecordError {
    let RecordError::Input { place, refusal } = error else { return error };
    match *refusal {
        Refusal::Quantity(QuantityError::UnstatedReference { text, .. }) => {
            Refusal::from(SessionRefusal::UnstatedLitres { text, wanted }).at(place)
        }
        other => other.at(place),
    }
}

fn scaled<D: Quantity>(given: D, to_k2: f64) -> D {
    // What is at k = 2 already stays as it is to the last bit.
    if to_k2.to_bits() == 1_f64.to_bits() { given } else { D::from_si(given.si() * to_k2) }
}
