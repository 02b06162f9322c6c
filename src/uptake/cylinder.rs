//! Oxygen that left a cylinder, from its pressure and temperature at both ends.
//!
//! Comes in: water volume, two pressures, two temperatures. Goes out: litres STPD (amount of substance).
//! `n = p·V/(Z·R·T)` at each end. The compressibility factor is a polynomial through values of the reference equation of
//! state of oxygen (R. Schmidt and W. Wagner, Fluid Phase Equilib. 19 (1985) 175, as computed by CoolProp 8.0), within
//! 0.0013 of it from 1 to 310 bar and −20 to 50 °C. Left out: expansion of the cylinder under pressure (under 0.1 %).

use crate::quantity::{STANDARD_ATMOSPHERE_PA, ZERO_CELSIUS_K};

/// Compressibility factor of oxygen at an absolute pressure in bar and a temperature in kelvins.
#[must_use]
pub fn oxygen_compressibility(p_bar: f64, t_k: f64) -> f64 {
    // Powers of p/100 bar down, of (T − 293.15 K)/20 K across.
    const ROWS: [[f64; 3]; 4] = [
        [-0.069_071, 0.022_879, -0.003_028],
        [0.010_240, 0.002_418, -0.001_915],
        [0.006_637, -0.004_295, 0.001_650],
        [-0.001_036, 0.000_655, -0.000_260],
    ];
    let x = p_bar / 100.0;
    let u = (t_k - 293.15) / 20.0;
    let row = |c: [f64; 3]| c[0] + u * (c[1] + u * c[2]);
    1.0 + x * (row(ROWS[0]) + x * (row(ROWS[1]) + x * (row(ROWS[2]) + x * row(ROWS[3]))))
}

/// Litres STPD in a cylinder of `volume_l` litres at an absolute pressure in bar and a temperature in kelvins.
#[must_use]
pub fn contents_l(volume_l: f64, p_bar: f64, t_k: f64) -> f64 {
    let ideal = volume_l * (p_bar * 1e5 / STANDARD_ATMOSPHERE_PA) * (ZERO_CELSIUS_K / t_k);
    ideal / oxygen_compressibility(p_bar, t_k)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn compressibility_is_that_of_the_reference_equation() {
        // Schmidt and Wagner 1985 through CoolProp 8.0, five digits; the polynomial's own tolerance.
        for (c, bar, want) in [
            (0.0, 10.0, 0.990_54),
            (0.0, 182.0, 0.901_76),
            (20.0, 50.0, 0.968_68),
            (20.0, 100.0, 0.946_49),
            (20.0, 171.0, 0.935_83),
            (20.0, 182.0, 0.936_55),
            (20.0, 300.0, 0.980_21),
            (40.0, 200.0, 0.965_95),
        ] {
            let got = oxygen_compressibility(bar, c + ZERO_CELSIUS_K);
            assert!((got - want).abs() < 0.001_3, "{c} °C, {bar} bar: got {got}, want {want}");
        }
    }

    #[test]
    fn one_kelvin_is_eight_per_cent_of_a_small_drop() {
        // The method's own warning: 182 to 171 bar, one kelvin at one end.
        let drop = |t: f64| contents_l(2.0, 182.0, 297.15) - contents_l(2.0, 171.0, t);
        let change = drop(298.15) / drop(297.15) - 1.0;
        assert!((0.06..0.10).contains(&change), "{change}");
    }
}
