//! What trying out an instrument brought: the bytes, the readings, the faults, and what would do better.
//!
//! Comes in: a trial as plain data. Goes out: text and JSON. What a device sent is data: bytes that are no printable
//! ASCII are written as escapes, so that no line can steer a terminal. Left out: the listening and the trying of other
//! settings (`instrument`), and the decision which of several proposals is the right one.

mod changes;
mod document;
mod faults;
mod raw;

use crate::entry::{Instrument, InstrumentPapers, Measures, MeterKind, Protocol, Socket};
use crate::quantity::Kind;
use crate::quantity::show::to_text;

use super::Units;
use super::layout::{counted, table, wrapped};
use super::number::{fixed, shortest};
use super::typed::tame;

pub use changes::{ChangeShown, ProposalShown};
pub use document::json;
pub use faults::{FaultShown, TrialFault};

/// Readings that are shown.
const SHOWN: usize = 8;
/// Significant figures of a reading: more than any instrument shows.
const FIGURES: i32 = 8;

/// Where the profile is from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum ProfileFrom {
    /// The register, of the book that was named if one was.
    Register(Option<String>),
    /// A file.
    File(String),
}

/// A reading of a trial.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TrialReading {
    /// Seconds since the trial began.
    pub at_s: f64,
    /// The number as it was shown.
    pub shown: f64,
    /// Symbol of the unit it was shown in.
    pub unit: &'static str,
    /// The value in SI, and its kind where that is known.
    pub si: f64,
    /// The kind of its quantity.
    pub kind: Option<Kind>,
}

/// A trial.
#[derive(Debug, Clone, PartialEq)]
pub struct TrialShown {
    /// The profile as it is.
    pub instrument: Instrument,
    /// Where that is from.
    pub from: ProfileFrom,
    /// Bits per second the port was set to.
    pub baud: u32,
    /// Its frame.
    pub frame: String,
    /// Seconds that were listened.
    pub listened_s: f64,
    /// All bytes heard.
    pub bytes: u64,
    /// The first of them.
    pub raw: Vec<u8>,
    /// The readings, in order.
    pub readings: Vec<TrialReading>,
    /// Readings a second; none before two at different seconds.
    pub rate_per_s: Option<f64>,
    /// Readings outside the range of the papers.
    pub outside_range: usize,
    /// The faults by kind, in the order in which the kinds were first seen.
    pub faults: Vec<FaultShown>,
    /// Why the port was lost on the way, if it was.
    pub lost: Option<String>,
    /// Settings under which what was heard makes more sense, each tried.
    pub proposals: Vec<ProposalShown>,
}

impl TrialShown {
    /// Faults of all kinds.
    #[must_use]
    pub fn fault_count(&self) -> usize {
        self.faults.iter().map(|fault| fault.times).sum()
    }

    /// Whether readings came, no fault among them, and nothing in what was heard speaks against the profile.
    #[must_use]
    pub fn reads_well(&self) -> bool {
        !self.readings.is_empty()
            && self.faults.is_empty()
            && self.lost.is_none()
            && self.proposals.is_empty()
    }

    /// The least and the greatest reading by value.
    fn extremes(&self) -> Option<(TrialReading, TrialReading)> {
        let by_value = |a: &&TrialReading, b: &&TrialReading| a.si.total_cmp(&b.si);
        let low = self.readings.iter().min_by(by_value)?;
        let high = self.readings.iter().max_by(by_value)?;
        Some((*low, *high))
    }
}

/// The trial in one sentence.
#[must_use]
pub fn summary(trial: &TrialShown) -> String {
    let id = trial.instrument.id.as_str();
    let (readings, faults) = (trial.readings.len() as u64, trial.fault_count() as u64);
    let listened = format!("{} s", fixed(trial.listened_s, 1));
    let came = counted(readings, "reading");
    let rate = trial.rate_per_s.map_or_else(String::new, |rate| format!(" ({} a second)", shortest(rate, 3)));
    let begins = match (readings, trial.bytes) {
        (0, 0) => format!("{id} said nothing in {listened}"),
        (0, bytes) => {
            format!("{id} gives no reading: {} in {listened}, none of them readable", counted(bytes, "byte"))
        }
        _ if faults == 0 => format!("{id} reads: {came}{rate} and no fault in {listened}"),
        _ => format!("{id} reads with faults: {came}{rate} and {} in {listened}", counted(faults, "fault")),
    };
    let mut text = begins;
    if readings > 0 && faults == 0 && !trial.proposals.is_empty() {
        text.push_str(", but its lines say something else than the profile");
    }
    if let Some(why) = &trial.lost {
        text.push_str(&format!("; then {}", tame(why)));
    }
    text
}

/// The trial for a person.
#[must_use]
pub fn text(trial: &TrialShown, units: &Units) -> String {
    let instrument = &trial.instrument;
    let port = match &instrument.socket {
        Some(Socket::Port(name)) => tame(name),
        Some(Socket::Usb(identity)) => format!("USB {}", tame(identity)),
        None => "no port".to_owned(),
    };
    let mut text = wrapped("", "  ", &summary(trial));
    text.push_str(&format!("  {}, {port} at {} {}\n", instrument.measures.name(), trial.baud, trial.frame));
    text.push_str(&raw::section(trial));
    text.push_str(&readings(trial, units));
    text.push_str(&faults::section(trial));
    text.push_str(&changes::section(trial));
    if let Some(help) = help(trial) {
        text.push('\n');
        text.push_str(&wrapped("", "  ", &help));
    }
    text
}

/// The first readings and the last, and between which they lie.
fn readings(trial: &TrialShown, units: &Units) -> String {
    let Some((low, high)) = trial.extremes() else { return String::new() };
    // The unit asked for stands beside the instrument's own, which is what its display shows.
    let also = |reading: &TrialReading| {
        let kind = reading.kind?;
        let unit = units.unit(kind);
        (unit != kind.default_unit() && unit.symbol != reading.unit)
            .then(|| (unit.from_si(reading.si), unit.symbol))
    };
    let count = trial.readings.len();
    let wanted = |place: usize| count <= SHOWN || place + 1 < SHOWN || place + 1 == count;
    let rows: Vec<Vec<String>> = trial
        .readings
        .iter()
        .enumerate()
        .filter(|(place, _)| wanted(*place))
        .map(|(_, reading)| {
            let mut row = vec![
                fixed(reading.at_s, 2),
                format!("{} {}", shortest(reading.shown, FIGURES), reading.unit),
            ];
            if let Some((value, symbol)) = also(reading) {
                row.push(format!("{} {symbol}", shortest(value, 6)));
            }
            row
        })
        .collect();
    let mut text = String::from("\nReadings");
    if count > SHOWN {
        text.push_str(&format!(" (the first {} of {count}, and the last)", SHOWN - 1));
    }
    text.push('\n');
    let wide = rows.iter().map(Vec::len).max().unwrap_or(2);
    let heads: &[&str] = if wide > 2 { &["at", "it shows", "that is"] } else { &["at", "it shows"] };
    let under: &[&str] = if wide > 2 { &["s", "", ""] } else { &["s", ""] };
    text.push_str(&table(heads, under, &rows, false));
    let between = format!(
        "between {} {} and {} {}; {}. No uncertainty is worked out here.",
        shortest(low.shown, FIGURES),
        low.unit,
        shortest(high.shown, FIGURES),
        high.unit,
        meaning(&trial.instrument)
    );
    text.push_str(&wrapped("  ", "  ", &between));
    if trial.outside_range > 0 {
        let outside = format!(
            "{} outside the range of the papers: check the unit, and the instrument",
            match trial.outside_range {
                1 => "1 reading lies".to_owned(),
                several => format!("{several} readings lie"),
            }
        );
        text.push_str(&wrapped("  ", "  ", &outside));
    }
    text
}

/// What the numbers are, of the instrument's kind.
fn meaning(instrument: &Instrument) -> String {
    match (instrument.measures, &instrument.papers) {
        (Measures::Flow, Some(InstrumentPapers::Meter(meter))) => match &meter.kind {
            MeterKind::Mass { reads_at, .. } => format!(
                "the meter's own litres ({}, {}), not STPD",
                to_text(reads_at.temperature),
                to_text(reads_at.pressure)
            ),
            _ => "the meter's own litres, not STPD".to_owned(),
        },
        (Measures::Flow, _) => {
            "the meter's own litres, whose reference conditions its papers must say".to_owned()
        }
        (Measures::Pressure, _) => "gauge pressure".to_owned(),
        (Measures::Barometer, _) => "absolute pressure".to_owned(),
        (Measures::Cell, _) => "a cell's signal, or the PO2 that a box shows".to_owned(),
        (Measures::Temperature, _) => "temperature".to_owned(),
        (Measures::Depth, _) => "depth".to_owned(),
    }
}

/// What to look at where nothing that was tried helps.
fn help(trial: &TrialShown) -> Option<String> {
    if !trial.readings.is_empty() || !trial.proposals.is_empty() || trial.lost.is_some() {
        return None;
    }
    let silent = trial.bytes == 0;
    Some(match (&trial.instrument.protocol, silent) {
        (Some(Protocol::ModbusRtu { device, .. }), true) => format!(
            "No answer came at any usual speed and frame: check cable and power, whether the two wires of the bus are \
             swapped, and that the device's address is {device} (--protocol-device)."
        ),
        (Some(Protocol::Lines { ask: Some(ask), .. }), true) => format!(
            "No answer came at any usual speed and frame: check cable and power, and that the instrument answers to \
             {} (--protocol-ask).",
            raw::escaped(ask.as_bytes())
        ),
        (_, true) => "Not one byte came: check cable and power, and whether the instrument sends by itself; one that \
                      has to be asked needs --protocol-ask."
            .to_owned(),
        (Some(Protocol::ModbusRtu { .. }), false) => {
            "Bytes came, and nothing that was tried makes readings of them: compare the register, its type and the \
             device's address with the instrument's manual."
                .to_owned()
        }
        (_, false) => "Bytes came, and no usual speed, frame, ending, pattern or unit makes readings of them: compare the \
                       lines above with the pattern, and the speed with the instrument's manual."
            .to_owned(),
    })
}

#[cfg(test)]
mod tests;
