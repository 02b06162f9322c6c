//! An orifice of the register.

use super::super::document::Table;
use super::super::error::RecordError;
use super::super::run::BUILDS;
use super::keys::{id, positive, words};
use crate::entry::{Build, Id, Orifice};

const KEYS: [&str; 10] = [
    "record",
    "id",
    "description",
    "serial",
    "maker",
    "customer",
    "build",
    "length",
    "nominal_diameter",
    "acceptance",
];

pub(super) fn read(file: &Table<'_>, stands: Option<&Id>) -> Result<Orifice, RecordError> {
    file.only(&KEYS)?;
    Ok(Orifice {
        id: id(file, "id = \"CMF-0417\"", stands)?,
        description: words(file, "description")?,
        serial: words(file, "serial")?,
        maker: words(file, "maker")?,
        customer: words(file, "customer")?,
        build: file.field("build").map_or(Ok(Build::Unknown), |field| field.word(&BUILDS))?,
        length: positive(file, "length")?,
        nominal_diameter: positive(file, "nominal_diameter")?,
        acceptance: file.field("acceptance").map(|field| field.id()).transpose()?,
    })
}
