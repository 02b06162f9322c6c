//! The questions before the first row of a typed session.
//!
//! Comes in: which question, and what an empty answer means. Goes out: the prompt, its explanation, and the words for
//! what is asked in a refusal.

use super::layout::wrapped;

/// What is asked before the first row.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SessionQuestion {
    /// Where the diver rests.
    Place,
    /// How the loop is kept.
    Loop,
    /// What is added to keep the volume.
    Diluent,
    /// Loop volume, lungs included.
    LoopVolume,
    /// The diver's mass.
    Mass,
    /// What is known of leaks.
    LeakTest,
    /// Whether a nose clip is worn.
    NoseClip,
    /// Barometer at the surface.
    Barometer,
    /// Depth of the counterlung, in a pool.
    Depth,
    /// Temperature of the loop gas.
    LoopTemperature,
    /// Time on the loop before the first reading.
    TimeOnLoop,
    /// Whether the scrubber is warm.
    ScrubberWarm,
    /// Gain of the cells.
    CellGain,
    /// The orifice whose line turns an IP into a flow.
    Orifice,
    /// Posture.
    Posture,
    /// Rested for.
    RestedFor,
    /// Last meal.
    LastMeal,
    /// Last exercise.
    LastExercise,
    /// Caffeine or nicotine.
    CaffeineOrNicotine,
    /// Last dive.
    LastDive,
    /// Temperature of the water, in a pool.
    WaterTemperature,
    /// Suit, in a pool.
    Suit,
    /// When.
    Taken,
}

impl SessionQuestion {
    /// All of them, in the order they are asked.
    pub const ALL: [Self; 23] = [
        Self::Place,
        Self::Loop,
        Self::Diluent,
        Self::LoopVolume,
        Self::Mass,
        Self::LeakTest,
        Self::NoseClip,
        Self::Barometer,
        Self::Depth,
        Self::LoopTemperature,
        Self::TimeOnLoop,
        Self::ScrubberWarm,
        Self::CellGain,
        Self::Orifice,
        Self::Posture,
        Self::RestedFor,
        Self::LastMeal,
        Self::LastExercise,
        Self::CaffeineOrNicotine,
        Self::LastDive,
        Self::WaterTemperature,
        Self::Suit,
        Self::Taken,
    ];

    /// Those whose common default would be a guess where nobody sees it: from a pipe they are waited for.
    pub const NEEDED: [Self; 2] = [Self::Place, Self::Loop];

    /// Whether it is asked in a pool only.
    #[must_use]
    pub const fn of_the_pool(self) -> bool {
        matches!(self, Self::Depth | Self::WaterTemperature | Self::Suit)
    }

    /// Whether the answer is about one person, or one day of theirs.
    #[must_use]
    pub const fn of_the_diver(self) -> bool {
        matches!(
            self,
            Self::LoopVolume
                | Self::Mass
                | Self::Posture
                | Self::RestedFor
                | Self::LastMeal
                | Self::LastExercise
                | Self::CaffeineOrNicotine
                | Self::LastDive
        )
    }

    /// Whether the answer is what the session is, and stays once it began.
    #[must_use]
    pub const fn stays(self) -> bool {
        matches!(self, Self::Place | Self::Loop | Self::Taken)
    }

    /// The word that may stand before an answer and restates it on the way; also that of the option, where there is one.
    #[must_use]
    pub const fn word(self) -> &'static str {
        match self {
            Self::Place => "place",
            Self::Loop => "loop",
            Self::Diluent => "diluent",
            Self::LoopVolume => "loop-volume",
            Self::Mass => "mass",
            Self::LeakTest => "leak-test",
            Self::NoseClip => "nose-clip",
            Self::Barometer => "barometer",
            Self::Depth => "depth",
            Self::LoopTemperature => "loop-temperature",
            Self::TimeOnLoop => "time-on-loop",
            Self::ScrubberWarm => "scrubber-warm",
            Self::CellGain => "gain",
            Self::Orifice => "orifice",
            Self::Posture => "posture",
            Self::RestedFor => "rested-for",
            Self::LastMeal => "last-meal",
            Self::LastExercise => "last-exercise",
            Self::CaffeineOrNicotine => "caffeine-or-nicotine",
            Self::LastDive => "last-dive",
            Self::WaterTemperature => "water-temperature",
            Self::Suit => "suit",
            Self::Taken => "taken",
        }
    }
}

/// A question as it is asked, with what an empty answer means; the answer is typed behind it.
#[must_use]
pub fn question(question: SessionQuestion, default: &str) -> String {
    let asked = match question {
        SessionQuestion::Place => "Place (couch, pool)",
        SessionQuestion::Loop => "Loop (held, sealed, topped)",
        SessionQuestion::Diluent => "Diluent, as in air or oxygen 18 %",
        SessionQuestion::LoopVolume => "Volume of loop and lungs at first reading, as in 7.5 L ± 1 L",
        SessionQuestion::Mass => "Mass of the diver, as in 82 kg",
        SessionQuestion::LeakTest => "Leak test (passed, or the leak as in 0.005 L/min)",
        SessionQuestion::NoseClip => "Nose clip worn (yes, no)",
        SessionQuestion::Barometer => "Barometer with its ±, as in 1016 hPa ± 2 hPa",
        SessionQuestion::Depth => "Depth of the counterlung with its ±, as in 1.2 m ± 0.1 m",
        SessionQuestion::LoopTemperature => "Temperature of the loop gas, as in 33 °C ± 4 °C",
        SessionQuestion::TimeOnLoop => "On the loop before the first reading, as in 10 min",
        SessionQuestion::ScrubberWarm => "Scrubber warm at the first reading (yes, no)",
        SessionQuestion::CellGain => "± of the cells' gain (k = 2), as in 2 %",
        SessionQuestion::Orifice => "Orifice of the book, for an IP in events (name, or none)",
        SessionQuestion::Posture => "Posture, as in lying",
        SessionQuestion::RestedFor => "Rested for, as in 25 min",
        SessionQuestion::LastMeal => "Last meal, so long ago, as in 4.5 h",
        SessionQuestion::LastExercise => "Last exercise, so long ago, as in 14 h",
        SessionQuestion::CaffeineOrNicotine => "Caffeine or nicotine today (yes, no)",
        SessionQuestion::LastDive => "Last dive, so long ago, as in 48 h",
        SessionQuestion::WaterTemperature => "Temperature of the water, as in 33 °C",
        SessionQuestion::Suit => "Suit, as in 5 mm wetsuit, or none",
        SessionQuestion::Taken => "Taken at",
    };
    wrapped("", "  ", &format!("{asked} [{default}]:")).trim_end().to_owned() + " "
}

/// What an answer means, for somebody who typed a question mark.
#[must_use]
pub fn explained(question: SessionQuestion) -> String {
    let text = match question {
        SessionQuestion::Place => {
            "Sitting or lying in the dry, or at rest in shallow water. The two are never pooled, and each has its own \
             floor and ceiling of PO2."
        }
        SessionQuestion::Loop => {
            "held: made up with diluent to the same volume. sealed: nothing goes in but the injection, nothing is let \
             out, and the loop shrinks. topped: PO2 and volume are brought back to where they began, and all oxygen is \
             accounted for."
        }
        SessionQuestion::Diluent => "What is added to keep the volume.",
        SessionQuestion::LoopVolume => {
            "Actual litres of loop and lungs at the first reading, the mean over a breath; behind ± its expanded \
             uncertainty. \"unknown\" where it is not known: then two injections that differ are needed, off and one \
             just below the uptake, ten minutes each."
        }
        SessionQuestion::Mass => "Only to tell whether the result is plausible; nothing is computed with it.",
        SessionQuestion::LeakTest => {
            "Whether the loop held its pressure. Without a passed test a wide allowance is taken."
        }
        SessionQuestion::NoseClip => {
            "Gas that leaves through the nose reads as uptake. Without a clip a wide allowance is taken."
        }
        SessionQuestion::Barometer => {
            "The pressure of the room, or at the surface of the pool, read now, not the one reduced to sea level that \
             weather stations give."
        }
        SessionQuestion::Depth => "Of the counterlung, in fresh water; no deeper than 3 m.",
        SessionQuestion::LoopTemperature => "Where the cells are; the gas is taken as wet with vapour at it.",
        SessionQuestion::TimeOnLoop => {
            "So long the diver was on the loop before the first reading: nitrogen leaves the body meanwhile."
        }
        SessionQuestion::ScrubberWarm => {
            "Vapour of a warming scrubber looks like uptake: unless it is warm the first ten minutes on the loop are left \
             out."
        }
        SessionQuestion::CellGain => "From the calibration of the cells; common to all readings.",
        SessionQuestion::Orifice => {
            "Whose line in the book turns an intermediate pressure into a flow. Events that give flows, or an injection \
             that is off, need none."
        }
        SessionQuestion::Posture | SessionQuestion::Suit => "In your own words; it stays in the record.",
        SessionQuestion::RestedFor
        | SessionQuestion::LastMeal
        | SessionQuestion::LastExercise
        | SessionQuestion::CaffeineOrNicotine
        | SessionQuestion::LastDive
        | SessionQuestion::WaterTemperature => {
            "Whether it is rest: a meal, caffeine, exercise, cold or nerves read high, and high is the dangerous side. \
             Times as in 25 min, 4.5 h or 04:30:00."
        }
        SessionQuestion::Taken => {
            "Date and time of the first reading with offset, as in 2026-11-20T18:05:00+11:00."
        }
    };
    wrapped("  ", "  ", text)
}

/// What is asked for, in a refusal.
#[must_use]
pub const fn asked_for(question: SessionQuestion) -> &'static str {
    match question {
        SessionQuestion::Place => "the place (couch or pool)",
        SessionQuestion::Loop => "how the loop is kept (held, sealed or topped)",
        other => other.word(),
    }
}
