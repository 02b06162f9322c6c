//! One answer of the dialogue to the part of a session it stands for.
//!
//! Comes in: a question and the text of an answer. Goes out: the same session with that part as the text says, read by
//! the rules of a session file.

use super::{SessionEnterError, refused};
use crate::entry::{Diluent, LeakTest, Session};
use crate::record::{SessionSetup, session_setup_from};
use crate::report::session_enter_questions::SessionQuestion;

/// The key of a question in a session file; none where no file has it so.
const fn key(question: SessionQuestion) -> &'static str {
    match question {
        SessionQuestion::Place => "place",
        SessionQuestion::Loop => "loop",
        SessionQuestion::Diluent => "diluent",
        SessionQuestion::LoopVolume => "loop_volume",
        SessionQuestion::Mass => "mass",
        SessionQuestion::LeakTest => "leak_test",
        SessionQuestion::NoseClip => "nose_clip",
        SessionQuestion::Barometer => "conditions.barometer",
        SessionQuestion::Depth => "conditions.depth",
        SessionQuestion::LoopTemperature => "conditions.loop_temperature",
        SessionQuestion::TimeOnLoop => "conditions.time_on_loop",
        SessionQuestion::ScrubberWarm => "conditions.scrubber_warm",
        SessionQuestion::CellGain => "cells.gain",
        SessionQuestion::Orifice => "orifice",
        SessionQuestion::Posture => "rest.posture",
        SessionQuestion::RestedFor => "rest.rested_for",
        SessionQuestion::LastMeal => "rest.last_meal",
        SessionQuestion::LastExercise => "rest.last_exercise",
        SessionQuestion::CaffeineOrNicotine => "rest.caffeine_or_nicotine",
        SessionQuestion::LastDive => "rest.last_dive",
        SessionQuestion::WaterTemperature => "rest.water_temperature",
        SessionQuestion::Suit => "rest.suit",
        SessionQuestion::Taken => "taken",
    }
}

/// Puts what a text says into a session; a word for "nothing" takes it away.
///
/// # Errors
/// A text that is no answer.
pub(super) fn put(
    session: &mut Session,
    question: SessionQuestion,
    text: &str,
) -> Result<(), SessionEnterError> {
    let lower = text.trim().to_lowercase();
    let nothing = match question {
        SessionQuestion::Place | SessionQuestion::Loop | SessionQuestion::Diluent | SessionQuestion::Suit => {
            false
        }
        SessionQuestion::LeakTest => matches!(lower.as_str(), "none" | "not done" | "no"),
        _ => matches!(lower.as_str(), "none" | "unknown" | "not said" | "not read"),
    };
    let text = match (question, lower.as_str()) {
        (
            SessionQuestion::NoseClip | SessionQuestion::ScrubberWarm | SessionQuestion::CaffeineOrNicotine,
            "yes" | "y",
        ) => "true",
        (
            SessionQuestion::NoseClip | SessionQuestion::ScrubberWarm | SessionQuestion::CaffeineOrNicotine,
            "no" | "n",
        ) => "false",
        (SessionQuestion::Place | SessionQuestion::Loop | SessionQuestion::LeakTest, _)
            if lower.chars().all(char::is_alphabetic) =>
        {
            lower.as_str()
        }
        _ => text,
    };
    let answers = [(key(question), text)];
    let said = session_setup_from(if nothing { &[] } else { &answers }).map_err(refused)?;
    take(session, question, said);
    Ok(())
}

/// Takes what a setup says about one question.
pub(super) fn take(session: &mut Session, question: SessionQuestion, said: SessionSetup) {
    let (conditions, rest) = (&mut session.conditions, &mut session.rest);
    match question {
        SessionQuestion::Place => session.place = said.place.unwrap_or(session.place),
        SessionQuestion::Loop => session.kept = said.kept.unwrap_or(session.kept),
        SessionQuestion::Diluent => session.diluent = said.diluent.unwrap_or(Diluent::Air),
        SessionQuestion::LoopVolume => session.loop_volume = said.loop_volume,
        SessionQuestion::Mass => session.mass = said.mass,
        SessionQuestion::LeakTest => session.leak_test = said.leak_test.unwrap_or(LeakTest::NotDone),
        SessionQuestion::NoseClip => session.nose_clip = said.nose_clip,
        SessionQuestion::Barometer => conditions.barometer = said.conditions.barometer,
        SessionQuestion::Depth => conditions.depth = said.conditions.depth,
        SessionQuestion::LoopTemperature => conditions.loop_temperature = said.conditions.loop_temperature,
        SessionQuestion::TimeOnLoop => conditions.time_on_loop = said.conditions.time_on_loop,
        SessionQuestion::ScrubberWarm => conditions.scrubber_warm = said.conditions.scrubber_warm,
        SessionQuestion::CellGain => session.cells.gain = said.cells.gain,
        SessionQuestion::Orifice => session.line = said.line,
        SessionQuestion::Posture => rest.posture = said.rest.posture,
        SessionQuestion::RestedFor => rest.rested_for = said.rest.rested_for,
        SessionQuestion::LastMeal => rest.last_meal = said.rest.last_meal,
        SessionQuestion::LastExercise => rest.last_exercise = said.rest.last_exercise,
        SessionQuestion::CaffeineOrNicotine => rest.caffeine_or_nicotine = said.rest.caffeine_or_nicotine,
        SessionQuestion::LastDive => rest.last_dive = said.rest.last_dive,
        SessionQuestion::WaterTemperature => rest.water_temperature = said.rest.water_temperature,
        SessionQuestion::Suit => rest.suit = said.rest.suit,
        // The time is read apart: a file's is of its own readings.
        SessionQuestion::Taken => {}
    }
}

/// Whether a setup says anything about a question.
pub(super) fn says(said: &SessionSetup, question: SessionQuestion) -> bool {
    let (conditions, rest) = (&said.conditions, &said.rest);
    match question {
        SessionQuestion::Place => said.place.is_some(),
        SessionQuestion::Loop => said.kept.is_some(),
        SessionQuestion::Diluent => said.diluent.is_some(),
        SessionQuestion::LoopVolume => said.loop_volume.is_some(),
        SessionQuestion::Mass => said.mass.is_some(),
        SessionQuestion::LeakTest => said.leak_test.is_some(),
        SessionQuestion::NoseClip => said.nose_clip.is_some(),
        SessionQuestion::Barometer => conditions.barometer.value.is_some(),
        SessionQuestion::Depth => conditions.depth.value.is_some(),
        SessionQuestion::LoopTemperature => conditions.loop_temperature.value.is_some(),
        SessionQuestion::TimeOnLoop => conditions.time_on_loop.is_some(),
        SessionQuestion::ScrubberWarm => conditions.scrubber_warm.is_some(),
        SessionQuestion::CellGain => said.cells.gain.is_some(),
        SessionQuestion::Orifice => said.line.is_some(),
        SessionQuestion::Posture => rest.posture.is_some(),
        SessionQuestion::RestedFor => rest.rested_for.is_some(),
        SessionQuestion::LastMeal => rest.last_meal.is_some(),
        SessionQuestion::LastExercise => rest.last_exercise.is_some(),
        SessionQuestion::CaffeineOrNicotine => rest.caffeine_or_nicotine.is_some(),
        SessionQuestion::LastDive => rest.last_dive.is_some(),
        SessionQuestion::WaterTemperature => rest.water_temperature.is_some(),
        SessionQuestion::Suit => rest.suit.is_some(),
        SessionQuestion::Taken => false,
    }
}
