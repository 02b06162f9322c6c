//! `certificate issue`: a number and two files, or the same again.

use std::fs;
use std::path::{Path, PathBuf};

use chrono::{DateTime, FixedOffset};

use super::CertificateError;
use super::document::{Made, content, digest, hex, make};
use super::draft::{Chosen, GivenTexts, draft, run_named};
use crate::book::{Book, CertificateFiles, GivenCertificate};
use crate::certificate::pages;
use crate::clock;
use crate::entry::{Certificate, CertificateDraft, CertificateTexts, RunNumber, Sheet};
use crate::report::certificate_words::{IssuedCertificate, IssuedFile};
use crate::report::layout::WIDTH;
use crate::work::WorkError;
use crate::work::output::{make_folder, write_whole};
use crate::work::runs::number_of;
use crate::work::shelf::{Shelf, stamped};

/// What is asked for.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct IssueRequest {
    /// The run, or the number of a certificate to have again.
    pub run: String,
    /// The folder for the files.
    pub into: PathBuf,
    /// The paper; A4 unless it was issued on another.
    pub paper: Option<Sheet>,
    /// The run before cleaning or adjustment.
    pub as_found: Option<String>,
    /// Who authorises it.
    pub by: Option<String>,
    /// What is stated.
    pub texts: GivenTexts,
}

/// Issues the certificate of a run, or makes the files of the one there is again.
///
/// # Errors
/// Everything that keeps it from being issued, at once, with no number used; a folder or a book that cannot be written.
pub fn issue(shelf: &Shelf, request: &IssueRequest) -> Result<IssuedCertificate, WorkError> {
    issue_at(shelf, request, clock::now())
}

/// As [`issue`], at a stated time.
///
/// # Errors
/// Those of [`issue`].
pub(in crate::work) fn issue_at(
    shelf: &Shelf,
    request: &IssueRequest,
    at: DateTime<FixedOffset>,
) -> Result<IssuedCertificate, WorkError> {
    let mut book = shelf.to_change()?;
    match there(&book, &request.run)? {
        Issuable::Again(given) => {
            agrees(request, &given.certificate)?;
            again(&mut book, *given, &request.into)
        }
        Issuable::New(run) => {
            let draft = drafted(&book, request, run, at)?;
            new(&mut book, draft, &request.into, |given| agrees(request, given))
        }
    }
}

/// The text of the document as it would print; nothing is recorded.
///
/// # Errors
/// Those of [`issue`] but for writing.
pub fn look(shelf: &Shelf, request: &IssueRequest) -> Result<String, WorkError> {
    let book = shelf.to_read()?;
    let certificate = match there(&book, &request.run)? {
        Issuable::Again(given) => {
            agrees(request, &given.certificate)?;
            given.certificate
        }
        Issuable::New(run) => book.number_in_sight(drafted(&book, request, run, clock::now())?)?,
    };
    // What keeps it from being issued is said here as there, in full.
    make(&book, &certificate)?;
    Ok(pages::text(&content(&book, &certificate)?, WIDTH))
}

enum Issuable {
    New(RunNumber),
    Again(Box<GivenCertificate>),
}

/// What a run or a number stands for.
fn there(book: &Book, named: &str) -> Result<Issuable, WorkError> {
    let found = match run_named(named) {
        Some(run) => {
            // One that is not there is refused as such, not for want of a certificate.
            book.run(run)?;
            match book.certificate_of_run(run)? {
                None => return Ok(Issuable::New(run)),
                found => found,
            }
        }
        None => book.certificate(named)?,
    };
    let none = || CertificateError::NoSuch(named.chars().take(60).collect());
    Ok(Issuable::Again(Box::new(found.ok_or_else(none)?)))
}

fn drafted(
    book: &Book,
    request: &IssueRequest,
    run: RunNumber,
    at: DateTime<FixedOffset>,
) -> Result<CertificateDraft, WorkError> {
    let chosen = Chosen {
        run,
        as_found: request.as_found.as_deref().map(number_of).transpose()?,
        by: request.by.as_deref(),
        sheet: request.paper.unwrap_or(Sheet::A4),
    };
    draft(book, &chosen, request.texts.over(&CertificateTexts::default())?, at)
}

/// Refuses an option that is another than the certificate was issued with.
fn agrees(request: &IssueRequest, certificate: &Certificate) -> Result<(), WorkError> {
    let CertificateDraft { results, as_found, signatory, sheet, texts, .. } = &certificate.draft;
    let found = request.as_found.as_deref().map(number_of).transpose()?;
    let same_name = |by: &String| by.trim().to_lowercase() == signatory.name.to_lowercase();
    let said = request.texts.over(texts)?;
    let what = if request.paper.is_some_and(|paper| paper != *sheet) {
        "--paper"
    } else if found.is_some() && found != as_found.as_ref().map(|of| of.run) {
        "--as-found"
    } else if !request.by.as_ref().is_none_or(same_name) {
        "--by"
    } else if said != *texts {
        "statement"
    } else {
        return Ok(());
    };
    let (run, number) = (results.run, certificate.number.clone());
    Err(CertificateError::IssuedOtherwise { run, number, what }.into())
}

/// Gives out a number and writes the files. `agrees` is asked where another process was faster with the same run.
pub(super) fn new(
    book: &mut Book,
    draft: CertificateDraft,
    into: &Path,
    agrees: impl FnOnce(&Certificate) -> Result<(), WorkError>,
) -> Result<IssuedCertificate, WorkError> {
    // Everything that can go wrong goes wrong with the number in sight, before it is used.
    let (in_sight, made) = loop {
        let in_sight = book.number_in_sight(draft.clone())?;
        let made = make(book, &in_sight)?;
        make_folder(into)?;
        match not_another(into, &made) {
            Ok(()) => break (in_sight, made),
            // Another process may have taken the number meanwhile, and the file is its own.
            Err(_) if book.number_in_sight(draft.clone())?.number != in_sight.number => {}
            Err(refused) => return Err(refused),
        }
    };
    let given = stamped(|stamp| book.give_number(draft.clone(), stamp))??;
    if given.draft != draft {
        agrees(&given)?;
    }
    let made = if given == in_sight { made } else { make(book, &given)? };
    write(book, &given, &made, into, None)
}

/// Makes the files of a certificate again.
fn again(book: &mut Book, given: GivenCertificate, into: &Path) -> Result<IssuedCertificate, WorkError> {
    let GivenCertificate { certificate, files, amended_by } = given;
    let made = make(book, &certificate)?;
    let now = digests(&made);
    if files.is_some_and(|files| files != now) {
        let (number, program) = (certificate.number, certificate.draft.program);
        return Err(CertificateError::OtherBytes { number, program }.into());
    }
    make_folder(into)?;
    let mut issued = write(book, &certificate, &made, into, Some(files.is_some()))?;
    issued.amended_by = amended_by;
    Ok(issued)
}

fn digests(made: &Made) -> CertificateFiles {
    CertificateFiles { pdf: digest(&made.files.pdf), xml: digest(&made.files.xml) }
}

/// `there` says, of a certificate there was, whether its files had been written.
fn write(
    book: &mut Book,
    certificate: &Certificate,
    made: &Made,
    into: &Path,
    there: Option<bool>,
) -> Result<IssuedCertificate, WorkError> {
    not_another(into, made)?;
    let digests = digests(made);
    let mut files = Vec::new();
    for (path, bytes, sha256) in [
        (path_of(into, made, "pdf"), &made.files.pdf, digests.pdf),
        (path_of(into, made, "xml"), &made.files.xml, digests.xml),
    ] {
        write_whole(&path, bytes)?;
        files.push(IssuedFile { path: path.display().to_string(), sha256: hex(&sha256) });
    }
    stamped(|stamp| book.note_files(&certificate.number, digests, stamp))??;
    let draft = &certificate.draft;
    Ok(IssuedCertificate {
        number: certificate.number.clone(),
        run: draft.results.run,
        as_found: draft.as_found.as_ref().map(|found| found.run),
        orifice: draft.results.header.orifice.to_string(),
        verdict: made.verdict,
        signatory: draft.signatory.name.clone(),
        paper: draft.sheet.name(),
        issued: draft.issued,
        amends: draft.amends.as_ref().map(|amends| (amends.number.clone(), amends.replaces)),
        what_changed: draft.amends.as_ref().map(|amends| amends.what.clone()),
        amended_by: None,
        there,
        files,
    })
}

fn path_of(into: &Path, made: &Made, ending: &str) -> PathBuf {
    into.join(format!("{}.{ending}", made.files.file_stem))
}

/// Refuses a folder that has another file under one of the names.
fn not_another(into: &Path, made: &Made) -> Result<(), WorkError> {
    for (ending, bytes) in [("pdf", &made.files.pdf), ("xml", &made.files.xml)] {
        let path = path_of(into, made, ending);
        let Ok(about) = fs::metadata(&path) else { continue };
        if !about.is_file() {
            continue;
        }
        let same = about.len() == bytes.len() as u64 && fs::read(&path).is_ok_and(|there| there == *bytes);
        if !same {
            let why = "is there already and is another file, which stays; for the folder (--into)";
            return Err(WorkError::NotReplaced { path, why: why.to_owned() });
        }
    }
    Ok(())
}
