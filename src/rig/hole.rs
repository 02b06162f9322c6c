//! The orifice of the rig: what passes at a pressure, a back pressure and a temperature.
//!
//! The law is that of [`crate::gas`]: choked flow of the real gas (ISO 9300), the ellipse of ISO 6358 above the choke
//! ratio, and a discharge coefficient `1 − k/√Re` that holds the flow itself in its Reynolds number.

use crate::gas::{self, Species};
use crate::quantity::{AbsolutePressure, Length, StpdFlow, Temperature};

/// A round hole.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Hole {
    /// Its true diameter.
    pub diameter: Length,
    /// Its choke ratio `b`, from 0 to below 1.
    pub choke_ratio: f64,
    /// `k` of the discharge coefficient; 0 for a perfect hole.
    pub k: f64,
}

impl Hole {
    /// What passes of a gas that stands before the hole at `p1` and `t1` and behind it at `p2`; nothing when `p2` is not
    /// below `p1`.
    #[must_use]
    pub fn flow(
        &self,
        species: Species,
        p1: AbsolutePressure,
        p2: AbsolutePressure,
        t1: Temperature,
    ) -> StpdFlow {
        if p1.as_pa() <= p2.as_pa().max(0.0) {
            return StpdFlow::from_m3_s(0.0);
        }
        let d = self.diameter.as_m();
        let area = std::f64::consts::PI / 4.0 * d * d;
        let share = gas::subsonic_factor(p2.as_pa() / p1.as_pa(), self.choke_ratio);
        let full = gas::choked_mass_flow(species, area, p1, t1) * share / gas::stpd_density(species);
        let mut flow = StpdFlow::from_m3_s(full);
        // The correction is a few per cent, so that each round leaves a hundredth of what was wrong before. Below
        // Re = 4·k² the law is far outside of what it was made for; there half the flow passes.
        for _ in 0..8 {
            let reynolds = gas::reynolds_number(species, flow, self.diameter);
            let root = reynolds.max(4.0 * self.k * self.k).max(1.0).sqrt();
            flow = StpdFlow::from_m3_s(full * (1.0 - self.k / root).max(0.0));
        }
        flow
    }
}
