//! `certificate check`: a PDF or an XML from anywhere, computed again from what is inside.
//!
//! A book that is there is asked whether it gave out the number and whether these are the bytes it issued; none is made.

use std::fs::File;
use std::io::{ErrorKind, Read as _};
use std::path::Path;

use super::CertificateError;
use super::document::digest;
use crate::book::{BookError, GivenCertificate};
use crate::certificate::compare::{Difference, Findings, Outcome as Found, Pages, What};
use crate::certificate::{Checked, check as check_bytes};
use crate::report::certificate_words::{CheckedCertificate, Finding, Here, Outcome, PagesCompared};
use crate::report::typed::tame;
use crate::work::WorkError;
use crate::work::shelf::Shelf;

/// Most megabytes of a file that are read.
const LARGEST_MB: u64 = 64;

/// Checks a file; `shelf` is where a book may be.
///
/// # Errors
/// A file that is not there, too large, or holds nothing to compute again; a book that is there and cannot be read.
pub fn check(shelf: Option<&Shelf>, file: &Path) -> Result<CheckedCertificate, WorkError> {
    let bytes = read(file)?;
    let name = tame(&file.display().to_string());
    let checked = check_bytes(&bytes, &name).map_err(CertificateError::from)?;
    let findings = &checked.findings;
    let here = match shelf {
        None => Here::NoBook,
        Some(shelf) => here(shelf, &bytes, &checked)?,
    };
    Ok(said(name, findings, here))
}

/// The file's bytes, if it is not beyond what any certificate has.
fn read(path: &Path) -> Result<Vec<u8>, WorkError> {
    let unreadable = |error: &std::io::Error| CertificateError::Unreadable {
        path: path.to_owned(),
        says: match error.kind() {
            ErrorKind::NotFound => "there is no such file".to_owned(),
            ErrorKind::IsADirectory => "it is a folder".to_owned(),
            _ => error.to_string(),
        },
    };
    let file = File::open(path).map_err(|error| unreadable(&error))?;
    let about = file.metadata().map_err(|error| unreadable(&error))?;
    if about.is_dir() {
        return Err(unreadable(&ErrorKind::IsADirectory.into()).into());
    }
    let most = LARGEST_MB << 20;
    let too_large = |bytes| CertificateError::TooLarge { path: path.to_owned(), bytes, limit: LARGEST_MB };
    if about.len() > most {
        return Err(too_large(about.len()).into());
    }
    // What is no plain file may have no length beforehand.
    let mut bytes = Vec::new();
    file.take(most + 1).read_to_end(&mut bytes).map_err(|error| unreadable(&error))?;
    if bytes.len() as u64 > most {
        return Err(too_large(bytes.len() as u64).into());
    }
    Ok(bytes)
}

/// What the book says of it, if there is one.
fn here(shelf: &Shelf, bytes: &[u8], checked: &Checked) -> Result<Here, WorkError> {
    let Checked { findings, xml, again } = checked;
    let book = match shelf.to_read() {
        Ok(book) => book,
        Err(WorkError::Book(BookError::NoBook { .. })) => return Ok(Here::NoBook),
        Err(error) => return Err(error),
    };
    let Some(GivenCertificate { files, amended_by, .. }) = book.certificate(&findings.number)? else {
        let ours = book.shop()?.zip(again.as_ref());
        let our_name = ours.is_some_and(|(ours, theirs)| ours.entry.name == theirs.issue.shop.name);
        return Ok(Here::Unknown { our_name });
    };
    let Some(files) = files else { return Ok(Here::Unfinished) };
    let same = digest(xml) == files.xml && (bytes.len() == xml.len() || digest(bytes) == files.pdf);
    Ok(if same { Here::Unchanged { amended_by } } else { Here::Differs })
}

fn said(file: String, findings: &Findings, here: Here) -> CheckedCertificate {
    let mut all: Vec<Finding> = findings.differences.iter().map(finding).collect();
    let mut outcome = match &findings.outcome {
        Found::Holds => Outcome::Holds,
        Found::DoesNotHold => Outcome::DoesNotHold,
        Found::NotChecked { method, program } => {
            Outcome::NotChecked { method: *method, program: tame(&short(program)) }
        }
    };
    if here == Here::Differs {
        // Consistent with itself or not: it is not what was issued under its number.
        outcome = Outcome::DoesNotHold;
        all.insert(
            0,
            Finding {
                what: "the file".to_owned(),
                printed: None,
                recomputed: None,
                says: "this book issued another file under this number".to_owned(),
            },
        );
    }
    CheckedCertificate {
        file,
        number: tame(&short(&findings.number)),
        outcome,
        findings: all,
        more: findings.more,
        numbers: findings.numbers,
        texts: findings.texts,
        files: findings.files,
        wordings: findings.wordings,
        pages: match findings.pages {
            Pages::None => PagesCompared::None,
            Pages::Same => PagesCompared::Same,
            Pages::Differ => PagesCompared::Differ,
            Pages::OtherProgram => PagesCompared::OtherProgram,
        },
        here,
    }
}

fn finding(difference: &Difference) -> Finding {
    let text = |text: &str| Some(tame(&short(text)));
    let (printed, recomputed) = match &difference.what {
        What::Number { printed, recomputed } | What::Text { printed, recomputed } => {
            (text(printed), text(recomputed))
        }
        What::Missing { recomputed } => (None, text(recomputed)),
        What::NotExpected { printed } => (text(printed), None),
        _ => (None, None),
    };
    let says = tame(&difference.to_string());
    let what = if difference.words.is_empty() { says.clone() } else { tame(&difference.words) };
    Finding { what, printed, recomputed, says }
}

/// A text of somebody else's, no longer than a sentence.
fn short(text: &str) -> String {
    const LONGEST: usize = 160;
    let mut short: String = text.chars().take(LONGEST).collect();
    if text.chars().nth(LONGEST).is_some() {
        short.push('…');
    }
    short
}
