//! The steady sign: steady, or the reason why not.

use crate::entry::Measures;
use crate::series::MeanOfSpan;

/// What an instrument is for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Role {
    /// Intermediate pressure.
    Pressure,
    /// Flow.
    Flow,
    /// Gas temperature at the orifice, or of the loop.
    Temperature,
    /// Ambient pressure.
    Barometer,
    /// An oxygen cell.
    Cell,
    /// Depth of the counterlung.
    Depth,
}

impl Role {
    /// Of an instrument that measures this.
    #[must_use]
    pub const fn of(measures: Measures) -> Self {
        match measures {
            Measures::Flow => Self::Flow,
            Measures::Pressure => Self::Pressure,
            Measures::Temperature => Self::Temperature,
            Measures::Barometer => Self::Barometer,
            Measures::Cell => Self::Cell,
            Measures::Depth => Self::Depth,
        }
    }
}

impl std::fmt::Display for Role {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(match self {
            Self::Pressure => "pressure",
            Self::Flow => "flow",
            Self::Temperature => "temperature",
            Self::Barometer => "barometer",
            Self::Cell => "cell",
            Self::Depth => "depth",
        })
    }
}

/// A span that is steady up to now.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Steady {
    /// Its first reading, in seconds of the clock.
    pub from_s: f64,
    /// Its last reading, in seconds of the clock.
    pub to_s: f64,
    /// Pressure over it, in pascals gauge as shown.
    pub pressure: MeanOfSpan,
    /// Flow over it, in litres per minute of the meter's scale.
    pub flow: MeanOfSpan,
}

/// Why it is not steady. Rates are signed, rising above nought.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum NotSteady {
    /// Nothing was heard of an instrument yet.
    #[error("no {role} was read yet: check its cable and its profile")]
    NothingHeard {
        /// Which.
        role: Role,
    },
    /// An instrument's last reading is too old, or its port is lost.
    #[error("{role} is stale: its last reading is {age_s:.0} s old")]
    Stale {
        /// Which.
        role: Role,
        /// Age of its last reading, in seconds.
        age_s: f64,
    },
    /// An instrument repeats one value for longer than its noise and its last digit allow.
    #[error("{role} is frozen: it has shown the very same value for {for_s:.0} s")]
    Frozen {
        /// Which.
        role: Role,
        /// For so many seconds.
        for_s: f64,
    },
    /// The pressure is being stepped.
    #[error("pressure {}", towards(*.rate_pa_s))]
    PressureMoves {
        /// Its rate in Pa/s.
        rate_pa_s: f64,
    },
    /// The pressure holds, but drifts.
    #[error("pressure still {}", towards(*.rate_pa_s))]
    PressureDrifts {
        /// Its rate in Pa/s.
        rate_pa_s: f64,
    },
    /// The pressure holds; the flow has not settled to it for long enough.
    #[error("flow settling: steady for {held_s:.0} s of {least_s:.0} s")]
    FlowSettles {
        /// For how long it has settled, in seconds.
        held_s: f64,
        /// For how long it must, in seconds.
        least_s: f64,
    },
    /// The flow drifts more than the pressure explains.
    #[error("flow still {} {:.2} % a minute", if *.share_per_s > 0.0 { "rising" } else { "falling" }, share_per_s.abs() * 6e3)]
    FlowDrifts {
        /// Its rate, as a share of the flow a second.
        share_per_s: f64,
    },
    /// It has held, but not for long enough.
    #[error("steady for {held_s:.0} s of {least_s:.0} s")]
    TooShort {
        /// For how long it has held, in seconds.
        held_s: f64,
        /// For how long it must, in seconds.
        least_s: f64,
    },
    /// It has held for long enough, with too few readings.
    #[error("{readings} readings of {least}: wait for more")]
    TooFewReadings {
        /// Readings of the channel that has fewer.
        readings: usize,
        /// Readings that are needed.
        least: usize,
    },
    /// The mean is not known well enough to say that it does not drift.
    #[error("{role} scatters: its mean is known to {:.2} % only, wait for more readings", share * 100.0)]
    Scatters {
        /// Which.
        role: Role,
        /// Standard uncertainty of its mean, as a share of it.
        share: f64,
    },
    /// There is no pressure before the orifice.
    #[error("no pressure: {pressure_pa:.0} Pa gauge")]
    NoPressure {
        /// The pressure, Pa gauge as shown.
        pressure_pa: f64,
    },
}

/// The direction and the rate of a pressure in words, in bar a minute.
fn towards(rate_pa_s: f64) -> String {
    let direction = if rate_pa_s > 0.0 { "rising" } else { "falling" };
    format!("{direction} {:.2} bar/min", rate_pa_s.abs() * 60.0 / 1e5)
}

/// Why no point was taken on demand.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum Refusal {
    /// It is not steady.
    #[error("no point: {0}")]
    NotSteady(#[from] NotSteady),
    /// The readings went into the last point already.
    #[error("no point: the last one holds these readings; wait {wait_s:.0} s for {least_s:.0} s of new ones")]
    SameReadings {
        /// Seconds to wait, at least.
        wait_s: f64,
        /// What a point needs, in seconds.
        least_s: f64,
    },
}
