//! The panel: trend with its band, limits, runs with bars.
//!
//! Comes in: what is drawn and where. Goes out: marks inside the panel's frame; what would leave it is cut at the
//! frame by arithmetic, so that no clipping path is needed.

use super::layout::Layout;
use super::marks::{
    DRAWING_ORDER, Sign, arrow, draw as draw_signs, draw_flags, draw_rings, hair, radius, told,
};
use super::seen::{Line, Seen};
use crate::entry::Purpose;

use super::super::ink::{INK, SAND, SEA_GLASS};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// Beyond this many runs they do not say their numbers when pointed at: the picture would grow heavy.
const MOST_TOLD: usize = 400;
/// Up to so many runs the bars have lips.
const MOST_LIPS: usize = 60;
/// Above so many runs bars and signs are paler, or they would be one dark mass.
const MANY: usize = 120;
/// How far the limits of one run reach to each side, in sizes of body text.
const OVERHANG: f64 = 0.8;
/// Two limits are one when they differ by less than this share.
const SAME_LIMIT: f64 = 1e-9;

/// Draws the panel.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    if let Some(line) = &seen.line {
        draw_band(svg, line, layout);
    }
    draw_limits(svg, seen, layout);
    if let Some((x, _)) = leaving(seen, layout) {
        draw_leaving(svg, x, layout);
    }
    draw_as_left(svg, seen, layout);
    draw_bars(svg, seen, layout);
    // Among many runs the trend would not be seen under them.
    let on_top = seen.marks.len() > MANY;
    let draw_trend = |svg: &mut Svg| {
        if let Some(line) = &seen.line {
            draw_line(svg, seen, line, layout);
        }
    };
    if !on_top {
        draw_trend(svg);
    }
    draw_runs(svg, seen, layout);
    if on_top {
        draw_trend(svg);
    }
    draw_changed(svg, seen, layout);
}

/// Where the trend leaves the limits, in pixels, if the panel shows that day and flow.
pub(super) fn leaving(seen: &Seen, layout: &Layout) -> Option<(f64, f64)> {
    let line = seen.line.as_ref()?;
    let (day, _) = line.leaves?;
    let flow = line.at(day);
    (layout.x.shows(day) && seen.shows(flow)).then(|| (layout.x.at(day), layout.flow.at(flow)))
}

/// The days between which the trend's line is drawn in the panel, none when it is nowhere in it.
pub(super) fn line_reach(line: &Line, layout: &Layout) -> Option<(f64, f64)> {
    let (low, high) = (layout.flow.low, layout.flow.high);
    let (mut from, mut to) = (line.span.0.max(layout.x.low), line.end().min(layout.x.high));
    let (at_from, at_to) = (line.at(line.span.0), line.at(line.span.0 + 365.0));
    let per_day = (at_to - at_from) / 365.0;
    if per_day.abs() > 0.0 {
        let day = |flow: f64| line.span.0 + (flow - at_from) / per_day;
        from = from.max(day(low).min(day(high)));
        to = to.min(day(low).max(day(high)));
    } else if !(low..=high).contains(&at_from) {
        return None;
    }
    (from < to).then_some((from, to))
}

/// The band: full between the first and the last run of the trend, paler where it looks ahead.
fn draw_band(svg: &mut Svg, line: &Line, layout: &Layout) {
    let (Some(first), Some(last)) = (line.places.first(), line.places.last()) else { return };
    let (from, to) = (first.0.max(layout.x.low), last.0.min(layout.x.high));
    let parts = [(from, to.min(line.span.1), "plot-band"), (from.max(line.span.1), to, "plot-band-beyond")];
    for (from, to, class) in parts.into_iter().filter(|(from, to, _)| from < to) {
        let mut days = vec![from];
        days.extend(line.places.iter().map(|p| p.0).filter(|day| from < *day && *day < to));
        days.push(to);
        let (mut upper, mut lower) = (Vec::new(), Vec::new());
        for (day, (flow, half)) in days.into_iter().filter_map(|day| Some((day, line.band_at(day)?))) {
            upper.push((layout.x.at(day), layout.flow.clamped(flow + half)));
            lower.push((layout.x.at(day), layout.flow.clamped(flow - half)));
        }
        let (mut fill, mut edges) = (Path::default(), Path::default());
        along(&mut edges, &upper);
        along(&mut edges, &lower);
        lower.reverse();
        upper.extend(lower);
        if along(&mut fill, &upper) {
            fill.close();
        }
        let beyond = class == "plot-band-beyond";
        let opacity = if beyond { "0.45" } else { "1" };
        svg.group(class, &[("fill", SAND), ("fill-opacity", opacity), ("stroke", "none")]);
        svg.path(&fill, &[]);
        let mut attributes =
            vec![("fill", "none"), ("stroke", INK), ("stroke-opacity", "0.4"), ("stroke-width", "0.6")];
        if beyond {
            attributes.push(("stroke-dasharray", "3 3"));
        }
        svg.path(&edges, &attributes);
        svg.end();
    }
}

/// A stroke through all places; whether there were any.
fn along(path: &mut Path, places: &[(f64, f64)]) -> bool {
    for (i, (x, y)) in places.iter().enumerate() {
        if i == 0 {
            path.move_to(*x, *y);
        } else {
            path.line_to(*x, *y);
        }
    }
    !places.is_empty()
}

fn draw_line(svg: &mut Svg, seen: &Seen, line: &Line, layout: &Layout) {
    let Some((from, to)) = line_reach(line, layout) else { return };
    let place = |day: f64| (layout.x.at(day), layout.flow.clamped(line.at(day)));
    let width = coordinate(0.14 * layout.body);
    let dashes = format!("{} {}", coordinate(0.55 * layout.body), coordinate(0.4 * layout.body));
    let (mut within, mut beyond) = (Path::default(), Path::default());
    let last = line.span.1.clamp(from, to);
    if from < last {
        within.stroke(place(from), place(last));
    }
    if last < to && !seen.marks.is_empty() {
        beyond.stroke(place(last), place(to));
    }
    svg.group("plot-line", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
    svg.path(&within, &[]);
    svg.path(&beyond, &[("class", "plot-line-beyond"), ("stroke-dasharray", &dashes)]);
    svg.end();
}

/// Strokes of a limit, each a list of places joined to one another.
pub(super) struct LimitStrokes {
    pub judged: Vec<Vec<(f64, f64)>>,
    /// From the latest run to the end of the panel.
    pub ahead: Option<((f64, f64), (f64, f64))>,
}

/// The lower (`pick` takes the first) or upper limit over the runs. Neighbours judged by the same limit are joined;
/// where the limit changed, each reaches a little to its side, and half way where there is no more room.
pub(super) fn limit_strokes(seen: &Seen, layout: &Layout, pick: impl Fn((f64, f64)) -> f64) -> LimitStrokes {
    let value = |i: usize| seen.marks.get(i)?.limits.map(&pick).filter(|l| seen.shows(*l));
    let x = |i: usize| layout.x.at(seen.marks[i].day);
    let overhang = OVERHANG * layout.body;
    let mut judged: Vec<Vec<(f64, f64)>> = Vec::new();
    let mut open: Vec<(f64, f64)> = Vec::new();
    for i in 0..seen.marks.len() {
        let Some(limit) = value(i) else { continue };
        let y = layout.flow.at(limit);
        if open.is_empty() {
            let room = if i == 0 { overhang } else { (x(i) - x(i - 1)) / 2.0 };
            open.push(((x(i) - overhang.min(room)).max(layout.panel.left), y));
        }
        let next = value(i + 1);
        if next.is_some_and(|next| (next - limit).abs() <= SAME_LIMIT * limit.abs()) {
            continue;
        }
        let room = if i + 1 < seen.marks.len() { (x(i + 1) - x(i)) / 2.0 } else { overhang };
        let end = (x(i) + overhang.min(room)).min(layout.panel.right);
        open.push((end, y));
        match next {
            // Where the two would touch anyway they are joined by a step.
            Some(next) if room <= overhang => open.push((end, layout.flow.at(next))),
            _ => judged.push(std::mem::take(&mut open)),
        }
    }
    let ahead = value(seen.marks.len().wrapping_sub(1)).and_then(|limit| {
        let y = layout.flow.at(limit);
        let from = judged.last().and_then(|s| s.last()).map_or(layout.panel.right, |end| end.0);
        (from < layout.panel.right).then_some(((from, y), (layout.panel.right, y)))
    });
    LimitStrokes { judged, ahead }
}

fn draw_limits(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let (mut judged, mut ahead) = (Path::default(), Path::default());
    for strokes in
        [limit_strokes(seen, layout, |limits| limits.0), limit_strokes(seen, layout, |limits| limits.1)]
    {
        for stroke in &strokes.judged {
            along(&mut judged, stroke);
        }
        if let Some((from, to)) = strokes.ahead {
            ahead.stroke(from, to);
        }
    }
    let width = coordinate(0.12 * layout.body);
    svg.group("plot-limits", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
    svg.path(&judged, &[]);
    svg.path(
        &ahead,
        &[("class", "plot-limits-ahead"), ("stroke-dasharray", "1 3"), ("stroke-linecap", "round")],
    );
    for (x, edge, outward) in limits_beyond(seen, layout) {
        svg.path(&arrow((x, edge), outward, 0.9 * layout.body), &[]);
    }
    svg.end();
}

/// Where the limits of the latest run lie beyond the panel: x, the edge, and in which direction.
pub(super) fn limits_beyond(seen: &Seen, layout: &Layout) -> Vec<(f64, f64, f64)> {
    let Some((low, high)) = seen.latest_limits() else { return Vec::new() };
    let x = layout.panel.right - 1.2 * layout.body;
    let mut arrows = Vec::new();
    if [low, high].into_iter().any(|l| l > seen.flows.1) {
        arrows.push((x, layout.panel.top, -1.0));
    }
    if [low, high].into_iter().any(|l| l < seen.flows.0) {
        arrows.push((x, layout.panel.bottom, 1.0));
    }
    arrows
}

/// The day the trend leaves the limits, as a dotted stroke over the whole panel.
fn draw_leaving(svg: &mut Svg, x: f64, layout: &Layout) {
    let mut path = Path::default();
    path.stroke((x, layout.panel.top), (x, layout.panel.bottom));
    svg.group("plot-leaving", &[("fill", "none"), ("stroke", INK), ("stroke-width", "1")]);
    svg.path(&path, &[("stroke-dasharray", "1 3"), ("stroke-linecap", "round")]);
    svg.end();
}

/// Size of the triangles of as-left runs.
pub(super) fn flag_size(seen: &Seen, layout: &Layout) -> f64 {
    (1.6 * radius(seen, layout.body)).max(0.4 * layout.body)
}

fn draw_as_left(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let places: Vec<f64> =
        seen.marks.iter().filter(|m| m.purpose == Purpose::AsLeft).map(|m| layout.x.at(m.day)).collect();
    if !places.is_empty() {
        draw_flags(svg, &places, layout.panel.bottom, flag_size(seen, layout));
    }
}

/// Half the width of the lips of bars.
pub(super) fn lip(seen: &Seen, layout: &Layout) -> f64 {
    if seen.marks.len() <= MOST_LIPS { 0.6 * radius(seen, layout.body) } else { 0.0 }
}

fn draw_bars(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let lip = lip(seen, layout);
    let mut path = Path::default();
    for m in seen.marks.iter().filter(|m| m.bar > 0.0) {
        let x = layout.x.at(m.day);
        let ends = [m.flow - m.bar, m.flow + m.bar];
        path.stroke((x, layout.flow.clamped(ends[0])), (x, layout.flow.clamped(ends[1])));
        for end in ends.into_iter().filter(|end| lip > 0.0 && seen.shows(*end)) {
            path.stroke((x - lip, layout.flow.at(end)), (x + lip, layout.flow.at(end)));
        }
    }
    let width = coordinate(hair(radius(seen, layout.body)));
    let opacity = if seen.marks.len() > MANY { "0.35" } else { "1" };
    svg.group(
        "plot-bars",
        &[("fill", "none"), ("stroke", INK), ("stroke-width", &width), ("stroke-opacity", opacity)],
    );
    svg.path(&path, &[]);
    svg.end();
}

fn draw_runs(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let r = radius(seen, layout.body);
    let tell = seen.marks.len() <= MOST_TOLD;
    for verdict in DRAWING_ORDER {
        let signs: Vec<Sign> = seen
            .marks
            .iter()
            .filter(|m| m.verdict == verdict)
            .map(|m| Sign {
                x: layout.x.at(m.day),
                y: layout.flow.at(m.flow),
                told: tell.then(|| told(m, seen)),
            })
            .collect();
        draw_signs(svg, verdict, &signs, r, (layout.transparent, seen.marks.len() > MANY));
    }
}

fn draw_changed(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let rings: Vec<(f64, f64)> = seen
        .marks
        .iter()
        .filter(|m| m.changed().is_some())
        .map(|m| (layout.x.at(m.day), layout.flow.at(m.flow)))
        .collect();
    if !rings.is_empty() {
        draw_rings(svg, &rings, radius(seen, layout.body), layout.body);
    }
}
