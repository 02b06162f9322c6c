//! Typed quantities, their units, and the text people write them in.
//!
//! SI inside. A gauge pressure and an absolute one are two types with no addition between them except through an
//! ambient pressure; a volume flow that was read somewhere carries its reference conditions and becomes an
//! [`StpdFlow`] only with them. Uncertainties parsed after `±` stay *expanded* until divided by their coverage factor.

mod flow;
mod length;
mod pressure;
mod temperature;
mod time;
pub mod text;
pub mod unit;

pub use flow::{ActualFlow, IndicatedFlow, ReferenceConditions, ReferenceFlow, StpdFlow};
pub use length::{Length, Mass, Volume};
pub use pressure::{AbsolutePressure, GaugePressure, PressureDifference, STANDARD_ATMOSPHERE_PA};
pub use temperature::{Temperature, TemperatureDifference, ZERO_CELSIUS_K};
pub use text::{QuantityError, Uncertain};
pub use time::Span;
