//! The only caller of the system clock.
//!
//! Goes out: the time of day with its offset, and seconds that never run back ([`Ticks`]). A test hands a time of its own where a verb takes one; nothing below
//! this room asks for the time. Time zones are left out: what the program records itself is in UTC and says so, what
//! a person wrote keeps the offset it was written with.

mod ticks;

use std::time::SystemTime;

use chrono::{DateTime, FixedOffset, Utc};

pub use ticks::{Hastened, Monotonic, Ticks, Virtual};

/// The time now, in UTC, to the millisecond.
#[must_use]
#[allow(clippy::disallowed_methods, reason = "this room is where the time is asked for")]
pub fn now() -> DateTime<FixedOffset> {
    let now: DateTime<Utc> = SystemTime::now().into();
    let millis = now.timestamp_millis();
    DateTime::from_timestamp_millis(millis).unwrap_or(now).fixed_offset()
}

#[cfg(test)]
mod tests {
    #[test]
    fn it_is_after_the_program_was_written_and_does_not_run_back() {
        let first = super::now();
        assert!(first.timestamp() > 1_760_000_000 && super::now() >= first);
        assert_eq!(first.offset().local_minus_utc(), 0);
    }
}
