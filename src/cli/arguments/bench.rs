//! Arguments of `bench`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

use crate::quantity::text;
use crate::quantity::{
    AbsolutePressure, GaugePressure, PressureDifference, QuantityError, StpdFlow, Uncertain,
};

/// Verbs of bench runs.
#[derive(Debug, Subcommand)]
pub enum Bench {
    /// Takes runs from files into the book
    Import(Import),
    /// Fits a run: line, uncertainty, checks, verdict
    Fit(Fit),
    /// Leaves a point of a run out of its line, with the reason
    LeaveOut(LeaveOut),
    /// Judges a run of the book and keeps the judgement with its figures
    Accept(Accept),
    /// Lists the runs of the book, the newest first
    List(List),
    /// Shows a run of the book as it was recorded, with its judgements
    Show(Show),
}

/// Options of `bench import`.
#[derive(Debug, Args)]
pub struct Import {
    /// Run files
    #[arg(value_name = "FILE.toml", required = true)]
    pub files: Vec<PathBuf>,
}

/// Options of `bench leave-out`.
#[derive(Debug, Args)]
pub struct LeaveOut {
    /// A run of the book
    #[arg(value_name = "RUN")]
    pub run: String,
    /// The number of the point
    #[arg(value_name = "POINT")]
    pub point: usize,
    /// The reason, kept in the record
    #[arg(long, value_name = "TEXT")]
    pub why: String,
    /// Who says so
    #[arg(long, value_name = "NAME")]
    pub by: Option<String>,
}

/// Options of `bench accept`.
#[derive(Debug, Args)]
pub struct Accept {
    /// A run of the book
    #[arg(value_name = "RUN")]
    pub run: String,
    /// Who judges (else the technician of the run)
    #[arg(long, value_name = "NAME")]
    pub by: Option<String>,
    /// A remark, kept in the record
    #[arg(long, value_name = "TEXT")]
    pub remark: Option<String>,
}

/// Options of `bench list`.
#[derive(Debug, Args)]
pub struct List {
    /// Every run, not only the newest 50
    #[arg(long)]
    pub all: bool,
}

/// Options of `bench show`.
#[derive(Debug, Args)]
pub struct Show {
    /// A run of the book
    #[arg(value_name = "RUN")]
    pub run: String,
}

/// Options of `bench fit`.
#[derive(Debug, Args)]
pub struct Fit {
    /// A run of the book, or a run file (a name with a slash, or ending in .toml)
    #[arg(value_name = "RUN|FILE.toml")]
    pub run: String,
    /// Flow at this IP, as in "9.4 bar"; repeat, or list with commas
    #[arg(long, value_name = "IP", value_delimiter = ',', allow_hyphen_values = true, value_parser = text::value::<GaugePressure>)]
    pub at: Vec<GaugePressure>,
    /// The IP that gives this flow (STPD), as in "0.31 L/min"; repeat, or list with commas
    #[arg(long, value_name = "FLOW", value_delimiter = ',', allow_hyphen_values = true, value_parser = text::value::<StpdFlow>)]
    pub for_flow: Vec<StpdFlow>,
    /// Ambient pressure for these answers instead of 1.01325 bar, as in "830 hPa" or "1009 hPa ± 1 hPa"
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = barometer)]
    pub barometer: Option<Uncertain<AbsolutePressure, PressureDifference>>,
    /// Draw the run; the ending says how
    #[arg(long, value_name = "FILE.svg|.png")]
    pub plot: Option<PathBuf>,
    /// Check the budget by Monte Carlo with this many trials
    #[arg(long, value_name = "N")]
    pub monte_carlo: Option<usize>,
}

fn barometer(text: &str) -> Result<Uncertain<AbsolutePressure, PressureDifference>, QuantityError> {
    text::uncertain(text)
}
