//! What is drawn, as plain numbers: seconds, bar, L/min, metres.
//!
//! Comes in: a session, its uptake, what a person left out. Goes out: [`Seen`]. Equations: none but a cell's two-point
//! calibration and the purity in an injected flow. Left out: pixels and words.

use super::SessionPlot;
use super::fitted;
use super::stretches::{Stretch, stretches};
use crate::entry::{CellSignal, Injection, LoopKept, Metered, Place, Session, What};
use crate::setting::DEFAULT_PURITY;
use crate::uptake::{Proposal, SegmentUptake, SessionUptake, Warning, calibration_points_bar};

use super::super::range::{drawable, framed, hull, reaching};

/// Floor and ceiling of PO2 on the couch and in the pool, bar: below and above them a session ends (the method).
const COUCH_LIMITS_BAR: (f64, f64) = (0.40, 1.0);
const POOL_LIMITS_BAR: (f64, f64) = (0.60, 1.3);
/// How far beyond the agreeing cells and the limits, in spans of theirs, another cell still widens the range.
const CELL_REACH: f64 = 0.35;
/// Room left between the outermost number and the frame, as a share of the range.
const PADDING: f64 = 0.04;
/// Nothing read for so long, and for so many usual intervals: the line is broken, as the uptake's segments are.
const GAP_S: f64 = 60.0;
const GAP_INTERVALS: f64 = 5.0;
/// More cells are not told apart by a dash and a sign.
pub(super) const MOST_CELLS: usize = 8;

/// A cell's readings.
pub(super) struct Cell<'a> {
    /// The name of its column.
    pub name: &'a str,
    /// Which of the session's cells, counted from 0.
    pub index: usize,
    pub left_out: Option<crate::uptake::CellTrouble>,
    /// Readings above or below the panel.
    pub beyond: usize,
    column: &'a [f64],
    gain: f64,
    offset: f64,
}

impl Cell<'_> {
    /// PO2 in bar of a row; NaN when it is missing.
    pub(super) fn at(&self, row: usize) -> f64 {
        self.offset + self.gain * self.column.get(row).copied().unwrap_or(f64::NAN)
    }
}

/// What happened, as it is marked.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Happened {
    Injection,
    OxygenAdd,
    DiluentAdd,
    Vent,
    MakeUp,
    Stop,
}

/// An event with a time within the readings.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Mark {
    pub at_s: f64,
    pub happened: Happened,
    pub what: What,
    /// Oxygen injected from then on, L/min, where it is known.
    pub injection_l_min: Option<f64>,
}

/// A span with an injection.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Step {
    pub from_s: f64,
    pub to_s: f64,
    pub l_min: f64,
}

/// A segment and its fitted line.
pub(super) struct Fit {
    pub segment: SegmentUptake,
    /// Seconds and bar.
    pub line: Vec<(f64, f64)>,
}

/// All of it.
pub(super) struct Seen<'a> {
    pub time_s: &'a [f64],
    /// Rows in order of time; none when they are in order as they stand.
    order: Option<Vec<usize>>,
    pub cells: Vec<Cell<'a>>,
    /// Cells that could not be read as a pressure, or one too many to be drawn.
    pub cells_not_drawn: Vec<&'a str>,
    pub series: Vec<(f64, f64)>,
    pub stretches: Vec<Stretch>,
    pub fits: Vec<Fit>,
    pub marks: Vec<Mark>,
    pub jumps: Vec<Proposal>,
    /// Floor and ceiling of the place, bar.
    pub limits: (f64, f64),
    /// When PO2 first lay below the floor and above the ceiling, seconds.
    pub passed: (Option<f64>, Option<f64>),
    pub steps: Vec<Step>,
    /// Whether the strip of the injection is drawn.
    pub has_strip: bool,
    pub depth: Option<&'a [f64]>,
    /// Readings further apart than this, in seconds, are not joined.
    pub gap_s: f64,
    /// Ranges of the axes: seconds, bar, L/min, metres.
    pub times: (f64, f64),
    pub po2: (f64, f64),
    pub flows: (f64, f64),
    pub depths: (f64, f64),
}

impl<'a> Seen<'a> {
    pub(super) fn new(session: &'a Session, uptake: &SessionUptake, options: &SessionPlot) -> Self {
        let time_s = session.readings.time_s.as_slice();
        let order = in_order(time_s);
        let span = hull(time_s.iter().filter(|t| drawable(**t)).map(|t| (*t, 0.0)));
        let times = span.filter(|(from, to)| from < to).unwrap_or_else(|| {
            let from = span.map_or(0.0, |s| s.0);
            (from, from + 60.0)
        });
        let series: Vec<(f64, f64)> = uptake
            .series
            .time_s
            .iter()
            .zip(&uptake.series.po2_bar)
            .filter(|(t, _)| drawable(**t))
            .map(|(t, p)| (*t, if drawable(*p) { *p } else { f64::NAN }))
            .collect();
        let limits = match session.place {
            Place::Couch => COUCH_LIMITS_BAR,
            Place::Pool => POOL_LIMITS_BAR,
        };
        let (mut cells, cells_not_drawn) = cells(session, uptake);
        let fits: Vec<Fit> = uptake
            .segments
            .iter()
            .filter(|s| s.from_s < s.to_s && drawable(s.from_s) && drawable(s.to_s))
            .map(|segment| Fit { segment: *segment, line: fitted::line(segment, &series) })
            .collect();
        let po2 = po2_range(&series, &cells, time_s.len(), limits);
        for cell in &mut cells {
            cell.beyond = (0..time_s.len())
                .map(|row| cell.at(row))
                .filter(|p| p.is_finite() && !(po2.0..=po2.1).contains(p))
                .count();
        }
        let passed = |beyond: &dyn Fn(f64) -> bool| series.iter().find(|(_, p)| beyond(*p)).map(|(t, _)| *t);
        let passed = (passed(&|p| p < limits.0), passed(&|p| p > limits.1));
        let steps = steps(session, uptake, times);
        let mut marks: Vec<Mark> =
            session.events.iter().filter_map(|e| mark(e.at_s, e.what, times)).collect();
        marks.sort_by(|a, b| a.at_s.total_cmp(&b.at_s).then(a.happened.cmp(&b.happened)));
        for mark in marks.iter_mut().filter(|m| m.happened == Happened::Injection) {
            let step = steps.iter().find(|s| s.from_s <= mark.at_s && mark.at_s < s.to_s);
            mark.injection_l_min = step.map(|s| s.l_min);
        }
        let depth = session.readings.depth_m.as_deref().filter(|d| d.iter().any(|d| drawable(*d)));
        let changes = steps.windows(2).any(|pair| (pair[0].l_min - pair[1].l_min).abs() > 1e-9);
        Self {
            gap_s: gap_s(time_s, order.as_deref()),
            time_s,
            order,
            cells,
            cells_not_drawn,
            stretches: stretches(&uptake.left_out, &options.left_out, times),
            fits,
            marks,
            jumps: uptake
                .warnings
                .iter()
                .filter_map(|w| match w {
                    Warning::UnmarkedJump(jump) if drawable(jump.at_s) => Some(*jump),
                    _ => None,
                })
                .collect(),
            limits,
            passed,
            has_strip: changes || depth.is_some(),
            flows: framed(
                hull(steps.iter().map(|s| (s.l_min, 0.0)))
                    .map_or((0.0, 1.0), |(_, high)| (0.0, high.max(0.1))),
                0.15,
            ),
            depths: depth
                .and_then(|d| hull(d.iter().filter(|d| drawable(**d)).map(|d| (*d, 0.0))))
                .map_or((0.0, 1.0), |(low, high)| framed((low.min(0.0), high.max(0.5)), 0.08)),
            steps,
            depth,
            times,
            po2,
            series,
        }
    }

    /// Rows in order of time.
    pub(super) fn rows(&self) -> impl Iterator<Item = usize> {
        (0..self.time_s.len()).map(|i| self.order.as_ref().and_then(|o| o.get(i)).copied().unwrap_or(i))
    }
}

fn in_order(time_s: &[f64]) -> Option<Vec<usize>> {
    // A row without a time is passed over later, wherever it stands.
    let ordered = time_s.windows(2).all(|pair| pair[0] <= pair[1]);
    (!ordered).then(|| {
        let mut rows: Vec<usize> = (0..time_s.len()).collect();
        rows.sort_by(|a, b| time_s[*a].total_cmp(&time_s[*b]));
        rows
    })
}

/// The usual interval between rows, times what makes a gap.
fn gap_s(time_s: &[f64], order: Option<&[usize]>) -> f64 {
    let at = |i: usize| time_s[order.and_then(|o| o.get(i)).copied().unwrap_or(i)];
    let mut intervals: Vec<f64> =
        (1..time_s.len()).map(|i| at(i) - at(i - 1)).filter(|s| s.is_finite() && *s > 0.0).collect();
    let middle = intervals.len() / 2;
    let usual =
        if intervals.is_empty() { 0.0 } else { *intervals.select_nth_unstable_by(middle, f64::total_cmp).1 };
    GAP_S.max(GAP_INTERVALS * usual)
}

fn cells<'a>(session: &'a Session, uptake: &SessionUptake) -> (Vec<Cell<'a>>, Vec<&'a str>) {
    let points = session.cells.calibrated_at.map(|at| calibration_points_bar(&at));
    let (mut cells, mut not_drawn) = (Vec::new(), Vec::new());
    for (index, cell) in session.readings.cells.iter().enumerate() {
        let scale = match &cell.signal {
            CellSignal::Bar(column) => Some((column, 1.0, 0.0)),
            CellSignal::Volts { readings, in_air, in_oxygen } => points.and_then(|(air, oxygen)| {
                let gain = (oxygen - air) / (in_oxygen - in_air);
                (gain.is_finite() && gain > 0.0).then_some((readings, gain, air - gain * in_air))
            }),
        };
        let name = cell.name.as_str();
        match scale {
            Some((column, gain, offset)) if cells.len() < MOST_CELLS => {
                let left_out = uptake.cells_left_out.iter().find(|c| c.name == name).map(|c| c.why);
                cells.push(Cell { name, index, left_out, beyond: 0, column, gain, offset });
            }
            _ => not_drawn.push(name),
        }
    }
    (cells, not_drawn)
}

fn po2_range(series: &[(f64, f64)], cells: &[Cell<'_>], rows: usize, limits: (f64, f64)) -> (f64, f64) {
    let used = series.iter().map(|(_, p)| *p).filter(|p| p.is_finite());
    let core = hull(used.chain([limits.0, limits.1]).map(|p| (p, 0.0))).unwrap_or(limits);
    let readings = cells.iter().flat_map(|cell| (0..rows).map(|row| cell.at(row))).filter(|p| p.is_finite());
    framed(reaching(core, readings, CELL_REACH), PADDING)
}

fn mark(at_s: f64, what: What, times: (f64, f64)) -> Option<Mark> {
    let happened = match what {
        What::Injection(_) => Happened::Injection,
        What::OxygenAdd(_) => Happened::OxygenAdd,
        What::DiluentAdd(_) => Happened::DiluentAdd,
        What::Vent(_) => Happened::Vent,
        What::MakeUp { .. } => Happened::MakeUp,
        What::Stop => Happened::Stop,
        What::Exclude { .. } => return None,
    };
    let seen = (times.0..=times.1).contains(&at_s);
    seen.then_some(Mark { at_s, happened, what, injection_l_min: None })
}

/// The oxygen injected, from event to event, where it is known: as the segments say, else the stated flow times the
/// purity.
fn steps(session: &Session, uptake: &SessionUptake, times: (f64, f64)) -> Vec<Step> {
    let purity = session.oxygen.unwrap_or(DEFAULT_PURITY).fraction;
    let mut events: Vec<(f64, Injection)> = session
        .events
        .iter()
        .filter_map(|e| match e.what {
            What::Injection(injection) if e.at_s.is_finite() => Some((e.at_s, injection)),
            _ => None,
        })
        .collect();
    events.sort_by(|a, b| a.0.total_cmp(&b.0));
    let stops = session.events.iter().filter(|e| e.what == What::Stop && e.at_s.is_finite()).map(|e| e.at_s);
    let end_s = stops.fold(times.1, f64::min);
    let mut steps = Vec::new();
    for (i, (at_s, injection)) in events.iter().enumerate() {
        let until_s = events.get(i + 1).map_or(end_s, |next| next.0).min(end_s);
        let within = |s: &&SegmentUptake| s.from_s >= *at_s - 1e-6 && s.to_s <= until_s + 1e-6;
        let by_segments = uptake.segments.iter().find(within).map(|s| s.injection_l_min);
        let l_min = match injection {
            Injection::Off => Some(0.0),
            Injection::Flow(flow) => by_segments.or(Some(purity * flow.value.as_l_min())),
            Injection::Ip(_) => by_segments,
        };
        let (from_s, to_s) = (at_s.max(times.0), until_s.min(times.1));
        if let Some(l_min) = l_min.filter(|l_min| drawable(*l_min) && from_s < to_s) {
            steps.push(Step { from_s, to_s, l_min });
        }
    }
    steps
}

/// The litres of an amount, and whether they are STPD: without the conditions of its meter they are as it showed them.
pub(super) fn litres(amount: Option<Metered>) -> Option<(f64, bool)> {
    let amount = amount?;
    let factor = amount.reads_at.map(|at| at.stpd_factor());
    let litres = amount.volume.value.as_l() * factor.unwrap_or(1.0);
    drawable(litres).then_some((litres, factor.is_some()))
}

/// How a loop is kept, and whether it is back at its mark.
pub(super) fn made_up(kept: Option<LoopKept>, mark: bool) -> String {
    let kept = kept.map(|k| format!("from here {}", k.name()));
    let mark = mark.then(|| "back at the mark".to_owned());
    match (mark, kept) {
        (Some(mark), Some(kept)) => format!("{mark}, {kept}"),
        (Some(text), None) | (None, Some(text)) => text,
        (None, None) => "made up".to_owned(),
    }
}
