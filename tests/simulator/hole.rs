//! A true orifice: what it passes, from first principles and apart from the crate's own laws.

use ebbline::gas::Species;

/// Molar gas constant, J/(mol·K) (CODATA 2018).
const R: f64 = 8.314_462_618;
/// Litres STPD a minute in one mole a second: `60 · 1000 · R · 273.15 K / 101 325 Pa`.
const L_MIN_PER_MOL_S: f64 = 60.0 * 1000.0 * R * 273.15 / 101_325.0;

/// A gas as the hole sees it.
struct Gas {
    /// kg/mol.
    molar_mass: f64,
    /// Pa·s at 20 °C (CRC handbook, from memory, a few per mille).
    viscosity: f64,
    /// Critical flow function at 20 °C and 1 and 20 bar (rows of `fixtures/reference/gas/critical_flow.csv`); in
    /// between a straight line, which leaves the table by under 2·10⁻⁵.
    c_star: (f64, f64),
}

impl Gas {
    fn of(species: Species) -> Self {
        match species {
            Species::Oxygen => {
                Self { molar_mass: 0.031_999, viscosity: 20.3e-6, c_star: (0.684_609, 0.691_440) }
            }
            Species::Air => {
                Self { molar_mass: 0.028_965, viscosity: 18.2e-6, c_star: (0.685_128, 0.690_550) }
            }
            other => panic!("the simulator knows no {}", other.name()),
        }
    }

    fn c_star(&self, p1_bar: f64) -> f64 {
        let (one, twenty) = self.c_star;
        one + (twenty - one) * (p1_bar - 1.0) / 19.0
    }
}

/// How the flow falls from choked to nothing.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Transition {
    /// The ellipse of ISO 6358 from the choke ratio on.
    Ellipse,
    /// An ideal nozzle, isentropic with γ = 1.4 (Saint-Venant and Wantzel), whatever `b` says.
    Nozzle,
    /// A thin sharp plate (J. A. Perry, Trans. ASME 71 (1949) 757), whatever `b` says.
    Plate,
}

/// A hole.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Hole {
    /// Diameter, m.
    pub(crate) diameter: f64,
    /// Choke ratio.
    pub(crate) b: f64,
    /// Discharge coefficient at endless Reynolds number.
    pub(crate) cd: f64,
    /// `k` of `cd · (1 − k/√Re)`.
    pub(crate) k: f64,
    /// Shape of the transition.
    pub(crate) transition: Transition,
}

impl Hole {
    /// Flow in L/min STPD (an amount of substance: ideal-gas litres) between absolute pressures in bar, gas upstream
    /// at `t1` kelvins.
    pub(crate) fn flow(&self, species: Species, p1_bar: f64, p2_bar: f64, t1: f64) -> f64 {
        let gas = Gas::of(species);
        let area = std::f64::consts::PI / 4.0 * self.diameter * self.diameter;
        let ideal = gas.c_star(p1_bar) * area * p1_bar * 1e5 / (gas.molar_mass * R * t1).sqrt();
        let mut molar = ideal * self.cd * self.share(p2_bar / p1_bar);
        let full = molar;
        // The Reynolds number holds the flow itself; the correction is a few per cent, so five rounds settle it.
        for _ in 0..5 {
            let reynolds =
                4.0 * molar * gas.molar_mass / (std::f64::consts::PI * self.diameter * gas.viscosity);
            molar = full * (1.0 - self.k / reynolds.max(4.0 * self.k * self.k).max(1.0).sqrt());
        }
        molar * L_MIN_PER_MOL_S
    }

    /// Share of the choked flow at a pressure ratio.
    pub(crate) fn share(&self, ratio: f64) -> f64 {
        match self.transition {
            Transition::Ellipse => ellipse(ratio, self.b),
            Transition::Nozzle => isentropic(ratio),
            Transition::Plate => plate(ratio),
        }
    }
}

/// Perry's discharge coefficient times the isentropic expansion, over its value into a vacuum.
fn plate(ratio: f64) -> f64 {
    let r = ratio;
    let cd = 0.8414 + r * (-0.1002 + r * (0.8415 + r * (-3.9 + r * (4.6001 - r * 1.6827))));
    cd / 0.8414 * isentropic(r)
}

/// Isentropic flow of an ideal gas with γ = 1.4 over its choked flow.
fn isentropic(ratio: f64) -> f64 {
    const CRITICAL: f64 = 0.528_281_8;
    let of = |r: f64| (libm::pow(r, 2.0 / 1.4) - libm::pow(r, 2.4 / 1.4)).max(0.0).sqrt();
    if ratio <= CRITICAL { 1.0 } else { of(ratio) / of(CRITICAL) }
}

/// ISO 6358: all of the choked flow up to `b`, an ellipse down to nothing at equal pressures.
fn ellipse(ratio: f64, b: f64) -> f64 {
    if ratio <= b {
        1.0
    } else if ratio >= 1.0 {
        0.0
    } else {
        let x = (ratio - b) / (1.0 - b);
        ((1.0 - x) * (1.0 + x)).sqrt()
    }
}
