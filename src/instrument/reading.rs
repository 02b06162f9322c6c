//! From the number an instrument shows to a reading in SI units, or a reason why it cannot be one.
//!
//! Pressures are as shown: gauge for a transducer, absolute for a barometer and for cells. What a flow meter shows
//! stays an indicated flow; its reference conditions are a matter of its papers.

use super::error::ProfileError;
use super::fault::FaultKind;
use crate::entry::{Instrument, InstrumentPapers, Measures};
use crate::quantity::unit::{self, Unit};
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, Kind, Quantity, QuantityError, Temperature,
};

/// A reading.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Reading {
    /// In SI: m³/s of the meter's own scale, Pa, K, V, m.
    pub si: f64,
    /// The number as it was shown.
    pub shown: f64,
    /// The unit it was shown in.
    pub unit: Unit,
}

impl Reading {
    /// The reading of a flow meter, to the last bit what it showed when it shows litres per minute.
    #[must_use]
    pub fn indicated_flow(&self) -> IndicatedFlow {
        IndicatedFlow::from_shown(self.shown, self.unit)
    }

    /// The kind of its quantity, of which a cell knows two.
    #[must_use]
    pub fn kind(&self) -> Option<Kind> {
        [Kind::Flow, Kind::Pressure, Kind::Temperature, Kind::Voltage, Kind::Length]
            .into_iter()
            .find(|kind| unit::lookup(*kind, self.unit.symbol).is_ok_and(|known| known == self.unit))
    }
}

/// How the numbers of one instrument are taken.
#[derive(Debug, Clone)]
pub struct Scale {
    measures: Measures,
    unit: Option<Unit>,
    range: Option<(f64, f64)>,
}

/// Kinds of quantity an instrument may show.
#[must_use]
pub(super) fn kinds(measures: Measures) -> &'static [Kind] {
    match measures {
        Measures::Flow => &[Kind::Flow],
        Measures::Pressure | Measures::Barometer => &[Kind::Pressure],
        Measures::Temperature => &[Kind::Temperature],
        Measures::Depth => &[Kind::Length],
        // A bare cell gives a voltage, a box with cells in it their PO2.
        Measures::Cell => &[Kind::Voltage, Kind::Pressure],
    }
}

impl Scale {
    /// The scale of an instrument.
    ///
    /// # Errors
    /// A unit that is none of what the instrument measures.
    pub fn of(instrument: &Instrument) -> Result<Self, ProfileError> {
        let unit = instrument.unit.as_deref().map(|text| known(instrument.measures, text)).transpose();
        let unit =
            unit.map_err(|cause| ProfileError::Unit { id: instrument.id.as_str().to_owned(), cause })?;
        let range = match &instrument.papers {
            Some(InstrumentPapers::Meter(meter)) => {
                meter.papers.range.map(|(low, high)| (low.as_m3_s(), high.as_m3_s()))
            }
            Some(InstrumentPapers::Transducer(transducer)) => {
                transducer.papers.range.map(|(low, high)| (low.as_pa(), high.as_pa()))
            }
            None => None,
        };
        Ok(Self { measures: instrument.measures, unit, range })
    }

    /// The unit of the profile.
    #[must_use]
    pub const fn unit(&self) -> Option<Unit> {
        self.unit
    }

    /// The reading a number shows in the unit that stands beside it, else in that of the profile.
    ///
    /// # Errors
    /// Those faults that a number and its unit can have.
    pub fn reading(&self, shown: f64, unit: Option<&str>) -> Result<Reading, FaultKind> {
        let unit = match unit {
            Some(text) => self.unit_beside(text)?,
            None => self.unit.ok_or(FaultKind::NoUnit)?,
        };
        if !shown.is_finite() {
            return Err(FaultKind::NotFinite);
        }
        let si = match self.measures {
            Measures::Flow => IndicatedFlow::from_shown(shown, unit).as_m3_s(),
            _ => unit.to_si(shown),
        };
        if !si.is_finite() {
            return Err(FaultKind::NotFinite);
        }
        let can_be = match self.measures {
            Measures::Pressure => GaugePressure::from_pa(si).check(),
            Measures::Barometer => AbsolutePressure::from_pa(si).check(),
            Measures::Temperature => Temperature::from_k(si).check(),
            Measures::Flow | Measures::Cell | Measures::Depth => Ok(()),
        };
        can_be.map_err(|_| FaultKind::Impossible)?;
        let reading = Reading { si, shown, unit };
        let (low, high) = believable(self.measures, self.is_voltage(unit));
        // "By far" is further outside the papers' range than that range is wide: a meter shows some overload honestly.
        let far = self.range.is_some_and(|(low, high)| {
            let span = high - low;
            si > high + span || si < low - span
        });
        if far || si < low || si > high { Err(FaultKind::OutOfRange) } else { Ok(reading) }
    }

    /// Whether a reading lies within the range of the papers; none without such a range.
    #[must_use]
    pub fn within_range(&self, reading: &Reading) -> Option<bool> {
        self.range.map(|(low, high)| (low..=high).contains(&reading.si))
    }

    fn is_voltage(&self, unit: Unit) -> bool {
        self.measures == Measures::Cell
            && unit::lookup(Kind::Voltage, unit.symbol).is_ok_and(|known| known == unit)
    }

    /// The unit a line says.
    fn unit_beside(&self, text: &str) -> Result<Unit, FaultKind> {
        let refused = match known(self.measures, text) {
            Ok(unit) => return Ok(unit),
            Err(refused) => refused,
        };
        match refused {
            // "psig" of a transducer and "hPa abs" of a barometer say what is taken for granted here; the reverse
            // would be a pressure wrong by one atmosphere.
            QuantityError::ZeroInUnit { unit: marked, plain, .. } => {
                let letters: String =
                    marked.to_lowercase().chars().filter(char::is_ascii_alphabetic).collect();
                let gauge = letters.ends_with('g') || letters.ends_with("gauge") || letters.ends_with("gage");
                if gauge == (self.measures == Measures::Pressure) {
                    unit::lookup(Kind::Pressure, plain).map_err(|_| FaultKind::UnknownUnit)
                } else {
                    Err(FaultKind::OtherUnit)
                }
            }
            QuantityError::UnstatedReference { .. } => Err(FaultKind::UnstatedReference),
            QuantityError::OtherKind { .. } => Err(FaultKind::OtherUnit),
            QuantityError::NoUnit { .. } => Err(FaultKind::NoUnit),
            _ => Err(FaultKind::UnknownUnit),
        }
    }
}

/// The unit that `text` is for an instrument of this kind.
///
/// # Errors
/// As [`unit::lookup`]; for a cell those of a pressure.
pub(super) fn known(measures: Measures, text: &str) -> Result<Unit, QuantityError> {
    let (last, first) = match kinds(measures) {
        [first @ .., last] => (*last, first),
        [] => (Kind::Share, [].as_slice()),
    };
    first.iter().find_map(|kind| unit::lookup(*kind, text).ok()).map_or_else(|| unit::lookup(last, text), Ok)
}

/// The SI values between which an instrument of this trade may show anything at all, whatever its papers say: beyond
/// them lie a wrong unit, a wrong type of number and a broken sensor (common practice, no source).
const fn believable(measures: Measures, voltage: bool) -> (f64, f64) {
    match (measures, voltage) {
        // 100 L/min either way.
        (Measures::Flow, _) => (-1e-1 / 60.0, 1e-1 / 60.0),
        // A full vacuum to 400 bar.
        (Measures::Pressure, _) => (-1e5, 4e7),
        // -60 °C to 150 °C.
        (Measures::Temperature, _) => (213.15, 423.15),
        // 300 hPa, which is above every mountain, to 1200 hPa.
        (Measures::Barometer, _) => (3e4, 1.2e5),
        // A cell gives some 10 mV in air and less than 100 mV in oxygen.
        (Measures::Cell, true) => (-0.02, 0.5),
        // Its PO2: 20 bar.
        (Measures::Cell, false) => (-1e4, 2e6),
        // The zero of a depth sensor wanders at the surface.
        (Measures::Depth, _) => (-5.0, 500.0),
    }
}
