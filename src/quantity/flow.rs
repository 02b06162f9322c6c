//! Volume flows: at STPD, at stated reference conditions, and actual.
//!
//! A flow that was read becomes an [`StpdFlow`] only through [`ReferenceFlow::stpd`] (which needs the reference
//! conditions) or [`ActualFlow::stpd`] (which needs the pressure and temperature at the meter). A litre STPD is an
//! amount of substance: 1 L of ideal gas at 0 °C and 101.325 kPa, dry.

use super::{AbsolutePressure, STANDARD_ATMOSPHERE_PA, Temperature, ZERO_CELSIUS_K};

/// Litres per minute in one cubic metre per second, exact; dividing by it rounds once, as [`super::unit`] does.
const L_MIN_PER_M3_S: f64 = 60_000.0;

/// A volume flow at STPD (0 °C, 101.325 kPa, dry), in m³/s inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct StpdFlow(f64);

/// The temperature and dry pressure at which a meter states its litres.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReferenceConditions {
    /// Reference temperature.
    pub temperature: Temperature,
    /// Reference pressure.
    pub pressure: AbsolutePressure,
}

/// A volume flow stated at reference conditions, in m³/s inside.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ReferenceFlow {
    m3_s: f64,
    at: ReferenceConditions,
}

/// What a flow meter shows, in litres per minute of its own scale: not yet any known amount of gas.
///
/// It becomes one through [`IndicatedFlow::at`] (a meter that shows litres at reference conditions) or
/// [`IndicatedFlow::actual`] (a meter that shows the volume that passes).
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct IndicatedFlow(f64);

/// A volume flow as it passes, at the pressure and temperature it has there, in m³/s inside.
#[derive(Debug, Clone, Copy, PartialEq, PartialOrd)]
pub struct ActualFlow(f64);

impl StpdFlow {
    /// From cubic metres per second STPD.
    #[must_use]
    pub const fn from_m3_s(m3_s: f64) -> Self {
        Self(m3_s)
    }

    /// In cubic metres per second STPD.
    #[must_use]
    pub const fn as_m3_s(self) -> f64 {
        self.0
    }

    /// From litres per minute STPD.
    #[must_use]
    pub fn from_l_min(l_min: f64) -> Self {
        Self(l_min / L_MIN_PER_M3_S)
    }

    /// In litres per minute STPD.
    #[must_use]
    pub fn as_l_min(self) -> f64 {
        self.0 * L_MIN_PER_M3_S
    }
}

impl IndicatedFlow {
    /// From cubic metres per second of the meter's scale.
    #[must_use]
    pub fn from_m3_s(m3_s: f64) -> Self {
        Self(m3_s * L_MIN_PER_M3_S)
    }

    /// In cubic metres per second of the meter's scale.
    #[must_use]
    pub fn as_m3_s(self) -> f64 {
        self.0 / L_MIN_PER_M3_S
    }

    /// From litres per minute of the meter's scale.
    #[must_use]
    pub const fn from_l_min(l_min: f64) -> Self {
        Self(l_min)
    }

    /// In litres per minute of the meter's scale.
    #[must_use]
    pub const fn as_l_min(self) -> f64 {
        self.0
    }

    /// Read as litres at the reference conditions `at`.
    #[must_use]
    pub fn at(self, at: ReferenceConditions) -> ReferenceFlow {
        ReferenceFlow::from_l_min(self.0, at)
    }

    /// Read as the volume that passes.
    #[must_use]
    pub fn actual(self) -> ActualFlow {
        ActualFlow::from_l_min(self.0)
    }
}

impl ReferenceConditions {
    /// 0 °C, 101.325 kPa.
    pub const STPD: Self = Self {
        temperature: Temperature::from_k(ZERO_CELSIUS_K),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    };

    /// Litres STPD in one litre at these conditions, ideal gas: `(p_ref / 101.325 kPa) · (273.15 K / T_ref)`.
    #[must_use]
    pub fn stpd_factor(&self) -> f64 {
        (self.pressure.as_pa() / STANDARD_ATMOSPHERE_PA) * (ZERO_CELSIUS_K / self.temperature.as_k())
    }
}

impl ReferenceFlow {
    /// From litres per minute at the reference conditions `at`.
    #[must_use]
    pub fn from_l_min(l_min: f64, at: ReferenceConditions) -> Self {
        Self { m3_s: l_min / L_MIN_PER_M3_S, at }
    }

    /// In litres per minute at its own reference conditions.
    #[must_use]
    pub fn as_l_min(self) -> f64 {
        self.m3_s * L_MIN_PER_M3_S
    }

    /// The conditions it is stated at.
    #[must_use]
    pub fn conditions(self) -> ReferenceConditions {
        self.at
    }

    /// The same amount of gas at STPD.
    #[must_use]
    pub fn stpd(self) -> StpdFlow {
        StpdFlow(self.m3_s * self.at.stpd_factor())
    }
}

impl ActualFlow {
    /// From litres per minute.
    #[must_use]
    pub fn from_l_min(l_min: f64) -> Self {
        Self(l_min / L_MIN_PER_M3_S)
    }

    /// In litres per minute.
    #[must_use]
    pub fn as_l_min(self) -> f64 {
        self.0 * L_MIN_PER_M3_S
    }

    /// The dry gas in it at STPD: `vapour` is the partial pressure of water in the gas at the meter (zero when dry).
    #[must_use]
    pub fn stpd(
        self,
        pressure: AbsolutePressure,
        vapour: AbsolutePressure,
        temperature: Temperature,
    ) -> StpdFlow {
        let dry_pa = pressure.as_pa() - vapour.as_pa();
        StpdFlow(self.0 * (dry_pa / STANDARD_ATMOSPHERE_PA) * (ZERO_CELSIUS_K / temperature.as_k()))
    }
}
