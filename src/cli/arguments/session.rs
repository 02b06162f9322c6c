//! Arguments of `session`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

/// Verbs of couch and pool sessions.
#[derive(Debug, Subcommand)]
pub enum Sessions {
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
