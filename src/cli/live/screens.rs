//! The two screens on their terminal.

use std::io;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use super::bench_scene::BenchScene;
use super::look::Look;
use super::session_scene::SessionScene;
use super::terminal::Screen;
use crate::report::bench_live::BenchView;
use crate::report::session_live::SessionView;
use crate::work::log::{BenchFace, BenchWish, SessionFace, SessionWish};

/// The screen of a bench run; the terminal is as it was when it is dropped.
pub struct BenchScreen {
    screen: Screen,
    scene: BenchScene,
    interrupted: Arc<AtomicBool>,
}

impl BenchScreen {
    /// Takes the terminal over; `interrupted` is set when the program shall end.
    ///
    /// # Errors
    /// A terminal that cannot be taken over; it is left as it was.
    pub fn open(look: Look, interrupted: Arc<AtomicBool>) -> io::Result<Self> {
        Ok(Self { screen: Screen::open()?, scene: BenchScene::new(look), interrupted })
    }

    fn draw(&mut self) {
        let scene = &mut self.scene;
        self.screen.draw(|frame| scene.draw(frame));
    }
}

impl BenchFace for BenchScreen {
    fn show(&mut self, view: &BenchView) {
        self.scene.show(view);
        self.draw();
    }

    fn wishes(&mut self) -> Vec<BenchWish> {
        let (mut wishes, mut changed) = (Vec::new(), false);
        for event in self.screen.events() {
            if super::is_redraw(&event) {
                self.screen.forget();
            }
            let (seen, wish) = self.scene.event(&event);
            changed |= seen;
            wishes.extend(wish);
        }
        if changed {
            self.draw();
        }
        if self.screen.is_gone() || self.interrupted.load(Ordering::SeqCst) {
            wishes.push(BenchWish::LeaveOpen);
        }
        wishes
    }

    fn say(&mut self, sentence: &str) {
        self.scene.say(sentence);
        self.draw();
    }
}

/// The screen of a session; the terminal is as it was when it is dropped.
pub struct SessionScreen {
    screen: Screen,
    scene: SessionScene,
    interrupted: Arc<AtomicBool>,
}

impl SessionScreen {
    /// As [`BenchScreen::open`].
    ///
    /// # Errors
    /// A terminal that cannot be taken over; it is left as it was.
    pub fn open(look: Look, interrupted: Arc<AtomicBool>) -> io::Result<Self> {
        Ok(Self { screen: Screen::open()?, scene: SessionScene::new(look), interrupted })
    }

    fn draw(&mut self) {
        let scene = &mut self.scene;
        self.screen.draw(|frame| scene.draw(frame));
    }
}

impl SessionFace for SessionScreen {
    fn show(&mut self, view: &SessionView) {
        let rings = self.scene.show(view);
        self.draw();
        if rings {
            self.screen.bell();
        }
    }

    fn wishes(&mut self) -> Vec<SessionWish> {
        let (mut wishes, mut changed) = (Vec::new(), false);
        for event in self.screen.events() {
            if super::is_redraw(&event) {
                self.screen.forget();
            }
            let (seen, wish) = self.scene.event(&event);
            changed |= seen;
            wishes.extend(wish);
        }
        if changed {
            self.draw();
        }
        if self.screen.is_gone() || self.interrupted.load(Ordering::SeqCst) {
            wishes.push(SessionWish::LeaveOpen);
        }
        wishes
    }

    fn say(&mut self, sentence: &str) {
        self.scene.say(sentence);
        self.draw();
    }
}
