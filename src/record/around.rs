//! What stands around the readings: `[conditions]`, `[before]`, `[after]`, `[acceptance]`, `[[leave_out]]`.

use super::columns::Columns;
use super::document::{Field, Table};
use super::error::{RecordError, Refusal};
use super::instruments::{COVERAGE, GASES, coverage, is_share, share};
use super::note::Note;
use crate::entry::{Acceptance, Conditions, Influence, LeftOut, Limits, Rule, Tolerance, ZeroAndLeak};
use crate::quantity::text::{expanded_only, range, uncertain, value, zero_reading};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, PressureRate, Quantity, Share,
    StpdFlow, Temperature,
};

/// The words for decision rules, in files.
pub(super) const RULES: [(&str, Rule); 2] = [("guarded", Rule::Guarded), ("simple", Rule::Simple)];

/// The conditions; `whole` is the file, for what is missing when there is no table.
pub(super) fn conditions(
    whole: &Table<'_>,
    columns: &Columns,
    uses_volume: bool,
    wet: bool,
) -> Result<Conditions, RecordError> {
    let Some(table) = whole.table("conditions")? else {
        let none = Conditions::default();
        return required(none, columns, |key, refusal| whole.refuse(&format!("[conditions] {key}"), refusal));
    };
    let column = |column: bool| if column { Alone::Column } else { Alone::Refused };
    let gas_in_meter = |column: bool| if column { Alone::Column } else { Alone::Taken };
    let alone = AloneFor {
        temperature: column(columns.temperature.is_some()),
        barometer: column(columns.barometer.is_some()),
        meter_temperature: gas_in_meter(columns.meter_temperature.is_some()),
        meter_pressure: gas_in_meter(columns.meter_pressure.is_some()),
    };
    let given = stated(&table, &alone, uses_volume, wet)?;
    required(given, columns, |key, refusal| table.refuse(key, refusal))
}

/// The conditions of a file whose readings do not count: a value may be missing, as it is given elsewhere.
pub(super) fn conditions_without_readings(
    whole: &Table<'_>,
    uses_volume: bool,
    wet: bool,
) -> Result<Conditions, RecordError> {
    let alone = AloneFor {
        temperature: Alone::Taken,
        barometer: Alone::Taken,
        meter_temperature: Alone::Taken,
        meter_pressure: Alone::Taken,
    };
    let table = whole.table("conditions")?;
    table.map_or_else(|| Ok(Conditions::default()), |table| stated(&table, &alone, uses_volume, wet))
}

/// What `[conditions]` states.
fn stated(
    table: &Table<'_>,
    alone: &AloneFor,
    uses_volume: bool,
    wet: bool,
) -> Result<Conditions, RecordError> {
    table.only(&[
        "temperature",
        "barometer",
        "back_pressure",
        "humidity",
        "meter_temperature",
        "meter_pressure",
        "water_temperature",
        "coverage",
    ])?;
    let to_k2 = COVERAGE / coverage(table)?;
    for (key, used, why) in [
        ("humidity", uses_volume, "only a meter that shows the volume that passes needs it"),
        ("meter_temperature", uses_volume, "only a meter that shows the volume that passes needs it"),
        ("meter_pressure", uses_volume, "only a meter that shows the volume that passes needs it"),
        ("water_temperature", wet, "only a wet meter needs it"),
    ] {
        if let (false, Some(field)) = (used, table.field(key)) {
            field.note(Note::NotUsed { place: field.place(), why });
        }
    }
    let reader = Reader { table, to_k2 };
    let humidity = reader.influence::<Share>("humidity", Alone::Refused)?;
    if let (Some(share), Some(field)) = (humidity.value, table.field("humidity"))
        && share.as_ratio() > 1.0
    {
        let shown = field.text()?.to_owned();
        return Err(field.refuse(Refusal::OutOfBounds { shown, want: "between 0 % and 100 %" }));
    }
    Ok(Conditions {
        temperature: reader.influence::<Temperature>("temperature", alone.temperature)?,
        barometer: reader.influence::<AbsolutePressure>("barometer", alone.barometer)?,
        back_pressure: reader.influence::<PressureDifference>("back_pressure", Alone::Refused)?,
        humidity: Influence {
            value: humidity.value.map(Share::as_ratio),
            expanded: humidity.expanded.map(Share::as_ratio),
        },
        meter_temperature: reader.influence::<Temperature>("meter_temperature", alone.meter_temperature)?,
        meter_pressure: reader.influence::<AbsolutePressure>("meter_pressure", alone.meter_pressure)?,
        water_temperature: reader.influence::<Temperature>("water_temperature", Alone::Refused)?,
    })
}

/// `[before]` or `[after]`.
pub(super) fn zero_and_leak(table: Option<&Table<'_>>) -> Result<ZeroAndLeak, RecordError> {
    let Some(table) = table else { return Ok(ZeroAndLeak::default()) };
    table.only(&["zero", "leak"])?;
    let leak = |field: Field<'_>| field.quantity(value::<PressureRate>).map(PressureRate::as_pa_s);
    Ok(ZeroAndLeak {
        zero: table.field("zero").map(|field| field.quantity(zero_reading::<IndicatedFlow>)).transpose()?,
        leak_pa_s: table.field("leak").map(leak).transpose()?,
    })
}

/// The keys of `[acceptance]`, and of the register's file.
pub(super) const ACCEPTANCE: [&str; 14] = [
    "id",
    "ip",
    "flow",
    "tolerance",
    "rule",
    "gas",
    "straight",
    "hysteresis",
    "repeat",
    "steady",
    "significance",
    "crossing",
    "en",
    "leak",
];

/// `[acceptance]`.
pub(super) fn acceptance(table: &Table<'_>) -> Result<Acceptance, RecordError> {
    table.only(&ACCEPTANCE)?;
    limits(table)
}

/// What the keys of [`ACCEPTANCE`] say, in a table that may have others.
pub(super) fn limits(table: &Table<'_>) -> Result<Acceptance, RecordError> {
    let ip = table.required("ip", "ip = \"10 bar\"")?.quantity(value::<GaugePressure>)?;
    let flow = table.required("flow", "flow = \"0.48 L/min\"")?;
    let flow = above_zero(&flow, flow.quantity(value::<StpdFlow>)?)?;
    let tolerance = table.required("tolerance", "tolerance = \"5 %\"")?;
    let tolerance = if is_share(tolerance.quantity_text()?) {
        Tolerance::Relative(above_zero(&tolerance, tolerance.quantity(value::<Share>)?)?.as_ratio())
    } else {
        Tolerance::Flow(above_zero(&tolerance, tolerance.quantity(value::<StpdFlow>)?)?)
    };
    let default = Limits::DEFAULT;
    let limit = |key: &str, default: f64| match table.field(key) {
        None => Ok(default),
        Some(field) => above_zero(&field, Share::from_ratio(share(&field)?)).map(Share::as_ratio),
    };
    let crossing = |field: Field<'_>| {
        field.quantity(range::<PressureDifference>).map(|(low, high)| (low.as_pa(), high.as_pa()))
    };
    let leak = |field: Field<'_>| {
        above_zero(&field, field.quantity(value::<PressureRate>)?).map(PressureRate::as_pa_s)
    };
    let significance =
        |field: Field<'_>| field.number("a significance level above 0 and below 0.5", |p| p > 0.0 && p < 0.5);
    Ok(Acceptance {
        id: table.field("id").map(|field| field.id()).transpose()?,
        ip,
        flow,
        gas: table.field("gas").map(|field| field.word(&GASES)).transpose()?,
        tolerance,
        rule: table.field("rule").map_or(Ok(Rule::Guarded), |field| field.word(&RULES))?,
        limits: Limits {
            straight: limit("straight", default.straight)?,
            hysteresis: limit("hysteresis", default.hysteresis)?,
            repeat: limit("repeat", default.repeat)?,
            steady: limit("steady", default.steady)?,
            significance: table.field("significance").map_or(Ok(default.significance), significance)?,
            crossing_pa: table.field("crossing").map_or(Ok(default.crossing_pa), crossing)?,
            en: table
                .field("en")
                .map_or(Ok(default.en), |field| field.number("a number above zero", |en| en > 0.0))?,
            leak_pa_s: table.field("leak").map_or(Ok(default.leak_pa_s), leak)?,
        },
    })
}

/// `[[leave_out]]`; `points` is how many there are, when they are known before the series is read into points.
pub(super) fn left_out(tables: &[Table<'_>], points: Option<usize>) -> Result<Vec<LeftOut>, RecordError> {
    let mut left_out: Vec<LeftOut> = Vec::new();
    for table in tables {
        table.only(&["point", "why"])?;
        let field = table.required("point", "point = 7")?;
        let given = field.integer()?;
        let point = usize::try_from(given).ok().filter(|point| *point >= 1);
        let Some(point) = point.filter(|point| points.is_none_or(|points| *point <= points)) else {
            return Err(field.refuse(match points {
                Some(points) => Refusal::NoSuchPoint { point: given, points },
                None => Refusal::OutOfBounds { shown: given.to_string(), want: "a point, counted from 1" },
            }));
        };
        if left_out.iter().any(|other| other.point == point) {
            return Err(field.refuse(Refusal::LeftOutTwice(given)));
        }
        let why = table.required("why", "why = \"regulator was turned during this point\"")?;
        let Some(why) = why.free_text()? else { return Err(why.refuse(Refusal::EmptyText)) };
        left_out.push(LeftOut { point, why });
    }
    Ok(left_out)
}

/// What an uncertainty alone means for a condition.
#[derive(Clone, Copy, PartialEq, Eq)]
pub(super) enum Alone {
    /// A column gives the values; one that is written here is not used.
    Column,
    /// Another quantity gives the value (in the meter: that of the gas at the orifice).
    Taken,
    /// Nothing gives the value.
    Refused,
}

/// What it means for each condition that may stand elsewhere.
struct AloneFor {
    temperature: Alone,
    barometer: Alone,
    meter_temperature: Alone,
    meter_pressure: Alone,
}

pub(super) struct Reader<'t, 'd> {
    pub(super) table: &'t Table<'d>,
    /// Brings an expanded uncertainty to k = 2.
    pub(super) to_k2: f64,
}

impl Reader<'_, '_> {
    pub(super) fn influence<T: Quantity>(
        &self,
        key: &str,
        alone: Alone,
    ) -> Result<Influence<T, T::Difference>, RecordError> {
        let Some(field) = self.table.field(key) else { return Ok(Influence { value: None, expanded: None }) };
        let text = field.quantity_text()?;
        let only_uncertainty = ["±", "+/-"].iter().any(|sign| text.trim_start().starts_with(sign));
        let (value, expanded) = if only_uncertainty {
            if alone == Alone::Refused {
                return Err(field.refuse(Refusal::OnlyUncertainty(text.to_owned())));
            }
            (None, Some(field.quantity(expanded_only::<T>)?))
        } else {
            let given = field.quantity(uncertain::<T>)?;
            if alone == Alone::Column {
                let why = "the column gives the value, and only the ± is taken from here";
                field.note(Note::NotUsed { place: field.place(), why });
            }
            (Some(given.value).filter(|_| alone != Alone::Column), given.expanded)
        };
        let scaled = |u: T::Difference| T::difference_from_si(u.si() * self.to_k2);
        // By way of SI a flow may move by its last bit, so what is at k = 2 already is left alone.
        let as_given = self.to_k2.to_bits() == 1_f64.to_bits();
        Ok(Influence { value, expanded: expanded.map(|u| if as_given { u } else { scaled(u) }) })
    }
}

fn required(
    given: Conditions,
    columns: &Columns,
    refuse: impl Fn(&str, Refusal) -> RecordError,
) -> Result<Conditions, RecordError> {
    if columns.barometer.is_none() && given.barometer.value.is_none() {
        return Err(refuse("barometer", Refusal::NoBarometer));
    }
    if columns.temperature.is_none() && given.temperature.value.is_none() {
        return Err(refuse("temperature", Refusal::NoTemperature));
    }
    Ok(given)
}

/// Refuses nought, which [`value`] takes.
pub(super) fn above_zero<T: Quantity>(field: &Field<'_>, given: T) -> Result<T, RecordError> {
    if given.si() > 0.0 {
        return Ok(given);
    }
    let shown = field.quantity_text()?.to_owned();
    Err(field.refuse(Refusal::OutOfBounds { shown, want: "above zero" }))
}
