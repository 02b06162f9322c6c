//! Histories to draw: made up, with a drift, a scatter and habits of their own, so that a picture shows what a book
//! would.

#![allow(clippy::unwrap_used)] // made-up input that does not parse is a mistake in this file

use chrono::{DateTime, Duration, FixedOffset};
use ebbline::bench::Verdict;
use ebbline::entry::Purpose;
use ebbline::gas::Species;
use ebbline::plot::{History, HistoryRun, Leaving, Trend, TrendPlace};

/// A history that owns what it is made of.
#[derive(Debug, Clone)]
pub(crate) struct Made {
    pub(crate) orifice: String,
    pub(crate) gas: Species,
    pub(crate) ip_bar: f64,
    pub(crate) runs: Vec<HistoryRun>,
    pub(crate) left_out: usize,
    pub(crate) trend: Option<Trend>,
}

impl Made {
    pub(crate) fn history(&self) -> History<'_> {
        History {
            orifice: &self.orifice,
            gas: self.gas,
            ip_bar: self.ip_bar,
            runs: &self.runs,
            left_out: self.left_out,
            trend: self.trend.clone(),
        }
    }

    fn of(runs: Vec<HistoryRun>) -> Self {
        Self {
            orifice: "CMF-0417".to_owned(),
            gas: Species::Oxygen,
            ip_bar: 10.0,
            runs,
            left_out: 0,
            trend: None,
        }
    }

    fn with_trend(mut self, last: usize) -> Self {
        self.trend = trend(&self.runs, last);
        self
    }
}

pub(crate) fn time(text: &str) -> DateTime<FixedOffset> {
    DateTime::parse_from_rfc3339(text).unwrap()
}

/// Twelve months of a year, in days.
const YEAR: f64 = 365.25;

fn after(from: DateTime<FixedOffset>, days: f64) -> DateTime<FixedOffset> {
    from + Duration::seconds((days * 86_400.0) as i64)
}

/// Scatter between −1 and 1 that is the same everywhere: the mixing step of SplitMix64.
fn scatter(i: u64) -> f64 {
    let mut z = (i + 1).wrapping_mul(0x9E37_79B9_7F4A_7C15);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    ((z ^ (z >> 31)) >> 11) as f64 / (1u64 << 52) as f64 - 1.0
}

/// Names, verdicts and E_n for flows on dates; of `own` (a share) the expanded uncertainty of one run that the next
/// does not share.
fn judged(
    flows: &[(DateTime<FixedOffset>, f64, Purpose)],
    limits: impl Fn(usize) -> Option<(f64, f64)>,
    own: f64,
) -> Vec<HistoryRun> {
    flows
        .iter()
        .enumerate()
        .map(|(i, (taken, flow, purpose))| {
            let expanded = 0.0085 * flow;
            let verdict = limits(i).map_or(Verdict::None, |(low, high)| {
                if flow - expanded >= low && flow + expanded <= high {
                    Verdict::Pass
                } else if flow + expanded < low || flow - expanded > high {
                    Verdict::Fail
                } else {
                    Verdict::Undecided
                }
            });
            let before = i.checked_sub(1).map(|b| flows[b].1);
            let en = before.map(|b| (flow - b) / (own * (flow * flow + b * b).sqrt()));
            HistoryRun {
                name: format!("R{:04}", 12 + 7 * i),
                taken: *taken,
                flow_l_min: *flow,
                expanded_l_min: expanded,
                limits_l_min: limits(i),
                verdict,
                en,
                purpose: *purpose,
            }
        })
        .collect()
}

/// An ordinary straight line through the last runs, its band with twice its standard error, looked ahead by a third of
/// its length or to where it leaves the limits; enough to draw by.
fn trend(runs: &[HistoryRun], last: usize) -> Option<Trend> {
    let used = &runs[runs.len() - last..];
    let (from, to) = (used[0].taken, used[last - 1].taken);
    let day = |t: DateTime<FixedOffset>| (t - from).num_seconds() as f64 / 86_400.0;
    let n = last as f64;
    let mean_x = used.iter().map(|r| day(r.taken)).sum::<f64>() / n;
    let mean_y = used.iter().map(|r| r.flow_l_min).sum::<f64>() / n;
    let sxx: f64 = used.iter().map(|r| (day(r.taken) - mean_x) * (day(r.taken) - mean_x)).sum();
    let sxy: f64 = used.iter().map(|r| (day(r.taken) - mean_x) * (r.flow_l_min - mean_y)).sum();
    let slope = sxy / sxx;
    let residual = |r: &HistoryRun| r.flow_l_min - mean_y - slope * (day(r.taken) - mean_x);
    let s = (used.iter().map(|r| residual(r) * residual(r)).sum::<f64>() / (n - 2.0)).sqrt();
    let half = |x: f64| 2.3 * s * (1.0 / n + (x - mean_x) * (x - mean_x) / sxx).sqrt();
    let at = |x: f64| mean_y + slope * (x - mean_x);
    let (low, high) = used[last - 1].limits_l_min?;
    let leaves = mean_x + ((if slope < 0.0 { low } else { high }) - mean_y) / slope;
    let near = leaves > day(to) && leaves < day(to) + 3.0 * YEAR;
    let end = if near { leaves } else { 1.3 * day(to) };
    let line = (0..=24)
        .map(|i| {
            let x = end * f64::from(i) / 24.0;
            TrendPlace { at: after(from, x), flow_l_min: at(x), expanded_l_min: half(x) }
        })
        .collect();
    let first = (0..2000).map(|i| day(to) + f64::from(i)).find(|x| {
        let (line, half) = (at(*x), half(*x));
        line - half < low || line + half > high
    });
    Some(Trend {
        runs: last,
        from,
        to,
        per_year_share: slope * YEAR / mean_y,
        per_year_expanded: 2.3 * s / sxx.sqrt() * YEAR / mean_y,
        line,
        leaves: near
            .then(|| Leaving { about: after(from, leaves), not_before: first.map(|x| after(from, x)) }),
    })
}

const LIMITS: Option<(f64, f64)> = Some((0.456, 0.504));

/// Checks about every `every` days, the flow in shares of 0.483 L/min.
fn checked(
    start: &str,
    count: usize,
    every: f64,
    share: impl Fn(usize) -> f64,
) -> Vec<(DateTime<FixedOffset>, f64, Purpose)> {
    (0..count)
        .map(|i| {
            let day = every * (i as f64 + 0.25 * scatter(7 * i as u64));
            let flow = 0.483 * share(i) * (1.0 + 0.0022 * scatter(i as u64));
            let purpose = if i == 0 { Purpose::Acceptance } else { Purpose::Check };
            (after(time(start), day), flow, purpose)
        })
        .collect()
}

/// A good orifice that begins to clog after half its runs.
fn clogging(count: usize, per_run: f64) -> Made {
    let half = count / 2;
    let share = |i: usize| 1.0 - per_run * i.saturating_sub(half) as f64;
    let flows = checked("2024-11-04T09:40:00+11:00", count, 61.0, share);
    Made::of(judged(&flows, |_| LIMITS, 0.0035)).with_trend(count - half)
}

/// Serviced each time: found lower, cleaned, left higher.
fn serviced(count: usize, every: f64, start: &str) -> Vec<(DateTime<FixedOffset>, f64, Purpose)> {
    (0..count)
        .map(|i| {
            let (visit, left) = ((i / 2) as f64, i % 2 == 1);
            let day = every * (visit + 0.2 * scatter(visit as u64)) + if left { 0.15 } else { 0.0 };
            let lost = if left { 0.001 } else { 0.012 + 0.010 * scatter(5 * i as u64) };
            let flow = 0.483 * (1.0 - lost) * (1.0 + 0.0015 * scatter(i as u64));
            (after(time(start), day), flow, if left { Purpose::AsLeft } else { Purpose::AsFound })
        })
        .collect()
}

fn hostile() -> Made {
    let mut made = clogging(6, 0.02);
    made.orifice = "Отверстие_ЖЩШЮжщшюЫы-Ünïté-12\u{202e}<&\">".to_owned();
    let names =
        ["<script>alert(\"&amp;\")</script>", "</text>", "\u{202e}gnirts\u{1b}[31m", "", "a\u{0}b", "]]>"];
    for (run, name) in made.runs.iter_mut().zip(names) {
        run.name = name.to_owned();
    }
    made.runs[4].name = "a run with a name as long as nobody would ever give one, <&\">, ѪѪѪѪ".to_owned();
    made
}

/// Every history, by name.
pub(crate) fn all() -> Vec<(&'static str, Made)> {
    let good = |count, every| {
        Made::of(judged(&checked("2023-02-06T10:00:00+01:00", count, every, |_| 1.0), |_| LIMITS, 0.0045))
    };
    let mut two = judged(
        &[
            (time("2025-11-20T16:10:00+01:00"), 0.4851, Purpose::Acceptance),
            (time("2026-11-12T09:40:00+01:00"), 0.4775, Purpose::Check),
        ],
        |_| LIMITS,
        0.0085,
    );
    two[1].en = Some(-1.31);
    let same_day = judged(
        &[
            (time("2026-11-12T09:40:00+11:00"), 0.4512, Purpose::AsFound),
            (time("2026-11-12T14:10:00+11:00"), 0.4825, Purpose::AsLeft),
        ],
        |_| LIMITS,
        0.0045,
    );
    let blocked = {
        let share = |i| if i == 6 { 0.52 } else { 1.0 };
        judged(&checked("2024-03-01T08:00:00Z", 7, 120.0, share), |_| LIMITS, 0.0045)
    };
    let changing = |i: usize| match i {
        0..=11 => Some((0.435, 0.525)),
        12..=13 => None,
        14..=27 => Some((0.456, 0.504)),
        _ => Some((0.4656, 0.4944)),
    };
    let mut odd = good(9, 45.0);
    odd.runs[3].flow_l_min = f64::NAN;
    odd.runs[5].expanded_l_min = f64::INFINITY;
    odd.runs[6].limits_l_min = Some((f64::NAN, 0.5));
    odd.runs.reverse();
    let far = judged(&checked("2025-05-05T10:00:00Z", 6, 30.0, |_| 1.0), |_| Some((4.56, 5.04)), 0.0045);
    let wild = judged(
        &checked("2022-01-10T10:00:00Z", 60, 21.0, |i| 1.0 + 0.012 * scatter(3 * i as u64)),
        |_| LIMITS,
        0.0035,
    );
    vec![
        ("none", Made { left_out: 3, ..Made::of(Vec::new()) }),
        ("one", good(1, 1.0)),
        ("two", Made::of(two)),
        ("five", Made { left_out: 1, ..good(5, 110.0) }),
        ("same-day", Made::of(same_day)),
        ("same-week", good(4, 2.0)),
        ("clogging", Made { left_out: 2, ..clogging(13, 0.0042) }),
        ("clogged", clogging(14, 0.011)),
        ("half-blocked", Made::of(blocked)),
        (
            "not-judged",
            Made::of(judged(&checked("2025-01-07T10:00:00Z", 8, 47.0, |_| 1.0), |_| None, 0.0045)),
        ),
        ("limits-far-away", Made::of(far)),
        ("forty", Made::of(judged(&serviced(40, 158.0, "2016-06-13T10:00:00+02:00"), changing, 0.0055))),
        ("much-changed", Made { gas: Species::Helium, ip_bar: 9.5, ..Made::of(wild) }),
        ("five-hundred", {
            let share = |i: usize| 1.0 - 3.6e-5 * i as f64;
            let flows = checked("1988-04-11T10:00:00Z", 500, 28.0, share);
            Made::of(judged(&flows, |i| if i < 200 { Some((0.445, 0.515)) } else { LIMITS }, 0.0035))
                .with_trend(120)
        }),
        ("odd-numbers", odd),
        ("hostile-texts", hostile()),
    ]
}
