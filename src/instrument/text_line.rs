//! One line of text to a reading, or a fault.
//!
//! The pattern of the profile finds the number; everything here is about not believing it too easily. A line with one
//! byte that no text has is no reading, whatever the pattern finds in it; nor is a part of a number that goes on in the
//! line (`1` of `1e999`, `0` of `0,512`, `5` of `-5`).

use std::borrow::Cow;

use regex::{Regex, RegexBuilder};

use super::error::ProfileError;
use super::fault::{Fault, FaultKind};
use super::reading::{Reading, Scale};
use crate::entry::Instrument;

/// Reads the lines of one instrument.
#[derive(Debug, Clone)]
pub struct LineReader {
    pattern: Regex,
    scale: Scale,
}

impl LineReader {
    /// A reader by the pattern and the unit of an instrument.
    ///
    /// # Errors
    /// A pattern that does not compile or has no group `value`, and a unit of another kind.
    pub fn new(instrument: &Instrument, pattern: &str) -> Result<Self, ProfileError> {
        let id = || instrument.id.as_str().to_owned();
        let refused = |why: &str| ProfileError::Pattern { id: id(), why: why.to_owned() };
        // A compiled pattern of some hundred kilobytes is nobody's line of text.
        let compiled = RegexBuilder::new(pattern).size_limit(1 << 20).build();
        let pattern = compiled.map_err(|error| {
            let error = error.to_string();
            let last = error.lines().last().unwrap_or("it is not a regular expression");
            refused(last.trim_start_matches("error: "))
        })?;
        if !pattern.capture_names().flatten().any(|name| name == "value") {
            return Err(refused("it has no group named value, as in (?P<value>[-+]?\\d+)"));
        }
        Ok(Self { pattern, scale: Scale::of(instrument)? })
    }

    /// How its numbers are taken.
    #[must_use]
    pub const fn scale(&self) -> &Scale {
        &self.scale
    }

    /// Whether its lines say their unit.
    #[must_use]
    pub fn reads_units(&self) -> bool {
        self.pattern.capture_names().flatten().any(|name| name == "unit")
    }

    /// The reading of a line, given without its ending.
    ///
    /// # Errors
    /// The fault that it is instead.
    pub fn read(&self, line: &[u8]) -> Result<Reading, Fault> {
        self.take(line).map_err(|kind| Fault::new(kind, line))
    }

    /// What stands behind the number in a line that matches.
    #[must_use]
    pub fn behind_number<'l>(&self, line: &'l str) -> Option<&'l str> {
        let value = self.pattern.captures(line)?.name("value")?;
        line.get(value.end()..)
    }

    fn take(&self, line: &[u8]) -> Result<Reading, FaultKind> {
        let text = text_of(line).ok_or(FaultKind::Garbage)?;
        if text.trim().is_empty() {
            return Err(FaultKind::Empty);
        }
        let found = self.pattern.captures(&text).ok_or(FaultKind::NoMatch)?;
        let (Some(all), Some(value)) = (found.get(0), found.name("value")) else {
            return Err(FaultKind::NoMatch);
        };
        // What the pattern itself names beside the number is its author's business; what stands there unnamed is not.
        let before = if value.start() == all.start() { text.get(..value.start()) } else { None };
        let after = if value.end() == all.end() { text.get(value.end()..) } else { None };
        if begins_earlier(before.unwrap_or("")) || goes_on(value.as_str(), after.unwrap_or("")) {
            return Err(FaultKind::CutNumber);
        }
        let shown = number(value.as_str())?;
        let unit = found.name("unit").map(|unit| unit.as_str().trim()).filter(|unit| !unit.is_empty());
        self.scale.reading(shown, unit)
    }
}

/// A line as text, without line breaks at its ends: UTF-8, else Latin-1; none when it holds what no line of a meter
/// holds.
#[must_use]
pub fn text_of(line: &[u8]) -> Option<Cow<'_, str>> {
    let text: Cow<'_, str> = match std::str::from_utf8(line) {
        Ok(text) => Cow::Borrowed(text),
        Err(_) => Cow::Owned(line.iter().map(|byte| char::from(*byte)).collect()),
    };
    let bare = text.trim_matches(['\r', '\n']);
    // Start and end of text (STX, ETX, EOT) frame the lines of some instruments.
    let inner = bare.strip_prefix('\u{2}').unwrap_or(bare);
    let inner = inner.strip_suffix(['\u{3}', '\u{4}']).unwrap_or(inner);
    if !inner.chars().all(is_of_text) {
        return None;
    }
    match &text {
        Cow::Borrowed(text) => Some(Cow::Borrowed(text.trim_matches(['\r', '\n']))),
        Cow::Owned(_) => Some(Cow::Owned(bare.to_owned())),
    }
}

/// Printable ASCII, white space, and the signs that units are written with.
fn is_of_text(c: char) -> bool {
    matches!(c, ' '..='~' | '\t' | '\r' | '\n') || "°ºµμ²³·℃℉ℓ\u{2212}".contains(c)
}

/// Whether the number begins earlier in the line than the pattern says.
fn begins_earlier(before: &str) -> bool {
    if before.ends_with(|c: char| c.is_ascii_digit() || ".-\u{2212}".contains(c)) {
        return true;
    }
    // Behind "0.512" a comma parts columns, behind "0" or "1" it may be a decimal comma or part thousands.
    let Some(head) = before.strip_suffix(',') else { return false };
    let column = head.rsplit(|c: char| !c.is_ascii_digit() && c != '.').next().unwrap_or("");
    !column.is_empty() && !column.contains('.')
}

/// Whether the number goes on in the line.
fn goes_on(value: &str, after: &str) -> bool {
    let mut rest = after.chars();
    let digit = |c: Option<char>| c.is_some_and(|c| c.is_ascii_digit());
    match rest.next() {
        Some(c) if c.is_ascii_digit() || c == '.' => true,
        // Behind "0.512" a comma parts columns, behind "0" it may be a decimal comma.
        Some(',') => !value.contains('.') && digit(rest.next()),
        Some('e' | 'E') => match rest.next() {
            Some('+' | '-') => digit(rest.next()),
            next => digit(next),
        },
        _ => false,
    }
}

/// The number in a text; white space may stand around it and behind its sign, where scales put it.
fn number(text: &str) -> Result<f64, FaultKind> {
    let text = text.trim().replace('\u{2212}', "-");
    let (sign, digits) = match text.strip_prefix('-') {
        Some(digits) => (-1.0, digits),
        None => (1.0, text.strip_prefix('+').unwrap_or(&text)),
    };
    let digits = digits.trim_start();
    if digits.starts_with(['+', '-']) {
        return Err(FaultKind::NotANumber);
    }
    let number: f64 = digits.parse().map_err(|_| FaultKind::NotANumber)?;
    if number.is_finite() { Ok(sign * number) } else { Err(FaultKind::NotFinite) }
}

/// A line without the echo of what was asked; none when it is nothing but the echo.
///
/// Some instruments and adapters send back what they hear. The text is taken off only where all of it stands, its own
/// ending included: a question "0" must not eat the nought of "0.512".
#[must_use]
pub fn without_echo<'l>(line: &'l [u8], ask: &[u8]) -> Option<&'l [u8]> {
    if line.trim_ascii() == ask.trim_ascii() {
        return None;
    }
    let ended = ask.last().is_some_and(u8::is_ascii_control);
    match line.strip_prefix(ask) {
        Some(rest) if ended => Some(rest),
        _ => Some(line),
    }
}
