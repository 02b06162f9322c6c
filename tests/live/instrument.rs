//! Instruments: what their bytes become, on lines that are made up, on pseudo-terminals, and at the wrong settings.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on fails")]

mod support;
mod lines;
mod modbus;
mod streams;
mod proposals;
#[cfg(target_os = "linux")]
mod terminals;
