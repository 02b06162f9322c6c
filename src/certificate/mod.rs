//! The certificate: content as plain data ⇄ its forms on paper, and what is inside a form read back.
//!
//! [`content`] holds everything a certificate says, made of what is stated and of one or two analysed runs; [`complete`] lists what
//! forbids issuing it; [`fn@issue`] makes the PDF and the XML. [`fn@check`] takes either form back, makes the content again from the files
//! inside, and names each number that differs. [`dcc`] is the XML, [`pages`] the layout, [`paper`] the setting of any document in
//! pages, which knows nothing of calibrations.
//!
//! Left out: numbers and who may sign, which are the book's; whether a certificate is genuine, which only that book can tell;
//! electronic signatures.

pub mod check;
pub mod compare;
pub mod complete;
pub mod conformance;
pub mod content;
pub mod dcc;
pub mod issue;
pub mod pages;
pub mod paper;
pub mod rounding;
pub mod sheet;
pub mod stated;

pub use check::{CheckError, Checked, check};
pub use issue::{Issued, issue};
