//! Where the book is, how it is opened, and what stands in its registers.

use std::cell::RefCell;
use std::path::{Path, PathBuf};

use etcetera::BaseStrategy as _;
use rand_chacha::ChaCha20Rng;
use rand_chacha::rand_core::{Rng as _, SeedableRng as _};

use super::WorkError;
use crate::book::{Book, BookError, Opening, Options, Stamp};
use crate::clock;
use crate::entry::{Acceptance, Id, Instrument, InstrumentPapers, Meter, Transducer};
use crate::record::Registers;

/// Where the book is: what was said on the command line, else `EBBLINE_BOOK`, else the platform's data folder.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Shelf {
    path: PathBuf,
}

impl Shelf {
    /// Finds the place.
    ///
    /// # Errors
    /// When nothing was said and the platform names no data folder.
    pub fn find(said: Option<&Path>) -> Result<Self, WorkError> {
        if let Some(path) = said {
            return Ok(Self::at(path));
        }
        if let Some(path) = std::env::var_os("EBBLINE_BOOK").filter(|path| !path.is_empty()) {
            return Ok(Self::at(Path::new(&path)));
        }
        let folders = etcetera::choose_base_strategy().map_err(|_| WorkError::NoDataFolder)?;
        Ok(Self { path: folders.data_dir().join("ebbline").join("book.db") })
    }

    /// At a stated place.
    #[must_use]
    pub fn at(path: &Path) -> Self {
        Self { path: path.to_owned() }
    }

    /// The file.
    #[must_use]
    pub fn path(&self) -> &Path {
        &self.path
    }

    /// Opens the book for reading.
    ///
    /// # Errors
    /// When there is none, or it cannot be read.
    pub fn to_read(&self) -> Result<Book, WorkError> {
        Ok(Book::open_to_read(&self.path, &Options::default())?)
    }

    /// Opens the book for writing; one that is not there is begun, and `notes` says so.
    ///
    /// # Errors
    /// When it cannot be opened or begun.
    pub fn to_write(&self, notes: &mut Vec<String>) -> Result<Book, WorkError> {
        let book = stamped(|stamp| Book::open_or_begin(&self.path, &Options::default(), stamp))??;
        match book.opening() {
            Opening::Found => {}
            Opening::Upgraded { from } => notes.push(format!(
                "the book {} was brought from form {from} to the present one",
                self.path.display()
            )),
            Opening::Begun | Opening::BegunWithFolder => {
                notes.push(format!("a new book was begun: {}", self.path.display()));
            }
        }
        Ok(book)
    }

    /// Opens the book for writing where there has to be one.
    ///
    /// # Errors
    /// When there is none, or it cannot be opened.
    pub fn to_change(&self) -> Result<Book, WorkError> {
        Ok(Book::open(&self.path, &Options::default())?)
    }
}

/// Hands the time and a source of salts to what writes.
///
/// # Errors
/// When the system gives no random numbers.
pub fn stamped<R>(write: impl FnOnce(&mut Stamp<'_>) -> R) -> Result<R, WorkError> {
    let mut seed = [0_u8; 32];
    getrandom::fill(&mut seed).map_err(|_| WorkError::NoRandomNumbers)?;
    let mut numbers = ChaCha20Rng::from_seed(seed);
    let mut salt = || {
        let mut salt = [0_u8; 16];
        numbers.fill_bytes(&mut salt);
        salt
    };
    Ok(write(&mut Stamp { at: clock::now(), salt: &mut salt }))
}

/// The registers of a book that is opened when a file first names an entry.
///
/// A file that names none is read without a book, as the interface promises.
#[derive(Debug)]
pub struct ShelfRegisters<'a> {
    shelf: &'a Shelf,
    book: RefCell<Option<Book>>,
    failed: RefCell<Option<WorkError>>,
}

impl<'a> ShelfRegisters<'a> {
    /// The registers of the book at `shelf`.
    #[must_use]
    pub const fn new(shelf: &'a Shelf) -> Self {
        Self { shelf, book: RefCell::new(None), failed: RefCell::new(None) }
    }

    /// What kept the book from being read, if anything did. Where there is no book, nothing did: then the file that
    /// names an entry is refused for naming it.
    pub fn failure(&self) -> Option<WorkError> {
        self.failed.borrow_mut().take()
    }

    fn look<T>(&self, find: impl FnOnce(&Book) -> Result<Option<T>, BookError>) -> Option<T> {
        let mut book = self.book.borrow_mut();
        if book.is_none() {
            match self.shelf.to_read() {
                Ok(opened) => *book = Some(opened),
                Err(WorkError::Book(BookError::NoBook { .. })) => return None,
                Err(error) => {
                    self.failed.borrow_mut().get_or_insert(error);
                    return None;
                }
            }
        }
        match find(book.as_ref()?) {
            Ok(found) => found,
            Err(error) => {
                self.failed.borrow_mut().get_or_insert(error.into());
                None
            }
        }
    }
}

impl Registers for ShelfRegisters<'_> {
    fn meter(&self, id: &Id) -> Option<Meter> {
        self.look(|book| meter_of(book, id))
    }

    fn transducer(&self, id: &Id) -> Option<Transducer> {
        self.look(|book| transducer_of(book, id))
    }

    fn acceptance(&self, id: &Id) -> Option<Acceptance> {
        self.look(|book| Ok(book.entry::<Acceptance>(id)?.map(|found| found.entry)))
    }
}

/// The flow meter of a name in the register of instruments.
///
/// # Errors
/// When the book cannot be read.
pub fn meter_of(book: &Book, id: &Id) -> Result<Option<Meter>, BookError> {
    Ok(book.entry::<Instrument>(id)?.and_then(|found| match found.entry.papers {
        Some(InstrumentPapers::Meter(meter)) => Some(Meter { id: Some(found.entry.id), ..meter }),
        _ => None,
    }))
}

/// The transducer of a name in the register of instruments.
///
/// # Errors
/// When the book cannot be read.
pub fn transducer_of(book: &Book, id: &Id) -> Result<Option<Transducer>, BookError> {
    Ok(book.entry::<Instrument>(id)?.and_then(|found| match found.entry.papers {
        Some(InstrumentPapers::Transducer(transducer)) => {
            Some(Transducer { id: Some(found.entry.id), ..transducer })
        }
        _ => None,
    }))
}
