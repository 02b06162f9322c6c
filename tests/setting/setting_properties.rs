//! What must hold for any setting: more doubt, more depth or less uptake never raise the recommended IP; nothing recommended
//! breaks its own conditions.

#![allow(clippy::float_cmp, reason = "a division of a gauge is a printed decimal, the same on both sides")]

use crate::setting_support::*;
use ebbline::entry::Purity;
use ebbline::quantity::{GaugePressure, Length};
use ebbline::setting::{
    FirstStageKind, OrificeInput, RestingUptake, Setting, SettingOptions, WhyNot, setting,
};
use proptest::prelude::*;

/// A case in plain numbers, so that one of them can be raised.
#[derive(Debug, Clone, Copy)]
struct Plain {
    slope: f64,
    uptake: f64,
    relative_u: f64,
    dof: f64,
    gauge: f64,
    spread: f64,
    repeat: f64,
    purity: f64,
    weather: f64,
    line: f64,
    max_depth: Option<f64>,
    water: bool,
}

fn any_plain() -> impl Strategy<Value = Plain> {
    (
        (0.018_f64..0.036, 9.0_f64..13.0, 0.01_f64..0.11, 3.0_f64..60.0),
        (0.0_f64..0.5, 0.0_f64..0.4, 0.0_f64..0.2, 0.0_f64..0.01, 0.0_f64..0.04, 0.0_f64..2.0),
        proptest::option::of(0.0_f64..12.0),
        any::<bool>(),
    )
        .prop_map(
            |(
                (slope, over, relative_u, dof),
                (gauge, spread, repeat, purity, weather, line),
                max_depth,
                water,
            )| {
                Plain {
                    slope,
                    uptake: over * slope,
                    relative_u,
                    dof,
                    gauge,
                    spread,
                    repeat,
                    purity,
                    weather,
                    line,
                    max_depth,
                    water,
                }
            },
        )
}

impl Plain {
    fn orifice(&self) -> OrificeInput {
        let mut line = bench_line(self.slope);
        line.intercept_variance *= self.line;
        line.slope_variance *= self.line;
        line.covariance *= self.line;
        for shift in &mut line.common {
            shift.intercept *= self.line;
            shift.slope *= self.line;
        }
        orifice("A", line)
    }

    fn diver(&self) -> RestingUptake {
        diver(self.uptake, self.relative_u * self.uptake, self.dof)
    }

    fn options(&self) -> SettingOptions {
        SettingOptions {
            first_stage: match self.max_depth {
                Some(_) => FirstStageKind::Compensated,
                None => FirstStageKind::Uncompensated,
            },
            max_depth: self.max_depth.map(Length::from_m),
            ip_range: Some((GaugePressure::from_bar(4.0), GaugePressure::from_bar(12.5))),
            gauge_error: bar(self.gauge),
            ip_spread: bar(self.spread),
            ip_repeat: bar(self.repeat),
            oxygen: Some(Purity { fraction: 0.98, expanded: self.purity }),
            set_at: barometer(1.013, self.weather),
            dive_at: barometer(1.013, self.weather),
            water_temperature: if self.water { water(15.0) } else { None },
            ..Default::default()
        }
    }

    fn set(&self) -> Setting {
        setting(&[self.orifice()], Some(&self.diver()), &self.options()).expect("a good call")
    }
}

/// The IP of a setting; where there is none because it would be too lean, the IP that was found too lean.
fn found(set: &Setting) -> Option<f64> {
    match &set.orifices[0].answer {
        Ok(described) => Some(described.at.ip_bar_gauge),
        Err(WhyNot::ShortfallTooLarge { ip_bar_gauge, .. } | WhyNot::OutsideSpan { ip_bar_gauge, .. }) => {
            Some(*ip_bar_gauge)
        }
        Err(WhyNot::NothingHighEnough { highest_ip_bar_gauge, .. }) => Some(*highest_ip_bar_gauge),
        Err(_) => None,
    }
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 64, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn more_doubt_never_raises_the_ip(plain in any_plain(), which in 0_usize..9, more in 0.01_f64..1.0) {
        let mut doubtful = plain;
        match which {
            0 => doubtful.relative_u += 0.05 * more,
            1 => doubtful.gauge += 0.5 * more,
            2 => doubtful.spread += 0.5 * more,
            3 => doubtful.repeat += 0.5 * more,
            4 => doubtful.purity += 0.02 * more,
            5 => doubtful.weather += 0.1 * more,
            6 => doubtful.line += 5.0 * more,
            7 => doubtful.dof = 2.5 + more * (doubtful.dof - 2.5) * 0.9,
            _ => doubtful.water = false,
        }
        let (before, after) = (plain.set(), doubtful.set());
        match (found(&before), found(&after)) {
            (Some(before), Some(after)) => prop_assert!(after <= before, "{before} → {after}"),
            (None, Some(after)) => prop_assert!(false, "nothing → {after}"),
            _ => {}
        }
    }

    #[test]
    fn a_deeper_maximum_depth_never_raises_the_ip_of_a_compensated_stage(
        plain in any_plain(), depth in 0.0_f64..20.0, deeper in 0.0_f64..20.0,
    ) {
        let at = |depth| Plain { max_depth: Some(depth), ..plain }.set();
        match (found(&at(depth)), found(&at(depth + deeper))) {
            (Some(before), Some(after)) => prop_assert!(after <= before, "{before} → {after}"),
            (None, Some(after)) => prop_assert!(false, "nothing → {after}"),
            _ => {}
        }
    }

    #[test]
    fn what_is_recommended_keeps_its_own_conditions(plain in any_plain()) {
        let set = plain.set();
        if let Some((orifice, described)) = set.recommended() {
            let at = &described.at;
            prop_assert!(at.overfeed_chance <= 0.025);
            prop_assert!(at.least_shortfall >= 0.05 - 1e-12 && at.largest_shortfall <= 0.25);
            prop_assert!(at.held.leanest_l_min <= at.held.nominal_l_min && at.held.nominal_l_min <= at.held.richest_l_min);
            prop_assert!(orifice.never_exceed_ip_bar_gauge >= Some(at.ip_bar_gauge));
            prop_assert!(orifice.table.iter().any(|row| row.ip_bar_gauge == at.ip_bar_gauge));
            let rising = |w: &[ebbline::setting::AtIp]| w[0].overfeed_chance <= w[1].overfeed_chance;
            prop_assert!(orifice.table.windows(2).all(rising));
            let depth = &described.depth;
            prop_assert!(depth.one_percent.map(|p| p.depth_m) <= depth.nine_tenths.map(|p| p.depth_m));
            if let Some(stops) = depth.stops {
                prop_assert!(depth.nine_tenths.is_some_and(|p| p.depth_m < stops.depth_m));
            }
            if let (Some(limit), Some(max)) = (depth.overtakes_at_m, plain.max_depth) {
                prop_assert!(limit >= max - 1e-6, "overtakes at {limit} m, set for {max} m");
            }
        }
    }
}
