//! The parts of a session's model: what is injected, how the loop is kept, which readings belong together.
//!
//! Plain data, filled by [`super::plan`] and read by [`super::model`]; no formulas.

use std::ops::Range;

use crate::entry::{Cylinder, Injection, LoopKept};

/// An error of each source; what is used is what was stated plus these.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub(super) struct Shift {
    /// Cells' gain, relative.
    pub(super) gain: f64,
    /// Loop temperature, K.
    pub(super) loop_k: f64,
    /// Carbon dioxide, relative.
    pub(super) carbon_dioxide: f64,
    /// Barometer, bar.
    pub(super) barometer: f64,
    /// Depth, bar.
    pub(super) depth: f64,
    /// Drift of depth from first to last reading, bar.
    pub(super) drift: f64,
    /// Leak, L/min.
    pub(super) leak: f64,
    /// Purity of the oxygen.
    pub(super) purity: f64,
    /// Nitrogen at the start, L/min.
    pub(super) washout: f64,
    /// Line: intercept, L/min.
    pub(super) intercept: f64,
    /// Line: slope, L/min per bar.
    pub(super) slope: f64,
    /// Gauge of the intermediate pressure, bar.
    pub(super) ip: f64,
    /// Gas temperature at the orifice, K.
    pub(super) gas_k: f64,
    /// Stated flows, relative.
    pub(super) flow: f64,
    /// Metered amounts, relative.
    pub(super) metered: f64,
    /// Oxygen that left the cylinder, L STPD.
    pub(super) cylinder: f64,
}

/// The injection in force, as numbers.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Rate {
    Off,
    /// Whole gas, L/min STPD.
    Flow(f64),
    /// Intermediate pressure, bar gauge.
    Ip(f64),
}

impl Rate {
    pub(super) fn of(injection: Injection) -> Self {
        match injection {
            Injection::Off => Self::Off,
            Injection::Flow(flow) => Self::Flow(flow.value.as_l_min()),
            Injection::Ip(ip) => Self::Ip(ip.value.as_bar()),
        }
    }
}

/// How the dry gas at the beginning of a stage is known.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Anchor {
    /// It is that of the first reading.
    Start,
    /// The loop is back at the volume it had then.
    Mark,
    /// It follows from the stage before.
    Carried,
    /// It does not follow.
    Unknown,
}

/// An amount that went in or out, litres STPD where it was metered.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Counted {
    pub(super) at_s: f64,
    pub(super) litres: Option<f64>,
}

/// A span in which the loop is kept in one way.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Stage {
    pub(super) kept: LoopKept,
    pub(super) from_s: f64,
    pub(super) to_s: f64,
    pub(super) anchor: Anchor,
    pub(super) oxygen: Vec<Counted>,
    pub(super) diluent: Vec<Counted>,
    pub(super) vented: Vec<Counted>,
    /// Bins at its beginning and end, where the oxygen fraction is read.
    pub(super) window: Range<usize>,
    pub(super) last_window: Range<usize>,
}

impl Stage {
    pub(super) fn new(kept: LoopKept, from_s: f64, anchor: Anchor) -> Self {
        Self {
            kept,
            from_s,
            to_s: from_s,
            anchor,
            oxygen: Vec::new(),
            diluent: Vec::new(),
            vented: Vec::new(),
            window: 0..0,
            last_window: 0..0,
        }
    }
}

/// What went into a topped loop.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct TopUp {
    /// Bins at both ends, and those after the last add has mixed.
    pub(super) begin: Range<usize>,
    pub(super) end: Range<usize>,
    pub(super) after_last: Range<usize>,
    pub(super) last_add_s: f64,
    pub(super) oxygen_l: f64,
    pub(super) diluent_l: f64,
    pub(super) vented_l: f64,
    /// Whether every add was metered.
    pub(super) metered: bool,
    pub(super) cylinder: Option<Cylinder>,
    /// Whether the cylinder's drop stands for the adds.
    pub(super) use_cylinder: bool,
    /// Everything that happened is taken this many times; only to ask what a longer session would be worth.
    pub(super) scale: f64,
}

/// Readings under one injection, in one stage.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Segment {
    pub(super) stage: usize,
    pub(super) kept: LoopKept,
    pub(super) from_s: f64,
    pub(super) to_s: f64,
    pub(super) bins: Range<usize>,
    /// The injection, each with its share of the time.
    pub(super) rates: Vec<(Rate, f64)>,
    pub(super) top_up: Option<TopUp>,
    /// Mean time and sum of squared levers, minutes from the first reading.
    pub(super) middle: f64,
    pub(super) square: f64,
    /// Mean of PO2, bar, and its slope per minute.
    pub(super) po2: (f64, f64),
    /// Washout left, averaged as the slope weighs it.
    pub(super) washout: f64,
    /// From the beginning of the stage to the middle: washout in minutes, inert share in minutes.
    pub(super) washed: f64,
    pub(super) leaked: f64,
    /// Whole gas injected and added meanwhile, litres.
    pub(super) injected: f64,
    /// Dry gas over that at the beginning of the stage, at constant volume; and its relative change per minute.
    pub(super) kappa: f64,
    pub(super) kappa_slope: f64,
    /// Standard uncertainty of the slope from noise and its degrees of freedom, for a segment that was only thought up.
    pub(super) thought_up: Option<(f64, f64)>,
}

impl Segment {
    pub(super) fn new(
        stage: usize,
        kept: LoopKept,
        from_s: f64,
        to_s: f64,
        bins: Range<usize>,
        rates: Vec<(Rate, f64)>,
    ) -> Self {
        Self {
            stage,
            kept,
            from_s,
            to_s,
            bins,
            rates,
            top_up: None,
            middle: 0.0,
            square: 0.0,
            po2: (0.0, 0.0),
            washout: 0.0,
            washed: 0.0,
            leaked: 0.0,
            injected: 0.0,
            kappa: 1.0,
            kappa_slope: 0.0,
            thought_up: None,
        }
    }

    /// Length in minutes.
    pub(super) fn minutes(&self) -> f64 {
        let scale = self.top_up.as_ref().map_or(1.0, |t| t.scale);
        scale * (self.to_s - self.from_s) / 60.0
    }
}

/// How a segment is read.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Made up with diluent to constant volume.
    Held,
    /// More goes in than is used: the loop vents.
    Venting,
    /// Nothing but the injection and oxygen goes in, nothing out.
    Sealed,
    /// PO2 and volume brought back.
    Topped,
}

impl Kind {
    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Held => "held",
            Self::Venting => "venting",
            Self::Sealed => "sealed",
            Self::Topped => "topped",
        }
    }
}

impl From<LoopKept> for Kind {
    fn from(kept: LoopKept) -> Self {
        match kept {
            LoopKept::Held => Self::Held,
            LoopKept::Sealed => Self::Sealed,
            LoopKept::Topped => Self::Topped,
        }
    }
}
