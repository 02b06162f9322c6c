//! A CSV table of readings, streamed row by row.
//!
//! Comes in: any reader of bytes and the names of the columns wanted. Goes out: rows of trimmed cells, each with the
//! line it stands on. Taken as if nothing were odd: a byte order mark, CRLF, `;` or tab between fields, quoted cells,
//! no final newline, empty lines, rows of nothing but delimiters. Memory stays within one line of 64 KiB, whatever the
//! file is.

use std::io::{BufRead, BufReader, Read};

use super::document::nearest;
use super::error::{Fault, Place, RecordError, Refusal};
use super::number::{self, Mark};

/// Longest line that is read, in bytes. A logger with a thousand columns stays below it.
const LONGEST_LINE: usize = 64 * 1024;

/// The delimiters known, in the order they are tried.
const DELIMITERS: [u8; 3] = [b';', b'\t', b','];

/// A table whose header has been read.
pub(super) struct Sheet {
    file: String,
    header: Vec<String>,
    header_line: u64,
    delimiter: u8,
    reader: csv::Reader<Lines<BufReader<Box<dyn Read>>>>,
    row: csv::ByteRecord,
    /// Whether a decimal point, and a decimal comma, have been met.
    marks: (bool, bool),
}

impl Sheet {
    /// Reads the header and finds the delimiter under which it holds the columns `wanted`.
    ///
    /// # Errors
    /// A file that cannot be read or is no UTF-8 text; no header; a column wanted that is not in it (with the field
    /// it was named in); a name that stands twice.
    pub(super) fn open(file: &str, source: Box<dyn Read>, wanted: &[&str]) -> Result<Self, RecordError> {
        let mut source = BufReader::with_capacity(LONGEST_LINE, source);
        let (line, header_line) = first_line(file, &mut source)?;
        let text = std::str::from_utf8(&line)
            .map_err(|_| RecordError::unreadable(file, Fault::NotUtf8(header_line)))?;
        let has_all = |names: &Vec<String>| wanted.iter().all(|name| names.iter().any(|n| n == name));
        let headers = DELIMITERS.map(|delimiter| (delimiter, split(text, delimiter)));
        // The columns wanted tell the delimiter; without them the one that splits most, so that the refusal names
        // sensible columns.
        let (delimiter, header) = match headers.iter().find(|(_, names)| has_all(names)) {
            Some(found) => found.clone(),
            None => headers.iter().rev().max_by_key(|(_, names)| names.len()).cloned().unwrap_or_default(),
        };
        let place = |name: &str| Place {
            file: file.to_owned(),
            line: Some(header_line),
            field: Some(format!("column {name:?}")),
        };
        for (index, name) in header.iter().enumerate() {
            if !name.is_empty() && header[..index].contains(name) {
                return Err(Refusal::DoubledColumn.at(place(name)));
            }
        }
        if let Some(missing) = wanted.iter().find(|name| !header.iter().any(|n| n == *name)) {
            let near = nearest(missing, header.iter().map(String::as_str)).unwrap_or_default();
            return Err(Refusal::NoColumn(near.to_owned()).at(place(missing)));
        }
        let lines = Lines { source, line: header_line, ended: true, since_row: 0 };
        let reader = csv::ReaderBuilder::new()
            .delimiter(delimiter)
            .has_headers(false)
            .flexible(true)
            .buffer_capacity(LONGEST_LINE)
            .from_reader(lines);
        Ok(Self {
            file: file.to_owned(),
            header,
            header_line,
            delimiter,
            reader,
            row: csv::ByteRecord::new(),
            marks: (false, false),
        })
    }

    /// Goes to the next row that is not blank; false at the end.
    pub(super) fn next_row(&mut self) -> Result<bool, RecordError> {
        loop {
            match self.reader.read_byte_record(&mut self.row) {
                Ok(true) => {}
                Ok(false) => return Ok(false),
                Err(error) => return Err(self.unreadable(error)),
            }
            self.reader.get_mut().since_row = 0;
            let bytes = self.row.as_slice();
            if !bytes.iter().fold(true, |plain, byte| plain & (byte.is_ascii() & !matches!(byte, 0 | b'\n')))
            {
                self.check_text()?;
            }
            if self.row.len() == self.header.len() && self.row.get(0).is_some_and(|cell| !blank(cell)) {
                return Ok(true);
            }
            if self.row.iter().all(blank) {
                continue;
            }
            if self.row.len() != self.header.len() {
                let (got, header) = (self.row.len(), self.header.len());
                return Err(self.refuse_row(Refusal::FieldCount { got, header }));
            }
            return Ok(true);
        }
    }

    /// Where a column stands; every column wanted at opening is there.
    pub(super) fn column(&self, name: &str) -> Option<usize> {
        self.header.iter().position(|n| n == name)
    }

    /// The cell of the present row, without the spaces around it.
    pub(super) fn cell(&self, column: usize) -> &[u8] {
        self.row.get(column).unwrap_or_default().trim_ascii()
    }

    /// The number in a cell of the present row; none when the cell is empty.
    pub(super) fn number(&mut self, column: usize) -> Result<Option<f64>, RecordError> {
        let cell = self.row.get(column).unwrap_or_default().trim_ascii();
        let Some((value, mark)) = number::parse(cell) else {
            return if cell.is_empty() { Ok(None) } else { Err(self.not_a_number(column)) };
        };
        match mark {
            Mark::None => {}
            Mark::Point => self.marks.0 = true,
            Mark::Comma => self.marks.1 = true,
        }
        if self.marks.1 {
            let shown = String::from_utf8_lossy(cell).into_owned();
            if self.delimiter != b';' {
                return Err(self.refuse(column, Refusal::DecimalComma(shown)));
            }
            if self.marks.0 {
                return Err(self.refuse(column, Refusal::MixedDecimals(shown)));
            }
        }
        Ok(Some(value))
    }

    /// A refusal of a cell of the present row.
    pub(super) fn refuse(&self, column: usize, refusal: Refusal) -> RecordError {
        let field = self.header.get(column).map(|name| format!("column {name:?}"));
        refusal.at(Place { file: self.file.clone(), line: Some(self.reader.get_ref().line), field })
    }

    /// A refusal of the present row.
    pub(super) fn refuse_row(&self, refusal: Refusal) -> RecordError {
        refusal.at(Place { file: self.file.clone(), line: Some(self.reader.get_ref().line), field: None })
    }

    /// A refusal of the whole table.
    pub(super) fn refuse_table(&self, refusal: Refusal) -> RecordError {
        refusal.at(Place { file: self.file.clone(), line: Some(self.header_line), field: None })
    }

    #[cold]
    fn not_a_number(&self, column: usize) -> RecordError {
        let shown = String::from_utf8_lossy(self.cell(column)).into_owned();
        let bare = shown.trim_start_matches(['-', '+']).to_ascii_lowercase();
        let again = self.header.iter().enumerate().all(|(i, name)| self.cell(i) == name.as_bytes());
        let is_large = || bare.starts_with(|c: char| c.is_ascii_digit()) && shown.parse::<f64>().is_ok();
        self.refuse(
            column,
            match bare.as_str() {
                _ if again => Refusal::HeaderAgain,
                "nan" | "inf" | "infinity" | "#n/a" => Refusal::NotFinite(shown),
                _ if is_large() => Refusal::NotFinite(shown),
                _ => Refusal::NotANumber(shown),
            },
        )
    }

    /// Tells why a row with unusual bytes cannot be taken, if it cannot.
    #[cold]
    fn check_text(&self) -> Result<(), RecordError> {
        let bytes = self.row.as_slice();
        if bytes.contains(&0) {
            return Err(RecordError::unreadable(&self.file, Fault::Binary));
        }
        if self.row.iter().any(|cell| std::str::from_utf8(cell).is_err()) {
            return Err(RecordError::unreadable(&self.file, Fault::NotUtf8(self.reader.get_ref().line)));
        }
        if bytes.contains(&b'\n') { Err(self.refuse_row(Refusal::OpenQuote)) } else { Ok(()) }
    }

    fn unreadable(&self, error: csv::Error) -> RecordError {
        match error.into_kind() {
            csv::ErrorKind::Io(error) if is_long_line(&error) => self.refuse_row(Refusal::LongLine),
            csv::ErrorKind::Io(error) => RecordError::unreadable(&self.file, Fault::of(&error)),
            other => RecordError::unreadable(&self.file, Fault::System(format!("{other:?}"))),
        }
    }
}

/// Hands the bytes on line by line, so that the line counter stands at the row just read; refuses a row that grows
/// beyond all measure (a binary file, a quote that is never closed).
struct Lines<R> {
    source: R,
    /// The line of the last byte handed out.
    line: u64,
    /// Whether that byte ended its line.
    ended: bool,
    /// Bytes handed out since the last row, empty lines not counted.
    since_row: usize,
}

impl<R: BufRead> Read for Lines<R> {
    fn read(&mut self, out: &mut [u8]) -> std::io::Result<usize> {
        let buffer = self.source.fill_buf()?;
        let most = buffer.len().min(out.len());
        let end = buffer[..most].iter().position(|byte| *byte == b'\n');
        let length = end.map_or(most, |end| end + 1);
        out[..length].copy_from_slice(&buffer[..length]);
        self.source.consume(length);
        self.line += u64::from(self.ended && length > 0);
        self.ended = end.is_some();
        if length > 2 {
            self.since_row += length;
        }
        if self.since_row > LONGEST_LINE { Err(long_line()) } else { Ok(length) }
    }
}

fn long_line() -> std::io::Error {
    std::io::Error::new(std::io::ErrorKind::InvalidData, Refusal::LongLine)
}

fn is_long_line(error: &std::io::Error) -> bool {
    error.get_ref().is_some_and(|inner| matches!(inner.downcast_ref(), Some(Refusal::LongLine)))
}

/// The first line that is not blank, and its number.
fn first_line(file: &str, source: &mut impl BufRead) -> Result<(Vec<u8>, u64), RecordError> {
    let refuse =
        |line, refusal: Refusal| refusal.at(Place { file: file.to_owned(), line: Some(line), field: None });
    let mut number = 0;
    loop {
        let mut line = Vec::new();
        let read = source.by_ref().take(LONGEST_LINE as u64 + 1).read_until(b'\n', &mut line);
        read.map_err(|error| RecordError::unreadable(file, Fault::of(&error)))?;
        if line.is_empty() {
            return Err(refuse(1, Refusal::NoHeader));
        }
        number += 1;
        if line.contains(&0) {
            return Err(RecordError::unreadable(file, Fault::Binary));
        }
        if line.trim_ascii().contains(&b'\r') {
            return Err(refuse(number, Refusal::BareReturn));
        }
        if line.len() > LONGEST_LINE {
            return Err(refuse(number, Refusal::LongLine));
        }
        if number == 1 && line.starts_with(b"\xEF\xBB\xBF") {
            line.drain(..3);
        }
        if !blank(&line) {
            return Ok((line, number));
        }
    }
}

/// The trimmed names in a header line.
fn split(line: &str, delimiter: u8) -> Vec<String> {
    let mut reader =
        csv::ReaderBuilder::new().delimiter(delimiter).has_headers(false).from_reader(line.as_bytes());
    let first = reader.records().next().and_then(Result::ok).unwrap_or_default();
    first.iter().map(|name| name.trim().to_owned()).collect()
}

fn blank(cell: &[u8]) -> bool {
    cell.trim_ascii().is_empty()
}
