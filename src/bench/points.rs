//! The points of a run after correction, and whether each counts for the line.

use super::correct::Raw;
use crate::entry::Sweep;

/// One point: what was read, what it means, and whether the line uses it.
#[derive(Debug, Clone, PartialEq)]
pub struct Point {
    /// Number, counted from 1 in the order of the readings.
    pub index: usize,
    /// What was read.
    pub raw: Raw,
    /// Upstream pressure, bar absolute.
    pub pressure_bar_abs: f64,
    /// Random standard uncertainty of that, bar.
    pub pressure_u: f64,
    /// Downstream pressure, bar absolute.
    pub downstream_bar_abs: f64,
    /// Flow, L/min STPD, gas of 20 °C at the orifice.
    pub flow_l_min: f64,
    /// Random standard uncertainty of that, L/min.
    pub flow_u: f64,
    /// Flow less the line's, L/min.
    pub residual_l_min: f64,
    /// Share of the choked flow expected to be lost at this point's pressure ratio.
    pub expected_loss: f64,
    /// Largest expected loss at which the point still counts as choked: half its random standard uncertainty.
    pub loss_limit: f64,
    /// Why the line does not use it; none when it does.
    pub why_not: Option<WhyNot>,
    /// Direction of the sweep, as recorded.
    pub sweep: Option<Sweep>,
    /// Seconds since the first reading.
    pub time_s: Option<f64>,
}

/// Why a point is shown but not used.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum WhyNot {
    /// It is expected to have lost flow against full choking.
    NotChoked,
    /// A person left it out, for this reason.
    LeftOut(String),
}

impl Point {
    /// Whether the line uses it.
    #[must_use]
    pub const fn used(&self) -> bool {
        self.why_not.is_none()
    }

    /// Random standard uncertainty along the flow axis: both axes together, for a slope in L/min per bar.
    #[must_use]
    pub fn combined_u(&self, slope: f64) -> f64 {
        let through_pressure = slope * self.pressure_u;
        (self.flow_u * self.flow_u + through_pressure * through_pressure).sqrt()
    }
}
