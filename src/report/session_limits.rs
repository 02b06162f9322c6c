//! A record that passed what a session may not pass: PO2 below its floor or above its ceiling, a pool too deep.
//!
//! Comes in: a session and, where it was worked out, the mean of its agreeing cells. Goes out: a caution each, with the
//! reading and where it stands. Nothing is refused: the session is over, and the next one should not be like it.

use super::Units;
use super::cautions::{POOL_DEEPEST_M, po2_limits_bar};
use super::number::fixed;
use super::typed::clock;
use super::uptake_sentences::length;
use crate::entry::{CellSignal, Place, Session};
use crate::gas::at_depth;
use crate::quantity::{AbsolutePressure, Length};
use crate::uptake::{CellLeftOut, Series};

/// A reading above ambient by more than this share is a fault and no PO2 (interface).
const ABOVE_AMBIENT: f64 = 1.05;

/// What a session read, as far as a limit is concerned.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Extremes {
    /// Lowest PO2, bar, and its second.
    pub lowest: (f64, f64),
    /// Highest PO2, bar, and its second.
    pub highest: (f64, f64),
}

/// Lowest and highest PO2: of the middle of the believed cells in each row, where they show bar; else of `series`. None
/// when neither says anything.
#[must_use]
pub fn extremes(session: &Session, left_out: &[CellLeftOut], series: Option<&Series>) -> Option<Extremes> {
    let by_row = middles(session, left_out);
    let readings: Vec<(f64, f64)> = if by_row.is_empty() {
        let series = series?;
        series.po2_bar.iter().copied().zip(series.time_s.iter().copied()).collect()
    } else {
        by_row
    };
    let finite = || readings.iter().copied().filter(|(po2, at_s)| po2.is_finite() && at_s.is_finite());
    let lowest = finite().min_by(|a, b| a.0.total_cmp(&b.0))?;
    let highest = finite().max_by(|a, b| a.0.total_cmp(&b.0).then(b.1.total_cmp(&a.1)))?;
    Some(Extremes { lowest, highest })
}

/// The cautions a record deserves.
#[must_use]
pub fn cautions(session: &Session, extremes: Option<&Extremes>, units: &Units) -> Vec<String> {
    let place = session.place;
    let (floor, ceiling) = po2_limits_bar(place);
    let mut cautions = Vec::new();
    if let Some(Extremes { lowest: (po2, at_s), .. }) = extremes.filter(|e| e.lowest.0 < floor) {
        cautions.push(format!(
            "PO2 fell to {} bar at {}, below the floor of {} bar for a {} session: the record is used, but add oxygen \
             earlier, or stop before",
            fixed(*po2, 3),
            clock(*at_s),
            fixed(floor, 2),
            place.name()
        ));
    }
    if let Some(Extremes { highest: (po2, at_s), .. }) = extremes.filter(|e| e.highest.0 > ceiling) {
        cautions.push(format!(
            "PO2 rose to {} bar at {}, above the ceiling of {} bar for a {} session: the record is used, but begin \
             lower, and add oxygen in smaller amounts",
            fixed(*po2, 3),
            clock(*at_s),
            fixed(ceiling, 1),
            place.name()
        ));
    }
    if let Some((metres, at_s)) =
        deepest(session).filter(|(m, _)| place == Place::Pool && *m > POOL_DEEPEST_M)
    {
        let at = at_s.map_or_else(String::new, |s| format!(" at {}", clock(s)));
        cautions.push(format!(
            "the pool session went to {}{at}, deeper than the {} it is meant for: the record is used, but stay \
             shallower",
            length(metres, units),
            length(POOL_DEEPEST_M, units)
        ));
    }
    cautions
}

/// Greatest depth in metres, and its second where there is a column.
fn deepest(session: &Session) -> Option<(f64, Option<f64>)> {
    let stated = || session.conditions.depth.value.map(|d| (d.as_m(), None));
    let Some(column) = &session.readings.depth_m else { return stated() };
    column
        .iter()
        .zip(&session.readings.time_s)
        .filter(|(m, _)| m.is_finite())
        .map(|(m, at_s)| (*m, Some(*at_s)))
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .or_else(stated)
}

/// PO2 and second of each row with a plausible reading: the middle of the cells in bar that are not left out; of all of
/// them when every one is.
fn middles(session: &Session, left_out: &[CellLeftOut]) -> Vec<(f64, f64)> {
    let readings = &session.readings;
    let in_bar = |believed_only: bool| -> Vec<&[f64]> {
        let cells = readings.cells.iter();
        cells
            .filter(|cell| !believed_only || left_out.iter().all(|out| out.name != cell.name))
            .filter_map(|cell| match &cell.signal {
                CellSignal::Bar(column) => Some(column.as_slice()),
                CellSignal::Volts { .. } => None,
            })
            .collect()
    };
    let believed = in_bar(true);
    let columns = if believed.is_empty() { in_bar(false) } else { believed };
    let surface = session.conditions.barometer.value.unwrap_or(AbsolutePressure::STANDARD_ATMOSPHERE);
    let stated = session.conditions.depth.value.map_or(0.0, Length::as_m);
    let ambient = |row: usize| {
        let depth = readings.depth_m.as_ref().and_then(|d| d.get(row)).copied().filter(|d| d.is_finite());
        at_depth(surface, Length::from_m(depth.unwrap_or(stated)), session.conditions.water).as_bar()
    };
    let middle = |row: usize| -> Option<f64> {
        let most = ABOVE_AMBIENT * ambient(row);
        let mut values: Vec<f64> =
            columns.iter().filter_map(|c| c.get(row)).copied().filter(|v| *v > 0.0 && *v <= most).collect();
        values.sort_unstable_by(f64::total_cmp);
        let half = values.len() / 2;
        let upper = values.get(half)?;
        let lower = if values.len().is_multiple_of(2) { values.get(half - 1)? } else { upper };
        Some(0.5 * (lower + upper))
    };
    readings.time_s.iter().enumerate().filter_map(|(row, at_s)| middle(row).map(|po2| (po2, *at_s))).collect()
}
