//! Arguments of `session`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

use crate::quantity::{Span, text};

/// Verbs of couch and pool sessions.
#[derive(Debug, Subcommand)]
pub enum Sessions {
    /// Types a session, row by row, at a prompt or from a pipe
    Enter(Box<EnterSession>),
    /// Logs a session live from oxygen cells
    Log(Box<SessionLog>),
    /// Goes on with a session that was left open, typed or live
    Resume(ResumeSession),
    /// Takes sessions from files into the book
    Import(ImportSessions),
    /// Lists the sessions of the book, the newest first
    List(ListSessions),
    /// Shows a session of the book as it was recorded
    Show(ShowSession),
    /// Leaves a stretch of a session out, or the whole session out of the diver's uptake, with the reason
    LeaveOut(LeaveOutSession),
    /// Works out the resting oxygen uptake from one session or many
    Uptake(UptakeOf),
}

/// Options of `session enter`; what is not given is asked for, or stays unsaid.
#[derive(Debug, Clone, Args)]
pub struct EnterSession {
    /// The diver, by code; one that is not in the register yet is created with the code only
    #[arg(value_name = "DIVER")]
    pub diver: String,
    /// Everything but the time, readings and events as in this session file
    #[arg(long, value_name = "FILE.toml")]
    pub from: Option<PathBuf>,
    /// couch or pool
    #[arg(long, value_name = "PLACE")]
    pub place: Option<String>,
    /// held, sealed or topped
    #[arg(long, value_name = "HOW")]
    pub r#loop: Option<String>,
    /// air, or as in "oxygen 18 %" (else the diver's own, else air)
    #[arg(long, value_name = "GAS")]
    pub diluent: Option<String>,
    /// Lungs included, as in "7.5 L ± 1.0 L", or unknown (else the diver's own)
    #[arg(long, value_name = "VOLUME")]
    pub loop_volume: Option<String>,
    /// Mass of the diver, as in "82 kg" (else the diver's own)
    #[arg(long, value_name = "MASS")]
    pub mass: Option<String>,
    /// passed, or the leak as in "0.005 L/min"
    #[arg(long, value_name = "LEAK")]
    pub leak_test: Option<String>,
    /// Barometer, as in "1016 hPa ± 2 hPa"
    #[arg(long, value_name = "PRESSURE")]
    pub barometer: Option<String>,
    /// Depth of the counterlung in a pool, as in "1.2 m ± 0.1 m"
    #[arg(long, value_name = "DEPTH", allow_hyphen_values = true)]
    pub depth: Option<String>,
    /// Temperature of the loop gas, as in "33 °C ± 4 °C"
    #[arg(long, value_name = "TEMPERATURE", allow_hyphen_values = true)]
    pub loop_temperature: Option<String>,
    /// On the loop before the first reading, as in "10 min"
    #[arg(long, value_name = "SPAN")]
    pub time_on_loop: Option<String>,
    /// ± of the cells' gain (k = 2), as in "2 %"
    #[arg(long, value_name = "SHARE")]
    pub gain: Option<String>,
    /// The orifice of the book whose line turns an IP into a flow, or none
    #[arg(long, value_name = "ORIFICE")]
    pub orifice: Option<String>,
    /// When the first reading is, as in 2026-11-20T18:05:00+11:00 (else now)
    #[arg(long, value_name = "TIME")]
    pub taken: Option<String>,
}

/// Options of `session log`: those of `session enter`, and the instruments.
#[derive(Debug, Args)]
pub struct SessionLog {
    /// The session
    #[command(flatten)]
    pub session: EnterSession,
    /// An oxygen cell, by its name in the register; repeat, in their order (else every cell with a port)
    #[arg(long, value_name = "ID")]
    pub cell: Vec<String>,
    /// What is injected at the beginning, as in "0.31 L/min" (STPD), "9.4 bar" (IP through the orifice's line) or off
    #[arg(long, value_name = "FLOW|IP|off")]
    pub injection: Option<String>,
    /// How long, as in "40 min" (else until it is finished or left)
    #[arg(long = "for", value_name = "DURATION", allow_hyphen_values = true, value_parser = text::value::<Span>)]
    pub lasts: Option<Span>,
}

/// Options of `session resume`.
#[derive(Debug, Args)]
pub struct ResumeSession {
    /// A session of the book that is still open
    #[arg(value_name = "SESSION")]
    pub session: String,
    /// How long a live one goes on, as in "40 min"
    #[arg(long = "for", value_name = "DURATION", allow_hyphen_values = true, value_parser = text::value::<Span>)]
    pub lasts: Option<Span>,
}

/// Options of `session import`.
#[derive(Debug, Args)]
pub struct ImportSessions {
    /// Session files
    #[arg(value_name = "FILE.toml", required = true)]
    pub files: Vec<PathBuf>,
}

/// Options of `session list`.
#[derive(Debug, Args)]
pub struct ListSessions {
    /// Only those of this diver
    #[arg(value_name = "DIVER")]
    pub diver: Option<String>,
    /// Every session, not only the newest 50
    #[arg(long)]
    pub all: bool,
}

/// Options of `session show`.
#[derive(Debug, Args)]
pub struct ShowSession {
    /// A session of the book
    #[arg(value_name = "SESSION")]
    pub session: String,
}

/// Options of `session leave-out`.
#[derive(Debug, Args)]
pub struct LeaveOutSession {
    /// A session of the book
    #[arg(value_name = "SESSION")]
    pub session: String,
    /// Beginning of the stretch, as in 00:08:30 on the time column, or a time of day with its offset; without it the
    /// whole session is left out
    #[arg(long, value_name = "TIME", requires = "until")]
    pub from: Option<String>,
    /// End of the stretch
    #[arg(long, value_name = "TIME", requires = "from")]
    pub until: Option<String>,
    /// The reason, kept in the record
    #[arg(long, value_name = "TEXT")]
    pub why: String,
    /// Who says so
    #[arg(long, value_name = "NAME")]
    pub by: Option<String>,
}

/// Options of `session uptake`.
#[derive(Debug, Args)]
pub struct UptakeOf {
    /// Sessions of the book, session files (a name with a slash, or ending in .toml), or a diver for all of that diver's
    #[arg(value_name = "SESSION|DIVER|FILE.toml", required = true)]
    pub of: Vec<String>,
    /// Draw each session; the ending says how
    #[arg(long, value_name = "FILE.svg|.png")]
    pub plot: Option<PathBuf>,
    /// Check the budget by Monte Carlo with this many trials
    #[arg(long, value_name = "N")]
    pub monte_carlo: Option<usize>,
}
