//! What is kept: files of runs, sessions and registers there and back, and the book.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../loop_simulator/bare.rs"]
mod bare;
mod book_support;
#[path = "../common/studies.rs"]
mod studies;

mod book_copies;
mod book_crash;
mod book_damage;
mod book_erasure;
mod book_open_sessions;
mod book_registers;
mod book_runs;
mod book_sessions;
mod book_strangers;
mod record;
mod record_registers;
mod record_session;
