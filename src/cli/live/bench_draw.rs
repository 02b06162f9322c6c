//! A bench run on the screen: two dials, the sign, the points with their line, what they say, the keys.

use ratatui::buffer::Buffer;
use ratatui::layout::Rect;
use ratatui::style::Style;

use super::bench_plot;
use super::bench_scene::{Asked, KEYS};
use super::look::Look;
use super::numerals::{self, Size};
use super::pen::{Pen, inset, joined, rows, take, take_below, width, wrap};
use super::stage::{Page, Stage, draw_lines};
use super::{level, parts};
use crate::entry::Sweep;
use crate::report::bench_live::{self as words, BenchView, CheckSeen, Holds, PointSeen};
use crate::report::live_parts::Dial;
use crate::report::typed::tame;

/// From this size on the numerals have six rows.
const LARGE: (u16, u16) = (120, 34);
/// Rows that the instruments take at most.
const MOST_INSTRUMENTS: usize = 3;
/// Rows that points and plot have at least.
const LEAST_BODY: u16 = 5;

/// Draws a run.
pub(super) fn draw(
    buffer: &mut Buffer,
    area: Rect,
    look: Look,
    view: Option<&BenchView>,
    stage: &Stage<Asked>,
) {
    let pen = &mut Pen { buffer, look };
    let Some(view) = view else {
        pen.text(inset(area, 1), "waiting for the instruments", Style::new());
        return;
    };
    if parts::is_small(area) {
        return small(pen, area, view, stage);
    }
    let mut rest = area;
    head(pen, take(&mut rest, 2), view);
    parts::key_bar(pen, &mut rest, &KEYS);
    let aside = status(pen, take_below(&mut rest, 1), view);
    parts::bottom(pen, stage, trouble(view).or(aside).as_deref(), &mut rest);
    match stage.page {
        Page::Main => main(pen, rest, view),
        Page::All(from) => draw_lines(pen, inset(rest, 1), &everything(view, look, area.width), from),
        Page::Help(from) => draw_lines(pen, inset(rest, 1), &help(area.width), from),
    }
}

/// What the run is and where it stands: side by side above a rule, or below one another where that is too long.
fn head(pen: &mut Pen<'_>, area: Rect, view: &BenchView) {
    let (title, whereabouts) = (words::title(view), words::whereabouts(view));
    let mut rest = area;
    let first = inset(take(&mut rest, 1), 1);
    if width(&pen.look.text(&title)) + 2 + width(&whereabouts) > usize::from(first.width) {
        pen.text(first, &title, pen.look.strong());
        pen.right(inset(rest, 1), &whereabouts, Style::new());
        return;
    }
    let left = pen.right(first, &whereabouts, Style::new());
    pen.text(left, &title, pen.look.strong());
    pen.rule(rest);
}

/// What is saved and who takes points; goes out: what is not saved, where that is too long for the row.
fn status(pen: &mut Pen<'_>, row: Rect, view: &BenchView) -> Option<String> {
    let row = inset(row, 1);
    let left = pen.right(row, parts::MORE, pen.look.faint());
    let hold = view.hold.words().unwrap_or_else(|| words::by_itself_words(view).to_owned());
    parts::status(pen, left, &view.saved, &view.saved.words("reading"), &hold)
}

/// The screen at a size where everything has its place.
fn main(pen: &mut Pen<'_>, area: Rect, view: &BenchView) {
    let mut rest = area;
    let whole = pen.buffer.area;
    let size = size(whole, view);
    dials(pen, take(&mut rest, size.rows() + 2), view, size);
    let columns = usize::from(area.width.saturating_sub(2));
    let instruments = joined(&instruments(view), columns);
    for line in instruments.iter().take(MOST_INSTRUMENTS) {
        let row = take(&mut rest, 1);
        pen.text(inset(row, 1), line, pen.look.faint());
    }
    sign(pen, take(&mut rest, 1), view);
    progress(pen, take(&mut rest, 1), view);
    let rule = take(&mut rest, 1);
    pen.rule(rule);

    let says = sayings(view, columns);
    let room = rest.height.saturating_sub(LEAST_BODY.min(rest.height));
    let below = u16::try_from(says.len()).unwrap_or(u16::MAX).min(room);
    let below = take_below(&mut rest, below);
    sayings_in(pen, inset(below, 1), &says);

    let wide = (rest.width / 2).max(rest.width.saturating_sub(60));
    let left = Rect { width: wide, ..rest };
    bench_plot::draw(pen, inset(left, 1), view);
    let right = Rect { x: rest.x + wide, width: rest.width - wide, ..rest };
    pen.bar(right);
    points(pen, inset(right, 1), view);
}

/// The size at which both dials fit.
fn size(whole: Rect, view: &BenchView) -> Size {
    let columns = (whole.width / 2).saturating_sub(3);
    let large = [&view.pressure, &view.flow]
        .into_iter()
        .all(|dial| numerals::fits(columns, &number(dial, view), dial.kind.symbol(&view.units), Size::Six));
    if large && whole.width >= LARGE.0 && whole.height >= LARGE.1 { Size::Six } else { Size::Three }
}

/// The number on a dial; dashes where it is not of now.
fn number(dial: &Dial, view: &BenchView) -> String {
    let number = dial.number(&view.units).unwrap_or_else(|| "0.00".to_owned());
    if dial.is_alive() { number } else { parts::dashes(&number) }
}

fn dials(pen: &mut Pen<'_>, area: Rect, view: &BenchView, size: Size) {
    let half = area.width / 2;
    let left = Rect { width: half, ..area };
    let right = Rect { x: area.x + half, width: area.width - half, ..area };
    pen.bar(right);
    dial(pen, inset(left, 1), (&view.pressure, size), view);
    dial(
        pen,
        Rect { x: right.x + 2, width: right.width.saturating_sub(3), ..right },
        (&view.flow, size),
        view,
    );
}

fn dial(pen: &mut Pen<'_>, area: Rect, (dial, size): (&Dial, Size), view: &BenchView) {
    let mut rest = area;
    let head = take(&mut rest, 1);
    let name = dial.kind.name();
    pen.text(head, &format!("{} {}", name, tame(&dial.meant)), pen.look.faint());
    let state = take_below(&mut rest, 1);
    let style = if dial.is_alive() { Style::new() } else { pen.look.faint() };
    numerals::draw(pen, rest, &number(dial, view), dial.kind.symbol(&view.units), (size, style));
    parts::state(pen, state, dial, &view.units);
}

/// The trouble of an instrument that keeps a value from being of now.
fn trouble(view: &BenchView) -> Option<String> {
    parts::trouble([&view.pressure, &view.flow].into_iter().chain(&view.around))
}

/// The instruments with their rates and faults, and the small dials.
fn instruments(view: &BenchView) -> Vec<String> {
    let mut parts = vec![view.pressure.source_words(), view.flow.source_words()];
    parts.extend(view.around.iter().map(|dial| parts::small_dial(dial, &view.units)));
    parts
}

/// The steady sign: ready, or how far it is, and why not.
fn sign(pen: &mut Pen<'_>, row: Rect, view: &BenchView) {
    let mut row = inset(row, 1);
    let says = words::sign_words(view);
    if view.sign.steady {
        if view.taken_here {
            pen.text(row, &says, pen.look.strong());
        } else {
            pen.text(row, &format!(" {says} "), pen.look.ready());
        }
        return;
    }
    if let Some(held) = words::held_besides(&view.sign) {
        row = pen.right(row, &held, Style::new());
    }
    let gauge = Rect { x: row.right().saturating_sub(20), width: 20.min(row.width), ..row };
    let share = view.sign.held_s / view.sign.least_s;
    let long = width(&pen.look.text(&says)) + 22 > usize::from(row.width);
    if !long {
        pen.gauge(gauge, share, pen.look.accent());
        row.width = row.width.saturating_sub(22);
    }
    pen.text(row, &says, pen.look.strong());
}

/// How far the run has come.
fn progress(pen: &mut Pen<'_>, row: Rect, view: &BenchView) {
    let row = inset(row, 1);
    let mut left = pen.right(row, &words::next_words(view), pen.look.accent());
    let says = words::progress_words(view);
    let room = usize::from(left.width).saturating_sub(width(&says));
    if let Some(wanted) = view.sweep.wanted.filter(|wanted| *wanted > 0 && room > 12) {
        let gauge = Rect { width: 12.min(left.width), ..left };
        pen.gauge(gauge, view.points.len() as f64 / wanted as f64, pen.look.accent());
        left =
            Rect { x: left.x + gauge.width + 1, width: left.width.saturating_sub(gauge.width + 1), ..left };
    }
    pen.text(left, &says, Style::new());
}

/// A line of what the points say, and the finding it stands for.
struct Saying {
    mark: Option<Holds>,
    text: String,
}

/// What the points say, what matters most first: the running line, checks that do not hold, those that are open.
fn sayings(view: &BenchView, columns: usize) -> Vec<Saying> {
    let mut all = Vec::new();
    let plain = |says: &String| {
        wrap(&tame(says), columns).into_iter().map(|text| Saying { mark: None, text }).collect::<Vec<_>>()
    };
    let checks = |holds: Holds| {
        let these = view.checks.iter().filter(move |check| check.holds == holds);
        these.flat_map(|check| check_lines(check, columns))
    };
    all.extend(view.says.iter().take(1).flat_map(plain));
    all.extend(checks(Holds::No));
    all.extend(view.says.iter().skip(1).flat_map(plain));
    all.extend(checks(Holds::Open));
    let hold = view.checks.iter().filter(|check| check.holds == Holds::Yes).count();
    if hold > 0 {
        let text = match hold {
            1 => "1 check holds".to_owned(),
            n => format!("{n} checks hold"),
        };
        all.push(Saying { mark: Some(Holds::Yes), text });
    }
    all
}

/// A check with its stroke before the first of its lines.
fn check_lines(check: &CheckSeen, columns: usize) -> Vec<Saying> {
    let lines = wrap(&tame(&check.says), columns.saturating_sub(4));
    let lines = lines.into_iter().enumerate();
    lines
        .map(|(place, text)| match place {
            0 => Saying { mark: Some(check.holds), text },
            _ => Saying { mark: None, text: format!("    {text}") },
        })
        .collect()
}

/// A line behind the stroke of its check.
fn marked(saying: &Saying, look: Look) -> String {
    match saying.mark {
        Some(holds) => format!("{} {}", level::of_check(holds, look), saying.text),
        None => saying.text.clone(),
    }
}

fn sayings_in(pen: &mut Pen<'_>, area: Rect, says: &[Saying]) {
    let room = usize::from(area.height);
    let more = says.len() > room;
    for (place, (row, saying)) in rows(area).zip(says).enumerate() {
        if more && place + 1 == room {
            let text = format!("{} more lines: Tab", says.len() - place);
            pen.text(row, &text, pen.look.ready());
            return;
        }
        let style = match saying.mark {
            Some(Holds::No) => pen.look.warning(),
            _ => Style::new(),
        };
        pen.text(row, &marked(saying, pen.look), style);
    }
}

/// The points, newest first.
fn points(pen: &mut Pen<'_>, area: Rect, view: &BenchView) {
    let mut rest = area;
    let head = take(&mut rest, 1);
    let (p, q) = (view.units.pressure_symbol(), view.units.flow_symbol());
    pen.text(head, &format!("{:>3} {p:>7} {q:>7}   off the line", "no"), pen.look.faint());
    let room = usize::from(rest.height);
    let more = view.points.len().saturating_sub(room);
    for (place, (row, point)) in rows(rest).zip(view.points.iter().rev()).enumerate() {
        if more > 0 && place + 1 == room {
            let text = format!("{:>3} earlier points: Tab", view.points.len() - place);
            pen.text(row, &text, pen.look.faint());
            return;
        }
        let (pressure, flow) = words::point_numbers(view, point);
        let mark = mark(point, pen.look);
        let text = format!("{:>3} {pressure:>7} {flow:>7} {mark} ", point.number);
        let columns = usize::from(row.width).saturating_sub(width(&text));
        let style = match (&point.left_out, point.apart) {
            (Some(_), _) => pen.look.faint(),
            (None, true) => pen.look.warning(),
            (None, false) => Style::new(),
        };
        let remark = short_remark(point, columns, pen.look);
        pen.text(row, &format!("{text}{remark}"), style);
    }
}

/// The remark at a point, or what is left of it where that is too long.
fn short_remark(point: &PointSeen, columns: usize, look: Look) -> String {
    let whole = words::point_remark(point);
    if width(&look.text(&whole)) <= columns {
        return whole;
    }
    match (&point.left_out, point.apart) {
        (Some(_), _) => "left out".to_owned(),
        (None, true) => "lies apart".to_owned(),
        (None, false) => whole,
    }
}

/// The sign of a point, in the table and on the plot: the direction of its sweep, or that it does not count.
pub(super) const fn mark(point: &PointSeen, look: Look) -> &'static str {
    match (&point.left_out, point.sweep) {
        (Some(_), _) => look.glyph("×", "x"),
        (None, Some(Sweep::Rising)) => look.glyph("▲", "^"),
        (None, Some(Sweep::Falling)) => look.glyph("▼", "v"),
        (None, None) => look.glyph("●", "o"),
    }
}

/// Everything in lines, nothing of it shortened.
pub(super) fn everything(view: &BenchView, look: Look, columns: u16) -> Vec<String> {
    let columns = usize::from(columns.saturating_sub(2));
    let mut all = Vec::new();
    let mut add = |text: &str| all.extend(wrap(text, columns));
    add(&words::title(view));
    add(&words::whereabouts(view));
    add(&format!("{} · {}", words::progress_words(view), words::next_words(view)));
    add(&words::sign_words(view));
    for dial in [&view.pressure, &view.flow].into_iter().chain(&view.around) {
        add(&parts::whole_dial(dial, &view.units));
    }
    add(&view.saved.words("reading"));
    for says in &view.says {
        add(&tame(says));
    }
    for check in &view.checks {
        all.extend(check_lines(check, columns).iter().map(|line| marked(line, look)));
    }
    for point in view.points.iter().rev() {
        let text = format!("{} {}", mark(point, look), words::point_line(view, point));
        all.extend(wrap(&text, columns));
    }
    all
}

/// The keys, each with its sentence.
fn help(columns: u16) -> Vec<String> {
    let keys = [
        ("space", "take a point now, of all readings that are steady and in no point yet"),
        ("a", "points by themselves as soon as it is steady at a new level, or only at the space key"),
        ("l", "leave a point out: its number and the reason are asked; it stays in the record"),
        ("f", "finish the run: all points are in"),
        ("q", "leave the run open; bench resume goes on with it. Ctrl-C does the same"),
        ("Tab", "everything in lines: instruments, checks, all points; arrows and Page Down move in it"),
        ("Esc", "cancels a question"),
    ];
    let mut lines = parts::help_lines(&keys, columns);
    lines.push(String::new());
    let signs = "The stroke beside a value lies level while it is steady and tilts with its drift. Beside a check it is whole \
                 when it holds, broken when it is open, crossed when it does not hold. Points: up and down triangles \
                 for the rising and falling sweep, a cross for one that does not count. Dashes in place of a value: it is \
                 stale, frozen or lost.";
    lines.extend(wrap(signs, usize::from(columns.saturating_sub(2))));
    lines
}

/// Where there is no room for the screen: that it is too small, and the run in lines.
fn small(pen: &mut Pen<'_>, area: Rect, view: &BenchView, stage: &Stage<Asked>) {
    let mut rest = area;
    parts::too_small(pen, take(&mut rest, 1), area);
    parts::key_bar(pen, &mut rest, &KEYS);
    parts::bottom(pen, stage, trouble(view).as_deref(), &mut rest);
    let columns = usize::from(area.width.saturating_sub(2));
    let points = view.points.iter().rev().map(|point| words::point_line(view, point));
    let parts = words::bench_parts(view).into_iter().chain(points);
    let lines: Vec<String> = parts.flat_map(|part| wrap(&part, columns)).collect();
    let lines: Vec<(String, Style)> = lines.into_iter().map(|line| (line, Style::new())).collect();
    pen.lines(inset(rest, 1), &lines);
}
