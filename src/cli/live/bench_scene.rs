//! The screen of a bench run without its terminal: what is shown, and what keys wish.

use ratatui::Frame;
use ratatui::crossterm::event::Event;

use super::bench_draw;
use super::look::Look;
use super::stage::{Did, Question, Stage};
use crate::report::bench_live::BenchView;
use crate::report::live_parts::Hold;
use crate::work::log::BenchWish;

/// What is asked at the bottom line.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum Asked {
    /// Which point to leave out.
    Point,
    /// Why that one.
    Why(usize),
    /// Whether the run is to be finished.
    Finish,
}

/// The keys in the bar, and what they do.
pub(super) const KEYS: [(&str, &str); 5] =
    [("space", "point"), ("a", "by itself"), ("l", "leave out"), ("f", "finish"), ("q", "leave open")];

/// The screen of a run.
#[derive(Debug, Clone)]
pub struct BenchScene {
    look: Look,
    view: Option<BenchView>,
    stage: Stage<Asked>,
}

impl BenchScene {
    /// An empty one.
    #[must_use]
    pub const fn new(look: Look) -> Self {
        Self { look, view: None, stage: Stage::new() }
    }

    /// The run as it stands now.
    pub fn show(&mut self, view: &BenchView) {
        self.view = Some(view.clone());
    }

    /// A sentence that stays until the next.
    pub fn say(&mut self, sentence: &str) {
        self.stage.said = Some(sentence.to_owned());
    }

    /// Takes an event of the terminal; goes out: whether something on the screen may have changed, and what is wished.
    pub fn event(&mut self, event: &Event) -> (bool, Option<BenchWish>) {
        match self.stage.event(event) {
            None => (false, None),
            Some(Did::Used) => (true, None),
            Some(Did::Leave) => (true, Some(BenchWish::LeaveOpen)),
            Some(Did::Free(key)) => (true, self.key(key)),
            Some(Did::Answered(question)) => (true, self.answer(question)),
        }
    }

    fn key(&mut self, key: char) -> Option<BenchWish> {
        if key == 'q' {
            return Some(BenchWish::LeaveOpen);
        }
        if !matches!(key, ' ' | 'a' | 'l' | 'f') {
            return None;
        }
        let view = self.view.as_ref()?;
        if let Hold::Watched(_) = view.hold {
            self.stage.said = view.hold.words();
            return None;
        }
        match key {
            ' ' => Some(BenchWish::Take),
            'a' => Some(BenchWish::ByItself(!view.by_itself)),
            'l' if view.points.is_empty() => {
                self.stage.said = Some("there is no point yet to leave out".to_owned());
                None
            }
            'l' => {
                self.stage.ask(Asked::Point, "Leave out which point? Its number, Enter. Esc: none.");
                None
            }
            _ => {
                self.stage
                    .ask_key(Asked::Finish, "Finish the run: are all points in? y: yes. Any other key: no.");
                None
            }
        }
    }

    fn answer(&mut self, question: Question<Asked>) -> Option<BenchWish> {
        let typed = question.typed.trim().to_owned();
        match question.about {
            Asked::Finish => typed.eq_ignore_ascii_case("y").then_some(BenchWish::Finish),
            Asked::Point => {
                let points = self.view.as_ref().map_or(&[][..], |view| &view.points);
                let number = typed.parse::<usize>().ok();
                match points.iter().find(|point| Some(point.number) == number) {
                    Some(point) => {
                        let number = point.number;
                        let asks = format!(
                            "Why leave out point {number}? It stays in the record with the reason. Esc: leave it in."
                        );
                        self.stage.ask(Asked::Why(number), &asks);
                    }
                    None => {
                        let last = points.last().map_or(0, |point| point.number);
                        let why =
                            format!("\"{typed}\" is no point of this run: type a number from 1 to {last}");
                        self.stage.ask_again(question, &why);
                    }
                }
                None
            }
            Asked::Why(_) if typed.is_empty() => {
                self.stage.ask_again(question, "no point is left out without a reason");
                None
            }
            Asked::Why(point) => Some(BenchWish::LeaveOut { point, why: typed }),
        }
    }

    /// Draws it on the whole of a frame.
    pub fn draw(&mut self, frame: &mut Frame<'_>) {
        let area = frame.area();
        if let Some(view) = &self.view {
            self.stage.hold_within(bench_draw::everything(view, self.look, area.width).len());
        }
        bench_draw::draw(frame.buffer_mut(), area, self.look, self.view.as_ref(), &self.stage);
    }
}
