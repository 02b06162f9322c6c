//! The instruments of the rig: what each shows of what is true.
//!
//! An instrument follows with a lag, converts to its own unit (a flow meter to its own reference conditions), is off by a
//! gain and a zero drawn once within its papers, scatters, and shows so many digits. It makes a new reading at its own
//! rate whether or not somebody asks, so that asking changes nothing. Left out: range, drift, and float meters.

use super::RigError;
use super::bench::Truth;
use crate::entry::{Amount, Id, InstrumentPapers, Measures, Meter, MeterKind, Transducer};
use crate::gas::{Species, saturation_pressure};
use crate::quantity::unit::{self, Unit};
use crate::quantity::{IndicatedFlow, Kind, Quantity, STANDARD_ATMOSPHERE_PA, ZERO_CELSIUS_K};
use crate::stats::monte_carlo::Random;

/// What an instrument looks at.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Source {
    /// The flow through the orifice.
    Flow,
    /// IP over the barometer.
    Ip,
    /// The gas at the orifice.
    GasTemperature,
    /// The room.
    Barometer,
    /// PO2 of the loop.
    Cell,
    /// Depth of the loop.
    Depth,
}

impl Source {
    /// What such an instrument measures, in the register's words.
    #[must_use]
    pub const fn measures(self) -> Measures {
        match self {
            Self::Flow => Measures::Flow,
            Self::Ip => Measures::Pressure,
            Self::GasTemperature => Measures::Temperature,
            Self::Barometer => Measures::Barometer,
            Self::Cell => Measures::Cell,
            Self::Depth => Measures::Depth,
        }
    }
}

/// What an instrument may be off by: standard uncertainties in SI units, and its last digit.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Allowed {
    /// Of its gain, relative.
    pub gain: f64,
    /// Of its zero.
    pub zero: f64,
    /// Scatter of a reading, the same everywhere.
    pub noise: f64,
    /// Scatter of a reading, a share of it.
    pub noise_of_reading: f64,
    /// Step of the last digit; nought for six decimals of its unit.
    pub resolution: f64,
    /// How many standard uncertainties gain and zero are drawn within.
    pub within: f64,
}

/// What an instrument is off by: it shows `reading · (1 + gain) + zero`, the zero in SI units.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct OffBy {
    /// Relative.
    pub gain: f64,
    /// In SI units.
    pub zero: f64,
}

/// An instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct Gauge {
    /// Its name.
    pub id: Id,
    /// What it looks at.
    pub source: Source,
    /// The unit of its numbers.
    pub unit: Unit,
    /// Time constant, seconds.
    pub lag_s: f64,
    /// How often it makes a reading, seconds.
    pub every_s: f64,
    /// For a cell that gives a voltage: how much.
    pub mv_per_bar: Option<f64>,
    /// Its papers.
    pub papers: Option<InstrumentPapers>,
    /// What it may be off by.
    pub allowed: Allowed,
    /// What it is off by, where that is not to be drawn.
    pub off_by: Option<OffBy>,
}

impl Gauge {
    /// A flow meter by its papers, in L/min of its own reference conditions.
    ///
    /// # Errors
    /// [`RigError::FloatMeter`] for a float meter, which has nothing to plug in.
    pub fn flow(id: Id, meter: Meter) -> Result<Self, RigError> {
        if matches!(meter.kind, MeterKind::Float { .. }) {
            return Err(RigError::FloatMeter(id));
        }
        let (papers, k) = (&meter.papers, meter.papers.coverage);
        let (noise, noise_of_reading) = noise(papers.noise.as_ref(), k);
        let si = |flow: Option<IndicatedFlow>| flow.map_or(0.0, IndicatedFlow::as_m3_s);
        let allowed = Allowed {
            gain: papers.gain.unwrap_or(0.0) / k,
            zero: si(papers.zero) / k,
            noise,
            noise_of_reading,
            resolution: si(papers.resolution),
            within: k,
        };
        let papers = Some(InstrumentPapers::Meter(Meter { id: Some(id.clone()), ..meter }));
        Ok(Self { papers, lag_s: 0.5, ..Self::bare(id, Source::Flow, Kind::Flow, allowed) })
    }

    /// A transducer by its papers, in bar gauge.
    #[must_use]
    pub fn pressure(id: Id, transducer: Transducer) -> Self {
        Self { lag_s: 0.05, ..Self::by_papers(id, Source::Ip, transducer) }
    }

    /// A barometer by its papers, in hPa.
    #[must_use]
    pub fn barometer(id: Id, transducer: Transducer) -> Self {
        let hpa = Kind::Pressure.units().find(|unit| unit.symbol == "hPa");
        let bare = Self { lag_s: 1.0, every_s: 1.0, ..Self::by_papers(id, Source::Barometer, transducer) };
        Self { unit: hpa.unwrap_or(bare.unit), ..bare }
    }

    /// A thermometer in °C, off by up to 0.5 K.
    #[must_use]
    pub fn temperature(id: Id) -> Self {
        let allowed = Allowed { zero: 0.25, noise: 0.02, resolution: 0.1, within: 2.0, ..Allowed::default() };
        let bare = Self::bare(id, Source::GasTemperature, Kind::Temperature, allowed);
        Self { lag_s: 5.0, every_s: 0.5, ..bare }
    }

    /// An oxygen cell, off by up to 2 %: in bar, or in mV when `mv_per_bar` is given.
    #[must_use]
    pub fn cell(id: Id, mv_per_bar: Option<f64>) -> Self {
        // Pascals or volts.
        let (kind, bar, resolution) = match mv_per_bar {
            Some(mv) => (Kind::Voltage, mv / 1e3, 1e-4),
            None => (Kind::Pressure, 1e5, 1e2),
        };
        let allowed =
            Allowed { gain: 0.01, noise: 0.001 * bar, resolution, within: 2.0, ..Allowed::default() };
        let bare = Self::bare(id, Source::Cell, kind, allowed);
        Self { lag_s: 6.0, every_s: 0.5, mv_per_bar, ..bare }
    }

    /// A depth gauge in m, off by up to 0.1 m.
    #[must_use]
    pub fn depth(id: Id) -> Self {
        let allowed = Allowed { zero: 0.05, noise: 0.01, resolution: 0.1, within: 2.0, ..Allowed::default() };
        Self { lag_s: 1.0, every_s: 0.5, ..Self::bare(id, Source::Depth, Kind::Length, allowed) }
    }

    /// The same instrument with its numbers in another unit.
    ///
    /// # Errors
    /// [`RigError::Unit`] when it is none of what it measures.
    pub fn in_unit(self, symbol: &str) -> Result<Self, RigError> {
        Ok(Self { unit: unit::lookup(self.kind(), symbol)?, ..self })
    }

    /// The kind of its numbers.
    #[must_use]
    pub const fn kind(&self) -> Kind {
        match self.source {
            Source::Flow => Kind::Flow,
            Source::Ip | Source::Barometer => Kind::Pressure,
            Source::GasTemperature => Kind::Temperature,
            Source::Cell if self.mv_per_bar.is_some() => Kind::Voltage,
            Source::Cell => Kind::Pressure,
            Source::Depth => Kind::Length,
        }
    }

    fn by_papers(id: Id, source: Source, transducer: Transducer) -> Self {
        let (papers, k) = (&transducer.papers, transducer.papers.coverage);
        let (noise, noise_of_reading) = noise(papers.noise.as_ref(), k);
        let allowed = Allowed {
            gain: papers.gain.unwrap_or(0.0) / k,
            zero: papers.zero.map_or(0.0, Quantity::si) / k,
            noise,
            noise_of_reading,
            resolution: papers.resolution.map_or(0.0, Quantity::si),
            within: k,
        };
        let papers = InstrumentPapers::Transducer(Transducer { id: Some(id.clone()), ..transducer });
        Self { papers: Some(papers), ..Self::bare(id, source, Kind::Pressure, allowed) }
    }

    fn bare(id: Id, source: Source, kind: Kind, allowed: Allowed) -> Self {
        Self {
            id,
            source,
            unit: kind.default_unit(),
            lag_s: 0.0,
            every_s: 0.1,
            mv_per_bar: None,
            papers: None,
            allowed,
            off_by: None,
        }
    }

    /// What a prompt and perfect instrument of this kind would show, SI.
    fn perfect(&self, truth: &Truth, gas: Species) -> f64 {
        match self.source {
            Source::Flow => self.perfect_flow(truth, gas).si(),
            Source::Ip => truth.ip.as_pa(),
            Source::GasTemperature => truth.temperature.as_k(),
            Source::Barometer => truth.barometer.as_pa(),
            Source::Cell => self.mv_per_bar.map_or(truth.po2_bar * 1e5, |mv| truth.po2_bar * mv / 1e3),
            Source::Depth => truth.depth.as_m(),
        }
    }

    fn perfect_flow(&self, truth: &Truth, gas: Species) -> IndicatedFlow {
        let stpd = truth.flow.as_l_min();
        let actual = |vapour_pa: f64| {
            let dry_pa = truth.barometer.as_pa() - vapour_pa;
            stpd * (STANDARD_ATMOSPHERE_PA / dry_pa) * (truth.temperature.as_k() / ZERO_CELSIUS_K)
        };
        let Some(InstrumentPapers::Meter(meter)) = &self.papers else {
            return IndicatedFlow::from_l_min(stpd);
        };
        IndicatedFlow::from_l_min(match &meter.kind {
            MeterKind::Mass { reads_at, made_for, gas_factor } => {
                let factor = gas_factor.filter(|_| *made_for != gas).map_or(1.0, |factor| factor.value);
                stpd / reads_at.stpd_factor() / factor
            }
            MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => {
                actual(if *wet { saturation_pressure(truth.temperature).as_pa() } else { 0.0 })
            }
            // `flow` refuses one; papers put in its place by hand are read as actual litres.
            MeterKind::Float { .. } => actual(0.0),
        })
    }
}

/// Scatter of a reading: fixed, in SI units, and as a share.
fn noise<D: Quantity>(papers: Option<&Amount<D>>, coverage: f64) -> (f64, f64) {
    match papers {
        Some(Amount::Fixed(fixed)) => (fixed.si() / coverage, 0.0),
        Some(Amount::OfReading(share)) => (0.0, share / coverage),
        None => (0.0, 0.0),
    }
}

/// What an instrument shows.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reading {
    /// The number, with no more digits than are shown.
    pub value: f64,
    /// Its unit.
    pub unit: Unit,
    /// Digits shown after the point.
    pub decimals: usize,
    /// What a prompt and perfect instrument would show, in the same unit.
    pub truth: f64,
    kind: Kind,
    resolution_si: f64,
}

impl Reading {
    fn of(si: f64, truth_si: f64, unit: Unit, kind: Kind, resolution_si: f64) -> Self {
        let per_si = per_si(unit);
        let step = resolution_si * per_si;
        let (step, decimals) = if step > 0.0 {
            // A hundredth of a digit of room: 0.1 over two factors is not quite 0.1 any more.
            (step, libm::ceil(-libm::log10(step) - 0.01).clamp(0.0, 9.0) as usize)
        } else {
            (0.0, 6)
        };
        let exact = unit.from_si(si);
        let stepped = if step > 0.0 { (exact / step).round() * step } else { exact };
        let value = format!("{stepped:.decimals$}").parse().unwrap_or(stepped);
        // Minus nought is shown as nought.
        let value = if value == 0.0 { 0.0 } else { value };
        Self { value, unit, decimals, truth: unit.from_si(truth_si), kind, resolution_si }
    }

    /// The text of the number.
    #[must_use]
    pub fn text(&self) -> String {
        format!("{:.*}", self.decimals, self.value)
    }

    /// The same reading in another unit; as it is when that is no unit of its kind.
    #[must_use]
    pub fn in_unit(&self, symbol: &str) -> Self {
        match unit::lookup(self.kind, symbol) {
            Ok(other) => Self::of(
                self.unit.to_si(self.value),
                self.unit.to_si(self.truth),
                other,
                self.kind,
                self.resolution_si,
            ),
            Err(_) => *self,
        }
    }
}

/// How many of a unit make a difference of one SI unit.
fn per_si(unit: Unit) -> f64 {
    unit.from_si(1.0) - unit.from_si(0.0)
}

/// An instrument at work.
#[derive(Debug, Clone)]
pub(super) struct AtWork {
    pub(super) gauge: Gauge,
    pub(super) off_by: OffBy,
    followed_si: f64,
    next_s: f64,
    random: Random,
    pub(super) reading: Reading,
}

impl AtWork {
    pub(super) fn new(gauge: Gauge, truth: &Truth, gas: Species, mut random: Random) -> Self {
        let allowed = gauge.allowed;
        let drawn = OffBy {
            gain: allowed.gain * within(&mut random, allowed.within),
            zero: allowed.zero * within(&mut random, allowed.within),
        };
        let perfect = gauge.perfect(truth, gas);
        let reading = Reading::of(perfect, perfect, gauge.unit, gauge.kind(), allowed.resolution);
        let mut new = Self {
            off_by: gauge.off_by.unwrap_or(drawn),
            followed_si: perfect,
            next_s: 0.0,
            random,
            reading,
            gauge,
        };
        new.step(truth, gas, 0.0);
        new
    }

    /// Goes on to the time of `truth`, `dt_s` after the last time.
    pub(super) fn step(&mut self, truth: &Truth, gas: Species, dt_s: f64) {
        let gauge = &self.gauge;
        let perfect = gauge.perfect(truth, gas);
        let follows = 1.0 - libm::exp(-dt_s / gauge.lag_s.max(1e-9));
        self.followed_si += (perfect - self.followed_si) * follows;
        // A billionth of a second of room for the rounding of times.
        if truth.time_s + 1e-9 < self.next_s {
            return;
        }
        self.next_s = truth.time_s + gauge.every_s.max(1e-3);
        // Gains are of what the scale counts from its own zero: degrees Celsius, not kelvins.
        let nought = gauge.unit.to_si(0.0);
        let counted = self.followed_si - nought;
        let noise = gauge.allowed.noise + gauge.allowed.noise_of_reading * counted.abs();
        let shown =
            counted * (1.0 + self.off_by.gain) + self.off_by.zero + noise * self.random.normal() + nought;
        self.reading = Reading::of(shown, perfect, gauge.unit, gauge.kind(), gauge.allowed.resolution);
    }
}

/// A standard normal deviate no further out than `limit`.
fn within(random: &mut Random, limit: f64) -> f64 {
    // Beyond two one in twenty is; beyond a limit of nearly nought nearly all are, and then it is cut.
    for _ in 0..64 {
        let z = random.normal();
        if z.abs() <= limit {
            return z;
        }
    }
    limit * random.rectangular(-1.0, 1.0)
}
