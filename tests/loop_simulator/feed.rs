//! A true orifice on a first stage that feeds the loop, and what the diver knows of it.

use super::Dice;
use ebbline::uptake::InjectionLine;

/// Whole gas in L/min STPD that passes at an absolute pressure upstream and one downstream, in bar, and gas of so many kelvins.
pub(crate) type Passes = Box<dyn Fn(f64, f64, f64) -> f64 + Sync>;

/// What the diver injects through.
pub(crate) struct Feed {
    /// The truth.
    pub(crate) passes: Passes,
    /// The line as the bench made it.
    pub(crate) line: InjectionLine,
    /// What the gauge of the intermediate pressure is off by (true less shown), and its ± (k = 2), bar.
    pub(crate) gauge_off_bar: f64,
    pub(crate) gauge_expanded_bar: f64,
}

impl Feed {
    /// The division of the gauge that comes nearest to a flow in gas of so many kelvins, and the flow that it truly gives.
    pub(crate) fn set(&self, flow: f64, ambient_bar: f64, gas_k: f64, dice: &mut Dice) -> (f64, f64) {
        let at = |ip_bar: f64| (self.passes)(ip_bar + ambient_bar, ambient_bar, gas_k);
        let (mut low, mut high) = (0.0, 30.0);
        for _ in 0..50 {
            let middle = 0.5 * (low + high);
            if at(middle) < flow { low = middle } else { high = middle }
        }
        let shown_bar = ((low - self.gauge_off_bar) / 0.1).round() * 0.1;
        // The needle is read to half a division.
        let true_bar = shown_bar + self.gauge_off_bar + dice.between(-0.05, 0.05);
        (shown_bar, at(true_bar))
    }
}
