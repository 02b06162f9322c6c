//! The certificate of an orifice that came in dirty, was cleaned and measured again; and its amendment.
//!
//! Issued and checked by the same code as anybody's. Its numbers begin with DEMO, so that it is taken for no other. It prints the
//! head of the book's chain, so it is another each time.

use std::fs;
use std::path::{Path, PathBuf};

use chrono::Duration;

use super::id;
use crate::entry::Purpose;
use crate::report::certificate_words::{CheckedCertificate, Outcome, check_line};
use crate::work::WorkError;
use crate::work::certificate::{
    AmendRequest, GivenTexts, IssueRequest, amend_at, check as check_file, issue_at,
};
use crate::work::shelf::Shelf;

/// Pattern of the shop's numbers.
pub(super) const PATTERN: &str = "DEMO-{year}-{n:4}";
/// How many certificates a demonstration issues.
pub(super) const ISSUED: usize = 2;
/// The orifice that was cleaned.
const ORIFICE: &str = "demo-04";

/// What was issued.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct DemoCertificate {
    /// The orifice.
    pub orifice: &'static str,
    /// The number of the first.
    pub number: String,
    /// The number of its amendment.
    pub amendment: String,
    /// The files of both, each with what its check says.
    pub files: Vec<(PathBuf, String)>,
    /// Whether every one of them holds.
    pub hold: bool,
}

/// Issues, amends and checks, in the book at `shelf`.
pub(super) fn certify(folder: &Path, shelf: &Shelf) -> Result<Option<DemoCertificate>, WorkError> {
    let history = shelf.to_read()?.history(&id(ORIFICE), None)?;
    let of = |purpose| history.iter().find(|row| row.run.purpose == purpose).map(|row| &row.run);
    let (Some(left), Some(found)) = (of(Purpose::AsLeft), of(Purpose::AsFound)) else { return Ok(None) };
    let into = folder.join("certificates");
    remove_earlier(&into);
    let first = issue_at(
        shelf,
        &IssueRequest {
            run: left.number.to_string(),
            into: into.clone(),
            paper: None,
            as_found: Some(found.number.to_string()),
            by: None,
            texts: GivenTexts {
                condition: Some("the filter before the hole was dirty".to_owned()),
                work: Some("Filter replaced, hole cleaned in an ultrasonic bath.".to_owned()),
                received: Some(found.taken.date_naive().to_string()),
                ..GivenTexts::default()
            },
        },
        left.taken + Duration::days(1),
    )?;
    let second = amend_at(
        shelf,
        &AmendRequest {
            number: first.number.clone(),
            why: "the house number of the customer was wrong".to_owned(),
            replace: true,
            into,
            texts: GivenTexts {
                customer: Some("Tern Club (invented), 3 Quay Street, Nowhere".to_owned()),
                ..GivenTexts::default()
            },
            ..AmendRequest::default()
        },
        left.taken + Duration::days(2),
    )?;
    let written = first.files.iter().chain(&second.files);
    let checked: Vec<(PathBuf, CheckedCertificate)> = written
        .map(|file| {
            let path = PathBuf::from(&file.path);
            check_file(Some(shelf), &path).map(|checked| (path, checked))
        })
        .collect::<Result<_, _>>()?;
    Ok(Some(DemoCertificate {
        orifice: ORIFICE,
        number: first.number,
        amendment: second.number,
        hold: checked.iter().all(|(_, checked)| checked.outcome == Outcome::Holds),
        files: checked.into_iter().map(|(path, checked)| (path, check_line(&checked))).collect(),
    }))
}

/// Takes the certificates of an earlier demonstration away: they are of a book that is no more.
fn remove_earlier(into: &Path) {
    let Ok(entries) = fs::read_dir(into) else { return };
    for entry in entries.flatten() {
        let name = entry.file_name();
        let ours = name.to_str().is_some_and(|name| {
            name.starts_with("DEMO-") && (name.ends_with(".pdf") || name.ends_with(".xml"))
        });
        if ours {
            let _ = fs::remove_file(entry.path());
        }
    }
}
