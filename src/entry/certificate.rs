//! A calibration certificate as the book keeps it: its number, and everything that makes its document.
//!
//! Nothing here was computed at issue: the document is made of this, of the readings of its runs and of the revisions of the
//! registers that are named, and the same comes of it every time.

use chrono::{DateTime, FixedOffset, NaiveDate};

use super::{Run, RunNumber, Signatory, StoredFigures};

/// The paper a certificate is set on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Sheet {
    /// 210 mm by 297 mm (ISO 216).
    A4,
    /// 8.5 in by 11 in (ANSI A).
    Letter,
}

impl Sheet {
    /// The word for it.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::A4 => "a4",
            Self::Letter => "letter",
        }
    }
}

/// A run as a certificate has it.
#[derive(Debug, Clone, PartialEq)]
pub struct CertifiedRun {
    /// Its number.
    pub run: RunNumber,
    /// All but its readings, as it stood at issue, with build and limits from the registers.
    pub header: Run,
    /// The accepted run it was compared with, and that one's figures.
    pub before: Option<(RunNumber, StoredFigures)>,
}

/// What a person stated for one certificate.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct CertificateTexts {
    /// Name of the customer.
    pub customer: String,
    /// Address of the customer, with its lines.
    pub customer_address: String,
    /// That the item bears no serial number.
    pub without_serial: bool,
    /// Condition of the item as it came.
    pub condition: Option<String>,
    /// What was done to the item between the runs.
    pub work_done: Option<String>,
    /// Day of receipt.
    pub received: Option<NaiveDate>,
    /// Where the work was done, where not at the address of the shop.
    pub place: Option<String>,
    /// What of all this the customer supplied.
    pub supplied: Vec<String>,
    /// An interval until the next calibration that the customer asked for.
    pub interval: Option<String>,
    /// Further sentences.
    pub remarks: Vec<String>,
}

/// What an amendment says of the certificate before it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct CertificateAmends {
    /// Number of that certificate.
    pub number: String,
    /// Whether this one replaces it; else it amends it.
    pub replaces: bool,
    /// What changed.
    pub what: String,
    /// Why.
    pub why: String,
    /// SHA-256 of its XML, where its files were written.
    pub xml: Option<[u8; 32]>,
}

/// A certificate before it has its number.
#[derive(Debug, Clone, PartialEq)]
pub struct CertificateDraft {
    /// The run it rests on.
    pub results: CertifiedRun,
    /// The run before cleaning or adjustment.
    pub as_found: Option<CertifiedRun>,
    /// Revision of the shop in its register.
    pub shop_revision: u32,
    /// Revision of the orifice in its register.
    pub orifice_revision: u32,
    /// Who authorises it.
    pub signatory: Signatory,
    /// Its paper.
    pub sheet: Sheet,
    /// What was stated.
    pub texts: CertificateTexts,
    /// The certificate it amends or replaces.
    pub amends: Option<CertificateAmends>,
    /// When it is issued.
    pub issued: DateTime<FixedOffset>,
    /// Revision of the method.
    pub method_revision: u32,
    /// Version of the program.
    pub program: String,
}

/// A certificate whose number was given out.
#[derive(Debug, Clone, PartialEq)]
pub struct Certificate {
    /// Its number.
    pub number: String,
    /// The running part of the number.
    pub counter: u32,
    /// The year it counts in.
    pub year: i32,
    /// Place and link of the chain's head as it stood before, which the certificate prints.
    pub head: (u64, [u8; 32]),
    /// Everything else.
    pub draft: CertificateDraft,
}
