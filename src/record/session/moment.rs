//! Moments of a session: what a person writes for them, and where they are on its time column.
//!
//! Comes in: "00:08:30", which has elapsed, or an RFC 3339 time. Goes out: seconds on the session's time column, which
//! counts from its first reading. Left out: times of day without a date.

use chrono::{DateTime, Duration, FixedOffset};

use super::super::error::Refusal;
use super::SessionRefusal;
use crate::entry::Session;
use crate::quantity::Span;
use crate::quantity::text::value;

/// When something happened, as a person writes it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum When {
    /// So many seconds have elapsed.
    Elapsed(f64),
    /// At this time.
    At(DateTime<FixedOffset>),
}

/// Reads what has elapsed ("00:08:30", "8.5 min") or an RFC 3339 time.
///
/// # Errors
/// [`SessionRefusal::NotAMoment`] for anything else.
pub fn elapsed_or_time(text: &str) -> Result<When, Refusal> {
    let text = text.trim();
    if let Ok(time) = DateTime::parse_from_rfc3339(text) {
        return Ok(When::At(time));
    }
    match value::<Span>(text) {
        Ok(span) => Ok(When::Elapsed(span.as_s())),
        Err(_) => Err(SessionRefusal::NotAMoment(text.to_owned()).into()),
    }
}

impl When {
    /// Seconds on the time column of a session as it is kept: from its first reading, which was at `taken`.
    #[must_use]
    pub fn on(&self, session: &Session) -> f64 {
        Axis::from_first_reading(&session.taken).second(self)
    }
}

/// The time column of a session, as far as moments need it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Axis {
    /// What the column shows at the first reading where its numbers count themselves; else nought.
    pub(super) begins_at_s: f64,
    /// When the first reading was, in seconds since 1970 and nanoseconds.
    pub(super) begins: (i64, u32),
    /// Earliest and latest reading, in seconds after the first row.
    pub(super) ends_s: (f64, f64),
}

impl Axis {
    /// The axis of readings that begin at a time and may end at any.
    pub(super) fn from_first_reading(begun: &DateTime<FixedOffset>) -> Self {
        let begins = (begun.timestamp(), begun.timestamp_subsec_nanos());
        Self { begins_at_s: 0.0, begins, ends_s: (f64::NEG_INFINITY, f64::INFINITY) }
    }

    /// The axis of readings that are not read yet: what has elapsed is nowhere on it (NaN), so that nothing is refused
    /// for where it lies.
    pub(super) fn unread(taken: &DateTime<FixedOffset>) -> Self {
        Self { begins_at_s: f64::NAN, ..Self::from_first_reading(taken) }
    }

    /// Seconds after the first row.
    pub(super) fn second(&self, when: &When) -> f64 {
        match when {
            When::Elapsed(seconds) => seconds - self.begins_at_s,
            When::At(time) => {
                // As the time column itself is read, so that a row's own time is that row to the last bit.
                let whole = (time.timestamp() - self.begins.0) as f64;
                let nanoseconds = i64::from(time.timestamp_subsec_nanos()) - i64::from(self.begins.1);
                if nanoseconds == 0 { whole } else { whole + nanoseconds as f64 / 1e9 }
            }
        }
    }

    /// Refuses a moment outside the readings; `at` is what was written.
    pub(super) fn within(&self, second: f64, at: &str) -> Result<(), Refusal> {
        let (first_s, last_s) = self.ends_s;
        let shown = |s: f64| elapsed_text(s + self.begins_at_s).unwrap_or_else(|| format!("{s} s"));
        if second < first_s {
            return Err(SessionRefusal::BeforeReadings { at: at.to_owned(), first: shown(first_s) }.into());
        }
        if second > last_s {
            return Err(SessionRefusal::AfterReadings { at: at.to_owned(), last: shown(last_s) }.into());
        }
        Ok(())
    }
}

/// A moment as text that reads back as the same second: what has elapsed, or before the first row an RFC 3339 time.
pub(super) fn moment_text(second: f64, taken: &DateTime<FixedOffset>) -> String {
    let before = || {
        // To the nanosecond, which is as fine as these times are.
        let away = Duration::nanoseconds(libm::round(second * 1e9) as i64);
        taken.checked_add_signed(away).unwrap_or(*taken).to_rfc3339()
    };
    elapsed_text(second).unwrap_or_else(before)
}

/// Seconds as HH:MM:SS with all their decimals; none below zero.
fn elapsed_text(seconds: f64) -> Option<String> {
    let digits = format!("{}", if seconds == 0.0 { 0.0 } else { seconds });
    let (whole, decimals) = match digits.split_once('.') {
        Some((whole, decimals)) => (whole, format!(".{decimals}")),
        None => (digits.as_str(), String::new()),
    };
    let whole: u64 = whole.parse().ok()?;
    Some(format!("{:02}:{:02}:{:02}{decimals}", whole / 3_600, whole / 60 % 60, whole % 60))
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn both_forms_are_read_and_no_other() {
        assert_eq!(elapsed_or_time("00:08:30"), Ok(When::Elapsed(510.0)));
        assert_eq!(elapsed_or_time(" 1:00:00.5 "), Ok(When::Elapsed(3_600.5)));
        assert_eq!(elapsed_or_time("90 s"), Ok(When::Elapsed(90.0)));
        let time = DateTime::parse_from_rfc3339("2026-11-20T18:13:30+11:00").unwrap();
        assert_eq!(elapsed_or_time("2026-11-20T18:13:30+11:00"), Ok(When::At(time)));
        for bad in ["", "90", "18:05", "00:60:00", "-00:00:10", "2026-11-20T18:13:30", "tea", "600 m"] {
            let refused: Refusal = SessionRefusal::NotAMoment(bad.to_owned()).into();
            assert_eq!(elapsed_or_time(bad), Err(refused), "{bad}");
        }
    }

    proptest! {
        #[test]
        fn a_moment_is_read_back_to_the_last_bit(second in 0.0..1e6_f64) {
            let taken = DateTime::parse_from_rfc3339("2026-11-20T18:05:00+11:00").unwrap();
            let text = moment_text(second, &taken);
            let back = Axis::from_first_reading(&taken).second(&elapsed_or_time(&text).unwrap());
            prop_assert_eq!(back.to_bits(), second.to_bits());
        }

        #[test]
        fn a_moment_before_the_first_row_is_read_back_to_the_nanosecond(milliseconds in 1..1_000_000_i32) {
            let taken = DateTime::parse_from_rfc3339("2026-11-20T18:05:00.25+11:00").unwrap();
            let second = -f64::from(milliseconds) / 1e3;
            let text = moment_text(second, &taken);
            let back = Axis::from_first_reading(&taken).second(&elapsed_or_time(&text).unwrap());
            prop_assert!((back - second).abs() < 1e-9, "{} {}", back, second);
        }
    }
}
