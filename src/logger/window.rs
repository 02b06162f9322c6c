//! The last minute of flow and pressure, and whether its end is steady.
//!
//! Takes readings as they come and asks [`crate::series::steady_points`] about the rows it holds: the search that finds
//! the points of an imported series, with its options, its spikes, gaps and settling. The rows are bounded in time and one
//! looks once in a tenth of the least duration, so the cost of a reading does not grow with the run. Of an instrument that
//! says more than twenty numbers a second a row holds the mean over a twentieth.
//! Left out: anything that is known of the instruments from their papers.

use super::sign::{NotSteady, Role, Steady};
use crate::entry::{PointReading, SeriesReadings};
use crate::quantity::{AbsolutePressure, Temperature};
use crate::series::{Channel, Rejection, Remark, SteadyOptions, join, steady_points};

/// Rows are kept for this many least durations (common practice, no source).
const KEPT_DURATIONS: f64 = 6.0;
/// ... or for this many times the readings a point needs of a slow instrument.
const KEPT_READINGS: f64 = 4.0;
/// ... and never for longer than this, in seconds.
const MOST_KEPT_S: f64 = 900.0;
/// Shortest time from one row of a channel to its next, seconds: no meter and no transducer of this trade settles faster
/// (common practice, no source), and what is looked at stays small however fast an instrument speaks.
const FINEST_S: f64 = 0.05;
/// The pressure now is the mean over the least duration divided by this, which is the search's own window.
pub(super) const NOW_DURATIONS: f64 = 4.0;
/// A reading stamped earlier than the last by more than this many seconds is of a clock that was set; by less, of another
/// port's thread.
const OUT_OF_ORDER_S: f64 = 1.0;

/// Readings of a slow instrument, for the points.
#[derive(Debug, Clone, Default)]
struct Slow {
    time_s: Vec<f64>,
    values: Vec<f64>,
}

impl Slow {
    fn push(&mut self, at_s: f64, value: f64, keep_s: f64) {
        if self.time_s.last().is_some_and(|last_s| at_s < *last_s) {
            // Its own times never run back while its clock does not.
            *self = Self::default();
        }
        if self.time_s.last().is_some_and(|last_s| at_s < last_s + FINEST_S) {
            return;
        }
        self.time_s.push(at_s);
        self.values.push(value);
        let old = self.time_s.partition_point(|t| *t < at_s - keep_s);
        // Half of it at once, so that a reading costs the same however many are kept.
        if 2 * old > self.time_s.len() {
            self.time_s.drain(..old);
            self.values.drain(..old);
        }
    }

    fn over(&self, span: &Steady, nearest_s: f64) -> Option<f64> {
        join::over_time(&self.time_s, &self.values, span.from_s, span.to_s, nearest_s).map(|at| at.value)
    }
}

/// The readings of a channel that its newest row is the mean of.
#[derive(Debug, Clone, Copy, Default)]
struct Newest {
    from_s: f64,
    sum: f64,
    count: u32,
    last: f64,
    last_s: f64,
}

impl Newest {
    fn of(at_s: f64, value: f64) -> Self {
        Self { from_s: at_s, sum: value, count: 1, last: value, last_s: at_s }
    }

    /// Takes a reading of the same row; none when it begins a new one.
    fn with(&self, at_s: f64, value: f64) -> Option<Self> {
        let same_row = self.count > 0 && at_s >= self.last_s && at_s < self.from_s + FINEST_S;
        // Readings that were held back on their way come all at one second: only the newest of them is of that second.
        let at_once = at_s <= self.last_s;
        let (sum, count) =
            if at_once { (self.sum - self.last, self.count) } else { (self.sum, self.count + 1) };
        same_row.then_some(Self { sum: sum + value, count, last: value, last_s: at_s, ..*self })
    }

    fn mean(&self) -> f64 {
        self.sum / f64::from(self.count.max(1))
    }
}

/// A span that is steady up to now, and the point it makes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Held {
    pub(super) steady: Steady,
    pub(super) reading: PointReading,
}

/// What one sees in a window.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Seen {
    /// The sign.
    pub(super) sign: Result<Held, NotSteady>,
    /// A channel that repeats one value while the other moves, with the second since when.
    pub(super) frozen: Option<(Role, f64)>,
    /// The level that is held now and for how many seconds, steady or not; none while it moves.
    pub(super) level: Option<(f64, f64)>,
}

/// The readings of the last minute.
#[derive(Debug, Clone)]
pub(super) struct Window {
    options: SteadyOptions,
    rows: SeriesReadings,
    newest_pressure: Newest,
    newest_flow: Newest,
    temperature: Slow,
    barometer: Slow,
}

impl Window {
    pub(super) fn new(options: SteadyOptions) -> Self {
        let (temperature, barometer) = (Slow::default(), Slow::default());
        let (newest_pressure, newest_flow) = (Newest::default(), Newest::default());
        Self {
            options,
            rows: SeriesReadings::default(),
            newest_pressure,
            newest_flow,
            temperature,
            barometer,
        }
    }

    /// Takes a reading: Pa gauge, L/min as shown, K or Pa. `interval_s` is that of the slower of flow and pressure.
    pub(super) fn push(&mut self, role: Role, at_s: f64, value: f64, interval_s: f64) {
        let options = &self.options;
        let slow_s = KEPT_READINGS * options.least_readings as f64 * interval_s;
        let keep_s = (KEPT_DURATIONS * options.least_duration_s).max(slow_s).min(MOST_KEPT_S);
        let (pressure, flow) = match role {
            Role::Pressure => (value, f64::NAN),
            Role::Flow => (f64::NAN, value),
            Role::Temperature => {
                return self.temperature.push(at_s, value, keep_s + options.nearest_s);
            }
            Role::Barometer => return self.barometer.push(at_s, value, keep_s + options.nearest_s),
            Role::Cell | Role::Depth => return,
        };
        let rows = &mut self.rows;
        let mut place = rows.time_s.len();
        while place > 0 && rows.time_s.get(place - 1).is_some_and(|t| *t > at_s) {
            place -= 1;
        }
        if rows.time_s.last().is_some_and(|last_s| *last_s > at_s + OUT_OF_ORDER_S) {
            *rows = SeriesReadings::default();
            place = 0;
        }
        let (column, newest) = match role {
            Role::Flow => (&mut rows.flow_l_min, &mut self.newest_flow),
            _ => (&mut rows.pressure_pa, &mut self.newest_pressure),
        };
        if let Some(with) = newest.with(at_s, value) {
            *newest = with;
            let since = |row: &usize| rows.time_s.get(*row).is_some_and(|t| *t >= with.from_s);
            for row in (0..place).rev().take_while(since) {
                if let Some(mean) = column.get_mut(row).filter(|mean| mean.is_finite()) {
                    *mean = with.mean();
                    return;
                }
            }
        }
        *newest = Newest::of(at_s, value);
        rows.time_s.insert(place, at_s);
        rows.pressure_pa.insert(place, pressure);
        rows.flow_l_min.insert(place, flow);
        let old = rows.time_s.partition_point(|t| *t < at_s - keep_s);
        // A quarter at once, so that a reading costs the same however many are kept.
        if 4 * old > rows.time_s.len() {
            rows.time_s.drain(..old);
            rows.pressure_pa.drain(..old);
            rows.flow_l_min.drain(..old);
        }
    }

    /// Looks at the rows after `after_s`.
    pub(super) fn look(&self, after_s: f64) -> Seen {
        let fresh = self.rows.time_s.partition_point(|t| *t <= after_s);
        if fresh == 0 {
            return self.judge(&self.rows);
        }
        let rest = |column: &[f64]| column.get(fresh..).unwrap_or_default().to_vec();
        self.judge(&SeriesReadings {
            time_s: rest(&self.rows.time_s),
            pressure_pa: rest(&self.rows.pressure_pa),
            flow_l_min: rest(&self.rows.flow_l_min),
            ..SeriesReadings::default()
        })
    }

    fn judge(&self, rows: &SeriesReadings) -> Seen {
        let options = &self.options;
        let least_s = options.least_duration_s;
        let (Some(&first_s), Some(&last_s)) = (rows.time_s.first(), rows.time_s.last()) else {
            let sign = Err(NotSteady::TooShort { held_s: 0.0, least_s });
            return Seen { sign, frozen: None, level: None };
        };
        let found = steady_points(rows, options);
        // What ends further back than this is over.
        let now_from_s = last_s - (least_s / NOW_DURATIONS).max(2.0 * interval_s(rows));
        let frozen = found.remarks.iter().rev().find_map(|remark| match remark {
            Remark::Frozen(stretch) if stretch.to_s >= now_from_s => {
                Some((role_of(stretch.channel), stretch.from_s))
            }
            _ => None,
        });
        let span = found.spans.last().zip(found.points.last()).filter(|(span, _)| span.to_s >= now_from_s);
        let rejected = found.rejected.last().filter(|rejected| rejected.to_s >= now_from_s);
        let later = span.is_some_and(|(span, _)| rejected.is_none_or(|r| r.rows.end <= span.rows.end));
        match (span, rejected) {
            (Some((span, point)), _) if later => {
                let (from_s, to_s) = (span.from_s, span.to_s);
                let steady = Steady { from_s, to_s, pressure: span.pressure, flow: span.flow };
                let level = Some((span.pressure.mean, to_s - from_s));
                let sign = self
                    .known_well(&steady)
                    .map_or_else(|| Ok(Held { steady, reading: self.complete(*point, &steady) }), Err);
                Seen { sign, frozen, level }
            }
            (_, Some(rejected)) => {
                let lasts_s = rejected.to_s - rejected.from_s;
                let moving = matches!(rejected.why, Rejection::KeptMoving);
                let level = (!moving).then_some((rejected.pressure_pa, lasts_s));
                Seen { sign: Err(self.not_steady(rows, &rejected.why, lasts_s)), frozen, level }
            }
            _ => {
                let begun = last_s - first_s < least_s / 2.0;
                let sign =
                    if begun { NotSteady::TooShort { held_s: 0.0, least_s } } else { self.moves(rows) };
                Seen { sign: Err(sign), frozen, level: None }
            }
        }
    }

    fn not_steady(&self, rows: &SeriesReadings, why: &Rejection, lasts_s: f64) -> NotSteady {
        let per_s = 1.0 / lasts_s.max(1e-9);
        match *why {
            Rejection::KeptMoving => self.moves(rows),
            Rejection::TooShort { lasts_s, least_s } => NotSteady::TooShort { held_s: lasts_s, least_s },
            Rejection::TooFewReadings { readings, least } => NotSteady::TooFewReadings { readings, least },
            Rejection::PressureDrifts { drift_pa, .. } => {
                NotSteady::PressureDrifts { rate_pa_s: drift_pa * per_s }
            }
            Rejection::FlowSettlesLate { lasts_s, least_s } => {
                NotSteady::FlowSettles { held_s: lasts_s, least_s }
            }
            Rejection::FlowDrifts { drift, .. } => NotSteady::FlowDrifts { share_per_s: drift * per_s },
        }
    }

    fn moves(&self, rows: &SeriesReadings) -> NotSteady {
        let over_s = self.options.least_duration_s / NOW_DURATIONS;
        NotSteady::PressureMoves { rate_pa_s: rate(&rows.time_s, &rows.pressure_pa, over_s).unwrap_or(0.0) }
    }

    /// Drift that is not seen may be hidden in scatter: a mean that is not known to within the limit of its drift is
    /// not yet one.
    fn known_well(&self, span: &Steady) -> Option<NotSteady> {
        let share = |mean: &crate::series::MeanOfSpan| mean.scatter / mean.mean.abs().max(f64::MIN_POSITIVE);
        if span.pressure.scatter > self.options.most_pressure_drift_pa {
            return Some(NotSteady::Scatters { role: Role::Pressure, share: share(&span.pressure) });
        }
        let flow = share(&span.flow);
        (flow > self.options.most_flow_drift).then_some(NotSteady::Scatters { role: Role::Flow, share: flow })
    }

    /// The point with the slower channels.
    fn complete(&self, point: PointReading, span: &Steady) -> PointReading {
        let nearest_s = self.options.nearest_s;
        PointReading {
            temperature: self.temperature.over(span, nearest_s).map(Temperature::from_k),
            barometer: self.barometer.over(span, nearest_s).map(AbsolutePressure::from_pa),
            ..point
        }
    }

    /// Mean pressure of the last part of the least duration, Pa gauge; none without readings in it.
    pub(super) fn pressure_now_pa(&self) -> Option<f64> {
        let rows = &self.rows;
        let from_s = rows.time_s.last()? - self.options.least_duration_s / NOW_DURATIONS;
        let first = rows.time_s.partition_point(|t| *t < from_s);
        let late = rows.pressure_pa.get(first..)?.iter().copied().filter(|p| p.is_finite());
        let (sum, count) = late.fold((0.0, 0_usize), |(sum, n), p| (sum + p, n + 1));
        (count > 0).then(|| sum / count as f64)
    }

    /// Rates of pressure in Pa/s and of flow in L/min a second, over the last half of the least duration.
    pub(super) fn rates(&self) -> (Option<f64>, Option<f64>) {
        let over_s = self.options.least_duration_s / 2.0;
        let rows = &self.rows;
        (rate(&rows.time_s, &rows.pressure_pa, over_s), rate(&rows.time_s, &rows.flow_l_min, over_s))
    }
}

/// Mean interval of the slower of the two channels, in seconds.
fn interval_s(rows: &SeriesReadings) -> f64 {
    let lasts_s = rows.time_s.last().unwrap_or(&0.0) - rows.time_s.first().unwrap_or(&0.0);
    let count = |column: &[f64]| column.iter().filter(|x| x.is_finite()).count();
    let fewer = count(&rows.pressure_pa).min(count(&rows.flow_l_min));
    lasts_s / fewer.max(1) as f64
}

fn role_of(channel: Channel) -> Role {
    match channel {
        Channel::Pressure => Role::Pressure,
        Channel::Flow => Role::Flow,
    }
}

/// Slope of the finite values of the last `over_s` seconds, a second; none with fewer than three of them.
fn rate(time_s: &[f64], values: &[f64], over_s: f64) -> Option<f64> {
    let last_s = *time_s.last()?;
    let first = time_s.partition_point(|t| *t < last_s - over_s);
    let late = || {
        let pairs = time_s.iter().zip(values).skip(first);
        pairs.filter(|(_, x)| x.is_finite()).map(|(t, x)| (t - last_s, *x))
    };
    let n = late().count();
    let (t_sum, x_sum) = late().fold((0.0, 0.0), |(a, b), (t, x)| (a + t, b + x));
    let (t_mean, x_mean) = (t_sum / n as f64, x_sum / n as f64);
    let (mut squares, mut products) = (0.0, 0.0);
    for (t, x) in late() {
        squares += (t - t_mean) * (t - t_mean);
        products += (t - t_mean) * (x - x_mean);
    }
    (n >= 3 && squares > 0.0).then(|| products / squares)
}
