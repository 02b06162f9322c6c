//! Quantity to text: the units results are shown in, and texts that come back as the same quantity.
//!
//! Comes in: `--show psi,mL/min,ft,F`, or a quantity. Goes out: a [`Shown`] set of units, or a text that
//! [`super::text`] reads back to the last bit. Left out: rounding for people, which needs an uncertainty and is done
//! where results become words.

use super::error::QuantityError;
use super::text::Uncertain;
use super::unit::{self, Kind, Unit};
use super::{Quantity, ReferenceConditions};

/// The units in which results are shown.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Shown {
    /// Of pressures.
    pub pressure: Unit,
    /// Of flows.
    pub flow: Unit,
    /// Of lengths and depths.
    pub length: Unit,
    /// Of temperatures.
    pub temperature: Unit,
    /// Of volumes.
    pub volume: Unit,
    /// Of masses.
    pub mass: Unit,
}

impl Default for Shown {
    /// bar, L/min, m, °C, L, kg.
    fn default() -> Self {
        Self {
            pressure: Kind::Pressure.default_unit(),
            flow: Kind::Flow.default_unit(),
            length: Kind::Length.default_unit(),
            temperature: Kind::Temperature.default_unit(),
            volume: Kind::Volume.default_unit(),
            mass: Kind::Mass.default_unit(),
        }
    }
}

/// The kinds whose unit can be chosen.
const CHOICE: [Kind; 6] =
    [Kind::Pressure, Kind::Flow, Kind::Length, Kind::Temperature, Kind::Volume, Kind::Mass];

impl Shown {
    /// From units with commas between them: "psi,mL/min,ft,F". Kinds not named keep their default; an empty text
    /// names none.
    ///
    /// # Errors
    /// A unit of no kind that can be chosen, and two units of one kind; units refused in quantities are refused here
    /// with the same sentence.
    pub fn parse(text: &str) -> Result<Self, QuantityError> {
        let mut shown = Self::default();
        let mut chosen: Vec<Kind> = Vec::new();
        for word in text.split(',').map(str::trim).filter(|word| !word.is_empty()) {
            let (kind, unit) = choose(word, text)?;
            if chosen.contains(&kind) {
                return Err(QuantityError::ShownTwice { text: text.to_owned(), kind });
            }
            chosen.push(kind);
            match kind {
                Kind::Pressure => shown.pressure = unit,
                Kind::Flow => shown.flow = unit,
                Kind::Length => shown.length = unit,
                Kind::Temperature => shown.temperature = unit,
                Kind::Volume => shown.volume = unit,
                _ => shown.mass = unit,
            }
        }
        Ok(shown)
    }

    /// The unit a kind is shown in; the default one for kinds without a choice. Differences and rates of pressure
    /// and differences of temperature follow the unit of what they are differences of where there is such a unit.
    #[must_use]
    pub fn unit(&self, kind: Kind) -> Unit {
        match kind {
            Kind::Pressure => self.pressure,
            Kind::Flow => self.flow,
            Kind::Length => self.length,
            Kind::Temperature => self.temperature,
            Kind::Volume => self.volume,
            Kind::Mass => self.mass,
            Kind::TemperatureDifference => followed(kind, self.temperature.symbol),
            Kind::PressureRate => followed(kind, &format!("{}/min", self.pressure.symbol)),
            Kind::Voltage | Kind::Time | Kind::Share => kind.default_unit(),
        }
    }
}

/// A text that [`super::text::value`] reads back as the same quantity to the last bit.
///
/// It has the default unit of its kind (lengths under a millimetre: µm) and the fewest digits that come back. Not
/// every double has a number in that unit that comes back (the grid of doubles is coarser on one side of a factor
/// that is no power of two): then the next unit of the kind that has one is taken, at last the SI unit, which always
/// has. A value that was read in the default unit is always written in it.
///
/// `quantity` must be finite and possible ([`Quantity::check`]), as everything read from text is.
#[must_use]
pub fn to_text<T: Quantity>(quantity: T) -> String {
    let short_length = T::KIND == Kind::Length && quantity.si().abs() < 1e-3 && quantity.si() != 0.0;
    let first = if short_length { followed(T::KIND, "µm") } else { T::KIND.default_unit() };
    let decimal = T::KIND.units().filter(|unit| unit.remark.is_none());
    let units = std::iter::once(first).chain(decimal);
    exact(quantity, units)
}

/// A text that [`super::text::uncertain`] reads back as the same value and expanded uncertainty.
#[must_use]
pub fn uncertain_to_text<T: Quantity>(given: Uncertain<T, T::Difference>) -> String {
    match given.expanded {
        Some(expanded) => format!("{} ± {}", to_text(given.value), to_text(expanded)),
        None => to_text(given.value),
    }
}

/// A text that [`super::text::range`] reads back as the same two ends.
#[must_use]
pub fn range_to_text<T: Quantity>(low: T, high: T) -> String {
    format!("{} to {}", to_text(low), to_text(high))
}

/// A text that [`super::text::reference_conditions`] reads back as the same conditions: "20 °C, 101.325 kPa".
#[must_use]
pub fn reference_to_text(conditions: ReferenceConditions) -> String {
    let kilopascal = std::iter::once(followed(Kind::Pressure, "kPa"));
    format!("{}, {}", to_text(conditions.temperature), exact(conditions.pressure, kilopascal))
}

/// The unit of `--show` that `word` names, and its kind.
fn choose(word: &str, text: &str) -> Result<(Kind, Unit), QuantityError> {
    if let Some(found) = CHOICE.iter().find_map(|kind| Some((*kind, unit::lookup(*kind, word).ok()?))) {
        return Ok(found);
    }
    // A unit that is refused for a reason of its own keeps that reason.
    for kind in [Kind::Pressure, Kind::Flow] {
        let found = unit::lookup_in(kind, word, text);
        if let Err(refused @ (QuantityError::UnstatedReference { .. } | QuantityError::ZeroInUnit { .. })) =
            found
        {
            return Err(refused);
        }
    }
    let choice: Vec<String> = CHOICE.iter().map(|kind| kind.units_listed().replace(" or ", ", ")).collect();
    let choice = choice.join("; ");
    Err(QuantityError::NotShown { text: text.to_owned(), unit: word.to_owned(), choice })
}

/// The unit of `kind` with this symbol, else its default.
fn followed(kind: Kind, symbol: &str) -> Unit {
    unit::lookup(kind, symbol).unwrap_or_else(|_| kind.default_unit())
}

/// The quantity in the first unit in which a number comes back as the same quantity, at last in the SI unit.
fn exact<T: Quantity>(quantity: T, units: impl Iterator<Item = Unit>) -> String {
    units
        .chain(std::iter::once(T::KIND.si_unit()))
        .find_map(|unit| Some(format!("{} {}", exact_number(quantity, unit)?, unit.symbol)))
        .unwrap_or_else(|| format!("{} {}", digits(quantity.si()), T::KIND.si_unit().symbol))
}

/// The number with the fewest digits, at what `unit` shows or within a few doubles of it, that comes back as the same
/// quantity.
fn exact_number<T: Quantity>(quantity: T, unit: Unit) -> Option<String> {
    const STEPS: usize = 4;
    let comes_back = |x: &f64| x.is_finite() && T::from_shown(*x, unit) == quantity;
    let shown = quantity.shown(unit);
    // A double has at most 17 digits that matter. Where the unit has a zero of its own fewer do: 0.1 °C is kept to
    // the bits of 273.25 K, and is shown again as 0.10000000000002274.
    let mut rounded = (0..16).filter_map(|places| format!("{shown:.places$e}").parse().ok());
    let up = std::iter::successors(Some(shown), |x| Some(x.next_up())).take(STEPS + 1);
    let down = std::iter::successors(Some(shown), |x| Some(x.next_down())).skip(1).take(STEPS);
    rounded
        .find(comes_back)
        .map(digits)
        .or_else(|| up.chain(down).filter(comes_back).map(digits).min_by_key(String::len))
}

/// The shortest digits that are this double, with an exponent where it would otherwise be zeros that one counts.
fn digits(x: f64) -> String {
    if x.abs() == 0.0 {
        return "0".to_owned();
    }
    let (plain, with_exponent) = (format!("{x}"), format!("{x:e}"));
    let readable = (1e-5..1e15).contains(&x.abs()) || plain.len() <= with_exponent.len();
    if readable { plain } else { with_exponent }
}
