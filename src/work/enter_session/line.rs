//! One typed line of a session: a row, or a command.
//!
//! Comes in: the text of a line, and the session it belongs to. Goes out: what was meant, or one sentence. Times and events
//! are brought to the texts a session file has and read by its rules; only minutes:seconds, which no file has, are this
//! dialogue's own. Left out: decimal commas, which are refused with the number as it should stand.

use chrono::DateTime;

use super::{SessionEnterError, refused};
use crate::entry::{Event, Session, What};
use crate::quantity::text::{uncertain, value};
use crate::quantity::{AbsolutePressure, GaugePressure, QuantityError, StpdFlow};
use crate::record::{When, elapsed_or_time, event_from};
use crate::report::session_enter_questions::SessionQuestion;

/// What was typed.
#[derive(Debug, Clone, PartialEq)]
pub enum Typed {
    /// Nothing, or a remark behind `#`.
    Nothing,
    /// A row.
    Row(Row),
    /// A row that was typed wrong, as it should be.
    Correct(usize, Row),
    /// A row that does not count, and why.
    Strike(usize, String),
    /// The rows so far.
    List,
    /// The uptake so far.
    SoFar,
    /// Everything the rows say so far.
    Sheet,
    /// How everything around the rows stands.
    Conditions,
    /// An answer to a question again; empty to be asked.
    Restate(SessionQuestion, String),
    /// All rows are in.
    Done,
    /// Leave the session open.
    Quit,
    /// What can be typed.
    Help,
}

/// A row as typed.
#[derive(Debug, Clone, PartialEq)]
pub enum Row {
    /// PO2 of the cells at a time.
    Readings {
        /// Seconds after the first reading.
        at_s: f64,
        /// PO2 of each cell in bar; NaN for one that was not read.
        po2_bar: Vec<f64>,
    },
    /// Something that happened.
    Event(Event),
}

const COMMANDS: [&str; 10] =
    ["correct", "strike", "list", "so far", "sheet", "conditions", "done", "quit", "exit", "help"];

/// What can happen, in the words of a file.
const HAPPENINGS: [&str; 7] =
    ["injection", "oxygen add", "diluent add", "vent", "make-up", "exclude", "stop"];

/// Reads a line where a row or a command is expected.
///
/// # Errors
/// A line that is neither, or lacks something, in one sentence.
pub fn read(line: &str, session: &Session) -> Result<Typed, SessionEnterError> {
    let line = line.trim();
    if line.is_empty() || line.starts_with('#') {
        return Ok(Typed::Nothing);
    }
    let (first, rest) = line.split_once(char::is_whitespace).unwrap_or((line, ""));
    let rest = rest.trim();
    let alone = |what: &'static str, typed: Typed| match rest {
        "" => Ok(typed),
        text => Err(SessionEnterError::Behind { text: text.to_owned(), what, takes: "nothing behind it" }),
    };
    let lower = first.to_lowercase();
    match lower.as_str() {
        "?" | "help" => Ok(Typed::Help),
        "list" => alone("list", Typed::List),
        "so" if rest.eq_ignore_ascii_case("far") => Ok(Typed::SoFar),
        "sheet" => alone("sheet", Typed::Sheet),
        "conditions" => alone("conditions", Typed::Conditions),
        "done" => alone("done", Typed::Done),
        "quit" | "exit" => alone("quit", Typed::Quit),
        "strike" => {
            let (row, why) = numbered("strike", "strike 3 read the wrong watch", rest)?;
            if why.is_empty() {
                return Err(SessionEnterError::NoReason);
            }
            Ok(Typed::Strike(row, why.to_owned()))
        }
        "correct" => {
            let (row, again) = numbered("correct", "correct 3 10:00 0.88 0.87 0.89", rest)?;
            match again.split_once(char::is_whitespace) {
                Some((at, what)) if begins_time(at) => {
                    Ok(Typed::Correct(row, row_of(at, what.trim(), session)?))
                }
                _ => Err(SessionEnterError::NoRow),
            }
        }
        word => {
            if let Some(question) = SessionQuestion::ALL.into_iter().find(|question| question.word() == word)
            {
                return Ok(Typed::Restate(question, rest.to_owned()));
            }
            if begins_time(first) {
                return Ok(Typed::Row(row_of(first, rest, session)?));
            }
            let words = SessionQuestion::ALL.into_iter().map(SessionQuestion::word);
            let meant = nearest(&line.to_lowercase(), COMMANDS.into_iter())
                .or_else(|| nearest(word, COMMANDS.into_iter().chain(words)));
            Err(SessionEnterError::Unknown { text: line.to_owned(), meant: meant.unwrap_or_default() })
        }
    }
}

/// The row of a time and what stands behind it.
fn row_of(at: &str, what: &str, session: &Session) -> Result<Row, SessionEnterError> {
    let at = moment(at)?;
    if what.is_empty() {
        return Err(SessionEnterError::TimeAlone);
    }
    if begins_reading(what) {
        let when = elapsed_or_time(&at).map_err(|refusal| SessionEnterError::Refused(refusal.to_string()))?;
        return Ok(Row::Readings { at_s: when.on(session), po2_bar: cells(what)? });
    }
    let pairs = happening(what)?;
    let mut texts: Vec<(&str, &str)> = vec![("at", &at)];
    texts.extend(pairs.iter().map(|(key, text)| (*key, text.as_str())));
    Ok(Row::Event(event_from(&texts, session.taken).map_err(refused)?))
}

/// What happened, as it is typed behind its time: "oxygen add 0.4 L", "injection 9.4 bar", "make-up held mark".
///
/// # Errors
/// What is nothing that can happen, or not as a session file has it, in one sentence.
pub fn happened(text: &str) -> Result<What, SessionEnterError> {
    let pairs = happening(text)?;
    let mut texts: Vec<(&str, &str)> = vec![("at", "00:00:00")];
    texts.extend(pairs.iter().map(|(key, text)| (*key, text.as_str())));
    // No time of day is read here, so that the beginning does not matter.
    let begun = DateTime::UNIX_EPOCH.fixed_offset();
    Ok(event_from(&texts, begun).map_err(refused)?.what)
}

/// A time on the time column as it is typed: minutes and seconds, hours with them, or seconds alone.
///
/// # Errors
/// What is none; a time of day.
pub fn seconds(text: &str) -> Result<f64, SessionEnterError> {
    match elapsed_or_time(&moment(text)?) {
        Ok(When::Elapsed(seconds)) => Ok(seconds),
        _ => Err(SessionEnterError::Moment(text.to_owned())),
    }
}

/// What happened, as the keys of an event of a file with their texts.
fn happening(text: &str) -> Result<Vec<(&'static str, String)>, SessionEnterError> {
    let lower = text.to_lowercase();
    let words: Vec<&str> = text.split_whitespace().collect();
    let found = HAPPENINGS.into_iter().find_map(|name| {
        let count = name.split(' ').count();
        let said = words.get(..count)?.join(" ");
        said.eq_ignore_ascii_case(name).then(|| (name, words.get(count..).unwrap_or(&[]).join(" ")))
    });
    let Some((what, rest)) = found else {
        let two: String = lower.split_whitespace().take(2).collect::<Vec<_>>().join(" ");
        let one = lower.split_whitespace().next().unwrap_or("");
        let meant = nearest(&two, HAPPENINGS.into_iter())
            .or_else(|| nearest(one, HAPPENINGS.into_iter()))
            .or_else(|| HAPPENINGS.into_iter().find(|name| name.starts_with(one)).map(is_meant));
        return Err(SessionEnterError::Happening { text: text.to_owned(), meant: meant.unwrap_or_default() });
    };
    let mut pairs = vec![("what", what.to_owned())];
    let behind = |takes| SessionEnterError::Behind { text: rest.clone(), what, takes };
    match what {
        "injection" => pairs.push(injected(&rest)?),
        "make-up" => {
            for word in rest.split_whitespace() {
                let word = word.trim_end_matches(',');
                if word.eq_ignore_ascii_case("mark") {
                    pairs.push(("mark", "true".to_owned()));
                } else {
                    let kept = word.strip_prefix("loop=").unwrap_or(word).to_lowercase();
                    pairs.push(("loop", kept));
                }
            }
        }
        "exclude" => {
            let until = rest.strip_prefix("until").map(str::trim).filter(|until| !until.is_empty());
            let until = until.ok_or_else(|| behind("until when, as in exclude until 13:00"))?;
            pairs.push(("until", moment(until)?));
        }
        "stop" if !rest.is_empty() => return Err(behind("nothing behind it")),
        "stop" => {}
        _ if rest.is_empty() => {}
        _ => match rest.split_once(" at ") {
            Some((volume, reads_at)) => {
                pairs.push(("volume", volume.trim().to_owned()));
                pairs.push(("reads_at", reads_at.trim().to_owned()));
            }
            None => pairs.push(("volume", rest)),
        },
    }
    Ok(pairs)
}

/// What is injected: nothing, a flow or an intermediate pressure, by its unit.
fn injected(text: &str) -> Result<(&'static str, String), SessionEnterError> {
    let keyed = |key: &str| {
        let rest = text.strip_prefix(key)?.trim_start();
        Some(rest.strip_prefix('=').unwrap_or(rest).trim().to_owned())
    };
    if text.is_empty() {
        return Err(SessionEnterError::NothingInjected);
    }
    if text.eq_ignore_ascii_case("off") || text.eq_ignore_ascii_case("none") {
        return Ok(("off", "true".to_owned()));
    }
    if let Some(flow) = keyed("flow") {
        return Ok(("flow", flow));
    }
    if let Some(ip) = keyed("ip").or_else(|| keyed("IP")) {
        return Ok(("ip", ip));
    }
    // Litres that hide their reference conditions are refused as a flow, in their own words.
    if matches!(uncertain::<StpdFlow>(text), Ok(_) | Err(QuantityError::UnstatedReference { .. })) {
        return Ok(("flow", text.to_owned()));
    }
    if uncertain::<GaugePressure>(text).is_ok() {
        return Ok(("ip", text.to_owned()));
    }
    // A bare number is neither; else its refusal names what is wrong with it.
    let numeric = text.chars().all(|c| c.is_ascii_digit() || matches!(c, '.' | ',' | '-' | '+' | ' '));
    if numeric || !text.starts_with(|c: char| c.is_ascii_digit() || matches!(c, '.' | '-' | '+')) {
        return Err(SessionEnterError::NothingInjected);
    }
    Ok((if text.contains('/') { "flow" } else { "ip" }, text.to_owned()))
}

/// PO2 of each cell in bar.
fn cells(text: &str) -> Result<Vec<f64>, SessionEnterError> {
    let mut groups: Vec<String> = Vec::new();
    for word in text.split(|c: char| c.is_whitespace() || c == ';') {
        let word = word.trim_end_matches(',');
        match groups.last_mut() {
            _ if word.is_empty() => {}
            // A unit belongs to the number before it.
            Some(last) if !begins_reading(word) => {
                last.push(' ');
                last.push_str(word);
            }
            _ => groups.push(word.to_owned()),
        }
    }
    groups.iter().map(|group| cell(group)).collect()
}

fn cell(text: &str) -> Result<f64, SessionEnterError> {
    if matches!(text, "-" | "--" | "\u{2013}") {
        return Ok(f64::NAN);
    }
    let bare = text.chars().all(|c| c.is_ascii_digit() || c == '.');
    // As it was shown to the last bit, as from a column in bar.
    if let (true, Ok(bar)) = (bare, text.parse::<f64>())
        && bar.is_finite()
    {
        return Ok(bar);
    }
    let with_unit = text.ends_with(char::is_alphabetic) || text.contains(' ');
    let written = if with_unit { text.to_owned() } else { format!("{text} bar") };
    value::<AbsolutePressure>(&written).map(AbsolutePressure::as_bar).map_err(SessionEnterError::Po2)
}

/// A time as a session file writes what has elapsed; an RFC 3339 time stays.
fn moment(text: &str) -> Result<String, SessionEnterError> {
    let none = || SessionEnterError::Moment(text.to_owned());
    let text_of = |parts: &[&str]| -> Option<String> {
        let digits = |part: &str| !part.is_empty() && part.bytes().all(|b| b.is_ascii_digit());
        let (minutes, seconds) = match parts {
            [minutes, seconds] => (minutes, seconds),
            _ => return None,
        };
        let (whole, decimals) = seconds.split_once('.').map_or((*seconds, None), |(w, d)| (w, Some(d)));
        let sound = digits(minutes) && digits(whole) && whole.len() == 2 && decimals.is_none_or(digits);
        let (minutes, seconds_whole): (u32, u32) = (minutes.parse().ok()?, whole.parse().ok()?);
        let sound = sound && seconds_whole < 60 && minutes < 6_000;
        sound.then(|| format!("{:02}:{:02}:{seconds}", minutes / 60, minutes % 60))
    };
    if text.contains('T') || text.contains('t') {
        return elapsed_or_time(text).map(|_| text.to_owned()).map_err(|_| none());
    }
    let parts: Vec<&str> = text.split(':').collect();
    let written = match parts.len() {
        1 if text.bytes().all(|b| b.is_ascii_digit() || b == b'.') => format!("{text} s"),
        2 => text_of(&parts).ok_or_else(none)?,
        _ => text.to_owned(),
    };
    elapsed_or_time(&written).map(|_| written).map_err(|_| none())
}

fn begins_time(word: &str) -> bool {
    word.starts_with(|c: char| c.is_ascii_digit())
}

/// Whether a word begins PO2 readings: a number, or the dash for a cell that was not read.
fn begins_reading(text: &str) -> bool {
    let bare = text.trim_start_matches(['+', '-', '\u{2212}', '\u{2013}']);
    let word = bare.split_whitespace().next().unwrap_or("").trim_end_matches([',', ';']);
    let no_number = ["nan", "inf", "infinity"].iter().any(|none| word.eq_ignore_ascii_case(none));
    no_number
        || bare.starts_with(|c: char| c.is_ascii_digit() || c == '.')
        || (bare.len() < text.len() && (bare.is_empty() || bare.starts_with([' ', ',', ';', '\t'])))
}

/// The number of a row and what follows it.
fn numbered<'l>(
    command: &'static str,
    example: &'static str,
    rest: &'l str,
) -> Result<(usize, &'l str), SessionEnterError> {
    let (number, after) = rest.split_once(char::is_whitespace).unwrap_or((rest, ""));
    let plain = !number.is_empty() && number.bytes().all(|b| b.is_ascii_digit());
    match number.parse() {
        Ok(row) if plain && row > 0 => Ok((row, after.trim())),
        _ => Err(SessionEnterError::NoNumber(command, example)),
    }
}

/// The word that is nearly what was typed, ready to be appended.
fn nearest(typed: &str, known: impl Iterator<Item = &'static str>) -> Option<String> {
    let near = known.map(|name| (strsim::osa_distance(typed, name), name)).min()?;
    (near.0 <= 2 && typed.len() <= 24 && typed.len() > 2).then(|| is_meant(near.1))
}

fn is_meant(name: &str) -> String {
    format!(" (is {name} meant?)")
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::entry::Injection;

    #[test]
    fn times_are_those_of_a_watch() {
        for (typed, written) in [
            ("0:00", "00:00:00"),
            ("10:30", "00:10:30"),
            ("75:05", "01:15:05"),
            ("10:30.5", "00:10:30.5"),
            ("1:05:00", "1:05:00"),
            ("630", "630 s"),
            ("0.5", "0.5 s"),
            ("2026-11-20T18:05:00+11:00", "2026-11-20T18:05:00+11:00"),
        ] {
            assert_eq!(moment(typed), Ok(written.to_owned()), "{typed}");
        }
        for bad in
            ["", "10:60", "10:5", "10:", ":30", "-1:00", "1:2:3:4", "10:3o", "6000:00", "2026-11-20T18:05:00"]
        {
            assert_eq!(moment(bad), Err(SessionEnterError::Moment(bad.to_owned())), "{bad}");
        }
    }

    #[test]
    fn cells_are_bar_to_the_last_bit_and_a_dash_is_no_reading() {
        let bits = |text: &str| cells(text).map(|all| all.into_iter().map(f64::to_bits).collect::<Vec<_>>());
        let plain = Ok(vec![0.95_f64.to_bits(), 0.9371_f64.to_bits()]);
        for text in ["0.95 0.9371", "0.95, 0.9371", "0.95; 0.9371", "  0.95\t0.9371"] {
            assert_eq!(bits(text), plain, "{text}");
        }
        let mixed = cells("0.95 bar 937.1 mbar -").unwrap();
        assert!((mixed[0] - 0.95).abs() < 1e-12 && (mixed[1] - 0.9371).abs() < 1e-12 && mixed[2].is_nan());
        assert_eq!(cells("- 0.9").unwrap().len(), 2);
        for bad in ["0,95 0,94", "0.95 nan", "1e999", "-0.5", "0.95 V"] {
            assert!(cells(bad).is_err(), "{bad}");
        }
    }

    #[test]
    fn what_happened_now_is_read_without_a_time() {
        assert_eq!(happened("injection off"), Ok(What::Injection(Injection::Off)));
        assert_eq!(happened("oxygen add"), Ok(What::OxygenAdd(None)));
        let Ok(What::OxygenAdd(Some(metered))) = happened("oxygen add 0.4 L at 25 °C, 101.3 kPa") else {
            panic!("not metered")
        };
        assert!((metered.volume.value.as_l() - 0.4).abs() < 1e-12 && metered.reads_at.is_some());
        for bad in ["oxygen add 0,4 L", "oxygen add soon", "injection", "injection 0.31", "make-up open"] {
            assert!(happened(bad).is_err(), "{bad}");
        }
        assert_eq!(seconds("10:30").map(f64::to_bits), Ok(630.0_f64.to_bits()));
        assert!(seconds("2026-11-20T18:05:00+11:00").is_err() && seconds("soon").is_err());
    }

    #[test]
    fn what_happened_is_written_as_a_file_writes_it() {
        let pairs = |text: &str| {
            let pairs = happening(text).unwrap();
            pairs.iter().map(|(key, text)| format!("{key}={text}")).collect::<Vec<_>>().join("|")
        };
        assert_eq!(pairs("injection off"), "what=injection|off=true");
        assert_eq!(pairs("Injection 0.31 L/min ± 2 mL/min"), "what=injection|flow=0.31 L/min ± 2 mL/min");
        assert_eq!(pairs("injection 9.4 bar"), "what=injection|ip=9.4 bar");
        assert_eq!(pairs("injection ip=9.4 bar"), "what=injection|ip=9.4 bar");
        assert_eq!(pairs("injection 300 sccm"), "what=injection|flow=300 sccm");
        assert_eq!(pairs("oxygen add"), "what=oxygen add");
        let metered = "what=oxygen add|volume=0.4 L|reads_at=25 °C, 101.3 kPa";
        assert_eq!(pairs("oxygen add 0.4 L at 25 °C, 101.3 kPa"), metered);
        assert_eq!(pairs("make-up loop=sealed mark"), "what=make-up|loop=sealed|mark=true");
        assert_eq!(pairs("make-up Held"), "what=make-up|loop=held");
        assert_eq!(pairs("exclude until 12:30"), "what=exclude|until=00:12:30");
        assert_eq!(pairs("stop"), "what=stop");
    }
}
