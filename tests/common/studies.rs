//! How much of a simulated study is drawn, and what so few cases leave to chance.
//!
//! In every `cargo test` a part of the cases is drawn; with `EBBLINE_STUDIES=full` all of them. Limits are those of the
//! full study. A study of fewer cases is held to them with room, so that what holds with all of them does not fail because
//! few were drawn; a mistake that a study is there to find stands far outside that room.

#![allow(dead_code, reason = "not every program of tests uses all of this")]

/// Whether all cases are drawn.
pub(crate) fn full() -> bool {
    std::env::var("EBBLINE_STUDIES").is_ok_and(|wanted| wanted == "full")
}

/// Cases to draw: a part of `all`, or all.
pub(crate) fn cases(part: usize, all: usize) -> usize {
    if full() { all } else { part }
}

/// Room about a limit for a share (0 to 1) of `n` cases: none in a full study, otherwise two standard deviations of the
/// share that `n` draws at that limit have (binomial distribution).
pub(crate) fn room(limit: f64, n: usize) -> f64 {
    if full() { 0.0 } else { 2.0 * (limit * (1.0 - limit) / n as f64).sqrt() }
}
