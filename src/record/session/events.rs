//! `[[events]]`: what happened, each with its time.
//!
//! Comes in: a table of an event, or its texts from a dialogue, and the time column it is placed on. Goes out: the
//! [`Event`]. A key that belongs to another kind of event is refused, because whoever wrote it had that kind in mind.

use chrono::{DateTime, FixedOffset};

use super::super::around::above_zero;
use super::super::document::{Field, Origin, Source, Table};
use super::super::error::{Place, RecordError, Refusal};
use super::super::write::{number, quoted};
use super::moment::{Axis, elapsed_or_time};
use super::spread::{flow, given, to_k2};
use super::{LOOPS, SessionRefusal};
use crate::entry::{Event, Injection, Metered, What};
use crate::quantity::text::reference_conditions;
use crate::quantity::{GaugePressure, Volume};

/// Every key of an event.
const KEYS: [&str; 11] =
    ["at", "what", "flow", "ip", "off", "volume", "reads_at", "loop", "mark", "until", "coverage"];

/// What can happen, before its own keys are read.
#[derive(Clone, Copy)]
enum Kind {
    Injection,
    OxygenAdd,
    DiluentAdd,
    Vent,
    MakeUp,
    Exclude,
    Stop,
}

const KINDS: [(&str, Kind); 7] = [
    ("injection", Kind::Injection),
    ("oxygen add", Kind::OxygenAdd),
    ("diluent add", Kind::DiluentAdd),
    ("vent", Kind::Vent),
    ("make-up", Kind::MakeUp),
    ("exclude", Kind::Exclude),
    ("stop", Kind::Stop),
];

impl Kind {
    fn of(what: &What) -> Self {
        match what {
            What::Injection(_) => Self::Injection,
            What::OxygenAdd(_) => Self::OxygenAdd,
            What::DiluentAdd(_) => Self::DiluentAdd,
            What::Vent(_) => Self::Vent,
            What::MakeUp { .. } => Self::MakeUp,
            What::Exclude { .. } => Self::Exclude,
            What::Stop => Self::Stop,
        }
    }

    fn name(self) -> &'static str {
        KINDS[self as usize].0
    }

    fn keys(self) -> &'static [&'static str] {
        match self {
            Self::Injection => &["flow", "ip", "off", "coverage"],
            Self::OxygenAdd | Self::DiluentAdd | Self::Vent => &["volume", "reads_at", "coverage"],
            Self::MakeUp => &["loop", "mark"],
            Self::Exclude => &["until"],
            Self::Stop => &[],
        }
    }
}

/// The word for what happened, in files.
pub(super) fn word(what: &What) -> &'static str {
    Kind::of(what).name()
}

/// One event from its texts, as a file would have them: keys and values, `off` and `mark` with "true" or "false".
///
/// Elapsed times count from the first reading, and that was at `begun`; whether the event lies within the readings
/// is not looked at.
///
/// # Errors
/// As for an event of a file; the place is "event" with the key.
pub fn event_from(pairs: &[(&str, &str)], begun: DateTime<FixedOffset>) -> Result<Event, RecordError> {
    const NAME: &str = "event";
    let refuse = |key: &str, refusal: Refusal| {
        refusal.at(Place { file: NAME.to_owned(), line: None, field: Some(key.to_owned()) })
    };
    let mut toml = String::new();
    for (key, text) in pairs {
        let text = text.trim();
        let value = match *key {
            "off" | "mark" => match text {
                "true" | "false" => text.to_owned(),
                _ => {
                    let (word, known) = (text.to_owned(), "true, false".to_owned());
                    return Err(refuse(key, Refusal::UnknownWord { word, known }));
                }
            },
            "coverage" => match text.parse::<f64>() {
                Ok(k) if k.is_finite() => number(k),
                _ => return Err(refuse(key, Refusal::NotANumber(text.to_owned()))),
            },
            _ => quoted(text),
        };
        toml.push_str(&format!("{} = {value}\n", quoted(key)));
    }
    let source = Source::from(Origin::Entry, NAME, &toml);
    let parsed = source.parse()?;
    event(&source.whole(&parsed), &Axis::from_first_reading(&begun))
}

/// The event of a table.
pub(super) fn event(table: &Table<'_>, axis: &Axis) -> Result<Event, RecordError> {
    table.only(&KEYS)?;
    let at = table.required("at", r#"at = "00:10:00""#)?;
    let at_s = moment(&at, axis)?;
    axis.within(at_s, &at.date_or_text()?).map_err(|refusal| at.refuse(refusal))?;
    let kind = table.required("what", r#"what = "oxygen add""#)?.word(&KINDS)?;
    let strange = |key: &&&str| !["at", "what"].contains(*key) && !kind.keys().contains(*key);
    for key in KEYS.iter().filter(strange) {
        if let Some(field) = table.field(key) {
            return Err(field.refuse(SessionRefusal::NotOfThisEvent { what: kind.name(), key }.into()));
        }
    }
    let what = match kind {
        Kind::Injection => What::Injection(injection(table)?),
        Kind::OxygenAdd => What::OxygenAdd(metered(table)?),
        Kind::DiluentAdd => What::DiluentAdd(metered(table)?),
        Kind::Vent => What::Vent(metered(table)?),
        Kind::MakeUp => {
            let kept = table.field("loop").map(|field| field.word(&LOOPS)).transpose()?;
            let mark = table.field("mark").map_or(Ok(false), |field| field.flag())?;
            if kept.is_none() && !mark {
                return Err(table.refuse("loop", SessionRefusal::MakeUpOfNothing.into()));
            }
            What::MakeUp { kept, mark }
        }
        Kind::Exclude => {
            let until = table.required("until", r#"until = "00:14:30""#)?;
            let until_s = moment(&until, axis)?;
            if until_s < at_s {
                let (until_text, at) = (until.date_or_text()?, at.date_or_text()?);
                let refusal = SessionRefusal::EndsBeforeItBegins { until: until_text, at };
                return Err(until.refuse(refusal.into()));
            }
            What::Exclude { until_s }
        }
        Kind::Stop => What::Stop,
    };
    Ok(Event { at_s, what })
}

fn moment(field: &Field<'_>, axis: &Axis) -> Result<f64, RecordError> {
    let when = elapsed_or_time(&field.date_or_text()?).map_err(|refusal| field.refuse(refusal))?;
    Ok(axis.second(&when))
}

fn injection(table: &Table<'_>) -> Result<Injection, RecordError> {
    let mut said = ["flow", "ip", "off"].into_iter().filter_map(|key| Some((key, table.field(key)?)));
    let Some((key, field)) = said.next() else {
        return Err(table.refuse("flow", SessionRefusal::NothingInjected.into()));
    };
    if let Some((_, again)) = said.next() {
        return Err(again.refuse(SessionRefusal::InjectionTwice.into()));
    }
    match key {
        "flow" => Ok(Injection::Flow(flow(&field, to_k2(table)?)?)),
        "ip" => Ok(Injection::Ip(given::<GaugePressure>(&field, to_k2(table)?)?)),
        _ if field.flag()? => Ok(Injection::Off),
        _ => Err(field.refuse(SessionRefusal::OffIsFalse.into())),
    }
}

fn metered(table: &Table<'_>) -> Result<Option<Metered>, RecordError> {
    let reads_at = table.field("reads_at");
    let Some(field) = table.field("volume") else {
        return match reads_at {
            Some(field) => Err(field.refuse(SessionRefusal::ReadsAtAlone.into())),
            None => Ok(None),
        };
    };
    let volume = given::<Volume>(&field, to_k2(table)?)?;
    above_zero(&field, volume.value)?;
    let reads_at = reads_at.map(|field| field.quantity(reference_conditions)).transpose()?;
    Ok(Some(Metered { volume, reads_at }))
}
