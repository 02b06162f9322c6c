//! Arithmetic with twice the digits, for residuals that are small differences of large numbers.
//!
//! Takes ordinary numbers, keeps sums and products of them to about 32 digits and gives the nearest ordinary number.
//! Left out: division and functions.

/// A number kept as the sum of two, with twice the digits (T. J. Dekker, Numer. Math. 18 (1971) 224).
#[derive(Clone, Copy)]
pub(super) struct Twice {
    high: f64,
    low: f64,
}

impl From<f64> for Twice {
    fn from(high: f64) -> Self {
        Self { high, low: 0.0 }
    }
}

impl Twice {
    /// Sum with a number.
    pub(super) fn plus(self, b: f64) -> Self {
        // Knuth's two-sum: the rounding error of an addition is itself a number.
        let high = self.high + b;
        let part = high - self.high;
        let error = (self.high - (high - part)) + (b - part);
        Self { high, low: self.low + error }.tidy()
    }

    /// Sum with a product, which is not rounded.
    pub(super) fn plus_product(self, a: f64, b: f64) -> Self {
        let product = a * b;
        // The fused multiply-add is exact before its one rounding, on every machine.
        let error = a.mul_add(b, -product);
        let sum = self.plus(product);
        Self { high: sum.high, low: sum.low + error }.tidy()
    }

    /// Product with a number.
    pub(super) fn times(self, b: f64) -> Self {
        let high = self.high * b;
        let error = self.high.mul_add(b, -high);
        Self { high, low: self.low * b + error }.tidy()
    }

    fn tidy(self) -> Self {
        let high = self.high + self.low;
        Self { high, low: self.low - (high - self.high) }
    }

    /// Nearest ordinary number.
    pub(super) fn value(self) -> f64 {
        self.high + self.low
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_ordinary_numbers_lose_is_kept() {
        let third = 1.0 / 3.0;
        // 1e16 + 1/3 − 1e16, and (1 + 2⁻³⁰)² − 1 − 2⁻²⁹ = 2⁻⁶⁰.
        assert_eq!(Twice::from(1e16).plus(third).plus(-1e16).value().to_bits(), third.to_bits());
        let e = 1.0 / (1u64 << 30) as f64;
        let square = Twice::from(-1.0).plus(-2.0 * e).plus_product(1.0 + e, 1.0 + e);
        assert_eq!(square.value().to_bits(), (e * e).to_bits());
        let cube = Twice::from(1.0 + e).times(1.0 + e).plus(-1.0).plus(-2.0 * e);
        assert_eq!(cube.value().to_bits(), (e * e).to_bits());
    }
}
