//! Keys that several registers have.

use super::super::around::above_zero;
use super::super::document::Table;
use super::super::error::{RecordError, Refusal};
use super::RegisterRefusal;
use crate::entry::Id;
use crate::quantity::text::{expanded_only, uncertain, value};
use crate::quantity::{PressureDifference, Quantity, Uncertain};

/// The entry's name: as given, or in an edit that which stands.
pub(super) fn id(file: &Table<'_>, example: &'static str, stands: Option<&Id>) -> Result<Id, RecordError> {
    let field = file.required("id", example)?;
    let given = field.id()?;
    match stands {
        None => Ok(given),
        Some(stands) if stands.same_as(&given) => Ok(stands.clone()),
        Some(stands) => {
            let (given, stands) = (given.as_str().to_owned(), stands.as_str().to_owned());
            Err(field.refuse(RegisterRefusal::OtherId { given, stands }.into()))
        }
    }
}

/// Words on one line.
pub(in crate::record) fn words(file: &Table<'_>, key: &str) -> Result<Option<String>, RecordError> {
    file.field(key).map_or(Ok(None), |field| field.free_text())
}

/// Words that must be there.
pub(super) fn required_words(
    file: &Table<'_>,
    key: &str,
    example: &'static str,
) -> Result<String, RecordError> {
    let field = file.required(key, example)?;
    field.free_text()?.ok_or_else(|| field.refuse(Refusal::EmptyText))
}

/// A quantity above zero.
pub(in crate::record) fn positive<T: Quantity>(
    file: &Table<'_>,
    key: &str,
) -> Result<Option<T>, RecordError> {
    let read = |field: super::super::document::Field<'_>| above_zero(&field, field.quantity(value::<T>)?);
    file.field(key).map(read).transpose()
}

/// A quantity above zero with or without its ±.
pub(super) fn uncertain_positive<T: Quantity>(
    file: &Table<'_>,
    key: &str,
) -> Result<Option<Uncertain<T, T::Difference>>, RecordError> {
    let Some(field) = file.field(key) else { return Ok(None) };
    let given = field.quantity(uncertain::<T>)?;
    above_zero(&field, given.value)?;
    Ok(Some(given))
}

/// An amount of pressure that is not negative, with a ± before it or without.
pub(super) fn spread(file: &Table<'_>, key: &str) -> Result<Option<PressureDifference>, RecordError> {
    file.field(key).map(|field| field.quantity(expanded_only::<PressureDifference>)).transpose()
}
