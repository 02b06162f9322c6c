//! Every number a setting was worked out with, and which of them nobody gave.
//!
//! Comes in: a setting and what it was asked with. Goes out: one row an option for people, and one key an option, its
//! unit in the name, for programs.

use serde::Serialize;

use super::Units;
use super::number::{Plain, shortest};
use super::setting::Reported;
use super::setting_sentences::{first_stage_name, max_depth, option_name, water_name};
use super::setting_words::{data, first_stage, ip_given, limit, temperature};
use crate::quantity::{Uncertain, ZERO_CELSIUS_K};
use crate::setting::{
    DEFAULT_GAUGE_SCALE_BAR, Defaulted, HYPOXIA_BAR, LARGEST_SHORTFALL, LOOP_C, Trapped, Used,
};

/// One option and what was taken for it.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Row {
    /// The option, or what stands for one.
    pub(super) name: &'static str,
    /// Its value with its unit.
    pub(super) text: String,
    /// Whether nobody gave it.
    pub(super) defaulted: bool,
}

/// Every row.
pub(super) fn rows(reported: &Reported<'_>, units: &Units) -> Vec<Row> {
    let (setting, options) = (reported.setting, reported.options);
    let used = &setting.used;
    let took = |which| used.defaulted.contains(&which);
    let of = |which: Defaulted, text: String| Row { name: option_name(which), text, defaulted: took(which) };
    let given = |name, text| Row { name, text, defaulted: false };
    let pressure = |bar: f64| units.pressure_text(bar);
    let mut rows = vec![given("first-stage", {
        let name = reported.first_stage.map(|name| format!("{}, ", data(name))).unwrap_or_default();
        format!("{name}{}", first_stage(used.first_stage))
    })];
    if used.max_depth_m.is_some() {
        rows.push(given("max-depth", max_depth(setting, units)));
    }
    rows.push(of(
        Defaulted::IpRange,
        used.ip_range_bar_gauge.map_or_else(
            || "what the bench run of each orifice spans".to_owned(),
            |(low, high)| format!("{} to {}", ip_given(low, units), ip_given(high, units)),
        ),
    ));
    if let Some(max) = used.max_ip_bar_gauge {
        rows.push(given("maximum IP", format!("{}, stated by the maker", ip_given(max, units))));
    }
    rows.push(of(Defaulted::GaugeDivision, pressure(used.gauge_division_bar)));
    if let Some(scale) = gauge_scale_bar(reported) {
        rows.push(of(Defaulted::GaugeScale, pressure(scale)));
    }
    let expanded = |bar: f64| format!("±{} (k = 2)", pressure(bar));
    rows.push(of(Defaulted::GaugeError, expanded(used.gauge_error_expanded_bar)));
    rows.push(of(Defaulted::IpSpread, format!("up to {} higher", pressure(used.ip_spread_bar))));
    rows.push(of(Defaulted::IpRepeat, expanded(used.ip_repeat_expanded_bar)));
    rows.push(of(Defaulted::Chance, limit(used.chance)));
    rows.push(of(Defaulted::Shortfall, format!("{} of the uptake", limit(used.shortfall))));
    rows.push(given("largest shortfall", format!("{}, cannot be changed", limit(LARGEST_SHORTFALL))));
    rows.push(of(Defaulted::Water, format!("{}, {} kg/m³", water_name(used.water), used.water.density())));
    rows.push(of(Defaulted::WaterTemperature, water_temperature(used, units)));
    rows.push(of(Defaulted::SetAt, ambient(used.set_at_bar_abs, used.set_at_u_bar)));
    rows.push(of(Defaulted::DiveAt, ambient(used.dive_at_bar_abs, used.dive_at_u_bar)));
    rows.push(given(
        "loop-volume",
        used.loop_volume_l.map_or_else(
            || "not known".to_owned(),
            |litres| format!("{} L with the lungs, gas of {LOOP_C} °C", shortest(litres, 4)),
        ),
    ));
    rows.push(of(Defaulted::Diluent, format!("{} % oxygen", shortest(100.0 * used.diluent_fraction, 4))));
    rows.push(of(Defaulted::Po2High, format!("{} bar", shortest(used.po2_high_bar, 4))));
    rows.push(of(Defaulted::Po2Low, format!("{} bar", shortest(used.po2_low_bar, 4))));
    rows.push(of(
        Defaulted::Work,
        format!("{} {} STPD", shortest(units.flow(used.work_l_min), 4), units.flow_symbol()),
    ));
    rows.push(of(
        Defaulted::Oxygen,
        format!("{} % ± {} %", shortest(100.0 * used.purity, 5), shortest(200.0 * used.purity_u, 3)),
    ));
    if let Some(trapped) = options.trapped {
        rows.push(given("trapped gas", trapped_text(trapped, units)));
        let (from, to) = used.contents_bar_gauge;
        rows.push(of(Defaulted::Contents, format!("{} down to {}", pressure(from), pressure(to))));
    }
    rows
}

/// Full scale of the IP gauge, where it is known or was taken.
fn gauge_scale_bar(reported: &Reported<'_>) -> Option<f64> {
    let took = reported.setting.used.defaulted.contains(&Defaulted::GaugeScale);
    reported.options.gauge_scale.map(|scale| scale.as_bar()).or(took.then_some(DEFAULT_GAUGE_SCALE_BAR))
}

fn water_temperature(used: &Used, units: &Units) -> String {
    if used.defaulted.contains(&Defaulted::WaterTemperature) {
        format!(
            "not known: best estimate with gas of {}, overfeeding judged at {}, leanness at {}",
            temperature(used.nominal_k, units),
            temperature(used.coldest_k, units),
            temperature(used.warmest_k, units)
        )
    } else {
        format!(
            "{} ± {} K (k = 2)",
            temperature(used.nominal_k, units),
            shortest(2.0 * used.temperature_u_k, 3)
        )
    }
}

fn ambient(bar_abs: f64, u_bar: f64) -> String {
    format!("{} hPa ± {} hPa", shortest(1000.0 * bar_abs, 6), shortest(2000.0 * u_bar, 3))
}

fn trapped_text(trapped: Trapped, units: &Units) -> String {
    let uncertain = |value: f64, expanded: Option<f64>, unit: &str| {
        let plus_minus = expanded.map_or_else(
            || " ± 10 % (nothing stated)".to_owned(),
            |e| format!(" ± {} {unit}", shortest(e, 3)),
        );
        format!("{} {unit}{plus_minus}", shortest(value, 4))
    };
    match trapped {
        Trapped::Volume(Uncertain { value, expanded }) => {
            uncertain(1000.0 * value.as_l(), expanded.map(|e| 1000.0 * e.as_l()), "mL")
        }
        Trapped::Fall(Uncertain { value, expanded }) => {
            let unit = units.unit(crate::quantity::Kind::PressureRate);
            let shown = |rate: crate::quantity::PressureRate| unit.from_si(rate.as_pa_s());
            format!("falls by {}", uncertain(shown(value), expanded.map(shown), unit.symbol))
        }
    }
}

/// For programs: flows L/min STPD; `expanded` at k = 2, `u` standard.
#[derive(Serialize)]
pub(super) struct Assumed {
    first_stage: &'static str,
    max_depth_m: Option<Plain>,
    ip_range_bar_gauge: Option<[Plain; 2]>,
    max_ip_bar_gauge: Option<Plain>,
    gauge_division_bar: Plain,
    gauge_scale_bar_gauge: Option<Plain>,
    gauge_error_expanded_bar: Plain,
    ip_spread_bar: Plain,
    ip_repeat_expanded_bar: Plain,
    chance: Plain,
    shortfall: Plain,
    largest_shortfall: Plain,
    water: &'static str,
    water_density_kg_m3: Plain,
    water_temperature_c: Plain,
    water_temperature_u_k: Plain,
    overfeed_judged_at_c: Plain,
    leanness_judged_at_c: Plain,
    set_at_bar_abs: Plain,
    set_at_u_bar: Plain,
    dive_at_bar_abs: Plain,
    dive_at_u_bar: Plain,
    loop_volume_l: Option<Plain>,
    loop_temperature_c: Plain,
    diluent_oxygen_fraction: Plain,
    po2_high_bar: Plain,
    po2_low_bar: Plain,
    hypoxia_po2_bar: Plain,
    work_l_min: Plain,
    oxygen_fraction: Plain,
    oxygen_fraction_u: Plain,
    contents_bar_gauge: [Plain; 2],
    trapped_volume_l: Option<Plain>,
    fall_observed_bar_min: Option<Plain>,
    /// Names of the options that nobody gave.
    defaulted: Vec<&'static str>,
}

impl Assumed {
    pub(super) fn of(reported: &Reported<'_>) -> Self {
        let used = &reported.setting.used;
        let celsius = |k: f64| Plain(k - ZERO_CELSIUS_K);
        let pair = |(a, b): (f64, f64)| [Plain(a), Plain(b)];
        let (volume, fall) = match reported.options.trapped {
            None => (None, None),
            Some(Trapped::Volume(volume)) => (Some(Plain(volume.value.as_l())), None),
            Some(Trapped::Fall(fall)) => (None, Some(Plain(fall.value.as_bar_min()))),
        };
        Self {
            first_stage: first_stage_name(used.first_stage),
            max_depth_m: used.max_depth_m.map(Plain),
            ip_range_bar_gauge: used.ip_range_bar_gauge.map(pair),
            max_ip_bar_gauge: used.max_ip_bar_gauge.map(Plain),
            gauge_division_bar: Plain(used.gauge_division_bar),
            gauge_scale_bar_gauge: gauge_scale_bar(reported).map(Plain),
            gauge_error_expanded_bar: Plain(used.gauge_error_expanded_bar),
            ip_spread_bar: Plain(used.ip_spread_bar),
            ip_repeat_expanded_bar: Plain(used.ip_repeat_expanded_bar),
            chance: Plain(used.chance),
            shortfall: Plain(used.shortfall),
            largest_shortfall: Plain(LARGEST_SHORTFALL),
            water: water_name(used.water),
            water_density_kg_m3: Plain(used.water.density()),
            water_temperature_c: celsius(used.nominal_k),
            water_temperature_u_k: Plain(used.temperature_u_k),
            overfeed_judged_at_c: celsius(used.coldest_k),
            leanness_judged_at_c: celsius(used.warmest_k),
            set_at_bar_abs: Plain(used.set_at_bar_abs),
            set_at_u_bar: Plain(used.set_at_u_bar),
            dive_at_bar_abs: Plain(used.dive_at_bar_abs),
            dive_at_u_bar: Plain(used.dive_at_u_bar),
            loop_volume_l: used.loop_volume_l.map(Plain),
            loop_temperature_c: Plain(LOOP_C),
            diluent_oxygen_fraction: Plain(used.diluent_fraction),
            po2_high_bar: Plain(used.po2_high_bar),
            po2_low_bar: Plain(used.po2_low_bar),
            hypoxia_po2_bar: Plain(HYPOXIA_BAR),
            work_l_min: Plain(used.work_l_min),
            oxygen_fraction: Plain(used.purity),
            oxygen_fraction_u: Plain(used.purity_u),
            contents_bar_gauge: pair(used.contents_bar_gauge),
            trapped_volume_l: volume,
            fall_observed_bar_min: fall,
            defaulted: used.defaulted.iter().map(|which| option_name(*which)).collect(),
        }
    }
}
