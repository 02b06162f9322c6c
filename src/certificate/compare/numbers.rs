//! Numbers compared as printed, never bit by bit.

use crate::certificate::rounding;

/// Relative allowance for what two machines may compute apart.
const RELATIVE: f64 = 1e-9;
/// Share of an uncertainty that may be lost in rounding it (ILAC-P14:09/2020, 5.3).
const LEAST_SHARE: f64 = 0.95;

/// Whether a printed value is the recomputed one to half a unit of its last place, and has at least `fewest` decimals: to
/// fewer places anything would hold.
#[must_use]
pub(super) fn value_holds(printed: &str, exact: f64, fewest: i32) -> bool {
    let Some((value, decimals)) = plain(printed) else { return false };
    if decimals < fewest.max(0) {
        return false;
    }
    // A number that ends before the point has no decimals to show where.
    let place = place(if fewest < 0 { decimals.min(fewest) } else { decimals });
    (value - exact).abs() <= 0.5 * place + RELATIVE * exact.abs()
}

/// Whether a printed uncertainty lies between 0.95 of the recomputed one and that rounded up to the printed place, which is
/// at most one place coarser than it should be.
#[must_use]
pub(super) fn expanded_holds(printed: &str, exact: f64) -> bool {
    let (Some((value, decimals)), Some(expected)) = (plain(printed), rounding::decimals(exact)) else {
        return false;
    };
    if decimals < (expected - 1).max(0) {
        return false;
    }
    let place = place(if expected < 0 { expected } else { decimals });
    let up = (exact / place * (1.0 - RELATIVE)).ceil() * place;
    value >= LEAST_SHARE * exact * (1.0 - RELATIVE) && value <= up * (1.0 + RELATIVE)
}

fn place(decimals: i32) -> f64 {
    libm::pow(10.0, f64::from(-decimals))
}

/// A number in digits with at most a sign and a point, and its decimals. No exponent, no words: none is ever printed.
fn plain(text: &str) -> Option<(f64, i32)> {
    let digits = text.strip_prefix('-').unwrap_or(text);
    let (whole, part) = digits.split_once('.').unwrap_or((digits, ""));
    let all_digits = |text: &str| text.bytes().all(|b| b.is_ascii_digit());
    if whole.is_empty() || text.len() > 40 || !all_digits(whole) || !all_digits(part) {
        return None;
    }
    if digits.ends_with('.') {
        return None;
    }
    Some((text.parse().ok()?, i32::try_from(part.len()).ok()?))
}

/// The numbers in a sentence, in their order, as they stand.
#[must_use]
pub(super) fn in_text(text: &str) -> Vec<&str> {
    let part = |c: char| c.is_numeric() || matches!(c, '.' | ',' | '-' | '−');
    let words = text.split(|c: char| !part(c)).map(|word| word.trim_end_matches(['.', ',', '-', '−']));
    words.filter(|word| word.chars().any(char::is_numeric)).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_value_holds_within_half_a_unit_of_its_last_place() {
        for good in ["0.4803", "0.480", "0.48034", "0.480340"] {
            assert!(value_holds(good, 0.480_34, 3), "{good}");
        }
        for bad in [
            "0.4804", "0.4802", "0.481", "0.48035", "0.48", "0.5", "-0.4803", "4.803e-1", "NaN", "",
            "0.4803.", "+0.4803",
        ] {
            assert!(!value_holds(bad, 0.480_34, 3), "{bad}");
        }
        // To tens, and exactly half a unit.
        assert!(value_holds("12350", 12_345.6, -1) && !value_holds("12360", 12_345.6, -1));
        assert!(value_holds("0.5", 0.45, 1) && value_holds("0.4", 0.45, 1));
    }

    #[test]
    fn numbers_of_a_sentence_are_found_whatever_its_words() {
        let said = "At 10.0 bar it passes 0.4764 ± 0.0040 L/min (95 %, k = 1.96), −0.5 % less.";
        assert_eq!(in_text(said), ["10.0", "0.4764", "0.0040", "95", "1.96", "−0.5"]);
        assert_eq!(in_text("no number - none."), [] as [&str; 0]);
    }

    #[test]
    fn an_uncertainty_holds_from_95_per_cent_to_itself_rounded_up() {
        for good in ["0.0044", "0.0045", "0.005", "0.00441", "0.0042"] {
            assert!(expanded_holds(good, 0.004_41), "{good}");
        }
        for bad in ["0.0041", "0.0046", "0.004", "0.01", "0.00442", "0", "0.0088", "inf"] {
            assert!(!expanded_holds(bad, 0.004_41), "{bad}");
        }
        assert!(expanded_holds("120", 119.0) && !expanded_holds("110", 119.0));
    }
}
