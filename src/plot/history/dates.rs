//! Dates on an axis: times to numbers and back to words, and ticks from days to millennia.
//!
//! Comes in: times, the range of an axis in days, how much room a label needs. Goes out: days as numbers, counted by
//! the clock of each record (its own offset), and [`DateTicks`]: labels at the beginnings of days, weeks, months or
//! years that keep apart, and the months or years they belong to. Left out: hours.

use chrono::{DateTime, Datelike, FixedOffset, NaiveDate, Timelike};

use super::super::axis::Scale;

const SECONDS_PER_DAY: f64 = 86_400.0;
/// The shortest month, so that the closest two ticks of a step in months keep apart.
const SHORTEST_MONTH_DAYS: f64 = 28.0;
/// Days of a mean Gregorian month: 146 097 days in 400 years.
const MEAN_MONTH_DAYS: f64 = 146_097.0 / 4800.0;
/// No step is looked at that would have more ticks than this.
const MOST_TICKS: f64 = 200.0;

/// Short names of the months.
const MONTHS: [&str; 12] =
    ["Jan", "Feb", "Mar", "Apr", "May", "Jun", "Jul", "Aug", "Sep", "Oct", "Nov", "Dec"];

/// Ticks with labels, finer ones between them, and what a row below says.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct DateTicks {
    pub major: Vec<(f64, String)>,
    pub minor: Vec<f64>,
    pub periods: Vec<Period>,
}

/// A month or year, as much of it as the axis shows.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Period {
    pub from: f64,
    pub to: f64,
    pub label: String,
}

/// How far ticks are apart.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Step {
    /// So many days; seven of them begin on a Monday.
    Days(i32),
    Months(i32),
}

/// Days since the beginning of the first year of the calendar, by the clock of the record.
pub(super) fn days(time: &DateTime<FixedOffset>) -> f64 {
    // Not by the local time itself, which the last and first representable days do not have.
    let utc = time.naive_utc();
    let seconds = f64::from(utc.num_seconds_from_midnight()) + f64::from(time.offset().local_minus_utc());
    f64::from(utc.num_days_from_ce()) + seconds / SECONDS_PER_DAY
}

/// "2026-11-12".
pub(super) fn date(days: f64) -> String {
    date_of(days).format("%Y-%m-%d").to_string()
}

/// "2026-11".
pub(super) fn month(days: f64) -> String {
    date_of(days).format("%Y-%m").to_string()
}

/// The ticks that fit: `room` says how many pixels the widest of some labels needs from its neighbour, `fits` whether
/// a label of the row below has room in so many.
pub(super) fn ticks(
    scale: &Scale,
    room: impl Fn(&[(f64, String)]) -> f64,
    fits: impl Fn(&str, f64) -> bool,
) -> DateTicks {
    let range = (scale.low, scale.high);
    let per_day = (scale.at(scale.high) - scale.at(scale.low)).abs() / (scale.high - scale.low);
    for (step, finer) in steps() {
        if (scale.high - scale.low) / step.least_days() > MOST_TICKS {
            continue;
        }
        let major: Vec<(f64, String)> =
            step.beginnings(range).into_iter().map(|day| (day, step.label(day))).collect();
        if per_day * step.least_days() >= room(&major) {
            let minor = finer.map_or(Vec::new(), |finer| finer.beginnings(range));
            let mut periods = step.periods(range);
            periods.retain(|p| fits(&p.label, per_day * (p.to - p.from)));
            return DateTicks { major, minor, periods };
        }
    }
    DateTicks::default()
}

/// All steps from the finest, each with what lies between its ticks.
fn steps() -> Vec<(Step, Option<Step>)> {
    use Step::{Days, Months};
    let mut steps = vec![
        (Days(1), None),
        (Days(2), Some(Days(1))),
        (Days(7), Some(Days(1))),
        (Months(1), None),
        (Months(3), Some(Months(1))),
        (Months(6), Some(Months(1))),
        (Months(12), Some(Months(3))),
        (Months(24), Some(Months(12))),
        (Months(60), Some(Months(12))),
    ];
    let mut decade = 120;
    while decade <= 1_200_000 {
        steps.extend([
            (Months(decade), Some(Months(decade / 5))),
            (Months(2 * decade), Some(Months(decade / 2))),
            (Months(5 * decade), Some(Months(decade))),
        ]);
        decade *= 10;
    }
    steps
}

impl Step {
    /// The least distance of two ticks.
    fn least_days(self) -> f64 {
        match self {
            Self::Days(n) => f64::from(n),
            Self::Months(n) if n < 12 => SHORTEST_MONTH_DAYS * f64::from(n),
            Self::Months(n) => MEAN_MONTH_DAYS * f64::from(n) - 1.0,
        }
    }

    /// Where it begins anew within a range.
    fn beginnings(self, (low, high): (f64, f64)) -> Vec<f64> {
        let mut days = Vec::new();
        match self {
            Self::Days(n) => {
                // The first day of the calendar was a Monday, and its number is 1.
                let first = libm::ceil((low - 1.0) / f64::from(n));
                let last = libm::floor((high - 1.0) / f64::from(n));
                let count = (last - first).clamp(-1.0, 10.0 * MOST_TICKS) as i32;
                days.extend((0..=count).map(|i| 1.0 + f64::from(n) * (first + f64::from(i))));
            }
            Self::Months(n) => {
                let (first, last) = (month_of(low).div_euclid(n), month_of(high).div_euclid(n));
                // The outermost may lie outside the range, and even outside the calendar.
                let firsts = (first..=last).filter_map(|i| first_of(i * n));
                days.extend(firsts.filter(|day| (low..=high).contains(day)));
            }
        }
        days
    }

    fn label(self, day: f64) -> String {
        let date = date_of(day);
        match self {
            Self::Days(_) => date.day().to_string(),
            Self::Months(n) if n < 12 => MONTHS[date.month0() as usize % 12].to_owned(),
            Self::Months(_) => year(date.year()),
        }
    }

    /// The months that days belong to, the years that months belong to.
    fn periods(self, (low, high): (f64, f64)) -> Vec<Period> {
        let (whole, label): (Self, fn(NaiveDate) -> String) = match self {
            Self::Days(_) => (Self::Months(1), |d| d.format("%Y-%m").to_string()),
            Self::Months(n) if n < 12 => (Self::Months(12), |d| year(d.year())),
            Self::Months(_) => return Vec::new(),
        };
        let mut edges = vec![low];
        edges.extend(whole.beginnings((low, high)).into_iter().filter(|day| *day > low));
        edges.push(high);
        edges
            .windows(2)
            .map(|pair| Period { from: pair[0], to: pair[1], label: label(date_of(pair[0])) })
            .collect()
    }
}

fn year(year: i32) -> String {
    year.to_string().replace('-', "\u{2212}")
}

/// The day a number lies in; the first or last there is when it lies beyond all.
fn date_of(days: f64) -> NaiveDate {
    let nearest = if days < 0.0 { NaiveDate::MIN } else { NaiveDate::MAX };
    NaiveDate::from_num_days_from_ce_opt(libm::floor(days) as i32).unwrap_or(nearest)
}

/// Months since the beginning of the year nought.
fn month_of(days: f64) -> i32 {
    let date = date_of(days);
    12 * date.year() + date.month0() as i32
}

/// The first day of a month.
fn first_of(month: i32) -> Option<f64> {
    let date = NaiveDate::from_ymd_opt(month.div_euclid(12), month.rem_euclid(12) as u32 + 1, 1);
    date.map(|d| f64::from(d.num_days_from_ce()))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(text: &str) -> f64 {
        days(&DateTime::parse_from_rfc3339(text).unwrap())
    }

    /// Labels and the row below, where a letter is 7 pixels wide.
    fn drawn(from: &str, to: &str, pixels: f64) -> (Vec<String>, Vec<String>) {
        let scale = Scale::new(at(from), at(to), 0.0, pixels);
        let letters = |label: &str| 7.0 * label.chars().count() as f64;
        let room =
            |labels: &[(f64, String)]| labels.iter().map(|(_, l)| letters(l)).fold(0.0, f64::max) + 14.0;
        let ticks = ticks(&scale, room, |label, room| letters(label) + 7.0 <= room);
        (ticks.major.into_iter().map(|t| t.1).collect(), ticks.periods.into_iter().map(|p| p.label).collect())
    }

    #[test]
    fn a_time_counts_by_its_own_clock() {
        assert_eq!(date(at("2026-11-12T00:30:00+11:00")), "2026-11-12");
        assert_eq!(date(at("2026-11-12T23:30:00-08:00")), "2026-11-12");
        assert!((at("2026-11-12T18:00:00+02:00") - at("2026-11-12T12:00:00-05:00") - 0.25).abs() < 1e-9);
        assert_eq!(month(at("2027-05-31T23:59:59Z")), "2027-05");
    }

    #[test]
    fn days_are_numbered_under_their_month() {
        let (labels, periods) = drawn("2026-11-27T00:00:00Z", "2026-12-03T12:00:00Z", 300.0);
        assert_eq!(labels, ["27", "28", "29", "30", "1", "2", "3"]);
        assert_eq!(periods, ["2026-11", "2026-12"]);
    }

    #[test]
    fn weeks_begin_on_monday() {
        // 12 November 2026 was a Thursday (perpetual calendar), so the Mondays about it are the 9th and the 16th.
        let (labels, periods) = drawn("2026-11-05T00:00:00Z", "2026-12-10T00:00:00Z", 260.0);
        assert_eq!(labels, ["9", "16", "23", "30", "7"]);
        assert_eq!(periods, ["2026-11", "2026-12"]);
    }

    #[test]
    fn months_are_named_over_their_year() {
        let (labels, periods) = drawn("2025-10-20T00:00:00Z", "2027-02-10T00:00:00Z", 300.0);
        assert_eq!(labels, ["Jan", "Apr", "Jul", "Oct", "Jan"]);
        // Of 2027 there are too few pixels for its number.
        assert_eq!(periods, ["2025", "2026"]);
    }

    #[test]
    fn years_stand_alone_and_spread_with_the_range() {
        let (labels, periods) = drawn("2019-05-01T00:00:00Z", "2026-11-12T00:00:00Z", 400.0);
        assert_eq!(labels, ["2020", "2021", "2022", "2023", "2024", "2025", "2026"]);
        assert!(periods.is_empty());
        assert_eq!(drawn("1961-05-01T00:00:00Z", "2026-11-12T00:00:00Z", 200.0).0, ["1980", "2000", "2020"]);
    }

    #[test]
    fn the_ends_of_the_calendar_are_no_trap() {
        let utc = |t: chrono::NaiveDateTime| t.and_utc().fixed_offset();
        let (first, last) = (utc(chrono::NaiveDateTime::MIN), utc(chrono::NaiveDateTime::MAX));
        let ahead = last.with_timezone(&FixedOffset::east_opt(50_400).unwrap());
        assert!(date(days(&ahead)).contains("262142"), "{}", date(days(&ahead)));
        let scale = Scale::new(days(&first) - 1e5, days(&last) + 1e5, 0.0, 600.0);
        let ticks = ticks(&scale, |_| 60.0, |_, _| true);
        assert!(ticks.major.len() > 4 && ticks.major.len() < 12, "{ticks:?}");
    }
}
