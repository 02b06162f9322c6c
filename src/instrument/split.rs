//! Bytes to lines.
//!
//! Takes bytes as they come and the ending of a line, of one byte or several; returns whole lines without it. A line
//! of which the beginning was not heard is no line: joining a stream at "12.5" may show "2.5".

/// Longest line in bytes; an instrument's have some tens.
pub const LONGEST_LINE: usize = 512;

/// What came out of the bytes.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Piece {
    /// A whole line without its ending.
    Line(Vec<u8>),
    /// More bytes than a line has, without an ending; what follows to the next one is dropped.
    TooLong(Vec<u8>),
}

/// Splits a stream into lines.
#[derive(Debug, Clone)]
pub struct Splitter {
    ends: Vec<u8>,
    held: Vec<u8>,
    /// The beginning of the line in progress was not heard.
    joined_late: bool,
    /// The line in progress was given up as too long.
    given_up: bool,
}

impl Splitter {
    /// A splitter that joins a stream anywhere: what comes before the first ending is dropped.
    ///
    /// An empty ending never comes; a profile that was read has none.
    #[must_use]
    pub fn joining(ends: &[u8]) -> Self {
        Self { ends: ends.to_vec(), held: Vec::new(), joined_late: true, given_up: false }
    }

    /// Forgets what is held; the next byte begins a line.
    pub fn begin(&mut self) {
        self.held.clear();
        (self.joined_late, self.given_up) = (false, false);
    }

    /// Forgets what is held; what comes before the next ending is dropped.
    pub fn join(&mut self) {
        self.begin();
        self.joined_late = true;
    }

    /// The beginning of a line that waits for its rest; empty when none does.
    #[must_use]
    pub fn half(&self) -> &[u8] {
        if self.joined_late || self.given_up { &[] } else { &self.held }
    }

    /// Takes one byte.
    pub fn push(&mut self, byte: u8) -> Option<Piece> {
        self.held.push(byte);
        if !self.ends.is_empty() && self.held.ends_with(&self.ends) {
            let whole = !self.joined_late && !self.given_up;
            let mut line = std::mem::take(&mut self.held);
            line.truncate(line.len() - self.ends.len());
            (self.joined_late, self.given_up) = (false, false);
            return whole.then_some(Piece::Line(line));
        }
        if self.held.len() < LONGEST_LINE + self.ends.len() {
            return None;
        }
        // The beginning of an ending may be the last of what is held.
        let keep = self.held.len() - self.ends.len().saturating_sub(1);
        let rest = self.held.split_off(keep);
        let long = std::mem::replace(&mut self.held, rest);
        let first_time = !self.given_up;
        self.given_up = true;
        first_time.then_some(Piece::TooLong(long))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn all(splitter: &mut Splitter, bytes: &[u8]) -> Vec<Piece> {
        bytes.iter().filter_map(|byte| splitter.push(*byte)).collect()
    }

    fn line(text: &str) -> Piece {
        Piece::Line(text.as_bytes().to_vec())
    }

    #[test]
    fn half_a_line_waits_for_the_rest() {
        let mut splitter = Splitter::joining(b"\r\n");
        splitter.begin();
        assert!(all(&mut splitter, b"0.5").is_empty());
        assert_eq!(splitter.half(), b"0.5");
        assert_eq!(all(&mut splitter, b"12\r\n0.513\r"), [line("0.512")]);
        assert_eq!(all(&mut splitter, b"\n\r\n"), [line("0.513"), line("")]);
        assert!(splitter.half().is_empty());
    }

    #[test]
    fn a_line_joined_in_its_middle_is_dropped() {
        let mut splitter = Splitter::joining(b"\n");
        assert_eq!(all(&mut splitter, b"2.5\n12.5\n"), [line("12.5")]);
        all(&mut splitter, b"13.");
        splitter.join();
        assert!(splitter.half().is_empty());
        assert_eq!(all(&mut splitter, b"5\n14.5\n"), [line("14.5")]);
    }

    #[test]
    fn an_ending_of_several_bytes_is_found_after_its_own_beginning() {
        let mut splitter = Splitter::joining(b"\r\r\n");
        splitter.begin();
        assert_eq!(all(&mut splitter, b"1\r2\r\r\r\n3\r\r\n"), [line("1\r2\r"), line("3")]);
    }

    #[test]
    fn a_line_without_an_end_is_given_up_once_and_the_next_is_found() {
        for joined_late in [false, true] {
            let mut splitter = Splitter::joining(b"\r\n");
            if !joined_late {
                splitter.begin();
            }
            let pieces = all(&mut splitter, &[b'x'; 5_000]);
            assert!(matches!(pieces.as_slice(), [Piece::TooLong(long)] if long.len() >= LONGEST_LINE));
            assert_eq!(all(&mut splitter, b"\r\n0.512\r\n"), [line("0.512")]);
        }
    }

    #[test]
    fn the_longest_line_is_still_one() {
        let mut splitter = Splitter::joining(b"\r\n");
        splitter.begin();
        let longest = [b'7'; LONGEST_LINE - 1];
        assert!(all(&mut splitter, &longest).is_empty());
        assert_eq!(all(&mut splitter, b"\r\n"), [Piece::Line(longest.to_vec())]);
    }
}
