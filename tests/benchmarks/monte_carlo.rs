//! The whole chain of a 20-point run by Monte Carlo: 100 000 trials on two threads.

#![allow(clippy::print_stdout, reason = "a benchmark's result is what it prints")]

mod common;

use std::hint::black_box;

use common::{Prepared, Setting, time};
use ebbline::bench::monte_carlo::monte_carlo;

/// Any seed; the time does not depend on it.
const SEED: u64 = 101;
const THREADS: usize = 2;

fn main() {
    let setting = Setting::from_arguments();
    let prepared = Prepared::new(&setting);
    let analysis = prepared.analyse();
    let trials = if setting.in_earnest { 100_000 } else { 1_000 };
    let mut last = None;
    let seconds = time(setting.repetitions(15), 1, || {
        last = black_box(monte_carlo(&prepared.run, black_box(&analysis), trials, SEED, THREADS));
    });
    let Some(result) = last else { panic!("too few trials converged for an interval") };
    println!(
        "monte_carlo {trials} trials of {} points on {THREADS} threads: median {:.6} s (from {:.6} to {:.6} s); \
         mean {:.9}, u {:.9}, 95 % from {:.9} to {:.9} L/min",
        prepared.points().len(),
        seconds.median,
        seconds.least,
        seconds.most,
        result.mean,
        result.standard_uncertainty,
        result.interval_95.0,
        result.interval_95.1,
    );
}
