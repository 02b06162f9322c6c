//! A diver's resting uptake as text: the number first, then what it rests on, what would narrow it, and the cautions.

use super::Units;
use super::cautions::{SESSION, UPTAKE};
use super::layout::{counted, table, wrapped};
use super::number::{figures, fixed, u_alone, value_and_u};
use super::session_limits;
use super::typed::{clock, tame};
use super::uptake_sentences::{self as say, from_to};
use crate::entry::{LoopKept, Place, Session};
use crate::quantity::unit::Kind as Quantity;
use crate::uptake::{
    Estimate, Kind, LoopVolume, MonteCarlo, Origin, PlaceUptake, RestDoubt, RestItem, SegmentUptake,
    SessionUptake, StretchLeftOut, StretchWhy, Uptake, Warning, WhyNot,
};

/// A session that was handed in, with what it is called.
#[derive(Debug, Clone, Copy)]
pub struct Named<'a> {
    /// Its number in the book, or its file.
    pub name: &'a str,
    /// What was recorded.
    pub session: &'a Session,
    /// Where the injection's line comes from, in words; none where events give flows.
    pub line: Option<&'a str>,
}

/// Everything that is said of an uptake.
#[derive(Debug, Clone, Copy)]
pub struct Reported<'a> {
    /// What was made of the sessions.
    pub uptake: &'a Uptake,
    /// The sessions in the order they were handed in.
    pub sessions: &'a [Named<'a>],
    /// The Monte Carlo check of each place, when it was asked for.
    pub monte_carlo: &'a [(Place, MonteCarlo)],
    /// What was said on reading the files, and what was left out by hand.
    pub notes: &'a [String],
}

impl<'a> Reported<'a> {
    /// What a worked-out session is called.
    pub(super) fn name(&self, session: &SessionUptake) -> String {
        self.named(session).map_or_else(|| format!("session {}", session.index + 1), |n| tame(n.name))
    }

    /// The session as it was handed in.
    pub(super) fn named(&self, session: &SessionUptake) -> Option<&Named<'a>> {
        self.sessions.get(session.index)
    }

    /// The Monte Carlo check of a place.
    pub(super) fn monte_carlo_of(&self, place: Place) -> Option<&MonteCarlo> {
        self.monte_carlo.iter().find(|(there, _)| *there == place).map(|(_, mc)| mc)
    }

    fn worked(&self) -> impl Iterator<Item = &'a SessionUptake> {
        self.uptake.places.iter().flat_map(|place| &place.sessions)
    }
}

/// What a diver reads, 80 columns wide.
#[must_use]
pub fn text(reported: &Reported<'_>, units: &Units) -> String {
    let mut text = wrapped("", "  ", &summary_line(reported, units));
    text.push_str(&wrapped(
        "  ",
        "  ",
        "Flows are of oxygen at 0 °C and 101.325 kPa, dry (STPD); ± stands for 95 %, u for one standard \
         uncertainty.",
    ));
    if let Some((lowest, _)) = reported.uptake.lowest().filter(|_| reported.uptake.places.len() > 1) {
        let line = format!(
            "Couch and pool are never pooled: a setting takes the lower one that has a number, the {}.",
            lowest.place.name()
        );
        text.push_str(&wrapped("  ", "  ", &line));
    }
    for place in &reported.uptake.places {
        text.push('\n');
        text.push_str(&place_text(reported, place, units));
    }
    let warnings = warnings(reported, false, units);
    if !warnings.is_empty() || !reported.notes.is_empty() {
        text.push_str("\nTo know\n");
        for line in warnings.into_iter().chain(reported.notes.iter().map(|note| tame(note))) {
            text.push_str(&wrapped("  - ", "    ", &line));
        }
    }
    text.push_str("\nCautions\n");
    let beside_a_number = if reported.uptake.lowest().is_some() { &UPTAKE[..] } else { &[] };
    for caution in beside_a_number {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text.push_str("  Before the next session\n");
    for caution in SESSION {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text
}

/// The uptake, or why there is none, in one sentence.
#[must_use]
pub fn summary_line(reported: &Reported<'_>, units: &Units) -> String {
    let diver = &reported.uptake.diver;
    let Some((place, estimate)) = reported.uptake.lowest() else {
        let why = why_not(reported).unwrap_or_default();
        return format!("No resting oxygen uptake of {diver}: {why}");
    };
    let next = &estimate.next_day;
    let stpd = format!("{} STPD", units.flow_symbol());
    format!(
        "Resting oxygen uptake of {diver} ({}): {}; another day {}",
        place.place.name(),
        in_words(estimate.uptake_l_min, estimate.interval_95, units, &stpd),
        in_words(next.uptake_l_min, next.interval_95, units, &stpd)
    )
}

/// Why there is no number in any place, and what to do; none when there is one.
#[must_use]
pub fn why_not(reported: &Reported<'_>) -> Option<String> {
    if reported.uptake.lowest().is_some() {
        return None;
    }
    let worked: Vec<&SessionUptake> = reported.worked().collect();
    let reasons: Vec<String> = match worked.as_slice() {
        [] => Vec::new(),
        [only] => reason(only).into_iter().collect(),
        several => {
            several.iter().filter_map(|s| Some(format!("{}: {}", reported.name(s), reason(s)?))).collect()
        }
    };
    if !reasons.is_empty() {
        return Some(reasons.join("; "));
    }
    let places = reported.uptake.places.iter();
    Some(places.filter_map(|p| p.answer.as_ref().err().map(say::why_not)).collect::<Vec<_>>().join("; "))
}

fn session_why_not(session: &SessionUptake) -> Option<&WhyNot> {
    session.answer.as_ref().err()
}

/// Why a session has no number; a stretch that was left out for a jump could have been what is missing.
fn reason(session: &SessionUptake) -> Option<String> {
    let why = session_why_not(session)?;
    let mut reason = say::why_not(why);
    let missed = matches!(why, WhyNot::NoVolumeOneInjection | WhyNot::TooShort { .. } | WhyNot::Unbounded);
    let jump = session.left_out.iter().find(|s| matches!(s.why, StretchWhy::UnmarkedJump(_)));
    if let (true, Some(stretch)) = (missed, jump) {
        reason.push_str(&format!(
            "; {} is left out because PO2 jumps there and no event says why: an event that does may bring it back",
            from_to(stretch.from_s, stretch.to_s)
        ));
    }
    Some(reason)
}

/// What to know before trusting the number, a sentence each, with the sessions it holds for where there are several;
/// `whole` each by itself, also those that propose
/// an event and stand in the text with it.
pub(super) fn warnings<'a>(reported: &Reported<'a>, whole: bool, units: &Units) -> Vec<String> {
    let mut said: Vec<(String, Vec<&SessionUptake>)> = Vec::new();
    let mut add =
        |sentence: String, session: &'a SessionUptake| match said.iter_mut().find(|s| s.0 == sentence) {
            Some((_, sessions)) if sessions.iter().any(|s| s.index == session.index) => {}
            Some((_, sessions)) => sessions.push(session),
            None => said.push((sentence, vec![session])),
        };
    for place in &reported.uptake.places {
        for session in &place.sessions {
            for sentence in session_warnings(reported, session, whole, units) {
                add(sentence, session);
            }
            if let (Ok(_), Some(why)) = (&place.answer, session_why_not(session)) {
                add(format!("no number, and no part of the uptake: {}", say::why_not(why)), session);
            }
        }
    }
    let several = reported.sessions.len() > 1;
    let names = |mut sessions: Vec<&SessionUptake>| {
        sessions.sort_by_key(|session| session.index);
        sessions.into_iter().map(|session| reported.name(session)).collect::<Vec<_>>().join(", ")
    };
    let mut warnings: Vec<String> = said
        .into_iter()
        .map(|(sentence, of)| if several { format!("{}: {sentence}", names(of)) } else { sentence })
        .collect();
    for place in &reported.uptake.places {
        let (name, lowest) = (place.place.name(), reported.uptake.lowest());
        match &place.answer {
            Ok(estimate) => warnings.extend(
                estimate
                    .per_kilogram
                    .as_ref()
                    .and_then(say::per_kilogram_warning)
                    .map(|w| format!("{name}: {w}")),
            ),
            Err(_) if lowest.is_some() => {
                warnings.push(format!("{name}: no number, so that nothing says whether it is the lower one"));
            }
            Err(_) => {}
        }
    }
    warnings
}

/// What to know of the sessions behind a setting, by their names: what each warns of, and which gave no number.
pub(super) fn behind(uptake: &Uptake, names: &[String], units: &Units) -> Vec<String> {
    let Some((place, estimate)) = uptake.lowest() else { return Vec::new() };
    let mut said: Vec<(String, Vec<String>)> = Vec::new();
    let mut add = |sentence: String, name: &str| match said.iter_mut().find(|s| s.0 == sentence) {
        Some((_, of)) => of.push(name.to_owned()),
        None => said.push((sentence, vec![name.to_owned()])),
    };
    for session in &place.sessions {
        let name = names.get(session.index).map_or("a session", String::as_str);
        if let Err(why) = &session.answer {
            add(format!("gave no number and is no part of the uptake: {}", say::why_not(why)), name);
        }
        let mut not_said = Vec::new();
        for warning in &session.warnings {
            match warning {
                Warning::Rest(RestDoubt::NotSaid(item)) => not_said.push(*item),
                other => add(say::warning(other, units), name),
            }
        }
        if let Some(sentence) = say::rest_not_said(&not_said, units) {
            add(sentence, name);
        }
    }
    let mut all: Vec<String> =
        said.into_iter().map(|(sentence, of)| format!("{}: {sentence}", tame(&of.join(", ")))).collect();
    if estimate.per_kilogram.is_none() {
        all.push(say::mass_unknown(estimate.uptake_l_min, units));
    }
    all
}

/// What to know of one session: first what endangered the diver, then what the record lacks.
pub(super) fn session_warnings(
    reported: &Reported<'_>,
    session: &SessionUptake,
    whole: bool,
    units: &Units,
) -> Vec<String> {
    let mut warnings = Vec::new();
    if let Some(named) = reported.named(session) {
        let extremes =
            session_limits::extremes(named.session, &session.cells_left_out, Some(&session.series));
        warnings.extend(session_limits::cautions(named.session, extremes.as_ref(), units));
    }
    let not_said = |w: &Warning| match w {
        Warning::Rest(RestDoubt::NotSaid(item)) => Some(*item),
        _ => None,
    };
    let stands_elsewhere = |w: &Warning| matches!(w, Warning::UnmarkedJump(_)) || not_said(w).is_some();
    let told = session.warnings.iter().filter(|w| whole || !stands_elsewhere(w));
    warnings.extend(told.map(|w| say::warning(w, units)));
    if !whole {
        let items: Vec<RestItem> = session.warnings.iter().filter_map(not_said).collect();
        warnings.extend(say::rest_not_said(&items, units));
    }
    warnings
}

fn place_text(reported: &Reported<'_>, place: &PlaceUptake, units: &Units) -> String {
    let mut text = match place.place {
        Place::Couch => String::from("Couch\n"),
        Place::Pool => String::from("Pool\n"),
    };
    match &place.answer {
        Ok(estimate) => text.push_str(&estimate_text(reported, place.place, estimate, units)),
        // Where nothing else was handed in, the reason is the headline.
        Err(_) if reported.sessions.len() < 2 => {}
        Err(why) if place.sessions.len() < 2 => text.push_str(&row("no number", &say::why_not(why))),
        Err(_) => text.push_str(&row("no number", "none of the sessions has one; each says why")),
    }
    for session in &place.sessions {
        text.push('\n');
        text.push_str(&session_text(reported, place, session, units));
    }
    if let Ok(estimate) = &place.answer {
        text.push('\n');
        text.push_str(&budget(estimate, units));
        text.push('\n');
        text.push_str(&help(place.place, estimate, units));
    }
    text
}

fn estimate_text(reported: &Reported<'_>, place: Place, estimate: &Estimate, units: &Units) -> String {
    let next = &estimate.next_day;
    let q = units.flow_symbol();
    let days = counted(next.days as u64, "day");
    let mut text = row(
        "measured",
        &format!(
            "{} on {days}; u = {} {q}, degrees of freedom {}",
            with_interval(estimate.uptake_l_min, estimate.interval_95, units),
            u_alone(units.flow(estimate.u)),
            dof(estimate.dof)
        ),
    );
    text.push_str(&row(
        "another day",
        &format!(
            "{}; u = {} {q}, degrees of freedom {}. A prediction from {days}, and the only figure a setting uses; from \
             day to day ±{} {q} was taken (one standard deviation)",
            with_interval(next.uptake_l_min, next.interval_95, units),
            u_alone(units.flow(next.u)),
            dof(next.dof),
            u_alone(units.flow(next.day_spread_l_min))
        ),
    ));
    if let Some(per) = &estimate.per_kilogram {
        let relative = 0.5 * (estimate.interval_95.1 - estimate.interval_95.0) / estimate.uptake_l_min;
        let (value, u) = value_and_u(per.ml_kg_min, relative * per.ml_kg_min);
        let line = format!("{value} ± {u} mL/(kg·min), {}", say::plausible(per));
        text.push_str(&row("per kilogram", &line));
    } else {
        text.push_str(&row("per kilogram", &say::mass_unknown(estimate.uptake_l_min, units)));
    }
    if let Some(mc) = reported.monte_carlo_of(place) {
        text.push_str(&row("Monte Carlo", &monte_carlo(mc, units)));
    }
    text
}

fn monte_carlo(mc: &MonteCarlo, units: &Units) -> String {
    let places = decimals(&value_and_u(units.flow(mc.mean), units.flow(mc.u)).0) + 1;
    let interval =
        |i: (f64, f64)| format!("{} to {}", fixed(units.flow(i.0), places), fixed(units.flow(i.1), places));
    let failed = if mc.failed > 0 { format!(", {} without a result", mc.failed) } else { String::new() };
    format!(
        "{} trials{failed}, seed {}: 95 % from {} {q}; by the budget from {} {q}",
        mc.trials,
        mc.seed,
        interval(mc.interval_95),
        interval(mc.budget_interval_95),
        q = units.flow_symbol()
    )
}

fn session_text(
    reported: &Reported<'_>,
    place: &PlaceUptake,
    session: &SessionUptake,
    units: &Units,
) -> String {
    let name = reported.name(session);
    let title = format!("{name}, {}, taken {}", place.place.name(), session.taken.to_rfc3339());
    let mut text = wrapped("", "  ", &title);
    match &session.answer {
        Ok(estimate) => {
            let line = format!(
                "{}; u = {} {}, degrees of freedom {}",
                with_interval(estimate.uptake_l_min, estimate.interval_95, units),
                u_alone(units.flow(estimate.u)),
                units.flow_symbol(),
                dof(estimate.dof)
            );
            text.push_str(&row("uptake", &line));
            text.push_str(&row("loop volume", &loop_volume(&estimate.loop_volume, units)));
        }
        // Of a single session the reason stands already above.
        Err(_) if place.answer.is_err() && place.sessions.len() < 2 => {}
        Err(why) => text.push_str(&row("no number", &say::why_not(why))),
    }
    if let Some(line) = reported.named(session).and_then(|named| named.line) {
        text.push_str(&row("injection by", &tame(line)));
    }
    text.push_str(&row("cells", &cells(session)));
    text.push_str(&left_out(&session.left_out));
    if !session.segments.is_empty() {
        text.push_str(&segments(&session.segments, units));
    }
    for warning in &session.warnings {
        if let Warning::UnmarkedJump(proposal) = warning {
            text.push_str(&wrapped("  ", "  ", &format!("{}:", say::jump_seen(proposal))));
            for line in say::jump_lines(proposal) {
                text.push_str(&format!("    {line}\n"));
            }
        }
    }
    text
}

/// A loop volume with its origin.
fn loop_volume(volume: &LoopVolume, units: &Units) -> String {
    let unit = units.unit(Quantity::Volume);
    let (value, u) = value_and_u(unit.from_si(volume.litres / 1e3), unit.from_si(volume.u / 1e3));
    let origin = match volume.origin {
        Origin::Given => "as stated",
        Origin::Found => "found from the injections",
        Origin::Both => "stated, and corrected by the injections",
    };
    let u = if u.is_empty() { String::new() } else { format!(", u = {u} {}", unit.symbol) };
    format!("{value} {}{u}, {origin}; lungs included, at the first reading", unit.symbol)
}

/// The word for where a loop volume comes from in JSON.
pub(super) const fn origin_name(origin: Origin) -> &'static str {
    match origin {
        Origin::Given => "given",
        Origin::Found => "found",
        Origin::Both => "both",
    }
}

fn cells(session: &SessionUptake) -> String {
    let mut text = format!("{} used", session.cells_used);
    for cell in &session.cells_left_out {
        text.push_str(&format!("; left out: {}", say::cell(cell)));
    }
    text
}

/// Whether a stretch is not used at all; a topped loop's one segment spans the times after its adds.
pub(super) fn is_unused(stretch: &StretchLeftOut) -> bool {
    let spanned = stretch.kept == LoopKept::Topped && stretch.why == StretchWhy::DeadTime;
    stretch.to_s > stretch.from_s && !spanned
}

/// Stretches that are not used, those with one reason together.
fn left_out(stretches: &[StretchLeftOut]) -> String {
    let mut reasons: Vec<(&StretchWhy, Vec<String>)> = Vec::new();
    for stretch in stretches.iter().filter(|stretch| is_unused(stretch)) {
        let times = from_to(stretch.from_s, stretch.to_s);
        match reasons.iter_mut().find(|(why, _)| **why == stretch.why) {
            Some((_, there)) => there.push(times),
            None => reasons.push((&stretch.why, vec![times])),
        }
    }
    reasons
        .iter()
        .map(|(why, times)| row("left out", &format!("{}: {}", say::stretch_why(why), times.join(", "))))
        .collect()
}

fn segments(segments: &[SegmentUptake], units: &Units) -> String {
    let q = units.flow_symbol();
    let rows: Vec<Vec<String>> = segments
        .iter()
        .map(|segment| {
            let (slope, slope_u) = value_and_u(segment.slope_per_min, segment.slope_u);
            let (uptake, uptake_u) = match segment.uptake_l_min {
                Some(uptake) => value_and_u(units.flow(uptake), units.flow(segment.u)),
                None => ("none".into(), String::new()),
            };
            vec![
                clock(segment.from_s),
                clock(segment.to_s),
                segment.kind.name().to_owned(),
                figures(units.flow(segment.injection_l_min), 4),
                slope,
                slope_u,
                uptake,
                uptake_u,
            ]
        })
        .collect();
    let mut text = table(
        &["from", "to", "loop", "oxygen in", "slope", "u", "uptake", "u"],
        &["", "", "", q, "1/min", "1/min", q, q],
        &rows,
        false,
    );
    let any = |kind: Kind| segments.iter().any(|segment| segment.kind == kind);
    let sealed = if any(Kind::Sealed) { "; sealed: of 1/(1 − f)" } else { "" };
    let topped = if any(Kind::Topped) { "; topped: its change from end to end over the time" } else { "" };
    let of = format!("Slope of the oxygen fraction f{sealed}{topped}{}", ordinary(segments));
    text.push_str(&wrapped("  ", "  ", &of));
    text
}

/// How much too small ordinary standard errors are.
fn ordinary(segments: &[SegmentUptake]) -> String {
    let times: Vec<f64> = segments
        .iter()
        .filter_map(|s| s.slope_u_ordinary.map(|u| s.slope_u / u))
        .filter(|t| t.is_finite())
        .collect();
    let least = times.iter().copied().fold(f64::INFINITY, f64::min);
    let most = times.iter().copied().fold(0.0, f64::max);
    let (low, high) = (figures(least, 2), figures(most, 2));
    if times.is_empty() {
        ".".to_owned()
    } else if low == high {
        format!(". Its ordinary standard error is {low} times smaller than u and is not used.")
    } else {
        format!(". Their ordinary standard errors are {low} to {high} times smaller than u and are not used.")
    }
}

fn budget(estimate: &Estimate, units: &Units) -> String {
    let total = estimate.u;
    let mut rows: Vec<Vec<String>> = estimate
        .budget
        .iter()
        .map(|row| {
            vec![
                u_alone(units.flow(row.u_l_min)),
                fixed(row.u_l_min * row.u_l_min / (total * total) * 100.0, 0),
                row.source.name().to_owned(),
            ]
        })
        .collect();
    rows.push(vec![u_alone(units.flow(total)), "100".into(), "combined".into()]);
    let mut text = String::from("Budget of the measured uptake, largest first\n");
    text.push_str(&table(&["u", "share", "source"], &[units.flow_symbol(), "%", ""], &rows, true));
    text
}

fn help(place: Place, estimate: &Estimate, units: &Units) -> String {
    let mut text = String::from("What would help, best first\n");
    if estimate.would_help.is_empty() {
        text.push_str("  Nothing that is known here would narrow it by more than 2 %.\n");
    }
    for proposal in &estimate.would_help {
        text.push_str(&wrapped("  - ", "    ", &say::help(proposal, half_widths(estimate), place, units)));
    }
    text
}

/// Half-widths of the intervals of an uptake and of another day, L/min.
fn half_widths(estimate: &Estimate) -> (f64, f64) {
    let half = |(low, high): (f64, f64)| 0.5 * (high - low);
    (half(estimate.interval_95), half(estimate.next_day.interval_95))
}

/// "0.296 ± 0.018 L/min (95 %)"; an interval that is not even is given by its ends.
fn with_interval(l_min: f64, interval: (f64, f64), units: &Units) -> String {
    in_words(l_min, interval, units, units.flow_symbol())
}

fn in_words(l_min: f64, (low, high): (f64, f64), units: &Units, unit: &str) -> String {
    let half = 0.5 * (high - low);
    let uneven = (0.5 * (high + low) - l_min).abs() > 0.025 * half;
    let (value, u) = value_and_u(units.flow(l_min), units.flow(half));
    if uneven {
        let places = decimals(&value);
        let end = |l_min: f64| fixed(units.flow(l_min), places);
        format!("{value} {unit} (95 % from {} to {})", end(low), end(high))
    } else {
        format!("{value} ± {u} {unit} (95 %)")
    }
}

fn row(label: &str, says: &str) -> String {
    wrapped(&format!("  {label:<14}"), &" ".repeat(16), says)
}

fn dof(dof: f64) -> String {
    // Beyond a thousand Student's t is the normal distribution to all digits shown.
    if dof.is_infinite() {
        "no limit".into()
    } else if dof > 1000.0 {
        "over 1000".into()
    } else {
        fixed(dof, 0)
    }
}

fn decimals(text: &str) -> i32 {
    text.split_once('.').map_or(0, |(_, d)| i32::try_from(d.len()).unwrap_or(0))
}
