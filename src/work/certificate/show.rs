//! `certificate show`.

use super::document::{content, find, hex};
use crate::certificate::pages;
use crate::report::certificate_words::{ListedCertificate, ShownCertificate};
use crate::report::layout::WIDTH;
use crate::work::WorkError;
use crate::work::shelf::Shelf;

/// One certificate: what stands in the list, and the text of its document.
///
/// # Errors
/// A number that was never given out, a certificate of another method, a book that cannot be read.
pub fn show(shelf: &Shelf, number: &str) -> Result<ShownCertificate, WorkError> {
    let book = shelf.to_read()?;
    let found = find(&book, number)?;
    let text = pages::text(&content(&book, &found.certificate)?, WIDTH);
    let draft = found.certificate.draft;
    let listed = ListedCertificate {
        number: found.certificate.number,
        run: draft.results.run,
        as_found: draft.as_found.as_ref().map(|of| of.run),
        orifice: draft.results.header.orifice.to_string(),
        issued: draft.issued,
        amends: draft.amends.as_ref().map(|amends| (amends.number.clone(), amends.replaces)),
        amended_by: found.amended_by,
        sha256: found.files.map(|files| (hex(&files.pdf), hex(&files.xml))),
    };
    Ok(ShownCertificate { listed, text })
}
