//! Slopes, their standard errors and gas factors against figures made or published elsewhere.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::float_cmp, reason = "rows of a table are whole degrees")]

use crate::published::Published;
use ebbline::gas::saturation_pressure;
use ebbline::quantity::{AbsolutePressure, ActualFlow, Temperature};
use ebbline::uptake::slope::{slope, slope_with_bandwidth};

#[test]
fn newey_west_is_that_of_statsmodels() {
    let file = Published::read("uptake", "newey_west");
    for name in ["white", "like", "alternating"] {
        let y = file.numbers(&format!("{name}.y"));
        let minutes: Vec<f64> = (0..y.len()).map(|i| i as f64 * 5.0 / 60.0).collect();
        let automatic = slope(&minutes, &y).unwrap();
        let three = slope_with_bandwidth(&minutes, &y, 4.0).unwrap();
        for (key, got) in [
            ("slope", automatic.slope),
            ("ordinary", automatic.u_ordinary),
            ("three_lags", three.u),
            ("bandwidth", automatic.bandwidth),
            ("automatic", automatic.u),
        ] {
            file.check_relative(&format!("{name}.{key}"), got, 1e-9);
        }
    }
}

#[test]
fn real_oxygen_declines_have_the_slopes_that_were_published() {
    let file = Published::read("uptake", "oxygen_decline");
    for phase in ["M1", "M2", "M3"] {
        let means = file.numbers(&format!("{phase}.means"));
        let middles: Vec<f64> = (0..means.len()).map(|i| 15.5 + 30.0 * i as f64).collect();
        let got = slope(&middles, &means).unwrap();
        let newey_west = file.number(&format!("{phase}.newey_west"));
        let ordinary = file.number(&format!("{phase}.ordinary"));
        file.check_within(&format!("{phase}.slope"), got.slope, 0.1 * newey_west);
        // Every reading as if independent, the standard error is two to six times too small; means of 30 s already say so.
        let short = newey_west / ordinary;
        println!(
            "{phase}: Newey-West {:e}, of the record {newey_west:e}, {short} times the ordinary one",
            got.u
        );
        assert!((2.0..6.0).contains(&short), "{phase}: {short}");
        let ratio = got.u / newey_west;
        assert!((0.6..2.0).contains(&ratio), "{phase}: of means {:e}, of the record {newey_west:e}", got.u);
    }
}

#[test]
fn saturated_volumes_become_body_conditions_as_tabulated() {
    let text = std::fs::read_to_string(concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/fixtures/reference/uptake/atps_to_btps.csv"
    ))
    .unwrap();
    let mut rows = 0;
    for line in text.lines().filter(|l| l.starts_with(|c: char| c.is_ascii_digit())) {
        let numbers: Vec<f64> = line.split(',').map(|n| n.parse().unwrap()).collect();
        let [c, printed, recomputed] = numbers[..] else { panic!("{line}") };
        let stpd = |c: f64| {
            let (p, t) = (AbsolutePressure::STANDARD_ATMOSPHERE, Temperature::from_c(c));
            ActualFlow::from_l_min(1.0).stpd(p, saturation_pressure(t), t).as_l_min()
        };
        let got = stpd(c) / stpd(37.0);
        // Half a unit of the printed digits and a hair for the vapour pressures behind them; two rows are off themselves.
        let tolerance = if c == 25.0 || c == 35.0 { 0.000_85 } else { 0.000_7 };
        for (want, tolerance) in [(printed, tolerance), (recomputed, 6e-6)] {
            assert!(
                (got - want).abs() <= tolerance,
                "{c} °C: got {got}, want {want}, difference {:e}, tolerance {tolerance}, source: {}",
                got - want,
                text.lines().next().unwrap()
            );
        }
        rows += 1;
    }
    assert_eq!(rows, 18);
}
