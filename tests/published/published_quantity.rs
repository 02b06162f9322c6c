//! Units and reference conditions against published figures (`fixtures/reference/quantity/`).

#![allow(clippy::unwrap_used, reason = "a test that cannot read its figures fails")]

use ebbline::quantity::text::{reference_conditions, value};
use ebbline::quantity::unit::lookup;
use ebbline::quantity::{
    AbsolutePressure, GaugePressure, Kind, Length, PRESETS, Quantity, ReferenceConditions, ReferenceFlow,
    Temperature,
};

fn fixture(name: &str) -> toml::Table {
    let path = format!("{}/fixtures/reference/quantity/{name}", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(&path).unwrap_or_else(|e| panic!("{path}: {e}"));
    let table: toml::Table = text.parse().unwrap();
    assert!(table["source"]["document"].is_str(), "{path} names its source");
    table
}

#[track_caller]
fn assert_close(what: &str, got: f64, want: f64, tolerance: f64, source: &str) {
    let difference = (got - want).abs();
    assert!(
        difference <= tolerance,
        "{what}: got {got}, want {want}, difference {difference:e}, tolerance {tolerance:e}, source {source}"
    );
}

/// Half a unit of the last digit of a figure as printed, "6.894757e3" → 0.0005.
fn half_a_digit(printed: &str) -> f64 {
    let (mantissa, exponent) = printed.split_once('e').unwrap_or((printed, "0"));
    let decimals = mantissa.split_once('.').map_or(0, |(_, decimals)| decimals.len());
    let exponent: i32 = exponent.parse().unwrap();
    // The hair above one half is for the double the printed figure itself is rounded to.
    0.5 * (1.0 + 1e-6) * 10f64.powi(exponent - i32::try_from(decimals).unwrap())
}

#[test]
fn units_have_the_factors_of_nist_sp_811() {
    let source = "NIST SP 811 (2008), B.8";
    let table = fixture("units.toml");
    let units = table["units"].as_array().unwrap();
    assert_eq!(units.len(), 14);
    for entry in units {
        let text = |key: &str| entry[key].as_str().unwrap();
        let (symbol, name, printed) = (text("symbol"), text("name"), text("printed"));
        let kind = Kind::ALL.into_iter().find(|kind| kind.name() == text("kind")).unwrap();
        let unit = lookup(kind, symbol).unwrap();
        let figure: f64 = printed.parse().unwrap();
        assert_close(name, unit.factor, figure, half_a_digit(printed), source);
        // The ratio of two whole numbers is rounded once, so a unit that says it is exact agrees to the last bit.
        let whole = |nth: usize| entry["definition"][nth].as_str().unwrap().parse::<f64>().unwrap();
        let exact = whole(0) / whole(1);
        assert_close(name, unit.factor, exact, 0.0, "its definition");
        assert_close(name, unit.to_si(1.0), exact, 0.0, "its definition");
        if entry["exact"].as_bool().unwrap() {
            assert_close(name, unit.factor, figure, 0.0, source);
        }
    }
    for entry in table["temperatures"].as_array().unwrap() {
        let text = entry["text"].as_str().unwrap();
        let got: Temperature = value(text).unwrap();
        // One bit of a double at 300 K.
        assert_close(text, got.as_k(), entry["kelvin"].as_float().unwrap(), 5.7e-14, source);
    }
}

#[test]
fn litres_between_reference_conditions_have_the_published_factors() {
    let table = fixture("reference_conditions.toml");
    let source = table["source"]["document"].as_str().unwrap();
    let conditions: Vec<(&str, ReferenceConditions)> = table["conditions"]
        .as_array()
        .unwrap()
        .iter()
        .map(|entry| {
            let (name, text) = (entry["name"].as_str().unwrap(), entry["text"].as_str().unwrap());
            let read = reference_conditions(text).unwrap();
            let (t_k, p_pa) =
                (entry["temperature_k"].as_float().unwrap(), entry["pressure_pa"].as_float().unwrap());
            assert_close(name, read.temperature.as_k(), t_k, 1e-12, source);
            assert_close(name, read.pressure.as_pa(), p_pa, 1e-10, source);
            (name, read)
        })
        .collect();
    assert_eq!(conditions.len(), 7);
    for (from, at) in &conditions {
        for (to, other) in &conditions {
            let want = table["factors"][from][to].as_float().unwrap();
            let litres_stpd = ReferenceFlow::from_l_min(1.0, *at).stpd().as_l_min();
            let per_litre = ReferenceFlow::from_l_min(1.0, *other).stpd().as_l_min();
            let what = format!("{from} to {to}");
            assert_close(&what, litres_stpd / per_litre, want, 1e-12 * want, source);
            assert_close(&what, at.stpd_factor() / other.stpd_factor(), want, 1e-12 * want, source);
        }
    }
}

#[test]
fn ideal_molar_volumes_follow_from_the_reference_conditions() {
    let table = fixture("reference_conditions.toml");
    let source = "CODATA 2018, SI 2019: V = R·T/p";
    let r = table["gas_constant"]["value_j_mol_k"].as_float().unwrap();
    let volumes = table["ideal_molar_volume_l"].as_table().unwrap();
    let printed_of = |name: &str| volumes[name].as_str().unwrap();
    assert_eq!(volumes.len(), 4);
    let stpd_l: f64 = printed_of("STPD").parse().unwrap();
    for entry in table["conditions"].as_array().unwrap() {
        let name = entry["name"].as_str().unwrap();
        let Some(printed) = volumes.get(name).and_then(toml::Value::as_str) else { continue };
        let at = reference_conditions(entry["text"].as_str().unwrap()).unwrap();
        let want: f64 = printed.parse().unwrap();
        let molar_l = r * at.temperature.as_k() / at.pressure.as_pa() * 1e3;
        assert_close(name, molar_l, want, half_a_digit(printed), source);
        // By the other road: as many litres STPD are in it as in a mole at STPD, whose figure is rounded too.
        let rounding = half_a_digit(printed) + half_a_digit(printed_of("STPD"));
        assert_close(name, want * at.stpd_factor(), stpd_l, rounding, source);
    }
}

#[test]
fn presets_are_those_of_the_standards() {
    // ISO 13443:1996: 15 °C; ISO 8778: 20 °C and 100 kPa; 70 °F printed as 21.11 °C.
    let preset = |name: &str| PRESETS.iter().find(|preset| preset.name == name).unwrap().conditions;
    assert_close("STPD", preset("STPD").stpd_factor(), 1.0, 0.0, "by definition");
    assert_close("15 °C", preset("15 °C").temperature.as_k(), 288.15, 1e-12, "ISO 13443:1996");
    assert_close("ANR", preset("ANR").pressure.as_pa(), 1e5, 0.0, "ISO 8778");
    assert_close("ANR", preset("ANR").temperature.as_c(), 20.0, 1e-12, "ISO 8778");
    assert_close("70 °F", preset("70 °F").temperature.as_c(), 21.11, 0.005, "makers' use");
    // A litre at 20 °C is 7 % less gas than one at 0 °C: the slip that makes a setting too lean or too rich.
    assert_close("20 °C", 1.0 / preset("20 °C").stpd_factor(), 1.0732, 0.000_05, "ratio of temperatures");
}

#[test]
fn trade_figures_hold() {
    // Common practice, no source: what is on gauges and in weather reports.
    let bar = |text: &str| value::<GaugePressure>(text).unwrap().as_bar();
    assert_close("1 bar in psi", 1.0 / bar("1 psi"), 14.5038, 0.000_05, "common practice");
    assert_close("1 atm in psi", bar("1 atm") / bar("1 psi"), 14.696, 0.000_5, "common practice");
    assert_close("135 psi", bar("135 psi"), 9.3, 0.05, "common practice");
    assert_close("1 atm in mmHg", bar("1 atm") / bar("1 mmHg"), 760.0, 0.000_5, "common practice");
    let hpa = value::<AbsolutePressure>("29.92 inHg").unwrap().as_pa() / 100.0;
    assert_close("29.92 inHg in hPa", hpa, 1013.2, 0.05, "common practice");
    assert_close("0.003 in", value::<Length>("0.003 in").unwrap().as_um(), 76.2, 1e-9, "by definition");
    assert_close("130 ft", value::<Length>("130 ft").unwrap().si(), 40.0, 0.5, "common practice");
    assert_close("37 °C", value::<Temperature>("98.6 °F").unwrap().as_c(), 37.0, 1e-9, "by definition");
}
