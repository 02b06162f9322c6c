//! Saturation pressure of water.

use crate::quantity::{AbsolutePressure, Temperature};

/// Critical temperature of water in kelvins (IAPWS R2-83).
const CRITICAL_TEMPERATURE_K: f64 = 647.096;
/// Critical pressure of water in pascals (IAPWS R2-83).
const CRITICAL_PRESSURE_PA: f64 = 22.064e6;

/// Saturation pressure over liquid water at `t`, from 0.01 °C up to the critical point.
///
/// W. Wagner and A. Pruss, J. Phys. Chem. Ref. Data 22 (1993) 783, equation 1; five other formulations agree
/// within 0.1 % between 1 and 40 °C.
#[must_use]
pub fn saturation_pressure(t: Temperature) -> AbsolutePressure {
    let x = 1.0 - t.as_k() / CRITICAL_TEMPERATURE_K;
    let root = x.sqrt();
    let x2 = x * x;
    let x3 = x2 * x;
    let sum = -7.859_517_83 * x + 1.844_082_59 * x * root - 11.786_649_7 * x3 + 22.680_741_1 * x3 * root
        - 15.961_871_9 * x2 * x2
        + 1.801_225_02 * x2 * x2 * x3 * root;
    AbsolutePressure::from_pa(CRITICAL_PRESSURE_PA * libm::exp(CRITICAL_TEMPERATURE_K / t.as_k() * sum))
}
