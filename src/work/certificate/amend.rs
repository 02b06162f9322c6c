//! `certificate amend`: another certificate, with a number of its own, in the place of one that was issued.

use std::path::PathBuf;

use chrono::{DateTime, FixedOffset};

use super::document::{find, stated};
use super::draft::{Chosen, GivenTexts, customer_of, draft};
use super::{CertificateError, issue};
use crate::book::{Book, BookError};
use crate::certificate::content::Issue;
use crate::clock;
use crate::entry::{
    Certificate, CertificateAmends, CertificateDraft, CertificateTexts, CertifiedRun, Run, Sheet,
};
use crate::report::certificate_words::IssuedCertificate;
use crate::work::WorkError;
use crate::work::runs::{number_of, said};
use crate::work::shelf::Shelf;

/// What is asked for; what is not said stays as on the certificate before, or as its entries in the registers stand now.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct AmendRequest {
    /// The certificate.
    pub number: String,
    /// Why.
    pub why: String,
    /// What changed, where the program should not find the words itself.
    pub changed: Option<String>,
    /// The run the new one rests on, where it is another.
    pub run: Option<String>,
    /// That the new one replaces the one before, which is not to be used any more.
    pub replace: bool,
    /// The folder for the files.
    pub into: PathBuf,
    /// The paper.
    pub paper: Option<Sheet>,
    /// The run before cleaning or adjustment.
    pub as_found: Option<String>,
    /// Who authorises it.
    pub by: Option<String>,
    /// What is stated.
    pub texts: GivenTexts,
}

/// Issues the amendment.
///
/// # Errors
/// A certificate that is not there or amended already; those of issuing.
pub fn amend(shelf: &Shelf, request: &AmendRequest) -> Result<IssuedCertificate, WorkError> {
    amend_at(shelf, request, clock::now())
}

/// As [`amend`], at a stated time.
///
/// # Errors
/// Those of [`amend`].
pub(in crate::work) fn amend_at(
    shelf: &Shelf,
    request: &AmendRequest,
    at: DateTime<FixedOffset>,
) -> Result<IssuedCertificate, WorkError> {
    let why = said("--why", &request.why)?;
    let changed = request.changed.as_deref().map(|text| said("--changed", text)).transpose()?;
    let mut book = shelf.to_change()?;
    let given = find(&book, &request.number)?;
    let before = given.certificate;
    if let Some((by, _)) = given.amended_by {
        return Err(BookError::AmendedAlready { number: before.number, by }.into());
    }
    let old = stated(&book, &before)?;
    let mut draft = drafted(&book, request, &before, &old, at)?;
    if !draft.results.header.orifice.same_as(&before.draft.results.header.orifice) {
        let (found, run) = (draft.results.run, before.draft.results.run);
        let why = "a certificate and its amendment are of one orifice".to_owned();
        return Err(CertificateError::OtherOrifice { found, run, why }.into());
    }
    let what = match changed {
        Some(text) => text.to_owned(),
        None => differences(&book, &before, &old, &draft)?,
    };
    draft.amends = Some(CertificateAmends {
        number: before.number,
        replaces: request.replace,
        what,
        why: why.to_owned(),
        xml: given.files.map(|files| files.xml),
    });
    // No other process has an amendment of the same certificate: the book refuses the second.
    issue::new(&mut book, draft, &request.into, |_| Ok(()))
}

fn drafted(
    book: &Book,
    request: &AmendRequest,
    before: &Certificate,
    old: &Issue,
    at: DateTime<FixedOffset>,
) -> Result<CertificateDraft, WorkError> {
    let CertificateDraft { results, as_found, signatory, sheet, texts, .. } = &before.draft;
    // A customer that came from the orifice's entry comes from there again: that may be what was put right.
    let from_entry = (texts.customer.clone(), texts.customer_address.clone()) == customer_of(&old.item);
    let mut stood = texts.clone();
    if from_entry {
        (stood.customer, stood.customer_address) = (String::new(), String::new());
    }
    let found = request.as_found.as_deref().map(number_of).transpose()?;
    let run = request.run.as_deref().map(number_of).transpose()?;
    let chosen = Chosen {
        run: run.unwrap_or(results.run),
        as_found: found.or_else(|| as_found.as_ref().map(|of| of.run)),
        by: Some(request.by.as_deref().unwrap_or(&signatory.name)),
        sheet: request.paper.unwrap_or(*sheet),
    };
    let texts: CertificateTexts = request.texts.over(&stood)?;
    draft(book, &chosen, texts, at)
}

/// What is another than before, in words.
fn differences(
    book: &Book,
    before: &Certificate,
    old: &Issue,
    draft: &CertificateDraft,
) -> Result<String, WorkError> {
    let then = &before.draft;
    let new = stated(book, &Certificate { draft: draft.clone(), ..before.clone() })?;
    let mut all: Vec<String> = Vec::new();
    if let Some(run) = run_differs("the results", &then.results, &draft.results) {
        all.push(run);
    }
    match (&then.as_found, &draft.as_found) {
        (None, Some(now)) => all.push(format!("run {} as found was added", now.run)),
        (Some(then), None) => all.push(format!("run {} as found was taken away", then.run)),
        (Some(then), Some(now)) => all.extend(run_differs("the run as found", then, now)),
        (None, None) => {}
    }
    let shop = |issue: &Issue| {
        let shop = &issue.shop;
        (shop.name.clone(), shop.address.clone(), shop.contact.clone(), shop.statements.clone())
    };
    let look = |issue: &Issue| (issue.shop.logo.clone(), issue.shop.accent.clone());
    let item = |issue: &Issue| {
        let item = &issue.item;
        (item.description.clone(), item.serial.clone(), item.maker.clone(), item.build)
    };
    let mut part = |differs: bool, what: &str| {
        if differs {
            all.push(what.to_owned());
        }
    };
    part(old.customer != new.customer, "the customer");
    part(item(old) != item(&new) || old.without_serial != new.without_serial, "the description of the item");
    part(shop(old) != shop(&new), "the details of the shop");
    part(look(old) != look(&new), "the letterhead");
    part(old.signatory != new.signatory, "who authorises it");
    part(old.condition != new.condition, "the condition of the item on receipt");
    part(old.work_done != new.work_done, "the work on the item");
    part(old.received != new.received, "the day of receipt");
    part(old.place != new.place, "the place of the work");
    part(old.supplied != new.supplied, "what the customer supplied");
    part(old.interval != new.interval, "the interval the customer asked for");
    part(old.remarks != new.remarks, "the remarks");
    part(then.sheet != draft.sheet, "the paper");
    part(then.program != draft.program, "the version of the program");
    if all.is_empty() {
        return Ok("number, date of issue and head of the record alone".to_owned());
    }
    Ok(all.join("; "))
}

fn run_differs(what: &str, then: &CertifiedRun, now: &CertifiedRun) -> Option<String> {
    if then.run != now.run {
        return Some(format!("{what}, from run {} in the place of run {}", now.run, then.run));
    }
    // NaN is nowhere in a run that gives a result; what differs here differs in print.
    if then.header.left_out != now.header.left_out {
        return Some(format!("{what}, by points of run {} that were left out", now.run));
    }
    let plain = |run: &Run| Run { left_out: Vec::new(), ..run.clone() };
    if plain(&then.header) != plain(&now.header) {
        return Some(format!("the limits or the build {what} of run {} are stated with", now.run));
    }
    (then.before != now.before)
        .then(|| format!("the calibration before, with which run {} is compared", now.run))
}
