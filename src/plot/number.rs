//! Numbers as text: coordinates, and the labels of axes.
//!
//! Comes in: a number. Goes out: a text that never says NaN, an infinity or a negative nought; on axes the minus sign
//! is the real one. Left out: values with their uncertainty, which are rounded as the report does it.

/// Digits after the point of every coordinate: a hundredth of a pixel.
const COORDINATE_DECIMALS: usize = 2;
/// Beyond these sizes digits are counted with an exponent, else a label would run on.
const PLAIN: std::ops::Range<f64> = 1e-6..1e7;

/// A coordinate. What is not finite becomes nought: callers leave such marks out, and a picture never holds a NaN.
pub(super) fn coordinate(x: f64) -> String {
    let text = format!("{:.*}", COORDINATE_DECIMALS, if x.is_finite() { x } else { 0.0 });
    without_negative_zero(text)
}

/// A value with a fixed number of decimals, on an axis.
pub(super) fn fixed(value: f64, decimals: usize) -> String {
    let size = value.abs();
    let text = if size == 0.0 || PLAIN.contains(&size) || (size < PLAIN.start && decimals <= 6) {
        format!("{value:.decimals$}")
    } else {
        format!("{value:.3e}")
    };
    without_negative_zero(text).replace('-', "\u{2212}")
}

/// A value with at most four significant digits and no noughts at the end.
pub(super) fn short(value: f64) -> String {
    let decimals = (3 - exponent(value)).clamp(0, 9) as usize;
    let text = fixed(value, decimals);
    if text.contains('.') && !text.contains('e') {
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    } else {
        text
    }
}

/// The decimal exponent of a number's first digit; nought for nought and for what is not finite.
pub(super) fn exponent(x: f64) -> i32 {
    let size = x.abs();
    if size.is_finite() && size > 0.0 {
        libm::floor(libm::log10(size)).clamp(-300.0, 300.0) as i32
    } else {
        0
    }
}

fn without_negative_zero(text: String) -> String {
    match text.strip_prefix('-') {
        Some(rest) if rest.bytes().all(|b| matches!(b, b'0' | b'.')) => rest.to_owned(),
        _ => text,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn coordinates_have_two_decimals_and_no_negative_zero() {
        assert_eq!(coordinate(-0.001), "0.00");
        assert_eq!(coordinate(-0.006), "-0.01");
        assert_eq!(coordinate(12.345_6), "12.35");
        assert_eq!(coordinate(f64::NAN), "0.00");
        assert_eq!(coordinate(f64::NEG_INFINITY), "0.00");
    }

    #[test]
    fn people_get_a_real_minus_and_no_noughts_at_the_end() {
        assert_eq!(fixed(-0.25, 1), "\u{2212}0.2");
        assert_eq!(fixed(-0.01, 1), "0.0");
        assert_eq!(short(0.456), "0.456");
        assert_eq!(short(10.0), "10");
        assert_eq!(short(-12.5), "\u{2212}12.5");
        assert_eq!(short(0.0), "0");
        assert_eq!(short(100_000.0), "100000");
        assert_eq!(short(1.5e9), "1.500e9");
    }
}
