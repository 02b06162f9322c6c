//! Seconds that never run back, tied once to the time of day.
//!
//! A logged reading is stamped with the seconds since its clock was started; what time of day that was is asked once,
//! so that a time server that sets the system clock during a run moves no reading against another. Left out: the time
//! a machine spends suspended, which a monotonic clock may leave out too; then the time of day of later readings is
//! early by it, their distances are right.

use std::sync::atomic::{AtomicU64, Ordering};
use std::time::{Duration, Instant};

use chrono::{DateTime, FixedOffset, TimeDelta};

/// A source of seconds that can be waited on.
pub trait Ticks: Send + Sync {
    /// Seconds since the clock was started; never less than a moment ago.
    fn now_s(&self) -> f64;

    /// Waits so many seconds; not at all for a negative or not finite number.
    fn sleep(&self, s: f64);

    /// The time of day at second nought.
    fn started(&self) -> DateTime<FixedOffset>;

    /// The time of day at a second of this clock, to the millisecond.
    fn time_of_day(&self, at_s: f64) -> DateTime<FixedOffset> {
        let started = self.started();
        // A double beyond the range of `i64` saturates; the sum is then refused and the start stands.
        #[allow(clippy::cast_possible_truncation, reason = "saturates, and is then refused by the sum")]
        let after = TimeDelta::try_milliseconds((at_s * 1e3).round() as i64);
        after.and_then(|after| started.checked_add_signed(after)).unwrap_or(started)
    }
}

/// The monotonic clock of the machine.
#[derive(Debug, Clone, Copy)]
pub struct Monotonic {
    since: Instant,
    started: DateTime<FixedOffset>,
}

impl Monotonic {
    /// Starts it now.
    #[must_use]
    #[allow(clippy::disallowed_methods, reason = "this room is where the time is asked for")]
    pub fn start() -> Self {
        Self { since: Instant::now(), started: super::now() }
    }
}

impl Ticks for Monotonic {
    fn now_s(&self) -> f64 {
        self.since.elapsed().as_secs_f64()
    }

    fn sleep(&self, s: f64) {
        std::thread::sleep(Duration::try_from_secs_f64(s).unwrap_or_default());
    }

    fn started(&self) -> DateTime<FixedOffset> {
        self.started
    }
}

/// A clock that goes faster than the machine's, for a demonstration in which nobody wants to sit through a bench run.
#[derive(Debug, Clone, Copy)]
pub struct Hastened {
    real: Monotonic,
    times: f64,
}

impl Hastened {
    /// Starts it now; it goes so many times as fast, at least at its own pace.
    #[must_use]
    pub fn start(times: f64) -> Self {
        Self { real: Monotonic::start(), times: times.max(1.0) }
    }

    /// How many times as fast it goes.
    #[must_use]
    pub const fn times(&self) -> f64 {
        self.times
    }
}

impl Ticks for Hastened {
    fn now_s(&self) -> f64 {
        self.real.now_s() * self.times
    }

    fn sleep(&self, s: f64) {
        self.real.sleep(s / self.times);
    }

    fn started(&self) -> DateTime<FixedOffset> {
        self.real.started()
    }
}

/// A clock that only moves when somebody waits on it, for tests: an hour passes at once.
#[derive(Debug)]
pub struct Virtual {
    /// Bits of a double of nought or more; these order as their numbers do.
    now: AtomicU64,
    started: DateTime<FixedOffset>,
}

impl Virtual {
    /// A clock that shows nought at this time of day.
    #[must_use]
    pub const fn starting(at: DateTime<FixedOffset>) -> Self {
        Self { now: AtomicU64::new(0), started: at }
    }
}

impl Ticks for Virtual {
    fn now_s(&self) -> f64 {
        f64::from_bits(self.now.load(Ordering::SeqCst))
    }

    /// Several threads that wait at once wait together: the clock goes to the end of the longest wait.
    fn sleep(&self, s: f64) {
        if s.is_finite() && s > 0.0 {
            let until = self.now_s() + s;
            self.now.fetch_max(until.to_bits(), Ordering::SeqCst);
        }
    }

    fn started(&self) -> DateTime<FixedOffset> {
        self.started
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn noon() -> DateTime<FixedOffset> {
        DateTime::parse_from_rfc3339("2026-11-12T12:00:00+11:00").unwrap()
    }

    #[test]
    fn a_virtual_second_passes_only_by_waiting() {
        let clock = Virtual::starting(noon());
        assert_eq!(clock.now_s().to_bits(), 0f64.to_bits());
        for s in [0.25, -1.0, f64::NAN, f64::INFINITY, 0.5] {
            clock.sleep(s);
        }
        assert!((clock.now_s() - 0.75).abs() < 1e-12);
        assert_eq!(clock.time_of_day(90.5).to_rfc3339(), "2026-11-12T12:01:30.500+11:00");
        assert_eq!(clock.time_of_day(f64::INFINITY), noon());
    }

    #[test]
    fn the_machine_s_clock_does_not_run_back_and_waits_at_least_as_long_as_asked() {
        let clock = Monotonic::start();
        let before = clock.now_s();
        clock.sleep(0.01);
        assert!(clock.now_s() - before >= 0.01);
        clock.sleep(-1.0);
        assert!(clock.time_of_day(clock.now_s()) >= clock.started());
    }
}
