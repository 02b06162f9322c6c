//! Random numbers of the simulator, apart from the crate's own generator.

/// SplitMix64 (G. Steele, D. Lea, C. Flood, OOPSLA 2014; constants from memory of the public-domain reference code),
/// with normal deviates by Box and Muller (Ann. Math. Stat. 29 (1958) 610).
pub(crate) struct Random(u64);

impl Random {
    pub(crate) fn new(seed: u64) -> Self {
        Self(seed)
    }

    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform between two values.
    pub(crate) fn uniform(&mut self, low: f64, high: f64) -> f64 {
        let unit = ((self.next() >> 11) as f64 + 0.5) / (1_u64 << 53) as f64;
        low + (high - low) * unit
    }

    /// A whole number from `low` to `high`, both included.
    pub(crate) fn whole(&mut self, low: usize, high: usize) -> usize {
        low + (self.uniform(0.0, (high - low + 1) as f64) as usize).min(high - low)
    }

    /// Normal with mean zero and standard deviation `sd`.
    pub(crate) fn normal(&mut self, sd: f64) -> f64 {
        let (u, v) = (self.uniform(0.0, 1.0), self.uniform(0.0, 1.0));
        sd * (-2.0 * libm::log(u)).sqrt() * libm::cos(2.0 * std::f64::consts::PI * v)
    }

    /// Whether something of this probability happens.
    pub(crate) fn chance(&mut self, probability: f64) -> bool {
        self.uniform(0.0, 1.0) < probability
    }
}
