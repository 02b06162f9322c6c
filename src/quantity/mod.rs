//! Typed quantities, their units, and the text people write them in.
//!
//! SI inside. A gauge pressure and an absolute one are two types with no addition between them except through an
//! ambient pressure; a volume flow that was read somewhere carries its reference conditions and becomes an
//! [`StpdFlow`] only with them. Uncertainties parsed after `±` stay *expanded* until divided by their coverage factor.

mod flow;
mod length;
mod partial_pressure;
mod pressure;
mod pressure_rate;
mod share;
mod temperature;
mod time;
mod typed;
mod voltage;
pub mod unit;
mod error;
mod number;
pub mod text;
mod reference;
pub mod show;

#[cfg(test)]
mod tests;

pub use error::{Impossible, QuantityError};
pub use flow::{ActualFlow, IndicatedFlow, ReferenceConditions, ReferenceFlow, StpdFlow};
pub use length::{Length, Mass, Volume};
pub use partial_pressure::PartialPressure;
pub use pressure::{AbsolutePressure, GaugePressure, PressureDifference, STANDARD_ATMOSPHERE_PA};
pub use pressure_rate::PressureRate;
pub use reference::{PRESETS, Preset, presets_listed};
pub use share::Share;
pub use show::Shown;
pub use temperature::{Temperature, TemperatureDifference, ZERO_CELSIUS_K};
pub use text::Uncertain;
pub use time::Span;
pub use typed::Quantity;
pub use unit::{Kind, Unit};
pub use voltage::Voltage;
