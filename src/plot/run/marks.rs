//! The signs points are drawn with, in the panels and in the legend alike.
//!
//! Comes in: a place in pixels and what the sign stands for. Goes out: paths. In the line and rising: a full triangle
//! pointing up; falling: a light one pointing down; without a direction: a full circle. Not in the line: the same
//! outline, empty, with an upright cross when not choked and a slanting one when a person left it out.

use super::seen::{Mark, Seen, Shape, Use};
use crate::report::number::value_and_u;

use super::super::ink::{INK, PAPER, SAND};
use super::super::svg::{Path, Svg};

/// With this many points or fewer the signs have their full size.
const FULL_SIZE_POINTS: f64 = 25.0;

/// Which of the ways of not being used a sign shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Cross {
    None,
    Upright,
    Slanting,
}

/// All signs in the order they are drawn, so that points of the line lie on top.
pub(super) const DRAWING_ORDER: [(Cross, Shape); 9] = [
    (Cross::Slanting, Shape::Neither),
    (Cross::Slanting, Shape::Rising),
    (Cross::Slanting, Shape::Falling),
    (Cross::Upright, Shape::Neither),
    (Cross::Upright, Shape::Rising),
    (Cross::Upright, Shape::Falling),
    (Cross::None, Shape::Neither),
    (Cross::None, Shape::Rising),
    (Cross::None, Shape::Falling),
];

/// The cross of a point.
pub(super) fn cross_of(how: &Use) -> Cross {
    match how {
        Use::InTheLine => Cross::None,
        Use::NotChoked => Cross::Upright,
        Use::LeftOut(_) => Cross::Slanting,
    }
}

/// Size of the signs, half their width in pixels: smaller where there are many.
pub(super) fn radius(seen: &Seen, body: f64) -> f64 {
    let crowd = (FULL_SIZE_POINTS / (seen.marks.len() as f64).max(1.0)).sqrt().min(1.0);
    body * (0.40 * crowd).max(0.19)
}

/// Width of bars and outlines, in pixels.
pub(super) fn hair(radius: f64) -> f64 {
    (0.21 * radius).clamp(0.5, 1.2)
}

/// Begins a group in which [`sign`] draws.
pub(super) fn begin(svg: &mut Svg, (cross, shape): (Cross, Shape), radius: f64, transparent: bool) {
    let (class, fill) = match (cross, shape) {
        (Cross::None, Shape::Rising) => ("plot-points plot-rising", INK),
        (Cross::None, Shape::Falling) => ("plot-points plot-falling", SAND),
        (Cross::None, Shape::Neither) => ("plot-points", INK),
        (Cross::Upright, _) => ("plot-points plot-not-choked", if transparent { "none" } else { PAPER }),
        (Cross::Slanting, _) => ("plot-points plot-left-out", if transparent { "none" } else { PAPER }),
    };
    let width = super::super::number::coordinate(hair(radius));
    svg.group(
        class,
        &[("fill", fill), ("stroke", INK), ("stroke-width", &width), ("stroke-linejoin", "round")],
    );
}

/// The path of one sign.
pub(super) fn sign((cross, shape): (Cross, Shape), x: f64, y: f64, r: f64) -> Path {
    let mut path = Path::default();
    match shape {
        Shape::Neither => {
            path.circle(x, y, 0.9 * r);
        }
        Shape::Rising => {
            path.move_to(x, y - 1.15 * r)
                .line_to(x + 1.05 * r, y + 0.75 * r)
                .line_to(x - 1.05 * r, y + 0.75 * r);
            path.close();
        }
        Shape::Falling => {
            path.move_to(x, y + 1.15 * r)
                .line_to(x + 1.05 * r, y - 0.75 * r)
                .line_to(x - 1.05 * r, y - 0.75 * r);
            path.close();
        }
    }
    match cross {
        Cross::None => {}
        Cross::Upright => {
            path.stroke((x - 1.5 * r, y), (x + 1.5 * r, y)).stroke((x, y - 1.5 * r), (x, y + 1.5 * r));
        }
        Cross::Slanting => {
            path.stroke((x - 1.25 * r, y - 1.25 * r), (x + 1.25 * r, y + 1.25 * r));
            path.stroke((x - 1.25 * r, y + 1.25 * r), (x + 1.25 * r, y - 1.25 * r));
        }
    }
    path
}

/// A small arrow whose tip touches the edge of a panel, for what lies beyond it in direction `(dx, dy)`, which is one
/// step along one axis.
pub(super) fn arrow(tip: (f64, f64), (dx, dy): (f64, f64), size: f64) -> Path {
    let mut path = Path::default();
    // `along` steps back from the edge, `across` to its side.
    let place = |along: f64, across: f64| {
        (tip.0 - size * (along * dx - across * dy), tip.1 - size * (along * dy + across * dx))
    };
    path.stroke(place(1.5, 0.0), place(0.15, 0.0));
    let (left, point, right) = (place(0.75, -0.5), place(0.15, 0.0), place(0.75, 0.5));
    path.move_to(left.0, left.1).line_to(point.0, point.1).line_to(right.0, right.1);
    path
}

/// What a point says when it is pointed at.
pub(super) fn told(mark: &Mark, seen: &Seen) -> String {
    let units = &seen.shown.units;
    let how = match &mark.how {
        Use::InTheLine => String::new(),
        Use::NotChoked => "; not choked".to_owned(),
        Use::LeftOut(why) => format!("; left out: {why}"),
    };
    format!(
        "point {}: {} {} absolute, {} {} STPD{how}",
        mark.index,
        value_and_u(mark.pressure, mark.pressure_bar).0,
        units.pressure_symbol(),
        value_and_u(mark.flow, mark.flow_bar).0,
        units.flow_symbol(),
    )
}
