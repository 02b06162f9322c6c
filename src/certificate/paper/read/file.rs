//! A PDF as a file: where each object stands, objects by their number, streams unpacked (ISO 32000-1, 7.3.8 and 7.5).

use std::collections::{HashMap, HashSet};
use std::io::Read as _;

use flate2::read::ZlibDecoder;

use super::syntax::{Allowance, Cursor, Dictionary, Object};
use super::{MOST_BYTES, MOST_STREAM_BYTES, MOST_STREAMS_BYTES, ReadError};

/// Objects of a file; a certificate of ten pages has some thousand.
const MOST_OBJECTS: usize = 500_000;
/// Parts of objects and of tables that are read in all; each takes some hundred bytes while it is held.
const MOST_PARTS: usize = 1_000_000;
/// Bytes that are passed over in all, so that one place read again and again takes no hours.
const MOST_READING: usize = 2 * MOST_BYTES;
/// How often a file may have been written on to.
const MOST_REVISIONS: usize = 64;
/// References that lead to references.
const LONGEST_CHAIN: usize = 8;
/// Filters one after another.
const MOST_FILTERS: usize = 3;
/// The end of the file has to be found in so many of its last bytes.
const TAIL: usize = 2_048;

/// An open file.
pub(super) struct File<'b> {
    bytes: &'b [u8],
    /// Places of the objects by their numbers; nothing for one that was given up.
    places: HashMap<u32, Option<usize>>,
    trailer: Dictionary,
    revisions: usize,
    allowance: Allowance,
    /// Bytes that may still be passed over.
    reading: usize,
    /// Bytes that streams may still unpack to.
    room: usize,
}

impl<'b> File<'b> {
    pub(super) fn open(bytes: &'b [u8]) -> Result<Self, ReadError> {
        if bytes.len() > MOST_BYTES {
            return Err(ReadError::TooLarge(bytes.len()));
        }
        if !bytes.starts_with(b"%PDF-") {
            return Err(ReadError::NotPdf);
        }
        let mut file = Self {
            bytes,
            places: HashMap::new(),
            trailer: Dictionary::default(),
            revisions: 0,
            allowance: Allowance(MOST_PARTS),
            reading: MOST_READING,
            room: MOST_STREAMS_BYTES,
        };
        let mut next = Some(file.start()?);
        let mut visited = HashSet::new();
        while let Some(at) = next {
            if !visited.insert(at) {
                return Err(ReadError::Circle("the tables of contents"));
            }
            if visited.len() > MOST_REVISIONS {
                return Err(ReadError::TooMany("revisions"));
            }
            next = file.table(at)?;
        }
        file.revisions = visited.len();
        Ok(file)
    }

    pub(super) fn trailer(&self) -> &Dictionary {
        &self.trailer
    }

    pub(super) fn revisions(&self) -> usize {
        self.revisions
    }

    /// Where the last table of contents stands.
    fn start(&self) -> Result<usize, ReadError> {
        let tail = self.bytes.len().saturating_sub(TAIL);
        let last = self.bytes.get(tail..).unwrap_or_default();
        let word = b"startxref";
        let found =
            last.windows(word.len()).rposition(|window| window == word).ok_or(ReadError::Truncated)?;
        let mut cursor = Cursor::new(self.bytes, tail + found + word.len());
        let at = cursor.unsigned().and_then(|at| usize::try_from(at).ok()).ok_or(ReadError::Truncated)?;
        if at < self.bytes.len() { Ok(at) } else { Err(ReadError::Truncated) }
    }

    /// Reads a table and its trailer; what a later revision said already stays. Goes out: where the table before stands.
    fn table(&mut self, at: usize) -> Result<Option<usize>, ReadError> {
        let mut cursor = Cursor::new(self.bytes, at);
        cursor.skip_space();
        if !cursor.word("xref") {
            return Err(match cursor.peek() {
                Some(b'0'..=b'9') => ReadError::Foreign("its table of contents is packed"),
                _ => cursor.damaged("the table of contents"),
            });
        }
        loop {
            cursor.skip_space();
            if cursor.word("trailer") {
                break;
            }
            let damaged = cursor.damaged("the table of contents");
            let (Some(first), Some(count)) = (cursor.unsigned(), cursor.unsigned()) else {
                return Err(damaged);
            };
            for number in first..first.saturating_add(count) {
                self.allowance.take()?;
                let damaged = cursor.damaged("the table of contents");
                let (Some(place), Some(_)) = (cursor.unsigned(), cursor.unsigned()) else {
                    return Err(damaged);
                };
                cursor.skip_space();
                let place = match (cursor.word("n"), cursor.word("f")) {
                    (true, _) => Some(usize::try_from(place).map_err(|_| cursor.damaged("a place"))?),
                    (_, true) => None,
                    _ => return Err(cursor.damaged("the table of contents")),
                };
                let number = u32::try_from(number).map_err(|_| ReadError::TooMany("objects"))?;
                self.places.entry(number).or_insert(place);
                if self.places.len() > MOST_OBJECTS {
                    return Err(ReadError::TooMany("objects"));
                }
            }
        }
        let trailer = cursor.object(&mut self.allowance)?.into_dictionary("trailer")?;
        self.passed(cursor.at - at)?;
        if trailer.get("Encrypt").is_some() {
            return Err(ReadError::Encrypted);
        }
        if trailer.get("XRefStm").is_some() {
            return Err(ReadError::Foreign("its table of contents is packed"));
        }
        let before = match trailer.get("Prev") {
            Some(Object::Integer(at)) => match usize::try_from(*at) {
                Ok(at) if at < self.bytes.len() => Some(at),
                _ => return Err(cursor.damaged("the place of an earlier table of contents")),
            },
            None => None,
            Some(_) => return Err(cursor.damaged("the place of an earlier table of contents")),
        };
        if self.trailer == Dictionary::default() {
            self.trailer = trailer;
        }
        Ok(before)
    }

    /// An object by its number; of a stream, its dictionary.
    pub(super) fn object(&mut self, number: u32) -> Result<Object, ReadError> {
        let mut number = number;
        for _ in 0..LONGEST_CHAIN {
            match self.object_and_end(number)? {
                (Object::Reference(next), _) => number = next,
                (object, _) => return Ok(object),
            }
        }
        Err(ReadError::Circle("references"))
    }

    /// The object itself where it is a reference, and whether it is there at all.
    pub(super) fn follow_if_there(&mut self, object: Option<&Object>) -> Result<Option<Object>, ReadError> {
        match object {
            Some(Object::Reference(number)) => match self.object(*number)? {
                Object::Null => Ok(None),
                object => Ok(Some(object)),
            },
            Some(Object::Null) | None => Ok(None),
            Some(object) => Ok(Some(object.clone())),
        }
    }

    /// The same where it has to be there.
    pub(super) fn follow(&mut self, object: Option<Object>, what: &'static str) -> Result<Object, ReadError> {
        self.follow_if_there(object.as_ref())?.ok_or(ReadError::Missing(what))
    }

    /// Reads one object and the place behind it. An object that is nowhere is null (7.3.10).
    fn object_and_end(&mut self, number: u32) -> Result<(Object, usize), ReadError> {
        let Some(at) = self.places.get(&number).copied().flatten() else { return Ok((Object::Null, 0)) };
        let mut cursor = Cursor::new(self.bytes, at);
        let damaged = cursor.damaged("an object");
        if at >= self.bytes.len()
            || cursor.unsigned() != Some(u64::from(number))
            || cursor.unsigned().is_none()
        {
            return Err(damaged);
        }
        cursor.skip_space();
        if !cursor.word("obj") {
            return Err(damaged);
        }
        let object = cursor.object(&mut self.allowance)?;
        self.passed(cursor.at - at)?;
        Ok((object, cursor.at))
    }

    fn passed(&mut self, count: usize) -> Result<(), ReadError> {
        self.reading =
            self.reading.checked_sub(count).ok_or(ReadError::TooMany("references to the same bytes"))?;
        Ok(())
    }

    /// A stream by the number of its object, unpacked.
    pub(super) fn stream(&mut self, number: u32, what: &'static str) -> Result<Vec<u8>, ReadError> {
        let (object, end) = self.object_and_end(number)?;
        let dictionary = object.into_dictionary(what)?;
        let mut cursor = Cursor::new(self.bytes, end);
        cursor.skip_space();
        if !cursor.word("stream") {
            return Err(cursor.damaged(what));
        }
        // A line break, of one or two characters (7.3.8.1).
        cursor.at += usize::from(cursor.peek() == Some(b'\r'));
        cursor.at += usize::from(cursor.peek() == Some(b'\n'));
        let length = match self.follow(dictionary.get("Length").cloned(), "length of a stream")? {
            Object::Integer(length) => usize::try_from(length).ok(),
            _ => None,
        };
        let packed = length.and_then(|length| self.bytes.get(cursor.at..cursor.at.checked_add(length)?));
        let packed = packed.ok_or(cursor.damaged(what))?;
        let mut behind = Cursor::new(self.bytes, cursor.at + packed.len());
        behind.skip_space();
        if !behind.word("endstream") {
            return Err(behind.damaged(what));
        }
        self.passed(behind.at - end)?;
        self.unpacked(&dictionary, packed, what)
    }

    fn unpacked(
        &mut self,
        dictionary: &Dictionary,
        packed: &[u8],
        what: &'static str,
    ) -> Result<Vec<u8>, ReadError> {
        let filters = match self.follow_if_there(dictionary.get("Filter"))? {
            None => Vec::new(),
            Some(Object::Array(filters)) => filters,
            Some(one) => vec![one],
        };
        if filters.len() > MOST_FILTERS || dictionary.get("F").is_some() {
            return Err(ReadError::Foreign("a stream is packed in an unusual way"));
        }
        if self.follow_if_there(dictionary.get("DecodeParms"))?.is_some() {
            return Err(ReadError::Foreign("a stream is packed in an unusual way"));
        }
        let mut bytes = None;
        for filter in &filters {
            if !matches!(filter, Object::Name(name) if name == b"FlateDecode") {
                return Err(ReadError::Foreign("a stream is packed in an unusual way"));
            }
            bytes = Some(self.inflated(bytes.as_deref().unwrap_or(packed), what)?);
        }
        match bytes {
            Some(bytes) => Ok(bytes),
            None => {
                self.spend(packed.len(), what)?;
                Ok(packed.to_vec())
            }
        }
    }

    fn inflated(&mut self, packed: &[u8], what: &'static str) -> Result<Vec<u8>, ReadError> {
        let mut bytes = Vec::new();
        let most = MOST_STREAM_BYTES.min(self.room);
        // One byte more than allowed shows that there is more.
        let read = ZlibDecoder::new(packed).take(most as u64 + 1).read_to_end(&mut bytes);
        self.spend(bytes.len(), what)?;
        match read {
            Ok(_) => Ok(bytes),
            Err(_) => Err(ReadError::Missing("stream that can be unpacked")),
        }
    }

    fn spend(&mut self, count: usize, what: &'static str) -> Result<(), ReadError> {
        if count > MOST_STREAM_BYTES {
            return Err(ReadError::Bomb { what, most_mb: MOST_STREAM_BYTES >> 20 });
        }
        self.room = self
            .room
            .checked_sub(count)
            .ok_or(ReadError::Bomb { what: "all streams together", most_mb: MOST_STREAMS_BYTES >> 20 })?;
        Ok(())
    }
}
