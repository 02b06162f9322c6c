//! What the rig sent: every byte, with what was meant or what went wrong.

use std::collections::VecDeque;
use std::fs::File;
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use serde::Serialize;

use super::RigError;
use super::fault::Fault;
use crate::entry::Id;

/// A number that was meant.
#[derive(Debug, Clone, PartialEq)]
pub struct Meant {
    /// The instrument.
    pub gauge: Id,
    /// What it showed.
    pub value: f64,
    /// Symbol of its unit.
    pub unit: &'static str,
    /// What a prompt and perfect instrument would have shown, in the same unit.
    pub truth: f64,
}

/// What a device says at a time, on its way to the port.
#[derive(Debug, Clone, PartialEq)]
pub struct Message {
    /// When it leaves the device, by the clock that the rig was handed.
    pub time_s: f64,
    /// The device: the first of its instruments.
    pub device: Id,
    /// The bytes; none when a fault kept it silent.
    pub bytes: Vec<u8>,
    /// What was meant; none for an exception and for what is no message.
    pub meant: Vec<Meant>,
    /// The faults that befell it.
    pub faults: Vec<Fault>,
}

/// What became of a message.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Delivery {
    /// All bytes went into the port (or there were none to send).
    Whole,
    /// So many of its bytes did, and the rest nowhere: nobody took them.
    Part(usize),
    /// Nobody had the port open, or it was unplugged before the message was on its way.
    Lost,
}

/// A line of the log.
#[derive(Debug, Clone, PartialEq)]
pub struct Sent {
    /// The port by its name in the settings.
    pub port: String,
    /// What was said.
    pub message: Message,
    /// What became of it.
    pub delivery: Delivery,
}

/// Lines that are kept in memory; older ones are only in the file.
const MOST_KEPT: usize = 200_000;

/// The log: in memory, and as lines of JSON in a file, each handed to the system whole before the next.
#[derive(Debug, Default)]
pub struct Log {
    kept: VecDeque<Sent>,
    file: Option<(PathBuf, File)>,
    trouble: Option<RigError>,
}

impl Log {
    /// Writes it to a file from now on, which is made or emptied.
    ///
    /// # Errors
    /// [`RigError::Log`] when the file cannot be made.
    pub fn write_to(&mut self, path: &Path) -> Result<(), RigError> {
        let failed = |source| RigError::Log { path: path.display().to_string(), source };
        self.file = Some((path.to_owned(), File::create(path).map_err(failed)?));
        Ok(())
    }

    /// What was sent, in order; the newest two hundred thousand.
    pub fn sent(&self) -> impl DoubleEndedIterator<Item = &Sent> + ExactSizeIterator {
        self.kept.iter()
    }

    /// The first trouble in writing the file, after which it is left alone; it is handed over once.
    pub fn take_trouble(&mut self) -> Option<RigError> {
        self.trouble.take()
    }

    pub(super) fn keep(&mut self, sent: Sent) {
        if let Some((path, file)) = &mut self.file
            && let Err(source) = write(file, &sent)
        {
            self.trouble = Some(RigError::Log { path: path.display().to_string(), source });
            self.file = None;
        }
        if self.kept.len() == MOST_KEPT {
            self.kept.pop_front();
        }
        self.kept.push_back(sent);
    }
}

/// One line in one call, so that what is there is whole whenever somebody reads it.
fn write(file: &mut File, sent: &Sent) -> io::Result<()> {
    let mut line = serde_json::to_string(&Line::of(sent))?;
    line.push('\n');
    file.write_all(line.as_bytes())
}

/// A line of the file.
#[derive(Serialize)]
struct Line<'a> {
    time_s: f64,
    port: &'a str,
    device: &'a str,
    /// Two hexadecimal digits a byte.
    bytes: String,
    /// Bytes that went into the port.
    delivered: usize,
    lost: bool,
    meant: Vec<MeantLine<'a>>,
    faults: Vec<String>,
}

#[derive(Serialize)]
struct MeantLine<'a> {
    instrument: &'a str,
    value: f64,
    unit: &'a str,
    truth: f64,
}

impl<'a> Line<'a> {
    fn of(sent: &'a Sent) -> Self {
        let message = &sent.message;
        let meant = message.meant.iter().map(|meant| MeantLine {
            instrument: meant.gauge.as_str(),
            value: meant.value,
            unit: meant.unit,
            truth: meant.truth,
        });
        Line {
            time_s: message.time_s,
            port: &sent.port,
            device: message.device.as_str(),
            bytes: message.bytes.iter().map(|byte| format!("{byte:02x}")).collect(),
            delivered: match sent.delivery {
                Delivery::Whole => message.bytes.len(),
                Delivery::Part(bytes) => bytes,
                Delivery::Lost => 0,
            },
            lost: sent.delivery == Delivery::Lost,
            meant: meant.collect(),
            faults: message.faults.iter().map(ToString::to_string).collect(),
        }
    }
}
