//! The line of an orifice with its uncertainty, random and common parts kept apart.
//!
//! Comes in: raw readings of the points that count, their random uncertainties, the common sources. Goes out: an
//! [`OrificeLine`], which answers flow at a pressure, pressure for a flow, and the crossing, each with its budget.
//! Fit: ISO/TS 28037:2010, clause 7. Common sources never enter the fit's covariance (relative common errors would
//! pull the line low: Peelle's puzzle); instead correction and fit are repeated with each source moved by plus and
//! minus its standard uncertainty, and half the difference is its sensitivity (JCGM 100:2008, clause 5).
//! Left out: correlation between points beyond those sources.

use super::correct::{Correction, Raw, Shift, Source};
use super::sources::CommonSource;
use crate::stats::budget::{Budget, BudgetRow};
use crate::stats::inverse::{Fieller, Inverse, line_inverse};
use crate::stats::line::{CalibrationPoints, Line, LineError, fit, fit_from};

/// Probability of every interval this room states.
pub const COVERAGE_PROBABILITY: f64 = 0.95;

/// What one common source does to the line when it moves by one standard uncertainty.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CommonShift {
    /// Which source.
    pub source: Source,
    /// Change of the intercept, L/min.
    pub intercept: f64,
    /// Change of the slope, L/min per bar.
    pub slope: f64,
}

/// A line `q = α + β·p1` with everything that is uncertain about it; q in L/min STPD for gas of 20 °C, p1 in bar
/// absolute.
#[derive(Debug, Clone, PartialEq)]
pub struct OrificeLine {
    /// The fit with its random part, widened where the points scatter more than stated.
    pub random: Line,
    /// Degrees of freedom of the random part; infinite when it was not widened.
    pub random_dof: f64,
    /// What the variances of the random part were multiplied by (Birge's ratio), 1 when not widened.
    pub widened: f64,
    /// The common part.
    pub common: Vec<CommonShift>,
}

/// Which part of a budget a row is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Part {
    /// Scatter of the points.
    Random,
    /// A source common to all points.
    Common(Source),
    /// The ambient pressure that was asked for.
    AmbientAsked,
    /// Turning the line into the one of another gas.
    GasConversion,
}

/// The flow at one pressure.
#[derive(Debug, Clone, PartialEq)]
pub struct FlowAt {
    /// Absolute pressure, bar.
    pub p1_bar: f64,
    /// Flow, L/min STPD, gas of 20 °C.
    pub flow_l_min: f64,
    /// Contributions in L/min, signed for the common ones, with their degrees of freedom.
    pub parts: Vec<(Part, f64, f64)>,
    /// Combined standard uncertainty, L/min.
    pub standard_uncertainty: f64,
    /// Effective degrees of freedom (Welch-Satterthwaite); infinite when no part is limited.
    pub dof: f64,
    /// Coverage factor for 95 %.
    pub coverage_factor: f64,
}

impl FlowAt {
    /// From a value and its parts.
    #[must_use]
    pub fn new(p1_bar: f64, flow_l_min: f64, parts: Vec<(Part, f64, f64)>) -> Self {
        let budget = Budget::new(
            parts.iter().map(|(_, u, dof)| BudgetRow::new(String::new(), 1.0, u.abs(), *dof)).collect(),
        );
        Self {
            p1_bar,
            flow_l_min,
            parts,
            standard_uncertainty: budget.combined_u(),
            dof: budget.effective_dof(),
            coverage_factor: budget.coverage_factor(COVERAGE_PROBABILITY),
        }
    }

    /// Expanded uncertainty for 95 %, L/min.
    #[must_use]
    pub fn expanded(&self) -> f64 {
        self.coverage_factor * self.standard_uncertainty
    }
}

/// The points a line is fitted to.
#[derive(Debug, Clone, PartialEq)]
pub struct LinePoints {
    /// What was read.
    pub raw: Vec<Raw>,
    /// Random standard uncertainty of `p1`, bar.
    pub pressure_u: Vec<f64>,
    /// Random standard uncertainty of the flow, L/min.
    pub flow_u: Vec<f64>,
    /// Whether `flow_u` came from the scatter about the line, so that its degrees of freedom are those of the line.
    pub flow_u_from_scatter: bool,
}

/// Fits the line and works out what each common source does to it.
///
/// # Errors
/// As [`fit`]: fewer than two points, all at one pressure, no uncertainty anywhere, or no convergence.
pub fn fit_orifice_line(
    points: &LinePoints,
    correction: &Correction,
    sources: &[CommonSource],
) -> Result<OrificeLine, LineError> {
    let n = points.raw.len();
    let (mut x, mut y) = (Vec::with_capacity(n), Vec::with_capacity(n));
    corrected_into(points, correction, &Shift::NONE, &mut x, &mut y);
    let nominal = fit(&CalibrationPoints::new(&x, &points.pressure_u, &y, &points.flow_u)?)?;
    let squares = |u: &[f64]| u.iter().map(|u| u * u).collect::<Vec<f64>>();
    let (ux2, uy2) = (squares(&points.pressure_u), squares(&points.flow_u));
    let start = (nominal.intercept, nominal.slope);
    let mut moved = |source, error| {
        x.clear();
        y.clear();
        corrected_into(points, correction, &Shift::of(source, error), &mut x, &mut y);
        fit_from(&x, &ux2, &y, &uy2, start).ok_or(LineError::NotConverged { steps: 0, slope: nominal.slope })
    };
    let mut common = Vec::with_capacity(sources.len());
    for source in sources {
        let up = moved(source.source, source.standard_uncertainty)?;
        let down = moved(source.source, -source.standard_uncertainty)?;
        common.push(CommonShift {
            source: source.source,
            intercept: (up.intercept - down.intercept) / 2.0,
            slope: (up.slope - down.slope) / 2.0,
        });
    }
    let reduced = nominal.reduced_chi_square().unwrap_or(1.0);
    let widen = reduced > 1.0 || points.flow_u_from_scatter;
    let widened = if widen { reduced } else { 1.0 };
    let random_dof = if widen { nominal.dof as f64 } else { f64::INFINITY };
    Ok(OrificeLine { random: nominal.scaled(widened), random_dof, widened, common })
}

/// Corrects all points into `x` (bar absolute) and `y` (L/min), which must be empty.
pub(super) fn corrected_into(
    points: &LinePoints,
    correction: &Correction,
    shift: &Shift,
    x: &mut Vec<f64>,
    y: &mut Vec<f64>,
) {
    for raw in &points.raw {
        let corrected = correction.apply(raw, shift);
        x.push(corrected.p1_bar);
        y.push(corrected.flow_l_min);
    }
}

impl OrificeLine {
    /// The line with random and common parts in its variances and covariance.
    #[must_use]
    pub fn total(&self) -> Line {
        self.common.iter().fold(self.random, |line, c| {
            line.with_added(c.intercept * c.intercept, c.slope * c.slope, c.intercept * c.slope)
        })
    }

    /// Flow at an absolute pressure in bar, with its budget.
    #[must_use]
    pub fn flow_at(&self, p1_bar: f64) -> FlowAt {
        let mut parts = vec![(Part::Random, self.random.u_at(p1_bar), self.random_dof)];
        parts.extend(
            self.common
                .iter()
                .map(|c| (Part::Common(c.source), c.intercept + c.slope * p1_bar, f64::INFINITY)),
        );
        FlowAt::new(p1_bar, self.random.at(p1_bar), parts)
    }

    /// Absolute pressure in bar at which the line passes `flow_l_min`, itself known to `flow_u`, with its 95 % limits;
    /// none for a flat line.
    #[must_use]
    pub fn pressure_for(&self, flow_l_min: f64, flow_u: f64) -> Option<Inverse> {
        let total = self.total();
        let (x, _) = total.inverse(flow_l_min, 0.0)?;
        line_inverse(&total, flow_l_min, flow_u * flow_u, self.flow_at(x).coverage_factor)
    }

    /// Where the line crosses the pressure axis, in bar absolute: the value and its 95 % interval; none for a flat
    /// line, and an interval without ends when the slope is not known to differ from zero.
    #[must_use]
    pub fn crossing(&self) -> Option<(f64, (f64, f64))> {
        let inverse = self.pressure_for(0.0, 0.0)?;
        Some((inverse.x, limits_of(&inverse)))
    }

    /// Whether the line, within its 95 % limits, may cross the pressure axis somewhere from `low` to `high` bar absolute.
    /// A line that is nearly flat has no interval of crossings, and yet may be far from the axis there.
    #[must_use]
    pub fn may_cross_between(&self, low: f64, high: f64) -> bool {
        match self.pressure_for(0.0, 0.0).map(|inverse| inverse.limits) {
            Some(Fieller::Interval { lower, upper }) => lower <= high && upper >= low,
            Some(Fieller::Outside { lower, upper }) => low <= lower || high >= upper,
            Some(Fieller::Unbounded) => true,
            // Flat: one value everywhere, least well known at an end.
            None => [low, high].iter().any(|x| {
                let flow = self.flow_at(*x);
                flow.flow_l_min.abs() <= flow.expanded()
            }),
        }
    }
}

/// The 95 % interval of an inverse, infinite at both ends where there is none.
#[must_use]
pub fn limits_of(inverse: &Inverse) -> (f64, f64) {
    match inverse.limits {
        Fieller::Interval { lower, upper } => (lower, upper),
        Fieller::Outside { .. } | Fieller::Unbounded => (f64::NEG_INFINITY, f64::INFINITY),
    }
}
