//! The strip below: what is left of each point when the line is taken off.
//!
//! Comes in: what is drawn and where. Goes out: residuals with bars (both axes together), the line as nought, and the
//! line's own 95 % band where it is narrow enough to say something. A point left out that lies beyond the strip
//! becomes an arrow at its edge with the residual in numbers beside it, where there is room for it.

use super::flow_panel::MOST_TOLD;
use super::layout::{Frame, Layout};
use super::marks::{DRAWING_ORDER, arrow, begin, cross_of, hair, radius, sign, told};
use super::seen::{Mark, Seen};
use crate::bench::Analysis;

use super::super::ink::{INK, SAND, SEA_GLASS};
use super::super::letters::{Weight, width};
use super::super::number::{coordinate, fixed};
use super::super::svg::{Anchor, Path, Svg, Text};

/// Places at which the band is worked out.
const BAND_STEPS: u32 = 48;

/// Draws the strip.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, analysis: &Analysis, layout: &Layout) {
    draw_band(svg, seen, analysis, layout);
    let nought = layout.residual.at(0.0);
    let mut path = Path::default();
    path.stroke((layout.strip.left, nought), (layout.strip.right, nought));
    let width = coordinate(0.12 * layout.body);
    svg.group("plot-line", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
    svg.path(&path, &[]);
    svg.end();
    draw_bars(svg, seen, layout);
    draw_points(svg, seen, layout);
    draw_values_beyond(svg, seen, layout);
}

/// Whether a point lies above or below the strip.
pub(super) fn beyond(m: &Mark, seen: &Seen) -> bool {
    (seen.pressures.0..=seen.pressures.1).contains(&m.pressure) && m.residual.abs() > seen.residual_reach
}

/// The band about nought, within the span of the points, unless it is wider than the strip and says nothing there.
fn draw_band(svg: &mut Svg, seen: &Seen, analysis: &Analysis, layout: &Layout) {
    let (from, to) = seen.span;
    if from >= to {
        return;
    }
    let edge: Option<Vec<(f64, f64)>> = (0..=BAND_STEPS)
        .map(|i| {
            let pressure = from + (to - from) * f64::from(i) / f64::from(BAND_STEPS);
            let expanded = analysis.line.flow_at(pressure / seen.shown.units.pressure(1.0)).expanded();
            let expanded = expanded * seen.shown.residual_per_l_min;
            (expanded <= seen.residual_reach).then_some((pressure, expanded))
        })
        .collect();
    let Some(edge) = edge else { return };
    let mut path = Path::default();
    for (i, (pressure, expanded)) in edge.iter().enumerate() {
        let place = (layout.x.at(*pressure), layout.residual.at(*expanded));
        if i == 0 {
            path.move_to(place.0, place.1);
        } else {
            path.line_to(place.0, place.1);
        }
    }
    for (pressure, expanded) in edge.iter().rev() {
        path.line_to(layout.x.at(*pressure), layout.residual.at(-expanded));
    }
    path.close();
    svg.group("plot-band", &[("fill", SAND), ("stroke", "none")]);
    svg.path(&path, &[]);
    svg.end();
}

fn draw_bars(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let mut path = Path::default();
    for m in seen.marks.iter().filter(|m| in_view(m, seen) && m.residual_bar > 0.0) {
        let x = layout.x.at(m.pressure);
        let ends = (m.residual - m.residual_bar, m.residual + m.residual_bar);
        path.stroke((x, layout.residual.clamped(ends.0)), (x, layout.residual.clamped(ends.1)));
    }
    let width = coordinate(hair(radius(seen, layout.body)));
    svg.group("plot-bars", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
    svg.path(&path, &[]);
    svg.end();
}

fn draw_points(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let r = 0.9 * radius(seen, layout.body);
    let tell = seen.marks.len() <= MOST_TOLD;
    for kind in DRAWING_ORDER {
        let of_kind = |m: &&Mark| (cross_of(&m.how), m.shape) == kind && layout.x.shows(m.pressure);
        let mut marks = seen.marks.iter().filter(of_kind).peekable();
        if marks.peek().is_none() {
            continue;
        }
        begin(svg, kind, r, layout.transparent);
        for m in marks {
            let x = layout.x.at(m.pressure);
            let path = if in_view(m, seen) {
                sign(kind, x, layout.residual.at(m.residual), r)
            } else {
                let (edge, outward) = edge_of(m, layout);
                arrow((x, edge), (0.0, outward), 0.7 * layout.body)
            };
            if tell {
                svg.path_with_title(&path, &told(m, seen));
            } else {
                svg.path(&path, &[]);
            }
        }
        svg.end();
    }
}

fn in_view(m: &Mark, seen: &Seen) -> bool {
    (seen.pressures.0..=seen.pressures.1).contains(&m.pressure) && m.residual.abs() <= seen.residual_reach
}

/// The edge of the strip beyond which a point lies, and which way that is.
fn edge_of(m: &Mark, layout: &Layout) -> (f64, f64) {
    if m.residual > 0.0 { (layout.strip.top, -1.0) } else { (layout.strip.bottom, 1.0) }
}

/// The residuals beyond the strip in numbers, the largest first, as far as they do not touch anything.
fn draw_values_beyond(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let size = (0.85 * layout.body).max(8.0);
    let r = radius(seen, layout.body);
    let mut marks: Vec<&Mark> = seen.marks.iter().filter(|m| beyond(m, seen)).collect();
    marks.sort_by(|a, b| b.residual.abs().total_cmp(&a.residual.abs()).then(a.index.cmp(&b.index)));
    // Nothing may stand on arrows or on residuals with their bars.
    let mut taken: Vec<Frame> = marks
        .iter()
        .map(|m| {
            let (x, (edge, outward)) = (layout.x.at(m.pressure), edge_of(m, layout));
            let foot = edge - 1.1 * layout.body * outward;
            Frame {
                left: x - 0.35 * layout.body,
                right: x + 0.35 * layout.body,
                top: foot.min(edge),
                bottom: foot.max(edge),
            }
        })
        .collect();
    taken.extend(seen.marks.iter().filter(|m| in_view(m, seen)).map(|m| {
        let (x, reach) = (layout.x.at(m.pressure), m.residual_bar);
        Frame {
            left: x - r,
            right: x + r,
            top: layout.residual.clamped(m.residual + reach).min(layout.residual.at(m.residual) - r),
            bottom: layout.residual.clamped(m.residual - reach).max(layout.residual.at(m.residual) + r),
        }
    }));
    svg.group("plot-values-beyond", &[]);
    for m in marks {
        let text = fixed(m.residual, decimals_of_a_value_beyond(m.residual));
        let wide = width(&text, size, Weight::Regular);
        let (x, (edge, outward)) = (layout.x.at(m.pressure), edge_of(m, layout));
        let middle = edge - 0.75 * layout.body * outward;
        let at = |left: f64| Frame {
            left,
            right: left + wide,
            top: middle - 0.58 * size,
            bottom: middle + 0.62 * size,
        };
        let gap = 0.45 * layout.body;
        let free = |f: &Frame| layout.strip.holds(f) && !taken.iter().any(|t| t.meets(f));
        if let Some(frame) = [at(x + gap), at(x - gap - wide)].into_iter().find(free) {
            svg.text(&Text {
                x: frame.left,
                y: middle + 0.36 * size,
                size,
                anchor: Anchor::Start,
                fill: INK,
                muted: false,
                class: "plot-value-beyond",
                pieces: &[(&text, Weight::Regular)],
            });
            taken.push(frame);
        }
    }
    svg.end();
}

/// Two digits or the whole number, whichever is more.
fn decimals_of_a_value_beyond(residual: f64) -> usize {
    (1 - super::super::number::exponent(residual)).clamp(0, 6) as usize
}
