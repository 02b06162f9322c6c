//! Instruments that send lines by themselves; several may read their numbers out of one stream.

use super::conversation::{Conversation, DEFAULT_STALE_S, Found};
use super::fault::{Fault, FaultKind};
use super::split::{Piece, Splitter};
use super::text_line::LineReader;

/// Seconds in the middle of a line after which its rest does not come: more than any instrument pauses in a line
/// (common practice, no source).
pub(super) const HALF_LINE_S: f64 = 0.5;

/// A stream and those who read it.
#[derive(Debug)]
pub struct Streamed {
    splitter: Splitter,
    readers: Vec<Reader>,
    last_byte_s: f64,
}

#[derive(Debug)]
struct Reader {
    reader: LineReader,
    stale_after_s: f64,
    /// When something was last heard of it, or its silence last said.
    last_s: f64,
}

impl Streamed {
    /// A stream with this ending of a line, its readers, and the age in seconds from which the readings of each are
    /// stale.
    #[must_use]
    pub fn new(ends: &[u8], readers: Vec<(LineReader, Option<f64>)>) -> Self {
        let readers = readers.into_iter().map(|(reader, stale_after_s)| Reader {
            reader,
            stale_after_s: stale_after_s.unwrap_or(DEFAULT_STALE_S),
            last_s: 0.0,
        });
        Self { splitter: Splitter::joining(ends), readers: readers.collect(), last_byte_s: 0.0 }
    }

    fn all(&mut self, now_s: f64, fault: &Fault, found: &mut Vec<Found>) {
        for (member, reader) in self.readers.iter_mut().enumerate() {
            reader.last_s = now_s;
            found.push(Found { member, what: Err(fault.clone()) });
        }
    }
}

/// What each reader takes from a line. A line that is somebody's is no fault of the others whom it does not match.
pub(super) fn shared<'r>(
    line: &[u8],
    readers: impl Iterator<Item = (usize, &'r LineReader)>,
    found: &mut Vec<Found>,
) {
    let first = found.len();
    found.extend(readers.map(|(member, reader)| Found { member, what: reader.read(line) }));
    let strange = |one: &Found| matches!(&one.what, Err(Fault { kind: FaultKind::NoMatch, .. }));
    if found.get(first..).is_some_and(|new| !new.iter().all(strange)) {
        let mut at = 0;
        found.retain(|one| {
            at += 1;
            at <= first || !strange(one)
        });
    }
}

impl Conversation for Streamed {
    fn opened(&mut self, now_s: f64) {
        self.splitter.join();
        self.last_byte_s = now_s;
        for reader in &mut self.readers {
            reader.last_s = now_s;
        }
    }

    fn heard(&mut self, now_s: f64, bytes: &[u8], found: &mut Vec<Found>) {
        self.last_byte_s = now_s;
        for byte in bytes {
            match self.splitter.push(*byte) {
                None => {}
                Some(Piece::TooLong(long)) => self.all(now_s, &Fault::new(FaultKind::TooLong, &long), found),
                Some(Piece::Line(line)) => {
                    let first = found.len();
                    shared(&line, self.readers.iter().map(|one| &one.reader).enumerate(), found);
                    for one in found.iter().skip(first) {
                        if let Some(reader) = self.readers.get_mut(one.member) {
                            reader.last_s = now_s;
                        }
                    }
                }
            }
        }
    }

    fn turn(&mut self, now_s: f64, found: &mut Vec<Found>) -> Option<Vec<u8>> {
        if !self.splitter.half().is_empty() && now_s >= self.last_byte_s + HALF_LINE_S {
            let fault = Fault::new(FaultKind::HalfLine, self.splitter.half());
            self.all(now_s, &fault, found);
            // Whether the next byte begins a line or ends this one, nobody knows.
            self.splitter.join();
        }
        for (member, reader) in self.readers.iter_mut().enumerate() {
            if now_s >= reader.last_s + reader.stale_after_s {
                reader.last_s = now_s;
                found.push(Found { member, what: Err(Fault::new(FaultKind::Silence, &[])) });
            }
        }
        None
    }

    fn wake_s(&self) -> f64 {
        let half =
            if self.splitter.half().is_empty() { f64::INFINITY } else { self.last_byte_s + HALF_LINE_S };
        self.readers.iter().map(|reader| reader.last_s + reader.stale_after_s).fold(half, f64::min)
    }
}
