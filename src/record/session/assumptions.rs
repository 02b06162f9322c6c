//! `[assumptions]`: what a session states in place of the method's defaults.
//!
//! Every field of [`Assumptions`] has a key of its name. Those that are a ± are expanded (k = 2 unless the table has
//! `coverage`); `wander`, `least_wander`, `day_spread` and `flush` are standard deviations, as the method has them.

use super::super::around::above_zero;
use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::instruments::share;
use super::SessionRefusal;
use super::around::not_negative;
use super::cells::fraction;
use super::spread::{expanded, given, stpd_wanted, to_k2};
use crate::entry::Assumptions;
use crate::quantity::text::{range, span, value};
use crate::quantity::{
    GaugePressure, Length, PressureDifference, Quantity, QuantityError, Share, Span, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};

/// Every key, in the order of the fields.
const KEYS: [&str; 28] = [
    "dead_time",
    "warm_up",
    "lung_share",
    "lung_carbon_dioxide",
    "washout",
    "washout_time",
    "sealed_fraction",
    "sealed_wait",
    "wander",
    "least_wander",
    "wander_time",
    "leak",
    "day_spread",
    "day_spread_weight",
    "cell_limit",
    "cell_faults",
    "cell_gain",
    "flush",
    "depth_drift",
    "ip_gauge",
    "flow",
    "metered",
    "gas_temperature",
    "loop_volume",
    "mark",
    "average_over",
    "least_usable",
    "coverage",
];

/// Reads the table.
pub(super) fn assumptions(whole: &Table<'_>) -> Result<Assumptions, RecordError> {
    let default = Assumptions::DEFAULT;
    let Some(table) = whole.table("assumptions")? else { return Ok(default) };
    table.only(&KEYS)?;
    let reader = Reader { table: &table, to_k2: to_k2(&table)? };
    Ok(Assumptions {
        dead_time: reader.span("dead_time", default.dead_time)?,
        warm_up: reader.span("warm_up", default.warm_up)?,
        lung_share: reader.or("lung_share", default.lung_share, |f| fraction(f, false))?,
        lung_carbon_dioxide: reader.or(
            "lung_carbon_dioxide",
            default.lung_carbon_dioxide,
            not_negative::<PressureDifference>,
        )?,
        washout: reader.or("washout", default.washout, flows)?,
        washout_time: reader.some_time("washout_time", default.washout_time)?,
        sealed_fraction: reader.or("sealed_fraction", default.sealed_fraction, |f| fraction(f, false))?,
        sealed_wait: reader.span("sealed_wait", default.sealed_wait)?,
        wander: reader.or("wander", default.wander, share)?,
        least_wander: reader.or("least_wander", default.least_wander, share)?,
        wander_time: reader.some_time("wander_time", default.wander_time)?,
        leak: reader.or("leak", default.leak, |f| flows(f).map(Some))?,
        day_spread: reader.or("day_spread", default.day_spread, |f| {
            above_zero(f, Share::from_ratio(share(f)?)).map(Share::as_ratio)
        })?,
        day_spread_weight: reader.or("day_spread_weight", default.day_spread_weight, |f| {
            f.number("a number of degrees of freedom above zero", |weight| weight > 0.0)
        })?,
        cell_limit: reader.or("cell_limit", default.cell_limit, |f| {
            above_zero(f, f.quantity(value::<PressureDifference>)?)
        })?,
        cell_faults: reader.or("cell_faults", default.cell_faults, |f| fraction(f, false))?,
        cell_gain: reader.spread("cell_gain", default.cell_gain)?,
        flush: reader.or("flush", default.flush, share)?,
        depth_drift: reader.or("depth_drift", default.depth_drift, |f| expanded::<Length>(f, 1.0))?,
        ip_gauge: reader.or("ip_gauge", default.ip_gauge, |f| expanded::<GaugePressure>(f, reader.to_k2))?,
        flow: reader.spread("flow", default.flow)?,
        metered: reader.spread("metered", default.metered)?,
        gas_temperature: reader.or("gas_temperature", default.gas_temperature, |f| reader.temperature(f))?,
        loop_volume: reader.spread("loop_volume", default.loop_volume)?,
        mark: reader.or("mark", default.mark, |f| expanded::<Volume>(f, reader.to_k2))?,
        average_over: reader.some_time("average_over", default.average_over)?,
        least_usable: reader.span("least_usable", default.least_usable)?,
    })
}

struct Reader<'t, 'd> {
    table: &'t Table<'d>,
    to_k2: f64,
}

impl<'d> Reader<'_, 'd> {
    fn or<T>(
        &self,
        key: &str,
        default: T,
        read: impl FnOnce(&Field<'d>) -> Result<T, RecordError>,
    ) -> Result<T, RecordError> {
        self.table.field(key).map_or(Ok(default), |field| read(&field))
    }

    fn span(&self, key: &str, default: Span) -> Result<Span, RecordError> {
        self.or(key, default, |field| field.quantity(span))
    }

    /// A span above zero.
    fn some_time(&self, key: &str, default: Span) -> Result<Span, RecordError> {
        self.or(key, default, |field| above_zero(field, field.quantity(span)?))
    }

    /// A relative ±.
    fn spread(&self, key: &str, default: f64) -> Result<f64, RecordError> {
        self.or(key, default, |field| expanded::<Share>(field, self.to_k2).map(Share::as_ratio))
    }

    /// A temperature; without a ± it keeps that of the default.
    fn temperature(&self, field: &Field<'_>) -> Result<(Temperature, TemperatureDifference), RecordError> {
        let Uncertain { value, expanded } = given::<Temperature>(field, self.to_k2)?;
        Ok((value, expanded.unwrap_or(Assumptions::DEFAULT.gas_temperature.1)))
    }
}

/// The lowest and the highest of a flow: "20 mL/min to 60 mL/min", or a list of the two, which may be equal.
fn flows(field: &Field<'_>) -> Result<(StpdFlow, StpdFlow), RecordError> {
    if field.is_text() {
        return field.quantity(range::<StpdFlow>).map_err(stpd_wanted);
    }
    let items = field.items()?;
    let [low, high] = items.as_slice() else {
        return Err(field.refuse(SessionRefusal::NotTwoEnds.into()));
    };
    let end = |item: &Field<'_>| item.quantity(value::<StpdFlow>).map_err(stpd_wanted);
    let ends = (end(low)?, end(high)?);
    if ends.0.si() <= ends.1.si() {
        return Ok(ends);
    }
    let text = format!("{} to {}", low.text()?, high.text()?);
    Err(field.refuse(Refusal::Quantity(QuantityError::RangeOrder { text })))
}
