//! Uncertainties after a ± in the tables of a session, brought to k = 2.

use super::super::document::{Field, Table};
use super::super::error::RecordError;
use super::super::instruments::{COVERAGE, coverage};
use crate::quantity::text::{expanded_only, uncertain};
use crate::quantity::{Quantity, Uncertain};

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

fn scaled<D: Quantity>(given: D, to_k2: f64) -> D {
    // What is at k = 2 already stays as it is to the last bit.
    if to_k2.to_bits() == 1_f64.to_bits() { given } else { D::from_si(given.si() * to_k2) }
}
