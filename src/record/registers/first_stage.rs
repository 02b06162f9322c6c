//! A first stage of the register, with the gauge it is set by.

use super::super::around::above_zero;
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::keys::{id, positive, spread, uncertain_positive, words};
use crate::entry::{FirstStage, Id};
use crate::quantity::text::{range, value};
use crate::quantity::{GaugePressure, PressureDifference};

const KEYS: [&str; 14] = [
    "record",
    "id",
    "compensated",
    "ip_range",
    "division",
    "gauge_scale",
    "gauge_error",
    "ip_spread",
    "ip_repeat",
    "max_ip",
    "trapped_volume",
    "fall_observed",
    "maker",
    "serial",
];

pub(super) fn read(file: &Table<'_>, stands: Option<&Id>) -> Result<FirstStage, RecordError> {
    file.only(&KEYS)?;
    let id = id(file, "id = \"FS-01\"", stands)?;
    let compensated =
        file.required("compensated", "compensated = false (its IP does not follow depth)")?.flag()?;
    let field = file.required("ip_range", "ip_range = \"7 bar to 13 bar\"")?;
    let (low, high) = field.quantity(range::<GaugePressure>)?;
    if low.as_pa() < 0.0 {
        return Err(out_of_bounds(&field, "from 0 bar up, over ambient"));
    }
    let field = file.required("division", "division = \"0.1 bar\"")?;
    let division = above_zero(&field, field.quantity(value::<PressureDifference>)?)?;
    if division.as_pa() > high.as_pa() - low.as_pa() {
        return Err(out_of_bounds(&field, "at most the width of ip_range"));
    }
    let at_least = |key: &str, least: GaugePressure, want: &'static str| {
        let given = positive::<GaugePressure>(file, key)?;
        match (given, file.field(key)) {
            (Some(given), Some(field)) if given.as_pa() < least.as_pa() => Err(out_of_bounds(&field, want)),
            _ => Ok(given),
        }
    };
    Ok(FirstStage {
        id,
        compensated,
        ip_range: (low, high),
        division,
        gauge_scale: at_least("gauge_scale", high, "at least the upper end of ip_range")?,
        gauge_error: spread(file, "gauge_error")?,
        ip_spread: spread(file, "ip_spread")?,
        ip_repeat: spread(file, "ip_repeat")?,
        max_ip: at_least("max_ip", low, "at least the lower end of ip_range")?,
        trapped_volume: uncertain_positive(file, "trapped_volume")?,
        fall_observed: uncertain_positive(file, "fall_observed")?,
        maker: words(file, "maker")?,
        serial: words(file, "serial")?,
    })
}

fn out_of_bounds(field: &Field<'_>, want: &'static str) -> RecordError {
    let shown = field.quantity_text().unwrap_or_default().to_owned();
    field.refuse(Refusal::OutOfBounds { shown, want })
}
