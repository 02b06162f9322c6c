//! The likelihood of the choke ratio: one value of `b` at a time, everything else integrated out.
//!
//! Comes in: the points of a run and the effects of the common sources on them. Goes out: a [`Slice`] for each `b` of
//! an even grid. The model (see [`super::choke`]) is `m = a − k·c` with `a = choked·ψ` and `c = a/√Re`, so that every
//! quadratic form in `m` is a polynomial in `k`. The covariance is `V = Λ + D·Dᵀ`, Λ diagonal (random parts) and a
//! column of `D` for each common source, and one for the second order of all that is common to `p1`: near `p2 = p1` ψ
//! bends within an error of a tenth of a bar. `V⁻¹` is applied by the Woodbury identity, for which sums over the points
//! are all that is needed. A point that is choked for one `b` is choked for every larger one, so its share of the sums is
//! worked out once; only the points still below choking are added anew for each `b`.

use super::choke::{ChokePoint, CommonEffect, LARGEST_K};
use super::correct::SOURCES;
use crate::gas::{self, Species};
use crate::quantity::{AbsolutePressure, StpdFlow, Temperature};

/// Steps of the grid over `k`.
const K_STEPS: usize = 15;

/// One value of `b` on the grid.
#[derive(Debug, Clone, Copy)]
pub(super) struct Slice {
    pub(super) b: f64,
    /// Logarithm of its weight, up to a constant.
    pub(super) log_weight: f64,
    /// χ² at the best `C`, `k` and common errors.
    pub(super) least_chi_square: f64,
}

/// Flow in L/min STPD that the model passes at `p1_bar` for a hole of conductance `c` (L/min per bar at
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

/// Everything about the points that does not depend on `b` or `k`, points in rising order of their pressure ratio.
pub(super) struct Model {
    points: Vec<ModelPoint>,
    /// Effects of the common sources on `p1`, `p2` and flow, all sources of a point together.
    effects: Vec<[f64; 3]>,
    sources: usize,
    /// A first estimate of `C`, L/min per bar.
    scale: f64,
}

struct ModelPoint {
    ratio: f64,
    flow_l_min: f64,
    pressure_variance: f64,
    /// Variance of `p1` from all common sources together, as a share of `p1²`.
    common_share: f64,
    flow_variance: f64,
    /// `p1 · C*(p1)/C*(10 bar)`, bar.
    choked: f64,
    /// The same with the first estimate of `C`, over `p1`: L/min per bar.
    per_bar: f64,
    /// `1/√Re`.
    inverse_root_re: f64,
}

impl Model {
    pub(super) fn new(species: Species, points: &[ChokePoint], effects: &[CommonEffect]) -> Self {
        let t = Temperature::from_k(super::correct::REFERENCE_TEMPERATURE_K);
        let c_star = |bar: f64| gas::critical_flow_function(species, AbsolutePressure::from_bar(bar), t);
        let reference = c_star(10.0);
        let choked = |p: &ChokePoint| p.corrected.p1_bar * c_star(p.corrected.p1_bar) / reference;
        let scale =
            points.iter().map(|p| p.corrected.flow_l_min / choked(p)).fold(f64::MIN_POSITIVE, f64::max);
        let diameter =
            gas::effective_diameter(species, StpdFlow::from_l_min(scale), AbsolutePressure::from_bar(1.0), t);
        let model_point = |i: usize| {
            let p = &points[i];
            // A reading of almost nothing still has a jet; one per cent of the largest flow keeps 1/√Re finite.
            let flow = StpdFlow::from_l_min(p.corrected.flow_l_min.max(0.01 * scale));
            ModelPoint {
                ratio: p.corrected.p2_bar / p.corrected.p1_bar,
                flow_l_min: p.corrected.flow_l_min,
                pressure_variance: p.pressure_u * p.pressure_u,
                common_share: effects.iter().map(|e| e.p1_bar[i] * e.p1_bar[i]).sum::<f64>()
                    / (p.corrected.p1_bar * p.corrected.p1_bar),
                flow_variance: p.flow_u * p.flow_u,
                choked: choked(p),
                per_bar: scale * choked(p) / p.corrected.p1_bar,
                inverse_root_re: 1.0 / gas::reynolds_number(species, flow, diameter).max(1.0).sqrt(),
            }
        };
        let ratio = |i: usize| points[i].corrected.p2_bar / points[i].corrected.p1_bar;
        let mut order: Vec<usize> = (0..points.len()).collect();
        order.sort_by(|&i, &j| ratio(i).total_cmp(&ratio(j)));
        let effect_on = |i: usize| effects.iter().map(move |e| [e.p1_bar[i], e.p2_bar[i], e.flow_l_min[i]]);
        Self {
            effects: order.iter().flat_map(|&i| effect_on(i)).collect(),
            points: order.iter().map(|&i| model_point(i)).collect(),
            sources: effects.len(),
            scale,
        }
    }

    /// A slice for each of `steps` values of `b` from `low` to `high`.
    pub(super) fn posterior(&self, low: f64, high: f64, steps: usize) -> Vec<Slice> {
        if self.sources < FEW_COLUMNS {
            self.slices::<FEW_COLUMNS>(low, high, steps)
        } else {
            self.slices::<MOST_COLUMNS>(low, high, steps)
        }
    }

    fn slices<const S: usize>(&self, low: f64, high: f64, steps: usize) -> Vec<Slice> {
        let mut slices: Vec<Slice> = Vec::with_capacity(steps);
        let mut choked = Sums::<S>::new();
        let mut choked_points = 0;
        for i in 0..steps {
            let b = low + (high - low) * i as f64 / (steps - 1) as f64;
            // With every point choked already, a larger b changes nothing.
            if let Some(last) = slices.last().copied().filter(|_| choked_points == self.points.len()) {
                slices.push(Slice { b, ..last });
                continue;
            }
            while choked_points < self.points.len() && self.points[choked_points].ratio <= b {
                self.add(choked_points, b, &mut choked);
                choked_points += 1;
            }
            let mut all = choked.clone();
            for point in choked_points..self.points.len() {
                self.add(point, b, &mut all);
            }
            slices.push(slice(b, &all));
        }
        slices
    }

    /// Adds what one point contributes for one `b`.
    fn add<const S: usize>(&self, index: usize, b: f64, sums: &mut Sums<S>) {
        let p = &self.points[index];
        let Psi { psi, slope: psi_slope, curvature } = Psi::of(p.ratio, b);
        // d²(p1·ψ)/dp1² times the variance of what is common to all p1, over p1: its half is the mean shift of ψ.
        let second_order = curvature * p.ratio * p.ratio * p.common_share;
        let a = p.choked * (psi + 0.5 * second_order);
        // dq/dp1 and dq/dp2 of the model without k, which changes them by a few per cent only.
        let by_p1 = p.per_bar * (psi - psi_slope * p.ratio);
        let by_p2 = p.per_bar * psi_slope;
        let variance = p.flow_variance + by_p1 * by_p1 * p.pressure_variance;
        let effects = &self.effects[index * self.sources..(index + 1) * self.sources];
        let mut d = [0.0; S];
        for (d, [p1, p2, flow]) in d.iter_mut().zip(effects) {
            *d = flow - by_p1 * p1 - by_p2 * p2;
        }
        // z² of a standard normal z has the standard deviation √2 and is not correlated with z.
        d[S - 1] = self.scale * p.choked * second_order * std::f64::consts::FRAC_1_SQRT_2;
        sums.add(&d, [a, a * p.inverse_root_re, p.flow_l_min], 1.0 / variance);
        sums.product *= variance / p.flow_variance.max(f64::MIN_POSITIVE);
        if !(1e-200..1e200).contains(&sums.product) {
            sums.log_diagonal += libm::log(sums.product);
            sums.product = 1.0;
        }
    }
}

/// ψ of ISO 6358-1 with its slope and curvature by the pressure ratio.
struct Psi {
    psi: f64,
    slope: f64,
    curvature: f64,
}

impl Psi {
    fn of(ratio: f64, b: f64) -> Self {
        let psi = gas::subsonic_factor(ratio, b);
        if ratio <= b || psi <= 0.0 {
            return Self { psi, slope: 0.0, curvature: 0.0 };
        }
        let per_width = 1.0 / (1.0 - b);
        // Very near p2 = p1 both grow without bound; a tenth of full flow is as far as they are followed.
        let per_psi = 1.0 / psi.max(0.1);
        let steep = -per_width * per_width * per_psi;
        Self { psi, slope: (ratio - b) * steep, curvature: steep * per_psi * per_psi }
    }
}

/// Pairs of the vectors a, c, q in the order their forms are kept: aa, ac, cc, aq, cq, qq.
const PAIRS: [(usize, usize); 6] = [(0, 0), (0, 1), (1, 1), (0, 2), (1, 2), (2, 2)];

/// Columns of `D` for which there is room, of which the last is that of the second order; columns that are not needed
/// stay zero and change nothing. The run of a mass-reading meter needs the few, and its sums are worked out without a
/// loop.
const FEW_COLUMNS: usize = 6;
const MOST_COLUMNS: usize = SOURCES + 1;

/// Sums over points.
#[derive(Clone)]
struct Sums<const S: usize> {
    /// `Dᵀ·Λ⁻¹·D`, of which the lower triangle is filled.
    gram: [[f64; S]; S],
    /// `Dᵀ·Λ⁻¹·v` for v = a, c, q, the three of a source together.
    projected: [[f64; 3]; S],
    /// `vᵀ·Λ⁻¹·w` for the [`PAIRS`].
    forms: [f64; 6],
    /// Logarithm of the product of the variances, each over its flow part; `product` is still to be taken in.
    log_diagonal: f64,
    product: f64,
}

impl<const S: usize> Sums<S> {
    fn new() -> Self {
        Self {
            gram: [[0.0; S]; S],
            projected: [[0.0; 3]; S],
            forms: [0.0; 6],
            log_diagonal: 0.0,
            product: 1.0,
        }
    }

    fn add(&mut self, d: &[f64; S], v: [f64; 3], weight: f64) {
        for (form, (i, j)) in self.forms.iter_mut().zip(PAIRS) {
            *form += v[i] * v[j] * weight;
        }
        for row in 0..S {
            let weighted = d[row] * weight;
            self.projected[row].iter_mut().zip(v).for_each(|(p, v)| *p += weighted * v);
            self.gram[row][..=row].iter_mut().zip(d).for_each(|(entry, d)| *entry += weighted * d);
        }
    }
}

/// Takes the common errors, `C` and `k` out of the sums.
fn slice<const S: usize>(b: f64, sums: &Sums<S>) -> Slice {
    let (cholesky, log_gram) = factor(&sums.gram);
    let log_determinant = sums.log_diagonal + libm::log(sums.product) + log_gram;
    let [aa, ac, cc, aq, cq, qq] = forms(sums, &cholesky);
    let at_k = |j: usize| {
        let k = LARGEST_K * j as f64 / (K_STEPS - 1) as f64;
        let mm = aa - k * (2.0 * ac - k * cc);
        let mq = aq - k * cq;
        (qq - mq * mq / mm, mm)
    };
    let mut grid = [(0.0, 0.0); K_STEPS];
    grid.iter_mut().enumerate().for_each(|(j, at)| *at = at_k(j));
    let least = grid.iter().map(|(chi_square, _)| *chi_square).fold(f64::INFINITY, f64::min);
    let sum: f64 = grid
        .iter()
        .enumerate()
        .map(|(j, (chi_square, mm))| {
            // Trapezoidal rule: the two ends count half.
            let share = if j == 0 || j == K_STEPS - 1 { 0.5 } else { 1.0 };
            // `C` integrated out leaves 1/√mm.
            share * libm::exp(-0.5 * (chi_square - least)) / mm.sqrt()
        })
        .sum();
    Slice { b, log_weight: libm::log(sum) - 0.5 * (least + log_determinant), least_chi_square: least }
}

/// Lower Cholesky factor of `I + Dᵀ·Λ⁻¹·D`, and the logarithm of its determinant.
fn factor<const S: usize>(gram: &[[f64; S]; S]) -> ([[f64; S]; S], f64) {
    let mut cholesky = [[0.0; S]; S];
    let mut determinant_root = 1.0;
    for row in 0..S {
        for column in 0..=row {
            let entry = gram[row][column];
            let mut sum = if row == column { 1.0 + entry } else { entry };
            for (a, b) in cholesky[row][..column].iter().zip(&cholesky[column][..column]) {
                sum -= a * b;
            }
            if row == column {
                // The matrix is the identity plus a sum of squares, so the pivot is at least one but for rounding.
                let pivot = sum.max(f64::EPSILON).sqrt();
                cholesky[row][row] = pivot;
                determinant_root *= pivot;
            } else {
                cholesky[row][column] = sum / cholesky[column][column];
            }
        }
    }
    (cholesky, 2.0 * libm::log(determinant_root))
}

/// The quadratic forms through `V⁻¹`, in the order of [`PAIRS`].
fn forms<const S: usize>(sums: &Sums<S>, cholesky: &[[f64; S]; S]) -> [f64; 6] {
    let mut projected = sums.projected;
    for row in 0..S {
        let mut sum = sums.projected[row];
        for j in 0..row {
            let (factor, earlier) = (cholesky[row][j], projected[j]);
            sum.iter_mut().zip(earlier).for_each(|(sum, e)| *sum -= factor * e);
        }
        projected[row] = sum.map(|v| v / cholesky[row][row]);
    }
    let mut forms = sums.forms;
    for p in &projected {
        for (form, (i, j)) in forms.iter_mut().zip(PAIRS) {
            *form -= p[i] * p[j];
        }
    }
    forms
}
