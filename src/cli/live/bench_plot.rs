//! The points of a run with their line, in the cells of a terminal.

use ratatui::layout::Rect;
use ratatui::style::{Color, Style};

use super::bench_draw::mark;
use super::pen::Pen;
use super::plane::{Plane, Span};
use crate::report::bench_live::BenchView;
use crate::report::live_parts::DialKind;

/// Draws points, line, limits and the live value; says so where there is nothing to draw.
pub(super) fn draw(pen: &mut Pen<'_>, area: Rect, view: &BenchView) {
    let live =
        view.pressure.value.zip(view.flow.value).filter(|_| view.pressure.is_alive() && view.flow.is_alive());
    let mut x = Span::empty();
    let mut y = Span::empty();
    for point in &view.points {
        x.take(point.pressure_bar);
        y.take(point.flow_l_min);
    }
    if let Some((pressure, flow)) = live {
        x.take(pressure);
        y.take(flow);
    }
    if view.points.is_empty() {
        let says = "no points yet: set a pressure, and wait until it is steady";
        let lines: Vec<(String, Style)> = super::pen::wrap(says, usize::from(area.width))
            .into_iter()
            .map(|line| (line, pen.look.faint()))
            .collect();
        pen.lines(area, &lines);
        return;
    }
    if let Some((low, high)) = view.sweep.span_bar {
        x.take(low);
        x.take(high);
    }
    if let Some((ip, low, high)) = view.limits.filter(|(ip, ..)| x.holds(*ip)) {
        x.take(ip);
        y.take(low);
        y.take(high);
    }
    let units = &view.units;
    let label_x = |bar: f64| DialKind::Pressure.number(bar, Some(0.1), units);
    let label_y = |l_min: f64| DialKind::Flow.number(l_min, Some(0.001), units);
    let Some(plane) = Plane::new(area, x.padded(0.05, 0.1), y.padded(0.05, 0.001)) else { return };
    plane.axes(pen, (&label_x, units.pressure_symbol()), (&label_y, units.flow_symbol()));
    let mut lines = Vec::new();
    if let Some(line) = view.line {
        let (from, to) = plane.x();
        let at = |bar: f64| line.intercept_l_min + line.slope_l_min_bar * bar;
        lines.push(((from, at(from)), (to, at(to)), Color::Cyan));
    }
    if let Some((ip, low, high)) = view.limits {
        lines.push(((ip, low), (ip, high), Color::Reset));
    }
    plane.lines(pen, &lines);
    if let Some((ip, low, high)) = view.limits {
        for end in [low, high] {
            plane.glyph(pen, (ip, end), pen.look.glyph("┼", "="), pen.look.faint());
        }
    }
    if let Some(at) = live {
        plane.glyph(pen, at, "+", pen.look.strong());
    }
    for point in &view.points {
        let at = (point.pressure_bar, point.flow_l_min);
        let style = if point.apart { pen.look.warning() } else { pen.look.strong() };
        plane.glyph(pen, at, mark(point, pen.look), style);
    }
}
