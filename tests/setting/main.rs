//! The setting of a diver, by hand, on simulated loops, and the whole way from the bench.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../loop_simulator/mod.rs"]
mod loop_simulator;
#[path = "../setting_support/mod.rs"]
mod setting_support;
#[path = "../simulator/mod.rs"]
mod simulator;
#[path = "../common/studies.rs"]
mod studies;

mod diver_study;
mod setting_by_hand;
mod setting_properties;
mod setting_refusals;
mod setting_study;
mod setting_whole_way;
