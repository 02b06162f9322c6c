//! What is drawn of a setting, in the units it is shown in.
//!
//! Comes in: a setting, the units. Goes out: [`Seen`]: lines, curves, marks and ranges as plain finite numbers.
//! Equations: none but changes of unit and the interval of another day's uptake, `M ± t·u` (JCGM 100:2008, G.3.2), as
//! the session's own result states it. Left out: pixels and words.

use super::SettingPlot;
use crate::quantity::unit::Kind;
use crate::report::Units;
use crate::setting::{Described, FirstStageKind, OrificeSetting, RestingUptake, Setting};
use crate::stats::coverage::coverage_factor;
use crate::uptake::COVERAGE_PROBABILITY;

use super::super::range::{drawable, framed, hull};

/// Room left between the outermost number and the frame, as a share of the range.
const PADDING: f64 = 0.06;
/// Depth shown where nothing is set, m.
const SOME_DEPTH_M: f64 = 60.0;
/// Highest IP shown where there is no line, bar.
const SOME_IP_BAR: f64 = 15.0;
/// Room to the right of several lines, as a share of their range.
const NAME_SHARE: f64 = 0.17;

/// A row of an orifice's line: IP gauge, injection at the surface.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Row {
    pub ip: f64,
    pub nominal: f64,
    pub richest: f64,
    pub leanest: f64,
}

/// An orifice's line.
pub(super) struct Line {
    pub name: String,
    pub rows: Vec<Row>,
    /// Whether it is the one whose setting is shown.
    pub shown: bool,
}

/// Another day's uptake.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Band {
    pub low: f64,
    pub middle: f64,
    pub high: f64,
}

/// Whose IP is described.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Whose {
    Recommended,
    Judged,
    Fitting,
}

/// A place on a depth curve.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Place {
    pub depth: f64,
    pub flow: f64,
    pub lowest: f64,
    pub beyond_span: bool,
}

/// What a depth is marked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Marked {
    OnePercent,
    Tenth,
    Stops,
    Chance,
    Crosses,
}

/// A marked depth: depth, the flow of the curve there, ambient pressure absolute where it is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Mark {
    pub marked: Marked,
    pub depth: f64,
    pub flow: f64,
    pub bar_abs: f64,
}

/// An IP with its injection at the surface.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct At {
    pub ip: f64,
    pub flow: f64,
}

/// All of it.
pub(super) struct Seen {
    pub units: Units,
    pub compensated: bool,
    pub band: Option<Band>,
    pub lines: Vec<Line>,
    /// The IP that is set.
    pub chosen: Option<At>,
    pub judged: Option<At>,
    pub never: Option<f64>,
    /// Division of the gauge.
    pub division: f64,
    pub places: Vec<Place>,
    pub marks: Vec<Mark>,
    pub max_depth: Option<f64>,
    /// From where on the flow has stopped, when the panel reaches beyond.
    pub stops: Option<f64>,
    /// Ranges of the axes.
    pub depths: (f64, f64),
    pub depth_flows: (f64, f64),
    /// Ambient pressure absolute at both ends of the axis of depth.
    pub ambients: (f64, f64),
    pub ips: (f64, f64),
    pub ip_flows: (f64, f64),
}

/// What a setting shows: recommended, else judged, else the first that is described.
pub(super) fn described(setting: &Setting) -> Option<(Whose, usize, &Described)> {
    let answered = |(i, o): (usize, &'_ OrificeSetting)| o.answer.is_ok().then_some(i);
    let ok = |i: usize| setting.orifices.get(i).and_then(|o| o.answer.as_ref().ok()).map(|d| (i, d));
    if let Some((i, described)) = setting.recommended.and_then(ok) {
        return Some((Whose::Recommended, i, described));
    }
    let judged = setting.orifices.iter().enumerate().find_map(|(i, o)| o.judged.as_ref().map(|j| (i, j)));
    if let Some((i, judged)) = judged {
        return Some((Whose::Judged, i, &judged.described));
    }
    let first = setting.orifices.iter().enumerate().find_map(answered)?;
    ok(first).map(|(i, described)| (Whose::Fitting, i, described))
}

impl Seen {
    pub(super) fn new(setting: &Setting, options: &SettingPlot) -> Self {
        let units = options.units;
        let metres = |m: f64| depth(&units, m);
        let shown = described(setting);
        let orifice = shown.map(|(_, i, _)| i);
        let band = setting.uptake.as_ref().and_then(|uptake| band(uptake, &units));
        let lines: Vec<Line> = setting
            .orifices
            .iter()
            .enumerate()
            .map(|(i, o)| line(o, orifice == Some(i), &units))
            .filter(|line| line.rows.len() > 1)
            .collect();
        let at = |d: &Described| {
            let at =
                At { ip: units.pressure(d.at.ip_bar_gauge), flow: units.flow(d.at.surface.nominal_l_min) };
            (drawable(at.ip) && drawable(at.flow)).then_some(at)
        };
        let chosen = shown.filter(|(whose, _, _)| *whose != Whose::Judged).and_then(|(_, _, d)| at(d));
        let judged = {
            let of = |o: &OrificeSetting| o.judged.as_ref().and_then(|j| at(&j.described));
            let own = orifice.and_then(|i| setting.orifices.get(i)).and_then(of);
            own.or_else(|| setting.orifices.iter().find_map(of))
        };
        let never = orifice
            .and_then(|i| setting.orifices.get(i))
            .or(setting.orifices.first())
            .and_then(|o| o.never_exceed_ip_bar_gauge)
            .map(|ip| units.pressure(ip))
            .filter(|ip| drawable(*ip));
        let places: Vec<Place> = shown.map(|(_, _, d)| places(d, &units)).unwrap_or_default();
        let deepest = places.last().map_or(metres(SOME_DEPTH_M), |p| p.depth);
        let max_depth = setting.used.max_depth_m.map(metres).filter(|d| drawable(*d));
        let depths = (0.0, 1.05 * max_depth.map_or(deepest, |d| d.max(deepest)).max(1e-3));
        let marks: Vec<Mark> = shown
            .map(|(_, _, d)| marks(d, &places, setting, &units))
            .unwrap_or_default()
            .into_iter()
            .filter(|m| m.depth <= depths.1)
            .collect();
        let banded = || band.iter().flat_map(|b| [b.low, b.high]);
        let depth_flows = places.iter().flat_map(|p| [p.flow, p.lowest]).chain(banded());
        // Without a curve the band alone would fill the panel.
        let from_nought = places.is_empty().then_some(0.0);
        let depth_flows = depth_flows.chain(from_nought).map(|q| (q, 0.0));
        let depth_flows = framed(hull(depth_flows).unwrap_or((0.0, 1.0)), PADDING);
        let row_flows = lines.iter().flat_map(|l| &l.rows).flat_map(|r| [r.nominal, r.richest, r.leanest]);
        let points = || chosen.iter().chain(&judged);
        let ip_flows = row_flows.chain(banded()).chain(points().map(|at| at.flow));
        let ip_flows = framed(hull(ip_flows.map(|q| (q, 0.0))).unwrap_or((0.0, 1.0)), PADDING);
        let ips = lines.iter().flat_map(|l| l.rows.iter().map(|r| r.ip));
        let ips = ips.chain(points().map(|at| at.ip)).chain(never);
        let (lowest, highest) = hull(ips.map(|p| (p, 0.0))).unwrap_or((0.0, units.pressure(SOME_IP_BAR)));
        let highest = highest.max(lowest + units.pressure(0.5));
        // The names of several lines stand at their ends.
        let room = if lines.len() > 1 { NAME_SHARE } else { PADDING };
        let span = highest - lowest;
        let below = lowest - PADDING * span;
        let ips = (if lowest < 0.0 { below } else { below.max(0.0) }, highest + room * span);
        let stops = marks.iter().find(|m| m.marked == Marked::Stops).map(|m| m.depth);
        let ambient = |shown: f64| {
            // Ambient pressure is straight in depth: two places of it give any other.
            let (surface, per_m) = (setting.used.ambient_at(0.0), setting.used.ambient_at(1.0));
            let bar = units.pressure(surface + (per_m - surface) * shown / metres(1.0));
            if drawable(bar) { bar } else { 0.0 }
        };
        Self {
            compensated: setting.used.first_stage == FirstStageKind::Compensated,
            band,
            lines,
            chosen,
            judged,
            never,
            division: units.pressure(setting.used.gauge_division_bar),
            places,
            marks,
            max_depth,
            stops,
            ambients: (ambient(depths.0), ambient(depths.1)),
            depths,
            depth_flows,
            ips,
            ip_flows,
            units,
        }
    }
}

/// A depth in metres in the unit it is shown in.
pub(super) fn depth(units: &Units, m: f64) -> f64 {
    units.unit(Kind::Length).from_si(m)
}

fn band(uptake: &RestingUptake, units: &Units) -> Option<Band> {
    let half = coverage_factor(COVERAGE_PROBABILITY, uptake.dof) * uptake.u_l_min;
    let middle = uptake.uptake_l_min;
    let band = Band {
        low: units.flow((middle - half).max(0.0)),
        middle: units.flow(middle),
        high: units.flow(middle + half),
    };
    ([band.low, band.middle, band.high].iter().all(|x| drawable(*x)) && band.low <= band.high).then_some(band)
}

fn line(orifice: &OrificeSetting, shown: bool, units: &Units) -> Line {
    let rows = orifice.table.iter().map(|at| Row {
        ip: units.pressure(at.ip_bar_gauge),
        nominal: units.flow(at.surface.nominal_l_min),
        richest: units.flow(at.surface.richest_l_min),
        leanest: units.flow(at.surface.leanest_l_min),
    });
    let finite = |r: &Row| [r.ip, r.nominal, r.richest, r.leanest].iter().all(|x| drawable(*x));
    let mut rows: Vec<Row> = rows.filter(finite).collect();
    rows.sort_by(|a, b| a.ip.total_cmp(&b.ip));
    let name = super::super::letters::clean(orifice.orifice.as_str()).trim().to_owned();
    Line { name, rows, shown }
}

fn places(described: &Described, units: &Units) -> Vec<Place> {
    let places = described.depth.rows.iter().map(|row| Place {
        depth: depth(units, row.depth_m),
        flow: units.flow(row.injection_l_min),
        lowest: units.flow(row.lowest_l_min),
        beyond_span: row.beyond_span,
    });
    let finite = |p: &Place| [p.depth, p.flow, p.lowest].iter().all(|x| drawable(*x)) && p.depth >= 0.0;
    let mut places: Vec<Place> = places.filter(finite).collect();
    places.sort_by(|a, b| a.depth.total_cmp(&b.depth));
    places
}

/// The flow of a curve at a depth, between the rows beside it; none beyond them.
fn flow_at(places: &[Place], depth: f64, of: impl Fn(&Place) -> f64) -> Option<f64> {
    let next = places.partition_point(|p| p.depth < depth);
    let after = places.get(next)?;
    match next.checked_sub(1).and_then(|i| places.get(i)) {
        Some(before) if after.depth > before.depth => {
            let share = (depth - before.depth) / (after.depth - before.depth);
            Some(of(before) + share * (of(after) - of(before)))
        }
        _ => Some(of(after)),
    }
}

fn marks(described: &Described, places: &[Place], setting: &Setting, units: &Units) -> Vec<Mark> {
    let limits = &described.depth;
    let lost = [
        (Marked::OnePercent, limits.one_percent),
        (Marked::Tenth, limits.nine_tenths),
        (Marked::Stops, limits.stops),
    ];
    // The first two depths are those of the lowest choke ratio, and stand on its curve.
    let lost = lost.into_iter().filter_map(|(marked, point)| {
        let point = point?;
        let at = depth(units, point.depth_m);
        let flow = flow_at(places, at, |p| p.lowest)?;
        Some(Mark { marked, depth: at, flow, bar_abs: units.pressure(point.ambient_bar_abs) })
    });
    let overtakes =
        [(Marked::Chance, limits.overtakes_at_m), (Marked::Crosses, limits.overtakes_at_best_estimate_m)];
    let overtakes = overtakes.into_iter().filter_map(|(marked, m)| {
        let m = m?;
        let at = depth(units, m);
        let flow = flow_at(places, at, |p| p.flow)?;
        Some(Mark { marked, depth: at, flow, bar_abs: units.pressure(setting.used.ambient_at(m)) })
    });
    let finite = |m: &Mark| [m.depth, m.flow, m.bar_abs].iter().all(|x| drawable(*x)) && m.depth >= 0.0;
    lost.chain(overtakes).filter(finite).collect()
}
