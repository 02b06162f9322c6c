//! Arguments of `certificate`.

use std::path::PathBuf;

use clap::{Args, Subcommand, ValueEnum};

/// Verbs of calibration certificates.
#[derive(Debug, Subcommand)]
pub enum Certificates {
    /// Issues the certificate of a judged run, as PDF and XML; issued before, makes the same files again
    Issue(IssueCertificate),
    /// Issues another certificate, with a number of its own, in the place of one that was issued
    Amend(AmendCertificate),
    /// Computes a certificate again from what is inside: 0 it holds, 1 it does not or cannot be checked here
    Check(CheckCertificate),
    /// Lists the certificates of the book, the newest first
    List(ListCertificates),
    /// Shows a certificate of the book as text
    Show(ShowCertificate),
}

/// Paper.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Paper {
    /// 210 mm by 297 mm
    A4,
    /// 8.5 in by 11 in
    Letter,
}

/// How a certificate is written.
#[derive(Debug, Args)]
pub struct Written {
    /// The folder for PDF and XML
    #[arg(long, value_name = "DIR", default_value = ".")]
    pub into: PathBuf,
    /// The paper (else a4, or that of the certificate before)
    #[arg(long, value_name = "PAPER")]
    pub paper: Option<Paper>,
    /// The run before cleaning or adjustment; --work says what was done
    #[arg(long, value_name = "RUN")]
    pub as_found: Option<String>,
    /// Who authorises it, one of the shop's signatories (else the only one)
    #[arg(long, value_name = "NAME")]
    pub by: Option<String>,
    /// What is stated
    #[command(flatten)]
    pub stated: Stated,
}

/// What is stated and not computed.
#[derive(Debug, Args)]
#[command(next_help_heading = "What is stated")]
pub struct Stated {
    /// Customer with address, as in "Reef School; 12 Bay Road; 4870 Cairns" (else as in the orifice's entry)
    #[arg(long, value_name = "TEXT")]
    pub customer: Option<String>,
    /// The item bears no serial number
    #[arg(long)]
    pub without_serial: bool,
    /// Condition of the item as it came
    #[arg(long, value_name = "TEXT")]
    pub condition: Option<String>,
    /// What was done to the item between the runs
    #[arg(long, value_name = "TEXT")]
    pub work: Option<String>,
    /// Day of receipt, as in 2026-11-10
    #[arg(long, value_name = "DAY")]
    pub received: Option<String>,
    /// Where the work was done (else at the address of the shop)
    #[arg(long, value_name = "TEXT")]
    pub place: Option<String>,
    /// What the customer supplied; repeat
    #[arg(long, value_name = "TEXT")]
    pub supplied: Vec<String>,
    /// An interval until the next calibration, only where the customer asked for one
    #[arg(long, value_name = "TEXT")]
    pub interval: Option<String>,
    /// A further sentence; repeat
    #[arg(long, value_name = "TEXT")]
    pub remark: Vec<String>,
}

/// Options of `certificate issue`.
#[derive(Debug, Args)]
pub struct IssueCertificate {
    /// The run, or the number of a certificate to have again
    #[arg(value_name = "RUN")]
    pub run: String,
    /// Show the text of the document and write nothing
    #[arg(long)]
    pub look: bool,
    /// How it is written
    #[command(flatten)]
    pub written: Written,
}

/// Options of `certificate amend`; what is not said stays as it was.
#[derive(Debug, Args)]
pub struct AmendCertificate {
    /// The certificate
    #[arg(value_name = "NUMBER")]
    pub number: String,
    /// Why it is amended
    #[arg(long, value_name = "TEXT")]
    pub why: String,
    /// What changed (else found by comparing both)
    #[arg(long, value_name = "TEXT")]
    pub changed: Option<String>,
    /// Another run to rest on
    #[arg(long, value_name = "RUN")]
    pub run: Option<String>,
    /// The list says that the earlier one is replaced, where else it says amended
    #[arg(long)]
    pub replace: bool,
    /// How it is written
    #[command(flatten)]
    pub written: Written,
}

/// Options of `certificate check`.
#[derive(Debug, Args)]
pub struct CheckCertificate {
    /// The certificate, PDF or XML
    #[arg(value_name = "FILE")]
    pub file: PathBuf,
}

/// Options of `certificate list`.
#[derive(Debug, Args)]
pub struct ListCertificates {
    /// All certificates, not the newest 50
    #[arg(long)]
    pub all: bool,
}

/// Options of `certificate show`.
#[derive(Debug, Args)]
pub struct ShowCertificate {
    /// The certificate
    #[arg(value_name = "NUMBER")]
    pub number: String,
}
