//! Bytes from anywhere to what is printed in them and the files they carry.
//!
//! Held to [`LONGEST_XML`] and to so many elements, levels, leaves and files, so memory stays within a few times the document: a
//! short document must not grow by the places and names that each of its leaves is given. A document
//! type is refused, and with it every entity of a document's own: nothing is expanded, nothing fetched. A processing
//! instruction is refused too, since it may ask a reader to show something else. Comments are passed over.

use std::collections::BTreeMap;

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use quick_xml::Reader;
use quick_xml::escape::resolve_predefined_entity;
use quick_xml::events::{BytesStart, Event};

use super::leaves::{PrintedLeaf, printed};

/// Longest XML that is read, in bytes.
pub const LONGEST_XML: usize = 64 << 20;
/// Elements inside one another; a certificate of ours has 17.
const DEEPEST: usize = 24;
/// Elements of a document; a certificate of ours has some thousand, and two for each point.
const MOST_ELEMENTS: usize = 50_000;
/// Attributes of an element.
const MOST_ATTRIBUTES: usize = 32;
/// Longest name of an element or attribute, in bytes.
const LONGEST_NAME: usize = 80;
/// Files inside; a certificate of ours has five at most.
const MOST_FILES: usize = 32;
/// The root.
const ROOT: &str = "dcc:digitalCalibrationCertificate";

/// Why an XML cannot be read.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum DccError {
    /// Longer than is read.
    #[error("the XML is longer than {} MB and is not read", LONGEST_XML >> 20)]
    TooLong,
    /// Not text.
    #[error("the XML is no UTF-8 text: it may be damaged, or of another encoding")]
    NotUtf8,
    /// Not well formed.
    #[error("the XML is broken at byte {at}: it may be cut off or damaged ({why})")]
    Broken {
        /// Where.
        at: u64,
        /// Why, in the words of the XML reader.
        why: String,
    },
    /// Nothing is closed.
    #[error("the XML ends before it is closed: it was cut off")]
    CutOff,
    /// A document type.
    #[error("the XML has a document type, which could hide or fetch anything: it is not read")]
    DocumentType,
    /// An entity that is not one of the five of XML.
    #[error("the XML uses the entity &{0};, which it would have to define itself: it is not read")]
    Entity(String),
    /// A processing instruction.
    #[error("the XML has a processing instruction, which no certificate needs: it is not read")]
    Instruction,
    /// Declared as something else than UTF-8.
    #[error("the XML says its encoding is {0:?}: only UTF-8 is read")]
    Encoding(String),
    /// Too deep.
    #[error("the XML has more than {DEEPEST} elements inside one another: it is not read")]
    TooDeep,
    /// Too many elements.
    #[error("the XML has more than {MOST_ELEMENTS} elements: it is not read")]
    TooMany,
    /// Too many leaves, or too long places.
    #[error("the XML has more entries than a certificate can have: it is not read")]
    TooManyLeaves,
    /// Too many files.
    #[error("the XML has more than {MOST_FILES} files inside: it is not read")]
    TooManyFiles,
    /// Another root.
    #[error("the XML is no digital calibration certificate: its root is {0:?}")]
    OtherRoot(String),
    /// Text where there should be none.
    #[error("the XML has text or a second root outside its root: it is not read")]
    Outside,
    /// One place twice.
    #[error("the XML has two entries for one place, {0:?}: it is not read")]
    Twice(String),
    /// A file that cannot be read.
    #[error("the file {0:?} inside the XML is no base64")]
    NotBase64(String),
}

/// What an XML says.
#[derive(Debug, Clone, PartialEq)]
pub struct Received {
    /// What is printed, by path.
    pub leaves: BTreeMap<String, PrintedLeaf>,
    /// The files inside, in their order.
    pub files: Vec<ReceivedFile>,
}

/// A file inside.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ReceivedFile {
    /// Its name as given; data, and no path.
    pub name: String,
    /// Its bytes.
    pub bytes: Vec<u8>,
}

/// An element as it was read.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Parsed {
    /// Name with its prefix.
    pub name: String,
    /// Attributes with their values.
    pub attributes: Vec<(String, String)>,
    /// Elements inside.
    pub children: Vec<Parsed>,
    /// Text right inside.
    pub text: String,
}

/// Reads an XML.
///
/// # Errors
/// Every [`DccError`].
pub fn read(bytes: &[u8]) -> Result<Received, DccError> {
    let root = parsed(bytes)?;
    let mut files = Vec::new();
    collect(&root, &mut files)?;
    Ok(Received { leaves: printed(&root)?, files })
}

fn collect(element: &Parsed, files: &mut Vec<ReceivedFile>) -> Result<(), DccError> {
    if let Some(data) = element.children.iter().find(|child| child.name == "dcc:dataBase64") {
        let name = element.children.iter().find(|child| child.name == "dcc:fileName");
        let name = name.map(|child| child.text.clone()).unwrap_or_default();
        let bytes = decoded(&data.text);
        let bytes = bytes.ok_or_else(|| DccError::NotBase64(name.chars().take(60).collect()))?;
        if files.len() >= MOST_FILES {
            return Err(DccError::TooManyFiles);
        }
        files.push(ReceivedFile { name, bytes });
    }
    element.children.iter().try_for_each(|child| collect(child, files))
}

/// Base64 with white space in it, decoded.
pub(super) fn decoded(text: &str) -> Option<Vec<u8>> {
    let plain: Vec<u8> = text.bytes().filter(|b| !b.is_ascii_whitespace()).collect();
    STANDARD.decode(plain).ok()
}

fn parsed(bytes: &[u8]) -> Result<Parsed, DccError> {
    if bytes.len() > LONGEST_XML {
        return Err(DccError::TooLong);
    }
    let text = std::str::from_utf8(bytes).map_err(|_| DccError::NotUtf8)?;
    let mut reader = Reader::from_str(text.trim_start_matches('\u{FEFF}'));
    reader.config_mut().expand_empty_elements = true;
    reader.config_mut().check_end_names = true;
    let mut build = Build::default();
    loop {
        let event = reader.read_event().map_err(|error| DccError::Broken {
            at: reader.error_position(),
            why: error.to_string().chars().take(120).collect(),
        })?;
        match event {
            Event::Eof => break,
            Event::DocType(_) => return Err(DccError::DocumentType),
            Event::PI(_) => return Err(DccError::Instruction),
            Event::Comment(_) => {}
            Event::Decl(declaration) => {
                if let Some(Ok(encoding)) = declaration.encoding()
                    && !encoding.eq_ignore_ascii_case("UTF-8")
                {
                    return Err(DccError::Encoding(encoding.chars().take(40).collect()));
                }
            }
            Event::Start(start) => build.open(element(&start, reader.buffer_position())?)?,
            Event::Empty(start) => {
                build.open(element(&start, reader.buffer_position())?)?;
                build.close()?;
            }
            Event::End(_) => build.close()?,
            Event::Text(text) => build.text(&text.xml10_content())?,
            Event::CData(text) => build.text(&text.xml10_content())?,
            Event::GeneralRef(name) => {
                let unknown = || DccError::Entity(name.chars().take(40).collect());
                if name.is_char_ref() {
                    let c = name.resolve_char_ref().ok().flatten().ok_or_else(unknown)?;
                    build.text(c.encode_utf8(&mut [0; 4]))?;
                } else {
                    build.text(resolve_predefined_entity(&name).ok_or_else(unknown)?)?;
                }
            }
        }
    }
    match (build.open.is_empty(), build.root) {
        (true, Some(root)) => Ok(root),
        _ => Err(DccError::CutOff),
    }
}

/// What was read so far.
#[derive(Default)]
struct Build {
    open: Vec<Parsed>,
    root: Option<Parsed>,
    elements: usize,
}

impl Build {
    fn open(&mut self, element: Parsed) -> Result<(), DccError> {
        self.elements += 1;
        if self.elements > MOST_ELEMENTS {
            return Err(DccError::TooMany);
        }
        if self.open.len() >= DEEPEST {
            return Err(DccError::TooDeep);
        }
        if self.open.is_empty() {
            if self.root.is_some() {
                return Err(DccError::Outside);
            }
            if element.name != ROOT {
                return Err(DccError::OtherRoot(element.name.chars().take(60).collect()));
            }
        }
        self.open.push(element);
        Ok(())
    }

    fn close(&mut self) -> Result<(), DccError> {
        let done = self.open.pop().ok_or(DccError::Outside)?;
        match self.open.last_mut() {
            Some(parent) => parent.children.push(done),
            None => self.root = Some(done),
        }
        Ok(())
    }

    fn text(&mut self, text: &str) -> Result<(), DccError> {
        match self.open.last_mut() {
            Some(element) => element.text.push_str(text),
            None if text.trim().is_empty() => {}
            None => return Err(DccError::Outside),
        }
        Ok(())
    }
}

fn element(start: &BytesStart<'_>, at: u64) -> Result<Parsed, DccError> {
    let broken = |why: String| DccError::Broken { at, why: why.chars().take(120).collect() };
    if start.name().as_ref().len() > LONGEST_NAME {
        return Err(broken(format!("a name of more than {LONGEST_NAME} bytes")));
    }
    let mut attributes = Vec::new();
    for attribute in start.attributes() {
        let attribute = attribute.map_err(|error| broken(error.to_string()))?;
        if attributes.len() >= MOST_ATTRIBUTES {
            return Err(broken(format!("more than {MOST_ATTRIBUTES} attributes")));
        }
        if attribute.key.as_ref().len() > LONGEST_NAME {
            return Err(broken(format!("a name of more than {LONGEST_NAME} bytes")));
        }
        let value = attribute
            .normalized_value(quick_xml::XmlVersion::Implicit1_0)
            .map_err(|error| broken(error.to_string()))?;
        attributes.push((attribute.key.as_ref().to_owned(), value.into_owned()));
    }
    Ok(Parsed {
        name: start.name().as_ref().to_owned(),
        attributes,
        children: Vec::new(),
        text: String::new(),
    })
}
