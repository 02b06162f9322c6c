//! The terminal of a live screen: raw and on a screen of its own while it lasts, as it was on every way out.

use std::io::{self, Stdout, Write as _};
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::mpsc::{self, Receiver};
use std::time::Duration;

use ratatui::backend::CrosstermBackend;
use ratatui::crossterm::event::{self, Event};
use ratatui::crossterm::terminal::{
    EnterAlternateScreen, LeaveAlternateScreen, disable_raw_mode, enable_raw_mode,
};
use ratatui::crossterm::{cursor, execute};
use ratatui::{Frame, Terminal};

/// How long the thread of the keys waits before it looks whether it is still wanted.
const KEYS_WAIT: Duration = Duration::from_millis(100);

/// A terminal that shows a screen.
pub(super) struct Screen {
    terminal: Terminal<CrosstermBackend<Stdout>>,
    events: Receiver<Event>,
    /// Set when the terminal is as it was.
    restored: Arc<AtomicBool>,
    /// Whether it can no longer be written to.
    gone: bool,
}

impl Screen {
    /// Takes the terminal over.
    ///
    /// # Errors
    /// A terminal that cannot be made raw or written to; it is left as it was.
    pub(super) fn open() -> io::Result<Self> {
        let restored = Arc::new(AtomicBool::new(false));
        restore_on_panic(Arc::clone(&restored));
        enable_raw_mode()?;
        let opened = execute!(io::stdout(), EnterAlternateScreen, cursor::Hide)
            .and_then(|()| Terminal::new(CrosstermBackend::new(io::stdout())));
        match opened {
            Ok(terminal) => {
                Ok(Self { terminal, events: listen(Arc::clone(&restored)), restored, gone: false })
            }
            Err(error) => {
                restore(&restored);
                Err(error)
            }
        }
    }

    /// Draws; a terminal that is gone is noted and never drawn on again.
    pub(super) fn draw(&mut self, scene: impl FnOnce(&mut Frame<'_>)) {
        if !self.gone {
            self.gone = self.terminal.draw(scene).is_err();
        }
    }

    /// Forgets what is on it, so that the next drawing is whole.
    pub(super) fn forget(&mut self) {
        if !self.gone {
            self.gone = self.terminal.clear().is_err();
        }
    }

    /// What was typed since the last call; never waits.
    pub(super) fn events(&mut self) -> Vec<Event> {
        self.events.try_iter().collect()
    }

    /// Rings the bell once.
    pub(super) fn bell(&mut self) {
        if !self.gone {
            let mut stdout = io::stdout();
            self.gone = stdout.write_all(b"\x07").and_then(|()| stdout.flush()).is_err();
        }
    }

    /// Whether the terminal is gone, as when a connection broke.
    pub(super) const fn is_gone(&self) -> bool {
        self.gone
    }
}

impl Drop for Screen {
    fn drop(&mut self) {
        restore(&self.restored);
    }
}

/// Gives the terminal back as it was, once.
fn restore(restored: &AtomicBool) {
    if !restored.swap(true, Ordering::SeqCst) {
        let _ = execute!(io::stdout(), LeaveAlternateScreen, cursor::Show);
        let _ = disable_raw_mode();
    }
}

/// Gives the terminal back before a panic of this thread is reported, so that the report can be read. Other threads may
/// panic and leave the screen standing: whoever waits for them says what happened.
fn restore_on_panic(restored: Arc<AtomicBool>) {
    let (owner, before) = (std::thread::current().id(), std::panic::take_hook());
    std::panic::set_hook(Box::new(move |panic| {
        if std::thread::current().id() == owner {
            restore(&restored);
        }
        before(panic);
    }));
}

/// Listens for keys in a thread of its own: on a terminal that hung up the reading of keys never comes back, and the run
/// has to be closed all the same. It ends with the screen, or with the program.
fn listen(restored: Arc<AtomicBool>) -> Receiver<Event> {
    let (send, events) = mpsc::channel();
    std::thread::spawn(move || {
        while !restored.load(Ordering::SeqCst) {
            match event::poll(KEYS_WAIT) {
                Ok(false) => {}
                Ok(true) if event::read().is_ok_and(|event| send.send(event).is_ok()) => {}
                _ => break,
            }
        }
    });
    events
}
