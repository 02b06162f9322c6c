//! The certificate: content as plain data ⇄ its forms on paper, and what is inside a form read back.
//!
//! [`paper`] sets any document in pages and knows nothing of calibrations.

pub mod compare;
pub mod complete;
pub mod content;
pub mod dcc;
pub mod paper;
pub mod rounding;
pub mod stated;
