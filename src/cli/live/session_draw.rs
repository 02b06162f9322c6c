//! A session on the screen: the caution, alarms, PO2 large, the cells, the curve with its limits, events, the keys.

use ratatui::buffer::Buffer;
use ratatui::layout::Rect;
use ratatui::style::{Color, Style};

use super::look::Look;
use super::numerals::{self, Size};
use super::pen::{Pen, inset, joined, rows, take, take_below, width, wrap};
use super::plane::{Plane, Span};
use super::session_scene::{Asked, KEYS};
use super::stage::{Page, Stage, draw_lines};
use super::{level, parts};
use crate::entry::What;
use crate::report::cautions::{SESSION_ALARM, SESSION_LIVE};
use crate::report::live_parts::{Dial, DialKind, DialState};
use crate::report::session_live::{self as words, AlarmSeen, SessionView};
use crate::report::typed::{clock, tame};

/// From this size on the numerals have six rows.
const LARGE: (u16, u16) = (100, 32);
/// Rows that alarms take at most at the least size.
const MOST_ALARMS: u16 = 7;

/// Draws a session.
pub(super) fn draw(
    buffer: &mut Buffer,
    area: Rect,
    look: Look,
    view: Option<&SessionView>,
    stage: &Stage<Asked>,
) {
    let pen = &mut Pen { buffer, look };
    let Some(view) = view else {
        let lines =
            [(SESSION_LIVE.to_owned(), look.strong()), ("waiting for the cells".to_owned(), Style::new())];
        pen.lines(inset(area, 1), &lines);
        return;
    };
    let mut rest = area;
    if parts::is_small(area) {
        return small(pen, area, view, stage);
    }
    let head = inset(take(&mut rest, 1), 1);
    let left = pen.right(head, &words::whereabouts(view), Style::new());
    pen.text(left, &words::title(view), look.strong());
    pen.text(inset(take(&mut rest, 1), 1), SESSION_LIVE, look.strong());
    alarms(pen, &mut rest, view, MOST_ALARMS);
    parts::key_bar(pen, &mut rest, &KEYS);
    let aside = status(pen, take_below(&mut rest, 1), view);
    parts::bottom(pen, stage, trouble(view).or(aside).as_deref(), &mut rest);
    match stage.page {
        Page::Main => main(pen, rest, view),
        Page::All(from) => draw_lines(pen, inset(rest, 1), &everything(view, area.width), from),
        Page::Help(from) => draw_lines(pen, inset(rest, 1), &help(area.width), from),
    }
}

fn trouble(view: &SessionView) -> Option<String> {
    parts::trouble(view.cells.iter().map(|cell| &cell.dial).chain(&view.around))
}

fn status(pen: &mut Pen<'_>, row: Rect, view: &SessionView) -> Option<String> {
    let row = inset(row, 1);
    let left = pen.right(row, parts::MORE, pen.look.faint());
    let hold = view.hold.words().unwrap_or_default();
    parts::status(pen, left, &view.saved, &words::saved_words(view), &hold)
}

/// The alarms across the whole width, a rule where there is none.
fn alarms(pen: &mut Pen<'_>, rest: &mut Rect, view: &SessionView, most: u16) {
    if view.alarms.is_empty() {
        let rule = take(rest, 1);
        pen.rule(rule);
        return;
    }
    let columns = usize::from(rest.width.saturating_sub(2));
    let mut lines: Vec<String> = Vec::new();
    let says = wrap(SESSION_ALARM, columns);
    for (place, alarm) in view.alarms.iter().enumerate() {
        let these = alarm_lines(alarm, view, columns);
        // Whatever has no room for its sentence is named all the same.
        let named = |from: usize| {
            let names: Vec<String> = view.alarms.iter().skip(from).map(words::alarm_name).collect();
            wrap(&format!("ALARM {}", names.join(", ")), columns)
        };
        let after = if place + 1 < view.alarms.len() { named(place + 1).len() } else { 0 };
        if place > 0 && lines.len() + these.len() + after + says.len() > usize::from(most) {
            lines.extend(named(place));
            break;
        }
        lines.extend(these);
    }
    lines.extend(says);
    let style = pen.look.alarm();
    for line in lines {
        let row = take(rest, 1);
        // The whole row is reversed, not the words alone.
        pen.text(row, &" ".repeat(usize::from(row.width)), style);
        pen.text(inset(row, 1), &line, style);
    }
}

fn alarm_lines(alarm: &AlarmSeen, view: &SessionView, columns: usize) -> Vec<String> {
    wrap(&format!("ALARM {}", words::alarm_words(alarm, &view.units)), columns)
}

fn main(pen: &mut Pen<'_>, area: Rect, view: &SessionView) {
    let mut rest = area;
    let whole = pen.buffer.area;
    let large = whole.width >= LARGE.0 && whole.height >= LARGE.1 && rest.height >= 16;
    let size = if large { Size::Six } else { Size::Three };
    let top = take(&mut rest, size.rows() + 2);
    let left = Rect { width: 34.max(top.width * 2 / 5), ..top };
    po2(pen, inset(left, 1), view, size);
    let right = Rect { x: top.x + left.width, width: top.width - left.width, ..top };
    pen.bar(right);
    cells(pen, inset(right, 2), view);

    let columns = usize::from(area.width.saturating_sub(2));
    let mut around = vec![words::injection_words(view)];
    around.extend(view.around.iter().map(|dial| parts::small_dial(dial, &view.units)));
    for line in joined(&around, columns).iter().take(2) {
        let row = take(&mut rest, 1);
        pen.text(inset(row, 1), line, Style::new());
    }
    let rule = take(&mut rest, 1);
    pen.rule(rule);
    let wide = rest.width * 3 / 5;
    curve(pen, inset(Rect { width: wide, ..rest }, 1), view);
    let right = Rect { x: rest.x + wide, width: rest.width - wide, ..rest };
    pen.bar(right);
    events(pen, inset(right, 2), view);
}

fn po2(pen: &mut Pen<'_>, area: Rect, view: &SessionView, size: Size) {
    let mut rest = area;
    let used = view.cells.iter().filter(|cell| cell.dial.is_alive()).count();
    let head = format!("PO2, median of {used} of {} cells", view.cells.len());
    pen.text(take(&mut rest, 1), &head, pen.look.faint());
    let state = take_below(&mut rest, 1);
    match words::po2_number(view) {
        Some(number) => numerals::draw(pen, rest, &number, "bar", (size, Style::new())),
        None => numerals::draw(pen, rest, "-.--", "bar", (size, pen.look.faint())),
    }
    match words::trend_tilt(view) {
        Some(tilt) => {
            pen.text(state, level::tilted(tilt, pen.look), pen.look.accent());
            let after = (level::COLUMNS + 1).min(state.width);
            let words_at = Rect { x: state.x + after, width: state.width - after, ..state };
            pen.text(words_at, &words::trend_words(view), Style::new());
        }
        None => {
            let waits = view.cells.iter().all(|cell| cell.dial.state == DialState::Waiting);
            let style = if waits { pen.look.strong() } else { pen.look.alarm() };
            pen.text(state, &words::trend_words(view), style);
        }
    }
}

fn cells(pen: &mut Pen<'_>, area: Rect, view: &SessionView) {
    let mut rest = area;
    pen.text(take(&mut rest, 1), &words::limits_words(view), pen.look.faint());
    let names = view.cells.iter().map(|cell| width(&pen.look.text(&tame(&cell.dial.instrument))));
    let name = names.max().unwrap_or(0).min(usize::from(rest.width) / 4);
    for cell in &view.cells {
        let row = take(&mut rest, 1);
        let mut at = row;
        at.width = u16::try_from(name).unwrap_or(row.width).min(row.width);
        pen.text(at, &tame(&cell.dial.instrument), pen.look.strong());
        let after = (at.width + 1).min(row.width);
        let mut at = Rect { x: row.x + after, width: row.width - after, ..row };
        let alive = cell.dial.is_alive();
        let style = match (alive, cell.off) {
            (true, false) => Style::new(),
            (true, true) => pen.look.warning(),
            (false, _) if cell.dial.state == DialState::Waiting => pen.look.strong(),
            (false, _) => pen.look.alarm(),
        };
        let says = words::cell_words(cell, &view.units);
        let (rate, faults) = source(&cell.dial);
        let room = usize::from(at.width).saturating_sub(width(&says) + 2);
        let both = if rate.is_empty() || faults.is_empty() {
            format!("{rate}{faults}")
        } else {
            format!("{rate}, {faults}")
        };
        if let Some(source) = [both, faults].into_iter().find(|source| width(source) <= room) {
            at = pen.right(at, &source, pen.look.faint());
        }
        pen.text(at, &says, style);
        // With six rows of numerals there is room between the cells.
        if usize::from(area.height) > 2 * view.cells.len() {
            take(&mut rest, 1);
        }
    }
}

/// Readings a second and faults of a cell.
fn source(dial: &Dial) -> (String, String) {
    let rate = dial.per_s.filter(|_| dial.is_alive()).map(|per_s| format!("{per_s:.1}/s"));
    let faults = match dial.faults {
        0 => String::new(),
        1 => "1 fault".to_owned(),
        n => format!("{n} faults"),
    };
    (rate.unwrap_or_default(), faults)
}

fn curve(pen: &mut Pen<'_>, area: Rect, view: &SessionView) {
    let (floor, ceiling) = view.limits_bar;
    let (mut x, mut y) = (Span::empty(), Span::empty());
    for (at_s, bar) in &view.curve {
        if bar.is_finite() {
            x.take(*at_s);
            y.take(*bar);
        }
    }
    y.take(floor);
    y.take(ceiling);
    let label_x = |s: f64| clock(s.max(0.0));
    let label_y = |bar: f64| DialKind::Po2.number(bar, None, &view.units);
    let Some(plane) = Plane::new(area, x.padded(0.0, 0.5), y.padded(0.05, 0.01)) else {
        let says = if view.curve.is_empty() { "no PO2 yet" } else { "" };
        pen.text(area, says, pen.look.faint());
        return;
    };
    plane.axes(pen, (&label_x, "h:min:s"), (&label_y, "bar"));
    let (from, to) = plane.x();
    let mut strokes =
        vec![((from, floor), (to, floor), Color::Red), ((from, ceiling), (to, ceiling), Color::Red)];
    let pairs = view.curve.iter().zip(view.curve.iter().skip(1));
    // A gap in the readings stays a gap.
    strokes.extend(
        pairs
            .filter(|(a, b)| a.1.is_finite() && b.1.is_finite() && b.0 - a.0 < 15.0)
            .map(|(a, b)| (*a, *b, Color::Cyan)),
    );
    plane.lines(pen, &strokes);
    plane.word(pen, floor, "floor");
    plane.word(pen, ceiling, "ceiling");
    for event in &view.events {
        plane.glyph(pen, (event.at_s, ceiling), letter(&event.what), pen.look.strong());
    }
    if let Some(last) = view.curve.last() {
        plane.glyph(pen, *last, "+", pen.look.strong());
    }
}

/// The key of an event, as its sign on the curve.
const fn letter(what: &What) -> &'static str {
    match what {
        What::Injection(_) => "i",
        What::OxygenAdd(_) => "o",
        What::DiluentAdd(_) => "d",
        What::Vent(_) => "v",
        What::MakeUp { .. } => "m",
        What::Exclude { .. } => "x",
        What::Stop => "s",
    }
}

/// The events, newest first.
fn events(pen: &mut Pen<'_>, area: Rect, view: &SessionView) {
    let mut rest = area;
    pen.text(take(&mut rest, 1), "events, newest first", pen.look.faint());
    let columns = usize::from(rest.width);
    let mut lines: Vec<String> = Vec::new();
    let room = usize::from(rest.height);
    for (place, event) in view.events.iter().rev().enumerate() {
        let text = format!("{} {}", letter(&event.what), words::event_words(event, &view.units));
        let these = wrap(&text, columns);
        let left = view.events.len() - place;
        if lines.len() + these.len() + usize::from(left > 1) > room {
            lines.truncate(room.saturating_sub(1));
            lines.push(format!("{left} earlier: Tab"));
            break;
        }
        lines.extend(these);
    }
    for (row, line) in rows(rest).zip(&lines) {
        pen.text(row, line, Style::new());
    }
}

/// Everything in lines, nothing of it shortened.
pub(super) fn everything(view: &SessionView, columns: u16) -> Vec<String> {
    let columns = usize::from(columns.saturating_sub(2));
    let mut all = Vec::new();
    let mut add = |text: &str| all.extend(wrap(text, columns));
    for alarm in &view.alarms {
        add(&format!("ALARM {}", words::alarm_words(alarm, &view.units)));
    }
    add(&words::title(view));
    add(&words::whereabouts(view));
    let po2 = words::po2_number(view).unwrap_or_else(|| "--".to_owned());
    add(&format!("PO2 {po2} bar, {} ({})", words::trend_words(view), words::limits_words(view)));
    for dial in view.cells.iter().map(|cell| &cell.dial).chain(&view.around) {
        add(&parts::whole_dial(dial, &view.units));
    }
    add(&words::injection_words(view));
    add(&view.saved.words("row"));
    for event in view.events.iter().rev() {
        add(&format!("{} {}", letter(&event.what), words::event_words(event, &view.units)));
    }
    all
}

/// The keys, each with its sentence.
fn help(columns: u16) -> Vec<String> {
    let keys = [
        ("o", "oxygen was added by hand now; how much, where it was metered"),
        ("d", "diluent was added now, beyond what keeps the volume"),
        ("i", "the injection is another one from now on: a flow, an IP, or off"),
        ("v", "loop gas was let out now"),
        ("x", "readings between two times do not count"),
        ("m", "the loop is kept in another way from now on, or is back at its first volume"),
        ("s", "stop: the session is over"),
        ("q", "leave the session open, to go on later. Ctrl-C does the same"),
        ("Tab", "everything in lines: alarms, cells, all events; arrows and Page Down move in it"),
        ("Esc", "cancels a question"),
    ];
    let mut lines = parts::help_lines(&keys, columns);
    lines.push(String::new());
    let signs = "Alarms: PO2 below the floor or above the ceiling, too deep, a cell or another instrument that is missing, \
                 stale or frozen, a cell off the others, PO2 that rises unfed. Dashes in place of a value: it is not of \
                 now.";
    lines.extend(wrap(signs, usize::from(columns.saturating_sub(2))));
    lines
}

/// Where there is no room for the screen: the alarms first, then that it is too small, then the session in lines.
fn small(pen: &mut Pen<'_>, area: Rect, view: &SessionView, stage: &Stage<Asked>) {
    let mut rest = area;
    parts::key_bar(pen, &mut rest, &KEYS);
    let most = (area.height / 2).max(2);
    if !view.alarms.is_empty() {
        alarms(pen, &mut rest, view, most);
    }
    parts::too_small(pen, take(&mut rest, 1), area);
    parts::bottom(pen, stage, trouble(view).as_deref(), &mut rest);
    let columns = usize::from(area.width.saturating_sub(2));
    let mut lines = wrap(SESSION_LIVE, columns);
    lines.extend(words::session_parts(view).iter().flat_map(|part| wrap(part, columns)));
    let lines: Vec<(String, Style)> = lines.into_iter().map(|line| (line, Style::new())).collect();
    pen.lines(inset(rest, 1), &lines);
}
