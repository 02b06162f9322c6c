//! What the two live screens have in common: a live value with its state, what is saved, who logs.
//!
//! Comes in: numbers in bar, L/min, metres and degrees Celsius, with what is known of them. Goes out: words. The level
//! line beside a value is a number of steps here; how it is drawn is the screen's affair.

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
