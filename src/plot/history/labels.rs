//! Words in the panel: E_n beside the runs that changed, and when the trend leaves the limits.
//!
//! Comes in: what is drawn, in pixels. Goes out: texts that stand on nothing and on none of one another. Where
//! everything near is taken there is no text: the ring still marks the run, and the margin says when the trend leaves.
//! The largest E_n are placed first.

use super::dates::month;
use super::layout::{Frame, Layout, tick_size};
use super::marks::{radius, ring_radius};
use super::panel::{flag_size, leaving, limit_strokes, limits_beyond, line_reach, lip};
use super::seen::{Mark, Seen};
use super::words::en;
use crate::entry::Purpose;

use super::super::ink::{BRICK, INK};
use super::super::letters::{Weight, width};
use super::super::svg::{Anchor, Svg, Text};

/// Places at which the trend is looked at.
const LINE_STEPS: u32 = 96;
/// No more labels than this are tried: more would not be read.
const MOST_LABELS: usize = 40;

struct Label {
    text: String,
    frame: Frame,
    fill: &'static str,
    class: &'static str,
}

/// Draws the words.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let mut taken = taken(seen, layout);
    let mut labels: Vec<Label> = Vec::new();
    let mut changed: Vec<(&Mark, f64)> =
        seen.marks.iter().filter_map(|m| m.changed().map(|en| (m, en))).collect();
    changed.sort_by(|a, b| b.1.abs().total_cmp(&a.1.abs()));
    for (mark, value) in changed.into_iter().take(MOST_LABELS) {
        let text = en(value);
        if let Some(frame) = first_free(around(mark, value, &text, seen, layout), &taken, layout) {
            let gap = 0.5 * layout.body;
            taken.push(Frame { left: frame.left - gap, right: frame.right + gap, ..frame });
            labels.push(Label { text, frame, fill: BRICK, class: "plot-en" });
        }
    }
    if let Some(label) = leaving_label(seen, layout, &taken) {
        labels.push(label);
    }
    svg.group("plot-panel-labels", &[]);
    for label in labels {
        svg.text(&Text {
            x: label.frame.left,
            y: (label.frame.top + label.frame.bottom) / 2.0 + 0.36 * tick_size(layout.body),
            size: tick_size(layout.body),
            anchor: Anchor::Start,
            fill: label.fill,
            muted: false,
            class: label.class,
            pieces: &[(&label.text, Weight::Regular)],
        });
    }
    svg.end();
}

/// Places for a text about a run, the best first: beyond the bar on the side it moved to, then beside the sign.
fn around(mark: &Mark, value: f64, text: &str, seen: &Seen, layout: &Layout) -> Vec<Frame> {
    let (size, wide) = (tick_size(layout.body), width(text, tick_size(layout.body), Weight::Regular));
    let (x, y) = (layout.x.at(mark.day), layout.flow.at(mark.flow));
    let ring = ring_radius(radius(seen, layout.body), layout.body);
    let away = 0.35 * layout.body;
    let above = layout.flow.clamped(mark.flow + mark.bar).min(y - ring) - away - 0.6 * size;
    let below = layout.flow.clamped(mark.flow - mark.bar).max(y + ring) + away + 0.6 * size;
    let (first, second) = if value < 0.0 { (below, above) } else { (above, below) };
    let frame = |left: f64, middle: f64| Frame {
        left,
        top: middle - 0.6 * size,
        right: left + wide,
        bottom: middle + 0.6 * size,
    };
    let mut places = Vec::new();
    for middle in [first, second] {
        places.extend([0.5, 0.25, 0.75, 0.0, 1.0].map(|share| frame(x - share * wide, middle)));
    }
    for shift in [0.0, 0.9, -0.9] {
        let middle = y - value.signum() * shift * size;
        places.extend([frame(x + ring + away, middle), frame(x - ring - away - wide, middle)]);
    }
    places
}

fn first_free(places: Vec<Frame>, taken: &[Frame], layout: &Layout) -> Option<Frame> {
    places.into_iter().find(|f| layout.panel.holds(f) && !taken.iter().any(|t| t.meets(f)))
}

/// The date beside the dotted stroke, at its upper or lower end or wherever there is room.
fn leaving_label(seen: &Seen, layout: &Layout, taken: &[Frame]) -> Option<Label> {
    let (x, _) = leaving(seen, layout)?;
    let (day, _) = seen.line.as_ref()?.leaves?;
    let size = tick_size(layout.body);
    let texts = [format!("leaves the limits about {}", month(day)), month(day)];
    texts.into_iter().find_map(|text| {
        let wide = width(&text, size, Weight::Regular);
        let (top, bottom) = (layout.panel.top + size, layout.panel.bottom - size);
        let places = (0..=8).map(|i| top + (bottom - top) * f64::from(i) / 8.0).flat_map(|middle| {
            [x - 0.5 * layout.body - wide, x + 0.5 * layout.body].map(|left| Frame {
                left,
                top: middle - 0.6 * size,
                right: left + wide,
                bottom: middle + 0.6 * size,
            })
        });
        let frame = first_free(places.collect(), taken, layout)?;
        Some(Label { text, frame, fill: INK, class: "plot-leaving-label" })
    })
}

/// What runs, bars, limits, trend and triangles occupy.
fn taken(seen: &Seen, layout: &Layout) -> Vec<Frame> {
    let r = radius(seen, layout.body);
    let ring = ring_radius(r, layout.body);
    let lip = lip(seen, layout).max(0.1 * layout.body);
    let mut taken = Vec::new();
    for m in &seen.marks {
        let (x, y) = (layout.x.at(m.day), layout.flow.at(m.flow));
        let sign = if m.changed().is_some() { ring } else { 1.4 * r };
        taken.push(Frame { left: x - sign, top: y - sign, right: x + sign, bottom: y + sign });
        taken.push(Frame {
            left: x - lip,
            top: layout.flow.clamped(m.flow + m.bar),
            right: x + lip,
            bottom: layout.flow.clamped(m.flow - m.bar),
        });
        if m.purpose == Purpose::AsLeft {
            let flag = flag_size(seen, layout);
            let bottom = layout.panel.bottom;
            taken.push(Frame { left: x - flag, top: bottom - flag, right: x + flag, bottom });
        }
    }
    let mut stroke = |a: (f64, f64), b: (f64, f64)| {
        let around = 0.12 * layout.body;
        taken.push(Frame {
            left: a.0.min(b.0) - around,
            right: a.0.max(b.0) + around,
            top: a.1.min(b.1) - around,
            bottom: a.1.max(b.1) + around,
        });
    };
    for strokes in
        [limit_strokes(seen, layout, |limits| limits.0), limit_strokes(seen, layout, |limits| limits.1)]
    {
        for places in &strokes.judged {
            places.windows(2).for_each(|pair| stroke(pair[0], pair[1]));
        }
        if let Some((from, to)) = strokes.ahead {
            stroke(from, to);
        }
    }
    for (x, edge, outward) in limits_beyond(seen, layout) {
        stroke((x - layout.body, edge), (x + layout.body, edge - outward * 1.5 * layout.body));
    }
    if let Some((x, _)) = leaving(seen, layout) {
        stroke((x, layout.panel.top), (x, layout.panel.bottom));
    }
    if let Some((line, (from, to))) =
        seen.line.as_ref().and_then(|line| Some((line, line_reach(line, layout)?)))
    {
        let place = |i: u32| {
            let day = from + (to - from) * f64::from(i) / f64::from(LINE_STEPS);
            (layout.x.at(day), layout.flow.clamped(line.at(day)))
        };
        (0..LINE_STEPS).for_each(|i| stroke(place(i), place(i + 1)));
    }
    taken
}
