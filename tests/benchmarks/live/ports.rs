//! What is on the ports: profiles for the listener, lines for the writer, and the time that a number says.

use std::time::{SystemTime, UNIX_EPOCH};

use ebbline::entry::{Id, Instrument, Measures, ModbusNumber, ModbusTable, Protocol, Socket, WordOrder};
use ebbline::quantity::Span;

/// Ten thousandths of a second after which the time in a number begins anew: a hundred seconds.
pub(crate) const ROUND: u64 = 1_000_000;
/// Readings a second of each of the eight.
pub(crate) const A_SECOND: f64 = 100.0;
/// Bytes a second at 921 600 baud with a start and a stop bit.
pub(crate) const BYTES_A_SECOND: f64 = 92_160.0;

/// What is asked of the listener.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Load {
    /// Eight instruments with a hundred readings a second each.
    Eight,
    /// Two that stream without pause at 921 600 baud.
    Fast,
}

impl Load {
    pub(crate) fn named(name: &str) -> Option<Self> {
        [Self::Eight, Self::Fast].into_iter().find(|load| load.name() == name)
    }

    pub(crate) const fn name(self) -> &'static str {
        match self {
            Self::Eight => "eight",
            Self::Fast => "fast",
        }
    }

    pub(crate) const fn says(self) -> &'static str {
        match self {
            Self::Eight => {
                "eight instruments, a hundred readings a second each, streamed, asked for and by Modbus"
            }
            Self::Fast => "two instruments that stream without pause at 921600 baud",
        }
    }

    pub(crate) fn devices(self) -> Vec<Device> {
        use Measures::{Barometer, Cell, Depth, Flow, Pressure, Temperature};
        let device =
            |id, measures, unit, speaks, base, step| Device { id, measures, unit, speaks, base, step };
        match self {
            Self::Eight => vec![
                device("FM-1", Flow, "L/min", Speaks::ByItself, 0.31, 1e-9),
                device("PT-1", Pressure, "bar", Speaks::Modbus, 8.0, 1e-8),
                device("T-1", Temperature, "°C", Speaks::WhenAsked, 21.0, 1e-8),
                device("B-1", Barometer, "hPa", Speaks::ByItself, 1009.0, 1e-7),
                device("C-1", Cell, "bar", Speaks::ByItself, 1.31, 1e-9),
                device("C-2", Cell, "bar", Speaks::ByItself, 1.32, 1e-9),
                device("C-3", Cell, "bar", Speaks::ByItself, 1.33, 1e-9),
                device("D-1", Depth, "m", Speaks::WhenAsked, 1.0, 1e-8),
            ],
            Self::Fast => vec![
                device("FM-1", Flow, "L/min", Speaks::WithoutPause, 0.31, 1e-9),
                device("PT-1", Pressure, "bar", Speaks::WithoutPause, 8.0, 1e-8),
            ],
        }
    }
}

/// How a device speaks.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Speaks {
    /// A line every hundredth of a second.
    ByItself,
    /// Line after line, as fast as the baud rate allows.
    WithoutPause,
    /// An answer to [`ASK`].
    WhenAsked,
    /// Input registers 0 and 1 of device 1, a signed number of 32 bits.
    Modbus,
}

/// What is asked for a line.
pub(crate) const ASK: &str = "READ?\n";

/// A device: its number is `base`, and the time of writing times `step`.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Device {
    pub(crate) id: &'static str,
    pub(crate) measures: Measures,
    pub(crate) unit: &'static str,
    pub(crate) speaks: Speaks,
    base: f64,
    step: f64,
}

/// The time, in ten thousandths of a second; both processes ask the same clock.
pub(crate) fn now() -> u64 {
    let since = SystemTime::now().duration_since(UNIX_EPOCH).unwrap();
    u64::try_from(since.as_micros()).unwrap() / 100
}

impl Device {
    /// The line that is written now.
    pub(crate) fn line(&self) -> String {
        let value = self.base + (now() % ROUND) as f64 * self.step;
        format!("{value:.9} {}\r\n", self.unit)
    }

    /// The registers that are written now.
    pub(crate) fn registers(&self) -> [u8; 4] {
        let whole = (self.base / self.step).round() as i32 + i32::try_from(now() % ROUND).unwrap();
        whole.to_be_bytes()
    }

    /// How long ago a number was written, in ten thousandths of a second.
    pub(crate) fn age(&self, shown: f64, at: u64) -> u64 {
        let written = ((shown - self.base) / self.step).round() as u64;
        (at % ROUND + ROUND - written % ROUND) % ROUND
    }

    pub(crate) fn profile(&self, port: &str) -> Instrument {
        let every = Some(Span::from_s(1.0 / A_SECOND));
        let stale_after = Some(Span::from_s(2.0));
        let protocol = match self.speaks {
            Speaks::Modbus => Protocol::ModbusRtu {
                device: 1,
                table: ModbusTable::Input,
                register: 0,
                number: ModbusNumber::I32,
                word_order: WordOrder::Big,
                scale: self.step,
                every,
                stale_after,
            },
            speaks => Protocol::Lines {
                ask: (speaks == Speaks::WhenAsked).then(|| ASK.to_owned()),
                every,
                ends: "\r\n".to_owned(),
                pattern: r"(?P<value>[-+]?\d+(\.\d+)?)".to_owned(),
                stale_after,
            },
        };
        Instrument {
            id: Id::new(self.id).unwrap(),
            measures: self.measures,
            socket: Some(Socket::Port(port.to_owned())),
            baud: Some(if self.speaks == Speaks::WithoutPause { 921_600 } else { 115_200 }),
            frame: Some("8N1".to_owned()),
            unit: Some(self.unit.to_owned()),
            protocol: Some(protocol),
            papers: None,
        }
    }
}
