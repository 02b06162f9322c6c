//! What a person decided about a run, with the figures it was decided on.
//!
//! The figures are stored as they stood, with the revision of the method that made them: lists show these and not
//! figures computed later. The parts of the uncertainty stay apart, because the next run of the orifice is compared
//! without those that both share.

use chrono::{DateTime, FixedOffset};

use super::RunNumber;
use crate::gas::Species;
use crate::quantity::GaugePressure;

/// A verdict on a run, as it stood when it was decided.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum StoredVerdict {
    /// Within the limits, and every check holds.
    Pass,
    /// Outside the limits.
    Fail,
    /// Neither, or a check does not hold.
    Undecided,
    /// There was nothing to judge by.
    None,
}

impl StoredVerdict {
    /// The word for it in files and lists.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::Pass => "pass",
            Self::Fail => "fail",
            Self::Undecided => "undecided",
            Self::None => "none",
        }
    }
}

/// One part of the uncertainty of a stored flow.
#[derive(Debug, Clone, PartialEq)]
pub struct StoredPart {
    /// The source, by its word in budgets.
    pub source: String,
    /// Its contribution in litres per minute; signed for a source common to all points.
    pub u_l_min: f64,
    /// Its degrees of freedom; infinite when not limited.
    pub dof: f64,
}

/// The figures of a run at its nominal pressure, as they stood when it was decided.
#[derive(Debug, Clone, PartialEq)]
pub struct StoredFigures {
    /// Revision of the method that made them.
    pub method_revision: u32,
    /// Gas of the run.
    pub gas: Species,
    /// Nominal intermediate pressure.
    pub ip: GaugePressure,
    /// The same as an absolute pressure at 1.01325 bar ambient, in bar.
    pub p1_bar: f64,
    /// Flow at that pressure, in litres per minute STPD, gas of 20 °C.
    pub flow_l_min: f64,
    /// Its combined standard uncertainty, in litres per minute.
    pub standard_uncertainty_l_min: f64,
    /// Effective degrees of freedom; infinite when not limited.
    pub dof: f64,
    /// Coverage factor for 95 %.
    pub coverage_factor: f64,
    /// The parts of the uncertainty.
    pub parts: Vec<StoredPart>,
    /// Lower and upper limit of the flow in litres per minute, where it was judged by an acceptance.
    pub limits_l_min: Option<(f64, f64)>,
    /// Probability that the flow lies within the limits, 0 to 1.
    pub conformity_probability: Option<f64>,
    /// Names of the checks that did not hold.
    pub failed_checks: Vec<String>,
    /// Points the line was fitted to.
    pub points_used: u32,
    /// Certificate of the flow meter.
    pub meter_certificate: Option<String>,
    /// Certificate of the transducer.
    pub transducer_certificate: Option<String>,
    /// The orifice's accepted run before this one and E_n against it, where there was one.
    pub against: Option<(RunNumber, f64)>,
}

impl StoredFigures {
    /// Expanded uncertainty of the flow at 95 %, in litres per minute.
    #[must_use]
    pub fn expanded_l_min(&self) -> f64 {
        self.coverage_factor * self.standard_uncertainty_l_min
    }
}

/// A run decided upon.
#[derive(Debug, Clone, PartialEq)]
pub struct Decision {
    /// The verdict.
    pub verdict: StoredVerdict,
    /// The figures it rests on.
    pub figures: StoredFigures,
    /// When.
    pub at: DateTime<FixedOffset>,
    /// By whom, where that was said.
    pub by: Option<String>,
    /// A remark.
    pub remark: Option<String>,
}
