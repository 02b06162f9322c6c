//! A run and what is said of it, on runs made up and on a simulated bench whose truth is known.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[allow(dead_code, reason = "only the run file and its readings are used here")]
#[path = "../common/bench_files.rs"]
mod bench_files;
#[path = "../common/runs.rs"]
mod runs;
#[path = "../simulator/mod.rs"]
mod simulator;
#[path = "../common/studies.rs"]
mod studies;

mod advice;
mod bench_checks;
mod bench_properties;
mod meters;
mod mistakes_in_pressure;
mod series;
mod simulated_study;
