//! Instruments to buses: those on one port share its line and are spoken to in turn.

use super::asked::{Asked, Question};
use super::conversation::{Conversation, DEFAULT_STALE_S};
use super::error::{Differ, ProfileError};
use super::line::LineSettings;
use super::modbus::{Modbus, Poll};
use super::modbus_frame::{Request, registers_of};
use super::reading::Scale;
use super::streamed::Streamed;
use super::text_line::LineReader;
use crate::entry::{Instrument, Protocol, Socket};

/// Seconds of silence after which a port is opened anew, unless readings may be older than that.
pub const SILENT_S: f64 = 5.0;

/// A port and what is spoken on it.
pub struct Bus {
    /// The port.
    pub socket: Socket,
    /// How it is set.
    pub settings: LineSettings,
    /// Its instruments, as numbers in the list given, counted from 0; a [`super::Found::member`] counts in this list.
    pub members: Vec<usize>,
    /// What is spoken.
    pub conversation: Box<dyn Conversation>,
    /// Seconds of silence after which the port is opened anew.
    pub silent_s: f64,
}

/// The buses of these instruments, in the order of their first instruments.
///
/// # Errors
/// A profile that cannot be listened to, and two on one port that do not go together.
pub fn buses(instruments: &[Instrument]) -> Result<Vec<Bus>, ProfileError> {
    let mut ports: Vec<(&Socket, Vec<usize>)> = Vec::new();
    for (index, instrument) in instruments.iter().enumerate() {
        let id = || instrument.id.as_str().to_owned();
        let socket = instrument.socket.as_ref().ok_or_else(|| ProfileError::NoSocket { id: id() })?;
        match ports.iter_mut().find(|(known, _)| same(known, socket)) {
            Some((_, members)) => members.push(index),
            None => ports.push((socket, vec![index])),
        }
    }
    ports.into_iter().map(|(socket, members)| bus(instruments, socket, members)).collect()
}

/// A bus of one instrument alone.
///
/// # Errors
/// As [`buses`].
pub fn alone(instrument: &Instrument) -> Result<Bus, ProfileError> {
    let id = || instrument.id.as_str().to_owned();
    let mut buses = buses(std::slice::from_ref(instrument))?;
    buses.pop().ok_or_else(|| ProfileError::NoSocket { id: id() })
}

/// Whether two profiles name one port. The same device once by its port and once by its identity is not known to be
/// one; then the second opening is refused by the system.
fn same(a: &Socket, b: &Socket) -> bool {
    match (a, b) {
        (Socket::Port(a), Socket::Port(b)) => a == b,
        (Socket::Usb(a), Socket::Usb(b)) => {
            let numbers = |text: &str| text.trim().get(..9).map(str::to_ascii_lowercase);
            numbers(a) == numbers(b) && a.trim().get(9..) == b.trim().get(9..)
        }
        _ => false,
    }
}

/// An instrument of a bus, with what of its profile must be there.
struct Member<'i> {
    instrument: &'i Instrument,
    settings: LineSettings,
    protocol: &'i Protocol,
}

fn bus(instruments: &[Instrument], socket: &Socket, members: Vec<usize>) -> Result<Bus, ProfileError> {
    let mut of_bus: Vec<Member<'_>> = Vec::new();
    for instrument in members.iter().filter_map(|index| instruments.get(*index)) {
        let id = || instrument.id.as_str().to_owned();
        let protocol = instrument.protocol.as_ref().ok_or_else(|| ProfileError::NoProtocol { id: id() })?;
        let member = Member { instrument, settings: LineSettings::of(instrument)?, protocol };
        if let Some(first) = of_bus.first() {
            go_together(first, &member)?;
        }
        of_bus.push(member);
    }
    let Some(first) = of_bus.first() else {
        return Err(ProfileError::NoSocket { id: String::new() });
    };
    let settings = first.settings;
    let stale_s = of_bus.iter().map(|member| stale_after_s(member.protocol).unwrap_or(DEFAULT_STALE_S));
    let silent_s = stale_s.fold(SILENT_S, f64::max);
    let conversation: Box<dyn Conversation> = match first.protocol {
        Protocol::Lines { ask: None, ends, .. } => {
            let mut readers = Vec::new();
            for member in &of_bus {
                if let Protocol::Lines { pattern, .. } = member.protocol {
                    let reader = LineReader::new(member.instrument, pattern)?;
                    readers.push((reader, stale_after_s(member.protocol)));
                }
            }
            Box::new(Streamed::new(ends.as_bytes(), readers))
        }
        Protocol::Lines { .. } => Box::new(Asked::new(questions(&of_bus)?, settings.baud)),
        Protocol::ModbusRtu { .. } => {
            let polls: Result<Vec<Poll>, ProfileError> = of_bus.iter().filter_map(poll).collect();
            Box::new(Modbus::new(polls?, settings.baud))
        }
    };
    Ok(Bus { socket: socket.clone(), settings, members, conversation, silent_s })
}

fn go_together(first: &Member<'_>, other: &Member<'_>) -> Result<(), ProfileError> {
    let differ = if first.settings.baud != other.settings.baud {
        Some(Differ::Baud)
    } else if first.settings != other.settings {
        Some(Differ::Frame)
    } else {
        match (first.protocol, other.protocol) {
            (Protocol::ModbusRtu { .. }, Protocol::ModbusRtu { .. }) => None,
            (
                Protocol::Lines { ask: one, ends: one_ends, .. },
                Protocol::Lines { ask: two, ends: two_ends, .. },
            ) => match (one, two) {
                (Some(_), Some(_)) => None,
                (None, None) => (one_ends != two_ends).then_some(Differ::Ends),
                _ => Some(Differ::Asked),
            },
            _ => Some(Differ::Protocol),
        }
    };
    let id = |member: &Member<'_>| member.instrument.id.as_str().to_owned();
    match differ {
        Some(what) => Err(ProfileError::Shared { first: id(first), second: id(other), what }),
        None => Ok(()),
    }
}

/// The questions of a bus; instruments with the same question share its answer.
fn questions(members: &[Member<'_>]) -> Result<Vec<Question>, ProfileError> {
    let mut questions: Vec<Question> = Vec::new();
    for (index, member) in members.iter().enumerate() {
        let Protocol::Lines { ask: Some(ask), every, ends, pattern, .. } = member.protocol else { continue };
        let reader = LineReader::new(member.instrument, pattern)?;
        let every_s = every.map(crate::quantity::Span::as_s);
        let (ask, ends) = (ask.as_bytes(), ends.as_bytes());
        match questions.iter_mut().find(|question| question.ask == ask && question.ends == ends) {
            Some(question) => {
                question.every_s = match (question.every_s, every_s) {
                    (Some(one), Some(other)) => Some(one.min(other)),
                    (one, other) => one.or(other),
                };
                question.readers.push((index, reader));
            }
            None => questions.push(Question {
                ask: ask.to_vec(),
                ends: ends.to_vec(),
                every_s,
                readers: vec![(index, reader)],
            }),
        }
    }
    Ok(questions)
}

fn poll(member: &Member<'_>) -> Option<Result<Poll, ProfileError>> {
    let Protocol::ModbusRtu { device, table, register, number, word_order, scale, every, .. } =
        member.protocol
    else {
        return None;
    };
    let taken = Scale::of(member.instrument).and_then(|scale| match scale.unit() {
        Some(_) => Ok(scale),
        None => Err(ProfileError::NoUnit { id: member.instrument.id.as_str().to_owned() }),
    });
    Some(taken.map(|taken| Poll {
        request: Request {
            device: *device,
            table: *table,
            register: *register,
            count: registers_of(*number),
        },
        number: *number,
        word_order: *word_order,
        multiplier: *scale,
        scale: taken,
        every_s: every.map(crate::quantity::Span::as_s),
    }))
}

/// The age in seconds from which a reading is stale.
fn stale_after_s(protocol: &Protocol) -> Option<f64> {
    let (Protocol::Lines { stale_after, .. } | Protocol::ModbusRtu { stale_after, .. }) = protocol;
    stale_after.map(crate::quantity::Span::as_s)
}
