//! The legend: the signs that are present, each with its words.
//!
//! Comes in: what is drawn. Goes out: [`Entry`]s, and their signs drawn as they are in the panel. Only what is present
//! is explained.

use super::marks::{self, DRAWING_ORDER, arrow, draw_flags, draw_rings, ring_radius};
use super::seen::Seen;
use crate::bench::Verdict;
use crate::entry::Purpose;

use super::super::ink::{INK, SAND, SEA_GLASS};
use super::super::number::coordinate;
use super::super::svg::{Path, Svg};

/// What the legend can explain.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Sign {
    Run(Verdict),
    Changed,
    Limits,
    LimitsBeyond,
    Trend,
    AsLeft,
}

/// A sign with its words: in full, and for where there is little room.
pub(super) struct Entry {
    pub sign: Sign,
    pub text: String,
    pub brief: String,
}

/// The entries, in the order they are read.
pub(super) fn entries(seen: &Seen) -> Vec<Entry> {
    let mut entries = Vec::new();
    let mut add = |sign: Sign, text: &str, brief: &str| {
        entries.push(Entry { sign, text: text.to_owned(), brief: brief.to_owned() });
    };
    for verdict in DRAWING_ORDER {
        if seen.marks.iter().any(|m| m.verdict == verdict) {
            let word = match verdict {
                Verdict::Pass => "pass",
                Verdict::Fail => "fail",
                Verdict::Undecided => "undecided",
                Verdict::None => "not judged",
            };
            add(Sign::Run(verdict), word, word);
        }
    }
    match seen.marks.iter().filter(|m| m.changed().is_some()).count() {
        0 => {}
        n => add(
            Sign::Changed,
            &format!("|E_n|\u{a0}over\u{a0}1 to the run before ({n})"),
            "|E_n|\u{a0}over\u{a0}1",
        ),
    }
    if seen.marks.iter().any(|m| m.limits.is_some_and(|(low, high)| seen.shows(low) || seen.shows(high))) {
        add(Sign::Limits, "limits each run was judged by", "limits");
    }
    if seen.latest_limits().is_some_and(|(low, high)| !seen.shows(low) || !seen.shows(high)) {
        add(Sign::LimitsBeyond, "a limit beyond the panel", "limit beyond");
    }
    if let Some(line) = &seen.line {
        let band = "trend, 95\u{a0}% band";
        let ahead = line.end().min(seen.days.1) > line.span.1;
        let text = if ahead { format!("{band}; dashed: looked ahead") } else { band.to_owned() };
        add(Sign::Trend, &text, band);
    }
    if seen.marks.iter().any(|m| m.purpose == Purpose::AsLeft) {
        add(Sign::AsLeft, "as-left: cleaned or adjusted before", "as-left");
    }
    entries
}

/// A sign centred at a place, as it is in the panel.
pub(super) fn draw(svg: &mut Svg, sign: Sign, (x, y): (f64, f64), body: f64, transparent: bool) {
    let (half, r) = (0.95 * body, 0.4 * body);
    match sign {
        Sign::Run(verdict) => {
            let bar = 0.62 * body;
            let mut path = Path::default();
            path.stroke((x, y - bar), (x, y + bar));
            let width = coordinate(marks::hair(r));
            svg.group("plot-bars", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
            svg.path(&path, &[]);
            svg.end();
            marks::draw(svg, verdict, &[marks::Sign { x, y, told: None }], r, (transparent, false));
        }
        Sign::Changed => {
            // As large as round a sign of the panel, but never into the lines above and below.
            let shrunk = 0.6 * body / ring_radius(r, body);
            draw_rings(svg, &[(x, y)], r * shrunk.min(1.0), body * shrunk.min(1.0));
        }
        Sign::Limits => {
            let mut path = Path::default();
            for side in [-1.0, 1.0] {
                path.stroke((x - half, y + side * 0.36 * body), (x + half, y + side * 0.36 * body));
            }
            let width = coordinate(0.12 * body);
            svg.group("plot-limits", &[("fill", "none"), ("stroke", INK), ("stroke-width", &width)]);
            svg.path(&path, &[]);
            svg.end();
        }
        Sign::LimitsBeyond => {
            svg.group("plot-limits", &[("fill", "none"), ("stroke", INK), ("stroke-width", "1.2")]);
            svg.path(&arrow((x, y - 0.55 * body), -1.0, 0.75 * body), &[]);
            svg.end();
        }
        Sign::Trend => {
            svg.group("plot-band", &[("fill", SAND)]);
            svg.rect(x - half, y - 0.38 * body, 2.0 * half, 0.76 * body, &[]);
            svg.end();
            let mut path = Path::default();
            path.stroke((x - half, y), (x + half, y));
            let width = coordinate(0.14 * body);
            svg.group("plot-line", &[("fill", "none"), ("stroke", SEA_GLASS), ("stroke-width", &width)]);
            svg.path(&path, &[]);
            svg.end();
        }
        Sign::AsLeft => draw_flags(svg, &[x], y + 0.34 * body, 0.68 * body),
    }
}
