//! A number and the unit that follows it, as they stand in a text.
//!
//! Comes in: one number with its unit ("10.5 bar", "10bar", "1e-3 bar", "−0.2 mbar", for spans "00:08:30"). Goes
//! out: the number and the text of the unit, which may be empty. Any white space may stand between them and around
//! them, the no-break and thin ones too; the minus may be U+2212.

use super::error::QuantityError;
use super::unit::Kind;

/// A number and the text after it.
#[derive(Debug, PartialEq)]
pub(super) struct Part {
    /// The number, finite.
    pub(super) number: f64,
    /// What stands after it, without white space at its ends; empty when nothing does.
    pub(super) unit: String,
}

/// Reads `part`, which stands in `whole`.
pub(super) fn read(kind: Kind, part: &str, whole: &str) -> Result<Part, QuantityError> {
    let text = part.trim().replace('\u{2212}', "-");
    if text.is_empty() {
        return Err(QuantityError::Empty { kind });
    }
    if kind == Kind::Time && text.contains(':') {
        let number = clock(&text).ok_or_else(|| QuantityError::NotClock { text: whole.to_owned() })?;
        return Ok(Part { number, unit: "s".to_owned() });
    }
    if let Some(word) = word_for_no_number(&text) {
        return Err(QuantityError::NotFinite { text: whole.to_owned(), word });
    }
    let (digits, rest) = text.split_at(number_length(&text));
    if digits.contains(',') {
        let (point, comma) = (without_comma(digits), digits.to_owned());
        return Err(QuantityError::DecimalComma { text: whole.to_owned(), point, comma });
    }
    // `parse` also takes "inf" and "nan", but `digits` holds no such letters.
    let number: f64 = digits.parse().map_err(|_| QuantityError::NoNumber { text: whole.to_owned(), kind })?;
    if number.is_infinite() {
        return Err(QuantityError::TooLarge { text: whole.to_owned() });
    }
    let unit = rest.trim();
    let unit_one = kind == Kind::Share && unit == "1";
    if !unit_one && unit.starts_with(|c: char| c.is_ascii_digit() || "+-.".contains(c)) {
        return Err(QuantityError::SecondNumber { text: whole.to_owned(), kind });
    }
    Ok(Part { number, unit: unit.to_owned() })
}

/// Bytes of the number at the beginning of `text`: sign, digits with points and commas between them, exponent.
fn number_length(text: &str) -> usize {
    let bytes = text.as_bytes();
    let digit = |at: usize| bytes.get(at).is_some_and(u8::is_ascii_digit);
    let sign = |at: usize| usize::from(matches!(bytes.get(at), Some(b'+' | b'-')));
    let mut end = sign(0);
    while digit(end)
        || bytes.get(end) == Some(&b'.')
        // A comma that no digit follows belongs to the sentence, not to the number.
        || (bytes.get(end) == Some(&b',') && digit(end + 1))
    {
        end += 1;
    }
    if matches!(bytes.get(end), Some(b'e' | b'E')) {
        let mut exponent = end + 1 + sign(end + 1);
        if digit(exponent) {
            while digit(exponent) {
                exponent += 1;
            }
            end = exponent;
        }
    }
    end
}

/// What may have been meant by a number with commas: "10,5" → "10.5", "1.013,2" → "1013.2", "1,000,000" → "1000000".
/// A single comma before three digits may part thousands, so both are named: "1,013" → "1013 or 1.013".
fn without_comma(digits: &str) -> String {
    let bare = |part: &str| part.replace([',', '.'], "");
    let commas = digits.matches(',').count();
    if commas > 1 && !digits.contains('.') {
        return bare(digits);
    }
    let (before, after) = digits.rsplit_once([',', '.']).unwrap_or((digits, ""));
    let decimal = format!("{}.{after}", bare(before));
    let thousands = !digits.contains('.') && after.len() == 3;
    if thousands { format!("{} or {decimal}", bare(digits)) } else { decimal }
}

/// The word at the beginning of `text`, with its sign, if it means NaN or an infinity.
fn word_for_no_number(text: &str) -> Option<String> {
    let unsigned = text.trim_start_matches(['+', '-']);
    if unsigned.starts_with('∞') {
        return Some("∞".to_owned());
    }
    let length = unsigned.find(|c: char| !c.is_ascii_alphabetic()).unwrap_or(unsigned.len());
    let word = &unsigned[..length];
    ["nan", "inf", "infinity"].iter().any(|w| word.eq_ignore_ascii_case(w)).then(|| word.to_owned())
}

/// Seconds in "HH:MM:SS", where hours may pass 24 and seconds may have decimals.
fn clock(text: &str) -> Option<f64> {
    let whole = |part: &str| -> Option<u32> {
        let plain = (1..=6).contains(&part.len()) && part.bytes().all(|b| b.is_ascii_digit());
        plain.then(|| part.parse().ok()).flatten()
    };
    let mut parts = text.split(':');
    let (hours, minutes, seconds) = (parts.next()?, parts.next()?, parts.next()?);
    let (seconds, decimals) = seconds.split_once('.').unwrap_or((seconds, "0"));
    let (h, m, s) = (whole(hours)?, whole(minutes)?, whole(seconds)?);
    let well_formed = parts.next().is_none() && minutes.len() == 2 && seconds.len() == 2 && m < 60 && s < 60;
    if !well_formed || decimals.is_empty() || !decimals.bytes().all(|b| b.is_ascii_digit()) {
        return None;
    }
    // Whole seconds and decimals are joined as text, so that "00:00:00.1" is the same as "0.1 s".
    let whole_s = u64::from(h) * 3600 + u64::from(m) * 60 + u64::from(s);
    format!("{whole_s}.{decimals}").parse().ok()
}
