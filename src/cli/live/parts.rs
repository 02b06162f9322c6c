//! Pieces both screens have: a dial's state, the key bar, the bottom lines, a screen that is too small.

use ratatui::layout::Rect;
use ratatui::style::Style;

use super::level;
use super::pen::{self, Pen, inset, take_below, width, wrap};
use super::stage::Stage;
use crate::report::Units;
use crate::report::live_parts::{Dial, DialState, Saved};
use crate::report::typed::tame;

/// The least size at which everything has its place.
const LEAST: (u16, u16) = (80, 24);
/// Keys that every screen has.
pub(super) const MORE: &str = "Tab all  ? help";
/// Rows the bottom lines take at most.
const MOST_SAID: usize = 5;

/// Whether there is no room for the whole screen.
pub(super) const fn is_small(area: Rect) -> bool {
    area.width < LEAST.0 || area.height < LEAST.1
}

/// Says that the terminal is too small.
pub(super) fn too_small(pen: &mut Pen<'_>, row: Rect, area: Rect) {
    let (wide, high) = LEAST;
    let text = format!("{}x{} is too small for the screen: make it {wide}x{high}", area.width, area.height);
    pen.text(inset(row, 1), &text, pen.look.ready());
}

/// The keys with what they do, at the bottom of an area, which gets shorter by as many rows as they need.
pub(super) fn key_bar(pen: &mut Pen<'_>, rest: &mut Rect, keys: &[(&str, &str)]) {
    let columns = usize::from(rest.width.saturating_sub(1));
    let mut rows: Vec<Vec<(usize, &str, &str)>> = vec![Vec::new()];
    let mut at = 0;
    for (key, does) in keys {
        let wide = width(key) + 1 + width(does);
        if at > 0 && at + wide > columns {
            rows.push(Vec::new());
            at = 0;
        }
        if let Some(row) = rows.last_mut() {
            row.push((at, key, does));
        }
        at += wide + 2;
    }
    let area = take_below(rest, u16::try_from(rows.len()).unwrap_or(1));
    for (row, keys) in pen::rows(area).zip(rows) {
        for (at, key, does) in keys {
            let part = |at: usize| {
                let at = u16::try_from(at + 1).unwrap_or(u16::MAX).min(row.width);
                Rect { x: row.x + at, width: row.width - at, ..row }
            };
            pen.text(part(at), key, pen.look.strong());
            pen.text(part(at + width(key) + 1), does, pen.look.accent());
        }
    }
}

/// The sentence and the question at the bottom, taken from below.
pub(super) fn bottom<A: Clone>(
    pen: &mut Pen<'_>,
    stage: &Stage<A>,
    else_says: Option<&str>,
    rest: &mut Rect,
) {
    let columns = usize::from(rest.width.saturating_sub(2));
    let lines = stage.bottom(columns, else_says);
    // The last lines hold what is typed.
    let skip = lines.len().saturating_sub(MOST_SAID);
    let lines: Vec<(String, Style)> =
        lines.into_iter().skip(skip).map(|line| (line, pen.look.strong())).collect();
    let height = u16::try_from(lines.len()).unwrap_or(0);
    let area = take_below(rest, height);
    pen.lines(inset(area, 1), &lines);
}

/// What is saved, and more where there is room; goes out: what is not saved, where it is too long for the row.
pub(super) fn status(pen: &mut Pen<'_>, row: Rect, saved: &Saved, says: &str, more: &str) -> Option<String> {
    let style = if *saved == Saved::All { Style::new() } else { pen.look.warning() };
    let room = usize::from(row.width);
    let both = format!("{says} · {more}");
    let whole = if more.is_empty() || width(&pen.look.text(&both)) > room { says } else { both.as_str() };
    pen.text(row, whole, style);
    (width(&pen.look.text(whole)) > room).then(|| whole.to_owned())
}

/// The level line and the words beside it; for a value that is not of now its words alone, reversed.
pub(super) fn state(pen: &mut Pen<'_>, row: Rect, dial: &Dial, units: &Units) {
    let words = dial.state_words(units);
    match dial.tilt() {
        Some(tilt) => {
            let stroke = level::tilted(tilt, pen.look);
            pen.text(row, stroke, pen.look.accent());
            let after = (level::COLUMNS + 1).min(row.width);
            let rest = Rect { x: row.x + after, width: row.width - after, ..row };
            pen.text(rest, &words, Style::new());
        }
        None => {
            let style = if dial.state == DialState::Waiting { pen.look.strong() } else { pen.look.alarm() };
            pen.text(row, &words, style);
        }
    }
}

/// A number with dashes in place of its numerals.
pub(super) fn dashes(number: &str) -> String {
    number.trim_start_matches('-').chars().map(|c| if c == '.' { '.' } else { '-' }).collect()
}

/// A small dial in words: what it is, its value or what is the matter, its faults.
pub(super) fn small_dial(dial: &Dial, units: &Units) -> String {
    let value = if dial.is_alive() { dial.value_words(units) } else { dial.state_words(units) };
    let faults = match dial.faults {
        0 => String::new(),
        1 => ", 1 fault".to_owned(),
        n => format!(", {n} faults"),
    };
    format!("{} {value}{faults}", dial.kind.name())
}

/// A dial in words, with everything that is known of it.
pub(super) fn whole_dial(dial: &Dial, units: &Units) -> String {
    let mut text = format!("{} {}", dial.kind.name(), dial.value_words(units));
    if !dial.meant.is_empty() {
        text.push_str(&format!(" {}", tame(&dial.meant)));
    }
    let state = dial.state_words(units);
    if !state.is_empty() {
        text.push_str(&format!(", {state}"));
    }
    text.push_str(&format!(" ({})", dial.source_words()));
    if let Some(trouble) = &dial.trouble {
        text.push_str(&format!("; last trouble: {}", tame(trouble)));
    }
    text
}

/// The trouble of the first dial that is not alive, with its instrument.
pub(super) fn trouble<'a>(mut dials: impl Iterator<Item = &'a Dial>) -> Option<String> {
    dials.find_map(|dial| {
        let trouble = dial.trouble.as_ref().filter(|_| !dial.is_alive())?;
        Some(format!("{}: {trouble}", dial.instrument))
    })
}

/// Keys with their sentences, as lines.
pub(super) fn help_lines(keys: &[(&str, &str)], columns: u16) -> Vec<String> {
    let columns = usize::from(columns.saturating_sub(2));
    let mut all = Vec::new();
    for (key, does) in keys {
        for (place, line) in wrap(does, columns.saturating_sub(7)).into_iter().enumerate() {
            let key = if place == 0 { key } else { "" };
            all.push(format!("{key:<6} {line}"));
        }
    }
    all
}
