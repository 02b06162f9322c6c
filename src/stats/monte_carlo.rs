//! Propagation of distributions by Monte Carlo (JCGM 101:2008), and the portable random numbers it needs.
//!
//! Takes a trial (a function from random numbers to results), a number of trials and a seed; returns every result, and
//! their mean, standard deviation and coverage intervals (JCGM 101:2008, 7.6 and 7.7). Numbers come from ChaCha8, which is
//! the same on every machine; trials are cut into a fixed number of blocks, each with a stream of its own, so the answer
//! does not depend on the number of threads. Left out: the adaptive procedure of 7.9; the caller says how many trials.

use rand_chacha::ChaCha8Rng;
use rand_chacha::rand_core::{Rng, SeedableRng};
use std::sync::OnceLock;

/// A source of random numbers: ChaCha with 8 rounds, a seed to be stored with the result, and a stream.
#[derive(Debug, Clone)]
pub struct Random {
    bits: ChaCha8Rng,
    ziggurat: &'static Ziggurat,
}

impl Random {
    /// The numbers of `stream` under `seed`; different streams are independent.
    pub fn new(seed: u64, stream: u64) -> Self {
        let mut bits = ChaCha8Rng::seed_from_u64(seed);
        bits.set_stream(stream);
        Self { bits, ziggurat: Ziggurat::shared() }
    }

    /// Uniform between 0 and 1, never either.
    pub fn uniform(&mut self) -> f64 {
        // 52 bits and the middle of their cell.
        ((self.bits.next_u64() >> 12) as f64 + 0.5) * (1.0 / (1u64 << 52) as f64)
    }

    /// Rectangular between `lower` and `upper`.
    pub fn rectangular(&mut self, lower: f64, upper: f64) -> f64 {
        lower + (upper - lower) * self.uniform()
    }

    /// Standard normal: ziggurat of G. Marsaglia and W. W. Tsang, J. Stat. Softw. 5 (2000) 8, with layer and position from
    /// separate bits (J. A. Doornik, An Improved Ziggurat Method, 2005).
    #[inline]
    pub fn normal(&mut self) -> f64 {
        loop {
            let bits = self.bits.next_u64();
            // The lowest 8 bits choose the layer, the highest 53 the place in it, from −1 to 1.
            let layer = (bits & 0xff) as usize;
            let place = (bits >> 11) as f64 * (1.0 / (1u64 << 52) as f64) - 1.0;
            let x = place * self.ziggurat.edge[layer];
            if x.abs() < self.ziggurat.edge[layer + 1] {
                return x;
            }
            if let Some(x) = self.normal_at_the_rim(layer, x) {
                return x;
            }
        }
    }

    /// Chi-squared with `dof` > 0 degrees of freedom.
    pub fn chi_squared(&mut self, dof: f64) -> f64 {
        2.0 * self.gamma(0.5 * dof)
    }

    /// Student's t with `dof` > 0 degrees of freedom; standard normal when they are infinite.
    pub fn student_t(&mut self, dof: f64) -> f64 {
        let z = self.normal();
        if dof.is_infinite() { z } else { z / (self.chi_squared(dof) / dof).sqrt() }
    }

    /// The rest of the normal's ziggurat: the tail beyond the lowest layer, and the rim of a layer where the curve cuts it.
    #[cold]
    fn normal_at_the_rim(&mut self, layer: usize, x: f64) -> Option<f64> {
        if layer == 0 {
            // G. Marsaglia, Technometrics 6 (1964) 101.
            loop {
                let beyond = -libm::log(self.uniform()) / RIM;
                let height = -libm::log(self.uniform());
                if 2.0 * height > beyond * beyond {
                    return Some((RIM + beyond).copysign(x));
                }
            }
        }
        let (low, high) = (self.ziggurat.height[layer], self.ziggurat.height[layer + 1]);
        let height = low + (high - low) * self.uniform();
        (height < libm::exp(-0.5 * x * x)).then_some(x)
    }

    /// Gamma with `shape` > 0 and unit scale: G. Marsaglia and W. W. Tsang, ACM Trans. Math. Softw. 26 (2000) 363.
    fn gamma(&mut self, shape: f64) -> f64 {
        if shape < 1.0 {
            // Same paper, section 6: a gamma of shape + 1 times u^(1/shape).
            let boost = libm::pow(self.uniform(), 1.0 / shape);
            return boost * self.gamma(shape + 1.0);
        }
        let d = shape - 1.0 / 3.0;
        let c = 1.0 / (9.0 * d).sqrt();
        loop {
            let z = self.normal();
            let root = 1.0 + c * z;
            if root <= 0.0 {
                continue;
            }
            let v = root * root * root;
            let u = self.uniform();
            if libm::log(u) < 0.5 * z * z + d - d * v + d * libm::log(v) {
                return d * v;
            }
        }
    }
}

/// Layers of the ziggurat.
const LAYERS: usize = 256;

/// Where the lowest layer ends and the tail begins, for 256 layers of equal area under exp(−x²/2). From memory, after
/// Marsaglia and Tsang 2000; a test checks that the layers close on it.
const RIM: f64 = 3.654_152_885_361_009;

/// Right edge and height of each layer; layer 0 is the lowest, its edge beyond the rim because it stands for the tail too.
#[derive(Debug)]
struct Ziggurat {
    edge: [f64; LAYERS + 1],
    height: [f64; LAYERS + 1],
}

impl Ziggurat {
    fn shared() -> &'static Self {
        static TABLES: OnceLock<Ziggurat> = OnceLock::new();
        TABLES.get_or_init(Self::new)
    }

    fn new() -> Self {
        let curve = |x: f64| libm::exp(-0.5 * x * x);
        let area = Self::area();
        let mut edge = [0.0; LAYERS + 1];
        edge[0] = area / curve(RIM);
        edge[1] = RIM;
        for i in 2..LAYERS {
            edge[i] = (-2.0 * libm::log(area / edge[i - 1] + curve(edge[i - 1]))).sqrt();
        }
        // The top layer ends in the point of the curve.
        edge[LAYERS] = 0.0;
        Self { edge, height: edge.map(curve) }
    }

    /// Area of each layer: the lowest rectangle and the tail beyond it.
    fn area() -> f64 {
        let tail = (std::f64::consts::PI / 2.0).sqrt() * libm::erfc(RIM * std::f64::consts::FRAC_1_SQRT_2);
        RIM * libm::exp(-0.5 * RIM * RIM) + tail
    }
}

/// How many trials, from which seed, on how many threads.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Plan {
    /// Number of trials.
    pub trials: usize,
    /// Seed, to be stored with the result.
    pub seed: u64,
    /// Threads to use, at least 1; the result is the same for any number.
    pub threads: usize,
}

/// Blocks into which the trials are cut. Part of the method: changing it changes every drawn number.
const BLOCKS: usize = 64;

/// Results of the trials that gave one, in a fixed order.
#[derive(Debug, Clone, PartialEq)]
pub struct Draws<const K: usize> {
    /// One entry per successful trial.
    pub values: Vec<[f64; K]>,
    /// Trials that gave no result; a reader must be told when there are any.
    pub failed: usize,
}

/// Runs the trials of `plan`. `scratch` makes a working area once per block; `trial` draws its inputs and returns its `K`
/// results, or None when there is none, and needs to allocate nothing.
pub fn propagate<const K: usize, S>(
    plan: &Plan,
    scratch: impl Fn() -> S + Sync,
    trial: impl Fn(&mut Random, &mut S) -> Option<[f64; K]> + Sync,
) -> Draws<K> {
    let bound = |block: usize| (plan.trials as u128 * block as u128 / BLOCKS as u128) as usize;
    let run = |block: usize| {
        let mut random = Random::new(plan.seed, block as u64);
        let mut scratch = scratch();
        let count = bound(block + 1) - bound(block);
        let mut values = Vec::with_capacity(count);
        values.extend((0..count).filter_map(|_| trial(&mut random, &mut scratch)));
        values
    };
    let threads = plan.threads.clamp(1, BLOCKS);
    let mut blocks: Vec<(usize, Vec<[f64; K]>)> = if threads == 1 {
        (0..BLOCKS).map(|block| (block, run(block))).collect()
    } else {
        std::thread::scope(|scope| {
            let run = &run;
            let workers: Vec<_> = (0..threads)
                .map(|first| {
                    scope.spawn(move || {
                        (first..BLOCKS).step_by(threads).map(|block| (block, run(block))).collect::<Vec<_>>()
                    })
                })
                .collect();
            // A trial that panics panics here, with its own message.
            let joined =
                workers.into_iter().map(|w| w.join().unwrap_or_else(|e| std::panic::resume_unwind(e)));
            joined.flatten().collect()
        })
    };
    blocks.sort_unstable_by_key(|(block, _)| *block);
    let mut values = Vec::with_capacity(plan.trials);
    for (_, block) in blocks {
        values.extend(block);
    }
    Draws { failed: plan.trials - values.len(), values }
}

/// Summary of one output.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Summary {
    /// Mean of the trials.
    pub mean: f64,
    /// Their standard deviation: the standard uncertainty (7.6).
    pub sd: f64,
    /// Coverage interval with equal probability on both sides (7.7.2, NOTE 1).
    pub symmetric: (f64, f64),
    /// Shortest coverage interval (7.7.2, NOTE 2).
    pub shortest: (f64, f64),
}

impl<const K: usize> Draws<K> {
    /// The results of one output, in the order of the trials.
    pub fn column(&self, output: usize) -> Vec<f64> {
        self.values.iter().map(|v| v[output]).collect()
    }

    /// Summary of `output` (below K) with intervals that cover with `probability` (0.95 for 95 %). None with too few
    /// trials for such an interval, at least 20 for 95 %, or when `probability` is outside (0, 1).
    pub fn summary(&self, output: usize, probability: f64) -> Option<Summary> {
        summarise(&self.column(output), probability)
    }

    /// Covariance of two outputs. None with fewer than two trials.
    pub fn covariance(&self, first: usize, second: usize) -> Option<f64> {
        let n = self.values.len() as f64;
        if self.values.len() < 2 {
            return None;
        }
        let mean = |k: usize| self.values.iter().map(|v| v[k]).sum::<f64>() / n;
        let (a, b) = (mean(first), mean(second));
        Some(self.values.iter().map(|v| (v[first] - a) * (v[second] - b)).sum::<f64>() / (n - 1.0))
    }
}

/// Mean, standard deviation and coverage intervals of `values`, as [`Draws::summary`].
pub fn summarise(values: &[f64], probability: f64) -> Option<Summary> {
    let trials = values.len();
    if !(probability > 0.0 && probability < 1.0) || values.iter().any(|v| !v.is_finite()) {
        return None;
    }
    // Symbols as in JCGM 101:2008, 7.7: M trials, q of them inside.
    let q = (probability * trials as f64 + 0.5) as usize;
    if trials < 2 || q == 0 || q >= trials {
        return None;
    }
    let n = trials as f64;
    let mean = values.iter().sum::<f64>() / n;
    let sd = (values.iter().map(|v| (v - mean) * (v - mean)).sum::<f64>() / (n - 1.0)).sqrt();
    let mut sorted = values.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    // The standard counts from 1: y_low = y_(r) with r = (M − q)/2, or the integer part of (M − q + 1)/2.
    let r = (trials - q).div_ceil(2).max(1);
    let symmetric = (sorted[r - 1], sorted[r + q - 1]);
    let mut shortest = (sorted[0], sorted[q]);
    for low in 1..trials - q {
        if sorted[low + q] - sorted[low] < shortest.1 - shortest.0 {
            shortest = (sorted[low], sorted[low + q]);
        }
    }
    Some(Summary { mean, sd, symmetric, shortest })
}

#[cfg(test)]
mod tests {
    use super::super::distribution::{chi_squared_upper, normal_cdf, student_t_cdf};
    use super::*;

    /// Largest distance between the sample's and the expected distribution function, times √n (Kolmogorov).
    fn kolmogorov(mut sample: Vec<f64>, expected: impl Fn(f64) -> f64) -> f64 {
        sample.sort_unstable_by(f64::total_cmp);
        let n = sample.len() as f64;
        let distance = |(i, x): (usize, &f64)| (expected(*x) - (i as f64 + 0.5) / n).abs() + 0.5 / n;
        n.sqrt() * sample.iter().enumerate().map(distance).fold(0.0, f64::max)
    }

    #[test]
    fn draws_follow_their_distributions() {
        // √n·D exceeds 1.95 with probability 0.001 (limit of Kolmogorov's distribution, common tables).
        let n = 200_000;
        let mut random = Random::new(1, 0);
        let mut sample =
            |draw: &dyn Fn(&mut Random) -> f64| (0..n).map(|_| draw(&mut random)).collect::<Vec<f64>>();
        for (what, distance) in [
            ("uniform", kolmogorov(sample(&|r| r.uniform()), |x| x)),
            ("rectangular", kolmogorov(sample(&|r| r.rectangular(-2.0, 6.0)), |x| (x + 2.0) / 8.0)),
            ("normal", kolmogorov(sample(&|r| r.normal()), normal_cdf)),
            (
                "chi-squared 0.7",
                kolmogorov(sample(&|r| r.chi_squared(0.7)), |x| 1.0 - chi_squared_upper(x, 0.7)),
            ),
            (
                "chi-squared 9",
                kolmogorov(sample(&|r| r.chi_squared(9.0)), |x| 1.0 - chi_squared_upper(x, 9.0)),
            ),
            ("Student t 4", kolmogorov(sample(&|r| r.student_t(4.0)), |x| student_t_cdf(x, 4.0))),
            ("Student t ∞", kolmogorov(sample(&|r| r.student_t(f64::INFINITY)), normal_cdf)),
        ] {
            assert!(distance < 1.95, "{what}: {distance}");
        }
    }

    #[test]
    fn the_tail_of_the_normal_is_all_there() {
        let n = 4_000_000;
        let mut random = Random::new(2, 0);
        let (mut beyond_3, mut beyond_rim, mut above) = (0.0, 0.0, 0.0);
        for _ in 0..n {
            let z = random.normal();
            beyond_3 += f64::from(u8::from(z.abs() > 3.0));
            beyond_rim += f64::from(u8::from(z.abs() > 4.0));
            above += f64::from(u8::from(z > 3.0));
        }
        for (what, got, probability) in [
            ("beyond 3", beyond_3, 2.0 * normal_cdf(-3.0)),
            ("beyond 4", beyond_rim, 2.0 * normal_cdf(-4.0)),
            ("above 3", above, normal_cdf(-3.0)),
        ] {
            let want = f64::from(n) * probability;
            assert!((got - want).abs() < 4.0 * want.sqrt(), "{what}: got {got}, want {want}");
        }
    }

    #[test]
    fn the_layers_of_the_ziggurat_close_at_the_top() {
        let tables = Ziggurat::new();
        let top = tables.edge[LAYERS - 1] * (1.0 - tables.height[LAYERS - 1]);
        assert!((top / Ziggurat::area() - 1.0).abs() < 1e-9, "top {top}, area {}", Ziggurat::area());
        assert!(tables.edge.windows(2).all(|w| w[0] > w[1]));
    }

    #[test]
    fn the_numbers_are_the_same_on_every_machine() {
        // Pinned so that a change of generator, which would change every stored result, is noticed.
        let mut random = Random::new(20_261_112, 3);
        let got =
            [random.uniform(), random.normal(), random.normal(), random.chi_squared(3.0)].map(f64::to_bits);
        assert_eq!(got, PINNED, "{got:#018x?}");
    }

    const PINNED: [u64; 4] = [0x3fdc52b716d8d45a, 0x3ff28f4a5406683d, 0xbfe73546b3aaebdd, 0x3fd8b6735a2f22d5];

    #[test]
    fn the_result_does_not_depend_on_the_number_of_threads() {
        let run = |threads| {
            let plan = Plan { trials: 1003, seed: 5, threads };
            propagate(
                &plan,
                || 0u32,
                |random, _| {
                    let z = random.normal();
                    (z > -1.5).then_some([z, z * z])
                },
            )
        };
        let one = run(1);
        assert!(one.failed > 30 && one.failed + one.values.len() == 1003);
        for threads in [2, 3, 7, 64, 500] {
            assert_eq!(run(threads), one, "{threads} threads");
        }
    }

    #[test]
    fn streams_and_seeds_differ() {
        let first = |seed, stream| Random::new(seed, stream).uniform().to_bits();
        assert_ne!(first(1, 0), first(1, 1));
        assert_ne!(first(1, 0), first(2, 0));
    }

    #[test]
    fn intervals_are_counted_as_the_standard_counts() {
        // M = 100, p = 0.95: q = 95, r = (100 − 95 + 1)/2 = 3: from the 3rd to the 98th value.
        let values: Vec<f64> = (1..=100).map(f64::from).collect();
        let summary = summarise(&values, 0.95).unwrap();
        assert_eq!(summary.symmetric, (3.0, 98.0));
        // Squared, the lower end is the dense one.
        let squares: Vec<f64> = values.iter().map(|v| v * v).collect();
        assert_eq!(summarise(&squares, 0.95).unwrap().shortest, (1.0, 9216.0));
        assert_eq!(summarise(&values[..5], 0.95), None);
        assert_eq!(summarise(&values, 1.0), None);
    }

    #[test]
    fn covariance_of_outputs_is_the_usual_one() {
        let draws = Draws { values: vec![[1.0, 2.0], [2.0, 4.5], [3.0, 5.5]], failed: 0 };
        assert!((draws.covariance(0, 1).unwrap() - 1.75).abs() < 1e-15);
        assert_eq!(Draws::<1> { values: vec![[1.0]], failed: 0 }.covariance(0, 0), None);
    }
}
