//! One run on a certificate: the types. [`super::rows`] fills them.

use chrono::{DateTime, FixedOffset};

use super::figure::Figure;
use super::surroundings::{Condition, Equipment};
use crate::bench::Verdict;
use crate::bench::checks::CheckVerdict;
use crate::entry::Purpose;

/// A run and what came of it.
#[derive(Debug, Clone, PartialEq)]
pub struct Calibration {
    /// First part of the paths of its figures: `results` or `as_found`.
    pub path: &'static str,
    /// Heading.
    pub title: &'static str,
    /// Name of the run.
    pub run: String,
    /// The orifice it was made of.
    pub orifice: String,
    /// Why it was made.
    pub purpose: Purpose,
    /// When it was begun.
    pub taken: DateTime<FixedOffset>,
    /// Who took it.
    pub technician: Option<String>,
    /// The gas, in words with its purity.
    pub gas: String,
    /// The gas of the flows that are judged and headlined.
    pub gas_of_result: &'static str,
    /// The headline in one sentence.
    pub headline: String,
    /// The flow at the nominal pressure.
    pub nominal: Row,
    /// The line.
    pub line: LineFigures,
    /// What the line says of the hole.
    pub hole: Hole,
    /// Every point, used or not.
    pub points: Vec<PointRow>,
    /// The flow over the useful range.
    pub table: Vec<Row>,
    /// Where the uncertainty of the flow at the nominal pressure comes from.
    pub budget: Budget,
    /// The checks.
    pub checks: Vec<CheckRow>,
    /// The comparison with the calibration before.
    pub before: Option<Comparison>,
    /// What it was judged to be.
    pub conformity: Option<Conformity>,
    /// Instruments.
    pub equipment: Vec<Equipment>,
    /// Influences.
    pub conditions: Vec<Condition>,
    /// What to know before trusting it.
    pub warnings: Vec<String>,
    /// The drawing, as SVG text.
    pub plot: String,
    /// What the drawing shows, for those who do not see it.
    pub plot_says: String,
}

/// The flow at one intermediate pressure.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Intermediate pressure, bar gauge at 1.01325 bar ambient.
    pub ip: Figure,
    /// Flow of the run's gas.
    pub flow: Figure,
    /// Flow of oxygen through the same hole, where the gas was another.
    pub as_oxygen: Option<Figure>,
}

/// The line `q = α + β·p1`.
#[derive(Debug, Clone, PartialEq)]
pub struct LineFigures {
    /// α.
    pub intercept: Figure,
    /// β.
    pub slope: Figure,
    /// Variance of α, covariance, variance of β.
    pub covariance: [Figure; 3],
    /// Lowest and highest pressure of the points it rests on, bar absolute.
    pub span: [Figure; 2],
    /// Reduced chi-squared of the fit.
    pub reduced_chi_square: Option<Figure>,
    /// Points used, and points taken.
    pub used_of: (usize, usize),
    /// What the standard errors and the widening are.
    pub says: String,
}

/// The hole behind the line.
#[derive(Debug, Clone, PartialEq)]
pub struct Hole {
    /// Choke ratio.
    pub choke: Choke,
    /// Sonic conductance of ISO 6358.
    pub conductance: Option<Figure>,
    /// Effective diameter, discharge coefficient 1.
    pub diameter: Option<Figure>,
}

/// The choke ratio.
#[derive(Debug, Clone, PartialEq)]
pub struct Choke {
    /// Value with its 95 % interval.
    pub figure: Figure,
    /// Measured, or only bounded.
    pub says: &'static str,
}

/// A point.
#[derive(Debug, Clone, PartialEq)]
pub struct PointRow {
    /// Its number.
    pub number: usize,
    /// Upstream pressure, bar absolute; the uncertainty is that of its random part.
    pub pressure: Figure,
    /// Flow; the uncertainty is that of its random part.
    pub flow: Figure,
    /// Residual from the line, per cent of the flow.
    pub residual: Option<Figure>,
    /// Rising or falling.
    pub sweep: Option<&'static str>,
    /// Why the line does not use it.
    pub why_not: Option<String>,
}

/// The budget.
#[derive(Debug, Clone, PartialEq)]
pub struct Budget {
    /// Its rows, the largest first.
    pub rows: Vec<BudgetRow>,
    /// The combined standard uncertainty.
    pub combined: BudgetRow,
}

/// A row of the budget.
#[derive(Debug, Clone, PartialEq)]
pub struct BudgetRow {
    /// Source.
    pub source: &'static str,
    /// Contribution as a standard uncertainty.
    pub u: Figure,
    /// Its share of the variance.
    pub share: Figure,
    /// Degrees of freedom; none when they are infinite.
    pub dof: Option<Figure>,
}

/// A check.
#[derive(Debug, Clone, PartialEq)]
pub struct CheckRow {
    /// Its name.
    pub name: &'static str,
    /// What it says.
    pub verdict: CheckVerdict,
    /// The same in a word.
    pub word: &'static str,
    /// In a sentence.
    pub says: String,
    /// What was found.
    pub value: Option<Figure>,
    /// What it is held against: upper limit, or lower and upper.
    pub limits: Vec<Figure>,
}

/// A comparison of two flows.
#[derive(Debug, Clone, PartialEq)]
pub struct Comparison {
    /// What it is compared with.
    pub with: String,
    /// The flow there, at the same pressure.
    pub flow: Figure,
    /// Change, per cent of the flow there.
    pub change: Figure,
    /// E_n.
    pub en: Figure,
    /// In a sentence.
    pub says: String,
}

/// Conformity with an acceptance.
#[derive(Debug, Clone, PartialEq)]
pub struct Conformity {
    /// The verdict.
    pub verdict: Verdict,
    /// In a word: pass, fail, undecided.
    pub word: &'static str,
    /// The sentence with its reason.
    pub says: String,
    /// What was judged, of which gas.
    pub judged: Figure,
    /// Nominal flow.
    pub nominal: Figure,
    /// Lower and upper limit of the flow.
    pub limits: [Figure; 2],
    /// Limits of the measured flow by the decision rule; none where the simple rule makes them the same.
    pub guarded: Option<[Figure; 2]>,
    /// Name of the rule.
    pub rule: &'static str,
    /// What the rule is.
    pub rule_says: &'static str,
    /// Probability that the flow lies within the limits, as printed.
    pub probability: String,
}
