//! The objects of PDF: numbers, names, strings, arrays, dictionaries (ISO 32000-1, 7.2 and 7.3).
//!
//! Comes in: bytes and a place in them. Goes out: an object, and the place behind it. How many parts an object has and
//! how deep they lie is bounded by the caller's [`Allowance`].

use super::ReadError;

/// Deepest nesting of arrays and dictionaries.
const DEEPEST: usize = 24;

/// An object.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Object {
    Null,
    Boolean,
    Integer(i64),
    /// Read past: nothing here needs its value.
    Real,
    Name(Vec<u8>),
    String(Vec<u8>),
    Array(Vec<Object>),
    Dictionary(Dictionary),
    /// To an object by its number; the generation is read past.
    Reference(u32),
}

/// A dictionary. Of two entries with one key the first counts.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Dictionary(Vec<(Vec<u8>, Object)>);

impl Dictionary {
    pub(super) fn get(&self, key: &str) -> Option<&Object> {
        self.0.iter().find(|(k, _)| k == key.as_bytes()).map(|(_, value)| value)
    }
}

impl Object {
    pub(super) fn into_dictionary(self, what: &'static str) -> Result<Dictionary, ReadError> {
        match self {
            Self::Dictionary(dictionary) => Ok(dictionary),
            _ => Err(ReadError::Missing(what)),
        }
    }

    pub(super) fn into_array(self, what: &'static str) -> Result<Vec<Self>, ReadError> {
        match self {
            Self::Array(array) => Ok(array),
            _ => Err(ReadError::Missing(what)),
        }
    }
}

/// How many objects may still be read.
#[derive(Debug)]
pub(super) struct Allowance(pub usize);

impl Allowance {
    pub(super) fn take(&mut self) -> Result<(), ReadError> {
        self.0 = self.0.checked_sub(1).ok_or(ReadError::TooMany("objects"))?;
        Ok(())
    }
}

/// A place in bytes.
#[derive(Debug, Clone, Copy)]
pub(super) struct Cursor<'b> {
    pub bytes: &'b [u8],
    pub at: usize,
}

impl<'b> Cursor<'b> {
    pub(super) fn new(bytes: &'b [u8], at: usize) -> Self {
        Self { bytes, at }
    }

    pub(super) fn damaged(&self, what: &'static str) -> ReadError {
        ReadError::Damaged { what, at: self.at.min(self.bytes.len()) }
    }

    pub(super) fn peek(&self) -> Option<u8> {
        self.bytes.get(self.at).copied()
    }

    fn next(&mut self) -> Option<u8> {
        let byte = self.peek()?;
        self.at += 1;
        Some(byte)
    }

    pub(super) fn rest(&self) -> &'b [u8] {
        self.bytes.get(self.at..).unwrap_or_default()
    }

    /// Passes over white space and comments.
    pub(super) fn skip_space(&mut self) {
        while let Some(byte) = self.peek() {
            if byte == b'%' {
                while self.peek().is_some_and(|b| !matches!(b, b'\r' | b'\n')) {
                    self.at += 1;
                }
            } else if is_space(byte) {
                self.at += 1;
            } else {
                break;
            }
        }
    }

    /// Whether a word comes next; passes over it if so.
    pub(super) fn word(&mut self, word: &str) -> bool {
        let found = self.rest().starts_with(word.as_bytes())
            && self.bytes.get(self.at + word.len()).is_none_or(|b| !is_regular(*b));
        if found {
            self.at += word.len();
        }
        found
    }

    /// A number without sign.
    pub(super) fn unsigned(&mut self) -> Option<u64> {
        self.skip_space();
        let digits = self.rest().iter().take_while(|b| b.is_ascii_digit()).count();
        // Twenty digits hold every number of 64 bits.
        let text = std::str::from_utf8(self.rest().get(..digits)?)
            .ok()
            .filter(|d| !d.is_empty() && d.len() <= 20)?;
        let number = text.parse().ok()?;
        self.at += digits;
        Some(number)
    }

    /// The object that comes next.
    pub(super) fn object(&mut self, allowance: &mut Allowance) -> Result<Object, ReadError> {
        self.object_at(allowance, 0)
    }

    fn object_at(&mut self, allowance: &mut Allowance, depth: usize) -> Result<Object, ReadError> {
        allowance.take()?;
        if depth > DEEPEST {
            return Err(ReadError::TooMany("objects inside one another"));
        }
        self.skip_space();
        match self.peek() {
            Some(b'/') => self.name().map(Object::Name),
            Some(b'(') => self.literal_string().map(Object::String),
            Some(b'[') => {
                self.at += 1;
                let mut array = Vec::new();
                loop {
                    self.skip_space();
                    match self.peek() {
                        Some(b']') => break self.at += 1,
                        Some(_) => array.push(self.object_at(allowance, depth + 1)?),
                        None => return Err(self.damaged("an array")),
                    }
                }
                Ok(Object::Array(array))
            }
            Some(b'<') if self.rest().starts_with(b"<<") => {
                self.at += 2;
                let mut entries = Vec::new();
                loop {
                    self.skip_space();
                    match self.peek() {
                        Some(b'>') if self.rest().starts_with(b">>") => break self.at += 2,
                        Some(b'/') => {
                            let key = self.name()?;
                            entries.push((key, self.object_at(allowance, depth + 1)?));
                        }
                        _ => return Err(self.damaged("a dictionary")),
                    }
                }
                Ok(Object::Dictionary(Dictionary(entries)))
            }
            Some(b'<') => self.hexadecimal_string().map(Object::String),
            Some(b'+' | b'-' | b'.' | b'0'..=b'9') => self.number_or_reference(),
            _ if self.word("true") || self.word("false") => Ok(Object::Boolean),
            _ if self.word("null") => Ok(Object::Null),
            _ => Err(self.damaged("an object")),
        }
    }

    fn name(&mut self) -> Result<Vec<u8>, ReadError> {
        self.at += 1;
        let mut name = Vec::new();
        while let Some(byte) = self.peek().filter(|b| is_regular(*b)) {
            self.at += 1;
            if byte == b'#' {
                let digits = self
                    .rest()
                    .get(..2)
                    .and_then(|d| Some((hexadecimal(*d.first()?)?, hexadecimal(*d.get(1)?)?)));
                let (high, low) = digits.ok_or_else(|| self.damaged("a name"))?;
                name.push(high << 4 | low);
                self.at += 2;
            } else {
                name.push(byte);
            }
        }
        Ok(name)
    }

    fn literal_string(&mut self) -> Result<Vec<u8>, ReadError> {
        self.at += 1;
        let mut string = Vec::new();
        let mut open = 1_usize;
        while let Some(byte) = self.next() {
            match byte {
                b'(' => open += 1,
                b')' if open == 1 => return Ok(string),
                b')' => open -= 1,
                b'\\' => {
                    self.escaped(&mut string);
                    continue;
                }
                _ => {}
            }
            string.push(byte);
        }
        Err(self.damaged("a string"))
    }

    fn escaped(&mut self, string: &mut Vec<u8>) {
        match self.next() {
            Some(b'n') => string.push(b'\n'),
            Some(b'r') => string.push(b'\r'),
            Some(b't') => string.push(b'\t'),
            Some(b'b') => string.push(8),
            Some(b'f') => string.push(12),
            // A line break behind a backslash is none.
            Some(b'\r') => self.at += usize::from(self.peek() == Some(b'\n')),
            Some(b'\n') | None => {}
            Some(first @ b'0'..=b'7') => {
                let mut code = u32::from(first - b'0');
                for _ in 0..2 {
                    let Some(digit) = self.peek().filter(|b| matches!(b, b'0'..=b'7')) else { break };
                    code = code * 8 + u32::from(digit - b'0');
                    self.at += 1;
                }
                // High-order overflow is ignored (7.3.4.2).
                string.push((code & 0xFF) as u8);
            }
            Some(other) => string.push(other),
        }
    }

    fn hexadecimal_string(&mut self) -> Result<Vec<u8>, ReadError> {
        self.at += 1;
        let mut string = Vec::new();
        let mut high = None;
        while let Some(byte) = self.next() {
            match (byte, hexadecimal(byte), high) {
                (b'>', ..) => {
                    string.extend(high.map(|h| h << 4));
                    return Ok(string);
                }
                (_, Some(digit), None) => high = Some(digit),
                (_, Some(digit), Some(h)) => {
                    string.push(h << 4 | digit);
                    high = None;
                }
                _ if is_space(byte) => {}
                _ => return Err(self.damaged("a string")),
            }
        }
        Err(self.damaged("a string"))
    }

    fn number_or_reference(&mut self) -> Result<Object, ReadError> {
        let start = self.at;
        let length = self.rest().iter().take_while(|b| matches!(b, b'+' | b'-' | b'.' | b'0'..=b'9')).count();
        self.at += length;
        let text =
            self.bytes.get(start..self.at).and_then(|b| std::str::from_utf8(b).ok()).unwrap_or_default();
        let Ok(number) = text.parse::<i64>() else {
            return if text.contains('.') { Ok(Object::Real) } else { Err(self.damaged("a number")) };
        };
        // "12 0 R" is a reference; anything else leaves the place where it was.
        let mut ahead = *self;
        if let Ok(object) = u32::try_from(number)
            && ahead.peek().is_some_and(is_space)
            && ahead.unsigned().is_some_and(|generation| generation <= 65_535)
        {
            ahead.skip_space();
            if ahead.word("R") {
                *self = ahead;
                return Ok(Object::Reference(object));
            }
        }
        Ok(Object::Integer(number))
    }
}

fn is_space(byte: u8) -> bool {
    matches!(byte, 0 | 9 | 10 | 12 | 13 | 32)
}

/// Neither white space nor a delimiter.
fn is_regular(byte: u8) -> bool {
    !is_space(byte) && !matches!(byte, b'(' | b')' | b'<' | b'>' | b'[' | b']' | b'{' | b'}' | b'/' | b'%')
}

fn hexadecimal(byte: u8) -> Option<u8> {
    char::from(byte).to_digit(16).and_then(|digit| u8::try_from(digit).ok())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn object(text: &[u8]) -> Result<Object, ReadError> {
        Cursor::new(text, 0).object(&mut Allowance(1000))
    }

    /// Examples of ISO 32000-1, 7.3.4 and 7.3.5.
    #[test]
    fn strings_and_names_are_read_as_the_standard_shows() {
        for (text, string) in [
            (
                &b"(Strings may contain balanced parentheses ( ) and so on)"[..],
                &b"Strings may contain balanced parentheses ( ) and so on"[..],
            ),
            (b"(two \\\nstrings)", b"two strings"),
            (b"(\\245 and \\53 and \\0053)", b"\xA5 and + and \x053"),
            (b"<901FA>", b"\x90\x1F\xA0"),
        ] {
            assert_eq!(object(text), Ok(Object::String(string.to_vec())));
        }
        assert_eq!(
            object(b"/A;Name_With-Various***Characters?"),
            Ok(Object::Name(b"A;Name_With-Various***Characters?".to_vec()))
        );
        assert_eq!(object(b"/Lime#20Green"), Ok(Object::Name(b"Lime Green".to_vec())));
    }

    #[test]
    fn references_are_told_from_numbers() {
        let array =
            object(b"[12 0 R 1 2 3 -4 0.5 +.5 true null <</A 7 0 R>>]").unwrap().into_array("").unwrap();
        assert_eq!(array.len(), 10);
        assert_eq!(array.first(), Some(&Object::Reference(12)));
        let Some(Object::Dictionary(last)) = array.last() else { panic!("{array:?}") };
        assert_eq!(last.get("A"), Some(&Object::Reference(7)));
    }

    #[test]
    fn nests_and_heaps_end() {
        for text in [
            "[".repeat(100_000),
            "<</A".repeat(100_000),
            "0 ".repeat(5_000),
            format!("[{}]", "0 ".repeat(5_000)),
        ] {
            let read = object(text.as_bytes());
            assert!(matches!(read, Err(ReadError::TooMany(_)) | Ok(Object::Integer(0))), "{read:?}");
        }
        for text in [
            &b"("[..],
            b"<12",
            b"[1",
            b"<<",
            b"<</A>>",
            b"/A#zz",
            b"",
            b"frue",
            b"--1",
            b"99999999999999999999",
        ] {
            assert!(object(text).is_err(), "{text:?}");
        }
    }
}
