//! The rig put together: bench, instruments and lines on one clock.
//!
//! The bench goes on in steps of a fiftieth of a second, whoever asks and how often: with the same seed, settings,
//! commands and times of asking the same bytes come. A rig whose clock stands still for long catches up all at once.

use std::sync::Arc;

use super::RigError;
use super::bench::{Bench, BenchSettings, Truth};
use super::command::Command;
use super::fault::{Fault, Planned};
use super::gauge::{AtWork, Gauge, OffBy, Reading};
use super::lines::Speaks;
use super::log::{Delivery, Log, Message, Sent};
use super::modbus::ModbusDevice;
use super::port::{Port, PortSettings, Speaker, Wiring};
use super::time::Settable;
use crate::entry::Id;
use crate::quantity::unit;
use crate::stats::monte_carlo::Random;

/// One step of the bench, seconds: shorter than any instrument's time constant, and no line comes oftener.
pub const TICK_S: f64 = 0.02;
/// Streams of the generator from here on belong to the instruments, and to the devices.
const FIRST_GAUGE_STREAM: u64 = 100;
const FIRST_DEVICE_STREAM: u64 = 10_000;

/// A rig to be put together.
#[derive(Debug, Clone, PartialEq)]
pub struct Settings {
    /// Seed of everything that is drawn.
    pub seed: u64,
    /// What is true.
    pub bench: BenchSettings,
    /// What looks at it.
    pub gauges: Vec<Gauge>,
    /// Where that is plugged in.
    pub ports: Vec<PortSettings>,
    /// What goes wrong, each with an instrument of the device that it befalls.
    pub faults: Vec<(Id, Planned)>,
}

/// A rig.
pub struct Rig {
    bench: Bench,
    pub(super) gauges: Vec<AtWork>,
    pub(super) ports: Vec<Port>,
    /// Where each port is found just now, and whether somebody holds it.
    pub(super) found_at: Vec<Option<String>>,
    pub(super) held: Vec<bool>,
    /// The clock's time at the beginning.
    origin_s: Option<f64>,
    /// Seconds since then, and steps made.
    t_s: f64,
    ticks: u64,
    settable: Option<Arc<dyn Settable>>,
    log: Log,
}

impl std::fmt::Debug for Rig {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Rig").field("truth", self.bench.truth()).finish_non_exhaustive()
    }
}

impl Rig {
    /// Puts a rig together. Its time begins when it is first asked for something.
    ///
    /// # Errors
    /// Names used twice; an instrument on no line or on two; a device without instruments; a bus whose addresses or
    /// registers collide; a rate that is not above zero; a fault that the device cannot have.
    pub fn new(settings: Settings) -> Result<Self, RigError> {
        let Settings { seed, bench, gauges, ports, faults } = settings;
        names_once(&gauges, &ports)?;
        let bench = Bench::new(bench, seed);
        let streams = FIRST_GAUGE_STREAM..;
        let at_work: Vec<AtWork> = gauges
            .into_iter()
            .zip(streams)
            .map(|(gauge, stream)| AtWork::new(gauge, bench.truth(), bench.gas(), Random::new(seed, stream)))
            .collect();
        let mut streams = FIRST_DEVICE_STREAM..;
        let mut draw = || Random::new(seed, streams.next().unwrap_or_default());
        let ports: Vec<Port> =
            ports.into_iter().map(|port| wired(port, &at_work, &mut draw)).collect::<Result<_, _>>()?;
        for (number, one) in at_work.iter().enumerate() {
            let on = ports.iter().flat_map(|port| &port.speakers);
            let lines = on.filter(|speaker| speaker.gauges.contains(&number)).count();
            if lines != 1 {
                return Err(RigError::Lines(one.gauge.id.clone(), lines));
            }
        }
        let mut rig = Self {
            bench,
            gauges: at_work,
            found_at: vec![None; ports.len()],
            held: vec![false; ports.len()],
            ports,
            origin_s: None,
            t_s: 0.0,
            ticks: 0,
            settable: None,
            log: Log::default(),
        };
        for (id, planned) in faults {
            rig.plan(id.as_str(), planned)?;
        }
        Ok(rig)
    }

    /// Lets [`Fault::ClockJump`] set this clock: that of whoever reads, not the rig's own.
    pub fn may_set(&mut self, clock: Arc<dyn Settable>) {
        self.settable = Some(clock);
    }

    /// Goes on to `now_s` of the clock: the bench, the instruments, the lines that come by themselves. A time before the
    /// last one changes nothing.
    pub fn advance(&mut self, now_s: f64) {
        let t_s = now_s - *self.origin_s.get_or_insert(now_s);
        // Plugs and clocks that were planned for the very beginning.
        if self.ticks == 0 {
            self.plugs_and_clocks(0.0);
        }
        while (self.ticks + 1) as f64 * TICK_S <= t_s + 1e-9 {
            self.ticks += 1;
            // From the count, so that no error adds up.
            let tick_s = self.ticks as f64 * TICK_S;
            self.bench.step(tick_s, TICK_S);
            let (truth, gas) = (*self.bench.truth(), self.bench.gas());
            for gauge in &mut self.gauges {
                gauge.step(&truth, gas, TICK_S);
            }
            self.plugs_and_clocks(tick_s);
            for port in &mut self.ports {
                port.speak(tick_s, &self.gauges);
                port.fall_due(tick_s);
            }
        }
        self.t_s = self.t_s.max(t_s);
        for port in 0..self.ports.len() {
            if let Some(at) = self.ports.get_mut(port) {
                at.fall_due(t_s);
            }
            if !self.held.get(port).copied().unwrap_or_default() {
                for message in self.fetch(port) {
                    self.sent(port, message, Delivery::Lost);
                }
            }
        }
    }

    /// Bytes in, messages out: a port at `now_s` of the clock. Whoever carries them says with [`Self::sent`] what became
    /// of each. Nothing for a port that there is not.
    pub fn exchange(&mut self, port: usize, now_s: f64, input: &[u8]) -> Vec<Message> {
        self.advance(now_s);
        if let Some(at) = self.ports.get_mut(port) {
            at.hear(self.t_s, input, &self.gauges);
            at.fall_due(self.t_s);
        }
        self.fetch(port)
    }

    fn fetch(&mut self, port: usize) -> Vec<Message> {
        let origin_s = self.origin_s.unwrap_or_default();
        let Some(at) = self.ports.get_mut(port) else { return Vec::new() };
        let on_the_clock = |message: Message| Message { time_s: message.time_s + origin_s, ..message };
        at.out.drain(..).map(on_the_clock).collect()
    }

    /// Keeps in the log what became of a message.
    pub fn sent(&mut self, port: usize, message: Message, delivery: Delivery) {
        let Some(at) = self.ports.get(port) else { return };
        self.log.keep(Sent { port: at.settings.name.clone(), message, delivery });
    }

    fn plugs_and_clocks(&mut self, t_s: f64) {
        let time_s = t_s + self.origin_s.unwrap_or_default();
        for number in 0..self.ports.len() {
            let Some(port) = self.ports.get_mut(number) else { continue };
            let Some(device) = port.speakers.first().map(|speaker| speaker.label.clone()) else { continue };
            let mut events = Vec::new();
            if port.plug(t_s) {
                events.push(if port.plugged { Vec::new() } else { vec![Fault::Unplugged] });
                // Whoever held the line holds a dead one.
                if let Some(held) = self.held.get_mut(number) {
                    *held = false;
                }
            }
            for speaker in &mut port.speakers {
                for by_s in speaker.faults.take_jumps(t_s) {
                    if let Some(clock) = &self.settable {
                        clock.jump(by_s);
                    }
                    events.push(vec![Fault::ClockJump(by_s)]);
                }
            }
            for faults in events {
                let device = device.clone();
                let message = Message { time_s, device, bytes: Vec::new(), meant: Vec::new(), faults };
                self.sent(number, message, Delivery::Whole);
            }
        }
    }

    /// Does what is commanded, now.
    ///
    /// # Errors
    /// An instrument that there is not, a fault that its device cannot have.
    pub fn command(&mut self, command: Command) -> Result<(), RigError> {
        match command {
            Command::Ip(ip) => self.bench.set_ip(ip),
            Command::Feed(feed) => self.bench.set_feed(feed),
            Command::Uptake(uptake) => self.bench.set_uptake(uptake),
            Command::Depth(depth) => self.bench.set_depth(depth),
            Command::AddOxygen(volume) => self.bench.add_oxygen(volume),
            Command::AddDiluent(volume) => self.bench.add_diluent(volume),
            Command::Fault { device, fault, lasts, in_s } => {
                let from_s = self.t_s + in_s;
                self.plan(&device, Planned { from_s, lasts, fault })?;
            }
            Command::Clear(Some(device)) => {
                let t_s = self.t_s;
                let (port, speaker) = self.device(&device)?;
                if let Some(speaker) =
                    self.ports.get_mut(port).and_then(|port| port.speakers.get_mut(speaker))
                {
                    speaker.faults.clear(t_s);
                }
            }
            Command::Clear(None) => {
                for speaker in self.ports.iter_mut().flat_map(|port| &mut port.speakers) {
                    speaker.faults.clear_all();
                }
            }
        }
        Ok(())
    }

    /// Plans a fault of the device that an instrument belongs to; its time counts from the rig's beginning.
    ///
    /// # Errors
    /// [`RigError::NoInstrument`], [`RigError::NotItsFault`].
    pub fn plan(&mut self, instrument: &str, planned: Planned) -> Result<(), RigError> {
        let (port, number) = self.device(instrument)?;
        let Some(port) = self.ports.get_mut(port) else { return Ok(()) };
        let Some(speaker) = port.speakers.get_mut(number) else { return Ok(()) };
        let why = match &planned.fault {
            Fault::BadCrc if matches!(port.settings.wiring, Wiring::Lines(_)) => {
                Some("its lines have no check sum")
            }
            Fault::WrongUnit(symbol) => {
                let mut kinds = speaker.gauges.iter().filter_map(|g| self.gauges.get(*g)).map(|g| &g.gauge);
                let any = kinds.any(|gauge| unit::lookup(gauge.kind(), symbol).is_ok());
                if any { None } else { Some("that is no unit of what it measures") }
            }
            _ => None,
        };
        if let Some(why) = why {
            let (device, fault) = (speaker.label.clone(), planned.fault);
            return Err(RigError::NotItsFault { device, fault, why });
        }
        speaker.faults.add(planned);
        Ok(())
    }

    /// Port and device that an instrument belongs to.
    fn device(&self, instrument: &str) -> Result<(usize, usize), RigError> {
        let lower = instrument.to_lowercase();
        let gauge = self.gauges.iter().position(|g| g.gauge.id.as_str().to_lowercase() == lower);
        let place = gauge.and_then(|gauge| {
            self.ports.iter().enumerate().find_map(|(number, port)| {
                let speaker = port.speakers.iter().position(|s| s.gauges.contains(&gauge))?;
                Some((number, speaker))
            })
        });
        place.ok_or_else(|| {
            let has: Vec<&str> = self.gauges.iter().map(|g| g.gauge.id.as_str()).collect();
            RigError::NoInstrument { asked: instrument.to_owned(), has: has.join(", ") }
        })
    }

    /// What is true now.
    #[must_use]
    pub fn truth(&self) -> &Truth {
        self.bench.truth()
    }

    /// What an instrument shows now; none for one that there is not.
    #[must_use]
    pub fn reading(&self, instrument: &Id) -> Option<Reading> {
        self.gauge(instrument).map(|at_work| at_work.reading)
    }

    /// What an instrument is off by; none for one that there is not.
    #[must_use]
    pub fn off_by(&self, instrument: &Id) -> Option<OffBy> {
        self.gauge(instrument).map(|at_work| at_work.off_by)
    }

    fn gauge(&self, instrument: &Id) -> Option<&AtWork> {
        self.gauges.iter().find(|at_work| at_work.gauge.id.same_as(instrument))
    }

    /// The port that an instrument is plugged into.
    ///
    /// # Errors
    /// [`RigError::NoInstrument`].
    pub fn port_of(&self, instrument: &Id) -> Result<usize, RigError> {
        self.device(instrument.as_str()).map(|(port, _)| port)
    }

    /// How many ports there are.
    #[must_use]
    pub fn ports(&self) -> usize {
        self.ports.len()
    }

    /// The name of a port in the settings.
    #[must_use]
    pub fn port_name(&self, port: usize) -> Option<&str> {
        self.ports.get(port).map(|port| port.settings.name.as_str())
    }

    /// Whether a port is plugged in, and how often its plug has gone in or out: a line that was opened before the last
    /// time is dead.
    #[must_use]
    pub fn plug(&self, port: usize) -> (bool, u64) {
        self.ports.get(port).map_or((false, 0), |port| (port.plugged, port.plugs))
    }

    /// What was sent.
    #[must_use]
    pub fn log(&self) -> &Log {
        &self.log
    }

    /// The log, to have it written to a file.
    pub fn log_mut(&mut self) -> &mut Log {
        &mut self.log
    }
}

fn names_once(gauges: &[Gauge], ports: &[PortSettings]) -> Result<(), RigError> {
    for (number, gauge) in gauges.iter().enumerate() {
        if gauges.iter().take(number).any(|other| other.id.same_as(&gauge.id)) {
            return Err(RigError::Twice(gauge.id.as_str().to_owned()));
        }
    }
    for (number, port) in ports.iter().enumerate() {
        if ports.iter().take(number).any(|other| other.name == port.name) {
            return Err(RigError::Twice(port.name.clone()));
        }
    }
    Ok(())
}

/// A port with its devices bound to the instruments.
fn wired(
    settings: PortSettings,
    gauges: &[AtWork],
    draw: &mut impl FnMut() -> Random,
) -> Result<Port, RigError> {
    let place = |id: &Id| {
        gauges.iter().position(|at_work| at_work.gauge.id.same_as(id)).ok_or_else(|| {
            let has: Vec<&str> = gauges.iter().map(|g| g.gauge.id.as_str()).collect();
            RigError::NoInstrument { asked: id.as_str().to_owned(), has: has.join(", ") }
        })
    };
    let mut speaker = |ids: Vec<&Id>| {
        let Some(label) = ids.first().copied().cloned() else {
            return Err(RigError::Nothing(settings.name.clone()));
        };
        let places = ids.into_iter().map(place).collect::<Result<Vec<usize>, _>>()?;
        Ok(Speaker::new(label, places, draw()))
    };
    let speakers = match &settings.wiring {
        Wiring::Lines(device) => {
            let every_s = match &device.speaks {
                Speaks::ByItself { every_s } | Speaks::WhenAsked { every_s, .. } => *every_s,
            };
            if every_s.is_nan() || every_s <= 0.0 {
                return Err(RigError::Rate(settings.name, every_s));
            }
            let silent = matches!(&device.speaks, Speaks::WhenAsked { ask, .. } if ask.is_empty());
            if silent || device.ends.is_empty() {
                return Err(RigError::Nothing(settings.name));
            }
            vec![speaker(device.fields.iter().map(|field| &field.gauge).collect())?]
        }
        Wiring::Bus { devices, .. } => {
            if devices.is_empty() {
                return Err(RigError::Nothing(settings.name));
            }
            collide(&settings.name, devices)?;
            let of = |device: &ModbusDevice| speaker(device.values.iter().map(|v| &v.gauge).collect());
            devices.iter().map(of).collect::<Result<_, _>>()?
        }
    };
    Ok(Port::new(settings, speakers))
}

/// Refuses addresses and registers that collide.
fn collide(port: &str, devices: &[ModbusDevice]) -> Result<(), RigError> {
    for (number, device) in devices.iter().enumerate() {
        let address = device.address;
        let taken = devices.iter().take(number).any(|other| other.address == address);
        if taken || !(1..=247).contains(&address) {
            return Err(RigError::Address { port: port.to_owned(), address });
        }
        for (number, value) in device.values.iter().enumerate() {
            let register = value.register;
            let last = register.checked_add(value.takes() - 1);
            let apart = |other: &super::modbus::ModbusValue| {
                last.is_some_and(|last| !(register..=last).any(|register| other.holds(value.table, register)))
            };
            if last.is_none() || !device.values.iter().take(number).all(apart) {
                return Err(RigError::Register { port: port.to_owned(), address, register });
            }
        }
    }
    Ok(())
}
