//! The units a person asked to see.

use crate::quantity::show::Shown;
use crate::quantity::unit::{Kind, Unit};

/// Cubic metres per second in one litre per minute.
const M3_S_PER_L_MIN: f64 = 1e-3 / 60.0;

/// Display units, with conversions from the units results carry.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Units {
    shown: Shown,
}

impl Units {
    /// From what `--show` named.
    #[must_use]
    pub const fn new(shown: Shown) -> Self {
        Self { shown }
    }

    /// The unit a kind of quantity is shown in.
    #[must_use]
    pub fn unit(&self, kind: Kind) -> Unit {
        self.shown.unit(kind)
    }

    /// Symbol of the pressure unit.
    #[must_use]
    pub fn pressure_symbol(&self) -> &'static str {
        self.shown.pressure.symbol
    }

    /// Pascals in one unit of pressure.
    #[must_use]
    pub fn pressure_pa(&self) -> f64 {
        self.shown.pressure.factor
    }

    /// Cubic metres per second in one unit of flow.
    #[must_use]
    pub fn flow_m3_s(&self) -> f64 {
        self.shown.flow.factor
    }

    /// Symbol of the flow unit.
    #[must_use]
    pub fn flow_symbol(&self) -> &'static str {
        self.shown.flow.symbol
    }

    /// Symbol of the temperature unit.
    #[must_use]
    pub fn temperature_symbol(&self) -> &'static str {
        self.shown.temperature.symbol
    }

    /// A pressure, or a difference of pressures, given in bar.
    #[must_use]
    pub fn pressure(&self, bar: f64) -> f64 {
        bar * 1e5 / self.shown.pressure.factor
    }

    /// A flow given in L/min.
    #[must_use]
    pub fn flow(&self, l_min: f64) -> f64 {
        l_min * M3_S_PER_L_MIN / self.shown.flow.factor
    }

    /// A slope given in L/min per bar.
    #[must_use]
    pub fn slope(&self, l_min_per_bar: f64) -> f64 {
        self.flow(l_min_per_bar) / self.pressure(1.0)
    }

    /// A temperature given in degrees Celsius.
    #[must_use]
    pub fn temperature(&self, c: f64) -> f64 {
        let unit: Unit = self.shown.temperature;
        unit.from_si(c + crate::quantity::ZERO_CELSIUS_K)
    }

    /// A pressure with its symbol.
    #[must_use]
    pub fn pressure_text(&self, bar: f64) -> String {
        format!("{} {}", super::number::shortest(self.pressure(bar), 4), self.pressure_symbol())
    }

    /// A flow with its symbol.
    #[must_use]
    pub fn flow_text(&self, l_min: f64) -> String {
        format!("{} {}", super::number::figures(self.flow(l_min), 4), self.flow_symbol())
    }
}
