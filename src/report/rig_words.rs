//! What the simulated bench says of itself.
//!
//! Comes in: its instruments as entries of the register, and where their files are. Goes out: text and JSON, both of
//! which say that nothing of it is real.

use serde::Serialize;

use super::json_text;
use super::layout::wrapped;
use super::typed::{shell_word, tame};
use crate::entry::{Instrument, Socket};

/// First line of every profile that the rig writes.
pub const SIMULATED: &str =
    "# Simulated by ebbline rig: no such instrument exists, and its papers are invented.\n";

/// An instrument of the rig.
#[derive(Debug, Clone, PartialEq)]
pub struct RigInstrument {
    /// As an entry of the register; its socket is meant only while it is plugged in.
    pub instrument: Instrument,
    /// Whether it is plugged in.
    pub plugged: bool,
    /// The file of its profile.
    pub profile: String,
}

impl RigInstrument {
    fn port(&self) -> Option<&str> {
        match &self.instrument.socket {
            Some(Socket::Port(name)) if self.plugged => Some(name),
            _ => None,
        }
    }
}

/// A rig at work.
#[derive(Debug, Clone, PartialEq)]
pub struct RigShown {
    /// The folder with profiles, log, and the names of the ports.
    pub folder: String,
    /// The file that logs what was sent.
    pub log: String,
    /// Seed of everything that is drawn.
    pub seed: u64,
    /// Its instruments.
    pub instruments: Vec<RigInstrument>,
}

/// Instruments and ports, a line each.
#[must_use]
pub fn list(rig: &RigShown) -> String {
    let rows: Vec<Vec<String>> = rig
        .instruments
        .iter()
        .map(|one| {
            vec![
                one.instrument.id.to_string(),
                one.instrument.measures.name().to_owned(),
                one.port().map_or_else(|| "unplugged".to_owned(), tame),
            ]
        })
        .collect();
    let width =
        |place: usize| rows.iter().filter_map(|row| row.get(place)).map(|cell| cell.chars().count()).max();
    let (id, measures) = (width(0).unwrap_or(0), width(1).unwrap_or(0));
    rows.iter()
        .map(|row| match row.as_slice() {
            // Whole, however long: a port is there to be copied.
            [name, what, port] => format!("  {name:<id$}  {what:<measures$}  {port}\n"),
            _ => String::new(),
        })
        .collect()
}

/// What is said when it has begun.
#[must_use]
pub fn begun(rig: &RigShown, commands: &str) -> String {
    let mut text = wrapped(
        "",
        "  ",
        "SIMULATED: no such orifice, gas or instrument exists. A bench to try the program with, which tells nothing of a \
         real one.",
    );
    text.push('\n');
    text.push_str(&list(rig));
    text.push('\n');
    let folder = tame(&shell_word(&rig.folder));
    let first = rig.instruments.first().map_or("", |one| one.profile.as_str());
    text.push_str(&format!("Register them:  ebbline instrument add {folder}/*.toml\n"));
    text.push_str(&format!("Try one:        ebbline instrument try {}\n", tame(&shell_word(first))));
    text.push_str(&format!("Log a session:  ebbline session log D-1 --from {folder}/couch/session.toml\n"));
    text.push_str(&format!("What was sent:  {}\n", tame(&rig.log)));
    text.push_str(&wrapped(
        "",
        "  ",
        "Baud rate and frame are not simulated: at a wrong one these ports answer all the same.",
    ));
    text.push_str(&known(commands));
    text
}

/// The commands there are.
#[must_use]
pub fn known(commands: &str) -> String {
    let all =
        format!("{commands}; \"list\" for the ports as they are now, \"help\" for this, \"quit\" to end.");
    wrapped("Commands, one a line: ", "  ", &all)
}

/// The answer to a command that was done.
#[must_use]
pub fn done(command: &str) -> String {
    format!("done: {}\n", tame(command))
}

/// The answer to one that was not; `why` is a sentence of ours with what was typed in it.
#[must_use]
pub fn not_done(why: &str) -> String {
    format!("not done: {}\n", tame(why))
}

/// The last words.
#[must_use]
pub fn ended(rig: &RigShown, why: &str) -> String {
    let text = format!(
        "{why}: the rig has ended and its ports are gone. Profiles and log stay in {}.",
        tame(&rig.folder)
    );
    wrapped("", "  ", &text)
}

/// The instruments with their ports as a document.
#[must_use]
pub fn json(rig: &RigShown) -> String {
    let instruments = rig.instruments.iter().map(|one| Entry {
        instrument: one.instrument.id.as_str(),
        measures: one.instrument.measures.name(),
        port: one.port(),
        baud: one.instrument.baud,
        frame: one.instrument.frame.as_deref(),
        unit: one.instrument.unit.as_deref(),
        profile: &one.profile,
    });
    json_text(&Document {
        format: 1,
        simulated: true,
        seed: rig.seed,
        folder: &rig.folder,
        log: &rig.log,
        instruments: instruments.collect(),
    })
}

#[derive(Serialize)]
struct Document<'a> {
    format: u32,
    simulated: bool,
    seed: u64,
    folder: &'a str,
    log: &'a str,
    instruments: Vec<Entry<'a>>,
}

#[derive(Serialize)]
struct Entry<'a> {
    instrument: &'a str,
    measures: &'static str,
    port: Option<&'a str>,
    baud: Option<u32>,
    frame: Option<&'a str>,
    unit: Option<&'a str>,
    profile: &'a str,
}
