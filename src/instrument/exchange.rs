//! One turn of a conversation on an open line.

use std::io;

use super::conversation::{Conversation, Found};
use super::line::{Line, nothing_yet};
use crate::clock::Ticks;

/// Longest wait in seconds, so that a thread that is told to stop does.
pub(super) const LONGEST_WAIT_S: f64 = 0.1;
/// Seconds a question may take to leave.
const SEND_S: f64 = 1.0;

/// What one turn brought.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct Turn {
    /// When it ended, which is when its bytes arrived.
    pub(super) at_s: f64,
    /// The bytes.
    pub(super) bytes: Vec<u8>,
    /// What was found in them, and in the silence.
    pub(super) found: Vec<Found>,
}

/// Sends what is due, waits for bytes, and hands them on.
///
/// # Errors
/// The line is lost; `UnexpectedEof` when its other end was closed.
pub(super) fn turn(
    line: &mut dyn Line,
    conversation: &mut dyn Conversation,
    ticks: &dyn Ticks,
    longest_s: f64,
) -> io::Result<Turn> {
    let mut found = Vec::new();
    if let Some(ask) = conversation.turn(ticks.now_s(), &mut found) {
        line.wait_at_most(SEND_S)?;
        line.write_all(&ask)?;
    }
    let mut buffer = [0_u8; 1024];
    let wait_s = (conversation.wake_s() - ticks.now_s()).min(longest_s).max(0.0);
    line.wait_at_most(wait_s)?;
    let read = match line.read(&mut buffer) {
        Ok(0) => return Err(io::ErrorKind::UnexpectedEof.into()),
        Ok(read) => read,
        Err(error) if nothing_yet(&error) => 0,
        Err(error) => return Err(error),
    };
    let at_s = ticks.now_s();
    let bytes = buffer.get(..read).unwrap_or_default().to_vec();
    if !bytes.is_empty() {
        conversation.heard(at_s, &bytes, &mut found);
    }
    Ok(Turn { at_s, bytes, found })
}
