//! A first stage in the register.

use super::Id;
use crate::quantity::{GaugePressure, PressureDifference, PressureRate, Uncertain, Volume};

/// The regulator that makes the intermediate pressure, with the gauge it is set by.
#[derive(Debug, Clone, PartialEq)]
pub struct FirstStage {
    /// Its name.
    pub id: Id,
    /// Whether its intermediate pressure follows depth.
    pub compensated: bool,
    /// Lowest and highest intermediate pressure it can be set to.
    pub ip_range: (GaugePressure, GaugePressure),
    /// Division of the gauge it is set by.
    pub division: PressureDifference,
    /// Full scale of that gauge.
    pub gauge_scale: Option<GaugePressure>,
    /// Error of that gauge, expanded, k = 2.
    pub gauge_error: Option<PressureDifference>,
    /// How far the intermediate pressure may rise by itself (creep, supply pressure).
    pub ip_spread: Option<PressureDifference>,
    /// How far it comes back from one breath or setting to the next, expanded, k = 2.
    pub ip_repeat: Option<PressureDifference>,
    /// The intermediate pressure the maker allows at most.
    pub max_ip: Option<GaugePressure>,
    /// Volume between the shut cylinder valve and the orifice; the ± is expanded, k = 2.
    pub trapped_volume: Option<Uncertain<Volume>>,
    /// Fall of pressure observed with the cylinder valve shut and a good orifice; the ± is expanded, k = 2.
    pub fall_observed: Option<Uncertain<PressureRate>>,
    /// Maker.
    pub maker: Option<String>,
    /// Serial number.
    pub serial: Option<String>,
}
