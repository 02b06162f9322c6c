//! What is drawn, in the units it is shown in.
//!
//! Comes in: a history, the units. Goes out: [`Seen`]: runs in the order of their dates, trend and ranges as plain
//! finite numbers, dates as days. Equations: none but changes of unit, and the straight line through two places of
//! the trend. Left out: pixels.

use super::dates::days;
use super::{History, HistoryPlot, HistoryRun, Trend};
use crate::bench::Verdict;
use crate::entry::Purpose;
use crate::report::Units;

use super::super::letters::clean;
use super::super::range::{drawable, framed, hull, reaching};

/// How far beyond the flows, in spans of theirs with their bars, the limits still widen the range.
const LIMITS_REACH: f64 = 6.0;
/// The same for bars, and for the trend looked ahead.
const BARS_REACH: f64 = 4.0;
const TREND_REACH: f64 = 1.0;
/// How far beyond the last run, in spans of the runs, the date of leaving the limits still widens the range, and how
/// far the trend is looked ahead at least and without such a date.
const LEAVING_REACH: f64 = 1.0;
const AHEAD: f64 = 0.3;
/// So many days beyond the last run the date of leaving is shown however short the history is: a year.
const LEAVING_DAYS: f64 = 366.0;
/// The axis of dates shows so many days at least.
const LEAST_DAYS: f64 = 3.0;
/// Room left between the outermost number and the frame, as a share of the range.
const PADDING: f64 = 0.05;
/// |E_n| above this says that two runs differ by more than their uncertainties explain (ISO/IEC 17043:2010,
/// annex B; the clause is from memory).
pub(super) const EN_LIMIT: f64 = 1.0;

/// A run, in shown units; the bar is half its length.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Mark {
    pub name: String,
    pub day: f64,
    pub flow: f64,
    pub bar: f64,
    pub limits: Option<(f64, f64)>,
    pub verdict: Verdict,
    pub en: Option<f64>,
    pub purpose: Purpose,
}

/// The trend, in shown units.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Line {
    /// Day, flow, half the width of the band; in order, at least two.
    pub places: Vec<(f64, f64, f64)>,
    /// The days of its first and last run.
    pub span: (f64, f64),
    /// Days on which the line leaves the limits, and on which its band first may.
    pub leaves: Option<(f64, Option<f64>)>,
}

/// All of it.
pub(super) struct Seen {
    pub units: Units,
    pub marks: Vec<Mark>,
    /// Runs whose numbers cannot be drawn.
    pub undrawn: usize,
    pub line: Option<Line>,
    /// Range of the axis of dates, in days.
    pub days: (f64, f64),
    /// Range of the flow axis.
    pub flows: (f64, f64),
}

impl Mark {
    /// E_n, where it says that something changed.
    pub(super) fn changed(&self) -> Option<f64> {
        self.en.filter(|en| en.abs() > EN_LIMIT)
    }
}

impl Line {
    /// The straight line on a day.
    pub(super) fn at(&self, day: f64) -> f64 {
        let (Some(first), Some(last)) = (self.places.first(), self.places.last()) else { return f64::NAN };
        first.1 + (last.1 - first.1) * (day - first.0) / (last.0 - first.0)
    }

    /// The line and half the width of its band on a day between two of its places.
    pub(super) fn band_at(&self, day: f64) -> Option<(f64, f64)> {
        let pair = self.places.windows(2).find(|p| p[0].0 <= day && day <= p[1].0)?;
        let share = (day - pair[0].0) / (pair[1].0 - pair[0].0);
        let between = |a: f64, b: f64| a + (b - a) * share;
        Some((between(pair[0].1, pair[1].1), between(pair[0].2, pair[1].2)))
    }

    /// How far it is drawn: to its last place, or to where it leaves the limits.
    pub(super) fn end(&self) -> f64 {
        let last = self.places.last().map_or(self.span.1, |p| p.0);
        self.leaves.map_or(last, |(about, _)| last.max(about))
    }
}

impl Seen {
    pub(super) fn new(history: &History<'_>, options: &HistoryPlot) -> Self {
        let units = options.units;
        let mut marks: Vec<Mark> = history.runs.iter().filter_map(|run| mark(run, &units)).collect();
        let undrawn = history.runs.len() - marks.len();
        marks.sort_by(|a, b| a.day.total_cmp(&b.day));
        let line = history.trend.as_ref().filter(|_| !marks.is_empty()).and_then(|t| line(t, &units));
        let days = range_of_days(&marks, line.as_ref());
        let flows = range_of_flows(&marks, line.as_ref(), days);
        Self { units, marks, undrawn, line, days, flows }
    }

    /// The limits of the latest run, which hold until others are set.
    pub(super) fn latest_limits(&self) -> Option<(f64, f64)> {
        self.marks.last().and_then(|m| m.limits)
    }

    /// Whether a flow lies within the panel.
    pub(super) fn shows(&self, flow: f64) -> bool {
        (self.flows.0..=self.flows.1).contains(&flow)
    }
}

fn mark(run: &HistoryRun, units: &Units) -> Option<Mark> {
    let bar = units.flow(run.expanded_l_min.abs());
    let limits = run.limits_l_min.map(|(low, high)| (units.flow(low), units.flow(high)));
    let mark = Mark {
        name: clean(&run.name).trim().to_owned(),
        day: days(&run.taken),
        flow: units.flow(run.flow_l_min),
        bar: if drawable(bar) { bar } else { 0.0 },
        limits: limits.filter(|(low, high)| drawable(*low) && drawable(*high) && low <= high),
        verdict: run.verdict,
        en: run.en.filter(|en| en.is_finite()),
        purpose: run.purpose,
    };
    drawable(mark.flow).then_some(mark)
}

fn line(trend: &Trend, units: &Units) -> Option<Line> {
    let mut places: Vec<(f64, f64, f64)> = trend
        .line
        .iter()
        .map(|p| (days(&p.at), units.flow(p.flow_l_min), units.flow(p.expanded_l_min.abs())))
        .filter(|(_, flow, half)| drawable(*flow) && drawable(*half))
        .collect();
    places.sort_by(|a, b| a.0.total_cmp(&b.0));
    // Two places at one moment say nothing of a slope.
    places.dedup_by(|a, b| (a.0 - b.0).abs() < 1e-6);
    let (from, to) = (days(&trend.from), days(&trend.to));
    let leaves = trend.leaves.map(|l| (days(&l.about), l.not_before.map(|t| days(&t))));
    (places.len() >= 2).then_some(Line { places, span: (from.min(to), from.max(to)), leaves })
}

/// From the first run to the last, and on to where the trend leaves the limits if that is not too far.
fn range_of_days(marks: &[Mark], line: Option<&Line>) -> (f64, f64) {
    let Some((first, last)) = hull(marks.iter().map(|m| (m.day, 0.0))) else { return (0.0, LEAST_DAYS) };
    let mut end = last;
    if let Some(line) = line {
        let leaves = line.leaves.map(|(about, _)| about).filter(|about| {
            *about > last && *about - last <= (LEAVING_REACH * (last - first)).max(LEAVING_DAYS)
        });
        let ahead = line.end().min(last + AHEAD * (last - first));
        end = leaves.unwrap_or(ahead).max(last);
    }
    let lacking = (LEAST_DAYS - (end - first)).max(0.0) / 2.0;
    let room = PADDING * (end - first).max(LEAST_DAYS);
    (first - lacking - room, end + lacking + room)
}

fn range_of_flows(marks: &[Mark], line: Option<&Line>, days: (f64, f64)) -> (f64, f64) {
    let core = hull(marks.iter().map(|m| (m.flow, 0.0))).unwrap_or((0.0, 1.0));
    let bars = marks.iter().flat_map(|m| [m.flow - m.bar, m.flow + m.bar]);
    let core = reaching(core, bars, BARS_REACH);
    let trend = line.iter().flat_map(|l| {
        l.places
            .iter()
            .filter(|p| (days.0..=days.1).contains(&p.0))
            .flat_map(|p| [p.1 - p.2, p.1 + p.2])
            .chain([l.at(l.end().min(days.1))])
    });
    let core = reaching(core, trend, TREND_REACH);
    framed(
        reaching(core, marks.iter().filter_map(|m| m.limits).flat_map(|(a, b)| [a, b]), LIMITS_REACH),
        PADDING,
    )
}
