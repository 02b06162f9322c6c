//! What is inside a PDF: attached files, content of the pages, who says to have made it.
//!
//! Comes in: bytes from anywhere, which may be damaged or made to do harm. Goes out: the contents, or one sentence why
//! not. Nothing is recomputed or believed here.
//!
//! Only what a reader of these contents has to follow is followed: cross-reference tables, the tree of pages, the tree of
//! attached files. Files of at most 64 MB are read; a stream may grow to 16 MB, all of them to 128 MB; nesting, numbers of
//! pages, of files and of objects have limits, and no place is visited twice. Readers made for all of PDF decompress
//! before one can ask how much, which is why this one is the program's own.
//!
//! Left out: encrypted files; files in which another program packed objects into cross-reference or object streams;
//! filters other than Flate; fonts, pictures and everything else that is looked at. So two files whose pages have the
//! same content may still look different: only equal bytes are equal pages for certain.

mod file;
mod syntax;

use std::collections::HashSet;

use file::File;
use syntax::{Dictionary, Object};

use super::model::Relationship;

/// Largest file that is read, in bytes.
pub const MOST_BYTES: usize = 64 << 20;
/// Largest stream, decompressed, in bytes.
pub const MOST_STREAM_BYTES: usize = 16 << 20;
/// Largest sum of all streams that are read, decompressed, in bytes.
pub const MOST_STREAMS_BYTES: usize = 128 << 20;
const MOST_PAGES: usize = 5_000;
const MOST_ATTACHMENTS: usize = 200;
/// Deepest tree of pages or of names; writers seldom go beyond three.
const DEEPEST_TREE: usize = 32;

/// What is inside a PDF.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Contents {
    /// Title, from the information dictionary.
    pub title: Option<String>,
    /// Who answers for it.
    pub author: Option<String>,
    /// The program that made it.
    pub producer: Option<String>,
    /// The attached files, in the order of their names, then those that no name leads to.
    pub attachments: Vec<Attached>,
    /// Content streams of each page, decompressed and joined by line breaks.
    pub pages: Vec<Vec<u8>>,
    /// How often the file was written on to; 1 for a file as it was made.
    pub revisions: usize,
    /// Pages on which something lies over the content: notes, stamps, fields of forms.
    pub annotated_pages: usize,
}

/// An attached file as found.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Attached {
    /// Its name, as it was written: it may hold anything.
    pub name: String,
    /// What it is to the document, where that is said.
    pub relationship: Option<Relationship>,
    /// The file itself, whole.
    pub bytes: Vec<u8>,
}

/// Why the contents could not be read.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum ReadError {
    /// Over [`MOST_BYTES`].
    #[error("the file has {0} bytes, over 64 MB: a certificate has far fewer")]
    TooLarge(usize),
    /// No PDF at all.
    #[error("the file is no PDF: it does not begin with %PDF-")]
    NotPdf,
    /// The end is missing.
    #[error("the file is cut off: its end with the table of contents is missing; fetch it anew")]
    Truncated,
    /// It asks for a key.
    #[error("the file is encrypted: take the certificate as it was issued")]
    Encrypted,
    /// Written in a way this reader does not read.
    #[error("the file was saved by another program ({0}): take the certificate as it was issued")]
    Foreign(&'static str),
    /// Against the rules of PDF.
    #[error("the file is damaged: {what} at byte {at} cannot be read; fetch it anew")]
    Damaged {
        /// What was being read.
        what: &'static str,
        /// Where.
        at: usize,
    },
    /// Something is missing.
    #[error("the file is damaged: it has no {0}; fetch it anew")]
    Missing(&'static str),
    /// A tree that leads back to itself.
    #[error("the file leads in a circle ({0}): it was made to mislead, or is damaged")]
    Circle(&'static str),
    /// A stream that grows beyond its limit.
    #[error(
        "the file unpacks to more than {most_mb} MB ({what}): it was made to do harm, or is no certificate"
    )]
    Bomb {
        /// What grew.
        what: &'static str,
        /// Limit in megabytes.
        most_mb: usize,
    },
    /// More pages, files or objects than any certificate has.
    #[error("the file holds more {0} than a certificate can have: it was made to do harm, or is none")]
    TooMany(&'static str),
}

/// Reads what is inside a PDF.
///
/// # Errors
/// One [`ReadError`] for the first thing that stands in the way; nothing is handed out of a file that has one.
pub fn read(bytes: &[u8]) -> Result<Contents, ReadError> {
    let mut file = File::open(bytes)?;
    let catalog =
        file.follow(file.trailer().get("Root").cloned(), "catalogue")?.into_dictionary("catalogue")?;
    let information = match file.trailer().get("Info").cloned() {
        Some(information) => file.follow(Some(information), "information")?.into_dictionary("information")?,
        None => Dictionary::default(),
    };
    let mut said = |key| match file.follow_if_there(information.get(key)) {
        Ok(Some(Object::String(bytes))) => Ok(Some(text(&bytes))),
        Ok(_) => Ok(None),
        Err(e) => Err(e),
    };
    let (title, author, producer) = (said("Title")?, said("Author")?, said("Producer")?);
    let mut pages = Pages { file: &mut file, visited: HashSet::new(), contents: Vec::new(), annotated: 0 };
    pages.below(catalog.get("Pages"), 0)?;
    let Pages { contents, annotated, .. } = pages;
    let mut files = Files { file: &mut file, visited: HashSet::new(), found: Vec::new() };
    files.named(&catalog)?;
    files.associated(&catalog)?;
    let attachments = files.found;
    Ok(Contents {
        title,
        author,
        producer,
        attachments,
        pages: contents,
        revisions: file.revisions(),
        annotated_pages: annotated,
    })
}

struct Pages<'f, 'b> {
    file: &'f mut File<'b>,
    visited: HashSet<u32>,
    contents: Vec<Vec<u8>>,
    annotated: usize,
}

impl Pages<'_, '_> {
    fn below(&mut self, node: Option<&Object>, depth: usize) -> Result<(), ReadError> {
        let Some(Object::Reference(number)) = node else { return Err(ReadError::Missing("pages")) };
        if !self.visited.insert(*number) || depth > DEEPEST_TREE {
            return Err(ReadError::Circle("the tree of pages"));
        }
        let node = self.file.object(*number)?.into_dictionary("page")?;
        if let Some(kids) = node.get("Kids") {
            let kids = self.file.follow(Some(kids.clone()), "pages")?.into_array("pages")?;
            return kids.iter().try_for_each(|kid| self.below(Some(kid), depth + 1));
        }
        if self.contents.len() >= MOST_PAGES {
            return Err(ReadError::TooMany("pages"));
        }
        if let Some(notes) = self.file.follow_if_there(node.get("Annots"))?
            && !matches!(&notes, Object::Array(notes) if notes.is_empty())
        {
            self.annotated += 1;
        }
        let content = self.content(node.get("Contents"))?;
        self.contents.push(content);
        Ok(())
    }

    fn content(&mut self, content: Option<&Object>) -> Result<Vec<u8>, ReadError> {
        const WHAT: &str = "content of a page";
        let parts = match content {
            None => return Ok(Vec::new()),
            Some(Object::Array(parts)) => parts.clone(),
            Some(Object::Reference(number)) => match self.file.object(*number)? {
                Object::Array(parts) => parts,
                _ => return self.file.stream(*number, WHAT),
            },
            Some(_) => return Err(ReadError::Missing(WHAT)),
        };
        let mut whole = Vec::new();
        for part in parts {
            let Object::Reference(number) = part else { return Err(ReadError::Missing(WHAT)) };
            whole.extend(self.file.stream(number, WHAT)?);
            whole.push(b'\n');
        }
        Ok(whole)
    }
}

struct Files<'f, 'b> {
    file: &'f mut File<'b>,
    visited: HashSet<u32>,
    found: Vec<Attached>,
}

impl Files<'_, '_> {
    /// Those in the tree of names.
    fn named(&mut self, catalog: &Dictionary) -> Result<(), ReadError> {
        let Some(names) = self.file.follow_if_there(catalog.get("Names"))? else { return Ok(()) };
        let names = names.into_dictionary("names")?;
        match names.get("EmbeddedFiles").cloned() {
            Some(tree) => self.below(tree, 0),
            None => Ok(()),
        }
    }

    fn below(&mut self, node: Object, depth: usize) -> Result<(), ReadError> {
        if let Object::Reference(number) = node
            && !self.visited.insert(number)
        {
            return Err(ReadError::Circle("the tree of attached files"));
        }
        if depth > DEEPEST_TREE {
            return Err(ReadError::Circle("the tree of attached files"));
        }
        let node = self.file.follow(Some(node), "names")?.into_dictionary("names")?;
        if let Some(pairs) = self.file.follow_if_there(node.get("Names"))? {
            let pairs = pairs.into_array("names")?;
            // A name, then its file; the name inside the file's own description counts.
            for file in pairs.iter().skip(1).step_by(2) {
                self.attached(file)?;
            }
        }
        if let Some(kids) = self.file.follow_if_there(node.get("Kids"))? {
            for kid in kids.into_array("names")? {
                self.below(kid, depth + 1)?;
            }
        }
        Ok(())
    }

    /// Those the document is said to be associated with, as far as no name led to them.
    fn associated(&mut self, catalog: &Dictionary) -> Result<(), ReadError> {
        let Some(list) = self.file.follow_if_there(catalog.get("AF"))? else { return Ok(()) };
        for file in list.into_array("associated files")? {
            match file {
                Object::Reference(number) if self.visited.contains(&number) => {}
                file => self.attached(&file)?,
            }
        }
        Ok(())
    }

    fn attached(&mut self, file: &Object) -> Result<(), ReadError> {
        const WHAT: &str = "attached file";
        if let Object::Reference(number) = file
            && !self.visited.insert(*number)
        {
            return Err(ReadError::Circle("two names for one attached file"));
        }
        if self.found.len() >= MOST_ATTACHMENTS {
            return Err(ReadError::TooMany("attached files"));
        }
        let described = self.file.follow(Some(file.clone()), WHAT)?.into_dictionary(WHAT)?;
        let name = match self.file.follow_if_there(described.get("UF").or(described.get("F")))? {
            Some(Object::String(name)) => text(&name),
            _ => return Err(ReadError::Missing("name of an attached file")),
        };
        let relationship = match described.get("AFRelationship") {
            Some(Object::Name(name)) => relationship(name),
            _ => None,
        };
        let embedded = self.file.follow(described.get("EF").cloned(), WHAT)?.into_dictionary(WHAT)?;
        let Some(Object::Reference(stream)) = embedded.get("UF").or(embedded.get("F")) else {
            return Err(ReadError::Missing("attached file"));
        };
        let bytes = self.file.stream(*stream, WHAT)?;
        self.found.push(Attached { name, relationship, bytes });
        Ok(())
    }
}

fn relationship(name: &[u8]) -> Option<Relationship> {
    match name {
        b"Source" => Some(Relationship::Source),
        b"Data" => Some(Relationship::Data),
        b"Alternative" => Some(Relationship::Alternative),
        b"Supplement" => Some(Relationship::Supplement),
        b"Unspecified" => Some(Relationship::Unspecified),
        _ => None,
    }
}

/// A text string: UTF-16 or UTF-8 behind a mark, or else Latin letters by their numbers (ISO 32000-1, 7.9.2.2; the few
/// places where PDFDocEncoding is not Latin-1 are left as they are).
fn text(bytes: &[u8]) -> String {
    if let Some(wide) = bytes.strip_prefix(b"\xFE\xFF") {
        let units =
            wide.chunks_exact(2).map(|pair| pair.iter().fold(0, |unit, byte| unit << 8 | u16::from(*byte)));
        char::decode_utf16(units).map(|c| c.unwrap_or(char::REPLACEMENT_CHARACTER)).collect()
    } else if let Some(utf8) = bytes.strip_prefix(b"\xEF\xBB\xBF") {
        String::from_utf8_lossy(utf8).into_owned()
    } else {
        bytes.iter().copied().map(char::from).collect()
    }
}
