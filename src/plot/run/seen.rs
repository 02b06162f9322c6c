//! What is drawn, in the units it is shown in.
//!
//! Comes in: a run, its analysis, the units. Goes out: [`Seen`]: points, window and ranges as plain finite numbers.
//! Equations: none but changes of unit. Left out: pixels.

use super::super::range::{drawable, framed, hull, reaching};
use super::RunPlot;
use crate::bench::convert::gas_ratio;
use crate::bench::{Analysis, Point, WhyNot};
use crate::entry::{Run, Sweep};
use crate::quantity::AbsolutePressure;
use crate::report::Units;
use crate::report::number::value_and_u;

/// Coverage factor of the bars: for the random part of one point, as the papers of instruments state theirs.
pub(super) const BAR_COVERAGE: f64 = 2.0;
/// How far beyond the other points, in spans of theirs, a point left out still widens the range.
const LEFT_OUT_REACH: f64 = 0.6;
/// How far beyond the points, in spans of theirs, the acceptance window still widens the range.
const WINDOW_REACH: f64 = 6.0;
/// Room left between the outermost number and the frame, as a share of the range.
const PADDING: f64 = 0.04;

/// Which sign a point is drawn with.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shape {
    Rising,
    Falling,
    Neither,
}

/// Whether the line uses a point.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Use {
    InTheLine,
    NotChoked,
    LeftOut(String),
}

/// A point, in shown units; bars are half their length.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Mark {
    pub index: usize,
    pub pressure: f64,
    pub pressure_bar: f64,
    pub flow: f64,
    pub flow_bar: f64,
    pub residual: f64,
    pub residual_bar: f64,
    pub shape: Shape,
    pub how: Use,
}

/// What a residual is a number of.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum ResidualUnit {
    /// Per cent of the flow at the nominal pressure.
    Percent,
    /// The unit of flows, where there is no such flow to take shares of.
    Flow,
}

/// The flow at the nominal pressure.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Nominal {
    /// Absolute, where the line is read.
    pub pressure: f64,
    /// Gauge, as asked for.
    pub ip: f64,
    pub flow: f64,
    pub expanded: f64,
    pub coverage_factor: f64,
}

/// What the flow may be, in the gas of the run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Window {
    pub low: f64,
    pub nominal: f64,
    pub high: f64,
    /// Whether the limits are meant for another gas and were converted.
    pub converted: bool,
}

/// All of it.
pub(super) struct Seen {
    pub shown: Shown,
    pub marks: Vec<Mark>,
    pub nominal: Option<Nominal>,
    pub window: Option<Window>,
    /// Lowest and highest pressure of the points of the line; twice nought when there are none.
    pub span: (f64, f64),
    /// Range of the pressure axis.
    pub pressures: (f64, f64),
    /// Range of the flow axis.
    pub flows: (f64, f64),
    /// The residual strip goes from minus this to this.
    pub residual_reach: f64,
}

/// How numbers of `bench` become shown ones.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Shown {
    pub units: Units,
    pub residual: ResidualUnit,
    /// Shown residual in one litre per minute.
    pub residual_per_l_min: f64,
    /// Decimals of flows as they are said: those of the flow at the nominal pressure with its uncertainty.
    pub flow_decimals: i32,
}

impl Seen {
    pub(super) fn new(run: &Run, analysis: &Analysis, options: &RunPlot) -> Self {
        let shown = Shown::new(analysis, options);
        let slope = analysis.line.random.slope;
        let marks: Vec<Mark> = analysis.points.iter().filter_map(|p| mark(p, slope, &shown)).collect();
        let used = || marks.iter().filter(|m| m.how == Use::InTheLine);
        let span = hull(used().map(|m| (m.pressure, 0.0))).unwrap_or((0.0, 0.0));
        let nominal = nominal(analysis, &shown.units);
        let window = window(run, analysis, &shown.units);
        let pressures = {
            let core = hull(
                used().map(|m| (m.pressure, m.pressure_bar)).chain(nominal.iter().map(|n| (n.pressure, 0.0))),
            );
            let others = marks.iter().filter(|m| m.how != Use::InTheLine).map(|m| m.pressure);
            framed(reaching(core.unwrap_or((0.0, 1.0)), others, LEFT_OUT_REACH), PADDING)
        };
        let flows = {
            let core =
                hull(used().map(|m| (m.flow, m.flow_bar)).chain(nominal.iter().map(|n| (n.flow, 0.0))));
            let others = marks.iter().filter(|m| m.how != Use::InTheLine).map(|m| m.flow);
            let core = reaching(core.unwrap_or((0.0, 1.0)), others, LEFT_OUT_REACH);
            let ends = nominal.iter().flat_map(|n| [n.flow - n.expanded, n.flow + n.expanded]);
            let core = reaching(core, ends, WINDOW_REACH);
            framed(reaching(core, window.iter().flat_map(|w| [w.low, w.high]), WINDOW_REACH), PADDING)
        };
        let residual_reach = used().map(|m| m.residual.abs() + m.residual_bar).fold(0.0, f64::max);
        // Residuals that are nothing but rounding are not blown up to the height of the strip.
        let least = shown.least_residual();
        let residual_reach = if residual_reach > 1e-3 * least { 1.08 * residual_reach } else { least };
        Self { shown, marks, nominal, window, span, pressures, flows, residual_reach }
    }

    /// Whether the window is near enough the points to be drawn.
    pub(super) fn window_in_view(&self) -> Option<Window> {
        self.window.filter(|w| w.low >= self.flows.0 && w.high <= self.flows.1)
    }
}

impl Shown {
    fn new(analysis: &Analysis, options: &RunPlot) -> Self {
        let units = options.units;
        let at = &analysis.nominal.flow;
        let (residual, residual_per_l_min) = if at.flow_l_min.is_finite() && at.flow_l_min > 1e-9 {
            (ResidualUnit::Percent, 100.0 / at.flow_l_min)
        } else {
            (ResidualUnit::Flow, units.flow(1.0))
        };
        let (value, _) = value_and_u(units.flow(at.flow_l_min), units.flow(at.expanded()));
        let decimals = value.split_once('.').map_or(0, |(_, decimals)| decimals.len());
        Self { units, residual, residual_per_l_min, flow_decimals: decimals as i32 }
    }

    /// The standard atmosphere: what the gauge axis is below the absolute one.
    pub(super) fn ambient(&self) -> f64 {
        self.units.pressure(AbsolutePressure::STANDARD_ATMOSPHERE.as_bar())
    }

    /// Half the height of a strip whose residuals are all nought.
    fn least_residual(&self) -> f64 {
        match self.residual {
            ResidualUnit::Percent => 0.1,
            ResidualUnit::Flow => self.units.flow(1e-3),
        }
    }
}

fn mark(p: &Point, slope: f64, shown: &Shown) -> Option<Mark> {
    let units = &shown.units;
    let bar = |u: f64| {
        let bar = BAR_COVERAGE * u.abs();
        if bar.is_finite() { bar } else { 0.0 }
    };
    let mark = Mark {
        index: p.index,
        pressure: units.pressure(p.pressure_bar_abs),
        pressure_bar: bar(units.pressure(p.pressure_u)),
        flow: units.flow(p.flow_l_min),
        flow_bar: bar(units.flow(p.flow_u)),
        residual: p.residual_l_min * shown.residual_per_l_min,
        residual_bar: bar(p.combined_u(slope) * shown.residual_per_l_min),
        shape: match p.sweep {
            Some(Sweep::Rising) => Shape::Rising,
            Some(Sweep::Falling) => Shape::Falling,
            None => Shape::Neither,
        },
        how: match &p.why_not {
            None => Use::InTheLine,
            Some(WhyNot::NotChoked) => Use::NotChoked,
            Some(WhyNot::LeftOut(why)) => Use::LeftOut(why.clone()),
        },
    };
    [mark.pressure, mark.flow, mark.residual].iter().all(|x| drawable(*x)).then_some(mark)
}

fn nominal(analysis: &Analysis, units: &Units) -> Option<Nominal> {
    let at = &analysis.nominal;
    let nominal = Nominal {
        pressure: units.pressure(at.flow.p1_bar),
        ip: units.pressure(at.ip.as_bar()),
        flow: units.flow(at.flow.flow_l_min),
        expanded: units.flow(at.flow.expanded()),
        coverage_factor: at.flow.coverage_factor,
    };
    [nominal.pressure, nominal.ip, nominal.flow, nominal.expanded]
        .iter()
        .all(|x| drawable(*x))
        .then_some(nominal)
}

/// The limits, brought to the gas of the run where they are meant for another.
fn window(run: &Run, analysis: &Analysis, units: &Units) -> Option<Window> {
    let acceptance = run.acceptance.as_ref()?;
    let (low, high) = analysis.judgement.as_ref()?.limits_l_min;
    let at = &analysis.nominal.flow;
    let converted = acceptance.gas.is_some_and(|gas| gas != run.gas);
    let ratio = acceptance.gas.map_or(1.0, |gas| gas_ratio(run.gas, gas, at.p1_bar, at.flow_l_min).value);
    let shown = |l_min: f64| units.flow(l_min / ratio);
    let window =
        Window { low: shown(low), nominal: shown(acceptance.flow.as_l_min()), high: shown(high), converted };
    ([window.low, window.nominal, window.high].iter().all(|x| drawable(*x)) && window.low <= window.high)
        .then_some(window)
}
