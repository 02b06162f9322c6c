//! The serial ports there are, and which registered instrument is set to which.
//!
//! Comes in: ports and instruments as plain data. Goes out: text and JSON. What a device calls itself is data, and is
//! tamed like anything typed.

use serde::Serialize;

use super::json_text;
use super::layout::wrapped;
use super::typed::tame;

/// What a port says of itself on USB.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UsbShown {
    /// `vendor:product:serial`, as a profile names it; none without a serial number.
    pub identity: Option<String>,
    /// `vendor:product`.
    pub model: String,
    /// What it calls its maker.
    pub maker: Option<String>,
    /// What it calls itself.
    pub name: Option<String>,
}

/// A port.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PortShown {
    /// Its name.
    pub name: String,
    /// What it is on USB; none for other ports.
    pub usb: Option<UsbShown>,
    /// The registered instruments that are set to it.
    pub instruments: Vec<String>,
}

/// An instrument whose port is not among those there are.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Absent {
    /// The instrument.
    pub instrument: String,
    /// The port or USB identity it is set to.
    pub set_to: String,
    /// Whether that names a file all the same, such as a pseudo-terminal, which no list of ports has.
    pub there: bool,
}

/// The ports there are.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PortList {
    /// In the order of their names.
    pub ports: Vec<PortShown>,
    /// Instruments that are set to none of them.
    pub absent: Vec<Absent>,
    /// Whether there is a book with a register to look in.
    pub book: bool,
}

/// For a person.
#[must_use]
pub fn text(list: &PortList) -> String {
    let mut text = String::new();
    if list.ports.is_empty() {
        text.push_str(&wrapped(
            "",
            "  ",
            "There is no serial port here: plug an instrument or its adapter in.",
        ));
    }
    for port in &list.ports {
        text.push_str(&format!("{}\n", tame(&port.name)));
        if let Some(usb) = &port.usb {
            let called: Vec<String> =
                [&usb.maker, &usb.name].into_iter().flatten().map(|called| tame(called)).collect();
            let called = if called.is_empty() {
                String::new()
            } else {
                format!(", calls itself {}", called.join(" "))
            };
            let identity = match &usb.identity {
                Some(identity) => format!("usb = \"{}\"{called}", tame(identity)),
                None => format!(
                    "USB {}{called}; without a serial number it is told from its like by its port alone",
                    usb.model
                ),
            };
            text.push_str(&wrapped("  ", "    ", &identity));
        }
        match port.instruments.as_slice() {
            [] => text.push_str("  no registered instrument is set to it\n"),
            set => text.push_str(&wrapped("  set to it: ", "    ", &set.join(", "))),
        }
    }
    for absent in &list.absent {
        let what = if absent.there {
            "which no list of ports has, but is there"
        } else {
            "which is not there: check the cable"
        };
        let line = format!("{} is set to {}, {what}", absent.instrument, tame(&absent.set_to));
        text.push_str(&wrapped("", "  ", &line));
    }
    if !list.book {
        text.push_str("There is no book yet, so no instrument is registered.\n");
    }
    text
}

/// As a document.
#[must_use]
pub fn json(list: &PortList) -> String {
    let ports = list.ports.iter().map(|port| Port {
        port: &port.name,
        usb: port.usb.as_ref().and_then(|usb| usb.identity.as_deref()),
        usb_model: port.usb.as_ref().map(|usb| usb.model.as_str()),
        usb_maker: port.usb.as_ref().and_then(|usb| usb.maker.as_deref()),
        usb_name: port.usb.as_ref().and_then(|usb| usb.name.as_deref()),
        instruments: &port.instruments,
    });
    let absent = list.absent.iter().map(|absent| AbsentJson {
        instrument: &absent.instrument,
        set_to: &absent.set_to,
        there: absent.there,
    });
    json_text(&Document { format: 1, ports: ports.collect(), absent: absent.collect(), book: list.book })
}

#[derive(Serialize)]
struct Document<'a> {
    format: u32,
    ports: Vec<Port<'a>>,
    absent: Vec<AbsentJson<'a>>,
    book: bool,
}

#[derive(Serialize)]
struct Port<'a> {
    port: &'a str,
    usb: Option<&'a str>,
    usb_model: Option<&'a str>,
    usb_maker: Option<&'a str>,
    usb_name: Option<&'a str>,
    instruments: &'a [String],
}

#[derive(Serialize)]
struct AbsentJson<'a> {
    instrument: &'a str,
    set_to: &'a str,
    there: bool,
}

#[cfg(test)]
mod tests {
    use super::*;

    fn list() -> PortList {
        let usb = UsbShown {
            identity: Some("0403:6001:A1".into()),
            model: "0403:6001".into(),
            maker: Some("Some\u{1b}[2Jbody".into()),
            name: None,
        };
        let bare = UsbShown { identity: None, maker: None, model: "1a86:7523".into(), name: None };
        let port = |name: &str, usb, instruments: &[&str]| PortShown {
            name: name.into(),
            usb,
            instruments: instruments.iter().map(|id| (*id).to_owned()).collect(),
        };
        PortList {
            ports: vec![
                port("COM3", Some(usb), &["FM-01", "PT-01"]),
                port("COM4", Some(bare), &[]),
                port("COM5", None, &[]),
            ],
            absent: vec![Absent { instrument: "BAR-1".into(), set_to: "COM9".into(), there: false }],
            book: true,
        }
    }

    #[test]
    fn every_port_says_what_it_is_and_who_is_set_to_it() {
        let text = text(&list());
        for words in [
            "COM3\n  usb = \"0403:6001:A1\", calls itself Some\\u{1b}[2Jbody\n  set to it: FM-01, PT-01\n",
            "COM4\n  USB 1a86:7523; without a serial number",
            "COM5\n  no registered instrument is set to it\n",
            "BAR-1 is set to COM9, which is not there: check the cable\n",
        ] {
            assert!(text.contains(words), "{words:?} is not in {text}");
        }
        assert!(!text.contains('\u{1b}') && !text.contains("no book"));
    }

    #[test]
    fn nothing_there_is_said() {
        let none = PortList { ports: Vec::new(), absent: Vec::new(), book: false };
        let text = text(&none);
        assert!(text.contains("no serial port") && text.contains("no book"), "{text}");
        let document: serde_json::Value = serde_json::from_str(&json(&none)).unwrap();
        assert_eq!(document, serde_json::json!({ "format": 1, "ports": [], "absent": [], "book": false }));
    }
}
