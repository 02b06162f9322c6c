//! Acceptance limits of the register: the keys of `[acceptance]` in a run file, with a name.

use super::super::around::{ACCEPTANCE, limits};
use super::super::document::Table;
use super::super::error::RecordError;
use super::keys::id;
use crate::entry::{Acceptance, Id};

pub(super) fn read(file: &Table<'_>, stands: Option<&Id>) -> Result<Acceptance, RecordError> {
    let known: Vec<&str> = std::iter::once("record").chain(ACCEPTANCE).collect();
    file.only(&known)?;
    let id = id(file, "id = \"SHOP-5\"", stands)?;
    Ok(Acceptance { id: Some(id), ..limits(file)? })
}
