//! `session uptake --json`: the document of the interface. Keys may be added, never renamed.

use serde::Serialize;

use super::Units;
use super::number::Plain;
use super::session_limits;
use super::session_uptake::{Named, Reported, is_unused, origin_name, session_warnings, warnings, why_not};
use super::typed::clock;
use super::uptake_sentences as say;
use crate::entry::Place;
use crate::uptake::{
    Estimate, METHOD_REVISION, MonteCarlo, NextDay, PerKilogram, PlaceUptake, Plausible, SegmentUptake,
    SessionUptake, StretchLeftOut, Warning,
};

/// Revision of the document.
const FORMAT: u32 = 1;

/// The document, for whoever writes it.
#[must_use]
pub fn json(reported: &Reported<'_>) -> impl Serialize + use<> {
    Document::of(reported)
}

/// The document, indented, with a newline at its end.
#[must_use]
pub fn document(reported: &Reported<'_>) -> String {
    super::json_text(&json(reported))
}

#[derive(Serialize)]
struct Document {
    format: u32,
    method: u32,
    diver: String,
    /// The place the figures at this level are of: that with the lowest uptake.
    place: Option<&'static str>,
    #[serde(flatten)]
    answer: Answer,
    sessions: Vec<JsonSession>,
    places: Vec<JsonPlace>,
    flows_are: &'static str,
    warnings: Vec<String>,
    notes: Vec<String>,
}

/// The uptake of one place, or that there is none.
#[derive(Serialize)]
struct Answer {
    uptake_l_min: Option<Plain>,
    u: Option<Plain>,
    degrees_of_freedom: Option<Plain>,
    interval_95: Option<[Plain; 2]>,
    why_not: Option<String>,
    next_day: Option<JsonNextDay>,
    per_kilogram: Option<JsonPerKilogram>,
    budget: Vec<JsonBudget>,
    would_help: Vec<JsonHelp>,
    monte_carlo: Option<JsonMonteCarlo>,
}

#[derive(Serialize)]
struct JsonPlace {
    place: &'static str,
    #[serde(flatten)]
    answer: Answer,
}

#[derive(Serialize)]
struct JsonNextDay {
    uptake_l_min: Plain,
    u: Plain,
    degrees_of_freedom: Option<Plain>,
    interval_95: [Plain; 2],
    days: usize,
    day_spread_l_min: Plain,
}

#[derive(Serialize)]
struct JsonPerKilogram {
    ml_kg_min: Plain,
    plausible: &'static str,
}

#[derive(Serialize)]
struct JsonBudget {
    source: &'static str,
    u_l_min: Plain,
}

#[derive(Serialize)]
struct JsonHelp {
    what: String,
    interval_half_width_l_min: Plain,
    next_day_half_width_l_min: Plain,
}

#[derive(Serialize)]
struct JsonMonteCarlo {
    trials: usize,
    failed: usize,
    seed: u64,
    generator: &'static str,
    uptake_l_min: Plain,
    u: Plain,
    interval_95: [Plain; 2],
    budget_interval_95: [Plain; 2],
}

#[derive(Serialize)]
struct JsonSession {
    session: String,
    diver: String,
    place: &'static str,
    taken: String,
    line: Option<String>,
    uptake_l_min: Option<Plain>,
    u: Option<Plain>,
    degrees_of_freedom: Option<Plain>,
    interval_95: Option<[Plain; 2]>,
    why_not: Option<String>,
    segments: Vec<JsonSegment>,
    loop_volume_l: Option<JsonVolume>,
    cells_used: usize,
    cells_left_out: Vec<String>,
    /// In the order of `cells_left_out`.
    cells_left_out_why: Vec<String>,
    left_out: Vec<JsonStretch>,
    proposed_events: Vec<JsonProposal>,
    po2_lowest_bar: Option<Plain>,
    po2_highest_bar: Option<Plain>,
    warnings: Vec<String>,
}

#[derive(Serialize)]
struct JsonSegment {
    from_s: Plain,
    to_s: Plain,
    r#loop: &'static str,
    injection_l_min: Plain,
    slope_per_min: Plain,
    slope_u: Plain,
    slope_u_noise: Plain,
    slope_u_ordinary: Option<Plain>,
    readings: usize,
    uptake_l_min: Option<Plain>,
    u: Plain,
}

#[derive(Serialize)]
struct JsonVolume {
    value: Plain,
    u: Plain,
    origin: &'static str,
}

#[derive(Serialize)]
struct JsonStretch {
    from_s: Plain,
    to_s: Plain,
    r#loop: &'static str,
    why: String,
}

#[derive(Serialize)]
struct JsonProposal {
    at: String,
    at_s: Plain,
    what: &'static str,
    change_bar: Plain,
}

impl Document {
    fn of(reported: &Reported<'_>) -> Self {
        let units = Units::default();
        let uptake = reported.uptake;
        let lowest = uptake.lowest();
        let answer = match lowest {
            Some((place, estimate)) => {
                Answer::of(estimate, reported.monte_carlo_of(place.place), place.place)
            }
            None => Answer::none(why_not(reported)),
        };
        let mut sessions: Vec<(Place, &SessionUptake)> =
            uptake.places.iter().flat_map(|p| p.sessions.iter().map(|s| (p.place, s))).collect();
        sessions.sort_by_key(|(_, session)| session.index);
        Self {
            format: FORMAT,
            method: METHOD_REVISION,
            diver: uptake.diver.to_string(),
            place: lowest.map(|(place, _)| place.place.name()),
            answer,
            sessions: sessions.iter().map(|(place, s)| JsonSession::of(reported, *place, s)).collect(),
            places: uptake.places.iter().map(|place| JsonPlace::of(reported, place)).collect(),
            flows_are: "STPD (0 °C, 101.325 kPa, dry)",
            warnings: warnings(reported, true, &units),
            notes: reported.notes.to_vec(),
        }
    }
}

impl Answer {
    fn of(estimate: &Estimate, monte_carlo: Option<&MonteCarlo>, place: Place) -> Self {
        let units = Units::default();
        Self {
            uptake_l_min: Some(Plain(estimate.uptake_l_min)),
            u: Some(Plain(estimate.u)),
            degrees_of_freedom: finite(estimate.dof),
            interval_95: Some(pair(estimate.interval_95)),
            why_not: None,
            next_day: Some(JsonNextDay::of(&estimate.next_day)),
            per_kilogram: estimate.per_kilogram.as_ref().map(JsonPerKilogram::of),
            budget: estimate
                .budget
                .iter()
                .map(|row| JsonBudget { source: row.source.name(), u_l_min: Plain(row.u_l_min) })
                .collect(),
            would_help: estimate
                .would_help
                .iter()
                .map(|help| JsonHelp {
                    what: say::help_with(&help.what, place, &units),
                    interval_half_width_l_min: Plain(help.half_width_l_min),
                    next_day_half_width_l_min: Plain(help.next_day_half_width_l_min),
                })
                .collect(),
            monte_carlo: monte_carlo.map(JsonMonteCarlo::of),
        }
    }

    const fn none(why_not: Option<String>) -> Self {
        Self {
            uptake_l_min: None,
            u: None,
            degrees_of_freedom: None,
            interval_95: None,
            why_not,
            next_day: None,
            per_kilogram: None,
            budget: Vec::new(),
            would_help: Vec::new(),
            monte_carlo: None,
        }
    }
}

impl JsonPlace {
    fn of(reported: &Reported<'_>, place: &PlaceUptake) -> Self {
        let answer = match &place.answer {
            Ok(estimate) => Answer::of(estimate, reported.monte_carlo_of(place.place), place.place),
            Err(why) => Answer::none(Some(say::why_not(why))),
        };
        Self { place: place.place.name(), answer }
    }
}

impl JsonNextDay {
    fn of(next: &NextDay) -> Self {
        Self {
            uptake_l_min: Plain(next.uptake_l_min),
            u: Plain(next.u),
            degrees_of_freedom: finite(next.dof),
            interval_95: pair(next.interval_95),
            days: next.days,
            day_spread_l_min: Plain(next.day_spread_l_min),
        }
    }
}

impl JsonPerKilogram {
    const fn of(per: &PerKilogram) -> Self {
        let plausible = match per.plausible {
            Plausible::Usual => "usual",
            Plausible::Unusual => "unusual",
            Plausible::Hardly => "hardly",
        };
        Self { ml_kg_min: Plain(per.ml_kg_min), plausible }
    }
}

impl JsonMonteCarlo {
    const fn of(mc: &MonteCarlo) -> Self {
        Self {
            trials: mc.trials,
            failed: mc.failed,
            seed: mc.seed,
            generator: "ChaCha8",
            uptake_l_min: Plain(mc.mean),
            u: Plain(mc.u),
            interval_95: pair(mc.interval_95),
            budget_interval_95: pair(mc.budget_interval_95),
        }
    }
}

impl JsonSession {
    fn of(reported: &Reported<'_>, place: Place, session: &SessionUptake) -> Self {
        let named: Option<&Named<'_>> = reported.named(session);
        let answer = session.answer.as_ref();
        let estimate = answer.ok();
        let extremes = named.and_then(|named| {
            session_limits::extremes(named.session, &session.cells_left_out, Some(&session.series))
        });
        Self {
            session: named.map_or_else(|| reported.name(session), |named| named.name.to_owned()),
            diver: reported.uptake.diver.to_string(),
            place: place.name(),
            taken: session.taken.to_rfc3339(),
            line: named.and_then(|named| named.line).map(str::to_owned),
            uptake_l_min: estimate.map(|e| Plain(e.uptake_l_min)),
            u: estimate.map(|e| Plain(e.u)),
            degrees_of_freedom: estimate.and_then(|e| finite(e.dof)),
            interval_95: estimate.map(|e| pair(e.interval_95)),
            why_not: answer.err().map(say::why_not),
            segments: session.segments.iter().map(JsonSegment::of).collect(),
            loop_volume_l: estimate.map(|e| JsonVolume {
                value: Plain(e.loop_volume.litres),
                u: Plain(e.loop_volume.u),
                origin: origin_name(e.loop_volume.origin),
            }),
            cells_used: session.cells_used,
            cells_left_out: session.cells_left_out.iter().map(|cell| cell.name.clone()).collect(),
            cells_left_out_why: session.cells_left_out.iter().map(say::cell).collect(),
            left_out: session.left_out.iter().filter(|s| is_unused(s)).map(JsonStretch::of).collect(),
            proposed_events: session.warnings.iter().filter_map(JsonProposal::of).collect(),
            po2_lowest_bar: extremes.map(|e| Plain(e.lowest.0)),
            po2_highest_bar: extremes.map(|e| Plain(e.highest.0)),
            warnings: session_warnings(reported, session, true, &Units::default()),
        }
    }
}

impl JsonSegment {
    fn of(segment: &SegmentUptake) -> Self {
        Self {
            from_s: Plain(segment.from_s),
            to_s: Plain(segment.to_s),
            r#loop: segment.kind.name(),
            injection_l_min: Plain(segment.injection_l_min),
            slope_per_min: Plain(segment.slope_per_min),
            slope_u: Plain(segment.slope_u),
            slope_u_noise: Plain(segment.slope_u_noise),
            slope_u_ordinary: segment.slope_u_ordinary.map(Plain),
            readings: segment.readings,
            uptake_l_min: segment.uptake_l_min.map(Plain),
            u: Plain(segment.u),
        }
    }
}

impl JsonStretch {
    fn of(stretch: &StretchLeftOut) -> Self {
        Self {
            from_s: Plain(stretch.from_s),
            to_s: Plain(stretch.to_s),
            r#loop: stretch.kept.name(),
            why: say::stretch_why(&stretch.why),
        }
    }
}

impl JsonProposal {
    fn of(warning: &Warning) -> Option<Self> {
        let Warning::UnmarkedJump(proposal) = warning else { return None };
        Some(Self {
            at: clock(proposal.at_s),
            at_s: Plain(proposal.at_s),
            what: say::jump_event(proposal.looks_like),
            change_bar: Plain(proposal.change_bar),
        })
    }
}

fn finite(value: f64) -> Option<Plain> {
    value.is_finite().then_some(Plain(value))
}

const fn pair((low, high): (f64, f64)) -> [Plain; 2] {
    [Plain(low), Plain(high)]
}
