//! Text to quantity.
//!
//! Comes in: what people write in files and flags ("10.5 bar", "7.5 L ± 1.0 L", "0.02 L/min to 2 L/min", "00:08:30",
//! "20 °C, 101.325 kPa"). Goes out: a typed quantity in SI, or one sentence that says what is wrong and what to do.
//! The way back is in [`super::show`].
//!
//! Left out: decimal commas (the reader of CSV files knows where they are meant), fractions, sums, uncertainties
//! in parentheses, and relative uncertainties: the part after ± has a unit of the same kind as the value.

use super::Span;
use super::number::{self, Part};
use super::unit;

pub use super::error::QuantityError;
pub use super::reference::reference_conditions;
pub use super::typed::Quantity;
pub use super::unit::remarks;

/// A value with the expanded uncertainty that stood after its `±`, if any (k = 2 unless its table says otherwise).
///
/// `D` is the type of differences of `T`; for most quantities they are the same.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Uncertain<T, D = T> {
    /// The value.
    pub value: T,
    /// The expanded uncertainty after `±`.
    pub expanded: Option<D>,
}

/// A value alone, as "10.5 bar".
///
/// # Errors
/// A ± part is refused; so are all that [`QuantityError`] lists for a number and its unit, and values that
/// [`Quantity::check`] says cannot be.
pub fn value<T: Quantity>(text: &str) -> Result<T, QuantityError> {
    no_uncertainty(text)?;
    let part = number::read(T::KIND, text, text)?;
    possible(of(&part, &part.unit, text)?, text)
}

/// A reading that may be on the impossible side of zero because an instrument shows it, as a meter's zero does:
/// "-0.0002 L/min".
///
/// # Errors
/// As [`value`], but for [`QuantityError::Impossible`].
pub fn zero_reading<T: Quantity>(text: &str) -> Result<T, QuantityError> {
    no_uncertainty(text)?;
    let part = number::read(T::KIND, text, text)?;
    of(&part, &part.unit, text)
}

/// A value with or without its expanded uncertainty: "7.5 L ± 1.0 L", "7.5 L +/- 1.0 L", "7.5 ± 1.0 L", "7.5 L".
///
/// The two may have different units of the same kind. The ± of a temperature is a difference: "± 2 °F" is 10/9 K.
///
/// # Errors
/// As [`value`]; also a negative ±, more than one ±, a ± without a value before it, and a ± without a unit.
pub fn uncertain<T: Quantity>(text: &str) -> Result<Uncertain<T, T::Difference>, QuantityError> {
    let Some((before, after)) = split_uncertainty(text)? else {
        return Ok(Uncertain { value: value(text)?, expanded: None });
    };
    if before.trim().is_empty() {
        return Err(QuantityError::NoValue { text: text.to_owned(), kind: T::KIND });
    }
    let part = number::read(T::KIND, &before, text)?;
    let spread = number::read(T::Difference::KIND, &after, text)?;
    let unit = if part.unit.is_empty() { &spread.unit } else { &part.unit };
    let value = possible(of(&part, unit, text)?, text)?;
    Ok(Uncertain { value, expanded: Some(expanded(&spread, text)?) })
}

/// An expanded uncertainty alone: "± 1.0 °C" or "1.0 °C", which is a difference of 1 K and no temperature.
///
/// # Errors
/// As [`uncertain`]; also a value before the ±.
pub fn expanded_only<T: Quantity>(text: &str) -> Result<T::Difference, QuantityError> {
    let after = match split_uncertainty(text)? {
        None => text.to_owned(),
        Some((before, after)) if before.trim().is_empty() => after,
        Some(_) => return Err(QuantityError::ValueHere { text: text.to_owned() }),
    };
    expanded(&number::read(T::Difference::KIND, &after, text)?, text)
}

/// The two ends of a range, the lower first: "0.02 L/min to 2 L/min", also "0 to 2 L/min".
///
/// # Errors
/// As [`value`] for each end; also when there is no "to", or the ends are equal or the wrong way round.
pub fn range<T: Quantity>(text: &str) -> Result<(T, T), QuantityError> {
    no_uncertainty(text)?;
    let not_range = || QuantityError::NotRange { text: text.to_owned(), kind: T::KIND };
    let words: Vec<&str> = text.split_whitespace().collect();
    let mut ends = words.split(|word| *word == "to");
    let (low, high) =
        (ends.next().unwrap_or_default().join(" "), ends.next().ok_or_else(not_range)?.join(" "));
    if ends.next().is_some() || low.is_empty() || high.is_empty() {
        return Err(not_range());
    }
    let (low, high) = (number::read(T::KIND, &low, text)?, number::read(T::KIND, &high, text)?);
    let low_unit = if low.unit.is_empty() { &high.unit } else { &low.unit };
    let low: T = possible(of(&low, low_unit, text)?, text)?;
    let high: T = possible(of(&high, &high.unit, text)?, text)?;
    if low.si() < high.si() {
        Ok((low, high))
    } else {
        Err(QuantityError::RangeOrder { text: text.to_owned() })
    }
}

/// A span of time: "90 s", "200 ms", "2 min", "1.5 h", "00:08:30" (hours may pass 24).
///
/// # Errors
/// As [`value`]; also a text with colons that is not hours, minutes and seconds.
pub fn span(text: &str) -> Result<Span, QuantityError> {
    value(text)
}

/// A number that has no unit, such as a gas factor: "0.98" or "0.98 ± 0.01".
///
/// # Errors
/// [`QuantityError::NotPlain`] when it is none or a unit follows; a decimal comma, NaN, infinities and a negative ±
/// as [`uncertain`].
pub fn plain(text: &str) -> Result<Uncertain<f64>, QuantityError> {
    // The kind only steers sentences, and those that would name it are replaced.
    let read = |part: &str| match number::read(unit::Kind::Share, part, text) {
        Ok(Part { number, unit }) if unit.is_empty() => Ok(number),
        Err(
            refused @ (QuantityError::DecimalComma { .. }
            | QuantityError::NotFinite { .. }
            | QuantityError::TooLarge { .. }),
        ) => Err(refused),
        Ok(_) | Err(_) => Err(QuantityError::NotPlain { text: text.to_owned() }),
    };
    let Some((before, after)) = split_uncertainty(text)? else {
        return Ok(Uncertain { value: read(text)?, expanded: None });
    };
    let (value, expanded) = (read(&before)?, read(&after)?);
    if expanded < 0.0 {
        return Err(QuantityError::NegativeUncertainty { text: text.to_owned() });
    }
    Ok(Uncertain { value, expanded: Some(expanded) })
}

/// The quantity of a number in the unit written as `unit`, any sign.
fn of<T: Quantity>(part: &Part, unit: &str, whole: &str) -> Result<T, QuantityError> {
    let quantity = T::from_shown(part.number, unit::lookup_in(T::KIND, unit, whole)?);
    if quantity.si().is_finite() {
        Ok(quantity)
    } else {
        Err(QuantityError::TooLarge { text: whole.to_owned() })
    }
}

fn possible<T: Quantity>(quantity: T, whole: &str) -> Result<T, QuantityError> {
    match quantity.check() {
        Ok(()) => Ok(quantity),
        Err(why) => Err(QuantityError::Impossible { text: whole.to_owned(), why }),
    }
}

/// An expanded uncertainty, which is a difference and not negative.
fn expanded<D: Quantity>(part: &Part, whole: &str) -> Result<D, QuantityError> {
    let difference: D = of(part, &part.unit, whole)?;
    if difference.si() < 0.0 {
        return Err(QuantityError::NegativeUncertainty { text: whole.to_owned() });
    }
    Ok(difference)
}

/// What stands before and after the ±, if there is one.
fn split_uncertainty(text: &str) -> Result<Option<(String, String)>, QuantityError> {
    let text_with_sign = text.replace("+/-", "±").replace("+/\u{2212}", "±");
    match text_with_sign.split_once('±') {
        Some((_, after)) if after.contains('±') => {
            Err(QuantityError::SeveralUncertainties { text: text.to_owned() })
        }
        Some((before, after)) => Ok(Some((before.to_owned(), after.to_owned()))),
        None => Ok(None),
    }
}

fn no_uncertainty(text: &str) -> Result<(), QuantityError> {
    match split_uncertainty(text)? {
        Some(_) => Err(QuantityError::UncertaintyHere { text: text.to_owned() }),
        None => Ok(()),
    }
}
