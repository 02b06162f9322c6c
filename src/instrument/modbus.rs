//! A Modbus RTU client for several devices on one line, one question at a time.
//!
//! A frame is found by its length and check sum; what is none ends with a gap. After anything but an answer the line has
//! to be quiet before the next question, so that it begins in step again.

use super::conversation::{ANSWER_S, Conversation, Found, GAP_S, Pause, SETTLE_S, Schedule, wire_s};
use super::fault::{Fault, FaultKind};
use super::modbus_frame::{Answer, Request, number_in, scaled};
use super::reading::{Reading, Scale};
use crate::entry::{ModbusNumber, WordOrder};

/// Longest frame (MODBUS over Serial Line, V1.02, 2.3).
const LONGEST_FRAME: usize = 256;

/// One instrument on the line.
#[derive(Debug, Clone)]
pub struct Poll {
    /// What is asked.
    pub request: Request,
    /// How the number is packed.
    pub number: ModbusNumber,
    /// Order of two registers.
    pub word_order: WordOrder,
    /// What the number is multiplied by.
    pub multiplier: f64,
    /// How the number is taken.
    pub scale: Scale,
    /// How often it is asked, in seconds.
    pub every_s: Option<f64>,
}

impl Poll {
    fn reading(&self, registers: &[u16]) -> Result<Reading, FaultKind> {
        let number = number_in(registers, self.number, self.word_order).ok_or(FaultKind::WrongLength)?;
        self.scale.reading(scaled(number, self.multiplier), None)
    }
}

/// Questions and answers on one line.
#[derive(Debug)]
pub struct Modbus {
    polls: Vec<(Poll, Schedule)>,
    state: State,
    baud: u32,
}

#[derive(Debug)]
enum State {
    Pausing(Pause),
    Idle,
    Waiting(Waiting),
}

#[derive(Debug)]
struct Waiting {
    poll: usize,
    heard: Vec<u8>,
    last_byte_s: f64,
    until_s: f64,
}

impl Modbus {
    /// Asks these instruments on a line of this speed.
    #[must_use]
    pub fn new(polls: Vec<Poll>, baud: u32) -> Self {
        let polls = polls.into_iter().map(|poll| {
            let schedule = Schedule::every(poll.every_s);
            (poll, schedule)
        });
        Self { polls: polls.collect(), state: State::Idle, baud }
    }

    /// Silence between frames: 3.5 characters, and 1.75 ms from 19 200 bit/s on (MODBUS over Serial Line, V1.02,
    /// 2.5.1.1).
    fn between_frames_s(&self) -> f64 {
        (3.5 * wire_s(1, self.baud)).max(0.001_75)
    }

    /// How long the line has to be quiet after something that was no answer. An answer does not say its register: where
    /// two questions differ in that alone, a late one must not be taken for the answer to the other.
    fn quiet_s(&self, poll: usize) -> f64 {
        let alike = |a: &Request, b: &Request| {
            (a.device, a.table, a.count) == (b.device, b.table, b.count) && a.register != b.register
        };
        let asked = self.polls.get(poll).map(|(poll, _)| poll.request);
        let twin = asked.is_some_and(|asked| self.polls.iter().any(|(poll, _)| alike(&poll.request, &asked)));
        if twin { ANSWER_S } else { GAP_S / 2.0 }
    }
}

impl Conversation for Modbus {
    fn opened(&mut self, now_s: f64) {
        for (_, schedule) in &mut self.polls {
            schedule.begin(now_s);
        }
        self.state = State::Pausing(Pause::of(now_s, SETTLE_S));
    }

    fn heard(&mut self, now_s: f64, bytes: &[u8], found: &mut Vec<Found>) {
        let between_s = self.between_frames_s();
        let waiting = match &mut self.state {
            State::Pausing(pause) => return pause.heard(now_s),
            State::Idle => return self.state = State::Pausing(Pause::of(now_s, between_s)),
            State::Waiting(waiting) => waiting,
        };
        // What is beyond two frames is noise; it is thrown away before it can grow.
        let room = (2 * LONGEST_FRAME).saturating_sub(waiting.heard.len());
        waiting.heard.extend(bytes.iter().take(room));
        waiting.last_byte_s = now_s;
        let Some((poll, schedule)) = self.polls.get_mut(waiting.poll) else { return };
        let member = waiting.poll;
        match poll.request.answer(&waiting.heard) {
            Some(answer) => {
                let what = match answer {
                    Answer::Registers(registers) => poll.reading(&registers),
                    Answer::Refused(code) => Err(FaultKind::Refused(code)),
                };
                schedule.answered();
                found.push(Found { member, what: what.map_err(|kind| Fault::new(kind, &waiting.heard)) });
                self.state = State::Pausing(Pause::of(now_s, between_s));
            }
            None if waiting.heard.len() >= 2 * LONGEST_FRAME => {
                let fault = Fault::new(FaultKind::CheckSum, &waiting.heard);
                found.push(Found { member, what: Err(fault) });
                self.state = State::Pausing(Pause::of(now_s, self.quiet_s(member)));
            }
            None => {}
        }
    }

    fn turn(&mut self, now_s: f64, found: &mut Vec<Found>) -> Option<Vec<u8>> {
        match &self.state {
            State::Pausing(pause) if now_s >= pause.until_s() => self.state = State::Idle,
            State::Waiting(waiting) if now_s >= waiting.ends_s() => {
                let member = waiting.poll;
                if let Some((poll, schedule)) = self.polls.get_mut(member) {
                    let kind = poll.request.fault(&waiting.heard);
                    if kind == FaultKind::Silence {
                        schedule.silent(now_s);
                    }
                    found.push(Found { member, what: Err(Fault::new(kind, &waiting.heard)) });
                }
                self.state = State::Pausing(Pause::of(now_s, self.quiet_s(member)));
            }
            _ => {}
        }
        if !matches!(self.state, State::Idle) {
            return None;
        }
        let (poll, due_s) = Schedule::next(self.polls.iter().map(|(_, schedule)| schedule))?;
        if now_s < due_s {
            return None;
        }
        let (asked, schedule) = self.polls.get_mut(poll)?;
        schedule.asked(now_s);
        let frame = asked.request.frame();
        let on_the_wire = wire_s(frame.len() + asked.request.length(), self.baud);
        let until_s = now_s + on_the_wire + ANSWER_S;
        self.state =
            State::Waiting(Waiting { poll, heard: Vec::new(), last_byte_s: f64::NEG_INFINITY, until_s });
        Some(frame)
    }

    fn wake_s(&self) -> f64 {
        match &self.state {
            State::Pausing(pause) => pause.until_s(),
            State::Waiting(waiting) => waiting.ends_s(),
            State::Idle => {
                let next = Schedule::next(self.polls.iter().map(|(_, schedule)| schedule));
                next.map_or(f64::INFINITY, |(_, due_s)| due_s)
            }
        }
    }
}

impl Waiting {
    /// When the answer is given up: in time after the question, and not while a frame is coming in.
    fn ends_s(&self) -> f64 {
        self.until_s.max(self.last_byte_s + GAP_S)
    }
}
