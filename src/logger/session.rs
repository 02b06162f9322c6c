//! A session while it is logged: rows at a steady rate, events, and alarms.

use super::alarm::{Alarm, AlarmChange, AlarmKind, AlarmLimits, Condition, Watched};
use super::cells::CellScale;
use super::channel::{Channel, ChannelLive};
use super::ledger::{SessionLedger, Trouble, TroubleAt};
use super::outbox::Outbox;
use super::rising::Rising;
use super::sign::Role;
use crate::entry::{Event, Instrument, Place, What as Happened};
use crate::gas::{self, Water};
use crate::instrument::{Fault, FaultKind, Heard, Reading, What};
use crate::quantity::{AbsolutePressure, Length};

/// A clock that leaps further than this, in seconds, was asleep: no rows are invented for the time between.
const ASLEEP_S: f64 = 60.0;
/// Fewest equal readings of a frozen cell, as in an uptake (common practice, no source).
const FROZEN_READINGS: u64 = 10;
/// ... and how many steps of its last digit the others must have moved.
const FROZEN_DIGITS: f64 = 2.5;

/// How a session is logged.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SessionOptions {
    /// Seconds from one row to the next. Default 1.
    pub every_s: f64,
    /// Barometer at the surface.
    pub barometer: AbsolutePressure,
    /// What the pool is filled with.
    pub water: Water,
    /// When alarms are raised and cleared.
    pub limits: AlarmLimits,
    /// The second of the clock of the first row of a session that goes on; none for a new one.
    pub began_s: Option<f64>,
}

impl SessionOptions {
    /// The usual ones of a place: a row a second, fresh water, the standard atmosphere.
    #[must_use]
    pub fn of(place: Place) -> Self {
        Self {
            every_s: 1.0,
            barometer: AbsolutePressure::STANDARD_ATMOSPHERE,
            water: Water::Fresh,
            limits: AlarmLimits::of(place),
            began_s: None,
        }
    }
}

/// Why a session cannot be logged so.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SessionSetupError {
    /// Too few or too many cells.
    #[error(
        "a session is logged with two or three oxygen cells, and {0} are named: with one alone nothing tells when it \
         is wrong"
    )]
    Cells(usize),
    /// Not a scale for each cell.
    #[error(
        "{cells} cells need a scale each, and {scales} are given: say for each whether it shows bar or mV"
    )]
    Scales {
        /// Cells.
        cells: usize,
        /// Scales.
        scales: usize,
    },
    /// A scale that is no line.
    #[error("the calibration of {0} does not rise from air to oxygen: calibrate it anew")]
    NoLine(String),
    /// Two for one thing.
    #[error("{first} and {second} both measure {role}: name one of them")]
    Twice {
        /// What they measure.
        role: Role,
        /// One.
        first: String,
        /// The other.
        second: String,
    },
    /// One that a session has no use for.
    #[error("{id} measures {role}, which no session has a column for: leave it out")]
    NotForSession {
        /// The instrument.
        id: String,
        /// What it measures.
        role: Role,
    },
    /// A rate that is none.
    #[error("rows cannot come every {0} s: give 0.2 s to 60 s")]
    Rate(f64),
}

/// Why an event was not taken.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
pub enum EventRefused {
    /// No reading yet.
    #[error("no cell was read yet, so that the session has not begun: mark it again when it has")]
    NotBegun,
    /// Outside the readings so far.
    #[error("{at_s:.0} s is not between the beginning and now ({now_s:.0} s)")]
    Outside {
        /// When it was said to be, on the time column.
        at_s: f64,
        /// Now, on the time column.
        now_s: f64,
    },
    /// The session is over.
    #[error("the session ended at {0:.0} s")]
    Over(f64),
}

/// A row of a session.
#[derive(Debug, Clone, PartialEq)]
pub struct Row {
    /// Seconds since the first row.
    pub time_s: f64,
    /// The last value of each instrument within its stale time, in the order they were given; none where it is missing.
    pub values: Vec<Option<Reading>>,
}

/// The session as a screen shows it.
#[derive(Debug, Clone, PartialEq)]
pub struct SessionLive {
    /// When, in seconds of the clock.
    pub at_s: f64,
    /// Seconds since the first row; none before it.
    pub time_s: Option<f64>,
    /// The instruments, in the order they were given.
    pub channels: Vec<ChannelLive>,
    /// PO2 in bar by each cell in that order; none where it is stale or frozen.
    pub po2_bar: Vec<Option<f64>>,
    /// Median of these; none without any.
    pub median_po2_bar: Option<f64>,
    /// The alarms that are raised.
    pub alarms: Vec<Alarm>,
    /// Rows so far.
    pub rows: usize,
}

/// Something to be handed to the ledger.
#[derive(Debug, Clone)]
enum Entry {
    Row(Row),
    Event(Event),
    Alarm(AlarmChange),
    Fault(TroubleAt),
}

/// What a cell needs besides its channel.
#[derive(Debug, Clone, Copy)]
struct Cell {
    instrument: usize,
    scale: CellScale,
    /// Smallest difference of neighbouring readings that is not nought, bar.
    digit_bar: f64,
    /// Mean of the other cells when its present value began to repeat, bar.
    others_then_bar: Option<f64>,
}

/// Logs a session. Handled as [`super::BenchLogger`]; [`Self::tick`] must come at least once a row.
#[derive(Debug, Clone)]
pub struct SessionLogger {
    options: SessionOptions,
    channels: Vec<Channel>,
    cells: Vec<Cell>,
    alarms: Vec<Watched>,
    rising: Rising,
    /// When the first word came or time first passed.
    started_s: Option<f64>,
    /// Second of the clock of the first row.
    origin_s: Option<f64>,
    rows: usize,
    next_row_s: f64,
    stopped_s: Option<f64>,
    outbox: Outbox<Entry>,
}

impl SessionLogger {
    /// A logger of these instruments, in the order in which [`Heard::instrument`] counts them: two or three cells, at
    /// most one for depth and one for the temperature of the loop. `scales` are those of the cells, in their order.
    ///
    /// # Errors
    /// Cells too few or too many, a calibration that is none, two instruments for one thing, one that a session has no
    /// use for, a rate that is none.
    pub fn new(
        instruments: &[Instrument],
        scales: &[CellScale],
        options: SessionOptions,
    ) -> Result<Self, SessionSetupError> {
        let mut channels = Vec::with_capacity(instruments.len());
        let mut cells = Vec::new();
        for (number, instrument) in instruments.iter().enumerate() {
            let (role, id) = (Role::of(instrument.measures), || instrument.id.as_str().to_owned());
            let before = instruments.iter().take(number).find(|other| other.measures == instrument.measures);
            match (role, before) {
                (Role::Cell, _) => {
                    let scale = scales.get(cells.len()).copied().unwrap_or(CellScale::Bar);
                    if !scale.is_a_line() {
                        return Err(SessionSetupError::NoLine(id()));
                    }
                    let digit_bar = f64::INFINITY;
                    cells.push(Cell { instrument: number, scale, digit_bar, others_then_bar: None });
                }
                (Role::Depth | Role::Temperature, None) => {}
                (Role::Depth | Role::Temperature, Some(before)) => {
                    let first = before.id.as_str().to_owned();
                    return Err(SessionSetupError::Twice { role, first, second: id() });
                }
                _ => return Err(SessionSetupError::NotForSession { id: id(), role }),
            }
            channels.push(Channel::new(instrument, role));
        }
        if !(2..=3).contains(&cells.len()) {
            return Err(SessionSetupError::Cells(cells.len()));
        }
        if scales.len() != cells.len() {
            return Err(SessionSetupError::Scales { cells: cells.len(), scales: scales.len() });
        }
        if !(0.2..=60.0).contains(&options.every_s) {
            return Err(SessionSetupError::Rate(options.every_s));
        }
        Ok(Self {
            alarms: alarms(&channels, &options.limits),
            options,
            channels,
            cells,
            rising: Rising::default(),
            started_s: None,
            origin_s: options.began_s,
            rows: 0,
            next_row_s: f64::INFINITY,
            stopped_s: None,
            outbox: Outbox::new(),
        })
    }

    /// Takes what was heard. What is heard of a number that no instrument has is none of ours.
    pub fn hear(&mut self, heard: &Heard) {
        let at_s = heard.at_s;
        // Rows before it do not know it yet.
        self.rows_before(at_s, false);
        self.started_s.get_or_insert(at_s);
        let cell = self.cells.iter().position(|cell| cell.instrument == heard.instrument);
        let scale = cell.and_then(|cell| self.cells.get(cell)).map(|cell| cell.scale);
        let Some(channel) = self.channels.get_mut(heard.instrument) else { return };
        let before = channel.last.map(|last| last.reading);
        let other_kind = match (&heard.what, scale) {
            (What::Reading(reading), Some(scale)) => !reading.kind().is_some_and(|kind| scale.fits(kind)),
            _ => false,
        };
        let troubles = if other_kind {
            // Volts where bar is expected, or the reverse: no reading of this cell.
            let fault = What::Fault(Fault::new(FaultKind::OtherUnit, &[]));
            channel.heard(&Heard { what: fault, ..*heard })
        } else {
            channel.heard(heard)
        };
        let ran_back = troubles.iter().any(|trouble| matches!(trouble, Trouble::TimeRanBack { .. }));
        self.record(heard.instrument, at_s, troubles);
        if ran_back {
            // Rows go on from here; their own times do not run back.
            self.next_row_s = self.next_row_s.min(at_s + self.options.every_s);
        }
        if let (What::Reading(reading), false, Some(cell)) = (&heard.what, other_kind, cell) {
            match self.origin_s {
                None => (self.origin_s, self.next_row_s) = (Some(at_s), at_s),
                // A session that goes on has its next row where the rows before would have put it.
                Some(origin_s) if self.next_row_s.is_infinite() => {
                    let every_s = self.options.every_s;
                    self.next_row_s = origin_s + libm::ceil((at_s - origin_s) / every_s) * every_s;
                }
                Some(_) => {}
            }
            self.cell_read(cell, at_s, before, reading);
        }
        self.see(at_s);
    }

    /// Time passed: rows that are due, what has become stale, alarms.
    pub fn tick(&mut self, now_s: f64) {
        self.started_s.get_or_insert(now_s);
        self.rows_before(now_s, true);
        for instrument in 0..self.channels.len() {
            let stale = self.channels.get_mut(instrument).is_some_and(|channel| channel.becomes_stale(now_s));
            if stale {
                self.record(instrument, now_s, vec![Trouble::Stale]);
            }
        }
        self.see(now_s);
    }

    /// Marks an event now.
    ///
    /// # Errors
    /// Before the first reading of a cell, and after the end.
    pub fn mark(&mut self, now_s: f64, what: Happened) -> Result<Event, EventRefused> {
        let origin_s = self.origin_s.ok_or(EventRefused::NotBegun)?;
        self.mark_at(now_s - origin_s, now_s, what)
    }

    /// Marks an event at a time on the time column.
    ///
    /// # Errors
    /// As [`Self::mark`]; a time before the first row or later than now.
    pub fn mark_at(&mut self, at_s: f64, now_s: f64, what: Happened) -> Result<Event, EventRefused> {
        let origin_s = self.origin_s.ok_or(EventRefused::NotBegun)?;
        if let Some(stopped_s) = self.stopped_s {
            return Err(EventRefused::Over(stopped_s));
        }
        if !(0.0..=now_s - origin_s).contains(&at_s) {
            return Err(EventRefused::Outside { at_s, now_s: now_s - origin_s });
        }
        let event = Event { at_s, what };
        if what == Happened::Stop {
            self.rows_before(now_s, true);
            self.stopped_s = Some(at_s);
        }
        self.rising.event(origin_s + at_s, &what);
        self.outbox.push_urgent(Entry::Event(event));
        Ok(event)
    }

    /// The session as it stands at a second of the clock.
    #[must_use]
    pub fn live(&self, now_s: f64) -> SessionLive {
        let po2_bar: Vec<Option<f64>> = (0..self.cells.len()).map(|cell| self.po2_bar(cell, now_s)).collect();
        let channels = self.channels.iter().enumerate().map(|(number, one)| one.live(number, now_s));
        SessionLive {
            at_s: now_s,
            time_s: self.origin_s.map(|origin_s| now_s - origin_s),
            channels: channels.collect(),
            median_po2_bar: median(po2_bar.iter().flatten().copied()),
            po2_bar,
            alarms: self.alarms.iter().filter_map(Watched::raised).collect(),
            rows: self.rows,
        }
    }

    /// The second of the clock of the first row.
    #[must_use]
    pub const fn began_s(&self) -> Option<f64> {
        self.origin_s
    }

    /// Hands over what is due: rows and faults at least every half second, events and alarms at once, a heartbeat.
    ///
    /// # Errors
    /// The ledger's own; what it refused is handed over again the next time, before anything else.
    pub fn hand_over<L: SessionLedger>(&mut self, now_s: f64, ledger: &mut L) -> Result<(), L::Error> {
        if self.outbox.is_due(now_s) { self.hand_over_all(now_s, ledger) } else { Ok(()) }
    }

    /// Hands over everything, due or not, as at the end.
    ///
    /// # Errors
    /// As [`Self::hand_over`].
    pub fn hand_over_all<L: SessionLedger>(&mut self, now_s: f64, ledger: &mut L) -> Result<(), L::Error> {
        self.outbox.drain(now_s, |entry| match entry {
            Entry::Row(row) => ledger.rows(std::slice::from_ref(row)),
            Entry::Event(event) => ledger.event(event),
            Entry::Alarm(change) => ledger.alarm(change),
            Entry::Fault(trouble) => ledger.fault(trouble),
        })?;
        ledger.heartbeat(now_s)
    }

    fn record(&mut self, instrument: usize, at_s: f64, troubles: Vec<Trouble>) {
        for what in troubles {
            self.outbox.push(Entry::Fault(TroubleAt { instrument, at_s, what }));
        }
    }

    /// A cell was read.
    fn cell_read(&mut self, number: usize, at_s: f64, before: Option<Reading>, reading: &Reading) {
        let others_bar = self.others_bar(number, at_s);
        let limits = self.options.limits;
        let Some(cell) = self.cells.get_mut(number) else { return };
        let Some(channel) = self.channels.get_mut(cell.instrument) else { return };
        if let Some(before) = before {
            let step_bar = (cell.scale.po2_bar(reading) - cell.scale.po2_bar(&before)).abs();
            if step_bar > 0.0 {
                cell.digit_bar = cell.digit_bar.min(step_bar);
            }
        }
        let repeats = &channel.repeats;
        if repeats.is_new() {
            cell.others_then_bar = others_bar;
        }
        let digit_bar = if cell.digit_bar.is_finite() { cell.digit_bar } else { 0.0 };
        let least_bar = limits.frozen_moves_bar.max(FROZEN_DIGITS * digit_bar);
        let long = at_s - repeats.since_s() >= limits.frozen_s && repeats.times() >= FROZEN_READINGS;
        let moved =
            others_bar.zip(cell.others_then_bar).is_some_and(|(now, then)| (now - then).abs() > least_bar);
        if long && moved {
            channel.frozen_beside_s.get_or_insert(repeats.since_s());
        }
        let (instrument, mut troubles) = (cell.instrument, Vec::new());
        channel.say_frozen(&mut troubles);
        self.record(instrument, at_s, troubles);
    }

    /// PO2 by a cell, in bar; none while it is stale or frozen.
    fn po2_bar(&self, cell: usize, now_s: f64) -> Option<f64> {
        let cell = self.cells.get(cell)?;
        let channel = self.channels.get(cell.instrument)?;
        let usable = !channel.is_stale(now_s) && channel.frozen_since_s().is_none();
        channel.last.filter(|_| usable).map(|last| cell.scale.po2_bar(&last.reading))
    }

    /// Mean PO2 of the other cells, in bar.
    fn others_bar(&self, cell: usize, now_s: f64) -> Option<f64> {
        let others = (0..self.cells.len()).filter(|other| *other != cell);
        let (sum, count) = others
            .filter_map(|other| self.po2_bar(other, now_s))
            .fold((0.0, 0_usize), |(sum, n), po2| (sum + po2, n + 1));
        (count > 0).then(|| sum / count as f64)
    }

    /// The last reading of the one instrument of a role, if it is not stale.
    fn fresh(&self, role: Role, now_s: f64) -> Option<Reading> {
        let channel = self.channels.iter().find(|channel| channel.role == role)?;
        channel.last.filter(|_| !channel.is_stale(now_s)).map(|last| last.reading)
    }

    /// Writes the rows before `until_s`, or up to it.
    fn rows_before(&mut self, until_s: f64, inclusive: bool) {
        let Some(origin_s) = self.origin_s.filter(|_| self.stopped_s.is_none()) else { return };
        let every_s = self.options.every_s;
        if until_s - self.next_row_s > ASLEEP_S {
            self.next_row_s = origin_s + libm::floor((until_s - origin_s) / every_s) * every_s;
        }
        while self.next_row_s < until_s || (inclusive && self.next_row_s <= until_s) {
            let at_s = self.next_row_s;
            let last =
                |channel: &Channel| channel.last.filter(|_| !channel.is_stale(at_s)).map(|last| last.reading);
            let values = self.channels.iter().map(last).collect();
            self.outbox.push(Entry::Row(Row { time_s: at_s - origin_s, values }));
            self.rows += 1;
            // From the count, so that no error adds up.
            self.next_row_s = origin_s + (((at_s - origin_s) / every_s).round() + 1.0) * every_s;
            self.rising_row(at_s);
        }
    }

    /// PO2 as it would be at the surface, for the watch on a loop that nothing feeds.
    fn rising_row(&mut self, at_s: f64) {
        let cells = (0..self.cells.len()).filter_map(|cell| self.po2_bar(cell, at_s));
        let Some(po2_bar) = median(cells) else { return };
        let surface = self.options.barometer;
        let depth = self.fresh(Role::Depth, at_s).map_or(0.0, |reading| reading.si.max(0.0));
        let here = gas::at_depth(surface, Length::from_m(depth), self.options.water);
        self.rising.row(at_s, po2_bar * surface.as_pa() / here.as_pa());
    }

    /// Looks at every alarm.
    fn see(&mut self, now_s: f64) {
        let conditions: Vec<Condition> =
            self.alarms.iter().map(|watched| self.condition(watched.kind(), now_s)).collect();
        let after_s = self.options.limits.cleared_after_s;
        for (watched, condition) in self.alarms.iter_mut().zip(conditions) {
            if let Some(change) = watched.see(now_s, condition, after_s) {
                self.outbox.push_urgent(Entry::Alarm(change));
            }
        }
    }

    fn condition(&self, kind: AlarmKind, now_s: f64) -> Condition {
        let limits = &self.options.limits;
        let cells = || (0..self.cells.len()).filter_map(|cell| self.po2_bar(cell, now_s));
        match kind {
            AlarmKind::Po2Low { limit_bar } => match cells().reduce(f64::min) {
                None => Condition::Between,
                Some(lowest) if lowest < limit_bar => Condition::Holds(lowest),
                Some(lowest) if lowest >= limit_bar + limits.po2_margin_bar => Condition::Over,
                Some(_) => Condition::Between,
            },
            AlarmKind::Po2High { limit_bar } => match cells().reduce(f64::max) {
                None => Condition::Between,
                Some(highest) if highest > limit_bar => Condition::Holds(highest),
                Some(highest) if highest <= limit_bar - limits.po2_margin_bar => Condition::Over,
                Some(_) => Condition::Between,
            },
            AlarmKind::TooDeep { limit_m } => match self.fresh(Role::Depth, now_s).map(|depth| depth.si) {
                None => Condition::Between,
                Some(depth_m) if depth_m > limit_m => Condition::Holds(depth_m),
                Some(depth_m) if depth_m <= limit_m - limits.depth_margin_m => Condition::Over,
                Some(_) => Condition::Between,
            },
            AlarmKind::NoPo2 => {
                let for_s = now_s - self.started_s.unwrap_or(now_s);
                let heard =
                    |cell: &Cell| self.channels.get(cell.instrument).is_some_and(|one| one.last.is_some());
                // A session that goes on has an origin before it has heard a cell.
                let waited = (self.origin_s.is_some() && self.cells.iter().any(heard))
                    || self.cells.iter().all(|cell| self.is_missing(cell.instrument, now_s));
                match cells().next() {
                    Some(_) => Condition::Over,
                    None if waited => Condition::Holds(for_s),
                    None => Condition::Between,
                }
            }
            AlarmKind::Missing { instrument } => {
                let heard = self.channels.get(instrument).is_some_and(|channel| channel.last.is_some());
                if heard {
                    Condition::Over
                } else if self.is_missing(instrument, now_s) {
                    Condition::Holds(now_s - self.started_s.unwrap_or(now_s))
                } else {
                    Condition::Between
                }
            }
            AlarmKind::Stale { instrument } => match self.channels.get(instrument) {
                Some(channel) => match channel.age_s(now_s) {
                    None => Condition::Between,
                    Some(age_s) if channel.is_stale(now_s) => Condition::Holds(age_s),
                    Some(_) => Condition::Over,
                },
                None => Condition::Between,
            },
            AlarmKind::Frozen { instrument } => {
                match self.channels.get(instrument).and_then(Channel::frozen_since_s) {
                    Some(since_s) => Condition::Holds(now_s - since_s),
                    None => Condition::Over,
                }
            }
            AlarmKind::Disagrees { instrument } => self.apart(instrument, now_s),
            AlarmKind::RisesUnfed => self.rising.condition(limits.rises_bar_min),
        }
    }

    /// Whether an instrument ought to have said something by now and never did.
    fn is_missing(&self, instrument: usize, now_s: f64) -> bool {
        let Some((channel, started_s)) = self.channels.get(instrument).zip(self.started_s) else {
            return false;
        };
        channel.last.is_none() && now_s - started_s > channel.stale_after_s
    }

    /// How far a cell is off: of three from the median, of two from the other.
    fn apart(&self, instrument: usize, now_s: f64) -> Condition {
        let Some(number) = self.cells.iter().position(|cell| cell.instrument == instrument) else {
            return Condition::Between;
        };
        let Some(own) = self.po2_bar(number, now_s) else { return Condition::Between };
        let all: Vec<f64> = (0..self.cells.len()).filter_map(|cell| self.po2_bar(cell, now_s)).collect();
        let off_bar = match all.as_slice() {
            [one, other] => (one - other).abs(),
            [_, _, _] => median(all.iter().copied()).map_or(0.0, |median| (own - median).abs()),
            _ => return Condition::Between,
        };
        let limits = &self.options.limits;
        if off_bar > limits.apart_bar {
            Condition::Holds(off_bar)
        } else if off_bar < limits.apart_cleared * limits.apart_bar {
            Condition::Over
        } else {
            Condition::Between
        }
    }
}

/// Every alarm that these instruments can give.
fn alarms(channels: &[Channel], limits: &AlarmLimits) -> Vec<Watched> {
    let (floor, ceiling) = limits.po2_bar;
    let mut kinds = vec![
        AlarmKind::Po2Low { limit_bar: floor },
        AlarmKind::Po2High { limit_bar: ceiling },
        AlarmKind::NoPo2,
        AlarmKind::RisesUnfed,
    ];
    for (instrument, channel) in channels.iter().enumerate() {
        kinds.extend([AlarmKind::Missing { instrument }, AlarmKind::Stale { instrument }]);
        match channel.role {
            Role::Cell => {
                kinds.extend([AlarmKind::Frozen { instrument }, AlarmKind::Disagrees { instrument }])
            }
            Role::Depth => kinds.push(AlarmKind::TooDeep { limit_m: limits.deepest_m }),
            _ => {}
        }
    }
    let after_s = |kind: &AlarmKind| match kind {
        AlarmKind::Disagrees { .. } => limits.apart_for_s,
        _ => 0.0,
    };
    kinds.into_iter().map(|kind| Watched::new(kind, after_s(&kind))).collect()
}

/// The middle one, or the mean of the two in the middle.
fn median(values: impl Iterator<Item = f64>) -> Option<f64> {
    let mut sorted: Vec<f64> = values.collect();
    sorted.sort_unstable_by(f64::total_cmp);
    let upper = *sorted.get(sorted.len() / 2)?;
    let lower = if sorted.len().is_multiple_of(2) { *sorted.get(sorted.len() / 2 - 1)? } else { upper };
    Some((lower + upper) / 2.0)
}
