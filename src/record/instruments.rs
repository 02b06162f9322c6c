//! The `[meter]` and `[transducer]` tables: papers of instruments.
//!
//! Comes in: a table, and the gas of the run where there is one. Goes out: a [`Meter`] or a [`Transducer`]. A key that belongs to
//! another kind of meter is refused, because whoever wrote it had that other kind in mind.

use super::document::{Field, Table};
use super::error::{RecordError, Refusal};
use super::note::Note;
use crate::entry::{Amount, FloatScale, Meter, MeterKind, Papers, Transducer};
use crate::gas::Species;
use crate::quantity::text::{expanded_only, range, reference_conditions, value};
use crate::quantity::{GaugePressure, Quantity, ReferenceConditions, Share, Uncertain, presets_listed};

/// The coverage factor of what stands after a `±`, and of papers, in a table that states none.
pub(super) const COVERAGE: f64 = 2.0;

const PAPERS: [&str; 9] =
    ["id", "gain", "zero", "noise", "resolution", "coverage", "range", "certificate", "due"];

/// The keys of a meter beyond its papers.
const METER: [&str; 7] = ["kind", "reads_at", "made_for", "gas_factor", "wet", "scale", "made_at"];

/// Which of the flow meters, before its own keys are read.
#[derive(Clone, Copy)]
enum Kind {
    Mass,
    Volumetric,
    Timed,
    Float,
}

/// In the order of [`Kind`].
const KINDS: [(&str, Kind); 4] =
    [("mass", Kind::Mass), ("volumetric", Kind::Volumetric), ("timed", Kind::Timed), ("float", Kind::Float)];

const SCALES: [(&str, FloatScale); 2] =
    [("actual", FloatScale::Actual), ("reference", FloatScale::Reference)];

/// The words for gases, in files.
pub(super) const GASES: [(&str, Species); 4] = [
    (Species::ALL[0].name(), Species::ALL[0]),
    (Species::ALL[1].name(), Species::ALL[1]),
    (Species::ALL[2].name(), Species::ALL[2]),
    (Species::ALL[3].name(), Species::ALL[3]),
];

/// A flow meter used on `gas`; in a register, on whatever gas comes.
pub(super) fn meter(table: &Table<'_>, gas: Option<Species>) -> Result<Meter, RecordError> {
    let known: Vec<&str> = PAPERS.into_iter().chain(METER).collect();
    table.only(&known)?;
    let kind = table.required("kind", "kind = \"mass\"")?.word(&KINDS)?;
    let own: &[&str] = match kind {
        Kind::Mass => &["kind", "reads_at", "made_for", "gas_factor"],
        Kind::Volumetric | Kind::Timed => &["kind", "wet"],
        Kind::Float => &["kind", "reads_at", "made_for", "gas_factor", "scale", "made_at"],
    };
    let name = KINDS[kind as usize].0;
    for key in METER.into_iter().filter(|key| !own.contains(key)) {
        if let Some(field) = table.field(key) {
            return Err(field.refuse(Refusal::NotOfThisKind { kind: name, key }));
        }
    }
    let wet = || table.field("wet").map_or(Ok(false), |field| field.flag());
    let kind = match kind {
        Kind::Volumetric => MeterKind::Volumetric { wet: wet()? },
        Kind::Timed => MeterKind::Timed { wet: wet()? },
        Kind::Mass => {
            let reads_at = reads_at(table, name)?;
            let made_for = made_for(table)?;
            MeterKind::Mass { reads_at, made_for, gas_factor: gas_factor(table, gas, made_for)? }
        }
        Kind::Float => {
            let reads_at = reads_at(table, name)?;
            let made_for = made_for(table)?;
            let scale = table.required("scale", "scale = \"actual\"")?.word(&SCALES)?;
            let made_at = table.field("made_at");
            if let (FloatScale::Actual, Some(field)) = (scale, &made_at) {
                return Err(field.refuse(Refusal::MadeAtOfActual));
            }
            let made_at = made_at.map(|field| field.quantity(reference_conditions)).transpose()?;
            let gas_factor = gas_factor(table, gas, made_for)?;
            MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor }
        }
    };
    gas.map_or(Ok(()), |gas| suits(&kind, gas)).map_err(|refusal| table.refuse("gas_factor", refusal))?;
    Ok(Meter { id: table.field("id").map(|id| id.id()).transpose()?, kind, papers: papers(table)? })
}

/// Whether a meter can say anything about `gas`: a mass-reading one made for another gas needs the maker's factor.
///
/// # Errors
/// [`Refusal::GasDiffers`] when it cannot.
pub fn suits(kind: &MeterKind, gas: Species) -> Result<(), Refusal> {
    match kind {
        MeterKind::Mass { made_for, gas_factor: None, .. } if *made_for != gas => {
            Err(Refusal::GasDiffers { gas: gas.name(), made_for: made_for.name() })
        }
        _ => Ok(()),
    }
}

/// A pressure transducer.
pub(super) fn transducer(table: &Table<'_>) -> Result<Transducer, RecordError> {
    table.only(&PAPERS)?;
    let id = table.field("id").map(|id| id.id()).transpose()?;
    Ok(Transducer { id, papers: papers::<GaugePressure>(table)? })
}

/// Whether a text that may be a share or a quantity is a share; some doubles have no number in per cent, and are
/// written in the unit one.
pub(super) fn is_share(text: &str) -> bool {
    let unit_one = text.trim().rsplit_once(char::is_whitespace).is_some_and(|(_, unit)| unit == "1");
    text.contains('%') || text.contains("percent") || unit_one
}

/// A share written with its unit, as "0.8 %".
pub(super) fn share(field: &Field<'_>) -> Result<f64, RecordError> {
    field.quantity(value::<Share>).map(Share::as_ratio)
}

/// An expanded uncertainty as a share of a reading; it is refused like any other when it is negative.
fn expanded_share(field: &Field<'_>) -> Result<f64, RecordError> {
    field.quantity(expanded_only::<Share>).map(Share::as_ratio)
}

/// The coverage factor of a table.
pub(super) fn coverage(table: &Table<'_>) -> Result<f64, RecordError> {
    let stated = |field: Field<'_>| field.number("a coverage factor above zero", |k| k > 0.0);
    table.field("coverage").map_or(Ok(COVERAGE), stated)
}

fn papers<R: Quantity>(table: &Table<'_>) -> Result<Papers<R::Difference, R>, RecordError> {
    let expanded = |field: Field<'_>| field.quantity(expanded_only::<R>);
    let noise = |field: Field<'_>| {
        if is_share(field.quantity_text()?) {
            expanded_share(&field).map(Amount::OfReading)
        } else {
            expanded(field).map(Amount::Fixed)
        }
    };
    Ok(Papers {
        gain: table.field("gain").map(|field| expanded_share(&field)).transpose()?,
        zero: table.field("zero").map(expanded).transpose()?,
        noise: table.field("noise").map(noise).transpose()?,
        resolution: table.field("resolution").map(expanded).transpose()?,
        coverage: coverage(table)?,
        range: table.field("range").map(|field| field.quantity(range::<R>)).transpose()?,
        certificate: table.field("certificate").map(|field| field.free_text()).transpose()?.flatten(),
        due: table.field("due").map(|field| field.date()).transpose()?,
    })
}

fn reads_at(table: &Table<'_>, kind: &'static str) -> Result<ReferenceConditions, RecordError> {
    match table.field("reads_at") {
        Some(field) => field.quantity(reference_conditions),
        None => {
            Err(table.refuse("reads_at", Refusal::NoReferenceConditions { kind, presets: presets_listed() }))
        }
    }
}

fn made_for(table: &Table<'_>) -> Result<Species, RecordError> {
    table.required("made_for", "made_for = \"oxygen\" (the gas on the meter's papers)")?.word(&GASES)
}

fn gas_factor(
    table: &Table<'_>,
    gas: Option<Species>,
    made_for: Species,
) -> Result<Option<Uncertain<f64>>, RecordError> {
    let Some(field) = table.field("gas_factor") else { return Ok(None) };
    if gas == Some(made_for) {
        let why = "the meter was made for this gas";
        field.note(Note::NotUsed { place: field.place(), why });
    }
    let Uncertain { value, expanded } = field.uncertain_number()?;
    // The entry keeps what stands after a ± at k = 2, whatever the papers' own coverage factor is.
    let to_k2 = COVERAGE / coverage(table)?;
    Ok(Some(Uncertain { value, expanded: expanded.map(|u| u * to_k2) }))
}
