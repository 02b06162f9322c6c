//! Arguments of `bench`.

use std::path::PathBuf;

use clap::{Args, Subcommand};

use crate::quantity::text;
use crate::quantity::unit::{Kind, Unit, lookup};
use crate::quantity::{
    AbsolutePressure, GaugePressure, PressureDifference, QuantityError, Span, StpdFlow, Uncertain,
};

/// Most points of a run.
const MOST_POINTS: usize = 5_000;

/// Verbs of bench runs.
#[derive(Debug, Subcommand)]
pub enum Bench {
    /// Types a run, point by point, at a prompt or from a pipe
    Enter(Box<Enter>),
    /// Logs a run live from serial instruments
    Log(Box<BenchLog>),
    /// Goes on with a run that was left open, typed or live; shows one that another process logs
    Resume(Resume),
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

/// Options of `bench enter`; what is not given is asked for where it is needed.
#[derive(Debug, Args)]
pub struct Enter {
    /// The orifice; one that is not in the register yet is created with its name only
    #[arg(value_name = "ORIFICE")]
    pub orifice: String,
    /// Gas, instruments, conditions, limits and units as in this run file; its readings do not count
    #[arg(long, value_name = "FILE.toml")]
    pub from: Option<PathBuf>,
    /// oxygen, air, nitrogen or helium
    #[arg(long, value_name = "GAS")]
    pub gas: Option<String>,
    /// Oxygen in the oxygen (else "99.5 % ± 0.3 %")
    #[arg(long, value_name = "SHARE")]
    pub oxygen: Option<String>,
    /// acceptance, as-found, as-left or check
    #[arg(long, value_name = "PURPOSE")]
    pub purpose: Option<String>,
    /// The flow meter, by its name in the register
    #[arg(long, value_name = "ID")]
    pub meter: Option<String>,
    /// The pressure transducer, by its name in the register
    #[arg(long, value_name = "ID")]
    pub transducer: Option<String>,
    /// The limits, by their name in the register, or none
    #[arg(long, value_name = "NAME")]
    pub acceptance: Option<String>,
    /// Who reads the instruments
    #[arg(long, value_name = "NAME")]
    pub technician: Option<String>,
    /// Barometer, as in "1009.2 hPa ± 1.0 hPa"
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true)]
    pub barometer: Option<String>,
    /// Gas temperature at the orifice, as in "21.0 °C ± 1.0 °C"
    #[arg(long, value_name = "TEMPERATURE", allow_hyphen_values = true)]
    pub temperature: Option<String>,
    /// When it is taken, as in 2026-11-12T09:40:00+11:00 (else now)
    #[arg(long, value_name = "TIME")]
    pub taken: Option<String>,
    /// How numbers without a unit are read
    #[command(flatten)]
    pub typed: Typed,
}

/// Options of `bench log`.
#[derive(Debug, Args)]
pub struct BenchLog {
    /// The orifice; one that is not in the register yet is created with its name only
    #[arg(value_name = "ORIFICE")]
    pub orifice: String,
    /// oxygen, air, nitrogen or helium (else oxygen)
    #[arg(long, value_name = "GAS")]
    pub gas: Option<String>,
    /// Oxygen in the oxygen (else "99.5 % ± 0.3 %")
    #[arg(long, value_name = "SHARE")]
    pub oxygen: Option<String>,
    /// The flow meter, by its name in the register (else the only one with a port)
    #[arg(long, value_name = "ID")]
    pub meter: Option<String>,
    /// The pressure transducer, by its name in the register (else the only one with a port)
    #[arg(long, value_name = "ID")]
    pub transducer: Option<String>,
    /// A barometer by its name in the register, or a value as in "1009.2 hPa ± 1.0 hPa" (else the only one with a port)
    #[arg(long, value_name = "ID|PRESSURE", allow_hyphen_values = true)]
    pub barometer: Option<String>,
    /// A thermometer by its name in the register, or a value as in "21.0 °C ± 1.0 °C" (else the only one with a port)
    #[arg(long, value_name = "ID|TEMPERATURE", allow_hyphen_values = true)]
    pub temperature: Option<String>,
    /// acceptance, as-found, as-left or check (else check)
    #[arg(long, value_name = "PURPOSE")]
    pub purpose: Option<String>,
    /// Who turns the regulator
    #[arg(long, value_name = "NAME")]
    pub technician: Option<String>,
    /// The limits, by their name in the register, or none
    #[arg(long, value_name = "NAME")]
    pub acceptance: Option<String>,
    /// How it is logged
    #[command(flatten)]
    pub length: LogLength,
}

/// How long a run is logged, and who takes its points.
#[derive(Debug, Args)]
pub struct LogLength {
    /// Ends after this time, as in "10 min" (else when it is finished or left)
    #[arg(long = "for", value_name = "DURATION", allow_hyphen_values = true, value_parser = text::value::<Span>)]
    pub lasts: Option<Span>,
    /// Ends with this many points
    #[arg(long, value_name = "N", value_parser = points)]
    pub points: Option<usize>,
    /// Takes steady points by itself and prints a line a second, as it does without a terminal
    #[arg(long)]
    pub by_itself: bool,
}

/// Options of `bench resume`.
#[derive(Debug, Args)]
pub struct Resume {
    /// A run of the book that is still open
    #[arg(value_name = "RUN")]
    pub run: String,
    /// How a live run is logged
    #[command(flatten)]
    pub length: LogLength,
    /// How numbers without a unit are read
    #[command(flatten)]
    pub typed: Typed,
}

/// How numbers that are typed without a unit are read.
#[derive(Debug, Args)]
pub struct Typed {
    /// Unit of pressures typed without one (else bar)
    #[arg(long, value_name = "UNIT", value_parser = pressure_unit)]
    pub pressure_unit: Option<Unit>,
    /// Unit of flows typed without one (else L/min)
    #[arg(long, value_name = "UNIT", value_parser = flow_unit)]
    pub flow_unit: Option<Unit>,
    /// The transducer shows absolute pressure (else gauge)
    #[arg(long)]
    pub absolute: bool,
}

fn points(text: &str) -> Result<usize, String> {
    let points = text.parse().ok().filter(|points| (1..=MOST_POINTS).contains(points));
    points.ok_or_else(|| format!("a run has 1 to {MOST_POINTS} points"))
}

fn pressure_unit(text: &str) -> Result<Unit, QuantityError> {
    lookup(Kind::Pressure, text)
}

fn flow_unit(text: &str) -> Result<Unit, QuantityError> {
    lookup(Kind::Flow, text)
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
