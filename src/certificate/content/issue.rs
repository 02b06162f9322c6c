//! What is stated, and not computed: by the shop, the customer, and the book at the moment of issue.

use chrono::{DateTime, FixedOffset, NaiveDate};

use crate::bench::Analysis;
use crate::bench::history::Accepted;
use crate::entry::{Orifice, Run, Shop, Signatory};

/// Everything of a certificate that cannot be computed from the readings.
#[derive(Debug, Clone, PartialEq)]
pub struct Issue {
    /// Its number, unlike any other of the shop.
    pub number: String,
    /// Version of the program that issues it: [`super::VERSION`], unless an older certificate is made again.
    pub program: String,
    /// When it is issued, with the offset of the shop.
    pub issued: DateTime<FixedOffset>,
    /// Who authorises it.
    pub signatory: Signatory,
    /// The shop with its letterhead.
    pub shop: Shop,
    /// Country of the shop, two capital letters of ISO 3166-1; [`super::country_of`] finds it in an address.
    pub country: String,
    /// The customer.
    pub customer: Customer,
    /// The orifice as it stands in the register.
    pub item: Orifice,
    /// That the item bears no serial number; else it must have one.
    pub without_serial: bool,
    /// Condition of the item as it came.
    pub condition: Option<String>,
    /// What was done to the item between the runs: cleaning, adjustment.
    pub work_done: Option<String>,
    /// Day of receipt, where it matters.
    pub received: Option<NaiveDate>,
    /// Where the work was done; at the shop's address when nobody says otherwise.
    pub place: Option<String>,
    /// What of the above the customer supplied, each in a few words.
    pub supplied: Vec<String>,
    /// An interval until the next calibration, only where the customer asked for one.
    pub interval: Option<String>,
    /// Head of the book's chain as it stood before the certificate was recorded.
    pub chain_head: Option<String>,
    /// The certificate that this one replaces.
    pub amends: Option<Amendment>,
    /// Further sentences for this certificate alone.
    pub remarks: Vec<String>,
}

/// The customer.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub struct Customer {
    /// Name.
    pub name: String,
    /// Address, with its lines.
    pub address: String,
    /// How to reach them.
    pub contact: Option<String>,
}

/// What an amendment says of the certificate it amends or replaces.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Amendment {
    /// Number of that certificate.
    pub replaces: String,
    /// Whether this one takes its place; else it amends it.
    pub instead: bool,
    /// What changed.
    pub what: String,
    /// Why.
    pub why: String,
    /// SHA-256 of the XML that is replaced, in hexadecimal, where the book has it.
    pub digest: Option<String>,
}

/// A run with its result, as it goes into a certificate.
#[derive(Debug, Clone, Copy)]
pub struct Measured<'a> {
    /// Name of the run: `R0012`. Its files are named after it.
    pub name: &'a str,
    /// What was recorded, with everything the registers add to it.
    pub run: &'a Run,
    /// What was made of it.
    pub analysis: &'a Analysis,
    /// The run before that it was compared with, where there was one.
    pub before: Option<&'a Accepted>,
    /// The files it is read from, which must name no entry of a register; written anew from the run where there are none.
    pub files: Option<&'a RunFiles>,
}

/// The two files of a run.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct RunFiles {
    /// Name of the run file, without folders.
    pub toml_name: String,
    /// The run file.
    pub toml: Vec<u8>,
    /// Name of its readings, as the run file gives it.
    pub readings_name: String,
    /// The readings.
    pub readings: Vec<u8>,
}
