//! Which type is which kind of quantity, what its differences are, and which of its values cannot be.

use super::error::Impossible;
use super::unit::{self, Kind, Unit};
use super::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Length, Mass, PartialPressure, PressureDifference,
    PressureRate, Share, Span, StpdFlow, Temperature, TemperatureDifference, Voltage, Volume,
};

/// A typed quantity that people write as a number and a unit.
pub trait Quantity: Sized + Copy + PartialEq + std::fmt::Debug {
    /// Its kind, which says the units it is understood in.
    const KIND: Kind;
    /// What the difference of two of it is, and so its uncertainty.
    type Difference: Quantity;

    /// From the SI value (the unit is named at [`Kind`]).
    fn from_si(si: f64) -> Self;

    /// The SI value.
    fn si(self) -> f64;

    /// Whether such a value can be.
    ///
    /// # Errors
    /// Says what it goes against: NaN and infinities for all; gauge pressures below -1 bar; absolute pressures below
    /// zero; temperatures at or below absolute zero; negative flows, lengths, masses, volumes, spans and shares.
    fn check(self) -> Result<(), Impossible>;

    /// A difference from its SI value.
    #[must_use]
    fn difference_from_si(si: f64) -> Self::Difference {
        Self::Difference::from_si(si)
    }

    /// From the number shown in a unit of its kind.
    #[must_use]
    fn from_shown(shown: f64, unit: Unit) -> Self {
        Self::from_si(unit.to_si(shown))
    }

    /// The number a unit of its kind shows.
    #[must_use]
    fn shown(self, unit: Unit) -> f64 {
        unit.from_si(self.si())
    }
}

/// Writes `impl Quantity` for a type whose inside is the SI value.
macro_rules! quantity {
    ($type:ident, $kind:ident, $difference:ident, $from_si:ident, $si:ident, $check:expr) => {
        impl Quantity for $type {
            const KIND: Kind = Kind::$kind;
            type Difference = $difference;

            fn from_si(si: f64) -> Self {
                Self::$from_si(si)
            }

            fn si(self) -> f64 {
                self.$si()
            }

            fn check(self) -> Result<(), Impossible> {
                let check: fn(f64) -> Result<(), Impossible> = $check;
                check(self.si())
            }
        }
    };
}

quantity!(AbsolutePressure, Pressure, PressureDifference, from_pa, as_pa, above_vacuum_absolute);
quantity!(GaugePressure, Pressure, PressureDifference, from_pa, as_pa, above_full_vacuum_gauge);
quantity!(PressureDifference, Pressure, PressureDifference, from_pa, as_pa, finite);
quantity!(PressureRate, PressureRate, PressureRate, from_pa_s, as_pa_s, finite);
quantity!(Temperature, Temperature, TemperatureDifference, from_k, as_k, above_absolute_zero);
quantity!(TemperatureDifference, TemperatureDifference, TemperatureDifference, from_k, as_k, finite);
quantity!(StpdFlow, Flow, StpdFlow, from_m3_s, as_m3_s, |m3_s| not_negative(m3_s, Kind::Flow));
quantity!(Length, Length, Length, from_m, as_m, |m| not_negative(m, Kind::Length));
quantity!(Mass, Mass, Mass, from_kg, as_kg, |kg| not_negative(kg, Kind::Mass));
quantity!(Volume, Volume, Volume, from_m3, as_m3, |m3| not_negative(m3, Kind::Volume));
quantity!(Voltage, Voltage, Voltage, from_v, as_v, finite);
quantity!(Span, Time, Span, from_s, as_s, |s| not_negative(s, Kind::Time));
quantity!(Share, Share, Share, from_ratio, as_ratio, |ratio| not_negative(ratio, Kind::Share));

impl Quantity for IndicatedFlow {
    const KIND: Kind = Kind::Flow;
    type Difference = Self;

    fn from_si(si: f64) -> Self {
        Self::from_m3_s(si)
    }

    fn si(self) -> f64 {
        self.as_m3_s()
    }

    fn check(self) -> Result<(), Impossible> {
        not_negative(self.as_l_min(), Kind::Flow)
    }

    // A meter's reading is kept in litres per minute, and one that was read in them stays as it is to the last bit:
    // the way over m³/s would move one four-digit reading in thirteen by one bit (7.7 % of 200 000 drawn).
    fn from_shown(shown: f64, unit: Unit) -> Self {
        Self::from_l_min(unit.shown_in(shown, unit::L_MIN))
    }

    fn shown(self, unit: Unit) -> f64 {
        unit::L_MIN.shown_in(self.as_l_min(), unit)
    }
}

impl Quantity for PartialPressure {
    const KIND: Kind = Kind::Pressure;
    type Difference = Self;

    fn from_si(si: f64) -> Self {
        Self::from_pa(si)
    }

    fn si(self) -> f64 {
        self.as_pa()
    }

    fn check(self) -> Result<(), Impossible> {
        finite(self.as_bar())
    }

    // As for a meter's reading: what was shown in bar is kept to the last bit, which the way over Pa would not do.
    fn from_shown(shown: f64, unit: Unit) -> Self {
        Self::from_bar(unit.shown_in(shown, unit::BAR))
    }

    fn shown(self, unit: Unit) -> f64 {
        unit::BAR.shown_in(self.as_bar(), unit)
    }
}

fn finite(si: f64) -> Result<(), Impossible> {
    if si.is_finite() { Ok(()) } else { Err(Impossible::NotFinite) }
}

fn at_least(lowest: f64, si: f64, why: Impossible) -> Result<(), Impossible> {
    finite(si)?;
    if si < lowest { Err(why) } else { Ok(()) }
}

fn above_vacuum_absolute(pa: f64) -> Result<(), Impossible> {
    at_least(0.0, pa, Impossible::AbsoluteBelowZero)
}

// A round limit: full vacuum is -1.01325 bar under the standard atmosphere, and no first stage is set there.
fn above_full_vacuum_gauge(pa: f64) -> Result<(), Impossible> {
    at_least(-1e5, pa, Impossible::GaugeBelowVacuum)
}

fn not_negative(si: f64, kind: Kind) -> Result<(), Impossible> {
    at_least(0.0, si, Impossible::Negative(kind))
}

fn above_absolute_zero(k: f64) -> Result<(), Impossible> {
    finite(k)?;
    if k > 0.0 { Ok(()) } else { Err(Impossible::AtAbsoluteZero) }
}
