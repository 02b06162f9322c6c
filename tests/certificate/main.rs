//! The certificate from content to XML and back: what is printed, what is refused, and whether a changed one is found out.

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]

#[path = "../common/runs.rs"]
#[allow(dead_code, reason = "shared by several tests")]
mod runs;
mod check;
mod contents;
mod pages;
mod paper;
mod support;
mod xml;
