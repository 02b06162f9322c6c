//! Arguments of `rig`.

use std::path::PathBuf;

use clap::Args;

use crate::quantity::{Span, text};

/// Options of `rig`.
#[derive(Debug, Args)]
#[command(
    after_help = "While it runs it takes commands, one a line: help lists them. It ends at quit, at Ctrl-C, after --for, or, \
                        without --for, when its input ends; in the background, with the null device as input, it runs on."
)]
pub struct Rig {
    /// The folder that is filled with profiles, the names of the ports, and the log of what was sent
    #[arg(long, value_name = "DIR", default_value = "ebbline-rig")]
    pub into: PathBuf,
    /// Seed of everything that is drawn
    #[arg(long, value_name = "N", default_value_t = 2_026, allow_negative_numbers = true)]
    pub seed: u64,
    /// Something that goes wrong, as in "rig-flow silence for 5 s in 30 s"; repeat
    #[arg(
        long,
        value_name = "\"ID NAME [ARG] [once|always|for TIME] [in TIME]\"",
        allow_hyphen_values = true
    )]
    pub fault: Vec<String>,
    /// How long it runs, as in "10 min"; else until it is ended
    #[arg(long = "for", value_name = "DURATION", allow_hyphen_values = true, value_parser = text::value::<Span>)]
    pub lasts: Option<Span>,
    /// What is set at the regulator and for how long, as in "4 bar 45 s, 5 bar 45 s"; else up and down between 4 and 13 bar
    #[arg(long, value_name = "STEPS", allow_hyphen_values = true)]
    pub script: Option<String>,
}
