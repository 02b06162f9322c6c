//! Bytes as they came.

use super::TrialShown;
use crate::entry::Protocol;
use crate::report::layout::counted;

/// Lines of bytes that are shown.
const LINES: usize = 6;
/// Columns of one of them.
const COLUMNS: usize = 74;

/// Bytes as text: printable ASCII as it is, everything else as an escape.
#[must_use]
pub(super) fn escaped(bytes: &[u8]) -> String {
    let mut text = String::with_capacity(bytes.len());
    for byte in bytes {
        match byte {
            // Quotes need no escape where nothing is quoted.
            b'"' | b'\'' => text.push(char::from(*byte)),
            _ => text.extend(std::ascii::escape_default(*byte).map(char::from)),
        }
    }
    text
}

/// Bytes as hexadecimal digits, two a byte.
pub(super) fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().map(|byte| format!("{byte:02x}")).collect::<Vec<_>>().join(" ")
}

/// Bytes as their protocol has them: text, or the digits of frames.
pub(super) fn shown(trial: &TrialShown, bytes: &[u8]) -> String {
    match trial.instrument.protocol {
        Some(Protocol::ModbusRtu { .. }) => hexadecimal(bytes),
        _ => escaped(bytes),
    }
}

pub(super) fn section(trial: &TrialShown) -> String {
    if trial.raw.is_empty() {
        return String::new();
    }
    let mut text = format!("\nWhat came ({}, escaped)\n", counted(trial.bytes, "byte"));
    let mut told = 0;
    for line in lines(trial).into_iter().take(LINES) {
        told += line.len();
        text.push_str(&format!("  {}\n", shown(trial, line)));
    }
    let left = trial.bytes.saturating_sub(told as u64);
    if left > 0 {
        text.push_str(&format!("  … and {} more\n", counted(left, "byte")));
    }
    text
}

/// The bytes in lines no longer than the page is wide.
fn lines(trial: &TrialShown) -> Vec<&[u8]> {
    let raw = trial.raw.as_slice();
    let last = match &trial.instrument.protocol {
        Some(Protocol::ModbusRtu { .. }) => return raw.chunks(16).collect(),
        Some(Protocol::Lines { ends, .. }) => ends.as_bytes().last().copied(),
        None => None,
    };
    // What ends the lines may be just what is wrong.
    let last = [Some(b'\n'), Some(b'\r'), last]
        .into_iter()
        .flatten()
        .find(|last| raw.contains(last))
        .unwrap_or(b'\n');
    raw.split_inclusive(|byte| *byte == last).flat_map(within).collect()
}

/// A line in pieces that fit.
fn within(line: &[u8]) -> Vec<&[u8]> {
    let mut pieces = Vec::new();
    let (mut begins, mut columns) = (0, 0);
    for (place, byte) in line.iter().enumerate() {
        let takes = std::ascii::escape_default(*byte).len();
        if columns + takes > COLUMNS {
            pieces.extend(line.get(begins..place));
            (begins, columns) = (place, 0);
        }
        columns += takes;
    }
    pieces.extend(line.get(begins..).filter(|rest| !rest.is_empty()));
    pieces
}
