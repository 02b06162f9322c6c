//! What was registered and read, as plain data without formulas.
//!
//! Numbers stand here as they were given: an uncertainty stays expanded with its coverage factor beside it, an
//! indication stays an indication. `record` fills these types from files; the rooms below compute with them.

mod acceptance;
mod id;
mod papers;
mod run;

pub use acceptance::{Acceptance, Limits, Rule, Tolerance};
pub use id::{Id, IdError};
pub use papers::{Amount, FloatScale, Meter, MeterKind, Papers, Transducer};
pub use run::{
    Build, Conditions, Indication, Influence, LeftOut, PointReading, Purity, Purpose, Readings, Run,
    SeriesReadings, Sweep, TimedVolume, ZeroAndLeak,
};
