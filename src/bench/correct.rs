//! From what the instruments show to what passed: one reading at a time.
//!
//! Comes in: a reading, the meter's kind, the conditions, and a [`Shift`] that moves any of the common sources of
//! error. Goes out: absolute pressures up- and downstream and the flow at STPD brought to gas of 20 °C at the
//! orifice. Equations: `q_STPD = q_ref · (p_ref/101.325 kPa) · (273.15 K/T_ref)`; a float's
//! `q = q_scale · sqrt(ρ_scale/ρ_gas)`; choked flow goes with `1/sqrt(T1)`. Left out: thermal lag of the meter.

use crate::entry::{FloatScale, Indication, MeterKind, PointReading, Run};
use crate::gas::{self, Species};
use crate::quantity::{
    AbsolutePressure, ReferenceConditions, STANDARD_ATMOSPHERE_PA, Temperature, ZERO_CELSIUS_K,
};

/// Gas temperature at the orifice at which every line is quoted, in kelvins (20 °C).
pub const REFERENCE_TEMPERATURE_K: f64 = 293.15;

/// One source of error that moves all points of a run together.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Source {
    /// Scale of the flow meter, relative.
    MeterGain,
    /// Zero of the flow meter, in litres per minute of its scale.
    MeterZero,
    /// Scale of the transducer, relative.
    TransducerGain,
    /// Zero of the transducer, in pascals.
    TransducerZero,
    /// Barometer, in pascals.
    Barometer,
    /// Gas temperature at the orifice (and in the meter, where none is stated for it), in kelvins.
    GasTemperature,
    /// Pressure of the meter's inlet over the barometer, in pascals.
    BackPressure,
    /// Gas temperature in the meter, in kelvins.
    MeterTemperature,
    /// Absolute pressure in the meter, in pascals.
    MeterPressure,
    /// Relative humidity in the meter, 0 to 1.
    Humidity,
    /// Water temperature of a wet meter, in kelvins.
    WaterTemperature,
    /// The maker's factor from the meter's gas to the gas of the run, relative.
    GasFactor,
    /// Which law a float follows when the gas is not the one its scale was made for, relative.
    FloatLaw,
}

impl Source {
    /// Every source, in the order of a budget.
    pub const ALL: [Self; SOURCES] = [
        Self::MeterGain,
        Self::MeterZero,
        Self::TransducerGain,
        Self::TransducerZero,
        Self::Barometer,
        Self::GasTemperature,
        Self::BackPressure,
        Self::MeterTemperature,
        Self::MeterPressure,
        Self::Humidity,
        Self::WaterTemperature,
        Self::GasFactor,
        Self::FloatLaw,
    ];
}

/// How many sources there are.
pub const SOURCES: usize = 13;

/// An error of each source, in the unit its [`Source`] names; what is corrected is what was read plus these.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Shift([f64; SOURCES]);

impl Shift {
    /// No error anywhere.
    pub const NONE: Self = Self([0.0; SOURCES]);

    /// Only `source` is off, by `error`.
    #[must_use]
    pub fn of(source: Source, error: f64) -> Self {
        let mut shift = Self::NONE;
        shift.set(source, error);
        shift
    }

    /// Sets the error of `source`.
    pub fn set(&mut self, source: Source, error: f64) {
        self.0[source as usize] = error;
    }

    fn get(&self, source: Source) -> f64 {
        self.0[source as usize]
    }
}

/// What one reading becomes.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Corrected {
    /// Upstream pressure in bar absolute.
    pub p1_bar: f64,
    /// Downstream pressure in bar absolute.
    pub p2_bar: f64,
    /// Flow in litres per minute STPD, for gas of 20 °C at the orifice.
    pub flow_l_min: f64,
    /// Litres per minute as in `flow_l_min` for one litre per minute shown.
    pub per_shown: f64,
}

/// One reading with everything that is needed to correct it, in SI units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Raw {
    /// Shown pressure in pascals.
    pub shown_pa: f64,
    /// Whether that is over vacuum.
    pub absolute: bool,
    /// Shown flow in litres per minute.
    pub shown_l_min: f64,
    /// Gas temperature at the orifice in kelvins.
    pub temperature_k: f64,
    /// Barometer in pascals.
    pub ambient_pa: f64,
    /// Gas temperature in the meter in kelvins, where it is not the orifice's.
    pub meter_temperature_k: Option<f64>,
    /// Absolute pressure in the meter in pascals, where it is not barometer plus back pressure.
    pub meter_pressure_pa: Option<f64>,
}

/// What is the same for all readings of a run.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Correction {
    kind: Kind,
    back_pa: f64,
}

/// The meter's law with its constants worked out.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Kind {
    /// Litres STPD per litre shown.
    Mass { stpd_per_shown: f64 },
    /// The volume that passes, and what water it carries.
    Volumetric { vapour: Vapour },
    /// Litres at the state the scale was drawn for per litre shown, gas factor included, and that state's
    /// pressure over temperature in Pa/K.
    Float { factor: f64, scale_pa_k: f64 },
}

/// Water in the metered gas.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Vapour {
    Dry,
    /// Relative humidity at the meter's own temperature.
    Humid(f64),
    /// Relative humidity over water of a stated temperature in kelvins.
    Over(f64, f64),
}

impl Correction {
    /// Works out the constants of a run.
    #[must_use]
    pub fn of(run: &Run) -> Self {
        let kind = match &run.meter.kind {
            MeterKind::Mass { reads_at, made_for, gas_factor } => {
                let factor = if *made_for == run.gas { None } else { gas_factor.map(|f| f.value) };
                Kind::Mass { stpd_per_shown: reads_at.stpd_factor() * factor.unwrap_or(1.0) }
            }
            MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => {
                let humidity = run.conditions.humidity.value;
                let vapour = match (wet, run.conditions.water_temperature.value, humidity) {
                    (true, Some(water), humidity) => Vapour::Over(water.as_k(), humidity.unwrap_or(1.0)),
                    (true, None, humidity) => Vapour::Humid(humidity.unwrap_or(1.0)),
                    (false, _, Some(humidity)) => Vapour::Humid(humidity),
                    (false, _, None) => Vapour::Dry,
                };
                Kind::Volumetric { vapour }
            }
            MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor } => {
                let state = made_at.unwrap_or(*reads_at);
                let litres = match scale {
                    FloatScale::Actual => 1.0,
                    FloatScale::Reference => reads_at.stpd_factor() / state.stpd_factor(),
                };
                let gas = if *made_for == run.gas {
                    1.0
                } else {
                    gas_factor.map_or_else(|| FloatLaws::of(*made_for, run.gas).mean(), |f| f.value)
                };
                Kind::Float { factor: litres * gas, scale_pa_k: pa_per_k(&state) }
            }
        };
        Self { kind, back_pa: run.conditions.back_pressure.value.map_or(0.0, |p| p.as_pa()) }
    }

    /// Corrects one reading with every source moved by `shift`.
    #[must_use]
    pub fn apply(&self, raw: &Raw, shift: &Shift) -> Corrected {
        let ambient_pa = raw.ambient_pa + shift.get(Source::Barometer);
        let shown_pa =
            raw.shown_pa * (1.0 + shift.get(Source::TransducerGain)) + shift.get(Source::TransducerZero);
        let p1_pa = if raw.absolute { shown_pa } else { shown_pa + ambient_pa };
        let p2_pa = ambient_pa + self.back_pa + shift.get(Source::BackPressure);
        let temperature_k = raw.temperature_k + shift.get(Source::GasTemperature);
        let to_20_c = (temperature_k / REFERENCE_TEMPERATURE_K).sqrt();
        let per_shown = self.stpd_per_shown(raw, shift, p2_pa, temperature_k) * to_20_c;
        let shown_l_min =
            raw.shown_l_min * (1.0 + shift.get(Source::MeterGain)) + shift.get(Source::MeterZero);
        Corrected { p1_bar: p1_pa / 1e5, p2_bar: p2_pa / 1e5, flow_l_min: shown_l_min * per_shown, per_shown }
    }

    /// Litres per minute STPD for one litre per minute shown.
    fn stpd_per_shown(&self, raw: &Raw, shift: &Shift, p2_pa: f64, gas_temperature_k: f64) -> f64 {
        let factor = 1.0 + shift.get(Source::GasFactor) + shift.get(Source::FloatLaw);
        let meter_k =
            raw.meter_temperature_k.map_or(gas_temperature_k, |t| t + shift.get(Source::MeterTemperature));
        let meter_pa = raw.meter_pressure_pa.map_or(p2_pa, |p| p + shift.get(Source::MeterPressure));
        match self.kind {
            Kind::Mass { stpd_per_shown } => stpd_per_shown * factor,
            Kind::Volumetric { vapour } => {
                let vapour_pa = match vapour {
                    Vapour::Dry => 0.0,
                    Vapour::Humid(h) => (h + shift.get(Source::Humidity)) * saturation_pa(meter_k),
                    Vapour::Over(water_k, h) => {
                        let water_k = water_k + shift.get(Source::WaterTemperature);
                        (h + shift.get(Source::Humidity)) * saturation_pa(water_k)
                    }
                };
                stpd_per_actual(meter_pa - vapour_pa, meter_k)
            }
            Kind::Float { factor: scale_factor, scale_pa_k } => {
                let density = (scale_pa_k / (meter_pa / meter_k)).sqrt();
                scale_factor * factor * density * stpd_per_actual(meter_pa, meter_k)
            }
        }
    }
}

/// The two laws a float may follow when its gas changes: by density when the flow round it is turbulent, by viscosity
/// when it is laminar. Each is the true flow over the shown one at the same pressure and temperature.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FloatLaws {
    /// `sqrt(M_scale/M_gas)`.
    pub by_density: f64,
    /// `µ_scale/µ_gas`.
    pub by_viscosity: f64,
}

impl FloatLaws {
    /// For a scale made for `scale` and read with `gas`.
    #[must_use]
    pub fn of(scale: Species, gas: Species) -> Self {
        Self {
            by_density: (scale.molar_mass() / gas.molar_mass()).sqrt(),
            by_viscosity: scale.viscosity() / gas.viscosity(),
        }
    }

    /// The middle between both, which is what is used where the maker gives no factor.
    #[must_use]
    pub fn mean(&self) -> f64 {
        (self.by_density + self.by_viscosity) / 2.0
    }

    /// Half the distance between both over their middle: the half-width of a rectangular distribution, relative.
    #[must_use]
    pub fn relative_half_width(&self) -> f64 {
        ((self.by_density - self.by_viscosity) / (self.by_density + self.by_viscosity)).abs()
    }
}

impl Raw {
    /// A reading with what the run's conditions say where it has no value of its own; none if the run says neither
    /// temperature nor barometer.
    #[must_use]
    pub fn of(reading: &PointReading, run: &Run) -> Option<Self> {
        let conditions = &run.conditions;
        let either = |own: Option<f64>, common: Option<f64>| own.or(common);
        Some(Self {
            shown_pa: reading.pressure.shown_pa(),
            absolute: matches!(reading.pressure, Indication::Absolute(_)),
            shown_l_min: reading.flow.as_l_min(),
            temperature_k: reading.temperature.or(conditions.temperature.value)?.as_k(),
            ambient_pa: reading.barometer.or(conditions.barometer.value)?.as_pa(),
            meter_temperature_k: either(
                reading.meter_temperature.map(Temperature::as_k),
                conditions.meter_temperature.value.map(Temperature::as_k),
            ),
            meter_pressure_pa: either(
                reading.meter_pressure.map(AbsolutePressure::as_pa),
                conditions.meter_pressure.value.map(AbsolutePressure::as_pa),
            ),
        })
    }
}

fn pa_per_k(state: &ReferenceConditions) -> f64 {
    state.pressure.as_pa() / state.temperature.as_k()
}

fn stpd_per_actual(dry_pa: f64, temperature_k: f64) -> f64 {
    (dry_pa / STANDARD_ATMOSPHERE_PA) * (ZERO_CELSIUS_K / temperature_k)
}

fn saturation_pa(temperature_k: f64) -> f64 {
    gas::saturation_pressure(Temperature::from_k(temperature_k)).as_pa()
}
