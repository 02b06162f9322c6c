//! The shop that owns the book.

/// A picture for the letterhead.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Logo {
    /// Name of the file it came from, which says PNG or SVG by its ending.
    pub file_name: String,
    /// Its bytes.
    pub bytes: Vec<u8>,
}

/// A person who may sign.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Signatory {
    /// Name.
    pub name: String,
    /// Function.
    pub role: Option<String>,
}

/// What stands on the shop's certificates.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Shop {
    /// Name.
    pub name: String,
    /// Address, with its lines.
    pub address: String,
    /// How to reach it.
    pub contact: Option<String>,
    /// Logo.
    pub logo: Option<Logo>,
    /// Accent colour, as `#0B6E7A`.
    pub accent: Option<String>,
    /// Pattern of the certificates' numbers, as `{year}-{n:4}`.
    pub number_pattern: Option<String>,
    /// Who may sign.
    pub signatories: Vec<Signatory>,
    /// Sentences that stand on every certificate.
    pub statements: Vec<String>,
}
