//! `certificate`: issued from judged runs, amended, listed, shown, and checked whoever issued them.
//!
//! A certificate is a record of the book, and its files are made of it each time: the same record gives the same bytes. Before
//! a number is given out the whole certificate is made once with the number in sight, so that nothing incomplete uses one.

mod amend;
mod check;
mod document;
mod draft;
mod error;
mod issue;
mod list;
mod show;

pub use amend::{AmendRequest, amend};
pub use check::check;
pub use draft::GivenTexts;
pub use error::CertificateError;
pub(super) use issue::issue_at;
pub use issue::{IssueRequest, issue, look};
pub use list::list;
pub(super) use list::listed;
pub use show::show;

pub(super) use amend::amend_at;
