//! What is stated on a certificate, as a file inside it: everything that the readings do not give.
//!
//! Comes in: an [`Issue`] and which runs there are. Goes out: TOML text, the same for the same issue; and back. With it and
//! the run files a certificate can be made again from nothing, which is how it is checked. The earlier run that a result was
//! compared with is here too, with the parts of its uncertainty, since no file of this certificate gives those.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use chrono::{DateTime, NaiveDate};
use serde::{Deserialize, Serialize};

use super::content::{Amendment, Customer, Issue, Measured};
use crate::bench::METHOD_REVISION;
use crate::bench::correct::Source;
use crate::bench::history::Accepted;
use crate::bench::line::{FlowAt, Part};
use crate::entry::{Build, Id, Logo, Orifice, Shop, Signatory};
use crate::gas::Species;
use crate::report::bench_fit::source_name;

/// What the file says in `record`.
const RECORD: &str = "certificate";

/// Why the file cannot be read.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum StatedError {
    /// No TOML, or not of this form.
    #[error("certificate.toml inside the certificate cannot be read: {0}")]
    Toml(String),
    /// A field with something impossible.
    #[error("certificate.toml inside the certificate has an impossible {field}: {text:?}")]
    Field {
        /// The field.
        field: &'static str,
        /// What stands there.
        text: String,
    },
}

/// What was read back.
#[derive(Debug, Clone, PartialEq)]
pub struct Stated {
    /// Everything stated.
    pub issue: Issue,
    /// Method revision it was made with.
    pub method: u32,
    /// The run of the results.
    pub results: StatedRun,
    /// The run as found.
    pub as_found: Option<StatedRun>,
}

/// A run as the file names it.
#[derive(Debug, Clone, PartialEq)]
pub struct StatedRun {
    /// Its name.
    pub name: String,
    /// Name of its run file.
    pub file: String,
    /// What it was compared with.
    pub before: Option<Accepted>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct File {
    record: String,
    program: String,
    method: u32,
    number: String,
    issued: String,
    country: String,
    place: Option<String>,
    received: Option<String>,
    condition: Option<String>,
    work_done: Option<String>,
    interval: Option<String>,
    chain_head: Option<String>,
    supplied: Vec<String>,
    remarks: Vec<String>,
    without_serial: bool,
    signatory: FileSignatory,
    shop: FileShop,
    customer: FileCustomer,
    item: FileItem,
    amends: Option<FileAmendment>,
    results: FileRun,
    as_found: Option<FileRun>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileSignatory {
    name: String,
    role: Option<String>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileShop {
    name: String,
    address: String,
    contact: Option<String>,
    accent: Option<String>,
    statements: Vec<String>,
    logo_name: Option<String>,
    logo_base64: Option<String>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileCustomer {
    name: String,
    address: String,
    contact: Option<String>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileItem {
    id: String,
    description: Option<String>,
    serial: Option<String>,
    maker: Option<String>,
    build: String,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileAmendment {
    replaces: String,
    instead: bool,
    what: String,
    why: String,
    digest: Option<String>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileRun {
    name: String,
    file: String,
    before: Option<FileBefore>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FileBefore {
    name: String,
    gas: String,
    p1_bar: f64,
    flow_l_min: f64,
    meter_certificate: Option<String>,
    transducer_certificate: Option<String>,
    parts: Vec<FilePart>,
}

#[derive(Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct FilePart {
    source: String,
    u_l_min: f64,
    /// Absent for infinitely many.
    dof: Option<f64>,
}

/// The text of the file.
#[must_use]
pub fn written(issue: &Issue, results: &Measured<'_>, as_found: Option<&Measured<'_>>) -> String {
    let shop = &issue.shop;
    let file = File {
        record: RECORD.to_owned(),
        program: issue.program.clone(),
        method: METHOD_REVISION,
        number: issue.number.clone(),
        issued: issue.issued.to_rfc3339(),
        country: issue.country.clone(),
        place: issue.place.clone(),
        received: issue.received.map(|day| day.to_string()),
        condition: issue.condition.clone(),
        work_done: issue.work_done.clone(),
        interval: issue.interval.clone(),
        chain_head: issue.chain_head.clone(),
        supplied: issue.supplied.clone(),
        remarks: issue.remarks.clone(),
        without_serial: issue.without_serial,
        signatory: FileSignatory { name: issue.signatory.name.clone(), role: issue.signatory.role.clone() },
        shop: FileShop {
            name: shop.name.clone(),
            address: shop.address.clone(),
            contact: shop.contact.clone(),
            accent: shop.accent.clone(),
            statements: shop.statements.clone(),
            logo_name: shop.logo.as_ref().map(|logo| logo.file_name.clone()),
            logo_base64: shop.logo.as_ref().map(|logo| STANDARD.encode(&logo.bytes)),
        },
        customer: FileCustomer {
            name: issue.customer.name.clone(),
            address: issue.customer.address.clone(),
            contact: issue.customer.contact.clone(),
        },
        item: FileItem {
            id: issue.item.id.to_string(),
            description: issue.item.description.clone(),
            serial: issue.item.serial.clone(),
            maker: issue.item.maker.clone(),
            build: issue.item.build.name().to_owned(),
        },
        amends: issue.amends.as_ref().map(|a| FileAmendment {
            replaces: a.replaces.clone(),
            instead: a.instead,
            what: a.what.clone(),
            why: a.why.clone(),
            digest: a.digest.clone(),
        }),
        results: file_run(results),
        as_found: as_found.map(file_run),
    };
    // Plain tables of texts and numbers always have a TOML form.
    toml::to_string(&file).unwrap_or_default()
}

fn file_run(measured: &Measured<'_>) -> FileRun {
    FileRun {
        name: measured.name.to_owned(),
        file: measured
            .files
            .map_or_else(|| format!("{}.toml", measured.name), |files| files.toml_name.clone()),
        before: measured.before.map(|before| FileBefore {
            name: before.name.clone(),
            gas: before.gas.name().to_owned(),
            p1_bar: before.flow.p1_bar,
            flow_l_min: before.flow.flow_l_min,
            meter_certificate: before.meter_certificate.clone(),
            transducer_certificate: before.transducer_certificate.clone(),
            parts: before
                .flow
                .parts
                .iter()
                .map(|(part, u, dof)| FilePart {
                    source: source_name(*part).to_owned(),
                    u_l_min: *u,
                    dof: dof.is_finite().then_some(*dof),
                })
                .collect(),
        }),
    }
}

/// Reads the file.
///
/// # Errors
/// Text that is no such file, or a field with something impossible.
pub fn read(bytes: &[u8]) -> Result<Stated, StatedError> {
    let text = std::str::from_utf8(bytes).map_err(|_| StatedError::Toml("it is no UTF-8 text".to_owned()))?;
    let file: File = toml::from_str(text).map_err(|error| StatedError::Toml(first_line(error.message())))?;
    if file.record != RECORD {
        return Err(impossible("record", &file.record));
    }
    let issued =
        DateTime::parse_from_rfc3339(&file.issued).map_err(|_| impossible("issued", &file.issued))?;
    let received = file.received.as_deref().map(|text| day("received", text)).transpose()?;
    let logo = match (file.shop.logo_name, file.shop.logo_base64) {
        (Some(file_name), Some(text)) => {
            let bytes = STANDARD.decode(&text).map_err(|_| impossible("logo_base64", "no base64"))?;
            Some(Logo { file_name, bytes })
        }
        _ => None,
    };
    let id = Id::new(&file.item.id).map_err(|_| impossible("item id", &file.item.id))?;
    let builds = [Build::ThinPlate, Build::ShortTube, Build::Nozzle, Build::Unknown];
    let build = builds.into_iter().find(|b| b.name() == file.item.build);
    let build = build.ok_or_else(|| impossible("item build", &file.item.build))?;
    Ok(Stated {
        method: file.method,
        results: run(file.results)?,
        as_found: file.as_found.map(run).transpose()?,
        issue: Issue {
            number: file.number,
            program: file.program,
            issued,
            signatory: Signatory { name: file.signatory.name, role: file.signatory.role },
            shop: Shop {
                name: file.shop.name,
                address: file.shop.address,
                contact: file.shop.contact,
                logo,
                accent: file.shop.accent,
                number_pattern: None,
                signatories: Vec::new(),
                statements: file.shop.statements,
            },
            country: file.country,
            customer: Customer {
                name: file.customer.name,
                address: file.customer.address,
                contact: file.customer.contact,
            },
            item: Orifice {
                description: file.item.description,
                serial: file.item.serial,
                maker: file.item.maker,
                build,
                ..Orifice::bare(id)
            },
            without_serial: file.without_serial,
            condition: file.condition,
            work_done: file.work_done,
            received,
            place: file.place,
            supplied: file.supplied,
            interval: file.interval,
            chain_head: file.chain_head,
            amends: file.amends.map(|a| Amendment {
                replaces: a.replaces,
                instead: a.instead,
                what: a.what,
                why: a.why,
                digest: a.digest,
            }),
            remarks: file.remarks,
        },
    })
}

fn run(file: FileRun) -> Result<StatedRun, StatedError> {
    Ok(StatedRun { name: file.name, file: file.file, before: file.before.map(before).transpose()? })
}

fn before(file: FileBefore) -> Result<Accepted, StatedError> {
    let gas = Species::ALL.into_iter().find(|gas| gas.name() == file.gas);
    let gas = gas.ok_or_else(|| impossible("gas of the earlier run", &file.gas))?;
    let parts = file
        .parts
        .iter()
        .map(|part| {
            let known = part_named(&part.source).ok_or_else(|| impossible("source", &part.source))?;
            Ok((known, part.u_l_min, part.dof.unwrap_or(f64::INFINITY)))
        })
        .collect::<Result<Vec<_>, StatedError>>()?;
    Ok(Accepted {
        name: file.name,
        gas,
        flow: FlowAt::new(file.p1_bar, file.flow_l_min, parts),
        meter_certificate: file.meter_certificate,
        transducer_certificate: file.transducer_certificate,
    })
}

fn part_named(name: &str) -> Option<Part> {
    let common = Source::ALL.map(Part::Common);
    let own = [Part::Random, Part::AmbientAsked, Part::GasConversion];
    common.into_iter().chain(own).find(|part| source_name(*part) == name)
}

fn day(field: &'static str, text: &str) -> Result<NaiveDate, StatedError> {
    text.parse().map_err(|_| impossible(field, text))
}

fn impossible(field: &'static str, text: &str) -> StatedError {
    StatedError::Field { field, text: text.chars().take(60).collect() }
}

fn first_line(text: &str) -> String {
    text.lines().next().unwrap_or_default().chars().take(200).collect()
}
