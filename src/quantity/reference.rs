//! The reference conditions that meters' litres are counted at, by name and as text.
//!
//! There is no default: a litre at 20 °C is 7 % less gas than one at 0 °C, and no way to tell from the reading.

use super::error::QuantityError;
use super::text::value;
use super::{AbsolutePressure, ReferenceConditions, STANDARD_ATMOSPHERE_PA, Temperature, ZERO_CELSIUS_K};

/// Reference conditions with a name that may stand for them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Preset {
    /// The name as it is written.
    pub name: &'static str,
    /// What it stands for.
    pub conditions: ReferenceConditions,
}

/// The presets, in the order they are listed to people.
///
/// STPD is 0 °C, 101.325 kPa, dry; 15 °C is that of ISO 13443:1996; ANR is that of ISO 8778 (20 °C, 100 kPa, 65 %
/// relative humidity, which the ideal-gas conversion leaves out); 20 °C, 25 °C and 70 °F are makers' use (common
/// practice, no source).
pub const PRESETS: [Preset; 7] = [
    at_one_atmosphere("STPD", ZERO_CELSIUS_K),
    at_one_atmosphere("0 °C", ZERO_CELSIUS_K),
    at_one_atmosphere("15 °C", ZERO_CELSIUS_K + 15.0),
    at_one_atmosphere("20 °C", ZERO_CELSIUS_K + 20.0),
    at_one_atmosphere("25 °C", ZERO_CELSIUS_K + 25.0),
    at_one_atmosphere("70 °F", (70.0 + 459.67) * 5.0 / 9.0),
    Preset {
        name: "ANR",
        conditions: ReferenceConditions {
            temperature: Temperature::from_k(ZERO_CELSIUS_K + 20.0),
            pressure: AbsolutePressure::from_pa(1e5),
        },
    },
];

/// What reference conditions are looked for within: wide enough for every meter, and for a float tube whose scale
/// was made for some bar, yet outside it lie kelvins written as °C and bar written as kPa (common practice, no source).
pub(super) const PLAUSIBLE: &str = "-40 °C to 100 °C and 10 kPa to 2 MPa";

/// Reference conditions: the name of a preset, a temperature that is one ("20 °C", "68 °F"; at 101.325 kPa), or a
/// temperature and an absolute pressure in any unit and order ("20 °C, 101.325 kPa", "1 atm; 70 °F").
///
/// # Errors
/// Anything else is refused with the list of presets; a decimal comma by its own sentence; temperatures and pressures
/// that no meter refers to by theirs.
pub fn reference_conditions(text: &str) -> Result<ReferenceConditions, QuantityError> {
    let name = text.trim();
    if let Some(preset) = PRESETS.iter().find(|preset| preset.name.eq_ignore_ascii_case(name)) {
        return Ok(preset.conditions);
    }
    let not_reference = |cause: QuantityError| match cause {
        QuantityError::DecimalComma { point, comma, .. } => {
            QuantityError::DecimalComma { text: text.to_owned(), point, comma }
        }
        _ => QuantityError::NotReference { text: text.to_owned() },
    };
    match split(text).as_slice() {
        [alone] => {
            let temperature: Temperature = value(alone).map_err(not_reference)?;
            let like = |preset: &&Preset| {
                let distance_k = preset.conditions.temperature.as_k() - temperature.as_k();
                // Other units than the preset's may round differently; a billionth of a kelvin changes no flow.
                distance_k.abs() < 1e-9
            };
            let preset = PRESETS.iter().find(like);
            preset
                .map(|preset| preset.conditions)
                .ok_or_else(|| QuantityError::NotReference { text: text.to_owned() })
        }
        [first, second] => {
            let in_order = |temperature: &str, pressure: &str| {
                Ok(ReferenceConditions { temperature: value(temperature)?, pressure: value(pressure)? })
            };
            // When neither order reads, the first error is as good as the second but for a decimal comma, which
            // either order meets in one of its two parts.
            let conditions =
                in_order(first, second).or_else(|_| in_order(second, first)).map_err(not_reference)?;
            plausible(conditions).ok_or_else(|| QuantityError::ImplausibleReference { text: text.to_owned() })
        }
        _ => Err(QuantityError::NotReference { text: text.to_owned() }),
    }
}

/// The presets in a sentence, and how to write any other conditions.
#[must_use]
pub fn presets_listed() -> String {
    let names: Vec<&str> = PRESETS.iter().map(|preset| preset.name).filter(|name| *name != "ANR").collect();
    format!(
        "{} (these at 101.325 kPa), ANR (20 °C, 100 kPa), or a temperature and a pressure as in \
         \"20 °C, 101.325 kPa\"",
        names.join(", ")
    )
}

const fn at_one_atmosphere(name: &'static str, temperature_k: f64) -> Preset {
    let temperature = Temperature::from_k(temperature_k);
    let pressure = AbsolutePressure::from_pa(STANDARD_ATMOSPHERE_PA);
    Preset { name, conditions: ReferenceConditions { temperature, pressure } }
}

/// The conditions, if they lie within [`PLAUSIBLE`].
fn plausible(conditions: ReferenceConditions) -> Option<ReferenceConditions> {
    let temperature = (-40.0..=100.0).contains(&conditions.temperature.as_c());
    let pressure = (1e4..=2e6).contains(&conditions.pressure.as_pa());
    (temperature && pressure).then_some(conditions)
}

/// The parts between semicolons and commas; a comma between two digits is a decimal comma and does not part.
fn split(text: &str) -> Vec<&str> {
    let bytes = text.as_bytes();
    let digit = |at: Option<usize>| at.and_then(|at| bytes.get(at)).is_some_and(u8::is_ascii_digit);
    let mut parts = Vec::new();
    let mut begin = 0;
    for (at, mark) in text.match_indices([',', ';']) {
        let decimal = mark == "," && digit(at.checked_sub(1)) && digit(Some(at + 1));
        if !decimal {
            parts.push(&text[begin..at]);
            begin = at + 1;
        }
    }
    parts.push(&text[begin..]);
    parts
}
