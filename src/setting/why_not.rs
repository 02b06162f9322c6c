//! Why there is no setting, and what is wrong with a call.

use chrono::NaiveDate;

use super::fitting_diameter::FittingDiameter;

/// Why there is no setting. Each is an answer, not an error of the call.
#[derive(Debug, Clone, PartialEq)]
pub enum WhyNot {
    /// The sentence says: there is no uptake to set by (with the uptake's own reason), measure it first.
    NoUptake,
    /// The sentence says: so many mL/(kg·min) is hardly a resting uptake; are flow, loop volume or reference conditions
    /// wrong? Setting by it needs `--despite` with the reason.
    ImplausiblePerKilogram {
        /// Uptake, mL/(kg·min).
        ml_kg_min: f64,
    },
    /// The sentence says: the orifice failed its acceptance; have it cleaned or replaced, or give `--despite`.
    Failed,
    /// The sentence says: the acceptance could not decide; repeat the run, or give `--despite`.
    Undecided,
    /// The sentence says: the calibration fell due on that day; calibrate, or give `--despite`.
    Overdue {
        /// The day it fell due.
        since: NaiveDate,
    },
    /// The sentence says: the line does not rise with pressure, so no pressure can be found on it.
    LineDoesNotRise,
    /// The sentence says: even the lowest IP the first stage has injects too much (so much at most, where so much is
    /// allowed): the hole is too large; the effective diameter that would fit is so much.
    NothingLowEnough {
        /// Lowest IP of the range on the gauge's division, bar gauge.
        lowest_ip_bar_gauge: f64,
        /// The richest injection there, L/min.
        richest_l_min: f64,
        /// The chance that it exceeds the uptake.
        chance: f64,
        /// What would fit.
        fitting: Option<FittingDiameter>,
    },
    /// The sentence says: even the highest IP the first stage has leaves a shortfall of so much: the hole is too small; the
    /// effective diameter that would fit is so much.
    NothingHighEnough {
        /// Highest IP of the range on the gauge's division, bar gauge.
        highest_ip_bar_gauge: f64,
        /// Shortfall of the leanest injection there, share of the uptake.
        shortfall: f64,
        /// What would fit.
        fitting: Option<FittingDiameter>,
    },
    /// The sentence says: the range holds no division of the gauge.
    NoDivisionInRange {
        /// The range, bar gauge.
        range_bar_gauge: (f64, f64),
        /// The division, bar.
        division_bar: f64,
    },
    /// The sentence says: the setting needs so many bar absolute at the orifice (for a compensated first stage at the
    /// maximum depth), and the bench measured only from here to there; measure the orifice there, or take one of that
    /// effective diameter.
    OutsideSpan {
        /// The IP that would be set, bar gauge.
        ip_bar_gauge: f64,
        /// What it needs at the orifice, bar absolute.
        needs_bar_abs: f64,
        /// What was measured, bar absolute.
        span_bar_abs: (f64, f64),
        /// What would fit in the same range.
        fitting: Option<FittingDiameter>,
    },
    /// The sentence says: to keep the chance, the injection would fall short by so much, and over 25 % is too lean: measure
    /// again (first what dominates), because too lean also kills. An orifice of another diameter helps where one is named.
    ShortfallTooLarge {
        /// The IP, bar gauge.
        ip_bar_gauge: f64,
        /// Shortfall of the leanest injection there, share of the uptake.
        shortfall: f64,
        /// What would fit, at the top of the range, where an error of the gauge matters least.
        fitting: Option<FittingDiameter>,
    },
}

/// What is wrong with a call.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SettingError {
    /// A compensated first stage without a maximum depth.
    #[error(
        "with a depth-compensated first stage the injection grows with depth: give the deepest depth of the dive (--max-depth)"
    )]
    CompensatedWithoutMaxDepth,
    /// A maximum depth that is none.
    #[error("a maximum depth of {0:.1} m cannot be dived: give one from 0 m to 350 m")]
    MaxDepth(f64),
    /// A chance of nothing or of a coin.
    #[error("a chance of {0} % cannot be held: give one above 0 % and below 50 %")]
    Chance(f64),
    /// A shortfall of nothing, or one that is no setting.
    #[error("a least shortfall of {0} % is no setting: give one above 0 % and below 25 %")]
    Shortfall(f64),
    /// A division that is none.
    #[error("a gauge division of {0} bar is none: give one above zero")]
    Division(f64),
    /// A range that is none.
    #[error("an IP range from {0} bar to {1} bar is none: give the lower pressure first, not below zero")]
    IpRange(f64, f64),
    /// Something that cannot be negative.
    #[error("the {what} cannot be {value}: give a number that is not negative")]
    Negative {
        /// What.
        what: &'static str,
        /// Its value, in bar, K or as a share.
        value: f64,
    },
    /// A place nobody dives at.
    #[error("{0:.0} hPa is no pressure where people dive: give a barometer from 450 hPa to 1120 hPa")]
    Place(f64),
    /// No water.
    #[error("water of {0:.1} °C is not dived in: give a temperature from -2 °C to 45 °C")]
    WaterTemperature(f64),
    /// No oxygen.
    #[error("oxygen of {0:.1} % is not pure enough to be called that: give more than 50 % and at most 100 %")]
    Purity(f64),
    /// A diluent without inert gas.
    #[error("a diluent with {0:.1} % of oxygen dilutes nothing: give less than 100 %")]
    Diluent(f64),
    /// PO2 limits out of order.
    #[error("a PO2 from {0} bar down to {1} bar is no fall: give the higher first and both above 0.16 bar")]
    Po2(f64, f64),
    /// Work that is none.
    #[error("an uptake at work of {0} L/min is none: give one above zero")]
    Work(f64),
    /// A loop that is none.
    #[error("a loop of {0} L is none: give a volume above zero")]
    LoopVolume(f64),
    /// Contents out of order.
    #[error("the contents gauge cannot fall from {0} bar to {1} bar: give the higher reading first")]
    Contents(f64, f64),
    /// Nothing to set.
    #[error("a setting needs at least one orifice (--orifice)")]
    NoOrifice,
    /// The IP to judge is not on the line.
    #[error(
        "an IP of {ip_bar_gauge:.2} bar puts {needs_bar_abs:.2} bar absolute on orifice {orifice}, and its bench run holds from \
         {low:.2} to {high:.2} bar: measure it there, or judge another IP",
        low = span_bar_abs.0, high = span_bar_abs.1
    )]
    IpOutsideSpan {
        /// The orifice.
        orifice: String,
        /// The IP, bar gauge.
        ip_bar_gauge: f64,
        /// What it puts on the orifice, bar absolute.
        needs_bar_abs: f64,
        /// What was measured, bar absolute.
        span_bar_abs: (f64, f64),
    },
}
