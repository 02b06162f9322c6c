//! The certificate as XML: the open digital calibration certificate schema, 3.3.0, with units of the D-SI.
//!
//! Comes in: a [`Content`]. Goes out: the bytes of the XML, the same for the same content. And back: bytes from anywhere to
//! what is printed in them ([`read`]), held to a size, a depth and a number of elements, without document type, entities and
//! processing instructions, so that nothing is fetched, expanded or run. Both sides are laid out as leaves by the same
//! paths, which is what [`super::compare`] works on. The run files, the readings and what is stated are inside.
//!
//! Left out: signatures of the schema's own (`ds:Signature`), other languages than English for our sentences, and validation
//! against the schema, which is not ours to carry: `scripts/validate_dcc.py` does it where the schema is at hand.

mod administrative;
mod element;
mod leaves;
mod quantity;
mod read;
mod results;

use quick_xml::Writer;
use quick_xml::events::{BytesDecl, BytesEnd, BytesStart, BytesText, Event};

use super::content::Content;
pub use element::{Body, Element, Leaf, shifted};
pub use leaves::PrintedLeaf;
pub use leaves::{Expected, expected, printed};
pub use read::{DccError, LONGEST_XML, Parsed, Received, ReceivedFile, read};

/// Version of the schema.
const SCHEMA_VERSION: &str = "3.3.0";
/// Its name spaces.
const DCC: &str = "https://ptb.de/dcc";
const SI: &str = "https://ptb.de/si";
/// Our own name space of terms, each the place of an element: `ebbline_results.nominal.flow`.
const TERMS: &str = "ebbline";
/// What such a term begins with.
const PLACE: &str = "ebbline_";

/// The document of a content.
#[must_use]
pub fn document(content: &Content) -> Element {
    Element::of(
        "dcc:digitalCalibrationCertificate",
        vec![administrative::administrative_data(content), results::measurement_results(content)],
    )
    .with("xmlns:dcc", DCC)
    .with("xmlns:si", SI)
    .with("schemaVersion", SCHEMA_VERSION)
}

/// The bytes of a content.
#[must_use]
pub fn write(content: &Content) -> Vec<u8> {
    let mut writer = Writer::new_with_indent(Vec::new(), b' ', 1);
    // Writing to memory cannot fail.
    let _ = writer.write_event(Event::Decl(BytesDecl::new("1.0", Some("UTF-8"), None)));
    let _ = written(&document(content), &mut writer);
    let mut bytes = writer.into_inner();
    bytes.push(b'\n');
    bytes
}

fn written(element: &Element, writer: &mut Writer<Vec<u8>>) -> std::io::Result<()> {
    let mut start = BytesStart::new(element.name);
    for (name, value) in &element.attributes {
        start.push_attribute((*name, value.as_str()));
    }
    writer.write_event(Event::Start(start))?;
    match &element.body {
        Body::Elements(children) => {
            for child in children {
                written(child, writer)?;
            }
        }
        Body::Leaf(leaf) => writer.write_event(Event::Text(BytesText::new(&leaf.text())))?,
        Body::List(all) => {
            let text: Vec<String> = all.iter().map(Leaf::text).collect();
            writer.write_event(Event::Text(BytesText::new(&text.join(" "))))?;
        }
    }
    writer.write_event(Event::End(BytesEnd::new(element.name)))
}
