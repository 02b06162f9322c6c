//! `certificate list`.

use crate::book::{CertificateQuery, CertificateRow};
use crate::report::certificate_words::ListedCertificate;
use crate::work::WorkError;
use crate::work::runs::LISTED;
use crate::work::shelf::Shelf;

/// The newest certificates, [`LISTED`] of them unless `all`, and whether there are older ones.
///
/// # Errors
/// When there is no book or it cannot be read.
pub fn list(shelf: &Shelf, all: bool) -> Result<(Vec<ListedCertificate>, bool), WorkError> {
    let limit = (!all).then_some(LISTED + 1);
    let mut rows = shelf.to_read()?.certificates(&CertificateQuery { limit, run: None })?;
    let more = !all && rows.len() > LISTED as usize;
    if more {
        rows.truncate(LISTED as usize);
    }
    Ok((rows.into_iter().map(listed).collect(), more))
}

/// A row of the book for `report`.
pub(in crate::work) fn listed(row: CertificateRow) -> ListedCertificate {
    let hex = super::document::hex;
    ListedCertificate {
        number: row.number,
        run: row.run,
        as_found: row.as_found,
        orifice: row.orifice,
        issued: row.issued,
        amends: row.amends,
        amended_by: row.amended_by,
        sha256: row.files.map(|files| (hex(&files.pdf), hex(&files.xml))),
    }
}
