//! Numbers for people and for programs.
//!
//! For people: an uncertainty to two significant figures, and the value to the same place (JCGM 100:2008, 7.2.6;
//! the uncertainty is rounded up when more than 5 % of it would be lost). For programs: twelve significant figures,
//! so that the last bits of a machine's own mathematics do not make two files differ.

use serde::{Serialize, Serializer};

/// Significant figures of a number in JSON.
const JSON_FIGURES: i32 = 12;

/// A number in JSON: rounded to twelve significant figures, `null` when it is not finite.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Plain(pub f64);

impl Serialize for Plain {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        if self.0.is_finite() {
            serializer.serialize_f64(significant(self.0, JSON_FIGURES))
        } else {
            serializer.serialize_none()
        }
    }
}

/// `value` rounded to `figures` significant figures, through its decimal text so that the result is the nearest
/// number to that text; minus nought becomes nought.
#[must_use]
pub fn significant(value: f64, figures: i32) -> f64 {
    if !value.is_finite() {
        return value;
    }
    let digits = usize::try_from((figures - 1).max(0)).unwrap_or(0);
    let rounded = format!("{value:.digits$e}").parse().unwrap_or(value);
    if rounded == 0.0 { 0.0 } else { rounded }
}

/// A value and its uncertainty as two texts with the same number of decimals.
///
/// The uncertainty has two significant figures and is rounded up rather than lose more than 5 %; without one (zero
/// or not finite) the value has four significant figures and the second text is empty.
#[must_use]
pub fn value_and_u(value: f64, u: f64) -> (String, String) {
    if !(u.is_finite() && u > 0.0) {
        return (figures(value, 4), String::new());
    }
    let (rounded, decimals) = rounded_uncertainty(u);
    (fixed(value, decimals), fixed(rounded, decimals))
}

/// An uncertainty alone, to two significant figures.
#[must_use]
pub fn u_alone(u: f64) -> String {
    if !(u.is_finite() && u > 0.0) {
        return figures(u, 2);
    }
    let (rounded, decimals) = rounded_uncertainty(u);
    fixed(rounded, decimals)
}

/// A number with a number of significant figures, never in powers of ten between a millionth and a million.
#[must_use]
pub fn figures(value: f64, count: i32) -> String {
    if !value.is_finite() {
        return "no limit".to_owned();
    }
    if value == 0.0 {
        return "0".to_owned();
    }
    let exponent = exponent_of(significant(value, count));
    if !(-7..7).contains(&exponent) {
        let digits = usize::try_from(count - 1).unwrap_or(0);
        return format!("{value:.digits$e}");
    }
    fixed(value, count - 1 - exponent)
}

/// A number with a number of decimals; below nought, rounded to tens, hundreds and so on.
#[must_use]
pub fn fixed(value: f64, decimals: i32) -> String {
    if let Ok(decimals) = usize::try_from(decimals) {
        let text = format!("{value:.decimals$}");
        // "-0.00" says nothing that "0.00" does not.
        if text.trim_start_matches('-').bytes().all(|b| matches!(b, b'0' | b'.')) {
            return text.trim_start_matches('-').to_owned();
        }
        return text;
    }
    let unit = libm::pow(10.0, f64::from(-decimals));
    format!("{:.0}", (value / unit).round() * unit)
}

/// A share as a percentage with two significant figures.
#[must_use]
pub fn percent(share: f64) -> String {
    // Two steps of the arithmetic leave 1e-15 of what should be nothing.
    if share.abs() < 1e-6 && share != 0.0 {
        return "under 0.0001 %".to_owned();
    }
    format!("{} %", figures(share * 100.0, 2))
}

/// A limit that somebody set, as a percentage in as few digits as it was set with.
#[must_use]
pub fn limit_percent(share: f64) -> String {
    format!("{} %", significant(share * 100.0, 6))
}

/// A number with up to `count` significant figures and no noughts at its end.
#[must_use]
pub fn shortest(value: f64, count: i32) -> String {
    let text = figures(value, count);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// A probability as a percentage that never claims certainty.
#[must_use]
pub fn probability(p: f64) -> String {
    let percent = p * 100.0;
    if percent > 99.9 {
        "over 99.9 %".to_owned()
    } else if percent < 0.1 {
        "under 0.1 %".to_owned()
    } else if (1.0..=99.0).contains(&percent) {
        format!("{} %", fixed(percent, 0))
    } else {
        format!("{} %", fixed(percent, 1))
    }
}

/// An uncertainty above nought to two significant figures, rounded up when more than 5 % would be lost, and the decimals
/// that takes; fewer than none where it ends before the point.
#[must_use]
pub fn rounded_uncertainty(u: f64) -> (f64, i32) {
    let decimals = 1 - exponent_of(significant(u, 2));
    let unit = libm::pow(10.0, f64::from(-decimals));
    let nearest = (u / unit).round() * unit;
    let rounded = if nearest < 0.95 * u { (u / unit).ceil() * unit } else { nearest };
    (rounded, decimals)
}

/// Power of ten of the first significant figure.
fn exponent_of(value: f64) -> i32 {
    let text = format!("{value:e}");
    text.rsplit('e').next().and_then(|e| e.parse().ok()).unwrap_or(0)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn value_and_uncertainty_end_at_the_same_place() {
        assert_eq!(value_and_u(0.480_34, 0.004_41), ("0.4803".into(), "0.0044".into()));
        assert_eq!(value_and_u(12_345.6, 120.0), ("12350".into(), "120".into()));
        assert_eq!(value_and_u(-0.000_01, 0.02), ("0.000".into(), "0.020".into()));
        assert_eq!(value_and_u(1.0, 0.0996), ("1.00".into(), "0.10".into()));
        assert_eq!(value_and_u(0.5, 0.0), ("0.5000".into(), String::new()));
    }

    #[test]
    fn figures_keep_their_count() {
        assert_eq!(figures(0.001_234, 3), "0.00123");
        assert_eq!(figures(9.999, 3), "10.0");
        assert_eq!(figures(1234.5, 2), "1200");
        assert_eq!(figures(0.0, 3), "0");
        assert_eq!(figures(f64::INFINITY, 3), "no limit");
    }

    #[test]
    fn json_numbers_are_short_and_never_minus_nought() {
        assert_eq!(serde_json::to_string(&Plain(0.1 + 0.2)).unwrap(), "0.3");
        assert_eq!(serde_json::to_string(&Plain(-0.0)).unwrap(), "0.0");
        assert_eq!(serde_json::to_string(&Plain(f64::INFINITY)).unwrap(), "null");
        assert_eq!(serde_json::to_string(&Plain(1.0 / 3.0)).unwrap(), "0.333333333333");
    }

    #[test]
    fn limits_are_as_short_as_they_were_set() {
        assert_eq!(limit_percent(0.005), "0.5 %");
        assert_eq!(limit_percent(0.0025), "0.25 %");
        assert_eq!(shortest(1.013_25, 6), "1.01325");
        assert_eq!(shortest(10.0, 4), "10");
        assert_eq!(shortest(200.0, 2), "200");
    }

    #[test]
    fn certainty_is_never_claimed() {
        assert_eq!(probability(1.0), "over 99.9 %");
        assert_eq!(probability(0.0), "under 0.1 %");
        assert_eq!(probability(0.973), "97 %");
        assert_eq!(probability(0.994), "99.4 %");
    }
}
