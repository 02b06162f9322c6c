//! A serial line of the rig: what its devices say of themselves, what they answer, and what goes wrong on the way.
//!
//! Comes in: bytes, times, what the instruments show. Goes out: messages with their times. Knows nothing of clocks and
//! of what carries the bytes. Left out: the time that the bytes themselves take on the line.

use super::fault::{Fault, FaultPlan};
use super::gauge::{AtWork, Reading};
use super::lines::{LinesDevice, Speaks};
use super::log::{Meant, Message};
use super::modbus::{self, ModbusDevice};
use crate::entry::Id;
use crate::stats::monte_carlo::Random;

/// What is on a line.
#[derive(Debug, Clone, PartialEq)]
pub enum Wiring {
    /// One instrument, or a box of several, with lines of text.
    Lines(LinesDevice),
    /// Modbus devices on one bus, each with the seconds it takes to answer.
    Bus {
        /// The devices.
        devices: Vec<ModbusDevice>,
        /// Seconds from request to answer.
        delay_s: f64,
    },
}

/// A serial line.
#[derive(Debug, Clone, PartialEq)]
pub struct PortSettings {
    /// Its name: of the file that leads to its pseudo-terminal, and in profiles before there is one.
    pub name: String,
    /// Bits per second, for the register; nothing here waits for bits.
    pub baud: u32,
    /// Data bits, parity and stop bits, as `8N1`.
    pub frame: String,
    /// What is on it.
    pub wiring: Wiring,
}

/// Silence after which what was begun on a bus is dropped, seconds. The specification has 3.5 characters, which no
/// reader on a general computer keeps.
const BUS_SILENCE_S: f64 = 0.1;
/// The longest that is kept of what is no command, bytes.
const MOST_INPUT: usize = 512;

/// A line at work.
#[derive(Debug, Clone)]
pub(super) struct Port {
    pub(super) settings: PortSettings,
    /// One for lines, one for each device of a bus, in their order.
    pub(super) speakers: Vec<Speaker>,
    input: Vec<u8>,
    heard_s: f64,
    /// Said, and due later.
    pending: Vec<Message>,
    /// Due, and not fetched yet.
    pub(super) out: Vec<Message>,
    /// How often the plug went in or out.
    pub(super) plugs: u64,
    pub(super) plugged: bool,
}

/// One device on a line.
#[derive(Debug, Clone)]
pub(super) struct Speaker {
    /// Its first instrument, by which it goes.
    pub(super) label: Id,
    /// Its instruments, by their place in the rig.
    pub(super) gauges: Vec<usize>,
    pub(super) faults: FaultPlan,
    frozen: Option<Vec<Reading>>,
    held: Vec<Message>,
    random: Random,
    /// Number of the next line it sends by itself.
    next: u64,
}

impl Speaker {
    pub(super) fn new(label: Id, gauges: Vec<usize>, random: Random) -> Self {
        Self { label, gauges, faults: FaultPlan::default(), frozen: None, held: Vec::new(), random, next: 0 }
    }

    /// What all instruments show, as this device has it: frozen where it is.
    fn shown(&mut self, all: &[AtWork], in_force: &[Fault]) -> Vec<Reading> {
        let now: Vec<Reading> = all.iter().map(|at_work| at_work.reading).collect();
        if in_force.contains(&Fault::Frozen) {
            self.frozen.get_or_insert(now).clone()
        } else {
            self.frozen = None;
            now
        }
    }

    /// Says something at `t_s` of the rig: does to the bytes what is in force, and hands over what is due, with the
    /// seconds each is late.
    fn say(&mut self, t_s: f64, said: Said, in_force: Vec<Fault>) -> Vec<(f64, Message)> {
        let Said { mut bytes, meant, command } = said;
        let (mut late_s, mut burst) = (0.0, false);
        for fault in &in_force {
            match fault {
                Fault::Echo => {
                    let before = command.clone().unwrap_or_else(|| bytes.clone());
                    bytes.splice(0..0, before);
                }
                Fault::HalfLine => {
                    let length = bytes.len().max(2);
                    // At least the first byte comes, and the last does not.
                    let kept = self.random.rectangular(1.0, length as f64) as usize;
                    bytes.truncate(kept);
                }
                Fault::Garbage => {
                    let length = self.random.rectangular(1.0, 17.0) as usize;
                    let random = &mut self.random;
                    let garbage: Vec<u8> =
                        (0..length).map(|_| random.rectangular(0.0, 256.0) as u8).collect();
                    bytes.splice(0..0, garbage);
                }
                Fault::Silence => bytes.clear(),
                Fault::Late(s) => late_s += s,
                Fault::Burst => burst = true,
                _ => {}
            }
        }
        if in_force.contains(&Fault::Silence) {
            bytes.clear();
        }
        self.faults.spend(t_s);
        let message = Message { time_s: t_s, device: self.label.clone(), bytes, meant, faults: in_force };
        if burst {
            self.held.push(message);
            return Vec::new();
        }
        // What was held back leaves now.
        let held = self.held.drain(..).map(|held| (0.0, Message { time_s: t_s, ..held }));
        let mut due: Vec<(f64, Message)> = held.collect();
        due.push((late_s, message));
        due
    }
}

/// What a device has to say, before anything goes wrong with it on the line.
struct Said {
    bytes: Vec<u8>,
    meant: Vec<Meant>,
    /// What was asked; none when it speaks by itself.
    command: Option<Vec<u8>>,
}

fn meant(all: &[AtWork], shown: &[Reading], gauges: &[usize]) -> Vec<Meant> {
    let one = |gauge: &usize| {
        let (at_work, reading) = (all.get(*gauge)?, shown.get(*gauge)?);
        Some(Meant {
            gauge: at_work.gauge.id.clone(),
            value: reading.value,
            unit: reading.unit.symbol,
            // What was shown may be frozen; the truth is not.
            truth: at_work.reading.truth,
        })
    };
    gauges.iter().filter_map(one).collect()
}

impl Port {
    pub(super) fn new(settings: PortSettings, speakers: Vec<Speaker>) -> Self {
        Self {
            settings,
            speakers,
            input: Vec::new(),
            heard_s: f64::NEG_INFINITY,
            pending: Vec::new(),
            out: Vec::new(),
            plugs: 0,
            plugged: true,
        }
    }

    /// Plug in or out as the plans say at `t_s`; goes out: whether that is new.
    pub(super) fn plug(&mut self, t_s: f64) -> bool {
        let plugged = !self.speakers.iter().any(|speaker| speaker.faults.unplugged(t_s));
        let new = plugged != self.plugged;
        if new {
            self.plugged = plugged;
            self.plugs += 1;
            self.input.clear();
            self.pending.clear();
            for speaker in &mut self.speakers {
                speaker.held.clear();
            }
        }
        new
    }

    /// Lines that come by themselves and are due by `t_s`.
    pub(super) fn speak(&mut self, t_s: f64, all: &[AtWork]) {
        let Wiring::Lines(device) = &self.settings.wiring else { return };
        let (Speaks::ByItself { every_s }, Some(speaker)) = (&device.speaks, self.speakers.first_mut())
        else {
            return;
        };
        // The first line comes one interval after the beginning; a billionth of a second of room for rounding.
        while (speaker.next + 1) as f64 * every_s <= t_s + 1e-9 {
            speaker.next += 1;
            if self.plugged {
                let due = line_of(device, speaker, t_s, all, None);
                self.pending.extend(due.into_iter().map(|(late_s, message)| after(late_s, message)));
            }
        }
    }

    /// Bytes that come in at `t_s`.
    pub(super) fn hear(&mut self, t_s: f64, bytes: &[u8], all: &[AtWork]) {
        if bytes.is_empty() || !self.plugged {
            return;
        }
        if matches!(self.settings.wiring, Wiring::Bus { .. }) && t_s - self.heard_s > BUS_SILENCE_S {
            self.input.clear();
        }
        self.heard_s = t_s;
        self.input.extend_from_slice(bytes);
        match &self.settings.wiring {
            Wiring::Lines(device) => {
                let (Speaks::WhenAsked { ask, delay_s, .. }, Some(speaker)) =
                    (&device.speaks, self.speakers.first_mut())
                else {
                    self.input.clear();
                    return;
                };
                let ask = ask.as_bytes();
                while let Some(at) = self.input.windows(ask.len().max(1)).position(|window| window == ask) {
                    self.input.drain(..at + ask.len());
                    let due = line_of(device, speaker, t_s, all, Some(ask.to_vec()));
                    self.pending
                        .extend(due.into_iter().map(|(late_s, message)| after(late_s + delay_s, message)));
                }
            }
            Wiring::Bus { devices, delay_s } => {
                while let Some(request) = modbus::next_request(&mut self.input) {
                    let Some((address, pdu)) = request.split_first() else { continue };
                    let mut both = devices.iter().zip(&mut self.speakers);
                    // Another address is another's, and a broadcast (0) is answered by nobody.
                    if let Some((device, speaker)) = both.find(|(device, _)| device.address == *address) {
                        let due = answer_of(device, speaker, t_s, all, pdu);
                        self.pending.extend(
                            due.into_iter().map(|(late_s, message)| after(late_s + delay_s, message)),
                        );
                    }
                }
            }
        }
        // What stands before half a command is no part of one.
        if self.input.len() > MOST_INPUT {
            self.input.drain(..self.input.len() - MOST_INPUT);
        }
    }

    /// Moves what is due by `t_s` to what goes out.
    pub(super) fn fall_due(&mut self, t_s: f64) {
        // Late ones are overtaken, and what is due at once keeps its order.
        let (due, later) = self.pending.drain(..).partition(|message| message.time_s <= t_s + 1e-9);
        self.pending = later;
        let mut due: Vec<Message> = due;
        due.sort_by(|a, b| a.time_s.total_cmp(&b.time_s));
        self.out.extend(due);
    }
}

fn after(late_s: f64, message: Message) -> Message {
    Message { time_s: message.time_s + late_s, ..message }
}

/// A line of a device with lines, at `t_s`.
fn line_of(
    device: &LinesDevice,
    speaker: &mut Speaker,
    t_s: f64,
    all: &[AtWork],
    command: Option<Vec<u8>>,
) -> Vec<(f64, Message)> {
    let in_force = speaker.faults.in_force(t_s);
    let shown = speaker.shown(all, &in_force);
    let by = usize::from(in_force.contains(&Fault::WrongDevice));
    let count = shown.len().max(1);
    let readings: Vec<Reading> =
        speaker.gauges.iter().filter_map(|gauge| shown.get((gauge + by) % count)).copied().collect();
    let bytes = device.line(&readings, &in_force);
    let meant = meant(all, &shown, &speaker.gauges);
    speaker.say(t_s, Said { bytes, meant, command }, in_force)
}

/// The answer of a device on a bus, at `t_s`.
fn answer_of(
    device: &ModbusDevice,
    speaker: &mut Speaker,
    t_s: f64,
    all: &[AtWork],
    pdu: &[u8],
) -> Vec<(f64, Message)> {
    let in_force = speaker.faults.in_force(t_s);
    let shown = speaker.shown(all, &in_force);
    let word = |table, register| {
        let at = device.values.iter().position(|value| value.holds(table, register))?;
        let (value, gauge) = (device.values.get(at)?, speaker.gauges.get(at)?);
        let words = value.words(shown.get(*gauge)?, &in_force);
        words.get(usize::from(register - value.register)).copied()
    };
    let reply = modbus::answer(pdu, word);
    let exception = reply.first().is_some_and(|function| function & 0x80 != 0);
    let asked = |value: &modbus::ModbusValue| {
        modbus::asked(pdu).is_some_and(|(table, first, count)| {
            (0..count).any(|k| first.checked_add(k).is_some_and(|register| value.holds(table, register)))
        })
    };
    let gauges: Vec<usize> = device
        .values
        .iter()
        .zip(&speaker.gauges)
        .filter(|(value, _)| !exception && asked(value))
        .map(|(_, gauge)| *gauge)
        .collect();
    let address = if in_force.contains(&Fault::WrongDevice) {
        // The next address there can be.
        device.address % 247 + 1
    } else {
        device.address
    };
    let mut bytes = modbus::frame(address, &reply);
    if in_force.contains(&Fault::BadCrc)
        && let Some(last) = bytes.last_mut()
    {
        *last ^= 0x01;
    }
    let meant = meant(all, &shown, &gauges);
    let command = Some(modbus::frame(device.address, pdu));
    speaker.say(t_s, Said { bytes, meant, command }, in_force)
}
