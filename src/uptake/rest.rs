//! Was it rest, and is the number one of a resting person?
//!
//! Comes in: what the session says about rest; the uptake and the mass. Goes out: doubts, each a warning, and the
//! question that an implausible uptake per kilogram raises. Never a correction. Limits are common practice (no source);
//! the plausible range is that of measured resting uptakes, 2.6 ± 0.4 mL/(kg·min) (N. M. Byrne et al., J. Appl.
//! Physiol. 99 (2005) 1112), and the convention of 3.5.

use crate::entry::{Place, Rest};
use crate::quantity::{Mass, Span, Temperature};

/// Rested for at least this, seconds.
const RESTED_S: f64 = 20.0 * 60.0;
/// Last meal at least this long ago, seconds.
const FASTED_S: f64 = 3.0 * 3600.0;
/// Last exercise at least this long ago, seconds.
const NO_EXERCISE_S: f64 = 4.0 * 3600.0;
/// Last dive at least this long ago, seconds.
const NO_DIVE_S: f64 = 12.0 * 3600.0;
/// Water at least this warm without a suit, °C.
const WARM_WATER_C: f64 = 32.0;
/// Outside this the question is asked, mL/(kg·min).
const USUAL_ML_KG: (f64, f64) = (2.0, 4.5);
/// Outside this no setting without a recorded override, mL/(kg·min).
const POSSIBLE_ML_KG: (f64, f64) = (1.5, 6.0);

/// A doubt about rest. All but a cold pool's cause are "read high, the dangerous side".
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum RestDoubt {
    /// Nothing says this.
    NotSaid(RestItem),
    /// Rested for less than 20 minutes: so many seconds.
    RestedTooShort(f64),
    /// A meal less than 3 hours ago: so many seconds.
    Fed(f64),
    /// Exercise less than 4 hours ago: so many seconds.
    Exercised(f64),
    /// A dive less than 12 hours ago: so many seconds.
    Dived(f64),
    /// Caffeine or nicotine today.
    Stimulated,
    /// Water colder than 32 °C without a suit: so many °C.
    ColdWater(f64),
}

/// What a session may say about rest.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum RestItem {
    /// Posture.
    Posture,
    /// For how long the diver had rested.
    RestedFor,
    /// When the last meal was.
    LastMeal,
    /// When the last exercise was.
    LastExercise,
    /// When the last dive was.
    LastDive,
    /// Caffeine or nicotine.
    CaffeineOrNicotine,
    /// Water temperature, in a pool.
    WaterTemperature,
    /// Suit, in a pool.
    Suit,
}

/// What an uptake per kilogram says.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct PerKilogram {
    /// Uptake, mL/(kg·min).
    pub ml_kg_min: f64,
    /// Whether it is usual.
    pub plausible: Plausible,
}

/// How usual an uptake per kilogram is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Plausible {
    /// Between 2.0 and 4.5 mL/(kg·min).
    Usual,
    /// Outside that: ask whether flow, volume or reference conditions are wrong.
    Unusual,
    /// Outside 1.5 to 6: ask, and no setting without a recorded override.
    Hardly,
}

/// Every doubt, in the order of the keys.
pub(super) fn doubts(rest: &Rest, place: Place) -> Vec<RestDoubt> {
    use RestDoubt::{ColdWater, Dived, Exercised, Fed, NotSaid, RestedTooShort, Stimulated};
    let mut doubts = Vec::new();
    if rest.posture.is_none() {
        doubts.push(NotSaid(RestItem::Posture));
    }
    let mut span = |said: Option<Span>, least_s: f64, item, doubt: fn(f64) -> RestDoubt| match said {
        None => doubts.push(NotSaid(item)),
        Some(span) if span.as_s() < least_s => doubts.push(doubt(span.as_s())),
        Some(_) => {}
    };
    span(rest.rested_for, RESTED_S, RestItem::RestedFor, RestedTooShort);
    span(rest.last_meal, FASTED_S, RestItem::LastMeal, Fed);
    span(rest.last_exercise, NO_EXERCISE_S, RestItem::LastExercise, Exercised);
    span(rest.last_dive, NO_DIVE_S, RestItem::LastDive, Dived);
    match rest.caffeine_or_nicotine {
        None => doubts.push(NotSaid(RestItem::CaffeineOrNicotine)),
        Some(true) => doubts.push(Stimulated),
        Some(false) => {}
    }
    if place == Place::Pool {
        let suited = rest.suit.as_deref().is_some_and(|suit| !suit.eq_ignore_ascii_case("none"));
        if rest.suit.is_none() {
            doubts.push(NotSaid(RestItem::Suit));
        }
        match rest.water_temperature.map(Temperature::as_c) {
            None => doubts.push(NotSaid(RestItem::WaterTemperature)),
            Some(c) if c < WARM_WATER_C && !suited => doubts.push(ColdWater(c)),
            Some(_) => {}
        }
    }
    doubts
}

/// Uptake per kilogram.
pub(super) fn per_kilogram(uptake_l_min: f64, mass: Mass) -> Option<PerKilogram> {
    let kg = mass.as_kg();
    if kg.is_nan() || kg <= 0.0 {
        return None;
    }
    let ml_kg_min = uptake_l_min * 1000.0 / kg;
    let within = |(low, high): (f64, f64)| (low..=high).contains(&ml_kg_min);
    let plausible = match (within(USUAL_ML_KG), within(POSSIBLE_ML_KG)) {
        (true, _) => Plausible::Usual,
        (false, true) => Plausible::Unusual,
        (false, false) => Plausible::Hardly,
    };
    Some(PerKilogram { ml_kg_min, plausible })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn uptakes_per_kilogram_raise_the_right_question() {
        // Byrne et al. 2005: 2.6 ± 0.4; convention 3.5; the limits are the method's.
        for (litres, want) in [
            (0.26, Plausible::Usual),
            (0.35, Plausible::Usual),
            (0.20, Plausible::Usual),
            (0.19, Plausible::Unusual),
            (0.46, Plausible::Unusual),
            (0.149, Plausible::Hardly),
            (0.61, Plausible::Hardly),
        ] {
            assert_eq!(per_kilogram(litres, Mass::from_kg(100.0)).unwrap().plausible, want, "{litres}");
        }
        assert_eq!(per_kilogram(0.3, Mass::from_kg(0.0)), None);
    }

    #[test]
    fn each_missing_or_unfavourable_item_is_a_doubt() {
        assert_eq!(doubts(&Rest::default(), Place::Couch).len(), 6);
        assert_eq!(doubts(&Rest::default(), Place::Pool).len(), 8);
        let hours = |h: f64| Some(Span::from_s(h * 3600.0));
        let good = Rest {
            posture: Some("lying".into()),
            rested_for: hours(0.5),
            last_meal: hours(5.0),
            last_exercise: hours(12.0),
            last_dive: hours(48.0),
            caffeine_or_nicotine: Some(false),
            water_temperature: Some(Temperature::from_c(33.0)),
            suit: Some("none".into()),
        };
        assert_eq!(doubts(&good, Place::Pool), []);
        let bad = Rest {
            rested_for: hours(0.2),
            last_meal: hours(1.0),
            last_exercise: hours(2.0),
            last_dive: hours(3.0),
            caffeine_or_nicotine: Some(true),
            water_temperature: Some(Temperature::from_c(28.0)),
            ..good.clone()
        };
        assert_eq!(doubts(&bad, Place::Pool).len(), 6);
        let suited = Rest {
            water_temperature: Some(Temperature::from_c(20.0)),
            suit: Some("dry suit".into()),
            ..good
        };
        assert_eq!(doubts(&suited, Place::Pool), []);
    }
}
