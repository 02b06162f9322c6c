//! A session and the uptake found from it, by hand and on a simulated loop.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../loop_simulator/bare.rs"]
mod bare;
#[path = "../loop_simulator/mod.rs"]
mod loop_simulator;
#[path = "../common/studies.rs"]
mod studies;

mod uptake_advice;
mod uptake_by_hand;
mod uptake_refusals;
mod uptake_study;
