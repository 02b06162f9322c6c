//! Does the orifice change over the years? A straight line of flow against time.
//!
//! Comes in: the flows of an orifice's accepted runs, of one gas at one nominal pressure, each with its budget, its
//! certificates, its purpose and its date. Goes out: a [`Trend`]: the change in a year with its 95 % interval, whether
//! chance explains it, and when the line would leave given limits if it went on.
//!
//! The line is ISO/TS 28037:2010, clause 6 (dates are exact). **Weights** are the parts of a budget that are a run's own:
//! its scatter, barometer and temperature of the day, and whatever no other run shares. What an instrument's calibration
//! adds is shared by all runs under the same certificate: it moves them together, so it is no scatter between them, and
//! counting it as such would hide a slow blockage behind an error that every run has alike. As with the line of a run,
//! shared parts never enter the fit; each moves its runs by its standard uncertainty, and what that does to the line is
//! added to its variances (JCGM 100:2008, clause 5). A certificate under which all runs were made so hardly matters, and a
//! change of certificate between the runs matters as much as it should. Own scatter larger than stated widens the own
//! part (Birge's ratio, n − 2 degrees of freedom).
//!
//! A trend begins anew with each run that is made after cleaning or adjustment (purpose *as-left*): the orifice is another
//! one then. Left out: anything but a straight line; drift of an instrument between two of its own
//! calibrations, which looks the same as a drift of the orifice.

use chrono::{DateTime, Duration, FixedOffset};

use super::history::papers_of;
use super::instruments::Instrument;
use super::line::{COVERAGE_PROBABILITY, FlowAt, Part, limits_of};
use crate::entry::Purpose;
use crate::stats::coverage::{coverage_factor, welch_satterthwaite};
use crate::stats::distribution::student_t_two_sided;
use crate::stats::inverse::line_inverse;
use crate::stats::line::{CalibrationPoints, Line, fit};

/// Seconds of a year: 365.25 days, exact (the Julian year, IAU Style Manual 1989, 5.15).
const YEAR_S: f64 = 365.25 * 86_400.0;
/// Fewest runs a trend goes through: two runs are compared by E_n.
pub const FEWEST_RUNS: usize = 3;
/// A slope with a smaller p-value is more than chance explains (common practice, no source).
pub const SIGNIFICANCE: f64 = 1.0 - COVERAGE_PROBABILITY;
/// So many years after its last run a trend is not looked at any more (common practice, no source).
const HORIZON_YEARS: f64 = 10.0;

/// A run of a history.
#[derive(Debug, Clone, PartialEq)]
pub struct TrendRun {
    /// When it was taken.
    pub taken: DateTime<FixedOffset>,
    /// Why it was made.
    pub purpose: Purpose,
    /// Its flow with the budget.
    pub flow: FlowAt,
    /// Certificate of its flow meter.
    pub meter_certificate: Option<String>,
    /// Certificate of its transducer.
    pub transducer_certificate: Option<String>,
}

/// A straight trend.
#[derive(Debug, Clone, PartialEq)]
pub struct Trend {
    /// How many runs it goes through: the last so many of those given.
    pub runs: usize,
    /// When the first of them was taken; the line counts years from here.
    pub from: DateTime<FixedOffset>,
    /// When the last of them was taken.
    pub to: DateTime<FixedOffset>,
    /// Flow in L/min STPD against years, own and shared parts together.
    pub line: Line,
    /// What the own variances were multiplied by (Birge's ratio), 1 when not widened.
    pub widened: f64,
    /// Effective degrees of freedom of the slope; infinite when no part is limited.
    pub dof: f64,
    /// Coverage factor for 95 %.
    pub coverage_factor: f64,
    /// Probability that chance alone gives such a slope to an orifice that does not change.
    pub p: f64,
}

/// When a trend leaves its limits, if it goes on.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Leaving {
    /// The line is outside already.
    Already,
    /// It leaves them.
    At {
        /// When the line does.
        about: DateTime<FixedOffset>,
        /// When the nearer edge of its 95 % band does; not before the last run.
        not_before: DateTime<FixedOffset>,
    },
}

/// The trend through the runs since the orifice was last worked on; `runs` in the order of their dates.
///
/// None with fewer than [`FEWEST_RUNS`] of those, or when they give no line (all of one moment, or no uncertainty).
#[must_use]
pub fn trend(runs: &[TrendRun]) -> Option<Trend> {
    let runs = &runs[since_worked_on(runs)..];
    let (first, last) = (runs.first()?, runs.last()?);
    if runs.len() < FEWEST_RUNS {
        return None;
    }
    let shared = shared_parts(runs);
    let x: Vec<f64> = runs.iter().map(|run| years(first.taken, run.taken)).collect();
    let y: Vec<f64> = runs.iter().map(|run| run.flow.flow_l_min).collect();
    let uy: Vec<f64> = runs.iter().enumerate().map(|(i, run)| own_u(i, run, &shared)).collect();
    let ux = vec![0.0; runs.len()];
    let through = |y: &[f64]| fit(&CalibrationPoints::new(&x, &ux, y, &uy).ok()?).ok();
    let plain = through(&y)?;
    let reduced = plain.reduced_chi_square().unwrap_or(1.0);
    let (widened, own_dof) = if reduced > 1.0 { (reduced, plain.dof as f64) } else { (1.0, f64::INFINITY) };
    let own = plain.scaled(widened);
    let mut line = own;
    let mut slopes = vec![(own.slope_u, own_dof)];
    for part in &shared {
        let moved = |way: f64| {
            let mut y = y.clone();
            for (i, u) in &part.u {
                y[*i] += way * u;
            }
            through(&y)
        };
        let (up, down) = (moved(1.0)?, moved(-1.0)?);
        let (intercept, slope) = ((up.intercept - down.intercept) / 2.0, (up.slope - down.slope) / 2.0);
        line = line.with_added(intercept * intercept, slope * slope, intercept * slope);
        slopes.push((slope, f64::INFINITY));
    }
    let dof = welch_satterthwaite(slopes);
    Some(Trend {
        runs: runs.len(),
        from: first.taken,
        to: last.taken,
        widened,
        dof,
        coverage_factor: coverage_factor(COVERAGE_PROBABILITY, dof),
        p: student_t_two_sided(line.slope / line.slope_u, dof),
        line,
    })
}

impl Trend {
    /// Change in a year as a share of what the line gives at its first run; negative when the flow falls.
    #[must_use]
    pub fn per_year(&self) -> f64 {
        self.line.slope / self.line.at(0.0)
    }

    /// Expanded uncertainty of [`Trend::per_year`] for 95 %.
    #[must_use]
    pub fn per_year_expanded(&self) -> f64 {
        (self.coverage_factor * self.line.slope_u / self.line.at(0.0)).abs()
    }

    /// Whether it is more than chance explains.
    #[must_use]
    pub fn is_significant(&self) -> bool {
        self.p < SIGNIFICANCE
    }

    /// The line at a date and half the width of its 95 % band, L/min.
    #[must_use]
    pub fn at(&self, date: DateTime<FixedOffset>) -> (f64, f64) {
        let x = years(self.from, date);
        (self.line.at(x), self.coverage_factor * self.line.u_at(x))
    }

    /// When it leaves the limits (lowest and highest flow, L/min) if it goes on; none when it is not more than chance
    /// explains, or when that lies over ten years after its last run.
    #[must_use]
    pub fn leaves(&self, limits_l_min: (f64, f64)) -> Option<Leaving> {
        if !self.is_significant() {
            return None;
        }
        let limit = if self.line.slope < 0.0 { limits_l_min.0 } else { limits_l_min.1 };
        let inverse = line_inverse(&self.line, limit, 0.0, self.coverage_factor)?;
        let last = years(self.from, self.to);
        if inverse.x <= last {
            return Some(Leaving::Already);
        }
        let (earliest, _) = limits_of(&inverse);
        let date = |x: f64| self.from.checked_add_signed(Duration::milliseconds((x * YEAR_S * 1e3) as i64));
        let within = inverse.x - last <= HORIZON_YEARS;
        let (about, not_before) = (date(inverse.x)?, date(earliest.max(last))?);
        within.then_some(Leaving::At { about, not_before })
    }
}

/// The first run after the last work on the orifice.
fn since_worked_on(runs: &[TrendRun]) -> usize {
    let after_work = |run: &TrendRun| run.purpose == Purpose::AsLeft;
    runs.iter().rposition(after_work).unwrap_or(0)
}

/// Years from one date to another.
fn years(from: DateTime<FixedOffset>, to: DateTime<FixedOffset>) -> f64 {
    (to - from).num_milliseconds() as f64 / 1e3 / YEAR_S
}

/// A part that several runs share because they were made under one certificate.
struct Shared<'a> {
    part: Part,
    certificate: &'a str,
    /// The runs by their place, each with its contribution, signed.
    u: Vec<(usize, f64)>,
}

/// What runs under one certificate share, in the order in which it is met; what only one run has is its own.
fn shared_parts(runs: &[TrendRun]) -> Vec<Shared<'_>> {
    let mut shared: Vec<Shared<'_>> = Vec::new();
    for (i, run) in runs.iter().enumerate() {
        for (part, u, _) in &run.flow.parts {
            let Some(certificate) = certificate_of(*part, run) else { continue };
            match shared.iter_mut().find(|s| s.part == *part && s.certificate == certificate) {
                Some(there) => there.u.push((i, *u)),
                None => shared.push(Shared { part: *part, certificate, u: vec![(i, *u)] }),
            }
        }
    }
    shared.retain(|part| part.u.len() > 1);
    shared
}

/// The certificate a part comes from, if it does and is named.
fn certificate_of(part: Part, run: &TrendRun) -> Option<&str> {
    match papers_of(part)? {
        Instrument::Meter => run.meter_certificate.as_deref(),
        Instrument::Transducer => run.transducer_certificate.as_deref(),
    }
}

/// Standard uncertainty of a run's flow without what it shares.
fn own_u(place: usize, run: &TrendRun, shared: &[Shared<'_>]) -> f64 {
    let is_shared = |part: Part| {
        let certificate = certificate_of(part, run);
        let listed = |s: &Shared<'_>| s.part == part && s.u.iter().any(|(i, _)| *i == place);
        certificate.is_some() && shared.iter().any(listed)
    };
    let own = run.flow.parts.iter().filter(|(part, ..)| !is_shared(*part)).map(|(_, u, _)| u * u);
    own.sum::<f64>().sqrt()
}

#[cfg(test)]
mod tests {
    use super::super::correct::Source;
    use super::*;

    /// Standard uncertainties: own, of the meter's gain as a share.
    const OWN: f64 = 0.000_4;
    const GAIN: f64 = 0.004;

    fn run(day: i64, flow_l_min: f64, certificate: &str) -> TrendRun {
        let start = DateTime::parse_from_rfc3339("2025-01-06T10:00:00+01:00").unwrap();
        let parts = vec![
            (Part::Random, OWN, f64::INFINITY),
            (Part::Common(Source::MeterGain), GAIN * flow_l_min, f64::INFINITY),
        ];
        TrendRun {
            taken: start + Duration::days(day),
            purpose: Purpose::Check,
            flow: FlowAt::new(11.0, flow_l_min, parts),
            meter_certificate: Some(certificate.to_owned()),
            transducer_certificate: None,
        }
    }

    #[test]
    fn the_line_is_the_weighted_one_of_a_hand_calculation() {
        // Equal weights, days 0, 365.25, 730.5 of 0.480, 0.472, 0.470: slope (0.470 − 0.480)/2 = −0.005 a year, residuals
        // 0.001, −0.002, 0.001 from 0.479, 0.474, 0.469.
        let days = [0.0, 365.25, 730.5];
        let start = run(0, 0.48, "A").taken;
        let runs: Vec<TrendRun> = days
            .iter()
            .zip([0.480, 0.472, 0.470])
            .map(|(day, flow)| TrendRun {
                taken: start + Duration::milliseconds((day * 86_400e3) as i64),
                ..run(0, flow, "A")
            })
            .collect();
        let trend = trend(&runs).unwrap();
        assert!((trend.line.slope + 0.005).abs() < 1e-12, "{}", trend.line.slope);
        let chi_square = (1e-6 + 4e-6 + 1e-6) / (OWN * OWN);
        assert!((trend.widened - chi_square).abs() < 1e-6 * chi_square, "{}", trend.widened);
        // u of the slope: residual standard deviation sqrt(6e-6/1) over sqrt(Σ(x − x̄)²) = sqrt(2); one degree of freedom. The
        // shared gain tilts the line by no more than its own share of the slope.
        let own = (6e-6_f64 / 2.0).sqrt();
        let shared = GAIN * 0.005;
        assert!((trend.line.slope_u - (own * own + shared * shared).sqrt()).abs() < 1e-9);
        assert!((trend.coverage_factor - 12.706).abs() < 0.01, "{}", trend.coverage_factor);
        assert!(!trend.is_significant() && trend.leaves((0.456, 0.504)).is_none());
    }

    /// Eight quarters, each losing 0.5 % (0.0024 L/min), with alternating scatter.
    fn clogging(certificate: impl Fn(usize) -> &'static str) -> Vec<TrendRun> {
        (0..8)
            .map(|i| {
                let scatter = if i % 2 == 0 { 0.000_2 } else { -0.000_2 };
                run(91 * i as i64, 0.480 - 0.002_4 * i as f64 + scatter, certificate(i))
            })
            .collect()
    }

    #[test]
    fn a_slow_blockage_is_seen_although_each_run_knows_its_flow_less_well() {
        // The whole uncertainty of a run is 0.8 % of the flow, the loss in a quarter 0.5 %.
        let trend = trend(&clogging(|_| "A")).unwrap();
        assert_eq!(trend.runs, 8);
        assert!((trend.per_year() + 0.020).abs() < 0.001, "{}", trend.per_year());
        assert!(trend.is_significant() && trend.p < 1e-6, "{}", trend.p);
        let Some(Leaving::At { about, not_before }) = trend.leaves((0.456, 0.504)) else {
            panic!("{:?}", trend.leaves((0.456, 0.504)))
        };
        // 0.024 L/min at 0.0024 in 91 days: 910 days after the first run.
        assert!((about - trend.from).num_days().abs_diff(910) < 15, "{about}");
        assert!(not_before < about && not_before >= trend.to, "{not_before}");
        assert_eq!(trend.leaves((0.470, 0.504)), Some(Leaving::Already));
        // Upwards there is no limit to leave, and ten years on nobody looks.
        assert_eq!(trend.leaves((0.100, 0.504)), None);
    }

    #[test]
    fn a_change_of_certificate_may_be_the_meter_and_not_the_orifice() {
        // The same flows, but as a step of 1 % where the meter came back with a new certificate.
        let runs: Vec<TrendRun> = (0..8)
            .map(|i| {
                let scatter = if i % 2 == 0 { 0.000_2 } else { -0.000_2 };
                let (flow, certificate) = if i < 4 { (0.480, "A") } else { (0.4752, "B") };
                run(91 * i, flow + scatter, certificate)
            })
            .collect();
        let told = trend(&runs).unwrap();
        let as_if_one: Vec<TrendRun> =
            runs.iter().map(|run| TrendRun { meter_certificate: Some("A".into()), ..run.clone() }).collect();
        let naive = trend(&as_if_one).unwrap();
        assert!(naive.is_significant() && !told.is_significant(), "{} {}", naive.p, told.p);
        assert!(told.line.slope_u > 2.0 * naive.line.slope_u);
    }

    #[test]
    fn without_a_named_certificate_nothing_is_shared() {
        let unnamed: Vec<TrendRun> =
            clogging(|_| "A").into_iter().map(|run| TrendRun { meter_certificate: None, ..run }).collect();
        assert!(
            trend(&unnamed).unwrap().line.slope_u > 3.0 * trend(&clogging(|_| "A")).unwrap().line.slope_u
        );
    }

    #[test]
    fn work_on_the_orifice_begins_a_new_trend() {
        let mut runs = clogging(|_| "A");
        runs[5].purpose = Purpose::AsLeft;
        assert_eq!(trend(&runs).unwrap().runs, 3);
        runs[6].purpose = Purpose::AsLeft;
        assert_eq!(trend(&runs), None);
        assert_eq!(trend(&[]), None);
        let one_moment: Vec<TrendRun> = (0..3).map(|_| run(0, 0.48, "A")).collect();
        assert_eq!(trend(&one_moment), None);
    }
}
