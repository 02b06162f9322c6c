//! One session: from what was recorded to its uptake, segment by segment.
//!
//! Comes in: a session and its injection's line. Goes out: a [`SessionUptake`], with an answer or the reason why there is
//! none, and the model behind it for whoever asks what else would have helped.

use chrono::{DateTime, FixedOffset};

use super::cells::{self, Ambient, CellLeftOut};
use super::given::Given;
use super::injection::InjectionLine;
use super::model::Model;
use super::plan::{checked_events, plan};
use super::rest::doubts;
use super::segment::Kind;
use super::solve::{Origin, Solved, solve};
use super::why_not::{StretchLeftOut, StretchWhy, UptakeError, Warning, WhyNot};
use super::{SessionInput, bins};
use crate::entry::{CellSignal, Session};

/// What one session says.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionUptake {
    /// Which of the sessions handed in, counted from 0.
    pub index: usize,
    /// When it was begun.
    pub taken: DateTime<FixedOffset>,
    /// The uptake, or why there is none.
    pub answer: Result<SessionEstimate, WhyNot>,
    /// Segments in order; empty where there is no answer.
    pub segments: Vec<SegmentUptake>,
    /// What no segment uses, in order.
    pub left_out: Vec<StretchLeftOut>,
    /// Cells that are not used.
    pub cells_left_out: Vec<CellLeftOut>,
    /// How many are.
    pub cells_used: usize,
    /// Binned readings of the agreeing cells, for a plot.
    pub series: Series,
    /// What to know before trusting it.
    pub warnings: Vec<Warning>,
}

/// Binned readings.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Series {
    /// Seconds on the session's time column.
    pub time_s: Vec<f64>,
    /// Mean oxygen partial pressure of the agreeing cells, bar.
    pub po2_bar: Vec<f64>,
}

/// One session's uptake.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionEstimate {
    /// Uptake, L/min STPD.
    pub uptake_l_min: f64,
    /// Standard uncertainty, L/min.
    pub u: f64,
    /// Effective degrees of freedom; infinite when no row limits them.
    pub dof: f64,
    /// 95 % interval, L/min.
    pub interval_95: (f64, f64),
    /// The loop volume.
    pub loop_volume: LoopVolume,
}

/// The loop volume at the first reading.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LoopVolume {
    /// Actual litres, lungs included.
    pub litres: f64,
    /// Standard uncertainty, litres.
    pub u: f64,
    /// Where it comes from.
    pub origin: Origin,
}

/// One segment.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SegmentUptake {
    /// First second.
    pub from_s: f64,
    /// Last second.
    pub to_s: f64,
    /// How it was read.
    pub kind: Kind,
    /// Oxygen injected (purity counted), L/min STPD.
    pub injection_l_min: f64,
    /// Slope per minute: of the oxygen fraction `f` (held, venting), of `1/(1 − f)` (sealed), and for a topped loop the
    /// change of the fraction over the segment by its length.
    pub slope_per_min: f64,
    /// Standard uncertainty of the slope, noise and wander together.
    pub slope_u: f64,
    /// That from noise alone (Newey-West).
    pub slope_u_noise: f64,
    /// Ordinary standard error, as if readings were independent; shown only to say how small it is. None for a topped
    /// loop, which has no slope.
    pub slope_u_ordinary: Option<f64>,
    /// What the fitted variable is in the middle of the segment.
    pub level: f64,
    /// Where that middle is, seconds.
    pub middle_s: f64,
    /// Pressure of the dry gas there, bar: PO2 over oxygen fraction.
    pub dry_bar: f64,
    /// Bins the slope is fitted to.
    pub readings: usize,
    /// Uptake by this segment with the session's loop volume, L/min; none when it is not positive.
    pub uptake_l_min: Option<f64>,
    /// Its standard uncertainty from noise, wander and loop volume, L/min.
    pub u: f64,
}

/// A session with the model behind it.
#[derive(Debug, Clone)]
pub(super) struct Worked<'a> {
    pub(super) session: &'a Session,
    pub(super) uptake: SessionUptake,
    /// Model and solution, where there is an answer.
    pub(super) solved: Option<(Model, Solved)>,
}

/// Works one session out.
pub(super) fn work<'a>(index: usize, input: &SessionInput<'a>) -> Result<Worked<'a>, UptakeError> {
    let session = input.session;
    let mut warnings = Vec::new();
    let mut uptake = SessionUptake {
        index,
        taken: session.taken,
        answer: Err(WhyNot::NoVolumeOneInjection),
        segments: Vec::new(),
        left_out: Vec::new(),
        cells_left_out: Vec::new(),
        cells_used: 0,
        series: Series::default(),
        warnings: Vec::new(),
    };
    let answer = model(session, input.line, &mut uptake, &mut warnings)?
        .and_then(|model| solve(&model, &session.assumptions).map(|solved| (model, solved)));
    let solved = match answer {
        Ok((model, solved)) => {
            warnings.extend(solved.warnings.iter().cloned());
            uptake.segments = segments(&model, &solved);
            uptake.answer = Ok(SessionEstimate {
                uptake_l_min: solved.uptake,
                u: solved.u,
                dof: solved.dof,
                interval_95: solved.interval,
                loop_volume: LoopVolume {
                    litres: solved.volume_l,
                    u: solved.volume_u,
                    origin: solved.origin,
                },
            });
            Some((model, solved))
        }
        Err(why) => {
            uptake.answer = Err(why);
            None
        }
    };
    warnings.extend(doubts(&session.rest, session.place).into_iter().map(Warning::Rest));
    uptake.warnings = warnings;
    Ok(Worked { session, uptake, solved })
}

/// The model of a session; fills in what the cells and the plan say on the way.
fn model(
    session: &Session,
    line: Option<&InjectionLine>,
    uptake: &mut SessionUptake,
    warnings: &mut Vec<Warning>,
) -> Result<Result<Model, WhyNot>, UptakeError> {
    let assumptions = &session.assumptions;
    if session.readings.cells.is_empty() {
        return Err(UptakeError::NoReadings);
    }
    let in_volts = session.readings.cells.iter().any(|c| matches!(c.signal, CellSignal::Volts { .. }));
    if in_volts && session.cells.calibrated_at.is_none() {
        return Err(UptakeError::NoCalibration);
    }
    let given = Given::of(session, warnings)?;
    let bins = bins::bins(&session.readings.time_s, assumptions.average_over.as_s())
        .ok_or(UptakeError::NoReadings)?;
    // Events are checked before cells, so that a wrong file is called wrong whatever the cells did.
    let events = checked_events(session, line.is_some(), &bins)?;
    for (rows, warning) in [
        (bins.without_time, Warning::RowsWithoutTime as fn(usize) -> Warning),
        (bins.unordered, Warning::RowsUnordered),
        (bins.repeated, Warning::TimesRepeated),
    ] {
        if rows > 0 {
            warnings.push(warning(rows));
        }
    }
    let barometer_bar = given.barometer_bar;
    let ambient = Ambient {
        barometer_bar,
        bar_per_m: given.bar_per_m,
        depth_m: given.depth_m,
        depths_m: session.readings.depth_m.as_deref(),
    };
    let calibrated_at = session.cells.calibrated_at;
    let cells = match cells::read(&session.readings, calibrated_at, &bins, &ambient, assumptions) {
        Ok(cells) => cells,
        Err(why) => {
            if let WhyNot::NoUsableCell { left_out } | WhyNot::CellsDisagree { left_out } = &why {
                uptake.cells_left_out = left_out.clone();
            }
            return Ok(Err(why));
        }
    };
    uptake.cells_left_out = cells.left_out.clone();
    uptake.cells_used = cells.used;
    if cells.used == 1 {
        warnings.push(Warning::OneCellOnly);
    }
    let highest = cells.po2_bar.iter().copied().filter(|p| p.is_finite()).fold(0.0, f64::max);
    let calibrated_bar = cells.calibrated_to_bar.unwrap_or(barometer_bar);
    if highest > calibrated_bar {
        warnings.push(Warning::AboveCalibration { po2_bar: highest, calibrated_bar });
    }
    let model = plan(session, line, given, &bins, &cells, &events, warnings);
    uptake.series = Series { time_s: model.time_s.clone(), po2_bar: model.po2.clone() };
    uptake.left_out.clone_from(&model.left_out);
    // Two events at one time leave the same stretch out.
    uptake.left_out.dedup();
    let ordinary = |w: &StretchWhy| {
        matches!(
            w,
            StretchWhy::DeadTime | StretchWhy::WarmUp | StretchWhy::Excluded | StretchWhy::UnmarkedJump(_)
        )
    };
    let unusual = model.left_out.iter().filter(|s| !ordinary(&s.why));
    warnings.extend(unusual.map(|s| Warning::StretchLeftOut(*s)));
    Ok(Ok(widened(model, session, warnings)))
}

/// A sealed loop that is rich in oxygen, or begun early, is pushed harder by nitrogen: twice the allowance.
fn widened(mut model: Model, session: &Session, warnings: &mut Vec<Warning>) -> Model {
    let assumptions = &session.assumptions;
    let sealed = || model.segments.iter().filter(|s| Kind::from(s.kept) == Kind::Sealed);
    let fraction =
        sealed().flat_map(|s| s.bins.clone()).map(|bin| 1.0 - model.inert_share[bin]).fold(0.0, f64::max);
    let begun_s = sealed().map(|s| s.from_s).fold(f64::INFINITY, f64::min);
    let on_loop_s = model.given.on_loop_s + begun_s - model.first_s;
    let early = on_loop_s < assumptions.sealed_wait.as_s();
    if fraction > assumptions.sealed_fraction || early {
        warnings.push(Warning::SealedNitrogen { fraction, on_loop_s });
        model.given.washout_u *= 2.0;
    }
    model
}

/// Every segment in numbers.
fn segments(model: &Model, solved: &Solved) -> Vec<SegmentUptake> {
    let inverse_n = solved.fit.inverse_n;
    let volume_u = solved.volume_u / solved.volume_l;
    (0..model.segments.len())
        .map(|i| {
            let (segment, o, noise) = (&model.segments[i], &solved.observations[i], &solved.noise[i]);
            let uptake = o.net - o.y / inverse_n;
            let wander_slope = solved.wander[i] * inverse_n / o.per_slope;
            let own = noise.y_u / inverse_n;
            let by_volume = o.y / inverse_n * volume_u;
            let by_mark = noise.mark_u / inverse_n;
            let u =
                (own * own + solved.wander[i] * solved.wander[i] + by_volume * by_volume + by_mark * by_mark)
                    .sqrt();
            let middle_s = model.first_s + 60.0 * segment.middle;
            let dry_bar = segment.bins.clone().map(|bin| model.ambient[bin] - model.vapour[bin]).sum::<f64>()
                / segment.bins.len() as f64;
            SegmentUptake {
                from_s: segment.from_s,
                to_s: segment.to_s,
                kind: solved.kinds[i],
                injection_l_min: o.injected,
                slope_per_min: noise.fitted.map_or(o.y, |s| s.slope),
                slope_u: (noise.slope_u * noise.slope_u + wander_slope * wander_slope).sqrt(),
                slope_u_noise: noise.slope_u,
                slope_u_ordinary: noise.fitted.map(|s| s.u_ordinary),
                level: noise.fitted.map_or(o.fraction, |s| s.level),
                middle_s,
                dry_bar,
                readings: segment.bins.len(),
                uptake_l_min: Some(uptake).filter(|m| *m > 0.0 && m.is_finite()),
                u,
            }
        })
        .collect()
}
