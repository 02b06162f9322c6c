//! What a session file says apart from its readings and events, for a session that is typed or logged.
//!
//! Comes in: a session file, whole or with only some of its keys, or single answers of a dialogue. Goes out: a
//! [`SessionSetup`] with what stands there. Readings are never opened, and events are another session's. Keys, units and
//! refusals are those of [`super::parse_session`], so that an answer means what it means in a file.

use std::path::Path;

use super::super::document::{Origin, Source, Table};
use super::super::error::{Place as At, RecordError, Refusal};
use super::super::note::{Loaded, Note};
use super::super::registers::{diluent, positive};
use super::super::run::{purity, read_toml};
use super::super::write::quoted;
use super::{
    CellCalibration, KEYS, LOOPS, PLACES, SessionRefusal, actual_volume, around, assumptions, leak_test,
    line, session_text, spread,
};
use crate::entry::{
    Assumptions, CellPapers, Cylinder, Diluent, Id, LeakTest, LineReference, LoopKept, Place, Purity, Rest,
    SessionConditions,
};
use crate::gas::Species;
use crate::quantity::{Mass, Share, Uncertain, Volume};

/// What stands in a session file beside its readings and events; what does not stand there is none.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionSetup {
    /// The diver, by code.
    pub diver: Option<Id>,
    /// The diver's mass.
    pub mass: Option<Mass>,
    /// Where the diver rests.
    pub place: Option<Place>,
    /// How the loop is kept at first.
    pub kept: Option<LoopKept>,
    /// What is added to keep the volume.
    pub diluent: Option<Diluent>,
    /// Loop volume, lungs included.
    pub loop_volume: Option<Uncertain<Volume>>,
    /// What is known of leaks.
    pub leak_test: Option<LeakTest>,
    /// Whether a nose clip is worn.
    pub nose_clip: Option<bool>,
    /// Oxygen in what is injected and added.
    pub oxygen: Option<Purity>,
    /// Where the injection's line comes from.
    pub line: Option<LineReference>,
    /// What stands around it.
    pub conditions: SessionConditions,
    /// The gain of the cells; a calibration in mV is not taken.
    pub cells: CellPapers,
    /// What says whether it is rest.
    pub rest: Rest,
    /// What is assumed; the defaults where nothing is stated.
    pub assumptions: Assumptions,
    /// The cylinder of a topped loop.
    pub cylinder: Option<Cylinder>,
}

/// Reads what a session file says apart from its readings and events.
///
/// # Errors
/// Every [`RecordError`] but those of readings and events.
pub fn read_session_setup(path: &Path) -> Result<Loaded<SessionSetup>, RecordError> {
    let (name, bytes) = read_toml(path)?;
    let source = Source::new(&name, session_text(&name, &bytes)?.trim_start_matches('\u{FEFF}'));
    let parsed = source.parse()?;
    let file = source.whole(&parsed);
    let record = file.required("record", "record = \"session\"")?;
    if record.text()? != "session" {
        return Err(record.refuse(SessionRefusal::OtherRecord(record.text()?.to_owned()).into()));
    }
    let value = setup(&file)?;
    Ok(Loaded { value, notes: source.into_notes() })
}

/// The calibration that a session file has for so many cells that are read in mV; none when it names none.
///
/// # Errors
/// As [`read_session_setup`], and those of its table of cells.
pub fn read_cell_calibration(path: &Path, in_volts: usize) -> Result<Option<CellCalibration>, RecordError> {
    let (name, bytes) = read_toml(path)?;
    let source = Source::new(&name, session_text(&name, &bytes)?.trim_start_matches('\u{FEFF}'));
    let parsed = source.parse()?;
    super::cells::calibration(&source.whole(&parsed), in_volts)
}

/// What single answers say: keys as a file has them, behind the name of their table and a dot where they have one
/// (`conditions.barometer`); yes or no as "true" or "false".
///
/// # Errors
/// As for a file; the place is "session" with the key.
pub fn session_setup_from(answers: &[(&str, &str)]) -> Result<SessionSetup, RecordError> {
    const NAME: &str = "session";
    let mut toml = String::new();
    for (key, text) in answers {
        let text = text.trim();
        let flag = key.ends_with("nose_clip")
            || key.ends_with("scrubber_warm")
            || key.ends_with("caffeine_or_nicotine");
        let value = match (flag, text) {
            (true, "true" | "false") => text.to_owned(),
            (true, _) => {
                let (word, known) = (text.to_owned(), "yes, no".to_owned());
                let place = At { file: NAME.to_owned(), line: None, field: Some((*key).to_owned()) };
                return Err(Refusal::UnknownWord { word, known }.at(place));
            }
            (false, _) => quoted(text),
        };
        toml.push_str(&format!("{key} = {value}\n"));
    }
    let source = Source::from(Origin::Entry, NAME, &toml);
    let parsed = source.parse()?;
    setup(&source.whole(&parsed))
}

fn setup(file: &Table<'_>) -> Result<SessionSetup, RecordError> {
    file.only(&KEYS)?;
    let columns = file.table("columns")?;
    let has = |key: &str| columns.as_ref().is_some_and(|columns| columns.field(key).is_some());
    Ok(SessionSetup {
        diver: file.field("diver").map(|field| field.id()).transpose()?,
        mass: positive(file, "mass")?,
        place: file.field("place").map(|field| field.word(&PLACES)).transpose()?,
        kept: file.field("loop").map(|field| field.word(&LOOPS)).transpose()?,
        diluent: file.field("diluent").map(|field| diluent(&field)).transpose()?,
        loop_volume: file.field("loop_volume").map(|field| actual_volume(&field, 1.0)).transpose()?,
        leak_test: file.field("leak_test").map(|field| leak_test(&field)).transpose()?,
        nose_clip: file.field("nose_clip").map(|field| field.flag()).transpose()?,
        oxygen: match file.field("oxygen") {
            Some(_) => purity(file, Species::Oxygen)?,
            None => None,
        },
        line: line(file)?,
        conditions: around::conditions(file, has("depth"), has("loop_temperature"))?,
        cells: cells(file)?,
        rest: around::rest(file)?,
        assumptions: assumptions::assumptions(file)?,
        cylinder: match file.field("cylinder") {
            Some(field) => Some(around::cylinder(&field.table("cylinder")?)?),
            None => None,
        },
    })
}

/// The gain of `[cells]`; a calibration in mV is of cells that are read in mV, which are not typed.
fn cells(file: &Table<'_>) -> Result<CellPapers, RecordError> {
    let Some(table) = file.table("cells")? else { return Ok(CellPapers::default()) };
    table.only(&["gain", "coverage", "air", "oxygen", "calibrated_at"])?;
    for field in ["air", "oxygen", "calibrated_at"].into_iter().filter_map(|key| table.field(key)) {
        field.note(Note::NotUsed { place: field.place(), why: "only a cell read in mV needs it" });
    }
    let gain = table.field("gain").map(|field| spread::expanded::<Share>(&field, spread::to_k2(&table)?));
    Ok(CellPapers { gain: gain.transpose()?.map(Share::as_ratio), calibrated_at: None })
}
