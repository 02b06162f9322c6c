//! A 20-point run from its readings to line, budget, checks, choke ratio and verdict: analyses a second on one core.

#![allow(clippy::print_stdout, reason = "a benchmark's result is what it prints")]

mod common;

use std::hint::black_box;

use common::{Prepared, Setting, time};

fn main() {
    let setting = Setting::from_arguments();
    let prepared = Prepared::new(&setting);
    let times = if setting.in_earnest { 200 } else { 1 };
    let seconds = time(setting.repetitions(21), times, || {
        black_box(prepared.analyse());
    });
    println!(
        "analyse {} points: median {:.6} ms (from {:.6} to {:.6} ms), {:.1} analyses a second on one core",
        prepared.points().len(),
        seconds.median * 1e3,
        seconds.least * 1e3,
        seconds.most * 1e3,
        1.0 / seconds.median,
    );
}
