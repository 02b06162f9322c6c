//! Sentences and drawings of results.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../loop_simulator/mod.rs"]
mod loop_simulator;
mod plot_checks;
mod plot_histories;
mod plot_runs;
#[path = "../setting_support/mod.rs"]
mod setting_support;
#[path = "../simulator/mod.rs"]
mod simulator;

mod plot;
mod plot_history;
mod plot_session;
mod plot_setting;
mod report_setting;
mod report_uptake;
