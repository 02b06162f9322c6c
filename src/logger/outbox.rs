//! What is to be handed over, in order, until somebody has taken it.

use std::collections::VecDeque;

/// Seconds that something may wait before it is handed over, and from one heartbeat to the next.
pub(super) const HAND_OVER_S: f64 = 0.5;

/// Entries in their order. What could not be handed over stays, and is tried again first.
#[derive(Debug, Clone)]
pub(super) struct Outbox<E> {
    waiting: VecDeque<E>,
    /// When the next round is due; at once before the first.
    due_s: f64,
    urgent: bool,
}

impl<E> Outbox<E> {
    pub(super) const fn new() -> Self {
        Self { waiting: VecDeque::new(), due_s: f64::NEG_INFINITY, urgent: false }
    }

    pub(super) fn push(&mut self, entry: E) {
        self.waiting.push_back(entry);
    }

    /// Something that is handed over whenever somebody asks next.
    pub(super) fn push_urgent(&mut self, entry: E) {
        self.urgent = true;
        self.waiting.push_back(entry);
    }

    /// Whether a round is due; a clock that was set back far does not stop the rounds.
    pub(super) fn is_due(&self, now_s: f64) -> bool {
        self.urgent || now_s >= self.due_s || now_s < self.due_s - 2.0 * HAND_OVER_S
    }

    /// Hands over everything.
    ///
    /// # Errors
    /// The first refusal of `take`; that entry and those behind it stay.
    pub(super) fn drain<X>(
        &mut self,
        now_s: f64,
        mut take: impl FnMut(&E) -> Result<(), X>,
    ) -> Result<(), X> {
        while let Some(first) = self.waiting.front() {
            take(first)?;
            self.waiting.pop_front();
        }
        self.urgent = false;
        self.due_s = now_s + HAND_OVER_S;
        Ok(())
    }
}
