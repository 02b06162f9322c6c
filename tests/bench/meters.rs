//! Every meter kind from what it shows to STPD, worked by hand or against a published table.

use crate::runs::{points, run};
use ebbline::bench::correct::{Correction, FloatLaws, Raw, Shift};
use ebbline::entry::Run;
use ebbline::gas::Species;

const HEAD: &str = r#"record = "bench run"
orifice = "CMF-1"
gas = "GAS"
purpose = "check"
taken = "2026-11-12T09:40:00+11:00"
readings = "run.csv"
[transducer]
gain = "0.2 %"
"#;

/// A run with one reading of 1 L/min at 10 bar, gas, conditions and meter as given.
fn one(gas: &str, conditions: &str, meter: &str, columns: &str) -> Run {
    let toml = format!(
        "{}[columns]\npressure = {{ column = \"ip\", unit = \"bar\" }}\n{columns}\n[conditions]\n{conditions}\n[meter]\n{meter}\n",
        HEAD.replace("GAS", gas)
    );
    run(&toml, "ip,flow,volume,duration\n10,1,2.5,150\n")
}

const FLOW: &str = "flow = { column = \"flow\", unit = \"L/min\" }";

/// Litres STPD for the reading, at the temperature of the gas: the line's own step to 20 °C taken back.
fn stpd(run: &Run) -> f64 {
    let raw = Raw::of(&points(run)[0], run).expect("conditions");
    let corrected = Correction::of(run).apply(&raw, &Shift::NONE);
    corrected.flow_l_min / (raw.temperature_k / 293.15).sqrt()
}

#[track_caller]
fn close(got: f64, want: f64, tolerance: f64, source: &str) {
    assert!((got - want).abs() <= tolerance, "got {got}, want {want}, tolerance {tolerance:e} ({source})");
}

#[test]
fn a_mass_reading_meter_goes_by_its_reference_conditions_alone() {
    for (reads_at, factor) in [
        ("STPD", 1.0),
        ("20 °C, 101.325 kPa", 0.931_775_541_531_639),
        ("15 °C, 101.325 kPa", 0.947_943_779_281_624),
        ("20 °C, 100 kPa", 0.919_590_961_294_487_3),
        ("ANR", 0.919_590_961_294_487_3),
        ("25 °C, 100 kPa", 0.904_169_344_7),
        ("70 °F, 101.325 kPa", 273.15 / (273.15 + 190.0 / 9.0)),
    ] {
        let meter = format!("kind = \"mass\"\nreads_at = \"{reads_at}\"\nmade_for = \"oxygen\"");
        let run = one("oxygen", "temperature = \"27 °C\"\nbarometer = \"950 hPa\"", &meter, FLOW);
        close(stpd(&run), factor, 1e-9, "ideal volume factors, ISO 13443 and CODATA; 70 °F by hand");
    }
}

#[test]
fn a_mass_reading_meter_for_another_gas_takes_the_makers_factor() {
    let meter = "kind = \"mass\"\nreads_at = \"STPD\"\nmade_for = \"air\"\ngas_factor = \"0.98 ± 0.01\"";
    let run = one("oxygen", "temperature = \"20 °C\"\nbarometer = \"1013.25 hPa\"", meter, FLOW);
    close(stpd(&run), 0.98, 1e-12, "by hand");
    // The factor of a meter that already reads the gas is left alone.
    let meter = meter.replace("\"air\"", "\"oxygen\"");
    let run = one("oxygen", "temperature = \"20 °C\"\nbarometer = \"1013.25 hPa\"", &meter, FLOW);
    close(stpd(&run), 1.0, 1e-12, "by hand");
}

#[test]
fn a_wet_volumetric_meter_gives_the_tabulated_factors() {
    // Saturated volume at t and barometer (mmHg) to STPD, 5 decimals; the table's vapour formula differs by 1e-5.
    let path = format!("{}/fixtures/reference/gas/atps_to_stpd.csv", env!("CARGO_MANIFEST_DIR"));
    let text = std::fs::read_to_string(path).unwrap();
    let mut checked = 0;
    for line in text.lines().skip(2) {
        let cells: Vec<f64> = line.split(',').map(|c| c.parse().unwrap()).collect();
        for (mmhg, want) in [700.0, 720.0, 740.0, 750.0, 760.0, 770.0].iter().zip(&cells[1..]) {
            let conditions = format!("temperature = \"{} °C\"\nbarometer = \"{mmhg} mmHg\"", cells[0]);
            let run = one("oxygen", &conditions, "kind = \"volumetric\"\nwet = true", FLOW);
            close(stpd(&run), *want, 1.5e-5, "atps_to_stpd.csv");
            checked += 1;
        }
    }
    assert!(checked > 60, "{checked}");
}

#[test]
fn a_dry_volumetric_meter_takes_its_own_pressure_and_temperature() {
    let conditions = "temperature = \"20 °C\"\nbarometer = \"1000 hPa\"\nback_pressure = \"20 mbar\"";
    let run_at = |conditions: &str| one("air", conditions, "kind = \"volumetric\"", FLOW);
    close(
        stpd(&run_at(conditions)),
        1020.0 / 1013.25 * 273.15 / 293.15,
        1e-12,
        "by hand: barometer and back pressure",
    );
    let warmer = format!("{conditions}\nmeter_temperature = \"30 °C\"\nmeter_pressure = \"1100 hPa\"");
    close(stpd(&run_at(&warmer)), 1100.0 / 1013.25 * 273.15 / 303.15, 1e-12, "by hand: its own");
    // Half saturated room air at 20 °C carries 11.7 hPa of water (IAPWS: 23.392 hPa at saturation).
    let humid = format!("{conditions}\nhumidity = \"50 %\"");
    let dry_hpa = 1020.0 - 0.5 * 23.391_94;
    close(stpd(&run_at(&humid)), dry_hpa / 1013.25 * 273.15 / 293.15, 1e-7, "by hand with the IAPWS value");
}

#[test]
fn a_timed_volume_is_a_flow() {
    let columns =
        "volume = { column = \"volume\", unit = \"L\" }\nduration = { column = \"duration\", unit = \"s\" }";
    let conditions = "temperature = \"0 °C\"\nbarometer = \"1013.25 hPa\"";
    let run = one("oxygen", conditions, "kind = \"timed\"", columns);
    close(stpd(&run), 2.5 / 2.5, 1e-12, "2.5 L in 150 s");
}

#[test]
fn a_float_goes_with_the_root_of_density() {
    // Scale for air at 20 °C and 101.325 kPa; read with air at 20 °C and 120 kPa: the density is 1.1843 times that
    // of the scale, so 1 L/min shown is 0.9189 actual L/min, or 1.0134 L/min STPD.
    let meter = "kind = \"float\"\nreads_at = \"20 °C, 101.325 kPa\"\nmade_for = \"air\"\nscale = \"actual\"";
    let conditions = "temperature = \"20 °C\"\nbarometer = \"1013.25 hPa\"\nback_pressure = \"186.75 mbar\"";
    let run = one("air", conditions, meter, FLOW);
    let density = 1200.0 / 1013.25_f64;
    close(stpd(&run), (1.0 / density).sqrt() * density * 273.15 / 293.15, 1e-12, "by hand");
    close(stpd(&run), 1.0140, 5e-5, "by hand: sqrt(1.18431) · 0.931776");
}

#[test]
fn a_reference_scale_drawn_for_another_state_is_taken_back_to_it() {
    // Reference litres (20 °C, 101.325 kPa) at a working pressure of 3 bar absolute; read at that state: what it shows.
    let meter = "kind = \"float\"\nreads_at = \"20 °C, 101.325 kPa\"\nmade_at = \"20 °C, 300 kPa\"\nmade_for = \"air\"\nscale = \"reference\"";
    let conditions = "temperature = \"20 °C\"\nbarometer = \"1000 hPa\"\nmeter_pressure = \"3000 hPa\"";
    let run = one("air", conditions, meter, FLOW);
    close(stpd(&run), 273.15 / 293.15, 1e-12, "by hand: 1 L/min at its reference conditions");
}

#[test]
fn a_float_with_another_gas_lies_between_two_laws() {
    // Air scale on oxygen: 0.951 by density, 0.898 by viscosity (method; handbook molar masses and viscosities).
    let laws = FloatLaws::of(Species::Air, Species::Oxygen);
    close(laws.by_density, 0.951, 5e-4, "sqrt(28.965/31.999)");
    close(laws.by_viscosity, 0.898, 5e-4, "1.8205/2.0272");
    close(laws.relative_half_width(), (0.9514 - 0.8980) / (0.9514 + 0.8980), 1e-4, "by hand");
    let meter = "kind = \"float\"\nreads_at = \"20 °C, 101.325 kPa\"\nmade_for = \"air\"\nscale = \"actual\"";
    let conditions = "temperature = \"20 °C\"\nbarometer = \"1013.25 hPa\"";
    let without = one("oxygen", conditions, meter, FLOW);
    close(stpd(&without), laws.mean() * 273.15 / 293.15, 1e-12, "the middle of both laws");
    let with = one("oxygen", conditions, &format!("{meter}\ngas_factor = \"0.93 ± 0.01\""), FLOW);
    close(stpd(&with), 0.93 * 273.15 / 293.15, 1e-12, "the maker's factor");
}

#[test]
fn the_line_is_quoted_for_gas_of_20_degrees() {
    let meter = "kind = \"mass\"\nreads_at = \"STPD\"\nmade_for = \"oxygen\"";
    let run = one("oxygen", "temperature = \"4 °C\"\nbarometer = \"1013.25 hPa\"", meter, FLOW);
    let raw = Raw::of(&points(&run)[0], &run).unwrap();
    let corrected = Correction::of(&run).apply(&raw, &Shift::NONE);
    // Colder gas passes more: the flow at 4 °C is 2.8 % larger than at 20 °C (method, section 5).
    close(1.0 / corrected.flow_l_min, 1.028, 5e-4, "sqrt(293.15/277.15)");
    close(corrected.p1_bar, 11.01325, 1e-12, "gauge over barometer");
    close(corrected.p2_bar, 1.01325, 1e-12, "barometer");
}
