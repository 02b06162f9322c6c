//! What the two live screens have in common: a live value with its state, what is saved, who logs.
//!
//! Comes in: numbers in bar, L/min, metres and degrees Celsius, with what is known of them. Goes out: words. The level
//! line beside a value is a number of steps here; how it is drawn is the screen's affair.

use super::Units;
use super::layout::counted;
use super::number::{figures, fixed};
use super::typed::{span, tame};
use crate::quantity::Kind;

/// What a live value is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum DialKind {
    /// A pressure in bar, as shown.
    Pressure,
    /// A flow in L/min, as shown.
    Flow,
    /// A temperature in degrees Celsius.
    Temperature,
    /// Ambient pressure in bar.
    Barometer,
    /// A partial pressure of oxygen in bar.
    Po2,
    /// A depth in metres.
    Depth,
}

/// How a live value stands.
#[derive(Debug, Clone, PartialEq)]
pub enum DialState {
    /// Nothing was read yet.
    Waiting,
    /// Read, and not judged: a value of which nobody asks whether it is steady.
    Read,
    /// Steady.
    Steady,
    /// Read, and moving.
    Moving,
    /// Its last reading is too old.
    Stale {
        /// Age of the last reading, seconds.
        age_s: f64,
    },
    /// It repeats one value for longer than an honest instrument would.
    Frozen {
        /// For so many seconds.
        for_s: f64,
    },
    /// Its port is lost.
    Lost {
        /// Age of the last reading, seconds; none when there was none.
        age_s: Option<f64>,
    },
}

/// A live value of one instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct Dial {
    /// What it is.
    pub kind: DialKind,
    /// The instrument's name.
    pub instrument: String,
    /// The last value, in the unit of its kind; none before the first.
    pub value: Option<f64>,
    /// What its last digit counts, in the same unit; none where the papers do not say.
    pub resolution: Option<f64>,
    /// What the value is meant at: "gauge", "absolute", "STPD", "at 20 °C, 101.325 kPa"; may be empty.
    pub meant: String,
    /// How fast it moves, in the unit of its kind a minute; none when that is not known.
    pub rate_per_min: Option<f64>,
    /// How it stands.
    pub state: DialState,
    /// Readings a second; none before there are two.
    pub per_s: Option<f64>,
    /// Faults so far.
    pub faults: u64,
    /// The last fault or the reason of a loss, as the instrument's sentence; text from outside, tamed when shown.
    pub trouble: Option<String>,
}

/// What is safely in the book.
#[derive(Debug, Clone, PartialEq)]
pub enum Saved {
    /// Everything.
    All,
    /// Not everything.
    Not {
        /// Readings, or rows of a session, that are not.
        readings: usize,
        /// For so many seconds.
        for_s: f64,
        /// Why, in a sentence without its full stop; none while it is only on its way.
        why: Option<String>,
    },
}

/// Who logs.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Hold {
    /// This process.
    Ours,
    /// Another one: this one only watches. The text says which ("process 4711"), as known.
    Watched(String),
}

impl Dial {
    /// Whether the value is of now: neither missing, stale, frozen nor lost.
    #[must_use]
    pub const fn is_alive(&self) -> bool {
        matches!(self.state, DialState::Read | DialState::Steady | DialState::Moving)
    }
}

impl Dial {
    /// The last value as a number in the unit shown, with as many decimals whatever it is; none before the first.
    #[must_use]
    pub fn number(&self, units: &Units) -> Option<String> {
        Some(self.kind.number(self.value?, self.resolution, units))
    }

    /// The last value with its unit; dashes before the first, or when it is not of now.
    #[must_use]
    pub fn value_words(&self, units: &Units) -> String {
        let number = self.number(units).filter(|_| self.is_alive());
        format!("{} {}", number.as_deref().unwrap_or("--"), self.kind.symbol(units))
    }

    /// How it stands, in words.
    #[must_use]
    pub fn state_words(&self, units: &Units) -> String {
        let last = |age_s: f64| match self.number(units) {
            Some(number) => {
                format!("last {number} {}, {} ago", self.kind.symbol(units), span(age_s))
            }
            None => format!("no reading for {}", span(age_s)),
        };
        match &self.state {
            DialState::Waiting => "NO READING YET".to_owned(),
            DialState::Read => String::new(),
            DialState::Steady => "steady".to_owned(),
            DialState::Moving => self.rate_words(units).unwrap_or_else(|| "moving".to_owned()),
            DialState::Stale { age_s } => format!("STALE: {}", last(*age_s)),
            DialState::Frozen { for_s } => {
                let at = self.number(units).map(|number| format!(" {number} {}", self.kind.symbol(units)));
                format!("FROZEN:{} for {}", at.unwrap_or_default(), span(*for_s))
            }
            DialState::Lost { age_s } => {
                format!("LOST: {}", age_s.map_or_else(|| "no reading".to_owned(), last))
            }
        }
    }

    /// How fast it moves, in words; none when that is not known.
    #[must_use]
    pub fn rate_words(&self, units: &Units) -> Option<String> {
        self.kind.rate_words(self.rate_per_min?, self.value?, units)
    }

    /// The tilt of its level line: 0 while it lies level, up to 3 steps above nought while the value rises, below it
    /// while it falls; none when the value is not of now.
    #[must_use]
    pub fn tilt(&self) -> Option<i8> {
        match self.state {
            DialState::Read | DialState::Moving => {
                Some(self.rate_per_min.zip(self.value).map_or(0, |(rate, value)| self.kind.tilt(rate, value)))
            }
            DialState::Steady => Some(0),
            _ => None,
        }
    }

    /// What is behind the value: readings a second and faults.
    #[must_use]
    pub fn source_words(&self) -> String {
        let mut text = tame(&self.instrument);
        if let Some(per_s) = self.per_s {
            text.push_str(&format!(" {}/s", figures(per_s, 2)));
        }
        if self.faults > 0 {
            text.push_str(&format!(", {}", counted(self.faults, "fault")));
        }
        text
    }
}

impl DialKind {
    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Pressure => "IP",
            Self::Flow => "flow",
            Self::Temperature => "gas",
            Self::Barometer => "barometer",
            Self::Po2 => "PO2",
            Self::Depth => "depth",
        }
    }

    /// The symbol of the unit it is shown in. PO2 is in bar and the barometer in hPa whatever was asked for, as everywhere.
    #[must_use]
    pub fn symbol(self, units: &Units) -> &'static str {
        match self {
            Self::Pressure => units.pressure_symbol(),
            Self::Flow => units.flow_symbol(),
            Self::Temperature => units.temperature_symbol(),
            Self::Barometer => "hPa",
            Self::Po2 => "bar",
            Self::Depth => units.unit(Kind::Length).symbol,
        }
    }

    /// A value as a number in the unit shown; `resolution` is what its last digit counts, in the unit of its kind.
    #[must_use]
    pub fn number(self, value: f64, resolution: Option<f64>, units: &Units) -> String {
        let step = self.shown_step(resolution.unwrap_or_else(|| self.usual_step()), units);
        let decimals =
            if step.is_finite() && step > 0.0 { -libm::floor(libm::log10(step * 1.001)) } else { 3.0 };
        fixed(self.shown(value, units), decimals.clamp(0.0, 5.0) as i32)
    }

    /// How fast a value moves, in words; none when that is no number.
    #[must_use]
    pub fn rate_words(self, per_min: f64, value: f64, units: &Units) -> Option<String> {
        let direction = if per_min > 0.0 { "rising" } else { "falling" };
        let size = per_min.abs();
        let much = match self {
            Self::Flow => {
                let share = size / value.abs();
                if !share.is_finite() {
                    return None;
                }
                (share * 100.0 >= 0.005).then(|| format!("{} % a minute", fixed(share * 100.0, 2)))?
            }
            Self::Pressure => {
                let symbol = units.pressure_symbol();
                let shown = self.shown_step(size, units);
                let decimals = if self.shown_step(0.01, units) < 0.05 { 2 } else { 1 };
                format!("{} {symbol}/min", fixed(shown, decimals))
            }
            Self::Po2 => format!("{} bar/min", fixed(size, 3)),
            Self::Depth => {
                format!("{} {}/min", fixed(self.shown_step(size, units), 1), self.symbol(units))
            }
            Self::Temperature | Self::Barometer => return None,
        };
        let nothing = much.bytes().take_while(|b| !b.is_ascii_whitespace()).all(|b| matches!(b, b'0' | b'.'));
        (size.is_finite() && !nothing).then(|| format!("{direction} {much}"))
    }

    /// The tilt of the level line for a rate a minute; see [`Dial::tilt`].
    #[must_use]
    pub fn tilt(self, per_min: f64, value: f64) -> i8 {
        // Steps by eye (common practice, no source): what hardly shows, what a hand corrects, what is a step.
        let (size, steps) = match self {
            Self::Po2 => (per_min.abs(), [0.002, 0.03, 0.1]),
            Self::Depth => (per_min.abs(), [0.1, 1.0, 5.0]),
            _ => (per_min.abs() / value.abs().max(1e-6), [0.0005, 0.01, 0.05]),
        };
        let tilt = steps.iter().filter(|step| size >= **step).count() as i8;
        if per_min < 0.0 { -tilt } else { tilt }
    }

    fn shown(self, value: f64, units: &Units) -> f64 {
        match self {
            Self::Temperature => units.temperature(value),
            _ => self.shown_step(value, units),
        }
    }

    /// A difference of two values in the unit shown.
    fn shown_step(self, step: f64, units: &Units) -> f64 {
        match self {
            Self::Pressure => units.pressure(step),
            Self::Flow => units.flow(step),
            Self::Temperature => units.temperature(step) - units.temperature(0.0),
            Self::Barometer => step * 1000.0,
            Self::Po2 => step,
            Self::Depth => step / units.unit(Kind::Length).factor,
        }
    }

    /// What the last digit counts where no papers say (common practice, no source).
    const fn usual_step(self) -> f64 {
        match self {
            Self::Pressure | Self::Po2 => 0.01,
            Self::Flow | Self::Barometer => 1e-4,
            Self::Temperature | Self::Depth => 0.1,
        }
    }
}

impl Saved {
    /// In words; `thing` is what is saved: "reading", "row".
    #[must_use]
    pub fn words(&self, thing: &str) -> String {
        match self {
            Self::All => "all saved".to_owned(),
            Self::Not { readings, for_s, why } => {
                let why = why.as_ref().map(|why| format!(": {}", tame(why))).unwrap_or_default();
                let count = counted(u64::try_from(*readings).unwrap_or(u64::MAX), thing);
                format!("NOT SAVED for {}, {count}{why}", span(*for_s))
            }
        }
    }
}

impl Hold {
    /// That this process only watches; none when it logs.
    #[must_use]
    pub fn words(&self) -> Option<String> {
        match self {
            Self::Ours => None,
            Self::Watched(by) => Some(format!("only watched here: {} logs it", tame(by))),
        }
    }
}
