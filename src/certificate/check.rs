//! A certificate of either form, from anywhere, checked.
//!
//! Comes in: bytes. Goes out: [`Findings`]. An XML is compared with what comes of the files inside it ([`super::compare`]). Of
//! a PDF the XML it carries is; every attached file must be the one inside that XML; and the whole PDF must be the one that is
//! made of the same content by the same version of the program, to the byte, since only equal bytes are equal pages for
//! certain. Where another version made it the pages are not compared, and that is said.

use super::compare::{CompareError, Compared, Difference, Findings, Pages, What, compare};
use super::content::{Content, VERSION};
use super::paper::{self, Paper, read};
use super::{dcc, pages};

/// Why nothing can be said of a file.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum CheckError {
    /// Neither form.
    #[error("{0}: this is neither a PDF nor an XML certificate")]
    Neither(String),
    /// A PDF that cannot be read.
    #[error("{name}: {error}")]
    Pdf {
        /// The file.
        name: String,
        /// Why.
        error: read::ReadError,
    },
    /// A PDF without its XML.
    #[error(
        "{0}: there is no XML inside the PDF, so there is nothing to compute again: ask for the certificate with its files"
    )]
    NoXml(String),
    /// More than one XML.
    #[error("{0}: there are several XML files inside the PDF, and a certificate has one")]
    SeveralXml(String),
    /// An XML that cannot be read, or one without readings.
    #[error("{name}: {error}")]
    Compare {
        /// The file.
        name: String,
        /// Why.
        error: CompareError,
    },
}

/// What was checked.
#[derive(Debug, Clone, PartialEq)]
pub struct Checked {
    /// What was found.
    pub findings: Findings,
    /// The XML: the file itself, or the one inside the PDF. The book compares it with what it issued.
    pub xml: Vec<u8>,
    /// The content made again, where that was possible.
    pub again: Option<Content>,
}

/// Checks a certificate; `name` is only for sentences, the form shows in the bytes.
///
/// # Errors
/// One that cannot be read, or that holds nothing to compute again.
pub fn check(bytes: &[u8], name: &str) -> Result<Checked, CheckError> {
    if bytes.starts_with(b"%PDF-") {
        return pdf(bytes, name);
    }
    let begins = bytes.iter().find(|byte| !byte.is_ascii_whitespace());
    let marked = bytes.starts_with(b"\xEF\xBB\xBF");
    if begins != Some(&b'<') && !marked {
        return Err(CheckError::Neither(name.to_owned()));
    }
    let compared = compared(bytes, name)?;
    Ok(Checked { findings: compared.findings, xml: bytes.to_vec(), again: compared.again })
}

fn compared(xml: &[u8], name: &str) -> Result<Compared, CheckError> {
    compare(xml).map_err(|error| CheckError::Compare { name: name.to_owned(), error })
}

fn pdf(bytes: &[u8], name: &str) -> Result<Checked, CheckError> {
    let inside = read::read(bytes).map_err(|error| CheckError::Pdf { name: name.to_owned(), error })?;
    let is_xml = |file: &&read::Attached| file.name.to_ascii_lowercase().ends_with(".xml");
    let mut all_xml = inside.attachments.iter().filter(is_xml);
    let xml = match (all_xml.next(), all_xml.next()) {
        (Some(one), None) => one,
        (None, _) => return Err(CheckError::NoXml(name.to_owned())),
        (Some(_), Some(_)) => return Err(CheckError::SeveralXml(name.to_owned())),
    };
    let Compared { mut findings, again, received } = compared(&xml.bytes, name)?;
    // Attachments against the XML: same names, same bytes, each once.
    for file in &received.files {
        match inside.attachments.iter().find(|attached| attached.name == file.name) {
            None => findings.differ(Difference::of_file(&file.name, What::AttachmentMissing)),
            Some(attached) if attached.bytes != file.bytes => {
                findings.differ(Difference::of_file(&file.name, What::AttachmentDiffers));
            }
            Some(_) => {}
        }
    }
    for (i, attached) in inside.attachments.iter().enumerate() {
        let twice = inside.attachments.iter().take(i).any(|other| other.name == attached.name);
        let known = received.files.iter().any(|file| file.name == attached.name);
        if attached.name != xml.name && (!known || twice) {
            findings.differ(Difference::of_file(&attached.name, What::AttachmentUnknown));
        }
    }
    if inside.revisions > 1 {
        findings.differ(Difference::whole(What::WrittenOn));
    }
    if let Some(content) = &again {
        findings.pages = if content.issue.program != VERSION {
            Pages::OtherProgram
        } else if [Paper::A4, Paper::Letter].into_iter().any(|sheet| set_again(content, sheet, bytes)) {
            Pages::Same
        } else {
            findings.differ(Difference::whole(What::Pages));
            Pages::Differ
        };
    }
    Ok(Checked { findings, xml: xml.bytes.clone(), again })
}

/// Whether the same content on that paper is the same file.
fn set_again(content: &Content, sheet: Paper, bytes: &[u8]) -> bool {
    let xml = dcc::write(content);
    paper::render(&pages::document(content, sheet, &xml)).is_ok_and(|again| again == bytes)
}
