//! Units: which are understood for which kind of quantity, and what each is in SI.
//!
//! Comes in: a unit as people write it. Goes out: a [`Unit`], which turns a number shown in it into SI and back.
//! Every unit is a ratio of two whole numbers a double holds exactly, so that a number shown in a decimal unit is
//! rounded once. Sources: SI Brochure, 9th edition (2019); NIST Special Publication 811 (2008), appendix B, for the
//! others; each line of the tables below says what it is made of.
//!
//! Left out: compound units beyond those listed, prefixes beyond those listed, and every unit that hides reference
//! conditions (sccm, slpm, NL/min) or a zero of pressure (psig, bara): these are refused by name.

use super::error::QuantityError;

/// The kinds of quantity that have units.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Kind {
    /// Gauge and absolute pressures and their differences; SI: Pa.
    Pressure,
    /// Change of pressure with time; SI: Pa/s.
    PressureRate,
    /// Temperatures on a scale with a zero; SI: K.
    Temperature,
    /// Differences of temperatures, which know no zero; SI: K.
    TemperatureDifference,
    /// Volume flows, whatever their litres are; SI: m³/s.
    Flow,
    /// Volumes; SI: m³.
    Volume,
    /// Lengths and depths; SI: m.
    Length,
    /// Masses; SI: kg.
    Mass,
    /// Voltages of cells; SI: V.
    Voltage,
    /// Spans of time; SI: s.
    Time,
    /// Shares of a whole; SI: 1.
    Share,
}

/// A unit of one kind of quantity: SI value = shown · `factor` + `offset`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Unit {
    /// Its symbol, one for all the ways it may be written.
    pub symbol: &'static str,
    /// SI units in one of it, to the nearest double; [`Unit::to_si`] rounds less.
    pub factor: f64,
    /// The SI value of its zero; not nought only for °C and °F as temperatures.
    pub offset: f64,
    /// What must be said to the person who wrote it, where it could be understood otherwise.
    pub remark: Option<&'static str>,
    /// `factor` as a ratio: this over `denominator`, both exact.
    numerator: f64,
    denominator: f64,
    /// How many of it lie between the zero of SI and its own.
    zero: f64,
}

/// Looks a unit up by its text.
///
/// White space in it does not matter, capitals do: `mV` is not `MV`.
///
/// # Errors
/// [`QuantityError::NoUnit`] when the text is empty; [`QuantityError::UnstatedReference`] for units that hide
/// reference conditions; [`QuantityError::ZeroInUnit`] for pressures marked gauge or absolute;
/// [`QuantityError::OtherKind`] for a unit of another kind; else [`QuantityError::UnknownUnit`] with the nearest known.
pub fn lookup(kind: Kind, text: &str) -> Result<Unit, QuantityError> {
    lookup_in(kind, text, text)
}

/// As [`lookup`], naming in its errors the whole text the unit stood in.
pub(super) fn lookup_in(kind: Kind, unit: &str, whole: &str) -> Result<Unit, QuantityError> {
    let bare: String = unit.chars().filter(|c| !c.is_whitespace()).collect();
    match find(kind, &bare) {
        Some(known) => Ok(known),
        None => Err(refusal(kind, bare, whole)),
    }
}

impl Unit {
    /// The SI value of a number shown in this unit.
    #[must_use]
    pub fn to_si(self, shown: f64) -> f64 {
        (shown + self.zero) * self.numerator / self.denominator
    }

    /// The number this unit shows for an SI value.
    #[must_use]
    pub fn from_si(self, si: f64) -> f64 {
        si * self.denominator / self.numerator - self.zero
    }

    /// The number `other` shows for what this unit shows as `shown`; both without a zero of their own.
    ///
    /// Unlike the way over SI it changes nothing between equal units and rounds once between decimal ones.
    #[must_use]
    pub(super) fn shown_in(self, shown: f64, other: Self) -> f64 {
        let numerator = self.numerator * other.denominator;
        let denominator = self.denominator * other.numerator;
        if denominator % numerator == 0.0 {
            shown / (denominator / numerator)
        } else {
            shown * (numerator / denominator)
        }
    }
}

impl Kind {
    /// All kinds.
    pub const ALL: [Self; 11] = [
        Self::Pressure,
        Self::PressureRate,
        Self::Temperature,
        Self::TemperatureDifference,
        Self::Flow,
        Self::Volume,
        Self::Length,
        Self::Mass,
        Self::Voltage,
        Self::Time,
        Self::Share,
    ];

    /// Its name in a sentence, such as "pressure".
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Pressure => "pressure",
            Self::PressureRate => "change of pressure with time",
            Self::Temperature => "temperature",
            Self::TemperatureDifference => "temperature difference",
            Self::Flow => "flow",
            Self::Volume => "volume",
            Self::Length => "length",
            Self::Mass => "mass",
            Self::Voltage => "voltage",
            Self::Time => "span of time",
            Self::Share => "share",
        }
    }

    /// A text of this kind, for sentences that say how to write one.
    #[must_use]
    pub const fn example(self) -> &'static str {
        match self {
            Self::Pressure => "10.5 bar",
            Self::PressureRate => "0.002 bar/min",
            Self::Temperature => "21 °C",
            Self::TemperatureDifference => "1 °C",
            Self::Flow => "0.7 L/min",
            Self::Volume => "7.5 L",
            Self::Length => "12 m",
            Self::Mass => "82 kg",
            Self::Voltage => "48.0 mV",
            Self::Time => "90 s",
            Self::Share => "0.8 %",
        }
    }

    /// Its units in the order they are listed to people; the first is the one shown by default.
    pub fn units(self) -> impl Iterator<Item = Unit> {
        table(self).iter().map(|row| row.unit)
    }

    /// Its units in a sentence: "bar, mbar, … or ata".
    #[must_use]
    pub fn units_listed(self) -> String {
        let symbols: Vec<&str> = table(self).iter().map(|row| row.unit.symbol).collect();
        listed(&symbols)
    }

    /// The unit it is shown and written in unless another is asked for.
    #[must_use]
    pub fn default_unit(self) -> Unit {
        table(self)[0].unit
    }

    /// The SI unit, whose number is the SI value itself.
    #[must_use]
    pub fn si_unit(self) -> Unit {
        let is_si = |row: &&Row| row.unit.factor.to_bits() == 1f64.to_bits() && row.unit.zero.to_bits() == 0;
        table(self).iter().find(is_si).map_or_else(|| self.default_unit(), |row| row.unit)
    }
}

/// What has to be said of units found in a text (each once, in the order of the tables).
///
/// `ata` is divers' use for 1.01325 bar: it is accepted, and said.
#[must_use]
pub fn remarks(text: &str) -> Vec<&'static str> {
    let words = || text.split(|c: char| !c.is_alphabetic());
    Kind::ALL
        .iter()
        .flat_map(|kind| table(*kind))
        .filter(|row| row.names().any(|name| words().any(|word| word == name)))
        .filter_map(|row| row.unit.remark)
        .collect()
}

/// Joins words as a sentence does: "a, b or c".
pub(super) fn listed(words: &[&str]) -> String {
    match words {
        [] => String::new(),
        [only] => (*only).to_owned(),
        [first @ .., last] => format!("{} or {last}", first.join(", ")),
    }
}

/// A unit and the other ways it is written.
struct Row {
    unit: Unit,
    also: &'static [&'static str],
}

impl Row {
    fn names(&self) -> impl Iterator<Item = &'static str> {
        std::iter::once(self.unit.symbol).chain(self.also.iter().copied())
    }
}

/// A unit of `numerator / denominator` SI units.
const fn row(symbol: &'static str, also: &'static [&'static str], numerator: f64, denominator: f64) -> Row {
    scale(symbol, also, numerator, denominator, 0.0)
}

/// A unit of `numerator / denominator` SI units whose scale begins `zero` of it above the zero of SI.
const fn scale(
    symbol: &'static str,
    also: &'static [&'static str],
    numerator: f64,
    denominator: f64,
    zero: f64,
) -> Row {
    let factor = numerator / denominator;
    let offset = zero * numerator / denominator;
    Row { unit: Unit { symbol, factor, offset, remark: None, numerator, denominator, zero }, also }
}

const fn remarked(row: Row, remark: &'static str) -> Row {
    let Row { unit, also } = row;
    Row { unit: Unit { remark: Some(remark), ..unit }, also }
}

/// The litre per minute, in which meters' readings are kept.
pub(super) const L_MIN: Unit = row("L/min", &[], 1.0, 6e4).unit;

/// The bar, in which partial pressures that were read are kept.
pub(super) const BAR: Unit = row("bar", &[], 1e5, 1.0).unit;

/// Pound-force per square inch in pascals: 0.453 592 37 kg · 9.806 65 m/s² / (0.0254 m)², exact (international pound
/// and inch of 1959; standard gravity of the 3rd CGPM, 1901) = 6894.757 293 168 361…
const PSI_PA: (f64, f64) = (44_482_216_152_605.0, 6_451_600_000.0);

/// Conventional millimetre of mercury in pascals: 13 595.1 kg/m³ · 9.806 65 m/s² · 1 mm = 133.322 387 415, exact
/// (ISO 80000-4; NIST SP 811, B.8).
const MMHG_PA: (f64, f64) = (133_322_387_415.0, 1e9);

/// Conventional inch of mercury: 25.4 of the above (NIST SP 811, B.8).
const INHG_PA: (f64, f64) = (33_863_886_403_410.0, 1e10);

/// Cubic foot in cubic metres: (0.3048 m)³, exact.
const FT3_M3: (f64, f64) = (28_316_846_592.0, 1e12);

static PRESSURE: &[Row] = &[
    row("bar", &["Bar", "BAR"], 1e5, 1.0),
    row("mbar", &[], 1e2, 1.0),
    row("Pa", &[], 1.0, 1.0),
    row("hPa", &[], 1e2, 1.0),
    row("kPa", &[], 1e3, 1.0),
    row("MPa", &[], 1e6, 1.0),
    row("psi", &["PSI", "lbf/in2", "lbf/in²"], PSI_PA.0, PSI_PA.1),
    row("mmHg", &["mmhg"], MMHG_PA.0, MMHG_PA.1),
    row("inHg", &["inhg"], INHG_PA.0, INHG_PA.1),
    // Standard atmosphere (10th CGPM, 1954, Resolution 4).
    row("atm", &[], super::STANDARD_ATMOSPHERE_PA, 1.0),
    // Divers' use, and not the technical atmosphere (kgf/cm²) that the symbol once stood for.
    remarked(
        row("ata", &["ATA"], super::STANDARD_ATMOSPHERE_PA, 1.0),
        "ata is read as 1.01325 bar; whether that is gauge or absolute is said by the key, not by the unit",
    ),
];

static PRESSURE_RATE: &[Row] = &[
    row("bar/min", &[], 5e3, 3.0),
    row("mbar/min", &[], 5.0, 3.0),
    row("Pa/s", &[], 1.0, 1.0),
    row("Pa/min", &[], 1.0, 60.0),
    row("hPa/min", &[], 5.0, 3.0),
    row("kPa/min", &[], 50.0, 3.0),
    row("psi/min", &["PSI/min"], PSI_PA.0, PSI_PA.1 * 60.0),
    row("mbar/s", &[], 1e2, 1.0),
    row("bar/h", &[], 250.0, 9.0),
    row("mbar/h", &[], 1.0, 36.0),
];

static TEMPERATURE: &[Row] = &[
    scale("°C", &["C", "degC", "℃", "ºC"], 1.0, 1.0, super::ZERO_CELSIUS_K),
    row("K", &[], 1.0, 1.0),
    // t/°F = 9/5 · T/K − 459.67, exact (NIST SP 811, B.8).
    scale("°F", &["F", "degF", "℉", "ºF"], 5.0, 9.0, 459.67),
];

static TEMPERATURE_DIFFERENCE: &[Row] = &[
    row("°C", &["C", "degC", "℃", "ºC"], 1.0, 1.0),
    row("K", &[], 1.0, 1.0),
    row("°F", &["F", "degF", "℉", "ºF"], 5.0, 9.0),
];

static FLOW: &[Row] = &[
    row("L/min", &["l/min", "ℓ/min", "lpm", "LPM", "dm3/min", "dm³/min"], 1.0, 6e4),
    row("mL/min", &["ml/min"], 1.0, 6e7),
    row("L/h", &["l/h", "ℓ/h"], 1.0, 3.6e6),
    row("L/s", &["l/s", "ℓ/s", "dm3/s", "dm³/s"], 1.0, 1e3),
    row("mL/s", &["ml/s"], 1.0, 1e6),
    row("cm³/min", &["cm3/min", "ccm", "cc/min"], 1.0, 6e7),
    row("m³/h", &["m3/h"], 1.0, 3.6e3),
    row("m³/s", &["m3/s"], 1.0, 1.0),
    row("ft³/h", &["ft3/h", "cfh"], FT3_M3.0, FT3_M3.1 * 3.6e3),
    row("ft³/min", &["ft3/min", "cfm"], FT3_M3.0, FT3_M3.1 * 60.0),
];

static VOLUME: &[Row] = &[
    row("L", &["l", "ℓ", "dm3", "dm³"], 1.0, 1e3),
    row("mL", &["ml"], 1.0, 1e6),
    row("cm³", &["cm3", "cc"], 1.0, 1e6),
    row("m³", &["m3"], 1.0, 1.0),
    row("ft³", &["ft3", "cuft"], FT3_M3.0, FT3_M3.1),
];

static LENGTH: &[Row] = &[
    row("m", &[], 1.0, 1.0),
    // The micro sign and the Greek letter are two characters that look alike.
    row("µm", &["\u{3bc}m", "um"], 1.0, 1e6),
    row("mm", &[], 1.0, 1e3),
    row("cm", &[], 1.0, 1e2),
    // International inch and foot (1959), exact.
    row("in", &[], 254.0, 1e4),
    row("ft", &[], 3048.0, 1e4),
];

static MASS: &[Row] = &[
    row("kg", &[], 1.0, 1.0),
    row("g", &[], 1.0, 1e3),
    // International avoirdupois pound (1959), exact.
    row("lb", &["lbs"], 45_359_237.0, 1e8),
];

static VOLTAGE: &[Row] =
    &[row("mV", &[], 1.0, 1e3), row("V", &[], 1.0, 1.0), row("µV", &["\u{3bc}V", "uV"], 1.0, 1e6)];

static TIME: &[Row] = &[
    row("s", &["sec"], 1.0, 1.0),
    row("ms", &[], 1.0, 1e3),
    row("min", &[], 60.0, 1.0),
    row("h", &["hr"], 3600.0, 1.0),
];

// The unit one has no symbol in running text (SI Brochure, 5.4.7); here it must be written, lest a missing % pass.
static SHARE: &[Row] = &[row("%", &["percent"], 1.0, 1e2), row("1", &[], 1.0, 1.0)];

/// The units of a kind, the default first.
fn table(kind: Kind) -> &'static [Row] {
    match kind {
        Kind::Pressure => PRESSURE,
        Kind::PressureRate => PRESSURE_RATE,
        Kind::Temperature => TEMPERATURE,
        Kind::TemperatureDifference => TEMPERATURE_DIFFERENCE,
        Kind::Flow => FLOW,
        Kind::Volume => VOLUME,
        Kind::Length => LENGTH,
        Kind::Mass => MASS,
        Kind::Voltage => VOLTAGE,
        Kind::Time => TIME,
        Kind::Share => SHARE,
    }
}

/// The unit of `kind` that is written so.
fn find(kind: Kind, bare: &str) -> Option<Unit> {
    table(kind).iter().find(|row| row.names().any(|name| name == bare)).map(|row| row.unit)
}

/// Why `bare` is no unit of `kind`.
fn refusal(kind: Kind, bare: String, whole: &str) -> QuantityError {
    let text = whole.to_owned();
    if bare.is_empty() {
        return QuantityError::NoUnit { text, kind };
    }
    if matches!(kind, Kind::Flow | Kind::Volume) && hides_reference(kind, &bare) {
        return QuantityError::UnstatedReference { text, unit: bare };
    }
    if kind == Kind::Pressure
        && let Some(plain) = without_zero_mark(&bare)
    {
        return QuantityError::ZeroInUnit { text, unit: bare, plain };
    }
    if let Some(is) = Kind::ALL.into_iter().find(|other| find(*other, &bare).is_some()) {
        return QuantityError::OtherKind { text, unit: bare, is, kind };
    }
    let nearest = nearest(kind, &bare);
    QuantityError::UnknownUnit { text, unit: bare, kind, nearest }
}

/// Whether a unit of flow or volume is one of those that mean "at some reference conditions" without saying which:
/// sccm, slpm, NL/min, Nm³/h, SCFH, std L/min, ln/min, in any case of letters.
fn hides_reference(kind: Kind, bare: &str) -> bool {
    let lower = bare.to_lowercase().replace(['.', '(', ')'], "");
    if ["slm", "nlm", "slph", "nlph", "scf"].contains(&lower.as_str()) {
        return true;
    }
    let suffixed = lower.replacen("ln/", "l/", 1);
    let suffixed_known = suffixed != lower && find_any_case(kind, &suffixed).is_some();
    suffixed_known
        || ["standard", "normal", "norm", "std", "s", "n"]
            .iter()
            .filter_map(|mark| lower.strip_prefix(mark))
            .any(|rest| find_any_case(kind, rest).is_some())
}

/// The unit that is left when a mark for gauge or absolute is taken off a unit of pressure (psig, bara, bar(g)).
fn without_zero_mark(bare: &str) -> Option<&'static str> {
    let lower = bare.to_lowercase().replace(['.', '(', ')', ','], "");
    ["absolute", "abs", "gauge", "gage", "a", "g"]
        .iter()
        .filter_map(|mark| lower.strip_suffix(mark))
        .find_map(|rest| find_any_case(Kind::Pressure, rest))
        .map(|unit| unit.symbol)
}

/// As [`find`], whatever the case of letters; only for telling what somebody meant.
fn find_any_case(kind: Kind, lower: &str) -> Option<Unit> {
    table(kind).iter().find(|row| row.names().any(|name| name.to_lowercase() == lower)).map(|row| row.unit)
}

/// The unit of `kind` whose spelling is nearest, if it is near at all: at most half of the letters differ.
fn nearest(kind: Kind, bare: &str) -> Option<&'static str> {
    let lower = bare.to_lowercase();
    let half = lower.chars().count() / 2;
    table(kind)
        .iter()
        .flat_map(|row| row.names().map(|name| (distance(&lower, &name.to_lowercase()), row.unit.symbol)))
        .filter(|(changes, _)| *changes <= half)
        .min_by_key(|(changes, _)| *changes)
        .map(|(_, symbol)| symbol)
}

/// Changes of a letter between two spellings; very long ones, which nobody meant, are not measured.
fn distance(a: &str, b: &str) -> usize {
    const LONGEST: usize = 40;
    if a.len() > LONGEST { usize::MAX } else { strsim::osa_distance(a, b) }
}
