//! Counting.

/// How often something held.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Tally {
    held: usize,
    of: usize,
}

impl Tally {
    pub(crate) fn add(&mut self, held: bool) {
        self.of += 1;
        self.held += usize::from(held);
    }

    pub(crate) fn of(&self) -> usize {
        self.of
    }

    pub(crate) fn held(&self) -> usize {
        self.held
    }

    /// Share, 0 to 1.
    pub(crate) fn share(&self) -> f64 {
        self.held as f64 / self.of as f64
    }

    /// Standard error of that share.
    pub(crate) fn standard_error(&self) -> f64 {
        (self.share() * (1.0 - self.share()) / self.of as f64).sqrt()
    }
}

impl std::fmt::Display for Tally {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(
            f,
            "{} of {} = {:.2} % ± {:.2} %",
            self.held,
            self.of,
            100.0 * self.share(),
            100.0 * self.standard_error()
        )
    }
}

/// The middle value.
pub(crate) fn median(values: &mut [f64]) -> f64 {
    values.sort_by(f64::total_cmp);
    values[values.len() / 2]
}
