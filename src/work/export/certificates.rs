//! The certificates of a book: their numbers and what they rest on.

use serde::Serialize;

use super::folder::Folder;
use super::toml_text;
use crate::book::{Book, CertificateQuery};
use crate::work::WorkError;
use crate::work::certificate::listed;

#[derive(Serialize)]
struct Listed {
    certificate: Vec<One>,
}

#[derive(Serialize)]
struct One {
    number: String,
    issued: String,
    run: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    as_found: Option<String>,
    orifice: String,
    state: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    amends: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    replaces: Option<bool>,
    #[serde(skip_serializing_if = "Option::is_none")]
    why: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    changed: Option<String>,
    signatory: String,
    paper: &'static str,
    method: u32,
    program: String,
    head: String,
    #[serde(skip_serializing_if = "Option::is_none")]
    pdf_sha256: Option<String>,
    #[serde(skip_serializing_if = "Option::is_none")]
    xml_sha256: Option<String>,
}

/// Writes `certificates.toml` in the order the numbers were given, where there are any; how many.
pub(super) fn write(folder: &mut Folder, book: &Book) -> Result<usize, WorkError> {
    let mut all = Vec::new();
    for row in book.certificates(&CertificateQuery::default())?.into_iter().rev() {
        let Some(given) = book.certificate(&row.number)? else { continue };
        let (seq, link) = given.certificate.head;
        let draft = given.certificate.draft;
        let listed = listed(row);
        let (pdf_sha256, xml_sha256) = listed.sha256.clone().unzip();
        let amends = draft.amends.as_ref();
        all.push(One {
            state: listed.state(),
            number: listed.number,
            issued: listed.issued.to_rfc3339(),
            run: listed.run.to_string(),
            as_found: listed.as_found.map(|run| run.to_string()),
            orifice: listed.orifice,
            amends: amends.map(|amends| amends.number.clone()),
            replaces: amends.map(|amends| amends.replaces),
            why: amends.map(|amends| amends.why.clone()),
            changed: amends.map(|amends| amends.what.clone()),
            signatory: draft.signatory.name,
            paper: draft.sheet.name(),
            method: draft.method_revision,
            program: draft.program,
            head: crate::book::Head { seq, link }.to_string(),
            pdf_sha256,
            xml_sha256,
        });
    }
    let count = all.len();
    if count > 0 {
        folder.write("certificates.toml", toml_text(&Listed { certificate: all }).as_bytes())?;
    }
    Ok(count)
}
