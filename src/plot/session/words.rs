//! What the plate of a session says in words and numbers.
//!
//! Comes in: a session, its uptake, what is drawn. Goes out: [`Words`], each already cleaned of what cannot be drawn.
//! Values are rounded as the report does it. Left out: tick labels and legend.

use super::SessionPlot;
use super::clock::elapsed;
use super::seen::{Cell, Fit, Mark, Seen, litres, made_up};
use crate::entry::{Injection, Session, What};
use crate::report::Units;
use crate::report::number::{figures, fixed, percent, u_alone, value_and_u};
use crate::uptake::{CellTrouble, Jump, Origin, Proposal, SessionUptake};

use super::super::letters::clean;
use super::super::number::short;

/// So many events and segments are named in the description; of more, the number is said.
const MOST_NAMED: usize = 12;

/// All texts but tick labels and legend.
pub(super) struct Words {
    /// Of the picture, for readers who do not see it.
    pub title: String,
    pub description: String,
    pub name: String,
    pub about: String,
    pub po2_axis: Vec<String>,
    pub time_axis: Vec<String>,
    pub flow_axis: Vec<String>,
    pub depth_axis: Vec<String>,
    /// The uptake, or that there is none.
    pub answer: String,
    pub is_number: bool,
    /// What stands under it: interval, or the reason.
    pub answer_detail: String,
    pub volume: Option<String>,
    /// The place and the diver.
    pub who: String,
    /// Where PO2 passed the floor or the ceiling.
    pub passed: Vec<String>,
    /// Each segment: in one line, in two, in three, and in the margin.
    pub segments: Vec<SegmentWords>,
    /// Each event: in full, and short.
    pub events: Vec<[String; 2]>,
    /// Each unmarked jump: beside its sign, and in the margin.
    pub jumps: Vec<[String; 2]>,
    pub floor: String,
    pub ceiling: String,
    /// Each drawn cell in the legend.
    pub cells: Vec<String>,
    pub cells_not_drawn: Option<String>,
    /// How to read it: in full, and for where there is little room.
    pub notes: [String; 2],
}

/// What a segment says.
pub(super) struct SegmentWords {
    pub lines: [Vec<String>; 3],
    pub key: String,
}

impl Words {
    pub(super) fn new(
        session: &Session,
        uptake: &SessionUptake,
        seen: &Seen<'_>,
        options: &SessionPlot,
    ) -> Self {
        let units = &options.units;
        let flow = units.flow_symbol();
        let name = match clean(&options.name).trim() {
            "" => "Session".to_owned(),
            name => name.to_owned(),
        };
        let place = session.place.name();
        let diver = clean(session.diver.as_str()).trim().to_owned();
        let taken = session.taken.format("%Y-%m-%d %H:%M %:z").to_string();
        let (answer, is_number, answer_detail) = answer(uptake, units, options);
        let jumps = seen.jumps.iter().map(jump).collect();
        let mut words = Self {
            title: format!("Session {name} of {diver}: oxygen partial pressure against time"),
            description: String::new(),
            about: format!("{diver}, {place}, {}, {taken}", session.kept.name()),
            name,
            po2_axis: vec!["oxygen partial pressure PO2, bar".to_owned(), "PO2, bar".to_owned()],
            time_axis: vec!["elapsed time, h:mm:ss".to_owned(), "h:mm:ss".to_owned()],
            flow_axis: vec![
                format!("oxygen injected, {flow} STPD"),
                format!("injected, {flow} STPD"),
                format!("{flow} STPD"),
            ],
            depth_axis: vec![
                format!("depth (dotted), {}", depth_symbol(units)),
                format!("depth, {}", depth_symbol(units)),
            ],
            answer,
            is_number,
            answer_detail,
            volume: volume(uptake),
            who: format!("{place}, diver {diver}"),
            passed: passed(seen),
            segments: seen.fits.iter().map(|fit| segment(fit, units)).collect(),
            events: seen.marks.iter().map(|m| [event(m, units, false), event(m, units, true)]).collect(),
            jumps,
            floor: format!("floor {} bar ({place})", fixed(seen.limits.0, 2)),
            ceiling: format!("ceiling {} bar ({place})", fixed(seen.limits.1, 2)),
            cells: seen.cells.iter().map(cell).collect(),
            cells_not_drawn: not_drawn(seen),
            notes: notes(flow),
        };
        words.description = describe(seen, &words);
        words
    }
}

/// The unit of depths.
pub(super) fn depth_symbol(units: &Units) -> &'static str {
    units.unit(crate::quantity::unit::Kind::Length).symbol
}

/// A depth in metres in the unit it is shown in.
pub(super) fn depth(units: &Units, m: f64) -> f64 {
    units.unit(crate::quantity::unit::Kind::Length).from_si(m)
}

fn answer(uptake: &SessionUptake, units: &Units, options: &SessionPlot) -> (String, bool, String) {
    let flow = units.flow_symbol();
    match &uptake.answer {
        Ok(estimate) if estimate.uptake_l_min.is_finite() && estimate.u.is_finite() => {
            let (low, high) = estimate.interval_95;
            let (value, u) = value_and_u(units.flow(estimate.uptake_l_min), units.flow(estimate.u));
            let decimals = u.split_once('.').map_or(0, |(_, d)| d.len()) as i32;
            let end = |x: f64| fixed(units.flow(x), decimals);
            let detail = if low.is_finite() && high.is_finite() {
                format!("95\u{a0}%: {} to {} {flow} STPD", end(low), end(high))
            } else {
                "its interval is open".to_owned()
            };
            (format!("{value} {flow}"), true, detail)
        }
        _ => {
            let why = options.why_not.as_deref().map(clean).unwrap_or_default();
            ("No number".to_owned(), false, why.trim().to_owned())
        }
    }
}

fn volume(uptake: &SessionUptake) -> Option<String> {
    let volume = uptake.answer.as_ref().ok()?.loop_volume;
    if !(volume.litres.is_finite() && volume.u.is_finite()) {
        return None;
    }
    let (value, u) = value_and_u(volume.litres, 2.0 * volume.u);
    let origin = match volume.origin {
        Origin::Given => "as stated",
        Origin::Found => "found from the slopes",
        Origin::Both => "stated, and corrected by the slopes",
    };
    let u = if u.is_empty() { u } else { format!(" ±\u{a0}{u}") };
    Some(format!("Loop volume {value}{u}\u{a0}L (k\u{a0}=\u{a0}2), {origin}"))
}

fn passed(seen: &Seen<'_>) -> Vec<String> {
    let ends = [
        (seen.passed.0, "fell below the floor of", seen.limits.0),
        (seen.passed.1, "rose above the ceiling of", seen.limits.1),
    ];
    ends.into_iter()
        .filter_map(|(at, what, limit)| {
            at.map(|at| format!("PO2 {what} {} bar at {}", fixed(limit, 2), elapsed(at)))
        })
        .collect()
}

fn segment(fit: &Fit, units: &Units) -> SegmentWords {
    let s = &fit.segment;
    let (kind, flow) = (s.kind.name(), units.flow_symbol());
    let number = |x: f64, count| if x.is_finite() { figures(x, count) } else { "?".to_owned() };
    let injection = number(units.flow(s.injection_l_min), 3);
    let uptake = match s.uptake_l_min.filter(|m| m.is_finite()) {
        Some(m) => {
            let (value, u) = value_and_u(units.flow(m), units.flow(s.u));
            if u.is_empty() { value } else { format!("{value} ± {u}") }
        }
        None => "not positive".to_owned(),
    };
    let (value, u) = uptake.split_once(" ± ").unwrap_or((&uptake, ""));
    let mut narrow = vec![kind.to_owned(), format!("in {injection}"), format!("uptake {value}")];
    if !u.is_empty() {
        narrow.push(format!("± {u} {flow}"));
    }
    SegmentWords {
        lines: [
            vec![format!("{kind}: injection {injection}, uptake {uptake} {flow}")],
            vec![format!("{kind}, injection {injection}"), format!("uptake {uptake} {flow}")],
            narrow,
        ],
        key: format!("{kind}, injection {injection}, uptake {uptake} {flow} STPD"),
    }
}

fn event(mark: &Mark, units: &Units, brief: bool) -> String {
    let litres = |amount| match litres(amount) {
        Some((l, _)) if brief => format!(" {}\u{a0}L", figures(l, 2)),
        Some((l, true)) => format!(" {}\u{a0}L\u{a0}STPD", figures(l, 3)),
        Some((l, false)) => format!(" {}\u{a0}L as read", figures(l, 3)),
        None => String::new(),
    };
    match mark.what {
        What::Injection(Injection::Off) => (if brief { "off" } else { "injection off" }).to_owned(),
        What::Injection(injection) => match (mark.injection_l_min, injection) {
            (Some(l_min), _) => {
                let value = figures(units.flow(l_min), 3);
                if brief { value } else { format!("injection {value}\u{a0}{}", units.flow_symbol()) }
            }
            (None, Injection::Ip(ip)) => {
                format!(
                    "IP\u{a0}{}\u{a0}{}",
                    short(units.pressure(ip.value.as_bar())),
                    units.pressure_symbol()
                )
            }
            (None, _) => "injection".to_owned(),
        },
        What::OxygenAdd(amount) => gas(if brief { "O2" } else { "oxygen" }, "added", litres(amount), brief),
        What::DiluentAdd(amount) => {
            gas(if brief { "dil." } else { "diluent" }, "added", litres(amount), brief)
        }
        What::Vent(amount) => gas("vent", "", litres(amount), brief),
        What::MakeUp { kept, mark } if brief => match kept {
            Some(kept) => kept.name().to_owned(),
            None => (if mark { "mark" } else { "made up" }).to_owned(),
        },
        What::MakeUp { kept, mark } => made_up(kept, mark),
        What::Stop => "stop".to_owned(),
        What::Exclude { .. } => String::new(),
    }
}

/// What went in or out, with its amount where it is known.
fn gas(what: &str, verb: &str, amount: String, brief: bool) -> String {
    if amount.is_empty() && !brief && !verb.is_empty() {
        format!("{what} {verb}")
    } else {
        format!("{what}{amount}")
    }
}

fn jump(jump: &Proposal) -> [String; 2] {
    let looks = match jump.looks_like {
        Jump::OxygenAdd => "oxygen added?",
        Jump::DiluentAdd => "diluent added?",
    };
    let change = if jump.change_bar.is_finite() {
        let sign = if jump.change_bar < 0.0 { "\u{2212}" } else { "+" };
        format!("{sign}{} bar", fixed(jump.change_bar.abs(), 2))
    } else {
        "jump".to_owned()
    };
    let near = format!("{change}, {looks}");
    [near.clone(), format!("{}: {near}", elapsed(jump.at_s))]
}

fn cell(cell: &Cell<'_>) -> String {
    let mut text = clean(cell.name).trim().to_owned();
    if text.is_empty() {
        text = format!("cell {}", cell.index + 1);
    }
    if let Some(why) = cell.left_out {
        text.push_str(&match why {
            CellTrouble::Faults(share) => format!(", left out: {} faults", percent(share)),
            CellTrouble::Frozen { from_s, to_s } => {
                format!(", left out: frozen {} to {}", elapsed(from_s), elapsed(to_s))
            }
            CellTrouble::Off(bar) => format!(", left out: {}\u{a0}bar off the median", u_alone(bar.abs())),
            CellTrouble::Calibration => ", left out: no calibration".to_owned(),
        });
    }
    match cell.beyond {
        0 => {}
        1 => text.push_str(" (1 reading beyond the panel)"),
        n => text.push_str(&format!(" ({n} readings beyond the panel)")),
    }
    text
}

fn not_drawn(seen: &Seen<'_>) -> Option<String> {
    let names: Vec<String> = seen.cells_not_drawn.iter().map(|n| clean(n).trim().to_owned()).collect();
    match names.as_slice() {
        [] => None,
        [name] => Some(format!("Cell not drawn: {name}")),
        names => Some(format!("Cells not drawn: {}", names.join(", "))),
    }
}

fn notes(flow: &str) -> [String; 2] {
    let stpd =
        format!("{flow} STPD: 0\u{a0}°C, 101.325\u{a0}kPa, dry; injection is oxygen, its purity counted.");
    [
        format!(
            "{stpd} ± of a segment: one standard uncertainty from noise, wander and loop volume. Uptake at rest is \
             the lowest demand, and another day's rest differs."
        ),
        "Flows STPD. ± of a segment: standard uncertainty. Another day's rest differs.".to_owned(),
    ]
}

/// The picture in sentences.
fn describe(seen: &Seen<'_>, words: &Words) -> String {
    let mut text = format!(
        "PO2 of {} cells from {} to {}, {}. ",
        seen.cells.len(),
        elapsed(seen.times.0),
        elapsed(seen.times.1),
        words.about
    );
    if words.is_number {
        text.push_str(&format!("Resting oxygen uptake {} ({}).", words.answer, words.answer_detail));
    } else if words.answer_detail.is_empty() {
        text.push_str("There is no number.");
    } else {
        text.push_str(&format!("No number: {}.", words.answer_detail.trim_end_matches('.')));
    }
    if let Some(volume) = &words.volume {
        text.push_str(&format!(" {volume}."));
    }
    for passed in &words.passed {
        text.push_str(&format!(" {passed}."));
    }
    let mut list = |head: &str, items: Vec<String>| {
        if !items.is_empty() {
            let more = items.len().saturating_sub(MOST_NAMED);
            let named: Vec<String> = items.into_iter().take(MOST_NAMED).collect();
            let more = if more > 0 { format!("; and {more} more") } else { String::new() };
            text.push_str(&format!(" {head}: {}{more}.", named.join("; ")));
        }
    };
    list(
        "Segments",
        seen.fits
            .iter()
            .zip(&words.segments)
            .map(|(fit, words)| {
                format!("{} to {} {}", elapsed(fit.segment.from_s), elapsed(fit.segment.to_s), words.key)
            })
            .collect(),
    );
    list(
        "Events",
        seen.marks.iter().zip(&words.events).map(|(m, w)| format!("{} {}", elapsed(m.at_s), w[0])).collect(),
    );
    list("Jumps no event explains", words.jumps.iter().map(|jump| jump[1].clone()).collect());
    list(
        "Left out",
        seen.stretches
            .iter()
            .map(|s| format!("{} to {} {}", elapsed(s.from_s), elapsed(s.to_s), s.reason.words().1))
            .collect(),
    );
    list(
        "Cells left out",
        seen.cells
            .iter()
            .zip(&words.cells)
            .filter(|(c, _)| c.left_out.is_some())
            .map(|(_, w)| w.clone())
            .collect(),
    );
    text.replace('\u{a0}', " ")
}
