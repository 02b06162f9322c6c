//! What people see while a run or a session is logged: a screen on a terminal, lines elsewhere.
//!
//! Comes in: [`crate::report::bench_live::BenchView`] and [`crate::report::session_live::SessionView`]; keys. Goes out: a
//! picture, and wishes. [`BenchScene`] and [`SessionScene`] are the screens without a terminal, so that a test draws
//! them; [`BenchScreen`] and [`SessionScreen`] put them on one, [`BenchLines`] and [`SessionLines`] write a line a second.
//! From 80 columns and 24 rows on everything has its place; below, the screen says so and shows lines. Colour only helps,
//! and where a terminal has ASCII alone the same screen is drawn in it.

mod look;
mod pen;
mod numerals;
mod level;
mod plane;
mod stage;
mod parts;
mod bench_plot;
mod bench_draw;
mod bench_scene;
mod session_draw;
mod session_scene;
mod terminal;
mod screens;
mod lines;

pub use bench_scene::BenchScene;
pub use lines::{BenchLines, SessionLines};
pub use look::{Glyphs, Look};
pub use screens::{BenchScreen, SessionScreen};
pub use session_scene::SessionScene;

use std::io::{self, IsTerminal as _};

use ratatui::crossterm::event::{Event, KeyCode, KeyModifiers};

/// Whether there is a terminal that a screen can be drawn on and whose keys can be read.
#[must_use]
pub fn has_screen() -> bool {
    let term = std::env::var("TERM").unwrap_or_default();
    let drawn = cfg!(windows) || !matches!(term.as_str(), "" | "dumb");
    drawn && io::stdin().is_terminal() && io::stdout().is_terminal()
}

/// Whether a key asks for the whole screen again.
fn is_redraw(event: &Event) -> bool {
    matches!(event, Event::Key(key)
        if key.code == KeyCode::Char('l') && key.modifiers.contains(KeyModifiers::CONTROL))
}
