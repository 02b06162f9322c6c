//! Orifices and divers made up for a setting, with every number in the open.

// Each test program uses its own share of this.
#![allow(dead_code)]

use ebbline::bench::choke::{ChokePoint, ChokeRatio, choke_ratio};
use ebbline::bench::correct::{Corrected, Source};
use ebbline::entry::{Build, Id, Purity};
use ebbline::gas::{Species, critical_flow_function, subsonic_factor};
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, PressureDifference, Temperature, TemperatureDifference, Uncertain,
};
use ebbline::setting::{OrificeInput, PlaceGiven, RestingUptake, SettingOptions, Standing};
use ebbline::uptake::{InjectionLine, LineShift};

/// What a run down to low pressures knows of a hole of choke ratio `b`.
pub(crate) fn choke(b: f64) -> ChokeRatio {
    let t = Temperature::from_c(20.0);
    let c_star = |bar| critical_flow_function(Species::Oxygen, AbsolutePressure::from_bar(bar), t);
    let points: Vec<ChokePoint> = [1.15, 1.3, 1.5, 1.8, 2.2, 2.7, 3.5, 5.0, 8.0, 11.0, 14.0]
        .into_iter()
        .map(|p1_bar| {
            let flow_l_min =
                0.028 * p1_bar * c_star(p1_bar) / c_star(10.0) * subsonic_factor(1.013_25 / p1_bar, b);
            let corrected = Corrected { p1_bar, p2_bar: 1.013_25, flow_l_min, per_shown: 1.0 };
            ChokePoint { corrected, pressure_u: 0.001, flow_u: 0.001 * flow_l_min }
        })
        .collect();
    choke_ratio(Species::Oxygen, Build::Unknown, &points, &[])
}

/// A line without any uncertainty: `slope` L/min per bar, through zero.
pub(crate) fn exact_line(slope: f64) -> InjectionLine {
    InjectionLine {
        intercept: 0.0,
        slope,
        intercept_variance: 0.0,
        slope_variance: 0.0,
        covariance: 0.0,
        random_dof: f64::INFINITY,
        common: Vec::new(),
    }
}

/// A line as a good bench makes it: 0.4 % of meter gain, 0.0003 L/min of meter zero, a random part of 0.1 %.
pub(crate) fn bench_line(slope: f64) -> InjectionLine {
    let at_10 = 10.0 * slope;
    InjectionLine {
        intercept: -0.06 * slope,
        intercept_variance: (0.002 * at_10) * (0.002 * at_10),
        slope_variance: (0.000_2 * at_10) * (0.000_2 * at_10),
        covariance: -0.9 * (0.002 * at_10) * (0.000_2 * at_10),
        random_dof: 9.0,
        common: vec![
            LineShift { source: Some(Source::MeterGain), intercept: -0.000_24 * slope, slope: 0.004 * slope },
            LineShift { source: Some(Source::MeterZero), intercept: 0.000_3, slope: 0.0 },
        ],
        ..exact_line(slope)
    }
}

pub(crate) fn orifice(id: &str, line: InjectionLine) -> OrificeInput {
    OrificeInput {
        id: Id::new(id).expect("a name"),
        line,
        choke: choke(0.45),
        span_bar_abs: (4.0, 14.0),
        effective_diameter_um: 60.0,
        standing: Standing::Accepted,
        overdue_since: None,
    }
}

pub(crate) fn diver(uptake_l_min: f64, u_l_min: f64, dof: f64) -> RestingUptake {
    RestingUptake { uptake_l_min, u_l_min, dof, shared_lines: Vec::new(), per_kilogram: None }
}

pub(crate) fn bar(bar: f64) -> Option<PressureDifference> {
    Some(PressureDifference::from_bar(bar))
}

pub(crate) fn gauge(bar: f64) -> GaugePressure {
    GaugePressure::from_bar(bar)
}

pub(crate) fn barometer(bar: f64, expanded: f64) -> Option<PlaceGiven> {
    let expanded = Some(PressureDifference::from_bar(expanded));
    Some(PlaceGiven::Barometer(Uncertain { value: AbsolutePressure::from_bar(bar), expanded }))
}

/// Everything known exactly: 1 bar all round, pure oxygen of 20 °C, a perfect gauge with a division of 0.1 bar.
pub(crate) fn exact() -> SettingOptions {
    SettingOptions {
        gauge_error: bar(0.0),
        ip_spread: bar(0.0),
        ip_repeat: bar(0.0),
        water_temperature: water(20.0),
        set_at: barometer(1.0, 0.0),
        dive_at: barometer(1.0, 0.0),
        oxygen: Some(Purity { fraction: 1.0, expanded: 0.0 }),
        ..Default::default()
    }
}

/// Water of a temperature that is known exactly.
pub(crate) fn water(c: f64) -> Option<Uncertain<Temperature, TemperatureDifference>> {
    Some(Uncertain { value: Temperature::from_c(c), expanded: Some(TemperatureDifference::from_k(0.0)) })
}
