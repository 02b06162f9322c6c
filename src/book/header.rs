//! A look at the first bytes of a file before SQLite sees it.
//!
//! Comes in: a path. Goes out: the version of the book's schema, or why it is no book this program may open. Nothing is
//! written and no lock taken, so a foreign, newer, empty or cut file stays as it is to the byte. Offsets are those of
//! "Database File Format" (sqlite.org/fileformat2.html, 1.3 The Database Header, 4 The Write-Ahead Log).
//!
//! The version may stand in the log and not yet in the file, so the log's last committed copy of page 1 is looked at
//! too. Left out: the checksums of the log's frames; a frame torn by a crash could be taken for committed, which
//! refuses the book until SQLite has cleared the log, or leaves the question to the second look after opening.

use std::fs::File;
use std::io::{ErrorKind, Read, Seek, SeekFrom};
use std::path::{Path, PathBuf};

use super::error::{BookError, Stranger};

/// What a book carries at offset 68 of its file: "Ebbl".
pub(super) const APPLICATION_ID: u32 = 0x4562_626C;

const MAGIC: &[u8; 16] = b"SQLite format 3\0";
const HEADER_BYTES: usize = 100;
const PAGE_SIZE_AT: usize = 16;
const CHANGES_AT: usize = 24;
const PAGES_AT: usize = 28;
const USER_VERSION_AT: usize = 60;
const APPLICATION_ID_AT: usize = 68;
const VALID_FOR_AT: usize = 92;
/// The log's magic number but for its last bit, which tells the byte order of its checksums.
const LOG_MAGIC: u32 = 0x377F_0682;
const LOG_HEADER_BYTES: u64 = 32;
const FRAME_HEADER_BYTES: u64 = 24;

/// The version of the book's schema, of at most `known`.
///
/// # Errors
/// [`BookError::NoBook`] where there is no file; [`BookError::NotABook`], [`BookError::Newer`],
/// [`BookError::Damaged`]; [`BookError::Permission`] and [`BookError::Io`] when it cannot be read.
pub(super) fn peek(path: &Path, known: u32) -> Result<u32, BookError> {
    let unreadable = |error: &std::io::Error| BookError::of_io(path, "read", error);
    let mut file = match File::open(path) {
        Ok(file) => file,
        // SQLite would read the log of a book that is gone into whatever is put in its place.
        Err(error) if error.kind() == ErrorKind::NotFound && has_log(path) => {
            return Err(BookError::damaged(
                path,
                "the file is gone and its log (the name with -wal) is there",
            ));
        }
        Err(error) if error.kind() == ErrorKind::NotFound => {
            return Err(BookError::NoBook { path: path.to_owned() });
        }
        Err(error) => return Err(unreadable(&error)),
    };
    let about = file.metadata().map_err(|error| unreadable(&error))?;
    if about.is_dir() {
        return Err(BookError::stranger(path, Stranger::Folder));
    }
    let mut front = Vec::with_capacity(HEADER_BYTES);
    (&mut file).take(HEADER_BYTES as u64).read_to_end(&mut front).map_err(|error| unreadable(&error))?;
    if front.is_empty() {
        return Err(BookError::stranger(path, Stranger::Empty));
    }
    if !front.starts_with(MAGIC) {
        return Err(BookError::stranger(path, Stranger::NoDatabase));
    }
    let Some(header) = Header::of(&front) else {
        return Err(BookError::damaged(path, "its first page is cut short"));
    };
    let logged = logged_header(path).map_err(|error| unreadable(&error))?;
    let current = logged.as_ref().unwrap_or(&header);
    if header.application_id != APPLICATION_ID || current.application_id != APPLICATION_ID {
        return Err(BookError::stranger(path, Stranger::OtherApplication));
    }
    for version in [header.user_version, current.user_version] {
        if version > known {
            return Err(BookError::Newer { path: path.to_owned(), found: version, known });
        }
    }
    let length = about.len();
    if logged.is_none() && !has_log(path) && header.is_cut(length) {
        return Err(BookError::damaged(path, "it is shorter than its own count of pages"));
    }
    Ok(current.user_version)
}

/// The numbers of the database header that matter here.
struct Header {
    page_size: u64,
    changes: u32,
    pages: u32,
    user_version: u32,
    application_id: u32,
    valid_for: u32,
}

impl Header {
    fn of(page: &[u8]) -> Option<Self> {
        let u32_at = |at: usize| page.get(at..).and_then(big_endian);
        let short = page.get(PAGE_SIZE_AT..PAGE_SIZE_AT + 2)?;
        // 1 stands for 65 536, which does not fit in two bytes.
        let page_size = match u64::from(short[0]) << 8 | u64::from(short[1]) {
            1 => 65_536,
            size => size,
        };
        Some(Self {
            page_size,
            changes: u32_at(CHANGES_AT)?,
            pages: u32_at(PAGES_AT)?,
            user_version: u32_at(USER_VERSION_AT)?,
            application_id: u32_at(APPLICATION_ID_AT)?,
            valid_for: u32_at(VALID_FOR_AT)?,
        })
    }

    /// Whether a file of `length` bytes, to which no log belongs, lacks pages that its own header counts.
    fn is_cut(&self, length: u64) -> bool {
        let counted = self.pages > 0 && self.changes == self.valid_for;
        length < self.page_size || (counted && length < self.page_size * u64::from(self.pages))
    }
}

/// The log that belongs to a book.
pub(super) fn log_of(path: &Path) -> PathBuf {
    with_suffix(path, "-wal")
}

/// The name of a file that stands beside a book.
pub(super) fn with_suffix(path: &Path, suffix: &str) -> PathBuf {
    let mut name = path.as_os_str().to_owned();
    name.push(suffix);
    PathBuf::from(name)
}

/// Whether something stands in the log that belongs to a book.
pub(super) fn has_log(path: &Path) -> bool {
    std::fs::metadata(log_of(path)).is_ok_and(|about| about.len() > 0)
}

/// The header in the last committed copy of page 1 in the log, if there is one.
fn logged_header(path: &Path) -> std::io::Result<Option<Header>> {
    let mut log = match File::open(log_of(path)) {
        Ok(log) => log,
        Err(error) if error.kind() == ErrorKind::NotFound => return Ok(None),
        Err(error) => return Err(error),
    };
    let length = log.metadata()?.len();
    let mut front = [0; LOG_HEADER_BYTES as usize];
    if length < LOG_HEADER_BYTES || log.read_exact(&mut front).is_err() {
        return Ok(None);
    }
    let u32_in = |bytes: &[u8], at: usize| bytes.get(at..).and_then(big_endian).unwrap_or(0);
    let page_size = u64::from(u32_in(&front, 8));
    if u32_in(&front, 0) & !1 != LOG_MAGIC || page_size < 512 {
        return Ok(None);
    }
    let salts = &front[16..24];
    let frames = (length - LOG_HEADER_BYTES) / (FRAME_HEADER_BYTES + page_size);
    let (mut pending, mut committed) = (None, None);
    for number in 0..frames {
        let at = LOG_HEADER_BYTES + number * (FRAME_HEADER_BYTES + page_size);
        let mut frame = [0; FRAME_HEADER_BYTES as usize];
        log.seek(SeekFrom::Start(at))?;
        // Another program may begin the log anew while it is looked at; what is gone is not looked at.
        if log.read_exact(&mut frame).is_err() || &frame[8..16] != salts {
            break;
        }
        if u32_in(&frame, 0) == 1 {
            let mut page = [0; HEADER_BYTES];
            if log.read_exact(&mut page).is_err() {
                break;
            }
            pending = Header::of(&page);
        }
        let pages_after_commit = u32_in(&frame, 4);
        if pages_after_commit != 0 && pending.is_some() {
            committed = pending.take();
        }
    }
    Ok(committed)
}

fn big_endian(bytes: &[u8]) -> Option<u32> {
    bytes.first_chunk().map(|four| u32::from_be_bytes(*four))
}
