//! What to know before trusting a setting.

use chrono::NaiveDate;

/// A warning. Those that concern one orifice stand with it.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// The sentence says: nothing is known of the IP gauge; ±this was taken (2.5 % of its scale). Compare it with the bench
    /// transducer: it is often the largest part.
    GaugeErrorAssumed {
        /// Expanded, bar.
        expanded_bar: f64,
    },
    /// The sentence says: nothing is known of creep and supply pressure; so much upward was taken. Read the highest IP between
    /// a full and a nearly empty cylinder, orifice flowing.
    IpSpreadAssumed {
        /// Upward, bar.
        bar: f64,
    },
    /// The sentence says: nothing is known of how well the IP comes back; ±this was taken.
    IpRepeatAssumed {
        /// Expanded, bar.
        expanded_bar: f64,
    },
    /// The sentence says: the water temperature is not known; overfeed is judged at 4 °C and leanness at 30 °C.
    WaterTemperatureUnknown,
    /// The sentence says: the loop volume is not known, so there is no drift and there are no minutes.
    LoopVolumeUnknown,
    /// The sentence says: nothing is known of the trapped volume, so there is no patency check by the contents gauge.
    TrappedVolumeUnknown,
    /// The sentence says: the uptake per kilogram is unusual; are flow, volume or reference conditions wrong?
    UnusualPerKilogram {
        /// Uptake, mL/(kg·min).
        ml_kg_min: f64,
    },
    /// The sentence says: set by a hardly possible uptake per kilogram, despite it, for the reason given.
    DespitePerKilogram {
        /// Uptake, mL/(kg·min).
        ml_kg_min: f64,
        /// The reason.
        why: String,
    },
    /// The sentence says: nobody has judged this orifice.
    NeverJudged,
    /// The sentence says: the orifice failed, and is used despite that for the reason given.
    DespiteFailed {
        /// The reason.
        why: String,
    },
    /// The sentence says: the orifice is undecided, and is used despite that for the reason given.
    DespiteUndecided {
        /// The reason.
        why: String,
    },
    /// The sentence says: the calibration is overdue, and is used despite that for the reason given.
    DespiteOverdue {
        /// The day it fell due.
        since: NaiveDate,
        /// The reason.
        why: String,
    },
    /// The sentence says: the range of the first stage (or its stated maximum, or the bench span) ends before the richest
    /// allowed setting; a larger hole would come nearer.
    RangeLimits {
        /// Highest IP of the range, bar gauge.
        highest_ip_bar_gauge: f64,
    },
    /// The sentence says: the choke ratio is only bounded; the depths are those of the worst likely one, and points at low IP
    /// would settle it.
    ChokeRatioBounded,
    /// The sentence says: no choke ratio describes the run, so its depths are those of the build alone.
    ChokeModelFails,
    /// The sentence says: at this IP the hole may not be choked even at the surface: its flow is not constant anywhere.
    NotChokedAtSurface,
    /// The sentence says: the maximum depth is deeper than the flow is constant; at it so much of the flow is left at worst.
    DeeperThanConstant {
        /// Depth at which one per cent is lost, m.
        one_percent_at_m: f64,
        /// Share of the surface's injection left at the maximum depth, at the lower end of the choke ratio.
        left: f64,
    },
    /// The sentence says: at the maximum depth the flow stops or runs back.
    StopsAboveMaxDepth {
        /// Depth at which it stops, m.
        stops_at_m: f64,
    },
    /// The sentence says: at depth the pressure goes beyond what the bench measured (by up to 10 %); those rows are flagged.
    BeyondSpanAtDepth {
        /// Pressure at the maximum depth, bar absolute.
        needs_bar_abs: f64,
        /// Highest measured, bar absolute.
        highest_bar_abs: f64,
    },
    /// The sentence says: held to the maximum depth, the setting falls short by so much at the surface, where hypoxia is
    /// nearest: a first stage that does not follow depth is the right one for a constant flow.
    LeanAtSurface {
        /// Shortfall of the leanest injection at the surface, share of the uptake.
        shortfall: f64,
    },
    /// The sentence says: the expected reading lies outside the meter's range.
    MeterOutOfRange,
    /// The sentence says: the meter was made for another gas and its papers give no factor: no reading is foretold.
    MeterWithoutGasFactor,
}
