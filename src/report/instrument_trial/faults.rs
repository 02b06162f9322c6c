//! What was heard and is no reading, in words.

use super::TrialShown;
use super::raw::shown;
use crate::report::layout::wrapped;

/// Bytes of an example that are shown.
const EXAMPLE: usize = 32;

/// Why something heard is no reading.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TrialFault {
    /// A line with nothing in it.
    Empty,
    /// Bytes that no text has.
    Garbage,
    /// Too many bytes without an ending.
    TooLong,
    /// A line that was begun.
    HalfLine,
    /// A line that the pattern does not match.
    NoMatch,
    /// A part of a number.
    CutNumber,
    /// No number.
    NotANumber,
    /// NaN or infinite.
    NotFinite,
    /// No unit anywhere.
    NoUnit,
    /// A unit that is none.
    UnknownUnit,
    /// A unit that hides reference conditions.
    UnstatedReference,
    /// A unit of another kind.
    OtherUnit,
    /// Nothing.
    Silence,
    /// A check sum that does not fit.
    CheckSum,
    /// A frame of another device.
    OtherDevice,
    /// A frame of another function.
    OtherFunction,
    /// A frame of another length.
    WrongLength,
    /// An exception of this code.
    Refused(u8),
    /// A value that cannot be.
    Impossible,
    /// A value out of all range.
    OutOfRange,
}

impl TrialFault {
    /// The word for it in JSON.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Empty => "empty",
            Self::Garbage => "garbage",
            Self::TooLong => "too-long",
            Self::HalfLine => "half-line",
            Self::NoMatch => "no-match",
            Self::CutNumber => "cut-number",
            Self::NotANumber => "not-a-number",
            Self::NotFinite => "not-finite",
            Self::NoUnit => "no-unit",
            Self::UnknownUnit => "unknown-unit",
            Self::UnstatedReference => "unstated-reference",
            Self::OtherUnit => "other-unit",
            Self::Silence => "silence",
            Self::CheckSum => "check-sum",
            Self::OtherDevice => "other-device",
            Self::OtherFunction => "other-function",
            Self::WrongLength => "wrong-length",
            Self::Refused(_) => "refused",
            Self::Impossible => "impossible",
            Self::OutOfRange => "out-of-range",
        }
    }

    /// What it is, as one says it.
    #[must_use]
    pub fn says(self) -> String {
        let says = match self {
            Self::Empty => "a line with nothing in it",
            Self::Garbage => "bytes that no text has: noise, or a wrong baud rate or frame",
            Self::TooLong => "more bytes than a line has, and no ending among them",
            Self::HalfLine => "the beginning of a line, and then nothing",
            Self::NoMatch => "a line that the pattern does not match",
            Self::CutNumber => "a number of which the pattern takes only a part",
            Self::NotANumber => "no number where the pattern takes one",
            Self::NotFinite => "no finite number: NaN, infinite, or too large",
            Self::NoUnit => "no unit in the line, and none in the profile",
            Self::UnknownUnit => "a unit that is not known",
            Self::UnstatedReference => {
                "a unit that hides its reference conditions: leave it out of the pattern, give unit, and say them in reads_at"
            }
            Self::OtherUnit => {
                "a unit of another kind, or one that says absolute where gauge is read, or the reverse"
            }
            Self::Silence => "no answer in time",
            Self::CheckSum => "a frame whose check sum does not fit",
            Self::OtherDevice => "an answer of another device",
            Self::OtherFunction => "an answer to another question",
            Self::WrongLength => "an answer of another length than was asked for",
            // "MODBUS Application Protocol Specification", V1.1b3, 7: exception codes.
            Self::Refused(1) => "the device refuses: it has no such table (code 1)",
            Self::Refused(2) => "the device refuses: it has no such register (code 2)",
            Self::Refused(code) => return format!("the device refuses (code {code})"),
            Self::Impossible => "a value that cannot be: below a full vacuum, or below absolute zero",
            Self::OutOfRange => {
                "a value far outside the range of the papers, or beyond anything such an instrument shows"
            }
        };
        says.to_owned()
    }
}

/// Faults of one kind.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct FaultShown {
    /// The kind.
    pub kind: TrialFault,
    /// How many.
    pub times: usize,
    /// The bytes of the first that has some.
    pub example: Vec<u8>,
}

impl FaultShown {
    /// The example, escaped and cut; empty without one.
    pub(super) fn example(&self, trial: &TrialShown) -> String {
        let some = self.example.get(..EXAMPLE).unwrap_or(&self.example);
        let cut = if some.len() < self.example.len() { "…" } else { "" };
        format!("{}{cut}", shown(trial, some))
    }
}

pub(super) fn section(trial: &TrialShown) -> String {
    if trial.faults.is_empty() {
        return String::new();
    }
    let mut text = String::from("\nFaults\n");
    for fault in &trial.faults {
        text.push_str(&wrapped(&format!("  {:>4}  ", fault.times), "        ", &fault.kind.says()));
        if !fault.example.is_empty() {
            // Not wrapped: the spaces of a line belong to it.
            text.push_str(&format!("        such as: {}\n", fault.example(trial)));
        }
    }
    text
}
