//! Why a text is no quantity: one sentence each, with the text given, what is wrong and what to do.

use super::reference;
use super::unit::Kind;

/// Why a text is no quantity.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum QuantityError {
    /// The text is empty.
    #[error("nothing is written where a {} should stand: write it as in {:?}", .kind.name(), .kind.example())]
    Empty {
        /// What was asked for.
        kind: Kind,
    },
    /// The text does not begin with a number.
    #[error("{} does not begin with a number: write a {} as in {:?}", quoted(.text), .kind.name(), .kind.example())]
    NoNumber {
        /// The text given.
        text: String,
        /// What was asked for.
        kind: Kind,
    },
    /// A plain number was asked for and is not there, or something follows it.
    #[error("{} is not a plain number: write it without a unit, as in \"0.98\" or \"0.98 ± 0.01\"", quoted(.text))]
    NotPlain {
        /// The text given.
        text: String,
    },
    /// NaN or an infinity.
    #[error("{} is refused because {word} is not a number that was read: give a finite number or leave it out", quoted(.text))]
    NotFinite {
        /// The text given.
        text: String,
        /// The word for it in the text.
        word: String,
    },
    /// A number beyond what a double holds.
    #[error("{} is too large a number: check its exponent", quoted(.text))]
    TooLarge {
        /// The text given.
        text: String,
    },
    /// A comma in the number.
    #[error("{} has a comma in its number: write {point}, not {comma}", quoted(.text))]
    DecimalComma {
        /// The text given.
        text: String,
        /// The number with a decimal point.
        point: String,
        /// The number as it stands.
        comma: String,
    },
    /// A second number stands where the unit should.
    #[error(
        "{} has a second number where its unit should stand: write one number without spaces in it, as in {:?}",
        quoted(.text), .kind.example()
    )]
    SecondNumber {
        /// The text given.
        text: String,
        /// What was asked for.
        kind: Kind,
    },
    /// No unit where one is possible.
    #[error("{} has a number without a unit: give the {} in {}", quoted(.text), .kind.name(), .kind.units_listed())]
    NoUnit {
        /// The text given.
        text: String,
        /// What was asked for.
        kind: Kind,
    },
    /// A unit nobody knows.
    #[error(
        "{}{} is not a unit of {} known here{}: use {}",
        quoted(.unit), within(.text, .unit), .kind.name(), meant(*.nearest), .kind.units_listed()
    )]
    UnknownUnit {
        /// The text given.
        text: String,
        /// The unit in it.
        unit: String,
        /// What was asked for.
        kind: Kind,
        /// The unit with the nearest spelling.
        nearest: Option<&'static str>,
    },
    /// A unit of something else.
    #[error(
        "{}{} is a unit of {}, and a {} is asked for: use {}",
        quoted(.unit), within(.text, .unit), .is.name(), .kind.name(), .kind.units_listed()
    )]
    OtherKind {
        /// The text given.
        text: String,
        /// The unit in it.
        unit: String,
        /// What the unit measures.
        is: Kind,
        /// What was asked for.
        kind: Kind,
    },
    /// A unit that means "at reference conditions" without saying which.
    #[error(
        "{}{} does not say at which temperature and pressure its litres are counted: write it in L, mL or ft³ \
         and say the reference conditions in reads_at",
        quoted(.unit), within(.text, .unit)
    )]
    UnstatedReference {
        /// The text given.
        text: String,
        /// The unit in it.
        unit: String,
    },
    /// A unit of pressure marked gauge or absolute.
    #[error(
        "{}{} is refused because gauge or absolute is said by the key, not by the unit: write {plain}",
        quoted(.unit), within(.text, .unit)
    )]
    ZeroInUnit {
        /// The text given.
        text: String,
        /// The unit in it.
        unit: String,
        /// The unit without the mark.
        plain: &'static str,
    },
    /// A ± where only a value is meant.
    #[error("{} has a ± where only a value is meant: leave the ± and what follows it out", quoted(.text))]
    UncertaintyHere {
        /// The text given.
        text: String,
    },
    /// Nothing before the ±.
    #[error("{} has no value before its ±: write it as in \"{} ± …\"", quoted(.text), .kind.example())]
    NoValue {
        /// The text given.
        text: String,
        /// What was asked for.
        kind: Kind,
    },
    /// A value before the ± where only the ± is meant.
    #[error("{} has a value where only its ± is meant: leave out what stands before the ±", quoted(.text))]
    ValueHere {
        /// The text given.
        text: String,
    },
    /// More than one ±.
    #[error("{} has more than one ±: give one expanded uncertainty", quoted(.text))]
    SeveralUncertainties {
        /// The text given.
        text: String,
    },
    /// A negative uncertainty.
    #[error("{} has a negative uncertainty: give the ± without a sign", quoted(.text))]
    NegativeUncertainty {
        /// The text given.
        text: String,
    },
    /// A value that cannot be.
    #[error("{} is refused because {why}: check its sign, its unit and its key", quoted(.text))]
    Impossible {
        /// The text given.
        text: String,
        /// What it goes against.
        why: Impossible,
    },
    /// No range.
    #[error("{} is not a range: write its two ends with \"to\" between them, as in \"{} to …\"", quoted(.text), .kind.example())]
    NotRange {
        /// The text given.
        text: String,
        /// What was asked for.
        kind: Kind,
    },
    /// A range whose ends are equal or the wrong way round.
    #[error("{} does not rise: write the lower end of the range first and the higher after it", quoted(.text))]
    RangeOrder {
        /// The text given.
        text: String,
    },
    /// A time of the form 1:2:3 that is none.
    #[error("{} is not a span of time: write hours, minutes and seconds as in \"00:08:30\", or \"510 s\"", quoted(.text))]
    NotClock {
        /// The text given.
        text: String,
    },
    /// No reference conditions.
    #[error("{} does not say reference conditions known here: write {}", quoted(.text), reference::presets_listed())]
    NotReference {
        /// The text given.
        text: String,
    },
    /// Reference conditions that no meter has.
    #[error(
        "{} would be reference conditions outside {}: check the units of its temperature and pressure",
        quoted(.text), reference::PLAUSIBLE
    )]
    ImplausibleReference {
        /// The text given.
        text: String,
    },
    /// Units to show that name one kind twice.
    #[error("{} names two units of {}: keep one", quoted(.text), .kind.name())]
    ShownTwice {
        /// The text given.
        text: String,
        /// The kind named twice.
        kind: Kind,
    },
    /// A unit to show that is none of those that can be chosen.
    #[error("{}{} cannot be chosen to show results in: choose among {choice}", quoted(.unit), within(.text, .unit))]
    NotShown {
        /// The text given.
        text: String,
        /// The unit in it.
        unit: String,
        /// What can be chosen.
        choice: String,
    },
}

/// What a value goes against that cannot be.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
pub enum Impossible {
    /// NaN or infinite.
    #[error("it is not a finite number")]
    NotFinite,
    /// Below a full vacuum.
    #[error("a gauge pressure is never below -1 bar")]
    GaugeBelowVacuum,
    /// Below a full vacuum.
    #[error("an absolute pressure is never below zero")]
    AbsoluteBelowZero,
    /// At or below absolute zero.
    #[error("a temperature is always above absolute zero, -273.15 °C")]
    AtAbsoluteZero,
    /// Below zero.
    #[error("a {} is never negative", .0.name())]
    Negative(Kind),
}

/// The text in quotation marks, control characters made visible and a very long text cut.
fn quoted(text: &str) -> String {
    const LONGEST: usize = 60;
    match text.char_indices().nth(LONGEST) {
        Some((end, _)) => format!("\"{}…\"", text[..end].escape_debug()),
        None => format!("{text:?}"),
    }
}

/// Where the unit stood, when it did not stand alone.
fn within(text: &str, unit: &str) -> String {
    if text.trim() == unit { String::new() } else { format!(" in {}", quoted(text)) }
}

fn meant(nearest: Option<&str>) -> String {
    nearest.map_or_else(String::new, |symbol| format!(", the nearest is {symbol}"))
}
