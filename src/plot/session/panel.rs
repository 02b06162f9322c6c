//! The main panel of a session: spans, hatches, uprights, limits, cells, the mean of the agreeing ones, fitted slopes.
//!
//! Comes in: what is drawn and where. Goes out: marks inside the panel's frame; what would leave it is left out by
//! arithmetic, so that no clipping path is needed.

use super::lanes::Told;
use super::layout::Layout;
use super::seen::Seen;
use super::signs::{
    begin_cell, begin_cell_marks, begin_fits, begin_series, cell_mark, dash, draw_hatch, draw_span,
};
use super::trace::{Thinning, strokes};

use super::super::axes::tick_size;
use super::super::frame::Frame;
use super::super::ink::{BRICK, INK};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// Stretches of one reason nearer than this in pixels are drawn as one.
const TOGETHER_PX: f64 = 0.8;
/// From so many events on their uprights are drawn lighter.
const MANY: usize = 20;

/// Draws the panel.
pub(super) fn draw(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    for fit in &seen.fits {
        let (left, right) = (layout.x.clamped(fit.segment.from_s), layout.x.clamped(fit.segment.to_s));
        draw_span(svg, &Frame { left, right, ..layout.main });
    }
    for (reason, frame) in stretch_frames(seen, layout) {
        draw_hatch(svg, reason, &frame, layout.body);
    }
    draw_uprights(svg, seen, layout);
    draw_limits(svg, seen, layout);
    draw_cells(svg, seen, layout);
    draw_fits(svg, seen, layout);
    draw_series(svg, seen, layout);
    draw_jumps(svg, seen, layout);
}

/// The stretches that are not used, as rectangles.
pub(super) fn stretch_frames(seen: &Seen<'_>, layout: &Layout) -> Vec<(super::stretches::Reason, Frame)> {
    let mut frames: Vec<(super::stretches::Reason, Frame)> = Vec::new();
    for stretch in &seen.stretches {
        let (left, right) = (layout.x.clamped(stretch.from_s), layout.x.clamped(stretch.to_s));
        match frames.last_mut() {
            Some((reason, last)) if *reason == stretch.reason && left - last.right < TOGETHER_PX => {
                last.right = right;
            }
            _ => frames.push((stretch.reason, Frame { left, right, ..layout.main })),
        }
    }
    frames
}

fn draw_uprights(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    let many = layout.events.items.len() > MANY;
    for item in &layout.events.items {
        let Some(mark) = seen.marks.get(item.index) else { continue };
        // Down to the sign, or onto the number that stands in its place.
        let over = if layout.events.told == Told::Numbered { 0.62 * tick_size(layout.body) } else { 0.0 };
        let foot = layout.event_y(item.row) - over;
        let mut path = Path::default();
        path.stroke((item.x, layout.main.top), (item.x, foot));
        let width = coordinate(if many { 0.06 } else { 0.09 } * layout.body);
        let opacity = if many { "0.45" } else { "1" };
        let mut attributes = vec![
            ("fill", "none"),
            ("stroke", INK),
            ("stroke-opacity", opacity),
            ("stroke-width", width.as_str()),
        ];
        let dashes = dash(mark.happened, layout.body);
        if let Some(dashes) = &dashes {
            attributes.extend([("stroke-dasharray", dashes.as_str()), ("stroke-linecap", "round")]);
        }
        svg.group("plot-upright", &attributes);
        svg.path(&path, &[]);
        svg.end();
    }
}

fn draw_limits(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    let (main, body) = (layout.main, layout.body);
    let dashes = format!("{} {}", coordinate(1.2 * body), coordinate(0.5 * body));
    for (limit, passed) in [(seen.limits.0, seen.passed.0), (seen.limits.1, seen.passed.1)] {
        if !layout.po2.shows(limit) {
            continue;
        }
        let y = layout.po2.at(limit);
        let mut path = Path::default();
        path.stroke((main.left, y), (main.right, y));
        let stroke = if passed.is_some() { BRICK } else { INK };
        let width = if passed.is_some() { "1.4" } else { "0.9" };
        let attributes = [
            ("fill", "none"),
            ("stroke", stroke),
            ("stroke-width", width),
            ("stroke-dasharray", dashes.as_str()),
        ];
        svg.group("plot-limit", &attributes);
        svg.path(&path, &[]);
        svg.end();
    }
}

/// How readings of this session are thinned.
fn thinning(seen: &Seen<'_>, layout: &Layout) -> Thinning {
    Thinning {
        left: layout.main.left,
        width: layout.main.width(),
        longest: layout.x.at(seen.times.0 + seen.gap_s) - layout.main.left,
    }
}

/// A place in pixels; a y that is none where there is nothing within the panel.
fn place(layout: &Layout, at_s: f64, po2: f64) -> (f64, f64) {
    let y = if layout.po2.shows(po2) { layout.po2.at(po2) } else { f64::NAN };
    (layout.x.at(at_s), y)
}

/// The strokes of each cell in pixels.
pub(super) fn cell_strokes(seen: &Seen<'_>, layout: &Layout) -> Vec<Vec<Vec<(f64, f64)>>> {
    let thinning = thinning(seen, layout);
    let of = |cell: &super::seen::Cell<'_>| {
        let rows = seen.rows().filter(|row| layout.x.shows(seen.time_s[*row]));
        strokes(rows.map(|row| place(layout, seen.time_s[row], cell.at(row))), &thinning)
    };
    seen.cells.iter().map(of).collect()
}

/// The strokes of the mean of the agreeing cells in pixels.
pub(super) fn series_strokes(seen: &Seen<'_>, layout: &Layout) -> Vec<Vec<(f64, f64)>> {
    let shown = seen.series.iter().filter(|(t, _)| layout.x.shows(*t));
    strokes(shown.map(|(t, p)| place(layout, *t, *p)), &thinning(seen, layout))
}

fn draw_cells(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    let drawn = cell_strokes(seen, layout);
    for (cell, strokes) in seen.cells.iter().zip(&drawn) {
        begin_cell(svg, cell.index, layout.body);
        svg.path(&through(strokes), &[]);
        svg.end();
    }
    begin_cell_marks(svg, layout.transparent);
    let (r, count) = (0.26 * layout.body, drawn.len().max(1) as f64);
    let every = (6.0 * layout.body).max(layout.main.width() / 14.0);
    for (i, (cell, strokes)) in seen.cells.iter().zip(&drawn).enumerate() {
        let mut marks = Path::default();
        let mut next = layout.main.left + every * (i as f64 + 0.5) / count;
        for (x, y) in strokes.iter().flatten() {
            if *x >= next {
                cell_mark(&mut marks, cell.index, (*x, *y), r);
                next += every * libm::ceil((x - next) / every).max(1.0);
            }
        }
        svg.path(&marks, &[]);
    }
    svg.end();
}

fn draw_series(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    begin_series(svg, layout.body);
    svg.path(&through(&series_strokes(seen, layout)), &[]);
    svg.end();
}

/// One path through all strokes; a single place is a dot.
fn through(strokes: &[Vec<(f64, f64)>]) -> Path {
    let mut path = Path::default();
    for stroke in strokes {
        for (i, (x, y)) in stroke.iter().enumerate() {
            if i == 0 {
                path.move_to(*x, *y);
            } else {
                path.line_to(*x, *y);
            }
        }
        if let [(x, y)] = stroke.as_slice() {
            path.line_to(x + 0.01, *y);
        }
    }
    path
}

fn draw_fits(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    begin_fits(svg, layout.body);
    for fit in &seen.fits {
        svg.path(&through(&[fit_places(fit, layout)]), &[]);
    }
    svg.end();
    // The line itself, thin over the broad stroke, and a foot at each end.
    let width = coordinate(0.08 * layout.body);
    svg.group("plot-fit-ends", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
    let (mut ends, half) = (Path::default(), 0.55 * layout.body);
    for fit in &seen.fits {
        let places = fit_places(fit, layout);
        for (x, y) in [places.first(), places.last()].into_iter().flatten() {
            ends.stroke((*x, y - half), (*x, y + half));
        }
    }
    svg.path(&ends, &[]);
    svg.end();
}

/// A fitted slope in pixels, as far as it lies within the panel.
pub(super) fn fit_places(fit: &super::seen::Fit, layout: &Layout) -> Vec<(f64, f64)> {
    let within = fit.line.iter().all(|(t, p)| layout.x.shows(*t) && layout.po2.shows(*p));
    let at = |(t, p): &(f64, f64)| (layout.x.at(*t), layout.po2.at(*p));
    if within { fit.line.iter().map(at).collect() } else { Vec::new() }
}

fn draw_jumps(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    if seen.jumps.is_empty() {
        return;
    }
    let body = layout.body;
    let width = coordinate(0.12 * body);
    let dashes = format!("{} {}", coordinate(0.2 * body), coordinate(0.2 * body));
    let attributes = [
        ("fill", "none"),
        ("stroke", BRICK),
        ("stroke-width", width.as_str()),
        ("stroke-dasharray", dashes.as_str()),
    ];
    svg.group("plot-jump", &attributes);
    for jump in seen.jumps.iter().filter(|j| layout.x.shows(j.at_s)) {
        let x = layout.x.at(jump.at_s);
        let mut path = Path::default();
        path.stroke((x, layout.main.top), (x, layout.main.bottom));
        svg.path(&path, &[]);
    }
    svg.end();
}
