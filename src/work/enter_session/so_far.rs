//! What the rows of a typed session say so far.
//!
//! Comes in: the session as it stands, and what was made of it. Goes out: the middle of the cells in the last row, a slope
//! to look at, and what is still needed. The slope is a plain straight line through the rows since the last event and its
//! dead time: it shows that PO2 ebbs, and no uptake is made of it.

use crate::entry::{CellSignal, Event, Session, What};
use crate::report::session_enter_words::{Needs, Slope};
use crate::stats::ordinary;
use crate::uptake::{SessionUptake, Uptake, UptakeError, Warning, WhyNot};
use crate::work::WorkError;

/// Fewest rows for a slope, and least seconds they span (our own choice: fewer say nothing).
const FEWEST_ROWS: usize = 3;
const LEAST_S: f64 = 60.0;

/// What the rows say so far.
#[derive(Debug, Clone, PartialEq)]
pub struct SoFar<'a> {
    /// Middle of the cells in the last row of readings, bar.
    pub median_bar: Option<f64>,
    /// How fast PO2 goes since the last event.
    pub slope: Option<Slope>,
    /// What is still needed for an uptake.
    pub needs: Needs<'a>,
}

/// What a session says so far; `worked` is what was made of it up to its last reading.
pub(super) fn so_far<'a>(session: &Session, worked: Option<&'a Result<Uptake, WorkError>>) -> SoFar<'a> {
    let middles = middles(session);
    let median_bar = middles.last().map(|(_, po2)| *po2);
    SoFar { median_bar, slope: slope(session, &middles), needs: needs(session, worked) }
}

/// The session up to its last reading: what happened after it has not done anything yet.
pub(super) fn up_to_now(mut session: Session) -> Session {
    let last_s = last_reading(&session);
    session.events.retain(|event| event.at_s <= last_s);
    session
}

/// Time of the last reading in seconds; minus infinity without any.
pub(super) fn last_reading(session: &Session) -> f64 {
    let times = session.readings.time_s.iter().copied();
    times.filter(|t| t.is_finite()).fold(f64::NEG_INFINITY, f64::max)
}

pub(super) fn has_injection(session: &Session) -> bool {
    session.events.iter().any(|event| matches!(event.what, What::Injection(_)))
}

fn needs<'a>(session: &Session, worked: Option<&'a Result<Uptake, WorkError>>) -> Needs<'a> {
    if session.readings.time_s.is_empty() {
        return Needs::Readings;
    }
    if !has_injection(session) {
        return Needs::Injection;
    }
    let least_s = session.assumptions.least_usable.as_s();
    match worked {
        None => Needs::Readings,
        // The injection is there, and no reading after it yet.
        Some(Err(WorkError::Uptake { error: UptakeError::NoInjection, .. })) => {
            Needs::Time { usable_s: 0.0, needed_s: least_s, warm_up_s: 0.0 }
        }
        Some(Err(WorkError::Uptake { error, .. })) => Needs::Wrong(error.to_string()),
        Some(Err(error)) => Needs::Wrong(error.to_string()),
        Some(Ok(uptake)) => {
            let worked = uptake.places.iter().flat_map(|place| &place.sessions).next();
            match worked.map(|session| &session.answer) {
                None | Some(Ok(_)) => Needs::Nothing,
                Some(Err(WhyNot::TooShort { usable_s, needed_s })) => {
                    let warm_up_s = worked.map_or(0.0, warm_up);
                    Needs::Time { usable_s: *usable_s, needed_s: *needed_s, warm_up_s }
                }
                Some(Err(WhyNot::NoVolumeOneInjection)) => Needs::VolumeOrInjection,
                Some(Err(why)) => Needs::Other(why),
            }
        }
    }
}

/// Seconds that a scrubber not said to be warm takes away.
fn warm_up(worked: &SessionUptake) -> f64 {
    let seconds = worked.warnings.iter().filter_map(|warning| match warning {
        Warning::WarmUpLeftOut { seconds } => Some(*seconds),
        _ => None,
    });
    seconds.fold(0.0, f64::max)
}

/// Time and middle of the cells of each row, in the order of the rows.
fn middles(session: &Session) -> Vec<(f64, f64)> {
    let readings = &session.readings;
    let columns: Vec<&[f64]> = readings
        .cells
        .iter()
        .filter_map(|cell| match &cell.signal {
            CellSignal::Bar(column) => Some(column.as_slice()),
            CellSignal::Volts { .. } => None,
        })
        .collect();
    let middle = |row: usize| -> Option<f64> {
        let read = columns.iter().filter_map(|column| column.get(row)).copied();
        let mut values: Vec<f64> = read.filter(|po2| po2.is_finite()).collect();
        values.sort_unstable_by(f64::total_cmp);
        let half = values.len() / 2;
        let upper = *values.get(half)?;
        let lower = if values.len().is_multiple_of(2) { *values.get(half.checked_sub(1)?)? } else { upper };
        Some(0.5 * (lower + upper))
    };
    readings.time_s.iter().enumerate().filter_map(|(row, at_s)| Some((*at_s, middle(row)?))).collect()
}

fn slope(session: &Session, middles: &[(f64, f64)]) -> Option<Slope> {
    let last_s = last_reading(session);
    let dead_s = session.assumptions.dead_time.as_s();
    let disturbs =
        |event: &&Event| event.at_s <= last_s && !matches!(event.what, What::Exclude { .. } | What::Stop);
    let disturbed_s =
        session.events.iter().filter(disturbs).map(|event| event.at_s + dead_s).fold(0.0, f64::max);
    let is_out = |at_s: f64| {
        session.events.iter().any(|event| match event.what {
            What::Exclude { until_s } => (event.at_s..=until_s).contains(&at_s),
            What::Stop => at_s > event.at_s,
            _ => false,
        })
    };
    let (minutes, po2): (Vec<f64>, Vec<f64>) = middles
        .iter()
        .filter(|(at_s, _)| *at_s >= disturbed_s && !is_out(*at_s))
        .map(|(at_s, po2)| (at_s / 60.0, *po2))
        .unzip();
    let (first, last) = (minutes.first()?, minutes.last()?);
    if minutes.len() < FEWEST_ROWS || 60.0 * (last - first) < LEAST_S {
        return None;
    }
    let line = ordinary::polynomial(&minutes, &po2, 1).ok()?;
    let bar_per_min = *line.parameters.get(1)?;
    Some(Slope { bar_per_min, from_s: 60.0 * first, rows: minutes.len() })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::entry::{
        Assumptions, CellPapers, CellReadings, Diluent, Id, Injection, LeakTest, LoopKept, Place, Rest,
        SessionConditions, SessionReadings,
    };

    /// Two cells that sink by 0.02 bar a minute, a row every 30 s.
    fn session(rows: usize) -> Session {
        let column = |more: f64| (0..rows).map(|row| 0.9 + more - 0.01 * row as f64).collect();
        let cell =
            |name: &str, more| CellReadings { name: name.into(), signal: CellSignal::Bar(column(more)) };
        Session {
            diver: Id::new("D-07").unwrap(),
            mass: None,
            place: Place::Couch,
            kept: LoopKept::Held,
            diluent: Diluent::Air,
            loop_volume: None,
            leak_test: LeakTest::NotDone,
            nose_clip: None,
            oxygen: None,
            taken: chrono::DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap(),
            readings: SessionReadings {
                time_s: (0..rows).map(|row| 30.0 * row as f64).collect(),
                cells: vec![cell("c1", 0.0), cell("c2", 0.01)],
                depth_m: None,
                loop_temperature_k: None,
            },
            line: None,
            conditions: SessionConditions::default(),
            cells: CellPapers::default(),
            rest: Rest::default(),
            assumptions: Assumptions::DEFAULT,
            events: Vec::new(),
            cylinder: None,
        }
    }

    fn at(at_s: f64, what: What) -> Event {
        Event { at_s, what }
    }

    #[test]
    fn the_slope_is_that_of_the_rows_since_the_last_event_and_its_dead_time() {
        let mut long = session(21);
        let of = |session: &Session| so_far(session, None).slope;
        let whole = of(&long).unwrap();
        // By hand: 0.01 bar in half a minute; 21 rows from 0 s on.
        assert!((whole.bar_per_min + 0.02).abs() < 1e-12 && whole.rows == 21 && whole.from_s == 0.0);
        long.events.push(at(0.0, What::Injection(Injection::Off)));
        assert_eq!(of(&long).map(|s| (s.from_s, s.rows)), Some((90.0, 18)));
        long.events.push(at(300.0, What::OxygenAdd(None)));
        assert_eq!(of(&long).map(|s| (s.from_s, s.rows)), Some((390.0, 8)));
        long.events.push(at(450.0, What::Exclude { until_s: 480.0 }));
        assert_eq!(of(&long).map(|s| s.rows), Some(6));
        // What comes after the last reading has done nothing yet.
        long.events.push(at(700.0, What::Vent(None)));
        assert_eq!(of(&long).map(|s| s.rows), Some(6));
        long.events.push(at(420.0, What::Stop));
        assert_eq!(of(&long), None, "two rows are left");
        assert_eq!(of(&session(2)), None);
    }

    #[test]
    fn the_middle_is_that_of_the_cells_that_were_read() {
        let mut three = session(1);
        assert_eq!(so_far(&three, None).median_bar, Some(0.5 * (0.9 + 0.91)));
        if let CellSignal::Bar(column) = &mut three.readings.cells[1].signal {
            column[0] = f64::NAN;
        }
        assert_eq!(so_far(&three, None).median_bar, Some(0.9));
    }

    #[test]
    fn what_is_needed_is_said_in_the_order_in_which_it_can_be_given() {
        assert_eq!(so_far(&session(0), None).needs, Needs::Readings);
        let mut begun = session(3);
        assert_eq!(so_far(&begun, None).needs, Needs::Injection);
        begun.events.push(at(90.0, What::Injection(Injection::Off)));
        assert_eq!(up_to_now(begun.clone()).events, [], "no reading is after it yet");
        let none = Err(WorkError::Uptake { session: "S0001".into(), error: UptakeError::NoInjection });
        assert_eq!(
            so_far(&begun, Some(&none)).needs,
            Needs::Time { usable_s: 0.0, needed_s: 240.0, warm_up_s: 0.0 }
        );
    }
}
