//! A bench run: from what was read to a line, its checks and a verdict.
//!
//! Comes in: an [`entry::Run`](crate::entry::Run) whose readings are steady points. Goes out: an [`Analysis`].
//! The steps, each a plain function of its own file: [`correct`] (what the meters show → absolute pressure and flow
//! at STPD, gas of 20 °C), `sources` (what each may be off by), [`choke`] (which points are choked), [`mod@line`] (the
//! fit, random and common parts apart), `checks` and `instruments`, `verdict`; on demand [`monte_carlo`] and
//! [`advice`]; [`history`] compares two runs, [`trend`] looks for a slope through many, and [`convert`] turns one gas into
//! another.
//!
//! Reasons to doubt it: the line is straight only as far as the discharge coefficient is constant (its growth with
//! the Reynolds number moves the crossing, not more than 0.1 % of flow within the span); the choke model knows one
//! shape of transition; litres STPD are ideal-gas litres; the common sources are taken as independent.

pub mod advice;
pub mod checks;
pub mod choke;
mod choke_model;
pub mod convert;
pub mod correct;
pub mod history;
pub mod instruments;
pub mod line;
pub mod monte_carlo;
mod points;
mod sources;
pub mod trend;
mod verdict;
mod warning;

pub use points::{Point, WhyNot};
pub use sources::{CommonSource, DEFAULT_BAROMETER_EXPANDED_PA, DEFAULT_TEMPERATURE_EXPANDED_K, Shape};
pub use verdict::{Doubt, Judgement, Verdict};
pub use warning::Warning;

use checks::{Check, CheckKind};
use choke::{ChokePoint, ChokeRatio, CommonEffect};
use convert::gas_ratio;
use correct::{Correction, REFERENCE_TEMPERATURE_K, Raw, Shift, Source};
use history::Accepted;
use line::{FlowAt, LinePoints, OrificeLine, Part, fit_orifice_line, limits_of};

use crate::entry::{Acceptance, Limits, PointReading, Run};
use crate::gas::{self, Species};
use crate::quantity::{
    AbsolutePressure, GaugePressure, PressureDifference, StpdFlow, Temperature, Uncertain,
};
use crate::stats::distribution::chi_squared_upper;
use crate::stats::line::{CalibrationPoints, Line, LineError, fit};

/// Revision of the method: rises when any printed figure could change.
pub const METHOD_REVISION: u32 = 1;
/// Fewest points a line is fitted to.
pub const FEWEST_POINTS: usize = 5;
/// Barometers a bench can stand at: the highest road passes to the lowest shores (common practice, no source).
const PLAUSIBLE_BAROMETER_PA: (f64, f64) = (45_000.0, 112_000.0);
/// Gas temperatures on a bench, −10 to 60 °C, in kelvins (common practice, no source).
const PLAUSIBLE_TEMPERATURE_K: (f64, f64) = (263.15, 333.15);
/// Points within this much pressure of one another are at one pressure, bar.
const ONE_PRESSURE_BAR: f64 = 0.1;

/// What is asked of an analysis beside the run's own acceptance.
#[derive(Debug, Clone, Default)]
pub struct Questions<'a> {
    /// Pressures at which the flow is wanted.
    pub at: Vec<GaugePressure>,
    /// Flows for which the pressure is wanted.
    pub for_flow: Vec<StpdFlow>,
    /// Ambient pressure for those answers, instead of 1.01325 bar; the ± is expanded, k = 2.
    pub ambient: Option<Uncertain<AbsolutePressure, PressureDifference>>,
    /// The orifice's accepted run before this one.
    pub before: Option<&'a Accepted>,
}

/// A run, analysed.
#[derive(Debug, Clone, PartialEq)]
pub struct Analysis {
    /// All points, used or not, in the order of the readings.
    pub points: Vec<Point>,
    /// The line.
    pub line: OrificeLine,
    /// The choke ratio.
    pub choke: ChokeRatio,
    /// The common sources that were off by anything.
    pub sources: Vec<CommonSource>,
    /// The flow at the nominal pressure, at 1.01325 bar ambient: what is judged, and what shares are taken of.
    pub nominal: FlowAtIp,
    /// The nominal pressure first, then each that was asked for; at the ambient pressure asked for.
    pub flow_at: Vec<FlowAtIp>,
    /// The pressure for each flow asked for.
    pub ip_for: Vec<IpFor>,
    /// Sonic conductance of ISO 6358 in dm³/(s·bar) in the gas of the run, and its standard uncertainty.
    /// None where the line does not rise.
    pub sonic_conductance: Option<(f64, f64)>,
    /// Effective diameter in µm (discharge coefficient 1), and its standard uncertainty.
    /// None where the line does not rise.
    pub effective_diameter_um: Option<(f64, f64)>,
    /// The checks.
    pub checks: Vec<Check>,
    /// The judgement, when the run has an acceptance.
    pub judgement: Option<Judgement>,
    /// What to know before trusting it.
    pub warnings: Vec<Warning>,
}

/// The flow at one intermediate pressure.
#[derive(Debug, Clone, PartialEq)]
pub struct FlowAtIp {
    /// Intermediate pressure.
    pub ip: GaugePressure,
    /// Ambient pressure around the gauge.
    pub ambient: AbsolutePressure,
    /// The flow of the run's gas, with its budget.
    pub flow: FlowAt,
    /// The flow of oxygen through the same hole, when the run's gas is another.
    pub as_oxygen: Option<FlowAt>,
}

/// The intermediate pressure that passes one flow.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct IpFor {
    /// The flow asked for, of the run's gas.
    pub flow: StpdFlow,
    /// The pressure, bar gauge; NaN when the line gives none.
    pub ip_bar_gauge: f64,
    /// Its 95 % interval, bar gauge; infinite when the line gives none.
    pub interval_bar_gauge: (f64, f64),
}

/// Why a run cannot be analysed.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum BenchError {
    /// Too few points are left for a line.
    #[error(
        "a line needs {FEWEST_POINTS} usable points and this run has {usable} (of {given} readings {not_choked} are not \
         choked and {left_out} were left out): take more points at higher pressure"
    )]
    TooFewPoints {
        /// Points left.
        usable: usize,
        /// Points given.
        given: usize,
        /// Points not choked.
        not_choked: usize,
        /// Points left out by a person.
        left_out: usize,
    },
    /// All points at one pressure.
    #[error(
        "all usable points lie between {low_bar:.2} and {high_bar:.2} bar absolute, within {ONE_PRESSURE_BAR} bar of one \
         another: step the pressure over the range in which the orifice is used"
    )]
    OnePressure {
        /// Lowest, bar absolute.
        low_bar: f64,
        /// Highest, bar absolute.
        high_bar: f64,
    },
    /// Neither column nor condition gives temperature or barometer.
    #[error("point {0} has no gas temperature or no barometer: give a column or a value in [conditions]")]
    MissingCondition(usize),
    /// A pressure below vacuum.
    #[error(
        "point {0} has an absolute pressure of {1:.3} bar, below vacuum: check gauge and absolute and the unit"
    )]
    BelowVacuum(usize, f64),
    /// A barometer no bench stands at.
    #[error(
        "point {0} has a barometer of {1:.0} hPa; where people work it is {low} to {high} hPa: check its unit",
        low = PLAUSIBLE_BAROMETER_PA.0 / 100.0, high = PLAUSIBLE_BAROMETER_PA.1 / 100.0
    )]
    ImplausibleBarometer(usize, f64),
    /// A temperature no bench has.
    #[error(
        "point {0} has a gas temperature of {1:.0} °C; on a bench it is {low} to {high} °C: check its unit",
        low = PLAUSIBLE_TEMPERATURE_K.0 - 273.15, high = PLAUSIBLE_TEMPERATURE_K.1 - 273.15
    )]
    ImplausibleTemperature(usize, f64),
    /// A pressure asked for that cannot be.
    #[error("{0:.2} bar gauge is below vacuum at this barometer: ask for a higher pressure")]
    AskedBelowVacuum(f64),
    /// An ambient pressure asked for at which nobody works.
    #[error(
        "an ambient pressure of {0:.0} hPa was asked for; where people work it is {low} to {high} hPa: check its unit",
        low = PLAUSIBLE_BAROMETER_PA.0 / 100.0, high = PLAUSIBLE_BAROMETER_PA.1 / 100.0
    )]
    AskedImplausibleAmbient(f64),
    /// The time series had no steady span.
    #[error("the readings are a time series that has not been turned into points")]
    NotPoints,
    /// The fit failed.
    #[error("the line cannot be fitted")]
    Line(#[from] LineError),
}

/// Analyses a run whose steady points are `readings` (those of the run, or what a time series was turned into).
///
/// # Errors
/// Fewer than [`FEWEST_POINTS`] usable points, all at one pressure, a missing temperature or barometer, a pressure
/// below vacuum, or a fit that does not converge.
pub fn analyse(
    run: &Run,
    readings: &[PointReading],
    questions: &Questions<'_>,
) -> Result<Analysis, BenchError> {
    let mut warnings = Vec::new();
    if let Some(ambient) = questions.ambient.filter(|a| !plausible_barometer(a.value.as_pa())) {
        return Err(BenchError::AskedImplausibleAmbient(ambient.value.as_pa() / 100.0));
    }
    let correction = Correction::of(run);
    let sources = sources::common_sources(run, &mut warnings);
    let mut points = corrected_points(run, readings, &correction, &mut warnings)?;
    let choke = known_of_choking(run, &points, &correction, &sources);
    if !choke.model_fits {
        warnings.push(Warning::ChokeModelFails);
    }
    leave_out(&mut points, &choke);
    let line_points = usable(&points, &warnings)?;
    let line = fit_orifice_line(&line_points, &correction, &sources)?;
    for point in &mut points {
        point.residual_l_min = point.flow_l_min - line.random.at(point.pressure_bar_abs);
    }
    let at = Answers { run, line: &line, questions };
    let nominal_ip = run.acceptance.as_ref().map(|a| a.ip);
    let nominal_ip = nominal_ip.or(questions.at.first().copied()).unwrap_or_else(|| middle(&points));
    let nominal = at.flow(nominal_ip, AbsolutePressure::STANDARD_ATMOSPHERE, None)?;
    let asked = if run.acceptance.is_some() || questions.at.is_empty() { Some(nominal_ip) } else { None };
    let flow_at = asked
        .into_iter()
        .chain(questions.at.iter().copied())
        .map(|ip| match questions.ambient {
            Some(ambient) => at.flow(ip, ambient.value, ambient.expanded),
            None if ip == nominal_ip => Ok(nominal.clone()),
            None => at.flow(ip, AbsolutePressure::STANDARD_ATMOSPHERE, None),
        })
        .collect::<Result<Vec<_>, _>>()?;
    let ip_for: Vec<IpFor> = questions.for_flow.iter().map(|flow| at.pressure(*flow)).collect();
    let ambient_bar = questions.ambient.map_or(AbsolutePressure::STANDARD_ATMOSPHERE, |a| a.value).as_bar();
    // What is judged is read at 1.01325 bar, whatever ambient pressure the answers are for.
    let judged_at = run.acceptance.as_ref().filter(|_| questions.ambient.is_some()).map(|_| &nominal);
    let read_at = flow_at.iter().chain(judged_at).map(|at| (at.ip.as_bar(), at.flow.p1_bar));
    let found_at = ip_for.iter().map(|ip| (ip.ip_bar_gauge, ip.ip_bar_gauge + ambient_bar));
    warn_of_extrapolation(&points, read_at.chain(found_at), &mut warnings);
    let limits = run.acceptance.as_ref().map_or(Limits::DEFAULT, |a| a.limits);
    let checks = checks::all_checks(&checks::Checked {
        run,
        points: &points,
        line: &line,
        nominal: &nominal.flow,
        limits: &limits,
        before: questions.before,
    });
    // Every second honest run scatters a little more than stated; only what chance does not explain is a warning.
    let chance = chi_squared_upper(line.random.chi_square, line.random.dof as f64);
    if line.widened > 1.0 && !line_points.flow_u_from_scatter && chance < limits.significance {
        let straight = checks.iter().find(|c| c.kind == CheckKind::Straight);
        let bent = straight.and_then(|c| c.p_value).is_some_and(|p| p < limits.significance);
        warnings.push(Warning::RandomPartWidened { factor: line.widened.sqrt(), bent });
    }
    let judgement =
        run.acceptance.as_ref().map(|a| judge(run, a, &nominal, &checks, span(&points), &mut warnings));
    if run.gas != Species::Oxygen {
        warnings.push(Warning::BenchGasIsNotOxygen);
    }
    Ok(Analysis {
        sonic_conductance: sonic_conductance(&line),
        effective_diameter_um: effective_diameter(run.gas, &line, &points),
        points,
        line,
        choke,
        sources,
        nominal,
        flow_at,
        ip_for,
        checks,
        judgement,
        warnings,
    })
}

/// Corrects all readings and works out their random part.
fn corrected_points(
    run: &Run,
    readings: &[PointReading],
    correction: &Correction,
    warnings: &mut Vec<Warning>,
) -> Result<Vec<Point>, BenchError> {
    let mut points = Vec::with_capacity(readings.len());
    let mut without_u = false;
    for (i, reading) in readings.iter().enumerate() {
        let index = i + 1;
        let raw = Raw::of(reading, run).ok_or(BenchError::MissingCondition(index))?;
        plausible(index, &raw)?;
        let corrected = correction.apply(&raw, &Shift::NONE);
        if corrected.p1_bar <= 0.0 {
            return Err(BenchError::BelowVacuum(index, corrected.p1_bar));
        }
        let (pressure_u, flow_u) = sources::random_part(run, reading, &raw, &corrected);
        without_u |= flow_u.is_none();
        points.push(Point {
            index,
            raw,
            pressure_bar_abs: corrected.p1_bar,
            pressure_u,
            downstream_bar_abs: corrected.p2_bar,
            flow_l_min: corrected.flow_l_min,
            flow_u: flow_u.unwrap_or(0.0),
            residual_l_min: 0.0,
            expected_loss: 0.0,
            loss_limit: 0.0,
            why_not: run.left_out.iter().find(|l| l.point == index).map(|l| WhyNot::LeftOut(l.why.clone())),
            sweep: reading.sweep,
            time_s: reading.time_s,
        });
    }
    let (candidates, given) = (points.iter().filter(|p| p.used()).count(), points.len());
    if candidates < FEWEST_POINTS {
        return Err(BenchError::TooFewPoints {
            usable: candidates,
            given,
            not_choked: 0,
            left_out: given - candidates,
        });
    }
    one_pressure(&points)?;
    if without_u {
        warnings.push(Warning::FlowNoiseFromScatter);
        let scatter = scatter_about_a_line(&points)?;
        points.iter_mut().for_each(|p| p.flow_u = p.flow_u.max(scatter));
    }
    Ok(points)
}

/// A wrong unit in a condition moves every point without leaving a trace in the line, so it is refused.
fn plausible(index: usize, raw: &Raw) -> Result<(), BenchError> {
    if !plausible_barometer(raw.ambient_pa) {
        return Err(BenchError::ImplausibleBarometer(index, raw.ambient_pa / 100.0));
    }
    let (coldest, warmest) = PLAUSIBLE_TEMPERATURE_K;
    if !(coldest..=warmest).contains(&raw.temperature_k) {
        return Err(BenchError::ImplausibleTemperature(index, raw.temperature_k - 273.15));
    }
    Ok(())
}

fn plausible_barometer(pa: f64) -> bool {
    (PLAUSIBLE_BAROMETER_PA.0..=PLAUSIBLE_BAROMETER_PA.1).contains(&pa)
}

/// Residual standard deviation about a line through the points well above choking, L/min.
fn scatter_about_a_line(points: &[Point]) -> Result<f64, LineError> {
    let candidates = || points.iter().filter(|p| p.used());
    let high: Vec<&Point> =
        candidates().filter(|p| p.downstream_bar_abs / p.pressure_bar_abs < 0.4).collect();
    let chosen = if high.len() >= FEWEST_POINTS { high } else { candidates().collect() };
    let x: Vec<f64> = chosen.iter().map(|p| p.pressure_bar_abs).collect();
    let y: Vec<f64> = chosen.iter().map(|p| p.flow_l_min).collect();
    let line = fit(&CalibrationPoints::new(&x, &vec![0.0; x.len()], &y, &vec![1.0; y.len()])?)?;
    let largest = y.iter().fold(0.0_f64, |a, b| a.max(b.abs()));
    // Readings without any scatter at all were rounded or made up; a millionth keeps the weights finite.
    Ok(line.reduced_chi_square().unwrap_or(0.0).sqrt().max(1e-6 * largest))
}

/// What all points that nobody left out say of the choke ratio.
fn known_of_choking(
    run: &Run,
    points: &[Point],
    correction: &Correction,
    sources: &[CommonSource],
) -> ChokeRatio {
    let considered: Vec<&Point> = points.iter().filter(|p| p.used()).collect();
    let at = |shift: &Shift| -> Vec<correct::Corrected> {
        considered.iter().map(|p| correction.apply(&p.raw, shift)).collect()
    };
    let nominal = at(&Shift::NONE);
    // Errors that only scale the flow are part of C, which is free anyway.
    let matters =
        |s: &&CommonSource| !matches!(s.source, Source::MeterGain | Source::GasFactor | Source::FloatLaw);
    let effects: Vec<CommonEffect> = sources
        .iter()
        .filter(matters)
        .map(|s| {
            let moved = at(&Shift::of(s.source, s.standard_uncertainty));
            let change = |of: fn(&correct::Corrected) -> f64| -> Vec<f64> {
                moved.iter().zip(&nominal).map(|(m, n)| of(m) - of(n)).collect()
            };
            CommonEffect {
                p1_bar: change(|c| c.p1_bar),
                p2_bar: change(|c| c.p2_bar),
                flow_l_min: change(|c| c.flow_l_min),
            }
        })
        .collect();
    let choke_points: Vec<ChokePoint> = considered
        .iter()
        .zip(&nominal)
        .map(|(p, corrected)| ChokePoint {
            corrected: *corrected,
            pressure_u: p.pressure_u,
            flow_u: p.flow_u,
        })
        .collect();
    choke::choke_ratio(run.gas, run.build, &choke_points, &effects)
}

/// Leaves out of the line what has lost more flow than half its random standard uncertainty.
fn leave_out(points: &mut [Point], choke: &ChokeRatio) {
    let slope = points.iter().map(|p| p.flow_l_min / p.pressure_bar_abs).fold(0.0, f64::max);
    for point in points.iter_mut() {
        point.expected_loss = choke.expected_loss(point.downstream_bar_abs / point.pressure_bar_abs);
        // As a share of the flow the point would have if it were choked.
        let full = point.flow_l_min.max(0.0) / (1.0 - point.expected_loss).max(0.05);
        point.loss_limit = if full > 0.0 { 0.5 * point.combined_u(slope) / full } else { 0.0 };
        if point.used() && point.expected_loss > point.loss_limit {
            point.why_not = Some(WhyNot::NotChoked);
        }
    }
}

/// The points of the line.
fn usable(points: &[Point], warnings: &[Warning]) -> Result<LinePoints, BenchError> {
    let used: Vec<&Point> = points.iter().filter(|p| p.used()).collect();
    if used.len() < FEWEST_POINTS {
        let left_out = points.iter().filter(|p| matches!(p.why_not, Some(WhyNot::LeftOut(_)))).count();
        return Err(BenchError::TooFewPoints {
            usable: used.len(),
            given: points.len(),
            not_choked: points.len() - used.len() - left_out,
            left_out,
        });
    }
    one_pressure(points)?;
    Ok(LinePoints {
        raw: used.iter().map(|p| p.raw).collect(),
        pressure_u: used.iter().map(|p| p.pressure_u).collect(),
        flow_u: used.iter().map(|p| p.flow_u).collect(),
        flow_u_from_scatter: warnings.contains(&Warning::FlowNoiseFromScatter),
    })
}

fn one_pressure(points: &[Point]) -> Result<(), BenchError> {
    let (low_bar, high_bar) = span(points);
    if high_bar - low_bar < ONE_PRESSURE_BAR {
        Err(BenchError::OnePressure { low_bar, high_bar })
    } else {
        Ok(())
    }
}

/// Lowest and highest pressure of the points in use, bar absolute.
fn span(points: &[Point]) -> (f64, f64) {
    let used = points.iter().filter(|p| p.used()).map(|p| p.pressure_bar_abs);
    used.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), p| (low.min(p), high.max(p)))
}

/// The middle of the points in use, in whole bar gauge.
fn middle(points: &[Point]) -> GaugePressure {
    let (low, high) = span(points);
    let standard = AbsolutePressure::STANDARD_ATMOSPHERE.as_bar();
    GaugePressure::from_bar(((low + high) / 2.0 - standard).round())
}

/// Reads answers off the line.
struct Answers<'a> {
    run: &'a Run,
    line: &'a OrificeLine,
    questions: &'a Questions<'a>,
}

impl Answers<'_> {
    fn flow(
        &self,
        ip: GaugePressure,
        ambient: AbsolutePressure,
        ambient_expanded: Option<PressureDifference>,
    ) -> Result<FlowAtIp, BenchError> {
        let p1_bar = ip.above(ambient).as_bar();
        if p1_bar <= 0.0 {
            return Err(BenchError::AskedBelowVacuum(ip.as_bar()));
        }
        let mut flow = self.line.flow_at(p1_bar);
        if let Some(expanded) = ambient_expanded {
            let u = self.line.random.slope * expanded.as_bar() / 2.0;
            flow.parts.push((Part::AmbientAsked, u, f64::INFINITY));
            flow = FlowAt::new(p1_bar, flow.flow_l_min, flow.parts);
        }
        let as_oxygen =
            (self.run.gas != Species::Oxygen).then(|| of_gas(&flow, self.run.gas, Species::Oxygen));
        Ok(FlowAtIp { ip, ambient, flow, as_oxygen })
    }

    /// Infinite at both ends, and no number between, where the slope is not known to differ from zero.
    fn pressure(&self, flow: StpdFlow) -> IpFor {
        let asked = self.questions.ambient;
        let ambient = asked.map_or(AbsolutePressure::STANDARD_ATMOSPHERE, |a| a.value).as_bar();
        // What the ambient pressure may be off by moves the gauge pressure as much, and the flow by the slope.
        let ambient_u = asked.and_then(|a| a.expanded).map_or(0.0, |expanded| expanded.as_bar() / 2.0);
        let inverse = self.line.pressure_for(flow.as_l_min(), self.line.random.slope * ambient_u);
        let (low, high) = inverse.as_ref().map_or((f64::NEG_INFINITY, f64::INFINITY), limits_of);
        let p1_bar = inverse.filter(|_| low.is_finite()).map_or(f64::NAN, |found| found.x);
        IpFor { flow, ip_bar_gauge: p1_bar - ambient, interval_bar_gauge: (low - ambient, high - ambient) }
    }
}

/// The flow of another gas through the same hole.
#[must_use]
pub fn of_gas(flow: &FlowAt, from: Species, to: Species) -> FlowAt {
    let ratio = gas_ratio(from, to, flow.p1_bar, flow.flow_l_min);
    let mut parts: Vec<(Part, f64, f64)> =
        flow.parts.iter().map(|(p, u, dof)| (*p, u * ratio.value, *dof)).collect();
    parts.push((Part::GasConversion, flow.flow_l_min * ratio.standard_uncertainty, f64::INFINITY));
    FlowAt::new(flow.p1_bar, flow.flow_l_min * ratio.value, parts)
}

fn judge(
    run: &Run,
    acceptance: &Acceptance,
    nominal: &FlowAtIp,
    checks: &[Check],
    span: (f64, f64),
    warnings: &mut Vec<Warning>,
) -> Judgement {
    let stated = acceptance.flow.as_l_min();
    let doubts = [
        (warnings.contains(&Warning::MeterGainUnknown), Doubt::MeterGainUnknown),
        (warnings.contains(&Warning::TransducerPapersUnknown), Doubt::TransducerPapersUnknown),
        (beyond(span, nominal.flow.p1_bar), Doubt::BeyondThePoints),
    ];
    let doubts = doubts.into_iter().filter(|(holds, _)| *holds).map(|(_, doubt)| doubt).collect();
    match acceptance.gas {
        Some(gas) if gas != run.gas => {
            // Judged as the gas the limits are meant for.
            let converted = of_gas(&nominal.flow, run.gas, gas);
            verdict::judge(acceptance, stated, (gas, &converted), checks, doubts)
        }
        None if run.gas != Species::Oxygen => {
            warnings.push(Warning::AcceptanceGasAssumed);
            verdict::judge(acceptance, stated, (run.gas, &nominal.flow), checks, doubts)
        }
        _ => verdict::judge(acceptance, stated, (run.gas, &nominal.flow), checks, doubts),
    }
}

/// Whether a pressure lies beyond the points of the line, bar absolute.
fn beyond((low, high): (f64, f64), at_bar_abs: f64) -> bool {
    at_bar_abs < low - ONE_PRESSURE_BAR || at_bar_abs > high + ONE_PRESSURE_BAR
}

/// `read_at` holds where the line is read, bar gauge and bar absolute.
fn warn_of_extrapolation(
    points: &[Point],
    read_at: impl Iterator<Item = (f64, f64)>,
    warnings: &mut Vec<Warning>,
) {
    let (low, high) = span(points);
    for (ip_bar_gauge, at_bar_abs) in read_at {
        if beyond((low, high), at_bar_abs) {
            warnings.push(Warning::Extrapolated { ip_bar_gauge, span_bar_abs: (low, high), at_bar_abs });
        }
    }
}

fn sonic_conductance(line: &OrificeLine) -> Option<(f64, f64)> {
    let total = rising(line)?;
    Some((gas::sonic_conductance(total.slope), gas::sonic_conductance(total.slope_u)))
}

/// The line with all its uncertainty, where its slope lies above nought by three standard uncertainties; a meter that is
/// stuck says nothing of a hole.
fn rising(line: &OrificeLine) -> Option<Line> {
    let total = line.total();
    (total.slope > 3.0 * total.slope_u).then_some(total)
}

/// From the slope, in the middle of the span: the flow that the slope alone would pass there.
fn effective_diameter(species: Species, line: &OrificeLine, points: &[Point]) -> Option<(f64, f64)> {
    let total = rising(line)?;
    let (low, high) = span(points);
    let p1_bar = (low + high) / 2.0;
    let flow = StpdFlow::from_l_min((total.slope * p1_bar).max(0.0));
    let t1 = Temperature::from_k(REFERENCE_TEMPERATURE_K);
    let um = gas::effective_diameter(species, flow, AbsolutePressure::from_bar(p1_bar), t1).as_um();
    // The diameter goes with the root of the slope.
    Some((um, 0.5 * um * total.slope_u / total.slope))
}
