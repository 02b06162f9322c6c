//! The main panel: points with bars, the line with its band, the acceptance window.
//!
//! Comes in: what is drawn and where. Goes out: marks inside the panel's frame; what would leave it is cut at the
//! frame by arithmetic, so that no clipping path is needed.

use super::layout::{Frame, Layout};
use super::limits;
use super::marks::{DRAWING_ORDER, arrow, begin, cross_of, hair, radius, sign, told};
use super::seen::{Mark, Nominal, Seen};
use crate::bench::Analysis;

use super::super::frame::hatch;
use super::super::ink::{INK, SAND, SEA_GLASS};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// Places at which the curved edges of the band are worked out.
const BAND_STEPS: u32 = 64;
/// Beyond this many points they do not say their numbers when pointed at: the picture would grow heavy.
pub(super) const MOST_TOLD: usize = 400;

/// Draws the panel.
pub(super) fn draw(svg: &mut Svg, seen: &Seen, analysis: &Analysis, layout: &Layout) {
    let line = Drawn::of(seen, analysis);
    draw_band(svg, seen, analysis, layout, &line);
    draw_line(svg, seen, layout, &line);
    draw_window(svg, seen, layout);
    draw_bars(svg, seen, layout);
    draw_points(svg, seen, layout);
    limits::draw(svg, seen, layout, &line);
}

/// The line in shown units, and between which pressures it is drawn.
pub(super) struct Drawn {
    intercept: f64,
    slope: f64,
    /// Where it lies within the panel and above no flow; none when nowhere.
    pub(super) reach: Option<(f64, f64)>,
}

impl Drawn {
    fn of(seen: &Seen, analysis: &Analysis) -> Self {
        let fit = &analysis.line.random;
        let units = &seen.shown.units;
        let intercept = units.flow(fit.intercept);
        let slope = units.slope(fit.slope);
        let (low, high) = (seen.flows.0.max(0.0), seen.flows.1);
        let reach = if !(intercept.is_finite() && slope.is_finite()) || low >= high {
            None
        } else if slope.abs() > 0.0 {
            let (a, b) = ((low - intercept) / slope, (high - intercept) / slope);
            Some((a.min(b).max(seen.pressures.0), a.max(b).min(seen.pressures.1)))
        } else {
            (low..=high).contains(&intercept).then_some(seen.pressures)
        };
        Self { intercept, slope, reach: reach.filter(|(from, to)| from < to) }
    }

    pub(super) fn at(&self, pressure: f64) -> f64 {
        self.intercept + self.slope * pressure
    }

    /// The parts below, within and above the span of the points, each none when empty.
    fn parts(&self, span: (f64, f64)) -> [Option<(f64, f64)>; 3] {
        let Some((from, to)) = self.reach else { return [None; 3] };
        let part = |low: f64, high: f64| (low < high).then_some((low, high));
        [part(from, to.min(span.0)), part(from.max(span.0), to.min(span.1)), part(from.max(span.1), to)]
    }
}

fn draw_band(svg: &mut Svg, seen: &Seen, analysis: &Analysis, layout: &Layout, line: &Drawn) {
    let units = &seen.shown.units;
    let places = ["plot-band-beyond", "plot-band", "plot-band-beyond"];
    for (part, class) in line.parts(seen.span).into_iter().zip(places) {
        let Some((from, to)) = part else { continue };
        let (mut upper, mut lower) = (Vec::new(), Vec::new());
        for i in 0..=BAND_STEPS {
            let pressure = from + (to - from) * f64::from(i) / f64::from(BAND_STEPS);
            let expanded = units.flow(analysis.line.flow_at(pressure / units.pressure(1.0)).expanded());
            if expanded.is_finite() {
                let x = layout.x.at(pressure);
                upper.push((x, layout.flow.clamped(line.at(pressure) + expanded)));
                lower.push((x, layout.flow.clamped(line.at(pressure) - expanded)));
            }
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

fn draw_line(svg: &mut Svg, seen: &Seen, layout: &Layout, line: &Drawn) {
    let place = |pressure: f64| (layout.x.at(pressure), layout.flow.clamped(line.at(pressure)));
    let [below, within, above] = line.parts(seen.span);
    let width = coordinate(0.14 * layout.body);
    let dashes = format!("{} {}", coordinate(0.55 * layout.body), coordinate(0.4 * layout.body));
    svg.group("plot-line", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
    let mut path = Path::default();
    if let Some((from, to)) = within {
        path.stroke(place(from), place(to));
    }
    svg.path(&path, &[]);
    let mut path = Path::default();
    for (from, to) in [below, above].into_iter().flatten() {
        path.stroke(place(from), place(to));
    }
    svg.path(&path, &[("class", "plot-line-beyond"), ("stroke-dasharray", &dashes)]);
    svg.end();
}

/// Half the width of the window in pixels.
pub(super) fn window_half_width(layout: &Layout) -> f64 {
    1.25 * layout.body
}

/// The window as a pair of brackets with the nominal flow as a tick on both, the flow found there as a hatched box,
/// and a dotted stroke up to the pressure it is judged at.
fn draw_window(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let Some(nominal) = seen.nominal else { return };
    let x = layout.x.at(nominal.pressure);
    let half = window_half_width(layout);
    let flow = (nominal.flow - nominal.expanded, nominal.flow + nominal.expanded);
    let mut guide = Path::default();
    let mut dotted = |from: f64, to: f64| {
        if from > to {
            guide.stroke((x, layout.flow.clamped(from)), (x, layout.flow.clamped(to)));
        }
    };
    // From the axis down to the upper of the two, and on to the lower one where they lie apart.
    match seen.window_in_view() {
        Some(window) => {
            dotted(seen.flows.1, window.high.max(flow.1));
            dotted(window.low.max(flow.0), window.high.min(flow.1));
        }
        None => dotted(seen.flows.1, flow.1),
    }
    svg.group("plot-window", &[("fill", "none"), ("stroke", INK)]);
    svg.path(&guide, &[("stroke-width", "0.9"), ("stroke-dasharray", "1 3"), ("stroke-linecap", "round")]);
    draw_flow_box(svg, &nominal, layout, x, half - 0.35 * layout.body);
    if let Some(window) = seen.window_in_view() {
        let (high, low) = (layout.flow.at(window.high), layout.flow.at(window.low));
        let lip = 0.5 * layout.body;
        let mut brackets = Path::default();
        for side in [-1.0, 1.0] {
            let back = x + side * half;
            brackets
                .move_to(back - side * lip, high)
                .line_to(back, high)
                .line_to(back, low)
                .line_to(back - side * lip, low);
            if layout.flow.shows(window.nominal) {
                let middle = layout.flow.at(window.nominal);
                brackets.stroke((back, middle), (back + side * lip, middle));
            }
        }
        svg.path(&brackets, &[("class", "plot-limits"), ("stroke-width", &coordinate(0.12 * layout.body))]);
    } else if let Some(window) = seen.window {
        let (edge, outward) =
            if window.nominal > seen.flows.1 { (layout.main.top, -1.0) } else { (layout.main.bottom, 1.0) };
        let path = arrow((x, edge), (0.0, outward), 0.9 * layout.body);
        svg.path(&path, &[("class", "plot-limits"), ("stroke-width", "1.4")]);
    }
    svg.end();
}

/// The interval of the flow as a box with slanting hatch.
fn draw_flow_box(svg: &mut Svg, nominal: &Nominal, layout: &Layout, x: f64, half: f64) {
    let top = layout.flow.clamped(nominal.flow + nominal.expanded);
    let bottom = layout.flow.clamped(nominal.flow - nominal.expanded);
    let frame = Frame { left: x - half, top, right: x + half, bottom };
    let mut outline = Path::default();
    outline
        .move_to(frame.left, frame.top)
        .line_to(frame.right, frame.top)
        .line_to(frame.right, frame.bottom)
        .line_to(frame.left, frame.bottom)
        .close();
    svg.path(&hatch(&frame, 0.28 * layout.body), &[("stroke-width", "0.7")]);
    svg.path(&outline, &[("class", "plot-flow-at-nominal"), ("stroke-width", "1")]);
}

fn draw_bars(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let mut path = Path::default();
    for m in seen.marks.iter().filter(|m| in_view(m, seen)) {
        let (x, y) = (layout.x.at(m.pressure), layout.flow.at(m.flow));
        if m.pressure_bar > 0.0 {
            let ends = (m.pressure - m.pressure_bar, m.pressure + m.pressure_bar);
            path.stroke((layout.x.clamped(ends.0), y), (layout.x.clamped(ends.1), y));
        }
        if m.flow_bar > 0.0 {
            let ends = (m.flow - m.flow_bar, m.flow + m.flow_bar);
            path.stroke((x, layout.flow.clamped(ends.0)), (x, layout.flow.clamped(ends.1)));
        }
    }
    let width = coordinate(hair(radius(seen, layout.body)));
    svg.group("plot-bars", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
    svg.path(&path, &[]);
    svg.end();
}

fn draw_points(svg: &mut Svg, seen: &Seen, layout: &Layout) {
    let r = radius(seen, layout.body);
    let tell = seen.marks.len() <= MOST_TOLD;
    for kind in DRAWING_ORDER {
        let mut marks = seen.marks.iter().filter(|m| (cross_of(&m.how), m.shape) == kind).peekable();
        if marks.peek().is_none() {
            continue;
        }
        begin(svg, kind, r, layout.transparent);
        for m in marks {
            let path = if in_view(m, seen) {
                sign(kind, layout.x.at(m.pressure), layout.flow.at(m.flow), r)
            } else {
                arrow_beyond(m, seen, layout)
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

/// An arrow at the edge beyond which a point lies; to the side when its pressure is beyond.
fn arrow_beyond(m: &Mark, seen: &Seen, layout: &Layout) -> Path {
    let size = 0.75 * layout.body;
    let (main, corner) = (layout.main, 0.6 * size);
    let (x, y) = (layout.x.clamped(m.pressure), layout.flow.clamped(m.flow));
    if !(seen.pressures.0..=seen.pressures.1).contains(&m.pressure) {
        let outward = if m.pressure > seen.pressures.1 { 1.0 } else { -1.0 };
        arrow((x, y.clamp(main.top + corner, main.bottom - corner)), (outward, 0.0), size)
    } else {
        let outward = if m.flow > seen.flows.1 { -1.0 } else { 1.0 };
        arrow((x.clamp(main.left + corner, main.right - corner), y), (0.0, outward), size)
    }
}

/// Whether a point lies within the panel.
pub(super) fn in_view(m: &Mark, seen: &Seen) -> bool {
    (seen.pressures.0..=seen.pressures.1).contains(&m.pressure)
        && (seen.flows.0..=seen.flows.1).contains(&m.flow)
}
