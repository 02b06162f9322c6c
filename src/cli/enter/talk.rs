//! Lines in, text out: the two ends of the dialogue, whatever they are connected to.

use std::io::{self, BufRead, Read as _, Write};

/// Longest line that is read, in bytes.
const LONGEST: u64 = 4096;

/// The dialogue's ears and mouth.
pub struct Talk<'a> {
    input: &'a mut dyn BufRead,
    out: &'a mut dyn Write,
    aside: &'a mut dyn Write,
    /// Whether somebody sits there who can be asked.
    pub(super) asks: bool,
    line: u64,
}

impl<'a> Talk<'a> {
    /// Reads from `input`; answers go to `out`, notes to `aside`. `asks` prompts, and asks again after a wrong answer.
    pub fn new(
        input: &'a mut dyn BufRead,
        out: &'a mut dyn Write,
        aside: &'a mut dyn Write,
        asks: bool,
    ) -> Self {
        Self { input, out, aside, asks, line: 0 }
    }

    /// The number of the line that was read last.
    pub(super) const fn line(&self) -> u64 {
        self.line
    }

    /// Says something; it is out when this returns.
    pub(super) fn say(&mut self, text: &str) -> io::Result<()> {
        self.out.write_all(text.as_bytes())?;
        self.out.flush()
    }

    /// Says something only to somebody who sits there.
    pub(super) fn prompt(&mut self, text: &str) -> io::Result<()> {
        if self.asks { self.say(text) } else { Ok(()) }
    }

    /// Says something on the side; nobody may be listening.
    pub(super) fn note(&mut self, text: &str) {
        let _ = writeln!(self.aside, "note: {text}").and_then(|()| self.aside.flush());
    }

    /// The next line without its end; none at the end of the input.
    pub(super) fn hear(&mut self) -> io::Result<Option<Heard>> {
        let mut bytes = Vec::new();
        if (&mut *self.input).take(LONGEST).read_until(b'\n', &mut bytes)? == 0 {
            return Ok(None);
        }
        self.line += 1;
        if bytes.len() as u64 == LONGEST && bytes.last() != Some(&b'\n') {
            self.skip_line()?;
            return Ok(Some(Heard::TooLong));
        }
        // A mark that some editors put before the first line.
        let bytes =
            if self.line == 1 { bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(&bytes) } else { &bytes };
        Ok(Some(match std::str::from_utf8(bytes) {
            Ok(text) => Heard::Line(text.trim_end_matches(['\n', '\r']).to_owned()),
            Err(_) => Heard::NoText,
        }))
    }

    fn skip_line(&mut self) -> io::Result<()> {
        loop {
            let there = self.input.fill_buf()?;
            let (used, ends) = match there.iter().position(|b| *b == b'\n') {
                Some(at) => (at + 1, true),
                None => (there.len(), there.is_empty()),
            };
            self.input.consume(used);
            if ends {
                return Ok(());
            }
        }
    }
}

/// A line as it was heard.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Heard {
    /// Text.
    Line(String),
    /// Bytes that are no UTF-8.
    NoText,
    /// More than anybody types.
    TooLong,
}

impl Heard {
    /// The text, or why there is none.
    pub(super) fn text(self) -> Result<String, &'static str> {
        match self {
            Self::Line(text) => Ok(text),
            Self::NoText => Err("this line is not UTF-8 text"),
            Self::TooLong => Err("this line is longer than anything that can be typed here"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn heard(bytes: &[u8]) -> Vec<Heard> {
        let (mut input, mut out, mut aside) =
            (io::BufReader::with_capacity(16, bytes), Vec::new(), Vec::new());
        let mut talk = Talk::new(&mut input, &mut out, &mut aside, false);
        std::iter::from_fn(|| talk.hear().unwrap()).collect()
    }

    #[test]
    fn lines_end_as_they_like_and_the_last_needs_no_end() {
        let line = |text: &str| Heard::Line(text.to_owned());
        assert_eq!(heard(b"\xEF\xBB\xBFa\r\nb\n\nc"), [line("a"), line("b"), line(""), line("c")]);
        assert_eq!(heard(b""), []);
    }

    #[test]
    fn a_line_without_sense_does_not_swallow_the_next() {
        let mut long = vec![b'x'; 100_000];
        long.extend_from_slice(b"\nnext\n\xFF\xFE\nlast");
        let last = Heard::Line("last".into());
        assert_eq!(heard(&long), [Heard::TooLong, Heard::Line("next".into()), Heard::NoText, last]);
        assert_eq!(heard(&[b'x'; 5000]), [Heard::TooLong]);
    }
}
