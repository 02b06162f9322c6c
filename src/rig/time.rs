//! The time that the rig and its readers are handed: the real one, a virtual one, and one that jumps.

use std::sync::{Arc, Mutex, PoisonError};
use std::time::Duration;

use crate::clock::Ticks;

/// A clock in seconds from any beginning, and a way to wait by it.
pub trait Time: Send + Sync {
    /// Seconds now.
    fn now_s(&self) -> f64;

    /// Waits for `s` seconds of this clock; not at all when `s` is not above zero.
    fn sleep(&self, s: f64);
}

impl<T: Time + ?Sized> Time for Arc<T> {
    fn now_s(&self) -> f64 {
        (**self).now_s()
    }

    fn sleep(&self, s: f64) {
        (**self).sleep(s);
    }
}

/// The time of a clock of [`crate::clock`], in seconds since 1970 by its beginning.
#[derive(Clone)]
pub struct OfTicks(pub Arc<dyn Ticks>);

impl Time for OfTicks {
    fn now_s(&self) -> f64 {
        self.0.started().timestamp_millis() as f64 / 1e3 + self.0.now_s()
    }

    fn sleep(&self, s: f64) {
        self.0.sleep(s);
    }
}

/// A clock that stands still until somebody waits by it or moves it: a test of ten minutes takes none.
///
/// Everybody who waits moves it, so it is for one thread; several threads that wait by it run it several times as fast.
#[derive(Debug, Default)]
pub struct VirtualTime {
    now_s: Mutex<f64>,
}

impl VirtualTime {
    /// A clock that begins at nought.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }

    /// Moves it on by `s` seconds; backwards when they are negative.
    pub fn advance(&self, s: f64) {
        *self.now_s.lock().unwrap_or_else(PoisonError::into_inner) += s;
    }
}

impl Time for VirtualTime {
    fn now_s(&self) -> f64 {
        *self.now_s.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn sleep(&self, s: f64) {
        self.advance(s.max(0.0));
    }
}

/// The real time, in seconds of the Unix epoch to the millisecond; it does not run back when the system's clock is set
/// back, but goes on from where it was.
#[derive(Debug, Default)]
pub struct RealTime {
    /// The system's time when last asked, and what is added to it, both in milliseconds.
    last: Mutex<(i64, i64)>,
}

impl RealTime {
    /// The real time.
    #[must_use]
    pub fn new() -> Self {
        Self::default()
    }
}

impl Time for RealTime {
    fn now_s(&self) -> f64 {
        let system_ms = crate::clock::now().timestamp_millis();
        let mut last = self.last.lock().unwrap_or_else(PoisonError::into_inner);
        last.1 += (last.0 - system_ms).max(0);
        last.0 = system_ms;
        (system_ms + last.1) as f64 / 1e3
    }

    fn sleep(&self, s: f64) {
        // A day at most: a longer wait than that is nobody's, and infinity would be refused.
        if s > 0.0 {
            std::thread::sleep(Duration::from_secs_f64(s.min(86_400.0)));
        }
    }
}

/// A clock that can be set: what a reader of the rig is handed to see how it bears a jump of the system's time. The rig
/// itself goes on by the clock inside.
#[derive(Debug)]
pub struct JumpingTime<T> {
    inside: T,
    jumped_s: Mutex<f64>,
}

impl<T: Time> JumpingTime<T> {
    /// A clock that has not jumped yet.
    #[must_use]
    pub fn new(inside: T) -> Self {
        Self { inside, jumped_s: Mutex::new(0.0) }
    }
}

/// A clock that somebody else may set.
pub trait Settable: Send + Sync {
    /// Sets it on by `by_s` seconds, or back when they are negative.
    fn jump(&self, by_s: f64);
}

impl<T: Time> Settable for JumpingTime<T> {
    fn jump(&self, by_s: f64) {
        *self.jumped_s.lock().unwrap_or_else(PoisonError::into_inner) += by_s;
    }
}

impl<T: Time> Time for JumpingTime<T> {
    fn now_s(&self) -> f64 {
        self.inside.now_s() + *self.jumped_s.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn sleep(&self, s: f64) {
        self.inside.sleep(s);
    }
}
