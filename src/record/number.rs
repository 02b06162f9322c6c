//! Decimal numbers from bytes, fast.
//!
//! Read is what loggers write: an optional sign, digits with at most one decimal mark, an optional exponent. The value
//! is the double nearest to the decimal, exactly as the standard library's parser gives it; words such as `nan` and
//! `inf`, which that parser takes, are not numbers here. A series of a million rows is mostly this function.

/// Powers of ten that a double holds exactly: all up to 10^22.
const EXACT_POWERS: [f64; 23] = [
    1e0, 1e1, 1e2, 1e3, 1e4, 1e5, 1e6, 1e7, 1e8, 1e9, 1e10, 1e11, 1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18,
    1e19, 1e20, 1e21, 1e22,
];

/// Largest integer up to which a double holds every integer.
const EXACT_INTEGER: u64 = 1 << 53;

/// Which decimal mark a number was written with.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Mark {
    /// It has none.
    None,
    /// A point.
    Point,
    /// A comma.
    Comma,
}

/// The number in `cell`, and its decimal mark; none when it is not one, or too large for a double.
pub(super) fn parse(cell: &[u8]) -> Option<(f64, Mark)> {
    let (negative, digits) = match cell.first()? {
        b'-' => (true, &cell[1..]),
        b'+' => (false, &cell[1..]),
        _ => (false, cell),
    };
    let mut mark = Mark::None;
    let mut mantissa: u64 = 0;
    let mut significant = 0_u32;
    let mut any_digit = false;
    let mut behind_mark: i32 = 0;
    let mut exponent: i32 = 0;
    let mut rest = digits;
    while let Some((&byte, tail)) = rest.split_first() {
        match byte {
            b'0'..=b'9' => {
                any_digit = true;
                // Past 19 digits the mantissa no longer counts: the slow road reads the text itself.
                if significant > 0 || byte != b'0' {
                    significant += 1;
                }
                mantissa = mantissa.wrapping_mul(10).wrapping_add(u64::from(byte - b'0'));
                behind_mark = behind_mark.saturating_add(i32::from(mark != Mark::None));
            }
            b'.' if mark == Mark::None => mark = Mark::Point,
            b',' if mark == Mark::None => mark = Mark::Comma,
            b'e' | b'E' if any_digit => {
                exponent = parse_exponent(tail)?;
                break;
            }
            _ => return None,
        }
        rest = tail;
    }
    if !any_digit {
        return None;
    }
    let power = exponent.saturating_sub(behind_mark);
    let size = power.unsigned_abs() as usize;
    // Both factors are exact doubles, so the one rounding of the product or quotient is the right one (W. D. Clinger,
    // "How to read floating point numbers accurately", PLDI 1990).
    if significant <= 19 && mantissa <= EXACT_INTEGER && size < EXACT_POWERS.len() {
        let whole = mantissa as f64;
        let value = if power < 0 { whole / EXACT_POWERS[size] } else { whole * EXACT_POWERS[size] };
        return Some((if negative { -value } else { value }, mark));
    }
    slow(cell).map(|value| (value, mark))
}

fn parse_exponent(bytes: &[u8]) -> Option<i32> {
    let (negative, digits) = match bytes.first()? {
        b'-' => (true, &bytes[1..]),
        b'+' => (false, &bytes[1..]),
        _ => (false, bytes),
    };
    if digits.is_empty() || !digits.iter().all(u8::is_ascii_digit) {
        return None;
    }
    let size = digits
        .iter()
        .fold(0_i32, |sum, digit| sum.saturating_mul(10).saturating_add(i32::from(digit - b'0')));
    Some(if negative { -size } else { size })
}

#[cold]
fn slow(cell: &[u8]) -> Option<f64> {
    let text = std::str::from_utf8(cell).ok()?.replacen(',', ".", 1);
    text.parse().ok().filter(|value: &f64| value.is_finite())
}

#[cfg(test)]
mod tests {
    use proptest::prelude::*;

    use super::*;

    #[test]
    fn words_and_halves_of_numbers_are_not_numbers() {
        for bad in [
            "", "-", ".", "e5", "1e", "1e+", "nan", "NaN", "inf", "-inf", "1.2.3", "1,2.3", "1 2", "0x10",
            "1_0", "1e9999",
        ] {
            assert_eq!(parse(bad.as_bytes()), None, "{bad}");
        }
    }

    #[test]
    fn decimal_marks_are_told() {
        assert_eq!(parse(b"0,48"), Some((0.48, Mark::Comma)));
        assert_eq!(parse(b"-.5"), Some((-0.5, Mark::Point)));
        assert_eq!(parse(b"+7."), Some((7.0, Mark::Point)));
        assert_eq!(parse(b"12e-1"), Some((1.2, Mark::None)));
    }

    proptest! {
        #[test]
        fn every_decimal_is_the_double_of_the_standard_parser(text in "[-+]?[0-9]{0,22}\\.?[0-9]{1,24}(e[-+]?[0-9]{1,3})?") {
            let want: f64 = text.parse().unwrap();
            let got = parse(text.as_bytes()).map(|(value, _)| value.to_bits());
            prop_assert_eq!(got, want.is_finite().then(|| want.to_bits()));
        }

        #[test]
        fn shortest_digits_of_a_double_read_back_to_the_same_bits(bits: u64) {
            let want = f64::from_bits(bits);
            prop_assume!(want.is_finite());
            let got = parse(format!("{want}").as_bytes()).map(|(value, _)| value.to_bits());
            prop_assert_eq!(got, Some(want.to_bits()));
        }
    }
}
