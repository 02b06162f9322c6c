//! The book: one SQLite file that holds what was registered, read and decided, and cannot be changed unnoticed.
//!
//! Comes in: values of [`crate::entry`], the time of writing and random salts. Goes out: the same values to the last
//! bit, lists, and what a check found. Nothing is computed: figures of a decision are stored as they are handed in.
//!
//! Everything recorded is one record of a single chain (`chain`): canonical bytes with a salt of their own, a
//! digest of both, and a link over the link before. A correction is a new record that names the old one; tables for
//! lists repeat what stands in the records, and [`Book::check`] derives each of their rows again. Personal records can
//! be erased ([`Book::forget_diver`]); their places in the chain stay.
//!
//! Reasons to doubt it: whoever may write the file may rewrite all of it; only a head kept elsewhere shows that. A
//! deleted byte is overwritten in the file and its log, not in what a disk or its snapshots keep by themselves.

mod error;
mod open;
mod header;
mod schema;
mod canonical;
mod body;
mod body_rows;
mod chain;
mod registers;
mod runs;
mod sessions;
mod session_rows;
mod live;
mod lease;
mod judgements;
mod certificates;
mod lists;
mod session_list;
mod check;
mod backup;
mod erasure;

#[cfg(test)]
mod certificate_tests;
#[cfg(test)]
mod tests;

pub use body::CopyKind;
pub use certificates::{CertificateFiles, CertificateQuery, CertificateRow, GivenCertificate};
pub use chain::{Head, NoHead, Stamp};
pub use check::{Check, Wrong};
pub use erasure::{ErasureNote, Forgotten};
pub use error::{BookError, Stranger};
pub use lease::{Holder, LEASE_LASTS, Lease, Logged};
pub use lists::{CopyMade, DecisionRow, HistoryRow, Info, RunQuery, RunRow};
pub use live::{RunBatch, SeenTo, SessionBatch};
pub use open::{Book, Opening, Options};
pub use registers::{Entry, Kept, Register, Registered};
pub use runs::{Change, Origin, Recorded, RunRecord, RunState, SourceFiles, ToImport};
pub use session_list::{SessionQuery, SessionRow};
pub use session_rows::{KeptRow, RowContent, SessionChange};
pub use sessions::{LineSource, SessionRecord, SessionRecorded, SessionSource, SessionToImport};
