//! Why a session has no answer, and what to know before trusting one; the sentences stand in `report`.

use super::cells::CellLeftOut;
use crate::entry::LoopKept;

/// What is wrong with the input itself.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum UptakeError {
    /// No session was handed in.
    #[error("no session was given: name at least one")]
    NoSession,
    /// Sessions of more than one diver.
    #[error("the sessions belong to {0} and to {1}: one diver's uptake at a time")]
    SeveralDivers(String, String),
    /// No injection event anywhere.
    #[error("no event says what was injected: write an injection event, and \"off = true\" if nothing was")]
    NoInjection,
    /// An event outside the readings.
    #[error(
        "event {index} at {at_s} s lies outside the readings, which run from {first_s} s to {last_s} s: correct its time"
    )]
    EventOutside {
        /// Number of the event, counted from 1.
        index: usize,
        /// Its time.
        at_s: f64,
        /// First reading.
        first_s: f64,
        /// Last reading.
        last_s: f64,
    },
    /// An exclusion that ends before it begins.
    #[error(
        "event {index} excludes until {until_s} s, which is before it begins at {at_s} s: correct one of them"
    )]
    ExcludeBackwards {
        /// Number of the event, counted from 1.
        index: usize,
        /// Its time.
        at_s: f64,
        /// Its end.
        until_s: f64,
    },
    /// An intermediate pressure and no line.
    #[error(
        "event {index} gives an intermediate pressure, but no orifice's line: give \"line\" or \"orifice\", or a flow"
    )]
    NoLine {
        /// Number of the event, counted from 1.
        index: usize,
    },
    /// Cells in volts without the state they were calibrated at.
    #[error(
        "cells are read in volts, but nothing says at which barometer and temperature they were calibrated"
    )]
    NoCalibration,
    /// No reading has a time and a cell.
    #[error("the readings have no time or no oxygen cell: name their columns")]
    NoReadings,
    /// A diluent, a purity or a condition that cannot be.
    #[error("{what} is {value}, which cannot be: correct it")]
    Impossible {
        /// What.
        what: &'static str,
        /// Its value.
        value: f64,
    },
}

/// Why there is no number. Each sentence must say what was seen and what to do differently next time.
#[derive(Debug, Clone, PartialEq)]
pub enum WhyNot {
    /// Less than the least usable readings (four minutes) are left: rest for longer, or mark fewer stretches.
    TooShort {
        /// Usable seconds.
        usable_s: f64,
        /// Needed seconds.
        needed_s: f64,
    },
    /// No cell is left that reads: say which were left out and why.
    NoUsableCell {
        /// The cells.
        left_out: Vec<CellLeftOut>,
    },
    /// Fewer than two cells agree, so that nobody can say which is right.
    CellsDisagree {
        /// The cells.
        left_out: Vec<CellLeftOut>,
    },
    /// PO2 rises with the injection off: oxygen comes from somewhere nobody wrote down.
    RisingWithInjectionOff {
        /// From, seconds.
        from_s: f64,
        /// To, seconds.
        to_s: f64,
        /// Slope of the oxygen fraction per minute.
        slope_per_min: f64,
    },
    /// A sealed loop so nearly pure in oxygen that its inert gas, the yardstick, is not known.
    NearlyPureOxygen {
        /// Largest oxygen fraction.
        fraction: f64,
    },
    /// Neither the loop volume nor a second injection: slopes alone are no flow. Measure the one or do the other.
    NoVolumeOneInjection,
    /// The stated loop volume is so far above the one found from the injections that one of them is wrong, or an
    /// injection is: their mean would be nobody's, and high. Measure the volume again, or leave it out.
    LoopVolumeContradicts {
        /// Stated, litres.
        stated_l: f64,
        /// Found, litres.
        found_l: f64,
        /// Difference in standard uncertainties.
        apart: f64,
    },
    /// The only stretches left hold a jump that no event explains: mark the event or exclude the stretch.
    UnmarkedJump {
        /// Where, seconds.
        at_s: f64,
    },
    /// After a vent or a diluent add the sealed loop's contents are unknown until it is back at the mark.
    ContentsUnknown,
    /// A topped loop in which gas was let out or added without an amount: not all oxygen is accounted for.
    NotAccounted {
        /// Where, seconds.
        at_s: f64,
    },
    /// The injection in force is not known in the stretches that are left.
    InjectionUnknown,
    /// The readings do not rule out any uptake (Fieller's limits are open): rest longer at injections further apart.
    Unbounded,
    /// The estimate is zero or below, or its interval reaches zero: a flow, a volume or a time must be wrong.
    NotPositive {
        /// What came out, L/min; never to be printed as an uptake.
        came_out: f64,
    },
}

/// Something to know before trusting the result.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// Only one cell: nothing contradicts it if it is wrong.
    OneCellOnly,
    /// No papers of the cells' gain: the default was taken.
    CellGainAssumed {
        /// Expanded, relative.
        expanded: f64,
    },
    /// PO2 passed the calibration point: an ageing cell reads low there.
    AboveCalibration {
        /// Highest PO2, bar.
        po2_bar: f64,
        /// Calibration point, or the barometer when it is not known, bar.
        calibrated_bar: f64,
    },
    /// Rows had no time and were passed over.
    RowsWithoutTime(usize),
    /// Rows were not in order of time and were sorted.
    RowsUnordered(usize),
    /// Times were repeated; their readings were averaged.
    TimesRepeated(usize),
    /// Nothing was read between these seconds; the stretch is split there.
    Gap {
        /// From, seconds.
        from_s: f64,
        /// To, seconds.
        to_s: f64,
    },
    /// No barometer: the standard atmosphere ± 30 hPa was taken.
    BarometerUnknown,
    /// No ± for the barometer: ±2 hPa taken.
    BarometerAssumed,
    /// No loop temperature: 33 ± 4 °C taken.
    LoopTemperatureUnknown,
    /// No ± for the loop temperature: ±1 °C taken.
    LoopTemperatureAssumed,
    /// No depth in a pool: the surface ± 1 m was taken.
    DepthUnknown,
    /// No ± for the depth in a pool: ±0.2 m taken.
    DepthAssumed,
    /// No time on the loop before the first reading: none was taken, with the whole washout and warm-up.
    TimeOnLoopUnknown,
    /// The scrubber may have been cold: so many seconds after the first reading were left out.
    WarmUpLeftOut {
        /// Seconds.
        seconds: f64,
    },
    /// The leak is not known to be small (no passed test, or no nose clip): a wide allowance was taken.
    LeakNotTested,
    /// The loop volume states no ±: the default was taken.
    LoopVolumeAssumed {
        /// Expanded, relative.
        expanded: f64,
    },
    /// Stated loop volume and the one found from two injections do not agree.
    LoopVolumeDisagrees {
        /// Stated, litres.
        stated_l: f64,
        /// Found, litres.
        found_l: f64,
        /// Difference in standard uncertainties.
        apart: f64,
    },
    /// A stated flow has no ±: the default was taken.
    FlowAssumed {
        /// Expanded, relative.
        expanded: f64,
    },
    /// The intermediate pressure was read on a gauge without a ±: the default was taken.
    IpGaugeAssumed {
        /// Expanded, bar.
        expanded_bar: f64,
    },
    /// An added amount has no ±: the default was taken.
    MeteredAssumed {
        /// Expanded, relative.
        expanded: f64,
    },
    /// A sealed loop above the oxygen fraction or before the time that keep nitrogen small: a wide allowance was taken.
    SealedNitrogen {
        /// Largest oxygen fraction.
        fraction: f64,
        /// Time on the loop at the first usable reading, seconds.
        on_loop_s: f64,
    },
    /// Said to be held, but more went in than the diver used: taken as venting. (As held it would read 8 % high.)
    HeldButVents {
        /// From, seconds.
        from_s: f64,
        /// To, seconds.
        to_s: f64,
    },
    /// So near the balance that held and venting cannot be told apart; what they make of it differs little.
    HeldOrVenting {
        /// From, seconds.
        from_s: f64,
        /// To, seconds.
        to_s: f64,
    },
    /// A jump that no event explains; the stretch is left out. Say what it was.
    UnmarkedJump(Proposal),
    /// A stretch was left out.
    StretchLeftOut(StretchLeftOut),
    /// The segments scatter more than stated: the wander was raised to this (relative standard deviation).
    WanderRaised(f64),
    /// Six or more segments scatter less than stated: the wander was lowered to this.
    WanderLowered(f64),
    /// A topped loop's cylinder drop and its metered oxygen differ: a leak upstream, or a wrong reading.
    CylinderDisagrees {
        /// Drop less metered, L/min.
        difference_l_min: f64,
        /// In standard uncertainties.
        apart: f64,
    },
    /// Metered oxygen and the cylinder's drop were both known; the drop was used because it is the better known.
    CylinderUsed,
    /// Something about the rest is unfavourable or was not said.
    Rest(super::rest::RestDoubt),
}

/// A jump found in the readings, proposed as an event.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Proposal {
    /// Where, seconds.
    pub at_s: f64,
    /// Change of PO2, bar.
    pub change_bar: f64,
    /// What it looks like.
    pub looks_like: Jump,
}

/// What an unmarked jump looks like.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Jump {
    /// Up: oxygen was added.
    OxygenAdd,
    /// Down: diluent was added.
    DiluentAdd,
}

/// A stretch of readings that no segment uses.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StretchLeftOut {
    /// From, seconds.
    pub from_s: f64,
    /// To, seconds.
    pub to_s: f64,
    /// How the loop was kept.
    pub kept: LoopKept,
    /// Why.
    pub why: StretchWhy,
}

/// Why a stretch is not used.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum StretchWhy {
    /// Mixing and cell lag after an event.
    DeadTime,
    /// A warming scrubber.
    WarmUp,
    /// Marked to be left out.
    Excluded,
    /// Too short for a slope.
    Short,
    /// Holds a jump that no event explains, at this second.
    UnmarkedJump(f64),
    /// The sealed loop's contents are unknown since a vent or a diluent add.
    ContentsUnknown,
    /// The injection is not known before its first event.
    InjectionUnknown,
    /// Sealed and nearly pure in oxygen: this fraction.
    NearlyPureOxygen(f64),
    /// Topped, and gas went in or out without an amount, at this second.
    NotAccounted(f64),
}
