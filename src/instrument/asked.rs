//! Instruments that answer a question with a line of text; several may read their numbers out of one answer, and several
//! questions may be asked on one port.

use super::conversation::{ANSWER_S, Conversation, Found, GAP_S, Pause, SETTLE_S, Schedule, wire_s};
use super::fault::{Fault, FaultKind};
use super::split::{LONGEST_LINE, Piece, Splitter};
use super::streamed::shared;
use super::text_line::{LineReader, without_echo};

/// Seconds without a byte after which a line nobody asked for is over, where there is time for so many.
const UNASKED_S: f64 = GAP_S / 2.0;
/// Where there is not, the part of the time from one question to the next that has to be quiet.
const UNASKED_PART: f64 = 0.25;

/// A question and those who read its answer.
#[derive(Debug)]
pub struct Question {
    /// What is sent.
    pub ask: Vec<u8>,
    /// What ends a line of the answer.
    pub ends: Vec<u8>,
    /// How often it is asked, in seconds.
    pub every_s: Option<f64>,
    /// Who reads it: the number of the instrument on the port, and how.
    pub readers: Vec<(usize, LineReader)>,
}

/// Questions and answers on one port.
#[derive(Debug)]
pub struct Asked {
    questions: Vec<Asking>,
    state: State,
    baud: u32,
    /// The line did not fall silent, so that the next line heard may be the rest of one.
    restless: bool,
}

#[derive(Debug)]
struct Asking {
    question: Question,
    splitter: Splitter,
    schedule: Schedule,
}

#[derive(Debug)]
enum State {
    /// Nothing is asked while the line is not quiet.
    Pausing(Pause),
    /// Nothing is going on; a byte that nobody asked for came last at this second.
    Idle(f64),
    /// An answer is waited for.
    Waiting(Waiting),
}

#[derive(Debug)]
struct Waiting {
    question: usize,
    until_s: f64,
    at_most_s: f64,
    /// Readers of whom a reading or a fault was found.
    done: Vec<usize>,
    /// Lines were heard that nobody could read; each was said.
    strange: bool,
    /// Empty lines were heard: some instruments put one before their answer.
    blank: bool,
}

impl Asked {
    /// Asks these questions on a line of this speed.
    #[must_use]
    pub fn new(questions: Vec<Question>, baud: u32) -> Self {
        let asking = |question: Question| {
            let splitter = Splitter::joining(&question.ends);
            let schedule = Schedule::every(question.every_s);
            Asking { question, splitter, schedule }
        };
        let questions = questions.into_iter().map(asking).collect();
        Self { questions, state: State::Idle(f64::NEG_INFINITY), baud, restless: false }
    }

    /// How long a line has to be quiet after an answer did not come. Where several questions are asked, a late answer
    /// must not be taken for that to the next.
    fn quiet_s(&self) -> f64 {
        if self.questions.len() > 1 { ANSWER_S } else { UNASKED_S }
    }

    /// Ends a question that was not fully answered.
    fn give_up(&mut self, now_s: f64, found: &mut Vec<Found>) {
        let State::Waiting(waiting) = &self.state else { return };
        if let Some(asking) = self.questions.get_mut(waiting.question) {
            let half = asking.splitter.half();
            let (kind, heard) = match half.trim_ascii() {
                [] if waiting.blank => (FaultKind::Empty, [].as_slice()),
                [] => (FaultKind::Silence, [].as_slice()),
                // The echo of the question alone is no answer begun.
                said if said == asking.question.ask.trim_ascii() => (FaultKind::Silence, [].as_slice()),
                _ => (FaultKind::HalfLine, half),
            };
            // Lines that nobody could read were said already.
            let said = waiting.strange && waiting.done.is_empty() && kind != FaultKind::HalfLine;
            if !said {
                let open =
                    asking.question.readers.iter().filter(|(member, _)| !waiting.done.contains(member));
                found.extend(
                    open.map(|(member, _)| Found { member: *member, what: Err(Fault::new(kind, heard)) }),
                );
            }
            if kind == FaultKind::Silence && !waiting.strange && waiting.done.is_empty() {
                asking.schedule.silent(now_s);
            }
        }
        self.state = State::Pausing(Pause::of(now_s, self.quiet_s()));
    }
}

impl Conversation for Asked {
    fn opened(&mut self, now_s: f64) {
        for asking in &mut self.questions {
            asking.schedule.begin(now_s);
        }
        self.state = State::Pausing(Pause::of(now_s, SETTLE_S));
    }

    fn heard(&mut self, now_s: f64, bytes: &[u8], found: &mut Vec<Found>) {
        let waiting = match &mut self.state {
            State::Pausing(pause) => return pause.heard(now_s),
            State::Idle(last_s) => {
                *last_s = now_s;
                return;
            }
            State::Waiting(waiting) => waiting,
        };
        let Some(asking) = self.questions.get_mut(waiting.question) else { return };
        waiting.until_s = waiting.until_s.max(now_s + GAP_S * 2.5).min(waiting.at_most_s);
        for byte in bytes {
            let line = match asking.splitter.push(*byte) {
                None => continue,
                Some(Piece::Line(line)) => line,
                Some(Piece::TooLong(long)) => {
                    let readers = asking.question.readers.iter();
                    let fault = Fault::new(FaultKind::TooLong, &long);
                    found.extend(
                        readers.map(|(member, _)| Found { member: *member, what: Err(fault.clone()) }),
                    );
                    self.state = State::Pausing(Pause::of(now_s, self.quiet_s()));
                    return;
                }
            };
            let Some(line) = without_echo(&line, &asking.question.ask) else { continue };
            if line.trim_ascii().is_empty() {
                waiting.blank = true;
                continue;
            }
            let first = found.len();
            let readers = asking.question.readers.iter();
            let open = readers.filter(|(member, _)| !waiting.done.contains(member));
            shared(line, open.map(|(member, reader)| (*member, reader)), found);
            for one in found.iter().skip(first) {
                // Noise and a greeting may come before the answer.
                match &one.what {
                    Err(Fault { kind: FaultKind::NoMatch | FaultKind::Garbage, .. }) => {
                        waiting.strange = true
                    }
                    _ => waiting.done.push(one.member),
                }
            }
            if asking.question.readers.iter().all(|(member, _)| waiting.done.contains(member)) {
                asking.schedule.answered();
                self.state = State::Idle(now_s);
                return;
            }
        }
    }

    fn turn(&mut self, now_s: f64, found: &mut Vec<Found>) -> Option<Vec<u8>> {
        match &self.state {
            State::Pausing(pause) if now_s >= pause.until_s() => {
                self.restless = !pause.was_quiet(now_s);
                self.state = State::Idle(f64::NEG_INFINITY);
            }
            State::Waiting(waiting) if now_s >= waiting.until_s => self.give_up(now_s, found),
            _ => {}
        }
        let State::Idle(unasked_s) = self.state else { return None };
        let (question, due_s) = Schedule::next(self.questions.iter().map(|asking| &asking.schedule))?;
        if now_s < due_s {
            return None;
        }
        // A question in the middle of a line would take its rest, "2.5" of "12.5", for the answer.
        let asking = self.questions.get_mut(question)?;
        let quiet_s = UNASKED_S.min(UNASKED_PART * asking.schedule.every_s());
        if now_s < unasked_s + quiet_s {
            self.state = State::Pausing(Pause::of(now_s, quiet_s));
            return None;
        }
        asking.schedule.asked(now_s);
        if std::mem::take(&mut self.restless) {
            asking.splitter.join();
        } else {
            asking.splitter.begin();
        }
        let ask = asking.question.ask.clone();
        let until_s = now_s + wire_s(ask.len(), self.baud) + ANSWER_S;
        let at_most_s = until_s + wire_s(LONGEST_LINE, self.baud);
        self.state = State::Waiting(Waiting {
            question,
            until_s,
            at_most_s,
            done: Vec::new(),
            strange: false,
            blank: false,
        });
        Some(ask)
    }

    fn wake_s(&self) -> f64 {
        match &self.state {
            State::Pausing(pause) => pause.until_s(),
            State::Waiting(waiting) => waiting.until_s,
            State::Idle(_) => {
                let next = Schedule::next(self.questions.iter().map(|asking| &asking.schedule));
                next.map_or(f64::INFINITY, |(_, due_s)| due_s)
            }
        }
    }
}
