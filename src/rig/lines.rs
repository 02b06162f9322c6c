//! Instruments that send lines of text, by themselves or when asked.

use super::fault::Fault;
use super::gauge::Reading;
use crate::entry::Id;

/// One number on a line.
#[derive(Debug, Clone, PartialEq)]
pub struct Field {
    /// The instrument it is from.
    pub gauge: Id,
    /// The unit as it is written behind the number after a space; none when no unit is sent.
    pub unit: Option<String>,
}

/// When lines are sent.
#[derive(Debug, Clone, PartialEq)]
pub enum Speaks {
    /// By itself, every so many seconds.
    ByItself {
        /// Seconds from one line to the next.
        every_s: f64,
    },
    /// When asked.
    WhenAsked {
        /// The command, with its end.
        ask: String,
        /// Seconds from command to answer.
        delay_s: f64,
        /// How often the register says it is asked, seconds.
        every_s: f64,
    },
}

/// An instrument, or a box of several, that sends lines.
#[derive(Debug, Clone, PartialEq)]
pub struct LinesDevice {
    /// The numbers on a line, at least one.
    pub fields: Vec<Field>,
    /// What stands between two; not a space where units are sent.
    pub separator: char,
    /// What ends a line.
    pub ends: String,
    /// When lines are sent.
    pub speaks: Speaks,
}

/// A number as text with an optional exponent, as a group of a pattern.
const VALUE: &str = r"(?P<value>[-+]?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?)";

impl LinesDevice {
    /// The line that says `readings`, one for each field, with what is in force done to it.
    #[must_use]
    pub fn line(&self, readings: &[Reading], in_force: &[Fault]) -> Vec<u8> {
        let mut line = String::new();
        for (number, (field, reading)) in self.fields.iter().zip(readings).enumerate() {
            if number > 0 {
                line.push(self.separator);
            }
            let (mut reading, mut text, mut wrong) = (*reading, None, false);
            for fault in in_force {
                match fault {
                    Fault::WrongUnit(symbol) => {
                        reading = reading.in_unit(symbol);
                        wrong = true;
                    }
                    Fault::NotANumber => text = Some("NaN"),
                    Fault::Overflow(overflow) => text = Some(overflow.text()),
                    // Another instrument says its own unit.
                    Fault::WrongDevice => wrong = true,
                    _ => {}
                }
            }
            line.push_str(&text.map_or_else(|| reading.text(), str::to_owned));
            if let Some(unit) = &field.unit {
                line.push(' ');
                line.push_str(if wrong { reading.unit.symbol } else { unit });
            }
        }
        line.push_str(&self.ends);
        line.into_bytes()
    }

    /// The pattern of the register by which a field is read from a line.
    #[must_use]
    pub fn pattern(&self, field: usize) -> String {
        let mark = match self.separator {
            meta @ ('\\' | '.' | '+' | '*' | '?' | '(' | ')' | '|' | '[' | ']' | '{' | '}' | '^' | '$'
            | '#' | '&' | '-' | '~') => format!("\\{meta}"),
            plain => plain.to_string(),
        };
        let before = if field == 0 { String::new() } else { format!("(?:[^{mark}]*{mark}){{{field}}}") };
        let sends_unit = self.fields.get(field).is_some_and(|field| field.unit.is_some());
        let unit = if sends_unit { format!(r"\s+(?P<unit>[^\s{mark}]+)") } else { String::new() };
        let after = if field + 1 < self.fields.len() { mark } else { "$".to_owned() };
        format!(r"^{before}\s*{VALUE}{unit}\s*{after}")
    }
}
