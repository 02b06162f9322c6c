//! The screen of a session without its terminal: what is shown, what keys wish, when the bell rings.

use ratatui::Frame;
use ratatui::crossterm::event::Event as Pressed;

use super::look::Look;
use super::session_draw;
use super::stage::{Did, Question, Stage};
use crate::report::live_parts::Hold;
use crate::report::session_live::{SessionView, Wrong};
use crate::work::enter_session::{happened, seconds};
use crate::work::log::SessionWish;

/// What is asked at the bottom line.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Asked {
    /// What happened: the answer stands behind these words.
    Happened(&'static str),
    /// From when on readings do not count.
    From,
    /// Until when.
    Until(f64),
    /// How the loop is kept from now on.
    MakeUp,
    /// Whether the session is over.
    Finish,
}

/// The keys in the bar, and what they do.
pub(super) const KEYS: [(&str, &str); 8] = [
    ("o", "oxygen"),
    ("d", "diluent"),
    ("i", "injection"),
    ("v", "vent"),
    ("x", "exclude"),
    ("m", "make-up"),
    ("s", "stop"),
    ("q", "leave"),
];

/// The screen of a session.
#[derive(Debug, Clone)]
pub struct SessionScene {
    look: Look,
    view: Option<SessionView>,
    stage: Stage<Asked>,
    rung: Vec<Wrong>,
}

impl SessionScene {
    /// An empty one.
    #[must_use]
    pub const fn new(look: Look) -> Self {
        Self { look, view: None, stage: Stage::new(), rung: Vec::new() }
    }

    /// The session as it stands now; goes out: whether an alarm is new, for which the bell rings once.
    pub fn show(&mut self, view: &SessionView) -> bool {
        let raised: Vec<Wrong> = view.alarms.iter().map(|alarm| alarm.what.clone()).collect();
        let is_new = raised.iter().any(|wrong| !self.rung.contains(wrong));
        self.rung = raised;
        self.view = Some(view.clone());
        is_new
    }

    /// A sentence that stays until the next.
    pub fn say(&mut self, sentence: &str) {
        self.stage.said = Some(sentence.to_owned());
    }

    /// Takes an event of the terminal; goes out: whether something on the screen may have changed, and what is wished.
    pub fn event(&mut self, event: &Pressed) -> (bool, Option<SessionWish>) {
        match self.stage.event(event) {
            None => (false, None),
            Some(Did::Used) => (true, None),
            Some(Did::Leave) => (true, Some(SessionWish::LeaveOpen)),
            Some(Did::Free(key)) => (true, self.key(key)),
            Some(Did::Answered(question)) => (true, self.answer(question)),
        }
    }

    fn key(&mut self, key: char) -> Option<SessionWish> {
        if key == 'q' {
            return Some(SessionWish::LeaveOpen);
        }
        if !KEYS.iter().any(|(known, _)| known.starts_with(key)) {
            return None;
        }
        let view = self.view.as_ref()?;
        if let Hold::Watched(_) = view.hold {
            self.stage.said = view.hold.words();
            return None;
        }
        match key {
            'o' => self.ask_amount("oxygen add", "Oxygen added now. How much"),
            'd' => self.ask_amount("diluent add", "Diluent added now, beyond what keeps the volume. How much"),
            'v' => self.ask_amount("vent", "Loop gas vented now. How much"),
            'i' => self.stage.ask(
                Asked::Happened("injection"),
                "Injection from now on: a flow as 0.31 L/min (STPD), an IP as 9.4 bar, or off. Esc: as it was.",
            ),
            'x' => self.stage.ask(
                Asked::From,
                "Readings that do not count, from when? As 10:30 since the first reading; empty: now. Esc: none.",
            ),
            'm' => self.stage.ask(
                Asked::MakeUp,
                "The loop from now on: sealed, held or topped; with mark (or mark alone) when it is back at the first \
                 volume. Esc: as it was.",
            ),
            _ => self.stage.ask_key(Asked::Finish, "Stop: is the session over? y: yes. Any other key: no."),
        }
        None
    }

    fn ask_amount(&mut self, what: &'static str, asks: &str) {
        let asks =
            format!("{asks}? As 0.4 L at 25 °C, 101.3 kPa; empty: not metered. Esc: nothing happened.");
        self.stage.ask(Asked::Happened(what), &asks);
    }

    fn answer(&mut self, question: Question<Asked>) -> Option<SessionWish> {
        let typed = question.typed.trim().to_owned();
        let now_s = self.view.as_ref().and_then(|view| view.elapsed_s).unwrap_or(0.0);
        let at = || if typed.is_empty() { Ok(now_s) } else { seconds(&typed) };
        match question.about {
            Asked::Finish => typed.eq_ignore_ascii_case("y").then_some(SessionWish::Finish),
            Asked::Happened(what) => match happened(format!("{what} {typed}").trim()) {
                Ok(what) => Some(SessionWish::Event(what)),
                Err(error) => self.again(question, &error.to_string()),
            },
            Asked::MakeUp if typed.is_empty() => {
                self.again(question, "say how the loop is kept: sealed, held or topped, or mark")
            }
            Asked::MakeUp => match happened(&format!("make-up {typed}")) {
                Ok(what) => Some(SessionWish::Event(what)),
                Err(error) => self.again(question, &error.to_string()),
            },
            Asked::From => match at() {
                Ok(from_s) if from_s > now_s => {
                    self.again(question, "that has not been yet: give a time up to now")
                }
                Ok(from_s) => {
                    let asks = "... and until when? As 13:00 since the first reading; empty: now. Esc: none.";
                    self.stage.ask(Asked::Until(from_s), asks);
                    None
                }
                Err(error) => self.again(question, &error.to_string()),
            },
            Asked::Until(from_s) => match at() {
                Ok(until_s) if until_s <= from_s => {
                    self.again(question, "the end must lie after the beginning: give a later time")
                }
                Ok(until_s) => Some(SessionWish::Exclude { from_s, until_s }),
                Err(error) => self.again(question, &error.to_string()),
            },
        }
    }

    fn again(&mut self, question: Question<Asked>, why: &str) -> Option<SessionWish> {
        self.stage.ask_again(question, why);
        None
    }

    /// Draws it on the whole of a frame.
    pub fn draw(&mut self, frame: &mut Frame<'_>) {
        let area = frame.area();
        if let Some(view) = &self.view {
            self.stage.hold_within(session_draw::everything(view, area.width).len());
        }
        session_draw::draw(frame.buffer_mut(), area, self.look, self.view.as_ref(), &self.stage);
    }
}
