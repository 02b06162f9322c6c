//! A diver of the register.

use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::keys::{id, positive, uncertain_positive, words};
use crate::entry::{Diluent, Diver, Id};
use crate::quantity::Share;
use crate::quantity::text::value;

const KEYS: [&str; 6] = ["record", "id", "name", "mass", "loop_volume", "diluent"];

pub(super) fn read(file: &Table<'_>, stands: Option<&Id>) -> Result<Diver, RecordError> {
    file.only(&KEYS)?;
    Ok(Diver {
        id: id(file, "id = \"D-07\"", stands)?,
        name: words(file, "name")?,
        mass: positive(file, "mass")?,
        loop_volume: uncertain_positive(file, "loop_volume")?,
        diluent: file.field("diluent").map(|field| diluent(&field)).transpose()?,
    })
}

/// "air", or "oxygen" with its share.
pub(in crate::record) fn diluent(field: &Field<'_>) -> Result<Diluent, RecordError> {
    let text = field.text()?.trim();
    if text == "air" {
        return Ok(Diluent::Air);
    }
    let Some(share) = text.strip_prefix("oxygen").filter(|rest| !rest.trim().is_empty()) else {
        let known = "air, oxygen 18 % (with its own share)".to_owned();
        return Err(field.refuse(Refusal::UnknownWord { word: text.to_owned(), known }));
    };
    let share = value::<Share>(share.trim()).map_err(|error| field.refuse(Refusal::Quantity(error)))?;
    if share.as_ratio() > 0.0 && share.as_ratio() <= 1.0 {
        return Ok(Diluent::Oxygen(share));
    }
    Err(field
        .refuse(Refusal::OutOfBounds { shown: text.to_owned(), want: "above 0 % and at most 100 % oxygen" }))
}
