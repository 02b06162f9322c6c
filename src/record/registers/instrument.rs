//! An instrument of the register: where it is found, how its line is set, its protocol, its papers.

use super::super::document::{Field, Table};
use super::super::error::{RecordError, Refusal};
use super::super::instruments;
use super::super::note::Note;
use super::keys::id;
use super::pattern::Groups;
use super::{RegisterRefusal, protocol};
use crate::entry::{Id, Instrument, InstrumentPapers, Measures, Protocol, Socket};
use crate::quantity::unit::{self, Unit};
use crate::quantity::{Kind, QuantityError};

const KEYS: [&str; 11] =
    ["record", "id", "measures", "port", "usb", "baud", "frame", "unit", "protocol", "meter", "transducer"];

const MEASURES: [(&str, Measures); 6] = [
    (Measures::Flow.name(), Measures::Flow),
    (Measures::Pressure.name(), Measures::Pressure),
    (Measures::Temperature.name(), Measures::Temperature),
    (Measures::Barometer.name(), Measures::Barometer),
    (Measures::Cell.name(), Measures::Cell),
    (Measures::Depth.name(), Measures::Depth),
];

pub(super) fn read(file: &Table<'_>, stands: Option<&Id>) -> Result<Instrument, RecordError> {
    file.only(&KEYS)?;
    let id = id(file, "id = \"FM-01\"", stands)?;
    let measures = file.required("measures", "measures = \"flow\"")?.word(&MEASURES)?;
    let socket = socket(file)?;
    if socket.is_none() {
        for key in ["baud", "frame", "protocol"] {
            if let Some(field) = file.field(key) {
                return Err(field.refuse(RegisterRefusal::NoSocket(key).into()));
            }
        }
    }
    let baud = match (&socket, file.field("baud")) {
        (_, Some(field)) => Some(baud(&field)?),
        (Some(_), None) => return Err(file.refuse("baud", Refusal::MissingKey("baud = 19200"))),
        (None, None) => None,
    };
    let frame = file.field("frame").map(|field| frame(&field)).transpose()?;
    let unit = file.field("unit").map(|field| unit(&field, measures)).transpose()?;
    let protocol = match (&socket, file.field("protocol")) {
        (Some(_), Some(field)) => Some(protocol::read(&field.table("protocol")?)?),
        (Some(_), None) => {
            let example = "a table [protocol] with kind = \"lines\" and how it is spoken to";
            return Err(file.refuse("protocol", Refusal::MissingKey(example)));
        }
        (None, _) => None,
    };
    fits(file, measures, protocol.as_ref(), frame.as_deref())?;
    let papers = papers(file, measures, &id)?;
    let unit = unit.map(|unit| unit.symbol.to_owned());
    Ok(Instrument { id, measures, socket, baud, frame, unit, protocol, papers })
}

fn socket(file: &Table<'_>) -> Result<Option<Socket>, RecordError> {
    let words = |field: Field<'_>| field.free_text()?.ok_or_else(|| field.refuse(Refusal::EmptyText));
    match (file.field("port"), file.field("usb")) {
        (Some(_), Some(usb)) => Err(usb.refuse(RegisterRefusal::PortAndUsb.into())),
        (Some(port), None) => Ok(Some(Socket::Port(words(port)?))),
        (None, Some(usb)) => {
            let text = usb.seen_text()?.trim();
            let mut parts = text.splitn(3, ':');
            let number = |part: Option<&str>| {
                part.is_some_and(|part| part.len() == 4 && part.bytes().all(|c| c.is_ascii_hexdigit()))
            };
            let (vendor, product) = (number(parts.next()), number(parts.next()));
            if vendor && product && parts.next().is_some_and(|serial| !serial.trim().is_empty()) {
                Ok(Some(Socket::Usb(text.to_owned())))
            } else {
                Err(usb.refuse(RegisterRefusal::NotUsb(text.to_owned()).into()))
            }
        }
        (None, None) => Ok(None),
    }
}

fn baud(field: &Field<'_>) -> Result<u32, RecordError> {
    let given = field.integer()?;
    u32::try_from(given).ok().filter(|baud| *baud > 0).ok_or_else(|| {
        let want = "a number of bits per second above zero, as in 19200";
        field.refuse(Refusal::OutOfBounds { shown: given.to_string(), want })
    })
}

/// Data bits, parity and stop bits, in capitals.
fn frame(field: &Field<'_>) -> Result<String, RecordError> {
    let text = field.text()?.trim();
    let frame = text.to_ascii_uppercase();
    match frame.as_bytes() {
        [b'5'..=b'8', b'N' | b'E' | b'O', b'1' | b'2'] => Ok(frame),
        _ => Err(field.refuse(RegisterRefusal::NotAFrame(text.to_owned()).into())),
    }
}

/// The unit of the numbers an instrument sends.
fn unit(field: &Field<'_>, measures: Measures) -> Result<Unit, RecordError> {
    let text = field.text()?.trim();
    let unit = of(measures, text).map_err(|error| match measures {
        Measures::Cell => field.refuse(RegisterRefusal::CellUnit(text.to_owned()).into()),
        _ => field.refuse(Refusal::Quantity(error)),
    })?;
    if let Some(says) = unit.remark {
        field.note(Note::Remark { place: field.place(), says });
    }
    Ok(unit)
}

fn of(measures: Measures, text: &str) -> Result<Unit, QuantityError> {
    match measures {
        Measures::Flow => unit::lookup(Kind::Flow, text),
        Measures::Pressure | Measures::Barometer => unit::lookup(Kind::Pressure, text),
        Measures::Temperature => unit::lookup(Kind::Temperature, text),
        Measures::Depth => unit::lookup(Kind::Length, text),
        // A bare cell gives a voltage, a box with cells in it their PO2.
        Measures::Cell => unit::lookup(Kind::Voltage, text).or_else(|_| unit::lookup(Kind::Pressure, text)),
    }
}

/// Whether unit, frame and protocol go together.
fn fits(
    file: &Table<'_>,
    measures: Measures,
    protocol: Option<&Protocol>,
    frame: Option<&str>,
) -> Result<(), RecordError> {
    type NoUnit = fn(&'static str) -> RegisterRefusal;
    let (sends_unit, no_unit): (_, NoUnit) = match protocol {
        None => return Ok(()),
        Some(Protocol::Lines { pattern, .. }) => {
            (Groups::of(pattern).is_ok_and(|groups| groups.unit), RegisterRefusal::NoUnitInLines)
        }
        Some(Protocol::ModbusRtu { .. }) => {
            // "MODBUS over Serial Line", V1.02, 2.5.1: each byte is sent with eight data bits.
            if let (Some(field), Some(false)) = (file.field("frame"), frame.map(|f| f.starts_with('8'))) {
                return Err(field.refuse(RegisterRefusal::ModbusFrame.into()));
            }
            (false, RegisterRefusal::NoUnit)
        }
    };
    if file.field("unit").is_some() || sends_unit {
        return Ok(());
    }
    let example = match measures {
        Measures::Flow => "L/min",
        Measures::Pressure => "bar",
        Measures::Temperature => "°C",
        Measures::Barometer => "hPa",
        Measures::Cell => "mV",
        Measures::Depth => "m",
    };
    Err(file.refuse("unit", no_unit(example).into()))
}

/// The papers, which go by the instrument's name.
fn papers(file: &Table<'_>, measures: Measures, id: &Id) -> Result<Option<InstrumentPapers>, RecordError> {
    let goes_with = |field: &Field<'_>, table: &'static str, goes_with: &'static str, goes: bool| {
        let refusal = RegisterRefusal::PapersOfOther { table, goes_with, measures: measures.name() };
        if goes { Ok(()) } else { Err(field.refuse(refusal.into())) }
    };
    let named = |table: &Table<'_>, given: Option<Id>| match (given, table.field("id")) {
        (Some(given), Some(field)) if !given.same_as(id) => {
            let (given, stands) = (given.as_str().to_owned(), id.as_str().to_owned());
            Err(field.refuse(RegisterRefusal::PapersId { given, stands }.into()))
        }
        _ => Ok(Some(id.clone())),
    };
    let meter = file.field("meter");
    if let Some(field) = &meter {
        goes_with(field, "meter", "flow", measures == Measures::Flow)?;
    }
    if let Some(field) = file.field("transducer") {
        let goes = matches!(measures, Measures::Pressure | Measures::Barometer);
        goes_with(&field, "transducer", "pressure or barometer", goes)?;
        let table = field.table("transducer")?;
        let mut transducer = instruments::transducer(&table)?;
        transducer.id = named(&table, transducer.id)?;
        return Ok(Some(InstrumentPapers::Transducer(transducer)));
    }
    let Some(field) = meter else { return Ok(None) };
    let table = field.table("meter")?;
    let mut meter = instruments::meter(&table, None)?;
    meter.id = named(&table, meter.id)?;
    Ok(Some(InstrumentPapers::Meter(meter)))
}
