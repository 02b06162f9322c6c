//! What a cell shows, as a partial pressure of oxygen.

use crate::entry::{CalibratedAt, CellSignal};
use crate::instrument::Reading;
use crate::quantity::Kind;
use crate::uptake::calibration_points_bar;

/// How the readings of a cell become partial pressures.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum CellScale {
    /// They are.
    Bar,
    /// On the straight line through two calibration points.
    Volts {
        /// Volts in air at the calibration.
        in_air: f64,
        /// Volts in oxygen at the calibration.
        in_oxygen: f64,
        /// The state at the calibration.
        at: CalibratedAt,
    },
}

impl CellScale {
    /// Whether its two points make a line that rises; one in bar needs none.
    pub(super) fn is_a_line(&self) -> bool {
        match self {
            Self::Bar => true,
            Self::Volts { in_air, in_oxygen, at } => {
                let (air, oxygen) = calibration_points_bar(at);
                let (volts, bar) = (in_oxygen - in_air, oxygen - air);
                volts.is_finite() && volts > 0.0 && bar.is_finite() && bar > 0.0
            }
        }
    }

    /// Whether readings of this kind fit it.
    pub(super) const fn fits(&self, kind: Kind) -> bool {
        matches!((self, kind), (Self::Bar, Kind::Pressure) | (Self::Volts { .. }, Kind::Voltage))
    }

    /// The partial pressure in bar.
    pub(super) fn po2_bar(&self, reading: &Reading) -> f64 {
        match self {
            Self::Bar => reading.si / 1e5,
            Self::Volts { in_air, in_oxygen, at } => {
                let (air, oxygen) = calibration_points_bar(at);
                air + (oxygen - air) * (reading.si - in_air) / (in_oxygen - in_air)
            }
        }
    }

    /// A column of readings in SI units (Pa or V) as a session has it.
    #[must_use]
    pub fn signal(&self, si: &[f64]) -> CellSignal {
        match self {
            Self::Bar => CellSignal::Bar(si.iter().map(|pa| pa / 1e5).collect()),
            Self::Volts { in_air, in_oxygen, .. } => {
                CellSignal::Volts { readings: si.to_vec(), in_air: *in_air, in_oxygen: *in_oxygen }
            }
        }
    }
}
