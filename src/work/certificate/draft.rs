//! What a certificate is made of, gathered from the book and from what was said.

use chrono::{DateTime, FixedOffset, NaiveDate, Timelike as _};

use super::CertificateError;
use crate::bench::{METHOD_REVISION, Questions};
use crate::book::{Book, BookError, RunState};
use crate::certificate::content::VERSION;
use crate::entry::{
    CertificateDraft, CertificateTexts, CertifiedRun, Orifice, Readings, Run, RunNumber, Sheet, Shop,
    Signatory,
};
use crate::work::WorkError;
use crate::work::runs::{LoadedRun, figures, load, said, stored_verdict};

/// What somebody said of one certificate; nothing of it where nothing was said.
#[derive(Debug, Clone, Default, PartialEq, Eq)]
pub struct GivenTexts {
    /// Customer with address, the parts behind commas or semicolons; else the one of the orifice's entry.
    pub customer: Option<String>,
    /// That the item bears no serial number.
    pub without_serial: bool,
    /// Condition of the item as it came.
    pub condition: Option<String>,
    /// What was done to the item between the runs.
    pub work: Option<String>,
    /// Day of receipt.
    pub received: Option<String>,
    /// Where the work was done.
    pub place: Option<String>,
    /// What the customer supplied.
    pub supplied: Vec<String>,
    /// The interval the customer asked for.
    pub interval: Option<String>,
    /// Further sentences.
    pub remarks: Vec<String>,
}

impl GivenTexts {
    /// What was said, over what stood before.
    ///
    /// # Errors
    /// Empty texts, such with characters that hide, and a day that is none.
    pub(super) fn over(&self, before: &CertificateTexts) -> Result<CertificateTexts, WorkError> {
        let one = |option: &'static str, given: &Option<String>, stood: &Option<String>| {
            let given = given.as_deref().map(|text| said(option, text).map(str::to_owned)).transpose()?;
            Ok::<_, WorkError>(given.or_else(|| stood.clone()))
        };
        let many = |option: &'static str, given: &[String], stood: &[String]| {
            let given: Vec<String> =
                given.iter().map(|text| said(option, text).map(str::to_owned)).collect::<Result<_, _>>()?;
            Ok::<_, WorkError>(if given.is_empty() { stood.to_vec() } else { given })
        };
        let day =
            |text: &String| text.trim().parse::<NaiveDate>().map_err(|_| CertificateError::Day(text.clone()));
        let (customer, customer_address) = match &self.customer {
            Some(text) => customer(said("--customer", text)?),
            None => (before.customer.clone(), before.customer_address.clone()),
        };
        Ok(CertificateTexts {
            customer,
            customer_address,
            without_serial: self.without_serial || before.without_serial,
            condition: one("--condition", &self.condition, &before.condition)?,
            work_done: one("--work", &self.work, &before.work_done)?,
            received: self.received.as_ref().map(day).transpose()?.or(before.received),
            place: one("--place", &self.place, &before.place)?,
            supplied: many("--supplied", &self.supplied, &before.supplied)?,
            interval: one("--interval", &self.interval, &before.interval)?,
            remarks: many("--remark", &self.remarks, &before.remarks)?,
        })
    }
}

/// Name and address in a text of one line: parts behind semicolons where there are any, else behind commas.
pub(super) fn customer(text: &str) -> (String, String) {
    let mark = if text.contains(';') { ';' } else { ',' };
    let mut parts = text.split(mark).map(str::trim).filter(|part| !part.is_empty());
    let name = parts.next().unwrap_or_default().to_owned();
    (name, parts.collect::<Vec<_>>().join("\n"))
}

/// The customer in the orifice's entry.
pub(super) fn customer_of(orifice: &Orifice) -> (String, String) {
    orifice.customer.as_deref().map(customer).unwrap_or_default()
}

/// What is chosen for a certificate beside its texts.
pub(super) struct Chosen<'a> {
    pub(super) run: RunNumber,
    pub(super) as_found: Option<RunNumber>,
    pub(super) by: Option<&'a str>,
    pub(super) sheet: Sheet,
}

/// A certificate without its number. `texts` comes with the customer empty where the orifice's entry names it.
///
/// # Errors
/// A run that is open, not judged or changed since; a run as found of another orifice or not before it; a shop of which nothing
/// is said; a signatory who is none.
pub(super) fn draft(
    book: &Book,
    chosen: &Chosen<'_>,
    mut texts: CertificateTexts,
    at: DateTime<FixedOffset>,
) -> Result<CertificateDraft, WorkError> {
    let results = judged(book, chosen.run)?;
    let as_found = chosen.as_found.map(|found| before_the_work(book, found, &results)).transpose()?;
    let shop = book.shop()?.ok_or(WorkError::NoShop)?;
    let orifice = &results.run.orifice;
    let item = book.entry::<Orifice>(orifice)?.ok_or_else(|| WorkError::NoOrifice(orifice.clone()))?;
    if texts.customer.is_empty() {
        (texts.customer, texts.customer_address) = customer_of(&item.entry);
    }
    // The bench says in which offset the shop lives: its clock, not that of the machine, tells the day of issue.
    let issued = at.with_timezone(results.run.taken.offset());
    let signatory = signatory(&shop.entry, chosen.by)?;
    Ok(CertificateDraft {
        issued: issued.with_nanosecond(0).unwrap_or(issued),
        results: certified(book, results)?,
        as_found: as_found.map(|found| certified(book, found)).transpose()?,
        shop_revision: shop.revision,
        orifice_revision: item.revision,
        signatory,
        sheet: chosen.sheet,
        texts,
        amends: None,
        method_revision: METHOD_REVISION,
        program: VERSION.to_owned(),
    })
}

/// A complete run whose judgement is of what comes out today.
fn judged(book: &Book, number: RunNumber) -> Result<LoadedRun, WorkError> {
    let record = book.run(number)?;
    if record.state == RunState::Open {
        return Err(BookError::Incomplete { run: number }.into());
    }
    let Some(decision) = record.decisions.last() else {
        return Err(CertificateError::NotJudged(number).into());
    };
    let loaded = load(book, number)?;
    let analysis = loaded.analyse(&Questions::default())?;
    let now = figures(&loaded, &analysis);
    let then = &decision.figures;
    let same = decision.verdict == stored_verdict(&analysis)
        && then.method_revision == now.method_revision
        && [
            (then.flow_l_min, now.flow_l_min),
            (then.standard_uncertainty_l_min, now.standard_uncertainty_l_min),
            (then.ip.as_pa(), now.ip.as_pa()),
        ]
        .iter()
        .all(|(a, b)| a.to_bits() == b.to_bits());
    if record.changed_since_decision || !same {
        return Err(CertificateError::JudgeAgain(number).into());
    }
    Ok(loaded)
}

/// A run as found: of the same orifice, complete, and taken before the one of the results.
fn before_the_work(book: &Book, number: RunNumber, results: &LoadedRun) -> Result<LoadedRun, WorkError> {
    let refuse =
        |why: String| Err(CertificateError::AsFound { found: number, run: results.number, why }.into());
    if number == results.number {
        return refuse("it is the same run".to_owned());
    }
    let record = book.run(number)?;
    if record.state == RunState::Open {
        return Err(BookError::Incomplete { run: number }.into());
    }
    if !record.run.orifice.same_as(&results.run.orifice) {
        return refuse(format!("it is of orifice {}, not {}", record.run.orifice, results.run.orifice));
    }
    if record.run.taken >= results.run.taken {
        return refuse("it was not taken before it".to_owned());
    }
    load(book, number)
}

fn certified(book: &Book, loaded: LoadedRun) -> Result<CertifiedRun, WorkError> {
    let compared = loaded.comparable().is_some();
    let before = match book.decided_before(&loaded.run.orifice, loaded.number)? {
        Some((number, decision)) if compared => Some((number, decision.figures)),
        _ => None,
    };
    let header = Run { readings: Readings::Points(Vec::new()), ..loaded.run };
    Ok(CertifiedRun { run: loaded.number, header, before })
}

/// Who signs: the one named, else the only one who may. Nobody where that leaves a choice, which the check of the whole then
/// says together with everything else.
fn signatory(shop: &Shop, by: Option<&str>) -> Result<Signatory, WorkError> {
    let nobody = Signatory { name: String::new(), role: None };
    let Some(by) = by.map(|by| said("--by", by)).transpose()? else {
        return Ok(match shop.signatories.as_slice() {
            [only] => only.clone(),
            _ => nobody,
        });
    };
    let named = shop.signatories.iter().find(|one| one.name.to_lowercase() == by.to_lowercase());
    match named {
        Some(one) => Ok(one.clone()),
        // A shop that names nobody leaves it to whoever issues.
        None if shop.signatories.is_empty() => Ok(Signatory { name: by.to_owned(), role: None }),
        None => {
            let those: Vec<&str> = shop.signatories.iter().map(|one| one.name.as_str()).collect();
            let (name, those) = (by.to_owned(), those.join(", "));
            Err(CertificateError::NotSigning { name, those }.into())
        }
    }
}

/// The run a name stands for, if it is a run's.
pub(super) fn run_named(text: &str) -> Option<RunNumber> {
    RunNumber::parse(text)
}
