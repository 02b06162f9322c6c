//! What is said while a session is typed: cautions, acknowledgements, what the rows say so far, help.
//!
//! Comes in: rows as they were understood, and what came of them. Goes out: text of 80 columns. The whole uptake is
//! [`super::session_uptake`]'s; refusals are their own errors. PO2 is in bar throughout, as it is typed.

use serde::Serialize;
use serde_json::Value;

use super::Units;
use super::cautions::{POOL_DEEPEST_M, SESSION, po2_limits_bar};
use super::layout::{counted, table, wrapped};
use super::number::{Plain, fixed, shortest};
use super::session_enter_questions::SessionQuestion;
use super::session_list::diluent;
use super::session_shown;
use super::typed::{clock, span, tame};
use super::uptake_sentences as say;
use crate::entry::{Event, Id, LeakTest, LineReference, Place, Session, SessionNumber};
use crate::quantity::show::uncertain_to_text;
use crate::quantity::{Quantity, Span, Uncertain};
use crate::uptake::WhyNot;

/// Digits of a reading that are shown: more than any handset has.
const DIGITS: i32 = 6;

/// A row as it is said.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum RowWords<'a> {
    /// PO2 of the cells at a time.
    Readings {
        /// When, in seconds after the first reading.
        at_s: f64,
        /// PO2 of each cell in bar; NaN for one that was not read.
        po2_bar: &'a [f64],
    },
    /// Something that happened.
    Event(&'a Event),
}

/// A row of the list.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Listed<'a> {
    /// What it says.
    pub row: RowWords<'a>,
    /// Why it was struck; none while it stands.
    pub struck: Option<&'a str>,
}

/// How fast PO2 goes, by a straight line through the middle of the cells.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Slope {
    /// Bar per minute, negative while it sinks.
    pub bar_per_min: f64,
    /// From which second on.
    pub from_s: f64,
    /// Rows it goes through.
    pub rows: usize,
}

/// What is still needed for an uptake.
#[derive(Debug, Clone, PartialEq)]
pub enum Needs<'a> {
    /// A first reading.
    Readings,
    /// An event that says what is injected.
    Injection,
    /// More usable time.
    Time {
        /// Usable so far, seconds.
        usable_s: f64,
        /// Needed, seconds.
        needed_s: f64,
        /// Seconds after the first reading that a scrubber not said to be warm takes away; nought when none.
        warm_up_s: f64,
    },
    /// The loop volume, or a second injection.
    VolumeOrInjection,
    /// Something else keeps it from an answer.
    Other(&'a WhyNot),
    /// The rows cannot be worked out, for this reason.
    Wrong(String),
    /// Nothing: there is an uptake.
    Nothing,
}

/// The cautions before the first question.
#[must_use]
pub fn cautions() -> String {
    let mut text = String::from("Before anybody goes on the loop\n");
    for caution in SESSION {
        text.push_str(&wrapped("  - ", "    ", caution));
    }
    text.push('\n');
    text
}

/// The first lines of a new session.
#[must_use]
pub fn greeting(diver: &Id, registered: bool, open: Option<SessionNumber>) -> String {
    let mut text = format!("A session of {diver}, typed.");
    if !registered {
        text.push_str(" The diver is new: the register gets the code only.");
    }
    text.push_str(" Enter takes what stands in [ ], ? explains, Ctrl-D leaves.");
    let mut text = wrapped("", "", &text);
    if let Some(open) = open {
        let also = format!("{open} of this diver is still open; session resume {open} goes on with it.");
        text.push_str(&wrapped("", "", &also));
    }
    text
}

/// The first lines of a session that goes on.
#[must_use]
pub fn going_on(number: SessionNumber, session: &Session) -> String {
    let about = format!(
        "{number} goes on — {}: {}, {} loop, taken {}",
        session.diver,
        session.place.name(),
        session.kept.name(),
        session.taken.to_rfc3339()
    );
    wrapped("", "  ", &about)
}

/// How a row is typed.
#[must_use]
pub fn how_to_type() -> String {
    let mut text = wrapped(
        "",
        "  ",
        "Type each row as the time since the first reading (minutes:seconds) and PO2 of each cell in bar, or as the \
         time and what happened, for example",
    );
    text.push_str("  0:00 0.95 0.94 0.96\n  0:00 injection off\n");
    text.push_str("\"done\" ends the session, \"help\" lists the rest.\n");
    text
}

/// Before a row.
#[must_use]
pub fn row_prompt(row: usize) -> String {
    format!("row {row}> ")
}

/// A row as it was understood.
#[must_use]
pub fn row_words(row: RowWords<'_>, units: &Units) -> String {
    match row {
        RowWords::Readings { at_s, po2_bar } => {
            let cells: Vec<String> = po2_bar.iter().map(|po2| po2_text(*po2)).collect();
            format!("{} PO2 {} bar", moment(at_s), cells.join(" "))
        }
        RowWords::Event(event) => {
            format!("{} {}", moment(event.at_s), session_shown::what(&event.what, units))
        }
    }
}

/// A time to the second, with its decimals where it has any.
fn moment(at_s: f64) -> String {
    let whole = libm::floor(at_s);
    let rest = shortest(at_s - whole, 3);
    let decimals = rest.strip_prefix("0.").map(|digits| format!(".{digits}")).unwrap_or_default();
    format!("{}{decimals}", clock(whole))
}

fn po2_text(po2: f64) -> String {
    if po2.is_nan() { "-".to_owned() } else { shortest(po2, DIGITS) }
}

/// That a session began in the book, and what came with it.
#[must_use]
pub fn begun(number: SessionNumber, diver: &Id, diver_created: bool) -> String {
    let bare = if diver_created { "; the diver is new and was created with the code only" } else { "" };
    wrapped("", "  ", &format!("{number} is begun for {diver}{bare}"))
}

/// That a row is in the book: one line, whatever its length, which programs may wait for.
#[must_use]
pub fn row_taken(number: SessionNumber, row: usize, words: RowWords<'_>, units: &Units) -> String {
    format!("{number} row {row}: {}\n", row_words(words, units))
}

/// That a row was corrected.
#[must_use]
pub fn row_corrected(
    number: SessionNumber,
    row: usize,
    now: RowWords<'_>,
    was: RowWords<'_>,
    units: &Units,
) -> String {
    format!("{number} row {row} corrected: {} (was {})\n", row_words(now, units), row_words(was, units))
}

/// That a row was struck.
#[must_use]
pub fn row_struck(number: SessionNumber, row: usize, why: &str) -> String {
    format!("{number} row {row} struck: {}\n", tame(why))
}

/// That something around the rows stands now as it was typed; `number` is none before the first row.
#[must_use]
pub fn restated(number: Option<SessionNumber>, question: SessionQuestion, session: &Session) -> String {
    let number = number.map(|number| format!("{number} ")).unwrap_or_default();
    wrapped("", "  ", &format!("{number}{}: {}", question.word(), stands(question, session)))
}

/// How something around the rows stands now.
#[must_use]
pub fn stands(question: SessionQuestion, session: &Session) -> String {
    let (conditions, rest) = (&session.conditions, &session.rest);
    let not_said = || "not said".to_owned();
    let for_so_long = |s: Option<Span>| s.map_or_else(not_said, |s| span(s.as_s()));
    let yes_no =
        |flag: Option<bool>| flag.map_or_else(not_said, |yes| if yes { "yes" } else { "no" }.to_owned());
    let words = |text: &Option<String>| text.as_deref().map_or_else(not_said, tame);
    match question {
        SessionQuestion::Place => session.place.name().to_owned(),
        SessionQuestion::Loop => session.kept.name().to_owned(),
        SessionQuestion::Diluent => diluent(session.diluent),
        SessionQuestion::LoopVolume => {
            session.loop_volume.map_or_else(|| "unknown".to_owned(), uncertain_to_text)
        }
        SessionQuestion::Mass => session.mass.map_or_else(not_said, plain),
        SessionQuestion::LeakTest => match session.leak_test {
            LeakTest::Passed => "passed".to_owned(),
            LeakTest::Measured(leak) => uncertain_to_text(leak),
            LeakTest::NotDone => "not done".to_owned(),
        },
        SessionQuestion::NoseClip => yes_no(session.nose_clip),
        SessionQuestion::Barometer => conditions.barometer.value.map_or_else(
            || "not read: 1013.25 ± 30 hPa is taken".to_owned(),
            |p| session_shown::hectopascal(p.as_pa(), conditions.barometer.expanded.map(|u| u.as_pa())),
        ),
        SessionQuestion::Depth => influence(conditions.depth.value, conditions.depth.expanded)
            .unwrap_or_else(|| "not read: 0 m ± 1 m is taken".to_owned()),
        SessionQuestion::LoopTemperature => {
            influence(conditions.loop_temperature.value, conditions.loop_temperature.expanded)
                .unwrap_or_else(|| "not read: 33 °C ± 4 °C is taken".to_owned())
        }
        SessionQuestion::TimeOnLoop => conditions
            .time_on_loop
            .map_or_else(|| "not said: none is taken".to_owned(), |time| span(time.as_s())),
        SessionQuestion::ScrubberWarm => yes_no(conditions.scrubber_warm),
        SessionQuestion::CellGain => match session.cells.gain {
            Some(gain) => format!("{} %", shortest(gain * 100.0, 4)),
            None => format!("not known: {} % is taken", shortest(session.assumptions.cell_gain * 100.0, 4)),
        },
        SessionQuestion::Orifice => match &session.line {
            Some(LineReference::Orifice(id)) => id.to_string(),
            Some(LineReference::RunFile(file)) => format!("run file {}", tame(file)),
            None => "none".to_owned(),
        },
        SessionQuestion::Posture => words(&rest.posture),
        SessionQuestion::RestedFor => for_so_long(rest.rested_for),
        SessionQuestion::LastMeal => for_so_long(rest.last_meal),
        SessionQuestion::LastExercise => for_so_long(rest.last_exercise),
        SessionQuestion::CaffeineOrNicotine => yes_no(rest.caffeine_or_nicotine),
        SessionQuestion::LastDive => for_so_long(rest.last_dive),
        SessionQuestion::WaterTemperature => rest.water_temperature.map_or_else(not_said, plain),
        SessionQuestion::Suit => words(&rest.suit),
        SessionQuestion::Taken => session.taken.to_rfc3339(),
    }
}

fn plain<T: Quantity>(value: T) -> String {
    crate::quantity::show::to_text(value)
}

fn influence<T: Quantity>(value: Option<T>, expanded: Option<T::Difference>) -> Option<String> {
    value.map(|value| uncertain_to_text(Uncertain { value, expanded }))
}

/// What a typed PO2 asks for at once; none within the limits of the place.
#[must_use]
pub fn po2_caution(place: Place, po2_bar: &[f64]) -> Option<String> {
    let (floor, ceiling) = po2_limits_bar(place);
    let cell = |passed: &dyn Fn(f64) -> bool| {
        let found = po2_bar.iter().position(|po2| passed(*po2))?;
        Some(format!("cell {} shows {} bar", found + 1, po2_text(*po2_bar.get(found)?)))
    };
    if let Some(shows) = cell(&|po2| po2 < floor) {
        return Some(format!(
            "below {} bar: add oxygen now, or come off the loop and breathe fresh gas ({shows}); the row is kept as \
             it was read",
            fixed(floor, 2)
        ));
    }
    let shows = cell(&|po2| po2 > ceiling)?;
    Some(format!(
        "above {} bar: add no oxygen, and bring it down with diluent, or come off the loop ({shows}); the row is kept \
         as it was read",
        fixed(ceiling, 1)
    ))
}

/// What a depth in a pool asks for; none down to the deepest there is.
#[must_use]
pub fn depth_caution(session: &Session) -> Option<String> {
    let depth = session.conditions.depth.value?.as_m();
    (session.place == Place::Pool && depth > POOL_DEEPEST_M).then(|| {
        format!(
            "deeper than {} m: a pool session is no deeper, with the second person in the water within reach",
            shortest(POOL_DEEPEST_M, 2)
        )
    })
}

/// What a row says, once it is in the book: the middle of the cells, how fast it goes, what is still needed.
#[must_use]
pub fn standing(median_bar: Option<f64>, slope: Option<&Slope>, needs: &Needs<'_>) -> String {
    let mut parts: Vec<String> = Vec::new();
    parts.extend(median_bar.map(|po2| format!("median {} bar", fixed(po2, 3))));
    parts.extend(slope.map(|slope| {
        format!(
            "slope {} bar/min since {} (line through {}, no uncertainty)",
            signed(slope.bar_per_min),
            clock(slope.from_s),
            counted(slope.rows as u64, "row")
        )
    }));
    parts.push(needed(needs));
    wrapped("  ", "    ", &parts.join("; "))
}

/// With a true minus, and a plus where it rises.
fn signed(bar_per_min: f64) -> String {
    let text = fixed(bar_per_min, 4);
    match text.strip_prefix('-') {
        Some(size) => format!("−{size}"),
        None if text.bytes().any(|b| b.is_ascii_digit() && b != b'0') => format!("+{text}"),
        None => text,
    }
}

/// What is still needed, in words.
#[must_use]
pub fn needed(needs: &Needs<'_>) -> String {
    match needs {
        Needs::Readings => "needed: the first reading, as in 0:00 0.95 0.94 0.96".to_owned(),
        Needs::Injection => {
            "needed: what is injected, as in 0:00 injection off (or 0.31 L/min, or 9.4 bar)".to_owned()
        }
        Needs::Time { usable_s, needed_s, warm_up_s } => {
            let warm_up = if *warm_up_s > 0.0 {
                format!(
                    "; the first {} do not count unless the scrubber was warm (scrubber-warm yes)",
                    span(*warm_up_s)
                )
            } else {
                String::new()
            };
            format!(
                "needed: {} usable at one injection, so far {}{warm_up}",
                span(*needed_s),
                span(*usable_s)
            )
        }
        Needs::VolumeOrInjection => {
            "needed: the loop volume (as in loop-volume 7.5 L ± 1.0 L), or ten minutes at a second \
            injection"
                .to_owned()
        }
        Needs::Other(why) => format!("no uptake yet: {}", say::why_not(why)),
        Needs::Wrong(why) => format!("no uptake yet: {why}"),
        Needs::Nothing => "enough for an uptake: so far tells it".to_owned(),
    }
}

/// The rows so far.
#[must_use]
pub fn list(rows: &[Listed<'_>], units: &Units) -> String {
    if rows.is_empty() {
        return "  no rows yet\n".to_owned();
    }
    let cells: Vec<Vec<String>> = rows
        .iter()
        .enumerate()
        .map(|(i, listed)| {
            let words = row_words(listed.row, units);
            let (time, says) = words.split_once(' ').unwrap_or((&words, ""));
            let struck = listed.struck.map(|why| format!("struck: {} — ", tame(why))).unwrap_or_default();
            vec![(i + 1).to_string(), time.to_owned(), format!("{struck}{says}")]
        })
        .collect();
    table(&["row", "time", ""], &["", "", ""], &cells, true)
}

/// What can be typed.
#[must_use]
pub fn help() -> String {
    let mut text = String::from("What can be typed\n");
    let rows: [(&str, &str); 17] = [
        ("10:00 0.88 0.87 -", "PO2 of each cell in bar at 10 min; - for a cell that was not read"),
        (
            "0:00 injection off",
            "what is injected from then on: off, a flow (0.31 L/min, STPD), or an IP (9.4 bar)",
        ),
        ("10:00 oxygen add", "oxygen added by hand; metered: oxygen add 0.4 L at 25 °C, 101.3 kPa"),
        ("10:00 diluent add", "diluent added beyond what keeps the volume"),
        ("10:00 vent", "loop gas let out"),
        ("10:00 make-up mark", "back at the first volume; make-up loop=sealed: kept so from then on"),
        ("12:00 exclude until 13:00", "readings that are dropped"),
        ("26:00 stop", "what follows does not count"),
        ("correct 3 10:00 0.88 0.87 0.89", "row 3 was typed wrong"),
        ("strike 3 read the wrong watch", "row 3 does not count, for this reason; it stays in the record"),
        ("list", "the rows so far"),
        ("so far", "the uptake so far"),
        ("sheet", "everything the rows say so far"),
        (
            "loop-volume 7.5 L ± 1.0 L",
            "again what was asked before the first row: barometer, mass, last-meal, …",
        ),
        ("conditions", "how all of that stands now"),
        ("done", "all rows are in"),
        ("quit", "leave the session open; session resume goes on with it"),
    ];
    for (typed, about) in rows {
        text.push_str(&wrapped(&format!("  {typed:<31} "), &" ".repeat(34), about));
    }
    text.push_str(&wrapped("  ", "  ", "Times are minutes:seconds, hours:minutes:seconds, or seconds."));
    text
}

/// How everything around the rows stands.
#[must_use]
pub fn conditions(session: &Session) -> String {
    let of_here = |question: &SessionQuestion| session.place == Place::Pool || !question.of_the_pool();
    SessionQuestion::ALL
        .into_iter()
        .filter(of_here)
        .map(|question| {
            wrapped(&format!("  {:<21} ", question.word()), &" ".repeat(24), &stands(question, session))
        })
        .collect()
}

/// That a session was left open, or that nothing was recorded.
#[must_use]
pub fn left_open(number: Option<SessionNumber>, rows: usize) -> String {
    match number {
        None => "Nothing was recorded.\n".to_owned(),
        Some(_) => wrapped("", "  ", &kept(number, rows)),
    }
}

/// What became of the rows so far.
#[must_use]
pub fn kept(number: Option<SessionNumber>, rows: usize) -> String {
    number.map_or_else(
        || "nothing was recorded".to_owned(),
        |number| {
            let rows = counted(rows as u64, "row");
            format!("{number} stays open with {rows}, go on with: session resume {number}")
        },
    )
}

/// That a session is complete, below what came out.
#[must_use]
pub fn finished(number: SessionNumber, with_uptake: bool) -> String {
    let text = if with_uptake {
        format!("{number} is complete: session uptake {number} tells the same again")
    } else {
        format!("{number} is complete, without an uptake for the reason above")
    };
    wrapped("", "  ", &text)
}

/// The session as a document: its number, whether it is open, its rows as read, and the uptake as `session uptake` has
/// it.
#[must_use]
pub fn document(
    number: Option<SessionNumber>,
    open: bool,
    session: &Session,
    rows: &[Listed<'_>],
    uptake: Option<&str>,
) -> String {
    super::json_text(&Document {
        format: 1,
        session: number.map(|number| number.to_string()),
        diver: session.diver.to_string(),
        open,
        rows: rows.iter().enumerate().map(|(i, row)| JsonRow::of(i + 1, row)).collect(),
        uptake: uptake.and_then(|document| serde_json::from_str(document).ok()).unwrap_or(Value::Null),
    })
}

#[derive(Serialize)]
struct Document {
    format: u32,
    session: Option<String>,
    diver: String,
    open: bool,
    rows: Vec<JsonRow>,
    uptake: Value,
}

#[derive(Serialize)]
struct JsonRow {
    row: usize,
    at_s: Plain,
    po2_bar: Option<Vec<Plain>>,
    event: Option<String>,
    struck: Option<String>,
}

impl JsonRow {
    fn of(row: usize, listed: &Listed<'_>) -> Self {
        let (at_s, po2_bar, event) = match listed.row {
            RowWords::Readings { at_s, po2_bar } => {
                (at_s, Some(po2_bar.iter().copied().map(Plain).collect()), None)
            }
            RowWords::Event(event) => {
                (event.at_s, None, Some(session_shown::what(&event.what, &Units::default())))
            }
        };
        Self { row, at_s: Plain(at_s), po2_bar, event, struck: listed.struck.map(str::to_owned) }
    }
}
