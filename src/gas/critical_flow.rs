//! The critical flow function: what a choked hole passes for a given upstream state.
//!
//! Comes in: species, stagnation pressure and temperature. Goes out: `C*` of ISO 9300, dimensionless, in
//! `q_m = C* · Cd · A · p0 · sqrt(M / (R·T0))`. The real-gas values are a polynomial through a table made by an
//! isentropic throat search on Helmholtz equations of state (`fixtures/reference/gas/critical_flow.csv` names them);
//! it departs from the table by less than 1·10⁻⁵ between 1 and 20 bar and 0 and 40 °C. Putting the real isentropic
//! exponent into the ideal formula would not give these values.

use super::Species;
use crate::quantity::{AbsolutePressure, Temperature};

/// Critical flow function of a real gas at stagnation pressure `p0` and temperature `t0`, dimensionless.
///
/// Holds between 1 and 20 bar absolute and 0 and 40 °C, and smoothly a little beyond.
#[must_use]
pub fn critical_flow_function(species: Species, p0: AbsolutePressure, t0: Temperature) -> f64 {
    let p = p0.as_bar() / 10.0;
    let t = (t0.as_c() - 20.0) / 20.0;
    let row = |c: &[f64; 3]| c[0] + t * (c[1] + t * c[2]);
    let c = coefficients(species);
    row(&c[0]) + p * (row(&c[1]) + p * row(&c[2]))
}

/// Critical flow function of an ideal gas with isentropic exponent `gamma` (ISO 9300):
/// `sqrt(γ) · (2/(γ+1))^((γ+1)/(2(γ−1)))`.
#[must_use]
pub fn ideal_critical_flow_function(gamma: f64) -> f64 {
    gamma.sqrt() * libm::pow(2.0 / (gamma + 1.0), (gamma + 1.0) / (2.0 * (gamma - 1.0)))
}

/// Throat over stagnation pressure of an ideal gas when it chokes: `(2/(γ+1))^(γ/(γ−1))`, 0.528 for γ = 1.4.
#[must_use]
pub fn ideal_critical_ratio(gamma: f64) -> f64 {
    libm::pow(2.0 / (gamma + 1.0), gamma / (gamma - 1.0))
}

/// Coefficients of `(p0 / 10 bar)^i · ((t0 − 20 °C) / 20 K)^j`, `i` down and `j` across; least squares through the
/// table named above, nine decimals.
const fn coefficients(species: Species) -> &'static [[f64; 3]; 3] {
    match species {
        Species::Oxygen => &[
            [0.684_255_317, -0.000_189_704, -0.000_025_431],
            [0.003_533_145, -0.000_760_732, 0.000_092_211],
            [0.000_029_576, -0.000_021_145, 0.000_005_764],
        ],
        Species::Air => &[
            [0.684_841_023, -0.000_050_936, -0.000_007_882],
            [0.002_867_417, -0.000_675_102, 0.000_083_599],
            [-0.000_006_470, -0.000_010_779, 0.000_003_751],
        ],
        Species::Nitrogen => &[
            [0.684_682_905, -0.000_013_741, -0.000_003_131],
            [0.002_633_380, -0.000_654_766, 0.000_082_316],
            [-0.000_008_061, -0.000_008_345, 0.000_003_093],
        ],
        Species::Helium => &[
            [0.726_184_499, 0.0, 0.0],
            [-0.000_952_491, 0.000_064_108, -0.000_003_754],
            [0.000_002_644, -0.000_000_284, 0.000_000_017],
        ],
    }
}
