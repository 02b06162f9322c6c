//! The document of a certificate, made of its record.

use super::CertificateError;
use crate::bench::history::Accepted;
use crate::bench::{Analysis, METHOD_REVISION, Questions};
use crate::book::{Book, BookError, Head};
use crate::certificate::content::{
    Amendment, Content, Customer, Issue, Measured, country_of, of as content_of,
};
use crate::certificate::paper::Paper;
use crate::certificate::{Issued, issue};
use crate::entry::{Certificate, CertifiedRun, Orifice, Sheet};
use crate::record::hidden_character;
use crate::work::WorkError;
use crate::work::runs::{LoadedRun, accepted};

/// What the certificate says, whole.
///
/// # Errors
/// A certificate of another method; a run that cannot be analysed; a book that cannot be read.
pub(super) fn content(book: &Book, certificate: &Certificate) -> Result<Content, WorkError> {
    let draft = &certificate.draft;
    if draft.method_revision != METHOD_REVISION {
        return Err(CertificateError::OtherMethod {
            number: certificate.number.clone(),
            method: draft.method_revision,
            program: draft.program.clone(),
        }
        .into());
    }
    let stated = stated(book, certificate)?;
    let results = Taken::of(book, &draft.results)?;
    let as_found = draft.as_found.as_ref().map(|found| Taken::of(book, found)).transpose()?;
    let found = as_found.as_ref().map(Taken::measured);
    Ok(content_of(&stated, &results.measured(), found.as_ref()))
}

/// A certificate in both forms.
pub(super) struct Made {
    /// The files.
    pub(super) files: Issued,
    /// What the run was judged to be, in a word.
    pub(super) verdict: &'static str,
}

/// Both forms of the certificate.
///
/// # Errors
/// Those of [`content`]; everything that keeps it from being issued, at once.
pub(super) fn make(book: &Book, certificate: &Certificate) -> Result<Made, WorkError> {
    let content = content(book, certificate)?;
    let verdict = content.results.conformity.as_ref().map_or("none", |conformity| conformity.word);
    let files = issue(&content, paper(certificate.draft.sheet)).map_err(|problems| {
        let says = problems.iter().map(|problem| visible(&problem.to_string())).collect();
        WorkError::from(CertificateError::Incomplete(says))
    })?;
    Ok(Made { files, verdict })
}

/// A sentence with what hides in it made visible: names of files and people stand in it as they were given.
fn visible(text: &str) -> String {
    let hidden = |c: char| hidden_character(c.encode_utf8(&mut [0; 4])).is_some();
    text.chars().map(|c| if hidden(c) { '\u{FFFD}' } else { c }).collect()
}

const fn paper(sheet: Sheet) -> Paper {
    match sheet {
        Sheet::A4 => Paper::A4,
        Sheet::Letter => Paper::Letter,
    }
}

/// What is stated, as the certificate's record and the revisions it names have it.
pub(super) fn stated(book: &Book, certificate: &Certificate) -> Result<Issue, WorkError> {
    let draft = &certificate.draft;
    let texts = &draft.texts;
    let shop = book.shop_revision(draft.shop_revision)?.ok_or(WorkError::NoShop)?.entry;
    let orifice = &draft.results.header.orifice;
    let item = book.revision::<Orifice>(orifice, draft.orifice_revision)?;
    let mut item = item.ok_or_else(|| WorkError::NoOrifice(orifice.clone()))?.entry;
    // The run has the register's build, or its own where the register knows none.
    item.build = draft.results.header.build;
    let (seq, link) = certificate.head;
    Ok(Issue {
        number: certificate.number.clone(),
        program: draft.program.clone(),
        issued: draft.issued,
        signatory: draft.signatory.clone(),
        country: country_of(&shop.address).unwrap_or_default().to_owned(),
        shop,
        customer: Customer {
            name: texts.customer.clone(),
            address: texts.customer_address.clone(),
            contact: None,
        },
        item,
        without_serial: texts.without_serial,
        condition: texts.condition.clone(),
        work_done: texts.work_done.clone(),
        received: texts.received,
        place: texts.place.clone(),
        supplied: texts.supplied.clone(),
        interval: texts.interval.clone(),
        chain_head: Some(Head { seq, link }.to_string()),
        amends: draft.amends.as_ref().map(|amends| Amendment {
            replaces: amends.number.clone(),
            instead: amends.replaces,
            what: amends.what.clone(),
            why: amends.why.clone(),
            digest: amends.xml.map(|digest| hex(&digest)),
        }),
        remarks: texts.remarks.clone(),
    })
}

/// A digest in hexadecimal.
pub(super) fn hex(digest: &[u8; 32]) -> String {
    digest.iter().map(|byte| format!("{byte:02x}")).collect()
}

/// SHA-256 of the content of a file.
pub(super) fn digest(bytes: &[u8]) -> [u8; 32] {
    use sha2::{Digest as _, Sha256};
    Sha256::digest(bytes).into()
}

/// A run as it stood at issue, with what comes of it.
struct Taken {
    name: String,
    loaded: LoadedRun,
    analysis: Analysis,
}

impl Taken {
    fn of(book: &Book, certified: &CertifiedRun) -> Result<Self, WorkError> {
        // The readings of a complete run never change; everything around them is as the certificate has it.
        let readings = book.run(certified.run)?.run.readings;
        let run = crate::entry::Run { readings, ..certified.header.clone() };
        let before = certified.before.as_ref();
        let before = before.map(|(number, figures)| (*number, accepted(*number, figures)));
        let loaded = LoadedRun { number: certified.run, run, before };
        let analysis = loaded.analyse(&Questions::default())?;
        Ok(Self { name: certified.run.to_string(), loaded, analysis })
    }

    fn before(&self) -> Option<&Accepted> {
        self.loaded.comparable()
    }

    fn measured(&self) -> Measured<'_> {
        Measured {
            name: &self.name,
            run: &self.loaded.run,
            analysis: &self.analysis,
            before: self.before(),
            files: None,
        }
    }
}

/// The certificate of a number, or a sentence that says there is none.
pub(super) fn find(book: &Book, number: &str) -> Result<crate::book::GivenCertificate, WorkError> {
    book.certificate(number)?.ok_or_else(|| {
        BookError::NoSuchCertificate {
            path: book.path().to_owned(),
            number: visible(&number.chars().take(60).collect::<String>()),
        }
        .into()
    })
}
