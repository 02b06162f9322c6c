//! The choke ratio `b` of the orifice, and how well a run knows it.
//!
//! Comes in: all points (absolute pressures, flow, random uncertainties) and the effect of each common source on
//! them. Goes out: the posterior of `b`, and the share of flow each point is expected to have lost against full
//! choking. Model: `q = C · p1 · C*(p1)/C*(10 bar) · (1 − k/√Re) · ψ(p2/p1; b)` with ψ of ISO 6358-1; `C` flat,
//! `k` uniform between 0 and 3.5, `b` uniform over what the build allows. `C` and the common errors are
//! integrated out in closed form (they enter linearly), `k` and `b` on a grid. Leaving `k` out would pull `b`
//! down and claim to know it far too well. Left out: any other shape of the transition than the ellipse.

use super::correct::Corrected;
use crate::entry::Build;
use crate::gas::{self, Species};
use crate::quantity::{AbsolutePressure, StpdFlow, Temperature};

/// Largest `k` in the discharge coefficient `1 − k/√Re` of a small hole (from memory, held by the simulated study).
pub const LARGEST_K: f64 = 3.5;
/// 95 % half-width below which a choke ratio counts as measured.
pub const MEASURED_HALF_WIDTH: f64 = 0.05;
/// Significance below which the model is held not to describe the points.
const MODEL_SIGNIFICANCE: f64 = 0.01;
/// Reduced χ² above which a failed model teaches nothing about `b`.
const HOPELESS_REDUCED_CHI_SQUARE: f64 = 4.0;
/// Steps of the grids over `b` (first and second pass) and `k`.
const B_STEPS: usize = 105;
const K_STEPS: usize = 15;

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
        self.grid.iter().map(|&(b, weight)| weight * (1.0 - gas::subsonic_factor(ratio, b))).sum()
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
    let first = model.posterior(low, high);
    // The second pass spends the same number of steps where the first found any weight.
    let top = first.iter().map(|s| s.log_weight).fold(f64::NEG_INFINITY, f64::max);
    let step = (high - low) / (B_STEPS - 1) as f64;
    let alive: Vec<f64> = first.iter().filter(|s| s.log_weight > top - 20.0).map(|s| s.b).collect();
    let (narrow_low, narrow_high) = match (alive.first(), alive.last()) {
        (Some(a), Some(b)) => ((a - step).max(low), (b + step).min(high)),
        _ => (low, high),
    };
    let slices = if narrow_high - narrow_low < 0.5 * (high - low) {
        model.posterior(narrow_low, narrow_high)
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

/// Flow in L/min STPD that the model of this file passes at `p1_bar` for a hole of conductance `c` (L/min per bar at
/// endless Reynolds number), discharge constant `k` and choke ratio `b`.
pub(super) fn modelled_flow(species: Species, (c, k, b): (f64, f64, f64), p1_bar: f64, p2_bar: f64) -> f64 {
    let t = Temperature::from_k(super::correct::REFERENCE_TEMPERATURE_K);
    let c_star = |bar: f64| gas::critical_flow_function(species, AbsolutePressure::from_bar(bar), t);
    let diameter =
        gas::effective_diameter(species, StpdFlow::from_l_min(c), AbsolutePressure::from_bar(1.0), t);
    let full = c * p1_bar * c_star(p1_bar) / c_star(10.0) * gas::subsonic_factor(p2_bar / p1_bar, b);
    let reynolds = gas::reynolds_number(species, StpdFlow::from_l_min(full), diameter).max(1.0);
    full * (1.0 - k / reynolds.sqrt()).max(0.0)
}

/// One value of `b` on the grid.
#[derive(Debug, Clone, Copy)]
struct Slice {
    b: f64,
    log_weight: f64,
    least_chi_square: f64,
}

/// Everything about the points that does not depend on `b` or `k`.
struct Model<'a> {
    points: &'a [ChokePoint],
    effects: &'a [CommonEffect],
    /// `p1 · C*(p1)/C*(10 bar)`, bar.
    choked: Vec<f64>,
    /// `1/√Re`.
    inverse_root_re: Vec<f64>,
    /// A first estimate of `C`, L/min per bar.
    scale: f64,
}

impl<'a> Model<'a> {
    fn new(species: Species, points: &'a [ChokePoint], effects: &'a [CommonEffect]) -> Self {
        let t = Temperature::from_k(super::correct::REFERENCE_TEMPERATURE_K);
        let c_star = |bar: f64| gas::critical_flow_function(species, AbsolutePressure::from_bar(bar), t);
        let reference = c_star(10.0);
        let choked: Vec<f64> =
            points.iter().map(|p| p.corrected.p1_bar * c_star(p.corrected.p1_bar) / reference).collect();
        let scale = points
            .iter()
            .zip(&choked)
            .map(|(p, g)| p.corrected.flow_l_min / g)
            .fold(f64::MIN_POSITIVE, f64::max);
        let diameter =
            gas::effective_diameter(species, StpdFlow::from_l_min(scale), AbsolutePressure::from_bar(1.0), t);
        let inverse_root_re = points
            .iter()
            .map(|p| {
                // A reading of almost nothing still has a jet; one per cent of the largest flow keeps 1/√Re finite.
                let flow = StpdFlow::from_l_min(p.corrected.flow_l_min.max(0.01 * scale));
                1.0 / gas::reynolds_number(species, flow, diameter).max(1.0).sqrt()
            })
            .collect();
        Self { points, effects, choked, inverse_root_re, scale }
    }

    fn posterior(&self, low: f64, high: f64) -> Vec<Slice> {
        let mut work = Work::new(self.points.len(), self.effects.len());
        (0..B_STEPS)
            .map(|i| {
                let b = low + (high - low) * i as f64 / (B_STEPS - 1) as f64;
                self.slice(b, &mut work)
            })
            .collect()
    }

    /// The weight of one `b`, with `C` and the common errors integrated out in closed form and `k` on its grid.
    ///
    /// The model is `m = a − k·c` with `a = choked·ψ` and `c = a/√Re`, so that every quadratic form in `m` is a
    /// polynomial in `k`. The covariance is `V = Λ + D·Dᵀ`, Λ diagonal (random parts) and a column of `D` for each
    /// common source; `V⁻¹` is applied by the Woodbury identity.
    fn slice(&self, b: f64, work: &mut Work) -> Slice {
        let n = self.points.len();
        let mut log_diagonal = 0.0;
        let mut product = 1.0_f64;
        for i in 0..n {
            let p = &self.points[i];
            let ratio = p.corrected.p2_bar / p.corrected.p1_bar;
            let (psi, psi_slope) = psi_and_slope(ratio, b);
            let choked = self.choked[i];
            let a = choked * psi;
            work.a[i] = a;
            work.c[i] = a * self.inverse_root_re[i];
            // dq/dp1 and dq/dp2 of the model without k, which changes them by a few per cent only.
            let by_p1 = self.scale * (psi - psi_slope * ratio) * choked / p.corrected.p1_bar;
            let by_p2 = self.scale * psi_slope * choked / p.corrected.p1_bar;
            let variance = p.flow_u * p.flow_u + by_p1 * by_p1 * p.pressure_u * p.pressure_u;
            product *= variance / (p.flow_u * p.flow_u).max(f64::MIN_POSITIVE);
            if !(1e-200..1e200).contains(&product) {
                log_diagonal += libm::log(product);
                product = 1.0;
            }
            work.weight[i] = 1.0 / variance;
            for (s, effect) in self.effects.iter().enumerate() {
                work.d[s * n + i] =
                    effect.flow_l_min[i] - by_p1 * effect.p1_bar[i] - by_p2 * effect.p2_bar[i];
            }
        }
        log_diagonal += libm::log(product);
        let log_determinant = log_diagonal + work.factor(n, self.effects.len());
        work.q.iter_mut().zip(self.points).for_each(|(q, p)| *q = p.corrected.flow_l_min);
        let forms = work.forms(n, self.effects.len());
        let mut least = f64::INFINITY;
        let mut logs = [0.0; K_STEPS];
        for (j, log) in logs.iter_mut().enumerate() {
            let k = LARGEST_K * j as f64 / (K_STEPS - 1) as f64;
            let mm = forms.aa - k * (2.0 * forms.ac - k * forms.cc);
            let mq = forms.aq - k * forms.cq;
            let chi_square = forms.qq - mq * mq / mm;
            least = least.min(chi_square);
            *log = -0.5 * (chi_square + libm::log(mm));
        }
        let top = logs.iter().copied().fold(f64::NEG_INFINITY, f64::max);
        let sum: f64 = logs
            .iter()
            .enumerate()
            .map(|(j, log)| {
                // Trapezoidal rule: the two ends count half.
                let share = if j == 0 || j == K_STEPS - 1 { 0.5 } else { 1.0 };
                share * libm::exp(log - top)
            })
            .sum();
        Slice { b, log_weight: top + libm::log(sum) - 0.5 * log_determinant, least_chi_square: least }
    }
}

/// ψ of ISO 6358-1 and its slope by the pressure ratio.
fn psi_and_slope(ratio: f64, b: f64) -> (f64, f64) {
    let psi = gas::subsonic_factor(ratio, b);
    if ratio <= b || psi <= 0.0 {
        return (psi, 0.0);
    }
    let one_minus_b = 1.0 - b;
    // Very near p2 = p1 the slope grows without bound; a tenth of full flow is as far as it is followed.
    (psi, -(ratio - b) / (one_minus_b * one_minus_b) / psi.max(0.1))
}

/// Quadratic forms through `V⁻¹`.
struct Forms {
    aa: f64,
    ac: f64,
    cc: f64,
    aq: f64,
    cq: f64,
    qq: f64,
}

/// Buffers of one posterior.
struct Work {
    a: Vec<f64>,
    c: Vec<f64>,
    q: Vec<f64>,
    weight: Vec<f64>,
    /// Column `s` of `D` at `s·n`.
    d: Vec<f64>,
    /// Lower Cholesky factor of `I + Dᵀ·Λ⁻¹·D`, row by row.
    cholesky: Vec<f64>,
    projected: [Vec<f64>; 3],
}

impl Work {
    fn new(n: usize, s: usize) -> Self {
        let zeros = |len| vec![0.0; len];
        Self {
            a: zeros(n),
            c: zeros(n),
            q: zeros(n),
            weight: zeros(n),
            d: zeros(n * s),
            cholesky: zeros(s * s),
            projected: [zeros(s), zeros(s), zeros(s)],
        }
    }

    /// Factorises `I + Dᵀ·Λ⁻¹·D` and returns the logarithm of its determinant.
    fn factor(&mut self, n: usize, s: usize) -> f64 {
        let mut determinant_root = 1.0;
        for row in 0..s {
            for column in 0..=row {
                let (dr, dc) = (&self.d[row * n..(row + 1) * n], &self.d[column * n..(column + 1) * n]);
                let mut sum = if row == column { 1.0 } else { 0.0 };
                for i in 0..n {
                    sum += dr[i] * dc[i] * self.weight[i];
                }
                for j in 0..column {
                    sum -= self.cholesky[row * s + j] * self.cholesky[column * s + j];
                }
                if row == column {
                    // The matrix is the identity plus a sum of squares, so the pivot is at least one but for rounding.
                    let pivot = sum.max(f64::EPSILON).sqrt();
                    self.cholesky[row * s + row] = pivot;
                    determinant_root *= pivot;
                } else {
                    self.cholesky[row * s + column] = sum / self.cholesky[column * s + column];
                }
            }
        }
        2.0 * libm::log(determinant_root)
    }

    fn forms(&mut self, n: usize, s: usize) -> Forms {
        let vectors = [&self.a, &self.c, &self.q];
        for (vector, projected) in vectors.iter().zip(&mut self.projected) {
            for row in 0..s {
                let d = &self.d[row * n..(row + 1) * n];
                let mut sum = 0.0;
                for i in 0..n {
                    sum += d[i] * self.weight[i] * vector[i];
                }
                for j in 0..row {
                    sum -= self.cholesky[row * s + j] * projected[j];
                }
                projected[row] = sum / self.cholesky[row * s + row];
            }
        }
        let form = |x: usize, y: usize| -> f64 {
            let direct: f64 = (0..n).map(|i| vectors[x][i] * self.weight[i] * vectors[y][i]).sum();
            let common: f64 = (0..s).map(|j| self.projected[x][j] * self.projected[y][j]).sum();
            direct - common
        };
        Forms {
            aa: form(0, 0),
            ac: form(0, 1),
            cc: form(1, 1),
            aq: form(0, 2),
            cq: form(1, 2),
            qq: form(2, 2),
        }
    }
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
    let weights: Vec<f64> = slices
        .iter()
        .enumerate()
        .map(|(i, s)| {
            let share = if i == 0 || i == last { 0.5 } else { 1.0 };
            share * libm::exp((s.log_weight - top) / temper)
        })
        .collect();
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
