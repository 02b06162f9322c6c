//! What a run file says of the bench apart from its readings, for a run that is typed on the same bench.
//!
//! Comes in: a run file, whole or without `orifice`, `taken`, `readings` and `[columns]`. Goes out: a [`Setup`] with
//! what stands there. Its readings are never opened, and the points it leaves out are another run's. Keys, units and
//! refusals are those of [`super::run`].

use std::path::Path;

use super::around;
use super::document::Source;
use super::error::{RecordError, Refusal};
use super::instruments::GASES;
use super::note::Loaded;
use super::run::{
    BUILDS, KEYS, PURPOSES, Registers, acceptance, as_text, meter, purity, read_toml, transducer,
};
use crate::entry::{Acceptance, Build, Conditions, Meter, MeterKind, Purity, Purpose, Transducer};
use crate::gas::Species;
use crate::quantity::unit::{Kind, Unit, lookup};

/// What stands in a run file beside its readings; what does not stand there is none.
#[derive(Debug, Clone, PartialEq)]
pub struct Setup {
    /// The gas.
    pub gas: Option<Species>,
    /// Oxygen in it, where the gas is oxygen: as stated, else the default.
    pub purity: Option<Purity>,
    /// How the hole is built.
    pub build: Option<Build>,
    /// Why the run is made.
    pub purpose: Option<Purpose>,
    /// Who takes it.
    pub technician: Option<String>,
    /// What stands around it.
    pub conditions: Conditions,
    /// The flow meter.
    pub meter: Option<Meter>,
    /// The transducer.
    pub transducer: Option<Transducer>,
    /// The limits.
    pub acceptance: Option<Acceptance>,
    /// Unit of the pressure column.
    pub pressure_unit: Option<Unit>,
    /// Whether the pressure column is over vacuum.
    pub absolute: bool,
    /// Unit of the flow column.
    pub flow_unit: Option<Unit>,
}

/// Reads the bench of a run file for a run of `gas`; without one, for the gas of the file, which is oxygen where it
/// states none.
///
/// # Errors
/// Every [`RecordError`] but those of readings.
pub fn read_setup(
    path: &Path,
    gas: Option<Species>,
    registers: &dyn Registers,
) -> Result<Loaded<Setup>, RecordError> {
    let (name, bytes) = read_toml(path)?;
    let text = as_text(&name, &bytes)?;
    let source = Source::new(&name, text.trim_start_matches('\u{FEFF}'));
    let parsed = source.parse()?;
    let file = source.whole(&parsed);
    let record = file.required("record", "record = \"bench run\"")?;
    if record.text()? != "bench run" {
        return Err(record.refuse(Refusal::OtherRecord(record.text()?.to_owned())));
    }
    file.only(&KEYS)?;
    let stated = file.field("gas").map(|field| field.word(&GASES)).transpose()?;
    let used = gas.or(stated).unwrap_or(Species::Oxygen);
    let there = |key: &str| file.field(key).is_some();
    let meter = there("meter").then(|| meter(&file, used, registers)).transpose()?;
    let transducer = there("transducer").then(|| transducer(&file, registers)).transpose()?;
    let (uses_volume, wet) = match meter.as_ref().map(|meter| &meter.kind) {
        Some(MeterKind::Mass { .. }) => (false, false),
        Some(MeterKind::Volumetric { wet } | MeterKind::Timed { wet }) => (true, *wet),
        Some(MeterKind::Float { .. }) | None => (true, false),
    };
    let unit = |column: &str, kind: Kind| -> Result<(Option<Unit>, bool), RecordError> {
        let Some(columns) = file.table("columns")? else { return Ok((None, false)) };
        let Some(column) = columns.table(column)? else { return Ok((None, false)) };
        let absolute = column.field("absolute").map(|field| field.flag()).transpose()?.unwrap_or(false);
        let unit = column.field("unit").map(|field| field.quantity(|text| lookup(kind, text))).transpose()?;
        Ok((unit, absolute))
    };
    let (pressure_unit, absolute) = unit("pressure", Kind::Pressure)?;
    let oxygen = used == Species::Oxygen && stated.is_none_or(|gas| gas == Species::Oxygen);
    let value = Setup {
        gas: stated,
        purity: if oxygen { purity(&file, used)? } else { None },
        build: file.field("build").map(|field| field.word(&BUILDS)).transpose()?,
        purpose: file.field("purpose").map(|field| field.word(&PURPOSES)).transpose()?,
        technician: file.field("technician").map(|field| field.free_text()).transpose()?.flatten(),
        conditions: around::conditions_without_readings(&file, uses_volume, wet)?,
        meter,
        transducer,
        acceptance: acceptance(&file, registers)?,
        pressure_unit,
        absolute,
        flow_unit: unit("flow", Kind::Flow)?.0,
    };
    Ok(Loaded { value, notes: source.into_notes() })
}
