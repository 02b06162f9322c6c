//! What the papers of an instrument say.

use chrono::NaiveDate;

use super::Id;
use crate::gas::Species;
use crate::quantity::{GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, Uncertain};

/// An amount of uncertainty: a share of the reading, or the same everywhere.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Amount<D> {
    /// A share of the reading (0.01 is one per cent).
    OfReading(f64),
    /// The same at every reading.
    Fixed(D),
}

/// The papers of an instrument whose indications and differences are of type `D` and whose range is given in `R`.
///
/// `gain`, `zero` and `noise` are expanded uncertainties with the coverage factor `coverage`; `resolution` is the
/// last digit's step. `gain` and `zero` are common to all readings, `noise` is each reading's own.
#[derive(Debug, Clone, PartialEq)]
pub struct Papers<D, R> {
    /// Relative error of the scale, common to all readings.
    pub gain: Option<f64>,
    /// Error of the zero, common to all readings.
    pub zero: Option<D>,
    /// Scatter of a single reading.
    pub noise: Option<Amount<D>>,
    /// Step of the last digit.
    pub resolution: Option<D>,
    /// Coverage factor of `gain`, `zero` and `noise`.
    pub coverage: f64,
    /// Lowest and highest reading the papers hold for.
    pub range: Option<(R, R)>,
    /// Number of the calibration certificate.
    pub certificate: Option<String>,
    /// Last day on which the calibration is in date.
    pub due: Option<NaiveDate>,
}

/// Which litres the scale of a float meter is marked in.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum FloatScale {
    /// The volume that passes at the state the scale was made for.
    Actual,
    /// Litres at the reference conditions.
    Reference,
}

/// How a flow meter arrives at its reading.
#[derive(Debug, Clone, PartialEq)]
pub enum MeterKind {
    /// Mass-reading (thermal, or laminar with built-in correction): shows litres at `reads_at` for `made_for`.
    Mass {
        /// The reference conditions of its litres.
        reads_at: ReferenceConditions,
        /// The gas it was calibrated for.
        made_for: Species,
        /// The maker's factor for the gas of the run: true flow over shown flow; the ± is expanded.
        gas_factor: Option<Uncertain<f64>>,
    },
    /// Positive displacement or piston: shows the volume that passes.
    Volumetric {
        /// Whether the gas passes over water and leaves saturated.
        wet: bool,
    },
    /// A volume and the time it took.
    Timed {
        /// Whether the gas is collected over water.
        wet: bool,
    },
    /// Variable area, with a float much denser than the gas.
    Float {
        /// Pressure and temperature the scale was made for.
        reads_at: ReferenceConditions,
        /// The gas the scale was made for.
        made_for: Species,
        /// Which litres are marked.
        scale: FloatScale,
        /// For a scale in reference litres: the working state it was drawn for, when that is not `reads_at`.
        made_at: Option<ReferenceConditions>,
        /// The maker's factor for the gas of the run: true flow over shown flow; the ± is expanded.
        gas_factor: Option<Uncertain<f64>>,
    },
}

impl MeterKind {
    /// The word for it in files.
    #[must_use]
    pub const fn name(&self) -> &'static str {
        match self {
            Self::Mass { .. } => "mass",
            Self::Volumetric { .. } => "volumetric",
            Self::Timed { .. } => "timed",
            Self::Float { .. } => "float",
        }
    }
}

/// A flow meter and its papers.
#[derive(Debug, Clone, PartialEq)]
pub struct Meter {
    /// Its name in the register, if it has one.
    pub id: Option<Id>,
    /// How it arrives at its reading.
    pub kind: MeterKind,
    /// Its papers.
    pub papers: Papers<IndicatedFlow, IndicatedFlow>,
}

/// A pressure transducer and its papers.
#[derive(Debug, Clone, PartialEq)]
pub struct Transducer {
    /// Its name in the register, if it has one.
    pub id: Option<Id>,
    /// Its papers; the range is of what it shows, gauge or absolute as the run's column is.
    pub papers: Papers<PressureDifference, GaugePressure>,
}
