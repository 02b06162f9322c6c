//! The serial ports of the machine.

use std::io::{self, Read, Write};
use std::time::Duration;

use serialport::{ClearBuffer, DataBits, FlowControl, SerialPort, SerialPortType, StopBits};

use super::error::OpenError;
use super::line::{Line, LineSettings, Opener, Parity};
use crate::entry::Socket;

/// What a USB port says of itself.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct UsbIdentity {
    /// Number of the vendor.
    pub vendor: u16,
    /// Number of the product.
    pub product: u16,
    /// Serial number; without one the device cannot be told from another of its kind.
    pub serial: Option<String>,
    /// What it calls its maker.
    pub maker: Option<String>,
    /// What it calls itself.
    pub name: Option<String>,
}

impl UsbIdentity {
    /// As a profile names it: `vendor:product:serial`; none without a serial number.
    #[must_use]
    pub fn text(&self) -> Option<String> {
        let serial = self.serial.as_deref().filter(|serial| !serial.trim().is_empty())?;
        Some(format!("{:04x}:{:04x}:{serial}", self.vendor, self.product))
    }

    /// Whether a profile's `vendor:product:serial` means this device; the case of the hexadecimal digits does not
    /// matter.
    #[must_use]
    pub fn is(&self, wanted: &str) -> bool {
        let mut parts = wanted.trim().splitn(3, ':');
        let mut number = || u16::from_str_radix(parts.next()?, 16).ok();
        let numbers = (number(), number());
        // Two devices without a serial number are not known to be one.
        let serial = self.serial.as_deref().map(str::trim).filter(|serial| !serial.is_empty());
        numbers == (Some(self.vendor), Some(self.product))
            && serial.is_some()
            && parts.next().map(str::trim) == serial
    }
}

/// A port of the machine.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct PortSeen {
    /// Its name, as a profile's `port` has it.
    pub name: String,
    /// What it is on USB; none for other ports.
    pub usb: Option<UsbIdentity>,
}

/// The ports there are, in the order of their names.
///
/// # Errors
/// When the system does not tell, with what it says.
pub fn ports() -> Result<Vec<PortSeen>, OpenError> {
    let listed = serialport::available_ports().map_err(|error| OpenError::Failed {
        port: "the list of ports".to_owned(),
        why: error.to_string(),
    })?;
    let seen = |port: serialport::SerialPortInfo| {
        let usb = match port.port_type {
            SerialPortType::UsbPort(usb) => Some(UsbIdentity {
                vendor: usb.vid,
                product: usb.pid,
                serial: usb.serial_number,
                maker: usb.manufacturer,
                name: usb.product,
            }),
            _ => None,
        };
        PortSeen { name: port.port_name, usb }
    };
    let mut ports: Vec<PortSeen> = listed.into_iter().map(seen).collect();
    ports.sort_by(|a, b| a.name.cmp(&b.name));
    Ok(ports)
}

/// The one port of a USB identity among those given.
///
/// # Errors
/// When there is none, and when there are several: which of two ports of one device is meant, its identity does not say.
pub fn port_of<'p>(ports: &'p [PortSeen], identity: &str) -> Result<&'p str, OpenError> {
    let is = |port: &&PortSeen| port.usb.as_ref().is_some_and(|usb| usb.is(identity));
    let found: Vec<&PortSeen> = ports.iter().filter(is).collect();
    match found.as_slice() {
        [only] => Ok(&only.name),
        [] => Err(OpenError::NotPlugged { identity: identity.to_owned() }),
        several => Err(OpenError::SeveralPorts {
            identity: identity.to_owned(),
            ports: several.iter().map(|port| port.name.clone()).collect(),
        }),
    }
}

/// Opens the ports of the machine; a port is opened for this program alone.
#[derive(Debug, Clone, Copy, Default)]
pub struct SystemPorts;

impl Opener for SystemPorts {
    fn open(&self, socket: &Socket, settings: LineSettings) -> Result<Box<dyn Line>, OpenError> {
        let name = match socket {
            Socket::Port(name) => name.clone(),
            // Looked up at each opening: a device that is plugged in again may have another name.
            Socket::Usb(identity) => port_of(&ports()?, identity)?.to_owned(),
        };
        let data_bits = match settings.data_bits {
            5 => DataBits::Five,
            6 => DataBits::Six,
            7 => DataBits::Seven,
            _ => DataBits::Eight,
        };
        let parity = match settings.parity {
            Parity::None => serialport::Parity::None,
            Parity::Even => serialport::Parity::Even,
            Parity::Odd => serialport::Parity::Odd,
        };
        let stop_bits = if settings.stop_bits == 2 { StopBits::Two } else { StopBits::One };
        let port = serialport::new(&name, settings.baud)
            .data_bits(data_bits)
            .parity(parity)
            .stop_bits(stop_bits)
            .flow_control(FlowControl::None)
            .timeout(Duration::from_millis(100))
            .open()
            .map_err(|error| refusal(&name, &error))?;
        port.clear(ClearBuffer::Input).map_err(|error| refusal(&name, &error))?;
        Ok(Box::new(SystemLine(port)))
    }
}

fn refusal(port: &str, error: &serialport::Error) -> OpenError {
    let (port, why) = (port.to_owned(), error.to_string());
    match error.kind {
        serialport::ErrorKind::Io(io::ErrorKind::NotFound) => OpenError::NotThere { port },
        serialport::ErrorKind::Io(
            io::ErrorKind::PermissionDenied | io::ErrorKind::ResourceBusy | io::ErrorKind::WouldBlock,
        ) => OpenError::NotOurs { port, why },
        // A port that another program holds is "no device" on some systems; the file tells the two apart.
        serialport::ErrorKind::NoDevice if !std::path::Path::new(&port).exists() => {
            OpenError::NotThere { port }
        }
        serialport::ErrorKind::NoDevice => OpenError::NotOurs { port, why },
        _ => OpenError::Failed { port, why },
    }
}

struct SystemLine(Box<dyn SerialPort>);

impl Read for SystemLine {
    fn read(&mut self, buffer: &mut [u8]) -> io::Result<usize> {
        self.0.read(buffer)
    }
}

impl Write for SystemLine {
    fn write(&mut self, buffer: &[u8]) -> io::Result<usize> {
        self.0.write(buffer)
    }

    fn flush(&mut self) -> io::Result<()> {
        self.0.flush()
    }
}

impl Line for SystemLine {
    fn wait_at_most(&mut self, longest_s: f64) -> io::Result<()> {
        let longest = Duration::try_from_secs_f64(longest_s).unwrap_or_default();
        // Waits are whole milliseconds on some systems, and nought may mean "for ever" on others.
        self.0.set_timeout(longest.max(Duration::from_millis(1))).map_err(io::Error::from)
    }
}
