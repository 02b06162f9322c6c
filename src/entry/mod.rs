//! What was registered and read, as plain data without formulas.
//!
//! Numbers stand here as they were given: an uncertainty stays expanded with its coverage factor beside it, an
//! indication stays an indication. `record` fills these types from files; the rooms below compute with them.

mod id;
mod number;
mod acceptance;
mod papers;
mod run;
mod judgement;
mod orifice;
mod instrument;
mod first_stage;
mod diver;
mod shop;
mod session;
mod live;
mod certificate;

pub use acceptance::{Acceptance, Limits, Rule, Tolerance};
pub use certificate::{
    Certificate, CertificateAmends, CertificateDraft, CertificateTexts, CertifiedRun, Sheet,
};
pub use diver::{Diluent, Diver};
pub use first_stage::FirstStage;
pub use id::{Id, IdError};
pub use instrument::{
    Instrument, InstrumentPapers, Measures, ModbusNumber, ModbusTable, Protocol, Socket, WordOrder,
};
pub use judgement::{Decision, StoredFigures, StoredPart, StoredVerdict};
pub use live::{LiveNote, LiveNoteKind, LivePoint, LiveReadings, LoggingBegun};
pub use number::{RunNumber, SessionNumber};
pub use orifice::Orifice;
pub use papers::{Amount, FloatScale, Meter, MeterKind, Papers, Transducer};
pub use run::{
    Build, Conditions, Indication, Influence, LeftOut, PointReading, Purity, Purpose, Readings, Run,
    SeriesReadings, Sweep, TimedVolume, ZeroAndLeak,
};
pub use session::{
    Assumptions, CalibratedAt, CellPapers, CellReadings, CellSignal, Cylinder, Event, Feeds, Injection,
    LeakTest, LineReference, LoopKept, Metered, Place, Rest, Session, SessionConditions, SessionLeftOut,
    SessionReadings, What,
};
pub use shop::{Logo, Shop, Signatory};
