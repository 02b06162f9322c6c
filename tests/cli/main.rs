//! The program from outside, and the dialogues.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../common/bench_files.rs"]
mod bench_files;
#[path = "../common/couch.rs"]
mod couch;
#[path = "../common/desk.rs"]
mod desk;
mod hands;
#[path = "../loop_simulator/mod.rs"]
mod loop_simulator;

mod bench_enter;
mod bench_enter_killed;
mod certificates;
mod cli_book;
mod cli_fit;
mod cli_refusals;
mod cli_registers;
mod cli_rig;
mod cli_session;
mod cli_setting;
mod cli_sheet;
mod demo;
mod export;
mod export_sessions;
mod session_enter;
