//! Signs of a session: what each event, cell and stretch is drawn with, in the panels and in the legend alike.
//!
//! Comes in: a place in pixels and what the sign stands for. Goes out: SVG. Events differ in their outline and in the
//! dash of their upright; cells in their dash and the marks along it.

use super::seen::Happened;
use super::stretches::Reason;

use super::super::frame::{Frame, hatched};
use super::super::ink::{BRICK, INK, PAPER, SAND, SEA_GLASS};
use super::super::letters::Weight;
use super::super::number::coordinate;
use super::super::svg::{Anchor, Path, Svg, Text};

/// What the legend can explain.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Sign {
    Cell(usize),
    Series,
    Fit,
    Stretch(Reason),
    Event(Happened),
    /// An event by its number.
    Number(usize),
    /// A segment by its number.
    Segment(usize),
    Jump,
}

/// Opacity of cells and of hatches.
const FAINT: &str = "0.55";

/// The dash of an event's upright, in sizes of body text.
pub(super) fn dash(happened: Happened, body: f64) -> Option<String> {
    let dashes: &[f64] = match happened {
        Happened::Injection => &[0.6, 0.3],
        Happened::OxygenAdd => &[0.08, 0.28],
        Happened::DiluentAdd => &[0.3, 0.3],
        Happened::Vent => &[0.6, 0.25, 0.1, 0.25],
        Happened::MakeUp => &[0.6, 0.2, 0.1, 0.2, 0.1, 0.2],
        Happened::Stop => return None,
    };
    Some(dashes.iter().map(|d| coordinate(d * body)).collect::<Vec<_>>().join(" "))
}

/// The sign of an event, filled or empty, centred at a place.
pub(super) fn draw_event(svg: &mut Svg, happened: Happened, (x, y): (f64, f64), r: f64, transparent: bool) {
    let mut path = Path::default();
    let filled = match happened {
        // A step upward.
        Happened::Injection => {
            path.move_to(x - 1.1 * r, y + 0.9 * r)
                .line_to(x, y + 0.9 * r)
                .line_to(x, y - 0.9 * r)
                .line_to(x + 1.1 * r, y - 0.9 * r)
                .line_to(x + 1.1 * r, y - 0.3 * r)
                .line_to(x + 0.6 * r, y - 0.3 * r)
                .line_to(x + 0.6 * r, y + 1.5 * r)
                .line_to(x - 1.1 * r, y + 1.5 * r);
            path.close();
            true
        }
        Happened::OxygenAdd => {
            path.move_to(x, y - 1.15 * r).line_to(x + 1.1 * r, y + 0.8 * r).line_to(x - 1.1 * r, y + 0.8 * r);
            path.close();
            true
        }
        Happened::DiluentAdd => {
            path.circle(x, y, 0.9 * r);
            false
        }
        Happened::Vent => {
            path.move_to(x, y + 1.15 * r).line_to(x + 1.1 * r, y - 0.8 * r).line_to(x - 1.1 * r, y - 0.8 * r);
            path.close();
            false
        }
        Happened::MakeUp => {
            path.move_to(x, y - 1.2 * r)
                .line_to(x + 1.2 * r, y)
                .line_to(x, y + 1.2 * r)
                .line_to(x - 1.2 * r, y);
            path.close();
            false
        }
        Happened::Stop => {
            path.move_to(x - 0.85 * r, y - 0.85 * r)
                .line_to(x + 0.85 * r, y - 0.85 * r)
                .line_to(x + 0.85 * r, y + 0.85 * r)
                .line_to(x - 0.85 * r, y + 0.85 * r);
            path.close();
            true
        }
    };
    let empty = if transparent { "none" } else { PAPER };
    let fill = if filled { INK } else { empty };
    let width = coordinate((0.22 * r).clamp(0.6, 1.8));
    svg.group(
        "plot-event",
        &[("fill", fill), ("stroke", INK), ("stroke-width", &width), ("stroke-linejoin", "round")],
    );
    svg.path(&path, &[]);
    svg.end();
}

/// Begins a group in which a cell's strokes are drawn.
pub(super) fn begin_cell(svg: &mut Svg, index: usize, body: f64) {
    let dashes: &[f64] = match index % 4 {
        0 => &[],
        1 => &[0.5, 0.22],
        2 => &[0.14, 0.2],
        _ => &[0.6, 0.2, 0.14, 0.2],
    };
    let width = coordinate((0.06 * body).max(0.7));
    let dash = dashes.iter().map(|d| coordinate(d * body)).collect::<Vec<_>>().join(" ");
    let mut attributes = vec![
        ("fill", "none"),
        ("stroke", INK),
        ("stroke-opacity", FAINT),
        ("stroke-width", width.as_str()),
        ("stroke-linecap", "round"),
    ];
    if !dashes.is_empty() {
        attributes.push(("stroke-dasharray", dash.as_str()));
    }
    svg.group("plot-cell", &attributes);
}

/// The mark of a cell along its line.
pub(super) fn cell_mark(path: &mut Path, index: usize, (x, y): (f64, f64), r: f64) {
    match index % 8 {
        0 => {
            path.circle(x, y, 0.9 * r);
        }
        1 => {
            path.move_to(x - 0.8 * r, y - 0.8 * r)
                .line_to(x + 0.8 * r, y - 0.8 * r)
                .line_to(x + 0.8 * r, y + 0.8 * r)
                .line_to(x - 0.8 * r, y + 0.8 * r);
            path.close();
        }
        2 => {
            path.move_to(x, y - 1.1 * r).line_to(x + r, y + 0.7 * r).line_to(x - r, y + 0.7 * r);
            path.close();
        }
        3 => {
            path.move_to(x, y - 1.15 * r)
                .line_to(x + 1.15 * r, y)
                .line_to(x, y + 1.15 * r)
                .line_to(x - 1.15 * r, y);
            path.close();
        }
        4 => {
            path.stroke((x - r, y), (x + r, y)).stroke((x, y - r), (x, y + r));
        }
        5 => {
            path.stroke((x - r, y - r), (x + r, y + r)).stroke((x - r, y + r), (x + r, y - r));
        }
        6 => {
            path.move_to(x, y + 1.1 * r).line_to(x + r, y - 0.7 * r).line_to(x - r, y - 0.7 * r);
            path.close();
        }
        _ => {
            path.stroke((x - r, y), (x + r, y));
        }
    }
}

/// Begins a group in which the marks of cells are drawn.
pub(super) fn begin_cell_marks(svg: &mut Svg, transparent: bool) {
    let fill = if transparent { "none" } else { PAPER };
    svg.group(
        "plot-cell-marks",
        &[("fill", fill), ("stroke", INK), ("stroke-opacity", "0.75"), ("stroke-width", "0.8")],
    );
}

/// Begins a group in which the mean of the agreeing cells is drawn.
pub(super) fn begin_series(svg: &mut Svg, body: f64) {
    let width = coordinate(0.14 * body);
    svg.group(
        "plot-series",
        &[
            ("fill", "none"),
            ("stroke", INK),
            ("stroke-width", &width),
            ("stroke-linejoin", "round"),
            ("stroke-linecap", "round"),
        ],
    );
}

/// Begins a group in which fitted slopes are drawn: a broad light stroke under the readings.
pub(super) fn begin_fits(svg: &mut Svg, body: f64) {
    let width = coordinate(0.62 * body);
    svg.group(
        "plot-fits",
        &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-opacity", "0.42"), ("stroke-width", &width)],
    );
}

/// The ground of a segment's span.
pub(super) fn draw_span(svg: &mut Svg, frame: &Frame) {
    let attributes = [("class", "plot-span"), ("fill", SAND), ("fill-opacity", "0.38")];
    svg.rect(frame.left, frame.top, frame.width(), frame.height(), &attributes);
}

/// The hatch of a stretch that is not used.
pub(super) fn draw_hatch(svg: &mut Svg, reason: Reason, frame: &Frame, body: f64) {
    let (kind, apart) = reason.hatch();
    let attributes = [("fill", "none"), ("stroke", INK), ("stroke-opacity", FAINT), ("stroke-width", "0.7")];
    svg.group("plot-left-out", &attributes);
    if frame.width() < 0.6 * apart * body {
        // Too narrow for strokes of any direction.
        let mut path = Path::default();
        path.stroke((frame.left, frame.top), (frame.left, frame.bottom));
        svg.path(&path, &[]);
    } else {
        svg.path(&hatched(frame, kind, apart * body), &[]);
        svg.path(&frame.outline(), &[("stroke-width", "0.5")]);
    }
    svg.end();
}

/// A sign of the legend centred at a place.
pub(super) fn draw(svg: &mut Svg, sign: Sign, (x, y): (f64, f64), body: f64, transparent: bool) {
    let half = 0.95 * body;
    let mut path = Path::default();
    path.stroke((x - half, y), (x + half, y));
    match sign {
        Sign::Cell(index) => {
            begin_cell(svg, index, body);
            svg.path(&path, &[]);
            svg.end();
            begin_cell_marks(svg, transparent);
            let mut mark = Path::default();
            cell_mark(&mut mark, index, (x, y), 0.3 * body);
            svg.path(&mark, &[]);
            svg.end();
        }
        Sign::Series => {
            begin_series(svg, body);
            svg.path(&path, &[]);
            svg.end();
        }
        Sign::Fit => {
            draw_span(
                svg,
                &Frame { left: x - half, top: y - 0.5 * body, right: x + half, bottom: y + 0.5 * body },
            );
            begin_fits(svg, body);
            svg.path(&path, &[]);
            svg.end();
        }
        Sign::Stretch(reason) => {
            let frame =
                Frame { left: x - half, top: y - 0.45 * body, right: x + half, bottom: y + 0.45 * body };
            draw_hatch(svg, reason, &frame, 0.8 * body);
        }
        Sign::Event(happened) => draw_event(svg, happened, (x, y), 0.4 * body, transparent),
        Sign::Number(number) => draw_number(svg, &number.to_string(), (x, y), body, INK),
        Sign::Segment(number) => {
            bracket(svg, (x - 0.8 * body, x + 0.8 * body), y - 0.5 * body, body);
            draw_number(svg, &letter(number), (x, y + 0.1 * body), body, INK);
        }
        Sign::Jump => draw_number(svg, "?", (x, y), body, BRICK),
    }
}

/// The letter of a segment, counted from 1: A to Z, then A1 …
pub(super) fn letter(number: usize) -> String {
    let index = number.saturating_sub(1);
    let letter = char::from(b'A' + (index % 26) as u8);
    match index / 26 {
        0 => letter.to_string(),
        round => format!("{letter}{round}"),
    }
}

/// A number or letter that stands for something in the margin.
pub(super) fn draw_number(svg: &mut Svg, text: &str, (x, y): (f64, f64), body: f64, fill: &'static str) {
    svg.text(&Text {
        x,
        y: y + 0.36 * body,
        size: body,
        anchor: Anchor::Middle,
        fill,
        muted: false,
        class: "plot-key",
        pieces: &[(text, Weight::Bold)],
    });
}

/// A bracket over a segment's span, open downward.
pub(super) fn bracket(svg: &mut Svg, (from, to): (f64, f64), y: f64, body: f64) {
    let mut path = Path::default();
    let lip = 0.35 * body;
    path.move_to(from, y + lip).line_to(from, y).line_to(to, y).line_to(to, y + lip);
    let width = coordinate(0.13 * body);
    svg.group("plot-bracket", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
    svg.path(&path, &[]);
    svg.end();
}
