//! The choke ratio `b` of the orifice, and how well a run knows it.
//!
//! Comes in: all points (absolute pressures, flow, random uncertainties) and the effect of each common source on
//! them. Goes out: the posterior of `b`, and the share of flow each point is expected to have lost against full
//! choking. Model: `q = C · p1 · C*(p1)/C*(10 bar) · (1 − k/√Re) · ψ(p2/p1; b)` with ψ of ISO 6358-1; `C` flat,
//! `k` uniform between 0 and 3.5, `b` uniform over what the build allows. `C` and the common errors are
//! integrated out in closed form (they enter linearly, the common error of `p1` to second order), `k` and `b` on a
//! grid. Leaving `k` out would pull `b` down and claim to know it far too well. Left out: any other shape of the
//! transition than the ellipse; an ideal nozzle is covered all the same, a plate that never chokes has no `b`.

use super::choke_model::{Model, Slice};
use super::correct::Corrected;
use crate::entry::Build;
use crate::gas::{self, Species};

/// Largest `k` in the discharge coefficient `1 − k/√Re` of a small hole (from memory, held by the simulated study).
pub const LARGEST_K: f64 = 3.5;
/// 95 % half-width below which a choke ratio counts as measured.
pub const MEASURED_HALF_WIDTH: f64 = 0.05;
/// Significance below which the model is held not to describe the points.
const MODEL_SIGNIFICANCE: f64 = 0.01;
/// Reduced χ² above which a failed model teaches nothing about `b`.
const HOPELESS_REDUCED_CHI_SQUARE: f64 = 4.0;
/// Steps of the grid over `b`, in the first and in the second pass.
const B_STEPS: usize = 105;

/// How the choke ratio is known.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Origin {
    /// The run has points low enough: 95 % half-width under [`MEASURED_HALF_WIDTH`], and the model fits.
    Measured,
    /// The run only narrows what was known beforehand.
    Bounded,
}

/// What is known of the choke ratio.
#[derive(Debug, Clone, PartialEq)]
pub struct ChokeRatio {
    /// Posterior mean.
    pub value: f64,
    /// Posterior standard deviation.
    pub standard_uncertainty: f64,
    /// 95 % interval of equal tails.
    pub interval_95: (f64, f64),
    /// How it is known.
    pub origin: Origin,
    /// χ² of the best model, and its degrees of freedom.
    pub chi_square: f64,
    /// Degrees of freedom of that χ².
    pub dof: f64,
    /// Whether the model describes the points.
    pub model_fits: bool,
    grid: Vec<(f64, f64)>,
}

/// One point as the posterior sees it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct ChokePoint {
    /// The corrected reading.
    pub corrected: Corrected,
    /// Random standard uncertainty of `p1`, bar.
    pub pressure_u: f64,
    /// Random standard uncertainty of the flow, L/min.
    pub flow_u: f64,
}

/// What a common source does to each point when it moves by one standard uncertainty.
#[derive(Debug, Clone, PartialEq)]
pub struct CommonEffect {
    /// Change of `p1` in bar, point by point.
    pub p1_bar: Vec<f64>,
    /// Change of `p2` in bar, point by point.
    pub p2_bar: Vec<f64>,
    /// Change of the flow in L/min, point by point.
    pub flow_l_min: Vec<f64>,
}

/// The choke ratios a build allows beforehand (from memory and the literature gathered in
/// `fixtures/reference/gas/README.md`): a thin sharp plate never chokes fully, a tube as long as wide does.
#[must_use]
pub const fn prior(build: Build) -> (f64, f64) {
    match build {
        Build::ThinPlate => (0.08, 0.40),
        Build::ShortTube => (0.35, 0.60),
        Build::Nozzle => (0.45, 0.60),
        Build::Unknown => (0.08, 0.60),
    }
}

impl ChokeRatio {
    /// Share of the choked flow expected to be lost at a pressure ratio, averaged over what is known of `b`.
    #[must_use]
    pub fn expected_loss(&self, ratio: f64) -> f64 {
        // From the ratio on, a hole is choked and loses nothing.
        let not_choked = self.grid.iter().take_while(|(b, _)| *b < ratio);
        not_choked.map(|&(b, weight)| weight * (1.0 - gas::subsonic_factor(ratio, b))).sum()
    }

    /// The value below which `b` lies with `probability`.
    #[must_use]
    pub fn quantile(&self, probability: f64) -> f64 {
        quantile(&self.grid, probability)
    }

    /// Half the 95 % interval.
    #[must_use]
    pub fn half_width(&self) -> f64 {
        (self.interval_95.1 - self.interval_95.0) / 2.0
    }
}

/// The posterior of `b` from all points of a run.
///
/// `effects` holds one entry a common source, each with as many values as there are points.
#[must_use]
pub fn choke_ratio(
    species: Species,
    build: Build,
    points: &[ChokePoint],
    effects: &[CommonEffect],
) -> ChokeRatio {
    let (low, high) = prior(build);
    let model = Model::new(species, points, effects);
    let first = model.posterior(low, high, B_STEPS);
    // The second pass spends the same number of steps where the first found any weight.
    let top = first.iter().map(|s| s.log_weight).fold(f64::NEG_INFINITY, f64::max);
    let step = (high - low) / (B_STEPS - 1) as f64;
    let alive: Vec<f64> = first.iter().filter(|s| s.log_weight > top - 20.0).map(|s| s.b).collect();
    let (narrow_low, narrow_high) = match (alive.first(), alive.last()) {
        (Some(a), Some(b)) => ((a - step).max(low), (b + step).min(high)),
        _ => (low, high),
    };
    let slices = if narrow_high - narrow_low < 0.5 * (high - low) {
        model.posterior(narrow_low, narrow_high, B_STEPS)
    } else {
        first
    };
    let chi_square = slices.iter().map(|s| s.least_chi_square).fold(f64::INFINITY, f64::min);
    // `C`, `k` and `b` are taken from the points.
    let dof = (points.len() as f64 - 3.0).max(1.0);
    let reduced = chi_square / dof;
    let model_fits = chi_square_tail(chi_square, dof) >= MODEL_SIGNIFICANCE;
    let slices = if model_fits || reduced < HOPELESS_REDUCED_CHI_SQUARE {
        slices
    } else {
        // A run that no choke ratio explains (pressures an atmosphere off, say) must not teach one.
        slices_of_prior(low, high)
    };
    // Where the points scatter more than stated, what they say of `b` counts for less, as for the line.
    let temper = if model_fits { 1.0 } else { reduced.max(1.0) };
    summarise(
        &slices,
        if reduced < HOPELESS_REDUCED_CHI_SQUARE { temper } else { 1.0 },
        chi_square,
        dof,
        model_fits,
    )
}

fn slices_of_prior(low: f64, high: f64) -> Vec<Slice> {
    (0..B_STEPS)
        .map(|i| Slice {
            b: low + (high - low) * i as f64 / (B_STEPS - 1) as f64,
            log_weight: 0.0,
            least_chi_square: f64::INFINITY,
        })
        .collect()
}

fn summarise(slices: &[Slice], temper: f64, chi_square: f64, dof: f64, model_fits: bool) -> ChokeRatio {
    let top = slices.iter().map(|s| s.log_weight).fold(f64::NEG_INFINITY, f64::max);
    let last = slices.len() - 1;
    let mut weights: Vec<f64> = Vec::with_capacity(slices.len());
    for (i, s) in slices.iter().enumerate() {
        // Where all points are choked one slice is like the one before.
        let weight = match i.checked_sub(1).map(|before| (slices[before].log_weight, weights[before])) {
            Some((log_weight, weight)) if log_weight.to_bits() == s.log_weight.to_bits() => weight,
            _ => libm::exp((s.log_weight - top) / temper),
        };
        weights.push(weight);
    }
    weights[0] *= 0.5;
    weights[last] *= 0.5;
    let sum: f64 = weights.iter().sum();
    let grid: Vec<(f64, f64)> = slices.iter().zip(&weights).map(|(s, w)| (s.b, w / sum)).collect();
    let value: f64 = grid.iter().map(|(b, w)| b * w).sum();
    let variance: f64 = grid.iter().map(|(b, w)| (b - value) * (b - value) * w).sum();
    let interval_95 = (quantile(&grid, 0.025), quantile(&grid, 0.975));
    let narrow = (interval_95.1 - interval_95.0) / 2.0 < MEASURED_HALF_WIDTH;
    let origin = if narrow && model_fits { Origin::Measured } else { Origin::Bounded };
    ChokeRatio {
        value,
        standard_uncertainty: variance.max(0.0).sqrt(),
        interval_95,
        origin,
        chi_square,
        dof,
        model_fits,
        grid,
    }
}

/// Quantile of a density given on an even grid, whose end points carry half a cell.
fn quantile(grid: &[(f64, f64)], probability: f64) -> f64 {
    let step = if grid.len() > 1 { grid[1].0 - grid[0].0 } else { 0.0 };
    let last = grid.len() - 1;
    let mut below = 0.0;
    for (i, &(b, weight)) in grid.iter().enumerate() {
        if below + weight >= probability && weight > 0.0 {
            let (left, width) = match i {
                0 => (b, step / 2.0),
                _ if i == last => (b - step / 2.0, step / 2.0),
                _ => (b - step / 2.0, step),
            };
            return left + width * (probability - below) / weight;
        }
        below += weight;
    }
    grid[last].0
}

/// Probability that a χ² of `dof` degrees of freedom is at least `chi_square`.
fn chi_square_tail(chi_square: f64, dof: f64) -> f64 {
    crate::stats::distribution::chi_squared_upper(chi_square, dof)
}
