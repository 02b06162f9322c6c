//! A bench and an orifice in the computer, written without the crate's own laws, to judge the method by.
//!
//! Goes in: a seed and a [`Scene`]. Comes out: a [`Trial`], which knows the truth, and the [`Run`](ebbline::entry::Run)
//! a technician would have recorded there. The flow law ([`Hole`]) is its own: a discharge coefficient that grows with
//! the Reynolds number, a critical flow function from two numbers, the ellipse of ISO 6358 below choking. The errors
//! of the instruments are drawn once a run from their papers, the noise for each reading. From the crate come only the
//! types a run is handed over in, and `bench::analyse`, to which it is handed.

// Each test program uses its own share of this.
#![allow(dead_code, unused_imports)]

mod bench;
mod hole;
mod random;
mod tally;

pub(crate) use bench::{
    MeterSort, NOMINAL_IP_BAR, Papers, Scene, Trial, at_nominal, misread_as_absolute, misread_as_gauge,
};
pub(crate) use hole::{Hole, Transition};
pub(crate) use random::Random;
pub(crate) use tally::{Tally, median};
