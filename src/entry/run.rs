//! A bench run as it was recorded.

use chrono::{DateTime, FixedOffset};

use super::{Acceptance, Id, Meter, Transducer};
use crate::gas::Species;
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, Span, Temperature,
    TemperatureDifference, Uncertain, Volume,
};

/// One orifice, one gas, one afternoon: readings and what is known about them.
#[derive(Debug, Clone, PartialEq)]
pub struct Run {
    /// The orifice under test.
    pub orifice: Id,
    /// How its hole is built, where that is known.
    pub build: Build,
    /// The gas upstream.
    pub gas: Species,
    /// Oxygen in that gas, when it is oxygen.
    pub purity: Option<Purity>,
    /// Why the run was made.
    pub purpose: Purpose,
    /// When it was begun, with the offset as given.
    pub taken: DateTime<FixedOffset>,
    /// Who took it.
    pub technician: Option<String>,
    /// What was read.
    pub readings: Readings,
    /// What stood around it.
    pub conditions: Conditions,
    /// Checks of zero and leak before the first point.
    pub before: ZeroAndLeak,
    /// Checks of zero and leak after the last point.
    pub after: ZeroAndLeak,
    /// The flow meter.
    pub meter: Meter,
    /// The pressure transducer.
    pub transducer: Transducer,
    /// What it is judged by, if anything.
    pub acceptance: Option<Acceptance>,
    /// Points a person has left out of the line.
    pub left_out: Vec<LeftOut>,
}

/// How the hole is built; it bounds the choke ratio beforehand.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum Build {
    /// A sharp hole in a plate much thinner than the hole is wide.
    ThinPlate,
    /// A hole about as long as wide, or longer.
    ShortTube,
    /// A rounded entry.
    Nozzle,
    /// Nobody has said.
    #[default]
    Unknown,
}

impl Build {
    /// The words for it in files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::ThinPlate => "thin plate",
            Self::ShortTube => "short tube",
            Self::Nozzle => "nozzle",
            Self::Unknown => "unknown",
        }
    }
}

/// The share of oxygen in the oxygen, with its expanded uncertainty (k = 2).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Purity {
    /// Share of oxygen, 0 to 1.
    pub fraction: f64,
    /// Expanded uncertainty of the share, k = 2.
    pub expanded: f64,
}

/// Why a run was made.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Purpose {
    /// A new orifice, or one after repair.
    Acceptance,
    /// As it came in, before cleaning or adjustment.
    AsFound,
    /// As it goes out, after cleaning or adjustment.
    AsLeft,
    /// A look in between.
    Check,
}

impl Purpose {
    /// The word for it in files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Acceptance => "acceptance",
            Self::AsFound => "as-found",
            Self::AsLeft => "as-left",
            Self::Check => "check",
        }
    }
}

/// Direction in which the pressure was stepped.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sweep {
    /// Upward.
    Rising,
    /// Downward.
    Falling,
}

/// A pressure as the transducer shows it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Indication {
    /// Over ambient.
    Gauge(GaugePressure),
    /// Over vacuum.
    Absolute(AbsolutePressure),
}

impl Indication {
    /// The number the transducer shows, in pascals, whatever its zero.
    #[must_use]
    pub const fn shown_pa(self) -> f64 {
        match self {
            Self::Gauge(p) => p.as_pa(),
            Self::Absolute(p) => p.as_pa(),
        }
    }
}

/// One steady point, as read.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PointReading {
    /// The transducer's indication.
    pub pressure: Indication,
    /// The flow meter's indication (for a timed meter: volume over duration).
    pub flow: IndicatedFlow,
    /// What a timed meter was read as, where volume and duration were recorded.
    pub timed: Option<TimedVolume>,
    /// Standard uncertainty of the mean of the indicated pressure from its own scatter, when it is a mean.
    pub pressure_scatter: Option<PressureDifference>,
    /// Standard uncertainty of the mean of the indicated flow from its own scatter, when it is a mean.
    pub flow_scatter: Option<IndicatedFlow>,
    /// Independent readings that were averaged into it; 1 for a single reading.
    pub averaged: f64,
    /// Gas temperature at the orifice.
    pub temperature: Option<Temperature>,
    /// Barometer.
    pub barometer: Option<AbsolutePressure>,
    /// Gas temperature in the meter.
    pub meter_temperature: Option<Temperature>,
    /// Absolute pressure in the meter.
    pub meter_pressure: Option<AbsolutePressure>,
    /// Direction of the sweep.
    pub sweep: Option<Sweep>,
    /// Seconds since the first reading of the run.
    pub time_s: Option<f64>,
}

/// A volume and the time it took.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TimedVolume {
    /// The volume that passed.
    pub volume: Volume,
    /// How long it took, above zero.
    pub duration: Span,
}

/// What was read.
#[derive(Debug, Clone, PartialEq)]
pub enum Readings {
    /// Steady points, in the order they were taken.
    Points(Vec<PointReading>),
    /// A time series, in which steady spans become points.
    Series(SeriesReadings),
}

/// A time series of readings, a column each; all present columns are equally long. A missing reading is NaN.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SeriesReadings {
    /// Seconds since the first row.
    pub time_s: Vec<f64>,
    /// Indicated pressure in pascals.
    pub pressure_pa: Vec<f64>,
    /// Whether `pressure_pa` is over vacuum; else it is over ambient.
    pub pressure_is_absolute: bool,
    /// Indicated flow in litres per minute.
    pub flow_l_min: Vec<f64>,
    /// Gas temperature at the orifice in kelvins.
    pub temperature_k: Option<Vec<f64>>,
    /// Barometer in pascals.
    pub barometer_pa: Option<Vec<f64>>,
    /// Gas temperature in the meter in kelvins.
    pub meter_temperature_k: Option<Vec<f64>>,
    /// Absolute pressure in the meter in pascals.
    pub meter_pressure_pa: Option<Vec<f64>>,
}

/// A quantity that influences the result: its value where no column gives it, and its expanded uncertainty (k = 2).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Influence<T, D> {
    /// The value that holds for the whole run, when no column gives it point by point.
    pub value: Option<T>,
    /// Expanded uncertainty, k = 2; none stated means the default with a warning.
    pub expanded: Option<D>,
}

impl<T, D> Default for Influence<T, D> {
    fn default() -> Self {
        Self { value: None, expanded: None }
    }
}

/// What stood around a run.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Conditions {
    /// Gas temperature at the orifice.
    pub temperature: Influence<Temperature, TemperatureDifference>,
    /// Barometer.
    pub barometer: Influence<AbsolutePressure, PressureDifference>,
    /// Pressure of the meter's inlet over the barometer; it is also downstream of the orifice.
    pub back_pressure: Influence<PressureDifference, PressureDifference>,
    /// Relative humidity of the gas in a volumetric meter, 0 to 1.
    pub humidity: Influence<f64, f64>,
    /// Gas temperature in the meter, where it differs from the orifice's.
    pub meter_temperature: Influence<Temperature, TemperatureDifference>,
    /// Absolute pressure in the meter, where it is not barometer plus back pressure.
    pub meter_pressure: Influence<AbsolutePressure, PressureDifference>,
    /// Water temperature of a wet meter.
    pub water_temperature: Influence<Temperature, TemperatureDifference>,
}

/// Zero reading at no flow, and fall of pressure with the outlet blanked.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct ZeroAndLeak {
    /// What the flow meter shows with no flow.
    pub zero: Option<IndicatedFlow>,
    /// Fall of the upstream pressure with the outlet blanked, in pascals per second.
    pub leak_pa_s: Option<f64>,
}

/// A point a person has left out of the line, and why.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct LeftOut {
    /// Number of the point, counted from 1.
    pub point: usize,
    /// The reason given.
    pub why: String,
}

/// An expanded uncertainty of a value, as [`Uncertain`] carries it, split for an influence.
impl<T, D> From<Uncertain<T, D>> for Influence<T, D> {
    fn from(given: Uncertain<T, D>) -> Self {
        Self { value: Some(given.value), expanded: given.expanded }
    }
}
