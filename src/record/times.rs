//! The time column of a table: RFC 3339, date and time without offset, clock time, or plain numbers.
//!
//! Comes in: cells in the order of the rows. Goes out: seconds since the first row. All cells of a column are written
//! in one form, so an offset left out never matters to a difference; it is that of the run's `taken`. Left out: time
//! zones and their changes.

use chrono::{DateTime, FixedOffset, NaiveDate, Timelike};

use super::error::Refusal;

const SECONDS_PER_DAY: i64 = 86_400;

/// How far a clock may go back and still be one that ran backwards (or was put back an hour for winter), in seconds;
/// farther back is past midnight. Our own choice, no source.
const LONGEST_STEP_BACK_S: i64 = 3_600;

/// Half a day in seconds: where rows may stand out of order, a step longer than this is past midnight, forwards or
/// back, and a shorter one is what it seems. Our own choice, no source; no session lasts so long.
const HALF_A_DAY_S: i64 = SECONDS_PER_DAY / 2;

/// How the cells of a column are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Form {
    Offset,
    Local,
    Clock,
}

/// A time as it stands in a cell: whole seconds since 1970 (for a clock: since midnight), and nanoseconds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Moment {
    form: Form,
    seconds: i64,
    nanoseconds: u32,
}

/// Turns the cells of one column into seconds since the first.
#[derive(Debug, Default)]
pub(super) struct Times {
    first: Option<Moment>,
    /// The clock time of the row before, in seconds since midnight.
    clock: i64,
    midnights: i64,
    any_order: bool,
}

impl Times {
    /// For rows that may stand out of order: a clock time is that nearest to the row before.
    pub(super) fn in_any_order() -> Self {
        Self { any_order: true, ..Self::default() }
    }

    /// When the first cell was, in seconds since 1970 and nanoseconds; a date or an offset that it lacks is that of
    /// `taken`, and a clock time is that nearest to it.
    pub(super) fn begins(&self, taken: &DateTime<FixedOffset>) -> Option<(i64, u32)> {
        let first = self.first?;
        let seconds = match first.form {
            Form::Offset => first.seconds,
            Form::Local => first.seconds - i64::from(taken.offset().local_minus_utc()),
            Form::Clock => {
                let away = first.seconds - i64::from(taken.time().num_seconds_from_midnight());
                taken.timestamp() + away - SECONDS_PER_DAY * days(away)
            }
        };
        Some((seconds, first.nanoseconds))
    }

    /// Seconds since the first cell.
    pub(super) fn seconds(&mut self, cell: &[u8]) -> Result<f64, Refusal> {
        let shown = || String::from_utf8_lossy(cell).into_owned();
        let mut now = parse(cell).ok_or_else(|| Refusal::NotATimeCell(shown()))?;
        if self.first.is_none() {
            self.clock = now.seconds;
        }
        let first = *self.first.get_or_insert(now);
        if first.form != now.form {
            return Err(Refusal::OtherTimeForm(shown()));
        }
        if now.form == Form::Clock {
            let step = now.seconds - self.clock;
            if self.any_order {
                self.midnights -= days(step);
            } else if -step > LONGEST_STEP_BACK_S {
                self.midnights += 1;
            }
            self.clock = now.seconds;
            now.seconds += self.midnights * SECONDS_PER_DAY;
        }
        let whole = (now.seconds - first.seconds) as f64;
        let nanoseconds = i64::from(now.nanoseconds) - i64::from(first.nanoseconds);
        Ok(if nanoseconds == 0 { whole } else { whole + nanoseconds as f64 / 1e9 })
    }
}

/// Days by which a difference of two times of day is too large to be the nearest one: -1, 0 or 1.
fn days(difference_s: i64) -> i64 {
    i64::from(difference_s > HALF_A_DAY_S) - i64::from(difference_s < -HALF_A_DAY_S)
}

fn parse(cell: &[u8]) -> Option<Moment> {
    let dated = cell.get(4) == Some(&b'-');
    if !dated {
        let (clock, nanoseconds, rest) = parse_clock(cell)?;
        return rest.is_empty().then_some(Moment { form: Form::Clock, seconds: clock, nanoseconds });
    }
    let year = i32::try_from(digits(cell.get(..4)?)?).ok()?;
    let month = digits(cell.get(5..7)?)?;
    let day = digits(cell.get(8..10)?)?;
    if cell.get(7) != Some(&b'-') || !matches!(cell.get(10)?, b'T' | b't' | b' ') {
        return None;
    }
    let date = NaiveDate::from_ymd_opt(year, month, day)?;
    let days = date.signed_duration_since(NaiveDate::default()).num_days();
    let (clock, nanoseconds, rest) = parse_clock(cell.get(11..)?)?;
    let (form, offset) = match rest {
        [] => (Form::Local, 0),
        [b'Z' | b'z'] => (Form::Offset, 0),
        [sign @ (b'+' | b'-'), h0, h1, b':', m0, m1] => {
            let (hours, minutes) = (digits(&[*h0, *h1])?, digits(&[*m0, *m1])?);
            if hours > 23 || minutes > 59 {
                return None;
            }
            let size = i64::from(hours * 3_600 + minutes * 60);
            (Form::Offset, if *sign == b'-' { -size } else { size })
        }
        _ => return None,
    };
    Some(Moment { form, seconds: days * SECONDS_PER_DAY + clock - offset, nanoseconds })
}

/// `HH:MM:SS` or `H:MM:SS` with an optional fraction: seconds since midnight, nanoseconds, and what follows.
fn parse_clock(text: &[u8]) -> Option<(i64, u32, &[u8])> {
    let colon = text.iter().position(|byte| *byte == b':').filter(|at| (1..=2).contains(at))?;
    let hours = digits(&text[..colon])?;
    let [b':', m0, m1, b':', s0, s1, rest @ ..] = &text[colon..] else { return None };
    let (minutes, seconds) = (digits(&[*m0, *m1])?, digits(&[*s0, *s1])?);
    // A leap second is written as second 60 (RFC 3339, 5.7).
    if hours > 23 || minutes > 59 || seconds > 60 {
        return None;
    }
    let (nanoseconds, rest) = match rest {
        [b'.' | b',', fraction @ ..] => {
            let length = fraction.iter().take_while(|byte| byte.is_ascii_digit()).count();
            if length == 0 {
                return None;
            }
            let nine = |sum: u32, at: usize| {
                let digit = if at < length { u32::from(fraction[at] - b'0') } else { 0 };
                sum * 10 + digit
            };
            ((0..9).fold(0, nine), &fraction[length..])
        }
        _ => (0, rest),
    };
    Some((i64::from(hours * 3_600 + minutes * 60 + seconds), nanoseconds, rest))
}

fn digits(bytes: &[u8]) -> Option<u32> {
    bytes.iter().try_fold(0_u32, |sum, byte| byte.is_ascii_digit().then(|| sum * 10 + u32::from(byte - b'0')))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn all(cells: &[&str]) -> Vec<Result<f64, Refusal>> {
        let mut times = Times::default();
        cells.iter().map(|cell| times.seconds(cell.as_bytes())).collect()
    }

    #[test]
    fn clock_times_roll_over_midnight() {
        assert_eq!(all(&["23:59:50", "0:00:10.5", "23:59:50"]), [Ok(0.0), Ok(20.5), Ok(86_400.0)]);
    }

    #[test]
    fn a_clock_put_back_an_hour_is_not_past_midnight() {
        assert_eq!(all(&["02:59:59", "02:00:00"]), [Ok(0.0), Ok(-3599.0)]);
        assert_eq!(all(&["17:30:00", "08:00:00"]), [Ok(0.0), Ok(14.5 * 3600.0)]);
    }

    #[test]
    fn rows_out_of_order_about_midnight_keep_their_day() {
        let mut times = Times::in_any_order();
        let cells = ["23:59:58", "00:00:01", "23:59:59", "00:00:03", "12:00:02", "11:59:00"];
        let seconds = cells.map(|cell| times.seconds(cell.as_bytes()));
        assert_eq!(seconds, [0.0, 3.0, 1.0, 5.0, 43_204.0, 43_142.0].map(Ok));
    }

    #[test]
    fn the_first_clock_time_is_the_one_nearest_to_when_it_was_taken() {
        let begins = |cell: &str, taken: &str| {
            let mut times = Times::in_any_order();
            times.seconds(cell.as_bytes()).unwrap();
            let taken = DateTime::parse_from_rfc3339(taken).unwrap();
            let (seconds, nanoseconds) = times.begins(&taken).unwrap();
            DateTime::from_timestamp(seconds, nanoseconds).unwrap().to_rfc3339()
        };
        let taken = "2026-11-20T18:05:00+11:00";
        assert_eq!(begins("18:05:02.5", taken), "2026-11-20T07:05:02.500+00:00");
        assert_eq!(begins("2026-11-20 18:04:00", taken), "2026-11-20T07:04:00+00:00");
        assert_eq!(begins("2026-11-20T08:00:00+01:00", taken), "2026-11-20T07:00:00+00:00");
        assert_eq!(begins("00:00:05", "2026-11-20T23:59:55Z"), "2026-11-21T00:00:05+00:00");
        assert_eq!(begins("23:59:55", "2026-11-21T00:00:05Z"), "2026-11-20T23:59:55+00:00");
    }

    #[test]
    fn offsets_are_taken_into_account() {
        let cells = ["2026-11-12T09:40:00+11:00", "2026-11-11T22:40:01Z", "2026-11-11 17:40:02.25-05:00"];
        assert_eq!(all(&cells), [Ok(0.0), Ok(1.0), Ok(2.25)]);
    }

    #[test]
    fn dates_without_offset_cross_months_and_leap_days() {
        let cells = ["2028-02-28T23:59:59", "2028-03-01 00:00:00"];
        assert_eq!(all(&cells), [Ok(0.0), Ok(86_401.0)]);
    }

    #[test]
    fn another_form_in_one_column_is_refused() {
        let mixed = all(&["09:40:00", "2026-11-12T09:40:00"]);
        assert_eq!(mixed[1], Err(Refusal::OtherTimeForm("2026-11-12T09:40:00".to_owned())));
        let mixed = all(&["2026-11-12T09:40:00Z", "2026-11-12T09:40:00"]);
        assert_eq!(mixed[1], Err(Refusal::OtherTimeForm("2026-11-12T09:40:00".to_owned())));
    }

    #[test]
    fn what_no_clock_shows_is_refused() {
        for bad in [
            "24:00:00",
            "12:60:00",
            "12:00:61",
            "12:00",
            "1200",
            "",
            "12:00:00.",
            "12:00:00x",
            "2026-02-29T00:00:00",
            "2026-11-12",
            "2026-11-12T09:40:00+11",
            "2026-11-12T09:40:00+24:00",
            "é:00:00",
            "123:00:00",
        ] {
            assert_eq!(all(&[bad]), [Err(Refusal::NotATimeCell(bad.to_owned()))]);
        }
    }
}
