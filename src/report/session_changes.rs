//! What was corrected or struck in a session that was recorded row by row, as `session show` tells it.

use chrono::{DateTime, FixedOffset};
use serde_json::{Value, json};

use super::Units;
use super::session_enter_words::{RowWords, row_words};
use super::typed::tame;
use crate::entry::Event;

/// A change after the first writing of a row.
#[derive(Debug, Clone, PartialEq)]
pub struct Change {
    /// When.
    pub at: DateTime<FixedOffset>,
    /// What.
    pub what: Changed,
}

/// What was changed.
#[derive(Debug, Clone, PartialEq)]
pub enum Changed {
    /// A row was recorded wrong.
    Corrected {
        /// The row.
        row: usize,
        /// What had stood there.
        before: Before,
    },
    /// A row was struck.
    Struck {
        /// The row.
        row: usize,
        /// Why.
        why: String,
    },
    /// What stands around the rows was corrected.
    Restated,
}

/// What had stood in a row.
#[derive(Debug, Clone, PartialEq)]
pub enum Before {
    /// Readings of the cells, in bar.
    Readings {
        /// When, in seconds after the first reading.
        at_s: f64,
        /// Each cell; NaN for one that was not read.
        cells: Vec<f64>,
    },
    /// Something that happened.
    Event(Event),
}

/// A change in words.
pub(super) fn words(change: &Change, units: &Units) -> String {
    let at = change.at.to_rfc3339();
    match &change.what {
        Changed::Corrected { row, before } => {
            let was = match before {
                Before::Readings { at_s, cells } => RowWords::Readings { at_s: *at_s, po2_bar: cells },
                Before::Event(event) => RowWords::Event(event),
            };
            format!("row {row} corrected, it was {} ({at})", row_words(was, units))
        }
        Changed::Struck { row, why } => format!("row {row} struck: {} ({at})", tame(why)),
        Changed::Restated => format!("what stands around the rows, stated anew ({at})"),
    }
}

/// A change in JSON.
pub(super) fn json(change: &Change) -> Value {
    let (row, what) = match &change.what {
        Changed::Corrected { row, .. } => (Some(*row), "corrected"),
        Changed::Struck { row, .. } => (Some(*row), "struck"),
        Changed::Restated => (None, "restated"),
    };
    json!({ "row": row, "what": what, "at": change.at.to_rfc3339(), "says": words(change, &Units::default()) })
}
