//! Published figures, to half a unit of the last printed digit.
//!
//! One program for all of them, because linking the crate once a file takes longer than most files run.

#[path = "../common/published.rs"]
mod published;

mod published_gas;
mod published_quantity;
mod published_stats;
mod uptake_published;
