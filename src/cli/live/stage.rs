//! What both screens do alike with keys: pages, questions at the bottom, the last sentence.

use ratatui::crossterm::event::{Event, KeyCode, KeyEvent, KeyEventKind, KeyModifiers};
use ratatui::layout::Rect;

use super::pen::{self, Pen, tail, wrap};
use crate::report::typed::tame;

/// Most characters of an answer.
const LONGEST: usize = 400;

/// Which page is shown.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Page {
    /// The screen.
    Main,
    /// Everything in lines, from this one on.
    All(usize),
    /// The keys, from this line on.
    Help(usize),
}

/// A question at the bottom line.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Question<A> {
    /// What the answer is for.
    pub(super) about: A,
    /// What is asked.
    pub(super) asks: String,
    /// What has been typed.
    pub(super) typed: String,
    /// Whether one key answers.
    pub(super) one_key: bool,
}

/// The state of a screen that keys change.
#[derive(Debug, Clone)]
pub(super) struct Stage<A> {
    pub(super) page: Page,
    pub(super) said: Option<String>,
    pub(super) question: Option<Question<A>>,
}

/// What a key did.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum Did<A> {
    /// Something on this screen.
    Used,
    /// It answered a question.
    Answered(Question<A>),
    /// Nothing: it is for the screen.
    Free(char),
    /// Ctrl-C, Ctrl-D.
    Leave,
}

impl<A: Clone> Stage<A> {
    pub(super) const fn new() -> Self {
        Self { page: Page::Main, said: None, question: None }
    }

    /// Asks something.
    pub(super) fn ask(&mut self, about: A, asks: &str) {
        self.page = Page::Main;
        self.said = None;
        self.question = Some(Question { about, asks: asks.to_owned(), typed: String::new(), one_key: false });
    }

    /// Asks for one key.
    pub(super) fn ask_key(&mut self, about: A, asks: &str) {
        self.ask(about, asks);
        if let Some(question) = &mut self.question {
            question.one_key = true;
        }
    }

    /// Says why an answer is not taken, and asks again with it.
    pub(super) fn ask_again(&mut self, question: Question<A>, why: &str) {
        self.said = Some(why.to_owned());
        self.question = Some(question);
    }

    /// Takes an event of the terminal; none when it is none of ours.
    pub(super) fn event(&mut self, event: &Event) -> Option<Did<A>> {
        match event {
            Event::Key(key) if key.kind != KeyEventKind::Release => Some(self.key(*key)),
            Event::Resize(..) => Some(Did::Used),
            _ => None,
        }
    }

    fn key(&mut self, key: KeyEvent) -> Did<A> {
        if key.modifiers.contains(KeyModifiers::CONTROL) {
            match (key.code, &mut self.question) {
                (KeyCode::Char('c' | 'd'), _) => return Did::Leave,
                (KeyCode::Char('u'), Some(question)) => question.typed.clear(),
                _ => {}
            }
            return Did::Used;
        }
        if let Some(question) = &mut self.question {
            match key.code {
                KeyCode::Esc => {
                    self.question = None;
                    self.said = None;
                }
                KeyCode::Char(c) if question.one_key => {
                    question.typed.push(c);
                    return self.answered();
                }
                _ if question.one_key => self.question = None,
                KeyCode::Enter => return self.answered(),
                KeyCode::Backspace => {
                    question.typed.pop();
                }
                KeyCode::Char(c) if !c.is_control() && question.typed.chars().count() < LONGEST => {
                    question.typed.push(c);
                }
                _ => {}
            }
            return Did::Used;
        }
        match (self.page, key.code) {
            (Page::Main, KeyCode::Tab) => self.page = Page::All(0),
            (Page::Main | Page::All(_), KeyCode::Char('?')) => self.page = Page::Help(0),
            (Page::Main | Page::All(_), KeyCode::Char(c)) => return Did::Free(c),
            (Page::Main, _) => {}
            (Page::All(from) | Page::Help(from), code) => match moved(from, code) {
                Some(from) if matches!(self.page, Page::All(_)) => self.page = Page::All(from),
                Some(from) => self.page = Page::Help(from),
                None => self.page = Page::Main,
            },
        }
        Did::Used
    }

    /// Keeps a page of lines within so many.
    pub(super) fn hold_within(&mut self, lines: usize) {
        if let Page::All(from) | Page::Help(from) = &mut self.page {
            *from = (*from).min(lines.saturating_sub(1));
        }
    }

    fn answered(&mut self) -> Did<A> {
        match self.question.take() {
            Some(question) => Did::Answered(question),
            None => Did::Used,
        }
    }

    /// The sentence and the question at the bottom, as lines; `else_says` when there is neither.
    pub(super) fn bottom(&self, columns: usize, else_says: Option<&str>) -> Vec<String> {
        let mut lines = Vec::new();
        let says = self.said.as_deref().or(else_says.filter(|_| self.question.is_none()));
        lines.extend(says.map(|says| wrap(&tame(says), columns)).unwrap_or_default());
        if let Some(question) = &self.question {
            lines.extend(wrap(&question.asks, columns));
            if !question.one_key {
                let typed = tail(&tame(&question.typed), columns.saturating_sub(3));
                lines.push(format!("> {typed}_"));
            }
        }
        lines
    }
}

/// The line from which on a page stands after a key; none when the key does not move in it.
const fn moved(from: usize, code: KeyCode) -> Option<usize> {
    match code {
        KeyCode::Down => Some(from.saturating_add(1)),
        KeyCode::Up => Some(from.saturating_sub(1)),
        KeyCode::PageDown => Some(from.saturating_add(10)),
        KeyCode::PageUp => Some(from.saturating_sub(10)),
        KeyCode::Home => Some(0),
        _ => None,
    }
}

/// Draws lines from one on, with a sign where there are more.
pub(super) fn draw_lines(pen: &mut Pen<'_>, area: Rect, lines: &[String], from: usize) {
    let mut room = usize::from(area.height);
    let longer = lines.len() > room;
    room = room.saturating_sub(usize::from(longer));
    let from = from.min(lines.len().saturating_sub(room));
    for (row, line) in pen::rows(area).take(room).zip(lines.iter().skip(from)) {
        pen.text(row, line, ratatui::style::Style::new());
    }
    if longer {
        let below = lines.len() - from - room;
        let more = format!(" {below} more below, {from} above: arrows, Page Down ");
        let last = Rect { y: area.bottom().saturating_sub(1), height: 1, ..area };
        pen.right(last, &more, pen.look.ready());
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn press(stage: &mut Stage<()>, code: KeyCode) -> Did<()> {
        stage.event(&Event::Key(KeyEvent::new(code, KeyModifiers::NONE))).unwrap()
    }

    #[test]
    fn what_is_typed_comes_back_as_it_was_and_shows_without_steering_the_terminal() {
        let mut stage: Stage<()> = Stage::new();
        stage.ask((), "why?");
        for c in "hose\u{202e} q".chars() {
            assert_eq!(press(&mut stage, KeyCode::Char(c)), Did::Used);
        }
        assert_eq!(stage.bottom(40, Some("not now")), ["why?", "> hose\\u{202e} q_"]);
        let Did::Answered(question) = press(&mut stage, KeyCode::Enter) else { panic!("no answer") };
        assert_eq!(question.typed, "hose\u{202e} q");
        assert_eq!(stage.bottom(40, Some("now")), ["now"]);
    }

    #[test]
    fn escape_cancels_and_control_c_leaves_even_then() {
        let mut stage: Stage<()> = Stage::new();
        stage.ask((), "why?");
        let leave = KeyEvent::new(KeyCode::Char('c'), KeyModifiers::CONTROL);
        assert_eq!(stage.event(&Event::Key(leave)), Some(Did::Leave));
        assert_eq!(press(&mut stage, KeyCode::Esc), Did::Used);
        assert_eq!(stage.question, None);
        stage.ask_key((), "sure?");
        assert_eq!(press(&mut stage, KeyCode::Enter), Did::Used);
        assert_eq!(stage.question, None);
    }

    #[test]
    fn help_and_the_page_of_everything_come_and_go() {
        let mut stage: Stage<()> = Stage::new();
        press(&mut stage, KeyCode::Char('?'));
        press(&mut stage, KeyCode::Down);
        assert_eq!(stage.page, Page::Help(1));
        assert_eq!(press(&mut stage, KeyCode::Char('f')), Did::Used);
        assert_eq!(stage.page, Page::Main);
        press(&mut stage, KeyCode::Tab);
        press(&mut stage, KeyCode::PageDown);
        press(&mut stage, KeyCode::Up);
        assert_eq!(stage.page, Page::All(9));
        assert_eq!(press(&mut stage, KeyCode::Char('f')), Did::Free('f'));
    }
}
