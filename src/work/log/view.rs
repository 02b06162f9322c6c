//! A logged run as a face shows it, from what the logger and the book say.

use super::ledger::Kept;
use crate::bench::checks::{CheckKind, CheckVerdict, Finding};
use crate::bench::{Analysis, WhyNot};
use crate::entry::{Indication, Instrument, InstrumentPapers, Measures, MeterKind, Readings, Run};
use crate::instrument::Counters;
use crate::logger::{ChannelLive, Live, Role};
use crate::report::Units;
use crate::report::bench_live::{BenchView, CheckSeen, Holds, LineSeen, PointSeen, Sign, SweepSoFar};
use crate::report::check_sentences::{name_key_unit, sentence};
use crate::report::enter_words::{more_points, no_line, running};
use crate::report::live_parts::{Dial, DialKind, DialState, Hold, Saved};
use crate::work::enter::{Desk, Standing};

/// What there is to show.
pub(super) struct BenchState<'a> {
    pub(super) now_s: f64,
    pub(super) instruments: &'a [Instrument],
    pub(super) live: &'a Live,
    pub(super) counters: &'a [Counters],
    /// The last fault or loss of each instrument, in words.
    pub(super) troubles: &'a [Option<String>],
    pub(super) by_itself: bool,
    /// The run as asked for, while it is not in the book.
    pub(super) asked: &'a Run,
    pub(super) desk: Option<&'a Desk>,
    pub(super) kept: Option<&'a Kept>,
    pub(super) units: Units,
    pub(super) hold: Hold,
    pub(super) wanted: Option<usize>,
    pub(super) elapsed_s: f64,
    pub(super) left_s: Option<f64>,
}

/// The view of a run.
pub(super) fn bench_view(state: &BenchState<'_>) -> BenchView {
    let run = state.desk.map_or(state.asked, Desk::run);
    let dials: Vec<(Role, Dial)> =
        state.live.channels.iter().map(|channel| (channel.role, dial(state, channel))).collect();
    let of = |role: Role| dials.iter().find(|(one, _)| *one == role).map(|(_, dial)| dial.clone());
    let around = dials.iter().filter(|(role, _)| matches!(role, Role::Temperature | Role::Barometer));
    let analysed = state.desk.map(Desk::standing);
    let analysis = match &analysed {
        Some(Standing::Line(fitted)) => Some(fitted.analysis),
        _ => None,
    };
    let points = points(state.desk, analysis);
    let line = analysis.and_then(|analysis| line(analysis, run));
    let (sign, steady) = match &state.live.sign {
        Ok(steady) => (format!("steady for {:.0} s", steady.to_s - steady.from_s), true),
        Err(why) => (why.to_string(), false),
    };
    BenchView {
        units: state.units,
        run: state.desk.and_then(Desk::number),
        orifice: run.orifice.to_string(),
        gas: run.gas.name().to_owned(),
        purpose: run.purpose,
        technician: run.technician.clone(),
        pressure: of(Role::Pressure).unwrap_or_else(|| none(DialKind::Pressure)),
        flow: of(Role::Flow).unwrap_or_else(|| none(DialKind::Flow)),
        around: around.map(|(_, dial)| dial.clone()).collect(),
        sign: Sign { steady, says: sign, held_s: state.live.steady_s.0, least_s: state.live.steady_s.1 },
        by_itself: state.by_itself,
        taken_here: state.live.taken_here,
        sweep: SweepSoFar {
            direction: state.live.sweep,
            wanted: state.wanted,
            span_bar: None,
            next: next(state),
        },
        limits: analysis.and_then(|analysis| limits(analysis, run)),
        says: says(state, analysed.as_ref()),
        checks: analysis.map(|analysis| checks(analysis, &state.units)).unwrap_or_default(),
        points,
        line,
        saved: saved(state.kept, state.now_s),
        hold: state.hold.clone(),
        elapsed_s: state.elapsed_s,
        left_s: state.left_s,
    }
}

/// What is saved, from what the ledger says.
pub(super) fn saved(kept: Option<&Kept>, now_s: f64) -> Saved {
    match kept {
        Some(Kept { waiting, since_s: Some(since_s), why }) => {
            Saved::Not { readings: *waiting, for_s: (now_s - since_s).max(0.0), why: why.clone() }
        }
        _ => Saved::All,
    }
}

/// A value that no instrument reads.
fn none(kind: DialKind) -> Dial {
    Dial {
        kind,
        instrument: String::new(),
        value: None,
        resolution: None,
        meant: String::new(),
        rate_per_min: None,
        state: DialState::Waiting,
        per_s: None,
        faults: 0,
        trouble: None,
    }
}

fn dial(state: &BenchState<'_>, channel: &ChannelLive) -> Dial {
    let live = state.live;
    let instrument = state.instruments.get(channel.instrument);
    let moving = if live.sign.is_ok() { DialState::Steady } else { DialState::Moving };
    let (rate, alive) = match channel.role {
        Role::Pressure => (live.pressure_rate_pa_s.map(|rate| rate * 60.0 / 1e5), moving),
        Role::Flow => (live.flow_rate_l_min_s.map(|rate| rate * 60.0), moving),
        _ => (None, DialState::Read),
    };
    Dial {
        rate_per_min: rate,
        meant: instrument.map(meant).unwrap_or_default(),
        ..plain_dial(instrument, channel, state.counters, state.troubles, state.now_s, alive)
    }
}

/// A dial without its rate and without what its value is meant at; `alive` is how it stands when nothing is wrong.
pub(super) fn plain_dial(
    instrument: Option<&Instrument>,
    channel: &ChannelLive,
    counters: &[Counters],
    troubles: &[Option<String>],
    now_s: f64,
    alive: DialState,
) -> Dial {
    let (kind, per_si) = match channel.role {
        Role::Pressure => (DialKind::Pressure, 1e-5),
        Role::Flow => (DialKind::Flow, 6e4),
        Role::Temperature => (DialKind::Temperature, 1.0),
        Role::Barometer => (DialKind::Barometer, 1e-5),
        Role::Cell => (DialKind::Po2, 1e-5),
        Role::Depth => (DialKind::Depth, 1.0),
    };
    let zero = if kind == DialKind::Temperature { 273.15 } else { 0.0 };
    let value = channel.last.map(|reading| match kind {
        DialKind::Flow => reading.indicated_flow().as_l_min(),
        _ => (reading.si - zero) * per_si,
    });
    let stands = match (channel.last, channel.connected, channel.frozen_since_s) {
        (None, Some(false), _) => DialState::Lost { age_s: None },
        (None, ..) => DialState::Waiting,
        (Some(_), Some(false), _) => DialState::Lost { age_s: channel.age_s },
        (Some(_), _, _) if channel.stale => DialState::Stale { age_s: channel.age_s.unwrap_or(0.0) },
        (Some(_), _, Some(since_s)) => DialState::Frozen { for_s: now_s - since_s },
        (Some(_), ..) => alive,
    };
    Dial {
        kind,
        instrument: instrument.map(|one| one.id.to_string()).unwrap_or_default(),
        value,
        resolution: instrument.and_then(resolution),
        meant: String::new(),
        rate_per_min: None,
        state: stands,
        per_s: channel.rate_per_s,
        faults: counters.get(channel.instrument).map_or(0, Counters::faults_in_all),
        trouble: troubles.get(channel.instrument).cloned().flatten(),
    }
}

/// What the last digit counts, in bar or L/min.
fn resolution(instrument: &Instrument) -> Option<f64> {
    match instrument.papers.as_ref()? {
        InstrumentPapers::Meter(meter) => meter.papers.resolution.map(|step| step.as_l_min()),
        InstrumentPapers::Transducer(transducer) => transducer.papers.resolution.map(|step| step.as_bar()),
    }
}

fn meant(instrument: &Instrument) -> String {
    match (&instrument.papers, instrument.measures) {
        (Some(InstrumentPapers::Meter(meter)), _) => match &meter.kind {
            MeterKind::Mass { reads_at, .. } | MeterKind::Float { reads_at, .. } => {
                format!("at {}", crate::quantity::show::reference_to_text(*reads_at))
            }
            MeterKind::Volumetric { .. } | MeterKind::Timed { .. } => "as it is in the meter".to_owned(),
        },
        (_, Measures::Pressure) => "gauge".to_owned(),
        (_, Measures::Barometer) => "absolute".to_owned(),
        _ => String::new(),
    }
}

/// What to do next, as far as that is known.
fn next(state: &BenchState<'_>) -> Option<String> {
    if !state.live.taken_here {
        return None;
    }
    let direction = match state.live.sweep {
        Some(crate::entry::Sweep::Falling) => "next: a lower IP",
        Some(crate::entry::Sweep::Rising) => "next: a higher IP, or down again",
        None => "next: another IP",
    };
    Some(direction.to_owned())
}

fn points(desk: Option<&Desk>, analysis: Option<&Analysis>) -> Vec<PointSeen> {
    let Some(desk) = desk else { return Vec::new() };
    let Readings::Points(points) = &desk.run().readings else { return Vec::new() };
    let apart: &[usize] = analysis
        .and_then(|analysis| analysis.checks.iter().find(|check| check.kind == CheckKind::Outlier))
        .map_or(&[], |check| match &check.finding {
            Finding::Apart(points) => points,
            _ => &[],
        });
    let seen = points.iter().enumerate().map(|(index, reading)| {
        let number = index + 1;
        let worked = analysis.and_then(|analysis| analysis.points.iter().find(|p| p.index == number));
        let why_not = worked.and_then(|point| point.why_not.as_ref());
        let left_out = desk.left_out().iter().find(|out| out.point == number);
        // That it is out is said where it is shown.
        let left_out = left_out.map(|out| out.why.strip_prefix("struck: ").unwrap_or(&out.why).to_owned());
        PointSeen {
            number,
            pressure_bar: reading.pressure.shown_pa() / 1e5,
            flow_l_min: reading.flow.as_l_min(),
            sweep: reading.sweep,
            off_line: worked
                .map(|point| point.residual_l_min / (point.flow_l_min - point.residual_l_min))
                .filter(|share| share.is_finite()),
            left_out: left_out
                .or_else(|| matches!(why_not, Some(WhyNot::NotChoked)).then(|| "not choked".to_owned())),
            apart: apart.contains(&number),
        }
    });
    seen.collect()
}

/// Mean of flow shown over flow corrected, and of the pressure shown less the absolute one (bar), over the points of the
/// line: what turns the line into figures as shown, for a drawing.
fn as_shown(analysis: &Analysis, run: &Run) -> Option<(f64, f64)> {
    let Readings::Points(points) = &run.readings else { return None };
    let (mut ratio, mut offset, mut count) = (0.0, 0.0, 0.0);
    for worked in analysis.points.iter().filter(|point| point.why_not.is_none()) {
        let shown = worked.index.checked_sub(1).and_then(|index| points.get(index))?;
        ratio += shown.flow.as_l_min() / worked.flow_l_min;
        offset += match shown.pressure {
            Indication::Gauge(gauge) => worked.pressure_bar_abs - gauge.as_bar(),
            Indication::Absolute(absolute) => worked.pressure_bar_abs - absolute.as_bar(),
        };
        count += 1.0;
    }
    (count > 0.0).then(|| (ratio / count, offset / count)).filter(|(ratio, _)| ratio.is_finite())
}

fn line(analysis: &Analysis, run: &Run) -> Option<LineSeen> {
    let (ratio, offset_bar) = as_shown(analysis, run)?;
    let (alpha, beta) = (analysis.line.random.intercept, analysis.line.random.slope);
    Some(LineSeen { intercept_l_min: ratio * (alpha + beta * offset_bar), slope_l_min_bar: ratio * beta })
}

fn limits(analysis: &Analysis, run: &Run) -> Option<(f64, f64, f64)> {
    let judgement = analysis.judgement.as_ref()?;
    let (ratio, _) = as_shown(analysis, run)?;
    // The limits are meant for another gas where the bench had one.
    let as_run = analysis.nominal.flow.flow_l_min / judgement.flow.flow_l_min;
    let (low, high) = judgement.limits_l_min;
    let factor = ratio * as_run;
    let ip_bar = run.acceptance.as_ref()?.ip.as_bar();
    factor.is_finite().then_some((ip_bar, low * factor, high * factor))
}

fn says(state: &BenchState<'_>, standing: Option<&Standing<'_>>) -> Vec<String> {
    let last = state.desk.map(|desk| desk.points().len()).filter(|points| *points > 0);
    let text = match standing {
        None => return Vec::new(),
        Some(Standing::Line(fitted)) => running(fitted, last, None, &state.units),
        Some(Standing::More { missing, not_choked }) => more_points(*missing, *not_choked),
        Some(Standing::No(error)) => no_line(&error.to_string()),
    };
    sentences(&text)
}

/// The sentences of a text that was wrapped: a line that is set in deeper goes on with the one before.
fn sentences(text: &str) -> Vec<String> {
    let mut all: Vec<String> = Vec::new();
    for line in text.lines().filter(|line| !line.trim().is_empty()) {
        match all.last_mut().filter(|_| line.starts_with("    ")) {
            Some(before) => {
                before.push(' ');
                before.push_str(line.trim());
            }
            None => all.push(line.trim().to_owned()),
        }
    }
    all
}

fn checks(analysis: &Analysis, units: &Units) -> Vec<CheckSeen> {
    let seen = analysis.checks.iter().map(|check| CheckSeen {
        holds: match check.verdict {
            CheckVerdict::Pass => Holds::Yes,
            CheckVerdict::Fail => Holds::No,
            CheckVerdict::Note => Holds::Open,
        },
        says: format!("{}: {}", name_key_unit(check.kind).0, sentence(check, units)),
    });
    seen.collect()
}

#[cfg(test)]
mod tests {
    use super::sentences;

    #[test]
    fn a_wrapped_sentence_is_one_again() {
        let text = "  first, and it\n    goes on\n  second\n\n";
        assert_eq!(sentences(text), ["first, and it goes on", "second"]);
    }
}
