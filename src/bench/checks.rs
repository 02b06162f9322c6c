//! The checks of a run: each with a value, a limit, a verdict and what it found (the sentences stand in `report`).
//!
//! Comes in: the points, the line, the limits of the acceptance. Goes out: one [`Check`] for each kind, in a fixed
//! order. Shares are of the flow at the nominal pressure. The trends come from ordinary least squares, whose
//! p-values need no stated uncertainty; a check fails only when its value passes the limit *and* chance is an
//! unlikely explanation, else it notes. Left out: anything that needs more than one run but the comparison with the
//! run before.

use super::history::{Accepted, compare};
use super::instruments::{InstrumentFinding, check_instruments};
use super::line::{FlowAt, OrificeLine};
use super::points::{Point, WhyNot};
use crate::entry::{Limits, Purpose, Run, Sweep};
use crate::stats::{lack_of_fit, ordinary, outlier};

/// Repeated points are those within this much pressure, bar (method: IP within 0.1 bar).
const SAME_PRESSURE_BAR: f64 = 0.1;
/// A crossing that comes this near to its limits, in bar, once the barometer is added or taken away, is an atmosphere
/// and no zero error (chosen by the simulated study: honest crossings and those of mistaken runs lie half a bar apart).
const NEAR_THE_LIMITS_BAR: f64 = 0.2;
/// Fewer points than this leave nothing to tell a trend beside a bend by.
const FEWEST_FOR_A_BEND: usize = 8;
/// Fewer points than this leave nothing to tell an outlier by.
const FEWEST_FOR_OUTLIER: usize = 6;

/// Which check.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CheckKind {
    /// Are all points of the line choked?
    Choked,
    /// Is the line straight?
    Straight,
    /// Do rising and falling sweep agree?
    Hysteresis,
    /// Do repeated points agree?
    Repeatable,
    /// Does the flow stay where it is?
    Steady,
    /// Does the line cross the pressure axis where it should?
    ThroughZero,
    /// Does any point lie apart?
    Outlier,
    /// Is it still the orifice it was?
    SameAsBefore,
    /// Are the instruments in date, in range and free of leaks?
    Instruments,
}

/// What a check says.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CheckVerdict {
    /// It holds.
    Pass,
    /// It does not hold.
    Fail,
    /// It could not be decided, or there is something to know.
    Note,
}

/// One check.
#[derive(Debug, Clone, PartialEq)]
pub struct Check {
    /// Which.
    pub kind: CheckKind,
    /// Its value, in the unit of its limit; none where it could not be made.
    pub value: Option<f64>,
    /// Its limit.
    pub limit: Option<f64>,
    /// Probability of such a value by chance, where the check tests one.
    pub p_value: Option<f64>,
    /// What it says.
    pub verdict: CheckVerdict,
    /// What it found.
    pub finding: Finding,
}

/// What a check found.
#[derive(Debug, Clone, PartialEq)]
pub enum Finding {
    /// Nothing to add to value, limit and verdict.
    Plain,
    /// Points that were left out because they are not choked, by number.
    NotChoked(Vec<usize>),
    /// Over the limit, but as likely chance.
    MayBeChance,
    /// Too few points, one sweep only, or no repetition: the check could not be made.
    CannotTell(CannotTell),
    /// Not straight; p-value of the lack of fit against repeated points, where there are any.
    Bent {
        /// Lack-of-fit p-value.
        lack_of_fit_p: Option<f64>,
    },
    /// Where the line crosses, with its 95 % interval, bar absolute.
    Crossing {
        /// 95 % interval, bar.
        interval_bar: (f64, f64),
        /// What it suggests, where it lies outside the limits.
        cause: Option<CrossingCause>,
    },
    /// Points that lie apart, by number.
    Apart(Vec<usize>),
    /// Against the run before.
    Change {
        /// Share of the earlier flow.
        change: f64,
        /// The run before.
        before: String,
    },
    /// What is to say of the instruments.
    Instruments(Vec<InstrumentFinding>),
}

/// Why a check could not be made.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CannotTell {
    /// Too few points.
    TooFewPoints,
    /// Rising and falling are not both there.
    OneSweep,
    /// No pressure was read twice.
    NoRepetition,
    /// Time and pressure ran together.
    TimeRunsWithPressure,
    /// No earlier accepted run is known.
    NoRunBefore,
}

/// What a crossing outside its limits suggests.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CrossingCause {
    /// One atmosphere high, from a column said to be gauge.
    AbsoluteEnteredAsGauge,
    /// One atmosphere low, from a column said to be absolute.
    GaugeEnteredAsAbsolute,
    /// High: the transducer reads high, the meter reads low, or gas is lost before the meter.
    High,
    /// The flow does not rise with the pressure.
    DoesNotRise,
    /// Low: the transducer reads low, the meter reads high, or gas passes beside the hole.
    Low,
}

/// What the checks are made on.
pub(super) struct Checked<'a> {
    pub run: &'a Run,
    pub points: &'a [Point],
    pub line: &'a OrificeLine,
    pub nominal: &'a FlowAt,
    pub limits: &'a Limits,
    pub before: Option<&'a Accepted>,
}

/// All checks, in the order of [`CheckKind`].
pub(super) fn all_checks(c: &Checked<'_>) -> Vec<Check> {
    let used: Vec<&Point> = c.points.iter().filter(|p| p.used()).collect();
    let trends = Trends::new(&used, c.line, c.nominal.flow_l_min);
    vec![
        choked(c, &used),
        straight(c, &trends),
        hysteresis(c, &used, &trends),
        repeatable(c, &trends),
        steady(c, &used, &trends),
        through_zero(c),
        outliers(c, &used, &trends),
        same_as_before(c),
        check_instruments(c.run, &used, c.limits),
    ]
}

fn choked(c: &Checked<'_>, used: &[&Point]) -> Check {
    let left_out: Vec<usize> =
        c.points.iter().filter(|p| matches!(p.why_not, Some(WhyNot::NotChoked))).map(|p| p.index).collect();
    // The point of the line that comes nearest to its own limit.
    let nearest = used
        .iter()
        .map(|p| (p.expected_loss, p.loss_limit))
        .max_by(|a, b| (a.0 / a.1).total_cmp(&(b.0 / b.1)));
    let verdict = if left_out.is_empty() { CheckVerdict::Pass } else { CheckVerdict::Note };
    let finding = if left_out.is_empty() { Finding::Plain } else { Finding::NotChoked(left_out) };
    Check {
        kind: CheckKind::Choked,
        value: nearest.map(|n| n.0),
        limit: nearest.map(|n| n.1),
        p_value: None,
        verdict,
        finding,
    }
}

fn straight(c: &Checked<'_>, trends: &Trends) -> Check {
    // With x from −1 to 1 over the span, q = … + c₂·x² departs from its chord by c₂ at mid-span.
    let quadratic: Vec<f64> = trends.x.iter().map(|x| x * x).collect();
    let limit = c.limits.straight;
    let Some((bend, p)) = trends.coefficient(&quadratic) else {
        return cannot_tell(CheckKind::Straight, limit, CannotTell::TooFewPoints);
    };
    let mut check = judged(CheckKind::Straight, bend, limit, p, c.limits.significance);
    if check.verdict == CheckVerdict::Fail {
        check.finding = Finding::Bent { lack_of_fit_p: trends.lack_of_fit_p() };
    }
    check
}

fn hysteresis(c: &Checked<'_>, used: &[&Point], trends: &Trends) -> Check {
    let sweeps = sweeps(used);
    let rising = sweeps.iter().filter(|s| **s == Some(Sweep::Rising)).count();
    let falling = sweeps.iter().filter(|s| **s == Some(Sweep::Falling)).count();
    let limit = c.limits.hysteresis;
    if rising < 2 || falling < 2 {
        return cannot_tell(CheckKind::Hysteresis, limit, CannotTell::OneSweep);
    }
    // A step of one between the sweeps; a point of neither stands in the middle.
    let step: Vec<f64> = sweeps
        .iter()
        .map(|s| match s {
            Some(Sweep::Rising) => 0.5,
            Some(Sweep::Falling) => -0.5,
            None => 0.0,
        })
        .collect();
    match trends.beside_the_bend(&step) {
        Some((difference, p)) => judged(CheckKind::Hysteresis, difference, limit, p, c.limits.significance),
        None => cannot_tell(CheckKind::Hysteresis, limit, CannotTell::TooFewPoints),
    }
}

fn repeatable(c: &Checked<'_>, trends: &Trends) -> Check {
    let limit = c.limits.repeat;
    let groups = trends.groups.iter().copied().max().map_or(0, |g| g + 1);
    let n = trends.residual.len();
    if groups >= n {
        return cannot_tell(CheckKind::Repeatable, limit, CannotTell::NoRepetition);
    }
    let mut sums = vec![(0.0, 0.0); groups];
    for (group, residual) in trends.groups.iter().zip(&trends.residual) {
        sums[*group].0 += residual;
        sums[*group].1 += 1.0;
    }
    let squares: f64 = trends
        .groups
        .iter()
        .zip(&trends.residual)
        .map(|(group, residual)| {
            let mean = sums[*group].0 / sums[*group].1;
            (residual - mean) * (residual - mean)
        })
        .sum();
    let scatter = (squares / (n - groups) as f64).sqrt();
    let verdict = if scatter > limit { CheckVerdict::Fail } else { CheckVerdict::Pass };
    Check {
        kind: CheckKind::Repeatable,
        value: Some(scatter),
        limit: Some(limit),
        p_value: None,
        verdict,
        finding: Finding::Plain,
    }
}

fn steady(c: &Checked<'_>, used: &[&Point], trends: &Trends) -> Check {
    let limit = c.limits.steady;
    let timed = used.iter().all(|p| p.time_s.is_some());
    let when: Vec<f64> = used.iter().map(|p| p.time_s.filter(|_| timed).unwrap_or(p.index as f64)).collect();
    let (first, last) = span(&when);
    if last <= first {
        return cannot_tell(CheckKind::Steady, limit, CannotTell::TooFewPoints);
    }
    let over_the_run: Vec<f64> = when.iter().map(|t| (t - first) / (last - first) - 0.5).collect();
    if correlation(&over_the_run, &trends.x).abs() > 0.98 {
        return cannot_tell(CheckKind::Steady, limit, CannotTell::TimeRunsWithPressure);
    }
    match trends.beside_the_bend(&over_the_run) {
        Some((drift, p)) => judged(CheckKind::Steady, drift, limit, p, c.limits.significance),
        None => cannot_tell(CheckKind::Steady, limit, CannotTell::TooFewPoints),
    }
}

fn through_zero(c: &Checked<'_>) -> Check {
    let (low, high) = (c.limits.crossing_pa.0 / 1e5, c.limits.crossing_pa.1 / 1e5);
    let wholly_outside = !c.line.may_cross_between(low, high);
    let without_ends = (f64::NEG_INFINITY, f64::INFINITY);
    let (crossing, interval) = match c.line.crossing() {
        // The same flow at every pressure, as of a meter that is stuck, crosses nowhere.
        Some((x, interval)) if wholly_outside && interval.0.is_infinite() => {
            (f64::INFINITY.copysign(x), interval)
        }
        None if wholly_outside => (f64::NEG_INFINITY, without_ends),
        Some(found) => found,
        None => return cannot_tell(CheckKind::ThroughZero, high, CannotTell::TooFewPoints),
    };
    let (absolute, ambient) = c.zero_of_pressure();
    let outside = crossing < low || crossing > high;
    let cause = outside.then(|| {
        let would_fit = |bar: f64| (low - NEAR_THE_LIMITS_BAR..=high + NEAR_THE_LIMITS_BAR).contains(&bar);
        if crossing.is_infinite() {
            CrossingCause::DoesNotRise
        } else if !absolute && would_fit(crossing - ambient) {
            CrossingCause::AbsoluteEnteredAsGauge
        } else if absolute && would_fit(crossing + ambient) {
            CrossingCause::GaugeEnteredAsAbsolute
        } else if crossing > high {
            CrossingCause::High
        } else {
            CrossingCause::Low
        }
    });
    let verdict = match (wholly_outside, outside) {
        (true, _) => CheckVerdict::Fail,
        (false, true) => CheckVerdict::Note,
        (false, false) => CheckVerdict::Pass,
    };
    Check {
        kind: CheckKind::ThroughZero,
        value: Some(crossing * 100.0),
        limit: Some(if crossing < low { low * 100.0 } else { high * 100.0 }),
        p_value: None,
        verdict,
        finding: Finding::Crossing { interval_bar: interval, cause },
    }
}

fn outliers(c: &Checked<'_>, used: &[&Point], trends: &Trends) -> Check {
    let n = used.len();
    let none = |why| Check {
        kind: CheckKind::Outlier,
        value: None,
        limit: None,
        p_value: None,
        verdict: CheckVerdict::Note,
        finding: Finding::CannotTell(why),
    };
    if n < FEWEST_FOR_OUTLIER {
        return none(CannotTell::TooFewPoints);
    }
    let Some(studentised) = trends.studentised() else { return none(CannotTell::TooFewPoints) };
    // Up to a tenth of the points may lie apart, at least one.
    let suspects = (n / 10).clamp(1, 10);
    let Ok(esd) = outlier::generalised_esd(&studentised, suspects, c.limits.significance) else {
        return none(CannotTell::TooFewPoints);
    };
    let mut apart: Vec<usize> = esd.flagged.iter().map(|&i| used[i].index).collect();
    apart.sort_unstable();
    let verdict = if apart.is_empty() { CheckVerdict::Pass } else { CheckVerdict::Note };
    Check {
        kind: CheckKind::Outlier,
        value: esd.steps.first().map(|s| s.statistic),
        limit: esd.steps.first().map(|s| s.critical),
        p_value: None,
        verdict,
        finding: if apart.is_empty() { Finding::Plain } else { Finding::Apart(apart) },
    }
}

fn same_as_before(c: &Checked<'_>) -> Check {
    let limit = c.limits.en;
    let Some(before) = c.before else {
        return cannot_tell(CheckKind::SameAsBefore, limit, CannotTell::NoRunBefore);
    };
    let comparison = compare(
        c.nominal,
        c.run.meter.papers.certificate.as_deref(),
        c.run.transducer.papers.certificate.as_deref(),
        before,
    );
    Check {
        kind: CheckKind::SameAsBefore,
        value: Some(comparison.en),
        limit: Some(limit),
        p_value: None,
        verdict: match (comparison.en.abs() > limit, c.run.purpose) {
            (false, _) => CheckVerdict::Pass,
            // After cleaning or adjustment a change is what the work was for; the run is judged by its flow.
            (true, Purpose::AsLeft) => CheckVerdict::Note,
            (true, _) => CheckVerdict::Fail,
        },
        finding: Finding::Change { change: comparison.change, before: before.name.clone() },
    }
}

impl Checked<'_> {
    /// Whether the pressures were given over vacuum, and the barometer in bar.
    fn zero_of_pressure(&self) -> (bool, f64) {
        self.points.first().map_or((false, 0.0), |p| (p.raw.absolute, p.raw.ambient_pa / 1e5))
    }
}

/// A trend judged by its size and by chance.
fn judged(kind: CheckKind, value: f64, limit: f64, p: f64, significance: f64) -> Check {
    let over = value.abs() > limit;
    let verdict = match (over, p < significance) {
        (true, true) => CheckVerdict::Fail,
        (true, false) => CheckVerdict::Note,
        (false, _) => CheckVerdict::Pass,
    };
    let finding = if verdict == CheckVerdict::Note { Finding::MayBeChance } else { Finding::Plain };
    Check { kind, value: Some(value), limit: Some(limit), p_value: Some(p), verdict, finding }
}

fn cannot_tell(kind: CheckKind, limit: f64, why: CannotTell) -> Check {
    Check {
        kind,
        value: None,
        limit: Some(limit),
        p_value: None,
        verdict: CheckVerdict::Note,
        finding: Finding::CannotTell(why),
    }
}

/// The points of the line prepared for ordinary least squares.
struct Trends {
    /// Pressure, −1 at the lowest point and 1 at the highest.
    x: Vec<f64>,
    /// Flow as a share of the nominal flow.
    y: Vec<f64>,
    /// Residual from the line, as a share of the nominal flow.
    residual: Vec<f64>,
    /// Group of repeated points each belongs to.
    groups: Vec<usize>,
}

impl Trends {
    fn new(used: &[&Point], line: &OrificeLine, nominal_l_min: f64) -> Self {
        let pressure: Vec<f64> = used.iter().map(|p| p.pressure_bar_abs).collect();
        let (low, high) = span(&pressure);
        let half = (high - low) / 2.0;
        Self {
            x: pressure.iter().map(|p| (p - low) / half - 1.0).collect(),
            y: used.iter().map(|p| p.flow_l_min / nominal_l_min).collect(),
            residual: used
                .iter()
                .map(|p| (p.flow_l_min - line.random.at(p.pressure_bar_abs)) / nominal_l_min)
                .collect(),
            groups: repeated(&pressure),
        }
    }

    /// Coefficient and p-value of a further column beside a straight line.
    fn coefficient(&self, column: &[f64]) -> Option<(f64, f64)> {
        let fit = ordinary::fit(&[&self.x, column], &self.y, ordinary::Intercept::Free).ok()?;
        last_of(&fit)
    }

    /// The same beside a line that may bend: where the low points come last, the growth of the discharge coefficient
    /// with the Reynolds number would otherwise be taken for a drift. Few points leave no room for a bend.
    fn beside_the_bend(&self, column: &[f64]) -> Option<(f64, f64)> {
        let square: Vec<f64> = self.x.iter().map(|x| x * x).collect();
        let bent = (self.x.len() >= FEWEST_FOR_A_BEND)
            .then(|| ordinary::fit(&[&self.x, &square, column], &self.y, ordinary::Intercept::Free).ok());
        match bent.flatten() {
            Some(fit) => last_of(&fit),
            None => self.coefficient(column),
        }
    }

    fn studentised(&self) -> Option<Vec<f64>> {
        ordinary::studentised_residuals(&self.x, &self.y).ok()?.into_iter().collect()
    }

    /// p-value of the lack of fit of a straight line against repeated points.
    fn lack_of_fit_p(&self) -> Option<f64> {
        let fit = ordinary::polynomial(&self.x, &self.y, 1).ok()?;
        let fitted: Vec<f64> = self.y.iter().zip(&fit.residuals).map(|(y, r)| y - r).collect();
        lack_of_fit::lack_of_fit(&self.groups, &self.y, &fitted, 2).ok().map(|l| l.p)
    }
}

/// The last parameter of a fit and its p-value; points without any scatter leave nothing to chance.
fn last_of(fit: &ordinary::OrdinaryFit) -> Option<(f64, f64)> {
    let last = fit.parameters.len().checked_sub(1)?;
    Some((fit.parameters[last], fit.p_value(last).unwrap_or(0.0)))
}

/// Groups of points within [`SAME_PRESSURE_BAR`] of the lowest of their group, numbered from 0 upward in pressure.
fn repeated(pressure: &[f64]) -> Vec<usize> {
    let mut order: Vec<usize> = (0..pressure.len()).collect();
    order.sort_by(|&a, &b| pressure[a].total_cmp(&pressure[b]));
    let mut groups = vec![0; pressure.len()];
    let mut group = 0;
    let mut lowest = f64::NAN;
    for (i, &index) in order.iter().enumerate() {
        if i == 0 {
            lowest = pressure[index];
        } else if pressure[index] - lowest > SAME_PRESSURE_BAR {
            group += 1;
            lowest = pressure[index];
        }
        groups[index] = group;
    }
    groups
}

/// Direction of each point: as recorded, or from the order when that goes up once and down once.
fn sweeps(used: &[&Point]) -> Vec<Option<Sweep>> {
    if used.iter().any(|p| p.sweep.is_some()) {
        return used.iter().map(|p| p.sweep).collect();
    }
    let pressure: Vec<f64> = used.iter().map(|p| p.pressure_bar_abs).collect();
    let turns_up = |d: &f64| *d > 0.0;
    let steps: Vec<f64> =
        pressure.windows(2).map(|w| w[1] - w[0]).filter(|d| d.abs() > SAME_PRESSURE_BAR).collect();
    let turns = steps.windows(2).filter(|w| turns_up(&w[0]) != turns_up(&w[1])).count();
    if turns != 1 {
        return vec![None; used.len()];
    }
    let rises_first = steps.first().is_some_and(turns_up);
    let (mut peak, mut best) = (0, f64::NEG_INFINITY);
    for (i, p) in pressure.iter().enumerate() {
        let height = if rises_first { *p } else { -*p };
        if height > best {
            (peak, best) = (i, height);
        }
    }
    let (first, second) =
        if rises_first { (Sweep::Rising, Sweep::Falling) } else { (Sweep::Falling, Sweep::Rising) };
    (0..used.len()).map(|i| Some(if i <= peak { first } else { second })).collect()
}

fn span(values: &[f64]) -> (f64, f64) {
    values.iter().fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| (low.min(*v), high.max(*v)))
}

fn correlation(a: &[f64], b: &[f64]) -> f64 {
    let n = a.len() as f64;
    let (ma, mb) = (a.iter().sum::<f64>() / n, b.iter().sum::<f64>() / n);
    let sum = |f: &dyn Fn(f64, f64) -> f64| a.iter().zip(b).map(|(x, y)| f(x - ma, y - mb)).sum::<f64>();
    sum(&|x, y| x * y) / (sum(&|x, _| x * x) * sum(&|_, y| y * y)).sqrt()
}
