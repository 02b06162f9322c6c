//! Instruments: what their bytes become, on lines that are made up, on pseudo-terminals, and at the wrong settings.

#![allow(clippy::unwrap_used, reason = "a test that cannot go on fails")]

#[path = "instrument/support.rs"]
mod support;
#[path = "instrument/lines.rs"]
mod lines;
#[path = "instrument/modbus.rs"]
mod modbus;
#[path = "instrument/streams.rs"]
mod streams;
#[path = "instrument/proposals.rs"]
mod proposals;
#[cfg(target_os = "linux")]
#[path = "instrument/terminals.rs"]
mod terminals;
