//! An entry to the text of its file.
//!
//! Comes in: an entry. Goes out: the text, the same for the same entry, which reads back as an equal entry; every number
//! has the fewest digits that come back to the last bit. Left out is what no file can say: papers that go by another
//! name than their instrument, an order of words where there is one word, limits without a name, empty texts, and the
//! bytes of a logo, whose file the text names.

use super::super::write::{Toml, limits, meter, number, quoted, transducer};
use super::protocol::{TABLES, TYPES, WORD_ORDERS, kind_of, takes_two};
use super::{RegisterEntry, RegisterKind};
use crate::entry::{
    Build, Diluent, Diver, FirstStage, Instrument, InstrumentPapers, Meter, Orifice, Protocol, Shop,
    Signatory, Socket, Transducer,
};
use crate::quantity::show::{range_to_text, to_text, uncertain_to_text};

/// Writes an entry; a logo is written as the name of its file, which must be put beside.
#[must_use]
pub fn write_register(entry: &RegisterEntry) -> String {
    let mut toml = Toml::default();
    toml.text("record", entry.kind().name());
    if let (Some(id), true) = (entry.id(), entry.kind() != RegisterKind::Acceptance) {
        toml.text("id", id.as_str());
    }
    match entry {
        RegisterEntry::Orifice(given) => orifice(&mut toml, given),
        RegisterEntry::Instrument(given) => instrument(&mut toml, given),
        RegisterEntry::FirstStage(given) => first_stage(&mut toml, given),
        RegisterEntry::Diver(given) => diver(&mut toml, given),
        RegisterEntry::Acceptance(given) => limits(&mut toml, given),
        RegisterEntry::Shop(given) => shop(&mut toml, given),
    }
    toml.0
}

fn orifice(toml: &mut Toml, given: &Orifice) {
    toml.some("description", given.description.as_deref());
    toml.some("serial", given.serial.as_deref());
    toml.some("maker", given.maker.as_deref());
    toml.some("customer", given.customer.as_deref());
    if given.build != Build::Unknown {
        toml.text("build", given.build.name());
    }
    toml.quantity("length", given.length);
    toml.quantity("nominal_diameter", given.nominal_diameter);
    toml.some("acceptance", given.acceptance.as_ref().map(|id| id.as_str()));
}

fn first_stage(toml: &mut Toml, given: &FirstStage) {
    toml.line("compensated", &given.compensated.to_string());
    let (low, high) = given.ip_range;
    toml.text("ip_range", &range_to_text(low, high));
    toml.quantity("division", Some(given.division));
    toml.quantity("gauge_scale", given.gauge_scale);
    toml.quantity("gauge_error", given.gauge_error);
    toml.quantity("ip_spread", given.ip_spread);
    toml.quantity("ip_repeat", given.ip_repeat);
    toml.quantity("max_ip", given.max_ip);
    toml.some("trapped_volume", given.trapped_volume.map(uncertain_to_text).as_deref());
    toml.some("fall_observed", given.fall_observed.map(uncertain_to_text).as_deref());
    toml.some("maker", given.maker.as_deref());
    toml.some("serial", given.serial.as_deref());
}

fn diver(toml: &mut Toml, given: &Diver) {
    toml.some("name", given.name.as_deref());
    toml.quantity("mass", given.mass);
    toml.some("loop_volume", given.loop_volume.map(uncertain_to_text).as_deref());
    match given.diluent {
        Some(Diluent::Air) => toml.text("diluent", "air"),
        Some(Diluent::Oxygen(share)) => toml.text("diluent", &format!("oxygen {}", to_text(share))),
        None => {}
    }
}

fn shop(toml: &mut Toml, given: &Shop) {
    toml.text("name", &given.name);
    toml.text("address", &given.address);
    toml.some("contact", given.contact.as_deref());
    toml.some("logo", given.logo.as_ref().map(|logo| logo.file_name.as_str()));
    toml.some("accent", given.accent.as_deref());
    toml.some("number_pattern", given.number_pattern.as_deref());
    let signatory = |given: &Signatory| match &given.role {
        Some(role) => format!("{{ name = {}, role = {} }}", quoted(&given.name), quoted(role)),
        None => quoted(&given.name),
    };
    list(toml, "signatories", given.signatories.iter().map(signatory).collect());
    list(toml, "statements", given.statements.iter().map(|text| quoted(text)).collect());
}

fn list(toml: &mut Toml, key: &str, items: Vec<String>) {
    if !items.is_empty() {
        toml.line(key, &format!("[\n    {},\n]", items.join(",\n    ")));
    }
}

fn instrument(toml: &mut Toml, given: &Instrument) {
    toml.text("measures", given.measures.name());
    match &given.socket {
        Some(Socket::Port(name)) => toml.text("port", name),
        Some(Socket::Usb(device)) => toml.text("usb", device),
        None => {}
    }
    if let Some(baud) = given.baud {
        toml.line("baud", &baud.to_string());
    }
    toml.some("frame", given.frame.as_deref());
    toml.some("unit", given.unit.as_deref());
    if let Some(given) = &given.protocol {
        protocol(toml, given);
    }
    // The papers go by the instrument's name, which is said once.
    match &given.papers {
        Some(InstrumentPapers::Meter(given)) => meter(toml, &Meter { id: None, ..given.clone() }),
        Some(InstrumentPapers::Transducer(given)) => {
            transducer(toml, &Transducer { id: None, ..given.clone() });
        }
        None => {}
    }
}

fn protocol(toml: &mut Toml, given: &Protocol) {
    toml.table("protocol");
    toml.text("kind", kind_of(given));
    let (every, stale_after) = match given {
        Protocol::Lines { ask, every, ends, pattern, stale_after } => {
            toml.some("ask", ask.as_deref());
            toml.text("ends", ends);
            toml.text("pattern", pattern);
            (*every, *stale_after)
        }
        Protocol::ModbusRtu {
            device,
            table,
            register,
            number: kind,
            word_order,
            scale,
            every,
            stale_after,
        } => {
            toml.line("device", &device.to_string());
            toml.text("table", word(&TABLES, table));
            toml.line("register", &register.to_string());
            toml.text("type", word(&TYPES, kind));
            if takes_two(*kind) {
                toml.text("word_order", word(&WORD_ORDERS, word_order));
            }
            toml.line("scale", &number(*scale));
            (*every, *stale_after)
        }
    };
    toml.quantity("every", every);
    toml.quantity("stale_after", stale_after);
}

fn word<T: PartialEq>(words: &[(&'static str, T)], meaning: &T) -> &'static str {
    words.iter().find(|(_, known)| known == meaning).map_or("", |(word, _)| *word)
}
