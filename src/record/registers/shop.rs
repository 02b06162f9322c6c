//! The shop: what stands on its certificates.

use std::io::Read;
use std::path::{Component, Path};

use super::super::document::{Field, Origin, Table};
use super::super::error::{Fault, RecordError, Refusal};
use super::super::run::Files;
use super::keys::{required_words, words};
use super::{NumberPattern, RegisterRefusal};
use crate::entry::{Logo, Shop, Signatory};

const KEYS: [&str; 9] =
    ["record", "name", "address", "contact", "logo", "accent", "number_pattern", "signatories", "statements"];

/// Largest logo, in bytes: it goes into every certificate.
const LARGEST_LOGO: u64 = 1 << 20;

/// The first bytes of a PNG picture (W3C Recommendation "Portable Network Graphics", 5.2).
const PNG: [u8; 8] = [0x89, b'P', b'N', b'G', 0x0D, 0x0A, 0x1A, 0x0A];

pub(super) fn read(file: &Table<'_>, files: Files<'_>) -> Result<Shop, RecordError> {
    file.only(&KEYS)?;
    let name = required_words(file, "name", "name = \"Harbour Orifice Works\"")?;
    let address = file.required("address", "address = \"1 Slip Road\\n7000 Hobart\"")?;
    let Some(address) = address.free_lines()? else { return Err(address.refuse(Refusal::EmptyText)) };
    Ok(Shop {
        name,
        address,
        contact: file.field("contact").map_or(Ok(None), |field| field.free_lines())?,
        logo: file.field("logo").map(|field| logo(&field, files)).transpose()?,
        accent: file.field("accent").map(|field| accent(&field)).transpose()?,
        number_pattern: file.field("number_pattern").map(|field| number_pattern(&field)).transpose()?,
        signatories: signatories(file)?,
        statements: file.field("statements").map_or(Ok(Vec::new()), |field| statements(&field))?,
    })
}

fn logo(field: &Field<'_>, files: Files<'_>) -> Result<Logo, RecordError> {
    let refuse = |refusal: RegisterRefusal| field.refuse(refusal.into());
    let Some(given) = field.free_text()? else { return Err(field.refuse(Refusal::EmptyText)) };
    let path = Path::new(&given);
    // What a person typed into a shell may lie anywhere; a file names only what travels with it.
    let within = path.components().all(|part| matches!(part, Component::Normal(_) | Component::CurDir));
    if field.origin() != Origin::Flags && !within {
        return Err(refuse(RegisterRefusal::LogoElsewhere(given)));
    }
    let file_name =
        path.file_name().map_or_else(|| given.clone(), |name| name.to_string_lossy().into_owned());
    let lower = file_name.to_lowercase();
    let (png, svg) = (lower.ends_with(".png"), lower.ends_with(".svg"));
    if !png && !svg {
        return Err(refuse(RegisterRefusal::LogoKind(given)));
    }
    let mut bytes = Vec::new();
    let read = files(&given)?.take(LARGEST_LOGO + 1).read_to_end(&mut bytes);
    read.map_err(|error| RecordError::unreadable(&given, Fault::of(&error)))?;
    if bytes.len() as u64 > LARGEST_LOGO {
        return Err(refuse(RegisterRefusal::LogoTooLarge));
    }
    let is_svg = || std::str::from_utf8(&bytes).is_ok_and(|text| text.contains("<svg"));
    match (png, svg) {
        (true, _) if !bytes.starts_with(&PNG) => Err(refuse(RegisterRefusal::LogoBytes("PNG"))),
        (_, true) if !is_svg() => Err(refuse(RegisterRefusal::LogoBytes("SVG"))),
        _ => Ok(Logo { file_name, bytes }),
    }
}

fn accent(field: &Field<'_>) -> Result<String, RecordError> {
    let text = field.text()?.trim();
    match text.strip_prefix('#') {
        Some(digits) if digits.len() == 6 && digits.bytes().all(|c| c.is_ascii_hexdigit()) => {
            Ok(text.to_owned())
        }
        _ => Err(field.refuse(RegisterRefusal::NotAColour(text.to_owned()).into())),
    }
}

fn number_pattern(field: &Field<'_>) -> Result<String, RecordError> {
    let text = field.seen_text()?.trim();
    let refuse = |fault| field.refuse(RegisterRefusal::Number(fault).into());
    NumberPattern::parse(text).map_err(refuse)?;
    Ok(text.to_owned())
}

/// Each a name, or a table with a name and a role.
fn signatories(file: &Table<'_>) -> Result<Vec<Signatory>, RecordError> {
    let mut signatories: Vec<Signatory> = Vec::new();
    let Some(field) = file.field("signatories") else { return Ok(signatories) };
    for item in field.items()? {
        let signatory = if item.is_text() {
            let Some(name) = item.free_text()? else { return Err(item.refuse(Refusal::EmptyText)) };
            Signatory { name, role: None }
        } else {
            let table = item.table("signatories")?;
            table.only(&["name", "role"])?;
            Signatory {
                name: required_words(&table, "name", "name = \"I. Varga\"")?,
                role: words(&table, "role")?,
            }
        };
        let same = |other: &Signatory| other.name.to_lowercase() == signatory.name.to_lowercase();
        if signatories.iter().any(same) {
            return Err(item.refuse(RegisterRefusal::SignatoryTwice(signatory.name).into()));
        }
        signatories.push(signatory);
    }
    Ok(signatories)
}

fn statements(field: &Field<'_>) -> Result<Vec<String>, RecordError> {
    let each = |item: Field<'_>| item.free_text()?.ok_or_else(|| item.refuse(Refusal::EmptyText));
    field.items()?.into_iter().map(each).collect()
}
