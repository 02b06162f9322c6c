//! A couch or pool session as it was recorded.

use chrono::{DateTime, FixedOffset};

use super::{Diluent, Id, Influence, Purity};
use crate::gas::Water;
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, Mass, PressureDifference, ReferenceConditions, Span, StpdFlow,
    Temperature, TemperatureDifference, Uncertain, Volume,
};

/// One diver resting on their own loop: readings, events, and what is known about them.
#[derive(Debug, Clone, PartialEq)]
pub struct Session {
    /// The diver, by code.
    pub diver: Id,
    /// The diver's mass, for plausibility only.
    pub mass: Option<Mass>,
    /// Where the diver rested.
    pub place: Place,
    /// How the loop is kept from the first reading on.
    pub kept: LoopKept,
    /// What is added to keep the volume.
    pub diluent: Diluent,
    /// Actual litres at the first reading, lungs included; the ± is expanded (k = 2).
    pub loop_volume: Option<Uncertain<Volume>>,
    /// What is known of leaks.
    pub leak_test: LeakTest,
    /// Whether a nose clip was worn; none when nothing was said.
    pub nose_clip: Option<bool>,
    /// Oxygen in what is injected and added; none means the default.
    pub oxygen: Option<Purity>,
    /// When it was begun, with the offset as given.
    pub taken: DateTime<FixedOffset>,
    /// What was read.
    pub readings: SessionReadings,
    /// The line that turns an intermediate pressure into a flow; its data are handed in separately.
    pub line: Option<LineReference>,
    /// What stood around it.
    pub conditions: SessionConditions,
    /// What is known of the cells.
    pub cells: CellPapers,
    /// What says whether it was rest.
    pub rest: Rest,
    /// What is assumed where nothing is stated.
    pub assumptions: Assumptions,
    /// What happened, in the order given.
    pub events: Vec<Event>,
    /// The cylinder weighed by pressure at both ends, for a topped loop.
    pub cylinder: Option<Cylinder>,
}

/// What somebody left out of a session, with the reason.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionLeftOut {
    /// First and last second on the time column; none when the whole session is left out of the diver's uptake.
    pub stretch_s: Option<(f64, f64)>,
    /// Why.
    pub why: String,
    /// By whom, where that was said.
    pub by: Option<String>,
    /// When it was decided.
    pub at: DateTime<FixedOffset>,
}

/// Where the diver rested.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Place {
    /// Sitting or lying in the dry.
    Couch,
    /// At rest in shallow water.
    Pool,
}

impl Place {
    /// The word for it in files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Couch => "couch",
            Self::Pool => "pool",
        }
    }
}

/// How the gas in the loop is kept.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum LoopKept {
    /// Nothing goes in but the injection and stated oxygen, nothing is vented; the loop shrinks.
    Sealed,
    /// Made up with diluent to constant volume.
    Held,
    /// PO2 and volume brought back to where they began, all oxygen accounted for.
    Topped,
}

impl LoopKept {
    /// The word for it in files.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Sealed => "sealed",
            Self::Held => "held",
            Self::Topped => "topped",
        }
    }
}

/// What is known of leaks of loop gas.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum LeakTest {
    /// The loop held its pressure.
    Passed,
    /// A leak was measured; the ± is expanded (k = 2).
    Measured(Uncertain<StpdFlow>),
    /// Nobody has said.
    #[default]
    NotDone,
}

/// Where the injection's line comes from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum LineReference {
    /// A run file, as the session's file names it.
    RunFile(String),
    /// An orifice of the book.
    Orifice(Id),
}

/// What was read, a column each; all columns are equally long. A missing reading is NaN.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SessionReadings {
    /// Seconds since the first row, in the order of the rows.
    pub time_s: Vec<f64>,
    /// The oxygen cells.
    pub cells: Vec<CellReadings>,
    /// Depth of the counterlung in metres.
    pub depth_m: Option<Vec<f64>>,
    /// Temperature of the loop gas in kelvins.
    pub loop_temperature_k: Option<Vec<f64>>,
}

/// The readings of one oxygen cell.
#[derive(Debug, Clone, PartialEq)]
pub struct CellReadings {
    /// The name of its column.
    pub name: String,
    /// What it showed.
    pub signal: CellSignal,
}

/// What an oxygen cell's column holds.
#[derive(Debug, Clone, PartialEq)]
pub enum CellSignal {
    /// Oxygen partial pressure in bar.
    Bar(Vec<f64>),
    /// The cell's voltage with its two-point calibration.
    Volts {
        /// Readings in volts.
        readings: Vec<f64>,
        /// Volts in air at the calibration.
        in_air: f64,
        /// Volts in oxygen at the calibration.
        in_oxygen: f64,
    },
}

/// What stood around a session. Where a quantity has a column, only its ± is taken from here.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionConditions {
    /// Barometer at the surface.
    pub barometer: Influence<AbsolutePressure, PressureDifference>,
    /// Depth of the counterlung.
    pub depth: Influence<Length, Length>,
    /// What the pool is filled with.
    pub water: Water,
    /// Temperature of the loop gas.
    pub loop_temperature: Influence<Temperature, TemperatureDifference>,
    /// Time on the loop before the first reading.
    pub time_on_loop: Option<Span>,
    /// Whether the scrubber was warm at the first reading.
    pub scrubber_warm: Option<bool>,
}

impl Default for SessionConditions {
    fn default() -> Self {
        Self {
            barometer: Influence::default(),
            depth: Influence::default(),
            water: Water::Fresh,
            loop_temperature: Influence::default(),
            time_on_loop: None,
            scrubber_warm: None,
        }
    }
}

/// What is known of the cells, common to all of them.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct CellPapers {
    /// Expanded relative uncertainty of the gain, k = 2.
    pub gain: Option<f64>,
    /// State at which cells read in volts were calibrated.
    pub calibrated_at: Option<CalibratedAt>,
}

/// The state at a two-point calibration in air and oxygen.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CalibratedAt {
    /// Barometer.
    pub barometer: AbsolutePressure,
    /// Temperature of the gas.
    pub temperature: Temperature,
    /// Relative humidity of the air, 0 to 1; the oxygen is dry.
    pub humidity: f64,
    /// Share of oxygen in the oxygen, 0 to 1.
    pub oxygen: f64,
}

/// What says whether it was rest; spans are "ago" at the first reading.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Rest {
    /// Posture, in the diver's words.
    pub posture: Option<String>,
    /// Rested for so long before the first reading.
    pub rested_for: Option<Span>,
    /// Last meal.
    pub last_meal: Option<Span>,
    /// Last exercise.
    pub last_exercise: Option<Span>,
    /// Last dive.
    pub last_dive: Option<Span>,
    /// Caffeine or nicotine today.
    pub caffeine_or_nicotine: Option<bool>,
    /// Temperature of the water, in a pool.
    pub water_temperature: Option<Temperature>,
    /// Suit, in the diver's words; "none" for none.
    pub suit: Option<String>,
}

/// One thing that happened.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Event {
    /// When, in seconds on the time column.
    pub at_s: f64,
    /// What.
    pub what: What,
}

/// What happened.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum What {
    /// The injection is so from then on.
    Injection(Injection),
    /// Oxygen added by hand.
    OxygenAdd(Option<Metered>),
    /// Diluent added beyond what keeps the volume.
    DiluentAdd(Option<Metered>),
    /// Loop gas let out.
    Vent(Option<Metered>),
    /// The loop is kept in another way from then on, or is back at the known volume.
    MakeUp {
        /// How it is kept; none means as before.
        kept: Option<LoopKept>,
        /// Whether it is back at the volume it had at the first reading.
        mark: bool,
    },
    /// Readings are dropped until `until_s`.
    Exclude {
        /// Last second dropped.
        until_s: f64,
    },
    /// The session ends.
    Stop,
}

/// The injection in force.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Injection {
    /// None.
    Off,
    /// A stated flow of the whole gas; the ± is expanded (k = 2).
    Flow(Uncertain<StpdFlow>),
    /// An intermediate pressure through the line; the ± is expanded (k = 2).
    Ip(Uncertain<GaugePressure, PressureDifference>),
}

/// An amount of gas added or let out, as its meter showed it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Metered {
    /// Litres; the ± is expanded (k = 2).
    pub volume: Uncertain<Volume>,
    /// The state these litres are meant at; none means the state of the loop.
    pub reads_at: Option<ReferenceConditions>,
}

/// A cylinder of oxygen whose pressure was read at both ends; every ± is expanded (k = 2).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cylinder {
    /// Water volume.
    pub volume: Uncertain<Volume>,
    /// Contents gauge at the beginning.
    pub from: Uncertain<GaugePressure, PressureDifference>,
    /// Temperature of the gas in it at the beginning.
    pub from_temperature: Uncertain<Temperature, TemperatureDifference>,
    /// Contents gauge at the end.
    pub to: Uncertain<GaugePressure, PressureDifference>,
    /// Temperature of the gas in it at the end.
    pub to_temperature: Uncertain<Temperature, TemperatureDifference>,
    /// What it feeds.
    pub feeds: Feeds,
}

/// What the cylinder feeds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Feeds {
    /// Injection and adds.
    All,
    /// Only the adds.
    Adds,
}

/// Every default of the method that a session may state otherwise.
///
/// Ranges and limits as the method names them; ± are expanded (k = 2).
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Assumptions {
    /// Left out after each event, for mixing and cell lag.
    pub dead_time: Span,
    /// Left out at the start of a cold scrubber, counted from going on the loop.
    pub warm_up: Span,
    /// The lungs' part of the loop volume, 0 to 1.
    pub lung_share: f64,
    /// Partial pressure of carbon dioxide in that part.
    pub lung_carbon_dioxide: PressureDifference,
    /// Nitrogen leaving the body on going on the loop without nitrogen in it, lowest and highest.
    pub washout: (StpdFlow, StpdFlow),
    /// Time constant with which that fades.
    pub washout_time: Span,
    /// Oxygen fraction above which a sealed loop gets a wide allowance for nitrogen.
    pub sealed_fraction: f64,
    /// Time on the loop below which a sealed loop gets that allowance.
    pub sealed_wait: Span,
    /// Relative wander of the uptake itself (one standard deviation).
    pub wander: f64,
    /// The data never lower it below this.
    pub least_wander: f64,
    /// Correlation time of that wander.
    pub wander_time: Span,
    /// Leak of loop gas, lowest and highest; none means by the leak test.
    pub leak: Option<(StpdFlow, StpdFlow)>,
    /// Relative spread of one diver's rest from day to day (one standard deviation).
    pub day_spread: f64,
    /// Degrees of freedom that spread counts for against the data.
    pub day_spread_weight: f64,
    /// A cell further than this from the median is left out.
    pub cell_limit: PressureDifference,
    /// A cell with a larger share of faults is left out, 0 to 1.
    pub cell_faults: f64,
    /// Relative ± of the gain where no papers state it.
    pub cell_gain: f64,
    /// Least relative standard uncertainty of the gain of a cell calibrated by flushing.
    pub flush: f64,
    /// Drift of depth over a pool session without a depth column, to either side.
    pub depth_drift: Length,
    /// ± of the diver's own intermediate-pressure gauge, where the event states none.
    pub ip_gauge: PressureDifference,
    /// Relative ± of a stated flow, where the event states none.
    pub flow: f64,
    /// Relative ± of a metered amount, where the event states none.
    pub metered: f64,
    /// Gas temperature at the orifice, with its ±.
    pub gas_temperature: (Temperature, TemperatureDifference),
    /// Relative ± of the loop volume, where it states none.
    pub loop_volume: f64,
    /// How closely a topped loop is brought back to its volume, actual litres, ±.
    pub mark: Volume,
    /// Readings are averaged over this before a slope is fitted.
    pub average_over: Span,
    /// Fewest usable readings, as a span.
    pub least_usable: Span,
}

impl Assumptions {
    /// What is assumed where a session states nothing. Values of the method, each with its reason in `uptake`; those
    /// marked there as common practice have no source.
    pub const DEFAULT: Self = Self {
        dead_time: Span::from_s(90.0),
        warm_up: Span::from_s(600.0),
        lung_share: 0.4,
        lung_carbon_dioxide: PressureDifference::from_pa(5_300.0),
        washout: (StpdFlow::from_m3_s(0.020 / 60_000.0), StpdFlow::from_m3_s(0.060 / 60_000.0)),
        washout_time: Span::from_s(720.0),
        sealed_fraction: 0.65,
        sealed_wait: Span::from_s(600.0),
        wander: 0.04,
        least_wander: 0.02,
        wander_time: Span::from_s(120.0),
        leak: None,
        day_spread: 0.05,
        day_spread_weight: 8.0,
        cell_limit: PressureDifference::from_pa(5_000.0),
        cell_faults: 0.01,
        cell_gain: 0.02,
        flush: 0.01,
        depth_drift: Length::from_m(0.1),
        ip_gauge: PressureDifference::from_pa(50_000.0),
        flow: 0.02,
        metered: 0.02,
        gas_temperature: (Temperature::from_k(293.15), TemperatureDifference::from_k(5.0)),
        loop_volume: 0.15,
        mark: Volume::from_m3(0.000_2),
        average_over: Span::from_s(5.0),
        least_usable: Span::from_s(240.0),
    };
}

impl Default for Assumptions {
    fn default() -> Self {
        Self::DEFAULT
    }
}
