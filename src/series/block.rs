//! Rows gathered into blocks of about a second, so that a fast logger costs no more than a slow one.
//!
//! Takes the columns and the row ranges to leave out, and returns blocks that each hold at least one finite pressure
//! and one finite flow. A left-out range, even an empty one, ends a run of blocks.

use std::ops::Range;

/// The means of some successive rows.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Block {
    /// Its rows; the end is excluded.
    pub(super) rows: Range<usize>,
    /// Time of its first row, in seconds.
    pub(super) from_s: f64,
    /// Mean pressure.
    pub(super) pressure: f64,
    /// Mean flow.
    pub(super) flow: f64,
}

/// Runs of blocks of `block_s` seconds or of one reading of each channel, whichever is longer. `left_out` is in order
/// of its starts. A started block that lacks a channel at the end of its run is dropped.
pub(super) fn blocks(
    time_s: &[f64],
    pressure: &[f64],
    flow: &[f64],
    left_out: &[Range<usize>],
    block_s: f64,
) -> Vec<Vec<Block>> {
    let rows = time_s.len().min(pressure.len()).min(flow.len());
    let mut runs = Vec::new();
    let mut start = 0;
    for out in left_out {
        if out.start.min(rows) > start {
            runs.push(run(time_s, pressure, flow, start..out.start.min(rows), block_s));
        }
        start = start.max(out.end).min(rows);
    }
    runs.push(run(time_s, pressure, flow, start..rows, block_s));
    runs.retain(|run| !run.is_empty());
    runs
}

/// The blocks of rows that hang together.
fn run(time_s: &[f64], pressure: &[f64], flow: &[f64], rows: Range<usize>, block_s: f64) -> Vec<Block> {
    let mut blocks = Vec::new();
    let mut start = rows.start;
    let mut from_s = f64::NAN;
    let mut sum = Sum::default();
    for row in rows.clone() {
        let t = time_s[row];
        if !t.is_finite() {
            continue;
        }
        if t - from_s >= block_s && sum.is_whole() {
            blocks.push(sum.block(start..row, from_s));
            (start, from_s, sum) = (row, t, Sum::default());
        }
        if from_s.is_nan() {
            from_s = t;
        }
        sum.add(pressure[row], flow[row]);
    }
    if sum.is_whole() {
        blocks.push(sum.block(start..rows.end, from_s));
    }
    blocks
}

/// What is summed for a block.
#[derive(Default)]
struct Sum {
    pressure: f64,
    pressures: u32,
    flow: f64,
    flows: u32,
}

impl Sum {
    fn add(&mut self, pressure: f64, flow: f64) {
        if pressure.is_finite() {
            self.pressure += pressure;
            self.pressures += 1;
        }
        if flow.is_finite() {
            self.flow += flow;
            self.flows += 1;
        }
    }

    fn is_whole(&self) -> bool {
        self.pressures > 0 && self.flows > 0
    }

    fn block(&self, rows: Range<usize>, from_s: f64) -> Block {
        Block {
            rows,
            from_s,
            pressure: self.pressure / f64::from(self.pressures),
            flow: self.flow / f64::from(self.flows),
        }
    }
}
