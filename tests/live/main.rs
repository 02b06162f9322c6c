//! Instruments and the rig: what is heard as it comes.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

mod instrument;
mod live_screens;
mod live_views;
mod log_killed;
mod log_real;
mod log_watched;
mod logged;
mod logger_bench;
mod logger_rig;
mod logger_session;
mod logger_study;
mod rig;
mod rig_faults;
mod rig_modbus;
mod rig_terminal;
