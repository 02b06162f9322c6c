//! From events and readings to segments: which readings are used, and what is in the loop when each begins.
//!
//! Comes in: a session, its binned readings and what it states. Goes out: a [`Model`], whose segments the estimator
//! reads. Between two events lies a stretch; of it a dead time after the event, a warming scrubber, what was excluded,
//! gaps and stretches with an unexplained jump are not used, each with its reason. *Stages* are the spans in which the
//! loop is kept in one way; each knows how its dry gas follows from that at the first reading: equal at the mark,
//! carried from the stage before, or unknown.

use std::ops::Range;

use super::bins::Bins;
use super::cells::Cells;
use super::given::Given;
use super::injection::InjectionLine;
use super::jumps::jumps;
use super::model::Model;
use super::segment::{Anchor, Counted, Rate, Segment, Stage, TopUp};
use super::why_not::{StretchLeftOut, StretchWhy, UptakeError, Warning};
use crate::entry::{Event, Feeds, Injection, LoopKept, Metered, Session, What};
use crate::gas::saturation_pressure;
use crate::quantity::{STANDARD_ATMOSPHERE_PA, Temperature, ZERO_CELSIUS_K};

/// Shortest stretch with a slope, seconds, and fewest bins in it (common practice, no source): below a minute and a half
/// the wander of the uptake alone is worth 7 %.
const SHORTEST_S: f64 = 90.0;
const FEWEST_BINS: usize = 8;
/// A gap longer than this, and than five usual intervals, splits a stretch, seconds (common practice, no source).
const GAP_S: f64 = 60.0;
const GAP_INTERVALS: f64 = 5.0;
/// Over how long the oxygen fraction is read where a stage begins or ends, seconds.
const WINDOW_S: f64 = 30.0;
/// And at both ends of a topped loop, seconds.
const TOPPED_WINDOW_S: f64 = 60.0;
/// A sealed loop is nearly pure in oxygen from this fraction: one per cent of cell gain is then a tenth of its inert gas.
pub(super) const NEARLY_PURE: f64 = 0.9;
/// Nitrogen in air, and the vapour pressure of blood in bar (6.3 kPa at 37 °C): what a body at the surface is full of.
const NITROGEN_IN_AIR: f64 = 0.79;
const BODY_VAPOUR_BAR: f64 = 0.063;

/// A stretch that may become segments.
struct Stretch {
    stage: usize,
    from_s: f64,
    to_s: f64,
    rate: Option<Rate>,
}

/// Makes the model of a session.
pub(super) fn plan(
    session: &Session,
    line: Option<&InjectionLine>,
    given: Given,
    bins: &Bins,
    cells: &Cells,
    events: &[Event],
    warnings: &mut Vec<Warning>,
) -> Model {
    let mut model = series(session, line, given, bins, cells);
    let stop_s = events.iter().find(|e| e.what == What::Stop).map_or(bins.last_s, |e| e.at_s);
    let dead_s = session.assumptions.dead_time.as_s();
    let mut left_out = Vec::new();
    let mut stretches = Vec::new();
    let mut exclusions = Vec::new();
    let mut stages = vec![Stage::new(session.kept, bins.first_s, Anchor::Start)];
    let mut rate: Option<Rate> = None;
    let mut from_s = bins.first_s;
    model.rates.push((bins.first_s, None));
    for event in events.iter().filter(|e| e.at_s <= stop_s) {
        let stage = stages.len() - 1;
        let kept = stages[stage].kept;
        let at_s = event.at_s;
        let mut close = |rate| {
            if at_s > from_s {
                stretches.push(Stretch { stage, from_s, to_s: at_s, rate });
            }
            left_out.push(StretchLeftOut {
                from_s: at_s,
                to_s: at_s + dead_s,
                kept,
                why: StretchWhy::DeadTime,
            });
            from_s = from_s.max(at_s + dead_s);
        };
        match event.what {
            What::Stop => break,
            What::Exclude { until_s } => exclusions.push((at_s, until_s)),
            What::Injection(injection) => {
                close(rate);
                rate = Some(Rate::of(injection));
                model.rates.push((at_s, rate));
            }
            What::OxygenAdd(amount) => {
                let add = Counted { at_s, litres: amount.map(|m| litres(&m, session, &model)) };
                stages[stage].oxygen.push(add);
                close(rate);
            }
            What::DiluentAdd(amount) | What::Vent(amount) => {
                let counted = Counted { at_s, litres: amount.map(|m| litres(&m, session, &model)) };
                close(rate);
                match (kept, matches!(event.what, What::Vent(_))) {
                    (LoopKept::Topped, true) => stages[stage].vented.push(counted),
                    (LoopKept::Topped, false) => stages[stage].diluent.push(counted),
                    (LoopKept::Sealed, _) => stages.push(Stage::new(kept, at_s, Anchor::Unknown)),
                    // A held loop is made up again to the volume it is held at.
                    (LoopKept::Held, _) => {}
                }
            }
            What::MakeUp { kept: next, mark } => {
                close(rate);
                let anchor = match (mark, stages[stage].anchor) {
                    (true, _) => Anchor::Mark,
                    (false, Anchor::Unknown) => Anchor::Unknown,
                    (false, _) => Anchor::Carried,
                };
                stages.push(Stage::new(next.unwrap_or(kept), at_s, anchor));
            }
        }
    }
    let last = stages.len() - 1;
    if stop_s > from_s {
        stretches.push(Stretch { stage: last, from_s, to_s: stop_s, rate });
    }
    for next in 1..stages.len() {
        stages[next - 1].to_s = stages[next].from_s;
    }
    stages[last].to_s = stop_s;
    for dead in &mut left_out {
        dead.to_s = dead.to_s.min(stop_s);
    }
    model.exclude(&exclusions);
    for (from_s, to_s) in &exclusions {
        let kept = stages.iter().rev().find(|s| s.from_s <= *from_s).map_or(session.kept, |s| s.kept);
        left_out.push(StretchLeftOut { from_s: *from_s, to_s: *to_s, kept, why: StretchWhy::Excluded });
    }
    for stage in &mut stages {
        stage.window = model.bins_between(stage.from_s, stage.from_s + WINDOW_S);
        stage.last_window = model.bins_between(stage.to_s - WINDOW_S, stage.to_s);
    }
    model.stages = stages;
    let warm_from_s = bins.first_s + model.given.warm_up_s;
    if model.given.warm_up_s > 0.0 {
        let to_s = warm_from_s.min(stop_s);
        left_out.push(StretchLeftOut {
            from_s: bins.first_s,
            to_s,
            kept: session.kept,
            why: StretchWhy::WarmUp,
        });
    }
    for stretch in &stretches {
        if model.stages[stretch.stage].kept != LoopKept::Topped {
            segments(&mut model, stretch, warm_from_s, &exclusions, &mut left_out, warnings);
        }
    }
    for stage in 0..model.stages.len() {
        if model.stages[stage].kept == LoopKept::Topped {
            topped(&mut model, stage, warm_from_s, session, &mut left_out, warnings);
        }
    }
    model.segments.sort_by(|a, b| a.from_s.total_cmp(&b.from_s));
    model.finish();
    left_out.sort_by(|a, b| a.from_s.total_cmp(&b.from_s));
    model.left_out = left_out;
    model
}

/// Events in order of time, each within the readings.
pub(super) fn checked_events(
    session: &Session,
    has_line: bool,
    bins: &Bins,
) -> Result<Vec<Event>, UptakeError> {
    let mut any_injection = false;
    for (i, event) in session.events.iter().enumerate() {
        let (index, at_s) = (i + 1, event.at_s);
        if !(at_s >= bins.first_s && at_s <= bins.last_s) {
            let (first_s, last_s) = (bins.first_s, bins.last_s);
            return Err(UptakeError::EventOutside { index, at_s, first_s, last_s });
        }
        match event.what {
            What::Injection(injection) => {
                any_injection = true;
                if matches!(injection, Injection::Ip(_)) && !has_line {
                    return Err(UptakeError::NoLine { index });
                }
            }
            What::Exclude { until_s } if until_s.is_nan() || until_s < at_s => {
                return Err(UptakeError::ExcludeBackwards { index, at_s, until_s });
            }
            _ => {}
        }
    }
    if !any_injection {
        return Err(UptakeError::NoInjection);
    }
    let mut events = session.events.clone();
    events.sort_by(|a, b| a.at_s.total_cmp(&b.at_s));
    Ok(events)
}

/// The model with its series, and no stages or segments yet.
fn series(
    session: &Session,
    line: Option<&InjectionLine>,
    given: Given,
    bins: &Bins,
    cells: &Cells,
) -> Model {
    let readings = &session.readings;
    let column = |column: &Option<Vec<f64>>| column.as_ref().and_then(|c| bins.filled_means(c));
    let depths = column(&readings.depth_m);
    let temperatures = column(&readings.loop_temperature_k);
    let mut model = Model::empty(given, line.cloned(), bins.first_s, bins.last_s);
    let vapour = |k: f64| saturation_pressure(Temperature::from_k(k)).as_bar();
    let fixed_k = model.given.loop_k;
    let fixed = (vapour(fixed_k), vapour(fixed_k + 0.5) - vapour(fixed_k - 0.5));
    for bin in 0..bins.time_s.len() {
        let po2 = cells.po2_bar[bin];
        if po2.is_nan() {
            continue;
        }
        let depth = depths.as_ref().map_or(model.given.depth_m, |d| d[bin]);
        let k = temperatures.as_ref().map_or(fixed_k, |t| t[bin]);
        let (h2o, per_k) =
            if temperatures.is_some() { (vapour(k), vapour(k + 0.5) - vapour(k - 0.5)) } else { fixed };
        model.time_s.push(bins.time_s[bin]);
        model.ends_s.push(bins.ends_s[bin]);
        model.po2.push(po2);
        model.ambient.push(model.given.barometer_bar + model.given.bar_per_m * depth);
        model.vapour.push(h2o);
        model.vapour_per_k.push(per_k);
        model.loop_k.push(k);
    }
    model.varies = depths.is_some() || temperatures.is_some();
    // Nitrogen the body is full of, and how much of the first washout is left at each bin.
    let body = NITROGEN_IN_AIR * (model.given.barometer_bar - BODY_VAPOUR_BAR);
    for bin in 0..model.time_s.len() {
        let dry = model.ambient[bin] - model.vapour[bin];
        let fraction = model.po2[bin] / dry;
        let on_loop_min = (model.given.on_loop_s + model.time_s[bin] - bins.first_s) / 60.0;
        let fading = libm::exp(-on_loop_min / model.given.washout_min);
        model.washout.push(fading * (body - (1.0 - fraction) * dry) / body);
        model.inert_share.push(1.0 - fraction);
    }
    model
}

/// Litres STPD of a metered amount; without a reference state, dry gas at the state of the loop.
fn litres(metered: &Metered, session: &Session, model: &Model) -> f64 {
    let litres = metered.volume.value.as_m3() * 1e3;
    let factor = metered.reads_at.map(|at| at.stpd_factor()).unwrap_or_else(|| {
        let ambient = model.given.barometer_bar
            + model.given.bar_per_m * session.conditions.depth.value.map_or(0.0, |d| d.as_m());
        ambient * 1e5 / STANDARD_ATMOSPHERE_PA * (ZERO_CELSIUS_K / model.given.loop_k)
    });
    litres * factor
}

/// Cuts a stretch into segments.
fn segments(
    model: &mut Model,
    stretch: &Stretch,
    warm_from_s: f64,
    exclusions: &[(f64, f64)],
    left_out: &mut Vec<StretchLeftOut>,
    warnings: &mut Vec<Warning>,
) {
    let (stage, kept) = (stretch.stage, model.stages[stretch.stage].kept);
    let mut skip = |from_s: f64, to_s: f64, why| {
        if to_s > from_s {
            left_out.push(StretchLeftOut { from_s, to_s, kept, why });
        }
    };
    let from_s = stretch.from_s.max(warm_from_s);
    if from_s >= stretch.to_s {
        return;
    }
    let Some(rate) = stretch.rate else {
        skip(from_s, stretch.to_s, StretchWhy::InjectionUnknown);
        return;
    };
    if model.stages[stage].anchor == Anchor::Unknown {
        skip(from_s, stretch.to_s, StretchWhy::ContentsUnknown);
        return;
    }
    let inside = model.bins_between(from_s, stretch.to_s);
    for piece in pieces(model, inside, exclusions, warnings) {
        if piece.is_empty() {
            continue;
        }
        let (from_s, to_s) = (model.ends_s[piece.start].0, model.ends_s[piece.end - 1].1);
        if piece.len() < FEWEST_BINS || to_s - from_s < SHORTEST_S {
            skip(from_s, to_s, StretchWhy::Short);
            continue;
        }
        let found = jumps(&model.time_s[piece.clone()], &straightened(model, &piece, kept), kept);
        if let Some(first) = found.first() {
            skip(from_s, to_s, StretchWhy::UnmarkedJump(first.at_s));
            warnings.extend(found.iter().map(|jump| Warning::UnmarkedJump(*jump)));
            continue;
        }
        let least_inert = model.inert_share[piece.clone()].iter().copied().fold(1.0, f64::min);
        if kept == LoopKept::Sealed && least_inert < 1.0 - NEARLY_PURE {
            skip(from_s, to_s, StretchWhy::NearlyPureOxygen(1.0 - least_inert));
            continue;
        }
        model.segments.push(Segment::new(stage, kept, from_s, to_s, piece, vec![(rate, 1.0)]));
    }
}

/// PO2 of some bins as it would be if it fell straight: a sealed loop's falls faster and faster, one over its inert share
/// does not, which is brought to the scale of PO2 in the middle.
fn straightened(model: &Model, piece: &Range<usize>, kept: LoopKept) -> Vec<f64> {
    let po2 = &model.po2[piece.clone()];
    if kept != LoopKept::Sealed {
        return po2.to_vec();
    }
    let middle = piece.start + piece.len() / 2;
    let inert = model.inert_share[middle];
    let dry = model.po2[middle] / (1.0 - inert);
    model.inert_share[piece.clone()].iter().map(|share| dry * inert * inert / share).collect()
}

/// The bins of a range, cut at exclusions and at gaps.
fn pieces(
    model: &Model,
    inside: Range<usize>,
    exclusions: &[(f64, f64)],
    warnings: &mut Vec<Warning>,
) -> Vec<Range<usize>> {
    let mut intervals: Vec<f64> = model.time_s[inside.clone()].windows(2).map(|w| w[1] - w[0]).collect();
    intervals.sort_unstable_by(f64::total_cmp);
    let usual = intervals.get(intervals.len() / 2).copied().unwrap_or(0.0);
    let longest = GAP_S.max(GAP_INTERVALS * usual);
    let mut pieces = Vec::new();
    let mut start = inside.start;
    for bin in inside.clone() {
        let next = bin + 1;
        if next >= inside.end {
            break;
        }
        let (from_s, to_s) = (model.ends_s[bin].1, model.ends_s[next].0);
        let excluded = exclusions.iter().any(|(from, until)| *from < to_s && *until > from_s);
        if excluded || to_s - from_s > longest {
            if !excluded {
                warnings.push(Warning::Gap { from_s, to_s });
            }
            pieces.push(start..next);
            start = next;
        }
    }
    pieces.push(start..inside.end);
    pieces
}

/// Makes the one segment of a topped stage.
fn topped(
    model: &mut Model,
    index: usize,
    warm_from_s: f64,
    session: &Session,
    left_out: &mut Vec<StretchLeftOut>,
    warnings: &mut Vec<Warning>,
) {
    let stage = model.stages[index].clone();
    let dead_s = session.assumptions.dead_time.as_s();
    let (from_s, to_s) = (stage.from_s.max(warm_from_s), stage.to_s);
    let mut skip = |why| left_out.push(StretchLeftOut { from_s, to_s, kept: LoopKept::Topped, why });
    let cylinder = session.cylinder.as_ref();
    if stage.anchor == Anchor::Unknown {
        return skip(StretchWhy::ContentsUnknown);
    }
    let uncounted = |list: &[Counted]| list.iter().find(|c| c.litres.is_none()).map(|c| c.at_s);
    if let Some(at_s) = uncounted(&stage.vented).or_else(|| uncounted(&stage.diluent)) {
        return skip(StretchWhy::NotAccounted(at_s));
    }
    if let (Some(at_s), None) = (uncounted(&stage.oxygen), cylinder) {
        return skip(StretchWhy::NotAccounted(at_s));
    }
    // A cylinder's drop covers the whole stage, so that none of it may be left out.
    if cylinder.is_some() && warm_from_s > stage.from_s {
        return skip(StretchWhy::WarmUp);
    }
    let within = |list: &[Counted]| -> Vec<Counted> {
        list.iter().filter(|c| c.at_s >= from_s && c.at_s <= to_s).copied().collect()
    };
    let (oxygen, diluent, vented) = (within(&stage.oxygen), within(&stage.diluent), within(&stage.vented));
    let moves = || oxygen.iter().chain(&diluent).chain(&vented).map(|c| c.at_s);
    let first_s = moves().fold(f64::INFINITY, f64::min);
    let last_s = moves().fold(f64::NEG_INFINITY, f64::max);
    let begin = model.bins_between(from_s, (from_s + TOPPED_WINDOW_S).min(first_s));
    let mixed_s = last_s + dead_s;
    let end = model.bins_between((to_s - TOPPED_WINDOW_S).max(mixed_s.min(to_s - WINDOW_S)), to_s);
    let after_last = if mixed_s <= to_s - WINDOW_S { model.bins_between(mixed_s, to_s) } else { 0..0 };
    if begin.len() < 3 || end.len() < 3 || to_s - from_s < SHORTEST_S {
        return skip(StretchWhy::Short);
    }
    let mut rates: Vec<(Rate, f64)> = Vec::new();
    for (i, (at_s, rate)) in model.rates.iter().enumerate() {
        let until_s = model.rates.get(i + 1).map_or(to_s, |next| next.0);
        let seconds = until_s.min(to_s) - at_s.max(from_s);
        if seconds > 0.0 {
            let Some(rate) = rate else { return skip(StretchWhy::InjectionUnknown) };
            rates.push((*rate, seconds / (to_s - from_s)));
        }
    }
    let sum = |list: &[Counted]| list.iter().filter_map(|c| c.litres).sum::<f64>();
    let feeds = cylinder.map(|c| c.feeds);
    let all_metered = uncounted(&oxygen).is_none() && !(oxygen.is_empty() && feeds.is_some());
    let piece = begin.start..end.end;
    let mut segment = Segment::new(index, LoopKept::Topped, from_s, to_s, piece, rates);
    segment.top_up = Some(TopUp {
        begin,
        end,
        after_last,
        last_add_s: last_s,
        oxygen_l: sum(&oxygen),
        diluent_l: sum(&diluent),
        vented_l: sum(&vented),
        metered: all_metered,
        cylinder: cylinder.copied(),
        use_cylinder: feeds.is_some() && !all_metered,
        scale: 1.0,
    });
    if feeds == Some(Feeds::All) && all_metered {
        // Which of the two is the better known is decided once their uncertainties are.
        warnings.retain(|w| *w != Warning::CylinderUsed);
    }
    model.segments.push(segment);
}
