//! The lanes above and below the main panel: what each segment says, and what happened when.
//!
//! Comes in: what is drawn, its words, the axis of time. Goes out: texts that touch neither one another nor an upright.
//! Events stand in as many rows as they need, each on an upright of its own; where that is too much they get shorter
//! texts, then numbers with a key in the margin, then only their signs. Segments likewise.

use super::layout::Layout;
use super::seen::{Fit, Happened, Mark, Seen};
use super::signs::{self, draw_event, draw_number};
use super::words::Words;

use super::super::axes::tick_size;
use super::super::axis::Scale;
use super::super::ink::INK;
use super::super::letters::{Weight, width};
use super::super::svg::{Anchor, Svg, Text};

/// Height of a row, in sizes of its text.
pub(super) const ROW: f64 = 1.3;
/// More events than this are not numbered: the key would be longer than the picture.
const MOST_NUMBERED: usize = 16;
/// More events than this are not laid out in rows.
const MOST_TOLD: usize = 60;

/// How events are told.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub(super) enum Told {
    Full,
    Brief,
    Numbered,
    Silent,
}

/// An event in its lane.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Item {
    pub index: usize,
    pub x: f64,
    pub row: usize,
    /// The text and where it begins or ends.
    text: Option<(String, f64, Anchor)>,
}

/// The lane of events.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Events {
    pub told: Told,
    pub rows: usize,
    pub items: Vec<Item>,
}

/// How segments are told.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Segments {
    /// In so many lines, the index of their words.
    Lines(usize),
    Lettered,
}

/// Radius of an event's sign.
fn radius(body: f64) -> f64 {
    0.4 * body
}

/// Lays out the events, from `first` on as they fit.
pub(super) fn events(
    seen: &Seen<'_>,
    words: &Words,
    x: &Scale,
    (left, right): (f64, f64),
    body: f64,
    (first, most_rows): (Told, usize),
) -> Events {
    let layouts = [(Told::Full, most_rows), (Told::Brief, most_rows), (Told::Numbered, most_rows)];
    layouts
        .into_iter()
        .filter(|(told, _)| *told >= first && seen.marks.len() <= MOST_TOLD)
        .filter(|(told, _)| *told != Told::Numbered || seen.marks.len() <= MOST_NUMBERED)
        .find_map(|(told, rows)| in_rows(seen, words, x, (left, right), body, (told, rows)))
        .unwrap_or_else(|| in_kinds(seen, x, most_rows))
}

/// Events without texts, a row for each kind where there are rows enough.
fn in_kinds(seen: &Seen<'_>, x: &Scale, most: usize) -> Events {
    let mut kinds: Vec<Happened> = seen.marks.iter().map(|m| m.happened).collect();
    kinds.sort_unstable();
    kinds.dedup();
    let apart = kinds.len() <= most.max(1) + 2;
    let row = |mark: &Mark| if apart { kinds.binary_search(&mark.happened).unwrap_or(0) } else { 0 };
    let items = seen.marks.iter().enumerate().map(|(index, m)| Item {
        index,
        x: x.clamped(m.at_s),
        row: row(m),
        text: None,
    });
    let items: Vec<Item> = items.collect();
    let rows = if apart { kinds.len() } else { 1 };
    Events { told: Told::Silent, rows, items }
}

/// Events in rows; none when they do not fit. From the last to the first, so that an upright that goes further down
/// stands left of what it would cross.
fn in_rows(
    seen: &Seen<'_>,
    words: &Words,
    x: &Scale,
    (left, right): (f64, f64),
    body: f64,
    (told, most): (Told, usize),
) -> Option<Events> {
    let (size, r, gap) = (tick_size(body), radius(body), 0.3 * body);
    let mut items: Vec<(Item, f64, f64)> = Vec::new();
    for (index, mark) in seen.marks.iter().enumerate().rev() {
        let text = match told {
            Told::Full => words.events[index][0].clone(),
            Told::Brief => words.events[index][1].clone(),
            _ => (index + 1).to_string(),
        };
        let weight = if told == Told::Numbered { Weight::Bold } else { Weight::Regular };
        let (at, wide) = (x.clamped(mark.at_s), width(&text, size, weight));
        // A number stands in the place of the sign; else the sign, then the text to its right, or to its left at the end of
        // the panel.
        let begin = at + 1.3 * r + gap;
        let (from, to, text) = if told == Told::Numbered {
            (at - 0.5 * wide, at + 0.5 * wide, (text, at, Anchor::Middle))
        } else if begin + wide <= right {
            (at - 1.3 * r, begin + wide, (text, begin, Anchor::Start))
        } else {
            let end = at - 1.3 * r - gap;
            (end - wide, at + 1.3 * r, (text, end, Anchor::End))
        };
        if from < left - body {
            return None;
        }
        let free = |row: usize| {
            items.iter().all(|(other, other_from, other_to)| {
                let apart = from >= other_to + 0.5 * gap || to + 0.5 * gap <= *other_from;
                match other.row.cmp(&row) {
                    std::cmp::Ordering::Equal => apart,
                    // An upright passes through what stands above it at the same moment, but through no text.
                    std::cmp::Ordering::Less => {
                        at + 0.25 * r < *other_from || at > other_to + 0.25 * r || (at - other.x).abs() < 0.1
                    }
                    std::cmp::Ordering::Greater => {
                        other.x + 0.25 * r < from || other.x > to + 0.25 * r || (at - other.x).abs() < 0.1
                    }
                }
            })
        };
        let row = (0..most).find(|row| free(*row))?;
        items.push((Item { index, x: at, row, text: Some(text) }, from, to));
    }
    let items: Vec<Item> = items.into_iter().rev().map(|(item, _, _)| item).collect();
    let rows = items.iter().map(|item| item.row + 1).max().unwrap_or(0);
    Some(Events { told, rows, items })
}

/// Height of the lane of events.
pub(super) fn events_height(events: &Events, body: f64) -> f64 {
    if events.rows == 0 { 0.0 } else { events.rows as f64 * ROW * tick_size(body).max(body) + 0.35 * body }
}

/// The first way of at most `most` lines in which all segments can be told, each over its own span.
pub(super) fn segments(
    seen: &Seen<'_>,
    words: &Words,
    x: &Scale,
    sides: (f64, f64),
    body: f64,
    most: usize,
) -> Segments {
    let size = tick_size(body);
    let rooms = rooms(&seen.fits, x, sides);
    (0..3)
        .filter(|variant| lines_of(words, *variant) <= most)
        .find(|variant| {
            words.segments.iter().zip(&rooms).all(|(said, (from, to))| {
                let widest =
                    said.lines[*variant].iter().map(|l| width(l, size, Weight::Regular)).fold(0.0, f64::max);
                widest + 0.8 * body <= to - from
            })
        })
        .map_or(Segments::Lettered, Segments::Lines)
}

fn lines_of(words: &Words, variant: usize) -> usize {
    words.segments.iter().map(|s| s.lines[variant].len()).max().unwrap_or(0)
}

/// Height of the lane of segments.
pub(super) fn segments_height(segments: Segments, words: &Words, body: f64) -> f64 {
    if words.segments.is_empty() {
        return 0.0;
    }
    let lines = match segments {
        Segments::Lines(variant) => lines_of(words, variant),
        Segments::Lettered => 1,
    };
    lines as f64 * ROW * tick_size(body) + 0.95 * body
}

/// The room of each segment's text: half way to its neighbours.
fn rooms(fits: &[Fit], x: &Scale, (left, right): (f64, f64)) -> Vec<(f64, f64)> {
    (0..fits.len())
        .map(|i| {
            let end = |j: usize| fits.get(j).map(|f| x.clamped(f.segment.to_s));
            let begin = |j: usize| fits.get(j).map(|f| x.clamped(f.segment.from_s));
            let (own_begin, own_end) = (begin(i).unwrap_or(left), end(i).unwrap_or(right));
            let before = i.checked_sub(1).and_then(end).map_or(left, |end| 0.5 * (end + own_begin));
            let after = begin(i + 1).map_or(right, |begin| 0.5 * (own_end + begin));
            (before, after)
        })
        .collect()
}

/// Draws both lanes.
pub(super) fn draw(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    draw_segments(svg, seen, layout);
    let (body, lane) = (layout.body, layout.events_lane);
    let (size, r) = (tick_size(body), radius(body));
    svg.group("plot-events", &[]);
    for item in &layout.events.items {
        let Some(mark) = seen.marks.get(item.index) else { continue };
        let y = layout.event_y(item.row);
        let numbered = layout.events.told == Told::Numbered;
        if !numbered {
            draw_event(svg, mark.happened, (item.x, y), r, layout.transparent);
        }
        let Some((text, x, anchor)) = &item.text else { continue };
        svg.text(&Text {
            x: *x,
            y: y + 0.36 * size,
            size,
            anchor: *anchor,
            fill: INK,
            muted: false,
            class: "plot-event-label",
            pieces: &[(text, if numbered { Weight::Bold } else { Weight::Regular })],
        });
    }
    svg.end();
    if lane.height() > 0.0 {
        svg.group("plot-axes", &[("fill", "none"), ("stroke", INK), ("stroke-width", "0.8")]);
        svg.path(&lane.outline(), &[]);
        svg.end();
    }
}

fn draw_segments(svg: &mut Svg, seen: &Seen<'_>, layout: &Layout) {
    let (body, lane) = (layout.body, layout.segments_lane);
    let (size, y) = (tick_size(body), lane.bottom - 0.55 * body);
    let rooms = rooms(&seen.fits, &layout.x, (layout.main.left, layout.main.right));
    let mut last_right = f64::NEG_INFINITY;
    svg.group("plot-segments", &[]);
    for (i, (fit, (from, to))) in seen.fits.iter().zip(rooms).enumerate() {
        let span = (layout.x.clamped(fit.segment.from_s), layout.x.clamped(fit.segment.to_s));
        signs::bracket(svg, span, y, body);
        let middle = 0.5 * (span.0 + span.1);
        match (layout.segments, layout.segment_lines.get(i)) {
            (Segments::Lines(_), Some(lines)) => {
                let widest = lines.iter().map(|l| width(l, size, Weight::Regular)).fold(0.0, f64::max);
                let reach = 0.5 * widest + 0.3 * body;
                let middle = middle.min(to - reach).max(from + reach);
                for (line, text) in lines.iter().enumerate() {
                    let below = (lines.len() - 1 - line) as f64;
                    svg.text(&Text {
                        x: middle,
                        y: y - 0.5 * body - below * ROW * size,
                        size,
                        anchor: Anchor::Middle,
                        fill: INK,
                        muted: false,
                        class: "plot-segment-label",
                        pieces: &[(text, Weight::Regular)],
                    });
                }
            }
            _ => {
                let letter = signs::letter(i + 1);
                let half = 0.5 * width(&letter, body, Weight::Bold) + 0.1 * body;
                if middle - half > last_right {
                    draw_number(svg, &letter, (middle, y - 0.75 * body), body, INK);
                    last_right = middle + half;
                }
            }
        }
    }
    svg.end();
}
