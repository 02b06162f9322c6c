//! The whole content of a calibration certificate as plain data.
//!
//! Comes in: what is stated ([`Issue`]) and one or two analysed runs ([`Measured`]). Goes out: a [`Content`], from which
//! the XML, the pages and the text are made and which knows nothing of them. It holds every number as a [`Figure`] with its
//! unit, reference conditions and uncertainty, unrounded, and every sentence in full; what it must carry is that of ISO/IEC
//! 17025:2017, 7.8.2, 7.8.4, 7.8.6 and 7.8.8, in our words. Nothing is computed here beyond reading the line over a table.
//! Left out on purpose: an interval until the next calibration unless it was asked for, and any claim of accreditation.

mod calibration;
mod country;
mod figure;
mod issue;
mod leaves;
mod of;
mod rows;
mod surroundings;
mod words;

use chrono::NaiveDate;

pub use calibration::{
    Budget, BudgetRow, Calibration, CheckRow, Choke, Comparison, Conformity, Hole, LineFigures, PointRow, Row,
};
pub use country::{country_of, is_country};
pub use figure::{
    Dsi, Figure, K_DECIMALS, NoUncertainty, Reference, Uncertainty, Unit, decimals_of_figures, probability,
};
pub use issue::{Amendment, Customer, Issue, Measured, RunFiles};
pub use leaves::{Printed, printed};
pub(super) use of::STATED;
pub use of::of;
pub use surroundings::{Condition, Equipment};
pub use words::{PROGRAM, Statement, StatementKind, VERSION};

/// What a certificate says, whole.
#[derive(Debug, Clone, PartialEq)]
pub struct Content {
    /// Title.
    pub title: &'static str,
    /// What is stated.
    pub issue: Issue,
    /// First and last day of measurement.
    pub performed: (NaiveDate, NaiveDate),
    /// Where the work was done.
    pub place: String,
    /// The method, by name and revision.
    pub method: Method,
    /// The run the certificate rests on: as-left, where there was work on the item.
    pub results: Calibration,
    /// The run before cleaning or adjustment.
    pub as_found: Option<Calibration>,
    /// How far the work changed the flow.
    pub changed_by_work: Option<Comparison>,
    /// What a reader has to be told: scope, traceability, uncertainty, decision rule.
    pub statements: Vec<Statement>,
    /// Cautions.
    pub cautions: Vec<&'static str>,
    /// The files it carries.
    pub files: Vec<File>,
}

/// How the results were arrived at.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Method {
    /// Name.
    pub name: &'static str,
    /// In two sentences.
    pub says: &'static str,
    /// Standards it follows.
    pub norms: &'static [&'static str],
    /// Revision of the computation.
    pub revision: u32,
    /// Version of the program.
    pub program: String,
}

/// A file inside.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct File {
    /// Its name, without folders.
    pub name: String,
    /// What it is.
    pub says: &'static str,
    /// MIME type.
    pub mime: &'static str,
    /// Its bytes.
    pub bytes: Vec<u8>,
    /// SHA-256 of them, in hexadecimal.
    pub sha256: String,
}

impl File {
    /// A file with its digest.
    #[must_use]
    pub fn new(name: impl Into<String>, says: &'static str, mime: &'static str, bytes: Vec<u8>) -> Self {
        let sha256 = sha256(&bytes);
        Self { name: name.into(), says, mime, bytes, sha256 }
    }
}

/// SHA-256 in hexadecimal.
#[must_use]
pub fn sha256(bytes: &[u8]) -> String {
    use sha2::{Digest, Sha256};
    Sha256::digest(bytes).iter().map(|byte| format!("{byte:02x}")).collect()
}

impl Content {
    /// The calibrations, the one it rests on first.
    pub fn calibrations(&self) -> impl Iterator<Item = &Calibration> {
        std::iter::once(&self.results).chain(&self.as_found)
    }
}
