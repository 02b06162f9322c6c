//! Settings under which what was heard makes sense, where the profile's own do not.
//!
//! Takes bytes and a profile, returns changed profiles, each tried on the very bytes. Pure: opening the port at other
//! speeds is [`super::try_out`]'s. A proposal is a proposal: which of several numbers in a line is the one meant, a
//! person decides.

use regex::Regex;

use super::fault::{Fault, FaultKind};
use super::reading::{Reading, kinds, known};
use super::split::{Piece, Splitter};
use super::text_line::{LineReader, text_of, without_echo};
use crate::entry::{Instrument, ModbusTable, Protocol, WordOrder};
use crate::quantity::QuantityError;

/// A key of a profile with another value than it has.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Change {
    /// `baud`.
    Baud {
        /// As it is.
        from: u32,
        /// As it parses.
        to: u32,
    },
    /// `frame`.
    Frame {
        /// As it is.
        from: String,
        /// As it parses.
        to: String,
    },
    /// `ends`.
    Ends {
        /// As it is.
        from: String,
        /// As it parses.
        to: String,
    },
    /// `pattern`.
    Pattern {
        /// As it is.
        from: String,
        /// As it parses.
        to: String,
    },
    /// `unit`.
    Unit {
        /// As it is.
        from: Option<String>,
        /// As it parses.
        to: String,
    },
    /// `table`.
    Table {
        /// As it is.
        from: ModbusTable,
        /// As it parses.
        to: ModbusTable,
    },
    /// `word_order`.
    WordOrder {
        /// As it is.
        from: WordOrder,
        /// As it parses.
        to: WordOrder,
    },
}

/// A changed profile under which what was heard parses.
#[derive(Debug, Clone, PartialEq)]
pub struct Proposal {
    /// What is changed.
    pub changes: Vec<Change>,
    /// The profile with the changes.
    pub instrument: Instrument,
    /// The readings it gives.
    pub readings: Vec<Reading>,
    /// The faults that are left.
    pub faults: usize,
}

/// Proposals that are shown; more than these are guesses.
const MOST: usize = 4;
/// Readings that make a fit: one may be chance.
const FEWEST: usize = 2;
/// A number as instruments write it.
const NUMBER: &str = r"[-+]?(?:\d+\.?\d*|\.\d+)(?:[eE][-+]?\d+)?";
/// Endings of lines that instruments use.
const ENDINGS: [&str; 7] = ["\r\n", "\n", "\r", "\n\r", ";", "\u{3}", "\0"];

/// What bytes are under a profile.
pub(super) struct Tried {
    /// The readings.
    pub(super) readings: Vec<Reading>,
    /// The faults.
    pub(super) faults: Vec<Fault>,
    lines: Vec<Vec<u8>>,
}

impl Tried {
    /// Whether it is as it should be: two readings, and at most one fault to four of them.
    pub(super) fn fits(&self) -> bool {
        self.readings.len() >= FEWEST && 4 * self.faults.len() <= self.readings.len()
    }

    fn mostly(&self, kinds: &[FaultKind]) -> bool {
        let of_them = self.faults.iter().filter(|fault| kinds.contains(&fault.kind)).count();
        of_them >= FEWEST && 2 * of_them > self.faults.len() + self.readings.len()
    }
}

/// What was heard, as the profile takes it; none for a profile that reads no lines, or whose pattern does not compile.
pub(super) fn tried(raw: &[u8], instrument: &Instrument) -> Option<Tried> {
    let Some(Protocol::Lines { ask, ends, pattern, .. }) = &instrument.protocol else { return None };
    let reader = LineReader::new(instrument, pattern).ok()?;
    let mut splitter = Splitter::joining(ends.as_bytes());
    if ask.is_some() {
        splitter.begin();
    }
    let mut result = Tried { readings: Vec::new(), faults: Vec::new(), lines: Vec::new() };
    for piece in raw.iter().filter_map(|byte| splitter.push(*byte)) {
        let read = match piece {
            Piece::TooLong(long) => Err(Fault::new(FaultKind::TooLong, &long)),
            Piece::Line(line) => {
                let said = without_echo(&line, ask.as_deref().unwrap_or_default().as_bytes());
                match (ask, said) {
                    (Some(_), None) => continue,
                    (Some(_), Some(said)) => {
                        result.lines.push(said.to_vec());
                        reader.read(said)
                    }
                    (None, _) => {
                        result.lines.push(line.clone());
                        reader.read(&line)
                    }
                }
            }
        };
        match read {
            Ok(reading) => result.readings.push(reading),
            Err(fault) => result.faults.push(fault),
        }
    }
    Some(result)
}

/// Profiles for text lines under which these bytes parse, those with the fewest changes; empty when the profile as it is
/// does well and the lines say no other unit.
#[must_use]
pub fn fitting_text(raw: &[u8], instrument: &Instrument) -> Vec<Proposal> {
    let Some(Protocol::Lines { ends, pattern, .. }) = &instrument.protocol else { return Vec::new() };
    let mut proposals = Vec::new();
    let others = ENDINGS.iter().copied().filter(|other| other != ends && times(raw, other) >= FEWEST);
    for other in std::iter::once(ends.as_str()).chain(others) {
        let mut changes = Vec::new();
        let mut changed = instrument.clone();
        if other != ends {
            changes.push(Change::Ends { from: ends.clone(), to: other.to_owned() });
            set_lines(&mut changed, Some(other), None);
        }
        let Some(as_it_is) = tried(raw, &changed) else { continue };
        let before = proposals.len();
        units(raw, &as_it_is, &changed, &changes, &mut proposals);
        if as_it_is.fits() {
            if other == ends {
                return best(proposals);
            }
            proposals.push(proposal(changes, changed, &as_it_is));
            continue;
        }
        if proposals.len() > before {
            continue;
        }
        for (other_pattern, other_unit) in patterns(&as_it_is.lines, &changed) {
            let mut changes = changes.clone();
            let mut changed = changed.clone();
            changes.push(Change::Pattern { from: pattern.clone(), to: other_pattern.clone() });
            set_lines(&mut changed, None, Some(&other_pattern));
            if let Some(to) = other_unit.filter(|to| Some(to) != changed.unit.as_ref()) {
                changes.push(Change::Unit { from: changed.unit.replace(to.clone()), to });
            }
            let Some(as_it_is) = tried(raw, &changed) else { continue };
            if as_it_is.fits() {
                proposals.push(proposal(changes, changed, &as_it_is));
            } else {
                units(raw, &as_it_is, &changed, &changes, &mut proposals);
            }
        }
    }
    best(proposals)
}

/// Those with the fewest changes, readings within the papers' range first, each once.
fn best(mut proposals: Vec<Proposal>) -> Vec<Proposal> {
    let fewest = proposals.iter().map(|one| one.changes.len()).min();
    proposals.retain(|one| Some(one.changes.len()) == fewest);
    proposals.sort_by_key(|one| {
        let scale = super::reading::Scale::of(&one.instrument).ok();
        let outside = |reading: &&Reading| {
            scale.as_ref().is_some_and(|scale| scale.within_range(reading) == Some(false))
        };
        one.readings.iter().filter(outside).count()
    });
    let mut seen: Vec<Proposal> = Vec::new();
    for one in proposals {
        if !seen.iter().any(|other| other.changes == one.changes) {
            seen.push(one);
        }
    }
    seen.truncate(MOST);
    seen
}

fn proposal(changes: Vec<Change>, instrument: Instrument, tried: &Tried) -> Proposal {
    Proposal { changes, instrument, readings: tried.readings.clone(), faults: tried.faults.len() }
}

fn set_lines(instrument: &mut Instrument, to_ends: Option<&str>, to_pattern: Option<&str>) {
    if let Some(Protocol::Lines { ends, pattern, .. }) = &mut instrument.protocol {
        if let Some(to) = to_ends {
            to.clone_into(ends);
        }
        if let Some(to) = to_pattern {
            to.clone_into(pattern);
        }
    }
}

fn times(raw: &[u8], ends: &str) -> usize {
    raw.windows(ends.len()).filter(|window| *window == ends.as_bytes()).count()
}

/// Other units for a profile whose lines say none: the one that stands behind the number all the same; else, where the
/// values are out of all range, each that brings all of them within it.
fn units(
    raw: &[u8],
    tried_so: &Tried,
    instrument: &Instrument,
    changes: &[Change],
    into: &mut Vec<Proposal>,
) {
    let Some(Protocol::Lines { pattern, .. }) = &instrument.protocol else { return };
    let Ok(reader) = LineReader::new(instrument, pattern) else { return };
    if reader.reads_units() {
        return;
    }
    let mut with = |to: &str, must_be_within: bool| {
        let mut changed = instrument.clone();
        let from = changed.unit.replace(to.to_owned());
        let Some(so) = tried(raw, &changed) else { return };
        let within = |reading: &Reading| reader.scale().within_range(reading) != Some(false);
        if so.fits() && (!must_be_within || so.readings.iter().all(within)) {
            let mut changes = changes.to_vec();
            changes.push(Change::Unit { from, to: to.to_owned() });
            into.push(proposal(changes, changed, &so));
        }
    };
    let said = |line: &Vec<u8>| {
        let text = text_of(line)?;
        let behind = reader.behind_number(&text)?;
        plain_unit(instrument, first_word(behind)?)
    };
    let mut all_said = tried_so.lines.iter().filter_map(said);
    if let Some(first) = all_said.next() {
        let one_voice = all_said.all(|other| other == first);
        if one_voice && reader.scale().unit().map(|unit| unit.symbol) != Some(first) {
            with(first, false);
        }
        return;
    }
    let no_unit = reader.scale().unit().is_none();
    if no_unit || tried_so.mostly(&[FaultKind::OutOfRange, FaultKind::Impossible]) {
        let mut factors = Vec::new();
        for unit in kinds(instrument.measures).iter().flat_map(|kind| kind.units()) {
            let scale = (unit.factor.to_bits(), unit.offset.to_bits());
            if !factors.contains(&scale) {
                factors.push(scale);
                with(unit.symbol, true);
            }
        }
    }
}

/// The word directly behind a number, if it begins as a unit does.
fn first_word(behind: &str) -> Option<&str> {
    let behind = behind.trim_start_matches([' ', '\t']);
    let ends = |c: char| c.is_whitespace() || ",;:=".contains(c) || c.is_control();
    let word = behind.split(ends).next()?;
    word.starts_with(|c: char| c.is_alphabetic() || "°º%".contains(c)).then_some(word)
}

/// The symbol of the unit a word means for this instrument, marks of reference conditions and of gauge taken off; what
/// these mean stands in the papers, not in the unit.
fn plain_unit(instrument: &Instrument, word: &str) -> Option<&'static str> {
    match known(instrument.measures, word) {
        Ok(unit) => Some(unit.symbol),
        Err(QuantityError::UnstatedReference { .. }) => {
            let lower = word.to_lowercase();
            let marks = ["standard", "normal", "std", "s", "n"];
            let bare = marks.iter().filter_map(|mark| lower.strip_prefix(mark)).map(str::to_owned);
            // "slm" and "ln/min" are written without the stroke, and with a mark behind.
            bare.chain([lower.replacen("ln/", "l/", 1), lower.replace("slm", "lpm").replace("nlm", "lpm")])
                .find_map(|bare| known(instrument.measures, &bare).ok())
                .map(|unit| unit.symbol)
        }
        Err(_) => None,
    }
}

/// Patterns for the lines as they look, each with the unit it needs in the profile when it reads none itself.
fn patterns(lines: &[Vec<u8>], instrument: &Instrument) -> Vec<(String, Option<String>)> {
    let texts: Vec<_> = lines.iter().filter_map(|line| text_of(line)).collect();
    let Some(typical) = typical(&texts) else { return Vec::new() };
    let Ok(number) = Regex::new(NUMBER) else { return Vec::new() };
    let (mut with_unit, mut marked, mut bare) = (Vec::new(), Vec::new(), Vec::new());
    for (column, found) in number.find_iter(typical).enumerate() {
        let before = typical.get(..found.start()).unwrap_or("");
        let word = first_word(typical.get(found.end()..).unwrap_or(""));
        let label = label(before);
        let value = format!("{}(?P<value>{NUMBER})", lead(&label, before, column));
        let unit = word.and_then(|word| Some((word, plain_unit(instrument, word)?)));
        match unit {
            Some((word, _)) if known(instrument.measures, word).is_ok() => {
                let unit = regex::escape(word);
                with_unit.push((format!(r"{value}\s*(?P<unit>{unit})"), None));
            }
            Some((word, plain)) => {
                marked.push((format!(r"{value}\s*{}", regex::escape(word)), Some(plain.to_owned())));
            }
            None => bare.push((value, instrument.unit.clone())),
        }
    }
    // Where a number says that it is of the kind asked for, one that does not is another.
    match (with_unit.is_empty(), marked.is_empty()) {
        (false, _) => with_unit,
        (true, false) => marked,
        (true, true) => bare,
    }
}

/// The line whose shape, its digits aside, is the most frequent.
fn typical<'t>(texts: &'t [std::borrow::Cow<'_, str>]) -> Option<&'t str> {
    let shape = |text: &str| -> String {
        let mut shape: String = text.chars().map(|c| if c.is_ascii_digit() { '0' } else { c }).collect();
        while shape.contains("00") {
            shape = shape.replace("00", "0");
        }
        shape
    };
    let shapes: Vec<String> = texts.iter().map(|text| shape(text)).collect();
    let times = |wanted: &String| shapes.iter().filter(|shape| *shape == wanted).count();
    let with_digits =
        texts.iter().zip(&shapes).filter(|(text, _)| text.contains(|c: char| c.is_ascii_digit()));
    let most = with_digits.rev().max_by_key(|(_, shape)| times(shape));
    most.map(|(text, _)| text.as_ref())
}

/// The letters and signs directly before a number.
fn label(before: &str) -> String {
    let parts = |c: char| c.is_whitespace() || ",;".contains(c) || c.is_control();
    let trimmed = before.trim_end_matches([' ', '\t']);
    trimmed.rsplit(parts).next().unwrap_or("").to_owned()
}

/// What has to stand before the number: its label where it has one, else as many columns as there are before it.
fn lead(label: &str, before: &str, column: usize) -> String {
    if label.contains(|c: char| c.is_alphabetic()) {
        // The label must not be the end of another: "P" is not "IP".
        return format!(r"(?:^|[\s,;]){}\s*", regex::escape(label));
    }
    if column == 0 {
        return String::new();
    }
    let separator = before.trim_end().chars().next_back().filter(|c| ",;".contains(*c));
    match separator {
        Some(c) => format!(r"^(?:[^{c}]*{c}){{{}}}\s*", before.matches(c).count()),
        None => format!(r"^\s*(?:\S+\s+){{{}}}", before.split_whitespace().count()),
    }
}
