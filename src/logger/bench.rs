//! A bench run while it is logged: what is heard becomes readings, a live sign and steady points.

use super::channel::{Channel, ChannelLive};
use super::ledger::{Block, By, Ledger, Stamped, Taken, Trouble, TroubleAt};
use super::outbox::Outbox;
use super::sign::{NotSteady, Refusal, Role, Steady};
use super::window::{Held, NOW_DURATIONS, Seen, Window};
use crate::entry::{Instrument, PointReading, Sweep};
use crate::instrument::{Heard, What};
use crate::series::SteadyOptions;

/// Looks in the least duration of a steady span.
const LOOKS: f64 = 10.0;
/// A level that is held for as long as this part of the least duration counts for the direction of the sweep. Its ends are
/// cut off by then, and in an imported series any level counts.
const LEVEL_DURATIONS: f64 = 1.0 / NOW_DURATIONS;

/// How points are taken.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BenchOptions {
    /// What counts as steady.
    pub steady: SteadyOptions,
    /// How far IP must move from the last point before the next one is taken by itself, in pascals. Default 0.1 bar, the
    /// smallest step that is set on purpose (common practice, no source).
    pub new_level_pa: f64,
    /// Whether points are taken by themselves.
    pub by_itself: bool,
    /// The second of the clock from which the times of points count; none for the first reading.
    pub began_s: Option<f64>,
    /// Points that the run has already.
    pub points_before: usize,
    /// Pressure in pascals and sweep of the last of them, if it has any.
    pub last: Option<(f64, Option<Sweep>)>,
}

impl Default for BenchOptions {
    fn default() -> Self {
        Self {
            steady: SteadyOptions::default(),
            new_level_pa: 10_000.0,
            by_itself: true,
            began_s: None,
            points_before: 0,
            last: None,
        }
    }
}

/// Why these instruments cannot log a run.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum SetupError {
    /// One that is needed is missing.
    #[error("a run needs an instrument that measures {0}: name one")]
    Missing(Role),
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
    /// One that a bench run has no use for.
    #[error("{id} measures {role}, which no run has a column for: leave it out")]
    NotForBench {
        /// The instrument.
        id: String,
        /// What it measures.
        role: Role,
    },
}

/// The run as a screen shows it.
#[derive(Debug, Clone, PartialEq)]
pub struct Live {
    /// When, in seconds of the clock.
    pub at_s: f64,
    /// The instruments, in the order they were given.
    pub channels: Vec<ChannelLive>,
    /// Steady, or why not.
    pub sign: Result<Steady, NotSteady>,
    /// For how many seconds it has been steady, and for how many it must.
    pub steady_s: (f64, f64),
    /// Whether the last point is at this level, so that no further one is taken by itself.
    pub taken_here: bool,
    /// Rate of the pressure over the last half of the least duration, in Pa/s.
    pub pressure_rate_pa_s: Option<f64>,
    /// Rate of the flow shown over the same time, in L/min a second.
    pub flow_rate_l_min_s: Option<f64>,
    /// Direction in which the pressure was stepped last.
    pub sweep: Option<Sweep>,
    /// Points of the run, those before it was resumed with them.
    pub points: usize,
}

/// Something to be handed to the ledger.
#[derive(Debug, Clone)]
enum Entry {
    Block(Block),
    Point(Taken),
    Fault(TroubleAt),
}

/// Logs a bench run.
///
/// Hand it what is heard ([`Self::hear`]), let time pass when nothing is ([`Self::tick`]), and hand over what is due
/// ([`Self::hand_over`]) a few times a second.
#[derive(Debug, Clone)]
pub struct BenchLogger {
    options: BenchOptions,
    channels: Vec<Channel>,
    window: Window,
    next_look_s: f64,
    seen: Option<Seen>,
    origin_s: Option<f64>,
    points: Vec<Taken>,
    /// Since when the pressure has left the level of the last point; none while it is there.
    left_s: Option<f64>,
    /// Last second of the readings that went into a point.
    used_to_s: f64,
    /// The level held last, Pa, and the direction in which it was reached.
    level_pa: Option<f64>,
    sweep: Option<Sweep>,
    /// Readings not yet in a block, for each instrument.
    open: Vec<Vec<Stamped>>,
    outbox: Outbox<Entry>,
}

impl BenchLogger {
    /// A logger of these instruments, in the order in which [`Heard::instrument`] counts them: one for flow and one for
    /// pressure, at most one for temperature and for the barometer.
    ///
    /// # Errors
    /// One that is missing, two for one thing, one that a run has no use for.
    pub fn new(instruments: &[Instrument], options: BenchOptions) -> Result<Self, SetupError> {
        let mut channels: Vec<Channel> = Vec::with_capacity(instruments.len());
        for (number, instrument) in instruments.iter().enumerate() {
            let (role, id) = (Role::of(instrument.measures), || instrument.id.as_str().to_owned());
            if matches!(role, Role::Cell | Role::Depth) {
                return Err(SetupError::NotForBench { id: id(), role });
            }
            let before = instruments.iter().take(number).find(|other| other.measures == instrument.measures);
            if let Some(before) = before {
                return Err(SetupError::Twice { role, first: before.id.as_str().to_owned(), second: id() });
            }
            channels.push(Channel::new(instrument, role));
        }
        for role in [Role::Pressure, Role::Flow] {
            if !channels.iter().any(|channel| channel.role == role) {
                return Err(SetupError::Missing(role));
            }
        }
        Ok(Self {
            options,
            open: vec![Vec::new(); channels.len()],
            channels,
            window: Window::new(options.steady),
            next_look_s: f64::NEG_INFINITY,
            seen: None,
            origin_s: options.began_s,
            points: Vec::new(),
            left_s: if options.last.is_some() { None } else { Some(f64::NEG_INFINITY) },
            used_to_s: f64::NEG_INFINITY,
            level_pa: options.last.map(|(pressure_pa, _)| pressure_pa),
            sweep: options.last.and_then(|(_, sweep)| sweep),
            outbox: Outbox::new(),
        })
    }

    /// Takes what was heard; goes out: the point that was taken by itself because of it. What is heard of a number that no
    /// instrument has is none of ours.
    pub fn hear(&mut self, heard: &Heard) -> Option<Taken> {
        let channel = self.channels.get_mut(heard.instrument)?;
        let role = channel.role;
        let troubles = channel.heard(heard);
        let at_s = heard.at_s;
        let ran_back = troubles.iter().any(|trouble| matches!(trouble, Trouble::TimeRanBack { .. }));
        self.record(heard.instrument, at_s, troubles);
        let What::Reading(reading) = &heard.what else { return None };
        if ran_back {
            self.begin_anew(at_s);
        }
        self.origin_s.get_or_insert(at_s);
        if let Some(open) = self.open.get_mut(heard.instrument) {
            open.push(Stamped { at_s, reading: *reading });
        }
        let value = if role == Role::Flow { reading.indicated_flow().as_l_min() } else { reading.si };
        let interval_s = self.slower_s();
        self.window.push(role, at_s, value, interval_s);
        if at_s < self.next_look_s || !matches!(role, Role::Flow | Role::Pressure) {
            return None;
        }
        self.next_look_s = at_s + self.options.steady.least_duration_s / LOOKS;
        self.look(at_s);
        let held = self.held(at_s).ok()?;
        if !self.options.by_itself || !self.is_new(&held) {
            return None;
        }
        Some(self.take(&held, By::Itself))
    }

    /// Another logger has taken a point: this one only shows the run.
    pub fn was_taken(&mut self, pressure_pa: f64, sweep: Option<Sweep>) {
        self.options.last = Some((pressure_pa, sweep));
        self.options.points_before += 1;
        self.left_s = None;
        self.level_pa = Some(pressure_pa);
        self.sweep = sweep.or(self.sweep);
    }

    /// Whether points are taken by themselves.
    #[must_use]
    pub const fn takes_by_itself(&self) -> bool {
        self.options.by_itself
    }

    /// Takes points by itself from now on, or at a wish only.
    pub const fn take_by_itself(&mut self, by_itself: bool) {
        self.options.by_itself = by_itself;
    }

    /// Whether a span is of another level than the last point, or of the same one reached again. Just after a step the end
    /// of the old level still counts as steady, and is neither.
    fn is_new(&self, held: &Held) -> bool {
        let from_s = held.steady.from_s;
        let again = self.left_s.is_some_and(|left_s| from_s > left_s);
        from_s > self.used_to_s && (again || self.is_away(held.steady.pressure.mean))
    }

    /// Whether a pressure is not that of the last point.
    fn is_away(&self, pressure_pa: f64) -> bool {
        let here = self.points.last().map(|last| last.reading.pressure.shown_pa());
        let last_pa = here.or(self.options.last.map(|(last_pa, _)| last_pa));
        last_pa.is_none_or(|last_pa| (pressure_pa - last_pa).abs() > self.options.new_level_pa)
    }

    /// Time passed: says what has become stale.
    pub fn tick(&mut self, now_s: f64) {
        for instrument in 0..self.channels.len() {
            let stale = self.channels.get_mut(instrument).is_some_and(|channel| channel.becomes_stale(now_s));
            if stale {
                self.record(instrument, now_s, vec![Trouble::Stale]);
            }
        }
    }

    /// Takes a point now, at the mean of all that is steady up to now and is in no point yet.
    ///
    /// # Errors
    /// When it is not steady, not for long enough, or with an instrument that is stale or frozen; when too few of the
    /// readings are new since the last point.
    pub fn take_now(&mut self, now_s: f64) -> Result<Taken, Refusal> {
        self.look(now_s);
        let held = self.held(now_s)?;
        if held.steady.from_s > self.used_to_s {
            return Ok(self.take(&held, By::Hand));
        }
        let least_s = self.options.steady.least_duration_s;
        let rest = self.window.look(self.used_to_s).sign;
        let held = rest.map_err(|_| {
            let wait_s = (self.used_to_s + least_s - held.steady.to_s).max(1.0);
            Refusal::SameReadings { wait_s, least_s }
        })?;
        Ok(self.take(&held, By::Hand))
    }

    /// The run as it stands at a second of the clock.
    #[must_use]
    pub fn live(&self, now_s: f64) -> Live {
        let sign = self.held(now_s).map(|held| held.steady);
        let least_s = self.options.steady.least_duration_s;
        let steady_s = match &sign {
            Ok(steady) => steady.to_s - steady.from_s,
            Err(NotSteady::TooShort { held_s, .. } | NotSteady::FlowSettles { held_s, .. }) => *held_s,
            Err(_) => 0.0,
        };
        let (pressure_rate_pa_s, flow_rate_l_min_s) = self.window.rates();
        let channels = self.channels.iter().enumerate().map(|(number, one)| one.live(number, now_s));
        Live {
            at_s: now_s,
            channels: channels.collect(),
            sign,
            steady_s: (steady_s, least_s),
            taken_here: self.left_s.is_none(),
            pressure_rate_pa_s,
            flow_rate_l_min_s,
            sweep: self.sweep,
            points: self.options.points_before + self.points.len(),
        }
    }

    /// The points taken so far. Those before the first step have its direction as soon as it is known, as in a series that
    /// is imported; the ledger had them without.
    #[must_use]
    pub fn points(&self) -> &[Taken] {
        &self.points
    }

    /// Hands over what is due: raw readings and faults at least every half second, a point at once with all readings
    /// before it, and a heartbeat.
    ///
    /// # Errors
    /// The ledger's own; what it refused is handed over again the next time, before anything else.
    pub fn hand_over<L: Ledger>(&mut self, now_s: f64, ledger: &mut L) -> Result<(), L::Error> {
        if self.outbox.is_due(now_s) { self.hand_over_all(now_s, ledger) } else { Ok(()) }
    }

    /// Hands over everything, due or not, as at the end.
    ///
    /// # Errors
    /// As [`Self::hand_over`].
    pub fn hand_over_all<L: Ledger>(&mut self, now_s: f64, ledger: &mut L) -> Result<(), L::Error> {
        self.seal();
        self.outbox.drain(now_s, |entry| match entry {
            Entry::Block(block) => ledger.readings(block),
            Entry::Point(point) => ledger.point(point),
            Entry::Fault(trouble) => ledger.fault(trouble),
        })?;
        ledger.heartbeat(now_s)
    }

    /// What is open becomes blocks.
    fn seal(&mut self) {
        for (instrument, open) in self.open.iter_mut().enumerate() {
            if !open.is_empty() {
                let readings = std::mem::take(open);
                self.outbox.push(Entry::Block(Block { instrument, readings }));
            }
        }
    }

    fn record(&mut self, instrument: usize, at_s: f64, troubles: Vec<Trouble>) {
        for what in troubles {
            self.outbox.push(Entry::Fault(TroubleAt { instrument, at_s, what }));
        }
    }

    /// A clock that was set back: nothing before it can be compared with anything after it.
    fn begin_anew(&mut self, at_s: f64) {
        for channel in &mut self.channels {
            // The age of what was read by the clock before is not known.
            channel.last = channel.last.filter(|last| last.at_s <= at_s);
        }
        self.window = Window::new(self.options.steady);
        self.seen = None;
        self.next_look_s = f64::NEG_INFINITY;
        self.used_to_s = f64::NEG_INFINITY;
        // The old clock's second of a step says nothing by the new one.
        self.left_s = self.left_s.map(|_| f64::NEG_INFINITY);
    }

    /// Seconds between readings of the slower of flow and pressure.
    fn slower_s(&self) -> f64 {
        let carry = self.channels.iter().filter(|one| matches!(one.role, Role::Flow | Role::Pressure));
        carry.filter_map(Channel::interval_s).fold(0.0, f64::max)
    }

    /// Looks at the last minute.
    fn look(&mut self, now_s: f64) {
        let seen = self.window.look(f64::NEG_INFINITY);
        for instrument in 0..self.channels.len() {
            let mut troubles = Vec::new();
            if let Some(channel) = self.channels.get_mut(instrument) {
                let role = channel.role;
                // The window remembers a stretch for a while after it is over.
                let lasts = |since_s: f64| channel.repeats.since_s() <= since_s;
                let beside = seen.frozen.filter(|(frozen, since_s)| *frozen == role && lasts(*since_s));
                let beside = beside.map(|(_, since_s)| since_s);
                channel.frozen_beside_s = beside.or(channel.frozen_beside_s);
                channel.say_frozen(&mut troubles);
            }
            self.record(instrument, now_s, troubles);
        }
        let now_pa = self.window.pressure_now_pa();
        if let Some(now_pa) = now_pa
            && self.left_s.is_none()
            && self.is_away(now_pa)
        {
            // Some of the readings of which it is the mean were away.
            self.left_s = Some(now_s - self.options.steady.least_duration_s / NOW_DURATIONS);
        }
        // Where the pressure stood when the first words came is where the first level was reached from.
        self.level_pa = self.level_pa.or(now_pa);
        if let Some((level_pa, held_s)) = seen.level
            && held_s >= LEVEL_DURATIONS * self.options.steady.least_duration_s
        {
            self.reached(level_pa);
        }
        self.seen = Some(seen);
    }

    /// A level is held.
    fn reached(&mut self, level_pa: f64) {
        let step_pa = level_pa - self.level_pa.unwrap_or(level_pa);
        if step_pa.abs() <= self.options.new_level_pa {
            return;
        }
        let sweep = if step_pa > 0.0 { Sweep::Rising } else { Sweep::Falling };
        self.level_pa = Some(level_pa);
        if self.sweep.replace(sweep).is_none() {
            for point in &mut self.points {
                point.reading.sweep = Some(sweep);
            }
        }
    }

    /// What is steady at a second of the clock, by all that is known of the instruments.
    fn held(&self, now_s: f64) -> Result<Held, NotSteady> {
        for channel in &self.channels {
            let role = channel.role;
            let Some(age_s) = channel.age_s(now_s) else { return Err(NotSteady::NothingHeard { role }) };
            if channel.is_stale(now_s) {
                return Err(NotSteady::Stale { role, age_s });
            }
            if let Some(since_s) = channel.frozen_since_s() {
                return Err(NotSteady::Frozen { role, for_s: now_s - since_s });
            }
        }
        let least_s = self.options.steady.least_duration_s;
        let Some(seen) = &self.seen else { return Err(NotSteady::TooShort { held_s: 0.0, least_s }) };
        let held = seen.sign?;
        let pressure_pa = held.steady.pressure.mean;
        if pressure_pa <= self.options.new_level_pa {
            return Err(NotSteady::NoPressure { pressure_pa });
        }
        // The regulator was just turned: what was steady is over, though the window has not seen enough of it.
        let now_pa = self.channels.iter().find(|one| one.role == Role::Pressure).and_then(|one| one.last);
        if now_pa.is_some_and(|now| (now.reading.si - pressure_pa).abs() > self.options.new_level_pa) {
            let rate_pa_s = self.window.rates().0.unwrap_or(0.0);
            return Err(NotSteady::PressureMoves { rate_pa_s });
        }
        for channel in &self.channels {
            let readings = match channel.role {
                Role::Pressure => held.steady.pressure.readings,
                Role::Flow => held.steady.flow.readings,
                _ => continue,
            };
            if channel.repeats.all_alike_since(held.steady.from_s, readings) {
                let for_s = now_s - channel.repeats.since_s();
                return Err(NotSteady::Frozen { role: channel.role, for_s });
            }
        }
        Ok(held)
    }

    fn take(&mut self, held: &Held, by: By) -> Taken {
        let time_s = held.reading.time_s.map(|at_s| at_s - self.origin_s.unwrap_or(0.0));
        let taken = Taken {
            number: self.options.points_before + self.points.len() + 1,
            reading: PointReading { sweep: self.sweep, time_s, ..held.reading },
            from_s: held.steady.from_s,
            to_s: held.steady.to_s,
            by,
        };
        self.left_s = None;
        self.used_to_s = held.steady.to_s;
        self.seal();
        self.outbox.push_urgent(Entry::Point(taken));
        self.points.push(taken);
        taken
    }
}
