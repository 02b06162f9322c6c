//! What an uptake is uncertain about, row by row.
//!
//! Comes in: what a session states. Goes out: each source of error with its standard uncertainty, its shape, and the
//! shift of the model that it moves. Sources are taken as independent of one another.

use super::given::Given;
use super::model::Model;
use super::segment::Shift;
use crate::entry::{Cylinder, Feeds};
use crate::quantity::{PressureDifference, TemperatureDifference};

/// A row of the budget.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
pub enum Source {
    /// Measurement noise of the slopes.
    SlopeNoise,
    /// Wander of the uptake itself.
    Wander,
    /// Loop volume, where measured.
    LoopVolume,
    /// The orifice's line, random and common parts.
    InjectionLine,
    /// The diver's own gauge of the intermediate pressure.
    IpGauge,
    /// Gas temperature at the orifice.
    GasTemperature,
    /// A stated flow.
    StatedFlow,
    /// Gain of the cells.
    CellGain,
    /// Vapour and loop temperature.
    LoopTemperature,
    /// Carbon dioxide in the lungs' share.
    CarbonDioxide,
    /// Barometer.
    Barometer,
    /// Depth of the counterlung.
    Depth,
    /// Drift of depth over the session.
    DepthDrift,
    /// Leak of loop gas.
    Leak,
    /// Purity of the oxygen.
    Purity,
    /// Nitrogen from the body.
    Washout,
    /// Metered amounts.
    Metered,
    /// Pressure, temperature and volume of the cylinder.
    Cylinder,
    /// How closely a topped loop is brought back to its volume.
    Mark,
}

impl Source {
    /// The words for it in a budget.
    #[must_use]
    pub const fn name(self) -> &'static str {
        match self {
            Self::SlopeNoise => "slope noise",
            Self::Wander => "wander",
            Self::LoopVolume => "loop volume",
            Self::InjectionLine => "injection line",
            Self::IpGauge => "IP gauge",
            Self::GasTemperature => "gas temperature at the orifice",
            Self::StatedFlow => "stated flow",
            Self::CellGain => "cell gain",
            Self::LoopTemperature => "vapour and loop temperature",
            Self::CarbonDioxide => "carbon dioxide share",
            Self::Barometer => "barometer",
            Self::Depth => "depth",
            Self::DepthDrift => "drift of depth",
            Self::Leak => "leak",
            Self::Purity => "purity",
            Self::Washout => "nitrogen washout",
            Self::Metered => "metered amounts",
            Self::Cylinder => "cylinder",
            Self::Mark => "loop volume at the end",
        }
    }

    /// Whether it is drawn anew in every session; the others are taken to be the same in all sessions of a diver.
    #[must_use]
    pub const fn is_of_the_session(self) -> bool {
        matches!(
            self,
            Self::SlopeNoise
                | Self::Wander
                | Self::Barometer
                | Self::DepthDrift
                | Self::Mark
                | Self::Cylinder
        )
    }
}

/// Distribution of a source of error.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Shape {
    Normal,
    Rectangular,
}

/// A source that moves the model as a whole.
#[derive(Debug, Clone, Copy)]
pub(super) struct Moves {
    pub(super) source: Source,
    pub(super) u: f64,
    pub(super) shape: Shape,
    pub(super) shift: Part,
}

/// The part of a shift that a source moves.
pub(super) type Part = fn(&mut Shift) -> &mut f64;

/// The sources that matter to a session.
pub(super) fn moves(model: &Model) -> Vec<Moves> {
    use Shape::{Normal, Rectangular};
    let given: &Given = &model.given;
    let all: [(Source, f64, Shape, Part); 14] = [
        (Source::IpGauge, given.ip_u_bar, Normal, |s| &mut s.ip),
        (Source::GasTemperature, given.gas_u_k, Normal, |s| &mut s.gas_k),
        (Source::StatedFlow, given.flow_u, Normal, |s| &mut s.flow),
        (Source::CellGain, given.gain_u, Normal, |s| &mut s.gain),
        (Source::LoopTemperature, given.loop_u_k, Normal, |s| &mut s.loop_k),
        (Source::CarbonDioxide, given.carbon_dioxide_u, Rectangular, |s| &mut s.carbon_dioxide),
        (Source::Barometer, given.barometer_u, Normal, |s| &mut s.barometer),
        (Source::Depth, given.depth_u_bar, Normal, |s| &mut s.depth),
        (Source::DepthDrift, given.drift_u_bar, Rectangular, |s| &mut s.drift),
        (Source::Leak, given.leak_u, Rectangular, |s| &mut s.leak),
        (Source::Purity, given.purity_u, Normal, |s| &mut s.purity),
        (Source::Washout, given.washout_u, Rectangular, |s| &mut s.washout),
        (Source::Metered, metered_u(model), Normal, |s| &mut s.metered),
        (Source::Cylinder, cylinder_u(model), Normal, |s| &mut s.cylinder),
    ];
    all.into_iter()
        .filter(|(_, u, _, _)| *u > 0.0)
        .map(|(source, u, shape, shift)| Moves { source, u, shape, shift })
        .collect()
}

fn metered_u(model: &Model) -> f64 {
    if model.segments.iter().any(|s| s.top_up.is_some()) { model.given.metered_u } else { 0.0 }
}

/// Standard uncertainty of the oxygen that left the cylinder, litres STPD; zero when no drop is used.
pub(super) fn cylinder_u(model: &Model) -> f64 {
    let used = model.segments.iter().find_map(|s| {
        let top_up = s.top_up.as_ref()?;
        top_up.cylinder.as_ref().filter(|_| top_up.use_cylinder)
    });
    used.map_or(0.0, |cylinder| drop_u(model, cylinder))
}

/// Each input moved by its standard uncertainty; without a ± the gauge is taken to ±1 bar, the thermometer to ±1 °C and the
/// volume to ±1 % (common practice, no source).
fn drop_u(model: &Model, cylinder: &Cylinder) -> f64 {
    let pressure =
        |expanded: Option<PressureDifference>| expanded.map_or(1.0, PressureDifference::as_bar) / 2.0;
    let temperature =
        |expanded: Option<TemperatureDifference>| expanded.map_or(1.0, TemperatureDifference::as_k) / 2.0;
    let volume = &cylinder.volume;
    let relative = volume.expanded.map_or(0.01, |d| d.as_m3() / volume.value.as_m3()) / 2.0;
    let u = [
        relative,
        pressure(cylinder.from.expanded),
        temperature(cylinder.from_temperature.expanded),
        pressure(cylinder.to.expanded),
        temperature(cylinder.to_temperature.expanded),
    ];
    let mut variance = 0.0;
    for input in 0..5 {
        let mut moved = [0.0; 5];
        moved[input] = u[input];
        let up = model.drop(cylinder, &moved);
        moved[input] = -u[input];
        let half = 0.5 * (up - model.drop(cylinder, &moved));
        variance += half * half;
    }
    variance.sqrt()
}

/// Litres STPD per minute by which drop and metered oxygen differ in a topped stage, and its standard uncertainty; none
/// when not both are known.
pub(super) fn leak_check(model: &Model) -> Option<(f64, f64)> {
    let segment = model
        .segments
        .iter()
        .find(|s| s.top_up.as_ref().is_some_and(|t| t.metered && t.cylinder.is_some()))?;
    let top_up = segment.top_up.as_ref()?;
    let cylinder = top_up.cylinder.as_ref()?;
    let minutes = segment.minutes();
    let none = Shift::default();
    let trickle: f64 = segment.rates.iter().map(|(rate, share)| share * model.flow(*rate, &none)).sum();
    let trickle = if cylinder.feeds == Feeds::All { trickle } else { 0.0 };
    let difference = model.drop(cylinder, &[0.0; 5]) / minutes - trickle - top_up.oxygen_l / minutes;
    let drop = drop_u(model, cylinder) / minutes;
    let metered = model.given.metered_u * top_up.oxygen_l / minutes;
    let flow = model.given.flow_u.max(0.01) * trickle;
    Some((difference, (drop * drop + metered * metered + flow * flow).sqrt()))
}
